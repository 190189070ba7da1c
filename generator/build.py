"""The only wiring: tables → checks → numbers → figures → pages and files. Knows no MkDocs."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from pathlib import Path

from generator import checks, evidence, exports, figures, pages, sidebyside
from generator.cache import Cache
from generator.catalogue import catalogue
from generator.dataset import load_dataset
from generator.errors import DatasetError, Problem
from generator.metrics import Handbook, Settings, compute
from generator.schema import read_package


@dataclass(frozen=True)
class Site:
    """Everything a handbook is made of: finished pages, other files, findings, numbers."""

    pages: tuple[pages.Page, ...]
    files: Mapping[str, bytes]
    findings: tuple[Problem, ...]
    handbook: Handbook


def review(data: Path, settings: Settings) -> tuple[Handbook, tuple[Problem, ...]]:
    """The numbers and every finding. Raises ``DatasetError`` when a finding is an error."""
    structural = checks.check_folder(data)
    errors = [problem for problem in structural if problem.severity == "error"]
    if errors:
        raise DatasetError(errors)
    handbook = compute(load_dataset(data), settings)
    return handbook, (*structural, *evidence.check_handbook(handbook))


def build_site(data: Path, settings: Settings, cache_folder: Path | None) -> Site:
    """Make the whole handbook from the tables in ``data``.

    Raises ``DatasetError`` with every problem when the tables cannot be used.
    """
    handbook, findings = review(data, settings)
    drawn = figures.figures_of(handbook, Cache(cache_folder))
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
