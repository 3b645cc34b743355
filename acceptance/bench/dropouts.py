"""Single zeros that a logger wrote for want of a reading, told from the readings beside them."""

from __future__ import annotations

from collections.abc import Iterator, Sequence

import numpy as np
from numpy.typing import NDArray

from acceptance.bench.log import Doubt, Span
from acceptance.bench.standstill import Trace, Values, place_of, words_of
from acceptance.bench.values import Column

__all__ = ["dropouts"]

_BESIDE = 10  # neighbours looked at on each side of a zero
_NEXT = 4  # neighbours on each side that are looked at first
_FAR = 20.0  # times their spread that these lie from zero
_DIGITS = 3  # of the channel: a reading of no more is no reading far from zero
_ZEROS = 2  # in one neighbourhood; more of them are the unit's manner, such as bursts
_CHANGED = 0.2  # of the input power: then the load did change


def dropouts(channel: Trace, tables: Sequence[Span], power: Column | None = None) -> Iterator[Doubt]:
    """Single zeros amid readings far from zero: what some loggers write for a reading that did not come.

    Parameters
    ----------
    power
        Input power or current, which vouches for an output's zero where it changed with it. [any]
    """
    values = channel.values
    zeros = np.flatnonzero(values == 0)
    if not zeros.size:
        return
    zeros = zeros[~_between_signs(values, zeros)]
    found = [
        row for a, b in tables for row in zeros[(zeros >= a) & (zeros < b)].tolist() if _is_alone(values, row, a, b)
    ]
    # an offset that shows one digit is 0 in the next reading for good reason
    digit = _last_digit(values) if found else 0.0
    found = [row for row in found if _DIGITS * digit < float(np.abs(values[[row - 1, row + 1]]).min())]
    found = [row for row in found if power is None or not _is_vouched(power, row)]
    if not found:
        return
    count = "a single reading" if len(found) == 1 else f"{len(found)} single readings"
    text = (
        f"{words_of(channel.key)} is 0 in {count} amid others far from it, first at {place_of(channel.log, found[0])}"
    )
    spans = tuple((row, row + 1) for row in found)
    remedy = "look to the logger, and measure again or leave the line out"
    yield Doubt("dropout", text, bars=True, channels=(channel.key,), spans=spans, remedy=remedy)


def _between_signs(values: Values, zeros: NDArray[np.intp]) -> NDArray[np.bool_]:
    """Which zeros have readings above and below zero next to them: noise about zero, of which there may be much."""
    inside = (zeros >= _NEXT) & (zeros < values.size - _NEXT)
    steps = [step for step in range(-_NEXT, _NEXT + 1) if step]
    beside = np.stack([values[np.clip(zeros + step, 0, values.size - 1)] for step in steps])
    beside[~np.isfinite(beside)] = 0.0
    return inside & (beside > 0).any(axis=0) & (beside < 0).any(axis=0)


def _is_alone(values: Values, row: int, first: int, stop: int) -> bool:
    """Whether a zero stands alone amid steady readings of its table."""
    before, after = (
        values[max(first, row - _BESIDE - _ZEROS) : row],
        values[row + 1 : min(stop, row + 1 + _BESIDE + _ZEROS)],
    )
    if not (before.size and after.size and before[-1] != 0 and after[0] != 0):
        return False
    zeros = 1 + np.count_nonzero(before == 0) + np.count_nonzero(after == 0)
    sides = [side[np.isfinite(side) & (side != 0)] for side in (before[::-1], after)]
    if zeros > _ZEROS or any(side.size < _BESIDE for side in sides):
        return False
    beside = np.concatenate([side[:_BESIDE] for side in sides])
    return bool(np.abs(beside).min() > _FAR * beside.std() and (np.sign(beside) == np.sign(beside[0])).all())


def _last_digit(values: Values) -> float:
    """The smallest step between readings other than 0; 0 where they are all alike."""
    steps = np.diff(np.unique(values[np.isfinite(values) & (values != 0)]))
    steps = steps[steps > 1e-9 * float(np.nanmax(np.abs(values)))] if steps.size else steps
    return float(steps.min()) if steps.size else 0.0


def _is_vouched(power: Column, row: int) -> bool:
    """Whether the input took another power in this sample, but took some: then the load did change."""
    first = max(0, row - _BESIDE)
    around = power[first : row + 1 + _BESIDE]
    beside = np.delete(around, row - first)
    typical = float(np.median(beside[np.isfinite(beside)])) if np.isfinite(beside).any() else 0.0
    here = around[row - first]
    return bool(here != 0 and np.isfinite(here) and abs(here - typical) > _CHANGED * abs(typical))
