"""Propagation of uncertainty: values that remember their sources, and what is said about them.

Values are `uncertainties` numbers. Each independent source of error is one variable, tagged with a `Source`; what two
values share, they share because the same variable stands in both, so that it cancels in a difference by itself.
"""

from __future__ import annotations

import math
from collections.abc import Iterable, Sequence
from dataclasses import dataclass
from typing import Any, Literal, TypeAlias

import numpy as np
from numpy.typing import NDArray
from scipy.special import ndtri, stdtrit
from uncertainties import UFloat, ufloat

from acceptance.errors import MeasurementError

__all__ = [
    "Contribution",
    "Expanded",
    "Source",
    "Value",
    "budget",
    "covariance",
    "effective_degrees_of_freedom",
    "expanded",
    "is_exact",
    "nominal",
    "of_source",
    "standard_uncertainty",
]

Value: TypeAlias = UFloat | float
INFINITE = math.inf


@dataclass(frozen=True, slots=True)
class Source:
    """Where one error comes from."""

    name: str  # as the budget prints it
    kind: Literal["A", "B"]
    degrees_of_freedom: float = INFINITE


@dataclass(frozen=True, slots=True)
class Contribution:
    """What one source brings to a value."""

    source: Source
    u: float  # |sensitivity| times standard uncertainty, in the value's unit
    share: float  # of the variance


@dataclass(frozen=True, slots=True)
class Expanded:
    """An expanded uncertainty and what it was made of."""

    standard: float
    degrees_of_freedom: float  # effective; infinite where nothing of type A is in it
    coverage_factor: float
    expanded: float


def of_source(u: float, source: Source, value: float = 0.0) -> Value:
    """A value with one source of error of its own; exact where u is 0. Two calls give two independent errors.

    Raises
    ------
    MeasurementError
        If u is negative or not a finite number: such a u would pass for none at all.
    """
    if not 0 <= u < math.inf:
        msg = f"the standard uncertainty of {source.name} would be {u}"
        raise MeasurementError(msg)
    return ufloat(value, u, source) if u > 0 else value


def nominal(value: Any) -> float:
    """The best estimate, of a value with or without uncertainty."""
    return float(getattr(value, "nominal_value", value))


def standard_uncertainty(value: Any) -> float:
    """The standard uncertainty; 0 for a plain number."""
    return float(getattr(value, "std_dev", 0.0))


def is_exact(value: Any) -> bool:
    """Whether no uncertainty at all is known of a value."""
    return standard_uncertainty(value) == 0.0


def _components(value: Any) -> dict[Any, float]:
    return value.error_components() if hasattr(value, "error_components") else {}


def budget(value: Any) -> list[Contribution]:
    """What each source brings to a value, the largest first; sources of one name and kind are added in squares."""
    squares: dict[Source, float] = {}
    for variable, u in _components(value).items():
        squares[variable.tag] = squares.get(variable.tag, 0.0) + u * u
    total = sum(squares.values())
    lines = [Contribution(source, math.sqrt(s), s / total if total > 0 else 0.0) for source, s in squares.items()]
    return sorted(lines, key=lambda line: (-line.u, line.source.name))


def effective_degrees_of_freedom(parts: Iterable[tuple[float, float]]) -> float:
    """Degrees of freedom of a sum of independent (u, degrees of freedom), by Welch and Satterthwaite.

    nu = u^4 / sum(u_i^4 / nu_i); infinite where no part has a finite number.

    References
    ----------
    JCGM 100:2008, annex G.4.1, equation (G.2b).
    """
    listed = list(parts)
    total = math.hypot(*(u for u, _ in listed))
    if total == 0:
        return INFINITE
    # as shares of the whole, so that no fourth power overflows
    below = sum((u / total) ** 4 / freedom for u, freedom in listed if math.isfinite(freedom))
    return 1.0 / below if below > 0 else INFINITE


def expanded(value: Any, confidence: float) -> Expanded:
    """The expanded uncertainty of a value: U = t(confidence, nu) u; k is 1.96 at 95 % for large nu."""
    parts = [(abs(u), variable.tag.degrees_of_freedom) for variable, u in _components(value).items()]
    u = math.hypot(*(part[0] for part in parts))
    freedom = effective_degrees_of_freedom(parts)
    k = coverage_factor(confidence, freedom)
    return Expanded(u, freedom, k, k * u)


def coverage_factor(confidence: float, degrees_of_freedom: float) -> float:
    """Two-sided quantile of Student's t, of the normal for infinite degrees of freedom."""
    p = 0.5 + confidence / 2
    return float(stdtrit(degrees_of_freedom, p) if math.isfinite(degrees_of_freedom) else ndtri(p))


def covariance(values: Sequence[Any]) -> NDArray[np.float64]:
    """Covariance matrix of values, from the sources they share."""
    components = [_components(value) for value in values]
    matrix = np.zeros((len(values), len(values)))
    for i, mine in enumerate(components):
        for j, other in enumerate(components[: i + 1]):
            # error_components gives |sensitivity| u; the signs come from the derivatives
            matrix[i, j] = matrix[j, i] = sum(
                _signed(values[i], variable) * _signed(values[j], variable) for variable in mine if variable in other
            )
    return matrix


def _signed(value: Any, variable: Any) -> float:
    return float(value.derivatives[variable] * variable.std_dev)
