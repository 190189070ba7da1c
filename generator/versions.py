"""Where a version of the tables is: a folder of tables, a published site, or a git revision."""

from __future__ import annotations

import io
import subprocess
import tarfile
import tempfile
from collections.abc import Iterator
from contextlib import contextmanager
from pathlib import Path

from generator.schema import DESCRIPTION

_PUBLISHED = Path("downloads") / "data"


class UnknownVersionError(Exception):
    """No version of the tables is called that; the message says what would be one."""


@contextmanager
def opened(name: str, data: Path) -> Iterator[Path]:
    """The folder with a version of the tables.

    ``name`` is a folder of tables, the folder of a published site, or a git revision of the
    repository in which the folder ``data`` lies; the files of a revision are there until the
    context ends. Raises ``UnknownVersionError``.
    """
    for folder in (Path(name), Path(name) / _PUBLISHED):
        if (folder / DESCRIPTION).is_file():
            yield folder
            return
    if Path(name).is_dir():
        raise UnknownVersionError(f"{name} holds neither tables nor a published site with tables")
    with tempfile.TemporaryDirectory() as passing:
        folder = Path(passing)
        for path, content in _revision(name, data):
            (folder / path).write_bytes(content)
        if not (folder / DESCRIPTION).is_file():
            raise UnknownVersionError(f"the revision {name} holds no tables at {data}")
        yield folder


def _revision(name: str, data: Path) -> Iterator[tuple[str, bytes]]:
    """The files of the folder ``data`` at a git revision."""
    if name.startswith("-"):
        raise UnknownVersionError(f"{name} is no revision")
    commit = _git(data, "rev-parse", "--verify", "--quiet", f"{name}^{{commit}}")
    if not commit:
        raise UnknownVersionError(
            f"{name} is no folder of tables, no published site, and no git revision of {data}"
        )
    top = Path(_git(data, "rev-parse", "--show-toplevel").decode().strip())
    inside = _git(data, "rev-parse", "--show-prefix").decode().strip().rstrip("/")
    archive = _git(top, "archive", "--format=tar", f"{commit.decode().strip()}:{inside}")
    if not archive:
        return
    with tarfile.open(fileobj=io.BytesIO(archive)) as files:
        for member in files:
            content = files.extractfile(member) if member.isfile() else None
            if content is not None and "/" not in member.name:
                yield member.name, content.read()


def _git(folder: Path, *arguments: str) -> bytes:
    """What git says, nothing where it refuses or is not there."""
    try:
        done = subprocess.run(["git", *arguments], cwd=folder, capture_output=True, check=False)
    except OSError:
        return b""
    return done.stdout if done.returncode == 0 else b""
