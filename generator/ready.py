"""Where the handbook reaches into MkDocs beyond its documented hooks; nowhere else does.

A page that is already HTML passes through MkDocs without Markdown, and its search entry is
written directly instead of being parsed out of the page again.
"""

from __future__ import annotations

from collections.abc import Iterable
from pathlib import Path
from typing import TYPE_CHECKING, Any

from mkdocs.exceptions import MkDocsException, PluginError
from mkdocs.structure.files import File, InclusionLevel
from mkdocs.structure.pages import Page
from mkdocs.structure.toc import AnchorLink, TableOfContents

# What `run_mkdocs` raises when MkDocs refuses.
Refused = MkDocsException

if TYPE_CHECKING:
    from mkdocs.config.defaults import MkDocsConfig
    from mkdocs.structure.files import Files

    from generator.pages import Page as FinishedPage


class ReadyPage(Page):
    """A page whose body and table of contents are finished before MkDocs sees it."""

    def __init__(self, finished: FinishedPage, file: File, config: MkDocsConfig) -> None:
        super().__init__(finished.title, file, config)
        self._finished = finished

    def read_source(self, config: MkDocsConfig) -> None:
        """There is no source to read; the search entry is written separately."""
        self.markdown = ""
        self.meta = {
            "title": self._finished.title,
            "kind": self._finished.kind,
            "search": {"exclude": True},
        }
        self.meta |= {"hide": ["navigation"]} if self._finished.kind == "datasheet" else {}

    def render(self, config: MkDocsConfig, files: Files) -> None:
        """Hand over the finished body; no Markdown is run."""
        self.content = self._finished.html
        self.present_anchor_ids = {anchor for _, anchor, _ in self._finished.toc}
        self.toc = TableOfContents(_nested(self._finished.toc))


def _nested(entries: Iterable[tuple[int, str, str]]) -> list[AnchorLink]:
    roots: list[AnchorLink] = []
    trail: list[AnchorLink] = []
    for level, anchor, text in entries:
        link = AnchorLink(text, anchor, level)
        while trail and trail[-1].level >= level:
            trail.pop()
        (trail[-1].children if trail else roots).append(link)
        trail.append(link)
    return roots


def add_page(finished: FinishedPage, config: MkDocsConfig, files: Files) -> None:
    """Put a finished page among the files of the build, out of the navigation tree."""
    existing = files.get_file_from_path(finished.path)
    if existing is not None:
        raise PluginError(f"{finished.path} is generated and must not stand among the sources too")
    file = File.generated(config, finished.path, content="", inclusion=InclusionLevel.NOT_IN_NAV)
    files.append(file)
    ReadyPage(finished, file, config)


def add_search_entries(pages: Iterable[FinishedPage], config: MkDocsConfig) -> None:
    """One search entry a page, written directly into the theme's index."""
    entries = _search_entries(config)
    if entries is None:
        return
    for finished in pages:
        if finished.search_text:
            url = File(finished.path, None, config.site_dir, config.use_directory_urls).url
            entries.append(
                {"location": url, "title": finished.search_title, "text": finished.search_text}
            )


def write_index_as_script(config: MkDocsConfig) -> None:
    """The theme's search index once more as a script, which a browser loads from a file as well."""
    folder = Path(config.site_dir) / "search"
    index = folder / "search_index.json"
    if index.is_file():
        text = index.read_text(encoding="utf-8")
        (folder / "search_index.js").write_text(f"var __index = {text};\n", encoding="utf-8")


def _search_entries(config: MkDocsConfig) -> list[dict[str, Any]] | None:
    plugin = config.plugins.get("material/search")
    if plugin is None:
        return None
    entries: list[dict[str, Any]] | None = getattr(plugin.search_index, "entries", None)
    if not isinstance(entries, list):
        raise PluginError("the theme's search index has changed: see generator/ready.py")
    return entries


def run_mkdocs(config_file: Path, site: Path) -> None:
    """Build the handbook described by ``config_file`` into the folder ``site``.

    Raises ``Refused`` when MkDocs refuses.
    """
    from mkdocs.commands.build import build
    from mkdocs.config import load_config

    config = load_config(str(config_file), site_dir=str(site))
    config.plugins.on_startup(command="build", dirty=False)
    try:
        build(config)
    finally:
        config.plugins.on_shutdown()
