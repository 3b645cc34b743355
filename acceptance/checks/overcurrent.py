"""Overcurrent: where an output begins to limit, how, what it gives into a short, and how soon it is back."""

from __future__ import annotations

from collections.abc import Callable, Sequence

from acceptance.checks.conditions import Condition, condition_of, meets_input, output_of
from acceptance.checks.outcome import Candidate, CheckResult, Outcome
from acceptance.checks.overcurrent_figures import overcurrent_figures
from acceptance.errors import MeasurementError
from acceptance.limitfile.model import Overcurrent
from acceptance.overload.analysis import Overload, overloads_in
from acceptance.overload.trace import overload_parts
from acceptance.points.point import Point, Points

__all__ = ["check_overcurrent"]

Former = Callable[[Overload], Candidate]

_NAMED = ("constant current", "constant power", "foldback", "hiccup", "latch off")


def check_overcurrent(requirements: Sequence[Overcurrent], points: Points) -> CheckResult:
    """Outcomes of the overcurrent requirements, one for each thing that is asked."""
    outcomes, figures = [], []
    for requirement in requirements:
        output = output_of(requirement, points.limits)
        condition = condition_of(requirement.at, points.limits, points.limits.outputs)
        parts = overload_parts(points, output)
        found, reason = _at_input(parts, output, points, requirement)
        outcomes += _outcomes(requirement, points, found, reason=reason, condition=condition)
        figures += overcurrent_figures(requirement, output, found)
    return CheckResult.of(outcomes, figures)


def _at_input(
    parts: Sequence[Point], output: str, points: Points, requirement: Overcurrent
) -> tuple[list[Overload], str]:
    """The overloads at the input voltage that is asked for, or why there is none."""
    at = condition_of(requirement.at, points.limits, points.limits.outputs)
    found: list[Overload] = []
    for part in parts:
        steady = [point for point in points.steady if _same_input(point, part)]
        found += overloads_in(part, output, steady, droop=requirement.droop)
    if not found:
        called = dict.fromkeys(str(stage) for stage in points.log.samples["stage"].unique())
        return [], (
            f"the log has no overload of {output} (its stages: {', '.join(called)}); sweep the load beyond rated "
            "current, into a short and back, and record it as stage overcurrent"
        )
    met = [one for one in found if meets_input(_loaded(one), at.input)]
    if met:
        return met, ""
    nearest = min(found, key=lambda one: _input_distance(_loaded(one), at))
    voltage = _loaded(nearest).input_voltage()
    told = "an input voltage that was neither logged nor stated" if voltage is None else f"input {voltage:.4g} V"
    return [], f"no overload was run at {at}; the nearest was run at {told} ({nearest.where})"


def _loaded(overload: Overload) -> Point:
    """The part of the stretch that tells the input voltage: from the way in to the end of the overload."""
    episode = overload.episode
    if episode is None:
        return overload.part
    stop = episode.end if episode.source_off is None else min(episode.end, episode.source_off)
    return episode.trace.stretch(episode.start, max(stop, episode.start + 1))


def _same_input(point: Point, part: Point) -> bool:
    here, there = point.input_voltage(), part.input_voltage()
    return here is None or there is None or meets_input(point, there)


def _input_distance(point: Point, at: Condition) -> float:
    voltage = point.input_voltage()
    if voltage is None or not isinstance(at.input, float):
        return float("inf")
    return abs(voltage - at.input)


# --- outcomes -------------------------------------------------------------------------------------------------------


def _outcomes(
    requirement: Overcurrent, points: Points, found: Sequence[Overload], *, reason: str, condition: Condition
) -> list[Outcome]:
    output = output_of(requirement, points.limits)
    rated = points.limits.ratings.outputs[output]
    outcomes: list[Outcome] = []

    def add(what: str, unit: str, former: Former, formula: str, **limits: object) -> None:
        candidates = tuple(_guarded(former, overload) for overload in found)
        outcomes.append(
            Outcome(
                name=f"{requirement.name}.{what}",
                characteristic="overcurrent",
                condition=f"{condition}{limits.pop('words', '')}",
                unit=unit,
                candidates=candidates,
                reason=reason,
                output=output,
                note=requirement.note or "",
                formula=formula,
                deviations=_deviations(what, found),
                **limits,  # type: ignore[arg-type]
            )
        )

    if requirement.behaviour is not None:
        asked = requirement.behaviour
        words = "any of " + ", ".join(_NAMED) if asked == "any" else asked
        add("behaviour", "", _behaviour_of(asked), "what the samples beyond the onset show", asked=words)
    if requirement.onset is not None:
        low, high = (share * rated.current for share in requirement.onset)
        words = f", fall of {100 * requirement.droop:g} % of {rated.voltage:g} V"
        formula = "I where V lies the droop below the line of the regulated branch"
        add("onset", "A", _onset, formula, low=low, high=high, words=words)
    if requirement.short_circuit is not None:
        short = requirement.short_circuit
        bounds = {"low": short.min, "high": short.max}
        limits = {key: value * rated.current for key, value in bounds.items() if value is not None}
        formula = "mean of I where V is below 5 % of rated; of bursts the largest reading"
        add("short_circuit", "A", _short_circuit, formula, **limits)
    if requirement.recovery is not None:
        recovery = requirement.recovery
        former = _recovery(recovery.band, recovery.within)
        words = f", back within {100 * recovery.band:g} % of {rated.voltage:g} V"
        formula = "from the last sample of the overload to the first of those that stay in the band: at most this"
        add("recovery", "s", former, formula, high=recovery.within, words=words)
    return outcomes


def _guarded(former: Former, overload: Overload) -> Candidate:
    try:
        return former(overload)
    except MeasurementError as problem:
        return Candidate((), reason=str(problem), place=overload.where)


def _behaviour_of(asked: str) -> Former:
    def form(overload: Overload) -> Candidate:
        seen = overload.behaviour()
        if asked == "any" and seen.name not in _NAMED:
            msg = f"{seen.name}: {seen.told}; it is none of {', '.join(_NAMED)} ({overload.where})"
            raise MeasurementError(msg)
        meets = asked in ("any", seen.name)
        at = f"{seen.told}; {_run_at(overload)}"
        return Candidate((), text=seen.name, text_meets=meets, at=at, place=overload.where)

    return form


def _onset(overload: Overload) -> Candidate:
    onset = overload.onset()
    at = "; ".join(word for word in (onset.how, _run_at(overload)) if word)
    return Candidate((), onset.current, at=at, known=onset.known, bound_reason=onset.reason, place=overload.where)


def _short_circuit(overload: Overload) -> Candidate:
    short, episode = overload.short(), overload.seen()
    at = f"at {short.voltage:.3g} V; {_run_at(overload)}"
    place = episode.place(short.first, short.stop)
    return Candidate((), short.current, at=at, known=short.known, bound_reason=short.reason, place=place)


def _recovery(band: float, within: float) -> Former:
    def form(overload: Overload) -> Candidate:
        returned, episode = overload.returned(band=band, within=within), overload.seen()
        place = episode.place(returned.removed, episode.stop)
        return Candidate(
            (),
            returned.time,
            at="; ".join(word for word in (returned.told, _run_at(overload)) if word),
            known=returned.known,
            bound_reason=returned.reason,
            place=place,
        )

    return form


def _run_at(overload: Overload) -> str:
    """The input and the load's mode, in words."""
    episode = overload.seen()
    voltage = _loaded(overload).input_voltage()
    mode = episode.trace.mode(slice(episode.entered, episode.end))
    told = "input unknown" if voltage is None else f"input {voltage:.4g} V"
    return f"{told}, load in {mode} mode" if mode not in ("", "mixed") else f"{told}, load mode {mode or 'unknown'}"


def _deviations(what: str, found: Sequence[Overload]) -> tuple[str, ...]:
    if what != "onset":
        return ()
    flat = any(one.episode is not None and one.episode.branch.flat for one in found)
    told = (
        "the regulated branch was seen at one load alone, and was taken as flat; record two loads up to rated current"
    )
    return (told,) if flat else ()
