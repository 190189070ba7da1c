"""Structural checks: the shipped tables and all published liquids are left in peace."""

from __future__ import annotations

import shutil
import subprocess
import sys
import time
from pathlib import Path

import pytest
from hypothesis import given
from hypothesis import strategies as st

from generator import additions, library
from generator.cache import Cache
from generator.checks import check_folder, check_tables
from generator.errors import Problem
from generator.kelvin import in_celsius, looks_like_kelvin, point_in_kelvin
from generator.smiles import why_unreadable
from generator.tables import read_tables
from generator.typed import Ends

ROOT = Path(__file__).resolve().parents[2]
DATA = ROOT / "data"


def test_the_shipped_tables_have_no_fault() -> None:
    assert check_folder(DATA) == ()


def test_common_units_and_a_kept_identity_need_no_heavy_library(tmp_path: Path) -> None:
    code = (
        "import sys; from pathlib import Path; from generator.checks import check_folder; "
        f"assert check_folder(Path({str(DATA)!r}), Path({str(tmp_path)!r})) == (); "
        "print({'pint', 'rdkit', 'pandas', 'matplotlib'} & set(sys.modules))"
    )
    first, second = (
        subprocess.run([sys.executable, "-c", code], check=True, capture_output=True, text=True)
        for _ in range(2)
    )
    assert first.stdout.strip() == "{'rdkit'}"
    assert second.stdout.strip() == "set()"


def test_what_is_kept_tells_the_same(tmp_path: Path) -> None:
    folder = shutil.copytree(DATA, tmp_path / "data")
    table = folder / "solvents.csv"
    table.write_text(table.read_text(encoding="utf-8").replace("CC(C)=O", "CCC=O", 1), "utf-8")
    tables, cache = read_tables(folder), Cache(tmp_path / "cache")
    fresh = check_tables(tables)
    assert [problem.kind for problem in fresh] == ["structure-cas-mismatch"]
    assert check_tables(tables, cache) == fresh
    assert check_tables(tables, cache) == fresh


def test_a_sample_of_the_published_liquids_has_no_fault(tmp_path: Path) -> None:
    names = library.with_permittivity()[::40]
    additions.apply(additions.plan(tmp_path, names))
    assert _errors(tmp_path) == []


@pytest.mark.build
def test_all_published_liquids_have_no_fault_and_take_seconds(tmp_path: Path) -> None:
    additions.apply(additions.plan(tmp_path, (), all_liquids=True))
    rows = sum(len(table.rows) for table in read_tables(tmp_path).tables.values())
    assert rows > 18_000
    start = time.process_time()
    assert _errors(tmp_path) == []
    assert time.process_time() - start < 10


def _errors(folder: Path) -> list[Problem]:
    return [problem for problem in check_folder(folder) if problem.severity == "error"]


# --- kelvin --------------------------------------------------------------------------------------

ACETONE = Ends(-94.7, 56.05)


@given(st.floats(-200, 240))
def test_what_a_laboratory_measures_at_is_believed(celsius: float) -> None:
    """Below 240 °C only an ending in .15 is no temperature in °C."""
    rounded = round(celsius, 1)
    for ends in (Ends(), ACETONE, Ends(10.0, 400.0), Ends(None, -40.0)):
        assert not looks_like_kelvin(rounded, ends)


@given(st.integers(-80, 56))
def test_kelvin_temperatures_of_a_liquid_are_noticed(celsius: int) -> None:
    kelvin = celsius + 273.15
    assert looks_like_kelvin(kelvin, Ends())
    assert in_celsius(kelvin) == f"{celsius}"
    if kelvin >= 250:
        assert looks_like_kelvin(round(kelvin), ACETONE)
        assert in_celsius(float(round(kelvin))) == f"{celsius}"


@pytest.mark.parametrize(
    ("celsius", "ends"),
    [
        (300.0, Ends(327.5, 1749.0)),  # no liquid at 27 °C: melts higher
        (293.0, Ends(216.0, 341.65)),  # anthracene: liquid at 293 °C, not at 20 °C
        (350.0, Ends(200.0, 685.0)),
        (298.0, Ends(120.0, None)),
        (390.0, Ends()),  # nothing known, and no usual temperature
    ],
)
def test_melts_are_measured_hot(celsius: float, ends: Ends) -> None:
    assert not looks_like_kelvin(celsius, ends)


@pytest.mark.parametrize(
    ("celsius", "others", "meant"),
    [
        (329.2, [56.1], 56.05),
        (329.2, [56.0, 56.3, 55.9], 56.05),
        (-217.1, [56.1], 56.05),  # 56.05 typed with the unit K
        (178.15, [], -95.0),
        (280.0, [6.0, 12.2], None),  # the others do not agree with each other
        (56.1, [56.0], None),
        (329.2, [], None),
        (300.0, [56.1], None),
    ],
)
def test_a_point_in_the_other_scale(
    celsius: float, others: list[float], meant: float | None
) -> None:
    found = point_in_kelvin(celsius, others)
    assert found == (None if meant is None else pytest.approx(meant, abs=0.01))


# --- structures ----------------------------------------------------------------------------------


@pytest.mark.parametrize(
    ("smiles", "words"),
    [
        ("CC(C", "1 opening and 0 closing round brackets"),
        ("C[Si", "square brackets"),
        ("C1CC", "ring number 1 is opened and not closed"),
        ("C%12CC", "ring number 12"),
        ("acetone", "'a' is no atom"),
        ("CQ", "'Q' is no atom"),
        ("C[Si](C)(C)(C)(C)C", "atom 2, Si, has more bonds"),
        ("C#C#C", "more bonds than it can have"),
        ("cc", "aromatic and is in no ring"),
        ("c1cccc1", "a ring in lower-case letters"),
        ("CC=", "a bond that leads nowhere"),
        ("C=(C)O", "no rule of SMILES"),
    ],
)
def test_why_a_structure_cannot_be_read(
    smiles: str, words: str, capfd: pytest.CaptureFixture[str]
) -> None:
    assert words in why_unreadable(smiles)
    assert capfd.readouterr().err == "", "the library's own messages stay out of the way"
