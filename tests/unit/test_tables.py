"""Files as spreadsheets write them: the same rows come back, whatever the dress."""

from __future__ import annotations

import csv
import io
from collections.abc import Iterator
from pathlib import Path

import pytest
from hypothesis import given
from hypothesis import strategies as st

from generator.schema import Field, TableSchema, shipped_schema
from generator.tables import Table, read_table, read_tables

ROOT = Path(__file__).resolve().parents[2]
SCHEMA = TableSchema(
    "things",
    "things.csv",
    (
        Field("thing", "string", "Name of the thing.", required=True),
        Field("value", "number", "Its value."),
        Field("remark", "string", "Anything."),
    ),
    ("thing",),
    (),
)
# Without what other encodings make of letters, and without cells that say "error".
TEXTS = (
    st.text(
        st.characters(codec="ascii", exclude_categories=["Cc"]) | st.sampled_from("µβ°é\n"),
        max_size=12,
    )
    .map(lambda text: text.strip())
    .filter(lambda text: not text.startswith("#"))
)
ROWS = st.lists(
    st.tuples(
        TEXTS.filter(bool),
        st.none() | st.floats(allow_nan=False, allow_infinity=False),
        TEXTS,
    ),
    max_size=6,
)


def _written(
    rows: list[tuple[str, float | None, str]], delimiter: str, newline: str, quoting: int
) -> str:
    text = io.StringIO(newline="")
    writer = csv.writer(text, delimiter=delimiter, lineterminator=newline, quoting=quoting)
    writer.writerow(SCHEMA.columns)
    for name, value, remark in rows:
        writer.writerow([name, "" if value is None else repr(value), remark])
    return text.getvalue()


def _cells(table: Table) -> Iterator[tuple[str, ...]]:
    return (tuple(row[column] for column in SCHEMA.columns) for row in table.rows)


@given(
    ROWS,
    st.sampled_from([",", ";", "\t"]),
    st.sampled_from(["\n", "\r\n"]),
    st.sampled_from([csv.QUOTE_MINIMAL, csv.QUOTE_ALL]),
    st.booleans(),
    st.sampled_from(["", "\n", "{0}{0}\n", "\r\n{0}{0}\r\n\r\n"]),
)
def test_rows_come_back_from_any_dress(
    rows: list[tuple[str, float | None, str]],
    delimiter: str,
    newline: str,
    quoting: int,
    bom: bool,
    tail: str,
) -> None:
    text = _written(rows, delimiter, newline, quoting) + tail.format(delimiter)
    data = (b"\xef\xbb\xbf" if bom else b"") + text.encode()
    table, problems = read_table(data, SCHEMA)
    assert {problem.severity for problem in problems} <= {"note"}
    expected = [(n, "" if v is None else repr(v), r) for n, v, r in rows]
    assert list(_cells(table)) == expected
    assert (table.has_bom, table.delimiter if rows else delimiter) == (bom, delimiter)
    lines = text.replace("\r\n", "\n").split("\n")
    for row in table.rows:
        # The line is the physical one, also behind cells of several lines.
        assert row["thing"].split("\n")[0] in lines[row.line - 1].replace('""', '"')


@given(st.binary(max_size=200))
def test_no_file_makes_the_reader_stumble(data: bytes) -> None:
    table, problems = read_table(data, SCHEMA)
    told = [problem for problem in problems if problem.severity == "error"]
    assert (list(table.columns) == list(SCHEMA.columns) and table.complete) or told


@given(st.integers(0, 10_000))
def test_a_file_cut_anywhere_is_never_taken_for_a_whole_one_with_other_values(cut: int) -> None:
    whole = _written(
        [("water", 80.1, "a, b"), ("acetone", 20.7, 'said "so"')], ",", "\n", csv.QUOTE_MINIMAL
    ).encode()
    cut %= len(whole)
    table, problems = read_table(whole[:cut], SCHEMA)
    if problems:
        return
    full = list(_cells(read_table(whole, SCHEMA)[0]))
    assert list(_cells(table)) == full[: len(table.rows)]


def test_a_row_of_the_wrong_length_is_not_asked_about_its_cells() -> None:
    table, problems = read_table(b"thing,value,remark\nwater, 1,2-mix,80.1,ok\nice,x,\n", SCHEMA)
    assert [(p.line, p.kind) for p in problems] == [(2, "too-many-cells"), (3, "wrong-type")]
    assert [row.whole for row in table.rows] == [False, True]
    assert [row["thing"] for row in table.whole_rows] == ["ice"]
    assert table.faulty == {(2, "remark"), (3, "value")}


def test_every_fault_of_a_file_is_told() -> None:
    data = 'thing,valu,remark,colour\nwater,"1,5",,\n,x,é,\n'.encode("latin-1")
    problems = read_table(data, SCHEMA)[1]
    assert [(p.line, p.column, p.kind) for p in problems] == [
        (1, "valu", "unknown-column"),
        (1, "colour", "unknown-column"),
        (2, "value", "decimal-comma"),
        (3, "thing", "blank"),
        (3, "value", "wrong-type"),
        (3, "remark", "encoding"),
    ]


@pytest.mark.parametrize("path", sorted((ROOT / "data").glob("*.csv")), ids=lambda path: path.stem)
def test_the_shipped_tables_read_without_a_word(path: Path) -> None:
    schema = next(s for s in shipped_schema().values() if s.path == path.name)
    table, problems = read_table(path.read_bytes(), schema)
    assert problems == []
    assert table.columns == schema.columns


def test_the_revision_follows_the_contents(tmp_path: Path) -> None:
    for path in (ROOT / "data").iterdir():
        (tmp_path / path.name).write_bytes(path.read_bytes())
    same = read_tables(tmp_path).revision
    assert same == read_tables(ROOT / "data").revision
    stock = tmp_path / "stock.csv"
    stock.write_bytes(stock.read_bytes().replace(b"Flammables", b"flammables", 1))
    assert read_tables(tmp_path).revision != same
