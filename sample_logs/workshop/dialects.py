"""A table of samples -> the bytes of a log, as loggers of several kinds write it."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass
from datetime import datetime, timedelta

import pandas as pd

__all__ = ["Column", "Dialect", "cells", "text_log", "time_cells"]

MARKS = {"utf-8": b"", "utf-8-sig": b"\xef\xbb\xbf", "utf-16-le": b"\xff\xfe", "latin-1": b""}


@dataclass(frozen=True, slots=True)
class Column:
    """One column of a log: which channel, under which heading, in which unit."""

    key: str
    heading: str
    unit: str = ""  # written in the row below the heading or in the cell, where the dialect does so
    scale: float = 1.0  # number in the file = SI value * scale
    decimals: int = 3


@dataclass(frozen=True, slots=True)
class Dialect:
    """How one logger writes."""

    separator: str = ","
    decimal: str = "."
    encoding: str = "utf-8"  # with the byte-order mark that goes with it
    newline: str = "\n"
    clock: str = "iso"  # "seconds", "minutes", "clock", "iso", "day and clock"
    units: str = "in heading"  # "row below", "in cell"
    above: Sequence[str] = ()  # lines of notes
    below: Sequence[str] = ()
    between: str = ""  # what joins number and unit in a cell


def text_log(samples: pd.DataFrame, columns: Sequence[Column], *, dialect: Dialect, start: datetime) -> bytes:
    """The bytes of a delimited log of these columns, its first sample taken at `start`."""
    headings = [column.heading for column in columns]
    rows = [headings]
    if dialect.units == "row below":
        rows.append([column.unit for column in columns])
    written = [_written(samples, column, dialect=dialect, start=start) for column in columns]
    rows.extend(list(row) for row in zip(*written, strict=True))
    lines = [*dialect.above, *(dialect.separator.join(row) for row in rows), *dialect.below]
    text = dialect.newline.join(lines) + dialect.newline
    plain = "utf-8" if dialect.encoding == "utf-8-sig" else dialect.encoding
    return MARKS[dialect.encoding] + text.encode(plain)


def _written(samples: pd.DataFrame, column: Column, *, dialect: Dialect, start: datetime) -> list[str]:
    if column.key in {"time", "day"}:
        clock = "day" if column.key == "day" else dialect.clock
        return [t.replace(".", dialect.decimal) if clock == "seconds" else t for t in time_cells(samples, clock, start)]
    values = samples[column.key]
    if not pd.api.types.is_numeric_dtype(values):
        return [str(value) for value in values]
    tail = f"{dialect.between}{column.unit}" if dialect.units == "in cell" else ""
    return [number.replace(".", dialect.decimal) + tail for number in cells(values.tolist(), column)]


def cells(values: Sequence[float], column: Column) -> list[str]:
    """The numbers of a column, as text with a decimal point; a zero never has a sign."""
    return [f"{round(value * column.scale, column.decimals) + 0.0:.{column.decimals}f}" for value in values]


def time_cells(samples: pd.DataFrame, clock: str, start: datetime) -> list[str]:
    """The time of each sample, as that clock shows it."""
    show: dict[str, Callable[[float], str]] = {
        "seconds": lambda t: f"{t:.2f}",
        "clock": lambda t: _at(start, t).strftime("%H:%M:%S.") + f"{_at(start, t).microsecond // 1000:03d}",
        "day and clock": lambda t: _at(start, t).strftime("%H:%M:%S.") + f"{_at(start, t).microsecond // 100000}",
        "day": lambda t: _at(start, t).strftime("%d.%m.%Y"),
        "minutes": lambda t: _at(start, t).strftime("%H:%M"),
        "iso": lambda t: _at(start, t).isoformat(timespec="milliseconds"),
    }
    return [show[clock](float(t)) for t in samples["time"]]


def _at(start: datetime, seconds: float) -> datetime:
    return start + timedelta(milliseconds=round(seconds * 1000))
