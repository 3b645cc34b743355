"""Steps: one setting of the load after the other, and what the output settled at under each."""

from __future__ import annotations

import math
from dataclasses import dataclass
from itertools import pairwise

import numpy as np
from numpy.typing import NDArray

from acceptance.overload.trace import NO_CURRENT, OFF, Trace, scatter

__all__ = ["GONE", "HELD", "STEADY", "Step", "nothing_given", "steps_of"]

Floats = NDArray[np.float64]
Mask = NDArray[np.bool_]

STEADY = "steady"  # it settled at one voltage and current
HELD = "off"  # it gave nothing throughout
GONE = "broken off"  # it gave something and nothing by turns, or until it gave up

_SAME_SETTING = {"CV": 1e-5, "": 1e-5}  # relative; of other modes:
_SETTING_NOISE = 1e-3
_LEVEL = 0.004  # of a rating: less is no new level, where no setting tells the steps
_OFF_SHARE = 0.1  # of a step's samples


@dataclass(frozen=True, slots=True)
class Step:
    """Samples [first, stop) of a trace under one setting of the load."""

    first: int
    stop: int
    setting: float  # NaN where none was logged
    mode: str
    kind: str  # STEADY, HELD or GONE
    voltage: float  # it settled at [V]
    current: float  # [A]
    u_voltage: float  # standard uncertainty from the scatter alone [V]
    u_current: float  # [A]

    @property
    def samples(self) -> int:
        """How many."""
        return self.stop - self.first


def steps_of(trace: Trace) -> tuple[Step, ...]:
    """The steps of a trace, in its order; of a log without settings its levels, of a ramp its samples."""
    off = nothing_given(trace)
    noise = scatter(trace.voltage), scatter(trace.current)
    edges = _edges_by_setting(trace) if trace.setting is not None else _edges_by_level(trace, noise)
    return tuple(_step(trace, (a, b), off[a:b], noise) for a, b in pairwise([0, *edges, trace.size]))


def nothing_given(trace: Trace) -> Mask:
    """Whether each sample shows an output that gives nothing: neither voltage nor current."""
    off: Mask = (trace.voltage < OFF * trace.rated_voltage) & (trace.current < NO_CURRENT * trace.rated_current)
    return off


def _edges_by_setting(trace: Trace) -> list[int]:
    assert trace.setting is not None
    before, after = trace.setting[:-1], trace.setting[1:]
    share = np.array([_SAME_SETTING.get(mode, _SETTING_NOISE) for mode in trace.modes[1:].tolist()])
    same = (np.abs(after - before) <= share * np.maximum(np.abs(after), np.abs(before))) | np.isnan(after)
    same &= trace.modes[1:] == trace.modes[:-1]
    return (np.flatnonzero(~same) + 1).tolist()


def _edges_by_level(trace: Trace, noise: tuple[float, float]) -> list[int]:
    """Borders between levels of voltage and current; a ramp is cut into pieces of a level's width."""
    widths = (
        max(6 * noise[0], _LEVEL * trace.rated_voltage),
        max(6 * noise[1], _LEVEL * trace.rated_current),
    )
    readings = (trace.voltage, trace.current)
    jumps = np.any([np.abs(np.diff(x)) > width for x, width in zip(readings, widths, strict=True)], axis=0)
    edges: list[int] = []
    for a, b in pairwise([0, *(np.flatnonzero(jumps) + 1).tolist(), trace.size]):
        pieces = [np.floor((x[a:b] - x[a]) / width + 0.5) for x, width in zip(readings, widths, strict=True)]
        moved = np.any([np.diff(piece) != 0 for piece in pieces], axis=0)
        edges += [a] * (a > 0) + (np.flatnonzero(moved) + a + 1).tolist()
    return edges


def _step(trace: Trace, span: tuple[int, int], off: Mask, noise: tuple[float, float]) -> Step:
    first, stop = span
    settled = _settled(trace, first, stop)
    voltage, current = float(np.median(trace.voltage[settled])), float(np.median(trace.current[settled]))
    count = stop - settled.start
    # of a median, pi/2 times that of a mean
    wide = math.sqrt(math.pi / 2 / count) if count > 2 else 1.0 / math.sqrt(count)
    return Step(
        first=first,
        stop=stop,
        setting=_setting(trace, first, stop),
        mode=trace.mode(slice(first, stop)),
        kind=_kind(off, settled.start - first),
        voltage=voltage,
        current=current,
        u_voltage=wide * _scatter(trace.voltage[settled], noise[0]),
        u_current=wide * _scatter(trace.current[settled], noise[1]),
    )


def _settled(trace: Trace, first: int, stop: int) -> slice:
    """The samples of a step that its value is formed from: the later half, or what little there is."""
    return slice(stop - max(1, math.ceil((stop - first) / 2)), stop)


def _setting(trace: Trace, first: int, stop: int) -> float:
    known = np.empty(0) if trace.setting is None else trace.setting[first:stop]
    known = known[np.isfinite(known)]
    return float(np.median(known)) if known.size else math.nan


def _scatter(values: Floats, elsewhere: float) -> float:
    return scatter(values) if values.size >= 8 else max(scatter(values), elsewhere)


def _kind(off: Mask, settling: int) -> str:
    """What a step shows; a first sample like the step before it is the way there."""
    share = float(np.mean(off))
    if share <= _OFF_SHARE and not off[settling:].any():
        return STEADY
    return HELD if off[min(1, off.size - 1) :].all() else GONE
