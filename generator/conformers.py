"""Shapes of molecules: conformers with their energies, and whether symmetry forbids a dipole.

Geometries are distance-geometry embeddings with torsion preferences (ETKDGv3: Wang, Witnauer,
Riniker, J. Chem. Inf. Model. 60 (2020) 2044), relaxed with MMFF94 (Halgren, J. Comput. Chem.
17 (1996) 490) or, where that force field lacks a parameter, UFF (Rappé et al., J. Am. Chem.
Soc. 114 (1992) 10024). The random seed is fixed, so equal structures give equal shapes.

rdkit is imported inside the functions: loading this module costs nothing.
"""

from __future__ import annotations

from collections import Counter
from dataclasses import dataclass
from functools import lru_cache
from typing import TYPE_CHECKING, Any

import numpy as np

from generator.smiles import why_unreadable
from generator.units import AVOGADRO, BOLTZMANN

if TYPE_CHECKING:
    from collections.abc import Sequence

    from numpy.typing import NDArray
    from rdkit.Chem import Mol

    Array = NDArray[np.float64]

SEED = 20_1891
"""Fixed seed of every embedding."""

ROOM_TEMPERATURE = 298.15
"""[K] Temperature of the Boltzmann weights."""

SYMMETRY_TOLERANCE = 0.12
"""[Å] Largest displacement of an atom that still counts as symmetric. A relaxed symmetric shape
is off by about 0.01 Å; breaking a symmetry (flat or pyramidal, chair or boat) costs 0.3 Å and
more."""

SYMMETRIC_SHARE = 0.97
"""Boltzmann share of conformers without a moment from which a substance counts as unpolar by
symmetry: the remaining 3 % would add at most one sixth of one conformer's moment."""

MAX_MAPPINGS = 1024
"""Relabellings of a molecule looked at before its hydrogen atoms on carbon are left out."""


@dataclass(frozen=True, slots=True)
class Shapes:
    """The conformers of one molecule, lowest energy first.

    `mol` carries every hydrogen atom; `positions` has shape (conformers, atoms, 3) in [Å];
    `energies` [kJ/mol] are relative to the lowest conformer; `weights` are the Boltzmann
    weights at 298.15 K and sum to one; `force_field` is "MMFF94", "UFF" or "none";
    `without_moment` tells the conformers whose symmetry forbids a dipole moment.
    """

    mol: Mol
    positions: Array
    energies: Array
    weights: Array
    force_field: str
    without_moment: NDArray[np.bool_]


def parse(smiles: str) -> Mol:
    """Read a SMILES string, or raise `ValueError` that says what is wrong with it."""
    from rdkit import Chem, rdBase

    text = smiles.strip()
    if not text:
        raise ValueError("the SMILES string is empty")
    with rdBase.BlockLogs():
        mol: Mol | None = Chem.MolFromSmiles(text)
    if mol is None or mol.GetNumAtoms() == 0:
        raise ValueError(f"not a valid SMILES string: {text!r}: {why_unreadable(text)}")
    # reading the canonical form makes every later step independent of the atom order typed in
    with rdBase.BlockLogs():
        canonical: Mol | None = Chem.MolFromSmiles(Chem.MolToSmiles(mol))
    return mol if canonical is None else canonical


def conformer_count(mol: Mol) -> int:
    """How many embeddings to try: 1 for a stiff molecule, up to 20 for a flexible one.

    Large molecules get fewer, so that the work on one stays within a fraction of a second.
    """
    from rdkit.Chem import rdMolDescriptors

    rotors = int(rdMolDescriptors.CalcNumRotatableBonds(mol))
    donors = int(rdMolDescriptors.CalcNumHBD(mol))
    ring_info = mol.GetRingInfo()
    floppy_rings = sum(
        1
        for ring in ring_info.AtomRings()
        if sum(not mol.GetAtomWithIdx(i).GetIsAromatic() for i in ring) > 3
    )
    freedom = rotors + donors + floppy_rings
    atoms = mol.GetNumAtoms() + sum(atom.GetTotalNumHs() for atom in mol.GetAtoms())
    affordable = max(3, int(20 * (22 / atoms) ** 2))
    return 1 if freedom == 0 else min(20, affordable, 4 + 5 * freedom)


def shapes(smiles: str, tries: int | None = None) -> Shapes:
    """Conformers of a molecule with Boltzmann weights at 298.15 K.

    `tries` is the number of embeddings; without it, `conformer_count` decides.
    Raises `ValueError` where no three-dimensional shape can be made.
    """
    from rdkit import Chem, rdBase

    with rdBase.BlockLogs():
        mol = Chem.AddHs(parse(smiles))
        if mol.GetNumAtoms() == 1:
            one = np.ones(1)
            return Shapes(mol, np.zeros((1, 1, 3)), np.zeros(1), one, "none", one > 0)
        found = _embed(mol, tries or conformer_count(mol))
        if not found:
            raise ValueError(f"no three-dimensional shape found for {smiles!r}")
        force_field, energies = _relax(mol)
    positions = np.array([mol.GetConformer(i).GetPositions() for i in found])
    order = np.argsort(energies, kind="stable")
    positions, energies = positions[order], energies[order] - energies.min()
    keep = _distinct(mol, positions, energies)
    positions, energies = positions[keep], energies[keep]
    members, mappings = _symmetry_of_graph(mol)
    symmetries = [_operations(_centres(points, members), mappings) for points in positions]
    copies = np.array([_copies(*symmetry) for symmetry in symmetries])
    without_moment = np.array([not _invariant_direction(*symmetry) for symmetry in symmetries])
    # 1 kJ = 1000 J
    factors = copies * np.exp(-energies * 1000.0 / (AVOGADRO * BOLTZMANN * ROOM_TEMPERATURE))
    weights = factors / factors.sum()
    return Shapes(mol, positions, energies, weights, force_field, without_moment)


def _embed(mol: Mol, tries: int) -> list[int]:
    """Add conformers to `mol`; their ids, none where the embedding fails."""
    from rdkit.Chem import rdDistGeom

    settings: Any = rdDistGeom.ETKDGv3()
    settings.randomSeed = SEED
    for random_start in (False, True):
        settings.useRandomCoords = random_start
        try:
            found = list(rdDistGeom.EmbedMultipleConfs(mol, tries, settings))
        except RuntimeError:  # the optimiser gives up on some two- and three-atom molecules
            continue
        if found:
            return found
    return []


def _relax(mol: Mol) -> tuple[str, Array]:
    """Relax every conformer in place; force field used and energies [kJ/mol]."""
    from rdkit.Chem import rdForceFieldHelpers

    if rdForceFieldHelpers.MMFFHasAllMoleculeParams(mol):
        name = "MMFF94"
        results = rdForceFieldHelpers.MMFFOptimizeMoleculeConfs(mol, maxIters=1000)
    elif rdForceFieldHelpers.UFFHasAllMoleculeParams(mol):
        name = "UFF"
        results = rdForceFieldHelpers.UFFOptimizeMoleculeConfs(mol, maxIters=1000)
    else:
        return "none", np.zeros(mol.GetNumConformers())
    # 1 kcal = 4.184 kJ (thermochemical calorie, exact)
    return name, np.array([energy for _, energy in results]) * 4.184


def _distinct(mol: Mol, positions: Array, energies: Array) -> list[int]:
    """Indices of conformers that differ: same energy and same atom distances count once.

    Mirror images have equal distances and count as one here; `_copies` makes up for it.
    """
    kept: list[int] = []
    prints: list[Array] = []
    upper = np.triu_indices(positions.shape[1], 1)
    numbers = np.array([atom.GetAtomicNum() for atom in mol.GetAtoms()])
    pair = np.sort(np.stack([numbers[upper[0]], numbers[upper[1]]]), axis=0)
    for index, here in enumerate(positions):
        distances = np.linalg.norm(here[upper[0]] - here[upper[1]], axis=1)
        ordered = distances[np.lexsort((distances, pair[0], pair[1]))]
        if not any(
            abs(energies[index] - energies[other]) < 0.2 and np.abs(ordered - seen).max() < 0.1
            for other, seen in zip(kept, prints, strict=True)
        ):
            kept.append(index)
            prints.append(ordered)
    return kept


def _copies(operations: Array, across: Sequence[Array]) -> float:
    """Relative number of ways to be in a conformer: mirror images over symmetry number.

    A shape that is flat or has a reflection among its operations is its own mirror image.
    """
    turns = int((np.linalg.det(operations) > 0).sum())
    if across:
        return 1.0 / len(operations)
    return (2.0 if turns == len(operations) else 1.0) / turns


@lru_cache(maxsize=4096)
def dipole_vanishes(smiles: str) -> bool:
    """Whether symmetry forbids a permanent dipole moment.

    A dipole moment must stay where it is under every symmetry operation of the molecule; it
    vanishes when the operations leave no direction unchanged. The operations are found as those
    relabellings of like atoms (automorphisms of the bond graph) that a rotation or a
    rotation-reflection carries out on the relaxed shape. End groups turning freely around one
    bond (CH₃, CF₃, C(CH₃)₃, …) count as one round group. A flexible molecule vanishes only if
    conformers without a moment hold at least 97 % of the Boltzmann weight: 1,4-dioxane (chair)
    does, 1,2-dichloroethane does not.
    """
    mol = parse(smiles)
    if any(atom.GetFormalCharge() for atom in mol.GetAtoms()) and not _is_neutral_pair(mol):
        return False
    if not _may_vanish(mol):
        return False
    full = conformer_count(mol)
    for tries in sorted({min(3, full), full}):
        try:
            found = shapes(smiles, tries)
        except ValueError:
            return False
        share = float(found.weights[found.without_moment].sum())
        # Few tries miss conformers, but a populated one with a moment settles the question.
        if share < (SYMMETRIC_SHARE if tries == full else 0.8):
            return False
    return True


def _is_neutral_pair(mol: Mol) -> bool:
    """Formal charges that cancel (nitro groups, isonitriles) are only a way of writing."""
    return sum(atom.GetFormalCharge() for atom in mol.GetAtoms()) == 0


def _round_groups(mol: Mol) -> tuple[list[list[int]], list[str]]:
    """Atoms of each point of the reduced molecule, and a label of each point.

    `mol` must carry all its hydrogen atoms. An atom bound to three like end points and one
    other partner is merged with them, repeatedly, so CH₃ and then C(CH₃)₃ become one point.
    """
    labels = {
        atom.GetIdx(): f"{atom.GetAtomicNum()}.{atom.GetIsotope()}" for atom in mol.GetAtoms()
    }
    members = {index: [index] for index in labels}
    partners = {
        atom.GetIdx(): {other.GetIdx() for other in atom.GetNeighbors()} for atom in mol.GetAtoms()
    }
    while True:
        merges: dict[int, list[int]] = {}
        for index, others in partners.items():
            ends = sorted(other for other in others if len(partners[other]) == 1)
            likes = Counter(labels[end] for end in ends)
            if len(others) == 4 and 3 in likes.values():
                merges[index] = [end for end in ends if likes[labels[end]] == 3]
        if not merges:
            break
        for index, ends in merges.items():
            labels[index] = f"({labels[index]}:3x{labels[ends[0]]})"
            partners[index] -= set(ends)
            for end in ends:
                del partners[end], members[end]
    indices = sorted(partners)
    return [members[index] for index in indices], [labels[index] for index in indices]


def _centres(points: Array, members: Sequence[Sequence[int]]) -> Array:
    return np.array([points[list(atoms)].mean(axis=0) for atoms in members])


def _reduced(mol: Mol, members: Sequence[Sequence[int]], labels: Sequence[str]) -> Mol:
    """The reduced molecule as a plain graph: one point each, all bonds alike."""
    from rdkit import Chem

    kinds = {label: number for number, label in enumerate(sorted(set(labels)), start=1)}
    graph = Chem.RWMol()
    place = {}
    for atoms, label in zip(members, labels, strict=True):
        atom = Chem.Atom(kinds[label])  # any element stands for a label: only likeness counts
        atom.SetNoImplicit(True)
        place[atoms[0]] = graph.AddAtom(atom)
    for bond in mol.GetBonds():
        begin, end = bond.GetBeginAtomIdx(), bond.GetEndAtomIdx()
        if begin in place and end in place:
            graph.AddBond(place[begin], place[end], Chem.BondType.SINGLE)
    reduced = graph.GetMol()
    reduced.UpdatePropertyCache(strict=False)
    return reduced


def _symmetry_of_graph(mol: Mol) -> tuple[list[list[int]], NDArray[np.int_]]:
    """Points of the reduced molecule and the relabellings that keep all its bonds.

    The relabellings have shape (mappings, points). Where they are too many (each CH₂ doubles
    their number), hydrogen atoms on carbon are left out: the heavier atoms settle where they are.
    """
    members, labels = _round_groups(mol)
    mappings = _relabellings(mol, members, labels)
    if len(mappings) >= MAX_MAPPINGS:
        atoms = [mol.GetAtomWithIdx(point[0]) for point in members]
        kept = [
            index
            for index, atom in enumerate(atoms)
            if atom.GetAtomicNum() != 1 or atom.GetNeighbors()[0].GetAtomicNum() != 6
        ]
        members, labels = [members[i] for i in kept], [labels[i] for i in kept]
        mappings = _relabellings(mol, members, labels)
    return members, mappings


def _relabellings(
    mol: Mol, members: Sequence[Sequence[int]], labels: Sequence[str]
) -> NDArray[np.int_]:
    graph = _reduced(mol, members, labels)
    found = graph.GetSubstructMatches(
        graph, uniquify=False, maxMatches=MAX_MAPPINGS, useChirality=False
    )
    leave = tuple(range(len(members)))  # leaving everything in place is always among them
    return np.array([leave, *(other for other in found if other != leave)], dtype=int)


def _may_vanish(mol: Mol) -> bool:
    """Quick look at the bond graph that rules out nearly every polar molecule.

    Two points that no relabelling moves stay where they are under every symmetry operation, and
    so does the direction from one to the other. Two or more bonds with free turn between
    tetrahedral atoms give more lopsided shapes than symmetric ones. One fixed point at the
    centre with two bent or three pyramidal bonds keeps the direction of their sum.
    """
    from rdkit import Chem

    with_h = Chem.AddHs(mol)
    members, labels = _round_groups(with_h)
    graph = _reduced(with_h, members, labels)
    ranks = list(Chem.CanonicalRankAtoms(graph, breakTies=False, includeChirality=False))
    counts = Counter(ranks)
    if _turning_bonds(with_h, members) > 1:
        return False
    fixed = [index for index, rank in enumerate(ranks) if counts[rank] == 1]
    if len(ranks) == 1:
        return True
    if len(fixed) > 1:
        return False
    for index in fixed:
        atom = with_h.GetAtomWithIdx(members[index][0])
        bent = atom.GetAtomicNum() in (8, 16, 34) and atom.GetDegree() == 2
        bent = bent and all(b.GetBondTypeAsDouble() == 1.0 for b in atom.GetBonds())
        pyramidal = atom.GetAtomicNum() in (15, 33) and atom.GetDegree() == 3
        if bent or pyramidal:
            return False
    return True


def _turning_bonds(mol: Mol, members: Sequence[Sequence[int]]) -> int:
    """Single bonds outside rings between saturated atoms whose turn changes the shape."""
    from rdkit.Chem import HybridizationType

    points = {atoms[0] for atoms in members}
    turning = 0
    for bond in mol.GetBonds():
        ends = (bond.GetBeginAtom(), bond.GetEndAtom())
        turning += not bond.IsInRing() and all(
            end.GetHybridization() == HybridizationType.SP3
            and sum(other.GetIdx() in points for other in end.GetNeighbors()) > 1
            for end in ends
        )
    return turning


def _operations(points: Array, mappings: NDArray[np.int_]) -> tuple[Array, list[Array]]:
    """Symmetry operations of the points, shape (operations, 3, 3), and the directions across.

    Row vectors times an operation give the moved points. The directions across a flat or linear
    shape are those in which nothing extends: reflecting them moves no point.
    """
    centred = points - points.mean(axis=0)
    axes = np.linalg.svd(centred)[2]
    across = [axis for axis in axes if np.abs(centred @ axis).max() < SYMMETRY_TOLERANCE]
    # Best orthogonal matrix (rotation or rotation-reflection) that carries out each relabelling:
    # Schönemann, Psychometrika 31 (1966) 1.
    u, _, vt = np.linalg.svd(np.einsum("ni,mnj->mij", centred, centred[mappings]))
    turns = np.einsum("mij,mjk->mik", u, vt)
    off = np.linalg.norm(centred @ turns - centred[mappings], axis=2).max(axis=1)
    return turns[off < SYMMETRY_TOLERANCE], across


def _invariant_direction(operations: Array, across: Sequence[Array]) -> bool:
    """Whether some direction is left unchanged by every symmetry operation of a shape."""
    # A direction d is kept by all if Σ |d·turn − d|² + Σ (axis·d)² = 0.
    change = operations - np.eye(3)
    total = np.einsum("mij,mkj->ik", change, change)
    total += sum((np.outer(axis, axis) for axis in across), np.zeros((3, 3)))
    return bool(np.linalg.eigvalsh(total)[0] < 0.05)
