"""Points that cannot be true, and what they keep from being judged."""

from __future__ import annotations

from collections.abc import Iterator

import numpy as np

from acceptance.bench.log import Doubt, channel_key
from acceptance.errors import MeasurementError
from acceptance.points.point import Point, Points
from acceptance.points.propagation import expanded

__all__ = ["doubt_points"]

_LEVELS = 3  # loads over which an output that never moves is no longer believed
_APART = 0.05  # of rated current: as far apart as loads must lie to count


def doubt_points(points: Points) -> tuple[Doubt, ...]:
    """Doubts that only the dwells show: an efficiency above 1 + U, an output that never moves while its load does."""
    return (*_impossible_efficiencies(points), *_dead_outputs(points))


def _impossible_efficiencies(points: Points) -> Iterator[Doubt]:
    outputs = points.limits.outputs
    found: list[tuple[Point, float]] = []
    for point in points.all:
        try:
            efficiency = point.efficiency(outputs)
        except MeasurementError:
            continue
        confidence = points.limits.decision.confidence
        if efficiency.nominal > 1 + expanded(efficiency.value, confidence).expanded:
            found.append((point, efficiency.nominal))
    if not found:
        return
    inputs = ("input_power", "input_current", "input_voltage")
    delivered = tuple(channel_key(quantity, o) for o in outputs for quantity in ("output_voltage", "output_current"))
    worst, value = max(found, key=lambda pair: pair[1])
    text = (
        f"efficiency {100 * value:.4g} % at {worst.where}"
        + (f" and {len(found) - 1} more dwells" if len(found) > 1 else "")
        + ": more came out than went in, by more than the uncertainty"
    )
    remedy = "see which column holds which quantity, in which unit, and how the meters are wired, and record it again"
    # input power is believed nowhere in such a log; the outputs not in those dwells
    yield Doubt("impossible efficiency", text, bars=True, channels=("input_power", "input_current"), remedy=remedy)
    spans = tuple((point.dwell.first, point.dwell.stop) for point, _ in found)
    yield Doubt("impossible efficiency", text, bars=True, channels=(*inputs, *delivered), spans=spans, remedy=remedy)


def _dead_outputs(points: Points) -> Iterator[Doubt]:
    for output, rating in points.limits.ratings.outputs.items():
        voltage, current = channel_key("output_voltage", output), channel_key("output_current", output)
        setting = channel_key("load_setting", output)
        steady = [point for point in points.all if point.dwell.stage == "steady"]
        if steady and all(point.has(voltage) and point.has(current) for point in steady):
            loads = sorted(f for point in steady if (f := point.load_fraction(output)) is not None)
            if _levels(loads) >= _LEVELS and _never_moves(steady, voltage):
                yield _dead(voltage, f"while the load ran over {_levels(loads)} levels")
        if steady and all(point.has(current) and point.has(setting) for point in steady):
            settings = [float(np.nanmean(s)) for p in steady if np.isfinite(s := p.samples(setting)).any()]
            if len({round(s / rating.current, 3) for s in settings}) >= _LEVELS and _never_moves(steady, current):
                yield _dead(current, "while the load setting changed")


def _levels(loads: list[float]) -> int:
    count, last = 0, -np.inf
    for load in loads:
        if load - last >= _APART:
            count, last = count + 1, load
    return count


def _never_moves(steady: list[Point], key: str) -> bool:
    lowest = [np.nanmin(s) for p in steady if np.isfinite(s := p.samples(key)).any()]
    highest = [np.nanmax(s) for p in steady if np.isfinite(s := p.samples(key)).any()]
    return bool(lowest) and min(lowest) == max(highest)


def _dead(key: str, when: str) -> Doubt:
    return Doubt(
        "never moves",
        f"{key} reads the same in every sample {when}",
        bars=True,
        channels=(key,),
        remedy="see that the channel was connected and logged live, with digits enough to show the change",
    )
