"""What the figures of a substance show, as plain numbers, and the same in words."""

from __future__ import annotations

import math
from collections.abc import Iterator
from dataclasses import dataclass

import numpy as np

from generator.curves import SHORTEST_SPAN, curve_values, line_through, rank_curves
from generator.dataset import Correlation, Dataset
from generator.metrics import Handbook
from generator.pictures import Line, Point
from generator.quantities import QUANTITIES
from generator.reconcile import REACH
from generator.values import EDGE, uncertainty_of
from generator.wording import celsius_label, range_label, split_value

_EPS = "relative_permittivity"
_SAMPLES = 33  # points of a curve, ends included
_BEYOND = 5  # points of an extrapolated bit


@dataclass(frozen=True, slots=True)
class FigureInput:
    """Everything the figures of one substance show, as plain numbers; temperatures in kelvin.

    ``chosen`` is the handbook's own value at the substance's reference, ``trend`` the sign of its
    slope, ``kirkwood`` the Kirkwood function with its standard uncertainty.
    """

    slug: str
    name: str
    smiles: str
    chosen: Point | None
    kirkwood: tuple[float, float] | None
    trend: str
    liquid: tuple[float | None, float | None]
    points: tuple[Point, ...]
    lines: tuple[Line, ...]


def figure_input(handbook: Handbook, slug: str) -> FigureInput:
    """What the figures of one substance must show."""
    dataset = handbook.dataset
    liquid = handbook.liquid_range(slug)
    value, kirkwood = handbook.at(slug, _EPS), handbook.at(slug, "kirkwood_function")
    chosen = None
    if value is not None:
        chosen = Point(handbook.own_reference(slug), value.value, value.uncertainty, "")
    return FigureInput(
        slug=slug,
        name=dataset.solvents[slug].name,
        smiles=handbook.molecules[slug].smiles,
        chosen=chosen,
        kirkwood=None if kirkwood is None else (kirkwood.value, kirkwood.uncertainty),
        trend=handbook.trend(slug).sign,
        liquid=(liquid.low, liquid.high),
        points=_points(dataset, slug),
        lines=tuple(_lines(dataset, slug, (liquid.low, liquid.high))),
    )


def _points(dataset: Dataset, slug: str) -> tuple[Point, ...]:
    return tuple(
        Point(p.temperature, p.value, uncertainty_of(dataset, p)[0], p.source)
        for p in dataset.measurements_of(slug, _EPS)
        if p.temperature is not None
    )


def _lines(
    dataset: Dataset, slug: str, liquid: tuple[float | None, float | None]
) -> Iterator[Line]:
    """Every curve over its stated range, and as far beyond the best one as numbers are given."""
    curves = rank_curves(dataset, slug, _EPS)
    for i, curve in enumerate(curves):
        inside = list(_sampled(curve, curve.t_min, curve.t_max, _SAMPLES, solid=True))
        yield from inside
        if inside and i == 0:
            low = max(curve.t_min - REACH, liquid[0] or 0.0)
            high = min(curve.t_max + REACH, liquid[1] or math.inf)
            yield from _sampled(curve, low, curve.t_min, _BEYOND, solid=False)
            yield from _sampled(curve, curve.t_max, high, _BEYOND, solid=False)
    points = dataset.measurements_of(slug, _EPS)
    at = sorted(p.temperature for p in points if p.temperature is not None)
    if not curves and at and at[-1] - at[0] >= SHORTEST_SPAN:
        fit = line_through(dataset, points, at[0])
        if fit is not None:
            ends = tuple(fit.value + fit.slope * (t - fit.centre) for t in (at[0], at[-1]))
            yield Line("", True, (at[0], at[-1]), ends)


def _sampled(
    curve: Correlation, low: float, high: float, count: int, *, solid: bool
) -> Iterator[Line]:
    if high - low > EDGE:  # printed ends of ranges are rounded
        at = tuple(float(t) for t in np.linspace(low, high, count))
        values = curve_values(curve, at, _EPS)
        bounds = QUANTITIES[_EPS]
        if all(bounds.low <= v <= bounds.high for v in values):
            yield Line(curve.source, solid, at, values)


def alt_text(shown: FigureInput) -> str:
    """What the figure shows, in words and numbers, for those who do not see it."""
    parts = [f"Relative permittivity of {shown.name} against temperature"]
    if shown.chosen is not None:
        digits, own = split_value(shown.chosen.value, shown.chosen.uncertainty, 2)
        parts[0] += f": {digits} ± {own} at {celsius_label(shown.chosen.temperature)}"
    words = {
        "falls": "It falls on warming",
        "rises": "It rises on warming",
        "no trend": "It has no trend within its uncertainty",
        "not known": "How it changes on warming is not known",
    }[shown.trend]
    solid = [line for line in shown.lines if line.solid]
    if solid:
        ends = [f"{short(solid[0].values[i])} at {celsius_label(solid[0].temperatures[i])}"
                for i in (0, -1)]  # fmt: skip
        words += f", from {ends[0]} to {ends[1]}"
    parts.append(words)
    beyond = [
        f"down to {celsius_label(line.temperatures[0])}"
        if line.temperatures[0] < solid[0].temperatures[0]
        else f"up to {celsius_label(line.temperatures[-1])}"
        for line in shown.lines
        if not line.solid
    ]
    if beyond:
        parts.append(f"Drawn broken, as extrapolated, {' and '.join(beyond)}")
    sources = {p.source for p in shown.points} | {line.source for line in solid if line.source}
    counted = [_count(len(shown.points), "published point"),
               _count(sum(bool(line.source) for line in solid), "curve")]  # fmt: skip
    parts.append(f"{' and '.join(counted)} from {_count(len(sources), 'source')}")
    parts.append(f"Liquid range: {range_label(*shown.liquid)}")
    return ". ".join(parts) + "."


def _count(number: int, noun: str) -> str:
    return f"{number or 'no'} {noun}{'' if number == 1 else 's'}"


def short(value: float) -> str:
    """A permittivity without its uncertainty, as printed."""
    return split_value(value, None, QUANTITIES[_EPS].decimals)[0]
