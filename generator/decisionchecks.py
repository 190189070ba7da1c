"""The table of corrections, row by row: whether what it decides about is still there."""

from __future__ import annotations

from collections import defaultdict
from collections.abc import Collection, Iterator, Mapping, Sequence
from dataclasses import dataclass

from generator import units
from generator.cells import Fault, is_number
from generator.dataset import SAME_TEMPERATURE, printed_alike
from generator.errors import Problem
from generator.quantities import QUANTITIES, Quantity
from generator.tables import Row, Table
from generator.typed import number, quantity_of

_KEY = ("solvent", "quantity", "source")
# Where points and curves stand.
_FILES = ("measurements.csv", "correlations.csv")


@dataclass(frozen=True, slots=True)
class Decided:
    """A correction with the rows it may mean, and the one it does mean if there is one.

    ``curve`` says that a row stands in the table of curves.
    """

    row: Row
    candidates: tuple[tuple[Row, bool], ...]
    meant: Row | None
    curve: bool


def decisions(corrections: Table, measurements: Table, correlations: Table) -> list[Decided]:
    """Each correction with the row it means."""
    rows: dict[tuple[str, ...], list[tuple[Row, bool]]] = defaultdict(list)
    for table, curve in ((measurements, False), (correlations, True)):
        for row in table.whole_rows:
            rows[tuple(row[column] for column in _KEY)].append((row, curve))
    found = []
    for row in corrections.whole_rows:
        candidates = tuple(rows.get(tuple(row[column] for column in _KEY), ()))
        meant, curve = next((c for c in candidates if _means(row, *c)), (None, False))
        found.append(Decided(row, candidates, meant, curve))
    return found


def _means(correction: Row, row: Row, curve: bool) -> bool:
    if curve:
        return not correction["temperature_c"] and printed_alike(
            correction["published_value"], row["coefficients"]
        )
    return _same_temperature(correction, row) and printed_alike(
        correction["published_value"], row["value"]
    )


def _same_temperature(correction: Row, row: Row) -> bool:
    one, other = number(correction, "temperature_c"), number(row, "temperature_c")
    if one is None or other is None:
        return one is other
    return abs(one - other) <= SAME_TEMPERATURE


def settled(decided: Sequence[Decided]) -> Mapping[bool, frozenset[int]]:
    """Lines of the rows that a correction decides about: of measurements (False), curves (True)."""
    return {
        curve: frozenset(d.meant.line for d in decided if d.meant is not None and d.curve == curve)
        for curve in (False, True)
    }


def check_corrections(
    table: Table, decided: Sequence[Decided], wrong: Collection[tuple[str, int]]
) -> Iterator[Problem]:
    """Everything wrong with the rows of corrections.

    ``wrong``: file and line of every other error, line 0 or 1 for a whole table. A value that is
    missing because of one of them is not called gone.
    """
    whole = not any((file, line) in wrong for file in _FILES for line in (0, 1))
    for decision in decided:
        row = decision.row
        quantity = quantity_of(table, row)
        if isinstance(quantity, Problem):
            yield quantity
            continue
        faults = list(_replacement(decision, quantity))
        places = [(_FILES[curve], other.line) for other, curve in decision.candidates]
        clear = whole and not any(p in wrong for p in [(table.schema.path, row.line), *places])
        if decision.meant is None and clear and quantity is not None:
            faults.append(_expired(decision))
        yield from (table.problem(row, column, fault) for column, fault in faults)


def _replacement(decision: Decided, quantity: Quantity | None) -> Iterator[tuple[str, Fault]]:
    row, new = decision.row, decision.row["replacement"]
    if row["action"] != "replace":
        if new and row["action"] in ("exclude", "keep"):
            hint = f"leave it blank, or make the action replace instead of {row['action']}"
            yield "replacement", Fault("needless-replacement", new, "a blank cell", hint)
    elif decision.curve:
        hint = "exclude, and put the better curve into correlations.csv"
        yield "action", Fault("replaced-curve", "replace", "exclude or keep for a curve", hint)
    elif not new:
        hint = "the value to use instead, or exclude as the action"
        yield "replacement", Fault("missing-replacement", "a blank cell", "a number", hint)
    elif not is_number(new):
        mended = new.replace(",", ".").replace("\u2212", "-")
        hint = mended if is_number(mended) else "the number alone, in the unit of the published one"
        yield "replacement", Fault("wrong-type", new, "a number", hint)
    elif decision.meant is not None and quantity is not None:
        unit = decision.meant["unit"]
        if not units.same_dimension(unit, quantity.unit):
            return
        value = units.convert(float(new), unit, quantity.unit)
        if not quantity.low <= value <= quantity.high:
            expected = f"{quantity.low:g} to {quantity.high:g} {quantity.unit}"
            hint = f"the value in {unit}, the unit of the published one"
            yield "replacement", Fault("out-of-bounds", f"{new} {unit}", expected, hint)


def _expired(decision: Decided) -> tuple[str, Fault]:
    """The decision is about a value that is not there, or not any more."""
    row = decision.row
    published = row["published_value"]
    moved = [
        c for c, curve in decision.candidates
        if not curve and printed_alike(published, c["value"])
    ]  # fmt: skip
    if moved:
        there = moved[0]["temperature_c"]
        typed = row["temperature_c"]
        found = f"{typed} °C" if typed else "a blank cell"
        hint = there or "leave the cell blank"
        expected = f"the temperature of line {moved[0].line} of the measurements"
        return "temperature_c", Fault("expired-correction", found, expected, hint)
    now = [
        f"{c['coefficients'] if curve else c['value']} (line {c.line} of {_FILES[curve]})"
        for c, curve in decision.candidates
    ]
    name = QUANTITIES[row["quantity"]].name.lower()
    expected = f"a {name} that {row['source']} prints for {row['solvent']} in these tables"
    hint = "delete this row, if the published value has been put right"
    if now:
        hint = f"{', '.join(now[:3])} stands there now: decide anew, or delete this row"
    return "published_value", Fault("expired-correction", published, expected, hint)
