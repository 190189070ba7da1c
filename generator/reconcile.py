"""Several sources for one quantity → one chosen value, with the whole trail of how.

The rule. Points of the tables are brought to the temperature asked for with the slope of a curve
of the same quantity, of a line through the points themselves, or (marked ``carried``) unchanged
with an uncertainty that grows by the usual slope; never over more than ``REACH``. A curve counts
inside its range; at most ``REACH`` outside it, marked ``extrapolated``, where nothing else is
there. Values that lie further from the others than their uncertainties and the common spread
allow are set aside and named. What is left gives a mean with weights 1/u², whose uncertainty
grows by the Birge ratio. Measured comes before calculated, and nothing is given outside the
liquid range.
"""

from __future__ import annotations

import math
from collections.abc import Iterable, Sequence
from dataclasses import dataclass
from statistics import median

from generator.curves import (
    curve_slope,
    curve_uncertainty,
    curve_values,
    line_through,
    rank_curves,
    within,
)
from generator.dataset import Correlation, Dataset, Measurement
from generator.quantities import QUANTITIES
from generator.uncertainty import weighted_mean
from generator.units import ZERO_CELSIUS
from generator.values import (
    CARRIED,
    CORRECTED,
    EDGE,
    ESTIMATED,
    EXTRAPOLATED,
    LiquidRange,
    Value,
    uncertainty_of,
)

SAME_TEMPERATURE = 0.6  # K: 293 K, 20 °C and 293.2 K are one temperature
REACH = 10.0  # K
# A value of less weight than this does not hand its marks on.
_SAYS_SOMETHING = 0.05
# Usual relative slope by kelvin, to widen a value that is taken to another temperature unchanged.
_USUAL_SLOPE = {
    "relative_permittivity": 0.005,
    "refractive_index": 0.0004,
    "density": 0.0012,
    "viscosity": 0.02,
    "vapour_pressure": 0.05,
    "conductivity": 0.03,
}
# A slope used to bring a point over is itself wrong by about this share.
_SLOPE_SHARE = 0.1
_CALCULATED = "calculated"
# Further out than this many times its own and the common spread, a value is set aside.
OUTLIER = 3.5


def liquid_range(dataset: Dataset, solvent: str) -> LiquidRange:
    """The liquid range of a substance from its chosen melting and boiling point."""
    ends = [choose_constant(dataset, solvent, key) for key in ("melting_point", "boiling_point")]
    low, high = (None if v is None else v.value + ZERO_CELSIUS for v in ends)
    if low is not None and high is not None and low >= high:
        return LiquidRange(None, None)
    return LiquidRange(low, high)


@dataclass(frozen=True, slots=True)
class Candidate:
    """One value that took part in a decision, brought to the temperature asked for.

    ``weight`` is its share of the mean (0 when it was set aside); ``remark`` says what happened
    to it. ``file`` and ``line`` are its place in the tables.
    """

    source: str
    file: str
    line: int
    printed: str
    value: float
    uncertainty: float
    weight: float
    remark: str


@dataclass(frozen=True, slots=True)
class Decision:
    """A chosen value and the trail that led to it; ``value`` is None where nothing could be."""

    value: Value | None
    candidates: tuple[Candidate, ...]
    birge_ratio: float


@dataclass(frozen=True, slots=True)
class _Entry:
    """A point or a curve at one temperature, on its way into the mean."""

    origin: Measurement | Correlation
    value: float
    uncertainty: float
    remark: str
    marks: tuple[str, ...]


_NOTHING = Decision(None, (), 0.0)


def choose_constant(dataset: Dataset, solvent: str, key: str) -> Value | None:
    """The chosen value of a quantity that has no temperature, or None."""
    return decide(dataset, solvent, key, None, LiquidRange(None, None)).value


def choose(
    dataset: Dataset,
    solvent: str,
    key: str,
    temperatures: Sequence[float],
    liquid: LiquidRange,
) -> tuple[Value | None, ...]:
    """The chosen value at each of ``temperatures`` [K]; None where there is none to stand for."""
    return tuple(decide(dataset, solvent, key, t, liquid).value for t in temperatures)


def choose_by_degree(
    dataset: Dataset, solvent: str, key: str, liquid: LiquidRange
) -> tuple[Value, ...]:
    """The chosen value at every whole °C at which there is one."""
    known = [p.temperature for p in dataset.measurements_of(solvent, key) if p.temperature]
    known += [t for c in dataset.correlations_of(solvent, key) for t in (c.t_min, c.t_max)]
    if not known:
        return ()
    first = math.ceil(min(known) - REACH - ZERO_CELSIUS)
    last = math.floor(max(known) + REACH - ZERO_CELSIUS)
    degrees = [ZERO_CELSIUS + degree for degree in range(first, last + 1)]
    return tuple(v for v in choose(dataset, solvent, key, degrees, liquid) if v is not None)


def decide(
    dataset: Dataset,
    solvent: str,
    key: str,
    temperature: float | None,
    liquid: LiquidRange,
) -> Decision:
    """Choose one value [unit of ``key``] at ``temperature`` [K], and say how it came about."""
    if temperature is not None and not liquid.holds(temperature):
        return _NOTHING
    points = [
        p
        for p in dataset.measurements_of(solvent, key)
        if (p.temperature is None) == (temperature is None)
    ]
    measured = [p for p in points if not _is_calculated(dataset, p)]
    if temperature is None:
        entries = [_at_rest(dataset, p) for p in measured or points]
    else:
        curves = rank_curves(dataset, solvent, key)
        entries = _around(dataset, curves, measured or points, key, temperature)
    if not entries:
        return _NOTHING
    return _merge(entries, key, temperature, estimated=not measured and bool(points))


def _around(
    dataset: Dataset,
    curves: Sequence[Correlation],
    points: Sequence[Measurement],
    key: str,
    temperature: float,
) -> list[_Entry]:
    """Everything that can speak for ``temperature`` [K], the best curve first."""
    near = [p for p in points if abs(_kelvin(p) - temperature) <= REACH]
    same = [p for p in near if abs(_kelvin(p) - temperature) <= SAME_TEMPERATURE]
    inside = _first(_of_curve(dataset, c, key, temperature, EDGE) for c in curves)
    brought = [_brought(dataset, p, curves, points, temperature) for p in near]
    sloped = [e for e in brought if CARRIED not in e.marks]
    if inside is not None:
        return [inside, *sloped]
    if same or sloped:
        return [e for e in brought if e in sloped or e.origin in same]
    beyond = _first(_of_curve(dataset, c, key, temperature, REACH) for c in curves)
    if beyond is not None:
        return [beyond]
    nearest = min((abs(_kelvin(p) - temperature) for p in near), default=0.0)
    return [
        e
        for p, e in zip(near, brought, strict=True)
        if abs(_kelvin(p) - temperature) <= nearest + SAME_TEMPERATURE
    ]


def _at_rest(dataset: Dataset, point: Measurement) -> _Entry:
    own, mark = uncertainty_of(dataset, point)
    marks = [m for m in (mark, CORRECTED if point.correction is not None else None) if m]
    return _Entry(point, point.value, own, "as published", tuple(marks))


def _brought(
    dataset: Dataset,
    point: Measurement,
    curves: Sequence[Correlation],
    points: Sequence[Measurement],
    temperature: float,
) -> _Entry:
    """A point brought to ``temperature`` [K] by the best slope that is known."""
    entry = _at_rest(dataset, point)
    start = _kelvin(point)
    away = temperature - start
    if abs(away) <= SAME_TEMPERATURE:
        return entry
    key = point.quantity
    for curve in curves:
        if within(curve, start) and within(curve, temperature):
            here, there = curve_values(curve, [start, temperature], key)
            # A curve that is off as a whole still has the right shape.
            value = entry.value * there / here if here > 0 else entry.value + there - here
            remark = f"brought over {away:+.1f} K by the curve of {curve.source}"
            return _moved(entry, value, _SLOPE_SHARE * abs(value - entry.value), remark, ())
    line = line_through(dataset, points, temperature)
    if line is not None:
        value = entry.value + line.slope * away
        remark = f"brought over {away:+.1f} K by a line through the points"
        return _moved(entry, value, line.slope_uncertainty * abs(away), remark, ())
    # The unpolar part of ε and n does not move: 1 is what vacuum keeps.
    offset = 1.0 if key in ("relative_permittivity", "refractive_index") else 0.0
    drift = _USUAL_SLOPE[key] * abs((entry.value - offset) * away)
    remark = f"taken unchanged over {away:+.1f} K, no slope is known"
    return _moved(entry, entry.value, drift, remark, (CARRIED,))


def _moved(
    entry: _Entry, value: float, added: float, remark: str, marks: tuple[str, ...]
) -> _Entry:
    uncertainty = math.hypot(entry.uncertainty, added)
    return _Entry(entry.origin, value, uncertainty, remark, (*entry.marks, *marks))


def _of_curve(
    dataset: Dataset, curve: Correlation, key: str, temperature: float, reach: float
) -> _Entry | None:
    if not within(curve, temperature, reach):
        return None
    bounds = QUANTITIES[key]
    (value,) = curve_values(curve, [temperature], key)
    if not (math.isfinite(value) and bounds.low <= value <= bounds.high):
        return None
    uncertainty, mark = curve_uncertainty(dataset, curve, value)
    marks = [mark] if mark else []
    remark = "the curve, inside its range"
    if not within(curve, temperature):
        beyond = max(curve.t_min - temperature, temperature - curve.t_max)
        slope = abs(curve_slope(curve, temperature, key))
        uncertainty = math.hypot(uncertainty, 2 * _SLOPE_SHARE * slope * beyond)
        marks.append(EXTRAPOLATED)
        remark = f"the curve, {beyond:.1f} K outside its range"
    return _Entry(curve, value, uncertainty, remark, tuple(marks))


def _merge(
    entries: Sequence[_Entry], key: str, temperature: float | None, *, estimated: bool
) -> Decision:
    """Set outliers aside, then the mean with weights 1/u² and its Birge ratio."""
    kept = _without_outliers(entries)
    # Values exactly zero (a moment that symmetry forbids) carry no weight problem of their own.
    spreads = [max(e.uncertainty, 1e-12 * max(abs(e.value), 1e-300)) for e in kept]
    mean, own, birge = weighted_mean([e.value for e in kept], spreads)
    # Published tables copy each other: agreeing with others makes no value better than the best.
    own = max(own, min(spreads))
    total = sum(1 / u**2 for u in spreads)
    weights = {id(e): 1 / u**2 / total for e, u in zip(kept, spreads, strict=True)}
    leading = max(kept, key=lambda e: weights[id(e)])
    basis = "curve" if isinstance(leading.origin, Correlation) else "measured"
    marks = dict.fromkeys(m for e in kept for m in e.marks if weights[id(e)] >= _SAYS_SOMETHING)
    value = Value(
        key,
        mean,
        own,
        temperature,
        "estimated" if estimated else basis,
        tuple(dict.fromkeys(e.origin.source for e in kept)),
        (*marks, ESTIMATED) if estimated else tuple(marks),
    )
    trail = tuple(_candidate(e, weights.get(id(e))) for e in entries)
    return Decision(value, trail, birge)


def _without_outliers(entries: Sequence[_Entry]) -> list[_Entry]:
    """Entries within ``OUTLIER`` times their own and the common spread of the median."""
    if len(entries) < 3:
        return list(entries)
    middle = median(e.value for e in entries)
    common = 1.4826 * median(abs(e.value - middle) for e in entries)
    kept = [
        e for e in entries if abs(e.value - middle) <= OUTLIER * math.hypot(common, e.uncertainty)
    ]
    return kept or list(entries)


def _candidate(entry: _Entry, weight: float | None) -> Candidate:
    origin = entry.origin
    if isinstance(origin, Correlation):
        file, printed = "correlations.csv", f"curve {origin.form}"
    else:
        file, printed = "measurements.csv", f"{origin.printed} {origin.printed_unit}".strip()
    aside = "" if weight is not None else "; set aside, too far from the others"
    return Candidate(
        origin.source,
        file,
        origin.line,
        printed,
        entry.value,
        entry.uncertainty,
        weight or 0.0,
        entry.remark + aside,
    )


def _first(entries: Iterable[_Entry | None]) -> _Entry | None:
    return next((e for e in entries if e is not None), None)


def _is_calculated(dataset: Dataset, point: Measurement) -> bool:
    source = dataset.sources.get(point.source)
    return source is not None and source.kind == _CALCULATED


def _kelvin(point: Measurement) -> float:
    return math.nan if point.temperature is None else point.temperature
