"""How far apart the two sides of a cross-check usually lie: learnt from the data themselves.

The spread of each check over the handbook at hand is robust: half of all residuals, and four
fifths of them, lie where a normal distribution of that spread would have them, whichever is
wider; wrong entries are rarer than that and do not widen it. It never falls below what was
learnt once from the open liquids and is shipped in ``reference/spreads.csv``. A handbook with few
substances leans on the shipped numbers, a large one on its own.
"""

from __future__ import annotations

import csv
import math
from collections import defaultdict
from collections.abc import Iterable, Mapping, Sequence
from dataclasses import dataclass
from functools import lru_cache
from pathlib import Path

import numpy as np

from generator.facts import RARE, Array
from generator.outcome import CHECKS, YES_OR_NO, Outcome

_TABLE = Path(__file__).parent / "reference" / "spreads.csv"
# A residual counts as a clash beyond this many spreads; alone it names a cell from about four on.
LIMIT = 3.0
# The shipped spread weighs as much as this many comparisons of the handbook's own.
PRIOR_COUNT = 60
# A group with fewer comparisons than this has no spread of its own.
FEWEST = 12
ALL = ""
# What makes the half and the four fifths of |residual| a standard deviation (normal distribution).
_HALF, _FOUR_FIFTHS = 1.4826, 1 / 1.2816


@dataclass(frozen=True, slots=True)
class Spread:
    """Median and robust spread of a check's residuals, over how many."""

    median: float
    spread: float
    count: int


@dataclass(frozen=True, slots=True)
class Threshold:
    """One check as the review page shows it.

    ``spread`` and ``limit`` are shares of one for checks by ratio, else in ``unit``.
    """

    check: str
    title: str
    group: str
    unit: str
    relative: bool
    median: float
    spread: float
    limit: float
    count: int


def robust(residuals: Iterable[float]) -> Spread:
    """Median, and the spread that half and four fifths of all ask for [as residuals]."""
    values = np.sort([r for r in residuals if math.isfinite(r)])
    if not values.size:
        return Spread(0.0, 0.0, 0)
    middle = _share(values, 0.5)
    away = np.sort(np.abs(values - middle))
    spread = max(_HALF * _share(away, 0.5), _FOUR_FIFTHS * _share(away, 0.8))
    return Spread(middle, spread, values.size)


def _share(ordered: Array, share: float) -> float:
    """Quantile of ordered values, between two of them by proportion."""
    place = share * (len(ordered) - 1)
    below = int(place)
    low, high = float(ordered[below]), float(ordered[min(below + 1, len(ordered) - 1)])
    return low + (place - below) * (high - low)


@lru_cache(maxsize=1)
def shipped() -> Mapping[tuple[str, str], Spread]:
    """What the open liquids taught, by check and group; the group "" stands for all."""
    with _TABLE.open(encoding="utf-8", newline="") as file:
        return {
            (row["check"], row["group"]): Spread(
                float(row["median"]), float(row["spread"]), int(row["count"])
            )
            for row in csv.DictReader(file)
        }


@dataclass(frozen=True)
class Spreads:
    """The spreads in force for one handbook.

    ``asked`` collects those that were asked for, median and spread, where it is given.
    """

    table: Mapping[tuple[str, str], Spread]
    asked: dict[tuple[str, str], tuple[float, float]] | None = None

    def of(self, check: str, group: str) -> Spread:
        """Spread of a group; where it has too few comparisons, of rare ones or the whole check."""
        found = self._of(check, group)
        if self.asked is not None:
            self.asked[check, group] = found.median, found.spread
        return found

    def give(self, asked: Mapping[tuple[str, str], tuple[float, float]]) -> bool:
        """Whether the same questions have the same answers."""
        found = {key: self._of(*key) for key in asked}
        return all((found[k].median, found[k].spread) == asked[k] for k in asked)

    def _of(self, check: str, group: str) -> Spread:
        if not CHECKS[check].learnt:
            return Spread(0.0, CHECKS[check].resolution, 0)
        groups = (group, RARE, ALL)
        found = next((s for g in groups if (s := self.table.get((check, g))) is not None), None)
        if found is None:
            return Spread(0.0, CHECKS[check].resolution, 0)
        return Spread(found.median, max(found.spread, CHECKS[check].resolution), found.count)

    def scale(self, outcome: Outcome) -> float:
        """What counts as one spread for an outcome, its own uncertainty included."""
        usual = self.of(outcome.check, outcome.group)
        return math.hypot(usual.spread * outcome.weight, outcome.own)

    def centre(self, outcome: Outcome) -> float:
        """Where the residual of an outcome usually lies."""
        weight = outcome.weight if CHECKS[outcome.check].relative else 1.0
        return self.of(outcome.check, outcome.group).median * weight

    def deviation(self, outcome: Outcome) -> Array:
        """Residual in spreads; NaN where there is nothing to compare."""
        return np.asarray((outcome.residual - self.centre(outcome)) / self.scale(outcome))


Key = tuple[str, str]
Compared = Mapping[Key, Sequence[tuple[float, float, float]]]
"""By check and group: residual, weight and own uncertainty of each comparison."""


def compared(outcomes: Iterable[Outcome]) -> Compared:
    """What there is to learn from the outcomes of a substance, or of several."""
    found: dict[Key, list[tuple[float, float, float]]] = defaultdict(list)
    for outcome in outcomes:
        numbers = float(outcome.residual), outcome.weight, outcome.own
        found[outcome.check, outcome.group].append(numbers)
    return dict(found)


def learn(each: Iterable[Compared]) -> dict[Key, Spread]:
    """Spread of every check and of every group that is large enough, from outcomes alone."""
    residuals: dict[Key, list[float]] = defaultdict(list)
    for found in each:
        for (check, group), numbers in found.items():
            if CHECKS[check].learnt:
                own = [residual / weight for residual, weight, _ in numbers]
                residuals[check, group] += own
                residuals[check, ALL] += own
    usual = {
        key: robust(values)
        for key, values in sorted(residuals.items())
        if len(values) >= FEWEST or key[1] == ALL
    }
    return {
        (check, group): spread if group == ALL else _leaning(spread, usual, check)
        for (check, group), spread in usual.items()
    }


def _leaning(usual: Spread, found: Mapping[tuple[str, str], Spread], check: str) -> Spread:
    """The spread of a group; a small one leans on the other groups of its check."""
    others = float(np.median([s.spread for (c, g), s in found.items() if c == check and g != ALL]))
    share = usual.count / (usual.count + FEWEST)
    return Spread(usual.median, share * usual.spread + (1 - share) * others, usual.count)


def spreads_for(each: Iterable[Compared]) -> Spreads:
    """The handbook's own spreads joined with the shipped ones."""
    own, floor = learn(each), shipped()
    table = {}
    for key in sorted({*own, *floor}):
        mine, base = own.get(key), floor.get(key) or floor.get((key[0], ALL))
        table[key] = base if mine is None else mine if base is None else _joined(mine, base)
    return Spreads({key: _rounded(value) for key, value in table.items() if value is not None})


def _rounded(usual: Spread) -> Spread:
    """A spread to the next of twenty steps a decade (ISO 3, R20), a median to a tenth of that.

    It is known no better, and one value more or less shall not move every limit.
    """
    if not usual.spread > 0:
        return usual
    spread = 10 ** (round(20 * math.log10(usual.spread)) / 20)
    return Spread(round(10 * usual.median / spread) * spread / 10, spread, usual.count)


def suspected(each: Mapping[str, Compared], spreads: Spreads) -> list[str]:
    """The substances of which some comparison lies beyond its limit."""
    gathered: dict[Key, list[tuple[float, float, float]]] = defaultdict(list)
    owners: dict[Key, list[str]] = defaultdict(list)
    for slug, found in each.items():
        for key, numbers in found.items():
            gathered[key] += numbers
            owners[key] += [slug] * len(numbers)
    beyond: set[str] = set()
    for (check, group), numbers in gathered.items():
        residual, weight, own = np.array(numbers).T
        usual = spreads.of(check, group)
        centre = usual.median * (weight if CHECKS[check].relative else 1.0)
        z = (residual - centre) / np.hypot(usual.spread * weight, own)
        clash = np.abs(np.nan_to_num(z)) > LIMIT
        beyond.update(slug for slug, far in zip(owners[check, group], clash, strict=True) if far)
    return [slug for slug in each if slug in beyond]


def _joined(mine: Spread, base: Spread) -> Spread:
    share = mine.count / (mine.count + PRIOR_COUNT)
    pooled = math.sqrt(share * mine.spread**2 + (1 - share) * base.spread**2)
    middle = share * mine.median + (1 - share) * base.median
    return Spread(middle, max(pooled, base.spread), mine.count)


def thresholds(spreads: Spreads) -> tuple[Threshold, ...]:
    """Every limit in force, in order of check and group; bounds, which are not learnt, as well."""
    known = {check for check, _ in spreads.table}
    bounds = [(name, ALL) for name in CHECKS if name not in known]
    return tuple(
        Threshold(
            check,
            CHECKS[check].title,
            group,
            CHECKS[check].unit,
            CHECKS[check].relative,
            usual.median,
            usual.spread,
            LIMIT * usual.spread,
            usual.count,
        )
        for check, group in sorted([*spreads.table, *bounds])
        if CHECKS[check].unit != YES_OR_NO
        for usual in [spreads.of(check, group)]
    )
