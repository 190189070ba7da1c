"""Who a substance is, by its CAS number, its structure, its name and the rows copied for it.

Where the structure typed is not the one the reference library knows under the CAS number, the
name and the rows that name an open table as their source tell which of the two is wrong.
"""

from __future__ import annotations

from collections.abc import Iterable, Mapping
from dataclasses import dataclass
from decimal import Decimal

from generator import library
from generator.dataset import Measurement, Solvent
from generator.structures import molecule, same_structure
from generator.units import convert

CAS, SMILES = "cas", "smiles"
# Copied rows decide between two CAS numbers where one explains this many more of them.
_MORE_ROWS = 2


@dataclass(frozen=True, slots=True)
class Identity:
    """What the reference library says about a substance.

    ``listed``: the structure it knows under the CAS number, "" where it knows none. ``relation``
    of the typed structure to it: same, stereo, isomer, different, or "" where unknown.
    ``likely_cas``: the number it knows the typed structure under, where that is another one.
    ``wrong``: ``cas`` or ``smiles`` where the two clash, else "". ``why``: what spoke against
    that cell, in words.
    """

    listed: str = ""
    relation: str = ""
    likely_cas: str = ""
    wrong: str = ""
    why: tuple[str, ...] = ()

    @property
    def clashes(self) -> bool:
        """Whether CAS number and structure stand for different substances."""
        return bool(self.wrong)


@dataclass(frozen=True, slots=True)
class Print:
    """What an open table prints: the row as `datasheets add` would write it."""

    value: str
    unit: str
    temperature_c: str = ""

    @property
    def half_width(self) -> float:
        """Half a unit of the last printed digit [unit]."""
        exponent = Decimal(self.value).as_tuple().exponent
        return 0.5 * 10.0**exponent if isinstance(exponent, int) else 0.0


def wrong_cell(solvent: Solvent, measurements: Iterable[Measurement] = ()) -> str:
    """``cas`` or ``smiles``, whichever is wrong, where the two clash; else "".

    ``measurements``: the rows of the substance, as typed.
    """
    return identify(solvent, measurements).wrong


def identify(solvent: Solvent, measurements: Iterable[Measurement] = ()) -> Identity:
    """Compare CAS number, structure, name and copied rows of a substance."""
    listed = library.structure_for_cas(solvent.cas) or ""
    try:
        relation = same_structure(solvent.smiles, listed) if listed else ""
    except ValueError:
        return Identity(listed)
    if relation == "stereo" and not _states_shape(solvent.smiles, listed):
        relation = "same"
    if relation == "same":
        return Identity(listed, relation)
    likely = library.cas_for_inchikey(molecule(solvent.smiles).inchikey) or ""
    likely = likely if likely != solvent.cas else ""
    against = {CAS: list[str](), SMILES: list[str]()}
    _by_name(solvent, against)
    _by_rows(solvent, likely, measurements, against)
    if not listed and not (likely and against[CAS]):
        # A number that the library does not know proves nothing by itself.
        return Identity(listed, relation, likely)
    wrong = CAS if len(against[CAS]) > len(against[SMILES]) else SMILES
    return Identity(listed, relation, likely, wrong, tuple(against[wrong]))


def _states_shape(one: str, other: str) -> bool:
    """Whether both say how their atoms lie in space; a racemate written flat is no clash."""
    return all(any(mark in text for mark in "@/\\") for text in (one, other))


def _by_name(solvent: Solvent, against: Mapping[str, list[str]]) -> None:
    """The name and its synonyms, each a vote where it fits one of the two only."""
    for name in dict.fromkeys((solvent.name, *solvent.synonyms[:2])):
        entries = library.find(name)
        if not entries:
            continue
        own = any(solvent.cas in (e.cas, e.listed_as) for e in entries)
        drawn = any(_same(solvent.smiles, e.smiles) for e in entries)
        if own != drawn:
            against[SMILES if own else CAS].append(f"the name {name}")


def _by_rows(
    solvent: Solvent,
    likely: str,
    measurements: Iterable[Measurement],
    against: Mapping[str, list[str]],
) -> None:
    """The rows copied from open tables: which of the two numbers they stand under there."""
    rows = list(measurements)
    own, other = (_copied(rows, printed(cas)) if cas else 0 for cas in (solvent.cas, likely))
    if own >= other + _MORE_ROWS:
        against[SMILES].append(f"{own} rows that open tables print under {solvent.cas}")
    elif other >= own + _MORE_ROWS:
        against[CAS].append(f"{other} rows that open tables print under {likely}")


def _copied(rows: Iterable[Measurement], prints: Mapping[tuple[str, str], Print]) -> int:
    """How many rows stand so in the open table that they name."""
    count = 0
    for row in rows:
        there = prints.get((row.quantity, row.source))
        if there is not None:
            value = convert(float(there.value), there.unit, row.unit)
            count += abs(value - row.value) <= 1e-9 + 1e-6 * abs(value)
    return count


def _same(one: str, other: str) -> bool:
    try:
        return same_structure(one, other) in ("same", "stereo")
    except ValueError:
        return False


def printed(cas: str) -> Mapping[tuple[str, str], Print]:
    """What the open tables print under a CAS number, by quantity and source; {} if unknown.

    For a curve the value holds its coefficients.
    """
    try:
        rows = library.rows(library.entry(cas), "")
    except library.UnknownSubstanceError:
        return {}
    points = {
        (row["quantity"], row["source"]): Print(row["value"], row["unit"], row["temperature_c"])
        for row in rows["measurements"]
    }
    curves = {
        (row["quantity"] + "~", row["source"]): Print(row["coefficients"], row["unit"])
        for row in rows["correlations"]
    }
    return {**points, **curves}
