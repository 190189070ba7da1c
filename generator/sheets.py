"""Datasheet contexts → stockroom sheets and the booklet: what the print templates may see.

The same context objects as the pages', turned into plain data; nothing is formatted again here.
"""

from __future__ import annotations

import datetime
import html
import re
from collections.abc import Iterable, Mapping, Sequence
from dataclasses import dataclass
from typing import Any

from markupsafe import Markup

from generator.catalogue import Catalogue
from generator.contexts import Datasheet, Foot, Mark, Number, QuantityRow
from generator.datasheet import datasheet
from generator.metrics import Handbook
from generator.quantities import QUANTITIES
from generator.typesetting import qr_code, typeset
from generator.wording import marks_of, number, symbol_markup, unit_label

# What a sheet says beside its key values, each at the substance's own reference temperature.
POLARITY = (
    "kirkwood_function", "clausius_mossotti_function", "lippert_mataga_polarizability",
    "orientation_polarization", "onsager_dipole_moment", "kirkwood_correlation_factor",
    "expected_temperature_coefficient",
)  # fmt: skip
SYNONYMS_LENGTH = 150  # characters
LONGEST_NAME, LONGEST_WORD = 40, 24  # characters; a longer word may be broken anywhere
CROP_MARGIN = 4.0  # px round a structure
TITLE = "Solvent datasheets"


@dataclass(frozen=True, slots=True)
class Edition:
    """What one print run has in common.

    ``paper`` is ``A4`` or ``Letter``; ``site`` the address of the handbook, "" where it has none.
    """

    paper: str
    date: datetime.date
    site: str = ""

    def address(self, slug: str) -> str:
        """Where a datasheet is found; relative to the handbook where that has no address."""
        page = f"solvents/{slug}.html"
        return f"{self.site.rstrip('/')}/{page}" if self.site else page


# --- one sheet ---------------------------------------------------------------------------------


def sheet_of(
    book: Catalogue, slug: str, figures: Mapping[str, str], foot: Foot, edition: Edition
) -> dict[str, Any]:
    """All that the print templates are told of one substance, as plain data."""
    sheet = datasheet(book, slug, figures, foot)
    return content(sheet, polarity_rows(book.handbook, slug), edition)


def polarity_rows(handbook: Handbook, slug: str) -> tuple[QuantityRow, ...]:
    """What a sheet says beside the key values, at the substance's own reference temperature."""
    return tuple(
        QuantityRow(
            QUANTITIES[key].name,
            symbol_markup(QUANTITIES[key].symbol),
            unit_label(QUANTITIES[key].unit),
            "",
            number(handbook.at(slug, key), {}),
        )
        for key in POLARITY
    )


def content(sheet: Datasheet, polarity: Sequence[QuantityRow], edition: Edition) -> dict[str, Any]:
    """A datasheet as the plain data of a print template. ``polarity`` adds to the key values."""
    address = edition.address(sheet.slug)
    cells = series(sheet)
    permittivity = sheet.permittivity
    observed = sheet.trend.observed
    rows = (*sheet.key_values, *polarity)
    marks = marks_of(*(row.number for row in rows), *cells)
    return {
        "anchor": f"solvent-{sheet.slug}",
        "name": breakable(sheet.name, LONGEST_NAME),
        "cas": sheet.cas,
        "cas_order": [int(part) for part in sheet.cas.split("-") if part.isdigit()],
        "family": sheet.family,
        "formula": runs(sheet.formula),
        "molar_mass": sheet.molar_mass,
        "synonyms": _some(sheet.synonyms),
        "structure": structure(sheet.structure, f"Structure of {sheet.name}"),
        "reference": sheet.own_reference,
        "permittivity": _plain(permittivity),
        "permittivity_basis": _basis(permittivity),
        "polar": sheet.polar,
        "polar_reason": sheet.polar_reason,
        "scale": picture(sheet.scale, f"Polarity scale of {sheet.name}"),
        "trend": sheet.trend.words,
        "trend_reason": f"dε/dT {observed.sentence}" if observed else "one temperature or none",
        "ribbon": picture(sheet.ribbon, f"Permittivity of {sheet.name} over its liquid range"),
        "flash_point": _flash_point(sheet),
        "liquid_range": sheet.liquid_range,
        "notices": [
            {"label": notice.label, "text": breakable(notice.text)} for notice in sheet.notices
        ],
        "series": [
            {"temperature": t, "number": _plain(cell), "reference": i == sheet.reference_column}
            for i, (t, cell) in enumerate(zip(sheet.temperatures, cells, strict=True))
        ],
        "key": [_row(row) for row in sheet.key_values],
        "polarity": [_row(row) for row in polarity],
        "legend": _legend(marks),
        "handling": [
            {
                "h_statements": breakable(line.h_statements),
                "storage": breakable(line.storage),
                "peroxide_group": line.peroxide_group,
                "sds_revision": line.sds_revision,
            }
            for line in sheet.handling
        ],
        "containers": [
            [
                breakable(cell)
                for cell in (
                    c.container, c.grade, c.size, c.location, c.received, c.opened, c.test_due,
                )
            ]
            for c in sheet.containers
        ],
        "address": address,
        "linked": bool(edition.site),
        "qr": {"svg": qr_code(address), "alt": f"QR code of {address}"},
        **imprint(sheet.foot, edition),
    }  # fmt: skip


def imprint(foot: Foot, edition: Edition) -> dict[str, str]:
    """What every print carries: whose it is, its revision and day, and the cautions."""
    return {
        "laboratory": foot.laboratory,
        "revision": foot.revision,
        "printed": edition.date.isoformat(),
        "caution": foot.caution,
        "uncontrolled": foot.uncontrolled,
    }


def series(sheet: Datasheet) -> tuple[Number | None, ...]:
    """The permittivity at each of the laboratory's temperatures."""
    name = QUANTITIES["relative_permittivity"].name
    found = [row.cells for group in sheet.metrics for row in group.rows if row.name == name]
    return found[0] if found else (None,) * len(sheet.temperatures)


def _flash_point(sheet: Datasheet) -> str:
    name = QUANTITIES["flash_point"].name
    found = [row.number for row in sheet.key_values if row.name == name and row.number]
    return f"{found[0].value} {found[0].unit}" if found else "not known"


def _plain(item: Number | None) -> dict[str, str] | None:
    if item is None:
        return None
    return {
        "value": item.value,
        "uncertainty": item.uncertainty,
        "unit": item.unit,
        "temperature": item.temperature,
        "marks": item.letters,
    }


def _row(row: QuantityRow) -> dict[str, Any]:
    return {"name": row.name, "symbol": runs(row.symbol), "number": _plain(row.number)}


def _basis(item: Number | None) -> str:
    if item is None:
        return ""
    return ", ".join([item.basis, *(mark.label for mark in item.marks)])


def _legend(marks: Iterable[Mark]) -> str:
    words = ["± standard uncertainty (k = 1)", "– no value"]
    words += [f"{mark.letter} {mark.label}" for mark in marks]
    return " · ".join(words)


def _some(synonyms: Sequence[str]) -> str:
    """As many of the other names as fit a line, whole ones only."""
    text = ""
    for name in synonyms:
        longer = f"{text}; {name}" if text else name
        if len(longer) <= SYNONYMS_LENGTH:
            text = longer
    return text


# --- text and pictures -------------------------------------------------------------------------

_SUB = re.compile(r"<sub>(.*?)</sub>")
_PATH = re.compile(r' d="([^"]*)"')
_POINT = re.compile(r"(-?[\d.]+)[ ,](-?[\d.]+)")
_LABEL = re.compile(r'aria-label="([^"]*)"')
# The small pictures are printed smaller than shown on a page, their words no smaller than the rest.
_LETTERING = re.compile(r'font-family="[^"]*" font-size="[^"]*"')
_FRAME = re.compile(r'width="[\d.]+" height="[\d.]+" viewBox="[^"]*"')


def runs(markup: Markup) -> list[tuple[str, bool]]:
    """Text of a formula or symbol in pieces, each with whether it is set low."""
    pieces = _SUB.split(str(markup))
    return [(html.unescape(piece), i % 2 == 1) for i, piece in enumerate(pieces) if piece]


def breakable(text: str, longest: int = LONGEST_WORD) -> str:
    """Text whose longest words may be broken anywhere, so that no column is ever too narrow."""
    return re.sub(rf"[^\s-]{{{longest + 1},}}", lambda found: "\u200b".join(found[0]), text)


def picture(svg: str, text: str) -> dict[str, str] | None:
    """A picture with what it shows in words: its own label, or else ``text``."""
    if not svg:
        return None
    label = _LABEL.search(svg)
    drawn = _LETTERING.sub('font-family="Libertinus Serif" font-size="12.5"', str(svg))
    return {"svg": drawn, "alt": html.unescape(label[1]) if label else text}


def structure(svg: str, text: str) -> dict[str, Any]:
    """A structure cut to its strokes, with its size in px, so that all are set to one scale."""
    points = [
        (float(x), float(y))
        for path in _PATH.findall(svg)
        for x, y in _POINT.findall(path)
    ]  # fmt: skip
    left, top = (min(part) - CROP_MARGIN for part in zip(*points, strict=True))
    right, bottom = (max(part) + CROP_MARGIN for part in zip(*points, strict=True))
    width, height = round(right - left, 1), round(bottom - top, 1)
    frame = f'width="{width}" height="{height}" viewBox="{left:.1f} {top:.1f} {width} {height}"'
    drawn = picture(_FRAME.sub(frame, str(svg), count=1), text) or {}
    return {**drawn, "width": width, "height": height}


# --- documents ---------------------------------------------------------------------------------


def print_sheets(
    sheets: Sequence[Mapping[str, Any]], foot: Foot, edition: Edition, *, booklet: bool
) -> bytes:
    """A PDF of sheets, one page each; as a booklet also with title page, contents and index."""
    count = f"{len(sheets)} substance" + "s" * (len(sheets) != 1)
    data = {
        "sheets": sheets,
        "booklet": booklet,
        "paper": edition.paper,
        "title": TITLE if booklet or len(sheets) != 1 else f"{TITLE}: {sheets[0]['name']}",
        "summary": f"Permittivity and polarity of {count}, with uncertainties.",
        "keywords": ["solvents", "relative permittivity", "polarity"],
        **imprint(foot, edition),
    }
    return typeset("sheets", data, edition.date)
