"""Insulation classes, and how warm a winding of each may get.

Kept here, not with the check, so that a class nobody knows is a fault of the limits file, with its place.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass

__all__ = ["CLASSES", "InsulationClass", "insulation_class"]

_QUOTED = "common practice: as makers quote it, not read in the standard itself"
_MEMORY = "from memory, not looked up"


@dataclass(frozen=True, slots=True)
class InsulationClass:
    """One class."""

    name: str  # its letter, or its temperature where it has none
    temperature: float  # that the class is named by: IEC 60085 [°C]
    winding: float  # largest winding temperature of a small transformer: EN 61558-1 [°C]
    evidence: str  # how well `winding` is known

    @property
    def source(self) -> str:
        """Table and evidence, for the report."""
        return (
            f"class {self.name}: at most {self.winding:g} °C for the winding of a small transformer (EN 61558-1; "
            f"{self.evidence}); the class itself is named by {self.temperature:g} °C (IEC 60085)"
        )


CLASSES: Mapping[str, InsulationClass] = {
    one.name: one
    for one in (
        InsulationClass("A", 105.0, 100.0, _QUOTED),
        InsulationClass("E", 120.0, 115.0, _QUOTED),
        InsulationClass("B", 130.0, 120.0, _QUOTED),
        InsulationClass("F", 155.0, 140.0, _QUOTED),
        InsulationClass("H", 180.0, 165.0, _QUOTED),
        InsulationClass("200", 200.0, 180.0, _MEMORY),
    )
}


def insulation_class(text: str) -> InsulationClass | None:
    """The class written `B`, `b`, `130` or `class B`; None where there is no such class."""
    word = text.strip().casefold().removeprefix("class").strip()
    for one in CLASSES.values():
        if word in (one.name.casefold(), f"{one.temperature:g}"):
            return one
    return None
