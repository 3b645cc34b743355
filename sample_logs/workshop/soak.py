"""A unit that warms up at full load, and the resistance of its winding before and after."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
import pandas as pd
from numpy.typing import NDArray

from workshop.products import Network, Product
from workshop.sequence import Bench, wander

__all__ = ["COPPER", "Room", "SoakRun", "Winding", "WindingRun", "rises_in", "run_soak", "run_winding"]

Array = NDArray[np.float64]
COPPER = 234.5  # °C below zero at which the resistance of copper, drawn on straight, would vanish


@dataclass(frozen=True, slots=True)
class Room:
    """The ambient temperature: straight from one of these moments to the next, level after the last one."""

    seconds: Sequence[float]  # rising from 0
    temperatures: Sequence[float]  # [°C]

    def at(self, seconds: Array) -> Array:
        """Temperature at these moments. [°C]"""
        return np.interp(seconds, self.seconds, self.temperatures)

    def legs(self) -> list[tuple[float, float, float]]:
        """Each straight stretch: beginning and end [s], drift [K/s]."""
        ends = [*self.seconds[1:], np.inf]
        values = [*self.temperatures, self.temperatures[-1]]
        drifts = [(values[n + 1] - values[n]) / (end - self.seconds[n]) for n, end in enumerate(ends)]
        return list(zip(self.seconds, ends, drifts, strict=True))


def rises_in(room: Room, heat: Network, power: float, *, seconds: Array, start: Array, begins: float = 0.0) -> Array:
    """Rises of core and case over a room that drifts, shape (n, 2), `seconds` after `begins` on the room's clock. [K]

    Exact: every straight stretch of the room is solved with its drift, one after the other.
    """
    rises = np.empty((len(seconds), 2))
    now = begins
    for _, end, drift in room.legs():
        if end <= now:
            continue
        here = (begins + seconds >= now) & (begins + seconds < end)
        path = heat.rise(power, np.append(begins + seconds[here], min(end, 1e9)) - now, start, drift=drift)
        rises[here], start, now = path[:-1], path[-1], end
    return rises


@dataclass(frozen=True, slots=True)
class SoakRun:
    """Samples of a soak in SI units, and what truly was."""

    samples: pd.DataFrame
    truth: pd.DataFrame  # time, ambient_temperature, rise core, rise case, input_power, output_voltage, output_current
    power: float  # turned into heat [W]

    @property
    def ended(self) -> Array:
        """Rises of core and case at the last sample. [K]"""
        return self.truth[["rise core", "rise case"]].to_numpy()[-1]


def run_soak(product: Product, bench: Bench, room: Room, *, seconds: float, interval: float, seed: int) -> SoakRun:
    """A unit switched on cold at full load and rated input, and left alone; the last sample is that of switch-off."""
    random = np.random.Generator(np.random.PCG64(seed))
    ((name, port),) = product.outputs.items()
    currents = {name: port.rated_current}
    power = product.loss(currents, product.rated_input)
    times = np.arange(round(seconds / interval) + 1) * interval
    rises = rises_in(room, product.heat, power, seconds=times, start=np.zeros(2))
    volts = np.array([product.output_voltage(name, currents, product.rated_input, x) for x in rises[:, 0]])
    truth = pd.DataFrame(
        {
            "time": times,
            "ambient_temperature": room.at(times),
            "rise core": rises[:, 0],
            "rise case": rises[:, 1],
            "input_power": volts * port.rated_current + power,
            "output_voltage": volts,
            "output_current": port.rated_current,
        }
    )
    return SoakRun(bench.read(_at_the_meters(truth, product, bench, name, random), random), truth, power)


def _at_the_meters(
    truth: pd.DataFrame, product: Product, bench: Bench, name: str, random: np.random.Generator
) -> pd.DataFrame:
    """What reaches the meters: probes show temperatures, the voltage is read behind the leads."""
    mains = product.rated_input * (1 + bench.supply_wander * wander(len(truth), random))
    table = {
        "time": truth["time"],
        "input_voltage": mains,
        "input_power": truth["input_power"],
        "input_current": truth["input_power"] / mains / product.factor_at(truth["input_power"].to_numpy()),
        f"output_voltage {name}": truth["output_voltage"] - bench.leads * truth["output_current"],
        f"output_current {name}": truth["output_current"],
        "ambient_temperature": truth["ambient_temperature"],
        "temperature case": truth["ambient_temperature"] + truth["rise case"],
        "temperature core": truth["ambient_temperature"] + truth["rise core"],
    }
    if product.power_factor is None:
        table["input_current"] = truth["input_power"] / mains
    return pd.DataFrame(table)


@dataclass(frozen=True, slots=True)
class Winding:
    """A copper winding, whose resistance tells its mean temperature."""

    resistance: float  # at 20 °C [ohm]

    def at(self, temperature: Array) -> Array:
        """Resistance at a temperature [°C]. [ohm]"""
        return self.resistance * (COPPER + temperature) / (COPPER + 20)


@dataclass(frozen=True, slots=True)
class WindingRun:
    """Readings of a winding's resistance, and what truly was."""

    samples: pd.DataFrame
    truth: pd.DataFrame  # time, ambient_temperature, winding_resistance, rise


def run_winding(winding: Winding, bench: Bench, *, times: Array, ambient: Array, rises: Array, seed: int) -> WindingRun:
    """Readings at `times` [s], the winding being `rises` [K] above the ambient [°C]."""
    random = np.random.Generator(np.random.PCG64(seed))
    truth = pd.DataFrame(
        {
            "time": times,
            "ambient_temperature": ambient,
            "winding_resistance": winding.at(ambient + rises),
            "rise": rises,
        }
    )
    return WindingRun(bench.read(truth.drop(columns="rise"), random), truth)
