"""Axes of a chart: which range they show, where their ticks stand, and where a value comes to lie.

Plain functions of numbers, with no page in them.
"""

from __future__ import annotations

import math
from collections.abc import Iterable, Sequence
from dataclasses import dataclass

from acceptance.printing import MINUS, Scale

__all__ = ["LinearAxis", "axis_for", "decimate", "nice_step"]

_FLATTEST = 1e-9  # a range narrower than this share of its values is shown as one value


@dataclass(frozen=True, slots=True)
class LinearAxis:
    """A straight axis: values from `low` to `high` lie from `start` to `end` on the page."""

    low: float
    high: float
    start: float  # [pt]
    end: float  # [pt]
    ticks: tuple[float, ...]
    labels: tuple[str, ...]

    def place(self, value: float) -> float:
        """Where a value lies on the page. [pt]"""
        return self.start + (value - self.low) / (self.high - self.low) * (self.end - self.start)


def nice_step(span: float, most: int) -> float:
    """The smallest step of 1, 2 or 5 times a power of ten that gives at most so many steps over the span."""
    least = span / most
    power = 10.0 ** math.floor(math.log10(least))
    for factor in (1.0, 2.0, 5.0):
        if factor * power >= least * (1 - 1e-9):
            return factor * power
    return 10.0 * power


def axis_for(
    values: Iterable[float],
    scale: Scale,
    place: tuple[float, float],
    *,
    most: int,
    padding: float = 0.06,
    from_zero: bool = False,
) -> LinearAxis:
    """An axis that shows all the values, its ends on ticks or a little beyond them.

    Parameters
    ----------
    values
        Finite; at least one. [SI]
    scale
        How the numbers are written beside the ticks.
    place
        Where the axis begins and ends on the page. [pt]
    most
        At most about so many steps.
    padding
        Share of the range that is left free at both ends.
    from_zero
        Whether an axis that begins near zero shows zero.
    """
    listed = list(values)
    low, high = _opened(min(listed), max(listed))
    if from_zero and 0 < low < 0.35 * high:
        low = 0.0
    free = padding * (high - low)
    # free room below nothing is a lie where nothing is below zero
    low, high = (0.0 if 0 <= low < free else low - free), (0.0 if -free < high <= 0 else high + free)
    unit = 10.0**scale.exponent
    step = nice_step((high - low) / unit, most)
    first, last = math.ceil(low / unit / step - 1e-9), math.floor(high / unit / step + 1e-9)
    decimals = max(0, -math.floor(math.log10(step) + 1e-9))
    numbers = [round(n * step, decimals) for n in range(first, last + 1)]
    labels = tuple(_label(number, decimals) for number in numbers)
    return LinearAxis(low, high, place[0], place[1], tuple(number * unit for number in numbers), labels)


def _opened(low: float, high: float) -> tuple[float, float]:
    """A range that is not empty: a single value stands in the middle of its own."""
    largest = max(abs(low), abs(high))
    if high - low > _FLATTEST * largest:
        return low, high
    half = 0.05 * largest or 1.0
    middle = low / 2 + high / 2
    return middle - half, middle + half


def _label(number: float, decimals: int) -> str:
    text = f"{number:.{decimals}f}" if abs(number) < 1e7 else f"{number:.6g}"
    return (text[1:] if text.startswith("-") and not text.strip("-0.") else text).replace("-", MINUS)


def decimate(y: Sequence[float], buckets: int = 500) -> list[int]:
    """Places of the values that are drawn: of each bucket its lowest and its highest, so that no spike is lost.

    The first and the last are kept too. A row of at most twice as many values as buckets is kept whole.
    """
    if len(y) <= 2 * buckets:
        return list(range(len(y)))
    kept = {0, len(y) - 1}
    for bucket in range(buckets):
        begin, end = bucket * len(y) // buckets, (bucket + 1) * len(y) // buckets
        part = y[begin:end]
        kept |= {begin + part.index(min(part)), begin + part.index(max(part))}
    return sorted(kept)
