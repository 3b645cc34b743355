"""Borders between stretches of samples: where columns change, where time jumps, what two lists of spans share."""

from __future__ import annotations

from collections.abc import Iterable, Iterator, Sequence
from typing import Any

import numpy as np
import numpy.typing as npt

from acceptance.bench.log import Span

__all__ = ["Codes", "changes", "common", "gaps_in"]

Array = npt.NDArray[np.float64]
Codes = npt.NDArray[np.signedinteger[Any]]

GAP_STEPS = 10  # median time steps without a sample: a gap


def changes(columns: Iterable[npt.NDArray[np.generic]]) -> Codes:
    """Indices of the samples at which any column differs from the sample before."""
    differs = [column[1:] != column[:-1] for column in columns]
    return np.flatnonzero(np.logical_or.reduce(differs)) + 1


def gaps_in(time: Array) -> Codes:
    """Indices of the samples before which time jumps, or runs back; a logger that slows down for good has no gap."""
    step = np.diff(time)
    forward = step[step > 0]
    back = np.flatnonzero(step < 0)
    if forward.size < 4:
        return back + 1
    long = step > GAP_STEPS * float(np.median(forward))
    count = np.concatenate(([0], np.cumsum(long)))
    at = np.flatnonzero(long)
    around = count[np.minimum(at + 4, step.size)] - count[np.maximum(at - 3, 0)]
    return np.union1d(at[around <= 3], back) + 1


def common(one: Iterable[Span], other: Sequence[Span]) -> Iterator[Span]:
    """What two ordered lists of spans have in common."""
    i = 0
    for first, stop in one:
        while i < len(other) and other[i][1] <= first:
            i += 1
        j = i
        while j < len(other) and other[j][0] < stop:
            yield max(first, other[j][0]), min(stop, other[j][1])
            j += 1
