"""Machine-readable files: every number in one table, the findings, the whole handbook, the tables.

Numbers are written with the fewest digits that give the same number back, so that whatever is
derived can be worked out again from what is exported.
"""

from __future__ import annotations

import csv
import io
import json
import math
from collections.abc import Iterable, Iterator, Mapping, Sequence
from dataclasses import asdict
from pathlib import Path
from typing import Any

from generator.catalogue import Catalogue
from generator.metrics import Handbook
from generator.quantities import QUANTITIES
from generator.schema import DESCRIPTION, read_package
from generator.timeline import feed
from generator.units import ZERO_CELSIUS
from generator.values import Value

FOLDER = "downloads"
VALUE_COLUMNS = (
    "solvent", "cas", "quantity", "temperature_c", "value", "uncertainty", "unit", "basis",
    "sources", "marks",
)  # fmt: skip
FINDING_COLUMNS = (
    "severity", "solvent", "kind", "file", "line", "column", "found", "expected", "evidence",
    "strength", "hint",
)  # fmt: skip


def exports(book: Catalogue, data_folder: Path) -> dict[str, bytes]:
    """Every file a reader may take away, by its path in the site; equal input, equal bytes."""
    return {**numbers(book, data_folder), **findings(book)}


def findings(book: Catalogue) -> dict[str, bytes]:
    """The table of findings, by its path in the site."""
    return {f"{FOLDER}/findings.csv": _table([FINDING_COLUMNS, *_finding_rows(book)])}


def numbers(book: Catalogue, data_folder: Path) -> dict[str, bytes]:
    """Every file but that of the findings, by its path in the site."""
    handbook = book.handbook
    slugs = tuple(handbook.dataset.solvents)
    shares = handbook.kept.each(slugs, "export", lambda some: [_share(handbook, s) for s in some])
    rows = {slug: share[0] for slug, share in shares.items()}
    head = _table([VALUE_COLUMNS])
    files = {
        "values.csv": head + b"".join(rows.values()),
        "handbook.json": _json(handbook, {slug: share[1] for slug, share in shares.items()}),
        "changes.atom": feed(
            handbook.dataset.history,
            {slug: solvent.name for slug, solvent in handbook.dataset.solvents.items()},
            handbook.settings.laboratory,
        ),
        **{f"solvents/{slug}.csv": head + own for slug, own in rows.items()},
        **{f"data/{name}": content for name, content in _package(data_folder)},
    }
    return {f"{FOLDER}/{name}": content for name, content in files.items()}


def _share(handbook: Handbook, slug: str) -> tuple[bytes, bytes]:
    """What follows from one substance: its rows of the table of values, and itself as JSON."""
    values = tuple(values_of(handbook, slug))
    return _table(_value_rows(handbook, slug, values)), _dumped(_solvent(handbook, slug, values))


def values_of(handbook: Handbook, slug: str) -> Iterator[Value]:
    """Every number of a substance: by quantity, then by temperature, none of them twice."""
    for key, quantity in QUANTITIES.items():
        given = [handbook.at(slug, key)]
        if quantity.needs_temperature:
            given += handbook.series(slug, key)
        by_temperature = {value.temperature: value for value in given if value is not None}
        yield from (by_temperature[at] for at in sorted(by_temperature, key=lambda t: t or 0.0))


def _value_rows(
    handbook: Handbook, slug: str, values: Iterable[Value]
) -> Iterator[Sequence[object]]:
    cas = handbook.dataset.solvents[slug].cas
    for value in values:
        yield (
            slug, cas, value.quantity, _celsius(value.temperature), value.value,
            _finite(value.uncertainty), QUANTITIES[value.quantity].unit, value.basis,
            "; ".join(value.sources), "; ".join(value.marks),
        )  # fmt: skip


def _finding_rows(book: Catalogue) -> Iterator[Sequence[object]]:
    for finding in book.findings:
        fields = {**finding.problem.as_dict(), "solvent": finding.slug}
        yield [fields[column] for column in FINDING_COLUMNS]


def _table(rows: Iterable[Sequence[object]]) -> bytes:
    """CSV in UTF-8; None is an empty cell."""
    text = io.StringIO()
    csv.writer(text, lineterminator="\n").writerows(rows)
    return text.getvalue().encode()


def _json(handbook: Handbook, solvents: Mapping[str, bytes]) -> bytes:
    """The whole handbook; ``solvents`` are its substances as JSON."""
    settings = handbook.settings
    head = {
        "revision": handbook.dataset.revision,
        "laboratory": settings.laboratory,
        "reference_temperature_c": settings.reference_temperature_c,
        "temperatures_c": settings.temperatures_c,
        "quantities": {
            key: {"name": q.name, "symbol": q.symbol, "unit": q.unit, "definition": q.definition}
            for key, q in QUANTITIES.items()
        },
        "sources": {
            key: {"kind": s.kind, "citation": s.citation, "year": s.year, "doi": s.doi}
            for key, s in handbook.sources.items()
        },
    }
    listed = b",".join(b"%b:%b" % (_dumped(slug), own) for slug, own in solvents.items())
    return b'%b,"solvents":{%b}}\n' % (_dumped(head)[:-1], listed)


def _dumped(content: object) -> bytes:
    text = json.dumps(content, ensure_ascii=False, allow_nan=False, separators=(",", ":"))
    return text.encode()


def _solvent(handbook: Handbook, slug: str, found: Iterable[Value]) -> dict[str, Any]:
    solvent, molecule = handbook.dataset.solvents[slug], handbook.molecules[slug]
    liquid = handbook.liquid_range(slug)
    values: dict[str, list[dict[str, Any]]] = {}
    for value in found:
        values.setdefault(value.quantity, []).append(_value(value))
    return {
        "name": solvent.name,
        "cas": solvent.cas,
        "synonyms": solvent.synonyms,
        "note": solvent.note,
        **asdict(molecule),
        "is_polar": handbook.is_polar(slug),
        "reference_temperature_c": _celsius(handbook.own_reference(slug)),
        "liquid_range_c": [_celsius(liquid.low), _celsius(liquid.high)],
        "trend": _trend(handbook, slug),
        "values": values,
    }


def _value(value: Value) -> dict[str, Any]:
    return {
        "temperature_c": _celsius(value.temperature),
        "value": value.value,
        "uncertainty": _finite(value.uncertainty),
        "basis": value.basis,
        "sources": value.sources,
        "marks": value.marks,
    }


def _trend(handbook: Handbook, slug: str) -> dict[str, Any]:
    trend = handbook.trend(slug)
    return {
        "sign": trend.sign,
        "value": _finite(trend.value),
        "uncertainty": _finite(trend.uncertainty),
        "temperature_c": _celsius(trend.temperature),
        "basis": trend.basis,
        "sources": trend.sources,
    }


def _celsius(temperature: float | None) -> float | None:
    """Kelvin as °C, without the noise of the subtraction."""
    return None if temperature is None else round(temperature - ZERO_CELSIUS, 9) + 0.0


def _finite(number: float) -> float | None:
    return number if math.isfinite(number) else None


def _package(folder: Path) -> Iterator[tuple[str, bytes]]:
    """The laboratory's tables as they are, with their description."""
    paths = [resource["path"] for resource in read_package(folder)["resources"]]
    for path in (DESCRIPTION, *paths):
        if (folder / path).is_file():
            yield path, (folder / path).read_bytes()
