"""What the tables say about one substance, as cells that can be doubted one at a time.

A cross-check reads its numbers through a ``View``. A view may hold another value for a cell, or
many values at once as an array, so that the same check also answers "what if this cell were
different?" without being written twice.
"""

from __future__ import annotations

import math
from collections.abc import Iterable, Mapping, Sequence
from dataclasses import dataclass, field
from statistics import median

import numpy as np
from numpy.typing import ArrayLike, NDArray

from generator import thermal
from generator.dataset import Correlation, Dataset, Measurement, Source
from generator.identity import CAS, SMILES, Identity, Print
from generator.increments import foretold, is_rare
from generator.quantities import QUANTITIES
from generator.structures import Molecule, additive_refraction
from generator.units import ZERO_CELSIUS, convert

Array = NDArray[np.float64]

# Usual thermal expansivity of a liquid at room temperature [1/K], where no density curve says more.
USUAL_EXPANSIVITY = 0.0011
USUAL_EXPANSIVITY_ASSOCIATED = 0.0008
TEMPERATURE = "@"
# Group of the molecules that too few liquids are like.
RARE = "rare"


@dataclass(frozen=True, slots=True)
class Point:
    """One measured value; ``name`` is the cell of its value, ``name + "@"`` of its temperature.

    ``repeats``: how many other liquids, of unrelated families, have its figure in the same source.
    """

    name: str
    value: float
    temperature: float
    spread: float
    row: Measurement
    calculated: bool = False
    repeats: int = 0

    @property
    def label(self) -> str:
        """The source, as evidence names it."""
        return self.row.source

    def holds(self, temperature: float, reach: float = 0.6) -> bool:
        """Whether the point was measured within ``reach`` of ``temperature`` [K]."""
        return abs(self.temperature - temperature) <= reach


@dataclass(frozen=True, slots=True)
class Curve:
    """One temperature curve; ``name`` is the cell of its coefficients.

    ``calculated``: worked out from a point of the same quantity, which it only repeats.
    """

    name: str
    row: Correlation
    calculated: bool = False

    @property
    def label(self) -> str:
        """The source, as evidence names it."""
        return f"{self.row.source} curve"

    def holds(self, temperature: float, reach: float = 0.6) -> bool:
        """Whether the curve is stated for ``temperature`` [K]."""
        return self.row.t_min - reach <= temperature <= self.row.t_max + reach

    def at(self, temperature: ArrayLike) -> Array:
        """The curve [the quantity's unit]; units are scaled, no offset is known for a curve."""
        raw = thermal.evaluate(self.row.form, self.row.coefficients, temperature)
        unit = QUANTITIES[self.row.quantity].unit
        scale = convert(1.0, self.row.unit, unit) - convert(0.0, self.row.unit, unit)
        return np.asarray(raw * scale, dtype=np.float64)

    def relative_slope(self, temperature: float) -> float:
        """d ln y/dT [1/K]."""
        slope = thermal.derivative(self.row.form, self.row.coefficients, temperature)
        level = thermal.evaluate(self.row.form, self.row.coefficients, temperature)
        return float(slope / level)


@dataclass(frozen=True, slots=True)
class Structure:
    """What the checks need of a molecule.

    ``refraction`` [cm3/mol] and ``foretold`` follow from it alone; ``group`` is the family, or
    ``rare`` where too few liquids taught what it is made of.
    """

    molecule: Molecule
    refraction: float
    foretold: Mapping[str, float]
    group: str


@dataclass(frozen=True, slots=True)
class Facts:
    """Everything the tables say about one substance that a cross-check looks at.

    ``series`` holds, for each model of the structure, how much more (natural logarithm) than
    foretold its neighbours in the homologous series have, and their scatter; ``estimate`` the
    dipole moment [D] estimated from the structure, and its uncertainty; ``listed`` the structure
    of the CAS number where another one was typed; ``prints`` what the open tables print under it.
    """

    slug: str
    structure: Structure
    points: Mapping[str, tuple[Point, ...]]
    curves: Mapping[str, tuple[Curve, ...]]
    series: Mapping[str, tuple[float, float]] = field(default_factory=dict)
    estimate: tuple[float, float] | None = None
    identity: Identity = field(default_factory=Identity)
    prints: Mapping[tuple[str, str], Print] = field(default_factory=dict)
    listed: Structure | None = None

    def names(self) -> Iterable[str]:
        """Every cell that can be doubted."""
        for points in self.points.values():
            for point in points:
                yield point.name
                if not math.isnan(point.temperature):
                    yield point.name + TEMPERATURE
        for curves in self.curves.values():
            yield from (curve.name for curve in curves)
        yield SMILES
        yield CAS


def structure_of(molecule: Molecule) -> Structure:
    """The structure's own numbers."""
    numbers = foretold(molecule)
    refraction = numbers.get("refraction") or additive_refraction(molecule.smiles)
    return Structure(molecule, refraction, numbers, RARE if is_rare(molecule) else molecule.family)


def facts_of(dataset: Dataset, slug: str, structure: Structure) -> Facts:
    """The cells of one substance, corrections applied."""
    points, curves = {}, {}
    for key, quantity in QUANTITIES.items():
        if quantity.kind != "measured":
            continue
        measured = dataset.measurements_of(slug, key)
        if measured:
            points[key] = tuple(
                _point(key, i, row, dataset.sources.get(row.source))
                for i, row in enumerate(measured)
            )
        fitted = dataset.correlations_of(slug, key)
        if fitted:
            curves[key] = tuple(
                Curve(f"{key}~{i}", row, _is_calculated(dataset.sources.get(row.source)))
                for i, row in enumerate(fitted)
            )
    return Facts(slug, structure, points, curves)


def _point(key: str, index: int, row: Measurement, source: Source | None) -> Point:
    temperature = math.nan if row.temperature is None else row.temperature
    spread = row.half_width if row.uncertainty is None else row.uncertainty
    return Point(f"{key}#{index}", row.value, temperature, spread, row, _is_calculated(source))


def _is_calculated(source: Source | None) -> bool:
    return source is not None and source.kind == "calculated"


@dataclass(frozen=True, slots=True)
class View:
    """Facts seen with some cells changed (arrays of one shape) and some left out."""

    facts: Facts
    changed: Mapping[str, Array] = field(default_factory=dict)
    dropped: frozenset[str] = frozenset()
    structure: Structure | None = None

    @property
    def known(self) -> Structure:
        """The structure in this view."""
        return self.structure or self.facts.structure

    def points(self, key: str) -> Sequence[Point]:
        """The measured values of a quantity."""
        return [p for p in self.facts.points.get(key, ()) if p.name not in self.dropped]

    def curves(self, key: str) -> Sequence[Curve]:
        """The curves of a quantity; one worked out from a point goes with the point."""
        gone = any(p.name in self.dropped for p in self.facts.points.get(key, ()))
        return [
            c
            for c in self.facts.curves.get(key, ())
            if c.name not in self.dropped and not (c.calculated and gone)
        ]

    def sources(self, key: str) -> Sequence[Point | Curve]:
        """The points and curves of a quantity that say something of their own."""
        points = self.points(key)
        return [*points, *(c for c in self.curves(key) if not (c.calculated and points))]

    def middle(self, key: str) -> float:
        """Median of the values of a quantity as typed, NaN where there is none."""
        values = [p.value for p in self.points(key)]
        return median(values) if values else math.nan

    def value(self, point: Point) -> Array:
        """Value of a point [the quantity's unit]."""
        return np.asarray(self.changed.get(point.name, point.value), dtype=np.float64)

    def temperature(self, point: Point) -> Array:
        """Temperature of a point [K]."""
        return np.asarray(
            self.changed.get(point.name + TEMPERATURE, point.temperature), dtype=np.float64
        )

    def curve(self, curve: Curve, temperature: ArrayLike) -> Array:
        """A curve at a temperature [K], in the quantity's unit; scaled where it is doubted."""
        scaled: Array = curve.at(temperature) * self.changed.get(curve.name, np.float64(1.0))
        return scaled

    def expansivity(self, temperature: float) -> float:
        """Thermal expansivity [1/K] from a density curve where there is one."""
        for curve in self.curves("density"):
            if curve.holds(temperature, 30.0):
                slope = -curve.relative_slope(temperature)
                if 0 < slope < 0.005:
                    return slope
        associated = self.known.molecule.is_associated
        return USUAL_EXPANSIVITY_ASSOCIATED if associated else USUAL_EXPANSIVITY

    def density(self, source: Point | Curve, temperature: ArrayLike) -> Array:
        """Density [g/cm3] after one source at a temperature [K]."""
        if isinstance(source, Curve):
            return self.curve(source, temperature)
        at = np.asarray(temperature, dtype=np.float64)
        alpha = self.expansivity(float(np.clip(middle_of(at), 150.0, 500.0)))
        density: Array = self.value(source) * np.exp(-alpha * (at - self.temperature(source)))
        return density

    def index(self, point: Point, temperature: ArrayLike) -> Array:
        """Refractive index [1] of a point brought to a temperature [K]."""
        # At constant refraction (n² − 1)/(n² + 2) goes with the density.
        away = np.asarray(temperature, dtype=np.float64) - self.temperature(point)
        square = self.value(point) ** 2
        with np.errstate(all="ignore"):
            share = (square - 1) / (square + 2)
            share = share * np.exp(-self.expansivity(point.temperature) * away)
            index: Array = np.sqrt((1 + 2 * share) / (1 - share))
        return index


def middle_of(numbers: ArrayLike) -> float:
    """Median of those that are numbers; NaN where none is."""
    known = np.ravel(numbers)
    known = known[~np.isnan(known)]
    return float(np.median(known)) if known.size else math.nan


def celsius(kelvin: float) -> float:
    """A temperature [K] in °C."""
    return kelvin - ZERO_CELSIUS
