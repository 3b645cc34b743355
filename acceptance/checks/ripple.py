"""Ripple: the largest of the readings in the log."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np

from acceptance.bench.log import channel_key
from acceptance.checks.conditions import (
    Condition,
    condition_channels,
    condition_of,
    describe,
    matching,
    missing_dwell,
    not_taken_in,
    output_of,
    untold,
)
from acceptance.checks.outcome import Candidate, CheckResult, Outcome, Used
from acceptance.errors import MeasurementError
from acceptance.limitfile.model import Ripple
from acceptance.points.point import Estimate, Point, Points

__all__ = ["check_ripple"]


def check_ripple(requirements: Sequence[Ripple], points: Points) -> CheckResult:
    """Outcomes of the ripple requirements, from readings of an oscilloscope or a ripple meter in the log."""
    return CheckResult.of([_outcome(requirement, points) for requirement in requirements])


def _outcome(requirement: Ripple, points: Points) -> Outcome:
    output = output_of(requirement, points.limits)
    outputs = (output,) if requirement.output else points.limits.outputs
    condition = condition_of(requirement.at, points.limits, outputs)
    key = channel_key("ripple", output)
    found = matching(points, condition)
    reason = "" if found else missing_dwell(points, condition)
    if key not in points.log.samples:
        reason = f"{key} was not logged; record the readings of an oscilloscope in a column of the log"
        found = []
    bandwidth = f", {requirement.bandwidth / 1e6:g} MHz" if requirement.bandwidth else ""
    return Outcome(
        name=requirement.name or "",
        characteristic="ripple",
        condition=f"{condition}, {requirement.kind}{bandwidth}",
        unit="V",
        high=requirement.max,
        candidates=(
            *(_candidate(point, key, condition, requirement.max) for point in found),
            *(untold(points, condition) if key in points.log.samples else ()),
        ),
        reason=reason,
        output=output,
        note=requirement.note or "",
        formula="the largest reading",
        deviations=(
            *not_taken_in(points, condition),
            f"kind ({requirement.kind}) and bandwidth are those of the limits file; the log does not show them",
        ),
    )


def _candidate(point: Point, key: str, condition: Condition, limit: float) -> Candidate:
    used = (Used(point, describe(point)),)
    try:
        point.require(key, *condition_channels(condition))
        samples = point.samples(key)
        if not np.isfinite(samples).any():
            msg = f"{key} has no reading ({point.where})"
            raise MeasurementError(msg)
        largest = float(np.nanmax(samples))
        if largest < 0:
            msg = f"{key} reads {largest:.4g} V, below zero ({point.where})"
            raise MeasurementError(msg)
        _see_to_settling(point, key, largest=largest, limit=limit)
        unstated = frozenset() if point.bench.is_stated(key) else frozenset({key})
        # of a largest reading there is no mean, so nothing of type A; what the scope may be wrong by is all
        value = point.bench.correct(key, largest) + point.rounding(key, 0.0)
        return Candidate(used, Estimate(value, unstated, single=True), at=describe(point))
    except MeasurementError as problem:
        return Candidate(used, reason=str(problem))


def _see_to_settling(point: Point, key: str, *, largest: float, limit: float) -> None:
    """See to it that no reading above the limit was left out as settling, with the load already set.

    Raises
    ------
    MeasurementError
        If one was, and the limits or bench file does not say how long settling takes.
    """
    if point.limits.settle is not None or largest > limit:
        return
    before = slice(point.dwell.begins, point.dwell.first)
    readings = point.columns[key][before]
    is_set = np.ones(readings.size, dtype=bool)
    for output, rating in point.limits.ratings.outputs.items():
        current = point.columns.get(channel_key("output_current", output))
        if current is not None:
            median = (point.median_load_fraction(output) or 0.0) * rating.current
            is_set &= np.abs(current[before] - median) <= 0.02 * rating.current
    above = readings[is_set & (readings > limit)]
    if above.size:
        msg = (
            f"a reading of {1000 * float(above.max()):.4g} mV lies above the limit in what was left out as settling "
            f"before {point.where}, with the load already set; state under log: settle: how long settling takes"
        )
        raise MeasurementError(msg)
