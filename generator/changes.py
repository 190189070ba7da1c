"""Two versions of the tables → what differs: cells, numbers, classes, findings, printed sheets."""

from __future__ import annotations

import datetime
import math
from collections import defaultdict
from collections.abc import Iterable, Iterator, Mapping
from dataclasses import dataclass
from pathlib import Path
from typing import Any

from generator import build, exports, sheets, versions
from generator.cache import Cache
from generator.catalogue import catalogue
from generator.cells import ERROR, NOTE
from generator.contexts import Foot
from generator.differences import Change, Grid, differences, grid_of
from generator.errors import DatasetError, Problem
from generator.metrics import Handbook, Settings
from generator.quantities import QUANTITIES
from generator.tablefiles import read_whole
from generator.tables import HISTORY
from generator.values import Value
from generator.wording import split_value


@dataclass(frozen=True)
class State:
    """One version of the tables, worked out.

    ``handbook`` is None where the check finds errors; ``findings`` then holds those.
    """

    revision: str
    grids: Mapping[str, Grid]
    handbook: Handbook | None
    findings: tuple[Problem, ...]


@dataclass(frozen=True, slots=True)
class Move:
    """A number that is printed otherwise than before, or is there in one version only."""

    solvent: str
    quantity: str
    temperature: float | None
    old: Value | None
    new: Value | None

    @property
    def shift(self) -> float | None:
        """How far the value moved [standard uncertainties it had before], with its sign."""
        if self.old is None or self.new is None or not self.old.uncertainty > 0:
            return None
        return (self.new.value - self.old.value) / self.old.uncertainty


@dataclass(frozen=True, slots=True)
class Flip:
    """A class or sign that is another: polarity, slope of the permittivity, family."""

    solvent: str
    what: str
    old: str
    new: str


@dataclass(frozen=True, slots=True)
class Concern:
    """A finding with the substance and quantity of the row it is about."""

    solvent: str
    quantity: str
    problem: Problem


@dataclass(frozen=True)
class Changes:
    """Everything that differs between two versions of the tables.

    ``names`` leads from short names to names. ``outdated`` are the substances whose sheet says
    something else now, or is new; ``withdrawn`` those whose sheet has to come down. ``errors``
    counts those of the older and of the newer version: where there are any, its numbers are not
    known, and only ``entries`` and the findings say something.
    """

    old: str
    new: str
    names: Mapping[str, str]
    entries: tuple[Change, ...]
    moves: tuple[Move, ...]
    flips: tuple[Flip, ...]
    appeared: tuple[Concern, ...]
    settled: tuple[Concern, ...]
    outdated: tuple[str, ...]
    withdrawn: tuple[str, ...]
    errors: tuple[int, int]

    @property
    def compared(self) -> bool:
        """Whether the numbers of both versions are known."""
        return not any(self.errors)


def state(folder: Path, settings: Settings, cache: Cache | None = None) -> State:
    """The tables in a folder, worked out. Raises ``DatasetError`` when they are not whole."""
    tables, files = read_whole(folder)
    grids = {
        name: grid_of(file, tables[name].schema) for name, file in files.items() if name != HISTORY
    }
    handbook: Handbook | None
    findings: tuple[Problem, ...]
    try:
        handbook, findings = build.review(folder, settings, cache)
    except DatasetError as error:
        handbook, findings = None, error.problems
    return State(tables.revision, grids, handbook, findings)


def between(old: str, new: str, data: Path, settings: Settings, cache: Path | None) -> Changes:
    """What differs between two versions by name (see ``versions.opened``).

    Raises ``UnknownVersionError``, and ``DatasetError`` when tables are not whole.
    """
    with versions.opened(old, data) as before, versions.opened(new, data) as after:
        # The newer one last, so that the results kept for the next build are its own.
        states = [state(folder, settings, Cache(cache)) for folder in (before, after)]
        return compare(*states)


def compare(old: State, new: State) -> Changes:
    """What differs between two versions, in the order of the newer tables."""
    appeared, settled = _findings(old, new)
    moves, flips = tuple(_moves(old, new)), tuple(_flips(old, new))
    return Changes(
        old=old.revision,
        new=new.revision,
        names=_names(old) | _names(new),
        entries=tuple(_entries(old, new)),
        moves=moves,
        flips=flips,
        appeared=appeared,
        settled=settled,
        outdated=_outdated(old, new, {m.solvent for m in moves} | {f.solvent for f in flips}),
        withdrawn=tuple(slug for slug in _names(old) if slug not in _names(new)),
        errors=(_errors(old), _errors(new)),
    )


def _outdated(old: State, new: State, moved: set[str]) -> tuple[str, ...]:
    """The substances whose printed sheet says something else, or is new; pictures aside.

    Only those are looked at whose rows, numbers or findings differ.
    """
    if old.handbook is None or new.handbook is None:
        return ()
    before, after = old.handbook.dataset.revisions, new.handbook.dataset.revisions
    said, says = _said(old), _said(new)
    doubtful = [
        slug
        for slug in new.handbook.dataset.solvents
        if slug in moved or before.get(slug) != after.get(slug) or said.get(slug) != says.get(slug)
    ]
    printed, prints = _contents(old, doubtful), _contents(new, doubtful)
    return tuple(slug for slug in doubtful if printed.get(slug) != prints[slug])


def _contents(state: State, slugs: Iterable[str]) -> dict[str, Mapping[str, Any]]:
    """What the sheets of substances say, whoever prints them and when."""
    assert state.handbook is not None
    book = catalogue(state.handbook, state.findings)
    foot, edition = Foot("", ""), sheets.Edition("A4", datetime.date.min)
    there = state.handbook.dataset.solvents
    return {slug: sheets.sheet_of(book, slug, {}, foot, edition) for slug in slugs if slug in there}


def _said(state: State) -> dict[str, list[str]]:
    """The findings about each substance, as they are printed."""
    said: dict[str, list[str]] = defaultdict(list)
    for concerns in _concerns(state).values():
        for concern in concerns:
            said[concern.solvent].append(f"{concern.problem.found} {concern.problem.expected}")
    return said


def _errors(state: State) -> int:
    return sum(finding.severity == ERROR for finding in state.findings)


def _names(state: State) -> dict[str, str]:
    grid = state.grids.get("solvents")
    return {row["solvent"]: row["name"] for row in grid.dicts()} if grid else {}


def _entries(old: State, new: State) -> Iterator[Change]:
    for name in dict.fromkeys((*new.grids, *old.grids)):
        schema = (new.grids.get(name) or old.grids[name]).schema
        nothing = Grid(schema, schema.columns)
        yield from differences(old.grids.get(name, nothing), new.grids.get(name, nothing))


def _shared(old: State, new: State) -> Iterator[tuple[str, Handbook, Handbook]]:
    """The substances both versions have, with both handbooks."""
    if old.handbook is None or new.handbook is None:
        return
    for slug in new.handbook.dataset.solvents:
        if slug in old.handbook.dataset.solvents:
            yield slug, old.handbook, new.handbook


def _moves(old: State, new: State) -> Iterator[Move]:
    for slug, before, after in _shared(old, new):
        was, now = _numbers(before, slug), _numbers(after, slug)
        for key in dict.fromkeys((*now, *was)):
            one, other = was.get(key), now.get(key)
            if _printed(one) != _printed(other):
                yield Move(slug, *key, one, other)


def _numbers(handbook: Handbook, slug: str) -> dict[tuple[str, float | None], Value]:
    return {
        (value.quantity, None if value.temperature is None else round(value.temperature, 3)): value
        for value in exports.values_of(handbook, slug)
    }


def _printed(value: Value | None) -> tuple[str, str]:
    if value is None or not math.isfinite(value.value):
        return "", ""
    return split_value(value.value, value.uncertainty, QUANTITIES[value.quantity].decimals)


def _flips(old: State, new: State) -> Iterator[Flip]:
    for slug, before, after in _shared(old, new):
        pairs = {
            "polarity": (before.is_polar(slug), after.is_polar(slug)),
            "permittivity on warming": (before.trend(slug).sign, after.trend(slug).sign),
            "family": tuple(book.molecules[slug].family_label for book in (before, after)),
        }
        yield from (Flip(slug, what, *pair) for what, pair in pairs.items() if pair[0] != pair[1])


# --- findings -----------------------------------------------------------------------------------


def _findings(old: State, new: State) -> tuple[tuple[Concern, ...], tuple[Concern, ...]]:
    """Findings only the newer version has, and those only the older one has.

    A finding is the same when it is of the same kind and about the same cell, wherever its row
    stands and however its numbers read.
    """
    before, after = _concerns(old), _concerns(new)
    appeared = [c for key, found in after.items() for c in found[len(before.get(key, ())) :]]
    settled = [c for key, found in before.items() for c in found[len(after.get(key, ())) :]]
    return tuple(appeared), tuple(settled)


def _concerns(state: State) -> dict[tuple[str, ...], list[Concern]]:
    rows = {
        (grid.schema.path, line): (grid, grid.row(index))
        for grid in state.grids.values()
        for index, line in enumerate(grid.lines)
    }
    grouped: dict[tuple[str, ...], list[Concern]] = defaultdict(list)
    for problem in state.findings:
        if problem.severity == NOTE:
            continue
        grid, row = rows.get((problem.file, problem.line), (None, {}))
        own = tuple(row[name] for name in grid.schema.key) if grid else (problem.found,)
        concern = Concern(row.get("solvent", ""), row.get("quantity", ""), problem)
        grouped[problem.file, problem.kind, problem.column, *own].append(concern)
    return grouped
