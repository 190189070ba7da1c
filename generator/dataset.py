"""The tables → one frozen ``Dataset``: units converted, corrections applied, rows indexed."""

from __future__ import annotations

from collections import defaultdict
from collections.abc import Iterable, Mapping, Sequence
from dataclasses import dataclass, field, replace
from decimal import Decimal
from functools import cached_property
from pathlib import Path
from typing import TypeVar

from generator.cells import NOTE
from generator.errors import DatasetError
from generator.history import Event, events
from generator.quantities import QUANTITIES
from generator.tables import Row, Tables, read_tables, revisions
from generator.units import ZERO_CELSIUS, convert, convert_difference

# What vacuum has: relative uncertainties are of what the liquid adds to it.
_VACUUM = {"relative_permittivity": 1.0, "refractive_index": 1.0}
# Printed temperatures in °C are compared to this many kelvin.
SAME_TEMPERATURE = 0.005


@dataclass(frozen=True, slots=True)
class Source:
    """Where values come from; the kinds are listed in ``datapackage.json``."""

    key: str
    kind: str
    citation: str
    year: int | None
    doi: str
    line: int


@dataclass(frozen=True, slots=True)
class Solvent:
    """Who a substance is."""

    slug: str
    name: str
    cas: str
    smiles: str
    synonyms: tuple[str, ...]
    note: str
    line: int


@dataclass(frozen=True, slots=True)
class Correction:
    """One decision about a published value. ``temperature`` [K] is None where it has none.

    ``published_value`` and ``replacement`` are as printed, in the unit of the row they mean; for
    a curve ``published_value`` holds its coefficients.
    """

    solvent: str
    quantity: str
    source: str
    temperature: float | None
    published_value: str
    action: str
    replacement: str
    reason: str
    date: str
    line: int


@dataclass(frozen=True, slots=True)
class Measurement:
    """One published value.

    ``value``, ``uncertainty`` (standard, None where not stated) and ``half_width`` (half a unit
    of the last printed digit) are in the unit of the quantity, ``temperature`` in kelvin.
    ``correction`` is the decision that replaced the printed value, if one did.
    """

    solvent: str
    quantity: str
    value: float
    unit: str
    uncertainty: float | None
    half_width: float
    temperature: float | None
    source: str
    method: str
    note: str
    line: int
    printed: str
    printed_unit: str
    correction: Correction | None = None


@dataclass(frozen=True, slots=True)
class Correlation:
    """One temperature curve. ``coefficients`` and ``uncertainty`` as printed, giving ``unit``.

    ``t_min`` and ``t_max`` [K] are the range its source states.
    """

    solvent: str
    quantity: str
    form: str
    unit: str
    coefficients: tuple[float, ...]
    t_min: float
    t_max: float
    uncertainty: float | None
    source: str
    line: int
    printed: str = ""


@dataclass(frozen=True, slots=True)
class Container:
    """One container in stock."""

    container: str
    solvent: str
    grade: str
    size: str
    location: str
    received: str
    opened: str
    test_due: str
    line: int


@dataclass(frozen=True, slots=True)
class Handling:
    """Handling of one substance as the laboratory transcribed it."""

    solvent: str
    h_statements: str
    storage: str
    peroxide_group: str
    sds_revision: str
    source: str
    line: int


@dataclass(frozen=True, slots=True)
class Usual:
    """Customary standard uncertainty: ``absolute`` [the quantity's unit] + ``relative`` × value.

    For the permittivity and the refractive index the value counts from 1, what vacuum has.
    """

    absolute: float
    relative: float
    reason: str


@dataclass(frozen=True)
class Dataset:
    """Everything the tables say.

    ``measurements`` and ``correlations`` hold every row as printed; ``measurements_of`` and
    ``correlations_of`` give those in force, corrections applied. ``usual`` is keyed by kind of
    source and quantity. ``revision`` is a hash of all tables, ``revisions`` of the rows of each
    substance and the sources they name, wherever in the tables they stand.
    """

    folder: Path
    revision: str
    solvents: Mapping[str, Solvent]
    sources: Mapping[str, Source]
    measurements: tuple[Measurement, ...]
    correlations: tuple[Correlation, ...]
    corrections: tuple[Correction, ...]
    stock: tuple[Container, ...]
    handling: tuple[Handling, ...]
    usual: Mapping[tuple[str, str], Usual]
    revisions: Mapping[str, str] = field(default_factory=dict, repr=False)
    history: tuple[Event, ...] = ()

    def measurements_of(self, solvent: str, quantity: str) -> tuple[Measurement, ...]:
        """The values in force of one quantity of one substance, in table order."""
        return self._measured.get((solvent, quantity), ())

    def correlations_of(self, solvent: str, quantity: str) -> tuple[Correlation, ...]:
        """The curves in force of one quantity of one substance, in table order."""
        return self._fitted.get((solvent, quantity), ())

    def usual_uncertainty(self, kind: str, quantity: str, value: float) -> float | None:
        """Customary standard uncertainty [the quantity's unit] for a kind of source, or None."""
        usual = self.usual.get((kind, quantity))
        if usual is None:
            return None
        return usual.absolute + usual.relative * abs(value - _VACUUM.get(quantity, 0.0))

    def decision_on(self, row: Measurement | Correlation) -> Correction | None:
        """The correction that concerns a row of the tables, or None."""
        candidates = self._decisions.get((row.solvent, row.quantity, row.source), ())
        return next((c for c in candidates if concerns(c, row)), None)

    @cached_property
    def _decisions(self) -> Mapping[tuple[str, str, str], Sequence[Correction]]:
        grouped: dict[tuple[str, str, str], list[Correction]] = defaultdict(list)
        for correction in self.corrections:
            key = (correction.solvent, correction.quantity, correction.source)
            grouped[key].append(correction)
        return grouped

    @cached_property
    def _measured(self) -> Mapping[tuple[str, str], tuple[Measurement, ...]]:
        return _grouped(map(self._in_force, self.measurements))

    @cached_property
    def _fitted(self) -> Mapping[tuple[str, str], tuple[Correlation, ...]]:
        excluded = (
            None if (d := self.decision_on(row)) is not None and d.action == "exclude" else row
            for row in self.correlations
        )
        return _grouped(excluded)

    def _in_force(self, row: Measurement) -> Measurement | None:
        decision = self.decision_on(row)
        if decision is None or decision.action == "keep":
            return row
        if decision.action == "exclude":
            return None
        value, half_width = _measure(decision.replacement, row.printed_unit, row.unit)
        return replace(row, value=value, half_width=half_width, correction=decision)


_Row = TypeVar("_Row", Measurement, Correlation)


def _grouped(rows: Iterable[_Row | None]) -> dict[tuple[str, str], tuple[_Row, ...]]:
    grouped: dict[tuple[str, str], list[_Row]] = defaultdict(list)
    for row in rows:
        if row is not None:
            grouped[row.solvent, row.quantity].append(row)
    return {key: tuple(group) for key, group in grouped.items()}


def concerns(correction: Correction, row: Measurement | Correlation) -> bool:
    """Whether a correction means this row: same key, temperature and printed value."""
    key = (correction.solvent, correction.quantity, correction.source)
    if key != (row.solvent, row.quantity, row.source):
        return False
    one = correction.temperature
    other = row.temperature if isinstance(row, Measurement) else None
    if one is None or other is None:
        return one is other and printed_alike(correction.published_value, row.printed)
    near = abs(one - other) <= SAME_TEMPERATURE
    return near and printed_alike(correction.published_value, row.printed)


def printed_alike(one: str, other: str) -> bool:
    """Whether two cells hold the same numbers in the same order, so that 1.0 equals 1."""
    try:
        return [float(part) for part in one.split()] == [float(part) for part in other.split()]
    except ValueError:
        return one == other


def load_dataset(folder: Path) -> Dataset:
    """The dataset of a folder of tables.

    Raises ``DatasetError`` when a table cannot be read. What the rows say is taken as it stands:
    unknown units or quantities (see ``checks``) raise ``ValueError`` or ``KeyError``.
    """
    return dataset_from(read_tables(folder))


def dataset_from(tables: Tables) -> Dataset:
    """The dataset of tables that have been read; see ``load_dataset``."""
    errors = [problem for problem in tables.problems if problem.severity != NOTE]
    if errors:
        raise DatasetError(errors)
    return Dataset(
        tables.folder,
        tables.revision,
        {row["solvent"]: _solvent(row) for row in tables["solvents"].rows},
        {row["source"]: _source(row) for row in tables["sources"].rows},
        tuple(map(_measurement, tables["measurements"].rows)),
        tuple(map(_correlation, tables["correlations"].rows)),
        tuple(map(_correction, tables["corrections"].rows)),
        tuple(map(_container, tables["stock"].rows)),
        tuple(map(_handling, tables["handling"].rows)),
        {
            (row["kind"], row["quantity"]): Usual(
                float(row["absolute"]), float(row["relative"]), row["reason"]
            )
            for row in tables["uncertainties"].rows
        },
        revisions(tables),
        events(tables),
    )


def _solvent(row: Row) -> Solvent:
    synonyms = tuple(part for text in row["synonyms"].split(";") if (part := text.strip()))
    return Solvent(
        row["solvent"], row["name"], row["cas"], row["smiles"], synonyms, row["note"], row.line
    )


def _source(row: Row) -> Source:
    year = int(float(row["year"])) if row["year"] else None
    return Source(row["source"], row["kind"], row["citation"], year, row["doi"], row.line)


def _measurement(row: Row) -> Measurement:
    unit = QUANTITIES[row["quantity"]].unit
    value, half_width = _measure(row["value"], row["unit"], unit)
    stated = row["uncertainty"]
    return Measurement(
        row["solvent"],
        row["quantity"],
        value,
        unit,
        convert_difference(float(stated), row["unit"], unit) if stated else None,
        half_width,
        _kelvin(row["temperature_c"]),
        row["source"],
        row["method"],
        row["note"],
        row.line,
        row["value"],
        row["unit"],
    )


def _measure(text: str, unit: str, to: str) -> tuple[float, float]:
    """A printed number and the half-width of its last digit, both in the unit ``to``."""
    number = Decimal(text)
    exponent = number.as_tuple().exponent
    step = 10.0**exponent if isinstance(exponent, int) else 0.0
    return convert(float(number), unit, to), abs(convert_difference(0.5 * step, unit, to))


def _correlation(row: Row) -> Correlation:
    low, high = float(row["t_min_c"]) + ZERO_CELSIUS, float(row["t_max_c"]) + ZERO_CELSIUS
    return Correlation(
        row["solvent"],
        row["quantity"],
        row["form"],
        row["unit"],
        tuple(float(part) for part in row["coefficients"].split()),
        low,
        high,
        float(row["uncertainty"]) if row["uncertainty"] else None,
        row["source"],
        row.line,
        row["coefficients"],
    )


def _correction(row: Row) -> Correction:
    return Correction(
        row["solvent"],
        row["quantity"],
        row["source"],
        _kelvin(row["temperature_c"]),
        row["published_value"],
        row["action"],
        row["replacement"],
        row["reason"],
        row["date"],
        row.line,
    )


def _container(row: Row) -> Container:
    return Container(
        row["container"],
        row["solvent"],
        row["grade"],
        row["size"],
        row["location"],
        row["received"],
        row["opened"],
        row["test_due"],
        row.line,
    )


def _handling(row: Row) -> Handling:
    return Handling(
        row["solvent"],
        row["h_statements"],
        row["storage"],
        row["peroxide_group"],
        row["sds_revision"],
        row["source"],
        row.line,
    )


def _kelvin(text: str) -> float | None:
    return float(text) + ZERO_CELSIUS if text else None
