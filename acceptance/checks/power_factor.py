"""Power factor: active power over root-mean-square volts times amperes, of an a.c. input."""

from __future__ import annotations

from collections.abc import Sequence

from acceptance.checks.conditions import Condition, condition_channels, describe
from acceptance.checks.outcome import Candidate, Used
from acceptance.errors import MeasurementError
from acceptance.points.point import Estimate, Point
from acceptance.points.propagation import expanded

__all__ = ["POWER_FACTOR_FORMULA", "power_factor", "power_factor_candidates"]

POWER_FACTOR_FORMULA = "power factor as logged, else mean(P) / (mean(V) × mean(I)) of the input, V and I in r.m.s."


def power_factor(point: Point) -> Estimate:
    """The power factor of the input at one point. [1]

    As logged, or else from the power, voltage and current of the input; the error of the power is the one that the
    efficiency has too.

    Raises
    ------
    MeasurementError
        If neither was logged, or if the quotient lies above 1 by more than its uncertainty.

    Notes
    -----
    The spreads of P, V and I count as independent. They go up and down together, so that they cancel in part: what is
    stated is the larger uncertainty.
    """
    if point.has("power_factor"):
        factor = point.reading("power_factor")
    else:
        missing = [key for key in ("input_power", "input_voltage", "input_current") if not point.has(key)]
        if missing:
            instead = "record the power factor, or input power, voltage and current together"
            msg = f"no power factor was logged, and no {' and no '.join(missing)} to work it out from; {instead}"
            raise MeasurementError(msg)
        power, voltage, current = (point.reading(k) for k in ("input_power", "input_voltage", "input_current"))
        if not (voltage.nominal > 0 and current.nominal > 0):
            msg = f"no input voltage or no input current flows ({point.where})"
            raise MeasurementError(msg)
        factor = Estimate.of(power.value / (voltage.value * current.value), power, voltage, current)
    _see_to_unity(factor, point)
    return factor


def _see_to_unity(factor: Estimate, point: Point) -> None:
    u = expanded(factor.value, point.limits.decision.confidence).expanded
    if not 0 < factor.nominal <= 1 + u + 1e-12:
        msg = (
            f"a power factor of {factor.nominal:.4g} cannot be ({point.where}); see which column holds which quantity, "
            "and that volts and amperes are root-mean-square values"
        )
        raise MeasurementError(msg)


def power_factor_candidates(found: Sequence[Point], condition: Condition) -> list[Candidate]:
    """The power factor of each point, or why it is none."""
    return [_candidate(point, condition) for point in found]


def _candidate(point: Point, condition: Condition) -> Candidate:
    used = (Used(point, describe(point)),)
    try:
        point.require(*condition_channels(condition))
        return Candidate(used, power_factor(point), at=describe(point))
    except MeasurementError as problem:
        return Candidate(used, reason=str(problem))
