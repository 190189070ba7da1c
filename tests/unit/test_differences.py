"""Differences between tables: exactly what was edited, whatever else stands in the way."""

from __future__ import annotations

from collections import Counter
from pathlib import Path

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from generator.csvfile import CsvFile, parse
from generator.differences import ADDED, CELL, REMOVED, Digits, Grid, differences, grid_of, same
from generator.merging import merge
from generator.schema import TableSchema, read_package, read_schema

ROOT = Path(__file__).resolve().parents[2]
SCHEMA = read_schema(read_package(ROOT / "data"))["measurements"]
TEXT = """\
solvent,quantity,value,unit,uncertainty,temperature_c,source,method,note
water,relative_permittivity,80.1,1,,20,tables,,
water,density,0.9970,g/cm3,,25,tables,,
water,density,0.9982,g/cm3,,20,tables,,"two
lines"
methanol,relative_permittivity,33.0,1,0.10,20,tables,,
methanol,relative_permittivity,32.6,1,,25,other,"a, b",
ethanol,relative_permittivity,25.3,1,,20,tables,,said "so"
"""
FILE = parse(TEXT.encode(), ",")
BASE = grid_of(FILE, SCHEMA)
OTHERS = ("value", "unit", "uncertainty", "note")


@st.composite
def edits(draw: st.DrawFn) -> tuple[dict[int, dict[str, str]], frozenset[int], int]:
    """Edits by row of the table, rows deleted, and how many rows are added."""
    fresh = iter(range(1000))
    cells: dict[int, dict[str, str]] = {}
    dropped = set()
    for row in range(len(BASE.rows)):
        what = draw(st.sampled_from(["nothing", "nothing", "cells", "key", "drop"]))
        if what == "cells":
            columns = draw(st.lists(st.sampled_from(OTHERS), min_size=1, max_size=3, unique=True))
            cells[row] = {name: f"new {next(fresh)}" for name in columns}
        elif what == "key":
            cells[row] = {draw(st.sampled_from(SCHEMA.key)): f"key {next(fresh)}"}
        elif what == "drop":
            dropped.add(row)
    return cells, frozenset(dropped), draw(st.integers(0, 2))


def patched(
    file: CsvFile, cells: dict[int, dict[str, str]], dropped: frozenset[int], added: int
) -> CsvFile:
    new = [{name: f"{name} {i}" for name in BASE.columns} for i in range(added)]
    return file.patched(
        {file.body[row]: edit for row, edit in cells.items()},
        frozenset(file.body[row] for row in dropped),
        {file.body[2]: new},
    )


def wanted(
    cells: dict[int, dict[str, str]], dropped: frozenset[int], added: int
) -> Counter[tuple[str, str, str, str]]:
    changed = [
        (CELL, column, BASE.row(row)[column], text)
        for row, edit in cells.items()
        for column, text in edit.items()
    ]
    removed = [(REMOVED, "", "", BASE.row(row)["value"]) for row in dropped]
    return Counter([*changed, *removed, *((ADDED, "", "", f"value {i}") for i in range(added))])


def told(old: Grid, new: Grid) -> Counter[tuple[str, str, str, str]]:
    return Counter(
        (c.kind, c.column, c.old, c.new) if c.kind == CELL else (c.kind, "", "", c.row["value"])
        for c in differences(old, new)
    )


@settings(max_examples=300, deadline=None)
@given(edits(), st.randoms(use_true_random=False))
def test_random_edits_are_told_exactly(
    made: tuple[dict[int, dict[str, str]], frozenset[int], int], random: object
) -> None:
    new = grid_of(parse(bytes(patched(FILE, *made)), ","), SCHEMA)
    assert told(BASE, new) == wanted(*made)
    order = list(range(len(new.rows)))
    random.shuffle(order)  # type: ignore[attr-defined]
    shuffled = Grid(
        SCHEMA, new.columns, tuple(new.rows[i] for i in order), tuple(new.lines[i] for i in order)
    )
    assert told(BASE, shuffled) == wanted(*made)


@settings(max_examples=300, deadline=None)
@given(edits())
def test_random_edits_merge_into_the_unchanged_file(
    made: tuple[dict[int, dict[str, str]], frozenset[int], int],
) -> None:
    new = parse(bytes(patched(FILE, *made)), ",")
    merged = merge(BASE, grid_of(new, SCHEMA), FILE)
    assert merged.conflicts == ()
    assert Counter(line for line in bytes(merged.file).splitlines()) == Counter(
        line for line in bytes(new).splitlines()
    )
    assert told(BASE, grid_of(merged.file, SCHEMA)) == wanted(*made)


@given(edits(), edits())
@settings(max_examples=300, deadline=None)
def test_edits_of_both_sides_in_different_rows_are_both_kept(
    ours: tuple[dict[int, dict[str, str]], frozenset[int], int],
    theirs: tuple[dict[int, dict[str, str]], frozenset[int], int],
) -> None:
    mine = {row: edit for row, edit in ours[0].items() if row < 3}
    others = {row: {c: f"{t} too" for c, t in e.items()} for row, e in theirs[0].items() if row > 2}
    dropped = frozenset(row for row in theirs[1] if row > 2)
    current = parse(bytes(patched(FILE, others, dropped, 0)), ",")
    merged = merge(BASE, grid_of(patched(FILE, mine, frozenset(), ours[2]), SCHEMA), current)
    assert merged.conflicts == ()
    assert told(BASE, grid_of(merged.file, SCHEMA)) == wanted({**mine, **others}, dropped, ours[2])


@pytest.mark.parametrize("path", sorted((ROOT / "data").glob("*.csv")), ids=lambda p: p.name)
def test_a_file_is_the_sum_of_its_cells(path: Path) -> None:
    data = path.read_bytes()
    assert bytes(parse(data, ",")) == data


@given(
    st.text(st.sampled_from('a",;\n\r\t é\ufeff'), max_size=60), st.sampled_from([",", ";", "\t"])
)
def test_any_text_is_the_sum_of_its_cells(text: str, delimiter: str) -> None:
    assert bytes(parse(text.encode(), delimiter)) == text.encode()


@given(
    st.lists(
        st.lists(
            st.text(st.sampled_from('a",; \nx'), min_size=1, max_size=6), min_size=2, max_size=4
        ),
        min_size=1,
        max_size=5,
    )
)
def test_cells_are_read_as_the_csv_library_reads_them(rows: list[list[str]]) -> None:
    import csv
    import io

    text = io.StringIO(newline="")
    csv.writer(text, lineterminator="\r\n").writerows(rows)
    file = parse(text.getvalue().encode(), ",")
    assert [list(record.cells) for record in file.records] == rows
    reader = csv.reader(io.StringIO(text.getvalue(), newline=""))
    behind = [reader.line_num + 1 for _ in reader]
    assert [record.line for record in file.records] == [1, *behind[:-1]]


def test_a_column_only_one_side_has_is_blank_on_the_other() -> None:
    schema = TableSchema("t", "t.csv", (), ("a",), ())
    old = Grid(schema, ("a", "b"), (("1", "x"), ("2", "")), (2, 3))
    new = Grid(schema, ("a", "c"), (("1", "y"), ("2", "")), (2, 3))
    assert [(c.column, c.old, c.new) for c in differences(old, new)] == [
        ("c", "", "y"), ("b", "x", ""),
    ]  # fmt: skip


def test_what_counts_as_the_same() -> None:
    assert same("0.9970", Digits("0.997"))
    assert not same("0.9970", "0.997")
    assert not same("0.9970", Digits("0.998"))
    assert same(" a\r\nb\t", "a\nb")
    assert not same("water", Digits("1"))
