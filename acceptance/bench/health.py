"""What cannot be true about a log's samples: clocks, converters, columns and units that betray themselves.

A bar keeps readings from being judged, so it must be as rare on good data as a miss on bad data. Every check
that looks for a reading standing still therefore asks first whether this channel is known to move there: a
coarse converter, a quiet dwell and a zero current stand still for good reasons.
"""

from __future__ import annotations

from collections.abc import Iterable, Iterator, Mapping, Sequence

import numpy as np
from numpy.typing import NDArray

from acceptance.bench.dropouts import dropouts
from acceptance.bench.log import BenchLog, Doubt, Span
from acceptance.bench.packed import Packed
from acceptance.bench.standstill import Trace, Values, clipped, frozen, piled, place_of, runs_of, words_of
from acceptance.bench.threads import each
from acceptance.bench.values import Column

__all__ = ["check_health"]

_GAP_STEPS = 5.0  # a gap is a step this many times the median step
_COARSE_SHARE = 0.01  # repeated times beyond this share are no accident
_LISTED = 200  # spans kept of one doubt without a bar
_BLOCK = 4096  # samples looked at in one go
_BLOCKS = 256  # of them at the least
_ENOUGH = 500_000  # samples that a median is taken from, of which one in so many counts in a longer log

_ANALOGUE = ("input_voltage", "input_current", "input_power", "output_voltage", "output_current", "ripple")
_NEVER_ZERO_ONCE = ("output_voltage", "input_voltage", "input_power", "output_current")
_PLACED = ("input_voltage", "input_current", "input_power", "output_voltage", "output_current")


def check_health(
    log: BenchLog,
    *,
    supply: str | None = None,
    rated_input_voltage: float | None = None,
    rated: Mapping[str, tuple[float, float]] | None = None,
) -> tuple[Doubt, ...]:
    """Every doubt about the samples of a log, those that bar a judgment marked.

    Parameters
    ----------
    supply
        "ac" or "dc": what the product is fed with; None where not known.
    rated_input_voltage
        [V]
    rated
        Output to its rated voltage and current. [V, A]

    Notes
    -----
    A gap's span ends with the last sample before the gap, so that a dwell is cut at the end of the span.
    """
    rated = rated or {}
    tables = tuple(_tables(log))
    doubts: list[Doubt] = []
    for table in tables:
        doubts += _clock_doubts(log, table)
    keys = [key for key in log.samples.columns if key.partition(" ")[0] in _ANALOGUE]
    for found in each(lambda key: _channel_doubts(log, key, tables), keys, samples=len(log.samples)):
        doubts += found
    doubts += _missing(log)
    doubts += _no_input_power(log, supply)
    doubts += _swapped(log, rated, rated_input_voltage)
    doubts += _scale(log, rated, rated_input_voltage)
    return tuple(doubts)


def _channel_doubts(log: BenchLog, key: str, tables: Sequence[Span]) -> list[Doubt]:
    """What one channel's readings betray by themselves."""
    quantity = key.partition(" ")[0]
    channel = Trace(log, key, _values(log, key), _driver(log, key))
    doubts = list(clipped(channel, tables))
    doubts += piled(channel, tables, [span for doubt in doubts for span in doubt.spans])
    if quantity in _PLACED:
        doubts += frozen(channel, tables)
    if quantity in _NEVER_ZERO_ONCE:
        doubts += dropouts(channel, tables, _power(log) if quantity.startswith("output") else None)
    return doubts


# --- parts of a log -------------------------------------------------------------------------------------------------


def _tables(log: BenchLog) -> Iterator[Span]:
    table = log.samples["table"].to_numpy()
    cuts = np.flatnonzero(np.diff(table)) + 1
    edges = [0, *cuts.tolist(), len(table)]
    yield from ((a, b) for a, b in zip(edges, edges[1:], strict=False) if b > a)


def _values(log: BenchLog, key: str) -> Values:
    return np.asarray(log.column(key))


def _quantity_keys(log: BenchLog) -> tuple[str, ...]:
    return tuple(key for key in log.samples.columns if key not in ("stage", "table", "line") and key != "time")


def _driver(log: BenchLog, key: str) -> Column | None:
    """What tells that the load changed: the output's current, else the load setting."""
    qualifier = key.partition(" ")[2]
    names = [f"load_setting {qualifier}".strip(), f"output_current {qualifier}".strip()]
    candidates = names if key == names[1] else names[::-1]
    candidates += [*log.keys("output_current"), *log.keys("load_setting")]
    for name in candidates:
        if name in log.samples and name != key:
            return log.column(name)
    return None


def _power(log: BenchLog) -> Column | None:
    """What the input took: its power, else its current."""
    return next((log.column(key) for key in ("input_power", "input_current") if key in log.samples), None)


# --- time -----------------------------------------------------------------------------------------------------------


def _clock_doubts(log: BenchLog, table: Span) -> Iterator[Doubt]:
    if "time" not in log.samples or table[1] - table[0] < 2:
        return
    time = log.column("time")
    if isinstance(time, Packed) and time.is_rising_evenly(*table):
        return
    step = np.diff(time[table[0] : table[1]])
    back = np.flatnonzero(step < 0)
    if back.size:
        row = table[0] + int(back[0])
        count = "once" if back.size == 1 else f"{back.size} times"
        text = f"time runs backwards {count}, first after {place_of(log, row)} by {-step[back[0]]:.6g} s"
        remedy = "write each run of the logger into a file of its own"
        channels = (*_quantity_keys(log), "time")
        yield Doubt("backward time", text, bars=True, channels=channels, spans=(table,), remedy=remedy)
        return
    yield from _repeated(log, table, step)
    yield from _gaps(log, table, step)


def _repeated(log: BenchLog, table: Span, step: Values) -> Iterator[Doubt]:
    """Equal times in a row: a clock coarser than the logger is normal; one that stands still bars what needs time.

    Readings stay good in either case, so only the channel "time" is ever barred.
    """
    same = np.flatnonzero(step == 0)
    if not same.size:
        return
    first, last = runs_of(step == 0)
    where = place_of(log, table[0] + int(first[0]))
    text = f"{same.size} samples carry the time of the one before, first after {where}"
    lengths = np.diff(np.flatnonzero(np.concatenate(([True], step != 0, [True]))))
    typical = float(np.median(lengths))
    if same.size <= max(1, _COARSE_SHARE * step.size):
        spans = tuple((table[0] + int(a), table[0] + int(b) + 1) for a, b in zip(first, last, strict=True))
        yield Doubt("repeated time", text, channels=("time",), spans=spans[:_LISTED])
    elif typical > 1 and lengths.max() <= 2 * typical + 1:
        moved = float(np.median(step[step > 0])) if (step > 0).any() else 0.0
        yield Doubt("repeated time", f"{text}; the clock moves in steps of {moved:.6g} s", channels=("time",))
    else:
        spans = tuple((table[0] + int(a), table[0] + int(b) + 1) for a, b in zip(first, last, strict=True))
        remedy = "let the logger write the time of every sample"
        yield Doubt("repeated time", text, bars=True, channels=("time",), spans=spans, remedy=remedy)


def _gaps(log: BenchLog, table: Span, step: Values) -> Iterator[Doubt]:
    """Steps far longer than a regular logger's; rows that a person wrote at leisure have no gaps."""
    known = step[step > 0]
    if known.size < 10:
        return
    median = float(np.median(known))
    if np.mean(np.abs(known - median) <= 0.5 * median) < 0.75:
        return
    rows = np.flatnonzero(step > _GAP_STEPS * median)
    if not rows.size:
        return
    longest = rows[np.argmax(step[rows])]
    where = place_of(log, table[0] + int(longest))
    gaps = "1 gap" if rows.size == 1 else f"{rows.size} gaps"
    text = f"{gaps} in the time; the longest, {step[longest]:.6g} s at steps of {median:.6g} s, is after {where}"
    spans = tuple((table[0] + int(row), table[0] + int(row) + 1) for row in rows)
    yield Doubt("gap", text, channels=("time",), spans=spans, remedy="dwells end at a gap")


# --- what is missing, and columns that cannot be what they say --------------------------------------------------------


def _missing(log: BenchLog) -> Iterator[Doubt]:
    """Empty readings that the reader has not told of already."""
    told = {key for doubt in log.doubts if doubt.kind in ("missing", "over range") for key in doubt.channels}
    table = log.samples["table"].to_numpy()
    for key in (*_quantity_keys(log), "time"):
        if key in told or key not in log.samples or log.samples[key].dtype.kind != "f":
            continue
        column = log.column(key)
        if isinstance(column, Packed) and not column.has_holes:
            continue
        empty = np.isnan(np.asarray(column))
        if not empty.any():
            continue
        # a table without this column misses nothing
        logged = np.unique(table[~empty])
        rows = np.flatnonzero(empty & np.isin(table, logged))
        if rows.size:
            text = f"{rows.size} readings of {words_of(key)} missing, first at {place_of(log, int(rows[0]))}"
            yield Doubt("missing", text, channels=(key,))


def _no_input_power(log: BenchLog, supply: str | None) -> Iterator[Doubt]:
    columns = log.samples.columns
    has_power = "input_power" in columns or "power_factor" in columns
    has_power = has_power or "input_power" in log.stated or "power_factor" in log.stated
    if supply != "ac" or has_power or not {"input_voltage", "input_current"} <= set(columns):
        return
    text = "an a.c. input with volts and amperes, but no power and no power factor: their product is no power"
    remedy = "record the input power with a wattmeter, or the power factor"
    yield Doubt("no input power", text, bars=True, channels=("input_power", "input_current"), remedy=remedy)


def _steady(log: BenchLog) -> NDArray[np.bool_]:
    """Samples under the ordinary load; where no stage is called steady, all but those of an overload."""
    stage = log.samples["stage"]
    if "steady" not in stage.cat.categories:
        # a limited or shorted output reads anything, and is no tenfold slip of a unit
        return ~log.is_stage("overcurrent")
    return log.is_stage("steady")


def _blocks(log: BenchLog, steady: NDArray[np.bool_], *keys: str) -> Iterator[tuple[Values, ...]]:
    """Some channels in the steady samples, a stretch at a time; of a very long log stretches spread all over it.

    They tell shares of samples, near enough from a million of them.
    """
    starts = range(0, steady.size, _BLOCK)
    for first in starts[:: max(1, len(starts) // _BLOCKS)]:
        stop = min(steady.size, first + _BLOCK)
        rows = steady[first:stop]
        parts = tuple(log.part(key, first, stop) for key in keys)
        yield parts if rows.all() else tuple(part[rows] for part in parts)


def _known(log: BenchLog, key: str, steady: NDArray[np.bool_]) -> Values:
    """The steady readings of a channel, of a very long log every so manieth: for a median they are enough."""
    every = max(1, steady.size // _ENOUGH)
    values, rows = log.column(key)[::every], steady[::every]
    return values[rows & np.isfinite(values)]


def _output_keys(log: BenchLog, output: str, rated: Mapping[str, tuple[float, float]]) -> tuple[str, str]:
    first = next(iter(rated), "")
    keys = [f"{quantity} {output}" for quantity in ("output_voltage", "output_current")]
    bare = [key.partition(" ")[0] if key not in log.samples and output == first else key for key in keys]
    return bare[0], bare[1]


def _median(values: Values) -> float:
    known = values[np.isfinite(values)]
    return float(np.median(known)) if known.size else float("nan")


def _swapped(
    log: BenchLog, rated: Mapping[str, tuple[float, float]], rated_input_voltage: float | None
) -> Iterator[Doubt]:
    steady = _steady(log)
    for output, (volts, amperes) in rated.items():
        voltage, current = _output_keys(log, output, rated)
        if voltage not in log.samples or current not in log.samples:
            continue
        if abs(volts - amperes) > 0.3 * max(volts, amperes) and _mostly(
            (np.abs(i - volts) < 0.1 * volts) & (np.abs(v - volts) > 0.2 * volts) & (np.abs(v) < 1.5 * amperes)
            for v, i in _blocks(log, steady, voltage, current)
        ):
            text = (
                f"{words_of(voltage)} reads like a current, and {words_of(current)} like the rated {volts:g} V: swapped"
            )
            remedy = "say which column is which under log: columns:"
            yield Doubt("swapped", text, bars=True, channels=(voltage, current), remedy=remedy)
        elif rated_input_voltage is not None and "input_voltage" in log.samples:
            yield from _ends_swapped(log, voltage, volts, rated_input_voltage, steady)
    yield from _gains_power(log, rated, steady)


def _mostly(masks: Iterable[NDArray[np.bool_]], share: float = 0.8) -> bool:
    counts = [(int(np.count_nonzero(mask)), mask.size) for mask in masks]
    size = sum(count for _, count in counts)
    return size > 0 and sum(count for count, _ in counts) / size >= share


def _ends_swapped(
    log: BenchLog, voltage: str, volts: float, rated_input: float, steady: NDArray[np.bool_]
) -> Iterator[Doubt]:
    if abs(volts - rated_input) <= 0.3 * max(volts, rated_input):
        return
    takes_output = _mostly(np.abs(v - volts) < 0.1 * volts for (v,) in _blocks(log, steady, "input_voltage"))
    if takes_output and _mostly(np.abs(v - rated_input) < 0.2 * rated_input for (v,) in _blocks(log, steady, voltage)):
        text = f"input voltage reads like the rated {volts:g} V output, and {words_of(voltage)} like the input: swapped"
        remedy = "say which column is which under log: columns:"
        yield Doubt("swapped", text, bars=True, channels=("input_voltage", voltage), remedy=remedy)


def _gains_power(log: BenchLog, rated: Mapping[str, tuple[float, float]], steady: NDArray[np.bool_]) -> Iterator[Doubt]:
    """More power out than in, in nearly all samples under load: no gain error does that."""
    if "input_power" not in log.samples:
        return
    pairs = [(v, v.replace("output_voltage", "output_current")) for v in log.keys("output_voltage")]
    pairs = [(v, i) for v, i in pairs if i in log.samples]
    if not pairs:
        return
    keys = [key for pair in pairs for key in pair]
    top = max((float(np.nanmax(_sum_of(parts), initial=0.0)) for parts in _blocks(log, steady, *keys)), default=0.0)
    if top <= 0:
        return
    gains, count = [], 0
    for power_in, *parts in _blocks(log, steady, "input_power", *keys):
        power_out = _sum_of(parts)
        loaded = (power_out > 0.1 * top) & np.isfinite(power_in)
        gains.append(power_out[loaded] > 1.02 * power_in[loaded])
        count += gains[-1].size
    if count < 2 or not _mostly(gains, 0.95):
        return
    loaded = steady & (_sum_of([_values(log, key) for key in keys]) > 0.1 * top)
    loaded &= np.isfinite(_values(log, "input_power"))
    near = all(
        abs(_median(_values(log, v)[loaded]) - rated[q][0]) <= 0.2 * rated[q][0]
        for (v, _), q in ((pair, pair[0].partition(" ")[2] or next(iter(rated), "")) for pair in pairs)
        if q in rated
    )
    outputs = () if near and rated else tuple(key for pair in pairs for key in pair)
    inputs = tuple(key for key in ("input_power", "input_current", "power_factor") if key in log.samples)
    text = "the output power exceeds the input power in nearly every sample: columns are swapped, or a unit is wrong"
    remedy = "say which column is which, and in which unit, under log: columns:"
    yield Doubt("swapped", text, bars=True, channels=(*inputs, *outputs), remedy=remedy)


def _sum_of(parts: Sequence[Values]) -> Values:
    """Powers of voltages and currents in turn, together. [W]"""
    return np.asarray(np.sum([v * i for v, i in zip(parts[::2], parts[1::2], strict=True)], axis=0))


def _scale(
    log: BenchLog, rated: Mapping[str, tuple[float, float]], rated_input_voltage: float | None
) -> Iterator[Doubt]:
    steady = _steady(log)
    for output, (volts, amperes) in rated.items():
        voltage, current = _output_keys(log, output, rated)
        has_current = current in log.samples
        if voltage in log.samples:
            values = _upper(log, voltage, current if has_current else None, steady)
            yield from _off_by_tens(log, voltage, _median(values), volts, "V")
        if has_current:
            known = _known(log, current, steady)
            high = float(np.quantile(np.abs(known), 0.95)) if known.size else 0.0
            if high > 8 * amperes:
                yield _scale_doubt(log, current, high, amperes, "A")
    if rated_input_voltage is not None and "input_voltage" in log.samples:
        median = _median(_known(log, "input_voltage", steady))
        yield from _off_by_tens(log, "input_voltage", median, rated_input_voltage, "V")
    if "power_factor" in log.samples:
        factor = _median(np.abs(_known(log, "power_factor", np.ones(len(log.samples), bool))))
        if factor > 1.05:
            yield _scale_doubt(log, "power_factor", factor, 1.0, "")


def _upper(log: BenchLog, voltage: str, current: str | None, steady: NDArray[np.bool_]) -> Values:
    """The voltage in the upper half of the load; every so manieth of a very long log."""
    if current is None:
        return _known(log, voltage, steady)
    every = max(1, steady.size // _ENOUGH)
    loads, values, rows = np.abs(log.column(current)[::every]), log.column(voltage)[::every], steady[::every]
    top = float(np.nanmax(loads[rows], initial=0.0))
    return values[rows & (loads >= 0.5 * top)]


def _off_by_tens(log: BenchLog, key: str, median: float, rating: float, symbol: str) -> Iterator[Doubt]:
    ratio = abs(median) / rating
    if ratio > 0 and np.isfinite(ratio):
        tens = round(float(np.log10(ratio)))
        if 1 <= abs(tens) <= 3 and abs(np.log10(ratio) - tens) < 0.08:
            yield _scale_doubt(log, key, median, rating, symbol)


def _scale_doubt(log: BenchLog, key: str, value: float, rating: float, symbol: str) -> Doubt:
    """A bar only where the unit was assumed: a written unit is the log's own word, and the unit may be faulty."""
    assumed = any(channel.key == key and channel.unit_from == "assumed" for channel in log.channels)
    rating_text = f"rated {rating:g} {symbol}".strip() if symbol else "at most 1"
    text = f"{words_of(key)} reads {value:.4g} {symbol}".rstrip() + f" against {rating_text}"
    text += ", and its unit was assumed" if assumed else ""
    return Doubt(
        "scale", text, bars=assumed, channels=(key,), remedy="write the unit into the heading or under log: columns:"
    )
