"""Dwells against built truth: synthetic sweeps whose steady spans are known."""

from __future__ import annotations

import math

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from hypothesis.extra.numpy import arrays

from acceptance.points.dwells import Dwell, _usual_length, find_dwells
from acceptance.points.levels import find_levels
from acceptance.points.settling import drift_of, settling_samples
from tests.points import dwell_logs
from tests.points.dwell_logs import KINDS, bench_log, is_exact, make_sweep
from tests.points.prototype_finder import find_plateaus

SEEDS = range(25)
# kind of log, and what is declared to both finders: (tolerance [A], min_dwell [samples])
CASES = [(kind, None, None) for kind in KINDS] + [("very slow ramps", None, 50), ("hum", 0.06, None)]


def spans(dwells: tuple[Dwell, ...]) -> list[tuple[int, int]]:
    return [(dwell.first, dwell.stop) for dwell in dwells]


def sweep(rng: np.random.Generator, levels: list[float], length: int) -> np.ndarray:
    """Clean steps with 2 mA of noise."""
    return np.repeat(levels, length) + rng.normal(0, 0.002, len(levels) * length)


# --- one channel --------------------------------------------------------------------------------------------------


@pytest.mark.parametrize(("kind", "tolerance", "min_dwell"), CASES)
def test_find_levels_is_exact_as_often_as_the_earlier_finder(kind, tolerance, min_dwell):
    """Of 25 logs a kind, at least as many are exactly right as with our earlier finder, and nine in ten."""
    ours = earlier = 0
    for seed in SEEDS:
        log = make_sweep(kind, seed)
        found = find_levels(log.current, tolerance=tolerance, min_dwell=min_dwell)
        ours += is_exact([level[:2] for level in found], log.truth)
        before = find_plateaus(log.current, tol_abs=tolerance, min_dwell=min_dwell)
        earlier += is_exact([level[:2] for level in before], log.truth)

    assert ours >= earlier
    assert ours >= 0.9 * len(SEEDS)


@pytest.mark.parametrize("ratio", [2, 3, 5, 8])
def test_find_levels_finds_small_steps_with_a_tolerance_of_half_the_step(ratio):
    """Steps of a few standard deviations over 400 samples a level, at least as often as by the earlier finder."""
    sigma, ours, earlier = 0.002, 0, 0
    for seed in range(40):
        rng = np.random.default_rng([ratio, seed])
        levels = 3 + ratio * sigma * np.cumsum(rng.choice([-1, 1], 6))
        x = np.repeat(levels, 400) + rng.normal(0, sigma, 2400)
        truth = tuple((i, i + 400) for i in range(0, 2400, 400))
        ours += is_exact([level[:2] for level in find_levels(x, tolerance=ratio * sigma / 2)], truth)
        earlier += is_exact([level[:2] for level in find_plateaus(x, tol_abs=ratio * sigma / 2)], truth)

    assert ours >= max(earlier, 36)


def test_find_levels_returns_the_level_between_its_borders():
    """The level is the median of its samples; the borders are the steps'."""
    x = sweep(np.random.default_rng(1), [0.0, 0.5, 5.0], 100)

    found = find_levels(x)

    assert [level[:2] for level in found] == [(0, 100), (100, 200), (200, 300)]
    assert [level[2] for level in found] == pytest.approx([0, 0.5, 5], abs=0.001)


@pytest.mark.parametrize("size", [30, 300, 3000, 100_000])
@pytest.mark.parametrize("level", [0.0, 5.0, -230.0])
def test_find_levels_sees_one_level_in_pure_noise(level, size):
    """Noise alone makes no level, even around zero."""
    for seed in range(5):
        x = level + np.random.default_rng([size, seed]).normal(0, 0.002, size)
        assert [found[:2] for found in find_levels(x)] == [(0, size)]


def test_find_levels_leaves_a_ramp_out():
    """A slow ramp belongs to no level, and no level reaches far into it."""
    rng = np.random.default_rng(3)
    x = np.concatenate([np.full(300, 1.0), np.linspace(1, 3, 150), np.full(300, 3.0)]) + rng.normal(0, 0.002, 750)

    (_, stop, _), (first, _, _) = find_levels(x)

    assert 280 <= stop <= 303
    assert 447 <= first <= 470


def test_find_levels_passes_over_missing_samples():
    """Samples that are not finite lie in a level, and move no border."""
    rng = np.random.default_rng(4)
    x = sweep(rng, [1.0, 2.0, 3.0], 100)
    x[[10, 50, 150, 151, 250]] = [np.nan, np.inf, np.nan, -np.inf, np.nan]

    assert [level[:2] for level in find_levels(x)] == [(0, 100), (100, 200), (200, 300)]


def test_find_levels_with_tolerance_merges_what_lies_within_it():
    """A declared tolerance decides which step is a new level."""
    x = sweep(np.random.default_rng(5), [1.0, 1.05, 2.0], 100)

    assert len(find_levels(x)) == 3
    assert [level[:2] for level in find_levels(x, tolerance=0.1)] == [(0, 200), (200, 300)]
    assert [level[:2] for level in find_levels(x, smallest=0.1)] == [(0, 200), (200, 300)]


@settings(max_examples=60, deadline=None)
@given(kind=st.sampled_from(sorted(KINDS)), seed=st.integers(0, 10_000), power=st.floats(-3, 3))
def test_find_levels_does_not_depend_on_the_unit(kind, seed, power):
    """A channel in mA or kA has the levels it has in A; a rounding may move a border by one sample."""
    log, factor = make_sweep(kind, seed), 10.0**power

    found, scaled = find_levels(log.current), find_levels(factor * log.current)

    assert len(scaled) == len(found)
    assert np.allclose([level[:2] for level in scaled], [level[:2] for level in found], rtol=0, atol=1)
    assert [level[2] for level in scaled] == pytest.approx([factor * level[2] for level in found], rel=1e-3)


ANY = arrays(np.float64, st.integers(0, 400), elements=st.floats(allow_nan=True, allow_infinity=True, width=64))
FEW_VALUES = arrays(np.float64, st.integers(0, 400), elements=st.sampled_from([0.0, 1.0, 1.001, 5.0, math.nan]))


@settings(max_examples=150, deadline=None)
@given(x=ANY | FEW_VALUES)
def test_find_levels_takes_any_numbers(x):
    """Whatever the samples are: ordered spans without overlap, each with a finite level between its samples."""
    found = find_levels(x)

    borders = [border for first, stop, _ in found for border in (first, stop)]
    assert borders == sorted(borders)
    assert all(0 <= first < stop <= x.size for first, stop, _ in found)
    for first, stop, level in found:
        part = x[first:stop][np.isfinite(x[first:stop])]
        low, high, half = part.min() / 2, part.max() / 2, level / 2  # the largest floats have no room for a margin
        margin = 1e-12 * np.abs(x[np.isfinite(x)] / 2).max()  # beside huge samples the smallest have fewer digits
        assert low - 1e-9 * abs(low) - margin <= half <= high + 1e-9 * abs(high) + margin


# --- settling -----------------------------------------------------------------------------------------------------


@pytest.mark.parametrize("samples", [150, 300, 1000, 5000])
def test_settling_samples_leaves_no_bias_of_an_exponential_tail(samples):
    """Tail of 3 %, time constant 10 samples: what is left of it is below the mean's own standard error."""
    tail = 0.03 * 3 * np.exp(-np.arange(samples) / 10)
    for seed in range(100):
        noise = np.random.default_rng([samples, seed]).normal(0, 0.002, samples)
        lead = settling_samples(3 + tail + noise)
        assert tail[lead:].mean() < 0.002 / math.sqrt(samples - lead)


@pytest.mark.parametrize("samples", [150, 300, 1000, 5000])
def test_settling_samples_takes_little_of_a_settled_stretch(samples):
    """Without a tail, on average under 1 % is left out; a steady drift and hum are no settling."""
    i = np.arange(samples)
    rng = np.random.default_rng(samples)
    noise = [rng.normal(0, 0.002, samples) for _ in range(100)]
    drifting, hum = 0.05 * i / samples, 0.015 * np.sin(2 * np.pi * i / 23)

    for true in (0.0, drifting, hum):
        assert np.mean([settling_samples(3 + true + white) for white in noise]) < 0.01 * samples


@pytest.mark.parametrize("samples", [500, 2000, 10_000])
def test_settling_samples_keeps_a_bursting_no_load_power(samples):
    """Bursts to twentyfold all along are how the unit idles, not how it settles."""
    rng = np.random.default_rng(samples)
    for _ in range(50):
        power = 0.1 + rng.normal(0, 0.002, samples)
        period = int(rng.integers(40, samples // 10 + 1))
        power[(np.arange(samples) + rng.integers(period)) % period < max(1, period // 20)] *= 20
        assert settling_samples(power) <= 0.2 * samples


def test_settling_samples_takes_no_more_than_half():
    """A tail longer than the stretch itself."""
    x = np.exp(-np.arange(1000) / 300)

    assert settling_samples(x) == 500


def test_settling_samples_of_few_samples():
    """One sample far off is left out, ordinary noise is not."""
    assert settling_samples(np.array([2.1, 3.001, 3.0, 2.999, 3.0])) == 1
    assert settling_samples(np.array([3.002, 3.001, 3.0, 2.999, 3.0])) == 0
    assert settling_samples(np.array([1.0, 2.0])) == 0


def test_drift_of_a_straight_line():
    """End against start over the whole length; none where there are no two samples."""
    assert drift_of(np.linspace(1, 2, 301)) == pytest.approx(1, rel=0.01)
    assert drift_of(np.array([1.0, np.nan, 1.5])) == pytest.approx(1.0)  # two samples stand for their halves
    assert drift_of(np.array([1.0, np.nan])) is None


# --- declared ------------------------------------------------------------------------------------------------------


@pytest.mark.parametrize("kind", sorted(KINDS))
def test_find_dwells_believes_a_declared_setting(kind):
    """With the setting logged, every log of every kind is exactly right."""
    for seed in SEEDS:
        sweep_log = make_sweep(kind, seed)
        log = bench_log(load_setting=sweep_log.setting, output_current=sweep_log.current)

        found = find_dwells(log).dwells

        assert is_exact(spans(found), sweep_log.truth)
        assert {dwell.from_ for dwell in found} == {"load setting"}


def test_find_dwells_begins_where_the_setting_changes():
    """A declared dwell begins at the new setting, whatever settling is left out."""
    current = sweep(np.random.default_rng(1), [0.0, 1.0], 200)
    current[200:230] += 0.5 * np.exp(-np.arange(30) / 8)
    log = bench_log(load_setting=np.repeat([0.0, 1.0], 200), output_current=current)

    first, second = find_dwells(log).dwells

    assert (first.begins, first.first, first.stop) == (0, 0, 200)
    assert (second.begins, second.stop) == (200, 400)
    assert 225 <= second.first <= 280


def test_find_dwells_cuts_a_declared_run_at_an_input_step():
    """One setting at two input voltages is two dwells, and the way between them is neither's."""
    rng = np.random.default_rng(2)
    volts = np.concatenate([np.full(300, 207.0), np.linspace(207, 253, 40), np.full(300, 253.0)])
    log = bench_log(
        load_setting=np.concatenate([np.full(320, 1.0), np.full(320, 1.0)]) + (np.arange(640) >= 630),
        output_current=1.0 + rng.normal(0, 0.002, 640) + (np.arange(640) >= 630),
        input_voltage=volts + rng.normal(0, 0.1, 640),
    )

    found = find_dwells(log).dwells

    assert len(found) == 3
    assert found[0].stop <= 305
    assert 335 <= found[1].first <= 360
    assert (found[1].begins, found[1].stop) == (found[0].stop, 630)


@pytest.mark.parametrize("setting", [np.full(300, 2.0), np.full(300, np.nan)], ids=["constant", "empty"])
def test_find_dwells_ignores_a_setting_that_tells_nothing(setting):
    """A column that never changes declares no dwell: the current tells."""
    log = bench_log(load_setting=setting, output_current=sweep(np.random.default_rng(3), [0.0, 1.0, 2.0], 100))

    found = find_dwells(log).dwells

    assert spans(found) == [(0, 100), (100, 200), (200, 300)]
    assert {dwell.from_ for dwell in found} == {"found in output_current"}


def test_find_dwells_keeps_an_empty_setting_inside_its_dwell():
    """An empty cell between two equal ones cuts nothing."""
    setting = np.repeat([0.0, 1.0], 100)
    setting[[20, 150, 151]] = np.nan
    log = bench_log(load_setting=setting, output_current=sweep(np.random.default_rng(4), [0.0, 1.0], 100))

    assert spans(find_dwells(log).dwells) == [(0, 100), (100, 200)]


def test_find_dwells_leaves_out_the_ramp_of_a_setting():
    """A setting that steps every sample on its way holds no dwell there."""
    setting = np.concatenate([np.zeros(100), np.linspace(0, 1, 22)[1:-1], np.ones(100)])
    log = bench_log(load_setting=setting, output_current=setting + np.random.default_rng(5).normal(0, 0.002, 220))

    assert spans(find_dwells(log).dwells) == [(0, 100), (120, 220)]


def test_find_dwells_takes_a_setting_read_back_with_noise():
    """A setting that jitters in its last digit is held all the same."""
    rng = np.random.default_rng(23)
    log = bench_log(load_setting=sweep(rng, [0.0, 1.0, 5.0], 200), output_current=sweep(rng, [0.0, 1.0, 5.0], 200))

    assert spans(find_dwells(log).dwells) == [(0, 200), (200, 400), (400, 600)]


def test_find_dwells_leaves_out_a_sample_that_runs_ahead_of_the_setting():
    """The load took the next setting a sample before the logger noted it."""
    current = sweep(np.random.default_rng(6), [0.0, 1.0], 100)
    current[99] = 0.8
    log = bench_log(load_setting=np.repeat([0.0, 1.0], 100), output_current=current)

    assert spans(find_dwells(log).dwells) == [(0, 99), (100, 200)]


# --- found ----------------------------------------------------------------------------------------------------------


def test_find_dwells_joins_what_every_channel_tells():
    """Two outputs and the input stepped in turn: a step in any is a border for all."""
    rng = np.random.default_rng(7)
    log = bench_log(
        output_current__main=sweep(rng, [1.0, 2.0, 2.0, 2.0], 200),
        output_current__aux=sweep(rng, [0.5, 0.5, 0.8, 0.8], 200),
        input_voltage=sweep(rng, [230.0, 230.0, 230.0, 207.0], 200),
    )

    found = find_dwells(log).dwells

    assert spans(found) == [(0, 200), (200, 400), (400, 600), (600, 800)]
    sources = ["found in output_current main", "found in output_current aux", "found in input_voltage"]
    assert [dwell.from_ for dwell in found[1:]] == sources


def test_find_dwells_is_not_disturbed_by_a_channel_of_noise():
    """Mains that wander by half a per cent and an unloaded output cut nothing."""
    rng = np.random.default_rng(8)
    log = bench_log(
        output_current__main=sweep(rng, [0.0, 0.5, 5.0], 300),
        output_current__aux=rng.normal(0, 1e-4, 900),
        input_voltage=230 + np.sin(np.arange(900) / 40) + rng.normal(0, 0.2, 900),
    )

    assert spans(find_dwells(log, rated={"main": 5.0, "aux": 1.0}).dwells) == [(0, 300), (300, 600), (600, 900)]


def test_find_dwells_separates_no_load_from_a_tenth():
    """0 and 10 % of rated are two conditions."""
    log = bench_log(output_current=sweep(np.random.default_rng(9), [0.0, 0.5], 100))

    assert spans(find_dwells(log, rated={"main": 5.0}).dwells) == [(0, 100), (100, 200)]


def test_find_dwells_takes_a_wandering_zero_for_one_dwell_when_rated():
    """The rating says that milliamperes are noise."""
    wander = np.cumsum(np.random.default_rng(10).normal(0, 2e-4, 2000))
    log = bench_log(output_current=wander)

    assert len(find_dwells(log, rated={"main": 50.0}).dwells) == 1


def test_find_dwells_spans_no_tables_and_no_stages():
    """The same current throughout, but another table or stage is another dwell."""
    log = bench_log(
        output_current=sweep(np.random.default_rng(11), [5.0], 400),
        table=np.repeat([0, 1], 200),
        stage=["steady"] * 100 + ["thermal"] * 200 + ["cooling"] * 100,
    )

    found = find_dwells(log).dwells

    assert spans(found) == [(0, 100), (100, 200), (200, 300), (300, 400)]
    assert [dwell.stage for dwell in found] == ["steady", "thermal", "thermal", "cooling"]
    assert [dwell.table for dwell in found] == [0, 0, 1, 1]


def test_find_dwells_finds_levels_within_any_stage():
    """An overcurrent sweep has dwells like any other."""
    log = bench_log(output_current=sweep(np.random.default_rng(12), [5.0, 5.5, 6.0], 40), stage=["overcurrent"] * 120)

    assert spans(find_dwells(log).dwells) == [(0, 40), (40, 80), (80, 120)]


def test_find_dwells_cuts_at_a_gap():
    """Nothing is known of a condition while nothing was logged."""
    time = np.arange(200) * 0.5
    time[120:] += 60
    log = bench_log(time=time, output_current=sweep(np.random.default_rng(13), [5.0], 200))

    assert spans(find_dwells(log).dwells) == [(0, 120), (120, 200)]


def test_find_dwells_sees_no_gap_where_the_logger_slows_down():
    """A soak logged every minute after a sweep logged every second is one dwell."""
    time = np.concatenate([np.arange(300), 300 + 60 * np.arange(100)]).astype(float)
    log = bench_log(time=time, output_current=sweep(np.random.default_rng(14), [5.0], 400))

    assert spans(find_dwells(log).dwells) == [(0, 400)]


def test_find_dwells_keeps_missing_rows_inside():
    """Empty cells in the middle, and at either end, stay in their dwell."""
    current = sweep(np.random.default_rng(15), [1.0, 2.0], 100)
    current[[0, 1, 40, 99, 150, 199]] = np.nan
    volts = np.full(200, np.nan)
    log = bench_log(output_current=current, input_voltage=volts)

    found = find_dwells(log).dwells

    assert len(found) == 2
    assert [found[0].first, found[1].stop] == [0, 200]
    assert found[0].stop in (99, 100)


def test_find_dwells_without_a_current_takes_a_table_for_one_dwell():
    """No current and no setting: the load is not known, the input voltage still is."""
    rng = np.random.default_rng(16)
    power = rng.normal(10, 0.05, 200)

    assert spans(find_dwells(bench_log(input_power=power)).dwells) == [(0, 200)]
    stepped = bench_log(input_power=power, input_voltage=sweep(rng, [207.0, 253.0], 100))
    assert spans(find_dwells(stepped).dwells) == [(0, 100), (100, 200)]


# --- by hand --------------------------------------------------------------------------------------------------------


def test_find_dwells_takes_each_row_by_hand_for_a_dwell():
    """Four loads at three inputs, a row each."""
    current = np.tile([1.25, 2.51, 3.74, 5.0], 3)
    volts = np.repeat([207.0, 230.1, 252.8], 4)

    found = find_dwells(bench_log(output_current=current, input_voltage=volts)).dwells

    assert spans(found) == [(i, i + 1) for i in range(12)]
    assert {dwell.from_ for dwell in found} == {"one row a condition"}
    assert {dwell.drift for dwell in found} == {None}


def test_find_dwells_takes_equal_settings_by_hand_for_readings_of_one_dwell():
    """Three readings at one setting, then one reading at another, then two."""
    setting = [1.0, 1.0, 1.0, 2.0, 3.0, 3.0]
    log = bench_log(load_setting=setting, output_current=[1.0, 1.001, 1.0, 2.0, 3.0, 3.001])

    assert spans(find_dwells(log).dwells) == [(0, 3), (3, 4), (4, 6)]


def test_find_dwells_keeps_single_readings_between_repeated_ones():
    """No row of a short table is dropped as a stray."""
    log = bench_log(output_current=[0.0, 0.0, 0.0, 1.0, 2.0, 3.0, 3.0], input_voltage=[230.0] * 7)

    assert spans(find_dwells(log).dwells) == [(0, 3), (3, 4), (4, 5), (5, 7)]


@pytest.mark.parametrize("rows", [1, 2, 3])
def test_find_dwells_takes_very_short_logs(rows):
    """One row is a dwell; so is each of two or three different ones."""
    found = find_dwells(bench_log(output_current=[1.0, 2.5, 4.0][:rows])).dwells

    assert spans(found) == [(i, i + 1) for i in range(rows)]


def test_find_dwells_of_no_rows():
    """A log without samples has no dwells."""
    assert find_dwells(bench_log(output_current=[])).dwells == ()


# --- settle and min_dwell --------------------------------------------------------------------------------------------


def test_find_dwells_drops_the_settling_time_stated():
    """Exactly this time, by an irregular clock."""
    rng = np.random.default_rng(17)
    time = np.cumsum(rng.uniform(0.1, 1.0, 200))
    log = bench_log(time=time, load_setting=np.repeat([0.0, 1.0], 100), output_current=sweep(rng, [0.0, 1.0], 100))

    found = find_dwells(log, settle=10.0).dwells

    for dwell, begins in zip(found, (0, 100), strict=True):
        assert dwell.begins == begins
        assert time[dwell.first] - time[begins] >= 10.0
        assert time[dwell.first - 1] - time[begins] < 10.0


def test_find_dwells_drops_dwells_below_the_time_stated():
    """min_dwell counts seconds, not samples."""
    rng = np.random.default_rng(18)
    time = np.concatenate([np.arange(100) * 1.0, 100 + np.arange(100) * 0.1, 110 + np.arange(100) * 1.0])
    log = bench_log(time=time, output_current=sweep(rng, [0.0, 1.0, 2.0], 100))

    assert spans(find_dwells(log).dwells) == [(0, 100), (100, 200), (200, 300)]
    assert spans(find_dwells(log, min_dwell=30.0).dwells) == [(0, 100), (200, 300)]
    assert len(find_dwells(log, min_dwell=9.9).dwells) == 3


def test_find_dwells_says_that_it_cannot_settle_without_time():
    """Seconds cannot be applied where no time was logged."""
    log = bench_log(output_current=sweep(np.random.default_rng(19), [0.0, 1.0], 100))

    found = find_dwells(log, settle=2.0, min_dwell=5.0)

    assert len(found.dwells) == 2
    assert [doubt.text for doubt in found.doubts] == [
        "settle not applied: the log has no time",
        "min_dwell not applied: the log has no time",
    ]


def test_find_dwells_says_where_settling_leaves_nothing():
    """A dwell shorter than its settling is no point, and that is said with its lines."""
    time = np.arange(200) * 0.1
    log = bench_log(
        time=time, load_setting=np.repeat([0.0, 1.0], [195, 5]), output_current=np.repeat([0.0, 1.0], [195, 5])
    )

    found = find_dwells(log, settle=2.0)

    assert spans(found.dwells) == [(20, 195)]
    (doubt,) = found.doubts
    assert doubt.text == "A-17-0.csv, lines 197 to 201: nothing is left of this dwell after settle = 2 s"


def test_find_dwells_applies_no_settling_to_single_rows():
    """A row by hand was read when its reader thought it settled."""
    log = bench_log(time=[0.0, 60.0, 120.0, 180.0], output_current=[1.0, 2.0, 3.0, 4.0])

    found = find_dwells(log, settle=10.0, min_dwell=5.0)

    assert len(found.dwells) == 4
    assert [doubt.kind for doubt in found.doubts] == ["settle not applied"]


def test_find_dwells_settles_by_any_channel_a_point_is_made_of():
    """The current stands at once, the input power does not: the dwell waits for it."""
    rng = np.random.default_rng(20)
    power = np.repeat([10.0, 20.0], 400) + rng.normal(0, 0.005, 800)
    tail = 0.6 * np.exp(-np.arange(400) / 10)
    power[400:] += tail
    log = bench_log(output_current=sweep(rng, [1.0, 2.0], 400), input_power=power)

    second = find_dwells(log).dwells[1]

    assert tail[second.first - 400 :].mean() < 0.005 / math.sqrt(second.stop - second.first)


def test_find_dwells_says_where_settling_takes_half():
    """What still moves at half of its dwell may not have settled at all."""
    rng = np.random.default_rng(21)
    power = 10 + 2 * np.exp(-np.arange(400) / 100) + rng.normal(0, 0.005, 400)
    log = bench_log(output_current=sweep(rng, [1.0], 400), input_power=power)

    found = find_dwells(log)

    assert spans(found.dwells) == [(200, 400)]
    assert [doubt.kind for doubt in found.doubts] == ["slow settling"]


def test_find_dwells_reports_the_drift_of_the_current():
    """End against start, in amperes."""
    log = bench_log(output_current=np.linspace(5.0, 5.01, 500) + np.random.default_rng(22).normal(0, 1e-4, 500))

    (dwell,) = find_dwells(log).dwells

    assert dwell.drift == pytest.approx(0.01, rel=0.05)


@settings(max_examples=80, deadline=None)
@given(data=st.data(), rows=st.integers(1, 60))
def test_find_dwells_takes_any_log(data, rows):
    """Whatever the cells: ordered dwells without overlap, within one table and stage, none beginning after it ends."""
    cells = arrays(np.float64, rows, elements=st.floats() | st.sampled_from([0.0, 1.0, 2.0, math.nan]))
    columns = {
        name: data.draw(cells)
        for name in ("time", "load_setting", "output_current", "input_voltage", "input_power")
        if data.draw(st.booleans())
    }
    table = np.sort(data.draw(arrays(np.int64, rows, elements=st.integers(0, 2))))
    stage = data.draw(st.lists(st.sampled_from(["steady", "thermal"]), min_size=rows, max_size=rows))
    log = bench_log(**columns, table=table, stage=stage)

    found = find_dwells(
        log, settle=data.draw(st.none() | st.floats(0, 10)), min_dwell=data.draw(st.none() | st.floats(0, 10))
    )

    borders = [border for dwell in found.dwells for border in (dwell.begins, dwell.first, dwell.stop)]
    assert borders == sorted(borders)
    for dwell in found.dwells:
        assert dwell.begins <= dwell.first < dwell.stop <= rows
        assert set(table[dwell.begins : dwell.stop]) == {dwell.table}
        assert set(stage[dwell.begins : dwell.stop]) == {dwell.stage}


@given(st.lists(st.integers(1, 30), min_size=1, max_size=20))
def test_usual_length_is_the_median_over_all_samples(lengths):
    assert _usual_length(np.array(lengths)) == np.median(np.repeat(lengths, lengths))


# --- very long logs ---------------------------------------------------------------------------------------------------


@pytest.mark.parametrize("has_holes", [False, True])
@pytest.mark.parametrize("is_declared", [False, True])
@pytest.mark.parametrize("kind", KINDS)
def test_find_dwells_finds_the_same_in_packed_columns(kind, is_declared, has_holes, monkeypatch):
    """The columns of a very long log are kept in another form, and mean the same."""
    log = make_sweep(kind, 5)
    current, time = log.current.copy(), np.arange(log.current.size) / 10
    time[current.size // 2 :] += 100  # a gap
    if has_holes:
        current[::37] = np.nan
    columns = {"output_current__main": current, "input_voltage": np.full(current.size, 230.0), "time": time}
    if is_declared:
        columns["load_setting__main"] = log.setting

    plain = find_dwells(bench_log(**columns), rated={"main": 5.0})
    monkeypatch.setitem(dwell_logs.PACKED, "columns", True)

    assert find_dwells(bench_log(**columns), rated={"main": 5.0}) == plain
    assert plain.dwells
