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
from collections.abc import Iterable, Mapping
from dataclasses import dataclass
from functools import lru_cache
from pathlib import Path

import numpy as np

from generator.facts import RARE, Array
from generator.outcome import CHECKS, Outcome

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
    values = np.array([r for r in residuals if math.isfinite(r)])
    if not values.size:
        return Spread(0.0, 0.0, 0)
    middle = float(np.median(values))
    half, most = np.quantile(np.abs(values - middle), [0.5, 0.8])
    return Spread(middle, float(max(_HALF * half, _FOUR_FIFTHS * most)), values.size)


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
    """The spreads in force for one handbook."""

    table: Mapping[tuple[str, str], Spread]

    def of(self, check: str, group: str) -> Spread:
        """Spread of a group; where it has too few comparisons, of rare ones or the whole check."""
        if not CHECKS[check].learnt:
            return Spread(0.0, CHECKS[check].resolution, 0)
        groups = (group, RARE, ALL)
        found = next((s for g in groups if (s := self.table.get((check, g))) is not None), None)
        if found is None:
            return Spread(0.0, math.inf, 0)
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


def learn(outcomes: Iterable[Outcome]) -> dict[tuple[str, str], Spread]:
    """Spread of every check and of every group that is large enough, from outcomes alone."""
    residuals: dict[tuple[str, str], list[float]] = defaultdict(list)
    for outcome in outcomes:
        if not CHECKS[outcome.check].learnt:
            continue
        residual = float(outcome.residual) / outcome.weight
        residuals[outcome.check, outcome.group].append(residual)
        residuals[outcome.check, ALL].append(residual)
    found = {
        key: robust(values)
        for key, values in sorted(residuals.items())
        if len(values) >= FEWEST or key[1] == ALL
    }
    return {
        (check, group): usual if group == ALL else _leaning(usual, found, check)
        for (check, group), usual in found.items()
    }


def _leaning(usual: Spread, found: Mapping[tuple[str, str], Spread], check: str) -> Spread:
    """The spread of a group; a small one leans on the other groups of its check."""
    others = float(np.median([s.spread for (c, g), s in found.items() if c == check and g != ALL]))
    share = usual.count / (usual.count + FEWEST)
    return Spread(usual.median, share * usual.spread + (1 - share) * others, usual.count)


def spreads_for(outcomes: Iterable[Outcome]) -> Spreads:
    """The handbook's own spreads joined with the shipped ones."""
    own, floor = learn(outcomes), shipped()
    table = {}
    for key in sorted({*own, *floor}):
        mine, base = own.get(key), floor.get(key) or floor.get((key[0], ALL))
        table[key] = base if mine is None else mine if base is None else _joined(mine, base)
    return Spreads({key: value for key, value in table.items() if value is not None})


def _joined(mine: Spread, base: Spread) -> Spread:
    share = mine.count / (mine.count + PRIOR_COUNT)
    pooled = math.sqrt(share * mine.spread**2 + (1 - share) * base.spread**2)
    middle = share * mine.median + (1 - share) * base.median
    return Spread(middle, max(pooled, base.spread), mine.count)


def thresholds(spreads: Spreads) -> tuple[Threshold, ...]:
    """Every limit in force, in order of check and group."""
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
        for check, group in spreads.table
        for usual in [spreads.of(check, group)]
    )
