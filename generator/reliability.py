"""How often a source is outvoted: learnt once from the open liquids, where several speak.

Where two sources contradict each other and nothing else speaks, the one that is wrong more often
elsewhere is the likelier culprit.
"""

from __future__ import annotations

import csv
import math
from collections.abc import Iterable, Mapping, Sequence
from functools import lru_cache
from pathlib import Path
from statistics import median

_TABLE = Path(__file__).parent / "reference" / "reliability.csv"
# A rate counts as much as this many values of average quality.
_PRIOR = 100.0
# What counts as outvoted [the quantity's unit]: the limits of the comparisons of sources.
_APART = {"melting_point": 12.0, "boiling_point": 8.0, "flash_point": 20.0, "dipole_moment": 0.4}
_FEWEST = 2


@lru_cache(maxsize=1)
def _shipped() -> Mapping[tuple[str, str], float]:
    """ln of how much more often than on average a source is outvoted, by quantity and source."""
    with _TABLE.open(encoding="utf-8", newline="") as file:
        rows = list(csv.DictReader(file))
    values, outvoted = (sum(int(row[c]) for row in rows) for c in ("values", "outvoted"))
    usual = outvoted / values
    return {
        (row["quantity"], row["source"]): math.log(
            (int(row["outvoted"]) + _PRIOR * usual) / (int(row["values"]) + _PRIOR) / usual
        )
        for row in rows
    }


def proneness(quantity: str, source: str) -> float:
    """How much more readily a value of this source is doubted [ln odds]; 0 for one not known."""
    return _shipped().get((quantity, source), 0.0)


def outvoted(quantity: str, values: Sequence[tuple[str, float]]) -> Iterable[tuple[str, bool]]:
    """For each (source, value) that others of one mind judge: whether they outvote it."""
    apart = _APART[quantity]
    for i, (source, value) in enumerate(values):
        others = [other for j, (_, other) in enumerate(values) if j != i]
        if len(others) >= _FEWEST:
            middle = median(others)
            if all(abs(other - middle) <= apart / 2 for other in others):
                yield source, abs(value - middle) > apart


QUANTITIES: tuple[str, ...] = tuple(_APART)
