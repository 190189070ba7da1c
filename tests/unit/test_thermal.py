"""Temperature curves: exact slopes, published points, and the sign of a slope."""

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from generator import thermal

EXAMPLES = {
    "polynomial": (249.21, -0.79069, 0.72997e-3),
    "rackett": (1.2, 0.27, 500.0, 0.29),
    "critical_series": (550.0, 300.0, 600.0, -100.0, 200.0, 30.0),
    "extended_antoine": (73.649, -7258.2, -7.3037, 4.1653e-6, 2.0),
    "antoine": (9.10462, 1265.632, -41.002),
    "wagner": (513.92, 6132000.0, -8.68587, 1.17831, -4.8762, 1.588),
    "vdi_viscosity": (0.69796, 1.14046, 549.921, -44.11, 0.00003565),
}


def test_every_form_has_an_example() -> None:
    assert set(EXAMPLES) == set(thermal.FORMS)


@pytest.mark.parametrize("form", EXAMPLES)
@given(temperature=st.floats(260.0, 420.0))
def test_slope_is_the_derivative(form: str, temperature: float) -> None:
    step = 1e-3
    around = thermal.evaluate(
        form, EXAMPLES[form], np.array([temperature - step, temperature + step])
    )
    numerical = (around[1] - around[0]) / (2 * step)
    exact = float(thermal.derivative(form, EXAMPLES[form], temperature))
    assert exact == pytest.approx(numerical, rel=1e-5, abs=1e-9)


def test_published_points_of_curves() -> None:
    # CRC Handbook of Chemistry and Physics, permittivity of water: 78.36 at 25 °C by its curve's
    # neighbour IAPWS R8-97 (78.41); the curve itself is good to 0.3.
    assert float(thermal.evaluate("polynomial", EXAMPLES["polynomial"], 298.15)) == pytest.approx(
        78.4, abs=0.3
    )
    # Vapour pressures at the normal boiling point are 101.325 kPa: tetrachloromethane 349.8 K
    # (Antoine), ethanol 351.4 K (Wagner), water 373.15 K (extended Antoine; ITS-90 373.124 K).
    for form, boiling in [("antoine", 349.8), ("wagner", 351.4), ("extended_antoine", 373.15)]:
        pressure = float(thermal.evaluate(form, EXAMPLES[form], boiling))
        assert pressure == pytest.approx(101325, rel=0.015)


def test_outside_its_mathematics_a_curve_is_nan() -> None:
    assert np.isnan(thermal.evaluate("rackett", EXAMPLES["rackett"], 600.0))


def test_line_through_exact_points() -> None:
    t = np.array([280.0, 300.0, 320.0])
    line = thermal.fit_line(t, 5 - 0.02 * t, np.full(3, 0.01))
    assert line is not None
    assert line.slope == pytest.approx(-0.02, rel=1e-9)
    assert line.slope_uncertainty == pytest.approx(0.01 / np.sqrt(800), rel=1e-9)
    assert thermal.sign_of(line.slope, line.slope_uncertainty) == "falls"


def test_scatter_beyond_the_stated_uncertainty_widens_the_slope() -> None:
    t = np.array([280.0, 300.0, 320.0, 340.0])
    noisy = np.array([5.0, 5.4, 4.7, 5.1])
    line = thermal.fit_line(t, noisy, np.full(4, 0.01))
    assert line is not None
    assert thermal.sign_of(line.slope, line.slope_uncertainty) == "no trend"


def test_one_temperature_gives_no_line() -> None:
    assert thermal.fit_line([300, 300], [1, 2], [0.1, 0.1]) is None
    assert thermal.sign_of(float("nan"), 0.1) == "not known"
    assert thermal.sign_of(0.3, 0.1) == "rises"
