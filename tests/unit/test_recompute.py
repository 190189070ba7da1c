"""Every derived number of the exported table worked out again from what stands beside it.

Written from the definitions, without the generator's own formulas: slopes are taken by complex
steps (Squire and Trapp, SIAM Review 40, 110 (1998)), which are exact to the last digit.
"""

from __future__ import annotations

import cmath
import csv
import io
import itertools
import math
from collections import defaultdict
from collections.abc import Callable, Mapping
from pathlib import Path

import pytest

from generator.catalogue import catalogue
from generator.exports import exports
from generator.metrics import Handbook

ROOT = Path(__file__).resolve().parents[2]
AGREEMENT = 1e-9

# Exact by the definition of the SI (BIPM, SI Brochure, 9th edition, 2019).
N_A, K_B, E = 6.02214076e23, 1.380649e-23, 1.602176634e-19  # mol⁻¹, J K⁻¹, C
EPSILON_0 = 8.8541878188e-12  # F m⁻¹, CODATA 2022 (NIST SP 961, 2024)
DEBYE = 1e-21 / 299_792_458  # C m, by definition
ATOMIC = 1.05  # atomic polarization as 5 % of the refraction, as the handbook states
BORN_RADIUS = 0.2e-9  # m, as the handbook states
STEP = 1e-30  # K

Inputs = Mapping[str, float]
Number = float | complex


def kirkwood(eps: float) -> float:
    return (eps - 1) / (2 * eps + 1)


def mossotti(eps: Number) -> Number:
    return (eps - 1) / (eps + 2)


def volume(x: Inputs) -> float:
    return x["molar_mass"] / x["density"]


def polarization(x: Inputs) -> float:
    return volume(x) * float(mossotti(x["relative_permittivity"]).real)


def refraction(x: Inputs) -> float:
    return volume(x) * float(mossotti(x["refractive_index"] ** 2).real)


def moment(dimensionless_volume: float, t: float) -> float:
    """Moment [D] from a polarizability volume [cm³/mol] that turning dipoles explain; never < 0."""
    return math.sqrt(max(dimensionless_volume, 0) * 1e-6 * 9 * EPSILON_0 * K_B * t / N_A) / DEBYE


def dipolar(eps: Number, inf: Number) -> Number:
    return (eps - inf) * (2 * eps + inf) / (eps * (inf + 2) ** 2)


def onsager(x: Inputs) -> float:
    term = dipolar(x["relative_permittivity"], ATOMIC * x["refractive_index"] ** 2)
    return moment(volume(x) * float(term.real), x["t"])


def expected_slope(x: Inputs) -> float:
    """dε/dT of ε(T) with F(ε, ε∞) T V held constant, by implicit differentiation."""
    eps, t, alpha = x["relative_permittivity"], x["t"], x["thermal_expansivity"]

    def drive(permittivity: Number, later: Number) -> Number:
        """F T V in units of the present V, ``later`` kelvin from now."""
        share = mossotti(x["refractive_index"] ** 2) * cmath.exp(-alpha * later)
        inf = ATOMIC * (1 + 2 * share) / (1 - share)
        return dipolar(permittivity, inf) * (t + later) * cmath.exp(alpha * later)

    by_eps = complex(drive(eps + 1j * STEP, 0.0)).imag
    by_time = complex(drive(eps, 1j * STEP)).imag
    return -by_time / by_eps


def unpolar_slope(x: Inputs) -> float:
    """dε/dT of ε(T) with V (ε−1)/(ε+2) held constant."""
    share = mossotti(x["relative_permittivity"]) * cmath.exp(-x["thermal_expansivity"] * 1j * STEP)
    return ((1 + 2 * share) / (1 - share)).imag / STEP


def debye_length(x: Inputs, molar: float) -> float:
    ions = 2 * N_A * E**2 * molar * 1000
    return 1e9 * math.sqrt(EPSILON_0 * x["relative_permittivity"] * K_B * x["t"] / ions)


EPS, N, RHO, MU, KAPPA, ALPHA, M = (
    "relative_permittivity", "refractive_index", "density", "dipole_moment", "conductivity",
    "thermal_expansivity", "molar_mass",
)  # fmt: skip
FORMULAS: Mapping[str, tuple[tuple[str, ...], Callable[[Inputs], float]]] = {
    "kirkwood_function": ((EPS,), lambda x: kirkwood(x[EPS])),
    "clausius_mossotti_function": ((EPS,), lambda x: float(mossotti(x[EPS]).real)),
    "molar_volume": ((M, RHO), volume),
    "molar_polarization": ((EPS, M, RHO), polarization),
    "molar_refraction": ((N, M, RHO), refraction),
    "orientation_polarization": (
        (EPS, N, M, RHO),
        lambda x: polarization(x) - ATOMIC * refraction(x),
    ),
    "debye_dipole_moment": (
        (EPS, N, M, RHO),
        lambda x: moment(polarization(x) - ATOMIC * refraction(x), x["t"]),
    ),
    "onsager_dipole_moment": ((EPS, N, M, RHO), onsager),
    "kirkwood_correlation_factor": ((EPS, N, M, RHO, MU), lambda x: (onsager(x) / x[MU]) ** 2),
    "lippert_mataga_polarizability": ((EPS, N), lambda x: kirkwood(x[EPS]) - kirkwood(x[N] ** 2)),
    "expected_temperature_coefficient": ((EPS, N, ALPHA), expected_slope),
    "bjerrum_length": (
        (EPS,),
        lambda x: 1e9 * E**2 / (4 * math.pi * EPSILON_0 * x[EPS] * K_B * x["t"]),
    ),
    "born_solvation_energy": (
        (EPS,),
        lambda x: -N_A * E**2 / (8 * math.pi * EPSILON_0 * BORN_RADIUS) * (1 - 1 / x[EPS]) / 1000,
    ),
    "debye_length_01": ((EPS,), lambda x: debye_length(x, 0.1)),
    "debye_length_001": ((EPS,), lambda x: debye_length(x, 0.01)),
    "charge_relaxation_time": ((EPS, KAPPA), lambda x: EPSILON_0 * x[EPS] / x[KAPPA]),
}
# Derived by the definition of a slope from the tables, not from other numbers of the table.
SLOPES = {"temperature_coefficient", "thermal_expansivity"}
Cell = dict[str, str]


@pytest.fixture(scope="module")
def files(handbook: Handbook) -> dict[str, bytes]:
    return exports(catalogue(handbook, ()), ROOT / "data")


def table(files: Mapping[str, bytes], name: str) -> list[Cell]:
    return list(csv.DictReader(io.StringIO(files[f"downloads/{name}"].decode())))


@pytest.fixture(scope="module")
def rows(files: dict[str, bytes]) -> list[Cell]:
    return table(files, "values.csv")


@pytest.fixture(scope="module")
def values(rows: list[Cell]) -> dict[str, dict[tuple[str, str], Cell]]:
    """Rows by substance, then by quantity and temperature."""
    found: dict[str, dict[tuple[str, str], Cell]] = defaultdict(dict)
    for row in rows:
        found[row["solvent"]][row["quantity"], row["temperature_c"]] = row
    return dict(found)


def inputs_of(
    own: Mapping[tuple[str, str], Cell], names: tuple[str, ...], at: str
) -> dict[str, float] | None:
    """The numbers a formula asks for at one temperature; None where one of them is missing."""
    found = {"t": float(at) + 273.15} if at else {}
    for name in names:
        row = own.get((name, at)) or own.get((name, ""))
        if row is None:
            return None
        found[name] = float(row["value"])
    return found


def has_no_moment(own: Mapping[tuple[str, str], Cell]) -> bool:
    row = own.get((MU, ""))
    return row is not None and float(row["value"]) <= max(0.1, 2 * float(row["uncertainty"]))


def test_every_derived_quantity_is_worked_out_here(rows: list[Cell]) -> None:
    derived = {r["quantity"] for r in rows if r["basis"] in {"computed", "estimated"}}
    measured = {N, RHO, MU, EPS, M}  # some are computed where nobody measured; see below
    assert derived - measured == set(FORMULAS) | SLOPES
    assert len(rows) > 20_000


@pytest.mark.parametrize("quantity", FORMULAS)
def test_derived_numbers_follow_from_the_exported_inputs(
    quantity: str, values: dict[str, dict[tuple[str, str], Cell]]
) -> None:
    names, formula = FORMULAS[quantity]
    checked = 0
    for slug, own in values.items():
        bare = has_no_moment(own)
        for (key, at), row in own.items():
            if key != quantity:
                continue
            if quantity == "expected_temperature_coefficient" and bare:
                x = inputs_of(own, (EPS, ALPHA), at)
                assert x is not None, (slug, at)
                wanted = unpolar_slope(x)
            else:
                x = inputs_of(own, names, at)
                assert x is not None, (slug, at)
                wanted = formula(x)
            assert float(row["value"]) == pytest.approx(wanted, rel=AGREEMENT, abs=1e-300), (
                slug, at,
            )  # fmt: skip
            assert not (quantity == "kirkwood_correlation_factor" and bare), slug
            checked += 1
    assert checked > 100


@pytest.mark.parametrize("quantity", FORMULAS)
def test_no_derived_number_is_missing_where_its_inputs_are_there(
    quantity: str, values: dict[str, dict[tuple[str, str], Cell]]
) -> None:
    names, _ = FORMULAS[quantity]
    for slug, own in values.items():
        if quantity == "kirkwood_correlation_factor" and has_no_moment(own):
            continue
        for at in {at for _, at in own if at}:
            if inputs_of(own, names, at) is not None:
                assert (quantity, at) in own, (slug, at)


def test_index_at_other_temperatures_keeps_the_refraction_of_a_measured_one(
    values: dict[str, dict[tuple[str, str], Cell]], files: dict[str, bytes]
) -> None:
    measured = {
        (r["solvent"], round(float(r["temperature_c"]), 6))
        for r in table(files, "data/measurements.csv")
        if r["quantity"] == N
    }
    checked = 0
    for slug, own in values.items():
        listed = {at for key, at in own if key == N and own[key, at]["basis"] == "measured"}
        anchors = [at for at in listed if (slug, float(at)) in measured]
        for (key, at), row in own.items():
            if key == N and row["basis"] == "computed" and anchors:
                kept = [float(own["molar_refraction", a]["value"]) for a in anchors]
                found = float(own["molar_refraction", at]["value"])
                assert any(found == pytest.approx(k, rel=AGREEMENT) for k in kept), (slug, at)
                checked += 1
    assert checked > 500


def polynomial(c: list[float], t: complex) -> complex:
    return sum((a * t**i for i, a in enumerate(c)), 0j)


def rackett(c: list[float], t: complex) -> complex:
    a, b, critical, d = c
    return a / b ** (1 + (1 - t / critical) ** d)


def critical_series(c: list[float], t: complex) -> complex:
    critical, at_critical, *factors = c
    powers = (0.35, 2 / 3, 1, 4 / 3)
    tau = 1 - t / critical
    return at_critical + sum(f * tau**p for f, p in zip(factors, powers, strict=True))


FORMS = {"polynomial": polynomial, "rackett": rackett, "critical_series": critical_series}


def curve_slopes(
    curves: list[Cell], row: Cell, *, relative: bool, share: float = 1.0
) -> list[float]:
    """Slopes at the temperature of ``row`` of every curve that its sources may mean."""
    at = float(row["temperature_c"])
    found = []
    for curve in curves:
        if curve["source"] != row["sources"] or curve["solvent"] != row["solvent"]:
            continue
        if float(curve["t_min_c"]) - 0.1 <= at <= float(curve["t_max_c"]) + 0.1:
            numbers = [float(c) for c in curve["coefficients"].split()]
            y = FORMS[curve["form"]](numbers, complex(at + 273.15, STEP))
            found.append(share * y.imag / STEP / (y.real if relative else 1.0))
    return found


def point_slopes(points: list[Cell], solvent: str) -> list[float]:
    """Slopes between any two points of a substance; a weighted line lies among them."""
    own = [
        (float(p["temperature_c"]), float(p["value"])) for p in points if p["solvent"] == solvent
    ]
    pairs = itertools.combinations(own, 2)
    return [(y1 - y0) / (t1 - t0) for (t0, y0), (t1, y1) in pairs if abs(t1 - t0) > 0.5]


def agrees(value: float, exact: list[float], around: list[float]) -> bool:
    """Whether a value is one of ``exact``, or lies among ``around``."""
    if any(value == pytest.approx(e, rel=AGREEMENT) for e in exact):
        return True
    slack = AGREEMENT * abs(value)
    return bool(around) and min(around) - slack <= value <= max(around) + slack


def test_slopes_follow_from_the_exported_curves_and_points(
    rows: list[Cell],
    values: dict[str, dict[tuple[str, str], Cell]],
    files: dict[str, bytes],
) -> None:
    correlations = table(files, "data/correlations.csv")
    excluded = {
        (c["solvent"], c["quantity"], c["source"], c["temperature_c"])
        for c in table(files, "data/corrections.csv")
        if c["action"] == "exclude"
    }
    points = [
        p
        for p in table(files, "data/measurements.csv")
        if (p["solvent"], p["quantity"], p["source"], p["temperature_c"]) not in excluded
    ]
    checked = 0
    for row in rows:
        quantity = {"temperature_coefficient": EPS, ALPHA: RHO}.get(row["quantity"])
        if quantity is None or row["basis"] != "computed":
            continue
        relative = quantity == RHO
        share = -1.0 if relative else 1.0
        curves = [c for c in correlations if c["quantity"] == quantity]
        own = [p for p in points if p["quantity"] == quantity]
        exact = curve_slopes(curves, row, relative=relative, share=share)
        around = [] if exact else point_slopes(own, row["solvent"])
        if relative and around:
            density = values[row["solvent"]].get((RHO, row["temperature_c"]))
            assert density is not None
            around = [-s / float(density["value"]) for s in around]
        assert agrees(float(row["value"]), exact, around), row
        checked += 1
    assert checked > 1000


def test_every_number_has_a_source_and_stands_in_the_liquid_range_or_is_marked(
    rows: list[Cell], values: dict[str, dict[tuple[str, str], Cell]], handbook: Handbook
) -> None:
    for row in rows:
        sources = row["sources"].split("; ")
        assert sources, row
        assert set(sources) <= set(handbook.sources), row
        if not row["temperature_c"]:
            continue
        own, at = values[row["solvent"]], float(row["temperature_c"])
        low, high = own.get(("melting_point", "")), own.get(("boiling_point", ""))
        # Printed ends of ranges are rounded to a tenth.
        inside = (low is None or at >= float(low["value"]) - 0.06) and (
            high is None or at <= float(high["value"]) + 0.06
        )
        assert inside or "outside-liquid-range" in row["marks"], row


def test_a_wrong_digit_would_be_seen(values: dict[str, dict[tuple[str, str], Cell]]) -> None:
    x = inputs_of(values["acetone"], (EPS, N, M, RHO), "25.0")
    assert x is not None
    right = float(values["acetone"]["onsager_dipole_moment", "25.0"]["value"])
    assert onsager(x) == pytest.approx(right, rel=AGREEMENT)
    assert onsager({**x, EPS: x[EPS] * (1 + 1e-7)}) != pytest.approx(right, rel=AGREEMENT)
