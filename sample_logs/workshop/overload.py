"""What outputs do above their rated current, and while they run warm: the stages beside the steady one."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass

import numpy as np
import pandas as pd
from numpy.typing import NDArray

from workshop.products import Product
from workshop.sequence import Bench

__all__ = ["ConstantCurrent", "Hiccup", "Winding", "run_overload", "run_winding"]

Array = NDArray[np.float64]
COPPER = 234.5  # °C below zero at which the resistance of copper, drawn on straight, would vanish


@dataclass(frozen=True, slots=True)
class ConstantCurrent:
    """A limiter that holds the current, with a little slope."""

    limit: float  # at rated voltage [A]
    slope: float = 0.0  # more current per volt that the output falls [A/V]

    def output(self, source: float, droop: float, *, load: float, local: Array) -> tuple[Array, Array]:
        """Volts and amperes at a resistor `load` [ohm] on a source of that voltage and droop."""
        current = source / (load + droop)
        if current > self.limit:
            current = (self.limit + self.slope * source) / (1 + self.slope * load)
        ones = np.ones(len(local))
        return current * load * ones, current * ones


@dataclass(frozen=True, slots=True)
class Hiccup:
    """A protection that shuts off above its onset, tries again every period, and shuts off again."""

    onset: float  # [A]
    burst: float  # current it can give while it tries [A]
    period: float  # [s]
    on: float  # [s]

    def output(self, source: float, droop: float, *, load: float, local: Array) -> tuple[Array, Array]:
        """Volts and amperes at a resistor `load` [ohm] on a source of that voltage and droop."""
        current = source / (load + droop)
        if current <= self.onset:
            return current * load * np.ones(len(local)), current * np.ones(len(local))
        phase = np.mod(local, self.period)
        trying = np.where(phase < self.on, min(self.burst, current), 0.0)
        return trying * load, trying


def run_overload(
    product: Product,
    bench: Bench,
    limiter: ConstantCurrent | Hiccup,
    *,
    loads: Sequence[float],
    seconds: float,
    rate: float,
    seed: int,
) -> pd.DataFrame:
    """A sweep of resistors [ohm] on the only output, the last ones being the return to rated load."""
    random = np.random.Generator(np.random.PCG64(seed))
    ((name, port),) = product.outputs.items()
    local = np.arange(round(seconds * rate)) / rate
    rise = float(product.heat.settled(product.loss({name: port.rated_current}, product.rated_input))[0])
    source = port.no_load_voltage * (1 + port.drift * rise)
    parts = []
    for number, load in enumerate(loads):
        volts, amperes = limiter.output(source, port.resistance, load=load, local=local)
        heat = np.array([product.loss({name: float(i)}, product.rated_input) for i in amperes])
        parts.append(
            pd.DataFrame(
                {
                    "time": number * seconds + local,
                    f"load_setting {name}": load,
                    "input_voltage": product.rated_input,
                    "input_power": volts * amperes + heat,
                    f"output_voltage {name}": volts - bench.leads * amperes,
                    f"output_current {name}": amperes,
                }
            )
        )
    table = pd.concat(parts, ignore_index=True)
    return bench.read(table, random).assign(load_mode="CR")


@dataclass(frozen=True, slots=True)
class Winding:
    """A copper winding, whose resistance tells its mean temperature."""

    resistance: float  # at 20 °C [ohm]

    def at(self, temperature: Array) -> Array:
        """Resistance at a temperature [°C]. [ohm]"""
        return self.resistance * (COPPER + temperature) / (COPPER + 20)


def run_winding(
    winding: Winding,
    rises: Callable[[Array], Array],
    bench: Bench,
    *,
    times: Sequence[float],
    seed: int,
) -> pd.DataFrame:
    """Readings of a winding's resistance at `times` [s], its rise over the ambient being `rises(times)` [K]."""
    random = np.random.Generator(np.random.PCG64(seed))
    seconds = np.asarray(times, dtype=float)
    ambient = np.full(len(seconds), bench.ambient)
    truth = {"ambient_temperature": ambient, "winding_resistance": winding.at(ambient + rises(seconds))}
    return bench.read(pd.DataFrame({"time": seconds, **truth}), random)
