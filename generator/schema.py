"""What the tables look like, read from their one description, ``datapackage.json``."""

from __future__ import annotations

import json
from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from functools import lru_cache
from pathlib import Path
from typing import Any

from generator.errors import DatasetError, Problem

DESCRIPTION = "datapackage.json"
# The tables a handbook cannot be made without; others may be described as well.
NEEDED = (
    "solvents", "measurements", "correlations", "sources", "uncertainties", "corrections", "stock",
    "handling",
)  # fmt: skip
_SHIPPED = Path(__file__).parents[1] / "data"


@dataclass(frozen=True, slots=True)
class Field:
    """One column, after the Table Schema of the Data Package standard.

    ``type`` is string, number, integer or date. ``decimal_comma`` is true where the description
    declares it (``"decimalChar": ","``). ``low`` and ``high`` bound a number.
    """

    name: str
    type: str
    description: str
    required: bool = False
    unique: bool = False
    enum: tuple[str, ...] = ()
    pattern: str = ""
    low: float | None = None
    high: float | None = None
    decimal_comma: bool = False


@dataclass(frozen=True, slots=True)
class Reference:
    """Cells of column ``field`` must stand in column ``column`` of ``table``."""

    field: str
    table: str
    column: str


@dataclass(frozen=True, slots=True)
class TableSchema:
    """One table: its file, its columns in order, its key, what its cells refer to."""

    name: str
    path: str
    fields: tuple[Field, ...]
    key: tuple[str, ...]
    references: tuple[Reference, ...]

    @property
    def columns(self) -> tuple[str, ...]:
        """Names of the columns in order."""
        return tuple(field.name for field in self.fields)


def read_package(folder: Path) -> Mapping[str, Any]:
    """The description of the tables in ``folder`` as parsed JSON.

    Raises ``DatasetError`` when it is missing or cannot be read.
    """
    path = folder / DESCRIPTION
    try:
        package: dict[str, Any] = json.loads(path.read_text(encoding="utf-8-sig"))
        lacking = _lacking(read_schema(package)) if folder != _SHIPPED else []
    except FileNotFoundError:
        problem = _problem(
            0, "missing-table", "no such file", f"{DESCRIPTION}, which describes the tables"
        )
        raise DatasetError([problem]) from None
    except UnicodeDecodeError as error:
        raise DatasetError([_problem(0, "encoding", str(error), "UTF-8 text")]) from error
    except json.JSONDecodeError as error:
        raise DatasetError(
            [_problem(error.lineno, "bad-description", error.msg, "valid JSON")]
        ) from error
    except (KeyError, TypeError, AttributeError) as error:
        raise DatasetError(
            [
                _problem(
                    0, "bad-description", f"{error!r} while reading it", "a Tabular Data Package"
                )
            ]
        ) from error
    if lacking:
        raise DatasetError(lacking)
    return package


def _lacking(found: Mapping[str, TableSchema]) -> list[Problem]:
    """The tables and columns that a description must have and does not."""
    problems = []
    for name in NEEDED:
        expected = shipped_schema()[name].columns
        columns = found[name].columns if name in found else ()
        missing = [column for column in expected if column not in columns]
        if missing:
            what = f"{', '.join(missing)} of the table {name}"
            problems.append(
                _problem(0, "bad-description", f"nothing about {what}", "every table and column")
            )
    return problems


def _problem(line: int, kind: str, found: str, expected: str) -> Problem:
    hint = f"take {DESCRIPTION} back from the last good revision"
    return Problem(DESCRIPTION, line, "", kind, found, expected, hint)


def read_schema(package: Mapping[str, Any]) -> dict[str, TableSchema]:
    """The tables of a parsed description, by name, in its order."""
    return {resource["name"]: _table(resource) for resource in package["resources"]}


def shipped_file(name: str) -> bytes:
    """One of the shipped files, as a new folder of tables starts with it."""
    return (_SHIPPED / name).read_bytes()


@lru_cache(maxsize=1)
def shipped_schema() -> Mapping[str, TableSchema]:
    """The shipped tables, by name, in the order of their description."""
    return read_schema(read_package(_SHIPPED))


def _table(resource: Mapping[str, Any]) -> TableSchema:
    schema = resource["schema"]
    return TableSchema(
        resource["name"],
        resource["path"],
        tuple(_field(field) for field in schema["fields"]),
        _names(schema.get("primaryKey", ())),
        tuple(
            Reference(
                _names(key["fields"])[0],
                key["reference"]["resource"],
                _names(key["reference"]["fields"])[0],
            )
            for key in schema.get("foreignKeys", ())
        ),
    )


def _names(value: str | Sequence[str]) -> tuple[str, ...]:
    return (value,) if isinstance(value, str) else tuple(value)


def _field(field: Mapping[str, Any]) -> Field:
    rules = field.get("constraints", {})
    return Field(
        field["name"],
        field["type"],
        field.get("description", ""),
        bool(rules.get("required", False)),
        bool(rules.get("unique", False)),
        tuple(rules.get("enum", ())),
        rules.get("pattern", ""),
        rules.get("minimum"),
        rules.get("maximum"),
        field.get("decimalChar", ".") == ",",
    )
