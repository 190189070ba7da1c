"""Cross-checks of the data with each other and with physics → suspects, with the evidence.

Every comparison between cells (``expectations``) is measured against what is usual (``spreads``);
where one lies beyond its limit, the cell most likely wrong is found (``blame``) and named with
the numbers of every check that voted. Suspects only: nothing here stops a build.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, replace

from generator import estimates
from generator.agreement import KAPPA
from generator.blame import Blame, blamed, curve_of, point_of
from generator.cache import Cache
from generator.dataset import Correction, Dataset
from generator.errors import Problem
from generator.expectations import outcomes
from generator.facts import Facts, View, facts_of, structure_of
from generator.identity import CAS, SMILES, identify, printed
from generator.metrics import Handbook
from generator.neighbours import series_of, with_repeats
from generator.parallel import shared_out
from generator.quantities import MEASURED
from generator.spreads import Spreads, Threshold, spreads_for, thresholds
from generator.statements import problem_of
from generator.structures import Molecule, molecule

_WAITING = ("dipole_moment", "relative_permittivity")
# Fewer estimates than this for each helper are not worth starting one.
_LEAST = 8


@dataclass(frozen=True)
class Review:
    """The findings of a handbook with the limits they were judged by."""

    problems: tuple[Problem, ...]
    kept: tuple[tuple[Problem, str], ...]
    thresholds: tuple[Threshold, ...]


def check_handbook(handbook: Handbook, cache: Cache | None = None) -> tuple[Problem, ...]:
    """Every suspect of a handbook, strongest first."""
    return review(handbook, cache).problems


def review(handbook: Handbook, cache: Cache | None = None) -> Review:
    """Suspects, those a correction of action ``keep`` silences with its reason, and limits.

    ``cache`` keeps what is estimated from structures.
    """
    dataset = handbook.dataset
    facts, spreads = prepared(dataset, handbook.molecules, cache or Cache(None))
    problems, kept = [], []
    for substance in facts:
        for blame in blamed(substance, spreads):
            problem = problem_of(dataset.solvents[substance.slug], substance, blame, spreads)
            decision = _kept(dataset, substance, blame)
            if decision is None:
                problems.append(problem)
            else:
                kept.append((problem, decision.reason))
    ordered = sorted(problems, key=lambda p: (-p.strength, p))
    return Review(tuple(ordered), tuple(kept), thresholds(spreads))


def prepared(
    dataset: Dataset, molecules: Mapping[str, Molecule], cache: Cache
) -> tuple[list[Facts], Spreads]:
    """The cells of every substance, and how far their comparisons usually lie apart."""
    facts = with_repeats(everything(dataset, molecules, cache), KAPPA)
    series = series_of(facts)
    facts = [replace(f, series=series[f.slug]) for f in facts]
    return facts, spreads_for(o for f in facts for o in outcomes(View(f)))


def everything(dataset: Dataset, molecules: Mapping[str, Molecule], cache: Cache) -> list[Facts]:
    """The cells of every substance with what their structures and CAS numbers foretell."""
    moments = _moments(dataset, molecules, cache)
    found = []
    for slug, solvent in dataset.solvents.items():
        rows = [row for key in MEASURED for row in dataset.measurements_of(slug, key)]
        who = identify(solvent, rows)
        found.append(
            replace(
                facts_of(dataset, slug, structure_of(molecules[slug])),
                estimate=moments.get(slug),
                identity=who,
                prints=printed(solvent.cas),
                listed=structure_of(molecule(who.listed)) if who.clashes else None,
            )
        )
    return found


def _moments(
    dataset: Dataset, molecules: Mapping[str, Molecule], cache: Cache
) -> Mapping[str, tuple[float, float]]:
    """Estimated dipole moments [D] with their uncertainty, where a measured value waits for them.

    A measured moment, or a permittivity without one.
    """
    wanted = [
        slug
        for slug, structure in molecules.items()
        if structure.dipole_limit is None
        and any(dataset.measurements_of(slug, key) for key in _WAITING)
    ]

    def estimated(share: Sequence[str]) -> list[tuple[float, float] | None]:
        return [estimates.dipole_moment(molecules[slug], cache) for slug in share]

    found = zip(wanted, shared_out(estimated, wanted, _LEAST), strict=True)
    return {slug: moment for slug, moment in found if moment is not None}


def _kept(dataset: Dataset, facts: Facts, blame: Blame) -> Correction | None:
    """The laboratory's decision to leave a cell as it is, if there is one."""
    if blame.cell in (SMILES, CAS):
        return None
    row = curve_of(facts, blame.cell).row if "~" in blame.cell else point_of(facts, blame.cell).row
    decision = dataset.decision_on(row)
    return decision if decision is not None and decision.action == "keep" else None
