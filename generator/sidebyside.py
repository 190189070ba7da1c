"""The numbers of every substance in one small script, for the page that sets some side by side.

A classic script, because a browser loads that from a file as well as from a server; short,
because a thousand substances must fit. Numbers are text as every other page shows them.
"""

from __future__ import annotations

import json
from collections.abc import Sequence
from typing import Any

from generator.bydegree import by_degree, drawn
from generator.catalogue import Catalogue, Links
from generator.contexts import Number
from generator.datasheet import COMPARED, GROUPS, POLAR, TREND
from generator.quantities import QUANTITIES
from generator.wording import MARKS, celsius, celsius_label, number, range_label, unit_label

PATH = "assets/handbook-data.js"
_EPS = "relative_permittivity"
_CONSTANTS = (
    "dipole_moment", "melting_point", "boiling_point", "flash_point", "molar_mass",
)  # fmt: skip


def groups(catalogue: Catalogue) -> tuple[tuple[str, tuple[str, ...]], ...]:
    """Titles with the quantities under them, in the order of a datasheet; none left out."""
    placed = {key for _, keys in GROUPS for key in keys} | set(_CONSTANTS)
    rest = tuple(key for key in QUANTITIES if key not in placed)
    known = {
        key
        for key in QUANTITIES
        if any(catalogue.handbook.at(slug, key) is not None for slug in catalogue.in_order)
    }
    titled = (*GROUPS, ("The molecule and its changes", _CONSTANTS), ("Others", rest))
    made = ((title, tuple(key for key in keys if key in known)) for title, keys in titled)
    return tuple((title, keys) for title, keys in made if keys)


def data_script(catalogue: Catalogue) -> bytes:
    """The script, which defines ``handbookData`` and does nothing else."""
    handbook = catalogue.handbook
    links = Links("")
    shown = groups(catalogue)
    keys = tuple(key for _, group in shown for key in group)
    solvents = handbook.kept.each(
        catalogue.in_order,
        "side-by-side",
        lambda slugs: [_short_json(_solvent(catalogue, slug, keys)) for slug in slugs],
        keys,
    )
    head = {
        "most": COMPARED,
        "marks": {mark.letter: f"{mark.label}: {mark.meaning}" for mark in MARKS},
        "groups": [
            {"title": title, "rows": [_quantity(key, links) for key in keys]}
            for title, keys in shown
        ],
        "listed": [celsius_label(t) for t in handbook.temperatures],
    }
    text = f'{_short_json(head)[:-1]},"solvents":[{",".join(solvents.values())}]}}'
    return f"window.handbookData = {text};\n".encode()


def _short_json(content: object) -> str:
    return json.dumps(content, ensure_ascii=False, separators=(",", ":"))


def _quantity(key: str, links: Links) -> dict[str, str]:
    quantity = QUANTITIES[key]
    return {
        "name": quantity.name,
        "symbol": quantity.symbol,
        "unit": unit_label(quantity.unit),
        "href": links.method(key),
    }


def _solvent(catalogue: Catalogue, slug: str, keys: Sequence[str]) -> dict[str, Any]:
    handbook = catalogue.handbook
    solvent, molecule = handbook.dataset.solvents[slug], handbook.molecules[slug]
    liquid = handbook.liquid_range(slug)
    return {
        "slug": slug,
        "n": solvent.name,
        "c": solvent.cas,
        "f": molecule.formula,
        "s": list(solvent.synonyms),
        "k": molecule.inchikey,
        "words": [
            molecule.family_label,
            POLAR[handbook.is_polar(slug)],
            TREND[handbook.trend(slug).sign],
            range_label(liquid.low, liquid.high),
            f"{celsius(handbook.own_reference(slug))} °C",
        ],
        "values": [_cell(number(handbook.at(slug, key), {})) for key in keys],
        "listed": [_cell(number(v, {})) for v in handbook.series(slug, _EPS)],
        "curve": drawn(by_degree(handbook, slug)),
    }


def _cell(shown: Number | None) -> str:
    """Value, uncertainty and letters of the marks behind bars; trailing bars fall away."""
    if shown is None:
        return ""
    return "|".join((shown.value, shown.uncertainty, shown.letters)).rstrip("|")
