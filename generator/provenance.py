"""Where the numbers of one substance come from: its sources, rows and curves, and what was used."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import replace

from generator.catalogue import Links, Rows
from generator.contexts import Citation, CurveRow, Link, SourceGroup, SourceValue
from generator.dataset import Correction, Correlation, Measurement, concerns
from generator.explain import decision_at, note
from generator.metrics import Handbook
from generator.quantities import QUANTITIES
from generator.reconcile import Candidate
from generator.wording import (
    celsius_label,
    printed_label,
    range_label,
    split_value,
    symbol_markup,
    unit_label,
)

KEY_VALUES = (
    "relative_permittivity", "refractive_index", "density", "dipole_moment", "viscosity",
    "vapour_pressure", "conductivity", "melting_point", "boiling_point", "flash_point",
)  # fmt: skip

Trail = Mapping[tuple[str, int], Candidate]


def trail(handbook: Handbook, slug: str) -> Trail:
    """What became of each row at the substance's own reference, by file and line."""
    found: dict[tuple[str, int], Candidate] = {}
    for key in KEY_VALUES:
        done = note(handbook, slug, handbook.at(slug, key))
        for candidate in decision_at(handbook, slug, key).candidates:
            told = replace(candidate, remark=done) if done else candidate
            found[candidate.file, candidate.line] = told
    return found


def numbering(handbook: Handbook, slug: str, rows: Rows) -> dict[str, Link]:
    """The sources behind a substance, numbered in the order in which the sheet meets them."""
    keys: dict[str, None] = {}
    for key in KEY_VALUES:
        value = handbook.at(slug, key)
        keys.update(dict.fromkeys(value.sources if value else ()))
    keys.update(dict.fromkeys(row.source for row in rows.measurements))
    keys.update(dict.fromkeys(row.source for row in rows.correlations))
    keys.update(dict.fromkeys(row.source for row in rows.handling))
    known = [key for key in keys if key in handbook.sources]
    return {key: Link(str(i), f"#source-{i}") for i, key in enumerate(known, start=1)}


def citations(handbook: Handbook, numbered: Mapping[str, Link]) -> tuple[Citation, ...]:
    """The sources of a sheet in the order of their numbers."""
    sources = handbook.sources
    return tuple(
        Citation(
            link.text,
            link.href.removeprefix("#"),
            sources[key].citation,
            sources[key].kind.replace("-", " "),
            sources[key].doi or "",
        )
        for key, link in numbered.items()
    )


def measured(rows: Rows, numbered: Mapping[str, Link], way: Trail) -> tuple[SourceGroup, ...]:
    """Every row of the measurements, by quantity, with the part it has in the chosen value."""
    groups = []
    for quantity in QUANTITIES.values():
        made = tuple(
            _source_value(row, rows.corrections, numbered, way)
            for row in rows.measurements
            if row.quantity == quantity.key
        )
        if made:
            groups.append(SourceGroup(quantity.name, symbol_markup(quantity.symbol), made))
    return tuple(groups)


def _source_value(
    row: Measurement,
    corrections: Sequence[Correction],
    numbered: Mapping[str, Link],
    way: Trail,
) -> SourceValue:
    correction = next((c for c in corrections if concerns(c, row)), None)
    quantity = QUANTITIES[row.quantity]
    if correction is None:
        status, reason = _fate(way.get(("measurements.csv", row.line)), row.note)
    elif correction.action == "exclude":
        status, reason = "left out", correction.reason
    elif correction.action == "replace":
        status, reason = f"replaced by {correction.replacement}", correction.reason
    else:
        status, reason = "kept after review", correction.reason
    uncertainty = ""
    if row.uncertainty is not None:
        _, digits = split_value(row.value, row.uncertainty, quantity.decimals)
        uncertainty = f"{digits} {unit_label(quantity.unit)}".strip()
    return SourceValue(
        printed=printed_label(row.printed, row.printed_unit),
        uncertainty=uncertainty or "not stated",
        temperature="" if row.temperature is None else celsius_label(row.temperature),
        source=numbered.get(row.source),
        method=row.method,
        status=status,
        reason=reason,
        row=f"measurements.csv, line {row.line}",
    )


def _fate(candidate: Candidate | None, note: str) -> tuple[str, str]:
    """Whether a row speaks for the value at the substance's own reference, and why or why not."""
    if candidate is None:
        return "on record", note
    remark = "" if candidate.remark == "as published" else candidate.remark
    percent = round(100 * candidate.weight)
    status = f"weight {percent} %" if percent else "weight below 1 %"
    status = status if candidate.weight > 0 else "set aside"
    return status, "; ".join(part for part in (remark, note) if part)


def curves(
    rows: Rows, links: Links, numbered: Mapping[str, Link], way: Trail
) -> tuple[CurveRow, ...]:
    """Every temperature curve, with the part it has in the chosen value."""
    return tuple(
        CurveRow(
            quantity=QUANTITIES[curve.quantity].name,
            form=Link(curve.form.replace("_", " "), links.form(curve.form)),
            coefficients="  ".join(f"{c:.6g}".replace("-", "\u2212") for c in curve.coefficients),
            unit=unit_label(curve.unit),
            span=range_label(curve.t_min, curve.t_max),
            uncertainty="not stated" if curve.uncertainty is None else f"{curve.uncertainty:g}",
            source=numbered.get(curve.source),
            status=_part_of_curve(curve, rows.corrections, way),
            row=f"correlations.csv, line {curve.line}",
        )
        for curve in rows.correlations
    )


def _part_of_curve(curve: Correlation, corrections: Sequence[Correction], way: Trail) -> str:
    correction = next((c for c in corrections if concerns(c, curve)), None)
    if correction is not None and correction.action == "exclude":
        return f"left out: {correction.reason}"
    return _fate(way.get(("correlations.csv", curve.line)), "")[0]
