"""The methods page: definitions, rules, and how well the models meet the handbook's own data."""

from __future__ import annotations

from collections import Counter
from collections.abc import Mapping

from markupsafe import Markup

from generator import estimates, reconcile, thermal, uncertainty
from generator.accuracy import comparisons
from generator.catalogue import Catalogue, anchor
from generator.listings import CurveForm, Customary, Method, ModelCheck, Rules
from generator.metrics import POLAR_ABOVE, SURELY_POLAR, UNPOLAR_BELOW
from generator.quantities import QUANTITIES
from generator.wording import math_markup, symbol_markup, unit_label


def methods() -> tuple[tuple[Method, ...], tuple[Method, ...]]:
    """Measured and derived quantities, each with its formula, validity and source."""
    made = {"measured": [], "derived": []}  # type: dict[str, list[Method]]
    for quantity in QUANTITIES.values():
        unit = unit_label(quantity.unit)
        made[quantity.kind].append(
            Method(
                anchor(quantity.key),
                quantity.name,
                symbol_markup(quantity.symbol),
                unit or "1",
                math_markup(quantity.formula),
                quantity.definition,
                quantity.validity,
                quantity.source,
                str(quantity.decimals),
                f"{quantity.low:g} to {quantity.high:g} {unit}".strip().replace("-", "\u2212"),
            )
        )
    return tuple(made["measured"]), tuple(made["derived"])


def curve_forms(catalogue: Catalogue) -> tuple[CurveForm, ...]:
    """The forms a temperature curve may have, and how many curves of the handbook have it."""
    used = Counter(curve.form for curve in catalogue.handbook.dataset.correlations)
    return tuple(
        CurveForm(
            f"form-{anchor(key)}",
            key,
            ", ".join(form.coefficients),
            math_markup(form.formula),
            form.source,
            f"{used[key]} curves" if used[key] != 1 else "1 curve",
        )
        for key, form in thermal.FORMS.items()
    )


def rules(catalogue: Catalogue) -> Rules:
    """The numbers in the rules by which values are chosen and judged."""
    return Rules(
        reach=f"{reconcile.REACH:g} K",
        same=f"{reconcile.SAME_TEMPERATURE:g} K",
        outlier=f"{reconcile.OUTLIER:g}",
        samples=str(uncertainty.SAMPLES),
        coverage=f"{thermal.COVERAGE_95:.2f}",
        polar=f"{POLAR_ABOVE:g}",
        unpolar=f"{UNPOLAR_BELOW:g}",
        surely=f"{SURELY_POLAR:g}",
        expansion=f"{100 * estimates.EXPANSION_SPREAD:.0f} %",
        onsager=f"{100 * estimates.PERMITTIVITY_SPREAD:.0f} %",
        maxwell=f"{100 * estimates.UNPOLAR_SPREAD:g} %",
        customary=tuple(
            Customary(
                kind.replace("-", " "),
                QUANTITIES[key].name,
                _share(usual.absolute, usual.relative, QUANTITIES[key].unit),
                usual.reason,
            )
            for (kind, key), usual in catalogue.handbook.dataset.usual.items()
            if key in QUANTITIES
        ),
    )


def _share(absolute: float, relative: float, unit: str) -> str:
    parts = [f"{absolute:g} {unit_label(unit)}".strip()] if absolute else []
    parts += [f"{100 * relative:g} %"] if relative else []
    return " + ".join(parts) or "0"


def model_checks(catalogue: Catalogue, figures: Mapping[str, str]) -> tuple[ModelCheck, ...]:
    """Each model against measured numbers, in words and as a figure where one was drawn."""
    return tuple(
        ModelCheck(
            f"accuracy-{anchor(found.key)}",
            found.title,
            found.words,
            Markup(figures.get(f"accuracy:{found.key}", "")),
        )
        for found in comparisons(catalogue.handbook)
    )
