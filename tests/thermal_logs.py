"""Soaks of units that are known in closed form, in rooms that drift or cycle, read by thermometers that round."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass

import numpy as np
import pandas as pd
from numpy.typing import NDArray

from acceptance.bench.log import BenchLog, Channel, Doubt
from acceptance.limitfile.limits import Limits
from acceptance.points.dwells import Dwell
from acceptance.points.point import Points, measure_points

Floats = NDArray[np.float64]
HOUR = 3600.0


@dataclass(frozen=True)
class Room:
    """Ambient temperature: base + drift t + swing sin(2 pi t / period + phase). [°C, K/s, K, s]"""

    base: float = 23.0
    drift: float = 0.0
    swing: float = 0.0
    period: float = HOUR
    phase: float = 0.0

    def at(self, time: Floats) -> Floats:
        return self.base + self.drift * time + self.swing * np.sin(2 * np.pi * time / self.period + self.phase)

    def lag(self, time: Floats, tau: float) -> Floats:
        """Room minus what a body of one time constant, at the room's temperature at t = 0, has made of it.

        Solved by hand: x' = (room - x)/tau.
        """
        w, a = 2 * np.pi / self.period, np.exp(-time / tau)
        drift = self.drift * tau * (1 - a)
        # x = base + swing Im(e^{i phase} (e^{iwt}/(1+iw tau) + K e^{-t/tau})) with x(0) = room(0)
        unit = np.exp(1j * self.phase)
        z = 1 / (1 + 1j * w * tau)
        follows = self.swing * np.imag(unit * (z * np.exp(1j * w * time) + (1 - z) * a))
        return drift + self.swing * np.sin(w * time + self.phase) - follows


@dataclass(frozen=True)
class Body:
    """A probe's rise: sum of parts (1 - exp(-t/tau)); it follows its room with the longest time constant. [K, s]"""

    parts: Sequence[float]
    taus: Sequence[float]
    start: float = 0.0  # the rise that was there already, of the slowest part

    @property
    def final(self) -> float:
        return float(sum(self.parts))

    def rise(self, time: Floats) -> Floats:
        rises = sum(part * -np.expm1(-time / tau) for part, tau in zip(self.parts, self.taus, strict=True))
        return rises + self.start * np.exp(-time / max(self.taus))

    def probe(self, time: Floats, room: Room) -> Floats:
        return room.at(time) + self.rise(time) - room.lag(time, max(self.taus))


@dataclass(frozen=True)
class Thermometer:
    """Noise of each reading, and the step it is rounded to. [K]"""

    noise: float = 0.03
    step: float = 0.01

    def read(self, truth: Floats, random: np.random.Generator) -> Floats:
        readings = truth + self.noise * random.standard_normal(truth.size)
        return np.round(readings / self.step) * self.step if self.step else readings


@dataclass(frozen=True)
class Table:
    """Rows of one stage of one file."""

    stage: str
    columns: Mapping[str, Floats]
    name: str = ""


def soak_table(
    bodies: Mapping[str, Body],
    *,
    lasts: float,
    interval: float = 30.0,
    room: Room | None = None,
    thermometer: Thermometer | None = None,
    load: float = 1.0,
    seed: int = 1,
) -> Table:
    """A thermal stage of a 12 V, 4 A unit at a load."""
    random = np.random.default_rng(seed)
    room, thermometer = room or Room(), thermometer or Thermometer()
    time = np.arange(0.0, lasts + interval / 2, interval)
    columns = {
        "time": time,
        "input_voltage": np.full(time.size, 230.0),
        "output_current main": np.full(time.size, 4.0 * load),
        "ambient_temperature": thermometer.read(room.at(time), random),
    }
    columns |= {f"temperature {n}": thermometer.read(b.probe(time, room), random) for n, b in bodies.items()}
    return Table("thermal", columns)


def points_of(
    tables: Sequence[Table],
    limits: Limits,
    *,
    doubts: Sequence[Doubt] = (),
    stated: Mapping[str, float] | None = None,
    stages_from: str = "file name",
    dwells: Sequence[tuple[int, int]] = (),
    seconds: bool = True,
    step: float = 0.0,
) -> Points:
    """Points of a log of these tables, one file each; `step` is that of the last digit of a temperature."""
    frames = []
    for index, table in enumerate(tables):
        frame = pd.DataFrame(dict(table.columns))
        frame["stage"], frame["table"] = table.stage, index
        frame["line"] = np.arange(2, len(frame) + 2)
        frames.append(frame)
    whole = pd.concat(frames, ignore_index=True)
    whole["stage"] = pd.Categorical(whole["stage"])
    names = tuple(table.name or f"T-1_{table.stage}_{n}.csv" for n, table in enumerate(tables))
    keys = [key for key in whole.columns if key not in ("stage", "table", "line")]
    channels = tuple(_channel(key, name, seconds, step) for name in names for key in keys)
    log = BenchLog(
        "T-1", whole, channels, (), names, doubts=tuple(doubts), stated=dict(stated or {}), stages_from=stages_from
    )
    found = [Dwell(a, b, a, str(whole["stage"][a]), 0, "load setting", 0.0) for a, b in dwells]
    return measure_points(log, found, limits)


def _channel(key: str, file: str, seconds: bool, step: float) -> Channel:
    quantity, _, qualifier = key.partition(" ")
    unit_from = "not a number" if key == "time" and not seconds else "heading"
    digits = step if quantity.endswith("temperature") else 0.0
    return Channel(key, quantity, qualifier, key, "", unit_from, 1.0, 0.0, "built", file, digits)


def winding_tables(
    *,
    cold: float = 0.4,
    room: float = 23.0,
    rise: Body | None = None,
    first: float = 10.0,
    readings: int = 30,
    every: float = 10.0,
    noise: float = 2e-5,
    material: float = 234.5,
    seed: int = 2,
) -> tuple[Table, Table]:
    """A winding cold, and cooling from a rise that falls as its body's parts and time constants say. [ohm, K]"""
    random = np.random.default_rng(seed)
    body = rise or Body([10.0, 50.0], [60.0, 1800.0])
    ohms = cold * (1 + noise * random.standard_normal(8))
    before = {"time": 5.0 * np.arange(8.0), "winding_resistance": ohms, "ambient_temperature": np.full(8, room)}
    time = first + every * np.arange(float(readings))
    falls = sum(part * np.exp(-time / tau) for part, tau in zip(body.parts, body.taus, strict=True))
    warm = cold * (material + room + falls) / (material + room) * (1 + noise * random.standard_normal(readings))
    after = {"time": time, "winding_resistance": warm, "ambient_temperature": np.full(readings, room)}
    return Table("cold", before), Table("cooling", after)
