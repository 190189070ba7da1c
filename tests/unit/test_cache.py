"""Kept results: found again, never wrong."""

import os
import tempfile
import time
from pathlib import Path

from hypothesis import given
from hypothesis import strategies as st

from generator.cache import Cache, Pack, digest


def test_kept_and_found(tmp_path: Path) -> None:
    cache = Cache(tmp_path)
    key = digest("figure", 1.5, ("a", "b"))
    assert cache.get("figure", key) is None
    cache.put("figure", key, b"<svg/>")
    assert cache.get("figure", key) == b"<svg/>"
    assert cache.get("drawing", key) is None


@given(position=st.integers(0, 70), flip=st.integers(1, 255))
def test_a_damaged_entry_is_made_again(position: int, flip: int) -> None:

    with tempfile.TemporaryDirectory() as folder:
        cache = Cache(Path(folder))
        key = digest("x")
        content = b"0123456789" * 4
        cache.put("figure", key, content)
        (entry,) = (p for p in Path(folder).rglob("*") if p.is_file())
        stored = bytearray(entry.read_bytes())
        stored[position] ^= flip
        entry.write_bytes(bytes(stored))
        assert cache.get("figure", key) is None


def test_an_entry_under_a_wrong_name_is_refused(tmp_path: Path) -> None:
    cache = Cache(tmp_path)
    cache.put("figure", digest("a"), b"of a")
    (entry,) = (p for p in tmp_path.rglob("*") if p.is_file())
    other = digest("b")
    target = tmp_path / "figure" / other[:2] / other
    target.parent.mkdir(parents=True, exist_ok=True)
    entry.rename(target)
    assert cache.get("figure", other) is None


def test_without_a_folder_nothing_is_kept() -> None:
    cache = Cache(None)
    cache.put("figure", "k", b"x")
    assert cache.get("figure", "k") is None


def _pack(folder: Path, **added: bytes) -> Pack:
    pack = Cache(folder).pack("small")
    for name, data in added.items():
        pack.put(digest(name), data)
    return pack


def test_a_pack_keeps_what_was_added_later(tmp_path: Path) -> None:
    _pack(tmp_path, a=b"a", b=b"b").save(forget=True)
    size = (tmp_path / "small.pack").stat().st_size
    _pack(tmp_path, c=b"c", b=b"new").save(forget=False)
    pack = _pack(tmp_path)
    assert [pack.get(digest(name)) for name in "abc"] == [b"a", b"new", b"c"]
    assert (tmp_path / "small.pack").stat().st_size > size


def test_a_pack_forgets_what_nobody_asked_for_once_it_is_much(tmp_path: Path) -> None:
    _pack(tmp_path, a=b"a", b=b"b" * 10_000).save(forget=True)
    pack = _pack(tmp_path)
    assert pack.get(digest("a")) == b"a"
    pack.save(forget=False)
    assert _pack(tmp_path).get(digest("b")) is not None
    pack.save(forget=True)
    assert (tmp_path / "small.pack").stat().st_size < 1_000
    pack = _pack(tmp_path)
    assert [pack.get(digest(name)) for name in "ab"] == [b"a", None]


def test_a_copy_tells_what_it_was_asked_for(tmp_path: Path) -> None:
    _pack(tmp_path, a=b"a", b=b"b").save(forget=True)
    pack, copy = _pack(tmp_path), _pack(tmp_path, c=b"c")
    assert copy.get(digest("a")) == b"a"
    pack.adopt(copy.asked())
    assert pack.asked() == {digest("c"): b"c", digest("a"): None}


def test_a_torn_pack_is_written_anew(tmp_path: Path) -> None:
    _pack(tmp_path, a=b"a", b=b"b").save(forget=True)
    path = tmp_path / "small.pack"
    path.write_bytes(path.read_bytes()[:-1])
    _pack(tmp_path, c=b"c").save(forget=False)
    pack = _pack(tmp_path)
    assert [pack.get(digest(name)) for name in "abc"] == [b"a", None, b"c"]


@given(position=st.integers(0, 400), flip=st.integers(1, 255))
def test_a_damaged_pack_gives_what_was_kept_or_nothing(position: int, flip: int) -> None:
    with tempfile.TemporaryDirectory() as folder:
        pack = Cache(Path(folder)).pack("small")
        content = {digest(n): bytes([n]) * 30 for n in range(4)}
        for key, data in content.items():
            pack.put(key, data)
        pack.save(forget=True)
        path = Path(folder) / "small.pack"
        stored = bytearray(path.read_bytes())
        stored[position % len(stored)] ^= flip
        path.write_bytes(bytes(stored))
        damaged = Cache(Path(folder)).pack("small")
        found = [damaged.get(key) for key in content]
        assert None in found
        assert all(f in (None, data) for f, data in zip(found, content.values(), strict=True))


def test_results_no_build_has_asked_for_are_swept(tmp_path: Path) -> None:
    cache = Cache(tmp_path)
    for name in ("old", "new", "wanted"):
        cache.put("figure", digest(name), b"x")
    for name in ("old", "wanted"):
        key = digest(name)
        long_ago = time.time() - 40 * 86_400
        os.utime(tmp_path / "figure" / key[:2] / key, (long_ago, long_ago))
    assert cache.get("figure", digest("wanted")) == b"x"
    cache.sweep()
    assert [cache.get("figure", digest(n)) for n in ("old", "new", "wanted")] == [None, b"x", b"x"]


def test_a_disk_that_takes_nothing_is_no_error(tmp_path: Path) -> None:
    (tmp_path / "file").touch()
    cache = Cache(tmp_path / "file" / "below")
    cache.put("figure", digest("a"), b"x")
    pack = cache.pack("small")
    pack.put(digest("a"), b"x")
    pack.save(forget=True)
    assert cache.get("figure", digest("a")) is None
