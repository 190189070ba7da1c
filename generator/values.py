"""One number of the handbook with everything that travels with it: marks, basis, uncertainty."""

from __future__ import annotations

from dataclasses import dataclass

from generator.dataset import Dataset, Measurement

EXTRAPOLATED = "extrapolated"
OUTSIDE_LIQUID_RANGE = "outside-liquid-range"
LOWER_BOUND = "lower-bound"
USUAL = "usual"
CARRIED = "carried"
ASSOCIATED = "associated"
CORRECTED = "corrected"
ESTIMATED = "estimated"
# What each mark means, as pages and the data dictionary say it.
MARKS = {
    EXTRAPOLATED: "outside the stated range of its curve",
    OUTSIDE_LIQUID_RANGE: "outside the liquid range",
    LOWER_BOUND: "no uncertainty stated: rounding of the printed value only, a lower bound",
    USUAL: "no uncertainty stated: the one customary for this kind of source stands in",
    CARRIED: "measured at another temperature and taken unchanged, uncertainty widened",
    ASSOCIATED: "the formula is not valid for associated liquids",
    CORRECTED: "a published value was set aside or replaced, see the corrections",
    ESTIMATED: "not measured: estimated from the structure or from other quantities",
}
EDGE = 0.051  # K: printed ends of ranges are rounded


@dataclass(frozen=True)  # without slots: a handbook of kept values is read twice as fast
class Value:
    """One number of the handbook with everything that must travel with it.

    ``value`` and ``uncertainty`` (standard) are in the quantity's unit, ``temperature`` in kelvin
    (None where the quantity has none). ``basis`` is measured, curve, computed or estimated.
    """

    quantity: str
    value: float
    uncertainty: float
    temperature: float | None
    basis: str
    sources: tuple[str, ...]
    marks: tuple[str, ...] = ()


@dataclass(frozen=True, slots=True)
class LiquidRange:
    """Melting and boiling point [K], None where not known."""

    low: float | None
    high: float | None

    def holds(self, temperature: float) -> bool:
        """Whether the substance is liquid at ``temperature`` [K], as far as is known."""
        above = self.low is None or temperature >= self.low - EDGE
        return above and (self.high is None or temperature <= self.high + EDGE)


def stated_or_usual(
    dataset: Dataset, source: str, key: str, stated: float | None, value: float, floor: float
) -> tuple[float, str | None]:
    """Standard uncertainty [unit of ``key``] of a table entry, and its mark.

    The stated one; else what is customary for the kind of source (table ``uncertainties``); else
    the rounding half-width ``floor`` as a marked lower bound. Never below the rounding, but that
    a bare 0 was not rounded to whole units.
    """
    if stated is not None:
        return stated, None
    kind = dataset.sources[source].kind if source in dataset.sources else ""
    usual = dataset.usual_uncertainty(kind, key, value)
    if usual is None:
        return floor, LOWER_BOUND
    return max(usual, floor if value else 0.0), USUAL


def uncertainty_of(dataset: Dataset, point: Measurement) -> tuple[float, str | None]:
    """Standard uncertainty [the quantity's unit] of a point of the tables, and its mark."""
    return stated_or_usual(
        dataset,
        point.source,
        point.quantity,
        point.uncertainty,
        point.value,
        point.half_width,
    )
