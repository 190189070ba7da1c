"""The pages that are about the handbook as a whole: home, review list, methods, sources, data."""

from __future__ import annotations

import math
from collections import Counter, defaultdict
from collections.abc import Mapping, Sequence
from typing import Any

from markupsafe import Markup

from generator import flammability
from generator.catalogue import Catalogue, Links, anchor
from generator.comparisons import TITLES
from generator.contexts import Foot, Link
from generator.datasheet import POLAR
from generator.listings import (
    Count,
    DictionaryField,
    DictionaryTable,
    Download,
    Group,
    Home,
    KeptRow,
    LimitRow,
    ReviewRow,
    SourceEntry,
)
from generator.metrics import Handbook
from generator.polarity_map import Axis, Point, polarity_map
from generator.spreads import Threshold
from generator.units import ZERO_CELSIUS
from generator.wording import celsius_label, number, prose, script_json, unit_label

ROOT = ""  # these pages stand at the top


def home(catalogue: Catalogue, laboratory: str, foot: Foot) -> Home:
    """The finder with its index, the map, and what the handbook holds."""
    handbook = catalogue.handbook
    dataset = handbook.dataset
    links = Links(ROOT)
    families = tuple(
        Group(
            f"family-{anchor(key)}",
            Markup.escape(catalogue.family_labels[key]),
            tuple(Link(dataset.solvents[slug].name, links.solvent(slug)) for slug in members),
        )
        for key, members in catalogue.families.items()
    )
    return Home(
        laboratory=laboratory,
        reference=celsius_label(handbook.reference),
        index_json=_index_json(catalogue),
        total=len(dataset.solvents),
        families=families,
        flash_classes=tuple((c.key, f"{c.label}: {c.criterion}") for c in flammability.CLASSES),
        polar_map=_map(catalogue),
        counts=_counts(catalogue),
        findings=_finding_counts(catalogue),
        tables=tuple(Link(title, f"tables/{key}.html") for key, title in TITLES.items()),
        foot=foot,
    )


def _index_json(catalogue: Catalogue) -> Markup:
    """The finder's index: what its columns are called, then a row a substance.

    ``<`` is escaped so that the text may stand inside a script element.
    """
    entries = catalogue.handbook.kept.each(
        catalogue.in_order,
        "finder",
        lambda slugs: [script_json(list(_entry(catalogue, slug).values())) for slug in slugs],
    )
    names = script_json(list(_entry(catalogue, catalogue.in_order[0]))) if entries else "[]"
    return Markup(f"[{','.join((names, *entries.values()))}]")


def _entry(catalogue: Catalogue, slug: str) -> dict[str, Any]:
    handbook = catalogue.handbook
    solvent, molecule = handbook.dataset.solvents[slug], handbook.molecules[slug]
    permittivity = number(handbook.at(slug, "relative_permittivity"), {})
    liquid = handbook.liquid_range(slug)
    flash = catalogue.flash_class(slug)
    return {
        "n": solvent.name,
        "c": solvent.cas,
        "f": molecule.formula,
        "s": list(solvent.synonyms),
        "k": molecule.inchikey,
        "g": f"family-{anchor(molecule.family)}",
        "p": handbook.is_polar(slug),
        "e": permittivity.value if permittivity else "",
        "t": permittivity.temperature if permittivity else "",
        "u": slug,
        "m": _degrees(liquid.low),
        "b": _degrees(liquid.high),
        "h": flash.key if flash else "",
        "o": int(bool(catalogue.rows[slug].stock)),
    }


def _degrees(temperature: float | None) -> float | None:
    """Kelvin as °C to a tenth, as the finder compares it."""
    return None if temperature is None else round(temperature - ZERO_CELSIUS, 1)


def _map(catalogue: Catalogue) -> Markup:
    known = catalogue.handbook.kept.each(
        catalogue.in_order,
        "point",
        lambda slugs: [_point(catalogue.handbook, slug) for slug in slugs],
    )
    points = [point for point in known.values() if point is not None]
    widest = max((p.x for p in points), default=40.0)
    lowest = 0.05 * int(min((p.y for p in points), default=0.0) / 0.05)
    upwards = Axis("Kirkwood function (ε−1)/(2ε+1)", lowest, 0.5, 0.05, 2)
    top = 10.0 * (int(widest / 10.0) + 1)
    across = Axis("Molar refraction / cm³ mol⁻¹", 0.0, top, 10.0 if top <= 100 else 50.0, 0)
    return polarity_map(
        points,
        across,
        upwards,
        f"Map of {len(points)} substances, molar refraction across and Kirkwood function upwards; "
        "each point leads to its datasheet",
    )


def _point(handbook: Handbook, slug: str) -> Point | None:
    refraction = handbook.at(slug, "molar_refraction")
    kirkwood = handbook.at(slug, "kirkwood_function")
    permittivity = number(handbook.at(slug, "relative_permittivity"), {})
    if refraction is None or kirkwood is None or permittivity is None:
        return None
    polar = handbook.is_polar(slug)
    donor = handbook.molecules[slug].is_associated
    return Point(
        refraction.value,
        kirkwood.value,
        handbook.dataset.solvents[slug].name,
        f"ε {permittivity.value} at {permittivity.temperature}, {POLAR[polar].lower()}",
        Links(ROOT).solvent(slug),
        "donor" if donor else "unpolar" if polar == "unpolar" else "dipolar",
    )


def _counts(catalogue: Catalogue) -> tuple[Count, ...]:
    handbook = catalogue.handbook
    dataset = handbook.dataset
    known = handbook.kept.each(
        catalogue.in_order,
        "is known",
        lambda slugs: [handbook.at(slug, "relative_permittivity") is not None for slug in slugs],
    )
    return (
        Count(str(len(dataset.solvents)), "substances", "tables/reference.html"),
        Count(str(sum(known.values())), "with a permittivity", "tables/permittivity.html"),
        Count(str(len(dataset.measurements)), "published values", "sources.html"),
        Count(str(len(dataset.correlations)), "temperature curves", "methods.html#curves"),
        Count(str(len(dataset.sources)), "sources", "sources.html"),
    )


def _finding_counts(catalogue: Catalogue) -> tuple[Count, ...]:
    kinds = Counter(finding.problem.kind for finding in catalogue.findings)
    return tuple(
        Count(str(count), kind.replace("-", " "), "review.html")
        for kind, count in sorted(kinds.items(), key=lambda pair: (-pair[1], pair[0]))
    )


def review(catalogue: Catalogue) -> tuple[ReviewRow, ...]:
    """Every finding, with the substance it concerns where there is one."""
    solvents = catalogue.handbook.dataset.solvents
    links = Links(ROOT)
    return tuple(
        ReviewRow(
            finding.anchor,
            finding.problem.severity,
            Link(solvents[finding.slug].name, links.solvent(finding.slug))
            if finding.slug
            else None,
            finding.problem.place,
            finding.problem.kind.replace("-", " "),
            prose(finding.problem.found),
            prose(finding.problem.expected),
            prose(finding.problem.hint),
            prose(finding.problem.evidence),
        )
        for finding in catalogue.findings
    )


def kept_findings(catalogue: Catalogue) -> tuple[KeptRow, ...]:
    """The findings that the laboratory has decided against, each with its reason."""
    solvents = catalogue.handbook.dataset.solvents
    links = Links(ROOT)
    rows = []
    for finding, reason in catalogue.decided:
        problem = finding.problem
        rows.append(
            KeptRow(
                Link(solvents[finding.slug].name, links.solvent(finding.slug)),
                prose(problem.found),
                prose(problem.evidence),
                prose(reason),
                problem.place,
            )
        )
    return tuple(rows)


def limits(catalogue: Catalogue) -> tuple[LimitRow, ...]:
    """For each cross-check how far apart its two sides usually lie, and how far they may lie."""
    grouped: dict[str, list[Threshold]] = defaultdict(list)
    for threshold in catalogue.limits:
        grouped[threshold.title].append(threshold)
    return tuple(
        LimitRow(
            # A symbol in front keeps its letter.
            title[:1].upper() + title[1:] if title[:2].isascii() else title,
            _span(found[0], [t.spread for t in found]),
            _span(found[0], [t.limit for t in found]),
            str(max(t.count for t in found)) if any(t.count for t in found) else "",
        )
        for title, found in sorted(grouped.items())
    )


def _span(threshold: Threshold, values: Sequence[float]) -> str:
    """The least and the greatest of some spreads or limits, with their unit."""
    shares = threshold.relative
    ends = [100 * math.expm1(v) if shares else v for v in (min(values), max(values))]
    low, high = (f"{end:.2g}" if end < 100 else f"{end:.0f}" for end in ends)
    unit = "%" if shares else unit_label("K" if threshold.unit == "degC" else threshold.unit)
    return prose(f"{low if low == high else f'{low} to {high}'} {unit}".strip())


def sources(catalogue: Catalogue) -> tuple[SourceEntry, ...]:
    """Every source with how much of the handbook comes from it."""
    handbook = catalogue.handbook
    values = Counter(m.source for m in handbook.dataset.measurements)
    curves = Counter(c.source for c in handbook.dataset.correlations)
    return tuple(
        SourceEntry(
            anchor(key),
            key,
            source.citation,
            source.kind.replace("-", " "),
            str(source.year or ""),
            source.doi or "",
            str(values[key]),
            str(curves[key]),
        )
        for key, source in sorted(handbook.sources.items())
    )


def dictionary(package: Mapping[str, Any]) -> tuple[DictionaryTable, ...]:
    """Tables and columns as the Tabular Data Package describes them."""
    tables = []
    for resource in package.get("resources", ()):
        schema = resource.get("schema", {})
        keys = _as_list(schema.get("primaryKey", ()))
        foreign = {
            field: f"{key['reference'].get('resource') or resource['name']}"
            for key in schema.get("foreignKeys", ())
            for field in _as_list(key["fields"])
        }
        tables.append(
            DictionaryTable(
                anchor(resource["name"]),
                resource["name"],
                resource.get("path", ""),
                resource.get("title", resource["name"]),
                resource.get("description", ""),
                tuple(
                    DictionaryField(
                        field["name"],
                        field.get("title", ""),
                        field.get("type", "string"),
                        field.get("description", ""),
                        _rules(field, foreign.get(field["name"], "")),
                        field["name"] in keys,
                    )
                    for field in schema.get("fields", ())
                ),
            )
        )
    return tuple(tables)


def _as_list(value: object) -> Sequence[str]:
    return (value,) if isinstance(value, str) else tuple(value)  # type: ignore[arg-type]


_RULES = {
    "required": "must be filled",
    "unique": "must be unique",
    "minimum": "at least {}",
    "maximum": "at most {}",
    "minLength": "at least {} characters",
    "maxLength": "at most {} characters",
    "pattern": "pattern {}",
    "enum": "one of {}",
}


def _rules(field: Mapping[str, Any], refers_to: str) -> str:
    rules = []
    for key, value in field.get("constraints", {}).items():
        if key in _RULES and value is not False:
            shown = ", ".join(map(str, value)) if isinstance(value, list) else value
            rules.append(_RULES[key].format(shown))
    if refers_to:
        rules.append(f"must stand in {refers_to}")
    return "; ".join(rules)


def downloads(package: Mapping[str, Any]) -> tuple[Download, ...]:
    """The files a reader may take away."""
    own = {
        "values.csv": "Every number, measured and derived alike, a row each, with uncertainty, "
        "unit, temperature, basis and sources",
        "findings.csv": "The review list",
        "handbook.json": "The whole handbook, by substance",
        "changes.atom": "What changed, as a feed for a feed reader (Atom)",
    }
    made = [Download(Link(name, f"downloads/{name}"), what) for name, what in own.items()]
    if package:
        made.append(
            Download(
                Link("datapackage.json", "downloads/data/datapackage.json"),
                "The laboratory's tables as a Tabular Data Package: this description and the "
                "tables below",
            )
        )
    for resource in package.get("resources", ()):
        path = resource.get("path", "")
        what = resource.get("title", "") or resource.get("description", "")
        made.append(Download(Link(path, f"downloads/data/{path}"), what))
    return tuple(made)
