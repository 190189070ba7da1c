"""What follows from one substance's own rows alone, kept from one build to the next.

Whatever is worked out for a substance is found again under the hash of all it depends on: the
substance's rows, the settings, the code, and what else its maker names. So an edit of one value
works out one substance anew, and a build from kept results is the build from none.
"""

from __future__ import annotations

import pickle
import sys
from collections.abc import Callable, Iterator, Mapping, Sequence
from pathlib import Path
from typing import Any, Generic, TypeVar

from generator.cache import Cache, Pack, digest, tree
from generator.parallel import Begun, shared_out

_Made = TypeVar("_Made")
Asked = Mapping[str, "bytes | None"]
_PACKAGE = Path(__file__).parent
# A key is half the hash of the substance and half that of what is kept of it.
_HALF = 20
# Fewer substances than this for each helper are not worth starting one.
LEAST = 25


class Kept:
    """The kept results of every substance. ``keys``: the hash of all its own numbers depend on."""

    def __init__(self, keys: Mapping[str, str], pack: Pack | None = None) -> None:
        self._keys = keys
        self._pack = Pack(None, "") if pack is None else pack

    def key(self, slug: str) -> str:
        """Hash of all that a substance's own numbers depend on, "" where nothing is kept."""
        return self._keys.get(slug, "")

    def of(self, slug: str, name: str, make: Callable[[], _Made], *more: object) -> _Made:
        """One result of one substance. ``more``: what it depends on besides the substance."""
        (made,) = self.each([slug], name, lambda _: [make()], *more).values()
        return made

    def each(
        self,
        slugs: Sequence[str],
        name: str,
        make: Callable[[Sequence[str]], list[_Made]],
        *more: object,
        beside: Mapping[str, object] | None = None,
        stands: Callable[[_Made], bool] | None = None,
    ) -> Results[_Made]:
        """One result of several substances, loaded as it is asked for.

        ``make`` is given those that are missing, in shares that helpers may work at; it returns
        one result for each. ``more`` is what all the results depend on besides the substances,
        ``beside`` what each of them does. A kept result that does not ``stand`` is made again.
        """
        named = digest(name, *more)[:_HALF]
        own = self._keys if beside is None else {s: digest(self.key(s), beside[s]) for s in slugs}
        keys = {slug: f"{own.get(slug, '')[:_HALF]}{named}" for slug in slugs}
        stored = {slug: data for slug, key in keys.items() if (data := self._pack.get(key))}
        made: dict[str, _Made] = {}
        if stands is not None:
            read = {slug: pickle.loads(data) for slug, data in stored.items()}
            made = {slug: result for slug, result in read.items() if stands(result)}
        missing = [slug for slug in slugs if slug not in (stored if stands is None else made)]
        fresh = shared_out(make, missing, LEAST) if missing else []
        for slug, result in zip(missing, fresh, strict=True):
            made[slug] = result
            if slug in self._keys:
                self._pack.put(keys[slug], pickle.dumps(result, pickle.HIGHEST_PROTOCOL))
        return Results(keys, stored, made, missing)

    def under(self, keys: Mapping[str, str]) -> Kept:
        """The same store for results that depend on something else: other hashes."""
        return Kept(keys, self._pack)

    def begin(self, job: Callable[[], _Made]) -> Callable[[], _Made]:
        """Have a job done by a helper if there is one; what is returned waits for its result.

        What the helper kept is kept here too.
        """

        def work() -> tuple[_Made, Asked]:
            before = len(self._pack.asked())
            return job(), self._pack.asked(before)

        begun = Begun(work)

        def wait() -> _Made:
            result, asked = begun.result()
            self._pack.adopt(asked)
            return result

        return wait

    def share_out(self, jobs: Sequence[Callable[[], _Made]], least: int) -> list[_Made]:
        """The results of jobs that helpers may do, in shares of at least ``least``.

        What a helper kept is kept here too.
        """

        def work(share: Sequence[Callable[[], _Made]]) -> list[tuple[_Made, Asked]]:
            before = len(self._pack.asked())
            results = [job() for job in share]
            asked = self._pack.asked(before)
            return [(result, {} if i else asked) for i, result in enumerate(results)]

        done = shared_out(work, jobs, least)
        for _, asked in done:
            self._pack.adopt(asked)
        return [result for result, _ in done]

    def save(self, *, forget: bool) -> None:
        """Write what was made; with ``forget``, without what this build had no use for."""
        self._pack.save(forget=forget)


NOTHING = Kept({})
"""Nothing is kept: everything is made each time."""


class Results(Mapping[str, _Made], Generic[_Made]):
    """Results by substance, in the order asked for; a stored one is read when it is wanted.

    ``anew`` are the substances whose result was made just now.
    """

    def __init__(
        self,
        order: Mapping[str, Any],
        stored: Mapping[str, Any],
        made: dict[str, _Made],
        anew: Sequence[str],
    ) -> None:
        self._order, self._stored, self._made, self.anew = order, stored, made, tuple(anew)

    def __getitem__(self, slug: str) -> _Made:
        if slug not in self._made:
            self._made[slug] = pickle.loads(self._stored[slug])
        return self._made[slug]

    def __iter__(self) -> Iterator[str]:
        return iter(self._order)

    def __len__(self) -> int:
        return len(self._order)


def code() -> str:
    """Hash of this package, of the Python that runs it, and of what is installed beside it.

    Templates are left out: no number depends on them.
    """
    installed = sorted(
        entry.name
        for folder in dict.fromkeys(sys.path)
        if Path(folder).is_dir()
        for entry in Path(folder).iterdir()
        if entry.name.endswith(".dist-info")
    )
    parts = [part for part in tree(_PACKAGE) if not part[0].startswith("templates/")]
    return digest(sys.version, installed, parts)


def templates() -> str:
    """Hash of the templates."""
    return digest(tree(_PACKAGE / "templates"))


def kept(cache: Cache, kind: str, revisions: Mapping[str, str], *common: object) -> Kept:
    """The kept results of the substances, of one kind. ``common``: what all of them depend on."""
    shared = digest(*common)
    keys = {slug: digest(slug, revision, shared) for slug, revision in revisions.items()}
    return Kept(keys, cache.pack(kind))
