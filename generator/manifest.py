"""What a published site was made from and what it holds, so that the next build does only the rest.

The record lies with the kept results, not in the site. It is believed only as far as the files of
the site still have the content it names: a site that was changed, moved or swapped meanwhile costs
time and is never taken for another.
"""

from __future__ import annotations

import hashlib
import json
import os
import shutil
import sys
from collections.abc import Iterable, Iterator, Mapping
from concurrent.futures import ThreadPoolExecutor
from dataclasses import asdict, dataclass, field
from pathlib import Path
from typing import Any

from generator.cache import Cache, digest
from generator.parallel import processors

_KIND = "site"
_PACKAGE = Path(__file__).parent


@dataclass(frozen=True, slots=True)
class Manifest:
    """One finished site.

    ``inputs`` is the hash of everything under ``watched``, ``files`` the hash of each file of the
    site by its path. ``pages`` is what the build itself wants to know again of each page.
    """

    inputs: str = ""
    watched: tuple[str, ...] = ()
    files: Mapping[str, str] = field(default_factory=dict)
    pages: Mapping[str, Any] = field(default_factory=dict)


NONE = Manifest()
"""Nothing is known of an earlier site."""


def read(cache: Cache, site: Path) -> Manifest:
    """What is known of the site in a folder."""
    stored = cache.get(_KIND, _key(site))
    if stored is None:
        return NONE
    try:
        known = json.loads(stored)
        return Manifest(known["inputs"], tuple(known["watched"]), known["files"], known["pages"])
    except (ValueError, KeyError, TypeError):  # of another version
        return NONE


def write(cache: Cache, site: Path, made: Manifest) -> None:
    """Remember the site that has just been put in a folder."""
    cache.put(_KIND, _key(site), json.dumps(asdict(made), ensure_ascii=False).encode())


def _key(site: Path) -> str:
    return digest(str(site.resolve()))


# ---- what a site is made from ------------------------------------------------------------------


def fingerprint(watched: Iterable[str | Path]) -> str:
    """Hash of files, of folders with everything in them, of this code and the packages it uses."""
    return digest(code(), [(str(path), _tree(Path(path))) for path in watched])


def code() -> str:
    """Hash of this package, of the Python that runs it, and of what is installed beside it."""
    installed = sorted(
        entry.name
        for folder in dict.fromkeys(sys.path)
        if Path(folder).is_dir()
        for entry in Path(folder).iterdir()
        if entry.name.endswith(".dist-info")
    )
    day = os.environ.get("SOURCE_DATE_EPOCH", "")
    return digest(sys.version, installed, day, _tree(_PACKAGE))


def _tree(top: Path) -> list[tuple[str, str]]:
    """Path and hash of every file that counts, in order; hidden ones belong to other programs."""
    if top.is_file():
        return [("", _hash_of(top))]
    return [(path.relative_to(top).as_posix(), _hash_of(path)) for path in sorted(_files(top))]


def _files(top: Path) -> Iterator[Path]:
    for folder, inner, names in os.walk(top):
        inner[:] = [name for name in inner if not name.startswith((".", "__pycache__"))]
        for name in names:
            if not name.startswith((".", "~")):
                yield Path(folder, name)


def _hash_of(path: Path) -> str:
    try:
        with path.open("rb") as file:
            return hashlib.file_digest(file, "sha256").hexdigest()
    except OSError:
        return ""


# ---- what it holds -----------------------------------------------------------------------------


def contents(site: Path) -> dict[str, str]:
    """Path and hash of every file of a site, those under a dot left out."""
    paths = {path.relative_to(site).as_posix(): path for path in _files(site)}
    # Hashing lets go of the interpreter: threads are enough.
    with ThreadPoolExecutor(processors()) as pool:
        return dict(sorted(zip(paths, pool.map(_hash_of, paths.values()), strict=True)))


def take_over(site: Path, fresh: Path, paths: Iterable[str]) -> None:
    """Put files of one folder into another: the same file where the disk allows it, else a copy."""
    for path in paths:
        target = fresh / path
        target.parent.mkdir(parents=True, exist_ok=True)
        try:
            os.link(site / path, target)
        except OSError:
            shutil.copy2(site / path, target)
