"""Propagation, combination of sources and shown digits."""

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from generator import polarity, uncertainty


def test_scores_are_standard_normal_and_independent() -> None:
    first, second = uncertainty.scores(0), uncertainty.scores(1)
    for scores in (first, second):
        assert float(np.mean(scores)) == pytest.approx(0, abs=1e-12)
        assert float(np.mean(scores**2)) == pytest.approx(1, rel=1e-12)
    assert float(np.mean(first * second)) == pytest.approx(0, abs=1e-12)
    assert np.array_equal(first, uncertainty.scores(0))


def test_gum_end_gauge_expansion_shape() -> None:
    """JCGM 100:2008, H.1: a product of independent inputs, against its analytic propagation."""
    a = uncertainty.draw(11.5e-6, 1.2e-6, 0, -1, 1)
    b = uncertainty.draw(-0.1, 0.41, 1, -10, 10)
    found = float(uncertainty.spread(a * b))
    exact = np.sqrt((1.2e-6 * 0.1) ** 2 + (11.5e-6 * 0.41) ** 2 + (1.2e-6 * 0.41) ** 2)
    assert found == pytest.approx(exact, rel=0.06)


def test_gum_end_gauge() -> None:
    """JCGM 100:2008, H.1: length of an end gauge by comparison with a standard.

    l = l_s + d − l_s (δα θ + α_s δθ), lengths in nm. Published: u_c(l) = 32 nm to first order
    (H.1.4), 34 nm with the terms of second order (H.1.7).
    """
    standard = uncertainty.draw(50_000_623.0, 25.0, 0, 0, 1e9)
    difference = uncertainty.draw(215.0, 9.7, 1, -1e4, 1e4)
    expansion = uncertainty.draw(11.5e-6, 1.2e-6, 2, 0, 1)
    deviation = uncertainty.draw(-0.1, 0.41, 3, -10, 10)
    other_expansion = uncertainty.draw(0.0, 0.58e-6, 4, -1, 1)
    other_temperature = uncertainty.draw(0.0, 0.029, 5, -10, 10)
    length = (
        standard
        + difference
        - standard * (other_expansion * deviation + expansion * other_temperature)
    )
    assert float(np.mean(length)) == pytest.approx(50_000_838, abs=2)
    assert 32 - 1 <= float(uncertainty.spread(length)) <= 34 + 1


def test_gum_supplement_additive_model() -> None:
    """JCGM 101:2008, 9.2.2: the sum of four standard normal inputs has u = 2.0."""
    total = sum(uncertainty.draw(0.0, 1.0, i, -100, 100) for i in range(4))
    assert float(uncertainty.spread(np.asarray(total))) == pytest.approx(2.0, rel=0.05)


def test_gum_supplement_comparison_loss_at_zero() -> None:
    """JCGM 101:2008, 9.4.2: δY = X₁² + X₂² at zero estimates, where the linear law gives u = 0.

    With u(X) = 0.005 the published Monte Carlo has mean 50e-6 and 95 % of the values below
    150e-6; here the central 68.27 % interval of that (exponential) distribution, whose half
    width is 50e-6 (ln 0.8413 − ln 0.1587)/2.
    """
    first, second = (uncertainty.draw(0.0, 0.005, i, -1, 1) for i in (0, 1))
    loss = first**2 + second**2
    assert float(np.mean(loss)) == pytest.approx(50e-6, rel=0.02)
    assert float(np.mean(loss < 150e-6)) == pytest.approx(0.95, abs=0.01)
    half = 50e-6 * (np.log(0.8413447) - np.log(0.1586553)) / 2
    assert float(uncertainty.spread(loss)) == pytest.approx(half, rel=0.06)


def test_intervals_cover_what_they_promise() -> None:
    """On invented liquids, value ± 1.96 u holds the known truth 93 to 97 times in 100."""
    chance = np.random.Generator(np.random.PCG64(11))
    count = 4000
    eps = chance.uniform(2.0, 60.0, count)
    n = chance.uniform(1.33, 1.60, count)
    volume = chance.uniform(50.0, 150.0, count)
    moment = chance.uniform(1.0, 4.0, count)
    spreads = [0.01 * eps, np.full(count, 0.001), 0.002 * volume, 0.03 * moment]

    def metrics(e, i, v, m):  # type: ignore[no-untyped-def]
        total = polarity.molar_polarization(e, v)
        onsager = polarity.onsager_dipole_moment(e, i, v, 298.15)
        return {
            "f": polarity.kirkwood_function(e),
            "P": total,
            "Δf": polarity.lippert_mataga_polarizability(e, i),
            "μ_O": onsager,
            "g": polarity.kirkwood_correlation_factor(onsager, m),
        }

    truth = metrics(eps, n, volume, moment)
    measured = [
        true + spread * chance.standard_normal(count)
        for true, spread in zip((eps, n, volume, moment), spreads, strict=True)
    ]
    drawn = [
        uncertainty.draw(x, u, k, 0.0, 1e4)
        for k, (x, u) in enumerate(zip(measured, spreads, strict=True))
    ]
    sampled = metrics(*drawn)
    for key, value in metrics(*measured).items():
        usable = np.isfinite(value) & np.isfinite(truth[key]) & (truth["μ_O"] > 0.5)
        own = uncertainty.spread(sampled[key])
        inside = np.abs(value - truth[key]) <= 1.959964 * own
        assert 0.93 <= float(np.mean(inside[usable])) <= 0.97, key


def test_a_quotient_by_nearly_nothing_stays_finite() -> None:
    """Some samples of the denominator are zero; they are left out, the rest gives the interval."""
    moment = uncertainty.draw(0.25, 0.1, 0, 0.0, 15.0)
    assert np.any(moment == 0)
    with np.errstate(divide="ignore", invalid="ignore"):
        factor = np.where(moment > 0, (0.3 / moment) ** 2, np.nan)
    own = float(uncertainty.spread(factor))
    assert 0.5 < own < 5
    assert np.isnan(uncertainty.spread(np.full(512, np.nan)))
    mostly = np.where(np.arange(512) < 200, 1.0, np.nan)
    assert np.isnan(uncertainty.spread(mostly))


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


def test_birge_ratio_of_the_gravitational_constant() -> None:
    """Mohr, Taylor, Newell, Rev. Mod. Phys. 84, 1527 (2012), table XVII and section on G.

    Eleven values of G [1e-11 m³ kg⁻¹ s⁻²] with their uncertainties (typed from memory);
    published: weighted mean 6.673 85, χ² = 209.6 for ν = 10, Birge ratio 4.58.
    """
    values = [
        (6.67248, 0.00043), (6.6729, 0.0005), (6.67398, 0.0007), (6.674255, 0.000092),
        (6.67559, 0.00027), (6.67422, 0.00098), (6.67387, 0.00027), (6.67222, 0.00087),
        (6.67425, 0.00012), (6.67349, 0.00018), (6.67234, 0.00014),
    ]  # fmt: skip
    mean, own, birge = uncertainty.weighted_mean(*zip(*values, strict=True))
    assert mean == pytest.approx(6.67385, abs=0.00005)
    assert 10 * birge**2 == pytest.approx(209.6, rel=0.002)
    assert birge == pytest.approx(4.58, abs=0.005)
    alone = 1 / np.sqrt(sum(u**-2 for _, u in values))
    assert own == pytest.approx(4.58 * alone, rel=0.002)


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
