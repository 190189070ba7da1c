"""Classes of flammable liquids by flash and boiling point: one table, with its standard.

Sorting by criteria, not a classification of a product: the supplier's safety data sheet comes
first. A class is never inferred where one of its inputs is missing.
"""

from __future__ import annotations

from dataclasses import dataclass

STANDARD = (
    "United Nations, Globally Harmonized System of Classification and Labelling of Chemicals "
    "(GHS), chapter 2.6, table 2.6.1; categories 1 to 3 as in Regulation (EC) No 1272/2008 (CLP), "
    "annex I, 2.6"
)


@dataclass(frozen=True, slots=True)
class FlashClass:
    """One category; the bounds say ``low`` to ``high`` of the flash point [°C].

    ``low_boiling`` is whether the boiling point must be at most ``LOW_BOILING``; None where the
    category does not ask for it.
    """

    key: str
    label: str
    criterion: str
    low: float
    high: float
    low_boiling: bool | None


LOW_BOILING = 35.0  # °C
_BELOW_23 = 23.0 - 1e-9  # °C: categories 1 and 2 end below 23 °C, category 3 starts there
CLASSES = (
    FlashClass(
        "1", "category 1", "flash point below 23 °C, boiling point up to 35 °C",
        float("-inf"), _BELOW_23, True,
    ),
    FlashClass(
        "2", "category 2", "flash point below 23 °C, boiling point above 35 °C",
        float("-inf"), _BELOW_23, False,
    ),
    FlashClass("3", "category 3", "flash point from 23 °C to 60 °C", 23.0, 60.0, None),
    FlashClass("4", "category 4", "flash point above 60 °C, up to 93 °C", 60.0, 93.0, None),
    FlashClass("0", "above category 4", "flash point above 93 °C", 93.0, float("inf"), None),
)  # fmt: skip


def flash_class(flash_point: float | None, boiling_point: float | None) -> FlashClass | None:
    """The class of a liquid; None where an input that the criteria ask for is missing.

    ``flash_point`` and ``boiling_point`` [°C], None where not known.
    """
    if flash_point is None:
        return None
    # From the top down: a flash point on a bound belongs to the more dangerous side.
    found = next(c for c in CLASSES if flash_point <= c.high)
    if found.low_boiling is None:
        return found
    if boiling_point is None:
        return None
    return CLASSES[0] if boiling_point <= LOW_BOILING else CLASSES[1]


def class_label(found: FlashClass | None) -> str:
    """A class with its criterion, or why there is none."""
    if found is None:
        return "not known: flash point or boiling point is missing"
    return f"{found.label} ({found.criterion})"
