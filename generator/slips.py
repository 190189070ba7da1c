"""The usual slips of people who copy numbers: what else a printed value may have been.

Each suggestion is another value with the words for what would have happened. They are tried when
a cell is under suspicion; one is named only when its value satisfies every check.
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass
from itertools import pairwise

from generator.quantities import QUANTITIES
from generator.units import DEBYE, ZERO_CELSIUS, convert

_MINUS = "\u2212"


@dataclass(frozen=True, slots=True)
class Slip:
    """Another value [the quantity's unit], the words for the slip, and how odd a slip it is."""

    value: float
    words: str
    column: str = "value"
    rarity: float = 0.0


def slips(printed: str, unit: str, quantity: str) -> Iterator[Slip]:
    """What a printed value [unit] of a quantity may have been before the usual slips."""
    own = QUANTITIES[quantity].unit
    temperature = own == "degC"
    seen = {printed}
    for text, words, rarity in _respelled(printed, temperature):
        if text not in seen:
            seen.add(text)
            yield Slip(convert(float(text), unit, own), words, rarity=rarity)
    number = float(printed)
    if temperature:
        yield from _temperature_scales(number, unit, own)
    if quantity == "density" and unit == own:
        yield Slip(number / 1000, f"{number:g} kg/m3 would fit: the unit is mixed up", "unit")
    if quantity == "dipole_moment" and number:
        yield Slip(number / DEBYE, f"{number:g} C m would fit: the unit is mixed up", "unit")
        yield Slip(number / 1e30 / DEBYE, f"{number:g}e-30 C m would fit: the unit is mixed up",
                   "unit")  # fmt: skip


def _temperature_scales(number: float, unit: str, own: str) -> Iterator[Slip]:
    words = "{} would fit: {:g} is in another scale"
    for scale, name in (("K", "K"), ("degC", "°C"), ("degF", "°F")):
        if scale != unit:
            yield Slip(convert(number, scale, own), words.format(f"{number:g} {name}", number),
                       "unit")  # fmt: skip
    yield Slip(convert(number + ZERO_CELSIUS, unit, own), "273.15 was subtracted twice", rarity=0.5)


def _respelled(printed: str, temperature: bool) -> Iterator[tuple[str, str, float]]:
    """Other spellings of the digits: sign, shifted point, swapped, doubled or lost digits."""
    sign = "-" if printed.startswith(("-", _MINUS)) else ""
    digits = printed.lstrip("-+" + _MINUS)
    if not digits.replace(".", "", 1).isdigit():
        return
    if temperature:
        yield (digits if sign else f"-{digits}"), "the opposite sign would fit", 0.0
    few = 2 if temperature else 6
    for shift, words in ((1, "×10"), (-1, "÷10"), (2, "×100"), (-2, "÷100"), (3, "×1000"),
                         (-3, "÷1000"))[:few]:  # fmt: skip
        text = f"{float(printed) * 10.0**shift:.12g}"
        yield text, f"{words} would fit: the point is shifted", 0.0
    marks = [i for i, character in enumerate(digits) if character.isdigit()]
    for one, other in pairwise(marks):
        swapped = list(digits)
        swapped[one], swapped[other] = swapped[other], swapped[one]
        text = sign + "".join(swapped)
        yield text, f"swapped digits: {text} would fit", 0.0
    for mark in marks:
        for digit in "0123456789":
            # A digit mistyped, or one left out, at this place.
            other_digit = sign + digits[:mark] + digit + digits[mark + 1 :]
            yield other_digit, f"one digit mistyped: {other_digit} would fit", 1.0
    if len(marks) >= 3:
        for mark in marks:
            shorter = sign + digits[:mark] + digits[mark + 1 :]
            yield shorter, f"one digit too many: {shorter} would fit", 0.7
        for digit in "123456789":
            # The first digit lost: 46.5 for 146.5.
            longer = sign + digit + digits
            yield longer, f"a digit is missing: {longer} would fit", 1.0
        point = digits.find(".")
        for mark in marks:
            if point >= 0 and mark > point:
                for digit in "0123456789":
                    longer = sign + digits[:mark] + digit + digits[mark:]
                    yield longer, f"a digit is missing: {longer} would fit", 1.5
