"""What of the steady test lies in no dwell, and may hide what an `any` would have taken in."""

from __future__ import annotations

from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from acceptance.bench.log import BenchLog, Doubt, Span, channel_key
from acceptance.points.dwells import Dwell
from acceptance.points.settling import drift_of

__all__ = ["Lost", "lost_stretches", "mostly_unsteady"]

Floats = NDArray[np.float64]

_FEWEST = 8  # samples of a stretch without a reading, or at a level of its own, in a log of many samples a dwell
_SHARE = 0.25  # of the usual dwell, where that is shorter
_APART = 0.02  # of rated current: a level of its own lies so far from the dwells beside it
_FLAT = 0.002  # of rated current: what moves less is a level
_UNSTEADY = 0.25  # of the steady test: more than that in no dwell is said


@dataclass(frozen=True, slots=True)
class Lost:
    """A stretch that is no dwell, and why an `any` cannot pass it over."""

    channel: str  # the one whose condition is not known, or that stood at a level of its own
    span: Span
    reason: str


def lost_stretches(log: BenchLog, dwells: Sequence[Dwell], rated: Mapping[str, float]) -> tuple[Lost, ...]:
    """Stretches between the dwells of the steady test without a reading of load or input, or at a level of their own.

    Ramps and settling are neither: on a ramp the current moves, and settling ends at the level of its dwell.

    Parameters
    ----------
    rated
        Output -> rated current. [A]
    """
    found: list[Lost] = []
    free = _free(log, dwells)
    lengths = [dwell.stop - dwell.first for dwell in dwells if dwell.stage == "steady"]
    shortest = max(1, min(_FEWEST, int(_SHARE * float(np.median(lengths))))) if lengths else _FEWEST
    for key in ("input_voltage", *(channel_key("output_current", output) for output in rated)):
        if key in log.samples:
            column = log.samples[key].to_numpy(dtype=np.float64)
            found += _without_reading(log, key, free & ~np.isfinite(column), shortest)
    for output, current in rated.items():
        key = channel_key("output_current", output)
        if key in log.samples:
            column = log.samples[key].to_numpy(dtype=np.float64)
            found += _at_a_level(log, key, column, free=free, current=current, dwells=dwells)
    return tuple(found)


def mostly_unsteady(log: BenchLog, dwells: Sequence[Dwell]) -> tuple[Doubt, ...]:
    """A doubt that is told where a good part of the steady test lies in no dwell."""
    free = _free(log, dwells)
    steady = int(np.count_nonzero(log.is_stage("steady")))
    lost = int(np.count_nonzero(free))
    if not steady or lost < _FEWEST or lost <= _UNSTEADY * steady:
        return ()
    spans = tuple((a, b) for a, b in _runs(free) if b - a >= _FEWEST)
    text = f"{lost} of {steady} samples of the steady test lie in no dwell: the load ramped, wandered or was not held"
    return (Doubt("not steady", text, spans=spans, remedy="hold each condition, and log the load setting"),)


def _free(log: BenchLog, dwells: Sequence[Dwell]) -> NDArray[np.bool_]:
    """Samples of the steady test in no dwell; what settled at a dwell's level belongs to it."""
    free = log.is_stage("steady")
    for dwell in dwells:
        free[dwell.reached : dwell.stop] = False
    return free


def _runs(mask: NDArray[np.bool_]) -> Iterator[Span]:
    edges = np.flatnonzero(np.diff(np.concatenate(([False], mask, [False])).astype(np.int8)))
    return ((int(a), int(b)) for a, b in zip(edges[::2], edges[1::2], strict=True))


def _without_reading(log: BenchLog, key: str, mask: NDArray[np.bool_], shortest: int) -> Iterator[Lost]:
    for span in _runs(mask):
        if span[1] - span[0] >= shortest:
            yield Lost(key, span, f"{key} was not read at {_place(log, span)}, so that it is open what was run there")


def _at_a_level(
    log: BenchLog, key: str, column: Floats, *, free: NDArray[np.bool_], current: float, dwells: Sequence[Dwell]
) -> Iterator[Lost]:
    for first, stop in _runs(free):
        for span in _flat_runs(column, (first, stop), _FLAT * current):
            part = column[span[0] : span[1]]
            level = float(np.median(part))
            drift = drift_of(part)
            beside = [_level(column, dwell) for dwell in _neighbours(span, dwells)]
            moves = drift is None or abs(drift) > max(_FLAT * current, 4 * float(part.std()) / np.sqrt(part.size / 3))
            if moves or any(abs(other - level) <= _APART * current for other in beside):
                continue
            told = f"{key} stood at {level:.4g} A at {_place(log, span)}, too short beside the others to be a dwell"
            yield Lost(key, span, f"{told}; hold it for longer, or log the load setting")


def _flat_runs(column: Floats, block: Span, tolerance: float) -> Iterator[Span]:
    """Stretches of at least eight samples that stay within a band of twice the tolerance and the noise."""
    part = column[block[0] : block[1]]
    if part.size < _FEWEST:
        return
    noise = float(np.median(np.abs(np.diff(part[np.isfinite(part)])))) if np.isfinite(part).sum() > 2 else 0.0
    far = ~(np.abs(np.diff(part)) <= tolerance + 6 * noise)  # a missing reading breaks a stretch
    cuts = np.flatnonzero(far) + 1
    for first, stop in zip([0, *cuts], [*cuts, part.size], strict=True):
        if stop - first >= _FEWEST:
            yield block[0] + int(first), block[0] + int(stop)


def _neighbours(span: Span, dwells: Sequence[Dwell]) -> list[Dwell]:
    before = [dwell for dwell in dwells if dwell.stop <= span[0]]
    after = [dwell for dwell in dwells if dwell.first >= span[1]]
    return [*before[-1:], *after[:1]]


def _level(column: Floats, dwell: Dwell) -> float:
    part = column[dwell.first : dwell.stop]
    return float(np.nanmedian(part)) if np.isfinite(part).any() else float("nan")


def _place(log: BenchLog, span: Span) -> str:
    table, first, last = log.rows_of(span)
    return f"{table}, line {first}" if first == last else f"{table}, lines {first} to {last}"
