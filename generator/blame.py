"""Which cell is to blame: the single change that lets every cross-check of a substance pass.

Each outcome costs the more, the further it lies from what is usual (a long-tailed cost), and what
one check can add is capped by how far that check is to be trusted, so that a rule of thumb that
does not hold for an odd molecule accuses nobody. For each cell the typed value is replaced by
many others; the cell whose best replacement saves most is the one most likely wrong. A cell that
stands in several failed checks is found this way, and one that other checks confirm is cleared,
since changing it would break them.
"""

from __future__ import annotations

import math
from collections import defaultdict
from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from generator.expectations import outcomes
from generator.facts import TEMPERATURE, Array, Curve, Facts, Point, View
from generator.identity import CAS, SMILES
from generator.outcome import CHECKS, Outcome
from generator.quantities import QUANTITIES
from generator.reliability import proneness
from generator.slips import Slip, slips
from generator.spreads import LIMIT, Spreads
from generator.units import convert

# Degrees of freedom of the long-tailed cost (Student's t).
_TAIL = 3.0
_FARTHEST = 1e6
# How much a cell must save before it is named.
LEAST_GAIN = 2.8
# Reluctance to blame a kind of cell: typed values go wrong most often.
_RELUCTANCE = {"value": 0.0, "temperature_c": 1.0, "coefficients": 0.7, "smiles": 0.5, "cas": 0.5}
# A structure that nothing replaces, and each comparison that is merely left out.
_NO_ALTERNATIVE, _LEFT_OUT = 2.5, 0.5
# Freedom of a replaced number: it can always pass one check, which proves nothing.
_FREEDOM = 1.0
_SLIP_BONUS = 1.0
# What no open table prints may have been mistyped, beside being wrong where it is from.
_TYPED = 1.0
# Share of a check's cost that counts beyond its cap: a slip of the point is no odd molecule.
_BEYOND = 0.2
# Two sources contradict each other and nothing else speaks: one is named where it is this much
# more prone, or the clash this many times beyond its limit.
_LEAST_LEAD, _PLAIN = 0.7, 1.8
# Sources this close agree [spreads].
_OF_ONE_MIND = 1.0
SOURCE_CHECKS = frozenset(
    {"melting-points", "boiling-points", "flash-points", "pressure-curves", "viscosity-curves",
     "curves", "moments", "permittivities", "densities", "indices"}
)  # fmt: skip


@dataclass(frozen=True, slots=True)
class Blame:
    """A cell found most likely wrong.

    ``best`` is the replacement that satisfies most (NaN for a structure or curve), ``failed`` the
    clashes it would settle, ``passed`` the comparisons it stands up to, ``strength`` the worst
    clash over its limit, ``rival`` the next most likely cell, ``lead`` how much less it saves.
    """

    cell: str
    best: float
    gain: float
    strength: float
    failed: tuple[Outcome, ...]
    passed: tuple[Outcome, ...]
    slip: Slip | None
    rival: str
    lead: float


@dataclass(frozen=True, slots=True)
class _Trial:
    """``cost`` ranks the cells, ``bare`` is what the change leaves without a slip to explain it."""

    cell: str
    best: float
    cost: float
    bare: float
    slip: Slip | None = None


def column_of(cell: str) -> str:
    """The table column a cell stands in."""
    if cell in (SMILES, CAS):
        return cell
    if cell.endswith(TEMPERATURE):
        return "temperature_c"
    return "coefficients" if "~" in cell else "value"


def quantity_of(cell: str) -> str:
    """The quantity a cell belongs to; the cell itself for structure and CAS number."""
    return cell.removesuffix(TEMPERATURE).partition("#")[0].partition("~")[0]


def point_of(facts: Facts, cell: str) -> Point:
    """The point a cell belongs to."""
    name = cell.removesuffix(TEMPERATURE)
    return next(p for p in facts.points[quantity_of(cell)] if p.name == name)


def curve_of(facts: Facts, cell: str) -> Curve:
    """The curve a cell belongs to."""
    return next(c for c in facts.curves[quantity_of(cell)] if c.name == cell)


def deviations(found: Sequence[Outcome], spreads: Spreads) -> Array:
    """Deviation of each outcome [spreads]."""
    return np.array([float(spreads.deviation(outcome)) for outcome in found])


def clashes(found: Sequence[Outcome], spreads: Spreads) -> list[Outcome]:
    """The outcomes beyond their limit."""
    z = deviations(found, spreads)
    return [o for o, d in zip(found, z, strict=True) if abs(d) > LIMIT]


def blamed(facts: Facts, spreads: Spreads, most: int = 4) -> tuple[Blame, ...]:
    """The cells most likely wrong in one substance, worst first; none where nothing clashes."""
    found: list[Blame] = []
    dropped: frozenset[str] = frozenset()
    while len(found) < most:
        view = View(facts, dropped=dropped)
        now = [o for o in outcomes(view) if dropped.isdisjoint(o.members)]
        failed = clashes(now, spreads)
        if not failed:
            break
        case = _Case(view, now, failed, spreads)
        blame = _worst(case)
        if blame is None:
            break
        if _is_decided(blame, facts, spreads):
            found.append(blame)
            dropped |= {blame.cell.removesuffix(TEMPERATURE), *case.linked(blame.cell)}
        else:
            # What cannot be decided is left alone as a whole.
            key = quantity_of(blame.cell)
            dropped |= {point.name for point in view.points(key)}
            dropped |= {curve.name for curve in view.curves(key)}
    return tuple(found)


def _is_decided(blame: Blame, facts: Facts, spreads: Spreads) -> bool:
    """Whether the sources that contradict the cell clearly outnumber those that agree with it."""
    kinds = frozenset(outcome.check for outcome in blame.failed)
    if not kinds <= SOURCE_CHECKS:
        return True
    z = deviations(blame.passed, spreads)
    close = [abs(float(d)) < _OF_ONE_MIND for d in z]
    mates = sum(o.check in kinds and near for o, near in zip(blame.passed, close, strict=True))
    others = len(blame.failed)
    if mates:
        return others >= 2 * (mates + 1)
    return others > 1 or blame.lead >= _LEAST_LEAD or blame.strength >= _PLAIN


class _Case:
    """What is held against the cells of one view."""

    def __init__(
        self, view: View, now: Sequence[Outcome], failed: Sequence[Outcome], spreads: Spreads
    ) -> None:
        self.view, self.spreads, self.failed = view, spreads, failed
        # What merely repeats a cell speaks only where it does not.
        clashing = set(map(id, failed))
        self.now = [o for o in now if not CHECKS[o.check].echo or id(o) in clashing]
        self._costs = {id(o): float(_cost(o, spreads)) for o in self.now}
        self.echoes = {(o.check, o.members) for o in self.now if CHECKS[o.check].echo}
        self._silent = {frozenset(o.members) for o in now if CHECKS[o.check].echo} - {
            frozenset(members) for _, members in self.echoes
        }

    def total(self, rest: Sequence[Outcome], touched: Sequence[Outcome] = ()) -> Array:
        """What is held against the cells: ``rest`` as it stands, ``touched`` as it is tried."""
        sums: dict[str, Array | float] = defaultdict(float)
        for outcome in (*rest, *touched):
            known = self._costs.get(id(outcome))
            cost = _cost(outcome, self.spreads) if known is None else known
            so_far = sums[outcome.check]
            # The sum over independent prints, the worst of one expectation.
            alone = math.isinf(CHECKS[outcome.check].trust)
            sums[outcome.check] = so_far + cost if alone else np.maximum(so_far, cost)
        total: Array = np.zeros(())
        for check, cost in sums.items():
            cap = CHECKS[check].trust
            total = total + np.minimum(cost, cap + _BEYOND * np.maximum(cost - cap, 0.0))
        return total

    @property
    def copied(self) -> int:
        """How many rows the open tables print so under the CAS number."""
        return sum(CAS in members for members in self._silent)

    def linked(self, cell: str) -> frozenset[str]:
        """The curves that repeat a point, and stand or fall with it."""
        if "#" not in cell or cell.endswith(TEMPERATURE):
            return frozenset()
        key = quantity_of(cell)
        return frozenset(
            curve.name
            for curve in self.view.curves(key)
            if any({cell, curve.name} <= members for members in self._silent)
        )

    def seen(self, view: View, reading: str = "") -> list[Outcome]:
        """The comparisons of another view, without what merely repeats."""
        return [
            o
            for o in outcomes(view, reading)
            if view.dropped.isdisjoint(o.members)
            and (not CHECKS[o.check].echo or (o.check, o.members) in self.echoes)
        ]


def _worst(case: _Case) -> Blame | None:
    before = float(case.total(case.now))
    candidates = [c for c in case.view.facts.names() if any(c in o.members for o in case.failed)]
    trials = sorted((_try(case, cell) for cell in candidates), key=lambda trial: trial.cost)
    best = trials[0]
    gain = before - best.bare
    if gain < LEAST_GAIN:
        return None
    cells = {best.cell, *case.linked(best.cell)}
    mine = [outcome for outcome in case.failed if cells.intersection(outcome.members)]
    z = np.abs(deviations(mine, case.spreads))
    order = np.argsort(-z, kind="stable")
    own = best.cell.removesuffix(TEMPERATURE)
    rival = next((t for t in trials[1:] if t.cell.removesuffix(TEMPERATURE) != own), None)
    return Blame(
        cell=best.cell,
        best=best.best,
        gain=gain,
        strength=float(z.max()) / LIMIT,
        failed=tuple(mine[i] for i in order),
        passed=tuple(o for o in case.now if best.cell in o.members and o not in mine),
        slip=best.slip,
        rival=rival.cell if rival else "",
        lead=rival.cost - best.cost if rival else math.inf,
    )


def _cost(outcome: Outcome, spreads: Spreads) -> Array:
    """Uncapped cost of one comparison.

    As typed, there may be nothing to compare, which costs nothing; a value that is tried and
    leaves an equation's domain explains nothing.
    """
    z = np.minimum(np.abs(spreads.deviation(outcome)), _FARTHEST)
    z = np.where(np.isnan(z), _FARTHEST if z.ndim else 0.0, z)
    cost: Array = 0.5 * (_TAIL + 1) * np.log1p(z**2 / _TAIL)
    return cost


def _try(case: _Case, cell: str) -> _Trial:
    """The best that can be made of a substance by changing one cell."""
    cells = {cell, *case.linked(cell)}
    rest = [o for o in case.now if cells.isdisjoint(o.members)]
    reluctance = _RELUCTANCE[column_of(cell)] + _FREEDOM
    if cell == SMILES:
        return _try_structure(case, rest, reluctance)
    if cell == CAS or "~" in cell:
        reluctance += case.copied if cell == CAS else _LEFT_OUT * (len(case.now) - len(rest))
        cost = float(case.total(rest)) + reluctance
        return _Trial(cell, math.nan, cost, cost)
    return _try_point(case, cell, cells, rest, reluctance)


def _try_point(
    case: _Case, cell: str, cells: set[str], rest: list[Outcome], reluctance: float
) -> _Trial:
    """The best other value or temperature of a point."""
    view, point = case.view, point_of(case.view.facts, cell)
    key, temperature = point.row.quantity, cell.endswith(TEMPERATURE)
    if (key, point.row.source) not in view.facts.prints:
        reluctance -= _TYPED
    elif not temperature:
        reluctance -= proneness(key, point.row.source)
    low, high = (150.0, 700.0) if temperature else (QUANTITIES[key].low, QUANTITIES[key].high)

    def costs(values: Array) -> tuple[Array, list[Outcome]]:
        changed = dict.fromkeys(cells - {cell}, values / (point.value or 1.0))
        tried = View(view.facts, {cell: values, **changed}, view.dropped)
        touched = [o for o in case.seen(tried, key) if not cells.isdisjoint(o.members)]
        total = np.broadcast_to(case.total(rest, touched), values.shape)
        outside = np.where((values < low) | (values > high), 50.0, 0.0)
        return total + reluctance + outside, touched

    grid = _grid(point, temperature)
    coarse, _ = costs(grid)
    fine = _around(grid, int(np.argmin(coarse)))
    total, _ = costs(fine)
    best = int(np.argmin(total))
    slip, bare = None, float(total[best])
    lowest = bare
    suggestions = [] if temperature else _suggestions(view.facts, point)
    if suggestions:
        values = np.array([s.value for s in suggestions])
        total, touched = costs(values)
        settled = _settled(touched, case.spreads, values.shape)
        for suggestion, cost, fits in zip(suggestions, total, settled, strict=True):
            # A slip explains more than a free number; an odd slip explains little more.
            worth = float(cost) - _SLIP_BONUS + suggestion.rarity
            if fits and worth < lowest:
                slip, lowest = suggestion, worth
    return _Trial(cell, slip.value if slip else float(fine[best]), lowest, bare, slip)


def _around(grid: Array, best: int) -> Array:
    """Closer values about the best of a grid, itself included."""
    nearest = np.sort(np.abs(grid - grid[best]))
    step = nearest[nearest > 0][0] if (nearest > 0).any() else 0.0
    return np.asarray(grid[best] + step * np.linspace(-1.0, 1.0, 41))


def _suggestions(facts: Facts, point: Point) -> list[Slip]:
    """What the open table prints, and what the usual slips would have made of the value."""
    row = point.row
    found = list(slips(row.printed, row.printed_unit, row.quantity))
    there = facts.prints.get((row.quantity, row.source))
    if there is not None and there.value != row.printed:
        value = convert(float(there.value), there.unit, row.unit)
        words = f"{there.value} {there.unit}".removesuffix(" 1")
        found.insert(0, Slip(value, f"{row.source} prints {words}"))
    return found


def _try_structure(case: _Case, rest: list[Outcome], reluctance: float) -> _Trial:
    who, listed = case.view.facts.identity, case.view.facts.listed
    if who.relation == "same":
        return _Trial(SMILES, math.nan, math.inf, math.inf)
    if listed is not None:
        rest = case.seen(View(case.view.facts, dropped=case.view.dropped, structure=listed))
    else:
        reluctance += _NO_ALTERNATIVE + _LEFT_OUT * (len(case.now) - len(rest))
    cost = float(case.total(rest)) + reluctance
    return _Trial(SMILES, math.nan, cost, cost)


def _settled(touched: Sequence[Outcome], spreads: Spreads, shape: tuple[int, ...]) -> Array:
    """Where a replacement brings every comparison of the cell well inside its limit."""
    fits = np.ones(shape, dtype=bool)
    for outcome in touched:
        z = np.abs(np.nan_to_num(spreads.deviation(outcome), nan=0.0, posinf=1e6, neginf=1e6))
        fits &= z < 0.6 * LIMIT
    return fits


def _grid(point: Point, temperature: bool) -> Array:
    """Other values to try: near ones closely, far ones coarsely."""
    if temperature:
        return np.linspace(173.0, 573.0, 81)
    quantity = QUANTITIES[point.row.quantity]
    if quantity.unit == "degC":
        return point.value + np.concatenate([np.linspace(-400, 400, 81), np.linspace(-40, 40, 81)])
    offset = 1.0 if quantity.key in ("relative_permittivity", "refractive_index") else 0.0
    level = abs(point.value - offset) or 1.0
    near = np.exp(np.linspace(-0.6, 0.6, 121))
    far = np.exp(np.linspace(-7, 7, 43))
    return offset + level * np.concatenate([near, far])
