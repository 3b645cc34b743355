"""Units: text such as "24 V" or "105 %" to plain SI numbers, and back.

Everything behind the door is SI: V, A, W, ohm, s, Hz, F; ratios as fractions; temperatures in °C and
differences of temperature in K. The table is closed: a unit that is not in it is refused, never guessed.

Words that are not synonyms here: *rated* is what the product's plate says, *nominal* the value a figure
is referred to, *measured* what an instrument read, *limit* what must be met, *guard band* what is kept
from the limit for the sake of the uncertainty.
"""

from __future__ import annotations

import math
import re
from dataclasses import dataclass

from acceptance.errors import MeasurementError

__all__ = ["KINDS", "UNITS", "Rate", "Unit", "find_unit", "parse_quantity", "parse_quantity_with_bound", "parse_rate"]

_MICRO = "\N{MICRO SIGN}"


@dataclass(frozen=True, slots=True)
class Unit:
    """One way to write a unit: SI value = number * factor + offset."""

    symbol: str
    kind: str
    factor: float
    offset: float = 0.0

    def to_si(self, number: float) -> float:
        """The number, given in this unit, in SI."""
        return number * self.factor + self.offset


# kind -> the SI symbol that a number of this kind is kept in
KINDS: dict[str, str] = {
    "voltage": "V",
    "current": "A",
    "power": "W",
    "resistance": "ohm",
    "capacitance": "F",
    "time": "s",
    "frequency": "Hz",
    "temperature": "°C",
    "temperature difference": "K",
    "ratio": "",
    "thermal resistance": "K/W",
    "temperature coefficient": "1/K",
}

_PREFIXES = {"p": 1e-12, "n": 1e-9, "u": 1e-6, _MICRO: 1e-6, "μ": 1e-6, "m": 1e-3, "": 1.0, "k": 1e3, "M": 1e6}


def _prefixed(kind: str, symbol: str, prefixes: str) -> list[Unit]:
    chosen = ["" if p == "-" else p for p in prefixes]
    return [Unit(p + symbol, kind, _PREFIXES[p]) for p in chosen]


def _table() -> dict[str, Unit]:
    micro = f"u{_MICRO}μ"
    units = [
        *_prefixed("voltage", "V", f"n{micro}m-k"),
        *_prefixed("current", "A", f"n{micro}m-k"),
        *_prefixed("power", "W", f"n{micro}m-kM"),
        *_prefixed("resistance", "ohm", f"{micro}m-kM"),
        *_prefixed("resistance", "Ω", f"{micro}m-kM"),
        *_prefixed("resistance", "\N{OHM SIGN}", f"{micro}m-kM"),
        *_prefixed("capacitance", "F", f"pn{micro}m-"),
        *_prefixed("time", "s", f"n{micro}m-"),
        Unit("min", "time", 60.0),
        Unit("h", "time", 3600.0),
        *_prefixed("frequency", "Hz", "m-kM"),
        Unit("°C", "temperature", 1.0),
        Unit("℃", "temperature", 1.0),
        Unit("degC", "temperature", 1.0),
        Unit("°F", "temperature", 5 / 9, -160 / 9),
        Unit("degF", "temperature", 5 / 9, -160 / 9),
        Unit("K", "temperature difference", 1.0),
        Unit("mK", "temperature difference", 1e-3),
        Unit("%", "ratio", 1e-2),
        Unit("ppm", "ratio", 1e-6),
        Unit("K/W", "thermal resistance", 1.0),
        Unit("°C/W", "thermal resistance", 1.0),
        Unit("ppm/K", "temperature coefficient", 1e-6),
        Unit("ppm/°C", "temperature coefficient", 1e-6),
        Unit("%/K", "temperature coefficient", 1e-2),
    ]
    return {unit.symbol: unit for unit in units}


UNITS: dict[str, Unit] = _table()

# A letter for each prefix; the case of a unit is kept, since mA is not MA.
_NUMBER = re.compile(r"[+\-−]?(?:\d+(?:\.\d*)?|\.\d+)(?:[eE][+\-−]?\d+)?")


@dataclass(frozen=True, slots=True)
class Rate:
    """A change of temperature within an interval, such as 1 K in 30 min."""

    difference: float  # [K]
    interval: float  # [s]


def find_unit(symbol: str, kind: str | None = None) -> Unit | None:
    """The unit written `symbol`, case kept, or None; with `kind`, only a unit of that kind.

    A difference of temperature may be written in °C, and a plain number is a ratio of no unit.
    """
    unit = UNITS.get(symbol.strip())
    if unit is None or kind is None or unit.kind == kind:
        return unit
    if kind == "temperature difference" and unit.kind == "temperature":
        return Unit(unit.symbol, kind, unit.factor)
    return None


def parse_quantity(text: str, kind: str) -> float:
    """The SI value of a quantity written with its unit, such as "24 V", "105 %" or "12 mohm".

    Parameters
    ----------
    text
        A number with a decimal point, and a unit of the closed table.
    kind
        One of `KINDS`.

    Raises
    ------
    MeasurementError
        If there is no number, no unit, an unknown unit, or a unit of another kind.
    """
    text = text.strip()
    match = _NUMBER.match(text)
    if match is None:
        msg = f'"{text}" does not begin with a number'
        raise MeasurementError(msg)
    symbol = text[match.end() :].strip()
    number = float(match.group().replace("−", "-"))
    unit = find_unit(symbol, kind)
    if unit is None:
        raise MeasurementError(_unit_fault(text, symbol, kind))
    value = unit.to_si(number)
    if not math.isfinite(value):
        msg = f'"{text}" is too large'
        raise MeasurementError(msg)
    return value


def _unit_fault(text: str, symbol: str, kind: str) -> str:
    if not symbol:
        return f'"{text}" has no unit'
    if symbol[0] == "," and symbol[1:2].isdigit():
        return f'"{text}" has a decimal comma, and a limits file takes a decimal point'
    known = UNITS.get(symbol)
    if known is not None:
        return f'"{text}" is a {known.kind}, not a {kind}'
    return f'"{symbol}" in "{text}" is no known unit'


def parse_quantity_with_bound(text: str, kind: str) -> tuple[float, float | None]:
    """A quantity and the bound of its error, written "12 mohm ± 2 mohm"; None where no bound is written."""
    value, mark, bound = text.replace("+/-", "±").replace("+-", "±").partition("±")
    if not mark:
        return parse_quantity(value, kind), None
    limit = parse_quantity(bound, "temperature difference" if kind == "temperature" else kind)
    if limit < 0:
        msg = f'"{text}" has a negative bound'
        raise MeasurementError(msg)
    return parse_quantity(value, kind), limit


def parse_rate(text: str) -> Rate:
    """A change of temperature within an interval, written "1 K/30 min" or "2 K/h"."""
    difference, mark, interval = text.partition("/")
    if not mark:
        msg = f'"{text}" is no change within a time'
        raise MeasurementError(msg)
    interval = interval.strip()
    seconds = parse_quantity(interval if interval[:1].isdigit() else f"1 {interval}", "time")
    kelvin = parse_quantity(difference, "temperature difference")
    if kelvin <= 0 or seconds <= 0:
        msg = f'"{text}" must be above zero'
        raise MeasurementError(msg)
    return Rate(kelvin, seconds)
