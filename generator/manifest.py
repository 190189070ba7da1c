"""What a published site was made from and what it holds, so that the next build does only the rest.

The record lies with the kept results, not in the site. It is believed only as far as the files of
the site still have the content it names: a site that was changed, moved or swapped meanwhile costs
time and is never taken for another.
"""

from __future__ import annotations

import contextlib
import json
import os
import shutil
from collections.abc import Iterable, Mapping, Sequence
from concurrent.futures import ThreadPoolExecutor
from dataclasses import dataclass, field, fields
from pathlib import Path
from typing import Any

from generator.cache import Cache, digest, files_in, hash_of, tree
from generator.kept import code, templates
from generator.parallel import processors

_KIND = "site"


@dataclass(frozen=True, slots=True)
class Manifest:
    """One finished site.

    ``config`` is the hash of the file of settings and ``settings`` what it sets; ``watched`` are
    the files and folders the site was made from, ``inputs`` is a hash of all of them and ``frame``
    of those that every page depends on; ``files`` holds the hash of each file of the site by its
    path and ``stamps`` its time and size, ``pages`` what the build itself wants to know again of
    each page, by the same, and ``summary`` what there is to tell of the whole.
    """

    config: str = ""
    settings: Mapping[str, Any] = field(default_factory=dict)
    watched: Sequence[str] = ()
    inputs: str = ""
    frame: str = ""
    files: Mapping[str, str] = field(default_factory=dict)
    stamps: Mapping[str, Sequence[int]] = field(default_factory=dict)
    pages: Mapping[str, Any] = field(default_factory=dict)
    summary: Mapping[str, Any] = field(default_factory=dict)


def read(cache: Cache, site: Path) -> Manifest:
    """What is known of the site in a folder."""
    stored = cache.get(_KIND, _key(site))
    return Manifest() if stored is None else Manifest(**json.loads(stored))


def write(cache: Cache, site: Path, made: Manifest) -> None:
    """Remember the site that has just been put in a folder."""
    record = {f.name: getattr(made, f.name) for f in fields(made)}
    cache.put(_KIND, _key(site), json.dumps(record, ensure_ascii=False).encode())


def _key(site: Path) -> str:
    # Another version of this class keeps its records apart.
    return digest(str(site.resolve()), Manifest.__slots__)


def fingerprint(watched: Iterable[str | Path]) -> str:
    """Hash of files, of folders with everything in them, of this code and the packages it uses."""
    day = os.environ.get("SOURCE_DATE_EPOCH")
    return digest(day, code(), templates(), [(str(path), tree(Path(path))) for path in watched])


def contents(site: Path, known: Manifest | None = None) -> dict[str, str]:
    """Path and hash of every file of a site, those under a dot left out.

    A file that has the time and size on record is taken to have the content on record.
    """
    paths = {path.relative_to(site).as_posix(): path for path in files_in(site)}
    found = {}
    if known is not None:
        found = {
            path: known.files[path]
            for path, stamp in stamps(site, paths).items()
            if stamp == known.stamps.get(path)
        }
    rest = {name: path for name, path in paths.items() if name not in found}
    # Hashing lets go of the interpreter: threads are enough.
    with ThreadPoolExecutor(processors()) as pool:
        found |= zip(rest, pool.map(hash_of, rest.values()), strict=True)
    return dict(sorted(found.items()))


def stamps(site: Path, paths: Iterable[str]) -> dict[str, list[int]]:
    """Time [ns] and size of files of a site."""
    found = {}
    for path in paths:
        with contextlib.suppress(OSError):
            status = (site / path).stat()
            found[path] = [status.st_mtime_ns, status.st_size]
    return found


def take_over(site: Path, fresh: Path, paths: Iterable[str]) -> None:
    """Put files of one folder into another: the same file where the disk allows it, else a copy."""
    for path in paths:
        target = fresh / path
        target.parent.mkdir(parents=True, exist_ok=True)
        try:
            os.link(site / path, target)
        except OSError:
            shutil.copy2(site / path, target)
