"""Type B: what the instruments and the wiring add to a mean reading.

The bound of an accuracy text is a = gain |x| + fixed parts, u = a / sqrt(3) (a rectangle), or a / k where it says k.
Of one channel in one range the gain part is the same error at every point, so that it cancels in a difference; the
rest, u^2 - u_gain^2, is independent from point to point.
"""

from __future__ import annotations

import math
from dataclasses import dataclass, field

from acceptance.errors import MeasurementError
from acceptance.limitfile.accuracy import Accuracy
from acceptance.limitfile.limits import Limits, Meter, ShuntResistor, Wiring
from acceptance.points.propagation import Source, Value, of_source

__all__ = ["Bench", "converter_step_uncertainty", "rectangular"]

RECTANGLE = math.sqrt(3.0)
OVER_RANGE = 1.25  # common practice, no source: meters read some way beyond the range they are named by


def rectangular(bound: float) -> float:
    """Standard uncertainty of an error known only to lie within ± bound (JCGM 100:2008, 4.3.7)."""
    return bound / RECTANGLE


def converter_step_uncertainty(step: float) -> float:
    """Standard uncertainty of rounding to a step (JCGM 100:2008, F.2.2.1)."""
    return step / math.sqrt(12.0)


@dataclass(frozen=True, slots=True)
class GainAndRest:
    """The uncertainty of one reading by an accuracy text, in the unit of the reading."""

    gain: float
    rest: float


def split(accuracy: Accuracy, reading: float, *, meter_range: float, resolution: float) -> GainAndRest:
    """The part of a reading's uncertainty that is proportional to it, and the rest."""
    divisor = accuracy.coverage or RECTANGLE
    gain = accuracy.gain * abs(reading) / divisor
    fixed = (accuracy.of_range * meter_range + accuracy.fixed + accuracy.digits * resolution) / divisor
    # bounds add, so the whole is gain + fixed, and what is not shared is what squares leave of it
    return GainAndRest(gain, math.sqrt(fixed * fixed + 2 * gain * fixed))


@dataclass(frozen=True, slots=True)
class Error:
    """One error of a reading."""

    source: Source
    u: float  # standard uncertainty it brings to the reading, in the reading's unit
    share: str = ""  # what it is shared by; "" for an error of this reading alone
    per_unit: float = 0.0  # of a shared one: reading's error = sensitivity x variable of this standard uncertainty


@dataclass(frozen=True, slots=True)
class Bench:
    """The bench as a source of errors: asked twice for what is shared, it gives the same error twice."""

    limits: Limits
    _shared: dict[str, Value] = field(default_factory=dict)

    def is_stated(self, key: str) -> bool:
        """Whether the accuracy of a channel is stated."""
        meter = self.limits.meter(key)
        return meter is not None and meter.is_stated

    def correct(self, key: str, reading: float) -> Value:
        """The reading with the errors of its instrument; a plain number where nothing is stated about it.

        Raises
        ------
        MeasurementError
            If the reading lies outside the range that is stated for the instrument.
        """
        self._see_to_range(key, reading)
        value: Value = reading
        for error in self._errors(key, reading):
            if not error.share:
                value = value + of_source(error.u, error.source)
            elif error.per_unit > 0:
                # the sign of the reading matters: a gain error makes a negative reading more negative
                sensitivity = math.copysign(error.u / error.per_unit, reading)
                value = value + sensitivity * self._share(error.share, error.source, error.per_unit)
        return value

    def stated_step(self, key: str) -> float:
        """The step that is stated for a channel's display or converter, in the reading's unit; 0 where none is."""
        meter = self.limits.meter(key)
        if meter is None:
            return 0.0
        scale = 1.0 / meter.shunt.resistance if meter.shunt is not None else 1.0
        converter = scale * meter.converter.step if meter.converter is not None else 0.0
        return max(converter, meter.resolution or 0.0)

    def stated(self, key: str, value: float) -> Value:
        """A value that is only stated, with the errors of what measured it: the same ones wherever it enters."""
        name = f"stated {key}"
        if name not in self._shared:
            self._shared[name] = self.correct(key, value)
        return self._shared[name]

    def _see_to_range(self, key: str, reading: float) -> None:
        meter = self.limits.meter(key)
        if meter is None:
            return
        span = meter.meter_range
        if isinstance(span, float) and abs(reading) > OVER_RANGE * span:
            msg = f"{key} reads {reading:.5g}, and the range stated for {meter.device} is {span:g}; see meter_range:"
            raise MeasurementError(msg)
        if meter.converter is not None:
            at_input = reading * meter.shunt.resistance if meter.shunt is not None else reading
            slack = 0.001 * (meter.converter.high - meter.converter.low)
            if not meter.converter.low - slack <= at_input <= meter.converter.high + slack:
                msg = (
                    f"{key} reads {reading:.5g}, which is {at_input:.4g} V at the converter of {meter.device}, "
                    f"and its span is {meter.converter.low:g} V to {meter.converter.high:g} V; see adc:"
                )
                raise MeasurementError(msg)

    def standard_uncertainty(self, key: str, reading: float) -> float:
        """What the instrument adds to a reading, all its errors together."""
        return math.sqrt(sum(error.u**2 for error in self._errors(key, reading)))

    def lead(self, side: str, output: str, wiring: Wiring) -> Value:
        """Resistance of the leads, the same error wherever it enters. [ohm]"""
        name = f"{side} {output}".strip()
        u = rectangular(wiring.bound or 0.0)
        return wiring.resistance + self._share(f"lead {name}", Source(f"lead resistance, {name}", "B"), u)

    def _errors(self, key: str, reading: float) -> list[Error]:
        meter = self.limits.meter(key)
        if meter is None or not meter.is_stated:
            return []
        name = f"{key}, {meter.device}"
        errors = [Error(Source(f"{name}: converter and fixed parts", "B"), _fixed(meter))]
        if meter.accuracy is not None:
            errors += _by_accuracy(meter, meter.accuracy, name, reading, share=f"gain {key}")
        if meter.shunt is not None:
            errors += _by_shunt(meter.shunt, name, reading, share=f"shunt {key}")
        return errors

    def _share(self, name: str, source: Source, u: float) -> Value:
        if name not in self._shared:
            self._shared[name] = of_source(u, source)
        return self._shared[name]


def _by_accuracy(meter: Meter, accuracy: Accuracy, name: str, reading: float, *, share: str) -> list[Error]:
    span = meter.meter_range
    parts = split(
        accuracy,
        reading,
        meter_range=span if isinstance(span, float) else 0.0,
        resolution=meter.resolution or 0.0,
    )
    rest, gain = Source(f"{name}: fixed part", "B"), Source(f"{name}: gain", "B")
    if span == "auto":  # the range may change between points, so nothing is shared
        return [Error(rest, parts.rest), Error(gain, parts.gain)]
    relative = accuracy.gain / (accuracy.coverage or RECTANGLE)
    return [Error(rest, parts.rest), Error(gain, parts.gain, share, relative)]


def _by_shunt(shunt: ShuntResistor, name: str, reading: float, *, share: str) -> list[Error]:
    tolerance = rectangular(shunt.tolerance)
    coefficient = rectangular(shunt.temperature_coefficient)
    # dR/R = coefficient x thermal resistance x I^2 R
    heating = shunt.heating * reading * reading * shunt.resistance
    return [
        Error(Source(f"{name}: shunt tolerance", "B"), abs(reading) * tolerance, f"{share} tolerance", tolerance),
        Error(
            Source(f"{name}: shunt self-heating", "B"),
            abs(reading) * heating * coefficient,
            f"{share} temperature",
            coefficient,
        ),
    ]


def _fixed(meter: Meter) -> float:
    """Converter offset and step, and the display's step where the accuracy text does not count digits."""
    squares = 0.0
    if meter.converter is not None:
        scale = 1.0 / meter.shunt.resistance if meter.shunt is not None else 1.0
        squares += (scale * rectangular(meter.converter.offset)) ** 2
        squares += (scale * converter_step_uncertainty(meter.converter.step)) ** 2
    if meter.resolution is not None and not (meter.accuracy is not None and meter.accuracy.digits):
        squares += converter_step_uncertainty(meter.resolution) ** 2
    return math.sqrt(squares)
