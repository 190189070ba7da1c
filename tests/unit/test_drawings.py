"""Structure drawings and the arrow of the dipole moment."""

from __future__ import annotations

import re
from xml.etree import ElementTree as ET

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from rdkit import Chem

from generator.drawings import drawing

SVG = "{http://www.w3.org/2000/svg}"
EXAMPLES = ("O", "CC(C)=O", "Cl/C=C\\Cl", "C[N+](=O)[O-]", "CC1=CC[C@@H](CC1)C(C)=C", "C1COCCO1")


def arrow(smiles: str) -> np.ndarray | None:
    """Unit vector from the crossed tail to the head, on the page (y downward)."""
    root = ET.fromstring(drawing(smiles, dipole=True))
    paths = [path.get("d", "") for path in root.iter(f"{SVG}path") if path.get("class") == "dipole"]
    if not paths:
        return None
    numbers = [float(number) for number in re.findall(r"-?\d+\.\d", paths[0])]
    tail, head = np.array(numbers[:2]), np.array(numbers[2:4])
    way: np.ndarray = (head - tail) / np.linalg.norm(head - tail)
    return way


@pytest.mark.parametrize("smiles", EXAMPLES)
@pytest.mark.parametrize("dipole", [False, True])
def test_drawings_are_clean(smiles: str, dipole: bool) -> None:
    text = drawing(smiles, 200, 150, dipole=dipole)
    assert text.startswith("<svg ")
    assert 'role="img"' in text
    root = ET.fromstring(text)
    assert root.get("viewBox") == "0 0 200 150"
    assert not any("id" in element.attrib for element in root.iter())
    # every colour is the page's own, and nothing is painted behind the structure
    assert not re.search(r"#[0-9A-Fa-f]{3,8}|rgb\(|<rect|<style|style=|DOCTYPE|<\?xml", text)
    colours = {element.get("stroke") for element in root} | {
        element.get("fill") for element in root
    }
    assert colours <= {"currentColor", "none", None}
    assert sum(1 for _ in root.iter(f"{SVG}path")) >= 3


@pytest.mark.parametrize("smiles", EXAMPLES)
def test_drawings_stay_on_the_canvas(smiles: str) -> None:
    for dipole in (False, True):
        root = ET.fromstring(drawing(smiles, 180, 130, dipole=dipole))
        for path in root.iter(f"{SVG}path"):
            numbers = [float(x) for x in re.findall(r"-?\d+(?:\.\d+)?", path.get("d", ""))]
            assert all(0 <= x <= 180 for x in numbers[::2])
            assert all(0 <= y <= 130 for y in numbers[1::2])


@settings(max_examples=30, deadline=None)
@given(smiles=st.sampled_from(EXAMPLES), seed=st.integers(1, 2**31 - 1))
def test_same_structure_same_bytes(smiles: str, seed: int) -> None:
    shuffled = Chem.MolToRandomSmilesVect(Chem.MolFromSmiles(smiles), 1, randomSeed=seed)[0]
    assert drawing(shuffled, dipole=True) == drawing(smiles, dipole=True)


@pytest.mark.parametrize("smiles", ["c1ccccc1", "Cl/C=C/Cl", "C1COCCO1", "S=C=S", "CCCCCC"])
def test_no_arrow_without_a_moment(smiles: str) -> None:
    assert arrow(smiles) is None


def test_no_arrow_where_the_model_says_nothing() -> None:
    assert arrow("CC[Sn](Cl)(CC)CC") is None


# The negative end is textbook knowledge; the drawings are laid out so that it lies at these sides.
@pytest.mark.parametrize("smiles", ["CC(C)=O", "CC#N", "Clc1ccccc1", "c1ccncc1", "O", "CN(C)C=O"])
def test_head_points_to_the_negative_end(smiles: str) -> None:
    """The head points from the middle of the molecule toward its hetero atom."""
    from rdkit.Chem import rdDepictor

    mol = Chem.MolFromSmiles(Chem.MolToSmiles(Chem.MolFromSmiles(smiles)))
    mol = Chem.AddHs(mol) if mol.GetNumAtoms() == 1 else mol
    rdDepictor.Compute2DCoords(mol, canonOrient=True)
    rdDepictor.StraightenDepiction(mol)
    flat = mol.GetConformer().GetPositions()[:, :2] * [1, -1]
    negative = [a.GetIdx() for a in mol.GetAtoms() if a.GetSymbol() in ("O", "Cl")] or [
        a.GetIdx() for a in mol.GetAtoms() if a.GetSymbol() == "N"
    ]
    way = arrow(smiles)
    assert way is not None
    toward = flat[negative[0]] - flat.mean(axis=0)
    assert way @ toward / np.linalg.norm(toward) > 0.8
