"""What a bench log is once it has been read: plain SI samples, and where each came from.

`read` knows file formats, headings and units; nothing after it does.
"""

from __future__ import annotations

from dataclasses import dataclass, field
from datetime import date, datetime
from typing import TYPE_CHECKING

if TYPE_CHECKING:
    import numpy as np
    import pandas as pd
    from numpy.typing import NDArray

    from acceptance.bench.packed import Packed

__all__ = [
    "OUTPUT_QUANTITIES",
    "QUANTITIES",
    "BenchLog",
    "Channel",
    "Doubt",
    "Evidence",
    "Ignored",
    "Span",
    "channel_key",
]

# quantity -> kind of its unit (acceptance.units.KINDS), or "text"
QUANTITIES: dict[str, str] = {
    "time": "time",
    "input_voltage": "voltage",
    "input_current": "current",
    "input_power": "power",
    "power_factor": "ratio",
    "output_voltage": "voltage",
    "output_current": "current",
    "output_power": "power",  # recognised and kept, never used: a check forms the power from volts and amperes
    "load_setting": "any",  # amperes, ohms, volts or watts, by the load's mode
    "load_mode": "text",
    "ambient_temperature": "temperature",
    "temperature": "temperature",  # qualified by its probe
    "ripple": "voltage",
    "winding_resistance": "resistance",
    "stage": "text",
    "serial": "text",
}

# quantities that a unit with several outputs has several of
OUTPUT_QUANTITIES = frozenset(
    {"output_voltage", "output_current", "output_power", "load_setting", "load_mode", "ripple"}
)

Span = tuple[int, int]  # samples [first, last + 1)


def channel_key(quantity: str, qualifier: str = "") -> str:
    """The name of a column of `BenchLog.samples`: "output_voltage main", "temperature case", "input_power"."""
    return f"{quantity} {qualifier}" if qualifier else quantity


@dataclass(frozen=True, slots=True)
class Channel:
    """One column of a log: what it was taken for, and why."""

    key: str  # column of BenchLog.samples
    quantity: str  # one of QUANTITIES
    qualifier: str  # output or probe; "" where there is none
    heading: str  # as written in the file
    unit: str  # as written, or the one assumed
    unit_from: str  # "heading", "row below", "cells", "limits file", "assumed", "not a number"
    factor: float  # SI value = number * factor + offset; 1 and 0 where every cell carries its own unit
    offset: float
    reason: str  # why the heading was taken for this, in words for `inspect`
    file: str  # the file (and sheet) that it was found in
    step: float = 0.0  # what one unit of the last digit written is, SI; 0 where it is not known


@dataclass(frozen=True, slots=True)
class Ignored:
    """A column or a line of a file that was left out, and why."""

    file: str
    what: str
    reason: str


@dataclass(frozen=True, slots=True)
class Doubt:
    """Something about the data that a reader of the report must know.

    A *doubt* is printed. A *bar* also keeps the channels it names from being judged, within its spans.
    """

    kind: str  # "gap", "repeated time", "backward time", "clipped", "frozen", "unit assumed", ...
    text: str  # what is wrong, with place and numbers
    bars: bool = False
    channels: tuple[str, ...] = ()  # channel keys concerned; with bars, those that may not be judged
    spans: tuple[Span, ...] = ()  # samples concerned; empty: the whole log
    remedy: str = ""  # what to record or do instead


@dataclass(frozen=True, slots=True)
class Evidence:
    """One file that the decision rests on."""

    file: str  # its name, without its folder
    sha256: str
    bytes: int
    rows: int  # samples taken from it
    dialect: str  # for `inspect`: 'semicolons, decimal comma, UTF-8 with mark', 'workbook, sheets "steady", "thermal"'
    started_at: datetime | None = None  # of its first sample, where the log carries dates


@dataclass(frozen=True, slots=True)
class BenchLog:
    """All samples of one unit, in SI units, in the order of the files and their rows.

    `samples` has one row a sample, index 0 to n - 1, and these columns:

    - one float64 column a channel (NaN where a cell was empty or not a number, and `doubts` says so); in a very long
      log it is packed, and `column` and `part` look at it without unpacking the whole;
      `time` in seconds, as logged where that was seconds, else from the first sample of its table (absent where no
      time was logged);
    - `stage`: categorical text, `steady` where the log tells nothing else;
    - `load_mode` (or `load_mode main`), where logged: categorical text;
    - `table`: int, which table (file, or sheet of a workbook) the sample came from, 0 upwards, index into `tables`;
    - `line`: int, the line (text) or row (workbook) of that file, from 1.
    """

    serial: str
    samples: pd.DataFrame
    channels: tuple[Channel, ...]
    evidence: tuple[Evidence, ...]
    tables: tuple[str, ...]  # "A-17.csv", 'A-17.xlsx, sheet "steady"'
    notes: dict[str, str] = field(default_factory=dict)  # from around the table, keys in lower case
    stated: dict[str, float] = field(default_factory=dict)  # channel -> SI value: not logged, only stated
    ignored: tuple[Ignored, ...] = ()
    doubts: tuple[Doubt, ...] = ()
    test_date: date | None = None  # the latest day that any sample lies in
    serial_from: str = ""  # "--serial", "note", "column", "file name"
    stages_from: str = ""  # "stage column", "file name", "sheet name", "note", "none told"

    def keys(self, quantity: str) -> list[str]:
        """The channels of one quantity, such as every "temperature"."""
        return [key for key in self.samples.columns if key == quantity or key.startswith(f"{quantity} ")]

    def column(self, key: str) -> NDArray[np.float64] | Packed:
        """A channel as it is kept: an array, or packed where the log is very long."""
        packed: Packed | None = getattr(self.samples[key].array, "packed", None)
        return packed if packed is not None else self.samples[key].to_numpy(dtype="float64")

    def part(self, key: str, first: int, stop: int) -> NDArray[np.float64]:
        """Samples first to stop - 1 of a channel, without unpacking the others."""
        return self.column(key)[first:stop]

    def is_stage(self, stage: str) -> NDArray[np.bool_]:
        """Which samples are of a stage."""
        column = self.samples["stage"].cat
        number = list(column.categories).index(stage) if stage in column.categories else -2
        found: NDArray[np.bool_] = column.codes.to_numpy() == number
        return found

    def rows_of(self, span: Span) -> tuple[str, int, int]:
        """Where samples lie: table, first and last line."""
        table, lines = self.samples["table"].array[span[0]], self.samples["line"].array
        return self.tables[int(table)], int(lines[span[0]]), int(lines[span[1] - 1])
