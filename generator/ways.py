"""How each derived number of a datasheet was found: formula, inputs and their shares."""

from __future__ import annotations

import math
from collections.abc import Mapping

from markupsafe import Markup

from generator.catalogue import Links, anchor
from generator.contexts import Link, Way, WayInput
from generator.metrics import DEPENDS, Handbook
from generator.quantities import QUANTITIES
from generator.uncertainty import format_value
from generator.values import Value
from generator.wording import math_markup, symbol_markup


def way_anchor(key: str) -> str:
    """Where on a datasheet the way to a derived quantity stands, "" for a published one."""
    return f"way-{anchor(key)}" if key in DEPENDS else ""


def ways(
    handbook: Handbook, slug: str, links: Links, numbered: Mapping[str, Link]
) -> tuple[Way, ...]:
    """The way to every derived quantity that has a number at a listed temperature."""
    inputs = {key: handbook.series(slug, key) for key in _INPUTS}
    texts = {key: tuple(_digits(value) for value in series) for key, series in inputs.items()}
    found = []
    for key in DEPENDS:
        quantity = QUANTITIES[key]
        if not any(handbook.series(slug, key)):
            continue
        rows = tuple(
            WayInput(
                QUANTITIES[used].name,
                symbol_markup(QUANTITIES[used].symbol),
                _origin(inputs[used]),
                _sources(inputs[used], numbered),
                tuple(
                    Markup('{}<span class="share">{}</span>').format(text, _percent(share))
                    if text and math.isfinite(share)
                    else Markup("–")
                    for text, share in zip(texts[used], shares, strict=True)
                ),
            )
            for used, shares in handbook.shares(slug, key).items()
        )
        found.append(
            Way(
                way_anchor(key),
                quantity.name,
                symbol_markup(quantity.symbol),
                math_markup(quantity.formula, block=False),
                links.method(key),
                rows,
            )
        )
    return tuple(found)


_INPUTS = tuple(dict.fromkeys(key for used in DEPENDS.values() for key in used))


def _digits(value: Value | None) -> str:
    if value is None:
        return ""
    decimals = QUANTITIES[value.quantity].decimals
    return format_value(value.value, value.uncertainty, decimals).replace(" ± ", "\u2009±\u2009")


def _percent(share: float) -> str:
    percent = round(100 * share)
    return f"{percent}\u202f%" if percent or share == 0 else "<1\u202f%"


def _origin(series: tuple[Value | None, ...]) -> str:
    """Measured, curve, computed or estimated: every basis that occurs."""
    return ", ".join(dict.fromkeys(v.basis for v in series if v is not None))


def _sources(series: tuple[Value | None, ...], numbered: Mapping[str, Link]) -> tuple[Link, ...]:
    keys = dict.fromkeys(key for v in series if v is not None for key in v.sources)
    return tuple(numbered[key] for key in keys if key in numbered)
