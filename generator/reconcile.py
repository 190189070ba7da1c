"""Several sources for one quantity → one chosen value, with where it came from.

The rule, in order. At a temperature: a curve inside its range; points within half a kelvin;
a curve at most ``REACH`` outside its range, marked ``extrapolated``; the nearest point at most
``REACH`` away, taken unchanged with an uncertainty that grows by the usual slope, marked
``carried``; else nothing. Outside the liquid range: nothing. Several points stand in by their
median, which one wrong entry cannot move far. Measured comes before calculated.
"""

from __future__ import annotations

import math
from collections.abc import Iterable, Sequence
from dataclasses import dataclass
from statistics import median

import numpy as np

from generator import thermal
from generator.dataset import Correlation, Dataset, Measurement
from generator.quantities import QUANTITIES
from generator.units import ZERO_CELSIUS, convert, convert_difference

EXTRAPOLATED = "extrapolated"
OUTSIDE_LIQUID_RANGE = "outside-liquid-range"
LOWER_BOUND = "lower-bound"
CARRIED = "carried"
ASSOCIATED = "associated"
CORRECTED = "corrected"
# What each mark means, as pages and the data dictionary say it.
MARKS = {
    EXTRAPOLATED: "outside the stated range of its curve",
    OUTSIDE_LIQUID_RANGE: "outside the liquid range",
    LOWER_BOUND: "no uncertainty stated: rounding of the printed value only, a lower bound",
    CARRIED: "measured at another temperature and taken unchanged, uncertainty widened",
    ASSOCIATED: "the formula is not valid for associated liquids",
    CORRECTED: "a published value was set aside or replaced, see the corrections",
}

SAME_TEMPERATURE = 0.6  # K: 293 K, 20 °C and 293.2 K are one temperature
REACH = 10.0  # K
EDGE = 0.051  # K: printed ends of ranges are rounded
# Usual relative slope by kelvin, to widen a value that is taken to another temperature.
_USUAL_SLOPE = {
    "relative_permittivity": 0.005,
    "refractive_index": 0.0004,
    "density": 0.0012,
    "viscosity": 0.02,
    "vapour_pressure": 0.05,
    "conductivity": 0.03,
}
_CALCULATED = "calculated"
# A calculated moment misses measured ones by about this much.
_CALCULATED_SHARE = 0.10


@dataclass(frozen=True, slots=True)
class Value:
    """One number of the handbook with everything that must travel with it.

    ``value`` and ``uncertainty`` (standard) are in the quantity's unit, ``temperature`` in kelvin
    (None where the quantity has none). ``basis`` is measured, curve, computed or estimated.
    """

    quantity: str
    value: float
    uncertainty: float
    temperature: float | None
    basis: str
    sources: tuple[str, ...]
    marks: tuple[str, ...] = ()


@dataclass(frozen=True, slots=True)
class LiquidRange:
    """Melting and boiling point [K], None where not known."""

    low: float | None
    high: float | None

    def holds(self, temperature: float) -> bool:
        """Whether the substance is liquid at ``temperature`` [K], as far as is known."""
        above = self.low is None or temperature >= self.low - EDGE
        return above and (self.high is None or temperature <= self.high + EDGE)


def liquid_range(dataset: Dataset, solvent: str) -> LiquidRange:
    """The liquid range of a substance from its chosen melting and boiling point."""
    ends = [choose_constant(dataset, solvent, key) for key in ("melting_point", "boiling_point")]
    low, high = (None if v is None else v.value + ZERO_CELSIUS for v in ends)
    if low is not None and high is not None and low >= high:
        return LiquidRange(None, None)
    return LiquidRange(low, high)


def point_uncertainty(point: Measurement) -> float:
    """Standard uncertainty of a point [its quantity's unit]: stated, or the rounding half-width."""
    return point.half_width if point.uncertainty is None else point.uncertainty


def curve_values(
    curve: Correlation, temperatures: Sequence[float], key: str
) -> tuple[float, ...]:
    """A curve at ``temperatures`` [K], in the unit of quantity ``key``."""
    raw = thermal.evaluate(curve.form, curve.coefficients, np.asarray(temperatures))
    unit = QUANTITIES[key].unit
    return tuple(convert(float(y), curve.unit, unit) for y in np.atleast_1d(raw))


def curve_slope(curve: Correlation, temperature: float, key: str) -> float:
    """Slope of a curve at ``temperature`` [K], in the unit of quantity ``key`` per kelvin."""
    raw = float(thermal.derivative(curve.form, curve.coefficients, temperature))
    return convert_difference(raw, curve.unit, QUANTITIES[key].unit)


def curve_uncertainty(dataset: Dataset, curve: Correlation) -> tuple[float, bool]:
    """Standard uncertainty of a curve [the quantity's unit], and whether it is a lower bound.

    Where none is stated: the distance from the points of the same quantity inside its range, or
    the rounding of those points, whichever is larger.
    """
    quantity = QUANTITIES[curve.quantity]
    if curve.uncertainty is not None:
        return convert_difference(curve.uncertainty, curve.unit, quantity.unit), False
    floor = 0.5 * 10.0**-quantity.decimals
    points = [
        p
        for p in dataset.measurements_of(curve.solvent, curve.quantity)
        if p.temperature is not None and within(curve, p.temperature)
    ]
    if points:
        at = curve_values(curve, [_kelvin(p) for p in points], curve.quantity)
        misses = [abs(p.value - y) for p, y in zip(points, at, strict=True)]
        floor = max(median(misses), median([p.half_width for p in points]))
    return floor, True


def within(curve: Correlation, temperature: float, reach: float = EDGE) -> bool:
    """Whether ``temperature`` [K] lies in the curve's range, give or take ``reach`` [K]."""
    return curve.t_min - reach <= temperature <= curve.t_max + reach


def rank_curves(dataset: Dataset, solvent: str, key: str) -> tuple[Correlation, ...]:
    """Curves, best first: the laboratory's own, then stated uncertainty, then table order."""

    def rank(curve: Correlation) -> tuple[bool, bool]:
        source = dataset.sources.get(curve.source)
        own = source is not None and source.kind == "laboratory"
        return (not own, curve.uncertainty is None)

    return tuple(sorted(dataset.correlations_of(solvent, key), key=rank))


def choose_constant(dataset: Dataset, solvent: str, key: str) -> Value | None:
    """The chosen value of a quantity that has no temperature, or None."""
    points = dataset.measurements_of(solvent, key)
    measured = [p for p in points if not _is_calculated(dataset, p)]
    if measured:
        return _combined(measured, None, "measured")
    if not points:
        return None
    value = _combined(points, None, "estimated")
    spread = max(value.uncertainty, _CALCULATED_SHARE * abs(value.value))
    return Value(key, value.value, spread, None, "estimated", value.sources, _drop(value.marks))


def choose(
    dataset: Dataset,
    solvent: str,
    key: str,
    temperatures: Sequence[float],
    liquid: LiquidRange,
) -> tuple[Value | None, ...]:
    """The chosen value at each of ``temperatures`` [K]; None where there is none to stand for."""
    points = [p for p in dataset.measurements_of(solvent, key) if p.temperature is not None]
    curves = rank_curves(dataset, solvent, key)
    result: list[Value | None] = []
    for temperature in temperatures:
        chosen = None
        if liquid.holds(temperature):
            chosen = (
                _from_curve(dataset, curves, key, temperature, EDGE)
                or _from_points(points, temperature)
                or _from_curve(dataset, curves, key, temperature, REACH)
                or _carried(points, key, temperature)
            )
        result.append(chosen)
    return tuple(result)


def _from_curve(
    dataset: Dataset, curves: Iterable[Correlation], key: str, temperature: float, reach: float
) -> Value | None:
    bounds = QUANTITIES[key]
    for curve in curves:
        if not within(curve, temperature, reach):
            continue
        (value,) = curve_values(curve, [temperature], key)
        if not (math.isfinite(value) and bounds.low <= value <= bounds.high):
            continue
        uncertainty, lower_bound = curve_uncertainty(dataset, curve)
        marks = [LOWER_BOUND] if lower_bound else []
        if reach > EDGE:
            beyond = max(curve.t_min - temperature, temperature - curve.t_max)
            slope = abs(curve_slope(curve, temperature, key))
            uncertainty = math.hypot(uncertainty, 0.2 * slope * beyond)
            marks.append(EXTRAPOLATED)
        return Value(key, value, uncertainty, temperature, "curve", (curve.source,), tuple(marks))
    return None


def _from_points(points: Sequence[Measurement], temperature: float) -> Value | None:
    near = [p for p in points if abs(_kelvin(p) - temperature) <= SAME_TEMPERATURE]
    return _combined(near, temperature, "measured") if near else None


def _carried(points: Sequence[Measurement], key: str, temperature: float) -> Value | None:
    if not points:
        return None
    nearest = min(abs(_kelvin(p) - temperature) for p in points)
    if nearest > REACH:
        return None
    near = [p for p in points if abs(_kelvin(p) - temperature) <= nearest + SAME_TEMPERATURE]
    value = _combined(near, temperature, "measured")
    # The unpolar part of ε and n does not move: 1 is what vacuum keeps.
    offset = 1.0 if key in ("relative_permittivity", "refractive_index") else 0.0
    drift = _USUAL_SLOPE[key] * (value.value - offset) * nearest
    return Value(
        key,
        value.value,
        math.hypot(value.uncertainty, drift),
        temperature,
        "measured",
        value.sources,
        (*value.marks, CARRIED),
    )


def _combined(points: Sequence[Measurement], temperature: float | None, basis: str) -> Value:
    """Median of the points; its uncertainty from their scatter, at least that of the best."""
    values = [p.value for p in points]
    middle = median(values)
    own = min(point_uncertainty(p) for p in points)
    if len(points) > 1:
        # 1.4826 MAD estimates σ of a normal spread; the median of n has √(π/2)/√n of it.
        mad = median(abs(v - middle) for v in values)
        own = max(own, 1.4826 * mad * math.sqrt(math.pi / 2 / len(points)))
    marks = []
    if all(p.uncertainty is None for p in points):
        marks.append(LOWER_BOUND)
    if any(p.correction is not None for p in points):
        marks.append(CORRECTED)
    sources = tuple(dict.fromkeys(p.source for p in points))
    return Value(points[0].quantity, middle, own, temperature, basis, sources, tuple(marks))


def _is_calculated(dataset: Dataset, point: Measurement) -> bool:
    source = dataset.sources.get(point.source)
    return source is not None and source.kind == _CALCULATED


def _drop(marks: Iterable[str]) -> tuple[str, ...]:
    return tuple(m for m in marks if m != LOWER_BOUND)


def _kelvin(point: Measurement) -> float:
    return math.nan if point.temperature is None else point.temperature


