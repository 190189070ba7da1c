"""The shipped handbook in a real browser: it opens, things are found, nothing leaves the site."""

from __future__ import annotations

import csv
from collections.abc import Iterator
from pathlib import Path
from typing import TYPE_CHECKING

import pytest

if TYPE_CHECKING:
    from playwright.sync_api import Page

pytestmark = [pytest.mark.browser, pytest.mark.filterwarnings("default::ResourceWarning")]


def _row(project: Path, slug: str) -> dict[str, str]:
    with (project / "data" / "solvents.csv").open(encoding="utf-8", newline="") as file:
        return next(row for row in csv.DictReader(file) if row["solvent"] == slug)


def _find(page: Page, text: str) -> Iterator[tuple[str, str]]:
    """Type into the finder and give the results as (text, address), best first."""
    page.goto("")
    page.locator("#finder-input").press_sequentially(text)
    page.locator("#finder-results a").first.wait_for()
    for link in page.locator("#finder-results a").all():
        yield link.inner_text(), link.evaluate("a => a.href")


def test_home_opens(browser_page: Page) -> None:
    response = browser_page.goto("")
    assert response is not None
    assert response.ok
    assert browser_page.locator("#finder-input").is_visible()
    assert browser_page.locator("h1").count() == 1


@pytest.mark.parametrize("how", ["cas", "cas without hyphens", "name", "synonym", "formula"])
def test_finder_finds_acetone(browser_page: Page, project: Path, how: str) -> None:
    row = _row(project, "acetone")
    typed = {
        "cas": row["cas"],
        "cas without hyphens": row["cas"].replace("-", ""),
        "name": row["name"],
        "synonym": row["synonyms"].split("; ")[0],
        "formula": "C3H6O",
    }[how]
    results = list(_find(browser_page, typed))
    assert any("acetone" in text.lower() for text, _ in results), results
    if how != "formula":  # isomers share it
        assert "acetone" in results[0][0].lower(), results


def test_finder_leads_to_the_datasheet(browser_page: Page, project: Path) -> None:
    row = _row(project, "acetonitrile")
    text, address = next(_find(browser_page, row["cas"]))
    assert "acetonitrile" in text.lower()
    browser_page.goto(address)
    assert "acetonitrile" in browser_page.locator("h1").inner_text().lower()
    assert row["cas"] in browser_page.locator("article").inner_text()


def test_finder_answers_the_first_key_stroke(browser_page: Page) -> None:
    assert list(_find(browser_page, "a"))


@pytest.mark.parametrize("slug", ["acetone", "water", "trans-1-2-dichloroethylene"])
def test_site_search_gives_a_whole_cas_number_first(
    browser_page: Page, project: Path, slug: str
) -> None:
    row = _row(project, slug)
    browser_page.goto("")
    box = browser_page.locator(".md-search__input")
    box.focus()
    box.press_sequentially(row["cas"])
    # The index answers in its own time, and once more after each key.
    first = browser_page.locator(".md-search-result__item").first
    first.locator(f"text={row['cas']}").first.wait_for()
    browser_page.wait_for_load_state("networkidle")
    link = first.locator("a").first.evaluate("a => a.href")
    browser_page.goto(link)
    assert row["name"].lower() in browser_page.locator("h1").inner_text().lower()
