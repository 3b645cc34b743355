"""The whole chain for one unit, in order."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import replace
from datetime import datetime
from pathlib import Path

from acceptance.bench.health import check_health
from acceptance.bench.log import BenchLog
from acceptance.bench.read import read_logs
from acceptance.checks import CHECKS
from acceptance.checks.figures import merged
from acceptance.checks.outcome import CheckResult
from acceptance.decision import decide
from acceptance.limitfile.limits import Limits
from acceptance.points.dwells import find_dwells
from acceptance.points.lost import mostly_unsteady
from acceptance.points.overload import overloads_told
from acceptance.points.plausible import doubt_points
from acceptance.points.point import Points, measure_points
from acceptance.record import Record
from acceptance.recording import make_record

__all__ = ["check_points", "find_points", "judge_unit", "read_unit"]


def judge_unit(
    paths: Sequence[Path],
    limits: Limits,
    *,
    serial: str | None = None,
    judged_at: datetime,
    progress: Callable[[int, int], None] | None = None,
) -> Record:
    """The record of one logged unit.

    Parameters
    ----------
    paths
        Its logs: every file and sheet a stage, or a part of one.
    serial
        Goes before what the logs say.
    judged_at
        With its zone.

    Raises
    ------
    LogError
        If a log cannot be read.
    SeveralSerialsError
        If the logs are of several units.
    """
    log = read_unit(paths, limits, serial=serial, progress=progress)
    points = find_points(log, limits)
    results = check_points(points)
    decided = [decide(outcome, limits.decision) for result in results for outcome in result.outcomes]
    figures = merged([figure for result in results for figure in result.figures])
    return make_record(points, decided, figures, judged_at=judged_at)


def read_unit(
    paths: Sequence[Path],
    limits: Limits,
    *,
    serial: str | None = None,
    progress: Callable[[int, int], None] | None = None,
) -> BenchLog:
    """The log of one unit, read as the limits and bench files say, with every doubt about its samples."""
    log = read_logs(
        paths,
        columns=limits.columns,
        stated=limits.stated,
        load_mode=limits.load_mode,
        outputs=limits.outputs,
        serial=serial,
        progress=progress,
    )
    plate = limits.ratings
    doubts = check_health(
        log,
        supply=plate.input.supply,
        rated_input_voltage=plate.input.voltage,
        rated={name: (output.voltage, output.current) for name, output in plate.outputs.items()},
    )
    return replace(log, doubts=(*log.doubts, *doubts))


def find_points(log: BenchLog, limits: Limits) -> Points:
    """The steady points of a log; what cannot be true of them is a doubt."""
    rated = {name: output.current for name, output in limits.ratings.outputs.items()}
    found = find_dwells(log, settle=limits.settle, min_dwell=limits.min_dwell, rated=rated)
    called = overloads_told(log, found.dwells, limits)
    log = replace(log, doubts=(*log.doubts, *found.doubts, *mostly_unsteady(log, called)))
    points = measure_points(log, called, limits)
    doubts = doubt_points(points)
    if not doubts:
        return points
    dwells = [point.dwell for point in points.all]
    return measure_points(replace(log, doubts=(*log.doubts, *doubts)), dwells, limits, before=points)


def check_points(points: Points) -> list[CheckResult]:
    """What every check has to say, in the order of the report."""
    asked = points.limits.requirements
    by_kind = {kind: [r for r in asked if r.characteristic == kind] for kind in CHECKS}
    return [CHECKS[kind](requirements, points) for kind, requirements in by_kind.items() if requirements]
