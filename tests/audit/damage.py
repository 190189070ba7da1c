"""Damages one cell of the shipped tables at a time and counts how often that cell is named.

Run ``python tests/audit/damage.py [trials] [--physics] [--typed]``. Each trial copies the tables,
types one slip into one cell, and looks for a finding with its file, line and column: an error of
the tables, or a suspect of the cross-checks. ``--physics`` leaves out the comparison with the
open tables that rows name as their source; ``--typed`` damages only rows that the laboratory
typed itself, which that comparison does not see.
"""

from __future__ import annotations

import argparse
import csv
import io
import random
import shutil
import tempfile
from collections import Counter
from collections.abc import Callable, Iterator, Mapping, Sequence
from dataclasses import dataclass, replace
from itertools import pairwise
from pathlib import Path

from generator import casnumbers, checks, evidence, library
from generator.blame import blamed
from generator.cache import Cache
from generator.cells import ERROR
from generator.dataset import Dataset, dataset_from
from generator.errors import Problem
from generator.facts import Facts
from generator.spreads import Spreads
from generator.statements import problem_of
from generator.structures import Molecule, molecule, same_structure
from generator.tables import read_tables
from generator.units import DEBYE

DATA = Path(__file__).resolve().parents[2] / "data"
VALUES = ("relative_permittivity", "refractive_index", "density", "dipole_moment")
KINDS = (*VALUES, "temperature", "cas", "smiles")
# A slip that changes less than this share of a value is none that anybody need notice.
LEAST_EFFECT = 0.05
Rows = list[dict[str, str]]


@dataclass(frozen=True)
class Slip:
    """One damaged cell: where, what was done, and the text before and after."""

    kind: str
    done: str
    file: str
    line: int
    column: str
    slug: str
    before: str
    after: str


@dataclass(frozen=True)
class Handbook:
    """The undamaged tables with all that a trial compares with."""

    folder: Path
    tables: Mapping[str, Rows]
    dataset: Dataset
    molecules: Mapping[str, Molecule]
    facts: Mapping[str, Facts]
    spreads: Spreads
    known: frozenset[tuple[str, int, str]]
    cache: Cache


def read(file: Path) -> Rows:
    """The rows of a table as text."""
    with file.open(encoding="utf-8-sig", newline="") as stream:
        return list(csv.DictReader(stream))


def undamaged(folder: Path, cache: Cache) -> Handbook:
    """The tables of a folder, checked."""
    tables = read_tables(folder)
    dataset = dataset_from(tables)
    molecules = {slug: molecule(s.smiles) for slug, s in dataset.solvents.items()}
    facts, spreads = evidence.prepared(dataset, molecules, cache)
    found = [*checks.check_tables(tables, cache), *suspects(dataset, facts, spreads)]
    known = frozenset((p.file, p.line, p.column) for p in found)
    rows = {name: read(folder / f"{name}.csv") for name in ("solvents", "measurements")}
    return Handbook(
        folder, rows, dataset, molecules, {f.slug: f for f in facts}, spreads, known, cache
    )


def suspects(dataset: Dataset, facts: Sequence[Facts], spreads: Spreads) -> list[Problem]:
    """What the cross-checks say about some substances, and no decision silences."""
    found = [
        problem_of(dataset.solvents[f.slug], f, blame, spreads)
        for f in facts
        for blame in blamed(f, spreads)
    ]
    kept = {
        (file, row.line)
        for file, rows in (
            ("measurements.csv", dataset.measurements),
            ("correlations.csv", dataset.correlations),
        )
        for row in rows
        if (decision := dataset.decision_on(row)) is not None and decision.action == "keep"
    }
    return [problem for problem in found if (problem.file, problem.line) not in kept]


# --- slips ---------------------------------------------------------------------------------------


def swapped(text: str, rng: random.Random) -> str:
    """Two neighbouring digits the other way round."""
    places = [i for i in range(len(text)) if text[i].isdigit()]
    pairs = [(i, j) for i, j in pairwise(places) if text[i] != text[j]]
    if not pairs:
        return text
    i, j = rng.choice(pairs)
    digits = list(text)
    digits[i], digits[j] = digits[j], digits[i]
    return "".join(digits)


def shifted(text: str, rng: random.Random) -> str:
    """The decimal point one place off."""
    return f"{float(text) * rng.choice((0.1, 10.0)):.10g}"


def _unit(text: str, quantity: str) -> str:
    if quantity == "density":
        return f"{float(text) * 1000:.6g}"
    if quantity == "dipole_moment":
        return f"{float(text) * DEBYE * 1e30:.3g}"
    return text


def value_slips(rows: Rows, row: dict[str, str], rng: random.Random) -> Iterator[tuple[str, str]]:
    """What a value may become: words for the slip, and the text."""
    text, quantity = row["value"], row["quantity"]
    others = [r["value"] for r in rows if r["quantity"] == quantity and r["unit"] == row["unit"]
              and r["solvent"] != row["solvent"]]  # fmt: skip
    yield "point shifted", shifted(text, rng)
    yield "digits swapped", swapped(text, rng)
    yield "unit mixed up", _unit(text, quantity)
    yield "neighbour's value", rng.choice(others)


def temperature_slips(
    rows: Rows, row: dict[str, str], rng: random.Random
) -> Iterator[tuple[str, str]]:
    """What a temperature may become."""
    text = row["temperature_c"]
    yield "K typed as °C", f"{float(text) + 273.15:.6g}"
    yield "point shifted", shifted(text, rng)
    yield "digits swapped", swapped(text, rng)
    yield "neighbour's value", rng.choice([r["temperature_c"] for r in rows if r["temperature_c"]])


def cas_slips(rows: Rows, row: dict[str, str], rng: random.Random) -> Iterator[tuple[str, str]]:
    """Another number with a valid check digit: a neighbour's, any substance's, a mistyped one."""
    yield "neighbour's number", rng.choice([r["cas"] for r in rows if r["cas"] != row["cas"]])
    yield "another substance's number", rng.choice(library.with_permittivity())
    digits = list(row["cas"].replace("-", "")[:-1])
    place = rng.randrange(len(digits))
    digits[place] = rng.choice([d for d in "123456789" if d != digits[place]])
    body = "".join(digits)
    yield "digit mistyped", f"{body[:-2]}-{body[-2:]}-{casnumbers.check_digit(body)}"


def smiles_slips(
    isomers: Callable[[str], Sequence[str]], rows: Rows, row: dict[str, str], rng: random.Random
) -> Iterator[tuple[str, str]]:
    """Another structure: an isomer's, a neighbour's."""
    others = isomers(row["smiles"])
    if others:
        yield "isomer's structure", rng.choice(others)
        yield "isomer's structure", rng.choice(others)
    yield "neighbour's structure", rng.choice([r["smiles"] for r in rows])


def isomers_of(smiles: str) -> Sequence[str]:
    """Structures of the open liquids with the same formula."""
    wanted = molecule(smiles)
    found = []
    for cas in library.with_permittivity():
        try:
            other = molecule(library.entry(cas).smiles)
        except ValueError:
            continue
        if other.formula == wanted.formula and other.stereo_key != wanted.stereo_key:
            found.append(other.smiles)
    return found


def slip_of(
    kind: str, book: Handbook, rng: random.Random, typed: bool
) -> Slip:  # fmt: skip
    """One slip of a kind, in a cell drawn at random."""
    table = "solvents" if kind in ("cas", "smiles") else "measurements"
    rows = book.tables[table]
    while True:
        place = rng.randrange(len(rows))
        row, line = rows[place], place + 2
        if kind == "temperature":
            if row["quantity"] not in VALUES or not row["temperature_c"]:
                continue
        elif kind in VALUES and row["quantity"] != kind:
            continue
        if typed and table == "measurements" and row["source"] != "memory":
            continue
        if kind == "cas":
            column, options = "cas", list(cas_slips(rows, row, rng))
        elif kind == "smiles":
            column, options = "smiles", list(smiles_slips(isomers_of, rows, row, rng))
        elif kind == "temperature":
            column, options = "temperature_c", list(temperature_slips(rows, row, rng))
        else:
            column, options = "value", list(value_slips(rows, row, rng))
        done, after = rng.choice(options)
        if counts(kind, done, row[column], after):
            file = f"{table}.csv"
            return Slip(kind, done, file, line, column, row["solvent"], row[column], after)


def counts(kind: str, done: str, before: str, after: str) -> bool:
    """Whether the slip changes anything worth noticing."""
    if kind == "cas":
        return before != after
    if kind == "smiles":
        return same_structure(before, after) in ("isomer", "different")
    one, other = float(before), float(after)
    if one == other:
        return False
    if kind == "temperature":
        return abs(one - other) >= 5.0
    return done != "digits swapped" or abs(other / one - 1) > LEAST_EFFECT if one else True


# --- trials --------------------------------------------------------------------------------------


def damaged(book: Handbook, slip: Slip, folder: Path) -> None:
    """The tables with the slip typed in."""
    for file in book.folder.iterdir():
        if file.is_file():
            shutil.copy(file, folder / file.name)
    name = slip.file.removesuffix(".csv")
    rows = [dict(row) for row in book.tables[name]]
    rows[slip.line - 2][slip.column] = slip.after
    text = io.StringIO(newline="")
    writer = csv.DictWriter(text, list(rows[0]), lineterminator="\n")
    writer.writeheader()
    writer.writerows(rows)
    (folder / slip.file).write_text(text.getvalue(), encoding="utf-8")


def findings(book: Handbook, slip: Slip, *, physics: bool) -> list[Problem]:
    """What is found in the damaged tables about the damaged substance, beside what was known."""
    with tempfile.TemporaryDirectory() as scratch:
        folder = Path(scratch)
        damaged(book, slip, folder)
        tables = read_tables(folder)
        found = list(checks.check_tables(tables, book.cache))
        if not any(problem.severity == ERROR for problem in found):
            dataset = dataset_from(tables)
            here = {slip.slug: molecule(dataset.solvents[slip.slug].smiles)}
            own = replace(dataset, solvents={slip.slug: dataset.solvents[slip.slug]})
            (facts,) = evidence.everything(own, here, book.cache)
            facts = replace(facts, series=book.facts[slip.slug].series)
            if physics:
                facts = replace(facts, prints={})
            found += suspects(dataset, [facts], book.spreads)
    return [p for p in found if (p.file, p.line, p.column) not in book.known]


def is_named(slip: Slip, found: Sequence[Problem]) -> bool:
    """Whether the damaged cell is among the findings."""
    return any((p.file, p.line, p.column) == (slip.file, slip.line, slip.column) for p in found)


def run(
    trials: int, *, physics: bool = False, typed: bool = False, seed: int = 1, show: bool = False
) -> tuple[Counter[str], Counter[str]]:
    """Trials and how many of them named the damaged cell, by kind of cell and by slip."""
    cache = Cache(DATA.parent / ".cache")
    book = undamaged(DATA, cache)
    rng = random.Random(seed)
    done: Counter[str] = Counter()
    named: Counter[str] = Counter()
    kinds = [k for k in KINDS if not (typed and k in ("cas", "smiles"))]
    for i in range(trials):
        slip = slip_of(kinds[i % len(kinds)], book, rng, typed)
        found = findings(book, slip, physics=physics)
        hit = is_named(slip, found)
        for key in (slip.kind, f"  {slip.done}", "all"):
            done[key] += 1
            named[key] += hit
        if show and not hit:
            others = "; ".join(f"{p.place} {p.kind}" for p in found) or "nothing"
            print(f"{slip.kind} of {slip.slug}: {slip.before} -> {slip.after} ({slip.done}), "
                  f"{slip.file} line {slip.line}; found {others}")  # fmt: skip
    return done, named


def main() -> None:
    """Run the trials asked for and print the table of rates."""
    parser = argparse.ArgumentParser(description=__doc__)
    parser.add_argument("trials", type=int, nargs="?", default=210)
    parser.add_argument("--physics", action="store_true")
    parser.add_argument("--typed", action="store_true")
    parser.add_argument("--seed", type=int, default=1)
    options = parser.parse_args()
    done, named = run(
        options.trials, physics=options.physics, typed=options.typed, seed=options.seed, show=True
    )
    for key in done:
        print(f"{key:28} {named[key]:4} of {done[key]:4}  {100 * named[key] / done[key]:5.1f} %")


if __name__ == "__main__":
    main()
