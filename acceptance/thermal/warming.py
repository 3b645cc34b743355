"""A soak in blocks of time, and how far a unit lies behind a room that moves.

Of a body with one time constant the rise that it ends at is rise + tau d(probe)/dt at every moment, whether or not
its room moves. So the lag behind the room is taken out before a curve is fitted: otherwise a room that drifts by
1 K/h would shift the rise of a unit of 1 h by 1 K.
"""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

__all__ = ["WINDOW", "Lag", "Warming", "blocks_of", "line_of", "running_means"]

Floats = NDArray[np.float64]

WINDOW = 1800.0  # the last part, whose slope is looked at [s]

_PER_WINDOW = 40  # blocks
_MOST = 1500  # blocks


@dataclass(frozen=True, slots=True)
class Warming:
    """A soak as the means of equal blocks of time; all arrays of one length, without a missing reading."""

    time: Floats  # from the soak's start [s]
    probe: Floats  # [°C]
    ambient: Floats  # [°C]
    recorded: float | None = None  # from its first sample to its last; None: between the blocks [s]

    @property
    def rise(self) -> Floats:
        """Rise over the ambient at the same moment. [K]"""
        return self.probe - self.ambient

    @property
    def lasts(self) -> float:
        """[s]"""
        return float(self.time[-1] - self.time[0]) if self.recorded is None else self.recorded

    def cut(self, rows: NDArray[np.bool_]) -> Warming:
        """Some of the blocks alone."""
        return Warming(self.time[rows], self.probe[rows], self.ambient[rows])


def blocks_of(time: Floats, *columns: Floats, window: float = WINDOW) -> list[Floats]:
    """Means of time and columns over equal blocks of time; blocks without a reading of all of them are left out.

    Parameters
    ----------
    time, columns
        Shape (n,); time rising, in seconds. A log of fewer readings than blocks keeps them as they are.
    """
    known = np.isfinite(time)
    for column in columns:
        known &= np.isfinite(column)
    everything = bool(known.all())
    kept = [c if everything else c[known] for c in (time, *columns)]
    span = float(kept[0][-1] - kept[0][0]) if kept[0].size else 0.0
    count = int(min(_MOST, max(_PER_WINDOW, math.ceil(_PER_WINDOW * span / window)))) if span > 0 else 1
    if kept[0].size <= count:
        return kept
    # samples are in the order of time, so that each block is a slice
    edges = kept[0][0] + span * np.arange(count) / count
    starts = np.unique(np.searchsorted(kept[0], edges))
    lengths = np.diff(np.append(starts, kept[0].size))
    return [np.add.reduceat(column, starts) / lengths for column in kept]


@dataclass(frozen=True, slots=True)
class Lag:
    """How far a unit of one time constant lies behind its room."""

    time: Floats
    grid: Floats
    moves: Floats  # of the ambient from one place of the grid to the next [K]
    kept: dict[float, Floats]

    @staticmethod
    def of(warming: Warming) -> Lag:
        count = max(2, min(600, 4 * warming.time.size))
        grid = np.linspace(warming.time[0], warming.time[-1], count)
        moves = np.diff(np.interp(grid, warming.time, warming.ambient))
        return Lag(warming.time, grid, moves, {})

    def behind(self, tau: float) -> Floats:
        """What the room's moves add to the rise once the unit has followed them. [K]

        tau dT/dt = room - T: after a step of the room the probe still lacks exp(-t/tau) of it.
        """
        if tau not in self.kept:
            step = float(self.grid[1] - self.grid[0])
            # of a move spread evenly over one step, at the end of it
            share = tau / step * -math.expm1(-step / tau)
            kernel = share * np.exp(-step / tau * np.arange(self.moves.size))
            path = np.concatenate(([0.0], np.convolve(self.moves, kernel)[: self.moves.size]))
            self.kept[tau] = np.interp(self.time, self.grid, path)
        return self.kept[tau]


def line_of(time: Floats, values: Floats) -> tuple[float, float]:
    """Mean and slope."""
    centred = time - time.mean()
    return float(values.mean()), float(centred @ values / (centred @ centred))


def running_means(time: Floats, values: Floats, width: float) -> tuple[Floats, Floats]:
    """Mean of the readings within `width` up to each moment, and the moments; of whole widths where there is one."""
    sums = np.concatenate(([0.0], np.cumsum(values)))
    stop = np.arange(1, time.size + 1)
    start = np.searchsorted(time, time - width * (1 - 1e-9))
    means = (sums[stop] - sums[start]) / (stop - start)
    whole = time >= time[0] + width * (1 - 1e-9)
    return (means[whole], time[whole]) if whole.any() else (means[-1:], time[-1:])
