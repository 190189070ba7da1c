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
from generator.identity import Identity, Print
from generator.increments import foretold
from generator.quantities import QUANTITIES
from generator.structures import Molecule, additive_refraction
from generator.units import ZERO_CELSIUS, convert

Array = NDArray[np.float64]

# Usual thermal expansivity of a liquid at room temperature [1/K], where no density curve says more.
USUAL_EXPANSIVITY = 0.0011
USUAL_EXPANSIVITY_ASSOCIATED = 0.0008
# dn/dT of organic liquids [1/K]; they differ by about a fifth of it.
INDEX_SLOPE = -4.5e-4
TEMPERATURE = "@"
SMILES = "smiles"
CAS = "cas"


@dataclass(frozen=True, slots=True)
class Point:
    """One measured value; ``name`` is the cell of its value, ``name + "@"`` of its temperature."""

    name: str
    value: float
    temperature: float
    spread: float
    row: Measurement
    calculated: bool = False

    @property
    def label(self) -> str:
        """The source, as evidence names it."""
        return self.row.source

    def holds(self, temperature: float, reach: float = 0.6) -> bool:
        """Whether the point was measured within ``reach`` of ``temperature`` [K]."""
        return abs(self.temperature - temperature) <= reach


@dataclass(frozen=True, slots=True)
class Curve:
    """One temperature curve; ``name`` is the cell of its coefficients."""

    name: str
    row: Correlation

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
        return np.asarray(raw * scale)

    def relative_slope(self, temperature: float) -> float:
        """d ln y/dT [1/K]."""
        slope = thermal.derivative(self.row.form, self.row.coefficients, temperature)
        level = thermal.evaluate(self.row.form, self.row.coefficients, temperature)
        return float(slope / level)


@dataclass(frozen=True, slots=True)
class Structure:
    """What the checks need of a molecule."""

    molecule: Molecule
    refraction: float
    foretold: Mapping[str, float]


@dataclass(frozen=True, slots=True)
class Facts:
    """Everything the tables say about one substance that a cross-check looks at.

    ``series`` holds, for each model of the structure, how much more (natural logarithm) than
    foretold its neighbours in the homologous series have; ``listed`` is the structure of the
    CAS number where another one was typed; ``prints`` what the open tables print under it.
    """

    slug: str
    structure: Structure
    points: Mapping[str, tuple[Point, ...]]
    curves: Mapping[str, tuple[Curve, ...]]
    series: Mapping[str, float] = field(default_factory=dict)
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
    return Structure(molecule, additive_refraction(molecule.smiles), foretold(molecule))


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
            curves[key] = tuple(Curve(f"{key}~{i}", row) for i, row in enumerate(fitted))
    return Facts(slug, structure, points, curves)


def _point(key: str, index: int, row: Measurement, source: Source | None) -> Point:
    calculated = source is not None and source.kind == "calculated"
    temperature = math.nan if row.temperature is None else row.temperature
    spread = row.half_width if row.uncertainty is None else row.uncertainty
    return Point(f"{key}#{index}", row.value, temperature, spread, row, calculated)


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
        """The curves of a quantity."""
        return [c for c in self.facts.curves.get(key, ()) if c.name not in self.dropped]

    def middle(self, key: str) -> float:
        """Median of the values of a quantity as typed, NaN where there is none."""
        values = [p.value for p in self.points(key)]
        return median(values) if values else math.nan

    def value(self, point: Point) -> ArrayLike:
        """Value of a point [the quantity's unit]."""
        return self.changed.get(point.name, point.value)

    def temperature(self, point: Point) -> ArrayLike:
        """Temperature of a point [K]."""
        return self.changed.get(point.name + TEMPERATURE, point.temperature)

    def curve(self, curve: Curve, temperature: ArrayLike) -> Array:
        """A curve at a temperature [K], in the quantity's unit."""
        return curve.at(temperature) * self.changed.get(curve.name, np.float64(1.0))

    def expansivity(self, temperature: float) -> float:
        """Thermal expansivity [1/K] from a density curve where there is one."""
        for curve in self.curves("density"):
            if curve.holds(temperature, 30.0):
                slope = -curve.relative_slope(temperature)
                if 0 < slope < 0.005:
                    return slope
        associated = self.known.molecule.is_associated
        return USUAL_EXPANSIVITY_ASSOCIATED if associated else USUAL_EXPANSIVITY

    def density(self, source: Point | Curve, temperature: ArrayLike) -> ArrayLike:
        """Density [g/cm3] after one source at a temperature [K]."""
        if isinstance(source, Curve):
            return self.curve(source, temperature)
        own = self.temperature(source)
        middle = float(np.clip(np.nanmedian(np.atleast_1d(temperature)), 150.0, 500.0))
        alpha = self.expansivity(middle)
        return np.asarray(self.value(source)) * np.exp(
            -alpha * (np.asarray(temperature) - np.asarray(own))
        )

    def index(self, point: Point, temperature: ArrayLike) -> Array:
        """Refractive index [1] of a point brought to a temperature [K]."""
        return np.asarray(self.value(point)) + INDEX_SLOPE * (
            np.asarray(temperature) - np.asarray(self.temperature(point))
        )


def celsius(kelvin: float) -> float:
    """A temperature [K] in °C."""
    return kelvin - ZERO_CELSIUS
