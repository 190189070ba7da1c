"""Cross-checks of the data with each other and with physics → suspects, with the evidence.

Every comparison between cells (``expectations``) is measured against what is usual (``spreads``);
where one lies beyond its limit, the cell most likely wrong is found (``blame``) and named with
the numbers of every check that voted. Suspects only: nothing here stops a build.
"""

from __future__ import annotations

import math
from dataclasses import dataclass, replace

from generator.blame import Blame, blamed, clashes, column_of, curve_of, point_of
from generator.dataset import Correction, Dataset
from generator.errors import Problem
from generator.expectations import outcomes
from generator.facts import SMILES, TEMPERATURE, Facts, View, celsius, facts_of, structure_of
from generator.metrics import Handbook
from generator.neighbours import series_of
from generator.outcome import CHECKS, Outcome
from generator.quantities import QUANTITIES
from generator.spreads import LIMIT, Spreads, Threshold, spreads_for
from generator.spreads import thresholds as _thresholds

_UNITS = {"1": "", "degC": " °C", "cm3/mol": " cm³/mol", "g/cm3": " g/cm³", "D": " D"}


@dataclass(frozen=True)
class Review:
    """The findings of a handbook with the limits they were judged by."""

    problems: tuple[Problem, ...]
    kept: tuple[tuple[Problem, str], ...]
    thresholds: tuple[Threshold, ...]


def check_handbook(handbook: Handbook) -> tuple[Problem, ...]:
    """Every suspect of a handbook, strongest first."""
    return review(handbook).problems


def thresholds(handbook: Handbook) -> tuple[Threshold, ...]:
    """The limits of every check for this handbook, as the review page shows them."""
    return _thresholds(_prepared(handbook)[1])


def review(handbook: Handbook) -> Review:
    """Suspects, those a correction of action ``keep`` silences with its reason, and limits."""
    facts, spreads = _prepared(handbook)
    problems, kept = [], []
    for substance in facts:
        if not clashes(outcomes(View(substance)), spreads):
            continue
        for blame in blamed(substance, spreads):
            problem = _problem(handbook.dataset, substance, blame, spreads)
            decision = _kept(handbook.dataset, substance, blame)
            if decision is None:
                problems.append(problem)
            else:
                kept.append((problem, decision.reason))
    ordered = sorted(problems, key=lambda p: (-p.strength, p))
    return Review(tuple(ordered), tuple(kept), _thresholds(spreads))


def _prepared(handbook: Handbook) -> tuple[list[Facts], Spreads]:
    dataset = handbook.dataset
    facts = [
        facts_of(dataset, slug, structure_of(handbook.molecules[slug])) for slug in dataset.solvents
    ]
    series = series_of(facts)
    facts = [replace(f, series=series[f.slug]) for f in facts]
    return facts, spreads_for(o for f in facts for o in outcomes(View(f)))


def _kept(dataset: Dataset, facts: Facts, blame: Blame) -> Correction | None:
    """The laboratory's decision to leave a cell as it is, if there is one."""
    if blame.cell == SMILES or "~" in blame.cell:
        return None
    row = point_of(facts, blame.cell).row
    for decision in dataset.corrections:
        same = (decision.solvent, decision.quantity, decision.source) == (
            row.solvent,
            row.quantity,
            row.source,
        )
        near = decision.temperature is None or row.temperature is None
        near = near or abs((decision.temperature or 0) - (row.temperature or 0)) < 0.06
        if decision.action == "keep" and same and near:
            return decision
    return None


def _number(value: float, unit: str) -> str:
    if not math.isfinite(value):
        return "not a number"
    text = f"{value:.5g}" if abs(value) < 1e5 else f"{value:.3e}"
    return f"{text}{_UNITS.get(unit, f' {unit}')}"


def _sentence(outcome: Outcome, spreads: Spreads) -> str:
    unit = outcome.unit or QUANTITIES.get(outcome.group, QUANTITIES["density"]).unit
    found, expected = float(outcome.found), float(outcome.expected)
    usual = spreads.of(outcome.check, outcome.group)
    limit = LIMIT * math.hypot(usual.spread * outcome.weight, outcome.own)
    residual = float(outcome.residual)
    if CHECKS[outcome.check].relative:
        gap = f"{100 * math.expm1(residual):+.3g} %, limit {100 * limit:.2g} %"
    else:
        gap = f"{residual:+.3g}, limit {limit:.2g}"
    title = CHECKS[outcome.check].title
    return (
        f"{title}: {outcome.what_found} {_number(found, unit)}, {outcome.what_expected} "
        f"{_number(expected, unit)} ({gap})"
    )


def _problem(dataset: Dataset, facts: Facts, blame: Blame, spreads: Spreads) -> Problem:
    lead = blame.failed[0]
    votes = [_sentence(outcome, spreads) for outcome in blame.failed]
    cleared = sorted({o.check for o in blame.passed})
    evidence = "; ".join(votes)
    if cleared:
        evidence += f". Checks it passes: {', '.join(cleared)}"
    file, line, found, expected = _cell(dataset, facts, blame)
    return Problem(
        file=file,
        line=line,
        column=column_of(blame.cell),
        kind=lead.check,
        found=found,
        expected=expected,
        hint=_hint(blame),
        severity="suspect",
        evidence=evidence,
        strength=round(blame.strength, 3),
    )


def _cell(dataset: Dataset, facts: Facts, blame: Blame) -> tuple[str, int, str, str]:
    """File, line, what stands there and what was expected."""
    solvent = dataset.solvents[facts.slug]
    if blame.cell == SMILES:
        return "solvents.csv", solvent.line, solvent.smiles, "a structure that fits the numbers"
    if "~" in blame.cell:
        curve = curve_of(facts, blame.cell).row
        lead = blame.failed[0]
        other = lead.found if lead.members[0] != blame.cell else lead.expected
        unit = QUANTITIES[curve.quantity].unit
        found = f"curve of {QUANTITIES[curve.quantity].name.lower()} of {solvent.name}"
        return "correlations.csv", curve.line, found, f"about {_number(float(other), unit)}"
    point = point_of(facts, blame.cell)
    row = point.row
    if blame.cell.endswith(TEMPERATURE):
        found = f"{QUANTITIES[row.quantity].name.lower()} at {celsius(point.temperature):g} °C"
        return "measurements.csv", row.line, found, f"about {celsius(blame.best):.0f} °C"
    quantity = QUANTITIES[row.quantity]
    found = f"{row.printed} {row.printed_unit}".removesuffix(" 1")
    return (
        "measurements.csv",
        row.line,
        f"{quantity.name.lower()} of {solvent.name}: {found}",
        f"about {_number(blame.best, quantity.unit)}",
    )


def _hint(blame: Blame) -> str:
    """What would settle it."""
    if blame.slip is not None:
        return f"{blame.slip.words}; look it up in the source named"
    if blame.cell == SMILES:
        return "draw the structure again from the CAS number"
    settle = "look it up in the source named, or bring a second source"
    if blame.lead < 1.0 and blame.rival:
        settle += f"; nearly as likely: {_cell_words(blame.rival)}"
    return settle


def _cell_words(cell: str) -> str:
    if cell == SMILES:
        return "the structure"
    key = cell.removesuffix(TEMPERATURE).partition("#")[0].partition("~")[0]
    name = QUANTITIES[key].name.lower()
    if cell.endswith(TEMPERATURE):
        return f"the temperature of the {name}"
    return f"the curve of the {name}" if "~" in cell else f"the {name}"
