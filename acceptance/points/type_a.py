"""Type A: the mean of samples that know of each other, and how well they tell it."""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

__all__ = ["TypeA", "autocorrelation", "type_a"]

_ENOUGH = 30  # samples from which on more than the first autocorrelation is worth looking at
_MANY = 20_000  # samples from which on no more coefficients are formed than the sum asks for
_BLOCK = 8192  # samples
_DIRECT = 64  # lags up to which forming each by itself then is faster than a transform of all
_BATCHES = 12
_BATCHES_DIFFER = 1.79  # 95 % point of chi squared over its 11 degrees of freedom


@dataclass(frozen=True, slots=True)
class TypeA:
    """The mean of one stretch of samples."""

    mean: float
    standard_uncertainty: float | None  # of the mean; None for a single reading, which tells nothing about it
    degrees_of_freedom: float
    readings: int
    effective_readings: float | None  # as many independent readings as these samples tell
    deviation: float | None  # standard deviation of the samples, n - 1 in the denominator


def autocorrelation(samples: NDArray[np.float64], lags: int | None = None) -> NDArray[np.float64]:
    """Autocorrelation coefficients of lags 0 to `lags` (all by default), by the usual biased estimate.

    r_k = sum (x_t - mean)(x_{t+k} - mean) / sum (x_t - mean)^2. Zeros where the samples do not vary.
    """
    d = samples - samples.mean()
    return _coefficients(d, _inner(d, d), lags)


def _coefficients(d: NDArray[np.float64], power: float, lags: int | None) -> NDArray[np.float64]:
    """The same from deviations and the sum of their squares."""
    n = d.size
    kept = n if lags is None else min(lags + 1, n)
    if power <= 0:
        return np.zeros(kept)
    if n >= _MANY and 3 < kept <= _DIRECT + 1:
        return _lagged(d, kept) / power
    if kept <= 3:
        return np.array([1.0, *(_inner(d[: n - k], d[k:]) / power for k in range(1, kept))])
    size = 1 << (2 * n - 1).bit_length() if n < _MANY else _smooth(n + kept)  # no farther than the lags reach
    spectrum = np.fft.rfft(d, size)
    return np.fft.irfft(spectrum * spectrum.conj(), size)[:kept] / power


def _lagged(d: NDArray[np.float64], kept: int) -> NDArray[np.float64]:
    """Sums of products of lags 0 to kept - 1, in blocks so short that the library starts no threads for them."""
    sums = np.zeros(kept)
    for first in range(0, d.size, _BLOCK):
        block, ahead = d[first : first + _BLOCK], d[first : first + _BLOCK + kept - 1]
        beyond = block.size + kept - 1 - ahead.size
        sums += np.correlate(np.append(ahead, np.zeros(beyond)) if beyond else ahead, block, "valid")
    return sums


def _smooth(least: int) -> int:
    """A length that is quick to transform, not much above the least one."""
    return min(m << max(0, -(-least // m) - 1).bit_length() for m in (1, 3, 5, 9, 15))


def _inner(a: NDArray[np.float64], b: NDArray[np.float64]) -> float:
    """Sum of products, without the linear algebra library: its threads cost more than they give for one sum."""
    return float(np.einsum("i,i", a, b))


def type_a(samples: NDArray[np.float64]) -> TypeA:
    """Mean of the samples, and the standard uncertainty of that mean for correlated samples.

    u^2 = s_c^2 tau / n with tau the integrated autocorrelation time (1 for independent samples), and s_c the
    sample deviation freed of what the estimated mean takes from it.

    Parameters
    ----------
    samples : shape (n,), n at least 1
        Readings in the order they were taken, finite, evenly spaced. [any unit]

    Notes
    -----
    tau comes from the first autocorrelation coefficient, corrected for most of its bias, as that of a
    first-order process; from 30 samples on also from the sum of the coefficients, cut where the lag exceeds eight
    times the sum so far, and that one is taken where it is well above the other: slow wander under white noise. From
    120 samples on the spread of the means of twelve batches is looked at as well, and taken where it is larger than
    chance would make it: wander too slow for the sum. The
    degrees of freedom follow the number of independent readings. Negative correlation is never believed: it could
    only make u smaller.

    References
    ----------
    JCGM 100:2008, 4.2.3 and 4.2.7 note (correlated observations). The sum cut at several times itself: the customary
    rule for the integrated autocorrelation time in simulation; common practice, no source.
    """
    n = int(samples.size)
    mean = float(samples.mean())
    if n == 1:
        return TypeA(mean, None, 0.0, 1, None, None)
    d = samples - mean
    power = _inner(d, d)
    deviation = float(samples.std(ddof=1)) if n < _MANY else math.sqrt(power / (n - 1))
    # a spread of rounding errors alone (1e-13 of the reading) is none
    if deviation <= 1e-13 * abs(mean):
        return TypeA(mean, 0.0, n - 1.0, n, float(n), 0.0)
    if n < 4:
        return TypeA(mean, deviation / math.sqrt(n), n - 1.0, n, float(n), deviation)
    phi = _first_order(d, power)
    time = _time_of_first_order(phi, n)
    freedom = max(1.0, n * (1 - phi) / (1 + phi) - 1) if phi > 0 else n - 1.0
    if n >= _ENOUGH:
        summed, window = _summed_time(d, power)
        # the sum has a spread of its own, sqrt(2 (2 W + 1) / n): what lies within it is no wander
        if summed > max(1.3, 1 + math.sqrt(2 * (2 * window + 1) / n)) * time:
            time, freedom = summed, max(1.0, n / (2 * window + 1))
    time = min(time, 0.8 * n)
    square = deviation**2 * (n - 1) / (n - time) * time / n
    if n >= 10 * _BATCHES:
        of_batches = _variance_by_batches(samples)
        if of_batches > _BATCHES_DIFFER * square:
            square, freedom = of_batches, min(freedom, _BATCHES - 1.0)
    # a mean cannot tell more than its samples taken as independent ones
    effective = min(n, deviation**2 / square)
    return TypeA(mean, math.sqrt(square), freedom, n, max(1.0, effective), deviation)


def _first_order(d: NDArray[np.float64], power: float) -> float:
    """The coefficient of a first-order process, freed of the bias of its estimate; 0 to 0.99."""
    n = d.size
    r = float(_coefficients(d, power, 1)[1])
    # E[r] = phi - (1 + 4 phi) / n. Taking off all of it makes u too large on the whole, since tau bends upwards in phi;
    # a quarter of the constant part and three quarters of the other is what covers best (tests/test_simulation.py).
    phi = (n * r + 0.25) / (n - 3) if n > 8 else r + (1 + 4 * r) / n
    return min(max(phi, 0.0), 0.99)


def _time_of_first_order(phi: float, n: int) -> float:
    """1 + 2 sum over k below n of (1 - k/n) phi^k, in closed form."""
    if phi <= 0:
        return 1.0
    # sum_{k<n} (1 - k/n) phi^k = phi/(1-phi) - phi (1 - phi^n) / (n (1-phi)^2)
    return 1 + 2 * (phi / (1 - phi) - phi * (1 - phi**n) / (n * (1 - phi) ** 2))


def _variance_by_batches(samples: NDArray[np.float64]) -> float:
    """Variance of the mean, from the means of twelve equal batches."""
    length = samples.size // _BATCHES
    means = samples[samples.size - length * _BATCHES :].reshape(_BATCHES, length).mean(axis=1)
    return float(means.var(ddof=1)) / _BATCHES


def _summed_time(d: NDArray[np.float64], power: float) -> tuple[float, int]:
    """The integrated autocorrelation time by summation, and the lag at which the sum was cut."""
    n = d.size
    most = min(n // 3, 20_000)
    for lags in (10, _DIRECT, most) if n >= _MANY else (most,):  # white noise is cut at the eighth or soon after
        sums = 1 + 2 * np.cumsum(_coefficients(d, power, lags)[1:])
        far = np.flatnonzero(np.arange(1, sums.size + 1) >= 8 * sums)
        if far.size:
            break
    window = int(far[0]) + 1 if far.size else sums.size
    time = float(sums[window - 1]) * (1 + (2 * window + 1) / n)
    return max(1.0, time), window
