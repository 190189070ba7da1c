"""Shelf labels: the geometry of a sheet of labels, and what one label says."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import asdict, dataclass, fields
from typing import Any

from generator.catalogue import Catalogue
from generator.contexts import Datasheet, Foot
from generator.datasheet import datasheet
from generator.selection import OrderError
from generator.sheets import LONGEST_NAME, Edition, breakable, imprint, picture
from generator.typesetting import qr_code, typeset

PAPERS = {"A4": (210.0, 297.0), "Letter": (215.9, 279.4)}
"""[mm] Width and height (ISO 216; ANSI/ASME Y14.1)."""
SMALLEST = (35.0, 20.0)
"""[mm] Below this the words of a label could not be read."""
TOLERANCE = 0.5  # mm; label sheets are described by rounded numbers


@dataclass(frozen=True, slots=True)
class LabelSheet:
    """A sheet of equal labels on ``paper`` (``A4`` or ``Letter``), all lengths in mm.

    ``left`` and ``top`` are the margins before the first label; ``gap_x`` and ``gap_y`` lie
    between neighbours.
    """

    paper: str
    columns: int
    rows: int
    width: float
    height: float
    left: float
    top: float
    gap_x: float = 0.0
    gap_y: float = 0.0

    @property
    def count(self) -> int:
        """Labels on a sheet."""
        return self.columns * self.rows

    def complaint(self) -> str:
        """Why these labels cannot be printed; "" when they can."""
        if self.paper not in PAPERS:
            return f"the paper of a label sheet is A4 or Letter, not {self.paper}"
        lengths = (self.left, self.top, self.gap_x, self.gap_y)
        if min(self.columns, self.rows) < 1 or min(lengths) < 0:
            return "a label sheet needs a column, a row, and no length below zero"
        if self.width < SMALLEST[0] or self.height < SMALLEST[1]:
            return f"labels below {SMALLEST[0]:g} × {SMALLEST[1]:g} mm cannot be read"
        needed = (
            self.left + self.columns * (self.width + self.gap_x) - self.gap_x,
            self.top + self.rows * (self.height + self.gap_y) - self.gap_y,
        )
        if any(n > have + TOLERANCE for n, have in zip(needed, PAPERS[self.paper], strict=True)):
            have = " × ".join(f"{side:g}" for side in PAPERS[self.paper])
            return (
                f"the labels take {needed[0]:g} × {needed[1]:g} mm, "
                f"but {self.paper} has {have} mm"
            )  # fmt: skip
        return ""


# Plain sizes in common use, named by what they measure (common practice, no source).
LABEL_SHEETS: Mapping[str, LabelSheet] = {
    "70x37": LabelSheet("A4", 3, 8, 70, 37, 0, 0.5),
    "63.5x38.1": LabelSheet("A4", 3, 7, 63.5, 38.1, 7.25, 15.15, 2.5),
    "99.1x67.7": LabelSheet("A4", 2, 4, 99.1, 67.7, 4.65, 13.1, 2.5),
    "105x74": LabelSheet("A4", 2, 4, 105, 74, 0, 0.5),
    "66.7x25.4": LabelSheet("Letter", 3, 10, 66.7, 25.4, 4.75, 12.7, 3.15),
    "101.6x50.8": LabelSheet("Letter", 2, 5, 101.6, 50.8, 3.95, 12.7, 4.8),
}
USUAL = {"A4": "70x37", "Letter": "101.6x50.8"}
NOT_TRANSCRIBED = "No hazard statements transcribed. A blank does not mean no hazard."


def layout_of(wanted: str | Mapping[str, Any], paper: str) -> LabelSheet:
    """The label sheet of a name, of measures, or for "" the usual one of a paper.

    Raises ``OrderError`` when there is no such sheet, or it is not of that paper.
    """
    if isinstance(wanted, str):
        name = wanted or USUAL[paper]
        if name not in LABEL_SHEETS:
            raise OrderError(f"no label sheet {name!r}; there are {', '.join(LABEL_SHEETS)}")
        layout = LABEL_SHEETS[name]
    else:
        try:
            layout = LabelSheet(paper, **wanted)
        except TypeError:
            known = [field.name for field in fields(LabelSheet)][1:]
            raise OrderError(
                f"a label sheet is described by {', '.join(known)}, not {', '.join(wanted)}"
            ) from None
    if layout.paper != paper:
        raise OrderError(f"this label sheet is {layout.paper}, the paper asked for {paper}")
    complaint = layout.complaint()
    if complaint:
        raise OrderError(complaint)
    return layout


def label_of(
    book: Catalogue, slug: str, figures: Mapping[str, str], foot: Foot, edition: Edition
) -> dict[str, Any]:
    """All that the print template is told for the label of one substance, as plain data."""
    return content(datasheet(book, slug, figures, foot), edition)


def content(sheet: Datasheet, edition: Edition) -> dict[str, Any]:
    """A datasheet as the plain data of a label."""
    address = edition.address(sheet.slug)
    statements = " ".join(line.h_statements for line in sheet.handling if line.h_statements)
    permittivity = sheet.permittivity
    return {
        "name": breakable(sheet.name, LONGEST_NAME),
        "cas": sheet.cas,
        "permittivity": f"ε = {permittivity.sentence}" if permittivity else "ε not known",
        "polar": "Polarity not known" if sheet.polar_key == "not-known" else sheet.polar,
        "scale": picture(sheet.scale, f"Polarity scale of {sheet.name}"),
        "hazards": breakable(statements),
        "qr": {"svg": qr_code(address), "alt": f"QR code of {address}"},
    }


def print_labels(
    labels: Sequence[Mapping[str, Any]],
    layout: LabelSheet,
    foot: Foot,
    edition: Edition,
    *,
    start: int = 1,
) -> bytes:
    """A PDF of label sheets. ``start`` is the first free place of a half-used sheet, from 1,
    counted along the rows. Raises ``OrderError`` when there is no such place."""
    if not 1 <= start <= layout.count:
        raise OrderError(f"the sheet has places 1 to {layout.count}, not {start}")
    places = [*[None] * (start - 1), *labels]
    data = {
        "title": "Shelf labels",
        "paper": layout.paper,
        "geometry": asdict(layout),
        "batches": [places[i : i + layout.count] for i in range(0, len(places), layout.count)],
        "no_hazards": NOT_TRANSCRIBED,
        **imprint(foot, edition),
    }
    return typeset("labels", data, edition.date)
