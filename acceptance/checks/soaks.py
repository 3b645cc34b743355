"""Which soaks meet a requirement's condition: load and input over the whole soak, not at one moment of it."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace
from typing import Literal

import numpy as np
from numpy.typing import NDArray

from acceptance.bench.log import channel_key
from acceptance.checks.conditions import ANY, Condition, describe, load_tolerance, matching
from acceptance.limitfile.limits import Limits
from acceptance.points.point import Points
from acceptance.printing import duration
from acceptance.thermal.soak import Soak, blocks_starts, calm, means_of, thermal_stretches
from acceptance.thermal.warming import WINDOW

__all__ = ["Found", "is_same_level", "soaks_at"]

Floats = NDArray[np.float64]
Mask = NDArray[np.bool_]

_LEAD_IN = 300.0  # while the load is being set nothing is asked of it [s]
_LEVELS = 8  # that one stretch may hold under `any`
_IDLE = 0.005  # of rated current: no load
_INPUT = 0.01
_FED, _DOWN = 0.5, 0.5  # of the rated voltages: an input that is there, an output that is not
_BRIDGED = 10  # blocks without a reading of load or input, to either side


@dataclass(frozen=True, slots=True)
class Found:
    """The soaks of a log that meet a condition."""

    soaks: tuple[Soak, ...]
    reason: str = ""  # why there is none
    notes: tuple[str, ...] = ()  # for the report to say


@dataclass(frozen=True, slots=True)
class _Asked:
    """One quantity of the condition, block by block."""

    word: str  # "the load", "the load of main", "the input"
    levels: Floats  # fraction of rated current, or share of the rated input voltage
    target: float | Literal["any"]
    tolerance: float
    highest: float  # that an `any` takes in
    lowest: float
    unit: float  # to per cent or volts
    symbol: str

    def near(self, target: float) -> Mask:
        """Blocks at a level."""
        near: Mask = np.abs(self.levels - target) <= self.tolerance * (1 + 1e-9)
        return near

    def shown(self, level: float) -> str:
        """A level in words."""
        return f"{self.word} {level * self.unit:.4g} {self.symbol}"


def soaks_at(points: Points, condition: Condition) -> Found:
    """The soaks at a condition; those that left it on the way carry a fault.

    Stretches of stage `thermal`, or, where no stage was told or there is no such stage, the steady dwells at the
    condition that last for half an hour.
    """
    stretches = thermal_stretches(points)
    if points.log.stages_from == "none told" or not stretches:
        return _dwells(points, condition)
    soaks: list[Soak] = []
    seen: list[str] = []
    for stretch in stretches:
        found, told = _runs_in(stretch, condition)
        soaks += found
        seen += [told] if told else []
    if soaks:
        return Found(tuple(soaks))
    nearest = f"; {seen[0]}: run it as asked, and record the soak again" if seen else ""
    return Found((), f"no soak at {condition or 'any condition'}{nearest}")


def is_same_level(first: Soak, second: Soak) -> bool:
    """Whether two soaks were run at one load of every output and at one input, within the tolerances of both."""
    limits = first.parts[0].limits
    widths = {
        channel_key("output_current", name): 2 * load_tolerance(1.0, limits) * rated.current
        for name, rated in limits.ratings.outputs.items()
    }
    share = limits.decision.tolerance.input
    widths["input_voltage"] = 2 * (_INPUT if share is None else share) * limits.ratings.input.voltage
    for key, width in widths.items():
        levels = [_level(soak, key) for soak in (first, second)]
        if np.isfinite(levels).any() and not abs(levels[0] - levels[1]) <= width:
            return False
    return True


def _level(soak: Soak, key: str) -> float:
    """The middle reading of a channel, or what was stated of it; NaN where it is not known."""
    if soak.has(key):
        samples = soak.samples(key)
        return float(np.nanmedian(samples)) if np.isfinite(samples).any() else np.nan
    return soak.parts[0].log.stated.get(key, np.nan)


def _dwells(points: Points, condition: Condition) -> Found:
    dwells = [point for point in matching(points, condition) if (point.starts()[1] or 0.0) >= 0.98 * WINDOW]
    soaks = []
    for point in dwells:
        time = point.samples("time")
        soaks.append(Soak((point,), time - time[0], dwell=True, condition=describe(point)))
    if soaks:
        note = "the log has no thermal stage: a steady dwell that lasts long enough serves as the soak"
        return Found(tuple(soaks), notes=(note,))
    reason = (
        f"the log has no thermal stage, and no steady dwell at {condition or 'any condition'} lasts "
        f"{duration(WINDOW)}; record the warming up as stage thermal, until it has settled"
    )
    return Found((), reason)


def _runs_in(stretch: Soak, condition: Condition) -> tuple[list[Soak], str]:
    """The soaks that one stretch holds, and what was run in it where that is none."""
    if stretch.fault:
        return [stretch], ""
    starts = blocks_starts(stretch.time)
    asked = _asked(stretch, condition, starts)
    missing = [one.word for one in asked if not np.isfinite(one.levels).any()]
    if missing:
        told = f"{' and '.join(missing)} {'were' if len(missing) > 1 else 'was'} not logged in the soak"
        fault = f"{told} ({stretch.where}); record {'them' if len(missing) > 1 else 'it'} beside the probes"
        return [replace(stretch, fault=fault)], ""
    if not asked:
        return [replace(stretch, condition=_described(asked))], ""
    found: list[Soak] = []
    for targets in _targets(asked, starts, stretch.time):
        inside = np.all([one.near(target) for one, target in zip(asked, targets, strict=True)], axis=0)
        found += _soaks(stretch, asked, inside, starts)
    told = ", ".join(one.shown(float(np.nanmedian(one.levels))) for one in asked)
    # between two levels lies the block in which the load was set
    found = [soak for soak in found if soak.fault or soak.lasts >= _LEAD_IN] or found
    return found, f"{stretch.where} was run at {told}"


def _asked(stretch: Soak, condition: Condition, starts: NDArray[np.intp]) -> list[_Asked]:
    limits = stretch.parts[0].limits
    found = []
    for output, load in condition.loads.items():
        if load is not None:
            levels = _levels(stretch, channel_key("output_current", output), starts)
            levels = levels / limits.ratings.outputs[output].current
            word = "load" if len(limits.outputs) == 1 else f"load {output}"
            tolerance = _IDLE if load == 0 else load_tolerance(1.0 if load == ANY else float(load), limits)
            found.append(_Asked(word, levels, load, tolerance, 1 + tolerance, -tolerance, 100.0, "%"))
    if condition.input is not None:
        found.append(_input(stretch, condition, starts, limits))
    return found


def _input(stretch: Soak, condition: Condition, starts: NDArray[np.intp], limits: Limits) -> _Asked:
    rated = limits.ratings.input.voltage
    share = limits.decision.tolerance.input
    tolerance = _INPUT if share is None else share
    low, high = limits.ratings.input.range or (0.0, np.inf)
    target: float | Literal["any"] = ANY if isinstance(condition.input, str) else float(condition.input or 0.0) / rated
    width = tolerance * (1.0 if isinstance(target, str) else target)
    levels = _levels(stretch, "input_voltage", starts) / rated
    bounds = high / rated * (1 + tolerance), low / rated * (1 - tolerance)
    return _Asked("input", levels, target, width, *bounds, rated, "V")


def _levels(stretch: Soak, key: str, starts: NDArray[np.intp]) -> Floats:
    if stretch.has(key):
        return _bridged(calm(means_of(stretch.samples(key), starts)))
    stated = stretch.parts[0].log.stated.get(key, np.nan)
    return np.full(starts.size, stated)


def _bridged(levels: Floats) -> Floats:
    """The levels, short holes filled from their ends: a meter that is read more rarely than the probes."""
    known = np.flatnonzero(np.isfinite(levels))
    if not known.size or known.size == levels.size:
        return levels
    places = np.arange(levels.size)
    filled = np.interp(places, known, levels[known])
    after = np.minimum(np.searchsorted(known, places), known.size - 1)
    before = np.maximum(after - 1, 0)
    far = np.minimum(np.abs(known[after] - places), np.abs(places - known[before])) > _BRIDGED
    filled[far] = np.nan
    return filled


def _targets(asked: Sequence[_Asked], starts: NDArray[np.intp], time: Floats) -> list[tuple[float, ...]]:
    """Every level that the condition takes in; one where nothing is left open."""
    fixed = tuple(np.nan if isinstance(one.target, str) else one.target for one in asked)
    if not any(isinstance(one.target, str) for one in asked):
        return [fixed]
    left = np.ones(starts.size, dtype=bool)
    for one, target in zip(asked, fixed, strict=True):
        inside = (one.levels >= one.lowest) & (one.levels <= one.highest)
        left &= inside if isinstance(one.target, str) else one.near(target)
    found: list[tuple[float, ...]] = []
    while left.any() and len(found) < _LEVELS:
        last = np.flatnonzero(left)
        last = last[time[starts[last]] >= time[starts[last[-1]]] - WINDOW / 3]
        targets = tuple(
            float(np.median(one.levels[last])) if isinstance(one.target, str) else target
            for one, target in zip(asked, fixed, strict=True)
        )
        near = np.all([one.near(target) for one, target in zip(asked, targets, strict=True)], axis=0)
        found.append(targets)
        left = left & ~near if (left & near).any() else left & (np.arange(left.size) < last[0])
    return found


def _soaks(stretch: Soak, asked: Sequence[_Asked], inside: Mask, starts: NDArray[np.intp]) -> list[Soak]:
    """The runs at one level as soaks; runs with less than half an hour between them as one that was left."""
    runs = _runs(inside)
    time = stretch.time
    ends = np.append(starts, time.size)
    moments = np.append(time[starts], time[-1])
    # what is not at the level at the very start is the load being set
    if runs and 0 < moments[runs[0][0]] - time[0] <= _LEAD_IN:
        runs[0] = (0, runs[0][1])
    groups: list[list[tuple[int, int]]] = []
    for run in runs:
        if groups and moments[run[0]] - moments[groups[-1][-1][1]] < WINDOW:
            groups[-1].append(run)
        else:
            groups.append([run])
    found = []
    for group in groups:
        longest = max(moments[b] - moments[a] for a, b in group)
        if longest < _LEAD_IN and len(runs) > 1:
            continue
        first, stop = int(starts[group[0][0]]), int(ends[group[-1][1]])
        soak = replace(stretch.cut(first, stop), condition=_described(asked, slice(group[-1][0], group[-1][1])))
        fault = _left(stretch, asked, group, starts) if len(group) > 1 else ""
        found.append(replace(soak, fault=fault, ended=_went_off(stretch, stop)))
    return found


def _went_off(stretch: Soak, stop: int) -> str:
    """Why the unit seems to have gone off by itself at the end of a soak: no output, with its input still there."""
    after = slice(stop, int(np.searchsorted(stretch.time, stretch.time[min(stop, stretch.time.size - 1)] + _LEAD_IN)))
    ratings = stretch.parts[0].limits.ratings
    outputs = {channel_key("output_voltage", name): rated.voltage for name, rated in ratings.outputs.items()}
    there = stretch.has("input_voltage") and all(stretch.has(key) for key in outputs)
    if not there or after.stop - after.start < 1:
        return ""
    levels = {key: stretch.samples(key)[after] for key in ("input_voltage", *outputs)}
    if not all(np.isfinite(samples).any() for samples in levels.values()):
        return ""
    is_fed = float(np.nanmedian(levels["input_voltage"])) > _FED * ratings.input.voltage
    down = [key for key, rated in outputs.items() if abs(float(np.nanmedian(levels[key]))) < _DOWN * abs(rated)]
    if not is_fed or len(down) < len(outputs):
        return ""
    return (
        f"the output went down at {stretch.place(stop)} with the input still there, as when the unit protects itself "
        "from heat; see why, and record the soak again (if it was switched off by hand, leave out the rows from there)"
    )


def _left(stretch: Soak, asked: Sequence[_Asked], group: Sequence[tuple[int, int]], starts: NDArray[np.intp]) -> str:
    """What happened between the runs of one soak."""
    first, stop = group[0][1], group[1][0]
    moments = stretch.time[starts]
    told = ", ".join(one.shown(float(np.nanmean(one.levels[first:stop]))) for one in asked if _known(one, first, stop))
    lasts = duration(float(moments[stop] - moments[first]))
    more = f", and {len(group) - 2} more times" if len(group) > 2 else ""
    return (
        f"the condition was left within the soak: {told or 'no reading of it'} for {lasts} at "
        f"{stretch.place(int(starts[first]))}{more}; hold load and input until it has settled, and record it again"
    )


def _known(one: _Asked, first: int, stop: int) -> bool:
    return bool(np.isfinite(one.levels[first:stop]).any())


def _runs(mask: Mask) -> list[tuple[int, int]]:
    edges = np.flatnonzero(np.diff(np.concatenate(([False], mask, [False])).astype(np.int8)))
    return [(int(a), int(b)) for a, b in zip(edges[::2], edges[1::2], strict=True)]


def _described(asked: Sequence[_Asked], where: slice = slice(None)) -> str:
    return ", ".join(one.shown(float(np.nanmean(one.levels[where]))) for one in asked)
