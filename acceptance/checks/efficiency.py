"""Efficiency: output power over input power, at a load or as the mean of several."""

from __future__ import annotations

from collections.abc import Sequence

from acceptance.checks.conditions import (
    Condition,
    by_input,
    condition_channels,
    condition_of,
    describe,
    input_words,
    matching,
    meets_load,
    missing_dwell,
    not_taken_in,
    untold,
)
from acceptance.checks.figures import efficiency_figure, limit_lines
from acceptance.checks.outcome import Candidate, CheckResult, Outcome, Used
from acceptance.errors import MeasurementError
from acceptance.limitfile.limits import Limits
from acceptance.limitfile.model import Efficiency
from acceptance.points.point import Estimate, Point, Points
from acceptance.points.propagation import expanded

__all__ = ["check_efficiency", "efficiency_candidate", "least_favourable"]


def check_efficiency(requirements: Sequence[Efficiency], points: Points) -> CheckResult:
    """Outcomes of the efficiency requirements, and efficiency over load as a figure.

    Of a unit with several outputs it is the power of all of them over the input's; `output:` names the one whose load
    the condition means, every output otherwise.
    """
    outcomes = [_average(r, points) if r.average else _at_load(r, points) for r in requirements]
    return CheckResult.of(outcomes, efficiency_figure(limit_lines(requirements), points) if requirements else [])


def _loaded_outputs(requirement: Efficiency, limits: Limits) -> tuple[str, ...]:
    return (requirement.output,) if requirement.output else limits.outputs


def _at_load(requirement: Efficiency, points: Points) -> Outcome:
    condition = condition_of(requirement.at, points.limits, _loaded_outputs(requirement, points.limits))
    found = [point for point in matching(points, condition) if _is_loaded(point, condition)]
    candidates = [efficiency_candidate([point], [describe(point)], condition) for point in found]
    return _outcome(
        requirement,
        str(condition),
        [*candidates, *untold(points, condition)],
        reason="" if found else missing_dwell(points, condition),
        formula="mean(V × I) / mean(P), sample by sample",
        deviations=not_taken_in(points, condition),
    )


def _is_loaded(point: Point, condition: Condition) -> bool:
    """Whether power flows: with any load asked for, a no-load dwell has no efficiency to be judged."""
    if "any" not in condition.loads.values():
        return True
    return not all(meets_load(point, output, 0.0) for output in condition.loads)


def _average(requirement: Efficiency, points: Points) -> Outcome:
    """The mean of the efficiencies at several loads; where a load was run twice, the worse of the two counts.

    With `input: any` the mean is formed at each input voltage by itself.
    """
    limits, outputs = points.limits, _loaded_outputs(requirement, points.limits)
    loads = requirement.average or ()
    conditions = [condition_of(requirement.at, limits, outputs, load=load) for load in loads]
    reason = "; ".join(dict.fromkeys(missing_dwell(points, c) for c in conditions if not matching(points, c)))
    every = [point for condition in conditions for point in matching(points, condition)]
    candidates: list[Candidate] = []
    deviations: list[str] = []
    for group in by_input(list(dict.fromkeys(every))):
        found = [[p for p in matching(points, condition) if p in group] for condition in conditions]
        missing = [load for load, there in zip(loads, found, strict=True) if not there]
        if missing:
            lacks = ", ".join(f"{100 * load:g} %" for load in missing)
            deviations.append(f"at {input_words(group)} load {lacks} was not run, so that no mean was formed there")
            continue
        roles = [f"load {100 * load:g} %" for load in loads]
        choices = least_favourable(found, low=requirement.min, high=requirement.max)
        candidates += [efficiency_candidate(choice, roles, conditions[0]) for choice in choices]
    if not reason and not candidates:
        reason = "the loads were run, but not all of them at one input voltage"
    words = str(condition_of(requirement.at, limits, ()))
    text = f"mean over load {', '.join(f'{100 * load:g} %' for load in loads)}" + (f", {words}" if words else "")
    formula = "mean of the efficiencies at the loads, each measured"
    more = [*([] if reason else candidates), *untold(points, conditions[0])]
    return _outcome(
        requirement, text, more, reason=reason, formula=formula, deviations=deviations if candidates else ()
    )


def least_favourable(
    found: Sequence[Sequence[Point]], *, low: float | None, high: float | None = None
) -> list[tuple[Point, ...]]:
    """Of each load the point that is worst for a limit: by its value, and by what its uncertainty leaves of it."""
    ways = [sign for sign, limit in ((1.0, low), (-1.0, high)) if limit is not None]
    return list(
        dict.fromkeys(
            tuple(min(group, key=lambda point, sign=sign, k=k: _worth(point, sign, k)) for group in found)  # type: ignore[misc]
            for sign in ways
            for k in (0.0, 1.0)
        )
    )


def _worth(point: Point, sign: float, k: float) -> float:
    """Efficiency less k times its U, turned about for an upper limit; what cannot be judged goes before all."""
    try:
        efficiency = point.efficiency(point.limits.outputs)
    except MeasurementError:
        return float("-inf")
    u = expanded(efficiency.value, point.limits.decision.confidence).expanded
    return sign * efficiency.nominal - k * u


def efficiency_candidate(
    used: Sequence[Point], roles: Sequence[str], condition: Condition, *, weights: Sequence[float] | None = None
) -> Candidate:
    """The efficiency of one point, or the mean of several, each with its role; a weighted mean where weights are given.

    The weights add up to 1.
    """
    named = tuple(Used(point, role) for point, role in zip(used, roles, strict=True))
    try:
        parts = []
        for point in used:
            point.require(*condition_channels(condition))
            parts.append(point.efficiency(point.limits.outputs))
        if weights is None:
            value = sum((part.value for part in parts), start=0.0) / len(parts)
        else:
            value = sum((w * part.value for w, part in zip(weights, parts, strict=True)), start=0.0)
        return Candidate(named, Estimate.of(value, *parts), at=describe(used[0]) if len(used) == 1 else "")
    except MeasurementError as problem:
        return Candidate(named, reason=str(problem))


def _outcome(
    requirement: Efficiency,
    condition: str,
    candidates: Sequence[Candidate],
    *,
    reason: str,
    formula: str,
    deviations: Sequence[str],
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
        deviations=tuple(deviations),
    )
