"""Temperature curves, their slopes, and the sign of a slope with its significance."""

from __future__ import annotations

from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass
from types import MappingProxyType

import numpy as np
from numpy.typing import ArrayLike, NDArray

Array = NDArray[np.float64]
_Function = Callable[[Sequence[float], Array], Array]


@dataclass(frozen=True, slots=True)
class Form:
    """A published form of temperature curve: y(T), T in kelvin, y in the curve's own unit."""

    name: str
    coefficients: tuple[str, ...]
    fewest: int
    formula: str
    source: str
    value: _Function
    slope: _Function


def _polynomial(c: Sequence[float], t: Array) -> Array:
    result = np.zeros_like(t)
    for coefficient in reversed(c):
        result = result * t + coefficient
    return result


def _polynomial_slope(c: Sequence[float], t: Array) -> Array:
    return _polynomial([i * value for i, value in enumerate(c)][1:], t)


def _rackett(c: Sequence[float], t: Array) -> Array:
    a, b, tc, d = c
    return a / b ** (1 + (1 - t / tc) ** d)


def _rackett_slope(c: Sequence[float], t: Array) -> Array:
    _, b, tc, d = c
    return np.asarray(_rackett(c, t) * np.log(b) * d * (1 - t / tc) ** (d - 1) / tc)


_SERIES_POWERS = (0.35, 2 / 3, 1.0, 4 / 3)


def _critical_series(c: Sequence[float], t: Array) -> Array:
    tc, at_critical, *factors = c
    tau = 1 - t / tc
    terms = (f * tau**p for f, p in zip(factors, _SERIES_POWERS, strict=True))
    return np.asarray(at_critical + np.sum(list(terms), axis=0))


def _critical_series_slope(c: Sequence[float], t: Array) -> Array:
    tc, _, *factors = c
    tau = 1 - t / tc
    terms = (-f * p * tau ** (p - 1) / tc for f, p in zip(factors, _SERIES_POWERS, strict=True))
    return np.asarray(np.sum(list(terms), axis=0))


def _extended_antoine(c: Sequence[float], t: Array) -> Array:
    a, b, g, d, e = c
    return np.exp(a + b / t + g * np.log(t) + d * t**e)


def _extended_antoine_slope(c: Sequence[float], t: Array) -> Array:
    _, b, g, d, e = c
    return _extended_antoine(c, t) * (-b / t**2 + g / t + d * e * t ** (e - 1))


def _antoine(c: Sequence[float], t: Array) -> Array:
    a, b, offset = c
    return 10 ** (a - b / (t + offset))


def _antoine_slope(c: Sequence[float], t: Array) -> Array:
    _, b, offset = c
    return np.asarray(_antoine(c, t) * np.log(10) * b / (t + offset) ** 2)


_WAGNER_POWERS = (1.0, 1.5, 2.5, 5.0)


def _wagner(c: Sequence[float], t: Array) -> Array:
    tc, pc, *factors = c
    tau = 1 - t / tc
    total = np.sum([f * tau**p for f, p in zip(factors, _WAGNER_POWERS, strict=True)], axis=0)
    return np.asarray(pc * np.exp(total * tc / t))


def _wagner_slope(c: Sequence[float], t: Array) -> Array:
    tc, _, *factors = c
    tau = 1 - t / tc
    pairs = list(zip(factors, _WAGNER_POWERS, strict=True))
    total = np.sum([f * tau**p for f, p in pairs], axis=0)
    inner = np.sum([-f * p * tau ** (p - 1) / tc for f, p in pairs], axis=0)
    return np.asarray(_wagner(c, t) * (inner * tc / t - total * tc / t**2))


def _vdi_viscosity(c: Sequence[float], t: Array) -> Array:
    a, b, upper, lower, scale = c
    z = (upper - t) / (t - lower)
    return scale * np.exp(a * np.cbrt(z) + b * z * np.cbrt(z))


def _vdi_viscosity_slope(c: Sequence[float], t: Array) -> Array:
    a, b, upper, lower, _ = c
    z = (upper - t) / (t - lower)
    dz = (lower - upper) / (t - lower) ** 2
    inner = a / 3 * np.cbrt(z) / z + b * 4 / 3 * np.cbrt(z)
    return _vdi_viscosity(c, t) * inner * dz


FORMS: Mapping[str, Form] = MappingProxyType(
    {
        form.name: form
        for form in (
            Form(
                "polynomial", ("a", "b", "c", "d", "e", "f", "g", "h"), 1,
                r"y = a + bT + cT^2 + dT^3 + \dots",
                "power series in the temperature",
                _polynomial, _polynomial_slope,
            ),
            Form(
                "rackett", ("A", "B", "C", "D"), 4,
                r"y = \frac{A}{B^{\,1+(1-T/C)^{D}}}",
                "Rackett, J. Chem. Eng. Data 15, 514 (1970), with free coefficients",
                _rackett, _rackett_slope,
            ),
            Form(
                "critical_series", ("T_c", "y_c", "a", "b", "c", "d"), 6,
                r"y = y_c + a\tau^{0.35} + b\tau^{2/3} + c\tau + d\tau^{4/3},"
                r"\quad \tau = 1 - T/T_c",
                "VDI Heat Atlas, 2nd edition, part D3.1 (2010)",
                _critical_series, _critical_series_slope,
            ),
            Form(
                "extended_antoine", ("A", "B", "C", "D", "E"), 5,
                r"y = \exp\left(A + \frac{B}{T} + C\ln T + D\,T^{E}\right)",
                "Perry's Chemical Engineers' Handbook, 8th edition, section 2 (2008)",
                _extended_antoine, _extended_antoine_slope,
            ),
            Form(
                "antoine", ("A", "B", "C"), 3,
                r"y = 10^{\,A - B/(T + C)}",
                "Antoine, C. R. Acad. Sci. 107, 681 (1888)",
                _antoine, _antoine_slope,
            ),
            Form(
                "wagner", ("T_c", "p_c", "a", "b", "c", "d"), 6,
                r"y = p_c \exp\left(\frac{T_c}{T}\left(a\tau + b\tau^{1.5} + c\tau^{2.5}"
                r" + d\tau^{5}\right)\right),\quad \tau = 1 - T/T_c",
                "Wagner, Cryogenics 13, 470 (1973), with exponents 2.5 and 5",
                _wagner, _wagner_slope,
            ),
            Form(
                "vdi_viscosity", ("A", "B", "C", "D", "E"), 5,
                r"y = E \exp\left(A z^{1/3} + B z^{4/3}\right),\quad z = \frac{C-T}{T-D}",
                "VDI Heat Atlas, 2nd edition, part D3.1 (2010)",
                _vdi_viscosity, _vdi_viscosity_slope,
            ),
        )
    }
)  # fmt: skip


@np.errstate(all="ignore")
def evaluate(form: str, coefficients: Sequence[float], temperature: ArrayLike) -> Array:
    """Value of a curve [its own unit], shape of ``temperature``; NaN outside its mathematics.

    ``form`` [name in FORMS], ``coefficients`` [as the form asks], ``temperature`` [K]. Source of
    each form: ``FORMS[form].source``. Raises ``KeyError`` for an unknown form.
    """
    return FORMS[form].value(coefficients, np.asarray(temperature, dtype=np.float64))


@np.errstate(all="ignore")
def derivative(form: str, coefficients: Sequence[float], temperature: ArrayLike) -> Array:
    """Slope dy/dT of a curve [its unit per K], shape of ``temperature``.

    ``form`` [name in FORMS], ``coefficients`` [as the form asks], ``temperature`` [K].
    """
    return FORMS[form].slope(coefficients, np.asarray(temperature, dtype=np.float64))


def turning_point(
    form: str, coefficients: Sequence[float], low: float, high: float
) -> float | None:
    """Temperature [K] in a range where a curve has its extremum, or None.

    ``form`` [name in FORMS], ``coefficients`` [as the form asks], the range from ``low`` [K] to
    ``high`` [K]. The outermost one where there are several.
    """
    grid = np.linspace(low, high, 201)
    slopes = derivative(form, coefficients, grid)
    turns = np.flatnonzero(np.sign(slopes[:-1]) * np.sign(slopes[1:]) < 0)
    if not turns.size:
        return None
    middle = (low + high) / 2
    i = max(turns, key=lambda k: abs(grid[k] - middle))
    share = slopes[i] / (slopes[i] - slopes[i + 1])
    return float(grid[i] + share * (grid[i + 1] - grid[i]))


@dataclass(frozen=True, slots=True)
class LineFit:
    """Weighted straight line y = value + slope (T − centre), with standard uncertainties."""

    centre: float
    value: float
    value_uncertainty: float
    slope: float
    slope_uncertainty: float


def fit_line(temperature: ArrayLike, value: ArrayLike, uncertainty: ArrayLike) -> LineFit | None:
    """Weighted least squares through points at two temperatures or more, else None.

    ``temperature`` [K], ``value`` [any], ``uncertainty`` [as value, standard, > 0]; all of
    shape (n,). Where the points scatter more than their uncertainties say, the uncertainties of
    the line grow by the Birge ratio. Birge, Phys. Rev. 40, 207 (1932).
    """
    t = np.asarray(temperature, dtype=np.float64)
    y = np.asarray(value, dtype=np.float64)
    u = np.asarray(uncertainty, dtype=np.float64)
    if np.unique(t).size < 2:
        return None
    w = 1 / u**2
    centre = float(np.sum(w * t) / np.sum(w))
    mean = float(np.sum(w * y) / np.sum(w))
    spread = float(np.sum(w * (t - centre) ** 2))
    slope = float(np.sum(w * (t - centre) * (y - mean)) / spread)
    birge = 1.0
    if t.size > 2:
        chi2 = float(np.sum(w * (y - mean - slope * (t - centre)) ** 2))
        birge = max(1.0, float(np.sqrt(chi2 / (t.size - 2))))
    value_u = birge / float(np.sqrt(np.sum(w)))
    return LineFit(centre, mean, value_u, slope, birge / float(np.sqrt(spread)))


# Two-sided 95 % of the normal distribution.
COVERAGE_95 = 1.959963984540054


def sign_of(slope: float, uncertainty: float) -> str:
    """``falls``, ``rises`` or ``no trend``, with 95 % confidence; ``not known`` for NaN.

    ``slope`` [any per K], ``uncertainty`` [as slope, standard].
    """
    if not np.isfinite(slope) or not np.isfinite(uncertainty):
        return "not known"
    if abs(slope) <= COVERAGE_95 * uncertainty:
        return "no trend"
    return "falls" if slope < 0 else "rises"
