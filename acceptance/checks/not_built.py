"""Characteristics that a limits file may ask for and this version does not judge: said, never passed over."""

from __future__ import annotations

from collections.abc import Sequence

from acceptance.checks.outcome import CheckResult, Outcome
from acceptance.limitfile.model import Requirement
from acceptance.points.point import Points

__all__ = ["check_not_built"]


def check_not_built(requirements: Sequence[Requirement], points: Points) -> CheckResult:
    """An outcome without a value for each requirement."""
    return CheckResult.of(
        [
            Outcome(
                name=requirement.name or "",
                characteristic=requirement.characteristic,
                condition="",
                unit="",
                reason=f"this version does not judge {requirement.characteristic.replace('_', ' ')}",
                output=requirement.output or "",
                note=requirement.note or "",
            )
            for requirement in requirements
        ]
    )
