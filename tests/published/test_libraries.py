"""The statistics against general-purpose libraries: statsmodels, scipy.stats, and plain Monte Carlo with numpy."""

from __future__ import annotations

import math
import warnings

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from scipy import stats

from acceptance.checks.efficiency import check_efficiency
from acceptance.decision import _probability_within, conformity_probability
from acceptance.points.propagation import Source, coverage_factor, expanded, of_source
from acceptance.points.type_a import autocorrelation, type_a
from tests.checks.built import adapter, limits_from, points_from

with warnings.catch_warnings():
    warnings.simplefilter("ignore")  # of its own imports
    from statsmodels.tsa.stattools import acf


@pytest.mark.parametrize("seed", range(5))
def test_autocorrelation_agrees_with_statsmodels(seed):
    samples = np.cumsum(np.random.default_rng(seed).normal(size=240))

    np.testing.assert_allclose(autocorrelation(samples), acf(samples, nlags=239, fft=True), atol=1e-10)
    np.testing.assert_allclose(autocorrelation(samples, 2), acf(samples, nlags=2, fft=False), atol=1e-12)


def test_type_a_of_independent_samples_agrees_with_the_standard_error():
    """White noise of a seed whose first coefficient is negative: nothing is added to s / sqrt n."""
    for seed in range(40):
        samples = np.random.default_rng(seed).normal(5, 0.1, 24)
        if autocorrelation(samples, 1)[1] < -0.1:
            assert type_a(samples).standard_uncertainty == pytest.approx(stats.sem(samples), rel=1e-12)
            return
    pytest.fail("no such seed")


@given(st.floats(-5, 5), st.floats(0.01, 3), st.floats(-4, 0), st.floats(0.1, 4), st.floats(1, 400))
def test_conformity_probability_agrees_with_student_t(value, u, low, width, freedom):
    high = low + width
    t = stats.t(freedom, loc=value, scale=u)

    p = conformity_probability(value, u, low=low, high=high, degrees_of_freedom=freedom)
    assert p == pytest.approx(t.cdf(high) - t.cdf(low), abs=1e-10)
    one_sided = conformity_probability(value, u, low=low, high=None, degrees_of_freedom=freedom)
    assert one_sided == pytest.approx(t.sf(low), abs=1e-10)


@pytest.mark.parametrize("freedom", [1.0, 2.5, 10.0, 16.75, 1e6, math.inf])
@pytest.mark.parametrize("confidence", [0.6827, 0.9, 0.95, 0.99])
def test_coverage_factor_agrees_with_the_quantile(freedom, confidence):
    quantile = stats.norm.ppf(0.5 + confidence / 2)
    if math.isfinite(freedom):
        quantile = stats.t.ppf(0.5 + confidence / 2, freedom)

    assert coverage_factor(confidence, freedom) == pytest.approx(quantile, rel=1e-9)


@pytest.mark.parametrize("rho", [-0.9, -0.3, 0.4, 0.95])
def test_joint_probability_agrees_with_the_multivariate_normal(rho):
    """Three findings, two of them correlated, against the integral."""
    first = of_source(1.0, Source("a", "B"))
    second = rho * first + of_source(math.sqrt(1 - rho * rho), Source("b", "B"))
    third = of_source(1.0, Source("c", "B"))
    bounds = [(-math.inf, 1.0), (-0.5, math.inf), (-1.5, 1.2)]

    matrix = np.eye(3)
    matrix[0, 1] = matrix[1, 0] = rho
    low, high = np.array(bounds).T
    exact = stats.multivariate_normal(cov=matrix).cdf(high, lower_limit=low)
    # four standard deviations of a count of 200 000
    assert _probability_within(bounds, [first, second, third]) == pytest.approx(exact, abs=4 * 0.5 / math.sqrt(200_000))


def test_efficiency_agrees_with_monte_carlo():
    """First order is enough: u of an average efficiency against 200 000 draws of every error."""
    bench = """
instruments:
  input_power: {device: P1, accuracy: "0.5 % reading + 0.05 W, k = 2"}
  output_voltage: {device: M1, accuracy: "0.2 % reading + 10 mV, k = 2"}
  output_current: {device: L1, accuracy: "0.3 % reading + 5 mA, k = 2"}
lead_resistance: {output: 40 mohm ± 10 mohm}
"""
    limits = limits_from(
        "  efficiency: [{name: avg, average: [25 %, 100 %], at: {input: 230 V}, min: 50 %}]", bench=bench
    )
    loads = (0.25, 1.0)
    points = points_from([adapter(load) for load in loads], limits)
    estimate = check_efficiency(limits.requirements, points).outcomes[0].candidates[0].estimate

    rng, n = np.random.default_rng(8), 200_000
    gains = {key: rng.normal(0, g / 2, n) for key, g in (("p", 0.005), ("v", 0.002), ("i", 0.003))}
    lead = 0.04 + rng.uniform(-0.01, 0.01, n)
    total = np.zeros(n)
    for load in loads:
        row = adapter(load)
        true = {}
        for key, channel, gain, fixed in (
            ("p", "input_power", 0.005, 0.05),
            ("v", "output_voltage main", 0.002, 0.01),
            ("i", "output_current main", 0.003, 0.005),
        ):
            x = row[channel]
            whole, shared = (gain * x + fixed) / 2, gain * x / 2
            true[key] = x * (1 + gains[key]) + rng.normal(0, math.sqrt(whole**2 - shared**2), n)
        total += (true["v"] + true["i"] * lead) * true["i"] / true["p"] / len(loads)
    assert estimate.nominal == pytest.approx(total.mean(), abs=4 * total.std() / math.sqrt(n) + 2e-5)
    assert expanded(estimate.value, 0.95).standard == pytest.approx(total.std(), rel=0.01)
