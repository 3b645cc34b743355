"""From decided outcomes to the record: plain values only, nothing is judged here."""

from __future__ import annotations

import hashlib
import math
import platform
from collections.abc import Iterable, Sequence
from datetime import datetime

import numpy as np

from acceptance import __version__
from acceptance.bench.log import QUANTITIES, BenchLog, Channel, Doubt
from acceptance.bench.packed import extent_of
from acceptance.decision import (
    Decided,
    Verdict,
    joint_probability,
    required_probability,
    unit_verdict,
)
from acceptance.errors import MeasurementError
from acceptance.hazards import hazards_of
from acceptance.limitfile.limits import Limits, Meter
from acceptance.points.point import Point, Points
from acceptance.points.propagation import budget, expanded, standard_uncertainty
from acceptance.record import (
    VERSION,
    Alternative,
    AtDwell,
    BudgetLine,
    DecisionRule,
    Deviation,
    Evidence,
    Figure,
    Finding,
    Health,
    InstrumentUsed,
    LimitsUsed,
    Output,
    Ratings,
    Reading,
    Record,
    TestFacts,
    Unit,
    finite,
    report_number,
)
from acceptance.record import Point as RecordedPoint
from acceptance.units import KINDS

__all__ = ["make_record"]


def make_record(
    points: Points, decided: Sequence[Decided], figures: Sequence[Figure], *, judged_at: datetime
) -> Record:
    """The record of one unit.

    Parameters
    ----------
    points
        Of the log, with all doubts about it.
    decided
        Every outcome's verdict, in the order of the report.
    judged_at
        With its zone; the only thing in the record that the evidence does not settle.
    """
    log, limits = points.log, points.limits
    findings = [*(_finding(one, points) for one in decided), *_calibration(log, limits)]
    joint = None if len(findings) > len(decided) else joint_probability(decided)
    return Record(
        acceptance_record=VERSION,
        report_number=_number(log, limits),
        judged_at=judged_at.isoformat(timespec="seconds").replace("+00:00", "Z"),
        unit=Unit(limits.product.name, limits.product.revision, log.serial),
        verdict=unit_verdict([finding.verdict for finding in findings]),
        joint_conformity_probability=joint,
        findings=findings,
        points=[_point(point) for point in points.all],
        figures=list(figures),
        instruments=_instruments(log, limits),
        health=[_health(doubt, log) for doubt in (*log.doubts, *_undated(log, limits), *_sheets_left_out(log))],
        notes=dict(log.notes),
        evidence=[Evidence(one.file, one.sha256, one.bytes, one.rows) for one in log.evidence],
        limits=LimitsUsed(
            limits.file, limits.sha256, limits.requirements_sha256, limits.bench_file, limits.bench_sha256
        ),
        made_by=_made_by(),
        ratings=_ratings(limits),
        decision=_rule(limits),
        test=_test(log, limits),
        hazards=hazards_of(limits.ratings),
    )


def _number(log: BenchLog, limits: Limits) -> str:
    """Evidence, requirements and bench, not the bytes of their files: a comment in a limits file changes nothing."""
    bench = (
        sorted(limits.meters.items()),
        sorted(limits.leads.items()),
        sorted(limits.columns.items()),
        sorted(limits.stated.items()),
        (limits.load_mode, limits.settle, limits.min_dwell),
    )
    told = hashlib.sha256(repr(bench).encode()).hexdigest()
    return report_number([log.serial, *sorted(one.sha256 for one in log.evidence), limits.requirements_sha256, told])


# --- findings -------------------------------------------------------------------------------------------------------


def _finding(decided: Decided, points: Points) -> Finding:
    outcome, by = decided.outcome, decided.by
    judged = by if by is not None and decided.verdict != "not judged" else None
    u = judged.expanded if judged is not None else None
    return Finding(
        name=outcome.name,
        characteristic=outcome.characteristic,
        condition=outcome.condition,
        value=_value(judged),
        unit=outcome.unit,
        expanded_uncertainty=u.expanded if u is not None else None,
        coverage_factor=u.coverage_factor if u is not None else None,
        degrees_of_freedom=finite(u.degrees_of_freedom) if u is not None else None,
        min=outcome.low,
        max=outcome.high,
        margin=judged.margin if judged is not None else None,
        conformity_probability=judged.probability if judged is not None else None,
        verdict=decided.verdict,
        reason=decided.reason,
        standard_uncertainty=u.standard if u is not None else None,
        output=outcome.output,
        where=by.candidate.where if by is not None else "",
        at=by.candidate.at if by is not None else "",
        note=outcome.note,
        asked=outcome.asked,
        formula=outcome.formula,
        points=[AtDwell(used.point.index, used.role) for used in by.candidate.used] if by is not None else [],
        others=[_alternative(other) for other in decided.others],
        budget=_budget(judged),
        deviations=[Deviation(text) for text in _deviations(decided, points)],
    )


def _value(judged: Verdict | None) -> float | str | None:
    if judged is None:
        return None
    if judged.candidate.text is not None:
        return judged.candidate.text
    return judged.candidate.estimate.nominal if judged.candidate.estimate is not None else None


def _budget(judged: Verdict | None) -> list[BudgetLine]:
    if judged is None or judged.candidate.estimate is None or judged.expanded is None:
        return []
    return [
        BudgetLine(line.source.name, line.source.kind, line.u, line.share, finite(line.source.degrees_of_freedom))
        for line in budget(judged.candidate.estimate.value)
    ]


def _alternative(other: Verdict) -> Alternative:
    value = _value(other) if other.verdict != "not judged" else None
    return Alternative(
        where=other.candidate.where,
        value=value if isinstance(value, float) else None,
        expanded_uncertainty=other.expanded.expanded if other.expanded is not None else None,
        margin=other.margin,
        conformity_probability=other.probability,
        verdict=other.verdict,
        reason=other.reason,
        at=other.candidate.at,
    )


def _deviations(decided: Decided, points: Points) -> list[str]:
    texts = list(decided.outcome.deviations)
    by = decided.by
    if by is None:
        return texts
    stated = points.log.stated
    if "input" in decided.outcome.condition and "input_voltage" in stated:
        texts.append(f"the input voltage was stated as {stated['input_voltage']:g} V, not logged")
    entered = _stated_in(decided, points)
    texts += [f"{key} was stated as {stated[key]:g}, not logged, and enters the value" for key in entered]
    if any(used.point.readings == 1 for used in by.candidate.used):
        texts.append("single readings: nothing of type A is in the uncertainty")
    return texts


def _stated_in(decided: Decided, points: Points) -> list[str]:
    """The channels of the input power that were only stated, where the value is formed from that power."""
    if decided.outcome.characteristic not in ("efficiency", "no_load_power") or "input_power" in points.log.samples:
        return []
    keys = ("input_current", "power_factor", "input_voltage")
    return [key for key in keys if key in points.log.stated and key not in points.log.samples]


def _calibration(log: BenchLog, limits: Limits) -> list[Finding]:
    """One finding, not judged, for each device whose calibration was past due on the day of the test."""
    if log.test_date is None:
        return []
    past: dict[str, Meter] = {}
    for meter in _meters_used(log, limits):
        if meter.due is not None and meter.due < log.test_date:
            past.setdefault(meter.device, meter)
    return [
        Finding(
            name=f"calibration.{device}",
            characteristic="calibration",
            condition="in date on the day of the test",
            value=None,
            unit="",
            expanded_uncertainty=None,
            coverage_factor=None,
            degrees_of_freedom=None,
            min=None,
            max=None,
            margin=None,
            conformity_probability=None,
            verdict="not judged",
            reason=(
                f"calibration of {device} was due on {meter.due}, the test was run on {log.test_date}; "
                "have it calibrated, and give the new date, or repeat the test"
            ),
        )
        for device, meter in past.items()
    ]


def _meters_used(log: BenchLog, limits: Limits) -> Iterable[Meter]:
    keys = [*(channel.key for channel in _measured(log)), *log.stated]
    return (meter for key in keys if (meter := limits.meter(key)) is not None)


def _undated(log: BenchLog, limits: Limits) -> list[Doubt]:
    """Without a date in the log no calibration can be held against it."""
    if log.test_date is not None or all(meter.due is None for meter in _meters_used(log, limits)):
        return []
    return [
        Doubt(
            "no date",
            "the log carries no date, so that no calibration can be compared with it",
            remedy="log the date with the time, or write a note such as # date: 2026-05-04 above the table",
        )
    ]


def _sheets_left_out(log: BenchLog) -> list[Doubt]:
    """Whole sheets that were not read: the paper says so, since one of them may hold another run."""
    return [
        Doubt("left out", f"{one.file}, {one.what}: {one.reason}")
        for one in log.ignored
        if one.what.startswith("sheet")
    ]


# --- points ---------------------------------------------------------------------------------------------------------


def _measured(log: BenchLog) -> list[Channel]:
    """Channels that an instrument measured."""
    left_out = {"time", "load_setting"}
    return [c for c in log.channels if QUANTITIES[c.quantity] in KINDS and c.quantity not in left_out]


def _point(point: Point) -> RecordedPoint:
    limits = point.limits
    starts, duration = point.starts()
    loads = {output: point.load_fraction(output) for output in limits.outputs}
    efficiency, u = _efficiency(point)
    return RecordedPoint(
        index=point.index,
        stage=point.dwell.stage,
        where=point.where,
        starts=starts,
        duration=duration,
        readings=point.readings,
        settling=point.dwell.first - point.dwell.begins,
        load_fractions={output: load for output, load in loads.items() if load is not None},
        channels={c.key: reading for c in _measured(point.log) if (reading := _reading(point, c)) is not None},
        efficiency=efficiency,
        efficiency_expanded_uncertainty=u,
        found_by=point.dwell.from_,
    )


def _efficiency(point: Point) -> tuple[float | None, float | None]:
    try:
        estimate = point.efficiency(point.limits.outputs)
    except MeasurementError:
        return None, None
    if estimate.unstated:
        return estimate.nominal, None
    return estimate.nominal, expanded(estimate.value, point.limits.decision.confidence).expanded


def _reading(point: Point, channel: Channel) -> Reading | None:
    try:
        mean = point.mean(channel.key)
    except MeasurementError:
        return None
    stated = point.bench.is_stated(channel.key)
    rounding = standard_uncertainty(point.rounding(channel.key, mean.deviation or 0.0))
    type_b = math.hypot(point.bench.standard_uncertainty(channel.key, mean.mean), rounding) if stated else None
    return Reading(
        value=mean.mean,
        unit=KINDS[QUANTITIES[channel.quantity]],
        standard_uncertainty=None if type_b is None else math.hypot(type_b, mean.standard_uncertainty or 0.0),
        type_a=mean.standard_uncertainty,
        type_b=type_b,
        readings=mean.readings,
        effective_readings=mean.effective_readings,
    )


# --- the rest -------------------------------------------------------------------------------------------------------


def _instruments(log: BenchLog, limits: Limits) -> list[InstrumentUsed]:
    channels = {channel.key: channel for channel in _measured(log)}  # once, however many files have it
    return [_instrument(channel, limits.meter(key), log) for key, channel in channels.items()]


def _instrument(channel: Channel, meter: Meter | None, log: BenchLog) -> InstrumentUsed:
    if meter is None:
        return InstrumentUsed(channel.key, None, "", "", "", "", None, "not stated")
    unit = KINDS[meter.kind]
    span = meter.meter_range
    return InstrumentUsed(
        channel=channel.key,
        device=meter.device,
        serial=meter.serial,
        accuracy=meter.text,
        meter_range=f"{span:g} {unit}" if isinstance(span, float) else (span or ""),
        resolution=f"{meter.resolution:g} {unit}" if meter.resolution is not None else "",
        due=meter.due.isoformat() if meter.due is not None else None,
        state=_state(meter, log),
    )


def _state(meter: Meter, log: BenchLog) -> str:
    if not meter.is_stated:
        return "uncertainty not stated"
    if meter.due is None:
        return "no due date stated"
    if log.test_date is None:
        return "test date unknown"
    return "in date" if meter.due >= log.test_date else "past due"


def _health(doubt: Doubt, log: BenchLog) -> Health:
    places = []
    for span in doubt.spans[:3]:
        table, first, last = log.rows_of(span)
        places.append(f"{table}, line {first}" if first == last else f"{table}, lines {first} to {last}")
    if len(doubt.spans) > 3:
        places.append(f"and {len(doubt.spans) - 3} more")
    return Health(doubt.kind, doubt.text, doubt.bars, list(doubt.channels), "; ".join(places), doubt.remedy)


def _made_by() -> dict[str, str]:
    import pandas as pd
    import scipy

    return {
        "acceptance": __version__,
        "python": platform.python_version(),
        "numpy": np.__version__,
        "scipy": scipy.__version__,
        "pandas": pd.__version__,
    }


def _ratings(limits: Limits) -> Ratings:
    plate = limits.ratings
    return Ratings(
        supply=plate.input.supply,
        input_voltage=plate.input.voltage,
        input_range=list(plate.input.range) if plate.input.range else None,
        frequency=plate.input.frequency,
        outputs=[Output(name, output.voltage, output.current) for name, output in plate.outputs.items()],
        ambient=plate.ambient,
        protection_class=limits.product.protection_class,
    )


def _rule(limits: Limits) -> DecisionRule:
    decision = limits.decision
    return DecisionRule(
        rule=decision.rule,
        confidence=decision.confidence,
        required_probability=None if decision.rule == "simple" else required_probability(decision),
        load_tolerance=decision.tolerance.load,
        input_tolerance=decision.tolerance.input,
    )


def _test(log: BenchLog, limits: Limits) -> TestFacts:
    ambient = None
    if "ambient_temperature" in log.samples:
        low, high = extent_of(log.column("ambient_temperature"))
        if low <= high:
            ambient = [low, high]
    return TestFacts(
        date=log.test_date.isoformat() if log.test_date is not None else None,
        stages=[str(stage) for stage in log.samples["stage"].unique()],
        samples=len(log.samples),
        load_mode=_load_mode(log),
        settle=limits.settle,
        min_dwell=limits.min_dwell,
        ambient=ambient,
        serial_from=log.serial_from,
        stated=dict(log.stated),
    )


def _load_mode(log: BenchLog) -> str | None:
    modes = {str(mode) for key in log.keys("load_mode") for mode in log.samples[key].dropna().unique()}
    return ", ".join(sorted(modes)) or None
