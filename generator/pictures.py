"""The two small pictures that stand wherever a solvent does: polarity scale and ribbon.

Written by hand as SVG without ids, because hundreds may stand on one page. Each carries its
numbers in its label. Colours are those of the light page; the classes let the style sheet follow
dark pages and print.
"""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from dataclasses import dataclass

import numpy as np
from markupsafe import escape

_WIDTH, _SCALE_HEIGHT, _RIBBON_HEIGHT = 200, 34, 44
_LEFT, _RIGHT, _FOOT = 5.0, 195.0, 31.0  # px; the ribbon stands on its foot
_NEAR = 44.0  # px: closer to an end, the reference is not written out

# Class of a colour → the colour on a light page, for viewers without the style sheet.
COLOURS = {
    "ink": "#1c2326",
    "soft": "#515b60",
    "rule": "#d8d3c6",
    "edge": "#8f8a7c",
    "accent": "#0d5566",
    "warm": "#8a4a06",
    "paper": "#fdfcf9",
}


@dataclass(frozen=True, slots=True)
class Point:
    """A permittivity as one source gives it: ``temperature`` [K], standard ``uncertainty``."""

    temperature: float
    value: float
    uncertainty: float
    source: str


@dataclass(frozen=True, slots=True)
class Line:
    """A piece of a curve, sampled: ``temperatures`` [K], ``values``.

    ``solid`` where it is backed by measurement, else extrapolated.
    """

    source: str
    solid: bool
    temperatures: tuple[float, ...]
    values: tuple[float, ...]


def stroke(colour: str, width: float = 1.0) -> str:
    """Attributes of a line in one of the handbook's colours."""
    return f'class="s-{colour}" stroke="{COLOURS[colour]}" stroke-width="{width:g}" fill="none"'


def fill(colour: str) -> str:
    """Attributes of an area in one of the handbook's colours."""
    return f'class="f-{colour}" fill="{COLOURS[colour]}"'


def polarity_scale(value: float, uncertainty: float, quartiles: Sequence[float], label: str) -> str:
    """A line from 0 to 0.5 of the Kirkwood function with a solvent's mark.

    The pale box spans the middle half of the handbook, its bar is the median; the needle is the
    solvent, the band behind it one standard uncertainty to each side. ``quartiles``: three
    numbers, or none.
    """

    def x(number: float) -> float:
        return round(_LEFT + min(max(number / 0.5, 0.0), 1.0) * (_RIGHT - _LEFT), 1)

    middle = 14.0
    parts = []
    if quartiles:
        low, median, high = map(x, quartiles)
        parts += [
            _box(low, 9, high, 19, fill("rule")),
            _segment(median, 9, median, 19, stroke("edge", 1.5)),
        ]
    parts.append(_segment(_LEFT, middle, _RIGHT, middle, stroke("edge")))
    parts += [_segment(end, middle - 4, end, middle + 4, stroke("edge")) for end in (_LEFT, _RIGHT)]
    mark, low, high = x(value), x(value - uncertainty), x(value + uncertainty)
    parts += [
        _box(low, 6, high, 22, f'{fill("accent")} fill-opacity="0.35"'),
        _segment(mark, 4, mark, 24, stroke("accent", 2)),
        f'<path {fill("accent")} d="M{mark:g} 8l-4.5-7h9z"/>',
        *_words(31, [(_LEFT, "start", "0"), (_RIGHT, "end", "0.5")]),
    ]
    return _svg("polarity-scale", _SCALE_HEIGHT, label, parts)


def ribbon(
    ends: tuple[float | None, float | None],
    reference: tuple[float, float] | None,
    lines: Sequence[Line],
    points: Sequence[Point],
    words: tuple[str, str, str],
    label: str,
) -> str:
    """ε(T) drawn small over the liquid range, with ε = 1 at the foot.

    ``ends`` are melting and boiling point [K], None where not known; ``reference`` is the
    reference temperature [K] with its ε. Lines are solid where measured, broken where
    extrapolated; ``words`` are what stands under the left end, the right end and the reference.
    """
    seen = [t for line in lines for t in line.temperatures] + [p.temperature for p in points]
    seen += [reference[0]] if reference else []
    low = ends[0] if ends[0] is not None else min(seen)
    high = ends[1] if ends[1] is not None else max(seen)
    # A substance measured only where it is not liquid still shows where that is.
    if reference is not None:
        low, high = min(low, reference[0]), max(high, reference[0])
    if high <= low:
        low, high = low - 10.0, high + 10.0
    inside = [_clipped(line, low, high) for line in lines]
    shown = [p for p in points if low <= p.temperature <= high]
    values = [v for line in inside for v in line.values] + [p.value for p in shown]
    top = max([*values, reference[1] if reference else 1.0, 1.001])

    def x(temperature: float) -> float:
        return round(_LEFT + (temperature - low) / (high - low) * (_RIGHT - _LEFT), 1)

    def y(number: float) -> float:
        return round(_FOOT - 1 - (number - 1) / (top - 1) * (_FOOT - 5), 1)

    parts = [_segment(_LEFT, _FOOT, _RIGHT, _FOOT, stroke("edge"))]
    for end, place in zip(ends, (_LEFT, _RIGHT), strict=True):
        if end is not None:
            parts.append(_segment(place, _FOOT - 4, place, _FOOT + 2, stroke("edge")))
    if reference is not None:
        at = x(reference[0])
        parts.append(_segment(at, 1, at, _FOOT + 2, stroke("ink")))
    for line in inside:
        if len(line.temperatures) > 1:
            path = " ".join(
                f"{x(t):g},{y(v):g}" for t, v in zip(line.temperatures, line.values, strict=True)
            )
            style = stroke("accent", 2.2) if line.solid else _BROKEN
            parts.append(f'<polyline {style} points="{path}"/>')
    parts += [
        f'<circle {fill("warm")} cx="{x(p.temperature):g}" cy="{y(p.value):g}" r="2.4"/>'
        for p in shown
    ]
    under = [(_LEFT, "start", words[0]), (_RIGHT, "end", words[1])]
    if reference is not None and _LEFT + _NEAR < x(reference[0]) < _RIGHT - _NEAR:
        under.append((x(reference[0]), "middle", words[2]))
    return _svg("ribbon", _RIBBON_HEIGHT, label, [*parts, *_words(42, under)])


_BROKEN = f'{stroke("accent", 1.6)} stroke-dasharray="3.5 2.5"'


def _clipped(line: Line, low: float, high: float) -> Line:
    """The part of a line between two temperatures [K], cut at the ends by interpolation."""
    first, last = max(low, line.temperatures[0]), min(high, line.temperatures[-1])
    if first > last:
        return Line(line.source, line.solid, (), ())
    between = [t for t in line.temperatures if first < t < last]
    at = (first, *between, last)
    values = np.interp(at, line.temperatures, line.values)
    return Line(line.source, line.solid, at, tuple(map(float, values)))


def _segment(x1: float, y1: float, x2: float, y2: float, style: str) -> str:
    return f'<path {style} d="M{x1:g} {y1:g}L{x2:g} {y2:g}"/>'


def _box(x1: float, y1: float, x2: float, y2: float, style: str) -> str:
    return f'<path {style} d="M{x1:g} {y1:g}H{x2:g}V{y2:g}H{x1:g}z"/>'


def _words(base: float, words: Iterable[tuple[float, str, str]]) -> list[str]:
    return [
        f'<text {fill("soft")} x="{x:g}" y="{base:g}" text-anchor="{anchor}">{escape(text)}</text>'
        for x, anchor, text in words
        if text
    ]


def _svg(kind: str, height: int, label: str, parts: Iterable[str]) -> str:
    return (
        f'<svg xmlns="http://www.w3.org/2000/svg" class="{kind}" width="{_WIDTH}" '
        f'height="{height}" viewBox="0 0 {_WIDTH} {height}" role="img" '
        f'aria-label="{escape(label)}" font-family="sans-serif" font-size="9.5">'
        f"{''.join(parts)}</svg>"
    )
