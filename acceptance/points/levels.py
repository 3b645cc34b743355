"""Where one channel stands still: its levels, found from the samples alone.

From fine to coarse, the means of two neighbouring windows are compared; where they differ by more than noise and
tolerance allow, the channel is cut. The pieces are then merged, freed of what belongs to the step before them, and
those that only move from one level to the next (ramps) are dropped. Cost is linear in the number of samples.

Published relatives of the windows on a fixed grid: seeded binary segmentation (2020); the rule on pieces, the noise
model and the constants are ours, set on synthetic sweeps with known truth (tests/points/dwell_logs.py).
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass, replace
from itertools import pairwise

import numpy as np
import numpy.typing as npt

from acceptance.points.noise import (
    SAMPLED,
    SIGMAS,
    SWING_SHARE,
    Array,
    Noise,
    floor_of,
    median,
    noise_of,
    running_sum,
    two_windows,
    windows,
)

__all__ = ["Level", "find_levels"]

Span = tuple[int, int]
Level = tuple[int, int, float]  # first sample, one past the last, level in the channel's unit

RAMP_SHARE = 0.3  # of the step to a neighbour: a piece that drifts so far towards it is on a ramp
MOST_ROWS = 2000  # nobody writes down more by hand
FEW_ROWS = 24  # too few to tell noise from conditions in any order
MOSTLY = 0.6  # of the rows
MANY = 1_000_000  # samples of which nothing is formed that may not be needed
CLUSTER_SHARE = 0.08  # of the span, between two loads of a plan by hand


@dataclass(frozen=True, slots=True)
class _Piece:
    """Samples [first, stop) between two cuts."""

    first: int
    stop: int
    level: float
    drift: float = 0.0  # end against start

    @property
    def length(self) -> int:
        return self.stop - self.first


def find_levels(
    x: npt.ArrayLike,
    *,
    tolerance: float | None = None,
    smallest: float = 0.0,
    min_samples: int = 2,
    min_dwell: int | None = None,
) -> list[Level]:
    """The stretches where a channel stays at one level, in order and without overlap.

    Parameters
    ----------
    x : shape (n,)
        Samples of one channel. What is not finite is passed over; a stretch may span it.
    tolerance
        Changes up to this make no new level. Default: 0.4 % of the span, 0.1 % of the largest reading or one and
        a half converter steps, whichever is largest, and noise in proportion to the reading. [unit of x]
    smallest
        The default tolerance is never below this; means nothing where a tolerance is given. [unit of x]
    min_samples
        Fewer samples than this make no level, unless every row is a condition of its own.
    min_dwell
        Shorter stretches are dropped. Default: found from the lengths of the others. [samples]

    Returns
    -------
    list of (first, stop, level)
        Samples [first, stop) and the median between them; settling and ramps left out.
    """
    values = np.ascontiguousarray(x, dtype=np.float64).ravel()
    finite = np.isfinite(values)
    at: npt.NDArray[np.intp] | range = range(values.size) if finite.all() else np.flatnonzero(finite)
    if not len(at):
        return []
    y = values if isinstance(at, range) else values[at]
    largest = max(float(np.max(y)), -float(np.min(y)))
    if largest == 0:
        return [(int(at[0]), int(at[-1]) + 1, 0.0)]
    y = y / largest  # so that no sum overflows, and a thousandfold reading has the same levels
    asked = None if tolerance is None else tolerance / largest
    if _stays(y, floor_of(y, asked, smallest / largest) if asked is not None or y.size > MANY else 0.0):
        return [(int(at[0]), int(at[-1]) + 1, median(y) * largest)]  # its noise need not be known
    noise = noise_of(y, asked, smallest / largest)
    pieces = _segment(y, noise, min_samples=min_samples, min_dwell=min_dwell)
    return [(int(at[p.first]), int(at[p.stop - 1]) + 1, p.level * largest) for p in pieces]


def _stays(y: Array, floor: float) -> bool:
    return float(np.max(y)) - float(np.min(y)) <= max(floor, 1e-12)


def _segment(y: Array, noise: Noise, *, min_samples: int, min_dwell: int | None) -> list[_Piece]:
    """The whole chain, on finite samples."""
    if _stays(y, noise.floor):
        return [_Piece(0, y.size, median(y))]
    if _is_one_row_a_condition(y, noise):
        return _equal_runs(y, noise.floor)
    pieces = _merged(_pieces_between(y, _cuts(y, noise)), noise)
    pieces = [piece for piece in pieces if piece.length >= min_samples]
    pieces = _rejoined(pieces, noise)
    for _ in range(2):  # a piece freed of its swing in may turn out to go on with the one before
        pieces = [trimmed for piece in pieces if (trimmed := _trimmed(y, piece, noise)).length >= min_samples]
        pieces = _rejoined(pieces, noise)
    pieces = [replace(piece, drift=_drift(y[piece.first : piece.stop])) for piece in pieces]
    return _without_fragments(_without_ramps(pieces, noise), noise, min_dwell)


# --- cuts -------------------------------------------------------------------------------------------------------


def _is_one_row_a_condition(y: Array, noise: Noise) -> bool:
    """Whether neighbouring rows mostly differ by more than any noise would: a log kept by hand."""
    if y.size >= MOST_ROWS:
        return False
    step = np.diff(y)
    if np.mean(np.abs(step) > noise.floor) <= MOSTLY:
        return False
    if y.size < FEW_ROWS:
        return True
    # two thirds of white noise are turning points, of which a sweep has few
    if np.mean(step[1:] * step[:-1] < 0) < 0.4:
        return True
    # conditions met again and again: the readings lie in clusters, and neighbours in different ones
    apart = CLUSTER_SHARE * float(np.ptp(y))
    gaps = np.diff(np.sort(y))
    return bool(np.sum(gaps[gaps > apart]) > 0.8 * np.ptp(y) and np.mean(np.abs(step) > apart) > MOSTLY)


def _equal_runs(y: Array, floor: float) -> list[_Piece]:
    borders = [0, *(np.flatnonzero(np.abs(np.diff(y)) > floor) + 1).tolist(), y.size]
    return [_Piece(first, stop, median(y[first:stop])) for first, stop in pairwise(borders)]


def _cuts(y: Array, noise: Noise) -> npt.NDArray[np.intp]:
    """The borders between pieces, 0 and n included."""
    cut = np.zeros(y.size + 1, dtype=np.bool_)
    total = running_sum(y)
    for window in windows(y.size):
        difference, mean = two_windows(total, window)
        np.abs(mean + y[0], out=mean)
        limit = np.maximum(SIGMAS * noise.fixed[window], noise.swing(window) * mean)
        np.maximum(limit, noise.floor * (1 + 1e-9), out=limit)
        if window == 1:
            cut[1:-1] = np.abs(difference) > limit
        else:
            up, down = _runs(difference > limit), _runs(difference < -limit)
            _add_coarse_cuts(cut, np.abs(difference, out=difference), window, runs=[*up, *down])
    cut[[0, -1]] = True
    return np.flatnonzero(cut)


def _add_coarse_cuts(cut: npt.NDArray[np.bool_], difference: Array, window: int, *, runs: Sequence[Span]) -> None:
    """Cut where a run of large differences is not explained by the cuts of finer windows.

    A step explains the differences of windows up to their own length away. What is left is cut at its largest
    difference and, where it is too long for a step seen through this window (a slow ramp), at its ends.
    """
    stride = max(1, window // 4)
    finer = np.flatnonzero(cut)
    for first, stop in runs:
        begin, end = first * stride + window, (stop - 1) * stride + window
        near = finer[np.searchsorted(finer, begin - window) : np.searchsorted(finer, end + window, side="right")]
        for low, high in _unexplained(begin, end, near, reach=window):
            if near.size == 0 or high - low > window:
                part = slice((low - window) // stride, (high - window) // stride + 1)
                cut[(part.start + int(np.argmax(difference[part]))) * stride + window] = True
            if high - low > (3 if near.size == 0 else 1) * window:
                cut[[low, high]] = True


def _unexplained(begin: int, end: int, cuts: npt.NDArray[np.intp], *, reach: int) -> list[Span]:
    """The parts of [begin, end] further than `reach` from every cut."""
    lows = [begin, *(cuts + reach).tolist()]
    highs = [*(cuts - reach).tolist(), end]
    return [(low, high) for low, high in zip(lows, highs, strict=True) if low <= high]


def _runs(mask: npt.NDArray[np.bool_]) -> list[Span]:
    """First index and one past the last of every run of True."""
    edges = np.flatnonzero(np.diff(np.concatenate(([0], mask.view(np.int8), [0])))).tolist()
    return list(zip(edges[::2], edges[1::2], strict=True))


# --- pieces -----------------------------------------------------------------------------------------------------


def _pieces_between(y: Array, cuts: npt.NDArray[np.intp]) -> list[_Piece]:
    """The pieces, each with the median of its last 70 %: a step's overshoot lies in the rest."""
    pieces = []
    for first, stop in pairwise(cuts.tolist()):
        if stop - first == 1:
            pieces.append(_Piece(first, stop, float(y[first])))
        else:
            settled = first + int(0.3 * (stop - first)) if stop - first >= 4 else first
            pieces.append(_Piece(first, stop, median(y[settled:stop])))
    return pieces


def _joined(one: _Piece, other: _Piece) -> _Piece:
    """One piece over both and what lies between, at their mean level by length."""
    level = (one.level * one.length + other.level * other.length) / (one.length + other.length)
    return _Piece(one.first, other.stop, level)


def _merged(pieces: Sequence[_Piece], noise: Noise) -> list[_Piece]:
    """Neighbours whose levels differ by no more than tolerance and noise, joined."""
    out: list[_Piece] = []
    for piece in pieces:
        if out:
            shorter = min(piece.length, out[-1].length)
            if abs(out[-1].level - piece.level) <= max(noise.floor, SIGMAS * noise.of_mean(shorter)):
                out[-1] = _joined(out[-1], piece)
                continue
        out.append(piece)
    return out


def _rejoined(pieces: Sequence[_Piece], noise: Noise) -> list[_Piece]:
    """Pieces of one level with only a few samples (gross outliers) between them, joined."""
    out: list[_Piece] = []
    for piece in pieces:
        if out and abs(out[-1].level - piece.level) <= noise.floor:
            gap = piece.first - out[-1].stop
            longer = max(out[-1], piece, key=lambda p: p.length)
            if gap <= max(2, 0.02 * longer.length):
                out[-1] = replace(longer, first=out[-1].first, stop=piece.stop)
                continue
        out.append(piece)
    return out


def _trimmed(y: Array, piece: _Piece, noise: Noise) -> _Piece:
    """The piece without the mostly deviating samples it begins with and those it ends with."""
    part = y[piece.first : piece.stop]
    band = max(SIGMAS * noise.sigma, noise.floor, noise.step, _swing_of(part, piece.level, noise))
    off = np.flatnonzero(np.abs(part - piece.level) > band)
    if not off.size:
        return replace(piece, level=median(part))
    early = off[: np.searchsorted(off, max(2, part.size // 2))]
    dense = np.flatnonzero(np.arange(1, early.size + 1) >= 0.3 * (early + 1))  # outliers further in are not dense
    lead = int(early[dense[-1]]) + 1 if dense.size else 0
    at_end = int(np.count_nonzero(off[::-1] == np.arange(part.size - 1, part.size - 1 - off.size, -1)))
    tail = max(lead + 1, part.size - at_end)
    level = median(part[lead:tail]) if lead < part.size else piece.level
    return _Piece(piece.first + lead, piece.first + min(tail, part.size), level)


def _swing_of(part: Array, level: float, noise: Noise) -> float:
    """How far a piece swings about its level, where that is a small share of the reading."""
    if noise.declared:
        return 0.0
    later = part[part.size // 3 :: max(1, part.size // SAMPLED)]
    return min(SWING_SHARE * abs(level), 4.0 * median(np.abs(later - level)))


def _drift(part: Array) -> float:
    """End against start: the medians of the outer thirds, carried on to the whole length."""
    if part.size < 2:
        return 0.0
    third = max(1, part.size // 3)
    return (median(part[-third:]) - median(part[:third])) * part.size / (part.size - third)


def _without_ramps(pieces: Sequence[_Piece], noise: Noise) -> list[_Piece]:
    """The pieces that are no part of a slow change from one level to the next."""
    keep = []
    for i, piece in enumerate(pieces):
        steps = [b.level - a.level for a, b in pairwise(pieces[max(0, i - 1) : i + 2])]
        if not _is_ramp(piece, steps, noise):
            keep.append(piece)
    return keep


def _is_ramp(piece: _Piece, steps: Sequence[float], noise: Noise) -> bool:
    """Whether a piece moves as its neighbours' levels do, and as fast: its drift then is about the step to them."""
    if abs(piece.drift) <= max(noise.floor, 2 * SIGMAS * noise.sigma / math.sqrt(max(1, piece.length // 3))):
        return False
    along = [step for step in steps if step * piece.drift > 0]
    return len(along) == len(steps) and bool(steps) and abs(piece.drift) > RAMP_SHARE * min(map(abs, steps))


def _without_fragments(pieces: list[_Piece], noise: Noise, min_dwell: int | None) -> list[_Piece]:
    """The pieces long enough, or short but flat and cleanly entered and left."""
    if len(pieces) <= 2:
        return pieces
    length = np.array([piece.length for piece in pieces])
    order = np.sort(length)[::-1]
    covering = int(np.searchsorted(np.cumsum(order), 0.9 * order.sum())) + 1
    typical = float(np.median(order[:covering]))
    need = min_dwell or 0.2 * typical
    keep = []
    for i, piece in enumerate(pieces):
        around = (pieces[i - 1] if i else None, pieces[i + 1] if i + 1 < len(pieces) else None)
        if piece.length >= need or (not min_dwell and _stands_alone(piece, around, noise, half=0.5 * need)):
            keep.append(piece)
    return keep


def _stands_alone(piece: _Piece, around: Sequence[_Piece | None], noise: Noise, *, half: float) -> bool:
    """Whether a short piece is a level of its own: far from its neighbours, and at once, or flat and not so short."""
    if piece.length < 5:
        return False
    beside = [other for other in around if other is not None]
    if any(abs(other.level - piece.level) <= 5 * noise.floor for other in beside):
        return False
    flat = abs(piece.drift) <= max(noise.floor, SIGMAS * noise.sigma / math.sqrt(max(1, piece.length // 3)))
    gaps = [max(other.first - piece.stop, piece.first - other.stop) for other in beside]
    return max(gaps, default=0) <= 2 or (flat and piece.length >= half)
