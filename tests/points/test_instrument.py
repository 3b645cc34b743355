"""Type B: accuracy texts, shunts, converters and leads, and what points of one channel share."""

from __future__ import annotations

import math

import pytest
from hypothesis import given
from hypothesis import strategies as st

from acceptance.checks.regulation import regulation
from acceptance.errors import MeasurementError
from acceptance.limitfile.accuracy import parse_accuracy
from acceptance.limitfile.limits import Limits, Wiring
from acceptance.points.instrument import Bench, converter_step_uncertainty, rectangular, split
from acceptance.points.point import Estimate
from acceptance.points.propagation import budget, covariance, is_exact, nominal, standard_uncertainty
from tests.published.built import limits_of, points_of

ROOT3 = math.sqrt(3)
SMALL = "{main: {voltage: 12 V, current: 2 A}}"
TWO_OUTPUTS = "{main: {voltage: 12 V, current: 10 A}, aux: {voltage: 5 V, current: 2 A}}"

INSTRUMENTS = """
  output_voltage: {device: "DMM-7", accuracy: "0.05 % reading + 0.02 % range", meter_range: 60 V, resolution: 1 mV}
  input_power: {device: "PM-1", accuracy: "0.1 % reading + 0.05 W, k = 2"}
  input_voltage: {device: "PM-1", accuracy: "0.2 % reading + 0.1 V", meter_range: auto}
  input_current: {device: "DMM-3", accuracy: "0.5 % reading + 3 digits", resolution: 10 mA}
  output_current:
    device: "L-2"
    shunt: {resistance: 10 mohm, tolerance: 0.1 %, temperature_coefficient: 50 ppm/K, heating: 15 K/W}
    adc: {bits: 16, span: [-0.256 V, 0.256 V], offset: 20 uV}
  temperature: {device: "TC-4", accuracy: "1 % reading + 1.5 K"}
  ripple: {device: "scope"}
"""


@pytest.fixture(scope="module")
def limits(tmp_path_factory) -> Limits:
    """A bench of one instrument of every kind."""
    return limits_of(tmp_path_factory.mktemp("limits"), instruments=INSTRUMENTS, outputs=TWO_OUTPUTS)


@pytest.fixture
def bench(limits) -> Bench:
    return Bench(limits)


def u_of(value) -> float:
    return standard_uncertainty(value)


# --- single readings ------------------------------------------------------------------------------------------------


def test_rectangular_and_step_in_closed_form():
    """A bound over sqrt(3), a step over sqrt(12): a step is a bound of half of it."""
    assert rectangular(ROOT3) == pytest.approx(1.0)
    assert converter_step_uncertainty(2.0) == pytest.approx(rectangular(1.0))


@given(
    st.floats(-1e3, 1e3),
    st.floats(0, 1),
    st.floats(0, 1),
    st.integers(0, 50),
    st.sampled_from(["", ", k = 2", ", k = 3"]),
)
def test_split_adds_the_bounds(reading, percent, share, digits, coverage):
    """Together the parts are the whole bound, over sqrt(3) or k; the gain part is that of the reading alone."""
    text = f"{percent:.6f} % reading + {share:.6f} % range + {digits} digits + 1 mV{coverage}"
    bound_gain = float(f"{percent:.6f}") / 100 * abs(reading)
    bound = bound_gain + float(f"{share:.6f}") / 100 * 60 + digits * 0.01 + 1e-3
    divisor = float(coverage[-1]) if coverage else ROOT3

    parts = split(parse_accuracy(text, "voltage"), reading, meter_range=60.0, resolution=0.01)

    assert math.hypot(parts.gain, parts.rest) == pytest.approx(bound / divisor, rel=1e-9)
    assert parts.gain == pytest.approx(bound_gain / divisor, rel=1e-9, abs=1e-15)


@pytest.mark.parametrize("reading", [12.0, 0.0, -12.0, 60.0])
def test_correct_by_reading_and_range(bench, reading):
    """0.05 % of reading and 0.02 % of 60 V, with the last digit of 1 mV beside it."""
    value = bench.correct("output_voltage main", reading)

    bound = 0.0005 * abs(reading) + 0.0002 * 60
    assert nominal(value) == reading
    assert u_of(value) == pytest.approx(math.hypot(bound / ROOT3, 1e-3 / math.sqrt(12)))


def test_correct_by_an_expanded_uncertainty(bench):
    """k = 2: half of what is written, not a rectangle."""
    assert u_of(bench.correct("input_power", 66.0)) == pytest.approx((0.001 * 66 + 0.05) / 2)


def test_correct_by_digits_takes_the_resolution_once(bench):
    """Three digits of 10 mA are in the bound, and the step is not added again."""
    assert u_of(bench.correct("input_current", 1.2)) == pytest.approx((0.005 * 1.2 + 0.03) / ROOT3)


@pytest.mark.parametrize("current", [10.0, 1.0, 0.0, -10.0, 20.0])
def test_correct_by_shunt_and_converter(bench, current):
    """Tolerance, self-heating, offset and step, each in closed form.

    dR/R = alpha Rth I^2 R; offset and step over the resistance.
    """
    value = bench.correct("output_current main", current)

    tolerance = 0.001 * current / ROOT3
    heating = 50e-6 * 15 * current**2 * 0.01 * current / ROOT3
    offset = 20e-6 / 0.01 / ROOT3
    step = 0.512 / 2**16 / 0.01 / math.sqrt(12)
    assert nominal(value) == current
    assert u_of(value) == pytest.approx(math.sqrt(tolerance**2 + heating**2 + offset**2 + step**2))


def test_correct_by_shunt_names_its_sources(bench):
    """Each source stands in the budget by its name."""
    lines = {
        line.source.name.rpartition(": ")[2]: line.u for line in budget(bench.correct("output_current main", 20.0))
    }

    assert lines["shunt tolerance"] == pytest.approx(0.001 * 20 / ROOT3)
    assert lines["shunt self-heating"] == pytest.approx(20 * 0.003 / ROOT3)  # 4 W, 60 K, 0.30 %
    assert lines["converter and fixed parts"] == pytest.approx(
        math.hypot(2e-3 / ROOT3, 0.512 / 2**16 / 0.01 / math.sqrt(12))
    )
    assert len(lines) == 3
    assert all("L-2" in line.source.name for line in budget(bench.correct("output_current main", 20.0)))


@pytest.mark.parametrize("key", ["ripple main", "power_factor"])
def test_correct_without_accuracy_is_a_plain_number(bench, key):
    """No accuracy, or no instrument at all: no uncertainty is invented, and it is said not to be stated."""
    assert not bench.is_stated(key)
    assert bench.correct(key, 0.5) == 0.5
    assert is_exact(bench.correct(key, 0.5))


def test_is_stated_of_what_an_accuracy_is_given_for(bench):
    """By the channel's own name or its quantity's; the ambient by the probes' instrument."""
    for key in ("output_voltage aux", "output_current main", "temperature case", "ambient_temperature"):
        assert bench.is_stated(key)


@pytest.mark.parametrize(
    ("shunt", "more", "stated"),
    [
        ("{resistance: 1 ohm, tolerance: 0.1 %}", 'accuracy: "1 mA"', True),
        ("{resistance: 1 ohm, tolerance: 0.1 %}", "adc: {bits: 16, span: [0 V, 5 V]}", True),
        ("{resistance: 1 ohm}", "adc: {bits: 16, span: [0 V, 5 V]}", False),  # how good the resistor is, is not known
    ],
)
def test_is_stated_of_a_shunt(tmp_path, shunt, more, stated):
    """A shunt needs its tolerance and something that read it."""
    limits = limits_of(
        tmp_path, instruments=f'{{output_current: {{device: "L", shunt: {shunt}, {more}}}}}', outputs=SMALL
    )
    bench = Bench(limits)

    assert bench.is_stated("output_current main") is stated
    assert is_exact(bench.correct("output_current main", 1.0)) is not stated


# --- what is shared -------------------------------------------------------------------------------------------------


@given(st.floats(1, 60), st.floats(1, 60))
def test_points_of_one_channel_share_their_gain(limits, a, b):
    """Covariance of two readings: the product of their gain parts, and nothing of the rest."""
    bench = Bench(limits)
    matrix = covariance([bench.correct("output_voltage main", a), bench.correct("output_voltage main", b)])

    assert matrix[0, 1] == pytest.approx(0.0005**2 * a * b / 3, rel=1e-9)
    assert matrix[0, 0] > matrix[0, 1] * a / b


def test_shared_gain_of_opposite_readings_is_opposite(bench):
    """A gain too high makes a negative reading more negative."""
    matrix = covariance([bench.correct("output_voltage main", 10.0), bench.correct("output_voltage main", -10.0)])

    assert matrix[0, 1] == pytest.approx(-(0.0005**2) * 100 / 3)


def test_shared_gain_cancels_in_a_ratio_and_the_rest_does_not(tmp_path):
    """All gain: the ratio of two readings is exact. With a fixed part, only that remains, from both."""
    pure = Bench(limits_of(tmp_path, instruments='{output_voltage: {device: "D", accuracy: "1 % reading"}}'))
    mixed = Bench(limits_of(tmp_path, instruments='{output_voltage: {device: "D", accuracy: "1 % reading + 10 mV"}}'))
    key = "output_voltage main"

    assert u_of(pure.correct(key, 12.0) / pure.correct(key, 11.0)) == pytest.approx(0.0, abs=1e-15)

    ratio = mixed.correct(key, 12.0) / mixed.correct(key, 11.0)
    rest = [((0.01 * v + 0.01) ** 2 - (0.01 * v) ** 2) / 3 for v in (12.0, 11.0)]  # u^2 - u_gain^2
    assert u_of(ratio) == pytest.approx(12 / 11 * math.sqrt(rest[0] / 12**2 + rest[1] / 11**2), rel=1e-9)


def test_auto_range_shares_nothing(bench):
    """The range may have changed between two points: u is as it was, the covariance 0."""
    a, b = bench.correct("input_voltage", 230.0), bench.correct("input_voltage", 207.0)

    assert u_of(a) == pytest.approx((0.002 * 230 + 0.1) / ROOT3)
    assert covariance([a, b])[0, 1] == 0.0
    assert u_of(a - b) == pytest.approx(math.hypot(u_of(a), u_of(b)))


def test_shunt_is_shared_and_its_converter_is_not(bench):
    """Two currents share tolerance and temperature coefficient, each by its own heating."""
    a, b = 10.0, 4.0
    matrix = covariance([bench.correct("output_current main", a), bench.correct("output_current main", b)])

    heat = [50e-6 * 15 * i**3 * 0.01 for i in (a, b)]
    assert matrix[0, 1] == pytest.approx((0.001**2 * a * b + heat[0] * heat[1]) / 3)


@pytest.mark.parametrize(
    ("one", "other"),
    [
        ("output_voltage main", "output_voltage aux"),
        ("output_current main", "output_current aux"),
        ("temperature case", "temperature core"),
        ("temperature case", "ambient_temperature"),
        ("input_power", "input_current"),
    ],
)
def test_two_channels_share_nothing(bench, one, other):
    """Not even where one instrument is named for both."""
    assert covariance([bench.correct(one, 20.0), bench.correct(other, 20.0)])[0, 1] == 0.0


def test_two_benches_share_nothing(limits):
    """Another unit's log has errors of its own."""
    readings = [Bench(limits).correct("output_voltage main", 12.0) for _ in range(2)]

    assert covariance(readings)[0, 1] == 0.0


def test_lead_is_the_same_error_wherever_it_enters(bench):
    """Once a resistance, at all points; another one for another output and for the input."""
    wiring = Wiring(0.012, 0.002)
    main, again = bench.lead("output", "main", wiring), bench.lead("output", "main", wiring)

    assert nominal(main) == 0.012
    assert u_of(main) == pytest.approx(0.002 / ROOT3)
    assert u_of(main - again) == 0.0
    for side, output in (("output", "aux"), ("input", "")):
        assert covariance([main, bench.lead(side, output, wiring)])[0, 1] == 0.0


@pytest.mark.parametrize("bound", [None, 0.0])
def test_lead_without_a_bound_is_a_plain_number(bench, bound):
    """Nothing is invented where no bound is written."""
    assert bench.lead("output", "main", Wiring(0.012, bound)) == 0.012


# --- through points -------------------------------------------------------------------------------------------------


def dwell(voltage: float, current: float) -> dict[str, list[float]]:
    return {"output_voltage main": [voltage] * 3, "output_current main": [current] * 3}


def test_regulation_is_free_of_the_shared_gain(tmp_path):
    """A voltmeter 1 % wrong in gain: the regulation of 1 % is 0.01 % uncertain, and exact over a voltage it read."""
    meter = '{device: "D", accuracy: "1 % reading"}'
    points = points_of(
        limits_of(tmp_path, instruments=f"{{output_voltage: {meter}}}"), [dwell(12.12, 0.0), dwell(12.0, 10.0)]
    )
    voltages = [point.voltage("main") for point in points.steady]

    measured = regulation(voltages, voltages[1])
    over_rated = regulation(voltages, Estimate(12.0))

    assert measured.nominal == pytest.approx(0.01)
    assert u_of(measured.value) == pytest.approx(0.0, abs=1e-12)
    assert u_of(over_rated.value) == pytest.approx(0.01 * 0.01 / ROOT3, rel=1e-6)


def test_regulation_shares_the_leads(tmp_path):
    """Leads of 12 +- 3 mohm: no current, no drop; at 10 A the drop's whole uncertainty enters the difference."""
    exact = '{device: "D", accuracy: "0.0001 % reading"}'
    limits = limits_of(
        tmp_path,
        instruments=f"{{output_voltage: {exact}, output_current: {exact}}}",
        leads="{output: 12 mohm ± 3 mohm}",
    )
    points = points_of(limits, [dwell(12.10, 0.0), dwell(11.90, 10.0), dwell(11.90, 10.0)])
    none, full, again = (point.voltage("main") for point in points.steady)

    assert full.nominal == pytest.approx(12.02)
    assert u_of(none.value - full.value) == pytest.approx(10 * 0.003 / ROOT3, rel=1e-3)
    assert u_of(full.value - again.value) < 1e-4  # of one resistance, which cancels


def test_regulation_of_a_negative_rail_is_a_magnitude():
    """-12.10 V and -11.95 V over -12 V: 1.25 %, as of the positive rail."""
    value = regulation([Estimate(-12.10), Estimate(-11.95)], Estimate(-12.0))

    assert value.nominal == pytest.approx(0.0125)


def test_regulation_over_nothing_is_refused():
    """A reference of 0 V gives no ratio: an error of the package, not a division."""
    with pytest.raises(MeasurementError, match="reference"):
        regulation([Estimate(0.1), Estimate(0.2)], Estimate(0.0))
