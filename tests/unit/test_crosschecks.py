"""Damaged cells of well-known liquids: what the checks compare, and which cell they blame."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import replace

import numpy as np
import pytest

from generator import evidence
from generator.agreement import boiling_after
from generator.blame import Blame, blamed, clashes
from generator.cache import Cache
from generator.dataset import Dataset, Measurement
from generator.expectations import outcomes
from generator.facts import Facts, View
from generator.metrics import Handbook
from generator.spreads import LIMIT, Spreads, shipped
from generator.statements import problem_of
from generator.units import ZERO_CELSIUS

SPREADS = Spreads(shipped())
EPS, N, RHO, MU = "relative_permittivity", "refractive_index", "density", "dipole_moment"


@pytest.fixture(scope="module")
def cache(tmp_path_factory: pytest.TempPathFactory) -> Cache:
    return Cache(tmp_path_factory.mktemp("cache"))


def facts_of(handbook: Handbook, slug: str, cache: Cache, dataset: Dataset | None = None) -> Facts:
    molecules = {slug: handbook.molecules[slug]}
    (facts,) = evidence.everything(dataset or handbook.dataset, molecules, cache)
    return facts


def first(dataset: Dataset, slug: str, key: str, source: str = "") -> Measurement:
    rows = dataset.measurements_of(slug, key)
    return next(row for row in rows if not source or row.source == source)


def damaged(
    handbook: Handbook, slug: str, key: str, change: Callable[[Measurement], Measurement]
) -> Dataset:
    """The shipped tables with the first row of a quantity of a substance changed."""
    row = first(handbook.dataset, slug, key)
    rows = tuple(change(m) if m is row else m for m in handbook.dataset.measurements)
    return replace(handbook.dataset, measurements=rows)


def typed(text: str) -> Callable[[Measurement], Measurement]:
    half = 0.5 * 10.0 ** -len(text.partition(".")[2])
    return lambda row: replace(row, value=float(text), printed=text, half_width=half)


def measured_at(celsius: float) -> Callable[[Measurement], Measurement]:
    return lambda row: replace(row, temperature=celsius + ZERO_CELSIUS)


# A slip in a value of a liquid that everybody knows: quantity, slug, text, the value it was.
DAMAGED = (
    (N, "toluene", "1.9461", 1.4961),
    (N, "acetone", "1.5388", 1.3588),
    (RHO, "toluene", "8.668", 0.8668),
    (RHO, "1-butanol", "0.8950", 0.8095),
    (EPS, "acetone", "2.101", 21.01),
    (EPS, "cyclohexane", "2.2043", 2.0243),
    (EPS, "nitrobenzene", "53.6", 35.6),
    (MU, "acetonitrile", "9.32", 3.92),
    (MU, "benzene", "1.5", 0.0),
    ("boiling_point", "heptane", "89.5", 98.5),
    ("melting_point", "hexane", "95", -95.0),
)


@pytest.mark.parametrize(("key", "slug", "text", "before"), DAMAGED)
@pytest.mark.parametrize("copied", [True, False], ids=["beside the table", "by physics alone"])
def test_a_damaged_value_is_named(
    handbook: Handbook, cache: Cache, key: str, slug: str, text: str, before: float, copied: bool
) -> None:
    facts = facts_of(handbook, slug, cache, damaged(handbook, slug, key, typed(text)))
    found = blamed(facts if copied else replace(facts, prints={}), SPREADS)
    assert [b.cell for b in found] == [f"{key}#0"]
    tolerance = 0.15 if not copied else 0.02
    assert found[0].best == pytest.approx(before, rel=tolerance, abs=4.0 if before < 0 else 0.35)


@pytest.mark.parametrize("slug", ["toluene", "acetone", "water", "ethanol", "1-4-dioxane"])
def test_well_known_liquids_are_left_in_peace(handbook: Handbook, cache: Cache, slug: str) -> None:
    facts = facts_of(handbook, slug, cache)
    assert blamed(facts, SPREADS) == ()
    assert blamed(replace(facts, prints={}), SPREADS) == ()


@pytest.mark.parametrize(("key", "celsius"), [(N, 2.0), (RHO, 293.15), (EPS, 200.0)])
def test_a_damaged_temperature_is_named(
    handbook: Handbook, cache: Cache, key: str, celsius: float
) -> None:
    dataset = damaged(handbook, "toluene", key, measured_at(celsius))
    facts = facts_of(handbook, "toluene", cache, dataset)
    assert [b.cell for b in blamed(facts, SPREADS)] == [f"{key}#0@"]


def test_what_a_table_prints_does_not_defend_a_wrong_print(
    handbook: Handbook, cache: Cache
) -> None:
    """Both the row and the table say 8.668: the rows are no mistyping, the number is wrong."""
    dataset = damaged(handbook, "toluene", RHO, typed("8.668"))
    facts = facts_of(handbook, "toluene", cache, dataset)
    source = first(dataset, "toluene", RHO).source
    printed = replace(facts.prints[RHO, source], value="8.668")
    facts = replace(facts, prints={**facts.prints, (RHO, source): printed})
    assert [b.cell for b in blamed(facts, SPREADS)] == [f"{RHO}#0"]


def test_a_point_and_the_curve_of_its_table_fall_together(handbook: Handbook, cache: Cache) -> None:
    facts = facts_of(handbook, "chlorobenzene", cache)
    (point,), (curve,) = facts.points[EPS], facts.curves[EPS]
    row = replace(curve.row, coefficients=tuple(10 * c for c in curve.row.coefficients))
    ten_times = {
        "points": {**facts.points, EPS: (replace(point, value=10 * point.value),)},
        "curves": {**facts.curves, EPS: (replace(curve, row=row),)},
        "prints": {},
    }
    found = blamed(replace(facts, **ten_times), SPREADS)  # type: ignore[arg-type]
    assert [b.cell for b in found] == [point.name]
    assert found[0].best == pytest.approx(point.value, rel=0.3)


def test_two_against_two_is_left_undecided(handbook: Handbook, cache: Cache) -> None:
    facts = facts_of(handbook, "heptane", cache)
    points = facts.points["melting_point"][:4]
    assert len(points) == 4
    halves = tuple(
        replace(p, value=p.value + (30.0 if i < 2 else 0.0)) for i, p in enumerate(points)
    )
    split = replace(facts, points={**facts.points, "melting_point": halves}, prints={})
    assert clashes(outcomes(View(split)), SPREADS)
    assert blamed(split, SPREADS) == ()


def test_the_finding_says_where_what_and_how_to_settle_it(handbook: Handbook, cache: Cache) -> None:
    dataset = damaged(handbook, "toluene", RHO, typed("8.668"))
    facts = facts_of(handbook, "toluene", cache, dataset)
    (blame,) = blamed(facts, SPREADS)
    problem = problem_of(dataset.solvents["toluene"], facts, blame, SPREADS)
    row = first(dataset, "toluene", RHO)
    assert (problem.file, problem.line, problem.column) == (
        "measurements.csv", row.line, "value",
    )  # fmt: skip
    assert problem.severity == "suspect"
    assert "8.668 g/cm3" in problem.found
    assert "0.8" in problem.expected
    assert "molar refraction" in problem.evidence
    assert "limit" in problem.evidence
    assert "prints" in problem.hint
    assert problem.strength > 1


def test_a_wrong_structure_is_named_although_its_numbers_are_right(
    handbook: Handbook, cache: Cache
) -> None:
    acetone = replace(handbook.dataset.solvents["acetone"], smiles="CCC=O")
    solvents = {**handbook.dataset.solvents, "acetone": acetone}
    dataset = replace(handbook.dataset, solvents=solvents)
    molecules = {"acetone": handbook.molecules["acetone"]}
    (facts,) = evidence.everything(dataset, molecules, cache)
    (blame,) = blamed(facts, SPREADS)
    assert blame.cell == "smiles"
    problem = problem_of(acetone, facts, blame, SPREADS)
    assert (problem.file, problem.column, problem.expected) == ("solvents.csv", "smiles", "CC(=O)C")


# --- single comparisons --------------------------------------------------------------------------


def deviation(facts: Facts, check: str) -> float:
    found = [o for o in outcomes(View(facts)) if o.check == check]
    assert found, check
    return max((float(SPREADS.deviation(o)) for o in found), key=abs)


def test_index_follows_the_density_over_temperature(handbook: Handbook, cache: Cache) -> None:
    # Toluene, n_D = 1.49693 at 20 °C and 1.49413 at 25 °C: Riddick, Bunger, Sakano, Organic
    # Solvents, 4th edition (1986), from memory.
    facts = facts_of(handbook, "toluene", cache)
    point = replace(facts.points[N][0], value=1.49693, temperature=293.15)
    view = View(replace(facts, points={**facts.points, N: (point,)}))
    assert float(view.index(point, 298.15)) == pytest.approx(1.49413, abs=3e-4)


@pytest.mark.parametrize(
    ("slug", "pressure"),
    # Vapour pressure at 20 °C [kPa]: CRC Handbook of Chemistry and Physics, from memory.
    [("toluene", 2.91), ("octane", 1.39), ("chlorobenzene", 1.17), ("butyl-acetate", 1.2)],
)
def test_boiling_point_foretells_the_vapour_pressure(
    handbook: Handbook, cache: Cache, slug: str, pressure: float
) -> None:
    facts = facts_of(handbook, slug, cache)
    found = [
        o for o in outcomes(View(facts)) if o.check == "pressure" and "at 20 °C" in o.what_found
    ]
    assert found
    for outcome in found:
        assert float(outcome.expected) == pytest.approx(pressure, rel=0.30)
        assert float(outcome.found) == pytest.approx(pressure, rel=0.10)


def test_curves_boil_at_the_boiling_point(handbook: Handbook, cache: Cache) -> None:
    # Toluene boils at 110.6 °C (CRC Handbook, from memory).
    for curve in facts_of(handbook, "toluene", cache).curves["vapour_pressure"]:
        assert boiling_after(curve) - ZERO_CELSIUS == pytest.approx(110.6, abs=0.3)


def test_one_sided_checks_are_silent_on_their_side(handbook: Handbook, cache: Cache) -> None:
    facts = facts_of(handbook, "toluene", cache)
    for check in ("order", "liquid-range", "below-index-square", "bounds"):
        assert deviation(facts, check) == 0.0


def test_many_values_at_once_are_each_value_alone(handbook: Handbook, cache: Cache) -> None:
    facts = facts_of(handbook, "acetone", cache)
    cell = facts.points[EPS][0].name
    values = np.array([2.0, 20.0, 21.0, 40.0])
    together = outcomes(View(facts, {cell: values}), EPS)
    for i, value in enumerate(values):
        alone = outcomes(View(facts, {cell: np.asarray(value)}), EPS)
        for many, one in zip(together, alone, strict=True):
            residuals = np.broadcast_to(many.residual, values.shape)
            assert residuals[i] == pytest.approx(float(one.residual), nan_ok=True)


def test_a_clash_alone_names_a_cell_only_well_beyond_its_limit(
    handbook: Handbook, cache: Cache
) -> None:
    """Around the limit one comparison is no case; far beyond it is."""

    def found(factor: float) -> tuple[Blame, ...]:
        text = f"{2.0243 * factor:.5g}"
        dataset = damaged(handbook, "cyclohexane", EPS, typed(text))
        facts = replace(facts_of(handbook, "cyclohexane", cache, dataset), prints={})
        curves = {k: v for k, v in facts.curves.items() if k != EPS}
        return blamed(replace(facts, curves=curves), SPREADS)

    spread = SPREADS.of("index-square", "symmetric").spread
    assert found(1 + LIMIT * spread * 0.9) == ()
    assert [b.cell for b in found(1 + LIMIT * spread * 3)] == [f"{EPS}#0"]
