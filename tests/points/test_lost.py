"""Stretches of the steady test that are no dwell and may hide what an `any` would have taken in."""

from __future__ import annotations

import numpy as np
import pytest

from acceptance.points.dwells import find_dwells
from acceptance.points.lost import lost_stretches, mostly_unsteady
from tests.points.test_settling import log_of

RATED = {"main": 4.0}


def sweep(parts, *, noise=1e-3, seed=3):
    """A log of stretches of (current, samples), without a load setting."""
    rng = np.random.default_rng(seed)
    amperes = np.concatenate([np.full(n, level) if np.isscalar(level) else np.asarray(level) for level, n in parts])
    amperes = amperes + rng.normal(0, noise, amperes.size)
    volts = 12 - 0.02 * np.nan_to_num(amperes) + rng.normal(0, 1e-4, amperes.size)
    vin = 230 + rng.normal(0, 0.05, amperes.size)
    return log_of({"input_voltage": vin, "output_voltage main": volts, "output_current main": amperes})


def lost_in(log):
    return lost_stretches(log, find_dwells(log, rated=RATED).dwells, RATED)


LEVELS = [(4.0, 160), (3.0, 160), (2.0, 160), (1.0, 160), (0.0, 160)]


@pytest.mark.parametrize("noise", [1e-4, 1e-3, 5e-3])
def test_a_plain_sweep_loses_nothing(noise):
    assert lost_in(sweep(LEVELS, noise=noise)) == ()


@pytest.mark.parametrize("length", [20, 60, 120])
def test_ramps_between_levels_are_no_loss(length):
    ramp = (np.linspace(4.0, 3.0, length), length)
    assert lost_in(sweep([LEVELS[0], ramp, *LEVELS[1:]])) == ()


def test_a_settling_tail_is_no_loss():
    tail = 3.0 + 0.6 * np.exp(-np.arange(160) / 8)
    assert lost_in(sweep([LEVELS[0], (tail, 160), *LEVELS[2:]])) == ()


def test_a_stretch_without_a_current_is_lost():
    """The logger lost the load's reading through a whole dwell: nobody knows at what load it was run."""
    found = lost_in(sweep([LEVELS[0], LEVELS[1], (np.nan, 160), LEVELS[2], LEVELS[3]]))

    (lost,) = [one for one in found if one.channel == "output_current main"]
    assert lost.span == (320, 480)
    assert "was not read at S-1.csv, lines 322 to 481" in lost.reason


def test_two_missing_readings_are_not():
    assert lost_in(sweep([LEVELS[0], (np.nan, 2), *LEVELS[1:]])) == ()


@pytest.mark.parametrize("length", [10, 16, 40])
def test_a_stand_at_a_level_of_its_own_that_is_no_dwell_is_lost(length):
    """60 % among dwells of 160 samples, taken for a fragment by whatever finds dwells."""
    log = sweep([*LEVELS[:2], (2.4, length), *LEVELS[2:]])
    dwells = [d for d in find_dwells(log, rated=RATED).dwells if d.stop - d.first > 2 * length]

    (lost,) = lost_stretches(log, dwells, RATED)
    assert lost.channel == "output_current main"
    assert lost.span[0] == pytest.approx(320, abs=1)
    assert lost.span[1] == pytest.approx(320 + length, abs=1)
    assert "stood at 2.4 A" in lost.reason


def test_a_log_that_mostly_ramps_is_said():
    log = sweep([(4.0, 100), (np.linspace(4, 1, 200), 200), (1.0, 100)])
    (doubt,) = mostly_unsteady(log, find_dwells(log, rated=RATED).dwells)

    assert not doubt.bars
    assert "lie in no dwell" in doubt.text


def test_a_log_of_dwells_is_not():
    log = sweep(LEVELS)

    assert mostly_unsteady(log, find_dwells(log, rated=RATED).dwells) == ()
