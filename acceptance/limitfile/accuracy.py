"""Accuracy texts of instruments, such as "0.05 % reading + 0.02 % range + 3 digits, k = 2"."""

from __future__ import annotations

import re
from dataclasses import dataclass

from acceptance.errors import MeasurementError
from acceptance.units import UNITS, parse_quantity

__all__ = ["Accuracy", "parse_accuracy"]

_COVERAGE = re.compile(r"[,;(]?\s*\bk\s*=\s*([0-9.]+)\s*\)?\s*$", re.IGNORECASE)
_TERM = re.compile(r"^(?P<size>[0-9.eE+\-]+)\s*(?P<unit>[^\s0-9]\S*)?\s*(?:of\s+)?(?P<what>[A-Za-z]+)?\.?$")
_READING = frozenset({"reading", "rdg", "rd", "value"})
_RANGE = frozenset({"range", "rng", "fs", "scale"})
_DIGITS = frozenset({"digits", "digit", "dgt", "dgts", "counts", "count"})


@dataclass(frozen=True, slots=True)
class Accuracy:
    """A bound of error: gain * |reading| + of_range * range + fixed + digits * resolution."""

    text: str
    gain: float = 0.0  # fraction of the reading
    of_range: float = 0.0  # fraction of the range
    fixed: float = 0.0  # in the SI unit of the quantity
    digits: float = 0.0  # times the resolution
    coverage: float | None = None  # the k the bound was stated for; None: the edge of a rectangle


def parse_accuracy(text: str, kind: str) -> Accuracy:
    """The accuracy written in `text`, for a quantity of that kind.

    Terms are joined by "+": per cent or ppm of reading or range, a number of digits, an amount with its
    unit (temperatures in K). "k = 2" at the end says that the bound is an expanded uncertainty.

    Raises
    ------
    MeasurementError
        If a term is not understood; the text names it.
    """
    body = text.strip().lstrip("±").strip()
    coverage = None
    if found := _COVERAGE.search(body):
        coverage = _number(found.group(1), text)
        if coverage <= 0:
            msg = f'k in "{text}" must be above zero'
            raise MeasurementError(msg)
        body = body[: found.start()].rstrip(" ,;")
    parts = {"gain": 0.0, "of_range": 0.0, "fixed": 0.0, "digits": 0.0}
    for term in re.split(r"(?<![eE])\+(?!/)", body):
        name, size = _term(term.strip(" ±()"), text, kind)
        if size < 0:
            msg = f'"{term.strip()}" in "{text}" is negative'
            raise MeasurementError(msg)
        parts[name] += size
    return Accuracy(text=text, coverage=coverage, **parts)


def _term(term: str, text: str, kind: str) -> tuple[str, float]:
    match = _TERM.match(term)
    if match is None:
        msg = f'"{term}" in "{text}" is no accuracy term'
        raise MeasurementError(msg)
    unit, what = match["unit"] or "", (match["what"] or "").lower()
    if not what and unit.lower() in _DIGITS:
        return "digits", _number(match["size"], text)
    if unit == "" and what in _DIGITS:
        return "digits", _number(match["size"], text)
    if what in _READING or what in _RANGE:
        known = UNITS.get(unit)
        if known is None or known.kind != "ratio":
            msg = f'"{term}" in "{text}" needs % or ppm before "{what}"'
            raise MeasurementError(msg)
        return ("gain" if what in _READING else "of_range"), known.to_si(_number(match["size"], text))
    if UNITS.get(unit or what) is not None and UNITS[unit or what].kind == "ratio":
        msg = f'"{term}" in "{text}" does not say of what; write "{term} reading" or "{term} range"'
        raise MeasurementError(msg)
    return "fixed", parse_quantity(term, "temperature difference" if kind == "temperature" else kind)


def _number(digits: str, text: str) -> float:
    try:
        return float(digits)
    except ValueError:
        msg = f'"{digits}" in "{text}" is no number'
        raise MeasurementError(msg) from None
