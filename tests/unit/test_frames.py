"""Tables of chosen numbers, against the handbook they are taken from."""

from pathlib import Path

import pandas as pd
import pytest
from click.testing import CliRunner

from generator import frames
from generator.cli import main
from generator.metrics import Handbook


@pytest.fixture(scope="module")
def frame(handbook: Handbook) -> pd.DataFrame:
    return frames.values(handbook)


def test_a_row_for_every_number(frame: pd.DataFrame, handbook: Handbook) -> None:
    key = ["solvent", "quantity", "temperature_c"]
    assert not frame.duplicated(key).any()
    water = frame[(frame["solvent"] == "water") & (frame["quantity"] == "density")]
    at = dict(zip(water["temperature_c"], water["value"], strict=True))
    found = handbook.at("water", "density", 293.15)
    assert found is not None
    assert at[20.0] == found.value
    assert (frame["sources"] != "").all()


def test_a_wide_table_holds_the_same_numbers(frame: pd.DataFrame, handbook: Handbook) -> None:
    made = frames.table(frame, ["relative_permittivity", "dipole_moment"], 40.0)
    assert list(made.columns) == ["relative_permittivity", "dipole_moment"]
    assert made["relative_permittivity"].dropna().is_monotonic_decreasing
    acetone = made.loc[("Acetone", "67-64-1")]
    for key in made.columns:
        found = handbook.at("acetone", key, 313.15)
        assert found is not None
        assert acetone[key] == found.value
    # Boils at 34.6 °C: a moment it has, a permittivity at 40 °C it has not.
    assert pd.isna(made.loc[("Diethyl ether", "60-29-7"), "relative_permittivity"])


def test_families_and_uncertainties(frame: pd.DataFrame) -> None:
    made = frames.table(frame, ["density"], 25.0, family="ester", uncertainties=True)
    assert list(made.columns) == ["density", "u(density)"]
    assert ("Ethyl acetate", "141-78-6") in made.index
    assert ("Acetone", "67-64-1") not in made.index
    assert (made["u(density)"] > 0).all()


def test_the_command(handbook: Handbook, tmp_path: Path) -> None:
    run, data = CliRunner().invoke, str(handbook.dataset.folder)
    out = tmp_path / "table.csv"
    done = run(
        main, ["table", "ε", "n_D", "--temperature", "31", "--out", str(out), "--data", data]
    )
    assert done.exit_code == 0, done.output
    made = pd.read_csv(out)
    assert list(made.columns) == ["name", "cas", "relative_permittivity", "refractive_index"]
    assert len(made) > 150
    shown = run(main, ["table", "bjerrum length", "--family", "nitriles", "--data", data])
    assert "Acetonitrile" in shown.output
    assert run(main, ["table", "colour", "--data", data]).exit_code == 2
