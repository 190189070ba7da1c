"""The handbook's numbers as data frames, for a table on the terminal or a notebook elsewhere."""

from __future__ import annotations

from collections.abc import Sequence
from typing import TYPE_CHECKING

from generator.exports import values_of
from generator.metrics import Handbook
from generator.quantities import QUANTITIES
from generator.units import ZERO_CELSIUS

if TYPE_CHECKING:
    import pandas as pd


def values(handbook: Handbook) -> pd.DataFrame:
    """Every number, one a row: solvent, name, cas, family, quantity, temperature_c and the rest.

    ``temperature_c`` [°C] is missing where a quantity has none; ``value`` and ``uncertainty``
    (standard) are in ``unit``; ``sources`` and ``marks`` are joined by semicolons.
    """
    import pandas as pd

    rows = [
        (
            slug,
            solvent.name,
            solvent.cas,
            handbook.molecules[slug].family_label,
            value.quantity,
            None if value.temperature is None else round(value.temperature - ZERO_CELSIUS, 6),
            value.value,
            value.uncertainty,
            QUANTITIES[value.quantity].unit,
            value.basis,
            "; ".join(value.sources),
            "; ".join(value.marks),
        )
        for slug, solvent in handbook.dataset.solvents.items()
        for value in values_of(handbook, slug)
    ]
    columns = (
        "solvent", "name", "cas", "family", "quantity", "temperature_c", "value", "uncertainty",
        "unit", "basis", "sources", "marks",
    )  # fmt: skip
    return pd.DataFrame(rows, columns=list(columns))


def table(
    frame: pd.DataFrame,
    quantities: Sequence[str],
    temperature: float,
    *,
    family: str = "",
    uncertainties: bool = False,
) -> pd.DataFrame:
    """One row a substance, one column a quantity [its unit], at ``temperature`` [°C].

    Substances that lack all of the quantities there are left out; ``family`` keeps those whose
    family holds the word. With ``uncertainties`` each quantity has a second column.
    """
    there = frame["temperature_c"].isna() | ((frame["temperature_c"] - temperature).abs() < 1e-3)
    kept = frame[there & frame["quantity"].isin(quantities)]
    if family:
        kept = kept[kept["family"].str.contains(family, case=False, regex=False)]
    shown = ["value", "uncertainty"] if uncertainties else ["value"]
    wide = kept.pivot(index=["name", "cas"], columns="quantity", values=shown)
    order = [(kind, key) for key in quantities for kind in shown if (kind, key) in wide.columns]
    wide = wide[order]
    wide.columns = [f"u({key})" if kind == "uncertainty" else key for kind, key in order]
    return wide.sort_values(list(wide.columns[:1]), ascending=False, kind="stable")
