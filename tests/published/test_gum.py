"""Uncertainty against the examples of JCGM 100:2008, the Guide to the expression of uncertainty in measurement."""

from __future__ import annotations

import math

import numpy as np
import pytest
from uncertainties import umath

from acceptance.limitfile.accuracy import parse_accuracy
from acceptance.points.instrument import Bench, converter_step_uncertainty, rectangular, split
from acceptance.points.propagation import (
    Source,
    budget,
    covariance,
    coverage_factor,
    effective_degrees_of_freedom,
    expanded,
    nominal,
    of_source,
    standard_uncertainty,
)
from acceptance.points.type_a import type_a
from tests.published.built import limits_of
from tests.published.digits import last_digit, printed

MICRO = 1e-6
NANO = 1e-9  # m


def test_last_digit_is_that_of_the_text():
    """The tolerance follows what was printed, trailing zeros and all."""
    assert [last_digit(text) for text in ("0.071", "93", "0.70", "-5.47")] == [0.001, 1, 0.01, 0.01]


# --- 4.3.7: a bound, and nothing known within it --------------------------------------------------------------------


def test_rectangular_reproduces_gum_4_3_7_example_1():
    """A coefficient of expansion known to within 0.40e-6 has u 0.23e-6. Value from memory."""
    assert rectangular(0.40e-6) / MICRO == printed("0.23")


def test_split_reproduces_gum_4_3_7_example_2():
    """A voltmeter of 14e-6 of reading and 2e-6 of range, at 0.928571 V on 1 V: a 15 uV, u 8.7 uV. From memory."""
    accuracy = parse_accuracy("14 ppm reading + 2 ppm range", "voltage")

    parts = split(accuracy, 0.928571, meter_range=1.0, resolution=0.0)
    u = math.hypot(parts.gain, parts.rest)

    assert u * math.sqrt(3) / MICRO == printed("15")
    assert u / MICRO == printed("8.7")
    assert parts.gain * math.sqrt(3) == pytest.approx(14e-6 * 0.928571)


def test_correct_reproduces_gum_5_1_5(tmp_path):
    """The same voltmeter on the bench, with 12 uV of type A: the combined u is 15 uV. Values from memory."""
    meter = '{device: "voltmeter", accuracy: "14 ppm reading + 2 ppm range", meter_range: 1 V}'
    cell = "{main: {voltage: 1 V, current: 1 A}}"
    bench = Bench(limits_of(tmp_path, instruments=f"{{output_voltage: {meter}}}", outputs=cell))

    reading = bench.correct("output_voltage main", 0.928571)
    combined = reading + of_source(12e-6, Source("spread", "A", 19))

    assert nominal(reading) == 0.928571
    assert standard_uncertainty(reading) / MICRO == printed("8.7")
    assert standard_uncertainty(combined) / MICRO == printed("15")


def test_converter_step_uncertainty_reproduces_gum_f_2_2_1():
    """The last digit of an indication brings 0.29 of itself."""
    # read in the manual of the R package clanTools, resolution.uncertainty.abs
    assert converter_step_uncertainty(1.0) == printed("0.29")


# --- G.4 and H.1: effective degrees of freedom ----------------------------------------------------------------------

GUM_G_4_1 = [(0.25, 9.0), (0.57, 4.0), (0.82, 14.0)]  # relative u in per cent; values from memory


def test_expanded_reproduces_gum_g_4_1():
    """A product of three means of 10, 5 and 15 readings: u_c 1.03 %, nu 19.0, t 2.09, U 2.2 %."""
    value = 1.0
    for u, freedom in GUM_G_4_1:
        value = value * of_source(u / 100, Source(f"mean of {freedom + 1:g}", "A", freedom), 1.0)

    said = expanded(value, 0.95)

    assert 100 * said.standard == printed("1.03")
    assert said.degrees_of_freedom == printed("19.0")
    assert said.coverage_factor == printed("2.09")
    assert 100 * said.expanded == printed("2.2")


def test_effective_degrees_of_freedom_reproduces_gum_g_4_1():
    """The formula alone: 19.0, and at 95 % and 19 degrees of freedom Table G.2 has 2.09."""
    assert effective_degrees_of_freedom(GUM_G_4_1) == printed("19.0")
    assert coverage_factor(0.95, 19) == printed("2.09")


def test_effective_degrees_of_freedom_reproduces_one_part_without_end():
    """0.57 with 9 degrees of freedom and 0.25 with infinitely many: 12.8."""
    # value as in github.com/sandialabs/suncal test/test_examples.py, test_DEGF
    assert effective_degrees_of_freedom([(0.57, 9), (0.25, math.inf)]) == printed("12.8")


# JCGM 100:2008, H.1, end-gauge calibration; read through github.com/sandialabs/suncal test/ex_endgauge.yaml and
# test/test_examples.py (test_GUMH1), and github.com/MSLNZ/GTC docs/API/GUM_H1.rst. u in nm, degrees of freedom.
COMPARATOR = [(5.8, 24.0), (3.9, 5.0), (6.7, 8.0)]
END_GAUGE = [(25.0, 18.0), (9.7, 25.6), (2.9, 50.0), (16.6, 2.0)]


def test_effective_degrees_of_freedom_reproduces_gum_h_1():
    """The comparator has 25.6 degrees of freedom, which the Guide forms with u rounded to 9.7 nm."""
    assert math.sqrt(sum(u * u for u, _ in COMPARATOR)) == printed("9.7")
    # 25.45 without that rounding: (9.7 / 9.6819)^4 makes 25.6 of it
    assert effective_degrees_of_freedom(COMPARATOR) * (9.7 / 9.681942) ** 4 == printed("25.6", digits=1)


def test_expanded_reproduces_gum_h_1_6():
    """The end gauge: u_c 32 nm, 16 degrees of freedom (truncated), k 2.92 and U99 93 nm (these two from memory)."""
    parts = [of_source(u, Source(f"part {i}", "A", freedom)) for i, (u, freedom) in enumerate(END_GAUGE)]

    said = expanded(sum(parts), 0.99)

    assert said.standard == printed("32")
    assert math.floor(said.degrees_of_freedom) == 16
    assert coverage_factor(0.99, 16) == printed("2.92")
    assert coverage_factor(0.99, 16) * 32 == printed("93")
    # we do not truncate, so that k lies between those of 16 and of 17
    assert coverage_factor(0.99, 17) < said.coverage_factor < coverage_factor(0.99, 16)


def test_budget_reproduces_tn_1297_d_2():
    """The end gauge with its second-order term, part by part as NIST TN 1297, Table D.1 lists them: u_c 34 nm."""
    # https://nist.gov/pml/nist-technical-note-1297/nist-tn-1297-appendix-d2-identification-uncertainty-components
    components = [25.0, 5.8, 3.9, 6.7, 1.7, 5.8, 10.2, 2.9, 16.6]
    total = sum(of_source(u * NANO, Source(f"component {i}", "B")) for i, u in enumerate(components))

    lines = budget(total)

    assert standard_uncertainty(total) / NANO == printed("34")
    assert [line.u / NANO for line in lines] == pytest.approx(sorted(components, reverse=True))
    assert sum(line.share for line in lines) == pytest.approx(1.0)
    assert lines[0].share == pytest.approx(25.0**2 / sum(u * u for u in components))


# --- H.2: quantities measured together ------------------------------------------------------------------------------

# JCGM 100:2008, H.2: five simultaneous readings (Table H.2). Data read in github.com/sandialabs/suncal
# test/test_GUMH2.csv, results in github.com/MSLNZ/GTC docs/API/GUM_H2.rst and test/test_type_a.py.
VOLTAGE = np.array([5.007, 4.994, 5.005, 4.990, 4.999])  # V
CURRENT = np.array([0.019663, 0.019639, 0.019640, 0.019685, 0.019678])  # A
PHASE = np.array([1.0456, 1.0438, 1.0468, 1.0428, 1.0433])  # rad
SETS = VOLTAGE.size


def means_with_shared_observations():
    """V, I and phase as means of the five, each set of simultaneous readings being one source that all three share."""
    sets = [of_source(1.0, Source(f"observation {k + 1}", "A", SETS - 1)) for k in range(SETS)]
    scale = math.sqrt(SETS * (SETS - 1))
    values = []
    for readings in (VOLTAGE, CURRENT, PHASE):
        mean = type_a(readings).mean
        values.append(mean + sum((x - mean) / scale * one for x, one in zip(readings, sets, strict=True)))
    return values


def correlation(values):
    matrix = covariance(values)
    deviation = np.sqrt(np.diag(matrix))
    return matrix / np.outer(deviation, deviation)


@pytest.mark.parametrize(
    ("readings", "mean", "u"),
    [
        pytest.param(VOLTAGE, "4.9990", "0.0032", id="voltage"),
        pytest.param(1000 * CURRENT, "19.6610", "0.0095", id="current"),  # mA
        pytest.param(PHASE, "1.04446", "0.00075", id="phase"),
    ],
)
def test_type_a_reproduces_gum_h_2_means(readings, mean, u):
    """Means and s / sqrt(n) of Table H.2."""
    told = type_a(readings)

    assert told.mean == printed(mean)
    assert told.deviation / math.sqrt(told.readings) == printed(u)


def test_covariance_reproduces_gum_h_2_inputs():
    """Correlation coefficients -0.36, 0.86 and -0.65 (Table H.2), and the covariance as numpy has it."""
    values = means_with_shared_observations()

    r = correlation(values)

    assert r[0, 1] == printed("-0.36")
    assert r[0, 2] == printed("0.86")
    assert r[1, 2] == printed("-0.65")
    ours = covariance(values)
    assert ours == pytest.approx(np.cov([VOLTAGE, CURRENT, PHASE]) / SETS, rel=1e-9, abs=0)


@pytest.mark.parametrize(
    ("row", "value", "u", "digits_of_u"),
    [
        pytest.param(0, "127.732", "0.071", 0.5, id="resistance"),
        pytest.param(1, "219.847", "0.295", 1.0, id="reactance"),  # unrounded arithmetic gives 0.2956
        pytest.param(2, "254.260", "0.236", 0.5, id="impedance"),
    ],
)
def test_propagation_reproduces_gum_h_2(row, value, u, digits_of_u):
    """R = V/I cos, X = V/I sin, Z = V/I with everything that the three readings share (Table H.3)."""
    v, i, phase = means_with_shared_observations()

    result = [v / i * umath.cos(phase), v / i * umath.sin(phase), v / i][row]

    assert nominal(result) == printed(value)
    assert standard_uncertainty(result) == printed(u, digits=digits_of_u)
    assert sum(line.u**2 for line in budget(result)) == pytest.approx(standard_uncertainty(result) ** 2)


def test_covariance_reproduces_gum_h_2_results():
    """Correlation of R, X and Z: -0.588, -0.485 and 0.993 (Table H.3)."""
    v, i, phase = means_with_shared_observations()

    r = correlation([v / i * umath.cos(phase), v / i * umath.sin(phase), v / i])

    assert r[0, 1] == printed("-0.588")
    assert r[0, 2] == printed("-0.485")
    assert r[1, 2] == printed("0.993")


@pytest.mark.parametrize(
    ("samples", "value", "u", "digits_of_u"),
    [
        pytest.param(VOLTAGE / CURRENT * np.cos(PHASE), "127.732", "0.071", 0.5, id="resistance"),
        pytest.param(VOLTAGE / CURRENT * np.sin(PHASE), "219.847", "0.295", 1.0, id="reactance"),
        pytest.param(VOLTAGE / CURRENT, "254.260", "0.236", 0.5, id="impedance"),
    ],
)
def test_type_a_reproduces_gum_h_2_4(samples, value, u, digits_of_u):
    """The other way round: each set evaluated by itself, and then the mean of the five (Table H.4, from memory)."""
    told = type_a(samples)

    assert told.mean == printed(value)
    assert told.deviation / math.sqrt(told.readings) == printed(u, digits=digits_of_u)


# --- a mean and its interval ----------------------------------------------------------------------------------------


def test_expanded_reproduces_e_handbook_1_3_5_2():
    """NIST/SEMATECH e-Handbook, 1.3.5.2: 195 readings of mean 9.26146, s 0.022789; t 1.9723, 9.258242 to 9.264679."""
    mean = of_source(0.022789 / math.sqrt(195), Source("spread", "A", 194), 9.26146)

    said = expanded(mean, 0.95)

    assert said.coverage_factor == printed("1.9723")
    # mean and s are rounded themselves, the limits were formed from the readings
    assert nominal(mean) - said.expanded == printed("9.258242", digits=1)
    assert nominal(mean) + said.expanded == printed("9.264679", digits=1)
