"""What the residuals of a curve tell of a mean and of a slope over a part of the soak."""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from acceptance.points.type_a import type_a
from acceptance.thermal.exponentials import Curve
from acceptance.thermal.warming import Warming, line_of

__all__ = ["LATE", "Noise", "local_noise", "still_slope", "wander_inflation"]

Floats = NDArray[np.float64]

LATE = 2 / 3  # of the soak: its noise is told from there, so that a start that no curve follows does not count
_FEWEST = 3  # readings of a stretch
_STRETCHES = 4  # fewer tell nothing
# times the deviation: more change over a part no steady noise shows, however it is correlated. A sine of circular
# frequency w gives 6 (sin x - x cos x)/x2 times its amplitude, x = w width/2, at most 2.61 at x = 2.08.
_STEEPEST = 2.61
_WANDER = 0.5  # of the last part: what is not noise from one reading to the next is taken to stay for so long
_CHANCE = 3.0  # standard deviations of a variance of white noise
_CREDIT = 3.0  # a curve is thought to take no more than so much of the variance of what wanders


@dataclass(frozen=True, slots=True)
class Noise:
    """What the residuals of a curve tell of means and slopes over a part of the soak."""

    time: Floats
    residuals: Floats
    deviation: float
    inflation: float
    freedom: float
    window: float

    @staticmethod
    def of(time: Floats, residuals: Floats, window: float, curve: Curve | None) -> Noise:
        late = time >= time[-1] - max(LATE * (time[-1] - time[0]), 2 * window)
        part = residuals[late]
        spread = type_a(part)
        effective = spread.effective_readings or 1.0
        # what the curve took from the residuals
        fitted = 1 + 2 * len(curve.taus) if curve is not None else 1
        total = residuals.size / part.size * effective
        scale = math.sqrt(total / max(1.0, total - fitted))
        deviation = float(np.sqrt(np.mean(part**2))) * scale
        freedom = min(spread.degrees_of_freedom, total - fitted)
        # wander slower than the window moves a slope over it by less, however few its independent readings
        freedom = max(2.0, freedom, float(time[-1] - time[0]) / window - fitted)
        return Noise(time[late], part, deviation, part.size / effective, freedom, window)

    def of_mean(self, width: float) -> float:
        """Standard uncertainty of the mean over `width`. [K]"""
        by_correlation = self.deviation * math.sqrt(self.inflation / self._readings(width))
        return max(by_correlation, self._seen(width, slope=False))

    def of_slope(self, width: float) -> float:
        """Standard uncertainty of the slope over `width`. [K/s]"""
        by_correlation = self.deviation * math.sqrt(12 * self.inflation / self._readings(width)) / width
        return max(min(by_correlation, _STEEPEST * self.deviation / width), self._seen(width, slope=True))

    def _readings(self, width: float) -> float:
        span = float(self.time[-1] - self.time[0])
        return max(1.0, self.time.size * min(1.0, width / span)) if span > 0 else 1.0

    def _seen(self, width: float, *, slope: bool) -> float:
        """The same figure over other stretches of that width: the spread of what is truly zero.

        This sees what no autocorrelation of a short record does: rooms that cycle, thermometers that step.
        """
        figures = []
        for stop in np.arange(self.time[-1], self.time[0] + width * 0.999, -width / 4):
            here = slice(*np.searchsorted(self.time, (stop - width * (1 + 1e-9), stop + 1e-9)))
            part = self.residuals[here]
            if part.size >= _FEWEST:
                mean, rate = line_of(self.time[here], part)
                figures.append(rate if slope else mean)
        if len(figures) < _STRETCHES:
            return 0.0
        return float(np.sqrt(np.mean(np.square(figures))))


def wander_inflation(time: Floats, residuals: Floats, fitted: int, window: float) -> float:
    """What slow wander does to the variances of a fit: at least 1, which it is for white noise.

    A curve follows wander as slow as itself, so that the autocorrelation of what it leaves is too small. Whatever of
    the spread is not seen from one reading to the next is taken for wander that stays for half the last part; what
    the curve's own parameters took of it is given back.
    """
    size, span = residuals.size, float(time[-1] - time[0])
    total = float(residuals @ residuals) / max(1, size - fitted)
    if size < 2 * fitted or total <= 0 or span <= 0:
        return 1.0
    stays = 2 * _WANDER * window
    slow = max(0.0, total - float(np.mean(np.diff(residuals) ** 2)) / 2)
    if slow <= _CHANCE * math.sqrt(2 / size) * total:
        return 1.0
    independent = span / stays
    given_back = min(_CREDIT, independent / max(1e-9, independent - fitted)) if independent > fitted else _CREDIT
    return max(1.0, 1 - slow / total + slow / total * given_back * max(1.0, stays * size / span))


def local_noise(values: Floats) -> float:
    """Deviation of the readings from their neighbours, whatever the whole of them does."""
    return 1.4826 * float(np.median(np.abs(np.diff(values)))) / math.sqrt(2) if values.size > 1 else 0.0


def still_slope(warming: Warming, window: float, steps: tuple[float, float]) -> float:
    """Standard uncertainty of the slope by how little coarse readings moved; infinite where they moved more.

    A reading that stands on one or two steps for hours has moved by no more than these, whatever the noise of its
    rounding was while it rose; and what settles moves more slowly at its end than before.
    """
    slowest = [
        _slowest(warming.time, column, window, step)
        for column, step in zip((warming.probe, warming.ambient), steps, strict=True)
    ]
    return math.hypot(*slowest) / math.sqrt(3)


def _slowest(time: Floats, values: Floats, window: float, step: float) -> float:
    """The smallest bound of the slope at the end that any stretch up to it gives. [K/s]"""
    if not np.ptp(values) > 0:
        return step / float(time[-1] - time[0])
    rates = [math.inf]
    for width in np.arange(window, time[-1] - time[0], window / 2):
        spread = float(np.ptp(values[time >= time[-1] - width]))
        if spread > 2 * step * (1 + 1e-9):
            break
        rates.append((spread + step) / width)
    return min(rates)
