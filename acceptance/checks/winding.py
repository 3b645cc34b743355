"""A winding's temperature by the change of its resistance: stages cold, thermal and cooling together."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from acceptance.bench.log import channel_key
from acceptance.checks.cold_winding import Cold, ambient_at, cold_winding
from acceptance.checks.warm import AMBIENT, Warm, ambient_of, probe_warming
from acceptance.errors import MeasurementError
from acceptance.limitfile.model import Temperature, TemperatureRise
from acceptance.points.point import Estimate, Point, Points
from acceptance.points.propagation import Source, Value, coverage_factor, of_source
from acceptance.printing import duration
from acceptance.thermal.resistance import (
    MATERIALS,
    Extrapolation,
    Material,
    temperature_by_resistance,
    to_switch_off,
)
from acceptance.thermal.rooms import ambient_doubt
from acceptance.thermal.settling import Settling, settling_of
from acceptance.thermal.soak import Soak, seconds_of, thermal_stretches
from acceptance.thermal.warming import WINDOW, Warming, blocks_of

__all__ = ["Cooling", "warm_winding", "winding_key"]

Floats = NDArray[np.float64]

_LATEST = 120.0  # the first reading after switch-off [s]
_OPEN, _OPEN_LEAST = 0.2, 5.0  # of the rise, and in K: so little known it is not told
_COUNTS_ON = 3600.0  # a first reading so late is rather one of a time that counts on from the soak's start [s]
_OVER_RANGE = 2.0  # a winding whose resistance doubles is 250 K warmer: it is another one, or another range


@dataclass(frozen=True, slots=True)
class Cooling:
    """A winding drawn back to switch-off, for its figure."""

    where: str
    time: Floats  # [s]
    temperatures: Floats  # [°C]
    room: float  # [°C]
    drawn: Extrapolation | None

    @property
    def hottest(self) -> float:
        """At switch-off; at the first reading where that came too late to be drawn back from. [°C]"""
        return self.room + self.drawn.rise if self.drawn is not None else float(self.temperatures[0])


def winding_key(points: Points, probe: str) -> str:
    """The channel of a winding's resistance: that of its name, or the only one."""
    named = channel_key("winding_resistance", probe.strip().lower())
    return named if named in points.log.samples else "winding_resistance"


def warm_winding(soak: Soak, points: Points, requirement: TemperatureRise | Temperature) -> tuple[Warm, Cooling]:
    """How warm a winding was at the end of a soak.

    Raises
    ------
    MeasurementError
        With what is missing of the three stages, or cannot be true about them.
    """
    if soak.fault:
        raise MeasurementError(soak.fault)
    key = winding_key(points, requirement.probe)
    if key not in points.log.samples:
        msg = f"{key} was not logged; measure it cold, and while the winding cools after switch-off"
        raise MeasurementError(msg)
    material = MATERIALS[requirement.material or "copper"]
    cold = cold_winding(points, key, material)
    stretch = _cooling_of(soak, points, key)
    end = _end(soak)
    cooling = _cooled(stretch, key, cold, material, room=_room(stretch, end))
    settling, warming, watched = _soaked(soak, key, requirement, cold, material)
    temperature = Estimate.of(
        _temperature(cooling, stretch, key, cold, material) + _to_come(settling, cooling.hottest - end.nominal),
        cold.resistance,
        cold.ambient,
        Estimate(0.0, frozenset() if stretch.bench.is_stated(key) else frozenset({key})),
    )
    unsettled = f"not settled ({watched}): {settling.reason}"
    late = "" if cooling.drawn is not None else _late(cooling.time)
    absolute = isinstance(requirement, Temperature) and requirement.adjust == "none"
    doubted = "" if absolute else ambient_doubt(warming)
    found = Warm(
        soak,
        temperature,
        end,
        settling,
        warming,
        soak.ended or late or ("" if settling.settled else unsettled) or doubted,
        _told(cooling, cold, material),
        _notes(points, key, material, watched),
    )
    return found, cooling


def _cooled(stretch: Point, key: str, cold: Cold, material: Material, *, room: float) -> Cooling:
    """The winding after switch-off, drawn back to it where its first reading came soon enough."""
    time, readings = _read(stretch, key, cold)
    heated = temperature_by_resistance(
        cold.resistance.nominal, readings, start=cold.ambient.nominal, constant=material.constant
    )
    soon = time[0] <= min(_LATEST, float(time[-1] - time[0]))
    drawn = to_switch_off(time, heated - room) if soon else None
    if drawn is not None:
        _see_to_drawing(drawn, stretch)
    return Cooling(stretch.where, time, heated, room, drawn)


def _see_to_drawing(drawn: Extrapolation, stretch: Point) -> None:
    """See to it that the readings tell what the winding had at switch-off."""
    open_by = coverage_factor(0.95, drawn.degrees_of_freedom) * drawn.u
    if open_by > max(_OPEN_LEAST, _OPEN * drawn.rise):
        msg = (
            f"the readings after switch-off ({stretch.where}) leave the rise open by {open_by:.2g} K, too far: see "
            "whether a contact changed; take the first within 30 s and at least twenty within 5 min, with a meter that "
            "shows a thousandth of the cold resistance"
        )
        raise MeasurementError(msg)


def _temperature(cooling: Cooling, stretch: Point, key: str, cold: Cold, material: Material) -> Value:
    """The winding's temperature at switch-off, or at the first reading, with its errors. [°C]"""
    warm = _resistance_at(cooling.hottest, cold, material)
    constant = material.constant + of_source(material.bound / math.sqrt(3), Source(f"constant of {material.name}", "B"))
    value: Value = temperature_by_resistance(
        cold.resistance.value,
        stretch.bench.correct(key, warm) + stretch.rounding(key, 0.0),
        start=cold.ambient.value,
        constant=constant,
    )
    if cooling.drawn is None:
        return value
    source = Source("extrapolation to switch-off", "A", cooling.drawn.degrees_of_freedom)
    return value + of_source(cooling.drawn.u, source)


def _resistance_at(temperature: float, cold: Cold, material: Material) -> float:
    """[ohm]"""
    return cold.resistance.nominal * (material.constant + temperature) / (material.constant + cold.ambient.nominal)


# --- cooling ----------------------------------------------------------------------------------------------------------


def _cooling_of(soak: Soak, points: Points, key: str) -> Point:
    """The cooling that followed a soak."""
    stretches = [s for s in points.stretches("cooling") if s.has(key) and np.isfinite(s.samples(key)).any()]
    if not stretches:
        msg = f"there is no stage cooling with {key}: read the winding after switch-off, the first time within 30 s"
        raise MeasurementError(msg)
    soaks = [stretch.parts[0].dwell.first for stretch in thermal_stretches(points)] or [soak.parts[0].dwell.first]
    if len(stretches) != len(soaks):
        msg = (
            f"there are {len(soaks)} soaks and {len(stretches)} coolings, so that it is open which belong together; "
            "log one cooling for each soak, or judge them apart"
        )
        raise MeasurementError(msg)
    mine = max(i for i, first in enumerate(soaks) if first <= soak.parts[0].dwell.first) if len(soaks) > 1 else 0
    return stretches[mine]


def _read(stretch: Point, key: str, cold: Cold) -> tuple[Floats, Floats]:
    """Time from switch-off and resistance of every reading of the cooling."""
    stretch.require("time", key)
    time = seconds_of(stretch)
    table = stretch.log.tables[stretch.dwell.table]
    clocks = any(
        c.key == "time" and c.unit_from == "not a number" and c.file in ("", table) for c in stretch.log.channels
    )
    if time is None or clocks:
        found = "has no time that rises" if time is None else "carries clock times"
        msg = f"the cooling {found} ({stretch.where}); log the seconds from switch-off, since all is drawn back to it"
        raise MeasurementError(msg)
    known = np.isfinite(stretch.samples(key))
    time, readings = time[known], stretch.samples(key)[known]
    if not time[0] > 0:
        msg = (
            f"the first reading of the cooling stands at {time[0]:g} s ({stretch.where}): nothing can be read at the "
            "moment of switch-off itself; log the seconds from switch-off"
        )
        raise MeasurementError(msg)
    ratio = readings / cold.resistance.nominal
    if not (readings > 0).all() or float(ratio.max()) > _OVER_RANGE or float(ratio.min()) < 0.8:
        msg = (
            f"{key} is {float(ratio.min()):.3g} to {float(ratio.max()):.3g} times its cold value while cooling "
            f"({stretch.where}): not the same winding, or another range of the meter"
        )
        raise MeasurementError(msg)
    if time.size > 2000:
        time, readings = blocks_of(time, readings)
    return time, readings


def _room(stretch: Point, end: Estimate) -> float:
    """The ambient that the winding cools towards: that of the soak's end where none was logged. [°C]"""
    if stretch.has(AMBIENT) and np.isfinite(stretch.samples(AMBIENT)).any():
        return float(np.nanmean(stretch.samples(AMBIENT)))
    return end.nominal


def _late(time: Floats) -> str:
    if time[0] > _COUNTS_ON:
        return (
            f"the time of the cooling begins at {time[0]:.5g} s: log the seconds from switch-off, not those from the "
            "soak's start, and the first reading within 30 s"
        )
    return (
        f"the first reading after switch-off came after {duration(float(time[0]))}, too late to be drawn back from; "
        "take it within 30 s, and go on for some minutes"
    )


# --- thermal ----------------------------------------------------------------------------------------------------------


def _end(soak: Soak) -> Estimate:
    """The ambient over the last part of the soak."""
    last = soak.cut(int(np.searchsorted(soak.time, soak.time[-1] - WINDOW)), soak.time.size).parts[-1]
    last.require("time", *([AMBIENT] if last.has(AMBIENT) else []))
    return ambient_at(last)


def _soaked(
    soak: Soak, key: str, requirement: TemperatureRise | Temperature, cold: Cold, material: Material
) -> tuple[Settling, Warming, str]:
    """The least settled of what was watched during the soak, and what that was."""
    limits = soak.parts[0].limits
    allowed = requirement.settled.difference / requirement.settled.interval
    watched: list[tuple[Settling, Warming, str]] = []
    for warming, steps, name in _watched(soak, key, cold, material):
        settling = settling_of(warming, allowed=allowed, confidence=limits.decision.confidence, steps=steps)
        watched.append((settling, warming, name))
    if not watched:
        msg = (
            f"nothing was logged in the soak that shows whether it had settled ({soak.where}); log a probe, or the "
            "winding's resistance, and the ambient"
        )
        raise MeasurementError(msg)
    return max(watched, key=lambda one: (not one[0].settled, one[0].slope_bound))


def _watched(
    soak: Soak, key: str, cold: Cold, material: Material
) -> Sequence[tuple[Warming, tuple[float, float], str]]:
    found = []
    for name in soak.parts[0].log.keys("temperature"):
        if soak.has(name) and np.isfinite(soak.samples(name)).any():
            warming, steps, _ = probe_warming(soak, name)
            found.append((warming, steps, name))
    if soak.has(key) and np.isfinite(soak.samples(key)).any():
        readings = temperature_by_resistance(
            cold.resistance.nominal, soak.samples(key), start=cold.ambient.nominal, constant=material.constant
        )
        ambient = ambient_of(soak)
        room = ambient if isinstance(ambient, np.ndarray) else np.full(soak.time.size, ambient or 0.0)
        time, probe, around = blocks_of(soak.time, readings, room)
        if time.size > 1:
            found.append((Warming(time, probe, around, soak.lasts), (0.0, 0.0), key))
    return found


def _to_come(settling: Settling, rise: float) -> Value:
    """What is still to come of the winding: as much of its rise as of what was watched."""
    if not settling.settled or not settling.rise > 0:
        return 0.0
    share = rise / settling.rise
    u = abs(share) * settling.u_to_come
    source = Source("what is still to come, as of the slowest probe", "A", settling.degrees_of_freedom)
    return share * settling.to_come + of_source(u, source)


def _told(cooling: Cooling, cold: Cold, material: Material) -> str:
    warm = _resistance_at(cooling.hottest, cold, material)
    scale, unit = (1000.0, "mohm") if cold.resistance.nominal < 1 else (1.0, "ohm")
    resistances = (
        f"{scale * cold.resistance.nominal:.5g} {unit} at {cold.ambient.nominal:.3g} °C, {scale * warm:.5g} {unit}"
    )
    drawn = cooling.drawn
    if drawn is None:
        return f"{resistances} {duration(float(cooling.time[0]))} after switch-off"
    first, last = duration(float(drawn.time[0])), duration(float(drawn.time[-1]))
    return f"{resistances} at switch-off, drawn back by {drawn.drawn:.2g} K from {first} to {last} by {drawn.method}"


def _notes(points: Points, key: str, material: Material, where: str) -> tuple[str, ...]:
    notes = (
        f"by change of resistance, the mean of the winding; constant {material.source}",
        f"that the soak had settled is told by {where}",
    )
    cold = [s for s in points.stretches("cold") if s.has(key)]
    probes = points.log.keys("temperature")
    if any(s.has(name) and np.isfinite(s.samples(name)).any() for s in cold for name in probes):
        return notes
    unseen = (
        "no probe was logged while cold: that the winding had the room's temperature then is not shown; each kelvin it "
        "was warmer takes more than one kelvin from the rise"
    )
    return (*notes, unseen)
