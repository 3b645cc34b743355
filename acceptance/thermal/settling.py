"""Whether a soak has settled, what is still to come, and what has been reached.

rise of the last half hour, its slope      ->  settled or not
slope x time constant                      ->  what is still to come, the lag behind a moving room included
highest running mean                       ->  what has been reached, whatever came after it
"""

from __future__ import annotations

import math
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from acceptance.points.propagation import coverage_factor
from acceptance.thermal.exponentials import Curve, best_curve, highest_end
from acceptance.thermal.noise import Noise, local_noise, still_slope, wander_inflation
from acceptance.thermal.warming import WINDOW, Lag, Warming, line_of, running_means

__all__ = ["Settling", "Slope", "settling_of"]

Floats = NDArray[np.float64]

_FEWEST = 3  # readings that a slope is formed from
_HOLE = 0.4  # of the last part: a longer stretch without a reading leaves its slope open
# how far what is to come is believed, and how well it must be known, as shares of what has been reached
_FARTHEST = 0.25
_LOOSEST = 0.1
_LOST = 0.5  # so little known, no curve of warming up fits at all
_OVERSHOOT = 0.1  # of what the slope may move in the last part: a smaller one is none
_CLEARLY = 3.0  # standard uncertainties
_HORIZON = 16.0  # last parts: the slowest part that a unit is thought to hide, 8 h (our choice)
_WANDERS = 5.0  # times the slope allowed: so large a bound is no noise of readings


@dataclass(frozen=True, slots=True)
class Slope:
    """How fast the rise still moves."""

    rate: float  # [K/s]
    u: float  # [K/s]
    degrees_of_freedom: float

    def bound(self, confidence: float) -> float:
        """What its magnitude stays below. [K/s]"""
        return abs(self.rate) + coverage_factor(confidence, self.degrees_of_freedom) * self.u


@dataclass(frozen=True, slots=True)
class Settling:
    """What a soak has come to."""

    settled: bool
    reason: str  # why it has not settled; "" where it has
    allowed: float  # the slope that counts as settled [K/s]
    rise: float  # mean over the last part, or the highest running mean of an overshoot [K]
    reached: float  # highest running mean [K]
    u_reached: float  # [K]
    reached_at: float  # [s]
    degrees_of_freedom: float
    curve: Curve | None
    to_come: float = 0.0  # [K]
    u_reading: float = 0.0  # of the mean, by the spread of the readings [K]
    u_to_come: float = 0.0  # [K]
    slope: Slope | None = None
    slope_bound: float = math.inf  # [K/s]
    overshot: bool = False  # it had been higher before
    began_warm: bool = False  # the highest was at its very beginning, and so came from before it

    @property
    def final(self) -> float:
        """The rise that it settles at. [K]"""
        return self.rise + self.to_come


@dataclass(frozen=True, slots=True)
class _Criterion:
    allowed: float
    confidence: float
    window: float
    steps: tuple[float, float]


def settling_of(
    warming: Warming,
    *,
    allowed: float,
    confidence: float = 0.95,
    window: float = WINDOW,
    steps: tuple[float, float] = (0.0, 0.0),
) -> Settling:
    """What a soak has come to.

    Parameters
    ----------
    allowed
        The slope that counts as settled. [K/s]
    confidence
        Of the bounds, two-sided.
    window
        The last part. [s]
    steps
        Of the displays of probe and ambient: no running mean is known better than what rounding hides. [K]

    Notes
    -----
    A rise that settled, fell, and settled again, as when a fan starts, counts by the higher of the two.
    """
    criterion = _Criterion(allowed, confidence, window, steps)
    found = _analysed(warming, criterion)
    return found if found.settled else _in_two(warming, criterion, found)


def _analysed(warming: Warming, criterion: _Criterion) -> Settling:
    rise, window = warming.rise, criterion.window
    curve, freed = _fitted(warming) if rise.size > _FEWEST else (None, rise)
    noise = Noise.of(warming.time, curve.residuals if curve is not None else rise - rise.mean(), window, curve)
    means, moments = running_means(warming.time, rise, window / 6)
    best = int(np.argmax(means))
    last = warming.time >= warming.time[-1] - window * (1 + 1e-9)
    bare = Settling(
        settled=False,
        reason=_lack(warming, last, window) or f"there are too few readings to tell a curve from; {_MORE}",
        allowed=criterion.allowed,
        rise=float(rise[last].mean()),
        reached=float(means[best]),
        u_reached=_u_reached(warming, criterion),
        reached_at=float(moments[best]),
        degrees_of_freedom=noise.freedom,
        curve=curve,
    )
    bare = replace(bare, began_warm=best == 0 and means.size > 1 and bare.reached > bare.rise + _clear(bare))
    if curve is None or _lack(warming, last, window):
        return bare
    return _judged(bare, warming, (curve, freed, noise), last, criterion)


def _clear(found: Settling) -> float:
    return _CLEARLY * found.u_reached + found.allowed * WINDOW / 2


def _u_reached(warming: Warming, criterion: _Criterion) -> float:
    """Standard uncertainty of a mean over a sixth of the last part, by readings and their neighbours. [K]"""
    span = float(warming.time[-1] - warming.time[0])
    count = max(1.0, warming.time.size * min(1.0, criterion.window / 6 / span)) if span > 0 else 1.0
    return math.hypot(local_noise(warming.rise) / math.sqrt(count), math.hypot(*criterion.steps) / math.sqrt(12))


_LONGER = "record it until it has settled"
_MORE = "read it every few minutes until it has settled"


def _lack(warming: Warming, last: NDArray[np.bool_], window: float) -> str:
    """Why no slope of the last part can be formed; "" where it can."""
    minutes = f"{window / 60:g} min"
    if warming.lasts < window * (1 - 0.001):
        return f"the soak lasts {warming.lasts / 60:.3g} min, and its slope is that of the last {minutes}; {_LONGER}"
    times = warming.time[last]
    if times.size < _FEWEST:
        return (
            f"there are fewer than {_FEWEST} readings in the last {minutes}; read it every few minutes, and {_LONGER}"
        )
    hole = float(np.diff(np.concatenate(([warming.time[-1] - window], times))).max())
    if hole > _HOLE * window and hole > 1.5 * float(np.median(np.diff(warming.time))):
        return f"there is no reading for {hole / 60:.3g} min of the last {minutes}; {_LONGER}"
    return ""


def _fitted(warming: Warming) -> tuple[Curve | None, Floats]:
    """The curve of the rise freed of the lag behind the room, and that rise."""
    lag = Lag.of(warming)
    curve = best_curve(warming.time, lambda tau: warming.rise + lag.behind(tau))
    return curve, warming.rise + (lag.behind(curve.slowest) if curve is not None else 0.0)


def _judged(
    bare: Settling,
    warming: Warming,
    fitted: tuple[Curve, Floats, Noise],
    last: NDArray[np.bool_],
    criterion: _Criterion,
) -> Settling:
    """Slope, what is to come, and what they decide."""
    curve, freed, noise = fitted
    window, time = criterion.window, warming.time[last]
    slope = _slope(warming, last, noise, criterion)
    bare = replace(bare, slope=slope, slope_bound=slope.bound(criterion.confidence), u_reading=noise.of_mean(window))
    if reason := _unsettled(bare, warming, criterion):
        return replace(bare, reason=reason)
    level, drift = line_of(time, freed[last])
    reach, u_ahead, u_log_tau = _reaches(warming, (curve, freed, noise), slope, criterion)
    # what the lag behind the room hides counts as still to come
    ahead = level + max(0.0, reach * drift)
    found = replace(
        bare,
        to_come=ahead - bare.rise,
        u_to_come=math.hypot(u_ahead, reach * drift * min(1.0, u_log_tau)),
    )
    reason = _far(found, curve, criterion)
    found = replace(found, reason=reason, settled=not reason)
    top = float(running_means(warming.time, freed, window / 3)[0].max())
    least = _CLEARLY * noise.of_mean(window / 3) + _OVERSHOOT * criterion.allowed * window
    if reason or top <= ahead + least:
        return found
    return replace(found, rise=top, to_come=0.0, u_to_come=0.0, u_reading=noise.of_mean(window / 3), overshot=True)


def _slope(warming: Warming, last: NDArray[np.bool_], noise: Noise, criterion: _Criterion) -> Slope:
    _, rate = line_of(warming.time[last], warming.rise[last])
    still = still_slope(warming, criterion.window, criterion.steps)
    stands = not np.ptp(warming.probe[last]) > 0 and not np.ptp(warming.ambient[last]) > 0
    # what stands still has no noise, and may move within its step
    u = still if stands else min(noise.of_slope(criterion.window), still if max(criterion.steps) > 0 else math.inf)
    return Slope(rate, u, noise.freedom)


def _reaches(
    warming: Warming, fitted: tuple[Curve, Floats, Noise], slope: Slope, criterion: _Criterion
) -> tuple[float, float, float]:
    """How far the slope reaches ahead, what its noise hides of what is to come, u of log tau. [s, K, 1]"""
    curve, freed, noise = fitted
    lasts = float(warming.time[-1] - warming.time[0])
    if lasts >= 2 * criterion.window:
        _, rate = line_of(warming.time, freed)
        u = noise.of_slope(lasts) + math.hypot(*criterion.steps) / math.sqrt(3) / lasts
        moved = float(np.ptp(curve.at(warming.time)))
        if abs(rate) <= 2 * u and moved <= criterion.allowed * criterion.window:
            # warm from its first reading on: a flat record has no time constant, and all of it bounds its slope
            return 0.0, lasts * math.hypot(u, rate), 0.0
    reach = _reach(curve, warming.time[warming.time >= warming.time[-1] - criterion.window])
    # a slower part than the curve shows, or a slower one than it says, hides in the noise
    rows = warming.time >= warming.time[-1] - criterion.window
    level, drift = line_of(warming.time[rows], freed[rows])
    ahead = level + max(0.0, reach * drift)
    wander = wander_inflation(warming.time, curve.residuals, 1 + 2 * len(curve.taus), criterion.window)
    end = highest_end(warming.time, freed, curve, slowest=_HORIZON * criterion.window, inflation=wander)
    # of a soak shorter than such a part even that tells too little: there all that the slope leaves open counts
    unseen = max(curve.slowest, _HORIZON * criterion.window - lasts)
    return reach, max((end - ahead) / 2, unseen * slope.u), curve.u_log_tau


def _reach(curve: Curve, time: Floats) -> float:
    """What is still to come over the slope, both of the last part, by the shape of the curve. [s]

    For a part that is short against the time constant this is the time constant.
    """
    parts, taus = np.array(curve.parts), np.array(curve.taus)
    end = parts * np.exp(-time[-1] / taus)
    if not (np.all(end > 0) or np.all(end < 0)) or np.abs(end).max() < 1e-9:
        end = np.where(taus == taus.max(), 1.0, 0.0)
    shape = np.exp((time[-1] - time)[:, None] / taus) @ end
    mean, rate = line_of(time, shape)
    return -mean / rate if rate != 0 else curve.slowest


def _unsettled(found: Settling, warming: Warming, criterion: _Criterion) -> str:
    """Why the slope does not meet the criterion, and what to do; "" where it does."""
    assert found.slope is not None
    allowed, window = criterion.allowed, criterion.window
    if found.slope_bound <= allowed * (1 + 1e-12):
        return ""
    rate, minutes = found.slope.rate, f"{window / 60:g} min"
    least = f"{allowed * window:.3g} K"
    told = f"the rise still {'rises' if rate >= 0 else 'falls'} by {abs(rate) * window:.2f} K in {minutes}"
    if abs(rate) > allowed:
        last = warming.time >= warming.time[-1] - window * (1 + 1e-9)
        _, drift = line_of(warming.time[last], warming.ambient[last])
        if abs(drift) > abs(rate) / 2:
            room = f"the ambient moved by {drift * window:.2g} K meanwhile"
            return f"{told}, more than {least}; {room}: hold the room steadier, and let it run on"
        return f"{told}, more than {least}; {_run_on(criterion)}"
    if found.slope_bound > _WANDERS * allowed:
        return f"{told}, but {_WANDERED}"
    return (
        f"{told}, and with the spread of the readings this may be up to {found.slope_bound * window:.2g} K, more than "
        f"{least}; let it run on for longer, read it with finer digits, and hold the room steadier"
    )


_WANDERED = (
    "it did not get there as what warms up does: it jumped, or wandered on the way, with the room, a fan, the load, or "
    "the contact of the probe; find out which, and record the soak again"
)


def _run_on(criterion: _Criterion) -> str:
    least = f"{criterion.allowed * criterion.window:.3g} K in {criterion.window / 60:g} min"
    return f"let it run on until it moves by less than {least}, and record all of it"


def _far(found: Settling, curve: Curve, criterion: _Criterion) -> str:
    """Why what is still to come cannot be told from this soak, and what to do; "" where it can."""
    least, reached = 2 * criterion.allowed * criterion.window, max(found.reached, 1e-9)
    bound = coverage_factor(criterion.confidence, found.degrees_of_freedom) * found.u_to_come
    if found.to_come > max(_FARTHEST * reached, least):
        return (
            f"the slope is small, but with a time constant of {curve.slowest / 3600:.2g} h about {found.to_come:.2g} K "
            "are still to come: too far to reckon ahead; let it run on for about two such time constants more"
        )
    if bound > max(_LOST * reached, least):
        return f"no curve tells what is still to come, as {_WANDERED}"
    if bound > max(_LOOSEST * reached, least):
        return (
            "it hardly moves any more, but so short or so noisy a soak leaves open whether a slow part of up to "
            f"{max(0.0, found.to_come) + bound:.2g} K is still to come; let it run on for some hours more, read it "
            "with finer digits, and hold the room steadier"
        )
    return ""


# --- a fall on the way ----------------------------------------------------------------------------------------------


def _in_two(warming: Warming, criterion: _Criterion, found: Settling) -> Settling:
    """The soak before a fall that came after it had settled, where the part after the fall has settled too."""
    width = criterion.window / 6
    means, moments = running_means(warming.time, warming.rise, width)
    falls = np.interp(moments + width, moments, means) - means
    at = float(moments[int(np.argmin(falls))])
    if not found.reached > found.rise + _clear(found):
        return found
    before, after = warming.time <= at - width, warming.time >= at + width
    parts = [_analysed(warming.cut(rows), criterion) for rows in (before, after) if np.count_nonzero(rows) > _FEWEST]
    if len(parts) < 2 or not (parts[0].settled and parts[1].settled) or parts[0].final < parts[1].final:
        return found
    return replace(
        parts[0],
        slope=parts[1].slope,
        slope_bound=parts[1].slope_bound,
        reached=found.reached,
        reached_at=found.reached_at,
        overshot=True,
    )
