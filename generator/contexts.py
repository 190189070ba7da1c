"""What a template may see: numbers, marks, links and the other small things pages are made of.

Everything here is frozen and already text: digits are rounded to fit the uncertainty, units are
spelled, temperatures are in °C. A template only places them.
"""

from __future__ import annotations

from dataclasses import dataclass

from markupsafe import Markup

CAUTION = (
    "The supplier's safety data sheet, local rules and licensed practice come first. "
    "This sheet is not a safety data sheet. A blank does not mean no hazard."
)
UNCONTROLLED = "Uncontrolled when printed."


@dataclass(frozen=True, slots=True)
class Link:
    """Somewhere to go. ``href`` is relative to the page that shows it."""

    text: str
    href: str


@dataclass(frozen=True, slots=True)
class Mark:
    """A flag on a number: the letter beside it in a table, and what the letter says."""

    key: str
    letter: str
    label: str
    meaning: str


@dataclass(frozen=True, slots=True)
class Number:
    """A number ready for print. ``raw`` is what sorting uses."""

    raw: str
    value: str
    uncertainty: str
    unit: str
    temperature: str
    basis: str
    marks: tuple[Mark, ...]
    sources: tuple[Link, ...]

    @property
    def letters(self) -> str:
        """The letters of its marks, in a row."""
        return "".join(mark.letter for mark in self.marks)

    @property
    def sentence(self) -> str:
        """Value, uncertainty, unit and temperature in running text."""
        text = f"{self.value} ± {self.uncertainty}" if self.uncertainty else self.value
        text = f"{text} {self.unit}" if self.unit else text
        return f"{text} at {self.temperature}" if self.temperature else text


@dataclass(frozen=True, slots=True)
class Foot:
    """What stands under every page and on every print."""

    laboratory: str
    revision: str
    caution: str = CAUTION
    uncontrolled: str = UNCONTROLLED


@dataclass(frozen=True, slots=True)
class Notice:
    """One line of warning. ``label`` says its kind in a word, so that colour is not needed."""

    kind: str
    label: str
    text: str
    href: str


@dataclass(frozen=True, slots=True)
class QuantityRow:
    """One quantity with one value."""

    name: str
    symbol: Markup
    unit: str
    method: str
    number: Number | None


@dataclass(frozen=True, slots=True)
class MetricRow:
    """One quantity over the handbook's temperatures.

    ``way`` is the anchor of how it was found, "" for a published one.
    """

    name: str
    symbol: Markup
    unit: str
    method: str
    way: str
    cells: tuple[Number | None, ...]


@dataclass(frozen=True, slots=True)
class MetricGroup:
    """Metrics that are read together."""

    title: str
    rows: tuple[MetricRow, ...]


@dataclass(frozen=True, slots=True)
class WayInput:
    """One input of a derived quantity: value and share of the variance at each temperature."""

    name: str
    symbol: Markup
    basis: str
    sources: tuple[Link, ...]
    cells: tuple[Markup, ...]


@dataclass(frozen=True, slots=True)
class Way:
    """How a derived quantity was found at each of the handbook's temperatures."""

    anchor: str
    name: str
    symbol: Markup
    formula: Markup
    method: str
    inputs: tuple[WayInput, ...]


@dataclass(frozen=True, slots=True)
class SourceValue:
    """One value as one source gives it, and what became of it."""

    printed: str
    uncertainty: str
    temperature: str
    source: Link | None
    method: str
    status: str
    reason: str
    row: str


@dataclass(frozen=True, slots=True)
class SourceGroup:
    """Everything the sources say about one quantity."""

    name: str
    symbol: Markup
    rows: tuple[SourceValue, ...]


@dataclass(frozen=True, slots=True)
class CurveRow:
    """One temperature curve as published, and the part it has in the value."""

    quantity: str
    form: Link
    coefficients: str
    unit: str
    span: str
    uncertainty: str
    source: Link | None
    status: str
    row: str


@dataclass(frozen=True, slots=True)
class HandlingLines:
    """What the laboratory transcribed about handling; empty text means blank."""

    h_statements: str
    storage: str
    peroxide_group: str
    sds_revision: str
    source: Link | None


@dataclass(frozen=True, slots=True)
class ContainerRow:
    """One container in stock."""

    container: str
    grade: str
    size: str
    location: str
    received: str
    opened: str
    test_due: str


@dataclass(frozen=True, slots=True)
class Citation:
    """One source at the foot of the sheet."""

    number: str
    anchor: str
    citation: str
    kind: str
    doi: str


@dataclass(frozen=True, slots=True)
class PastLine:
    """One thing that changed: of which sort, of which quantity, and what."""

    label: str
    quantity: str
    what: str


@dataclass(frozen=True, slots=True)
class Past:
    """What one recorded revision brought for one substance."""

    date: str
    revision: Link
    lines: tuple[PastLine, ...]


@dataclass(frozen=True, slots=True)
class Related:
    """A substance to look at beside this one."""

    link: Link
    cas: str
    permittivity: Number | None
    polar: str
    scale: Markup


@dataclass(frozen=True, slots=True)
class TrendLine:
    """What the permittivity does on warming, in words and in numbers."""

    key: str
    words: str
    remark: str
    observed: Number | None
    expected: Number | None
    left_over: Number | None


@dataclass(frozen=True, slots=True)
class Datasheet:
    """Everything the datasheet template may see."""

    slug: str
    name: str
    cas: str
    family: str
    family_link: Link
    formula: Markup
    formula_plain: str
    molar_mass: str
    synonyms: tuple[str, ...]
    smiles: str
    inchi: str
    inchikey: str
    note: str
    structure: Markup
    reference: str
    own_reference: str
    own_reference_c: str
    permittivity: Number | None
    polar_key: str
    polar: str
    polar_reason: str
    trend: TrendLine
    notices: tuple[Notice, ...]
    scale: Markup
    ribbon: Markup
    figure: Markup
    figure_text: str
    control: Markup
    liquid_range: str
    key_values: tuple[QuantityRow, ...]
    value_marks: tuple[Mark, ...]
    temperatures: tuple[str, ...]
    reference_column: int
    metrics: tuple[MetricGroup, ...]
    metric_columns: int
    metric_marks: tuple[Mark, ...]
    ways: tuple[Way, ...]
    measured: tuple[SourceGroup, ...]
    curves: tuple[CurveRow, ...]
    handling: tuple[HandlingLines, ...]
    containers: tuple[ContainerRow, ...]
    isomers: tuple[Related, ...]
    isomers_href: str
    swaps: tuple[Related, ...]
    swaps_total: int
    compare_href: str
    compare_isomers_href: str
    compare_swaps_href: str
    flash_class: str
    flash_class_link: Link
    quotation: str
    csv_href: str
    measurements_href: str
    correlations_href: str
    json_ld: Markup
    history: tuple[Past, ...]
    citations: tuple[Citation, ...]
    foot: Foot
