"""Table files as spreadsheets leave them → rows of clean text, with every fault in its place.

Accepted and said so as a note: a byte order mark, semicolons or tabs between the cells,
non-breaking spaces, the typographic minus sign, a missing last line end. Accepted without a
word: CRLF, blank rows, blank cells behind the last column. Everything else is an error.
"""

from __future__ import annotations

import csv
import io
from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass
from difflib import get_close_matches
from hashlib import sha256
from pathlib import Path
from typing import Any

from generator.cells import NOTE, Fault, plain, read_cell
from generator.errors import Problem
from generator.schema import TableSchema, read_package, read_schema

HISTORY = "history"
"""The table of recorded revisions, which does not count for the revision."""
_BOM = "\ufeff"
_CUT = ("truncated", "bad-quotes")
_NAMES = {"\t": "tabs", ";": "semicolons", ",": "commas"}


@dataclass(frozen=True, slots=True)
class Row:
    """One row: ``line`` is its first physical line in the file, ``cells`` clean text by column.

    ``whole`` is false where the row has too many or too few cells, so that what stands in a cell
    may belong to another column.
    """

    line: int
    cells: Mapping[str, str]
    whole: bool = True

    def __getitem__(self, column: str) -> str:
        return self.cells.get(column, "")


@dataclass(frozen=True, slots=True)
class Table:
    """The rows of one file. ``newline`` and ``delimiter`` are as found in the file.

    ``faulty`` holds line and column of every cell with an error; ``complete`` is false where rows
    are missing because the file is, or cannot be read to its end.
    """

    schema: TableSchema
    rows: tuple[Row, ...]
    columns: tuple[str, ...] = ()
    delimiter: str = ","
    newline: str = "\n"
    has_bom: bool = False
    faulty: frozenset[tuple[int, str]] = frozenset()
    complete: bool = True

    @property
    def whole_rows(self) -> Iterator[Row]:
        """The rows in which every cell stands under its column."""
        return (row for row in self.rows if row.whole)

    def problem(self, row: Row, column: str, fault: Fault) -> Problem:
        """A fault in one cell of one row."""
        return Problem(self.schema.path, row.line, column, *fault)


@dataclass(frozen=True)
class Tables:
    """A folder of tables as read: rows, problems with their places, and a hash of the contents."""

    folder: Path
    package: Mapping[str, Any]
    tables: Mapping[str, Table]
    problems: tuple[Problem, ...]
    revision: str

    def __getitem__(self, name: str) -> Table:
        return self.tables[name]


def read_tables(folder: Path) -> Tables:
    """Read every table that ``datapackage.json`` names.

    Raises ``DatasetError`` when the description itself cannot be read; faults of the tables are
    in ``problems``.
    """
    package = read_package(folder)
    tables, problems = {}, []
    seal = sha256()
    for name, schema in read_schema(package).items():
        try:
            data = (folder / schema.path).read_bytes()
        except OSError as error:
            problems.append(
                Problem(
                    schema.path, 0, "", "missing-table", error.strerror or "cannot be read",
                    f"a table with the columns {', '.join(schema.columns)}",
                    f"put {schema.path} back, or a file with only the line "
                    f"{','.join(schema.columns)}",
                )
            )  # fmt: skip
            tables[name] = Table(schema, (), schema.columns, complete=False)
            continue
        if name != HISTORY:
            seal.update(f"{name}\x00{len(data)}\x00".encode() + data)
        tables[name], found = read_table(data, schema)
        problems += found
    return Tables(folder, package, tables, tuple(problems), seal.hexdigest()[:8])


def revisions(tables: Tables) -> dict[str, str]:
    """Hash of what the tables say about each substance, wherever in them its rows stand.

    The sources that the rows name are part of it; what is on record of earlier revisions is not.
    """
    sources = dict(_said(tables["sources"], "source"))
    shares: dict[str, list[str]] = {row["solvent"]: [] for row in tables["solvents"].rows}
    named: dict[str, set[str]] = {slug: set() for slug in shares}
    for key, table in tables.tables.items():
        if key != HISTORY and "solvent" in table.schema.columns:
            for (slug, text), row in zip(_said(table, "solvent"), table.rows, strict=True):
                if slug in shares:
                    shares[slug].append(text)
                    named[slug].add(row.cells.get("source", ""))
    for slug, keys in named.items():
        shares[slug] += [sources[key] for key in sorted(keys & sources.keys())]
    return {slug: sha256(repr(said).encode()).hexdigest() for slug, said in shares.items()}


def _said(table: Table, column: str) -> Iterator[tuple[str, str]]:
    """The rows of a table by one of their columns, each as one text, its columns in order."""
    columns, name = table.schema.columns, table.schema.path
    for row in table.rows:
        get = row.cells.get
        yield row[column], "\x1f".join([name, *[get(c, "") for c in columns]])


def read_table(data: bytes, schema: TableSchema) -> tuple[Table, list[Problem]]:
    """The rows of one file and what is wrong with it, from the bytes of the file."""
    return _Reader(schema).read(data)


class _Reader:
    def __init__(self, schema: TableSchema) -> None:
        self._schema = schema
        self._fields = {field.name: field for field in schema.fields}
        self._problems: list[Problem] = []
        self._width = 0
        self._read: dict[tuple[str, str], tuple[str, tuple[Fault, ...]]] = {}

    def _say(
        self, line: int, column: str, kind: str, found: str, expected: str, hint: str,
        severity: str = "error",
    ) -> None:  # fmt: skip
        self._problems.append(
            Problem(self._schema.path, line, column, kind, found, expected, hint, severity)
        )

    def read(self, data: bytes) -> tuple[Table, list[Problem]]:
        text = self._decoded(data)
        has_bom = text.startswith(_BOM)
        if has_bom:
            text = text.removeprefix(_BOM)
            self._say(1, "", "byte-order-mark", "a byte order mark before the first column",
                      "plain UTF-8", "nothing to do; it is passed over", NOTE)  # fmt: skip
        newline = "\r\n" if "\r\n" in text else "\n"
        delimiter = self._delimiter(text)
        records = list(self._records(text, delimiter))
        if not records:
            self._say(0, "", "empty-file", "nothing in the file", "a line with the column names",
                      f"first line: {','.join(self._schema.columns)}")  # fmt: skip
            return Table(self._schema, (), complete=False), self._problems
        (header_line, header), *body = records
        columns = self._header(header_line, header)
        rows = [self._row(line, cells, columns) for line, cells in body]
        self._ending(text, body, columns)
        if delimiter != "," and rows:
            self._say(header_line, "", "separator", f"{_NAMES[delimiter]} between the cells",
                      "commas", "nothing to do; it is read as it stands", NOTE)  # fmt: skip
        errors = [problem for problem in self._problems if problem.severity != NOTE]
        table = Table(
            self._schema,
            tuple(rows),
            columns,
            delimiter,
            newline,
            has_bom,
            frozenset((problem.line, problem.column) for problem in errors),
            not any(problem.kind in _CUT for problem in errors),
        )
        return table, self._problems

    def _decoded(self, data: bytes) -> str:
        if data[:2] in (b"\xff\xfe", b"\xfe\xff"):
            self._say(1, "", "encoding", "UTF-16", "UTF-8",
                      "save the table again as CSV UTF-8")  # fmt: skip
            return data.decode("utf-16", errors="replace")
        if b"\x00" in data:
            line = data[: data.index(b"\x00")].count(b"\n") + 1
            self._say(line, "", "encoding", "a zero byte", "text",
                      "the file is damaged: take the last good revision")  # fmt: skip
            data = data.replace(b"\x00", b"")
        # Bytes that are no UTF-8 become marks, so that their cells can be named.
        return data.decode("utf-8", errors="replace")

    def _delimiter(self, text: str) -> str:
        header = text.split("\n", 1)[0]

        def known(delimiter: str) -> tuple[int, int]:
            cells = [cell.strip(' "\r').lower() for cell in header.split(delimiter)]
            return sum(cell in self._fields for cell in cells), -"\t;,".index(delimiter)

        return max(_NAMES, key=known)

    def _records(self, text: str, delimiter: str) -> Iterator[tuple[int, list[str]]]:
        """Rows that are not blank, each with its first physical line."""
        reader = csv.reader(io.StringIO(text, newline=""), delimiter=delimiter, strict=True)
        line = 1
        while True:
            try:
                cells = next(reader, None)
            except csv.Error as error:
                kind = "truncated" if "end of data" in str(error) else "bad-quotes"
                self._say(line, self._schema.columns[0], kind, f"a row without end: {error}",
                          'quotes in pairs; a quote inside quotes is written ""',
                          "close the quotes, or take the rest of the file from the last good "
                          "revision")  # fmt: skip
                return
            if cells is None:
                return
            if any(map(plain, cells)):
                yield line, cells
            line = reader.line_num + 1

    def _header(self, line: int, header: Sequence[str]) -> tuple[str, ...]:
        # Blank columns behind the last are passed over, in every row.
        self._width = len(header)
        columns = [plain(name) for name in header]
        while columns and not columns[-1]:
            columns.pop()
        missing = [name for name in self._fields if name not in columns]
        for i, name in enumerate(columns):
            if name in self._fields and name not in columns[:i]:
                continue
            if name in columns[:i]:
                self._say(line, name, "duplicate-column", f"{name} twice", "each column once",
                          "remove one of the two")  # fmt: skip
                continue
            near = get_close_matches(name.lower(), missing, 1)
            self._say(
                line, name or f"column {i + 1}", "unknown-column", name or "no name",
                f"one of {', '.join(self._schema.columns)}",
                near[0] if near else "remove the column, or describe it in datapackage.json",
            )  # fmt: skip
            if near:
                # Read as what it must mean, so that its cells are looked at as well.
                columns[i] = near[0]
                missing.remove(near[0])
        for name in missing:
            self._say(line, name, "missing-column", f"no column {name}", name,
                      f"put the column {name} back: {self._fields[name].description}")  # fmt: skip
        return tuple(columns)

    def _row(self, line: int, cells: Sequence[str], columns: tuple[str, ...]) -> Row:
        beyond = any(map(plain, cells[len(columns) :])) or len(cells) > self._width
        if beyond:
            self._say(line, columns[-1], "too-many-cells", f"{len(cells)} cells, beyond the last "
                      f"column: {', '.join(cells[len(columns) :]) or 'blank'}",
                      f"{len(columns)} cells",
                      'put text that holds a separator into quotes: "a, b"')  # fmt: skip
        whole = not beyond and len(cells) >= len(columns)
        clean = {}
        for name, cell in zip(columns, cells, strict=False):
            known = whole and name in self._fields
            clean[name] = self._cell(line, name, cell) if known else cell.strip()
        return Row(line, clean, whole)

    def _cell(self, line: int, column: str, cell: str) -> str:
        # The same text stands in many rows; it is looked at once.
        key = column, cell
        if key not in self._read:
            self._read[key] = read_cell(self._fields[column], cell)
        text, faults = self._read[key]
        for fault in faults:
            self._say(line, column, *fault)
        return text

    def _ending(
        self, text: str, body: Sequence[tuple[int, Sequence[str]]], columns: tuple[str, ...]
    ) -> None:
        """Rows with too few cells; the last of a file without its line end was cut off."""
        for line, cells in body:
            if len(cells) < len(columns):
                last = line == body[-1][0] and not text.endswith(("\n", "\r"))
                self._say(
                    line, columns[len(cells)], "truncated" if last else "too-few-cells",
                    f"{len(cells)} cells{', then the file ends' if last else ''}",
                    f"{len(columns)} cells",
                    "take the rest of the file from the last good revision" if last
                    else "fill the row up; a blank cell still needs its separator",
                )  # fmt: skip
        if body and not text.endswith(("\n", "\r")) and len(body[-1][1]) >= len(columns):
            self._say(body[-1][0], columns[-1], "no-last-line-end", "the last row has no line end",
                      "a line end", "look whether the last row is whole", NOTE)  # fmt: skip
