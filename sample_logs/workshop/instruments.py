"""What a meter makes of a quantity: an error of gain and one of offset drawn once, noise, and a last digit."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

__all__ = ["Meter", "MeterInUse"]

Array = NDArray[np.float64]


@dataclass(frozen=True, slots=True)
class Meter:
    """One kind of instrument; the bounds are those that the bench's file states as its accuracy."""

    gain: float = 0.0  # bound of the gain error, as a fraction of the reading
    offset: float = 0.0  # bound of the offset, in the quantity's unit
    noise: float = 0.0  # standard deviation of a reading
    relative_noise: float = 0.0  # and more of it in proportion to the reading
    memory: float = 0.0  # how much of its noise a reading keeps of the one before (a filter)
    step: float = 0.0  # what the last digit, or the converter, resolves; 0: no rounding

    def drawn(self, random: np.random.Generator) -> MeterInUse:
        """One instrument of this kind, its errors drawn within the bounds."""
        gain, offset = random.uniform(-1, 1, 2)
        return MeterInUse(self, float(gain) * self.gain, float(offset) * self.offset)


@dataclass(frozen=True, slots=True)
class MeterInUse:
    """One instrument with the errors it happens to have."""

    kind: Meter
    gain_error: float
    offset_error: float

    def read(self, truth: Array, random: np.random.Generator) -> Array:
        """Readings of `truth`, one for each sample, rounded to the step."""
        kind = self.kind
        noise = _remembered(random.standard_normal(len(truth)), kind.memory)
        noise *= np.hypot(kind.noise, kind.relative_noise * truth)
        readings = truth * (1 + self.gain_error) + self.offset_error + noise
        return np.round(readings / kind.step) * kind.step if kind.step else readings


def _remembered(white: Array, memory: float) -> Array:
    """Noise of unit variance where each value keeps `memory` of the one before."""
    if memory == 0:
        return white
    kept, fresh = white.copy(), (1 - memory**2) ** 0.5
    for n in range(1, len(kept)):
        kept[n] = memory * kept[n - 1] + fresh * white[n]
    return kept
