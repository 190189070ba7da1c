"""A datasheet at work: the permittivity at any temperature, and what is copied from it."""

from __future__ import annotations

import csv
import io
import re
from collections import defaultdict
from collections.abc import Callable
from pathlib import Path
from typing import TYPE_CHECKING

import pytest

from generator.wording import split_value

if TYPE_CHECKING:
    from playwright.sync_api import Page

pytestmark = [pytest.mark.browser, pytest.mark.filterwarnings("default::ResourceWarning")]

# A curve, a single point, a solid at room temperature, negative °C, an estimate, an associated one.
SHEETS = ("acetone", "acetic-anhydride", "dimethyl-sulfoxide", "diethyl-ether", "water", "decalin")


@pytest.fixture(scope="module")
def permittivities(built_site: Path) -> dict[str, dict[float, tuple[str, str]]]:
    """Digits of value and uncertainty by substance and °C, from values.csv alone."""
    found: dict[str, dict[float, tuple[str, str]]] = defaultdict(dict)
    with (built_site / "downloads" / "values.csv").open(encoding="utf-8", newline="") as file:
        for row in csv.DictReader(file):
            if row["quantity"] == "relative_permittivity":
                spread = float(row["uncertainty"]) if row["uncertainty"] else None
                at = float(row["temperature_c"])
                found[row["solvent"]][at] = split_value(float(row["value"]), spread, 2)
    return found


def test_the_control_shows_what_is_exported(
    page_either_way: Page, permittivities: dict[str, dict[float, tuple[str, str]]]
) -> None:
    page = page_either_way
    compared = 0
    for slug in SHEETS:
        if slug not in permittivities:
            continue
        page.goto(f"solvents/{slug}.html")
        for at, (value, spread) in permittivities[slug].items():
            page.locator("#at-field").fill(f"{at:g}")
            shown = page.locator("#at-value").inner_text()
            wanted = f"{value} ± {spread} at " if spread else f"{value} at "
            assert shown.startswith(wanted), (slug, at, shown)
            assert "nearest" not in shown, (slug, at)
            compared += 1
    assert compared > 30


def test_the_slider_moves_by_degrees_and_says_so(browser_page: Page) -> None:
    page = browser_page
    page.goto("solvents/acetone.html")
    assert page.locator("#at-field").input_value() == "25"
    slider = page.locator("#at-slider")
    slider.focus()
    page.keyboard.press("ArrowRight")
    assert page.locator("#at-field").input_value() == "26"
    assert "at 26 °C" in page.locator("#at-value").inner_text()
    assert (slider.get_attribute("aria-valuetext") or "").startswith("26 °C, permittivity 2")
    page.keyboard.press("Home")
    assert "extrapolated" in page.locator("#at-value").inner_text()


def test_outside_its_range_and_between_degrees_the_control_says_so(browser_page: Page) -> None:
    page = browser_page
    page.goto("solvents/acetone.html")
    page.locator("#at-field").fill("180")
    said = page.locator("#at-value").inner_text()
    assert re.match(r"Nothing is known at 180 °C\. Values go from −?\d+ to \d+ °C\.", said)
    page.locator("#at-field").fill("22.4")
    said = page.locator("#at-value").inner_text()
    assert "at 22 °C" in said
    assert "nearest" in said


def test_value_number_and_citation_are_copied(
    open_page: Callable[..., Page], site_url: str
) -> None:
    page = open_page()
    page.context.grant_permissions(["clipboard-read", "clipboard-write"], origin=site_url)
    page.goto("solvents/acetone.html")
    for button, pattern in (
        ("Copy ε", r"\d\d\.\d+ ± 0\.\d+ at 25 °C"),
        ("Copy CAS number", r"67-64-1"),
        ("Copy citation", r"Acetone \(67-64-1\): relative permittivity .*data revision \w+\."),
    ):
        page.get_by_role("button", name=button).click()
        page.get_by_role("button", name="Copied").wait_for()
        assert re.fullmatch(pattern, page.evaluate("navigator.clipboard.readText()"))
        page.get_by_role("button", name=button).wait_for()


def test_all_its_numbers_as_csv(browser_page: Page, built_site: Path) -> None:
    browser_page.goto("solvents/acetone.html")
    link = browser_page.get_by_role("link", name="All numbers as CSV")
    path = link.evaluate("a => new URL(a.href).pathname")
    own = list(csv.DictReader(io.StringIO((built_site / path.lstrip("/")).read_text("utf-8"))))
    with (built_site / "downloads" / "values.csv").open(encoding="utf-8", newline="") as file:
        assert own == [row for row in csv.DictReader(file) if row["solvent"] == "acetone"]
    assert len(own) > 100
