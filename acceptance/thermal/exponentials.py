"""Curves of one and of two time constants, fitted from a start that the data give.

For given time constants a curve is linear in everything else, so that only the time constants are searched for: on a
grid first, then by damped least squares. A search from a guess alone may end at a curve that does not fit.
"""

from __future__ import annotations

import math
from collections.abc import Callable
from dataclasses import dataclass
from typing import Literal

import numpy as np
from numpy.typing import NDArray

from acceptance.points.type_a import type_a

__all__ = ["Curve", "Kind", "best_curve", "fit_curve", "highest_end"]

Floats = NDArray[np.float64]

# free: level + sum c exp(-t/tau); from zero: sum c (1 - exp(-t/tau)); to zero: sum c exp(-t/tau)
Kind = Literal["free", "from zero", "to zero"]
Target = Callable[[float], Floats]

_GRID = 36  # time constants tried for one of them
_PAIRS = 18  # for two, each
# times what was recorded: a slower curve that ends anywhere is a straight line in it; one that ends at zero is known
# by its height alone
_LONGEST: dict[Kind, float] = {"free": 8.0, "from zero": 8.0, "to zero": 100.0}
_STEPS = 60
_CONVERGED = 1e-10
_ALIKE = 1e-11  # of the product of two columns' squares: a smaller determinant is rounding
_SLOW = 8  # time constants tried when asking how high a curve may end
_QUICK_STEPS = 7
_NEXT = 1.1
_AS_GOOD = 6.0  # two and a half standard uncertainties, squared
_APART = 1.5  # two time constants closer than this factor are one
_CHANCE = 0.001  # of taking two time constants where there is one: looked at once for every probe, so a rare one


@dataclass(frozen=True, slots=True)
class Curve:
    """One fitted curve."""

    kind: Kind
    taus: tuple[float, ...]  # time constants, the shortest first [s]
    parts: tuple[float, ...]  # the c of each
    level: float  # of a free curve, where it ends; of one from zero the sum of its parts; else 0
    u_log_tau: float  # standard uncertainty of the logarithm of the longest time constant
    u_level: float
    residuals: Floats
    covariance: Floats  # of level (a free curve's alone), parts, then logarithms of the time constants
    inflation: float  # of variances, since the residuals are correlated

    @property
    def slowest(self) -> float:
        """The longest time constant. [s]"""
        return self.taus[-1]

    @property
    def rss(self) -> float:
        """Sum of squared residuals."""
        return float(self.residuals @ self.residuals)

    @property
    def effective_readings(self) -> float:
        """As many independent readings as the residuals tell."""
        return self.residuals.size / self.inflation

    def at(self, time: Floats) -> Floats:
        """The curve at these times, a lag behind the room left out."""
        falls = np.exp(-np.divide.outer(np.asarray(time, dtype=float), np.array(self.taus))) @ np.array(self.parts)
        if self.kind == "free":
            falls = self.level + falls
        elif self.kind == "from zero":
            falls = sum(self.parts) - falls
        result: Floats = falls
        return result


def fit_curve(time: Floats, values: Floats | Target, *, order: int = 1, kind: Kind = "free") -> Curve | None:
    """The curve of one or two time constants that fits best; None where the data allow none.

    Parameters
    ----------
    time : shape (n,), rising
        [s]
    values : shape (n,), or a function of the longest time constant that gives them
        What is fitted; a function where the values themselves depend on how slowly the unit follows its room.
    order
        1 or 2 time constants.

    Notes
    -----
    Standard uncertainties are those of least squares, times the square root of what correlation leaves of the
    independent readings (acceptance.points.type_a). The grid runs from a third of the closest readings to eight
    times the span of them.
    """
    fit = _Fit(np.asarray(time, dtype=float), values if callable(values) else _constant(values), kind)
    linear = 1 if kind == "free" else 0
    if fit.time.size < linear + 2 * order + 1 or not np.ptp(fit.time) > 0:
        return None
    start = _start(fit, order)
    if start is None:
        return None
    return _finished(fit, _refined(fit, start))


def best_curve(time: Floats, values: Floats | Target, *, kind: Kind = "free", chance: float = _CHANCE) -> Curve | None:
    """The curve of one time constant, or of two where the residuals of one are curved.

    Two are taken where they leave so much less that chance would do it as rarely as `chance`, the residuals counted
    as so many independent ones as their correlation leaves.
    """
    one = fit_curve(time, values, kind=kind)
    two = fit_curve(time, values, order=2, kind=kind)
    if one is None or two is None:
        return one
    linear = 1 if kind == "free" else 0
    freedom = max(1.0, two.effective_readings - linear - 4)
    if two.taus[1] < _APART * two.taus[0] or _least_swing(two, time) < math.sqrt(two.rss / two.residuals.size):
        return one
    floor = 1e-24 * float(np.square(one.at(time)).sum())  # rounding
    ratio = (one.rss - two.rss) / 2 / ((two.rss + floor) / freedom)
    # the quantile of F with 2 and nu degrees of freedom has a closed form
    needed = freedom / 2 * (chance ** (-2 / freedom) - 1)
    return two if ratio > needed else one


def highest_end(time: Floats, values: Floats, curve: Curve, *, slowest: float, inflation: float = 1.0) -> float:
    """How high a free curve may end, at two standard uncertainties, with a part as slow as `slowest` beside it.

    For each slow time constant from the curve's own upwards everything else is fitted anew; where that fits about
    as well as the curve itself, its end, and two of its standard uncertainties, are possible. The slow part of a
    short record is known far less well than the covariance of its best fit says.

    Parameters
    ----------
    time, values : shape (n,)
        What the curve was fitted to, the lag behind the room taken out.
    curve
        A free curve of one or two time constants.
    slowest
        The slowest part that is thought possible. [s]
    inflation
        Of variances, where the residuals wander more slowly than their autocorrelation shows.
    """
    freedom = max(1, values.size - 1 - 2 * len(curve.taus))
    variance = curve.rss / freedom * max(curve.inflation, inflation)
    end, quick = curve.level, curve.taus[0]
    for slow in np.geomspace(_NEXT * curve.slowest, max(2 * curve.slowest, slowest), _SLOW):
        # each from where the one before ended
        quick = _quick_beside(time, values, quick, float(slow))
        basis, found, residuals = _linear(time, values, np.array([quick, slow]))
        if float(residuals @ residuals) - curve.rss <= _AS_GOOD * variance:
            u = math.sqrt(max(0.0, variance * float(np.linalg.pinv(basis.T @ basis)[0, 0])))
            end = max(end, float(found[0]) + 2 * u)
    return end


def _quick_beside(time: Floats, values: Floats, quick: float, slow: float) -> float:
    """The quick time constant that fits best beside a slow one that is given. [s]"""
    h, at = 1e-4, math.log(min(quick, slow / _APART))
    best = (math.inf, at)
    for _ in range(_QUICK_STEPS):
        up, here, down = (_linear(time, values, np.array([math.exp(at + d), slow]))[2] for d in (h, 0.0, -h))
        best = min(best, (float(here @ here), at))
        slope = (up - down) / (2 * h)
        square = float(slope @ slope)
        if square <= 0:
            break
        at = min(at - min(max(float(slope @ here) / square, -0.5), 0.5), math.log(slow / _APART))
    return math.exp(best[1])


def _linear(time: Floats, values: Floats, taus: Floats) -> tuple[Floats, Floats, Floats]:
    """Basis, level and parts, and residuals for given time constants."""
    basis = np.column_stack([np.ones(time.size), np.exp(-time[:, None] / taus)])
    found: Floats = np.linalg.lstsq(basis, values, rcond=1e-13)[0].astype(np.float64, copy=False)
    return basis, found, values - basis @ found


def _least_swing(curve: Curve, time: Floats) -> float:
    """What the smaller part moves over the record: less than the noise is no part."""
    ends = np.exp(-np.divide.outer(np.array([time[0], time[-1]]), np.array(curve.taus)))
    return float(np.abs(np.array(curve.parts) * (ends[0] - ends[1])).min())


@dataclass(frozen=True, slots=True)
class _Fit:
    time: Floats
    target: Target
    kind: Kind

    def basis(self, taus: Floats) -> Floats:
        """Columns of everything linear."""
        falls = np.exp(-self.time[:, None] / taus)
        if self.kind == "free":
            return np.column_stack([np.ones(self.time.size), falls])
        return 1 - falls if self.kind == "from zero" else falls

    def solved(self, taus: Floats) -> tuple[Floats, Floats]:
        """Linear parameters and residuals for given time constants."""
        basis, values = self.basis(taus), self.target(float(taus.max()))
        found: Floats = np.linalg.lstsq(basis, values, rcond=1e-13)[0].astype(np.float64, copy=False)
        return found, values - basis @ found

    @property
    def longest(self) -> float:
        """The longest time constant that is looked for. [s]"""
        return _LONGEST[self.kind] * max(float(np.ptp(self.time)), float(self.time[-1]))


def _constant(values: Floats) -> Target:
    array = np.asarray(values, dtype=float)
    return lambda _: array


def _start(fit: _Fit, order: int) -> Floats | None:
    """The best time constants of a grid."""
    span = float(np.ptp(fit.time))
    steps = np.diff(fit.time)
    closest = float(np.median(steps[steps > 0])) if (steps > 0).any() else span
    low, high = math.log(max(closest / 3, span / 300)), math.log(fit.longest)
    count = _GRID if order == 1 else _PAIRS
    grid = np.exp(np.linspace(low, high, count))
    scores = _scores(fit, grid, order)
    best = np.unravel_index(int(np.argmin(scores)), scores.shape)
    return grid[np.array(best)] if math.isfinite(scores[best]) else None


def _scores(fit: _Fit, grid: Floats, order: int) -> Floats:
    """Sums of squared residuals for each time constant of a grid, or each pair of them, by normal equations.

    Good enough to start from, and all of them in one go; a pair that cannot be told apart scores infinity.
    """
    columns = np.exp(-fit.time[:, None] / grid)
    values = np.column_stack([fit.target(float(tau)) for tau in grid])
    if fit.kind == "free":  # the level follows the means
        columns, values = columns - columns.mean(axis=0), values - values.mean(axis=0)
    elif fit.kind == "from zero":
        columns = 1 - columns
    squares, alone = np.square(values).sum(axis=0), np.square(columns).sum(axis=0)
    cross = columns.T @ values
    with np.errstate(divide="ignore", invalid="ignore"):
        if order == 1:
            scores = squares - np.diag(cross) ** 2 / alone
        else:
            # a quicker one i beside a slower one j, and the values that go with j
            gram = columns.T @ columns
            p, q, a, c = cross, np.diag(cross), alone[:, None], alone
            determinant = a * c - gram**2
            scores = squares - (c * p**2 - 2 * gram * p * q + a * q**2) / determinant
            told = np.triu(determinant > _ALIKE * a * c, k=1)
            scores = np.where(told, scores, math.inf)
    finite: Floats = np.where(np.isfinite(scores), scores, math.inf)
    return finite


def _refined(fit: _Fit, start: Floats) -> Floats:
    """Damped least squares over the logarithms of the time constants, the linear part solved at each step."""
    log_tau, damping = np.log(start), 1e-3
    bounds = log_tau.min() - 3, math.log(fit.longest)
    residuals = fit.solved(np.exp(log_tau))[1]
    for _ in range(_STEPS):
        slopes = _slopes(fit, log_tau)
        square = slopes.T @ slopes
        step = np.linalg.lstsq(square + damping * np.diag(np.diag(square) + 1e-300), slopes.T @ residuals, rcond=None)[
            0
        ]
        tried = np.clip(log_tau - step, *bounds)
        after = fit.solved(np.exp(tried))[1]
        if after @ after <= residuals @ residuals:
            moved = float(np.abs(tried - log_tau).max())
            log_tau, residuals, damping = tried, after, max(damping / 10, 1e-14)
            if moved < _CONVERGED:
                break
        else:
            damping *= 10
            if damping > 1e8:
                break
    return np.sort(np.exp(log_tau))


def _slopes(fit: _Fit, log_tau: Floats) -> Floats:
    """How the residuals move with each logarithm of a time constant, the linear part following."""
    h = 1e-5
    columns = []
    for at in range(log_tau.size):
        up, down = log_tau.copy(), log_tau.copy()
        up[at] += h
        down[at] -= h
        columns.append((fit.solved(np.exp(up))[1] - fit.solved(np.exp(down))[1]) / (2 * h))
    return np.column_stack(columns)


def _finished(fit: _Fit, taus: Floats) -> Curve:
    found, residuals = fit.solved(taus)
    parts = found[1:] if fit.kind == "free" else found
    sign = -1.0 if fit.kind == "from zero" else 1.0
    # d/d log tau of c exp(-t/tau) is c (t/tau) exp(-t/tau)
    x = fit.time[:, None] / taus
    jacobian = np.column_stack([fit.basis(taus), sign * parts * x * np.exp(-x)])
    freedom = max(1, residuals.size - jacobian.shape[1])
    inflation = _inflation(residuals)
    covariance: Floats = (
        float(residuals @ residuals) / freedom * inflation * np.linalg.pinv(jacobian.T @ jacobian, rcond=1e-14)
    )
    spread = np.sqrt(np.clip(np.diag(covariance), 0, None))
    level, u_level = 0.0, 0.0
    if fit.kind == "free":
        level, u_level = float(found[0]), float(spread[0])
    elif fit.kind == "from zero":
        k = parts.size
        level, u_level = float(parts.sum()), math.sqrt(max(0.0, float(covariance[:k, :k].sum())))
    return Curve(
        fit.kind,
        tuple(taus.tolist()),
        tuple(parts.tolist()),
        level,
        float(spread[-1]),
        u_level,
        residuals,
        covariance,
        inflation,
    )


def _inflation(residuals: Floats) -> float:
    """What the correlation of the residuals does to variances."""
    spread = type_a(residuals)
    return residuals.size / spread.effective_readings if spread.effective_readings else 1.0
