"""The open reference library: who a substance is and what open tables publish about it.

The tables come inside the package ``chemicals``. Its files are read directly, never through its
selection functions, so that every number keeps the name of the table it is from; and the package
itself is not imported, because that costs more than reading the files.
"""

from __future__ import annotations

import csv
import importlib.util
import re
from collections.abc import Iterable, Iterator, Mapping
from dataclasses import dataclass
from functools import lru_cache
from pathlib import Path

from generator import tablerows
from generator.tablerows import Record

# Identity tables, best curated first; a CAS number found in one is not looked for in the next.
_SMALL = (
    "Identifiers/chemical identifiers example user db.tsv",
    "Identifiers/chemical identifiers pubchem small.tsv",
    "Identifiers/Inorganic db.tsv",
)
_LARGE = "Identifiers/chemical identifiers pubchem large.tsv"
_REFERENCE = Path(__file__).parent / "reference"
_CAS = re.compile(r"(\d{2,7})-?(\d\d)-?(\d)")
# Registry codes, catalogue numbers, formulae with brackets: found in synonym lists, of no use.
_NOT_A_NAME = re.compile(
    r"\d{4}|\d-\d\d-\d|^[A-Z]{2,}[- ]?\d|[;{}\[\]=~_@#]|, |-$|inchi|^ghl|^unii", re.IGNORECASE
)
# What tells isomers apart in front of a name.
_LOCANTS = re.compile(r"^(?:(?:\d+(?:,\d+)*|[omp]|sec|tert|cis|trans)-)+")
_SYNONYMS = 4
_LONGEST_SYNONYM = 45
TABLES = ("solvents", "measurements", "correlations", "sources")


class UnknownSubstanceError(LookupError):
    """No substance of the open tables answers to this name or number."""


@dataclass(frozen=True, slots=True)
class Entry:
    """Who a substance is. ``molar_mass`` in g/mol; ``listed_as``: the CAS number under which
    handbooks list it when that is not its own (racemates), else empty."""

    cas: str
    name: str
    smiles: str
    synonyms: tuple[str, ...]
    inchikey: str
    formula: str
    molar_mass: float
    listed_as: str


@dataclass(frozen=True, slots=True)
class _Identity:
    cas: str
    formula: str
    molar_mass: float
    smiles: str
    inchikey: str
    names: tuple[str, ...]  # IUPAC name, common name, then synonyms


# --- files -------------------------------------------------------------------------------------


@lru_cache(maxsize=1)
def _folder() -> Path:
    spec = importlib.util.find_spec("chemicals")
    if spec is None or not spec.submodule_search_locations:
        raise ModuleNotFoundError("the reference library needs the package 'chemicals'")
    return Path(spec.submodule_search_locations[0])


@lru_cache(maxsize=64)
def _table(name: str) -> tuple[tuple[str, ...], Mapping[str, str]]:
    """Column names, and lines by their first cell; a line is split only when it is wanted."""
    header, *lines = (_folder() / name).read_text(encoding="utf-8").splitlines()
    return tuple(header.split("\t")), {line.partition("\t")[0].strip(): line for line in lines}


def _records(cas_numbers: Iterable[str], name: str) -> Iterator[Record]:
    columns, lines = _table(name)
    for cas in cas_numbers:
        line = lines.get(cas) or lines.get(cas.replace("-", ""))
        if line is not None:
            cells = (cell.strip() for cell in line.split("\t"))
            yield dict(zip(columns, cells, strict=False))


@lru_cache(maxsize=8)
def _own_table(name: str) -> Mapping[str, Record]:
    """A table of this package, by its first column."""
    with (_REFERENCE / name).open(encoding="utf-8", newline="") as file:
        rows = list(csv.DictReader(file))
    return {next(iter(row.values())): row for row in rows}


@lru_cache(maxsize=1)
def _large_bytes() -> bytes:
    return (_folder() / _LARGE).read_bytes()


def _parsed(line: str) -> _Identity | None:
    cells = line.rstrip("\r").split("\t")
    if len(cells) < 8 or not cells[4]:
        return None
    names = tuple(dict.fromkeys(name.replace("\xa0", " ").strip() for name in cells[7:]))
    return _Identity(cells[1], cells[2], float(cells[3]), cells[4], cells[6], names)


@lru_cache(maxsize=1)
def _small() -> Mapping[str, _Identity]:
    found: dict[str, _Identity] = {}
    for name in _SMALL:
        for line in (_folder() / name).read_text(encoding="utf-8").splitlines():
            identity = _parsed(line)
            if identity:
                found.setdefault(identity.cas, identity)
    return found


@lru_cache(maxsize=1)
def _large_index() -> Mapping[str, int]:
    """CAS number → where its line starts in the large table."""
    index, start = {}, 0
    for line in _large_bytes().split(b"\n"):
        index[line.split(b"\t", 2)[1].decode() if line else ""] = start
        start += len(line) + 1
    return index


def _line_around(data: bytes, position: int) -> str:
    start = data.rfind(b"\n", 0, position) + 1
    end = data.find(b"\n", position)
    return data[start : end if end >= 0 else len(data)].decode("utf-8", errors="replace")


@lru_cache(maxsize=4096)
def _identity(cas: str) -> _Identity | None:
    return _small().get(cas) or _from_large(cas)


def _from_large(cas: str) -> _Identity | None:
    position = _large_index().get(cas, -1)
    return _parsed(_line_around(_large_bytes(), position)) if position >= 0 else None


def _column_position(data: bytes, wanted: bytes, column: int) -> int:
    """Where ``wanted`` fills that column of some line; −1 if nowhere."""
    needle, position = b"\t" + wanted + b"\t", -1
    while (position := data.find(needle, position + 1)) >= 0:
        start = data.rfind(b"\n", 0, position) + 1
        if data.count(b"\t", start, position + 1) == column:
            return position + 1
    return -1


# --- identity ----------------------------------------------------------------------------------


def with_hyphens(text: str) -> str | None:
    """A CAS number in its usual spelling, or None when ``text`` is no CAS number."""
    match = _CAS.fullmatch(text.strip())
    return "-".join(match.groups()) if match else None


def structure_for_cas(cas: str) -> str | None:
    """SMILES of the substance with this CAS number, None when the library does not know it."""
    own = _own_table("names.csv").get(cas)
    if own and own["smiles"]:
        return own["smiles"]
    identity = _identity(cas)
    return identity.smiles if identity else None


def cas_for_inchikey(inchikey: str) -> str | None:
    """CAS number the library knows a structure under, None when it does not know it."""
    for identity in _small().values():
        if identity.inchikey == inchikey:
            return identity.cas
    data = _large_bytes()
    position = _column_position(data, inchikey.encode(), 6)
    identity_or_none = _parsed(_line_around(data, position)) if position >= 0 else None
    return identity_or_none.cas if identity_or_none else None


@lru_cache(maxsize=4096)
def entry(cas: str) -> Entry:
    """Everything known about who this CAS number is. Raises ``UnknownSubstanceError``."""
    own = _own_table("names.csv").get(cas)
    identity = _identity(cas)
    if identity is None:
        raise UnknownSubstanceError(f"the reference library has no structure for CAS number {cas}")
    name = own["name"] if own else _published_name(cas) or identity.names[1]
    customary = own["synonyms"].split("; ") if own and own["synonyms"] else []
    return Entry(
        cas=cas,
        name=name,
        smiles=(own["smiles"] if own else "") or identity.smiles,
        synonyms=tuple(customary) or _useful_synonyms(name, identity.names),
        inchikey=identity.inchikey,
        formula=identity.formula,
        molar_mass=identity.molar_mass,
        listed_as=own["listed_as"] if own else "",
    )


def _published_name(cas: str) -> str:
    """The handbook's own name, unless a Greek letter or sign has been lost from it."""
    for table, column in ((tablerows.PERMITTIVITY, "Chemical"), (tablerows.ORGANIC, "Name")):
        for record in _records((cas,), table):
            name = record[column].removesuffix(", ()-")
            if name and "--" not in name and not re.search(r"\(\)|^-|, -", name):
                return name
    return ""


def _useful_synonyms(name: str, others: Iterable[str]) -> tuple[str, ...]:
    chosen: dict[str, str] = {}
    for text in others:
        usable = 2 < len(text) <= _LONGEST_SYNONYM and not _NOT_A_NAME.search(text)
        if len(chosen) < _SYNONYMS and usable and text.casefold() != name.casefold():
            chosen.setdefault(text.casefold(), text)
    return tuple(chosen.values())


def find(text: str) -> tuple[Entry, ...]:
    """The substances a CAS number or name may mean: none, one, or several candidates.

    A name is compared whole and without regard to case: first with customary laboratory names,
    then with the names printed in the handbook tables, then with those names without their
    locants ("octanol" is one of four), then with the main names of the identity tables, then
    with their synonyms. The first of these lists that knows the name decides.
    """
    cas = with_hyphens(text)
    if cas is not None:
        cas = _racemates().get(cas, cas)
        return (entry(cas),) if _identity(cas) else ()
    wanted = " ".join(text.split()).casefold()
    if not wanted:
        return ()
    for search in (_customary, _in_handbooks, _without_locants, _in_identities):
        entries = tuple(entry(number) for number in search(wanted) if _identity(number))
        if entries:
            return entries
    return ()


def _customary(wanted: str) -> list[str]:
    names, synonyms = [], []
    for cas, row in _own_table("names.csv").items():
        if row["name"].casefold() == wanted:
            names.append(cas)
        elif wanted in (text.casefold() for text in row["synonyms"].split("; ")):
            synonyms.append(cas)
    return names or synonyms


@lru_cache(maxsize=1)
def _racemates() -> Mapping[str, str]:
    """The number a handbook lists a racemate under → its usual number."""
    return {row["listed_as"]: cas for cas, row in _own_table("names.csv").items()}


def _handbook_names() -> Iterator[tuple[str, str]]:
    for table in (tablerows.PERMITTIVITY, tablerows.ORGANIC, tablerows.INORGANIC):
        for cas, line in _table(table)[1].items():
            name = line.split("\t", 2)[1].strip().casefold()
            yield _racemates().get(cas, cas), name.removesuffix(", ()-")


def _in_handbooks(wanted: str) -> list[str]:
    return list(dict.fromkeys(cas for cas, name in _handbook_names() if name == wanted))


def _without_locants(wanted: str) -> list[str]:
    named = ((cas, name) for cas, name in _handbook_names() if name.endswith(wanted))
    return list(dict.fromkeys(cas for cas, name in named if _LOCANTS.sub("", name) == wanted))


def _in_identities(wanted: str) -> list[str]:
    known = list(_small().values())
    # Both tables keep lower case except for a few letters, so that bytes can be searched.
    data, needle = _large_bytes().lower(), re.escape(wanted.encode())
    hits = re.finditer(rb"\t" + needle + rb"(?=[\t\n])", data)
    lines = dict.fromkeys(_line_around(_large_bytes(), hit.start()) for hit in hits)
    known += [identity for line in lines if (identity := _parsed(line))]
    main: dict[str, None] = {}
    others: dict[str, None] = {}
    for identity in known:
        names = [name.casefold() for name in identity.names]
        if wanted in names[:2]:
            main[identity.cas] = None
        elif wanted in names:
            others[identity.cas] = None
    return list(main or others)


# --- what is published -------------------------------------------------------------------------


def with_permittivity() -> tuple[str, ...]:
    """CAS numbers of all substances with a published permittivity and a known structure."""
    _large_index()
    listed = (_racemates().get(cas, cas) for cas in _table(tablerows.PERMITTIVITY)[1])
    return tuple(cas for cas in dict.fromkeys(listed) if _identity(cas))


def rows(substance: Entry, solvent: str, smiles: str = "") -> dict[str, list[dict[str, str]]]:
    """Rows for the tables ``TABLES`` about one substance, keyed by its slug ``solvent``.

    Every value row names the table it is from; ``sources`` holds just the sources named.
    """
    numbers = tuple(dict.fromkeys(filter(None, (substance.cas, substance.listed_as))))

    def records(table: str) -> tuple[Record, ...]:
        return tuple(_records(numbers, table))

    measurements = tablerows.measurement_rows(records)
    correlations = tablerows.correlation_rows(records, substance.molar_mass)
    note = ""
    if substance.listed_as:
        note = f"Handbook tables list the racemate under CAS number {substance.listed_as}."
    named = {row["source"]: None for row in (*measurements, *correlations)}
    sources = _own_table("sources.csv")
    return {
        "solvents": [
            {
                "solvent": solvent,
                "name": substance.name,
                "cas": substance.cas,
                "smiles": smiles or substance.smiles,
                "synonyms": "; ".join(substance.synonyms),
                "note": note,
            }
        ],
        "measurements": [{"solvent": solvent, **row} for row in measurements],
        "correlations": [{"solvent": solvent, **row} for row in correlations],
        "sources": [dict(sources[key]) for key in named],
    }
