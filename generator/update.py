"""Bring the published site up to date: what did not change is taken over, the rest is made.

The site that comes out is the site of a build from nothing, byte for byte. While the pages are
made in one process, another makes MkDocs ready.
"""

from __future__ import annotations

import gc
import shutil
from collections import Counter
from collections.abc import Callable, Iterator, Mapping
from contextlib import contextmanager
from dataclasses import asdict, dataclass, field, fields, replace
from hashlib import sha256
from importlib import import_module
from pathlib import Path
from typing import TYPE_CHECKING, Any

from generator import manifest
from generator.cache import Cache, hash_of
from generator.errors import DatasetError, Problem
from generator.manifest import Manifest
from generator.parallel import Begun
from generator.publish import PublishError, publish

if TYPE_CHECKING:
    from generator.build import Site
    from generator.metrics import Settings
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
    cache = Cache(_cache(config_file))
    made: list[Manifest] = []

    def make(fresh: Path) -> bool:
        last = manifest.read(cache, site)
        same = last.inputs and manifest.fingerprint(last.watched) == last.inputs
        if same and manifest.contents(site, last) == last.files:
            made.append(last)
            return False
        made.append(_made(config_file, site, fresh, last, say))
        return True

    with _no_collection():
        changed = publish(site, make)
    if changed:
        manifest.write(cache, site, made[0])
    summary = made[0].summary
    return Report(changed, **(summary if changed else {**summary, "anew": 0}))


@contextmanager
def _no_collection() -> Iterator[None]:
    """Leave the collector of cycles out: a build makes millions of objects and hardly a cycle."""
    was = gc.isenabled()
    gc.disable()
    try:
        yield
    finally:
        if was:
            gc.enable()


def _cache(config_file: Path) -> Path:
    return config_file.resolve().parent / ".cache"


@dataclass(frozen=True, slots=True)
class _Plan:
    """What a handbook is made from. ``sources``: what every page depends on beside the tables."""

    config: str
    settings: Settings
    sources: tuple[str, ...]
    data: Path

    @property
    def watched(self) -> tuple[str, ...]:
        return *self.sources, str(self.data)


@dataclass(frozen=True, slots=True)
class _Outcome:
    """The pages that were made, what of the published site still stands, and the files that do not.

    ``written`` are those files, pages apart, with the hash of each: they are in place already.
    """

    site: Site
    standing: frozenset[str]
    written: Mapping[str, str]


def _made(
    config_file: Path, site: Path, fresh: Path, last: Manifest, say: Callable[[str], None]
) -> Manifest:
    """Fill the folder ``fresh``; start over where the tables changed while they were read."""
    for _ in range(_TRIES):
        plan = _plan(config_file, last)
        inputs = manifest.fingerprint(plan.watched)
        try:
            draft = _drafted(config_file, site, fresh, last, plan, say)
        except DatasetError:
            if manifest.fingerprint(plan.watched) == inputs:
                raise
        else:
            if manifest.fingerprint(plan.watched) == inputs:
                return replace(draft, inputs=inputs if plan.sources else "")
        say("Something was saved meanwhile: starting over")
        shutil.rmtree(fresh)
        fresh.mkdir()
    raise PublishError("the tables keep changing while they are read; try again")


def _drafted(
    config_file: Path,
    site: Path,
    fresh: Path,
    last: Manifest,
    plan: _Plan,
    say: Callable[[str], None],
) -> Manifest:
    # Loaded before the other process is split off, so that it is loaded only once.
    import_module("generator.build")
    frame = _frame(config_file, plan)
    there = manifest.contents(site, last) if last.files else {}
    intact = {path: content for path, content in last.files.items() if there.get(path) == content}
    still = intact if frame and frame == last.frame else {}
    pages = {place: page for place, page in last.pages.items() if place in still}
    last = replace(last, files=intact, pages=pages)
    begun = Begun(lambda: _outcome(plan, _cache(config_file), last, fresh, say))
    from generator.plugin import Wrapping  # with MkDocs, while the other process is at work

    wrapping = Wrapping(config_file, fresh)
    outcome = begun.result()
    if not isinstance(outcome, _Outcome):
        raise DatasetError(outcome)
    say("Putting the pages into their frame")
    places = wrapping.wrap(outcome.site, outcome.standing | outcome.written.keys())
    files = manifest.contents(fresh, _known_by(fresh, outcome.written))
    manifest.take_over(site, fresh, outcome.standing)
    files |= {path: last.files[path] for path in outcome.standing}
    made = outcome.site
    return Manifest(
        plan.config,
        asdict(plan.settings),
        plan.watched,
        "",
        frame,
        dict(sorted(files.items())),
        manifest.stamps(fresh, files),
        {places[page.path]: _record(page) for page in made.pages},
        {
            "substances": made.substances,
            "pages": len(made.pages),
            "anew": sum(bool(page.body) for page in made.pages),
            "findings": dict(Counter(finding.severity for finding in made.findings)),
        },
    )


def _plan(config_file: Path, last: Manifest) -> _Plan:
    """What a handbook is made from, as remembered while the settings are the same file."""
    config = hash_of(config_file)
    if last.inputs and config == last.config:
        from generator.metrics import Settings

        known: dict[str, Any] = {
            key: tuple(value) if isinstance(value, list) else value
            for key, value in last.settings.items()
        }
        *sources, data = last.watched
        return _Plan(config, Settings(**known), tuple(sources), Path(data))
    from generator.plugin import configured

    found = configured(config_file)
    return _Plan(config, found.settings, found.sources, found.data)


def _frame(config_file: Path, plan: _Plan) -> str:
    """Hash of what every page depends on, "" where that cannot be said."""
    if not plan.sources:
        return ""
    # A datasheet that is named in the navigation lends its title to every page.
    named = b"solvents/" in config_file.read_bytes()
    more = [plan.data / "solvents.csv"] if named else []
    return manifest.fingerprint([*plan.sources, *more])


def _outcome(
    plan: _Plan, cache: Path, last: Manifest, fresh: Path, say: Callable[[str], None]
) -> _Outcome | tuple[Problem, ...]:
    """Make the site but for what stands in the last one; or tell what is wrong with the tables.

    Files that are no pages go to the folder ``fresh`` at once.
    """
    from generator.build import build_site
    from generator.pages import Page

    known, places = {}, {}
    for place, record in last.pages.items():
        toc = tuple((level, anchor, text) for level, anchor, text in record["toc"])
        page = Page(**{**record, "toc": toc}, body=b"")
        known[page.path], places[page.path] = page, place
    try:
        made = build_site(plan.data, plan.settings, cache, known, say)
    except DatasetError as error:
        return error.problems
    pages = {places[page.path] for page in made.pages if not page.body}
    hashes = {path: sha256(content).hexdigest() for path, content in made.files.items()}
    files = {path for path, content in hashes.items() if content == last.files.get(path)}
    written = {path: content for path, content in hashes.items() if path not in files}
    for path in written:
        (fresh / path).parent.mkdir(parents=True, exist_ok=True)
        (fresh / path).write_bytes(made.files[path])
    names = dict.fromkeys(made.files, b"")
    return _Outcome(replace(made, files=names), frozenset(pages | files), written)


def _known_by(folder: Path, written: Mapping[str, str]) -> Manifest:
    return Manifest(files=written, stamps=manifest.stamps(folder, written))


def _record(page: Page) -> dict[str, Any]:
    return {f.name: getattr(page, f.name) for f in fields(page) if f.name != "body"}
