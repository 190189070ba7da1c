"""Figures as SVG text, drawn where they are missing and kept by content hash.

matplotlib is imported when a figure has to be drawn and not before: a build in which every figure
is kept never loads it.
"""

from __future__ import annotations

import statistics
from collections.abc import Callable, Iterator, Mapping, Sequence
from functools import cached_property, lru_cache, partial
from importlib.metadata import version
from itertools import chain
from pathlib import Path
from typing import TYPE_CHECKING

from generator import conformers, dipoles, drawings
from generator.cache import Cache, digest
from generator.figuredata import FigureInput, alt_text, figure_input, short
from generator.kept import NOTHING, Kept
from generator.metrics import Handbook
from generator.parallel import shared_out
from generator.pictures import COLOURS, polarity_scale, ribbon
from generator.plotting import canvas, house_style, svg
from generator.quantities import QUANTITIES
from generator.structures import drawing, likely_shapes
from generator.units import ZERO_CELSIUS
from generator.wording import celsius, celsius_label, range_label, split_value

if TYPE_CHECKING:
    from matplotlib.axes import Axes
    from matplotlib.figure import Figure

__all__ = ["FigureInput", "Figures", "alt_text", "figure_input", "figures_of"]

# Missing figures that are worth the start of another process.
_ALONE = 8


class Figures(Mapping[str, str]):
    """SVG text of every figure, by ``slug``, ``slug:scale``, ``slug:ribbon``, ``slug:structure``.

    What cannot be shown, because nothing is known of it, is left out. Curves and structures are
    there once they have been asked for by ``prepare``. ``anew`` are the substances that were not
    known before; ``whole`` draws figures about all of them, by names of their own.
    """

    def __init__(
        self,
        inputs: Mapping[str, FigureInput],
        cache: Cache,
        kept: Kept = NOTHING,
        anew: Sequence[str] = (),
        whole: Callable[[], Mapping[str, str]] = dict,
    ) -> None:
        self._anew = anew
        self._inputs, self._cache, self._slugs = inputs, cache, tuple(inputs)
        self._drawn: dict[str, str] = {}
        self._draw_whole = whole
        known = kept.each(self._slugs, "kirkwood", lambda some: [inputs[s].kirkwood for s in some])
        self.quartiles = _quartiles([pair[0] for pair in known.values() if pair is not None])
        self._small: Mapping[str, Mapping[str, str | None]] = {
            "scale": kept.each(self._slugs, "scale", self._scales, self.quartiles),
            "ribbon": kept.each(self._slugs, "ribbon", self._ribbons),
        }

    def prepare(self, slugs: Sequence[str], *, curves: bool = True) -> None:
        """Draw what some substances need, or find it among the kept: structures and curves."""
        wanted = [self._inputs[slug] for slug in slugs]
        self._drawn |= _kept_or_drawn(wanted, self._cache, curves=curves)

    def prepare_anew(self) -> None:
        """Draw for the substances that were not known before, if they are few."""
        if len(self._anew) <= _ALONE:
            self.prepare(self._anew)

    @cached_property
    def _whole(self) -> Mapping[str, str]:
        return self._draw_whole()

    def __getitem__(self, name: str) -> str:
        slug, _, kind = name.partition(":")
        small = self._small.get(kind)
        found = self._drawn.get(name) if small is None else small.get(slug)
        if found is None and small is None and slug not in self._inputs:
            found = self._whole.get(name)
        if found is None:
            raise KeyError(name)
        return found

    def __iter__(self) -> Iterator[str]:
        small = (f"{s}:{k}" for s in self._slugs for k in self._small if self._small[k][s])
        return chain(small, self._drawn, self._whole)

    def __len__(self) -> int:
        return sum(1 for _ in self)

    def _scales(self, slugs: Sequence[str]) -> list[str | None]:
        return [_scale(self._inputs[slug], self.quartiles) for slug in slugs]

    def _ribbons(self, slugs: Sequence[str]) -> list[str | None]:
        return [_ribbon(self._inputs[slug]) for slug in slugs]


def figures_of(
    handbook: Handbook, cache: Cache, whole: Callable[[], Mapping[str, str]] = dict
) -> Figures:
    """The figures of a handbook; ``whole`` draws those about it as a whole."""
    inputs = handbook.kept.each(
        tuple(handbook.dataset.solvents),
        "figure",
        lambda slugs: [figure_input(handbook, slug) for slug in slugs],
    )
    return Figures(inputs, cache, handbook.kept, inputs.anew, whole)


def _quartiles(numbers: Sequence[float]) -> tuple[float, ...]:
    """The quartiles that every scale shows, to two decimals.

    Finer ones would be another number on every page whenever one substance moves.
    """
    if len(numbers) < 4:
        return ()
    return tuple(round(q, 2) for q in statistics.quantiles(numbers, n=4, method="inclusive"))


def _scale(shown: FigureInput, quartiles: Sequence[float]) -> str | None:
    if shown.kirkwood is None:
        return None
    value, own = shown.kirkwood
    digits, spread = split_value(value, own, QUANTITIES["kirkwood_function"].decimals)
    label = f"Polarity scale: Kirkwood function of {shown.name} {digits} ± {spread}, from 0 to 0.5"
    if quartiles:
        low, middle, high = (f"{q:.2f}" for q in quartiles)
        label += f"; middle half of the handbook {low} to {high}, median {middle}"
    return polarity_scale(value, own, quartiles, label)


def _ribbon(shown: FigureInput) -> str | None:
    if shown.chosen is None:
        return None
    label = f"Permittivity of {shown.name} over its liquid range, {range_label(*shown.liquid)}"
    readings = [
        f"{short(line.values[i])} at {celsius_label(line.temperatures[i])}"
        for line in shown.lines[:1]
        for i in (0, -1)
    ]
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
    texts = shared_out(partial(_draw_batch, cache), jobs, _ALONE)
    for name, text in zip(missing, texts, strict=True):
        kind, _, key = wanted[name]
        cache.put(kind, key, text.encode())
        drawn[name] = text
    return {name: drawn[name] for name in wanted}


_Job = tuple[str, FigureInput]


def _draw_batch(cache: Cache, jobs: Sequence[_Job]) -> list[str]:
    return [_curve(item) if kind == "curve" else _structure(item, cache) for kind, item in jobs]


def _structure(shown: FigureInput, cache: Cache) -> str:
    shapes = likely_shapes(shown.smiles, cache)
    return drawing(shown.smiles, 190, 130, dipole=shapes is not None, shapes=shapes)


@lru_cache(maxsize=2)
def _version(kind: str) -> str:
    """Hash of the code that draws: an edit of it, or another library, draws anew."""
    here = Path(__file__)
    model = sorted((here.parent / "dipole_model").iterdir())
    modules = (drawings, dipoles, conformers)
    files: Mapping[str, Sequence[Path]] = {
        "curve": (here, here.with_name("plotting.py"), here.with_name("pictures.py")),
        "structure": (*(Path(str(module.__file__)) for module in modules), *model),
    }
    library = {"curve": "matplotlib", "structure": "rdkit"}[kind]
    content = [file.read_bytes() for file in files[kind]]
    return digest(version(library), version("numpy"), *content)


@lru_cache(maxsize=1)
def _canvas() -> tuple[Figure, Axes]:
    """The one figure that is drawn on again and again, with all that stays the same on it."""
    from matplotlib.ticker import MaxNLocator

    figure, axes = canvas(8.0, 4.2, (0.09, 0.135, 0.89, 0.72))
    for axis in (axes.xaxis, axes.yaxis):
        axis.set_major_locator(MaxNLocator(6, steps=[1, 2, 2.5, 5, 10]))
    axes.ticklabel_format(useOffset=False)
    axes.set_xlabel("Temperature / °C", color=COLOURS["ink"])
    axes.set_ylabel("Relative permittivity ε", color=COLOURS["ink"])
    return figure, axes


_MARKERS = ("o", "s", "^", "D", "v", "P", "X")
_STYLES = ("-", "-.", (0, (7, 2)))  # the best curve, the next, all others


def _curve(shown: FigureInput) -> str:
    """The figure of ε(T): points by source, curves, melting and boiling point, chosen value."""
    with house_style():
        figure, axes = _canvas()
        _wipe(axes)
        _window(axes, shown)
        _plot(axes, shown)
        axes.legend(
            loc="lower left", bbox_to_anchor=(-0.01, 1.0), ncols=3, frameon=False,
            borderaxespad=0.1, handlelength=2.2, columnspacing=1.6, labelcolor=COLOURS["ink"],
        )  # fmt: skip
        return svg(figure, alt_text(shown), "curve")


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
