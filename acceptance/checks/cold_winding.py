"""A winding before the test: its resistance, at rest at the temperature of the room."""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np

from acceptance.checks.warm import AMBIENT
from acceptance.errors import MeasurementError
from acceptance.points.point import Estimate, Point, Points
from acceptance.points.propagation import Source, of_source
from acceptance.thermal.resistance import Material

__all__ = ["Cold", "ambient_at", "cold_winding"]

_STEADY_COLD = 0.5  # the cold winding may move by so much [K]
_SAME_COLD = 2.0  # the probes may differ from the ambient by so much while cold [K]
_COARSEST = 5.0  # that the last digit of the cold resistance may be worth [K]


@dataclass(frozen=True, slots=True)
class Cold:
    """The winding before the test."""

    resistance: Estimate  # [ohm]
    ambient: Estimate  # [°C]


def cold_winding(points: Points, key: str, material: Material) -> Cold:
    """The winding before the unit was switched on.

    Raises
    ------
    MeasurementError
        If there is no such stage, or the winding was not at rest at the temperature of the room.
    """
    stretches = [s for s in points.stretches("cold") if s.has(key) and np.isfinite(s.samples(key)).any()]
    if not stretches:
        msg = f"there is no stage cold with {key}: measure the winding and the ambient before the unit is switched on"
        raise MeasurementError(msg)
    found = [_one_cold(stretch, key, material) for stretch in stretches]
    values = [
        one.resistance.nominal * (material.constant + 20) / (material.constant + one.ambient.nominal) for one in found
    ]
    spread = (max(values) / min(values) - 1) * (material.constant + 20)
    if spread > 2 * _STEADY_COLD:
        places = " and ".join(stretch.where for stretch in stretches)
        msg = f"the cold resistances differ by {spread:.2g} K ({places}); leave in the one that belongs to this unit"
        raise MeasurementError(msg)
    return found[-1]


def _one_cold(stretch: Point, key: str, material: Material) -> Cold:
    stretch.require(key)
    resistance = _reading(stretch, key)
    ambient = ambient_at(stretch)
    if not resistance.nominal > 0:
        msg = f"{key} reads {resistance.nominal:.4g} ohm while cold ({stretch.where}): not above zero"
        raise MeasurementError(msg)
    samples = stretch.samples(key)[np.isfinite(stretch.samples(key))]
    digits = getattr(stretch.rounding(key, float(samples.std())), "std_dev", 0.0) * math.sqrt(12)
    coarse = digits / resistance.nominal * (material.constant + ambient.nominal)
    if coarse > _COARSEST:
        msg = (
            f"{key} was logged while cold with a last digit of {digits:.2g} ohm ({stretch.where}), which is "
            f"{coarse:.2g} K of the winding: log it to a thousandth of its value, zeros at the end as well"
        )
        raise MeasurementError(msg)
    if samples.size >= 4:
        quarter = max(1, samples.size // 4)
        change = float(samples[-quarter:].mean() - samples[:quarter].mean())
        moved = change / resistance.nominal * (material.constant + ambient.nominal)
        noise = 3 * float(samples.std()) * math.sqrt(2 / quarter) / resistance.nominal * (material.constant + 20)
        if abs(moved) > max(_STEADY_COLD, noise if noise < 2 * _STEADY_COLD else 0.0):
            msg = (
                f"the winding was not at rest while cold: it moved by {moved:.2g} K ({stretch.where}); leave the unit "
                "off until it has the temperature of the room, and measure it again"
            )
            raise MeasurementError(msg)
    _see_to_probes_cold(stretch, ambient.nominal)
    return Cold(resistance, ambient)


def _see_to_probes_cold(stretch: Point, ambient: float) -> None:
    for name in stretch.log.keys("temperature"):
        samples = stretch.samples(name)
        if np.isfinite(samples).any():
            apart = float(np.nanmedian(samples)) - ambient
            if abs(apart) > _SAME_COLD:
                msg = (
                    f"{name} stands {abs(apart):.2g} K {'above' if apart > 0 else 'below'} the ambient while cold "
                    f"({stretch.where}): the winding did not have the room's temperature; leave the unit off for longer"
                )
                raise MeasurementError(msg)


def ambient_at(stretch: Point) -> Estimate:
    """The ambient of a stretch, as logged or as stated."""
    if stretch.has(AMBIENT) and np.isfinite(stretch.samples(AMBIENT)).any():
        stretch.require(AMBIENT)
        return _reading(stretch, AMBIENT)
    if AMBIENT in stretch.log.stated:
        unstated = frozenset() if stretch.bench.is_stated(AMBIENT) else frozenset({AMBIENT})
        return Estimate(stretch.bench.stated(AMBIENT, stretch.log.stated[AMBIENT]), unstated)
    msg = f"no ambient temperature was logged with the winding ({stretch.where}); record it beside the resistance"
    raise MeasurementError(msg)


def _reading(stretch: Point, key: str) -> Estimate:
    """Mean of a channel over a stretch, with the errors of its instrument, its digits and its spread."""
    spread = stretch.mean(key)
    source = Source(f"spread of {key} while {stretch.dwell.stage}", "A", spread.degrees_of_freedom)
    value = stretch.bench.correct(key, spread.mean) + stretch.rounding(key, spread.deviation or 0.0)
    value = value + of_source(spread.standard_uncertainty or 0.0, source)
    unstated = frozenset() if stretch.bench.is_stated(key) else frozenset({key})
    return Estimate(value, unstated, single=spread.readings == 1)
