"""The onset: the current at which an output leaves its regulated branch."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass
from typing import Literal

import numpy as np

from acceptance.errors import MeasurementError
from acceptance.overload.bursts import bursts_of
from acceptance.overload.episodes import Episode
from acceptance.overload.kinds import jump_of, levels_below
from acceptance.overload.steps import STEADY, Step, nothing_given
from acceptance.overload.way import asked_at, into
from acceptance.points.instrument import converter_step_uncertainty
from acceptance.points.point import Estimate
from acceptance.points.propagation import Source, Value, nominal, of_source

__all__ = ["Onset", "onset_of"]

_ON_THE_KNEE = 0.25  # of the droop: a level that lies so far below the branch is on the limited part already
_COLLAPSED = 0.5  # of rated voltage: in CC mode nothing lies between the branch and the collapse
_HELD_CURRENT = 0.95  # of a CC setting: less than this was not held
_FEWEST_BELOW = 3  # levels that make limiting a part of what comes later; fewer may be means of bursts
_DRIFTS = 2.0  # times what a limit moves by from the third to the fourth quarter of a step, as a bound
_SURE = 3  # samples of a setting that the output surely carried, not by the chance of a burst
_WIDE = 0.5  # of rated current: of a wider bracket only the lower end is told
_NOISY = 0.1  # of rated current: more scatter tells no onset
_REGULAR = 2.0  # steps of a ramp that differ by no more than this factor
_FEW = 4  # levels about the droop, from which on a line through them is better than two of them


@dataclass(frozen=True, slots=True)
class Onset:
    """Where limiting begins, or how far that is known."""

    current: Estimate  # [A]
    voltage: float  # where it is marked [V]
    known: Literal["value", "at least", "at most"] = "value"
    reason: str = ""  # why only a bound is known
    how: str = ""  # from what, in words
    before: int = 0  # the last sample on the branch


@dataclass(frozen=True, slots=True)
class _Found:
    """The onset in numbers, without what the instruments add."""

    current: float
    width: float  # within which it surely lies [A]
    noise: float  # standard uncertainty by scatter [A]
    slope: float  # of the current over the voltage there [A/V]
    how: str


def onset_of(episode: Episode) -> Onset:
    """The onset of one episode.

    Raises
    ------
    MeasurementError
        If it was never driven so far, or the samples do not tell where it is; with what to run instead.
    """
    way = _until_bursts(into(episode), episode)
    in_a_burst = _in_a_burst(way, episode)
    on = [_is_on(step, episode) and step not in in_a_burst for step in way]
    if not any(on):
        return _limited_from_the_start(way, episode)
    last = max(place for place, is_on in enumerate(on) if is_on)
    if not episode.left_branch:
        return _not_reached(way, episode)
    if last == len(way) - 1:
        msg = f"the output left its branch and was back on it at the largest load ({episode.where}); sweep it once more"
        raise MeasurementError(msg)
    b = way[last + 1]
    if b in in_a_burst:  # what was asked for until it gave nothing
        b = next((step for step in way[last + 1 :] if step.kind != STEADY), b)
    collapsed = b.mode in ("CC", "") and b.voltage < _COLLAPSED * episode.trace.rated_voltage
    collapsed |= b.mode == "CC" and b.current < _HELD_CURRENT * b.setting  # a mean of bursts, on and off
    collapsed |= any(step.kind != STEADY for step in way[last + 1 :]) and len(levels_below(episode)) < _FEWEST_BELOW
    if b.kind != STEADY or collapsed or jump_of(episode):
        return _at_a_collapse([*way[: last + 1], b], episode)
    if sum(step.samples for step in way[last + 1 :]) < 2:
        msg = (
            f"one sample alone lies beyond the onset ({episode.place(b.first, b.stop)}); drive it further into overload"
        )
        raise MeasurementError(msg)
    return _interpolated(way, last, episode)


def _in_a_burst(way: Sequence[Step], episode: Episode) -> list[Step]:
    """Steps so short, just before it first gave nothing, that they may lie in the first burst throughout."""
    off = nothing_given(episode.trace)[episode.entered : episode.last_over + 1]
    first = int(np.argmax(off))
    on = np.flatnonzero(np.diff(off[first:].astype(np.int8), append=1))
    lengths = np.diff(on)[::2] if off.any() else np.empty(0)
    if not lengths.size:
        return []
    longest = int(lengths.max())
    begins = episode.entered + first - longest - 1
    return [step for step in way if step.stop > begins and step.kind == STEADY and step.samples < 2 * longest]


def _until_bursts(way: Sequence[Step], episode: Episode) -> Sequence[Step]:
    """The way in up to the first setting at which the output gave nothing; later levels lie in bursts.

    Raises
    ------
    MeasurementError
        If it gave something again later, and the samples do not show bursts: what single readings caught is chance.
    """
    gone = next((n for n, step in enumerate(way) if step.kind != STEADY and step.first >= episode.entered), None)
    if gone is None:
        return way
    bursts = bursts_of(episode)
    if bursts is not None and bursts.is_shown:
        return way[: gone + 1] if any(_is_on(step, episode) for step in way[gone + 1 :]) else way
    later = [step for step in episode.steps if step.first >= way[gone].stop and step.stop <= episode.last_over + 1]
    again = [step for step in later if step.kind == STEADY]
    carried = [step for step in way[:gone] if _is_on(step, episode)]
    if any(_is_on(step, episode) for step in way[gone + 1 :]) or (again and carried and carried[-1].samples < _SURE):
        msg = (
            f"the output gave nothing at one setting and something at a later one ({episode.where}): bursts, of which "
            "single readings show some; sample ten times in a period"
        )
        raise MeasurementError(msg)
    return way


def _is_on(step: Step, episode: Episode) -> bool:
    return step.kind == STEADY and episode.droop >= _fall(step, episode)


def _fall(step: Step, episode: Episode) -> float:
    """How far a step lies below the branch. [V]"""
    return float(episode.branch.at(np.array(step.current))) - step.voltage


def _limited_from_the_start(way: Sequence[Step], episode: Episode) -> Onset:
    first = way[0] if way else None
    asked = asked_at(first, episode) if first is not None else math.nan
    if first is None or not math.isfinite(asked):
        msg = (
            f"the first sample is beyond the onset already ({episode.where}); begin the sweep at rated current or below"
        )
        raise MeasurementError(msg)
    reason = "the first sample of the sweep is beyond the onset already; begin the sweep at rated current or below"
    current = _estimate(_Found(asked, 0.0, first.u_current, 0.0, ""), episode)
    return Onset(current, first.voltage, "at most", reason, before=first.first)


def _not_reached(way: Sequence[Step], episode: Episode) -> Onset:
    """How far it was driven without leaving the branch: the current that flowed, whatever was asked for."""
    step = max((s for s in way if s.kind == STEADY), key=lambda s: s.current)
    share = 100 * step.current / episode.trace.rated_current
    reason = (
        f"driven to {step.current:.4g} A ({share:.1f} % of rated current) without a fall of "
        f"{episode.droop:.3g} V below the regulated branch; drive it further, until the output gives way"
    )
    return Onset(
        _estimate(_Found(step.current, 0.0, step.u_current, 0.0, ""), episode), step.voltage, "at least", reason
    )


# --- a collapse -----------------------------------------------------------------------------------------------------


def _at_a_collapse(way: Sequence[Step], episode: Episode) -> Onset:
    """The middle between the last current on the branch and the one that the next setting would have drawn."""
    a, b = way[-2], way[-1]
    asked = asked_at(b, episode)
    offset, noise = _offset(way[:-1], episode)
    asked += offset
    if not math.isfinite(asked):
        asked, noise = _next_of_ramp(way[:-1]), 0.0
    if not math.isfinite(asked):
        return _at_least(a, _untold(b, a, episode), episode)
    if asked < a.current - 0.02 * episode.trace.rated_current:
        msg = (
            f"the output gave way at a setting of {asked:.4g} A after it had carried {a.current:.4g} A "
            f"({episode.place(b.first, b.stop)}): by time or warmth, not by current; sweep faster, in small steps"
        )
        raise MeasurementError(msg)
    width = max(asked - a.current, 0.0)
    if width > _WIDE * episode.trace.rated_current:
        return _at_least(a, _too_wide(a.current, asked), episode)
    how = f"between {a.current:.4g} A on the branch and {asked:.4g} A asked for next"
    found = _Found(a.current + width / 2, width, math.hypot(a.u_current, noise) / 2, 0.0, how)
    return Onset(_estimate(found, episode), a.voltage, how=how, before=a.stop - 1)


def _at_least(a: Step, reason: str, episode: Episode) -> Onset:
    """No more is known than that the output carried the current of a step on its branch."""
    found = _Found(a.current, 0.0, a.u_current, 0.0, "")
    return Onset(_estimate(found, episode), a.voltage, "at least", reason, before=a.stop - 1)


def _untold(b: Step, a: Step, episode: Episode) -> str:
    told = f"the output gave way beyond {a.current:.4g} A ({episode.place(b.first, b.stop)}), and "
    if b.mode == "CV":
        return told + "a CV setting does not tell what it asks for; sweep in CC or CR mode, in small steps"
    return told + "the log does not tell what was asked for next; log the load setting"


def _too_wide(carried: float, asked: float) -> str:
    return (
        f"the output carried {carried:.4g} A on its branch, and the next setting asked for {asked:.4g} A; sweep in "
        "small steps about the onset"
    )


def _offset(way: Sequence[Step], episode: Episode) -> tuple[float, float]:
    """What the meters read beside the load's settings, at the last ones that the output carried, and its u. [A]

    The setting is the load's, the current a meter's, and in CV mode a few millivolts between the two are amperes.
    """
    beside = [step.current - asked_at(step, episode) for step in way[-4:] if step.kind == STEADY]
    known = [value for value in beside if math.isfinite(value)]
    branch, mode = episode.branch, way[-1].mode
    noise = float(np.std(known, ddof=1)) if len(known) > 1 else 0.0
    if mode == "CV" and branch.resistance > 0:  # through so small a resistance the line's own u counts
        noise = math.hypot(noise, branch.u(way[-1].current) / branch.resistance)
    return (float(np.median(known)) if known else 0.0), noise


def _next_of_ramp(way: Sequence[Step]) -> float:
    """What a regular ramp would have drawn next, generously: two of its steps on; NaN where it is none. [A]"""
    rises = np.diff([step.current for step in way[-6:]])
    if rises.size < 3 or not (rises > 0).all() or rises.max() > _REGULAR * rises.min():
        return math.nan
    return way[-1].current + 2 * float(rises.max())


# --- a limited branch -----------------------------------------------------------------------------------------------


def _interpolated(way: Sequence[Step], last: int, episode: Episode) -> Onset:
    found = _by_line(way, episode) or _by_bracket(way, last, episode)
    if found.width > _WIDE * episode.trace.rated_current:
        a, b = way[last], way[last + 1]
        reason = (
            f"the output was on its branch at {a.current:.4g} A, and at {b.voltage:.3g} V under the next setting, "
            "which does not tell the onset; sweep in smaller steps about it, and if it comes in bursts, sample faster"
        )
        return _at_least(a, reason, episode)
    voltage = float(episode.branch.at(np.array(found.current))) - episode.droop
    return Onset(_estimate(found, episode), voltage, how=found.how, before=way[last].stop - 1)


def _by_line(way: Sequence[Step], episode: Episode) -> _Found | None:
    """A line through the levels about the droop, where they lie so close that noise mixes their order."""
    falls = np.array([_fall(step, episode) for step in way])
    noise = float(np.median([step.u_voltage for step in way]))
    near = (np.abs(falls - episode.droop) <= 4 * noise) & np.array([step.kind == STEADY for step in way])
    if np.count_nonzero(near) < _FEW:
        return None
    x, y = falls[near] - episode.droop, np.array([step.current for step in way])[near]
    slope, value = np.polyfit(x, y, 1) if np.ptp(x) > noise else (0.0, float(y.mean()))
    rest = y - value - slope * x
    noise_left = float(np.sqrt(np.sum(rest**2) / max(1, x.size - 2)))
    u = noise_left * math.sqrt(1 / x.size + x.mean() ** 2 / max(float(np.sum((x - x.mean()) ** 2)), 1e-300))
    how = f"from a line through {x.size} levels about the droop"
    return _Found(float(value), 0.0, u, -float(slope), how)


def _by_bracket(way: Sequence[Step], last: int, episode: Episode) -> _Found:
    """Between the last level above the droop and the first below it.

    Where the level above lies on the regulated branch, the knee is between the two, and what the limited branch
    itself points at counts as much as the straight way from one to the other.
    """
    a, b = way[last], way[last + 1]
    fall_a, fall_b = _fall(a, episode), _fall(b, episode)
    share = (episode.droop - fall_a) / (fall_b - fall_a)
    straight = a.current + share * (b.current - a.current)
    ends = [a.current, b.current]
    value = straight
    if fall_a < _ON_THE_KNEE * episode.droop:
        pointed = _pointed_at(way, last, episode)
        ends = [straight, pointed, b.current]
        value = (straight + pointed) / 2
        ends += [2 * value - end for end in (straight, pointed)]
    noise = math.hypot((1 - share) * a.u_current, share * b.u_current)
    volts = abs(b.voltage - a.voltage)
    slope = (b.current - a.current) / (b.voltage - a.voltage) if volts > 0 else 0.0
    noise = math.hypot(noise, slope * math.hypot((1 - share) * a.u_voltage, share * b.u_voltage))
    how = f"between {a.current:.4g} A above and {b.current:.4g} A below the droop"
    return _Found(value, max(ends) - min(ends) + _drift(b, episode), noise, slope, how)


def _drift(step: Step, episode: Episode) -> float:
    """How far a limit that moves as it warms was from where it was read, when it was first met; in width. [A]

    What it moves by in the later half of its step it has moved by in the first half as well, and about twice that.
    """
    current, quarter = episode.trace.current[step.first : step.stop], step.samples // 4
    if quarter < 1:
        return 0.0
    moved = abs(float(np.median(current[2 * quarter : 3 * quarter]) - np.median(current[-quarter:])))
    noise = 4 * step.u_current if step.samples > 8 else 0.0
    return 4 * _DRIFTS * max(moved - noise, 0.0)


def _pointed_at(way: Sequence[Step], last: int, episode: Episode) -> float:
    """The current at the droop that the limited levels point at, within what the load can have drawn. [A]"""
    a, b = way[last], way[last + 1]
    at = float(episode.branch.at(np.array(b.current))) - episode.droop
    beyond = [step for step in way[last + 2 :] if step.kind == STEADY and step.voltage < b.voltage]
    pointed = b.current
    if beyond:
        c = beyond[0]
        pointed += (b.current - c.current) / (b.voltage - c.voltage) * (at - b.voltage)
    elif a.mode != "CC" and b.current > 0:
        pointed = at * b.current / b.voltage if b.voltage > 0 else b.current
    if b.mode in ("CR", "") and b.current > 0 and a.current > 0 and b.voltage > 0:
        least, most = at * a.current / a.voltage, at * b.current / b.voltage
        pointed = min(max(pointed, min(least, most)), max(least, most))
    return pointed


def _estimate(found: _Found, episode: Episode) -> Estimate:
    """The current with the errors of both meters, of the line, of the scatter and of the steps.

    An error of the voltage, or of the line it is held against, acts through the slope of the current there; what the
    meter shares between both cancels.
    """
    trace, part = episode.trace, episode.trace.part
    if found.noise > _NOISY * trace.rated_current:
        msg = (
            f"the readings about the onset scatter by {found.noise:.2g} A ({episode.where}), which does not tell it; "
            "hold each setting for longer, measure with less noise, and sweep in CC or CR mode about the onset"
        )
        raise MeasurementError(msg)
    value: Value = part.bench.correct(trace.current_key, found.current)
    value = value + part.rounding(trace.current_key, found.noise)
    if found.slope:
        line = float(episode.branch.at(np.array(found.current)))
        errors = part.bench.correct(trace.voltage_key, line) - line
        below = line - episode.droop
        errors = errors - (part.bench.correct(trace.voltage_key, below) - below)
        # the line and the levels on both sides were rounded, each by itself
        errors = errors + math.sqrt(3.0) * part.rounding(trace.voltage_key, found.noise / abs(found.slope))
        value = value + found.slope * errors
        branch = abs(found.slope) * episode.branch.u(found.current)
        value = value + of_source(branch, Source("the line of the regulated branch", "A"))
    value = value + of_source(found.noise, Source("scatter about the onset", "A"))
    value = value + of_source(converter_step_uncertainty(found.width), Source("steps of the load about the onset", "B"))
    keys = [trace.current_key, *([trace.voltage_key] if found.slope else [])]
    unstated = frozenset(key for key in keys if not part.bench.is_stated(key))
    assert math.isfinite(nominal(value))
    return Estimate(value, unstated)
