"""One cell as a spreadsheet leaves it: read rightly, or named with what it must have been."""

from __future__ import annotations

import pytest
from hypothesis import given
from hypothesis import strategies as st

from generator.cells import is_number, read_cell
from generator.schema import Field

NUMBER = Field("value", "number", "The value.", required=True)
OPTIONAL = Field("temperature_c", "number", "Temperature.", low=-273.15)
WITH_COMMA = Field("value", "number", "The value.", decimal_comma=True)
TEXT = Field("name", "string", "The name.")
DAY = Field("opened", "date", "The day.")

SPACES = st.text(" \t\u00a0\u2009\u202f\u3000", max_size=3)


def _kinds(field: Field, cell: str) -> list[str]:
    return [fault.kind for fault in read_cell(field, cell)[1]]


@given(st.floats(allow_nan=False, allow_infinity=False), SPACES, SPACES)
def test_any_printed_number_is_read_as_it_stands(value: float, before: str, after: str) -> None:
    text, faults = read_cell(NUMBER, f"{before}{value!r}{after}")
    assert float(text) == value
    assert {fault.severity for fault in faults} <= {"note"}


@given(st.decimals(allow_nan=False, allow_infinity=False, min_value="-1e9", max_value="1e9"))
def test_all_printed_digits_are_kept(value: object) -> None:
    assert read_cell(NUMBER, f"{value}")[0] == f"{value}"


@given(st.floats(0.001, 1e6).filter(lambda x: "e" not in repr(x)))
def test_the_typographic_minus_is_one(value: float) -> None:
    text, (note,) = read_cell(NUMBER, f"\u2212{value!r}")
    assert float(text) == -value
    assert (note.kind, note.severity) == ("minus-sign", "note")


@given(st.integers(-999, 999), st.integers(0, 999))
def test_a_decimal_comma_is_refused_unless_declared(whole: int, decimals: int) -> None:
    comma, point = f"{whole},{decimals}", f"{whole}.{decimals}"
    text, (fault,) = read_cell(NUMBER, comma)
    assert (text, fault.kind) == ("", "decimal-comma")
    assert fault.hint.startswith(point)
    assert read_cell(WITH_COMMA, comma) == (point, ())


@given(st.text(max_size=12))
def test_what_is_read_as_a_number_is_one(cell: str) -> None:
    text, faults = read_cell(NUMBER, cell)
    errors = [fault for fault in faults if fault.severity == "error"]
    assert bool(errors) == (text == "")
    assert text == "" or is_number(text)


@pytest.mark.parametrize(
    "text", ["nan", "inf", "1e999", "0x10", "1_000", "1 000", "١٢", "--1", "."]
)
def test_what_only_looks_like_a_number_is_none(text: str) -> None:
    assert not is_number(text)
    assert _kinds(NUMBER, text) == ["wrong-type"]


@pytest.mark.parametrize(
    ("cell", "number"),
    [
        ("Jan 85", "1.85"),
        ("Mai 85", "5.85"),
        ("1985-01-01", "1.1"),
        ("2026-05-08", "8.5"),
        ("08.05.2026", "8.5"),
        ("8/5/2026", "5.8"),
        ("8-May", None),
    ],
)
def test_a_number_turned_into_a_date_is_recognised(cell: str, number: str | None) -> None:
    text, (fault,) = read_cell(NUMBER, cell)
    assert text == ""
    if number is None:
        assert fault.kind == "wrong-type"
    else:
        assert fault.kind == "number-as-date"
        assert number in fault.hint.split(":")[0].split(" or ")


@given(st.text(st.characters(min_codepoint=0x20, max_codepoint=0x2FFF, exclude_categories=["C"])))
def test_letters_mangled_by_another_encoding_come_back(text: str) -> None:
    """Any text, once its UTF-8 is taken for the encoding of old spreadsheets."""
    bytes_ = text.encode()
    mangled = "".join(_as_spreadsheets_show(byte) for byte in bytes_)
    # White space is cleaned first, and a space that does not break is a byte of many letters.
    lost = any(mark in mangled for mark in "\u00a0\u00ad\u0085")
    if text.isascii() or text != text.strip() or lost:
        return
    faults = read_cell(TEXT, mangled)[1]
    assert [fault.kind for fault in faults] == ["mojibake"]
    assert faults[0].hint == text


def _as_spreadsheets_show(byte: int) -> str:
    try:
        return bytes([byte]).decode("cp1252")
    except UnicodeDecodeError:
        return chr(byte)


@pytest.mark.parametrize(
    "text",
    ["Müller", "β-pinene", "Ørsted", "½ saturated", "naïve", "20 °C ± 0,1", "“quoted”",
     "à la Ångström", "ÄÖÜ", "n²", "µS·m⁻¹", "Öl für Überdruck", "水"],
)  # fmt: skip
def test_letters_that_are_right_are_left_alone(text: str) -> None:
    assert read_cell(TEXT, text) == (text, ())


@pytest.mark.parametrize("cell", ["#N/A", "#NV", "#REF!", "#DIV/0!", "#WERT!", "#VALUE!", "#####"])
def test_cells_of_a_broken_spreadsheet(cell: str) -> None:
    for field in (NUMBER, TEXT, DAY):
        text, (fault,) = read_cell(field, cell)
        assert (text, fault.kind) == ("", "spreadsheet-error")


@pytest.mark.parametrize(
    ("cell", "day"),
    [
        ("31.03.2026", "2026-03-31"),
        ("31/3/2026", "2026-03-31"),
        ("5 May 2026", "2026-05-05"),
        ("2026/3/31", "2026-03-31"),
        ("46112", "2026-03-31"),
        ("4/3/2026", "2026-03-04 or 2026-04-03"),
    ],
)
def test_other_dates_come_with_the_one_to_type(cell: str, day: str) -> None:
    text, (fault,) = read_cell(DAY, cell)
    assert (text, fault.kind, fault.hint) == ("", "wrong-type", day)


def test_bounds_leave_the_number_readable() -> None:
    text, (fault,) = read_cell(OPTIONAL, "-300")
    assert (text, fault.kind) == ("-300", "out-of-bounds")
    assert read_cell(OPTIONAL, "") == ("", ())
    assert _kinds(NUMBER, "") == ["blank"]
