"""Steps: one setting of the load after the other, and what the output settled at under each."""

from __future__ import annotations

import math
from dataclasses import dataclass
from itertools import pairwise

import numpy as np
from numpy.typing import NDArray

from acceptance.overload.trace import NO_CURRENT, OFF, RATED, Trace, scatter

__all__ = ["GONE", "HELD", "STEADY", "Step", "is_by_hand", "noise_of", "nothing_given", "steps_of"]

Floats = NDArray[np.float64]
Mask = NDArray[np.bool_]

STEADY = "steady"  # it settled at one voltage and current
HELD = "off"  # it gave nothing throughout
GONE = "broken off"  # it gave something and nothing by turns, or until it gave up

_SAME_SETTING = {"CV": 1e-5, "": 1e-5}  # relative; of other modes:
_SETTING_NOISE = 1e-3
_LEVEL = 0.004  # of a rating: less is no new level, where no setting tells the steps
_OFF_SHARE = 0.1  # of a step's samples
_BY_HAND = 200  # rows; in so short a table with a row or two a setting, neighbours differ by the settings
_TELLING = 0.05  # of rated current: rows that differ by less tell no line
_ANY = 10.0  # times rated current: what a setting asks for beyond it is no expectation
_FEWEST_TRIPLES = 5  # neighbours in turn under one setting, which tell the scatter
_FEWEST_ROWS = 4  # up to rated load, which tell the scatter about the regulated branch


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
    noise = noise_of(trace)
    edges = _edges_by_setting(trace) if trace.setting is not None else _edges_by_level(trace, noise)
    return tuple(_step(trace, (a, b), off[a:b], noise) for a, b in pairwise([0, *edges, trace.size]))


def noise_of(trace: Trace) -> tuple[float, float]:
    """Scatter of one reading of the voltage and of the current, with what the settings change left out. [V, A]"""
    if not is_by_hand(trace):
        triples = _within_settings(trace)
        return _scatter_of(trace.voltage, triples), _scatter_of(trace.current, triples)
    lightly = (trace.current <= RATED * trace.rated_current) & (trace.voltage > 0.8 * trace.rated_voltage)
    lightly &= ~trace.overloaded()  # a folded output may lie there too
    if np.count_nonzero(lightly) < _FEWEST_ROWS:
        return 0.0, 0.0
    volts = _rest_of_line(trace.current[lightly], trace.voltage[lightly], least=_TELLING * trace.rated_current)
    expected = _by_settings(trace)
    lightly &= np.isfinite(expected)
    if np.count_nonzero(lightly) < _FEWEST_ROWS:  # the current's meter is taken to be as good as the voltage's
        return volts, volts / trace.rated_voltage * trace.rated_current
    return volts, _rest_of_line(expected[lightly], trace.current[lightly], least=_TELLING * trace.rated_current)


def _by_settings(trace: Trace) -> Floats:
    """The current that the load's settings make of the voltage that was read; NaN where none tells it. [A]"""
    expected = np.full(trace.size, np.nan)
    if trace.setting is None:
        return expected
    with np.errstate(divide="ignore", invalid="ignore"):
        by_mode = {
            "CC": trace.setting,
            "CR": trace.voltage / (trace.setting + trace.lead),
            "CP": trace.setting / trace.voltage,
        }
    for mode, values in by_mode.items():
        here = (trace.modes == mode) & (np.abs(values) < _ANY * trace.rated_current)
        expected[here] = values[here]
    return expected


def _within_settings(trace: Trace) -> Mask | None:
    """Which triples of neighbours tell the scatter: those of one setting, up to rated load where there are enough.

    None where no setting tells the steps, or none is long enough.
    """
    if trace.size < 3 or trace.setting is None:
        return None
    same = np.ones(trace.size, bool)
    same[_edges_by_setting(trace)] = False  # the first of each setting
    inside: Mask = same[1:-1] & same[2:]
    calm: Mask = inside & ~trace.overloaded()[2:]
    return next((mask for mask in (calm, inside) if np.count_nonzero(mask) >= _FEWEST_TRIPLES), None)


def _scatter_of(values: Floats, triples: Mask | None) -> float:
    if triples is None:
        return scatter(values)
    second = np.abs(values[:-2] - 2 * values[1:-1] + values[2:])
    return 1.4826 * float(np.median(second[triples])) / math.sqrt(6.0)


def is_by_hand(trace: Trace) -> bool:
    """Whether a row is a setting of its own, as where a person writes it down."""
    if trace.size > _BY_HAND:
        return False
    if trace.setting is None:
        return trace.time is None or float(np.median(np.diff(trace.time, append=np.inf))) >= 1.0
    return trace.size < 3 * (len(_edges_by_setting(trace)) + 1)


def _rest_of_line(x: Floats, y: Floats, *, least: float) -> float:
    """Standard deviation of y about a straight line over x, or about its mean where x spans less than `least`."""
    if np.ptp(x) < least:
        return float(np.std(y, ddof=1))
    rest = y - np.polyval(np.polyfit(x, y, 1), x)
    return math.sqrt(float(np.sum(rest**2)) / (x.size - 2))


def nothing_given(trace: Trace) -> Mask:
    """Whether each sample shows an output that gives nothing: neither voltage nor current."""
    off: Mask = (trace.voltage < OFF * trace.rated_voltage) & (trace.current < NO_CURRENT * trace.rated_current)
    return off


def _edges_by_setting(trace: Trace) -> list[int]:
    assert trace.setting is not None
    before, after = trace.setting[:-1], trace.setting[1:]
    share = np.full(after.size, _SETTING_NOISE)
    for mode, least in _SAME_SETTING.items():
        share[trace.modes[1:] == mode] = least
    same = (np.abs(after - before) <= share * np.maximum(np.abs(after), np.abs(before))) | np.isnan(after)
    same &= trace.modes[1:] == trace.modes[:-1]
    off = trace.load_off()
    same &= off[1:] == off[:-1]
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
    voltage, current = _middle(trace.voltage[settled], noise[0]), _middle(trace.current[settled], noise[1])
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


def _middle(values: Floats, noise: float) -> float:
    """The mean of what lies about the median: slips do not move it, and coarse digits are averaged out by noise."""
    median = float(np.median(values))
    near = values[np.abs(values - median) <= 4 * noise]
    return float(near.mean()) if near.size else median


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
