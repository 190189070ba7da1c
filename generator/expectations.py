"""The cross-checks of one substance: what one cell makes us expect of another.

Each check yields outcomes: a number found, the number expected from other cells, how far the two
may usually lie apart, and the cells that took part. Nothing is judged here; what is usual comes
from the data (``spreads``), and which cell is to blame from all outcomes together (``blame``).
"""

from __future__ import annotations

from collections.abc import Callable, Iterator
from dataclasses import dataclass
from itertools import combinations

import numpy as np
from numpy.typing import ArrayLike

from generator import polarity
from generator.facts import SMILES, TEMPERATURE, Array, Curve, Point, View
from generator.units import ZERO_CELSIUS

EPS, N, RHO, MU = "relative_permittivity", "refractive_index", "density", "dipole_moment"
TM, TB, TF = "melting_point", "boiling_point", "flash_point"
PRESSURE = "vapour_pressure"
ONE_ATMOSPHERE = 101.325  # kPa, exact
# A moment below this cannot be compared by ratio [D].
SMALL_MOMENT = 0.3
# Uncertainty of ε∞ = 1.05 n² taken as a share of ε (the 5 % are an assumption).
INFINITE_SHARE = 0.03
ROOM = 20.0 + ZERO_CELSIUS
# Density values are carried this far to meet an index or permittivity [K].
REACH = 60.0


@dataclass(frozen=True, slots=True)
class Check:
    """One kind of cross-check: its slug, what it compares, and whether by ratio or difference."""

    name: str
    title: str
    relative: bool
    unit: str


CHECKS = {
    check.name: check
    for check in (
        Check("refraction", "molar refraction from n and ρ against the structure", True, "cm3/mol"),
        Check("volume", "molar volume from ρ against the structure", True, "cm3/mol"),
        Check("index-square", "ε of an unpolar liquid against n²", True, "1"),
        Check("below-index-square", "ε below n²", True, "1"),
        Check("onsager", "ε against the Onsager equation from μ, n and V", True, "1"),
        Check("own-curve", "a point against its own curve", True, ""),
        Check("curves", "two curves of one quantity", True, ""),
        Check("sources", "two sources of one quantity", True, ""),
        Check("moments", "two published dipole moments", False, "D"),
        Check("symmetry", "dipole moment of a molecule that symmetry leaves none", False, "D"),
        Check("temperatures", "two sources of one temperature", False, "degC"),
    )
}


@dataclass(frozen=True, slots=True)
class Outcome:
    """One comparison. ``found`` and ``expected`` may be arrays; ``own`` is their own uncertainty.

    ``group`` is what the comparison's usual spread is learnt over; ``weight`` stretches that
    spread for this one comparison. ``members`` are the cells that took part.
    """

    check: str
    group: str
    members: tuple[str, ...]
    found: ArrayLike
    expected: ArrayLike
    own: float
    what_found: str
    what_expected: str
    weight: float = 1.0
    unit: str = ""

    @property
    def residual(self) -> Array:
        """ln(found/expected), or found − expected where the check goes by difference."""
        found, expected = np.asarray(self.found), np.asarray(self.expected)
        with np.errstate(all="ignore"):
            if CHECKS[self.check].relative:
                return np.log(found / expected)
            return np.asarray(found - expected, dtype=np.float64)


def outcomes(view: View) -> list[Outcome]:
    """Every comparison that the cells of a view allow."""
    return [outcome for check in _ALL for outcome in check(view)]


def _sources(view: View, key: str) -> list[Point | Curve]:
    return [*view.points(key), *view.curves(key)]


def _cells(*sources: Point | Curve) -> tuple[str, ...]:
    names: list[str] = []
    for source in sources:
        names.append(source.name)
        if isinstance(source, Point) and not np.isnan(source.temperature):
            names.append(source.name + TEMPERATURE)
    return tuple(names)


def _near(source: Point | Curve, temperature: float) -> bool:
    if isinstance(source, Curve):
        return source.holds(temperature, 5.0)
    return bool(abs(source.temperature - temperature) <= REACH)


def _relative(source: Point | Curve) -> float:
    return source.spread / abs(source.value) if isinstance(source, Point) and source.value else 0.0


def _refraction(view: View) -> Iterator[Outcome]:
    known = view.known
    for index in view.points(N):
        if not np.isfinite(index.temperature):
            continue
        for source in _sources(view, RHO):
            if not _near(source, index.temperature):
                continue
            at = view.temperature(index)
            n = view.value(index)
            volume = polarity.molar_volume(known.molecule.molar_mass, view.density(source, at))
            # d ln R/dn = 6n/((n²−1)(n²+2)), about 2 for organic liquids
            own = float(np.hypot(_relative(source), 2.0 * index.spread))
            yield Outcome(
                "refraction",
                known.molecule.family,
                (*_cells(index, source), SMILES),
                polarity.molar_refraction(n, volume),
                known.refraction,
                own,
                f"from n ({index.label}) and ρ ({source.label})",
                "from the structure",
                unit="cm3/mol",
            )


def _volume(view: View) -> Iterator[Outcome]:
    known = view.known
    if known.volume is None:
        return
    for source in _sources(view, RHO):
        at = ROOM
        if isinstance(source, Curve):
            at = float(np.clip(ROOM, source.row.t_min, source.row.t_max))
        here = view.density(source, at)
        expansion = np.exp(view.expansivity(at) * (at - ROOM))
        yield Outcome(
            "volume",
            known.molecule.family,
            (*_cells(source), SMILES),
            polarity.molar_volume(known.molecule.molar_mass, here),
            known.volume * expansion,
            _relative(source),
            f"from ρ ({source.label})",
            "from the structure",
            unit="cm3/mol",
        )


def _permittivities(view: View) -> Iterator[tuple[Point | Curve, ArrayLike, float, ArrayLike]]:
    """Every source of ε with its value, the temperature [K] it is compared at, as typed and now."""
    for point in view.points(EPS):
        if np.isfinite(point.temperature):
            yield point, view.value(point), point.temperature, view.temperature(point)
    for curve in view.curves(EPS):
        at = float(np.clip(ROOM, curve.row.t_min, curve.row.t_max))
        yield curve, view.curve(curve, at), at, at


def _index_square(view: View) -> Iterator[Outcome]:
    molecule = view.known.molecule
    unpolar = molecule.dipole_limit is not None
    for source, eps, at, now in _permittivities(view):
        for index in view.points(N):
            if not np.isfinite(index.temperature) or abs(index.temperature - at) > REACH:
                continue
            square = view.index(index, now) ** 2
            own = float(np.hypot(_relative(source), 2 * index.spread / index.value))
            if unpolar:
                group = "symmetric" if molecule.zero_dipole else "saturated"
                check, expected = "index-square", square
            else:
                group, check = "all", "below-index-square"
                expected = np.maximum(square, 0.0)
                eps = np.minimum(eps, expected)
            yield Outcome(
                check,
                group,
                (*_cells(source, index), SMILES),
                eps,
                expected,
                own,
                f"ε ({source.label})",
                f"n² ({index.label})",
                unit="1",
            )


def _onsager(view: View) -> Iterator[Outcome]:
    molecule = view.known.molecule
    densities = _sources(view, RHO)
    if molecule.dipole_limit is not None or not densities:
        return
    group = molecule.family if molecule.is_associated else f"aprotic {molecule.family}"
    for source, eps, at, now in _permittivities(view):
        near = [d for d in densities if _near(d, at)][:1]
        indices = [i for i in view.points(N) if abs(i.temperature - at) <= REACH][:1]
        for moment in view.points(MU):
            for density in near:
                for index in indices:
                    volume = polarity.molar_volume(molecule.molar_mass, view.density(density, now))
                    n = view.index(index, now)
                    mu = np.asarray(view.value(moment))
                    expected = polarity.onsager_permittivity(mu, n, volume, now)
                    slope = _sensitivity(moment.value, index.value, volume, at)
                    yield Outcome(
                        "onsager",
                        group,
                        (*_cells(source, moment, density, index), SMILES),
                        eps,
                        expected,
                        float(np.hypot(_relative(source), INFINITE_SHARE)),
                        f"ε ({source.label})",
                        f"from μ ({moment.label}), n and V",
                        weight=max(slope, 0.02),
                        unit="1",
                    )


def _sensitivity(mu: float, n: float, volume: ArrayLike, temperature: float) -> float:
    """d ln ε/d ln μ of the Onsager equation at the typed values."""
    middle = float(np.median(np.atleast_1d(volume)))
    if mu <= 0:
        return 0.0
    low, high = (
        float(polarity.onsager_permittivity(mu * f, n, middle, temperature)) for f in (0.95, 1.05)
    )
    with np.errstate(all="ignore"):
        slope = np.log(high / low) / np.log(1.05 / 0.95)
    return float(slope) if np.isfinite(slope) else 1.0


def _own_curve(view: View) -> Iterator[Outcome]:
    for key in (EPS, RHO):
        for point in view.points(key):
            for curve in view.curves(key):
                if not np.isfinite(point.temperature) or not curve.holds(point.temperature):
                    continue
                yield Outcome(
                    "own-curve",
                    key,
                    (*_cells(point), curve.name),
                    view.value(point),
                    view.curve(curve, view.temperature(point)),
                    _relative(point),
                    f"point ({point.label})",
                    curve.label,
                )


def _two_curves(view: View) -> Iterator[Outcome]:
    for key in (EPS, RHO):
        for one, other in combinations(view.curves(key), 2):
            low = max(one.row.t_min, other.row.t_min)
            high = min(one.row.t_max, other.row.t_max)
            if low > high:
                continue
            at = float(np.clip(ROOM, low, high))
            yield Outcome(
                "curves",
                key,
                (one.name, other.name),
                view.curve(one, at),
                view.curve(other, at),
                0.0,
                one.label,
                other.label,
            )


def _two_points(view: View) -> Iterator[Outcome]:
    for key in (EPS, RHO, N):
        for one, other in combinations(view.points(key), 2):
            if not abs(one.temperature - other.temperature) <= 5.0:
                continue
            yield Outcome(
                "sources",
                key,
                (*_cells(one), *_cells(other)),
                view.value(one),
                view.value(other),
                float(np.hypot(_relative(one), _relative(other))),
                one.label,
                other.label,
            )


def _moments(view: View) -> Iterator[Outcome]:
    points = view.points(MU)
    for one, other in combinations(points, 2):
        yield Outcome(
            "moments",
            "all",
            (one.name, other.name),
            view.value(one),
            view.value(other),
            float(np.hypot(one.spread, other.spread)),
            one.label,
            other.label,
            weight=max(1.0, 0.5 * min(one.value, other.value)),
            unit="D",
        )
    limit = view.known.molecule.dipole_limit
    if limit is not None:
        for point in points:
            yield Outcome(
                "symmetry",
                "all",
                (point.name, SMILES),
                np.maximum(view.value(point), limit),
                limit,
                point.spread,
                f"μ ({point.label})",
                "allowed by the structure",
                unit="D",
            )


def _temperatures(view: View) -> Iterator[Outcome]:
    for key in (TM, TB, TF):
        for one, other in combinations(view.points(key), 2):
            yield Outcome(
                "temperatures",
                key,
                (one.name, other.name),
                view.value(one),
                view.value(other),
                float(np.hypot(one.spread, other.spread)),
                one.label,
                other.label,
                unit="degC",
            )


_ALL: tuple[Callable[[View], Iterator[Outcome]], ...] = (
    _refraction,
    _volume,
    _index_square,
    _onsager,
    _own_curve,
    _two_curves,
    _two_points,
    _moments,
    _temperatures,
)
