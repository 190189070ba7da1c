"""Edits made to a copy of a table → the table's own file, where both may have moved on."""

from __future__ import annotations

from collections import defaultdict
from collections.abc import Mapping
from dataclasses import dataclass

from generator.csvfile import CsvFile, parse
from generator.differences import Change, Grid, differences, grid_of, pair, same, shown
from generator.errors import Problem


@dataclass(frozen=True, slots=True)
class Merged:
    """The file with the edits in it, what they change in it, and what stands against them."""

    file: CsvFile
    changes: tuple[Change, ...]
    conflicts: tuple[Problem, ...]


def merge(base: Grid, edited: Grid, current: CsvFile) -> Merged:
    """The difference between ``base`` and ``edited``, made in the file as it is now.

    A cell is changed where it still holds what the base held; what already says the same is left
    alone. Anything else is a conflict. A new row goes behind the row that stands above it in
    ``edited``.
    """
    work = _Merge(base, edited, current)
    work.change_cells()
    work.drop_rows()
    work.insert_rows()
    merged = current.patched(work.edits, frozenset(work.dropped), work.inserted)
    # Read again, for the lines on which the rows then stand.
    then = grid_of(parse(bytes(merged), merged.delimiter), base.schema)
    return Merged(merged, differences(work.now, then), tuple(work.conflicts))


class _Merge:
    def __init__(self, base: Grid, edited: Grid, current: CsvFile) -> None:
        self.base, self.edited = base, edited
        self.now = grid_of(current, base.schema)
        self.mine = pair(base, edited)
        self.theirs = pair(base, self.now)
        # Row of the base → its row now, and that row's place in the file.
        self.where = dict(self.theirs.pairs)
        self.body = current.body
        self.edits: dict[int, dict[str, str]] = defaultdict(dict)
        self.dropped: set[int] = set()
        self.inserted: dict[int, list[dict[str, str]]] = defaultdict(list)
        self.conflicts: list[Problem] = []

    def change_cells(self) -> None:
        for i, j in self.mine.pairs:
            was, wanted = self.base.row(i), self.edited.row(j)
            now = self.now.row(self.where[i]) if i in self.where else None
            for column in self.base.columns:
                if same(was[column], wanted[column]):
                    continue
                if now is None:
                    self._conflict(0, column, "the row is gone", was, was[column])
                elif same(now.get(column, ""), was[column]):
                    place = self.body[self.where[i]]
                    self.edits[place][column] = str(wanted[column])
                elif not same(now.get(column, ""), wanted[column]):
                    line = self.now.lines[self.where[i]]
                    self._conflict(line, column, shown(now.get(column, "")), was, was[column])

    def drop_rows(self) -> None:
        for i in self.mine.removed:
            if i not in self.where:
                continue
            was, now = self.base.row(i), self.now.row(self.where[i])
            for column, cell in was.items():
                if not same(cell, now.get(column, "")):
                    line = self.now.lines[self.where[i]]
                    self._conflict(line, column, shown(now.get(column, "")), was, cell)
            self.dropped.add(self.body[self.where[i]])

    def insert_rows(self) -> None:
        partner = {j: i for i, j in self.mine.pairs}
        newer = {self._key(self.now.row(k)): k for k in self.theirs.added}
        anchor = 0  # the header
        for j, row in enumerate(self.edited.dicts()):
            if j in partner:
                anchor = self.body[self.where[partner[j]]] if partner[j] in self.where else anchor
                continue
            k = newer.get(self._key(row))
            if k is None:
                self.inserted[anchor].append({name: str(cell) for name, cell in row.items()})
                continue
            now = self.now.row(k)
            for column, cell in row.items():
                if not same(now.get(column, ""), cell):
                    found = shown(now.get(column, ""))
                    self._conflict(self.now.lines[k], column, found, row, "")

    def _key(self, row: Mapping[str, str]) -> tuple[str, ...]:
        return tuple(row.get(name, "").strip() for name in self.base.schema.key)

    def _conflict(
        self, line: int, column: str, found: str, row: Mapping[str, str], expected: str
    ) -> None:
        name = " · ".join(cell for cell in self._key(row) if cell)
        self.conflicts.append(
            Problem(
                self.now.schema.path, line, column, "changed-since", f"{found} ({name})",
                f"{shown(expected)}, as when the workbook was written",
                "look which is right, type it into the table, and write a new workbook",
            )
        )  # fmt: skip
