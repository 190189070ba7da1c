"""A CSV file held cell by cell, so that changing one cell leaves every other byte as it is."""

from __future__ import annotations

import re
from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass, replace
from functools import lru_cache

_BOM = "\ufeff"
_INVISIBLE = "\u200b\u200c\u200d\u2060\ufeff"
_LINE_END = re.compile(r"\r\n|\r|\n")


@dataclass(frozen=True, slots=True)
class Record:
    """One record: its first physical line, its cells with their quotes, and its line end."""

    line: int
    raw: tuple[str, ...]
    ending: str

    @property
    def cells(self) -> tuple[str, ...]:
        """The cells without their quotes."""
        return tuple(map(_unquoted, self.raw))


@dataclass(frozen=True, slots=True)
class CsvFile:
    """The records of one file: ``records`` in order, blank ones included, the header first.

    Joining the records again gives the file's text to the letter.
    """

    records: tuple[Record, ...]
    delimiter: str = ","
    newline: str = "\n"
    has_bom: bool = False

    @property
    def columns(self) -> tuple[str, ...]:
        """The cells of the header, without blanks and invisible letters round them."""
        header = self.records[0].cells if self.records else ()
        return tuple(cell.strip().strip(_INVISIBLE) for cell in header)

    @property
    def body(self) -> tuple[int, ...]:
        """Positions in ``records`` of the rows that hold anything, header aside."""
        return tuple(
            position
            for position, record in enumerate(self.records)
            if position and any(cell.strip() for cell in record.cells)
        )

    def __bytes__(self) -> bytes:
        text = "".join(self.delimiter.join(r.raw) + r.ending for r in self.records)
        return ((_BOM if self.has_bom else "") + text).encode()

    def patched(
        self,
        edits: Mapping[int, Mapping[str, str]],
        dropped: frozenset[int],
        inserted: Mapping[int, Sequence[Mapping[str, str]]],
    ) -> CsvFile:
        """The file with cells changed, rows dropped and rows put behind others.

        All three are keyed by position in ``records``; a row is cells by column. Text is quoted
        where it must be, and where the cell it replaces was.
        """
        records: list[Record] = []
        for position, record in enumerate(self.records):
            if position not in dropped:
                records.append(self._edited(record, edits.get(position, {})))
            for row in inserted.get(position, ()):
                if records and not records[-1].ending:
                    records[-1] = replace(records[-1], ending=self.newline)
                raw = tuple(self._quoted(row.get(name, "")) for name in self.columns)
                records.append(Record(0, raw, self.newline))
        return replace(self, records=tuple(records))

    def _edited(self, record: Record, edit: Mapping[str, str]) -> Record:
        if not edit:
            return record
        raw = list(record.raw)
        for name, text in edit.items():
            place = self.columns.index(name)
            raw += [""] * (place + 1 - len(raw))
            raw[place] = self._quoted(text, always=raw[place].startswith('"'))
        return replace(record, raw=tuple(raw))

    def _quoted(self, text: str, *, always: bool = False) -> str:
        if always or any(letter in text for letter in (self.delimiter, '"', "\n", "\r")):
            return '"' + text.replace('"', '""') + '"'
        return text


def parse(data: bytes, delimiter: str) -> CsvFile:
    """The records of a file in UTF-8. Raises ``UnicodeDecodeError`` for other encodings."""
    text = data.decode("utf-8")
    has_bom = text.startswith(_BOM)
    text = text.removeprefix(_BOM)
    return CsvFile(
        tuple(_records(text, delimiter)),
        delimiter,
        "\r\n" if "\r\n" in text else "\n",
        has_bom,
    )


@lru_cache(maxsize=4)
def _cell(delimiter: str) -> re.Pattern[str]:
    plain = rf"[^{re.escape(delimiter)}\r\n]*"
    return re.compile(rf'"(?:[^"]|"")*"{plain}|{plain}')


def _records(text: str, delimiter: str) -> Iterator[Record]:
    cell = _cell(delimiter)
    position, line = 0, 1
    while position < len(text):
        raw, first = [], line
        while True:
            found = cell.match(text, position)
            assert found is not None  # the pattern matches the empty text as well
            raw.append(found[0])
            line += len(_LINE_END.findall(found[0]))
            position = found.end()
            if not text.startswith(delimiter, position):
                break
            position += 1
        end = _LINE_END.match(text, position)
        yield Record(first, tuple(raw), end[0] if end else "")
        position = end.end() if end else position
        line += 1


def _unquoted(raw: str) -> str:
    if not raw.startswith('"'):
        return raw
    body, _, behind = raw[1:].rpartition('"')
    return body.replace('""', '"') + behind
