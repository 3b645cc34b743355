"""Overcurrent: where an output begins to limit, how, what it gives into a short, and how soon it is back."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass

from acceptance.checks.conditions import Condition, condition_of, meets_input, output_of
from acceptance.checks.outcome import Candidate, CheckResult, Outcome
from acceptance.checks.overcurrent_figures import overcurrent_figures
from acceptance.errors import MeasurementError
from acceptance.limitfile.model import Output, Overcurrent
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


@dataclass(frozen=True, slots=True)
class _Asked:
    """One thing that a requirement asks of an overload."""

    what: str
    unit: str
    form: Former
    formula: str
    words: str = ""  # what the value refers to, behind the condition
    low: float | None = None
    high: float | None = None
    text: str = ""  # the limit, where it is one in words


def _outcomes(
    requirement: Overcurrent, points: Points, found: Sequence[Overload], *, reason: str, condition: Condition
) -> list[Outcome]:
    output = output_of(requirement, points.limits)
    return [
        Outcome(
            name=f"{requirement.name}.{asked.what}",
            characteristic="overcurrent",
            condition=f"{condition}{asked.words}",
            unit=asked.unit,
            low=asked.low,
            high=asked.high,
            candidates=tuple(_guarded(asked.form, overload) for overload in found),
            reason=reason,
            output=output,
            note=requirement.note or "",
            formula=asked.formula,
            deviations=_deviations(asked.what, found),
            asked=asked.text,
        )
        for asked in _asked_by(requirement, points.limits.ratings.outputs[output])
    ]


def _asked_by(requirement: Overcurrent, rated: Output) -> list[_Asked]:
    """What a requirement asks, in the order of its keys."""
    every = (
        _behaviour_asked(requirement),
        _onset_asked(requirement, rated),
        _short_circuit_asked(requirement, rated),
        _recovery_asked(requirement, rated),
    )
    return [asked for asked in every if asked is not None]


def _behaviour_asked(requirement: Overcurrent) -> _Asked | None:
    kind = requirement.behaviour
    if kind is None:
        return None
    text = "any of " + ", ".join(_NAMED) if kind == "any" else kind
    return _Asked("behaviour", "", _behaviour_of(kind), "what the samples beyond the onset show", text=text)


def _onset_asked(requirement: Overcurrent, rated: Output) -> _Asked | None:
    if requirement.onset is None:
        return None
    low, high = requirement.onset
    return _Asked(
        "onset",
        "A",
        _onset,
        "I where V lies the droop below the line of the regulated branch",
        words=f", fall of {100 * requirement.droop:g} % of {rated.voltage:g} V",
        low=low * rated.current,
        high=high * rated.current,
    )


def _short_circuit_asked(requirement: Overcurrent, rated: Output) -> _Asked | None:
    short = requirement.short_circuit
    if short is None:
        return None
    return _Asked(
        "short_circuit",
        "A",
        _short_circuit,
        "mean of I where V is below 5 % of rated; of bursts the largest reading",
        low=None if short.min is None else short.min * rated.current,
        high=None if short.max is None else short.max * rated.current,
    )


def _recovery_asked(requirement: Overcurrent, rated: Output) -> _Asked | None:
    recovery = requirement.recovery
    if recovery is None:
        return None
    return _Asked(
        "recovery",
        "s",
        _recovery(recovery.band, recovery.within),
        "from the last sample of the overload to the first of those that stay in the band: at most this",
        words=f", back within {100 * recovery.band:g} % of {rated.voltage:g} V",
        high=recovery.within,
    )


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
