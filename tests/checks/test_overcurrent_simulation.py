"""Overloads by simulation: each limiter under each load mode, at several noises and densities of samples.

`SIMULATED_LOGS=2000` runs more of them than the default.
"""

from __future__ import annotations

import os
from collections import Counter
from dataclasses import dataclass, replace

import numpy as np
import pytest

from acceptance.bench.health import check_health
from acceptance.bench.log import Doubt
from acceptance.checks.outcome import Candidate
from acceptance.checks.overcurrent import check_overcurrent
from acceptance.judge import find_points
from acceptance.points.propagation import expanded
from tests.overcurrent_logs import AMPERES, STATIC, VOLTS, Meters, Unit, built, limits_for, log_of

LOGS = int(os.environ.get("SIMULATED_LOGS", "300"))
KINDS = (*STATIC, "hiccup", "latch off", "constant current, then latch off")
MODES = ("CC", "CR", "CV")
LIMITS = limits_for()


@dataclass(frozen=True)
class Run:
    """One simulated log and what was made of it."""

    seed: int
    unit: Unit
    mode: str
    outcomes: dict[str, Candidate]
    bars: tuple[Doubt, ...]

    @property
    def named(self) -> str:
        """The behaviour as named; a mixed one, of which `any` says that it is none of its kinds, too."""
        candidate = self.outcomes["behaviour"]
        return candidate.text or ("mixed" if candidate.reason.startswith("mixed") else "not judged")

    @property
    def allowed(self) -> set[str]:
        """What it may be called; in CC mode a combination collapses like a latch."""
        if "then" not in self.unit.kind:
            return {"not judged", self.unit.kind}
        return {"not judged", "mixed", *(["latch off"] if self.mode == "CC" else [])}


def simulated(seed: int) -> Run:
    """A unit, a load and meters drawn at random, swept and judged."""
    rng = np.random.default_rng(seed)
    kind, mode = KINDS[rng.integers(len(KINDS))], MODES[rng.integers(len(MODES))]
    period = float(rng.choice([0.2, 0.5, 1.0]))
    unit = Unit(
        kind,
        onset=AMPERES * rng.uniform(1.1, 1.4),
        short=AMPERES * rng.uniform(0.2, 0.6),
        slope=rng.uniform(-0.03, 0.05),
        burst=AMPERES * rng.uniform(1.4, 1.8),
        period=period,
        on=period * rng.uniform(0.08, 0.4),
        latch_at=rng.uniform(0.3, 0.6),
    )
    settings, samples, interval = int(rng.choice([6, 10, 16, 30])), int(rng.choice([1, 3, 10, 40])), 0.05
    if kind == "hiccup":  # some too slow to show it, some settings too short
        interval, samples = period / rng.choice([4, 12, 25]), int(rng.choice([5, 30, 120]))
    gains, offsets = rng.uniform(-1, 1, 2) * (0.001, 0.002), rng.uniform(-1, 1, 2) * (0.006, 0.004)
    meters = Meters(
        noise=float(rng.choice([0, 1e-4, 1e-3, 5e-3])),
        errors=lambda v, i: (v * (1 + gains[0]) + offsets[0], i * (1 + gains[1]) + offsets[1]),
    )
    frame = built(
        unit,
        mode,
        settings=settings,
        samples=samples,
        interval=interval,
        back=int(12 / interval),
        jitter=rng.uniform(0.05, 1),
        meters=meters,
        seed=seed,
    )
    log = log_of(frame)
    doubts = check_health(log, supply="ac", rated_input_voltage=230.0, rated={"main": (VOLTS, AMPERES)})
    points = find_points(replace(log, doubts=doubts), LIMITS)
    outcomes = check_overcurrent(LIMITS.requirements, points).outcomes
    found = {outcome.name.partition(".")[2]: outcome.candidates[0] for outcome in outcomes}
    return Run(seed, unit, mode, found, tuple(doubt for doubt in points.log.doubts if doubt.bars))


@pytest.fixture(scope="module")
def runs() -> list[Run]:
    return [simulated(seed) for seed in range(LOGS)]


@pytest.mark.slow
def test_behaviour_is_never_named_wrongly(runs):
    """The confusion of all kinds and modes, printed; a refusal is allowed, another name is not."""
    confusion = Counter((run.unit.kind, run.mode, run.named) for run in runs)
    for key in sorted(confusion):
        print(*key, confusion[key], sep=" | ")  # noqa: T201 - read with -s, or when it fails

    assert [(run.seed, run.unit, run.mode, run.named) for run in runs if run.named not in run.allowed] == []


@pytest.mark.slow
def test_behaviour_is_named_where_the_samples_show_it(runs):
    """Refusing everything would name nothing wrongly either."""
    static = [run for run in runs if run.unit.kind in STATIC and run.mode != "CC"]
    in_time = [run for run in runs if run.unit.kind == "latch off"]

    assert np.mean([run.named == run.unit.kind for run in static]) > 0.6  # a fourth is swept in too few settings
    assert np.mean([run.named == "latch off" for run in in_time]) > 0.9


@pytest.mark.slow
def test_kind_of_a_limiter_is_never_named_in_cc_mode(runs):
    named = {run.named for run in runs if run.mode == "CC" and run.unit.kind in STATIC}

    assert named == {"not judged"}


@pytest.mark.slow
def test_onset_lies_within_its_uncertainty(runs):
    inside = []
    for run in runs:
        candidate = run.outcomes["onset"]
        if candidate.estimate is not None and candidate.known == "value":
            u = expanded(candidate.estimate.value, 0.95).expanded
            inside.append(abs(candidate.estimate.nominal - run.unit.true_onset(run.mode)) <= u)

    assert len(inside) > 0.9 * len(runs)
    assert np.mean(inside) >= 0.95


@pytest.mark.slow
def test_health_bars_no_honest_overload(runs):
    """Bursts, flat zeros, shorts and collapses: nothing of it is a clipped, frozen or missing reading."""
    assert [(run.seed, run.bars) for run in runs if run.bars] == []
