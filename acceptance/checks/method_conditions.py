"""What a published method asks beside load and input voltage, held against the log: told, never judged."""

from __future__ import annotations

from collections.abc import Iterator, Sequence

import numpy as np
from numpy.typing import NDArray

from acceptance.bench.log import channel_key
from acceptance.limitfile.published import Method, PublishedSet
from acceptance.points.point import Point, Points
from acceptance.printing import duration

__all__ = ["dates", "of_the_loads", "of_the_whole"]

FULL_LOAD = 0.05  # of rated current: the load counts as full within it, ripple and all
BLOCKS = 10  # means over so many parts of the watch show a drift, where samples would show noise
TIME_SLACK = 0.02  # of a time that is asked: n samples last one interval less than n intervals

Floats = NDArray[np.float64]


def dates(published: PublishedSet, points: Points) -> tuple[str, ...]:
    """What to say where the set does not apply on the day of the test."""
    day = points.log.test_date
    if day is None:
        return ()
    if published.since is not None and day < published.since:
        early = f"; {published.early}" if published.early else ""
        return (
            f"{published.name} is for what is {published.counts} {published.since}; the test was run on {day}{early}",
        )
    if published.until is not None and day > published.until:
        return (f"{published.name} applied until {published.until}; the test was run on {day}",)
    return ()


def of_the_whole(method: Method, used: Sequence[Point], points: Points) -> tuple[str, ...]:
    """Deviations of any value of the set: the room, the load's mode, and what the log does not show."""
    unlogged = list(method.unlogged)
    told: list[str] = []
    if method.ambient is not None:
        told += _ambient(method.ambient, used, points, unlogged)
    if method.load_mode:
        told += _load_mode(method.load_mode, used, points, unlogged)
    if unlogged:
        told.append(f"not shown by the log, of the method ({method.document}): {', '.join(unlogged)}")
    return tuple(told)


def of_the_loads(
    method: Method, used: Sequence[Point], *, first: Sequence[Point], full: float = 1.0
) -> tuple[str, ...]:
    """Deviations of the sweep over the loads: warm-up, order, stability.

    Parameters
    ----------
    method
        What is asked.
    used
        The point of each load that the value is formed from, from the largest load to the smallest.
    first
        The first point of each load: a load may have been run again after the sweep.
    full
        What counts as full load, as a fraction of rated current.
    """
    if not used or method.watch is None:
        return ()
    return (*_warm_up(method, first, full), *_order(first), *_stability(method, used))


# --- the room and the load ------------------------------------------------------------------------------------------


def _ambient(asked: tuple[float, float], used: Sequence[Point], points: Points, unlogged: list[str]) -> Iterator[str]:
    key, span = "ambient_temperature", f"{asked[0]:g} °C to {asked[1]:g} °C"
    readings = [point.samples(key) for point in used if point.has(key)]
    known = np.concatenate(readings) if readings else np.array([])
    known = known[np.isfinite(known)]
    if not known.size and key in points.log.stated:
        known = np.array([points.log.stated[key]])
    if not known.size:
        unlogged.append(f"the ambient temperature ({span})")
    elif known.min() < asked[0] or known.max() > asked[1]:
        yield f"the ambient was {known.min():.1f} °C to {known.max():.1f} °C; {span} is asked"


def _load_mode(asked: str, used: Sequence[Point], points: Points, unlogged: list[str]) -> Iterator[str]:
    modes = {points.limits.load_mode} if points.limits.load_mode else set()
    for key in points.log.keys("load_mode"):
        for point in used:
            modes |= set(points.log.samples[key].iloc[point.dwell.first : point.dwell.stop].dropna().unique())
    if not modes:
        unlogged.append(f"the load's mode ({asked})")
    elif others := sorted(str(mode) for mode in modes if mode != asked):
        yield f"the load was in {' and '.join(others)} mode; {asked} is asked"


# --- the sweep ------------------------------------------------------------------------------------------------------


def _warm_up(method: Method, run: Sequence[Point], full: float) -> Iterator[str]:
    if method.warm_up is None or method.watch is None:
        return
    first = min(run, key=lambda point: point.dwell.first)
    lasted = _at_full_load(first, full)
    watch = method.watch if first is run[0] else 0.0  # the first point is full load itself, and watched after it
    if lasted is not None and lasted >= (method.warm_up + watch) * (1 - TIME_SLACK):
        return
    shown = "does not show for how long" if lasted is None else f"shows {duration(lasted) if lasted else 'no time'}"
    asked = duration(method.warm_up) + (f" and {duration(watch)} of watching" if watch else "")
    note = first.log.notes.get("warm-up", "")
    said = f'; its note says "{note}"' if note else ""
    yield f"warm-up: the log {shown} at full load up to the end of the first point; {asked} are asked{said}"


def _at_full_load(point: Point, full: float) -> float | None:
    """The longest time at full load in the point's table, up to its end; None where no time was logged. [s]"""
    if not point.has("time"):
        return None
    rows = slice(point.dwell.stop)
    here = point.log.samples["table"].to_numpy()[rows] == point.dwell.table
    for output, rating in point.limits.ratings.outputs.items():
        key = channel_key("output_current", output)
        if not point.has(key):
            return None
        here &= np.abs(point.columns[key][rows] / rating.current - full) <= FULL_LOAD  # a missing reading is none
    time = point.columns["time"][rows]
    edges = np.flatnonzero(np.diff(here.astype(np.int8), prepend=0, append=0))
    lengths = [float(time[stop - 1] - time[first]) for first, stop in zip(edges[::2], edges[1::2], strict=True)]
    return max((length for length in lengths if np.isfinite(length)), default=0.0)


def _order(used: Sequence[Point]) -> Iterator[str]:
    run = sorted(used, key=lambda point: point.dwell.first)
    if run != list(used):
        output = run[0].limits.outputs[0]
        shares = [f"{100 * (point.load_fraction(output) or 0.0):.0f}" for point in run]
        yield f"the loads were run in the order {', '.join(shares)} %; from the largest to the smallest is asked"


def _stability(method: Method, used: Sequence[Point]) -> Iterator[str]:
    """The input power over the last minutes of each point."""
    watch = method.watch or 0.0
    several = len(used[0].limits.outputs) > 1
    largest = method.drift_several if several and method.drift_several is not None else method.drift
    short, moving = [], []
    for point in used:
        name = f"{100 * (point.load_fraction(point.limits.outputs[0]) or 0.0):.0f} %"
        lasted, drift = _watched(point, watch)
        if lasted is None or lasted < watch * (1 - TIME_SLACK):
            short.append((name, lasted))
        elif drift is not None and largest is not None and drift > largest:
            moving.append(f"{100 * drift:.2g} % at load {name}")
    if short:
        known = [lasted for _, lasted in short if lasted]
        least = (
            f"it has {duration(min(known))} at the shortest" if len(known) == len(short) else "the time is not known"
        )
        names = ", ".join(name for name, _ in short)
        yield f"stability over {duration(watch)} is not shown at load {names}: {least}"
    if moving:
        most = f"at most {100 * (largest or 0.0):g} % is asked"
        yield f"the input power drifted by {', '.join(moving)} within {duration(watch)}; {most}"


def _watched(point: Point, watch: float) -> tuple[float | None, float | None]:
    """How long a point's load stood, and the drift of its input power over the last of it, of the largest. [s, 1]"""
    if not point.has("time"):
        return None, None
    span = slice(point.dwell.begins, point.dwell.stop)
    time = point.columns["time"][span]
    if not np.isfinite(time).all():
        return None, None
    lasted = float(time[-1] - time[0])
    if lasted < watch * (1 - TIME_SLACK) or not point.has("input_power"):
        return lasted, None
    power = point.columns["input_power"][span]
    late = (time >= time[-1] - watch) & np.isfinite(power)
    means = [float(part.mean()) for part in np.array_split(power[late], BLOCKS) if part.size]
    largest = max(means, default=0.0)
    return lasted, (largest - min(means)) / largest if largest > 0 else None
