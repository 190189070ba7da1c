"""The revision of a substance follows its own rows, wherever in the tables they stand."""

from __future__ import annotations

import shutil
from pathlib import Path

import pytest

from generator.dataset import load_dataset

DATA = Path(__file__).resolve().parents[2] / "data"


def _revisions(folder: Path) -> dict[str, str]:
    return dict(load_dataset(folder).revisions)


@pytest.fixture
def tables(tmp_path: Path) -> Path:
    return Path(shutil.copytree(DATA, tmp_path / "data"))


def _changed(folder: Path, file: str, old: str, new: str) -> set[str]:
    before = _revisions(folder)
    text = (folder / file).read_text(encoding="utf-8")
    assert old in text
    (folder / file).write_text(text.replace(old, new, 1), encoding="utf-8")
    after = _revisions(folder)
    return {slug for slug in {*before, *after} if before.get(slug) != after.get(slug)}


def test_every_substance_has_its_own(tables: Path) -> None:
    revisions = _revisions(tables)
    assert len(set(revisions.values())) == len(load_dataset(tables).solvents)


def test_an_edit_concerns_its_substance_alone(tables: Path) -> None:
    row = next(
        line
        for line in (tables / "measurements.csv").read_text(encoding="utf-8").splitlines()
        if line.startswith("acetone,relative_permittivity,")
    )
    cells = row.split(",")
    assert _changed(tables, "measurements.csv", row, ",".join([*cells[:2], "99", *cells[3:]])) == {
        "acetone"
    }


def test_rows_may_move(tables: Path) -> None:
    header, *rows = (tables / "measurements.csv").read_text(encoding="utf-8").splitlines()
    before = _revisions(tables)
    first = [row for row in rows if row.startswith("water,")]
    others = [row for row in rows if not row.startswith("water,")]
    text = "\n".join([header, *first, *others]) + "\n"
    (tables / "measurements.csv").write_text(text, encoding="utf-8")
    assert _revisions(tables) == before


def test_a_source_concerns_those_who_name_it(tables: Path) -> None:
    dataset = load_dataset(tables)
    named = {row.solvent for row in dataset.measurements if row.source == "crc-permittivity"}
    named |= {row.solvent for row in dataset.correlations if row.source == "crc-permittivity"}
    others = set(dataset.solvents) - named
    source = dataset.sources["crc-permittivity"]
    changed = _changed(tables, "sources.csv", source.citation.split(",")[0], "Anew")
    assert named <= changed
    assert not changed & others
