"""Downloads: every number once, with its sources; tables and JSON say the same; nothing lost."""

from __future__ import annotations

import csv
import io
import json
from pathlib import Path

import pytest

from generator.catalogue import catalogue
from generator.errors import Problem
from generator.exports import FINDING_COLUMNS, VALUE_COLUMNS, exports
from generator.metrics import Handbook
from generator.overviews import downloads
from generator.quantities import QUANTITIES
from generator.schema import read_package
from generator.values import MARKS

ROOT = Path(__file__).resolve().parents[2]
DATA = ROOT / "data"
FINDING = Problem(
    "solvents.csv", 2, "cas", "cas-check-digit", 'a "quoted", odd value', "7732-18-5", "look",
    severity="suspect", evidence="3 against 5", strength=4.5,
)  # fmt: skip
BASES = {"measured", "curve", "computed", "estimated"}


@pytest.fixture(scope="module")
def files(handbook: Handbook) -> dict[str, bytes]:
    return exports(catalogue(handbook, (FINDING,)), DATA)


@pytest.fixture(scope="module")
def rows(files: dict[str, bytes]) -> list[dict[str, str]]:
    return list(csv.DictReader(io.StringIO(files["downloads/values.csv"].decode())))


def test_numbers_come_back_exactly(rows: list[dict[str, str]], handbook: Handbook) -> None:
    listed = {repr(t): k for k, t in enumerate(handbook.settings.temperatures_c)}
    for row in rows:
        slug, key, at = row["solvent"], row["quantity"], row["temperature_c"]
        if at in listed:
            value = handbook.at(slug, key, handbook.temperatures[listed[at]])
        else:
            value = handbook.at(slug, key)
            assert value is not None
            if value.temperature is None:
                assert at == ""
            else:
                assert float(at) == pytest.approx(value.temperature - 273.15, abs=1e-9)
        assert value is not None
        assert float(row["value"]) == value.value, row
        assert row["uncertainty"] == "" or float(row["uncertainty"]) == value.uncertainty


def test_every_number_of_the_handbook_is_there_once(
    rows: list[dict[str, str]], handbook: Handbook
) -> None:
    places = [(r["solvent"], r["quantity"], r["temperature_c"]) for r in rows]
    assert len(places) == len(set(places))
    exported = set(places)
    for slug in handbook.dataset.solvents:
        for key in QUANTITIES:
            own = handbook.at(slug, key)
            if own is not None:
                at = "" if own.temperature is None else repr(round(own.temperature - 273.15, 9))
                assert (slug, key, at) in exported
            if QUANTITIES[key].needs_temperature:
                for t, value in zip(
                    handbook.settings.temperatures_c, handbook.series(slug, key), strict=True
                ):
                    assert ((slug, key, repr(t)) in exported) >= (value is not None), (slug, key, t)


def test_every_row_is_complete(rows: list[dict[str, str]], handbook: Handbook) -> None:
    assert tuple(rows[0]) == VALUE_COLUMNS
    for row in rows:
        assert row["cas"] == handbook.dataset.solvents[row["solvent"]].cas
        assert row["unit"] == QUANTITIES[row["quantity"]].unit
        assert row["basis"] in BASES
        sources = row["sources"].split("; ")
        assert all(sources), row
        assert set(sources) <= set(handbook.sources), row
        assert set(filter(None, row["marks"].split("; "))) <= set(MARKS), row
        timed = QUANTITIES[row["quantity"]].needs_temperature
        assert (row["temperature_c"] != "") == timed, row


def test_json_says_the_same_as_the_table(
    files: dict[str, bytes], rows: list[dict[str, str]], handbook: Handbook
) -> None:
    whole = json.loads(files["downloads/handbook.json"])
    assert whole["revision"] == handbook.dataset.revision
    assert list(whole["solvents"]) == list(handbook.dataset.solvents)
    flat = [
        (slug, key, entry["temperature_c"], entry["value"], "; ".join(entry["sources"]))
        for slug, solvent in whole["solvents"].items()
        for key, entries in solvent["values"].items()
        for entry in entries
    ]
    table = [
        (
            r["solvent"], r["quantity"],
            float(r["temperature_c"]) if r["temperature_c"] else None, float(r["value"]),
            r["sources"],
        )
        for r in rows
    ]  # fmt: skip
    assert flat == table
    water = whole["solvents"]["water"]
    assert water["inchikey"] == "XLYOFNOQVPJJNP-UHFFFAOYSA-N"
    assert water["family"] == "water"
    assert water["is_polar"] == "polar"
    assert water["trend"]["sign"] == "falls"
    assert water["liquid_range_c"] == pytest.approx([0, 100], abs=0.1)
    assert {s for *_, sources in flat for s in sources.split("; ")} <= set(whole["sources"])


def test_findings_are_exported_with_the_substance_they_concern(files: dict[str, bytes]) -> None:
    (row,) = csv.DictReader(io.StringIO(files["downloads/findings.csv"].decode()))
    assert tuple(row) == FINDING_COLUMNS
    assert row["solvent"] == "water"
    assert row["found"] == 'a "quoted", odd value'
    assert (row["line"], row["strength"], row["severity"]) == ("2", "4.5", "suspect")


def test_tables_are_handed_on_byte_for_byte(files: dict[str, bytes]) -> None:
    handed = {k.removeprefix("downloads/data/"): v for k, v in files.items() if "/data/" in k}
    assert handed.keys() == {"datapackage.json"} | {p.name for p in DATA.glob("*.csv")}
    for name, content in handed.items():
        assert content == (DATA / name).read_bytes(), name


def test_every_link_of_the_downloads_page_leads_to_a_file(files: dict[str, bytes]) -> None:
    linked = {entry.link.href for entry in downloads(read_package(DATA))}
    assert linked == {path for path in files if not path.startswith("downloads/solvents/")}


def test_numbers_of_one_substance_are_its_rows_of_the_whole(
    files: dict[str, bytes], handbook: Handbook
) -> None:
    head, *lines = files["downloads/values.csv"].decode().splitlines()
    apart = []
    for slug in handbook.dataset.solvents:
        own_head, *own = files[f"downloads/solvents/{slug}.csv"].decode().splitlines()
        assert own_head == head
        apart += own
    assert apart == lines


def test_equal_input_gives_equal_bytes(files: dict[str, bytes], handbook: Handbook) -> None:
    again = exports(catalogue(handbook, (FINDING,)), DATA)
    assert again == files
    assert list(again) == list(files)
