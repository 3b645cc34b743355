"""Published sets: the limits for the product's class and rated power, under the set's own conditions."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

from acceptance.bench.log import channel_key
from acceptance.checks.conditions import Condition, describe, load_tolerance, matching, meets_input, missing_dwell
from acceptance.checks.efficiency import efficiency_candidate, least_favourable
from acceptance.checks.figures import efficiency_figure, limit_line
from acceptance.checks.method_conditions import dates, of_the_loads, of_the_whole
from acceptance.checks.no_load_power import NO_LOAD_FORMULA, no_load_candidate, unseen_outputs, whole_stretches
from acceptance.checks.outcome import Candidate, CheckResult, Outcome
from acceptance.checks.power_factor import POWER_FACTOR_FORMULA, power_factor_candidates
from acceptance.errors import MeasurementError
from acceptance.limitfile.model import Published
from acceptance.limitfile.published import EVIDENCE, PublishedSet, published_set
from acceptance.limitfile.setclass import Asked, AskedLimit, Unfit, asked_of
from acceptance.points.point import Point, Points
from acceptance.points.propagation import expanded
from acceptance.printing import with_uncertainty
from acceptance.record import LimitLine

__all__ = ["check_published"]

AC_OUTPUT = "the output power is volts times amperes, which is true of an a.c. output with a resistive load only"
ONE_UNIT = "one unit's result is not a represented value for a model"


@dataclass(frozen=True, slots=True)
class _Asking:
    """A set that is asked of one unit."""

    requirement: Published
    published: PublishedSet
    points: Points
    asked: Asked

    def condition(self, load: float) -> Condition:
        """A load of the set at its test voltage; 0 is no load.

        Of outputs that are rated for more than the unit gives, every current is scaled; one that cannot be run as low
        as the smallest load is run at its smallest current there.
        """
        test, ratings = self.published.test, self.points.limits.ratings.outputs
        smallest = (self.requirement.minimum_current or {}) if load == min(test.loads, default=0.0) else {}
        loads: dict[str, float] = {
            output: max(load * self.asked.derating, smallest.get(output, 0.0) / rating.current) if load else 0.0
            for output, rating in ratings.items()
        }
        tolerance = test.tolerance(load, several=len(ratings) > 1)
        return Condition(dict(loads), test.input, tolerance if load else None, test.input_tolerance)

    def found(self, load: float) -> list[Point]:
        """The points at a load of the set."""
        return matching(self.points, self.condition(load))

    def missing(self, loads: Sequence[float]) -> str:
        """Why no point is at these loads of the set; what is the same for all of them once."""
        conditions = [self.condition(load) for load in loads]
        told = dict.fromkeys(missing_dwell(self.points, condition) for condition in conditions)
        if told and self.points.steady:
            told[f"a load is met within ± {100 * (conditions[0].load_tolerance or 0.0):g} % of rated current"] = None
        return "; ".join(told)

    def words(self, loads: str) -> str:
        """The condition in words."""
        scaled = f", currents scaled by {self.asked.derating:.6g}" if self.asked.derating < 1 else ""
        smallest = self.requirement.minimum_current
        least = f", {' and '.join(smallest)} not below its smallest current" if smallest else ""
        return f"{loads}, input {self.published.test.input:g} V{scaled}{least}{self._tolerance()}"

    def _tolerance(self) -> str:
        """How near a load must be, where that is not what the limits file asks of every load."""
        limits = self.points.limits
        own = self.published.test.tolerance(1.0, several=len(limits.ratings.outputs) > 1)
        return "" if own == load_tolerance(1.0, limits) else f", each load within ± {100 * own:g} % of rated current"


def check_published(requirements: Sequence[Published], points: Points) -> CheckResult:
    """Outcomes of the published sets, one for each thing that a set asks, and efficiency over load as a figure."""
    outcomes: list[Outcome] = []
    lines: list[LimitLine] = []
    for requirement in requirements:
        published = published_set(requirement.set_)
        if published.kind == "weights":
            more, drawn = [_weighted(requirement, published, points)], tuple(published.weights)
            lines.append(limit_line(more[0].name, requirement.min or 0.0, "min", drawn))
        else:
            more = _outcomes(requirement, published, points)
            lines += [_line(outcome, published) for outcome in more if outcome.characteristic == "efficiency"]
        outcomes += more
    return CheckResult.of(outcomes, efficiency_figure(lines, points))


def _line(outcome: Outcome, published: PublishedSet) -> LimitLine:
    share = outcome.name.rpartition("_")[2]
    loads = (int(share) / 100,) if share.isdigit() else published.test.loads
    return limit_line(outcome.name, outcome.low or 0.0, "min", loads)


def _outcomes(requirement: Published, published: PublishedSet, points: Points) -> list[Outcome]:
    outputs = [(rating.voltage, rating.current) for rating in points.limits.ratings.outputs.values()]
    try:
        asked = asked_of(
            published, outputs, power=requirement.power, class_name=requirement.class_, ports=requirement.ports
        )
    except Unfit as unfit:  # the limits file was not checked against its ratings
        return [Outcome(requirement.name or "", "published", "", "", reason=str(unfit))]
    asking = _Asking(requirement, published, points, asked)
    return [_outcome(asking, limit, is_first=at == 0) for at, limit in enumerate(asked.limits)]


def _outcome(asking: _Asking, limit: AskedLimit, *, is_first: bool) -> Outcome:
    quantity, requirement = limit.quantity, asking.requirement
    if quantity.characteristic == "no_load_power":
        formed = _no_load(asking)
    elif quantity.load is None:
        formed = _average(asking, limit)
    else:
        formed = _at_load(asking, limit, quantity.load)
    reason = "" if formed.candidates else (_other_voltage(asking) or formed.reason)
    return Outcome(
        name=f"{requirement.name}.{quantity.name}",
        characteristic=quantity.characteristic,
        condition=formed.condition,
        unit=quantity.unit,
        low=limit.low,
        high=limit.high,
        candidates=tuple(formed.candidates),
        reason=reason,
        output=requirement.output or "",
        note=_note(asking, limit),
        formula=formed.formula,
        deviations=_deviations(asking, limit, formed, is_first=is_first),
    )


@dataclass(frozen=True, slots=True)
class _Formed:
    """The values of one outcome, and from what."""

    condition: str
    candidates: Sequence[Candidate]
    reason: str  # why there is none
    formula: str
    deviations: tuple[str, ...] = ()


# --- values ---------------------------------------------------------------------------------------------------------


def _average(asking: _Asking, limit: AskedLimit) -> _Formed:
    """The mean of the efficiencies; where a load was run twice, the worse of the two counts."""
    loads = asking.published.test.loads
    conditions = [asking.condition(load) for load in loads]
    found = [asking.found(load) for load in loads]
    missing = [load for load, there in zip(loads, found, strict=True) if not there]
    roles = [f"load {100 * load:g} %" for load in loads]
    choices = [] if missing else least_favourable(found, low=limit.low)
    candidates = [efficiency_candidate(choice, roles, conditions[0]) for choice in choices]
    method = asking.published.method
    swept: tuple[str, ...] = ()
    if method is not None and choices:
        swept = of_the_loads(method, choices[0], first=[group[0] for group in found], full=asking.asked.derating)
    return _Formed(
        asking.words(f"mean over load {', '.join(f'{100 * load:g} %' for load in loads)}"),
        candidates,
        asking.missing(missing),
        "mean of the efficiencies at the loads, each measured",
        swept,
    )


def _at_load(asking: _Asking, limit: AskedLimit, load: float) -> _Formed:
    condition, found = asking.condition(load), asking.found(load)
    if limit.quantity.characteristic == "power_factor":
        candidates, formula = power_factor_candidates(found, condition), POWER_FACTOR_FORMULA
    else:
        candidates = [efficiency_candidate([point], [describe(point)], condition) for point in found]
        formula = "mean(V × I) / mean(P), sample by sample"
    words = asking.words(f"load {100 * load:g} %")
    return _Formed(words, candidates, asking.missing([load]), formula)


def _no_load(asking: _Asking) -> _Formed:
    condition = asking.condition(0.0)
    candidates = [no_load_candidate(point, condition) for point in whole_stretches(asking.found(0.0))]
    missing = missing_dwell(asking.points, condition)
    words = f"load 0 %, input {asking.published.test.input:g} V"
    return _Formed(words, candidates, missing, NO_LOAD_FORMULA, unseen_outputs(asking.points))


def _other_voltage(asking: _Asking) -> str:
    """Why nothing can be judged where the log was run at another input voltage; "" where it was not."""
    test, points = asking.published.test, asking.points
    known = sorted({round(v, 1) for point in points.steady if (v := point.input_voltage()) is not None})
    if not known or any(meets_input(point, test.input, test.input_tolerance) for point in points.steady):
        return ""
    run = f"{known[0]:g} V" if len(known) == 1 else f"{known[0]:g} V to {known[-1]:g} V"
    asked = f"{test.input:g} V ± {100 * (test.input_tolerance or 0.0):g} %, {test.frequency:g} Hz"
    reason = f"{asking.published.name} is run at {asked}, and the log has an input of {run}; run it at {test.input:g} V"
    span = points.limits.ratings.input.range
    if span is not None and test.input is not None and not span[0] <= test.input <= span[1]:
        reason += f", which lies outside the rated {span[0]:g} V to {span[1]:g} V: another set may be the right one"
    return reason


# --- words ----------------------------------------------------------------------------------------------------------


def _note(asking: _Asking, limit: AskedLimit) -> str:
    """What the limit is, where it stands, and how well that is known."""
    published, asked = asking.published, asking.asked
    parts = [
        asking.requirement.note,
        f"{published.clause}: {limit.quantity.limit(limit.band)} for {limit.band}",
        f"P, the rated output power, is {asked.power:g} W",
        asked.reason if len(published.classes) > 1 else None,
        EVIDENCE[limit.band.evidence],
    ]
    return "; ".join(filter(None, parts))


def _deviations(asking: _Asking, limit: AskedLimit, formed: _Formed, *, is_first: bool) -> tuple[str, ...]:
    """Of the method on every finding; of the set as a whole on its first."""
    told = list(formed.deviations)
    if formed.candidates and asking.published.method is not None:
        used = [used.point for used in formed.candidates[0].used]
        told += of_the_whole(asking.published.method, used, asking.points)
    if limit.band.evidence == "unconfirmed":
        told.append(f"the limit is unconfirmed: compare it with {asking.published.clause} before relying on it")
    if "ac-ac" in asking.asked.class_name and limit.quantity.characteristic == "efficiency":
        told.append(AC_OUTPUT)
    if is_first:
        told += [*_reported(asking), *dates(asking.published, asking.points), *_adaptive(asking), ONE_UNIT]
    return tuple(told)


def _adaptive(asking: _Asking) -> list[str]:
    if "adaptive" not in asking.asked.class_name:
        return []
    return ["an adaptive supply is tested at its highest and at its lowest voltage; this is one of the two"]


def _reported(asking: _Asking) -> list[str]:
    """Efficiencies that are to be reported without a limit."""
    return [_one_reported(asking, load) for load in asking.published.reports(asking.asked.power)]


def _one_reported(asking: _Asking, load: float) -> str:
    name = f"efficiency at load {100 * load:g} %, to be reported without a limit"
    values = []
    for point in asking.found(load):
        try:
            values.append(point.efficiency(point.limits.outputs))
        except MeasurementError:
            continue
    if not values:
        return f"{name}: not measured"
    worst = min(values, key=lambda value: value.nominal)
    u = None if worst.unstated else expanded(worst.value, asking.points.limits.decision.confidence).expanded
    return f"{name}: {with_uncertainty(worst.nominal, u, '')}"


# --- weighted efficiency --------------------------------------------------------------------------------------------


def _weighted(requirement: Published, published: PublishedSet, points: Points) -> Outcome:
    """The efficiencies at shares of the rated output power, each by its weight."""
    voltage = requirement.at.input if requirement.at is not None else None
    condition = Condition({}, voltage if isinstance(voltage, float) else None)
    there = matching(points, condition)
    found = [[p for p in there if _meets_power(p, load, published)] for load in published.weights]
    missing = [load for load, group in zip(published.weights, found, strict=True) if not group]
    choices = [] if missing else least_favourable(found, low=requirement.min)
    roles = [f"{100 * load:g} % of rated output power" for load in published.weights]
    weights = list(published.weights.values())
    terms = ", ".join(f"{weight:g} at {100 * load:g} %" for load, weight in published.weights.items())
    return Outcome(
        name=f"{requirement.name}.weighted_efficiency",
        characteristic="efficiency",
        condition=f"weighted over shares of the rated output power, {condition}",
        unit="",
        low=requirement.min,
        candidates=tuple(efficiency_candidate(choice, roles, condition, weights=weights) for choice in choices),
        reason=_missing_power(points, condition, missing),
        output=requirement.output or "",
        note="; ".join(filter(None, [requirement.note, published.document])),  # which says how well it is known
        formula=f"sum of efficiency × weight: {terms}",
        deviations=(AC_OUTPUT, ONE_UNIT),  # an inverter's output is a.c.
    )


def _missing_power(points: Points, condition: Condition, missing: Sequence[float]) -> str:
    if not missing:
        return ""
    if not matching(points, condition):
        return missing_dwell(points, condition)
    shares = ", ".join(f"{100 * load:g} %" for load in missing)
    return f"no dwell at {shares} of the rated output power, {condition}; run the output there"


def _meets_power(point: Point, load: float, published: PublishedSet) -> bool:
    share = _power_share(point)
    return share is not None and abs(share - load) <= published.test.tolerance(load, several=False) + 1e-12


def _power_share(point: Point) -> float | None:
    """Output power over the rated one, as read: barred or not, since what is barred must not drop out unseen."""
    ratings = point.limits.ratings.outputs
    try:
        power = sum(
            point.mean(channel_key("output_voltage", output)).mean
            * point.mean(channel_key("output_current", output)).mean
            for output in ratings
        )
    except MeasurementError:
        return None
    return power / sum(rating.voltage * rating.current for rating in ratings.values())
