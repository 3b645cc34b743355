"""Dwells: the stretches of a bench log at one steady operating condition.

What the log declares (a load setting that varies) is believed first; where it declares nothing, dwells are found in
the output currents and the input voltage. A dwell never spans two tables, two stages, or a gap in time.
"""

from __future__ import annotations

from collections.abc import Iterable, Iterator, Mapping, Sequence
from dataclasses import dataclass, field
from itertools import pairwise

import numpy as np
import numpy.typing as npt

from acceptance.bench.log import BenchLog, Doubt, Span
from acceptance.bench.packed import Packed, extent_of
from acceptance.bench.values import Column
from acceptance.points.borders import Codes, changes, common, gaps_in
from acceptance.points.levels import Level, find_levels
from acceptance.points.settling import drift_of, samples_ahead, settling_samples

__all__ = ["Dwell", "Dwells", "find_dwells"]

Array = npt.NDArray[np.float64]

RATED_SHARE = 0.002  # of the rated current: a smaller change is no new load
INPUT_SHARE = 0.01  # of the input voltage: the tolerance within which a condition on it is met
BY_HAND_ROWS = 24  # in so short a table a row may be a condition of its own
ROWS_BY_HAND = 200  # a longer table whose settings all differ was not written by hand, but read back
FEW = 5  # samples; a log whose settings are mostly held for fewer is kept by hand
VOLTAGE_MATTERS = 1e-4  # of the reading: a tenth of the tightest regulation that is asked for
POWER_MATTERS = 1e-3  # of the reading
STUB = 0.25  # of the usual length: a shorter piece between two settings that do not change together is no condition
SUSPICIOUS = 0.3  # of a dwell: nothing that has settled moves for so long after the load has arrived
HALF_LEFT = 8  # samples; below this a half says nothing about settling
SETTLING_QUANTITIES = ("output_current", "output_voltage", "input_power")
LARGEST = 1e150  # beyond it is no reading, and sums of squares overflow
STEADY = "steady"  # the stage whose means are judged
BY_HAND = "one row a condition"
DECLARED = "load setting"


@dataclass(frozen=True, slots=True)
class Dwell:
    """Samples [first, stop) of a log at one steady operating condition."""

    first: int  # sample index, after settling
    stop: int  # one past the last sample
    begins: int  # where the condition was set: first - begins samples were left out as settling
    stage: str
    table: int  # index into BenchLog.tables
    from_: str  # "load setting", "found in <channel>", "one row a condition"
    drift: float | None  # end against start, of the first output current, else of the input voltage, in its unit
    level_from: int | None = None  # where the channels that tell had reached the level; None: at `first`

    @property
    def reached(self) -> int:
        """The sample from which on the condition was there, settling included."""
        return self.first if self.level_from is None else self.level_from


@dataclass(frozen=True, slots=True)
class Dwells:
    """The dwells of a log in its order, and what could not be done as asked."""

    dwells: tuple[Dwell, ...]
    doubts: tuple[Doubt, ...] = ()


@dataclass(frozen=True, slots=True)
class _Steady:
    """A stretch at one condition, before settling is left out."""

    begins: int  # where the condition was set
    first: int  # where the channels that tell have reached it
    stop: int
    from_: str


@dataclass(frozen=True, slots=True)
class _Samples:
    """What dwells are found from: plain arrays over the whole log, and what was asked for."""

    channels: Mapping[str, Column]  # channel key -> its samples, NaN where not finite
    time: Column | None  # [s]; None where not logged
    settle: float | None  # [s]
    min_dwell: float | None  # [s]
    smallest: Mapping[str, float]  # output current channel -> smallest change that is a new load [A]
    left_out: list[tuple[Span, str]] = field(default_factory=list)  # what is no dwell, and why

    def keys(self, *quantities: str) -> list[str]:
        """The channels of these quantities, in this order."""
        return [key for quantity in quantities for key in self.channels if key.partition(" ")[0] == quantity]


def find_dwells(
    log: BenchLog,
    *,
    settle: float | None = None,
    min_dwell: float | None = None,
    rated: Mapping[str, float] | None = None,
) -> Dwells:
    """The dwells of a log, in its order and without overlap.

    Parameters
    ----------
    log
        Any number of tables and stages.
    settle
        Time left out at the start of every dwell, by the log's time. Default: found from the data. A dwell that was
        found, not declared, also starts no earlier than its level is reached. [s]
    min_dwell
        Shorter dwells (settling included) are dropped, but for conditions of one row. Default: found from the
        lengths of the others. [s]
    rated
        Output -> rated current, which tells a change of load from noise at no load. [A]

    Returns
    -------
    Dwells
        With a doubt where `settle` or `min_dwell` could not be applied, or left nothing of a dwell.
    """
    if not len(log.samples):
        return Dwells(())
    channels = {key: _finite(log.column(key)) for key in _channels_used(log)}
    time = channels.pop("time", None)
    doubts = []
    if time is None or _tells_nothing(time):
        doubts = [_no_time(name) for name, value in (("settle", settle), ("min_dwell", min_dwell)) if value]
        time, settle, min_dwell = None, None, None
    samples = _Samples(channels, time, settle, min_dwell, _smallestchanges(channels, rated or {}))
    table, stage = log.samples["table"].to_numpy(), log.samples["stage"]
    dwells: list[Dwell] = []
    for group, borders in _groups(log, samples):
        for steady in _steady_stretches(samples, group, borders):
            first, stop, slow = _settled_span(samples, steady)
            if first < stop:
                where = str(stage.iat[first]), int(table[first])
                drift = _drift(samples, first, stop)
                dwells.append(Dwell(first, stop, steady.begins, *where, steady.from_, drift, steady.first))
                # what a mean must wait for: an overload and a soak are looked at sample by sample
                if where[0] != STEADY:
                    continue
                if slow:
                    doubts.append(_slow_settling(log, steady, first, slow))
                elif (
                    settle is None and stop - first >= HALF_LEFT and first - steady.first >= (stop - steady.first) // 2
                ):
                    doubts.append(_half_settling(log, steady))
            else:
                doubts.append(_all_settling(log, steady, settle))
    return Dwells(tuple(dwells), (*_by_hand_doubts(dwells, settle), *_left_out(log, samples.left_out), *doubts))


# --- doubts -----------------------------------------------------------------------------------------------------


def _no_time(name: str) -> Doubt:
    return Doubt(f"{name} not applied", f"{name} not applied: the log has no time", remedy="log the time")


def _all_settling(log: BenchLog, steady: _Steady, settle: float | None) -> Doubt:
    table, first, last = log.rows_of((steady.begins, steady.stop))
    text = f"{table}, lines {first} to {last}: nothing is left of this dwell after settle = {settle or 0:g} s"
    spans = ((steady.begins, steady.stop),)
    return Doubt("dwell shorter than settle", text, spans=spans, remedy="hold each condition for longer")


def _half_settling(log: BenchLog, steady: _Steady) -> Doubt:
    table, first, last = log.rows_of((steady.begins, steady.stop))
    text = f"{table}, lines {first} to {last}: half of this dwell was left out as settling, and it may go on"
    spans = ((steady.begins, steady.stop),)
    return Doubt("slow settling", text, spans=spans, remedy="hold each condition for longer, or state settle")


def _slow_settling(log: BenchLog, steady: _Steady, first: int, slow: Sequence[str]) -> Doubt:
    """What was left out moved while the load stood still: it may be settling, or the very fault that is looked for."""
    table, begin, last = log.rows_of((steady.begins, steady.stop))
    names = " and ".join(slow)
    text = (
        f"{table}, lines {begin} to {last}: {names} moved through the first {first - steady.first} of "
        f"{steady.stop - steady.first} samples, with the load already set"
    )
    spans = ((steady.begins, steady.stop),)
    remedy = "hold each condition for longer, or state under log: settle: how long it is given to settle"
    return Doubt("slow settling", text, bars=True, channels=tuple(slow), spans=spans, remedy=remedy)


def _left_out(log: BenchLog, left_out: Sequence[tuple[Span, str]]) -> Iterator[Doubt]:
    """What could have been a dwell and is none, by the reason."""
    for reason in dict.fromkeys(why for _, why in left_out):
        spans = tuple(span for span, why in left_out if why == reason)
        table, first, last = log.rows_of(spans[0])
        more = f", and {len(spans) - 1} more" if len(spans) > 1 else ""
        text = f"{len(spans)} conditions were left out, {reason} ({table}, lines {first} to {last}{more})"
        yield Doubt("dwell left out", text.replace("1 conditions were", "1 condition was", 1), spans=spans)


def _by_hand_doubts(dwells: Sequence[Dwell], settle: float | None) -> Iterator[Doubt]:
    rows = tuple((dwell.begins, dwell.stop) for dwell in dwells if dwell.stop - dwell.begins == 1)
    if rows and settle:
        text = f"settle not applied to {len(rows)} conditions of one row: a single reading has no time to leave out"
        yield Doubt("settle not applied", text, spans=rows)


# --- the log as arrays ------------------------------------------------------------------------------------------


def _channels_used(log: BenchLog) -> list[str]:
    """The numeric columns that dwells are found from."""
    quantities = ("time", "load_setting", "input_voltage", *SETTLING_QUANTITIES)
    return [key for quantity in quantities for key in log.keys(quantity)]


def _tells_nothing(time: Column) -> bool:
    low, high = extent_of(time)
    return not low <= high


def _finite(x: Column) -> Column:
    """The samples, contiguous, NaN for what is no reading; copied only where something changes."""
    if isinstance(x, Packed):
        low, high = x.extent()
        if max(abs(low), abs(high)) <= LARGEST or not low <= high:
            return x
        x = np.asarray(x)
    infinite = np.abs(x) > LARGEST
    return np.where(infinite, np.nan, x) if infinite.any() else np.ascontiguousarray(x)


def _smallestchanges(channels: Iterable[str], rated: Mapping[str, float]) -> dict[str, float]:
    """Output current channel -> the smallest change that is a new load. [A]"""
    out: dict[str, float] = {}
    for key in channels:
        quantity, _, output = key.partition(" ")
        if quantity == "output_current":
            current = rated.get(output, next(iter(rated.values())) if not output and len(rated) == 1 else 0.0)
            out[key] = RATED_SHARE * current
    return out


# --- borders that nothing spans ---------------------------------------------------------------------------------


def _groups(log: BenchLog, samples: _Samples) -> Iterator[tuple[Span, list[int]]]:
    """Each stretch of one table, stage and load mode, with the borders of its gapless parts."""
    told = [log.samples["table"].to_numpy(), *(_codes(log, key) for key in ("stage", *log.keys("load_mode")))]
    for first, stop in pairwise([0, *changes(told).tolist(), len(log.samples)]):
        time = samples.time
        if time is None or (isinstance(time, Packed) and time.is_rising_evenly(first, stop)):
            gaps = []
        else:
            gaps = (gaps_in(time[first:stop]) + first).tolist()
        yield (first, stop), [first, *gaps, stop]


def _codes(log: BenchLog, key: str) -> Codes:
    """A number for each text of a column; equal numbers, equal text."""
    return np.asarray(log.samples[key].astype("category").cat.codes)


# --- steady stretches -------------------------------------------------------------------------------------------


def _steady_stretches(samples: _Samples, group: Span, borders: Sequence[int]) -> list[_Steady]:
    """The steady stretches of one group, those too short left out."""
    settings = _settings(samples, group)
    out: list[_Steady] = []
    for first, stop in pairwise(borders):
        if settings is None:
            out += _found(samples, (first, stop))
        else:
            out += _declared(samples, (first, stop), settings[:, first - group[0] : stop - group[0]])
    if samples.min_dwell is None or samples.time is None:
        return out
    kept = [s for s in out if s.stop - s.begins == 1 or _duration(samples.time[s.first : s.stop]) >= samples.min_dwell]
    why = f"shorter than min_dwell = {samples.min_dwell:g} s"
    samples.left_out.extend(((s.begins, s.stop), why) for s in out if s not in kept)
    return kept


def _duration(time: Array) -> float:
    """From the first sample to the end of the last one, which lasts as long as the others do. [s]"""
    time = time[~np.isnan(time)]
    return float(time[-1] - time[0]) * time.size / (time.size - 1) * (1 + 1e-9) if time.size > 1 else 0.0


def _settings(samples: _Samples, group: Span) -> Array | None:
    """The load settings of a group, one row a channel; None where they tell nothing."""
    rows = [_without_holes(samples.channels[key][slice(*group)]) for key in samples.keys("load_setting")]
    told = [row for row in rows if not np.isnan(row).all()]
    if not any(np.nanmax(row) > np.nanmin(row) for row in told):
        return None
    return np.stack(told) if len(told) > 1 else told[0][np.newaxis]


def _without_holes(setting: Array) -> Array:
    """The setting, an empty cell between two equal ones filled: the load was not set anew there."""
    if not np.isnan(setting).any():
        return setting
    known = np.flatnonzero(~np.isnan(setting))
    if not known.size:
        return setting
    before = np.maximum(np.searchsorted(known, np.arange(setting.size), side="right") - 1, 0)
    after = np.minimum(before + 1, known.size - 1)
    low, high = setting[known[before]], setting[known[after]]
    return np.where(np.isnan(setting) & (low == high) & (np.arange(setting.size) > known[0]), low, setting)


def _declared(samples: _Samples, block: Span, settings: Array) -> list[_Steady]:
    """Runs of equal settings, each cut where the input voltage is stepped; where all are empty, found instead."""
    empty = np.isnan(settings)
    columns = [*np.where(empty, 0.0, settings), *empty] if empty.any() else [*settings]
    runs = list(pairwise([0, *changes(columns).tolist(), settings.shape[1]]))
    lengths = np.array([stop - first for first, stop in runs])
    by_hand = _usual_length(lengths) < FEW  # else a setting of one sample is part of a ramp
    if by_hand and settings.shape[1] > ROWS_BY_HAND:
        runs, by_hand = _levels_read_back(settings), False
    inputs = _levels(samples, "input_voltage", block, by_hand=by_hand) or [block]
    out: list[_Steady] = []
    for first, stop in runs:
        if empty[:, first].all():
            out += _found(samples, (block[0] + first, block[0] + stop))
        elif stop - first > 1 or by_hand:
            pieces = list(_within((block[0] + first, block[0] + stop), inputs))
            usual = float(np.median([piece.stop - piece.first for piece in pieces])) if pieces else 0.0
            whole = [piece for piece in pieces if by_hand or piece.stop - piece.first >= STUB * usual]
            why = "the load and the input not being set at the same time"
            samples.left_out.extend(((piece.first, piece.stop), why) for piece in pieces if piece not in whole)
            out += whole
        else:
            span = (block[0] + first, block[0] + stop)
            samples.left_out.append((span, "a load setting of one sample being part of a ramp"))
    return out


def _usual_length(lengths: Codes) -> float:
    """The median over all samples of the length of the run that each is in."""
    ordered = np.sort(lengths)
    upto = np.cumsum(ordered)
    middle = np.array([(upto[-1] - 1) // 2, upto[-1] // 2])
    return float(np.mean(ordered[np.searchsorted(upto, middle, side="right")]))


def _levels_read_back(settings: Array) -> list[Span]:
    """The runs of settings that were read back with noise, so that hardly two samples are equal."""
    joint: list[Span] = [(0, settings.shape[1])]
    for setting in settings:
        largest = float(np.nanmax(np.abs(setting)))
        levels = [(first, stop) for first, stop, _ in find_levels(setting, smallest=RATED_SHARE * largest)]
        joint = list(common(joint, levels))
    return joint


def _within(run: Span, inputs: Sequence[Span]) -> Iterator[_Steady]:
    """A declared run, once for every input-voltage level in it."""
    begins = run[0]
    for first, stop in common([run], inputs):
        yield _Steady(begins, first, stop, DECLARED)
        begins = stop


def _found(samples: _Samples, block: Span) -> list[_Steady]:
    """Stretches over which every output current, and the input voltage, stays at one level."""
    by_hand = block[1] - block[0] <= BY_HAND_ROWS
    told: dict[str, list[Span]] = {}
    for key in _telling(samples, block):
        levels = _levels(samples, key, block, by_hand=by_hand)
        if levels:
            told[key] = levels
    if not told:
        return [_Steady(block[0], *block, BY_HAND if block[1] - block[0] == 1 else "found in no channel")]
    rows_told = any(_is_by_hand(levels) for levels in told.values())
    joint: Iterable[Span] = [block]
    for levels in told.values():
        joint = common(joint, levels)
    out: list[_Steady] = []
    begins = block[0]
    for first, stop in joint:
        if stop - first == 1 and not (by_hand or rows_told):
            continue
        single = rows_told or stop - first == 1
        out.append(_Steady(first if single else begins, first, stop, BY_HAND if single else _source(told, first)))
        begins = stop
    return out


def _is_by_hand(levels: Sequence[Span]) -> bool:
    return float(np.median([stop - first for first, stop in levels])) == 1


def _telling(samples: _Samples, block: Span) -> list[str]:
    """The channels that tell the condition."""
    told = samples.keys("output_current", "input_voltage")
    if samples.keys("output_current"):
        return told
    # the load is not known: rows written by hand still show in the power, a logger's table is one dwell
    power = [key for key in samples.keys("input_power") if _is_by_hand(_levels(samples, key, block) or [block])]
    return told + power


def _levels(samples: _Samples, key: str, block: Span, *, by_hand: bool = False) -> list[Span]:
    """Where a channel stays at one level within a block; empty where the channel is not there or has no number."""
    if key not in samples.channels:
        return []
    x = samples.channels[key][slice(*block)]
    if key == "input_voltage" and _is_within(x, INPUT_SHARE):
        return [block]
    missing = np.isnan(x)
    if missing.all():
        return []
    # the first and the last with a reading
    known = np.array([missing.argmin(), x.size - 1 - missing[::-1].argmin()])
    shortest = 1 if by_hand else 2
    dwell = None if samples.min_dwell is None else 1  # the clock decides later, not the count
    if key == "input_voltage":
        size = np.abs(x[~missing] if missing.any() else x)
        tolerance = INPUT_SHARE * float(np.partition(size, size.size // 2)[size.size // 2])  # no mean that may overflow
        levels = find_levels(x, tolerance=tolerance, min_samples=shortest, min_dwell=dwell)
    else:
        smallest = samples.smallest.get(key, 0.0)
        levels = find_levels(x, smallest=smallest, min_samples=shortest, min_dwell=dwell)
    return [(block[0] + first, block[0] + stop) for first, stop in _over_empty_ends(levels, known, x.size)]


def _is_within(x: Array, share: float) -> bool:
    """Whether readings differ by no more than a share of any of them, and so of their median."""
    low, high = float(np.fmin.reduce(x)), float(np.fmax.reduce(x))
    return low * high > 0 and high - low <= share * (1 - 1e-9) * min(abs(low), abs(high))


def _over_empty_ends(levels: Sequence[Level], known: Codes, size: int) -> list[Span]:
    """The levels' spans, carried on over empty cells at either end of a block: they break no level."""
    spans = [(first, stop) for first, stop, _ in levels]
    if spans and spans[0][0] == known[0]:
        spans[0] = (0, spans[0][1])
    if spans and spans[-1][1] == known[-1] + 1:
        spans[-1] = (spans[-1][0], size)
    return spans


def _source(told: Mapping[str, Sequence[Span]], first: int) -> str:
    """Which channel reached its level last, and so began the dwell, in words."""
    starts = {key: max((begin for begin, _ in levels if begin <= first), default=-1) for key, levels in told.items()}
    return f"found in {max(starts, key=lambda key: starts[key])}"


# --- settling ---------------------------------------------------------------------------------------------------


def _settled_span(samples: _Samples, steady: _Steady) -> tuple[int, int, tuple[str, ...]]:
    """The samples of a stretch without its settling, first and stop, and the channels that settled suspiciously long.

    A channel is suspicious that still moves through three tenths of a dwell after the load has arrived, or through
    any of a dwell of a few samples, where nothing tells settling from a fault.
    """
    first, stop = steady.first, steady.stop
    if stop - steady.begins == 1:
        return first, stop, ()
    if steady.from_ == DECLARED:
        currents = [samples.channels[key][first:stop] for key in samples.keys("output_current")]
        stop -= max((samples_ahead(part) for part in currents), default=0)
    if samples.settle is not None and samples.time is not None:
        return max(first, _after(samples.time, (steady.begins, stop), samples.settle)), stop, ()
    if samples.time is None and stop - first < HALF_LEFT:
        return first, stop, ()  # rows by hand: whoever wrote them down waited first
    leads = {key: settling_samples(samples.channels[key][first:stop]) for key in samples.keys(*SETTLING_QUANTITIES)}
    by_load = max((lead for key, lead in leads.items() if key.startswith("output_current")), default=0)
    whole = stop - first
    enough = 1 if whole < HALF_LEFT else SUSPICIOUS * whole
    settled = first + max(leads.values(), default=0)
    suspects = [k for k, lead in leads.items() if not k.startswith("output_current") and lead - by_load >= enough]
    slow = tuple(k for k in suspects if _matters(samples.channels[k], k, (first + by_load, settled, stop)))
    return settled, stop, slow


def _matters(x: Column, key: str, bounds: tuple[int, int, int]) -> bool:
    """Whether leaving out what settled moves the mean by more than anybody would be after."""
    whole, kept = x[bounds[0] : bounds[2]], x[bounds[1] : bounds[2]]
    if np.isnan(whole).all() or np.isnan(kept).all():
        return False
    mean = float(np.nanmean(kept))
    share = VOLTAGE_MATTERS if key.startswith("output_voltage") else POWER_MATTERS
    return abs(float(np.nanmean(whole)) - mean) > share * abs(mean)


def _after(time: Column, span: Span, wait: float) -> int:
    """The first sample at least `wait` after the first one of a span; its end where there is none."""
    part = time[slice(*span)]
    known = part[~np.isnan(part)]
    if not known.size:
        return span[1]
    late = part - known[0] >= wait - 1e-9 * max(1.0, abs(wait))
    return span[0] + int(np.argmax(late)) if late.any() else span[1]


def _drift(samples: _Samples, first: int, stop: int) -> float | None:
    for key in samples.keys("output_current", "input_voltage"):
        drift = drift_of(samples.channels[key][first:stop])
        if drift is not None:
            return drift
    return None
