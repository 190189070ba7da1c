"""The table of temperature curves, row by row: form, coefficients, range, what the curve gives."""

from __future__ import annotations

import math
from collections.abc import Collection, Iterator, Mapping
from difflib import get_close_matches

import numpy as np

from generator import thermal, units
from generator.cells import Fault, is_number
from generator.errors import Problem
from generator.kelvin import ends_in_15, looks_like_kelvin
from generator.quantities import Quantity
from generator.tables import Row, Table
from generator.thermal import FORMS, Array, Form
from generator.typed import UNKNOWN, Ends, number, quantity_of, unit_problem
from generator.units import ZERO_CELSIUS
from generator.valuechecks import kelvin_fault, uncertainty_fault

# Places of its range at which a curve is looked at.
_PLACES = 9
_MIDDLE = _PLACES // 2
# A lower end above this may be in kelvin [°C].
_HOT = 100.0


def check_correlations(
    table: Table, ends: Mapping[str, Ends], settled: Collection[int]
) -> Iterator[Problem]:
    """Everything wrong with the rows of curves.

    ``ends``: melting and boiling points by substance. A curve whose line is ``settled`` by a
    correction is not asked whether its values can be.
    """
    for row in table.whole_rows:
        quantity = quantity_of(table, row)
        form = FORMS.get(row["form"])
        coefficients, faults = _coefficients(row, form)
        if form is None and row["form"]:
            expected = f"one of {', '.join(FORMS)}"
            near = get_close_matches(row["form"].lower().replace(" ", "_"), FORMS, 1)
            faults.append(("form", Fault("unknown-form", row["form"], expected,
                                         near[0] if near else expected)))  # fmt: skip
        faults += _range(row, ends.get(row["solvent"], UNKNOWN))
        zero = number(row, "uncertainty")
        if zero is not None and (fault := uncertainty_fault(zero)):
            faults.append(("uncertainty", fault))
        yield from (table.problem(row, column, fault) for column, fault in faults)
        if not isinstance(quantity, Quantity):
            yield from [quantity] if quantity else []
            continue
        problem = unit_problem(table, row, quantity)
        if problem:
            yield problem
        elif not faults and form and coefficients and row.line not in settled:
            yield from _values(table, row, quantity, form, coefficients)


def _coefficients(row: Row, form: Form | None) -> tuple[tuple[float, ...], list[tuple[str, Fault]]]:
    """The coefficients, none where one cannot be read, and what is wrong with them."""
    text = row["coefficients"]
    parts = text.split()
    odd = [part for part in parts if not is_number(part)]
    if odd:
        mended = text.replace("\u2212", "-").replace(";", " ")
        if any(part.count(",") == 1 and "." not in part for part in mended.split()):
            mended = mended.replace(",", ".")
        mended = " ".join(mended.replace(",", " ").split())
        fits = all(map(is_number, mended.split()))
        fault = Fault(
            "coefficients", odd[0], "numbers separated by blanks, with a decimal point",
            mended if fits else "each coefficient as a number, 6.5e-05 for instance",
        )  # fmt: skip
        return (), [("coefficients", fault)]
    if form and parts and not form.fewest <= len(parts) <= len(form.coefficients):
        names = " ".join(form.coefficients)
        few, many = form.fewest, len(form.coefficients)
        expected = f"{few}: {names}" if few == many else f"{few} to {many}: {names}"
        hint = "all coefficients of the source, in this order"
        return (), [("coefficients", Fault("coefficient-count", str(len(parts)), expected, hint))]
    return tuple(map(float, parts)), []


def _range(row: Row, ends: Ends) -> list[tuple[str, Fault]]:
    """What is wrong with the two ends of the range."""
    low, high = number(row, "t_min_c"), number(row, "t_max_c")
    if low is None or high is None:
        return []
    found = []
    if looks_like_kelvin(low, ends) or (low >= high > low - ZERO_CELSIUS and low > _HOT):
        found.append(("t_min_c", kelvin_fault(row["t_min_c"], low)))
    if ends_in_15(high):
        found.append(("t_max_c", kelvin_fault(row["t_max_c"], high)))
    if not found and low >= high:
        text = f"{row['t_max_c']} °C, not above the lower end, {row['t_min_c']} °C"
        hint = f"{row['t_min_c']}, with {row['t_max_c']} as the lower end"
        found.append(("t_max_c", Fault("empty-range", text, "the upper end of the range", hint)))
    return found


def _values(
    table: Table, row: Row, quantity: Quantity, form: Form, coefficients: tuple[float, ...]
) -> Iterator[Problem]:
    """Values that no liquid has, inside the range of the curve itself.

    A curve that is off at its ends only is doubtful; published ones are. No number of the
    handbook is taken from where a curve is out of bounds.
    """
    low, high = number(row, "t_min_c"), number(row, "t_max_c")
    if low is None or high is None:
        return
    celsius = np.linspace(low, high, _PLACES)

    def given(temperature: Array) -> list[float]:
        values = thermal.evaluate(form.name, coefficients, temperature)
        return [units.convert(float(y), row["unit"], quantity.unit) for y in values]

    def off(values: list[float]) -> list[int]:
        """Places out of bounds; at its ends a curve may cease, for they are printed rounded."""
        inner = range(1, _PLACES - 1)
        return [
            i
            for i, y in enumerate(values)
            if not quantity.low <= y <= quantity.high and (i in inner or not math.isnan(y))
        ]

    values = given(celsius + ZERO_CELSIUS)
    places = off(values)
    if not places:
        return
    wholly = _MIDDLE in places
    place = _MIDDLE if wholly else places[0]
    unit = "" if quantity.unit == "1" else f" {quantity.unit}"
    hint = "all coefficients of the source, their signs, and the unit of what they give"
    if wholly and not off(given(celsius)):
        hint = "coefficients for a temperature in kelvin; these are for one in °C"
    fault = Fault(
        "curve-out-of-bounds",
        f"a curve that gives {values[place]:.4g}{unit} at {celsius[place]:.4g} °C",
        f"{quantity.low:g} to {quantity.high:g}{unit}",
        hint,
        "error" if wholly else "suspect",
    )
    yield table.problem(row, "coefficients", fault)
