"""Everything wrong with the tables, row by row and between them, in one go.

What the files themselves have wrong comes with the tables. Here: keys, references, and what each
table has to be asked by itself. A fault that follows from another one is not told as well.
"""

from __future__ import annotations

import re
from collections.abc import Collection, Iterator
from difflib import get_close_matches
from pathlib import Path

from generator.cache import Cache
from generator.cells import ERROR, Fault
from generator.curvechecks import check_correlations
from generator.decisionchecks import check_corrections, decisions, settled
from generator.errors import Problem
from generator.schema import Reference
from generator.solventchecks import check_solvents
from generator.tables import Row, Table, Tables, read_tables
from generator.typed import ends_of, quantity_of, typed_rows
from generator.valuechecks import check_measurements

# Hazard statements of the GHS (2xx physical, 3xx health, 4xx environment) and of the EU.
_STATEMENT = re.compile(r"(H[234]\d\d[A-Za-z]{0,3}|EUH\d{3}[A-Z]?)(\+H[234]\d\d[A-Za-z]{0,3})*")
# Columns by which a substance may have been named instead of its slug.
_NAMES = ("name", "cas")


def check_folder(folder: Path, cache_folder: Path | None = None) -> tuple[Problem, ...]:
    """Everything wrong with the tables in a folder.

    Raises ``DatasetError`` when their description cannot be read.
    """
    return check_tables(read_tables(folder), Cache(cache_folder))


def check_tables(tables: Tables, cache: Cache | None = None) -> tuple[Problem, ...]:
    """Everything wrong with tables that have been read, in order of place."""
    keys = [problem for table in tables.tables.values() for problem in _keys(table)]
    found = [*tables.problems, *keys, *_references(tables, {problem.file for problem in keys})]
    found += check_solvents(tables["solvents"], cache or Cache(None))
    measurements, correlations = tables["measurements"], tables["correlations"]
    rows = [*typed_rows(measurements)]
    ends = ends_of(iter(rows))
    decided = decisions(tables["corrections"], measurements, correlations)
    done = settled(decided)
    found += check_measurements(measurements, rows, ends, done[False])
    found += check_correlations(correlations, ends, done[True])
    wrong = {(problem.file, problem.line) for problem in found if problem.severity == ERROR}
    found += check_corrections(tables["corrections"], decided, wrong)
    found += _uncertainties(tables["uncertainties"])
    found += _stock(tables["stock"])
    found += _handling(tables["handling"])
    # A cell that could not be read is not asked what it says.
    read = {(p.file, p.line, p.column) for p in tables.problems if p.severity == ERROR}
    rest = [p for p in found[len(tables.problems) :] if (p.file, p.line, p.column) not in read]
    return tuple(sorted([*tables.problems, *rest]))


# --- keys and references --------------------------------------------------------------------------


def _keys(table: Table) -> Iterator[Problem]:
    """Rows with the key of an earlier one."""
    key = table.schema.key
    if not set(key) <= set(table.columns):
        return
    numeric = {field.name for field in table.schema.fields if field.type == "number"}
    first: dict[tuple[object, ...], Row] = {}
    for row in table.whole_rows:
        if any((row.line, column) in table.faulty for column in key):
            continue
        cells = tuple(
            float(row[column]) if column in numeric and row[column] else row[column]
            for column in key
        )
        if cells not in first:
            first[cells] = row
            continue
        same = ", ".join(f"{column} {row[column]}" for column in key if row[column])
        hint = f"remove line {first[cells].line} or this one"
        if "method" in key:
            hint += "; two values of one source are told apart by their method"
        fault = Fault("duplicate-key", f"{same}, as in line {first[cells].line}", "each once", hint)
        yield table.problem(row, key[0], fault)


def _references(tables: Tables, doubled: Collection[str]) -> Iterator[Problem]:
    """Cells that name a row of another table which is not there, once for each name.

    ``doubled``: files in which a key stands twice, so that another one is missing.
    """
    for table in tables.tables.values():
        for reference in table.schema.references:
            target = tables.tables.get(reference.table)
            if target is None or target.schema.path in doubled:
                continue
            if _can_be_trusted(target, reference.column):
                yield from _unknown(table, reference, target)


def _can_be_trusted(target: Table, column: str) -> bool:
    """Whether a name that is missing from a table is not missing because of a fault there."""
    faulty = any(place == column for _, place in target.faulty)
    return target.complete and column in target.columns and not faulty


def _unknown(table: Table, reference: Reference, target: Table) -> Iterator[Problem]:
    known = {row[reference.column] for row in target.rows}
    missing: dict[str, list[Row]] = {}
    for row in table.whole_rows:
        name = row[reference.field]
        if name and name not in known and (row.line, reference.field) not in table.faulty:
            missing.setdefault(name, []).append(row)
    for name, rows in missing.items():
        first, *others = rows
        found = name
        if others:
            lines = ", ".join(str(row.line) for row in others[:5])
            more = f" and {len(others) - 5} more" if len(others) > 5 else ""
            found += f", also in line{'s' * (len(others) > 1)} {lines}{more}"
        expected = f"a {reference.column} of {target.schema.path}"
        hint = _meant(name, target, reference.column) or (
            f"put {name} into {target.schema.path} first"
            + (", or let `datasheets add` do it" if reference.table == "solvents" else "")
        )
        fault = Fault(f"unknown-{reference.field}", found, expected, hint)
        yield table.problem(first, reference.field, fault)


def _meant(name: str, target: Table, column: str) -> str:
    """The key of the row that a name most likely means, "" where none is near."""
    plain = name.casefold()
    keys = {row[column].casefold(): row[column] for row in target.rows}
    for row in target.rows:
        others = [row[key] for key in _NAMES] + row["synonyms"].split(";")
        keys |= {other.strip().casefold(): row[column] for other in others if other.strip()}
    near = [plain] if plain in keys else get_close_matches(plain, keys, 1, 0.75)
    return keys[near[0]] if near else ""


# --- small tables ---------------------------------------------------------------------------------


def _uncertainties(table: Table) -> Iterator[Problem]:
    for row in table.whole_rows:
        quantity = quantity_of(table, row)
        if isinstance(quantity, Problem):
            yield quantity


def _stock(table: Table) -> Iterator[Problem]:
    for row in table.whole_rows:
        if row["received"] and row["opened"] and row["opened"] < row["received"]:
            found = f"opened on {row['opened']}, received on {row['received']}"
            hint = "look at the label of the container: one of the two dates is wrong"
            fault = Fault("opened-before-received", found, "the day it was opened", hint)
            yield table.problem(row, "opened", fault)


def _handling(table: Table) -> Iterator[Problem]:
    for row in table.whole_rows:
        statements = row["h_statements"].split()
        odd = [text for text in statements if not _STATEMENT.fullmatch(text)]
        if odd:
            fault = Fault("hazard-statement", odd[0], "codes separated by blanks: H225 H319",
                          _codes(row["h_statements"]))  # fmt: skip
            yield table.problem(row, "h_statements", fault)


def _codes(text: str) -> str:
    """The codes in a text that is not made of codes alone."""
    found = re.findall(r"(?:EUH|H) ?\d{3}[A-Za-z]{0,3}(?![A-Za-z])", text, re.IGNORECASE)
    plain = (code.replace(" ", "") for code in found)
    codes = [re.sub(r"^[A-Za-z]+", lambda letters: letters[0].upper(), code) for code in plain]
    fitting = [code for code in codes if _STATEMENT.fullmatch(code)]
    return " ".join(fitting) or "only the codes, as on the safety data sheet: H225 H319"
