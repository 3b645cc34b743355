"""Every log of the folder above, by its name, as a function that makes it."""

from __future__ import annotations

from collections.abc import Callable, Mapping

from workshop import (
    adapter_logs,
    adapter_stages,
    converter_logs,
    converter_stages,
    supply_logs,
    supply_stages,
    two_output_logs,
)
from workshop.logfile import LogFile

__all__ = ["FILES", "LogFile"]

FILES: Mapping[str, Callable[[], LogFile]] = {
    "A-17_steady.csv": adapter_logs.a17_steady,
    "A-17_overcurrent.csv": adapter_stages.a17_overcurrent,
    "A-17_cold.csv": adapter_stages.a17_cold,
    "A-17_thermal.csv": adapter_stages.a17_thermal,
    "A-17_cooling.csv": adapter_stages.a17_cooling,
    "A-18.csv": adapter_logs.a18,
    "A-19.csv": adapter_logs.a19,
    "A-20_steady.csv": adapter_logs.a20_steady,
    "A-21.csv": adapter_logs.a21,
    "A-22.csv": adapter_logs.a22,
    "B-203.xlsx": supply_logs.b203,
    "B-203_thermal.txt": supply_stages.b203_thermal,
    "B-204.tsv": supply_logs.b204,
    "B-205.txt": supply_logs.b205,
    "B-206_steady.tsv": supply_stages.b206_steady,
    "B-206_overcurrent.tsv": supply_stages.b206_overcurrent,
    "B-206_thermal.tsv": supply_stages.b206_thermal,
    "D-0412.csv": converter_logs.d0412,
    "D-0413.csv": converter_logs.d0413,
    "D-0414.csv": converter_logs.d0414,
    "D-0415.tsv": converter_logs.d0415,
    "D-0416_steady.csv": converter_stages.d0416_steady,
    "D-0416_overcurrent.csv": converter_stages.d0416_overcurrent,
    "D-0416_cold.csv": converter_stages.d0416_cold,
    "D-0416_thermal.csv": converter_stages.d0416_thermal,
    "D-0416_cooling.csv": converter_stages.d0416_cooling,
    "D-0417_steady.csv": converter_stages.d0417_steady,
    "D-0417_overcurrent.csv": converter_stages.d0417_overcurrent,
    "M-31.txt": two_output_logs.m31,
    "M-32.csv": two_output_logs.m32,
}
