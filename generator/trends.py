"""What the permittivity does on warming: the observed slope, its uncertainty and its sign."""

from __future__ import annotations

import math
from dataclasses import dataclass

from generator import thermal
from generator.curves import (
    SHORTEST_SPAN,
    curve_slope,
    curve_uncertainty,
    curve_values,
    line_through,
    rank_curves,
    within,
)
from generator.dataset import Correlation, Dataset
from generator.reconcile import REACH
from generator.units import ZERO_CELSIUS
from generator.values import Value

_EPS = "relative_permittivity"
# A curve that turns in this outer share of its range follows its own fit there, not the liquid.
_OUTER = 0.25


@dataclass(frozen=True, slots=True)
class Trend:
    """Observed slope dε/dT [1/K] with its sign: falls, rises, no trend, not known.

    ``remark`` says what a reader must know about it, "" where there is nothing to say.
    """

    value: float
    uncertainty: float
    sign: str
    temperature: float | None
    basis: str
    sources: tuple[str, ...]
    remark: str = ""


_UNKNOWN = Trend(math.nan, math.nan, "not known", None, "measured", ())


def trend_at(
    dataset: Dataset, solvent: str, value: Value | None, temperature: float, association: str
) -> Trend:
    """Slope of ε at ``temperature`` [K], or at the end of its curve's range where that is near.

    From the best curve inside its range, else from a weighted line through the points.
    ``value`` is the permittivity there, None where there is none; ``association`` the reason why
    the liquid is associated, "" where it is not.
    """
    if value is None or value.basis == "estimated":
        return _UNKNOWN
    for curve in rank_curves(dataset, solvent, _EPS):
        if within(curve, temperature, REACH) and curve.t_max - curve.t_min >= SHORTEST_SPAN:
            return _of_curve(dataset, curve, temperature, association)
    points = dataset.measurements_of(solvent, _EPS)
    line = line_through(dataset, points, temperature)
    if line is None:
        return _UNKNOWN
    sign = thermal.sign_of(line.slope, line.slope_uncertainty)
    sources = tuple(dict.fromkeys(p.source for p in points))
    remark = _against_agitation(sign, association)
    return Trend(line.slope, line.slope_uncertainty, sign, temperature, "measured", sources, remark)


def _of_curve(dataset: Dataset, curve: Correlation, temperature: float, association: str) -> Trend:
    width = curve.t_max - curve.t_min
    place = min(max(temperature, curve.t_min), curve.t_max)
    slope = curve_slope(curve, place, _EPS)
    (at,) = curve_values(curve, [place], _EPS)
    # The slope of a straight line through evenly spread points of uncertainty u.
    spread = math.sqrt(12) * curve_uncertainty(dataset, curve, at)[0] / width
    remark = ""
    turn = thermal.turning_point(curve.form, curve.coefficients, curve.t_min, curve.t_max)
    if turn is not None and _same_end(curve, turn, place):
        # Without the turn the slope would be about that over the whole range.
        first, last = curve_values(curve, [curve.t_min, curve.t_max], _EPS)
        spread = math.hypot(spread, slope - (last - first) / width)
        remark = (
            f"the curve turns at {turn - ZERO_CELSIUS:.0f} °C, near the end of its range: that is "
            "the fit, not the liquid, and the slope there is not to be relied upon"
        )
    sign = thermal.sign_of(slope, spread)
    remark = remark or _against_agitation(sign, association)
    return Trend(slope, spread, sign, place, "curve", (curve.source,), remark)


def _same_end(curve: Correlation, turn: float, place: float) -> bool:
    """Whether the turn and the place both lie in the same outer part of the range."""
    outer = _OUTER * (curve.t_max - curve.t_min)
    at_high = min(turn, place) >= curve.t_max - outer
    return at_high or max(turn, place) <= curve.t_min + outer


def _against_agitation(sign: str, association: str) -> str:
    """Why a permittivity may rise although thermal agitation turns dipoles out of the field."""
    if sign != "rises" or not association:
        return ""
    return f"rises against thermal agitation as association loosens on warming ({association})"
