"""The house style of plots, and matplotlib's SVG made fit for a page.

matplotlib is imported when something has to be drawn and not before.
"""

from __future__ import annotations

import io
import re
from collections.abc import Iterator, Mapping
from contextlib import contextmanager
from typing import TYPE_CHECKING
from xml.etree import ElementTree

from markupsafe import escape

from generator.pictures import COLOURS

if TYPE_CHECKING:
    from matplotlib.axes import Axes
    from matplotlib.figure import Figure

Box = tuple[float, float, float, float]


@contextmanager
def house_style() -> Iterator[None]:
    """Whatever the settings of this machine, the same figure: text as text, no dates, no chance."""
    import matplotlib

    with matplotlib.rc_context():
        matplotlib.rcdefaults()
        matplotlib.rcParams.update(
            {
                "svg.fonttype": "none",
                "svg.hashsalt": "handbook",
                "text.parse_math": False,
                "font.size": 11.0,
            }
        )
        yield


def preload() -> None:
    """Load what a figure needs, so that the first one is not the slowest."""
    import matplotlib.backends.backend_svg
    import matplotlib.figure  # noqa: F401


def canvas(width: float, height: float, box: Box) -> tuple[Figure, Axes]:
    """Empty axes in the house style; sizes in inches, ``box`` as shares of the figure."""
    from matplotlib.backends.backend_svg import FigureCanvasSVG
    from matplotlib.figure import Figure

    figure = Figure((width, height), frameon=False)
    FigureCanvasSVG(figure)
    axes = figure.add_axes(box)
    axes.patch.set_visible(False)
    axes.tick_params(which="both", length=0, labelcolor=COLOURS["soft"], pad=6)
    axes.grid(color=COLOURS["rule"], linewidth=0.8)
    axes.set_axisbelow(True)
    axes.spines[["top", "right"]].set_visible(False)
    axes.spines[["left", "bottom"]].set(color=COLOURS["edge"], linewidth=1.0)
    return figure, axes


def svg(figure: Figure, label: str, kind: str) -> str:
    """The figure as SVG without ids, of class ``kind``; ``label`` says what it shows."""
    drawn = io.StringIO()
    figure.savefig(drawn, format="svg", metadata={"Date": None})
    return _tidy(drawn.getvalue(), label, kind)


_HREF = "{http://www.w3.org/1999/xlink}href"
_CLASSES = {colour: name for name, colour in COLOURS.items()}
_LONG = re.compile(r"-?\d+\.\d+")
_DROPPED = {"metadata", "defs", "clipPath"}
_KEPT = ("x", "y", "d", "transform")


def _tidy(text: str, label: str, kind: str) -> str:
    """A drawing without ids, its colours open to the style sheet, its text in the page's font."""
    root = ElementTree.fromstring(text)
    shapes = {node.get("id", ""): node for node in root.iter() if _tag(node) == "path"}
    _, _, width, height = root.get("viewBox", "").split()
    body = "".join(part for child in root for part in _element(child, shapes))
    return (
        f'<svg xmlns="http://www.w3.org/2000/svg" class="{kind}" width="{float(width):g}" '
        f'height="{float(height):g}" viewBox="0 0 {float(width):g} {float(height):g}" role="img" '
        f'aria-label="{escape(label)}" font-family="sans-serif" stroke-linejoin="round">'
        f"{body}</svg>\n"
    )


def _element(node: ElementTree.Element, shapes: Mapping[str, ElementTree.Element]) -> Iterator[str]:
    tag = _tag(node)
    if tag in _DROPPED:
        return
    if tag == "g":
        for child in node:
            yield from _element(child, shapes)
        return
    given = dict(node.attrib)
    if tag == "use":  # a marker: the shape itself, moved to its place
        given["d"] = shapes[given[_HREF].removeprefix("#")].get("d", "")
        given["transform"] = f"translate({given.pop('x')} {given.pop('y')})"
        tag = "path"
    if given.get("transform", "").startswith("rotate(-0 "):
        del given["transform"]
    attributes = {key: _short(given[key]) for key in _KEPT if key in given}
    attributes |= _attributes(given.get("style", ""))
    if attributes.get("fill") == "none" == attributes.get("stroke", "none"):
        return  # a background
    written = "".join(f' {key}="{value}"' for key, value in attributes.items())
    yield f"<{tag}{written}>{escape(node.text)}</{tag}>" if tag == "text" else f"<{tag}{written}/>"


def _tag(node: ElementTree.Element) -> str:
    return node.tag.rpartition("}")[2]


def _short(numbers: str) -> str:
    """Coordinates to a hundredth of a pixel, on one line."""
    return _LONG.sub(lambda found: f"{float(found[0]):.2f}", " ".join(numbers.split()))


def _attributes(style: str) -> dict[str, str]:
    """A style as attributes, which a style sheet overrules, with a class for each colour."""
    pairs = [item.split(": ", 1) for item in style.split("; ") if item]
    given = {key: value for key, value in pairs if key != "font-family"}
    if given.get("stroke-dashoffset") == "0":
        del given["stroke-dashoffset"]
    if "stroke" in given:
        given.setdefault("fill", "none")
    names = [
        f"{key[0]}-{_CLASSES[given[key]]}"
        for key in ("stroke", "fill")
        if given.get(key, "none") != "none"
    ]
    return {"class": " ".join(names), **given}
