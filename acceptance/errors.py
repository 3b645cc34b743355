"""What can go wrong, and where.

    AcceptanceError          anything this package raises on purpose
    ├── LimitsError          a limits or bench file is wrong; carries every fault found
    ├── LogError             a log cannot be read
    │   └── SeveralSerialsError  the logs given belong to several units
    ├── MeasurementError     a reading or an instrument makes no sense
    ├── RecordError          a record cannot be read or does not agree with itself
    └── ReportError          a report cannot be drawn or written

A unit that fails its limits is no error: that is a verdict.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

__all__ = [
    "AcceptanceError",
    "Fault",
    "LimitsError",
    "LogError",
    "MeasurementError",
    "RecordError",
    "ReportError",
    "SeveralSerialsError",
]


class AcceptanceError(Exception):
    """Base of every error this package raises on purpose."""


@dataclass(frozen=True, slots=True, order=True)
class Fault:
    """One thing wrong in a file, with the place a person can go to."""

    file: str
    line: int  # from 1; 0 where the fault has no line
    column: int  # from 1; 0 where the fault has no column
    found: str  # what is wrong
    expected: str  # what is expected instead

    def __str__(self) -> str:
        place = f"{self.file}:{self.line}:{self.column}" if self.line else self.file
        return f"{place}: {self.found}; {self.expected}" if self.expected else f"{place}: {self.found}"


class LimitsError(AcceptanceError):
    """A limits or bench file is wrong; `faults` holds every fault found, in the order of the file."""

    def __init__(self, faults: Sequence[Fault]) -> None:
        self.faults = tuple(sorted(faults))
        super().__init__("\n".join(str(fault) for fault in self.faults))


class LogError(AcceptanceError):
    """A log cannot be read; the text names file and place, what was found and what to do."""

    def __init__(self, file: str, found: str, expected: str = "", *, line: int = 0, column: int = 0) -> None:
        self.fault = Fault(file, line, column, found, expected)
        super().__init__(str(self.fault))


class SeveralSerialsError(LogError):
    """The logs given belong to several units; `serials` names them in the order they were met."""

    def __init__(self, file: str, found: str, expected: str = "", *, serials: Sequence[str] = ()) -> None:
        self.serials = tuple(serials)
        super().__init__(file, found, expected)


class MeasurementError(AcceptanceError):
    """A reading, an instrument or a setting makes no sense."""


class RecordError(AcceptanceError):
    """A record cannot be read, or does not agree with itself."""


class ReportError(AcceptanceError):
    """A report cannot be drawn or written."""
