"""Soaks: whole stretches of the thermal stage at one operating condition, or long steady dwells where there is none."""

from __future__ import annotations

import math
from dataclasses import dataclass, replace
from datetime import datetime

import numpy as np
from numpy.typing import NDArray

from acceptance.bench.log import BenchLog
from acceptance.points.dwells import Dwell
from acceptance.points.point import Point, Points

__all__ = ["Soak", "blocks_starts", "calm", "joined", "means_of", "seconds_of", "stretch_of", "thermal_stretches"]

Floats = NDArray[np.float64]
Indices = NDArray[np.intp]
Span = tuple[int, int]

_BLOCK = 45.0  # what a load is averaged over [s]
_MOST = 4000  # blocks
_PAUSE = 600.0  # a longer pause between two tables is no pause of the logger [s]


@dataclass(frozen=True, slots=True)
class Soak:
    """Samples of one soak, of one table or of several in a row."""

    parts: tuple[Point, ...]  # each a whole stretch of one table
    time: Floats  # from its first sample, over all parts [s]
    dwell: bool = False  # a long steady dwell that serves as one
    fault: str = ""  # why it cannot be judged
    condition: str = ""  # what was run, in words
    ended: str = ""  # why what it came to is only known at the least: the unit went off by itself

    def samples(self, key: str) -> Floats:
        """A channel over all parts; without a copy where there is one part."""
        if len(self.parts) == 1:
            return self.parts[0].samples(key)
        return np.concatenate([part.samples(key) for part in self.parts])

    def has(self, key: str) -> bool:
        """Whether a channel was logged in all parts."""
        return all(part.has(key) for part in self.parts)

    def require(self, *keys: str) -> None:
        """See to it that channels may be judged here (MeasurementError)."""
        for part in self.parts:
            part.require(*keys)

    @property
    def where(self) -> str:
        """Files and lines."""
        return "; ".join(part.where for part in self.parts)

    @property
    def lasts(self) -> float:
        """[s]"""
        return float(self.time[-1] - self.time[0])

    def place(self, index: int) -> str:
        """File and line of a sample."""
        for part in self.parts:
            if index < part.readings:
                table, line, _ = part.log.rows_of((part.dwell.first + index, part.dwell.first + index + 1))
                return f"{table}, line {line}"
            index -= part.readings
        raise AssertionError  # pragma: no cover - the sample is one of the soak's

    def cut(self, first: int, stop: int) -> Soak:
        """The samples [first, stop) alone."""
        parts, at = [], 0
        for part in self.parts:
            a, b = max(first - at, 0), min(stop - at, part.readings)
            if a < b:
                parts.append(stretch_of(part, (part.dwell.first + a, part.dwell.first + b)))
            at += part.readings
        time = self.time[first:stop]
        return replace(self, parts=tuple(parts), time=time - time[0] if time.size and time[0] != 0 else time)


def stretch_of(point: Point, span: Span) -> Point:
    """Samples of the log as a stretch like another one."""
    dwell = Dwell(span[0], span[1], span[0], point.dwell.stage, point.dwell.table, "whole stretch", None)
    return Point(-1, dwell, point.log, point.limits, point.bench, point.columns)


def thermal_stretches(points: Points) -> list[Soak]:
    """The stretches of the thermal stage, those joined that only a border of tables parts; without time: a fault."""
    soaks: list[Soak] = []
    for stretch in points.stretches("thermal"):
        soak = _of(stretch)
        joint = joined(soaks[-1], soak) if soaks else None
        if joint is not None:
            soaks[-1] = joint
        else:
            soaks.append(soak)
    return soaks


def _of(stretch: Point) -> Soak:
    time = seconds_of(stretch)
    if time is None:
        fault = (
            f"the soak has no time ({stretch.where}), so that it cannot be told whether it has settled; "
            "log the time of every sample"
        )
        return Soak((stretch,), np.zeros(stretch.readings), fault=fault)
    return Soak((stretch,), time - time[0] if time[0] != 0 else time)


def seconds_of(stretch: Point) -> Floats | None:
    """Time of every sample, as logged; None where it is missing or does not rise."""
    if not stretch.has("time"):
        return None
    time = stretch.samples("time")
    if not np.isfinite(time).all() or (time.size > 1 and float(np.diff(time).min()) < 0):
        return None
    return time if time.size == 1 or time[-1] > time[0] else None


def joined(first: Soak, second: Soak) -> Soak | None:
    """Two stretches as one soak, where they follow each other in the log and in time; else None."""
    a, b = first.parts[-1], second.parts[0]
    if first.fault or second.fault or a.dwell.stop != b.dwell.first:
        return None
    pause = _pause(a, b)
    if pause is None or not 0 <= pause <= _PAUSE:
        return None
    later = second.time + first.time[-1] + pause
    return Soak(first.parts + second.parts, np.concatenate([first.time, later]))


def _pause(a: Point, b: Point) -> float | None:
    """Time between the last sample of one table and the first of the next; None where it cannot be told. [s]"""
    log = a.log
    starts = _started(log, a.dwell.table), _started(log, b.dwell.table)
    last, first = float(a.samples("time")[-1]), float(b.samples("time")[0])
    if starts[0] is not None and starts[1] is not None:
        if (starts[0].tzinfo is None) != (starts[1].tzinfo is None):
            return None
        return (starts[1] - starts[0]).total_seconds() + first - last
    return first - last if first > 0 else None  # a count of seconds that goes on


def _started(log: BenchLog, table: int) -> datetime | None:
    name = log.tables[table]
    return next((one.started_at for one in log.evidence if name == one.file), None)


# --- means over blocks of time ----------------------------------------------------------------------------------------


def blocks_starts(time: Floats, length: float = _BLOCK) -> Indices:
    """First sample of each block of time, for np.add.reduceat; every sample is one where they are farther apart."""
    span = float(time[-1] - time[0])
    count = int(min(_MOST, max(1, math.ceil(span / length)))) if span > 0 else 1
    if time.size <= count:
        return np.arange(time.size)
    return np.unique(np.searchsorted(time, time[0] + span * np.arange(count) / count))


def means_of(column: Floats, starts: Indices) -> Floats:
    """Mean of each block, missing readings left out; NaN where a block has none."""
    known = np.isfinite(column)
    if known.all():
        lengths = np.diff(np.append(starts, column.size))
        means: Floats = np.add.reduceat(column, starts) / lengths
        return means
    counts = np.add.reduceat(known.astype(np.int64), starts)
    sums = np.add.reduceat(np.where(known, column, 0.0), starts)
    found: Floats = np.divide(sums, counts, out=np.full(counts.size, np.nan), where=counts > 0)
    return found


def calm(values: Floats) -> Floats:
    """Each value by the middle one of itself and its neighbours, so that one odd block counts for nothing."""
    if values.size < 3:
        return values
    around = np.stack([values[:-2], values[1:-1], values[2:]])
    inner = np.where(np.isnan(around).any(axis=0), values[1:-1], np.sort(around, axis=0)[1])
    ends = np.array([values[0], values[-1]])
    return np.concatenate((ends[:1], inner, ends[1:]))
