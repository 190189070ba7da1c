"""Who the substances are: CAS numbers, structures, whether both mean the same, and duplicates."""

from __future__ import annotations

import json
from collections.abc import Iterator
from functools import lru_cache
from importlib.metadata import version
from pathlib import Path

from generator import casnumbers, identity, library
from generator.cache import Cache, digest
from generator.cells import Fault
from generator.dataset import Solvent
from generator.errors import Problem
from generator.structures import inchikey
from generator.tables import Row, Table

_RELATIONS = {
    "different": "another substance than",
    "isomer": "an isomer of",
    "stereo": "another stereoisomer than",
    "": "not known as",
}


def check_solvents(table: Table, cache: Cache) -> Iterator[Problem]:
    """Everything wrong with who the substances are. What takes long is kept in ``cache``."""
    pack = cache.pack("identity")
    numbers: dict[str, tuple[int, str]] = {}
    structures: dict[str, tuple[int, str]] = {}
    for row in table.whole_rows:
        number = row["cas"]
        fault = _number_fault(row) if number else None
        if fault:
            yield table.problem(row, "cas", fault)
        elif number in numbers:
            yield table.problem(row, "cas", _duplicate("cas", number, *numbers[number]))
            continue
        elif number:
            numbers[number] = row.line, row["solvent"]
        if not row["smiles"]:
            continue
        key = digest(_version(), row["cas"], row["smiles"], row["name"], row["synonyms"])
        stored = pack.get(key)
        if stored is None:
            stored = json.dumps(_identified(row, known=bool(number) and fault is None)).encode()
            pack.put(key, stored)
        structure, clash = json.loads(bytes(stored))
        if clash:
            column, *parts = clash
            yield table.problem(row, column, Fault(*parts))
        elif structure in structures:
            line, slug = structures[structure]
            yield table.problem(row, "smiles", _duplicate("structure", row["smiles"], line, slug))
        elif structure:
            structures[structure] = row.line, row["solvent"]
    pack.save(forget=True)


def _duplicate(what: str, found: str, line: int, slug: str) -> Fault:
    hint = f"keep one of the two rows, or correct the wrong one: line {line} or this one"
    if what == "structure":
        hint += "; stereoisomers are told apart by @, / and \\ in their structures"
    return Fault(f"duplicate-{what}", f"{found}, as in line {line}, {slug}", "each once", hint)


# --- CAS numbers ----------------------------------------------------------------------------------


def _number_fault(row: Row) -> Fault | None:
    """What is wrong with a CAS number by itself, with the number most likely meant."""
    text = row["cas"]
    if casnumbers.is_valid(text):
        return None
    if casnumbers.is_shaped(text):
        expected = f"a last digit of {casnumbers.check_digit(text[:-1].replace('-', ''))}"
        fitting = _best_first(casnumbers.slips(text), row)
        return Fault("cas-check-digit", text, expected, _suggestion(fitting, row))
    respelled = casnumbers.respelled(text)
    dates = casnumbers.from_date(text)
    if casnumbers.is_date(text) or (dates and not respelled):
        hint = f"{_suggestion(_best_first(dates, row), row)}; then format the column as text"
        return Fault("cas-date", text, "a CAS number; a spreadsheet made a date of it", hint)
    expected = "two to seven digits, two, and one, with hyphens: 67-64-1"
    fitting = _best_first((respelled,) if respelled else (), row)
    return Fault("cas-shape", text, expected, _suggestion(fitting, row))


def _best_first(numbers: tuple[str, ...], row: Row) -> tuple[str, ...]:
    """Numbers that may be meant, those first under which the library has the row's structure."""
    own = _structure(row["smiles"])
    listed = {number: _structure(library.structure_for_cas(number) or "") for number in numbers}
    known = library.cas_for_inchikey(own) if own and own not in listed.values() else None
    ranked = sorted(numbers, key=lambda number: (listed[number] != own, not listed[number]))
    return tuple(dict.fromkeys([*([known] if known else []), *ranked])) if own else numbers


def _suggestion(numbers: tuple[str, ...], row: Row) -> str:
    if not numbers:
        return "look the number up by the name"
    own = _structure(row["smiles"])
    first, *others = numbers
    if own and _structure(library.structure_for_cas(first) or "") == own:
        return f"{first}, the number of the structure in this row"
    return " or ".join([first, *others[:3]])


@lru_cache(maxsize=4096)
def _structure(smiles: str) -> str:
    try:
        return inchikey(smiles) if smiles else ""
    except ValueError:
        return ""


# --- structures -----------------------------------------------------------------------------------


def _identified(row: Row, *, known: bool) -> tuple[str, tuple[str, ...]]:
    """InChIKey and, where something is wrong, column and parts of the fault.

    ``known``: the CAS number is one, so that the structure can be compared with it.
    """
    try:
        structure = inchikey(row["smiles"])
    except ValueError as error:
        hint = "draw the structure again and paste its SMILES"
        if known and (listed := library.structure_for_cas(row["cas"])):
            hint = f"{listed}, the structure of {row['cas']}"
        return "", ("smiles", "unreadable-structure", row["smiles"], str(error), hint)
    listed = library.structure_for_cas(row["cas"]) if known else None
    if not known or _structure(listed or "") == structure:
        return structure, ()
    return structure, _clash(row)


def _clash(row: Row) -> tuple[str, ...]:
    """Column and parts of the fault where CAS number and structure do not fit each other.

    Isomers between which neither name nor anything else decides are left to the cross-checks:
    mixtures of isomers have a number of their own.
    """
    synonyms = tuple(part.strip() for part in row["synonyms"].split(";") if part.strip())
    solvent = Solvent(
        row["solvent"], row["name"], row["cas"], row["smiles"], synonyms, "", row.line
    )
    who = identity.identify(solvent)
    wrong, why = who.wrong, ", ".join(who.why)
    if who.relation == "stereo" and not why:
        wrong = _wrong_by_name(solvent)
        why = f"the name {row['name']}" if wrong else ""
    if not wrong or (who.relation in ("isomer", "stereo") and not why):
        return ()
    found = f"{row['cas']} beside {row['smiles']}, {_RELATIONS[who.relation]} {row['cas']}"
    if why:
        found += f"; against the {'number' if wrong == identity.CAS else 'structure'}: {why}"
    if wrong == identity.CAS:
        hint = who.likely_cas or "look the number up by name and structure"
        return "cas", "structure-cas-mismatch", found, "the number of the structure", hint
    hint = f"{who.listed}, the structure of {row['cas']}"
    if who.likely_cas:
        hint += f"; or the CAS number {who.likely_cas}, if the structure is right"
    return "smiles", "structure-cas-mismatch", found, f"the structure of {row['cas']}", hint


def _wrong_by_name(solvent: Solvent) -> str:
    """Which of two stereoisomers the name means: the wrong one of ``cas`` and ``smiles``, or ""."""
    entries = library.find(solvent.name)
    own = any(entry.cas == solvent.cas for entry in entries)
    drawn = any(_structure(entry.smiles) == _structure(solvent.smiles) for entry in entries)
    if own == drawn:
        return ""
    return identity.SMILES if own else identity.CAS


@lru_cache(maxsize=1)
def _version() -> str:
    """Hash of everything but the row itself that the identity of a substance depends on."""
    here = Path(__file__)
    others = ("identity.py", "library.py", "structures.py", "reference/names.csv")
    content = [file.read_bytes() for file in (here, *(here.parent / name for name in others))]
    return digest(version("rdkit"), version("chemicals"), *content)
