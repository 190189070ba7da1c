"""The whole way to one number: formula, inputs and their shares, sources, weights, rejections."""

from __future__ import annotations

import re
from collections.abc import Iterator
from dataclasses import dataclass, replace
from difflib import get_close_matches

from generator.cache import Cache
from generator.dataset import Correction, Dataset
from generator.inputs import anchor_temperature
from generator.metrics import Handbook, Settings, compute
from generator.quantities import QUANTITIES
from generator.reconcile import Candidate, Decision, decide
from generator.selection import OrderError
from generator.uncertainty import format_value
from generator.units import ZERO_CELSIUS
from generator.values import MARKS, LiquidRange, Value


@dataclass(frozen=True)
class Way:
    """How one number came about.

    ``share`` is its part in the variance of the number it is an input of (1 for the number asked
    for). ``inputs`` are those of a derived number; ``decision`` holds the candidates of a
    published one; ``corrections`` the laboratory's decisions about its rows; ``note`` says what
    else was done, "" where nothing was.
    """

    quantity: str
    value: Value | None
    share: float
    inputs: tuple[Way, ...]
    decision: Decision | None
    corrections: tuple[Correction, ...]
    note: str


def find_quantity(text: str) -> str:
    """Key of the quantity called ``text``: key, name or symbol.

    Raises ``OrderError`` with the nearest keys.
    """
    wanted = re.sub(r"[\s-]+", "_", text.strip())
    for key, quantity in QUANTITIES.items():
        if wanted.casefold() in (key, re.sub(r"[\s–-]+", "_", quantity.name.casefold())):
            return key
        if text.strip() == quantity.symbol:
            return key
    near = get_close_matches(wanted.casefold(), QUANTITIES, 3)
    hint = f"; nearest: {', '.join(near)}" if near else ""
    raise OrderError(f"no quantity is called {text!r}{hint}")


def only(dataset: Dataset, slug: str) -> Dataset:
    """The dataset as if it held one substance."""
    return replace(dataset, solvents={slug: dataset.solvents[slug]})


def explain(
    dataset: Dataset,
    settings: Settings,
    slug: str,
    key: str,
    temperature: float | None = None,
    cache: Cache | None = None,
) -> tuple[Handbook, Way]:
    """The way to one number at ``temperature`` [K], or at the substance's own reference."""
    if temperature is not None:
        settings = replace(settings, temperatures_c=(temperature - ZERO_CELSIUS,))
    handbook = compute(only(dataset, slug), settings, cache)
    at = None if temperature is None else handbook.temperatures[0]
    return handbook, way_to(handbook, slug, key, at)


def way_to(
    handbook: Handbook, slug: str, key: str, temperature: float | None = None, share: float = 1.0
) -> Way:
    """The way to one number of a handbook at a listed temperature [K] or the own reference."""
    value = handbook.at(slug, key, temperature)
    inputs = tuple(
        way_to(handbook, slug, part.value.quantity, temperature, part.share)
        for part in handbook.budget(slug, key, temperature)
    )
    decision: Decision | None = None
    corrections: tuple[Correction, ...] = ()
    if QUANTITIES[key].kind == "measured":
        decision = decision_at(handbook, slug, key, temperature)
        corrections = tuple(
            c for c in handbook.dataset.corrections if (c.solvent, c.quantity) == (slug, key)
        )
    return Way(key, value, share, inputs, decision, corrections, note(handbook, slug, value))


def decision_at(
    handbook: Handbook, slug: str, key: str, temperature: float | None = None
) -> Decision:
    """What was decided between the sources of a published quantity, with every candidate.

    For a refractive index brought over from another temperature: what was decided there.
    """
    if not QUANTITIES[key].needs_temperature:
        return decide(handbook.dataset, slug, key, None, LiquidRange(None, None))
    at = handbook.own_reference(slug) if temperature is None else temperature
    value = handbook.at(slug, key, temperature)
    if value is not None and value.basis == "computed":
        anchor = anchor_temperature(handbook.dataset, slug, at)
        return decide(handbook.dataset, slug, key, anchor, LiquidRange(None, None))
    return decide(handbook.dataset, slug, key, at, handbook.liquid_range(slug))


def note(handbook: Handbook, slug: str, value: Value | None) -> str:
    """What was done to a number beside weighing its sources and its formula."""
    if value is None:
        return ""
    if value.quantity == "refractive_index" and value.basis == "computed":
        at = anchor_temperature(handbook.dataset, slug, value.temperature or 0.0)
        return (
            f"brought over from {at - ZERO_CELSIUS:g} °C at constant molar refraction, with the "
            "densities there and here"
        )
    if value.quantity == "dipole_moment" and value.basis == "computed":
        return "zero by the symmetry of the structure"
    if value.basis == "estimated":
        return _ESTIMATES.get(value.quantity, "")
    if value.quantity == "temperature_coefficient":
        return handbook.trend(slug).remark
    return ""


_ESTIMATES = {
    "dipole_moment": "estimated from the structure, or calculated for one conformer; not measured",
    "relative_permittivity": "estimated by the Onsager equation from the dipole moment, the "
    "refractive index and the molar volume; not measured",
    "thermal_expansivity": "estimated from the boiling point; no density curve is known",
}


def lines(handbook: Handbook, way: Way, indent: str = "") -> Iterator[str]:
    """The way in words, a line each, inputs set in."""
    quantity = QUANTITIES[way.quantity]
    head = f"{indent}{quantity.name} {quantity.symbol}"
    if way.value is None:
        yield f"{head}: no value here"
    else:
        unit = "" if quantity.unit == "1" else f" {quantity.unit}"
        number = format_value(way.value.value, way.value.uncertainty, quantity.decimals)
        at = way.value.temperature
        place = "" if at is None else f" at {at - ZERO_CELSIUS:g} °C"
        part = f", {100 * way.share:.0f} % of the variance" if indent else ""
        yield f"{head} = {number}{unit}{place} ({way.value.basis}{part})"
    inner = indent + "    "
    if way.inputs:
        yield f"{inner}{plain_formula(quantity.formula)}"
    if way.note:
        yield f"{inner}{way.note}"
    if way.value is not None:
        yield from (f"{inner}mark: {MARKS[mark]}" for mark in way.value.marks)
    yield from _decided(way, inner)
    for part_of in sorted(way.inputs, key=lambda w: -w.share):
        yield from lines(handbook, part_of, inner)
    if not indent:
        named = dict.fromkeys(way.value.sources if way.value else ())
        yield from (f"[{key}] {handbook.sources[key].citation}" for key in named)


def _decided(way: Way, indent: str) -> Iterator[str]:
    if way.decision is None:
        return
    unit = QUANTITIES[way.quantity].unit
    unit = "" if unit == "1" else f" {unit}"
    for candidate in way.decision.candidates:
        yield (
            f"{indent}{weight_words(candidate)}: {candidate.value:.6g} ± "
            f"{candidate.uncertainty:.2g}{unit}, {candidate.remark} [{candidate.source}], "
            f"{candidate.file} line {candidate.line}"
        )
    if len(way.decision.candidates) > 1:
        yield f"{indent}Birge ratio {way.decision.birge_ratio:.2f}"
    for correction in way.corrections:
        yield (
            f"{indent}decision of {correction.date}: {correction.action} "
            f"{correction.published_value} [{correction.source}], {correction.reason}"
        )


def weight_words(candidate: Candidate) -> str:
    """The part a candidate has in the mean, in words."""
    if candidate.weight <= 0:
        return "set aside"
    percent = round(100 * candidate.weight)
    return f"weight {percent} %" if percent else "weight below 1 %"


_WORDS = {
    r"\varepsilon": "ε", r"\mu": "μ", r"\rho": "ρ", r"\kappa": "κ", r"\alpha": "α", r"\tau": "τ",
    r"\pi": "π", r"\infty": "∞", r"\sum": "Σ", r"\Delta": "Δ", r"\lambda": "λ", r"\left": "",
    r"\right": "", r"\mathrm": "", r"\text": "", r"\qquad": " ", r"\quad": " ", r"\,": " ",
    r"\;": " ", r"\ ": " ",
}  # fmt: skip
# A piece in braces, which may hold others.
_PIECE = r"\{((?:[^{}]|\{(?:[^{}]|\{[^{}]*\})*\})*)\}"
_FRACTION = re.compile(r"\\frac" + _PIECE + _PIECE)
_ROOT = re.compile(r"\\sqrt" + _PIECE)
_COMMANDS = re.compile("|".join(re.escape(c) for c in sorted(_WORDS, key=len, reverse=True)))


def plain_formula(formula: str) -> str:
    """A LaTeX formula of the registry as one line of text."""
    previous = ""
    while previous != formula:
        previous = formula
        formula = _ROOT.sub(lambda m: f"√({m[1]})", formula)
        formula = _FRACTION.sub(lambda m: f" {_grouped(m[1])}/{_grouped(m[2])} ", formula)
    formula = _COMMANDS.sub(lambda m: _WORDS[m[0]], formula)
    text = " ".join(formula.replace("{", "").replace("}", "").split())
    return re.sub(r"(?<=\() | (?=[)^])", "", text)


def _grouped(text: str) -> str:
    """A numerator or denominator, in brackets where it is more than one symbol."""
    bare = _COMMANDS.sub(lambda m: _WORDS[m[0]] or "", text)
    return text if re.fullmatch(r"[\w.{}]+", bare) else f"({text})"
