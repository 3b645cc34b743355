"""Truth by simulation: intervals cover it as often as they say, and wrong passes stay as rare as they should.

Every log is built from a unit whose efficiency and regulation are known in closed form, read through meters whose
errors are drawn from what their accuracy texts say. `SIMULATED_LOGS=2000` runs more of them than the default.
"""

from __future__ import annotations

import os
from collections.abc import Callable
from dataclasses import dataclass

import numpy as np
import pandas as pd
import pytest
from numpy.typing import NDArray
from scipy.signal import lfilter

from acceptance.bench.log import BenchLog, Channel
from acceptance.checks.efficiency import check_efficiency
from acceptance.checks.regulation import check_load_regulation
from acceptance.decision import decide
from acceptance.judge import find_points
from acceptance.points.instrument import split
from acceptance.points.propagation import expanded
from tests.checks.built import limits_from

LOGS = int(os.environ.get("SIMULATED_LOGS", "500"))
LEVELS = (0.0, 0.25, 0.5, 0.75, 1.0)
SAMPLES = 60
VOLTS, AMPERES, DROOP = 12.0, 4.0, 0.02

GAUSSIAN = """
instruments:
  input_power: {device: P1, accuracy: "0.2 % reading + 0.02 W, k = 2"}
  output_voltage: {device: M1, accuracy: "0.05 % reading + 6 mV, k = 2"}
  output_current: {device: L1, accuracy: "0.1 % reading + 2 mA, k = 2"}
"""
RECTANGULAR = GAUSSIAN.replace(", k = 2", "")
REQUIREMENTS = """
  efficiency:
    - {name: eff-50, at: {load: 50 %, input: 230 V}, min: LIMIT}
    - {name: eff-avg, average: [25 %, 50 %, 75 %, 100 %], at: {input: 230 V}, min: 10 %}
  load_regulation:
    - {name: loadreg, from: 0 %, to: 100 %, at: {input: 230 V}, max: 2 %, relative_to: full load}
"""

Draw = Callable[[np.random.Generator, float, float], float]


@dataclass(frozen=True)
class Truth:
    """What a simulated unit does."""

    volts: NDArray[np.float64]
    amperes: NDArray[np.float64]
    watts: NDArray[np.float64]

    def efficiency(self, level: int) -> float:
        return float(self.volts[level] * self.amperes[level] / self.watts[level])

    @property
    def regulation(self) -> float:
        return float((self.volts.max() - self.volts.min()) / self.volts[-1])


def unit() -> Truth:
    amperes = AMPERES * np.array(LEVELS)
    volts = VOLTS - DROOP * amperes
    return Truth(volts, amperes, volts * amperes + 0.5 + 0.4 * amperes + 0.1 * amperes**2)


def white(rng, sigma, n):
    return rng.normal(0, sigma, n)


def wandering(rng, sigma, n):
    """First-order noise with a coefficient of 0.8, of the same standard deviation."""
    start = 60
    drawn = lfilter([1.0], [1.0, -0.8], rng.normal(0, sigma * np.sqrt(1 - 0.64), n + start))
    return np.asarray(drawn)[start:]


def flat(rng, sigma, n):
    return rng.uniform(-sigma * np.sqrt(3), sigma * np.sqrt(3), n)


def gaussian_errors(rng, meter, truths):
    """One gain error for all levels, the rest anew at each, with the u that the settled rule gives."""
    gain = rng.normal(0, meter.accuracy.gain / meter.accuracy.coverage)
    rest = [split(meter.accuracy, x, meter_range=0, resolution=0).rest * rng.normal() for x in truths]
    return gain * truths + np.array(rest)


def rectangular_errors(rng, meter, truths):
    """A gain and a fixed error, each anywhere within its bound."""
    gain = rng.uniform(-1, 1) * meter.accuracy.gain
    return gain * truths + rng.uniform(-1, 1, len(truths)) * meter.accuracy.fixed


def simulated(rng, truth, limits, *, noise, errors, sigma):
    """The log of one unit, as this bench would have read it."""
    spread = {"input_power": 0.02, "output_voltage main": 0.004, "output_current main": 0.001}
    columns = {"input_voltage": np.full(len(LEVELS) * SAMPLES, 230.0)}
    for key, values in zip(spread, (truth.watts, truth.volts, truth.amperes), strict=True):
        seen = values + errors(rng, limits.meter(key), values)
        columns[key] = np.concatenate([level + noise(rng, sigma * spread[key], SAMPLES) for level in seen])
    table = pd.DataFrame(columns)
    channels = tuple(Channel(k, k.split()[0], k.partition(" ")[2], k, "", "heading", 1, 0, "", "") for k in columns)
    table["load_setting main"] = np.repeat(AMPERES * np.array(LEVELS), SAMPLES)
    table["time"] = np.arange(len(table), dtype=float)
    table["stage"] = pd.Categorical(["steady"] * len(table))
    table["table"], table["line"] = 0, np.arange(2, len(table) + 2)
    return BenchLog("S-1", table, channels, (), ("S-1.csv",))


def run(seed, *, bench, noise, errors, limit="10 %", sigma=1.0, logs=LOGS):
    """For each log: value and expanded uncertainty of the three findings, and the verdict of the first."""
    limits = limits_from(REQUIREMENTS.replace("LIMIT", limit), bench=bench + "log: {settle: 0 s}\n")
    truth, rng = unit(), np.random.default_rng(seed)
    by_kind = {k: [r for r in limits.requirements if r.characteristic == k] for k in ("efficiency", "load_regulation")}
    rows, verdicts = [], []
    for _ in range(logs):
        points = find_points(simulated(rng, truth, limits, noise=noise, errors=errors, sigma=sigma), limits)
        outcomes = [
            *check_efficiency(by_kind["efficiency"], points).outcomes,
            *check_load_regulation(by_kind["load_regulation"], points).outcomes,
        ]
        estimates = [outcome.candidates[0].estimate for outcome in outcomes]
        rows.append([(e.nominal, expanded(e.value, 0.95).expanded) for e in estimates])
        verdicts.append(decide(outcomes[0], limits.decision).verdict)
    return truth, np.array(rows), verdicts


def truths(truth):
    average = np.mean([truth.efficiency(level) for level in (1, 2, 3, 4)])
    return np.array([truth.efficiency(2), average, truth.regulation])


def coverage(truth, rows):
    """Share of the logs whose intervals hold the truth: efficiency, average efficiency, load regulation."""
    return np.mean(np.abs(rows[:, :, 0] - truths(truth)) <= rows[:, :, 1], axis=0)


@pytest.mark.slow
@pytest.mark.parametrize(("noise", "sigma", "seed"), [
    pytest.param(white, 0.2, 11, id="meters alone matter"),
    pytest.param(white, 5.0, 12, id="white noise"),
    pytest.param(wandering, 3.0, 13, id="correlated noise"),
])  # fmt: skip
def test_intervals_cover_the_truth_with_gaussian_errors(noise, sigma, seed):
    truth, rows, _ = run(seed, bench=GAUSSIAN, noise=noise, errors=gaussian_errors, sigma=sigma)

    covered = coverage(truth, rows)
    # 93.5 to 96.5 % of 2 000 logs; fewer logs are given one standard deviation of their count
    slack = 0.0 if LOGS >= 2000 else np.sqrt(0.05 * 0.95 / LOGS)
    assert covered.min() >= 0.935 - slack
    assert covered.max() <= 0.965 + slack


@pytest.mark.slow
def test_intervals_cover_the_truth_with_rectangular_errors():
    truth, rows, _ = run(14, bench=RECTANGULAR, noise=flat, errors=rectangular_errors)

    assert coverage(truth, rows).min() >= 0.94


@pytest.mark.slow
@pytest.mark.parametrize(("noise", "seed"), [(white, 15), (wandering, 16)])
def test_guarded_accepts_less_than_one_in_forty_just_outside_the_limit(noise, seed):
    """The true efficiency lies one part in a million below its limit, where a wrong pass is most likely."""
    limit = f"{100 * unit().efficiency(2) * (1 + 1e-6):.8f} %"
    _, _, verdicts = run(seed, bench=GAUSSIAN, noise=noise, errors=gaussian_errors, limit=limit, sigma=3.0)

    accepted = verdicts.count("pass") / len(verdicts)
    # 2.5 % and three standard deviations of a count of so many logs
    assert accepted <= 0.025 + 3 * np.sqrt(0.025 * 0.975 / len(verdicts)), accepted
    assert accepted > 0  # the simulation can find a wrong pass at all
