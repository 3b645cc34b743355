"""What a channel does while it stands still: noise, converter steps, and the windows that both are seen through."""

from __future__ import annotations

import math
from collections.abc import Iterator
from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

__all__ = [
    "SAMPLED",
    "SIGMAS",
    "SWING_SHARE",
    "Array",
    "Noise",
    "floor_of",
    "median",
    "noise_of",
    "running_sum",
    "two_windows",
    "windows",
]

Array = npt.NDArray[np.float64]

WINDOWS = (1, 4, 16, 32, 64)  # samples
SIGMAS = 6.0  # a difference beyond this many standard deviations is no noise, even among 1e7 samples
SPAN_SHARE = 0.004  # of the channel's span: smaller changes make no new level
READING_SHARE = 0.001  # of the largest reading: the same
SWING_SHARE = 0.008  # of the reading: noise in proportion to it (mains hum) is looked for up to this
WHITE_SHARE = 0.01  # of the reading: white noise in proportion to it is looked for up to this standard deviation
SAMPLED = 8192  # a median over more samples than this is taken over every n-th
QUARTER_NORMAL = 0.3186394  # lower quartile of |z|, z standard normal


def median(y: Array) -> float:
    """The median of finite samples, without the checks that make numpy's slow on short ones."""
    ordered = np.sort(y if y.size <= SAMPLED else y[:: y.size // (SAMPLED // 2)])
    middle = ordered.size // 2
    if ordered.size % 2:
        return float(ordered[middle])
    return 0.5 * (float(ordered[middle - 1]) + float(ordered[middle]))


@dataclass(frozen=True, slots=True)
class Noise:
    """What a channel does while it stands still. All in the channel's unit over its largest magnitude."""

    sigma: float  # of a sample
    step: float  # of the converter; 0 where none shows
    floor: float  # changes up to this are no new level
    declared: bool  # whether the floor was given, not guessed
    fixed: dict[int, float]  # window -> standard deviation of the difference of two window means
    share: dict[int, float]  # window -> the same, as a share of the reading

    def swing(self, window: int) -> float:
        """What a difference of two windows may be by noise in proportion to the reading, as a share of it."""
        if self.declared:
            return 0.0
        # noise that averages out may be larger: no step and no ramp does
        white = min(WHITE_SHARE, 1.25 * self.share[1]) / math.sqrt(window)
        return min(max(SWING_SHARE, SIGMAS * white), SIGMAS * self.share[window])

    def of_mean(self, samples: int) -> float:
        """The standard deviation of a mean over so many samples, correlation included."""
        window = max((w for w in self.fixed if w <= samples), default=1)
        white = self.sigma / math.sqrt(max(1, samples))
        return max(white, min(self.sigma, self.fixed.get(window, 0.0) / math.sqrt(2)))


def noise_of(y: Array, tolerance: float | None, smallest: float) -> Noise:
    """The noise of a channel, taken from all of its samples.

    Parameters
    ----------
    y : shape (n,)
        Finite samples over the channel's largest magnitude, -1 to 1; at least one.
    tolerance
        Changes up to this make no new level; None where it is to be guessed.
    smallest
        What a guess is at least.

    Notes
    -----
    Noise is looked at through each window by itself, because it is seldom white: what is correlated, and hum, does
    not average out as 1/sqrt(window). The lower quartile of the differences stays noise as long as no more than
    about half of the windows hold a step.
    """
    sigma, step = _sample_noise(y)
    floor = floor_of(y, tolerance, smallest)
    fixed: dict[int, float] = {}
    share: dict[int, float] = {}
    total = running_sum(y)
    for window in windows(y.size):
        difference, mean = two_windows(total, window, sparse=True)
        white = sigma * math.sqrt(2 / window)
        fixed[window] = max(white, _normal_scale(difference))
        share[window] = _share_of_reading(difference, np.abs(mean + y[0], out=mean))
    return Noise(sigma, step, floor, tolerance is not None, fixed, share)


def floor_of(y: Array, tolerance: float | None, smallest: float) -> float:
    """Changes up to this are no new level: the one declared, else a guess. Arguments as of `noise_of`."""
    if tolerance is not None:
        return tolerance
    low, high = _extent(y)
    step = _converter_step(_blocks(y)[0]) if y.size > 2 else 0.0
    return max(SPAN_SHARE * (high - low), READING_SHARE * max(abs(low), abs(high)), 1.5 * step, smallest)


def _share_of_reading(difference: Array, reading: Array) -> float:
    """Standard deviation of differences as a share of the reading, from the upper readings, where it would show."""
    upper = reading > 0.4
    if np.count_nonzero(upper) < 30:
        upper = reading > 0.02  # at zero no share of the reading is defined
    return _normal_scale(difference[upper] / reading[upper])


def _sample_noise(y: Array) -> tuple[float, float]:
    """Standard deviation of a sample, and the converter's step.

    The lower quartile of the differences counts, so that up to half of them may be load steps.
    """
    if y.size < 3:
        return 0.0, 0.0
    blocks = _blocks(y)
    differences = np.abs(np.concatenate([np.diff(block) for block in blocks]))
    sigma = _normal_scale(differences) / math.sqrt(2)
    step = _converter_step(blocks[0])
    return max(sigma, step / math.sqrt(12)), step


def _converter_step(y: Array) -> float:
    """The smallest spacing of the values, where neighbouring samples show that it is the converter's; else 0."""
    values = np.unique(np.round(y, 9))
    if not 1 < values.size < 0.25 * y.size:
        return 0.0
    gaps = np.diff(values)
    step = float(np.min(gaps[gaps > 2e-9], initial=math.inf))
    # the levels of a log without noise are spaced too, but are passed only once or twice
    toggles = np.count_nonzero(np.abs(np.abs(np.diff(y)) - step) < 0.5 * step)
    return step if math.isfinite(step) and toggles > max(4, values.size) else 0.0


def _extent(y: Array) -> tuple[float, float]:
    """Lowest and highest value; of a long log, the few most extreme left out, which may be gross outliers."""
    if y.size < 200:
        return float(np.min(y)), float(np.max(y))
    low, high = np.quantile(y[:: max(1, y.size // 100_000)], [0.005, 0.995])
    return float(low), float(high)


def _blocks(y: Array, size: int = 10_000, count: int = 40) -> list[Array]:
    """The samples, or evenly spread stretches of a long log: differences stay those of neighbours."""
    if y.size <= size * count:
        return [y]
    return [y[i : i + size] for i in np.linspace(0, y.size - size, count).astype(int).tolist()]


def _normal_scale(differences: Array) -> float:
    """Standard deviation from the lower quartile of magnitudes, as if they were normal."""
    if not differences.size:
        return 0.0
    quarter = differences.size // 4
    return float(np.partition(np.abs(differences), quarter)[quarter]) / QUARTER_NORMAL


def windows(samples: int) -> Iterator[int]:
    """The windows, fine to coarse, of which a channel of so many samples holds at least six. [samples]"""
    return (w for w in WINDOWS if w == 1 or w <= samples // 6)


def running_sum(y: Array) -> Array:
    """Sums of the first 0 to n samples, each less the first sample so that no digits are lost. Shape (n + 1,)"""
    total = np.empty(y.size + 1)
    total[0] = 0
    np.cumsum(y - y[0], out=total[1:])
    return total


def two_windows(total: Array, window: int, *, sparse: bool = False) -> tuple[Array, Array]:
    """Difference of the means after and before, and their own mean, at every stride; offset by the first sample."""
    stride = max(1, window // 4)
    if sparse:
        stride *= max(1, total.size // (stride * 100_000))
    before, middle, after = (
        total[: total.size - 2 * window : stride],
        total[window : total.size - window : stride],
        total[2 * window :: stride],
    )
    return (after - 2 * middle + before) / window, (after - before) / (2 * window)
