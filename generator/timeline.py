"""The recorded revisions as pages and readers of the feed see them."""

from __future__ import annotations

import uuid
from collections import defaultdict
from collections.abc import Iterable, Mapping, Sequence
from dataclasses import dataclass
from xml.etree import ElementTree as ET

from generator import history
from generator.catalogue import Catalogue, Links, anchor
from generator.contexts import Link, Past, PastLine
from generator.differences import plain
from generator.history import Event
from generator.quantities import QUANTITIES
from generator.wording import prose

FEED = "downloads/changes.atom"
PAGE = "changes"
_LABELS = {
    history.ENTRY: "Tables",
    history.NUMBER: "Number",
    history.CLASS: "Class",
    history.FINDING: "Finding",
}
_ATOM = "http://www.w3.org/2005/Atom"
_XHTML = "http://www.w3.org/1999/xhtml"


@dataclass(frozen=True, slots=True)
class Share:
    """What changed for one substance; without one, for the tables as a whole.

    ``href`` is empty where the substance is gone.
    """

    name: str
    href: str
    lines: tuple[PastLine, ...]


@dataclass(frozen=True, slots=True)
class Revision:
    """One recorded revision."""

    anchor: str
    date: str
    revision: str
    notes: tuple[str, ...]
    shares: tuple[Share, ...]


@dataclass(frozen=True, slots=True)
class Timeline:
    """All recorded revisions, the newest first, and where the present tables stand."""

    present: str
    revisions: tuple[Revision, ...]
    feed: Link


def timeline(catalogue: Catalogue) -> Timeline:
    """The page "What changed"."""
    dataset = catalogue.handbook.dataset
    revisions = _revisions(dataset.history)
    links = Links("")
    known = dataset.solvents
    return Timeline(
        _present(dataset.revision, dataset.history),
        tuple(
            Revision(
                _anchor(revision),
                events[0].date,
                revision,
                tuple(event.what for event in events if event.kind == history.NOTE),
                tuple(
                    Share(
                        known[slug].name if slug in known else slug or "The tables as a whole",
                        links.solvent(slug) if slug in known else "",
                        tuple(map(_line, own)),
                    )
                    for slug, own in _by_substance(events).items()
                ),
            )
            for revision, events in reversed(revisions.items())
        ),
        Link("Feed of revisions (Atom)", FEED),
    )


def past(events: Iterable[Event]) -> tuple[Past, ...]:
    """The revisions of one substance, the newest first, for a page one folder down."""
    return tuple(
        Past(
            own[0].date,
            Link(revision, f"../{PAGE}.html#{_anchor(revision)}"),
            tuple(map(_line, own)),
        )
        for revision, own in reversed(_revisions(events).items())
    )


def feed(events: Sequence[Event], names: Mapping[str, str], laboratory: str) -> bytes:
    """The revisions as an Atom feed (RFC 4287), the newest first.

    ``names`` leads from short names to names. Links are relative to the feed, so that it works
    wherever the handbook stands; identifiers depend on what is recorded alone.
    """
    root = ET.Element("feed", xmlns=_ATOM)
    first = f"{events[0].date} {events[0].revision}" if events else laboratory
    own = uuid.uuid5(uuid.NAMESPACE_OID, f"solvent handbook, {first}")
    revisions = _revisions(events)
    newest = max((event.date for event in events), default="1970-01-01")
    _add(root, "id", own.urn)
    _add(root, "title", f"{laboratory}: what changed")
    _add(root, "updated", f"{newest}T00:00:00Z")
    _add(_add(root, "author"), "name", laboratory)
    _add(root, "link", rel="alternate", type="text/html", href=f"../{PAGE}.html")
    for revision, found in reversed(revisions.items()):
        day = found[0].date
        entry = _add(root, "entry")
        _add(entry, "id", uuid.uuid5(own, f"{day} {revision}").urn)
        _add(entry, "title", _title(revision, found, names))
        _add(entry, "updated", f"{day}T00:00:00Z")
        address = f"../{PAGE}.html#{_anchor(revision)}"
        _add(entry, "link", rel="alternate", type="text/html", href=address)
        _content(entry, found, names)
    return (
        b'<?xml version="1.0" encoding="utf-8"?>\n' + ET.tostring(root, "unicode").encode() + b"\n"
    )


def _revisions(events: Iterable[Event]) -> dict[str, list[Event]]:
    """The events by revision, in the order in which they were recorded."""
    grouped: dict[str, list[Event]] = defaultdict(list)
    for event in events:
        grouped[event.revision].append(event)
    return grouped


def _by_substance(events: Iterable[Event]) -> dict[str, list[Event]]:
    """The events by substance, notes aside; those of the tables as a whole last."""
    grouped: dict[str, list[Event]] = defaultdict(list)
    for event in events:
        if event.kind != history.NOTE:
            grouped[event.solvent].append(event)
    whole = grouped.pop("", None)
    return {**grouped, **({"": whole} if whole else {})}


def _line(event: Event) -> PastLine:
    quantity = QUANTITIES.get(event.quantity)
    name = quantity.name if quantity else event.quantity
    return PastLine(_LABELS.get(event.kind, ""), name, prose(event.what))


def _anchor(revision: str) -> str:
    return f"revision-{anchor(revision)}"


def _present(revision: str, events: Sequence[Event]) -> str:
    if not events:
        return f"These tables have revision {revision}. No revision is recorded yet."
    last = events[-1]
    if any(event.revision == revision for event in events):
        return f"These tables have revision {revision}, which is recorded below."
    return (
        f"These tables have revision {revision}. They changed after {last.revision}, recorded on "
        f"{last.date}; that change is not recorded yet."
    )


def _title(revision: str, events: Sequence[Event], names: Mapping[str, str]) -> str:
    slugs = [slug for slug in _by_substance(events) if slug]
    shown = ", ".join(names.get(slug, slug) for slug in slugs[:3])
    more = f" and {len(slugs) - 3} more" if len(slugs) > 3 else ""
    return f"Revision {revision}: {shown}{more}" if slugs else f"Revision {revision}"


def _content(entry: ET.Element, events: Sequence[Event], names: Mapping[str, str]) -> None:
    block = _add(_add(entry, "content", type="xhtml"), "div", xmlns=_XHTML)
    for event in events:
        if event.kind == history.NOTE:
            _add(block, "p", event.what)
    for slug, own in _by_substance(events).items():
        _add(block, "p", names.get(slug, slug) if slug else "The tables as a whole")
        items = _add(block, "ul")
        for line in map(_line, own):
            _add(items, "li", f"{line.quantity}: {line.what}" if line.quantity else line.what)


def _add(parent: ET.Element, name: str, text: str = "", **attributes: str) -> ET.Element:
    child = ET.SubElement(parent, name, attributes)
    if text:
        child.text = plain(text)
    return child
