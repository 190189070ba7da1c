"""Frozen contexts → finished HTML pages. Knows nothing of the site generator that wraps them."""

from __future__ import annotations

import html
import re
from collections.abc import Callable, Iterator, Mapping, Sequence
from dataclasses import dataclass, replace
from functools import lru_cache, partial
from typing import Any

from jinja2 import Environment, PackageLoader, StrictUndefined, Template
from markupsafe import Markup

from generator import comparisons, flammability, methods, overviews
from generator.cache import Cache, digest
from generator.catalogue import Catalogue
from generator.compiled import Compiled
from generator.contexts import Datasheet, Foot
from generator.datasheet import COMPARED, datasheet, related
from generator.kept import LEAST, templates
from generator.listings import IsomerPart, IsomerSet
from generator.metrics import Settings
from generator.timeline import timeline
from generator.wording import MARKS, cell_markup, marks_markup


@dataclass(frozen=True, slots=True)
class Page:
    """A finished page.

    ``path`` is where a Markdown source of it would stand; ``body`` is its HTML with its H1, in
    UTF-8; ``toc`` lists its headings as (level, id, text). ``search_title`` and ``search_text``
    are plain text for the site search, empty where the page shall not be found. ``key`` is a hash
    of all the page shows; without one it is made anew each time. A page that stands unchanged in
    the published site is known by everything but its ``body``, which is empty.
    """

    path: str
    title: str
    body: bytes
    toc: tuple[tuple[int, str, str], ...]
    search_title: str
    search_text: str
    kind: str
    key: str = ""

    @property
    def html(self) -> str:
        """The body as text; a thousand pages are kept as bytes, which take half the memory."""
        return self.body.decode()


NO_PAGES: Mapping[str, Page] = {}
NOTHING: Mapping[str, Any] = {}
# The pages that show findings, datasheets apart.
JUDGED = ("index.md", "review.md")
DRAWN = "methods.md"


def render_all(
    book: Catalogue,
    settings: Settings,
    figures: Mapping[str, str],
    package: Mapping[str, Any] = NOTHING,
    known: Mapping[str, Page] = NO_PAGES,
    prepare: Callable[[Sequence[str]], None] = lambda slugs: None,
    begun: Begun | None = None,
) -> tuple[Page, ...]:
    """Every generated page of the handbook.

    ``figures`` holds SVG text: ``slug`` the curve of the permittivity, ``slug:scale`` the
    polarity scale, ``slug:ribbon`` the temperature ribbon, ``slug:structure``
    a drawing to take instead of the plain one, ``accuracy:KEY`` a model against measured numbers.
    ``package`` is the parsed ``datapackage.json``; without it the data dictionary lists no tables.
    ``known`` are the pages of the published site by path; those that would come out the same are
    given back. ``prepare`` is told which substances need their figures before they are asked for.
    ``begun`` has the pages that were begun beforehand.
    """
    plain = begun.keys if begun else dict(_plain_keys(book, settings, figures))
    keys = {
        _path(slug): (slug, key and digest(key, book.findings_of(slug)))
        for slug, key in plain.items()
    }
    stale = {
        path: partial(_sheet, book, settings, figures, prepare, slug, key)
        for path, (slug, key) in keys.items()
        if path not in known or not key or known[path].key != key
    }
    plans = {plan[0]: partial(_page, *plan) for plan in _whole(book, settings, figures, package)}
    now = {path: job for path, job in plans.items() if path in JUDGED or not begun} | stale
    # The pages about the whole handbook are the longer, the more substances there are.
    least = max(1, min(LEAST, 2500 // max(1, len(keys))))
    made = dict(zip(now, book.handbook.kept.share_out([*now.values()], least), strict=True))
    made |= {page.path: page for page in (begun.pages() if begun else ())}
    return (
        *(_or_known(made[path], known) for path in plans),
        *(made[path] if path in made else known[path] for path in keys),
    )


class Begun:
    """The pages that show no findings, begun while these are still being looked for.

    A helper draws what will be needed next (``prepare``) and makes the page with most figures,
    while this process makes the others and looks which datasheets have changed.
    """

    def __init__(
        self,
        plain: Catalogue,
        settings: Settings,
        figures: Mapping[str, str],
        package: Mapping[str, Any],
        prepare: Callable[[], None],
    ) -> None:
        plans = {plan[0]: plan for plan in _whole(plain, settings, figures, package)}

        def drawing() -> Page:
            prepare()
            return _page(*plans[DRAWN])

        self._drawn = plain.handbook.kept.begin(drawing)
        self.keys = dict(_plain_keys(plain, settings, figures))
        """Of each substance, what ``_plain_keys`` says."""
        others = [plan for path, plan in plans.items() if path not in (*JUDGED, DRAWN)]
        self._others = [_page(*plan) for plan in others]

    def pages(self) -> list[Page]:
        """The pages; waits for the helper."""
        return [*self._others, self._drawn()]


def _sheet(
    book: Catalogue,
    settings: Settings,
    figures: Mapping[str, str],
    prepare: Callable[[Sequence[str]], None],
    slug: str,
    key: str,
) -> Page:
    prepare([slug])
    sheet = datasheet(book, slug, figures, _foot(book, settings, slug))
    return replace(_datasheet_page(sheet), key=key)


def _or_known(page: Page, known: Mapping[str, Page]) -> Page:
    page = replace(page, key=digest(page))
    standing = known.get(page.path)
    return standing if standing is not None and standing.key == page.key else page


def _foot(book: Catalogue, settings: Settings, slug: str = "") -> Foot:
    """The foot of a page: a datasheet carries the revision of its own rows."""
    dataset = book.handbook.dataset
    revision = dataset.revisions.get(slug, "")[: len(dataset.revision)]
    return Foot(settings.laboratory, revision or dataset.revision)


def _plain_keys(
    book: Catalogue, settings: Settings, figures: Mapping[str, str]
) -> Iterator[tuple[str, str]]:
    """For each substance a hash of all that its datasheet shows but findings.

    That is, what follows from its own rows and from those of others.
    """
    faces = {slug: digest(related(book, slug, figures)) for slug in book.in_order}
    for slug in book.in_order:
        own = book.handbook.kept.key(slug)
        isomers, swaps = book.isomers_of(slug), book.swaps_of(slug)
        yield (
            slug,
            own
            and digest(
                own,
                _foot(book, settings, slug),
                book.rows[slug].places,
                book.set_of(slug)[:1],
                len(book.families[book.handbook.molecules[slug].family]),
                [faces[other] for other in (slug, *isomers, *swaps)],
                len(isomers),
                figures.get(f"{slug}:ribbon"),
            ),
        )


def _path(slug: str) -> str:
    return f"solvents/{slug}.md"


_Plan = tuple[str, str, str, Callable[[], Mapping[str, Any]]]


def _whole(
    book: Catalogue, settings: Settings, figures: Mapping[str, str], package: Mapping[str, Any]
) -> Iterator[_Plan]:
    """The pages about all substances: path, kind, title, and how to make the rest."""
    foot = _foot(book, settings)
    menu = tuple(comparisons.TITLES.items())
    shared: dict[str, Any] = {"page_foot": foot, "menu_entries": menu}
    titles = comparisons.TITLES
    yield "index.md", "home", "Home", lambda: {"h": overviews.home(book, settings.laboratory, foot)}
    for key, table in comparisons.TABLES.items():
        yield (
            f"tables/{key}.md",
            "table",
            titles[key],
            partial(lambda table: {"t": table(book, figures), **shared}, table),
        )
    yield "tables/isomers.md", "isomers", titles["isomers"], lambda: {**_isomers(book), **shared}
    yield "changes.md", "changes", "What changed", lambda: {"t": timeline(book), **shared}
    yield "compare.md", "compare", "Side by side", lambda: shared
    yield "review.md", "review", "Review list", lambda: {**_review(book), **shared}
    yield "methods.md", "methods", "Methods", lambda: {**_methods(book, figures), **shared}
    yield "sources.md", "sources", "Sources", lambda: {"sources": overviews.sources(book), **shared}
    yield (
        "data-dictionary.md",
        "dictionary",
        "Data dictionary",
        lambda: {"tables": overviews.dictionary(package), **shared},
    )
    yield (
        "downloads.md",
        "downloads",
        "Downloads",
        lambda: {"files": overviews.downloads(package), **shared},
    )


def _review(book: Catalogue) -> dict[str, Any]:
    return {
        "rows": overviews.review(book),
        "kept": overviews.kept_findings(book),
        "limits": overviews.limits(book),
    }


def _isomers(book: Catalogue) -> dict[str, Any]:
    sets = {members[0]: members for members in comparisons.isomer_sets(book)}
    parts = book.handbook.kept.each(
        tuple(sets),
        "isomers",
        lambda some: [_isomer_part(comparisons.isomer_set(book, sets[first])) for first in some],
        templates(),
        beside={first: [(m, book.handbook.kept.key(m)) for m in sets[first]] for first in sets},
    )
    present = {mark.key for part in parts.values() for mark in part.marks}
    return {
        "sets": tuple(parts.values()),
        "marks": tuple(mark for mark in MARKS if mark.key in present),
        "groups": comparisons.same_formula(book),
    }


def _isomer_part(shown: IsomerSet) -> IsomerPart:
    section = Markup(_template("isomer-set").render(set=shown))
    names = ", ".join(link.text for link in shown.members)
    return IsomerPart(shown.anchor, shown.formula, names, section, shown.marks)


def _methods(book: Catalogue, figures: Mapping[str, str]) -> dict[str, Any]:
    measured, derived = methods.methods()
    return {
        "measured": measured,
        "derived": derived,
        "forms": methods.curve_forms(book),
        "rules": methods.rules(book),
        "checks": methods.model_checks(book, figures),
        "flash_classes": flammability.CLASSES,
        "flash_standard": flammability.STANDARD,
    }


# How much of a page the site search knows [characters]. Of the tables only what stands above them:
# their names and numbers belong to the datasheets.
_FOUND = {
    "home": 0,
    "table": 300,
    "isomers": 300,
    "changes": 2_000,
    "compare": 300,
    "review": 300,
    "methods": 20_000,
    "sources": 20_000,
    "dictionary": 20_000,
    "downloads": 2_000,
}


def _page(path: str, kind: str, title: str, context: Callable[[], Mapping[str, Any]]) -> Page:
    body = _template(kind).render(context())
    found = _plain(body, _FOUND[kind])
    return Page(path, title, body.encode(), headings(body), title, found, kind)


def _datasheet_page(sheet: Datasheet) -> Page:
    body = _template("datasheet").render(s=sheet)
    return Page(
        _path(sheet.slug),
        f"{sheet.name} {sheet.cas}",
        body.encode(),
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


def keep_templates(cache: Cache) -> None:
    """Keep compiled templates where other results are kept."""
    _environment().bytecode_cache = Compiled(cache)


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
