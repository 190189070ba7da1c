"""Frozen contexts → finished HTML pages. Knows nothing of the site generator that wraps them."""

from __future__ import annotations

import html
import re
from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass
from functools import lru_cache
from typing import Any

from jinja2 import Environment, PackageLoader, StrictUndefined, Template

from generator import comparisons, flammability, methods, overviews
from generator.catalogue import Catalogue, catalogue
from generator.contexts import Datasheet, Foot
from generator.datasheet import COMPARED, datasheet
from generator.errors import Problem
from generator.metrics import Handbook, Settings
from generator.timeline import timeline
from generator.wording import cell_markup, marks_markup, marks_of


@dataclass(frozen=True, slots=True)
class Page:
    """A finished page.

    ``path`` is where a Markdown source of it would stand; ``html`` is the body with its H1;
    ``toc`` lists its headings as (level, id, text). ``search_title`` and ``search_text`` are
    plain text for the site search, empty where the page shall not be found.
    """

    path: str
    title: str
    html: str
    toc: tuple[tuple[int, str, str], ...]
    search_title: str
    search_text: str
    kind: str


def render_all(
    handbook: Handbook,
    findings: Sequence[Problem],
    settings: Settings,
    figures: Mapping[str, str],
    package: Mapping[str, Any] | None = None,
) -> tuple[Page, ...]:
    """Every generated page of the handbook.

    ``figures`` holds SVG text: ``slug`` the curve of the permittivity, ``slug:scale`` the
    polarity scale, ``slug:ribbon`` the temperature ribbon, ``slug:structure``
    a drawing to take instead of the plain one; ``accuracy:KEY`` a model against measured numbers
    (see ``accuracy``). ``package`` is the parsed
    ``datapackage.json``; without it the data dictionary lists no tables.
    """
    book = catalogue(handbook, findings)
    foot = Foot(settings.laboratory, handbook.dataset.revision)
    described = package or {}
    return (
        *_whole(book, settings, figures, described, foot),
        *(_datasheet_page(datasheet(book, slug, figures, foot)) for slug in book.in_order),
    )


def _whole(
    book: Catalogue,
    settings: Settings,
    figures: Mapping[str, str],
    package: Mapping[str, Any],
    foot: Foot,
) -> Iterator[Page]:
    shared: dict[str, Any] = {"page_foot": foot}
    yield _page("index.md", "home", "Home",
                h=overviews.home(book, settings.laboratory, foot))  # fmt: skip
    menu = tuple((key, title) for key, title in comparisons.TITLES.items())
    for table in comparisons.tables(book, figures):
        yield _page(f"tables/{table.key}.md", "table", table.title,
                    t=table, menu_entries=menu, **shared)  # fmt: skip
    sets = comparisons.isomer_sets(book)
    yield _page(
        "tables/isomers.md", "isomers", comparisons.TITLES["isomers"],
        sets=sets, marks=marks_of(*(c.number for s in sets for r in s.rows for c in r.cells)),
        groups=comparisons.same_formula(book), menu_entries=menu, **shared,
    )  # fmt: skip
    yield _page("compare.md", "compare", "Side by side", **shared)
    yield _page("changes.md", "changes", "What changed", t=timeline(book), **shared)
    yield _page("review.md", "review", "Review list", rows=overviews.review(book), **shared)
    measured, derived = methods.methods()
    yield _page(
        "methods.md", "methods", "Methods",
        measured=measured, derived=derived, forms=methods.curve_forms(book),
        rules=methods.rules(book), checks=methods.model_checks(book, figures),
        flash_classes=flammability.CLASSES, flash_standard=flammability.STANDARD, **shared,
    )  # fmt: skip
    yield _page("sources.md", "sources", "Sources", sources=overviews.sources(book), **shared)
    yield _page(
        "data-dictionary.md", "dictionary", "Data dictionary",
        tables=overviews.dictionary(package), **shared,
    )  # fmt: skip
    yield _page(
        "downloads.md", "downloads", "Downloads",
        files=overviews.downloads(package), **shared,
    )  # fmt: skip


# How much of a page the site search knows [characters]. Of the tables only what stands above them:
# their names and numbers belong to the datasheets.
_FOUND = {
    "home": 0,
    "table": 300,
    "isomers": 300,
    "compare": 300,
    "changes": 2_000,
    "review": 300,
    "methods": 20_000,
    "sources": 20_000,
    "dictionary": 20_000,
    "downloads": 2_000,
}


def _page(path: str, kind: str, title: str, **context: Any) -> Page:
    body = _template(kind).render(**context)
    return Page(path, title, body, headings(body), title, _plain(body, _FOUND[kind]), kind)


def _datasheet_page(sheet: Datasheet) -> Page:
    body = _template("datasheet").render(s=sheet)
    return Page(
        f"solvents/{sheet.slug}.md",
        f"{sheet.name} {sheet.cas}",
        body,
        headings(body),
        f"{sheet.name} {sheet.cas}",
        search_text(sheet),
        "datasheet",
    )


def search_text(sheet: Datasheet) -> str:
    """What the site search knows of a substance: names, numbers and formula as plain text."""
    # What it is called as a whole stands first: site_src/pages/assets/search.js takes it apart.
    called = " · ".join((sheet.cas, sheet.formula_plain, sheet.inchikey, *sheet.synonyms))
    parts = [sheet.family, sheet.polar]
    if sheet.permittivity:
        parts.append(f"relative permittivity {sheet.permittivity.sentence}")
    return f"{called} — {', '.join(parts)}"


@lru_cache(maxsize=1)
def _environment() -> Environment:
    environment = Environment(
        loader=PackageLoader("generator"),
        autoescape=True,
        undefined=StrictUndefined,
        trim_blocks=True,
        lstrip_blocks=True,
    )
    environment.filters["cell"] = cell_markup
    environment.filters["marks"] = marks_markup
    environment.globals["most"] = COMPARED
    return environment


def _template(kind: str) -> Template:
    return _environment().get_template(f"{kind}.html.j2")


# A heading may say in data-toc how the list of contents shall call it.
_HEADING = re.compile(
    r'<h([1-3])[^>]* id="([^"]+)"(?: data-toc="([^"]*)")?[^>]*>(.*?)</h\1>', re.DOTALL
)
_TAG = re.compile(r"<[^>]+>")
_SILENT = re.compile(r"<(script|svg|math|style)\b.*?</\1>", re.DOTALL)


def headings(body: str) -> tuple[tuple[int, str, str], ...]:
    """The headings of a body that carry an id, as (level, id, plain text)."""
    return tuple(
        (int(level), name, _plain(short or text, 200))
        for level, name, short, text in _HEADING.findall(body)
    )


def _plain(markup: str, length: int) -> str:
    """Running text of a piece of HTML, cut at a word after ``length`` characters."""
    bare = _TAG.sub(" ", _SILENT.sub(" ", markup))
    text = " ".join(html.unescape(bare).split())
    return text if len(text) <= length else text[:length].rsplit(" ", 1)[0]
