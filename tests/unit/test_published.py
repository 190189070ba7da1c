"""Digits of the open tables come back as the handbooks printed them."""

from __future__ import annotations

from decimal import Decimal

import pytest
from hypothesis import given
from hypothesis import strategies as st

from generator import published
from generator.published import Printed


@pytest.mark.parametrize(
    ("kelvin", "expected"),
    [
        ("329.23", Printed("56.08", "degC")),  # acetone, CRC Handbook 95th ed.: 56.08 °C
        ("337.65", Printed("64.5", "degC")),  # methanol, same table: 64.5 °C
        ("253.15", Printed("-20", "degC")),
        ("177.59444", Printed("-140", "degF")),
        ("178.7", Printed("178.7", "K")),
        ("373.124", Printed("100.0", "degC")),
        ("273.15", Printed("0", "degC")),
        ("515.18322", Printed("242.0", "degC")),
    ],
)
def test_fixed_points_return_to_the_scale_they_were_printed_in(
    kelvin: str, expected: Printed
) -> None:
    assert published.fixed_point(kelvin) == expected


@given(st.integers(-1500, 4000))
def test_tenth_degrees_survive_the_way_through_kelvin(tenths: int) -> None:
    celsius = Decimal(tenths) / 10
    back = published.fixed_point(str(celsius + Decimal("273.15")))
    assert back.unit == "degC"
    assert Decimal(back.value) == celsius


@pytest.mark.parametrize(
    ("kelvin", "celsius"),
    [("293.2", "20"), ("298.2", "25"), ("293", "20"), ("273.2", "0"), ("296.35", "23.2"),
     ("301.5", "28.35"), ("298.15", "25"), ("237.6", "-35.55")],
)  # fmt: skip
def test_temperatures_of_measurement_are_the_ones_meant(kelvin: str, celsius: str) -> None:
    assert published.temperature_c(kelvin) == celsius


@pytest.mark.parametrize(
    ("run_together", "first"),
    [
        ("0.784525", ("0.7845", 25)),  # acetone, CRC Handbook 95th ed.: 0.7845 at 25 °C
        ("0.79142", ("0.7914", 20)),  # methanol: 0.7914 at 20 °C
        ("1.44902", ("1.4490", 20)),  # cis-1,2-dichloroethylene: 1.4490 at 20 °C
        ("0.88025", ("0.880", 25)),  # hexyl methacrylate: 0.880 at 25 °C
        ("1.272318", ("1.2723", 18)),  # sulfolane: 1.2723 at 18 °C
        ("1.247555", ("1.2475", 55)),  # 1,4-dichlorobenzene, a melt: 1.2475 at 55 °C
    ],
)
def test_superscript_temperatures_are_taken_out_of_the_digits(
    run_together: str, first: tuple[str, int]
) -> None:
    assert next(published.split_superscript(run_together)) == first


def test_nothing_is_read_from_digits_without_a_superscript() -> None:
    assert list(published.split_superscript("0.8")) == []
    assert list(published.split_superscript("2")) == []


def test_no_exponent_and_no_negative_zero() -> None:
    assert published.plain(Decimal("1E+2")) == "100"
    assert published.fixed(Decimal("-0.004"), 1) == "0.0"
