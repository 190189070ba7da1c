"""Two versions of one table → which rows belong together, and which cells differ."""

from __future__ import annotations

from collections import defaultdict
from collections.abc import Callable, Hashable, Iterable, Mapping
from dataclasses import dataclass

from generator.csvfile import CsvFile
from generator.schema import TableSchema

CELL, ADDED, REMOVED = "cell", "row added", "row removed"


class Digits(str):
    """Text of a cell that held a number: whatever zeros were typed behind it are lost."""

    __slots__ = ()


@dataclass(frozen=True, slots=True)
class Grid:
    """The rows of one table as plain text, with the line each begins on."""

    schema: TableSchema
    columns: tuple[str, ...]
    rows: tuple[tuple[str, ...], ...] = ()
    lines: tuple[int, ...] = ()

    def row(self, index: int) -> dict[str, str]:
        """One row as cells by column; a cell the row lacks is blank."""
        cells = self.rows[index]
        return {
            name: cells[place] if place < len(cells) else ""
            for place, name in enumerate(self.columns)
        }

    def dicts(self) -> list[dict[str, str]]:
        """All rows as cells by column."""
        return [self.row(index) for index in range(len(self.rows))]


@dataclass(frozen=True, slots=True)
class Pairing:
    """Which rows of an older and a newer table belong together, by index."""

    pairs: tuple[tuple[int, int], ...]
    removed: tuple[int, ...]
    added: tuple[int, ...]


@dataclass(frozen=True, slots=True)
class Change:
    """One difference between two versions of a table.

    ``kind`` is ``cell``, ``row added`` or ``row removed``; ``line`` is that of the row in the
    newer table, of a removed row in the older one. ``row`` holds the cells of the newer row (of a
    removed one its last). For a whole row ``column``, ``old`` and ``new`` are empty.
    """

    table: str
    file: str
    line: int
    kind: str
    row: Mapping[str, str]
    key: tuple[str, ...]
    column: str = ""
    old: str = ""
    new: str = ""

    @property
    def solvent(self) -> str:
        """The substance the row is about, "" where it is about none."""
        return self.row.get("solvent", "")

    @property
    def place(self) -> str:
        """File, line and column in one phrase."""
        line = f", line {self.line}" if self.line else ""
        return f"{self.file}{line}" + (f", {self.column}" if self.column else "")

    @property
    def name(self) -> str:
        """What tells the row from others: the cells of its key that hold anything."""
        return " · ".join(cell for cell in self.key if cell)

    def __str__(self) -> str:
        if self.kind != CELL:
            cells = " | ".join(cell for cell in self.row.values() if cell)
            return f"{self.place}: {self.kind}: {cells}"
        return f"{self.place}: {shown(self.old)} → {shown(self.new)}   ({self.name})"


def shown(text: str) -> str:
    """A cell in running text: a blank one says so, a line end does not break the line."""
    return text.replace("\n", "⏎") if text.strip() else "blank"


def grid_of(file: CsvFile, schema: TableSchema) -> Grid:
    """The rows of a CSV file, as typed."""
    records = [file.records[position] for position in file.body]
    return Grid(
        schema, file.columns, tuple(r.cells for r in records), tuple(r.line for r in records)
    )


# Letters that workbook files cannot hold, or that spreadsheet programs drop, tabs among them.
_DROPPED = dict.fromkeys([*range(10), *range(11, 32), 0xFFFE, 0xFFFF])


def plain(text: str) -> str:
    """A cell as far as spreadsheets keep it: no blanks round it, one kind of line end."""
    return text.replace("\r\n", "\n").replace("\r", "\n").translate(_DROPPED).strip()


def same(old: str, new: str) -> bool:
    """Whether two cells say the same. A number cell says the same as the digits it came from."""
    if plain(old) == plain(new):
        return True
    return isinstance(new, Digits) and _number(old) == _number(new)


def _number(text: str) -> float | str:
    try:
        return float(text)
    except ValueError:
        return text


def pair(old: Grid, new: Grid) -> Pairing:
    """The rows that belong together: equal ones, then those of equal key, then those that differ
    in a single cell of the key. Rows that occur several times are paired in their order."""
    columns = tuple(dict.fromkeys((*old.columns, *new.columns)))
    numbers = {field.name for field in new.schema.fields if field.type in ("number", "integer")}

    def normal(row: Mapping[str, str]) -> tuple[float | str, ...]:
        cells = ((name, plain(row.get(name, ""))) for name in columns)
        return tuple(_number(cell) if name in numbers else cell for name, cell in cells)

    before, after = [normal(r) for r in old.dicts()], [normal(r) for r in new.dicts()]
    places = [columns.index(name) for name in new.schema.key if name in columns]
    pairing = _Matcher(before, after)
    pairing.match(lambda row: row)
    pairing.match(lambda row: tuple(row[place] for place in places))
    for place in places:
        pairing.match(lambda row, place=place: (*row[:place], *row[place + 1 :]))  # type: ignore[misc]
    return pairing.result()


_Normal = tuple[float | str, ...]


class _Matcher:
    def __init__(self, before: list[_Normal], after: list[_Normal]) -> None:
        self._before, self._after = before, after
        self._pairs: dict[int, int] = {}
        self._left = list(range(len(before))), list(range(len(after)))

    def match(self, key: Callable[[_Normal], Hashable]) -> None:
        """Pair what is left by equal keys, in order of occurrence."""
        waiting: dict[Hashable, list[int]] = defaultdict(list)
        for j in reversed(self._left[1]):
            waiting[key(self._after[j])].append(j)
        for i in self._left[0]:
            found = waiting.get(key(self._before[i]))
            if found:
                self._pairs[i] = found.pop()
        taken = set(self._pairs.values())
        self._left = (
            [i for i in self._left[0] if i not in self._pairs],
            [j for j in self._left[1] if j not in taken],
        )

    def result(self) -> Pairing:
        return Pairing(
            tuple(sorted(self._pairs.items())), tuple(self._left[0]), tuple(self._left[1])
        )


def differences(old: Grid, new: Grid) -> tuple[Change, ...]:
    """What changed from ``old`` to ``new``, in the order of the newer rows, removed ones last."""
    pairing = pair(old, new)
    partner = {j: i for i, j in pairing.pairs}
    changes: list[Change] = []
    for j, row in enumerate(new.dicts()):
        if j not in partner:
            changes.append(_whole(new, j, ADDED))
            continue
        was = old.row(partner[j])
        changes += (
            Change(
                new.schema.name, new.schema.path, new.lines[j], CELL, row, _key(new, row),
                name, was.get(name, ""), row.get(name, ""),
            )
            for name in _columns(old, new)
            if not same(was.get(name, ""), row.get(name, ""))
        )  # fmt: skip
    changes += (_whole(old, i, REMOVED) for i in pairing.removed)
    return tuple(changes)


def _columns(old: Grid, new: Grid) -> Iterable[str]:
    return dict.fromkeys((*new.columns, *old.columns))


def _whole(grid: Grid, index: int, kind: str) -> Change:
    row = grid.row(index)
    schema = grid.schema
    return Change(schema.name, schema.path, grid.lines[index], kind, row, _key(grid, row))


def _key(grid: Grid, row: Mapping[str, str]) -> tuple[str, ...]:
    return tuple(row.get(name, "") for name in grid.schema.key)
