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
_HEAD = _KEY_BYTES + _LENGTH_BYTES + _HASH_BYTES
# A pack is written anew when less than this share of it was asked for.
_WORTH = 0.8
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


def files_in(top: str | Path) -> Iterator[Path]:
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
        """Clear away what no build has asked for in a month; looked for once a day."""
        if self._folder is None:
            return
        with contextlib.suppress(OSError):
            done = self._folder / ".swept"
            if done.exists() and time.time() - done.stat().st_mtime < _DAY:
                return
            for path in self._folder.glob("*/??/*"):
                if time.time() - path.stat().st_mtime > _FORGOTTEN:
                    path.unlink(missing_ok=True)
            done.touch()


_Entry = tuple["bytes | memoryview", "bytes | memoryview"]


class Pack:
    """Small results in one file, read in one go. What is new is written behind what is there."""

    def __init__(self, path: Path | None, kind: str) -> None:
        self._path, self._kind = path, kind
        self._stored: dict[str, _Entry] = {}
        self._used: dict[str, _Entry] = {}
        self._size, self._is_whole = 0, False
        if path is not None:
            with contextlib.suppress(OSError):
                content = memoryview(path.read_bytes())
                self._stored, end = _entries(content)
                self._size, self._is_whole = len(content), end == len(content)

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

    def asked(self, since: int = 0) -> dict[str, bytes | None]:
        """What was asked for, in order, from a number on; with its content where it is new."""
        recent = list(self._used.items())[since:]
        return {key: bytes(e[1]) if self._is_new(key) else None for key, e in recent}

    def adopt(self, asked: Mapping[str, bytes | None]) -> None:
        """Count as asked for here what was asked for in a copy of this process."""
        for key, data in asked.items():
            if key not in self._used:
                if data is None:
                    self._used[key] = self._stored[key]
                else:
                    self.put(key, data)

    def save(self, *, forget: bool) -> None:
        """Write what is new; with ``forget``, drop what nobody asked for once it is much."""
        if self._path is None:
            return
        new = {key: entry for key, entry in self._used.items() if self._is_new(key)}
        wanted = sum(_HEAD + len(data) for _, data in self._used.values())
        if not self._is_whole or (forget and wanted < _WORTH * self._size):
            kept = self._used if forget else {**self._stored, **self._used}
            _write(self._path, _written(kept))
        elif new:
            _append(self._path, _written(new))

    def _is_new(self, key: str) -> bool:
        return self._stored.get(key) is not self._used[key]


def _written(entries: Mapping[str, _Entry]) -> list[bytes | memoryview]:
    parts: list[bytes | memoryview] = []
    for key, (seal, data) in entries.items():
        parts += [key.encode(), len(data).to_bytes(_LENGTH_BYTES, "big"), seal, data]
    return parts


def _entries(stored: memoryview) -> tuple[dict[str, _Entry], int]:
    """Key → (seal, content) of a pack, the later counts; and where it ceases to make sense."""
    found: dict[str, _Entry] = {}
    start, sealed = 0, _HEAD - _HASH_BYTES
    while start + _HEAD <= len(stored):
        head = bytes(stored[start : start + _HEAD])
        end = start + _HEAD + int.from_bytes(head[_KEY_BYTES:sealed], "big")
        if end > len(stored):
            break
        found[head[:_KEY_BYTES].decode("latin-1")] = head[sealed:], stored[start + _HEAD : end]
        start = end
    return found, start


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


def _append(path: Path, parts: list[bytes | memoryview]) -> None:
    """Put something behind a file; a disk that is full leaves it as it was."""
    with contextlib.suppress(OSError), path.open("ab") as file:
        end = file.tell()
        try:
            file.writelines(parts)
            file.flush()
        except OSError:
            file.truncate(end)


def _seal(kind: str, key: str, data: bytes | memoryview) -> bytes:
    # The key is part of the seal, so an intact entry under a wrong name is refused as well.
    seal = hashlib.sha256(f"{kind}/{key}/".encode())
    seal.update(data)
    return seal.digest()
