"""How a log is read, as plain values for a person or a machine to look at."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from pathlib import Path

import numpy as np

from acceptance.bench.health import check_health
from acceptance.bench.log import QUANTITIES, BenchLog, Channel, Doubt, channel_key
from acceptance.bench.read import read_logs
from acceptance.limitfile.benchpart import BenchPart
from acceptance.limitfile.limits import Limits
from acceptance.points.dwells import Dwell, find_dwells
from acceptance.points.type_a import type_a
from acceptance.units import KINDS

__all__ = ["DwellShown", "Inspection", "inspect_logs", "log_block"]

# what a judgement rests on: named in the block where the log seems not to have it
_WANTED = ("input_voltage", "input_power", "output_voltage", "output_current")


@dataclass(frozen=True, slots=True)
class DwellShown:
    """One dwell as `inspect` shows it."""

    number: int  # from 1
    stage: str
    where: str
    found_by: str
    starts: float | None  # [s]
    duration: float | None  # [s]
    readings: int
    settling: int  # samples left out before it
    means: dict[str, float]  # channel -> mean, SI
    u: dict[str, float | None]  # channel -> standard uncertainty of the mean by the spread alone, SI


@dataclass(frozen=True, slots=True)
class Inspection:
    """All that there is to see of a reading."""

    log: BenchLog
    dwells: tuple[DwellShown, ...]
    doubts: tuple[Doubt, ...]
    block: str  # YAML to paste, "" where nothing is to be said


def inspect_logs(paths: Sequence[Path], limits: Limits | None = None, *, bench: BenchPart | None = None) -> Inspection:
    """How the logs of one unit are read: with a limits file, with a bench file alone, or with neither.

    Raises
    ------
    LogError
        If a log cannot be read.
    """
    if limits is not None:
        from acceptance.judge import find_points, read_unit

        points = find_points(read_unit(paths, limits), limits)
        dwells = [point.dwell for point in points.all]
        return Inspection(points.log, _shown(points.log, dwells), points.log.doubts, log_block(points.log))
    told = bench or BenchPart()
    log = read_logs(paths, columns=told.columns, stated=told.stated, load_mode=told.load_mode)
    found = find_dwells(log, settle=told.settle, min_dwell=told.min_dwell)
    doubts = (*log.doubts, *check_health(log), *found.doubts)
    return Inspection(log, _shown(log, found.dwells), doubts, log_block(log))


def _shown(log: BenchLog, dwells: Sequence[Dwell]) -> tuple[DwellShown, ...]:
    numeric = [c.key for c in log.channels if QUANTITIES[c.quantity] in KINDS and c.quantity != "time"]
    numeric += [c.key for c in log.channels if c.quantity == "load_setting" and c.key in log.samples]
    return tuple(_one(log, dwell, number, numeric) for number, dwell in enumerate(dwells, start=1))


def _one(log: BenchLog, dwell: Dwell, number: int, keys: Sequence[str]) -> DwellShown:
    span = (dwell.first, dwell.stop)
    table, first, last = log.rows_of(span)
    means: dict[str, float] = {}
    us: dict[str, float | None] = {}
    for key in keys:
        samples = log.part(key, *span)
        finite = samples[np.isfinite(samples)]
        if finite.size:
            spread = type_a(finite)
            means[key], us[key] = spread.mean, spread.standard_uncertainty
    time = log.part("time", *span)[[0, -1]] if "time" in log.samples else None
    known = time is not None and bool(np.isfinite(time).all())
    return DwellShown(
        number=number,
        stage=dwell.stage,
        where=f"{table}, line {first}" if first == last else f"{table}, lines {first} to {last}",
        found_by=dwell.from_,
        starts=float(time[0]) if time is not None and known else None,
        duration=float(time[1] - time[0]) if time is not None and known else None,
        readings=span[1] - span[0],
        settling=dwell.first - dwell.begins,
        means=means,
        u=us,
    )


def log_block(log: BenchLog) -> str:
    """A `log:` block for a limits or bench file: what was assumed, said, and what was not understood, asked."""
    told = [_choice(channel) for channel in log.channels if channel.unit_from == "assumed" and channel.unit]
    there = {channel.quantity for channel in log.channels} | set(log.stated)
    missing = [quantity for quantity in _WANTED if quantity not in there]
    left_out = dict.fromkeys(one.what for one in log.ignored if one.what.startswith("column"))
    asked = [
        f"    # {quantity}: not found in the log; write its heading, or take this line out" for quantity in missing
    ]
    asked += [f"    # left out: {_comment(what)}" for what in left_out]
    if not told and not missing:
        return ""
    return "\n".join(["log:", "  columns:", *told, *asked])


def _choice(channel: Channel) -> str:
    unit = f", unit: {channel.unit}" if channel.unit else ""
    key = channel_key(channel.quantity, channel.qualifier)
    return f"    {key}: {{heading: {_quoted(channel.heading)}{unit}}}"


def _quoted(text: str) -> str:
    escaped = text.replace("\\", "\\\\").replace('"', '\\"')
    return '"' + "".join(c if c.isprintable() else f"\\x{ord(c) & 0xFF:02x}" for c in escaped) + '"'


def _comment(text: str) -> str:
    return "".join(c if c.isprintable() else " " for c in text)
