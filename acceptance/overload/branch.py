"""The regulated branch: the straight line that an output's voltage follows up to its rated load."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from acceptance.errors import MeasurementError
from acceptance.overload.steps import STEADY, Step
from acceptance.overload.trace import RATED, Trace
from acceptance.points.point import Point

__all__ = ["Branch", "branch_of"]

Floats = NDArray[np.float64]

_APART = 0.05  # of rated current: loads that tell a slope lie at least so far apart
_FLAT = 0.02  # of rated voltage, from no load to rated load: what an unknown slope may be (our choice)
_LEAST = 0.8  # of the voltage at no load: what has fallen further is no regulated branch
_MOST = 400  # levels that are compared with each other


@dataclass(frozen=True, slots=True)
class Branch:
    """V = voltage − resistance · I."""

    voltage: float  # at no load [V]
    resistance: float  # [ohm]
    u_voltage: float  # of the line at the mean of the currents it was fitted over [V]
    u_resistance: float  # [ohm]
    centre: float  # that mean [A]
    flat: bool = False  # seen at one load only, and taken as flat

    def at(self, current: Floats) -> Floats:
        """The voltage on the line, which ends where a fifth of it is gone. [V]"""
        line: Floats = np.maximum(self.voltage - self.resistance * current, _LEAST * self.voltage)
        return line

    def u(self, current: float) -> float:
        """Standard uncertainty of the line. [V]"""
        return math.hypot(self.u_voltage, self.u_resistance * (current - self.centre))


def branch_of(trace: Trace, steps: Sequence[Step], points: Sequence[Point], *, droop: float) -> Branch:
    """The line through the settled levels up to rated load: the sweep's own, else those of steady points.

    Parameters
    ----------
    points
        Steady points at the input voltage of the sweep.
    droop
        Fall below the line that is no more regulation. [V]

    Raises
    ------
    MeasurementError
        If no level at or below rated load was seen.
    """
    own = _levels(trace, steps)
    levels = own if _spread(own) >= _APART * trace.rated_current else _joined(own, _elsewhere(trace, points))
    if not levels.size:
        msg = (
            f"no sample on the regulated branch, at or below rated load, in {trace.part.where}; begin the sweep at or "
            "below rated current, before the overload"
        )
        raise MeasurementError(msg)
    levels = levels[levels[:, 1] >= _held(levels) - droop]
    return _fitted(trace, levels)


def _levels(trace: Trace, steps: Sequence[Step]) -> Floats:
    """Current, voltage and its u of each settled step at no more than rated load, shape (n, 3)."""
    asked = trace.asked()
    bound, half = RATED * trace.rated_current, 0.5 * trace.rated_voltage
    kept = [
        (step.current, step.voltage, step.u_voltage)
        for step in steps
        if step.kind == STEADY and step.current <= bound and step.voltage >= half and not asked[step.stop - 1] > bound
    ]
    return np.array(kept, dtype=np.float64).reshape(-1, 3)


def _elsewhere(trace: Trace, points: Sequence[Point]) -> Floats:
    kept = []
    for point in points:
        if point.has(trace.voltage_key) and point.has(trace.current_key):
            voltage, current = (_median(point.samples(key)) for key in (trace.voltage_key, trace.current_key))
            if current <= RATED * trace.rated_current and voltage >= 0.5 * trace.rated_voltage:
                kept.append((current, voltage + trace.lead * current, 0.0))
    return np.array(kept, dtype=np.float64).reshape(-1, 3)


def _median(samples: Floats) -> float:
    known = samples[np.isfinite(samples)]
    return float(np.median(known)) if known.size else math.nan


def _joined(own: Floats, elsewhere: Floats) -> Floats:
    return elsewhere if not own.size or _spread(elsewhere) > _spread(own) else own


def _spread(levels: Floats) -> float:
    return float(np.ptp(levels[:, 0])) if levels.size else 0.0


def _held(levels: Floats) -> float:
    """What the output holds at the loads where it does. [V]"""
    return float(np.quantile(levels[:, 1], 0.75))


def _fitted(trace: Trace, levels: Floats) -> Branch:
    """The line by the median of the slopes between levels (Theil and Sen), which no outlier moves."""
    current, voltage = levels[:, 0], levels[:, 1]
    centre = float(current.mean())
    typical = float(np.median(levels[:, 2]))
    if _spread(levels) < _APART * trace.rated_current:
        slope = _FLAT * trace.rated_voltage / trace.rated_current / math.sqrt(3.0)
        return Branch(float(np.median(voltage)), 0.0, typical, slope, centre, flat=True)
    resistance = -_slope(current, voltage, _APART * trace.rated_current)
    offset = float(np.median(voltage + resistance * current))
    rest = voltage - offset + resistance * current
    scatter = 1.4826 * float(np.median(np.abs(rest)))
    u = max(scatter, typical) / math.sqrt(current.size)
    return Branch(offset, resistance, u, u / max(float(current.std()), 1e-12), centre)


def _slope(current: Floats, voltage: Floats, apart: float) -> float:
    some = np.linspace(0, current.size - 1, min(current.size, _MOST)).astype(int)
    x, y = current[some], voltage[some]
    dx, dy = x[:, None] - x[None, :], y[:, None] - y[None, :]
    far = dx >= min(apart, 0.5 * float(np.ptp(x)))
    return float(np.median(dy[far] / dx[far]))
