"""The table of measurements, row by row: quantity, unit, value, temperature, uncertainty."""

from __future__ import annotations

from collections import defaultdict
from collections.abc import Collection, Iterator, Mapping, Sequence

from generator.cells import Fault
from generator.errors import Problem
from generator.kelvin import in_celsius, looks_like_kelvin, point_in_kelvin
from generator.quantities import Quantity
from generator.slips import slips
from generator.tables import Row, Table
from generator.typed import UNKNOWN, Ends, Typed, number, quantity_of, unit_problem
from generator.units import ZERO_CELSIUS

_POINTS = ("melting_point", "boiling_point", "flash_point")
# Quantities that change little enough with temperature for another row to bear witness, and what
# vacuum has of them; how far such a row may lie away [K], and how far its value may [share].
_STEADY = {"relative_permittivity": 1.0, "refractive_index": 1.0, "density": 0.0}
_NEAR, _ALIKE = 15.0, 0.15
# Their values are far from zero, so that an uncertainty as large as the value is a slip.
_FAR_FROM_ZERO = (*_STEADY, "viscosity", "vapour_pressure")


def check_measurements(
    table: Table, rows: Sequence[Typed], ends: Mapping[str, Ends], settled: Collection[int]
) -> Iterator[Problem]:
    """Everything wrong with the rows of measurements.

    ``rows`` are those whose quantity can be read, ``ends`` the melting and boiling points by
    substance. A row whose line is ``settled`` by a correction is not asked whether its value can
    be.
    """
    for row in table.whole_rows:
        quantity = quantity_of(table, row)
        if isinstance(quantity, Problem):
            yield quantity
        elif quantity is not None:
            problem = unit_problem(table, row, quantity)
            yield from [problem] if problem else []
            yield from _presence(table, row, quantity)
    groups: dict[tuple[str, str], list[Typed]] = defaultdict(list)
    for typed in rows:
        groups[typed.row["solvent"], typed.quantity.key].append(typed)
    for (solvent, _), group in groups.items():
        for typed in group:
            if typed.row.line not in settled:
                faults = _faults(typed, group, ends.get(solvent, UNKNOWN))
                yield from (table.problem(typed.row, column, fault) for column, fault in faults)


def _presence(table: Table, row: Row, quantity: Quantity) -> Iterator[Problem]:
    """A temperature where none belongs, or none where one is needed."""
    if "temperature_c" not in row.cells or (row.line, "temperature_c") in table.faulty:
        return
    typed, name = row["temperature_c"], quantity.name.lower()
    if quantity.needs_temperature and not typed:
        fault = Fault(
            "missing-temperature", "a blank cell", f"the temperature of this {name} in °C",
            "the temperature the source states, often 20 or 25",
        )  # fmt: skip
    elif typed and not quantity.needs_temperature:
        fault = Fault(
            "needless-temperature", typed, f"a blank cell: a {name} has no temperature",
            f"leave the cell blank; if it matters, write “at {typed} °C” into the note",
        )  # fmt: skip
    else:
        return
    yield table.problem(row, "temperature_c", fault)


def _faults(typed: Typed, group: Sequence[Typed], ends: Ends) -> Iterator[tuple[str, Fault]]:
    """What cannot be about the numbers of a row, each with its column."""
    celsius = typed.celsius
    if celsius is None or not typed.quantity.needs_temperature:
        pass
    elif looks_like_kelvin(celsius, ends) and not _fits_as_typed(typed, group):
        yield "temperature_c", kelvin_fault(typed.row["temperature_c"], celsius)
    if typed.value is None:
        return
    bounds = _out_of_bounds(typed)
    scale = None if bounds else _mixed_scale(typed, group)
    for fault in (bounds, scale):
        if fault:
            yield "value", fault
    yield from _uncertainty(typed)


def kelvin_fault(text: str, celsius: float) -> Fault:
    """A temperature that must be in kelvin, with what to type instead."""
    return Fault("temperature-in-kelvin", f"{text} °C", "a temperature in °C", in_celsius(celsius))


def _fits_as_typed(typed: Typed, group: Sequence[Typed]) -> bool:
    """Whether the value is another one than at that temperature taken for kelvin."""
    vacuum = _STEADY.get(typed.quantity.key)
    if vacuum is None or typed.value is None or typed.celsius is None:
        return False
    meant = typed.celsius - ZERO_CELSIUS
    near = [
        other.value - vacuum
        for other in group
        if other.celsius is not None and other.value is not None
        if abs(other.celsius - meant) <= _NEAR
    ]
    own = typed.value - vacuum
    return bool(near) and all(abs(own - value) > _ALIKE * abs(value) for value in near)


def _out_of_bounds(typed: Typed) -> Fault | None:
    quantity, value = typed.quantity, typed.value
    if value is None or quantity.low <= value <= quantity.high:
        return None
    row = typed.row
    unit = "" if row["unit"] == "1" else f" {row['unit']}"
    expected = f"{quantity.low:g} to {quantity.high:g} {quantity.unit}".removesuffix(" 1")
    return Fault("out-of-bounds", f"{row['value']}{unit}", expected, _slip(typed))


def _slip(typed: Typed) -> str:
    """What may have happened to a value that cannot be, the likeliest first."""
    row, quantity = typed.row, typed.quantity
    likeliest = sorted(
        slips(row["value"], row["unit"], quantity.key), key=lambda s: (s.column != "unit", s.rarity)
    )
    for slip in likeliest:
        if quantity.low <= slip.value <= quantity.high and slip.value != 0:
            unit = "" if quantity.unit == "1" else f" {quantity.unit}"
            return f"{slip.value:.6g}{unit}? {slip.words}; look it up in the source named"
    return "look it up again in the source named, value and unit"


def _mixed_scale(typed: Typed, group: Sequence[Typed]) -> Fault | None:
    """A melting, boiling or flash point in the other of the two scales."""
    if typed.quantity.key not in _POINTS or typed.value is None:
        return None
    others = [o.value for o in group if o is not typed and o.value is not None]
    meant = point_in_kelvin(typed.value, others)
    if meant is None:
        return None
    unit = "K" if meant < typed.value else "degC"
    if typed.row["unit"] not in ("K", "degC", "°C"):
        return None
    found = f"{typed.row['value']} {typed.row['unit']}"
    expected = f"about {meant:.4g} °C" + (", as in the other rows" if others else "")
    return Fault("mixed-scale", found, expected, f"the unit {unit}, or {meant:.2f} in degC")


def _uncertainty(typed: Typed) -> Iterator[tuple[str, Fault]]:
    stated, value = number(typed.row, "uncertainty"), number(typed.row, "value")
    if stated is None or value is None:
        return
    zero = uncertainty_fault(stated)
    if zero:
        yield "uncertainty", zero
    elif stated > abs(value) and typed.quantity.key in _FAR_FROM_ZERO:
        expected = f"less than the value, {typed.row['value']}"
        hint = "the standard uncertainty in the unit of the value, not in percent"
        yield (
            "uncertainty",
            Fault("large-uncertainty", typed.row["uncertainty"], expected, hint, "suspect"),
        )


def uncertainty_fault(stated: float) -> Fault | None:
    """An uncertainty of zero, which nothing measured has."""
    if stated > 0:
        return None
    return Fault("zero-uncertainty", f"{stated:g}", "more than zero",
                 "leave the cell blank where the source states none")  # fmt: skip
