"""A site is swapped in whole or not at all."""

from __future__ import annotations

import subprocess
import sys
from collections.abc import Callable
from pathlib import Path

import pytest

from generator import publish as module
from generator.publish import PublishError, publish

EXCHANGES = sys.platform == "linux"


def _filled(text: str) -> Callable[[Path], bool]:
    def make(folder: Path) -> bool:
        for name in ("index.html", "404.html", "page.html"):
            (folder / name).write_text(text, encoding="utf-8")
        return True

    return make


def _texts(site: Path) -> set[str]:
    return {path.read_text(encoding="utf-8") for path in site.glob("*.html")}


def _left_over(site: Path) -> list[str]:
    return sorted(p.name for p in site.parent.glob(f".{site.name}-*"))


@pytest.fixture(params=["exchange", "rename pair"])
def site(request: pytest.FixtureRequest, tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> Path:
    """A place for a site, with and without the system's exchange in one step."""
    if request.param == "rename pair":
        monkeypatch.setattr(module, "_exchange", lambda one, other: False)
    return tmp_path / "site"


def test_first_and_second_publication(site: Path) -> None:
    publish(site, _filled("first"))
    publish(site, _filled("second"))
    assert _texts(site) == {"second"}
    assert _left_over(site) == []
    assert site.stat().st_mode & 0o777 == 0o755


def test_a_failure_leaves_the_site_as_it_was(site: Path) -> None:
    publish(site, _filled("first"))

    def fails(folder: Path) -> bool:
        (folder / "index.html").write_text("half", encoding="utf-8")
        raise OSError(28, "No space left on device")

    with pytest.raises(OSError, match="No space left"):
        publish(site, fails)
    assert _texts(site) == {"first"}
    assert _left_over(site) == []


def test_nothing_to_do_leaves_the_site_as_it_was(site: Path) -> None:
    assert publish(site, _filled("first"))
    assert not publish(site, lambda folder: False)
    assert _texts(site) == {"first"}
    assert _left_over(site) == []


def test_hidden_files_stay(site: Path) -> None:
    publish(site, _filled("first"))
    (site / ".htaccess").write_text("rules", encoding="utf-8")
    (site / ".git").mkdir()
    (site / ".git" / "HEAD").write_text("ref", encoding="utf-8")
    publish(site, _filled("second"))
    assert (site / ".htaccess").read_text(encoding="utf-8") == "rules"
    assert (site / ".git" / "HEAD").read_text(encoding="utf-8") == "ref"


def test_a_folder_that_is_no_handbook_is_not_replaced(site: Path) -> None:
    site.mkdir()
    (site / "thesis.txt").write_text("years of work", encoding="utf-8")
    with pytest.raises(PublishError, match="something other than a handbook"):
        publish(site, _filled("first"))
    assert (site / "thesis.txt").read_text(encoding="utf-8") == "years of work"


def test_a_file_in_the_place_of_the_folder(site: Path) -> None:
    site.write_text("a file", encoding="utf-8")
    with pytest.raises(PublishError, match="is a file"):
        publish(site, _filled("first"))


def test_what_killed_builds_left_is_swept(site: Path) -> None:
    publish(site, _filled("first"))
    half = site.parent / ".site-new-abc"
    half.mkdir()
    (half / "index.html").write_text("half", encoding="utf-8")
    publish(site, _filled("second"))
    assert _left_over(site) == []


def test_a_kill_between_two_renames_brings_the_old_site_back(site: Path) -> None:
    publish(site, _filled("first"))
    site.rename(site.parent / ".site-old-abc")

    def fails(folder: Path) -> bool:
        raise RuntimeError

    with pytest.raises(RuntimeError):
        publish(site, fails)
    assert _texts(site) == {"first"}


@pytest.mark.skipif(not EXCHANGES, reason="needs the system's exchange in one step")
def test_the_site_is_never_missing(tmp_path: Path) -> None:
    one, other = tmp_path / "one", tmp_path / "other"
    one.mkdir()
    other.mkdir()
    (one / "a").touch()
    assert module._exchange(one, other)
    assert (other / "a").exists()
    assert not (one / "a").exists()


def test_two_builds_at_once(tmp_path: Path) -> None:
    site = tmp_path / "site"
    second = (
        "import sys; from pathlib import Path\n"
        "from generator.publish import publish, PublishError\n"
        "try: publish(Path(sys.argv[1]), lambda folder: None)\n"
        "except PublishError as error: sys.exit(str(error))"
    )

    def make(folder: Path) -> bool:
        done = subprocess.run(
            [sys.executable, "-c", second, str(site)], capture_output=True, text=True, check=False
        )
        assert done.returncode == 1
        assert "another build of" in done.stderr
        assert "try again" in done.stderr
        return _filled("first")(folder)

    publish(site, make)
    assert _texts(site) == {"first"}
