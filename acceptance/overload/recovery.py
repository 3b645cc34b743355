"""Recovery: how soon the output is back in its band once the overload is gone."""

from __future__ import annotations

import math
from dataclasses import dataclass
from typing import Literal

import numpy as np

from acceptance.errors import MeasurementError
from acceptance.overload.episodes import Episode
from acceptance.overload.trace import Trace, scatter
from acceptance.points.instrument import converter_step_uncertainty
from acceptance.points.point import Estimate
from acceptance.points.propagation import Source, coverage_factor, of_source

__all__ = ["Returned", "returned_after"]

_LOST = 50  # an error so many times smaller than the bracket
_EDGE = 3  # samples back from the first one in the band, over which the voltage's way into it is looked at


@dataclass(frozen=True, slots=True)
class Returned:
    """How long the return took at most, or how long it surely took."""

    time: Estimate  # [s]
    removed: int  # sample
    back: int | None  # sample; None: not back in the log
    known: Literal["value", "at least", "at most"] = "value"
    reason: str = ""
    told: str = ""  # the bracket, in words


def returned_after(episode: Episode, *, band: float, within: float) -> Returned:
    """From the last sample of the overload until the first one in the band that no other one outside follows.

    Parameters
    ----------
    band
        Of rated voltage, to either side.
    within
        What is asked for: sampled more slowly, the log does not tell. [s]

    Raises
    ------
    MeasurementError
        If the log does not show it.
    """
    time, removed = _see_to_the_log(episode, within)
    trace = episode.trace
    ends = episode.stop
    if episode.source_off is not None and episode.source_off > removed:
        ends = episode.source_off
    inside = np.abs(trace.voltage[removed:ends] / trace.rated_voltage - 1) <= band * (1 + 1e-9)
    if not inside[-1]:
        return _not_back(episode, inside, float(time[ends - 1] - time[removed]), within=within)
    out = np.flatnonzero(~inside)
    back = removed + (int(out[-1]) + 1 if out.size else 0)
    most = float(time[back] - time[episode.last_over])
    least = max(0.0, float(time[max(back - 1, removed)] - time[removed]))
    _see_to_the_band(episode, trace.voltage[back:ends], band)
    value = _with_errors(episode, back, most, bracket=most - least)
    told = f"between {least:.3g} s and {most:.3g} s, by the samples"
    if most > within >= least:
        reason = f"it took {told}, which leaves open whether that is within {within:g} s; {_remedy(episode)}"
        return Returned(value, removed, back, "at most", reason, told)
    return Returned(value, removed, back, told=told)


def _with_errors(episode: Episode, back: int, most: float, *, bracket: float) -> Estimate:
    """The upper end of the bracket, which takes in what the sampling leaves open, and what else may be wrong with it.

    That are the digits of two times, and the moment at which a voltage that reads a little wrong crosses the edge.
    What is lost in the bracket is left out: it would print digits that nobody saw.
    """
    trace = episode.trace
    time, removed = trace.time, episode.removed
    assert time is not None
    assert removed is not None
    u_digits = math.sqrt(2.0) * converter_step_uncertainty(_step(trace, "time"))
    u_edge, before = 0.0, max(removed, back - _EDGE)
    if back > removed:
        u_voltage = math.hypot(
            trace.part.bench.standard_uncertainty(trace.voltage_key, float(trace.voltage[back])),
            converter_step_uncertainty(_step(trace, trace.voltage_key)),
            scatter(trace.voltage[back : episode.stop]),
        )
        moved = abs(float(trace.voltage[back] - trace.voltage[before]))
        u_edge = float(time[back] - time[before]) * u_voltage / max(moved, u_voltage, 1e-300)
    if _LOST * math.hypot(u_digits, u_edge) < bracket:
        return Estimate(most, _unstated(trace))
    value = most + of_source(u_digits, Source("digits of the time", "B"))
    value = value + of_source(u_edge, Source("error of the voltage at the edge of the band", "B"))
    return Estimate(value, _unstated(trace))


def _unstated(trace: Trace) -> frozenset[str]:
    """The voltage, where nothing says how well it was read: then it is not known when it was in the band."""
    return frozenset() if trace.part.bench.is_stated(trace.voltage_key) else frozenset({trace.voltage_key})


def _see_to_the_band(episode: Episode, back: np.ndarray[tuple[int], np.dtype[np.float64]], band: float) -> None:
    """See to it that what came back lies in the band by more than its voltage may be wrong.

    Raises
    ------
    MeasurementError
        If it may as well lie outside, under any rule but `simple`.
    """
    trace = episode.trace
    decision, rated = trace.part.limits.decision, trace.rated_voltage
    level = float(back.mean())
    u = trace.part.bench.standard_uncertainty(trace.voltage_key, level)
    bound = coverage_factor(decision.confidence, math.inf) * u
    if decision.rule != "simple" and abs(level - rated) + bound > band * rated * (1 + 1e-9):
        msg = (
            f"the output came back to {level:.5g} V, which lies within {100 * band:g} % of {rated:g} V by less than "
            f"its uncertainty of {bound:.2g} V ({episode.where}); use a better meter, or agree on a wider band"
        )
        raise MeasurementError(msg)


def _step(trace: Trace, key: str) -> float:
    """The last digit that a channel was logged with, in its unit."""
    return max((channel.step for channel in trace.part.log.channels if channel.key == key), default=0.0)


def _remedy(episode: Episode) -> str:
    assert episode.removed is not None
    is_vague = episode.trace.setting is None and episode.removed - episode.last_over > 1
    return "log the load setting, which tells when the overload was removed" if is_vague else "sample faster"


def _see_to_the_log(episode: Episode, within: float) -> tuple[np.ndarray[tuple[int], np.dtype[np.float64]], int]:
    trace = episode.trace
    if not episode.left_branch:
        msg = f"the output never left its branch, so that there is nothing to recover from ({episode.where})"
        raise MeasurementError(msg)
    if episode.removed is None:
        msg = f"the overload was not removed in the log ({episode.where}); return to rated load, and go on recording"
        raise MeasurementError(msg)
    trace.stretch(episode.last_over, episode.stop).require("time")
    if trace.time is None:
        msg = f"the overload has no time in every sample ({episode.where}); log the time"
        raise MeasurementError(msg)
    if trace.setting is None and trace.mode(slice(episode.entered, episode.stop)) != "CR":
        msg = (
            f"no load setting was logged, so that the moment at which the overload was removed is not known "
            f"({episode.where}); log the load setting"
        )
        raise MeasurementError(msg)
    interval = float(np.median(np.diff(trace.time[episode.last_over : episode.stop])))
    if interval > within:
        msg = (
            f"sampled every {interval:.3g} s after the overload, which cannot show a return within {within:g} s; "
            "sample faster"
        )
        raise MeasurementError(msg)
    time: np.ndarray[tuple[int], np.dtype[np.float64]] = trace.time
    return time, episode.removed


def _not_back(
    episode: Episode, inside: np.ndarray[tuple[int], np.dtype[np.bool_]], lasts: float, *, within: float
) -> Returned:
    """Not back when the log ends: shown not to recover only where it goes on for longer than was asked for."""
    assert episode.removed is not None
    if lasts <= within or (inside.size > 1 and inside[-2]):
        msg = (
            f"the output was outside the band when the log ended {lasts:.3g} s after the overload was removed "
            f"({episode.where}); record for longer"
        )
        raise MeasurementError(msg)
    last = episode.trace.voltage[episode.removed + inside.size - 1]
    reason = f"still at {last:.4g} V, outside the band, {lasts:.4g} s after the overload was removed"
    return Returned(Estimate(lasts, _unstated(episode.trace)), episode.removed, None, "at least", reason)
