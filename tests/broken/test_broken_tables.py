"""Tables with one fault each: every fault is told once, in its place, and nothing is published.

The tables are small and partly invented; each fault of the corpus is one edit of them.
"""

from __future__ import annotations

import csv
import io
import json
import shutil
from collections.abc import Callable
from dataclasses import dataclass
from pathlib import Path

import pytest
from click.testing import CliRunner
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st

from generator.checks import check_folder
from generator.cli import main
from generator.dataset import load_dataset
from generator.errors import DatasetError, Problem
from generator.schema import shipped_file, shipped_schema
from generator.tables import read_tables

TABLES = {
    "solvents.csv": """\
solvent,name,cas,smiles,synonyms,note
water,Water,7732-18-5,O,H2O,
acetone,Acetone,67-64-1,CC(C)=O,propanone; dimethyl ketone,
acetonitrile,Acetonitrile,75-05-8,CC#N,methyl cyanide; MeCN,
toluene,Toluene,108-88-3,Cc1ccccc1,methylbenzene,
cis-dce,"cis-1,2-Dichloroethylene",156-59-2,Cl/C=C\\Cl,,
trans-dce,"trans-1,2-Dichloroethylene",156-60-5,Cl/C=C/Cl,,
""",
    "measurements.csv": """\
solvent,quantity,value,unit,uncertainty,temperature_c,source,method,note
water,relative_permittivity,80.1,1,,20,handbook,,
water,density,0.9982,g/cm3,0.0001,20,handbook,,
water,melting_point,0,degC,,,handbook,,
water,boiling_point,100,degC,,,handbook,,
acetone,relative_permittivity,20.7,1,,25,handbook,,
acetone,density,0.7845,g/cm3,,25,handbook,,
acetone,refractive_index,1.3588,1,,20,handbook,,
acetone,dipole_moment,2.88,D,0.03,,gas,,
acetone,boiling_point,56.05,degC,,,handbook,,
acetone,boiling_point,56.1,degC,,,own,,
acetone,melting_point,-94.7,degC,,,handbook,,
acetonitrile,relative_permittivity,36.64,1,,20,handbook,,
acetonitrile,flash_point,2,degC,,,handbook,closed cup,
acetonitrile,conductivity,6e-8,S/m,,25,handbook,,
toluene,relative_permittivity,2.38,1,,20,handbook,,
toluene,viscosity,0.56,mPa s,,25,own,falling ball,
toluene,density,0.90,g/cm3,,20,old-table,,
cis-dce,relative_permittivity,9.2,1,,25,handbook,,
trans-dce,relative_permittivity,2.14,1,,20,handbook,,
""",
    "correlations.csv": """\
solvent,quantity,form,unit,coefficients,t_min_c,t_max_c,uncertainty,source
water,relative_permittivity,polynomial,1,249.21 -0.79069 0.00072997,0,99,,handbook
acetone,vapour_pressure,antoine,kPa,6.42448 1312.253 -32.445,-14,80,,handbook
""",
    "sources.csv": """\
source,kind,citation,year,doi
handbook,handbook-table,An invented handbook table,2014,
gas,compilation,An invented list of moments in the gas,2010,10.1234/moments
own,laboratory,Measured in the laboratory,2026,
old-table,handbook-table,An older table,1950,
""",
    "uncertainties.csv": """\
kind,quantity,absolute,relative,reason
handbook-table,relative_permittivity,0.005,0.01,Printed tables differ by about 1 %
""",
    "corrections.csv": """\
solvent,quantity,source,temperature_c,published_value,action,replacement,reason,date
toluene,density,old-table,20,0.90,replace,0.8669,Two digits only,2026-03-02
acetone,boiling_point,own,,56.1,keep,,Measured twice,2026-03-02
acetone,vapour_pressure,handbook,,6.42448 1312.253 -32.445,keep,,Compared with another,2026-03-03
""",
    "stock.csv": """\
container,solvent,grade,size,location,received,opened,test_due
A1,acetone,analysis,2.5 L,Cabinet 1,2026-01-12,2026-02-01,
A2,toluene,synthesis,1 L,Cabinet 1,2026-01-12,,
""",
    "handling.csv": """\
solvent,h_statements,storage,peroxide_group,sds_revision,source
acetone,H225 H319 H336,Flammables cabinet,,2025-05-02,own
toluene,H225 H304 H315 H336 H361d H373,Flammables cabinet,,2025-05-02,own
""",
}

S, M, C = "solvents.csv", "measurements.csv", "correlations.csv"
Edit = tuple[str, str] | Callable[[bytes], bytes | None]


@dataclass(frozen=True)
class Case:
    """One edit of one file, and the one error it makes. ``advice`` stands in the hint."""

    file: str
    edit: Edit
    line: int
    column: str
    kind: str
    advice: str = ""

    def apply(self, folder: Path) -> None:
        """Make the edit."""
        path = folder / self.file
        before = path.read_bytes()
        if callable(self.edit):
            after = self.edit(before)
        else:
            old, new = (text.encode() for text in self.edit)
            assert before.count(old) == 1, f"{self.edit[0]!r} stands in {before.count(old)} places"
            after = before.replace(old, new)
        path.unlink() if after is None else path.write_bytes(after)


def _gone(_: bytes) -> None:
    return None


def _with_semicolons(data: bytes) -> bytes:
    """As a spreadsheet of a country with decimal commas writes it, one number left as it was."""
    return data.replace(b",", b";").replace(b"0.7845", b"0,7845")


def _with_column(name: str) -> Callable[[bytes], bytes]:
    def edit(data: bytes) -> bytes:
        header, *rows = data.decode().splitlines()
        return "".join(
            f"{line}\n" for line in (f"{header},{name}", *(f"{r}," for r in rows))
        ).encode()

    return edit


def _without_stock(data: bytes) -> bytes:
    package = json.loads(data)
    package["resources"] = [r for r in package["resources"] if r["name"] != "stock"]
    return json.dumps(package).encode()


BROKEN = {
    # --- files
    "table missing": Case("stock.csv", _gone, 0, "", "missing-table", "container,solvent"),
    "description missing": Case("datapackage.json", _gone, 0, "", "missing-table"),
    "description damaged": Case("datapackage.json", ('"profile": "tabular-data-package"',
                                '"profile" "tabular-data-package"'), 2, "", "bad-description"),
    "description without a table": Case(
        "datapackage.json", _without_stock, 0, "", "bad-description"
    ),
    "file empty": Case("stock.csv", lambda _: b"", 0, "", "empty-file", "container,solvent"),
    "column missing": Case(
        "uncertainties.csv", lambda d: d.replace(b",reason", b"").replace(b",Printed tables "
        b"differ by about 1 %", b""), 1, "reason", "missing-column", "reason",
    ),
    "column unknown": Case("stock.csv", _with_column("colour"), 1, "colour", "unknown-column",
                           "remove"),
    "column misspelt": Case(M, ("temperature_c", "temprature_c"), 1, "temprature_c",
                            "unknown-column", "temperature_c"),
    "column twice": Case("stock.csv", _with_column("grade"), 1, "grade", "duplicate-column"),
    "row cut off": Case(M, lambda d: d[: d.rindex(b",2.14")], 20, "value", "truncated",
                        "last good revision"),
    "cut off inside quotes": Case(S, lambda d: d[: d.index(b"-Dichloroethylene")], 6, "solvent",
                                  "truncated"),
    "quotes amiss": Case(S, ('"cis-1,2-Dichloroethylene"', '"cis"-1,2'), 6, "solvent",
                         "bad-quotes", "close the quotes"),
    "cells missing": Case(M, ("20.7,1,,25,handbook,,", "20.7,1,,25,handbook"), 6, "method",
                          "too-few-cells"),
    "comma without quotes": Case(S, ('"cis-1,2-Dichloroethylene"', "cis-1,2-Dichloroethylene"),
                                 6, "note", "too-many-cells", "quotes"),
    "old encoding": Case(S, lambda d: d.replace(b"methylbenzene", b"toluol\xe8ne"), 5, "synonyms",
                         "encoding", "UTF-8"),
    "utf-16": Case("stock.csv", lambda d: d.decode().encode("utf-16"), 1, "", "encoding", "UTF-8"),
    "zero byte": Case("stock.csv", ("synthesis", "synth\0esis"), 3, "", "encoding"),
    # --- cells as spreadsheets leave them
    "decimal comma": Case(M, ("0.7845", '"0,7845"'), 7, "value", "decimal-comma", "0.7845"),
    "decimal comma, semicolons": Case(M, _with_semicolons, 7, "value", "decimal-comma", "0.7845"),
    "not available": Case(M, ("36.64", "#N/A"), 13, "value", "spreadsheet-error"),
    "reference lost": Case(S, ("CC#N", "#REF!"), 4, "smiles", "spreadsheet-error"),
    "column too narrow": Case(M, ("0.0001", "######"), 3, "uncertainty", "spreadsheet-error"),
    "number made a month": Case(M, ("2.38", "Feb 38"), 16, "value", "number-as-date", "2.38"),
    "number made a day": Case(M, ("20.7", "2026-07-20"), 6, "value", "number-as-date", "20.7"),
    "number made a German day": Case(M, ("9.2,", "09.02.2026,"), 19, "value", "number-as-date",
                                     "9.2"),
    "unit in the cell": Case(M, (",25,own", ",25 °C,own"), 17, "temperature_c", "wrong-type", "25"),
    "thousands": Case(M, ("80.1", '"1,080.1"'), 2, "value", "wrong-type", "point"),
    "less than": Case(M, ("6e-8", "<6e-8"), 15, "value", "wrong-type"),
    "letters mangled": Case(S, ("methylbenzene", "toluÃ¨ne"), 5, "synonyms", "mojibake", "toluène"),
    "degree sign mangled": Case(M, ("degC,,,handbook,closed", "Â°C,,,handbook,closed"), 14, "unit",
                                "mojibake", "°C"),
    "value blank": Case(M, (",2.88,", ",,"), 9, "value", "blank"),
    "unit blank": Case(M, ("1.3588,1,", "1.3588,,"), 8, "unit", "blank"),
    "year not whole": Case("sources.csv", ("2014", "2014.5"), 2, "year", "wrong-type", "2014"),
    "year impossible": Case("sources.csv", ("2010", "20100"), 3, "year", "out-of-bounds"),
    "doi with address": Case("sources.csv", ("10.1234", "https://doi.org/10.1234"), 3, "doi",
                             "wrong-shape", "10.1234/moments"),
    "kind unknown": Case("sources.csv", ("compilation", "compilations"), 3, "kind", "not-in-list",
                         "compilation"),
    "source blank": Case("sources.csv", ("An older table", ""), 5, "citation", "blank"),
    "slug with capitals": Case(S, ("trans-dce,", "Trans_DCE,"), 7, "solvent", "wrong-shape",
                               "trans-dce"),
    "date impossible": Case("stock.csv", ("2026-02-01", "2026-02-31"), 2, "opened", "wrong-type"),
    "date the other way": Case("handling.csv", ("H336,Flammables cabinet,,2025-05-02",
                               "H336,Flammables cabinet,,31.05.2025"), 2, "sds_revision",
                               "wrong-type", "2025-05-31"),
    # --- keys and references
    "slug twice": Case(S, ("trans-dce,", "cis-dce,"), 7, "solvent", "duplicate-key", "line 6"),
    "value twice": Case(M, lambda d: d + b"acetone,density,0.785,g/cm3,,25.0,handbook,,\n", 21,
                        "solvent", "duplicate-key", "line 7"),
    "source twice": Case("sources.csv", ("old-table,", "own,"), 5, "source", "duplicate-key"),
    "container twice": Case("stock.csv", ("A2", "A1"), 3, "container", "duplicate-key"),
    "curve twice": Case(C, lambda d: d + d.splitlines(keepends=True)[1], 4, "solvent",
                        "duplicate-key", "line 2"),
    "substance unknown": Case(M, ("acetone,dipole", "acetne,dipole"), 9, "solvent",
                              "unknown-solvent", "acetone"),
    "substance by its name": Case("stock.csv", ("A2,toluene", "A2,methylbenzene"), 3, "solvent",
                                  "unknown-solvent", "toluene"),
    "substance not there": Case("handling.csv", ("toluene", "pyridine"), 3, "solvent",
                                "unknown-solvent", "datasheets add"),
    "source unknown": Case(M, ("0.03,,gas", "0.03,,gass"), 9, "source", "unknown-source", "gas"),
    # --- quantities, units, values
    "quantity misspelt": Case(M, ("refractive_index", "refractiv_index"), 8, "quantity",
                              "unknown-quantity", "refractive_index"),
    "quantity by another name": Case(M, ("relative_permittivity,80.1", "dielectric constant,80.1"),
                                     2, "quantity", "unknown-quantity", "relative_permittivity"),
    "quantity derived": Case(M, ("dipole_moment", "molar_volume"), 9, "quantity",
                             "derived-quantity", "by itself"),
    "customary uncertainty of nothing": Case(
        "uncertainties.csv", ("relative_permittivity", "permitivity"), 2, "quantity",
        "unknown-quantity", "relative_permittivity"),
    "unit unreadable": Case(M, ("0.7845,g/cm3", "0.7845,g/qcm"), 7, "unit", "unknown-unit",
                            "g/cm3"),
    "unit of another thing": Case(M, ("2.88,D", "2.88,g/cm3"), 9, "unit", "wrong-dimension", "D"),
    "point shifted": Case(M, ("80.1", "801"), 2, "value", "out-of-bounds", "80.1"),
    "other unit": Case(M, ("0.7845", "784.5"), 7, "value", "out-of-bounds", "kg/m3"),
    "sign wrong": Case(M, ("36.64", "-36.64"), 13, "value", "out-of-bounds"),
    "temperature in kelvin": Case(M, ("0.0001,20", "0.0001,293.15"), 3, "temperature_c",
                                  "temperature-in-kelvin", "20"),
    "temperature in rounded kelvin": Case(M, ("20.7,1,,25", "20.7,1,,298"), 6, "temperature_c",
                                          "temperature-in-kelvin", "25"),
    "temperature below zero": Case(M, ("1.3588,1,,20", "1.3588,1,,-300"), 8, "temperature_c",
                                   "out-of-bounds"),
    "temperature missing": Case(M, ("9.2,1,,25", "9.2,1,,"), 19, "temperature_c",
                                "missing-temperature"),
    "temperature without use": Case(M, ("0.03,,gas", "0.03,25,gas"), 9, "temperature_c",
                                    "needless-temperature", "blank"),
    "boiling point in kelvin": Case(M, ("56.05", "329.2"), 10, "value", "mixed-scale", "56"),
    "melting point in kelvin": Case(M, ("-94.7", "178.15"), 12, "value", "mixed-scale", "-95"),
    "uncertainty zero": Case(M, ("0.0001", "0"), 3, "uncertainty", "zero-uncertainty", "blank"),
    "uncertainty negative": Case(M, ("0.03,", "-0.03,"), 9, "uncertainty", "out-of-bounds"),
    # --- curves
    "form unknown": Case(C, ("polynomial", "polynom"), 2, "form", "unknown-form", "polynomial"),
    "coefficient missing": Case(C, (" -32.445", ""), 3, "coefficients", "coefficient-count",
                                "all coefficients"),
    "coefficient unreadable": Case(C, ("1312.253", "1312.25a"), 3, "coefficients", "coefficients"),
    "coefficients with commas": Case(C, ("6.42448 1312.253 -32.445", '"6,42448 1312,253 -32,445"'),
                                     3, "coefficients", "coefficients", "6.42448 1312.253 -32.445"),
    "range upside down": Case(C, ("0,99", "99,0"), 2, "t_max_c", "empty-range", "99"),
    "range in kelvin": Case(C, ("0,99", "273.15,99"), 2, "t_min_c", "temperature-in-kelvin", "0"),
    "end in kelvin": Case(C, ("0,99", "0,372.15"), 2, "t_max_c", "temperature-in-kelvin", "99"),
    "curve of degrees Celsius": Case(C, ("249.21 -0.79069 0.00072997", "87.74 -0.4"),
                                     2, "coefficients", "curve-out-of-bounds", "°C"),
    "curve uncertainty zero": Case(C, ("0,99,,", "0,99,0,"), 2, "uncertainty", "zero-uncertainty"),
    # --- who the substances are
    "cas misshapen": Case(S, ("67-64-1", "67641"), 3, "cas", "cas-shape", "67-64-1"),
    "cas mistyped": Case(S, ("67-64-1", "67-46-1"), 3, "cas", "cas-check-digit", "67-64-1"),
    "cas made a date": Case(S, ("75-05-8", "1975-05-08"), 4, "cas", "cas-date", "75-05-8"),
    "cas made a German date": Case(S, ("75-05-8", "08.05.1975"), 4, "cas", "cas-date", "75-05-8"),
    "cas made an English date": Case(S, ("75-05-8", "5/8/1975"), 4, "cas", "cas-date", "75-05-8"),
    "cas made a month": Case(S, ("75-05-8", "May-75"), 4, "cas", "cas-date", "75-05-8"),
    "cas made a date in words": Case(S, ("75-05-8", "8 May 1975"), 4, "cas", "cas-date",
                                     "75-05-8"),
    "cas made a day number": Case(S, ("75-05-8", "27522"), 4, "cas", "cas-date", "75-05-8"),
    "cas twice": Case(S, ("108-88-3,Cc1ccccc1", "75-05-8,CC#N"), 5, "cas", "duplicate-cas",
                      "line 4"),
    "structure unreadable": Case(S, ("Cc1ccccc1", "Cc1ccccc"), 5, "smiles", "unreadable-structure",
                                 "108-88-3"),
    "structure twice": Case(S, lambda d: d + b"house,House solvent 7,999-99-5,C(C)(=O)C,,\n", 8,
                            "smiles", "duplicate-structure", "line 3"),
    "structure of another": Case(S, ("67-64-1,CC(C)=O", "67-64-1,CCO"), 3, "smiles",
                                 "structure-cas-mismatch", "CC(=O)C"),
    "structure of an isomer": Case(S, ("67-64-1,CC(C)=O", "67-64-1,CCC=O"), 3, "smiles",
                                   "structure-cas-mismatch", "CC(=O)C"),
    "structure of the stereoisomer": Case(S, ("156-59-2,Cl/C=C\\Cl", "156-59-2,Cl/C=C/Cl"), 6,
                                          "smiles", "structure-cas-mismatch", "156-60-5"),
    "number of another": Case(S, ("67-64-1,CC(C)=O", "64-17-5,CC(C)=O"), 3, "cas",
                              "structure-cas-mismatch", "67-64-1"),
    # --- decisions, stock, handling
    "corrected value gone": Case(M, ("0.90", "0.867"), 2, "published_value",
                                 "expired-correction", "0.867"),
    "corrected temperature gone": Case("corrections.csv", (",20,0.90", ",25,0.90"), 2,
                                       "temperature_c", "expired-correction", "20"),
    "corrected curve gone": Case("corrections.csv", ("-32.445", "-32.4"), 4, "published_value",
                                 "expired-correction", "-32.445"),
    "replacement missing": Case("corrections.csv", ("0.8669", ""), 2, "replacement",
                                "missing-replacement"),
    "replacement no number": Case("corrections.csv", ("0.8669", '"0,8669"'), 2, "replacement",
                                  "wrong-type", "0.8669"),
    "replacement impossible": Case("corrections.csv", ("0.8669", "866.9"), 2, "replacement",
                                   "out-of-bounds", "g/cm3"),
    "replacement without use": Case("corrections.csv", ("keep,,Measured", "keep,56,Measured"), 3,
                                    "replacement", "needless-replacement", "blank"),
    "curve replaced": Case("corrections.csv", ("keep,,Compared", "replace,,Compared"), 4, "action",
                           "replaced-curve", "exclude"),
    "action unknown": Case("corrections.csv", ("replace,0.8669", "replaced,0.8669"), 2, "action",
                           "not-in-list", "replace"),
    "opened too early": Case("stock.csv", ("2026-02-01", "2025-02-01"), 2, "opened",
                             "opened-before-received"),
    "hazard in words": Case("handling.csv", ("H225 H319 H336", "H225; h319"), 2, "h_statements",
                            "hazard-statement", "H225 H319"),
    "risk phrase": Case("handling.csv", ("H225 H319 H336", "R11"), 2, "h_statements",
                        "hazard-statement", "codes"),
    "peroxide group unknown": Case("handling.csv", ("Flammables cabinet,,2025-05-02,own\ntoluene",
                                   "Flammables cabinet,D,2025-05-02,own\ntoluene"), 2,
                                   "peroxide_group", "not-in-list", "A, B, C"),
}  # fmt: skip
# Where the fault shows in another file than the one that was edited.
SHOWS_IN = {"corrected value gone": "corrections.csv"}


@pytest.fixture
def tables(tmp_path: Path) -> Path:
    """The small tables, without a fault."""
    folder = tmp_path / "data"
    folder.mkdir()
    for name, text in TABLES.items():
        (folder / name).write_text(text, encoding="utf-8", newline="")
    for name in (table.path for table in shipped_schema().values()):
        if name not in TABLES:
            (folder / name).write_text(shipped_file(name).decode().split("\n", 1)[0] + "\n")
    (folder / "datapackage.json").write_bytes(shipped_file("datapackage.json"))
    return folder


def _found(folder: Path) -> tuple[Problem, ...]:
    try:
        return check_folder(folder)
    except DatasetError as error:
        return error.problems


def test_the_small_tables_are_in_order(tables: Path) -> None:
    assert _found(tables) == ()


def test_the_corpus_is_large() -> None:
    assert len(BROKEN) >= 100


@pytest.mark.parametrize("name", BROKEN)
def test_one_fault_is_told_once_in_its_place(tables: Path, name: str) -> None:
    case = BROKEN[name]
    case.apply(tables)
    errors = [problem for problem in _found(tables) if problem.severity == "error"]
    places = [(e.file, e.line, e.column, e.kind) for e in errors]
    assert places == [(SHOWS_IN.get(name, case.file), case.line, case.column, case.kind)]
    assert case.advice in errors[0].hint
    assert errors[0].found
    assert errors[0].expected


def test_three_faults_in_three_files_are_told_in_one_run(tables: Path) -> None:
    cases = [BROKEN[name] for name in ("point shifted", "cas made a date", "form unknown")]
    for case in cases:
        case.apply(tables)
    result = CliRunner().invoke(main, ["check", "--data", str(tables), "--json"])
    assert result.exit_code == 1
    told = [(p["file"], p["line"], p["column"], p["kind"]) for p in json.loads(result.output)]
    assert sorted(told) == sorted((c.file, c.line, c.column, c.kind) for c in cases)


def test_the_command_prints_place_and_advice(tables: Path) -> None:
    BROKEN["temperature in kelvin"].apply(tables)
    result = CliRunner().invoke(main, ["check", "--data", str(tables)])
    assert result.exit_code == 1
    for part in ("measurements.csv, line 3, column temperature_c", "293.15 °C", "instead:  20"):
        assert part in result.output
    assert "Errors: 1. Suspect values: 0. Notes: 0." in result.output


def test_misuse_is_told_from_faults(tables: Path) -> None:
    assert CliRunner().invoke(main, ["check", "--data", str(tables), "--colour"]).exit_code == 2
    assert CliRunner().invoke(main, ["check", "--data", str(tables / S)]).exit_code == 2


@pytest.mark.parametrize(
    ("edit", "kinds"),
    [
        (lambda text: "\ufeff" + text, ["byte-order-mark"]),
        (lambda text: text.replace("\n", "\r\n"), []),
        (lambda text: text + "\n,,,,,,,,\n\n", []),
        (lambda text: text.replace("0.9982", "0.9982\u00a0"), ["odd-space"]),
        (lambda text: text.replace("mPa s", "mPa\u202fs"), ["odd-space"]),
        (lambda text: text.replace("-94.7", "\u221294.7"), ["minus-sign"]),
        (lambda text: text.replace(",", ";"), ["separator"]),
        (lambda text: text.replace(",", "\t"), ["separator"]),
        (lambda text: text.removesuffix("\n"), ["no-last-line-end"]),
        (lambda text: text.replace("\n", ",,\n"), []),
    ],
    ids=["bom", "crlf", "blank rows", "nbsp", "thin space", "minus", "semicolons", "tabs",
         "last line end", "blank columns"],
)  # fmt: skip
def test_what_spreadsheets_add_is_read_all_the_same(
    tables: Path, edit: Callable[[str], str], kinds: list[str]
) -> None:
    before = [row.cells for row in read_tables(tables)[M[:-4]].rows]
    (tables / M).write_bytes(edit(TABLES[M]).encode())
    found = _found(tables)
    assert [problem.kind for problem in found] == kinds
    assert {problem.severity for problem in found} <= {"note"}
    assert [row.cells for row in read_tables(tables)[M[:-4]].rows] == before


def test_notes_do_not_change_the_exit_status(tables: Path) -> None:
    (tables / M).write_bytes(b"\xef\xbb\xbf" + TABLES[M].encode())
    result = CliRunner().invoke(main, ["check", "--data", str(tables)])
    assert result.exit_code == 0
    assert "note: measurements.csv, line 1 [byte-order-mark]" in result.output
    assert "Errors: 0." in result.output
    assert "Notes: 1." in result.output


def test_a_kelvin_temperature_is_believed_where_the_value_is_another_one(tables: Path) -> None:
    """Water at 300 °C under pressure: the value is not that of 27 °C, where a row tells it."""
    extra = "water,relative_permittivity,20.1,1,,300,handbook,,\n"
    (tables / M).write_text(TABLES[M] + extra, encoding="utf-8")
    assert _found(tables) == ()


def test_a_correction_settles_what_would_be_an_error(tables: Path) -> None:
    BROKEN["point shifted"].apply(tables)
    with (tables / "corrections.csv").open("a", encoding="utf-8") as file:
        file.write("water,relative_permittivity,handbook,20,801,replace,80.1,Shifted,2026-03-02\n")
    assert _found(tables) == ()


@pytest.mark.parametrize(
    ("case", "advice"),
    [
        (Case(M, ("0.0001", "1.5"), 3, "uncertainty", "large-uncertainty"), "percent"),
        (
            Case(
                C,
                ("-0.79069 0.00072997,0,99", "-0.6,0,180"),
                2,
                "coefficients",
                "curve-out-of-bounds",
            ),
            "signs",
        ),
    ],
    ids=["uncertainty in percent", "curve off at one end"],
)
def test_what_is_only_doubtful_is_published_with_a_flag(
    tables: Path, case: Case, advice: str
) -> None:
    case.apply(tables)
    (found,) = _found(tables)
    assert (found.file, found.line, found.column) == (case.file, case.line, case.column)
    assert (found.kind, found.severity) == (case.kind, "suspect")
    assert advice in found.hint


@settings(
    max_examples=80, deadline=None, suppress_health_check=[HealthCheck.function_scoped_fixture]
)
@given(
    st.sampled_from(sorted(TABLES)),
    st.integers(0, 1000),
    st.integers(0, 1000),
    st.text(max_size=8)
    | st.sampled_from(
        ["0", "-1", "1e300", "nan", "K", "m**1e9", "10**10**10", "delta_degC", "kg kg"]
    )
    | st.sampled_from(
        ["1 2 3 4", "rackett", "wagner", "[U]", "0-0-0", "Jan 85", "acetone", "keep"]
    ),
)
def test_no_cell_makes_the_check_stumble(
    tables: Path, file: str, row: int, column: int, text: str
) -> None:
    """Whatever a cell holds: it is told, or the tables can be used."""
    rows = list(csv.reader(io.StringIO(TABLES[file])))
    cells = rows[1 + row % (len(rows) - 1)]
    cells[column % len(cells)] = text
    with (tables / file).open("w", encoding="utf-8", newline="") as out:
        csv.writer(out, lineterminator="\n").writerows(rows)
    if not any(problem.severity == "error" for problem in _found(tables)):
        assert load_dataset(tables).solvents
    (tables / file).write_text(TABLES[file], encoding="utf-8")


@pytest.mark.build
def test_nothing_is_published_from_broken_tables(
    tables: Path,
    tmp_path: Path,
    monkeypatch: pytest.MonkeyPatch,
    caplog: pytest.LogCaptureFixture,
) -> None:
    """Each fault by itself: exit status 1, its place in the message, the last site untouched."""
    monkeypatch.setenv("NO_MKDOCS_2_WARNING", "1")
    config = tmp_path / "mkdocs.yml"
    config.write_text(
        "site_name: Broken\ntheme: material\ndocs_dir: pages\n"
        "plugins:\n  - search\n  - datasheets:\n      data: data\n"
    )
    (tmp_path / "pages").mkdir()
    (tmp_path / "pages" / "by-hand.md").write_text("# By hand\n")
    site = tmp_path / "site"
    (site / "solvents").mkdir(parents=True)
    (site / "index.html").write_bytes(b"<p>the last good one\r\n\x00")
    (site / "404.html").write_text("<p>not found")
    (site / "solvents" / "water.html").write_text("<h1>Water</h1>")
    sound = tmp_path / "sound"
    shutil.copytree(tables, sound)
    before = _content(site)
    for name, case in BROKEN.items():
        shutil.rmtree(tables)
        shutil.copytree(sound, tables)
        case.apply(tables)
        result = CliRunner().invoke(main, ["build", "--config", str(config), "--site", str(site)])
        assert result.exit_code == 1, name
        place = Problem(
            SHOWS_IN.get(name, case.file), case.line, case.column, case.kind, "", "", ""
        ).place
        assert f"{place} [{case.kind}]" in result.output + caplog.text, name
        caplog.clear()
        assert _content(site) == before, name
        assert not list(tmp_path.glob(".site-*")), name


def _content(site: Path) -> dict[str, bytes]:
    return {str(p.relative_to(site)): p.read_bytes() for p in site.rglob("*") if p.is_file()}
