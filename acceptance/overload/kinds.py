"""Kinds of limiting, told from the settled levels below the branch: constant current, constant power, foldback."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from acceptance.overload.episodes import Episode
from acceptance.overload.steps import STEADY, Step, nothing_given
from acceptance.overload.way import into

__all__ = ["Kind", "goes_on_to", "jump_of", "kind_of", "levels_below", "limited_levels"]

Floats = NDArray[np.float64]

HIGHEST, LOWEST = 0.9, 0.1  # of rated voltage: between them the limited branch is looked at
_FEWEST = 5  # levels between them
_BAND = 0.05  # to either side, of the current or of the power
_GAP = 0.35  # of rated voltage, without a level: what the output does there is not known
_JUMP = 0.1  # of the last current on the branch: what no limiter jumps by
_UNSEEN = 0.1  # of rated voltage, between the lowest level and the first one below 10 %: what lies there is guessed
_LOST = 0.4  # of the current expected beyond an unseen gap: what a mean of bursts surely lacks
_SLIGHT = 0.03  # of the last current on the branch: less is lost by no burst
_STEEPER = 2.0  # times the typical slope of a branch: more is a break
_SWINGS = 3  # samples at the least
_UNSETTLED = 0.1  # of the last current on the branch: what a settled level does not move by
_POINTING = 3  # lowest levels, which point at the current into a short
_TELLS = 0.03  # of rated voltage: levels so far apart point at where the branch should have ended
_WIDE = 1.3  # ratio of voltages over which a constant power is told from anything else
_SURE = 2.0  # standard errors


@dataclass(frozen=True, slots=True)
class Kind:
    """What the limited branch is, or why that is not told."""

    name: str = ""  # "constant current", "constant power", "foldback", "mixed"; "" where it is not told
    told: str = ""  # what was seen, in words
    doubt: str = ""


@dataclass(frozen=True, slots=True)
class _Levels:
    """Voltage as a share of the rated one, current as a share of the last on the branch; by falling voltage."""

    v: Floats
    i: Floats
    u: Floats  # of i, by scatter
    u_v: Floats  # of v, by scatter
    last: float  # the last current on the branch [A]
    rated_voltage: float

    def at(self, place: int) -> str:
        return f"{self.i[place] * self.last:.4g} A at {self.v[place] * self.rated_voltage:.3g} V"


def limited_levels(episode: Episode) -> list[Step]:
    """The settled steps of the way in that lie between 90 % and 10 % of rated voltage, until it first gives nothing."""
    rated = episode.trace.rated_voltage
    return [step for step in levels_below(episode) if LOWEST * rated <= step.voltage <= HIGHEST * rated]


def levels_below(episode: Episode) -> list[Step]:
    """The settled steps of the way in below the branch, until it first gives nothing."""
    off = np.flatnonzero(nothing_given(episode.trace)[episode.entered : episode.end])
    until = episode.entered + int(off[0]) if off.size else episode.end
    return [step for step in into(episode) if step.kind == STEADY and step.stop <= until and _is_below(step, episode)]


def kind_of(episode: Episode) -> Kind:
    """The kind of limiting, by the settled levels alone: bursts and giving up are looked at elsewhere."""
    levels = _levels(episode, limited_levels(episode))
    doubt = _too_few(episode, levels) or _by_the_load(episode) or _unsettled(episode, levels)
    doubt = doubt or _a_jump(episode, levels) or _a_break(levels) or _a_break(_with_next(episode, levels), 1.0)
    if doubt:
        return Kind(doubt=doubt)
    power = _powers(levels)
    current_is, power_is = _is_constant(_with_edge(episode, levels)), _is_constant(power)
    wide = levels.v.max() / levels.v.min() >= _WIDE
    if power_is and wide and current_is is False:
        return Kind("constant power", f"{levels.at(0)}, {levels.at(-1)}")
    gap = _gap(levels)
    if gap:
        return Kind(doubt=gap)
    if current_is:
        return Kind("constant current", f"{levels.at(0)}, {levels.at(-1)}")
    if current_is is None or power_is is None:
        what = "current" if current_is is None else "power"
        doubt = f"whether the {what} keeps within ± 5 % is not told by so much scatter"
        return Kind(doubt=f"{doubt}; measure with less noise, or hold each setting for longer")
    return _folded(levels)


def _levels(episode: Episode, steps: Sequence[Step]) -> _Levels:
    ordered = sorted(steps, key=lambda step: -step.voltage)
    rated = episode.trace.rated_voltage
    before = [s.current for s in into(episode) if s.kind == STEADY and not _is_below(s, episode)]
    last = before[-1] if before else episode.trace.rated_current
    rows = [(s.voltage / rated, s.current / last, s.u_current / last, s.u_voltage / rated) for s in ordered]
    v, i, u, u_v = np.array(rows).reshape(-1, 4).T
    return _Levels(v, i, u, u_v, last, rated)


def _powers(levels: _Levels) -> _Levels:
    """The same with the power in place of the current."""
    u = np.hypot(levels.u * levels.v, levels.u_v * levels.i)
    return replace(levels, i=levels.i * levels.v, u=u)


def _is_below(step: Step, episode: Episode) -> bool:
    return float(episode.branch.at(np.array(step.current))) - step.voltage > episode.droop


def _too_few(episode: Episode, levels: _Levels) -> str:
    if levels.v.size >= _FEWEST:
        return ""
    mode = episode.trace.mode(slice(episode.entered, episode.end))
    if mode == "CC":
        return (
            "the load was in CC mode, in which the output collapses at its limit whatever the limiter; sweep with the "
            "load in CR or CV mode"
        )
    return (
        f"{levels.v.size or 'no'} settled {'level' if levels.v.size == 1 else 'levels'} between 90 % and 10 % of rated "
        "voltage, and five show what the limiter does; sweep on in CR or CV mode, in small steps, into a short"
    )


def _by_the_load(episode: Episode) -> str:
    """Why the load's mode keeps the kind from being told."""
    modes = {step.mode for step in limited_levels(episode)}
    if "CC" in modes or "mixed" in modes:
        return "the load was in CC mode, which shows no kind of limiter; sweep with the load in CR or CV mode"
    if "CP" in modes:
        return "the load was in CP mode, which shows no kind of limiter; sweep with the load in CR or CV mode"
    if "" in modes and not _held(episode):
        return (
            "the load's mode is not known, and in CC mode a collapse looks like a limiter; state it under "
            "log: load_mode:, or log it"
        )
    return ""


def _held(episode: Episode) -> bool:
    """Whether the levels were held, so that a collapse on the way down is none of them."""
    time, levels = episode.trace.time, limited_levels(episode)
    if time is None:
        return all(step.samples == 1 for step in levels)
    begins = np.sort(time[[step.first for step in levels]])
    return all(step.samples >= 3 for step in levels) or float(np.median(np.diff(begins))) >= 1.0


def jump_of(episode: Episode) -> str:
    """Why what was read below the branch is hardly what flowed: it does not go on where the branch ends."""
    below = [step for step in levels_below(episode) if step.mode != "CC"]
    levels = _levels(episode, below)
    return _a_jump(episode, levels) if levels.v.size and np.ptp(levels.v) > _TELLS else ""


def _unsettled(episode: Episode, levels: _Levels) -> str:
    """Where the current swings within one setting, by more than noise does: bursts, half averaged out."""
    for step in limited_levels(episode):
        current = episode.trace.current[step.first + step.samples // 2 : step.stop]
        noise = 6 * float(np.median(levels.u)) * levels.last * math.sqrt(step.samples)
        if current.size >= _SWINGS and np.ptp(current) > _UNSETTLED * levels.last + noise:
            return (
                f"the current swings between {current.min():.4g} A and {current.max():.4g} A at one setting "
                f"({episode.place(step.first, step.stop)}): bursts, half averaged out; sample ten times in a period"
            )
    return ""


def goes_on_to(episode: Episode, voltage: float) -> float | None:
    """The current that the limited branch points at for a voltage below it; None where no levels show one. [A]"""
    low = LOWEST * episode.trace.rated_voltage
    levels = _levels(episode, [step for step in levels_below(episode) if step.voltage >= low])
    if levels.v.size < _POINTING or _by_the_load(episode):
        return None
    if _unsettled(episode, levels) or _a_jump(episode, levels) or _a_break(levels) or _gap(levels):
        return None
    v, i = levels.v[-_POINTING:], levels.i[-_POINTING:]
    slope, offset = np.polyfit(v, i, 1) if np.ptp(v) > 0 else (0.0, float(i[-1]))
    return float(offset + slope * voltage / levels.rated_voltage) * levels.last


def _a_jump(episode: Episode, levels: _Levels) -> str:
    """Why a branch that does not go on where the regulated one ends is no limiter's."""
    at = levels.v >= np.sort(levels.v)[max(0, levels.v.size - 4)]
    slope, offset = np.polyfit(levels.v[at], levels.i[at], 1) if np.ptp(levels.v[at]) > 0 else (0.0, levels.i[0])
    reached = max(float(offset + slope), float(levels.i[0]))
    if reached >= 1 - _JUMP:
        return ""
    return (
        f"the current jumps from {levels.last:.4g} A on the regulated branch to {levels.i[0] * levels.last:.4g} A "
        "below it, which no limiter does; a slow or averaging meter makes that of bursts: sample ten times in a period"
    )


def _with_next(episode: Episode, levels: _Levels) -> _Levels:
    """The levels, and the first one below 10 % of rated voltage where nothing was measured for a while before it."""
    lower = [s for s in levels_below(episode) if s.voltage < LOWEST * episode.trace.rated_voltage]
    if not lower or levels.v[-1] - LOWEST <= _UNSEEN:
        return levels
    return _levels(episode, [*limited_levels(episode), max(lower, key=lambda step: step.voltage)])


def _with_edge(episode: Episode, levels: _Levels) -> _Levels:
    """The levels, and the current at 90 % of rated voltage between the highest of them and the next above."""
    every = _levels(episode, levels_below(episode))
    above = np.flatnonzero(every.v > HIGHEST)
    if not above.size:
        return levels
    place = int(above[-1])
    share = (HIGHEST - levels.v[0]) / (every.v[place] - levels.v[0])
    current = levels.i[0] + share * (every.i[place] - levels.i[0])
    u = math.hypot(levels.u[0], every.u[place])
    edge = (HIGHEST, current, u, levels.u_v[0])
    v, i, u_i, u_v = (
        np.append(at, below) for at, below in zip(edge, (levels.v, levels.i, levels.u, levels.u_v), strict=True)
    )
    return replace(levels, v=v, i=i, u=u_i, u_v=u_v)


def _a_break(levels: _Levels, steeper: float = _STEEPER) -> str:
    """Why a current that falls all at once, amid a branch that falls slowly, is no limiter's."""
    dv, di = -np.diff(levels.v), -np.diff(levels.i)
    typical = max(float(np.median(di / np.maximum(dv, 1e-6))), 0.0)
    expected = np.maximum(levels.i[:-1] - typical * dv, 0.0)
    least = np.clip(_LOST * expected, _SLIGHT, _JUMP) if steeper <= 1 else _JUMP
    noise = np.hypot(levels.u[:-1], levels.u[1:])
    broken = np.flatnonzero(di > least + 3 * noise + steeper * typical * dv)
    if not broken.size:
        return ""
    place = int(broken[0])
    return (
        f"the current breaks off from {levels.at(place)} to {levels.at(place + 1)}: an output that snaps into a lower "
        "state, or bursts behind a slow or averaging meter; sweep in smaller steps there, and sample ten times in a "
        "period of the bursts"
    )


def _gap(levels: _Levels) -> str:
    """Where no level lies, between 90 % and 10 % of rated voltage."""
    places = np.concatenate(([HIGHEST], levels.v, [LOWEST]))
    gaps = -np.diff(places)
    widest = int(np.argmax(gaps))
    if gaps[widest] <= _GAP:
        return ""
    high, low = 100 * places[widest], 100 * places[widest + 1]
    return (
        f"nothing was measured between {high:.0f} % and {low:.0f} % of rated voltage, so that it is open what the "
        "limiter does there; sweep on in CR or CV mode, in smaller steps"
    )


def _is_constant(levels: _Levels) -> bool | None:
    """Whether all keep within ± 5 % of their middle; None where the scatter leaves it open."""
    high, low = int(np.argmax(levels.i)), int(np.argmin(levels.i))
    middle = (levels.i[high] + levels.i[low]) / 2
    half = (levels.i[high] - levels.i[low]) / 2 / middle if middle > 0 else math.inf
    u = math.hypot(levels.u[high], levels.u[low]) / 2 / max(middle, 1e-12)
    # scatter alone sets the extremes of n readings about sqrt(2 ln n) of its deviations from their middle
    noise = float(np.median(levels.u)) / max(middle, 1e-12) * math.sqrt(2 * math.log(levels.i.size))
    if half <= _BAND - _SURE * u:
        return True
    return False if half > _BAND + noise + _SURE * u else None


def _folded(levels: _Levels) -> Kind:
    """Foldback, where the current falls with the voltage throughout; else mixed, where that is sure."""
    slope, error = _logarithmic_slope(levels)
    half = max(2, levels.v.size // 2)
    changes = [_change(levels, slice(0, half + 1)), _change(levels, slice(half - 1, None))]
    told = f"{levels.at(0)}, {levels.at(-1)}"
    if slope - _SURE * error > 0 and all(change < -0.02 for change, _ in changes) and _falls(levels):
        ratio = levels.i[-1]
        return Kind("foldback", f"{told}; {ratio:.2f} of the {levels.last:.4g} A before it")
    sure = all(abs(change + 0.02) > _SURE * u for change, u in changes)
    if not sure:
        return Kind(doubt="whether the current falls with the voltage is not told by so much scatter")
    return Kind("mixed", f"the current is neither constant nor falls throughout, and the power is not constant: {told}")


def _change(levels: _Levels, part: slice) -> tuple[float, float]:
    """How much the current changes while the voltage falls over a part, and its u; as a share of the first."""
    i, u = levels.i[part], levels.u[part]
    return float(i[-1] / i[0] - 1), float(math.hypot(u[0], u[-1]) / i[0])


def _falls(levels: _Levels) -> bool:
    rises = np.diff(levels.i)
    noise = np.hypot(levels.u[:-1], levels.u[1:])
    return bool((rises <= 3 * noise + 0.005).all())


def _logarithmic_slope(levels: _Levels) -> tuple[float, float]:
    """Slope of ln I over ln V, and its standard error."""
    x, y = np.log(levels.v), np.log(np.maximum(levels.i, 1e-9))
    x = x - x.mean()
    slope = float(np.sum(x * y) / np.sum(x * x))
    rest = y - y.mean() - slope * x
    scatter = math.sqrt(float(np.sum(rest**2)) / max(1, x.size - 2))
    return slope, scatter / math.sqrt(float(np.sum(x * x)))
