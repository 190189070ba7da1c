"""One cell of a table as a spreadsheet leaves it → clean text, and what is wrong with it."""

from __future__ import annotations

import math
import re
from collections.abc import Iterator
from datetime import date
from difflib import get_close_matches
from typing import NamedTuple

from generator.casnumbers import is_date, readings
from generator.schema import Field

ERROR, NOTE = "error", "note"
_MINUS = "\u2212"
# What bytes that are no UTF-8 are decoded to.
_UNREADABLE = "\ufffd"
# Spaces that look like a space and are none.
_SPACES = re.compile("[\u00a0\u2000-\u200a\u202f\u205f\u3000]")
_INVISIBLE = re.compile("[\u200b-\u200d\u2060\ufeff]")
_ERROR_CELLS = re.compile(r"#(N/A|REF!|VALUE!|DIV/0!|NAME\?|NUM!|NULL!|NV|WERT!|BEZUG!|#+)", re.I)
_NUMBER = re.compile(r"[+-]?(\d+(\.\d*)?|\.\d+)([eE][+-]?\d+)?", re.ASCII)
_COMMA_NUMBER = re.compile(r"[+-]?\d+,\d+([eE][+-]?\d+)?", re.ASCII)
_GROUPED = re.compile(r"[+-]?\d{1,3}([., ]\d{3})+([.,]\d+)?", re.ASCII)
# UTF-8 taken for the encoding of old spreadsheets shows as two or more letters of this kind.
_FOREIGN = re.compile("[\u0080-\U0010ffff]{2,}")


class Fault(NamedTuple):
    """What is wrong with a cell; see ``errors.Problem`` for the parts."""

    kind: str
    found: str
    expected: str
    hint: str
    severity: str = ERROR


def plain(text: str) -> str:
    """The text with ordinary spaces, without invisible marks, and with nothing around it."""
    return _INVISIBLE.sub("", _SPACES.sub(" ", text)).strip()


def is_number(text: str) -> bool:
    """Whether a text is a finite number with a decimal point."""
    return _NUMBER.fullmatch(text) is not None and math.isfinite(float(text))


def read_cell(field: Field, cell: str) -> tuple[str, tuple[Fault, ...]]:
    """The cell as clean text, "" where it cannot be used, and what is wrong with it."""
    if _UNREADABLE in cell:
        hint = "save the table again as CSV UTF-8, then type the marked letters anew"
        return cell.strip(), (Fault("encoding", repr(cell), "UTF-8 text", hint),)
    text = plain(cell)
    faults = list(_faults(field, cell, text))
    unusable = any(fault.severity == ERROR for fault in faults)
    if field.type == "string":
        return ("" if _ERROR_CELLS.fullmatch(text) else text), tuple(faults)
    if not text or (unusable and not _is_typed(field, text)):
        return "", tuple(faults)
    return _as_number(field, text) if field.type != "date" else text, tuple(faults)


def _is_typed(field: Field, text: str) -> bool:
    """Whether a cell is of its column's type, whatever else is wrong with it."""
    if field.type == "date":
        return _is_iso(text)
    number = _as_number(field, text)
    return is_number(number) and (field.type != "integer" or float(number).is_integer())


def _as_number(field: Field, text: str) -> str:
    text = text.replace(_MINUS, "-")
    return text.replace(",", ".") if field.decimal_comma else text


def _faults(field: Field, cell: str, text: str) -> Iterator[Fault]:
    if text != cell.strip(" \t\r\n"):
        hint = f"{text}; nothing to do, it is read so"
        yield Fault("odd-space", repr(cell), "plain spaces", hint, NOTE)
    if _ERROR_CELLS.fullmatch(text):
        yield Fault("spreadsheet-error", text, "a value, or a blank cell",
                    "mend the formula in the spreadsheet, or leave the cell blank")  # fmt: skip
    elif not text:
        if field.required:
            yield Fault("blank", "a blank cell", field.description, f"type the {field.name}")
    elif field.type in ("number", "integer"):
        yield from _number_faults(field, text)
    elif field.type == "date":
        if not _is_iso(text):
            yield Fault("wrong-type", text, "a date as year-month-day, 2026-03-31",
                        " or ".join(_dates(text)) or "the date as year-month-day")  # fmt: skip
    else:
        yield from _text_faults(field, text)


def _number_faults(field: Field, text: str) -> Iterator[Fault]:
    number = _as_number(field, text)
    if _MINUS in text:
        hint = f"{number}; nothing to do, it is read so"
        yield Fault("minus-sign", text, "the hyphen as minus sign", hint, NOTE)
    if not is_number(number):
        yield _no_number(text, number)
        return
    value = float(number)
    if field.type == "integer" and not value.is_integer():
        yield Fault("wrong-type", text, "a whole number", f"{value:.0f}")
    elif field.low is not None and value < field.low:
        yield Fault("out-of-bounds", text, f"at least {field.low:g}", field.description)
    elif field.high is not None and value > field.high:
        yield Fault("out-of-bounds", text, f"at most {field.high:g}", field.description)


def _no_number(text: str, number: str) -> Fault:
    if _COMMA_NUMBER.fullmatch(number):
        hint = f"{number.replace(',', '.')} (or declare the comma: decimalChar in datapackage.json)"
        return Fault("decimal-comma", text, "a decimal point", hint)
    if is_date(number):
        once = " or ".join(_numbers_of_date(number)) or "the number"
        return Fault("number-as-date", text, "a number; a spreadsheet has turned it into a date",
                     f"{once}: look it up again, and format the column as text")  # fmt: skip
    if _GROUPED.fullmatch(number):
        return Fault("wrong-type", text, "digits without separators between thousands",
                     "the number with a point for the decimals and nothing else")  # fmt: skip
    start = re.match(_NUMBER, number)
    hint = f"{start[0]}, with its unit in a column of its own" if start else "the number"
    return Fault("wrong-type", text, "a number", hint)


def _text_faults(field: Field, text: str) -> Iterator[Fault]:
    mended = text if text.isascii() else _FOREIGN.sub(_decoded, text)
    if mended != text:
        yield Fault("mojibake", text, "the letters meant; UTF-8 was read as something else", mended)
    elif field.enum and text not in field.enum:
        near = get_close_matches(text.lower(), field.enum, 1)
        one_of = f"one of {', '.join(field.enum)}"
        yield Fault("not-in-list", text, one_of, near[0] if near else one_of)
    elif field.pattern and not re.fullmatch(field.pattern, text):
        hint = _reshaped(text, field.pattern) or f"text of the shape {field.pattern}"
        yield Fault("wrong-shape", text, field.description, hint)


def _decoded(letters: re.Match[str]) -> str:
    """Letters that are UTF-8 read as another encoding, read rightly; others as they are."""
    try:
        return b"".join(map(_byte, letters[0])).decode()
    except UnicodeError:
        return letters[0]


def _byte(letter: str) -> bytes:
    """The byte that old spreadsheets show as this letter; five of them they leave as they are."""
    try:
        return letter.encode("cp1252")
    except UnicodeError:
        return letter.encode("latin-1")


def _is_iso(text: str) -> bool:
    try:
        return date.fromisoformat(text).isoformat() == text
    except ValueError:
        return False


def _dates(text: str) -> Iterator[str]:
    """A date in any usual spelling as year-month-day; several where its order is not clear."""
    for year, month, day in sorted(readings(text), key=str):
        if day is not None:
            yield f"{year:04d}-{month:02d}-{day:02d}"


def _numbers_of_date(text: str) -> tuple[str, ...]:
    """The numbers a spreadsheet may have turned into this date: 1.85 becomes January 1985."""
    found: dict[str, None] = {}
    for year, month, day in readings(text):
        if day is None:
            found[f"{month}.{year % 100:02d}"] = None
        else:
            found |= dict.fromkeys((f"{day}.{month}", f"{month}.{day}"))
    return tuple(found)


def _reshaped(text: str, pattern: str) -> str:
    """The text in the shape asked for, where that is plain: lower case, hyphens, no address."""
    words = "-".join(re.findall(r"[a-z0-9]+", text.lower()))
    if re.fullmatch(pattern, words):
        return words
    inside = re.search(pattern, text)
    return inside[0] if inside else ""
