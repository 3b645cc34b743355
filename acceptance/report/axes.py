"""Axes of a chart: which range they show, where their ticks stand, and where a value comes to lie.

Plain functions of numbers, with no page in them.
"""

from __future__ import annotations

import math
from collections.abc import Iterable, Sequence
from dataclasses import dataclass

from acceptance.printing import MINUS, Scale

__all__ = ["LinearAxis", "axis_for", "decimate", "decimate_cloud", "decimate_path", "nice_step"]

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


def _minutes(span: float, most: int) -> float:
    """As `nice_step`, above ten minutes with quarters and halves of an hour."""
    least = span / most * (1 - 1e-9)
    if least <= 10.0:
        return nice_step(span, most)
    return next((step for step in (15.0, 20.0, 30.0, 60.0) if step >= least), nice_step(span, most))


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
        Whether an axis that begins near zero shows zero, and one that begins right below it (noise) hardly more.
    """
    listed = list(values)
    low, high = _opened(min(listed), max(listed))
    if from_zero and 0 < low < 0.35 * high:
        low = 0.0
    free = padding * (high - low)
    # free room below nothing is a lie where nothing is below zero
    begins = 0.0 if 0 <= low < free else low - free
    if from_zero and -0.02 * high < low < 0:
        begins = low
    low, high = begins, (0.0 if -free < high <= 0 else high + free)
    unit = scale.size
    step = (_minutes if scale.symbol == "min" else nice_step)((high - low) / unit, most)
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


def decimate_path(x: Sequence[float], y: Sequence[float], buckets: int = 500) -> list[int]:
    """Places of the points of a line, in their order; where it turns back in x, the extremes of x are kept as well."""
    if len(y) <= 2 * buckets:
        return list(range(len(y)))
    if all(before <= after for before, after in zip(x, x[1:], strict=False)):
        return decimate(y, buckets)
    half = max(1, buckets // 2)
    return sorted({*decimate(x, half), *decimate(y, half)})


def decimate_cloud(x: Sequence[float], y: Sequence[float], most: int = 1000) -> list[int]:
    """Places of the dots that are drawn: the first in each cell of a grid, so that none that lies apart is lost."""
    if len(y) <= most:
        return list(range(len(y)))
    cells = 400
    kept = _first_in_cell(x, y, cells)
    while len(kept) > most and cells > 1:
        cells //= 2
        kept = _first_in_cell(x, y, cells)
    return kept


def _first_in_cell(x: Sequence[float], y: Sequence[float], cells: int) -> list[int]:
    (left, wide), (low, high) = (_range(x), _range(y))
    found: dict[tuple[int, int], int] = {}
    for place, (a, b) in enumerate(zip(x, y, strict=True)):
        found.setdefault((int((a - left) / wide * cells), int((b - low) / high * cells)), place)
    return list(found.values())


def _range(values: Sequence[float]) -> tuple[float, float]:
    """The lowest value, and how far the others reach above it; 1 where they do not."""
    low = min(values)
    return low, (max(values) - low) or 1.0
