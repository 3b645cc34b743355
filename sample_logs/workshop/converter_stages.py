"""Logs of the d.c.-d.c. converter, bench 3: foldback, soak, and its winding before and after, one file a stage."""

from __future__ import annotations

from datetime import datetime, timedelta

import numpy as np

from workshop.converter_logs import converter_steps
from workshop.dialects import Column, Dialect, text_log
from workshop.logfile import LogFile, at
from workshop.overload import ConstantCurrent, Limiter, LoadStep, OverloadRun, run_overload
from workshop.sequence import run_sequence
from workshop.soak import Room, SoakRun, WindingRun, rises_in, run_soak, run_winding
from workshop.units import BENCH_3, CONVERTER, CONVERTER_LIMITER, CONVERTER_WINDING

NOT_FOLDED = ConstantCurrent(limit=9.42, slope=0.004, rise=0.04)  # the foldback network was not fitted
SOAK = 2.5 * 3600.0  # [s]
ROOM = Room((0.0, 3600.0, SOAK), (24.3, 24.9, 25.3))
_D0416_START = at(2026, 6, 17, 8, 15)
_D0416_NOTES = ("# serial;D-0416", "# operator;J. Q.", "# bench;3")
_D0416 = Dialect(";", ",", newline="\r\n", clock="day and clock", above=_D0416_NOTES)
_D0417_START = at(2026, 6, 18, 13, 40)


def _times() -> list[Column]:
    return [Column("day", "Date"), Column("time", "Time")]


def _powers() -> list[Column]:
    return [
        Column("input_voltage", "Vin/V", decimals=3),
        Column("input_current", "Iin/A", decimals=5),
        Column("output_voltage main", "Vout/V", decimals=4),
        Column("output_current main", "Iout/A", decimals=4),
    ]


def _steady(seed: int, start: datetime, *, dialect: Dialect, times: list[Column]) -> LogFile:
    run = run_sequence(CONVERTER, BENCH_3, converter_steps(30.0), rate=3.0, seed=seed)
    columns = [*times, *_powers(), Column("ripple main", "ripple/mV", scale=1e3, decimals=1)]
    return LogFile(text_log(run.samples, columns, dialect=dialect, start=start), CONVERTER, BENCH_3, run)


def _overcurrent(run: OverloadRun, start: datetime, *, dialect: Dialect, columns: list[Column]) -> LogFile:
    data = text_log(run.samples, columns, dialect=dialect, start=start)
    return LogFile(data, CONVERTER, BENCH_3, overload=run)


def _swept(limiter: Limiter, steps: list[LoadStep], *, seed: int) -> OverloadRun:
    return run_overload(CONVERTER, BENCH_3, limiter, steps=steps, rate=5.0, seed=seed)


def d0416_steady() -> LogFile:
    """A good converter with foldback: semicolons, decimal comma, day and clock in two columns."""
    return _steady(41601, _D0416_START, dialect=_D0416, times=_times())


def d0416_overcurrent() -> LogFile:
    """Resistors into the foldback, a short, and back to rated load."""
    loads = (6.0, 3.0, 2.0, 1.5, 1.4, 1.34, 1.3, 1.27, 1.25, 1.2, 1.1, 1.0, 0.85, 0.7, 0.55, 0.4, 0.2, 0.02)
    steps = [LoadStep(load, 4.0) for load in (*loads, 1.5)]
    mode = [Column("load_mode", "load mode"), Column("load_setting main", "load setting/ohm", decimals=3)]
    run = _swept(CONVERTER_LIMITER, steps, seed=41602)
    start = _D0416_START + timedelta(minutes=15)
    return _overcurrent(run, start, dialect=_D0416, columns=[*_times(), *mode, *_powers()])


def _soak() -> SoakRun:
    return run_soak(CONVERTER, BENCH_3, ROOM, seconds=SOAK, interval=10.0, seed=41604)


_SOAK_START = _D0416_START + timedelta(hours=24, minutes=5)


def d0416_cold() -> LogFile:
    """The winding's resistance after a night in the room."""
    times = np.arange(0.0, 80.0, 10.0)
    ambient = np.full(len(times), ROOM.temperatures[0])
    run = run_winding(CONVERTER_WINDING, BENCH_3, times=times, ambient=ambient, rises=np.zeros(len(times)), seed=41603)
    return LogFile(_winding_log(run, _SOAK_START - timedelta(minutes=5)), CONVERTER, BENCH_3, winding=run)


def d0416_thermal() -> LogFile:
    """Two and a half hours at full load from cold, sampled every 10 s."""
    run = _soak()
    temperatures = [
        Column("ambient_temperature", "T_amb/°C", decimals=1),
        Column("temperature case", "T_case/°C", decimals=1),
        Column("temperature core", "T_core/°C", decimals=1),
    ]
    data = text_log(run.samples, [*_times(), *_powers(), *temperatures], dialect=_D0416, start=_SOAK_START)
    return LogFile(data, CONVERTER, BENCH_3, soak=run)


def d0416_cooling() -> LogFile:
    """The winding's resistance after the soak, its time counted from switch-off."""
    times = np.arange(8.0, 248.0, 8.0)
    rises = rises_in(ROOM, CONVERTER.heat, 0.0, seconds=times, start=_soak().ended, begins=SOAK)[:, 0]
    run = run_winding(CONVERTER_WINDING, BENCH_3, times=times, ambient=ROOM.at(SOAK + times), rises=rises, seed=41605)
    return LogFile(_winding_log(run, _SOAK_START + timedelta(seconds=SOAK)), CONVERTER, BENCH_3, winding=run)


def _winding_log(run: WindingRun, start: datetime) -> bytes:
    columns = [
        Column("time", "time/s"),
        Column("winding_resistance", "winding resistance/mohm", scale=1e3, decimals=3),
        Column("ambient_temperature", "T_amb/°C", decimals=1),
    ]
    notes = (*_D0416_NOTES, f"# date;{start:%Y-%m-%d}")
    return text_log(
        run.samples, columns, dialect=Dialect(";", ",", newline="\r\n", clock="seconds", above=notes), start=start
    )


def d0417_steady() -> LogFile:
    """A converter without its foldback network, good up to rated load: comma, seconds."""
    return _steady(41701, _D0417_START, dialect=_seconds(_D0417_START), times=[Column("time", "time/s")])


def d0417_overcurrent() -> LogFile:
    """Swept down in CV mode: it holds its current to the short, where it was to fold back."""
    volts = (
        12.03,
        12.02,
        12.015,
        12.01,
        12.005,
        12.0,
        11.997,
        11.9,
        11.6,
        11.2,
        10.5,
        9.5,
        8.5,
        7.0,
        5.5,
        4.0,
        2.5,
        1.2,
        0.4,
        0.1,
    )
    steps = [LoadStep(level, 4.0, "CV") for level in (*volts, 12.005)]
    mode = [Column("load_mode", "load mode"), Column("load_setting main", "load setting/V", decimals=3)]
    run = _swept(NOT_FOLDED, steps, seed=41702)
    start = _D0417_START + timedelta(minutes=10)
    columns = [Column("time", "time/s"), *mode, *_powers()]
    return _overcurrent(run, start, dialect=_seconds(start), columns=columns)


def _seconds(start: datetime) -> Dialect:
    notes = ("# serial: D-0417", f"# date: {start:%Y-%m-%d}", "# operator: M. F.", "# bench: 3")
    return Dialect(clock="seconds", above=notes)
