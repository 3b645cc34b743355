"""A test sequence, run on a unit and seen by a bench: the samples, and the truth of each dwell."""

from __future__ import annotations

import zlib
from collections.abc import Mapping, Sequence
from dataclasses import dataclass

import numpy as np
import pandas as pd
from numpy.typing import NDArray

from workshop.instruments import Meter, MeterInUse
from workshop.products import OperatingPoint, Product

__all__ = ["Bench", "DwellTruth", "Run", "Step", "run_sequence", "wander"]

Array = NDArray[np.float64]
SETTLING = 4.0  # the truth of a dwell leaves out as much of its beginning [s]


@dataclass(frozen=True, slots=True)
class Step:
    """One condition, held for a while."""

    loads: Mapping[str, float]  # output -> share of its rated current
    input_voltage: float  # [V]
    seconds: float


@dataclass(frozen=True, slots=True)
class Bench:
    """What the bench adds: meters by channel, leads between unit and load, the room."""

    meters: Mapping[str, Meter]
    leads: float = 0.0  # both leads together, where the voltage is read at the load [ohm]
    ambient: float = 23.0  # [°C]
    supply_wander: float = 0.0  # standard deviation of the slow wander of the input voltage, as a fraction
    seed: int = 0  # of the errors that its instruments have, the same in every log

    def meter(self, key: str) -> Meter | None:
        """The kind of meter that reads a channel, by its full name first; None where the bench has none."""
        return self.meters.get(key) or self.meters.get(key.partition(" ")[0])

    def in_use(self, key: str) -> MeterInUse | None:
        """The meter of a channel with the errors it happens to have."""
        meter = self.meter(key)
        own = np.random.Generator(np.random.PCG64([self.seed, zlib.crc32(key.encode())]))
        return meter.drawn(own) if meter else None

    def read(self, truth: pd.DataFrame, random: np.random.Generator) -> pd.DataFrame:
        """The table as the meters show it; what is set or counted stays, what nothing measures is left out."""
        table = {}
        for key in map(str, truth.columns):
            if key == "time" or key.startswith("load_setting"):
                table[key] = truth[key].to_numpy()
            elif (meter := self.in_use(key)) is not None:
                table[key] = meter.read(truth[key].to_numpy(), random)
        return pd.DataFrame(table)


@dataclass(frozen=True, slots=True)
class DwellTruth:
    """What truly was during one step, once settled."""

    step: int
    begins: float  # [s]
    ends: float  # [s]
    loads: Mapping[str, float]
    point: OperatingPoint


@dataclass(frozen=True, slots=True)
class Run:
    """Samples in SI units, one column a channel, and the truth behind them."""

    samples: pd.DataFrame
    truth: tuple[DwellTruth, ...]


def run_sequence(
    product: Product, bench: Bench, steps: Sequence[Step], *, rate: float, seed: int, warm: bool = True
) -> Run:
    """Samples at `rate` [Hz] of a unit taken through `steps`, as the bench's meters show them.

    A `warm` unit has been at full load for long before the first step, another one is at the ambient. Noise
    is drawn from PCG64 with that seed.
    """
    random = np.random.Generator(np.random.PCG64(seed))
    parts, truths, start = [], [], 0.0
    full = Step(dict.fromkeys(product.outputs, 1.0), product.rated_input, 0.0)
    rises = product.heat.settled(_loss_at(product, full) if warm else 0.0)
    before: dict[str, float] = dict.fromkeys(product.outputs, 0.0)
    for number, step in enumerate(steps):
        local = np.arange(round(step.seconds * rate)) / rate
        path = product.heat.rise(_loss_at(product, step), np.append(local, step.seconds), rises)
        part = _true_samples(
            product, bench, step, begins=start, local=local, rises=path[:-1], before=before, random=random
        )
        parts.append(part.assign(time=start + local))
        rise = float(path[:-1][local >= SETTLING, 0].mean())
        point = product.point(_currents(product, step), step.input_voltage, rise)
        truths.append(DwellTruth(number, start, start + step.seconds, step.loads, point))
        start, rises, before = start + step.seconds, path[-1], _currents(product, step)
    truth = pd.concat(parts, ignore_index=True)
    truth.insert(0, "time", truth.pop("time"))
    return Run(bench.read(truth, random), tuple(truths))


def _currents(product: Product, step: Step) -> dict[str, float]:
    return {name: step.loads[name] * port.rated_current for name, port in product.outputs.items()}


def _loss_at(product: Product, step: Step) -> float:
    return product.loss(_currents(product, step), step.input_voltage)


def _true_samples(
    product: Product,
    bench: Bench,
    step: Step,
    *,
    begins: float,
    local: Array,
    rises: Array,
    before: Mapping[str, float],
    random: np.random.Generator,
) -> pd.DataFrame:
    """What truly is at each sample of one step, the load's and the output's settling included."""
    currents, wandering = _currents(product, step), wander(len(local), random)
    table: dict[str, Array] = {"input_voltage": step.input_voltage * (1 + bench.supply_wander * wandering)}
    settling = np.exp(-local / 0.35)
    output_power = np.zeros(len(local))
    for name, port in product.outputs.items():
        jump = currents[name] - before[name]
        current = currents[name] + 0.03 * jump * settling  # the load overshoots
        steady = np.array([product.output_voltage(name, currents, step.input_voltage, r) for r in rises[:, 0]])
        sag = 0.02 * port.rated_voltage * jump / port.rated_current * settling
        volts = steady - sag
        output_power += volts * current
        table |= _columns(product, name, current, volts)
        table[f"load_setting {name}"] = np.full(len(local), currents[name])
        table[f"output_voltage {name}"] = volts - bench.leads * current
    power = output_power + _loss_at(product, step)
    table["input_power"] = _in_bursts(power, product.burst, random) if not any(currents.values()) else power
    table["power_factor"] = product.factor_at(power)
    table["input_current"] = power / table["input_voltage"] / table["power_factor"]
    if product.power_factor is None:
        table["input_current"] = table["input_power"] / table["input_voltage"]
    slow = 0.3 * np.sin((begins + local) / 900)
    table["ambient_temperature"] = bench.ambient + slow
    table["temperature core"] = bench.ambient + slow + rises[:, 0]
    table["temperature case"] = bench.ambient + slow + rises[:, 1]
    return pd.DataFrame(table)


def _columns(product: Product, name: str, current: Array, volts: Array) -> dict[str, Array]:
    ripple = np.array([product.ripple(name, float(i)) for i in current])
    return {f"output_current {name}": current, f"output_voltage {name}": volts, f"ripple {name}": ripple}


def wander(n: int, random: np.random.Generator) -> Array:
    """A slow wander of about unit size that sums to zero over the step, so that the step's truth stays closed."""
    phases = random.uniform(0, 2 * np.pi, 3)
    turns = np.arange(n) / max(n, 1)
    return sum((np.sin(2 * np.pi * k * turns + phases[k - 1]) for k in (1, 2, 3)), np.zeros(n)) / 1.2247


def _in_bursts(power: Array, height: float, random: np.random.Generator) -> Array:
    """The same mean power, drawn in bursts of about `height` that come at uneven intervals."""
    if height == 0:
        return power
    drawn, owed, floor = np.empty(len(power)), random.uniform(0, height), 0.25
    for n, share in enumerate(power):
        owed += (1 - floor) * share
        burst = height * random.uniform(0.7, 1.0)
        drawn[n] = floor * share + (burst if owed >= burst else 0.0)
        owed -= drawn[n] - floor * share
    return drawn
