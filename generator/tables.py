"""Table files as spreadsheets leave them → rows of clean text, with every fault in its place.

Accepted and said so as a note: a byte order mark, semicolons or tabs between the cells,
non-breaking spaces, the typographic minus sign, a missing last line end. Accepted without a
word: CRLF, blank rows, blank cells behind the last column. Everything else is an error.
"""

from __future__ import annotations

import csv
import io
import math
import re
from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass
from datetime import date
from difflib import get_close_matches
from hashlib import sha256
from pathlib import Path
from typing import Any

from generator.errors import Problem
from generator.schema import Field, TableSchema, read_package, read_schema

NOTE = "note"
_BOM = "\ufeff"
_UNREADABLE = "\ufffd"
_MINUS = "\u2212"
# Spaces that look like a space and are none.
_SPACES = re.compile("[\u00a0\u2000-\u200a\u202f\u205f\u3000]")
_INVISIBLE = re.compile("[\u200b-\u200d\u2060\ufeff]")
_ERROR_CELLS = re.compile(r"#(N/A|REF!|VALUE!|DIV/0!|NAME\?|NUM!|NULL!|NV|WERT!|BEZUG!|#+)", re.I)
_NUMBER = re.compile(r"[+-]?(\d+(\.\d*)?|\.\d+)([eE][+-]?\d+)?", re.ASCII)
_COMMA_NUMBER = re.compile(r"[+-]?\d+,\d+([eE][+-]?\d+)?", re.ASCII)
_GROUPED = re.compile(r"[+-]?\d{1,3}([., ]\d{3})+([.,]\d+)?", re.ASCII)
_DAY_FIRST = re.compile(r"(\d{1,2})[./](\d{1,2})[./](\d{4})", re.ASCII)
_NAMES = {"\t": "tabs", ";": "semicolons", ",": "commas"}


@dataclass(frozen=True, slots=True)
class Row:
    """One row: ``line`` is its first physical line in the file, ``cells`` clean text by column."""

    line: int
    cells: Mapping[str, str]

    def __getitem__(self, column: str) -> str:
        return self.cells.get(column, "")


@dataclass(frozen=True, slots=True)
class Table:
    """The rows of one file. ``newline`` and ``delimiter`` are as found in the file."""

    schema: TableSchema
    rows: tuple[Row, ...]
    columns: tuple[str, ...] = ()
    delimiter: str = ","
    newline: str = "\n"
    has_bom: bool = False


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
            tables[name] = Table(schema, (), schema.columns)
            continue
        seal.update(f"{name}\x00{len(data)}\x00".encode() + data)
        tables[name], found = read_table(data, schema)
        problems += found
    return Tables(folder, package, tables, tuple(problems), seal.hexdigest()[:8])


def revisions(tables: Tables) -> dict[str, str]:
    """Hash of what the tables say about each substance, wherever in them its rows stand.

    The sources that the rows name are part of it.
    """
    sources = dict(_said(tables["sources"], "source"))
    shares: dict[str, list[str]] = {row["solvent"]: [] for row in tables["solvents"].rows}
    named: dict[str, set[str]] = {slug: set() for slug in shares}
    for table in tables.tables.values():
        if "solvent" in table.schema.columns:
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
        self._clean: dict[tuple[str, str], str] = {}

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
            return Table(self._schema, ()), self._problems
        (header_line, header), *body = records
        columns = self._header(header_line, header)
        rows = [self._row(line, cells, columns) for line, cells in body]
        self._ending(text, body, columns)
        if delimiter != "," and rows:
            self._say(header_line, "", "separator", f"{_NAMES[delimiter]} between the cells",
                      "commas", "nothing to do; it is read as it stands", NOTE)  # fmt: skip
        return (
            Table(self._schema, tuple(rows), columns, delimiter, newline, has_bom),
            self._problems,
        )

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
            if any(_SPACES.sub(" ", cell).strip() for cell in cells):
                yield line, cells
            line = reader.line_num + 1

    def _header(self, line: int, header: Sequence[str]) -> tuple[str, ...]:
        columns = [_SPACES.sub(" ", _INVISIBLE.sub("", name)).strip() for name in header]
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
                f"{near[0]}" if near else "remove the column, or describe it in datapackage.json",
            )  # fmt: skip
        for name in missing:
            self._say(line, name, "missing-column", f"no column {name}", name,
                      f"put the column {name} back: {self._fields[name].description}")  # fmt: skip
        return tuple(columns)

    def _row(self, line: int, cells: Sequence[str], columns: tuple[str, ...]) -> Row:
        beyond = [cell for cell in cells[len(columns) :] if cell.strip()]
        if beyond:
            self._say(line, columns[-1], "too-many-cells", f"{len(cells)} cells, beyond the last "
                      f"column: {', '.join(beyond)}", f"{len(columns)} cells",
                      'put text that holds a separator into quotes: "a, b"')  # fmt: skip
        clean = {}
        for name, cell in zip(columns, cells, strict=False):
            field = self._fields.get(name)
            clean[name] = self._known(line, field, cell) if field else cell.strip()
        return Row(line, clean)

    def _known(self, line: int, field: Field, cell: str) -> str:
        """The cell cleaned; a text met before, of which there was nothing to say, is known."""
        key = field.name, cell
        if key not in self._clean:
            said = len(self._problems)
            text = self._cell(line, field, cell)
            if len(self._problems) > said:
                return text
            self._clean[key] = text
        return self._clean[key]

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

    def _cell(self, line: int, field: Field, cell: str) -> str:
        def say(kind: str, found: str, expected: str, hint: str, severity: str = "error") -> None:
            self._say(line, field.name, kind, found, expected, hint, severity)

        if _UNREADABLE in cell:
            say("encoding", repr(cell), "UTF-8 text",
                "save the table again as CSV UTF-8, then type the marked letters anew")  # fmt: skip
            return cell.strip()
        text = _INVISIBLE.sub("", _SPACES.sub(" ", cell)).strip()
        if text != cell.strip(" \t\r\n") or _SPACES.search(cell):
            say("odd-space", repr(cell), "plain spaces", f"{text}; nothing to do, it is read so",
                NOTE)  # fmt: skip
        if _ERROR_CELLS.fullmatch(text):
            say("spreadsheet-error", text, "a value, or a blank cell",
                "mend the formula in the spreadsheet, or leave the cell blank")  # fmt: skip
            return ""
        if not text:
            if field.required:
                say("blank", "a blank cell", field.description, f"type the {field.name}")
            return ""
        if field.type in ("number", "integer"):
            return self._number(line, field, text)
        if field.type == "date" and not _is_date(text):
            say("wrong-type", text, "a date as year-month-day, 2026-03-31",
                _as_date(text) or "the date as year-month-day")  # fmt: skip
            return ""
        if field.enum and text not in field.enum:
            near = get_close_matches(text.lower(), field.enum, 1)
            say("not-in-list", text, f"one of {', '.join(field.enum)}",
                near[0] if near else f"one of {', '.join(field.enum)}")  # fmt: skip
        elif field.pattern and not re.fullmatch(field.pattern, text):
            say("wrong-shape", text, field.description, f"text of the shape {field.pattern}")
        return text

    def _number(self, line: int, field: Field, text: str) -> str:
        """The number as plain text, "" where it is none."""

        def say(kind: str, expected: str, hint: str, severity: str = "error") -> None:
            self._say(line, field.name, kind, text, expected, hint, severity)

        plain = text
        if _MINUS in plain:
            plain = plain.replace(_MINUS, "-")
            say("minus-sign", "the hyphen as minus sign", f"{plain}; nothing to do, it is read so",
                NOTE)  # fmt: skip
        if field.decimal_comma:
            plain = plain.replace(",", ".")
        if not _NUMBER.fullmatch(plain) or not math.isfinite(float(plain)):
            if _COMMA_NUMBER.fullmatch(plain):
                say("decimal-comma", "a decimal point",
                    f"{plain.replace(',', '.')} (or declare the comma: decimalChar in "
                    "datapackage.json)")  # fmt: skip
            elif _GROUPED.fullmatch(plain):
                say("wrong-type", "digits without separators between thousands",
                    "the number with a point for the decimals and nothing else")  # fmt: skip
            else:
                number = re.match(_NUMBER, plain)
                say("wrong-type", "a number",
                    f"{number[0]}, with its unit in a column of its own" if number
                    else "the number, or a blank cell")  # fmt: skip
            return ""
        if field.type == "integer" and not float(plain).is_integer():
            say("wrong-type", "a whole number", f"{float(plain):.0f}")
            return ""
        value = float(plain)
        if field.low is not None and value < field.low:
            say("out-of-bounds", f"at least {field.low:g}", field.description)
        if field.high is not None and value > field.high:
            say("out-of-bounds", f"at most {field.high:g}", field.description)
        return plain


def _is_date(text: str) -> bool:
    try:
        return date.fromisoformat(text).isoformat() == text
    except ValueError:
        return False


def _as_date(text: str) -> str:
    """An unambiguous date in other spellings as year-month-day, else ""."""
    match = _DAY_FIRST.fullmatch(text)
    if match is None:
        return ""
    first, second, year = map(int, match.groups())
    readings = {(first, second), (second, first)}
    days = [
        f"{year:04d}-{month:02d}-{day:02d}"
        for day, month in sorted(readings)
        if _is_date(f"{year:04d}-{month:02d}-{day:02d}")
    ]
    return " or ".join(days)
