"""The recorded revisions of the tables: read from their own table, and written behind its last row.

What is recorded does not count for the data revision, so that a record can name the revision it is
about.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import asdict, dataclass, fields
from pathlib import Path

from generator.errors import DatasetError, Problem
from generator.schema import DESCRIPTION
from generator.tablefiles import put, read_whole
from generator.tables import HISTORY, Tables

NOTE, ENTRY, NUMBER, CLASS, FINDING = ("note", "entry", "number", "class", "finding")


@dataclass(frozen=True, slots=True)
class Event:
    """One thing that came with a revision.

    ``kind`` is ``note`` (why, in the steward's words), ``entry`` (a cell or row of the tables),
    ``number`` (a number of the handbook), ``class`` (a sign or class) or ``finding``.
    ``solvent`` and ``quantity`` are empty where it concerns none.
    """

    date: str
    revision: str
    solvent: str
    quantity: str
    kind: str
    what: str


COLUMNS = tuple(field.name for field in fields(Event))


def events(tables: Tables) -> tuple[Event, ...]:
    """Everything recorded, in the order of the table; nothing where there is no such table."""
    if HISTORY not in tables.tables:
        return ()
    return tuple(Event(*map(row.__getitem__, COLUMNS)) for row in tables[HISTORY].rows)


def record(folder: Path, new: Sequence[Event]) -> None:
    """Write events behind the last row.

    Raises ``DatasetError`` when the tables are not whole, have no table for it, or hold the
    revision already.
    """
    tables, files = read_whole(folder)
    if HISTORY not in files:
        raise DatasetError(
            [
                Problem(
                    DESCRIPTION, 0, "", "missing-table", f"no table called {HISTORY}",
                    "the description of the table of revisions",
                    f"copy it from the {DESCRIPTION} that came with the generator",
                )
            ]
        )  # fmt: skip
    file, path = files[HISTORY], tables[HISTORY].schema.path
    held = {event.revision for event in events(tables)}
    again = sorted({event.revision for event in new} & held)
    if again:
        raise DatasetError(
            [
                Problem(
                    path, 0, "revision", "recorded-twice", f"{revision} is recorded already",
                    "a revision that is not", "nothing to do, or delete its rows first",
                )
                for revision in again
            ]
        )  # fmt: skip
    rows = [asdict(event) for event in new]
    last = file.body[-1] if file.body else 0
    grown = file.patched({}, frozenset(), {last: rows})
    put(folder, {path: bytes(grown)})
