"""Who a substance is, three ways: its CAS number, its structure and its name, by the library.

Where the structure typed is not the one the library knows under the CAS number, the name often
tells which of the two is wrong. Also what the open tables print for a substance, so that a row
naming one of them as its source can be compared with it.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field

from generator import library
from generator.dataset import Solvent
from generator.structures import same_structure


@dataclass(frozen=True, slots=True)
class Identity:
    """What the reference library says about a substance.

    ``listed``: the structure it knows under the CAS number, "" where it knows none. ``relation``
    of the typed structure to it: same, stereo, isomer, different, or "" where unknown.
    ``name_cas``: whether the name is listed under the CAS number; ``name_structure``: whether it
    is listed with the typed structure; None where the library does not know the name, or where
    nothing was in doubt.
    """

    listed: str = ""
    relation: str = ""
    name_cas: bool | None = None
    name_structure: bool | None = None

    @property
    def clashes(self) -> bool:
        """Whether CAS number and structure stand for different substances."""
        return self.relation in ("isomer", "different", "stereo")


def identify(solvent: Solvent) -> Identity:
    """Compare CAS number, structure and name of a substance."""
    listed = library.structure_for_cas(solvent.cas) or ""
    if not listed:
        return Identity()
    try:
        relation = same_structure(solvent.smiles, listed)
    except ValueError:
        return Identity()
    if relation == "stereo" and not _states_shape(solvent.smiles, listed):
        relation = "same"
    found = Identity(listed, relation)
    if not found.clashes:
        return found
    entries = [e for name in (solvent.name, *solvent.synonyms[:2]) for e in library.find(name)]
    if not entries:
        return found
    own = any(solvent.cas in (e.cas, e.listed_as) for e in entries)
    drawn = any(_same(solvent.smiles, e.smiles) for e in entries)
    return Identity(listed, relation, own, drawn)


def _states_shape(one: str, other: str) -> bool:
    """Whether both say how their atoms lie in space; a racemate written flat is no clash."""
    return all(any(mark in text for mark in "@/\\") for text in (one, other))


def _same(one: str, other: str) -> bool:
    try:
        return same_structure(one, other) in ("same", "stereo")
    except ValueError:
        return False


@dataclass(frozen=True, slots=True)
class Print:
    """What an open table prints: the row as `datasheets add` would write it."""

    value: str
    unit: str
    temperature_c: str = ""
    ends: tuple[str, str] = field(default=("", ""))


def printed(cas: str) -> Mapping[tuple[str, str], Print]:
    """What the open tables print under a CAS number, by quantity and source; {} if unknown.

    For a curve the value holds its coefficients.
    """
    try:
        rows = library.rows(library.entry(cas), "")
    except library.UnknownSubstance:
        return {}
    points = {
        (row["quantity"], row["source"]): Print(row["value"], row["unit"], row["temperature_c"])
        for row in rows["measurements"]
    }
    curves = {
        (row["quantity"] + "~", row["source"]): Print(
            row["coefficients"], row["unit"], ends=(row["t_min_c"], row["t_max_c"])
        )
        for row in rows["correlations"]
    }
    return {**points, **curves}
