"""The step that a channel was logged in, told from its digits."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

__all__ = ["logged_step"]

_DECIMALS = range(-3, 9)  # thousands to a hundred-millionth of the unit that was logged
_LOOKED_AT = 20_000  # samples; the digits of a logger do not change on the way
_FEWEST = 3  # different values, below which digits tell nothing: 230 V may be 230.000 V


def logged_step(samples: NDArray[np.float64], factor: float) -> float:
    """The decimal step all samples are whole multiples of; 0 where there is none, or too few values to tell.

    A converter's own step may be larger, and is for the bench file to state.

    Parameters
    ----------
    samples : shape (n,)
        A channel as read, NaN where it was not. [SI]
    factor
        What one unit of the file is in SI.

    Returns
    -------
    float
        The step in SI.
    """
    finite = samples[np.isfinite(samples)]
    logged = np.unique(finite[:: max(1, finite.size // _LOOKED_AT)] / factor)
    if logged.size < _FEWEST:
        return 0.0
    largest = float(np.abs(logged).max())
    for decimals in _DECIMALS:
        step = 10.0**-decimals
        if step > largest:
            continue
        off = np.abs(logged / step - np.rint(logged / step))
        # beside large readings a float has fewer digits below the point
        if float(off.max()) <= 1e-6 + 4e-16 * largest / step:
            return step * abs(factor)
    return 0.0
