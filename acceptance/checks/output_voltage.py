"""Output voltage: a band that every steady reading lies in."""

from __future__ import annotations

from collections.abc import Iterator, Sequence

import numpy as np
from numpy.typing import NDArray

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
from acceptance.checks.figures import voltage_figures
from acceptance.checks.outcome import Candidate, CheckResult, Outcome, Used
from acceptance.errors import MeasurementError
from acceptance.limitfile.model import OutputVoltage
from acceptance.points.point import Point, Points
from acceptance.record import LimitLine

__all__ = ["check_output_voltage"]


def check_output_voltage(requirements: Sequence[OutputVoltage], points: Points) -> CheckResult:
    """Outcomes of the output voltage requirements, and the voltage with its bands over load as figures."""
    outcomes = [_outcome(requirement, points) for requirement in requirements]
    outputs = dict.fromkeys(outcome.output for outcome in outcomes)
    bands = {output: _lines([o for o in outcomes if o.output == output]) for output in outputs}
    return CheckResult.of(outcomes, voltage_figures(list(outputs), points, bands=bands))


def _outcome(requirement: OutputVoltage, points: Points) -> Outcome:
    output = output_of(requirement, points.limits)
    outputs = (output,) if requirement.output else points.limits.outputs
    condition = condition_of(requirement.at, points.limits, outputs)
    found = matching(points, condition)
    low, high = _band(requirement, points.limits.ratings.outputs[output].voltage)
    within = f", within {100 * requirement.within:g} % of rated" if requirement.within is not None else ""
    return Outcome(
        name=requirement.name or "",
        characteristic="output_voltage",
        condition=f"{condition}{within}",
        unit="V",
        low=low,
        high=high,
        candidates=(*(_candidate(point, output, condition) for point in found), *untold(points, condition)),
        reason="" if found else missing_dwell(points, condition),
        output=output,
        note=requirement.note or "",
        formula="mean of the output voltage at the terminals",
        deviations=(*not_taken_in(points, condition), *_left_out_as_settling(found, output, low, high)),
    )


def _band(requirement: OutputVoltage, rated: float) -> tuple[float | None, float | None]:
    if requirement.within is None:
        return requirement.min, requirement.max
    return rated * (1 - requirement.within), rated * (1 + requirement.within)


def _candidate(point: Point, output: str, condition: Condition) -> Candidate:
    used = (Used(point, describe(point)),)
    try:
        point.require(*condition_channels(condition))
        return Candidate(used, point.voltage(output), at=describe(point))
    except MeasurementError as problem:
        return Candidate(used, reason=str(problem))


def _lines(outcomes: Sequence[Outcome]) -> list[LimitLine]:
    lines = [LimitLine(f"{o.name} min", o.low, "min") for o in outcomes if o.low is not None]
    return lines + [LimitLine(f"{o.name} max", o.high, "max") for o in outcomes if o.high is not None]


def _left_out_as_settling(found: Sequence[Point], output: str, low: float | None, high: float | None) -> Iterator[str]:
    """What lay outside the band while it was settling, with the condition there already: for the report to say."""
    count, worst, furthest = 0, 0.0, 0.0
    places: dict[str, list[str]] = {}  # table -> lines of the dwells before which it lay
    for point in found:
        samples = _settling(point, output)
        below = np.maximum(0.0, low - samples) if low is not None else np.zeros(samples.size)
        above = np.maximum(0.0, samples - high) if high is not None else np.zeros(samples.size)
        beyond = np.nan_to_num(below + above)
        if not beyond.any():
            continue
        count += int(np.count_nonzero(beyond))
        if beyond.max() > furthest:
            worst, furthest = float(samples[int(np.argmax(beyond))]), float(beyond.max())
        table, _, lines = point.where.rpartition(", line")
        places.setdefault(table, []).append(lines.removeprefix("s").strip())
    if count:
        told = "; ".join(
            f"{table}, lines {', '.join(lines)}" if table else ", ".join(lines) for table, lines in places.items()
        )
        readings = "readings" if count > 1 else "reading"
        yield f"{count} {readings} outside the band, up to {worst:.5g} V, left out as settling before {told}"


def _settling(point: Point, output: str) -> NDArray[np.float64]:
    """Output voltage at the terminals in what was left out as settling, its condition set already. [V]"""
    key, current = channel_key("output_voltage", output), channel_key("output_current", output)
    if not point.has(key):
        return np.zeros(0)
    settling = slice(point.dwell.reached, point.dwell.first)
    samples = point.columns[key][settling]
    wiring = point.limits.wiring("output", output)
    if wiring is not None and point.has(current):
        samples = samples + wiring.resistance * point.columns[current][settling]
    return samples
