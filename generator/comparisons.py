"""The comparison tables: all substances in one table each, and isomers side by side."""

from __future__ import annotations

from collections.abc import Callable, Mapping, Sequence
from itertools import chain
from typing import NamedTuple

from markupsafe import Markup

from generator.catalogue import Catalogue, Links, anchor
from generator.contexts import Link, Number
from generator.datasheet import COMPARED, POLAR, TREND, trend_line
from generator.listings import Cell, Column, Group, IsomerRow, IsomerSet, Table
from generator.quantities import QUANTITIES
from generator.structures import drawing
from generator.units import ZERO_CELSIUS
from generator.wording import (
    MARKS,
    cell_parts,
    celsius,
    celsius_label,
    formula_markup,
    labelled,
    marks_of,
    number,
    padding,
    places,
    range_label,
    symbol_markup,
    unit_label,
)

ROOT = "../"  # the tables stand one folder down
TITLES = {
    "reference": "At the reference temperature",
    "permittivity": "Permittivity by temperature",
    "temperature-coefficients": "Temperature coefficients",
    "association": "Association",
    "isomers": "Isomers side by side",
}
AT_REFERENCE = (
    "relative_permittivity", "kirkwood_function", "lippert_mataga_polarizability",
    "dipole_moment", "refractive_index", "density", "molar_volume", "molar_polarization",
    "molar_refraction", "viscosity", "vapour_pressure", "bjerrum_length",
    "born_solvation_energy", "melting_point", "boiling_point", "flash_point",
)  # fmt: skip
SIDE_BY_SIDE = (
    "relative_permittivity", "kirkwood_function", "lippert_mataga_polarizability",
    "dipole_moment", "onsager_dipole_moment", "kirkwood_correlation_factor",
    "temperature_coefficient", "expected_temperature_coefficient", "refractive_index", "density",
    "molar_volume", "molar_refraction", "viscosity", "vapour_pressure", "melting_point",
    "boiling_point", "flash_point",
)  # fmt: skip
ASSOCIATION = (
    "dipole_moment", "debye_dipole_moment", "onsager_dipole_moment",
    "kirkwood_correlation_factor", "relative_permittivity", "orientation_polarization",
)  # fmt: skip


def _quantity_column(key: str, links: Links) -> Column:
    quantity = QUANTITIES[key]
    return Column(
        anchor(key), quantity.name, symbol_markup(quantity.symbol), unit_label(quantity.unit),
        "number", links.method(key),
    )  # fmt: skip


def _text_column(key: str, title: str) -> Column:
    return Column(key, title, Markup(""), "", "text", "")


def _picture_column(key: str, title: str) -> Column:
    return Column(key, title, Markup(""), "", "picture", "")


class Draft(NamedTuple):
    """One row but for what depends on other rows: padding and pictures go between its ``parts``.

    ``places`` holds the digits behind the point for each number, -1 where there is none.
    """

    parts: tuple[str, ...]
    places: tuple[int, ...]
    marks: tuple[str, ...]


def _table(
    catalogue: Catalogue,
    figures: Mapping[str, str],
    key: str,
    lead: str,
    columns: Sequence[Column],
    cells: Callable[[str], Sequence[Cell]],
) -> Table:
    """Rows in the order of names, decimal points of each number column in line."""
    drafts = catalogue.handbook.kept.each(
        catalogue.in_order,
        f"row of {key}",
        lambda slugs: [_draft(catalogue, slug, columns, cells(slug)) for slug in slugs],
    )
    most = [max(column) for column in zip(*(d.places for d in drafts.values()), strict=True)]
    holes = [column for column in columns if column.kind != "text"]
    rows = []
    for slug, draft in drafts.items():
        numbers = iter(map(padding, most, draft.places))
        fill = [
            next(numbers) if hole.kind == "number" else catalogue.picture(figures, slug, hole.key)
            for hole in holes
        ]
        rows.append(
            Markup("".join(chain.from_iterable(zip(draft.parts, [*fill, ""], strict=True))))
        )
    present = {mark for draft in drafts.values() for mark in draft.marks}
    legend = tuple(mark for mark in MARKS if mark.key in present)
    return Table(key, TITLES[key], lead, tuple(columns), tuple(rows), legend)


def _draft(
    catalogue: Catalogue, slug: str, columns: Sequence[Column], cells: Sequence[Cell]
) -> Draft:
    solvent = catalogue.handbook.dataset.solvents[slug]
    row = Markup(
        '<tr><th scope="row"><a href="{}">{}</a></th><td class="cas">{}</td>'
        '<td class="family">{}</td>'
    ).format(
        Links(ROOT).solvent(slug), solvent.name, solvent.cas,
        catalogue.handbook.molecules[slug].family_label,
    )  # fmt: skip
    parts = []
    for column, cell in zip(columns, cells, strict=True):
        if column.kind == "text":
            row += Markup('<td class="text">{}</td>').format(cell.text)
            continue
        head, tail = '<td class="picture">', "</td>"
        if column.kind == "number":
            head, tail = cell_parts(cell.number, "ref" if column.reference else "")
        parts.append(f"{row}{head}")
        row = Markup(tail)
    numbers = [cell.number for c, cell in zip(columns, cells, strict=True) if c.kind == "number"]
    return Draft(
        (*parts, f"{row}</tr>"),
        tuple(map(places, numbers)),
        tuple(mark.key for mark in marks_of(*numbers)),
    )


def _temperature_cell(catalogue: Catalogue, slug: str) -> Cell:
    return Cell(celsius(catalogue.handbook.own_reference(slug)))


def _at_reference(catalogue: Catalogue, figures: Mapping[str, str]) -> Table:
    handbook = catalogue.handbook
    links = Links(ROOT)
    columns = [
        _text_column("polar", "Polar?"),
        _picture_column("scale", "Polarity scale"),
        _text_column("at", "At / °C"),
        *(_quantity_column(key, links) for key in AT_REFERENCE),
        _text_column("trend", "ε on warming"),
    ]

    def cells(slug: str) -> Sequence[Cell]:
        return (
            Cell(POLAR[handbook.is_polar(slug)]),
            Cell(),
            _temperature_cell(catalogue, slug),
            *(Cell(number=number(handbook.at(slug, key), {})) for key in AT_REFERENCE),
            Cell(handbook.trend(slug).sign),
        )

    lead = (
        f"Every substance at {celsius_label(handbook.reference)}, or at the nearest temperature "
        "at which it is liquid and known; the column “At” says which."
    )
    return _table(catalogue, figures, "reference", lead, columns, cells)


def _permittivity(catalogue: Catalogue, figures: Mapping[str, str]) -> Table:
    handbook = catalogue.handbook
    columns = [
        _picture_column("ribbon", "ε(T)"),
        *(
            Column(
                f"at{t - ZERO_CELSIUS:.6g}", f"{celsius(t)} °C", Markup(""), "", "number", "",
                abs(t - handbook.reference) < 1e-6,
            )
            for t in handbook.temperatures
        ),
        _text_column("liquid", "Liquid range"),
    ]  # fmt: skip

    def cells(slug: str) -> Sequence[Cell]:
        liquid = handbook.liquid_range(slug)
        return (
            Cell(),
            *(Cell(number=number(v, {})) for v in handbook.series(slug, "relative_permittivity")),
            Cell(range_label(liquid.low, liquid.high)),
        )

    lead = (
        "Relative permittivity ε of the liquid at the laboratory's temperatures. An empty place "
        "means not liquid there, or no value near enough to stand for it."
    )
    return _table(catalogue, figures, "permittivity", lead, columns, cells)


def _coefficients(catalogue: Catalogue, figures: Mapping[str, str]) -> Table:
    handbook = catalogue.handbook
    links = Links(ROOT)
    left_over = Column(
        "left-over", "Left over: change of association", Markup(""), "K⁻¹", "number", ""
    )
    columns = [
        _text_column("sign", "On warming"),
        _picture_column("ribbon", "ε(T)"),
        _text_column("at", "At / °C"),
        _quantity_column("temperature_coefficient", links),
        _text_column("basis", "From"),
        _quantity_column("expected_temperature_coefficient", links),
        left_over,
    ]

    def cells(slug: str) -> Sequence[Cell]:
        trend = trend_line(handbook, slug, {})
        return (
            Cell(TREND[handbook.trend(slug).sign]),
            Cell(),
            _temperature_cell(catalogue, slug),
            Cell(number=trend.observed),
            Cell(trend.observed.basis if trend.observed else ""),
            Cell(number=trend.expected),
            Cell(number=trend.left_over),
        )

    lead = (
        "Slope of the permittivity by temperature, observed, and as thermal expansion and thermal "
        "agitation alone would make it. What is left over is change of association. The sign "
        "holds with 95 % confidence; “no trend” means that the slope is smaller than its "
        "uncertainty."
    )
    return _table(catalogue, figures, "temperature-coefficients", lead, columns, cells)


def _association(catalogue: Catalogue, figures: Mapping[str, str]) -> Table:
    handbook = catalogue.handbook
    links = Links(ROOT)
    columns = [
        _text_column("bonding", "Hydrogen bonds"),
        _text_column("at", "At / °C"),
        *(_quantity_column(key, links) for key in ASSOCIATION),
    ]

    def cells(slug: str) -> Sequence[Cell]:
        return (
            Cell("donor" if handbook.molecules[slug].is_associated else "no donor"),
            _temperature_cell(catalogue, slug),
            *(Cell(number=_value(catalogue, slug, key)) for key in ASSOCIATION),
        )

    lead = (
        "How the dipoles of neighbours stand to each other. A Kirkwood factor g well above 1: "
        "parallel, as in chains of alcohols; near 1: independent; below 1: opposed, as in pairs. "
        "No factor is given where the gas-phase moment is zero within its uncertainty."
    )
    return _table(catalogue, figures, "association", lead, columns, cells)


def _value(catalogue: Catalogue, slug: str, key: str) -> Number | None:
    return number(catalogue.handbook.at(slug, key), {})


def isomer_sets(catalogue: Catalogue) -> tuple[tuple[str, ...], ...]:
    """Every set of isomers, in the order of their formulas."""
    molecules = catalogue.handbook.molecules
    return tuple(sorted(catalogue.isomer_sets, key=lambda m: (molecules[m[0]].formula, m[0])))


def isomer_set(catalogue: Catalogue, members: Sequence[str]) -> IsomerSet:
    """A set of isomers with its quantities in rows and its members in columns."""
    handbook = catalogue.handbook
    links = Links(ROOT)
    molecules = [handbook.molecules[slug] for slug in members]
    rows = [
        IsomerRow("Is it polar?", Markup(""), "", "", _words(catalogue, members)),
        IsomerRow(
            "On warming", symbol_markup("ε"), "", "",
            tuple(Cell(TREND[handbook.trend(slug).sign]) for slug in members),
        ),
    ]  # fmt: skip
    for key in SIDE_BY_SIDE:
        quantity = QUANTITIES[key]
        cells = tuple(Cell(number=_value(catalogue, slug, key)) for slug in members)
        if any(cell.number for cell in cells):
            rows.append(
                IsomerRow(
                    quantity.name,
                    symbol_markup(quantity.symbol),
                    unit_label(quantity.unit),
                    links.method(key),
                    cells,
                )
            )
    return IsomerSet(
        f"isomers-{members[0]}",
        formula_markup(molecules[0].formula),
        molecules[0].formula,
        tuple(Link(handbook.dataset.solvents[slug].name, links.solvent(slug)) for slug in members),
        tuple(
            labelled(
                drawing(handbook.molecules[slug].smiles, 130, 90),
                f"Structure of {handbook.dataset.solvents[slug].name}",
            )
            for slug in members
        ),
        tuple(celsius_label(handbook.own_reference(slug)) for slug in members),
        tuple(rows),
        links.compare(members) if len(members) <= COMPARED else "",
        marks_of(*(cell.number for row in rows for cell in row.cells)),
    )


def _words(catalogue: Catalogue, members: Sequence[str]) -> tuple[Cell, ...]:
    return tuple(Cell(POLAR[catalogue.handbook.is_polar(slug)]) for slug in members)


def same_formula(catalogue: Catalogue) -> tuple[Group, ...]:
    """Substances that share a formula, whatever their functions."""
    solvents = catalogue.handbook.dataset.solvents
    links = Links(ROOT)
    return tuple(
        Group(
            anchor(formula),
            formula_markup(formula),
            tuple(Link(solvents[slug].name, links.solvent(slug)) for slug in members),
        )
        for formula, members in sorted(catalogue.formulas.items())
        if len(members) > 1
    )


# The tables with a row a substance, in the order of the menu.
TABLES: Mapping[str, Callable[[Catalogue, Mapping[str, str]], Table]] = {
    "reference": _at_reference,
    "permittivity": _permittivity,
    "temperature-coefficients": _coefficients,
    "association": _association,
}
