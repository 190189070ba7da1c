"""The permittivity of a substance degree by degree, for pages on which a reader chooses one.

Every number is one the generator gives; a page shows them and works out none of its own.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from typing import Any

from generator.metrics import Handbook
from generator.reconcile import choose_by_degree
from generator.units import ZERO_CELSIUS
from generator.values import CARRIED, EXTRAPOLATED, OUTSIDE_LIQUID_RANGE, Value
from generator.wording import celsius, number

_EPS = "relative_permittivity"
# What a curve is drawn broken for.
_UNSURE = {CARRIED, EXTRAPOLATED, OUTSIDE_LIQUID_RANGE}
DRAWN_EVERY = 5  # °C


def by_degree(handbook: Handbook, slug: str) -> tuple[Value, ...]:
    """The permittivity at every whole °C at which there is one, and at the listed temperatures.

    In the order of temperature; empty where none is known.
    """
    return handbook.kept.of(slug, "by-degree", lambda: _by_degree(handbook, slug))


def _by_degree(handbook: Handbook, slug: str) -> tuple[Value, ...]:
    liquid = handbook.liquid_range(slug)
    # The handbook's own last: at a whole degree it says the same, or is an estimate.
    own = (*handbook.series(slug, _EPS), handbook.at(slug, _EPS))
    values = (*choose_by_degree(handbook.dataset, slug, _EPS, liquid), *own)
    found = {round(v.temperature, 6): v for v in values if v is not None and v.temperature}
    return tuple(found[t] for t in sorted(found))


def control(values: Sequence[Value]) -> Mapping[str, Any]:
    """What the temperature control of a datasheet is fed: text, ready to show, by column.

    ``t`` temperatures [°C], ``v`` values, ``u`` uncertainties, ``b`` positions in ``bases``,
    ``m`` letters of the marks.
    """
    bases = list(dict.fromkeys(v.basis for v in values))
    shown = [made for v in values if (made := number(v, {})) is not None]
    return {
        "t": [celsius(v.temperature or 0.0) for v in values],
        "v": [n.value for n in shown],
        "u": [n.uncertainty for n in shown],
        "b": [bases.index(v.basis) for v in values],
        "m": [n.letters for n in shown],
        "bases": bases,
        "marks": {m.letter: m.label for n in shown for m in n.marks},
    }


def drawn(values: Sequence[Value]) -> str:
    """The same, thinned out and short, for a curve: ``20:80.1 25:78.4 x30:76.6``.

    °C and ε; ``x`` where the curve is to be broken.
    """
    last = len(values) - 1
    kept = []
    for i, value in enumerate(values):
        at = (value.temperature or 0.0) - ZERO_CELSIUS
        if i in (0, last) or abs(at - DRAWN_EVERY * round(at / DRAWN_EVERY)) < 1e-6:
            unsure = value.basis == "estimated" or not _UNSURE.isdisjoint(value.marks)
            kept.append(f"{'x' * unsure}{at:.4g}:{value.value:.4g}")
    return " ".join(kept)
