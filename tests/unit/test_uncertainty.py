"""Propagation, combination of sources and shown digits."""

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from generator import uncertainty


def test_scores_are_standard_normal_and_independent() -> None:
    first, second = uncertainty.scores(0), uncertainty.scores(1)
    for scores in (first, second):
        assert float(np.mean(scores)) == pytest.approx(0, abs=1e-12)
        assert float(np.mean(scores**2)) == pytest.approx(1, rel=1e-12)
    assert abs(float(np.mean(first * second))) < 0.1
    assert np.array_equal(first, uncertainty.scores(0))


def test_gum_end_gauge_expansion_shape() -> None:
    """JCGM 100:2008, H.1: a product of independent inputs, against its analytic propagation."""
    a = uncertainty.draw(11.5e-6, 1.2e-6, 0, -1, 1)
    b = uncertainty.draw(-0.1, 0.41, 1, -10, 10)
    found = float(uncertainty.spread(a * b))
    exact = np.sqrt((1.2e-6 * 0.1) ** 2 + (11.5e-6 * 0.41) ** 2 + (1.2e-6 * 0.41) ** 2)
    assert found == pytest.approx(exact, rel=0.06)


def test_near_zero_a_square_root_stays_finite() -> None:
    """An orientation polarization of 1 ± 2 must not give a moment of ±∞ or NaN."""
    samples = uncertainty.draw(1.0, 2.0, 0, -100, 2000)
    spread = float(uncertainty.spread(np.sqrt(np.maximum(samples, 0))))
    assert 0.3 < spread < 1.5


def test_weighted_mean_of_two_measurements() -> None:
    # JCGM 100:2008, annex F.1: weights go with 1/u².
    mean, own, birge = uncertainty.weighted_mean([10.0, 10.4], [0.1, 0.2])
    assert mean == pytest.approx(10.08)
    assert birge == pytest.approx(0.4 / np.sqrt(0.05), rel=1e-9)
    assert own == pytest.approx(np.sqrt(1 / 125) * birge)


@pytest.mark.parametrize(
    ("value", "spread", "decimals", "shown"),
    [
        (78.36, 0.05, 2, "78.360 ± 0.050"),
        (123.4, 12, 2, "123 ± 12"),
        (1234.5, 130, 2, "1230 ± 130"),
        (-0.36, 0.004, 4, "\u22120.3600 ± 0.0040"),
        (5.5e-6, 1e-6, 12, "(5.5 ± 1.0)×10⁻⁶"),
        (9.996, 0.0995, 2, "10.00 ± 0.10"),
        (36.2, 0.0, 1, "36.2"),
        (float("nan"), 1.0, 1, ""),
        (-0.001, 0.0, 2, "\u22121.0×10⁻³"),
    ],
)
def test_shown_digits_fit_the_uncertainty(
    value: float, spread: float, decimals: int, shown: str
) -> None:
    assert uncertainty.format_value(value, spread, decimals) == shown


@given(st.floats(0.01, 1e6), st.floats(1e-6, 1e3), st.integers(0, 5))
def test_shown_value_is_within_its_last_digit(value: float, spread: float, decimals: int) -> None:
    text = uncertainty.format_value(value, spread, decimals)
    shown, _, own = text.replace("\u2212", "-").partition(" ± ")
    assert float(own) > 0
    places = len(own.partition(".")[2])
    step = 10.0**-places if places else 10.0 ** (len(own) - len(own.rstrip("0")))
    assert abs(float(shown) - value) <= step * 0.5001 + 1e-9
