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
    RHO,
    ROOM,
    TB,
    N,
    estimated,
    inside,
    moment_spread,
)
from generator.facts import RARE, Array, Curve, Point, View, middle_of
from generator.identity import SMILES
from generator.increments import turns
from generator.outcome import Outcome, cells, relative_spread
from generator.phases import PHASES
from generator.units import ZERO_CELSIUS

# Uncertainty of ε∞ = 1.05 n² taken as a share of ε (the 5 % are an assumption).
INFINITE_SHARE = 0.03
# Density values are carried this far to meet an index or permittivity [K].
REACH = 60.0
# Further than this beyond it, a liquid is so far expanded that no structure foretells its volume.
BEYOND_BOILING = 30.0


def outcomes(view: View, reading: str = "") -> list[Outcome]:
    """Every comparison that the cells of a view allow, or those that read one quantity."""
    return [
        outcome
        for check, reads in (*AGREEMENT, *PHASES, *_PHYSICS)
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
    if not known.foretold:
        return
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
    if not view.points(N):
        for source, eps, _, n, _, members in _liquids(view):
            square = np.asarray(n) ** 2
            yield Outcome(
                "below-index-square", "all", members, np.minimum(eps, square), square,
                float(np.hypot(relative_spread(source), INFINITE_SHARE)), f"ε ({source.label})",
                "n² from the structure", unit="1",
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
    check = "associated" if molecule.is_associated else "onsager"
    # What association makes of a moment is not foreseeable.
    estimate = None if molecule.is_associated else estimated(view)
    for source, eps, now, n, volume, members in _liquids(view):
        own = np.hypot(relative_spread(source), INFINITE_SHARE)
        for moment in view.points(MU):
            steep = sensitivity(moment.value, n, volume, now)
            unsure = _unsure(moment.value, moment_spread(moment), n, volume, now)
            yield Outcome(
                check, molecule.family, (moment.name, *members), eps,
                polarity.onsager_permittivity(view.value(moment), n, volume, now),
                float(np.hypot(own, unsure)), f"ε ({source.label})",
                f"from μ ({moment.label}), n and V", weight=steep, unit="1",
            )  # fmt: skip
        if estimate is not None:
            steep = sensitivity(estimate[0], n, volume, now)
            unsure = _unsure(*estimate, n, volume, now)
            yield Outcome(
                "estimated-onsager", molecule.family, members, eps,
                polarity.onsager_permittivity(estimate[0], n, volume, now),
                float(np.hypot(own, unsure)), f"ε ({source.label})",
                "from the estimated μ, n and V", weight=steep, unit="1",
            )  # fmt: skip


def _moment(view: View) -> Iterator[Outcome]:
    """ε from the moment that similar liquids have."""
    known = view.known
    if known.molecule.dipole_limit is not None or not known.foretold or known.group == RARE:
        return
    shift, scatter = view.facts.series.get("liquid_moment", (0.0, 0.0))
    check, group = "series-moment" if scatter else "moment", known.group
    if known.molecule.is_associated:
        check, group = "associated", f"{known.molecule.family}, {check}"
    mu = known.foretold["liquid_moment"] * float(np.exp(shift))
    for source, eps, now, n, volume, members in _liquids(view):
        steep = sensitivity(mu, n, volume, now)
        own = np.hypot(relative_spread(source), INFINITE_SHARE)
        yield Outcome(
            check, group, members, eps,
            polarity.onsager_permittivity(mu, n, volume, now),
            float(np.hypot(own, steep * scatter)), f"ε ({source.label})",
            "from the series" if scatter else "from similar structures", weight=steep, unit="1",
        )  # fmt: skip


def sensitivity(mu: float, n: ArrayLike, volume: ArrayLike, temperature: ArrayLike) -> float:
    """d ln ε/d ln μ [1] of the Onsager equation, at the middle of what is tried.

    ``mu`` [D], ``n`` [1], ``volume`` [cm3/mol], ``temperature`` [K].
    """
    low, high = _responses(np.array([0.95, 1.05]) * max(mu, 0.01), n, volume, temperature)
    return float(np.clip((high - low) / np.log(1.05 / 0.95), 0.02, 2.0))


def _responses(mu: Array, n: ArrayLike, volume: ArrayLike, temperature: ArrayLike) -> Array:
    """ln ε at several moments [D], at the middle of what is tried."""
    middle = [middle_of(x) for x in (n, volume, temperature)]
    return np.log(polarity.onsager_permittivity(mu, *middle))


def _unsure(
    mu: float, spread: float, n: ArrayLike, volume: ArrayLike, temperature: ArrayLike
) -> float:
    """What an uncertain moment [D] leaves open about ln ε: small ones grow fast."""
    here, above = _responses(np.array([mu, mu + spread]), n, volume, temperature)
    return float(above - here)


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


_PHYSICS: tuple[tuple[Callable[[View], Iterator[Outcome]], frozenset[str]], ...] = (
    (_refraction, frozenset({N, RHO, SMILES})),
    (_index, frozenset({N, SMILES})),
    (_volume, frozenset({RHO, SMILES})),
    (_index_square, frozenset({EPS, N, SMILES})),
    (_onsager, frozenset({EPS, RHO, MU, SMILES})),
    (_moment, frozenset({EPS, RHO, SMILES})),
    (_slope, frozenset({EPS, SMILES})),
)
