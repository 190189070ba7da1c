"""The preview follows the files: what is saved is seen, what is broken is told, what is mended."""

from __future__ import annotations

import re
import threading
import urllib.request
from collections.abc import Iterator
from pathlib import Path

import pytest

from generator.preview import Preview, server

pytestmark = pytest.mark.build


class Open:
    """A preview that is open in a browser."""

    def __init__(self, folder: Path, address: str) -> None:
        self.folder, self._address = folder, address
        self.version = 0

    def get(self, path: str) -> str:
        with urllib.request.urlopen(self._address + path, timeout=60) as answer:
            return str(answer.read().decode())

    def news(self) -> None:
        """Wait, as the page does, until there is something newer."""
        number = self.version
        while number == self.version:
            number = int(self.get(f"-/news?after={self.version}"))
        self.version = number

    def save(self, table: str, old: str, new: str) -> None:
        path = self.folder / "data" / table
        text = path.read_text(encoding="utf-8")
        assert old in text
        draft = path.with_suffix(".draft")
        draft.write_text(text.replace(old, new, 1), encoding="utf-8")
        draft.replace(path)
        self.news()


@pytest.fixture
def opened(few: Path) -> Iterator[Open]:
    preview, ended = Preview(few / "mkdocs.yml", lambda text: None), threading.Event()
    watching = threading.Thread(target=preview.watch, args=(ended,))
    with server(preview, 0) as http:
        threading.Thread(target=http.serve_forever, daemon=True).start()
        watching.start()
        made = Open(few, f"http://127.0.0.1:{http.server_port}/")
        made.news()
        yield made
        ended.set()
        watching.join()
        http.shutdown()


def test_a_saved_table_is_seen_and_nothing_is_published(opened: Open) -> None:
    sheet = "solvents/acetone.html"
    assert "Acetone" in opened.get(sheet)
    assert re.search(r'fetch\("/-/news\?after=\d+"\)', opened.get(sheet))
    opened.save("solvents.csv", "acetone,Acetone,", "acetone,Propanone the plain,")
    assert "Propanone the plain" in opened.get(sheet)
    assert "Propanone the plain" in opened.get("")
    assert not (opened.folder / "site").exists()


def test_broken_tables_are_told_in_place_of_the_page(opened: Open) -> None:
    sheet = "solvents/acetone.html"
    good = opened.get("solvents/water.html")
    opened.save("solvents.csv", "67-64-1", "67-64-2")
    for page in (sheet, "", "methods.html"):
        told = opened.get(page)
        assert "1 error in the tables" in told
        assert "solvents.csv, line" in told
        assert "67-64-2" in told
        assert "/-/news?after=" in told
    opened.save("solvents.csv", "67-64-2", "67-64-1")
    assert "Relative permittivity" in opened.get(sheet)
    again = opened.get("solvents/water.html")
    number = r"(after=|news === \")\d+"
    assert re.sub(number, "", again) == re.sub(number, "", good)


def test_an_edited_page_is_seen(opened: Open) -> None:
    page = opened.folder / "site_src" / "pages" / "how-to-read.md"
    page.write_text(
        page.read_text(encoding="utf-8") + "\n\nA line of one's own.\n", encoding="utf-8"
    )
    opened.news()
    assert "A line of one’s own" in opened.get("how-to-read.html").replace("'", "’")


def test_only_this_machine_is_served(opened: Open) -> None:
    preview = Preview(opened.folder / "mkdocs.yml", lambda text: None)
    with server(preview, 0) as http:
        assert http.server_address[0] == "127.0.0.1"
