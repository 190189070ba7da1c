"""What is wrong with the tables: every problem with its place, all of them at once."""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import asdict, dataclass

_ADVICE = {"error": "instead: ", "suspect": "settle by:", "note": "outcome: "}


@dataclass(frozen=True, slots=True, order=True)
class Problem:
    """One thing wrong in one place, and what to type instead.

    ``file`` is the name inside the data folder, ``line`` the physical line (the header is line 1,
    0 stands for the whole file), ``column`` the column's name ("" for the whole line).
    ``kind`` is a slug such as ``cas-check-digit``. ``severity`` is ``error`` (nothing is built),
    ``suspect`` (published with a flag) or ``note`` (read all the same, and only said). A
    cross-check adds its ``evidence`` in numbers and its ``strength``, by which the review list is
    ordered (how many times the usual spread).
    """

    file: str
    line: int
    column: str
    kind: str
    found: str
    expected: str
    hint: str
    severity: str = "error"
    evidence: str = ""
    strength: float = 0.0

    @property
    def place(self) -> str:
        """File, line and column in one phrase."""
        parts = [self.file]
        if self.line:
            parts.append(f"line {self.line}")
        if self.column:
            parts.append(f"column {self.column}")
        return ", ".join(parts)

    def as_dict(self) -> dict[str, str | int | float]:
        """The fields by name, for machine-readable output."""
        return asdict(self)

    def __str__(self) -> str:
        lines = [
            f"{self.severity}: {self.place} [{self.kind}]",
            f"    found:    {self.found}",
            f"    expected: {self.expected}",
            f"    evidence: {self.evidence}" if self.evidence else "",
            f"    {_ADVICE.get(self.severity, 'advice:  ')} {self.hint}",
        ]
        return "\n".join(line for line in lines if line)


class DatasetError(Exception):
    """The tables cannot be used. ``problems`` holds every problem found, in order of place.

    Its text has the errors alone: they are what must be put right.
    """

    def __init__(self, problems: Iterable[Problem]) -> None:
        self.problems = tuple(sorted(problems))
        errors = [problem for problem in self.problems if problem.severity == "error"]
        head = f"{len(errors)} error{'' if len(errors) == 1 else 's'} in the tables"
        super().__init__("\n".join([head, *map(str, errors)]))
