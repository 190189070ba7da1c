"""Where a liquid is one: melting, boiling and flash points, pressures, temperatures of values.

Checks like those of ``expectations``, from which they differ in asking nothing of the structure
beyond its family and the boiling point it lets expect.
"""

from __future__ import annotations

import re
from collections.abc import Callable, Iterator

import numpy as np

from generator.agreement import (
    EPS,
    KAPPA,
    ONE_ATMOSPHERE,
    PRESSURE,
    RHO,
    ROOM,
    TB,
    TF,
    TM,
    N,
    inside,
)
from generator.facts import TEMPERATURE, View
from generator.identity import SMILES
from generator.outcome import Outcome
from generator.quantities import QUANTITIES
from generator.units import ZERO_CELSIUS

# Liquids that are liquid at room temperature are measured between these [K].
USUAL = (15.0 + ZERO_CELSIUS, 30.0 + ZERO_CELSIUS)
# Pressure takes a liquid this far beyond its boiling point before anybody wonders [K].
UNDER_PRESSURE = 80.0
# Pure hydrocarbons conduct less than this [S/m]; common practice, no source.
INSULATOR = 1e-11


def _boiling(view: View) -> Iterator[Outcome]:
    known = view.known
    if not known.foretold:
        return
    shift, scatter = view.facts.series.get("boiling_point", (0.0, 0.0))
    for point in view.points(TB):
        yield Outcome(
            "series-boiling" if scatter else "boiling", "all" if scatter else known.group,
            (point.name, SMILES), np.maximum(view.value(point) + ZERO_CELSIUS, 1.0),
            np.asarray(known.foretold["boiling_point"] * np.exp(shift)),
            float(np.hypot(point.spread / max(point.value + ZERO_CELSIUS, 1.0), scatter)),
            f"boiling point ({point.label})",
            "from the series" if scatter else "from the structure", unit="K",
        )  # fmt: skip


def _pressure(view: View) -> Iterator[Outcome]:
    """Vapour pressure at room temperature from the boiling point alone.

    ln(p/atm) = −(4.4 + ln T_b) (1.8 (T_b/T − 1) − 0.8 ln(T_b/T)), the entropy of evaporation after
    Kistiakowsky: Mackay, Bobra, Chan, Shiu, Environ. Sci. Technol. 16, 645 (1982).
    """
    boils = view.middle(TB) + ZERO_CELSIUS
    if not boils > ROOM + 20.0:
        return
    for curve in view.curves(PRESSURE):
        at = inside(curve)
        ratio = boils / at
        if ratio <= 1.05:
            continue
        steep = 1.8 * (ratio - 1) - 0.8 * np.log(ratio)
        expected = ONE_ATMOSPHERE * np.exp(-(4.4 + np.log(boils)) * steep)
        yield Outcome(
            "pressure", view.known.molecule.family, (curve.name,), view.curve(curve, at),
            np.asarray(expected), 0.0, f"p at {at - ZERO_CELSIUS:.0f} °C ({curve.label})",
            "from the boiling point", weight=float(ratio - 1), unit="kPa",
        )  # fmt: skip


def _bounds(view: View) -> Iterator[Outcome]:
    """Curves that leave what any liquid has."""
    for key in view.facts.curves:
        quantity = QUANTITIES[key]
        for curve in view.curves(key):
            value = view.curve(curve, inside(curve))
            yield Outcome(
                "bounds", key, (curve.name,), value, np.clip(value, quantity.low, quantity.high),
                0.0, curve.label, "of any liquid at most", unit=quantity.unit,
            )  # fmt: skip


def _flash(view: View) -> Iterator[Outcome]:
    boils = view.middle(TB)
    if not np.isfinite(boils):
        return
    for point in view.points(TF):
        yield Outcome(
            "flash", "all", (point.name,),
            np.maximum(view.value(point) + ZERO_CELSIUS, 1.0),
            np.asarray(boils + ZERO_CELSIUS), point.spread / max(point.value + ZERO_CELSIUS, 1.0),
            f"flash point ({point.label})", "boiling point", unit="K",
        )  # fmt: skip


def _melting(view: View) -> Iterator[Outcome]:
    boils = view.middle(TB) + ZERO_CELSIUS
    if not np.isfinite(boils):
        return
    for point in view.points(TM):
        yield Outcome(
            "melting", "all", (point.name,), np.maximum(view.value(point) + ZERO_CELSIUS, 1.0),
            np.asarray(boils), point.spread / max(point.value + ZERO_CELSIUS, 1.0),
            f"melting point ({point.label})", "boiling point", unit="K",
        )  # fmt: skip


def _conductivity(view: View) -> Iterator[Outcome]:
    """Hydrocarbons that conduct, and one figure for unrelated liquids: a lost 'less than'."""
    hydrocarbon = re.fullmatch(r"C\d*H\d*", view.known.molecule.formula)
    for point in view.points(KAPPA):
        value = view.value(point)
        if hydrocarbon:
            yield Outcome(
                "insulator", "all", (point.name,), np.maximum(value, INSULATOR),
                np.asarray(INSULATOR), 0.0, f"κ ({point.label})", "of a pure hydrocarbon at most",
                unit="S/m",
            )  # fmt: skip
        same = np.isclose(value, point.value, rtol=1e-9, atol=0.0)
        yield Outcome(
            "repeated", "all", (point.name,), np.where(same, float(point.repeats), 0.0),
            np.asarray(0.0), 0.0, f"other liquids with this κ in {point.label}",
            "usual", unit="1",
        )  # fmt: skip


def _order(view: View) -> Iterator[Outcome]:
    """Melting points below the boiling point, boiling points above the melting point."""
    for key, other, side in ((TM, TB, -1.0), (TB, TM, 1.0)):
        edge = view.middle(other)
        if not np.isfinite(edge):
            continue
        for point in view.points(key):
            value = view.value(point)
            yield Outcome(
                "order", key, (point.name,), value,
                np.minimum(value, edge) if side < 0 else np.maximum(value, edge), point.spread,
                f"{key.replace('_', ' ')} ({point.label})", f"{other.replace('_', ' ')} at most"
                if side < 0 else f"{other.replace('_', ' ')} at least", unit="degC",
            )  # fmt: skip


def _measured_at(view: View) -> Iterator[Outcome]:
    """Temperatures at which nobody measures: solid, gaseous, far from room for no reason."""
    melts, boils = (view.middle(key) + ZERO_CELSIUS for key in (TM, TB))
    cold, warm = USUAL
    if boils < warm:
        cold = -np.inf
    if melts > cold:
        warm = max(warm, melts + 40.0)
    for key in (EPS, N, RHO):
        for point in view.points(key):
            if not np.isfinite(point.temperature):
                continue
            now, words = view.temperature(point), f"temperature of {key} ({point.label})"
            for edge in (*view.points(TM), *view.points(TB)):
                at = view.value(edge) + ZERO_CELSIUS
                low = edge.row.quantity == TM
                yield Outcome(
                    "liquid-range", key, (point.name + TEMPERATURE, edge.name), now,
                    np.maximum(now, at) if low else np.minimum(now, at + UNDER_PRESSURE),
                    edge.spread, words.replace("_", " "),
                    f"{'melts' if low else 'boils, and under pressure'} ({edge.label})", unit="K",
                )  # fmt: skip
            if (key, point.row.source) in view.facts.prints:
                # A table prints it so, and may have had its reasons.
                continue
            tens = np.isclose((now - ZERO_CELSIUS) % 10.0, 0.0) & ~(now > boils + 5.0)
            yield Outcome(
                "usual-temperature", key, (point.name + TEMPERATURE,), now,
                np.where(tens, now, np.clip(now, cold, warm)), 0.0, words.replace("_", " "),
                "usual", unit="K",
            )  # fmt: skip


PHASES: tuple[tuple[Callable[[View], Iterator[Outcome]], frozenset[str]], ...] = (
    (_boiling, frozenset({TB, SMILES})),
    (_pressure, frozenset({PRESSURE})),
    (_bounds, frozenset()),
    (_flash, frozenset({TF})),
    (_melting, frozenset({TM})),
    (_order, frozenset({TM, TB})),
    (_measured_at, frozenset({EPS, N, RHO, TM, TB})),
    (_conductivity, frozenset({KAPPA})),
)
