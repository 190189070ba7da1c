"""The inputs of the metrics, chosen a substance at a time, each with where it came from."""

from __future__ import annotations

import math
from collections.abc import Iterable, Mapping, Sequence
from dataclasses import dataclass, replace

from generator import estimates, polarity
from generator.cache import Cache
from generator.curves import (
    curve_slope,
    curve_values,
    line_through,
    rank_curves,
    within,
)
from generator.dataset import Dataset, Source
from generator.quantities import MEASURED, QUANTITIES
from generator.reconcile import choose, choose_constant, liquid_range
from generator.structures import Molecule
from generator.trends import Trend, trend_at
from generator.values import CARRIED, ESTIMATED, OUTSIDE_LIQUID_RANGE, LiquidRange, Value

STRUCTURE = "structure"
# The source behind what follows from the molecular structure alone.
STRUCTURE_SOURCE = Source(
    STRUCTURE,
    "calculated",
    "Worked out from the structure: IUPAC standard atomic weights (Prohaska et al., Pure Appl. "
    "Chem. 94, 573, 2022); a dipole moment of zero follows from symmetry, an estimated one from "
    "bond increments calibrated on measured moments (see the methods page).",
    2022,
    "10.1515/pac-2019-0603",
    0,
)

# A moment below this is no moment that the permittivity could show (alkanes, [D]).
NO_MOMENT = 0.1
# Density curves of one liquid differ by some 3 % in slope; one worked out from a single density
# by 5 %, by far more where hydrogen bonds change the shape.
_CURVE_EXPANSION_SPREAD = 0.03
_ONE_POINT_EXPANSION_SPREAD = {False: 0.05, True: 0.25}
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
    cache: Cache,
) -> Row:
    """Every input of one substance at ``listed`` [K] and at its own reference temperature.

    ``cache`` keeps what is estimated from the structure.
    """
    liquid = liquid_range(dataset, slug)
    own = _own_reference(dataset, slug, reference, listed, liquid)
    temperatures = (*listed, own)
    constants = _constants(dataset, slug, structure, cache)
    chosen = {key: list(choose(dataset, slug, key, temperatures, liquid)) for key in TIMED}
    if not liquid.holds(own):
        _fill_outside(dataset, slug, chosen, own)
    chosen[_N] = _refractive_index(dataset, slug, constants[_M], chosen, temperatures, liquid)
    chosen[_ALPHA] = [
        _expansivity(dataset, slug, v, liquid, associated=structure.is_associated)
        for v in chosen[_RHO]
    ]
    if not dataset.measurements_of(slug, _EPS) and not dataset.correlations_of(slug, _EPS):
        chosen[_EPS] = [
            _estimated_permittivity(structure, constants, n, rho)
            for n, rho in zip(chosen[_N], chosen[_RHO], strict=True)
        ]
    fixed = {key: tuple(values) for key, values in chosen.items()}
    slopes = tuple(
        trend_at(dataset, slug, v, t, structure.association)
        for v, t in zip(fixed[_EPS], temperatures, strict=True)
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


def _constants(dataset: Dataset, slug: str, structure: Molecule, cache: Cache) -> dict[str, Value]:
    constants = {
        key: value for key in CONSTANT if (value := choose_constant(dataset, slug, key)) is not None
    }
    mass = structure.molar_mass
    # Standard atomic weights carry about five digits.
    constants[_M] = Value(_M, mass, 2e-5 * mass, None, "computed", (STRUCTURE,))
    if structure.zero_dipole:
        constants[_MU] = _no_moment(constants.get(_MU))
    elif _MU not in constants:
        estimate = estimates.dipole_moment(structure, cache)
        if estimate is not None:
            constants[_MU] = Value(_MU, *estimate, None, "estimated", (STRUCTURE,), (ESTIMATED,))
    return constants


def _estimated_permittivity(
    structure: Molecule, constants: Mapping[str, Value], index: Value | None, density: Value | None
) -> Value | None:
    """ε where no source has any, from what else is known."""
    moment = constants.get(_MU)
    if moment is None or index is None or density is None or density.temperature is None:
        return None
    estimate = estimates.permittivity(
        structure,
        (moment.value, moment.uncertainty),
        (index.value, index.uncertainty),
        constants[_M].value / density.value,
        density.temperature,
    )
    if estimate is None:
        return None
    sources = union(v.sources for v in (moment, index, density))
    return Value(_EPS, *estimate, density.temperature, "estimated", sources, (ESTIMATED,))


def _no_moment(measured: Value | None) -> Value:
    """Zero by symmetry, which is exact; sources that say the same are named beside it."""
    agreeing = measured is not None and measured.value <= NO_MOMENT
    sources = (STRUCTURE, *measured.sources) if agreeing and measured is not None else (STRUCTURE,)
    return Value(_MU, 0.0, 0.0, None, "computed", sources)


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
    if not any(p.temperature is not None for p in dataset.measurements_of(slug, _N)):
        return result
    for k, temperature in enumerate(temperatures):
        value, density = result[k], chosen[_RHO][k]
        if density is None or (value is not None and CARRIED not in value.marks):
            continue
        start = anchor_temperature(dataset, slug, temperature)
        anchor = choose(dataset, slug, _N, [start], LiquidRange(None, None))[0]
        known = choose(dataset, slug, _RHO, [start], liquid)[0]
        if anchor is None or known is None:
            continue
        refraction = polarity.molar_refraction(anchor.value, mass.value / known.value)
        n = float(polarity.refractive_index_from_refraction(refraction, mass.value / density.value))
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


def anchor_temperature(dataset: Dataset, slug: str, temperature: float) -> float:
    """Temperature [K] nearest to ``temperature`` [K] at which a refractive index is published."""
    points = dataset.measurements_of(slug, _N)
    known = [p.temperature for p in points if p.temperature is not None]
    return min(known, key=lambda t: abs(t - temperature))


def _expansivity(
    dataset: Dataset, slug: str, density: Value | None, liquid: LiquidRange, *, associated: bool
) -> Value | None:
    """Thermal expansivity at the temperature of a density: curve, points, or an estimate."""
    if density is None or density.temperature is None:
        return None
    temperature = density.temperature
    for curve in rank_curves(dataset, slug, _RHO):
        if within(curve, temperature):
            (rho,) = curve_values(curve, [temperature], _RHO)
            alpha = -curve_slope(curve, temperature, _RHO) / rho
            one_point = dataset.sources[curve.source].kind == "calculated"
            share = (
                _ONE_POINT_EXPANSION_SPREAD[associated] if one_point else _CURVE_EXPANSION_SPREAD
            )
            spread = share * abs(alpha)
            return Value(_ALPHA, alpha, spread, temperature, "computed", (curve.source,))
    points = [p for p in dataset.measurements_of(slug, _RHO) if p.temperature is not None]
    line = line_through(dataset, points, temperature)
    if line is not None:
        alpha, spread = -line.slope / density.value, line.slope_uncertainty / density.value
        sources = tuple(dict.fromkeys(p.source for p in points))
        return Value(_ALPHA, alpha, spread, temperature, "computed", sources)
    boiling = choose_constant(dataset, slug, "boiling_point")
    if liquid.high is None or boiling is None:
        return None
    alpha = estimates.expansivity(liquid.high, temperature)
    spread = estimates.EXPANSION_SPREAD * alpha
    return Value(_ALPHA, alpha, spread, temperature, "estimated", boiling.sources, (ESTIMATED,))


def has_no_moment(row: Row) -> bool:
    """Whether the gas-phase moment is zero within its uncertainty, or too small to show."""
    moment = row.constants.get(_MU)
    return moment is not None and moment.value <= max(NO_MOMENT, 2 * moment.uncertainty)


def union(groups: Iterable[Iterable[str]]) -> tuple[str, ...]:
    """The distinct items of all groups, in order of appearance."""
    return tuple(dict.fromkeys(item for group in groups for item in group))
