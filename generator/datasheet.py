"""One substance → everything its datasheet says, in the order in which it says it."""

from __future__ import annotations

import math
from collections.abc import Mapping, Sequence
from dataclasses import replace

from markupsafe import Markup

from generator.bydegree import by_degree, control
from generator.catalogue import Catalogue, Finding, Links, Rows
from generator.contexts import (
    ContainerRow,
    Datasheet,
    Foot,
    HandlingLines,
    Link,
    MetricGroup,
    MetricRow,
    Notice,
    QuantityRow,
    Related,
    TrendLine,
)
from generator.flammability import class_label
from generator.linked import dataset_description, identity, quotation
from generator.metrics import POLAR_ABOVE, UNPOLAR_BELOW, Handbook
from generator.provenance import KEY_VALUES, citations, curves, measured, numbering, trail
from generator.quantities import QUANTITIES
from generator.structures import Molecule, drawing
from generator.timeline import past
from generator.units import ZERO_CELSIUS
from generator.values import Value
from generator.ways import way_anchor, ways
from generator.wording import (
    celsius,
    celsius_label,
    formula_markup,
    labelled,
    marks_of,
    number,
    prose,
    range_label,
    script_json,
    split_value,
    symbol_markup,
    unit_label,
)

ROOT = "../"  # datasheets stand one folder down

# Metrics by temperature, grouped as they are read. What is not named here comes last of its own.
GROUPS: tuple[tuple[str, tuple[str, ...]], ...] = (
    (
        "The liquid",
        (
            "relative_permittivity",
            "density",
            "refractive_index",
            "viscosity",
            "vapour_pressure",
            "conductivity",
        ),
    ),
    (
        "Polarity functions",
        ("kirkwood_function", "clausius_mossotti_function", "lippert_mataga_polarizability"),
    ),
    (
        "By mole",
        (
            "molar_volume",
            "molar_polarization",
            "molar_refraction",
            "orientation_polarization",
        ),
    ),
    (
        "Dipole moment and association",
        ("debye_dipole_moment", "onsager_dipole_moment", "kirkwood_correlation_factor"),
    ),
    (
        "By temperature",
        ("temperature_coefficient", "expected_temperature_coefficient", "thermal_expansivity"),
    ),
    (
        "Ions and charge",
        (
            "bjerrum_length",
            "born_solvation_energy",
            "debye_length_01",
            "debye_length_001",
            "charge_relaxation_time",
        ),
    ),
)
COMPARED = 5  # as many as stand side by side


POLAR = {
    "polar": "Polar",
    "unpolar": "Unpolar",
    "borderline": "Borderline",
    "not known": "Not known",
}
TREND = {
    "falls": "Falls on warming",
    "rises": "Rises on warming",
    "no trend": "No trend within its uncertainty",
    "not known": "Not known",
}


def datasheet(catalogue: Catalogue, slug: str, figures: Mapping[str, str], foot: Foot) -> Datasheet:
    """The datasheet of one substance. ``figures`` holds SVG text by ``slug``, ``slug:scale``
    (polarity scale), ``slug:ribbon`` (temperature ribbon) and ``slug:structure`` (a drawing to take
    instead of the plain one); a missing one is left out."""
    handbook = catalogue.handbook
    solvent = handbook.dataset.solvents[slug]
    molecule = handbook.molecules[slug]
    links = Links(ROOT)
    rows = catalogue.rows[slug]
    way = trail(handbook, slug)
    numbered = numbering(handbook, slug, rows)
    own = handbook.own_reference(slug)
    liquid = handbook.liquid_range(slug)
    key_values = _key_values(handbook, slug, links, numbered)
    permittivity = number(handbook.at(slug, "relative_permittivity"), numbered)
    degrees = by_degree(handbook, slug)
    described = identity(handbook, slug, ROOT)
    metrics = _metrics(handbook, slug, links)
    isomers, swaps = catalogue.isomers_of(slug), catalogue.swaps_of(slug)
    return Datasheet(
        slug=slug,
        name=solvent.name,
        cas=solvent.cas,
        family=molecule.family_label,
        family_link=Link(molecule.family_label, links.family(molecule.family)),
        formula=formula_markup(molecule.formula),
        formula_plain=molecule.formula,
        molar_mass=described["molar_mass"],
        synonyms=solvent.synonyms,
        smiles=molecule.smiles,
        inchi=molecule.inchi,
        inchikey=molecule.inchikey,
        note=solvent.note,
        structure=labelled(
            figures.get(f"{slug}:structure") or drawing(molecule.smiles, 190, 130),
            f"Structure of {solvent.name}, SMILES {molecule.smiles}",
        ),
        reference=celsius_label(handbook.reference),
        own_reference=celsius_label(own),
        own_reference_c=f"{own - ZERO_CELSIUS:.6g}",
        permittivity=permittivity,
        polar_key=handbook.is_polar(slug).replace(" ", "-"),
        polar=POLAR[handbook.is_polar(slug)],
        polar_reason=_polar_reason(handbook, slug, molecule),
        trend=trend_line(handbook, slug, numbered),
        notices=_notices(catalogue, slug, links),
        scale=catalogue.picture(figures, slug, "scale"),
        ribbon=catalogue.picture(figures, slug, "ribbon"),
        figure=Markup(figures.get(slug, "")),
        figure_text=_figure_text(handbook, slug, solvent.name),
        control=script_json(control(degrees)) if degrees else Markup(""),
        liquid_range=range_label(liquid.low, liquid.high),
        key_values=key_values,
        value_marks=marks_of(*(row.number for row in key_values)),
        temperatures=tuple(celsius(t) for t in handbook.temperatures),
        reference_column=_position(handbook.temperatures, handbook.reference),
        metrics=metrics,
        metric_columns=len(handbook.temperatures) + 2,  # with name and unit
        metric_marks=marks_of(*(c for g in metrics for r in g.rows for c in r.cells)),
        ways=ways(handbook, slug, links, numbered),
        measured=measured(rows, numbered, way),
        curves=curves(rows, links, numbered, way),
        handling=_handling(rows, numbered),
        containers=_containers(rows),
        isomers=tuple(related(catalogue, other, figures) for other in isomers),
        isomers_href=links.isomers(catalogue.set_of(slug)),
        swaps=tuple(related(catalogue, other, figures) for other in swaps),
        swaps_total=len(catalogue.families[molecule.family]) - 1,
        compare_href=links.compare([slug]),
        compare_isomers_href=links.compare([slug, *isomers][:COMPARED]),
        compare_swaps_href=links.compare([slug, *swaps][:COMPARED]),
        flash_class=class_label(catalogue.flash_class(slug)),
        flash_class_link=Link("GHS, chapter 2.6", links.flash_classes()),
        quotation=quotation(solvent, permittivity, foot),
        csv_href=described["csv"],
        measurements_href=links.table("measurements.csv"),
        correlations_href=links.table("correlations.csv"),
        json_ld=script_json(
            dataset_description(described, key_values, foot.laboratory, foot.revision)
        ),
        history=past(rows.history),
        citations=citations(handbook, numbered),
        foot=foot,
    )


def _position(temperatures: Sequence[float], reference: float) -> int:
    """Column of the reference temperature, −1 where it is none of the columns."""
    return next((i for i, t in enumerate(temperatures) if abs(t - reference) < 1e-6), -1)


def _polar_reason(handbook: Handbook, slug: str, molecule: Molecule) -> str:
    parts = []
    orientation = handbook.at(slug, "lippert_mataga_polarizability")
    if orientation is not None:
        digits = split_value(orientation.value, orientation.uncertainty, 3)[0]
        parts.append(f"Δf = {digits} (polar from {POLAR_ABOVE:g}, unpolar to {UNPOLAR_BELOW:g})")
    dipole = handbook.at(slug, "dipole_moment")
    if molecule.zero_dipole:
        parts.append("no dipole moment by symmetry")
    elif dipole is not None:
        parts.append(f"dipole moment {split_value(dipole.value, dipole.uncertainty, 2)[0]} D")
    return ", ".join(parts) if parts else "neither permittivity nor dipole moment on record"


def trend_line(handbook: Handbook, slug: str, numbered: Mapping[str, Link]) -> TrendLine:
    """The observed and the expected slope, and what is left between them."""
    trend = handbook.trend(slug)
    expected = handbook.expected_trend(slug)
    quantity = QUANTITIES["temperature_coefficient"]
    observed = None
    if math.isfinite(trend.value):
        observed = Value(
            quantity.key, trend.value, trend.uncertainty, trend.temperature,
            trend.basis, trend.sources, (),
        )  # fmt: skip
    left_over = None
    if observed is not None and expected is not None:
        spread = math.hypot(observed.uncertainty, expected.uncertainty)
        left_over = Value(
            quantity.key, observed.value - expected.value, spread, observed.temperature,
            "computed", (), (),
        )  # fmt: skip
    return TrendLine(
        key=trend.sign.replace(" ", "-"),
        words=TREND[trend.sign],
        remark=trend.remark,
        observed=number(observed, numbered),
        expected=number(expected, numbered),
        left_over=number(left_over, numbered, quantity=quantity),
    )


def _notices(catalogue: Catalogue, slug: str, links: Links) -> tuple[Notice, ...]:
    handbook = catalogue.handbook
    own = handbook.own_reference(slug)
    notices = []
    if abs(own - handbook.reference) > 1e-6:
        notices.append(
            Notice(
                "note",
                "Note",
                f"Not liquid, or not measured, at {celsius_label(handbook.reference)}: single "
                f"values on this page are at {celsius_label(own)} unless they say otherwise.",
                "",
            )
        )
    if handbook.at(slug, "relative_permittivity") is None:
        notices.append(Notice("note", "Note", "No permittivity on record for the liquid.", ""))
    notices += [
        Notice(
            "hazard",
            "Peroxides",
            f"Peroxide former, group {line.peroxide_group}, as transcribed by the laboratory.",
            "#handling",
        )
        for line in catalogue.rows[slug].handling
        if line.peroxide_group
    ]
    if handbook.molecules[slug].is_associated:
        notices.append(
            Notice(
                "note",
                "Associated",
                "Hydrogen-bonded liquid: equations that let molecules turn independently "
                "do not hold.",
                "#metrics",
            )
        )
    notices += [_check(finding, links) for finding in catalogue.findings_of(slug)]
    return tuple(notices)


def _check(finding: Finding, links: Links) -> Notice:
    problem = finding.problem
    text = f"{problem.found} (expected: {problem.expected})" if problem.expected else problem.found
    label = "Error" if problem.severity == "error" else "Check"
    return Notice("check", label, prose(text), f"{links.root}review.html#{finding.anchor}")


def _figure_text(handbook: Handbook, slug: str, name: str) -> str:
    """What the curve shows, for those who do not see it."""
    pairs = [
        (t, v)
        for t, v in zip(
            handbook.temperatures, handbook.series(slug, "relative_permittivity"), strict=True
        )
        if v is not None
    ]
    if not pairs:
        return f"No permittivity by temperature is known for {name}."
    (low_t, low), (high_t, high) = pairs[0], pairs[-1]
    first = split_value(low.value, low.uncertainty, 2)[0]
    if len(pairs) == 1:
        return f"Relative permittivity of {name}: {first} at {celsius_label(low_t)}."
    last = split_value(high.value, high.uncertainty, 2)[0]
    return (
        f"Relative permittivity of {name} against temperature: {first} at "
        f"{celsius_label(low_t)}, {last} at {celsius_label(high_t)}."
    )


def _key_values(
    handbook: Handbook, slug: str, links: Links, numbered: Mapping[str, Link]
) -> tuple[QuantityRow, ...]:
    rows = []
    for key in KEY_VALUES:
        quantity = QUANTITIES[key]
        rows.append(
            QuantityRow(
                quantity.name,
                symbol_markup(quantity.symbol),
                unit_label(quantity.unit),
                links.method(key),
                number(handbook.at(slug, key), numbered),
            )
        )
    return tuple(rows)


def _metrics(handbook: Handbook, slug: str, links: Links) -> tuple[MetricGroup, ...]:
    placed = {key for _, keys in GROUPS for key in keys}
    rest = tuple(q.key for q in QUANTITIES.values() if q.needs_temperature and q.key not in placed)
    groups = []
    for title, keys in (*GROUPS, ("Others", rest)):
        rows = []
        for key in keys:
            quantity = QUANTITIES[key]
            cells = tuple(number(v, {}) for v in handbook.series(slug, key))
            if any(cells):
                rows.append(
                    MetricRow(
                        quantity.name,
                        symbol_markup(quantity.symbol),
                        unit_label(quantity.unit),
                        links.method(key),
                        way_anchor(key),
                        cells,
                    )
                )
        if rows:
            groups.append(MetricGroup(title, tuple(rows)))
    return tuple(groups)


def _handling(rows: Rows, numbered: Mapping[str, Link]) -> tuple[HandlingLines, ...]:
    return tuple(
        HandlingLines(
            line.h_statements,
            line.storage,
            line.peroxide_group,
            line.sds_revision,
            numbered.get(line.source),
        )
        for line in rows.handling
    )


def _containers(rows: Rows) -> tuple[ContainerRow, ...]:
    return tuple(
        ContainerRow(
            c.container, c.grade, str(c.size), c.location,
            str(c.received or ""), str(c.opened or ""), str(c.test_due or ""),
        )
        for c in rows.stock
    )  # fmt: skip


def related(catalogue: Catalogue, slug: str, figures: Mapping[str, str]) -> Related:
    """All that the sheets of other substances show of one."""
    handbook = catalogue.handbook
    solvent = handbook.dataset.solvents[slug]
    shown = handbook.kept.of(
        slug,
        "related",
        lambda: Related(
            Link(solvent.name, f"{slug}.html"),
            solvent.cas,
            number(handbook.at(slug, "relative_permittivity"), {}),
            POLAR[handbook.is_polar(slug)],
            Markup(""),
        ),
    )
    return replace(shown, scale=catalogue.picture(figures, slug, "scale"))
