"""What a structure alone lets expect: molar volume, boiling point, and moment in the liquid.

Each is a sum over the parts of the molecule, their share of it, and its family. The parts are
counted in the canonical SMILES text and the formula, so that no molecule needs to be built. The
contributions were fitted once to the open liquids (tests/audit/learn_spreads.py makes them again)
and are shipped in ``reference/increments.csv``.
"""

from __future__ import annotations

import csv
import math
import re
from collections import Counter
from collections.abc import Mapping
from functools import lru_cache
from pathlib import Path
from typing import TYPE_CHECKING

if TYPE_CHECKING:
    from generator.structures import Molecule

_TABLE = Path(__file__).parent / "reference" / "increments.csv"
_TOKEN = re.compile(r"\[[^\]]+\]|Cl|Br|[BCNOPSFI]|[bcnops]|[=#]|%\d\d|\d")
_ELEMENT = re.compile(r"([A-Z][a-z]?)(\d*)")
_AROMATIC = {"b", "c", "n", "o", "p", "s", "[nH]"}
_GROUPS = {
    "carbonyl": re.compile(r"C\(=O\)|O=C"),
    "hydroxyl": re.compile(r"O(?![A-Za-z(\[=#\d])|^O(?=[A-Z\[])"),
    "nitro": re.compile(r"\[N\+\]\(=O\)|O=\[N\+\]"),
    "sulfinyl": re.compile(r"S\(=O\)|O=S"),
}
# The shipped models: what each foretells, all as natural logarithms.
MODELS = ("molar_volume", "boiling_point", "liquid_moment")


def parts(molecule: Molecule) -> Mapping[str, float]:
    """How often each part occurs, its share by atom, the family, and the size of the molecule."""
    counts: Counter[str] = Counter()
    heavy = 0
    for element, number in _ELEMENT.findall(molecule.formula):
        counts[element] += int(number or 1)
        heavy += int(number or 1) if element not in ("H", "D") else 0
    tokens = _TOKEN.findall(molecule.smiles)
    # Each ring closure is written twice.
    counts["ring"] = sum(token.isdigit() or token[0] == "%" for token in tokens) // 2
    counts["aromatic atom"] = sum(token in _AROMATIC for token in tokens)
    counts["double bond"] = tokens.count("=")
    counts["triple bond"] = tokens.count("#")
    counts["branch"] = molecule.smiles.count("(")
    counts["associated"] = int(molecule.is_associated)
    for name, pattern in _GROUPS.items():
        counts[name] = len(pattern.findall(molecule.smiles))
    size = max(1, heavy)
    found = {name: float(count) for name, count in counts.items() if count}
    shares = {f"{name} by atom": count / size for name, count in found.items()}
    return {
        **found,
        **shares,
        f"family {molecule.family}": 1.0,
        f"family {molecule.family} by atom": 1.0 / size,
        "ln atoms": math.log(size),
        "ln molar mass": math.log(molecule.molar_mass),
        "molecule": 1.0,
    }


def size(molecule: Molecule) -> float:
    """ln of the number of atoms without hydrogen: how neighbours in a series are told apart."""
    return parts(molecule)["ln atoms"]


def series_key(molecule: Molecule) -> str:
    """Key shared by the members of a homologous series: same family and functions, any chain."""
    functions = molecule.position_key.partition("|")[2].split(" ")
    return " ".join([molecule.family, *(f for f in functions if not re.fullmatch(r"-\d+", f))])


@lru_cache(maxsize=1)
def _contributions() -> Mapping[str, tuple[float, ...]]:
    with _TABLE.open(encoding="utf-8", newline="") as file:
        rows = list(csv.DictReader(file))
    return {row["part"]: tuple(float(row[model]) for model in MODELS) for row in rows}


@lru_cache(maxsize=4096)
def foretold(molecule: Molecule) -> Mapping[str, float]:
    """Molar volume at 20 °C [cm3/mol], boiling point [K] and Onsager moment of the liquid [D].

    Empty for a molecule without carbon or with an element the open liquids did not teach. How
    far off each may be stands in ``reference/spreads.csv``.
    """
    known = _contributions()
    counts = parts(molecule)
    if "C" not in counts or any(
        name not in known for name in counts if not name.startswith("family")
    ):
        return {}
    sums = [0.0] * len(MODELS)
    for name, count in counts.items():
        for i, contribution in enumerate(known.get(name, ())):
            sums[i] += count * contribution
    return {model: math.exp(total) for model, total in zip(MODELS, sums, strict=True)}
