"""Tables → dataset: units converted, corrections applied, rounding and customary uncertainty."""

from __future__ import annotations

from collections.abc import Callable
from pathlib import Path

import pytest
from hypothesis import given
from hypothesis import strategies as st

from generator.dataset import Dataset, load_dataset, printed_alike
from generator.errors import DatasetError
from generator.quantities import QUANTITIES
from generator.schema import shipped_file, shipped_schema

Load = Callable[..., Dataset]
TABLES = {
    "solvents": ["acetone,Acetone,67-64-1,CC(C)=O,propanone; dimethyl ketone ;,"],
    "sources": ["book,handbook-table,A book,2014,", "own,laboratory,Here,,"],
    "uncertainties": [
        "handbook-table,density,0.0005,0.001,Printed tables",
        "handbook-table,relative_permittivity,0.01,0.01,Printed tables",
    ],
}


@pytest.fixture
def load(tmp_path: Path) -> Load:
    """Tables of these rows, loaded."""

    def make(**rows: list[str]) -> Dataset:
        (tmp_path / "datapackage.json").write_bytes(shipped_file("datapackage.json"))
        for name, table in shipped_schema().items():
            lines = [",".join(table.columns), *rows.get(name, TABLES.get(name, []))]
            (tmp_path / table.path).write_text("".join(f"{line}\n" for line in lines))
        return load_dataset(tmp_path)

    return make


@pytest.mark.parametrize(
    ("row", "value", "half_width"),
    [
        ("density,784.5,kg/m3,,25", 0.7845, 0.00005),
        ("density,0.78450,g/cm3,,25", 0.7845, 0.000005),
        ("dipole_moment,2.88,D,,", 2.88, 0.005),
        ("dipole_moment,3,D,,", 3.0, 0.5),
        ("boiling_point,329.2,K,,", 56.05, 0.05),
        ("boiling_point,133,degF,,", 56.1111111, 0.2777778),
        ("viscosity,3.06e-4,Pa s,,25", 0.306, 0.0005),
        ("vapour_pressure,230,mmHg,,25", 30.66414, 0.066661),
    ],
)
def test_values_come_in_the_quantitys_own_unit(
    load: Load, row: str, value: float, half_width: float
) -> None:
    (found,) = load(measurements=[f"acetone,{row},book,,"]).measurements
    assert found.value == pytest.approx(value, rel=1e-6)
    assert found.half_width == pytest.approx(half_width, rel=1e-4)
    assert found.unit == QUANTITIES[found.quantity].unit
    assert found.printed in row


def test_an_uncertainty_has_no_offset(load: Load) -> None:
    (kelvin,) = load(measurements=["acetone,boiling_point,329.2,K,0.1,,book,,"]).measurements
    assert kelvin.uncertainty == pytest.approx(0.1)
    (blank,) = load(measurements=["acetone,boiling_point,56,degC,,,book,,"]).measurements
    assert blank.uncertainty is None
    assert blank.temperature is None


def test_temperatures_come_in_kelvin(load: Load) -> None:
    dataset = load(
        measurements=["acetone,density,0.78,g/cm3,,25,book,,"],
        correlations=["acetone,density,polynomial,g/cm3,1.1 -0.001,-20,50,,book"],
        corrections=["acetone,density,book,25,0.78,keep,,Why,2026-01-02"],
    )
    assert dataset.measurements[0].temperature == pytest.approx(298.15)
    assert (dataset.correlations[0].t_min, dataset.correlations[0].t_max) == pytest.approx(
        (253.15, 323.15)
    )
    assert dataset.corrections[0].temperature == pytest.approx(298.15)


def test_names_are_split_and_order_is_kept(load: Load) -> None:
    dataset = load(solvents=["b,B,67-64-1,CC(C)=O,x; y ;,", "a,A,64-17-5,CCO,,note"])
    assert list(dataset.solvents) == ["b", "a"]
    assert dataset.solvents["b"].synonyms == ("x", "y")
    assert dataset.solvents["a"].line == 3


# --- corrections ---------------------------------------------------------------------------------

POINTS = [
    "acetone,density,785,kg/m3,,25,book,,",
    "acetone,density,0.79,g/cm3,,20,book,,",
    "acetone,dipole_moment,2.9,D,,,book,,",
]


def _decision(text: str) -> list[str]:
    return [f"acetone,{text},The reason,2026-01-02"]


def test_a_point_set_aside_is_not_in_force_and_still_there(load: Load) -> None:
    dataset = load(measurements=POINTS, corrections=_decision("density,book,25,785.0,exclude,"))
    assert [p.line for p in dataset.measurements_of("acetone", "density")] == [3]
    assert len(dataset.measurements) == 3
    decision = dataset.decision_on(dataset.measurements[0])
    assert decision is not None
    assert decision.reason == "The reason"


def test_a_replacement_is_in_the_unit_that_was_printed(load: Load) -> None:
    dataset = load(measurements=POINTS, corrections=_decision("density,book,25,785,replace,784.51"))
    point = dataset.measurements_of("acetone", "density")[0]
    assert point.value == pytest.approx(0.78451)
    assert point.half_width == pytest.approx(0.000005)
    assert point.printed == "785"
    assert point.correction is not None


def test_a_value_kept_is_in_force_as_it_stands(load: Load) -> None:
    dataset = load(measurements=POINTS, corrections=_decision("density,book,25,785,keep,"))
    assert dataset.measurements_of("acetone", "density")[0].value == pytest.approx(0.785)


@pytest.mark.parametrize(
    "text",
    [
        "density,book,20,785,exclude,",  # another temperature
        "density,book,25,786,exclude,",  # another value
        "density,own,25,785,exclude,",  # another source
        "density,book,,785,exclude,",  # no temperature
        "dipole_moment,book,25,2.9,exclude,",  # a temperature where there is none
    ],
)
def test_a_decision_means_one_row_only(load: Load, text: str) -> None:
    dataset = load(measurements=POINTS, corrections=_decision(text))
    assert sum(len(dataset.measurements_of("acetone", q)) for q in QUANTITIES) == 3


def test_a_curve_is_set_aside_by_its_coefficients(load: Load) -> None:
    curves = [
        "acetone,density,polynomial,g/cm3,1.1 -0.001,-20,50,,book",
        "acetone,density,polynomial,g/cm3,1.2 -0.001,-20,50,,own",
    ]
    dataset = load(correlations=curves, corrections=_decision("density,book,,1.10 -1e-3,exclude,"))
    assert [c.source for c in dataset.correlations_of("acetone", "density")] == ["own"]
    assert len(dataset.correlations) == 2


# --- uncertainties, refusal ----------------------------------------------------------------------


def test_customary_uncertainty_is_absolute_plus_relative(load: Load) -> None:
    dataset = load()
    assert dataset.usual_uncertainty("handbook-table", "density", 0.8) == pytest.approx(0.0013)
    assert dataset.usual_uncertainty("laboratory", "density", 0.8) is None
    assert dataset.usual_uncertainty("handbook-table", "viscosity", 0.8) is None


@given(st.lists(st.floats(allow_nan=False, allow_infinity=False), min_size=1, max_size=5))
def test_numbers_are_alike_however_they_are_printed(values: list[float]) -> None:
    plain = " ".join(repr(value) for value in values)
    other = "  ".join(f"{value:.17e}" for value in values)
    assert printed_alike(plain, other)
    assert not printed_alike(plain, f"{other} 1")
    assert printed_alike("as written", "as written")
    assert not printed_alike("1", "one")


def test_a_table_with_an_error_is_refused_with_its_place(load: Load) -> None:
    with pytest.raises(DatasetError) as caught:
        load(measurements=['acetone,density,"0,78",g/cm3,,25,book,,'])
    (problem,) = caught.value.problems
    assert problem.place == "measurements.csv, line 2, column value"
