"""What outputs do above their rated current, and a load swept through it."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass
from typing import Protocol

import numpy as np
import pandas as pd
from numpy.typing import NDArray

from workshop.products import Product
from workshop.sequence import Bench

__all__ = ["ConstantCurrent", "Foldback", "Hiccup", "Limiter", "LoadStep", "OverloadRun", "Supply", "run_overload"]

Array = NDArray[np.float64]


@dataclass(frozen=True, slots=True)
class LoadStep:
    """One setting of the electronic load, held for a while."""

    setting: float  # [ohm] in CR mode, [V] in CV mode
    seconds: float
    mode: str = "CR"


@dataclass(frozen=True, slots=True)
class Supply:
    """What stands before the limiter: a source with a droop."""

    voltage: float  # with nothing connected [V]
    resistance: float  # [ohm]

    def meets(self, step: LoadStep) -> tuple[float, float]:
        """Volts and amperes at a load, were there no limiter."""
        if step.mode == "CV":
            volts = min(step.setting, self.voltage)
            return volts, (self.voltage - volts) / self.resistance
        current = self.voltage / (step.setting + self.resistance)
        return current * step.setting, current


class Limiter(Protocol):
    """How an output behaves when it is asked for too much."""

    def trace(self, supply: Supply, steps: Sequence[LoadStep], times: Sequence[Array]) -> list[tuple[Array, Array]]:
        """Volts and amperes in each step, at `times` that count from the step's beginning. [V, A]"""


@dataclass(frozen=True, slots=True)
class _Line:
    """Currents that a limiter lets through: I = short + slope V."""

    short: float  # [A]
    slope: float  # [A/V]

    def meets(self, supply: Supply, step: LoadStep) -> tuple[float, float]:
        """Volts and amperes where the load meets the output."""
        volts, current = supply.meets(step)
        if not self.limits(supply, step):
            return volts, current
        if step.mode == "CV":
            return volts, self.short + self.slope * volts
        current = self.short / (1 - self.slope * step.setting)
        return current * step.setting, current

    def limits(self, supply: Supply, step: LoadStep) -> bool:
        """Whether the load asks for more than this line lets through."""
        volts, current = supply.meets(step)
        return current > self.short + self.slope * volts

    def trace(
        self, supply: Supply, steps: Sequence[LoadStep], times: Sequence[Array], *, rise: float
    ) -> list[tuple[Array, Array]]:
        """Every step at its meeting point; after an overload the output comes back exponentially."""
        traced, before, limited = [], 0.0, False
        for step, local in zip(steps, times, strict=True):
            volts, current = self.meets(supply, step)
            if limited and not self.limits(supply, step):
                traced.append(_return(supply, step, local, before=before, rise=rise))
            else:
                traced.append((np.full(len(local), volts), np.full(len(local), current)))
            before, limited = volts, self.limits(supply, step)
        return traced


def _return(supply: Supply, step: LoadStep, local: Array, *, before: float, rise: float) -> tuple[Array, Array]:
    """The way from an overload's voltage `before` [V] back to the regulated branch, of time constant `rise` [s]."""
    volts, current = supply.meets(step)
    decay = np.exp(-local / rise)
    if step.mode == "CV":  # a load that holds a voltage takes nothing below it
        free = supply.voltage - (supply.voltage - before) * decay
        return np.minimum(free, volts), np.where(free < volts, 0.0, current)
    risen = volts - (volts - before) * decay
    return risen, risen / step.setting


@dataclass(frozen=True, slots=True)
class ConstantCurrent:
    """A limiter that holds the current, with a little slope."""

    limit: float  # at the source's voltage [A]
    slope: float = 0.0  # more current per volt that the output falls [A/V]
    rise: float = 0.01  # time constant of the return after an overload [s]

    def line(self, supply: Supply) -> _Line:
        """Currents that it lets through."""
        return _Line(self.limit + self.slope * supply.voltage, -self.slope)

    def trace(self, supply: Supply, steps: Sequence[LoadStep], times: Sequence[Array]) -> list[tuple[Array, Array]]:
        """Volts and amperes in each step."""
        return self.line(supply).trace(supply, steps, times, rise=self.rise)


@dataclass(frozen=True, slots=True)
class Foldback:
    """A limiter whose current falls in a straight line with the voltage, down to what it gives into a short."""

    knee: float  # at the source's voltage [A]
    short: float  # [A]
    rise: float = 0.01  # time constant of the return after an overload [s]

    def line(self, supply: Supply) -> _Line:
        """Currents that it lets through."""
        return _Line(self.short, (self.knee - self.short) / supply.voltage)

    def trace(self, supply: Supply, steps: Sequence[LoadStep], times: Sequence[Array]) -> list[tuple[Array, Array]]:
        """Volts and amperes in each step."""
        return self.line(supply).trace(supply, steps, times, rise=self.rise)


@dataclass(frozen=True, slots=True)
class Hiccup:
    """A protection that shuts off above its onset, tries again every period, and shuts off again.

    The first try begins with the overload; a try that finds the overload gone goes on, the output rising
    exponentially. For loads in CR mode.
    """

    onset: float  # [A]
    burst: float  # current it can give while it tries [A]
    period: float  # [s]
    on: float  # [s]
    rise: float = 0.01  # time constant of the return after an overload [s]

    def trace(self, supply: Supply, steps: Sequence[LoadStep], times: Sequence[Array]) -> list[tuple[Array, Array]]:
        """Volts and amperes in each step."""
        traced, into = [], -1.0  # how long it has been tripped when the step begins; below 0: not tripped
        for step, local in zip(steps, times, strict=True):
            volts, current = supply.meets(step)
            if current > self.onset:
                into = max(into, 0.0)
                trying = np.where(np.mod(into + local, self.period) < self.on, min(self.burst, current), 0.0)
                traced.append((trying * step.setting, trying))
                into += step.seconds
                continue
            since = local - (self.waits(into) if into >= 0 else -math.inf)
            risen = np.where(since < 0, 0.0, volts * -np.expm1(-np.maximum(since, 0.0) / self.rise))
            traced.append((risen, risen / step.setting))
            into = -1.0
        return traced

    def waits(self, tripped_for: float) -> float:
        """How long it takes to the next try, when the overload ends after so long. [s]"""
        phase = math.fmod(tripped_for, self.period)
        return 0.0 if phase < self.on else self.period - phase


@dataclass(frozen=True, slots=True)
class OverloadRun:
    """A sweep through the overload: the samples as the meters show them, and what truly was."""

    samples: pd.DataFrame
    truth: pd.DataFrame  # time, output_voltage and output_current at the terminals, input_power, step
    steps: tuple[LoadStep, ...]
    supply: Supply
    limiter: Limiter

    @property
    def removed(self) -> float:
        """When the last step began, the return to a rated load. [s]"""
        return sum(step.seconds for step in self.steps[:-1])


def run_overload(
    product: Product, bench: Bench, limiter: Limiter, *, steps: Sequence[LoadStep], rate: float, seed: int
) -> OverloadRun:
    """A sweep of the load on the only output of a warm unit, its last step being the return to a rated load."""
    random = np.random.Generator(np.random.PCG64(seed))
    ((name, port),) = product.outputs.items()
    rise = float(product.heat.settled(product.loss({name: port.rated_current}, product.rated_input))[0])
    supply = Supply(port.no_load_voltage * (1 + port.drift * rise), port.resistance)
    times = [np.arange(round(step.seconds * rate)) / rate for step in steps]
    parts, begins = [], 0.0
    for step, local, (volts, amperes) in zip(steps, times, limiter.trace(supply, steps, times), strict=True):
        heat = np.array([product.loss({name: float(i)}, product.rated_input) for i in amperes])
        part = {"time": begins + local, "output_voltage": volts, "output_current": amperes}
        parts.append(pd.DataFrame(part | {"input_power": volts * amperes + heat, "setting": step.setting}))
        parts[-1]["mode"] = step.mode
        begins += step.seconds
    truth = pd.concat(parts, ignore_index=True)
    seen = _at_the_meters(truth, product, bench, name)
    samples = bench.read(seen, random).assign(load_mode=truth["mode"])
    return OverloadRun(samples, truth, tuple(steps), supply, limiter)


def _at_the_meters(truth: pd.DataFrame, product: Product, bench: Bench, name: str) -> pd.DataFrame:
    """What reaches the meters: the voltage less the drop in the leads; the current of a d.c. input."""
    table = {
        "time": truth["time"],
        f"load_setting {name}": truth["setting"],
        "input_voltage": np.full(len(truth), product.rated_input),
        "input_power": truth["input_power"],
        f"output_voltage {name}": truth["output_voltage"] - bench.leads * truth["output_current"],
        f"output_current {name}": truth["output_current"],
    }
    if product.power_factor is None:
        table["input_current"] = truth["input_power"] / product.rated_input
    return pd.DataFrame(table)
