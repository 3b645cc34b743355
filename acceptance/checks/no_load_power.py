"""No-load power: what the unit draws with nothing connected to its outputs."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import replace

import numpy as np

from acceptance.bench.log import channel_key
from acceptance.checks.conditions import (
    Condition,
    condition_channels,
    condition_of,
    describe,
    matching,
    missing_dwell,
    untold,
)
from acceptance.checks.outcome import Candidate, CheckResult, Outcome, Used
from acceptance.errors import MeasurementError
from acceptance.limitfile.model import NoLoadPower
from acceptance.points.point import Point, Points
from acceptance.printing import duration, quantity

__all__ = ["NO_LOAD_FORMULA", "check_no_load_power", "no_load_candidate", "unseen_outputs", "whole_stretches"]

NO_LOAD_FORMULA = "mean input power over the whole no-load stretch after settling"


def check_no_load_power(requirements: Sequence[NoLoadPower], points: Points) -> CheckResult:
    """Outcomes of the no-load power requirements: the mean over each whole no-load stretch, bursts and all."""
    return CheckResult.of([_outcome(requirement, points) for requirement in requirements])


def _outcome(requirement: NoLoadPower, points: Points) -> Outcome:
    limits = points.limits
    condition = condition_of(requirement.at, limits, limits.outputs, load=0.0)
    stretches = whole_stretches(matching(points, condition))
    return Outcome(
        name=requirement.name or "",
        characteristic="no_load_power",
        condition=str(condition),
        unit="W",
        high=requirement.max,
        candidates=(*(no_load_candidate(point, condition) for point in stretches), *untold(points, condition)),
        reason="" if stretches else missing_dwell(points, condition),
        output=requirement.output or "",
        note=requirement.note or "",
        formula=NO_LOAD_FORMULA,
        deviations=unseen_outputs(points),
    )


def unseen_outputs(points: Points) -> tuple[str, ...]:
    """What to say where the log does not show that the unit was on."""
    if all(channel_key("output_voltage", output) in points.log.samples for output in points.limits.outputs):
        return ()
    return ("no output voltage was logged: that the unit was on is not shown",)


def whole_stretches(found: Sequence[Point]) -> list[Point]:
    """The points, those that only a burst or a spike keeps apart joined to one."""
    joined: list[Point] = []
    for point in found:
        last = joined[-1] if joined else None
        if last is not None and _is_one_stretch(last, point):
            joined[-1] = replace(last, dwell=replace(last.dwell, stop=point.dwell.stop), _kept={})
        else:
            joined.append(point)
    return joined


def _is_one_stretch(first: Point, second: Point) -> bool:
    """Whether no load was drawn between two no-load points either."""
    a, b = first.dwell, second.dwell
    if a.table != b.table or a.stage != b.stage or b.first - a.stop > (a.stop - a.first) + (b.stop - b.first):
        return False
    for output, rating in first.limits.ratings.outputs.items():
        between = first.log.part(channel_key("output_current", output), a.stop, b.first)
        if not np.all(np.abs(between) <= 0.01 * rating.current):
            return False
    voltages = (first.input_voltage(), second.input_voltage())
    return None not in voltages and voltages[0] == voltages[1] or _close(*voltages)


def _close(first: float | None, second: float | None) -> bool:
    return first is not None and second is not None and abs(first - second) <= 0.005 * abs(first)


def no_load_candidate(point: Point, condition: Condition) -> Candidate:
    """The mean input power of one no-load stretch, or why it is none."""
    lasts = point.starts()[1]
    over = f"mean over {duration(lasts)}" if lasts else f"mean of {point.readings} readings"
    used = (Used(point, f"no load, {over}"),)
    try:
        point.require(*condition_channels(condition))
        _see_to_output(point)
        power = point.input_power()
        if not power.nominal > 0:
            reads = quantity(power.nominal, "W", digits=2)
            msg = (
                f"the mean no-load power reads {reads}, not above zero: the meter does not resolve it; "
                "use a lower range, or a meter that does"
            )
            raise MeasurementError(msg)
        return Candidate(used, power, at=f"{describe(point)}, {over}")
    except MeasurementError as problem:
        return Candidate(used, reason=str(problem))


def _see_to_output(point: Point) -> None:
    """See to it that the unit was on: one that is off, or has tripped, draws next to nothing and shows no standby.

    Raises
    ------
    MeasurementError
        If an output that was logged stands below half its rated voltage.
    """
    for output, rating in point.limits.ratings.outputs.items():
        key = channel_key("output_voltage", output)
        if point.has(key) and np.isfinite(point.samples(key)).any():
            point.require(key)
            voltage = point.mean(key).mean
            if voltage < 0.5 * rating.voltage:
                msg = (
                    f"output {output} stands at {voltage:.4g} V, under half its rated voltage: the unit is off or has "
                    f"tripped, and this is no no-load power ({point.where})"
                )
                raise MeasurementError(msg)
