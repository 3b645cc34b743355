"""Logs of the supply with two outputs, bench 2."""

from __future__ import annotations

from workshop.dialects import Column, Dialect, text_log
from workshop.logfile import LogFile, at, sweep
from workshop.sequence import Step, run_sequence
from workshop.units import (
    BENCH_2,
    TWO_OUTPUT,
    with_port,
)


def two_output_steps(seconds: float) -> list[Step]:
    """Both outputs together at 230 V, each alone against the other at half load, then the input."""
    both = sweep(TWO_OUTPUT, [1.0, 0.75, 0.5, 0.25, 0.0], 230.0, seconds)
    crossed = [
        Step({"logic": logic, "drive": drive}, 230.0, seconds)
        for logic, drive in ((0.0, 0.5), (1.0, 0.5), (0.5, 0.0), (0.5, 1.0))
    ]
    lines = [step for volts in (207.0, 253.0) for step in sweep(TWO_OUTPUT, [1.0], volts, seconds)]
    return both + crossed + lines


def _two_output_columns() -> list[Column]:
    return [
        Column("time", "time [s]"),
        Column("load_setting logic", "load_setting logic [A]", decimals=2),
        Column("load_setting drive", "load_setting drive [A]", decimals=2),
        Column("input_voltage", "Vin [V]", decimals=1),
        Column("input_power", "Pin [W]", decimals=3),
        Column("output_voltage logic", "Vout logic [V]", decimals=4),
        Column("output_current logic", "Iout logic [A]", decimals=4),
        Column("output_voltage drive", "Vout_drive [V]", decimals=4),
        Column("output_current drive", "Iout_drive [mA]", scale=1e3, decimals=1),
        Column("ripple logic", "ripple.logic [mV]", scale=1e3, decimals=2),
        Column("ripple drive", "ripple.drive [mV]", scale=1e3, decimals=2),
    ]


def m31() -> LogFile:
    """A good unit with two outputs: bars."""
    run = run_sequence(TWO_OUTPUT, BENCH_2, two_output_steps(32.0), rate=3.0, seed=3101)
    notes = ("# serial: M-31", "# date: 2026-06-22", "# operator: M. F.")
    dialect = Dialect("|", clock="seconds", above=notes)
    data = text_log(run.samples, _two_output_columns(), dialect=dialect, start=at(2026, 6, 22, 9, 0))
    return LogFile(data, TWO_OUTPUT, BENCH_2, run)


def m32() -> LogFile:
    """The drive output rises too far with the load of the logic output: comma."""
    poor = with_port(TWO_OUTPUT, "drive", cross=-0.085)
    run = run_sequence(poor, BENCH_2, two_output_steps(32.0), rate=2.0, seed=3201)
    notes = ("# serial: M-32", "# date: 2026-06-22", "# operator: M. F.")
    dialect = Dialect(clock="seconds", above=notes)
    data = text_log(run.samples, _two_output_columns(), dialect=dialect, start=at(2026, 6, 22, 11, 0))
    return LogFile(data, poor, BENCH_2, run)
