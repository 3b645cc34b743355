"""Efficiency: output power over input power, at a load or as the mean of several."""

from __future__ import annotations

from collections.abc import Callable, Sequence

from acceptance.checks.conditions import (
    Condition,
    condition_channels,
    condition_of,
    matching,
    meets_load,
    missing_dwell,
)
from acceptance.checks.figures import efficiency_figure
from acceptance.checks.outcome import Candidate, CheckResult, Outcome, Used
from acceptance.errors import MeasurementError
from acceptance.limitfile.limits import Limits
from acceptance.limitfile.model import Efficiency
from acceptance.points.point import Estimate, Point, Points

__all__ = ["check_efficiency"]


def check_efficiency(requirements: Sequence[Efficiency], points: Points) -> CheckResult:
    """Outcomes of the efficiency requirements, and efficiency over load as a figure.

    Of a unit with several outputs it is the power of all of them over the input's; `output:` names the one whose load
    the condition means, every output otherwise.
    """
    outcomes = [_average(r, points) if r.average else _at_load(r, points) for r in requirements]
    return CheckResult.of(outcomes, efficiency_figure(requirements, points) if requirements else [])


def _loaded_outputs(requirement: Efficiency, limits: Limits) -> tuple[str, ...]:
    return (requirement.output,) if requirement.output else limits.outputs


def _at_load(requirement: Efficiency, points: Points) -> Outcome:
    condition = condition_of(requirement.at, points.limits, _loaded_outputs(requirement, points.limits))
    found = [point for point in matching(points, condition) if _is_loaded(point, condition)]
    candidates = [_candidate([point], [str(condition)], condition) for point in found]
    return _outcome(
        requirement,
        str(condition),
        candidates,
        reason="" if found else missing_dwell(points, condition),
        formula="mean(V × I) / mean(P), sample by sample",
    )


def _is_loaded(point: Point, condition: Condition) -> bool:
    """Whether power flows: with any load asked for, a no-load dwell has no efficiency to be judged."""
    if "any" not in condition.loads.values():
        return True
    return not all(meets_load(point, output, 0.0) for output in condition.loads)


def _average(requirement: Efficiency, points: Points) -> Outcome:
    """The mean of the efficiencies at several loads; where a load was run twice, the worse of the two counts."""
    limits, outputs = points.limits, _loaded_outputs(requirement, points.limits)
    loads = requirement.average or ()
    conditions = [condition_of(requirement.at, limits, outputs, load=load) for load in loads]
    found = [matching(points, condition) for condition in conditions]
    reason = "; ".join(missing_dwell(points, c) for c, f in zip(conditions, found, strict=True) if not f)
    whole = condition_of(requirement.at, limits, ())
    text = ", ".join(
        [f"mean over load {', '.join(f'{100 * load:g} %' for load in loads)}", *([str(whole)] * bool(str(whole)))]
    )
    candidates: list[Candidate] = []
    if not reason:
        roles = [f"load {100 * load:g} %" for load in loads]
        wanted = [pick for pick, limit in ((min, requirement.min), (max, requirement.max)) if limit is not None]
        choices = dict.fromkeys(_extremes(found, pick) for pick in wanted)
        candidates = [_candidate(choice, roles, conditions[0]) for choice in choices]
    return _outcome(
        requirement, text, candidates, reason=reason, formula="mean of the efficiencies at the loads, each measured"
    )


def _extremes(found: Sequence[Sequence[Point]], pick: Callable[..., Point]) -> tuple[Point, ...]:
    """Of each load the point of the lowest (or highest) efficiency; one that cannot be judged goes before all."""

    def key(point: Point) -> float:
        try:
            return point.efficiency(point.limits.outputs).nominal
        except MeasurementError:
            return float("-inf") if pick is min else float("inf")

    return tuple(pick(group, key=key) for group in found)


def _candidate(used: Sequence[Point], roles: Sequence[str], condition: Condition) -> Candidate:
    named = tuple(Used(point, role) for point, role in zip(used, roles, strict=True))
    try:
        parts = []
        for point in used:
            point.require(*condition_channels(condition))
            parts.append(point.efficiency(point.limits.outputs))
        value = sum((part.value for part in parts), start=0.0) / len(parts)
        return Candidate(named, Estimate.of(value, *parts))
    except MeasurementError as problem:
        return Candidate(named, reason=str(problem))


def _outcome(
    requirement: Efficiency, condition: str, candidates: Sequence[Candidate], *, reason: str, formula: str
) -> Outcome:
    return Outcome(
        name=requirement.name or "",
        characteristic="efficiency",
        condition=condition,
        unit="",
        low=requirement.min,
        high=requirement.max,
        candidates=tuple(candidates),
        reason=reason,
        output=requirement.output or "",
        note=requirement.note or "",
        formula=formula,
    )
