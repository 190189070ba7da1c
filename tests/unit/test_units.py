"""Constants against CODATA, and conversions between units as laboratories type them."""

import subprocess
import sys

import pint
import pytest
import scipy.constants as codata
from hypothesis import given
from hypothesis import strategies as st

from generator import units


@pytest.mark.parametrize(
    ("ours", "name", "relative"),
    [
        (units.AVOGADRO, "Avogadro constant", 0.0),
        (units.BOLTZMANN, "Boltzmann constant", 0.0),
        (units.ELEMENTARY_CHARGE, "elementary charge", 0.0),
        (units.SPEED_OF_LIGHT, "speed of light in vacuum", 0.0),
        (units.VACUUM_PERMITTIVITY, "vacuum electric permittivity", 1e-9),
    ],
)
def test_constants_are_codata(ours: float, name: str, relative: float) -> None:
    """CODATA as carried by scipy.constants."""
    assert ours == pytest.approx(codata.value(name), rel=relative, abs=0)


def test_debye_in_si() -> None:
    # IUPAC Green Book, 3rd ed. (2007): 1 D ≈ 3.335 641 × 10⁻³⁰ C m.
    assert pytest.approx(3.335641e-30, rel=1e-7) == units.DEBYE


@pytest.mark.parametrize(
    ("value", "unit", "to", "expected"),
    [
        (998.2, "kg/m3", "g/cm3", 0.9982),
        (0.7857, "g cm-3", "g/cm3", 0.7857),
        (0.7857, "g·cm⁻³", "g/cm3", 0.7857),
        (785.7, "kg m^-3", "g/cm3", 0.7857),
        (0.7857, "g/mL", "g/cm3", 0.7857),
        (3.33564095e-30, "C m", "D", 1.0),
        (300.0, "K", "degC", 26.85),
        (212.0, "°F", "degC", 100.0),
        (5.5, "µS/m", "S/m", 5.5e-6),
        (5.5, "μS/m", "S/m", 5.5e-6),
        (0.055, "uS/cm", "S/m", 5.5e-6),
        (1.0, "cP", "mPa s", 1.0),
        (1e-3, "Pa·s", "mPa s", 1.0),
        (760.0, "mmHg", "kPa", 101.325),
        (1.0, "atm", "kPa", 101.325),
        (80.1, "", "1", 80.1),
    ],
)
def test_units_as_typed(value: float, unit: str, to: str, expected: float) -> None:
    assert units.convert(value, unit, to) == pytest.approx(expected, rel=1e-6)


def test_a_difference_has_no_offset() -> None:
    assert units.convert_difference(1.8, "degF", "degC") == pytest.approx(1.0)
    assert units.convert_difference(2.0, "K", "degC") == pytest.approx(2.0)


def test_wrong_dimension_and_nonsense_are_told_apart() -> None:
    assert units.is_known("S/m")
    assert not units.is_known("furlong/quux")
    assert not units.same_dimension("S/m", "g/cm3")
    with pytest.raises(ValueError, match="same thing"):
        units.convert(1.0, "S/m", "g/cm3")
    with pytest.raises(ValueError, match="not a unit"):
        units.convert(1.0, "quux", "g/cm3")


# Unit as tables spell it → as Pint spells it.
COMMON = {
    "1": "dimensionless",
    "D": "debye",
    "K": "kelvin",
    "degC": "degree_Celsius",
    "degF": "degree_Fahrenheit",
    "kg/m3": "kilogram/meter**3",
    "g/cm3": "gram/centimeter**3",
    "S/m": "siemens/meter",
    "Pa s": "pascal*second",
    "mPa s": "millipascal*second",
    "Pa": "pascal",
    "kPa": "kilopascal",
}
PINT: pint.UnitRegistry[float] = pint.UnitRegistry(autoconvert_offset_to_baseunit=True)


@pytest.mark.parametrize("to", COMMON)
@pytest.mark.parametrize("unit", COMMON)
def test_exact_factors_are_those_of_pint(unit: str, to: str) -> None:
    one, other = PINT.Unit(COMMON[unit]), PINT.Unit(COMMON[to])
    same = one.dimensionality == other.dimensionality
    assert units.same_dimension(unit, to) == same
    if same:
        theirs = PINT.Quantity(7.0, one).to(other).magnitude
        assert units.convert(7.0, unit, to) == pytest.approx(theirs, rel=1e-14, abs=1e-12)


def test_common_units_need_no_pint() -> None:
    code = (
        "import sys; from generator import units; "
        f"known = [units.is_known(unit) for unit in {list(COMMON)}]; "
        "assert all(known); assert units.convert(500.0, 'kg/m3', 'g/cm3') == 0.5; "
        "assert units.convert(68.0, 'degF', '°C') == 20.0; "
        "assert 'pint' not in sys.modules"
    )
    subprocess.run([sys.executable, "-c", code], check=True)


@given(st.floats(1e-6, 1e6))
def test_there_and_back(value: float) -> None:
    there = units.convert(value, "kg/m3", "g/cm3")
    assert units.convert(there, "g/cm3", "kg/m3") == pytest.approx(value, rel=1e-12)
