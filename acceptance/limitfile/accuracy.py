"""Accuracy texts of instruments, such as "0.05 % reading + 0.02 % range + 3 digits, k = 2"."""

from __future__ import annotations

import math
import re
from dataclasses import dataclass

from acceptance.errors import MeasurementError
from acceptance.units import UNITS, parse_quantity, quoted

__all__ = ["Accuracy", "parse_accuracy"]

_COVERAGE = re.compile(r"[,;(]?\s*\bk\s*=\s*([0-9.]+)\s*\)?\s*$", re.IGNORECASE)
_TERM = re.compile(
    r"^(?P<size>[0-9.eE+\-]+)\s*(?P<unit>%(?=[A-Za-z\s.]|$)|[^\s0-9%]\S*)?\s*(?:of\s+)?(?:full\s+)?(?P<what>[A-Za-z]+)?\.?$"
)
_PLUS = re.compile(r"(?<![0-9.][eE])\+")  # between terms, not within 1e+3
_LARGEST_K = 10
_LONGEST = 200  # characters
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
    unit (temperatures in K; a ratio also as a plain number). "k = 2" at the end says that the bound is an
    expanded uncertainty.

    Raises
    ------
    MeasurementError
        If a term is not understood, or all of them are zero; the text names it.
    """
    if len(text) > _LONGEST:
        msg = f"{quoted(text)} is too long for an accuracy"
        raise MeasurementError(msg)
    if not text.strip():
        msg = "no accuracy is given"
        raise MeasurementError(msg)
    body = text.replace("+/-", "±").strip().lstrip("±").strip()
    coverage = None
    if found := _COVERAGE.search(body):
        coverage = _number(found.group(1), text)
        if not 1 <= coverage <= _LARGEST_K:
            msg = f"k in {quoted(text)} does not lie between 1 and {_LARGEST_K}"
            raise MeasurementError(msg)
        body = body[: found.start()].rstrip(" ,;")
    parts = {"gain": 0.0, "of_range": 0.0, "fixed": 0.0, "digits": 0.0}
    for term in _PLUS.split(body):
        name, size = _term(term.strip(" ±()"), text, kind)
        if size < 0:
            msg = f"{quoted(term.strip())} in {quoted(text)} is negative"
            raise MeasurementError(msg)
        parts[name] += size
    if not any(parts.values()):
        msg = f"{quoted(text)} states no error at all"
        raise MeasurementError(msg)
    return Accuracy(text=text, coverage=coverage, **parts)


def _term(term: str, text: str, kind: str) -> tuple[str, float]:
    match = _TERM.match(term)
    if match is None:
        msg = f"{quoted(term)} in {quoted(text)} is no accuracy term" if term else f"{quoted(text)} lacks a term"
        raise MeasurementError(msg)
    unit, what = match["unit"] or "", (match["what"] or "").lower()
    if (not what and unit.lower() in _DIGITS) or (not unit and what in _DIGITS):
        return "digits", _number(match["size"], text)
    if not what and unit.lower() in _READING | _RANGE:
        unit, what = "", unit.lower()
    if what in _READING or what in _RANGE:
        return _share(match, what, text)
    if unit and what:
        msg = f"{quoted(match['what'])} in {quoted(text)} is neither reading, range nor digits"
        raise MeasurementError(msg)
    known = UNITS.get(unit)
    if known is not None and known.kind == "ratio":
        msg = f'{quoted(term)} in {quoted(text)} does not say of what ("{term} reading" or "{term} range")'
        raise MeasurementError(msg)
    if kind == "ratio" and not unit and not what:
        return "fixed", _number(match["size"], text)
    return "fixed", parse_quantity(term, "temperature difference" if kind == "temperature" else kind)


def _share(match: re.Match[str], what: str, text: str) -> tuple[str, float]:
    """A share of the reading or of the range."""
    known = UNITS.get(match["unit"] or "") if match["what"] else None
    if known is None or known.kind != "ratio":
        msg = f'{quoted(match[0])} in {quoted(text)} needs % or ppm before "{what}"'
        raise MeasurementError(msg)
    _number(match["size"], text)
    share = parse_quantity(f"{match['size']} {known.symbol}", "ratio")
    return ("gain" if what in _READING else "of_range"), share


def _number(digits: str, text: str) -> float:
    try:
        number = float(digits)
    except ValueError:
        number = math.nan
    if not math.isfinite(number):
        msg = f"{quoted(digits)} in {quoted(text)} is no number"
        raise MeasurementError(msg)
    return number
