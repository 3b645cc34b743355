"""Logs of the bench supply, bench 2: a workbook, and steady tests."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import replace
from datetime import datetime, timedelta

import numpy as np
import pandas as pd

from workshop.dialects import Column, Dialect, cells, text_log
from workshop.logfile import LogFile, at
from workshop.overload import run_overload
from workshop.sequence import run_sequence
from workshop.supply_stages import bench_supply_steps, limiter_steps
from workshop.units import (
    BENCH_2,
    BENCH_SUPPLY,
    BENCH_SUPPLY_LIMITER,
    with_port,
)
from workshop.workbook import Cell, workbook


def b203() -> LogFile:
    """A workbook: the table off the corner, notes beside it, sheets as stages, date and time in the cells."""
    run = run_sequence(BENCH_SUPPLY, BENCH_2, bench_supply_steps(32.0), rate=2.0, seed=20301)
    swept = run_overload(BENCH_SUPPLY, BENCH_2, BENCH_SUPPLY_LIMITER, steps=limiter_steps(), rate=4.0, seed=20302)
    steady = [
        Column("time", "Timestamp"),
        Column("load_setting main", "I set [A]", decimals=2),
        Column("input_voltage", "Vin [V]", decimals=1),
        Column("input_power", "Pin [W]", decimals=3),
        Column("output_voltage main", "Vout [V]", decimals=4),
        Column("output_current main", "Iout [A]", decimals=4),
        Column("ripple main", "Ripple [mV]", scale=1e3, decimals=2),
    ]
    overload = [*steady[:-1], Column("load_mode", "Load mode")]
    overload[1] = Column("load_setting main", "Load setting [ohm]", decimals=2)
    start = at(2026, 6, 2, 10, 5)
    notes = {"serial": "B-203", "operator": "J. Q.", "set": "30.00 V, limit 3.2 A"}
    sheets: dict[str, Sequence[Sequence[Cell]]] = {
        "about": [["Tarnbeck Bench Works"], ["Bench supply, final test"], ["Table sheets are named after their stage"]],
        "steady": _placed(_table(run.samples, steady, start), notes),
        "overcurrent": _placed(_table(swept.samples, overload, start + timedelta(minutes=12)), {}),
    }
    data = workbook(sheets, author="Tarnbeck Bench Works", created=start)
    return LogFile(data, BENCH_SUPPLY, BENCH_2, run, overload=swept)


def _table(samples: pd.DataFrame, columns: Sequence[Column], start: datetime) -> list[list[Cell]]:
    written: list[list[Cell]] = []
    for column in columns:
        if column.key == "time":
            written.append([start + timedelta(seconds=float(t)) for t in samples["time"]])
        elif column.key == "load_mode":
            written.append([str(mode) for mode in samples["load_mode"]])
        else:
            written.append([float(text) for text in cells(samples[column.key].tolist(), column)])
    headings: list[Cell] = [column.heading for column in columns]
    return [headings, *(list(row) for row in zip(*written, strict=True))]


def _placed(table: Sequence[list[Cell]], notes: Mapping[str, str]) -> list[list[Cell]]:
    """The table from C5 on, a title above it, and notes to its right after an empty column."""
    rows: list[list[Cell]] = [[None, "Final test, bench 2"], [], [], []]
    beside: list[list[Cell]] = [[None, key, value] for key, value in notes.items()]
    for number, row in enumerate(table):
        rows.append([None, None, *row, *(beside[number] if number < len(beside) else [])])
    return rows


def b204() -> LogFile:
    """A dried-out output capacitor: tabs, UTF-16 with mark."""
    dry = with_port(BENCH_SUPPLY, ripple=0.0034, ripple_slope=0.0021)
    run = run_sequence(dry, BENCH_2, bench_supply_steps(36.0), rate=2.0, seed=20401)
    columns = [
        Column("time", "Time (s)"),
        Column("load_setting main", "Load setting (A)", decimals=2),
        Column("input_voltage", "Vin (V)", decimals=1),
        Column("input_power", "Pin (W)", decimals=3),
        Column("output_voltage main", "Vout (V)", decimals=4),
        Column("output_current main", "Iout (A)", decimals=4),
        Column("ripple main", "Ripple (mV)", scale=1e3, decimals=2),
    ]
    notes = ("serial\tB-204", "date\t2026-06-03", "operator\tM. F.")
    dialect = Dialect("\t", encoding="utf-16-le", newline="\r\n", clock="seconds", above=notes)
    data = text_log(run.samples, columns, dialect=dialect, start=at(2026, 6, 3, 9, 0))
    return LogFile(data, dry, BENCH_2, run)


def b205() -> LogFile:
    """The voltmeter hung at full load and nobody saw it: bars."""
    run = run_sequence(BENCH_SUPPLY, BENCH_2, bench_supply_steps(40.0), rate=2.0, seed=20501)
    samples = run.samples.copy()
    hung = int(np.flatnonzero(samples["load_setting main"] == 3.0)[40])
    samples.loc[hung:, "output_voltage main"] = samples.loc[hung, "output_voltage main"]
    columns = [
        Column("time", "t / s"),
        Column("load_setting main", "load_setting / A", decimals=2),
        Column("input_voltage", "Vin / V", decimals=1),
        Column("input_power", "Pin / W", decimals=3),
        Column("output_voltage main", "Vout / V", decimals=4),
        Column("output_current main", "Iout / A", decimals=4),
        Column("ripple main", "ripple / mV", scale=1e3, decimals=2),
    ]
    notes = ("serial: B-205", "date: 2026-06-04")
    dialect = Dialect("|", clock="seconds", above=notes)
    data = text_log(samples, columns, dialect=dialect, start=at(2026, 6, 4, 9, 0))
    return LogFile(data, BENCH_SUPPLY, BENCH_2, replace(run, samples=samples))
