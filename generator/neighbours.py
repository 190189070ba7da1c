"""Homologous series: how much more than foretold the neighbours of a substance have.

The structure's own forecast leaves a remainder that members of one series share. The median
remainder of the nearest members corrects it, so that a step out of the series stands out; how
far the members lie apart says how much the correction is worth.
"""

from __future__ import annotations

import math
from collections import defaultdict
from collections.abc import Mapping, Sequence
from dataclasses import dataclass, replace
from statistics import median

import numpy as np

from generator import polarity
from generator.agreement import EPS, KAPPA, ROOM, TB
from generator.facts import Facts, View
from generator.increments import MODELS, series_key, size
from generator.units import ZERO_CELSIUS

# Neighbours looked at, the fewest that count, and how far in ln(size) they may lie.
_MOST, _FEWEST, _REACH = 7, 3, 0.6
# Members further apart than the forecast is good for say nothing (ln units).
_USEFUL = {"refraction": 0.006, "molar_volume": 0.015, "boiling_point": 0.02, "liquid_moment": 0.2}
_LEAST = 0.002
# Liquids of this many families have nothing in common that would explain one figure for all.
_UNRELATED = 3


@dataclass(frozen=True)
class Sketch:
    """What a substance tells its neighbours: where it stands in which series, and its figures.

    ``figures`` are its conductivities as their sources print them.
    """

    slug: str
    series: str
    size: float
    remainders: Mapping[str, float]
    family: str
    figures: tuple[tuple[str, str], ...]


@dataclass(frozen=True)
class Surroundings:
    """What its neighbours tell of a substance; see ``facts.Facts`` and ``facts.Point``."""

    series: Mapping[str, tuple[float, float]]
    repeats: tuple[int, ...]


def sketch(facts: Facts) -> Sketch:
    """What a substance tells its neighbours."""
    molecule = facts.structure.molecule
    figures = tuple((p.row.source, p.row.printed) for p in facts.points.get(KAPPA, ()))
    return Sketch(
        facts.slug,
        series_key(molecule),
        size(molecule),
        remainders(facts),
        molecule.family,
        figures,
    )


def surroundings(sketches: Sequence[Sketch]) -> dict[str, Surroundings]:
    """What the substances tell of each other."""
    series, repeats = series_of(sketches), _repeats(sketches)
    return {s.slug: Surroundings(series[s.slug], repeats[s.slug]) for s in sketches}


def placed(facts: Facts, among: Surroundings) -> Facts:
    """A substance with what its neighbours tell of it."""
    points = facts.points
    if KAPPA in points:
        counted = zip(points[KAPPA], among.repeats, strict=True)
        points = {**points, KAPPA: tuple(replace(p, repeats=count) for p, count in counted)}
    return replace(facts, series=among.series, points=points)


def series_of(sketches: Sequence[Sketch]) -> Mapping[str, Mapping[str, tuple[float, float]]]:
    """For each substance and model: what its neighbours have beyond the forecast.

    The median of their ln(measured/foretold), and the standard error of that median; only where
    it is worth more than no correction at all.
    """
    groups: dict[str, list[Sketch]] = defaultdict(list)
    for own in sketches:
        groups[own.series].append(own)
    shifts: dict[str, dict[str, tuple[float, float]]] = {own.slug: {} for own in sketches}
    for members in groups.values():
        for own in members:
            near = sorted(
                (abs(other.size - own.size), other.slug, other.remainders)
                for other in members
                if other is not own and abs(other.size - own.size) <= _REACH
            )
            for model in MODELS:
                values = [r[model] for *_, r in near if model in r][:_MOST]
                if len(values) < _FEWEST:
                    continue
                middle = median(values)
                half, most = np.quantile(np.abs(np.array(values) - middle), [0.5, 0.8])
                apart = float(max(1.4826 * half, most / 1.2816))
                if apart < _USEFUL[model]:
                    error = max(apart, _LEAST) * 1.25 / math.sqrt(len(values))
                    shifts[own.slug][model] = middle, error
    return shifts


def _repeats(sketches: Sequence[Sketch]) -> dict[str, tuple[int, ...]]:
    """In how many other substances each printed figure stands again, where they are unrelated."""
    families: dict[tuple[str, str], list[str]] = defaultdict(list)
    for own in sketches:
        for figure in own.figures:
            families[figure].append(own.family)

    def again(figure: tuple[str, str]) -> int:
        found = families[figure]
        return len(found) - 1 if len(set(found)) >= _UNRELATED else 0

    return {own.slug: tuple(map(again, own.figures)) for own in sketches}


def remainders(facts: Facts) -> Mapping[str, float]:
    """ln(measured/foretold) of each model where both are known."""
    measured = observed(facts)
    return {
        model: math.log(measured[model] / value)
        for model, value in facts.structure.foretold.items()
        if measured.get(model, 0.0) > 0
    }


def observed(facts: Facts) -> Mapping[str, float]:
    """What the models foretell, as the tables have it: R and V at 20 °C, T_b [K], moment [D]."""
    view, found = View(facts), dict[str, float]()
    boils = view.middle(TB)
    if math.isfinite(boils):
        found["boiling_point"] = boils + ZERO_CELSIUS
    mass = facts.structure.molecule.molar_mass
    densities = [d for d in view.sources("density") if d.holds(ROOM, 40.0)]
    volumes = [mass / float(view.density(source, ROOM)) for source in densities]
    volumes = [v for v in volumes if math.isfinite(v) and v > 0]
    if not volumes:
        return found
    volume = found["molar_volume"] = median(volumes)
    refractions = [
        float(polarity.molar_refraction(n.value, mass / float(view.density(d, n.temperature))))
        for n in view.points("refractive_index")
        for d in densities
        if n.holds(ROOM, 40.0)
    ]
    if refractions:
        found["refraction"] = median(refractions)
    n = polarity.refractive_index_from_refraction(facts.structure.refraction, volume)
    moments = [
        float(polarity.onsager_dipole_moment(p.value, n, volume, p.temperature))
        for p in view.points(EPS)
        if math.isfinite(p.temperature)
    ]
    if moments and facts.structure.molecule.dipole_limit is None:
        found["liquid_moment"] = median(moments)
    return found
