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
    output_of,
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
        candidates=tuple(_candidate(point, key, condition) for point in found),
        reason=reason,
        output=output,
        note=requirement.note or "",
        formula="the largest reading",
        deviations=(
            f"kind ({requirement.kind}) and bandwidth are those of the limits file; the log does not show them",
        ),
    )


def _candidate(point: Point, key: str, condition: Condition) -> Candidate:
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
        unstated = frozenset() if point.bench.is_stated(key) else frozenset({key})
        # of a largest reading there is no mean, so nothing of type A; what the scope may be wrong by is all
        return Candidate(used, Estimate(point.bench.correct(key, largest), unstated, single=True))
    except MeasurementError as problem:
        return Candidate(used, reason=str(problem))
