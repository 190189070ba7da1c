"""Whatever happens to a build, the published site is whole, and the next build succeeds.

Builds run as whole processes of their own, as a laboratory runs them.
"""

from __future__ import annotations

import hashlib
import os
import random
import re
import resource
import shutil
import signal
import subprocess
import sys
import time
from collections.abc import Callable
from pathlib import Path

import pytest

pytestmark = [
    pytest.mark.build,
    pytest.mark.skipif(sys.platform == "win32", reason="needs signals and limits of POSIX"),
]
KILLS = 30
DAMAGES = 6
COMMAND = [sys.executable, "-c", "from generator.cli import main; main()"]


def start(
    folder: Path, *arguments: str, before: Callable[[], None] | None = None
) -> subprocess.Popen[str]:
    """A build of the handbook in ``folder``, in a process group of its own."""
    return subprocess.Popen(
        [*COMMAND, "build", *arguments],
        cwd=folder,
        stdout=subprocess.PIPE,
        stderr=subprocess.STDOUT,
        text=True,
        start_new_session=True,
        preexec_fn=before,
        env={**os.environ, "NO_MKDOCS_2_WARNING": "1"},
    )


def build(
    folder: Path, *arguments: str, before: Callable[[], None] | None = None
) -> tuple[int, str]:
    """Exit status of a build and what it said."""
    process = start(folder, *arguments, before=before)
    said, _ = process.communicate(timeout=120)
    return process.returncode, said


def contents(site: Path) -> dict[str, str]:
    """Every file of a site with the hash of what it holds."""
    return {
        path.relative_to(site).as_posix(): hashlib.sha256(path.read_bytes()).hexdigest()
        for path in sorted(site.rglob("*"))
        if path.is_file()
    }


def left_over(folder: Path) -> list[str]:
    """What is left of builds that did not end."""
    return sorted(path.name for path in folder.glob(".site-*"))


def edit(folder: Path, value: str) -> None:
    """Another density of acetone, saved as a spreadsheet saves: a new file in place of the old."""
    table = folder / "data" / "measurements.csv"
    text = table.read_text(encoding="utf-8")
    changed = re.sub(r"(?m)^(acetone,density,)[\d.]+", rf"\g<1>{value}", text)
    assert changed != text
    draft = table.with_suffix(".draft")
    draft.write_text(changed, encoding="utf-8")
    draft.replace(table)


@pytest.fixture
def published(few: Path) -> Path:
    """A handbook of ten substances that is published."""
    status, said = build(few)
    assert status == 0, said
    return few


def test_killed_builds_leave_a_whole_site(published: Path) -> None:
    chance = random.Random(5)
    edit(published, "0.7801")
    begun = time.monotonic()
    assert build(published)[0] == 0
    usual = time.monotonic() - begun
    unfinished = 0
    for i in range(KILLS):
        before = contents(published / "site")
        edit(published, f"0.78{10 + i}")
        process = start(published)
        time.sleep(chance.uniform(0.02, 1.0) * usual)
        os.killpg(process.pid, signal.SIGKILL)
        process.communicate(timeout=60)
        now = contents(published / "site")
        status, said = build(published)
        assert status == 0, said
        after = contents(published / "site")
        assert after != before
        assert now in (before, after), "half a site was published"
        unfinished += now == before
        assert left_over(published) == []
    assert unfinished > KILLS / 3, "most builds had ended before they were killed"


def test_a_full_disk_leaves_the_last_good_site(published: Path) -> None:
    before = contents(published / "site")
    edit(published, "0.7805")

    def small_files() -> None:
        # No file may grow beyond this: what a quota does, without one.
        signal.signal(signal.SIGXFSZ, signal.SIG_IGN)
        resource.setrlimit(resource.RLIMIT_FSIZE, (60_000, 60_000))

    status, said = build(published, before=small_files)
    assert status == 1, said
    assert "Nothing was published" in said
    assert "Traceback" not in said
    assert contents(published / "site") == before
    status, said = build(published)
    assert status == 0, said
    assert contents(published / "site") != before


@pytest.mark.parametrize("room", [200, 3_000])
def test_a_full_file_system_leaves_the_last_good_site(few: Path, room: int) -> None:
    """A file system with ``room`` kilobytes left for the next build."""
    disk = few / "disk"
    disk.mkdir()
    mounted = subprocess.run(
        ["mount", "-t", "tmpfs", "-o", "size=96m", "tmpfs", str(disk)],
        capture_output=True,
        check=False,
    )
    if mounted.returncode:
        pytest.skip("this user may not mount a small file system")
    try:
        site = disk / "site"
        assert build(few, "--site", str(site))[0] == 0
        before = contents(site)
        edit(few, "0.7805")
        filling = disk / "filling"
        free = shutil.disk_usage(disk).free - room * 1000
        with filling.open("wb") as file:
            for _ in range(free // 65536):
                file.write(bytes(65536))
        status, said = build(few, "--site", str(site))
        assert status == 1, said
        assert "No space left on device" in said
        assert "Nothing was published" in said
        assert "Traceback" not in said
        assert contents(site) == before
        filling.unlink()
        status, said = build(few, "--site", str(site))
        assert status == 0, said
        assert contents(site) != before
    finally:
        subprocess.run(["umount", str(disk)], check=False)


def test_a_place_that_cannot_be_written_is_said_in_one_line(few: Path) -> None:
    place = few / "closed"
    place.mkdir(mode=0o555)
    # The superuser may write even there, but not below a file.
    site = place / "site" if os.geteuid() else few / "mkdocs.yml" / "site"
    status, said = build(few, "--site", str(site))
    assert status == 1, said
    assert "cannot write beside" in said
    assert "Traceback" not in said


def test_two_builds_at_once_are_kept_apart(few: Path) -> None:
    first = start(few)
    lock = few / ".site.lock"
    limit = time.monotonic() + 60
    while not (lock.exists() and lock.read_text(encoding="utf-8")) and time.monotonic() < limit:
        time.sleep(0.01)
    status, said = build(few)
    assert status == 1, said
    assert "another build" in said
    said, _ = first.communicate(timeout=120)
    assert first.returncode == 0, said
    assert (few / "site" / "solvents" / "acetone.html").is_file()


def test_a_table_replaced_while_it_is_read_gives_no_mixture(published: Path) -> None:
    process = start(published)
    edit(published, "0.7811")
    for i in range(12):
        time.sleep(0.05)
        edit(published, f"0.78{30 + i}")
    said, _ = process.communicate(timeout=120)
    assert process.returncode == 0 or "keep changing" in said, said
    status, said = build(published)
    assert status == 0, said
    clean = published / "clean"
    clean.mkdir()
    for name in ("data", "site_src"):
        shutil.copytree(published / name, clean / name)
    shutil.copy(published / "mkdocs.yml", clean)
    assert build(clean)[0] == 0
    assert contents(published / "site") == contents(clean / "site")


@pytest.mark.parametrize("seed", range(DAMAGES))
def test_damaged_caches_give_no_wrong_number(published: Path, seed: int) -> None:
    """Random bytes of every kept file changed, some files cut short: the same site comes out."""
    chance = random.Random(seed)
    before = contents(published / "site")
    files = sorted(path for path in (published / ".cache").rglob("*") if path.is_file())
    assert len(files) > 20
    for path in files:
        content = bytearray(path.read_bytes())
        if content and chance.random() < 0.7:
            for _ in range(chance.choice([1, 3, 20])):
                content[chance.randrange(len(content))] ^= chance.randrange(1, 256)
            if chance.random() < 0.2:
                del content[chance.randrange(len(content)) :]
            path.write_bytes(content)
    shutil.rmtree(published / "site")
    status, said = build(published)
    assert status == 0, said
    assert contents(published / "site") == before
