"""The current into a short: what flows where the output lies below 5 % of its rated voltage."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Literal

import numpy as np
from numpy.typing import NDArray

from acceptance.errors import MeasurementError
from acceptance.overload.bursts import Bursts, bursts_of
from acceptance.overload.episodes import Episode
from acceptance.overload.kinds import jump_of
from acceptance.overload.steps import Step, nothing_given
from acceptance.points.point import Estimate
from acceptance.points.propagation import Source, of_source
from acceptance.points.type_a import type_a

__all__ = ["SHORTED", "Short", "short_of"]

Floats = NDArray[np.float64]

SHORTED = 0.05  # of rated voltage
_HELD_BY_LOAD = 0.98  # of a CC setting: from here on the load holds the current, not the unit
_SEEN = 3  # samples of a burst that show its height

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
    source = Source("spread of the current into the short", "A", spread.degrees_of_freedom)
    value = value + of_source(spread.standard_uncertainty or 0.0, source)
    estimate = Estimate(value, _unstated(episode), single=spread.readings == 1)
    voltage = float(trace.voltage[rows].mean())
    span = int(rows[0]), int(rows[-1]) + 1
    held = [s for s in steps if s.first <= rows[-1] and s.stop > rows[0] and s.mode == "CC"]
    if any(spread.mean >= _HELD_BY_LOAD * step.setting for step in held):
        reason = "the load in CC mode held the current, so that the unit may give more; short it, or use CR or CV mode"
        return Short(estimate, voltage, "at least", reason, *span)
    return Short(estimate, voltage, "value", "", *span)


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
    estimate = Estimate(value, _unstated(episode))
    span = int(taken[0]), int(taken[-1]) + 1
    if bursts.samples_on < _SEEN:
        reason = "a burst has fewer than three samples, so that its peak may lie between them; sample faster"
        return Short(estimate, float(trace.voltage[top]), "at least", reason, *span)
    return Short(estimate, float(trace.voltage[top]), "value", "", *span)


def _unstated(episode: Episode) -> frozenset[str]:
    key = episode.trace.current_key
    return frozenset() if episode.trace.part.bench.is_stated(key) else frozenset({key})
