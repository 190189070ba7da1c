"""The inputs of the metrics, chosen a substance at a time, each with where it came from."""

from __future__ import annotations

import math
from collections.abc import Iterable, Mapping, Sequence
from dataclasses import dataclass, replace

from generator import polarity, thermal
from generator.dataset import Dataset, Measurement, Source
from generator.quantities import MEASURED, QUANTITIES
from generator.reconcile import (
    CARRIED,
    EDGE,
    LOWER_BOUND,
    OUTSIDE_LIQUID_RANGE,
    LiquidRange,
    Value,
    choose,
    choose_constant,
    curve_slope,
    curve_uncertainty,
    curve_values,
    liquid_range,
    point_uncertainty,
    rank_curves,
    within,
)
from generator.structures import Molecule

STRUCTURE = "structure"
# The source behind what follows from the molecular structure alone.
STRUCTURE_SOURCE = Source(
    STRUCTURE,
    "calculated",
    "Worked out from the structure: IUPAC standard atomic weights (Prohaska et al., Pure Appl. "
    "Chem. 94, 573, 2022); a dipole moment of zero follows from symmetry.",
    2022,
    "10.1515/pac-2019-0603",
    0,
)

# A moment below this is no moment that the permittivity could show (alkanes, [D]).
NO_MOMENT = 0.1
# A slope needs temperatures this far apart [K].
SHORTEST_SPAN = 4.0
# Share of a temperature shift of n that constant molar refraction gets wrong.
_REFRACTION_SHARE = 0.1

TIMED = tuple(k for k in MEASURED if QUANTITIES[k].needs_temperature)
CONSTANT = tuple(k for k in MEASURED if not QUANTITIES[k].needs_temperature)
# What the metrics are made of, in the order of their sampling index.
INPUTS = (
    "relative_permittivity",
    "refractive_index",
    "density",
    "dipole_moment",
    "conductivity",
    "thermal_expansivity",
    "molar_mass",
)
_EPS, _N, _RHO, _MU, _KAPPA, _ALPHA, _M = INPUTS


@dataclass(frozen=True, slots=True)
class Trend:
    """Observed slope dε/dT [1/K] with its sign: falls, rises, no trend, not known."""

    value: float
    uncertainty: float
    sign: str
    temperature: float | None
    basis: str
    sources: tuple[str, ...]


_UNKNOWN_TREND = Trend(math.nan, math.nan, "not known", None, "measured", ())


@dataclass(frozen=True)
class Row:
    """Everything chosen for one substance, before the metrics are worked out."""

    reference: float
    liquid: LiquidRange
    temperatures: tuple[float, ...]
    chosen: Mapping[str, tuple[Value | None, ...]]
    constants: Mapping[str, Value]
    slopes: tuple[Trend, ...]


def choose_inputs(
    dataset: Dataset,
    slug: str,
    structure: Molecule,
    reference: float,
    listed: tuple[float, ...],
) -> Row:
    """Every input of one substance at ``listed`` [K] and at its own reference temperature."""
    liquid = liquid_range(dataset, slug)
    own = _own_reference(dataset, slug, reference, listed, liquid)
    temperatures = (*listed, own)
    constants = _constants(dataset, slug, structure)
    chosen = {key: list(choose(dataset, slug, key, temperatures, liquid)) for key in TIMED}
    if not liquid.holds(own):
        _fill_outside(dataset, slug, chosen, own)
    chosen[_N] = _refractive_index(dataset, slug, constants[_M], chosen, temperatures, liquid)
    chosen[_ALPHA] = [_expansivity(dataset, slug, v) for v in chosen[_RHO]]
    fixed = {key: tuple(values) for key, values in chosen.items()}
    slopes = tuple(
        _trend(dataset, slug, v, t) for v, t in zip(fixed[_EPS], temperatures, strict=True)
    )
    return Row(own, liquid, temperatures, fixed, constants, slopes)


def _own_reference(
    dataset: Dataset,
    slug: str,
    reference: float,
    listed: Sequence[float],
    liquid: LiquidRange,
) -> float:
    points = [
        p.temperature for p in dataset.measurements_of(slug, _EPS) if p.temperature is not None
    ]
    curves = dataset.correlations_of(slug, _EPS)
    ends = [t for c in curves for t in (c.t_min, c.t_max)]
    candidates = sorted([reference, *listed, *points, *ends], key=lambda t: abs(t - reference))
    for temperature in candidates:
        if choose(dataset, slug, _EPS, [temperature], liquid)[0] is not None:
            return temperature
    return min(points, key=lambda t: abs(t - reference), default=reference)


def _fill_outside(
    dataset: Dataset, slug: str, chosen: Mapping[str, list[Value | None]], own: float
) -> None:
    """A substance measured only where it is not liquid at 1 atm: those values, marked."""
    anywhere = LiquidRange(None, None)
    for key, values in chosen.items():
        value = choose(dataset, slug, key, [own], anywhere)[0]
        if value is not None:
            values[-1] = replace(value, marks=(*value.marks, OUTSIDE_LIQUID_RANGE))


def _constants(dataset: Dataset, slug: str, structure: Molecule) -> dict[str, Value]:
    constants = {
        key: value
        for key in CONSTANT
        if (value := choose_constant(dataset, slug, key)) is not None
    }
    mass = structure.molar_mass
    # Standard atomic weights carry about five digits.
    constants[_M] = Value(_M, mass, 2e-5 * mass, None, "computed", (STRUCTURE,))
    moment = constants.get(_MU)
    if structure.zero_dipole and (moment is None or moment.basis == "estimated"):
        constants[_MU] = Value(_MU, 0.0, 0.0, None, "computed", (STRUCTURE,))
    return constants


def _refractive_index(
    dataset: Dataset,
    slug: str,
    mass: Value,
    chosen: Mapping[str, list[Value | None]],
    temperatures: Sequence[float],
    liquid: LiquidRange,
) -> list[Value | None]:
    """n at each temperature: measured there, else by constant refraction from where it was."""
    result = list(chosen[_N])
    points = [p for p in dataset.measurements_of(slug, _N) if p.temperature is not None]
    if not points:
        return result
    for k, temperature in enumerate(temperatures):
        value, density = result[k], chosen[_RHO][k]
        if density is None or (value is not None and CARRIED not in value.marks):
            continue
        nearest = min(points, key=lambda p: abs((p.temperature or 0.0) - temperature))
        start = nearest.temperature or 0.0
        anchor = choose(dataset, slug, _N, [start], LiquidRange(None, None))[0]
        known = choose(dataset, slug, _RHO, [start], liquid)[0]
        if anchor is None or known is None:
            continue
        refraction = polarity.molar_refraction(anchor.value, mass.value / known.value)
        n = float(
            polarity.refractive_index_from_refraction(refraction, mass.value / density.value)
        )
        spread = math.hypot(anchor.uncertainty, _REFRACTION_SHARE * (n - anchor.value))
        inputs = (anchor, known, density)
        result[k] = Value(
            _N,
            n,
            spread,
            temperature,
            "computed",
            union(v.sources for v in inputs),
            union(v.marks for v in inputs),
        )
    return result


def _expansivity(dataset: Dataset, slug: str, density: Value | None) -> Value | None:
    """Thermal expansivity at the temperature of a density, from a curve or from points."""
    if density is None or density.temperature is None:
        return None
    temperature = density.temperature
    for curve in rank_curves(dataset, slug, _RHO):
        if within(curve, temperature):
            slope = curve_slope(curve, temperature, _RHO)
            (rho,) = curve_values(curve, [temperature], _RHO)
            # Density curves of one liquid differ by some 3 % in slope.
            return _alpha(-slope / rho, 0.03 * abs(slope / rho), temperature, (curve.source,))
    points = [p for p in dataset.measurements_of(slug, _RHO) if p.temperature is not None]
    line = _line(points, temperature)
    if line is None:
        return None
    sources = tuple(dict.fromkeys(p.source for p in points))
    return _alpha(
        -line.slope / density.value, line.slope_uncertainty / density.value, temperature, sources
    )


def _alpha(value: float, spread: float, temperature: float, sources: tuple[str, ...]) -> Value:
    return Value(_ALPHA, value, spread, temperature, "computed", sources, (LOWER_BOUND,))


def _line(points: Sequence[Measurement], temperature: float) -> thermal.LineFit | None:
    """A straight line through points whose temperatures reach around ``temperature`` [K]."""
    timed = [p for p in points if p.temperature is not None]
    at = [p.temperature for p in timed if p.temperature is not None]
    if not at or max(at) - min(at) < SHORTEST_SPAN:
        return None
    if not min(at) - EDGE <= temperature <= max(at) + EDGE:
        return None
    return thermal.fit_line(at, [p.value for p in timed], [point_uncertainty(p) for p in timed])


def _trend(dataset: Dataset, slug: str, value: Value | None, temperature: float) -> Trend:
    """Slope of ε at ``temperature`` [K], where there is an ε to have a slope."""
    if value is None:
        return _UNKNOWN_TREND
    for curve in rank_curves(dataset, slug, _EPS):
        width = curve.t_max - curve.t_min
        if within(curve, temperature) and width >= SHORTEST_SPAN:
            slope = curve_slope(curve, temperature, _EPS)
            # The slope of a straight line through evenly spread points of uncertainty u.
            spread = math.sqrt(12) * curve_uncertainty(dataset, curve)[0] / width
            sign = thermal.sign_of(slope, spread)
            return Trend(slope, spread, sign, temperature, "curve", (curve.source,))
    points = dataset.measurements_of(slug, _EPS)
    line = _line(points, temperature)
    if line is None:
        return _UNKNOWN_TREND
    sources = tuple(dict.fromkeys(p.source for p in points))
    sign = thermal.sign_of(line.slope, line.slope_uncertainty)
    return Trend(line.slope, line.slope_uncertainty, sign, temperature, "measured", sources)


def has_no_moment(row: Row) -> bool:
    """Whether the gas-phase moment is zero within its uncertainty, or too small to show."""
    moment = row.constants.get(_MU)
    return moment is not None and moment.value <= max(NO_MOMENT, 2 * moment.uncertainty)


def union(groups: Iterable[Iterable[str]]) -> tuple[str, ...]:
    """The distinct items of all groups, in order of appearance."""
    return tuple(dict.fromkeys(item for group in groups for item in group))


