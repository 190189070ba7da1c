"""Where the handbook reaches into MkDocs beyond its documented hooks; nowhere else does.

A page that is already HTML passes through MkDocs without Markdown, and its search entry is
written directly instead of being parsed out of the page again. Pages and files that stand
unchanged in the published site are known to MkDocs, and are neither rendered nor written. The
body is put into the frame when the theme and the search have done with the page: they would look
through every one of it.
"""

from __future__ import annotations

import logging
import os
from collections.abc import Iterable
from pathlib import Path
from typing import TYPE_CHECKING, Any

from jinja2 import FileSystemLoader
from mkdocs.exceptions import MkDocsException, PluginError
from mkdocs.structure.files import File, InclusionLevel
from mkdocs.structure.pages import Page
from mkdocs.structure.toc import AnchorLink, TableOfContents

from generator.cache import Cache, files_in
from generator.compiled import Compiled

# What `load` and `run` raise when MkDocs refuses.
Refused = MkDocsException


if TYPE_CHECKING:
    from mkdocs.config.defaults import MkDocsConfig
    from mkdocs.structure.files import Files

    from generator.pages import Page as FinishedPage


# Where the body goes. The theme looks whether it has a heading, and ours whether it has a foot.
_PLACE = "<h1>page-foot: the body goes here</h1>"


class ReadyFile(File):
    """A generated file. One that ``stands`` in the published site is not written again."""

    stands = False

    def is_modified(self) -> bool:
        """Whether MkDocs, when it looks for changes, shall render and write it."""
        return not self.stands


class ReadyPage(Page):
    """A page whose body and table of contents are finished before MkDocs sees it."""

    def __init__(self, finished: FinishedPage, file: File, config: MkDocsConfig) -> None:
        super().__init__(finished.title, file, config)
        self._finished = finished
        self.present_anchor_ids = {anchor for _, anchor, _ in finished.toc}

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
        """Nothing is to be rendered; the place of the body is marked."""
        self.content = _PLACE
        self.toc = TableOfContents(_nested(self._finished.toc))

    def filled(self, output: str) -> str:
        """The page in its frame with its body in place."""
        return output.replace(_PLACE, self._finished.html, 1)


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


def add_page(finished: FinishedPage, config: MkDocsConfig, files: Files) -> str:
    """Put a finished page among the files of the build, out of the navigation tree.

    Returns where in the site it will be.
    """
    existing = files.get_file_from_path(finished.path)
    if existing is not None:
        raise PluginError(f"{finished.path} is generated and must not stand among the sources too")
    outside = InclusionLevel.NOT_IN_NAV
    file = ReadyFile.generated(config, finished.path, content="", inclusion=outside)
    assert isinstance(file, ReadyFile)
    file.stands = not finished.body
    files.append(file)
    ReadyPage(finished, file, config)
    return file.dest_uri


def add_file(
    path: str, content: bytes, config: MkDocsConfig, files: Files, *, stands: bool
) -> None:
    """Put a finished file that is no page among the files of the build."""
    file = ReadyFile.generated(config, path, content=content)
    assert isinstance(file, ReadyFile)
    file.stands = stands
    files.append(file)


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


def load(config_file: Path, site: Path | None = None) -> MkDocsConfig:
    """The settings of a handbook, to be built into the folder ``site``.

    Raises ``Refused`` when MkDocs cannot use them.
    """
    from mkdocs.config import load_config

    # The theme's notice about its successor; see DEVELOPERS.md.
    os.environ.setdefault("NO_MKDOCS_2_WARNING", "1")
    place = {} if site is None else {"site_dir": str(site)}
    return load_config(str(config_file), **place)


def sources(config: MkDocsConfig) -> tuple[str, ...]:
    """The files and folders that every page depends on, beside the tables.

    Empty where they cannot be named: settings that come from elsewhere.
    """
    file = Path(str(config.config_file_path))
    text = file.read_text(encoding="utf-8")
    if "INHERIT" in text or "!ENV" in text:
        return ()
    folders: list[str | Path] = [
        file,
        config.docs_dir,
        config.theme.custom_dir or "",
        *map(str, config.hooks),
    ]
    return tuple(str(Path(file.parent, place).resolve()) for place in folders if place)


class _Theme(FileSystemLoader):
    """The theme's files without its thousands of icons, which MkDocs would list and leave out."""

    def list_templates(self) -> list[str]:
        """The name of every file that is not under a dot."""
        return sorted(
            {path.relative_to(top).as_posix() for top in self.searchpath for path in files_in(top)}
        )


def run(config: MkDocsConfig, cache: Cache) -> None:
    """Let MkDocs build what differs from the published site.

    ``cache`` keeps compiled templates. Raises ``Refused`` when MkDocs refuses.
    """
    from mkdocs.commands import build

    # One set of templates for all who ask for the theme's.
    env = config.theme.get_env()
    env.loader, env.bytecode_cache = _Theme(config.theme.dirs), Compiled(cache)
    setattr(config.theme, "get_env", lambda: env)  # noqa: B010, a method for this build alone

    config.plugins.on_startup(command="build", dirty=False)
    build.log.addFilter(_is_no_warning_of_dirt)
    try:
        build.build(config, dirty=True)
    finally:
        build.log.removeFilter(_is_no_warning_of_dirt)
        config.plugins.on_shutdown()


def _is_no_warning_of_dirt(record: logging.LogRecord) -> bool:
    """Looking for changes is what MkDocs calls dirty and warns of; here nothing is left to it."""
    return not record.getMessage().startswith("A 'dirty' build")
