"""Results kept on disk under the hash of everything they depend on.

Each entry carries the hash of its own content: a damaged entry is noticed, dropped and made
again, so it costs time and never a wrong number. ``Cache`` keeps large results in a file each,
``Pack`` many small ones in one file.
"""

from __future__ import annotations

import contextlib
import hashlib
import os
import tempfile
import time
from collections.abc import Iterator, Mapping
from pathlib import Path

_HASH_BYTES = 32
_KEY_BYTES = 40
_LENGTH_BYTES = 8
_DAY = 86_400.0
# A result that no build has asked for in this long is cleared away [s].
_FORGOTTEN = 30 * _DAY


def digest(*parts: object) -> str:
    """Hash of the parts' ``repr`` in order; equal parts give equal hashes in every run."""
    joined = "\x1f".join(repr(part) for part in parts)
    return hashlib.sha256(joined.encode()).hexdigest()[:_KEY_BYTES]


def tree(top: Path) -> list[tuple[str, str]]:
    """Path and hash of every file below a folder, or of one file, in order.

    Files under a dot or ``~`` belong to editors and other programs and are passed over.
    """
    if not top.is_dir():
        return [("", hash_of(top))]
    return [(path.relative_to(top).as_posix(), hash_of(path)) for path in sorted(files_in(top))]


def files_in(top: Path) -> Iterator[Path]:
    """Every file below a folder, those passed over that belong to other programs."""
    for folder, inner, names in os.walk(top):
        inner[:] = [name for name in inner if not name.startswith((".", "__pycache__"))]
        for name in names:
            if not name.startswith((".", "~")):
                yield Path(folder, name)


def hash_of(path: Path) -> str:
    """Hash of the content of a file, "" where it cannot be read."""
    try:
        with path.open("rb") as file:
            return hashlib.file_digest(file, "sha256").hexdigest()
    except OSError:
        return ""


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
            with path.open("rb") as file:
                if time.time() - os.fstat(file.fileno()).st_mtime > _DAY:
                    with contextlib.suppress(OSError):
                        os.utime(path)
                stored = file.read()
        except OSError:
            return None
        seal, data = stored[:_HASH_BYTES], stored[_HASH_BYTES:]
        return data if _seal(kind, key, data) == seal else None

    def put(self, kind: str, key: str, data: bytes) -> None:
        """Keep ``data``; a full or read-only disk means it is not kept, and no more than that."""
        path = self._path(kind, key)
        if path is not None:
            _write(path, [_seal(kind, key, data), data])

    def pack(self, kind: str) -> Pack:
        """The small results of one kind, all in one file."""
        return Pack(None if self._folder is None else self._folder / f"{kind}.pack", kind)

    def sweep(self) -> None:
        """Clear away what no build has asked for in a month."""
        if self._folder is None:
            return
        with contextlib.suppress(OSError):
            for path in self._folder.glob("*/??/*"):
                if time.time() - path.stat().st_mtime > _FORGOTTEN:
                    path.unlink(missing_ok=True)


class Pack:
    """Small results in one file, read in one go; written anew with those that were asked for."""

    def __init__(self, path: Path | None, kind: str) -> None:
        self._path, self._kind = path, kind
        self._stored: dict[str, tuple[memoryview, memoryview]] = {}
        self._used: dict[str, tuple[bytes | memoryview, bytes | memoryview]] = {}
        self._changed = False
        if path is not None:
            with contextlib.suppress(OSError):
                self._stored = dict(_entries(memoryview(path.read_bytes())))

    def get(self, key: str) -> bytes | memoryview | None:
        """The kept content, or None where there is none or it was damaged."""
        if key in self._used:
            return self._used[key][1]
        found = self._stored.get(key)
        if found is None or found[0] != _seal(self._kind, key, found[1]):
            return None
        self._used[key] = found
        return found[1]

    def put(self, key: str, data: bytes) -> None:
        """Keep ``data`` from the next ``save`` on."""
        self._used[key] = (_seal(self._kind, key, data), data)
        self._changed = True

    def asked(self, since: int = 0) -> dict[str, bytes | None]:
        """What was asked for, in order, from a number on; with its content where it is new."""
        recent = list(self._used.items())[since:]
        return {
            key: None if self._stored.get(key) is entry else bytes(entry[1])
            for key, entry in recent
        }

    def adopt(self, asked: Mapping[str, bytes | None]) -> None:
        """Count as asked for here what was asked for in a copy of this process."""
        for key, data in asked.items():
            if key not in self._used:
                if data is None:
                    self._used[key] = self._stored[key]
                else:
                    self.put(key, data)

    def save(self, *, forget: bool) -> None:
        """Write what was added; with ``forget``, without what nobody asked for."""
        rest = {key: e for key, e in self._stored.items() if key not in self._used}
        if self._path is None or not (self._changed or (forget and rest)):
            return
        entries = self._used if forget else {**rest, **self._used}
        parts: list[bytes | memoryview] = []
        for key, (seal, data) in entries.items():
            parts += [key.encode(), len(data).to_bytes(_LENGTH_BYTES, "big"), seal, data]
        _write(self._path, parts)


def _entries(stored: memoryview) -> Iterator[tuple[str, tuple[memoryview, memoryview]]]:
    """Key → (seal, content) of a pack; behind a damaged length nothing is found any more."""
    head = _KEY_BYTES + _LENGTH_BYTES + _HASH_BYTES
    start = 0
    while start + head <= len(stored):
        key = bytes(stored[start : start + _KEY_BYTES]).decode("latin-1")
        length = int.from_bytes(stored[start + _KEY_BYTES : start + head - _HASH_BYTES], "big")
        seal = stored[start + head - _HASH_BYTES : start + head]
        start += head + length
        if start > len(stored):
            return
        yield key, (seal, stored[start - length : start])


def _write(path: Path, parts: list[bytes] | list[bytes | memoryview]) -> None:
    """Put a file in place whole, or leave things as they are where the disk does not let it."""
    with contextlib.suppress(OSError):
        path.parent.mkdir(parents=True, exist_ok=True)
        handle, name = tempfile.mkstemp(dir=path.parent)
        try:
            with os.fdopen(handle, "wb") as file:
                file.writelines(parts)
            Path(name).replace(path)
        except OSError:
            Path(name).unlink(missing_ok=True)


def _seal(kind: str, key: str, data: bytes | memoryview) -> bytes:
    # The key is part of the seal, so an intact entry under a wrong name is refused as well.
    seal = hashlib.sha256(f"{kind}/{key}/".encode())
    seal.update(data)
    return seal.digest()
