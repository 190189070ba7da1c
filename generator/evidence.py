"""Cross-checks of the data with each other and with physics → suspects, with the evidence.

Every comparison between cells (``expectations``) is measured against what is usual (``spreads``);
where one lies beyond its limit, the cell most likely wrong is found (``blame``) and named with
the numbers of every check that voted. Suspects only: nothing here stops a build.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, replace

from generator import dipoles, estimates
from generator.blame import Blame, blamed, curve_of, point_of
from generator.cache import Cache, digest
from generator.dataset import Correction, Dataset
from generator.errors import Problem
from generator.expectations import outcomes
from generator.facts import Facts, View, facts_of, structure_of
from generator.identity import CAS, SMILES, identify, printed
from generator.kept import code, kept
from generator.neighbours import placed, sketch, surroundings
from generator.parallel import shared_out
from generator.quantities import MEASURED
from generator.spreads import Spreads, Threshold, compared, spreads_for, suspected, thresholds
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


NOT_JUDGED = Review((), (), ())
"""What a handbook that nobody cross-checked has to show."""


def review(
    dataset: Dataset, molecules: Mapping[str, Molecule], cache: Cache | None = None
) -> Review:
    """Suspects, those a correction of action ``keep`` silences with its reason, and limits.

    ``cache`` keeps whatever follows from a structure, from a substance, or from a substance, its
    neighbours and the limits it is judged by.
    """
    cache = cache or Cache(None)
    version = code()
    results = kept(cache, "findings", dataset.revisions, version)
    slugs = tuple(dataset.solvents)

    # Who a substance is does not change with its values.
    named = {slug: digest(replace(s, line=0), version) for slug, s in dataset.solvents.items()}
    by_name = results.under(named)

    def backgrounds(some: Sequence[str]) -> list[Facts]:
        origins = by_name.each(
            some, "origin", lambda few: [_origin(dataset, slug, molecules[slug]) for slug in few]
        )
        return _backgrounds(dataset, origins, cache)

    known = results.each(slugs, "background", backgrounds)
    sketches = results.each(
        slugs, "sketch", lambda some: [sketch(_facts(dataset, known[slug])) for slug in some]
    )
    around = surroundings(list(sketches.values()))

    def facts(slug: str) -> Facts:
        return placed(_facts(dataset, known[slug]), around[slug])

    found = results.each(
        slugs,
        "comparisons",
        lambda some: [compared(outcomes(View(facts(slug)))) for slug in some],
        beside=around,
    )
    spreads = spreads_for(found.values())
    judged = results.each(
        suspected(found, spreads),
        "judgement",
        lambda some: [_judged(dataset, facts(slug), spreads) for slug in some],
        beside=around,
        stands=lambda judgement: spreads.give(judgement.limits),
    )
    problems, silenced = [], []
    for slug, judgement in judged.items():
        lines = _lines(dataset, slug)
        for problem, decision in judgement.problems:
            there = replace(problem, line=lines[problem.file][problem.line])
            if decision is None:
                problems.append(there)
            else:
                silenced.append((there, decision))
    results.save(forget=True)
    ordered = sorted(problems, key=lambda p: (-p.strength, p))
    return Review(tuple(ordered), tuple(silenced), thresholds(spreads))


@dataclass(frozen=True)
class _Judgement:
    """What is held against one substance, and the limits it was judged by.

    ``problems`` have the position of a row among the substance's own in the place of its line,
    so that they hold wherever the rows stand; beside each the reason why it is silenced, if it is.
    """

    problems: tuple[tuple[Problem, str | None], ...]
    limits: Mapping[tuple[str, str], tuple[float, float]]


def _judged(dataset: Dataset, facts: Facts, spreads: Spreads) -> _Judgement:
    asked: dict[tuple[str, str], tuple[float, float]] = {}
    tracing = replace(spreads, asked=asked)
    lines, problems = _lines(dataset, facts.slug), []
    for blame in blamed(facts, tracing):
        problem = problem_of(dataset.solvents[facts.slug], facts, blame, tracing)
        decision = _kept(dataset, facts, blame)
        place = lines[problem.file].index(problem.line)
        problems.append(
            (replace(problem, line=place), None if decision is None else decision.reason)
        )
    return _Judgement(tuple(problems), asked)


def _lines(dataset: Dataset, slug: str) -> Mapping[str, Sequence[int]]:
    """The lines of the rows of one substance, by file."""
    measured = [row.line for key in MEASURED for row in dataset.measurements_of(slug, key)]
    fitted = [row.line for key in MEASURED for row in dataset.correlations_of(slug, key)]
    return {
        "solvents.csv": [dataset.solvents[slug].line],
        "measurements.csv": measured,
        "correlations.csv": fitted,
    }


def prepared(
    dataset: Dataset, molecules: Mapping[str, Molecule], cache: Cache
) -> tuple[list[Facts], Spreads]:
    """The cells of every substance, and how far their comparisons usually lie apart."""
    known = everything(dataset, molecules, cache)
    around = surroundings([sketch(facts) for facts in known])
    found = [placed(facts, around[facts.slug]) for facts in known]
    return found, spreads_for(compared(outcomes(View(facts))) for facts in found)


def everything(dataset: Dataset, molecules: Mapping[str, Molecule], cache: Cache) -> list[Facts]:
    """The cells of some substances with what their structures and CAS numbers foretell."""
    origins = {slug: _origin(dataset, slug, known) for slug, known in molecules.items()}
    return [_facts(dataset, known) for known in _backgrounds(dataset, origins, cache)]


def _facts(dataset: Dataset, background: Facts) -> Facts:
    """The cells of a substance on a background."""
    own = facts_of(dataset, background.slug, background.structure)
    return replace(background, points=own.points, curves=own.curves)


_Origin = tuple[Facts, bool]


def _origin(dataset: Dataset, slug: str, known: Molecule) -> _Origin:
    """What structure, name and CAS number foretell; and whether a moment can be estimated."""
    solvent = dataset.solvents[slug]
    who = identify(solvent)
    facts = Facts(slug, structure_of(known), {}, {}, identity=who, prints=printed(solvent.cas))
    # An estimate that no like molecule supports judges nothing.
    return facts, known.dipole_limit is None and dipoles.support(known.smiles) > 0


def _backgrounds(dataset: Dataset, origins: Mapping[str, _Origin], cache: Cache) -> list[Facts]:
    """What is foretold of some substances, their rows taken into account, without their cells."""
    moments = _moments(dataset, origins, cache)
    found = []
    for slug, (facts, _) in origins.items():
        who = facts.identity
        if who.relation != "same":  # then the rows have a say
            rows = [row for key in MEASURED for row in dataset.measurements_of(slug, key)]
            who = identify(dataset.solvents[slug], rows)
        listed = structure_of(molecule(who.listed)) if who.clashes else None
        found.append(replace(facts, estimate=moments.get(slug), identity=who, listed=listed))
    return found


def _moments(
    dataset: Dataset, origins: Mapping[str, _Origin], cache: Cache
) -> Mapping[str, tuple[float, float]]:
    """Estimated dipole moments [D] with their uncertainty, where a measured value waits for them.

    A measured moment, or a permittivity without one.
    """
    wanted = [
        slug
        for slug, (_, supported) in origins.items()
        if supported and any(dataset.measurements_of(slug, key) for key in _WAITING)
    ]

    def estimated(share: Sequence[str]) -> list[tuple[float, float] | None]:
        known = [origins[slug][0].structure.molecule for slug in share]
        return [estimates.dipole_moment(structure, cache) for structure in known]

    found = zip(wanted, shared_out(estimated, wanted, _LEAST), strict=True)
    return {slug: moment for slug, moment in found if moment is not None}


def _kept(dataset: Dataset, facts: Facts, blame: Blame) -> Correction | None:
    """The laboratory's decision to leave a cell as it is, if there is one."""
    if blame.cell in (SMILES, CAS):
        return None
    row = curve_of(facts, blame.cell).row if "~" in blame.cell else point_of(facts, blame.cell).row
    decision = dataset.decision_on(row)
    return decision if decision is not None and decision.action == "keep" else None
