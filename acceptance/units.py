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

__all__ = [
    "KINDS",
    "UNITS",
    "Rate",
    "Unit",
    "find_unit",
    "parse_quantity",
    "parse_quantity_with_bound",
    "parse_rate",
    "quoted",
]

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

_PREFIXES = {
    "p": 1e-12,
    "n": 1e-9,
    "u": 1e-6,
    _MICRO: 1e-6,
    "μ": 1e-6,
    "m": 1e-3,
    "": 1.0,
    "k": 1e3,
    "M": 1e6,
    "G": 1e9,
}


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
        *_prefixed("frequency", "Hz", "m-kMG"),
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
        Unit("1/K", "temperature coefficient", 1.0),
    ]
    return {unit.symbol: unit for unit in units}


UNITS: dict[str, Unit] = _table()

_NUMBER = re.compile(r"([+\-−]?(?:\d+(?:\.\d*)?|\.\d+))(?:[eE]([+\-−]?\d{1,5}))?", re.ASCII)
_NUMBER_STARTS = tuple("0123456789.")
_ABSOLUTE_ZERO = -273.15  # °C
_LONGEST = 200  # characters that a quantity may have
# factors that only move the decimal point: 57 % is read as 57e-2, which is 0.57 and not 57 * 0.01
_POWERS = {factor: round(math.log10(factor)) for factor in (*_PREFIXES.values(), 1e-2)}


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
    if len(text) > _LONGEST:
        msg = f"{quoted(text)} is too long for a number and its unit"
        raise MeasurementError(msg)
    match = _NUMBER.match(text)
    if match is None:
        msg = f"{quoted(text)} does not begin with a number" if text else "no number is given"
        raise MeasurementError(msg)
    unit = find_unit(text[match.end() :], kind)
    if unit is None:
        raise MeasurementError(_unit_fault(text, text[match.end() :].strip(), kind))
    value = _scaled(match, unit)
    if not math.isfinite(value):
        msg = f"{quoted(text)} is too large"
        raise MeasurementError(msg)
    if kind == "temperature" and value < _ABSOLUTE_ZERO:
        msg = f"{quoted(text)} lies below absolute zero"
        raise MeasurementError(msg)
    return value


def quoted(text: str) -> str:
    """The text in quotation marks, on one line and not longer than a line, for a message."""
    shown = text if len(text) <= 60 else text[:57] + "..."
    return '"' + "".join(c if c.isprintable() else c.encode("unicode_escape").decode("ascii") for c in shown) + '"'


def _scaled(match: re.Match[str], unit: Unit) -> float:
    """The SI value, correctly rounded where the unit only moves the decimal point; never minus zero."""
    digits = match[1].replace("−", "-")
    exponent = int((match[2] or "0").replace("−", "-"))
    shift = _POWERS.get(unit.factor)
    if shift is not None and unit.offset == 0:
        return float(f"{digits}e{exponent + shift}") + 0.0
    return unit.to_si(float(f"{digits}e{exponent}")) + 0.0


def _unit_fault(text: str, symbol: str, kind: str) -> str:
    if not symbol:
        return f"{quoted(text)} has no unit"
    if symbol[0] == "," and symbol[1:2].isdigit():
        return f"{quoted(text)} has a decimal comma, and a limits file takes a decimal point"
    if symbol[0].isdigit():
        return f"{quoted(text)} has a space inside its number"
    known = UNITS.get(symbol)
    if known is not None:
        return f"{quoted(text)} is a {known.kind}, not a {kind}"
    alike = " or ".join(u.symbol for u in UNITS.values() if u.kind == kind and u.symbol.lower() == symbol.lower())
    hint = f" (units keep their case: {alike})" if alike else ""
    return f"{quoted(symbol)} in {quoted(text)} is no known unit{hint}"


def parse_quantity_with_bound(text: str, kind: str) -> tuple[float, float | None]:
    """A quantity and the bound of its error, written "12 mohm ± 2 mohm"; None where no bound is written."""
    value, mark, bound = text.replace("+/-", "±").replace("+-", "±").partition("±")
    if not mark:
        return parse_quantity(value, kind), None
    limit = parse_quantity(bound, "temperature difference" if kind == "temperature" else kind)
    if limit < 0:
        msg = f"{quoted(text)} has a negative bound"
        raise MeasurementError(msg)
    return parse_quantity(value, kind), limit


def parse_rate(text: str) -> Rate:
    """A change of temperature within an interval, written "1 K/30 min" or "2 K/h"."""
    difference, mark, interval = text.partition("/")
    if not mark:
        msg = f"{quoted(text)} is no change within a time"
        raise MeasurementError(msg)
    interval = interval.strip()
    seconds = parse_quantity(interval if interval[:1] in _NUMBER_STARTS else f"1 {interval}", "time")
    kelvin = parse_quantity(difference, "temperature difference")
    if kelvin <= 0 or seconds <= 0:
        msg = f"{quoted(text)} must be above zero"
        raise MeasurementError(msg)
    return Rate(kelvin, seconds)
