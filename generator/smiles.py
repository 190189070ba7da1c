"""Why a SMILES string cannot be read, in words for whoever typed it."""

from __future__ import annotations

import re
from typing import TYPE_CHECKING

if TYPE_CHECKING:
    from rdkit.Chem import Mol

_BRACKETED = re.compile(r"\[[^\[\]]*\]")
_ATOM = re.compile(r"Cl|Br|[BCNOPSFI]|[bcnops*]")
_RING = re.compile(r"%(\d\d)|(\d)")
_BOND_AT_END = re.compile(r"[-=#$:/\\~]$|[-=#$:]\)")


def why_unreadable(smiles: str) -> str:
    """What is wrong with a SMILES string that rdkit refuses."""
    from rdkit import Chem, rdBase

    with rdBase.BlockLogs():
        mol: Mol | None = Chem.MolFromSmiles(smiles, sanitize=False)
        problems = () if mol is None else Chem.DetectChemistryProblems(mol)
    if mol is None:
        return _misspelt(smiles)
    for problem in problems:
        if problem.GetType() == "AtomValenceException":
            atom = mol.GetAtomWithIdx(problem.GetAtomIdx())
            return f"atom {atom.GetIdx() + 1}, {atom.GetSymbol()}, has more bonds than it can have"
        if problem.GetType() == "AtomKekulizeException":
            atom = mol.GetAtomWithIdx(problem.GetAtomIdx())
            return f"atom {atom.GetIdx() + 1} is written as aromatic and is in no ring"
    return "a ring in lower-case letters cannot be aromatic as it stands: is a hydrogen missing?"


def _misspelt(smiles: str) -> str:
    for left, right, name in (("(", ")", "round"), ("[", "]", "square")):
        if smiles.count(left) != smiles.count(right):
            return f"{smiles.count(left)} opening and {smiles.count(right)} closing {name} brackets"
    bare = _BRACKETED.sub("*", smiles)
    rings = ["".join(number) for number in _RING.findall(bare)]
    for number in dict.fromkeys(rings):
        if rings.count(number) % 2:
            return f"ring number {number} is opened and not closed"
    strange = re.search(r"[^\d%().=#$:/\\~@+-]", _ATOM.sub("", bare))
    if strange:
        return (
            f"{strange[0]!r} is no atom; elements other than B, C, N, O, P, S, F, Cl, Br and I "
            "stand in square brackets, and a name is no SMILES"
        )
    if _BOND_AT_END.search(bare):
        return "a bond that leads nowhere"
    return "it follows no rule of SMILES; draw the structure again"
