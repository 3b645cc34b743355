"""What betrays a probe: it falls off, breaks, stands still while the others move, or was never attached.

A rise is only as true as the contact of its probe. Each fault is one that the readings alone give away, under a load
that is known to have been held.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from acceptance.bench.log import BenchLog
from acceptance.errors import MeasurementError
from acceptance.printing import duration
from acceptance.thermal.exponentials import fit_curve
from acceptance.thermal.soak import Soak, blocks_starts, means_of

__all__ = ["Readings", "probe_readings", "see_to_contact", "step_of"]

Floats = NDArray[np.float64]

_COLDEST, _HOTTEST = -80.0, 900.0  # common practice, no source: beyond is the end of a thermometer's range [°C]
_HOLE = 300.0  # without a reading, while the log went on [s]
_SPIKE = 10.0  # a single reading so far from both its neighbours is none [K]
_SPIKES = 0.01  # of the readings; more is a fault
_SOON = 95.0  # what a probe loses so soon under load, it lost by its contact [s]
_FALL = 0.35  # of the rise
_LEAST_FALL = 2.0  # [K]
_JUMP = 0.5  # of the rise, upwards
_LEAST_JUMP = 10.0  # [K]
_STILL = 600.0  # [s]
_STILL_READINGS = 10
_OTHERS_MOVE = 5.0  # [K]
_STEPS = 3.0  # of its display, that a probe ought to have moved by
_MOVING = 6.0  # steps of its display: so far it had moved before it stood still
_SEEN = 4.0  # steps: a move that would have been seen
_NO_RISE = 1.0  # [K]
_ROOM_LEAPS = 5.0  # that no room does so soon [K]


@dataclass(frozen=True, slots=True)
class Readings:
    """A probe's samples as they may be used, and how many single ones were set aside."""

    values: Floats
    set_aside: int


def step_of(log: BenchLog, key: str, values: Floats) -> float:
    """The step of a channel's digits as logged, or the smallest one between its readings. [its unit]"""
    told = max((channel.step for channel in log.channels if channel.key == key), default=0.0)
    some = values[:: max(1, values.size // 20_000)]
    levels = np.unique(some[np.isfinite(some)])
    if levels.size < 2:
        return told
    steps = np.diff(levels)
    steps = steps[steps > 1e-9 * max(1.0, float(np.abs(levels).max()))]
    seen = _common(steps, told) if steps.size else 0.0
    # digits that never change, such as the zeros of 23.000, tell of no finer step
    return max(told, seen) if levels.size > 2 or seen > told else told


def _common(steps: Floats, told: float) -> float:
    """The largest step that all differences are multiples of; the smallest of them where no digits tell."""
    if not told > 0:
        return float(steps.min())
    counts = np.round(steps / told).astype(np.int64)
    return max(told, told * float(np.gcd.reduce(counts)))


def probe_readings(soak: Soak, key: str) -> Readings:
    """The samples of a probe in a soak, single readings far from their neighbours set aside.

    Raises
    ------
    MeasurementError
        If readings are missing for long, stand at the end of the thermometer's range, or jump about.
    """
    values = soak.samples(key)
    known = np.isfinite(values)
    if not known.any():
        msg = f"{key} has no reading in the soak ({soak.where})"
        raise MeasurementError(msg)
    if not known.all():
        _see_to_holes(soak, key, known)
    low, high = float(np.min(values, where=known, initial=np.inf)), float(np.max(values, where=known, initial=-np.inf))
    spikes = _spikes(values)
    if spikes.size > max(3, _SPIKES * values.size):
        msg = (
            f"{key} jumps: {spikes.size} single readings lie far from their neighbours, the first at "
            f"{soak.place(int(spikes[0]))}; look to the probe and its leads, and record the soak again"
        )
        raise MeasurementError(msg)
    if spikes.size:
        values = values.copy()
        values[spikes] = np.nan
        kept = values[np.isfinite(values)]
        low, high = float(kept.min()), float(kept.max())
    if low < _COLDEST or high > _HOTTEST:
        odd = int(np.flatnonzero((values < _COLDEST) | (values > _HOTTEST))[0])
        msg = (
            f"{key} reads {float(values[odd]):.4g} °C at {soak.place(odd)}, the end of a thermometer's range: the "
            "probe is open or not connected; look to it, and record the soak again"
        )
        raise MeasurementError(msg)
    return Readings(values, int(spikes.size))


def _see_to_holes(soak: Soak, key: str, known: NDArray[np.bool_]) -> None:
    rows = np.flatnonzero(known)
    told = np.concatenate((soak.time[:1], soak.time[rows], soak.time[-1:]))
    gaps = np.diff(told)
    widest = int(np.argmax(gaps))
    usual = float(np.median(gaps[1:-1])) if rows.size > 2 else 0.0
    begins = int(rows[widest - 1]) if widest else 0
    ends = int(rows[widest]) if widest < rows.size else soak.time.size - 1
    rows_between = ends - begins - 1 if 0 < widest < rows.size else ends - begins
    if gaps[widest] > max(_HOLE, 3 * usual) and rows_between > 0:
        msg = (
            f"{key} has no reading for {duration(float(gaps[widest]))} from {soak.place(begins)} on: its probe fell "
            "off or broke; fasten it, and record the soak again"
        )
        raise MeasurementError(msg)


def _spikes(values: Floats) -> NDArray[np.intp]:
    """Single readings that lie far from both neighbours, on one side of them."""
    if values.size < 3:
        return np.zeros(0, dtype=np.intp)
    d = np.diff(values)
    with np.errstate(invalid="ignore"):
        single = (np.abs(d[:-1]) > _SPIKE) & (np.abs(d[1:]) > _SPIKE) & (d[:-1] * d[1:] < 0)
    return np.flatnonzero(single) + 1


def see_to_contact(
    soak: Soak, key: str, values: Floats, *, ambient: Floats | float, others: Mapping[str, Floats]
) -> None:
    """See to it that a probe was attached, stayed so, and did not stand still while others rose.

    Parameters
    ----------
    values
        Its samples.
    ambient
        Samples of the ambient, or the one that is stated.
    others
        Samples of the other probes of the soak, by channel.

    Raises
    ------
    MeasurementError
        With what was seen, where, and what to do.
    """
    starts = blocks_starts(soak.time)
    time, probe = means_of(soak.time, starts), means_of(values, starts)
    room = means_of(ambient, starts) if isinstance(ambient, np.ndarray) else np.full(time.size, ambient)
    rise = probe - room
    if not np.isfinite(rise).any():
        return
    if float(np.nanmax(rise)) < _NO_RISE:
        msg = (
            f"{key} never rises more than {max(0.0, float(np.nanmax(rise))):.2g} K above the ambient ({soak.where}): "
            "the probe was not attached, or the unit was off; fasten it, and record the soak again"
        )
        raise MeasurementError(msg)
    if isinstance(ambient, np.ndarray):
        _see_to_room(soak, time, room, starts)
    _see_to_jumps(soak, key, time, probe, rise=rise, starts=starts)
    _see_to_standstill(soak, key, values, others=others)


def _see_to_room(soak: Soak, time: Floats, room: Floats, starts: NDArray[np.intp]) -> None:
    """The ambient of a room moves slowly; a sensor that is carried or touched does not."""
    known = np.flatnonzero(np.isfinite(room))
    t, v = time[known], room[known]
    leaps = (np.abs(np.diff(v)) > _ROOM_LEAPS) & (np.diff(t) <= _SOON)
    if leaps.any():
        at = int(np.flatnonzero(leaps)[0])
        msg = (
            f"the ambient moves by {float(v[at + 1] - v[at]):.3g} K within {duration(float(t[at + 1] - t[at]))} at "
            f"{soak.place(int(starts[known[at]]))}: its sensor was moved or touched; keep it away from the unit and "
            "from draughts, and record the soak again"
        )
        raise MeasurementError(msg)


def _see_to_jumps(soak: Soak, key: str, time: Floats, probe: Floats, *, rise: Floats, starts: NDArray[np.intp]) -> None:
    """A probe that comes off shows the room within a minute or so; one that touches something else leaps up."""
    known = np.flatnonzero(np.isfinite(rise))
    t, v, r = time[known], probe[known], rise[known]
    for lag in (1, 2):
        if t.size <= lag:
            return
        moves, soon = v[lag:] - v[:-lag], t[lag:] - t[:-lag] <= _SOON
        falls = moves < -np.maximum(_LEAST_FALL, _FALL * r[:-lag])
        # while it warms up from cold a small part may leap
        leaps = (moves > np.maximum(_LEAST_JUMP, _JUMP * np.abs(r[:-lag]))) & (t[:-lag] > t[0] + _HOLE)
        for mask, verb, cause in ((falls, "falls", "the probe came off"), (leaps, "leaps", "the probe has no contact")):
            hits = np.flatnonzero(mask & soon)
            if hits.size:
                at = int(hits[0])
                msg = (
                    f"{key} {verb} by {abs(float(moves[at])):.3g} K within {duration(float(t[at + lag] - t[at]))} at "
                    f"{soak.place(int(starts[known[at]]))}, with the load held: {cause}; fasten it, and record the "
                    "soak again"
                )
                raise MeasurementError(msg)


def _see_to_standstill(soak: Soak, key: str, values: Floats, *, others: Mapping[str, Floats]) -> None:
    """A reading that has settled stands still for good reason, one whose neighbours still rise does not."""
    known = np.flatnonzero(np.isfinite(values))
    moved = np.flatnonzero(values[known] != values[known[-1]])
    first = int(known[moved[-1] + 1]) if moved.size else int(known[0])
    run = slice(first, int(known[-1]) + 1)
    lasts = float(soak.time[run.stop - 1] - soak.time[first])
    readings = int(np.count_nonzero(known >= first))
    if lasts < _STILL or readings < _STILL_READINGS:
        return
    step = step_of(soak.parts[0].log, key, values)
    stopped = _stopped_at_once(values[known], readings, step)
    why = _others_moved(values, run, others, step) or _left_its_curve(soak, values, run, step) or stopped
    if why:
        msg = (
            f"{key} stands still at {float(values[first]):.4g} °C for {duration(lasts)} from {soak.place(first)} on, "
            f"while {why}: the probe or its logger is stuck; look to it, and record the soak again"
        )
        raise MeasurementError(msg)


def _others_moved(values: Floats, run: slice, others: Mapping[str, Floats], step: float) -> str:
    own = float(np.nanmax(values) - np.nanmin(values))
    for name, samples in others.items():
        part = samples[run]
        if not np.isfinite(part).any():
            continue
        moved = float(np.nanmax(part) - np.nanmin(part))
        whole = float(np.nanmax(samples) - np.nanmin(samples))
        # as much of its way as the other went
        expected = own * moved / whole if whole > 0 else 0.0
        if moved >= _OTHERS_MOVE and (expected >= max(_STEPS * step, 2.0) or (own == 0 and moved >= 2 * _OTHERS_MOVE)):
            return f"{name} moves by {moved:.3g} K"
    return ""


def _stopped_at_once(values: Floats, still: int, step: float) -> str:
    """Whether the readings were moving until they stood still at once: what settles slows down first.

    Each move is as much smaller than the one before it as that was than its own forerunner, or less so where there
    are several time constants: the next one would have been seen.
    """
    last = values.size - still
    width = 1
    while 2 * width <= last and 3 * width <= still:
        late = float(values[last] - values[last - width])
        early = float(values[last - width] - values[last - 2 * width])
        if abs(late) >= _MOVING * step:
            next_one = abs(late) * min(1.0, late / early) if late * early > 0 else 0.0
            return f"it had moved by {abs(late):.2g} K just before" if next_one >= _SEEN * step else ""
        width *= 2
    return ""


def _left_its_curve(soak: Soak, values: Floats, run: slice, step: float) -> str:
    """Whether the readings stopped far below where they were heading: one exponential alone aims too low."""
    if run.start < 20:
        return ""
    starts = blocks_starts(soak.time[: run.start])
    time, before = means_of(soak.time[: run.start], starts), means_of(values[: run.start], starts)
    known = np.isfinite(before)
    curve = fit_curve(time[known], before[known]) if np.count_nonzero(known) >= 20 else None
    if curve is None or curve.u_log_tau > 0.2:
        return ""
    heading = float(curve.at(soak.time[run.stop - 1 : run.stop])[0])
    stopped = float(values[run.start])
    span = abs(heading - float(before[known][0]))
    if abs(heading - stopped) > max(4 * step, 1.0, 0.1 * span) + 3 * curve.u_level:
        return f"it was on its way to {heading:.3g} °C"
    return ""
