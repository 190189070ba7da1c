"""Time the handbook's build beside a bare ``mkdocs build`` of the same pages as Markdown.

Whole processes in fresh interpreters, alternating, so that whatever else the machine does falls
on all alike. The Markdown twin of a page holds its headings, text, lists and tables, but none of
its pictures; it goes through the same theme and the same search, with pages out of the
navigation tree. As a floor, the same Markdown goes through ``hugo`` with a layout of one line and
no search. What both are spared (tables, checks, numbers, figures) is what the ratio shows.

    python tests/bench/bench_build.py --sizes 100,300,1000 --figure site_src/images/bench.svg
"""

from __future__ import annotations

import argparse
import math
import os
import shutil
import statistics
import sys
import tempfile
import time
from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from pathlib import Path

from handbooks import ROOT, edits, handbook, twins

from generator.cache import digest, tree

BIN = Path(sys.executable).parent
KINDS = {
    "bare": "bare mkdocs build",
    "hugo": "hugo, no search",
    "cold": "build, nothing kept",
    "anew": "build, all figures drawn anew",
    "warm": "build, figures kept",
    "edit": "one value edited",
    "nothing": "nothing changed",
    "check": "check",
    "booklet": "booklet as PDF",
}
# What is drawn, among what is kept; everything but these stays for "anew".
DRAWN = ("curve", "structure", "model-figure")
BOOKLET = 120
GROWTH = (300, 3000)


@dataclass(frozen=True, slots=True)
class Run:
    """One process: wall and processor time [s], memory of its largest process [MB]."""

    wall: float
    cpu: float
    memory: float


def _run(*command: object) -> Run:
    """Run to its end and take its resources; a failure ends the benchmark."""
    words = [str(word) for word in command]
    environment = {**os.environ, "NO_MKDOCS_2_WARNING": "1", "PYTHONPATH": str(ROOT)}
    with tempfile.TemporaryFile("w+", encoding="utf-8") as log:
        redirected = [(os.POSIX_SPAWN_DUP2, log.fileno(), number) for number in (1, 2)]
        start = time.monotonic()
        pid = os.posix_spawn(words[0], words, environment, file_actions=redirected)
        _, status, used = os.wait4(pid, 0)
        wall = time.monotonic() - start
        if status:
            log.seek(0)
            sys.exit(f"{' '.join(words)} failed:\n{log.read()[-3000:]}")
    run = Run(wall, used.ru_utime + used.ru_stime, used.ru_maxrss / 1024)
    print(f"{run.wall:8.2f} s {run.cpu:8.2f} CPU s  {' '.join(words)}", file=sys.stderr, flush=True)
    return run


def _typical(runs: Sequence[Run]) -> Run:
    return Run(
        statistics.median(run.wall for run in runs),
        statistics.median(run.cpu for run in runs),
        max(run.memory for run in runs),
    )


def _liquids() -> Path:
    """The shipped tables with every published liquid added; made once."""
    folder = ROOT / ".cache" / "bench" / digest(tree(ROOT / "data"))
    if not folder.exists():
        folder.parent.mkdir(parents=True, exist_ok=True)
        with tempfile.TemporaryDirectory(dir=folder.parent) as draft:
            shutil.copytree(ROOT / "data", Path(draft, "data"))
            _run(BIN / "datasheets", "add", "--all-liquids", "--data", Path(draft, "data"))
            Path(draft, "data").replace(folder)
    return folder


def measure(count: int, repeats: int) -> dict[str, Run]:
    """Medians of ``repeats`` runs of each kind for one size; with nothing kept it is one run."""
    runs: dict[str, list[Run]] = {kind: [] for kind in KINDS if kind != "booklet"}
    with tempfile.TemporaryDirectory(prefix="bench-") as name:
        ours, bare, plain = (Path(name, part) for part in ("handbook", "bare", "plain"))
        for folder in (ours, bare, plain):
            folder.mkdir()
        handbook(ours, _liquids(), count)
        site, kept = ours / "site", ours / ".cache"
        build = (BIN / "datasheets", "build", "--config", ours / "mkdocs.yml", "--site", site)
        runs["cold"].append(_run(*build))
        pages = twins(site, bare, plain)
        hugo = BIN / "hugo"
        editing = edits(ours / "data")
        for _ in range(repeats):
            runs["bare"].append(
                _run(BIN / "mkdocs", "build", "--quiet", "--config-file", bare / "mkdocs.yml")
            )
            shutil.rmtree(site)
            runs["warm"].append(_run(*build))
            runs["nothing"].append(_run(*build))
            next(editing)
            runs["edit"].append(_run(*build))
            runs["check"].append(_run(BIN / "datasheets", "check", "--data", ours / "data"))
            shutil.rmtree(site)
            for kind in DRAWN:
                shutil.rmtree(kept / kind)
            runs["anew"].append(_run(*build))
            if hugo.exists():
                runs["hugo"].append(_run(hugo, "--source", plain, "--quiet"))
                shutil.rmtree(plain / "public")
    medians = {kind: _typical(some) for kind, some in runs.items() if some}
    _show(f"{count} substances, {pages} pages", medians)
    if not hugo.exists():
        print("  hugo is not installed: no floor")
    return medians


def booklet(repeats: int) -> Run:
    """Every sheet of a handbook of 120 substances as one PDF, with what a build keeps."""
    with tempfile.TemporaryDirectory(prefix="bench-") as name:
        handbook(Path(name), ROOT / "data", BOOKLET)
        config = ("--config", Path(name, "mkdocs.yml"))
        _run(BIN / "datasheets", "build", *config, "--site", Path(name, "site"))
        out = ("--out", Path(name, "booklet.pdf"))
        command = (BIN / "datasheets", "print", "--all", "--as", "booklet", *config, *out)
        return _typical([_run(*command) for _ in range(repeats)])


def _show(title: str, medians: Mapping[str, Run]) -> None:
    """Times and memory; and, as others at work weigh less on it, the ratio of processor times."""
    print(title)
    bare = medians.get("bare")
    for kind, run in medians.items():
        figures = f"{run.wall:8.2f} s {run.cpu:8.2f} CPU s {run.memory:6.0f} MB"
        if bare:
            figures += f"  {run.wall / bare.wall:6.3f} × bare, CPU {run.cpu / bare.cpu:6.3f} ×"
        print(f"  {KINDS[kind]:30}{figures}", flush=True)


def _exponents(results: Mapping[int, Mapping[str, Run]]) -> None:
    """How time grows with size between the two sizes nearest to 300 and 3000: ~ N^exponent."""
    low, high = (min(results, key=lambda size: abs(math.log(size / end))) for end in GROWTH)
    if low == high:
        return
    print(f"growth exponent from {low} to {high} substances: wall, CPU")
    for kind, small in results[low].items():
        large = results[high][kind]
        ratios = (large.wall / small.wall, large.cpu / small.cpu)
        wall, cpu = (math.log(ratio) / math.log(high / low) for ratio in ratios)
        print(f"  {KINDS[kind]:30}{wall:8.2f} {cpu:8.2f}")


def draw(results: Mapping[int, Mapping[str, Run]], path: Path) -> None:
    """Wall time against size, both on logarithmic scales, as an SVG."""
    import matplotlib as mpl

    mpl.use("svg")
    import matplotlib.pyplot as plt

    mpl.rcParams.update({"svg.fonttype": "none", "svg.hashsalt": "bench"})
    figure, axes = plt.subplots(figsize=(7.5, 4.5), layout="constrained")
    sizes = sorted(results)
    for (kind, label), marker in zip(KINDS.items(), "osD^vP*Xh", strict=True):
        times = [results[size][kind].wall for size in sizes if kind in results[size]]
        if len(times) == len(sizes):
            style = "--" if kind in {"bare", "hugo"} else "-"
            axes.loglog(sizes, times, marker=marker, linestyle=style, label=label)
    axes.set(xlabel="Substances", ylabel="Wall time / s", xticks=sizes)
    axes.xaxis.set_major_formatter("{x:.0f}")
    axes.yaxis.set_major_formatter("{x:g}")
    axes.minorticks_off()
    axes.grid(alpha=0.3)
    figure.legend(loc="outside right upper", frameon=False, fontsize="small")
    path.parent.mkdir(parents=True, exist_ok=True)
    figure.savefig(path, format="svg", metadata={"Date": None, "Creator": None})


def main() -> None:
    """Measure each size asked for, show the table, and draw it where asked to."""
    parser = argparse.ArgumentParser(description=(__doc__ or "").partition("\n")[0])
    parser.add_argument("--sizes", default="100,300,1000,3000", help="numbers of substances")
    parser.add_argument("--runs", type=int, default=3, help="runs of each kind (3)")
    parser.add_argument("--figure", type=Path, help="SVG to draw the times in")
    options = parser.parse_args()
    sizes = [int(size) for size in options.sizes.split(",")]
    print(f"{os.cpu_count()} cores, load {os.getloadavg()[0]:.1f}", flush=True)
    results = {size: measure(size, options.runs) for size in sizes}
    _show(f"{BOOKLET} substances, booklet", {"booklet": booklet(options.runs)})
    _exponents(results)
    if options.figure:
        draw(results, options.figure)


if __name__ == "__main__":
    main()
