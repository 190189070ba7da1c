"""After any edits the site that was brought up to date is the site of a build from nothing."""

from __future__ import annotations

import csv
import hashlib
import random
import shutil
from collections.abc import Callable
from pathlib import Path

import pytest

from generator.errors import DatasetError
from generator.update import Report, update

pytestmark = pytest.mark.build
SEQUENCES = 50
EDITS = 3
# What takes long to make and does not depend on the tables but through its key.
SLOW = ("curve", "structure", "model-figure", "dipole-estimate", "molecules.pack")


class Desk:
    """A handbook that is edited at random: its tables, pages, settings and published site."""

    def __init__(self, folder: Path, seed: int) -> None:
        self.folder, self.random = folder, random.Random(seed)
        self.original = shutil.copytree(folder / "data", folder / "original")
        self.done: list[str] = []

    def build(self) -> Report:
        return update(self.folder / "mkdocs.yml", self.folder / "site", lambda stage: None)

    def rows(self, table: str) -> list[list[str]]:
        with (self.folder / "data" / f"{table}.csv").open(encoding="utf-8", newline="") as file:
            return list(csv.reader(file))

    def write(self, table: str, rows: list[list[str]]) -> None:
        path = self.folder / "data" / f"{table}.csv"
        with path.open("w", encoding="utf-8", newline="") as file:
            csv.writer(file, lineterminator="\n").writerows(rows)

    def edit(self) -> None:
        """One edit of any kind."""
        kind = self.random.choice(EDIT_KINDS)
        kind(self)
        self.done.append(kind.__name__)


def _another_value(desk: Desk) -> None:
    header, *rows = desk.rows("measurements")
    row = desk.random.choice(rows)
    row[2] = f"{float(row[2]) * desk.random.choice([0.9, 0.99, 1.01, 1.3, 10]):.6g}"
    desk.write("measurements", [header, *rows])


def _a_row_less(desk: Desk) -> None:
    table = desk.random.choice(["measurements", "correlations", "stock", "handling"])
    header, *rows = desk.rows(table)
    if rows:
        rows.pop(desk.random.randrange(len(rows)))
    desk.write(table, [header, *rows])


def _a_row_more(desk: Desk) -> None:
    header, *rows = desk.rows("measurements")
    row = [*desk.random.choice([r for r in rows if r[5]])]
    row[5] = f"{float(row[5]) + desk.random.uniform(0.5, 5):.1f}"
    rows.insert(desk.random.randrange(len(rows)), row)
    desk.write("measurements", [header, *rows])


def _rows_in_another_order(desk: Desk) -> None:
    table = desk.random.choice(["measurements", "solvents", "sources"])
    header, *rows = desk.rows(table)
    desk.random.shuffle(rows)
    desk.write(table, [header, *rows])


def _another_name(desk: Desk) -> None:
    header, *rows = desk.rows("solvents")
    row = desk.random.choice(rows)
    column = desk.random.choice([1, 4, 5])
    row[column] = f"{row[column]} {desk.random.choice('abc')}".strip()
    desk.write("solvents", [header, *rows])


def _a_substance_less(desk: Desk) -> None:
    slugs = [row[0] for row in desk.rows("solvents")[1:]]
    if len(slugs) < 5:
        return
    gone = desk.random.choice(slugs)
    for path in (desk.folder / "data").glob("*.csv"):
        header, *rows = desk.rows(path.stem)
        if "solvent" in header:
            place = header.index("solvent")
            desk.write(path.stem, [header, *(row for row in rows if row[place] != gone)])


def _as_it_was(desk: Desk) -> None:
    shutil.copytree(desk.original, desk.folder / "data", dirs_exist_ok=True)


def _another_source(desk: Desk) -> None:
    header, *rows = desk.rows("sources")
    desk.random.choice(rows)[2] += "."
    desk.write("sources", [header, *rows])


def _other_uncertainties(desk: Desk) -> None:
    header, *rows = desk.rows("uncertainties")
    row = desk.random.choice(rows)
    place = header.index("relative")
    row[place] = f"{float(row[place] or 0) * 1.5 + 0.001:.4g}"
    desk.write("uncertainties", [header, *rows])


def _other_settings(desk: Desk) -> None:
    file = desk.folder / "mkdocs.yml"
    text = file.read_text(encoding="utf-8")
    pairs = [
        ("laboratory: Demonstration", "laboratory: Another"),
        ("[0, 10, 20,", "[0, 20,"),
        ("reference_temperature_c: 25", "reference_temperature_c: 20"),
    ]
    old, new = desk.random.choice(pairs)
    text = text.replace(old, new) if old in text else text.replace(new, old)
    file.write_text(text, encoding="utf-8")


def _another_page(desk: Desk) -> None:
    name = desk.random.choice(["how-to-read.md", "assets/print.css"])
    with (desk.folder / "site_src" / "pages" / name).open("a", encoding="utf-8") as file:
        file.write("\n\n" if name.endswith(".css") else "\n\nOne more word.\n")


def _a_hand_on_the_site(desk: Desk) -> None:
    files = sorted(p for p in (desk.folder / "site").rglob("*") if p.is_file())
    path = desk.random.choice(files)
    if desk.random.random() < 0.5:
        path.unlink()
    else:
        path.write_bytes(b"something else")


def _a_lost_cache(desk: Desk) -> None:
    name = desk.random.choice(["numbers.pack", "findings.pack", "site", "template"])
    path = desk.folder / ".cache" / name
    shutil.rmtree(path) if path.is_dir() else path.unlink(missing_ok=True)


EDIT_KINDS: list[Callable[[Desk], None]] = [
    *[_another_value] * 4, _a_row_less, _a_row_more, _rows_in_another_order, _another_name,
    _a_substance_less, _as_it_was, _another_source, _other_uncertainties, _other_settings,
    _another_page, _a_hand_on_the_site, _a_lost_cache,
]  # fmt: skip


def _contents(site: Path) -> dict[str, str]:
    return {
        path.relative_to(site).as_posix(): hashlib.sha256(path.read_bytes()).hexdigest()
        for path in sorted(site.rglob("*"))
        if path.is_file()
    }


@pytest.fixture(scope="session")
def slow_results(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """Figures, conformers and structures, made once for all sequences."""
    return tmp_path_factory.mktemp("slow")


def _lend(source: Path, target: Path) -> None:
    for name in SLOW:
        path = source / name
        if path.is_dir():
            shutil.copytree(path, target / name, dirs_exist_ok=True)
        elif path.is_file():
            target.mkdir(parents=True, exist_ok=True)
            shutil.copy(path, target / name)


@pytest.mark.parametrize("seed", range(SEQUENCES))
def test_the_site_is_that_of_a_clean_build(seed: int, few: Path, slow_results: Path) -> None:
    desk = Desk(few, seed)
    _lend(slow_results, few / ".cache")
    desk.build()
    made = 0
    for _ in range(EDITS):
        desk.edit()
        try:
            made += desk.build().anew
        except DatasetError:
            _as_it_was(desk)
            made += desk.build().anew
    clean = few / "clean"
    clean.mkdir()
    for name in ("data", "site_src"):
        shutil.copytree(few / name, clean / name)
    shutil.copy(few / "mkdocs.yml", clean)
    if seed % 10:  # every tenth is made from nothing at all
        _lend(few / ".cache", clean / ".cache")
    update(clean / "mkdocs.yml", clean / "site", lambda stage: None)
    assert _contents(few / "site") == _contents(clean / "site"), desk.done
    _lend(few / ".cache", slow_results)


def test_nothing_is_made_where_nothing_changed(few: Path, slow_results: Path) -> None:
    desk = Desk(few, 0)
    _lend(slow_results, few / ".cache")
    first = desk.build()
    assert first.changed
    assert first.anew == first.pages
    before = {path: path.stat().st_mtime_ns for path in (few / "site").rglob("*")}
    second = desk.build()
    assert not second.changed
    assert (second.anew, second.pages, second.findings) == (0, first.pages, first.findings)
    assert {path: path.stat().st_mtime_ns for path in (few / "site").rglob("*")} == before


def test_one_value_makes_few_pages_anew(few: Path, slow_results: Path) -> None:
    desk = Desk(few, 0)
    _lend(slow_results, few / ".cache")
    desk.build()
    rows = desk.rows("measurements")
    row = next(r for r in rows if r[:2] == ["acetone", "density"])
    row[2] = f"{float(row[2]) * 1.0005:.5g}"
    desk.write("measurements", rows)
    standing = few / "site" / "solvents" / "water.html"
    before = standing.stat().st_mtime_ns
    assert desk.build().anew < 16
    assert standing.stat().st_mtime_ns == before
