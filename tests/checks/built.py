"""Bench logs built by hand, with the truth known in closed form."""

from __future__ import annotations

import tempfile
from collections.abc import Mapping, Sequence
from pathlib import Path

import numpy as np
import pandas as pd

from acceptance.bench.log import BenchLog, Channel, Doubt
from acceptance.limitfile.limits import Limits
from acceptance.limitfile.load import load_limits
from acceptance.points.dwells import Dwell
from acceptance.points.point import Points, measure_points

HEAD = """
acceptance: 1
product: {name: "Check rail 12", revision: A, protection_class: I}
ratings:
  input: {supply: ac, voltage: 230 V, range: [207 V, 253 V], frequency: 50 Hz}
  outputs:
    main: {voltage: 12 V, current: 4 A}
"""

INSTRUMENTS = """
instruments:
  input_power: {device: P1, accuracy: "0.1 % reading + 0.02 W"}
  output_voltage: {device: M1, accuracy: "0.02 % reading + 2 mV"}
  output_current: {device: L1, accuracy: "0.05 % reading + 1 mA"}
  ripple: {device: S1, accuracy: "3 % reading"}
"""


def limits_from(requirements: str, *, head: str = HEAD, bench: str = INSTRUMENTS, decision: str = "") -> Limits:
    """Limits read from text."""
    with tempfile.TemporaryDirectory() as folder:
        path = Path(folder) / "limits.yaml"
        path.write_text(head + bench + decision + "\nlimits:\n" + requirements, encoding="utf-8")
        return load_limits(path)


def points_from(
    dwells: Sequence[Mapping[str, float | Sequence[float]]],
    limits: Limits,
    *,
    stage: str = "steady",
    doubts: Sequence[Doubt] = (),
    stated: Mapping[str, float] | None = None,
    samples: int = 1,
) -> Points:
    """Points of a log with these dwells, one after the other.

    Each dwell maps channels to a value, repeated `samples` times, or to its samples; ten rows of transition, which
    belong to no dwell, stand before each but the first.
    """
    frames, spans, at = [], [], 0
    for dwell in dwells:
        n = max(len(v) if isinstance(v, Sequence) else samples for v in dwell.values())
        frame = pd.DataFrame({key: np.broadcast_to(np.asarray(v, dtype=float), n) for key, v in dwell.items()})
        frames.append(frame)
        spans.append((at, at + n))
        at += n
    table = pd.concat(frames, ignore_index=True)
    channels = tuple(_channel(key) for key in table.columns)
    table["time"] = np.arange(len(table), dtype=float)
    table["stage"] = pd.Categorical([stage] * len(table))
    table["table"] = 0
    table["line"] = np.arange(2, len(table) + 2)
    log = BenchLog("T-1", table, channels, (), ("T-1.csv",), doubts=tuple(doubts), stated=dict(stated or {}))
    found = [Dwell(a, b, a, stage, 0, "load setting", 0.0) for a, b in spans]
    return measure_points(log, found, limits)


def _channel(key: str) -> Channel:
    quantity, _, qualifier = key.partition(" ")
    return Channel(key, quantity, qualifier, key, "", "heading", 1.0, 0.0, "built", "T-1.csv")


def adapter(load: float, *, volts: float = 12.0, resistance: float = 0.02, vin: float = 230.0) -> dict[str, float]:
    """One reading of a 12 V, 4 A unit with a droop, and losses of 0.5 W + 0.4 W/A I + 0.1 ohm I^2."""
    current = 4.0 * load
    voltage = volts - resistance * current
    power = voltage * current + 0.5 + 0.4 * current + 0.1 * current**2
    return {
        "input_voltage": vin,
        "input_power": power,
        "output_voltage main": voltage,
        "output_current main": current,
        "ripple main": 0.02 + 0.01 * load,
    }
