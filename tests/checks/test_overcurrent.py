"""Overloads whose truth is known: what is named, where it begins, what flows into a short, how it comes back."""

from __future__ import annotations

import math
from dataclasses import replace

import numpy as np
import pandas as pd
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from acceptance.bench.health import check_health
from acceptance.checks.outcome import CheckResult
from acceptance.checks.overcurrent import check_overcurrent
from acceptance.decision import Decided, decide
from acceptance.judge import find_points
from acceptance.points.propagation import expanded
from tests.checks.built import limits_from
from tests.overcurrent_logs import (
    ACCURATE,
    AMPERES,
    BRANCH,
    HEAD,
    STATIC,
    VOLTS,
    Load,
    Meters,
    Unit,
    built,
    limits_for,
    log_of,
    read,
    run,
)

HICCUP = Unit("hiccup", 4.6, burst=6.0, period=0.5, on=0.15)
LATCH = Unit("latch off", 4.6)
LONG = 240  # samples at 0.05 s after the overload: longer than any retry


def asking(*lines: str, at: str = "input: any") -> str:
    """A requirement that asks for some things."""
    return f"\n  overcurrent:\n    - {{name: ocp, at: {{{at}}}, {', '.join(lines)}}}\n"


def check(frame: pd.DataFrame, requirements: str, *, bench: str = ACCURATE, head: str = HEAD, **log) -> CheckResult:
    """What the whole chain up to the check makes of a log."""
    limits = limits_from(requirements, head=head, bench=bench)
    bench_log = log_of(frame, **log)
    rated = {name: (one.voltage, one.current) for name, one in limits.ratings.outputs.items()}
    doubts = check_health(bench_log, supply="ac", rated_input_voltage=230.0, rated=rated)
    points = find_points(replace(bench_log, doubts=doubts), limits)
    return check_overcurrent(limits.requirements, points)


def judged(frame: pd.DataFrame, *lines: str, at: str = "input: any", **options) -> Decided:
    """The one thing that is asked, decided."""
    result = check(frame, asking(*lines, at=at), **options)
    return decide(result.outcomes[0], limits_for().decision)


def slow(unit: Unit, mode: str = "CR", **options) -> pd.DataFrame:
    """A sweep with time for everything: bursts in each setting, and a long look after the overload."""
    chosen = {"samples": 80, "interval": 0.02, "back": 600} if unit.kind == "hiccup" else {"samples": 10, "back": LONG}
    return built(unit, mode, **{**chosen, **options})


# --- behaviour --------------------------------------------------------------------------------------------------------


@pytest.mark.parametrize("kind", [*STATIC, "hiccup", "latch off"])
@pytest.mark.parametrize("mode", ["CR", "CV"])
def test_behaviour_asked_for_passes(kind, mode):
    decided = judged(slow(Unit(kind, 4.6), mode), f"behaviour: {kind}")

    assert decided.verdict == "pass", decided.reason
    assert decided.by.candidate.text == kind


@pytest.mark.parametrize(("kind", "asked"), [
    ("constant current", "foldback"), ("foldback", "constant current"), ("hiccup", "constant current"),
    ("constant power", "constant current"), ("latch off", "hiccup"), ("constant current", "hiccup"),
])  # fmt: skip
def test_another_behaviour_than_asked_for_fails(kind, asked):
    decided = judged(slow(Unit(kind, 4.6)), f"behaviour: {asked}")

    assert (decided.verdict, decided.by.candidate.text) == ("fail", kind)


@pytest.mark.parametrize("kind", STATIC)
def test_kind_is_not_judged_with_the_load_in_cc_mode(kind):
    decided = judged(slow(Unit(kind, 4.6), "CC"), f"behaviour: {kind}")

    assert decided.verdict == "not judged"
    assert "CR or CV mode" in decided.reason


@pytest.mark.parametrize("unit", [HICCUP, LATCH])
def test_what_is_seen_in_time_is_judged_in_cc_mode(unit):
    assert judged(slow(unit, "CC"), f"behaviour: {unit.kind}").verdict == "pass"


def test_any_behaviour_passes_where_one_is_shown():
    assert judged(slow(Unit("foldback", 4.6)), "behaviour: any").verdict == "pass"


def test_any_behaviour_is_not_judged_where_none_is_shown():
    frame = slow(Unit("foldback", 4.6))
    shallow = frame[frame["load_setting main"] > 2.5].reset_index(drop=True)

    assert judged(shallow, "behaviour: any").verdict == "not judged"


def test_constant_current_that_then_latches_is_mixed():
    decided = judged(slow(Unit("constant current, then latch off", 4.6)), "behaviour: constant current")

    assert (decided.verdict, decided.by.candidate.text) == ("fail", "mixed")
    assert "constant current down to 4" in decided.by.candidate.at
    assert "then latch off" in decided.by.candidate.at


def test_hiccup_tells_its_period_and_duty():
    at = judged(slow(HICCUP), "behaviour: hiccup").by.candidate.at

    assert "every 0.5 s" in at
    assert "on 3" in at  # 30 to 32 % by whole samples


def test_hiccup_sampled_too_slowly_is_not_judged():
    frame = slow(HICCUP, samples=200, interval=0.5 / 4.3)

    decided = judged(frame, "behaviour: hiccup")
    assert decided.verdict == "not judged"
    assert "sample faster" in decided.reason


def test_hiccup_of_two_bursts_is_not_judged():
    frame = read(
        run(
            HICCUP, [Load("CR", 6.0, 50), Load("CR", 3.0, 50), Load("CR", 2.0, 52), Load("CR", 6.0, 100)], interval=0.02
        ),
        Meters(),
        rng=np.random.default_rng(1),
        interval=0.02,
    )

    decided = judged(frame, "behaviour: hiccup")
    assert decided.verdict == "not judged"
    assert "three show a hiccup" in decided.reason


@pytest.mark.parametrize("mode", ["CR", "CV"])
@pytest.mark.parametrize("duty", [0.1, 0.3, 0.6])
def test_bursts_behind_an_averaging_meter_are_no_limiter(mode, duty):
    """Whole periods averaged look like a steady low voltage and current at every setting."""
    unit = replace(HICCUP, period=0.5, on=0.5 * duty)
    frame = slow(unit, mode, settings=30, samples=200, meters=Meters(average=25, noise=1e-4))
    frame = frame.iloc[24::25].reset_index(drop=True)

    assert judged(frame, "behaviour: any").verdict == "not judged"
    if duty < 0.5:
        assert judged(frame, "short_circuit: {max: 100 %}").verdict == "not judged"


def test_switching_by_hand_is_no_hiccup():
    """Three short overloads one after the other, each removed again."""
    unit = Unit("constant current", 4.6)
    loads = [Load("CR", 4.0, 20)] + [Load("CR", setting, 20) for _ in range(5) for setting in (1.0, 4.0)]
    frame = read(run(unit, loads, interval=0.05), Meters(), rng=np.random.default_rng(1), interval=0.05)

    assert judged(frame, "behaviour: hiccup").verdict == "not judged"


def test_levels_that_leave_a_gap_do_not_show_a_kind():
    """Constant down to 60 % of the voltage, and nobody knows what comes then."""
    frame = slow(Unit("constant current", 4.6), settings=30)
    shallow = frame[(frame["load_setting main"] > 0.6 * VOLTS / 4.6) | (frame["load_setting main"] < 0.05)]

    decided = judged(shallow.reset_index(drop=True), "behaviour: constant current")
    assert decided.verdict == "not judged"
    assert "nothing was measured between" in decided.reason


def test_five_levels_are_asked_for():
    decided = judged(slow(Unit("foldback", 4.6), settings=6), "behaviour: foldback")

    assert decided.verdict == "not judged"
    assert "five show" in decided.reason


def test_unknown_load_mode_with_a_fast_collapse_shows_no_kind():
    """A CC load discharges the capacitors at its own current: that looks like a limiter while the voltage falls."""
    falling = np.linspace(11.5, 0.0, 40)
    volts = np.concatenate((np.full(100, 11.98), falling, np.zeros(60)))
    amperes = np.concatenate((np.linspace(1.0, 4.8, 100), np.full(40, 4.8), np.full(60, 1.5)))
    noise = np.random.default_rng(2).normal(0, 0.003, volts.size)
    frame = pd.DataFrame({"time": 1e-3 * np.arange(200), "input_voltage": 230.0})
    frame["output_voltage main"], frame["output_current main"] = volts + noise, amperes + noise

    decided = judged(frame, "behaviour: constant current")
    assert decided.verdict == "not judged"
    assert "load_mode" in decided.reason


# --- latch off --------------------------------------------------------------------------------------------------------


def latched(*, source_off: bool, down: int, back: bool = False) -> pd.DataFrame:
    """A latch in CC mode, the overload removed for `down` samples, then the source cycled, or not."""
    loads = [Load("CC", 4.0, 20), Load("CC", 4.4, 20), Load("CC", 4.8, 20), Load("CC", 3.0, down)]
    frame = read(run(LATCH, loads, interval=0.05), Meters(noise=1e-4), rng=np.random.default_rng(1), interval=0.05)
    after = frame.iloc[[20] * 30].copy()
    after["load_setting main"] = 3.0
    after["time"] = frame["time"].iloc[-1] + 0.05 * np.arange(1, 31)
    off = after.iloc[:10].copy()
    off["input_voltage"], off["output_voltage main"], off["output_current main"] = 0.1, 0.0, 0.0
    parts = [frame, *([off] if source_off else []), *([after.iloc[10:]] if source_off or back else [])]
    return pd.concat(parts, ignore_index=True)


def test_latch_off_is_shown_by_cycling_the_source():
    decided = judged(latched(source_off=True, down=100), "behaviour: latch off")

    assert decided.verdict == "pass", decided.reason
    assert "until the source was cycled" in decided.by.candidate.at


def test_latch_off_is_not_judged_where_the_log_ends_soon():
    decided = judged(latched(source_off=False, down=20), "behaviour: latch off")

    assert decided.verdict == "not judged"
    assert "slow retry is not ruled out" in decided.reason


def test_output_back_by_itself_is_no_latch():
    decided = judged(latched(source_off=False, down=40, back=True), "behaviour: latch off")

    assert decided.verdict == "not judged"
    assert "came back by itself" in decided.reason


def test_zero_output_under_overload_alone_is_not_judged():
    frame = slow(LATCH)
    under = frame[frame["time"] < frame["time"].iloc[-LONG - 1]].reset_index(drop=True)

    decided = judged(under, "behaviour: latch off")
    assert decided.verdict == "not judged"
    assert "was not removed" in decided.reason


# --- onset ------------------------------------------------------------------------------------------------------------


@pytest.mark.parametrize("kind", [*STATIC, "hiccup", "latch off"])
@pytest.mark.parametrize("mode", ["CC", "CR", "CV"])
def test_onset_is_where_it_truly_is(kind, mode):
    unit = Unit(kind, 4.6)
    candidate = judged(slow(unit, mode, settings=30), "onset: [105 %, 130 %]").by.candidate

    u = expanded(candidate.estimate.value, 0.95).expanded
    assert abs(candidate.estimate.nominal - unit.true_onset(mode)) <= u
    assert mode == "CV" or u < 0.05 * AMPERES


def test_onset_of_a_trip_lies_in_the_middle_of_its_steps():
    """Carried 4.4 A, gave way at 4.8 A: 4.6 A, within 0.4 A/sqrt(12)."""
    bench = ACCURATE.replace("0.2 % reading + 4 mA", "0.0001 % reading")
    candidate = judged(latched(source_off=True, down=20), "onset: [105 %, 130 %]", bench=bench).by.candidate

    assert candidate.estimate.nominal == pytest.approx(4.6, abs=2e-3)
    assert expanded(candidate.estimate.value, 0.95).standard == pytest.approx(0.4 / math.sqrt(12), rel=0.01)


def test_onset_not_reached_is_not_judged_and_says_how_far_it_was_driven():
    frame = slow(Unit("constant current", 5.0)).iloc[:-LONG]
    mild = frame[frame["load_setting main"] > VOLTS / 4.4].reset_index(drop=True)

    decided = judged(mild, "onset: [105 %, 130 %]")
    assert decided.verdict == "not judged"
    assert "drive it further" in decided.reason


def test_window_passed_without_limiting_fails():
    """Driven to 160 % of rated current and still on the branch: the onset lies above the window whatever it is."""
    frame = slow(Unit("constant current", 7.0), "CC", samples=20).iloc[:-LONG]
    held = frame[frame["load_setting main"] < 6.5].reset_index(drop=True)

    decided = judged(held, "onset: [105 %, 130 %]")
    assert decided.verdict == "fail"
    assert "at least" in decided.reason


def test_load_that_limits_by_itself_is_no_onset():
    """The load's own limit holds 5.6 A whatever is set, and the output stays regulated: nothing gave way."""
    settings_ = np.repeat(np.arange(1.0, 8.0, 0.5), 10)
    amperes = np.minimum(settings_, 5.6)
    noise = np.random.default_rng(3).normal(0, 0.002, amperes.size)
    frame = pd.DataFrame({"time": 0.1 * np.arange(amperes.size), "input_voltage": 230.0})
    frame["output_voltage main"] = BRANCH[0] - BRANCH[1] * amperes + noise
    frame["output_current main"] = amperes + noise[::-1]
    frame["load_setting main"], frame["load_mode main"] = settings_, pd.Categorical(["CC"] * len(frame))

    assert judged(frame, "onset: [105 %, 150 %]").verdict == "not judged"
    assert judged(frame, "behaviour: constant current").verdict == "not judged"
    assert judged(frame, "short_circuit: {max: 150 %}").verdict == "not judged"


def test_sweep_that_begins_beyond_the_onset_is_known_from_one_side():
    frame = slow(Unit("constant current", 4.6))
    branch = frame[frame["load_setting main"] >= 3.0].assign(stage="steady", table=0)
    limited = frame[frame["load_setting main"] < 2.4].assign(stage="overcurrent", table=1)
    both = pd.concat([branch, limited], ignore_index=True)

    decided = judged(both, "onset: [105 %, 130 %]", stages_from="file name")
    assert decided.verdict == "not judged"
    assert "begin the sweep at rated current or below" in decided.reason


@pytest.mark.parametrize("kind", ["constant current", "foldback"])
def test_single_slip_of_the_meter_is_no_onset(kind):
    unit = Unit(kind, 4.6)
    frame = slow(unit, samples=1, settings=30)
    frame.loc[2, "output_voltage main"] = 8.0

    candidate = judged(frame, "onset: [105 %, 130 %]").by.candidate
    assert abs(candidate.estimate.nominal - unit.true_onset("CR")) <= expanded(candidate.estimate.value, 0.95).expanded


def test_limiter_below_rated_current_fails():
    decided = judged(slow(Unit("constant current", 3.4)), "onset: [105 %, 130 %]")

    assert decided.verdict == "fail"
    assert decided.by.candidate.estimate.nominal == pytest.approx(3.4, abs=0.1)


def test_lead_drop_is_put_back():
    """Behind 0.2 ohm the voltage at the load falls by the droop long before the output limits."""
    unit = Unit("constant current", 4.6)
    frame = slow(unit, settings=30, meters=Meters(lead=0.2))
    frame = frame[frame["load_setting main"] > 0].reset_index(drop=True)  # no load goes below its leads

    candidate = judged(
        frame, "onset: [105 %, 130 %]", bench=ACCURATE + "lead_resistance: {output: 200 mohm ± 1 mohm}\n"
    ).by.candidate
    assert abs(candidate.estimate.nominal - 4.6) <= expanded(candidate.estimate.value, 0.95).expanded


# --- short circuit ----------------------------------------------------------------------------------------------------


def test_current_into_a_short_is_the_mean_below_5_percent():
    decided = judged(slow(Unit("foldback", 4.6, short=1.6)), "short_circuit: {max: 50 %}")

    truth = 1.6 / (1 - 3.0 / BRANCH[0] * 0.02)  # on I = 1.6 + (3.0/12.05) V, at 0.02 ohm
    assert decided.verdict == "pass"
    assert decided.by.candidate.estimate.nominal == pytest.approx(truth, abs=2e-3)


def test_current_into_a_short_is_the_peak_of_bursts():
    decided = judged(slow(HICCUP), "short_circuit: {max: 140 %}")

    assert decided.verdict == "fail"  # 6 A of 5.6 A, although the mean is a third of that
    assert decided.by.candidate.estimate.nominal == pytest.approx(6.0, abs=2e-3)


def test_nothing_below_5_percent_is_not_judged():
    frame = slow(Unit("constant current", 4.6))
    decided = judged(frame[frame["load_setting main"] > 0.5].reset_index(drop=True), "short_circuit: {max: 130 %}")

    assert decided.verdict == "not judged"
    assert "short the output" in decided.reason


def test_current_that_the_load_holds_is_only_the_least():
    """At 0 V a CC load holds what it was set to: the unit may give more."""
    frame = slow(Unit("constant current", 4.6), "CC")
    collapsed = (frame["output_voltage main"] < 0.5) & (frame["load_setting main"] > 4.5)
    frame.loc[collapsed, "output_current main"] = frame.loc[collapsed, "load_setting main"]

    assert judged(frame, "short_circuit: {max: 200 %}").verdict == "not judged"


# --- recovery ---------------------------------------------------------------------------------------------------------


def test_recovery_is_the_upper_end_of_its_bracket():
    """V = V0 - (V0 - Vd) exp(-t/tau): in the band of 3 % after tau ln((V0 - Vd)/(V0 - 11.64 V))."""
    unit, interval, tau = Unit("constant current", 4.6), 0.01, 0.1
    loads = [Load("CR", 4.0, 20), Load("CR", 3.0, 20), Load("CR", 0.5, 20), Load("CR", 3.75, 200)]
    log = run(unit, loads, interval=interval, rise=tau)
    frame = read(log, Meters(), rng=np.random.default_rng(1), interval=interval)
    ends = BRANCH[0] * 3.75 / (3.75 + BRANCH[1])
    down = log.volts[59]
    truth = tau * math.log((ends - down) / (ends - 0.97 * VOLTS))

    decided = judged(frame, "recovery: {within: 1 s, band: 3 %}")
    assert decided.verdict == "pass"
    assert truth <= decided.by.candidate.estimate.nominal <= truth + 2 * interval


def test_no_recovery_fails_where_the_log_is_long_enough():
    decided = judged(slow(LATCH), "recovery: {within: 2 s, band: 3 %}")

    assert decided.verdict == "fail"
    assert "at least" in decided.reason


def test_no_recovery_is_not_judged_where_the_log_ends_soon():
    decided = judged(slow(LATCH, back=20), "recovery: {within: 2 s, band: 3 %}")

    assert decided.verdict == "not judged"
    assert "record for longer" in decided.reason


def test_recovery_sampled_more_slowly_than_asked_for_is_not_judged():
    decided = judged(slow(Unit("constant current", 4.6), interval=0.5), "recovery: {within: 100 ms, band: 3 %}")

    assert decided.verdict == "not judged"
    assert "sample faster" in decided.reason


def test_recovery_that_the_samples_leave_open_is_not_judged():
    """Within one interval, or within two: 0.5 s of 0.6 s."""
    decided = judged(slow(Unit("constant current", 4.6), interval=0.5), "recovery: {within: 0.4 s, band: 3 %}")

    assert decided.verdict == "not judged"


def test_recovery_without_an_accuracy_of_the_voltage_is_not_judged():
    """Nobody knows when a voltage of unknown error was in the band."""
    bench = 'instruments:\n  output_current: {device: L1, accuracy: "0.2 % reading + 4 mA"}\n'

    decided = judged(slow(Unit("constant current", 4.6)), "recovery: {within: 3 s, band: 3 %}", bench=f"\n{bench}")

    assert decided.verdict == "not judged"
    assert "output_voltage main" in decided.reason


@pytest.mark.parametrize(("beyond", "verdict"), [(0.005, "not judged"), (0.05, "pass")])
def test_recovery_to_the_edge_of_the_band_is_not_judged(beyond, verdict):
    """The voltage is known to 18 mV as a bound, 20 mV as U: 5 mV inside the edge shows nothing."""
    frame = slow(Unit("constant current", 4.6))
    off = abs(float(frame["output_voltage main"].iloc[-20:].mean()) - VOLTS)

    decided = judged(frame, f"recovery: {{within: 3 s, band: {100 * (off + beyond) / VOLTS:.4f} %}}")

    assert decided.verdict == verdict


def test_overload_that_is_not_removed_has_no_recovery():
    frame = slow(Unit("constant current", 4.6))
    decided = judged(frame.iloc[:-LONG], "recovery: {within: 2 s, band: 3 %}")

    assert decided.verdict == "not judged"
    assert "not removed" in decided.reason


@pytest.mark.parametrize("column", ["time", "load_setting main"])
def test_recovery_without_time_or_setting_is_not_judged(column):
    frame = slow(Unit("constant current", 4.6), "CV").drop(columns=[column])

    assert judged(frame, "recovery: {within: 2 s, band: 3 %}").verdict == "not judged"


# --- meters -----------------------------------------------------------------------------------------------------------

EVERYTHING = ("behaviour: any", "onset: [105 %, 130 %]", "short_circuit: {max: 150 %}")


@pytest.mark.parametrize("mode", ["CR", "CV"])
@pytest.mark.parametrize("noise", [0.0, 1e-3, 5e-3])
def test_clipped_current_is_no_constant_current(mode, noise):
    """A unit that gives more and more, read by a meter whose range ends at 5 A."""
    frame = slow(Unit("constant power", 4.6), mode, meters=Meters(noise=noise))
    frame["output_current main"] = np.minimum(frame["output_current main"], 5.0)

    assert [judged(frame, line).verdict for line in EVERYTHING] == ["not judged"] * 3


def test_bursts_at_the_end_of_the_stated_range_are_not_judged():
    frame = slow(HICCUP, "CV")
    frame["output_current main"] = np.minimum(frame["output_current main"], 5.0)
    bench = ACCURATE.replace('+ 4 mA"', '+ 4 mA", meter_range: 5 A')

    decided = judged(frame, "short_circuit: {max: 150 %}", bench=bench)
    assert decided.verdict == "not judged"
    assert "range ends" in decided.reason


@pytest.mark.parametrize("from_", [30, 150])
def test_frozen_voltage_is_not_judged(from_):
    frame = slow(Unit("constant current", 4.6), meters=Meters(noise=1e-4))
    frame.loc[from_:, "output_voltage main"] = frame.loc[from_, "output_voltage main"]

    assert [judged(frame, line).verdict for line in EVERYTHING] == ["not judged"] * 3


def test_stiff_output_read_by_hand_is_no_frozen_meter():
    """A bench supply that reads 12.000 V at every load, until it limits."""
    amperes = [0.5, 1, 2, 3, 4, 4.2, 4.4, 4.6, 4.61, 4.6, 4.61, 4.59, 4.6, 4.61, 4.6, 3.0]
    volts = [12.0] * 8 + [10.5, 9.0, 7.0, 5.0, 3.0, 1.5, 0.1, 12.0]
    frame = pd.DataFrame({"output_voltage main": volts, "output_current main": amperes, "input_voltage": 230.0})

    assert judged(frame, "behaviour: constant current").verdict == "pass"
    assert judged(frame, "onset: [105 %, 130 %]").verdict == "pass"


def test_negative_current_is_not_judged():
    frame = slow(Unit("constant current", 4.6))
    frame["output_current main"] *= -1

    decided = judged(frame, "behaviour: any")
    assert decided.verdict == "not judged"
    assert "below zero" in decided.reason


@pytest.mark.parametrize("unit", [HICCUP, LATCH, Unit("foldback", 4.6, short=0.8), Unit("constant current", 4.6)])
@pytest.mark.parametrize("mode", ["CC", "CR", "CV"])
def test_honest_overload_has_no_barring_doubt(unit, mode):
    log = log_of(slow(unit, mode))
    doubts = check_health(log, supply="ac", rated_input_voltage=230.0, rated={"main": (VOLTS, AMPERES)})
    points = find_points(replace(log, doubts=doubts), limits_for())

    assert [doubt for doubt in points.log.doubts if doubt.bars] == []


# --- stages, inputs, outputs ------------------------------------------------------------------------------------------


def test_log_without_stages_is_looked_at_whole():
    frame = slow(Unit("constant current", 4.6))

    decided = judged(frame, "behaviour: constant current", stage="steady", stages_from="none told")
    assert decided.verdict == "pass", decided.reason


def test_steady_stage_is_no_overload():
    frame = slow(Unit("constant current", 4.6))

    decided = judged(frame, "behaviour: any", stage="steady", stages_from="file name")
    assert decided.verdict == "not judged"
    assert "record it as stage overcurrent" in decided.reason


def test_least_favourable_of_several_sweeps_decides():
    good = slow(Unit("constant current", 4.6)).assign(table=0)
    early = slow(Unit("constant current", 4.05)).assign(table=1, input_voltage=207.0)

    result = check(pd.concat([good, early], ignore_index=True), asking("onset: [105 %, 130 %]"))
    decided = decide(result.outcomes[0], limits_for().decision)
    assert decided.verdict == "fail"
    assert len(decided.others) == 1
    assert "input 207 V" in decided.by.candidate.at


def test_input_that_was_not_run_names_the_nearest():
    decided = judged(slow(LATCH), "behaviour: any", at="input: 253 V")

    assert decided.verdict == "not judged"
    assert "nearest was run at input 230 V" in decided.reason


def test_two_sweeps_in_one_stretch_are_two_candidates():
    unit = Unit("constant current", 4.6)
    one = slow(unit, back=60)
    two = one.assign(time=one["time"] + one["time"].iloc[-1] + 0.05)

    result = check(pd.concat([one, two], ignore_index=True), asking("onset: [105 %, 130 %]"))
    found = [candidate.estimate.nominal for candidate in result.outcomes[0].candidates]
    assert found == pytest.approx([4.6, 4.6], abs=0.02)


# --- figures ----------------------------------------------------------------------------------------------------------


def test_figures_stay_small_whatever_the_length():
    frame = slow(HICCUP, samples=4000, meters=Meters(noise=5e-3))
    result = check(frame, asking(*EVERYTHING, "recovery: {within: 2 s, band: 3 %}"))

    sizes = {figure.name: sum(len(series.x) for series in figure.series) for figure in result.figures}
    assert set(sizes) == {"overcurrent main", "overcurrent voltage main", "overcurrent current main"}
    assert max(sizes.values()) <= 1500


def test_figures_mark_onset_short_and_return():
    result = check(slow(HICCUP), asking(*EVERYTHING, "recovery: {within: 2 s, band: 3 %}"))
    plane, volts, _ = result.figures

    assert {mark.label for mark in plane.marks} == {"onset", "short circuit"}
    assert {region.label for region in plane.regions} == {"ocp.onset", "ocp.short_circuit"}
    assert {mark.label for mark in volts.marks} == {"overload removed", "back in the band"}


# --- properties -------------------------------------------------------------------------------------------------------


def scaled_head(volts: float, amperes: float) -> str:
    return HEAD.replace("12 V", f"{VOLTS * volts:.9g} V").replace("current: 4 A", f"current: {AMPERES * amperes:.9g} A")


@settings(deadline=None, max_examples=15)
@given(st.sampled_from([*STATIC, "hiccup"]), st.floats(0.1, 30), st.floats(0.05, 50))
def test_scale_changes_nothing_but_the_scale(kind, volts, amperes):
    frame = slow(Unit(kind, 4.6), settings=16)
    meter = '{device: M, accuracy: "0.1 % reading"}'
    bench = f"instruments: {{output_voltage: {meter}, output_current: {meter}}}"
    lines = ("behaviour: any", "onset: [105 %, 130 %]", "short_circuit: {max: 160 %}")
    larger = frame.assign(**{
        "output_voltage main": frame["output_voltage main"] * volts,
        "output_current main": frame["output_current main"] * amperes,
        "load_setting main": frame["load_setting main"] * volts / amperes,
    })  # fmt: skip

    plain = check(frame, asking(*lines), bench=bench).outcomes
    scaled = check(larger, asking(*lines), bench=bench, head=scaled_head(volts, amperes)).outcomes

    assert plain[0].candidates[0].text == scaled[0].candidates[0].text == kind
    onsets = [outcomes[1].candidates[0].estimate.nominal for outcomes in (plain, scaled)]
    assert onsets[1] == pytest.approx(onsets[0] * amperes, rel=2e-3)


@settings(deadline=None, max_examples=15)
@given(st.randoms(use_true_random=False))
def test_order_of_the_regulated_branch_does_not_matter(random):
    frame = slow(Unit("foldback", 4.6), samples=1, back=1).drop(columns=["time"])
    order = list(range(4))
    random.shuffle(order)
    shuffled = frame.iloc[[*order, *range(4, len(frame))]].reset_index(drop=True)

    plain, other = (judged(one, "onset: [105 %, 130 %]").by.candidate.estimate.nominal for one in (frame, shuffled))
    assert other == pytest.approx(plain, rel=1e-9)


READING = st.one_of(
    st.floats(-20, 20), st.sampled_from([0.0, math.nan, math.inf, -math.inf, 1e30, -1e30, 12.0, 4.0, 1e-300])
)
COLUMNS = ("time", "input_voltage", "output_voltage main", "output_current main", "load_setting main")


@st.composite
def junk(draw) -> pd.DataFrame:
    """Any columns of anything, or an honest sweep of which one column is spoilt."""
    keys = draw(st.lists(st.sampled_from(COLUMNS), min_size=1, unique=True))
    if draw(st.booleans()):
        n = draw(st.integers(1, 30))
        frame = pd.DataFrame({key: draw(st.lists(READING, min_size=n, max_size=n)) for key in keys})
    else:
        unit = Unit(draw(st.sampled_from([*STATIC, "hiccup", "latch off"])), draw(st.floats(0.5, 8.0)))
        frame = built(unit, draw(st.sampled_from(["CC", "CR", "CV"])), samples=draw(st.integers(1, 4)), back=5)
        constant = draw(READING)
        rows = draw(st.integers(0, len(frame)))
        for key in keys:
            frame.loc[rows:, key] = constant
    if draw(st.booleans()) and "load_setting main" in frame:
        frame["load_mode main"] = pd.Categorical([draw(st.sampled_from(["CC", "CR", "CV", "CP", "odd"]))] * len(frame))
    return frame


@settings(deadline=None, max_examples=120)
@given(junk())
@pytest.mark.filterwarnings("ignore::RuntimeWarning")
def test_junk_ends_in_a_reason(frame):
    result = check(frame, asking(*EVERYTHING, "recovery: {within: 2 s, band: 3 %}"))

    for outcome in result.outcomes:
        decided = decide(outcome, limits_for().decision)
        assert decided.verdict in ("pass", "fail", "not judged")
        assert decided.reason or decided.verdict == "pass"


@pytest.mark.parametrize("missing", ["output_voltage main", "output_current main"])
def test_overload_without_a_channel_says_which(missing):
    decided = judged(slow(LATCH).drop(columns=[missing]), "behaviour: any")

    assert decided.verdict == "not judged"
    assert f"{missing} was not logged" in decided.reason


@pytest.mark.parametrize("value", [0.0, 12.0])
def test_one_sample_or_only_one_value_is_not_judged(value):
    frame = pd.DataFrame({key: [value] * 30 for key in COLUMNS})
    frame["time"] = np.arange(30.0)

    for part in (frame, frame.iloc[:1]):
        assert [judged(part, line).verdict for line in EVERYTHING] == ["not judged"] * 3
