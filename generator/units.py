"""Physical constants with their authority, and conversion between units of one dimension.

The units that nearly all tables use are known here with their exact factors. Pint reads every
other spelling; it is imported only when one is met, because its import takes a third of a second.
"""

from __future__ import annotations

import re
from fractions import Fraction
from functools import lru_cache
from typing import TYPE_CHECKING, Any

if TYPE_CHECKING:
    import pint

# Exact by the definition of the SI (BIPM, SI Brochure, 9th edition, 2019).
AVOGADRO = 6.02214076e23  # mol⁻¹
BOLTZMANN = 1.380649e-23  # J K⁻¹
ELEMENTARY_CHARGE = 1.602176634e-19  # C
SPEED_OF_LIGHT = 299_792_458.0  # m s⁻¹
ZERO_CELSIUS = 273.15  # K, exact: definition of the Celsius temperature
# CODATA 2022 recommended value (NIST SP 961, 2024); relative standard uncertainty 1.6e-10.
VACUUM_PERMITTIVITY = 8.8541878188e-12  # F m⁻¹
# 1 D = 1e-18 statC cm = 1e-21 C m² s⁻¹ / c, by definition of the debye.
DEBYE = 1e-21 / SPEED_OF_LIGHT  # C m

# Spellings met in tables → spellings Pint reads.
_SPELLINGS = {
    "": "dimensionless",
    "1": "dimensionless",
    "°C": "degC",
    "° C": "degC",
    "℃": "degC",
    "C": "degC",
    "°F": "degF",
    "F": "degF",
    "D": "debye",
    "Debye": "debye",
    "C m": "coulomb*meter",
    "C.m": "coulomb*meter",
    "C·m": "coulomb*meter",
    "C*m": "coulomb*meter",
    "Pa s": "pascal*second",
    "mPa s": "millipascal*second",
    "cP": "centipoise",
    "mmHg": "mmHg",
    "Torr": "torr",
    "%": "percent",
}
# Spelling Pint reads → dimension, and the exact slope and offset that lead to the first unit of it.
_EXACT = {
    "dimensionless": ("number", Fraction(1), Fraction(0)),
    "debye": ("dipole moment", Fraction(1), Fraction(0)),
    "K": ("temperature", Fraction(1), Fraction(0)),
    "degC": ("temperature", Fraction(1), Fraction("273.15")),
    "degF": ("temperature", Fraction(5, 9), Fraction("459.67") * Fraction(5, 9)),
    "kg/m**3": ("density", Fraction(1), Fraction(0)),
    "g/cm**3": ("density", Fraction(1000), Fraction(0)),
    "S/m": ("conductivity", Fraction(1), Fraction(0)),
    "pascal*second": ("viscosity", Fraction(1), Fraction(0)),
    "millipascal*second": ("viscosity", Fraction(1, 1000), Fraction(0)),
    "Pa": ("pressure", Fraction(1), Fraction(0)),
    "kPa": ("pressure", Fraction(1000), Fraction(0)),
}
_POWER = re.compile(r"(?<=[A-Za-zµμ])(-?\d+)")
_SUPERSCRIPTS = str.maketrans("⁰¹²³⁴⁵⁶⁷⁸⁹⁻", "0123456789-")


@lru_cache(maxsize=1)
def _registry() -> pint.UnitRegistry[Any]:
    import pint

    return pint.UnitRegistry(autoconvert_offset_to_baseunit=True, on_redefinition="ignore")


def _spelling(unit: str) -> str:
    text = " ".join(unit.split())
    if text in _SPELLINGS:
        return _SPELLINGS[text]
    text = text.translate(_SUPERSCRIPTS).replace("\u2212", "-").replace("μ", "µ")
    text = _POWER.sub(r"**\1", text.replace("^", "").replace("**", ""))
    return re.sub(r"\s*[·⋅]\s*|\s+(?![/*])(?<![/*] )", "*", text)


@lru_cache(maxsize=512)
def _parsed(unit: str) -> pint.Unit | None:
    try:
        parsed: pint.Unit = _registry().Unit(_spelling(unit))
    except Exception:  # Pint raises many kinds for unreadable text; all mean "no such unit"
        return None
    return parsed


def is_known(unit: str) -> bool:
    """Whether ``unit`` can be read as a unit."""
    return _spelling(unit) in _EXACT or _parsed(unit) is not None


@lru_cache(maxsize=512)
def same_dimension(unit: str, to: str) -> bool:
    """Whether both can be read and measure the same kind of thing."""
    one, other = _EXACT.get(_spelling(unit)), _EXACT.get(_spelling(to))
    if one and other:
        return one[0] == other[0]
    left, right = _parsed(unit), _parsed(to)
    return left is not None and right is not None and left.dimensionality == right.dimensionality


@lru_cache(maxsize=4096)
def _line(unit: str, to: str) -> tuple[float, float]:
    """Slope and offset of the straight line that turns ``unit`` into ``to``."""
    one, other = _EXACT.get(_spelling(unit)), _EXACT.get(_spelling(to))
    if one and other and one[0] == other[0]:
        return float(one[1] / other[1]), float((one[2] - other[2]) / other[1])
    left, right = _parsed(unit), _parsed(to)
    if left is None or right is None:
        raise ValueError(f"not a unit: {unit if left is None else to!r}")
    if left.dimensionality != right.dimensionality:
        raise ValueError(f"{unit} does not measure the same thing as {to}")
    quantity = _registry().Quantity
    at_zero = float(quantity(0.0, left).to(right).magnitude)
    at_one = float(quantity(1.0, left).to(right).magnitude)
    slope = at_one if at_zero == 0.0 else at_one - at_zero
    # Factors between units are short decimals; fifteen digits drop the noise of the arithmetic.
    return float(f"{slope:.15g}"), float(f"{at_zero:.15g}")


def convert(value: float, unit: str, to: str) -> float:
    """``value`` [unit] expressed in ``to``; temperatures take their offset with them.

    Raises ``ValueError`` when a unit is unknown or the dimensions differ.
    """
    if unit == to:
        return value
    slope, offset = _line(unit, to)
    return value * slope + offset


def convert_difference(value: float, unit: str, to: str) -> float:
    """A difference or uncertainty ``value`` [unit] expressed in ``to`` (no temperature offset)."""
    if unit == to:
        return value
    return value * _line(unit, to)[0]
