"""Points that cannot be true, and what they keep from being judged."""

from __future__ import annotations

from collections.abc import Iterator, Sequence

import numpy as np

from acceptance.bench.log import Doubt, channel_key
from acceptance.errors import MeasurementError
from acceptance.points.point import Point, Points
from acceptance.points.propagation import expanded, nominal

__all__ = ["doubt_points"]

_LEVELS = 3  # loads over which an output that never moves is no longer believed; two of many samples each
_MANY = 20
_APART = 0.05  # of rated current: as far apart as loads must lie to count
_LOADED = 0.25  # of rated current: from here on any supply worth testing passes on a good part of its power
_LEAST_EFFICIENCY = 0.05  # below it a factor of a thousand is likelier than a supply
_MOST_EFFICIENCY = 0.997  # at every load: nothing that converts power does it without loss
_FAR = 0.2  # of the median: a sample further off is a dropout, or the condition was not steady
_FAR_VOLTAGE = 0.05  # the same for an output voltage, which is there to stay where it is
_LIGHT = 0.05  # of rated current: below it an offset of the current alone makes an efficiency impossible

_LEAST_RIPPLE = 1e-5  # of the output voltage; common practice, no source

_SEE_WIRING = "see which column holds which quantity, in which unit, and how the meters are wired, and record it again"


def doubt_points(points: Points) -> tuple[Doubt, ...]:
    """Doubts that only the dwells show: powers that cannot be, outputs that never move, loads that did not stay."""
    return (
        *_impossible_efficiencies(points),
        *_lossless(points),
        *_lossy_by_a_thousand(points),
        *_dead_outputs(points),
        *_negative(points),
        *_unsteady(points),
        *_offsets(points),
        *_ripple_beyond_output(points),
        *_ripple_of_nothing(points),
    )


def _efficiencies(points: Points) -> list[tuple[Point, float, float]]:
    """Point, efficiency and its expanded uncertainty, of all that have one."""
    found = []
    for point in points.all:
        try:
            efficiency = point.efficiency(points.limits.outputs)
        except MeasurementError:
            continue
        u = expanded(efficiency.value, points.limits.decision.confidence).expanded
        found.append((point, nominal(efficiency.value), u))
    return found


def _largest_load(point: Point) -> float:
    return max((point.load_fraction(output) or 0.0 for output in point.limits.outputs), default=0.0)


def _impossible_efficiencies(points: Points) -> Iterator[Doubt]:
    found = [(point, value) for point, value, u in _efficiencies(points) if value > 1 + u]
    loaded = [pair for pair in found if _largest_load(pair[0]) >= _LIGHT]
    for some, words in ((loaded, _SEE_WIRING), ([pair for pair in found if pair not in loaded], _OFFSET)):
        if not some:
            continue
        worst, value = max(some, key=lambda pair: pair[1])
        more = f" and {len(some) - 1} more dwells" if len(some) > 1 else ""
        text = (
            f"efficiency {100 * value:.4g} % at {worst.where}{more}: "
            "more came out than went in, by more than the uncertainty"
        )
        if some is loaded:
            # the input power is believed nowhere in such a log; the outputs not in those dwells
            yield Doubt("impossible efficiency", text, bars=True, channels=_INPUTS[:2], remedy=words)
        spans = tuple((point.dwell.first, point.dwell.stop) for point, _ in some)
        channels = (*_INPUTS, *_delivered(points))
        yield Doubt("impossible efficiency", text, bars=True, channels=channels, spans=spans, remedy=words)


_INPUTS = ("input_power", "input_current", "input_voltage")
_OFFSET = "see the zero of the current at no load, and how the meters are wired, and record it again"


def _delivered(points: Points) -> tuple[str, ...]:
    quantities = ("output_voltage", "output_current")
    return tuple(channel_key(quantity, output) for output in points.limits.outputs for quantity in quantities)


def _lossless(points: Points) -> Iterator[Doubt]:
    """An input power that is the output power, in every dwell."""
    found = [(point, value) for point, value, _ in _efficiencies(points) if _largest_load(point) >= _LIGHT]
    if len(found) >= 2 and all(_MOST_EFFICIENCY <= value <= 2 - _MOST_EFFICIENCY for _, value in found):
        text = f"efficiency {100 * found[0][1]:.2f} % and alike at every load: the input power reads like the output's"
        yield Doubt("no loss", text, bars=True, channels=_INPUTS[:2], remedy=_SEE_WIRING)


def _lossy_by_a_thousand(points: Points) -> Iterator[Doubt]:
    found = [(point, value) for point, value, _ in _efficiencies(points) if _largest_load(point) >= _LOADED]
    if found and all(value < _LEAST_EFFICIENCY for _, value in found):
        text = f"efficiency {100 * found[0][1]:.3g} % at {found[0][0].where}, and alike at every load"
        remedy = "see the units of the columns: a factor of 1000 lies near; name them in the headings"
        yield Doubt("scale", text, bars=True, channels=(*_INPUTS, *_delivered(points)), remedy=remedy)


def _dead_outputs(points: Points) -> Iterator[Doubt]:
    steady = points.steady
    for output, rating in points.limits.ratings.outputs.items():
        voltage, current = channel_key("output_voltage", output), channel_key("output_current", output)
        setting = channel_key("load_setting", output)
        if steady and all(point.has(voltage) and point.has(current) for point in steady):
            loads = sorted(f for point in steady if (f := point.load_fraction(output)) is not None)
            levels = _levels(loads)
            many = all(point.readings >= _MANY for point in steady)
            if levels >= (2 if many else _LEVELS) and _never_moves(steady, voltage):
                yield _dead(voltage, f"while the load ran over {levels} levels")
        if steady and all(point.has(current) and point.has(setting) for point in steady):
            settings = [mean for point in steady if (mean := point.plain_mean(setting)) is not None]
            if len({round(s / rating.current, 3) for s in settings}) >= _LEVELS and _never_moves(steady, current):
                yield _dead(current, "while the load setting changed")


def _levels(loads: list[float]) -> int:
    count, last = 0, -np.inf
    for load in loads:
        if load - last >= _APART:
            count, last = count + 1, load
    return count


def _never_moves(steady: Sequence[Point], key: str) -> bool:
    extents = [point.extent(key) for point in steady]
    extents = [extent for extent in extents if extent[2]]
    return bool(extents) and min(low for low, _, _ in extents) == max(high for _, high, _ in extents)


def _dead(key: str, when: str) -> Doubt:
    return Doubt(
        "never moves",
        f"{key} reads the same in every sample {when}",
        bars=True,
        channels=(key,),
        remedy="see that the channel was connected and logged live, with digits enough to show the change",
    )


def _negative(points: Points) -> Iterator[Doubt]:
    """Outputs and inputs that read below zero: a sign turned about, which a correction would turn further."""
    for output, rating in points.limits.ratings.outputs.items():
        bounds = {
            channel_key("output_current", output): 0.01 * rating.current,
            channel_key("output_voltage", output): 0.01 * rating.voltage,
        }
        for key, bound in bounds.items():
            below = [
                p for p in points.steady if p.has(key) and (mean := p.plain_mean(key)) is not None and mean < -bound
            ]
            if below:
                text = f"{key} reads {below[0].plain_mean(key):.4g} at {below[0].where}: below zero"
                remedy = "connect the meter, or turn the sign of the column, so that what the unit delivers is positive"
                yield Doubt("negative", text, bars=True, channels=(key,), remedy=remedy)


def _unsteady(points: Points) -> Iterator[Doubt]:
    """Dwells in which samples lie far off the rest: dropouts of a logger, or a condition that did not stay."""
    for key in (*_INPUTS, *_delivered(points)):
        spans = []
        worst: tuple[Point, int] | None = None
        for point in points.steady:
            count = _far_off(point, key)
            if count:
                spans.append((point.dwell.first, point.dwell.stop))
                worst = (point, count) if worst is None or count > worst[1] else worst
        if worst is not None:
            point, count = worst
            more = f", and in {len(spans) - 1} more dwells" if len(spans) > 1 else ""
            text = f"{key}: {count} of {point.readings} readings lie far off the rest at {point.where}{more}"
            remedy = "see whether the logger dropped out or the condition did not stay, and record it again"
            yield Doubt("unsteady", text, bars=True, channels=(key,), spans=tuple(spans), remedy=remedy)


def _far_off(point: Point, key: str) -> int:
    """Readings more than a fifth of the median off it; of currents and powers at light load, where bursts are, none."""
    if not point.has(key) or point.readings < 3:
        return 0
    if key in ("input_power", "input_current") and _largest_load(point) < _LOADED:
        return 0
    quantity, _, output = key.partition(" ")
    far = _FAR_VOLTAGE if quantity == "output_voltage" else _FAR
    low, high, count = point.extent(key)
    # so near each other that none can be far off their median, wherever it is
    if not count or (low * high > 0 and high - low <= far * min(abs(low), abs(high))):
        return 0
    samples = point.samples(key)
    samples = samples[np.isfinite(samples)]
    median = float(np.median(samples))
    rating = point.limits.ratings.outputs.get(output)
    if quantity == "output_current" and rating is not None and abs(median) < _APART * rating.current:
        return 0
    spread = 1.4826 * float(np.median(np.abs(samples - median)))  # a standard deviation that no outlier moves
    return int(np.count_nonzero(np.abs(samples - median) > max(far * abs(median), 6 * spread)))


def _offsets(points: Points) -> Iterator[Doubt]:
    """A current that reads more than its uncertainty at no load: told, since it is small."""
    for output, rating in points.limits.ratings.outputs.items():
        key, setting = channel_key("output_current", output), channel_key("load_setting", output)
        for point in points.steady:
            is_set = point.has(setting) and point.plain_mean(setting) == 0.0
            if not point.has(key) or not (is_set or point.is_unloaded(output)):
                continue
            mean, u = point.plain_mean(key), point.bench.standard_uncertainty(key, 0.0)
            if mean is not None and u > 0 and 2 * u < abs(mean) < _APART * rating.current:
                text = f"{key} reads {1000 * mean:.3g} mA at no load, and its U there is {2000 * u:.2g} mA"
                remedy = "take the zero of the current before and after the run; it is in every reading"
                yield Doubt("offset", text, channels=(key,), remedy=remedy)
                break


def _ripple_beyond_output(points: Points) -> Iterator[Doubt]:
    for output, rating in points.limits.ratings.outputs.items():
        key = channel_key("ripple", output)
        largest = [p.extent(key)[1] for p in points.steady if p.has(key) and p.extent(key)[2]]
        if largest and max(largest) > rating.voltage:
            text = f"{key} reads {max(largest):.4g} V, more than the {rating.voltage:g} V of the output itself"
            remedy = "see the unit of the column: mV lies near; name it in the heading"
            yield Doubt("scale", text, bars=True, channels=(key,), remedy=remedy)


def _ripple_of_nothing(points: Points) -> Iterator[Doubt]:
    """Ripple that never changes over many readings, or is far too small to be one: a channel that is not connected."""
    for output, rating in points.limits.ratings.outputs.items():
        key = channel_key("ripple", output)
        extents = [extent for point in points.steady if point.has(key) and (extent := point.extent(key))[2]]
        low, high = min((low for low, _, _ in extents), default=0.0), max((high for _, high, _ in extents), default=0.0)
        readings = sum(count for _, _, count in extents)
        if readings >= _MANY and low == high:
            yield _dead(key, f"of {readings}")
        elif readings and high < _LEAST_RIPPLE * rating.voltage:
            text = f"{key} reads {1e6 * high:.3g} µV at most, which no switching or linear supply reaches"
            remedy = "see the unit of the column and the probe, and record it again"
            yield Doubt("scale", text, bars=True, channels=(key,), remedy=remedy)
