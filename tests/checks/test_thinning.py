"""What a figure keeps of many samples."""

import numpy as np
from hypothesis import given
from hypothesis import strategies as st

from acceptance.checks.thinning import thinned_cloud, thinned_trace


def test_thinned_trace_keeps_every_spike_and_the_ends():
    y = np.zeros(1_000_003)
    y[[123_456, 777_777]] = [5.0, -7.0]
    x = np.arange(y.size, dtype=float)

    kept_x, kept_y = thinned_trace(x, y)

    assert len(kept_x) <= 2 * 400 + 2
    assert (kept_x[0], kept_x[-1]) == (0.0, y.size - 1)
    assert {(123_456.0, 5.0), (777_777.0, -7.0)} <= set(zip(kept_x, kept_y, strict=True))


@given(st.lists(st.floats(-1e6, 1e6) | st.just(float("nan")), max_size=300), st.integers(1, 20))
def test_thinned_trace_keeps_extremes_and_order(values, buckets):
    y = np.array(values, dtype=float)
    x = np.arange(y.size, dtype=float)

    kept_x, kept_y = thinned_trace(x, y, buckets=buckets)

    assert kept_x == sorted(kept_x)
    known = y[np.isfinite(y)]
    assert len(kept_y) <= max(2 * buckets + 2, 0)
    if known.size:
        assert (min(kept_y), max(kept_y)) == (known.min(), known.max())


def test_thinned_trace_leaves_few_samples_alone():
    x, y = np.array([1.0, 2.0, np.nan]), np.array([3.0, np.nan, 4.0])

    assert thinned_trace(x, y) == ([1.0], [3.0])


def test_thinned_cloud_keeps_an_outlier_of_many_samples():
    random = np.random.default_rng(1)
    x, y = random.normal(size=(2, 100_000))
    x[5_000], y[5_000] = 30.0, -30.0

    kept_x, kept_y = thinned_cloud(x, y)

    assert len(kept_x) < 81 * 81
    assert (30.0, -30.0) in set(zip(kept_x, kept_y, strict=True))
