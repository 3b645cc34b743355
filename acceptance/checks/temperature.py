"""Temperature rise and temperature of probes and windings, once the unit has settled."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass
from typing import Literal

from acceptance.checks.conditions import Condition, condition_of, output_of
from acceptance.checks.outcome import Candidate, CheckResult, Outcome
from acceptance.checks.soaks import Found, is_same_level, soaks_at
from acceptance.checks.temperature_figures import cooling_figure, soak_figure
from acceptance.checks.warm import Warm, probe_key, warm_probe
from acceptance.checks.winding import Cooling, warm_winding, winding_key
from acceptance.errors import MeasurementError
from acceptance.limitfile.insulation import InsulationClass, insulation_class
from acceptance.limitfile.model import Temperature, TemperatureRise
from acceptance.points.point import Estimate, Points
from acceptance.record import Figure
from acceptance.thermal.soak import Soak

__all__ = ["check_temperature", "check_temperature_rise"]

_COOLEST_RATED = 25.0  # the rated ambient counts as at least this (IEC 60950-1, 1.4.12.2, from memory) [°C]

_COOLER = 2.0  # than rated: the report says so [K]

Asked = TemperatureRise | Temperature
Known = Literal["value", "at least", "at most"]


@dataclass(frozen=True, slots=True)
class _Judged:
    """One soak under one requirement."""

    soak: Soak
    candidate: Candidate
    warm: Warm | None = None
    cooling: Cooling | None = None


def check_temperature_rise(requirements: Sequence[TemperatureRise], points: Points) -> CheckResult:
    """Outcomes of the temperature rise requirements: over the ambient at the same moment."""
    return _check(requirements, points, _rise_outcome)


def check_temperature(requirements: Sequence[Temperature], points: Points) -> CheckResult:
    """Outcomes of the temperature requirements: as measured, or in the highest rated ambient."""
    return _check(requirements, points, _temperature_outcome)


Former = Callable[..., Outcome]


def _check(requirements: Sequence[Asked], points: Points, former: Former) -> CheckResult:
    outcomes, figures = [], []
    for requirement in requirements:
        output = output_of(requirement, points.limits)
        outputs = (output,) if requirement.output else points.limits.outputs
        condition = condition_of(requirement.at, points.limits, outputs)
        found = soaks_at(points, condition)
        judged = _without_cut_short([_judge(soak, requirement, points) for soak in found.soaks])
        outcomes.append(former(requirement, points, condition, found=found, judged=judged))
        figures += _figures(requirement, points, judged)
    return CheckResult.of(outcomes, figures)


def _rise_outcome(
    requirement: TemperatureRise, points: Points, condition: Condition, *, found: Found, judged: Sequence[_Judged]
) -> Outcome:
    method = "by resistance" if requirement.method == "resistance" else "by probe"
    return Outcome(
        name=requirement.name or "",
        characteristic="temperature_rise",
        condition=f"{condition}, {requirement.probe} {method}",
        unit="K",
        high=requirement.max,
        candidates=tuple(one.candidate for one in judged),
        reason=found.reason,
        output=requirement.output or "",
        note=requirement.note or "",
        formula=_formula(requirement),
        deviations=_deviations(found, judged),
    )


def _temperature_outcome(
    requirement: Temperature, points: Points, condition: Condition, *, found: Found, judged: Sequence[_Judged]
) -> Outcome:
    reference = _reference(requirement, points)
    known = insulation_class(requirement.class_) if requirement.class_ else None
    method = "by resistance" if requirement.method == "resistance" else "by probe"
    adjusted = "" if reference is None else f", adjusted to an ambient of {reference:g} °C"
    return Outcome(
        name=requirement.name or "",
        characteristic="temperature",
        condition=f"{condition}, {requirement.probe} {method}{adjusted}",
        unit="°C",
        high=known.winding if known is not None else requirement.max,
        candidates=tuple(one.candidate for one in judged),
        reason=found.reason,
        output=requirement.output or "",
        note=requirement.note or "",
        formula=_formula(requirement),
        deviations=(
            *_of_class(known, requirement),
            *_cooler_room(requirement, points, judged),
            *_deviations(found, judged),
        ),
    )


def _formula(requirement: Asked) -> str:
    if requirement.method == "resistance":
        rise = "(R2 − R1)/R1 · (K + t1) − (t2 − t1), R2 at switch-off"
        temperature = "R2/R1 · (K + t1) − K, R2 at switch-off"
    else:
        rise = "mean of probe − ambient over the last 30 min + slope × time constant"
        temperature = "mean over the last 30 min + slope × time constant"
    if isinstance(requirement, TemperatureRise):
        return rise
    return temperature if requirement.adjust == "none" else "T + max(rated ambient, 25 °C) − ambient"


def _of_class(known: InsulationClass | None, requirement: Temperature) -> tuple[str, ...]:
    if known is None:
        return ()
    if requirement.method == "resistance":
        return (known.source,)
    probe = (
        "a class limit is for the mean of a winding by resistance; by a thermocouple standards allow 10 K less (from "
        "memory), which is not taken off here"
    )
    return known.source, probe


def _cooler_room(requirement: Temperature, points: Points, judged: Sequence[_Judged]) -> tuple[str, ...]:
    """That a temperature as measured says nothing of the highest rated ambient."""
    rated = points.limits.ratings.ambient
    rooms = [one.warm.ambient.nominal for one in judged if one.warm is not None and one.warm.ambient is not None]
    if requirement.adjust != "none" or rated is None or not rooms or max(rooms) > rated - _COOLER:
        return ()
    told = f"as measured, in an ambient of {max(rooms):.1f} °C; in the highest rated one, {rated:g} °C, it would be"
    return (f"{told} warmer by about their difference (adjust: rated ambient reckons with it)",)


def _deviations(found: Found, judged: Sequence[_Judged]) -> tuple[str, ...]:
    notes = [note for one in judged if one.warm is not None for note in one.warm.notes]
    kept = {id(one.soak) for one in judged}
    cut = [
        f"another soak at the condition was cut short before it had reached more: {soak.where}"
        for soak in found.soaks
        if id(soak) not in kept
    ]
    return tuple(dict.fromkeys((*found.notes, *notes, *cut)))


def _reference(requirement: Temperature, points: Points) -> float | None:
    """The ambient that a temperature is adjusted to; None where it is taken as measured. [°C]"""
    if requirement.adjust == "none":
        return None
    rated = points.limits.ratings.ambient
    return max(_COOLEST_RATED if rated is None else rated, _COOLEST_RATED)


# --- one soak --------------------------------------------------------------------------------------------------------


def _judge(soak: Soak, requirement: Asked, points: Points) -> _Judged:
    try:
        cooling = None
        if requirement.method == "resistance":
            warm, cooling = warm_winding(soak, points, requirement)
        else:
            absolute = isinstance(requirement, Temperature) and requirement.adjust == "none"
            warm = warm_probe(soak, probe_key(requirement.probe), settled=requirement.settled, absolute=absolute)
        estimate = _value(warm, requirement, points)
    except MeasurementError as problem:
        return _Judged(soak, Candidate((), reason=str(problem), at=soak.condition, place=soak.where))
    known, reason = _known(warm, estimate, requirement)
    at = f"{soak.condition}; {warm.told}" if soak.condition else warm.told
    candidate = Candidate((), estimate, at=at, known=known, bound_reason=reason, place=soak.where)
    return _Judged(soak, candidate, warm, cooling)


def _known(warm: Warm, estimate: Estimate, requirement: Asked) -> tuple[Known, str]:
    """Whether the value is one, or a bound, and then why."""
    limit = _highest(requirement)
    if warm.settling.began_warm and (warm.bound_reason or (limit is not None and estimate.nominal > limit)):
        # heat from before the soak tells of another condition, neither for the unit nor against it
        reason = (
            f"the soak began warmer than it ends (a rise of {warm.settling.reached:.1f} K at first): what was reached "
            "came from before it; let the unit cool down, and record the soak from its beginning"
        )
        return "at most", reason
    if warm.bound_reason:
        unit = "K" if isinstance(requirement, TemperatureRise) else "°C"
        return "at least", f"{warm.bound_reason} (so far {estimate.nominal:.1f} {unit})"
    return "value", ""


def _highest(requirement: Asked) -> float | None:
    """The limit in the requirement's own terms."""
    known = (
        insulation_class(requirement.class_) if isinstance(requirement, Temperature) and requirement.class_ else None
    )
    return known.winding if known is not None else requirement.max


def _value(warm: Warm, requirement: Asked, points: Points) -> Estimate:
    if isinstance(requirement, TemperatureRise):
        return warm.rise
    reference = _reference(requirement, points)
    return warm.temperature if reference is None else warm.adjusted(reference)


def _without_cut_short(judged: Sequence[_Judged]) -> list[_Judged]:
    """Without soaks that were cut short, where another one at the same load and input settled above what they reached.

    Under `any` what settled at one load tells nothing of another.
    """
    settled = [one for one in judged if one.candidate.known == "value" and one.candidate.estimate is not None]
    return [one for one in judged if not any(_supersedes(other, one) for other in settled)]


def _supersedes(other: _Judged, one: _Judged) -> bool:
    mine = one.candidate
    if mine.known != "at least" or mine.estimate is None or not is_same_level(other.soak, one.soak):
        return False
    return _is_higher(other.candidate, mine.estimate)


def _is_higher(other: Candidate, estimate: Estimate) -> bool:
    return other.estimate is not None and other.estimate.nominal >= estimate.nominal


# --- figures ---------------------------------------------------------------------------------------------------------


def _figures(requirement: Asked, points: Points, judged: Sequence[_Judged]) -> list[Figure]:
    found = []
    for number, one in enumerate((j for j in judged if j.warm is not None), start=1):
        assert one.warm is not None
        suffix = f" {number}" if number > 1 else ""
        limit = _limit_of(requirement, one.warm, points)
        if one.cooling is not None:
            name = f"{winding_key(points, requirement.probe)}{suffix}"
            found.append(cooling_figure(one.cooling, name=name, limit=limit, label=f"{requirement.name} max"))
        else:
            key = probe_key(requirement.probe)
            is_rise = isinstance(requirement, TemperatureRise)
            label = f"{requirement.name} max"
            found.append(soak_figure(one.warm, key, suffix=suffix, limit=limit, label=label, is_rise=is_rise))
    return found


def _limit_of(requirement: Asked, warm: Warm, points: Points) -> float | None:
    """The limit as a temperature in the ambient of the soak. [°C]"""
    room = warm.ambient.nominal if warm.ambient is not None else None
    if isinstance(requirement, TemperatureRise):
        return None if room is None else room + requirement.max
    high, reference = _highest(requirement), _reference(requirement, points)
    if high is None or reference is None or room is None:
        return high
    return high - reference + room
