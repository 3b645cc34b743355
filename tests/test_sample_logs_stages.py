"""The stages of the sample logs beside the steady one: overload, soak and windings are physically sound."""

from __future__ import annotations

import math
from datetime import UTC, datetime

import numpy as np
import pytest

from tests.sample_truth import BEYOND_STEADY, RECOVERY_BANDS, made, true_recovery

# isort: split
from workshop.overload import ConstantCurrent, Foldback, Hiccup, Limiter, LoadStep, OverloadRun, Supply
from workshop.products import Network
from workshop.runs import FILES
from workshop.soak import COPPER, Room, SoakRun, Winding, WindingRun, rises_in
from workshop.units import ADAPTER_WINDING, CONVERTER_WINDING

OVERLOADS = ["A-17_overcurrent.csv", "B-203.xlsx", "B-206_overcurrent.tsv", "D-0416_overcurrent.csv"]
OVERLOADS += ["D-0417_overcurrent.csv"]
SOAKS = ["A-17_thermal.csv", "B-203_thermal.txt", "B-206_thermal.tsv", "D-0416_thermal.csv"]
WINDINGS = [(unit, stage) for unit in ("A-17", "D-0416") for stage in ("cold", "cooling")]
HALF_AN_HOUR = 1800.0  # s


def overload_of(name: str) -> OverloadRun:
    """The sweep behind a log."""
    run = made(name).overload
    assert run is not None
    return run


def soak_of(name: str) -> SoakRun:
    """The soak behind a log."""
    run = made(name).soak
    assert run is not None
    return run


def winding_of(name: str) -> WindingRun:
    """The winding's readings behind a log."""
    run = made(name).winding
    assert run is not None
    return run


def traced(limiter: Limiter, steps: list[LoadStep], *, rate: float = 100.0) -> tuple[np.ndarray, np.ndarray]:
    """Volts and amperes of a 24 V source with a droop of 40 mohm, taken through steps."""
    times = [np.arange(round(step.seconds * rate)) / rate for step in steps]
    parts = limiter.trace(Supply(24.0, 0.04), steps, times)
    return np.concatenate([volts for volts, _ in parts]), np.concatenate([amperes for _, amperes in parts])


def test_every_stage_file_is_tested_here() -> None:
    beyond = {name for name in FILES if any(stage in name for stage in BEYOND_STEADY)}

    tested = {*OVERLOADS, *SOAKS, *(f"{unit}_{stage}.csv" for unit, stage in WINDINGS)}
    assert beyond == tested - {"B-203.xlsx"}


# --- limiters ---------------------------------------------------------------------------------------------------------


@pytest.mark.parametrize("load", [100.0, 9.6, 8.0])
@pytest.mark.parametrize("limiter", [ConstantCurrent(3.2), Foldback(3.2, 1.0), Hiccup(3.2, 3.6, 1.0, 0.3)])
def test_limiters_leave_rated_loads_alone(limiter: Limiter, load: float) -> None:
    volts, amperes = traced(limiter, [LoadStep(load, 1.0)])

    assert volts == pytest.approx(np.full(100, 24.0 * load / (load + 0.04)))
    assert amperes * load == pytest.approx(volts)


def test_constant_current_holds_through_to_a_short() -> None:
    limiter = ConstantCurrent(limit=3.2, slope=0.001)
    for load in (5.0, 1.0, 0.05):
        volts, amperes = traced(limiter, [LoadStep(load, 0.1)])

        assert amperes == pytest.approx(3.2 + 0.001 * (24.0 - volts))
        assert volts == pytest.approx(load * amperes)


@pytest.mark.parametrize(("load", "volts"), [(4.0, 12.0), (8.0 / 3, 6.0), (1e-6, 0.0)])
def test_foldback_meets_the_line_from_knee_to_short(load: float, volts: float) -> None:
    # I = 2 A + (4 A - 2 A) V / 24 V: 3 A at 12 V, 2.5 A at 6 V ... seen through the resistor of V / I
    limiter = Foldback(knee=4.0, short=2.0)
    resistor = load if volts == 0 else volts / (2.0 + volts / 12.0)

    seen_volts, seen_amperes = traced(limiter, [LoadStep(resistor, 0.1)])

    assert seen_volts == pytest.approx(np.full(10, volts), abs=1e-5)
    assert seen_amperes == pytest.approx(np.full(10, 2.0 + volts / 12.0), rel=1e-5)


def test_load_in_cv_mode_takes_what_the_limiter_gives_at_its_voltage() -> None:
    limiter = Foldback(knee=4.0, short=2.0)
    for setting, amperes in ((24.5, 0.0), (23.96, 1.0), (12.0, 3.0), (0.0, 2.0)):
        volts, current = traced(limiter, [LoadStep(setting, 0.1, "CV")])

        assert current == pytest.approx(np.full(10, amperes))
        assert volts == pytest.approx(np.full(10, min(setting, 24.0)))


def test_hiccup_bursts_once_a_period() -> None:
    limiter = Hiccup(onset=3.1, burst=3.6, period=1.4, on=0.3)

    volts, amperes = traced(limiter, [LoadStep(100.0, 1.0), LoadStep(5.0, 14.0)], rate=20.0)

    assert ((volts[20:] > 0) & (volts[19:-1] == 0)).sum() == 9  # the first one follows on the regulated output
    assert amperes.max() == pytest.approx(3.6)
    assert (amperes[20:] > 0).mean() == pytest.approx(0.3 / 1.4, abs=0.02)


def test_hiccup_comes_back_with_the_next_try() -> None:
    limiter = Hiccup(onset=3.1, burst=3.6, period=1.0, on=0.2, rise=0.05)

    # tripped for 2.5 s, so that the next try is 0.5 s away; then 24 V exponentially
    volts, _ = traced(limiter, [LoadStep(9.6, 1.0), LoadStep(5.0, 2.5), LoadStep(9.6, 2.0)], rate=100.0)

    back = volts[350:]
    settled = 24.0 * 9.6 / 9.64
    assert not back[:50].any()
    assert back[50:60] == pytest.approx(settled * (1 - np.exp(-np.arange(10) / 5)), abs=1e-6)
    assert back[-1] == pytest.approx(settled)


def test_return_from_a_limited_current_is_exponential() -> None:
    limiter = ConstantCurrent(limit=3.2, rise=0.05)

    volts, _ = traced(limiter, [LoadStep(1.0, 1.0), LoadStep(9.6, 1.0)], rate=100.0)

    settled = 24.0 * 9.6 / 9.64
    assert volts[100] == pytest.approx(3.2)
    assert volts[105] == pytest.approx(settled - (settled - 3.2) / math.e)


# --- overload logs ----------------------------------------------------------------------------------------------------


@pytest.mark.parametrize("name", OVERLOADS)
def test_overload_conserves_energy_at_every_sample(name: str) -> None:
    product, truth = made(name).product, overload_of(name).truth
    port = product.outputs["main"]
    for volts, amperes, power in (
        truth[["output_voltage", "output_current", "input_power"]].drop_duplicates().to_numpy()
    ):
        fixed = product.fixed_loss if amperes or product.standby is None else product.standby

        loss = fixed + port.linear_loss * amperes + port.square_loss * amperes**2
        assert power - volts * amperes == pytest.approx(loss)


@pytest.mark.parametrize("name", OVERLOADS)
def test_overload_lies_on_the_load_line_and_below_the_branch(name: str) -> None:
    run = overload_of(name)
    truth, supply = run.truth, run.supply
    resistors = truth["mode"] == "CR"

    assert truth["output_voltage"][resistors].to_numpy() == pytest.approx(
        (truth["setting"] * truth["output_current"])[resistors].to_numpy()
    )
    unlimited = supply.voltage - supply.resistance * truth["output_current"]
    assert (truth["output_voltage"] <= unlimited + 1e-9).all()
    assert (truth["output_voltage"] >= 0).all()


@pytest.mark.parametrize("name", OVERLOADS)
def test_overload_readings_lie_within_the_instruments_accuracy(name: str) -> None:
    log, run = made(name), overload_of(name)
    current = run.truth["output_current"]
    truths = {
        "output_current main": current,
        "output_voltage main": run.truth["output_voltage"] - log.bench.leads * current,
        "input_power": run.truth["input_power"],
    }
    for key, truth in truths.items():
        meter = log.bench.meter(key)
        if meter is None:  # no wattmeter where the input is d.c.
            continue
        bound = meter.gain * truth.abs() + meter.offset + 6 * np.hypot(meter.noise, meter.relative_noise * truth)
        assert ((run.samples[key] - truth).abs() <= bound + meter.step).all(), key


@pytest.mark.parametrize("name", OVERLOADS)
def test_overload_is_seen_from_full_load_to_a_short_and_back(name: str) -> None:
    log, run = made(name), overload_of(name)
    port = log.product.outputs["main"]
    share = run.truth["output_voltage"] / port.rated_voltage
    before, back = run.truth["time"] < run.removed, run.truth["time"] >= run.removed

    regulated = run.truth["output_current"][before & (share > 0.98)]
    assert (regulated.drop_duplicates() <= port.rated_current).sum() >= 2
    assert regulated.max() > port.rated_current
    assert (share[before] < 0.05).sum() >= 10
    assert share[back].iloc[-10:].min() > 0.99
    assert 0.4 < run.truth["output_current"].iloc[-1] / port.rated_current <= 1.01


@pytest.mark.parametrize("name", ["B-203.xlsx", "B-206_overcurrent.tsv", "D-0417_overcurrent.csv"])
def test_constant_current_stays_within_5_percent_over_its_range(name: str) -> None:
    run, rated = overload_of(name), made(name).product.outputs["main"].rated_voltage
    share = run.truth["output_voltage"] / rated
    held = run.truth[(share > 0.1) & (share < 0.9) & (run.truth["time"] < run.removed)]

    assert held["setting"].nunique() >= 5
    assert held["output_current"].max() / held["output_current"].min() < 1.05


def test_foldback_line_runs_from_the_knee_to_the_short() -> None:
    run, port = overload_of("D-0416_overcurrent.csv"), made("D-0416_overcurrent.csv").product.outputs["main"]
    limiter = run.limiter
    assert isinstance(limiter, Foldback)
    share = run.truth["output_voltage"] / port.rated_voltage
    folded = run.truth[(share < 0.98) & (run.truth["time"] < run.removed)]

    slope, short = np.polyfit(folded["output_voltage"], folded["output_current"], 1)
    assert folded["setting"].nunique() >= 8
    assert ((share > 0.1) & (share < 0.9)).sum() >= 5 * 20  # five settings of 20 samples
    assert short == pytest.approx(limiter.short)
    assert short + slope * run.supply.voltage == pytest.approx(limiter.knee)
    assert limiter.short < 0.5 * limiter.knee
    assert port.rated_current < limiter.knee


def test_bursts_are_sampled_often_enough_to_be_counted() -> None:
    run = overload_of("A-17_overcurrent.csv")
    limiter, times = run.limiter, run.truth["time"].to_numpy()
    assert isinstance(limiter, Hiccup)
    interval = float(np.diff(times).max())
    amperes = run.samples["output_current main"].to_numpy()
    overloads = [s for s in run.steps if run.supply.meets(s)[1] > limiter.onset]
    begins = sum(step.seconds for step in run.steps[:-1] if step not in overloads)
    here = (times > begins) & (times < run.removed)

    rising = times[1:][(amperes[1:] > 1.0) & (amperes[:-1] < 1.0) & here[1:]]
    assert interval <= limiter.period / 10
    assert limiter.on > 3 * interval  # so that the height of a burst is seen
    assert min(step.seconds for step in overloads) > 5 * limiter.period
    assert len(rising) == math.floor((run.removed - begins) / limiter.period)  # the first one has no rise of its own
    assert np.median(np.diff(rising)) == pytest.approx(limiter.period, abs=interval)


@pytest.mark.parametrize(("name", "within"), [(name, 3.0 if name.startswith("A-") else 1.0) for name in OVERLOADS])
def test_recovery_is_seen_where_the_closed_form_says(name: str, within: float) -> None:
    run, rated = overload_of(name), made(name).product.outputs["main"].rated_voltage
    band = RECOVERY_BANDS[made(name).product.name]
    back = run.truth[run.truth["time"] >= run.removed]
    since = back["time"].to_numpy() - run.removed
    interval = since[1] - since[0]
    in_band = (back["output_voltage"] / rated - 1).abs().to_numpy() <= band

    truth = true_recovery(run, rated * (1 - band))
    first = since[in_band][0]
    assert in_band[in_band.argmax() :].all()
    assert truth - 1e-9 <= first <= truth + interval
    assert interval < within / 2
    assert 0.05 < truth < within - 2 * interval


# --- soaks ------------------------------------------------------------------------------------------------------------


@pytest.mark.parametrize("name", SOAKS)
def test_heat_of_a_soak_is_stored_or_given_to_the_room(name: str) -> None:
    heat, run = made(name).product.heat, soak_of(name)
    time, ambient = run.truth["time"].to_numpy(), run.truth["ambient_temperature"].to_numpy()
    core, case = run.truth["rise core"].to_numpy(), run.truth["rise case"].to_numpy()

    stored = heat.core_capacity * (core + ambient - ambient[0]) + heat.case_capacity * (case + ambient - ambient[0])
    given = np.concatenate(([0.0], np.cumsum(np.diff(time) * (case[1:] + case[:-1]) / 2))) / heat.case_to_ambient
    assert stored + given == pytest.approx(run.power * time, rel=2e-3, abs=2.0)
    electric = run.truth["input_power"] - run.truth["output_voltage"] * run.truth["output_current"]
    assert electric.to_numpy() == pytest.approx(np.full(len(time), run.power))


@pytest.mark.parametrize("name", SOAKS)
def test_soak_is_a_sum_of_two_exponentials_in_every_leg_of_the_room(name: str) -> None:
    heat, run = made(name).product.heat, soak_of(name)
    slow, fast = heat.rates()
    time = run.truth["time"].to_numpy()
    kinks = np.flatnonzero(np.abs(np.diff(run.truth["ambient_temperature"], 2)) > 1e-9) + 1
    edges = [0, *kinks.tolist(), len(time)]
    for first, stop in zip(edges, edges[1:], strict=False):
        leg = time[first:stop] - time[first]
        basis = np.column_stack([np.ones_like(leg), np.exp(-slow * leg), np.exp(-fast * leg)])
        for rise in ("rise core", "rise case"):
            seen = run.truth[rise].to_numpy()[first:stop]
            parts, *_ = np.linalg.lstsq(basis, seen, rcond=None)

            assert basis @ parts == pytest.approx(seen, abs=1e-6)
            if first == 0:  # one of them alone would not do
                assert abs(parts[1]) > 5.0
                assert abs(parts[2]) > (5.0 if rise == "rise core" else 0.5)
    assert fast > 4 * slow


def test_rises_lag_behind_a_room_that_warms() -> None:
    heat, room = Network(3.5, 4.4, 95.0, 380.0), Room((0.0, 36000.0), (20.0, 30.0))

    rises = rises_in(room, heat, 7.2, seconds=np.array([35900.0, 2e5]), start=np.zeros(2))

    drift = 10.0 / 36000.0  # what warms the bodies with the room is not given to it
    assert rises[0, 1] == pytest.approx(7.2 * 4.4 - 4.4 * 475.0 * drift, abs=1e-3)
    assert rises[1] == pytest.approx([7.2 * 7.9, 7.2 * 4.4])


@pytest.mark.parametrize("name", SOAKS)
def test_soak_readings_lie_within_the_instruments_accuracy(name: str) -> None:
    log, run = made(name), soak_of(name)
    ambient = run.truth["ambient_temperature"]
    truths = {"ambient_temperature": ambient, "output_current main": run.truth["output_current"]}
    truths |= {f"temperature {probe}": ambient + run.truth[f"rise {probe}"] for probe in ("core", "case")}
    for key, truth in truths.items():
        meter = log.bench.meter(key)
        assert meter is not None
        bound = meter.gain * truth.abs() + meter.offset + 6 * meter.noise + meter.step
        assert ((run.samples[key] - truth).abs() <= bound).all(), key


@pytest.mark.parametrize("name", ["A-17_thermal.csv", "B-203_thermal.txt", "D-0416_thermal.csv"])
def test_soak_has_settled_in_a_room_that_drifts_by_a_kelvin(name: str) -> None:
    log, run = made(name), soak_of(name)
    ambient = run.truth["ambient_temperature"]
    last = run.truth[run.truth["time"] >= run.truth["time"].iloc[-1] - HALF_AN_HOUR]

    assert 0.8 <= ambient.max() - ambient.min() <= 1.2
    for rise, settled in zip(("rise core", "rise case"), log.product.heat.settled(run.power), strict=True):
        assert abs(last[rise].iloc[-1] - last[rise].iloc[0]) < 0.1
        assert last[rise].iloc[-1] == pytest.approx(settled, abs=0.3)  # less what the drift keeps back


def test_stopped_soak_has_not_settled_and_would_exceed_its_limit() -> None:
    log, run, limit = made("B-206_thermal.tsv"), soak_of("B-206_thermal.tsv"), 35.0
    slow, _ = log.product.heat.rates()
    last = run.truth[run.truth["time"] >= run.truth["time"].iloc[-1] - HALF_AN_HOUR]["rise case"]

    assert 1 / slow == pytest.approx(42 * 60, abs=150)  # a time constant of about 42 min, stopped after 50 min
    assert run.truth["time"].iloc[-1] == 50 * 60
    assert last.iloc[-1] - last.iloc[0] > 5.0  # where 1 K is allowed
    assert last.iloc[-1] < limit - 3.0
    assert log.product.heat.settled(run.power)[1] > limit + 3.0


# --- windings ---------------------------------------------------------------------------------------------------------


def test_winding_doubles_where_copper_does() -> None:
    winding = Winding(resistance=0.4)

    assert winding.at(np.array([20.0, COPPER + 40])) == pytest.approx([0.4, 0.8])


@pytest.mark.parametrize(("unit", "stage"), WINDINGS)
def test_winding_is_read_within_its_meters_accuracy(unit: str, stage: str) -> None:
    name = f"{unit}_{stage}.csv"
    log, run = made(name), winding_of(name)
    meter = log.bench.meter("winding_resistance")
    assert meter is not None

    truth = run.truth["winding_resistance"]
    bound = meter.gain * truth + meter.offset + 6 * meter.noise + meter.step
    assert ((run.samples["winding_resistance"] - truth).abs() <= bound).all()


@pytest.mark.parametrize(
    ("unit", "at_20"), [("A-17", ADAPTER_WINDING.resistance), ("D-0416", CONVERTER_WINDING.resistance)]
)
def test_winding_cools_from_where_the_soak_ended(unit: str, at_20: float) -> None:
    soak, cold, cooling = (made(f"{unit}_{stage}.csv") for stage in ("thermal", "cold", "cooling"))
    assert soak.soak is not None
    assert cold.winding is not None
    assert cooling.winding is not None
    heat, ended = soak.product.heat, soak.soak.ended
    slow, fast = heat.rates()
    truth = cooling.winding.truth
    hot = truth["winding_resistance"] / at_20 * (COPPER + 20) - COPPER - truth["ambient_temperature"]

    # the two exponentials that are left without power, through the readings and back to switch-off
    time = truth["time"].to_numpy()
    basis = np.column_stack([np.exp(-slow * time), np.exp(-fast * time)])
    parts, *_ = np.linalg.lstsq(basis, hot.to_numpy(), rcond=None)
    assert parts.sum() == pytest.approx(ended[0], abs=1e-3)
    assert basis @ parts == pytest.approx(hot.to_numpy(), abs=1e-4)
    assert (np.diff(hot) < 0).all()
    assert time[0] < 0.1 / fast  # soon enough
    # cold: all at the temperature of the room in which the soak then begins
    at_room = cold.winding.truth["winding_resistance"] / at_20 * (COPPER + 20) - COPPER
    assert at_room.to_numpy() == pytest.approx(np.full(len(at_room), soak.soak.truth["ambient_temperature"][0]))


# --- order ------------------------------------------------------------------------------------------------------------


def test_stages_of_the_adapter_follow_one_another() -> None:
    last = datetime.min.replace(tzinfo=UTC)
    for stage in ("steady", "overcurrent", "thermal"):
        rows = made(f"A-17_{stage}.csv").data.decode().splitlines()
        stamps = [datetime.fromisoformat(row.partition(",")[0]) for row in rows if row[:2] == "20"]

        assert last < stamps[0] < stamps[-1]
        last = stamps[-1]


@pytest.mark.parametrize("name", [name for name in OVERLOADS + SOAKS if not name.endswith("xlsx")])
def test_stage_file_has_a_row_for_every_sample(name: str) -> None:
    log = made(name)
    run = log.overload or log.soak
    assert run is not None

    rows = [row for row in log.data.decode("utf-8-sig").splitlines() if row[:1].isdigit()]
    assert len(rows) == len(run.samples)
