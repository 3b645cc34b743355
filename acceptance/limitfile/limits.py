"""What a limits file and a bench file say, once they have been read and found whole."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from datetime import date
from typing import Literal

from acceptance.limitfile.accuracy import Accuracy
from acceptance.limitfile.model import Decision, Product, Ratings, Requirement

__all__ = ["Converter", "Limits", "Meter", "ShuntResistor", "Wiring"]


@dataclass(frozen=True, slots=True)
class ShuntResistor:
    """A resistor that a current was read across."""

    resistance: float  # [ohm]
    tolerance: float  # bound, as a fraction
    temperature_coefficient: float  # [1/K]
    heating: float  # [K/W]
    stated: bool  # whether a tolerance was given: without one its uncertainty is not known


@dataclass(frozen=True, slots=True)
class Converter:
    """An analogue-to-digital converter."""

    bits: int
    low: float  # [V]
    high: float  # [V]
    offset: float  # bound [V]

    @property
    def step(self) -> float:
        """The smallest step it can show. [V]"""
        return (self.high - self.low) / float(2**self.bits)


@dataclass(frozen=True, slots=True)
class Meter:
    """What measured one quantity, and how well."""

    quantity: str  # as in the file: "output_voltage", "temperature case"
    device: str
    kind: str  # kind of the quantity's unit
    accuracy: Accuracy | None = None
    meter_range: float | Literal["auto"] | None = None  # SI
    resolution: float | None = None  # SI
    shunt: ShuntResistor | None = None
    converter: Converter | None = None
    due: date | None = None
    serial: str = ""
    note: str = ""
    text: str = ""  # the accuracy in words, for the report

    @property
    def is_stated(self) -> bool:
        """Whether an uncertainty can be told from what is said about it."""
        if self.shunt is not None:
            return self.shunt.stated and (self.converter is not None or self.accuracy is not None)
        return self.accuracy is not None or self.converter is not None


@dataclass(frozen=True, slots=True)
class Wiring:
    """Resistance of both leads together, where a voltage was not sensed at the terminals."""

    resistance: float  # [ohm]
    bound: float | None  # ± [ohm]; None where none was stated


@dataclass(frozen=True, slots=True)
class Limits:
    """What one unit must meet, how that is decided, and what measured it."""

    file: str  # name, without its folder
    sha256: str  # of the file's bytes
    requirements_sha256: str  # over ratings, decision and requirements as parsed, without notes, lot and bench
    product: Product
    ratings: Ratings
    decision: Decision
    requirements: tuple[Requirement, ...]  # in the order of the file; each has a name of its own
    columns: Mapping[str, tuple[str, str | None]]  # channel -> heading, unit
    stated: Mapping[str, float]  # channel -> SI value: not logged, only stated
    load_mode: str | None  # CC, CR, CV, CP
    settle: float | None  # [s]
    min_dwell: float | None  # [s]
    meters: Mapping[str, Meter]  # quantity, or quantity and output or probe -> meter
    leads: Mapping[str, Wiring]  # "output", "output main", "input" -> wiring
    bench_file: str = ""  # "" where the limits file carries the bench's part itself
    bench_sha256: str = ""
    lot: Mapping[str, object] | None = None

    @property
    def outputs(self) -> tuple[str, ...]:
        """Names of the product's outputs, the first one being the default."""
        return tuple(self.ratings.outputs)

    def meter(self, key: str) -> Meter | None:
        """What measured a channel: by its full name first, then by its quantity.

        The ambient is measured by what measures "temperature" unless it is named itself.
        """
        quantity = key.partition(" ")[0]
        names = [key, quantity, "temperature"] if quantity == "ambient_temperature" else [key, quantity]
        return next((self.meters[name] for name in names if name in self.meters), None)

    def wiring(self, side: Literal["output", "input"], output: str = "") -> Wiring | None:
        """The leads of one output, or of the input."""
        return self.leads.get(f"{side} {output}".strip()) or self.leads.get(side)
