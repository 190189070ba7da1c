"""The one description of the tables: understood here as any stranger's reader understands it."""

from __future__ import annotations

import json
import warnings
from pathlib import Path
from typing import Any

import pytest

from generator import dataset
from generator.errors import DatasetError
from generator.schema import DESCRIPTION, NEEDED, read_package, read_schema, shipped_schema

ROOT = Path(__file__).resolve().parents[2]


@pytest.fixture
def package() -> dict[str, Any]:
    description: dict[str, Any] = json.loads((ROOT / "data" / DESCRIPTION).read_text())
    return description


def test_a_strangers_reader_finds_the_shipped_tables_valid(monkeypatch: pytest.MonkeyPatch) -> None:
    """Frictionless: the reference reader of Tabular Data Packages."""
    with warnings.catch_warnings():
        warnings.simplefilter("ignore")  # of the library about its own dependencies
        from frictionless import Package

        monkeypatch.chdir(ROOT)
        report = Package("data/datapackage.json").validate()
    assert report.valid, report.flatten(["title", "rowNumber", "fieldName", "note"])
    assert [task.name for task in report.tasks] == list(shipped_schema())


def test_both_readers_find_the_same_columns_keys_and_references(package: dict[str, Any]) -> None:
    from frictionless import Schema

    for resource in package["resources"]:
        theirs = Schema.from_descriptor(resource["schema"])
        ours = shipped_schema()[resource["name"]]
        assert list(ours.columns) == theirs.field_names
        assert list(ours.key) == theirs.primary_key
        assert [(r.field, r.table, r.column) for r in ours.references] == [
            (key["fields"][0], key["reference"]["resource"], key["reference"]["fields"][0])
            for key in theirs.foreign_keys
        ]
        assert [f.required for f in ours.fields] == [f.required for f in theirs.fields]


def test_every_column_has_its_help() -> None:
    for table in shipped_schema().values():
        for field in table.fields:
            assert field.description.endswith("."), (table.name, field.name)
            assert field.type in ("string", "number", "integer", "date")


def test_the_tables_needed_are_those_the_dataset_is_made_of() -> None:
    made_of = {"usual": "uncertainties"}
    fields = {"solvents", "sources", "measurements", "correlations", "corrections", "stock",
              "handling", "usual"}  # fmt: skip
    assert fields <= set(dataset.Dataset.__dataclass_fields__)
    assert {made_of.get(name, name) for name in fields} == set(NEEDED)


def test_a_decimal_comma_can_be_declared(package: dict[str, Any]) -> None:
    field = package["resources"][1]["schema"]["fields"][2]
    assert field["name"] == "value"
    field["decimalChar"] = ","
    assert read_schema(package)["measurements"].fields[2].decimal_comma


@pytest.mark.parametrize(
    ("text", "line", "kind"),
    [
        (None, 0, "missing-table"),
        ("{", 1, "bad-description"),
        ('{\n"resources": [\n}', 3, "bad-description"),
        ("[]", 0, "bad-description"),
        ('{"resources": [{"name": "solvents"}]}', 0, "bad-description"),
        ('{"resources": []}', 0, "bad-description"),
    ],
)
def test_a_description_that_cannot_be_used_is_told_with_its_place(
    tmp_path: Path, text: str | None, line: int, kind: str
) -> None:
    if text is not None:
        (tmp_path / DESCRIPTION).write_text(text)
    with pytest.raises(DatasetError) as caught:
        read_package(tmp_path)
    problem = caught.value.problems[0]
    assert (problem.file, problem.line, problem.kind) == (DESCRIPTION, line, kind)


def test_a_description_of_another_encoding_is_told(tmp_path: Path) -> None:
    (tmp_path / DESCRIPTION).write_bytes('{"title": "Lösemittel"}'.encode("latin-1"))
    with pytest.raises(DatasetError, match="encoding"):
        read_package(tmp_path)


def test_a_column_missing_from_the_description_is_named(
    tmp_path: Path, package: dict[str, Any]
) -> None:
    fields = package["resources"][1]["schema"]["fields"]
    fields[:] = [field for field in fields if field["name"] != "unit"]
    (tmp_path / DESCRIPTION).write_text(json.dumps(package))
    with pytest.raises(DatasetError, match="unit of the table measurements"):
        read_package(tmp_path)
