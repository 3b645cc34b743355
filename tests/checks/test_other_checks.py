"""Output voltage, no-load power, ripple, and what this version does not judge."""

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
STANDBY = "  no_load_power: [{name: standby, at: {input: 230 V}, max: 0.6 W}]"
RIPPLE = "  ripple: [{name: rip, at: {load: 100 %, input: 230 V}, max: 40 mV, kind: p-p, bandwidth: 20 MHz}]"


def outcome_of(check, requirement, dwells, **kwargs):
    limits = limits_from(requirement, **{k: kwargs.pop(k) for k in ("bench", "decision") if k in kwargs})
    points = points_from(dwells, limits, **kwargs)
    return check(limits.requirements, points).outcomes[0], limits


def test_a_band_within_a_share_is_about_the_rated_voltage():
    outcome, _ = outcome_of(check_output_voltage, BAND, [adapter(0.5)])

    assert outcome.low == pytest.approx(11.76)
    assert outcome.high == pytest.approx(12.24)


def test_every_steady_dwell_within_ratings_is_held_against_the_band():
    rows = [adapter(0.0), adapter(1.0), adapter(1.3, volts=2.0), adapter(0.5, vin=180.0, volts=1.0)]
    outcome, limits = outcome_of(check_output_voltage, BAND, rows)

    assert [candidate.estimate.nominal for candidate in outcome.candidates] == pytest.approx([12.0, 11.92])
    assert decide(outcome, limits.decision).verdict == "pass"


def test_a_collapsed_output_at_no_current_is_not_overlooked():
    """With the output down the load draws nothing: that dwell must fail the band, not vanish from it."""
    outcome, limits = outcome_of(
        check_output_voltage, BAND, [adapter(0.5), {**adapter(0.0), "output_voltage main": 0.1}]
    )

    assert decide(outcome, limits.decision).verdict == "fail"


def test_the_drop_in_the_leads_is_put_back():
    bench = INSTRUMENTS + "lead_resistance: {output: 30 mohm ± 3 mohm}\n"
    outcome, _ = outcome_of(check_output_voltage, BAND, [adapter(1.0)], bench=bench)

    estimate = outcome.candidates[0].estimate
    assert estimate.nominal == pytest.approx(11.92 + 0.03 * 4.0, rel=1e-12)
    lead = 0.003 / math.sqrt(3) * 4.0
    meter = (0.0002 * 11.92 + 0.002) / math.sqrt(3)
    clamp = 0.03 * (0.0005 * 4.0 + 0.001) / math.sqrt(3)
    expected = math.sqrt(lead**2 + meter**2 + clamp**2)
    assert expanded(estimate.value, 0.95).standard == pytest.approx(expected, rel=1e-6)


def test_no_load_power_is_the_mean_bursts_and_all():
    rng = np.random.default_rng(5)
    power = np.where(np.arange(600) % 30 < 3, 4.0, 0.05) + rng.normal(0, 0.002, 600)
    row = {**adapter(0.0), "input_power": list(power)}
    outcome, _ = outcome_of(check_no_load_power, STANDBY, [row, adapter(1.0)])

    (candidate,) = outcome.candidates
    assert candidate.estimate.nominal == pytest.approx(0.445, abs=0.001)
    assert outcome.condition == "load 0 %, input 230 V"
    assert candidate.used[0].role == "no load, mean over 9 min 59 s"


def test_a_no_load_stretch_that_a_spike_cut_in_two_is_one_stretch():
    limits = limits_from(STANDBY)
    points = points_from(
        [{**adapter(0.0), "input_power": [0.1] * 50}, {**adapter(0.0), "input_power": [0.3] * 50}], limits
    )
    (outcome,) = check_no_load_power(limits.requirements, points).outcomes

    (candidate,) = outcome.candidates
    assert candidate.estimate.nominal == pytest.approx(0.2)
    assert candidate.used[0].point.readings == 100


@pytest.mark.parametrize(("power", "printed"), [(0.0, "0 W"), (-0.01, "−10 mW"), (-4.7e-5, "−47 µW")])
def test_a_no_load_power_that_the_meter_does_not_resolve_is_not_judged(power, printed):
    outcome, limits = outcome_of(check_no_load_power, STANDBY, [{**adapter(0.0), "input_power": power}])

    decided = decide(outcome, limits.decision)
    assert decided.verdict == "not judged"
    assert "does not resolve" in decided.reason
    assert f"reads {printed}, not above zero" in decided.reason


@pytest.mark.parametrize(("current", "met"), [(0.0, True), (0.0079, True), (-0.0079, True), (0.0085, False)])
def test_no_load_is_below_two_thousandths_of_rated_current(current, met):
    """0.2 % of 4 A is 8 mA; the meter's own U of 1.1 mA is less."""
    outcome, _ = outcome_of(check_no_load_power, STANDBY, [{**adapter(0.0), "output_current main": current}])

    assert bool(outcome.candidates) is met


def test_no_load_is_below_the_meters_uncertainty_where_that_is_larger():
    bench = INSTRUMENTS.replace("0.05 % reading + 1 mA", "20 mA")  # U = 1.96 x 20 mA / sqrt 3 = 22.6 mA
    outcome, _ = outcome_of(check_no_load_power, STANDBY, [{**adapter(0.0), "output_current main": 0.022}], bench=bench)

    assert len(outcome.candidates) == 1


def test_ripple_is_the_largest_reading_never_the_mean():
    row = {**adapter(1.0), "ripple main": [0.020, 0.0391, 0.021, math.nan]}
    outcome, limits = outcome_of(check_ripple, RIPPLE, [row])

    estimate = outcome.candidates[0].estimate
    assert estimate.nominal == 0.0391
    assert expanded(estimate.value, 0.95).standard == pytest.approx(0.0391 * 0.03 / math.sqrt(3), rel=1e-9)
    decided = decide(outcome, limits.decision)
    assert decided.verdict == "fail"
    assert "not shown to conform" in decided.reason


def test_ripple_that_was_not_logged_is_not_judged():
    row = {k: v for k, v in adapter(1.0).items() if not k.startswith("ripple")}
    outcome, limits = outcome_of(check_ripple, RIPPLE, [row])

    assert "ripple main was not logged" in decide(outcome, limits.decision).reason


def test_a_value_without_stated_accuracy_is_judged_only_under_simple():
    bench = '\ninstruments:\n  output_current: {device: L, accuracy: "0.1 % reading"}\n'
    guarded, limits = outcome_of(check_output_voltage, BAND, [adapter(0.5)], bench=bench)
    simple, lenient = outcome_of(
        check_output_voltage, BAND, [adapter(0.5)], bench=bench, decision="decision: {rule: simple}"
    )

    assert decide(guarded, limits.decision).verdict == "not judged"
    told = decide(simple, lenient.decision)
    assert told.verdict == "pass"
    assert told.reason.startswith("uncertainty not stated")
    assert told.by.probability is None


def test_an_impossible_efficiency_is_a_doubt_that_bars():
    limits = limits_from(BAND)
    good = points_from([adapter(load) for load in (0.25, 0.5, 1.0)], limits)
    swapped = adapter(0.5)
    swapped["input_power"] *= 0.7
    bad = points_from([adapter(0.25), swapped, adapter(1.0)], limits)

    assert doubt_points(good) == ()
    doubts = doubt_points(bad)
    assert all(doubt.bars and doubt.kind == "impossible efficiency" for doubt in doubts)
    assert doubts[0].channels == ("input_power", "input_current")
    assert doubts[1].spans == ((1, 2),)


def test_an_efficiency_above_one_within_its_uncertainty_is_no_doubt():
    bench = INSTRUMENTS.replace("0.1 % reading + 0.02 W", "5 % reading")
    row = adapter(1.0)
    row["input_power"] = row["output_voltage main"] * 4.0 / 1.02
    limits = limits_from(BAND, bench=bench)

    assert doubt_points(points_from([row], limits)) == ()


def test_an_output_that_never_moves_while_its_load_does_is_barred():
    rows = [{**adapter(load), "output_voltage main": [12.0] * 3} for load in (0.1, 0.5, 1.0)]
    doubts = doubt_points(points_from(rows, limits_from(BAND)))

    assert [doubt.channels for doubt in doubts if doubt.kind == "never moves"] == [("output_voltage main",)]


def test_an_output_that_moves_by_a_digit_is_not():
    rows = [{**adapter(load), "output_voltage main": volts} for load, volts in ((0.1, 12.1), (0.5, 12.0), (1.0, 12.0))]

    assert doubt_points(points_from(rows, limits_from(BAND))) == ()
