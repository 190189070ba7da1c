"""Fit the bond increments of `dipoles` to measured gas-phase moments: python -m generator.calibrate

The measured moments are the lists of Poling, Prausnitz, O'Connell (The Properties of Gases and
Liquids, 5th ed., 2001), of NIST's Computational Chemistry Comparison and Benchmark Database
(CCCBDB) and of Müller, Mokrushina, Arlt (J. Chem. Eng. Data 57 (2012) 1231), as the package
`chemicals` carries them. The lists contain errors. What is set aside is decided by the lists
against one another and against symmetry, never by the residual of the model, and every value set
aside is written out with its reason.

Fit: robust (Huber) ridge regression on |μ|, Levenberg-Marquardt. Each molecule is then left out
in turn and estimated from the others (leave-one-out).
"""

from __future__ import annotations

import csv
import json
from collections import Counter
from dataclasses import dataclass, field
from typing import TYPE_CHECKING, Any

import numpy as np

from generator.conformers import Shapes, parse, shapes
from generator.dipoles import (
    MODEL_FOLDER,
    bond_keys,
    moment_vectors,
    populated,
    refuse_outside,
)

if TYPE_CHECKING:
    from collections.abc import Iterable, Sequence

    from numpy.typing import NDArray

    Array = NDArray[np.float64]

LISTS = {
    "poling": "dipole_data_Poling",
    "cccbdb": "dipole_data_CCDB",
    "muller": "dipole_data_Muller",
}

LIST_UNCERTAINTY = {"poling": 0.1, "cccbdb": 0.05, "muller": 0.1}
"""[D] For weighing several lists of one substance: Poling prints one decimal only."""

AGREEMENT = 0.3
"""[D] Lists that differ by more contradict each other."""

MAJORITY = 0.15
"""[D] Distance from the median within which a list stays when another one is outvoted."""

SYMMETRY_ROUNDING = 0.1
"""[D] A larger moment of a molecule without one by symmetry is an error of the list."""

# CAS numbers whose entry in the list and whose structure are different substances.
WRONG_IDENTITY = {
    "14989-30-1": "the list means dichlorine monoxide, the structure is another substance",
    "2154-59-8": "the list means difluoromethylene, the structure is difluoromethane",
    "12070-15-4": "the list means the carbon dimer, the structure is ethyne",
    "12075-35-3": "the list means the carbon trimer, the structure is propadiene",
    "78-87-5": "the list names 2-chlorobutane, the CAS number is 1,2-dichloropropane's",
}

PENALTY = {"0": 1.0, "1": 2.0, "2": 5.0, "3": 10.0}
"""Ridge penalty by level: particular increments are held closer to zero than general ones.
Chosen together with the Huber width and the damping from a handful of values by ten-fold
cross-validation; the error changes by less than 0.02 D between neighbouring choices."""

PRIOR = {"0": 0.5, "1": 0.0, "2": 0.0, "3": 0.0}
HUBER = 0.2
"""[D] Residuals beyond this count linearly."""

POLAR_LIMITS = (0.2, 0.5, 1.0)
"""[D] Limits between unpolar and polar that the statistics look at. 0.2 D is the limit between
molecules without a moment (by symmetry, saturated hydrocarbons) and those with one."""

SUPPORT_CLASSES = (0, 5, 10**6)


@dataclass(slots=True)
class Case:
    """One substance of the lists."""

    smiles: str
    name: str
    values: list[tuple[str, float]]
    found: Shapes
    aside: list[tuple[str, float, str]] = field(default_factory=list)

    @property
    def moment(self) -> float:
        """Weighted mean [D] of the lists that are left."""
        weights = np.array([LIST_UNCERTAINTY[name] ** -2 for name, _ in self.values])
        return float((weights * [value for _, value in self.values]).sum() / weights.sum())

    @property
    def by_symmetry(self) -> bool:
        """Whether every populated conformer is without a moment by symmetry."""
        return bool(populated(self.found).without_moment.all())


def measured() -> list[Case]:
    """Read the lists, keep what the model covers, and set aside what contradicts."""
    import chemicals.dipole
    from chemicals.identifiers import search_chemical

    cases: dict[str, Case] = {}
    for key, attribute in LISTS.items():
        for cas, row in getattr(chemicals.dipole, attribute).iterrows():
            try:
                smiles = canonical(search_chemical(cas).smiles)
            except (ValueError, TypeError):
                continue  # no structure: nothing to estimate
            if smiles not in cases:
                try:
                    cases[smiles] = Case(smiles, str(row["Chemical"]).strip(), [], shapes(smiles))
                except ValueError:
                    continue
            value = round(float(row["dipole_moment"]), 3)
            if cas in WRONG_IDENTITY:
                cases[smiles].aside.append((key, value, WRONG_IDENTITY[cas]))
            else:
                cases[smiles].values.append((key, value))
    for case in cases.values():
        set_aside(case)
    return sorted(cases.values(), key=lambda case: case.smiles)


def canonical(smiles: str) -> str:
    """Canonical SMILES of a structure inside the model, else `ValueError`."""
    from rdkit import Chem

    mol = parse(smiles)
    refuse_outside(Chem.AddHs(mol))
    numbers = {atom.GetAtomicNum() for atom in mol.GetAtoms()}
    if 6 not in numbers and not _hydride(mol, numbers):
        raise ValueError("neither a carbon compound nor a hydride")
    if any(atom.GetIsotope() for atom in mol.GetAtoms()):
        raise ValueError("labelled with isotopes")
    nitro = mol.GetSubstructMatches(Chem.MolFromSmarts("[N+](=O)[O-]"))
    inside = {index for match in nitro for index in match}
    if any(a.GetFormalCharge() and a.GetIdx() not in inside for a in mol.GetAtoms()):
        raise ValueError("written with charges other than in nitro groups")
    return str(Chem.MolToSmiles(mol))


def _hydride(mol: Any, numbers: set[int]) -> bool:
    single = all(bond.GetBondTypeAsDouble() == 1.0 for bond in mol.GetBonds())
    return numbers <= {7, 8, 16} and single and mol.GetNumAtoms() <= 2


def set_aside(case: Case) -> None:
    """Move values that the other lists, symmetry or the structure contradict to `aside`."""
    from rdkit import Chem

    def drop(which: Iterable[tuple[str, float]], reason: str) -> None:
        gone = list(which)
        case.aside += [(name, value, reason) for name, value in gone]
        case.values = [pair for pair in case.values if pair not in gone]

    mol = parse(case.smiles)
    if any(
        info.type == Chem.StereoType.Bond_Double
        and info.specified == Chem.StereoSpecified.Unspecified
        for info in Chem.FindPotentialStereo(mol)
    ):
        drop(case.values, "the structure does not say cis or trans")
    if case.by_symmetry:
        drop([pair for pair in case.values if pair[1] > SYMMETRY_ROUNDING],
             "symmetry forbids a moment")  # fmt: skip
    numbers = [value for _, value in case.values]
    if numbers and max(numbers) - min(numbers) > AGREEMENT:
        middle = float(np.median(numbers))
        near = [pair for pair in case.values if abs(pair[1] - middle) <= MAJORITY]
        if len(numbers) > 2 and len(near) > 1:
            drop([pair for pair in case.values if pair not in near], "outvoted by two lists")
        else:
            drop(case.values, "lists contradict each other")
    donors = len(mol.GetSubstructMatches(Chem.MolFromSmarts("[O,N;!H0]")))
    if donors > 1 and {name for name, _ in case.values} == {"muller"}:
        drop(case.values, "several hydrogen-bond donors, and in the one list that mixes gas-phase "
                          "and solution values")  # fmt: skip


class Fit:
    """Design of all molecules stacked, and the fit of the increments."""

    def __init__(self, cases: Sequence[Case]) -> None:
        self.cases = cases
        self.measured = np.array([case.moment for case in cases])
        rows = [bond_keys(case.found.mol) for case in cases]
        self.sets = [{key for _, _, key, _ in found} for found in rows]
        self.molecules = Counter(key for found in self.sets for key in found)
        self.keys = sorted(self.molecules)
        place = {key: index for index, key in enumerate(self.keys)}
        design: list[Array] = []
        weights: list[float] = []
        starts: list[int] = []
        for case, found in zip(cases, rows, strict=True):
            here = populated(case.found)
            used = sorted({place[key] for _, _, key, _ in found})
            local = {index: position for position, index in enumerate(used)}
            charges = np.zeros((here.mol.GetNumAtoms(), len(used)))
            for begin, end, key, factor in found:
                charges[begin, local[place[key]]] -= factor
                charges[end, local[place[key]]] += factor
            starts.append(len(weights))
            for points, weight, vanishing in zip(
                here.positions, here.weights, here.without_moment, strict=True
            ):
                block = np.zeros((3, len(self.keys)))
                if not vanishing:
                    block[:, used] = moment_vectors(here.mol, points, charges)
                design.append(block)
                weights.append(weight)
        self.design, self.weights = np.array(design), np.array(weights)
        self.starts = np.array(starts)
        self.penalty = np.array([PENALTY[key[0]] for key in self.keys])
        self.prior = np.array([PRIOR[key[0]] for key in self.keys])

    def moments(self, increments: Array) -> tuple[Array, Array]:
        """|μ| [D] of each molecule, and its derivative by each increment."""
        vectors = self.design @ increments
        squares = np.add.reduceat(self.weights * (vectors**2).sum(axis=1), self.starts)
        sizes = np.sqrt(squares + 1e-4)  # keeps the derivative finite at zero
        slopes = np.einsum("nc,nck->nk", vectors * self.weights[:, None], self.design)
        return sizes, np.add.reduceat(slopes, self.starts) / sizes[:, None]

    def solve(self, start: Array, use: Array, huber: float, steps: int = 60) -> Array:
        """Increments that minimise the robust sum of squares; `use` weighs the molecules."""
        increments, damping = start.copy(), 1e-3
        sizes, slopes = self.moments(increments)
        cost = self._cost(sizes, increments, use, huber)
        for _ in range(steps):
            residual = sizes - self.measured
            weight = use * np.minimum(1.0, huber / np.maximum(np.abs(residual), 1e-12))
            hessian = slopes.T @ (weight[:, None] * slopes) + np.diag(self.penalty)
            gradient = slopes.T @ (weight * residual) + self.penalty * (increments - self.prior)
            for _ in range(8):
                step = np.linalg.solve(hessian + damping * np.diag(np.diag(hessian)), gradient)
                trial = increments - step
                trial_sizes, trial_slopes = self.moments(trial)
                trial_cost = self._cost(trial_sizes, trial, use, huber)
                if trial_cost < cost:
                    break
                damping *= 4
            else:
                return increments
            done = cost - trial_cost < 1e-6 * cost
            increments, sizes, slopes, cost = trial, trial_sizes, trial_slopes, trial_cost
            damping = max(damping / 5, 1e-9)
            if done:
                break
        return increments

    def _cost(self, sizes: Array, increments: Array, use: Array, huber: float) -> float:
        away = np.abs(sizes - self.measured)
        loss = np.where(away < huber, away**2 / 2, huber * (away - huber / 2))
        return float((use * loss).sum() + (self.penalty * (increments - self.prior) ** 2).sum() / 2)

    def all(self) -> Array:
        """Increments from all molecules: plain least squares first, then robust."""
        use = np.ones(len(self.measured))
        return self.solve(self.solve(self.prior, use, 1e9), use, HUBER)

    def leave_one_out(self, increments: Array) -> Array:
        """|μ| [D] of each molecule from a fit without it."""
        left_out = np.zeros(len(self.measured))
        for index in range(len(self.measured)):
            use = np.ones(len(self.measured))
            use[index] = 0.0
            left_out[index] = self.moments(self.solve(increments, use, HUBER))[0][index]
        left_out[[case.by_symmetry for case in self.cases]] = 0.0
        return left_out

    def support(self, index: int) -> int:
        """Other molecules that share the rarest bond of this one."""
        return min((self.molecules[key] - 1 for key in self.sets[index] if key[0] == "3"),
                   default=len(self.measured))  # fmt: skip


def statistics(fit: Fit, left_out: Array, fitted: Array, cases: Sequence[Case]) -> dict[str, Any]:
    """Numbers for the methods page."""
    error = left_out - fit.measured
    able = np.array([not case.by_symmetry for case in fit.cases])
    support = np.array([fit.support(index) for index in range(len(error))])

    def rms(values: Array) -> float:
        return round(float(np.sqrt(np.mean(values**2))), 3)

    classes, below = [], -1
    for up_to in SUPPORT_CLASSES:
        inside = able & (support > below) & (support <= up_to)
        classes.append({"up_to": up_to, "molecules": int(inside.sum()),
                        "rms_error": rms(error[inside])})  # fmt: skip
        below = up_to
    sides = []
    for limit in POLAR_LIMITS:
        right = (left_out > limit) == (fit.measured > limit)
        clear = np.abs(fit.measured - limit) > 2 * LIST_UNCERTAINTY["poling"]
        shares = [round(float(which.mean()), 4) for which in (right, right[clear])]
        names = ("limit", "right", "right_where_measured_0_2_away")
        sides.append(dict(zip(names, (limit, *shares), strict=True)))
    return {
        "molecules": len(error),
        "molecules_with_a_moment_allowed": int(able.sum()),
        "increments": len(fit.keys),
        "loo_rmse": rms(error),
        "loo_rmse_where_a_moment_is_allowed": rms(error[able]),
        "loo_median_absolute_error": round(float(np.median(np.abs(error[able]))), 3),
        "loo_mean_error": round(float(error[able].mean()), 3),
        "loo_within_half_debye": round(float((np.abs(error) <= 0.5).mean()), 3),
        "fit_rmse": rms(fitted - fit.measured),
        "polar_or_unpolar": sides,
        "values_set_aside": sum(len(case.aside) for case in cases),
        "error_by_support": classes,
    }


def main() -> None:
    """Fit, test, write the three files of the model and print the statistics."""
    cases = measured()
    fit = Fit([case for case in cases if case.values])
    increments = fit.all()
    left_out = fit.leave_one_out(increments)
    fitted = fit.moments(increments)[0]
    result = statistics(fit, left_out, fitted, cases)
    MODEL_FOLDER.mkdir(exist_ok=True)
    _write("increments.csv", ("key", "increment", "molecules"), (
        (key, f"{value:.4f}", fit.molecules[key])
        for key, value in zip(fit.keys, increments, strict=True)
    ))  # fmt: skip
    rows: list[tuple[object, ...]] = []
    for index, case in enumerate(fit.cases):
        used = " ".join(f"{name}={value:g}" for name, value in sorted(case.values))
        numbers = (f"{x:.2f}" for x in (case.moment, fitted[index], left_out[index]))
        rows.append((case.smiles, case.name, "used", used, *numbers, fit.support(index), ""))
    for case in cases:
        rows += [
            (case.smiles, case.name, "set aside", f"{name}={value:g}", "", "", "", "", reason)
            for name, value, reason in case.aside
        ]
    _write("tested.csv", ("smiles", "name", "status", "lists", "measured", "fitted", "left_out",
                          "support", "reason"), rows)  # fmt: skip
    text = json.dumps(result, indent=2) + "\n"
    (MODEL_FOLDER / "statistics.json").write_text(text, encoding="utf-8")
    print(text, end="")


def _write(name: str, header: Sequence[str], rows: Iterable[Sequence[object]]) -> None:
    with (MODEL_FOLDER / name).open("w", encoding="utf-8", newline="") as file:
        writer = csv.writer(file, lineterminator="\n")
        writer.writerow(header)
        writer.writerows(rows)


if __name__ == "__main__":
    main()
