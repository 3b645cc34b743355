"""Which hazards a unit under test has, by its ratings; what is not known is taken to be there.

Facts: extra-low voltage ends at 60 V d.c. and 25 V a.c. (EN 50191, 1.2); 240 VA is the customary bound of a power that
heats a short to burning (IEC 60950-1, 1.2.8.8; from memory); a capacitor counts as discharged below 60 V
(IEC 60204-1, 6.2.4).
"""

from __future__ import annotations

import math

from acceptance.limitfile.model import Ratings
from acceptance.printing import quantity
from acceptance.record import Hazard

__all__ = ["hazards_of", "waiting_time"]

HARMLESS_VOLTAGE = 60.0  # d.c. [V]
HIGH_POWER = 240.0  # [VA]


def hazards_of(ratings: Ratings) -> list[Hazard]:
    """The hazards that the report's cautions are chosen by."""
    found: list[Hazard] = []
    if ratings.input.supply == "ac":
        found.append(Hazard("mains", f"input {ratings.input.voltage:g} V a.c."))
    elif _highest_input(ratings) > HARMLESS_VOLTAGE:
        found.append(Hazard("mains", f"input {_highest_input(ratings):g} V d.c., above 60 V"))
    found.append(_stored_charge(ratings))
    voltages = [output.voltage for output in ratings.outputs.values()]
    if max(voltages) > HARMLESS_VOLTAGE:
        found.append(Hazard("output above 60 V", f"output {max(voltages):g} V d.c."))
    powers = [output.voltage * output.current for output in ratings.outputs.values()]
    if sum(powers) >= HIGH_POWER:
        found.append(Hazard("high power output", f"rated output {sum(powers):g} VA in all"))
    # nothing in the ratings tells how hot it gets, so it is taken to be hot
    found.append(Hazard("hot parts", "surface temperatures are not known from the ratings"))
    return found


def _highest_input(ratings: Ratings) -> float:
    return max(ratings.input.voltage, *(ratings.input.range or (0.0, 0.0)))


def _stored_charge(ratings: Ratings) -> Hazard:
    charge = ratings.stored_charge
    if charge is None:
        return Hazard("stored charge", "capacitors and their discharge are not stated in the limits file")
    wait = waiting_time(charge.capacitance, charge.voltage, charge.bleeder)
    capacitance, bleeder = quantity(charge.capacitance, "F"), quantity(charge.bleeder, "ohm")
    words = f"{capacitance} charged to {charge.voltage:g} V, discharged through {bleeder}"
    return Hazard("stored charge", words, wait=wait)


def waiting_time(capacitance: float, voltage: float, bleeder: float) -> float:
    """Time until a capacitor is below 60 V through its bleeder: t = R C ln(V / 60 V). [s]"""
    return bleeder * capacitance * math.log(voltage / HARMLESS_VOLTAGE) if voltage > HARMLESS_VOLTAGE else 0.0
