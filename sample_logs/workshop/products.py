"""What a power source truly does: closed forms for loss, output voltage and heat.

Everything is in SI units; temperatures in °C, rises in K, ratios as fractions.
"""

from __future__ import annotations

import math
from collections.abc import Mapping
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

__all__ = ["Network", "OperatingPoint", "Port", "Product"]

Array = NDArray[np.float64]


@dataclass(frozen=True, slots=True)
class Port:
    """One output: V = V0 (1 + line (v - 1) + drift * rise) - r I - sum of cross * I of the others."""

    rated_voltage: float  # [V]
    rated_current: float  # [A]
    no_load_voltage: float  # V0, at rated input and a cold core [V]
    resistance: float  # r [ohm]
    line: float = 0.0  # relative change of V0 per relative change of the input voltage
    drift: float = 0.0  # relative change of V0 per kelvin of core rise [1/K]
    cross: float = 0.0  # droop per ampere of every other output [ohm]
    linear_loss: float = 0.0  # a: junctions and switching [W/A]
    square_loss: float = 0.0  # b: copper and channels [W/A2]
    ripple: float = 0.0  # peak to peak at no load [V]
    ripple_slope: float = 0.0  # and more of it per ampere [ohm]


@dataclass(frozen=True, slots=True)
class Network:
    """Heat from the core (winding and hot spot) to the case, and from the case to the ambient.

    With rises x over the ambient, power P and an ambient that drifts by d [K/s]:
    C1 (x1' + d) = P - (x1 - x2)/R1,  C2 (x2' + d) = (x1 - x2)/R1 - x2/R2. Solved exactly for constant P and d.
    """

    core_to_case: float  # R1 [K/W]
    case_to_ambient: float  # R2 [K/W]
    core_capacity: float  # C1 [J/K]
    case_capacity: float  # C2 [J/K]

    def settled(self, power: float, *, drift: float = 0.0) -> Array:
        """Rises of core and case after a long time, in an ambient that drifts [K/s]. [K]"""
        from_core = power - self.core_capacity * drift  # what the ambient takes along stays in the bodies
        case = self.case_to_ambient * (from_core - self.case_capacity * drift)
        return np.array([case + self.core_to_case * from_core, case])

    def rates(self) -> tuple[float, float]:
        """The two decay rates, the slower one first. [1/s]"""
        (a, b), (c, d) = self._matrix()
        half, root = -(a + d) / 2, math.sqrt(((a - d) / 2) ** 2 + b * c)
        return half - root, half + root

    def rise(self, power: float, seconds: Array, start: Array, *, drift: float = 0.0) -> Array:
        """Rises of core and case, shape (n, 2), after `seconds` at constant `power`, beginning at `start`. [K]

        exp(A t) = ((s2 exp(-s1 t) - s1 exp(-s2 t)) I + (exp(-s1 t) - exp(-s2 t)) A) / (s2 - s1)
        """
        slow, fast = self.rates()
        one, two = np.exp(-slow * seconds), np.exp(-fast * seconds)
        settled = self.settled(power, drift=drift)
        away = start - settled
        turned = np.array(self._matrix()) @ away
        moved = np.outer(fast * one - slow * two, away) + np.outer(one - two, turned)
        return settled + moved / (fast - slow)

    def _matrix(self) -> tuple[tuple[float, float], tuple[float, float]]:
        c1, c2, r1, r2 = self.core_capacity, self.case_capacity, self.core_to_case, self.case_to_ambient
        return (-1 / (r1 * c1), 1 / (r1 * c1)), (1 / (r1 * c2), -(1 / r1 + 1 / r2) / c2)


@dataclass(frozen=True, slots=True)
class OperatingPoint:
    """What truly is at one load and input voltage."""

    input_voltage: float  # [V]
    input_power: float  # [W]
    output_voltage: Mapping[str, float]  # [V]
    output_current: Mapping[str, float]  # [A]

    @property
    def output_power(self) -> float:
        """Power of all outputs together. [W]"""
        return sum(self.output_voltage[name] * current for name, current in self.output_current.items())

    @property
    def efficiency(self) -> float:
        """Output power over input power."""
        return self.output_power / self.input_power


@dataclass(frozen=True, slots=True)
class Product:
    """One power source.

    Loss = (p0 + sum a I) (1 + g (v - 1)) + sum b I^2 (1 - h (v - 1)), v being the input voltage over the rated one.
    With nothing connected p0 is what `standby` says, where the unit then works in bursts.
    """

    name: str
    revision: str
    rated_input: float  # [V]
    outputs: Mapping[str, Port]
    fixed_loss: float  # p0 [W]
    heat: Network
    core_line: float = 0.0  # g: core and switching loss grow with the input voltage
    copper_line: float = 0.0  # h: current on the input side falls with it
    power_factor: float | None = None  # at rated load and input; None: d.c. input
    standby: float | None = None  # loss with nothing connected; None: p0 [W]
    burst: float = 0.0  # height of the bursts that it is then drawn in; 0: drawn evenly [W]

    def loss(self, currents: Mapping[str, float], input_voltage: float) -> float:
        """Power turned into heat. [W]"""
        v = input_voltage / self.rated_input - 1
        fixed = self.fixed_loss if self.standby is None or any(currents.values()) else self.standby
        linear = fixed + sum(self.outputs[n].linear_loss * i for n, i in currents.items())
        square = sum(self.outputs[n].square_loss * i * i for n, i in currents.items())
        return linear * (1 + self.core_line * v) + square * (1 - self.copper_line * v)

    def output_voltage(self, output: str, currents: Mapping[str, float], input_voltage: float, rise: float) -> float:
        """Voltage at the terminals of one output. [V]"""
        port, v = self.outputs[output], input_voltage / self.rated_input - 1
        others = sum(current for name, current in currents.items() if name != output)
        source = port.no_load_voltage * (1 + port.line * v + port.drift * rise)
        return source - port.resistance * currents[output] - port.cross * others

    def point(self, currents: Mapping[str, float], input_voltage: float, rise: float = 0.0) -> OperatingPoint:
        """What truly is at these output currents [A], this input voltage [V] and this rise of the core [K]."""
        volts = {name: self.output_voltage(name, currents, input_voltage, rise) for name in self.outputs}
        power = sum(volts[name] * current for name, current in currents.items())
        return OperatingPoint(input_voltage, power + self.loss(currents, input_voltage), volts, dict(currents))

    def ripple(self, output: str, current: float) -> float:
        """Peak-to-peak ripple of one output. [V]"""
        return self.outputs[output].ripple + self.outputs[output].ripple_slope * current

    def factor_at(self, input_power: Array) -> Array:
        """Power factor: it rises with the power drawn, as that of a rectifier with a capacitor does."""
        full = self.point({n: p.rated_current for n, p in self.outputs.items()}, self.rated_input).input_power
        share = np.clip(input_power / full, 0, 1.2)
        return (self.power_factor or 1.0) * (0.55 + 0.45 * np.sqrt(share))
