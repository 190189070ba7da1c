"""Which cell is to blame: the single change that lets every cross-check of a substance pass.

Each outcome costs the more, the further it lies from what is usual (a long-tailed cost, so that
one failed model cannot outvote the rest). For each cell the tables' value is replaced by many
others; the cell whose best replacement saves most is the one most likely wrong. A cell that
stands in several failed checks is found this way, and one that other checks confirm is cleared,
since changing it would break them.
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass, field

import numpy as np

from generator.expectations import Outcome, outcomes
from generator.facts import SMILES, TEMPERATURE, Array, Curve, Facts, Point, View
from generator.quantities import QUANTITIES
from generator.slips import Slip, slips
from generator.spreads import LIMIT, Spreads

# Degrees of freedom of the long-tailed cost (Student's t).
_TAIL = 3.0
# How much a cell must save before it is named.
LEAST_GAIN = 3.0
# Reluctance to blame a kind of cell: typed values go wrong most often.
_RELUCTANCE = {"value": 0.0, "temperature_c": 1.5, "coefficients": 1.0, "smiles": 3.0}
# Freedom of a replaced number: it can always pass one check, which proves nothing.
_FREEDOM = 1.5
_SLIP_BONUS = 1.0
_STEPS = 160


@dataclass(frozen=True, slots=True)
class Blame:
    """A cell found most likely wrong.

    ``best`` is the replacement that satisfies most (NaN for a structure or curve), ``failed`` the
    clashes it would settle, ``strength`` the worst of them over its limit, ``rival`` the next
    most likely cell with the gain it lacks.
    """

    cell: str
    best: float
    gain: float
    strength: float
    failed: tuple[Outcome, ...]
    passed: tuple[Outcome, ...]
    slip: Slip | None
    rival: str = ""
    lead: float = math.inf


@dataclass(frozen=True, slots=True)
class _Trial:
    cell: str
    best: float
    cost: float
    slip: Slip | None = None
    fixed: dict[str, Array] = field(default_factory=dict)


def cost(deviation: Array) -> Array:
    """Cost of a deviation [spreads]; 0 where there is nothing to compare."""
    z = np.nan_to_num(deviation, nan=0.0, posinf=1e6, neginf=1e6)
    return np.asarray(0.5 * (_TAIL + 1) * np.log1p(z**2 / _TAIL))


def deviations(found: Sequence[Outcome], spreads: Spreads) -> Array:
    """Deviation of each outcome [spreads]."""
    return np.array([float(spreads.deviation(outcome)) for outcome in found])


def clashes(found: Sequence[Outcome], spreads: Spreads) -> list[Outcome]:
    """The outcomes beyond their limit."""
    z = deviations(found, spreads)
    return [o for o, d in zip(found, z, strict=True) if not abs(np.nan_to_num(d)) <= LIMIT]


def blamed(facts: Facts, spreads: Spreads, most: int = 3) -> tuple[Blame, ...]:
    """The cells most likely wrong in one substance, worst first; none where nothing clashes."""
    found: list[Blame] = []
    changed: dict[str, Array] = {}
    dropped: set[str] = set()
    while len(found) < most:
        view = View(facts, changed, frozenset(dropped))
        now = outcomes(view)
        failed = clashes(now, spreads)
        if not failed:
            break
        blame = _worst(facts, view, now, failed, spreads)
        if blame is None:
            break
        found.append(blame)
        dropped.add(blame.cell.removesuffix(TEMPERATURE))
        if blame.cell == SMILES:
            break
    return tuple(found)


def _worst(
    facts: Facts, view: View, now: list[Outcome], failed: list[Outcome], spreads: Spreads
) -> Blame | None:
    before = float(cost(deviations(now, spreads)).sum())
    candidates = [c for c in facts.names() if any(c in outcome.members for outcome in failed)]
    trials = sorted((_try(facts, view, now, cell, spreads) for cell in candidates),
                    key=lambda trial: trial.cost)  # fmt: skip
    if not trials:
        return None
    best = trials[0]
    gain = before - best.cost
    mine = [outcome for outcome in failed if best.cell in outcome.members]
    if gain < LEAST_GAIN:
        return None
    z = np.abs(deviations(mine, spreads))
    order = np.argsort(-z, kind="stable")
    rival = next((t for t in trials[1:] if _base(t.cell) != _base(best.cell)), None)
    return Blame(
        cell=best.cell,
        best=best.best,
        gain=gain,
        strength=float(z.max()) / LIMIT,
        failed=tuple(mine[i] for i in order),
        passed=tuple(o for o in now if o not in failed and best.cell in o.members),
        slip=best.slip,
        rival=rival.cell if rival else "",
        lead=rival.cost - best.cost if rival else math.inf,
    )


def _base(cell: str) -> str:
    return cell.removesuffix(TEMPERATURE)


def column_of(cell: str) -> str:
    """The table column a cell stands in."""
    if cell == SMILES:
        return "smiles"
    if cell.endswith(TEMPERATURE):
        return "temperature_c"
    return "coefficients" if "~" in cell else "value"


def _try(facts: Facts, view: View, now: list[Outcome], cell: str, spreads: Spreads) -> _Trial:
    reluctance = _RELUCTANCE[column_of(cell)] + _FREEDOM
    z = deviations(now, spreads)
    if cell == SMILES or "~" in cell:
        rest = sum(c for o, c in zip(now, cost(z), strict=True) if cell not in o.members)
        # Each comparison that is merely left out is paid with the cost of an ordinary one.
        left_out = sum(cell in o.members for o in now)
        return _Trial(cell, math.nan, float(rest) + reluctance + 0.5 * left_out)
    point = _point(facts, cell)
    temperature = cell.endswith(TEMPERATURE)
    suggestions = [] if temperature else list(
        slips(point.row.printed, point.row.printed_unit, point.row.quantity)
    )  # fmt: skip
    values = np.array(
        [*_grid(point, temperature), *(s.value for s in suggestions)], dtype=np.float64
    )
    tried = View(facts, {**view.changed, cell: values}, view.dropped)
    total = np.zeros_like(values)
    for outcome in outcomes(tried):
        total = total + cost(np.broadcast_to(spreads.deviation(outcome), values.shape))
    total += reluctance
    quantity = QUANTITIES[point.row.quantity]
    if not temperature:
        total[(values < quantity.low) | (values > quantity.high)] += 50.0
    plain = len(values) - len(suggestions)
    best = int(np.argmin(total[:plain]))
    slip, lowest = None, float(total[best])
    for suggestion, at in zip(suggestions, total[plain:], strict=True):
        # A slip explains more than a free number; an odd slip explains little more.
        value = float(at) - _SLIP_BONUS + suggestion.rarity
        if value < lowest:
            slip, lowest = suggestion, value
    return _Trial(cell, slip.value if slip else float(values[best]), lowest, slip)


def _point(facts: Facts, cell: str) -> Point:
    name = cell.removesuffix(TEMPERATURE)
    return next(p for p in facts.points[name.partition("#")[0]] if p.name == name)


def curve_of(facts: Facts, cell: str) -> Curve:
    """The curve a cell belongs to."""
    return next(c for c in facts.curves[cell.partition("~")[0]] if c.name == cell)


def point_of(facts: Facts, cell: str) -> Point:
    """The point a cell belongs to."""
    return _point(facts, cell)


def _grid(point: Point, temperature: bool) -> Array:
    """Other values to try: near ones closely, far ones coarsely."""
    if temperature:
        return np.concatenate([np.linspace(173.0, 573.0, 101), [point.temperature]])
    quantity = QUANTITIES[point.row.quantity]
    if quantity.unit == "degC":
        return point.value + np.concatenate(
            [np.linspace(-300, 300, 121), np.linspace(-25, 25, 101)]
        )
    offset = 1.0 if quantity.key in ("relative_permittivity", "refractive_index") else 0.0
    level = max(abs(point.value - offset), 1e-3)
    near = np.exp(np.linspace(-0.6, 0.6, _STEPS + 1))
    far = np.exp(np.linspace(-7, 7, 57))
    return offset + level * np.concatenate([near, far])
