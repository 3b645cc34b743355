"""Every log of the folder above, by its name, as a function that makes it."""

from __future__ import annotations

from collections.abc import Callable, Mapping

from workshop import adapter_logs, converter_logs, supply_logs, two_output_logs
from workshop.logfile import LogFile

__all__ = ["FILES", "LogFile"]

FILES: Mapping[str, Callable[[], LogFile]] = {
    "A-17_steady.csv": adapter_logs.a17_steady,
    "A-17_overcurrent.csv": adapter_logs.a17_overcurrent,
    "A-17_cold.csv": adapter_logs.a17_cold,
    "A-17_thermal.csv": adapter_logs.a17_thermal,
    "A-17_cooling.csv": adapter_logs.a17_cooling,
    "A-18.csv": adapter_logs.a18,
    "A-19.csv": adapter_logs.a19,
    "A-20_steady.csv": adapter_logs.a20_steady,
    "A-21.csv": adapter_logs.a21,
    "A-22.csv": adapter_logs.a22,
    "B-203.xlsx": supply_logs.b203,
    "B-204.tsv": supply_logs.b204,
    "B-205.txt": supply_logs.b205,
    "D-0412.csv": converter_logs.d0412,
    "D-0413.csv": converter_logs.d0413,
    "D-0414.csv": converter_logs.d0414,
    "D-0415.tsv": converter_logs.d0415,
    "M-31.txt": two_output_logs.m31,
    "M-32.csv": two_output_logs.m32,
}
