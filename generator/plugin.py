"""The MkDocs plugin: settings in, finished pages out. It holds no logic of its own."""

from __future__ import annotations

from collections.abc import Collection
from dataclasses import dataclass
from pathlib import Path
from typing import Any

from jinja2 import Environment
from mkdocs.config import config_options as option
from mkdocs.config.base import Config, ValidationError
from mkdocs.config.defaults import MkDocsConfig
from mkdocs.exceptions import PluginError
from mkdocs.livereload import LiveReloadServer
from mkdocs.plugins import BasePlugin, CombinedEvent, event_priority
from mkdocs.structure.files import Files
from mkdocs.structure.pages import Page

from generator import ready
from generator.build import Site, build_site
from generator.cache import Cache
from generator.compiled import Compiled
from generator.errors import DatasetError
from generator.metrics import Settings
from generator.units import ZERO_CELSIUS


class _Temperature(option.OptionallyRequired[float]):
    """A number in °C above absolute zero."""

    def run_validation(self, value: object) -> float:
        if isinstance(value, bool) or not isinstance(value, (int, float)):
            raise ValidationError(f"expected a temperature in °C, a plain number, found {value!r}")
        if value <= -ZERO_CELSIUS:
            raise ValidationError(f"{value} °C is below absolute zero")
        return float(value)


class DatasheetsConfig(Config):
    """The settings of ``plugins: - datasheets:`` in mkdocs.yml."""

    # MkDocs drops the underscore: a bare `data` would hide the dictionary its Config stands on.
    data_ = option.Type(str, default="data")
    laboratory = option.Type(str, default=Settings.laboratory)
    reference_temperature_c = _Temperature(default=Settings.reference_temperature_c)
    temperatures_c = option.ListOfItems(_Temperature(), default=list(Settings.temperatures_c))
    paper = option.Choice(("A4", "Letter"), default=Settings.paper)
    label_sheet: option.Type[Any] = option.Type((str, dict), default="")


def settings_of(config: DatasheetsConfig) -> Settings:
    """The generator's settings from the plugin's."""
    return Settings(
        laboratory=config.laboratory,
        reference_temperature_c=config.reference_temperature_c,
        temperatures_c=tuple(sorted(set(config.temperatures_c))),
        paper=config.paper,
    )


@dataclass(frozen=True, slots=True)
class Configured:
    """What mkdocs.yml says, for a command that makes no site.

    ``site`` is the address of the handbook, "" where it has none; ``sources`` see
    ``ready.sources``.
    """

    data: Path
    settings: Settings
    site: str
    label_sheet: str | dict[str, Any]
    sources: tuple[str, ...]


def configured(config_file: Path) -> Configured:
    """Read the settings of a handbook. Raises ``ready.Refused`` when they cannot be used."""
    config = ready.load(config_file)
    plugin = plugin_of(config)
    return Configured(
        data=plugin.folder(config),
        settings=settings_of(plugin.config),
        site=config.site_url or "",
        label_sheet=plugin.config.label_sheet,
        sources=ready.sources(config),
    )


class Wrapping:
    """MkDocs made ready to put the pages of a handbook into their frame, in an empty folder."""

    def __init__(self, config_file: Path, folder: Path) -> None:
        self._config = ready.load(config_file, folder)
        self._plugin = plugin_of(self._config)

    def wrap(self, site: Site, standing: Collection[str]) -> dict[str, str]:
        """Wrap and write what does not stand; where in the site each page is, by its path."""
        self._plugin.hand_over(site, standing)
        ready.run(self._config, Cache(_cache(self._config)))
        return self._plugin.places


def plugin_of(config: MkDocsConfig) -> DatasheetsPlugin:
    """This plugin among those of a handbook. Raises ``ready.Refused`` when it is not named."""
    plugin = config.plugins.get("datasheets")
    if not isinstance(plugin, DatasheetsPlugin):
        raise PluginError(f"{config.config_file_path} does not name the plugin datasheets")
    return plugin


def _home(config: MkDocsConfig) -> Path:
    return Path(config.config_file_path or "mkdocs.yml").resolve().parent


def _cache(config: MkDocsConfig) -> Path:
    return _home(config) / ".cache"


class DatasheetsPlugin(BasePlugin[DatasheetsConfig]):
    """Hands the generated pages and files to MkDocs."""

    _site: Site | None = None
    _standing: Collection[str] = ()

    def __init__(self) -> None:
        self.places: dict[str, str] = {}
        """Where in the site each generated page is, by its path."""

    def folder(self, config: MkDocsConfig) -> Path:
        """The folder of the tables, beside mkdocs.yml."""
        return _home(config) / self.config.data_

    def hand_over(self, site: Site, standing: Collection[str]) -> None:
        """Take pages and files made beforehand; those files that stand somewhere already."""
        self._site, self._standing = site, standing

    def on_config(self, config: MkDocsConfig) -> MkDocsConfig:
        """Without the address of the site its map would be empty, and dated."""
        if not config.site_url:
            config.theme.static_templates.discard("sitemap.xml")
        return config

    def on_pre_build(self, *, config: MkDocsConfig) -> None:
        """Make everything before MkDocs empties the site, so that bad data leave it untouched."""
        if self._site is None:
            try:
                folder, settings = self.folder(config), settings_of(self.config)
                self._site = build_site(folder, settings, _cache(config))
            except DatasetError as error:
                raise PluginError(str(error)) from error
        config.extra["data_revision"] = self._site.revision

    def on_files(self, files: Files, *, config: MkDocsConfig) -> Files:
        """Add the generated pages and files."""
        assert self._site is not None
        map_of_site = files.get_file_from_path("sitemap.xml")
        if map_of_site is not None and not config.site_url:
            files.remove(map_of_site)  # no template any more, and no file to be copied
        for page in self._site.pages:
            self.places[page.path] = ready.add_page(page, config, files)
        for path, content in self._site.files.items():
            ready.add_file(path, content, config, files, stands=path in self._standing)
        return files

    def on_env(self, env: Environment, *, config: MkDocsConfig, files: Files) -> Environment:
        """Keep the theme's compiled templates."""
        env.bytecode_cache = Compiled(Cache(_cache(config)))
        return env

    @event_priority(100)
    def on_post_page(self, output: str, *, page: Page, config: MkDocsConfig) -> str:
        """Put the body of a generated page in its place."""
        return page.filled(output) if isinstance(page, ready.ReadyPage) else output

    @event_priority(100)
    def _add_search_entries(self, *, config: MkDocsConfig) -> None:
        """Write the search entries before the theme writes its index."""
        assert self._site is not None
        ready.add_search_entries(self._site.pages, config)

    @event_priority(-100)
    def _write_index_as_script(self, *, config: MkDocsConfig) -> None:
        """Once the theme has written it."""
        ready.write_index_as_script(config)
        self._site = None  # a preview makes it anew

    on_post_build = CombinedEvent(_add_search_entries, _write_index_as_script)

    def on_serve(
        self, server: LiveReloadServer, *, config: MkDocsConfig, builder: object
    ) -> LiveReloadServer:
        """Watch the tables in the preview."""
        server.watch(str(self.folder(config)))
        return server
