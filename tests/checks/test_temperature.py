"""Temperature rise and temperature of probes, on soaks whose end is known in closed form."""

from __future__ import annotations

import re
from dataclasses import replace

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from acceptance.bench.log import Doubt
from acceptance.checks.outcome import Outcome
from acceptance.checks.temperature import check_temperature, check_temperature_rise
from acceptance.decision import Decided, decide
from acceptance.limitfile.limits import Limits
from acceptance.points.point import Points
from acceptance.points.propagation import expanded
from tests.checks.built import HEAD, limits_from
from tests.thermal_logs import HOUR, Body, Room, Table, Thermometer, points_of, soak_table

BENCH = """
instruments:
  temperature: {device: T1, accuracy: "0.5 K"}
"""
WARM_HEAD = HEAD + "  ambient: 40 °C\n"
CASE = Body([32.0], [0.5 * HOUR])
CORE = Body([20.0, 35.0], [240.0, 0.5 * HOUR])


def rise_limits(limit: str = "40 K", *, at: str = "{load: 100 %, input: 230 V}", more: str = "", **kw: str) -> Limits:
    text = f"  temperature_rise:\n    - {{name: rise, probe: case, at: {at}, max: {limit}{more}}}\n"
    return limits_from(text, **{"head": WARM_HEAD, "bench": BENCH, **kw})


def temperature_limits(limit: str = "max: 110 °C", *, more: str = "", probe: str = "core", **kw: str) -> Limits:
    text = f"  temperature:\n    - {{name: hot, probe: {probe}, at: {{load: 100 %, input: 230 V}}, {limit}{more}}}\n"
    return limits_from(text, **{"head": WARM_HEAD, "bench": BENCH, **kw})


def rise_of(points: Points) -> Decided:
    (outcome,) = check_temperature_rise(points.limits.requirements, points).outcomes
    return decide(outcome, points.limits.decision)


def temperature_of(points: Points) -> Decided:
    (outcome,) = check_temperature(points.limits.requirements, points).outcomes
    return decide(outcome, points.limits.decision)


def value(decided: Decided) -> float:
    assert decided.by is not None
    assert decided.by.candidate.estimate is not None
    return decided.by.candidate.estimate.nominal


def reach(decided: Decided) -> float:
    assert decided.by is not None
    assert decided.by.expanded is not None
    return decided.by.expanded.expanded


def soak(lasts: float = 4 * HOUR, **kw: object) -> Table:
    return soak_table({"case": CASE, "core": CORE}, lasts=lasts, **kw)


def changed(table: Table, **columns: np.ndarray) -> Table:
    names = {name.replace("_of_", " "): column for name, column in columns.items()}
    return replace(table, columns={**table.columns, **names})


# --- settled ----------------------------------------------------------------------------------------------------------


def test_rise_of_a_settled_soak_is_what_the_body_ends_at() -> None:
    decided = rise_of(points_of([soak()], rise_limits()))

    assert decided.verdict == "pass"
    assert value(decided) == pytest.approx(32.0, abs=0.1)
    # two thermometers of ± 0.5 K, each once: 1.96 sqrt(2) 0.5/sqrt(3) = 0.80, and the spread on top
    assert 0.80 <= reach(decided) < 1.0


def test_rise_still_to_come_is_added() -> None:
    """At 3.5 time constants the mean of the last half hour lies 32 exp(-3.5) (e - 1) = 1.66 K below the end."""
    table = soak_table({"case": Body([32.0], [0.5 * HOUR])}, lasts=1.75 * HOUR)
    limits = rise_limits(more=", settled: 3 K/30 min")

    decided = rise_of(points_of([table], limits))

    time, rise = table.columns["time"], table.columns["temperature case"] - table.columns["ambient_temperature"]
    assert rise[time >= 1.25 * HOUR].mean() < 30.5
    assert value(decided) == pytest.approx(32.0, abs=0.25)


@pytest.mark.parametrize("drift", [-1.5 / HOUR, 1.5 / HOUR])
def test_rise_in_a_room_that_drifts_is_that_in_a_steady_one(drift: float) -> None:
    """The unit lies 1.5 K/h x 0.5 h = 0.75 K behind its room for ever; the rise it ends at does not change."""
    decided = rise_of(points_of([soak(room=Room(drift=drift))], rise_limits()))

    assert value(decided) == pytest.approx(32.0, abs=0.2)


def test_rise_above_its_limit_fails() -> None:
    decided = rise_of(points_of([soak()], rise_limits("31 K")))

    assert decided.verdict == "fail"
    assert decided.reason == "outside the limit"


def test_rise_just_below_its_limit_is_not_shown_to_conform() -> None:
    decided = rise_of(points_of([soak()], rise_limits("32.4 K")))

    assert decided.verdict == "fail"
    assert "not shown to conform" in decided.reason


def test_rise_uses_the_stated_ambient_where_none_was_logged() -> None:
    table = soak()
    bare = replace(table, columns={k: v for k, v in table.columns.items() if k != "ambient_temperature"})

    decided = rise_of(points_of([bare], rise_limits(), stated={"ambient_temperature": 23.0}))

    assert value(decided) == pytest.approx(32.0, abs=0.1)
    assert "the ambient was stated as 23 °C, not logged" in decided.outcome.deviations


def test_rise_without_a_stated_accuracy_is_judged_by_the_simple_rule_alone() -> None:
    points = points_of([soak()], rise_limits(bench="", decision="decision: {rule: guarded, confidence: 95 %}"))

    decided = rise_of(points)

    assert decided.verdict == "not judged"
    assert "ambient_temperature, temperature case" in decided.reason


def test_rise_written_down_by_hand_is_judged() -> None:
    """A row every ten minutes over four hours."""
    decided = rise_of(points_of([soak(interval=600.0)], rise_limits()))

    assert decided.verdict == "pass"
    assert value(decided) == pytest.approx(32.0, abs=0.3)


def test_rise_with_a_thermometer_of_whole_kelvins_is_judged() -> None:
    """Standing still is what a settled probe does on a coarse display."""
    coarse = Thermometer(noise=0.05, step=1.0)

    decided = rise_of(points_of([soak(8 * HOUR, thermometer=coarse)], rise_limits(), step=1.0))

    assert decided.verdict == "pass"
    assert abs(value(decided) - 32.0) <= reach(decided)
    # two thermometers of ± 0.5 K, and the steps of both: 1.96 sqrt(2/12 + 2/12)
    assert reach(decided) >= 1.13


def test_overshoot_counts_by_its_top() -> None:
    """22 (1 - exp(-t/6 min)) + 18 exp(-t/48 min) - ...: up to 31.5 K within the first hour, 22 K at the end."""
    time = np.arange(0.0, 5 * HOUR, 30.0)
    rise = 22 * -np.expm1(-time / 360) + 18 * (np.exp(-time / 2880) - np.exp(-time / 360))
    table = changed(soak(5 * HOUR - 30), temperature_of_case=23.0 + rise)

    decided = rise_of(points_of([table], rise_limits("30 K")))

    means = np.convolve(rise, np.ones(20) / 20, "valid")
    assert means.max() > 30
    assert value(decided) == pytest.approx(means.max(), abs=0.2)
    assert decided.verdict == "fail"


# --- not settled ------------------------------------------------------------------------------------------------------


def test_unsettled_soak_within_its_limit_is_not_judged() -> None:
    decided = rise_of(points_of([soak(0.9 * HOUR)], rise_limits()))

    assert decided.verdict == "not judged"
    assert "not settled: the rise still rises by" in decided.reason
    assert "let it run on until it moves by less than 1 K in 30 min" in decided.reason


def test_unsettled_soak_fails_by_what_it_reached() -> None:
    decided = rise_of(points_of([soak(0.9 * HOUR)], rise_limits("20 K")))

    assert decided.verdict == "fail"
    assert "the true value is at least this" in decided.reason
    assert value(decided) < 32 * -np.expm1(-1.8)


def test_soak_shorter_than_half_an_hour_is_not_settled() -> None:
    quick = soak_table({"case": Body([32.0], [120.0])}, lasts=1500.0)

    decided = rise_of(points_of([quick], rise_limits()))

    assert decided.verdict == "not judged"
    assert "the soak lasts 25 min" in decided.reason


def test_fan_that_starts_after_it_had_settled_leaves_the_higher_rise() -> None:
    """38 K for two hours and a half, then 20 K."""
    time = np.arange(0.0, 5 * HOUR, 30.0)
    after = np.clip(time - 2.5 * HOUR, 0, None)
    rise = 38 * -np.expm1(-time / 1200) - 18 * -np.expm1(-after / 1200)
    noise = 0.03 * np.random.default_rng(3).standard_normal(time.size)

    decided = rise_of(points_of([changed(soak(5 * HOUR - 30), temperature_of_case=23 + rise + noise)], rise_limits()))

    assert decided.verdict == "pass"
    assert value(decided) == pytest.approx(38.0, abs=0.2)


def test_fan_that_starts_on_the_way_leaves_nothing_to_judge() -> None:
    """What it would have come to without the fan, or a probe that came off slowly, is not known."""
    time = np.arange(0.0, 5 * HOUR, 30.0)
    top = 50 * -np.expm1(-1500 / 1200)
    rise = np.where(
        time < 1500, 50 * -np.expm1(-time / 1200), 25 + (top - 25) * np.exp(-np.clip(time - 1500, 0, None) / 1200)
    )

    decided = rise_of(points_of([changed(soak(5 * HOUR - 30), temperature_of_case=23 + rise)], rise_limits()))

    assert decided.verdict == "not judged"


def test_soak_that_begins_warm_and_stays_so_is_judged() -> None:
    """Nothing tells a time constant; the slope over five hours bounds what could still come."""
    noise = 0.03 * np.random.default_rng(3).standard_normal(601)

    decided = rise_of(points_of([changed(soak(5 * HOUR), temperature_of_case=55 + noise)], rise_limits()))

    assert decided.verdict == "pass"
    assert value(decided) == pytest.approx(32.0, abs=0.1)


@pytest.mark.parametrize(("began", "verdict"), [(38.0, "pass"), (45.0, "not judged")])
def test_soak_that_begins_warmer_than_it_ends_counts_no_heat_from_before(began: float, verdict: str) -> None:
    time = np.arange(0.0, 5 * HOUR, 30.0)
    rise = 32 + (began - 32) * np.exp(-time / 1800)

    decided = rise_of(points_of([changed(soak(5 * HOUR - 30), temperature_of_case=23 + rise)], rise_limits()))

    assert decided.verdict == verdict
    if verdict == "not judged":
        assert "began warmer than it ends" in decided.reason


def test_soak_without_readings_at_its_end_is_not_settled() -> None:
    table = soak()
    rows = (table.columns["time"] < 3.6 * HOUR) | (table.columns["time"] > 3.95 * HOUR)
    cut = replace(table, columns={k: v[rows] for k, v in table.columns.items()})

    decided = rise_of(points_of([cut], rise_limits()))

    assert decided.verdict == "not judged"
    assert "no reading for 2" in decided.reason


def test_slow_second_time_constant_passes_no_soak_that_looks_settled() -> None:
    """After three hours the slope is 0.69 K in 30 min, and 11 K are still to come."""
    slow = Body([24.0, 16.0], [1200.0, 8 * HOUR])
    rates = 16.0 / 8 * np.exp(-3 / 8) / 2
    assert rates < 1

    decided = rise_of(points_of([soak_table({"case": slow}, lasts=3 * HOUR)], rise_limits("35 K")))

    assert decided.verdict in ("not judged", "fail")


# --- probes -----------------------------------------------------------------------------------------------------------


def fallen(kind: str) -> np.ndarray:
    column = soak().columns["temperature case"].copy()
    half = column.size // 2
    if kind == "open":
        column[half:] = np.nan
    elif kind == "room":
        column[half:] = 23.0 + (column[half] - 23.0) * np.exp(-np.arange(column.size - half) * 30 / 20)
    elif kind == "rail":
        column[half:] = 1372.0
    elif kind == "zero":
        column[half:] = 0.0
    elif kind == "hole":
        column[half : half + 60] = np.nan
    return column


@pytest.mark.parametrize(
    ("kind", "told"),
    [
        ("open", "has no reading for 2 h"),
        ("hole", "has no reading for 30 min"),
        ("room", "falls by .* the probe came off"),
        ("zero", "falls by .* the probe came off"),
        ("rail", "the end of a thermometer's range"),
    ],
)
def test_probe_that_falls_off_is_not_judged(kind: str, told: str) -> None:
    table = changed(soak(), temperature_of_case=fallen(kind))

    decided = rise_of(points_of([table], rise_limits()))

    assert decided.verdict == "not judged"
    assert re.search(told, decided.reason), decided.reason
    assert "T-1_thermal_0.csv, line" in decided.reason


def test_probe_that_was_never_attached_is_not_judged() -> None:
    table = changed(soak(), temperature_of_case=soak(seed=5).columns["ambient_temperature"])

    decided = rise_of(points_of([table], rise_limits()))

    assert decided.verdict == "not judged"
    assert "the probe was not attached, or the unit was off" in decided.reason


def test_probe_stuck_while_the_other_rises_is_not_judged() -> None:
    column = soak().columns["temperature case"].copy()
    column[20:] = column[20]  # after ten minutes

    decided = rise_of(points_of([changed(soak(), temperature_of_case=column)], rise_limits()))

    assert decided.verdict == "not judged"
    assert "stands still at" in decided.reason
    assert "temperature core moves by" in decided.reason


def test_lonely_probe_stuck_on_its_way_is_not_judged() -> None:
    table = soak_table({"case": CASE}, lasts=4 * HOUR)
    column = table.columns["temperature case"].copy()
    column[100:] = column[100]  # after 50 min, at 81 % of the rise

    decided = rise_of(points_of([changed(table, temperature_of_case=column)], rise_limits()))

    assert decided.verdict == "not judged"
    assert "it was on its way to" in decided.reason


def test_single_odd_readings_are_set_aside_and_told() -> None:
    column = soak().columns["temperature case"].copy()
    column[[50, 300]] = 999.0

    decided = rise_of(points_of([changed(soak(), temperature_of_case=column)], rise_limits()))

    assert value(decided) == pytest.approx(32.0, abs=0.1)
    assert any(text.startswith("2 single readings of temperature case") for text in decided.outcome.deviations)


def test_missing_probe_is_named_with_those_there() -> None:
    decided = rise_of(points_of([soak_table({"core": CORE}, lasts=4 * HOUR)], rise_limits()))

    assert decided.reason == "temperature case was not logged; the log has temperature core"


def test_missing_ambient_leaves_no_rise() -> None:
    table = soak()
    bare = replace(table, columns={k: v for k, v in table.columns.items() if k != "ambient_temperature"})

    decided = rise_of(points_of([bare], rise_limits()))

    assert decided.verdict == "not judged"
    assert "no ambient temperature was logged in the soak" in decided.reason


def test_ambient_sensor_that_was_moved_is_not_judged() -> None:
    ambient = soak().columns["ambient_temperature"].copy()
    ambient[300:] += 12.0

    decided = rise_of(points_of([changed(soak(), ambient_temperature=ambient)], rise_limits()))

    assert decided.verdict == "not judged"
    assert "the ambient moves by 12 K within" in decided.reason


def test_missing_time_is_not_judged() -> None:
    table = soak()
    bare = replace(table, columns={k: v for k, v in table.columns.items() if k != "time"})

    decided = rise_of(points_of([bare], rise_limits()))

    assert decided.verdict == "not judged"
    assert "the soak has no time" in decided.reason


def test_barred_probe_is_not_judged() -> None:
    doubt = Doubt("clipped", "temperature case is clipped", bars=True, channels=("temperature case",), remedy="again")

    decided = rise_of(points_of([soak()], rise_limits(), doubts=[doubt]))

    assert decided.reason == "temperature case is clipped; again"


# --- conditions -------------------------------------------------------------------------------------------------------


def test_soak_at_another_load_is_named() -> None:
    decided = rise_of(points_of([soak(load=0.5)], rise_limits()))

    assert decided.verdict == "not judged"
    assert decided.reason.startswith("no soak at load 100 %, input 230 V; T-1_thermal_0.csv")
    assert "load 50 %" in decided.reason


def test_load_that_dropped_out_is_not_judged_with_its_place() -> None:
    column = soak().columns["output_current main"].copy()
    column[200:210] = 0.0

    decided = rise_of(points_of([changed(soak(), **{"output_current main": column})], rise_limits()))

    assert decided.verdict == "not judged"
    assert "left within the soak: load 0 %" in decided.reason
    assert "T-1_thermal_0.csv, line 202" in decided.reason


def test_input_that_sagged_is_not_judged() -> None:
    column = soak().columns["input_voltage"].copy()
    column[300:330] = 200.0

    decided = rise_of(points_of([changed(soak(), input_voltage=column)], rise_limits()))

    assert "input 200 V" in decided.reason


def test_load_step_begins_a_soak_of_its_own() -> None:
    """Two hours at half load, then five at full load: 23 K are made of 10 K + 22 K (1 - exp(-t/0.5 h))."""
    time = np.arange(0.0, 7 * HOUR, 30.0)
    after = np.clip(time - 2 * HOUR, 0, None)
    rise = 10 * -np.expm1(-time / (0.5 * HOUR)) + 22 * -np.expm1(-after / (0.5 * HOUR))
    load = np.where(time < 2 * HOUR, 2.0, 4.0)
    table = changed(soak(7 * HOUR - 30), temperature_of_case=23 + rise, **{"output_current main": load})

    decided = rise_of(points_of([table], rise_limits()))

    assert value(decided) == pytest.approx(32.0, abs=0.1)
    assert decided.by is not None
    assert decided.by.candidate.where == "T-1_thermal_0.csv, lines 242 to 841"


def test_any_load_judges_every_level_of_the_soak() -> None:
    """Full load first, then half load, which is cooler: the hotter one is the finding."""
    time = np.arange(0.0, 8 * HOUR, 30.0)
    after = np.clip(time - 4 * HOUR, 0, None)
    rise = 32 * -np.expm1(-time / (0.5 * HOUR)) - 22 * -np.expm1(-after / (0.5 * HOUR))
    load = np.where(time < 4 * HOUR, 4.0, 2.0)
    table = changed(soak(8 * HOUR - 30), temperature_of_case=23 + rise, **{"output_current main": load})

    decided = rise_of(points_of([table], rise_limits("20 K", at="{load: any, input: any}")))

    assert decided.verdict == "fail"
    assert value(decided) == pytest.approx(32.0, abs=0.1)
    assert len(decided.others) == 1


def test_soaks_of_two_units_of_time_are_candidates_each() -> None:
    hotter = soak_table({"case": Body([36.0], [0.5 * HOUR])}, lasts=4 * HOUR, seed=3)

    decided = rise_of(points_of([soak(), hotter], rise_limits()))

    assert value(decided) == pytest.approx(36.0, abs=0.1)
    assert len(decided.others) == 1


def test_soak_that_goes_on_in_a_second_table_is_one_soak() -> None:
    whole = soak()
    half = whole.columns["time"].size // 2
    parts = [
        replace(whole, columns={k: v[rows] for k, v in whole.columns.items()})
        for rows in (slice(0, half), slice(half, None))
    ]

    decided = rise_of(points_of(parts, rise_limits()))

    assert decided.others == ()
    assert value(decided) == pytest.approx(32.0, abs=0.1)


def test_soak_cut_short_does_not_hide_the_one_that_settled() -> None:
    decided = rise_of(points_of([soak(0.9 * HOUR, seed=4), soak()], rise_limits()))

    assert decided.verdict == "pass"
    assert any("cut short" in text for text in decided.outcome.deviations)


def test_steady_dwell_serves_where_no_stage_was_told() -> None:
    table = replace(soak(), stage="steady")
    size = table.columns["time"].size

    decided = rise_of(points_of([table], rise_limits(), stages_from="none told", dwells=[(0, size)]))

    assert value(decided) == pytest.approx(32.0, abs=0.1)
    assert any("a steady dwell that lasts long enough serves" in text for text in decided.outcome.deviations)


def test_log_without_any_soak_says_what_to_record() -> None:
    table = replace(soak(0.2 * HOUR), stage="steady")

    decided = rise_of(points_of([table], rise_limits(), dwells=[(0, table.columns["time"].size)]))

    assert "record the warming up as stage thermal" in decided.reason


# --- temperature ------------------------------------------------------------------------------------------------------


def test_temperature_as_measured_takes_the_room_as_it_was() -> None:
    decided = temperature_of(points_of([soak(room=Room(base=21.0))], temperature_limits()))

    assert value(decided) == pytest.approx(21.0 + 55.0, abs=0.1)
    # one thermometer alone: 1.96 x 0.5/sqrt(3) = 0.57
    assert 0.56 < reach(decided) < 0.8


def test_temperature_in_a_room_that_cooled_counts_by_its_top() -> None:
    """32 °C for four hours, then in one hour down to 20 °C: as measured, the core was 87 °C hot."""
    time = np.arange(0.0, 10 * HOUR, 30.0)
    after, tau, rate = np.clip(time - 4 * HOUR, 0, HOUR), 0.5 * HOUR, 12 / HOUR
    ambient = 32.0 - rate * after
    # behind a room that falls by `rate`: rate tau (1 - exp(-t/tau)), and from then on by exp(-t/tau)
    behind = rate * tau * -np.expm1(-after / tau) * np.exp(-np.clip(time - 5 * HOUR, 0, None) / tau)
    table = changed(
        soak(10 * HOUR - 30), ambient_temperature=ambient, temperature_of_core=ambient + behind + CORE.rise(time)
    )

    decided = temperature_of(points_of([table], temperature_limits()))

    assert value(decided) == pytest.approx(87.0, abs=0.2)


def test_temperature_class_is_held_against_the_stricter_table() -> None:
    limits = temperature_limits("class: B")
    (outcome,) = check_temperature(limits.requirements, points_of([soak()], limits)).outcomes

    assert outcome.high == 120.0
    assert any("the class itself is named by 130 °C (IEC 60085)" in text for text in outcome.deviations)
    assert any("by a thermocouple standards allow 10 K less" in text for text in outcome.deviations)


def test_temperature_without_an_ambient_is_judged_as_measured_alone() -> None:
    table = soak()
    bare = replace(table, columns={k: v for k, v in table.columns.items() if k != "ambient_temperature"})

    plain = temperature_of(points_of([bare], temperature_limits()))
    adjusted = temperature_of(points_of([bare], temperature_limits(more=", adjust: rated ambient")))

    assert plain.verdict == "pass"
    assert any("told by the probe alone" in text for text in plain.outcome.deviations)
    assert adjusted.verdict == "not judged"


# --- figures ----------------------------------------------------------------------------------------------------------


def test_figure_shows_probe_ambient_curve_limit_and_settling() -> None:
    points = points_of([soak(interval=1.0)], rise_limits())

    (figure,) = check_temperature_rise(points.limits.requirements, points).figures

    assert figure.name == "temperature case"
    assert [series.name for series in figure.series] == ["temperature case", "ambient", "fitted curve"]
    assert all(series.kind in ("trace", "line") and len(series.x) <= 700 for series in figure.series)
    (limit,) = figure.limits
    assert limit.y == pytest.approx(63.0, abs=0.05)
    (mark,) = figure.marks
    # the mean slope over a half hour is 1 K when 32 exp(-t/tau) (e - 1) is, tau being that half hour: t = 4.0 tau
    assert mark.x == pytest.approx(np.log(32 * (np.e - 1)) * 0.5 * HOUR, abs=400)


# --- properties -------------------------------------------------------------------------------------------------------


def outcome_of(points: Points) -> Outcome:
    return check_temperature_rise(points.limits.requirements, points).outcomes[0]


@given(offset=st.floats(-40, 36))
@settings(max_examples=8, deadline=None)
def test_a_constant_on_probe_and_ambient_leaves_the_rise(offset: float) -> None:
    table, limits = soak_table({"case": CASE}, lasts=3 * HOUR, interval=60.0), rise_limits()
    moved = changed(
        table,
        temperature_of_case=table.columns["temperature case"] + offset,
        ambient_temperature=table.columns["ambient_temperature"] + offset,
    )

    one, other = rise_of(points_of([table], limits)), rise_of(points_of([moved], limits))

    assert value(other) == pytest.approx(value(one), abs=1e-6)
    assert reach(other) == pytest.approx(reach(one), rel=1e-3)


JUNK = st.one_of(
    st.floats(-1e6, 1e6),
    st.sampled_from([np.nan, np.inf, -np.inf, 0.0, 23.0, 1e300, -1e300]),
)


@given(
    columns=st.lists(st.lists(JUNK, min_size=1, max_size=60), min_size=4, max_size=4),
    step=st.sampled_from([0.0, 1.0, 60.0, 3600.0, -5.0]),
)
@settings(max_examples=60, deadline=None)
@pytest.mark.filterwarnings("ignore::RuntimeWarning")
def test_junk_is_never_a_pass_and_never_crashes(columns: list[list[float]], step: float) -> None:
    size = min(len(column) for column in columns)
    current, volts, probe, ambient = (np.array(column[:size]) for column in columns)
    table = Table(
        "thermal",
        {
            "time": step * np.arange(float(size)),
            "input_voltage": volts,
            "output_current main": current,
            "temperature case": probe,
            "ambient_temperature": ambient,
        },
    )

    decided = rise_of(points_of([table], rise_limits(at="{load: any, input: any}")))

    assert decided.verdict in ("not judged", "fail")


def test_expanded_uncertainty_names_what_is_still_to_come() -> None:
    (outcome,) = check_temperature_rise(rise_limits().requirements, points_of([soak()], rise_limits())).outcomes
    estimate = outcome.candidates[0].estimate
    assert estimate is not None

    names = {variable.tag.name for variable in estimate.value.error_components()}

    assert "what is still to come of temperature case" in names
    assert expanded(estimate.value, 0.95).standard > 0.5 * np.sqrt(2 / 3)
