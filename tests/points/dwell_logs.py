"""Synthetic current sweeps with known truth: what a bench logger writes, and where its dwells really are.

Every log is 5 to 14 levels between 0 and 5 A. Unless its kind says otherwise: noise 2 mA, converter step 1 mA, 60 to
400 samples a level. `truth` holds the spans [first, stop) where the set current is held, the ramp to it left out.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np
import numpy.typing as npt
import pandas as pd

from acceptance.bench.log import BenchLog
from acceptance.bench.packed import Packed, pack
from acceptance.bench.packed_frame import PackedArray

__all__ = ["KINDS", "SweepLog", "bench_log", "is_exact", "make_sweep"]

Array = npt.NDArray[np.float64]
Span = tuple[int, int]

FULL_SCALE = 5.0  # A
NOISE = 0.002  # A
SMALLEST_STEP = 0.1  # A, between neighbouring levels: 2 % of full scale


@dataclass(frozen=True, slots=True)
class SweepLog:
    """One synthetic log: the logged current, the current that was set, and the spans where it was held."""

    current: Array  # [A]
    setting: Array  # [A], the setting in force at each sample, ramp included
    truth: tuple[Span, ...]


@dataclass(frozen=True, slots=True)
class Kind:
    """How one kind of log departs from the plain one."""

    length: tuple[int, int] = (60, 400)  # samples a level, smallest and largest
    ramp: tuple[int, int] = (0, 0)  # samples from one level to the next
    noise: float = NOISE  # [A]
    adc_step: float = 0.001  # [A]
    overshoot: float = 0.0  # of the step
    outliers: float = 0.0  # share of samples grossly wrong
    drift: float = 0.0  # of the reading, over a level
    levels: Callable[[np.random.Generator], Array] | None = None
    lengths: Callable[[np.random.Generator, int], npt.NDArray[np.int64]] | None = None
    disturb: Callable[[np.random.Generator, Array], Array] | None = None  # noise instead of the white one


def random_levels(rng: np.random.Generator) -> Array:
    """5 to 14 levels, neighbours at least SMALLEST_STEP apart, one in three logs beginning with no load."""
    count = int(rng.integers(5, 15))
    levels = [0.0 if rng.random() < 1 / 3 else rng.uniform(0, FULL_SCALE)]
    while len(levels) < count:
        level = rng.uniform(0, FULL_SCALE)
        if abs(level - levels[-1]) >= SMALLEST_STEP:
            levels.append(level)
    return np.round(levels, 3)


def repeated_levels(rng: np.random.Generator) -> Array:
    """A staircase up and down again, each level met twice, the top one once."""
    up = np.linspace(0, FULL_SCALE, int(rng.integers(4, 8)))
    return np.concatenate([up, up[-2::-1]])


def soak_and_steps(rng: np.random.Generator, count: int) -> npt.NDArray[np.int64]:
    """One long soak among short levels of 30 samples."""
    lengths = np.full(count, 30, dtype=np.int64)
    lengths[rng.integers(0, count)] = rng.integers(2000, 8000)
    return lengths


def autoregressive(coefficient: float) -> Callable[[np.random.Generator, Array], Array]:
    """Correlated noise of 2 mA: x[i] = coefficient * x[i - 1] + white."""

    def noise(rng: np.random.Generator, setting: Array) -> Array:
        white = rng.normal(0, NOISE * np.sqrt(1 - coefficient**2), setting.size)
        out = np.empty(setting.size)
        last = rng.normal(0, NOISE)
        for i, innovation in enumerate(white):
            last = coefficient * last + innovation
            out[i] = last
        return out

    return noise


def random_walk(rng: np.random.Generator, setting: Array) -> Array:
    """White noise on a wandering zero, 0.1 mA a sample."""
    return rng.normal(0, NOISE, setting.size) + np.cumsum(rng.normal(0, 1e-4, setting.size))


def mains_hum(rng: np.random.Generator, setting: Array) -> Array:
    """0.5 % of the reading, periodic (mains seen through the logger's slower rate), on white noise."""
    period = rng.uniform(5, 120)
    phase = rng.uniform(0, 2 * np.pi)
    hum = 0.005 * setting * np.sin(2 * np.pi * np.arange(setting.size) / period + phase)
    return hum + rng.normal(0, NOISE, setting.size)


def noise_of_the_reading(rng: np.random.Generator, setting: Array) -> Array:
    """White noise of 0.5 % of the reading, on the usual 2 mA."""
    return rng.normal(0, 1, setting.size) * (NOISE + 0.005 * setting)


KINDS: dict[str, Kind] = {
    "clean": Kind(),
    "coarse converter": Kind(adc_step=0.010),
    "ramps": Kind(ramp=(10, 60)),
    "overshoot": Kind(overshoot=0.25),
    "outliers": Kind(outliers=0.003),
    "drift": Kind(drift=0.004),
    "sparse": Kind(length=(4, 7)),
    "three samples": Kind(length=(3, 3)),
    "manual": Kind(length=(1, 1)),
    "soak and short steps": Kind(lengths=soak_and_steps),
    "all together": Kind(ramp=(10, 60), overshoot=0.25, outliers=0.003, noise=0.005),
    "very slow ramps": Kind(ramp=(80, 200)),
    "up and down": Kind(levels=repeated_levels),
    "correlated 0.9": Kind(disturb=autoregressive(0.9)),
    "correlated 0.98": Kind(disturb=autoregressive(0.98)),
    "random walk": Kind(disturb=random_walk),
    "hum": Kind(disturb=mains_hum),
    "noise of the reading": Kind(disturb=noise_of_the_reading),
    "no noise": Kind(noise=0.0),
}


def make_sweep(name: str, seed: int) -> SweepLog:
    """One log of the kind `name`; the same seed gives the same log."""
    rng = np.random.default_rng([sum(name.encode()), seed])
    kind = KINDS[name]
    levels = (kind.levels or random_levels)(rng)
    if kind.lengths is not None:
        lengths = kind.lengths(rng, levels.size)
    else:
        lengths = rng.integers(kind.length[0], kind.length[1] + 1, levels.size)
    ramps = rng.integers(kind.ramp[0], kind.ramp[1] + 1, levels.size)
    ramps[0] = 0

    true, setting, truth = _profile(levels, lengths, ramps, kind)
    if kind.disturb is not None:
        true = true + kind.disturb(rng, setting)
    else:
        true = true + rng.normal(0, kind.noise, true.size)
    wrong = np.flatnonzero(rng.random(true.size) < kind.outliers)
    true[wrong] += rng.choice([-1.0, 1.0], wrong.size) * rng.uniform(0.5, 3.0, wrong.size)
    return SweepLog(np.round(true / kind.adc_step) * kind.adc_step, setting, truth)


def _profile(
    levels: Array, lengths: npt.NDArray[np.int64], ramps: npt.NDArray[np.int64], kind: Kind
) -> tuple[Array, Array, tuple[Span, ...]]:
    """The current without noise, the setting, and the spans held."""
    parts: list[Array] = []
    setting: list[Array] = []
    truth: list[Span] = []
    at = 0
    before = float(levels[0])
    for level, length, ramp in zip(levels.tolist(), lengths.tolist(), ramps.tolist(), strict=True):
        i = np.arange(length)
        held = level * (1 + kind.drift * i / max(1, length - 1))
        # a damped swing, 25 % of the step at first, gone within a tenth of the level
        tau = max(1.0, length / 40)
        held = held + kind.overshoot * (level - before) * np.exp(-i / tau) * np.cos(i / tau)
        parts += [before + (level - before) * (np.arange(ramp) + 0.5) / max(1, ramp), held]
        setting.append(np.full(ramp + length, level))
        truth.append((at + ramp, at + ramp + length))
        at += ramp + length
        before = float(held[-1]) if kind.drift else level
    return np.concatenate(parts), np.concatenate(setting), tuple(truth)


def is_exact(found: list[Span], truth: tuple[Span, ...]) -> bool:
    """Whether every true span, and nothing else, was found.

    A span counts as found when it overlaps the truth by half of the shorter of both and by 30 % of the truth.
    """
    if len(found) != len(truth):
        return False
    for (first, stop), (begin, end) in zip(found, truth, strict=True):
        overlap = min(stop, end) - max(first, begin)
        if overlap < 0.5 * min(stop - first, end - begin) or overlap < 0.3 * (end - begin):
            return False
    return True


PACKED = {"columns": False}  # whether logs are built as very long ones are kept


def packed(values: np.ndarray) -> PackedArray:
    parts = [np.ascontiguousarray(values[at : at + 61]) for at in range(0, len(values), 61)]
    return PackedArray(Packed([pack(part, 3, look_for_run=True) for part in parts]))


def bench_log(**columns: object) -> BenchLog:
    """A log of these columns; `__` in a name stands for the space before an output: output_current__main."""
    data = {name.replace("__", " "): values for name, values in columns.items()}
    rows = len(next(iter(data.values())))
    frame = pd.DataFrame(data)
    for name in frame.columns:
        if name != "stage" and not name.startswith("load_mode"):
            frame[name] = frame[name].astype(np.int64 if name == "table" else np.float64)
    for name in frame.columns if PACKED["columns"] else ():
        if frame[name].dtype == np.float64:
            frame[name] = packed(frame[name].to_numpy())
    frame["stage"] = pd.Categorical(frame["stage"] if "stage" in frame else ["steady"] * rows)
    if "table" not in frame:
        frame["table"] = 0
    frame["line"] = np.arange(rows) + 2
    tables = tuple(f"A-17-{i}.csv" for i in range(int(frame["table"].max()) + 1)) if rows else ("A-17.csv",)
    return BenchLog("A-17", frame, (), (), tables)
