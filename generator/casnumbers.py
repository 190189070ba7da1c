"""CAS numbers: check digit, likely slips, and what a spreadsheet may have turned one into."""

from __future__ import annotations

import re
import unicodedata
from collections.abc import Iterator
from datetime import date, timedelta

_SHAPE = re.compile(r"([1-9]\d{1,6})-(\d\d)-(\d)", re.ASCII)
# Hyphens, dashes and the minus sign, as word processors put them between digits.
_DASHES = re.compile(r"\s*[-\u2010-\u2015\u2212\ufe63\uff0d]\s*")
# Day 0 of the serial dates of spreadsheets. Serial 60 is the 29 February 1900 that never was, so
# that this holds from 1 March 1900 on.
_SERIAL_ZERO = date(1899, 12, 30)
_FIRST_SERIAL, _LAST_SERIAL = 61, 2_958_465  # 1 March 1900, 31 December 9999
# First letters of the months in the languages whose spreadsheets print them.
_MONTHS = {
    1: ("jan", "ene", "gen"),
    2: ("feb", "fev"),
    3: ("mar", "mrt", "maer"),
    4: ("apr", "avr", "abr"),
    5: ("may", "mai", "mag", "mei"),
    6: ("jun", "juin", "giu"),
    7: ("jul", "juil", "lug"),
    8: ("aug", "aou", "ago"),
    9: ("sep", "set"),
    10: ("oct", "okt", "ott", "out"),
    11: ("nov",),
    12: ("dec", "dez", "dic"),
}
_TIME = re.compile(r"[T ]+00:00(:00)?(\.0+)?Z?$")
_NUMBERS = re.compile(r"(\d{1,4})[-/. ]+(\d{1,2})[-/. ]+(\d{1,4})\.?", re.ASCII)
_WORDS = re.compile(r"(?:(\d{1,2})[-/. ]+)?([a-z]{3,})[-/., ]+(?:(\d{1,2}), +)?(\d{2,4})")
_MONTH_AND_YEAR = re.compile(r"(\d{1,2})[-/.](\d{4})|(\d{4})[-/.](\d{1,2})", re.ASCII)


def check_digit(digits: str) -> str:
    """The last digit that fits the others: their sum weighted 1, 2, 3 … from the right, mod 10."""
    return str(sum(i * int(d) for i, d in enumerate(reversed(digits), start=1)) % 10)


def is_shaped(text: str) -> bool:
    """Whether ``text`` looks like a CAS number: two to seven digits, two, one."""
    return _SHAPE.fullmatch(text) is not None


def is_valid(text: str) -> bool:
    """Whether ``text`` is a CAS number whose check digit fits."""
    return is_shaped(text) and check_digit(text[:-1].replace("-", "")) == text[-1]


def respelled(text: str) -> str | None:
    """The valid CAS number inside a text written some other way, None where there is none.

    Other dashes, no hyphens, leading zeros, something around it, letters O and l for digits.
    """
    plain = _DASHES.sub("-", unicodedata.normalize("NFKC", text)).strip()
    found = re.findall(r"(?<![\d-])\d{2,10}-\d\d-\d(?![\d-])", plain)
    spellings = [number.lstrip("0") for number in found]
    digits = plain.lstrip("0")
    if re.fullmatch(r"\d{5,10}", digits, re.ASCII):
        spellings.append(f"{digits[:-3]}-{digits[-3:-1]}-{digits[-1]}")
    spellings.append(plain.translate(str.maketrans("OoIlS", "00115")))
    fitting = dict.fromkeys(s for s in spellings if is_valid(s))
    return next(iter(fitting)) if len(fitting) == 1 else None


def slips(cas: str) -> tuple[str, ...]:
    """Valid numbers that differ from a shaped but invalid one by two neighbouring digits swapped.

    The number with the check digit that fits comes last.
    """
    digits = cas.replace("-", "")
    swapped = (
        digits[:i] + digits[i + 1] + digits[i] + digits[i + 2 :] for i in range(len(digits) - 1)
    )
    made = [
        f"{d[:-3]}-{d[-3:-1]}-{d[-1]}" for d in (*swapped, digits[:-1] + check_digit(digits[:-1]))
    ]
    return tuple(dict.fromkeys(number for number in made if is_valid(number)))


# --- dates --------------------------------------------------------------------------------------


def readings(text: str) -> tuple[tuple[int, int, int | None], ...]:
    """Every (year, month, day) that ``text`` may stand for as a date; the day may be lost.

    Year first, day first, month first, month in words, month and year alone, serial number.
    """
    plain = unicodedata.normalize("NFKD", _TIME.sub("", text.strip())).casefold()
    plain = "".join(c for c in plain if not unicodedata.combining(c))
    plain = re.sub(r"(\d+)\s*[年月]\s*", r"\1-", plain).replace("日", "")
    found = dict.fromkeys(r for r in _readings(plain) if _exists(*r))
    return tuple(found)


def _readings(plain: str) -> Iterator[tuple[int, int, int | None]]:
    if match := _NUMBERS.fullmatch(plain):
        first, second, third = match.groups()
        if len(first) >= 3 or int(first) > 31:
            yield _year(first), int(second), int(third)
        else:
            yield _year(third), int(second), int(first)
            yield _year(third), int(first), int(second)
    elif match := _WORDS.fullmatch(plain):
        before, word, after, year = match.groups()
        day = before or after
        for month in _months(word):
            yield _year(year), month, int(day) if day else None
    elif match := _MONTH_AND_YEAR.fullmatch(plain):
        month_first, year_last, year_first, month_last = match.groups()
        yield int(year_last or year_first), int(month_first or month_last), None
    elif re.fullmatch(r"\d{2,7}(\.0+)?", plain, re.ASCII):
        serial = int(float(plain))
        if _FIRST_SERIAL <= serial <= _LAST_SERIAL:
            day_of = _SERIAL_ZERO + timedelta(days=serial)
            yield day_of.year, day_of.month, day_of.day


def _months(word: str) -> Iterator[int]:
    for month, starts in _MONTHS.items():
        if any(word.startswith(start) for start in starts):
            yield month


def _year(digits: str) -> int:
    """Two digits stand for 1930 to 2029, as spreadsheets read them."""
    year = int(digits)
    if len(digits) > 2:
        return year
    return year + (2000 if year < 30 else 1900)


def _exists(year: int, month: int, day: int | None) -> bool:
    try:
        date(year, month, day or 1)
    except ValueError:
        return False
    return True


def is_date(text: str) -> bool:
    """Whether ``text`` looks like a date of any usual kind; a bare number does not."""
    return bool(readings(text)) and not re.fullmatch(r"\d+(\.\d+)?", text.strip())


def from_date(text: str) -> tuple[str, ...]:
    """Valid CAS numbers that a spreadsheet may have turned into the date ``text``.

    A CAS number has the shape year-month-day when its middle is 01 to 12 and its last digit is
    not 0: 75-05-8 becomes 8 May 1975, 2050-08-… a day in August 2050. The year stands for two
    digits, or three or four. Where the day is lost (May-75) the check digit brings it back.
    """
    found = []
    for year, month, day in readings(text):
        heads = [f"{year % 100:02d}"] if 1930 <= year <= 2029 else []
        heads.append(str(year))
        for head in heads:
            digits = f"{head}{month:02d}"
            last = check_digit(digits) if day is None else str(day)
            found.append(f"{head}-{month:02d}-{last}")
    # A last digit of 0 would have been no date, and the spreadsheet would have left it alone.
    return tuple(dict.fromkeys(c for c in found if is_valid(c) and not c.endswith("-0")))
