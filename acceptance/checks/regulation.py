"""Load and line regulation: how far the output voltage spreads over a span of load or of input."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import replace

from acceptance.checks.conditions import (
    Condition,
    condition_channels,
    condition_of,
    load_tolerance,
    matching,
    meets_input,
    meets_load,
    missing_dwell,
    output_of,
    share,
)
from acceptance.checks.figures import voltage_figures
from acceptance.checks.outcome import Candidate, CheckResult, Outcome, Used
from acceptance.errors import MeasurementError
from acceptance.limitfile.model import LineRegulation, LoadRegulation
from acceptance.points.point import Estimate, Point, Points

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
    largest = max(voltages, key=lambda voltage: voltage.nominal)
    smallest = min(voltages, key=lambda voltage: voltage.nominal)
    if not abs(reference.nominal) > 0:
        msg = "the reference voltage is zero"
        raise MeasurementError(msg)
    sign = 1.0 if reference.nominal > 0 else -1.0
    return Estimate.of(sign * (largest.value - smallest.value) / reference.value, *voltages, reference)


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
    groups = [
        group for group in _by_input(matching(points, others)) if all(_meets_any(group, output, load) for load in span)
    ]
    if not problem and not groups:
        problem = f"both ends of the load were run, but not at one input voltage ({ends[0]}; {ends[1]})"
    candidates: list[Candidate] = []
    for group in groups if not problem else []:
        reference = _load_reference(requirement, output, group, points)
        if isinstance(reference, str):
            problem = reference
        else:
            inside = [point for point in group if _is_between(point, output, span)]
            candidates.append(_candidate(output, inside, reference=reference, condition=ends[0], role=_load_role))
    words = str(others)
    condition = ", ".join([f"load {100 * span[0]:g} % to {100 * span[1]:g} %", *([words] if words else [])])
    return Outcome(
        name=requirement.name or "",
        characteristic="load_regulation",
        condition=f"{condition}, relative to {requirement.relative_to}",
        unit="",
        high=requirement.max,
        candidates=tuple(candidates),
        reason=problem if not candidates else "",
        output=output,
        note=requirement.note or "",
        formula=f"(largest − smallest output voltage) / output voltage at {_in_words(requirement.relative_to)}",
    )


def _by_input(inside: Sequence[Point]) -> list[list[Point]]:
    """The points by input voltage: with `input: any` each input voltage is looked at by itself."""
    return _grouped(inside, lambda point: point.input_voltage() or 0.0, lambda voltage: 0.01 * abs(voltage))


def _grouped(
    inside: Sequence[Point], value: Callable[[Point], float], width: Callable[[float], float]
) -> list[list[Point]]:
    """Points in groups that lie within a width of the group's smallest value, each in the order of the log."""
    groups: list[list[Point]] = []
    for point in sorted(inside, key=value):
        start = value(groups[-1][0]) if groups else 0.0
        if groups and value(point) - start <= 2 * width(start):
            groups[-1].append(point)
        else:
            groups.append([point])
    return [sorted(group, key=lambda point: point.index) for group in groups]


def _meets_any(group: Sequence[Point], output: str, load: float) -> bool:
    return any(meets_load(point, output, load) for point in group)


def _in_words(reference: str) -> str:
    return "its rated value" if reference == "nominal" else reference


def _is_between(point: Point, output: str, span: tuple[float, float]) -> bool:
    """Whether a point lies in a span of load, its ends with their tolerances included."""
    fraction = point.load_fraction(output)
    if fraction is None:
        return False
    low, high = (span[0] - load_tolerance(span[0], point.limits), span[1] + load_tolerance(span[1], point.limits))
    return low <= fraction <= high or meets_load(point, output, span[0])


def _load_role(point: Point, output: str) -> str:
    return f"load {share(point.load_fraction(output) or 0.0)}"


def _input_role(point: Point, output: str) -> str:
    return f"input {point.input_voltage() or 0.0:.4g} V"


def _load_reference(
    requirement: LoadRegulation, output: str, group: Sequence[Point], points: Points
) -> list[Point] | float | str:
    """Points that the spread is referred to, the rated voltage, or why there is none."""
    if requirement.relative_to == "nominal":
        return points.limits.ratings.outputs[output].voltage
    load = _REFERENCE_LOADS[requirement.relative_to]
    found = [point for point in group if meets_load(point, output, load)]
    return found or f"no dwell at load {100 * load:g} %, which the regulation is to be relative to"


def _candidate(
    output: str,
    inside: Sequence[Point],
    *,
    reference: Sequence[Point] | float,
    condition: Condition,
    role: Callable[[Point, str], str],
) -> Candidate:
    """The spread over the points, referred to the reference that makes it largest."""
    roles = [role(point, output) for point in inside]
    try:
        needed = condition_channels(condition)
        for point in [*inside, *([] if isinstance(reference, float) else reference)]:
            point.require(*needed)
        voltages = [point.voltage(output) for point in inside]
        extra: list[Used] = []
        if isinstance(reference, float):
            value = regulation(voltages, Estimate(reference))
        else:
            smallest = min(reference, key=lambda point: abs(point.voltage(output).nominal))
            value, extra = regulation(voltages, smallest.voltage(output)), [Used(smallest, "reference")]
    except MeasurementError as problem:
        return Candidate(tuple(map(Used, inside, roles)), reason=str(problem))
    return Candidate((*_extremes(inside, voltages, roles), *extra), value)


def _extremes(inside: Sequence[Point], voltages: Sequence[Estimate], roles: Sequence[str]) -> list[Used]:
    order = sorted(range(len(inside)), key=lambda i: voltages[i].nominal)
    return [
        Used(inside[order[-1]], f"largest, {roles[order[-1]]}"),
        Used(inside[order[0]], f"smallest, {roles[order[0]]}"),
    ]


def check_line_regulation(requirements: Sequence[LineRegulation], points: Points) -> CheckResult:
    """Outcomes of the line regulation requirements."""
    return CheckResult.of([_line_regulation(requirement, points) for requirement in requirements])


def _line_regulation(requirement: LineRegulation, points: Points) -> Outcome:
    limits, output = points.limits, output_of(requirement, points.limits)
    outputs = (output,) if requirement.output else limits.outputs
    at_load = condition_of(requirement.at, limits, outputs)
    span = (requirement.from_, requirement.to)
    rated = limits.ratings.input.voltage
    needed = [replace(at_load, input=voltage) for voltage in dict.fromkeys((*span, rated))]
    problem = "; ".join(missing_dwell(points, condition) for condition in needed if not matching(points, condition))
    if points.log.stated.get("input_voltage") is not None and "input_voltage" not in points.log.samples:
        problem = "the input voltage is only stated, not logged, so that no span of it is seen; record it"
    inside = [point for point in matching(points, at_load) if _is_between_inputs(point, span)]
    groups = [g for g in _by_load(inside, output) if all(any(meets_input(p, v) for p in g) for v in (*span, rated))]
    if not problem and not groups:
        problem = "both ends of the input were run, but not at one load"
    candidates: list[Candidate] = []
    for group in groups if not problem else []:
        reference = [point for point in group if meets_input(point, rated)]
        candidates.append(_candidate(output, group, reference=reference, condition=needed[0], role=_input_role))
    return Outcome(
        name=requirement.name or "",
        characteristic="line_regulation",
        condition=", ".join([f"input {span[0]:g} V to {span[1]:g} V", str(at_load)]),
        unit="",
        high=requirement.max,
        candidates=tuple(candidates),
        reason=problem,
        output=output,
        note=requirement.note or "",
        formula=f"(largest − smallest output voltage) / output voltage at {rated:g} V input",
    )


def _by_load(inside: Sequence[Point], output: str) -> list[list[Point]]:
    """The points by load: with `load: any` each load is looked at by itself."""
    return _grouped(inside, lambda point: point.load_fraction(output) or 0.0, lambda load: 0.02 if load > 0.1 else 0.01)


def _is_between_inputs(point: Point, span: tuple[float, float]) -> bool:
    voltage = point.input_voltage()
    if voltage is None:
        return False
    return span[0] <= voltage <= span[1] or any(meets_input(point, end) for end in span)
