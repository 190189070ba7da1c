"""Substances as a reader names them: by short name, name, synonym, CAS number, or place."""

from __future__ import annotations

import difflib
from collections.abc import Iterable

from generator.dataset import Dataset


class OrderError(Exception):
    """What was asked for is not there, or does not go together; the message says what would."""


def choose(dataset: Dataset, words: Iterable[str]) -> tuple[str, ...]:
    """The substances meant by slugs, names, synonyms or CAS numbers (with or without hyphens).

    In the order of the words, each once. Raises ``OrderError`` with every word that fits
    none, and the nearest that would, or that fits several.
    """
    exact: dict[str, list[str]] = {}
    also: dict[str, list[str]] = {}
    for slug, solvent in dataset.solvents.items():
        for name in {n.casefold() for n in (slug, solvent.name, solvent.cas)}:
            exact.setdefault(name, []).append(slug)
        exact.setdefault(solvent.cas.replace("-", ""), []).append(slug)
        for name in {n.casefold() for n in solvent.synonyms}:
            also.setdefault(name, []).append(slug)
    chosen: dict[str, None] = {}
    complaints = []
    for word in words:
        key = word.strip().casefold()
        found = exact.get(key) or also.get(key) or []
        if len(found) == 1:
            chosen[found[0]] = None
        elif found:
            complaints.append(f"{word!r} may be any of: {', '.join(found)}")
        else:
            near = difflib.get_close_matches(key, [*exact, *also], n=3, cutoff=0.6)
            slugs = dict.fromkeys(s for name in near for s in (exact.get(name) or also[name]))
            hint = f"; nearest: {', '.join(slugs)}" if slugs else ""
            complaints.append(f"no substance is called {word!r}{hint}")
    if complaints:
        raise OrderError("\n".join(complaints))
    return tuple(chosen)


def kept_at(dataset: Dataset, location: str) -> tuple[str, ...]:
    """The substances with a container at a place of the stock table, in the order of the tables.

    Raises ``OrderError`` naming the places there are when none is called that.
    """
    wanted = location.strip().casefold()
    found = {c.solvent for c in dataset.stock if c.location.casefold() == wanted}
    if not found:
        places = "; ".join(sorted({c.location for c in dataset.stock})) or "none on record"
        raise OrderError(f"no container stands at {location!r}; places: {places}")
    return tuple(slug for slug in dataset.solvents if slug in found)
