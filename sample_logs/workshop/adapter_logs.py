"""Logs of the mains adapter, bench 1: its steady test."""

from __future__ import annotations

from collections.abc import Sequence
from datetime import timedelta, timezone

from workshop.dialects import Column, Dialect, text_log
from workshop.logfile import LogFile, at, sweep
from workshop.products import Product
from workshop.sequence import Step, run_sequence
from workshop.units import (
    ADAPTER,
    BENCH_1,
    BENCH_4,
    with_port,
)

SUMMER = timezone(timedelta(hours=2))
JOINT = 0.030  # resistance of a poor joint [ohm]
ADAPTER_LOADS = (1.0, 0.75, 0.5, 0.25, 0.1, 0.0)


def _adapter(**changes: float) -> Product:
    return with_port(ADAPTER, "main", **changes)


def adapter_steps(seconds: float, loads: Sequence[float] = ADAPTER_LOADS) -> list[Step]:
    """The adapter's programme: loads at 230 V, then full load at 207, 230 and 253 V."""
    lines = [step for volts in (207.0, 230.0, 253.0) for step in sweep(ADAPTER, [1.0], volts, seconds)]
    return sweep(ADAPTER, loads, 230.0, seconds) + lines


A17_START = at(2026, 5, 4, 9, 10, SUMMER)
A17_NOTES = ("# workshop: Tarnbeck Bench Works", "# serial: A-17", "# operator: J. Q.", "# bench: 1")


def a17_steady() -> LogFile:
    """The good unit, with everything logged: comma, decimal point, UTF-8, date and time with zone."""
    run = run_sequence(ADAPTER, BENCH_1, adapter_steps(60.0), rate=4.0, seed=1701)
    columns = [
        Column("time", "timestamp"),
        Column("load_setting main", "I_set (A)", decimals=3),
        Column("input_voltage", "Vin (V)", decimals=2),
        Column("input_current", "Iin (A)", decimals=4),
        Column("input_power", "Pin (W)", decimals=3),
        Column("power_factor", "PF", decimals=3),
        Column("output_voltage main", "Vout (V)", decimals=3),
        Column("output_current main", "Iout (A)", decimals=4),
        Column("ripple main", "ripple (mV)", scale=1e3, decimals=1),
        Column("ambient_temperature", "T_amb (°C)", decimals=2),
        Column("temperature case", "T_case (°C)", decimals=2),
        Column("temperature core", "T_core (°C)", decimals=2),
    ]
    notes = (*A17_NOTES, "# warm-up: 30 min at full load before the first row")
    data = text_log(run.samples, columns, dialect=Dialect(above=notes), start=A17_START)
    return LogFile(data, ADAPTER, BENCH_1, run)


def a18() -> LogFile:
    """Lossy at half load, its core of a wrong grade under thick wire: semicolons, decimal comma, UTF-8 with mark."""
    lossy = _adapter(linear_loss=2.45, square_loss=0.04)
    run = run_sequence(lossy, BENCH_1, adapter_steps(40.0), rate=3.0, seed=1801)
    columns = [
        Column("time", "time [s]"),
        Column("input_voltage", "input_voltage [V]", decimals=2),
        Column("input_power", "input_power [W]", decimals=3),
        Column("output_voltage main", "output_voltage [V]", decimals=3),
        Column("output_current main", "output_current [mA]", scale=1e3, decimals=1),
        Column("ripple main", "ripple [mV]", scale=1e3, decimals=1),
        Column("ambient_temperature", "ambient_temperature [°C]", decimals=2),
    ]
    notes = ("serial;A-18", "date;2026-05-06", "operator;J. Q.", "remark;second sample of the batch", "")
    dialect = Dialect(";", ",", encoding="utf-8-sig", newline="\r\n", clock="seconds", above=notes)
    return LogFile(text_log(run.samples, columns, dialect=dialect, start=at(2026, 5, 6, 8, 0)), lossy, BENCH_1, run)


def a19() -> LogFile:
    """A poor joint at the output, 30 mohm: semicolons, decimal comma, Latin-1, day and clock in two columns."""
    good = _adapter(linear_loss=0.94).outputs["main"]
    poor = _adapter(linear_loss=0.94, resistance=good.resistance + JOINT, square_loss=good.square_loss + JOINT)
    run = run_sequence(poor, BENCH_1, adapter_steps(40.0), rate=3.0, seed=1901)
    columns = [
        Column("day", "Date"),
        Column("time", "Time"),
        Column("load_setting main", "I set/A", decimals=2),
        Column("input_voltage", "Uin/V", decimals=2),
        Column("input_power", "Pin/W", decimals=3),
        Column("output_voltage main", "Uout/V", decimals=3),
        Column("output_current main", "Iout/A", decimals=4),
        Column("ripple main", "Ripple/mV", scale=1e3, decimals=1),
        Column("ambient_temperature", "Tamb/°C", decimals=2),
    ]
    notes = ("Tarnbeck Bench Works;bench 1;ambient about 23 °C", "serial: A-19", "operator: M. F.")
    dialect = Dialect(";", ",", encoding="latin-1", newline="\r\n", clock="day and clock", above=notes)
    return LogFile(text_log(run.samples, columns, dialect=dialect, start=at(2026, 5, 18, 13, 25)), poor, BENCH_1, run)


def a20_steady() -> LogFile:
    """Nobody ran 75 % load: comma, clock times without a day, units in the cells."""
    loads = (1.0, 0.5, 0.25, 0.1, 0.0)
    good = _adapter(linear_loss=0.98)
    run = run_sequence(good, BENCH_1, adapter_steps(40.0, loads), rate=2.0, seed=2001)
    columns = [
        Column("time", "clock"),
        Column("input_voltage", "Vin", "V", decimals=2),
        Column("input_power", "Pin", "W", decimals=3),
        Column("output_voltage main", "Vout", "V", decimals=3),
        Column("output_current main", "Iout", "A", decimals=4),
        Column("ripple main", "ripple", "mV", scale=1e3, decimals=1),
    ]
    notes = ("# serial: A-20", "# date: 2026-05-19", "# operator: M. F.")
    dialect = Dialect(clock="clock", units="in cell", between=" ", above=notes)
    return LogFile(text_log(run.samples, columns, dialect=dialect, start=at(2026, 5, 19, 8, 2)), good, BENCH_1, run)


def a21() -> LogFile:
    """Volts and amperes of the mains, but no watts: comma, notes below the table."""
    run = run_sequence(ADAPTER, BENCH_1, adapter_steps(40.0), rate=2.0, seed=2101)
    columns = [
        Column("time", "time_s"),
        Column("load_setting main", "i_set_a", decimals=2),
        Column("input_voltage", "vin_v", decimals=2),
        Column("input_current", "iin_ma", scale=1e3, decimals=1),
        Column("output_voltage main", "vout_v", decimals=3),
        Column("output_current main", "iout_ma", scale=1e3, decimals=1),
        Column("ripple main", "ripple_mv", scale=1e3, decimals=1),
    ]
    below = ("", "# serial: A-21", "# date: 2026-05-20", "# the wattmeter was out on loan")
    dialect = Dialect(clock="seconds", below=below)
    return LogFile(text_log(run.samples, columns, dialect=dialect, start=at(2026, 5, 20, 8, 2)), ADAPTER, BENCH_1, run)


def a22() -> LogFile:
    """Just at the limit of a customer who decides conditionally; headings that only the bench file explains."""
    run = run_sequence(ADAPTER, BENCH_4, adapter_steps(40.0), rate=2.0, seed=2201)
    columns = [
        Column("time", "t [s]"),
        Column("input_voltage", "U1 [V]", decimals=2),
        Column("input_power", "P1 [W]", decimals=3),
        Column("output_voltage main", "U2 [V]", decimals=3),
        Column("output_current main", "I2 [A]", decimals=4),
        Column("ripple main", "scope", scale=1e3, decimals=1),
    ]
    notes = ("serial;A-22", "date;2026-05-26")
    dialect = Dialect(";", clock="seconds", above=notes)
    return LogFile(text_log(run.samples, columns, dialect=dialect, start=at(2026, 5, 26, 9, 0)), ADAPTER, BENCH_4, run)
