"""Dipole moments estimated from the structure: bond charges, mutual polarization, conformers.

Every bond shifts a charge from one end to the other. The shift is a sum of increments, from the
general to the particular: the electronegativity difference, the two elements, their
hybridisation, their chemical surroundings (`bond_keys`). The charges polarize all atoms, which
polarize one another (point dipoles damped at short range after Thole, Chem. Phys. 59 (1981)
341). The moment of a molecule is the root of the Boltzmann average of μ² over its conformers.

The increments were fitted to measured gas-phase moments by `python -m generator.calibrate`,
which also writes how well each measured moment is met by a model that has not seen it.
"""

from __future__ import annotations

import csv
import json
from dataclasses import dataclass
from functools import lru_cache
from importlib.metadata import version
from pathlib import Path
from typing import TYPE_CHECKING, Any

import numpy as np

from generator.cache import digest
from generator.conformers import Shapes, parse, shapes
from generator.units import DEBYE, ELEMENTARY_CHARGE

if TYPE_CHECKING:
    from collections.abc import Iterable, Mapping, Sequence

    from numpy.typing import NDArray
    from rdkit.Chem import Atom, Mol

    Array = NDArray[np.float64]

MODEL_FOLDER = Path(__file__).parent / "dipole_model"
"""increments.csv (the model), tested.csv (each measured moment), statistics.json."""

CHARGE_TIMES_ANGSTROM = ELEMENTARY_CHARGE * 1e-10 / DEBYE
"""[D] Moment of two elementary charges 1 Å apart."""

# Pauling electronegativities: Allred, J. Inorg. Nucl. Chem. 17 (1961) 215.
ELECTRONEGATIVITY: Mapping[int, float] = {
    1: 2.20, 6: 2.55, 7: 3.04, 8: 3.44, 9: 3.98, 14: 1.90, 15: 2.19, 16: 2.58, 17: 3.16,
    35: 2.96, 53: 2.66,
}  # fmt: skip

# Atomic polarizabilities [Å³] that add up to molecular ones with dipoles in mutual induction,
# after van Duijnen, Swart, J. Phys. Chem. A 102 (1998) 2399 (typed in from memory; silicon and
# phosphorus set between their neighbours). The increments are fitted on top of them.
POLARIZABILITY: Mapping[int, float] = {
    1: 0.414, 6: 1.289, 7: 0.972, 8: 0.852, 9: 0.445, 14: 2.40, 15: 2.10, 16: 2.474, 17: 2.400,
    35: 3.493, 53: 5.481,
}  # fmt: skip

DAMPING = 1.95
"""Range of the linear Thole damping in units of (α₁α₂)^(1/6); larger damps more."""

SMALLEST_WEIGHT = 0.01
"""Conformers with less than this share of the Boltzmann weight are left out."""

LARGEST = 24
"""Atoms without hydrogen: hardly any larger molecule taught the model."""

HALOGENS = (9, 17, 35, 53)


@dataclass(frozen=True, slots=True)
class DipoleEstimate:
    """Dipole moment of the free molecule estimated from its structure.

    `value` [D] is the root of the Boltzmann average of μ² at 298.15 K. `uncertainty` [D],
    standard, comes from the errors of left-out molecules with as few like bonds (`support`) and
    from how far the conformer weights matter. `spread` [D] is the standard deviation of |μ| over
    the conformers. `vector` [D] belongs to the most populated conformer, in its coordinates,
    from the negative to the positive end. `zero_by_symmetry`: all populated conformers are
    without a moment by symmetry.
    """

    value: float
    uncertainty: float
    spread: float
    n_conformers: int
    vector: tuple[float, float, float]
    support: int
    zero_by_symmetry: bool


@dataclass(frozen=True, slots=True)
class Moments:
    """Moments of the populated conformers of a molecule.

    `vectors` [D] has shape (conformers, 3), from the negative to the positive end.
    """

    vectors: Array
    weights: Array
    support: int
    shapes: Shapes


def estimate_dipole(smiles: str) -> DipoleEstimate:
    """Estimated gas-phase dipole moment of a molecule.

    Raises `ValueError` for structures outside the model: several parts, an overall charge,
    unpaired electrons, elements or bonds between elements that were not fitted, more than
    `LARGEST` atoms.
    """
    found = moments(smiles)
    sizes = np.linalg.norm(found.vectors, axis=1)
    value = _mean(sizes, found.weights)
    # Force-field energies are good to a few kJ/mol: halve them and see what moves.
    softer = np.sqrt(found.weights)
    shift = abs(value - _mean(sizes, softer / softer.sum()))
    spread = float(np.sqrt(max(0.0, value**2 - float((found.weights * sizes).sum()) ** 2)))
    zero = bool(found.shapes.without_moment[: len(sizes)].all())
    best = found.vectors[int(np.argmax(found.weights))]
    return DipoleEstimate(
        value=value,
        uncertainty=0.0 if zero else float(np.hypot(_model_error(found.support), shift)),
        spread=spread,
        n_conformers=len(sizes),
        vector=(float(best[0]), float(best[1]), float(best[2])),
        support=found.support,
        zero_by_symmetry=zero,
    )


@lru_cache(maxsize=64)
def moments(smiles: str) -> Moments:
    """Conformers with more than 1 % of the weight, and the moment of each."""
    if parse(smiles).GetNumHeavyAtoms() > LARGEST:
        raise ValueError(f"larger than {LARGEST} atoms without hydrogen")
    found = populated(shapes(smiles))
    refuse_outside(found.mol)
    model = _increments()
    keys = bond_keys(found.mol)
    strange = {key[2:] for _, _, key, _ in keys if key[0] == "1" and key not in model}
    if strange:
        raise ValueError(f"no bond like {', '.join(sorted(strange))} was fitted")
    charges = np.zeros(found.mol.GetNumAtoms())
    for begin, end, key, factor in keys:
        if key in model:
            charges[begin] -= factor * model[key][0]
            charges[end] += factor * model[key][0]
    vectors = np.array([moment_vectors(found.mol, here, charges) for here in found.positions])
    vectors[found.without_moment] = 0.0
    return Moments(vectors, found.weights, _support(key for _, _, key, _ in keys), found)


def support(smiles: str) -> int:
    """How many measured molecules share the rarest bond of a molecule; 0 outside the model."""
    from rdkit import Chem

    mol = Chem.AddHs(parse(smiles))
    try:
        refuse_outside(mol)
    except ValueError:
        return 0
    return _support(key for _, _, key, _ in bond_keys(mol))


def _support(keys: Iterable[str]) -> int:
    model, found = _increments(), list(keys)
    if any(key not in model for key in found):
        return 0
    return min((model[key][1] for key in found if key[0] == "3"),
               default=max(count for _, count in model.values()))  # fmt: skip


def populated(found: Shapes) -> Shapes:
    """The same conformers without those that hold less than 1 % of the weight."""
    keep = found.weights > SMALLEST_WEIGHT
    weights = found.weights[keep] / found.weights[keep].sum()
    return Shapes(
        found.mol, found.positions[keep], found.energies[keep], weights, found.force_field,
        found.without_moment[keep],
    )  # fmt: skip


def refuse_outside(mol: Mol) -> None:
    """Raise `ValueError` for molecules the model says nothing about."""
    from rdkit import Chem

    if len(Chem.GetMolFrags(mol)) > 1:
        raise ValueError("a structure of several parts has no dipole moment of its own")
    if Chem.GetFormalCharge(mol):
        raise ValueError("an ion has no dipole moment that is independent of the origin")
    if any(atom.GetNumRadicalElectrons() for atom in mol.GetAtoms()):
        raise ValueError("the bond increments hold for paired electrons only")
    strange = {atom.GetSymbol() for atom in mol.GetAtoms()
               if atom.GetAtomicNum() not in ELECTRONEGATIVITY}  # fmt: skip
    if strange:
        raise ValueError(f"no bond increments are fitted for {', '.join(sorted(strange))}")


def moment_vectors(mol: Mol, positions: Array, charges: Array) -> Array:
    """Dipole moment [D] of atomic charges and the dipoles they induce.

    `positions` [Å] of shape (atoms, 3); `charges` [e] of shape (atoms,) or (atoms, sets), adding
    to zero. Result of shape (3,) or (3, sets), pointing from the negative to the positive end.
    """
    numbers = [atom.GetAtomicNum() for atom in mol.GetAtoms()]
    alpha = np.array([POLARIZABILITY[number] for number in numbers])
    count = len(numbers)
    apart = positions[:, None] - positions[None]
    distance = np.linalg.norm(apart, axis=2) + np.eye(count)
    reach = DAMPING * np.outer(alpha, alpha) ** (1 / 6)
    ratio = np.minimum(distance / reach, 1.0)
    other = 1.0 - np.eye(count)
    field_part = other * (4 * ratio**3 - 3 * ratio**4) / distance**3
    tensor_part = 3 * other * ratio**4 / distance**5
    coupling = tensor_part[..., None, None] * apart[..., :, None] * apart[
        ..., None, :
    ] - field_part[..., None, None] * np.eye(3)
    matrix = -coupling.transpose(0, 2, 1, 3)
    for index in range(count):
        matrix[index, :, index, :] = np.eye(3) / alpha[index]
    sets = charges.reshape(count, -1)
    field = np.einsum("ij,ijc,jk->ick", field_part, apart, sets)
    induced = np.linalg.solve(matrix.reshape(3 * count, 3 * count), field.reshape(3 * count, -1))
    total = positions.T @ sets + induced.reshape(count, 3, -1).sum(axis=0)
    result: Array = (total * CHARGE_TIMES_ANGSTROM).reshape(3, *charges.shape[1:])
    return result


def bond_keys(mol: Mol) -> list[tuple[int, int, str, float]]:
    """Increments of each bond: (begin atom, end atom, key, factor).

    A positive increment times factor moves negative charge to the begin atom. Keys start with
    their level: 0 electronegativity, 1 elements, 2 hybridisation, 3 surroundings.
    """
    signs = {1.0: "-", 1.5: ":", 2.0: "=", 3.0: "#"}
    rows: list[tuple[int, int, str, float]] = []
    for bond in mol.GetBonds():
        one, two = bond.GetBeginAtom(), bond.GetEndAtom()
        begin, end = one.GetIdx(), two.GetIdx()
        sign = signs.get(bond.GetBondTypeAsDouble(), "?")
        if {_surroundings(one), _surroundings(two)} == {"N+", "Onitro"}:
            sign = "~"  # the two bonds of a nitro group are alike
        difference = ELECTRONEGATIVITY[one.GetAtomicNum()] - ELECTRONEGATIVITY[two.GetAtomicNum()]
        if difference:
            rows.append((begin, end, "0 single" if sign == "-" else "0 multiple", difference))
        for level, name in ((1, _element), (2, _hybridisation), (3, _surroundings)):
            first, second = name(one), name(two)
            if first < second:
                rows.append((begin, end, f"{level} {first}{sign}{second}", 1.0))
            elif second < first:
                rows.append((begin, end, f"{level} {second}{sign}{first}", -1.0))
    return rows


def _element(atom: Atom) -> str:
    return str(atom.GetSymbol())


def _orders(atom: Atom) -> list[float]:
    return sorted((bond.GetBondTypeAsDouble() for bond in atom.GetBonds()), reverse=True)


def _hybridisation(atom: Atom) -> str:
    """Element with 1, 2, 3 for sp, sp², sp³, c for lone pairs next to a π system."""
    symbol, orders = str(atom.GetSymbol()), _orders(atom)
    if symbol == "H":
        return symbol
    if atom.GetIsAromatic():
        return f"{symbol}2"
    if 3.0 in orders or (symbol == "C" and orders.count(2.0) > 1):
        return f"{symbol}1"
    if orders and orders[0] >= 1.5:
        return f"{symbol}2"
    beside_pi = any(n.GetIsAromatic() or _orders(n)[0] >= 2.0 for n in atom.GetNeighbors())
    return f"{symbol}c" if beside_pi and symbol in ("N", "O") else f"{symbol}3"


def _surroundings(atom: Atom) -> str:
    """Element with the chemical surroundings that tell its bonds from others alike."""
    symbol = str(atom.GetSymbol())
    if symbol == "C":
        return _carbon(atom)
    if symbol == "N":
        return _nitrogen(atom)
    if symbol == "O":
        return _oxygen(atom)
    return f"{symbol}ar" if atom.GetIsAromatic() else symbol


def _carbon(atom: Atom) -> str:
    if atom.GetIsAromatic():
        return "Car"
    multiple = [bond for bond in atom.GetBonds() if bond.GetBondTypeAsDouble() >= 2.0]
    if not multiple:
        halogens = sum(n.GetAtomicNum() in HALOGENS for n in atom.GetNeighbors())
        return f"CX{halogens}" if halogens > 1 else "C"
    if len(multiple) > 1:
        return "C=="
    partner = multiple[0].GetOtherAtom(atom)
    if multiple[0].GetBondTypeAsDouble() == 3.0:
        return f"C#{partner.GetSymbol()}"
    if partner.GetAtomicNum() in (8, 16):
        others = {n.GetSymbol() for n in atom.GetNeighbors() if n.GetIdx() != partner.GetIdx()}
        for symbol in ("N", "O"):
            if symbol in others:
                return f"C=O|{symbol}"
        if others - {"C", "H"}:
            return "C=O|X"
    return f"C={partner.GetSymbol()}"


def _double_to_chalcogen(atom: Atom) -> bool:
    return any(
        bond.GetBondTypeAsDouble() == 2.0 and bond.GetOtherAtom(atom).GetAtomicNum() in (8, 16)
        for bond in atom.GetBonds()
    )


def _nitrogen(atom: Atom) -> str:
    if atom.GetIsAromatic():
        return "Nar" if atom.GetDegree() == 2 else "NarX3"
    if atom.GetFormalCharge() == 1:
        return "N+"
    orders = _orders(atom)
    if orders and orders[0] >= 2.0:
        return "N#" if orders[0] == 3.0 else "N="
    neighbours = atom.GetNeighbors()
    if any(_double_to_chalcogen(n) for n in neighbours):
        return "Nam"
    if any(n.GetIsAromatic() for n in neighbours):
        return "Nan"
    return "Nvi" if any(_orders(n)[0] >= 2.0 for n in neighbours) else "N"


def _oxygen(atom: Atom) -> str:
    if atom.GetIsAromatic():
        return "Oar"
    neighbours = atom.GetNeighbors()
    if atom.GetDegree() == 1:
        partner = neighbours[0]
        nitro = partner.GetAtomicNum() == 7 and partner.GetFormalCharge() == 1
        return "Onitro" if nitro else f"O={partner.GetSymbol()}"
    if any(_double_to_chalcogen(n) for n in neighbours):
        return "Oest"
    if any(n.GetIsAromatic() or _orders(n)[0] >= 2.0 for n in neighbours):
        return "Ovi"
    return "Ow" if all(n.GetAtomicNum() == 1 for n in neighbours) else "O"


def _mean(sizes: Array, weights: Array) -> float:
    return float(np.sqrt((weights * sizes**2).sum()))


@lru_cache(maxsize=1)
def _increments() -> dict[str, tuple[float, int]]:
    """Fitted increment [e] and number of calibration molecules of each key."""
    with (MODEL_FOLDER / "increments.csv").open(encoding="utf-8", newline="") as file:
        return {
            row["key"]: (float(row["increment"]), int(row["molecules"]))
            for row in csv.DictReader(file)
        }


@lru_cache(maxsize=1)
def fingerprint() -> str:
    """Hash of everything an estimate depends on beside the structure: the model and its code."""
    here = Path(__file__)
    files = (here, here.with_name("conformers.py"), MODEL_FOLDER / "increments.csv")
    return digest(version("rdkit"), *(file.read_bytes() for file in files))


@lru_cache(maxsize=1)
def calibration_statistics() -> dict[str, Any]:
    """How well the model meets measured moments it has not seen (statistics.json)."""
    text = (MODEL_FOLDER / "statistics.json").read_text(encoding="utf-8")
    statistics: dict[str, Any] = json.loads(text)
    return statistics


def calibration_table() -> Sequence[Mapping[str, str]]:
    """Each measured moment with the estimate of a model that has not seen it (tested.csv)."""
    with (MODEL_FOLDER / "tested.csv").open(encoding="utf-8", newline="") as file:
        return tuple(csv.DictReader(file))


def _model_error(support: int) -> float:
    """Standard error [D] of left-out molecules whose rarest bond is about as rare."""
    classes = calibration_statistics()["error_by_support"]
    return float(next(row["rms_error"] for row in classes if support <= row["up_to"]))
