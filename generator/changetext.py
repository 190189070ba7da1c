"""What differs between two versions of the tables, in words: on a terminal, as data, on record."""

from __future__ import annotations

import math
from collections import defaultdict
from collections.abc import Iterator, Sequence
from typing import Any

from generator.changes import Changes, Concern, Flip, Move
from generator.differences import CELL, Change, shown
from generator.history import CLASS, ENTRY, FINDING, NOTE, NUMBER, Event
from generator.quantities import QUANTITIES
from generator.units import ZERO_CELSIUS
from generator.values import Value
from generator.wording import MINUS, celsius_label, prose, split_value, unit_label

_WHOLE = "The tables as a whole"
# A number that moved less than this is not worth a line in the record [standard uncertainties].
_RECORDED = 0.5


def text(changes: Changes) -> str:
    """The changes for a terminal: a summary, then by substance."""
    lines = [f"{changes.old} → {changes.new}", summary(changes)]
    if not changes.compared:
        before, after = changes.errors
        lines.append(
            f"{changes.old} has {_count(before, 'error')}, {changes.new} has "
            f"{_count(after, 'error')}: numbers are not compared."
        )
    for slug, said in _by_substance(changes).items():
        title = changes.names.get(slug, slug) if slug else _WHOLE
        lines += ["", f"{title}" + f" ({slug})" * bool(slug), *(f"  {line}" for line in said)]
    return "\n".join(lines)


def summary(changes: Changes) -> str:
    """How much changed, in one line."""
    cells = sum(entry.kind == CELL for entry in changes.entries)
    rows = len(changes.entries) - cells
    moved = {move.solvent for move in changes.moves}
    shifts = [abs(shift) for move in changes.moves if (shift := move.shift) is not None]
    parts = [_count(cells, "cell") + " changed", _count(rows, "row") + " added or removed"]
    if changes.compared:
        most = f", most by {max(shifts):.1f} u" if shifts else ""
        whose = _count(len(moved), "substance")
        parts.append(f"{_count(len(changes.moves), 'number')} of {whose} moved{most}")
        parts.append(_count(len(changes.flips), "sign or class", "signs or classes") + " changed")
    appeared = _count(len(changes.appeared), "finding")
    parts.append(f"{appeared} appeared, {len(changes.settled)} settled")
    if changes.compared:
        parts.append(_count(len(changes.outdated), "printed sheet") + " out of date")
    if changes.withdrawn:
        parts.append(_count(len(changes.withdrawn), "sheet") + " to take down")
    unit = " (u: the standard uncertainty a number had before)" if shifts else ""
    return "; ".join(parts) + unit


def _count(number: int, one: str, many: str = "") -> str:
    return f"{number} {one if number == 1 else many or one + 's'}"


def _by_substance(changes: Changes) -> dict[str, list[str]]:
    said: dict[str, list[str]] = defaultdict(list)
    for entry in changes.entries:
        said[entry.solvent].append(str(entry))
    for moves in _by_quantity(changes.moves):
        said[moves[0].solvent].append(_move_line(moves))
    for flip in changes.flips:
        said[flip.solvent].append(_flip_line(flip))
    for word, concerns in (("new", changes.appeared), ("settled", changes.settled)):
        for concern in concerns:
            said[concern.solvent].append(f"{word} finding: {_concern_line(concern)}")
    for slug in changes.outdated:
        said[slug].append("printed sheet out of date")
    for slug in changes.withdrawn:
        said[slug].append("no longer there: take its sheet down")
    order = [*changes.names, *sorted(said.keys() - changes.names.keys() - {""}), ""]
    return {slug: said[slug] for slug in order if slug in said}


def _by_quantity(moves: Sequence[Move]) -> Iterator[list[Move]]:
    """The moves of one quantity of one substance together."""
    grouped: dict[tuple[str, str], list[Move]] = defaultdict(list)
    for move in moves:
        grouped[move.solvent, move.quantity].append(move)
    yield from grouped.values()


def _widest(moves: Sequence[Move]) -> Move:
    return max(moves, key=lambda move: abs(move.shift or 0.0))


def _move_line(moves: Sequence[Move]) -> str:
    widest = _widest(moves)
    others = len(moves) - 1
    also = f"; moved at {_count(others, 'other temperature')} too" if others else ""
    return f"{QUANTITIES[widest.quantity].name} {_move(widest)}{also}"


def _move(move: Move) -> str:
    at = "" if move.temperature is None else f"at {celsius_label(move.temperature)}: "
    unit = unit_label(QUANTITIES[move.quantity].unit)
    return f"{at}{_value(move.old)} → {_value(move.new)}" + f" {unit}" * bool(unit) + _shift(move)


def _shift(move: Move) -> str:
    if move.shift is None:
        return ""
    digits = f"{move.shift:+.1f}".replace("-", MINUS)
    return f" ({digits} u)" if digits[1:] != "0.0" else " (within 0.1 u)"


def _value(value: Value | None) -> str:
    if value is None:
        return "not known"
    decimals = QUANTITIES[value.quantity].decimals
    digits, own = split_value(value.value, value.uncertainty, decimals)
    return f"{digits} ± {own}" if own else digits


def _flip_line(flip: Flip) -> str:
    return f"{flip.what}: {flip.old} → {flip.new}"


def _concern_line(concern: Concern) -> str:
    problem = concern.problem
    return f"{problem.place} [{problem.kind}]: {prose(problem.found)}"


# --- for a machine ------------------------------------------------------------------------------


def as_dict(changes: Changes) -> dict[str, Any]:
    """The changes as plain data; temperatures in °C, shifts in standard uncertainties."""
    return {
        "old": changes.old,
        "new": changes.new,
        "compared": changes.compared,
        "entries": [
            {
                "kind": entry.kind, "file": entry.file, "line": entry.line,
                "column": entry.column, "old": entry.old, "new": entry.new,
                "key": list(entry.key), "solvent": entry.solvent,
            }
            for entry in changes.entries
        ],
        "numbers": [
            {
                "solvent": move.solvent, "quantity": move.quantity,
                "temperature_c": _celsius(move.temperature),
                "old": _plain(move.old), "new": _plain(move.new), "shift": move.shift,
                "unit": QUANTITIES[move.quantity].unit,
            }
            for move in changes.moves
        ],
        "classes": [
            {"solvent": flip.solvent, "what": flip.what, "old": flip.old, "new": flip.new}
            for flip in changes.flips
        ],
        "findings": {
            word: [
                {"solvent": c.solvent, "quantity": c.quantity, **c.problem.as_dict()}
                for c in concerns
            ]
            for word, concerns in (("appeared", changes.appeared), ("settled", changes.settled))
        },
        "sheets": {"outdated": list(changes.outdated), "withdrawn": list(changes.withdrawn)},
    }  # fmt: skip


def _celsius(temperature: float | None) -> float | None:
    return None if temperature is None else round(temperature - ZERO_CELSIUS, 6)


def _plain(value: Value | None) -> dict[str, float | None] | None:
    if value is None:
        return None
    own = value.uncertainty if math.isfinite(value.uncertainty) else None
    return {"value": value.value, "uncertainty": own}


# --- for the record -----------------------------------------------------------------------------


def events(changes: Changes, date: str, note: str) -> tuple[Event, ...]:
    """The changes as rows of the table of revisions.

    A substance that is new, or gone, is one row; numbers are recorded where they matter most.
    """

    def event(solvent: str, quantity: str, kind: str, what: str) -> Event:
        return Event(date, changes.new, solvent, quantity, kind, what.replace("\n", " "))

    return tuple(
        [event("", "", NOTE, note or summary(changes))]
        + [event(solvent, quantity, ENTRY, what) for solvent, quantity, what in _rows(changes)]
        + [
            event(widest.solvent, widest.quantity, NUMBER, _move(widest))
            for widest in map(_widest, _by_quantity(changes.moves))
            if widest.shift is None or abs(widest.shift) >= _RECORDED
        ]
        + [event(flip.solvent, "", CLASS, _flip_line(flip)) for flip in changes.flips]
        + [
            event(c.solvent, c.quantity, FINDING, f"{word}: {_concern_line(c)}")
            for word, concerns in (("new", changes.appeared), ("settled", changes.settled))
            for c in concerns
        ]
    )


def _rows(changes: Changes) -> Iterator[tuple[str, str, str]]:
    """Entries for the record: the rows of one table that came or went together as one."""
    together: dict[tuple[str, str, str], list[Change]] = defaultdict(list)
    for entry in changes.entries:
        if entry.kind == CELL:
            yield entry.solvent, entry.row.get("quantity", ""), _cell(entry)
        else:
            together[entry.solvent, entry.file, entry.kind].append(entry)
    for (solvent, file, kind), entries in together.items():
        if len(entries) == 1:
            quantity = entries[0].row.get("quantity", "")
            yield solvent, quantity, f"{file}: {kind}: {entries[0].name}"
        else:
            word = kind.removeprefix("row ")
            yield solvent, "", f"{file}: {len(entries)} rows {word}"


def _cell(entry: Change) -> str:
    return f"{entry.file}, {entry.column}: {shown(entry.old)} → {shown(entry.new)} ({entry.name})"
