"""Figures as SVG text, drawn where they are missing and kept by content hash.

The only module that knows matplotlib, which is imported when a figure has to be drawn and not
before: a build in which every figure is kept never loads it.
"""

from __future__ import annotations

import io
import re
import statistics
from collections.abc import Callable, Collection, Iterator, Mapping, Sequence
from concurrent.futures import ProcessPoolExecutor
from functools import lru_cache
from importlib.metadata import version
from multiprocessing import get_context
from pathlib import Path
from typing import TYPE_CHECKING
from xml.etree import ElementTree

from markupsafe import escape

from generator import conformers, dipoles, drawings
from generator.cache import Cache, digest
from generator.figuredata import FigureInput, alt_text, figure_input, short
from generator.pictures import COLOURS, polarity_scale, ribbon
from generator.quantities import QUANTITIES
from generator.structures import drawing
from generator.units import ZERO_CELSIUS
from generator.wording import celsius, celsius_label, range_label, split_value

if TYPE_CHECKING:
    from matplotlib.axes import Axes
    from matplotlib.figure import Figure

__all__ = ["FigureInput", "alt_text", "draw_all", "figure_input"]

# More missing figures than this are worth the start of other processes.
_ALONE = 8


def draw_all(inputs: Sequence[FigureInput], cache: Cache) -> dict[str, str]:
    """SVG text of every figure, by ``slug``, ``slug:scale``, ``slug:ribbon``, ``slug:structure``.

    What cannot be shown, because nothing is known of it, is left out.
    """
    return {**_kept_or_drawn(inputs, cache), **_small(inputs, inputs)}


def draw_small(
    inputs: Sequence[FigureInput], slugs: Collection[str], cache: Cache
) -> dict[str, str]:
    """Scale, ribbon and structure of some substances, without the curves: what prints carry.

    ``inputs`` are those of the whole handbook, which every scale shows.
    """
    wanted = [item for item in inputs if item.slug in slugs]
    return {**_kept_or_drawn(wanted, cache, curves=False), **_small(inputs, wanted)}


def _small(inputs: Sequence[FigureInput], shown: Sequence[FigureInput]) -> dict[str, str]:
    drawn: dict[str, str] = {}
    known = [item.kirkwood[0] for item in inputs if item.kirkwood is not None]
    quartiles = statistics.quantiles(known, n=4, method="inclusive") if len(known) > 3 else []
    for item in shown:
        if item.kirkwood is not None:
            drawn[f"{item.slug}:scale"] = _scale(item, quartiles)
        if item.chosen is not None:
            drawn[f"{item.slug}:ribbon"] = _ribbon(item)
    return drawn


def _scale(shown: FigureInput, quartiles: Sequence[float]) -> str:
    value, own = shown.kirkwood or (0.0, 0.0)
    digits, spread = split_value(value, own, QUANTITIES["kirkwood_function"].decimals)
    label = f"Polarity scale: Kirkwood function of {shown.name} {digits} ± {spread}, from 0 to 0.5"
    if quartiles:
        low, middle, high = (f"{q:.3f}" for q in quartiles)
        label += f"; middle half of the handbook {low} to {high}, median {middle}"
    return polarity_scale(value, own, quartiles, label)


def _ribbon(shown: FigureInput) -> str:
    label = f"Permittivity of {shown.name} over its liquid range, {range_label(*shown.liquid)}"
    readings = [
        f"{short(line.values[i])} at {celsius_label(line.temperatures[i])}"
        for line in shown.lines[:1]
        for i in (0, -1)
    ]
    reference, word = None, ""
    if shown.chosen is not None:
        reference = (shown.chosen.temperature, shown.chosen.value)
        word = celsius_label(reference[0])
        readings.append(f"{short(reference[1])} at the reference of {word}")
    low, high = ("" if end is None else f"{celsius(end, 0)} °C" for end in shown.liquid)
    label = f"{label}: {', '.join(readings)}"
    best = [line for i, line in enumerate(shown.lines) if i == 0 or not line.solid]
    return ribbon(shown.liquid, reference, best, shown.points, (low, high, word), label)


# ---- drawing what is missing -------------------------------------------------------------------


def _kept_or_drawn(
    inputs: Sequence[FigureInput], cache: Cache, *, curves: bool = True
) -> dict[str, str]:
    wanted: dict[str, tuple[str, FigureInput, str]] = {}
    for item in inputs:
        if curves and (item.chosen is not None or item.points or item.lines):
            wanted[item.slug] = ("curve", item, digest(_version("curve"), item, alt_text(item)))
        wanted[f"{item.slug}:structure"] = (
            "structure", item, digest(_version("structure"), item.smiles)
        )  # fmt: skip
    drawn: dict[str, str] = {}
    missing: list[str] = []
    for name, (kind, _, key) in wanted.items():
        found = cache.get(kind, key)
        if found is None:
            missing.append(name)
        else:
            drawn[name] = found.decode()
    jobs = [wanted[name][:2] for name in missing]
    for name, svg in zip(missing, _drawn(jobs), strict=True):
        kind, _, key = wanted[name]
        cache.put(kind, key, svg.encode())
        drawn[name] = svg
    return {name: drawn[name] for name in wanted}


_Job = tuple[str, FigureInput]


def _drawn(jobs: Sequence[_Job]) -> list[str]:
    if len(jobs) <= _ALONE:
        return _draw_batch(jobs)
    size = min(32, -(-len(jobs) // 2))
    batches = [jobs[i : i + size] for i in range(0, len(jobs), size)]
    # A fresh interpreter each: a fork would copy the threads of a preview server.
    with ProcessPoolExecutor(2, mp_context=get_context("spawn")) as pool:
        return [svg for batch in pool.map(_draw_batch, batches) for svg in batch]


def _draw_batch(jobs: Sequence[_Job]) -> list[str]:
    return [_DRAWERS[kind](item) for kind, item in jobs]


def _structure(shown: FigureInput) -> str:
    return drawing(shown.smiles, 190, 130, dipole=True)


@lru_cache(maxsize=2)
def _version(kind: str) -> str:
    """Hash of the code that draws: an edit of it, or another library, draws anew."""
    here = Path(__file__)
    model = sorted((here.parent / "dipole_model").iterdir())
    modules = (drawings, dipoles, conformers)
    files: Mapping[str, Sequence[Path]] = {
        "curve": (here, here.with_name("pictures.py")),
        "structure": (*(Path(str(module.__file__)) for module in modules), *model),
    }
    library = {"curve": "matplotlib", "structure": "rdkit"}[kind]
    content = [file.read_bytes() for file in files[kind]]
    return digest(version(library), version("numpy"), *content)


@lru_cache(maxsize=1)
def _canvas() -> tuple[Figure, Axes]:
    """The one figure that is drawn on again and again, with all that stays the same on it."""
    from matplotlib.backends.backend_svg import FigureCanvasSVG
    from matplotlib.figure import Figure
    from matplotlib.ticker import MaxNLocator

    figure = Figure((8.0, 4.2), frameon=False)
    FigureCanvasSVG(figure)
    axes = figure.add_axes((0.09, 0.135, 0.89, 0.72))
    axes.patch.set_visible(False)
    for axis in (axes.xaxis, axes.yaxis):
        axis.set_major_locator(MaxNLocator(6, steps=[1, 2, 2.5, 5, 10]))
    axes.ticklabel_format(useOffset=False)
    axes.tick_params(length=0, labelcolor=COLOURS["soft"], pad=6)
    axes.grid(color=COLOURS["rule"], linewidth=0.8)
    axes.set_axisbelow(True)
    axes.spines[["top", "right"]].set_visible(False)
    axes.spines[["left", "bottom"]].set(color=COLOURS["edge"], linewidth=1.0)
    axes.set_xlabel("Temperature / °C", color=COLOURS["ink"])
    axes.set_ylabel("Relative permittivity ε", color=COLOURS["ink"])
    return figure, axes


_MARKERS = ("o", "s", "^", "D", "v", "P", "X")
_STYLES = ("-", "-.", (0, (7, 2)))  # the best curve, the next, all others


def _curve(shown: FigureInput) -> str:
    """The figure of ε(T): points by source, curves, melting and boiling point, chosen value."""
    import matplotlib

    with matplotlib.rc_context():
        matplotlib.rcdefaults()  # whatever the settings of this machine, the same figure
        matplotlib.rcParams.update(
            {
                "svg.fonttype": "none",
                "svg.hashsalt": "handbook",
                "text.parse_math": False,
                "font.size": 11.0,
            }
        )
        figure, axes = _canvas()
        _wipe(axes)
        _window(axes, shown)
        _plot(axes, shown)
        axes.legend(
            loc="lower left", bbox_to_anchor=(-0.01, 1.0), ncols=3, frameon=False,
            borderaxespad=0.1, handlelength=2.2, columnspacing=1.6, labelcolor=COLOURS["ink"],
        )  # fmt: skip
        drawn = io.StringIO()
        figure.savefig(drawn, format="svg", metadata={"Date": None})
    return _tidy(drawn.getvalue(), alt_text(shown))


def _wipe(axes: Axes) -> None:
    """Take off what was drawn last; clearing the axes would make every tick anew."""
    for container in list(axes.containers):
        container.remove()
    for artist in (*axes.lines, *axes.patches, *axes.texts):
        artist.remove()


def _window(axes: Axes, shown: FigureInput) -> None:
    """Axes wide enough for everything known, shaded where the substance is not liquid."""
    points = [*shown.points, *([shown.chosen] if shown.chosen else [])]
    at = [p.temperature for p in points] + [t for line in shown.lines for t in line.temperatures]
    values = [p.value + side * p.uncertainty for p in points for side in (-1, 1)]
    values += [v for line in shown.lines for v in line.values]
    middle, half = (min(at) + max(at)) / 2, max(0.53 * (max(at) - min(at)), 15.0)
    low, high = middle - half - ZERO_CELSIUS, middle + half - ZERO_CELSIUS
    centre = (min(values) + max(values)) / 2
    height = max(0.58 * (max(values) - min(values)), 0.02 * centre)
    axes.set_xlim(low, high)
    axes.set_ylim(centre - height, centre + height)
    for end, outside, word, side in (
        (shown.liquid[0], low, "melts", "left"),
        (shown.liquid[1], high, "boils", "right"),
    ):
        if end is None or not low < end - ZERO_CELSIUS < high:
            continue
        place = end - ZERO_CELSIUS
        left, right = sorted((place, outside))
        axes.axvspan(left, right, color=COLOURS["rule"], alpha=0.45, linewidth=0, clip_on=False)
        axes.axvline(place, color=COLOURS["edge"], linewidth=1.0, clip_on=False)
        # The curve mostly falls: there is room below it on the left, above it on the right.
        below = place - low < high - place
        axes.text(
            place, 0.03 if below else 0.97, f" {word} at {celsius(end, 1)} °C ",
            color=COLOURS["soft"], rotation=90, ha=side, va="bottom" if below else "top",
            transform=axes.get_xaxis_transform(), fontsize=10,
        )  # fmt: skip


def _plot(axes: Axes, shown: FigureInput) -> None:
    solid = [line for line in shown.lines if line.solid]
    for i, line in enumerate(solid):
        axes.plot(
            [t - ZERO_CELSIUS for t in line.temperatures], line.values,
            color=COLOURS["warm" if i else "accent"], linewidth=1.4 if i else 2.2,
            linestyle=_STYLES[min(i, 2)], clip_on=False,
            label=f"curve, {line.source}" if line.source else "straight line through the points",
        )  # fmt: skip
    for i, line in enumerate(line for line in shown.lines if not line.solid):
        axes.plot(
            [t - ZERO_CELSIUS for t in line.temperatures], line.values, clip_on=False,
            color=COLOURS["accent"], linewidth=1.6, linestyle=(0, (2.5, 2)),
            label="_" if i else "extrapolated",
        )  # fmt: skip
    for i, source in enumerate(dict.fromkeys(p.source for p in shown.points)):
        own = [p for p in shown.points if p.source == source]
        axes.errorbar(
            [p.temperature - ZERO_CELSIUS for p in own], [p.value for p in own],
            [p.uncertainty for p in own], linestyle="none", marker=_MARKERS[i % len(_MARKERS)],
            color=COLOURS["warm"], markersize=6.5, elinewidth=1.4, capsize=0,
            label=f"point, {source}",
        )  # fmt: skip
    if shown.chosen is not None:
        axes.errorbar(
            [shown.chosen.temperature - ZERO_CELSIUS], [shown.chosen.value],
            [shown.chosen.uncertainty], linestyle="none", marker="o", markersize=11,
            markerfacecolor="none", color=COLOURS["ink"], elinewidth=1.0, capsize=0,
            label=f"handbook's value, {celsius_label(shown.chosen.temperature)}",
        )  # fmt: skip


# ---- matplotlib's SVG, made fit for a page -----------------------------------------------------

_HREF = "{http://www.w3.org/1999/xlink}href"
_CLASSES = {colour: name for name, colour in COLOURS.items()}
_LONG = re.compile(r"-?\d+\.\d+")
_DROPPED = {"metadata", "defs", "clipPath"}
_KEPT = ("x", "y", "d", "transform")


def _tidy(text: str, label: str) -> str:
    """A drawing without ids, its colours open to the style sheet, its text in the page's font."""
    root = ElementTree.fromstring(text)
    shapes = {node.get("id", ""): node for node in root.iter() if _tag(node) == "path"}
    _, _, width, height = root.get("viewBox", "").split()
    body = "".join(part for child in root for part in _element(child, shapes))
    return (
        f'<svg xmlns="http://www.w3.org/2000/svg" class="curve" width="{float(width):g}" '
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


_DRAWERS: Mapping[str, Callable[[FigureInput], str]] = {"curve": _curve, "structure": _structure}
