"""Work shared out over the processors, where the system can split a running process.

Each helper is a copy of the process that does its share, hands over the result and ends. There is
no queue it could wait at for ever: when the process it came from is killed, it ends by itself.
"""

from __future__ import annotations

import os
import pickle
import sys
import warnings
from collections.abc import Callable, Sequence
from functools import partial
from typing import BinaryIO, Generic, TypeVar

# What an answer that was cut off raises.
_BROKEN = (EOFError, pickle.UnpicklingError)
_helping = False  # whether this process is a helper, which starts no others
_Item = TypeVar("_Item")
_Made = TypeVar("_Made")
_Result = TypeVar("_Result")


def processors() -> int:
    """How many processors this process may use."""
    if sys.platform == "linux":
        return len(os.sched_getaffinity(0))
    return os.cpu_count() or 1


def can_split() -> bool:
    """Whether helpers are to be had, and of use."""
    return hasattr(os, "fork") and processors() > 1 and not _helping


class Begun(Generic[_Result]):
    """Work that may be under way in a helper while this process does something else."""

    def __init__(self, work: Callable[[], _Result]) -> None:
        self._work = work
        self._helper = _start(work, is_last=False) if can_split() else None

    def result(self) -> _Result:
        """What came of the work; it is waited for, or done here where no helper did it."""
        if self._helper is not None:
            process, pipe = self._helper
            self._helper = None
            try:
                with pipe:
                    result: _Result = pickle.load(pipe)
                return result
            except _BROKEN:
                pass
            finally:
                os.waitpid(process, 0)
        return self._work()


def shared_out(
    work: Callable[[Sequence[_Item]], list[_Made]], items: Sequence[_Item], least: int
) -> list[_Made]:
    """What ``work`` makes of ``items``, in their order, done in shares of at least ``least``.

    ``work`` takes a share and returns one result for each of its items. Small jobs, and systems
    without ``fork``, get no helpers.
    """
    count = min(processors(), len(items) // least)
    if count < 2 or not can_split():
        return work(items)
    # Interleaved shares: neighbours in a table are alike, and so is the work they make.
    shares = [items[k::count] for k in range(count)]
    helpers = [_start(partial(work, share), is_last=True) for share in shares[1:]]
    try:
        done = [work(shares[0])]
        for share, (_, pipe) in zip(shares[1:], helpers, strict=True):
            try:
                done.append(pickle.load(pipe))
            except _BROKEN:
                # A helper that failed leaves its share undone; here it fails in plain sight.
                done.append(work(share))
    finally:
        for process, pipe in helpers:
            pipe.close()
            os.waitpid(process, 0)
    return [done[k % count][k // count] for k in range(len(items))]


def _start(work: Callable[[], object], *, is_last: bool) -> tuple[int, BinaryIO]:
    """A helper at work and where it will answer; one that ``is_last`` starts no others."""
    reading, writing = os.pipe()
    sys.stdout.flush()
    sys.stderr.flush()
    with warnings.catch_warnings():
        # The other threads are those of the array library, which sees to a split by itself.
        warnings.simplefilter("ignore", DeprecationWarning)
        process = os.fork()
    if process:
        os.close(writing)
        return process, os.fdopen(reading, "rb")
    global _helping
    _helping, status = is_last, 1
    try:
        os.close(reading)
        answer = work()
        with os.fdopen(writing, "wb") as pipe:
            # Piece by piece: a whole site need not be in memory once more.
            pickle.dump(answer, pipe, pickle.HIGHEST_PROTOCOL)
        status = 0
    finally:
        os._exit(status)
