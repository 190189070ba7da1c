"""Homologous series: how much more than foretold the neighbours of a substance have.

The structure's own forecast leaves a remainder that members of one series share. The median
remainder of the nearest members corrects it, so that a step out of the series stands out; how
far the members lie apart says how much the correction is worth.
"""

from __future__ import annotations

import math
from collections import defaultdict
from collections.abc import Mapping, Sequence
from dataclasses import replace
from statistics import median

from generator import polarity
from generator.agreement import EPS, ROOM, TB
from generator.facts import Facts, Point, View
from generator.increments import MODELS, series_key, size
from generator.units import ZERO_CELSIUS

# Neighbours looked at, the fewest that count, and how far in ln(size) they may lie.
_MOST, _FEWEST, _REACH = 7, 3, 0.6
# Members further apart than the forecast is good for say nothing (ln units).
_USEFUL = {"refraction": 0.006, "molar_volume": 0.015, "boiling_point": 0.02, "liquid_moment": 0.2}
_LEAST = 0.002
# Liquids of this many families have nothing in common that would explain one figure for all.
_UNRELATED = 3


def series_of(everything: Sequence[Facts]) -> Mapping[str, Mapping[str, tuple[float, float]]]:
    """For each substance and model: what its neighbours have beyond the forecast.

    The median of their ln(measured/foretold), and the standard error of that median; only where
    it is worth more than no correction at all.
    """
    groups: dict[str, list[tuple[float, Facts, Mapping[str, float]]]] = defaultdict(list)
    for facts in everything:
        key = series_key(facts.structure.molecule)
        groups[key].append((size(facts.structure.molecule), facts, remainders(facts)))
    shifts: dict[str, dict[str, tuple[float, float]]] = {facts.slug: {} for facts in everything}
    for members in groups.values():
        for own_size, facts, _ in members:
            near = sorted(
                (abs(other_size - own_size), other.slug, remainder)
                for other_size, other, remainder in members
                if other is not facts and abs(other_size - own_size) <= _REACH
            )
            for model in MODELS:
                values = [r[model] for *_, r in near if model in r][:_MOST]
                if len(values) < _FEWEST:
                    continue
                middle = median(values)
                apart = 1.4826 * median(abs(value - middle) for value in values)
                if apart < _USEFUL[model]:
                    error = max(apart, _LEAST) * 1.25 / math.sqrt(len(values))
                    shifts[facts.slug][model] = middle, error
    return shifts


def with_repeats(everything: Sequence[Facts], key: str) -> list[Facts]:
    """The same substances; each value of a quantity knows in how many others it stands again."""
    families: dict[tuple[str, str], list[str]] = defaultdict(list)
    for facts in everything:
        for point in facts.points.get(key, ()):
            families[point.row.source, point.row.printed].append(facts.structure.molecule.family)

    def again(point: Point) -> int:
        found = families[point.row.source, point.row.printed]
        return len(found) - 1 if len(set(found)) >= _UNRELATED else 0

    def counted(facts: Facts) -> Facts:
        points = tuple(replace(p, repeats=again(p)) for p in facts.points[key])
        return replace(facts, points={**facts.points, key: points})

    return [counted(facts) if key in facts.points else facts for facts in everything]


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
