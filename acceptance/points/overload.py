"""Which dwells of a log without stages are an overload: told from the load that was set, or measured."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import replace

import numpy as np

from acceptance.bench.log import QUANTITIES, BenchLog, channel_key
from acceptance.limitfile.limits import Limits
from acceptance.points.dwells import Dwell
from acceptance.units import UNITS

__all__ = ["overloads_told"]

OVERLOAD = 1.05  # of rated current: beyond any tolerance of full load
STEADY = "steady"
OVERCURRENT = "overcurrent"


def overloads_told(log: BenchLog, dwells: Sequence[Dwell], limits: Limits) -> list[Dwell]:
    """The dwells, those called `overcurrent` that ask for more than an output's rated current.

    Only where neither a column nor a name tells the stages. A unit that limits its current, or gives up, shows less
    current than was asked for: so the setting counts, where it is one in amperes, and the current where it is not.
    """
    if log.stages_from != "none told":
        return list(dwells)
    return [_called(log, dwell, limits) for dwell in dwells]


def _called(log: BenchLog, dwell: Dwell, limits: Limits) -> Dwell:
    for output, rating in limits.ratings.outputs.items():
        asked = [_mean(log, key, dwell) for key in _asking(log, output)]
        if any(value is not None and value > OVERLOAD * rating.current for value in asked):
            return replace(dwell, stage=OVERCURRENT)
    return dwell


def _asking(log: BenchLog, output: str) -> list[str]:
    """The channels that say which current was asked for."""
    setting = channel_key("load_setting", output)
    in_amperes = any(c.key == setting and _kind(c.unit) == "current" for c in log.channels)
    return [*([setting] if in_amperes else []), channel_key("output_current", output)]


def _kind(unit: str) -> str:
    known = UNITS.get(unit)
    return known.kind if known is not None else QUANTITIES["load_setting"]


def _mean(log: BenchLog, key: str, dwell: Dwell) -> float | None:
    if key not in log.samples:
        return None
    samples = log.part(key, dwell.first, dwell.stop)
    return float(np.nanmean(samples)) if np.isfinite(samples).any() else None
