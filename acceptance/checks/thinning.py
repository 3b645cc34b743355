"""Fewer samples for a figure, none of its spikes lost."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

__all__ = ["thinned_cloud", "thinned_trace"]

Floats = NDArray[np.float64]


def thinned_trace(x: Floats, y: Floats, *, buckets: int = 400) -> tuple[list[float], list[float]]:
    """A trace by the lowest and the highest sample of each bucket, in the order of the samples.

    Parameters
    ----------
    x, y
        Shape (n,); samples without a number are left out.
    buckets
        Stretches of about equally many samples; at most two samples of each remain, and the first and the last.
    """
    known = np.flatnonzero(np.isfinite(x) & np.isfinite(y))
    if known.size > 2 * buckets:
        starts = (np.arange(buckets) * known.size) // buckets
        values = y[known]
        lengths = np.diff(np.append(starts, known.size))
        # the place of the extreme: the first sample in each bucket that equals it
        kept = [np.array([0, known.size - 1])]
        for extreme in (np.minimum.reduceat(values, starts), np.maximum.reduceat(values, starts)):
            hits = np.flatnonzero(values == np.repeat(extreme, lengths))
            kept.append(hits[np.searchsorted(hits, starts)])
        known = known[np.unique(np.concatenate(kept))]
    return x[known].tolist(), y[known].tolist()


def thinned_cloud(x: Floats, y: Floats, *, cells: int = 80) -> tuple[list[float], list[float]]:
    """Samples of a plane by the first one in each cell of a grid over their range, in the order of the samples.

    Whatever lies apart from the others has a cell of its own, so that no outlier is lost.

    Parameters
    ----------
    x, y
        Shape (n,); samples without a number are left out.
    cells
        Along each side of the grid.
    """
    known = np.flatnonzero(np.isfinite(x) & np.isfinite(y))
    if known.size > 2 * cells:
        cell = _cell(x[known], cells) * (cells + 1) + _cell(y[known], cells)
        known = known[np.sort(np.unique(cell, return_index=True)[1])]
    return x[known].tolist(), y[known].tolist()


def _cell(values: Floats, cells: int) -> NDArray[np.int64]:
    low, span = values.min(), np.ptp(values)
    return ((values - low) / span * cells).astype(np.int64) if span > 0 else np.zeros(values.size, dtype=np.int64)
