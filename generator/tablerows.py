"""Records of the open tables → rows of the handbook's tables, with digits, units and sources.

One function a quantity. A record is one line of one packaged table; nothing here opens a file.
"""

from __future__ import annotations

from collections.abc import Callable, Iterator, Mapping
from decimal import ROUND_FLOOR, Decimal
from itertools import islice

from generator.published import (
    ZERO_CELSIUS,
    Printed,
    fixed,
    fixed_point,
    plain,
    range_c,
    significant,
    split_superscript,
    temperature_c,
)
from generator.units import AVOGADRO, BOLTZMANN

Record = Mapping[str, str]
Row = dict[str, str]
# Records of one substance in one packaged table: its own CAS number first, then the number the
# handbooks list it under (racemates).
Records = Callable[[str], tuple[Record, ...]]

PERMITTIVITY = "Electrolytes/Permittivity (Dielectric Constant) of Liquids.tsv"
REFRACTIVE_INDEX = "Misc/CRC Handbook Organic RI.csv"
ORGANIC = "Misc/Physical Constants of Organic Compounds.csv"
INORGANIC = "Misc/Physical Constants of Inorganic Compounds.csv"
COMMON_CHEMISTRY = "Misc/common_chemistry_data.tsv"
WEBBOOK = "Misc/webbook_constants.tsv"
WIKIDATA = "Misc/wikidata_properties.tsv"
OPEN_MELTING_POINTS = "Phase Change/OpenNotebook Melting Points.tsv"
YAWS_BOILING_POINTS = "Phase Change/Yaws Boiling Points.tsv"
PERRY_DENSITY = "Density/Perry Parameters 105.tsv"
VDI_DENSITY = "Density/VDI PPDS Density of Saturated Liquids.tsv"
PERRY_VISCOSITY = "Viscosity/Table 2-313 Viscosity of Inorganic and Organic Liquids.tsv"
VDI_VISCOSITY = "Viscosity/VDI PPDS Dynamic viscosity of saturated liquids polynomials.tsv"
VISWANATH_3 = "Viscosity/Viswanath Natarajan Dynamic 3 term.tsv"
VISWANATH_2 = "Viscosity/Viswanath Natarajan Dynamic 2 term.tsv"
PERRY_VAPOUR = "Vapor Pressure/Table 2-8 Vapor Pressure of Inorganic and Organic Liquids.tsv"
VDI_VAPOUR = "Vapor Pressure/VDI PPDS Boiling temperatures at different pressures.tsv"
POLING_ANTOINE = "Vapor Pressure/Antoine Collection Poling.tsv"
POLING_WAGNER = "Vapor Pressure/Wagner Collection Poling.tsv"
CRITICAL_IUPAC = "Critical Properties/IUPACOrganicCriticalProps.tsv"
CRITICAL_CRC = "Critical Properties/CRCCriticalOrganics.tsv"
CRITICAL_YAWS = "Critical Properties/Yaws Collection.tsv"
CONDUCTIVITY = "Electrolytes/Lange Pure Species Conductivity.tsv"
IEC_FLASH = "Safety/IS IEC 60079-20-1 2010.tsv"
NFPA_FLASH = "Safety/NFPA 497 2008.tsv"
SERAT_FLASH = "Safety/DIPPR T_flash Serat.csv"
_DIPOLES = (
    ("Misc/Poling Dipole.csv", "poling-dipole"),
    ("Misc/cccbdb.nist.gov Dipoles.csv", "cccbdb-dipole"),
    ("Misc/Muller Supporting Info Dipoles.csv", "muller-dipole"),
    ("Misc/psi4_dipoles.tsv", "psi4-dipole"),
)
_MELTING = (
    (ORGANIC, "crc-organic"),
    (INORGANIC, "crc-inorganic"),
    (OPEN_MELTING_POINTS, "open-melting-points"),
    (COMMON_CHEMISTRY, "common-chemistry"),
    (WEBBOOK, "nist-webbook"),
    (WIKIDATA, "wikidata"),
)
_BOILING = (
    (ORGANIC, "crc-organic"),
    (INORGANIC, "crc-inorganic"),
    (YAWS_BOILING_POINTS, "yaws-boiling-points"),
    (COMMON_CHEMISTRY, "common-chemistry"),
    (WEBBOOK, "nist-webbook"),
    (WIKIDATA, "wikidata"),
)
_FLASH = (
    (IEC_FLASH, "iec-60079-20-1"),
    (NFPA_FLASH, "nfpa-497"),
    (SERAT_FLASH, "serat-flash-point"),
    (WIKIDATA, "wikidata"),
)
_CURVE_DIGITS = 7
# Liquids whose C has the wrong sign in the packaged viscosity table: as it stands there the curve
# misses other sources by a factor of 1.4 (cis-1,2-dichloroethylene) to 5e7 (isobutyl acetate),
# with the sign turned it meets them within 3 %.
_SIGN_TURNED = frozenset(
    {"64-17-5", "96-37-7", "105-37-3", "106-97-8", "110-74-7", "110-19-0", "156-59-2"}
)
# Standard deviation of a one-point Rackett density from the published curves of 174 liquids at
# 40 K from the point, as a share of the density.
_RACKETT_SHARE = 0.005
_RACKETT_POWER = 2 / 7
_USUAL_TEMPERATURES = (10, *range(14, 31))  # °C
# Liquids share a table with minerals, whose densities carry no temperature.
_LOWEST_DENSITY, _HIGHEST_DENSITY = Decimal("0.3"), Decimal(4)
# Kelvin a density may lie below the melting point and still be one of the liquid.
_SUPERCOOLED = Decimal(2)


def measurement_rows(records: Records) -> list[Row]:
    """Every published value of one substance, quantity by quantity."""
    return [
        *_permittivity(records),
        *_refractive_index(records),
        *_density(records),
        *_dipole_moment(records),
        *_fixed_points(records, "melting_point", "Tm", _MELTING),
        *_fixed_points(records, "boiling_point", "Tb", _BOILING),
        *_fixed_points(records, "flash_point", "T_flash", _FLASH),
        *_conductivity(records),
    ]


def correlation_rows(records: Records, molar_mass: float) -> list[Row]:
    """Every published curve of one substance, at most two a quantity.

    ``molar_mass`` [g/mol] turns the molar densities of Perry's handbook into mass densities.
    Where no density curve is published, one is worked out from the published point.
    """
    densities = list(_density_curves(records, molar_mass))
    return [
        *_permittivity_curve(records),
        *(densities or _worked_out_density_curve(records, molar_mass)),
        *_first(2, _viscosity_curves(records)),
        *_first(2, _vapour_pressure_curves(records)),
    ]


def _first(count: int, rows: Iterator[Row]) -> list[Row]:
    return list(islice(rows, count))


def _cell(records: Records, table: str, column: str) -> str:
    return next((r[column] for r in records(table) if r.get(column, "")), "")


def _full(records: Records, table: str, *columns: str) -> Record | None:
    """The first record of the table in which all these columns are filled."""
    return next((r for r in records(table) if all(r.get(c, "") for c in columns)), None)


def _point(quantity: str, printed: Printed, source: str, celsius: str = "", note: str = "") -> Row:
    return {
        "quantity": quantity,
        "value": printed.value,
        "unit": printed.unit,
        "uncertainty": "",
        "temperature_c": celsius,
        "source": source,
        "method": "",
        "note": note,
    }


def _curve(
    quantity: str,
    form: str,
    unit: str,
    coefficients: tuple[float | str, ...],
    ends: tuple[str, str],
    source: str,
) -> Row:
    # One published range has its ends the wrong way round.
    low, high = sorted(ends, key=float)
    texts = (c if isinstance(c, str) else significant(c, _CURVE_DIGITS) for c in coefficients)
    return {
        "quantity": quantity,
        "form": form,
        "unit": unit,
        "coefficients": " ".join(texts),
        "t_min_c": low,
        "t_max_c": high,
        "uncertainty": "",
        "source": source,
    }


def _permittivity(records: Records) -> Iterator[Row]:
    record = _full(records, PERMITTIVITY, "T", "Permittivity")
    if record:
        value = Printed(record["Permittivity"], "1")
        yield _point("relative_permittivity", value, "crc-permittivity", temperature_c(record["T"]))


def _permittivity_curve(records: Records) -> Iterator[Row]:
    record = _full(records, PERMITTIVITY, "A", "B", "Tmin", "Tmax")
    if record:
        terms = [float(record[c] or 0) for c in "ABCD"]
        while len(terms) > 1 and terms[-1] == 0:
            terms.pop()
        coefficients = tuple(repr(term) for term in terms)
        ends = range_c(record["Tmin"]), range_c(record["Tmax"])
        yield _curve(
            "relative_permittivity", "polynomial", "1", coefficients, ends, "crc-permittivity"
        )


def _refractive_index(records: Records) -> Iterator[Row]:
    record = _full(records, REFRACTIVE_INDEX, "RI", "RIT")
    if record is None:
        return
    celsius = fixed(Decimal(record["RIT"]) - ZERO_CELSIUS, 0)
    run_together = _cell(records, ORGANIC, "RI")
    # The other printing of the same table keeps the trailing zeros this one has lost.
    digits = next(
        (
            text
            for text, at in split_superscript(run_together)
            if str(at) == celsius and Decimal(text) == Decimal(record["RI"])
        ),
        record["RI"],
    )
    yield _point("refractive_index", Printed(digits, "1"), "crc-organic", celsius)


def _density(records: Records) -> Iterator[Row]:
    for table, source in ((ORGANIC, "crc-organic"), (INORGANIC, "crc-inorganic")):
        record = _full(records, table, "rho")
        if record is None:
            continue
        number = plain(Decimal(record["rho"]) / 1000)
        digits, at = next(split_superscript(number), ("", 0))
        # With six digits the last two can only be the temperature; with fewer, trust usual ones.
        certain = len(number.partition(".")[2]) == 6 or at in _USUAL_TEMPERATURES
        melting = Decimal(_cell(records, table, "Tm") or 0)
        liquid = ZERO_CELSIUS + at >= melting - _SUPERCOOLED
        if digits and certain and liquid and _LOWEST_DENSITY < Decimal(digits) < _HIGHEST_DENSITY:
            yield _point("density", Printed(digits, "g/cm3"), source, str(at))
            return


def _dipole_moment(records: Records) -> Iterator[Row]:
    for table, source in _DIPOLES:
        text = _cell(records, table, "dipole_moment")
        if text:
            moment = Decimal(text)
            # Numbers converted from coulomb metres carry a tail of digits nobody published.
            digits = text if len(text.partition(".")[2]) <= 2 else fixed(moment, 2)
            yield _point("dipole_moment", Printed(digits, "D"), source)


def _fixed_points(
    records: Records, quantity: str, column: str, tables: tuple[tuple[str, str], ...]
) -> Iterator[Row]:
    for table, source in tables:
        kelvin = _cell(records, table, column)
        if not kelvin:
            continue
        # Values with a tail of digits in this list are the authors' estimates, not experiments.
        if table == SERAT_FLASH and len(kelvin.partition(".")[2]) > 2:
            continue
        yield _point(quantity, fixed_point(kelvin), source)


def _conductivity(records: Records) -> Iterator[Row]:
    record = _full(records, CONDUCTIVITY, "T", "Conductivity")
    if record:
        value = Printed(repr(float(record["Conductivity"])), "S/m")
        yield _point("conductivity", value, "lange-conductivity", temperature_c(record["T"]))


def _below(kelvin: str) -> str:
    """The upper end of a curve, kept below the critical temperature where it stops existing."""
    celsius = Decimal(kelvin) - ZERO_CELSIUS - Decimal("0.01")
    return plain(celsius.quantize(Decimal("0.1"), rounding=ROUND_FLOOR))


def _density_curves(records: Records, molar_mass: float) -> Iterator[Row]:
    record = _full(records, PERRY_DENSITY, "C1", "C2", "C3", "C4", "Tmin", "Tmax")
    if record:
        # mol/m³ → kg/m³ with the molar mass in g/mol
        first = float(record["C1"]) * molar_mass / 1000
        coefficients = (first, record["C2"], record["C3"], record["C4"])
        ends = range_c(record["Tmin"]), _below(record["Tmax"])
        yield _curve("density", "rackett", "kg/m3", coefficients, ends, "perry-density")
    record = _full(records, VDI_DENSITY, "Tc", "rhoc", "A", "B", "C", "D")
    melting = _cell(records, VDI_VAPOUR, "Tm")
    if record and melting:
        columns = ("Tc", "rhoc", "A", "B", "C", "D")
        ends = range_c(melting), _below(record["Tc"])
        yield _curve(
            "density", "critical_series", "kg/m3", tuple(record[c] for c in columns), ends,
            "vdi-density",
        )  # fmt: skip


def _worked_out_density_curve(records: Records, molar_mass: float) -> Iterator[Row]:
    """The Rackett equation through the published density, with the critical constants.

    ρ = A / Z^(1 + (1 − T/Tc)^(2/7)) with A = pc M/(R Tc); Z makes it pass through the point
    (Rackett, J. Chem. Eng. Data 15, 514, 1970; Spencer and Danner, ibid. 17, 236, 1972).
    """
    critical = next(
        (
            record
            for table in (CRITICAL_IUPAC, CRITICAL_CRC, CRITICAL_YAWS)
            if (record := _full(records, table, "Tc", "Pc"))
        ),
        None,
    )
    point = next(_density(records), None)
    melting, boiling = (
        _cell(records, ORGANIC, c) or _cell(records, COMMON_CHEMISTRY, c) for c in ("Tm", "Tb")
    )
    if not (critical and point and melting and boiling):
        return
    t_critical = float(critical["Tc"])
    first = float(critical["Pc"]) * molar_mass / 1000 / (AVOGADRO * BOLTZMANN * t_critical)
    density = float(point["value"]) * 1000
    reduced = (float(point["temperature_c"]) + float(ZERO_CELSIUS)) / t_critical
    if reduced >= 1 or float(melting) >= float(boiling):
        return
    z = (first / density) ** (1 / (1 + (1 - reduced) ** _RACKETT_POWER))
    row = _curve(
        "density", "rackett", "kg/m3", (first, z, critical["Tc"], _RACKETT_POWER),
        (range_c(melting), range_c(boiling)), "rackett-one-point",
    )  # fmt: skip
    yield {**row, "uncertainty": significant(_RACKETT_SHARE * density, 2)}


def _viscosity_curves(records: Records) -> Iterator[Row]:
    record = _full(records, PERRY_VISCOSITY, "C1", "C2", "C3", "C4", "C5", "Tmin", "Tmax")
    if record:
        coefficients = tuple(repr(float(record[f"C{i}"])) for i in range(1, 6))
        ends = range_c(record["Tmin"]), range_c(record["Tmax"])
        yield _curve("viscosity", "extended_antoine", "Pa s", coefficients, ends, "perry-viscosity")
    record = _full(records, VDI_VISCOSITY, "A", "B", "C", "D", "E")
    melting = _cell(records, VDI_VAPOUR, "Tm")
    boiling = _cell(records, ORGANIC, "Tb") or _cell(records, INORGANIC, "Tb")
    if record and melting and boiling:
        coefficients = tuple(repr(float(record[c])) for c in "ABCDE")
        ends = range_c(melting), range_c(boiling)
        yield _curve("viscosity", "vdi_viscosity", "Pa s", coefficients, ends, "vdi-viscosity")
    record = _full(records, VISWANATH_3, "A", "B", "C", "Tmin", "Tmax")
    if record:
        # log10(η / mPa s) = A + B/(C − T), rewritten in the Antoine form
        offset = float(record["C"]) * (1 if record["CAS"] in _SIGN_TURNED else -1)
        coefficients = (record["A"], record["B"], repr(offset))
        ends = range_c(record["Tmin"]), range_c(record["Tmax"])
        yield _curve("viscosity", "antoine", "mPa s", coefficients, ends, "viswanath-viscosity")
        return
    record = _full(records, VISWANATH_2, "A", "B", "Tmin", "Tmax")
    if record:
        # log10(η / Pa s) = A + B/T, likewise
        coefficients = (record["A"], repr(-float(record["B"])), "0.0")
        ends = range_c(record["Tmin"]), range_c(record["Tmax"])
        yield _curve("viscosity", "antoine", "Pa s", coefficients, ends, "viswanath-viscosity")


def _vapour_pressure_curves(records: Records) -> Iterator[Row]:
    record = _full(records, PERRY_VAPOUR, "C1", "C2", "C3", "C4", "C5", "Tmin", "Tmax")
    if record:
        coefficients = tuple(repr(float(record[f"C{i}"])) for i in range(1, 6))
        ends = range_c(record["Tmin"]), _below(record["Tmax"])
        yield _curve(
            "vapour_pressure", "extended_antoine", "Pa", coefficients, ends,
            "perry-vapour-pressure",
        )  # fmt: skip
    record = _full(records, POLING_ANTOINE, "A", "B", "C", "Tmin", "Tmax")
    if record:
        coefficients = (record["A"], record["B"], record["C"])
        ends = range_c(record["Tmin"]), range_c(record["Tmax"])
        yield _curve("vapour_pressure", "antoine", "Pa", coefficients, ends, "poling-antoine")
    record = _full(records, VDI_VAPOUR, "Tm", "Tc", "Pc", "A", "B", "C", "D")
    if record:
        coefficients = tuple(record[c] for c in ("Tc", "Pc", "A", "B", "C", "D"))
        ends = range_c(record["Tm"]), _below(record["Tc"])
        yield _curve("vapour_pressure", "wagner", "Pa", coefficients, ends, "vdi-vapour-pressure")
    record = _full(records, POLING_WAGNER, "Tc", "Pc", "A", "B", "C", "D", "Tmin", "Tmax")
    if record:
        coefficients = tuple(record[c] for c in ("Tc", "Pc", "A", "B", "C", "D"))
        ends = range_c(record["Tmin"]), _below(record["Tmax"])
        yield _curve("vapour_pressure", "wagner", "Pa", coefficients, ends, "poling-wagner")
