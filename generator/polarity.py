"""Polarity of liquids as pure functions of arrays.

Every function takes scalars or arrays of any one broadcastable shape and returns an array (or a
scalar) of that shape. Outside the domain the result is NaN, never an exception: a handbook has
gaps, and one gap must not stop the rest.
"""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike, NDArray

from generator.units import (
    AVOGADRO,
    BOLTZMANN,
    DEBYE,
    ELEMENTARY_CHARGE,
    VACUUM_PERMITTIVITY,
)

Array = NDArray[np.float64]

# Atomic polarization as a share of the electronic one: a stated, customary assumption.
ATOMIC_SHARE = 0.05
BORN_RADIUS = 0.2e-9  # m, fixed for comparing liquids
_CM3 = 1e-6  # m³
_NM = 1e9  # nm in a metre


def _array(value: ArrayLike) -> Array:
    return np.asarray(value, dtype=np.float64)


def _where(valid: NDArray[np.bool_], value: Array) -> Array:
    return np.where(valid, value, np.nan)


@np.errstate(all="ignore")
def kirkwood_function(permittivity: ArrayLike) -> Array:
    """(ε − 1)/(2ε + 1) [1], between 0 and 0.5; NaN below ε = 1.

    ``permittivity`` [1]. Kirkwood, J. Chem. Phys. 2, 351 (1934); Onsager (1936).
    """
    eps = _array(permittivity)
    return _where(eps >= 1, (eps - 1) / (2 * eps + 1))


@np.errstate(all="ignore")
def clausius_mossotti_function(permittivity: ArrayLike) -> Array:
    """(ε − 1)/(ε + 2) [1], between 0 and 1; NaN below ε = 1.

    ``permittivity`` [1]. Clausius (1879), Mossotti (1850).
    """
    eps = _array(permittivity)
    return _where(eps >= 1, (eps - 1) / (eps + 2))


@np.errstate(all="ignore")
def molar_volume(molar_mass: ArrayLike, density: ArrayLike) -> Array:
    """M/ρ [cm3/mol]; NaN where the density is not positive.

    ``molar_mass`` [g/mol], ``density`` [g/cm3].
    """
    rho = _array(density)
    return _where(rho > 0, _array(molar_mass) / rho)


@np.errstate(all="ignore")
def molar_polarization(permittivity: ArrayLike, volume: ArrayLike) -> Array:
    """V (ε − 1)/(ε + 2) [cm3/mol]; NaN below ε = 1.

    ``permittivity`` [1], ``volume`` [cm3/mol]. Clausius (1879), Mossotti (1850).
    """
    return clausius_mossotti_function(permittivity) * _array(volume)


@np.errstate(all="ignore")
def molar_refraction(refractive_index: ArrayLike, volume: ArrayLike) -> Array:
    """V (n² − 1)/(n² + 2) [cm3/mol]; NaN below n = 1.

    ``refractive_index`` [1], ``volume`` [cm3/mol]. Lorentz (1880), Lorenz (1880).
    """
    n = _array(refractive_index)
    return _where(n >= 1, clausius_mossotti_function(n * n) * _array(volume))


@np.errstate(all="ignore")
def refractive_index_from_refraction(refraction: ArrayLike, volume: ArrayLike) -> Array:
    """Refractive index [1] of a liquid of molar refraction R at molar volume V; NaN where R ≥ V.

    ``refraction`` [cm3/mol], ``volume`` [cm3/mol]. Inverse of the Lorentz–Lorenz equation.
    """
    share = _array(refraction) / _array(volume)
    return _where((share >= 0) & (share < 1), np.sqrt((1 + 2 * share) / (1 - share)))


@np.errstate(all="ignore")
def orientation_polarization(polarization: ArrayLike, refraction: ArrayLike) -> Array:
    """P − 1.05 R [cm3/mol]; the atomic polarization is taken as 5 % of R.

    ``polarization`` [cm3/mol], ``refraction`` [cm3/mol]. Debye, Phys. Z. 13, 97 (1912).
    """
    return _array(polarization) - (1 + ATOMIC_SHARE) * _array(refraction)


@np.errstate(all="ignore")
def debye_dipole_moment(orientation: ArrayLike, temperature: ArrayLike) -> Array:
    """Apparent dipole moment [D] of a liquid treated as a gas of dipoles; 0 where P_or < 0.

    ``orientation`` [cm3/mol], ``temperature`` [K]. Debye, Phys. Z. 13, 97 (1912).
    """
    positive = np.maximum(_array(orientation), 0.0) * _CM3
    square = 9 * VACUUM_PERMITTIVITY * BOLTZMANN * _array(temperature) * positive / AVOGADRO
    return np.sqrt(square) / DEBYE


@np.errstate(all="ignore")
def _dipolar_term(permittivity: Array, infinite: Array) -> Array:
    """(ε − ε∞)(2ε + ε∞)/(ε(ε∞ + 2)²) of the Onsager and Kirkwood–Fröhlich equations."""
    return (
        (permittivity - infinite)
        * (2 * permittivity + infinite)
        / (permittivity * (infinite + 2) ** 2)
    )


@np.errstate(all="ignore")
def infinite_permittivity(refractive_index: ArrayLike) -> Array:
    """ε∞ = 1.05 n² [1]: the response of electrons and atoms, without turning molecules.

    ``refractive_index`` [1].
    """
    return (1 + ATOMIC_SHARE) * _array(refractive_index) ** 2


@np.errstate(all="ignore")
def onsager_dipole_moment(
    permittivity: ArrayLike, refractive_index: ArrayLike, volume: ArrayLike, temperature: ArrayLike
) -> Array:
    """Dipole moment [D] that explains ε when neighbours turn independently; 0 where ε ≤ 1.05 n².

    ``permittivity`` [1], ``refractive_index`` [1], ``volume`` [cm3/mol], ``temperature`` [K].
    Onsager, J. Am. Chem. Soc. 58, 1486 (1936).
    """
    term = _dipolar_term(_array(permittivity), infinite_permittivity(refractive_index))
    scale = 9 * VACUUM_PERMITTIVITY * BOLTZMANN * _array(temperature) * _array(volume) * _CM3
    return np.sqrt(np.maximum(term, 0.0) * scale / AVOGADRO) / DEBYE


@np.errstate(all="ignore")
def onsager_permittivity(
    dipole_moment: ArrayLike, refractive_index: ArrayLike, volume: ArrayLike, temperature: ArrayLike
) -> Array:
    """Permittivity [1] that the Onsager equation expects; the inverse of the moment.

    ``dipole_moment`` [D], ``refractive_index`` [1], ``volume`` [cm3/mol], ``temperature`` [K].
    Onsager, J. Am. Chem. Soc. 58, 1486 (1936).
    """
    infinite = infinite_permittivity(refractive_index)
    moment = _array(dipole_moment) * DEBYE
    drive = (
        AVOGADRO
        * moment**2
        * (infinite + 2) ** 2
        / (9 * VACUUM_PERMITTIVITY * BOLTZMANN * _array(temperature) * _array(volume) * _CM3)
    )
    # (ε − ε∞)(2ε + ε∞) = drive · ε, a quadratic equation in ε.
    linear = infinite + drive
    return (linear + np.sqrt(linear**2 + 8 * infinite**2)) / 4


@np.errstate(all="ignore")
def kirkwood_correlation_factor(onsager_moment: ArrayLike, gas_moment: ArrayLike) -> Array:
    """(μ_O/μ)² [1]; NaN where the gas-phase moment is zero.

    ``onsager_moment`` [D], ``gas_moment`` [D]. Kirkwood (1939), Fröhlich (1949).
    """
    gas = _array(gas_moment)
    return _where(gas > 0, (_array(onsager_moment) / gas) ** 2)


@np.errstate(all="ignore")
def lippert_mataga_polarizability(permittivity: ArrayLike, refractive_index: ArrayLike) -> Array:
    """f(ε) − f(n²) [1], the orientation polarizability.

    ``permittivity`` [1], ``refractive_index`` [1]. Lippert (1955); Mataga, Kaifu, Koizumi (1956).
    """
    return kirkwood_function(permittivity) - kirkwood_function(_array(refractive_index) ** 2)


@np.errstate(all="ignore")
def expected_temperature_coefficient(
    permittivity: ArrayLike,
    refractive_index: ArrayLike,
    expansivity: ArrayLike,
    temperature: ArrayLike,
) -> Array:
    """dε/dT [1/K] from thermal expansion and agitation alone, at constant g μ².

    ``permittivity`` [1], ``refractive_index`` [1], ``expansivity`` [1/K], ``temperature`` [K].

    With F(ε, ε∞) = (ε − ε∞)(2ε + ε∞)/(ε(ε∞ + 2)²) the Kirkwood–Fröhlich equation reads
    F = N_A g μ²/(9 ε₀ k T V), hence dF/dT = −F (1/T + α), while ε∞ = 1.05 n² falls by the
    Clausius–Mossotti law of n²: dn²/dT = −α (n² − 1)(n² + 2)/3. Fröhlich, Theory of Dielectrics
    (1949), differentiated here.
    """
    eps, alpha = _array(permittivity), _array(expansivity)
    square = _array(refractive_index) ** 2
    inf = (1 + ATOMIC_SHARE) * square
    inf_slope = (1 + ATOMIC_SHARE) * clausius_mossotti_slope(square, alpha)
    term = _dipolar_term(eps, inf)
    by_eps = (2 * eps**2 + inf**2) / (eps**2 * (inf + 2) ** 2)
    by_inf = -(eps + 2 * inf) / (eps * (inf + 2) ** 2) - 2 * term / (inf + 2)
    return (-term * (1 / _array(temperature) + alpha) - by_inf * inf_slope) / by_eps


@np.errstate(all="ignore")
def clausius_mossotti_slope(permittivity: ArrayLike, expansivity: ArrayLike) -> Array:
    """−α (ε − 1)(ε + 2)/3 [1/K]: the slope of ε of an unpolar liquid that only expands.

    ``permittivity`` [1], ``expansivity`` [1/K]. The Clausius–Mossotti law differentiated at
    constant molar polarization.
    """
    eps = _array(permittivity)
    return -_array(expansivity) * (eps - 1) * (eps + 2) / 3


@np.errstate(all="ignore")
def bjerrum_length(permittivity: ArrayLike, temperature: ArrayLike) -> Array:
    """e²/(4π ε₀ ε k T) [nm].

    ``permittivity`` [1], ``temperature`` [K]. Bjerrum (1926).
    """
    thermal = 4 * np.pi * VACUUM_PERMITTIVITY * BOLTZMANN * _array(temperature)
    return _NM * ELEMENTARY_CHARGE**2 / (thermal * _array(permittivity))


@np.errstate(all="ignore")
def born_solvation_energy(permittivity: ArrayLike) -> Array:
    """−N_A e²/(8π ε₀ r) (1 − 1/ε) [kJ/mol] for r = 0.2 nm.

    ``permittivity`` [1]. Born, Z. Phys. 1, 45 (1920).
    """
    whole = AVOGADRO * ELEMENTARY_CHARGE**2 / (8 * np.pi * VACUUM_PERMITTIVITY * BORN_RADIUS)
    return -whole / 1000 * (1 - 1 / _array(permittivity))


@np.errstate(all="ignore")
def debye_length(
    permittivity: ArrayLike, temperature: ArrayLike, concentration: ArrayLike
) -> Array:
    """√(ε₀ ε k T/(2 N_A e² c)) [nm] of a 1:1 salt.

    ``permittivity`` [1], ``temperature`` [K], ``concentration`` [mol/dm3].
    Debye and Hückel, Phys. Z. 24, 185 (1923).
    """
    ions = 2 * AVOGADRO * ELEMENTARY_CHARGE**2 * _array(concentration) * 1000
    thermal = VACUUM_PERMITTIVITY * BOLTZMANN * _array(permittivity) * _array(temperature)
    return _NM * np.sqrt(thermal / ions)


@np.errstate(all="ignore")
def charge_relaxation_time(permittivity: ArrayLike, conductivity: ArrayLike) -> Array:
    """ε₀ ε/κ [s]; NaN where the conductivity is not positive.

    ``permittivity`` [1], ``conductivity`` [S/m]. Maxwell (1873).
    """
    kappa = _array(conductivity)
    return _where(kappa > 0, VACUUM_PERMITTIVITY * _array(permittivity) / kappa)
