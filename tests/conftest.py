"""What several tests share: the shipped handbook, built once, and a browser that stays at home."""

from __future__ import annotations

import csv
import functools
import http.server
import os
import re
import shutil
import subprocess
import sys
import threading
from collections.abc import Callable, Iterator
from pathlib import Path
from typing import TYPE_CHECKING, Any

import pytest

if TYPE_CHECKING:
    from playwright.sync_api import Browser, Page, Route

ROOT = Path(__file__).resolve().parent.parent
IN_CI = os.environ.get("CI", "").lower() in {"1", "true"}
BROWSER_NAMES = ("chromium", "chromium-browser", "google-chrome")
# A browser that asks nobody for updates, and runs as root inside a container.
BROWSER_ARGUMENTS = (
    "--headless",
    "--no-sandbox",
    "--disable-gpu",
    "--disable-quic",
    "--no-first-run",
    "--disable-background-networking",
    "--disable-component-update",
    "--disable-sync",
)


@pytest.fixture(scope="session")
def project() -> Path:
    """The folder of the project."""
    return ROOT


def datasheets(*arguments: str | Path, folder: Path = ROOT) -> subprocess.CompletedProcess[str]:
    """Run the command as a user does: the whole process, nothing imported here."""
    command = shutil.which("datasheets", path=str(Path(sys.executable).parent))
    assert command, "the project is not installed beside this Python: see README.md"
    return subprocess.run(
        [command, *map(str, arguments)],
        cwd=folder,
        capture_output=True,
        text=True,
        check=False,
        env={**os.environ, "NO_MKDOCS_2_WARNING": "1"},
    )


@pytest.fixture(scope="session")
def built_site(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """The shipped handbook, built by the command into a folder of its own."""
    site = tmp_path_factory.mktemp("handbook") / "site"
    done = datasheets("build", "--site", site)
    assert done.returncode == 0, done.stdout + done.stderr
    return site


# Isomers, a family, associated liquids, an unpolar one, one with corrections.
FEW = (
    "water", "methanol", "ethanol", "1-propanol", "2-propanol", "acetone", "acetonitrile",
    "hexane", "cis-1-2-dichloroethylene", "trans-1-2-dichloroethylene",
)  # fmt: skip


@pytest.fixture
def few_tables(tmp_path: Path) -> Path:
    """The shipped tables with the rows of ten substances, to be edited at will."""
    folder = Path(shutil.copytree(ROOT / "data", tmp_path / "data"))
    for table in folder.glob("*.csv"):
        with table.open(encoding="utf-8", newline="") as file:
            header, *rows = csv.reader(file)
        if "solvent" in header:
            place = header.index("solvent")
            with table.open("w", encoding="utf-8", newline="") as file:
                writer = csv.writer(file, lineterminator="\n")
                writer.writerows([header, *(row for row in rows if row[place] in FEW)])
    return folder


@pytest.fixture
def few(few_tables: Path) -> Path:
    """A handbook of ten substances: tables, pages, settings."""
    shutil.copytree(ROOT / "site_src", few_tables.parent / "site_src")
    shutil.copy(ROOT / "mkdocs.yml", few_tables.parent)
    return few_tables.parent


def content_policy() -> tuple[str, str]:
    """The header that README.md gives: its name and its content."""
    text = (ROOT / "README.md").read_text(encoding="utf-8")
    (line,) = re.findall(r"^Content-Security-Policy: .*$", text, flags=re.MULTILINE)
    name, _, content = line.partition(": ")
    return name, content


class _Quiet(http.server.SimpleHTTPRequestHandler):
    def end_headers(self) -> None:
        self.send_header(*content_policy())
        super().end_headers()

    def log_message(self, format: str, *args: object) -> None:  # noqa: A002
        pass


@pytest.fixture(scope="session")
def site_url(built_site: Path) -> Iterator[str]:
    """Address of the built handbook on a server that only this machine reaches."""
    handler = functools.partial(_Quiet, directory=str(built_site))
    with http.server.ThreadingHTTPServer(("127.0.0.1", 0), handler) as server:
        thread = threading.Thread(target=server.serve_forever, daemon=True)
        thread.start()
        yield f"http://127.0.0.1:{server.server_port}/"
        server.shutdown()
        thread.join()


@pytest.fixture(scope="session")
def chromium() -> Iterator[Browser]:
    """A running browser. Without one: skipped on a desk, failed in CI."""
    found = (shutil.which(name) for name in BROWSER_NAMES)
    path = os.environ.get("CHROMIUM") or next(filter(None, found), None)
    if path is None:
        message = "no Chromium found: install one or set CHROMIUM to its path (see README.md)"
        pytest.fail(message) if IN_CI else pytest.skip(message)
    from playwright.sync_api import sync_playwright

    with sync_playwright() as playwright:
        browser = playwright.chromium.launch(executable_path=path, args=list(BROWSER_ARGUMENTS))
        yield browser
        browser.close()


@pytest.fixture
def open_page(chromium: Browser, site_url: str, built_site: Path) -> Iterator[Callable[..., Page]]:
    """Opens fresh pages; relative addresses work in ``page.goto``.

    ``base_url`` is the served site unless given; further options are those of a browser context.
    A request to anywhere else is stopped, and fails the test, as does an error on the console,
    which is also where a browser reports what the policy of README.md forbids.
    """
    allowed = (site_url, built_site.as_uri(), "data:", "blob:")
    strangers: list[str] = []
    errors: list[str] = []
    pages: list[Page] = []

    def guard(route: Route) -> None:
        if route.request.url.startswith(allowed):
            route.continue_()
        else:
            strangers.append(route.request.url)
            route.abort()

    def opened(base_url: str = site_url, **options: Any) -> Page:
        context = chromium.new_context(base_url=base_url, **options)
        context.route("**/*", guard)
        page = context.new_page()
        page.on("console", lambda m: errors.append(m.text) if m.type == "error" else None)
        page.on("pageerror", lambda error: errors.append(str(error)))
        page.set_default_timeout(10_000)
        pages.append(page)
        return page

    yield opened
    for page in pages:
        # Let anything still on its way be seen before judging.
        page.wait_for_load_state("load")
        page.wait_for_timeout(100)
        page.context.close()
    assert not strangers, f"requests that leave the site: {strangers}"
    assert not errors, f"errors on the console: {errors}"


@pytest.fixture
def browser_page(open_page: Callable[..., Page]) -> Page:
    """A fresh page of the served site."""
    return open_page()


@pytest.fixture(params=["http", "file"])
def page_either_way(
    request: pytest.FixtureRequest, open_page: Callable[..., Page], built_site: Path
) -> Page:
    """A fresh page of the site, once from a server and once from the disk."""
    return open_page() if request.param == "http" else open_page(f"{built_site.as_uri()}/")
