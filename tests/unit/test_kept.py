"""Results of a substance are made once, and again as soon as anything they depend on changes."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import replace
from pathlib import Path

from generator import evidence
from generator.cache import Cache
from generator.dataset import load_dataset
from generator.kept import NOTHING, Kept, kept
from generator.metrics import Settings, compute
from generator.quantities import QUANTITIES
from generator.structures import molecule

REVISIONS = {"water": "1", "ethanol": "2"}


def _kept(folder: Path, revisions: Mapping[str, str], *common: object) -> Kept:
    return kept(Cache(folder), "numbers", revisions, *common)


def _lengths(store: Kept, *more: object) -> tuple[list[str], dict[str, int]]:
    """Whose length was made anew, and all lengths."""
    made: list[str] = []

    def make(slugs: Sequence[str]) -> list[int]:
        made.extend(slugs)
        return [len(slug) for slug in slugs]

    return made, dict(store.each(list(REVISIONS), "length", make, *more))


def test_made_once_then_found(tmp_path: Path) -> None:
    first = _kept(tmp_path, REVISIONS, "code")
    assert _lengths(first) == (["water", "ethanol"], {"water": 5, "ethanol": 7})
    assert _lengths(first)[0] == []
    first.save(forget=True)
    assert _lengths(_kept(tmp_path, REVISIONS, "code")) == (
        [],
        {"water": 5, "ethanol": 7},
    )


def test_made_again_where_something_changed(tmp_path: Path) -> None:
    first = _kept(tmp_path, REVISIONS, "code")
    _lengths(first, "a")
    first.save(forget=True)
    cases = {
        "edited": (
            _kept(tmp_path, {**REVISIONS, "water": "3"}, "code"),
            "a",
            ["water"],
        ),
        "other code": (
            _kept(tmp_path, REVISIONS, "else"),
            "a",
            ["water", "ethanol"],
        ),
        "other input": (
            _kept(tmp_path, REVISIONS, "code"),
            "b",
            ["water", "ethanol"],
        ),
    }
    for store, more, again in cases.values():
        assert _lengths(store, more)[0] == again


def test_one_result(tmp_path: Path) -> None:
    store = _kept(tmp_path, REVISIONS)
    assert store.of("water", "name", lambda: "Water") == "Water"
    assert store.of("water", "name", lambda: "not made") == "Water"
    assert store.of("ethanol", "name", lambda: "Ethanol") == "Ethanol"


def test_without_a_store_everything_is_made_each_time() -> None:
    assert _lengths(NOTHING)[0] == ["water", "ethanol"]
    assert _lengths(NOTHING)[0] == ["water", "ethanol"]


def test_kept_numbers_are_the_numbers(few_tables: Path, tmp_path: Path) -> None:
    dataset = load_dataset(few_tables)
    cache = Cache(tmp_path / "cache")

    def everything(store: Kept) -> str:
        book = compute(dataset, Settings(), cache, store)
        return repr([
            (slug, key, book.series(slug, key), book.at(slug, key), book.budget(slug, key))
            for slug in dataset.solvents
            for key in QUANTITIES
        ])  # fmt: skip

    plain = everything(NOTHING)
    store = kept(cache, "numbers", dataset.revisions)
    assert everything(store) == plain
    store.save(forget=True)
    again = kept(cache, "numbers", dataset.revisions)
    assert everything(again) == plain
    assert again.each(list(dataset.solvents), "row", lambda missing: [1 / 0 for _ in missing])


def test_a_substance_alone_has_the_numbers_it_has_among_others(few_tables: Path) -> None:
    dataset = load_dataset(few_tables)
    together = compute(dataset, Settings())
    for slug in dataset.solvents:
        alone = compute(replace(dataset, solvents={slug: dataset.solvents[slug]}), Settings())
        for key in QUANTITIES:
            assert repr(alone.series(slug, key)) == repr(together.series(slug, key))


def _with_wrong_cells(folder: Path) -> None:
    """A density and a permittivity ten times too large."""
    table = folder / "measurements.csv"
    lines = table.read_text(encoding="utf-8").splitlines()
    for start in ("acetone,density,", "hexane,relative_permittivity,"):
        at = next(i for i, line in enumerate(lines) if line.startswith(start))
        cells = lines[at].split(",")
        lines[at] = ",".join([*cells[:2], str(10 * float(cells[2])), *cells[3:]])
    table.write_text("\n".join(lines) + "\n", encoding="utf-8")


def _reviewed(folder: Path, cache: Cache) -> evidence.Review:
    dataset = load_dataset(folder)
    structures = {slug: molecule(s.smiles) for slug, s in dataset.solvents.items()}
    return evidence.review(dataset, structures, cache)


def test_kept_findings_are_the_findings(few_tables: Path, tmp_path: Path) -> None:
    cache = Cache(tmp_path / "cache")
    before = _reviewed(few_tables, cache)
    _with_wrong_cells(few_tables)
    found = _reviewed(few_tables, cache)
    assert len(found.problems) > len(before.problems)
    assert found == _reviewed(few_tables, Cache(None))
    assert found == _reviewed(few_tables, cache)


def test_kept_findings_follow_their_rows(few_tables: Path, tmp_path: Path) -> None:
    cache = Cache(tmp_path / "cache")
    _with_wrong_cells(few_tables)
    before = _reviewed(few_tables, cache)
    table = few_tables / "measurements.csv"
    header, *rows = table.read_text(encoding="utf-8").splitlines()
    water = [row for row in rows if row.startswith("water,")]
    rest = [row for row in rows if not row.startswith("water,")]
    table.write_text("\n".join([header, *rest, *water]) + "\n", encoding="utf-8")
    after = _reviewed(few_tables, cache)
    assert {p.line for p in after.problems} != {p.line for p in before.problems}
    assert after == _reviewed(few_tables, Cache(None))
