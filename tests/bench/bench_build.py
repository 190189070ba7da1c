"""Time the handbook's build beside a bare ``mkdocs build`` of the same pages as Markdown.

Whole processes, alternating, so that whatever else the machine does falls on both alike. The
Markdown twin of a page holds its headings, text, lists and tables, but none of its pictures;
it goes through the same theme and the same search, with pages out of the navigation tree. What
the bare build is spared (tables, checks, numbers, figures, structures) is what the ratio shows.

    python tests/bench/bench_build.py                      the shipped solvents
    python tests/bench/bench_build.py --sizes 120 300 900  growth, with `add --all-liquids`
"""

from __future__ import annotations

import argparse
import csv
import math
import os
import shutil
import statistics
import sys
import tempfile
import time
from collections.abc import Sequence
from dataclasses import dataclass
from html.parser import HTMLParser
from pathlib import Path

ROOT = Path(__file__).resolve().parent.parent.parent
BIN = Path(sys.executable).parent
BOUND = 2.0
BARE_SETTINGS = """\
site_name: Bare
docs_dir: pages
use_directory_urls: false
theme: {name: material, font: false}
plugins: [search]
markdown_extensions: [tables]
nav: [index.md]
not_in_nav: "*"
"""
_SKIPPED = {"svg", "script", "style", "nav", "button", "input", "select", "math", "noscript"}
_VOID = {"br", "img", "hr", "input", "link", "meta", "source", "wbr"}


@dataclass(frozen=True, slots=True)
class Run:
    """One process: wall and processor time [s], largest memory [MB]."""

    wall: float
    cpu: float
    memory: float


class _Twin(HTMLParser):
    """The article of a finished page as Markdown."""

    def __init__(self) -> None:
        super().__init__(convert_charrefs=True)
        self.lines: list[str] = []
        self._words: list[str] = []
        self._inside = self._skipped = self._cells = 0
        self._row: list[str] = []
        self._first_row = False

    def handle_starttag(self, tag: str, attrs: list[tuple[str, str | None]]) -> None:
        if tag == "article":
            self._inside += 1
        if tag in _SKIPPED and tag not in _VOID:
            self._skipped += 1
        if tag in {"h1", "h2", "h3", "h4", "p", "li", "div", "dt", "dd", "table", "caption"}:
            self._flush()
        if tag == "table":
            self._first_row = True
        if tag in {"td", "th"}:
            self._words.clear()

    def handle_endtag(self, tag: str) -> None:
        if tag == "article":
            self._flush()
            self._inside -= 1
        if tag in _SKIPPED and tag not in _VOID:
            self._skipped -= 1
        if tag in {"h1", "h2", "h3", "h4"}:
            self._flush("#" * int(tag[1]) + " ")
        elif tag == "li":
            self._flush("- ")
        elif tag in {"p", "div", "dt", "dd", "caption"}:
            self._flush()
        elif tag in {"td", "th"}:
            self._row.append(" ".join(self._words).replace("|", "/"))
            self._words.clear()
        elif tag == "tr":
            self.lines.append("| " + " | ".join(self._row) + " |")
            if self._first_row:
                self.lines.append("|" + " --- |" * len(self._row))
            self._first_row = False
            self._row.clear()
        elif tag == "table":
            self.lines.append("")

    def handle_data(self, data: str) -> None:
        if self._inside and not self._skipped and data.strip():
            self._words.append(" ".join(data.split()))

    def _flush(self, mark: str = "") -> None:
        if self._words and not self._row:
            self.lines += [mark + " ".join(self._words), ""]
            self._words.clear()


def _twin_of(html: str) -> str:
    twin = _Twin()
    twin.feed(html)
    return "\n".join(twin.lines)


def _run(command: Sequence[str | Path], folder: Path) -> Run:
    """Run to its end and take its resources; a failure ends the benchmark."""
    log = folder / "log.txt"
    environment = {**os.environ, "NO_MKDOCS_2_WARNING": "1"}
    start = time.monotonic()
    pid = os.posix_spawn(
        command[0],
        [str(part) for part in command],
        environment,
        file_actions=[
            (os.POSIX_SPAWN_OPEN, 1, str(log), os.O_WRONLY | os.O_CREAT | os.O_TRUNC, 0o644),
            (os.POSIX_SPAWN_DUP2, 1, 2),
        ],
    )
    _, status, used = os.wait4(pid, 0)
    wall = time.monotonic() - start
    if status:
        sys.exit(f"{' '.join(map(str, command))} failed:\n{log.read_text()}")
    return Run(wall, used.ru_utime + used.ru_stime, used.ru_maxrss / 1024)


def _reduce(data: Path, count: int) -> None:
    """Keep the rows of the first ``count`` solvents."""
    with (data / "solvents.csv").open(encoding="utf-8", newline="") as file:
        kept = {row["solvent"] for row, _ in zip(csv.DictReader(file), range(count), strict=False)}
    if len(kept) < count:
        sys.exit(f"only {len(kept)} solvents to be had, {count} asked for")
    for table in data.glob("*.csv"):
        with table.open(encoding="utf-8", newline="") as file:
            header, *rows = csv.reader(file)
        if "solvent" not in header:
            continue
        place = header.index("solvent")
        with table.open("w", encoding="utf-8", newline="") as file:
            writer = csv.writer(file, lineterminator="\n")
            writer.writerows([header, *(row for row in rows if row and row[place] in kept)])


def _handbook(folder: Path, count: int | None, shipped: int) -> None:
    """A copy of the project's tables, pages and settings, with ``count`` solvents."""
    shutil.copytree(ROOT / "data", folder / "data")
    shutil.copytree(ROOT / "site_src", folder / "site_src")
    shutil.copy(ROOT / "mkdocs.yml", folder)
    if count is not None and count > shipped:
        add = [BIN / "datasheets", "add", "--all-liquids", "--data", folder / "data"]
        _run(add, folder)
    if count is not None and count != shipped:
        _reduce(folder / "data", count)


def _bare(folder: Path, site: Path) -> int:
    """The Markdown twin of every page of ``site``; how many there are."""
    pages = [path for path in sorted(site.rglob("*.html")) if path.name != "404.html"]
    for path in pages:
        target = folder / "pages" / path.relative_to(site).with_suffix(".md")
        target.parent.mkdir(parents=True, exist_ok=True)
        target.write_text(_twin_of(path.read_text(encoding="utf-8")), encoding="utf-8")
    (folder / "mkdocs.yml").write_text(BARE_SETTINGS, encoding="utf-8")
    return len(pages)


def _median(runs: Sequence[Run]) -> Run:
    return Run(
        statistics.median(r.wall for r in runs),
        statistics.median(r.cpu for r in runs),
        max(r.memory for r in runs),
    )


def measure(count: int | None, shipped: int, repeats: int) -> dict[str, Run]:
    """Medians for one size: bare, and the handbook with nothing kept and with all kept."""
    with tempfile.TemporaryDirectory(prefix="bench-") as name:
        ours, bare = Path(name, "handbook"), Path(name, "bare")
        ours.mkdir()
        bare.mkdir()
        _handbook(ours, count, shipped)
        build = [BIN / "datasheets", "build", "--config", ours / "mkdocs.yml"]
        build += ["--site", ours / "site"]
        plain = [BIN / "mkdocs", "build", "--quiet", "--config-file", bare / "mkdocs.yml"]
        _run(build, ours)
        pages = _bare(bare, ours / "site")
        runs: dict[str, list[Run]] = {"bare": [], "cold": [], "warm": []}
        for _ in range(repeats):
            runs["bare"].append(_run(plain, bare))
            shutil.rmtree(ours / ".cache", ignore_errors=True)
            runs["cold"].append(_run(build, ours))
            runs["warm"].append(_run(build, ours))
    medians = {kind: _median(kind_runs) for kind, kind_runs in runs.items()}
    _show(count or shipped, pages, medians)
    return medians


def _show(solvents: int, pages: int, medians: dict[str, Run]) -> None:
    floor = medians["bare"]
    print(f"{solvents} solvents, {pages} pages")
    for kind, label in (
        ("bare", "bare mkdocs build"),
        ("cold", "handbook, nothing kept"),
        ("warm", "handbook, figures kept"),
    ):
        run = medians[kind]
        print(
            f"  {label:24} {run.wall:7.2f} s  {run.cpu:7.2f} CPU s  {run.memory:5.0f} MB"
            f"  {run.wall / floor.wall:5.2f} x"
        )


def main() -> None:
    """Measure each size asked for; end with status 1 when the shipped size misses the bound."""
    parser = argparse.ArgumentParser(description=(__doc__ or "").partition("\n")[0])
    parser.add_argument("--sizes", type=int, nargs="*", help="numbers of solvents")
    parser.add_argument("--runs", type=int, default=5, help="runs of each kind (5)")
    options = parser.parse_args()
    with (ROOT / "data" / "solvents.csv").open(encoding="utf-8", newline="") as file:
        shipped = sum(1 for _ in csv.DictReader(file))
    sizes = options.sizes or [shipped]
    results = {size: measure(size, shipped, options.runs) for size in sizes}
    if len(sizes) > 1:
        low, high = min(sizes), max(sizes)
        for kind in ("bare", "cold", "warm"):
            growth = math.log(results[high][kind].wall / results[low][kind].wall)
            print(f"growth exponent, {kind}: {growth / math.log(high / low):.2f}")
    first = results[sizes[0]]
    if first["cold"].wall > BOUND * first["bare"].wall:
        sys.exit(f"slower than {BOUND:g} times the bare build")


if __name__ == "__main__":
    main()
