"""The cross-checks measured: on damaged cells, on entries known to be wrong, on what is shipped."""

from __future__ import annotations

import csv
import importlib.util
import sys
from collections.abc import Iterator
from pathlib import Path
from types import ModuleType

import pytest

from generator import additions, evidence
from generator.cache import Cache
from generator.dataset import load_dataset
from generator.errors import Problem
from generator.structures import molecule

HERE = Path(__file__).parent
ROOT = HERE.parents[1]
CACHE = Cache(ROOT / ".cache")


@pytest.fixture(scope="module")
def damage() -> Iterator[ModuleType]:
    spec = importlib.util.spec_from_file_location("damage", HERE / "damage.py")
    assert spec is not None
    assert spec.loader is not None
    module = importlib.util.module_from_spec(spec)
    sys.modules["damage"] = module
    spec.loader.exec_module(module)
    yield module
    del sys.modules["damage"]


@pytest.mark.build
def test_the_shipped_tables_leave_no_suspect_unexplained() -> None:
    dataset = load_dataset(ROOT / "data")
    structures = {slug: molecule(s.smiles) for slug, s in dataset.solvents.items()}
    review = evidence.review(dataset, structures, CACHE)
    assert [str(problem) for problem in review.problems] == []
    for problem, reason in review.kept:
        assert len(reason) > 40, problem
    kept = [c for c in dataset.corrections if c.action == "keep"]
    # A decision that nothing doubts any more is to be taken out again.
    assert len(review.kept) == len(kept)


@pytest.mark.build
def test_damaged_cells_are_named(damage: ModuleType) -> None:
    done, named = damage.run(63, seed=5)
    assert done["all"] == 63
    assert named["all"] / done["all"] >= 0.85
    for kind in damage.KINDS:
        assert named[kind] / done[kind] >= 0.6, (kind, named[kind], done[kind])


@pytest.mark.build
def test_physics_alone_names_most_damaged_cells(damage: ModuleType) -> None:
    """Without the open tables that the rows were copied from."""
    done, named = damage.run(63, physics=True, seed=6)
    assert named["all"] / done["all"] >= 0.75


def wrong_entries() -> list[dict[str, str]]:
    with (HERE / "known_wrong.csv").open(encoding="utf-8", newline="") as file:
        return list(csv.DictReader(file))


def test_each_wrong_entry_says_how_that_is_known() -> None:
    entries = wrong_entries()
    assert len(entries) >= 100
    assert len({(e["cas"], e["quantity"], e["source"]) for e in entries}) == len(entries)
    decided = {
        (c.quantity, c.source)
        for c in load_dataset(ROOT / "data").corrections
        if c.action != "keep"
    }
    for entry in entries:
        if entry["where_from"] == "from memory":
            assert entry["right"], entry
        else:
            assert (entry["quantity"], entry["source"]) in decided, entry


@pytest.mark.build
def test_wrong_entries_of_the_open_tables_are_named(tmp_path: Path, damage: ModuleType) -> None:
    """On all liquids with a published permittivity, by substance and quantity."""
    folder = tmp_path / "data"
    folder.mkdir()
    additions.apply(additions.plan(folder, (), all_liquids=True))
    dataset = load_dataset(folder)
    molecules = {slug: molecule(s.smiles) for slug, s in dataset.solvents.items()}
    problems = damage.suspects(dataset, *evidence.prepared(dataset, molecules, CACHE))
    assert 300 < len(problems) < 700
    owners = {
        ("measurements.csv", m.line): (dataset.solvents[m.solvent].cas, m.quantity)
        for m in dataset.measurements
    }
    owners |= {
        ("correlations.csv", c.line): (dataset.solvents[c.solvent].cas, c.quantity)
        for c in dataset.correlations
    }
    named = {place(owners, problem) for problem in problems}
    entries = wrong_entries()
    missed = [e for e in entries if (e["cas"], e["quantity"]) not in named]
    assert len(missed) <= 0.1 * len(entries), missed


def place(
    owners: dict[tuple[str, int], tuple[str, str]], problem: Problem
) -> tuple[str, str] | None:
    """Substance and quantity that a finding is about."""
    return owners.get((problem.file, problem.line))
