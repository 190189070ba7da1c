"""Kept results: found again, never wrong."""

import tempfile
from pathlib import Path

from hypothesis import given
from hypothesis import strategies as st

from generator.cache import Cache, digest


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
