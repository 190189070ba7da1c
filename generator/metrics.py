"""Every derived number, for all substances and temperatures at once.

Inputs are chosen a substance at a time (``reconcile``); the metrics are then worked out on arrays
of shape (substances, temperatures), and their uncertainties by sampling the inputs, which the
metrics share, so that correlated inputs stay correlated.
"""

from __future__ import annotations

import math
from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field
from functools import cached_property

import numpy as np
from numpy.typing import NDArray

from generator import polarity, uncertainty
from generator.cache import Cache
from generator.dataset import Dataset, Source
from generator.inputs import (
    INPUTS,
    STRUCTURE,
    STRUCTURE_SOURCE,
    Row,
    choose_inputs,
    has_no_moment,
    union,
)
from generator.kept import NOTHING, Kept
from generator.quantities import QUANTITIES
from generator.structures import Molecule, molecules
from generator.trends import Trend
from generator.units import ZERO_CELSIUS
from generator.values import ASSOCIATED, LiquidRange, Value

Array = NDArray[np.float64]

# Orientation polarizability above which a liquid counts as polar, and below which as unpolar.
POLAR_ABOVE = 0.10
UNPOLAR_BELOW = 0.03
# Without a refractive index the permittivity alone decides only where it leaves no doubt.
SURELY_POLAR = 5.0
_CHUNK = 50
_EPS, _N, _RHO, _MU, _KAPPA, _ALPHA, _M = INPUTS
DEPENDS: Mapping[str, tuple[str, ...]] = {
    "kirkwood_function": (_EPS,),
    "clausius_mossotti_function": (_EPS,),
    "molar_volume": (_M, _RHO),
    "molar_polarization": (_EPS, _M, _RHO),
    "molar_refraction": (_N, _M, _RHO),
    "orientation_polarization": (_EPS, _N, _M, _RHO),
    "debye_dipole_moment": (_EPS, _N, _M, _RHO),
    "onsager_dipole_moment": (_EPS, _N, _M, _RHO),
    "kirkwood_correlation_factor": (_EPS, _N, _M, _RHO, _MU),
    "lippert_mataga_polarizability": (_EPS, _N),
    "expected_temperature_coefficient": (_EPS, _N, _ALPHA),
    "bjerrum_length": (_EPS,),
    "born_solvation_energy": (_EPS,),
    "debye_length_01": (_EPS,),
    "debye_length_001": (_EPS,),
    "charge_relaxation_time": (_EPS, _KAPPA),
}
# Arrays that a substance's results are made of: values, spreads and what each input moves.
_ARRAYS = sum(2 + len(inputs) for inputs in DEPENDS.values())

# What an estimated permittivity only gives back as it went in.
_MEASURED_ONLY = (
    "debye_dipole_moment",
    "onsager_dipole_moment",
    "kirkwood_correlation_factor",
)


@dataclass(frozen=True)
class Settings:
    """What a laboratory sets: temperatures [°C], its name and its paper."""

    laboratory: str = "Solvent handbook"
    reference_temperature_c: float = 25.0
    temperatures_c: tuple[float, ...] = (0.0, 10.0, 20.0, 25.0, 30.0, 40.0, 50.0, 60.0, 80.0)
    paper: str = "A4"


@dataclass(frozen=True, slots=True)
class Result:
    """One metric for all substances: arrays of shape (substances, temperatures + 1).

    ``moves``: what one standard uncertainty of an input moves the value by, for each input.
    """

    values: Array
    spreads: Array
    moves: Mapping[str, Array]


@dataclass(frozen=True, slots=True)
class Share:
    """An input of a derived number and its share of the variance, 0 to 1."""

    value: Value
    share: float


@dataclass(frozen=True)
class Handbook:
    """Every number of the handbook, measured and derived alike.

    ``reference`` and ``temperatures`` are in kelvin. In ``_results`` the last column is each
    substance's own reference. ``kept`` is where else results of one substance may be kept.
    """

    dataset: Dataset
    settings: Settings
    molecules: Mapping[str, Molecule]
    reference: float
    temperatures: tuple[float, ...]
    _rows: Mapping[str, Row]
    _results: Mapping[str, Result]
    _index: Mapping[str, int] = field(repr=False)
    kept: Kept = field(default=NOTHING, repr=False)

    @cached_property
    def sources(self) -> Mapping[str, Source]:
        """Every source a number may name: those of the tables, and the structure itself."""
        return {STRUCTURE: STRUCTURE_SOURCE, **self.dataset.sources}

    def own_reference(self, solvent: str) -> float:
        """The reference temperature [K], or the nearest usable one where it is not liquid."""
        return self._rows[solvent].reference

    def liquid_range(self, solvent: str) -> LiquidRange:
        """Melting and boiling point [K] of a substance."""
        return self._rows[solvent].liquid

    def at(self, solvent: str, key: str, temperature: float | None = None) -> Value | None:
        """One number at a listed temperature [K], or at the substance's own reference."""
        row = self._rows[solvent]
        if key in row.constants:
            return row.constants[key]
        if temperature is None:
            return self._cell(solvent, key, len(self.temperatures))
        return self._cell(solvent, key, self.temperatures.index(temperature))

    def series(self, solvent: str, key: str) -> tuple[Value | None, ...]:
        """One quantity over the listed temperatures."""
        constant = self._rows[solvent].constants.get(key)
        if constant is not None:
            return tuple(constant for _ in self.temperatures)
        return tuple(self._cell(solvent, key, k) for k in range(len(self.temperatures)))

    def budget(self, solvent: str, key: str, temperature: float | None = None) -> tuple[Share, ...]:
        """What a derived number is made of, with the share of each input in its variance.

        ``temperature`` [K] is a listed one, or None for the own reference. Empty for a number
        that is not derived. Shares follow from what one standard uncertainty of each input
        moves the result by (JCGM 100:2008, 5.1.3).
        """
        if key not in self._results or self.at(solvent, key, temperature) is None:
            return ()
        own = temperature is None
        column = len(self.temperatures) if own else self.temperatures.index(temperature)
        index, moves = self._index[solvent], self._results[key].moves
        inputs = self._inputs(solvent, key, column)
        variances = [float(moves[v.quantity][index, column]) ** 2 for v in inputs]
        total = math.fsum(variances)
        return tuple(
            Share(v, variance / total if total > 0 else 0.0)
            for v, variance in zip(inputs, variances, strict=True)
        )

    def shares(self, solvent: str, key: str) -> Mapping[str, Array]:
        """Share of each input in the variance of a derived number, at the listed temperatures.

        Arrays of shape (temperatures,), 0 to 1; NaN where there is no number.
        """
        result, index = self._results[key], self._index[solvent]
        row, count = self._rows[solvent], len(self.temperatures)
        there = np.isfinite(result.values[index, :count])
        used = (_EPS, _ALPHA) if self._without_index(row, key) else DEPENDS[key]
        variances = {k: result.moves[k][index, :count] ** 2 for k in used}
        total = np.sum(list(variances.values()), axis=0)
        with np.errstate(all="ignore"):
            return {
                k: np.where(there & (total > 0), v / total, np.nan) for k, v in variances.items()
            }

    def trend(self, solvent: str) -> Trend:
        """Observed slope of the permittivity at the substance's own reference."""
        return self._rows[solvent].slopes[-1]

    def expected_trend(self, solvent: str) -> Value | None:
        """Slope that expansion and thermal agitation alone would give, at its own reference."""
        return self.at(solvent, "expected_temperature_coefficient")

    def is_polar(self, solvent: str) -> str:
        """``polar``, ``borderline``, ``unpolar`` or ``not known``, by the orientation part."""
        orientation = self.at(solvent, "lippert_mataga_polarizability")
        if orientation is not None:
            if orientation.value >= POLAR_ABOVE:
                return "polar"
            return "unpolar" if orientation.value <= UNPOLAR_BELOW else "borderline"
        permittivity = self.at(solvent, _EPS)
        if permittivity is not None and permittivity.value >= SURELY_POLAR:
            return "polar"
        return "not known"

    def _cell(self, solvent: str, key: str, column: int) -> Value | None:
        row = self._rows[solvent]
        if key in row.chosen:
            return row.chosen[key][column]
        if key == "temperature_coefficient":
            own = column == len(self.temperatures)
            return _trend_value(row.slopes[column], None if own else row.temperatures[column])
        if key not in self._results:
            return None
        result, index = self._results[key], self._index[solvent]
        value, spread = float(result.values[index, column]), float(result.spreads[index, column])
        if not (math.isfinite(value) and math.isfinite(spread)):
            return None
        known = self._inputs(solvent, key, column)
        if key in _MEASURED_ONLY and any(
            v.quantity == _EPS and v.basis == "estimated" for v in known
        ):
            return None
        marks = list(union(v.marks for v in known))
        if key == "debye_dipole_moment" and self.molecules[solvent].is_associated:
            marks.append(ASSOCIATED)
        basis = "estimated" if any(v.basis == "estimated" for v in known) else "computed"
        return Value(
            key,
            value,
            spread,
            row.temperatures[column],
            basis,
            union(v.sources for v in known),
            tuple(marks),
        )

    @staticmethod
    def _without_index(row: Row, key: str) -> bool:
        return key == "expected_temperature_coefficient" and has_no_moment(row)

    def _inputs(self, solvent: str, key: str, column: int) -> list[Value]:
        """The inputs a number was made from; the slope of unpolar liquids does without n."""
        row = self._rows[solvent]
        used = (_EPS, _ALPHA) if self._without_index(row, key) else DEPENDS[key]
        inputs = (row.constants.get(k) or row.chosen[k][column] for k in used)
        return [v for v in inputs if v is not None]


def compute(
    dataset: Dataset, settings: Settings, cache: Cache | None = None, kept: Kept = NOTHING
) -> Handbook:
    """Choose every input and work out every metric. Structures must be readable (see checks).

    ``cache`` keeps what follows from structures, ``kept`` what follows from each substance's rows.
    """
    cache = cache or Cache(None)
    reference = settings.reference_temperature_c + ZERO_CELSIUS
    temperatures = tuple(t + ZERO_CELSIUS for t in settings.temperatures_c)
    slugs = tuple(dataset.solvents)
    known = molecules([solvent.smiles for solvent in dataset.solvents.values()], cache)
    structures = {slug: known[solvent.smiles] for slug, solvent in dataset.solvents.items()}

    def choose(share: Sequence[str]) -> list[Row]:
        return [
            choose_inputs(dataset, slug, structures[slug], reference, temperatures, cache)
            for slug in share
        ]

    rows = kept.each(slugs, "row", choose)
    numbers = kept.each(slugs, "numbers", lambda share: _numbers([rows[slug] for slug in share]))
    shape = (len(slugs), _ARRAYS, len(temperatures) + 1)
    results = _results(np.array([numbers[slug] for slug in slugs]).reshape(shape))
    index = {slug: i for i, slug in enumerate(slugs)}
    return Handbook(
        dataset, settings, structures, reference, temperatures, rows, results, index, kept
    )


def _trend_value(trend: Trend, temperature: float | None) -> Value | None:
    """The slope as a number; None where it is not known at ``temperature`` [K] itself."""
    if trend.temperature is None or temperature not in (None, trend.temperature):
        return None
    return Value(
        "temperature_coefficient",
        trend.value,
        trend.uncertainty,
        trend.temperature,
        "computed",
        trend.sources,
    )


def _numbers(rows: Sequence[Row]) -> list[Array]:
    """Every metric for some substances: for each, all arrays of its results one under another."""
    numbers: list[Array] = []
    for start in range(0, len(rows), _CHUNK):
        results = _work_out(rows[start : start + _CHUNK])
        arrays = [a for r in results.values() for a in (r.values, r.spreads, *r.moves.values())]
        numbers += list(np.stack(arrays, axis=1))
    return numbers


def _results(numbers: Array) -> dict[str, Result]:
    """The results of all substances from an array (substances, arrays of results, temperatures)."""
    arrays = iter(np.moveaxis(numbers, 1, 0))
    return {
        key: Result(next(arrays), next(arrays), {used: next(arrays) for used in DEPENDS[key]})
        for key in DEPENDS
    }


def _work_out(rows: Sequence[Row]) -> dict[str, Result]:
    """Every metric for some substances."""
    temperature = np.array([row.temperatures for row in rows])
    bare = np.array([[has_no_moment(row)] for row in rows])
    centre, spread = {}, {}
    for key in INPUTS:
        cells = [row.chosen.get(key) or (row.constants.get(key),) for row in rows]
        centre[key] = np.array([[v.value if v else np.nan for v in cell] for cell in cells])
        spread[key] = np.array([[v.uncertainty if v else np.nan for v in cell] for cell in cells])
    samples = {
        key: uncertainty.draw(centre[key], spread[key], index, *_bounds(key))
        for index, key in enumerate(INPUTS)
    }
    values = _metrics(centre, temperature, bare)
    sampled = _metrics(samples, temperature[..., np.newaxis], bare[..., np.newaxis])
    moved = {key: _moved(centre, spread, key, temperature, bare) for key in INPUTS}
    return {
        key: Result(
            values[key],
            uncertainty.spread(sampled[key]),
            {used: moved[used][key] for used in DEPENDS[key]},
        )
        for key in DEPENDS
    }


def _moved(
    centre: Mapping[str, Array],
    spread: Mapping[str, Array],
    key: str,
    temperature: Array,
    bare: NDArray[np.bool_],
) -> dict[str, Array]:
    """Half of what each metric changes by when one input goes from −u to +u, inside its bounds."""
    up, down = (
        _metrics(
            {**centre, key: np.clip(centre[key] + side * spread[key], *_bounds(key))},
            temperature,
            bare,
        )
        for side in (1.0, -1.0)
    )
    return {name: np.nan_to_num(np.abs(up[name] - down[name]) / 2) for name in DEPENDS}


def _bounds(key: str) -> tuple[float, float]:
    quantity = QUANTITIES[key]
    return quantity.low, quantity.high


def _metrics(x: Mapping[str, Array], t: Array, no_moment: NDArray[np.bool_]) -> dict[str, Array]:
    """The metrics of DESIGN's table from arrays of inputs; the one place that wires them."""
    eps, n, mu = x[_EPS], x[_N], x[_MU]
    volume = polarity.molar_volume(x[_M], x[_RHO])
    total = polarity.molar_polarization(eps, volume)
    refraction = polarity.molar_refraction(n, volume)
    orientation = polarity.orientation_polarization(total, refraction)
    onsager = polarity.onsager_dipole_moment(eps, n, volume, t)
    g = polarity.kirkwood_correlation_factor(onsager, mu)
    dipolar_slope = polarity.expected_temperature_coefficient(eps, n, x[_ALPHA], t)
    unpolar_slope = polarity.clausius_mossotti_slope(eps, x[_ALPHA])
    return {
        "kirkwood_function": polarity.kirkwood_function(eps),
        "clausius_mossotti_function": polarity.clausius_mossotti_function(eps),
        "molar_volume": volume,
        "molar_polarization": total,
        "molar_refraction": refraction,
        "orientation_polarization": orientation,
        "debye_dipole_moment": polarity.debye_dipole_moment(orientation, t),
        "onsager_dipole_moment": onsager,
        "kirkwood_correlation_factor": np.where(no_moment, np.nan, g),
        "lippert_mataga_polarizability": polarity.lippert_mataga_polarizability(eps, n),
        "expected_temperature_coefficient": np.where(no_moment, unpolar_slope, dipolar_slope),
        "bjerrum_length": polarity.bjerrum_length(eps, t),
        "born_solvation_energy": polarity.born_solvation_energy(eps),
        "debye_length_01": polarity.debye_length(eps, t, 0.1),
        "debye_length_001": polarity.debye_length(eps, t, 0.01),
        "charge_relaxation_time": polarity.charge_relaxation_time(eps, x[_KAPPA]),
    }
