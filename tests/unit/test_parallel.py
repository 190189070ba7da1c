"""Work shared out gives what it gives in one piece."""

from __future__ import annotations

import os
from collections.abc import Sequence

import pytest

from generator import parallel
from generator.parallel import shared_out


def _squares(numbers: Sequence[int]) -> list[tuple[int, int]]:
    return [(number * number, os.getpid()) for number in numbers]


@pytest.mark.parametrize("processors", [1, 2, 3, 7])
@pytest.mark.parametrize("count", [0, 1, 5, 24, 1000])
def test_results_come_in_order(
    processors: int, count: int, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setattr(parallel, "processors", lambda: processors)
    results = shared_out(_squares, range(count), least=4)
    assert [square for square, _ in results] == [n * n for n in range(count)]
    assert len({pid for _, pid in results}) == min(count, max(1, min(processors, count // 4)))


def test_an_error_in_a_helper_is_the_callers(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(parallel, "processors", lambda: 2)

    def work(numbers: Sequence[int]) -> list[float]:
        return [1 / (number - 5) for number in numbers]

    with pytest.raises(ZeroDivisionError):
        shared_out(work, range(20), least=1)


def test_a_killed_helpers_share_is_done_again(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(parallel, "processors", lambda: 2)
    caller = os.getpid()

    def work(numbers: Sequence[int]) -> list[int]:
        if os.getpid() != caller:
            os.kill(os.getpid(), 9)
        return list(numbers)

    assert shared_out(work, range(20), least=1) == list(range(20))
