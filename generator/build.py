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
from generator.catalogue import catalogue
from generator.cells import ERROR, NOTE
from generator.dataset import dataset_from
from generator.errors import DatasetError, Problem
from generator.kept import code, kept
from generator.metrics import Handbook, Settings, compute
from generator.schema import read_package
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


def inspect(
    data: Path,
    settings: Settings,
    cache: Cache | None = None,
    say: Callable[[str], None] = lambda stage: None,
) -> tuple[Handbook, tuple[Problem, ...], evidence.Review]:
    """The numbers and all there is to say about the tables, notes on how they were read included.

    The cross-checks come with what they left alone and the limits they judged by. ``say`` is told
    each stage before it starts. Raises ``DatasetError``, which tells all there is to say, when
    some of it is an error.
    """
    cache = cache or Cache(None)
    say("Reading and checking the tables")
    tables = read_tables(data)
    structural = checks.check_tables(tables, cache)
    if any(problem.severity == ERROR for problem in structural):
        raise DatasetError(structural)
    dataset = dataset_from(tables)
    say(f"Working out the numbers of {len(dataset.solvents)} substances")
    common = code(), settings, sorted(dataset.usual.items())
    handbook = compute(dataset, settings, cache, kept(cache, dataset.revisions, *common))
    say("Cross-checking them")
    judged = evidence.review(handbook, cache)
    return handbook, (*structural, *judged.problems), judged


def review(
    data: Path,
    settings: Settings,
    cache: Cache | None = None,
    say: Callable[[str], None] = lambda stage: None,
) -> tuple[Handbook, tuple[Problem, ...]]:
    """The numbers and every finding that is published. Raises ``DatasetError`` as ``inspect``."""
    handbook, findings, _ = inspect(data, settings, cache, say)
    return handbook, _published(findings)


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
    handbook, findings, judged = inspect(data, settings, cache, say)
    findings = _published(findings)
    say("Writing pages and files")
    book = catalogue(handbook, findings, judged)
    models = modelfigures.draw(accuracy.comparisons(handbook), cache)
    drawn = figures.figures_of(handbook, cache, models)
    package = read_package(data)
    pages.keep_templates(cache)
    made = pages.render_all(book, settings, drawn, package, known, drawn.prepare)
    files = {**exports.exports(book, data), sidebyside.PATH: sidebyside.data_script(book)}
    handbook.kept.save(forget=True)
    cache.sweep()
    dataset = handbook.dataset
    return Site(made, files, findings, dataset.revision, len(dataset.solvents))
