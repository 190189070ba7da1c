"""Put a finished site in the place of the last one, whole or not at all."""

from __future__ import annotations

import os
import shutil
import tempfile
from collections.abc import Callable
from pathlib import Path


def publish(site: Path, make: Callable[[Path], None]) -> None:
    """Let ``make`` fill a new folder beside ``site``, then swap it in.

    When ``make`` raises, ``site`` stays as it was and the half-made folder is removed.
    """
    site = site.resolve()
    site.parent.mkdir(parents=True, exist_ok=True)
    fresh = Path(tempfile.mkdtemp(prefix=f".{site.name}-new-", dir=site.parent))
    try:
        make(fresh)
        os.chmod(fresh, 0o755)
        _swap(fresh, site)
    finally:
        shutil.rmtree(fresh, ignore_errors=True)


def _swap(fresh: Path, site: Path) -> None:
    if not site.exists():
        fresh.rename(site)
        return
    old = site.with_name(f".{site.name}-old-{fresh.name[-8:]}")
    site.rename(old)
    try:
        fresh.rename(site)
    except OSError:
        old.rename(site)
        raise
    shutil.rmtree(old, ignore_errors=True)
