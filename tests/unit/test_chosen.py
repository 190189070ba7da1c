"""What scripts are fed, and what the finder sorts by: the same numbers as everywhere else."""

from __future__ import annotations

import json
import math
import re

import pytest

from generator.bydegree import by_degree, control, drawn
from generator.catalogue import catalogue
from generator.flammability import CLASSES, flash_class
from generator.metrics import Handbook
from generator.pages import Page, render_all
from generator.quantities import QUANTITIES
from generator.sidebyside import data_script, groups
from generator.units import ZERO_CELSIUS
from generator.values import Value
from generator.wording import celsius, number, split_value

EPS = "relative_permittivity"


# --- degree by degree ---------------------------------------------------------------------------


def test_every_listed_value_is_among_the_degrees_with_its_digits(handbook: Handbook) -> None:
    seen = 0
    for slug in handbook.dataset.solvents:
        fed = control(by_degree(handbook, slug))
        columns = zip(*(fed[k] for k in "tvum"), strict=True)
        shown = {t: (v, u, m) for t, v, u, m in columns}
        for value in (*handbook.series(slug, EPS), handbook.at(slug, EPS)):
            if value is not None:
                printed = number(value, {})
                assert printed is not None
                assert value.temperature is not None
                found = shown[celsius(value.temperature)]
                assert found == (printed.value, printed.uncertainty, printed.letters), slug
                seen += 1
    assert seen > 800


def test_degrees_are_in_order_whole_and_inside_the_liquid_range(handbook: Handbook) -> None:
    listed = {round(t, 6) for t in handbook.temperatures}
    for slug in handbook.dataset.solvents:
        own = round(handbook.own_reference(slug), 6)
        values = by_degree(handbook, slug)
        at = [round(v.temperature or math.nan, 6) for v in values]
        assert at == sorted(set(at)), slug
        for temperature in at:
            whole = abs(temperature - ZERO_CELSIUS - round(temperature - ZERO_CELSIUS)) < 1e-6
            assert whole or temperature in listed or temperature == own, (slug, temperature)
            assert handbook.liquid_range(slug).holds(temperature) or temperature == own, slug


def test_a_curve_is_drawn_from_end_to_end_and_broken_where_it_is_not_sure() -> None:
    def at(celsius: float, basis: str, *marks: str) -> Value:
        return Value(EPS, 80.0 - celsius / 3, 0.1, celsius + ZERO_CELSIUS, basis, ("a",), marks)

    values = [at(t, "curve") for t in range(18, 31)]
    assert drawn(values) == "18:74 20:73.33 25:71.67 30:70"
    unsure = [at(25, "curve", "extrapolated"), at(30, "estimated"), at(35, "measured")]
    assert drawn(unsure) == "x25:71.67 x30:70 35:68.33"
    assert drawn([]) == ""


# --- side by side -------------------------------------------------------------------------------


@pytest.fixture(scope="module")
def fed(handbook: Handbook) -> dict[str, list[dict[str, object]]]:
    script = data_script(catalogue(handbook, ())).decode()
    found = re.fullmatch(r"window\.handbookData = (\{.*\});\n", script)
    assert found
    content: dict[str, list[dict[str, object]]] = json.loads(found[1])
    return content


def test_side_by_side_has_every_number_of_every_substance(
    handbook: Handbook, fed: dict[str, list[dict[str, object]]]
) -> None:
    keys = [key for _, group in groups(catalogue(handbook, ())) for key in group]
    assert len(keys) == len(set(keys))
    never = {k for k in QUANTITIES if all(handbook.at(s, k) is None for s in fed_slugs(fed))}
    assert set(keys) == set(QUANTITIES) - never
    assert fed_slugs(fed) == list(catalogue(handbook, ()).in_order)
    for solvent in fed["solvents"]:
        cells = solvent["values"]
        assert isinstance(cells, list)
        for key, cell in zip(keys, cells, strict=True):
            value = handbook.at(str(solvent["slug"]), key)
            parts = [*str(cell).split("|"), "", ""]
            if value is None:
                assert cell == ""
            else:
                wanted = split_value(value.value, value.uncertainty, QUANTITIES[key].decimals)
                assert tuple(parts[:2]) == wanted, (solvent["slug"], key)


def fed_slugs(fed: dict[str, list[dict[str, object]]]) -> list[str]:
    return [str(solvent["slug"]) for solvent in fed["solvents"]]


def test_side_by_side_stays_small(handbook: Handbook) -> None:
    # About a kilobyte a substance: a megabyte for a thousand, a third of it on the wire.
    size = len(data_script(catalogue(handbook, ())))
    assert size < 1_250 * len(handbook.dataset.solvents)


# --- flammable liquids --------------------------------------------------------------------------


@pytest.mark.parametrize(
    ("flash", "boiling", "key"),
    [
        # Table 2.6.1 of GHS, chapter 2.6, at and beside each of its bounds.
        (22.9, 35.0, "1"),
        (22.9, 35.1, "2"),
        (23.0, 30.0, "3"),
        (60.0, 150.0, "3"),
        (60.1, None, "4"),
        (93.0, None, "4"),
        (93.1, None, "0"),
        (-45.0, 34.6, "1"),  # diethyl ether
        (-20.0, 56.1, "2"),  # acetone
    ],
)
def test_flash_classes(flash: float, boiling: float | None, key: str) -> None:
    found = flash_class(flash, boiling)
    assert found is not None
    assert found.key == key


@pytest.mark.parametrize(("flash", "boiling"), [(None, 56.0), (None, None), (10.0, None)])
def test_no_class_where_an_input_is_missing(flash: float | None, boiling: float | None) -> None:
    assert flash_class(flash, boiling) is None


def test_a_class_that_needs_no_boiling_point_is_given_without_one() -> None:
    assert flash_class(40.0, None) is CLASSES[2]


# --- what a datasheet hands on ------------------------------------------------------------------


@pytest.fixture(scope="module")
def acetone(handbook: Handbook) -> Page:
    pages = render_all(catalogue(handbook, ()), handbook.settings, {})
    return next(page for page in pages if page.path == "solvents/acetone.md")


def test_a_datasheet_describes_itself_to_machines(acetone: Page, handbook: Handbook) -> None:
    found = re.search(r'<script type="application/ld\+json">(.*?)</script>', acetone.html)
    assert found
    told = json.loads(found[1])
    assert told["@context"] == "https://schema.org"
    assert told["@type"] == "Dataset"
    assert told["about"]["inChIKey"] == "CSCPPACGZOOCGX-UHFFFAOYSA-N"
    assert told["about"]["identifier"] == "CAS 67-64-1"
    assert told["distribution"]["contentUrl"] == "../downloads/solvents/acetone.csv"
    properties = {p["name"]: p for p in told["variableMeasured"]}
    value = handbook.at("acetone", EPS)
    assert value is not None
    assert math.isclose(properties["Relative permittivity"]["value"], value.value, rel_tol=1e-6)
    assert properties["Density"]["unitText"] == "g cm⁻³"


def test_a_datasheet_says_how_to_cite_it(acetone: Page) -> None:
    revision = re.search(r"Data revision <code>(\w+)</code>", acetone.html)
    quoted = re.search(r'data-copy="([^"]*revision[^"]*)"', acetone.html)
    assert quoted
    assert revision
    assert "Acetone (67-64-1): relative permittivity 2" in quoted[1]
    assert quoted[1].endswith(f"data revision {revision[1]}.")
