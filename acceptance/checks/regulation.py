"""Load and line regulation: how far the output voltage spreads over a span of load or of input."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass, replace

from acceptance.checks.conditions import (
    Condition,
    by_input,
    by_load,
    condition_channels,
    condition_of,
    describe,
    input_words,
    load_tolerance,
    matching,
    meets_input,
    meets_load,
    missing_dwell,
    not_taken_in,
    output_of,
    share,
    untold,
)
from acceptance.checks.figures import voltage_figures
from acceptance.checks.outcome import Candidate, CheckResult, Outcome, Used
from acceptance.errors import MeasurementError
from acceptance.limitfile.model import LineRegulation, LoadRegulation
from acceptance.points.point import Estimate, Point, Points
from acceptance.points.propagation import expanded

__all__ = ["check_line_regulation", "check_load_regulation", "regulation"]

_REFERENCE_LOADS = {"full load": 1.0, "no load": 0.0, "half load": 0.5}


def regulation(voltages: Sequence[Estimate], reference: Estimate) -> Estimate:
    """Largest less smallest of the voltages over a reference, a magnitude. [1]

    Parameters
    ----------
    voltages
        Output voltages at the points of the span, at least two; what they share cancels. [V]
    reference
        The voltage it is referred to, of either sign; not 0. [V]

    Raises
    ------
    MeasurementError
        If the reference is zero.
    """
    # by place, so that equal readings are still two readings, each with an error of its own
    order = sorted(voltages, key=lambda voltage: voltage.nominal)
    smallest, largest = order[0], order[-1]
    if not abs(reference.nominal) > 0:
        msg = "the reference voltage is zero"
        raise MeasurementError(msg)
    sign = 1.0 if reference.nominal > 0 else -1.0
    return Estimate.of(sign * (largest.value - smallest.value) / reference.value, *voltages, reference)


@dataclass(frozen=True, slots=True)
class Sweep:
    """What one regulation is formed from: the points of one span, at one value of whatever was held."""

    output: str
    inside: Sequence[Point]  # the points of the span, ends included
    reference: Sequence[Point] | float  # points it is referred to, or a voltage [V]
    referred_to: str  # what those are, in words
    has_both_ends: bool  # by two different points
    held: str  # at what the sweep was run, in words
    role: Callable[[Point], str]


def check_load_regulation(requirements: Sequence[LoadRegulation], points: Points) -> CheckResult:
    """Outcomes of the load regulation requirements, and the output voltage over load as a figure."""
    outcomes = [_load_regulation(requirement, points) for requirement in requirements]
    outputs = dict.fromkeys(output_of(requirement, points.limits) for requirement in requirements)
    return CheckResult.of(outcomes, voltage_figures(list(outputs), points))


def _load_regulation(requirement: LoadRegulation, points: Points) -> Outcome:
    output = output_of(requirement, points.limits)
    span = (requirement.from_, requirement.to)
    given = condition_of(requirement.at, points.limits, ())
    others = replace(given, loads={**given.loads, output: None})
    ends = [replace(others, loads={**others.loads, output: load}) for load in span]
    problem = "; ".join(missing_dwell(points, end) for end in ends if not matching(points, end))
    sweeps = [_load_sweep(requirement, output, group) for group in by_input(matching(points, others))]
    judged, left_out = _judged(sweeps, ends[0], requirement.max)
    if not problem and not judged:
        problem = f"both ends of the load were run, but not at one input voltage ({ends[0]}; {ends[1]})"
    words = str(others)
    condition = ", ".join([f"load {100 * span[0]:g} % to {100 * span[1]:g} %", *([words] if words else [])])
    return Outcome(
        name=requirement.name or "",
        characteristic="load_regulation",
        condition=f"{condition}, relative to {requirement.relative_to}",
        unit="",
        high=requirement.max,
        candidates=() if problem else (*judged, *untold(points, others)),
        reason=problem,
        output=output,
        note=requirement.note or "",
        formula=f"(largest − smallest output voltage) / output voltage at {_in_words(requirement.relative_to)}",
        deviations=() if problem else (*left_out, *not_taken_in(points, others)),
        is_magnitude=True,
    )


def _load_sweep(requirement: LoadRegulation, output: str, group: Sequence[Point]) -> Sweep:
    span = (requirement.from_, requirement.to)
    ends = [[point for point in group if meets_load(point, output, load)] for load in span]
    reference: list[Point] | float
    if requirement.relative_to == "nominal":
        reference = group[0].limits.ratings.outputs[output].voltage
    else:
        load = _REFERENCE_LOADS[requirement.relative_to]
        reference = [point for point in group if meets_load(point, output, load)]
    inside = [point for point in group if _is_between(point, output, span)]
    return Sweep(
        output=output,
        inside=inside,
        reference=reference,
        referred_to=_in_words(requirement.relative_to),
        has_both_ends=_are_two(*ends),
        held=input_words(group),
        role=lambda point: _load_role(point, output),
    )


def _are_two(low: Sequence[Point], high: Sequence[Point]) -> bool:
    """Whether both ends were run, and not by one and the same dwell."""
    return any(first is not second for first in low for second in high)


def _in_words(reference: str) -> str:
    """The reference as a report says it."""
    return {"nominal": "its rated value", "half load": "half load (50 %)"}.get(reference, reference)


def _is_between(point: Point, output: str, span: tuple[float, float]) -> bool:
    """Whether a point lies in a span of load, its ends with their tolerances included."""
    fraction = point.load_fraction(output)
    if fraction is None:
        return False
    low, high = (span[0] - load_tolerance(span[0], point.limits), span[1] + load_tolerance(span[1], point.limits))
    return low <= fraction <= high or any(meets_load(point, output, load) for load in span)


def _load_role(point: Point, output: str) -> str:
    return f"load {share(point.load_fraction(output) or 0.0)}"


def check_line_regulation(requirements: Sequence[LineRegulation], points: Points) -> CheckResult:
    """Outcomes of the line regulation requirements."""
    return CheckResult.of([_line_regulation(requirement, points) for requirement in requirements])


def _line_regulation(requirement: LineRegulation, points: Points) -> Outcome:
    limits, output = points.limits, output_of(requirement, points.limits)
    outputs = (output,) if requirement.output else limits.outputs
    at_load = condition_of(requirement.at, limits, outputs)
    rated, span = limits.ratings.input.voltage, (requirement.from_, requirement.to)
    needed = [replace(at_load, input=voltage) for voltage in dict.fromkeys((*span, rated))]
    problem = "; ".join(missing_dwell(points, condition) for condition in needed if not matching(points, condition))
    if points.log.stated.get("input_voltage") is not None and "input_voltage" not in points.log.samples:
        problem = "the input voltage is only stated, not logged, so that no span of it is seen; record it"
    sweeps = [_line_sweep(requirement, output, group) for group in by_load(matching(points, at_load), output)]
    judged, left_out = _judged(sweeps, needed[0], requirement.max)
    if not problem and not judged:
        problem = "both ends of the input were run, but not at one load"
    return Outcome(
        name=requirement.name or "",
        characteristic="line_regulation",
        condition=", ".join([f"input {span[0]:g} V to {span[1]:g} V", str(at_load)]),
        unit="",
        high=requirement.max,
        candidates=() if problem else (*judged, *untold(points, at_load)),
        reason=problem,
        output=output,
        note=requirement.note or "",
        formula=f"(largest − smallest output voltage) / output voltage at {rated:g} V input",
        deviations=() if problem else (*left_out, *not_taken_in(points, at_load)),
        is_magnitude=True,
    )


def _line_sweep(requirement: LineRegulation, output: str, group: Sequence[Point]) -> Sweep:
    span, rated = (requirement.from_, requirement.to), group[0].limits.ratings.input.voltage
    ends = [[point for point in group if meets_input(point, voltage)] for voltage in span]
    return Sweep(
        output=output,
        inside=[point for point in group if _is_between_inputs(point, span)],
        reference=[point for point in group if meets_input(point, rated)],
        referred_to=f"input {rated:g} V",
        has_both_ends=_are_two(*ends),
        held=_load_role(group[0], output),
        role=lambda point: f"input {point.input_voltage() or 0.0:.4g} V",
    )


def _is_between_inputs(point: Point, span: tuple[float, float]) -> bool:
    voltage = point.input_voltage()
    if voltage is None:
        return False
    return span[0] <= voltage <= span[1] or any(meets_input(point, end) for end in span)


# --- both -----------------------------------------------------------------------------------------------------------


def _judged(sweeps: Sequence[Sweep], condition: Condition, limit: float) -> tuple[list[Candidate], list[str]]:
    """Candidates of the whole sweeps, and of those parts that exceed the limit already; the other parts in words.

    The spread of a part is a lower bound of the whole one's, so a part can fail a unit and never pass it.
    """
    judged: list[Candidate] = []
    left_out: list[str] = []
    for sweep in sweeps:
        if not sweep.inside:
            continue
        found = _candidates(sweep, condition)
        if sweep.has_both_ends:
            judged += found
            continue
        beyond = [c for c in found if c.estimate is not None and c.estimate.nominal > limit]
        judged += beyond
        if not beyond:
            where = ", ".join(describe(point) for point in sweep.inside[:3])
            left_out.append(f"at {sweep.held} only part of the span was run, and is not judged ({where})")
    return judged, left_out


def _candidates(sweep: Sweep, condition: Condition) -> list[Candidate]:
    """The spread by the readings themselves, and, where it takes other points, by what their uncertainty adds."""
    try:
        voltages = _voltages(sweep, condition)
        if not isinstance(sweep.reference, float) and not sweep.reference:
            msg = f"at {sweep.held} there is no dwell at {sweep.referred_to}, which the regulation is to be relative to"
            raise MeasurementError(msg)
        pairs = dict.fromkeys(_extremes(voltages, sweep.inside, k) for k in (0.0, 1.0))
        return [_candidate(sweep, pair) for pair in pairs]
    except MeasurementError as problem:
        used = tuple(Used(point, sweep.role(point)) for point in sweep.inside)
        return [Candidate(used, reason=str(problem), at=sweep.held)]


def _voltages(sweep: Sweep, condition: Condition) -> list[Estimate]:
    reference = [] if isinstance(sweep.reference, float) else sweep.reference
    for point in [*sweep.inside, *reference]:
        point.require(*condition_channels(condition))
    return [point.voltage(sweep.output) for point in sweep.inside]


def _extremes(voltages: Sequence[Estimate], inside: Sequence[Point], k: float) -> tuple[Point, Point]:
    """The points of the largest and smallest voltage, k times their U added and taken off."""
    confidence = inside[0].limits.decision.confidence
    bounds = [(v.nominal, k * expanded(v.value, confidence).expanded if k else 0.0) for v in voltages]
    order = range(len(inside))
    smallest = min(order, key=lambda i: (bounds[i][0] - bounds[i][1], i))
    # of equal readings two different ones are taken, since each has an error of its own
    largest = max(order, key=lambda i: (bounds[i][0] + bounds[i][1], i))
    return inside[largest], inside[smallest]


def _candidate(sweep: Sweep, pair: tuple[Point, Point]) -> Candidate:
    """The spread between two points, referred to the reference that makes it largest."""
    largest, smallest = pair
    voltages = [largest.voltage(sweep.output), smallest.voltage(sweep.output)]
    used = [Used(largest, f"largest, {sweep.role(largest)}"), Used(smallest, f"smallest, {sweep.role(smallest)}")]
    if isinstance(sweep.reference, float):
        return Candidate(tuple(used), regulation(voltages, Estimate(sweep.reference)), at=sweep.held)
    least = min(sweep.reference, key=lambda point: abs(point.voltage(sweep.output).nominal))
    value = regulation(voltages, least.voltage(sweep.output))
    return Candidate((*used, Used(least, "reference")), value, at=sweep.held)
