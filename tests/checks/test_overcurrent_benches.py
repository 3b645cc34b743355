"""Overloads as benches really log them: by hand, slowly, behind averaging meters, with the load switched off."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pandas as pd
import pytest

from acceptance.points.propagation import expanded
from tests.checks.test_overcurrent import HICCUP, LATCH, judged, slow
from tests.overcurrent_logs import ACCURATE, AMPERES, BRANCH, DROOP, VOLTS, Load, Meters, Unit, built, read, run

VOLTAGE, CURRENT, SETTING, MODE = ("output_voltage main", "output_current main", "load_setting main", "load_mode main")
CONSTANT = Unit("constant current", 4.6)


def recorded(unit: Unit, *loads: Load, interval: float = 0.02, noise: float = 0.0) -> pd.DataFrame:
    """Some settings one after the other, the last one the return."""
    meters = Meters(noise=noise)
    return read(run(unit, loads, interval=interval), meters, rng=np.random.default_rng(1), interval=interval)


def by_hand(unit: Unit, mode: str, *, average: int = 1, row: int = -1, settings: int = 20, **options) -> pd.DataFrame:
    """One row a setting, without a time: sample `row` of each, of a meter that averages."""
    frame = slow(unit, mode, settings=settings, meters=Meters(average=average, **options))
    change = frame[SETTING].ne(frame[SETTING].shift()).cumsum()
    rows = [part.index[row] for _, part in frame.groupby(change)]
    return frame.loc[rows].drop(columns="time").reset_index(drop=True)


def inside(candidate, truth: float) -> bool:
    """Whether the value agrees with the truth, within its uncertainty."""
    return abs(candidate.estimate.nominal - truth) <= expanded(candidate.estimate.value, 0.95).expanded


# --- bursts that the readings hide ------------------------------------------------------------------------------------


@pytest.mark.parametrize("mode", ["CC", "CR", "CV"])
def test_mean_of_bursts_read_by_hand_is_no_current_into_a_short(mode):
    """The mean, 1.8 A, meets the limit that the bursts of 6 A exceed."""
    decided = judged(by_hand(HICCUP, mode, average=25), "short_circuit: {max: 100 %}")

    assert decided.verdict == "not judged"


@pytest.mark.parametrize("mode", ["CR", "CV"])
def test_pauses_between_bursts_are_no_current_into_a_short(mode):
    """One reading a second, each in a pause of the bursts, until the overload is gone."""
    frame = slow(replace(HICCUP, period=0.5), mode, samples=100, interval=0.02)
    off = frame.iloc[::50].reset_index(drop=True)  # 1 s, two periods
    asked = off[CURRENT].where(off[CURRENT] < AMPERES * 1.1, 0.0)  # what a burst shows by chance is taken out, too
    off[VOLTAGE], off[CURRENT] = off[VOLTAGE].where(asked > 0, 0.0), asked

    decided = judged(off, "short_circuit: {max: 100 %}")
    assert decided.verdict == "not judged"


@pytest.mark.parametrize("mode", ["CC", "CR", "CV"])
@pytest.mark.parametrize("duty", [0.1, 0.3])
def test_onset_before_averaged_bursts_is_right_or_not_judged(mode, duty):
    unit = replace(HICCUP, on=0.5 * duty)
    decided = judged(by_hand(unit, mode, average=25), "onset: [100 %, 150 %]")

    assert decided.verdict in ("pass", "not judged"), decided.reason
    assert decided.verdict == "not judged" or inside(decided.by.candidate, unit.onset)


def test_foldback_that_bursts_at_low_voltage_is_not_named_behind_an_averaging_meter():
    """Below a fourth of the voltage the meters show a fourth of what flows."""
    frame = slow(Unit("foldback", 4.6, short=2.4), settings=30)
    low = (frame[VOLTAGE] < 0.25 * VOLTS) & (frame[SETTING] < 3)
    frame.loc[low, [VOLTAGE, CURRENT]] *= 0.25

    for asked in ("behaviour: foldback", "short_circuit: {max: 60 %}"):
        decided = judged(frame, asked)
        assert decided.verdict == "not judged", asked
    assert "breaks off" in judged(frame, "behaviour: any").reason


@pytest.mark.parametrize("mode", ["CC", "CV"])
def test_onset_of_bursts_that_single_readings_caught_is_not_judged(mode):
    """Trips at 4.6 A; two readings beyond it fell into bursts, which look like the branch, and others did not."""
    frame = by_hand(replace(HICCUP, on=0.25), mode, row=5, settings=16)
    beyond = frame.index[(frame[SETTING].diff().abs() > 0) & (frame[CURRENT] < 0.1)]
    assert beyond.size > 4  # pauses, as read
    caught = beyond[:2]
    frame.loc[caught, CURRENT] = frame.loc[beyond[0] - 1, CURRENT] + np.array([0.5, 1.0])
    frame.loc[caught, VOLTAGE] = BRANCH[0] - BRANCH[1] * frame.loc[caught, CURRENT]
    frame.loc[beyond[3], [VOLTAGE, CURRENT]] = 6.0, 5.0

    decided = judged(frame, "onset: [105 %, 200 %]")
    assert decided.verdict == "not judged"
    assert "single readings" in decided.reason


def test_limiter_that_gave_nothing_at_a_setting_is_not_named():
    """Bursts that single readings caught nine times of ten."""
    frame = by_hand(CONSTANT, "CV")
    missed = frame.index[(frame[VOLTAGE] < 0.5 * VOLTS) & (frame[VOLTAGE] > 0.3 * VOLTS)][-1]
    frame.loc[missed, [VOLTAGE, CURRENT]] = 0.0

    decided = judged(frame, "behaviour: constant current")
    assert decided.verdict == "not judged"


def test_current_that_swings_within_one_setting_is_no_limiter():
    """A meter that averages over less than two periods: the readings of one setting differ."""
    frame = slow(Unit("foldback", 4.6), settings=30)
    swings = np.where(np.arange(len(frame)) % 2 == 0, 1.15, 0.85)
    deep = (frame[VOLTAGE] < 0.4 * VOLTS) & (frame[SETTING] < 3)
    frame.loc[deep, CURRENT] *= swings[deep]
    frame.loc[deep, VOLTAGE] *= swings[deep]

    decided = judged(frame, "behaviour: foldback")
    assert decided.verdict == "not judged"
    assert "swings between" in decided.reason


def test_bursts_sampled_too_slowly_show_no_peak():
    frame = slow(HICCUP, settings=10, samples=400, interval=0.02).iloc[::5].reset_index(drop=True)  # 5 a period

    assert judged(frame, "short_circuit: {max: 200 %}").verdict == "not judged"


def test_peak_of_a_burst_that_rises_to_its_end_covers_what_lies_between_readings():
    """Bursts of 10 readings that rise by 0.6 A a reading: the peak is up to one step above the last one."""
    frame = recorded(
        replace(HICCUP, period=0.5, on=0.2), Load("CR", 4.0, 50), Load("CR", 0.02, 300), Load("CR", 4.0, 99)
    )
    short = (frame[SETTING] == 0.02) & (frame[CURRENT] > 1)
    place = short.groupby((~short).cumsum()).cumsum()
    frame.loc[short, CURRENT] = 0.6 * place[short]
    frame.loc[short, VOLTAGE] = 0.02 * frame.loc[short, CURRENT]
    largest = float(frame.loc[short, CURRENT].max())

    decided = judged(frame, "short_circuit: {max: 400 %}")
    assert decided.verdict == "not judged" or inside(decided.by.candidate, largest + 0.6)


# --- what a bench does ------------------------------------------------------------------------------------------------


@pytest.mark.parametrize("unit", [CONSTANT, HICCUP])
def test_straight_from_rated_load_into_a_short_fails_no_onset(unit):
    """Between 4 A and what 20 milliohm ask for lies every onset."""
    frame = recorded(unit, Load("CR", 3.0, 50), Load("CR", 0.02, 250), Load("CR", 3.0, 150))

    decided = judged(frame, "onset: [105 %, 130 %]")
    assert decided.verdict == "not judged"
    assert "steps about" in decided.reason
    assert judged(frame, "short_circuit: {max: 160 %}").verdict == "pass"
    assert judged(frame, "recovery: {within: 2 s, band: 3 %}").verdict == "pass"


@pytest.mark.parametrize("blank", [True, False])
@pytest.mark.parametrize("unit", [CONSTANT, HICCUP])
def test_load_switched_off_ends_the_overload(unit, blank):
    """Its setting is blank then, or still says what it was."""
    frame = slow(unit)
    back = frame.index[-600 if unit is HICCUP else -240 :]
    frame.loc[back, CURRENT] = 0.0
    frame.loc[back, SETTING] = np.nan if blank else 0.02
    up = back[frame.loc[back, VOLTAGE] > 0.97 * VOLTS][0]
    drew = frame.index[frame[CURRENT] > 0.2][-1]

    decided = judged(frame, f"behaviour: {unit.kind}")
    assert decided.verdict == "pass", decided.reason
    returned = judged(frame, "recovery: {within: 2 s, band: 3 %}")
    assert returned.verdict == "pass", returned.reason
    longest = frame["time"][up] - frame["time"][drew]  # from the last moment at which it surely drew
    assert returned.by.candidate.estimate.nominal == pytest.approx(longest, abs=1e-6)


def test_latch_written_down_by_hand_is_shown_by_rows_and_a_cycled_source():
    frame = by_hand(LATCH, "CR")
    down, off = frame.iloc[[-1]], frame.iloc[[-1]].assign(input_voltage=0.2)
    up = frame.iloc[[0]]

    def decided(rows: int) -> str:
        log = pd.concat([frame.iloc[:-1], *[down] * rows, off, up], ignore_index=True)
        return judged(log, "behaviour: latch off").verdict

    assert (decided(1), decided(3)) == ("not judged", "pass")


def test_source_cycled_at_once_shows_no_latch():
    """A retry every 4 s looks the same for 2 s."""
    frame = recorded(LATCH, Load("CR", 4.0, 50), Load("CR", 1.0, 50), Load("CR", 4.0, 50), interval=0.02)
    off = frame.iloc[-10:].assign(input_voltage=0.1)
    on = frame.iloc[:50]
    log = pd.concat([frame, off, on], ignore_index=True)
    log["time"] = 0.02 * np.arange(len(log))

    decided = judged(log, "behaviour: latch off")
    assert decided.verdict == "not judged"
    assert "wait 10 s" in decided.reason


# --- readings ---------------------------------------------------------------------------------------------------------


@pytest.mark.parametrize("kind", ["constant current", "constant power", "foldback"])
@pytest.mark.parametrize("mode", ["CR", "CV"])
@pytest.mark.parametrize("noise", [0.0, 1e-3])
def test_sweep_by_hand_is_judged_like_a_logged_one(kind, mode, noise):
    """One reading a setting has no scatter of its own, and what the settings change is none."""
    unit = Unit(kind, 4.6)
    frame = by_hand(unit, mode, settings=24, noise=noise)

    assert judged(frame, f"behaviour: {kind}").verdict == "pass"
    candidate = judged(frame, "onset: [100 %, 150 %]").by.candidate
    assert inside(candidate, unit.true_onset(mode))
    assert expanded(candidate.estimate.value, 0.95).expanded < 0.1 * AMPERES


def test_coarse_volts_into_a_short_contradict_no_current():
    """0.03 V reads as 0.0 V, and the last digit is 5 A through 20 milliohm."""
    unit = Unit("foldback", 4.6, short=1.6)
    frame = slow(unit, settings=30, meters=Meters(digits=(0.1, 0.01)))
    bench = ACCURATE.replace('6 mV"', '6 mV", resolution: 100 mV')

    decided = judged(frame, "short_circuit: {max: 60 %}", bench=bench)
    assert decided.verdict == "pass", decided.reason
    assert inside(decided.by.candidate, 1.6 / (1 - 3.0 / BRANCH[0] * 0.02))


def test_limit_that_sinks_as_it_warms_is_covered_where_it_was_met_cold():
    """From the first setting below the droop on, the current falls by 2 % with a time constant of 10 s."""
    frame = slow(CONSTANT, "CV", settings=20, samples=50, interval=0.1)
    limited = (frame[VOLTAGE] < BRANCH[0] - BRANCH[1] * 4.6 - DROOP) & (frame[CURRENT] > 4.2)
    hot = 0.1 * np.cumsum(limited) / 10.0
    frame.loc[limited, CURRENT] *= (1 - 0.02 * (1 - np.exp(-hot)))[limited]

    candidate = judged(frame, "onset: [105 %, 130 %]").by.candidate
    assert inside(candidate, CONSTANT.true_onset("CV"))


def test_current_that_stands_still_well_inside_a_stated_range_is_a_limiter():
    """A bench supply keeps its current to the last milliampere."""
    frame = slow(replace(CONSTANT, slope=0.0), "CV", settings=24, meters=Meters(digits=(1e-3, 1e-3)))
    stated = ACCURATE.replace('0.2 % reading + 4 mA"', '0.2 % reading + 4 mA", meter_range: 10 A')

    assert "meter_range" in judged(frame, "behaviour: constant current").reason
    assert judged(frame, "behaviour: constant current", bench=stated).verdict == "pass"


def test_power_limit_down_to_a_current_limit_is_no_constant_current():
    """From 90 % of the voltage the current rises by 12 %, most of it above the highest level."""
    frame = built(CONSTANT, "CV", settings=24, samples=10, back=100)
    share = frame[VOLTAGE] / BRANCH[0]
    limited = (frame[CURRENT] > 4.3) & (share < 0.97)
    frame.loc[limited, CURRENT] = np.minimum(4.6 / np.maximum(share, 0.05), 5.8)[limited]
    kept = ~((share > 0.81) & (share < 0.895) & limited)

    decided = judged(frame[kept].reset_index(drop=True), "behaviour: constant current")
    assert decided.verdict != "pass"


def test_noise_at_rated_load_is_no_second_overload():
    """Without a setting a single reading beyond rated load is noise."""
    frame = recorded(HICCUP, Load("CR", 3.0, 500), Load("CR", 0.5, 500), Load("CR", 3.0, 500), interval=2e-3)
    frame = frame.drop(columns=[SETTING, MODE])
    spike = len(frame) - 3
    frame.loc[spike, CURRENT] *= 1.04
    frame[MODE] = pd.Categorical(["CR"] * len(frame))

    decided = judged(frame, "recovery: {within: 2 s, band: 3 %}")
    assert decided.verdict == "pass", decided.reason
