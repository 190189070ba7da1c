"""Results kept on disk under the hash of everything they depend on.

Each entry carries the hash of its own content: a damaged entry is noticed, dropped and made
again, so it costs time and never a wrong number.
"""

from __future__ import annotations

import contextlib
import hashlib
import os
import tempfile
from pathlib import Path

_HASH_BYTES = 32


def digest(*parts: object) -> str:
    """Hash of the parts' ``repr`` in order; equal parts give equal hashes in every run."""
    joined = "\x1f".join(repr(part) for part in parts)
    return hashlib.sha256(joined.encode()).hexdigest()[:40]


class Cache:
    """A folder of results. Without a folder nothing is kept."""

    def __init__(self, folder: Path | None) -> None:
        self._folder = folder

    def _path(self, kind: str, key: str) -> Path | None:
        return None if self._folder is None else self._folder / kind / key[:2] / key

    def get(self, kind: str, key: str) -> bytes | None:
        """The kept content, or None where there is none or it was damaged."""
        path = self._path(kind, key)
        if path is None:
            return None
        try:
            stored = path.read_bytes()
        except OSError:
            return None
        seal, data = stored[:_HASH_BYTES], stored[_HASH_BYTES:]
        return data if _seal(kind, key, data) == seal else None

    def put(self, kind: str, key: str, data: bytes) -> None:
        """Keep ``data``; a full or read-only disk means it is not kept, and no more than that."""
        path = self._path(kind, key)
        if path is None:
            return
        with contextlib.suppress(OSError):
            path.parent.mkdir(parents=True, exist_ok=True)
            handle, name = tempfile.mkstemp(dir=path.parent)
            try:
                with os.fdopen(handle, "wb") as file:
                    file.write(_seal(kind, key, data) + data)
                os.replace(name, path)
            except OSError:
                Path(name).unlink(missing_ok=True)


def _seal(kind: str, key: str, data: bytes) -> bytes:
    # The key is part of the seal, so an intact entry under a wrong name is refused as well.
    return hashlib.sha256(f"{kind}/{key}/".encode() + data).digest()
