"""What a row of values states, as far as it can be read: quantity, unit, number, temperature."""

from __future__ import annotations

from collections import defaultdict
from collections.abc import Iterator, Mapping
from dataclasses import dataclass
from difflib import get_close_matches
from functools import lru_cache
from statistics import median

from generator import units
from generator.cells import Fault
from generator.errors import Problem
from generator.quantities import MEASURED, QUANTITIES, Quantity
from generator.tables import Row, Table

# What laboratories call the quantities, besides the names and symbols of the registry.
_CUSTOMARY = {
    "dielectric constant": "relative_permittivity",
    "permittivity": "relative_permittivity",
    "epsilon": "relative_permittivity",
    "eps": "relative_permittivity",
    "refraction": "refractive_index",
    "nd": "refractive_index",
    "nd20": "refractive_index",
    "rho": "density",
    "mu": "dipole_moment",
    "mp": "melting_point",
    "freezing point": "melting_point",
    "bp": "boiling_point",
    "fp": "flash_point",
    "vapor pressure": "vapour_pressure",
    "kappa": "conductivity",
}


@dataclass(frozen=True, slots=True)
class Typed:
    """A row with its quantity, its value [the quantity's unit] and temperature [°C] if readable."""

    row: Row
    quantity: Quantity
    value: float | None
    celsius: float | None


@dataclass(frozen=True, slots=True)
class Ends:
    """Melting and boiling point [°C] as the table has them, None where it has none."""

    melts: float | None = None
    boils: float | None = None


UNKNOWN = Ends()


def number(row: Row, column: str) -> float | None:
    """The number in a cell, None where there is none."""
    return float(row[column]) if row[column] else None


def quantity_of(table: Table, row: Row) -> Quantity | Problem | None:
    """The measured quantity of a row, the problem with it, or None where the cell is blank."""
    key = row["quantity"]
    quantity = QUANTITIES.get(key)
    if quantity is not None and quantity.kind == "measured":
        return quantity
    if not key:
        return None
    if quantity is not None:
        expected = f"a measured quantity: {', '.join(MEASURED)}"
        hint = f"leave the row out; the handbook works the {quantity.name.lower()} out by itself"
        return table.problem(row, "quantity", Fault("derived-quantity", key, expected, hint))
    expected = f"one of {', '.join(MEASURED)}"
    hint = _nearest_quantity(key) or expected
    return table.problem(row, "quantity", Fault("unknown-quantity", key, expected, hint))


def _nearest_quantity(text: str) -> str:
    plain = " ".join(text.casefold().replace("_", " ").replace("-", " ").split())
    names = dict(_CUSTOMARY)
    for key in MEASURED:
        quantity = QUANTITIES[key]
        names |= {
            key.replace("_", " "): key,
            quantity.name.casefold(): key,
            quantity.symbol.casefold(): key,
        }
    near = get_close_matches(plain, names, 1)
    return names[near[0]] if near else ""


def unit_problem(table: Table, row: Row, quantity: Quantity) -> Problem | None:
    """What is wrong with the unit of a row, None where it is blank or fits."""
    fault = _unit_fault(row["unit"], quantity.key) if row["unit"] else None
    return None if fault is None else table.problem(row, "unit", fault)


@lru_cache(maxsize=512)
def _unit_fault(unit: str, key: str) -> Fault | None:
    quantity = QUANTITIES[key]
    if units.same_dimension(unit, quantity.unit):
        return None
    pure = " (1 stands for a pure number)" if quantity.unit == "1" else ""
    expected = f"a unit of {quantity.name.lower()}, such as {quantity.unit}{pure}"
    if not units.is_known(unit):
        swapped = (unit.lower(), unit.upper(), unit.capitalize(), unit.replace("deg ", "deg"))
        fits = [other for other in swapped if units.same_dimension(other, quantity.unit)]
        return Fault("unknown-unit", unit, expected, fits[0] if fits else quantity.unit)
    hint = f"{quantity.unit}, if the value is in that unit; or another quantity in this row"
    return Fault("wrong-dimension", unit, expected, hint)


def typed_rows(table: Table) -> Iterator[Typed]:
    """The rows whose quantity can be read; value and temperature as far as they can."""
    for row in table.whole_rows:
        quantity = quantity_of(table, row)
        if isinstance(quantity, Quantity):
            value = number(row, "value")
            if value is not None and _converts(row["unit"], quantity):
                value = units.convert(value, row["unit"], quantity.unit)
            else:
                value = None
            yield Typed(row, quantity, value, number(row, "temperature_c"))


def _converts(unit: str, quantity: Quantity) -> bool:
    return bool(unit) and _unit_fault(unit, quantity.key) is None


def ends_of(rows: Iterator[Typed]) -> Mapping[str, Ends]:
    """Melting and boiling points by substance: the median of what the table has."""
    found: dict[tuple[str, str], list[float]] = defaultdict(list)
    for typed in rows:
        if typed.quantity.key in ("melting_point", "boiling_point") and typed.value is not None:
            found[typed.row["solvent"], typed.quantity.key].append(typed.value)
    middle = {key: median(values) for key, values in found.items()}
    return {
        solvent: Ends(
            middle.get((solvent, "melting_point")), middle.get((solvent, "boiling_point"))
        )
        for solvent, _ in middle
    }
