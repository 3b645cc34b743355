"""Several things done at once, where a log is so long that it pays: numpy lets its threads run beside each other."""

from __future__ import annotations

import os
from collections.abc import Callable, Iterable
from typing import TypeVar

__all__ = ["MANY", "each", "processors"]

A = TypeVar("A")
B = TypeVar("B")

MANY = 1_000_000  # samples, below which threads cost more than they give
_AT_ONCE = 2  # threads that look at columns: each has one unpacked


def processors() -> int:
    """How many processors this process may use."""
    try:
        return len(os.sched_getaffinity(0))
    except AttributeError:  # not every system tells
        return os.cpu_count() or 1


def each(function: Callable[[A], B], items: Iterable[A], *, samples: int) -> list[B]:
    """What a function gives for each item, in their order; in threads where the log has so many samples."""
    workers = min(_AT_ONCE, processors())
    if samples < MANY or workers < 2:
        return [function(item) for item in items]
    from concurrent.futures import ThreadPoolExecutor

    with ThreadPoolExecutor(workers) as pool:
        return list(pool.map(function, items))
