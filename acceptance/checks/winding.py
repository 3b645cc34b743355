"""A winding's temperature by the change of its resistance: stages cold, thermal and cooling together."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from acceptance.bench.log import channel_key
from acceptance.checks.warm import AMBIENT, Warm, ambient_of, probe_warming
from acceptance.errors import MeasurementError
from acceptance.limitfile.model import Temperature, TemperatureRise
from acceptance.points.point import Estimate, Point, Points
from acceptance.points.propagation import Source, Value, of_source
from acceptance.printing import duration
from acceptance.thermal.resistance import (
    MATERIALS,
    Extrapolation,
    Material,
    temperature_by_resistance,
    to_switch_off,
)
from acceptance.thermal.settling import Settling, settling_of
from acceptance.thermal.soak import Soak, seconds_of, thermal_stretches
from acceptance.thermal.warming import WINDOW, Warming, blocks_of

__all__ = ["Cooling", "warm_winding", "winding_key"]

Floats = NDArray[np.float64]

_STEADY_COLD = 0.5  # the cold winding may move by so much [K]
_SAME_COLD = 2.0  # the probes may differ from the ambient by so much while cold [K]
_LATEST = 120.0  # the first reading after switch-off [s]
_OVER_RANGE = 2.0  # a winding whose resistance doubles is 250 K warmer: it is another one, or another range


@dataclass(frozen=True, slots=True)
class Cold:
    """The winding before the test."""

    resistance: Estimate  # [ohm]
    ambient: Estimate  # [°C]


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
    cold = _cold(points, key, material)
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
    unsettled = f"not settled ({watched}): {settling.reason}; let it run on, and record all of it"
    late = "" if cooling.drawn is not None else _late(cooling.time)
    found = Warm(
        soak,
        temperature,
        end,
        settling,
        warming,
        late or ("" if settling.settled else unsettled),
        _told(cooling, cold, material),
        _notes(material, watched),
    )
    return found, cooling


def _cooled(stretch: Point, key: str, cold: Cold, material: Material, *, room: float) -> Cooling:
    """The winding after switch-off, drawn back to it where its first reading came soon enough."""
    time, readings = _read(stretch, key, cold)
    heated = temperature_by_resistance(
        cold.resistance.nominal, readings, start=cold.ambient.nominal, constant=material.constant
    )
    soon = time[0] <= min(_LATEST, float(time[-1] - time[0]))
    return Cooling(stretch.where, time, heated, room, to_switch_off(time, heated - room) if soon else None)


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


# --- cold -------------------------------------------------------------------------------------------------------------


def _cold(points: Points, key: str, material: Material) -> Cold:
    stretches = [s for s in points.stretches("cold") if s.has(key) and np.isfinite(s.samples(key)).any()]
    if not stretches:
        msg = f"there is no stage cold with {key}: measure the winding and the ambient before the unit is switched on"
        raise MeasurementError(msg)
    found = [_one_cold(stretch, key, material) for stretch in stretches]
    values = [
        one.resistance.nominal * (material.constant + 20) / (material.constant + one.ambient.nominal) for one in found
    ]
    spread = (max(values) / min(values) - 1) * (material.constant + 20)
    if spread > 2 * _STEADY_COLD:
        places = " and ".join(stretch.where for stretch in stretches)
        msg = f"the cold resistances differ by {spread:.2g} K ({places}); leave in the one that belongs to this unit"
        raise MeasurementError(msg)
    return found[-1]


def _one_cold(stretch: Point, key: str, material: Material) -> Cold:
    stretch.require(key)
    resistance = _reading(stretch, key)
    ambient = _ambient_at(stretch)
    if not resistance.nominal > 0:
        msg = f"{key} reads {resistance.nominal:.4g} ohm while cold ({stretch.where}): not above zero"
        raise MeasurementError(msg)
    samples = stretch.samples(key)[np.isfinite(stretch.samples(key))]
    if samples.size >= 4:
        quarter = max(1, samples.size // 4)
        change = float(samples[-quarter:].mean() - samples[:quarter].mean())
        moved = change / resistance.nominal * (material.constant + ambient.nominal)
        noise = 3 * float(samples.std()) * math.sqrt(2 / quarter) / resistance.nominal * (material.constant + 20)
        if abs(moved) > max(_STEADY_COLD, noise if noise < 2 * _STEADY_COLD else 0.0):
            msg = (
                f"the winding was not at rest while cold: it moved by {moved:.2g} K ({stretch.where}); leave the unit "
                "off until it has the temperature of the room, and measure it again"
            )
            raise MeasurementError(msg)
    _see_to_probes_cold(stretch, ambient.nominal)
    return Cold(resistance, ambient)


def _see_to_probes_cold(stretch: Point, ambient: float) -> None:
    for name in stretch.log.keys("temperature"):
        samples = stretch.samples(name)
        if np.isfinite(samples).any():
            apart = float(np.nanmedian(samples)) - ambient
            if abs(apart) > _SAME_COLD:
                msg = (
                    f"{name} stands {abs(apart):.2g} K {'above' if apart > 0 else 'below'} the ambient while cold "
                    f"({stretch.where}): the winding did not have the room's temperature; leave the unit off for longer"
                )
                raise MeasurementError(msg)


def _ambient_at(stretch: Point) -> Estimate:
    """The ambient of a stretch, as logged or as stated."""
    if stretch.has(AMBIENT) and np.isfinite(stretch.samples(AMBIENT)).any():
        stretch.require(AMBIENT)
        return _reading(stretch, AMBIENT)
    if AMBIENT in stretch.log.stated:
        unstated = frozenset() if stretch.bench.is_stated(AMBIENT) else frozenset({AMBIENT})
        return Estimate(stretch.bench.stated(AMBIENT, stretch.log.stated[AMBIENT]), unstated)
    msg = f"no ambient temperature was logged with the winding ({stretch.where}); record it beside the resistance"
    raise MeasurementError(msg)


def _reading(stretch: Point, key: str) -> Estimate:
    """Mean of a channel over a stretch, with the errors of its instrument, its digits and its spread."""
    spread = stretch.mean(key)
    source = Source(f"spread of {key} while {stretch.dwell.stage}", "A", spread.degrees_of_freedom)
    value = stretch.bench.correct(key, spread.mean) + stretch.rounding(key, spread.deviation or 0.0)
    value = value + of_source(spread.standard_uncertainty or 0.0, source)
    unstated = frozenset() if stretch.bench.is_stated(key) else frozenset({key})
    return Estimate(value, unstated, single=spread.readings == 1)


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
    return (
        f"the first reading after switch-off came after {duration(float(time[0]))}, too late to be drawn back from; "
        "take it within 30 s, and go on for some minutes"
    )


# --- thermal ----------------------------------------------------------------------------------------------------------


def _end(soak: Soak) -> Estimate:
    """The ambient over the last part of the soak."""
    last = soak.cut(int(np.searchsorted(soak.time, soak.time[-1] - WINDOW)), soak.time.size).parts[-1]
    last.require("time", *([AMBIENT] if last.has(AMBIENT) else []))
    return _ambient_at(last)


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


def _notes(material: Material, where: str) -> tuple[str, ...]:
    return (
        f"by change of resistance, the mean of the winding; constant {material.source}",
        f"that the soak had settled is told by {where}",
    )
