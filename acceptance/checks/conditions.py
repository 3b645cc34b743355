"""Which points meet a requirement's conditions, and what to say when none does."""

from __future__ import annotations

from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass
from typing import Literal

from acceptance.bench.log import channel_key
from acceptance.checks.outcome import Candidate, Used
from acceptance.limitfile.limits import Limits
from acceptance.limitfile.model import Conditions, Requirement
from acceptance.points.point import Point, Points

ANY: Literal["any"] = "any"

__all__ = [
    "Condition",
    "by_input",
    "by_load",
    "condition_channels",
    "condition_of",
    "describe",
    "grouped",
    "input_words",
    "load_tolerance",
    "matching",
    "meets_input",
    "meets_load",
    "missing_dwell",
    "not_taken_in",
    "output_of",
    "share",
    "untold",
]

_LOAD_TOLERANCE = 0.02  # of rated current; half of it at 10 % and below
_INPUT_TOLERANCE = 0.01  # of the input voltage

Load = float | Literal["any"] | None


@dataclass(frozen=True, slots=True)
class Condition:
    """Where a value is asked for, output by output. None: it does not matter."""

    loads: Mapping[str, Load]
    input: float | Literal["any"] | None
    load_tolerance: float | None = None  # a method's own, of rated current; None: the limits file's, or the usual one
    input_tolerance: float | None = None  # a method's own, of the input voltage

    def __str__(self) -> str:
        return ", ".join([*self._load_words(), *self._input_words()])

    def _load_words(self) -> list[str]:
        given = {output: load for output, load in self.loads.items() if load is not None}
        if not given:
            return []
        values = set(given.values())
        if len(values) == 1 and len(given) == len(self.loads):
            return [f"load {_percent(next(iter(values)))}"]
        return [f"load {output} {_percent(load)}" for output, load in given.items()]

    def _input_words(self) -> list[str]:
        if self.input is None:
            return []
        return ["input any" if self.input == ANY else f"input {self.input:g} V"]


def _percent(load: Load) -> str:
    return ANY if load == ANY else f"{100 * (load or 0.0):g} %"


def condition_of(at: Conditions | None, limits: Limits, outputs: Sequence[str], *, load: Load = None) -> Condition:
    """The condition written under `at:`, a load standing there meaning the given outputs; `load` goes before it."""
    given = load if load is not None else (at.load if at is not None else None)
    if isinstance(given, Mapping):
        loads: dict[str, Load] = {output: given.get(output) for output in limits.outputs}
    else:
        loads = {output: (given if output in outputs else None) for output in limits.outputs}
    voltage = at.input if at is not None else None
    return Condition(loads, ANY if isinstance(voltage, str) else voltage)


def output_of(requirement: Requirement, limits: Limits) -> str:
    """The output that a requirement is about: the one it names, or the first."""
    return requirement.output or limits.outputs[0]


def load_tolerance(load: float, limits: Limits) -> float:
    """How far a load may lie from the one asked for, as a fraction of rated current."""
    stated = limits.decision.tolerance.load
    if stated is not None:
        return stated
    return _LOAD_TOLERANCE if load > 0.1 + 1e-12 else _LOAD_TOLERANCE / 2


def meets_load(point: Point, output: str, load: Load, tolerance: float | None = None) -> bool:
    """Whether a point has the load asked for; any: up to the rated current. A tolerance given goes before the usual.

    By the mean of the current, or by its median: a dwell whose load dropped out for a while was still run at that
    load, and what is judged there must not be the other dwells alone.
    """
    if load is None:
        return True
    fractions = [f for f in (point.load_fraction(output), point.median_load_fraction(output)) if f is not None]
    if isinstance(load, str):
        return any(abs(fraction) <= 1 + load_tolerance(1.0, point.limits) + 1e-12 for fraction in fractions)
    if load == 0:
        return point.is_unloaded(output)
    near = load_tolerance(load, point.limits) if tolerance is None else tolerance
    return any(abs(fraction - load) <= near + 1e-12 for fraction in fractions)


def meets_input(point: Point, voltage: float | Literal["any"] | None, tolerance: float | None = None) -> bool:
    """Whether a point has the input voltage asked for; any: within the rated range."""
    if voltage is None:
        return True
    measured = point.input_voltage()
    if tolerance is None:
        share = point.limits.decision.tolerance.input
        tolerance = _INPUT_TOLERANCE if share is None else share
    if isinstance(voltage, str):
        span = point.limits.ratings.input.range
        if measured is None or span is None:
            return measured is not None
        return span[0] * (1 - tolerance) <= measured <= span[1] * (1 + tolerance)
    if measured is None:
        return False
    return abs(measured - voltage) <= tolerance * voltage * (1 + 1e-12)


def matching(points: Points, condition: Condition) -> list[Point]:
    """The steady points that meet a condition."""
    return [
        point
        for point in points.steady
        if meets_input(point, condition.input, condition.input_tolerance)
        and all(meets_load(point, output, load, condition.load_tolerance) for output, load in condition.loads.items())
    ]


def untold(points: Points, condition: Condition) -> list[Candidate]:
    """Candidates that cannot be judged: points of which it is not known whether an `any` takes them in."""
    found = []
    for point in points.steady:
        loads = [o for o, load in condition.loads.items() if load == ANY and point.load_fraction(o) is None]
        inputs = condition.input == ANY and point.input_voltage() is None
        if loads or inputs:
            what = " and ".join([*(f"the load of {output}" for output in loads), *(["the input voltage"] * inputs)])
            reason = f"{what} is not known at {point.where}, so that it is open whether the condition takes it in"
            found.append(Candidate((Used(point, "condition unknown"),), reason=reason))
    asked = {channel_key("output_current", output) for output, load in condition.loads.items() if load == ANY}
    if condition.input == ANY:
        asked.add("input_voltage")
    return found + [Candidate((), reason=lost.reason) for lost in points.lost if lost.channel in asked]


def not_taken_in(points: Points, condition: Condition) -> tuple[str, ...]:
    """What was run beyond the ratings, and an `any` does not take in: for the report to say."""
    if ANY not in (*condition.loads.values(), condition.input):
        return ()
    inside = {id(point) for point in matching(points, condition)}
    unknown = {id(used.point) for candidate in untold(points, condition) for used in candidate.used}
    out = [point for point in points.steady if id(point) not in inside | unknown and _is_beyond(point, condition)]
    if not out:
        return ()
    more = f", and {len(out) - 1} more" if len(out) > 1 else ""
    return (f"run beyond the ratings and not taken in by any: {describe(out[0])} ({out[0].where}){more}",)


def _is_beyond(point: Point, condition: Condition) -> bool:
    loads = [output for output, load in condition.loads.items() if load == ANY]
    beyond_load = any(not meets_load(point, output, ANY) for output in loads)
    return beyond_load or (condition.input == ANY and not meets_input(point, ANY))


def condition_channels(condition: Condition) -> list[str]:
    """The channels that tell whether a condition is met."""
    keys = [channel_key("output_current", output) for output, load in condition.loads.items() if load is not None]
    return keys + (["input_voltage"] if condition.input is not None else [])


def by_input(found: Sequence[Point]) -> list[list[Point]]:
    """Points by input voltage: with `input: any` each input voltage is looked at by itself."""
    return grouped(found, lambda point: point.input_voltage() or 0.0, lambda voltage: 2 * _INPUT_TOLERANCE * voltage)


def by_load(found: Sequence[Point], output: str) -> list[list[Point]]:
    """Points by load: with `load: any` each load is looked at by itself."""
    return grouped(
        found, lambda point: point.load_fraction(output) or 0.0, lambda load: 2 * load_tolerance(load, found[0].limits)
    )


def grouped(
    found: Sequence[Point], value: Callable[[Point], float], width: Callable[[float], float]
) -> list[list[Point]]:
    """Points in groups whose neighbouring values lie within a width of each other, each in the order of the log.

    Neighbours, not all: a mains voltage that wanders through a sweep leaves it one sweep.
    """
    groups: list[list[Point]] = []
    for point in sorted(found, key=value):
        if groups and value(point) - value(groups[-1][-1]) <= abs(width(value(point))):
            groups[-1].append(point)
        else:
            groups.append([point])
    return [sorted(group, key=lambda point: point.index) for group in groups]


def input_words(group: Sequence[Point]) -> str:
    """The input voltage of a group, in words."""
    voltages = [voltage for point in group if (voltage := point.input_voltage()) is not None]
    return f"input {sum(voltages) / len(voltages):.4g} V" if voltages else "an unknown input voltage"


def missing_dwell(points: Points, condition: Condition) -> str:
    """Why no point meets a condition, with the nearest one named."""
    unknown = _unknown(points, condition)
    if unknown:
        return unknown
    if not points.steady:
        stages = dict.fromkeys(point.dwell.stage for point in points.all)
        called = f"; its dwells are of stage {', '.join(stages)} (from: {points.log.stages_from})" if stages else ""
        return f"the log has no steady dwell{called}"
    nearest = min(points.steady, key=lambda point: _distance(point, condition))
    return f"no dwell at {condition or 'any condition'}; the nearest is at {describe(nearest)} ({nearest.where})"


def _unknown(points: Points, condition: Condition) -> str:
    """What the log does not tell at all, and the condition needs."""
    for output, load in condition.loads.items():
        key = channel_key("output_current", output)
        turned = [doubt for doubt in points.log.doubts if doubt.kind == "negative" and key in doubt.channels]
        if load is not None and turned:
            return f"{turned[0].text}; {turned[0].remedy}"
        if load is not None and all(point.load_fraction(output) is None for point in points.steady) and points.steady:
            return f"{key} was not logged, so that no load can be told; record it"
    if condition.input is not None and points.steady and all(p.input_voltage() is None for p in points.steady):
        return "the input voltage was neither logged nor stated; record it, or give it under log: stated:"
    return ""


def describe(point: Point) -> str:
    """The operating condition of a point, in words."""
    several = len(point.limits.outputs) > 1
    words = []
    for output in point.limits.outputs:
        fraction = point.load_fraction(output)
        told = "unknown" if fraction is None else share(fraction)
        words.append(f"load {output} {told}" if several else f"load {told}")
    voltage = point.input_voltage()
    words.append("input unknown" if voltage is None else f"input {voltage:.4g} V")
    return ", ".join(words)


def share(fraction: float) -> str:
    """A measured load in per cent; what rounds to zero has no sign."""
    return f"{round(100 * fraction, 1) + 0.0:.1f} %"


def _distance(point: Point, condition: Condition) -> float:
    far = 0.0
    for output, load in condition.loads.items():
        fraction = point.load_fraction(output)
        if fraction is None:
            far += 10.0
        elif isinstance(load, float):
            far += abs(fraction - load)
        elif load == ANY:
            far += max(0.0, fraction - 1)
    voltage = point.input_voltage()
    if isinstance(condition.input, float):
        far += 10.0 if voltage is None else abs(voltage / condition.input - 1)
    return far
