"""Logs of the d.c.-d.c. converter, bench 3."""

from __future__ import annotations

from dataclasses import replace

import numpy as np

from workshop.dialects import Column, Dialect, text_log
from workshop.logfile import LogFile, at, sweep
from workshop.sequence import Step, run_sequence
from workshop.units import (
    BENCH_3,
    CONVERTER,
    with_port,
)


def converter_steps(seconds: float) -> list[Step]:
    """The converter's programme: loads at 48 V, then full load at 36 V and 60 V."""
    lines = [step for volts in (36.0, 60.0) for step in sweep(CONVERTER, [1.0], volts, seconds)]
    return sweep(CONVERTER, [1.0, 0.75, 0.5, 0.25, 0.0], 48.0, seconds) + lines


def _converter_columns(*, ripple: str = "mV") -> list[Column]:
    return [
        Column("time", "time", "s"),
        Column("input_voltage", "Vin", "V", decimals=3),
        Column("input_current", "Iin", "A", decimals=5),
        Column("output_voltage main", "Vout", "V", decimals=4),
        Column("output_current main", "Iout", "A", decimals=4),
        Column("ripple main", "ripple", ripple, scale=1e3, decimals=1),
        Column("temperature case", "T_case", "°C", decimals=1),
    ]


def d0412() -> LogFile:
    """A good converter, power from volts and amperes: comma, the units in a row under the headings."""
    run = run_sequence(CONVERTER, BENCH_3, converter_steps(40.0), rate=4.0, seed=41201)
    notes = ("# serial: D-0412", "# date: 2026-06-15", "# operator: M. F.")
    dialect = Dialect(clock="seconds", units="row below", above=notes)
    data = text_log(run.samples, _converter_columns(), dialect=dialect, start=at(2026, 6, 15, 9, 0))
    return LogFile(data, CONVERTER, BENCH_3, run)


def d0413() -> LogFile:
    """A person with a pencil: one row a condition, a clock of minutes, units in the cells."""
    run = run_sequence(CONVERTER, BENCH_3, converter_steps(60.0), rate=1.0, seed=41301)
    ends = np.cumsum([step.seconds for step in converter_steps(60.0)]).astype(int) - 1
    averaged = run.samples.rolling(10).mean().assign(time=run.samples["time"])  # displays that average over 10 s
    samples = averaged.iloc[ends].reset_index(drop=True)
    columns = [
        Column("time", "clock"),
        Column("load_setting main", "load setting", "A", decimals=1),
        Column("input_voltage", "Vin", "V", decimals=2),
        Column("input_current", "Iin", "A", decimals=4),
        Column("output_voltage main", "Vout", "V", decimals=3),
        Column("output_current main", "Iout", "A", decimals=3),
        Column("ripple main", "ripple", "mV", scale=1e3, decimals=0),
    ]
    notes = ("serial: D-0413", "date: 2026-06-16", "read and written down by: M. F.", "")
    dialect = Dialect(";", clock="minutes", units="in cell", between=" ", above=notes)
    data = text_log(samples, columns, dialect=dialect, start=at(2026, 6, 16, 14, 0))
    return LogFile(data, CONVERTER, BENCH_3, replace(run, samples=samples))


def d0414() -> LogFile:
    """A bad switch, seen at full load; clock times over midnight: comma, Latin-1."""
    lossy = with_port(CONVERTER, square_loss=0.07)
    run = run_sequence(lossy, BENCH_3, converter_steps(40.0), rate=4.0, seed=41401)
    columns = [
        Column("time", "clock"),
        Column("load_setting main", "I_set [A]", decimals=1),
        Column("input_voltage", "Vin [V]", decimals=3),
        Column("input_current", "Iin [A]", decimals=5),
        Column("output_voltage main", "Vout [V]", decimals=4),
        Column("output_current main", "Iout [A]", decimals=4),
        Column("ripple main", "ripple [mV]", scale=1e3, decimals=1),
        Column("temperature case", "T_case [°C]", decimals=1),
    ]
    notes = ("# serial: D-0414", "# date: 2026-06-16", "# night shift, 24 °C in the room")
    dialect = Dialect(clock="clock", encoding="latin-1", newline="\r\n", above=notes)
    data = text_log(run.samples, columns, dialect=dialect, start=at(2026, 6, 16, 23, 57))
    return LogFile(data, lossy, BENCH_3, run)


def d0415() -> LogFile:
    """A good converter, measured after the load's shunt was due for calibration: tabs."""
    run = run_sequence(CONVERTER, BENCH_3, converter_steps(30.0), rate=4.0, seed=41501)
    notes = ("# serial: D-0415", "# date: 2026-09-14", "# operator: J. Q.")
    dialect = Dialect("\t", clock="seconds", units="row below", above=notes)
    data = text_log(run.samples, _converter_columns(), dialect=dialect, start=at(2026, 9, 14, 9, 0))
    return LogFile(data, CONVERTER, BENCH_3, run)
