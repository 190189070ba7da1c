"""Handbooks to measure: as many substances as asked for, and the same pages as Markdown.

Up to the published liquids the substances are real, an even share of them, so that small and
large handbooks are alike in how much is known of a substance. Beyond, substances are invented:
named so, under CAS numbers nobody knows, each with a structure of its own and the rows of the
real liquid that stands at the same place by molar mass.
"""

from __future__ import annotations

import csv
import html
import shutil
from collections.abc import Iterator, Sequence
from html.parser import HTMLParser
from itertools import product
from pathlib import Path

from generator import library, structures
from generator.casnumbers import check_digit

ROOT = Path(__file__).resolve().parent.parent.parent
Row = dict[str, str]

_GROUPS = (
    "C", "CC", "CCC", "C(C)C", "CCCC", "CC(C)C", "C(C)CC", "CCCCC", "CCC(C)C", "CC(C)CC",
    "C1CCCC1", "C1CCCCC1", "CC=C", "c1ccccc1", "Cc1ccccc1", "CCOC", "CCOCC", "CCCl", "CCCCl",
    "CCF", "CC#C", "c1ccco1", "c1ccc(F)cc1", "c1ccc(C)cc1",
)  # fmt: skip
_BRIDGES = ("O{}", "C(=O)O{}", "C(=O){}", "S{}", "OC(=O)O{}", "N(C){}", "C(=O)N(C){}", "OCO{}")
_SKIPPED = {"svg", "script", "style", "nav", "button", "select", "math", "noscript"}
_HEADINGS = {"h1", "h2", "h3", "h4"}
_BLOCKS = {*_HEADINGS, "p", "li", "div", "dt", "dd", "table", "caption", "figcaption"}


# --- tables -------------------------------------------------------------------------------------


def _read(table: Path) -> tuple[list[str], list[Row]]:
    with table.open(encoding="utf-8", newline="") as file:
        reader = csv.DictReader(file)
        return list(reader.fieldnames or ()), list(reader)


def _write(table: Path, columns: Sequence[str], rows: Sequence[Row]) -> None:
    with table.open("w", encoding="utf-8", newline="") as file:
        writer = csv.DictWriter(file, columns, lineterminator="\n")
        writer.writeheader()
        writer.writerows(rows)


def handbook(folder: Path, tables: Path, count: int) -> None:
    """A project in ``folder``: the pages and settings of this one, ``count`` of its substances."""
    shutil.copytree(ROOT / "site_src", folder / "site_src")
    shutil.copy(ROOT / "mkdocs.yml", folder)
    shutil.copytree(tables, folder / "data")
    solvents = [row["solvent"] for row in _read(tables / "solvents.csv")[1]]
    if count <= len(solvents):
        kept = {solvents[i * len(solvents) // count] for i in range(count)} | {""}
        for table in (folder / "data").glob("*.csv"):
            columns, rows = _read(table)
            if "solvent" in columns:
                _write(table, columns, [row for row in rows if row["solvent"] in kept])
    else:
        _invent(folder / "data", count - len(solvents))


def _invent(data: Path, count: int) -> None:
    """Append ``count`` invented substances. Light ones get the rows of light liquids."""
    columns, solvents = _read(data / "solvents.csv")
    weighed = [(structures.molecule(row["smiles"]), row["solvent"]) for row in solvents]
    known = {molecule.inchikey for molecule, _ in weighed}
    ranked = [slug for _, slug in sorted((m.molar_mass, slug) for m, slug in weighed)]
    made = sorted(_structures(known, count))
    rows: list[Row] = []
    parents: dict[str, list[str]] = {}
    for index, (_, smiles) in enumerate(made):
        slug = f"invented-{index + 1}"
        number = f"{9_000_000 + index}00"
        cas = f"{number[:-2]}-{number[-2:]}-{check_digit(number)}"
        name, note = f"Invented liquid {index + 1}", "invented, to measure how long a build takes"
        rows.append(dict.fromkeys(columns, "") | {
            "solvent": slug, "name": name, "cas": cas, "smiles": smiles, "note": note
        })  # fmt: skip
        parents.setdefault(ranked[index * len(ranked) // count], []).append(slug)
    _write(data / "solvents.csv", columns, [*solvents, *rows])
    for table in (data / "measurements.csv", data / "correlations.csv"):
        columns, old = _read(table)
        new = [row | {"solvent": slug} for row in old for slug in parents.get(row["solvent"], ())]
        _write(table, columns, [*old, *new])


def _structures(known: set[str], count: int) -> list[tuple[float, str]]:
    """Molar mass and SMILES of ``count`` small molecules that no table knows."""
    found: dict[str, tuple[float, str]] = {}
    for bridge, left, right in product(_BRIDGES, _GROUPS, _GROUPS):
        if len(found) == count:
            return list(found.values())
        # A ring digit of the left group is closed again, so the right one may use it too. The
        # left group is written as a branch of the bridge's first atom.
        atom, rest = bridge[0], bridge[1:]
        try:
            molecule = structures.molecule(f"{atom}({left}){rest.format(right)}")
        except ValueError:
            continue
        if molecule.inchikey not in known and not library.cas_for_inchikey(molecule.inchikey):
            found.setdefault(molecule.inchikey, (molecule.molar_mass, molecule.smiles))
    raise ValueError(f"only {len(found)} structures can be invented, {count} asked for")


def edits(data: Path) -> Iterator[str]:
    """Change one printed permittivity by one in its last place with each step; say which."""
    columns, rows = _read(data / "measurements.csv")
    corrected = {row["solvent"] for row in _read(data / "corrections.csv")[1]}
    candidates = [
        row
        for row in rows
        if row["quantity"] == "relative_permittivity"
        and "." in row["value"]
        and row["solvent"] not in corrected
    ]
    row = candidates[len(candidates) // 2]
    whole, _, places = row["value"].partition(".")
    digits = int(whole + places)
    while True:
        digits += 1
        row["value"] = f"{digits / 10 ** len(places):.{len(places)}f}"
        _write(data / "measurements.csv", columns, rows)
        yield row["solvent"]


# --- the same pages as Markdown -----------------------------------------------------------------


class _Twin(HTMLParser):
    """The article of a finished page as Markdown: headings, text, lists and tables."""

    def __init__(self) -> None:
        super().__init__(convert_charrefs=True)
        self.lines: list[str] = []
        self._words: list[str] = []
        self._inside = self._skipped = 0
        self._row: list[str] | None = None
        self._is_first = False

    def handle_starttag(self, tag: str, attrs: list[tuple[str, str | None]]) -> None:
        self._inside += tag == "article"
        self._skipped += tag in _SKIPPED
        if tag in _BLOCKS:
            self._flush()
        if tag == "table":
            self._is_first = True
        elif tag == "tr":
            self._row = []

    def handle_endtag(self, tag: str) -> None:
        if tag == "article" or tag in _BLOCKS:
            mark = "#" * int(tag[1]) + " " if tag in _HEADINGS else "- " if tag == "li" else ""
            self._flush(mark)
        self._inside -= tag == "article"
        self._skipped -= tag in _SKIPPED
        if self._row is not None and tag in {"td", "th"}:
            self._row.append(" ".join(self._words).replace("|", "/"))
            self._words.clear()
        elif self._row is not None and tag == "tr":
            if self._inside and not self._skipped:
                self.lines.append("| " + " | ".join(self._row) + " |")
                self.lines += ["|" + " --- |" * len(self._row)] * self._is_first
            self._is_first, self._row = False, None
        elif tag == "table":
            self.lines.append("")

    def handle_data(self, data: str) -> None:
        if self._inside and not self._skipped and data.strip():
            self._words.append(html.escape(" ".join(data.split()), quote=False))

    def _flush(self, mark: str = "") -> None:
        if self._words and self._row is None:
            self.lines += [mark + " ".join(self._words), ""]
            self._words.clear()


def _twin(page: str) -> str:
    twin = _Twin()
    twin.feed(page)
    return "\n".join(twin.lines)


_MKDOCS = """\
site_name: Bare
docs_dir: pages
use_directory_urls: false
theme: {name: material, font: false}
plugins: [search]
markdown_extensions: [tables]
nav: [index.md]
not_in_nav: "*"
"""
_HUGO = """\
title = "Bare"
baseURL = "/"
uglyURLs = true
disableKinds = ["taxonomy", "term", "RSS", "sitemap", "section"]
"""
_LAYOUT = (
    "<!doctype html><html lang=en><meta charset=utf-8><title>{{ .Title }}</title>"
    "<main>{{ .Content }}</main>{{ .TableOfContents }}</html>\n"
)


def twins(site: Path, mkdocs: Path, hugo: Path) -> int:
    """Write every page of ``site`` as Markdown into two projects; how many pages there are."""
    pages = [path for path in sorted(site.rglob("*.html")) if path.name != "404.html"]
    for page in pages:
        place = page.relative_to(site).with_suffix(".md")
        text = _twin(page.read_text(encoding="utf-8"))
        # To hugo, index.md would be the only page of its folder.
        own = place.with_name("_index.md") if place.name == "index.md" else place
        for target, content in (
            (mkdocs / "pages" / place, text),
            (hugo / "content" / own, f"---\ntitle: {place.stem}\n---\n{text}"),
        ):
            target.parent.mkdir(parents=True, exist_ok=True)
            target.write_text(content, encoding="utf-8")
    (mkdocs / "mkdocs.yml").write_text(_MKDOCS, encoding="utf-8")
    (hugo / "hugo.toml").write_text(_HUGO, encoding="utf-8")
    (hugo / "layouts").mkdir()
    for name in ("home.html", "single.html"):
        (hugo / "layouts" / name).write_text(_LAYOUT, encoding="utf-8")
    return len(pages)
