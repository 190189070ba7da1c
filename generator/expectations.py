"""The cross-checks of one substance: what one cell makes us expect of another.

Each check yields outcomes: a number found, the number expected from other cells, and the cells
that took part. Nothing is judged here; what is usual comes from the data (``spreads``), and which
cell is to blame from all outcomes together (``blame``).
"""

from __future__ import annotations

from collections.abc import Callable, Iterator

import numpy as np
from numpy.typing import ArrayLike

from generator import polarity
from generator.agreement import (
    AGREEMENT,
    EPS,
    MU,
    ONE_ATMOSPHERE,
    PRESSURE,
    RHO,
    ROOM,
    TB,
    TF,
    TM,
    N,
    inside,
    moment_spread,
)
from generator.facts import TEMPERATURE, Array, Curve, Point, View
from generator.identity import SMILES
from generator.increments import turns
from generator.outcome import Outcome, cells, relative_spread
from generator.quantities import QUANTITIES
from generator.units import AVOGADRO, BOLTZMANN, ZERO_CELSIUS

# Uncertainty of ε∞ = 1.05 n² taken as a share of ε (the 5 % are an assumption).
INFINITE_SHARE = 0.03
# Density values are carried this far to meet an index or permittivity [K].
REACH = 60.0
# Liquids that are liquid at room temperature are measured between these [K].
USUAL = (15.0 + ZERO_CELSIUS, 30.0 + ZERO_CELSIUS)
_GAS_CONSTANT = AVOGADRO * BOLTZMANN  # J/(mol K)
# Pressure takes a liquid this far beyond its boiling point before anybody wonders [K].
UNDER_PRESSURE = 80.0
# Further than this beyond it, a liquid is so far expanded that no structure foretells its volume.
BEYOND_BOILING = 30.0


def outcomes(view: View, reading: str = "") -> list[Outcome]:
    """Every comparison that the cells of a view allow, or those that read one quantity."""
    return [
        outcome
        for check, reads in (*AGREEMENT, *_PHYSICS)
        if not reading or reading in reads
        for outcome in check(view)
    ]


def _near(source: Point | Curve, temperature: float) -> bool:
    if isinstance(source, Curve):
        return source.holds(temperature, 5.0)
    return bool(abs(source.temperature - temperature) <= REACH)


def _ordinary(view: View, temperature: float) -> bool:
    """Whether the liquid is one under its own weight there: not held by pressure."""
    boils = view.middle(TB) + ZERO_CELSIUS
    return not temperature > boils + BEYOND_BOILING


def _refraction(view: View) -> Iterator[Outcome]:
    known = view.known
    shift, scatter = view.facts.series.get("refraction", (0.0, 0.0))
    for index in view.points(N):
        for source in view.sources(RHO):
            if not _near(source, index.temperature):
                continue
            density = view.density(source, view.temperature(index))
            volume = polarity.molar_volume(known.molecule.molar_mass, density)
            # d ln R/dn = 6n/((n²−1)(n²+2)), about 2 for organic liquids
            own = np.hypot(relative_spread(source), 2.0 * index.spread)
            yield Outcome(
                "refraction", "series" if scatter else known.group,
                (*cells(index, source), SMILES),
                polarity.molar_refraction(view.value(index), volume),
                np.asarray(known.refraction * np.exp(shift)), float(np.hypot(own, scatter)),
                f"from n ({index.label}) and ρ ({source.label})",
                "from the series" if scatter else "from the structure", unit="cm3/mol",
            )  # fmt: skip


def _index(view: View) -> Iterator[Outcome]:
    """n from the structure alone: its refraction in its volume."""
    known = view.known
    if not known.foretold:
        return
    shift, scatter = view.facts.series.get("molar_volume", (0.0, 0.0))
    volume = known.foretold["molar_volume"] * np.exp(shift)
    refraction = known.refraction * np.exp(view.facts.series.get("refraction", (0.0, 0.0))[0])
    at_room = polarity.refractive_index_from_refraction(refraction, volume)
    for index in view.points(N):
        if np.isfinite(index.temperature):
            own = float(np.hypot(index.spread / index.value, 0.3 * scatter))
            yield Outcome(
                "index", known.group, (*cells(index), SMILES), view.index(index, ROOM), at_room,
                own, f"n ({index.label})", "from the structure", unit="1",
            )  # fmt: skip


def _volume(view: View) -> Iterator[Outcome]:
    known = view.known
    if not known.foretold:
        return
    shift, scatter = view.facts.series.get("molar_volume", (0.0, 0.0))
    check, group = ("series-volume", "all") if scatter else ("volume", known.group)
    for source in view.sources(RHO):
        at = inside(source) if isinstance(source, Curve) else ROOM
        if not (_near(source, ROOM) and _ordinary(view, at)):
            continue
        volume = polarity.molar_volume(known.molecule.molar_mass, view.density(source, at))
        expected = known.foretold["molar_volume"] * np.exp(shift)
        yield Outcome(
            check, group, (*cells(source), SMILES), volume,
            expected * np.exp(view.expansivity(at) * (at - ROOM)),
            float(np.hypot(relative_spread(source), scatter)), f"from ρ ({source.label})",
            "from the series" if scatter else "from the structure", unit="cm3/mol",
        )  # fmt: skip


def _permittivities(view: View) -> Iterator[tuple[Point | Curve, Array, float, Array]]:
    """Every source of ε with its value and the temperature [K] it is compared at: typed, seen."""
    for point in view.points(EPS):
        if np.isfinite(point.temperature):
            yield point, view.value(point), point.temperature, view.temperature(point)
    for curve in view.curves(EPS):
        at = inside(curve)
        yield curve, view.curve(curve, at), at, np.asarray(at)


def _index_square(view: View) -> Iterator[Outcome]:
    molecule = view.known.molecule
    unpolar = molecule.dipole_limit is not None
    if unpolar and turns(molecule):
        return
    for source, eps, at, now in _permittivities(view):
        for index in view.points(N):
            if not abs(index.temperature - at) <= REACH:
                continue
            square = view.index(index, now) ** 2
            own = float(np.hypot(relative_spread(source), 2 * index.spread / index.value))
            group = "symmetric" if molecule.zero_dipole else "saturated"
            yield Outcome(
                "index-square" if unpolar else "below-index-square",
                group if unpolar else "all", (*cells(source, index), SMILES),
                eps if unpolar else np.minimum(eps, square), square, own,
                f"ε ({source.label})", f"n² ({index.label})", unit="1",
            )  # fmt: skip


def _liquids(
    view: View,
) -> Iterator[tuple[Point | Curve, Array, Array, Array, Array, tuple[str, ...]]]:
    """What the Onsager equation needs beside μ: ε, T [K], n, V [cm3/mol] and the cells read.

    n follows from the structure's refraction, so that a wrong n does not cast doubt on ε.
    """
    known = view.known
    densities = view.sources(RHO)
    for source, eps, at, now in _permittivities(view):
        density = next((d for d in densities if _near(d, at)), None)
        if density is not None:
            rho = view.density(density, now)
            members = (*cells(source), density.name, SMILES)
        elif known.foretold:
            rho = np.asarray(known.molecule.molar_mass / known.foretold["molar_volume"])
            members = (*cells(source), SMILES)
        else:
            continue
        volume = polarity.molar_volume(known.molecule.molar_mass, rho)
        n = polarity.refractive_index_from_refraction(known.refraction, volume)
        yield source, eps, now, n, volume, members


def _onsager(view: View) -> Iterator[Outcome]:
    molecule = view.known.molecule
    if molecule.dipole_limit is not None:
        return
    group = molecule.family if molecule.is_associated else f"aprotic {molecule.family}"
    for source, eps, now, n, volume, members in _liquids(view):
        for moment in view.points(MU):
            steep = sensitivity(moment.value, n, volume, now)
            own = steep * moment_spread(moment) / max(moment.value, 0.1)
            yield Outcome(
                "onsager", group, (moment.name, *members), eps,
                polarity.onsager_permittivity(view.value(moment), n, volume, now),
                float(np.hypot(np.hypot(relative_spread(source), INFINITE_SHARE), own)),
                f"ε ({source.label})", f"from μ ({moment.label}), n and V", weight=steep, unit="1",
            )  # fmt: skip


def _moment(view: View) -> Iterator[Outcome]:
    """ε without a measured moment: from the one estimated, or the one of similar liquids."""
    known = view.known
    if known.molecule.dipole_limit is not None or not known.foretold:
        return
    shift, scatter = view.facts.series.get("liquid_moment", (0.0, 0.0))
    mu = known.foretold["liquid_moment"] * float(np.exp(shift))
    for source, eps, now, n, volume, members in _liquids(view):
        steep = sensitivity(mu, n, volume, now)
        own = np.hypot(relative_spread(source), INFINITE_SHARE)
        yield Outcome(
            "series-moment" if scatter else "moment", known.group, members, eps,
            polarity.onsager_permittivity(mu, n, volume, now),
            float(np.hypot(own, steep * scatter)), f"ε ({source.label})",
            "from the series" if scatter else "from similar structures", weight=steep, unit="1",
        )  # fmt: skip


def sensitivity(mu: float, n: ArrayLike, volume: ArrayLike, temperature: ArrayLike) -> float:
    """d ln ε/d ln μ [1] of the Onsager equation, at the middle of what is tried.

    ``mu`` [D], ``n`` [1], ``volume`` [cm3/mol], ``temperature`` [K].
    """
    if mu <= 0:
        return 0.02
    n, volume, temperature = (
        float(np.median(np.atleast_1d(np.asarray(x)))) for x in (n, volume, temperature)
    )
    low, high = polarity.onsager_permittivity(mu * np.array([0.95, 1.05]), n, volume, temperature)
    with np.errstate(all="ignore"):
        slope = float(np.log(high / low) / np.log(1.05 / 0.95))
    return max(slope, 0.02) if np.isfinite(slope) else 1.0


def _slope(view: View) -> Iterator[Outcome]:
    """d ln ε/dT of a curve against what expansion and thermal agitation leave at constant g."""
    known = view.known
    for curve in view.curves(EPS):
        if curve.row.t_max - curve.row.t_min < 4.0:
            continue
        at = float(np.clip(ROOM, curve.row.t_min + 2.0, curve.row.t_max - 2.0))
        eps = float(curve.at(at))
        if not (known.foretold and eps > 1):
            continue
        volume = known.foretold["molar_volume"]
        n = polarity.refractive_index_from_refraction(known.refraction, volume)
        alpha = view.expansivity(at)
        if known.molecule.dipole_limit is not None:
            slope, group = polarity.clausius_mossotti_slope(eps, alpha), "unpolar"
        else:
            slope = polarity.expected_temperature_coefficient(eps, n, alpha, at)
            group = known.molecule.family if known.molecule.is_associated else "aprotic"
        yield Outcome(
            "slope", group, (curve.name, SMILES), np.asarray(curve.relative_slope(at)),
            slope / eps, 0.0,
            f"d ln ε/dT ({curve.label})", "at constant correlation", unit="1/K",
        )  # fmt: skip


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

    Entropy of evaporation after Kistiakowsky (Z. phys. Chem. 107, 65, 1923), 36.6 + R ln T_b
    [J/(mol K)], rising a little towards lower temperatures: Fishtine's power of 0.19 in T_b/T.
    """
    boils = view.middle(TB) + ZERO_CELSIUS
    if not boils > ROOM + 20.0:
        return
    entropy = (36.6 + _GAS_CONSTANT * np.log(boils)) / _GAS_CONSTANT
    for curve in view.curves(PRESSURE):
        at = inside(curve)
        ratio = boils / at
        if ratio <= 1.05:
            continue
        expected = ONE_ATMOSPHERE * np.exp(-entropy * ratio**0.19 * (ratio - 1))
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
            yield Outcome(
                "usual-temperature", key, (point.name + TEMPERATURE,), now,
                np.clip(now, cold, warm), 0.0, words.replace("_", " "), "usual", unit="K",
            )  # fmt: skip


_PHYSICS: tuple[tuple[Callable[[View], Iterator[Outcome]], frozenset[str]], ...] = (
    (_refraction, frozenset({N, RHO, SMILES})),
    (_index, frozenset({N, SMILES})),
    (_volume, frozenset({RHO, SMILES})),
    (_index_square, frozenset({EPS, N, SMILES})),
    (_onsager, frozenset({EPS, RHO, MU, SMILES})),
    (_moment, frozenset({EPS, RHO, SMILES})),
    (_slope, frozenset({EPS, SMILES})),
    (_boiling, frozenset({TB, SMILES})),
    (_pressure, frozenset({PRESSURE})),
    (_bounds, frozenset()),
    (_flash, frozenset({TF})),
    (_order, frozenset({TM, TB})),
    (_measured_at, frozenset({EPS, N, RHO, TM, TB})),
)
