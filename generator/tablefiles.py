"""A folder of tables as files that can be changed: read when whole, written whole or not at all."""

from __future__ import annotations

from collections.abc import Mapping
from pathlib import Path

from generator.csvfile import CsvFile, parse
from generator.errors import DatasetError
from generator.tables import Tables, read_tables

# Faults after which it is not sure which cell stands where.
_SHAPELESS = {
    "missing-table", "empty-file", "encoding", "bad-quotes", "truncated", "missing-column",
    "unknown-column", "duplicate-column", "too-many-cells", "too-few-cells",
}  # fmt: skip


def read_whole(folder: Path) -> tuple[Tables, dict[str, CsvFile]]:
    """The tables in a folder and their files, where it is sure which cell stands where.

    Cells may be wrong. Raises ``DatasetError`` when a table is not whole.
    """
    tables = read_tables(folder)
    broken = [problem for problem in tables.problems if problem.kind in _SHAPELESS]
    if broken:
        raise DatasetError(broken)
    return tables, {
        name: parse((folder / table.schema.path).read_bytes(), table.delimiter)
        for name, table in tables.tables.items()
    }


def put(folder: Path, files: Mapping[str, bytes]) -> None:
    """Write files by name: all are made ready before the first takes its place."""
    drafts = {folder / name: folder / f"{name}.new" for name in files}
    for path, draft in drafts.items():
        draft.write_bytes(files[path.name])
    for path, draft in drafts.items():
        draft.replace(path)
