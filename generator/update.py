"""Bring the published site up to date: what did not change is taken over, the rest is made.

The site that comes out is the site of a build from nothing, byte for byte.
"""

from __future__ import annotations

import shutil
from collections import Counter
from collections.abc import Callable, Mapping
from dataclasses import dataclass, field, fields
from pathlib import Path
from typing import TYPE_CHECKING, Any

from generator import manifest
from generator.cache import Cache
from generator.errors import DatasetError
from generator.manifest import Manifest
from generator.publish import PublishError, publish

if TYPE_CHECKING:
    from generator.build import Site
    from generator.pages import Page

# How often a build starts over because a table was saved while it ran.
_TRIES = 3


@dataclass(frozen=True, slots=True)
class Report:
    """What a build did. ``anew``: pages made anew; ``findings`` are counted by severity."""

    changed: bool
    substances: int
    pages: int
    anew: int
    findings: Mapping[str, int] = field(default_factory=dict)


def update(config_file: Path, site: Path, say: Callable[[str], None]) -> Report:
    """Build the handbook that ``config_file`` describes and publish it in the folder ``site``.

    ``say`` is told each stage before it starts. Raises ``DatasetError`` when the tables cannot be
    used, ``PublishError`` or ``OSError`` when the disk or another build is in the way, and
    ``ready.Refused`` when MkDocs refuses; ``site`` is then as it was.
    """
    cache = Cache(config_file.resolve().parent / ".cache")
    made: list[Manifest] = []

    def make(fresh: Path) -> bool:
        last = manifest.read(cache, site)
        there = manifest.contents(site) if last.files else {}
        same = last.inputs and there == last.files
        if same and manifest.fingerprint(last.watched) == last.inputs:
            made.append(last)
            return False
        intact = {path for path, content in last.files.items() if there.get(path) == content}
        made.append(_made(config_file, site, fresh, last, intact, say))
        return True

    changed = publish(site, make)
    if changed:
        manifest.write(cache, site, made[0])
    summary = made[0].summary
    return Report(changed, **(summary if changed else {**summary, "anew": 0}))


def _made(
    config_file: Path,
    site: Path,
    fresh: Path,
    last: Manifest,
    intact: set[str],
    say: Callable[[str], None],
) -> Manifest:
    """Fill the folder ``fresh``; start over where the tables changed while they were read."""
    from generator import plugin, ready

    for _ in range(_TRIES):
        config = ready.load(config_file, fresh)
        own = plugin.plugin_of(config)
        data, sources = own.folder(config), ready.sources(config)
        watched = (*sources, str(data))
        inputs = manifest.fingerprint(watched)
        frame = _frame(config_file, sources, data)
        try:
            made = own.make(config, _known(last, frame, intact), say)
            standing = _standing(made, last, intact)
            own.hand_over(made, standing)
            ready.run(config)
        except DatasetError:
            if manifest.fingerprint(watched) == inputs:
                raise
        else:
            if manifest.fingerprint(watched) == inputs:
                break
        say("The tables were saved meanwhile: starting over")
        shutil.rmtree(fresh)
        fresh.mkdir()
    else:
        raise PublishError("the tables keep changing while they are read; try again")
    say("Publishing")
    stood = [own.places[page.path] for page in made.pages if not page.html]
    files = manifest.contents(fresh)
    manifest.take_over(site, fresh, (*stood, *standing))
    files |= {path: last.files[path] for path in (*stood, *standing)}
    return Manifest(
        watched,
        inputs if sources else "",
        frame,
        dict(sorted(files.items())),
        {own.places[page.path]: _record(page) for page in made.pages},
        {
            "substances": len(made.handbook.dataset.solvents),
            "pages": len(made.pages),
            "anew": len(made.pages) - len(stood),
            "findings": dict(Counter(finding.severity for finding in made.findings)),
        },
    )


def _frame(config_file: Path, sources: tuple[str, ...], data: Path) -> str:
    """Hash of what every page depends on, "" where that cannot be said."""
    if not sources:
        return ""
    # A datasheet that is named in the navigation lends its title to every page.
    named = b"solvents/" in config_file.read_bytes()
    return manifest.fingerprint([*sources, *([data / "solvents.csv"] if named else [])])


def _known(last: Manifest, frame: str, intact: set[str]) -> dict[str, Page]:
    """The pages that can be taken over if they come out the same."""
    from generator.pages import Page

    if not frame or last.frame != frame:
        return {}
    found = {}
    for place, record in last.pages.items():
        if place in intact:
            toc = tuple((level, anchor, text) for level, anchor, text in record["toc"])
            found[record["path"]] = Page(**{**record, "toc": toc}, html="")
    return found


def _record(page: Page) -> dict[str, Any]:
    return {f.name: getattr(page, f.name) for f in fields(page) if f.name != "html"}


def _standing(made: Site, last: Manifest, intact: set[str]) -> set[str]:
    """The files, pages apart, that the published site holds already."""
    return {
        path
        for path, content in made.files.items()
        if path in intact and manifest.same(content, last.files[path])
    }
