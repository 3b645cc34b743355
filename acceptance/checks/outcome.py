"""What a check hands on: values and the limits they are to be held against, before anything is decided."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, field
from typing import Literal

from acceptance.points.point import Estimate, Point
from acceptance.record import Figure

__all__ = ["Candidate", "CheckResult", "Outcome", "Used"]


@dataclass(frozen=True, slots=True)
class Used:
    """A point that a value was formed from, and as what."""

    point: Point
    role: str


@dataclass(frozen=True, slots=True)
class Candidate:
    """One way a requirement's condition was met: a dwell, or the dwells that one value is formed from.

    Either `estimate` or `text` is there, or `reason` says why this one cannot be judged.
    """

    used: tuple[Used, ...]
    estimate: Estimate | None = None
    reason: str = ""
    text: str | None = None  # a value in words, such as a behaviour
    text_meets: bool | None = None
    at: str = ""  # the operating condition that was run, where the requirement's condition leaves it open
    known: Literal["value", "at least", "at most"] = "value"  # a bound may fail a unit, it never passes one
    bound_reason: str = ""  # why only a bound of the value is known
    place: str = ""  # file and lines, where it was formed from samples rather than from points

    @property
    def where(self) -> str:
        """Files and lines that it was formed from, each once."""
        return self.place or "; ".join(dict.fromkeys(used.point.where for used in self.used))


@dataclass(frozen=True, slots=True)
class Outcome:
    """One finding to be: its candidates, of which the least favourable one decides."""

    name: str
    characteristic: str
    condition: str  # in words, with what the value refers to
    unit: str  # SI; "" for a ratio
    low: float | None = None
    high: float | None = None
    candidates: tuple[Candidate, ...] = ()
    reason: str = ""  # why it cannot be judged at all, where there is no candidate
    output: str = ""
    note: str = ""
    formula: str = ""
    deviations: tuple[str, ...] = ()
    asked: str = ""  # the limit, where it is one in words
    is_magnitude: bool = False  # of a signed value: what is below -high does not meet the limit either

    @property
    def bounds(self) -> tuple[float | None, float | None]:
        """Between what the true value must lie to conform."""
        if self.is_magnitude and self.high is not None and self.low is None:
            return -self.high, self.high
        return self.low, self.high


@dataclass(frozen=True, slots=True)
class CheckResult:
    """All that one check found."""

    outcomes: tuple[Outcome, ...]
    figures: tuple[Figure, ...] = field(default=())

    @staticmethod
    def of(outcomes: Sequence[Outcome], figures: Sequence[Figure] = ()) -> CheckResult:
        """From lists."""
        return CheckResult(tuple(outcomes), tuple(figures))
