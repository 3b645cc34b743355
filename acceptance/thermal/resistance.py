"""A winding's mean temperature by its resistance: cold, and extrapolated to the moment of switch-off.

    R2/R1 = (K + T2)/(K + t1)       K: where the resistance, drawn on straight, would vanish, below zero

The winding cools while the meter is being connected, so that what is read is drawn back to t = 0. It gives its heat to
the core first and to the room later; a straight line through such readings always ends too low.
"""

from __future__ import annotations

import math
from collections.abc import Mapping
from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray

from acceptance.errors import MeasurementError
from acceptance.thermal.exponentials import Curve, best_curve

__all__ = ["MATERIALS", "Extrapolation", "Material", "temperature_by_resistance", "to_switch_off", "winding_rise"]

Floats = NDArray[np.float64]

_FEWEST = 3  # readings
_ENOUGH = 5  # from which on a second time constant may be looked for
_CHANCE = 0.05  # of taking two where there is one: a winding always has its core beside the room
_LEAST_JUMP = 2.0  # [K]
_JUMP = 6.0  # times the usual spread of the moves between readings
_READ_OVER = 600.0  # readings later than this tell of the room, not of the winding [s]
_LEAST_READ = 8  # readings that are looked at, however late


@dataclass(frozen=True, slots=True)
class Material:
    """A winding's material."""

    name: str
    constant: float  # K [°C below zero]
    bound: float  # how far published values differ from it [K]
    source: str


MATERIALS: Mapping[str, Material] = {
    "copper": Material(
        "copper", 234.5, 0.0, "234.5 for copper (IS 2705-1:1992, annex D-1; the other sources read agree)"
    ),
    # 225 in a US product standard, 228 in textbooks and cable standards (alpha at 20 °C is 0.00403), 229 in
    # IEC 61558-1 (from memory)
    "aluminium": Material("aluminium", 228.0, 3.0, "228 for aluminium; published values are 225 to 229"),
}


def winding_rise(cold: Any, warm: Any, *, start: Any, end: Any, constant: Any) -> Any:
    """Rise of a winding over the ambient at the end; numbers, or values with uncertainty. [K]

    (R2 - R1)/R1 (K + t1) - (t2 - t1)

    Parameters
    ----------
    cold, warm
        Resistance at the ambient `start`, and warm. [ohm]
    start, end
        Ambient, and so the winding's temperature, when it was cold; ambient at the end. [°C]
    constant
        K of the material. [°C]

    References
    ----------
    EN 61558-1, 14.2, as quoted by makers; IS 2705-1:1992, annex D-1.
    """
    return (warm - cold) / cold * (constant + start) - (end - start)


def temperature_by_resistance(cold: Any, warm: Any, *, start: Any, constant: Any) -> Any:
    """Mean temperature of a winding: R2/R1 (K + t1) - K. [°C]"""
    return warm / cold * (constant + start) - constant


@dataclass(frozen=True, slots=True)
class Extrapolation:
    """A winding's rise at the moment of switch-off."""

    rise: float  # [K]
    u: float  # [K]
    degrees_of_freedom: float
    method: str  # in words
    curve: Curve
    time: Floats  # of the readings it was drawn from [s]
    rises: Floats  # [K]

    @property
    def drawn(self) -> float:
        """How far the readings were drawn back. [K]"""
        return self.rise - float(self.rises[0])


def to_switch_off(time: Floats, rises: Floats) -> Extrapolation:
    """The rise at t = 0, by an exponential, or by two where the residuals of one are curved.

    Parameters
    ----------
    time : shape (n,), rising, above 0
        From switch-off. [s]
    rises : shape (n,)
        Of the winding over the ambient at the same moment. [K]

    Raises
    ------
    MeasurementError
        If there are fewer than three readings, or if these do not fall.

    Notes
    -----
    u holds the covariance of the fit, and what another way of drawing back gives for the first half of the
    readings: a parabola through their logarithms, taken as a bound; beside one exponential as a standard uncertainty.
    """
    last = max(_READ_OVER, float(time[min(time.size, _LEAST_READ) - 1]))
    used = (time <= last) & np.isfinite(rises)
    t, r = time[used], rises[used]
    if t.size < _FEWEST:
        msg = f"only {t.size} readings of the winding while it cooled; take at least eight, the first within 30 s"
        raise MeasurementError(msg)
    third = max(1, t.size // 3)
    if not (r > 0).all() or r[-third:].mean() >= r[:third].mean():
        msg = (
            "the winding does not cool after switch-off; see which column holds its resistance, and which stage this is"
        )
        raise MeasurementError(msg)
    _see_to_jumps(t, r)
    curve = best_curve(t, r, kind="to zero", chance=_CHANCE) if t.size >= _ENOUGH else None
    if curve is None:
        curve = _log_linear(t, r)
    k = len(curve.parts)
    rise = float(sum(curve.parts))
    u_fit = math.sqrt(max(0.0, float(curve.covariance[:k, :k].sum())))
    # of one exponential the parabola is the nearest that shows a part still hidden in the noise
    other = abs(_by_parabola(t, r) - rise) / (1.0 if k == 1 else math.sqrt(3))
    u = math.hypot(u_fit, other)
    method = "two exponentials" if k == 2 else "one exponential (straight in the logarithm)"
    return Extrapolation(rise, u, max(1.0, curve.effective_readings - 2 * k), method, curve, t, r)


def _see_to_jumps(time: Floats, rises: Floats) -> None:
    """A winding that is left alone only cools: a clear step up, or away from all others, is one of the contact."""
    if time.size < _ENOUGH:
        return
    moves = np.diff(rises)
    some = np.abs(moves[moves != 0])
    # a display that shows whole kelvins moves by one of its steps, or two
    step = float(some.min()) / 3 if some.size else 0.0
    usual = max(1.4826 * float(np.median(np.abs(moves - np.median(moves)))), step)
    up = moves > max(_LEAST_JUMP, _JUMP * usual)
    # what falls fast at first falls more slowly from then on, so that a later fall larger than all before is none
    down = np.zeros(moves.size, dtype=bool)
    rates = moves / np.diff(time)
    for at in range(2, moves.size):
        down[at] = moves[at] < -max(_LEAST_JUMP, _JUMP * usual) and rates[at] < 2 * float(rates[:at].min())
    jumps = np.flatnonzero(up | down)
    if jumps.size:
        at = int(jumps[0])
        msg = (
            f"the winding's temperature jumps by {float(moves[at]):+.2g} K between {time[at]:.4g} s and "
            f"{time[at + 1]:.4g} s after switch-off, as no winding cools: a contact or a range of the meter changed; "
            "clamp the leads before switch-off, on one range, and record the soak and its cooling again"
        )
        raise MeasurementError(msg)


def _log_linear(time: Floats, rises: Floats) -> Curve:
    """A straight line through the logarithms: what few readings allow."""
    slope, top = np.polyfit(time, np.log(rises), 1)
    tau, part = -1 / min(float(slope), -1e-12), math.exp(float(top))
    residuals = rises - part * np.exp(-time / tau)
    spread = float(residuals @ residuals) / max(1, time.size - 2)
    jacobian = np.column_stack([np.exp(-time / tau), part * time / tau * np.exp(-time / tau)])
    covariance = spread * np.linalg.pinv(jacobian.T @ jacobian)
    u_log_tau = math.sqrt(max(0.0, float(covariance[1, 1])))
    return Curve("to zero", (tau,), (part,), 0.0, u_log_tau, 0.0, residuals, covariance, 1.0)


def _by_parabola(time: Floats, rises: Floats) -> float:
    """The rise at t = 0 by a parabola through the logarithms of the first half of the readings."""
    count = max(min(time.size, 4), time.size // 2)
    degree = 2 if count >= 3 else 1
    return math.exp(float(np.polyfit(time[:count], np.log(rises[:count]), degree)[-1]))
