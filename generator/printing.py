"""One print run: which substances, in which form, on what paper → a PDF."""

from __future__ import annotations

import datetime
from collections.abc import Callable, Mapping
from dataclasses import dataclass
from pathlib import Path
from typing import Any

from generator import build, figures, labels, sheets
from generator.cache import Cache
from generator.catalogue import Catalogue, catalogue
from generator.contexts import Foot
from generator.metrics import Settings
from generator.selection import choose, kept_at

KINDS = ("sheets", "booklet", "labels")
STAGES = 4
"""How many stages a run announces."""


@dataclass(frozen=True, slots=True)
class Order:
    """What is to be printed.

    The substances are those of ``names``, or those with a container at ``location``, or all where
    both are empty. ``label_sheet`` is a size by name, or its measures, or "" for the usual one.
    """

    kind: str
    names: tuple[str, ...]
    location: str
    paper: str
    date: datetime.date
    site: str
    label_sheet: str | Mapping[str, Any] = ""
    start: int = 1


@dataclass(frozen=True, slots=True)
class Printed:
    """A finished document and the number of substances in it."""

    pdf: bytes
    count: int


def produce(
    data: Path, settings: Settings, cache: Path | None, order: Order, say: Callable[[str], None]
) -> Printed:
    """Print what is ordered from the tables in ``data``, telling each stage before it starts.

    Raises ``DatasetError`` when the tables cannot be used, ``OrderError`` when the order
    names what is not there, or labels and paper do not go together.
    """
    layout = labels.layout_of(order.label_sheet, order.paper)
    kept = Cache(cache)
    say("Reading and checking the tables")
    handbook, findings = build.review(data, settings, kept)
    book = catalogue(handbook, findings)
    slugs = _wanted(book, order)
    say("Drawing")
    drawn = figures.figures_of(handbook, kept)
    drawn.prepare(slugs, curves=False)
    say(f"Preparing {len(slugs)} substances")
    foot = Foot(settings.laboratory, handbook.dataset.revision)
    edition = sheets.Edition(order.paper, order.date, order.site)
    making = labels.label_of if order.kind == "labels" else sheets.sheet_of
    made = [making(book, slug, drawn, foot, edition) for slug in slugs]
    say("Setting the pages")
    if order.kind == "labels":
        pdf = labels.print_labels(made, layout, foot, edition, start=order.start)
    else:
        pdf = sheets.print_sheets(made, foot, edition, booklet=order.kind == "booklet")
    return Printed(pdf, len(slugs))


def _wanted(book: Catalogue, order: Order) -> tuple[str, ...]:
    dataset = book.handbook.dataset
    if order.names:
        return choose(dataset, order.names)
    if order.location:
        there = kept_at(dataset, order.location)
        return tuple(slug for slug in book.in_order if slug in there)
    return book.in_order
