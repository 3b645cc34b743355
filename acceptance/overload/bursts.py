"""Bursts and giving up: what an output does in time while it is asked for too much."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from acceptance.overload.episodes import Episode
from acceptance.overload.steps import is_by_hand, nothing_given
from acceptance.overload.trace import scatter

__all__ = ["Bursts", "GivenUp", "bursts_of", "given_up"]

Mask = NDArray[np.bool_]

_FEWEST = 3  # bursts
_UNEVEN = 0.3  # of the median period, to either side
_EVEN_SHARE = 0.6  # of the periods that lie within it
_SAMPLES = 10  # in a period
_DOWN = 10.0  # an output that is down for so long after the overload has given up; a slow retry comes sooner [s]
_DOWN_CYCLED = 5.0  # the same where the source was cycled then, which brought it back [s]
_DOWN_SAMPLES = 3


@dataclass(frozen=True, slots=True)
class Bursts:
    """On and off by turns."""

    count: int
    period_samples: float  # between rising edges, the median
    period: float | None  # [s]
    duty: float  # share of the time that it is on
    current: float  # largest [A]
    samples_on: float  # of a burst, the median
    noise: float  # scatter of the current within the bursts [A]
    even: bool  # whether most periods are alike
    first: int  # sample of the first rising edge

    @property
    def is_shown(self) -> bool:
        """Three bursts and more, at even distances, sampled ten times in a period."""
        return self.count >= _FEWEST and self.even and self.period_samples >= _SAMPLES

    @property
    def doubt(self) -> str:
        """Why bursts that were seen do not show a hiccup; "" where they do."""
        if self.count < _FEWEST:
            seen = "one burst was" if self.count == 1 else f"{self.count} bursts were"
            return f"{seen} seen, and three show a hiccup; hold the overload for longer"
        if self.period_samples < _SAMPLES:
            return (
                f"a burst comes every {self.period_samples:.3g} samples, and ten samples in a period show what it is; "
                "sample faster"
            )
        if not self.even:
            return "the bursts come at uneven distances; hold each setting for several of them"
        return ""


@dataclass(frozen=True, slots=True)
class GivenUp:
    """An output that gives nothing any more."""

    since: int  # sample
    latched: bool  # still down after the overload, until the source was cycled or for long
    doubt: str  # why it cannot be told whether it has latched


def bursts_of(episode: Episode) -> Bursts | None:
    """What is on and off by turns under overload; None where nothing is.

    A burst counts whose beginning lies within one setting of the load, so that nobody's switching is taken for it.
    """
    trace, first, stop = episode.trace, episode.entered, episode.last_over + 1
    off = nothing_given(trace)[first:stop]
    inside = _within_steps(episode, first, stop)
    rises = np.flatnonzero(off[:-1] & ~off[1:] & inside[1:]) + 1
    if not rises.size:
        return None
    period = _periods(episode, rises + first)
    on = ~off
    lengths = _lengths(on[rises[0] :])
    current = trace.current[first:stop]
    seconds = _seconds(episode, rises + first)
    return Bursts(
        count=int(rises.size),
        period_samples=float(np.median(period)) if period.size else float("nan"),
        period=float(np.median(seconds)) if seconds.size else None,
        duty=float(np.mean(on[rises[0] : rises[-1]])) if rises.size > 1 else float("nan"),
        current=float(current.max()),
        samples_on=float(np.median(lengths)),
        noise=_noise(current, on),
        even=_is_even(period),
        first=first + int(rises[0]),
    )


def _within_steps(episode: Episode, first: int, stop: int) -> Mask:
    """Samples that are not the first of their step; all of them where no setting tells the steps."""
    inside = np.ones(stop - first, dtype=bool)
    if episode.trace.setting is not None:
        starts = np.array([step.first for step in episode.steps if first <= step.first < stop], dtype=np.intp)
        inside[starts - first] = False
    return inside


def _periods(episode: Episode, rises: NDArray[np.intp]) -> NDArray[np.float64]:
    """Samples from one rising edge to the next of the same setting."""
    return np.diff(rises).astype(np.float64)[_same_step(episode, rises)]


def _seconds(episode: Episode, rises: NDArray[np.intp]) -> NDArray[np.float64]:
    time = episode.trace.time
    if time is None or rises.size < 2:
        return np.empty(0)
    seconds: NDArray[np.float64] = np.diff(time[rises])[_same_step(episode, rises)]
    return seconds


def _same_step(episode: Episode, rises: NDArray[np.intp]) -> Mask:
    """Whether each edge and the next one lie in one step; they do where no setting tells the steps."""
    if episode.trace.setting is None:
        return np.ones(max(0, rises.size - 1), dtype=bool)
    firsts = np.array([step.first for step in episode.steps])
    same: Mask = np.diff(np.searchsorted(firsts, rises, side="right")) == 0
    return same


def _is_even(period: NDArray[np.float64]) -> bool:
    if not period.size:
        return False
    median = float(np.median(period))
    near = np.abs(period - median) <= np.maximum(_UNEVEN * median, 1.0)
    return float(near.mean()) >= _EVEN_SHARE


def _lengths(on: Mask) -> NDArray[np.float64]:
    edges = np.flatnonzero(np.diff(on.astype(np.int8), prepend=0, append=0))
    return (edges[1::2] - edges[::2]).astype(np.float64) if edges.size else np.array([np.nan])


def _noise(current: NDArray[np.float64], on: Mask) -> float:
    """Scatter of the current within the longest burst."""
    edges = np.flatnonzero(np.diff(on.astype(np.int8), prepend=0, append=0))
    longest = int(np.argmax(edges[1::2] - edges[::2]))
    inside = current[edges[2 * longest] + 1 : edges[2 * longest + 1] - 1]
    return scatter(inside)


def given_up(episode: Episode) -> GivenUp | None:
    """Whether the output gave nothing from some moment of the overload to its end; None where it did not."""
    off = nothing_given(episode.trace)
    last = episode.end - 1 if episode.source_off is None else min(episode.end, episode.source_off) - 1
    if last < episode.entered or not off[last]:
        return None
    on = np.flatnonzero(~off[episode.start : last])
    since = episode.start + int(on[-1]) + 1 if on.size else episode.start
    back = np.flatnonzero(~off[since : episode.stop])
    if (int(back[0]) if back.size else episode.stop - since) < _DOWN_SAMPLES:
        return None  # the way through zero of a return, or of a single reading
    return GivenUp(since, *_latched(episode, off, since))


def _latched(episode: Episode, off: Mask, since: int) -> tuple[bool, str]:
    """Whether it is still down after the overload is gone, and what leaves that open."""
    removed = episode.removed
    if removed is None:
        return False, (
            "the output gave nothing under overload, and the overload was not removed in the log, so that a latch and "
            "a slow retry look alike; return to rated load, and then cycle the source"
        )
    if episode.source_off is not None and episode.source_off < removed:
        return False, "the source was switched off before the overload was removed; remove the overload first"
    end = episode.stop if episode.source_off is None else episode.source_off
    back = np.flatnonzero(~off[removed:end])
    if back.size:
        return False, _back_by_itself(episode)
    if end - removed < _DOWN_SAMPLES:
        return False, (
            f"{end - removed} readings were taken of the output down after the overload was removed, and three show a "
            "latch: write down several over 10 s at rated load, with their times, before the source is cycled"
        )
    if episode.source_off is not None:
        return _until_cycled(episode, end, since)
    return _long_enough(episode, removed, end, since)


def _until_cycled(episode: Episode, end: int, since: int) -> tuple[bool, str]:
    time = episode.trace.time
    if time is None:  # a person with a pencil: three rows take longer than any retry
        if is_by_hand(episode.trace):
            return True, ""
        return False, "the overload has no time in every sample; log the time"
    down = float(time[end - 1] - time[since])
    if down >= _DOWN_CYCLED:
        return True, ""
    return False, (
        f"the output was down for {down:.3g} s when the source was cycled, and a slow retry is not ruled out; wait "
        f"{_DOWN:g} s at rated load before the source is cycled"
    )


def _back_by_itself(episode: Episode) -> str:
    if episode.trace.input is None:
        return (
            "the output came back after the overload, and the input voltage was not logged, so that it is open whether "
            "the source was cycled; log the input voltage"
        )
    return (
        "the output gave nothing under overload, and came back by itself: no bursts were seen, and it has not latched; "
        "hold the overload for longer, and sample faster"
    )


def _long_enough(episode: Episode, removed: int, end: int, since: int) -> tuple[bool, str]:
    time = episode.trace.time
    down = float(time[end - 1] - time[removed]) if time is not None else 0.0
    waited = float(time[removed] - time[since]) if time is not None else 0.0
    if down >= _DOWN or (down >= 0.5 * _DOWN and down + waited >= 2 * _DOWN):
        return True, ""
    return False, (
        f"the output was still down when the log ended {down:.3g} s after the overload, and a slow retry is not ruled "
        f"out; record {_DOWN:g} s, or until the source is cycled"
    )
