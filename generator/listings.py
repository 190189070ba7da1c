"""What the templates of tables, home, review list, methods and the other overviews may see."""

from __future__ import annotations

from dataclasses import dataclass

from markupsafe import Markup

from generator.contexts import Foot, Link, Mark, Number


@dataclass(frozen=True, slots=True)
class Column:
    """A column of a comparison table. ``kind`` is ``text``, ``number`` or ``picture``."""

    key: str
    title: str
    symbol: Markup
    unit: str
    kind: str
    method: str
    reference: bool = False


@dataclass(frozen=True, slots=True)
class Cell:
    """What stands in one place of a comparison table: a number or words."""

    text: str = ""
    number: Number | None = None


@dataclass(frozen=True, slots=True)
class Table:
    """One comparison table, a row a substance; the rows are ready."""

    key: str
    title: str
    lead: str
    columns: tuple[Column, ...]
    rows: tuple[Markup, ...]
    marks: tuple[Mark, ...]


@dataclass(frozen=True, slots=True)
class IsomerRow:
    """One quantity of a set of isomers."""

    name: str
    symbol: Markup
    unit: str
    method: str
    cells: tuple[Cell, ...]


@dataclass(frozen=True, slots=True)
class IsomerSet:
    """Isomers side by side: a column a substance, a row a quantity."""

    anchor: str
    formula: Markup
    formula_plain: str
    members: tuple[Link, ...]
    structures: tuple[Markup, ...]
    temperatures: tuple[str, ...]
    rows: tuple[IsomerRow, ...]
    compare: str
    marks: tuple[Mark, ...]


@dataclass(frozen=True, slots=True)
class IsomerPart:
    """A set of isomers as its page lists it, and its ready ``section``."""

    anchor: str
    formula: Markup
    names: str
    section: Markup
    marks: tuple[Mark, ...]


@dataclass(frozen=True, slots=True)
class Group:
    """A titled list of links."""

    anchor: str
    title: Markup
    links: tuple[Link, ...]


@dataclass(frozen=True, slots=True)
class Count:
    """How many there are of something, and where to see them."""

    number: str
    what: str
    href: str


@dataclass(frozen=True, slots=True)
class Home:
    """Everything the home page may see."""

    laboratory: str
    reference: str
    index_json: Markup
    total: int
    families: tuple[Group, ...]
    flash_classes: tuple[tuple[str, str], ...]
    polar_map: Markup
    counts: tuple[Count, ...]
    findings: tuple[Count, ...]
    tables: tuple[Link, ...]
    foot: Foot


@dataclass(frozen=True, slots=True)
class ReviewRow:
    """One finding of the review list."""

    anchor: str
    severity: str
    substance: Link | None
    place: str
    kind: str
    found: str
    expected: str
    hint: str
    evidence: str


@dataclass(frozen=True, slots=True)
class KeptRow:
    """One finding that the laboratory has decided to leave as it is."""

    substance: Link
    found: str
    evidence: str
    reason: str
    place: str


@dataclass(frozen=True, slots=True)
class LimitRow:
    """How far apart the two sides of one cross-check may lie.

    ``spread`` and ``limit`` are ranges over the groups; ``count`` of comparisons they come from,
    empty for a bound that is not learnt.
    """

    check: str
    spread: str
    limit: str
    count: str


@dataclass(frozen=True, slots=True)
class Method:
    """One quantity on the methods page."""

    anchor: str
    name: str
    symbol: Markup
    unit: str
    formula: Markup
    definition: str
    validity: str
    source: str
    decimals: str
    bounds: str


@dataclass(frozen=True, slots=True)
class CurveForm:
    """One form of temperature curve on the methods page."""

    anchor: str
    name: str
    coefficients: str
    formula: Markup
    source: str
    used: str


@dataclass(frozen=True, slots=True)
class Customary:
    """The uncertainty taken where a kind of source states none."""

    kind: str
    quantity: str
    share: str
    reason: str


@dataclass(frozen=True, slots=True)
class Rules:
    """The numbers in the rules of the handbook, ready for print."""

    reach: str
    same: str
    outlier: str
    samples: str
    coverage: str
    polar: str
    unpolar: str
    surely: str
    expansion: str
    onsager: str
    maxwell: str
    customary: tuple[Customary, ...]


@dataclass(frozen=True, slots=True)
class ModelCheck:
    """A model held against measured numbers."""

    anchor: str
    title: str
    words: str
    figure: Markup


@dataclass(frozen=True, slots=True)
class SourceEntry:
    """One source and how much of the handbook comes from it."""

    anchor: str
    key: str
    citation: str
    kind: str
    year: str
    doi: str
    values: str
    curves: str


@dataclass(frozen=True, slots=True)
class DictionaryField:
    """One column of one of the laboratory's tables."""

    name: str
    title: str
    type: str
    help: str
    rules: str
    key: bool


@dataclass(frozen=True, slots=True)
class DictionaryTable:
    """One of the laboratory's tables."""

    anchor: str
    name: str
    path: str
    title: str
    help: str
    fields: tuple[DictionaryField, ...]


@dataclass(frozen=True, slots=True)
class Download:
    """One file to take away."""

    link: Link
    what: str
