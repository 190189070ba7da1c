"""The only wiring: tables → checks → numbers → figures → pages and files. Knows no MkDocs."""

from __future__ import annotations

from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass
from pathlib import Path

from generator import (
    accuracy,
    checks,
    evidence,
    exports,
    figures,
    modelfigures,
    pages,
    sidebyside,
)
from generator.cache import Cache
from generator.catalogue import catalogue, without_findings
from generator.cells import ERROR, NOTE
from generator.dataset import dataset_from
from generator.errors import DatasetError, Problem
from generator.kept import code, kept
from generator.metrics import Handbook, Settings, compute
from generator.parallel import Begun
from generator.schema import read_package
from generator.structures import molecules
from generator.tables import read_tables


@dataclass(frozen=True)
class Site:
    """Everything a handbook is made of: finished pages and other files; and what was found.

    ``revision`` is that of the tables, ``substances`` how many there are.
    """

    pages: tuple[pages.Page, ...]
    files: Mapping[str, bytes]
    findings: tuple[Problem, ...]
    revision: str
    substances: int


def findings_of(data: Path, cache: Cache) -> tuple[Problem, ...]:
    """All there is to say about the tables, notes on how they were read included.

    Raises ``DatasetError``, which tells all there is to say, when some of it is an error.
    """
    tables = read_tables(data)
    structural = tuple(checks.check_tables(tables, cache))
    if any(problem.severity == ERROR for problem in structural):
        raise DatasetError(structural)
    dataset = dataset_from(tables)
    known = molecules([solvent.smiles for solvent in dataset.solvents.values()], cache)
    structures = {slug: known[solvent.smiles] for slug, solvent in dataset.solvents.items()}
    return *structural, *evidence.review(dataset, structures, cache).problems


def _numbers(
    data: Path, settings: Settings, cache: Cache, say: Callable[[str], None]
) -> tuple[Handbook, tuple[Problem, ...]]:
    """The numbers, and what there is to say about the tables before they are looked at."""
    say("Reading and checking the tables")
    tables = read_tables(data)
    begun = Begun(lambda: tuple(checks.check_tables(tables, cache)))
    try:
        dataset = dataset_from(tables)
        say(f"Working out the numbers of {len(dataset.solvents)} substances")
        common = code(), settings, sorted(dataset.usual.items())
        handbook = compute(
            dataset, settings, cache, kept(cache, "numbers", dataset.revisions, *common)
        )
    finally:
        # Whatever went wrong with tables that are not fit to be used: this says what it was.
        structural = begun.result()
        if any(problem.severity == ERROR for problem in structural):
            raise DatasetError(structural)
    return handbook, structural


def review(
    data: Path, settings: Settings, cache: Cache | None = None
) -> tuple[Handbook, tuple[Problem, ...]]:
    """The numbers and every finding that is published; raises as ``findings_of``."""
    cache = cache or Cache(None)
    handbook, structural = _numbers(data, settings, cache, lambda stage: None)
    judged = evidence.review(handbook.dataset, handbook.molecules, cache)
    return handbook, _published((*structural, *judged.problems))


def _published(findings: Sequence[Problem]) -> tuple[Problem, ...]:
    return tuple(finding for finding in findings if finding.severity != NOTE)


def build_site(
    data: Path,
    settings: Settings,
    cache_folder: Path | None,
    known: Mapping[str, pages.Page] = pages.NO_PAGES,
    say: Callable[[str], None] = lambda stage: None,
) -> Site:
    """Make the whole handbook from the tables in ``data``.

    ``known`` are the pages of the published site by path: those that would come out the same are
    given back without a body. Raises ``DatasetError`` with every problem when the tables cannot
    be used.
    """
    cache = Cache(cache_folder)
    handbook, structural = _numbers(data, settings, cache, say)
    package = read_package(data)
    pages.keep_templates(cache)
    drawn = figures.figures_of(
        handbook, cache, lambda: modelfigures.draw(accuracy.comparisons(handbook), cache)
    )
    plain = without_findings(handbook)
    say("Cross-checking them, writing pages and files")
    # Three processes: the findings, the pages that do without them, and this one with the files.
    judging = Begun(lambda: evidence.review(handbook.dataset, handbook.molecules, cache))
    begun = pages.Begun(plain, settings, drawn, package, drawn.prepare_anew)
    files = {**exports.numbers(plain, data), sidebyside.PATH: sidebyside.data_script(plain)}
    judged = judging.result()
    findings = _published((*structural, *judged.problems))
    book = catalogue(handbook, findings, judged)
    made = pages.render_all(book, settings, drawn, package, known, drawn.prepare, begun)
    files |= exports.findings(book)
    handbook.kept.save(forget=True)
    cache.sweep()
    dataset = handbook.dataset
    return Site(made, files, findings, dataset.revision, len(dataset.solvents))
