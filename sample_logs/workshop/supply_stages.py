"""Logs of the bench supply, bench 2: its current limit and its soak, one file a stage."""

from __future__ import annotations

from dataclasses import replace
from datetime import timedelta

from workshop.dialects import Column, Dialect, text_log
from workshop.logfile import LogFile, at, sweep
from workshop.overload import LoadStep, run_overload
from workshop.sequence import Step, run_sequence
from workshop.soak import Room, run_soak
from workshop.units import BENCH_2, BENCH_SUPPLY, BENCH_SUPPLY_LIMITER, BLOCKED

DUSTY = replace(BENCH_SUPPLY, heat=BLOCKED)
_B206_START = at(2026, 6, 8, 8, 30)
_B206_NOTES = ("serial\tB-206", "operator\tM. F.", "remark\treturned from the field, slots full of dust")
_B206 = Dialect("\t", ",", encoding="utf-8-sig", newline="\r\n", above=_B206_NOTES)


def bench_supply_steps(seconds: float) -> list[Step]:
    """The bench supply's programme at 30 V: no load up to full load, then the input from 207 V to 253 V."""
    lines = [step for volts in (207.0, 253.0) for step in sweep(BENCH_SUPPLY, [1.0], volts, seconds)]
    return sweep(BENCH_SUPPLY, [0.0, 0.1, 0.25, 0.5, 0.75, 1.0], 230.0, seconds) + lines


def limiter_steps() -> list[LoadStep]:
    """Resistors from a light load into the current limit, a short, and back to rated load."""
    loads = (20.0, 12.0, 10.0, 9.6, 9.4, 9.2, 8.5, 7.4, 6.0, 4.5, 3.4, 2.2, 1.2, 0.6, 0.1, 10.0)
    return [LoadStep(load, 5.0) for load in loads]


def _soak_columns() -> list[Column]:
    return [
        Column("time", "Time"),
        Column("input_voltage", "Vin [V]", decimals=1),
        Column("input_power", "Pin [W]", decimals=3),
        Column("output_voltage main", "Vout [V]", decimals=4),
        Column("output_current main", "Iout [A]", decimals=4),
        Column("ambient_temperature", "T_amb [°C]", decimals=1),
        Column("temperature case", "T_case [°C]", decimals=1),
    ]


def b203_thermal() -> LogFile:
    """The soak of the unit in the workbook: four hours, settled; bars, clock times."""
    room = Room((0.0, 6000.0, 14400.0), (22.1, 22.9, 23.0))
    run = run_soak(BENCH_SUPPLY, BENCH_2, room, seconds=4 * 3600.0, interval=20.0, seed=20303)
    notes = (
        "# serial: B-203",
        "# date: 2026-06-02",
        "# operator: J. Q.",
        "# soak from cold, probe on the heatsink side",
    )
    dialect = Dialect("|", clock="clock", above=notes)
    data = text_log(run.samples, _soak_columns(), dialect=dialect, start=at(2026, 6, 2, 12, 40))
    return LogFile(data, BENCH_SUPPLY, BENCH_2, soak=run)


def b206_steady() -> LogFile:
    """A unit full of dust, good in everything but its warmth: tabs, decimal comma, UTF-8 with mark."""
    run = run_sequence(DUSTY, BENCH_2, bench_supply_steps(32.0), rate=2.0, seed=20601)
    columns = [
        Column("time", "Time"),
        Column("load_setting main", "Load setting [A]", decimals=2),
        *_soak_columns()[1:5],
        Column("ripple main", "Ripple [mV]", scale=1e3, decimals=2),
    ]
    return LogFile(text_log(run.samples, columns, dialect=_B206, start=_B206_START), DUSTY, BENCH_2, run)


def b206_overcurrent() -> LogFile:
    """The same unit's current limit."""
    run = run_overload(DUSTY, BENCH_2, BENCH_SUPPLY_LIMITER, steps=limiter_steps(), rate=4.0, seed=20602)
    columns = [
        Column("time", "Time"),
        Column("load_mode", "Load mode"),
        Column("load_setting main", "Load setting [ohm]", decimals=2),
        *_soak_columns()[1:5],
    ]
    start = _B206_START + timedelta(minutes=12)
    return LogFile(text_log(run.samples, columns, dialect=_B206, start=start), DUSTY, BENCH_2, overload=run)


def b206_thermal() -> LogFile:
    """Its soak, stopped after 50 min, below the limit that the unit would exceed in the end."""
    room = Room((0.0, 3000.0), (22.1, 22.5))
    run = run_soak(DUSTY, BENCH_2, room, seconds=50 * 60.0, interval=10.0, seed=20603)
    start = _B206_START + timedelta(hours=5)
    return LogFile(text_log(run.samples, _soak_columns(), dialect=_B206, start=start), DUSTY, BENCH_2, soak=run)
