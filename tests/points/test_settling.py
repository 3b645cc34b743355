"""Settling of meters that lag, told from faults and bursts; and overloads told from the data."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pandas as pd
import pytest

from acceptance.bench.log import BenchLog, Channel
from acceptance.points.dwells import find_dwells
from acceptance.points.overload import overloads_told
from acceptance.points.settling import settling_samples
from tests.checks.built import limits_from


def lagging(n, tau, seed):
    """A meter that follows a step of half its reading with a lag of tau samples, with a noise of 0.02 %."""
    rng = np.random.default_rng(seed)
    return 50 - 25 * np.exp(-np.arange(1, n + 1) / tau) + rng.normal(0, 0.01, n)


@pytest.mark.parametrize(("n", "tau"), [(20, 1), (40, 1), (80, 1), (80, 4), (200, 4), (1000, 10)])
def test_settling_of_a_lagging_meter_leaves_no_bias(n, tau):
    """What is left of the tail is below the standard error of what is kept."""
    off = []
    for seed in range(60):
        samples = lagging(n, tau, seed)
        kept = samples[settling_samples(samples) :]
        off.append((kept.mean() - 50) / (0.01 / np.sqrt(kept.size)))

    assert abs(np.mean(off)) < 0.5
    assert np.abs(off).max() < 5


def test_settling_is_not_seen_where_there_is_none():
    rng = np.random.default_rng(7)
    left_out = [settling_samples(50 + rng.normal(0, 0.01, n)) for n in (20, 40, 80) for _ in range(200)]

    assert np.mean(np.array(left_out) > 0) < 0.02


def test_bursts_are_no_settling():
    rng = np.random.default_rng(8)
    bursts = np.where((np.arange(200) + 3) % 30 < 3, 4.0, 0.05) + rng.normal(0, 0.002, 200)

    assert settling_samples(bursts) == 0


def log_of(columns, *, stages_from="none told", setting_unit="A", with_time=True):
    table = pd.DataFrame(columns)
    units = {"load_setting main": setting_unit}
    channels = tuple(
        Channel(k, k.split()[0], k.partition(" ")[2], k, units.get(k, ""), "heading", 1, 0, "", "") for k in columns
    )
    if with_time:
        table["time"] = np.arange(len(table), dtype=float)
    table["stage"] = pd.Categorical(["steady"] * len(table))
    table["table"], table["line"] = 0, np.arange(2, len(table) + 2)
    return BenchLog("S-1", table, channels, (), ("S-1.csv",), stages_from=stages_from)


def two_dwells(bad_share, n=60, bad=11.0):
    """Half and full load, the output low through a share of the second dwell."""
    rng = np.random.default_rng(9)
    volts = np.r_[np.full(n, 12.0), np.full(n, 11.9)] + rng.normal(0, 1e-3, 2 * n)
    volts[n : n + round(bad_share * n)] += bad - 11.9
    amperes = np.r_[np.full(n, 2.0), np.full(n, 4.0)] + rng.normal(0, 1e-3, 2 * n)
    setting = np.r_[np.full(n, 2.0), np.full(n, 4.0)]
    return {"load_setting main": setting, "output_voltage main": volts, "output_current main": amperes}


@pytest.mark.parametrize("share", [0.35, 0.45])
def test_an_output_low_for_a_third_of_a_dwell_is_no_settling(share):
    """The load was set, and the output took a third of the dwell to come up: not judged, and how to say otherwise."""
    found = find_dwells(log_of(two_dwells(share)), rated={"main": 4.0})

    (doubt,) = [doubt for doubt in found.doubts if doubt.bars]
    assert doubt.channels == ("output_voltage main",)
    assert doubt.spans == ((60, 120),)
    assert "settle" in doubt.remedy


def test_a_stated_settling_time_is_taken_at_its_word():
    found = find_dwells(log_of(two_dwells(0.35)), settle=25.0, rated={"main": 4.0})

    assert not [doubt for doubt in found.doubts if doubt.bars]
    assert [dwell.first for dwell in found.dwells] == [25, 85]


def test_rows_by_hand_without_a_time_are_all_kept():
    """Three rows at one load, the first one low: whoever wrote them down meant all three."""
    columns = {
        "load_setting main": [4.0, 4.0, 4.0, 2.0],
        "output_voltage main": [11.0, 11.9, 11.9, 12.0],
        "output_current main": [4.0, 4.0, 4.0, 2.0],
    }
    found = find_dwells(log_of(columns, with_time=False), rated={"main": 4.0})

    assert [(dwell.first, dwell.stop) for dwell in found.dwells] == [(0, 3), (3, 4)]


def test_what_min_dwell_leaves_out_is_said():
    found = find_dwells(log_of(two_dwells(0.0)), min_dwell=100.0, rated={"main": 4.0})

    assert found.dwells == ()
    (doubt,) = [doubt for doubt in found.doubts if doubt.kind == "dwell left out"]
    assert "min_dwell = 100 s" in doubt.text


def overload_log(**kwargs):
    """Full load, then 6 A asked of a unit that limits at 4.4 A and collapses to a third."""
    n = 60
    columns = {
        "load_setting main": np.r_[np.full(n, 4.0), np.full(n, 6.0)],
        "output_voltage main": np.r_[np.full(n, 11.9), np.full(n, 4.0)],
        "output_current main": np.r_[np.full(n, 4.0), np.full(n, 3.9)],
    }
    return log_of(columns, **kwargs)


LIMITS = limits_from("  output_voltage: [{name: band, at: {load: any, input: any}, within: 2 %}]")


def test_an_overload_is_told_from_the_setting():
    log = overload_log()
    dwells = overloads_told(log, find_dwells(log, rated={"main": 4.0}).dwells, LIMITS)

    assert [dwell.stage for dwell in dwells] == ["steady", "overcurrent"]


def test_a_setting_in_ohms_tells_no_overload():
    log = overload_log(setting_unit="ohm")
    dwells = overloads_told(log, find_dwells(log, rated={"main": 4.0}).dwells, LIMITS)

    assert [dwell.stage for dwell in dwells] == ["steady", "steady"]


def test_stages_that_the_log_tells_are_left_alone():
    log = overload_log(stages_from="stage column")
    dwells = find_dwells(log, rated={"main": 4.0}).dwells

    assert overloads_told(log, dwells, LIMITS) == list(dwells)


def test_an_overload_by_the_measured_current():
    log = overload_log(setting_unit="ohm")
    samples = log.samples.assign(**{"output_current main": np.r_[np.full(60, 4.0), np.full(60, 4.4)]})
    log = replace(log, samples=samples)
    dwells = overloads_told(log, find_dwells(log, rated={"main": 4.0}).dwells, LIMITS)

    assert [dwell.stage for dwell in dwells] == ["steady", "overcurrent"]


def test_a_drift_that_no_one_would_notice_bars_nothing():
    """A millivolt of 24 V with the room's air conditioning: a thirtieth of the tightest regulation asked for."""
    n = 300
    wave = 1e-3 * np.sin(2 * np.pi * np.arange(2 * n) * 2 / 600)
    columns = {
        "load_setting main": np.r_[np.full(n, 2.0), np.full(n, 4.0)],
        "output_voltage main": 24 + wave + np.random.default_rng(10).normal(0, 1e-5, 2 * n),
        "output_current main": np.r_[np.full(n, 2.0), np.full(n, 4.0)],
    }
    found = find_dwells(log_of(columns), rated={"main": 4.0})

    assert not [doubt for doubt in found.doubts if doubt.bars]


def test_an_input_that_steps_two_samples_after_the_load_makes_no_dwell_of_the_two():
    n = 160
    columns = {
        "input_voltage": np.r_[np.full(n + 2, 230.0), np.full(n - 2, 253.0)],
        "load_setting main": np.r_[np.full(n, 2.0), np.full(n, 4.0)],
        "output_voltage main": np.full(2 * n, 12.0) + np.random.default_rng(11).normal(0, 1e-3, 2 * n),
        "output_current main": np.r_[np.full(n, 2.0), np.full(n, 4.0)],
    }
    found = find_dwells(log_of(columns), rated={"main": 4.0})

    assert len(found.dwells) == 2
    assert [doubt.kind for doubt in found.doubts] == ["dwell left out"]


@pytest.mark.parametrize("stage", ["thermal", "overcurrent", "cooling"])
def test_settling_outside_the_steady_test_is_not_doubted(stage):
    """A soak and an overload are looked at sample by sample, so that no mean waits for them."""
    log = log_of(two_dwells(0.45))
    other = replace(log, samples=log.samples.assign(stage=pd.Categorical([stage] * len(log.samples))))

    assert find_dwells(log, rated={"main": 4.0}).doubts
    assert not find_dwells(other, rated={"main": 4.0}).doubts
