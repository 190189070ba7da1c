"""The only wiring: tables → checks → numbers → figures → pages and files. Knows no MkDocs."""

from __future__ import annotations

from collections.abc import Mapping
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
from generator.metrics import Handbook, Settings, compute
from generator.schema import read_package
from generator.tables import read_tables


@dataclass(frozen=True)
class Site:
    """Everything a handbook is made of: finished pages, other files, findings, numbers."""

    pages: tuple[pages.Page, ...]
    files: Mapping[str, bytes]
    findings: tuple[Problem, ...]
    handbook: Handbook


def inspect(
    data: Path, settings: Settings, cache: Cache | None = None
) -> tuple[Handbook, tuple[Problem, ...]]:
    """The numbers and all there is to say about the tables, notes on how they were read included.

    Raises ``DatasetError``, which tells all of it, when some of it is an error.
    """
    tables = read_tables(data)
    structural = checks.check_tables(tables, cache)
    if any(problem.severity == ERROR for problem in structural):
        raise DatasetError(structural)
    handbook = compute(dataset_from(tables), settings, cache)
    return handbook, (*structural, *evidence.check_handbook(handbook, cache))


def review(
    data: Path, settings: Settings, cache: Cache | None = None
) -> tuple[Handbook, tuple[Problem, ...]]:
    """The numbers and every finding that is published. Raises ``DatasetError`` as ``inspect``."""
    handbook, findings = inspect(data, settings, cache)
    return handbook, tuple(finding for finding in findings if finding.severity != NOTE)


def build_site(data: Path, settings: Settings, cache_folder: Path | None) -> Site:
    """Make the whole handbook from the tables in ``data``.

    Raises ``DatasetError`` with every problem when the tables cannot be used.
    """
    cache = Cache(cache_folder)
    handbook, findings = review(data, settings, cache)
    models = modelfigures.draw(accuracy.comparisons(handbook), cache)
    drawn = figures.figures_of(handbook, cache, models)
    drawn.prepare(tuple(handbook.dataset.solvents))
    return Site(
        pages=pages.render_all(handbook, findings, settings, drawn, read_package(data)),
        files={
            **exports.exports(handbook, findings, data),
            sidebyside.PATH: sidebyside.data_script(catalogue(handbook, findings)),
        },
        findings=findings,
        handbook=handbook,
    )
