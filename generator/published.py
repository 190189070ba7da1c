"""Digits as a handbook printed them, from the floating-point numbers of the open tables.

The open tables hold everything in SI units: a boiling point printed as 56.08 °C stands there as
329.23 K, one printed as 132 °F as 328.70556 K. A blank uncertainty is bounded by the rounding of
the printed digits, so digits that were never printed must not appear here.
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass
from decimal import ROUND_HALF_EVEN, Decimal

ZERO_CELSIUS = Decimal("273.15")
_TOLERANCE = Decimal("0.002")  # K: conversions in the open tables are kept to five digits
# A temperature of measurement that needs no explanation; others lose against these.
_USUAL_TEMPERATURE = 20


@dataclass(frozen=True, slots=True)
class Printed:
    """Digits as printed, with the unit they were printed in."""

    value: str
    unit: str


def plain(number: Decimal) -> str:
    """Without exponent and without trailing zeros after the point."""
    text = f"{number:f}"
    return text.rstrip("0").rstrip(".") if "." in text else text


def fixed(number: Decimal, decimals: int) -> str:
    """Rounded half to even to ``decimals`` places, without a negative zero."""
    rounded = number.quantize(Decimal(1).scaleb(-decimals), rounding=ROUND_HALF_EVEN)
    return f"{rounded + 0:f}" if rounded == 0 else f"{rounded:f}"


def significant(number: float, digits: int) -> str:
    """``number`` to ``digits`` significant digits, in the shortest spelling."""
    return repr(float(f"{number:.{digits - 1}e}"))


def _decimals(number: Decimal) -> int:
    exponent = number.normalize().as_tuple().exponent
    return max(0, -exponent) if isinstance(exponent, int) else 0


def fixed_point(kelvin: str) -> Printed:
    """A melting, boiling or flash point [K] in the scale it was printed in.

    Tried in order: whole or tenth degrees Celsius, whole degrees Fahrenheit, kelvin with at most
    one decimal, hundredth degrees Celsius; an average that fits none is rounded to 0.1 °C.
    """
    temperature = Decimal(kelvin)
    celsius = temperature - ZERO_CELSIUS
    for decimals in (0, 1):
        rounded = fixed(celsius, decimals)
        if abs(celsius - Decimal(rounded)) < _TOLERANCE:
            return Printed(rounded, "degC")
    fahrenheit = celsius * 9 / 5 + 32
    if abs(fahrenheit - round(fahrenheit)) < _TOLERANCE:
        return Printed(fixed(fahrenheit, 0), "degF")
    if _decimals(temperature) <= 1:
        return Printed(plain(temperature), "K")
    rounded = fixed(celsius, 2)
    if abs(celsius - Decimal(rounded)) < _TOLERANCE / 2:
        return Printed(rounded, "degC")
    return Printed(fixed(celsius, 1), "degC")


def temperature_c(kelvin: str) -> str:
    """The temperature of a measurement [K] in °C, no finer than it was printed.

    Handbooks print 293.2 K for 20 °C and 293 K for 20 °C; both come back as they were meant.
    """
    temperature = Decimal(kelvin)
    decimals = _decimals(temperature)
    if decimals == 0:
        return fixed(temperature - ZERO_CELSIUS, 0)
    if decimals == 1 and (temperature - Decimal("273.2")) % 1 == 0:
        return fixed(temperature - Decimal("273.2"), 0)
    return plain(temperature - ZERO_CELSIUS)


def range_c(kelvin: str) -> str:
    """The end of a curve's range [K] in °C, no finer than it was printed."""
    temperature = Decimal(kelvin)
    return plain(Decimal(fixed(temperature - ZERO_CELSIUS, min(2, _decimals(temperature)))))


def split_superscript(number: str) -> Iterator[tuple[str, int]]:
    """Undo a superscript temperature that has run into the digits before it.

    In the packaged table of organic compounds the density 0.7845²⁵ stands as 0.784525 and the
    index 1.3588²⁰ as 1.35882. Yields (digits as printed, °C), most likely first: the temperature
    nearest to 20 °C. Against the table of refractive indices, which has its temperatures in a
    column of their own, this reading holds for all but 10 of 4389 entries.
    """
    whole, _, digits = number.partition(".")
    found = []
    for kept in (4, 3, 2):
        tail = digits[kept:]
        if 1 <= len(tail) <= 2 and len(digits[:kept]) == kept:
            found.append((f"{whole}.{digits[:kept]}", int(tail.ljust(2, "0"))))
    return iter(sorted(found, key=lambda pair: abs(pair[1] - _USUAL_TEMPERATURE)))
