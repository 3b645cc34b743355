"""What a heading is taken for, and what it is never taken for."""

from __future__ import annotations

import pytest
from hypothesis import given
from hypothesis import strategies as st

from acceptance.bench.headings import Vocabulary, resolve_unit, shown
from acceptance.bench.log import QUANTITIES


@pytest.mark.parametrize("quantity", sorted(QUANTITIES))
@pytest.mark.parametrize("joint", [" ", "_", ".", "-"])
@pytest.mark.parametrize("case", [str.lower, str.upper, str.title])
def test_own_name_is_understood_in_any_case_and_joint(quantity, joint, case):
    """Each quantity by its own name."""
    heading = Vocabulary().read(case(quantity.replace("_", joint)))

    assert heading.quantity == quantity or (quantity == "temperature" and heading.quantity == "")


@pytest.mark.parametrize(
    ("text", "key", "unit"),
    [
        ("Vin", "input_voltage", ""),
        ("Uin", "input_voltage", ""),
        ("V_in", "input_voltage", ""),
        ("IIN (mA)", "input_current", "mA"),
        ("Pin/W", "input_power", "W"),
        ("Input power W", "input_power", "W"),
        ("Input V", "input_voltage", "V"),
        ("PF", "power_factor", ""),
        ("cos phi", "power_factor", ""),
        ("PF %", "power_factor", "%"),
        ("Vout (mV)", "output_voltage", "mV"),
        ("Uout", "output_voltage", ""),
        ("V_o", "output_voltage", ""),
        ("Vout in mV", "output_voltage", "mV"),
        ("Iout [A]", "output_current", "A"),
        ("iout mA", "output_current", "mA"),
        ("I_load", "output_current", ""),
        ("Pout", "output_power", ""),
        ("T_amb", "ambient_temperature", ""),
        ("Tamb °C", "ambient_temperature", "°C"),
        ("ambient", "ambient_temperature", ""),
        ("temperature ambient", "ambient_temperature", ""),
        ("T_case_degC", "temperature case", "degC"),
        ("temp case", "temperature case", ""),
        ("temperature.case", "temperature case", ""),
        ("T (case) [°C]", "temperature case", "°C"),
        ("case temperature", "temperature case", ""),
        ("Tcase", "temperature case", ""),
        ("t_hot", "temperature hot", ""),
        ("T case deg C", "temperature case", "°C"),
        ("T1 (°C)", "temperature 1", "°C"),
        ("T (°C)", "temperature", "°C"),
        ("Rw", "winding_resistance", ""),
        ("winding resistance (ohm)", "winding_resistance", "ohm"),
        ("Vripple", "ripple", ""),
        ("ripple_pp", "ripple", ""),
        ("ripple_mv", "ripple", "mv"),
        ("Ripple (mVpp)", "ripple", "mVpp"),
        ("I set", "load_setting", ""),
        ("i_set", "load_setting", ""),
        ("load setting", "load_setting", ""),
        ("load mode", "load_mode", ""),
        ("SN", "serial", ""),
        ("S/N", "serial", ""),
        ("t", "time", ""),
        ("t (s)", "time", "s"),
        ("T [s]", "time", "s"),
        ("Timestamp", "time", ""),
        ("Date/Time", "time", ""),
        ("Time (hh:mm:ss)", "time", ""),
        ("clock", "time", ""),
        ("Zeit", "time", ""),
        ("Eingangsspannung [V]", "input_voltage", "V"),
        ("Ausgangsspannung", "output_voltage", ""),
        ("Eingangsleistung/W", "input_power", "W"),
    ],
)
def test_heading_is_understood(text, key, unit):
    """The trade's abbreviations, with the unit where it may stand."""
    heading = Vocabulary().read(text)

    assert (heading.key, heading.unit) == (key, unit)
    assert text in heading.reason


@pytest.mark.parametrize(
    "text",
    [
        "T",  # a time or a temperature
        "T1",
        "t_on",
        "t_rise",
        "T_set",
        "v_set",
        "Vout min",
        "Vout_max",
        "Vout_set",
        "V_in_rms",
        "U in V",  # Uin in volts, or U in volts
        "Leistung",  # input or output
        "power",
        "Efficiency %",
        "K",
        "IOUT MA",  # mA is not MA
        "VOUT MV",
        "Vout (kVA)",
        "Vout (mVpp)",  # a ripple's unit
        "",
        "<img src=x>",
        "=1+1",
        "x" * 500,
    ],
)
def test_heading_that_may_mean_something_else_is_left_alone(text):
    """Never guessed: no quantity, and a reason."""
    heading = Vocabulary().read(text)

    assert heading.quantity == ""
    assert heading.reason


@pytest.mark.parametrize(
    "text", ["Vout main", "Vout_main", "output_voltage.main", "main Vout", "Vout-MAIN", "Voutmain"]
)
def test_output_name_may_be_joined_in_any_way(text):
    """The output's own spelling is kept."""
    assert Vocabulary(outputs=("main", "aux")).read(text).key == "output_voltage main"


def test_output_quantity_without_a_name_is_the_first_output():
    """And only an output quantity."""
    words = Vocabulary(outputs=("main", "aux"))

    assert words.read("Vout").key == "output_voltage main"
    assert words.read("Vin").key == "input_voltage"
    assert words.read("Vout aux (mV)").key == "output_voltage aux"


def test_word_that_names_no_output_is_not_understood():
    """Its reason lists the outputs."""
    heading = Vocabulary(outputs=("main",)).read("Vout other")

    assert heading.quantity == ""
    assert "main" in heading.reason


def test_unit_at_the_end_is_a_unit_unless_an_output_has_that_name():
    """An output called A."""
    assert Vocabulary().read("Iout A").unit == "A"
    words = Vocabulary(outputs=("B", "A"))
    assert (words.read("Iout A").key, words.read("Iout A").unit) == ("output_current A", "")
    assert (words.read("Iout A mA").key, words.read("Iout A mA").unit) == ("output_current A", "mA")


def test_columns_of_the_bench_file_come_first():
    """Its heading, its unit; the heading's own unit where it gives none."""
    words = Vocabulary({"output_voltage": ("U2 [mV]", None), "ripple": ("Vin", "mV")}, ("main",))

    assert (words.read("u2  [mV]").key, words.read("U2 [mV]").unit) == ("output_voltage main", "mV")
    assert (words.read("Vin").key, words.read("Vin").unit, words.read("Vin").unit_from) == (
        "ripple main",
        "mV",
        "limits file",
    )


@pytest.mark.parametrize(
    ("text", "kind", "lower", "factor"),
    [
        ("mA", "current", False, 1e-3),
        ("mv", "voltage", True, 1e-3),
        ("Vrms", "voltage", False, 1.0),
        ("volts", "voltage", False, 1.0),
        ("C", "temperature", False, 1.0),
        ("mW", "power", False, 1e-3),
        ("MW", "power", False, 1e6),
        ("mw", "power", True, 1e-3),
    ],
)
def test_unit_keeps_its_case(text, kind, lower, factor):
    """A factor to SI."""
    unit = resolve_unit(text, kind, lower=lower)

    assert unit is not None
    assert (unit.kind, unit.factor) == (kind, factor)


@pytest.mark.parametrize(("text", "kind"), [("MA", "current"), ("mv", "voltage"), ("C", "voltage"), ("", "voltage")])
def test_unit_that_is_none_is_refused(text, kind):
    """Not by another case, nor by another meaning."""
    assert resolve_unit(text, kind) is None


@given(st.text(max_size=120))
def test_any_text_is_a_heading_or_is_not(text):
    """No text breaks the reader of headings, and none breaks a line."""
    heading = Vocabulary(outputs=("main", "A")).read(text)

    assert heading.quantity in {"", *QUANTITIES}
    assert "\n" not in shown(text)
