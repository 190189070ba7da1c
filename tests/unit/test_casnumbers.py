"""CAS numbers: check digit, slips, and what a spreadsheet makes of one."""

from __future__ import annotations

from datetime import date, timedelta

import pytest
from hypothesis import assume, given
from hypothesis import strategies as st

from generator import casnumbers

# Numbers as printed on labels everywhere, from memory.
PRINTED = ("7732-18-5", "67-64-1", "64-17-5", "108-88-3", "75-05-8", "67-68-5", "127-19-5")


@st.composite
def numbers(draw: st.DrawFn) -> str:
    head = draw(st.integers(10, 9_999_999))
    middle = draw(st.integers(0, 99))
    digits = f"{head}{middle:02d}"
    return f"{head}-{middle:02d}-{casnumbers.check_digit(digits)}"


@pytest.mark.parametrize("number", PRINTED)
def test_printed_numbers_are_valid(number: str) -> None:
    assert casnumbers.is_valid(number)
    assert casnumbers.respelled(number.replace("-", "")) == number
    assert casnumbers.respelled(f"CAS {number.replace('-', '–')}") == number


@given(numbers(), st.data())
def test_one_wrong_digit_is_noticed(number: str, data: st.DataObject) -> None:
    place = data.draw(st.sampled_from([i for i, c in enumerate(number) if c.isdigit()]))
    digit = data.draw(st.sampled_from([d for d in "0123456789" if d != number[place]]))
    wrong = number[:place] + digit + number[place + 1 :]
    # The weights run from 1 to 9; a digit of weight w is caught unless w times the change is a
    # multiple of ten.
    from_right = sum(c.isdigit() for c in number[place:]) - 1
    change = int(digit) - int(number[place])
    assume(wrong[0] != "0")
    assert casnumbers.is_valid(wrong) == (from_right * change % 10 == 0 and from_right > 0)


@given(numbers(), st.data())
def test_swapped_neighbours_are_among_the_slips(number: str, data: st.DataObject) -> None:
    digits = number.replace("-", "")
    place = data.draw(st.integers(0, len(digits) - 2))
    wrong = digits[:place] + digits[place + 1] + digits[place] + digits[place + 2 :]
    assume(wrong != digits and wrong[0] != "0")
    typed = f"{wrong[:-3]}-{wrong[-3:-1]}-{wrong[-1]}"
    if not casnumbers.is_valid(typed):
        assert number in casnumbers.slips(typed)


@st.composite
def dated(draw: st.DrawFn) -> tuple[str, date]:
    """A number that spreadsheets take for a date, with that date."""
    head = draw(st.integers(30, 99) | st.integers(10, 29) | st.integers(1900, 9999))
    month = draw(st.integers(1, 12))
    last = casnumbers.check_digit(f"{head}{month:02d}")
    assume(last != "0")
    year = head + (1900 if head >= 30 else 2000) if head < 100 else head
    return f"{head}-{month:02d}-{last}", date(year, month, int(last))


@given(dated())
def test_a_number_comes_back_from_every_spelling_of_its_date(case: tuple[str, date]) -> None:
    number, day = case
    english = day.strftime("%b")
    spellings = [
        day.isoformat(),
        f"{day.isoformat()} 00:00:00",
        f"{day.year}/{day.month}/{day.day}",
        f"{day.day:02d}.{day.month:02d}.{day.year}",
        f"{day.day}/{day.month}/{day.year}",
        f"{day.month}/{day.day}/{day.year}",
        f"{day.day}-{english}-{day.year}",
        f"{day.day} {day.strftime('%B')} {day.year}",
        f"{day.strftime('%B')} {day.day}, {day.year}",
        f"{english}-{day.year % 100:02d}" if 1930 <= day.year <= 2029 else f"{english} {day.year}",
        f"{day.month}/{day.year}",
    ]
    for text in spellings:
        assert casnumbers.is_date(text), text
        assert number in casnumbers.from_date(text), text
    if day > date(1900, 3, 1):
        serial = (day - date(1899, 12, 30)) // timedelta(days=1)
        assert number in casnumbers.from_date(str(serial))
        assert not casnumbers.is_date(str(serial))


@given(numbers())
def test_a_number_is_no_date_by_itself(number: str) -> None:
    assert casnumbers.is_valid(number)
    assert not casnumbers.is_date(number.replace("-", ""))
