"""Which class of a published set a product belongs to, and what the set then asks of it.

The class is told from the ratings so far as they tell it, or given, and must then go with them: a class of looser
limits than the product's own would let a unit pass that does not.
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass
from typing import NoReturn

from acceptance.errors import MeasurementError
from acceptance.limitfile.published import Band, PublishedSet, Quantity
from acceptance.units import quoted

__all__ = ["Asked", "AskedLimit", "Unfit", "asked_of", "rated_power", "told_class"]

LOW_VOLTAGE = 6.0  # V: a low voltage supply has less, and at least LOW_VOLTAGE_CURRENT
LOW_VOLTAGE_CURRENT = 0.55  # A
PLATE_ROUNDING = 0.02  # of a power: plates round, as 19.5 V x 3.34 A = 65.1 W to 65 W; common practice, no source

Ratings = Sequence[tuple[float, float]]  # volts and amperes of each rated output


class Unfit(MeasurementError):
    """A set that cannot be asked of a product, or not as it was asked; `key` is what would have to change."""

    def __init__(self, key: str, found: str, expected: str) -> None:
        self.key, self.found, self.expected = key, found, expected
        super().__init__(f"{found}; {expected}")


def _refuse(key: str, found: str, expected: str) -> NoReturn:
    raise Unfit(key, found, expected)


@dataclass(frozen=True, slots=True)
class AskedLimit:
    """One limit at a rated output power."""

    quantity: Quantity
    band: Band
    value: float  # [W, or a fraction]

    @property
    def low(self) -> float | None:
        """What must be reached."""
        return None if self.quantity.characteristic == "no_load_power" else self.value

    @property
    def high(self) -> float | None:
        """What must not be exceeded."""
        return self.value if self.quantity.characteristic == "no_load_power" else None


@dataclass(frozen=True, slots=True)
class Asked:
    """What a set asks of one product."""

    class_name: str
    reason: str  # why it is of this class, in words
    power: float  # rated output power [W]
    derating: float  # what every current is scaled by: the outputs together are rated for more than the unit gives
    limits: tuple[AskedLimit, ...]


def asked_of(
    published: PublishedSet,
    outputs: Ratings,
    *,
    power: float | None = None,
    class_name: str | None = None,
    ports: int | None = None,
) -> Asked:
    """What a set asks of a product.

    Parameters
    ----------
    published
        A set with classes.
    outputs
        The ratings; may be empty where the power and the class are given.
    power
        The rated output power, where it differs from the sum of volts times amperes. [W]
    class_name
        Where the ratings do not tell it.
    ports
        Adaptive ports and different fixed voltages, of the class that counts them.

    Raises
    ------
    Unfit
        If the class cannot be told or does not go with the ratings, or if the set has no limits for the power.
    """
    highest = max((volts for volts, _ in outputs), default=0.0)
    if highest > published.largest_output_voltage:
        found = f"an output of {highest:g} V lies outside {published.name}"
        _refuse("set", found, f"expected outputs of at most {published.largest_output_voltage:g} V")
    name, reason = _class(published, outputs, class_name)
    rated, derating = rated_power(outputs, power)
    counted = _ports(published.classes[name], name, outputs, ports)
    found_bands = [(quantity, quantity.band(rated)) for quantity in published.classes[name]]
    limits = tuple(
        AskedLimit(quantity, band, band.formula.at(rated, counted))
        for quantity, band in found_bands
        if band is not None
    )
    if not any(limit.quantity.characteristic == "efficiency" for limit in limits):
        _refuse("set", f"a rated output power of {rated:g} W lies outside {published.name}", _reach(published, name))
    return Asked(name, reason, rated, derating, limits)


def _reach(published: PublishedSet, name: str) -> str:
    bands = [band for quantity in published.classes[name] for band in quantity.bands]
    top = max(band.top for band in bands)
    return f"expected at most {top:g} W" if math.isfinite(top) else "expected a power that it has limits for"


# --- power ----------------------------------------------------------------------------------------------------------


def rated_power(outputs: Ratings, stated: float | None = None) -> tuple[float, float]:
    """The rated output power, and what currents are scaled by where the outputs' ratings add up to more. [W, 1]

    Raises
    ------
    Unfit
        If no power is known, or if the stated one does not go with the outputs.

    References
    ----------
    10 CFR 430 Subpart B Appendix Z, 5(a)(1)(iv) and 5(b)(1)(iv): D = P / sum(V I), applied where it is below 1.
    """
    powers = [volts * amperes for volts, amperes in outputs]
    # 12 digits: a sum of products must not leave its band for the sake of a binary fraction
    total = float(f"{sum(powers):.12g}")
    power = total if stated is None else stated
    if not 0 < power < math.inf:
        _refuse("power", f"a rated output power of {power:g} W", "expected one above zero, such as 24 W")
    if stated is None or not outputs:
        return power, 1.0
    least = max(powers)
    if not least * (1 - PLATE_ROUNDING) <= stated <= total * (1 + PLATE_ROUNDING):
        span = (
            f"{total:g} W"
            if len(powers) == 1
            else f"{least:g} W, the largest output alone, to {total:g} W, all of them"
        )
        found = f"a rated output power of {stated:g} W does not go with the outputs"
        _refuse("power", found, f"expected {span}")
    return power, min(1.0, power / total)


def _ports(rows: Sequence[Quantity], name: str, outputs: Ratings, ports: int | None) -> int:
    counts = any(band.formula.per_further_port for row in rows for band in row.bands)
    if not counts and ports is not None:
        _refuse("ports", f"the class {name} counts no ports", "expected it left out")
    if counts and ports is None:
        expected = "expected ports: 2, the number of adaptive ports and different fixed voltages"
        _refuse("ports", f"the number of ports is not given, and the class {name} goes by it", expected)
    if ports is not None and outputs and ports > len(outputs):
        found = f"{ports} ports do not go with {len(outputs)} rated {'output' if len(outputs) == 1 else 'outputs'}"
        _refuse("ports", found, f"expected at most {len(outputs)}")
    return ports or 1


# --- class ----------------------------------------------------------------------------------------------------------


def told_class(published: PublishedSet, outputs: Ratings) -> tuple[str, str]:
    """The class that the ratings tell, or "" where they do not; and why, in words."""
    names = list(published.classes)
    if len(names) == 1:
        return names[0], "the set's only class"
    if not outputs:
        return "", "no output is rated"
    if published.kind == "internal supply":
        if len(outputs) == 1:
            return "single output", "one rated output"
        return "", "a main output with a standby one beside it may count as single output or as multi output"
    return _external(published, outputs)


def _external(published: PublishedSet, outputs: Ratings) -> tuple[str, str]:
    voltages = sorted({volts for volts, _ in outputs})
    if len(voltages) > 1:
        listed = f"{', '.join(f'{volts:g}' for volts in voltages[:-1])} and {voltages[-1]:g} V"
        return "multiple voltage", f"multiple voltage: outputs of {listed}"
    if len(outputs) > 1 and not published.isolated_outputs_are_one:
        return "", f"several outputs of {voltages[0]:g} V may count as one voltage or as several"
    volts, currents = voltages[0], [amperes for _, amperes in outputs]
    if volts >= LOW_VOLTAGE:
        return "ac-dc basic voltage", f"a.c. to d.c., basic voltage: {volts:g} V is not below {LOW_VOLTAGE:g} V"
    if sum(currents) < LOW_VOLTAGE_CURRENT:
        why = f"{sum(currents):g} A is below {LOW_VOLTAGE_CURRENT:g} A"
        return "ac-dc basic voltage", f"a.c. to d.c., basic voltage: {why}"
    if min(currents) < LOW_VOLTAGE_CURRENT:
        return "", f"the outputs' currents lie to both sides of {LOW_VOLTAGE_CURRENT:g} A, each and together"
    why = f"{volts:g} V is below {LOW_VOLTAGE:g} V, and {min(currents):g} A at least {LOW_VOLTAGE_CURRENT:g} A"
    return "ac-dc low voltage", f"a.c. to d.c., low voltage: {why}"


def _class(published: PublishedSet, outputs: Ratings, given: str | None) -> tuple[str, str]:
    told, why = told_class(published, outputs)
    if given is None:
        if not told:
            expected = f"expected class:, one of {', '.join(published.classes)}"
            _refuse("class", f"the class of {published.name} cannot be told: {why}", expected)
        return told, why
    if given not in published.classes:
        _refuse_unknown(published, given)
    if outputs and not _goes_with(given, told, outputs, one=published.isolated_outputs_are_one):
        right = f"expected {told}" if told else "expected another"
        _refuse("class", f"the class {quoted(given)} does not go with the ratings ({why})", right)
    return given, f"{given}, as stated" if not told or given != told else why


def _refuse_unknown(published: PublishedSet, given: str) -> NoReturn:
    from acceptance.limitfile.faults import unknown  # only a wrong class needs it

    _refuse("class", f"{quoted(given)} is no class of {published.name}", unknown(given, published.classes))


def _goes_with(given: str, told: str, outputs: Ratings, *, one: bool) -> bool:
    """Whether a class can be the product's: what the ratings leave open, the class may settle, and nothing else."""
    if given in ("multi output", "multiple voltage adaptive"):
        return len(outputs) > 1
    if given in ("single output", told):
        return True
    if told:
        return _voltage_of(given) == _voltage_of(told)
    # several outputs of one voltage: one or several, by the set; of 6 V and more never low voltage
    if given == "multiple voltage":
        return not one
    return "low voltage" not in given or max(volts for volts, _ in outputs) < LOW_VOLTAGE


def _voltage_of(name: str) -> str:
    return next((kind for kind in ("multiple", "low", "basic") if kind in name), name)
