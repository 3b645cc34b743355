"""Efficiency from readings whose truth is known."""

from __future__ import annotations

import math

import numpy as np
import pytest

from acceptance.bench.log import Doubt
from acceptance.checks.efficiency import check_efficiency
from acceptance.decision import decide
from acceptance.points.propagation import expanded, nominal
from tests.checks.built import HEAD, adapter, limits_from, points_from

EFF_50 = "  efficiency: [{name: eff, at: {load: 50 %, input: 230 V}, min: 80 %}]"


def outcome_of(requirements, dwells, *, head=HEAD, **kwargs):
    limits = limits_from(requirements, head=head, **{k: kwargs.pop(k) for k in ("bench", "decision") if k in kwargs})
    points = points_from(dwells, limits, **kwargs)
    return check_efficiency(limits.requirements, points).outcomes[0], limits


def true_efficiency(load: float) -> float:
    current, voltage = 4 * load, 12 - 0.02 * 4 * load
    return voltage * current / (voltage * current + 0.5 + 0.4 * current + 0.1 * current**2)


def test_efficiency_at_a_load_is_output_over_input_power():
    outcome, _ = outcome_of(EFF_50, [adapter(0.0), adapter(0.5), adapter(1.0)])

    (candidate,) = outcome.candidates
    assert candidate.estimate.nominal == pytest.approx(true_efficiency(0.5), rel=1e-12)
    assert outcome.condition == "load 50 %, input 230 V"


def test_efficiency_uncertainty_of_single_readings_is_that_of_the_three_meters():
    """u(eta)/eta is the root of the sum of squares of the relative u, each bound over sqrt 3."""
    outcome, _ = outcome_of(EFF_50, [adapter(0.5)])

    row = adapter(0.5)
    p, v, i = row["input_power"], row["output_voltage main"], row["output_current main"]
    parts = [(0.001 * p + 0.02) / p, (0.0002 * v + 0.002) / v, (0.0005 * i + 0.001) / i]
    expected = true_efficiency(0.5) * math.sqrt(sum((part / math.sqrt(3)) ** 2 for part in parts))
    estimate = outcome.candidates[0].estimate
    assert expanded(estimate.value, 0.95).standard == pytest.approx(expected, rel=1e-9)
    assert expanded(estimate.value, 0.95).coverage_factor == pytest.approx(1.959964, abs=1e-6)


def test_efficiency_is_the_mean_of_products_not_the_product_of_means():
    """Ripple of load that voltage follows out of phase: mean(V I) is not mean V times mean I."""
    rng = np.random.default_rng(3)
    current = 2 + 0.2 * rng.standard_normal(400)
    voltage = 12 - 0.5 * (current - 2)
    power = voltage * current / 0.9
    row = {
        "input_voltage": 230.0,
        "input_power": list(power),
        "output_voltage main": list(voltage),
        "output_current main": list(current),
    }
    outcome, _ = outcome_of(EFF_50, [row])

    # each sample has an efficiency of 0.9, so the mean has too, and no spread at all
    estimate = outcome.candidates[0].estimate
    assert estimate.nominal == pytest.approx(0.9, rel=1e-12)
    assert expanded(estimate.value, 0.95).degrees_of_freedom > 1e6


def test_average_efficiency_is_the_mean_of_the_efficiencies_not_of_the_powers():
    requirement = "  efficiency: [{name: avg, average: [25 %, 50 %, 75 %, 100 %], at: {input: 230 V}, min: 80 %}]"
    outcome, _ = outcome_of(requirement, [adapter(load) for load in (1.0, 0.75, 0.5, 0.25, 0.0)])

    expected = sum(true_efficiency(load) for load in (0.25, 0.5, 0.75, 1.0)) / 4
    assert outcome.candidates[0].estimate.nominal == pytest.approx(expected, rel=1e-12)
    assert [used.role for used in outcome.candidates[0].used] == ["load 25 %", "load 50 %", "load 75 %", "load 100 %"]


def test_average_efficiency_shares_the_gain_of_the_meters():
    """With gain errors alone the average is as uncertain as each point: nothing averages out."""
    bench = """
instruments:
  input_power: {device: P1, accuracy: "0.3 % reading"}
  output_voltage: {device: M1, accuracy: "0.1 % reading"}
  output_current: {device: L1, accuracy: "0.2 % reading"}
"""
    requirement = "  efficiency: [{name: avg, average: [25 %, 50 %, 75 %, 100 %], at: {input: 230 V}, min: 80 %}]"
    outcome, _ = outcome_of(requirement, [adapter(load) for load in (1.0, 0.75, 0.5, 0.25)], bench=bench)

    estimate = outcome.candidates[0].estimate
    relative = math.sqrt(0.003**2 + 0.001**2 + 0.002**2) / math.sqrt(3)
    assert expanded(estimate.value, 0.95).standard == pytest.approx(estimate.nominal * relative, rel=1e-9)


def test_average_takes_the_worse_of_two_dwells_at_one_load():
    worse = {**adapter(0.5), "input_power": adapter(0.5)["input_power"] * 1.02}
    requirement = "  efficiency: [{name: avg, average: [50 %, 100 %], at: {input: 230 V}, min: 80 %}]"
    outcome, _ = outcome_of(requirement, [adapter(0.5), worse, adapter(1.0)])

    expected = (true_efficiency(0.5) / 1.02 + true_efficiency(1.0)) / 2
    assert outcome.candidates[0].estimate.nominal == pytest.approx(expected, rel=1e-12)


def test_each_dwell_at_the_condition_is_a_candidate_and_the_worst_decides():
    worse = {**adapter(0.5), "input_power": adapter(0.5)["input_power"] * 1.2}
    outcome, limits = outcome_of(EFF_50, [adapter(0.5), worse])

    decided = decide(outcome, limits.decision)
    assert len(outcome.candidates) == 2
    assert decided.verdict == "fail"
    assert decided.by.candidate.estimate.nominal == pytest.approx(true_efficiency(0.5) / 1.2)
    assert [other.verdict for other in decided.others] == ["pass"]


def test_lead_resistance_is_put_back_with_its_uncertainty():
    """The load's meter sat behind 50 mohm: the terminals are I R higher, and deliver I^2 R more."""
    bench = "\ninstruments:\n  input_power: {device: P, accuracy: \"0.0001 % reading\"}\n" \
        "  output_voltage: {device: M, accuracy: \"0.0001 % reading\"}\n" \
        "  output_current: {device: L, accuracy: \"0.0001 % reading\"}\n" \
        "lead_resistance: {output: 50 mohm ± 6 mohm}\n"  # fmt: skip
    row = adapter(0.5)
    seen = {**row, "output_voltage main": row["output_voltage main"] - 0.05 * row["output_current main"]}
    outcome, _ = outcome_of(EFF_50, [seen], bench=bench)

    estimate = outcome.candidates[0].estimate
    assert estimate.nominal == pytest.approx(true_efficiency(0.5), rel=1e-9)
    u = 0.006 / math.sqrt(3) * row["output_current main"] ** 2 / row["input_power"]
    assert expanded(estimate.value, 0.95).standard == pytest.approx(u, rel=1e-4)


def test_lead_resistance_without_a_bound_leaves_the_uncertainty_unstated():
    bench = "\ninstruments:\n  input_power: {device: P, accuracy: \"0.1 % reading\"}\n" \
        "  output_voltage: {device: M, accuracy: \"0.1 % reading\"}\n" \
        "  output_current: {device: L, accuracy: \"0.1 % reading\"}\n" \
        "lead_resistance: {output: 50 mohm}\n"  # fmt: skip
    outcome, limits = outcome_of(EFF_50, [adapter(0.5)], bench=bench)

    decided = decide(outcome, limits.decision)
    assert decided.verdict == "not judged"
    assert "uncertainty not stated" in decided.reason
    assert "lead_resistance" in decided.reason


def test_an_ac_input_of_volts_and_amperes_alone_is_not_judged():
    row = adapter(0.5)
    current = row.pop("input_power") / 230 / 0.6
    outcome, limits = outcome_of(EFF_50, [{**row, "input_current": current}])

    decided = decide(outcome, limits.decision)
    assert decided.verdict == "not judged"
    assert "power factor" in decided.reason
    assert "wattmeter" in decided.reason


def test_an_ac_input_with_power_factor_gives_a_power():
    row = adapter(0.5)
    power = row.pop("input_power")
    more = {"input_current": power / 230 / 0.6, "power_factor": 0.6}
    outcome, _ = outcome_of(EFF_50, [{**row, **more}])

    assert outcome.candidates[0].estimate.nominal == pytest.approx(true_efficiency(0.5), rel=1e-12)
    assert outcome.candidates[0].estimate.unstated == {"input_voltage", "input_current", "power_factor"}


def test_a_dc_input_multiplies_volts_and_amperes():
    head = HEAD.replace(
        "supply: ac, voltage: 230 V, range: [207 V, 253 V], frequency: 50 Hz", "supply: dc, voltage: 48 V"
    )
    row = adapter(0.5, vin=48.0)
    power = row.pop("input_power")
    outcome, _ = outcome_of(EFF_50.replace("230 V", "48 V"), [{**row, "input_current": power / 48}], head=head)

    assert outcome.candidates[0].estimate.nominal == pytest.approx(true_efficiency(0.5), rel=1e-12)


def test_two_outputs_add_their_powers():
    head = HEAD + "    aux: {voltage: 5 V, current: 1 A}\n"
    row = {**adapter(0.5), "output_voltage aux": 5.0, "output_current aux": 0.5}
    row["input_power"] += 2.5 / 0.8
    outcome, _ = outcome_of(EFF_50, [row], head=head)

    main = adapter(0.5)
    delivered = main["output_voltage main"] * main["output_current main"] + 2.5
    assert outcome.candidates[0].estimate.nominal == pytest.approx(delivered / row["input_power"], rel=1e-12)


def test_two_outputs_need_both_at_the_load_unless_one_is_named():
    head = HEAD + "    aux: {voltage: 5 V, current: 1 A}\n"
    row = {**adapter(0.5), "output_voltage aux": 5.0, "output_current aux": 1.0}
    whole, _ = outcome_of(EFF_50, [row], head=head)
    named = EFF_50.replace("name: eff,", "name: eff, output: main,")
    one, _ = outcome_of(named, [row], head=head)

    assert not whole.candidates
    assert "load aux 100.0 %" in whole.reason
    assert len(one.candidates) == 1


def test_a_missing_load_names_the_nearest_dwell():
    outcome, limits = outcome_of(EFF_50, [adapter(0.25), adapter(0.46)])

    decided = decide(outcome, limits.decision)
    assert decided.verdict == "not judged"
    assert "no dwell at load 50 %, input 230 V" in decided.reason
    assert "load 46.0 %, input 230 V (T-1.csv, line 3)" in decided.reason


@pytest.mark.parametrize(("fraction", "asked", "met"), [
    (0.5199, "50 %", True), (0.5201, "50 %", False), (0.4801, "50 %", True), (0.4799, "50 %", False),
    (0.1099, "10 %", True), (0.1101, "10 %", False), (0.0901, "10 %", True), (0.0899, "10 %", False),
])  # fmt: skip
def test_a_load_is_met_within_two_points_and_one_at_ten_per_cent(fraction, asked, met):
    outcome, _ = outcome_of(EFF_50.replace("50 %", asked), [adapter(fraction)])

    assert bool(outcome.candidates) is met


@pytest.mark.parametrize(("volts", "met"), [(232.2, True), (232.4, False), (227.8, True), (227.6, False)])
def test_an_input_is_met_within_one_per_cent(volts, met):
    outcome, _ = outcome_of(EFF_50, [adapter(0.5, vin=volts)])

    assert bool(outcome.candidates) is met


def test_a_tolerance_of_the_limits_file_goes_before_the_default():
    outcome, _ = outcome_of(EFF_50, [adapter(0.455)], decision="decision: {tolerance: {load: 5 %}}")

    assert len(outcome.candidates) == 1


def test_a_barred_channel_is_not_judged_with_its_remedy():
    doubt = Doubt("frozen", "input_power stands still", bars=True, channels=("input_power",), remedy="record it again")
    outcome, limits = outcome_of(EFF_50, [adapter(0.5)], doubts=[doubt])

    decided = decide(outcome, limits.decision)
    assert decided.verdict == "not judged"
    assert decided.reason == "input_power stands still; record it again"


def test_a_bar_elsewhere_in_the_log_leaves_a_dwell_alone():
    doubt = Doubt("frozen", "input_power stands still", bars=True, channels=("input_power",), spans=((0, 1),))
    outcome, limits = outcome_of(EFF_50, [adapter(1.0), adapter(0.5)], doubts=[doubt])

    assert decide(outcome, limits.decision).verdict == "pass"


def test_a_channel_with_gaps_uses_the_samples_that_have_all():
    row = adapter(0.5)
    power = [row["input_power"]] * 4
    power[1] = math.nan
    outcome, _ = outcome_of(EFF_50, [{**row, "input_power": power}])

    assert outcome.candidates[0].estimate.nominal == pytest.approx(true_efficiency(0.5), rel=1e-12)


@pytest.mark.parametrize("power", [0.0, -1.0, math.nan])
def test_a_power_that_is_not_above_zero_is_never_a_number(power):
    outcome, limits = outcome_of(EFF_50, [{**adapter(0.5), "input_power": power}])

    assert decide(outcome, limits.decision).verdict == "not judged"


def test_no_load_is_left_out_of_any_load():
    requirement = "  efficiency: [{name: eff, at: {load: any, input: 230 V}, min: 1 %}]"
    outcome, _ = outcome_of(requirement, [adapter(0.0), adapter(0.5), adapter(1.0), adapter(1.2)])

    assert [candidate.where for candidate in outcome.candidates] == ["T-1.csv, line 3", "T-1.csv, line 4"]


def test_the_figure_carries_the_same_values_as_the_points():
    limits = limits_from(EFF_50)
    points = points_from([adapter(0.0), adapter(1.0), adapter(0.5)], limits)
    (figure,) = check_efficiency(limits.requirements, points).figures

    assert figure.series[0].x == [0.5, 1.0]
    assert figure.series[0].y == pytest.approx([true_efficiency(0.5), true_efficiency(1.0)], rel=1e-12)
    assert figure.limits[0].y == 0.8
    u = expanded(points.all[2].efficiency(["main"]).value, 0.95).expanded
    assert figure.series[0].expanded_uncertainty[0] == pytest.approx(u)
    assert nominal(points.all[2].efficiency(["main"]).value) == figure.series[0].y[0]
