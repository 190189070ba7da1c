"""The way to a number says everything that went into it, and its shares add up."""

import json
import math

import numpy as np
import pytest
from click.testing import CliRunner

from generator import explain, polarity
from generator.cli import main
from generator.metrics import DEPENDS, Handbook, Settings
from generator.quantities import QUANTITIES
from generator.selection import OrderError
from generator.units import ZERO_CELSIUS


def test_shares_of_every_number_add_up_to_one(handbook: Handbook) -> None:
    for slug in handbook.dataset.solvents:
        for key in DEPENDS:
            budget = handbook.budget(slug, key)
            assert bool(budget) == (handbook.at(slug, key) is not None), (slug, key)
            if budget:
                total = sum(share.share for share in budget)
                assert total == pytest.approx(1, abs=1e-9) or total == 0, (slug, key)


def test_budget_against_the_law_of_propagation(handbook: Handbook) -> None:
    """JCGM 100:2008, equation 10: variances of a product of powers, worked out here by hand."""
    volume = {s.value.quantity: s.share for s in handbook.budget("acetone", "molar_volume")}
    mass, density = handbook.at("acetone", "molar_mass"), handbook.at("acetone", "density")
    assert mass is not None
    assert density is not None
    parts = [(mass.uncertainty / mass.value) ** 2, (density.uncertainty / density.value) ** 2]
    assert volume["density"] == pytest.approx(parts[1] / sum(parts), rel=1e-4)
    total = handbook.at("acetone", "molar_volume")
    assert total is not None
    assert total.uncertainty == pytest.approx(total.value * math.sqrt(sum(parts)), rel=0.03)


def test_sampled_and_linear_uncertainty_agree_where_both_hold(handbook: Handbook) -> None:
    """Monte Carlo (JCGM 101) beside the linear law (JCGM 100) for smooth functions of ε."""
    checked = 0
    for slug in handbook.dataset.solvents:
        eps = handbook.at(slug, "relative_permittivity")
        function = handbook.at(slug, "kirkwood_function")
        if eps is None or function is None or eps.uncertainty > 0.02 * eps.value:
            continue
        linear = 3 / (2 * eps.value + 1) ** 2 * eps.uncertainty
        assert function.uncertainty == pytest.approx(linear, rel=0.04), slug
        checked += 1
    assert checked > 120


def test_the_way_to_a_derived_number_reaches_the_rows_of_the_tables(handbook: Handbook) -> None:
    way = explain.way_to(handbook, "acetone", "kirkwood_correlation_factor")
    assert {w.quantity for w in way.inputs} == set(DEPENDS["kirkwood_correlation_factor"])
    text = "\n".join(explain.lines(handbook, way))
    for needed in (
        "g = (μ_O/μ)^2",
        "weight 33 %",
        "[cccbdb-dipole]",
        "measurements.csv line",
        "Birge ratio",
        "constant molar refraction",
        "% of the variance",
    ):
        assert needed in text
    for source in way.value.sources if way.value else ():
        assert f"[{source}]" in text
        assert handbook.sources[source].citation in text


def test_decisions_of_the_laboratory_are_named(handbook: Handbook) -> None:
    way = explain.way_to(handbook, "hexane", "density")
    assert way.decision is not None
    assert all(c.printed != "0.6606 g/cm3" for c in way.decision.candidates)
    assert "exclude 0.6606" in "\n".join(explain.lines(handbook, way))


def test_any_temperature_gives_what_the_pages_give_at_theirs(handbook: Handbook) -> None:
    for celsius in (20.0, 40.0):
        kelvin = celsius + ZERO_CELSIUS
        for key in ("relative_permittivity", "molar_polarization", "bjerrum_length"):
            _, way = explain.explain(handbook.dataset, Settings(), "ethanol", key, kelvin)
            assert way.value == handbook.at("ethanol", key, kelvin)
    # Between the listed temperatures: straight from the formula.
    _, way = explain.explain(handbook.dataset, Settings(), "ethanol", "kirkwood_function", 295.65)
    (eps,) = way.inputs
    assert way.value is not None
    assert eps.value is not None
    assert way.value.value == pytest.approx(float(polarity.kirkwood_function(eps.value.value)))


def test_no_value_is_said_and_not_made_up(handbook: Handbook) -> None:
    # Boiling point 34.6 °C: no liquid diethyl ether at 1 atm and 60 °C.
    _, way = explain.explain(
        handbook.dataset, Settings(), "diethyl-ether", "relative_permittivity", 333.15
    )
    assert way.value is None
    assert "no value here" in "\n".join(explain.lines(handbook, way))


@pytest.mark.parametrize(
    "text", ["kirkwood-function", "Kirkwood function", "kirkwood_function", "f(ε)"]
)
def test_quantities_are_found_by_key_name_and_symbol(text: str) -> None:
    assert explain.find_quantity(text) == "kirkwood_function"


def test_unknown_quantities_come_with_the_nearest() -> None:
    with pytest.raises(OrderError, match="nearest: relative_permittivity"):
        explain.find_quantity("relative permitivity")


def test_the_command(handbook: Handbook) -> None:
    """Any name of a substance will do; wrong ones are usage errors, a missing value is status 1."""
    data = str(handbook.dataset.folder)
    run = CliRunner().invoke
    done = run(main, ["explain", "67-64-1", "f(ε)", "--temperature", "20", "--data", data])
    assert done.exit_code == 0, done.output
    assert done.output.startswith("Acetone\nKirkwood function f(ε) = 0.46")
    made = run(main, ["explain", "acetone", "density", "--json", "--data", data])
    way = json.loads(made.output)
    assert way["value"]["value"] == pytest.approx(0.7848, abs=0.001)
    assert sum(c["weight"] for c in way["decision"]["candidates"]) == pytest.approx(1)
    assert run(main, ["explain", "acetonne", "density", "--data", data]).exit_code == 2
    gone = run(main, ["explain", "diethyl ether", "density", "--temperature", "90", "--data", data])
    assert gone.exit_code == 1
    assert "no value here" in gone.output


def test_formulas_in_one_line() -> None:
    plain = {key: explain.plain_formula(q.formula) for key, q in QUANTITIES.items() if q.formula}
    assert plain["kirkwood_function"] == "f(ε) = (ε-1)/(2ε+1)"
    assert plain["debye_length_01"].startswith("λ_D = √((ε_0 ε k T)/(2 N_A e^2 c))")
    for key, text in plain.items():
        assert not set(text) & set("\\{}"), key
    assert np.all([text.isprintable() for text in plain.values()])
