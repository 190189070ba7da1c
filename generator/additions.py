"""Rows of new substances for the tables: planned first, then appended, never rewritten.

What a laboratory typed stays as it is, byte for byte: new rows go behind the last row of each
file, in that file's own separator, line ends and encoding, and in its own order of columns.
"""

from __future__ import annotations

import csv
import io
import re
import unicodedata
from collections.abc import Iterable, Mapping, Sequence
from dataclasses import dataclass, field
from pathlib import Path

from generator import library, structures
from generator.errors import DatasetError, Problem
from generator.library import Entry
from generator.schema import DESCRIPTION, shipped_file, shipped_schema

Row = Mapping[str, str]
# Comes filled into a new folder: without it no value would have an honest uncertainty.
_UNCERTAINTIES = "uncertainties.csv"
_GREEK = {
    "α": "alpha", "β": "beta", "γ": "gamma", "δ": "delta", "ε": "epsilon", "ω": "omega",
    "±": "",
}  # fmt: skip
_BOM = "\ufeff"


@dataclass(frozen=True, slots=True)
class Refusal:
    """A name nothing is done about, with the reason and the substances it may mean."""

    name: str
    reason: str
    candidates: tuple[Entry, ...] = ()

    def __str__(self) -> str:
        lines = [f"{self.name}: {self.reason}"]
        lines += [f"  {entry.cas}  {entry.name}" for entry in self.candidates]
        return "\n".join(lines)


@dataclass(frozen=True, slots=True)
class Plan:
    """What `apply` would append. ``rows``: table → rows; ``present``: names already there."""

    folder: Path
    rows: Mapping[str, tuple[Row, ...]]
    added: tuple[Entry, ...] = ()
    present: tuple[str, ...] = ()
    refusals: tuple[Refusal, ...] = ()
    skipped: int = 0

    def summary(self, *, rows: bool = False) -> str:
        """The plan in words, with every row to be written when ``rows`` is set."""
        lines = [str(refusal) for refusal in self.refusals]
        lines += [f"already there, left as it is: {name}" for name in self.present]
        if self.refusals:
            return "\n".join([*lines, "Nothing is written while a name is in doubt."])
        if rows:
            for table, new in self.rows.items():
                lines += [f"{table}.csv"] * bool(new)
                lines += ["  " + " | ".join(row.values()) for row in new]
        else:
            lines += [f"{entry.name} ({entry.cas})" for entry in self.added]
        if self.skipped:
            lines.append(f"{self.skipped} without a usable structure left out")
        counts = ", ".join(f"{len(new)} in {table}.csv" for table, new in self.rows.items())
        lines.append(f"{len(self.added)} substances to add; new rows: {counts}")
        return "\n".join(lines)


@dataclass(slots=True)
class _File:
    """A table as it stands in its file, with what is needed to append in its own style."""

    path: Path
    content: str = ""
    encoding: str = "utf-8"
    delimiter: str = ","
    newline: str = "\n"
    columns: tuple[str, ...] = ()
    rows: list[dict[str, str]] = field(default_factory=list)

    @classmethod
    def read(cls, folder: Path, table: str) -> _File:
        expected = shipped_schema()[table].columns
        file = cls(folder / f"{table}.csv", columns=expected)
        if not file.path.exists():
            return file
        data = file.path.read_bytes()
        try:
            file.content = data.decode("utf-8")
        except UnicodeDecodeError:
            file.content, file.encoding = data.decode("cp1252"), "cp1252"
        file.newline = "\r\n" if "\r\n" in file.content else "\n"
        header = file.content.removeprefix(_BOM).split("\n", 1)[0].strip("\r")
        file.delimiter = max(",;\t", key=header.count)
        text = io.StringIO(file.content.removeprefix(_BOM), newline="")
        reader = csv.DictReader(text, delimiter=file.delimiter)
        file.columns = tuple((name or "").strip() for name in reader.fieldnames or expected)
        reader.fieldnames = list(file.columns)
        file.rows = [{k: (v or "").strip() for k, v in row.items() if k} for row in reader]
        missing = [name for name in expected if name not in file.columns]
        if missing:
            raise DatasetError(
                [
                    Problem(
                        file.path.name, 1, name, "missing-column", "no such column", name,
                        "put the column back, then add the substance",
                    )
                    for name in missing
                ]
            )  # fmt: skip
        return file

    def with_appended(self, new: Sequence[Row]) -> bytes:
        """The file's bytes with rows behind its last one; trailing empty rows stay trailing."""
        kept = self.content
        tail = re.search(r"(?:\r?\n[\s\"" + re.escape(self.delimiter) + r"]*)+\Z", kept)
        tail_text = ""
        if tail:
            kept, tail_text = kept[: tail.start()], kept[tail.start() :]
        text = io.StringIO(newline="")
        writer = csv.writer(text, delimiter=self.delimiter, lineterminator=self.newline)
        if not kept:
            writer.writerow(self.columns)
        writer.writerows([row.get(column, "") for column in self.columns] for row in new)
        body = text.getvalue()
        if kept:
            body = self.newline + body.removesuffix(self.newline) + (tail_text or self.newline)
        return (kept + body).encode(self.encoding, errors="xmlcharrefreplace")


def plan(folder: Path, names: Iterable[str], *, all_liquids: bool = False) -> Plan:
    """What adding these substances to the tables in ``folder`` would write; writes nothing.

    ``names`` are CAS numbers or names; ``all_liquids`` takes every substance with a published
    permittivity and a usable structure instead. Names that fit none or several substances come
    back as refusals. Raises ``DatasetError`` when a table lacks a column.
    """
    solvents = _File.read(folder, "solvents")
    cas_there = {library.with_hyphens(row["cas"]) or row["cas"]: row for row in solvents.rows}
    slugs = {row["solvent"] for row in solvents.rows}
    sources_there = {row["source"] for row in _File.read(folder, "sources").rows}
    for table in ("measurements", "correlations"):
        _File.read(folder, table)

    found, refusals = _resolved(library.with_permittivity() if all_liquids else names)
    new: dict[str, list[Row]] = {table: [] for table in library.TABLES}
    added, present, skipped = [], [], 0
    for entry in found.values():
        there = cas_there.get(entry.cas)
        if there is not None:
            present.append(f"{there['name']} ({entry.cas})")
            continue
        try:
            smiles = structures.molecule(entry.smiles).smiles
        except ValueError as error:
            skipped += all_liquids
            refusals += [] if all_liquids else [Refusal(entry.name, str(error))]
            continue
        slug = _slug(entry, slugs)
        slugs.add(slug)
        rows = library.rows(entry, slug, smiles)
        rows["sources"] = [row for row in rows["sources"] if row["source"] not in sources_there]
        sources_there.update(row["source"] for row in rows["sources"])
        for table, table_rows in rows.items():
            new[table] += table_rows
        added.append(entry)
    return Plan(
        folder,
        {table: tuple(table_rows) for table, table_rows in new.items()},
        tuple(added),
        tuple(present),
        tuple(refusals),
        skipped,
    )


def apply(plan: Plan) -> None:
    """Append the planned rows. Raises ``ValueError`` for a plan with refusals.

    Every file is made ready before the first is written, so that a fault leaves all untouched.
    A folder without a description becomes a complete one: description, empty tables, and the
    customary uncertainties.
    """
    if plan.refusals:
        raise ValueError("a name is in doubt; nothing is written")
    if not plan.added:
        return
    ready = {}
    for table, rows in plan.rows.items():
        file = _File.read(plan.folder, table)
        if rows or not file.path.exists():
            ready[file.path] = file.with_appended(rows)
    if not (plan.folder / DESCRIPTION).exists():
        ready = {**_start(plan.folder), **ready}
    plan.folder.mkdir(parents=True, exist_ok=True)
    for path, content in ready.items():
        draft = path.with_name(path.name + ".new")
        draft.write_bytes(content)
        draft.replace(path)


def _start(folder: Path) -> dict[Path, bytes]:
    """The files that a new folder lacks, each with what it starts with."""
    paths = [folder / DESCRIPTION, *(folder / table.path for table in shipped_schema().values())]
    whole = (DESCRIPTION, _UNCERTAINTIES)
    return {
        path: shipped_file(path.name)
        if path.name in whole
        else _File.read(folder, path.stem).with_appended(())
        for path in paths
        if not path.exists()
    }


def _resolved(names: Iterable[str]) -> tuple[dict[str, Entry], list[Refusal]]:
    found: dict[str, Entry] = {}
    refusals = []
    for name in names:
        entries = library.find(name)
        if len(entries) == 1:
            found.setdefault(entries[0].cas, entries[0])
        elif entries:
            refusals.append(Refusal(name, "fits several substances; say which", entries))
        else:
            refusals.append(Refusal(name, "not in the open tables, or without a structure there"))
    return found, refusals


def slug(name: str) -> str:
    """Lower-case ASCII words with hyphens: "γ-Butyrolactone" → "gamma-butyrolactone"."""
    for letter, word in _GREEK.items():
        name = name.replace(letter, word)
    ascii_only = unicodedata.normalize("NFKD", name).encode("ascii", "ignore").decode()
    return "-".join(re.findall(r"[a-z0-9]+", ascii_only.lower()))


def _slug(entry: Entry, taken: set[str]) -> str:
    short = slug(entry.name) or entry.cas
    return short if short not in taken else f"{short}-{entry.cas}"
