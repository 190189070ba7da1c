"""What a value may have been before the usual slips."""

from __future__ import annotations

import pytest

from generator.slips import slips

# printed, unit, quantity, value before the slip [the quantity's unit], words
CASES = (
    ("1.4246", "1", "refractive_index", 1.4264, "swapped digits"),
    ("8.03", "1", "relative_permittivity", 80.3, "point is shifted"),
    ("876.5", "g/cm3", "density", 0.8765, "kg/m3 would fit"),
    ("9.61", "D", "dipole_moment", 2.881, "C m would fit"),
    ("-95", "degC", "melting_point", 95.0, "opposite sign"),
    ("353.2", "degC", "boiling_point", 80.05, "another scale"),
    ("46.5", "degC", "boiling_point", 146.5, "a digit is missing"),
    ("1.5264", "1", "refractive_index", 1.4264, "mistyped"),
)


@pytest.mark.parametrize(("printed", "unit", "quantity", "before", "words"), CASES)
def test_usual_slips_are_thought_of(
    printed: str, unit: str, quantity: str, before: float, words: str
) -> None:
    fitting = [
        slip.words
        for slip in slips(printed, unit, quantity)
        if slip.value == pytest.approx(before, rel=2e-3)
    ]
    assert any(words in text for text in fitting), fitting


def test_every_suggestion_is_another_value() -> None:
    found = [slip.value for slip in slips("7.58", "1", "relative_permittivity")]
    assert 7.58 not in found
    assert 7.85 in [round(value, 6) for value in found]


def test_odd_slips_count_for_less_than_plain_ones() -> None:
    quantity = "relative_permittivity"
    rarity = {slip.words.split(":")[0]: slip.rarity for slip in slips("7.58", "1", quantity)}
    assert rarity["swapped digits"] < rarity["one digit mistyped"]
