"""A workbook as an ``.ods`` file (OpenDocument 1.3, ISO/IEC 26300). Equal sheets, equal bytes."""

from __future__ import annotations

import io
import re
import zipfile
from collections.abc import Iterator, Sequence
from xml.sax.saxutils import escape, quoteattr

from generator.spreadsheet import NUMBER, SPARE_ROWS, Column, Sheet, letters

_TYPE = "application/vnd.oasis.opendocument.spreadsheet"
_HEAD = '<?xml version="1.0" encoding="UTF-8"?>\n'
_NAMESPACES = " ".join(
    [
        'office:version="1.3"',
        *(
            f'xmlns:{name}="urn:oasis:names:tc:opendocument:xmlns:{name}:1.0"'
            for name in ("office", "table", "text", "style", "config", "meta", "manifest")
        ),
        'xmlns:number="urn:oasis:names:tc:opendocument:xmlns:datastyle:1.0"',
        'xmlns:fo="urn:oasis:names:tc:opendocument:xmlns:xsl-fo-compatible:1.0"',
        'xmlns:dc="http://purl.org/dc/elements/1.1/"',
        'xmlns:of="urn:oasis:names:tc:opendocument:xmlns:of:1.2"',
    ]
)
# The number format of each style is "text", so that what is typed stays as it is typed.
_STYLES = """\
<number:text-style style:name="plain"><number:text-content/></number:text-style>
<style:style style:name="text" style:family="table-cell" style:data-style-name="plain"/>
<style:style style:name="number" style:family="table-cell" style:data-style-name="plain">
<style:table-cell-properties style:text-align-source="fix"/>
<style:paragraph-properties fo:text-align="end"/></style:style>
<style:style style:name="head" style:family="table-cell" style:data-style-name="plain">
<style:table-cell-properties fo:border-bottom="0.75pt solid #000000"/>
<style:text-properties fo:font-weight="bold"/></style:style>
<style:style style:name="shown" style:family="table"><style:table-properties/></style:style>
<style:style style:name="hidden" style:family="table">\
<style:table-properties table:display="false"/></style:style>
"""
_CHARACTER = 0.19  # cm
# What XML cannot hold, and tabs, which spreadsheet programs drop from cells.
_FORBIDDEN = re.compile("[\x00-\x09\x0b\x0c\x0e-\x1f\ufffe\uffff]")
_EPOCH = (1980, 1, 1, 0, 0, 0)


def write(sheets: Sequence[Sheet], title: str) -> bytes:
    """The file's bytes. Every cell is text, whatever it looks like: no formula, no date."""
    meta = f"<office:meta><dc:title>{escape(title)}</dc:title></office:meta>"
    parts = {
        "mimetype": _TYPE,
        "content.xml": _document("content", "".join(_content(sheets))),
        "meta.xml": _document("meta", meta),
        "settings.xml": _document("settings", _settings(sheets)),
    }
    entries = "".join(
        f'<manifest:file-entry manifest:full-path="{path}" manifest:media-type="{kind}"/>'
        for path, kind in (("/", _TYPE), *((path, "text/xml") for path in list(parts)[1:]))
    )
    parts["META-INF/manifest.xml"] = (
        f"{_HEAD}<manifest:manifest "
        'xmlns:manifest="urn:oasis:names:tc:opendocument:xmlns:manifest:1.0" '
        f'manifest:version="1.3">{entries}</manifest:manifest>'
    )
    buffer = io.BytesIO()
    with zipfile.ZipFile(buffer, "w") as archive:
        for path, text in parts.items():
            # The type stands first and uncompressed, so that programs find it.
            packed = zipfile.ZIP_STORED if path == "mimetype" else zipfile.ZIP_DEFLATED
            archive.writestr(zipfile.ZipInfo(path, _EPOCH), text.encode(), packed)
    return buffer.getvalue()


def _document(kind: str, body: str) -> str:
    return f"{_HEAD}<office:document-{kind} {_NAMESPACES}>{body}</office:document-{kind}>"


def _content(sheets: Sequence[Sheet]) -> Iterator[str]:
    columns = [
        (f"rule-{s}-{c}", f"width-{s}-{c}", sheet, place, column)
        for s, sheet in enumerate(sheets)
        for c, (place, column) in enumerate(enumerate(sheet.columns))
    ]
    yield f"<office:automatic-styles>{_STYLES}"
    for _, width, _, _, column in columns:
        yield (
            f'<style:style style:name="{width}" style:family="table-column">'
            f'<style:table-column-properties style:column-width="{column.width * _CHARACTER:.2f}cm"'
            "/></style:style>"
        )
    yield "</office:automatic-styles><office:body><office:spreadsheet><table:content-validations>"
    for rule, _, sheet, place, column in columns:
        yield _rule(rule, sheet, place, column)
    yield "</table:content-validations>"
    for number, sheet in enumerate(sheets):
        yield from _table(number, sheet)
    yield "<table:database-ranges>"
    for number, sheet in enumerate(sheets):
        if sheet.rows:
            corner = f"{letters(len(sheet.columns) - 1)}{len(sheet.rows) + 1}"
            name = _quoted(sheet.name)
            area = quoteattr(f"{name}.A1:{name}.{corner}")
            yield (
                f'<table:database-range table:name="__Anonymous_Sheet_DB__{number}" '
                f'table:target-range-address={area} table:display-filter-buttons="true"/>'
            )
    yield "</table:database-ranges></office:spreadsheet></office:body>"


def _quoted(name: str) -> str:
    return "'" + name.replace("'", "''") + "'"


def _rule(rule: str, sheet: Sheet, place: int, column: Column) -> str:
    if column.choices:
        letter, name = letters(column.choices.column), _quoted(column.choices.sheet)
        span = f"[${name}.${letter}$2:.${letter}${column.choices.rows + 1}]"
        condition = f"of:cell-content-is-in-list({span})"
    else:
        formula = column.condition(f"[.{letters(place)}2]", ";", "")
        if not formula:
            return ""
        condition = f"of:is-true-formula({formula})"
    base = f"{_quoted(sheet.name)}.{letters(place)}2"
    return (
        f'<table:content-validation table:name="{rule}" table:condition={quoteattr(condition)} '
        f'table:allow-empty-cell="true" table:base-cell-address={quoteattr(base)}>'
        f"<table:error-message table:title={quoteattr(column.title)} table:display="
        f'"true" table:message-type="warning">{_paragraphs(column.advice)}</table:error-message>'
        "</table:content-validation>"
    )


def _table(number: int, sheet: Sheet) -> Iterator[str]:
    look = "hidden" if sheet.hidden else "shown"
    yield f'<table:table table:name={quoteattr(sheet.name)} table:style-name="{look}">'
    kinds, spare = [], []
    for place, column in enumerate(sheet.columns):
        kind = NUMBER if column.kind == NUMBER else "text"
        ruled = column.choices or column.kind != "text"
        rule = f' table:content-validation-name="rule-{number}-{place}"' if ruled else ""
        kinds.append(f'table:style-name="{kind}"{rule}')
        spare.append(f"<table:table-cell {kinds[-1]}/>")
        yield (
            f'<table:table-column table:style-name="width-{number}-{place}" '
            f'table:default-cell-style-name="{kind}"/>'
        )
    yield "<table:table-row>"
    for column in sheet.columns:
        note = f"<office:annotation>{_paragraphs(column.help)}</office:annotation>"
        yield (
            '<table:table-cell table:style-name="head" office:value-type="string">'
            f"{note if column.help else ''}{_paragraphs(column.title)}</table:table-cell>"
        )
    yield "</table:table-row>"
    for row in sheet.rows:
        yield "<table:table-row>"
        for kind, cell in zip(kinds, row, strict=True):
            if cell:
                yield f'<table:table-cell {kind} office:value-type="string">'
                yield f"{_paragraphs(cell)}</table:table-cell>"
            else:
                yield f"<table:table-cell {kind}/>"
        yield "</table:table-row>"
    yield f'<table:table-row table:number-rows-repeated="{SPARE_ROWS}">{"".join(spare)}'
    yield "</table:table-row></table:table>"


_SPACES = re.compile("^ | {2,}| $")


def _paragraphs(text: str) -> str:
    """Text a paragraph a line; blanks that XML would swallow are spelled out."""
    lines = _FORBIDDEN.sub("", text).replace("\r\n", "\n").replace("\r", "\n").split("\n")
    return "".join(f"<text:p>{_spaced(line)}</text:p>" for line in lines)


def _spaced(line: str) -> str:
    line = escape(line)
    return _SPACES.sub(lambda found: f'<text:s text:c="{len(found[0])}"/>', line)


def _settings(sheets: Sequence[Sheet]) -> str:
    """The head of every sheet stays in sight."""

    def item(name: str, kind: str, value: object) -> str:
        return (
            f'<config:config-item config:name="{name}" config:type="{kind}">{value}'
            "</config:config-item>"
        )

    tables = "".join(
        f"<config:config-item-map-entry config:name={quoteattr(sheet.name)}>"
        + item("VerticalSplitMode", "short", 2)
        + item("VerticalSplitPosition", "int", 1)
        + item("ActiveSplitRange", "short", 2)
        + item("PositionBottom", "int", 1)
        + "</config:config-item-map-entry>"
        for sheet in sheets
    )
    return (
        '<office:settings><config:config-item-set config:name="ooo:view-settings">'
        '<config:config-item-map-indexed config:name="Views"><config:config-item-map-entry>'
        + item("ViewId", "string", "view1")
        + item("ActiveTable", "string", escape(sheets[0].name))
        + f'<config:config-item-map-named config:name="Tables">{tables}'
        "</config:config-item-map-named></config:config-item-map-entry>"
        "</config:config-item-map-indexed></config:config-item-set></office:settings>"
    )
