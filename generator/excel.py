"""A workbook as an ``.xlsx`` file (ECMA-376). Equal sheets give equal bytes."""

from __future__ import annotations

import datetime
import io
from collections.abc import Iterable
from typing import Any

from generator.spreadsheet import NUMBER, SPARE_ROWS, Column, Sheet, letters

_COMMENT_WIDTH = 40  # characters
_TEXT = 49  # the built-in number format "@"


def write(sheets: Iterable[Sheet], title: str) -> bytes:
    """The file's bytes. Every cell is text, whatever it looks like: no formula, no date."""
    import xlsxwriter

    buffer = io.BytesIO()
    book = xlsxwriter.Workbook(buffer, {"in_memory": True})
    # A fixed day, so that the same tables give the same file.
    book.set_properties({"title": title, "created": datetime.datetime(2000, 1, 1)})
    styles = {
        "head": book.add_format({"num_format": _TEXT, "bold": True, "bottom": 1}),
        "text": book.add_format({"num_format": _TEXT}),
        NUMBER: book.add_format({"num_format": _TEXT, "align": "right"}),
    }
    for sheet in sheets:
        _add(book, sheet, styles)
    book.close()
    return buffer.getvalue()


def _add(book: Any, sheet: Sheet, styles: dict[str, Any]) -> None:
    page = book.add_worksheet(sheet.name)
    if sheet.hidden:
        page.hide()
    page.freeze_panes(1, 0)
    last = len(sheet.rows)
    for place, column in enumerate(sheet.columns):
        style = styles.get(column.kind, styles["text"])
        page.set_column(place, place, column.width, style)
        page.write_string(0, place, column.title, styles["head"])
        if column.help:
            lines = -(-len(column.help) // _COMMENT_WIDTH) + 1
            size = {"x_scale": 2.2, "height": 18 * lines, "author": ""}
            page.write_comment(0, place, column.help, size)
        for number, row in enumerate(sheet.rows, start=1):
            if row[place]:
                page.write_string(number, place, row[place], style)
        rule = _rule(column, place)
        if rule:
            page.data_validation(1, place, last + SPARE_ROWS, place, rule)
    # Digits are kept as text on purpose; the program need not point at each of them.
    corner = f"{letters(len(sheet.columns) - 1)}{last + SPARE_ROWS + 1}"
    page.ignore_errors({"number_stored_as_text": f"A1:{corner}"})
    if last:
        page.autofilter(0, 0, last, len(sheet.columns) - 1)


def _rule(column: Column, place: int) -> dict[str, Any] | None:
    shared = {"error_type": "warning", "error_title": column.title, "error_message": column.advice}
    if column.choices:
        choices = column.choices
        letter = letters(choices.column)
        source = f"='{choices.sheet}'!${letter}$2:${letter}${choices.rows + 1}"
        return {"validate": "list", "source": source, **shared}
    condition = column.condition(f"{letters(place)}2", ",", "_xlfn.")
    return {"validate": "custom", "value": f"={condition}", **shared} if condition else None
