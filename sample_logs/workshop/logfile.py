"""One log of the workshop, and what its making needs again and again."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from datetime import UTC, datetime, timezone

from workshop.overload import OverloadRun
from workshop.products import Product
from workshop.sequence import Bench, Run, Step
from workshop.soak import SoakRun, WindingRun

__all__ = ["LogFile", "at", "sweep"]


@dataclass(frozen=True, slots=True)
class LogFile:
    """One file: its bytes, the product and the bench, and the truth behind each stage that it shows."""

    data: bytes
    product: Product
    bench: Bench
    run: Run | None = None  # steady
    overload: OverloadRun | None = None
    soak: SoakRun | None = None
    winding: WindingRun | None = None  # cold, or cooling


def sweep(product: Product, loads: Sequence[float], input_voltage: float, seconds: float) -> list[Step]:
    """Every output at the same share of its rated current; no load is held twice as long."""
    return [Step(dict.fromkeys(product.outputs, load), input_voltage, seconds * (1 if load else 2)) for load in loads]


def at(year: int, month: int, day: int, hour: int, minute: int, zone: timezone = UTC) -> datetime:
    """A moment in the life of the workshop."""
    return datetime(year, month, day, hour, minute, tzinfo=zone)
