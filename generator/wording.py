"""Numbers, units, temperatures and formulas as they are printed."""

from __future__ import annotations

import json
import math
import re
from collections.abc import Mapping
from functools import lru_cache

from markupsafe import Markup, escape

from generator import values
from generator.contexts import Link, Mark, Number
from generator.quantities import QUANTITIES, Quantity
from generator.uncertainty import format_value
from generator.units import ZERO_CELSIUS
from generator.values import Value

MINUS = "\u2212"
# The letter beside a number in a table, and the word for it where there is room for a word.
_LETTERS = {
    values.EXTRAPOLATED: ("x", "extrapolated"),
    values.OUTSIDE_LIQUID_RANGE: ("o", "not liquid"),
    values.LOWER_BOUND: ("r", "rounding only"),
    values.USUAL: ("u", "customary"),
    values.CARRIED: ("t", "other temperature"),
    values.ASSOCIATED: ("a", "associated"),
    values.CORRECTED: ("c", "corrected"),
    values.ESTIMATED: ("e", "estimated"),
}
MARKS = tuple(
    Mark(key, *_LETTERS.get(key, (key[0], key)), meaning) for key, meaning in values.MARKS.items()
)
_EXPONENTS = str.maketrans("-0123456789", "⁻⁰¹²³⁴⁵⁶⁷⁸⁹")
_UNIT_WORDS = {"degC": "°C", "degF": "°F", "1": ""}


@lru_cache(maxsize=256)
def unit_label(unit: str) -> str:
    """A table unit as it is printed: ``cm3/mol`` gives ``cm³ mol⁻¹``."""
    if unit in _UNIT_WORDS:
        return _UNIT_WORDS[unit]
    above, *below = unit.split("/")
    parts = []
    for position, group in enumerate([above, *below]):
        for word in group.split():
            found = re.fullmatch(r"(\D+?)(\d*)", word)
            if found is None:  # the bare "1" of a unit such as 1/K
                continue
            power = int(found[2] or 1) * (-1 if position else 1)
            exponent = "" if power == 1 else str(power).translate(_EXPONENTS)
            parts.append(found[1] + exponent)
    return " ".join(parts)


def celsius(temperature: float, decimals: int = 2) -> str:
    """A temperature [K] as digits in °C, with a real minus sign."""
    degrees = round(temperature - ZERO_CELSIUS, decimals)
    return f"{degrees + 0.0:g}".replace("-", MINUS)


def celsius_label(temperature: float) -> str:
    """A temperature [K] with its unit: ``25 °C``."""
    return f"{celsius(temperature)} °C"


def range_label(low: float | None, high: float | None) -> str:
    """A range of temperatures [K] to a tenth; an end that is not known is left open."""
    if low is None:
        return "not known" if high is None else f"up to {celsius(high, 1)} °C"
    if high is None:
        return f"from {celsius(low, 1)} °C"
    return f"{celsius(low, 1)} to {celsius(high, 1)} °C"


_POWER = re.compile(r"e([+-]?)0*(\d+)$", re.IGNORECASE)


def printed_label(printed: str, unit: str) -> str:
    """A number as its source prints it, with its unit; ``8e-06`` becomes a power of ten."""
    found = _POWER.search(printed)
    if found:
        power = ("-" if found[1] == "-" else "") + found[2]
        printed = f"{printed[: found.start()]}×10{power.translate(_EXPONENTS)}"
    return f"{printed.replace('-', MINUS)} {unit_label(unit)}".strip()


_HYPHEN_MINUS = re.compile(r"(?<![\w-])-(?=\d)")
_UNIT_IN_PROSE = re.compile(r"\bdeg([CF])\b")


def prose(text: str) -> str:
    """Text of a finding as it is printed: real minus signs, ``degC`` as ``°C``."""
    return _UNIT_IN_PROSE.sub(r"°\1", _HYPHEN_MINUS.sub(MINUS, text))


def formula_markup(formula: str) -> Markup:
    """A plain formula with its indices set low: ``C2H6O`` gives ``C₂H₆O``."""
    return Markup(re.sub(r"(\d+)", r"<sub>\1</sub>", str(escape(formula))))


@lru_cache(maxsize=256)
def symbol_markup(symbol: str) -> Markup:
    """A quantity's symbol with what follows an underscore set low."""
    head, _, index = symbol.partition("_")
    if not index:
        return escape(symbol)
    low, bracket, rest = index.partition("(")
    return Markup("{}<sub>{}</sub>{}").format(head, low, bracket + rest)


def script_json(content: object) -> Markup:
    """JSON that may stand inside a script element: no ``<`` ends it early."""
    text = json.dumps(content, ensure_ascii=False, separators=(",", ":"))
    return Markup(text.replace("<", "\\u003c"))


@lru_cache(maxsize=128)
def math_markup(formula: str, *, block: bool = True) -> Markup:
    """A LaTeX formula as MathML, which browsers draw without any script."""
    from latex2mathml.converter import convert

    if not formula:
        return Markup("")
    return Markup(convert(formula, display="block" if block else "inline"))


def labelled(svg: str, text: str) -> Markup:
    """A drawing that says what it shows to those who do not see it."""
    return Markup(svg.replace('role="img"', f'role="img" aria-label="{escape(text)}"', 1))


def number(
    value: Value | None,
    sources: Mapping[str, Link],
    *,
    quantity: Quantity | None = None,
) -> Number | None:
    """A value of the handbook as a printable number; ``None`` stays ``None``.

    ``sources`` leads from the key of a source to its link, relative to the page being made.
    """
    if value is None or not math.isfinite(value.value):
        return None
    definition = quantity or QUANTITIES[value.quantity]
    text, uncertainty = split_value(value.value, value.uncertainty, definition.decimals)
    return Number(
        raw=f"{value.value:.7g}",
        value=text,
        uncertainty=uncertainty,
        unit=unit_label(definition.unit),
        temperature="" if value.temperature is None else celsius_label(value.temperature),
        basis=value.basis,
        marks=_marks(value.marks),
        sources=tuple(sources[key] for key in value.sources if key in sources),
    )


@lru_cache(maxsize=256)
def _marks(keys: tuple[str, ...]) -> tuple[Mark, ...]:
    return tuple(mark for mark in MARKS if mark.key in keys)


@lru_cache(maxsize=256)
def marks_markup(marks: tuple[Mark, ...]) -> Markup:
    """The letters of some marks, set high; the legend of the page says what they mean."""
    letters = "".join(mark.letter for mark in marks)
    return Markup('<sup class="mark">{}</sup>').format(letters) if letters else Markup("")


def cell_markup(number: Number | None, extra: str = "", pad: str = "") -> Markup:
    """A number as a table cell: its decimal point in line, marks and uncertainty beside it.

    ``pad`` are the classes that put it in line. Made here and not in a template, and of as few
    elements as can be, because a datasheet has some two hundred of them and a comparison table of
    a thousand substances twenty thousand.
    """
    head, tail = cell_parts(number, extra)
    return Markup(f"{head}{pad}{tail}")


def cell_parts(number: Number | None, extra: str = "") -> tuple[str, str]:
    """The same cell in two parts, which the classes that put it in line come between."""
    if number is None:
        return '<td class="n', f'{" none " + extra if extra else " none"}">–</td>'
    own = f"<small>±\u202f{number.uncertainty}</small>" if number.uncertainty else ""
    return '<td class="n', (
        f'{" " + extra if extra else ""}" data-v="{number.raw}">{number.value}'
        f"{marks_markup(number.marks)}{own}</td>"
    )


def split_value(value: float, uncertainty: float | None, decimals: int) -> tuple[str, str]:
    """The digits of a value and of its uncertainty, each on its own ("" where there is none)."""
    own = math.nan if uncertainty is None else uncertainty
    text = format_value(value, own, decimals)
    if text.startswith("("):  # (1.5 ± 0.2)×10⁻⁶: the power belongs to both
        inside, _, power = text[1:].partition(")")
        head, _, tail = inside.partition(" ± ")
        return head + power, tail + power
    head, _, tail = text.partition(" ± ")
    return head, tail


def padding(most: int, own: int) -> str:
    """Classes of a cell in whose column the longest number has ``most`` decimals, it ``own``.

    So many digits are missing, and the point as well; -1 stands for no number at all.
    """
    point = " point" if own == 0 < most else ""
    return f"{point} pad{most - own}" if most > own >= 0 else ""


def places(number: Number | None) -> int:
    """Digits behind the decimal point, -1 without a number; a power of ten counts as none."""
    if number is None:
        return -1
    return 0 if "×" in number.value else len(number.value.partition(".")[2])


def marks_of(*numbers: Number | None) -> tuple[Mark, ...]:
    """The marks that occur among these numbers, each once, in the steady order."""
    present = {mark.key for item in numbers if item for mark in item.marks}
    return tuple(mark for mark in MARKS if mark.key in present)
