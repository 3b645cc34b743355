"""Readings that stand still, or pile up, where they are known to move: a clipped converter, a frozen instrument.

A coarse converter, a quiet dwell and a zero current stand still for good reasons, so both checks first ask
for noise: at the reading's own level, and beside the run itself at the same load.
"""

from __future__ import annotations

from collections.abc import Iterable, Iterator, Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from acceptance.bench.log import BenchLog, Doubt, Span
from acceptance.bench.packed import extent_of
from acceptance.bench.values import Column

__all__ = ["Trace", "Values", "clipped", "frozen", "piled", "place_of", "runs_of", "words_of"]

Values = NDArray[np.float64]

_FROZEN_RUN = 50  # samples
_LOOKED_AT = 20_000  # readings that a resolution is told from
_CLIPPED_RUN = 5
_NEAR_RAIL = 0.05  # of the reading
_PILED = 5  # readings
_PILED_SHARE = 0.05  # of a table's
_STEPS_BELOW = 3  # lattice steps under the largest, which together must be three times rarer
_SPREAD = 10  # lattice steps that the readings beside must spread over
_TYPICAL = 4  # lattice steps that they typically lie below the largest
_NEAREST = 0.45  # of the typical distance below; two conditions in turn leave half of it without a reading
_NOISE_STEPS = 3.0  # second differences (2.4 sigma) of this many resolution steps: then a run of equals is no chance


def place_of(log: BenchLog, row: int) -> str:
    """Table and line of a sample."""
    name, first, _ = log.rows_of((row, row + 1))
    return f"{name}:{first}"


def words_of(key: str) -> str:
    """A channel's key in words."""
    return key.replace("_", " ")


def runs_of(mask: NDArray[np.bool_]) -> tuple[NDArray[np.intp], NDArray[np.intp]]:
    """First and last + 1 of every stretch of True."""
    edges = np.flatnonzero(np.diff(np.concatenate(([False], mask, [False])).view(np.int8)))
    return edges[::2], edges[1::2]


@dataclass(frozen=True, slots=True)
class Trace:
    """One channel of a log, with what tells that its load changed."""

    log: BenchLog
    key: str
    values: Values
    driver: Column | None  # the load, where another channel tells it


def _resolution(values: Values) -> float:
    """The smallest step between two readings; 0 where all are equal."""
    sample = values[: 2 * _LOOKED_AT]
    sample = sample[np.isfinite(sample)]
    if sample.size < _LOOKED_AT < values.size:
        sample = values[np.isfinite(values)]
    sample = sample[:_LOOKED_AT]
    levels = np.unique(sample)
    if levels.size < 2:
        return 0.0
    steps = np.diff(levels)
    # converting units leaves equal readings a rounding apart
    steps = steps[steps > 1e-9 * max(abs(levels[0]), abs(levels[-1]))]
    return float(steps.min()) if steps.size else 0.0


def _noise(values: Values, mask: NDArray[np.bool_]) -> tuple[float, int]:
    """Median second difference over three marked neighbours, and how many there are; a ramp has none."""
    if values.size < 3:
        return 0.0, 0
    whole = mask[:-2] & mask[1:-1] & mask[2:]
    second = np.abs(values[:-2] - 2 * values[1:-1] + values[2:])[whole]
    second = second[np.isfinite(second)]
    return (float(np.median(second)), second.size) if second.size else (0.0, 0)


def clipped(channel: Trace, tables: Sequence[Span]) -> Iterator[Doubt]:
    """A converter at the end of its range: the extreme reading stands still where others of its size move.

    Zero is no rail: a current is 0.000 at no load. A quiet voltage at no load is none either.
    """
    values = channel.values
    if values.size < 2 * _CLIPPED_RUN:
        return
    bottom, top = _finite_extent(values)
    if top <= bottom:
        return
    for rail in (top, bottom):
        if abs(rail) <= 0.02 * max(abs(top), abs(bottom)):
            continue
        at_rail = values == rail
        if np.count_nonzero(at_rail) < max(_CLIPPED_RUN, 0.01 * values.size):
            continue
        spans = _clipped_spans(channel, at_rail, tables)
        if spans:
            count = sum(b - a for a, b in spans)
            where = f"{count} samples, first at {place_of(channel.log, spans[0][0])}"
            extreme = "largest" if rail == top else "smallest"
            text = f"{words_of(channel.key)} stands at its {extreme} value {rail:.6g} in {where}"
            text += ", while its other readings vary: clipped"
            remedy = "measure again in a higher range"
            yield Doubt("clipped", text, bars=True, channels=(channel.key,), spans=spans, remedy=remedy)


def _finite_extent(values: Values) -> tuple[float, float]:
    """The smallest and the largest finite value; the larger first where there is none."""
    low, high = float(np.fmin.reduce(values, initial=np.inf)), float(np.fmax.reduce(values, initial=-np.inf))
    if np.isfinite(low) and np.isfinite(high):
        return low, high
    finite = np.isfinite(values)
    low = float(np.min(values, where=finite, initial=np.inf))
    return low, float(np.max(values, where=finite, initial=-np.inf))


def _clipped_spans(channel: Trace, at_rail: NDArray[np.bool_], tables: Sequence[Span]) -> tuple[Span, ...]:
    need = max(_CLIPPED_RUN, 0.01 * at_rail.size)
    step = _resolution(channel.values)
    found: list[Span] = []
    for a, b in tables:
        values, mask = channel.values[a:b], at_rail[a:b]
        noise, count = _noise(values, ~mask & _comparable(channel, (a, b), mask))
        if (
            count < 20
            or step == 0
            or noise < _NOISE_STEPS * step
            or noise > 0.2 * abs(values[mask][0] if mask.any() else 1.0)
        ):
            continue
        first, last = runs_of(mask)
        long = last - first >= need
        if not long.any() or not _is_loaded(channel, a, first[long], last[long]):
            continue
        # amid lower readings, those of a pile were cut off too
        kept = (last - first >= _CLIPPED_RUN) | _pile(values)[first]
        found += [(a + int(i), a + int(j)) for i, j in zip(first[kept], last[kept], strict=True)]
    return tuple(found)


def _comparable(channel: Trace, table: Span, at_rail: NDArray[np.bool_]) -> NDArray[np.bool_]:
    """The readings whose noise tells that of the rail: under overload, where bursts are no noise, those near it."""
    values = channel.values[slice(*table)]
    under_overload = (channel.log.samples["stage"].iloc[slice(*table)] == "overcurrent").to_numpy()
    if not under_overload.any() or not at_rail.any():
        return np.ones(values.size, bool)
    rail = float(values[at_rail][0])
    return ~under_overload | (np.abs(values - rail) <= _NEAR_RAIL * abs(rail))


def _is_loaded(channel: Trace, start: int, first: NDArray[np.intp], last: NDArray[np.intp]) -> bool:
    """Whether the unit carried a load there; at no load a reading may be quiet for good reason."""
    if channel.driver is None:
        return True
    low, high = extent_of(channel.driver)
    top = max(-low, high, 0.0)
    loads = [np.nanmedian(np.abs(channel.driver[start + i : start + j])) for i, j in zip(first, last, strict=True)]
    return top == 0 or max(loads) >= 0.1 * top


def piled(channel: Trace, tables: Sequence[Span], told: Iterable[Span] = ()) -> Iterator[Doubt]:
    """A range that ends within the noise: the largest reading is frequent, with hardly any just below it.

    The readings beside the pile tell it from a quiet dwell (which has hardly any), from coarse steps (which lie one
    or two steps lower) and from conditions in turn (which leave a gap between their levels).

    Parameters
    ----------
    told
        Samples that are called clipped already; their table is not looked at again.
    """
    told = tuple(told)
    for a, b in tables:
        if any(first < b and last > a for first, last in told):
            continue
        values = channel.values[a:b]
        at_top = values == np.max(values, where=np.isfinite(values), initial=-np.inf)
        rows = _pile(np.where(_comparable(channel, (a, b), at_top), values, np.nan))
        first, last = runs_of(rows)
        if not first.size or not _is_loaded(channel, a, first, last):
            continue
        spans = tuple((a + int(i), a + int(j)) for i, j in zip(first, last, strict=True))
        top = channel.values[spans[0][0]]
        where = f"{np.count_nonzero(rows)} of {b - a} samples, first at {place_of(channel.log, spans[0][0])}"
        text = f"{words_of(channel.key)} stands at its largest value {top:.6g} in {where}"
        text += ", and hardly ever just below it: clipped"
        remedy = "measure again in a higher range"
        yield Doubt("clipped", text, bars=True, channels=(channel.key,), spans=spans, remedy=remedy)


def _pile(values: Values) -> NDArray[np.bool_]:
    """The samples of a pile at the largest value; none where there is no pile."""
    none = np.zeros(values.size, bool)
    _, top = _finite_extent(values)
    at_top = values == top
    size = np.count_nonzero(at_top)
    known = np.isfinite(values)
    count = np.count_nonzero(known)
    if not top > 0 or size < max(_PILED, _PILED_SHARE * count) or size == count:
        return none
    beside = known & ~at_top & (np.concatenate((at_top[1:], [False])) | np.concatenate(([False], at_top[:-1])))
    if np.count_nonzero(beside) < _PILED:
        return none
    typical = float(np.median(top - values[beside]))
    below = top - values[known & ~at_top & (values >= top - 2 * typical)]
    step = _resolution(np.append(below, 0.0))
    is_rare = size > _STEPS_BELOW * np.count_nonzero(below < (_STEPS_BELOW + 0.5) * step)
    is_noise = np.ptp(below) >= _SPREAD * step and typical >= _TYPICAL * step
    is_one_level = np.quantile(below, 0.1) <= _NEAREST * typical
    return at_top if step > 0 and is_rare and is_noise and is_one_level else none


def frozen(channel: Trace, tables: Sequence[Span]) -> Iterator[Doubt]:
    """A reading that stops moving amid readings of its own level that move, or while the load changes."""
    values = channel.values
    if values.size < 2 * _FROZEN_RUN:
        return
    half = _FROZEN_RUN // 2
    if not (values[:-half:half] == values[half::half]).any():  # no long run without two such equals
        return
    step = _resolution(values)
    low, high = (float(np.fmin.reduce(values, initial=0.0)), float(np.fmax.reduce(values, initial=0.0)))
    scale = max(-low, high)
    found: list[Span] = []
    for a, b in tables:
        part = values[a:b]
        first, last = runs_of(part[1:] == part[:-1])
        long = last - first >= _FROZEN_RUN - 1
        runs = [(int(i), int(j) + 1) for i, j in zip(first[long], last[long], strict=True)]
        runs = [run for run in runs if abs(part[run[0]]) > 0.01 * scale]
        if not runs or step == 0 or len(runs) > 8:  # so many are the unit's manner, such as bursts at no load
            continue
        still = np.zeros(part.size, bool)
        for i, j in runs:
            still[i:j] = True
        driver = None if channel.driver is None else channel.driver[a:b]
        found += [(a + i, a + j) for i, j in runs if _stopped(part, (i, j), still, driver, step)]
    if found:
        begin, end = found[0]
        text = f"{words_of(channel.key)} stands still at {values[begin]:.6g} for {end - begin} samples"
        text += f" from {place_of(channel.log, begin)}, while its other readings vary: frozen"
        remedy = "look to the instrument and its logger, and measure again"
        yield Doubt("frozen", text, bars=True, channels=(channel.key,), spans=tuple(found), remedy=remedy)


def _stopped(part: Values, run: Span, still: NDArray[np.bool_], driver: Values | None, step: float) -> bool:
    """Whether this run cannot be a quiet dwell: readings of its level have noise, and it does not end with the load."""
    level = part[run[0]]
    near = ~still & (np.abs(part - level) <= max(0.02 * abs(level), 20 * step))
    noise, count = _noise(part, near)
    if count < 20 or noise < _NOISE_STEPS * step:
        return False
    if driver is None:
        return False
    span = float(np.nanmax(driver, initial=-np.inf) - np.nanmin(driver, initial=np.inf))
    inside = driver[run[0] : run[1]]
    if not span > 0 or not np.isfinite(inside).all():
        return False
    edge = max(3, len(inside) // 20)
    core = inside[edge:-edge] if len(inside) > 4 * edge else inside
    if float(core.max() - core.min()) > 0.05 * span:
        return True  # the load changed, and the reading did not
    load = float(np.median(inside))
    return any(
        _noisy_neighbours(part, driver, rows, load, 0.02 * span, step)
        for rows in ((max(0, run[0] - 24), run[0]), (run[1], min(part.size, run[1] + 24)))
    )


def _noisy_neighbours(part: Values, driver: Values, rows: Span, load: float, within: float, step: float) -> bool:
    """Whether the samples beside a run, at the same load, have noise: then the run began amid a dwell."""
    values, loads = part[rows[0] : rows[1]], driver[rows[0] : rows[1]]
    noise, count = _noise(values, np.abs(loads - load) <= within)
    return count >= 8 and noise >= _NOISE_STEPS * step
