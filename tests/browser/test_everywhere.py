"""What holds on every kind of page: accessible, nothing too wide, light on the wire, quick."""

from __future__ import annotations

import importlib.resources
from collections.abc import Callable
from pathlib import Path
from typing import TYPE_CHECKING, Any

import pytest

if TYPE_CHECKING:
    from playwright.sync_api import Page

pytestmark = [pytest.mark.browser, pytest.mark.filterwarnings("default::ResourceWarning")]

PHONE = {"width": 360, "height": 740}
# With something to show, and with few rows of those that are all alike.
STARTS = {
    "compare.html": "#acetone+water+hexane",
    "tables/reference.html": "#q=acet",
    "tables/permittivity.html": "#q=acet",
    "tables/temperature-coefficients.html": "#q=acet",
    "tables/association.html": "#q=acet",
}
STATES = {
    # what to do on a page before it is looked at, so that what scripts bring is looked at as well
    "index.html": "document.getElementById('finder-input').value = 'a';"
    "document.getElementById('finder-input').dispatchEvent(new Event('input'));"
    "document.querySelector('#finder-results .pick').click();",
    "tables/isomers.html": "document.querySelectorAll('.isomer-set').forEach("
    "(set, place) => { if (place > 2) { set.remove(); } });",
    "tables/reference.html#q=acet": "document.querySelector('.table-choice').open = true;",
}


def kinds_of_page(site: Path) -> list[str]:
    """Every page but the datasheets; of those the one with the longest name and another."""
    pages = sorted(p.relative_to(site).as_posix() for p in site.rglob("*.html"))
    sheets = [p for p in pages if p.startswith("solvents/")]
    assert len(sheets) >= 100
    few = {max(sheets, key=len), "solvents/acetone.html"}
    others = [p + STARTS.get(p, "") for p in pages if p not in sheets]
    return [*others, *sorted(few)]


@pytest.fixture(scope="session")
def axe() -> str:
    """The script that looks for violations."""
    package = importlib.resources.files("axe_playwright_python")
    return (package / "axe.min.js").read_text(encoding="utf-8")


@pytest.mark.parametrize("colours", ["light", "dark"])
def test_nobody_is_shut_out(
    open_page: Callable[..., Page], built_site: Path, axe: str, colours: str
) -> None:
    """No violation of WCAG 2.2, level A or AA, on any kind of page."""
    page = open_page(color_scheme=colours, reduced_motion="reduce")
    found = {}
    for address in kinds_of_page(built_site):
        page.goto(address)
        page.evaluate(STATES.get(address, ""))
        assert page.evaluate("document.body.dataset.mdColorScheme") == (
            "slate" if colours == "dark" else "default"
        )
        page.evaluate(axe)
        result: Any = page.evaluate(
            """() => axe.run(document, { resultTypes: ["violations"], runOnly:
                ["wcag2a", "wcag2aa", "wcag21a", "wcag21aa", "wcag22aa"] })"""
        )
        for violation in result["violations"]:
            places = [node["target"] for node in violation["nodes"]][:3]
            found[address, violation["id"]] = places
    assert not found


def test_no_page_scrolls_sideways_on_a_phone(
    open_page: Callable[..., Page], built_site: Path
) -> None:
    page = open_page(viewport=PHONE)
    too_wide = {}
    for address in kinds_of_page(built_site):
        page.goto(address)
        page.evaluate(STATES.get(address, ""))
        width = page.evaluate("document.documentElement.scrollWidth")
        if width > PHONE["width"]:
            too_wide[address] = width
    assert not too_wide


def test_every_kind_of_page_opens_from_the_disk(
    open_page: Callable[..., Page], built_site: Path
) -> None:
    page = open_page(f"{built_site.as_uri()}/")
    for address in kinds_of_page(built_site):
        if address != "404.html":  # a server's own, which stands at no certain depth
            page.goto(address)
            assert page.locator("h1").count() == 1, address


def test_the_keyboard_reaches_everything_in_order(browser_page: Page) -> None:
    """From the top of the page: skip link, search, tabs, finder; the focus is always to be seen."""
    page = browser_page
    page.goto("index.html")
    reached = []
    for _ in range(60):
        page.keyboard.press("Tab")
        reached.append(
            page.evaluate(
                """() => {
                    const at = document.activeElement;
                    const style = getComputedStyle(at);
                    const seen = style.outlineStyle !== "none" || style.boxShadow !== "none"
                        || at.closest(".md-search, .md-header__option, .md-skip") !== null;
                    return [at.id || at.className || at.tagName, seen];
                }"""
            )
        )
    names = [name for name, _ in reached]
    assert names[0].startswith("md-skip")
    assert names.index("finder-input") < names.index("finder-family") < names.index("finder-clear")
    assert [name for name, seen in reached if not seen] == []


def test_the_home_page_is_light_and_quick(browser_page: Page, built_site: Path) -> None:
    page = browser_page
    sizes: dict[str, int] = {}
    page.on("response", lambda r: sizes.update({r.url.rsplit("/", 1)[-1]: len(r.body())}))
    page.goto("index.html")
    page.wait_for_load_state("networkidle")
    painted = page.evaluate(
        """() => new Promise((resolve) => new PerformanceObserver((list) =>
            resolve(list.getEntries().at(-1).startTime / 1000)
        ).observe({ type: "largest-contentful-paint", buffered: true }))"""
    )
    assert painted < 1.5
    # As sent by a server that does not even compress; the home page itself grows with the handbook.
    substances = len(list((built_site / "solvents").glob("*.html")))
    home = sizes.pop("index.html")
    assert sum(sizes.values()) + home * 120 / substances < 400_000
    assert sum(sizes.values()) + home < 450_000
