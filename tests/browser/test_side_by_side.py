"""Two to five substances side by side: the choice in the address, differences marked, curves."""

from __future__ import annotations

import csv
import io
import json
import re
from collections.abc import Callable
from pathlib import Path
from typing import TYPE_CHECKING, Any

import pypdf
import pytest

from generator.quantities import QUANTITIES
from generator.wording import split_value

if TYPE_CHECKING:
    from playwright.sync_api import Page

pytestmark = [pytest.mark.browser, pytest.mark.filterwarnings("default::ResourceWarning")]


def _columns(page: Page) -> list[str]:
    return page.locator("#compare-table thead th a").all_inner_texts()


def _row(page: Page, name: str, symbol: str = "") -> Any:
    head = page.locator("th[scope=row]", has_text=f"{name} {symbol.replace('_', '')}".strip())
    return page.locator("#compare-table tbody tr").filter(has=head).first


def _add(page: Page, typed: str) -> None:
    page.locator("#compare-input").fill(typed)
    page.keyboard.press("Enter")


def test_the_address_is_the_choice(page_either_way: Page) -> None:
    page = page_either_way
    page.goto("compare.html#acetone+water")
    assert _columns(page) == ["Acetone", "Water"]
    _add(page, "75-05-8")
    assert _columns(page) == ["Acetone", "Water", "Acetonitrile"]
    assert page.url.endswith("compare.html#acetone+water+acetonitrile")
    page.get_by_role("button", name="Remove: Water").click()
    assert page.url.endswith("#acetone+acetonitrile")
    page.get_by_role("button", name="Compare to this: Acetonitrile").click()
    assert _columns(page) == ["Acetonitrile", "Acetone"]
    assert page.locator("#compare-figure svg .curve").count() == 2


def test_five_is_the_most_and_nonsense_is_passed_over(browser_page: Page) -> None:
    page = browser_page
    page.goto("compare.html#acetone+nonsense+water+acetone")
    assert _columns(page) == ["Acetone", "Water"]
    for typed in ("hexane", "toluene", "DMSO"):
        _add(page, typed)
    assert len(_columns(page)) == 5
    assert page.locator("#compare-input").is_disabled()
    assert "the most" in page.locator("#compare-status").inner_text()


def test_every_number_is_the_one_of_the_export(browser_page: Page, built_site: Path) -> None:
    text = (built_site / "downloads" / "handbook.json").read_text(encoding="utf-8")
    solvents = json.loads(text)["solvents"]
    chosen = ["acetone", "water", "hexane"]
    browser_page.goto(f"compare.html#{'+'.join(chosen)}")
    own = [solvents[slug]["reference_temperature_c"] for slug in chosen]
    compared = 0
    for key, quantity in QUANTITIES.items():
        row = _row(browser_page, quantity.name, quantity.symbol)
        cells = row.locator("td").all_inner_texts() if row.count() else []
        for slug, at, shown in zip(chosen, own, cells, strict=False):
            given = [
                v for v in solvents[slug]["values"].get(key, ()) if v["temperature_c"] in (None, at)
            ]
            if given:
                decimals = quantity.decimals
                value, spread = split_value(given[0]["value"], given[0]["uncertainty"], decimals)
                assert shown.startswith(value), (key, slug)
                assert not spread or f"± {spread}" in shown, (key, slug)
                compared += 1
    assert compared > 50


def test_differences_say_which_way_and_whether_they_are_sure(browser_page: Page) -> None:
    page = browser_page
    page.goto("compare.html#o-xylene+p-xylene+water")
    permittivity = _row(page, "Relative permittivity").locator("td")
    assert permittivity.nth(0).locator(".diff").count() == 0
    assert re.search(r"▼ lower by 0\.\d+", permittivity.nth(1).inner_text())
    assert re.search(r"▲ higher by 75\.\d+", permittivity.nth(2).inner_text())
    mass = _row(page, "Molar mass").locator("td")
    assert "= equal" in mass.nth(1).inner_text()
    assert "≈ within uncertainty" in page.locator("#compare-table").inner_text()
    # The mark is right: every difference called sure is beyond twice the combined uncertainty.
    wrong = page.evaluate(
        """() => {
            const number = (text) => Number(handbook.plain(text));
            const read = (cell) => {
                const spread = cell.querySelector(".u")?.textContent.replace("±", "").trim() ?? "0";
                return [number(cell.firstChild.textContent), number(spread)];
            };
            return [...document.querySelectorAll("#compare-table tbody tr")].flatMap((row) => {
                const [first, ...others] = [...row.querySelectorAll("td")];
                const marks = ".diff-up, .diff-down, .diff-same";
                return others.filter((cell) => cell.querySelector(marks))
                    .filter((cell) => {
                        const [[a, u], [b, v]] = [read(first), read(cell)];
                        const sure = Math.abs(b - a) > 2 * Math.hypot(u, v);
                        return sure === Boolean(cell.querySelector(".diff-same"));
                    }).map((cell) => row.innerText);
            });
        }"""
    )
    assert wrong == []
    rows = page.locator("#compare-table tbody tr").count()
    page.locator("#compare-only").check()
    assert page.locator("#compare-table tbody tr").count() < rows
    assert _row(page, "Relative permittivity").count() == 1


def test_the_figure_shows_every_curve_in_words_too(browser_page: Page) -> None:
    browser_page.goto("compare.html#acetone+water+hexane")
    figure = browser_page.locator("#compare-figure svg")
    label = figure.get_attribute("aria-label") or ""
    assert re.search(r"Acetone from [\d.]+ at −?\d+ °C to [\d.]+ at \d+ °C; Water from", label)
    assert figure.locator(".name").all_text_contents() == ["Acetone", "Water", "Hexane"]


@pytest.mark.parametrize("paper", ["A4", "Letter"])
def test_five_print_on_two_pages(browser_page: Page, paper: str) -> None:
    browser_page.goto("compare.html#acetone+water+acetonitrile+o-xylene+p-xylene")
    pages = pypdf.PdfReader(io.BytesIO(browser_page.pdf(format=paper))).pages
    assert len(pages) == 2
    for page in pages:
        assert "p-Xylene" in page.extract_text()  # the head is repeated


def test_taken_away_as_csv(open_page: Callable[..., Page]) -> None:
    page = open_page(accept_downloads=True)
    page.goto("compare.html#acetone+water")
    with page.expect_download() as waiting:
        page.locator("#compare-csv").click()
    assert waiting.value.suggested_filename == "acetone-water.csv"
    head, *rows = csv.reader(io.StringIO(Path(waiting.value.path()).read_text(encoding="utf-8")))
    assert head[2] == "Acetone (67-64-1)"
    permittivity = next(row for row in rows if row[0] == "Relative permittivity ε")
    assert float(permittivity[2]) == pytest.approx(20.5, abs=0.6)
    assert permittivity[9].startswith("▲ higher by 5")


@pytest.mark.parametrize("place", ["index.html", "tables/association.html"])
def test_chosen_from_the_finder_and_from_a_table(page_either_way: Page, place: str) -> None:
    page = page_either_way
    page.goto(place)
    box = page.locator("#finder-input, .table-filter")
    for name in ("Acetone", "Toluene"):
        box.fill(name)
        page.get_by_role("checkbox", name=f"Side by side: {name}", exact=True).check()
    page.get_by_role("link", name="Compare these 2").click()
    page.wait_for_url("**/compare.html#acetone+toluene")
    assert _columns(page) == ["Acetone", "Toluene"]


def test_a_datasheet_leads_there(browser_page: Page) -> None:
    browser_page.goto("solvents/o-xylene.html")
    browser_page.get_by_role("link", name="Side by side with others").click()
    browser_page.wait_for_url("**/compare.html#o-xylene")
    assert "Add another" in browser_page.locator("#compare-status").inner_text()
    browser_page.goto("solvents/o-xylene.html")
    browser_page.get_by_role("link", name="Side by side with this one").first.click()
    browser_page.wait_for_url("**/compare.html#o-xylene+*")
    assert "p-Xylene" in _columns(browser_page)
