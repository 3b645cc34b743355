"""Load and line regulation from readings whose truth is known."""

from __future__ import annotations

import math

import pytest
from hypothesis import given
from hypothesis import strategies as st

from acceptance.checks.regulation import check_line_regulation, check_load_regulation, regulation
from acceptance.decision import decide
from acceptance.points.point import Estimate
from acceptance.points.propagation import expanded
from tests.checks.built import HEAD, adapter, limits_from, points_from

LOAD = "  load_regulation: [{name: reg, from: 0 %, to: 100 %, at: {input: 230 V}, max: 1 %, relative_to: full load}]"
LINE = "  line_regulation: [{name: line, from: 207 V, to: 253 V, at: {load: 100 %}, max: 0.5 %}]"
SWEEP = [adapter(load) for load in (0.0, 0.25, 0.5, 0.75, 1.0)]


def load_outcome(dwells, *, requirement=LOAD, **kwargs):
    limits = limits_from(requirement, **{k: kwargs.pop(k) for k in ("bench", "head") if k in kwargs})
    points = points_from(dwells, limits, **kwargs)
    return check_load_regulation(limits.requirements, points).outcomes[0], limits


def line_outcome(dwells, *, requirement=LINE, **kwargs):
    limits = limits_from(requirement)
    return check_line_regulation(limits.requirements, points_from(dwells, limits, **kwargs)).outcomes[0], limits


@pytest.mark.parametrize(("reference", "volts"), [
    ("full load", 11.92), ("no load", 12.0), ("half load", 11.96), ("nominal", 12.0),
])  # fmt: skip
def test_load_regulation_is_the_spread_over_the_reference_named(reference, volts):
    outcome, _ = load_outcome(SWEEP, requirement=LOAD.replace("relative_to: full load", f"relative_to: {reference}"))

    assert outcome.candidates[0].estimate.nominal == pytest.approx(0.08 / volts, rel=1e-12)


def test_load_regulation_is_a_magnitude():
    rising = [adapter(load, resistance=-0.02) for load in (0.0, 0.5, 1.0)]
    outcome, _ = load_outcome(rising)

    assert outcome.candidates[0].estimate.nominal == pytest.approx(0.08 / 12.08, rel=1e-12)


def test_load_regulation_takes_the_extremes_inside_the_span_not_only_its_ends():
    hump = [adapter(0.0), {**adapter(0.5), "output_voltage main": 12.3}, adapter(1.0)]
    outcome, _ = load_outcome(hump)

    assert outcome.candidates[0].estimate.nominal == pytest.approx((12.3 - 11.92) / 11.92, rel=1e-12)
    assert outcome.candidates[0].used[0].role == "largest, load 50.0 %"


def test_load_regulation_leaves_out_what_lies_above_rated_load():
    outcome, _ = load_outcome([*SWEEP, {**adapter(1.2), "output_voltage main": 6.0}])

    assert outcome.candidates[0].estimate.nominal == pytest.approx(0.08 / 11.92, rel=1e-12)


def test_a_gain_error_cancels_and_only_the_rest_remains():
    """U of the spread: sqrt 2 times the rest of one reading; the 1 % gain of the meter hardly shows."""
    bench = "\ninstruments:\n  output_voltage: {device: M, accuracy: \"1 % reading + 3 mV\"}\n" \
        "  output_current: {device: L, accuracy: \"0.1 % reading\"}\n"  # fmt: skip
    outcome, _ = load_outcome(SWEEP, bench=bench)

    estimate = outcome.candidates[0].estimate
    high, low = 12.0, 11.92
    rest = [math.sqrt(((0.01 * v + 0.003) ** 2 - (0.01 * v) ** 2) / 3) for v in (high, low)]
    # value = (high - low) / low: derivative 1/low to the one, -high/low^2 to the other, gain cancels entirely
    expected = math.hypot(rest[0] / low, rest[1] * high / low**2)
    assert expanded(estimate.value, 0.95).standard == pytest.approx(expected, rel=1e-9)


def test_with_an_automatic_range_nothing_is_shared():
    bench = "\ninstruments:\n  output_voltage: {device: M, accuracy: \"1 % reading\", meter_range: auto}\n" \
        "  output_current: {device: L, accuracy: \"0.1 % reading\"}\n"  # fmt: skip
    outcome, _ = load_outcome(SWEEP, bench=bench)

    u = 0.01 / math.sqrt(3)
    expected = math.sqrt(2) * u * 12.0 / 11.92  # both relative, times high/low
    assert expanded(outcome.candidates[0].estimate.value, 0.95).standard == pytest.approx(expected, rel=1e-9)


def test_both_ends_are_required():
    outcome, limits = load_outcome(SWEEP[1:])

    decided = decide(outcome, limits.decision)
    assert decided.verdict == "not judged"
    assert "no dwell at load 0 %" in decided.reason


def test_any_input_looks_at_each_input_by_itself():
    """The step of the output between inputs is line regulation, and stays out of the load's."""
    low = [adapter(load, vin=207.0, volts=11.9, resistance=0.03) for load in (0.0, 1.0)]
    outcome, limits = load_outcome([*SWEEP, *low], requirement=LOAD.replace("input: 230 V", "input: any"))

    decided = decide(outcome, limits.decision)
    assert len(outcome.candidates) == 2
    assert decided.by.candidate.estimate.nominal == pytest.approx(0.12 / 11.78, rel=1e-12)


def test_half_load_as_reference_must_have_been_run():
    outcome, limits = load_outcome([SWEEP[0], SWEEP[4]], requirement=LOAD.replace("full load", "half load"))

    assert "no dwell at half load" in decide(outcome, limits.decision).reason


def test_line_regulation_is_the_spread_over_the_output_at_rated_input():
    dwells = [adapter(1.0, vin=vin, volts=12 + 0.0005 * (vin - 230)) for vin in (207.0, 230.0, 253.0)]
    outcome, _ = line_outcome(dwells)

    assert outcome.candidates[0].estimate.nominal == pytest.approx(0.023 / 11.92, rel=1e-9)


def test_line_regulation_needs_the_rated_input():
    outcome, limits = line_outcome([adapter(1.0, vin=vin) for vin in (207.0, 253.0)])

    assert "input 230 V" in decide(outcome, limits.decision).reason


def test_line_regulation_of_a_stated_input_is_not_judged():
    rows = [{k: v for k, v in adapter(1.0).items() if k != "input_voltage"}]
    outcome, limits = line_outcome(rows, stated={"input_voltage": 230.0})

    decided = decide(outcome, limits.decision)
    assert decided.verdict == "not judged"
    assert "only stated" in decided.reason


def test_load_regulation_at_a_stated_input_is_judged_and_said():
    rows = [{k: v for k, v in row.items() if k != "input_voltage"} for row in SWEEP]
    outcome, limits = load_outcome(rows, stated={"input_voltage": 230.0})

    assert decide(outcome, limits.decision).verdict == "pass"


def test_other_outputs_are_held_where_the_limits_file_says():
    head = HEAD + "    aux: {voltage: 5 V, current: 1 A}\n"
    requirement = LOAD.replace("at: {input: 230 V}", "at: {input: 230 V, load: {aux: 50 %}}")
    at_half = [{**row, "output_voltage aux": 5.0, "output_current aux": 0.5} for row in SWEEP]
    elsewhere = {**adapter(0.5), "output_voltage main": 11.0, "output_voltage aux": 5.0, "output_current aux": 1.0}
    outcome, _ = load_outcome([*at_half, elsewhere], requirement=requirement, head=head)

    assert outcome.candidates[0].estimate.nominal == pytest.approx(0.08 / 11.92, rel=1e-12)


@given(
    st.lists(st.floats(1.0, 100.0), min_size=2, max_size=9),
    st.floats(0.5, 50.0),
    st.randoms(use_true_random=False),
)
def test_regulation_does_not_depend_on_order_or_scale(volts, scale, random):
    value = regulation([Estimate(v) for v in volts], Estimate(volts[0])).nominal
    mixed = list(volts)
    random.shuffle(mixed)

    again = regulation([Estimate(v * scale) for v in mixed], Estimate(volts[0] * scale)).nominal
    assert value >= 0
    assert again == pytest.approx(value, rel=1e-9, abs=1e-12)


def judged(dwells, requirement, check=check_load_regulation, **kwargs):
    limits = limits_from(requirement)
    points = points_from(dwells, limits, **kwargs)
    outcome = check(limits.requirements, points).outcomes[0]
    return decide(outcome, limits.decision), outcome


def test_equal_readings_are_still_two_readings():
    """24 / 24 V by a meter of 0.1 V: the spread reads zero, and is known to 0.1 sqrt(2/3) V, not to nothing."""
    bench = "\ninstruments:\n  output_voltage: {device: M, accuracy: \"0.1 V\"}\n" \
        "  output_current: {device: L, accuracy: \"0.1 % reading\"}\n"  # fmt: skip
    rows = [{**adapter(load), "output_voltage main": 12.0} for load in (0.0, 1.0)]
    outcome, limits = load_outcome(rows, requirement=LOAD.replace("max: 1 %", "max: 0.1 %"), bench=bench)

    estimate = outcome.candidates[0].estimate
    assert estimate.nominal == 0.0
    assert expanded(estimate.value, 0.95).standard == pytest.approx(0.1 * math.sqrt(2 / 3) / 12, rel=1e-9)
    assert decide(outcome, limits.decision).verdict == "fail"


def test_the_probability_of_a_magnitude_counts_both_sides():
    """A spread of zero within +- 1.975 u: 2 Phi(1.975) - 1 = 0.952, not Phi(1.975)."""
    bench = "\ninstruments:\n  output_voltage: {device: M, accuracy: \"12 mV, k = 2\"}\n" \
        "  output_current: {device: L, accuracy: \"0.1 % reading\"}\n"  # fmt: skip
    limit = 100 * 1.975 * 0.006 * math.sqrt(2) / 12
    rows = [{**adapter(load), "output_voltage main": 12.0} for load in (0.0, 1.0)]
    outcome, limits = load_outcome(rows, requirement=LOAD.replace("max: 1 %", f"max: {limit:.9f} %"), bench=bench)

    decided = decide(outcome, limits.decision)
    assert decided.by.probability == pytest.approx(math.erf(1.975 / math.sqrt(2)), abs=1e-6)
    assert decided.verdict == "fail"


def test_a_mains_that_wanders_through_the_sweep_leaves_it_one_sweep():
    """226.5, 232 and 230 V are one input under any, so that the sagging half-load dwell is in the spread."""
    rows = [adapter(0.0, vin=226.5), {**adapter(0.5, vin=232.0), "output_voltage main": 11.0}, adapter(1.0, vin=230.0)]
    decided, _ = judged(rows, LOAD.replace("input: 230 V", "input: any"))

    assert decided.verdict == "fail"
    assert decided.by.candidate.estimate.nominal == pytest.approx(1.0 / 11.92, rel=1e-12)


def test_part_of_a_sweep_that_exceeds_the_limit_already_fails():
    """At 253 V full load was not run, but no load and half load lie 8 % apart."""
    part = [adapter(0.0, vin=253.0), {**adapter(0.5, vin=253.0), "output_voltage main": 11.0}]
    part_with_reference = LOAD.replace("input: 230 V", "input: any").replace("full load", "nominal")
    decided, _ = judged([*SWEEP, *part], part_with_reference)

    assert decided.verdict == "fail"


def test_part_of_a_sweep_within_the_limit_is_named_and_not_judged():
    decided, outcome = judged([*SWEEP, adapter(1.0, vin=253.0)], LOAD.replace("input: 230 V", "input: any"))

    assert decided.verdict == "pass"
    assert "at input 253 V only part of the span was run" in outcome.deviations[0]


def test_one_dwell_is_not_both_ends():
    # a limits file that asks for this is refused; the check does not rely on it
    limits = limits_from(LINE)
    narrow = limits.requirements[0].model_copy(update={"from_": 229.0, "to": 231.0})
    (outcome,) = check_line_regulation([narrow], points_from([adapter(1.0)], limits)).outcomes

    assert decide(outcome, limits.decision).verdict == "not judged"


def test_rated_input_may_lie_outside_the_span():
    line = LINE.replace("from: 207 V, to: 253 V", "from: 240 V, to: 253 V")
    rows = [adapter(1.0, vin=vin, volts=12 + 0.0005 * (vin - 230)) for vin in (230.0, 240.0, 253.0)]
    decided, _ = judged(rows, line, check_line_regulation)

    assert decided.by.candidate.estimate.nominal == pytest.approx(0.0065 / 11.92, rel=1e-9)


def test_a_dwell_of_unknown_input_keeps_any_from_being_judged():
    rows = [*SWEEP, {**adapter(0.5), "input_voltage": math.nan, "output_voltage main": 9.0}]
    decided, _ = judged(rows, LOAD.replace("input: 230 V", "input: any"))

    assert decided.verdict == "not judged"
    assert "the input voltage is not known" in decided.reason
