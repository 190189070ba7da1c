"""Whether a number typed as °C is in kelvin, and what to type instead."""

from __future__ import annotations

from collections.abc import Sequence
from statistics import median

from generator.typed import Ends
from generator.units import ZERO_CELSIUS

# Temperatures at which laboratories measure, in kelvin and rounded to it.
_HABITS = (273, 283, 288, 293, 298, 300, 303, 308, 313, 318, 323)
_ROOM = (293, 298)
# Between these a temperature of a liquid is usually met in kelvin; above _WARM it must be where
# it ends in .15.
_LOWEST, _HIGHEST, _WARM = 250.0, 400.0, 150.0
_AROUND = 10.0  # K: how far from its melting and boiling point a substance may be measured
_HIGH_MELTING = 100.0  # °C: such liquids may well be measured at 293 or 298 °C
# Points of the same substance agree within this where they are right [K].
_AGREE, _COINCIDE = 5.0, 2.0


def looks_like_kelvin(celsius: float, ends: Ends) -> bool:
    """Whether a temperature typed as °C is most likely in kelvin.

    Either it ends in .15 as no reading in °C does, or the substance would have boiled away, and
    was liquid at that many kelvin. Where no boiling point is known, or a very high one, only the
    usual temperatures of a laboratory count.
    """
    if ends_in_15(celsius):
        return True
    if not _LOWEST <= celsius <= _HIGHEST:
        return False
    if ends.melts is not None and celsius - ZERO_CELSIUS < ends.melts - _AROUND:
        return False
    if ends.boils is None:
        return _is_one_of(celsius, _HABITS)
    if celsius > ends.boils + 2 * _AROUND:
        return True
    return _is_one_of(celsius, _ROOM) and (ends.melts is None or ends.melts < _HIGH_MELTING)


def point_in_kelvin(celsius: float, others: Sequence[float]) -> float | None:
    """The melting, boiling or flash point [°C] meant, where the scale of one was mixed up.

    ``others`` [°C] are the same point after other rows; they must agree with each other, and
    with the number read in the other scale. Without others only an ending in .15 tells.
    """
    if not others:
        return celsius - ZERO_CELSIUS if ends_in_15(celsius) else None
    if max(others) - min(others) > _AGREE:
        return None
    for meant in (celsius - ZERO_CELSIUS, celsius + ZERO_CELSIUS):
        if abs(meant - median(others)) <= _COINCIDE:
            return meant
    return None


def in_celsius(kelvin: float) -> str:
    """A temperature in kelvin as it is typed in °C: 293.15 and 293 give 20, 353.3 gives 80.15."""
    celsius = kelvin - ZERO_CELSIUS
    return f"{round(celsius) if kelvin.is_integer() else round(celsius, 2):g}"


def ends_in_15(celsius: float) -> bool:
    """Whether a temperature has the decimals of a round one in kelvin: 293.15."""
    return celsius >= _WARM and abs((celsius - 0.15) - round(celsius - 0.15)) < 1e-6


def _is_one_of(celsius: float, temperatures: Sequence[float]) -> bool:
    return any(abs(celsius - usual) <= 0.2 for usual in temperatures)
