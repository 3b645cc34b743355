"""Steady points: the mean readings of each dwell, what they are worth, and what may be formed from them."""

from __future__ import annotations

import math
from collections.abc import Callable, Mapping, Sequence
from contextlib import suppress
from dataclasses import dataclass, field
from itertools import pairwise
from typing import Any, TypeVar

import numpy as np
from numpy.typing import NDArray

from acceptance.bench.log import QUANTITIES, BenchLog, channel_key
from acceptance.bench.threads import MANY, each
from acceptance.bench.values import Column
from acceptance.errors import MeasurementError
from acceptance.limitfile.limits import Limits, Wiring
from acceptance.points.dwells import Dwell
from acceptance.points.instrument import Bench, converter_step_uncertainty
from acceptance.points.lost import Lost, lost_stretches
from acceptance.points.propagation import Source, Value, coverage_factor, nominal, of_source
from acceptance.points.type_a import TypeA, type_a

__all__ = ["Estimate", "Point", "Points", "measure_points"]

RESOLUTION_COVERS = 1.5  # a logged step up to so many times the stated one is the stated one, differently rounded
_NO_LOAD = 0.002  # of rated current
OF_SAMPLES = ("mean", "median", "extent", "plain mean")  # what is kept, and depends on the samples alone

Floats = NDArray[np.float64]
T = TypeVar("T")


@dataclass(frozen=True, slots=True)
class Estimate:
    """A value, and which of the channels it was formed from have no stated accuracy."""

    value: Value
    unstated: frozenset[str] = frozenset()
    single: bool = False  # formed from one reading alone, so that nothing of type A is in it

    @property
    def nominal(self) -> float:
        """The best estimate."""
        return nominal(self.value)

    @staticmethod
    def of(value: Value, *parts: Estimate) -> Estimate:
        """A value formed from others."""
        unstated = frozenset[str]().union(*(part.unstated for part in parts))
        return Estimate(value, unstated, any(part.single for part in parts))


@dataclass(frozen=True, slots=True)
class Power:
    """Power sample by sample, and its mean with the errors of the instruments alone."""

    samples: Floats  # shape (n,) [W]
    mean: Value  # [W]
    unstated: frozenset[str]


@dataclass(frozen=True, slots=True, eq=False)  # a point is itself, not what it looks like
class Point:
    """One dwell, and whatever is asked of it; what is formed is kept, so that two askers share its errors."""

    index: int
    dwell: Dwell
    log: BenchLog
    limits: Limits
    bench: Bench
    columns: Mapping[str, Column]  # the log's channels as arrays, shared by all points
    _kept: dict[tuple[str, ...], Any] = field(default_factory=dict)

    # --- samples ----------------------------------------------------------------------------------------------------

    def has(self, key: str) -> bool:
        """Whether a channel was logged."""
        return key in self.columns

    def samples(self, key: str) -> Floats:
        """The samples of a channel in this dwell, missing ones as NaN."""
        return self.columns[key][self.dwell.first : self.dwell.stop]

    def extent(self, key: str) -> tuple[float, float, int]:
        """The smallest and the largest reading of a channel, and how many there are; none, and the larger is first."""
        return self._keep(("extent", key), lambda: _extent(self.samples(key)))

    def plain_mean(self, key: str) -> float | None:
        """The mean of the readings of a channel, however few there are; None where there is none."""
        return self._keep(("plain mean", key), lambda: _plain_mean(self.samples(key)))

    def look_at(self, key: str) -> None:
        """Form what is asked of almost every channel, in one look at its samples."""
        samples = self.samples(key)
        if samples.size and np.isfinite(samples).all():
            whole = type_a(samples)
            self._kept[("extent", key)] = float(samples.min()), float(samples.max()), samples.size
            self._kept[("plain mean", key)], self._kept[("mean", key)] = whole.mean, whole
            return
        self._kept[("extent", key)] = _extent(samples)
        self._kept[("plain mean", key)] = _plain_mean(samples)
        with suppress(MeasurementError):
            self.mean(key)

    def require(self, *keys: str) -> None:
        """See to it that channels may be judged here.

        Raises
        ------
        MeasurementError
            With the reason and the remedy, where a doubt about the data bars one of them.
        """
        span = (self.dwell.first, self.dwell.stop)
        for doubt in self.log.doubts:
            concerned = not doubt.channels or any(key in doubt.channels for key in keys)
            here = not doubt.spans or any(a < span[1] and b > span[0] for a, b in doubt.spans)
            if doubt.bars and concerned and here:
                remedy = f"; {doubt.remedy}" if doubt.remedy else ""
                msg = f"{doubt.text}{remedy}"
                raise MeasurementError(msg)

    @property
    def where(self) -> str:
        """File and lines, for people."""
        table, first, last = self.log.rows_of((self.dwell.first, self.dwell.stop))
        return f"{table}, line {first}" if first == last else f"{table}, lines {first} to {last}"

    @property
    def readings(self) -> int:
        """Samples in the dwell."""
        return self.dwell.stop - self.dwell.first

    def starts(self) -> tuple[float | None, float | None]:
        """Time of the first sample within its table, and the time from it to the last. [s]"""
        if not self.has("time"):
            return None, None
        time = self.samples("time")
        if not np.isfinite(time[[0, -1]]).all():
            return None, None
        return float(time[0]), float(time[-1] - time[0])

    # --- mean readings ----------------------------------------------------------------------------------------------

    def mean(self, key: str) -> TypeA:
        """Mean of a channel as logged, barred or not, with what its spread tells."""
        return self._keep(("mean", key), lambda: type_a(self._finite(key)))

    def reading(self, key: str) -> Estimate:
        """Mean of a channel as logged, with the errors of its instrument and of its spread; never of a barred one."""
        self.require(key)
        return self._keep(("reading", key), lambda: self._reading(key))

    def voltage(self, output: str) -> Estimate:
        """Voltage at an output's terminals: the drop in the leads put back. [V]"""
        return self._keep(("voltage", output), lambda: self._voltage(output))

    def current(self, output: str) -> Estimate:
        """Current of an output. [A]"""
        return self.reading(channel_key("output_current", output))

    def load_fraction(self, output: str) -> float | None:
        """Measured current over rated current; None where it was not logged."""
        key = channel_key("output_current", output)
        if not self.has(key):
            return None
        try:
            mean = self.mean(key)
        except MeasurementError:  # no reading, or none over most of the dwell
            return None
        return mean.mean / self.limits.ratings.outputs[output].current

    def median_load_fraction(self, output: str) -> float | None:
        """Median of the measured current over rated current; None where it was not logged."""
        if self.load_fraction(output) is None:
            return None
        key = channel_key("output_current", output)
        median = self._keep(("median", key), lambda: float(np.nanmedian(self.samples(key))))
        return median / self.limits.ratings.outputs[output].current

    def is_unloaded(self, output: str) -> bool:
        """Whether an output's |I| is below its own uncertainty or 0.2 % of rated current, whichever is larger."""
        fraction = self.load_fraction(output)
        if fraction is None:
            return False
        key = channel_key("output_current", output)
        mean = self.mean(key)
        u = math.hypot(self.bench.standard_uncertainty(key, mean.mean), mean.standard_uncertainty or 0.0)
        error = coverage_factor(self.limits.decision.confidence, math.inf) * u
        bound = max(error / self.limits.ratings.outputs[output].current, _NO_LOAD)
        return abs(fraction) <= bound + 1e-12

    def input_voltage(self) -> float | None:
        """Mean input voltage at the unit, or the one that is only stated; None where neither is there. [V]"""
        return self._keep(("input voltage",), self._input_voltage)

    def _input_voltage(self) -> float | None:
        if self.has("input_voltage"):
            mean = self.plain_mean("input_voltage")
            if mean is None:
                return None
            wiring, key = self.limits.wiring("input"), "input_current"
            drop = wiring.resistance * self.mean(key).mean if wiring is not None and self.has(key) else 0.0
            return mean - drop
        return self.log.stated.get("input_voltage")

    # --- powers -----------------------------------------------------------------------------------------------------

    def input_power(self) -> Estimate:
        """Mean power drawn by the unit. [W]"""
        return self._keep(("input power",), self._mean_input_power)

    def efficiency(self, outputs: Sequence[str]) -> Estimate:
        """Output power over input power, sample by sample, with everything that both share. [1]

        Raises
        ------
        MeasurementError
            If a channel is missing or may not be judged, or if no power flows.

        Notes
        -----
        eta = mean(sum V I) / mean(P). The errors of the instruments act on eta through the means; the spread acts
        through the residuals e_t = (p_out,t - eta p_in,t) / mean(p_in), so that a load that wanders, and that both
        powers follow, costs nothing.
        """
        return self._keep(("efficiency", *outputs), lambda: self._efficiency(outputs))

    def _efficiency(self, outputs: Sequence[str]) -> Estimate:
        if all(self.is_unloaded(output) for output in outputs):
            msg = f"nothing was connected to the outputs, so that there is no efficiency ({self.where})"
            raise MeasurementError(msg)
        rows = self._complete([*self._input_keys(), *(k for o in outputs for k in self._output_keys(o))])
        source = self._input_power(rows)
        sinks = [self._output_power(output, rows) for output in outputs]
        p_in, p_out = source.samples, np.sum([sink.samples for sink in sinks], axis=0)
        if not p_in.mean() > 0:
            msg = f"the mean input power is {p_in.mean():.4g} W, not above zero ({self.where})"
            raise MeasurementError(msg)
        if not p_out.mean() > 0:
            msg = f"no output power flows ({self.where})"
            raise MeasurementError(msg)
        eta = float(p_out.mean() / p_in.mean())
        spread = type_a((p_out - eta * p_in) / p_in.mean())
        value = sum((sink.mean for sink in sinks), start=0.0) / source.mean
        value = value + self._spread(f"spread of the efficiency, dwell {self.index + 1}", spread)
        unstated = source.unstated.union(*(sink.unstated for sink in sinks))
        return Estimate(value, unstated, single=spread.readings == 1)

    def _mean_input_power(self) -> Estimate:
        rows = self._complete(self._input_keys())
        power = self._input_power(rows)
        spread = type_a(power.samples)
        value = power.mean + self._spread(f"spread of the input power, dwell {self.index + 1}", spread)
        return Estimate(value, power.unstated, single=spread.readings == 1)

    def _input_keys(self) -> list[str]:
        """Channels that the input power is formed from.

        Raises
        ------
        MeasurementError
            If what was logged gives no power, such as volts and amperes of an a.c. input alone.
        """
        leads = ["input_current"] if self.limits.wiring("input") is not None else []
        if self.has("input_power"):
            return ["input_power", *leads]
        factors = ["input_voltage", "input_current"]
        if self.limits.ratings.input.supply == "ac":
            factors.append("power_factor")
        missing = [key for key in factors if not self.has(key) and key not in self.log.stated]
        if not missing:
            return factors
        if missing == ["power_factor"]:
            msg = (
                "an a.c. input with volts and amperes but no power and no power factor; "
                "record the input power with a wattmeter, or the power factor"
            )
            raise MeasurementError(msg)
        msg = f"no input power was logged, and {_words(missing)} neither; record the input power"
        raise MeasurementError(msg)

    def _output_keys(self, output: str) -> list[str]:
        return [channel_key("output_voltage", output), channel_key("output_current", output)]

    def _input_power(self, rows: NDArray[np.bool_]) -> Power:
        keys = self._input_keys()
        if keys[0] == "input_power":
            samples = self._at(keys[0], rows)
            power = Power(samples, self._corrected(keys[0], float(samples.mean())), self._unstated(keys[:1]))
        else:
            power = self._product(keys, rows)
        return self._without_input_leads(power, rows)

    def _without_input_leads(self, power: Power, rows: NDArray[np.bool_]) -> Power:
        """The power less what the input leads burn, where the input was not sensed at the unit."""
        wiring = self.limits.wiring("input")
        if wiring is None:
            return power
        lost, unstated = self._lead_power("input", "", wiring, rows=rows)
        squares = self._at("input_current", rows) ** 2
        return Power(power.samples - wiring.resistance * squares, power.mean - lost, power.unstated | unstated)

    def _output_power(self, output: str, rows: NDArray[np.bool_]) -> Power:
        """Power at an output's terminals, what the leads drop put back: (V + I R) I."""
        voltage, current = self._output_keys(output)
        power = self._product([voltage, current], rows)
        wiring = self.limits.wiring("output", output)
        if wiring is None:
            return power
        gained, unstated = self._lead_power("output", output, wiring, rows=rows)
        squares = self._at(current, rows) ** 2
        return Power(power.samples + wiring.resistance * squares, power.mean + gained, power.unstated | unstated)

    def _lead_power(
        self, side: str, output: str, wiring: Wiring, *, rows: NDArray[np.bool_]
    ) -> tuple[Value, frozenset[str]]:
        """Power burnt in leads, R mean(I^2), with the errors of both, and what of them is not stated. [W]"""
        key = channel_key(f"{side}_current", output)
        current = self._at(key, rows)
        mean = float(current.mean())
        square = float((current * current).mean()) + 2 * mean * (self._corrected(key, mean) - mean)
        unstated = self._unstated([key])
        if wiring.bound is None:
            unstated |= {_lead(output, self.limits) if output else "lead_resistance input"}
        return self.bench.lead(side, output, wiring) * square, unstated

    def _product(self, keys: Sequence[str], rows: NDArray[np.bool_]) -> Power:
        """Power as a product of channels, sample by sample.

        The errors of the instruments act on the mean through the derivatives: mean I for the error of V, and so on.
        """
        columns = [self._at(key, rows) for key in keys]
        samples = np.prod(columns, axis=0)
        means = [float(column.mean()) for column in columns]
        mean: Value = float(samples.mean())
        for at, (key, value) in enumerate(zip(keys, means, strict=True)):
            slope = math.prod(means[:at] + means[at + 1 :])
            mean = mean + slope * (self._corrected(key, value) - value)
        return Power(samples, mean, self._unstated(keys))

    # --- helpers ----------------------------------------------------------------------------------------------------

    def _reading(self, key: str) -> Estimate:
        spread = self.mean(key)
        value = self._corrected(key, spread.mean) + self._spread(f"spread of {key}, dwell {self.index + 1}", spread)
        return Estimate(value, self._unstated([key]), single=spread.readings == 1)

    def _voltage(self, output: str) -> Estimate:
        voltage = self.reading(channel_key("output_voltage", output))
        wiring = self.limits.wiring("output", output)
        if wiring is None:
            return voltage
        current = self.current(output)
        value = voltage.value + current.value * self.bench.lead("output", output, wiring)
        # the current only enters through a small drop, but its accuracy must be known like any other
        unstated = frozenset() if wiring.bound is not None else frozenset({_lead(output, self.limits)})
        return Estimate.of(value, voltage, current, Estimate(0.0, unstated))

    def _corrected(self, key: str, mean: float) -> Value:
        """A mean with the errors of its instrument, the same errors for whatever is formed from this channel here."""
        if not self.has(key):  # only stated: one value, so one error at every point
            return self.bench.stated(key, mean)
        return mean + self._keep(("error", key), lambda: self._error(key))

    def _error(self, key: str) -> Value:
        """The error of a channel's mean here: the instrument's, and that of the digits it was logged with."""
        mean = self.mean(key)
        error = self.bench.correct(key, mean.mean) - mean.mean
        return error + self.rounding(key, mean.deviation or 0.0)

    def rounding(self, key: str, deviation: float) -> Value:
        """The error of rounding to the digits of the log, where the spread is too small to average it out.

        Only what the instrument's own steps, as stated, do not cover.
        """
        step = max((channel.step for channel in self.log.channels if channel.key == key), default=0.0)
        if step <= RESOLUTION_COVERS * self.bench.stated_step(key) or deviation > 0.5 * step:
            return 0.0
        return of_source(converter_step_uncertainty(step), Source(f"{key}: digits of the log", "B"))

    def _spread(self, name: str, spread: TypeA) -> Value:
        return of_source(spread.standard_uncertainty or 0.0, Source(name, "A", spread.degrees_of_freedom))

    def _unstated(self, keys: Sequence[str]) -> frozenset[str]:
        return frozenset(key for key in keys if not self.bench.is_stated(key))

    def _finite(self, key: str) -> Floats:
        if not self.has(key):
            msg = f"{key} was not logged"
            raise MeasurementError(msg)
        samples = self.samples(key)
        known = np.isfinite(samples)
        if known.all() and samples.size:
            return samples
        finite = samples[known]
        self._enough(known, key)
        if not finite.size:
            msg = f"{key} has no reading ({self.where})"
            raise MeasurementError(msg)
        return finite

    def _complete(self, keys: Sequence[str]) -> NDArray[np.bool_]:
        """Which samples have all channels; those only stated are the same in every sample."""
        self.require(*keys)
        rows = np.ones(self.readings, dtype=bool)
        for key in keys:
            if self.has(key):
                rows &= np.isfinite(self.samples(key))
            elif key not in self.log.stated:
                msg = f"{key} was not logged"
                raise MeasurementError(msg)
        if not rows.any():
            msg = f"no sample has all of {_words(keys)} ({self.where})"
            raise MeasurementError(msg)
        self._enough(rows, _words(keys))
        return rows

    def _enough(self, known: NDArray[np.bool_], what: str) -> None:
        """See to it that no half of the dwell is without a reading; a channel read every n-th sample is enough.

        Raises
        ------
        MeasurementError
            If readings are missing from more than half of the dwell at a stretch.
        """
        told = np.flatnonzero(np.concatenate(([True], known, [True])))
        if known.any() and int(np.diff(told).max()) - 1 > known.size / 2:
            msg = f"{what}: no reading over more than half of the dwell ({self.where}); record it again"
            raise MeasurementError(msg)

    def _at(self, key: str, rows: NDArray[np.bool_]) -> Floats:
        if self.has(key):
            samples = self.samples(key)
            return samples if rows.all() else samples[rows]
        return np.full(int(rows.sum()), self.log.stated[key])

    def _keep(self, name: tuple[str, ...], form: Callable[[], T]) -> T:
        if name not in self._kept:
            self._kept[name] = form()
        kept: T = self._kept[name]
        return kept


@dataclass(frozen=True, slots=True)
class Points:
    """All points of one unit, in the order of the log."""

    all: tuple[Point, ...]
    log: BenchLog
    limits: Limits
    bench: Bench
    lost: tuple[Lost, ...] = ()  # of the steady test, and in no point

    @property
    def steady(self) -> tuple[Point, ...]:
        """Those of the steady test."""
        return tuple(point for point in self.all if point.dwell.stage == "steady")

    def stretches(self, stage: str) -> tuple[Point, ...]:
        """Each whole stretch of one stage, settled or not: where samples are looked at, not their means.

        A stretch never spans two tables. Its index is that of no dwell.
        """
        here = self.log.is_stage(stage)
        if not here.any():
            return ()
        table = self.log.samples["table"].to_numpy()
        columns = next((point.columns for point in self.all), None) or numeric_columns(self.log)
        edges = np.flatnonzero(np.diff(here.astype(np.int8), prepend=0, append=0))
        found = []
        for first, stop in zip(edges[::2].tolist(), edges[1::2].tolist(), strict=True):
            cuts = (np.flatnonzero(np.diff(table[first:stop])) + first + 1).tolist()
            for a, b in pairwise([first, *cuts, stop]):
                dwell = Dwell(a, b, a, stage, int(table[a]), "whole stretch", None)
                found.append(Point(-1, dwell, self.log, self.limits, self.bench, columns))
        return tuple(found)


def numeric_columns(log: BenchLog) -> dict[str, Column]:
    """The channels of a log as arrays, without a copy where the log holds them so, and packed ones as they are."""
    return {key: log.column(key) for key in log.samples.columns if log.samples[key].dtype.kind in "fiu"}


def measure_points(log: BenchLog, dwells: Sequence[Dwell], limits: Limits, *, before: Points | None = None) -> Points:
    """The points of a log's dwells.

    Parameters
    ----------
    before
        Those of the same samples and dwells, with other doubts: what was formed of the samples alone is taken over.
    """
    bench = Bench(limits)
    columns = numeric_columns(log)
    points = tuple(Point(index, dwell, log, limits, bench, columns) for index, dwell in enumerate(dwells))
    for point, old in zip(points, before.all if before is not None else (), strict=False):
        point._kept.update({name: kept for name, kept in old._kept.items() if name[0] in OF_SAMPLES})
    if before is None:
        _form_means(points, log)
    rated = {output: rating.current for output, rating in limits.ratings.outputs.items()}
    return Points(points, log, limits, bench, lost_stretches(log, dwells, rated))


def _form_means(points: Sequence[Point], log: BenchLog) -> None:
    """Form the means that the record will ask for, of a very long log several at once."""
    keys = list(dict.fromkeys(c.key for c in log.channels if c.quantity != "time" and QUANTITIES[c.quantity] != "text"))
    if len(log.samples) < MANY:
        return

    asked = [(point, key) for point in points for key in keys if point.has(key)]
    each(lambda one: one[0].look_at(one[1]), asked, samples=len(log.samples))


def _extent(samples: Floats) -> tuple[float, float, int]:
    known = samples[np.isfinite(samples)]
    return (float(known.min()), float(known.max()), known.size) if known.size else (math.inf, -math.inf, 0)


def _plain_mean(samples: Floats) -> float | None:
    return float(np.nanmean(samples)) if np.isfinite(samples).any() else None


def _words(keys: Sequence[str]) -> str:
    return " and ".join(keys)


def _lead(output: str, limits: Limits) -> str:
    name = f"output {output}"
    return f"lead_resistance {name if name in limits.leads else 'output'}"
