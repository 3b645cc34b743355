"""What keeps an overload's readings from being believed: meters that clip, stand still, or contradict the load."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
from numpy.typing import NDArray

from acceptance.errors import MeasurementError
from acceptance.overload.steps import HELD, STEADY, Step, is_by_hand, noise_of, nothing_given
from acceptance.overload.trace import Trace, scatter

__all__ = ["see_to_the_meters"]

Floats = NDArray[np.float64]

_LEVELS = 3  # settings, over which a voltage that is to move has moved
_CLIPPED = 5  # settings, over which no limiter keeps its current to the last of fine digits
_FALLS = 0.3  # of rated voltage: what the voltage falls by meanwhile
_TIED = 5  # samples at the largest reading, among which a noisy one has few
_FINE = 0.002  # of the reading: digits so coarse may well stand still
_MOVES = 0.05  # of the rating: what the other reading changes by meanwhile
_RANGE = 0.98  # of a meter's range
_WELL_INSIDE = 0.9  # of a stated range: what stands still here does so at no end of it
_DISAGREES = 0.1  # of the current that a resistance and the voltage across it make


def see_to_the_meters(trace: Trace, steps: Sequence[Step]) -> None:
    """See to it that voltage and current were measured throughout the overload.

    Raises
    ------
    MeasurementError
        With the reason and the remedy, where one of them surely, or most likely, was not.
    """
    trace.part.require(trace.voltage_key, trace.current_key)
    settled = [step for step in steps if step.kind != HELD]
    _negative(trace)
    _clipped(trace, settled)
    _frozen(trace, settled)
    _contradicted(trace, settled)


def _negative(trace: Trace) -> None:
    for key, values, rated in (
        (trace.voltage_key, trace.voltage, trace.rated_voltage),
        (trace.current_key, trace.current, trace.rated_current),
    ):
        lowest, typical = float(values.min()), float(np.median(values))
        if typical < -0.01 * rated or lowest < -0.2 * rated:
            msg = (
                f"{key} reads {lowest:.4g} in the overload ({trace.part.where}): below zero; connect the meter, or "
                "turn the sign of the column, so that what the unit delivers is positive"
            )
            raise MeasurementError(msg)


def _clipped(trace: Trace, steps: Sequence[Step]) -> None:
    """A current that stands at its largest reading while the voltage falls: the end of a range, not a limiter."""
    top = float(trace.current.max())
    if _at_the_end(trace, top):
        msg = (
            f"{trace.current_key} reads up to {top:.5g} A ({trace.part.where}), where its range ends; measure again in "
            "a higher range"
        )
        raise MeasurementError(msg)
    at_top = [step for step in steps if _stands(trace.current, step, top)]
    falls = np.ptp([step.voltage for step in at_top]) if at_top else 0.0
    if _is_cut_off(trace, top):
        msg = (
            f"{trace.current_key} stands at its largest reading {top:.5g} A again and again ({trace.part.where}), "
            "while it varies elsewhere: the end of a range; measure again in a higher range"
        )
        raise MeasurementError(msg)
    if all(step.mode == "CR" and step.setting > 0 for step in at_top):
        return  # where the voltage across a known resistance tells the current too
    bursts = at_top and nothing_given(trace)[at_top[0].first : at_top[-1].stop].any()  # whose tops are alike
    if bursts or len(at_top) < _CLIPPED or top <= 0 or falls < _FALLS * trace.rated_voltage:
        return
    meter = trace.part.limits.meter(trace.current_key)
    span = meter.meter_range if meter is not None and isinstance(meter.meter_range, float) else np.inf
    if _step_of(trace, trace.current_key, trace.current) > _FINE * top and top < _RANGE * span:
        return
    if top < _WELL_INSIDE * span < np.inf:
        return
    msg = (
        f"{trace.current_key} stands at its largest reading {top:.5g} A over {len(at_top)} settings "
        f"({trace.place(at_top[0].first, at_top[-1].stop)}) while the voltage falls: the end of a range looks like "
        "that; state the meter's range under instruments: (meter_range), or measure again in a higher one"
    )
    raise MeasurementError(msg)


def _at_the_end(trace: Trace, top: float) -> bool:
    """Whether several readings stand where the stated range, or the converter, ends."""
    meter = trace.part.limits.meter(trace.current_key)
    if meter is None or np.count_nonzero(trace.current == top) < _LEVELS:
        return False
    if meter.converter is not None:
        scale = meter.shunt.resistance if meter.shunt is not None else 1.0
        return top * scale >= meter.converter.high - 2 * meter.converter.step
    return isinstance(meter.meter_range, float) and 0.999 <= top / meter.meter_range <= 1.001


def _is_cut_off(trace: Trace, top: float) -> bool:
    """Whether half of the readings about the largest one equal it, although readings on the branch scatter."""
    loaded = (trace.current > 0.3 * trace.rated_current) & (trace.voltage > 0.8 * trace.rated_voltage)
    loaded &= ~trace.overloaded()
    noise = noise_of(trace)[1]  # within the settings: their steps are none
    digits = _step_of(trace, trace.current_key, trace.current)
    if is_by_hand(trace) or np.count_nonzero(loaded) < _TIED or noise < digits or digits == 0:
        return False  # rows by hand differ by their settings, which is no noise
    near = np.count_nonzero(trace.current > top - 4 * noise)
    ties = np.count_nonzero(trace.current == top)
    return bool(ties >= _TIED and ties >= 0.5 * near)


def _stands(values: Floats, step: Step, at: float) -> bool:
    settled = values[step.first + step.samples // 2 : step.stop]
    return bool((settled == at).all())


def _frozen(trace: Trace, steps: Sequence[Step]) -> None:
    """A voltage that is the same to the last digit while the current moves over several settings."""
    logged = trace.voltage - trace.lead * trace.current
    digits = _step_of(trace, trace.voltage_key, logged)
    runs: list[Step] = []
    for step in [*steps, None]:
        if step is not None and _still(logged, step) and (not runs or _same(logged, runs[0], step)):
            runs.append(step)
            continue
        _see_to_run(trace, runs, logged, (digits, _noise_within(logged, steps)))
        runs = [step] if step is not None and _still(logged, step) else []


def _still(logged: Floats, step: Step) -> bool:
    part = logged[step.first + step.samples // 2 : step.stop]
    return bool(np.ptp(part) < 1e-9 * max(1e-12, abs(float(part[0]))))


def _same(logged: Floats, one: Step, other: Step) -> bool:
    a, b = float(logged[one.stop - 1]), float(logged[other.stop - 1])
    return abs(a - b) <= 1e-9 * max(abs(a), abs(b))


def _noise_within(logged: Floats, steps: Sequence[Step]) -> float:
    """Scatter within the settled steps, the largest of them; 0 where none has samples enough."""
    noises = [scatter(logged[s.first + s.samples // 2 : s.stop]) for s in steps if s.kind == STEADY and s.samples >= 8]
    return max(noises, default=0.0)


def _see_to_run(trace: Trace, runs: Sequence[Step], logged: Floats, resolved: tuple[float, float]) -> None:
    """See to it that settings without a change of voltage are no frozen meter's; resolved: digits and noise. [V]"""
    digits, noise = resolved
    if len(runs) < _LEVELS:
        return
    if abs(float(logged[runs[0].stop - 1])) < 0.01 * trace.rated_voltage:
        return  # shorted, or off
    level = float(logged[runs[0].stop - 1])
    moves = float(np.ptp([step.current for step in runs]))
    regulates = level > 0.95 * trace.rated_voltage
    still = 2 * _MOVES if regulates else _MOVES
    if moves < still * trace.rated_current:
        return
    if regulates and (digits > _FINE / 10 * level or (noise < digits and _is_alive(logged, runs, digits))):
        return
    msg = (
        f"{trace.voltage_key} stands at {level:.6g} V over {len(runs)} settings "
        f"({trace.place(runs[0].first, runs[-1].stop)}) while the current moves by {moves:.3g} A: frozen; look to the "
        "meter and its logger, and measure again"
    )
    raise MeasurementError(msg)


def _is_alive(logged: Floats, runs: Sequence[Step], digits: float) -> bool:
    """Whether the voltage moves later on: then a stiff output simply held it."""
    later = logged[runs[-1].stop :]
    level = logged[runs[0].stop - 1]
    return later.size > 0 and float(np.abs(later - level).max()) > 10 * digits


def _step_of(trace: Trace, key: str, values: Floats) -> float:
    """The last digit of a channel: as logged or stated, else the least difference between readings."""
    logged = max((channel.step for channel in trace.part.log.channels if channel.key == key), default=0.0)
    known = max(logged, trace.part.bench.stated_step(key))
    if known > 0:
        return known
    steps = np.diff(np.unique(values))
    steps = steps[steps > 1e-9 * max(1e-12, float(np.abs(values).max()))]
    return float(steps.min()) if steps.size else 0.0


def _contradicted(trace: Trace, steps: Sequence[Step]) -> None:
    """A current that is not what the voltage drives through the resistance that was set."""
    wrong: list[tuple[Step, tuple[float, float, float]]] = []
    for step in steps:
        if step.mode != "CR" or not step.setting > 0 or trace.load_off()[step.first : step.stop].any():
            continue
        voltage, current = _given(trace, step)
        through = voltage / (step.setting + trace.lead)
        # into a short the last digit of the voltage is amperes
        unsure = _unsure(trace, voltage) / (step.setting + trace.lead)
        if _disagree(trace, voltage, current - min(max(current - through, -unsure), unsure), through):
            wrong.append((step, (voltage, current, through)))
    sure = [one for one in wrong if one[0].samples >= _LEVELS]
    if len(wrong) < 2 and not sure:
        return
    step, (voltage, current, through) = (sure or wrong)[-1]
    msg = (
        f"{trace.current_key} reads {current:.4g} A at {voltage:.4g} V across {step.setting:.4g} ohm "
        f"({trace.place(step.first, step.stop)}), which take {through:.4g} A: a meter at the end of its range, or "
        "frozen, or a load that did not hold its setting; see to both, and record it again"
    )
    raise MeasurementError(msg)


def _unsure(trace: Trace, voltage: float) -> float:
    """What a voltage may be wrong by: twice its instrument's u, and half of its last digit. [V]"""
    u = trace.part.bench.standard_uncertainty(trace.voltage_key, voltage)
    return 2 * u + 0.5 * _step_of(trace, trace.voltage_key, trace.voltage)


def _given(trace: Trace, step: Step) -> tuple[float, float]:
    """Voltage and current of a step while the output gave something."""
    if step.kind == STEADY:
        return step.voltage, step.current
    on = np.flatnonzero(~nothing_given(trace)[step.first : step.stop]) + step.first
    # the first and the last sample of a burst are on their way
    inside = on[np.isin(on - 1, on) & np.isin(on + 1, on)]
    if not inside.size:
        return 0.0, 0.0
    return float(np.median(trace.voltage[inside])), float(np.median(trace.current[inside]))


def _disagree(trace: Trace, voltage: float, current: float, through: float) -> bool:
    """Whether a current cannot be: below a tenth of rated voltage, where loads end, only one that is far too large."""
    slack = _DISAGREES * through + 0.02 * trace.rated_current
    if voltage >= 0.1 * trace.rated_voltage:
        return abs(current - through) > slack
    return current > 2 * through + 0.2 * trace.rated_current
