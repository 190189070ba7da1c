"""Makes generator/reference/increments.csv and spreads.csv again from the open liquids.

Run ``python tests/audit/learn_spreads.py`` after a change of a check or of the open tables. The
thousand liquids with a published permittivity are put into a folder of their own, the models of
the structure are fitted to them, and the robust spread of every check is measured on them. What
the models miss by is measured on liquids that were left out of the fit.
"""

from __future__ import annotations

import csv
import math
import sys
import tempfile
from collections import Counter
from collections.abc import Mapping
from dataclasses import replace
from pathlib import Path

import numpy as np
from numpy.typing import NDArray

from generator import (
    additions,
    evidence,
    expectations,
    facts,
    increments,
    neighbours,
    reliability,
    spreads,
)
from generator.cache import Cache
from generator.dataset import Dataset, load_dataset
from generator.structures import additive_refraction, molecule

Array = NDArray[np.float64]
REFERENCE = Path(expectations.__file__).parent / "reference"
# Strengths that keep contributions of rare parts small; chosen by cross-validation.
RIDGE = {"refraction": 3.0, "molar_volume": 0.3, "boiling_point": 0.3, "liquid_moment": 1.0}
ROUNDS = 40
FOLDS = 10
# Contributions by part, how many liquids taught each part, and what each liquid's fold foretells.
Fitted = tuple[dict[str, float], Counter[str], Array]
COLDEST = 200.0  # K: gases teach nothing about liquids


def open_liquids(folder: Path) -> Dataset:
    """Every substance with a published permittivity, as ``add --all-liquids`` writes them."""
    if not (folder / "solvents.csv").exists():
        additions.apply(additions.plan(folder, (), all_liquids=True))
    return load_dataset(folder)


def solve(design: Array, target: Array, ridge: float) -> Array:
    """Robust ridge regression: outliers lose weight, the constant is left free."""
    scale = design.std(axis=0)
    free = scale == 0
    scale[free] = 1.0
    scaled = design / scale
    penalty = ridge * np.diag(np.where(free, 1e-6, 1.0))
    weight: Array = np.ones(len(target))
    solution: Array = np.zeros(design.shape[1])
    for _ in range(ROUNDS):
        left = scaled.T @ (weight[:, None] * scaled) + penalty
        solution = np.linalg.solve(left, scaled.T @ (weight * target))
        error = target - scaled @ solution
        middle = 1.4826 * float(np.median(np.abs(error)))
        weight = 1 / (1 + (error / (2 * middle)) ** 2)
    return np.asarray(solution / scale)


def remainder(model: str, substance: facts.Facts) -> float:
    """What the model must foretell: ln(measured), for the refraction over the additive one."""
    measured = neighbours.observed(substance)
    cold = measured.get("boiling_point", 999.0) < COLDEST
    if cold or measured.get(model, 0.0) <= 0.2:
        return math.nan
    smiles = substance.structure.molecule.smiles
    base = additive_refraction(smiles) if model == "refraction" else 1.0
    return math.log(measured[model] / base)


def fit(model: str, everything: list[facts.Facts]) -> Fitted:
    """Fit one model to all liquids, and to nine tenths of them at a time."""
    rows = [increments.parts(f.structure.molecule) for f in everything]
    target = np.array([remainder(model, f) for f in everything])
    organic = [increments.is_organic(f.structure.molecule) for f in everything]
    used = np.isfinite(target) & np.array(organic)
    taught = Counter(name for row, use in zip(rows, used, strict=True) if use for name in row)
    names = sorted(name for name, count in taught.items() if count >= increments.FEWEST)
    design = np.array([[row.get(name, 0.0) for name in names] for row in rows])
    fold = np.arange(len(rows)) % FOLDS
    unseen = np.zeros(len(rows))
    for k in range(FOLDS):
        others = used & (fold != k)
        unseen[fold == k] = design[fold == k] @ solve(design[others], target[others], RIDGE[model])
    usual = spreads.robust((target - unseen)[used])
    print(f"{model}: {used.sum()} liquids, robust spread of those left out {usual.spread:.4f}")
    whole = solve(design[used], target[used], RIDGE[model])
    return dict(zip(names, whole.tolist(), strict=True)), taught, unseen


def write_increments(everything: list[facts.Facts]) -> list[Mapping[str, float]]:
    """Fit every model, write the contributions; what a fit without each liquid foretells of it."""
    fitted = {model: fit(model, everything) for model in increments.MODELS}
    names = sorted({name for contributions, *_ in fitted.values() for name in contributions})
    write_table(names, fitted)
    unseen = []
    for i, substance in enumerate(everything):
        here = substance.structure.molecule
        found = {m: math.exp(fitted[m][2][i]) for m in increments.MODELS}
        found["refraction"] *= additive_refraction(here.smiles)
        unseen.append(found if increments.foretold(here) else {})
    return unseen


def write_table(names: list[str], fitted: Mapping[str, Fitted]) -> None:
    """Write the contributions of all models and forget those that were read before."""
    with (REFERENCE / "increments.csv").open("w", encoding="utf-8", newline="") as file:
        writer = csv.writer(file, lineterminator="\n")
        writer.writerow(["part", "liquids", *increments.MODELS])
        for name in names:
            values = (fitted[m][0].get(name, 0.0) for m in increments.MODELS)
            fewest = min(fitted[m][1][name] for m in increments.MODELS)
            writer.writerow([name, fewest, *(f"{value:.5g}" for value in values)])
    for cached in (increments._contributions, increments.foretold):
        cached.cache_clear()


def write_spreads(everything: list[facts.Facts], unseen: list[Mapping[str, float]]) -> None:
    """Measure the spread of every check and write it."""
    honest = []
    for substance, foretold in zip(everything, unseen, strict=True):
        structure = facts.structure_of(substance.structure.molecule)
        refraction = foretold.get("refraction", structure.refraction)
        structure = replace(structure, foretold=foretold, refraction=refraction)
        honest.append(replace(substance, structure=structure))
    series = neighbours.series_of([neighbours.sketch(substance) for substance in honest])
    found = [
        outcome
        for substance in honest
        for outcome in expectations.outcomes(
            facts.View(replace(substance, series=series[substance.slug]))
        )
    ]
    with (REFERENCE / "spreads.csv").open("w", encoding="utf-8", newline="") as file:
        writer = csv.writer(file, lineterminator="\n")
        writer.writerow(["check", "group", "median", "spread", "count"])
        for (check, group), usual in spreads.learn([spreads.compared(found)]).items():
            print(f"{check:20} {group:28} {usual.median:9.4f} {usual.spread:9.4f} {usual.count}")
            numbers = (f"{usual.median:.4g}", f"{usual.spread:.4g}", usual.count)
            writer.writerow([check, group, *numbers])


def write_reliability(dataset: Dataset) -> None:
    """Count how often each source is outvoted and write it."""
    votes: Counter[tuple[str, str]] = Counter()
    lost: Counter[tuple[str, str]] = Counter()
    for slug in dataset.solvents:
        for quantity in reliability.QUANTITIES:
            values = [(m.source, m.value) for m in dataset.measurements_of(slug, quantity)]
            for source, out in reliability.outvoted(quantity, values):
                votes[quantity, source] += 1
                lost[quantity, source] += out
    with (REFERENCE / "reliability.csv").open("w", encoding="utf-8", newline="") as file:
        writer = csv.writer(file, lineterminator="\n")
        writer.writerow(["quantity", "source", "values", "outvoted"])
        writer.writerows([*key, votes[key], lost[key]] for key in sorted(votes))


def main(folder: Path, cache: Cache) -> None:
    """Fit, measure and write both tables."""
    dataset = open_liquids(folder)
    molecules = {slug: molecule(s.smiles) for slug, s in dataset.solvents.items()}
    # The contributions of the last time may not teach those of this time.
    write_table([], {})
    everything = evidence.everything(dataset, molecules, cache)
    around = neighbours.surroundings([neighbours.sketch(substance) for substance in everything])
    everything = [neighbours.placed(f, around[f.slug]) for f in everything]
    write_reliability(dataset)
    write_spreads(everything, write_increments(everything))


if __name__ == "__main__":
    if len(sys.argv) > 1:
        main(Path(sys.argv[1]), Cache(Path(sys.argv[1]) / ".cache"))
    else:
        with tempfile.TemporaryDirectory() as scratch:
            main(Path(scratch), Cache(None))
