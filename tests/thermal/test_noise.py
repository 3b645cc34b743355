"""What wander does to a slope and to a fit."""

from __future__ import annotations

import math

import numpy as np
import pytest

from acceptance.thermal.noise import Noise, wander_inflation
from acceptance.thermal.warming import line_of

WINDOW = 1800.0
TIME = np.arange(0.0, 4 * 3600.0, 45.0)


def wander(correlation: float, random: np.random.Generator) -> np.ndarray:
    """A first-order process of deviation 1 and this correlation time. [s]"""
    keeps = math.exp(-45.0 / correlation)
    found = random.standard_normal(TIME.size)
    for at in range(1, TIME.size):
        found[at] = keeps * found[at - 1] + math.sqrt(1 - keeps**2) * found[at]
    return found


def test_white_noise_inflates_nothing() -> None:
    random = np.random.default_rng(3)
    found = [wander_inflation(TIME, random.standard_normal(TIME.size), 3, WINDOW) for _ in range(100)]

    # three standard deviations of a variance
    assert np.count_nonzero(np.array(found) > 1) <= 2


def test_wander_of_a_quarter_of_an_hour_inflates_by_what_it_stays() -> None:
    """The variance of a mean of such a process is 2 x 960 s / 45 s = 42.7 times that of white noise."""
    random = np.random.default_rng(4)
    found = [wander_inflation(TIME, wander(960.0, random), 3, WINDOW) for _ in range(50)]

    assert np.median(found) >= 0.9 * 42.7


@pytest.mark.parametrize("period", [600.0, 1800.0, 2720.0, 7200.0, 4 * 3600.0])
def test_slope_of_a_sine_is_at_most_what_its_deviation_allows(period: float) -> None:
    """For a sine of deviation s the slope is at most 2.61 s / window, at a period of pi/2.08 windows."""
    part = TIME[TIME < WINDOW]
    phases = np.linspace(0, 2 * np.pi, 90, endpoint=False)
    slopes = [line_of(part, math.sqrt(2) * np.sin(2 * np.pi * part / period + phase))[1] for phase in phases]
    bound = 2.61 / WINDOW

    assert math.sqrt(np.mean(np.square(slopes))) <= 1.03 * bound  # readings instead of a line


def test_uncertainty_of_a_slope_is_near_its_spread_for_wander() -> None:
    """0.143 K of 0.1 K wander of 16 min by simulation of the process alone: never far below, and bounded above."""
    random = np.random.default_rng(5)
    truth = float(np.std([line_of(TIME[:41], wander(960.0, random)[:41])[1] for _ in range(400)]))
    found = []
    for _ in range(60):
        noise = Noise.of(TIME, wander(960.0, random), WINDOW, None)
        found.append(noise.of_slope(WINDOW))
        assert found[-1] <= 2 * 2.61 * noise.deviation / WINDOW

    assert np.median(found) >= 0.7 * truth
    assert np.median(found) <= 2.5 * truth
