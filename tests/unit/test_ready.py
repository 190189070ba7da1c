"""Where the handbook reaches into MkDocs: fails when MkDocs is no longer what it was made for."""

from __future__ import annotations

import hashlib
import inspect
import json
import logging
from collections.abc import Callable
from pathlib import Path
from typing import Any

import pytest
from material.plugins.search.plugin import SearchIndex, SearchPlugin
from mkdocs.commands import build
from mkdocs.structure.files import File
from mkdocs.structure.pages import Page

from generator import ready
from generator.build import Site
from generator.pages import Page as FinishedPage
from generator.plugin import Wrapping

# What generator/ready.py relies on, by the hash of its source. When one has changed, read it: does
# ready.py still hold? Then write the new hash.
RELIED_ON: dict[Callable[..., Any], str] = {
    build.build: "c476b64474acfaa2",
    build._populate_page: "31a70ea4caef1e12",
    build._build_page: "adcdbd14b2361126",
    File.copy_file: "369c71ea1799a938",
    File.generated: "8699762cdd2d37a4",
    Page.validate_anchor_links: "874bc52fc630d5e8",
    SearchPlugin.on_post_build: "fa24b7a906c9eccf",
    SearchIndex.generate_search_index: "59ba9853f37a2b42",
}


@pytest.mark.parametrize(
    ("function", "known"), RELIED_ON.items(), ids=[f.__qualname__ for f in RELIED_ON]
)
def test_what_is_relied_on_is_as_it_was(function: Callable[..., Any], known: str) -> None:
    source = inspect.getsource(function)
    now = hashlib.sha256(source.encode()).hexdigest()[:16]
    assert now == known, f"{function.__qualname__} has changed: does generator/ready.py still hold?"


def _page(name: str, body: str) -> FinishedPage:
    toc = ((1, "top", name),)
    return FinishedPage(f"{name}.md", name, body.encode(), toc, name, f"about {name}", "table")


@pytest.fixture
def site(tmp_path: Path) -> Path:
    """A site of two pages and two files, of which one each stands in the published one."""
    (tmp_path / "pages").mkdir()
    (tmp_path / "pages" / "hand.md").write_text("# By hand\n\n[new](new.md#top)\n", "utf-8")
    (tmp_path / "mkdocs.yml").write_text(
        "site_name: Small\ndocs_dir: pages\nuse_directory_urls: false\n"
        "theme: {name: material, font: false}\nplugins: [search, datasheets]\n"
        "nav: [index.md, hand.md]\nvalidation: {links: {anchors: warn}}\n",
        "utf-8",
    )
    made = tmp_path / "site"
    pages = (_page("index", "<h1>Home</h1>"), _page("new", "<h1>New</h1>"), _page("old", ""))
    files = {"new.csv": b"new", "old.csv": b"old"}
    wrapping = Wrapping(tmp_path / "mkdocs.yml", made)
    places = wrapping.wrap(Site(pages, files, (), "12345678", 0), {"old.html", "old.csv"})
    assert places == {"index.md": "index.html", "new.md": "new.html", "old.md": "old.html"}
    return made


def test_what_stands_is_neither_rendered_nor_written(
    site: Path, caplog: pytest.LogCaptureFixture
) -> None:
    assert "<h1>New</h1>" in (site / "new.html").read_text(encoding="utf-8")
    assert (site / "new.csv").read_bytes() == b"new"
    assert not (site / "old.html").exists()
    assert not (site / "old.csv").exists()
    assert (site / "hand.html").exists()
    assert not [record for record in caplog.records if record.levelno >= logging.WARNING]


def test_the_search_knows_every_page_once(site: Path) -> None:
    index = json.loads((site / "search" / "search_index.json").read_text(encoding="utf-8"))
    found = [(entry["location"], entry["text"]) for entry in index["docs"]]
    for name in ("index", "new", "old"):
        assert found.count((f"{name}.html", f"about {name}")) == 1
    assert sum(location.startswith("hand.html") for location, _ in found) == 1
    script = (site / "search" / "search_index.js").read_text(encoding="utf-8")
    assert script == f"var __index = {json.dumps(index, separators=(',', ':'))};\n"


def test_without_an_address_there_is_no_map_of_the_site(site: Path) -> None:
    assert not list(site.glob("sitemap*"))


def test_settings_from_elsewhere_are_not_trusted(tmp_path: Path) -> None:
    (tmp_path / "docs").mkdir()
    for line, known in (("", True), ("copyright: !ENV [OWNER, nobody]\n", False)):
        (tmp_path / "mkdocs.yml").write_text(f"site_name: Small\n{line}", encoding="utf-8")
        assert bool(ready.sources(ready.load(tmp_path / "mkdocs.yml"))) == known
