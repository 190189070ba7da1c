"""Estimates against what is measured: their spread is what they claim."""

import math
from pathlib import Path

import numpy as np
import pytest

from generator import estimates, polarity
from generator.cache import Cache
from generator.curves import curve_slope, curve_values, rank_curves, within
from generator.dataset import load_dataset
from generator.metrics import Handbook, Settings, compute
from generator.structures import molecule


def _robust(values: list[float]) -> tuple[float, float]:
    found = np.array(values)
    middle = float(np.median(found))
    return middle, float(1.4826 * np.median(np.abs(found - middle)))


def test_expansivity_from_the_boiling_point_against_published_curves(handbook: Handbook) -> None:
    gaps = []
    for slug in handbook.dataset.solvents:
        boiling = handbook.liquid_range(slug).high
        for curve in rank_curves(handbook.dataset, slug, "density"):
            published = handbook.dataset.sources[curve.source].kind != "calculated"
            if boiling is None or not published or not within(curve, 298.15):
                continue
            (density,) = curve_values(curve, [298.15], "density")
            measured = -curve_slope(curve, 298.15, "density") / density
            gaps.append(estimates.expansivity(boiling, 298.15) / measured - 1)
    middle, spread = _robust(gaps)
    assert len(gaps) > 150
    assert abs(middle) < 0.05
    assert spread < estimates.EXPANSION_SPREAD


def test_permittivity_from_the_other_quantities_against_measured_ones(handbook: Handbook) -> None:
    gaps: dict[bool, list[float]] = {True: [], False: []}
    for slug, structure in handbook.molecules.items():
        known = [
            handbook.at(slug, key)
            for key in ("relative_permittivity", "dipole_moment", "refractive_index")
        ]
        volume = handbook.at(slug, "molar_volume")
        if volume is None or any(v is None or v.basis == "estimated" for v in known):
            continue
        eps, moment, index = (v for v in known if v is not None)
        assert eps.temperature is not None
        found = estimates.permittivity(
            structure, (moment.value, 0.0), (index.value, 0.0), volume.value, eps.temperature
        )
        if found is None:
            assert structure.is_associated
        else:
            gaps[structure.dipole_limit is not None].append(found[0] / eps.value - 1)
    for unpolar, limit in (
        (True, estimates.UNPOLAR_SPREAD),
        (False, estimates.PERMITTIVITY_SPREAD),
    ):
        middle, spread = _robust(gaps[unpolar])
        assert len(gaps[unpolar]) >= 20
        assert math.hypot(middle, spread) < limit


def test_estimates_stand_in_only_where_nothing_is_published(
    tmp_path: Path, handbook: Handbook
) -> None:
    """Acetone without its ε and μ rows: both are estimated, marked, and not far off."""
    for file in handbook.dataset.folder.iterdir():
        lines = file.read_text(encoding="utf-8").splitlines(keepends=True)
        gone = ("acetone,relative_permittivity", "acetone,dipole_moment")
        kept = [line for line in lines if not line.startswith(gone)]
        (tmp_path / file.name).write_text("".join(kept), encoding="utf-8")
    bare = compute(load_dataset(tmp_path), Settings(), Cache(tmp_path / "cache"))
    for key, published in (("relative_permittivity", 20.5), ("dipole_moment", 2.88)):
        value = bare.at("acetone", key)
        assert value is not None
        assert value.basis == "estimated"
        assert "estimated" in value.marks
        assert abs(value.value - published) < 2 * value.uncertainty
        measured = handbook.at("acetone", key)
        assert measured is not None
        assert measured.basis != "estimated"
        assert "estimated" not in measured.marks
    function = bare.at("acetone", "kirkwood_function")
    assert function is not None
    assert function.basis == "estimated"
    assert "estimated" in function.marks
    # An estimated permittivity has nothing to say about the correlation of dipoles.
    assert bare.at("acetone", "kirkwood_correlation_factor") is None
    assert bare.at("acetone", "onsager_dipole_moment") is None
    assert bare.trend("acetone").sign == "not known"
    # From the cache the same number comes back.
    again = compute(load_dataset(tmp_path), Settings(), Cache(tmp_path / "cache"))
    assert again.at("acetone", "dipole_moment") == bare.at("acetone", "dipole_moment")


def test_no_estimate_for_associated_liquids_and_strange_structures(tmp_path: Path) -> None:
    assert estimates.permittivity(molecule("CCO"), (1.69, 0.02), (1.36, 0.0), 58.7, 298.15) is None
    assert estimates.dipole_moment(molecule("[Na+].[Cl-]"), Cache(tmp_path)) is None
    assert estimates.dipole_moment(molecule("[Na+].[Cl-]"), Cache(tmp_path)) is None


def test_estimated_permittivity_carries_the_uncertainty_of_the_moment() -> None:
    acetone = molecule("CC(C)=O")
    sure = estimates.permittivity(acetone, (2.88, 0.0), (1.356, 0.0), 74.0, 298.15)
    vague = estimates.permittivity(acetone, (2.88, 0.6), (1.356, 0.0), 74.0, 298.15)
    assert sure is not None
    assert vague is not None
    assert sure[0] == pytest.approx(float(polarity.onsager_permittivity(2.88, 1.356, 74.0, 298.15)))
    assert vague[1] > 1.5 * sure[1]
