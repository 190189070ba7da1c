"""Numbers, units and temperatures as they are printed."""

from __future__ import annotations

import math
import re
from pathlib import Path

import pytest

from generator.contexts import Link
from generator.quantities import QUANTITIES
from generator.values import MARKS as MEANINGS
from generator.values import Value
from generator.wording import (
    MARKS,
    cell_markup,
    celsius,
    celsius_label,
    formula_markup,
    marks_of,
    number,
    padding,
    places,
    printed_label,
    prose,
    range_label,
    split_value,
    symbol_markup,
    unit_label,
)

ROOT = Path(__file__).resolve().parents[2]


def value(x: float, u: float, *marks: str, key: str = "relative_permittivity") -> Value:
    return Value(key, x, u, 298.15, "measured", ("a", "b"), marks)


@pytest.mark.parametrize(
    ("unit", "printed"),
    [
        ("1", ""), ("g/cm3", "g cm⁻³"), ("degC", "°C"), ("S/m", "S m⁻¹"), ("mPa s", "mPa s"),
        ("cm3/mol", "cm³ mol⁻¹"), ("1/K", "K⁻¹"), ("kJ/mol", "kJ mol⁻¹"), ("D", "D"),
    ],
)  # fmt: skip
def test_units(unit: str, printed: str) -> None:
    assert unit_label(unit) == printed


def test_every_unit_of_the_registry_is_printed_without_a_slash() -> None:
    for quantity in QUANTITIES.values():
        assert "/" not in unit_label(quantity.unit)


def test_temperatures_are_in_degrees_with_a_real_minus_sign() -> None:
    assert celsius(298.15) == "25"
    assert celsius_label(273.15 - 94.7) == "−94.7 °C"
    assert celsius(273.15 - 1e-9) == "0"
    assert range_label(178.45, 329.25) == "−94.7 to 56.1 °C"
    assert range_label(None, 300.0) == "up to 26.9 °C"
    assert range_label(300.0, None) == "from 26.9 °C"
    assert range_label(None, None) == "not known"


def test_formulas_and_symbols() -> None:
    assert formula_markup("C2H6O") == "C<sub>2</sub>H<sub>6</sub>O"
    assert formula_markup("<x>") == "&lt;x&gt;"
    assert symbol_markup("n_D") == "n<sub>D</sub>"
    assert symbol_markup("λ_D(0.1)") == "λ<sub>D</sub>(0.1)"
    assert symbol_markup("(dε/dT)_g") == "(dε/dT)<sub>g</sub>"
    assert symbol_markup("f(ε)") == "f(ε)"


def test_split_value_gives_digits_and_uncertainty() -> None:
    assert split_value(78.358, 0.05, 2) == ("78.358", "0.050")
    assert split_value(-0.4567, math.nan, 2) == ("−0.46", "")
    digits, own = split_value(6.0e-6, 5.0e-7, 12)
    assert digits.endswith("×10⁻⁶")
    assert own.endswith("×10⁻⁶")


def test_number_keeps_sources_marks_and_temperature() -> None:
    made = number(value(20.5, 0.1, "extrapolated"), {"a": Link("1", "#source-1")})
    assert made is not None
    assert made.sources == (Link("1", "#source-1"),)
    assert made.letters == "x"
    assert made.sentence.endswith("at 25 °C")
    assert number(None, {}) is None
    assert number(value(math.nan, 0.1), {}) is None


def test_padding_puts_decimal_points_in_line() -> None:
    column = [number(value(x, u), {}) for x, u in ((78.36, 0.05), (2.0, 1.0), (5.5, 0.1))]
    most = max(map(places, column))
    style = (ROOT / "site_src" / "pages" / "assets" / "tables.css").read_text(encoding="utf-8")
    ends = set()
    for item in column:
        assert item is not None
        whole, point, decimals = item.value.partition(".")
        classes = padding(most, places(item)).split()
        assert bool(point) != ("point" in classes), (whole, classes)
        ends.add(len(decimals) + sum(int(c[3:]) for c in classes if c.startswith("pad")))
        assert all(f".{name} {{" in style for name in classes)
    assert ends == {most}
    assert padding(most, places(None)) == ""


def test_cells() -> None:
    made = number(value(20.5, 0.1, "extrapolated"), {})
    cell = cell_markup(made, "ref")
    assert cell.startswith('<td class="n ref" data-v="20.5">')
    assert '20.50<sup class="mark">x</sup><small>±\u202f0.10</small></td>' in cell
    assert cell_markup(None) == '<td class="n none">–</td>'
    assert cell_markup(None, "ref") == '<td class="n none ref">–</td>'
    assert cell_markup(made, "ref", " point pad2").startswith('<td class="n point pad2 ref" data-v')


def test_every_mark_has_a_letter_of_its_own() -> None:
    assert {mark.key for mark in MARKS} == set(MEANINGS)
    assert len({mark.letter for mark in MARKS}) == len(MARKS)
    assert all(mark.label != mark.key for mark in MARKS if "-" in mark.key)


def test_every_mark_is_explained_to_the_reader() -> None:
    page = ROOT / "site_src" / "pages" / "how-to-read.md"
    rows = re.findall(r"^\| (\w) \| ([\w ]+) \|", page.read_text(encoding="utf-8"), re.MULTILINE)
    assert {(m.letter, m.label) for m in MARKS} == set(rows)


def test_marks_of_keeps_a_steady_order() -> None:
    numbers = [number(value(2.0, 0.1, m), {}) for m in ("corrected", "extrapolated", "corrected")]
    assert [mark.key for mark in marks_of(*numbers, None)] == ["extrapolated", "corrected"]


def test_printed_values_and_prose() -> None:
    assert printed_label("8e-06", "S/m") == "8×10⁻⁶ S m⁻¹"
    assert printed_label("-94.7", "degC") == "−94.7 °C"
    assert prose("melting point: -57.1 degC, not 1,2-x") == "melting point: −57.1 °C, not 1,2-x"
