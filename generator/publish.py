"""Put a finished site in the place of the last one, whole or not at all.

A build fills a folder of its own beside the site; the two are then exchanged in one step, so that
a reader sees the old site or the new one. A build that is killed leaves its folder behind, which
the next one sweeps away. A lock keeps two builds of one site apart.
"""

from __future__ import annotations

import errno
import os
import shutil
import stat
import sys
import tempfile
from collections.abc import Callable, Iterator
from contextlib import contextmanager
from pathlib import Path
from typing import IO

# What every finished handbook holds: nothing else is ever replaced.
_SIGNS = ("index.html", "404.html")
_EXCHANGE = 2  # RENAME_EXCHANGE of renameat2(2)
_HERE = -100  # AT_FDCWD: paths are as they stand


class PublishError(Exception):
    """Nothing was published; the message says why in one line."""


def publish(site: Path, make: Callable[[Path], bool]) -> bool:
    """Let ``make`` fill a new folder beside ``site``, then exchange the two.

    When ``make`` raises, or returns False because there is nothing to do, ``site`` stays as it
    was and the new folder is removed. Returns whether something was published. Raises
    ``PublishError`` when another build is at work, or when ``site`` is not the place for one.
    """
    site = site.resolve()
    try:
        site.parent.mkdir(parents=True, exist_ok=True)
        lock = site.with_name(f".{site.name}.lock").open("a+b")
    except OSError as error:
        raise PublishError(f"cannot write beside {site}: {error.strerror}") from error
    with lock, _held(lock, site):
        _sweep(site)
        _refuse_foreign(site)
        fresh = Path(tempfile.mkdtemp(prefix=f".{site.name}-new-", dir=site.parent))
        try:
            if not make(fresh):
                return False
            fresh.chmod(stat.S_IMODE(site.stat().st_mode) if site.exists() else 0o755)
            _keep_hidden(site, fresh)
            _swap(fresh, site)
            return True
        finally:
            shutil.rmtree(fresh, ignore_errors=True)


@contextmanager
def _held(lock: IO[bytes], site: Path) -> Iterator[None]:
    """Hold the lock, which the system takes back however the process ends."""
    try:
        _take(lock)
    except OSError:
        lock.seek(0)
        owner = lock.read().decode(errors="replace") or "unknown"
        raise PublishError(
            f"another build of {site} is at work (process {owner}); try again when it is done"
        ) from None
    lock.truncate(0)
    lock.write(str(os.getpid()).encode())
    lock.flush()
    yield


def _take(lock: IO[bytes]) -> None:
    # A lock of the process, not of the open file: the helpers it starts do not inherit it.
    if sys.platform == "win32":
        import msvcrt

        lock.seek(1 << 30)
        msvcrt.locking(lock.fileno(), msvcrt.LK_NBLCK, 1)
    else:
        import fcntl

        fcntl.lockf(lock, fcntl.LOCK_EX | fcntl.LOCK_NB)


def _sweep(site: Path) -> None:
    """Clear away what killed builds left; a site caught halfway between two names goes back."""
    for old in site.parent.glob(f".{site.name}-old-*"):
        if not site.exists():
            old.rename(site)
        else:
            shutil.rmtree(old, ignore_errors=True)
    for half_made in site.parent.glob(f".{site.name}-new-*"):
        shutil.rmtree(half_made, ignore_errors=True)


def _refuse_foreign(site: Path) -> None:
    if not site.exists():
        return
    if not site.is_dir():
        raise PublishError(f"{site} is a file; name a folder for the handbook")
    names = {entry.name for entry in site.iterdir() if not entry.name.startswith(".")}
    if names and not names.issuperset(_SIGNS):
        raise PublishError(f"{site} holds something other than a handbook; name another folder")


def _keep_hidden(site: Path, fresh: Path) -> None:
    """Carry over what a web server or version control keeps in the folder under a dot."""
    for entry in site.glob(".*"):
        if entry.is_dir() and not entry.is_symlink():
            shutil.copytree(entry, fresh / entry.name, symlinks=True)
        else:
            shutil.copy2(entry, fresh / entry.name, follow_symlinks=False)


def _swap(fresh: Path, site: Path) -> None:
    if not site.exists():
        fresh.rename(site)
    elif not _exchange(fresh, site):
        old = site.with_name(f".{site.name}-old-{fresh.name[-8:]}")
        site.rename(old)
        try:
            fresh.rename(site)
        except OSError:
            old.rename(site)
            raise
        shutil.rmtree(old, ignore_errors=True)


def _exchange(one: Path, other: Path) -> bool:
    """Exchange two folders in one step; False where the system has no such step."""
    if sys.platform != "linux":
        return False
    import ctypes

    library = ctypes.CDLL(None, use_errno=True)
    if not hasattr(library, "renameat2"):
        return False
    names = os.fsencode(one), os.fsencode(other)
    if library.renameat2(_HERE, names[0], _HERE, names[1], _EXCHANGE) == 0:
        return True
    code = ctypes.get_errno()
    if code in (errno.ENOSYS, errno.EINVAL):
        return False
    raise OSError(code, os.strerror(code), str(other))
