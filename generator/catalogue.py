"""The handbook as a whole: who is whose isomer, which finding is whose, what is where."""

from __future__ import annotations

import re
from collections import defaultdict
from collections.abc import Iterable, Mapping, Sequence
from dataclasses import dataclass, replace
from heapq import nsmallest
from typing import Any, Protocol, TypeVar

from markupsafe import Markup

from generator.dataset import Container, Correction, Correlation, Handling, Measurement
from generator.errors import Problem
from generator.evidence import NOT_JUDGED, Review
from generator.flammability import FlashClass, flash_class
from generator.history import Event
from generator.metrics import Handbook
from generator.spreads import Threshold

SWAPS_SHOWN = 12


@dataclass(frozen=True, slots=True)
class Links:
    """Addresses inside the site, relative to a page that stands ``root`` away from the top."""

    root: str

    def solvent(self, slug: str) -> str:
        """The datasheet of a substance."""
        return f"{self.root}solvents/{slug}.html"

    def method(self, quantity: str) -> str:
        """A quantity on the methods page."""
        return f"{self.root}methods.html#{anchor(quantity)}"

    def form(self, form: str) -> str:
        """A form of curve on the methods page."""
        return f"{self.root}methods.html#form-{anchor(form)}"

    def source(self, source: str) -> str:
        """A source on the page of sources."""
        return f"{self.root}sources.html#{anchor(source)}"

    def family(self, family: str) -> str:
        """A family in the list of all substances."""
        return f"{self.root}index.html#family-{anchor(family)}"

    def compare(self, slugs: Iterable[str]) -> str:
        """Some substances side by side."""
        return f"{self.root}compare.html#{'+'.join(slugs)}"

    def flash_classes(self) -> str:
        """The criteria of the classes of flammable liquids."""
        return f"{self.root}methods.html#flash-classes"

    def table(self, file: str) -> str:
        """One of the laboratory's own tables."""
        return f"{self.root}downloads/data/{file}"

    def isomers(self, members: Sequence[str]) -> str:
        """A set of isomers side by side; without one, the list by formula."""
        place = f"isomers-{members[0]}" if members else "same-formula"
        return f"{self.root}tables/isomers.html#{place}"


def anchor(key: str) -> str:
    """A key as it may stand behind ``#``."""
    return re.sub(r"[^a-z0-9]+", "-", key.lower()).strip("-")


@dataclass(frozen=True, slots=True)
class Finding:
    """A problem with its place in the review list and the substance whose row it concerns."""

    problem: Problem
    anchor: str
    slug: str


@dataclass(frozen=True, slots=True)
class Rows:
    """The rows of the tables that concern one substance, as the laboratory typed them."""

    measurements: tuple[Measurement, ...] = ()
    correlations: tuple[Correlation, ...] = ()
    corrections: tuple[Correction, ...] = ()
    stock: tuple[Container, ...] = ()
    handling: tuple[Handling, ...] = ()
    history: tuple[Event, ...] = ()

    @property
    def places(self) -> str:
        """Where in the tables the rows stand, and what is recorded of earlier ones."""
        tables = (
            self.measurements, self.correlations, self.corrections, self.stock, self.handling
        )  # fmt: skip
        return repr(([[row.line for row in rows] for rows in tables], self.history))


@dataclass(frozen=True, slots=True)
class Catalogue:
    """Look-ups over all substances, made once for all pages.

    ``decided`` are the findings that the laboratory leaves as they are, each with its reason;
    ``limits`` those that the cross-checks judge by.
    """

    handbook: Handbook
    findings: tuple[Finding, ...]
    in_order: tuple[str, ...]
    families: Mapping[str, tuple[str, ...]]
    family_labels: Mapping[str, str]
    formulas: Mapping[str, tuple[str, ...]]
    isomer_sets: tuple[tuple[str, ...], ...]
    rows: Mapping[str, Rows]
    decided: tuple[tuple[Finding, str], ...]
    limits: tuple[Threshold, ...]
    _by_slug: Mapping[str, tuple[Finding, ...]]
    _kirkwood: Mapping[str, float | None]
    _names: Mapping[str, str]
    _sets: Mapping[str, tuple[str, ...]]

    def findings_of(self, slug: str) -> tuple[Finding, ...]:
        """What the checks have to say about one substance."""
        return self._by_slug.get(slug, ())

    def isomers_of(self, slug: str) -> tuple[str, ...]:
        """The other substances with the same formula."""
        formula = self.handbook.molecules[slug].formula
        return tuple(other for other in self.formulas[formula] if other != slug)

    def set_of(self, slug: str) -> tuple[str, ...]:
        """Its set of positional and stereoisomers, itself included; empty where it has none."""
        return self._sets.get(slug, ())

    def flash_class(self, slug: str) -> FlashClass | None:
        """Its class among flammable liquids; None where flash or boiling point is missing."""
        ends = [self.handbook.at(slug, key) for key in ("flash_point", "boiling_point")]
        return flash_class(*(None if value is None else value.value for value in ends))

    def swaps_of(self, slug: str) -> tuple[str, ...]:
        """What one might swap a substance for: its family by permittivity, nearest first.

        Isomers are left out, since a sheet shows them by themselves.
        """
        own, isomers = self._kirkwood[slug], {slug, *self.isomers_of(slug)}

        def distance(other: str) -> tuple[float, str]:
            theirs = self._kirkwood[other]
            unknown = own is None or theirs is None
            return (1.0 if unknown else abs(theirs - own), self._names[other])  # type: ignore[operator]

        family = self.families[self.handbook.molecules[slug].family]
        return tuple(nsmallest(SWAPS_SHOWN, (s for s in family if s not in isomers), distance))

    def picture(self, figures: Mapping[str, str], slug: str, kind: str) -> Markup:
        """One of the small pictures of a substance, empty where there is none."""
        return Markup(figures.get(f"{slug}:{kind}", ""))


def catalogue(
    handbook: Handbook, findings: Sequence[Problem], judged: Review = NOT_JUDGED
) -> Catalogue:
    """The look-ups for a computed handbook and its findings."""
    solvents = handbook.dataset.solvents
    in_order = sorted(solvents, key=lambda slug: (sorting_name(solvents[slug].name), slug))
    families: dict[str, list[str]] = defaultdict(list)
    formulas: dict[str, list[str]] = defaultdict(list)
    positions: dict[str, list[str]] = defaultdict(list)
    labels: dict[str, str] = {}
    for slug in in_order:
        molecule = handbook.molecules[slug]
        families[molecule.family].append(slug)
        formulas[molecule.formula].append(slug)
        positions[molecule.position_key].append(slug)
        labels[molecule.family] = molecule.family_label
    owners = _owners(handbook)
    # An address counts the findings of one substance, so that one more leaves the others alone.
    by_slug: dict[str, list[Finding]] = defaultdict(list)
    placed = []
    for problem in findings:
        owner = _owner(problem, owners, solvents)
        place = f"finding-{owner or 'tables'}-{len(by_slug[owner]) + 1}"
        placed.append(Finding(problem, place, owner))
        by_slug[owner].append(placed[-1])
    isomer_sets = tuple(tuple(members) for members in positions.values() if len(members) > 1)
    return Catalogue(
        handbook=handbook,
        findings=tuple(placed),
        in_order=tuple(in_order),
        families={key: tuple(families[key]) for key in sorted(families, key=labels.__getitem__)},
        family_labels=labels,
        formulas={key: tuple(members) for key, members in formulas.items()},
        isomer_sets=isomer_sets,
        decided=tuple(
            (Finding(problem, "", _owner(problem, owners, solvents)), reason)
            for problem, reason in judged.kept
        ),
        limits=judged.thresholds,
        rows=_rows(handbook),
        _by_slug={slug: tuple(found) for slug, found in by_slug.items()},
        _kirkwood=handbook.kept.each(
            in_order, "kirkwood function", lambda some: [_kirkwood(handbook, s) for s in some]
        ),
        _names={slug: solvents[slug].name.casefold() for slug in in_order},
        _sets={slug: members for members in isomer_sets for slug in members},
    )


class _Unknown(dict[Any, Any]):
    """Findings that are still being looked for: whoever asks for them is refused."""

    def _refuse(self, *_: object) -> Any:
        raise LookupError("the findings are not known yet")

    __getitem__ = __iter__ = __len__ = get = _refuse


def without_findings(handbook: Handbook) -> Catalogue:
    """The look-ups while the findings are still being looked for; they must not be asked for."""
    nothing: Any = _Unknown()
    known = catalogue(handbook, ())
    return replace(known, findings=nothing, decided=nothing, limits=nothing, _by_slug=nothing)


def _kirkwood(handbook: Handbook, slug: str) -> float | None:
    value = handbook.at(slug, "kirkwood_function")
    return None if value is None else value.value


_PREFIXES = re.compile(
    r"^(?:(?:cis|trans|tert|sec|alpha|beta|gamma|delta|DL|[nompNOSEZRSDLαβγδε]|\d+'?|[(),'±+])+-)+"
)


def sorting_name(name: str) -> str:
    """A chemical name without the locants and prefixes that a dictionary passes over."""
    bare = _PREFIXES.sub("", name)
    return (bare or name).casefold()


def _rows(handbook: Handbook) -> dict[str, Rows]:
    dataset = handbook.dataset
    return {
        slug: Rows(*parts)
        for slug, *parts in zip(
            dataset.solvents,
            _shared_out(dataset.solvents, dataset.measurements),
            _shared_out(dataset.solvents, dataset.correlations),
            _shared_out(dataset.solvents, dataset.corrections),
            _shared_out(dataset.solvents, dataset.stock),
            _shared_out(dataset.solvents, dataset.handling),
            _shared_out(dataset.solvents, dataset.history),
            strict=True,
        )
    }


class _HasSolvent(Protocol):
    @property
    def solvent(self) -> str: ...


class _HasPlace(_HasSolvent, Protocol):
    @property
    def line(self) -> int: ...


_Row = TypeVar("_Row", bound=_HasSolvent)


def _shared_out(slugs: Iterable[str], rows: Iterable[_Row]) -> list[tuple[_Row, ...]]:
    """The rows of one table, dealt out to the substances in their order."""
    shares: dict[str, list[_Row]] = {slug: [] for slug in slugs}
    for row in rows:
        if row.solvent in shares:
            shares[row.solvent].append(row)
    return [tuple(share) for share in shares.values()]


def _owners(handbook: Handbook) -> dict[tuple[str, int], str]:
    """Which substance a row of a table belongs to."""
    dataset = handbook.dataset
    owners = {("solvents.csv", s.line): slug for slug, s in dataset.solvents.items()}
    tables: Mapping[str, Sequence[_HasPlace]] = {
        "measurements.csv": dataset.measurements,
        "correlations.csv": dataset.correlations,
        "corrections.csv": dataset.corrections,
        "stock.csv": dataset.stock,
        "handling.csv": dataset.handling,
    }
    for file, rows in tables.items():
        owners.update({(file, row.line): row.solvent for row in rows})
    return owners


def _owner(
    problem: Problem, owners: Mapping[tuple[str, int], str], solvents: Mapping[str, object]
) -> str:
    slug = owners.get((problem.file, problem.line), "")
    return slug if slug in solvents else ""
