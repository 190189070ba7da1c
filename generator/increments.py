"""What a structure alone lets expect: refraction, molar volume, boiling point, liquid moment.

Each is a sum over the parts of the molecule, their share of it, and its family: atom types by
their surroundings (the types of Wildman and Crippen, J. Chem. Inf. Comput. Sci. 39 (1999) 868),
rings, conjugated bonds, branches, hydrogen-bond donors. The contributions were fitted once to the
open liquids (tests/audit/learn_spreads.py makes them again) and are shipped in
``reference/increments.csv``.

rdkit is imported inside the functions: loading this module costs nothing.
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

from generator.conformers import parse
from generator.structures import additive_refraction

if TYPE_CHECKING:
    from rdkit.Chem import Mol

    from generator.structures import Molecule

_TABLE = Path(__file__).parent / "reference" / "increments.csv"
# The shipped models: what each foretells. The refraction is foretold as a correction of the
# additive one of Wildman and Crippen.
MODELS = ("refraction", "molar_volume", "boiling_point", "liquid_moment")
# A part that fewer open liquids have is rare: its contribution is hardly known.
FEWEST = 12
# ln of the most atoms (without hydrogen) that the contributions were taught by many liquids with.
LARGEST = math.log(24)
# Elements that enough open liquids hold.
ELEMENTS = frozenset({"C", "H", "N", "O", "F", "Si", "P", "S", "Cl", "Br", "I"})
_DICARBONYL = "O=[#6]-!@[#6]=O"
_ORTHO = "[!#1;!R]~c~c~[!#1;!R]"


@lru_cache(maxsize=4096)
def parts(molecule: Molecule) -> Mapping[str, float]:
    """How often each part occurs, its share by atom, the family, and the size of the molecule."""
    from rdkit import Chem, rdBase
    from rdkit.Chem import rdMolDescriptors

    mol = parse(molecule.smiles)
    with rdBase.BlockLogs():
        whole = Chem.AddHs(mol)
    types, labels = [0] * whole.GetNumAtoms(), [""] * whole.GetNumAtoms()
    rdMolDescriptors._CalcCrippenContribs(whole, False, types, labels)
    counts = Counter(labels)
    counts.update(f"ring of {len(ring)}" for ring in mol.GetRingInfo().AtomRings())
    counts.update(_conjugated(mol))
    for atom in mol.GetAtoms():
        if atom.GetAtomicNum() == 6 and atom.GetDegree() > 2:
            if atom.GetDegree() == 4:
                counts["branched twice"] += 1
            elif not atom.IsInRing():
                counts["branched once"] += 1
        if atom.GetAtomicNum() in (7, 8):
            counts[f"{atom.GetSymbol()}H"] += atom.GetTotalNumHs()
    counts["ortho pair"] = len(mol.GetSubstructMatches(_pattern(_ORTHO)))
    counts["dicarbonyl"] = len(mol.GetSubstructMatches(_pattern(_DICARBONYL)))
    heavy = max(1, mol.GetNumHeavyAtoms())
    found = {name: float(count) for name, count in counts.items() if count}
    return {
        **found,
        **{f"{name} by atom": count / heavy for name, count in found.items()},
        f"family {molecule.family}": 1.0,
        f"family {molecule.family} by atom": 1.0 / heavy,
        "ln atoms": math.log(heavy),
        "ln molar mass": math.log(molecule.molar_mass),
        "molecule": 1.0,
    }


def _conjugated(mol: Mol) -> list[str]:
    """Single bonds between unsaturated neighbours, by the elements they join."""
    return [
        "conjugated " + "-".join(sorted(map(_letter, (bond.GetBeginAtom(), bond.GetEndAtom()))))
        for bond in mol.GetBonds()
        if bond.GetIsConjugated() and bond.GetBondTypeAsDouble() == 1.0
    ]


def _letter(atom: object) -> str:
    symbol = str(atom.GetSymbol())  # type: ignore[attr-defined]
    return symbol.lower() if atom.GetIsAromatic() else symbol  # type: ignore[attr-defined]


@lru_cache(maxsize=8)
def _pattern(smarts: str) -> Mol:
    from rdkit import Chem

    return Chem.MolFromSmarts(smarts)


def turns(molecule: Molecule) -> bool:
    """Whether two polar groups turn against each other, so that no one shape holds."""
    return "dicarbonyl" in parts(molecule)


def size(molecule: Molecule) -> float:
    """ln of the number of atoms without hydrogen: how neighbours in a series are told apart."""
    return parts(molecule)["ln atoms"]


def series_key(molecule: Molecule) -> str:
    """Key shared by the members of a homologous series: same family and functions, any chain."""
    functions = molecule.position_key.partition("|")[2].split(" ")
    return " ".join([molecule.family, *(f for f in functions if not re.fullmatch(r"-\d+", f))])


@lru_cache(maxsize=1)
def _contributions() -> Mapping[str, tuple[int, tuple[float, ...]]]:
    """Liquids that taught a part, and its contribution to each model."""
    with _TABLE.open(encoding="utf-8", newline="") as file:
        return {
            row["part"]: (int(row["liquids"]), tuple(float(row[model]) for model in MODELS))
            for row in csv.DictReader(file)
        }


def is_organic(molecule: Molecule) -> bool:
    """Whether there is carbon in it, and nothing that organic liquids seldom hold."""
    elements = set(re.findall(r"[A-Z][a-z]?", molecule.formula))
    return "C" in elements and elements <= ELEMENTS


def is_rare(molecule: Molecule) -> bool:
    """Whether too few open liquids are like the molecule to foretell much about it."""
    known, found = _contributions(), parts(molecule)
    rare = any(name not in known or known[name][0] < FEWEST for name in found)
    return rare or "conjugated C-C" in found or found["ln atoms"] > LARGEST


@lru_cache(maxsize=4096)
def foretold(molecule: Molecule) -> Mapping[str, float]:
    """What the structure lets expect, by model.

    Molar refraction [cm3/mol], molar volume at 20 °C [cm3/mol], boiling point [K] and Onsager
    moment of the liquid [D]. Empty for a molecule that is not organic. How far off each may be
    stands in ``reference/spreads.csv``.
    """
    known = _contributions()
    if not is_organic(molecule):
        return {}
    sums = [0.0] * len(MODELS)
    for name, count in parts(molecule).items():
        for i, contribution in enumerate(known[name][1] if name in known else ()):
            sums[i] += count * contribution
    found = {model: math.exp(total) for model, total in zip(MODELS, sums, strict=True)}
    found["refraction"] *= additive_refraction(molecule.smiles)
    return found
