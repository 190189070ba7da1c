"""Print: one page a substance whatever there is to say, nothing lost, tagged, reproducible."""

from __future__ import annotations

import dataclasses
import datetime
import io
import json
import re
from collections.abc import Callable, Iterator, Mapping, Sequence
from pathlib import Path
from typing import Any

import numpy as np
import pypdf
import pytest
import typst
from click.testing import CliRunner
from markupsafe import Markup
from PIL import Image

from generator import labels, selection, sheets, typesetting
from generator.catalogue import Catalogue, catalogue
from generator.cli import main
from generator.contexts import (
    CAUTION,
    UNCONTROLLED,
    ContainerRow,
    Datasheet,
    Foot,
    HandlingLines,
    MetricGroup,
    Notice,
)
from generator.datasheet import datasheet
from generator.labels import LABEL_SHEETS, LabelSheet, layout_of, print_labels
from generator.metrics import Handbook
from generator.selection import OrderError
from generator.sheets import Edition, print_sheets
from generator.typesetting import qr_code

PPI = 60
FOOT = Foot("Laboratory of the tests", "0f1e2d3c")
DAY = datetime.date(2026, 12, 1)
A4 = Edition("A4", DAY, "https://handbook.example/")
LETTER = dataclasses.replace(A4, paper="Letter")
EDITIONS = pytest.mark.parametrize("edition", [A4, LETTER], ids=lambda e: e.paper)
# Name of a made-up substance, 90 characters; and one that offers no place to break it.
LONG = "1,1,1,2,3,4,4,5,5,5-decafluoro-2-(trifluoromethyl)-3-methoxy-4-(pentafluoroethyl)heptane-x"
UNBROKEN = "perfluoromethylcyclo" * 4 + "hexadecane"
assert len(LONG) == len(UNBROKEN) == 90


@pytest.fixture(scope="module")
def book(handbook: Handbook) -> Catalogue:
    return catalogue(handbook, ())


@pytest.fixture(scope="module")
def acetone(book: Catalogue) -> Datasheet:
    return datasheet(book, "acetone", _pictures("acetone"), FOOT)


def _pictures(slug: str) -> dict[str, str]:
    svg = (
        '<svg xmlns="http://www.w3.org/2000/svg" width="200" height="34" role="img" '
        'aria-label="{}" font-family="sans-serif" font-size="9.5">'
        '<text x="5" y="31">0</text><path d="M5 9H195v10H5z"/></svg>'
    )
    return {f"{slug}:{kind}": svg.format(f"the {kind} of it") for kind in ("scale", "ribbon")}


def with_containers(sheet: Datasheet, count: int) -> Datasheet:
    rows = tuple(
        ContainerRow(
            f"C{i:03}", "for spectroscopy, stabilised", "2.5 L",
            "Flammables cabinet 3 (peroxide formers)", "2026-01-05", "2026-02-06", "2027-02-06",
        )
        for i in range(1, count + 1)
    )  # fmt: skip
    return dataclasses.replace(sheet, containers=rows)


def with_notices(sheet: Datasheet, count: int) -> Datasheet:
    notices = tuple(
        Notice("check", "Check", f"finding {i}: " + "too far " * 20, "") for i in range(count)
    )
    return dataclasses.replace(sheet, notices=notices)


def with_temperatures(sheet: Datasheet, count: int) -> Datasheet:
    group = sheet.metrics[0]
    cell = group.rows[0].cells[sheet.reference_column]
    row = dataclasses.replace(group.rows[0], cells=(cell,) * count)
    return dataclasses.replace(
        sheet,
        temperatures=tuple(str(100 + i) for i in range(count)),
        metrics=(MetricGroup(group.title, (row,)),),
    )


def without_anything(sheet: Datasheet) -> Datasheet:
    nothing: dict[str, Any] = {
        "permittivity": None, "notices": (), "handling": (), "containers": (), "metrics": (),
        "synonyms": (), "scale": Markup(""), "ribbon": Markup(""), "liquid_range": "not known",
    }  # fmt: skip
    bare = tuple(dataclasses.replace(row, number=None) for row in sheet.key_values)
    trend = dataclasses.replace(sheet.trend, observed=None)
    return dataclasses.replace(sheet, key_values=bare, trend=trend, **nothing)


def printed(
    book: Catalogue, made: Sequence[Datasheet], edition: Edition, *, booklet: bool = False
) -> bytes:
    rows = sheets.polarity_rows(book.handbook, "acetone")
    told = [sheets.content(sheet, rows, edition) for sheet in made]
    return print_sheets(told, FOOT, edition, booklet=booklet)


def read(pdf: bytes) -> pypdf.PdfReader:
    return pypdf.PdfReader(io.BytesIO(pdf))


def tight(text: str) -> str:
    """Without any space: where lines end is not what is said."""
    return re.sub(r"[\s\u200b]", "", text)


def says(page: pypdf.PageObject, *texts: str) -> list[str]:
    """Those of the texts that do not stand on the page."""
    there = tight(page.extract_text())
    return [text for text in texts if tight(text) not in there]


@pytest.fixture
def pictures_of_pages(
    monkeypatch: pytest.MonkeyPatch,
) -> Callable[[Callable[[], bytes]], list[Any]]:
    """Sets a document as pictures instead of a PDF, to see where there is ink."""

    def picture(template: str, data: Mapping[str, Any], date: datetime.date) -> bytes:
        source = typesetting.TEMPLATES / f"{template}.typ"
        pages = typst.compile(
            source, root=source.parent, ignore_system_fonts=True, format="png", ppi=PPI,
            sys_inputs={"data": json.dumps(data)},
        )  # fmt: skip
        drawn.extend(pages if isinstance(pages, list) else [pages])
        return b""

    drawn: list[bytes] = []
    for module in (sheets, labels):
        monkeypatch.setattr(module, "typeset", picture)

    def run(printing: Callable[[], bytes]) -> list[Any]:
        printing()
        return [np.asarray(Image.open(io.BytesIO(page)).convert("L")) < 250 for page in drawn]

    return run


# --- the sheet ----------------------------------------------------------------------------------

CASES: dict[str, Callable[[Datasheet], Datasheet]] = {
    "as it is": lambda sheet: sheet,
    "long name": lambda sheet: dataclasses.replace(sheet, name=LONG),
    "unbroken name": lambda sheet: dataclasses.replace(sheet, name=UNBROKEN),
    "12 containers": lambda sheet: with_containers(sheet, 12),
    "40 containers": lambda sheet: with_containers(sheet, 40),
    "nothing at all": without_anything,
    "30 temperatures": lambda sheet: with_temperatures(sheet, 30),
    "one temperature": lambda sheet: with_temperatures(sheet, 1),
    "50 notices": lambda sheet: with_notices(sheet, 50),
    "long handling": lambda sheet: dataclasses.replace(
        sheet,
        handling=(HandlingLines("H225 " * 30, "keep it well closed, " * 60, "A", "2026", None),),
    ),
    "all at once": lambda sheet: with_notices(
        with_temperatures(with_containers(dataclasses.replace(sheet, name=LONG), 40), 30), 50
    ),
}


@pytest.fixture(scope="module")
def cases(acetone: Datasheet) -> dict[str, Datasheet]:
    return {name: change(acetone) for name, change in CASES.items()}


@EDITIONS
def test_every_sheet_is_one_page_that_says_all_it_must(
    book: Catalogue, cases: dict[str, Datasheet], edition: Edition
) -> None:
    pages = read(printed(book, list(cases.values()), edition)).pages
    assert len(pages) == len(cases)
    for page, (case, sheet) in zip(pages, cases.items(), strict=True):
        cells = [n for n in sheets.series(sheet) if n]
        key = [row.number for row in sheet.key_values if row.number]
        missing = says(
            page, sheet.name, sheet.cas, sheet.family, sheet.formula_plain, sheet.liquid_range,
            sheet.polar, sheet.polar_reason, sheet.trend.words, CAUTION, UNCONTROLLED,
            FOOT.laboratory,            f"Data revision {FOOT.revision}", "Printed 2026-12-01",
            "https://handbook.example/solvents/acetone.html",
            *(sheet.temperatures if cells else ["No value is known"]),
            *(n.value + n.letters for n in cells), *(n.uncertainty for n in [*cells, *key]),
            *(f"{n.value}{n.letters} ± {n.uncertainty} {n.unit}" for n in key),
            *(line.h_statements or "blank" for line in sheet.handling),
            *(line.storage or "blank" for line in sheet.handling),
            *([] if sheet.handling else ["None transcribed. A blank does not mean no hazard"]),
            *([] if sheet.containers else ["None on record."]),
        )  # fmt: skip
        assert missing == [], case


@EDITIONS
def test_nothing_is_printed_outside_the_margins(
    book: Catalogue,
    cases: dict[str, Datasheet],
    edition: Edition,
    pictures_of_pages: Callable[[Callable[[], bytes]], list[Any]],
) -> None:
    pages = pictures_of_pages(lambda: printed(book, list(cases.values()), edition))
    assert len(pages) == len(cases)
    left, top, bottom = (round(mm * PPI / 25.4) for mm in (15.0, 12.0, 13.0))
    for page, case in zip(pages, cases, strict=True):
        outside = page.copy()
        outside[top:-bottom, left:-left] = False
        assert not outside.any(), case
        assert page.mean() > 0.02, case


def test_lists_are_cut_short_openly_and_only_when_they_must(
    book: Catalogue, cases: dict[str, Datasheet]
) -> None:
    for case, listed in (("12 containers", 12), ("40 containers", 40), ("all at once", 40)):
        for edition in (A4, LETTER):
            text = read(printed(book, [cases[case]], edition)).pages[0].extract_text()
            shown = len(re.findall(r"\bC\d{3}\b", text))
            told = re.search(r"and (\d+) more containers, see the page", text)
            assert shown + int(told[1] if told else 0) == listed
            assert shown >= (12 if case != "all at once" else 5)
            assert bool(told) == (shown < listed)
    text = read(printed(book, [cases["50 notices"]], A4)).pages[0].extract_text()
    told = re.search(r"and (\d+) more warnings, see the page", text)
    assert told
    assert len(re.findall(r"finding \d+:", text)) + int(told[1]) == 50


def test_a_sheet_without_an_address_gives_the_place_in_the_handbook(
    book: Catalogue, acetone: Datasheet
) -> None:
    told = sheets.content(acetone, (), Edition("A4", DAY))
    assert told["address"] == "solvents/acetone.html"
    assert told["qr"]["svg"] == qr_code("solvents/acetone.html")
    page = read(print_sheets([told], FOOT, Edition("A4", DAY), booklet=False)).pages[0]
    assert says(page, "solvents/acetone.html") == []
    assert "/Annots" not in page


def test_the_same_data_on_the_same_day_give_the_same_bytes(
    book: Catalogue, acetone: Datasheet
) -> None:
    once, again = (printed(book, [acetone], A4) for _ in range(2))
    assert once == again
    later = dataclasses.replace(A4, date=DAY + datetime.timedelta(1))
    assert printed(book, [acetone], later) != once


# --- accessibility ------------------------------------------------------------------------------


def test_the_pdf_is_tagged_for_screen_readers(book: Catalogue, acetone: Datasheet) -> None:
    reader = read(printed(book, [acetone], A4))
    root = reader.trailer["/Root"]
    assert root["/MarkInfo"]["/Marked"]
    assert root["/Lang"] == "en"
    assert root["/ViewerPreferences"]["/DisplayDocTitle"]
    assert re.search(rb"pdfuaid:part(>|=\")1", root["/Metadata"].get_data())
    assert reader.metadata is not None
    assert reader.metadata.title == "Solvent datasheets: Acetone"
    elements = list(_elements(root["/StructTreeRoot"]))
    kinds = {str(element.get("/S")) for element in elements}
    assert {"/H1", "/H2", "/Table", "/TH", "/TD", "/Figure"} <= kinds
    texts = [e.get("/Alt") for e in elements if e.get("/S") == "/Figure"]
    assert {"the scale of it", "the ribbon of it"} <= set(texts)
    assert all(texts)
    assert len(texts) == 4, "structure, scale, ribbon, QR code"


def _elements(element: Any) -> Iterator[Any]:
    children = element.get("/K", [])
    for child in children if isinstance(children, list) else [children]:
        found = child.get_object()
        if isinstance(found, dict) and "/S" in found:
            yield found
            yield from _elements(found)


def test_fonts_are_embedded_and_know_every_character(book: Catalogue, acetone: Datasheet) -> None:
    signs = "εμρ°₂−κΔφ±×⁻⁷·–Å≤≥αβγδω"
    reader = read(printed(book, [dataclasses.replace(acetone, name=signs)], A4))
    assert says(reader.pages[0], signs) == []
    fonts = reader.pages[0]["/Resources"]["/Font"].values()  # type: ignore[index]
    for font in fonts:
        inner = font["/DescendantFonts"][0].get_object()
        assert "LibertinusSerif" in inner["/BaseFont"]
        assert {"/FontFile2", "/FontFile3"} & set(inner["/FontDescriptor"])


# --- the booklet --------------------------------------------------------------------------------


@pytest.fixture(scope="module")
def booklet(book: Catalogue) -> tuple[pypdf.PdfReader, list[Datasheet]]:
    slugs = book.in_order[:20]
    made = [datasheet(book, slug, {}, FOOT) for slug in slugs]
    return read(printed(book, made, A4, booklet=True)), made


def test_the_booklet_has_title_contents_sheets_and_index(
    booklet: tuple[pypdf.PdfReader, list[Datasheet]],
) -> None:
    reader, made = booklet
    assert len(reader.pages) == 1 + 1 + len(made) + 1
    assert (
        says(reader.pages[0], sheets.TITLE, f"{len(made)} substances", CAUTION, UNCONTROLLED) == []
    )
    for page in (reader.pages[1], reader.pages[-1]):
        assert says(page, FOOT.revision, "2026-12-01", UNCONTROLLED, CAUTION) == []
    for number, sheet in enumerate(made, start=3):
        assert says(reader.pages[number - 1], sheet.name, sheet.cas) == []
        assert says(reader.pages[1], sheet.name, str(number)) == []
        assert says(reader.pages[-1], f"{sheet.cas}{sheet.name}{number}") == []
    order = re.findall(r"(\d+)-(\d\d)-(\d)\b", reader.pages[-1].extract_text())
    assert [tuple(map(int, cas)) for cas in order] == sorted(tuple(map(int, cas)) for cas in order)


def test_bookmarks_and_links_lead_to_the_pages_they_name(
    booklet: tuple[pypdf.PdfReader, list[Datasheet]],
) -> None:
    reader, made = booklet
    marks = [mark for mark in reader.outline if not isinstance(mark, list)]
    assert [mark.title for mark in marks] == [
        "Contents", *(sheet.name for sheet in made), "Index by CAS number",
    ]  # fmt: skip
    for number, mark in enumerate(marks, start=1):
        assert reader.get_destination_page_number(mark) == number
    wanted = list(range(2, 2 + len(made)))
    assert sorted(set(_targets(reader, reader.pages[1]))) == [*wanted, len(reader.pages) - 1]
    assert sorted(set(_targets(reader, reader.pages[-1]))) == wanted


def _targets(reader: pypdf.PdfReader, page: pypdf.PageObject) -> Iterator[int]:
    """Index of the page each link leads to."""
    for entry in page["/Annots"]:  # type: ignore[attr-defined]
        annotation = entry.get_object()
        target = annotation.get("/Dest") or annotation["/A"]["/D"]
        if isinstance(target, str):
            target = reader.named_destinations[target].dest_array
        yield reader.get_page_number(target[0].get_object())


# --- labels -------------------------------------------------------------------------------------


@pytest.fixture(scope="module")
def many_labels(acetone: Datasheet) -> list[dict[str, Any]]:
    odd = [*(CASES[case](acetone) for case in CASES)]
    return [labels.content(sheet, A4) for sheet in [*odd, *[acetone] * 30]]


@pytest.mark.parametrize("name", LABEL_SHEETS)
def test_labels_stay_inside_their_places(
    name: str,
    many_labels: list[dict[str, Any]],
    pictures_of_pages: Callable[[Callable[[], bytes]], list[Any]],
) -> None:
    layout = LABEL_SHEETS[name]
    edition = dataclasses.replace(A4, paper=layout.paper)
    pages = pictures_of_pages(lambda: print_labels(many_labels, layout, FOOT, edition, start=3))
    assert len(pages) == -(-(len(many_labels) + 2) // layout.count)
    scale = PPI / 25.4
    for number, page in enumerate(pages):
        left = page.copy()
        for place in range(layout.count):
            row, column = divmod(place, layout.columns)
            x = (layout.left + column * (layout.width + layout.gap_x)) * scale
            y = (layout.top + row * (layout.height + layout.gap_y)) * scale
            cell = np.s_[
                round(y) + 1 : round(y + layout.height * scale) - 1,
                round(x) + 1 : round(x + layout.width * scale) - 1,
            ]
            taken = 2 <= number * layout.count + place < len(many_labels) + 2
            assert page[cell].any() == taken
            left[cell] = False
        assert not left.any(), "ink between the labels"


def test_a_label_says_what_it_must(acetone: Datasheet) -> None:
    bare = without_anything(acetone)
    told = [labels.content(sheet, A4) for sheet in (acetone, bare)]
    layout = layout_of("105x74", "A4")
    reader = read(print_labels(told, layout, FOOT, A4))
    assert len(reader.pages) == 1
    assert acetone.permittivity is not None
    assert says(
        reader.pages[0], "Acetone", acetone.cas, acetone.polar, acetone.permittivity.sentence,
        acetone.handling[0].h_statements, FOOT.revision, "2026-12-01", UNCONTROLLED,
        "Not a safety data sheet", labels.NOT_TRANSCRIBED, "ε not known",
    ) == []  # fmt: skip
    assert reader.trailer["/Root"]["/MarkInfo"]["/Marked"]


def test_label_sheets_that_cannot_be_are_refused() -> None:
    assert layout_of("", "A4") == LABEL_SHEETS["70x37"]
    assert layout_of("", "Letter") == LABEL_SHEETS["101.6x50.8"]
    own = {"columns": 2, "rows": 3, "width": 80, "height": 60, "left": 10, "top": 10, "gap_x": 5}
    assert layout_of(own, "A4") == LabelSheet("A4", 2, 3, 80, 60, 10, 10, 5)
    for wanted, complaint in (
        ("71x37", "no label sheet '71x37'; there are 70x37, "),
        ("101.6x50.8", "this label sheet is Letter, the paper asked for A4"),
        ({**own, "rows": 5}, "the labels take 175 × 310 mm, but A4 has 210 × 297 mm"),
        ({**own, "height": 10}, "labels below 35 × 20 mm cannot be read"),
        ({**own, "columns": 0}, "needs a column, a row"),
        ({**own, "wide": 1}, "a label sheet is described by columns, rows, width"),
    ):
        with pytest.raises(OrderError, match=re.escape(complaint)):
            layout_of(wanted, "A4")
    with pytest.raises(OrderError, match="places 1 to 24, not 25"):
        print_labels([], layout_of("", "A4"), FOOT, A4, start=25)


# --- which substances ---------------------------------------------------------------------------


def test_substances_are_found_by_every_name(handbook: Handbook) -> None:
    dataset = handbook.dataset
    asked = ("ACETONE", "60-29-7", "75058", "Diethyl ether", "propanone", "water")
    found = selection.choose(dataset, asked)
    assert found == ("acetone", "diethyl-ether", "acetonitrile", "water")
    for slug, solvent in dataset.solvents.items():
        for name in (slug, solvent.name, solvent.cas):
            assert selection.choose(dataset, [name]) == (slug,)


def test_unknown_substances_are_all_reported_with_the_nearest(handbook: Handbook) -> None:
    with pytest.raises(OrderError) as caught:
        selection.choose(handbook.dataset, ["acetne", "water", "qqqqqqqq", "tolune"])
    first, second, third = str(caught.value).splitlines()
    assert first.startswith("no substance is called 'acetne'; nearest: acetone")
    assert second == "no substance is called 'qqqqqqqq'"
    assert third.startswith("no substance is called 'tolune'; nearest: toluene")


def test_a_place_gives_its_substances_or_the_places_there_are(handbook: Handbook) -> None:
    dataset = handbook.dataset
    place = dataset.stock[0].location
    there = selection.kept_at(dataset, place.upper())
    assert set(there) == {c.solvent for c in dataset.stock if c.location == place}
    with pytest.raises(OrderError, match=re.escape(place)):
        selection.kept_at(dataset, "the moon")


# --- the command --------------------------------------------------------------------------------


@pytest.mark.parametrize(
    "arguments", [[], ["acetone", "--all"], ["--location", "shelf", "--all"]], ids=len
)
def test_the_command_wants_one_choice_of_substances(arguments: list[str]) -> None:
    done = CliRunner().invoke(main, ["print", *arguments])
    assert done.exit_code == 2
    assert "name substances, or give --location, --changed or --all" in done.output


@pytest.mark.build
@EDITIONS
def test_all_shipped_substances_are_printed_one_page_each(
    edition: Edition, handbook: Handbook, tmp_path: Path
) -> None:
    out = tmp_path / "booklet.pdf"
    command = ["print", "--all", "--as", "booklet", "--paper", edition.paper, "--out", str(out)]
    done = CliRunner().invoke(main, command)
    assert done.exit_code == 0, done.output
    reader = pypdf.PdfReader(out)
    names = {s.name for s in handbook.dataset.solvents.values()}
    pages = {
        mark.title: reader.get_destination_page_number(mark)
        for mark in reader.outline
        if not isinstance(mark, list)
    }
    numbers = sorted(pages[name] for name in names)
    assert numbers == list(range(numbers[0], numbers[0] + len(names)))
    assert pages["Index by CAS number"] == numbers[-1] + 1
    for name, number in pages.items():
        if name in names:
            assert says(reader.pages[number], name, CAUTION, UNCONTROLLED) == []
