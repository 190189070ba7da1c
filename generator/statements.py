"""A cell found wanting, in words: its place, what stands there, the votes, what settles it."""

from __future__ import annotations

import math

from generator.blame import Blame, column_of, curve_of, point_of, quantity_of
from generator.dataset import Solvent
from generator.errors import Problem
from generator.facts import TEMPERATURE, Facts, celsius
from generator.identity import CAS, SMILES
from generator.outcome import CHECKS, YES_OR_NO, Outcome
from generator.quantities import QUANTITIES
from generator.spreads import LIMIT, Spreads

_UNITS = {"1": "", "degC": " °C", "cm3/mol": " cm³/mol", "g/cm3": " g/cm³"}
# A rival that saves less than this much less than the cell named is nearly as likely.
_CLOSE = 1.0
# Ratios beyond this say the same [natural logarithm].
_MOST = 50.0
_LOOK_UP = "look it up in the source named, or bring a second source"


def problem_of(solvent: Solvent, facts: Facts, blame: Blame, spreads: Spreads) -> Problem:
    """The finding about one cell of a substance."""
    votes = "; ".join(_sentence(outcome, spreads) for outcome in blame.failed)
    cleared = sorted({CHECKS[o.check].title for o in blame.passed})
    passed = f". Passed: {', '.join(cleared)}" if cleared else ""
    file, line, found, expected = _cell(solvent, facts, blame)
    return Problem(
        file=file,
        line=line,
        column=column_of(blame.cell),
        kind=blame.failed[0].check,
        found=found,
        expected=expected,
        hint=_hint(facts, blame),
        severity="suspect",
        evidence=votes + passed,
        strength=round(blame.strength, 3),
    )


def _number(value: float, unit: str) -> str:
    if not math.isfinite(value):
        return "not a number"
    text = f"{value:.5g}" if abs(value) < 1e5 else f"{value:.3e}"
    return f"{text}{_UNITS.get(unit, f' {unit}')}"


def _sentence(outcome: Outcome, spreads: Spreads) -> str:
    """One vote with both numbers, their gap and the limit."""
    check = CHECKS[outcome.check]
    if check.unit == YES_OR_NO:
        return f"{check.title}: {outcome.what_found} is not {outcome.what_expected}"
    unit = outcome.unit or QUANTITIES[outcome.group].unit
    found, expected = float(outcome.found), float(outcome.expected)
    limit, centre = LIMIT * spreads.scale(outcome), spreads.centre(outcome)
    usual = expected * math.exp(centre) if check.relative else expected + centre
    gap = f"{found - usual:+.3g}, limit {limit:.2g}"
    if check.relative and unit == "K":
        gap = f"{found - usual:+.3g}, limit {usual * math.expm1(min(limit, _MOST)):.2g}"
    elif check.relative:
        beyond, limit = min(float(outcome.residual) - centre, _MOST), min(limit, _MOST)
        gap = f"{100 * math.expm1(beyond):+.3g} %, limit {100 * math.expm1(limit):.2g} %"
    if unit == "K":
        unit, found, expected, usual = "degC", *map(celsius, (found, expected, usual))
    shift = f", usual with it {_number(usual, unit)}" if abs(centre) > limit / LIMIT else ""
    return (
        f"{check.title}: {outcome.what_found} {_number(found, unit)}, {outcome.what_expected} "
        f"{_number(expected, unit)}{shift} ({gap})"
    )


def _cell(solvent: Solvent, facts: Facts, blame: Blame) -> tuple[str, int, str, str]:
    """File, line, what stands there and what was expected."""
    if blame.cell == SMILES:
        expected = facts.identity.listed or "a structure that fits the numbers"
        return "solvents.csv", solvent.line, solvent.smiles, expected
    if blame.cell == CAS:
        expected = facts.identity.likely_cas or "the CAS number of the name and the structure"
        return "solvents.csv", solvent.line, solvent.cas, expected
    name = QUANTITIES[quantity_of(blame.cell)].name.lower()
    if "~" in blame.cell:
        curve = curve_of(facts, blame.cell).row
        lead = blame.failed[0]
        other, words = lead.expected, lead.what_expected
        if words.startswith(curve_of(facts, blame.cell).label):
            other, words = lead.found, lead.what_found
        unit = lead.unit or QUANTITIES[curve.quantity].unit
        found = f"curve of {name} of {solvent.name} ({curve.printed})"
        return "correlations.csv", curve.line, found, f"{words} {_number(float(other), unit)}"
    point = point_of(facts, blame.cell)
    row = point.row
    if blame.cell.endswith(TEMPERATURE):
        found = f"{name} of {solvent.name} at {celsius(point.temperature):g} °C"
        return "measurements.csv", row.line, found, f"about {celsius(blame.best):.0f} °C"
    found = f"{row.printed} {row.printed_unit}".removesuffix(" 1")
    best = f"about {_number(blame.best, QUANTITIES[row.quantity].unit)}"
    if blame.failed[0].check == "repeated":
        best = "a figure of its own; this one may be an upper limit"
    return "measurements.csv", row.line, f"{name} of {solvent.name}: {found}", best


def _hint(facts: Facts, blame: Blame) -> str:
    """What would settle it."""
    if blame.cell == SMILES:
        return "draw the structure again from the name and the CAS number"
    if blame.cell == CAS:
        return "look the number up by the name"
    settle = f"{blame.slip.words}; {_LOOK_UP}" if blame.slip is not None else _LOOK_UP
    if _as_printed(facts, blame.cell):
        settle += "; the open table prints it so"
    if blame.lead < _CLOSE and blame.rival:
        settle += f"; nearly as likely: {_words(facts, blame.rival)}"
    return settle


def _as_printed(facts: Facts, cell: str) -> bool:
    """Whether the typed cell was compared with the table it is from, and stood up."""
    if cell.endswith(TEMPERATURE) or "~" in cell:
        return False
    point = point_of(facts, cell)
    there = facts.prints.get((point.row.quantity, point.row.source))
    return there is not None and there.value == point.row.printed


def _words(facts: Facts, cell: str) -> str:
    if cell in (SMILES, CAS):
        return "the structure" if cell == SMILES else "the CAS number"
    name = QUANTITIES[quantity_of(cell)].name.lower()
    if "~" in cell:
        return f"the curve of the {name} ({curve_of(facts, cell).row.source})"
    source = point_of(facts, cell).row.source
    if cell.endswith(TEMPERATURE):
        return f"the temperature of the {name} ({source})"
    return f"the {name} ({source})"
