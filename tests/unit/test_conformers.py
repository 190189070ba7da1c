"""Shapes and what their symmetry says about the dipole moment."""

from __future__ import annotations

import numpy as np
import pytest

from generator.conformers import ROOM_TEMPERATURE, dipole_vanishes, shapes
from generator.structures import molecule

# Point groups without an invariant direction: textbook facts.
WITHOUT_MOMENT = {
    "benzene": "c1ccccc1",
    "carbon tetrachloride": "ClC(Cl)(Cl)Cl",
    "carbon disulfide": "S=C=S",
    "carbon dioxide": "O=C=O",
    "trans-1,2-dichloroethylene": "Cl/C=C/Cl",
    "tetrachloroethylene": "ClC(Cl)=C(Cl)Cl",
    "p-xylene": "Cc1ccc(C)cc1",
    "1,4-dichlorobenzene": "Clc1ccc(Cl)cc1",
    "1,3,5-trichlorobenzene": "Clc1cc(Cl)cc(Cl)c1",
    "cyclohexane": "C1CCCCC1",
    "1,3,5-trimethylbenzene": "Cc1cc(C)cc(C)c1",
    "hexafluorobenzene": "Fc1c(F)c(F)c(F)c(F)c1F",
    "neopentane": "CC(C)(C)C",
    "methane": "C",
    "ethane": "CC",
    "ethene": "C=C",
    "ethyne": "C#C",
    "propadiene": "C=C=C",
    "1,4-dioxane": "C1COCCO1",
    "p-benzoquinone": "O=C1C=CC(=O)C=C1",
    "hexachloroethane": "ClC(Cl)(Cl)C(Cl)(Cl)Cl",
    "hexafluoroethane": "FC(F)(F)C(F)(F)F",
    "tetramethylsilane": "C[Si](C)(C)C",
    "silicon tetrachloride": "Cl[Si](Cl)(Cl)Cl",
    "boron trifluoride": "FB(F)F",
    "pyrazine": "c1cnccn1",
    "naphthalene": "c1ccc2ccccc2c1",
    "biphenyl": "c1ccc(-c2ccccc2)cc1",
    "1,4-dinitrobenzene": "O=[N+]([O-])c1ccc([N+](=O)[O-])cc1",
    "1,4-diazabicyclooctane": "C1CN2CCN1CC2",
    "1,4-di-tert-butylbenzene": "CC(C)(C)c1ccc(C(C)(C)C)cc1",
    "2-butyne": "CC#CC",
    "cyanogen": "N#CC#N",
    "octafluorocyclobutane": "FC1(F)C(F)(F)C(F)(F)C1(F)F",
    "nitrogen": "N#N",
}
WITH_MOMENT = {
    "water": "O",
    "ammonia": "N",
    "cis-1,2-dichloroethylene": "Cl/C=C\\Cl",
    "1,1-dichloroethylene": "C=C(Cl)Cl",
    "1,2-dichloroethane": "ClCCCl",
    "1,2-dibromoethane": "BrCCBr",
    "1,1,2,2-tetrachloroethane": "ClC(Cl)C(Cl)Cl",
    "hydroquinone dimethyl ether": "COc1ccc(OC)cc1",
    "hydroquinone": "Oc1ccc(O)cc1",
    "o-xylene": "Cc1ccccc1C",
    "m-xylene": "Cc1cccc(C)c1",
    "1,2-dichlorobenzene": "Clc1ccccc1Cl",
    "chloroform": "ClC(Cl)Cl",
    "dichloromethane": "ClCCl",
    "acetone": "CC(C)=O",
    "diethyl ether": "CCOCC",
    "tetrahydrofuran": "C1CCOC1",
    "1,3-dioxane": "C1COCOC1",
    "ethylene glycol": "OCCO",
    "1,2-dimethoxyethane": "COCCOC",
    "pyridine": "c1ccncc1",
    "pyridazine": "c1ccnnc1",
    "trimethylamine": "CN(C)C",
    "triethylamine": "CCN(CC)CC",
    "phosphorus trichloride": "ClP(Cl)Cl",
    "sulfur dioxide": "O=S=O",
    "hydrazine": "NN",
    "hydrogen peroxide": "OO",
    "piperazine": "C1CNCCN1",
    "dimethyl carbonate": "COC(=O)OC",
    "diethyl oxalate": "CCOC(=O)C(=O)OCC",
    "sulfolane": "O=S1(=O)CCCC1",
    "thiophene": "c1ccsc1",
    "1,4-dichlorobutane": "ClCCCCCl",
}


@pytest.mark.parametrize("name", WITHOUT_MOMENT)
def test_symmetry_forbids_a_moment(name: str) -> None:
    assert dipole_vanishes(WITHOUT_MOMENT[name])


@pytest.mark.parametrize("name", WITH_MOMENT)
def test_symmetry_allows_a_moment(name: str) -> None:
    assert not dipole_vanishes(WITH_MOMENT[name])


def test_alkanes_are_practically_without_a_moment() -> None:
    """Isobutane, the largest: 0.132 D (Lide, Maryott 1958, as in CCCBDB)."""
    for smiles in ("CCC", "CC(C)C", "CCCCCC", "CC1CCCC1", "C1CCCC1"):
        found = molecule(smiles)
        assert found.dipole_limit is not None
        assert 0.132 < found.dipole_limit < 0.2
    assert molecule("C1CCCCC1").dipole_limit == 0.0
    for smiles in ("C=CC", "Cc1ccccc1", "C1CC1C", "CCCl"):
        assert molecule(smiles).dipole_limit is None


def test_weights_follow_boltzmann_and_count_mirror_images() -> None:
    """1,2-dichloroethane: one trans form, two mirror-image gauche forms."""
    found = shapes("ClCCCl")
    assert len(found.weights) == 2
    assert found.without_moment.tolist() == [True, False]
    ratio = found.weights[1] / found.weights[0]
    # gas constant from CODATA
    expected = 2 * np.exp(-found.energies[1] * 1000 / (8.314462618 * ROOM_TEMPERATURE))
    assert ratio == pytest.approx(expected, rel=1e-6)
    # electron diffraction, 22 °C: 73 to 78 % trans (Kveseth 1974, from memory)
    assert 0.70 < found.weights[0] < 0.85


def test_weights_add_up_and_energies_are_sorted() -> None:
    for smiles in ("CCO", "OCCO", "CCCCCO", "O=CN1CCOCC1"):
        found = shapes(smiles)
        assert found.weights.sum() == pytest.approx(1.0)
        assert found.energies[0] == 0.0
        assert (np.diff(found.energies) >= 0).all()
        assert found.positions.shape == (len(found.weights), found.mol.GetNumAtoms(), 3)


def test_shapes_are_deterministic_and_independent_of_the_order_of_atoms() -> None:
    first, again, other = shapes("OCCO"), shapes("OCCO"), shapes("C(O)CO")
    assert np.array_equal(first.positions, again.positions)
    assert np.array_equal(first.positions, other.positions)


def test_bond_angle_of_water_and_planarity_of_benzene() -> None:
    """MMFF94 water: 104.0°, measured 104.5° (Benedict, Gailar, Plyler 1956)."""
    oxygen, *hydrogens = shapes("O").positions[0]
    one, two = (h - oxygen for h in hydrogens)
    angle = np.degrees(np.arccos(one @ two / np.linalg.norm(one) / np.linalg.norm(two)))
    assert angle == pytest.approx(104.5, abs=1.5)
    ring = shapes("c1ccccc1").positions[0]
    assert np.linalg.svd(ring - ring.mean(axis=0), compute_uv=False)[2] < 0.05
