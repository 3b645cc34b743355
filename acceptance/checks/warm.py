"""How warm a probe or a winding got in one soak, with its errors: what rises and temperatures are formed from."""

from __future__ import annotations

import math
from dataclasses import dataclass, field

import numpy as np
from numpy.typing import NDArray

from acceptance.bench.log import channel_key
from acceptance.errors import MeasurementError
from acceptance.limitfile.limits import Limits
from acceptance.points.instrument import converter_step_uncertainty
from acceptance.points.point import RESOLUTION_COVERS, Estimate, Point
from acceptance.points.propagation import Source, Value, of_source
from acceptance.printing import duration
from acceptance.thermal.probes import probe_readings, see_to_contact, step_of
from acceptance.thermal.rooms import ambient_doubt, see_to_room_level
from acceptance.thermal.settling import Settling, settling_of
from acceptance.thermal.soak import Soak
from acceptance.thermal.warming import WINDOW, Warming, blocks_of
from acceptance.units import Rate

__all__ = ["AMBIENT", "Warm", "ambient_of", "probe_key", "probe_warming", "warm_probe"]

Floats = NDArray[np.float64]

AMBIENT = "ambient_temperature"
_LEAST_TOLD = 0.01  # [K]
_SHOWN = 0.5  # u of the logarithm of a time constant: less well known, it is none


@dataclass(frozen=True, slots=True)
class Warm:
    """What one soak says of a probe or winding."""

    soak: Soak
    temperature: Estimate  # that it settles at, or that it reached at the least [°C]
    ambient: Estimate | None  # over the same part of the soak; None where it was not logged [°C]
    settling: Settling
    warming: Warming
    bound_reason: str = ""  # why it is only known at the least
    told: str = ""  # how it came about, for the finding
    notes: tuple[str, ...] = field(default=())

    @property
    def rise(self) -> Estimate:
        """Over the ambient. [K]"""
        if self.ambient is None:
            raise MeasurementError(NO_AMBIENT)
        return Estimate.of(self.temperature.value - self.ambient.value, self.temperature, self.ambient)

    def adjusted(self, reference: float) -> Estimate:
        """Temperature that it would have in another ambient. [°C]"""
        rise = self.rise
        return Estimate.of(rise.value + reference, rise)


NO_AMBIENT = (
    "no ambient temperature was logged in the soak, so that there is no rise over it; record it beside the probes, or "
    "give it under log: stated:"
)


def ambient_of(soak: Soak) -> Floats | float | None:
    """Samples of the ambient, the one that is only stated, or None."""
    if soak.has(AMBIENT) and np.isfinite(soak.samples(AMBIENT)).any():
        return probe_readings(soak, AMBIENT).values
    return soak.parts[0].log.stated.get(AMBIENT)


def warm_probe(soak: Soak, key: str, *, settled: Rate, absolute: bool = False) -> Warm:
    """How warm a probe gets in a soak.

    Parameters
    ----------
    key
        Its channel.
    settled
        The slope that counts as settled.
    absolute
        Whether its temperature as measured is asked for: the highest counts, whatever the room did.

    Raises
    ------
    MeasurementError
        With what is wrong with the soak, its probe, or its ambient.
    """
    limits = soak.parts[0].limits
    warming, steps, notes = probe_warming(soak, key)
    settling = _settling(warming, settled, limits, steps)
    where = _last(warming, settling, absolute=absolute)
    part = _part(soak, where)
    temperature, ambient = _means(warming, where)
    peak = _peak_of_probe(warming, temperature + settling.to_come, settling) if absolute else None
    to_come = settling.to_come if settling.settled and peak is None else 0.0
    if peak is not None:
        temperature = peak
    elif settling.overshot and settling.settled:
        temperature = ambient + settling.rise
    elif not settling.settled:
        temperature = _reached(warming) if absolute else ambient + settling.reached
    rounding = _rounding(part, key, steps[0])
    value = _with_errors(part, key, temperature, settling) + rounding + to_come
    unstated = frozenset() if part.bench.is_stated(key) else frozenset({key})
    return Warm(
        soak,
        Estimate(value, unstated),
        _ambient(part, soak, ambient, steps[1]),
        settling,
        warming,
        soak.ended or _bound(settling) or ("" if absolute else ambient_doubt(warming)),
        _told(settling, peak),
        notes,
    )


def probe_warming(soak: Soak, key: str) -> tuple[Warming, tuple[float, float], tuple[str, ...]]:
    """A probe's soak in blocks, the steps of probe and ambient, and what the report must say of its readings."""
    _see_to_channels(soak, key)
    readings = probe_readings(soak, key)
    ambient = ambient_of(soak)
    others = {name: soak.samples(name) for name in soak.parts[0].log.keys("temperature") if name != key}
    rated = soak.parts[0].limits.ratings.ambient
    see_to_room_level(soak, key, readings.values, ambient=ambient, rated=rated)
    see_to_contact(soak, key, readings.values, ambient=0.0 if ambient is None else ambient, others=others)
    log = soak.parts[0].log
    notes = []
    if readings.set_aside:
        notes.append(f"{readings.set_aside} single readings of {key} far from their neighbours were set aside")
    if ambient is None:
        notes.append("no ambient was logged: that the soak had settled is told by the probe alone")
    if isinstance(ambient, np.ndarray):
        time, probe, room = blocks_of(soak.time, readings.values, ambient)
        step = step_of(log, AMBIENT, ambient)
    else:
        time, probe = blocks_of(soak.time, readings.values)
        room, step = np.full(time.size, ambient or 0.0), 0.0
        if ambient is not None:
            notes.append(f"the ambient was stated as {ambient:g} °C, not logged")
    if time.size < 2 or not time[-1] > time[0]:
        msg = f"too few readings of {key} and the ambient together ({soak.where}); log both in every row"
        raise MeasurementError(msg)
    return Warming(time, probe, room, soak.lasts), (step_of(log, key, readings.values), step), tuple(notes)


def _see_to_channels(soak: Soak, key: str) -> None:
    if soak.fault:
        raise MeasurementError(soak.fault)
    log = soak.parts[0].log
    if not soak.has(key):
        probes = ", ".join(log.keys("temperature")) or "no temperature of a probe"
        msg = f"{key} was not logged; the log has {probes}"
        raise MeasurementError(msg)
    room = [AMBIENT] if soak.has(AMBIENT) else []
    soak.require("time", key, *room)


def _settling(warming: Warming, settled: Rate, limits: Limits, steps: tuple[float, float]) -> Settling:
    allowed = settled.difference / settled.interval
    return settling_of(warming, allowed=allowed, confidence=limits.decision.confidence, steps=steps)


def _last(warming: Warming, settling: Settling, *, absolute: bool) -> tuple[float, float]:
    """From when to when readings count: the last part, or where the highest mean was reached. [s]"""
    end = float(warming.time[-1])
    if settling.settled:
        return end - WINDOW, end
    end = float(warming.time[int(np.argmax(_running(warming)))]) if absolute else settling.reached_at
    return end - WINDOW / 6, end


def _running(warming: Warming) -> Floats:
    sums = np.concatenate(([0.0], np.cumsum(warming.probe)))
    start = np.searchsorted(warming.time, warming.time - WINDOW / 6)
    stop = np.arange(1, warming.time.size + 1)
    means: Floats = (sums[stop] - sums[start]) / (stop - start)
    return np.where(warming.time >= warming.time[0] + WINDOW / 6, means, means.min())


def _reached(warming: Warming) -> float:
    return float(_running(warming).max())


def _peak_of_probe(warming: Warming, final: float, settling: Settling) -> float | None:
    """The highest running mean of the probe itself, where a warmer room had brought it clearly higher. [°C]"""
    peak = _reached(warming)
    u = math.hypot(settling.u_reached, settling.u_reading, settling.u_to_come)
    return peak if settling.settled and peak > final + 3 * u else None


def _means(warming: Warming, where: tuple[float, float]) -> tuple[float, float]:
    rows = (warming.time >= where[0] - 1e-9) & (warming.time <= where[1] + 1e-9)
    if not rows.any():
        rows[-1] = True
    return float(warming.probe[rows].mean()), float(warming.ambient[rows].mean())


def _part(soak: Soak, where: tuple[float, float]) -> Point:
    """The samples that count, of the last table that they lie in."""
    first = int(np.searchsorted(soak.time, where[0] - 1e-9))
    stop = max(first + 1, int(np.searchsorted(soak.time, where[1] + 1e-9, side="right")))
    return soak.cut(min(first, soak.time.size - 1), stop).parts[-1]


def _with_errors(part: Point, key: str, temperature: float, settling: Settling) -> Value:
    """A temperature with the errors of its thermometer, of its spread, and of what is still to come."""
    value = part.bench.correct(key, temperature)
    freedom = settling.degrees_of_freedom
    if not settling.settled:
        return value + of_source(settling.u_reached, Source(f"spread of {key} where it was highest", "A", freedom))
    value = value + of_source(settling.u_reading, Source(f"spread of {key} over the last part", "A", freedom))
    return value + of_source(settling.u_to_come, Source(f"what is still to come of {key}", "A", freedom))


def _ambient(part: Point, soak: Soak, mean: float, step: float) -> Estimate | None:
    stated = soak.parts[0].log.stated
    unstated = frozenset() if part.bench.is_stated(AMBIENT) else frozenset({AMBIENT})
    if soak.has(AMBIENT) and np.isfinite(soak.samples(AMBIENT)).any():
        value = part.bench.correct(AMBIENT, mean) + _rounding(part, AMBIENT, step)
        return Estimate(value, unstated)
    return Estimate(part.bench.stated(AMBIENT, stated[AMBIENT]), unstated) if AMBIENT in stated else None


def _rounding(part: Point, key: str, step: float) -> Value:
    """The error of a display's steps, where the spread is too small to average it out and the instrument has it not."""
    samples = part.samples(key)
    deviation = float(np.nanstd(samples)) if np.isfinite(samples).any() else 0.0
    if step <= RESOLUTION_COVERS * part.bench.stated_step(key) or deviation > 0.5 * step:
        return 0.0
    return of_source(converter_step_uncertainty(step), Source(f"{key}: steps of its readings", "B"))


def _bound(settling: Settling) -> str:
    return "" if settling.settled else f"not settled: {settling.reason}"


def _told(settling: Settling, peak: float | None) -> str:
    if not settling.settled:
        return f"highest mean over {duration(WINDOW / 6)} {settling.reached_at / 60:.3g} min after the soak's start"
    if peak is not None:
        return f"highest mean over {duration(WINDOW / 6)}, in a warmer room than at the end"
    if settling.overshot:
        return "the highest that it held, before it fell"
    change = f"{_kelvins((settling.slope.rate if settling.slope else 0.0) * WINDOW)} in the last {duration(WINDOW)}"
    return f"moved {change}; mean over it, and {_kelvins(settling.to_come)} still to come{_taus(settling)}"


def _kelvins(difference: float) -> str:
    """A small difference; what no thermometer reads is told as less than that."""
    return f"{difference:.2g} K" if abs(difference) >= _LEAST_TOLD else f"less than {_LEAST_TOLD:g} K"


def _taus(settling: Settling) -> str:
    """The time constants, where the soak shows them."""
    curve = settling.curve
    if curve is None or curve.u_log_tau > _SHOWN:
        return ""
    several = "s" if len(curve.taus) > 1 else ""
    return f" (time constant{several} {' and '.join(duration(tau) for tau in curve.taus)})"


def probe_key(name: str) -> str:
    """The channel of a probe as the log names it."""
    return channel_key("temperature", name.strip().lower())
