"""What a workbook is made of, whoever writes it; reading one back as text."""

from __future__ import annotations

import datetime
from dataclasses import dataclass
from pathlib import Path

from generator.differences import Digits

# Rows below the last one that are ready for typing: text format, drop-downs.
SPARE_ROWS = 1000
LONGEST_CELL = 32_767  # characters; what the common programs can hold
TEXT, NUMBER, DATE = "text", "number", "date"


@dataclass(frozen=True, slots=True)
class Choices:
    """Cells of another sheet that a drop-down offers: one column, ``rows`` rows under its head."""

    sheet: str
    column: int
    rows: int


@dataclass(frozen=True, slots=True)
class Column:
    """One column: its title, its help, and what may be typed into it.

    ``width`` is in characters; ``kind`` is ``text``, ``number`` or ``date`` (cells of all three
    are held as text, to the digit); ``low`` and ``high`` bound a number.
    """

    title: str
    help: str = ""
    width: int = 12
    kind: str = TEXT
    low: float | None = None
    high: float | None = None
    choices: Choices | None = None

    @property
    def advice(self) -> str:
        """What to type, for whoever typed something else."""
        if self.choices:
            return "This is not in the list. The check tells whether it can stand."
        if self.kind == DATE:
            return "A date is typed as year-month-day: 2026-03-31."
        limits = (("at least", self.low), ("at most", self.high))
        bounds = " and ".join(f"{word} {limit:g}" for word, limit in limits if limit is not None)
        return f"A number with a decimal point{bounds and f', {bounds}'}, and nothing else."

    def condition(self, cell: str, comma: str, function_prefix: str) -> str:
        """The spreadsheet formula that holds for what may be typed into ``cell``, "" for any."""
        if self.kind == DATE:
            return f"AND(LEN({cell})=10{comma}ISNUMBER(DATEVALUE({cell})))"
        if self.kind != NUMBER:
            return ""
        number = f'{function_prefix}NUMBERVALUE({cell}{comma}"."{comma}" ")'
        bounds = ((">=", self.low), ("<=", self.high))
        terms = [f"{number}{sign}{limit:g}" for sign, limit in bounds if limit is not None]
        return f"AND({comma.join([f'ISNUMBER({number})', *terms])})"


@dataclass(frozen=True, slots=True)
class Sheet:
    """One sheet: a frozen head of titles and rows of text below it."""

    name: str
    columns: tuple[Column, ...]
    rows: tuple[tuple[str, ...], ...]
    hidden: bool = False


def letters(column: int) -> str:
    """The letters of a column counted from 0: A to Z, then AA."""
    above, last = divmod(column, 26)
    return (letters(above - 1) if above else "") + chr(ord("A") + last)


def read(path: Path) -> dict[str, list[list[str]]]:
    """Every sheet of an ``.xlsx`` or ``.ods`` file: its rows of text, from the first row down.

    A number cell gives the shortest text of its value, marked as ``Digits``; a date cell gives
    year-month-day. Raises ``ValueError`` when the file cannot be read.
    """
    from python_calamine import CalamineError, CalamineWorkbook

    try:
        book = CalamineWorkbook.from_path(path)
        found = {
            name: book.get_sheet_by_name(name).to_python(skip_empty_area=False)
            for name in book.sheet_names
        }
    except (CalamineError, OSError) as error:
        raise ValueError(str(error)) from error
    return {name: [[_text(value) for value in row] for row in rows] for name, rows in found.items()}


def _text(value: object) -> str:
    if isinstance(value, bool):
        return str(value).upper()
    if isinstance(value, float | int):
        whole = float(value).is_integer() and abs(value) < 1e15
        return Digits(int(value) if whole else repr(float(value)))
    if isinstance(value, datetime.datetime):
        at_midnight = value.time() == datetime.time()
        return value.date().isoformat() if at_midnight else value.isoformat(" ")
    if isinstance(value, datetime.date):
        return value.isoformat()
    return str(value)
