"""Windings drawn back to switch-off: the truth lies within the interval, and never silently above it."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from acceptance.errors import MeasurementError
from acceptance.points.propagation import coverage_factor
from acceptance.thermal.resistance import temperature_by_resistance, to_switch_off, winding_rise


@given(
    cold=st.floats(0.01, 100), ratio=st.floats(1.01, 1.6), start=st.floats(0, 40), end=st.floats(0, 40),
    constant=st.sampled_from([225.0, 228.0, 234.5]),
)  # fmt: skip
def test_rise_is_the_temperature_less_the_ambient_at_the_end(
    cold: float, ratio: float, start: float, end: float, constant: float
) -> None:
    rise = winding_rise(cold, ratio * cold, start=start, end=end, constant=constant)
    temperature = temperature_by_resistance(cold, ratio * cold, start=start, constant=constant)

    assert rise == pytest.approx(temperature - end, abs=1e-9)


@pytest.mark.parametrize("fast", [True, False])
@pytest.mark.parametrize("noise", [0.005, 0.02, 0.1])
def test_switch_off_lies_within_its_interval(noise: float, fast: bool) -> None:
    """A part of 3 K to 15 K that falls within a minute or so, or none, under one that takes half an hour."""
    random = np.random.default_rng(4)
    covered, count = 0, 60
    for _ in range(count):
        parts = np.array([random.uniform(3, 15) if fast else 0.0, random.uniform(30, 60)])
        taus = np.array([random.uniform(20, 90), random.uniform(900, 3600)])
        time = random.uniform(5, 30) + random.uniform(5, 15) * np.arange(float(random.integers(8, 40)))
        rises = np.exp(-time[:, None] / taus) @ parts + noise * random.standard_normal(time.size)
        found = to_switch_off(time, rises)
        covered += abs(found.rise - parts.sum()) <= coverage_factor(0.95, found.degrees_of_freedom) * found.u

    assert covered >= 0.94 * count - 2


@pytest.mark.parametrize("count", [3, 4])
def test_few_readings_are_drawn_back_by_a_straight_logarithm_with_a_wide_interval(count: int) -> None:
    time = 15.0 + 15.0 * np.arange(float(count))
    rises = 10 * np.exp(-time / 60) + 65 * np.exp(-time / 1800)

    found = to_switch_off(time, rises)

    assert "straight in the logarithm" in found.method
    assert abs(found.rise - 75.0) <= coverage_factor(0.95, found.degrees_of_freedom) * found.u


@pytest.mark.parametrize(
    ("rises", "told"),
    [([50.0, 49.0], "only 2 readings"), ([49.0, 50.0, 51.0], "does not cool"), ([5.0, 1.0, -3.0], "does not cool")],
)
def test_readings_that_tell_nothing_are_refused(rises: list[float], told: str) -> None:
    with pytest.raises(MeasurementError, match=told):
        to_switch_off(10.0 * np.arange(1.0, len(rises) + 1), np.array(rises))
