"""The current into a short: what flows where the output lies below 5 % of its rated voltage."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Literal

import numpy as np
from numpy.typing import NDArray

from acceptance.errors import MeasurementError
from acceptance.overload.bursts import Bursts, bursts_of, given_up
from acceptance.overload.episodes import Episode
from acceptance.overload.kinds import goes_on_to, jump_of
from acceptance.overload.steps import STEADY, Step, nothing_given
from acceptance.points.instrument import rectangular
from acceptance.points.point import Estimate
from acceptance.points.propagation import Source, Value, of_source
from acceptance.points.type_a import TypeA, type_a

__all__ = ["SHORTED", "Short", "short_of"]

Floats = NDArray[np.float64]

SHORTED = 0.05  # of rated voltage
_HELD_BY_LOAD = 0.98  # of a CC setting: from here on the load holds the current, not the unit
_SEEN = 3  # samples of a burst that show its height
_TOP = 0.1  # of the largest reading: those of them lie so close to it
_LIKE_ONSET = 0.9  # of the last current on the branch: a mean of bursts is far less
_POINTED_AT = 0.1  # of the same: how far it may lie below what the limited branch points at
_ENOUGH = 8  # readings that show their own scatter
_FAST = 0.02  # interval of samples that no burst slips through, if there are enough of them [s]
_FOR = 1.0  # how long they go on [s]
_QUIET = 0.2  # of their mean: what the largest of them exceeds it by

_LOWER = "short the output, or sweep on to the load's lowest resistance, and record it"


@dataclass(frozen=True, slots=True)
class Short:
    """The current into a short, or how far it is known."""

    current: Estimate  # [A]
    voltage: float  # where it flowed [V]
    known: Literal["value", "at least"] = "value"
    reason: str = ""
    first: int = 0  # samples that it was formed from
    stop: int = 0


def short_of(episode: Episode) -> Short:
    """The mean current below 5 % of rated voltage; of bursts the largest reading there.

    Raises
    ------
    MeasurementError
        If no such sample shows what the output gives there.
    """
    bursts = bursts_of(episode)
    steps = [step for step in episode.steps if episode.entered < step.stop and step.first <= episode.last_over]
    if bursts is not None:
        return _peak(episode, bursts, steps)
    off = nothing_given(episode.trace)
    rows = [_settled_below(step, episode) for step in steps]
    rows = [row for row in rows if row.size]
    if not rows:
        lowest = min((step.voltage for step in steps), default=float("nan"))
        share = 100 * lowest / episode.trace.rated_voltage
        msg = f"no sample below 5 % of rated voltage; the lowest step lies at {share:.0f} % ({episode.where}); {_LOWER}"
        raise MeasurementError(msg)
    taken = np.concatenate(rows)
    if off[taken].all() and not any(_is_short(step, episode) for step in steps):
        msg = f"the output was off below 5 % of rated voltage, and was not shorted ({episode.where}); {_LOWER}"
        raise MeasurementError(msg)
    averaged = jump_of(episode)
    if averaged:
        msg = f"{averaged} ({episode.where})"
        raise MeasurementError(msg)
    return _mean(episode, taken, steps)


def _settled_below(step: Step, episode: Episode) -> NDArray[np.intp]:
    """The later half of a step, where it lies below 5 % of rated voltage."""
    stop = min(step.stop, episode.last_over + 1)
    rows = np.arange(step.first + (stop - step.first) // 2, stop)
    return rows[episode.trace.voltage[rows] < SHORTED * episode.trace.rated_voltage]


def _is_short(step: Step, episode: Episode) -> bool:
    """Whether a setting is as good as a short."""
    rated = episode.trace.rated_voltage
    if step.mode == "CR":
        return step.setting + episode.trace.lead <= SHORTED * rated / episode.trace.rated_current
    return step.mode == "CV" and step.setting <= SHORTED * rated


def _mean(episode: Episode, rows: NDArray[np.intp], steps: Sequence[Step]) -> Short:
    trace, part = episode.trace, episode.trace.part
    spread = type_a(trace.current[rows])
    value = part.bench.correct(trace.current_key, spread.mean) + part.rounding(
        trace.current_key, spread.deviation or 0.0
    )
    value = value + _spread(spread, [step for step in steps if step.first <= rows[-1] and step.stop > rows[0]])
    estimate = Estimate(value, _unstated(episode), single=spread.readings == 1)
    voltage = float(trace.voltage[rows].mean())
    span = int(rows[0]), int(rows[-1]) + 1
    reason = _held_by_load(rows, steps, spread.mean) or _hidden_bursts(episode, rows, spread.mean)
    return Short(estimate, voltage, "at least" if reason else "value", reason, *span)


def _spread(spread: TypeA, here: Sequence[Step]) -> Value:
    """The error by scatter; few readings show little of theirs, and that of the branch tells it then. [A]"""
    name, own = "spread of the current into the short", spread.standard_uncertainty or 0.0
    elsewhere = max((step.u_current for step in here), default=0.0) if spread.readings < _ENOUGH else 0.0
    if elsewhere > own:
        return of_source(elsewhere, Source(name, "A"))
    return of_source(own, Source(name, "A", spread.degrees_of_freedom))


def _held_by_load(rows: NDArray[np.intp], steps: Sequence[Step], current: float) -> str:
    """Why the unit may give more than the load took; "" where it may not."""
    held = [s for s in steps if s.first <= rows[-1] and s.stop > rows[0] and s.mode == "CC"]
    if any(current >= _HELD_BY_LOAD * step.setting for step in held):
        return "the load in CC mode held the current, so that the unit may give more; short it, or use CR or CV mode"
    return ""


def _hidden_bursts(episode: Episode, rows: NDArray[np.intp], current: float) -> str:
    """Why a current well below the onset may be the mean of bursts, or a pause between them; "" where it is neither.

    A slow or averaging meter shows bursts as a steady low current. What speaks against them: a current like that on
    the branch, a limited branch that points at it, a latch that was shown, or many quick readings that are all alike.
    """
    gone = given_up(episode)
    latched = gone is not None and gone.latched
    if not latched and _is_off_at_some(episode):
        return (
            "the output gave nothing at other settings of the overload, so that this may be the mean of bursts, or "
            "less than their peak; sample ten times in a period of the bursts"
        )
    carried = [
        s.current for s in episode.steps if s.kind == STEADY and s.first < episode.end and not _is_below(s, episode)
    ]
    reached = max(carried, default=episode.trace.rated_current)
    if current >= _LIKE_ONSET * reached:
        return ""
    if gone is not None and latched and rows[0] >= gone.since:
        return ""
    voltage = float(episode.trace.voltage[rows].mean())
    pointed_at = goes_on_to(episode, voltage)
    gives = not nothing_given(episode.trace)[rows].any()
    if pointed_at is not None and gives and current >= pointed_at - _POINTED_AT * reached:
        return ""
    if gives and _is_fast_and_quiet(episode, rows):
        return ""
    return (
        f"{current:.3g} A after {reached:.4g} A on the branch may be the mean of bursts, or a pause between them; "
        "sweep in CR or CV mode, in small steps, to show a foldback, or sample the short every 20 ms or faster"
    )


def _is_off_at_some(episode: Episode) -> bool:
    """Whether the output gave nothing at some settings of the overload, and something at others."""
    given = [s.kind for s in episode.steps if episode.entered <= s.first and s.stop <= episode.last_over + 1]
    return STEADY in given and any(kind != STEADY for kind in given)


def _is_below(step: Step, episode: Episode) -> bool:
    return float(episode.branch.at(np.array(step.current))) - step.voltage > episode.droop


def _is_fast_and_quiet(episode: Episode, rows: NDArray[np.intp]) -> bool:
    time, current = episode.trace.time, episode.trace.current[rows]
    if time is None or rows.size < 2:
        return False
    apart = np.diff(time[rows])
    lasts = float(apart[np.diff(rows) == 1].sum())
    mean = float(current.mean())
    return bool(
        float(np.median(apart)) <= _FAST * (1 + 1e-6)
        and lasts >= _FOR
        and float(current.max()) <= (1 + _QUIET) * mean
        and float(current.min()) >= (1 - _QUIET) * mean
    )


def _peak(episode: Episode, bursts: Bursts, steps: Sequence[Step]) -> Short:
    trace, part = episode.trace, episode.trace.part
    on = ~nothing_given(trace)
    low = SHORTED * trace.rated_voltage
    shorted: list[NDArray[np.intp]] = []
    for step in steps:
        rows = np.arange(step.first, min(step.stop, episode.last_over + 1))
        rows = rows[on[rows]]
        if rows.size and float(np.median(trace.voltage[rows])) < low:
            shorted.append(rows[trace.voltage[rows] < low])
    if not shorted:
        msg = f"no burst lies below 5 % of rated voltage ({episode.where}); {_LOWER} for several bursts"
        raise MeasurementError(msg)
    taken = np.concatenate(shorted)
    top = int(taken[np.argmax(trace.current[taken])])
    largest = float(trace.current[top])
    value = part.bench.correct(trace.current_key, largest) + part.rounding(trace.current_key, 0.0)
    value = value + of_source(bursts.noise, Source("scatter of the largest reading", "A"))
    # between readings it may be larger still, by about as much as those beside the largest differ from it
    beside = largest - _third(trace.current, top)
    value = value + of_source(rectangular(beside), Source("height of a burst between its readings", "B"))
    estimate = Estimate(value, _unstated(episode))
    span = int(taken[0]), int(taken[-1]) + 1
    reason = bursts.doubt
    if bursts.samples_on < _SEEN or beside > _TOP * largest + 3 * bursts.noise:
        reason = (
            "fewer than three readings beside each other show the top of a burst, so that its peak may lie between "
            "them; sample faster"
        )
    return Short(estimate, float(trace.voltage[top]), "at least" if reason else "value", reason, *span)


def _third(current: Floats, top: int) -> float:
    """The least of three readings in turn, the largest one among them, where these are most alike. [A]"""
    starts = range(max(0, top - _SEEN + 1), min(top, current.size - _SEEN) + 1)
    return max((float(current[start : start + _SEEN].min()) for start in starts), default=0.0)


def _unstated(episode: Episode) -> frozenset[str]:
    key = episode.trace.current_key
    return frozenset() if episode.trace.part.bench.is_stated(key) else frozenset({key})
