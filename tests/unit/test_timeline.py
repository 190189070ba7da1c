"""Recorded revisions as readers see them: the page, the datasheets, the feed."""

from __future__ import annotations

import dataclasses
import re
from collections.abc import Sequence
from datetime import datetime
from xml.etree import ElementTree as ET

import pytest

from generator import pages
from generator.catalogue import Catalogue, catalogue
from generator.contexts import Foot
from generator.datasheet import datasheet
from generator.history import Event
from generator.metrics import Handbook
from generator.timeline import feed, timeline

EVENTS = (
    Event("2026-10-01", "11111111", "", "", "note", "First"),
    Event("2026-11-30", "22222222", "", "", "note", "Looked up <again> & found"),
    Event("2026-11-30", "22222222", "acetone", "density", "number", "0.78 → 0.79 (-0.5 u)"),
    Event("2026-11-30", "22222222", "gone", "", "entry", "solvents.csv: row removed: gone"),
    Event("2026-11-30", "22222222", "", "", "entry", "sources.csv, year: blank → 2014 (x)"),
    Event("2026-12-01", "33333333", "water", "", "class", "polarity: polar → <b>\x0bborderline"),
)
NAMES = {"acetone": "Acetone", "water": "Water"}
ATOM = {"a": "http://www.w3.org/2005/Atom"}


def book(handbook: Handbook, events: Sequence[Event], revision: str) -> Catalogue:
    dataset = dataclasses.replace(handbook.dataset, history=tuple(events), revision=revision)
    return catalogue(dataclasses.replace(handbook, dataset=dataset), ())


def page(handbook: Handbook, events: Sequence[Event], revision: str) -> str:
    told = timeline(book(handbook, events, revision))
    foot = Foot("Laboratory", revision)
    return pages._page(
        "changes.md", "changes", "What changed", lambda: {"t": told, "page_foot": foot}
    ).html


def test_page_tells_the_revisions_newest_first(handbook: Handbook) -> None:
    body = page(handbook, EVENTS, "33333333")
    assert re.findall(r'<h2 id="revision-(\w+)"', body) == ["33333333", "22222222", "11111111"]
    assert "which is recorded below" in body
    assert "Looked up &lt;again&gt; &amp; found" in body
    assert 'href="solvents/acetone.html">Acetone</a>' in body
    assert "0.78 → 0.79 (−0.5 u)" in body
    assert "solvents/gone.html" not in body
    assert "<b>" not in body
    assert 'href="downloads/changes.atom"' in body


@pytest.mark.parametrize(
    ("events", "words"),
    [((), "No revision is recorded yet."), (EVENTS[:1], "that change is not recorded yet.")],
)
def test_page_says_where_the_present_tables_stand(
    events: Sequence[Event], words: str, handbook: Handbook
) -> None:
    assert words in page(handbook, events, "44444444")


def test_each_datasheet_carries_its_own_revisions(handbook: Handbook) -> None:
    made = book(handbook, EVENTS, "33333333")
    foot = Foot("Laboratory", "33333333")
    (past,) = datasheet(made, "acetone", {}, foot).history
    assert (past.date, past.revision.text) == ("2026-11-30", "22222222")
    assert past.revision.href == "../changes.html#revision-22222222"
    assert [line.what for line in past.lines] == ["0.78 → 0.79 (−0.5 u)"]
    body = pages._datasheet_page(datasheet(made, "methanol", {}, foot)).html
    assert "No change on record." in body
    body = pages._datasheet_page(datasheet(made, "acetone", {}, foot)).html
    assert "0.78 → 0.79 (−0.5 u)" in body


def test_feed_is_valid_atom() -> None:
    """RFC 4287: what sections 4.1.1 and 4.1.2 ask of a feed and of its entries."""
    root = ET.fromstring(feed(EVENTS, NAMES, "Laboratory & co"))
    assert root.tag == f"{{{ATOM['a']}}}feed"
    for part in ("id", "title", "updated"):
        assert len(root.findall(f"a:{part}", ATOM)) == 1
    assert root.findtext("a:author/a:name", None, ATOM) == "Laboratory & co"
    entries = root.findall("a:entry", ATOM)
    assert [e.findtext("a:updated", None, ATOM) for e in entries] == [
        "2026-12-01T00:00:00Z", "2026-11-30T00:00:00Z", "2026-10-01T00:00:00Z",
    ]  # fmt: skip
    assert root.findtext("a:updated", None, ATOM) == "2026-12-01T00:00:00Z"
    ids = [each.findtext("a:id", "", ATOM) for each in (root, *entries)]
    assert len(set(ids)) == 4
    assert all(re.fullmatch(r"urn:uuid:[0-9a-f-]{36}", name) for name in ids)
    for entry in entries:
        for part in ("id", "title", "updated", "content"):
            assert len(entry.findall(f"a:{part}", ATOM)) == 1
        content = entry.find("a:content", ATOM)
        assert content is not None
        assert content.get("type") == "xhtml"
        (block,) = content
        assert block.tag == "{http://www.w3.org/1999/xhtml}div"
        link = entry.find("a:link", ATOM)
        assert link is not None
        assert link.get("rel") == "alternate"
        assert str(link.get("href")).startswith("../changes.html#revision-")
        datetime.fromisoformat(entry.findtext("a:updated", "", ATOM))
    text = "".join(entries[1].itertext())
    assert "Looked up <again> & found" in text
    assert "Acetone" in text


def test_feed_ids_stay_when_revisions_are_added() -> None:
    def ids(events: Sequence[Event], laboratory: str) -> list[str]:
        root = ET.fromstring(feed(events, NAMES, laboratory))
        return [str(each.text) for each in root.iter(f"{{{ATOM['a']}}}id")]

    first, *older = ids(EVENTS[:2], "One")
    again, newest, *same = ids(EVENTS, "Another name")
    assert (again, same) == (first, older)
    assert newest not in older
    assert feed(EVENTS, NAMES, "One") == feed(EVENTS, NAMES, "One")


def test_feed_of_nothing_is_a_feed() -> None:
    empty = ET.fromstring(feed((), {}, "Laboratory"))
    assert empty.findtext("a:updated", "", ATOM)
    assert not empty.findall("a:entry", ATOM)
