"""Comparison tables: sorted, filtered, cut to columns, taken away, quick with a thousand rows."""

from __future__ import annotations

import csv
import io
import re
from collections.abc import Callable
from pathlib import Path
from typing import TYPE_CHECKING, Any

import pytest

if TYPE_CHECKING:
    from playwright.sync_api import Page

pytestmark = [pytest.mark.browser, pytest.mark.filterwarnings("default::ResourceWarning")]

TABLE = "tables/reference.html"
MANY = 1000


def _numbers(page: Page, key: str) -> list[float | None]:
    """The numbers of a column in the order shown; None where there is none."""
    cells: list[str | None] = page.evaluate(
        """key => {
            const heads = [...document.querySelectorAll("table.long thead th")];
            const at = heads.findIndex((head) => head.dataset.key === key);
            return [...document.querySelectorAll("table.long tbody tr")]
                .map((row) => row.cells[at].dataset.v ?? null);
        }""",
        key,
    )
    return [None if cell is None else float(cell) for cell in cells]


def _names(page: Page) -> list[str]:
    return page.locator("table.long tbody th a").all_inner_texts()


def _head(page: Page, key: str) -> Any:
    return page.locator(f"table.long thead th[data-key='{key}']")


def test_sorting_by_number_both_ways_with_blanks_last(page_either_way: Page) -> None:
    page = page_either_way
    page.goto(TABLE)
    button = _head(page, "vapour-pressure").locator("button")
    button.click()
    page.get_by_role("button", name="Show all").click()
    found = _numbers(page, "vapour-pressure")
    known = [x for x in found if x is not None]
    assert known == sorted(known)
    assert len(known) > 50
    assert None in found
    assert found[len(known) :] == [None] * (len(found) - len(known))
    assert _head(page, "vapour-pressure").get_attribute("aria-sort") == "ascending"
    button.click()
    found = _numbers(page, "vapour-pressure")
    known = [x for x in found if x is not None]
    assert known == sorted(known, reverse=True)
    assert found[0] is not None
    assert _head(page, "vapour-pressure").get_attribute("aria-sort") == "descending"


def test_sorting_by_keyboard(browser_page: Page) -> None:
    browser_page.goto(TABLE)
    before = _names(browser_page)
    _head(browser_page, "substance").locator("button").focus()
    browser_page.keyboard.press("Enter")
    browser_page.keyboard.press("Enter")
    after = _names(browser_page)
    assert after != before
    assert after[0][:1].lower() in "vwxyz"


def test_filter_by_range_by_word_and_by_text(browser_page: Page) -> None:
    page = browser_page
    page.goto(TABLE)
    page.locator(".table-choice summary").click()
    page.get_by_label("Density, from").fill("0.9")
    page.get_by_label("Density, to").fill("1.0")
    found = _numbers(page, "density")
    assert found
    assert all(x is not None and 0.9 <= x <= 1.0 for x in found)
    page.get_by_label("Family, only").select_option("Ketones")
    families = page.locator("table.long tbody td.family").all_inner_texts()
    assert set(families) == {"Ketones"}
    assert len(families) < len(found)
    page.locator(".table-reset").click()
    page.locator(".table-filter").fill("67641")
    assert _names(page) == ["Acetone"]
    assert page.locator(".table-count").inner_text().startswith("1 of ")


def test_the_address_carries_the_choice(browser_page: Page, open_page: Callable[..., Page]) -> None:
    page = browser_page
    page.goto(TABLE)
    page.locator(".table-choice summary").click()
    page.get_by_label("Relative permittivity, from").fill("30")
    page.get_by_role("checkbox", name="Family").uncheck()
    page.locator(".table-uncertainty").uncheck()
    _head(page, "density").locator("button").click()
    _head(page, "density").locator("button").click()
    address = page.url
    other = open_page()
    other.goto(address)
    assert _names(other) == _names(page)
    assert 3 < len(_names(other)) < 60
    assert not _head(other, "family").is_visible()
    assert not other.locator("table.long tbody small").first.is_visible()
    assert _head(other, "density").get_attribute("aria-sort") == "descending"
    assert other.get_by_label("Relative permittivity, from").input_value() == "30"


def test_csv_and_clipboard_hold_what_is_shown(
    open_page: Callable[..., Page], site_url: str
) -> None:
    page = open_page(accept_downloads=True)
    page.context.grant_permissions(["clipboard-read", "clipboard-write"], origin=site_url)
    page.goto(f"{TABLE}#family=Ketones&sort=-density&hide=cas+scale+born-solvation-energy")
    with page.expect_download() as waiting:
        page.locator(".table-csv").click()
    assert waiting.value.suggested_filename == "reference.csv"
    text = Path(waiting.value.path()).read_text(encoding="utf-8")
    head, *rows = csv.reader(io.StringIO(text))
    assert [row[0] for row in rows] == _names(page)
    assert "CAS" not in head
    assert not [name for name in head if name.startswith("Born")]
    place = next(i for i, name in enumerate(head) if name.startswith("Density ("))
    assert head[place : place + 3] == ["Density (ρ / g cm⁻³)", "Density ±", "Density marks"]
    shown = [x for x in _numbers(page, "density") if x is not None]
    given = [float(row[place]) for row in rows if row[place]]
    assert given == pytest.approx(shown, abs=5e-4)
    assert all(float(row[place + 1]) > 0 for row in rows if row[place])
    page.locator(".table-copy").click()
    page.get_by_role("button", name="Copied").wait_for()
    copied = page.evaluate("navigator.clipboard.readText()")
    assert [line.split("\t") for line in copied.rstrip("\n").split("\n")] == [head, *rows]


def test_a_print_shows_what_is_shown_and_says_so(browser_page: Page) -> None:
    browser_page.goto(f"{TABLE}#density=0.9..1&hide=cas+family")
    browser_page.emulate_media(media="print")
    said = browser_page.locator(".table-shown").inner_text()
    assert re.match(r"Shown: \d+ of \d+ substances; Density .* from 0.9 to 1", said)
    assert not browser_page.locator(".table-tools").is_visible()
    assert not browser_page.locator("table.long .pick").first.is_visible()


def test_head_and_first_column_stay_in_sight(browser_page: Page) -> None:
    browser_page.goto(TABLE)
    region = browser_page.locator(".table-scroll")
    box = region.bounding_box()
    assert box is not None
    region.evaluate("r => r.scrollTo(700, 1500)")
    corner = browser_page.locator("table.long thead th").first.bounding_box()
    assert corner is not None
    assert abs(corner["x"] - box["x"]) < 3
    assert abs(corner["y"] - box["y"]) < 6
    inside = browser_page.evaluate(
        """() => {
            const left = document.querySelector(".table-scroll").getBoundingClientRect().left;
            return [...document.querySelectorAll("table.long tbody th")]
                .every((head) => Math.abs(head.getBoundingClientRect().left - left) < 3);
        }"""
    )
    assert inside


def test_decimal_points_stand_in_line(browser_page: Page) -> None:
    browser_page.goto(TABLE)
    spread = browser_page.evaluate(
        """() => {
            const heads = [...document.querySelectorAll("table.long thead th")];
            const at = heads.findIndex((head) => head.dataset.key === "density");
            const places = [...document.querySelectorAll("table.long tbody tr")].flatMap((row) => {
                const text = row.cells[at].firstChild;
                const point = text.data.indexOf(".");
                if (point < 0) { return []; }
                const range = document.createRange();
                range.setStart(text, point);
                range.setEnd(text, point + 1);
                return [range.getBoundingClientRect().left];
            });
            return [places.length, Math.max(...places) - Math.min(...places)];
        }"""
    )
    assert spread[0] > 100
    assert spread[1] < 1.0  # px


def test_without_scripts_every_row_can_be_read(open_page: Callable[..., Page]) -> None:
    page = open_page(java_script_enabled=False)
    page.goto(TABLE)
    rows = page.locator("table.long tbody tr")
    assert rows.count() > 150
    assert rows.last.is_visible()
    assert not page.locator(".table-tools").is_visible()


@pytest.fixture
def thousand(browser_page: Page, built_site: Path) -> Page:
    """The widest table with a thousand rows, served in place of the shipped one."""
    text = (built_site / TABLE).read_text(encoding="utf-8")
    head, body, tail = re.split(r"(?<=<tbody>)|(?=</tbody>)", text, maxsplit=2)
    rows = re.findall(r"<tr>.*?</tr>", body, flags=re.DOTALL)
    many = "\n".join(rows[i % len(rows)] for i in range(MANY))
    browser_page.route(
        f"**/{TABLE}",
        lambda route: route.fulfill(body=f"{head}{many}{tail}", content_type="text/html"),
    )
    return browser_page


def _usable(page: Page) -> float:
    """Opens the table and gives the seconds until its scripts have run."""
    page.goto(TABLE)
    taken: float = page.evaluate(
        "performance.getEntriesByType('navigation')[0].domContentLoadedEventEnd / 1000"
    )
    return taken


def _sorting(page: Page, key: str) -> float:
    """Seconds from the click to the new order laid out."""
    taken: float = page.evaluate(
        """(key) => {
            const button = document.querySelector(`table.long th[data-key="${key}"] button`);
            const start = performance.now();
            button.click();
            document.body.offsetHeight;
            return (performance.now() - start) / 1000;
        }""",
        key,
    )
    return taken


def test_a_thousand_rows_are_quick(thousand: Page) -> None:
    page = thousand
    # The best of three: other work on the machine is not the table's.
    assert any(_usable(page) < 2.0 for _ in range(3))
    assert page.locator(".table-count").inner_text() == f"{MANY} substances"
    for key in ("density", "substance", "viscosity", "family"):
        assert any(_sorting(page, key) < 0.3 for _ in range(3)), key
    page.locator(".table-scroll").evaluate("r => { r.scrollTop = r.scrollHeight; }")
    page.wait_for_function("document.querySelectorAll('table.long tbody tr').length > 150")
    page.get_by_role("button", name=f"Show all {MANY} rows").click()
    assert page.locator("table.long tbody tr").count() == MANY
