"""Temperature: change of resistance, ambient adjustment, classes, and fits of curves that rise to a level."""

from __future__ import annotations

import math
from collections.abc import Callable

import numpy as np
import pytest
from numpy.typing import NDArray

from acceptance.checks.temperature import check_temperature
from acceptance.limitfile.insulation import insulation_class
from acceptance.thermal.exponentials import Curve, best_curve, fit_curve
from acceptance.thermal.resistance import MATERIALS, temperature_by_resistance, to_switch_off, winding_rise
from tests.checks.built import HEAD, limits_from
from tests.published.digits import last_digit
from tests.thermal_logs import HOUR, Body, Room, Thermometer, points_of, soak_table

Floats = NDArray[np.float64]

# --- change of resistance -------------------------------------------------------------------------------------------

COPPER = MATERIALS["copper"].constant


def test_winding_rise_reproduces_a_teaching_example_of_iec_61558_1_14_2() -> None:
    """80 ohm at 20 °C, 100 ohm warm: rise 63.63 K, winding 83.63 °C (physicsforums.com/threads/381286)."""
    assert winding_rise(80.0, 100.0, start=20.0, end=20.0, constant=COPPER) == pytest.approx(63.63, abs=0.006)
    assert temperature_by_resistance(80.0, 100.0, start=20.0, constant=COPPER) == pytest.approx(83.63, abs=0.006)


def test_winding_rise_reproduces_a_ratio_of_a_transformer_course() -> None:
    """R2/R1 = 96/90 from 35.5 °C: 53.5 °C, rise 18 K (block.tw/question/1/30)."""
    assert temperature_by_resistance(90.0, 96.0, start=35.5, constant=COPPER) == pytest.approx(53.5, abs=0.05)
    assert winding_rise(90.0, 96.0, start=35.5, end=35.5, constant=COPPER) == pytest.approx(18.0, abs=0.05)


def test_winding_temperature_reproduces_an_examination_question() -> None:
    """20 ohm at 25 °C is 24.6 ohm at 85 °C (yamol.tw/item-1340196)."""
    assert temperature_by_resistance(20.0, 24.6, start=25.0, constant=COPPER) == pytest.approx(85.0, abs=0.4)
    # the other way, to the digit printed: R2 = 20 (234.5 + 85)/(234.5 + 25)
    back = 20 * (COPPER + 85) / (COPPER + 25)
    assert back == pytest.approx(24.6, abs=0.05)


@pytest.mark.parametrize(("constant", "rise"), [(234.5, "53.65"), (225.0, "51.56"), (228.0, "52.22"), (229.0, "52.44")])
def test_winding_rise_by_the_constants_in_use(constant: float, rise: str) -> None:
    """R2/R1 = 1.22, t1 23 °C, t2 26 °C, calculated: 0.22 (K + 23) - 3."""
    found = winding_rise(1.0, 1.22, start=23.0, end=26.0, constant=constant)

    assert found == pytest.approx(float(rise), rel=0, abs=0.5 * last_digit(rise) + 1e-9)


def test_constants_are_those_of_the_sources() -> None:
    """Copper 234.5 in all sources; aluminium 225, 228 and 229, of which all lie within the stated bound."""
    aluminium = MATERIALS["aluminium"]

    assert MATERIALS["copper"].constant == 234.5
    assert MATERIALS["copper"].bound == 0.0
    assert all(abs(value - aluminium.constant) <= aluminium.bound for value in (225.0, 228.0, 229.0))


# --- cooling, drawn back to switch-off ------------------------------------------------------------------------------

# T(t) = 25 + 10 exp(-t/60 s) + 65 exp(-t/1800 s), 100 °C at switch-off; readings and what each way of drawing back
# gives were calculated, no printed value seen.
TIME = np.arange(15.0, 121.0, 15.0)
READ = ["97.249", "94.991", "93.119", "91.548", "90.212", "89.061", "88.055", "87.161"]
RATIO = ["1.28834", "1.27958", "1.27231", "1.26621", "1.26102", "1.25655", "1.25264", "1.24917"]
RISES = np.array([float(text) for text in READ]) - 25.0


def straight(count: int) -> float:
    return float(np.polyfit(TIME[:count], RISES[:count], 1)[-1])


def log_linear(count: int) -> float:
    return math.exp(float(np.polyfit(TIME[:count], np.log(RISES[:count]), 1)[-1]))


def parabola() -> float:
    return float(np.polyfit(TIME, RISES, 2)[-1])


@pytest.mark.parametrize(
    ("way", "error"),
    [
        pytest.param(lambda: RISES[0], "-2.75", id="first reading"),
        pytest.param(lambda: straight(8), "-2.21", id="straight, all"),
        pytest.param(lambda: straight(4), "-1.03", id="straight, first four"),
        pytest.param(lambda: log_linear(8), "-2.02", id="log-linear, all"),
        pytest.param(lambda: log_linear(4), "-0.91", id="log-linear, first four"),
        pytest.param(parabola, "-0.55", id="parabola"),
    ],
)
def test_ways_that_the_curve_escapes_end_too_low(way: Callable[[], float], error: str) -> None:
    """What each simple way of drawing the vector back would cost: the reason for two exponentials."""
    assert way() - 75.0 == pytest.approx(float(error), abs=0.006)


def test_switch_off_is_found_by_two_exponentials() -> None:
    found = to_switch_off(TIME, RISES)

    assert found.method == "two exponentials"
    assert found.rise - 75.0 == pytest.approx(0.0, abs=0.005)
    # the readings are rounded to 1 mK; what a parabola in the logarithm makes of the first half is the bound
    assert found.u < 0.5


def test_resistance_ratios_of_the_vector_are_its_temperatures() -> None:
    """R/R1 at t1 = 23 °C, five decimals: 1e-5 is 2.6 mK."""
    found = temperature_by_resistance(1.0, np.array([float(text) for text in RATIO]), start=23.0, constant=COPPER)

    assert found == pytest.approx(RISES + 25.0, abs=0.002)


# --- fits -----------------------------------------------------------------------------------------------------------

# NIST StRD, nonlinear regression, y = b1 (1 - exp(-b2 x)): the form of a rise with the time constant 1/b2. Certified
# files read at github.com/lmfit/lmfit-py NIST_STRD/BoxBOD.dat and Misra1a.dat.
BOXBOD = ([1, 2, 3, 5, 7, 10], [109, 149, 149, 191, 213, 224])
MISRA1A = (
    [77.6, 114.9, 141.1, 190.8, 239.9, 289.0, 332.8, 378.4, 434.8, 477.3, 536.8, 593.1, 689.1, 760.0],
    [10.07, 14.73, 17.94, 23.93, 29.61, 35.18, 40.02, 44.82, 50.76, 55.05, 61.01, 66.40, 75.47, 81.78],
)


@pytest.mark.parametrize(
    ("data", "b1", "b2", "sd", "rss"),
    [
        pytest.param(
            BOXBOD, "213.80940889", "0.54723748542", ("12.354515176", "0.10455993237"), "1168.0088766", id="BoxBOD"
        ),
        pytest.param(
            MISRA1A,
            "238.94212918",
            "5.5015643181e-4",
            ("2.7070075241", "7.2668688436e-6"),
            "0.12455138894",
            id="Misra1a",
        ),
    ],
)
def test_fit_curve_reproduces_strd_from_a_start_that_the_data_give(
    data: tuple[list[float], list[float]], b1: str, b2: str, sd: tuple[str, str], rss: str
) -> None:
    """Plain least squares from the published start (1, 1) ends at 172.5 and 87.9 for BoxBOD, without an error."""
    curve = fit_curve(np.array(data[0], dtype=float), np.array(data[1], dtype=float), kind="from zero")

    assert curve is not None
    assert curve.level == pytest.approx(float(b1), rel=1e-7)
    assert 1 / curve.slowest == pytest.approx(float(b2), rel=1e-7)
    assert curve.rss == pytest.approx(float(rss), rel=1e-8)
    # the certified deviations are those of independent residuals
    independent = np.sqrt(np.diag(curve.covariance) / curve.inflation)
    assert independent[0] == pytest.approx(float(sd[0]), rel=1e-6)
    assert independent[1] / curve.slowest == pytest.approx(float(sd[1]), rel=1e-6)


# calculated: 30 (1 - exp(-t/5 min)) + 30 (1 - exp(-t/60 min)). That one exponential is always low is published
# (m.diangongwu.com/dgjc/17227: heating curves predicted from their early part).
def two_parts(time: Floats) -> Floats:
    return 60 - 30 * np.exp(-time / 5) - 30 * np.exp(-time / 60)


def test_one_exponential_of_the_first_hour_ends_far_too_low() -> None:
    """45.9 K instead of 60 K."""
    time = np.linspace(0.0, 60.0, 241)

    curve = fit_curve(time, two_parts(time), kind="from zero")

    assert curve is not None
    assert curve.level == pytest.approx(45.9, abs=0.06)


@pytest.mark.parametrize("kind", ["from zero", "free"])
def test_two_exponentials_of_four_hours_are_recovered(kind: str) -> None:
    """30 K of 5 min and 30 K of 60 min."""
    time = np.linspace(0.0, 240.0, 481)

    curve = best_curve(time, two_parts(time), kind=kind)  # type: ignore[arg-type]

    assert isinstance(curve, Curve)
    assert curve.taus == pytest.approx((5.0, 60.0), rel=1e-6)
    assert np.abs(curve.parts) == pytest.approx([30.0, 30.0], rel=1e-6)
    assert curve.level == pytest.approx(60.0, rel=1e-6)


# --- ambient and classes --------------------------------------------------------------------------------------------


def test_temperature_adjusts_to_the_rated_ambient_as_iec_60950_1_1_4_12() -> None:
    """Tmax 110 °C, Tma 40 °C, measured at 27.2 °C: 97.2 °C is allowed, so that 97.2 °C is just 110 °C.

    T <= Tmax + Tamb - Tma (IEC 60950-1:2005, 1.4.12.1 and .2; the inequality from memory, the numbers calculated).
    """
    entry = "{name: hot, probe: core, at: {load: 100 %, input: 230 V}, max: 110 °C, adjust: rated ambient}"
    bench = '\ninstruments:\n  temperature: {device: T1, accuracy: "0.5 K"}\n'
    limits = limits_from(f"  temperature:\n    - {entry}\n", head=HEAD + "  ambient: 40 °C\n", bench=bench)
    quiet = Thermometer(noise=0.001, step=0.0)
    table = soak_table({"core": Body([70.0], [600.0])}, lasts=4 * HOUR, room=Room(base=27.2), thermometer=quiet)

    (outcome,) = check_temperature(limits.requirements, points_of([table], limits)).outcomes

    (candidate,) = outcome.candidates
    assert candidate.estimate is not None
    assert table.columns["temperature core"][-1] == pytest.approx(97.2, abs=0.01)
    assert candidate.estimate.nominal == pytest.approx(110.0, abs=0.01)
    assert "adjusted to an ambient of 40 °C" in outcome.condition


def test_ambient_rated_below_25_degrees_counts_as_25() -> None:
    """Tma is the maximum rated ambient or 25 °C, whichever is greater (IEC 60950-1, 1.4.12.2, from memory)."""
    entry = "{name: hot, probe: core, at: {load: 100 %, input: 230 V}, max: 110 °C, adjust: rated ambient}"
    limits = limits_from(f"  temperature:\n    - {entry}\n", head=HEAD + "  ambient: 20 °C\n", bench="")
    table = soak_table({"core": Body([50.0], [600.0])}, lasts=4 * HOUR)

    (outcome,) = check_temperature(limits.requirements, points_of([table], limits)).outcomes

    assert outcome.candidates[0].estimate is not None
    assert outcome.candidates[0].estimate.nominal == pytest.approx(75.0, abs=0.1)


# IEC 60085 class temperatures (a maker's table and de-academic.com/dic.nsf/dewiki/667932) and largest winding
# temperatures of small transformers (EN 61558-1, as makers quote it; that of class 200 from memory).
@pytest.mark.parametrize(
    ("name", "temperature", "winding"),
    [("A", 105, 100), ("E", 120, 115), ("B", 130, 120), ("F", 155, 140), ("H", 180, 165), ("200", 200, 180)],
)
def test_classes_reproduce_iec_60085_and_en_61558_1(name: str, temperature: float, winding: float) -> None:
    for written in (name, name.lower(), str(temperature), f"class {name}"):
        found = insulation_class(written)

        assert found is not None
        assert (found.temperature, found.winding) == (temperature, winding)
        assert found.winding < found.temperature
