"""Episodes: a way into an overload, the overload itself, and what comes after it."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from acceptance.overload.branch import Branch
from acceptance.overload.steps import Step, nothing_given
from acceptance.overload.trace import Trace

__all__ = ["Episode", "episodes_of"]

Mask = NDArray[np.bool_]

_FEWEST = 2  # samples off the branch: one alone may be a slip of the meter


@dataclass(frozen=True, slots=True, eq=False)
class Episode:
    """Samples [start, stop) of a trace with one overload in them."""

    trace: Trace
    branch: Branch
    droop: float  # [V]
    steps: tuple[Step, ...]  # of these samples
    start: int
    stop: int
    entered: int  # the first sample that asks for more than rated current
    removed: int | None  # the first sample after the overload that asks for no more; None: none in the log
    last_over: int  # the last sample that surely asked for more
    source_off: int | None  # the first sample, after the entry, without an input voltage
    below: Mask  # of every sample of the trace: whether it lies the droop below the branch

    @property
    def end(self) -> int:
        """Where the overload ends, or its log."""
        return self.stop if self.removed is None else self.removed

    @property
    def left_branch(self) -> bool:
        """Whether the output left its branch, in more than a single sample."""
        return bool(np.count_nonzero(self.below[self.start : self.stop]) >= _FEWEST)

    def place(self, first: int, stop: int) -> str:
        """File and lines of samples."""
        return self.trace.place(first, stop)

    @property
    def where(self) -> str:
        """File and lines."""
        return self.trace.place(self.start, self.stop)


def episodes_of(trace: Trace, steps: Sequence[Step], branch: Branch, *, droop: float) -> tuple[Episode, ...]:
    """The episodes of a trace; one without an overload that left the branch only where there is no other.

    Parameters
    ----------
    droop
        Fall below the branch that is no more regulation. [V]
    """
    below = branch.at(trace.current) - trace.voltage > droop
    over = trace.overloaded()
    if not over.any():
        over = below
    found, start = [], 0
    for first, stop, after in _runs(over, trace.size):
        episode = _episode(trace, steps, (branch, droop, below), bounds=(start, first, stop, after), over=over)
        if episode.left_branch:
            found.append(episode)
            start = after
        elif after == trace.size and not found:
            found.append(episode)
    return tuple(found)


def _runs(over: Mask, size: int) -> list[tuple[int, int, int]]:
    """First and last + 1 of every overload, and where the next one begins."""
    edges = np.flatnonzero(np.diff(over.astype(np.int8), prepend=0, append=0))
    firsts, stops = edges[::2].tolist(), edges[1::2].tolist()
    return list(zip(firsts, stops, [*firsts, size][1:], strict=True)) if firsts else []


def _episode(
    trace: Trace,
    steps: Sequence[Step],
    line: tuple[Branch, float, Mask],
    *,
    bounds: tuple[int, int, int, int],
    over: Mask,
) -> Episode:
    branch, droop, below = line
    start, first, stop, after = bounds
    gives = ~nothing_given(trace)
    known = np.isfinite(trace.asked()) | np.isinf(trace.asked()) if trace.setting is not None else gives
    if stop < after and trace.load_off()[stop]:  # when it was switched off is known only from what it drew
        known = known & gives
    certain = np.flatnonzero((over & known)[first:stop])
    return Episode(
        trace=trace,
        branch=branch,
        droop=droop,
        steps=tuple(step for step in steps if step.stop > start and step.first < after),
        start=start,
        stop=after,
        entered=first,
        removed=stop if stop < after else None,
        last_over=first + int(certain[-1]) if certain.size else stop - 1,
        source_off=_source_off(trace, first, after),
        below=below,
    )


def _source_off(trace: Trace, first: int, stop: int) -> int | None:
    if trace.input is None:
        return None
    rated = trace.part.limits.ratings.input.voltage
    off = np.flatnonzero(trace.input[first:stop] < 0.5 * rated)
    return first + int(off[0]) if off.size else None
