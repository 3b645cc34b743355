"""A winding by change of resistance: stages cold, thermal and cooling, with the truth in closed form."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from acceptance.checks.temperature import check_temperature, check_temperature_rise
from acceptance.decision import Decided, decide
from acceptance.limitfile.limits import Limits
from acceptance.points.point import Points, measure_points
from tests.checks.built import HEAD, limits_from
from tests.thermal_logs import HOUR, Body, Table, points_of, soak_table, winding_tables

BENCH = """
instruments:
  temperature: {device: T1, accuracy: "0.2 K"}
  winding_resistance: {device: R1, accuracy: "0.1 % reading", meter_range: 1 ohm}
"""
PROBE = Body([40.0], [0.4 * HOUR])
WINDING = Body([10.0, 50.0], [60.0, 1800.0])  # how the winding falls: 60 K at switch-off


def rise_limits(limit: str = "70 K", *, material: str = "copper", bench: str = BENCH) -> Limits:
    entry = "{name: winding, probe: winding, at: {load: 100 %, input: 230 V}, method: resistance, "
    entry += f"material: {material}, max: {limit}}}"
    return limits_from(f"  temperature_rise:\n    - {entry}\n", head=HEAD + "  ambient: 40 °C\n", bench=bench)


def judged(tables: list[Table], limits: Limits | None = None, **kw: object) -> Decided:
    limits = limits or rise_limits()
    points: Points = points_of(tables, limits, **kw)
    (outcome,) = check_temperature_rise(limits.requirements, points).outcomes
    return decide(outcome, limits.decision)


def value(decided: Decided) -> float:
    assert decided.by is not None
    assert decided.by.candidate.estimate is not None
    return decided.by.candidate.estimate.nominal


def soak(lasts: float = 4 * HOUR, **kw: object) -> Table:
    return soak_table({"case": PROBE}, lasts=lasts, **kw)


SOAK = soak(2.5 * HOUR, interval=60.0)


def test_rise_by_resistance_is_that_at_switch_off() -> None:
    """The first reading, 10 s late, lies 1.8 K lower."""
    cold, cooling = winding_tables()

    decided = judged([cold, soak(), cooling])

    assert decided.verdict == "pass"
    assert value(decided) == pytest.approx(60.0, abs=0.3)
    assert decided.by is not None
    assert "two exponentials" in decided.by.candidate.at


def test_rise_by_resistance_of_a_plain_exponential_is_drawn_back_by_one() -> None:
    cold, cooling = winding_tables(rise=Body([60.0], [900.0]))

    decided = judged([cold, soak(), cooling])

    assert value(decided) == pytest.approx(60.0, abs=0.3)
    assert decided.by is not None
    assert "one exponential" in decided.by.candidate.at


def test_gain_of_the_meter_cancels_in_the_ratio() -> None:
    """0.1 % of reading in one range shifts R2 and R1 alike; where the range changes it does not cancel."""
    cold, cooling = winding_tables()
    auto = BENCH.replace("meter_range: 1 ohm", "meter_range: auto")

    same = judged([cold, soak(), cooling])
    other = judged([cold, soak(), cooling], rise_limits(bench=auto))

    assert same.by is not None
    assert other.by is not None
    assert same.by.expanded is not None
    assert other.by.expanded is not None
    # dT = (R2/R1)(K + t1): 1.96 x sqrt(2) x 0.1 %/sqrt(3) x 317.5 K = 0.51 K on top in squares
    added = other.by.expanded.expanded**2 - same.by.expanded.expanded**2
    assert added**0.5 == pytest.approx(0.51, abs=0.05)


def test_aluminium_carries_the_spread_of_its_constant() -> None:
    """R2/R1 - 1 = 0.239 times ± 3 K."""
    cold, cooling = winding_tables(material=228.0)

    decided = judged([cold, soak(), cooling], rise_limits(material="aluminium"))

    assert value(decided) == pytest.approx(60.0, abs=0.3)
    assert decided.by is not None
    assert decided.by.candidate.estimate is not None
    parts = {v.tag.name: u for v, u in decided.by.candidate.estimate.value.error_components().items()}
    assert parts["constant of aluminium"] == pytest.approx(0.239 * 3 / 3**0.5, rel=0.02)
    assert any("228 for aluminium" in text for text in decided.outcome.deviations)


def test_unsettled_soak_gives_no_pass_by_resistance() -> None:
    cold, cooling = winding_tables()

    within = judged([cold, soak(0.8 * HOUR), cooling])
    above = judged([cold, soak(0.8 * HOUR), cooling], rise_limits("50 K"))

    assert within.verdict == "not judged"
    assert "not settled (temperature case)" in within.reason
    assert above.verdict == "fail"


def test_resistance_logged_in_the_soak_tells_whether_it_settled() -> None:
    cold, cooling = winding_tables()
    table = soak()
    winding = 0.4 * (234.5 + 23.0 + Body([60.0], [2 * HOUR]).rise(table.columns["time"])) / 257.5
    columns = {k: v for k, v in table.columns.items() if k != "temperature case"} | {"winding_resistance": winding}

    decided = judged([cold, replace(table, columns=columns), cooling])

    assert decided.verdict == "not judged"
    assert "not settled (winding_resistance)" in decided.reason


@pytest.mark.parametrize(
    ("left_out", "told"),
    [
        ("cold", "there is no stage cold with winding_resistance"),
        ("cooling", "there is no stage cooling with winding_resistance"),
        ("both", "winding_resistance was not logged"),
    ],
)
def test_missing_stage_is_not_judged(left_out: str, told: str) -> None:
    cold, cooling = winding_tables()
    tables = {"cold": [soak(), cooling], "cooling": [cold, soak()], "both": [soak()]}[left_out]

    decided = judged(tables)

    assert decided.verdict == "not judged"
    assert told in decided.reason


def test_soak_without_anything_that_shows_settling_is_not_judged() -> None:
    cold, cooling = winding_tables()
    table = soak()
    bare = replace(table, columns={k: v for k, v in table.columns.items() if k != "temperature case"})

    assert "nothing was logged in the soak that shows" in judged([cold, bare, cooling]).reason


def test_cold_winding_that_still_cools_is_not_judged() -> None:
    cold, cooling = winding_tables()
    falling = cold.columns["winding_resistance"] * (1 - 0.001 * np.arange(8))  # 1.8 K over the stage

    decided = judged([replace(cold, columns={**cold.columns, "winding_resistance": falling}), soak(), cooling])

    assert "the winding was not at rest while cold" in decided.reason


def test_probe_warm_while_cold_is_not_judged() -> None:
    cold, cooling = winding_tables()
    warm = replace(cold, columns={**cold.columns, "temperature case": np.full(8, 29.0)})

    assert "temperature case stands 6 K above the ambient while cold" in judged([warm, soak(), cooling]).reason


def test_cold_without_an_ambient_is_not_judged() -> None:
    cold, cooling = winding_tables()
    bare = replace(cold, columns={k: v for k, v in cold.columns.items() if k != "ambient_temperature"})

    assert "no ambient temperature was logged with the winding" in judged([bare, soak(), cooling]).reason


def test_first_reading_too_late_is_a_bound_that_never_passes() -> None:
    cold, cooling = winding_tables(first=200.0, every=30.0)

    within = judged([cold, soak(), cooling])
    above = judged([cold, soak(), cooling], rise_limits("40 K"))

    assert within.verdict == "not judged"
    assert "the first reading after switch-off came after 3 min 20 s" in within.reason
    assert above.verdict == "fail"
    assert value(above) < 60


def test_cooling_whose_time_counts_on_from_the_soak_says_so() -> None:
    cold, cooling = winding_tables(first=4 * HOUR + 10)

    assert "log the seconds from switch-off" in judged([cold, soak(), cooling]).reason


def test_contact_that_changes_while_cooling_is_not_judged() -> None:
    """4 mohm of 493 mohm more from the 13th reading on: 2.6 K that no winding gains."""
    cold, cooling = winding_tables()
    ohms = cooling.columns["winding_resistance"] + np.where(np.arange(30) > 12, 0.004, 0.0)
    off = replace(cooling, columns={**cooling.columns, "winding_resistance": ohms})

    decided = judged([cold, soak(), off])

    assert decided.verdict == "not judged"
    assert "as no winding cools" in decided.reason


def test_readings_that_leave_the_rise_open_are_not_judged() -> None:
    """Nothing is known of the first minute and a half, in which a third of the rise went."""
    cold, cooling = winding_tables(rise=Body([20.0, 40.0], [30.0, 1800.0]), first=90.0, noise=2e-4)

    decided = judged([cold, soak(), cooling])

    assert decided.verdict == "not judged"
    assert "take the first within 30 s" in decided.reason


def test_cold_winding_told_without_its_digits_is_not_judged() -> None:
    """0.40 ohm to a hundredth: one digit is 0.01/0.4 x 257.5 K = 6.4 K."""
    cold, cooling = winding_tables(noise=0.0)
    points = points_of([cold, soak(), cooling], rise_limits())
    channels = tuple(
        replace(one, step=0.01) if one.quantity == "winding_resistance" else one for one in points.log.channels
    )
    points = measure_points(replace(points.log, channels=channels), [], points.limits)
    (outcome,) = check_temperature_rise(points.limits.requirements, points).outcomes

    assert "which is 6.4 K of the winding" in decide(outcome, points.limits.decision).reason


def test_cold_winding_without_a_probe_is_told() -> None:
    cold, cooling = winding_tables()
    case = replace(cold, columns={**cold.columns, "temperature case": np.full(8, 23.4)})

    bare, shown = judged([cold, SOAK, cooling]), judged([case, SOAK, cooling])

    assert any("no probe was logged while cold" in text for text in bare.outcome.deviations)
    assert not any("no probe was logged while cold" in text for text in shown.outcome.deviations)


def test_cooling_that_begins_at_zero_is_not_judged() -> None:
    cold, cooling = winding_tables(first=0.0)

    assert "nothing can be read at the moment of switch-off itself" in judged([cold, soak(), cooling]).reason


def test_cooling_with_clock_times_is_not_judged() -> None:
    cold, cooling = winding_tables()

    assert "carries clock times" in judged([cold, soak(), cooling], seconds=False).reason


def test_cooling_of_another_winding_is_not_judged() -> None:
    cold, cooling = winding_tables()
    other = {**cooling.columns, "winding_resistance": 0.3 * cooling.columns["winding_resistance"]}

    assert "not the same winding" in judged([cold, soak(), replace(cooling, columns=other)]).reason


def test_cooling_that_warms_is_not_judged() -> None:
    cold, cooling = winding_tables()
    turned = {**cooling.columns, "winding_resistance": cooling.columns["winding_resistance"][::-1]}

    assert "does not cool after switch-off" in judged([cold, soak(), replace(cooling, columns=turned)]).reason


def test_room_that_cooled_before_the_cooling_changes_no_rise() -> None:
    """The winding is 83 °C at switch-off, whatever the room does then; the rise is over the soak's 23 °C."""
    cold, _ = winding_tables()
    _, cooling = winding_tables(room=21.0, rise=Body([10.0, 52.0], [60.0, 1800.0]))
    # the same winding: 0.4 ohm at 23 °C is less at 21 °C
    ohms = cooling.columns["winding_resistance"] * (234.5 + 21) / (234.5 + 23)

    decided = judged([cold, soak(), replace(cooling, columns={**cooling.columns, "winding_resistance": ohms})])

    assert value(decided) == pytest.approx(60.0, abs=0.3)


def test_cooling_without_an_ambient_is_drawn_back_towards_that_of_the_soak() -> None:
    cold, cooling = winding_tables()
    bare = replace(cooling, columns={k: v for k, v in cooling.columns.items() if k != "ambient_temperature"})

    assert value(judged([cold, soak(), bare])) == pytest.approx(60.0, abs=0.3)


JUNK = st.one_of(st.floats(0.1, 1.0), st.sampled_from([np.nan, np.inf, 0.0, -1.0, 1e300, 0.4]))


@given(
    cold=st.lists(JUNK, min_size=1, max_size=8),
    cooling=st.lists(JUNK, min_size=1, max_size=20),
    step=st.sampled_from([0.0, 1.0, 10.0, -5.0, 1e9]),
)
@settings(max_examples=60, deadline=None)
@pytest.mark.filterwarnings("ignore::RuntimeWarning")
def test_junk_of_a_winding_never_crashes(cold: list[float], cooling: list[float], step: float) -> None:
    tables = [
        Table(
            stage,
            {
                "time": 5.0 + step * np.arange(float(len(ohms))),
                "winding_resistance": np.array(ohms),
                "ambient_temperature": np.full(len(ohms), 23.0),
            },
        )
        for stage, ohms in (("cold", cold), ("cooling", cooling))
    ]

    decided = judged([tables[0], SOAK, tables[1]])

    assert decided.verdict in ("not judged", "fail", "pass")
    assert decided.verdict == "not judged" or abs(value(decided)) < 400


def test_two_coolings_of_one_soak_are_not_judged() -> None:
    cold, cooling = winding_tables()

    assert "1 soaks and 2 coolings" in judged([cold, soak(), cooling, cooling]).reason


def test_winding_temperature_by_resistance_is_held_against_its_class() -> None:
    """23 °C and 60 K: 83 °C; at the rated ambient of 40 °C 100 °C, the limit of class A in the stricter table."""
    cold, cooling = winding_tables()
    entry = "{name: hot, probe: winding, at: {load: 100 %, input: 230 V}, method: resistance, material: copper, "
    entry += "class: A, adjust: rated ambient}"
    limits = limits_from(f"  temperature:\n    - {entry}\n", head=HEAD + "  ambient: 40 °C\n", bench=BENCH)

    (outcome,) = check_temperature(limits.requirements, points_of([cold, soak(), cooling], limits)).outcomes
    decided = decide(outcome, limits.decision)

    assert outcome.high == 100.0
    assert value(decided) == pytest.approx(100.0, abs=0.3)
    assert decided.verdict == "fail"  # not shown to conform
    assert not any("thermocouple" in text for text in outcome.deviations)


def test_figure_of_the_cooling_shows_the_extrapolation() -> None:
    cold, cooling = winding_tables()
    limits = rise_limits()

    (figure,) = check_temperature_rise(limits.requirements, points_of([cold, soak(), cooling], limits)).figures

    assert [series.name for series in figure.series] == ["by resistance", "two exponentials"]
    assert figure.series[1].x[0] == 0.0
    assert figure.marks[0].y == pytest.approx(83.0, abs=0.3)
    assert figure.limits[0].y == pytest.approx(93.0, abs=0.05)
