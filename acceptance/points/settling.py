"""How long one channel still moves after its condition was set."""

from __future__ import annotations

import math
from itertools import pairwise

import numpy as np
import numpy.typing as npt

__all__ = ["drift_of", "samples_ahead", "settling_samples"]

Array = npt.NDArray[np.float64]

DEVIATIONS = 3.5  # a leading block further off than this many standard deviations of block means is still settling
FAR = 5.0  # standard deviations: chance puts the first of some ten thousand dwells' samples there
FEW = 8  # samples; below this there is no statistic of blocks
MOST_SAMPLES = 65_536  # quantiles over more samples than this are taken over every n-th


def drift_of(x: Array) -> float | None:
    """End against start: the medians of the outer thirds, carried on to the whole length. [unit of x]

    None with fewer than two finite samples.
    """
    x = x[np.isfinite(x)]
    if x.size < 2:
        return None
    third = max(1, x.size // 3)
    step = max(1, third // MOST_SAMPLES)
    change = np.median(x[-third::step]) - np.median(x[:third:step])
    return float(change) * x.size / (x.size - third)


def settling_samples(x: Array) -> int:
    """The number of leading samples that still move; at most half of them.

    The later half is taken as settled. Leading blocks whose mean lies off its mean by more than its own block means
    scatter are settling; half as many samples again are added, because a tail sinks into the noise before it is
    over. A drift that goes on as fast in the later half is no settling, and bursts that come throughout are none.
    """
    at = np.flatnonzero(np.isfinite(x))
    n = at.size
    if n < 3:
        return 0
    y = x[at] / (np.max(np.abs(x[at])) or 1.0)  # huge readings must not overflow
    lead = _leading_few(y) if n < FEW else max(_leading(y), _leading_far(y))
    lead = min(lead + lead // 2, n // 2)
    return int(at[lead]) if lead else 0


def samples_ahead(x: Array, most: int = 2) -> int:
    """How many of the last samples have already left the level, `most` at the most; 0 where too few are there.

    A logger may note a new setting a sample after the load has taken it.
    """
    y = x[max(0, x.size - 50) :]
    body = y[:-most][np.isfinite(y[:-most])]
    if body.size < FEW:
        return 0
    low, high = np.quantile(body, [0.1, 0.9])  # so that neither a tail at the start nor an outlier widens the band
    band = 4 * (high - low) + 0.002 * abs(float(np.median(body)))
    away = np.abs(y[-most:] - np.median(body)) > band
    return most - int(np.argmax(away)) if away[-1] else 0


def _leading_few(y: Array) -> int:
    """Leading samples far off the later half, where there are too few for statistics."""
    later = y[y.size // 2 :]
    middle = float(np.median(later))
    far = np.abs(y[: y.size // 2] - middle) > 4 * np.ptp(later) + 0.002 * abs(middle)
    return int(np.argmin(far)) if not far.all() else far.size


def _leading(y: Array) -> int:
    """Samples in the leading blocks that are off the later half, for the worse of two sizes of block."""
    calm = _clipped(y)
    drift = _steady_drift(y)
    scatter = _deviation(calm[y.size // 2 :])
    sizes = {max(1, y.size // 64), max(1, y.size // 24)}
    return max(_leading_blocks(calm, size, scatter=scatter, drift=drift) for size in sizes)


def _leading_far(y: Array) -> int:
    """Leading samples each far off the later half: a transient too short, or too high, for the means of blocks.

    None where the later half has samples as far off: bursts and outliers are no settling.
    """
    later = y[y.size // 2 :]
    low, middle, high = np.quantile(later[:: max(1, later.size // MOST_SAMPLES)], [0.16, 0.5, 0.84])
    allowed = FAR * max(0.5 * (high - low), 1e-12) + _steady_drift(y)
    if np.count_nonzero(np.abs(later - middle) > allowed) > max(1, 0.02 * later.size):
        return 0
    off = np.abs(y[: y.size // 2] - middle) > allowed
    if not off.any():
        return 0
    settled = ~off
    settled[:-1] &= ~off[1:]  # one sample may lie on the level while the transient swings through it
    return int(settled.argmax()) if settled.any() else off.size


def _leading_blocks(calm: Array, size: int, *, scatter: float, drift: float) -> int:
    """Samples in the leading blocks of `size` whose mean is off the later half's mean."""
    count = calm.size // size
    means = np.add.reduce(calm[: count * size].reshape(count, size), axis=1) / size
    half = count // 2
    later = means[half:]
    # the second where bursts fall into step with the blocks, whose means then hardly scatter
    allowed = DEVIATIONS * max(_deviation(later), scatter / math.sqrt(size)) + drift + 1e-12
    off = np.abs(means[:half] - np.add.reduce(later) / later.size) > allowed
    settled = ~off
    settled[:-1] &= ~off[1:]  # one block may lie on the level while the rest swings about it
    return size * (int(settled.argmax()) if settled.any() else half)


def _deviation(x: Array) -> float:
    """Standard deviation; numpy's own takes ten times as long on a short array."""
    off = x - np.add.reduce(x) / x.size
    return math.sqrt(float(np.einsum("i,i", off, off)) / max(1, x.size - 1))


def _clipped(y: Array) -> Array:
    """The samples, gross outliers brought to the edge of what the later half does."""
    later = np.sort(y[y.size // 2 :: max(1, y.size // MOST_SAMPLES)])
    low, high = float(later[round(0.02 * (later.size - 1))]), float(later[round(0.98 * (later.size - 1))])
    widened = 0.5 * (high - low)
    return np.minimum(np.maximum(y, low - widened), high + widened) if widened > 0 else y


def _steady_drift(y: Array) -> float:
    """How far a drift as fast at the end as at the start carries the first samples off the later half's mean."""
    thinned = y[:: max(1, y.size // MOST_SAMPLES)]
    borders = [i * thinned.size // 4 for i in range(5)]
    # medians, near enough: neither bursts nor outliers count
    first, second, third, last = (float(np.sort(thinned[a:b])[(b - a) // 2]) for a, b in pairwise(borders))
    early, late = second - first, last - third
    if early * late <= 0 or abs(early) > 2 * abs(late):
        return 0.0
    return 4 * abs(late)  # a straight line: three quarters of the whole are three times `late`; one more for noise
