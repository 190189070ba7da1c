"""Sources against each other: points, curves, temperatures, moments, and who the substance is."""

from __future__ import annotations

from collections.abc import Callable, Iterator
from functools import lru_cache
from itertools import combinations

import numpy as np

from generator.facts import CAS, SMILES, TEMPERATURE, Curve, Point, View
from generator.outcome import Outcome, cells, relative_spread
from generator.quantities import QUANTITIES
from generator.units import ZERO_CELSIUS, convert

EPS, N, RHO, MU = "relative_permittivity", "refractive_index", "density", "dipole_moment"
TM, TB, TF = "melting_point", "boiling_point", "flash_point"
PRESSURE, VISCOSITY = "vapour_pressure", "viscosity"
ROOM = 20.0 + ZERO_CELSIUS  # K
ONE_ATMOSPHERE = 101.325  # kPa, exact
# Two points at temperatures this far apart are of one temperature [K].
SAME = 5.0
_CURVES = {PRESSURE: "pressure-curves", VISCOSITY: "viscosity-curves"}
_TEMPERATURES = {TM: "melting-points", TB: "boiling-points", TF: "flash-points"}
# A calculated moment is of one conformer and one method [D].
_CALCULATED = 0.3


def _own_curve(view: View) -> Iterator[Outcome]:
    for key in (EPS, RHO, VISCOSITY, PRESSURE):
        for point in view.points(key):
            for curve in view.curves(key):
                if np.isfinite(point.temperature) and curve.holds(point.temperature):
                    yield Outcome(
                        "own-curve", key, (*cells(point), curve.name), view.value(point),
                        view.curve(curve, view.temperature(point)), relative_spread(point),
                        f"point ({point.label})", curve.label,
                    )  # fmt: skip


def _curves(view: View) -> Iterator[Outcome]:
    for key in (EPS, RHO, VISCOSITY, PRESSURE):
        for one, other in combinations(view.curves(key), 2):
            low = max(one.row.t_min, other.row.t_min)
            high = min(one.row.t_max, other.row.t_max)
            if low <= high:
                at = float(np.clip(ROOM, low, high))
                yield Outcome(
                    _CURVES.get(key, "curves"), key, (one.name, other.name), view.curve(one, at),
                    view.curve(other, at), 0.0, one.label, other.label,
                )  # fmt: skip


def _points(view: View) -> Iterator[Outcome]:
    for key in (EPS, RHO, N):
        for one, other in combinations(view.points(key), 2):
            if abs(one.temperature - other.temperature) <= SAME:
                yield Outcome(
                    "sources", key, (*cells(one), *cells(other)), view.value(one),
                    view.value(other), float(np.hypot(relative_spread(one),
                    relative_spread(other))), one.label, other.label,
                )  # fmt: skip


def _moments(view: View) -> Iterator[Outcome]:
    points = view.points(MU)
    for one, other in combinations(points, 2):
        yield Outcome(
            "moments", "all", (one.name, other.name), view.value(one), view.value(other),
            float(np.hypot(_moment_spread(one), _moment_spread(other))), one.label, other.label,
            weight=max(1.0, 0.5 * min(one.value, other.value)), unit="D",
        )  # fmt: skip
    limit = view.known.molecule.dipole_limit
    if limit is None:
        return
    for point in points:
        yield Outcome(
            "symmetry", "all", (point.name, SMILES), np.maximum(view.value(point), limit), limit,
            _moment_spread(point), f"μ ({point.label})", "allowed by the structure", unit="D",
        )  # fmt: skip


def _moment_spread(point: Point) -> float:
    return max(point.spread, _CALCULATED) if point.calculated else point.spread


def _temperatures(view: View) -> Iterator[Outcome]:
    for key in (TM, TB, TF):
        for one, other in combinations(view.points(key), 2):
            yield Outcome(
                _TEMPERATURES[key], "all", (one.name, other.name), view.value(one), view.value(other),
                float(np.hypot(one.spread, other.spread)), one.label, other.label, unit="degC",
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
                boils - ZERO_CELSIUS, point.spread, f"boiling point ({point.label})",
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
    if not who.relation:
        return
    yield Outcome(
        "identity", "all", (SMILES, CAS), float(who.clashes and view.structure is None), 0.0, 0.0,
        "structure typed", f"structure of the CAS number ({who.relation})",
    )  # fmt: skip
    if who.name_cas is not None:
        yield Outcome(
            "name", "all", (CAS,), float(not who.name_cas), 0.0, 0.0, "CAS number typed",
            "CAS number of the name",
        )  # fmt: skip
    if who.name_structure is not None:
        yield Outcome(
            "name", "all", (SMILES,),
            float(not who.name_structure and view.structure is None), 0.0, 0.0,
            "structure typed", "structure of the name",
        )  # fmt: skip


def _transcripts(view: View) -> Iterator[Outcome]:
    """Rows that name an open table as their source, against that table."""
    prints = view.facts.prints
    if not prints:
        return
    for key in view.facts.points:
        unit = QUANTITIES[key].unit
        for point in view.points(key):
            there = prints.get((key, point.row.source))
            if there is None or point.row.correction is not None:
                continue
            expected = convert(float(there.value), there.unit, unit)
            shift = ZERO_CELSIUS if unit == "degC" else 0.0
            yield Outcome(
                "transcript", "all", (point.name, CAS), np.asarray(view.value(point)) + shift,
                expected + shift, 0.0, "typed", f"printed in {point.label}",
                unit="K" if shift else unit,
            )  # fmt: skip
            if there.temperature_c and np.isfinite(point.temperature):
                yield Outcome(
                    "transcript-temperature", "all", (point.name + TEMPERATURE, CAS),
                    view.temperature(point), float(there.temperature_c) + ZERO_CELSIUS, 0.0,
                    "typed", f"printed in {point.label}", unit="K",
                )  # fmt: skip
    for key in view.facts.curves:
        for curve in view.curves(key):
            there = prints.get((f"{key}~", curve.row.source))
            if there is None:
                continue
            right = tuple(map(float, there.value.split())) == tuple(curve.row.coefficients)
            yield Outcome(
                "transcript", "all", (curve.name, CAS), 1.0 if right else 2.0, 1.0, 0.0,
                "coefficients typed", f"printed in {curve.label}",
            )  # fmt: skip


AGREEMENT: tuple[tuple[Callable[[View], Iterator[Outcome]], frozenset[str]], ...] = (
    (_own_curve, frozenset({EPS, RHO, VISCOSITY, PRESSURE})),
    (_curves, frozenset({EPS, RHO, VISCOSITY, PRESSURE})),
    (_points, frozenset({EPS, RHO, N})),
    (_moments, frozenset({MU, SMILES})),
    (_temperatures, frozenset({TM, TB, TF})),
    (_vapour, frozenset({TB, PRESSURE})),
    (_identity, frozenset({SMILES, CAS})),
    (_transcripts, frozenset({*QUANTITIES, CAS})),
)
