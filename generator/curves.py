"""Temperature curves of the tables: values and slopes in the quantity's unit, uncertainty, rank.

Also the straight line through points of the tables, which does for a curve where there is none.
"""

from __future__ import annotations

from collections.abc import Sequence
from statistics import median

import numpy as np

from generator import thermal
from generator.dataset import Correlation, Dataset, Measurement
from generator.quantities import QUANTITIES
from generator.units import convert, convert_difference
from generator.values import EDGE, stated_or_usual, uncertainty_of

SHORTEST_SPAN = 4.0  # K: temperatures closer together give no slope


def curve_values(curve: Correlation, temperatures: Sequence[float], key: str) -> tuple[float, ...]:
    """A curve at ``temperatures`` [K], in the unit of quantity ``key``."""
    raw = thermal.evaluate(curve.form, curve.coefficients, np.asarray(temperatures))
    unit = QUANTITIES[key].unit
    return tuple(convert(float(y), curve.unit, unit) for y in np.atleast_1d(raw))


def curve_slope(curve: Correlation, temperature: float, key: str) -> float:
    """Slope of a curve at ``temperature`` [K], in the unit of quantity ``key`` per kelvin."""
    raw = float(thermal.derivative(curve.form, curve.coefficients, temperature))
    return convert_difference(raw, curve.unit, QUANTITIES[key].unit)


def curve_uncertainty(
    dataset: Dataset, curve: Correlation, value: float
) -> tuple[float, str | None]:
    """Standard uncertainty [the quantity's unit] of a curve where it gives ``value``, and its mark.

    Where none is stated, the distance from the points of the same quantity inside its range
    counts as well, if it is larger than what is usual for the kind of source.
    """
    quantity = QUANTITIES[curve.quantity]
    if curve.uncertainty is not None:
        return convert_difference(curve.uncertainty, curve.unit, quantity.unit), None
    own, mark = stated_or_usual(
        dataset, curve.source, curve.quantity, None, value, 0.5 * 10.0**-quantity.decimals
    )
    points = [
        (p.temperature, p.value)
        for p in dataset.measurements_of(curve.solvent, curve.quantity)
        if p.temperature is not None and within(curve, p.temperature)
    ]
    if points:
        at = curve_values(curve, [t for t, _ in points], curve.quantity)
        own = max(own, median(abs(value - y) for (_, value), y in zip(points, at, strict=True)))
    return own, mark


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


def line_through(
    dataset: Dataset, points: Sequence[Measurement], temperature: float
) -> thermal.LineFit | None:
    """A straight line through points whose temperatures reach around ``temperature`` [K]."""
    timed = [p for p in points if p.temperature is not None]
    at = [p.temperature for p in timed if p.temperature is not None]
    if not at or max(at) - min(at) < SHORTEST_SPAN:
        return None
    if not min(at) - EDGE <= temperature <= max(at) + EDGE:
        return None
    own = [uncertainty_of(dataset, p)[0] for p in timed]
    return thermal.fit_line(at, [p.value for p in timed], own)
