"""Propagation: what is shared cancels, what is not adds, and the budget says which."""

from __future__ import annotations

import math

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from uncertainties import correlated_values

from acceptance.points.propagation import (
    Source,
    budget,
    covariance,
    coverage_factor,
    effective_degrees_of_freedom,
    expanded,
    is_exact,
    nominal,
    of_source,
    standard_uncertainty,
)

positive = st.floats(1e-3, 1e3)


def source(name: str = "meter", freedom: float = math.inf) -> Source:
    return Source(name, "B" if math.isinf(freedom) else "A", freedom)


# --- values ---------------------------------------------------------------------------------------------------------


def test_of_source_without_uncertainty_is_a_plain_number():
    """Exact, and no line in any budget."""
    value = of_source(0.0, source(), 24.0)

    assert value == 24.0
    assert is_exact(value)
    assert (nominal(value), standard_uncertainty(value), budget(value)) == (24.0, 0.0, [])


def test_of_source_twice_is_two_errors():
    """Of one name, but independent: in a difference they add in squares, and the budget has one line of both."""
    one, other = of_source(3.0, source()), of_source(4.0, source())

    assert standard_uncertainty(one - other) == pytest.approx(5.0)
    assert standard_uncertainty(one - one) == 0.0
    (line,) = budget(one + other)
    assert (line.source, line.u, line.share) == (source(), pytest.approx(5.0), pytest.approx(1.0))


@given(positive, positive, positive)
def test_shared_gain_cancels_in_a_ratio(a, b, u):
    """Two readings with one relative error have a ratio without it."""
    gain = 1 + of_source(u / 1e4, source())

    ratio = (a * gain) / (b * gain)

    assert nominal(ratio) == pytest.approx(a / b)
    assert standard_uncertainty(ratio) <= 1e-12 * a / b


@given(positive, positive, st.floats(1e-6, 1e-2), st.floats(1e-6, 1e-2))
def test_what_is_not_shared_remains_in_a_ratio(a, b, u_a, u_b):
    """Independent relative errors add in squares beside a gain that cancels."""
    gain = 1 + of_source(0.01, source("gain"))

    ratio = (a * gain * (1 + of_source(u_a, source()))) / (b * gain * (1 + of_source(u_b, source())))

    assert standard_uncertainty(ratio) == pytest.approx(a / b * math.hypot(u_a, u_b), rel=1e-9)


@given(positive, positive)
def test_shared_gain_scales_a_difference(a, b):
    """Of a difference only as much as the difference is."""
    gain = 1 + of_source(0.01, source())

    assert standard_uncertainty(a * gain - b * gain) == pytest.approx(0.01 * abs(a - b), rel=1e-6, abs=1e-12 * (a + b))


# --- covariance -----------------------------------------------------------------------------------------------------


@pytest.mark.parametrize("seed", range(5))
def test_covariance_is_that_of_linear_algebra(seed):
    """Values y = A x of independent x: A diag(u^2) A^T, signs and all."""
    rng = np.random.default_rng(seed)
    weights, u = rng.normal(size=(4, 6)), rng.uniform(0.1, 2, 6)
    errors = [of_source(s, source(f"{i}")) for i, s in enumerate(u)]

    matrix = covariance([sum(w * e for w, e in zip(row, errors, strict=True)) for row in weights])

    assert matrix == pytest.approx(weights @ np.diag(u**2) @ weights.T, rel=1e-12, abs=1e-12)


@pytest.mark.parametrize("seed", range(3))
def test_covariance_of_a_product_and_a_ratio(seed):
    """First order about the means: J V J^T with the derivatives written down by hand."""
    rng = np.random.default_rng(seed)
    root = rng.normal(size=(3, 3)) * 0.01
    inputs = root @ root.T
    v, i, p = correlated_values([24.0, 2.5, 66.0], inputs, tags=[source(name) for name in "abc"])

    matrix = covariance([v * i, v * i / p])

    jacobian = np.array([[2.5, 24.0, 0.0], [2.5 / 66, 24.0 / 66, -60.0 / 66**2]])
    assert matrix == pytest.approx(jacobian @ inputs @ jacobian.T, rel=1e-6)
    assert np.sqrt(np.diag(matrix)) == pytest.approx([standard_uncertainty(v * i), standard_uncertainty(v * i / p)])


def test_covariance_with_exact_values():
    """Plain numbers vary with nothing, not even themselves."""
    value = of_source(2.0, source(), 5.0)

    assert covariance([value, 7.0, -value]).tolist() == [[4.0, 0.0, -4.0], [0.0, 0.0, 0.0], [-4.0, 0.0, 4.0]]
    assert covariance([]).shape == (0, 0)


# --- the budget -----------------------------------------------------------------------------------------------------


@given(st.lists(st.tuples(st.floats(0.01, 10), st.floats(-3, 3)), min_size=1, max_size=6))
def test_budget_shares_sum_to_one(parts):
    """Contributions are |sensitivity| u, in squares the variance, largest first."""
    value = sum(weight * of_source(u, source(f"{i}")) for i, (u, weight) in enumerate(parts))

    lines = budget(value)

    total = standard_uncertainty(value)
    if total == 0:  # all weights are zero
        assert sum(line.share for line in lines) == 0
        return
    assert sum(line.share for line in lines) == pytest.approx(1.0)
    assert math.sqrt(sum(line.u**2 for line in lines)) == pytest.approx(total)
    assert [line.u for line in lines] == sorted((line.u for line in lines), reverse=True)
    by_name = {line.source.name: line.u for line in lines}
    for i, (u, weight) in enumerate(parts):
        assert by_name.get(f"{i}", 0.0) == pytest.approx(abs(weight) * u, abs=1e-12)


def test_budget_keeps_type_a_and_type_b_apart():
    """Sources of one name but of two kinds are two lines."""
    value = of_source(1.0, Source("voltage", "A", 9)) + of_source(2.0, Source("voltage", "B"))

    assert [(line.source.kind, line.u, line.share) for line in budget(value)] == [
        ("B", 2.0, pytest.approx(0.8)),
        ("A", 1.0, pytest.approx(0.2)),
    ]


# --- degrees of freedom and coverage --------------------------------------------------------------------------------


def test_effective_degrees_of_freedom_in_simple_cases():
    """Alone its own; equal parts of equal number n times as many; infinite where no part is finite."""
    assert effective_degrees_of_freedom([(2.0, 7.0)]) == pytest.approx(7.0)
    assert effective_degrees_of_freedom([(1.0, 5.0)] * 4) == pytest.approx(20.0)
    assert effective_degrees_of_freedom([(1.0, math.inf), (3.0, math.inf)]) == math.inf
    assert effective_degrees_of_freedom([]) == math.inf
    assert effective_degrees_of_freedom([(0.0, 1.0), (1.0, math.inf)]) == math.inf


@given(st.lists(st.tuples(st.floats(1e-3, 10), st.floats(1, 200)), min_size=1, max_size=6))
def test_effective_degrees_of_freedom_lie_between_least_and_sum(parts):
    """JCGM 100:2008, G.4.1, note: never fewer than the least part has, nor more than all together."""
    freedom = effective_degrees_of_freedom(parts)

    assert min(nu for _, nu in parts) * (1 - 1e-9) <= freedom <= sum(nu for _, nu in parts) * (1 + 1e-9)


@pytest.mark.parametrize(
    ("confidence", "freedom", "k"),
    [
        # JCGM 100:2008, Table G.2: t for p = 68.27, 90, 95, 99 %; values from memory
        (0.95, 1, 12.71),
        (0.95, 2, 4.30),
        (0.95, 10, 2.23),
        (0.95, 50, 2.01),
        (0.99, 10, 3.17),
        (0.90, 10, 1.81),
        (0.95, math.inf, 1.960),
        (0.99, math.inf, 2.576),
    ],
)
def test_coverage_factor_of_table_g_2(confidence, freedom, k):
    """Student's t, two-sided; the normal without end."""
    assert coverage_factor(confidence, freedom) == pytest.approx(k, abs=0.5e-2)


@given(st.floats(0.5, 0.999), st.floats(1, 1e6))
def test_coverage_factor_falls_towards_the_normal(confidence, freedom):
    """Fewer degrees of freedom never make U smaller."""
    k = coverage_factor(confidence, freedom)

    assert k >= coverage_factor(confidence, 2 * freedom) >= coverage_factor(confidence, math.inf) * (1 - 1e-9)


def test_expanded_of_mixed_sources():
    """u of 3 with 9 degrees of freedom and of 4 without end: 5, and 5^4 / (3^4 / 9) degrees of freedom."""
    value = of_source(3.0, source("spread", 9), 100.0) + of_source(4.0, source())

    told = expanded(value, 0.95)

    assert told.standard == pytest.approx(5.0)
    assert told.degrees_of_freedom == pytest.approx(625 / 9)
    assert told.coverage_factor == pytest.approx(coverage_factor(0.95, 625 / 9))
    assert told.expanded == pytest.approx(5.0 * told.coverage_factor)


def test_expanded_of_an_exact_value_is_zero():
    """Nothing known against it: U 0, k of the normal."""
    told = expanded(24.0, 0.95)

    assert (told.standard, told.expanded, told.degrees_of_freedom) == (0.0, 0.0, math.inf)


def test_expanded_counts_a_shared_source_once():
    """What enters twice through one source enters by its whole sensitivity: u of 2 x is 2 u, not sqrt(2) u."""
    x = of_source(1.0, source("spread", 4))

    assert expanded(x + x, 0.95).standard == pytest.approx(2.0)
    assert expanded(x + x, 0.95).degrees_of_freedom == pytest.approx(4.0)
