"""Soaks as benches write them when something is wrong: none of it passes a unit, and the reason tells what to do."""

from __future__ import annotations

import re
from dataclasses import replace

import numpy as np
import pytest

from acceptance.thermal.probes import step_of
from tests.checks.test_temperature import changed, rise_limits, rise_of, temperature_limits, temperature_of, value
from tests.thermal_logs import HOUR, Body, Table, Thermometer, points_of, soak_table

TENTHS = Thermometer(0.03, 0.1)
HOT = Body([15.0, 30.0], [300.0, 1800.0])  # 45 K, over the limit of 40 K
GOOD = Body([8.0, 24.0], [300.0, 1800.0])  # 32 K


def soak(body: Body = GOOD, lasts: float = 4 * HOUR, **kw: object) -> Table:
    return soak_table({"case": body}, lasts=lasts, interval=10.0, thermometer=TENTHS, **kw)


def time_of(table: Table) -> np.ndarray:
    return np.asarray(table.columns["time"])


# --- several soaks ----------------------------------------------------------------------------------------------------


def test_soak_settled_at_half_load_does_not_hide_the_one_cut_short_at_full_load() -> None:
    """38 K settled at half load; at full load it goes to 45 K, and was stopped at some 34 K."""
    half = soak(Body([8.0, 30.0], [300.0, 1800.0]), load=0.5)
    full = soak(HOT, 2000.0)

    decided = rise_of(points_of([half, full], rise_limits(at="{load: any, input: 230 V}")))

    assert decided.verdict == "not judged"
    assert "let it run on" in decided.reason


def test_soak_settled_at_another_input_does_not_hide_the_one_cut_short() -> None:
    low = soak(HOT, 2000.0)
    low = changed(low, input_voltage=np.full(time_of(low).size, 207.0))
    high = soak(Body([8.0, 30.0], [300.0, 1800.0]))

    assert rise_of(points_of([high, low], rise_limits(at="{load: 100 %, input: any}"))).verdict == "not judged"


def test_soak_settled_at_the_same_load_supersedes_the_one_cut_short_under_any() -> None:
    decided = rise_of(points_of([soak(lasts=2000.0), soak(seed=5)], rise_limits(at="{load: any, input: any}")))

    assert decided.verdict == "pass"


def test_setting_of_the_load_between_two_levels_is_no_soak_under_any() -> None:
    """Half load, then full load, in one table whose blocks of time fall across the step."""
    table = soak(lasts=8 * HOUR)
    time = time_of(table)
    after = np.clip(time - 4 * HOUR - 20, 0, None)
    rise = 18 * -np.expm1(-time / 1800) + 14 * -np.expm1(-after / 1800)
    load = np.where(after > 0, 4.0, 2.0)
    both = changed(table, temperature_of_case=23 + rise, **{"output_current main": load})

    decided = rise_of(points_of([both], rise_limits(at="{load: any, input: any}")))

    assert decided.verdict == "pass"
    assert value(decided) == pytest.approx(32.0, abs=0.1)


# --- the ambient ------------------------------------------------------------------------------------------------------


@pytest.mark.parametrize("tau", [120.0, 300.0, 900.0, 1800.0])
def test_ambient_that_the_unit_warms_passes_no_unit(tau: float) -> None:
    """The sensor takes 13.5 K of the 45 K, so that 31.5 K seem to be left."""
    table = soak(HOT)
    near = np.round(23 + 13.5 * -np.expm1(-time_of(table) / tau), 1)

    decided = rise_of(points_of([changed(table, ambient_temperature=near)], rise_limits()))

    assert decided.verdict == "not judged"
    assert "its sensor feels the unit's heat" in decided.reason
    assert "move the sensor away" in decided.reason


def test_ambient_that_the_unit_warms_may_still_fail_it() -> None:
    table = soak(HOT)
    near = np.round(23 + 13.5 * -np.expm1(-time_of(table) / 1800), 1)

    decided = rise_of(points_of([changed(table, ambient_temperature=near)], rise_limits("25 K")))

    assert decided.verdict == "fail"


@pytest.mark.parametrize(
    "warms",
    [lambda t: 0.8 * t / HOUR, lambda t: 3 * -np.expm1(-t / (2 * HOUR)), lambda t: 3 * np.sin(t / (1.3 * HOUR))],
)
def test_room_that_warms_by_itself_is_one(warms: object) -> None:
    table = soak()
    time = time_of(table)
    room = 21 + warms(time)  # type: ignore[operator]
    # what the body of one time constant makes of the room, by steps of 10 s
    follows, keeps = np.empty(time.size), np.exp(-10 / 1800)
    follows[0] = room[0]
    for at in range(1, time.size):
        follows[at] = room[at] + keeps * (follows[at - 1] - room[at])
    probe = np.round(follows + GOOD.rise(time), 1)

    decided = rise_of(
        points_of(
            [changed(table, ambient_temperature=np.round(room, 1), temperature_of_case=probe)], rise_limits(), step=0.1
        )
    )

    assert decided.verdict == "pass"
    assert value(decided) == pytest.approx(32.0, abs=0.3)


def test_room_that_swings_is_named_as_what_still_moves() -> None:
    table = soak()
    room = 23 + 1.5 * np.sin(2 * np.pi * time_of(table) / 5400)
    probe = 23 + GOOD.rise(time_of(table))

    decided = rise_of(points_of([changed(table, ambient_temperature=room, temperature_of_case=probe)], rise_limits()))

    assert "hold the room steadier" in decided.reason


def test_ambient_that_reads_above_the_cold_unit_passes_none() -> None:
    """It stands at 30 °C all the time, in a room of 23 °C, and so takes 7 K of the 45 K."""
    table = soak(HOT)
    stuck = np.full(time_of(table).size, 30.0)

    decided = rise_of(points_of([changed(table, ambient_temperature=stuck)], rise_limits()))

    assert decided.verdict == "not judged"
    assert re.search(r"begins about [567]\.\d K below the ambient", decided.reason)


def test_ambient_in_fahrenheit_is_not_judged() -> None:
    table = soak()
    room = 1.8 * np.asarray(table.columns["ambient_temperature"]) + 32

    decided = rise_of(points_of([changed(table, ambient_temperature=room)], rise_limits()))

    assert "the ambient reads 73.4 °C" in decided.reason
    assert "logged in °F" in decided.reason


def test_temperature_as_measured_in_a_cool_room_says_so() -> None:
    """Rated 40 °C, measured in 23 °C: the limit may not be met in the rated ambient."""
    decided = temperature_of(points_of([soak()], temperature_limits("max: 70 °C", probe="case")))

    assert decided.verdict == "pass"
    assert any("in an ambient of 23.0 °C" in text for text in decided.outcome.deviations)


# --- probes -----------------------------------------------------------------------------------------------------------


@pytest.mark.parametrize("at", [100.0, 300.0, 900.0])
def test_lonely_probe_that_stops_at_once_is_stuck(at: float) -> None:
    table = soak(HOT)
    column = np.asarray(table.columns["temperature case"]).copy()
    late = time_of(table) > at
    column[late] = column[late][0]

    decided = rise_of(points_of([changed(table, temperature_of_case=column)], rise_limits(), step=0.1))

    assert decided.verdict == "not judged"
    assert "the probe or its logger is stuck" in decided.reason


def test_probe_without_noise_that_settles_is_not_stuck() -> None:
    table = soak()
    column = np.round(23 + 32 * -np.expm1(-time_of(table) / 900), 1)

    decided = rise_of(points_of([changed(table, temperature_of_case=column)], rise_limits(), step=0.1))

    assert decided.verdict == "pass"


def test_probe_in_fahrenheit_is_not_judged() -> None:
    table = soak()
    column = 1.8 * np.asarray(table.columns["temperature case"]) + 32

    decided = rise_of(points_of([changed(table, temperature_of_case=column)], rise_limits()))

    assert decided.verdict == "not judged"
    assert "which is the room in °F" in decided.reason


def test_step_of_few_readings_is_the_common_one() -> None:
    """23.0, 23.6, 24.3, 25.0: no two are a tenth apart, but all are multiples of it."""
    log = points_of([soak()], rise_limits(), step=0.1).log

    assert step_of(log, "temperature case", np.array([23.0, 23.6, 24.3, 25.0])) == pytest.approx(0.1)
    assert step_of(log, "temperature case", np.array([23.0, 24.0, 26.0])) == pytest.approx(1.0)


# --- the unit goes off ------------------------------------------------------------------------------------------------


def gone_off(*, input_stays: bool, body: Body = GOOD) -> Table:
    table = soak(body)
    after = time_of(table) > 2.5 * HOUR
    return changed(
        table,
        input_voltage=np.where(after & (not input_stays), 0.0, 230.0),
        **{"output_current main": np.where(after, 0.0, 4.0), "output_voltage main": np.where(after, 0.02, 12.0)},
    )


def test_unit_that_went_off_in_its_soak_is_not_passed() -> None:
    decided = rise_of(points_of([gone_off(input_stays=True)], rise_limits()))

    assert decided.verdict == "not judged"
    assert "the output went down" in decided.reason


def test_unit_that_went_off_may_fail_by_what_it_reached() -> None:
    assert rise_of(points_of([gone_off(input_stays=True, body=HOT)], rise_limits())).verdict == "fail"


def test_unit_that_was_switched_off_at_its_input_is_judged() -> None:
    assert rise_of(points_of([gone_off(input_stays=False)], rise_limits())).verdict == "pass"


# --- words ------------------------------------------------------------------------------------------------------------


def test_reason_of_an_unsettled_soak_has_its_unit_and_sensible_digits() -> None:
    """Of 32 K 30.1 K are there after an hour and a bit; the mean of the last five minutes is a little less."""
    decided = rise_of(points_of([soak(lasts=1.2 * HOUR)], rise_limits()))

    assert re.search(r"\(so far (29|30)\.\d K\)", decided.reason)


def test_missing_load_and_input_are_named_together() -> None:
    table = soak()
    bare = {k: v for k, v in table.columns.items() if k not in ("input_voltage", "output_current main")}

    decided = rise_of(points_of([replace(table, columns=bare)], rise_limits()))

    assert (
        "the load and the input were not logged" in decided.reason or "load and input were not logged" in decided.reason
    )
