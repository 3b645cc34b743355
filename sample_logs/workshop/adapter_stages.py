"""Logs of the mains adapter, bench 1: overload, soak, and its winding before and after."""

from __future__ import annotations

from datetime import datetime, timedelta

import numpy as np

from workshop.adapter_logs import A17_NOTES, A17_START
from workshop.dialects import Column, Dialect, text_log
from workshop.logfile import LogFile
from workshop.overload import LoadStep, run_overload
from workshop.soak import Room, SoakRun, WindingRun, rises_in, run_soak, run_winding
from workshop.units import ADAPTER, ADAPTER_LIMITER, ADAPTER_WINDING, BENCH_1

NEXT_DAY = A17_START + timedelta(hours=21)  # cold, after a night in the room
SOAK = 4 * 3600.0  # [s]
ROOM = Room((0.0, 9000.0, SOAK), (23.4, 24.3, 24.5))


def a17_overcurrent() -> LogFile:
    """The unit of the main demo swept into hiccup by a resistive load, shorted, and released."""
    steps = [LoadStep(load, 3.0) for load in (12.0, 9.6, 9.0, 8.6, 8.2, 7.9, 7.8)]
    steps += [LoadStep(load, 5.0) for load in (7.7, 7.4, 6.6, 5.0, 3.0, 1.2, 0.3)]
    steps += [LoadStep(0.1, 5.4), LoadStep(9.6, 8.0)]  # released between two tries
    run = run_overload(ADAPTER, BENCH_1, ADAPTER_LIMITER, steps=steps, rate=25.0, seed=1702)
    columns = [
        Column("time", "timestamp"),
        Column("load_mode", "load mode"),
        Column("load_setting main", "load setting (ohm)", decimals=2),
        Column("input_voltage", "Vin (V)", decimals=2),
        Column("input_power", "Pin (W)", decimals=3),
        Column("output_voltage main", "Vout (V)", decimals=3),
        Column("output_current main", "Iout (A)", decimals=4),
    ]
    start = A17_START + timedelta(minutes=20)
    data = text_log(run.samples, columns, dialect=Dialect(above=A17_NOTES), start=start)
    return LogFile(data, ADAPTER, BENCH_1, overload=run)


def _soak() -> SoakRun:
    return run_soak(ADAPTER, BENCH_1, ROOM, seconds=SOAK, interval=20.0, seed=1704)


def a17_cold() -> LogFile:
    """The winding's resistance before the soak, all at the temperature of the room."""
    times = np.arange(0.0, 60.0, 10.0)
    ambient = np.full(len(times), ROOM.temperatures[0])
    run = run_winding(ADAPTER_WINDING, BENCH_1, times=times, ambient=ambient, rises=np.zeros(len(times)), seed=1703)
    return LogFile(_winding_log(run, NEXT_DAY), ADAPTER, BENCH_1, winding=run)


def a17_thermal() -> LogFile:
    """Four hours at full load from cold, sampled every 20 s, while the room warms by a kelvin."""
    run = _soak()
    columns = [
        Column("time", "timestamp"),
        Column("input_voltage", "Vin (V)", decimals=2),
        Column("input_power", "Pin (W)", decimals=3),
        Column("output_voltage main", "Vout (V)", decimals=3),
        Column("output_current main", "Iout (A)", decimals=4),
        Column("ambient_temperature", "T_amb (°C)", decimals=2),
        Column("temperature case", "T_case (°C)", decimals=2),
        Column("temperature core", "T_core (°C)", decimals=2),
    ]
    start = NEXT_DAY + timedelta(minutes=5)
    data = text_log(run.samples, columns, dialect=Dialect(above=A17_NOTES), start=start)
    return LogFile(data, ADAPTER, BENCH_1, soak=run)


def a17_cooling() -> LogFile:
    """The winding's resistance after the soak; time counts from switch-off."""
    times = np.arange(12.0, 312.0, 10.0)
    rises = rises_in(ROOM, ADAPTER.heat, 0.0, seconds=times, start=_soak().ended, begins=SOAK)[:, 0]
    run = run_winding(ADAPTER_WINDING, BENCH_1, times=times, ambient=ROOM.at(SOAK + times), rises=rises, seed=1705)
    switched_off = NEXT_DAY + timedelta(minutes=5, seconds=SOAK)
    return LogFile(_winding_log(run, switched_off), ADAPTER, BENCH_1, winding=run)


def _winding_log(run: WindingRun, start: datetime) -> bytes:
    columns = [
        Column("time", "time (s)"),
        Column("winding_resistance", "winding resistance (mohm)", scale=1e3, decimals=2),
        Column("ambient_temperature", "T_amb (°C)", decimals=2),
    ]
    notes = (*A17_NOTES, f"# date: {start:%Y-%m-%d}")
    return text_log(run.samples, columns, dialect=Dialect(clock="seconds", above=notes), start=start)
