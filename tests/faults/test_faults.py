"""Whatever goes wrong while a handbook is built, the published one stays whole."""

from __future__ import annotations

import hashlib
import os
import random
import resource
import shutil
import signal
import subprocess
import sys
import threading
import time
from collections.abc import Iterator
from pathlib import Path

import pytest

from generator.cache import Cache
from generator.update import Report, update

pytestmark = pytest.mark.build
KILLS = 30
COMMAND = shutil.which("datasheets", path=str(Path(sys.executable).parent))
AS_ROOT = hasattr(os, "geteuid") and os.geteuid() == 0
linux_only = pytest.mark.skipif(sys.platform != "linux", reason="needs Linux")


def _contents(folder: Path) -> dict[str, str]:
    return {
        path.relative_to(folder).as_posix(): hashlib.sha256(path.read_bytes()).hexdigest()
        for path in sorted(folder.rglob("*"))
        if path.is_file()
    }


def _start(book: Path, site: Path | None = None, **more: object) -> subprocess.Popen[str]:
    assert COMMAND
    return subprocess.Popen(
        [COMMAND, "build", "--config", book / "mkdocs.yml", "--site", site or book / "site"],
        stdout=subprocess.PIPE,
        stderr=subprocess.PIPE,
        text=True,
        start_new_session=True,
        **more,  # type: ignore[call-overload]
    )


def _run(book: Path, site: Path | None = None, **more: object) -> tuple[int, str]:
    process = _start(book, site, **more)
    said, told = process.communicate(timeout=120)
    return process.returncode, said + told


def _build(book: Path) -> Report:
    return update(book / "mkdocs.yml", book / "site", lambda stage: None)


def _set(book: Path, value: str) -> None:
    """Another permittivity of acetone."""
    table = book / "data" / "measurements.csv"
    lines = table.read_text(encoding="utf-8").splitlines()
    at = next(i for i, row in enumerate(lines) if row.startswith("acetone,relative_permittivity,"))
    cells = lines[at].split(",")
    lines[at] = ",".join([*cells[:2], value, *cells[3:]])
    passing = table.with_name("passing")
    passing.write_text("\n".join(lines) + "\n", encoding="utf-8")
    passing.replace(table)


def _left_over(site: Path) -> list[str]:
    return [p.name for p in site.parent.iterdir() if p.name.startswith(f".{site.name}-")]


@pytest.fixture
def book(few: Path) -> Path:
    """A handbook of ten substances, published."""
    _build(few)
    return few


def _descendants(process: int) -> list[int]:
    found = []
    for task in Path(f"/proc/{process}/task").glob("*/children"):
        for child in map(int, task.read_text().split()):
            found += [child, *_descendants(child)]
    return found


@linux_only
def test_kills_at_any_moment_leave_a_whole_site(book: Path) -> None:
    site = book / "site"
    chance = random.Random(5)
    states = {"21.01": _contents(site)}
    start = time.monotonic()
    _set(book, "20.5")
    _build(book)
    states["20.5"] = _contents(site)
    _set(book, "20.7")
    began = time.monotonic()
    assert _run(book)[0] == 0
    whole = time.monotonic() - began
    states["20.7"] = _contents(site)
    killed = 0
    for value in [*("20.5", "20.7", "21.01") * KILLS]:
        _set(book, value)
        process = _start(book)
        time.sleep(chance.uniform(0, 1.05 * whole))
        helpers = _descendants(process.pid)
        process.send_signal(signal.SIGKILL)
        process.communicate()
        killed += process.returncode == -signal.SIGKILL
        # The site is whole, and one of the good ones.
        now = _contents(site)
        assert now in states.values(), {
            value: [path for path in {*now, *good} if now.get(path) != good.get(path)]
            for value, good in states.items()
        }
        deadline = time.monotonic() + 20
        while any(Path(f"/proc/{helper}").exists() for helper in helpers):
            assert time.monotonic() < deadline, "a helper outlived its build"
            time.sleep(0.02)
        if killed == KILLS:
            break
    assert killed == KILLS
    code, told = _run(book)
    assert code == 0, told
    assert _contents(site) == states[value]
    assert _left_over(site) == []
    assert time.monotonic() - start < 300


@pytest.fixture
def small_disk(tmp_path: Path) -> Iterator[Path]:
    """A disk of its own that takes four megabytes."""
    place = tmp_path / "disk"
    place.mkdir()
    mounted = (
        AS_ROOT
        and not subprocess.run(
            ["mount", "-t", "tmpfs", "-o", "size=4m", "tmpfs", place],
            capture_output=True,
            check=False,
        ).returncode
    )
    if not mounted:
        pytest.skip("needs the right to mount a small disk")
    yield place
    subprocess.run(["umount", "-l", place], check=True)


@linux_only
def test_a_full_disk(book: Path, small_disk: Path) -> None:
    site = small_disk / "site"
    site.mkdir()
    for name in ("index.html", "404.html"):
        (site / name).write_text("the last good one", encoding="utf-8")
    before = _contents(site)
    code, told = _run(book, site)
    assert code == 1
    assert "No space left on device" in told
    assert "Nothing was published" in told
    assert "Traceback" not in told
    assert _contents(site) == before
    assert _left_over(site) == []


@linux_only
def test_a_quota(book: Path) -> None:
    site = book / "site"
    before = _contents(site)
    _set(book, "20.5")

    def limit() -> None:
        resource.setrlimit(resource.RLIMIT_FSIZE, (150_000, 150_000))

    code, told = _run(book, preexec_fn=limit)
    assert code == 1
    assert "File too large" in told
    assert "Nothing was published" in told
    assert "Traceback" not in told
    assert _contents(site) == before
    assert _left_over(site) == []
    assert _run(book)[0] == 0
    assert _contents(site) != before


@linux_only
def test_a_place_that_cannot_be_written(book: Path, small_disk: Path) -> None:
    if AS_ROOT:  # whom permissions do not stop
        subprocess.run(["mount", "-o", "remount,ro", small_disk], check=True)
    else:
        small_disk.chmod(0o555)
    code, told = _run(book, small_disk / "site")
    assert code == 1
    assert "cannot write beside" in told
    assert "Nothing was published" in told
    assert "Traceback" not in told


def test_bad_data(book: Path) -> None:
    before = _contents(book / "site")
    _set(book, "twenty-one")
    code, told = _run(book)
    assert code == 1
    assert "measurements.csv, line" in told
    assert "Nothing was published" in told
    assert _contents(book / "site") == before


def test_two_builds_at_once(book: Path) -> None:
    for value in ("20.5", "20.7", "20.9"):
        _set(book, value)
        both = [_start(book), _start(book)]
        told = ["".join(process.communicate(timeout=120)) for process in both]
        codes = sorted(process.returncode for process in both)
        assert codes in ([0, 0], [0, 1])
        if codes == [0, 1]:
            assert any("another build" in text for text in told)
    assert not _build(book).changed
    assert _left_over(book / "site") == []


def test_tables_replaced_while_they_are_read(book: Path) -> None:
    """Saved again and again during a build: it waits for one version, and shows that one."""
    values = [f"20.{n}" for n in range(10, 40)]
    stop = threading.Event()

    def save() -> None:
        for value in values:
            _set(book, value)
            if stop.wait(0.15):
                return

    saving = threading.Thread(target=save)
    saving.start()
    code, told = _run(book)
    stop.set()
    saving.join()
    assert code == 0 or "tables keep changing" in told, told
    if code == 0:
        text = (book / "site" / "downloads" / "data" / "measurements.csv").read_text("utf-8")
        sheet = (book / "site" / "solvents" / "acetone.html").read_text("utf-8")
        value = next(row for row in text.splitlines() if row.startswith("acetone,relative_perm"))
        assert f">{value.split(',')[2]}<" in sheet or value.split(",")[2] in sheet
    _build(book)
    shown = _contents(book / "site")
    shutil.rmtree(book / "site")
    shutil.rmtree(book / ".cache" / "site")
    _build(book)
    assert _contents(book / "site") == shown


def test_a_damaged_cache_gives_no_wrong_number(book: Path) -> None:
    site, cache = book / "site", book / ".cache"
    right = _contents(site)
    chance = random.Random(11)
    for _ in range(10):
        files = sorted(p for p in cache.rglob("*") if p.is_file() and p.stat().st_size)
        for path in chance.sample(files, min(25, len(files))):
            content = bytearray(path.read_bytes())
            for _ in range(chance.choice([1, 3, 50])):
                content[chance.randrange(len(content))] ^= chance.randrange(1, 256)
            if chance.random() < 0.2:
                del content[chance.randrange(len(content)) :]
            path.write_bytes(bytes(content))
        if chance.random() < 0.7:
            shutil.rmtree(site)
        _build(book)
        assert _contents(site) == right


def test_a_cache_of_rubbish(book: Path) -> None:
    right = _contents(book / "site")
    for path in (book / ".cache").rglob("*"):
        if path.is_file():
            path.write_bytes(os.urandom(200))
    shutil.rmtree(book / "site")
    _build(book)
    assert _contents(book / "site") == right
    assert Cache(book / ".cache").get("site", "0" * 40) is None
