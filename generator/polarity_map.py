"""The polarity map: every substance as a point, size of the molecule against polarity.

Drawn by hand as SVG, because its points are links and its colours follow the page.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

from markupsafe import Markup, escape

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
    taken: list[Box] = [
        (px - RADIUS - 1, py - RADIUS - 1, px + RADIUS + 1, py + RADIUS + 1) for px, py in places
    ]
    labels = [Markup("")] * len(points)
    for i in sorted(range(len(points)), key=lambda i: (-_room(i, places), points[i].name)):
        px, py = places[i]
        width = LETTER * len(points[i].name)
        gap = RADIUS + 4
        spots = (
            (px + gap, py + 4, "start", px + gap),
            (px - gap, py + 4, "end", px - gap - width),
            (px, py - gap, "middle", px - width / 2),
            (px, py + gap + 8, "middle", px - width / 2),
        )
        for tx, ty, side, left in spots:
            box = (left - 1, ty - LINE + 3, left + width + 1, ty + 3)
            if _inside(box) and not any(_overlap(box, other) for other in taken):
                taken.append(box)
                labels[i] = Markup('<text class="label {}" x="{}" y="{}">{}</text>').format(
                    side, f"{tx:.1f}", f"{ty:.1f}", escape(points[i].name)
                )
                break
    return labels


def _room(i: int, places: Sequence[tuple[float, float]]) -> float:
    px, py = places[i]
    return min(
        ((px - qx) ** 2 / 9 + (py - qy) ** 2 for j, (qx, qy) in enumerate(places) if j != i),
        default=1e9,
    )


def _inside(box: Box) -> bool:
    return (
        box[0] > LEFT and box[2] < WIDTH - RIGHT and box[1] > TOP - 8 and box[3] < HEIGHT - BOTTOM
    )


def _overlap(a: Box, b: Box) -> bool:
    return a[0] < b[2] and b[0] < a[2] and a[1] < b[3] and b[1] < a[3]
