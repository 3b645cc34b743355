"""Converter steps, lead resistances and the regulation formulas against printed tables and worked checks."""

from __future__ import annotations

import math

import numpy as np
import pytest

from acceptance.checks.regulation import check_load_regulation, regulation
from acceptance.points.instrument import Bench
from acceptance.points.point import Estimate
from acceptance.points.propagation import nominal, standard_uncertainty
from tests.published.built import limits_of, points_of
from tests.published.digits import printed

# --- converter ------------------------------------------------------------------------------------------------------

# Full scale (+-) and step of a 16-bit converter, as in a maker's data sheet (common practice, no public source);
# u = step / sqrt(12), JCGM 100:2008, F.2.2.1, calculated. In V, uV, uV; the step on 1 ohm, 0.1 ohm, 10 mohm in mA.
CONVERTER = [
    ("6.144", "187.5", "54.13", ("0.1875", "1.875", "18.75")),
    ("4.096", "125", "36.08", ("0.125", "1.25", "12.5")),
    ("2.048", "62.5", "18.04", ("0.0625", "0.625", "6.25")),
    ("1.024", "31.25", "9.02", ("0.03125", "0.3125", "3.125")),
    ("0.512", "15.625", "4.51", ("0.0156", "0.156", "1.56")),
    ("0.256", "7.8125", "2.26", ("0.0078", "0.078", "0.78")),
]
# a rated current that every span of the table takes across every resistance of it
SMALL = "{main: {voltage: 12 V, current: 250 mA}}"


@pytest.mark.parametrize(("scale", "step", "u", "currents"), CONVERTER, ids=[row[0] for row in CONVERTER])
def test_correct_reproduces_converter_table(tmp_path, scale, step, u, currents):
    """A voltage read by a converter has the step of its span, and step / sqrt(12) as its only uncertainty."""
    adc = f"adc: {{bits: 16, span: [-{scale} V, {scale} V]}}"
    limits = limits_of(tmp_path, instruments=f'{{output_voltage: {{device: "converter", {adc}}}}}')

    reading = Bench(limits).correct("output_voltage main", 0.2)

    assert limits.meter("output_voltage main").converter.step * 1e6 == printed(step)
    assert standard_uncertainty(reading) * 1e6 == printed(u)
    assert nominal(reading) == 0.2


@pytest.mark.parametrize(("scale", "step", "u", "currents"), CONVERTER, ids=[row[0] for row in CONVERTER])
@pytest.mark.parametrize(("column", "resistance"), [(0, "1 ohm"), (1, "0.1 ohm"), (2, "10 mohm")])
def test_correct_reproduces_converter_table_as_current(tmp_path, scale, step, u, currents, column, resistance):
    """Across a shunt without error the step is a current: step over resistance."""
    shunt = f"shunt: {{resistance: {resistance}, tolerance: 0 %}}"
    adc = f"adc: {{bits: 16, span: [-{scale} V, {scale} V]}}"
    limits = limits_of(tmp_path, instruments=f'{{output_current: {{device: "shunt", {shunt}, {adc}}}}}', outputs=SMALL)

    reading = Bench(limits).correct("output_current main", 0.2)

    assert standard_uncertainty(reading) * math.sqrt(12) * 1000 == printed(currents[column])


# --- leads ----------------------------------------------------------------------------------------------------------

# Copper at 20 degC in mohm/m. IEC 60228 class 5, plain, largest resistance by cross-section in mm2; read at
# mycableengineering.com/knowledge-base/iec-60228-dc-resistance. American gauges: table at wp.1728.org/?p=4314.
CLASS_5 = [
    ("0.5 mm2", "39.0"),
    ("0.75 mm2", "26.0"),
    ("1.0 mm2", "19.5"),
    ("1.5 mm2", "13.3"),
    ("2.5 mm2", "7.98"),
    ("4 mm2", "4.95"),
    ("6 mm2", "3.30"),
    ("10 mm2", "1.91"),
]
GAUGES = [
    ("AWG 10", "3.28"),
    ("AWG 12", "5.21"),
    ("AWG 14", "8.28"),
    ("AWG 16", "13.17"),
    ("AWG 18", "20.94"),
    ("AWG 20", "33.29"),
    ("AWG 22", "52.94"),
    ("AWG 24", "84.20"),
]
CURRENT = 10.0  # A
AT_UNIT = 12.0  # V
INPUT_POWER = 140.0  # W


def point_behind_leads(tmp_path, lead: str | None, resistance: float):
    """A point of 10 A, the voltage of 12 V read behind leads of this resistance."""
    # instruments without error, so to say: what remains is the wiring
    fine = '{device: "ideal", accuracy: "1 ppm reading"}'
    limits = limits_of(
        tmp_path,
        instruments=f"{{output_voltage: {fine}, output_current: {fine}, input_power: {fine}}}",
        leads=f"{{output: {lead}}}" if lead else "{}",
    )
    samples = {
        "output_voltage main": [AT_UNIT - CURRENT * resistance] * 4,
        "output_current main": [CURRENT] * 4,
        "input_power": [INPUT_POWER] * 4,
    }
    return points_of(limits, [samples]).steady[0]


@pytest.mark.parametrize(("wire", "per_metre"), [*CLASS_5, *GAUGES], ids=[row[0] for row in [*CLASS_5, *GAUGES]])
def test_voltage_reproduces_lead_resistance_table(tmp_path, wire, per_metre):
    """One metre of a pair: 12 V at the unit again, and I2R more of output power."""
    pair = 2 * float(per_metre)  # mohm
    point = point_behind_leads(tmp_path, f"{pair:.6g} mohm ± 0 mohm", pair / 1000)

    assert point.limits.wiring("output", "main").resistance == pytest.approx(pair / 1000, rel=1e-12)
    assert point.voltage("main").nominal == pytest.approx(AT_UNIT, rel=1e-12)
    assert point.efficiency(["main"]).nominal * INPUT_POWER == pytest.approx(AT_UNIT * CURRENT, rel=1e-12)


def test_voltage_reproduces_lead_drop_worked_check(tmp_path):
    """12 V, 10 A, 1 m pair of 2.5 mm2: 15.96 mohm, 0.160 V or 1.33 %, P_load 118.4 W, P_leads 1.6 W. Calculated."""
    behind = point_behind_leads(tmp_path, None, 15.96e-3)
    put_back = point_behind_leads(tmp_path, "15.96 mohm ± 0 mohm", 15.96e-3)

    drop = put_back.voltage("main").nominal - behind.voltage("main").nominal
    load = behind.efficiency(["main"]).nominal * INPUT_POWER
    leads = put_back.efficiency(["main"]).nominal * INPUT_POWER - load

    assert drop == printed("0.160")
    assert 100 * drop / AT_UNIT == printed("1.33")
    assert load == printed("118.4")
    assert leads == printed("1.6")
    assert leads == pytest.approx(CURRENT**2 * 15.96e-3, rel=1e-9)


def test_voltage_carries_the_bound_of_the_leads(tmp_path):
    """Leads known to within 2 mohm bring 10 A x 2 mohm / sqrt(3) to the voltage, and I2 of it to the power."""
    point = point_behind_leads(tmp_path, "15.96 mohm ± 2 mohm", 15.96e-3)
    u = CURRENT * 2e-3 / math.sqrt(3)

    assert standard_uncertainty(point.voltage("main").value) == pytest.approx(u, rel=1e-4)
    assert standard_uncertainty(point.efficiency(["main"]).value) == pytest.approx(u * CURRENT / INPUT_POWER, rel=1e-4)


# --- regulation -----------------------------------------------------------------------------------------------------

# Worked check (calculated): 12.10 V without load, 12.06 V at 10 %, 11.95 V at full load, 12 V nominal, 10 A.
NO_LOAD, TENTH, FULL_LOAD, NOMINAL = 12.10, 12.06, 11.95, 12.00


@pytest.mark.parametrize(
    ("voltages", "reference", "percent"),
    [
        pytest.param([NO_LOAD, FULL_LOAD], FULL_LOAD, "1.2552", id="over full load"),
        pytest.param([NO_LOAD, FULL_LOAD], NO_LOAD, "1.2397", id="over no load"),
        pytest.param([NO_LOAD, FULL_LOAD], NOMINAL, "1.2500", id="over nominal"),
        pytest.param([NO_LOAD, TENTH, FULL_LOAD], NOMINAL, "1.2500", id="with a point between"),
        pytest.param([FULL_LOAD, NO_LOAD], NOMINAL, "1.2500", id="in the other order"),
        pytest.param([TENTH, FULL_LOAD], NOMINAL, "0.917", id="from 10 %"),
    ],
)
def test_regulation_reproduces_worked_check(voltages, reference, percent):
    """Each variant of the formula gives its own figure for the same three voltages."""
    value = regulation([Estimate(voltage) for voltage in voltages], Estimate(reference))

    assert 100 * value.nominal == printed(percent)


@pytest.mark.parametrize(
    ("relative_to", "span", "percent"),
    [
        ("full load", "from: 0 %, to: 100 %", "1.2552"),
        ("no load", "from: 0 %, to: 100 %", "1.2397"),
        ("nominal", "from: 0 %, to: 100 %", "1.2500"),
        ("nominal", "from: 10 %, to: 100 %", "0.917"),
    ],
)
def test_check_load_regulation_reproduces_worked_check(tmp_path, relative_to, span, percent):
    """The same figures from a limits file and a log: the reference and the span alone move them."""
    at = "at: {input: 48 V}"
    limits = limits_of(
        tmp_path, requirements=f"load_regulation: [{{{span}, {at}, max: 1.24 %, relative_to: {relative_to}}}]"
    )
    dwells = [
        {
            "output_voltage main": [voltage] * 3,
            "output_current main": [current] * 3,
            "input_voltage": [48.0] * 3,
        }
        for voltage, current in ((NO_LOAD, 0.0), (TENTH, 1.0), (FULL_LOAD, 10.0))
    ]

    (outcome,) = check_load_regulation(limits.requirements, points_of(limits, dwells)).outcomes
    (candidate,) = outcome.candidates

    assert candidate.estimate is not None, candidate.reason or outcome.reason
    assert 100 * candidate.estimate.nominal == printed(percent)
    assert outcome.high == pytest.approx(0.0124)


def test_correct_reproduces_shunt_self_heating_worked_check(tmp_path):
    """10 mohm, 20 A = 4 W, 15 K/W -> 60 K, 50 ppm/K -> 0.30 % as a bound. Calculated: dR/R = alpha Rth I2 R."""
    shunt = "{resistance: 10 mohm, tolerance: 0 %, temperature_coefficient: 50 ppm/K, heating: 15 K/W}"
    # 32 bits over half a volt: the step is nothing beside the heating
    adc = "adc: {bits: 32, span: [-0.256 V, 0.256 V]}"
    limits = limits_of(tmp_path, instruments=f'{{output_current: {{device: "shunt", shunt: {shunt}, {adc}}}}}')

    reading = Bench(limits).correct("output_current main", 20.0)

    bound = standard_uncertainty(reading) * math.sqrt(3) / 20.0
    assert 100 * bound == printed("0.30")
    assert np.isclose(bound, 50e-6 * 15 * 4, rtol=1e-6)
