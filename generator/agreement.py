"""Sources against each other: points, curves, temperatures, moments, and who the substance is."""

from __future__ import annotations

from collections.abc import Callable, Iterator
from functools import lru_cache
from itertools import combinations

import numpy as np

from generator.facts import TEMPERATURE, Curve, Point, View
from generator.identity import CAS, SMILES
from generator.increments import turns
from generator.outcome import Outcome, cells, relative_spread
from generator.quantities import QUANTITIES
from generator.units import ZERO_CELSIUS, convert, convert_difference

EPS, N, RHO, MU = "relative_permittivity", "refractive_index", "density", "dipole_moment"
TM, TB, TF = "melting_point", "boiling_point", "flash_point"
PRESSURE, VISCOSITY, KAPPA = "vapour_pressure", "viscosity", "conductivity"
ROOM = 20.0 + ZERO_CELSIUS  # K
ONE_ATMOSPHERE = 101.325  # kPa, exact
# Two points at temperatures this far apart are of one temperature [K].
SAME = 5.0
# A row that was measured this close to the table's temperature is the table's row [K].
_SAME_PRINT = 0.6
_CURVES = {PRESSURE: "pressure-curves", VISCOSITY: "viscosity-curves"}
_SOURCES = {EPS: "permittivities", RHO: "densities", N: "indices"}
_TEMPERATURES = {TM: "melting-points", TB: "boiling-points", TF: "flash-points"}
# A calculated moment is of one conformer and one method [D].
_CALCULATED = 0.3
# What an estimate for a molecule of well-known parts and few shapes is off by [D].
USUAL_ESTIMATE = 0.29


def _own_curve(view: View) -> Iterator[Outcome]:
    for key in (EPS, RHO, VISCOSITY, PRESSURE):
        for point in view.points(key):
            for curve in view.curves(key):
                if np.isfinite(point.temperature) and curve.holds(point.temperature):
                    yield Outcome(
                        _kind(point, curve), key,
                        (*cells(point), curve.name), view.value(point),
                        view.curve(curve, view.temperature(point)), relative_spread(point),
                        f"point ({point.label})", curve.label,
                    )  # fmt: skip


def _kind(point: Point, curve: Curve) -> str:
    if curve.calculated:
        return "worked-out"
    return "own-curve" if point.row.source == curve.row.source else "curve"


def inside(*curves: Curve) -> float:
    """Room temperature, or half way between the ends where curves do not hold there [K]."""
    low = max(curve.row.t_min for curve in curves)
    high = min(curve.row.t_max for curve in curves)
    # The last stretch before a critical point is no place to compare densities at.
    inner = high - 0.15 * (high - low)
    return ROOM if low <= ROOM <= max(inner, low) else low if low > ROOM else 0.5 * (low + high)


def _curves(view: View) -> Iterator[Outcome]:
    for key in (EPS, RHO, VISCOSITY, PRESSURE):
        for one, other in combinations(view.curves(key), 2):
            at = inside(one, other)
            if one.holds(at) and other.holds(at):
                yield Outcome(
                    _CURVES.get(key, "curves"), key, (one.name, other.name),
                    view.curve(one, at), view.curve(other, at), 0.0,
                    f"{one.label} at {at - ZERO_CELSIUS:.0f} °C", other.label,
                )  # fmt: skip


def _points(view: View) -> Iterator[Outcome]:
    for key in (EPS, RHO, N):
        for one, other in combinations(view.points(key), 2):
            if not abs(one.temperature - other.temperature) <= SAME:
                continue
            there = view.value(other)
            if key == RHO:
                there = view.density(other, view.temperature(one))
            elif key == N:
                there = view.index(other, view.temperature(one))
            own = float(np.hypot(relative_spread(one), relative_spread(other)))
            yield Outcome(
                _SOURCES[key], key, (*cells(one), *cells(other)), view.value(one), there, own,
                one.label, other.label,
            )  # fmt: skip


def _moments(view: View) -> Iterator[Outcome]:
    points = view.points(MU)
    for one, other in combinations(points, 2):
        yield Outcome(
            "moments", "calculated" if one.calculated or other.calculated else "measured",
            (one.name, other.name), view.value(one), view.value(other),
            float(np.hypot(moment_spread(one), moment_spread(other))), one.label, other.label,
            weight=max(1.0, 0.5 * min(one.value, other.value)), unit="D",
        )  # fmt: skip
    yield from _estimate(view)
    limit = view.known.molecule.dipole_limit
    if limit is None:
        return
    for point in points:
        yield Outcome(
            "symmetry", "all", (point.name, SMILES), np.maximum(view.value(point), limit),
            np.asarray(limit), moment_spread(point), f"μ ({point.label})",
            "allowed by the structure", unit="D",
        )  # fmt: skip


def estimated(view: View) -> tuple[float, float] | None:
    """The estimated moment [D] of the structure in view with its uncertainty, if it can judge."""
    estimate = view.facts.estimate if view.structure is None else None
    return None if turns(view.known.molecule) else estimate


def _estimate(view: View) -> Iterator[Outcome]:
    estimate = estimated(view)
    if estimate is None:
        return
    value, uncertainty = estimate
    for point in view.points(MU):
        yield Outcome(
            "estimate", "all", (point.name, SMILES), view.value(point),
            np.asarray(value), moment_spread(point), f"μ ({point.label})",
            "estimated from the structure", weight=max(1.0, uncertainty / USUAL_ESTIMATE), unit="D",
        )  # fmt: skip


def moment_spread(point: Point) -> float:
    """Own uncertainty of a dipole moment [D]; a calculated one is of one conformer."""
    return max(point.spread, _CALCULATED) if point.calculated else point.spread


def _temperatures(view: View) -> Iterator[Outcome]:
    for key in (TM, TB, TF):
        for one, other in combinations(view.points(key), 2):
            yield Outcome(
                _TEMPERATURES[key], "all", (one.name, other.name), view.value(one),
                view.value(other), float(np.hypot(one.spread, other.spread)), one.label,
                other.label, unit="degC",
            )  # fmt: skip


def _vapour(view: View) -> Iterator[Outcome]:
    for curve in view.curves(PRESSURE):
        boils = boiling_after(curve)
        if not np.isfinite(boils):
            continue
        for point in view.points(TB):
            yield Outcome(
                "vapour", "all", (point.name, curve.name), view.value(point),
                # A curve under suspicion has no inverse worth working out: it is left out whole.
                np.asarray(boils - ZERO_CELSIUS), point.spread, f"boiling point ({point.label})",
                f"1 atm on {curve.label}", unit="degC",
            )  # fmt: skip


@lru_cache(maxsize=4096)
def boiling_after(curve: Curve) -> float:
    """Temperature [K] at which a vapour pressure curve reaches 1 atm, NaN outside its range."""
    low, high = curve.row.t_min - 15.0, curve.row.t_max + 15.0
    grid = np.linspace(low, high, 161)
    pressure = np.log(np.maximum(curve.at(grid), 1e-12))
    target = np.log(ONE_ATMOSPHERE)
    above = np.flatnonzero((pressure[:-1] <= target) & (pressure[1:] > target))
    if not above.size:
        return float("nan")
    i = int(above[0])
    share = (target - pressure[i]) / (pressure[i + 1] - pressure[i])
    return float(grid[i] + share * (grid[i + 1] - grid[i]))


def _identity(view: View) -> Iterator[Outcome]:
    who = view.facts.identity
    right, wrong = np.asarray(0.0), np.asarray(1.0)
    if who.relation:
        clash = who.clashes and view.structure is None
        yield Outcome(
            "identity", "all", (SMILES, CAS), wrong if clash else right, right, 0.0,
            "the structure typed", f"the one of the CAS number ({who.relation})",
        )  # fmt: skip
    for reason in who.why:
        settled = who.wrong == SMILES and view.structure is not None
        yield Outcome(
            "name", "all", (who.wrong,), right if settled else wrong, right, 0.0,
            "the structure" if who.wrong == SMILES else "the CAS number", f"that of {reason}",
        )  # fmt: skip


def _copies(view: View) -> Iterator[Outcome]:
    """Rows that name an open table as their source, against that table.

    A row that has neither the temperature nor the value of the table is another entry of it.
    """
    for key in view.facts.points:
        for point in view.points(key):
            there = view.facts.prints.get((key, point.row.source))
            if there is None or point.row.correction is not None:
                continue
            unit = QUANTITIES[key].unit
            expected = convert(float(there.value), there.unit, unit)
            zero = ZERO_CELSIUS if unit == "degC" else 0.0
            slack = max(
                point.row.half_width, convert_difference(there.half_width, there.unit, unit)
            )
            timed = bool(there.temperature_c) and np.isfinite(point.temperature)
            at = float(there.temperature_c) + ZERO_CELSIUS if timed else np.nan
            if not timed or abs(point.temperature - at) < _SAME_PRINT:
                # What rounds to the printed digits is the printed value.
                value = view.value(point)
                value = np.where(np.abs(value - expected) <= 1.02 * slack, expected, value)
                yield Outcome(
                    "copied", "all", (point.name, CAS), value + zero,
                    np.asarray(expected + zero), 0.0, "typed",
                    f"printed in {point.label}", unit="K" if zero else unit,
                )  # fmt: skip
            if timed and abs(point.value - expected) <= 2 * slack:
                yield Outcome(
                    "copied-temperature", "all", (point.name + TEMPERATURE, CAS),
                    view.temperature(point), np.asarray(at), 0.0,
                    "typed", f"printed in {point.label}", unit="K",
                )  # fmt: skip
    for key in view.facts.curves:
        for curve in view.curves(key):
            there = view.facts.prints.get((f"{key}~", curve.row.source))
            if there is not None:
                right = tuple(map(float, there.value.split())) == tuple(curve.row.coefficients)
                yield Outcome(
                    "copied", "all", (curve.name, CAS), np.asarray(1.0 if right else 2.0),
                    np.asarray(1.0), 0.0, "coefficients typed", f"printed in {curve.label}",
                )  # fmt: skip


AGREEMENT: tuple[tuple[Callable[[View], Iterator[Outcome]], frozenset[str]], ...] = (
    (_own_curve, frozenset({EPS, RHO, VISCOSITY, PRESSURE})),
    (_curves, frozenset({EPS, RHO, VISCOSITY, PRESSURE})),
    (_points, frozenset({EPS, RHO, N})),
    (_moments, frozenset({MU, SMILES})),
    (_temperatures, frozenset({TM, TB, TF})),
    (_vapour, frozenset({TB, PRESSURE})),
    (_identity, frozenset({SMILES, CAS})),
    (_copies, frozenset({*QUANTITIES, CAS})),
)
