"""Figures of an overload: voltage over current, and both over time where the behaviour is one in time."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from typing import TypeVar

import numpy as np
from numpy.typing import NDArray

from acceptance.checks.thinning import thinned_cloud, thinned_trace
from acceptance.errors import MeasurementError
from acceptance.limitfile.model import Overcurrent
from acceptance.overload.analysis import Overload
from acceptance.overload.bursts import bursts_of, given_up
from acceptance.overload.episodes import Episode
from acceptance.overload.short import SHORTED
from acceptance.points.propagation import expanded
from acceptance.record import Axis, Figure, LimitLine, Mark, Region, Series

__all__ = ["overcurrent_figures"]

Floats = NDArray[np.float64]
T = TypeVar("T")

_CELLS = 36  # a curve fills far fewer of their squares
_BUCKETS = 250
_SHOWN = 3  # overloads of one output that are drawn in time


def overcurrent_figures(requirement: Overcurrent, output: str, found: Sequence[Overload]) -> list[Figure]:
    """The figures of one requirement; none where no overload was recorded."""
    seen = [overload for overload in found if overload.trace is not None]
    if not seen:
        return []
    figures = [_plane(requirement, output, seen)]
    in_time = [(one, one.episode) for one in seen if one.episode is not None and _is_in_time(one, one.episode)]
    for place, (overload, episode) in enumerate(in_time[:_SHOWN]):
        figures += _over_time(requirement, output, (overload, episode), number=place if len(in_time) > 1 else None)
    return figures


def _tried(form: Callable[[], T]) -> T | None:
    try:
        return form()
    except MeasurementError:
        return None


# --- voltage over current -------------------------------------------------------------------------------------------


def _plane(requirement: Overcurrent, output: str, seen: Sequence[Overload]) -> Figure:
    confidence = seen[0].part.limits.decision.confidence
    series: list[Series] = []
    marks: list[Mark] = []
    for number, overload in enumerate(seen, start=1):
        which = f" {number}" if len(seen) > 1 else ""
        series += _samples(overload, f"samples{which}", share=len(seen))
        if overload.episode is not None:
            series += _line(overload.episode, f"regulated branch{which}")
        marks += _onset_mark(overload, f"onset{which}", confidence)
        marks += _short_mark(overload, f"short circuit{which}", confidence)
    return Figure(
        name=f"overcurrent {output}",
        title="Output voltage over current, into overload",
        x=Axis("output current", "A"),
        y=Axis("output voltage", "V"),
        series=series,
        marks=marks,
        regions=_windows(requirement, seen[0]),
    )


def _samples(overload: Overload, name: str, *, share: int) -> list[Series]:
    trace, episode = overload.trace, overload.episode
    assert trace is not None
    here = slice(None) if episode is None else slice(episode.start, episode.stop)
    cells = max(12, int(_CELLS / np.sqrt(share)))
    x, y = thinned_cloud(trace.current[here], trace.voltage[here], cells=cells)
    return [Series(name, x, y, [None] * len(x), "dots")]


def _line(episode: Episode, name: str) -> list[Series]:
    onset = max(float(episode.trace.current[episode.start : episode.stop].max()), episode.trace.rated_current)
    x = np.array([0.0, min(onset, 2 * episode.trace.rated_current)])
    return [Series(name, x.tolist(), episode.branch.at(x).tolist(), [None, None], "line")]


def _onset_mark(overload: Overload, label: str, confidence: float) -> list[Mark]:
    onset = _tried(overload.onset)
    if onset is None or onset.known != "value":
        return []
    u = expanded(onset.current.value, confidence).expanded
    return [Mark(label, onset.current.nominal, onset.voltage, u)]


def _short_mark(overload: Overload, label: str, confidence: float) -> list[Mark]:
    short = _tried(overload.short)
    if short is None or short.known != "value":
        return []
    return [Mark(label, short.current.nominal, short.voltage, expanded(short.current.value, confidence).expanded)]


def _windows(requirement: Overcurrent, overload: Overload) -> list[Region]:
    trace = overload.trace
    assert trace is not None
    regions = []
    if requirement.onset is not None:
        low, high = (share * trace.rated_current for share in requirement.onset)
        regions.append(Region(f"{requirement.name}.onset", x_from=low, x_to=high))
    short = requirement.short_circuit
    if short is not None:
        least, most = (None if share is None else share * trace.rated_current for share in (short.min, short.max))
        top = SHORTED * trace.rated_voltage
        regions.append(Region(f"{requirement.name}.short_circuit", x_from=least, x_to=most, y_to=top))
    return regions


# --- over time ------------------------------------------------------------------------------------------------------


def _is_in_time(overload: Overload, episode: Episode) -> bool:
    """Whether time tells something: bursts, giving up, or a return that was asked for."""
    if episode.trace.time is None or not episode.left_branch:
        return False
    return episode.removed is not None or bursts_of(episode) is not None or given_up(episode) is not None


def _over_time(
    requirement: Overcurrent, output: str, one: tuple[Overload, Episode], *, number: int | None
) -> list[Figure]:
    overload, episode = one
    which = "" if number is None else f" {number + 1}"
    trace = episode.trace
    assert trace.time is not None
    here = slice(episode.start, episode.stop)
    time = trace.time[here] - trace.time[episode.start]
    marks = _moments(requirement, overload, episode)
    volts = Figure(
        name=f"overcurrent voltage {output}{which}",
        title="Output voltage over time, through the overload",
        x=Axis("time", "s"),
        y=Axis("output voltage", "V"),
        series=[_trace_series("output voltage", time, trace.voltage[here])],
        marks=marks,
        regions=_band(requirement, trace.rated_voltage, marks),
    )
    amperes = Figure(
        name=f"overcurrent current {output}{which}",
        title="Output current over time, through the overload",
        x=Axis("time", "s"),
        y=Axis("output current", "A"),
        series=[_trace_series("output current", time, trace.current[here])],
        limits=_short_limits(requirement, overload, episode),
        marks=marks,
    )
    return [volts, amperes]


def _trace_series(name: str, time: Floats, values: Floats) -> Series:
    x, y = thinned_trace(time, values, buckets=_BUCKETS)
    return Series(name, x, y, [None] * len(x), "trace")


def _moments(requirement: Overcurrent, overload: Overload, episode: Episode) -> list[Mark]:
    time = episode.trace.time
    assert time is not None
    begins = float(time[episode.start])
    marks = []
    if episode.removed is not None:
        marks.append(Mark("overload removed", float(time[episode.removed]) - begins))
    recovery = requirement.recovery
    if recovery is not None:
        returned = _tried(lambda: overload.returned(band=recovery.band, within=recovery.within))
        if returned is not None and returned.back is not None:
            marks.append(Mark("back in the band", float(time[returned.back]) - begins))
    return marks


def _band(requirement: Overcurrent, rated: float, marks: Sequence[Mark]) -> list[Region]:
    recovery = requirement.recovery
    if recovery is None or not marks:
        return []
    low, high = rated * (1 - recovery.band), rated * (1 + recovery.band)
    return [Region(f"{requirement.name}.recovery", x_from=marks[0].x, y_from=low, y_to=high)]


def _short_limits(requirement: Overcurrent, overload: Overload, episode: Episode) -> list[LimitLine]:
    """The limits of the short circuit, drawn while there was one: before it more current is no fault."""
    asked, short, time = requirement.short_circuit, _tried(overload.short), episode.trace.time
    if asked is None or short is None or time is None:
        return []
    begins, rated = float(time[episode.start]), episode.trace.rated_current
    span = float(time[short.first]) - begins, float(time[short.stop - 1]) - begins
    label = f"{requirement.name}.short_circuit"
    return [
        *([] if asked.min is None else [LimitLine(f"{label} min", asked.min * rated, "min", *span)]),
        *([] if asked.max is None else [LimitLine(f"{label} max", asked.max * rated, "max", *span)]),
    ]
