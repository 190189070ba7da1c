"""Signs of the temperature coefficient: what the data show, and what only a fit does."""

import pytest

from generator import thermal
from generator.metrics import Handbook
from generator.trends import Trend


@pytest.mark.parametrize("acid", ["acetic-acid", "propionic-acid", "butyric-acid"])
def test_associated_acids_rise_and_say_why(handbook: Handbook, acid: str) -> None:
    # Known of carboxylic acids, whose pairs come apart on warming; common practice, no source.
    trend, expected = handbook.trend(acid), handbook.expected_trend(acid)
    assert trend.sign == "rises"
    assert "association" in trend.remark
    assert expected is not None
    assert expected.value < 0  # what is left over is the change of association


@pytest.mark.parametrize("liquid", ["water", "acetone", "methanol", "acetonitrile", "benzene"])
def test_ordinary_liquids_fall_without_a_remark(handbook: Handbook, liquid: str) -> None:
    trend: Trend = handbook.trend(liquid)
    assert trend.sign == "falls"
    assert trend.value < -1.959963984540054 * trend.uncertainty
    assert trend.remark == ""


def test_slope_of_water(handbook: Handbook) -> None:
    # IAPWS R8-97 at 25 °C and 101.325 kPa: −0.3588 K⁻¹ (by differences of PyPI iapws).
    assert handbook.trend("water").value == pytest.approx(-0.3588, rel=0.005)


def test_a_polynomial_that_turns_at_the_end_of_its_range_is_recognised(handbook: Handbook) -> None:
    """Carbon disulfide: the published quadratic bends up just below its upper end of 46 °C."""
    trend = handbook.trend("carbon-disulfide")
    expected = handbook.expected_trend("carbon-disulfide")
    assert "turns at" in trend.remark
    assert trend.sign == "no trend"
    assert expected is not None
    assert abs(trend.value - expected.value) < 1.96 * trend.uncertainty


def test_turning_points() -> None:
    # y = (T − 300)² turns at 300.
    square = (90_000.0, -600.0, 1.0)
    assert thermal.turning_point("polynomial", square, 250.0, 400.0) == pytest.approx(300.0)
    assert thermal.turning_point("polynomial", square, 310.0, 400.0) is None
    assert thermal.turning_point("polynomial", (5.0, -0.01), 250.0, 400.0) is None
    # T³/3 − 290 T² + 84,000 T: at 280 and 300; the outermost of 200…305 is 300.
    cubic = (0.0, 84_000.0, -290.0, 1 / 3)
    assert thermal.turning_point("polynomial", cubic, 200.0, 305.0) == pytest.approx(300.0, abs=0.2)
