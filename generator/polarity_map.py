"""The polarity map: every substance as a point, size of the molecule against polarity.

Drawn by hand as SVG, because its points are links and its colours follow the page.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from markupsafe import Markup, escape
from numpy.typing import NDArray

WIDTH, HEIGHT = 960, 600
LEFT, RIGHT, TOP, BOTTOM = 62, 14, 14, 52
LETTER = 6.1  # mean width of a letter of a label [px at the drawing's own size]
LINE = 13.0
RADIUS = 4.6


@dataclass(frozen=True, slots=True)
class Point:
    """One substance on the map. ``shape`` is ``donor``, ``dipolar`` or ``unpolar``."""

    x: float
    y: float
    name: str
    note: str
    href: str
    shape: str


@dataclass(frozen=True, slots=True)
class Axis:
    """One axis: what it shows, its ends, and the step and decimals of its labels."""

    title: str
    low: float
    high: float
    step: float
    decimals: int

    @property
    def ticks(self) -> tuple[float, ...]:
        """Where the axis is labelled."""
        count = int((self.high - self.low) / self.step + 1e-6)
        return tuple(self.low + i * self.step for i in range(count + 1))


Box = tuple[float, float, float, float]
Array = NDArray[np.float64]


def polarity_map(points: Sequence[Point], x: Axis, y: Axis, description: str) -> Markup:
    """The map as one SVG element; labels stand where there is room for them."""
    places = [(_x(p.x, x), _y(p.y, y)) for p in points]
    parts = [
        Markup(
            '<svg class="polarity-map" viewBox="0 0 {} {}" role="group" aria-label="{}">'
        ).format(WIDTH, HEIGHT, description)
    ]
    parts += _frame(x, y)
    labels = _labels(points, places)
    for point, (px, py), label in zip(points, places, labels, strict=True):
        parts.append(
            Markup('<a href="{}" class="{}"><title>{}</title>{}{}</a>').format(
                point.href,
                f"pt pt-{point.shape}",
                f"{point.name}: {point.note}",
                _symbol(point.shape, px, py),
                label,
            )
        )
    parts.append(Markup("</svg>"))
    return Markup("\n").join(parts)


def _x(value: float, axis: Axis) -> float:
    share = (value - axis.low) / (axis.high - axis.low)
    return round(LEFT + share * (WIDTH - LEFT - RIGHT), 1)


def _y(value: float, axis: Axis) -> float:
    share = (value - axis.low) / (axis.high - axis.low)
    return round(HEIGHT - BOTTOM - share * (HEIGHT - TOP - BOTTOM), 1)


def _frame(x: Axis, y: Axis) -> list[Markup]:
    line = Markup('<line class="{}" x1="{}" y1="{}" x2="{}" y2="{}"/>')
    text = Markup('<text class="{}" x="{}" y="{}">{}</text>')
    right, floor = WIDTH - RIGHT, HEIGHT - BOTTOM
    parts = []
    for tick in x.ticks:
        px = _x(tick, x)
        parts.append(line.format("grid", px, TOP, px, floor))
        parts.append(text.format("tick tick-x", px, floor + 18, f"{tick:.{x.decimals}f}"))
    for tick in y.ticks:
        py = _y(tick, y)
        parts.append(line.format("grid", LEFT, py, right, py))
        parts.append(text.format("tick tick-y", LEFT - 8, py + 4, f"{tick:.{y.decimals}f}"))
    parts.append(line.format("axis", LEFT, floor, right, floor))
    parts.append(line.format("axis", LEFT, TOP, LEFT, floor))
    middle = (LEFT + right) / 2
    parts.append(text.format("axis-title", middle, HEIGHT - 8, x.title))
    parts.append(
        Markup(
            '<text class="axis-title" transform="translate(16 {}) rotate(-90)">{}</text>'
        ).format((TOP + floor) / 2, y.title)
    )
    return parts


def _symbol(shape: str, px: float, py: float) -> Markup:
    r = RADIUS
    if shape == "donor":
        corner = f"{px - r + 0.4:.1f}", f"{py - r + 0.4:.1f}", f"{2 * r - 0.8:.1f}"
        return Markup('<rect x="{0}" y="{1}" width="{2}" height="{2}"/>').format(*corner)
    if shape == "unpolar":
        d = f"M{px:.1f} {py - r - 0.8:.1f}l{r + 0.6:.1f} {2 * r:.1f}h{-2 * r - 1.2:.1f}z"
        return Markup('<path d="{}"/>').format(d)
    return Markup('<circle cx="{}" cy="{}" r="{}"/>').format(px, py, r)


def _labels(points: Sequence[Point], places: Sequence[tuple[float, float]]) -> list[Markup]:
    """A label for every point that has room beside it; the loneliest points choose first."""
    px, py = np.array(places).reshape(-1, 2).T
    near = RADIUS + 1
    taken = np.full((2 * len(points), 4), np.inf)  # left, top, right, bottom
    taken[: len(points)] = np.stack([px - near, py - near, px + near, py + near], axis=1)
    count = len(points)
    room = _room(px, py)
    labels = [Markup("")] * len(points)
    for i in sorted(range(len(points)), key=lambda i: (-room[i], points[i].name)):
        width = LETTER * len(points[i].name)
        for tx, ty, side, left in _spots(*places[i], width):
            box = (left - 1, ty - LINE + 3, left + width + 1, ty + 3)
            if _inside(box) and not _meets(box, taken[:count]):
                taken[count] = box
                count += 1
                labels[i] = Markup('<text class="label {}" x="{}" y="{}">{}</text>').format(
                    side, f"{tx:.1f}", f"{ty:.1f}", escape(points[i].name)
                )
                break
    return labels


def _spots(px: float, py: float, width: float) -> tuple[tuple[float, float, str, float], ...]:
    """Where a label may stand: x, y, side it is held by, left end."""
    gap = RADIUS + 4
    return (
        (px + gap, py + 4, "start", px + gap),
        (px - gap, py + 4, "end", px - gap - width),
        (px, py - gap, "middle", px - width / 2),
        (px, py + gap + 8, "middle", px - width / 2),
    )


def _room(px: Array, py: Array) -> list[float]:
    """How far away each point's nearest neighbour is, squared; across counts a third."""
    room = []
    for i in range(len(px)):
        away = (px - px[i]) ** 2 / 9 + (py - py[i]) ** 2
        away[i] = 1e9
        room.append(float(away.min()))
    return room


def _meets(box: Box, others: Array) -> bool:
    left, top, right, bottom = others.T
    apart = (box[0] >= right) | (left >= box[2]) | (box[1] >= bottom) | (top >= box[3])
    return not apart.all()


def _inside(box: Box) -> bool:
    return (
        box[0] > LEFT and box[2] < WIDTH - RIGHT and box[1] > TOP - 8 and box[3] < HEIGHT - BOTTOM
    )
