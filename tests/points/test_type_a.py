"""Type A of correlated samples: closed forms, and coverage of the truth by simulation."""

from __future__ import annotations

import math

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from hypothesis.extra.numpy import arrays
from scipy.signal import lfilter
from scipy.special import bdtr

from acceptance.points import type_a as type_a_module
from acceptance.points.propagation import coverage_factor
from acceptance.points.type_a import TypeA, autocorrelation, type_a

LOGS = 400
any_samples = arrays(float, st.integers(1, 80), elements=st.floats(-1e9, 1e9))
# whole numbers, so that a shift by one is exact; short, so that no sum is cut where rounding decides
whole_samples = arrays(float, st.integers(1, 29), elements=st.integers(-1000, 1000).map(float))


def first_order(rng: np.random.Generator, n: int, phi: float, *, logs: int = LOGS) -> np.ndarray:
    """Logs of a stationary first-order process of mean 0 and deviation 1, one a row."""
    drawn = rng.standard_normal((logs, n))
    drawn[:, 1:] *= math.sqrt(1 - phi * phi)
    return lfilter([1.0], [1.0, -phi], drawn, axis=1)


def covers(told: TypeA, truth: float) -> bool:
    """Whether the 95 % interval of a mean holds the truth."""
    half = coverage_factor(0.95, told.degrees_of_freedom) * told.standard_uncertainty
    return abs(told.mean - truth) <= half


def at_least(share: float, trials: int = LOGS) -> int:
    """The count that trials of this share fall below once in a thousand times."""
    return next(n for n in range(trials + 1) if bdtr(n, trials, share) > 1e-3)


# --- closed forms ---------------------------------------------------------------------------------------------------


def test_type_a_of_one_reading_has_no_uncertainty():
    """A single reading tells its value, and nothing about its spread."""
    assert type_a(np.array([24.01])) == TypeA(24.01, None, 0.0, 1, None, None)


def test_type_a_of_two_readings():
    """Half the difference, with one degree of freedom."""
    told = type_a(np.array([1.0, 3.0]))

    assert (told.mean, told.degrees_of_freedom, told.readings, told.effective_readings) == (2.0, 1.0, 2, 2.0)
    assert told.deviation == pytest.approx(math.sqrt(2))
    assert told.standard_uncertainty == pytest.approx(1.0)


def test_type_a_of_three_readings():
    """s / sqrt(3): too few to tell anything of their correlation."""
    told = type_a(np.array([1.0, 2.0, 6.0]))

    assert told.mean == pytest.approx(3.0)
    assert told.deviation == pytest.approx(math.sqrt(7))
    assert told.standard_uncertainty == pytest.approx(math.sqrt(7 / 3))
    assert told.degrees_of_freedom == 2.0


@pytest.mark.parametrize("n", [4, 10, 30, 100, 1001])
def test_type_a_never_believes_negative_correlation(n):
    """Readings that alternate would average better than independent ones; s / sqrt(n) it stays."""
    told = type_a(np.where(np.arange(n) % 2, 1.0, -1.0))

    assert told.standard_uncertainty == pytest.approx(told.deviation / math.sqrt(n))
    assert told.effective_readings == n
    assert told.degrees_of_freedom == n - 1


@pytest.mark.parametrize("n", [2, 3, 4, 29, 30, 5000])
@pytest.mark.parametrize("value", [0.0, 24.1, -3.3e-7, 7e8, 0.1])
def test_type_a_of_constant_readings(n, value):
    """No spread, no uncertainty of type A: rounding of the mean does not count."""
    told = type_a(np.full(n, value))

    assert told.mean == pytest.approx(value, rel=1e-15)
    assert (told.standard_uncertainty, told.deviation) == (0.0, 0.0)
    assert (told.degrees_of_freedom, told.effective_readings) == (n - 1, n)


@pytest.mark.parametrize("n", [60, 600])
def test_type_a_of_a_step_in_the_middle(n):
    """Half the readings at one level and half at another say hardly more than two readings do."""
    told = type_a(np.repeat([0.0, 1.0], n // 2))

    assert told.mean == 0.5
    assert told.effective_readings < 4
    assert told.standard_uncertainty > 0.3


@pytest.mark.parametrize("phi", [0.0, 0.3, 0.6, 0.9])
def test_type_a_of_a_long_first_order_process(phi):
    """u^2 n is the variance times (1 + phi) / (1 - phi), the integrated autocorrelation time."""
    n = 40_000
    told = type_a(first_order(np.random.default_rng(3), n, phi, logs=1)[0])
    time = (1 + phi) / (1 - phi)

    assert told.deviation == pytest.approx(1.0, abs=5 * math.sqrt(time / n))
    assert told.standard_uncertainty == pytest.approx(math.sqrt(time / n), rel=0.1)
    assert told.effective_readings == pytest.approx(n / time, rel=0.2)


# --- the autocorrelation --------------------------------------------------------------------------------------------


@pytest.mark.parametrize("n", [1, 2, 3, 4, 7, 64, 100])
@pytest.mark.parametrize("lags", [0, 1, 2, 3, 20, None])
def test_autocorrelation_is_its_definition(n, lags):
    """Sum by sum, whatever way it was formed."""
    samples = np.random.default_rng(n).standard_normal(n).cumsum()
    d = samples - samples.mean()
    kept = n if lags is None else min(lags + 1, n)
    expected = [sum(d[t] * d[t + k] for t in range(n - k)) / sum(d * d) if n > 1 else 0.0 for k in range(kept)]

    assert autocorrelation(samples, lags) == pytest.approx(expected, abs=1e-12)


def test_autocorrelation_of_a_straight_line():
    """Closed form for 1 to n: r_1 = 1 - 3 / n + 3 / n (n + 1) - ..., here as a fraction for n = 4: 1/4."""
    assert autocorrelation(np.array([1.0, 2.0, 3.0, 4.0])) == pytest.approx([1.0, 0.25, -0.3, -0.45])


def test_autocorrelation_of_constant_readings_is_zero():
    """Nothing varies, so nothing varies together."""
    assert autocorrelation(np.full(9, 5.0)).tolist() == [0.0] * 9


# --- coverage -------------------------------------------------------------------------------------------------------


@pytest.mark.parametrize(
    ("phi", "n", "share"),
    [
        (0.0, 60, 0.95),
        (0.0, 300, 0.95),
        (0.6, 60, 0.925),  # a short log of correlated readings tells little of how correlated they are
        (0.6, 300, 0.94),
        (0.9, 60, 0.90),  # the worth of three independent readings
        (0.9, 300, 0.935),
    ],
)
def test_type_a_covers_the_truth(phi, n, share):
    """The 95 % interval holds the true mean in this share of 400 logs, within what 400 logs can tell."""
    logs = first_order(np.random.default_rng(20_260_101), n, phi)
    told = [type_a(log) for log in logs]

    assert sum(covers(one, 0.0) for one in told) >= at_least(share)
    # and not by being timid: u is what it should be, in the middle of the logs
    truth = math.sqrt((1 + phi) / (1 - phi) / n)
    assert np.median([one.standard_uncertainty for one in told]) == pytest.approx(truth, rel=0.25)
    if phi:  # as independent readings they would be far off, so that the count above can fail
        naive = [TypeA(one.mean, one.deviation / math.sqrt(n), n - 1, n, n, one.deviation) for one in told]
        assert sum(covers(one, 0.0) for one in naive) < at_least(0.8)


@pytest.mark.parametrize("n", [4, 8, 20])
def test_type_a_covers_the_truth_with_few_independent_readings(n):
    """A handful of readings by hand."""
    logs = np.random.default_rng(5).standard_normal((LOGS, n))

    assert sum(covers(type_a(log), 0.0) for log in logs) >= at_least(0.95)


@pytest.mark.parametrize(("length", "n"), [(20, 1000), (20, 4000), (100, 4000)])
def test_type_a_covers_the_truth_under_white_noise_that_wanders(length, n):
    """A slow wander, half the noise's deviation, that the first coefficient hardly shows."""
    rng = np.random.default_rng(8)
    logs = 200
    wander = 0.5 * first_order(rng, n, math.exp(-1 / length), logs=logs)
    told = [type_a(log) for log in wander + rng.standard_normal((logs, n))]

    assert sum(covers(one, 0.0) for one in told) >= at_least(0.93, logs)
    # what the first coefficient alone would say: r_1 = 0.2 at most, half again as many readings at most
    naive = sum(abs(one.mean) <= 1.96 * one.deviation * math.sqrt(1.5 / n) for one in told)
    assert naive < at_least(0.8, logs)


# --- properties -----------------------------------------------------------------------------------------------------


@given(any_samples)
def test_type_a_never_gives_nan(samples):
    """Whatever was logged: finite numbers, in their proper order."""
    told = type_a(samples)

    assert told.readings == samples.size
    slack = 1e-9 * np.abs(samples).max()
    assert samples.min() - slack <= told.mean <= samples.max() + slack
    if samples.size == 1:
        assert told.standard_uncertainty is None
        return
    assert math.isfinite(told.standard_uncertainty)
    assert told.standard_uncertainty >= 0.999 * told.deviation / math.sqrt(samples.size)
    assert 1 <= told.degrees_of_freedom <= samples.size - 1
    assert 1 <= told.effective_readings <= samples.size


@given(whole_samples, st.sampled_from([-8.0, -1.0, 0.25, 2.0, 1024.0]), st.integers(-1000, 1000))
def test_type_a_follows_shift_and_scale(samples, scale, shift):
    """Another unit or another zero: the mean follows, u only the unit, and what is a count stays."""
    told, moved = type_a(samples), type_a(scale * (samples + shift))

    assert moved.mean == pytest.approx(scale * (told.mean + shift), rel=1e-12, abs=1e-9)
    assert moved.degrees_of_freedom == pytest.approx(told.degrees_of_freedom, rel=1e-6)
    if samples.size > 1:
        assert moved.standard_uncertainty == pytest.approx(abs(scale) * told.standard_uncertainty, rel=1e-6)
        assert moved.deviation == pytest.approx(abs(scale) * told.deviation, rel=1e-6)
        assert moved.effective_readings == pytest.approx(told.effective_readings, rel=1e-6)


@pytest.mark.parametrize("phi", [0.0, 0.9])
@pytest.mark.parametrize(("scale", "shift"), [(-1.0, 0.0), (1e-3, 230.0), (1.0, 1e4)])
def test_type_a_of_a_long_log_follows_shift_and_scale(phi, scale, shift):
    """The same for logs whose whole autocorrelation is looked at."""
    for log in first_order(np.random.default_rng(2), 500, phi, logs=20):
        told, moved = type_a(log), type_a(scale * log + shift)
        assert moved.standard_uncertainty == pytest.approx(abs(scale) * told.standard_uncertainty, rel=1e-6)
        assert moved.degrees_of_freedom == pytest.approx(told.degrees_of_freedom, rel=1e-6)


@given(whole_samples)
def test_type_a_of_the_log_backwards(samples):
    """Time's direction does not matter."""
    told, back = type_a(samples), type_a(samples[::-1])

    assert back.mean == pytest.approx(told.mean, rel=1e-12, abs=1e-12)
    if samples.size > 1:
        assert back.standard_uncertainty == pytest.approx(told.standard_uncertainty, rel=1e-9)


def test_type_a_of_a_shuffled_log_takes_it_for_independent():
    """Order is what tells correlation: shuffled, readings that wander count each for itself, about."""
    rng = np.random.default_rng(4)
    log = first_order(rng, 400, 0.9, logs=1)[0]
    shuffled = [type_a(rng.permutation(log)) for _ in range(50)]
    told = type_a(log)

    assert told.standard_uncertainty > 2.5 * told.deviation / math.sqrt(400)
    assert all(one.deviation == pytest.approx(told.deviation) for one in shuffled)
    assert all(one.mean == pytest.approx(told.mean, abs=1e-12) for one in shuffled)
    ratio = [one.standard_uncertainty / (one.deviation / math.sqrt(400)) for one in shuffled]
    assert np.median(ratio) == pytest.approx(1.0, abs=0.05)
    assert max(ratio) < 1.5


@settings(max_examples=30)
@given(st.integers(2, 40), st.integers(0, 2**32 - 1))
def test_type_a_does_not_gain_by_readings_repeated(times, seed):
    """A slow meter under a fast logger: every value held for a while tells no more than it does once."""
    once = np.random.default_rng(seed).standard_normal(40)

    told, held = type_a(once), type_a(np.repeat(once, times))

    assert held.mean == pytest.approx(told.mean)
    assert held.effective_readings < 40 * 1.7
    assert held.standard_uncertainty > 0.75 * once.std(ddof=1) / math.sqrt(40)


@pytest.mark.parametrize(
    ("phi", "wander"),
    [
        pytest.param(0.0, 0.0, id="white"),
        pytest.param(0.5, 0.0, id="short memory"),
        pytest.param(0.98, 0.0, id="long memory"),
        pytest.param(-0.4, 0.0, id="turning about"),
        pytest.param(0.0, 3.0, id="drift under white noise"),
    ],
)
@pytest.mark.parametrize("size", [20_000, 100_003])
def test_type_a_of_many_samples_is_that_of_all_coefficients(phi, wander, size, monkeypatch):
    """Forming no more coefficients than the sum asks for changes nothing beyond rounding."""
    noise = np.random.default_rng(7).normal(size=size)
    samples = np.array(noise)
    for at in range(1, size if phi else 0):
        samples[at] += phi * samples[at - 1]
    samples += 12 + wander * np.linspace(-1, 1, size) ** 2

    found = type_a_module.type_a(samples)
    monkeypatch.setattr(type_a_module, "_MANY", size + 1)
    whole = type_a_module.type_a(samples)

    assert found.mean == whole.mean
    assert found.readings == whole.readings
    for name in ("standard_uncertainty", "degrees_of_freedom", "effective_readings", "deviation"):
        assert getattr(found, name) == pytest.approx(getattr(whole, name), rel=1e-11), name
