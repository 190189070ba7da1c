"""The dielectric functions against published values, limits and each other."""

import math

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from generator import polarity

permittivities = st.floats(1.0001, 200)
indices = st.floats(1.2, 1.8)
volumes = st.floats(15, 400)
temperatures = st.floats(150, 500)


# Water, diethyl ether and hexane: Lakowicz, Principles of Fluorescence Spectroscopy, 3rd ed.
# (2006), chapter 6. The others: customary values of the fluorescence literature. All from memory.
@pytest.mark.parametrize(
    ("permittivity", "index", "published", "tolerance"),
    [
        (78.3, 1.33, 0.32, 0.005),
        (4.35, 1.35, 0.17, 0.005),
        (1.89, 1.37, 0.001, 0.001),
        (32.66, 1.3284, 0.309, 0.001),
        (24.55, 1.3614, 0.289, 0.001),
        (35.94, 1.3441, 0.305, 0.001),
        (46.45, 1.4783, 0.263, 0.001),
    ],
)
def test_orientation_polarizability_matches_published(
    permittivity: float, index: float, published: float, tolerance: float
) -> None:
    found = polarity.lippert_mataga_polarizability(permittivity, index)
    assert float(found) == pytest.approx(published, abs=tolerance)


# Molar refractions of benzene and tetrachloromethane at 20 °C (sodium D), from n and ρ:
# 26.2 and 26.4 cm³/mol, Vogel, J. Chem. Soc. 1948, 1833 (from memory).
@pytest.mark.parametrize(
    ("mass", "density", "index", "published"),
    [(78.114, 0.8790, 1.5011, 26.18), (153.823, 1.5940, 1.4601, 26.45)],
)
def test_molar_refraction_matches_published(
    mass: float, density: float, index: float, published: float
) -> None:
    volume = polarity.molar_volume(mass, density)
    assert float(polarity.molar_refraction(index, volume)) == pytest.approx(published, abs=0.08)


def test_kirkwood_factor_of_water_and_alcohols_matches_published() -> None:
    # Oster and Kirkwood, J. Chem. Phys. 11, 175 (1943), from memory: methanol 2.94, ethanol 3.04;
    # water 2.6 to 2.8 (Hasted, Aqueous Dielectrics, 1973, from memory). They differ from ours by
    # their choice of the permittivity at infinite frequency, some 10 %.
    for eps, n, mass, density, gas, published in [
        (32.66, 1.3265, 32.042, 0.7866, 1.70, 2.94),
        (24.55, 1.3594, 46.068, 0.7850, 1.69, 3.04),
        (78.36, 1.3325, 18.015, 0.99705, 1.855, 2.7),
    ]:
        moment = polarity.onsager_dipole_moment(eps, n, mass / density, 298.15)
        g = float(polarity.kirkwood_correlation_factor(moment, gas))
        assert g == pytest.approx(published, rel=0.10)


def test_lengths_in_water_match_textbooks() -> None:
    # Israelachvili, Intermolecular and Surface Forces, 3rd ed. (2011): 0.304/√c nm and 0.71 nm
    # at 25 °C (from memory).
    assert float(polarity.debye_length(78.36, 298.15, 0.01)) == pytest.approx(3.04, abs=0.02)
    assert float(polarity.debye_length(78.36, 298.15, 0.1)) == pytest.approx(0.961, abs=0.004)
    assert float(polarity.bjerrum_length(78.36, 298.15)) == pytest.approx(0.714, abs=0.003)


def test_born_energy_uses_the_customary_constant() -> None:
    # 69.47 kJ nm/mol is N_A e²/(8π ε₀), Marcus, Ion Solvation (1985), from memory.
    whole = float(polarity.born_solvation_energy(np.inf))
    assert whole == pytest.approx(-69.47 / 0.2, rel=2e-4)


def test_debye_moment_of_a_dilute_gas_is_the_molecules_own() -> None:
    # Chloromethane vapour: P(T) of a gas with μ = 1.87 D at 300 K, by the Debye equation itself
    # worked out in cgs: 4π N_A μ²/(9 k T) with μ in statC cm.
    avogadro, boltzmann = 6.02214076e23, 1.380649e-16
    orientation = 4 * math.pi * avogadro * (1.87e-18) ** 2 / (9 * boltzmann * 300)
    assert float(polarity.debye_dipole_moment(orientation, 300)) == pytest.approx(1.87, rel=1e-9)


def test_charge_relaxation_time_of_hexane_and_water() -> None:
    # Of the order of seconds to minutes for a poor conductor, microseconds for pure water
    # (5.5e-6 S/m): τ = ε₀ε/κ, common practice in IEC TS 60079-32-1 (18 s for 1 pS/m, ε = 2).
    assert float(polarity.charge_relaxation_time(2.0, 1e-12)) == pytest.approx(17.7, rel=0.01)
    assert float(polarity.charge_relaxation_time(78.4, 5.5e-6)) == pytest.approx(1.26e-4, rel=0.01)


def test_limits() -> None:
    assert float(polarity.kirkwood_function(1.0)) == 0.0
    assert float(polarity.kirkwood_function(1e12)) == pytest.approx(0.5)
    assert float(polarity.clausius_mossotti_function(1e12)) == pytest.approx(1.0)
    assert float(polarity.born_solvation_energy(1.0)) == 0.0
    assert math.isnan(float(polarity.kirkwood_function(0.9)))
    assert math.isnan(float(polarity.molar_volume(18.0, 0.0)))
    assert math.isnan(float(polarity.kirkwood_correlation_factor(1.0, 0.0)))
    assert float(polarity.onsager_dipole_moment(2.0, 1.5, 90, 298)) == 0.0
    assert float(polarity.debye_dipole_moment(-0.1, 298)) == 0.0


@given(permittivities, indices, volumes, temperatures)
def test_onsager_moment_and_permittivity_are_inverse(
    eps: float, n: float, volume: float, temperature: float
) -> None:
    moment = float(polarity.onsager_dipole_moment(eps, n, volume, temperature))
    back = float(polarity.onsager_permittivity(moment, n, volume, temperature))
    assert back == pytest.approx(max(eps, 1.05 * n * n), rel=1e-9)


@given(st.floats(1.05, 1.7), volumes)
def test_refraction_and_index_are_inverse(n: float, volume: float) -> None:
    refraction = polarity.molar_refraction(n, volume)
    back = float(polarity.refractive_index_from_refraction(refraction, volume))
    assert back == pytest.approx(n, rel=1e-12)


@given(st.floats(0.1, 6), st.floats(1.3, 1.6), st.floats(40, 200), st.floats(250, 400),
       st.floats(5e-4, 2e-3))  # fmt: skip
def test_expected_coefficient_is_the_slope_of_the_onsager_equation(
    moment: float, n: float, volume: float, temperature: float, expansivity: float
) -> None:
    """Against a numerical derivative in which volume and refraction follow the temperature."""
    refraction = float(polarity.molar_refraction(n, volume))

    def permittivity(t: float) -> float:
        grown = volume * math.exp(expansivity * (t - temperature))
        index = polarity.refractive_index_from_refraction(refraction, grown)
        return float(polarity.onsager_permittivity(moment, index, grown, t))

    step = 0.01
    numerical = (permittivity(temperature + step) - permittivity(temperature - step)) / (2 * step)
    eps = permittivity(temperature)
    found = float(polarity.expected_temperature_coefficient(eps, n, expansivity, temperature))
    assert found == pytest.approx(numerical, rel=1e-5, abs=1e-9)


@given(permittivities, st.floats(1e-4, 2e-3))
def test_unpolar_slope_keeps_the_molar_polarization(eps: float, expansivity: float) -> None:
    step = 1e-3
    slope = float(polarity.clausius_mossotti_slope(eps, expansivity))
    before = float(polarity.clausius_mossotti_function(eps))
    after = float(polarity.clausius_mossotti_function(max(1.0, eps + slope * step)))
    if eps + slope * step > 1.0:
        assert after * (1 + expansivity * step) == pytest.approx(before, rel=1e-4, abs=1e-9)


def test_arrays_equal_scalars() -> None:
    eps = np.array([[2.0, 10.0], [40.0, 80.0]])
    t = np.array([280.0, 300.0])
    whole = polarity.bjerrum_length(eps, t)
    assert whole.shape == (2, 2)
    for i in range(2):
        for j in range(2):
            assert whole[i, j] == float(polarity.bjerrum_length(eps[i, j], t[j]))
