"""All tables as one workbook for a spreadsheet program, and the edits in it back to the tables.

The workbook carries, out of sight, what the tables held when it was written. What the steward
did is the difference to that, so it can be told from what others did to the tables meanwhile.
"""

from __future__ import annotations

import base64
import binascii
import hashlib
import json
import shutil
import tempfile
import zlib
from collections.abc import Iterator, Mapping, Sequence
from contextlib import contextmanager
from dataclasses import dataclass
from pathlib import Path

from generator import excel, opendocument, spreadsheet
from generator.differences import Change, Grid, grid_of
from generator.errors import DatasetError, Problem
from generator.merging import merge
from generator.quantities import QUANTITIES
from generator.schema import Field, TableSchema
from generator.spreadsheet import DATE, NUMBER, SPARE_ROWS, TEXT, Choices, Column, Sheet
from generator.tablefiles import put, read_whole
from generator.tables import Tables
from generator.thermal import FORMS

ABOUT, LISTS, BASE = "About", "_lists", "_base"
_WRITERS = {".xlsx": excel.write, ".ods": opendocument.write}
_CHUNK = 30_000  # characters a cell
_WORDS = """\
Each further sheet is one table of the handbook. Point at a column's title to read what it holds.
Every cell is text and comes back exactly as typed: 0.9970 keeps its last zero, a CAS number stays one.
Numbers have a decimal point. Dates are year-month-day. A blank cell means not stated, never zero.
Rows may be sorted, added and deleted; the tables keep their own order. Titles must stay.
Take the edits over with:  datasheets sheet in FILE   (with --dry-run it only shows them)"""  # noqa: E501
_WIDEST = 60  # characters


@dataclass(frozen=True, slots=True)
class Plan:
    """What taking a workbook over changes. ``files``: name in the folder → new contents."""

    folder: Path
    changes: tuple[Change, ...]
    files: Mapping[str, bytes]

    def summary(self) -> str:
        """The changes in words, a line each."""
        if not self.changes:
            return "The workbook says what the tables say: nothing to change."
        files = ", ".join(sorted(self.files))
        return "\n".join([*map(str, self.changes), f"{len(self.changes)} changes in {files}"])

    @contextmanager
    def tried(self) -> Iterator[Path]:
        """A passing copy of the folder as it will be."""
        with tempfile.TemporaryDirectory() as name:
            copy = Path(name) / "data"
            shutil.copytree(self.folder, copy)
            put(copy, self.files)
            yield copy


def write(folder: Path, path: Path) -> None:
    """Write the tables in ``folder`` as a workbook; the ending of ``path`` says which kind.

    Raises ``DatasetError`` when a table is not whole or a cell is longer than programs can hold,
    ``ValueError`` for an unknown ending.
    """
    writer = _WRITERS.get(path.suffix.lower())
    if writer is None:
        raise ValueError(f"{path.name}: the name of a workbook ends in {' or '.join(_WRITERS)}")
    tables, files = read_whole(folder)
    grids = {name: grid_of(files[name], tables[name].schema) for name in files}
    _refuse_long_cells(grids)
    content = writer(_sheets(tables, grids), str(tables.package.get("title", folder.name)))
    put(path.parent, {path.name: content})


def read(folder: Path, path: Path) -> Plan:
    """What the workbook at ``path`` changes in the tables in ``folder``; writes nothing.

    Raises ``DatasetError`` with everything that stands against it: a table or the workbook is
    not whole, or both changed the same place.
    """
    tables, files = read_whole(folder)
    problems: list[Problem] = []
    try:
        book = spreadsheet.read(path)
    except ValueError as error:
        raise DatasetError([_fault(path, "", 0, "", "unreadable", str(error))]) from error
    base = _base(book.get(BASE), path, tables)
    changes: list[Change] = []
    changed: dict[str, bytes] = {}
    for name, file in files.items():
        grid, faults = _edited(book.get(name), path, tables[name].schema)
        problems += faults
        if faults:
            continue
        merged = merge(base[name], grid, file)
        problems += merged.conflicts
        changes += merged.changes
        if merged.changes:
            changed[tables[name].schema.path] = bytes(merged.file)
    if problems:
        raise DatasetError(problems)
    return Plan(folder, tuple(changes), changed)


def apply(plan: Plan) -> None:
    """Write the changed tables, each whole or not at all."""
    put(plan.folder, plan.files)


def _refuse_long_cells(grids: Mapping[str, Grid]) -> None:
    longest = spreadsheet.LONGEST_CELL
    problems = [
        Problem(
            grid.schema.path, line, column, "too-long", f"{len(cell)} characters",
            f"at most {longest}", "shorten the text; no spreadsheet program can hold it",
        )
        for grid in grids.values()
        for line, row in zip(grid.lines, grid.dicts(), strict=True)
        for column, cell in row.items()
        if len(cell) > longest
    ]  # fmt: skip
    if problems:
        raise DatasetError(problems)


# --- out ----------------------------------------------------------------------------------------


def _sheets(tables: Tables, grids: Mapping[str, Grid]) -> list[Sheet]:
    lists = _lists(tables, grids)
    titles = tuple(lists)
    longest = max(map(len, lists.values()))
    columns = tuple(Column(title) for title in titles)
    rows = tuple(
        tuple(lists[title][i] if i < len(lists[title]) else "" for title in titles)
        for i in range(longest)
    )
    return [
        _about(tables),
        *(_sheet(grid, grids, lists) for grid in grids.values()),
        Sheet(LISTS, columns, rows, hidden=True),
        _packed(grids),
    ]


def _about(tables: Tables) -> Sheet:
    described = {resource["name"]: resource for resource in tables.package["resources"]}
    rows = [
        ("Data revision", tables.revision),
        *(("", line) for line in _WORDS.splitlines()),
        *((name, described[name].get("description", "")) for name in tables.tables),
    ]
    columns = (Column("About", width=18), Column("The solvent tables", width=100))
    return Sheet(ABOUT, columns, tuple(rows))


def _lists(tables: Tables, grids: Mapping[str, Grid]) -> dict[str, tuple[str, ...]]:
    """What the drop-downs offer beside the keys of other tables."""
    measured = [quantity for quantity in QUANTITIES.values() if quantity.kind == "measured"]
    used = {row.get("unit", "") for grid in grids.values() for row in grid.dicts()}
    lists = {
        "quantity": tuple(quantity.key for quantity in measured),
        "unit": tuple(sorted((used | {quantity.unit for quantity in measured}) - {""})),
        "form": tuple(FORMS),
    }
    for name, table in tables.tables.items():
        lists |= {f"{name}.{field.name}": field.enum for field in table.schema.fields if field.enum}
    return lists


def _sheet(grid: Grid, grids: Mapping[str, Grid], lists: Mapping[str, Sequence[str]]) -> Sheet:
    rows = tuple(tuple(row.values()) for row in grid.dicts())
    fields = {field.name: field for field in grid.schema.fields}
    columns = []
    for place, name in enumerate(grid.columns):
        field = fields[name]
        widest = max((len(row[place]) for row in rows), default=0)
        columns.append(
            Column(
                name,
                field.description,
                min(max(widest, len(name)) + 3, _WIDEST),
                _kind(field),
                field.low,
                field.high,
                _choices(field, grid.schema, grids, lists),
            )
        )
    return Sheet(grid.schema.name, tuple(columns), rows)


def _kind(field: Field) -> str:
    # Where the tables are declared to have decimal commas, the programs' own rule would misread.
    if field.type in ("number", "integer"):
        return TEXT if field.decimal_comma else NUMBER
    return DATE if field.type == "date" else TEXT


def _choices(
    field: Field, schema: TableSchema, grids: Mapping[str, Grid], lists: Mapping[str, Sequence[str]]
) -> Choices | None:
    for reference in schema.references:
        if reference.field == field.name and reference.table in grids:
            target = grids[reference.table]
            column = target.columns.index(reference.column)
            return Choices(reference.table, column, len(target.rows) + SPARE_ROWS)
    for title in (f"{schema.name}.{field.name}", field.name):
        if title in lists:
            return Choices(LISTS, list(lists).index(title), len(lists[title]))
    return None


def _packed(grids: Mapping[str, Grid]) -> Sheet:
    held = {name: [grid.columns, grid.rows] for name, grid in grids.items()}
    packed = zlib.compress(json.dumps(held, ensure_ascii=False).encode(), 9)
    text = base64.b64encode(packed).decode()
    chunks = [text[i : i + _CHUNK] for i in range(0, len(text), _CHUNK)]
    title = Column("What the tables held when this workbook was written. Leave it as it is.")
    rows = ((hashlib.sha256(packed).hexdigest(),), *((chunk,) for chunk in chunks))
    return Sheet(BASE, (title,), rows, hidden=True)


# --- in -----------------------------------------------------------------------------------------


def _base(rows: list[list[str]] | None, path: Path, tables: Tables) -> dict[str, Grid]:
    try:
        _, seal, *chunks = (row[0].strip() for row in rows or () if row and row[0])
        packed = base64.b64decode("".join(chunks), validate=True)
        if hashlib.sha256(packed).hexdigest() != seal:
            raise ValueError("it was changed")
        held = json.loads(zlib.decompress(packed))
    except (ValueError, binascii.Error) as error:
        problem = _fault(path, BASE, 0, "", "no-base", f"the hidden sheet cannot be read: {error}")
        raise DatasetError([problem]) from error
    return {
        name: Grid(table.schema, *_held(held.get(name, [table.schema.columns, []])))
        for name, table in tables.tables.items()
    }


def _held(table: Sequence[Sequence[object]]) -> tuple[tuple[str, ...], tuple[tuple[str, ...], ...]]:
    columns, rows = table
    return tuple(map(str, columns)), tuple(tuple(row) for row in rows)  # type: ignore[arg-type]


def _edited(
    rows: list[list[str]] | None, path: Path, schema: TableSchema
) -> tuple[Grid, list[Problem]]:
    """The rows of one sheet below its titles, and what makes it unusable."""
    name = schema.name
    if not rows:
        return Grid(schema, ()), [_fault(path, name, 0, "", "missing-table", "no such sheet")]
    titles = [title.strip() for title in rows[0]]
    while titles and not titles[-1]:
        titles.pop()
    problems = [
        _fault(path, name, 1, title, "missing-column", f"no column {title}")
        for title in schema.columns
        if title not in titles
    ]
    for place, title in enumerate(titles):
        shown = title or spreadsheet.letters(place)
        if title in titles[:place]:
            problems.append(_fault(path, name, 1, shown, "duplicate-column", f"{title} twice"))
        elif title not in schema.columns:
            found = title or "a column without a title"
            problems.append(_fault(path, name, 1, shown, "unknown-column", found))
    body = [
        (line, row)
        for line, row in enumerate(rows[1:], start=2)
        if any(cell.strip() for cell in row)
    ]
    for line, row in body:
        beyond = [cell for cell in row[len(titles) :] if cell.strip()]
        if beyond:
            first = spreadsheet.letters(len(titles))
            problems.append(_fault(path, name, line, first, "too-many-cells", ", ".join(beyond)))
    return (
        Grid(
            schema,
            tuple(titles),
            tuple(tuple(row[: len(titles)]) for _, row in body),
            tuple(line for line, _ in body),
        ),
        problems,
    )


_ADVICE = {
    "unreadable": ("a workbook ending in .xlsx or .ods", "save it from the spreadsheet program"),
    "no-base": ("the hidden sheet as it was written", "write a new workbook, edit that one"),
    "missing-table": ("every table as a sheet", "put the sheet back, or write a new workbook"),
    "missing-column": ("every title in the first row", "put the title back into the first row"),
    "duplicate-column": ("each title once", "remove one of the two columns"),
    "unknown-column": ("the columns of the table only", "move it to a sheet of its own"),
    "too-many-cells": ("nothing beside the table", "move it to a sheet of its own"),
}


def _fault(path: Path, sheet: str, line: int, column: str, kind: str, found: str) -> Problem:
    expected, hint = _ADVICE[kind]
    file = f"{path.name}, sheet {sheet}" if sheet else path.name
    return Problem(file, line, column, kind, found, expected, hint)
