"""Makes generator/reference/increments.csv and spreads.csv again from the open liquids.

Run ``python tests/audit/learn_spreads.py`` after a change of a check or of the open tables. The
thousand liquids with a published permittivity are put into a folder of their own, the models of
the structure are fitted to them, and the robust spread of every check is measured on them.
"""

from __future__ import annotations

import csv
import math
import sys
import tempfile
from dataclasses import replace
from pathlib import Path

import numpy as np
from numpy.typing import NDArray

from generator import additions, expectations, facts, increments, neighbours, spreads
from generator.dataset import Dataset, load_dataset
from generator.structures import Molecule, molecule

Array = NDArray[np.float64]
REFERENCE = Path(expectations.__file__).parent / "reference"
# Strength that keeps contributions of rare parts small; chosen by cross-validation.
RIDGE = 0.3
ROUNDS = 40
FOLDS = 10
COLDEST = 150.0  # K: liquids of single atoms and the lightest molecules teach nothing here


def open_liquids(folder: Path) -> Dataset:
    """Every substance with a published permittivity, as ``add --all-liquids`` writes them."""
    if not (folder / "solvents.csv").exists():
        additions.apply(additions.plan(folder, (), all_liquids=True))
    return load_dataset(folder)


def solve(design: Array, target: Array) -> Array:
    """Robust ridge regression: outliers lose weight, the constant is left free."""
    scale = design.std(axis=0)
    free = scale == 0
    scale[free] = 1.0
    scaled = design / scale
    penalty = RIDGE * np.diag(np.where(free, 1e-6, 1.0))
    weight: Array = np.ones(len(target))
    solution: Array = np.zeros(design.shape[1])
    for _ in range(ROUNDS):
        left = scaled.T @ (weight[:, None] * scaled) + penalty
        solution = np.linalg.solve(left, scaled.T @ (weight * target))
        error = target - scaled @ solution
        weight = 1 / (1 + (error / (2 * spreads.robust(error).spread)) ** 2)
    return np.asarray(solution / scale)


def fit(model: str, everything: list[facts.Facts]) -> dict[str, float]:
    """Contributions to the logarithm of what the model foretells; prints its spread unseen."""
    rows, target = [], []
    for substance in everything:
        counts = dict(increments.parts(substance.structure.molecule))
        measured = neighbours.observed(substance).get(model, 0.0)
        cold = neighbours.observed(substance).get("boiling_point", 999.0) < COLDEST
        if "C" in counts and measured > 0.2 and not cold:
            rows.append(counts)
            target.append(math.log(measured))
    names = sorted({name for row in rows for name in row})
    design = np.array([[row.get(name, 0.0) for name in names] for row in rows])
    y = np.array(target)
    fold = np.arange(len(y)) % FOLDS
    unseen = np.zeros(len(y))
    for k in range(FOLDS):
        unseen[fold == k] = y[fold == k] - design[fold == k] @ solve(
            design[fold != k], y[fold != k]
        )
    usual = spreads.robust(unseen)
    print(f"{model}: {len(y)} liquids, robust spread of those left out {100 * usual.spread:.1f} %")
    return dict(zip(names, solve(design, y).tolist(), strict=True))


def write_increments(everything: list[facts.Facts]) -> None:
    """Fit every model and write the contributions."""
    models = {model: fit(model, everything) for model in increments.MODELS}
    names = sorted({name for model in models.values() for name in model})
    with (REFERENCE / "increments.csv").open("w", encoding="utf-8", newline="") as file:
        writer = csv.writer(file, lineterminator="\n")
        writer.writerow(["part", *increments.MODELS])
        for name in names:
            values = (models[m].get(name, 0.0) for m in increments.MODELS)
            writer.writerow([name, *(f"{value:.5g}" for value in values)])
    increments._contributions.cache_clear()
    increments.foretold.cache_clear()


def write_spreads(everything: list[facts.Facts]) -> None:
    """Measure the spread of every check and write it."""
    series = neighbours.series_of(everything)
    found = [
        outcome
        for substance in everything
        for outcome in expectations.outcomes(
            facts.View(replace(substance, series=series[substance.slug]))
        )
    ]
    with (REFERENCE / "spreads.csv").open("w", encoding="utf-8", newline="") as file:
        writer = csv.writer(file, lineterminator="\n")
        writer.writerow(["check", "group", "median", "spread", "count"])
        for (check, group), usual in spreads.learn(found).items():
            print(f"{check:20} {group:28} {usual.median:9.4f} {usual.spread:9.4f} {usual.count}")
            numbers = (f"{usual.median:.4g}", f"{usual.spread:.4g}", usual.count)
            writer.writerow([check, group, *numbers])


def facts_from(dataset: Dataset, molecules: dict[str, Molecule]) -> list[facts.Facts]:
    """The cells of every substance, with what the shipped models foretell."""
    return [
        facts.facts_of(dataset, slug, facts.structure_of(structure))
        for slug, structure in molecules.items()
    ]


def main(folder: Path) -> None:
    """Fit, measure and write both tables."""
    dataset = open_liquids(folder)
    molecules = {slug: molecule(s.smiles) for slug, s in dataset.solvents.items()}
    write_increments(facts_from(dataset, molecules))
    write_spreads(facts_from(dataset, molecules))


if __name__ == "__main__":
    if len(sys.argv) > 1:
        main(Path(sys.argv[1]))
    else:
        with tempfile.TemporaryDirectory() as scratch:
            main(Path(scratch))
