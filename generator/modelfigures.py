"""Models against measured numbers, as figures for the methods page."""

from __future__ import annotations

from collections.abc import Sequence
from importlib.metadata import version
from pathlib import Path

from generator.accuracy import Comparison
from generator.cache import Cache, digest
from generator.pictures import COLOURS
from generator.plotting import canvas, house_style, svg

_KIND = "model-figure"
_MARKERS = (("o", "accent"), ("^", "warm"), ("s", "ink"))


def draw(comparisons: Sequence[Comparison], cache: Cache) -> dict[str, str]:
    """SVG text of every comparison, by ``accuracy:KEY``."""
    here = Path(__file__)
    code = [here.read_bytes(), here.with_name("plotting.py").read_bytes(), version("matplotlib")]
    drawn = {}
    for shown in comparisons:
        key = digest(*code, shown)
        kept = cache.get(_KIND, key)
        if kept is None:
            kept = _scatter(shown).encode()
            cache.put(_KIND, key, kept)
        drawn[f"accuracy:{shown.key}"] = kept.decode()
    return drawn


def _scatter(shown: Comparison) -> str:
    """Predicted over measured, with the line of agreement; logarithmic where errors are shares."""
    points = [point for cloud in shown.clouds for point in cloud.points]
    low, high = min(map(min, points)), max(map(max, points))
    with house_style():
        figure, axes = canvas(6.4, 5.6, (0.12, 0.11, 0.86, 0.79))
        if shown.relative:
            axes.set_xscale("log")
            axes.set_yscale("log")
            low, high = low / 1.1, high * 1.1
            _plain_ticks(axes)
        else:
            low, high = low - 0.03 * (high - low), high + 0.03 * (high - low)
        axes.set_xlim(low, high)
        axes.set_ylim(low, high)
        axes.plot([low, high], [low, high], color=COLOURS["edge"], linewidth=1.2, label="agreement")
        for cloud, (marker, colour) in zip(shown.clouds, _MARKERS, strict=False):
            axes.plot(
                [x for x, _ in cloud.points], [y for _, y in cloud.points], linestyle="none",
                marker=marker, markersize=5.0, markerfacecolor="none", color=COLOURS[colour],
                label=cloud.label,
            )  # fmt: skip
        axes.set_xlabel(shown.measured, color=COLOURS["ink"])
        axes.set_ylabel(shown.predicted, color=COLOURS["ink"])
        axes.legend(
            loc="lower left", bbox_to_anchor=(-0.01, 1.0), ncols=3, frameon=False,
            borderaxespad=0.1, handlelength=1.6, columnspacing=1.6, labelcolor=COLOURS["ink"],
        )  # fmt: skip
        label = f"{shown.title}: predicted against measured, {len(points)} points. {shown.words}"
        return svg(figure, label, "model")


def _plain_ticks(axes) -> None:  # type: ignore[no-untyped-def]
    """1, 2, 5, 10, 20, 50 … written out."""
    from matplotlib.ticker import FuncFormatter, LogLocator, NullLocator

    for axis in (axes.xaxis, axes.yaxis):
        axis.set_major_locator(LogLocator(10, subs=(1.0, 2.0, 5.0)))
        axis.set_minor_locator(NullLocator())
        axis.set_major_formatter(FuncFormatter(lambda value, _: f"{value:g}"))
