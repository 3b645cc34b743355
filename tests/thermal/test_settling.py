"""Settling and what is still to come, on curves whose end is known."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from acceptance.thermal.settling import Settling, settling_of
from acceptance.thermal.warming import WINDOW, Warming, blocks_of
from tests.thermal_logs import HOUR, Body, Room

ALLOWED = 1.0 / 1800.0


def settled(body: Body, lasts: float, *, room: Room | None = None, noise: float = 0.02, seed: int = 1) -> Settling:
    time = np.arange(0.0, lasts + 1, 20.0)
    random = np.random.default_rng(seed)
    room = room or Room()
    probe = body.probe(time, room) + noise * random.standard_normal(time.size)
    return settling_of(Warming(*blocks_of(time, probe, room.at(time))), allowed=ALLOWED)


def test_blocks_keep_the_mean_and_leave_out_what_is_missing() -> None:
    time = np.arange(0.0, 4 * HOUR, 0.5)
    values = np.sin(time / 500)
    holes = values.copy()
    holes[5000:6000] = np.nan

    t, v = blocks_of(time, holes)

    assert t.size == v.size < 400
    assert v == pytest.approx(np.sin(t / 500), abs=1e-3)
    assert not ((t > time[5040]) & (t < time[5960])).any()


def test_few_readings_are_their_own_blocks() -> None:
    time = np.array([0.0, 600.0, 1500.0, 3000.0])

    t, v = blocks_of(time, 2 * time)

    assert np.array_equal(t, time)
    assert np.array_equal(v, 2 * time)


@pytest.mark.parametrize("hours", [2.2, 3.0, 6.0])
def test_end_of_one_time_constant_is_reckoned_ahead(hours: float) -> None:
    found = settled(Body([40.0], [0.5 * HOUR]), hours * HOUR)

    assert found.settled, found.reason
    assert found.final == pytest.approx(40.0, abs=0.1)
    assert found.curve is not None
    assert found.curve.taus == pytest.approx((0.5 * HOUR,), rel=0.01)


def test_end_of_two_time_constants_is_reckoned_ahead_by_the_slow_one() -> None:
    """After 5 h 25 exp(-5/1.2) = 0.39 K are still to come."""
    found = settled(Body([30.0, 25.0], [300.0, 1.2 * HOUR]), 5 * HOUR)

    assert found.settled, found.reason
    assert found.final == pytest.approx(55.0, abs=0.15)
    assert found.to_come > 0.3
    assert found.curve is not None
    assert found.curve.taus == pytest.approx((300.0, 1.2 * HOUR), rel=0.05)


def test_slope_with_its_noise_decides() -> None:
    """0.6 K in 30 min is less than 1 K, but not surely with a noise of 1.5 K."""
    body = Body([40.0], [0.5 * HOUR])
    at = -0.5 * HOUR * np.log(0.6 / 40 / (np.e - 1)) + WINDOW  # where the last half hour moves by about 0.6 K

    quiet, loud = settled(body, at), settled(body, at, noise=1.5)

    assert quiet.settled
    assert not loud.settled
    assert "with the spread of the readings" in loud.reason


def test_far_extrapolation_is_refused() -> None:
    found = settled(Body([24.0, 16.0], [1200.0, 8 * HOUR]), 3 * HOUR)

    assert not found.settled
    assert "too far to reckon ahead" in found.reason or "cannot be told well enough" in found.reason


def test_falling_rise_is_not_settled_and_keeps_its_top() -> None:
    time = np.arange(0.0, 2 * HOUR, 20.0)
    rise = 30 * -np.expm1(-time / 600) - np.clip(time - HOUR, 0, None) * 4 / HOUR

    found = settling_of(Warming(*blocks_of(time, 23 + rise, np.full(time.size, 23.0))), allowed=ALLOWED)

    assert not found.settled
    assert "falls by 2.00 K in 30 min" in found.reason
    assert found.reached == pytest.approx(rise.max(), abs=0.2)


@given(factor=st.floats(0.05, 20))
@settings(max_examples=10, deadline=None)
def test_scaling_time_with_the_criterion_changes_nothing(factor: float) -> None:
    time = np.arange(0.0, 3 * HOUR, 30.0)
    random = np.random.default_rng(8)
    probe = 23 + Body([40.0], [0.5 * HOUR]).rise(time) + 0.03 * random.standard_normal(time.size)
    room = np.full(time.size, 23.0)

    one = settling_of(Warming(*blocks_of(time, probe, room)), allowed=ALLOWED)
    scaled = settling_of(
        Warming(*blocks_of(factor * time, probe, room, window=factor * WINDOW)),
        allowed=ALLOWED / factor,
        window=factor * WINDOW,
    )

    assert scaled.settled == one.settled
    assert scaled.final == pytest.approx(one.final, abs=2e-3)
    assert scaled.u_to_come == pytest.approx(one.u_to_come, rel=0.05)


def test_room_that_swings_takes_nothing_from_the_rise_it_ends_at() -> None:
    """A swing of ± 1 K over two hours, seen at its turn where the rise seems to stand."""
    room = Room(swing=1.0, period=2 * HOUR)
    ends = [settled(Body([40.0], [0.4 * HOUR]), hours * HOUR, room=room) for hours in np.arange(4.0, 6.0, 0.1)]

    assert any(found.settled for found in ends)
    assert not all(found.settled for found in ends)
    assert all(abs(found.final - 40.0) < 0.2 for found in ends if found.settled)


@pytest.mark.parametrize("size", [1, 2, 3, 4, 5])
def test_hardly_any_readings_are_not_settled(size: int) -> None:
    time = np.linspace(0.0, 3600.0, size)
    found = settling_of(Warming(time, 23.0 + np.arange(float(size)), np.full(size, 23.0)), allowed=ALLOWED)

    assert not found.settled
