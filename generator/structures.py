"""Molecules from their SMILES: identity, mass, family, isomers, symmetry and drawings.

rdkit is imported inside the functions, so that importing this module costs nothing.
"""

from __future__ import annotations

import pickle
from dataclasses import dataclass
from functools import lru_cache
from importlib.metadata import version
from pathlib import Path
from typing import TYPE_CHECKING

from generator.cache import Cache, digest
from generator.conformers import dipole_vanishes, parse
from generator.dipoles import DipoleEstimate, estimate_dipole, fingerprint
from generator.drawings import Likely, drawing, likely
from generator.kept import Kept

if TYPE_CHECKING:
    from collections.abc import Mapping, Sequence

    from rdkit.Chem import Mol

__all__ = [
    "ATOMIC_WEIGHTS",
    "FAMILIES",
    "DipoleEstimate",
    "Molecule",
    "additive_refraction",
    "drawing",
    "estimate_dipole",
    "inchikey",
    "isomer_groups",
    "likely_shapes",
    "molecule",
    "molecules",
    "same_structure",
]

# Standard atomic weights, abridged to five digits [g/mol]: Prohaska et al., Pure Appl. Chem. 94
# (2022) 573 (IUPAC technical report 2021), conventional values where an interval is given.
ATOMIC_WEIGHTS: Mapping[str, float] = {
    "H": 1.0080, "He": 4.0026, "Li": 6.94, "Be": 9.0122, "B": 10.81, "C": 12.011, "N": 14.007,
    "O": 15.999, "F": 18.998, "Ne": 20.180, "Na": 22.990, "Mg": 24.305, "Al": 26.982,
    "Si": 28.085, "P": 30.974, "S": 32.06, "Cl": 35.45, "Ar": 39.95, "K": 39.098, "Ca": 40.078,
    "Sc": 44.956, "Ti": 47.867, "V": 50.942, "Cr": 51.996, "Mn": 54.938, "Fe": 55.845,
    "Co": 58.933, "Ni": 58.693, "Cu": 63.546, "Zn": 65.38, "Ga": 69.723, "Ge": 72.630,
    "As": 74.922, "Se": 78.971, "Br": 79.904, "Kr": 83.798, "Zr": 91.224, "Nb": 92.906,
    "Mo": 95.95, "Ru": 101.07, "Ag": 107.87, "Cd": 112.41, "In": 114.82, "Sn": 118.71,
    "Sb": 121.76, "Te": 127.60, "I": 126.90, "Xe": 131.29, "Hf": 178.49, "Ta": 180.95,
    "W": 183.84, "Re": 186.21, "Os": 190.23, "Pt": 195.08, "Au": 196.97, "Hg": 200.59,
    "Tl": 204.38, "Pb": 207.2, "Bi": 208.98,
}  # fmt: skip

# Family key, label, SMARTS. The first pattern that fits decides: functions that rule the
# behaviour of a liquid come before halogen and hydrocarbon parts. Patterns joined by " AND "
# must all fit; "HYDROCARBON" stands for "carbon and hydrogen only".
FAMILIES: tuple[tuple[str, str, tuple[str, ...]], ...] = (
    ("water", "Water", ("[OX2H2]",)),
    ("acids", "Acids", (
        "[CX3](=O)[OX2H1]", "[SX4](=O)(=O)[OX2H1]", "[OX2H1][NX3+](=O)[O-]", "[F,Cl,Br,I;H1]",
    )),
    ("anhydrides", "Anhydrides", ("[CX3](=O)[OX2][CX3](=O)",)),
    ("phosphorus", "Phosphorus compounds", ("[P,p]",)),
    ("carbonates", "Carbonates", ("[#6,#8][OX2][CX3](=O)[OX2][#6]",)),
    ("amides", "Amides and ureas", ("[NX3][CX3](=O)", "[n;r5,r6][c](=O)", "[NX3][CX3](=S)")),
    ("lactones", "Lactones", ("[CX3;R](=O)[OX2;R][#6]",)),
    ("esters", "Esters", (
        "[CX3](=O)[OX2][#6]", "[#6][OX2][NX3+](=O)[O-]", "[#6][OX2][NX2]=O", "[#6][OX2][BX3]",
        "[#6][OX2][SX3]=O", "[#6][OX2][SX4](=O)=O",
    )),
    ("sulfoxides-sulfones", "Sulfoxides and sulfones", ("[SX3](=O)", "[SX4](=O)(=O)")),
    ("nitro", "Nitro compounds", ("[NX3+](=O)[O-]", "[NX3](=O)=O")),
    ("nitriles", "Nitriles", ("[CX2]#[NX1]",)),
    ("ketones", "Ketones", ("[#6][CX3](=O)[#6]", "[#6][c](=O)[#6,#7]")),
    ("aldehydes", "Aldehydes", ("[CX3;H1,H2]=O",)),
    ("amines", "Amines and pyridines", (
        "[NX3;!$(N-[#6]=[O,S])]", "[n;X2,X3]", "[NX2;!$(N=O)]=[#6]",
    )),
    ("glycols", "Glycols and polyols", ("[CX4][OX2H1].[CX4][OX2H1]",)),
    ("glycol-ethers", "Glycol ethers", ("[#6][OX2;!R][CX4;!R][CX4;!R][OX2;!R;H1,$(O[#6])]",)),
    ("alcohols", "Alcohols and phenols", ("[#6][OX2H1]",)),
    ("brominated-iodinated", "Brominated and iodinated", ("[Br,I]",)),
    ("fluorinated", "Fluorinated", ("[F]",)),
    ("chlorinated", "Chlorinated", ("[Cl]",)),
    ("ethers", "Ethers and acetals", ("[OX2]([#6])[#6]", "o", "[OX2]([#14])[#6,#14]")),
    ("sulfur", "Sulfur compounds", ("[S,s]",)),
    ("terpenes", "Terpenes", (
        "HYDROCARBON TERPENE C~1~C~C~C(~C)~C~C1~C(~C)~C",
        "HYDROCARBON TERPENE C~C(~C)~C~C~C~C(~C)~C~C",
        "HYDROCARBON TERPENE C~C1(~C)~C(~C)~C2~C~C~C1~C2",
        "HYDROCARBON TERPENE C~C1~C~C~C~2~C~C1~C2(~C)~C",
    )),
    ("aromatic-hydrocarbons", "Aromatic hydrocarbons", ("HYDROCARBON c",)),
    ("aliphatic-hydrocarbons", "Aliphatic hydrocarbons", ("HYDROCARBON C",)),
    ("other", "Other", ()),
)  # fmt: skip

# What makes a liquid associated: hydrogen on oxygen, nitrogen or fluorine.
_ASSOCIATION = (
    ("carboxylic acid: pairs held by two hydrogen bonds", "[CX3](=O)[OX2H1]"),
    ("water: hydrogen-bonded network", "[OX2H2]"),
    ("O–H donor: hydrogen-bonded chains", "[OX2;!H0]"),
    ("N–H donor of an amide: hydrogen-bonded chains", "[NX3;!H0][CX3]=[O,S]"),
    ("N–H donor", "[#7;!H0]"),
    ("H–F donor", "[FH1]"),
)

SATURATED_HYDROCARBON_LIMIT = 0.15
"""[D] No open-chain or cyclohexane-type alkane has a larger moment: isobutane, 0.132 D, is the
largest well-known one (Lide, Maryott, J. Chem. Phys. 29 (1958) 1380 give 0.132 D)."""


@dataclass(frozen=True, slots=True)
class Molecule:
    """What a structure alone tells about a substance.

    `smiles` is canonical and isomeric; `formula` follows Hill ("C2H6O"); `molar_mass` [g/mol].
    `zero_dipole` says that symmetry forbids a dipole moment; `dipole_limit` [D] is 0 then, 0.15
    for other saturated hydrocarbons, whose moments are practically zero, and None otherwise.
    `association` is the reason why the liquid is associated, "" where it is not.
    Keys shared by isomers: `skeleton_key` by all with the same formula, `stereo_key` by
    stereoisomers, `position_key` by positional isomers (same formula, rings and functions).
    """

    smiles: str
    inchi: str
    inchikey: str
    formula: str
    molar_mass: float
    family: str
    family_label: str
    zero_dipole: bool
    dipole_limit: float | None
    skeleton_key: str
    stereo_key: str
    position_key: str
    association: str

    @property
    def isomer_key(self) -> str:
        """Key shared by all isomers: the Hill formula."""
        return self.skeleton_key

    @property
    def is_associated(self) -> bool:
        """Whether the liquid is held together by hydrogen bonds between like molecules."""
        return self.association != ""


@lru_cache(maxsize=4096)
def molecule(smiles: str) -> Molecule:
    """Everything about a molecule that follows from its structure alone.

    Raises `ValueError`, saying why, if the SMILES string cannot be read or holds an element
    without a standard atomic weight.
    """
    from rdkit import Chem
    from rdkit.Chem import rdMolDescriptors

    mol = parse(smiles)
    canonical = Chem.MolToSmiles(mol)
    inchi, key = _inchi(mol)
    formula = rdMolDescriptors.CalcMolFormula(mol, separateIsotopes=True, abbreviateHIsotopes=True)
    family, label = _family(mol)
    zero = dipole_vanishes(canonical)
    limit = 0.0 if zero else SATURATED_HYDROCARBON_LIMIT if _is_alkane(mol) else None
    return Molecule(
        smiles=canonical,
        inchi=inchi,
        inchikey=key,
        formula=formula,
        molar_mass=_molar_mass(mol),
        family=family,
        family_label=label,
        zero_dipole=zero,
        dipole_limit=limit,
        skeleton_key=formula,
        stereo_key=f"{formula}|{key.split('-')[0]}",
        position_key=f"{formula}|{_functions(mol)}",
        association=_association(mol),
    )


def inchikey(smiles: str) -> str:
    """The InChIKey alone, in a tenth of the time of `molecule`; raises as that does."""
    mol = parse(smiles)
    _molar_mass(mol)  # which asks that every element has a standard atomic weight
    return _inchi(mol)[1]


def _inchi(mol: Mol) -> tuple[str, str]:
    """InChI and InChIKey."""
    from rdkit import rdBase
    from rdkit.Chem import rdinchi

    with rdBase.BlockLogs():
        inchi = str(rdinchi.MolToInchi(mol)[0])
        key = str(rdinchi.InchiToInchiKey(inchi)) if inchi else ""
    if not key:
        raise ValueError("no InChI can be made for this structure")
    return inchi, key


def molecules(smiles: Sequence[str], cache: Cache) -> Mapping[str, Molecule]:
    """The molecules of several SMILES strings, by these; kept, so that most need no rdkit.

    Raises `ValueError` as `molecule` does.
    """
    pack = cache.pack("molecules")
    kept = Kept({text: digest(text, _version()) for text in smiles}, pack)
    found = kept.each(list(dict.fromkeys(smiles)), "molecule", lambda some: [*map(molecule, some)])
    pack.save(forget=False)
    return found


def likely_shapes(smiles: str, cache: Cache) -> Likely | None:
    """The conformers that may stand for the drawn shape, kept; None outside the dipole model."""
    key = digest(smiles, fingerprint())
    stored = cache.get("conformers", key)
    if stored is not None:
        kept: Likely | None = pickle.loads(stored)
        return kept
    found = likely(smiles)
    cache.put("conformers", key, pickle.dumps(found))
    return found


@lru_cache(maxsize=1)
def _version() -> str:
    """Hash of the code that reads structures."""
    here = Path(__file__)
    files = (here, here.with_name("conformers.py"))
    return digest(version("rdkit"), *(file.read_bytes() for file in files))


def same_structure(smiles_a: str, smiles_b: str) -> str:
    """Compare two structures: "same", "stereo", "isomer" or "different".

    "stereo": same atoms and bonds, another (or no) statement about their arrangement in space.
    Tautomers that the standard InChI holds for one substance count as the same.
    """
    one, two = molecule(smiles_a), molecule(smiles_b)
    if one.formula != two.formula:
        return "different"
    if one.inchikey == two.inchikey:
        return "same"
    return "stereo" if one.stereo_key == two.stereo_key else "isomer"


def isomer_groups(molecules: Mapping[str, Molecule], kind: str) -> tuple[tuple[str, ...], ...]:
    """Sets of two or more isomers among named molecules, each sorted, in order of their names.

    `kind` is "formula" (same formula), "position" (same formula, rings and functional groups)
    or "stereo" (same atoms and bonds). Entries of the very same structure count once, so two
    names of one substance make no set.
    """
    attribute = {"formula": "skeleton_key", "position": "position_key", "stereo": "stereo_key"}
    if kind not in attribute:
        raise ValueError(f"kind must be one of {sorted(attribute)}, not {kind!r}")
    groups: dict[str, list[str]] = {}
    for name in sorted(molecules):
        groups.setdefault(getattr(molecules[name], attribute[kind]), []).append(name)
    return tuple(
        tuple(names)
        for names in sorted(groups.values())
        if len({molecules[name].inchikey for name in names}) > 1
    )


def additive_refraction(smiles: str) -> float:
    """Molar refraction [cm³/mol] at the sodium D line as a sum over the atoms.

    Contributions of Wildman, Crippen, J. Chem. Inf. Comput. Sci. 39 (1999) 868.
    """
    from rdkit.Chem import rdMolDescriptors

    return float(rdMolDescriptors.CalcCrippenDescriptors(parse(smiles))[1])


def _molar_mass(mol: Mol) -> float:
    """Molar mass [g/mol]; an atom marked with an isotope counts with its isotopic mass."""
    from rdkit import Chem

    table = Chem.GetPeriodicTable()
    mass = 0.0
    for atom in mol.GetAtoms():
        symbol = atom.GetSymbol()
        if atom.GetIsotope():
            mass += table.GetMassForIsotope(symbol, atom.GetIsotope())
        elif symbol in ATOMIC_WEIGHTS:
            mass += ATOMIC_WEIGHTS[symbol]
        else:
            raise ValueError(f"no standard atomic weight is listed for {symbol}")
        mass += atom.GetTotalNumHs() * ATOMIC_WEIGHTS["H"]
    return round(mass, 6)  # sums in another order of atoms differ in the last bits


@lru_cache(maxsize=256)
def _pattern(smarts: str) -> Mol:
    from rdkit import Chem

    pattern = Chem.MolFromSmarts(smarts)
    if pattern is None:
        raise ValueError(f"not a valid SMARTS pattern: {smarts}")
    return pattern


def _family(mol: Mol) -> tuple[str, str]:
    hydrocarbon = all(atom.GetAtomicNum() in (1, 6) for atom in mol.GetAtoms())
    aromatic = any(atom.GetIsAromatic() for atom in mol.GetAtoms())
    isoprene_units = mol.GetNumHeavyAtoms() in (10, 15, 20) and not aromatic and not _is_alkane(mol)
    for key, label, patterns in FAMILIES:
        for pattern in patterns:
            *conditions, smarts = pattern.split(" ")
            if "HYDROCARBON" in conditions and not hydrocarbon:
                continue
            if "TERPENE" in conditions and not isoprene_units:
                continue
            if mol.HasSubstructMatch(_pattern(smarts)):
                return key, label
    return FAMILIES[-1][:2]


def _is_alkane(mol: Mol) -> bool:
    """Carbon and hydrogen, single bonds only, no three- or four-membered ring."""
    return all(
        atom.GetAtomicNum() == 6 and atom.GetDegree() + atom.GetTotalNumHs() == 4
        for atom in mol.GetAtoms()
    ) and not mol.HasSubstructMatch(_pattern("[r3,r4]"))


def _association(mol: Mol) -> str:
    for reason, smarts in _ASSOCIATION:
        if mol.HasSubstructMatch(_pattern(smarts)):
            return reason
    return ""


def _functions(mol: Mol) -> str:
    """Rings with what hangs on them, and every function of the molecule, as one string.

    Positional isomers agree in it. A function is a hetero atom with its hydrogens and bonds, or
    a multiple bond between carbons.
    """
    from rdkit import Chem

    parts: list[str] = []
    for atom in mol.GetAtoms():
        if atom.GetAtomicNum() == 6:
            hetero = sorted(
                f"{bond.GetBondTypeAsDouble():g}{bond.GetOtherAtom(atom).GetSymbol()}"
                for bond in atom.GetBonds()
                if bond.GetOtherAtom(atom).GetAtomicNum() != 6
            )
            if any(not text.startswith("1") for text in hetero):
                only = f"H{atom.GetTotalNumHs() > 0:d}" if len(hetero) == 1 else ""
                parts.append(f"C{only}({','.join(hetero)})")
            continue
        bonds = sorted(f"{bond.GetBondTypeAsDouble():g}" for bond in atom.GetBonds())
        parts.append(f"{atom.GetSymbol()}H{atom.GetTotalNumHs()}({','.join(bonds)})")
    for bond in mol.GetBonds():
        ends = {bond.GetBeginAtom().GetAtomicNum(), bond.GetEndAtom().GetAtomicNum()}
        if ends == {6} and bond.GetBondTypeAsDouble() > 1 and not bond.GetIsAromatic():
            parts.append(f"CC{bond.GetBondTypeAsDouble():g}")
    cut = [
        bond.GetIdx()
        for bond in mol.GetBonds()
        if not bond.IsInRing() and (bond.GetBeginAtom().IsInRing() or bond.GetEndAtom().IsInRing())
    ]
    if cut:
        pieces = Chem.FragmentOnBonds(mol, cut, addDummies=False)
        for piece in Chem.GetMolFrags(pieces, asMols=True, sanitizeFrags=False):
            plain = Chem.RemoveAllHs(piece, sanitize=False)
            ring = any(atom.IsInRing() for atom in plain.GetAtoms())
            for atom in plain.GetAtoms():
                atom.SetNoImplicit(False)
                atom.SetNumExplicitHs(0)
                atom.SetChiralTag(Chem.ChiralType.CHI_UNSPECIFIED)
            parts.append(
                Chem.MolToSmiles(plain, isomericSmiles=False) if ring else f"-{plain.GetNumAtoms()}"
            )
    elif mol.GetRingInfo().NumRings():
        parts.append(Chem.MolToSmiles(mol, isomericSmiles=False))
    return " ".join(sorted(parts))
