"""What somebody types leads to the right datasheet: in the finder and in the site search."""

from __future__ import annotations

import json
import re
from pathlib import Path
from typing import TYPE_CHECKING, Any

import pytest

if TYPE_CHECKING:
    from playwright.sync_api import Page

pytestmark = [pytest.mark.browser, pytest.mark.filterwarnings("default::ResourceWarning")]

# What is typed, the datasheet that must come first, whether the site search must know it as well
# (it knows whole terms).
LOOKUPS = [
    ("Acetone", "acetone", True),
    ("67-64-1", "acetone", True),
    ("67641", "acetone", True),
    ("dimethyl ketone", "acetone", True),
    ("7732-18-5", "water", True),
    ("H2O", "water", True),
    ("DMSO", "dimethyl-sulfoxide", True),
    ("IAZDPXIOMUYVGZ-UHFFFAOYSA-N", "dimethyl-sulfoxide", True),
    ("THF", "tetrahydrofuran", True),
    ("109999", "tetrahydrofuran", True),
    ("98-86-2", "acetophenone", True),
    ("N-Methyl-2-pyrrolidone", "n-methyl-2-pyrrolidone", True),
    ("NMP", "n-methyl-2-pyrrolidone", True),
    ("cis-1,2-dichloroethylene", "cis-1-2-dichloroethylene", True),
    ("156605", "trans-1-2-dichloroethylene", True),
    ("CCl4", "carbon-tetrachloride", True),
    ("MEK", "2-butanone", True),
    ("methyl cyanide", "acetonitrile", True),
    ("1-Propanol", "1-propanol", True),
    ("Ethanol", "ethanol", True),
    ("64-17-5", "ethanol", True),
    ("2-Pyrrolidone", "2-pyrrolidone", True),
    ("o-xyl", "o-xylene", False),
    ("chlorof", "chloroform", False),
    ("propylene carb", "propylene-carbonate", False),
    ("108-32", "propylene-carbonate", False),
    ("toluen", "toluene", False),
]


def test_the_finder_puts_the_right_datasheet_first(page_either_way: Page) -> None:
    page = page_either_way
    page.goto("index.html")
    box = page.locator("#finder-input")
    wrong = {}
    for typed, slug, _ in LOOKUPS:
        box.fill(typed)
        first = page.locator("#finder-results a").first.get_attribute("href", timeout=2000)
        if first != f"solvents/{slug}.html":
            wrong[typed] = first
    assert not wrong


def test_the_site_search_puts_the_right_datasheet_first(page_either_way: Page) -> None:
    page = page_either_way
    page.goto("methods.html")
    box = page.locator(".md-search__input")
    box.focus()
    wrong = {}
    for typed, slug, whole in LOOKUPS:
        if whole:
            box.fill(typed)
            box.dispatch_event("keyup")
            first = page.locator(".md-search-result__item").first.locator("a").first
            try:
                page.wait_for_function(
                    "slug => document.querySelector('.md-search-result__item a')?.href"
                    ".includes(`/${slug}.html`)",
                    arg=slug,
                    timeout=6000,
                )
            except Exception:  # the first wrong one is named below, with what came instead
                wrong[typed] = first.get_attribute("href") if first.count() else None
    assert not wrong


def test_every_cas_number_and_name_typed_whole_comes_first(browser_page: Page) -> None:
    browser_page.goto("index.html")
    wrong = browser_page.evaluate(
        """() => {
            const { items, search } = handbook.finder;
            const first = (typed) => search(items, typed)[0];
            return items.map(({ entry }) => entry).filter((e) => first(e.c) !== e
                || first(e.c.replaceAll("-", "")) !== e || first(e.n) !== e).map((e) => e.n);
        }"""
    )
    assert wrong == []


def test_the_first_key_stroke_brings_results(page_either_way: Page) -> None:
    page_either_way.goto("index.html")
    page_either_way.keyboard.press("/")
    page_either_way.keyboard.press("a")
    assert page_either_way.locator("#finder-input").input_value() == "a"
    assert page_either_way.locator("#finder-results a").count() > 5


def test_the_finder_is_driven_by_keys_alone(browser_page: Page) -> None:
    page = browser_page
    page.goto("index.html")
    page.keyboard.press("/")
    page.keyboard.type("meth")
    page.keyboard.press("ArrowDown")
    page.keyboard.press("ArrowDown")
    second = page.locator("#finder-results a").nth(1)
    assert page.evaluate("document.activeElement.href") == second.evaluate("a => a.href")
    page.keyboard.press("ArrowUp")
    page.keyboard.press("ArrowUp")
    assert page.evaluate("document.activeElement.id") == "finder-input"
    page.keyboard.press("Escape")
    assert page.locator("#finder-results a").count() == 0
    page.keyboard.type("methanol")
    page.keyboard.press("Enter")
    page.wait_for_url("**/solvents/methanol.html")


@pytest.fixture(scope="module")
def solvents(built_site: Path) -> dict[str, dict[str, Any]]:
    """The numbers as they are exported, which the filters of the finder must agree with."""
    text = (built_site / "downloads" / "handbook.json").read_text(encoding="utf-8")
    found: dict[str, dict[str, Any]] = json.loads(text)["solvents"]
    return found


def _shown(page: Page) -> int:
    found = re.match(r"\d+", page.locator("#finder-status").inner_text())
    return int(found[0]) if found else 0


def test_filters_keep_what_the_numbers_say(
    browser_page: Page, solvents: dict[str, dict[str, Any]]
) -> None:
    page = browser_page
    page.goto("index.html")

    def value(slug: str, key: str) -> float | None:
        given = solvents[slug]["values"].get(key)
        return given[0]["value"] if given else None

    def liquid(slug: str, at: float) -> bool:
        low, high = solvents[slug]["liquid_range_c"]
        return low is not None and high is not None and low <= at <= high

    page.locator("#finder-polar").select_option("unpolar")
    unpolar = {s for s, v in solvents.items() if v["is_polar"] == "unpolar"}
    assert _shown(page) == len(unpolar) > 10
    page.locator("#finder-liquid").fill("150")
    both = {s for s in unpolar if liquid(s, 150)}
    assert _shown(page) == len(both) > 0
    page.locator("#finder-clear").click()
    page.locator("#finder-flash").select_option("1")
    low = {s for s in solvents if (value(s, "flash_point") or 99) < 23}
    first = {s for s in low if (value(s, "boiling_point") or 99) <= 35}
    assert _shown(page) == len(first) > 0
    page.locator("#finder-flash").select_option("?")
    blank = {s for s in solvents if value(s, "flash_point") is None}
    assert _shown(page) >= len(blank) > 0
    page.locator("#finder-clear").click()
    page.locator("#finder-stock").check()
    assert 0 < _shown(page) < len(solvents)
    page.locator("#finder-clear").click()
    assert page.locator("#finder-results a").count() == 0


def test_site_search_asks_for_its_index_only_when_wanted(browser_page: Page) -> None:
    asked: list[str] = []
    browser_page.on("request", lambda request: asked.append(request.url))
    browser_page.goto("index.html")
    browser_page.wait_for_load_state("networkidle")
    assert not [url for url in asked if "search_index" in url or "/workers/" in url]
    with browser_page.expect_request("**/search_index.json"):
        browser_page.locator(".md-search__input").focus()
