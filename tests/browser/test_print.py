"""Printed from the browser: nothing beside the paper, heads on every page, the cautions on each."""

from __future__ import annotations

import io
import re
from typing import TYPE_CHECKING, Any

import pypdf
import pytest

from generator.contexts import CAUTION, UNCONTROLLED

if TYPE_CHECKING:
    from playwright.sync_api import Page

pytestmark = [pytest.mark.browser, pytest.mark.filterwarnings("default::ResourceWarning")]

MM = 96 / 25.4  # px
PAPERS = {"A4": (210.0, 297.0), "Letter": (215.9, 279.4)}
UPRIGHT = (
    "index.html", "solvents/acetone.html", "tables/isomers.html", "methods.html", "sources.html",
    "data-dictionary.html", "downloads.html", "how-to-read.html",
)  # fmt: skip
WIDE = (
    "tables/reference.html", "tables/permittivity.html", "tables/temperature-coefficients.html",
    "tables/association.html", "review.html",
)  # fmt: skip


def _printed(page: Page, paper: str) -> list[pypdf.PageObject]:
    return list(pypdf.PdfReader(io.BytesIO(page.pdf(format=paper))).pages)


@pytest.mark.parametrize("paper", PAPERS)
@pytest.mark.parametrize("address", [*UPRIGHT, *WIDE])
def test_pages_print_whole(browser_page: Page, address: str, paper: str) -> None:
    browser_page.goto(address)
    short, long = PAPERS[paper]
    inner = long - 24 if address in WIDE else short - 28  # mm, without the margins of print.css
    browser_page.emulate_media(media="print")
    browser_page.set_viewport_size({"width": int(inner * MM), "height": 1000})
    beyond: Any = browser_page.evaluate(
        """() => [...document.querySelectorAll(".md-content *")]
            .filter(e => e.getClientRects().length && getComputedStyle(e).visibility === "visible")
            .filter(e => e.getBoundingClientRect().right > document.documentElement.clientWidth + 1)
            .map(e => e.outerHTML.slice(0, 80))"""
    )
    assert beyond == []
    pages = _printed(browser_page, paper)
    for sheet in pages:
        assert (sheet.mediabox.width > sheet.mediabox.height) == (address in WIDE)
        assert len(sheet.extract_text()) > 40, "an empty page"
    if address != "how-to-read.html":
        last = " ".join(pages[-1].extract_text().split())
        assert re.sub(r"\s", "", CAUTION) in re.sub(r"\s", "", last)
        assert UNCONTROLLED in last
        assert re.search(r"Data revision \S+", last)
        assert re.search(r"Printed \d{4}-\d\d-\d\d", last)


@pytest.mark.parametrize("address", [a for a in WIDE if a.startswith("tables/")])
def test_every_page_of_a_long_table_has_its_head(browser_page: Page, address: str) -> None:
    browser_page.goto(address)
    browser_page.locator("table.data thead button").first.wait_for()
    heads = browser_page.locator("table.data thead .head").all_inner_texts()
    pages = _printed(browser_page, "A4")
    assert len(pages) > 2
    for sheet in pages:
        text = re.sub(r"\s", "", sheet.extract_text())
        assert [head for head in heads if re.sub(r"\s", "", head) not in text] == []
