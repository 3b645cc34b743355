"""Logs of overloads built by hand: what the output truly does in closed form, then read through meters."""

from __future__ import annotations

import math
from collections.abc import Callable, Sequence
from dataclasses import dataclass, field, replace

import numpy as np
import pandas as pd
from numpy.typing import NDArray

from acceptance.bench.log import BenchLog, Channel
from acceptance.limitfile.limits import Limits
from tests.checks.built import HEAD, limits_from

Floats = NDArray[np.float64]

VOLTS, AMPERES = 12.0, 4.0  # rated
BRANCH = 12.05, 0.02  # no-load voltage and resistance [V, ohm]
DROOP = 0.05 * VOLTS
STATIC = ("constant current", "constant power", "foldback")

ACCURATE = """
instruments:
  output_voltage: {device: M1, accuracy: "0.1 % reading + 6 mV"}
  output_current: {device: L1, accuracy: "0.2 % reading + 4 mA"}
"""
EVERYTHING = """
  overcurrent:
    - name: ocp
      at: {input: any}
      behaviour: any
      onset: [105 %, 150 %]
      short_circuit: {max: 200 %}
      recovery: {within: 2 s, band: 3 %}
"""


def limits_for(requirements: str = EVERYTHING, *, bench: str = ACCURATE, decision: str = "") -> Limits:
    """Limits of the unit whose overloads are built here."""
    return limits_from(requirements, head=HEAD, bench=bench, decision=decision)


@dataclass(frozen=True)
class Unit:
    """An output and its limiter. Currents in A."""

    kind: str  # one of the kinds, or "constant current, then latch off"
    onset: float  # knee of a limiter at the branch's voltage; or where it trips
    short: float = 1.6  # foldback: into a short
    slope: float = 0.02  # constant current: more of it into a short than at the knee, as a share
    burst: float = 5.0  # hiccup: what it can give while it tries
    period: float = 0.5  # hiccup [s]
    on: float = 0.1  # hiccup [s]
    latch_at: float = 0.4  # of rated voltage: where a combination latches

    def limit(self, volts: float) -> float:
        """Current that a limiter lets through at a voltage."""
        share = volts / BRANCH[0]
        if self.kind == "foldback":
            return self.short + (self.onset - self.short) * share
        if self.kind == "constant power":
            return self.onset * BRANCH[0] / max(volts, 0.02 * BRANCH[0])
        return self.onset * (1 + self.slope * (1 - share))

    def true_onset(self, mode: str) -> float:
        """Where the limiter's curve lies the droop below the branch; where the others trip.

        In CC mode there is nothing between the branch and the collapse, but for a constant power.
        """
        if self.kind in ("hiccup", "latch off"):
            return self.onset
        below = 0.0 if mode == "CC" and self.kind != "constant power" else DROOP
        current = self.onset
        for _ in range(50):  # the branch's slope is small, so this settles at once
            current = self.limit(BRANCH[0] - BRANCH[1] * current - below)
        return current


@dataclass(frozen=True)
class Load:
    """One setting, held for a number of samples."""

    mode: str
    setting: float
    samples: int


def on_branch(load: Load) -> tuple[float, float]:
    """Volts and amperes, were there no limiter."""
    v0, r = BRANCH
    if load.mode == "CC":
        return v0 - r * load.setting, load.setting
    if load.mode == "CR":
        current = v0 / (load.setting + r)
        return current * load.setting, current
    volts = min(load.setting, v0)
    return volts, (v0 - volts) / r


def limited(unit: Unit, load: Load) -> tuple[float, float]:
    """Volts and amperes where the load meets the limiter, or the branch."""
    volts, current = on_branch(load)
    if current <= unit.limit(volts):
        return volts, current
    if load.mode == "CV":
        return volts, unit.limit(volts)
    if load.mode == "CC":
        if unit.kind == "constant power" and load.setting <= unit.limit(0.0):
            return unit.onset * BRANCH[0] / load.setting, load.setting
        return 0.0, min(load.setting, unit.limit(0.0))
    low, high = 0.0, BRANCH[0]
    for _ in range(60):
        middle = (low + high) / 2
        low, high = (middle, high) if unit.limit(middle) > middle / load.setting else (low, middle)
    return high, high / load.setting


@dataclass
class Log:
    """Samples as they truly are, and the settings behind them."""

    volts: list[float] = field(default_factory=list)
    amperes: list[float] = field(default_factory=list)
    loads: list[Load] = field(default_factory=list)

    def add(self, volts: Floats | float, amperes: Floats | float, load: Load) -> None:
        n = load.samples
        self.volts += np.broadcast_to(volts, n).tolist()
        self.amperes += np.broadcast_to(amperes, n).tolist()
        self.loads += [load] * n


def run(unit: Unit, loads: Sequence[Load], *, interval: float, rise: float = 0.02) -> Log:
    """A unit under one setting after the other; the last one is the return to a rated load."""
    log = Log()
    tripped: float | None = None  # for how long
    down = 0.0  # voltage under the overload, from which it returns
    for place, load in enumerate(loads):
        since = np.arange(load.samples) * interval
        volts, current = on_branch(load)
        if place == len(loads) - 1:
            if tripped is not None and unit.kind != "hiccup":
                log.add(0.0, 0.0, load)
                continue
            waits = 0.0 if tripped is None else (unit.period - math.fmod(tripped, unit.period)) % unit.period
            rising = np.where(since < waits, 0.0, volts - (volts - down) * np.exp(-np.maximum(since - waits, 0) / rise))
            log.add(rising, current * rising / max(volts, 1e-9), load)
        elif unit.kind in ("hiccup", "latch off"):
            tripped = _protected(log, unit, load, since, tripped=tripped)
        elif tripped is not None:
            log.add(0.0, 0.0, load)
        else:
            down, current = limited(unit, load)
            if unit.kind.endswith("latch off") and down < unit.latch_at * VOLTS:
                tripped = 0.0
                log.add(0.0, 0.0, load)
            else:
                log.add(down, current, load)
    return log


def _protected(log: Log, unit: Unit, load: Load, since: Floats, *, tripped: float | None) -> float | None:
    volts, current = on_branch(load)
    if tripped is None and current <= unit.onset:
        log.add(volts, current, load)
        return None
    begun = tripped or 0.0
    if unit.kind == "latch off":
        log.add(0.0, 0.0, load)
    else:
        on = np.mod(begun + since, unit.period) < unit.on
        gives = min(current, unit.burst)
        if load.mode == "CR":
            height = gives * load.setting
        elif load.mode == "CV":
            height = volts
        else:
            height = volts if current <= unit.burst else 0.0
        log.add(np.where(on, height, 0.0), np.where(on, gives, 0.0), load)
    return begun + since.size * (since[1] - since[0] if since.size > 1 else 0.0)


# --- settings ---------------------------------------------------------------------------------------------------------


def sweep(unit: Unit, mode: str, *, settings: int, samples: int, back: int, jitter: float = 0.5) -> list[Load]:
    """From light load through the onset into a short, in `settings` beyond rated load, and back to a rated load.

    `jitter` places the settings against the onset, 0 to 1 of a step.
    """
    v0, r = BRANCH
    rated = [0.3, 0.6, 0.8, 1.0]
    fine = max(3, settings // 2)
    nearer = 1.0 + (unit.onset / AMPERES - 1.0) * 1.12 * (np.arange(fine) + jitter) / (fine - 1 + jitter)
    if mode == "CC":
        beyond = [*(AMPERES * nearer), *(AMPERES * np.linspace(nearer[-1] + 0.05, nearer[-1] + 0.6, settings - fine))]
        levels = [*(AMPERES * share for share in rated), *beyond, 0.8 * AMPERES]
        return [Load(mode, float(x), samples) for x in levels[:-1]] + [Load(mode, float(levels[-1]), back)]
    lowest = 0.3 if unit.kind == "constant power" else 0.06
    shares = np.linspace(0.93, lowest, settings - fine + 2)
    if mode == "CV":
        levels = [v0 - r * AMPERES * share for share in rated]
        if unit.kind in ("hiccup", "latch off"):
            levels += [v0 - r * AMPERES * share for share in nearer]
        levels += [VOLTS * share for share in [0.985, 0.97, *shares, 0.008]]
        return [Load(mode, float(x), samples) for x in levels] + [Load(mode, v0 - r * 0.8 * AMPERES, back)]
    levels = [VOLTS / (AMPERES * share) for share in (*rated, *nearer)]
    levels += [VOLTS * share / unit.limit(VOLTS * share) for share in shares]
    levels = sorted(levels, reverse=True)
    return [Load(mode, float(x), samples) for x in (*levels, 0.02)] + [Load(mode, VOLTS / (0.8 * AMPERES), back)]


# --- reading it -------------------------------------------------------------------------------------------------------


@dataclass(frozen=True)
class Meters:
    """How the samples were read."""

    noise: float = 0.0  # standard deviation, of the rating
    digits: tuple[float, float] = (1e-3, 1e-3)  # [V, A]
    errors: Callable[[Floats, Floats], tuple[Floats, Floats]] | None = None  # what the instruments add
    average: int = 1  # samples that a slow meter averages over
    lead: float = 0.0  # the voltage is read behind it [ohm]


def read(log: Log, meters: Meters, *, rng: np.random.Generator, interval: float, setting: bool = True) -> pd.DataFrame:
    """What the logger wrote."""
    volts, amperes = np.array(log.volts), np.array(log.amperes)
    if meters.average > 1:
        kernel = np.full(meters.average, 1.0 / meters.average)
        volts, amperes = (np.convolve(x, kernel)[: x.size] for x in (volts, amperes))
    volts = volts - meters.lead * amperes
    if meters.errors is not None:
        volts, amperes = meters.errors(volts, amperes)
    volts = volts + rng.normal(0, meters.noise * VOLTS, volts.size)
    amperes = amperes + rng.normal(0, meters.noise * AMPERES, amperes.size)
    frame = pd.DataFrame({
        "time": np.arange(volts.size) * interval,
        "input_voltage": np.round(230 + rng.normal(0, 0.05, volts.size), 2),
        "output_voltage main": np.round(volts / meters.digits[0]) * meters.digits[0],
        "output_current main": np.round(amperes / meters.digits[1]) * meters.digits[1],
    })  # fmt: skip
    if setting:
        # a resistance that the output meets is the load's and its leads'
        leads = [meters.lead if load.mode == "CR" else 0.0 for load in log.loads]
        frame["load_setting main"] = np.array([load.setting for load in log.loads]) - leads
        frame["load_mode main"] = pd.Categorical([load.mode for load in log.loads])
    return frame


def log_of(frame: pd.DataFrame, *, stage: str = "overcurrent", stages_from: str = "file name") -> BenchLog:
    """The frame as a log; a `stage` and a `table` column in it are kept."""
    frame = frame.copy()
    numbers = [key for key in frame if key not in ("stage", "table", "load_mode main")]
    channels = tuple(_channel(key) for key in numbers)
    if "stage" not in frame:
        frame["stage"] = [stage] * len(frame)
    frame["stage"] = pd.Categorical(frame["stage"])
    if "table" not in frame:
        frame["table"] = 0
    frame["line"] = np.arange(2, len(frame) + 2)
    tables = tuple(f"T-1_{i}.csv" for i in range(int(frame["table"].max() if len(frame) else 0) + 1))
    return BenchLog("T-1", frame, channels, (), tables, stages_from=stages_from)


def _channel(key: str) -> Channel:
    quantity, _, qualifier = key.partition(" ")
    units = {"output_voltage": "V", "output_current": "A", "time": "s", "input_voltage": "V"}
    step = 1e-3 if quantity in ("output_voltage", "output_current") else 0.0
    unit = units.get(quantity, "")
    return Channel(key, quantity, qualifier, key, unit, "assumed", 1.0, 0.0, "built", "T-1.csv", step)


def built(
    unit: Unit,
    mode: str = "CR",
    *,
    settings: int = 16,
    samples: int = 10,
    interval: float = 0.05,
    back: int = 100,
    jitter: float = 0.5,
    meters: Meters | None = None,
    seed: int = 1,
    setting: bool = True,
) -> pd.DataFrame:
    """A sweep of one unit as the logger wrote it."""
    loads = sweep(unit, mode, settings=settings, samples=samples, back=back, jitter=jitter)
    log = run(unit, loads, interval=interval)
    return read(log, meters or Meters(), rng=np.random.default_rng(seed), interval=interval, setting=setting)


def with_slope(unit: Unit, slope: float) -> Unit:
    """The unit with another slope of its current."""
    return replace(unit, slope=slope)
