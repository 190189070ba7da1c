"""Makes generator/reference/increments.csv and spreads.csv again from the open liquids.

Run ``python tests/audit/learn_spreads.py`` after a change of a check or of the open tables. The
thousand liquids with a published permittivity are put into a folder of their own, the additive
volumes are fitted to their densities, and the robust spread of every check is measured on them.
"""

from __future__ import annotations

import csv
import sys
import tempfile
from pathlib import Path

import numpy as np
from numpy.typing import NDArray

from generator import additions, expectations, facts, increments, spreads
from generator.dataset import Dataset, load_dataset
from generator.structures import Molecule, molecule

REFERENCE = Path(expectations.__file__).parent / "reference"
# Weight of a contribution of zero, in liquids: keeps parts that occur once or twice small.
RIDGE = 1e-4
ROUNDS = 40


def open_liquids(folder: Path) -> Dataset:
    """Every substance with a published permittivity, as ``add --all-liquids`` writes them."""
    if not (folder / "solvents.csv").exists():
        additions.apply(additions.plan(folder, (), all_liquids=True))
    return load_dataset(folder)


def _volumes(dataset: Dataset, molecules: dict[str, Molecule]) -> tuple[list[str], list[float]]:
    """Measured molar volumes [cm³/mol] at 20 °C."""
    slugs, volumes = [], []
    for slug, structure in molecules.items():
        for row in dataset.measurements_of(slug, "density")[:1]:
            if row.temperature is None or abs(row.temperature - expectations.ROOM) > 40:
                continue
            associated = structure.is_associated
            alpha = (
                facts.USUAL_EXPANSIVITY_ASSOCIATED if associated else facts.USUAL_EXPANSIVITY
            )
            cold = row.value * np.exp(alpha * (row.temperature - expectations.ROOM))
            slugs.append(slug)
            volumes.append(structure.molar_mass / float(cold))
    return slugs, volumes


def fit(rows: list[dict[str, float]], target: list[float]) -> dict[str, float]:
    """Contributions that give ``target`` with the least relative error; outliers lose weight."""
    names = sorted({name for row in rows for name in row})
    y = np.array(target)
    design = np.array([[row.get(name, 0.0) for name in names] for row in rows]) / y[:, None]
    weight: NDArray[np.float64] = np.ones(len(y))
    solution = np.zeros(len(names))
    for _ in range(ROUNDS):
        left = design.T @ (weight[:, None] * design) + RIDGE * np.eye(len(names))
        solution = np.linalg.solve(left, design.T @ weight)
        error = design @ solution - 1
        sigma = spreads.robust(error).spread
        weight = 1 / (1 + (error / (2 * sigma)) ** 2)
    print(f"{len(y)} molar volumes, robust spread {100 * sigma:.2f} %")
    return dict(zip(names, solution.tolist(), strict=True))


def main(folder: Path) -> None:
    """Fit, measure and write both tables."""
    dataset = open_liquids(folder)
    molecules = {slug: molecule(s.smiles) for slug, s in dataset.solvents.items()}
    slugs, volumes = _volumes(dataset, molecules)
    parts = fit([dict(increments.parts(molecules[slug])) for slug in slugs], volumes)
    with (REFERENCE / "increments.csv").open("w", encoding="utf-8", newline="") as file:
        writer = csv.writer(file, lineterminator="\n")
        writer.writerow(["part", "molar_volume"])
        writer.writerows((name, f"{value:.3f}") for name, value in parts.items())
    increments._contributions.cache_clear()  # noqa: SLF001
    everything = [
        outcome
        for slug, structure in molecules.items()
        for outcome in expectations.outcomes(
            facts.View(facts.facts_of(dataset, slug, facts.structure_of(structure)))
        )
    ]
    with (REFERENCE / "spreads.csv").open("w", encoding="utf-8", newline="") as file:
        writer = csv.writer(file, lineterminator="\n")
        writer.writerow(["check", "group", "median", "spread", "count"])
        for (check, group), usual in spreads.learn(everything).items():
            print(f"{check:20} {group:28} {usual.median:9.4f} {usual.spread:9.4f} {usual.count}")
            writer.writerow(
                [check, group, f"{usual.median:.4g}", f"{usual.spread:.4g}", usual.count]
            )


if __name__ == "__main__":
    if len(sys.argv) > 1:
        main(Path(sys.argv[1]))
    else:
        with tempfile.TemporaryDirectory() as scratch:
            main(Path(scratch))
