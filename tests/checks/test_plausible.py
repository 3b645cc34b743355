"""Points that cannot be true: each fault barred with its remedy, and good data left alone."""

from __future__ import annotations

import math

import numpy as np
import pytest

from acceptance.checks.no_load_power import check_no_load_power
from acceptance.checks.output_voltage import check_output_voltage
from acceptance.checks.ripple import check_ripple
from acceptance.decision import decide
from acceptance.points.plausible import doubt_points
from acceptance.points.propagation import expanded
from tests.checks.built import INSTRUMENTS, adapter, limits_from, points_from

BAND = "  output_voltage: [{name: band, at: {load: any, input: any}, within: 2 %}]"
FULL = "  output_voltage: [{name: band, at: {load: 100 %, input: any}, within: 2 %}]"


def doubts_of(rows, **kwargs):
    """Kinds and channels of the doubts about dwells with these readings."""
    limits = limits_from(BAND, **{k: kwargs.pop(k) for k in ("bench",) if k in kwargs})
    return doubt_points(points_from(rows, limits, **kwargs))


def kinds(doubts):
    return sorted({doubt.kind for doubt in doubts})


GOOD = [adapter(load) for load in (0.0, 0.1, 0.25, 0.5, 0.75, 1.0)]


def noisy(row, seed, n=40):
    """The reading as samples with a spread of a thousandth."""
    rng = np.random.default_rng(seed)
    return {key: list(value * (1 + 1e-3 * rng.standard_normal(n))) for key, value in row.items()}


def test_good_data_has_no_doubt():
    assert doubts_of(GOOD) == ()
    assert doubts_of([noisy(row, seed) for seed, row in enumerate(GOOD)]) == ()


@pytest.mark.parametrize("channel", ["output_current main", "output_voltage main"])
def test_a_sign_turned_about_is_barred(channel):
    doubts = doubts_of([{**row, channel: -row[channel]} for row in GOOD])

    assert ("negative", (channel,)) in {(doubt.kind, doubt.channels) for doubt in doubts if doubt.bars}


def test_an_offset_below_zero_at_no_load_is_no_sign_turned_about():
    assert doubts_of([{**GOOD[0], "output_current main": -0.001}, *GOOD[1:]]) == ()


def test_an_input_power_that_is_the_output_power_is_barred():
    rows = [{**row, "input_power": row["output_voltage main"] * row["output_current main"] + 1e-4} for row in GOOD]

    assert "no loss" in kinds(doubts_of(rows))


def test_an_input_power_in_another_unit_is_barred():
    rows = [{**row, "input_power": 1000 * row["input_power"]} for row in GOOD]

    (doubt,) = doubts_of(rows)
    assert doubt.kind == "scale"
    assert "1000" in doubt.remedy


def test_a_lossy_unit_at_light_load_alone_is_no_doubt():
    """A tenth of an ampere out of a supply that idles at 20 W is a bad supply, not a wrong unit."""
    assert doubts_of([{**row, "input_power": row["input_power"] + 20} for row in GOOD]) == ()


def test_ripple_above_the_output_itself_is_barred():
    doubts = doubts_of([{**row, "ripple main": 85.2} for row in GOOD])

    assert [(doubt.kind, doubt.channels) for doubt in doubts] == [("scale", ("ripple main",))]


def test_a_load_that_dropped_out_bars_its_dwell_and_the_dwell_still_counts():
    """Full load, with the unit down for 15 % of the second dwell: the mean load is 85 %, the dwell was run at 100 %."""
    full = noisy(adapter(1.0), 1)
    tripped = noisy(adapter(1.0), 2)
    for key in ("output_current main", "output_voltage main"):
        tripped[key][20:26] = [0.0] * 6
    limits = limits_from(FULL)
    points = points_from([full, tripped], limits)
    doubts = doubt_points(points)
    judged = points_from([full, tripped], limits, doubts=doubts)
    (outcome,) = check_output_voltage(limits.requirements, judged).outcomes

    assert {"unsteady"} == set(kinds(doubts))
    assert len(outcome.candidates) == 2
    assert decide(outcome, limits.decision).verdict == "not judged"


@pytest.mark.parametrize("channel", ["input_power", "output_voltage main", "output_current main", "input_voltage"])
def test_a_reading_dropped_to_zero_is_barred(channel):
    row = noisy(adapter(0.5), 3)
    row[channel][17] = 0.0

    (doubt,) = doubts_of([noisy(adapter(1.0), 4), row])
    assert doubt.kind == "unsteady"
    assert doubt.channels == (channel,)
    assert "1 of 40 readings" in doubt.text


def test_bursts_of_power_at_no_load_are_no_dropouts():
    row = noisy(adapter(0.0), 5)
    row["input_power"] = [4.0 if i % 10 == 0 else 0.05 for i in range(40)]

    assert doubts_of([row, noisy(adapter(1.0), 6)]) == ()


def test_a_current_that_reads_at_no_load_is_told():
    rows = [{**row, "load_setting main": round(row["output_current main"], 6)} for row in GOOD]
    rows[0]["output_current main"] = 0.009

    (doubt,) = doubts_of(rows)
    assert (doubt.kind, doubt.bars) == ("offset", False)
    assert "9 mA" in doubt.text


def test_an_efficiency_made_impossible_by_an_offset_bars_only_that_dwell():
    rows = [{**GOOD[0], "output_current main": 0.1}, *GOOD[1:]]

    (doubt,) = doubts_of(rows)
    assert doubt.spans == ((0, 1),)
    assert "zero of the current" in doubt.remedy


def test_a_unit_that_is_off_has_no_no_load_power():
    limits = limits_from("  no_load_power: [{name: standby, at: {input: 230 V}, max: 0.3 W}]")
    points = points_from([{**adapter(0.0), "input_power": 0.02, "output_voltage main": 0.002}], limits)
    decided = decide(check_no_load_power(limits.requirements, points).outcomes[0], limits.decision)

    assert decided.verdict == "not judged"
    assert "off or has tripped" in decided.reason


def test_a_dwell_of_unknown_load_keeps_any_from_being_judged():
    limits = limits_from(BAND)
    lost = {**adapter(1.0), "output_current main": math.nan, "output_voltage main": 9.0}
    points = points_from([*GOOD, lost], limits)
    decided = decide(check_output_voltage(limits.requirements, points).outcomes[0], limits.decision)

    assert decided.verdict == "not judged"
    assert "the load of main is not known" in decided.reason


def test_what_lies_beyond_the_ratings_is_named():
    limits = limits_from(BAND)
    points = points_from([*GOOD, {**adapter(1.024), "output_voltage main": 9.0}], limits)
    (outcome,) = check_output_voltage(limits.requirements, points).outcomes

    assert decide(outcome, limits.decision).verdict == "pass"
    assert "load 102.4 %" in outcome.deviations[0]


def test_a_channel_missing_over_most_of_a_dwell_is_not_judged():
    limits = limits_from(FULL)
    row = noisy(adapter(1.0), 7)
    row["output_voltage main"][5:35] = [math.nan] * 30
    points = points_from([row], limits)
    decided = decide(check_output_voltage(limits.requirements, points).outcomes[0], limits.decision)

    assert decided.verdict == "not judged"
    assert "no reading over more than half" in decided.reason


def test_a_channel_read_every_fourth_sample_is_judged():
    limits = limits_from(FULL)
    row = noisy(adapter(1.0), 8)
    row["output_voltage main"] = [v if i % 4 == 0 else math.nan for i, v in enumerate(row["output_voltage main"])]
    points = points_from([row], limits)

    assert decide(check_output_voltage(limits.requirements, points).outcomes[0], limits.decision).verdict == "pass"


def test_a_reading_beyond_the_stated_range_is_not_judged():
    bench = INSTRUMENTS.replace('"0.02 % reading + 2 mV"', '"0.02 % reading + 2 mV", meter_range: 10 V')
    head = FULL
    limits = limits_from(head, bench=bench)
    points = points_from([adapter(1.0, volts=12.6)], limits)
    decided = decide(check_output_voltage(limits.requirements, points).outcomes[0], limits.decision)

    assert decided.verdict == "not judged"
    assert "meter_range" in decided.reason


def test_a_ripple_reading_above_the_limit_among_the_settling_is_not_passed_over():
    limits = limits_from("  ripple: [{name: rip, at: {load: 100 %, input: any}, max: 100 mV}]")
    row = {**noisy(adapter(1.0), 9)}
    row["ripple main"] = [0.4] * 5 + [0.06] * 35
    points = points_from([row], limits)
    (point,) = points.all
    from dataclasses import replace

    settled = replace(point, dwell=replace(point.dwell, first=5), _kept={})
    points = replace(points, all=(settled,))
    decided = decide(check_ripple(limits.requirements, points).outcomes[0], limits.decision)

    assert decided.verdict == "not judged"
    assert "400 mV" in decided.reason


def stepped(points, key, step):
    """The points of a log whose channel was written in such steps."""
    from dataclasses import replace

    from acceptance.points.point import measure_points

    channels = tuple(replace(c, step=step if c.key == key else 0.0) for c in points.log.channels)
    log = replace(points.log, channels=channels)
    return measure_points(log, [point.dwell for point in points.all], points.limits)


def test_digits_coarser_than_the_meter_are_in_the_uncertainty():
    """A voltage written in tenths of a volt is known to 0.1 V / sqrt 12 at best, whatever the meter could do."""
    limits = limits_from(FULL)
    points = stepped(
        points_from([{**adapter(1.0), "output_voltage main": [11.9] * 30}], limits), "output_voltage main", 0.1
    )
    (outcome,) = check_output_voltage(limits.requirements, points).outcomes

    meter = (0.0002 * 11.9 + 0.002) / math.sqrt(3)
    expected = math.hypot(meter, 0.1 / math.sqrt(12))
    u = expanded(outcome.candidates[0].estimate.value, 0.95).standard
    assert u == pytest.approx(expected, rel=1e-9)


def test_digits_that_the_noise_averages_out_are_not():
    limits = limits_from(FULL)
    rng = np.random.default_rng(10)
    volts = list(np.round(11.9 + rng.normal(0, 0.1, 400), 1))
    points = stepped(points_from([{**adapter(1.0), "output_voltage main": volts}], limits), "output_voltage main", 0.1)
    (outcome,) = check_output_voltage(limits.requirements, points).outcomes

    assert expanded(outcome.candidates[0].estimate.value, 0.95).standard < 0.02


def test_a_log_without_a_current_says_what_to_record():
    limits = limits_from(FULL)
    rows = [{k: v for k, v in adapter(load).items() if not k.startswith("output_current")} for load in (0.5, 1.0)]
    decided = decide(check_output_voltage(limits.requirements, points_from(rows, limits)).outcomes[0], limits.decision)

    assert decided.reason == "output_current main was not logged, so that no load can be told; record it"


def test_a_load_that_reads_below_zero_is_named_where_its_condition_is_missed():
    limits = limits_from(FULL)
    rows = [{**row, "output_current main": -row["output_current main"]} for row in GOOD]
    doubts = doubt_points(points_from(rows, limits))
    points = points_from(rows, limits, doubts=doubts)
    decided = decide(check_output_voltage(limits.requirements, points).outcomes[0], limits.decision)

    assert decided.verdict == "not judged"
    assert "below zero" in decided.reason


@pytest.mark.parametrize("ripple", [0.0, 0.0002, 0.0613])
def test_ripple_that_never_changes_is_barred(ripple):
    rows = [{**noisy(row, seed), "ripple main": [ripple] * 40} for seed, row in enumerate(GOOD)]

    assert [(d.kind, d.channels) for d in doubts_of(rows)] == [("never moves", ("ripple main",))]


def test_ripple_in_the_wrong_unit_is_barred():
    """170 mV read as 170 microvolt."""
    rows = [
        {**noisy(row, seed), "ripple main": [1.7e-5 + 1e-7 * i for i in range(40)]} for seed, row in enumerate(GOOD)
    ]

    assert [(d.kind, d.channels) for d in doubts_of(rows)] == [("scale", ("ripple main",))]


def test_readings_outside_the_band_among_the_settling_are_said():
    from dataclasses import replace

    limits = limits_from(FULL)
    row = noisy(adapter(1.0), 11)
    row["output_voltage main"] = [12.5] * 4 + row["output_voltage main"][4:]
    points = points_from([row], limits)
    (point,) = points.all
    settled = replace(point, dwell=replace(point.dwell, first=4, level_from=0), _kept={})
    (outcome,) = check_output_voltage(limits.requirements, replace(points, all=(settled,))).outcomes

    assert outcome.deviations == (
        f"4 readings outside the band, up to 12.5 V, left out as settling before {settled.where}",
    )


def test_readings_outside_the_band_of_several_dwells_are_said_together():
    """All of them counted, the farthest named, each dwell's place given."""
    from dataclasses import replace

    limits = limits_from(FULL.replace("load: 100 %", "load: any"))
    rows = [noisy(adapter(load), seed) for load, seed in ((0.5, 11), (1.0, 12))]
    for row, volts in zip(rows, (12.6, 12.5), strict=True):
        row["output_voltage main"] = [volts] * 3 + row["output_voltage main"][3:]
    points = points_from(rows, limits)
    settled = tuple(
        replace(
            point, dwell=replace(point.dwell, first=point.dwell.begins + 3, level_from=point.dwell.begins), _kept={}
        )
        for point in points.all
    )
    (outcome,) = check_output_voltage(limits.requirements, replace(points, all=settled)).outcomes

    (text,) = outcome.deviations
    lines = [point.where.rpartition(", lines ")[2] for point in settled]
    assert text.startswith("6 readings outside the band, up to 12.6 V, left out as settling before ")
    assert text.endswith(f", lines {lines[0]}, {lines[1]}")
