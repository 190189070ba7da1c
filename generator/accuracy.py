"""How well the handbook's models meet its own measured numbers: figures for the methods page."""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import dataclass

import numpy as np

from generator import polarity
from generator.dipoles import calibration_statistics, calibration_table
from generator.metrics import Handbook
from generator.structures import additive_refraction

# The robust spread of a normal distribution from its median absolute deviation.
_NORMAL = 1.4826


@dataclass(frozen=True, slots=True)
class Cloud:
    """Points of one kind in a comparison: (measured, predicted)."""

    label: str
    points: tuple[tuple[float, float], ...]


@dataclass(frozen=True, slots=True)
class Comparison:
    """A model against measured numbers. ``relative``: errors are shares of the measured value."""

    key: str
    title: str
    measured: str
    predicted: str
    unit: str
    relative: bool
    clouds: tuple[Cloud, ...]
    words: str


def comparisons(handbook: Handbook) -> tuple[Comparison, ...]:
    """Onsager equation, additive refraction and estimated moments, each against the measured."""
    return tuple(c for c in _all(handbook) if sum(len(cloud.points) for cloud in c.clouds) > 1)


def _all(handbook: Handbook) -> Iterator[Comparison]:
    clouds = _permittivities(handbook)
    yield Comparison(
        "onsager",
        "Permittivity by the Onsager equation",
        "measured permittivity",
        "from dipole moment, refractive index and molar volume",
        "",
        True,
        clouds,
        " ".join(_scatter(cloud) for cloud in clouds if len(cloud.points) > 1)
        + " What associated liquids lie below the line by is their correlation factor; the rest of "
        "the scatter is the model's: it treats a molecule as a point dipole in a sphere.",
    )
    clouds = (_refractions(handbook),)
    yield Comparison(
        "refraction",
        "Molar refraction from the structure",
        "from refractive index and density, cm³ mol⁻¹",
        "sum over atoms and bonds, cm³ mol⁻¹",
        "cm³ mol⁻¹",
        True,
        clouds,
        " ".join(_scatter(cloud) for cloud in clouds if len(cloud.points) > 1)
        + " A gap of more than a few percent is a wrong refractive index, density or structure "
        "more often than an odd molecule.",
    )
    statistics = calibration_statistics()
    yield Comparison(
        "moments",
        "Dipole moment from the structure",
        "measured in the gas phase, D",
        "estimated by a model that has not seen it, D",
        "D",
        False,
        (_moments(),),
        f"{statistics['molecules']} molecules, each left out of the calibration in its turn: "
        f"root mean square error {statistics['loo_rmse']:.2f} D, median absolute error "
        f"{statistics['loo_median_absolute_error']:.2f} D; where symmetry allows a moment "
        f"({statistics['molecules_with_a_moment_allowed']} molecules) "
        f"{statistics['loo_rmse_where_a_moment_is_allowed']:.2f} D. Polar and unpolar, parted at "
        f"0.2 D, are told apart for {100 * statistics['polar_or_unpolar'][0]['right']:.1f} %.",
    )


Pair = tuple[float, float]


def _permittivities(handbook: Handbook) -> tuple[Cloud, ...]:
    """Measured ε and ε after Onsager at each substance's own reference."""
    slugs = tuple(handbook.dataset.solvents)
    pairs = handbook.kept.each(
        slugs, "onsager", lambda some: [_permittivity(handbook, slug) for slug in some]
    )
    return tuple(
        Cloud(
            label,
            tuple(
                pair
                for slug, pair in pairs.items()
                if pair and handbook.molecules[slug].is_associated == associated
            ),
        )
        for label, associated in (("not associated", False), ("associated", True))
    )


def _permittivity(handbook: Handbook, slug: str) -> Pair | None:
    values = [
        handbook.at(slug, key)
        for key in ("relative_permittivity", "dipole_moment", "refractive_index", "molar_volume")
    ]
    known = [v for v in values if v is not None and v.basis != "estimated"]
    if len(known) < len(values) or handbook.molecules[slug].dipole_limit is not None:
        return None
    eps, moment, index, volume = known
    predicted = polarity.onsager_permittivity(
        moment.value, index.value, volume.value, eps.temperature or handbook.reference
    )
    return eps.value, float(predicted)


def _refractions(handbook: Handbook) -> Cloud:
    pairs = handbook.kept.each(
        tuple(handbook.dataset.solvents),
        "refraction",
        lambda some: [_refraction(handbook, slug) for slug in some],
    )
    return Cloud("liquids of this handbook", tuple(pair for pair in pairs.values() if pair))


def _refraction(handbook: Handbook, slug: str) -> Pair | None:
    measured = handbook.at(slug, "molar_refraction")
    if measured is None:
        return None
    return measured.value, additive_refraction(handbook.molecules[slug].smiles)


def _moments() -> Cloud:
    rows = [row for row in calibration_table() if row["status"] == "used"]
    return Cloud(
        "molecules of the calibration",
        tuple((float(row["measured"]), float(row["left_out"])) for row in rows),
    )


def _scatter(cloud: Cloud) -> str:
    """Median and robust spread of predicted/measured − 1, in words."""
    middle, spread = deviation(cloud.points)
    return (
        f"{len(cloud.points)} {cloud.label}: predicted over measured lies at "
        f"{round(100 * middle) + 0.0:+.0f} % in the median, with a robust spread of "
        f"{100 * spread:.{0 if spread > 0.05 else 1}f} %."
    ).replace("-", "\u2212")


def deviation(points: Sequence[tuple[float, float]]) -> tuple[float, float]:
    """Median and robust spread of predicted/measured − 1 [1] of (measured, predicted) pairs."""
    ratio = np.array([predicted / measured - 1 for measured, predicted in points])
    middle = float(np.median(ratio))
    return middle, float(_NORMAL * np.median(np.abs(ratio - middle)))
