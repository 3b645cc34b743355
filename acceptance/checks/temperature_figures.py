"""Soaks and coolings as named series; the report draws them as they are."""

from __future__ import annotations

import numpy as np

from acceptance.checks.thinning import thinned_trace
from acceptance.checks.warm import AMBIENT, Warm
from acceptance.checks.winding import Cooling
from acceptance.record import Axis, Figure, LimitLine, Mark, Series
from acceptance.thermal.warming import WINDOW

__all__ = ["cooling_figure", "soak_figure"]

_CURVE = 120  # places of a fitted curve
_TRACE = 300  # buckets of a measured trace


def soak_figure(warm: Warm, key: str, *, suffix: str, limit: float | None, label: str, is_rise: bool) -> Figure:
    """A probe and the ambient over the time of the soak, with the fitted curve and where it settled."""
    soak, warming = warm.soak, warm.warming
    series = [_trace(key.replace("_", " "), soak.time, soak.samples(key))]
    if soak.has(AMBIENT):
        series.append(_trace("ambient", soak.time, soak.samples(AMBIENT)))
    curve = warm.settling.curve
    if curve is not None and curve.residuals.size == warming.probe.size:
        # what the curve says, in the room that there was
        series.append(_line("fitted curve", warming.time, warming.probe - curve.residuals))
    marks = [Mark("settled", moment)] if (moment := _settled_from(warm)) is not None else []
    return Figure(
        name=f"{key}{suffix}",
        title=f"Warming up: {key.partition(' ')[2] or key}{suffix}",
        x=Axis("time from the start of the soak", "s"),
        y=Axis("temperature", "°C"),
        series=series,
        limits=[LimitLine(label, limit, "max")] if limit is not None else [],
        caption=_caption(warm, is_rise=is_rise),
        marks=marks,
    )


def _caption(warm: Warm, *, is_rise: bool) -> str:
    """What a reader must know of the limit and of the soak."""
    told = [] if warm.settling.settled else ["The soak has not settled."]
    if is_rise:
        told.append("The limit is drawn above the ambient of the part that counts.")
    return " ".join(told)


def cooling_figure(cooling: Cooling, *, name: str, limit: float | None, label: str) -> Figure:
    """A winding's temperature after switch-off, and the curve that draws it back to it."""
    read = Series("by resistance", *thinned_trace(cooling.time, cooling.temperatures), [], "dots")
    series = [_known(read)]
    marks = []
    if cooling.drawn is not None:
        time = np.linspace(0.0, float(cooling.drawn.time[-1]), _CURVE)
        series.append(_line(cooling.drawn.method, time, cooling.drawn.curve.at(time) + cooling.room))
        marks.append(Mark("at switch-off", 0.0, cooling.hottest))
    return Figure(
        name=name,
        title="Cooling of the winding, drawn back to switch-off",
        x=Axis("time from switch-off", "s"),
        y=Axis("temperature", "°C"),
        series=series,
        limits=[LimitLine(label, limit, "max")] if limit is not None else [],
        marks=marks,
    )


def _trace(name: str, x: np.ndarray, y: np.ndarray) -> Series:
    return _known(Series(name, *thinned_trace(x, y, buckets=_TRACE), [], "trace"))


def _line(name: str, x: np.ndarray, y: np.ndarray) -> Series:
    return _known(Series(name, *thinned_trace(x, y, buckets=_CURVE), [], "line"))


def _known(series: Series) -> Series:
    return Series(series.name, series.x, series.y, [None] * len(series.x), series.kind)


def _settled_from(warm: Warm) -> float | None:
    """When the slope over the half hour before first stayed within the criterion. [s]"""
    slope = warm.settling.slope
    if not warm.settling.settled or slope is None:
        return None
    time, rise = warm.warming.time, warm.warming.rise
    allowed = warm.settling.allowed
    settled = None
    for end in np.linspace(time[-1], time[0] + WINDOW, _CURVE):
        rows = (time >= end - WINDOW) & (time <= end)
        if np.count_nonzero(rows) < 3:
            break
        centred = time[rows] - time[rows].mean()
        if abs(float(centred @ rise[rows] / (centred @ centred))) > allowed:
            break
        settled = float(end)
    return settled
