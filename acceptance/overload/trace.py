"""Traces: the samples of one output through an overload, with the current that the load asked for."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from acceptance.bench.log import channel_key
from acceptance.errors import MeasurementError
from acceptance.points.dwells import Dwell
from acceptance.points.point import Point, Points
from acceptance.units import UNITS

__all__ = ["NO_CURRENT", "OFF", "RATED", "Trace", "overload_parts", "scatter", "trace_of"]

Floats = NDArray[np.float64]
Mask = NDArray[np.bool_]

STAGE = "overcurrent"
RATED = 1.02  # of rated current: up to here a load is no overload, by the tolerance of a full load
OFF = 0.25  # of rated voltage: an output below it, with next to no current, gives nothing
NO_CURRENT = 0.05  # of rated current; a folded output still gives a fifth of it (makers' own answers)
_UP = 0.5  # of rated voltage
_DRAWS_NOTHING = 0.01  # of rated current, as far as an offset of the meter goes
_OVERLOAD = 1.05  # of rated current: a table without stages is an overload's from here on
_LARGEST = 1e9  # [V, A]: what is beyond it was never read
_OF_MEANS = ("slow settling", "unsteady", "never moves")  # doubts about dwells
_MODES = {"resistance": "CR", "current": "CC", "voltage": "CV", "power": "CP"}


@dataclass(frozen=True, slots=True, eq=False)
class Trace:
    """One output's samples of one stretch, those without a voltage or a current left out.

    All arrays have shape (n,).
    """

    part: Point
    output: str
    rows: NDArray[np.intp]  # where each sample lies in the stretch
    voltage: Floats  # at the terminals: the drop in the leads put back [V]
    current: Floats  # [A]
    time: Floats | None  # as logged; None where it is not known throughout [s]
    setting: Floats | None  # of the load, in the unit of its mode
    modes: NDArray[np.str_]  # of the load: CC, CR, CV, CP, or ""
    input: Floats | None  # [V]
    rated_voltage: float
    rated_current: float
    lead: float  # [ohm]

    @property
    def size(self) -> int:
        """Samples."""
        return self.voltage.size

    @property
    def voltage_key(self) -> str:
        """The channel of the voltage."""
        return channel_key("output_voltage", self.output)

    @property
    def current_key(self) -> str:
        """The channel of the current."""
        return channel_key("output_current", self.output)

    def mode(self, where: slice) -> str:
        """The load's mode over some samples; "mixed" where it changed, "" where nothing tells it."""
        found = set(self.modes[where].tolist())
        return str(found.pop()) if len(found) == 1 else ("mixed" if found else "")

    def place(self, first: int, stop: int) -> str:
        """File and lines of samples, for people."""
        at = self.part.dwell.first
        span = (at + int(self.rows[first]), at + int(self.rows[stop - 1]) + 1)
        table, line, last = self.part.log.rows_of(span)
        return f"{table}, line {line}" if line == last else f"{table}, lines {line} to {last}"

    def stretch(self, first: int, stop: int) -> Point:
        """These samples as a point of their own."""
        at = self.part.dwell.first
        return _stretch(self.part, at + int(self.rows[first]), at + int(self.rows[stop - 1]) + 1)

    def asked(self) -> Floats:
        """Current that the load asks for, were the output at its rated voltage; NaN where no setting tells it. [A]

        In CV mode a setting well below the rated voltage asks for whatever there is: infinite.
        """
        if self.setting is None:
            return np.full(self.size, np.nan)
        asked = np.full(self.size, np.nan)
        with np.errstate(divide="ignore", invalid="ignore"):
            by_mode = {
                "CC": self.setting,
                "CR": np.where(self.setting >= 0, self.rated_voltage / (self.setting + self.lead), np.nan),
                "CV": np.where(self.setting < 0.98 * self._regulated(), np.inf, 0.0),
                "CP": self.setting / self.rated_voltage,
            }
        for mode, values in by_mode.items():
            here = (self.modes == mode) & np.isfinite(self.setting)
            asked[here] = values[here]
        asked[self.load_off()] = 0.0
        return asked

    def load_off(self) -> Mask:
        """Whether the load was switched off, whatever its setting still says: the output is up and nothing is drawn."""
        if self.setting is None:
            return np.zeros(self.size, bool)
        up = self.voltage > _UP * self.rated_voltage
        off: Mask = up & (np.abs(self.current) < _DRAWS_NOTHING * self.rated_current)
        return off

    def overloaded(self) -> Mask:
        """Whether each sample is one of an overload.

        By the setting; where there is none, by the resistance that voltage and current show, and a sample that gives
        nothing is like the one before it.
        """
        asked = self.asked()
        known = np.isfinite(asked) | (asked == np.inf)
        if known.any():
            return _carried(np.where(known, asked > RATED * self.rated_current, False), known)
        rated_resistance = self.rated_voltage / self.rated_current
        gives = (self.voltage > OFF * self.rated_voltage) | (self.current > NO_CURRENT * self.rated_current)
        tight = self.voltage < rated_resistance / RATED * self.current
        tight[1:-1] &= tight[:-2] | tight[2:] | ~(gives[:-2] & gives[2:])  # a single one is noise at rated load
        return _carried(tight, gives)

    def _regulated(self) -> float:
        """About what the output holds at loads up to the rated one. [V]"""
        lightly = self.voltage[(self.current <= RATED * self.rated_current) & (self.voltage > 0.5 * self.rated_voltage)]
        return min(float(np.quantile(lightly, 0.75)) if lightly.size else math.inf, self.rated_voltage)


def _carried(values: Mask, known: Mask) -> Mask:
    """The values where they are known, each carried on until the next; before the first known one: False."""
    last = np.maximum.accumulate(np.where(known, np.arange(values.size), -1))
    return np.where(last >= 0, values[np.maximum(last, 0)], False)


def scatter(values: Floats) -> float:
    """Standard deviation of a reading from its neighbours, whatever their common course is; 0 below three samples."""
    if values.size < 3:
        return 0.0
    second = np.abs(values[:-2] - 2 * values[1:-1] + values[2:])
    return 1.4826 * float(np.median(second)) / math.sqrt(6.0)


def overload_parts(points: Points, output: str) -> tuple[Point, ...]:
    """The stretches that hold an overload: stage `overcurrent`, or, where no stage was told, tables with one in them.

    Of such a table the whole is taken, so that the regulated branch is there too.
    """
    if points.log.stages_from != "none told":
        return points.stretches(STAGE)
    whole = points.stretches("steady")
    called = [point.dwell for point in points.all if point.dwell.stage == STAGE]
    return tuple(part for part in whole if any(_holds(part, one) for one in called) or _is_driven(part, output))


def _holds(part: Point, dwell: Dwell) -> bool:
    return part.dwell.first < dwell.stop and dwell.first < part.dwell.stop


def _is_driven(part: Point, output: str) -> bool:
    """Whether more than the rated current was drawn, or asked for, in several samples."""
    rating = part.limits.ratings.outputs[output]
    key = channel_key("output_current", output)
    if not part.has(key) or not part.has(channel_key("output_voltage", output)):
        return False
    current = part.samples(key)
    if bool(np.count_nonzero(current > _OVERLOAD * rating.current) > 1):
        return True
    try:
        asked = trace_of(part, output).asked()
    except MeasurementError:
        return False
    return bool(np.count_nonzero(asked > _OVERLOAD * rating.current) > 1)


def trace_of(part: Point, output: str) -> Trace:
    """The samples of one output in one stretch.

    Raises
    ------
    MeasurementError
        If voltage or current was not logged, or has no readings.
    """
    part = _of_samples(part)
    keys = [channel_key(quantity, output) for quantity in ("output_voltage", "output_current")]
    for key in keys:
        if not part.has(key):
            msg = f"{key} was not logged in the overload ({part.where}); log voltage and current of the output together"
            raise MeasurementError(msg)
    logged, current = (part.samples(key) for key in keys)
    rows = np.flatnonzero(np.isfinite(logged) & np.isfinite(current))
    if not rows.size:
        msg = f"no sample has both {keys[0]} and {keys[1]} ({part.where}); log them together"
        raise MeasurementError(msg)
    _see_to_size(part, keys, (logged[rows], current[rows]))
    rating, wiring = part.limits.ratings.outputs[output], part.limits.wiring("output", output)
    lead = wiring.resistance if wiring is not None else 0.0
    setting_key = channel_key("load_setting", output)
    setting = part.samples(setting_key)[rows] if part.has(setting_key) else None
    return Trace(
        part=part,
        output=output,
        rows=rows,
        voltage=logged[rows] + lead * current[rows],
        current=current[rows],
        time=_time(part, rows),
        setting=setting if setting is not None and np.isfinite(setting).any() else None,
        modes=_modes(part, output, rows),
        input=part.samples("input_voltage")[rows] if part.has("input_voltage") else None,
        rated_voltage=rating.voltage,
        rated_current=rating.current,
        lead=lead,
    )


def _see_to_size(part: Point, keys: Sequence[str], readings: tuple[Floats, Floats]) -> None:
    for key, values in zip(keys, readings, strict=True):
        largest = float(np.abs(values).max())
        if largest > _LARGEST:
            msg = f"{key} reads {largest:.3g} in the overload ({part.where}), which is no reading; see the logger"
            raise MeasurementError(msg)


def _of_samples(part: Point) -> Point:
    """The stretch without what is only doubted of the means of dwells: under overload nothing has to stay."""
    doubts = tuple(doubt for doubt in part.log.doubts if doubt.kind not in _OF_MEANS)
    return replace(part, log=replace(part.log, doubts=doubts))


def _time(part: Point, rows: NDArray[np.intp]) -> Floats | None:
    if not part.has("time"):
        return None
    time = part.samples("time")[rows]
    return time if np.isfinite(time).all() and (np.diff(time) >= 0).all() else None


def _modes(part: Point, output: str, rows: NDArray[np.intp]) -> NDArray[np.str_]:
    """The load's mode in each sample: logged, stated, or told by the unit of its setting."""
    told = part.limits.load_mode or _by_unit(part, output)
    for key in (channel_key("load_mode", output), "load_mode"):
        if key in part.log.samples:
            column = part.log.samples[key].iloc[part.dwell.first : part.dwell.stop].astype(object)
            texts: Sequence[object] = column.where(column.notna(), "").to_numpy()[rows].tolist()
            logged = [str(text).strip().upper() for text in texts]
            return np.array([text if text in ("CC", "CR", "CV", "CP") else told for text in logged])
    return np.full(rows.size, told)


def _by_unit(part: Point, output: str) -> str:
    key = channel_key("load_setting", output)
    for channel in part.log.channels:
        if channel.key == key and channel.unit_from != "assumed" and channel.unit in UNITS:
            return _MODES.get(UNITS[channel.unit].kind, "")
    return ""


def _stretch(part: Point, first: int, stop: int) -> Point:
    dwell = Dwell(first, stop, first, part.dwell.stage, part.dwell.table, "whole stretch", None)
    return Point(-1, dwell, part.log, part.limits, part.bench, part.columns)
