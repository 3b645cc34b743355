"""Units: every entry of the closed table against pint, and texts to SI numbers."""

from __future__ import annotations

import math
import re
from decimal import Decimal

import pint
import pytest
from hypothesis import given
from hypothesis import strategies as st

from acceptance.errors import MeasurementError
from acceptance.units import (
    KINDS,
    UNITS,
    Rate,
    find_unit,
    parse_quantity,
    parse_quantity_with_bound,
    parse_rate,
    quoted,
)

# our way to write a unit -> pint's, where they differ
PINT_NAMES = {
    "°C": "degC",
    "℃": "degC",
    "degC": "degC",
    "°F": "degF",
    "degF": "degF",
    "min": "minute",
    "h": "hour",
    "%": "percent",
    "°C/W": "delta_degC/W",
    "ppm/°C": "ppm/delta_degC",
    "%/K": "percent/K",
}
PINT_KINDS = {"°C": "degC", "ohm": "ohm", "": "dimensionless"}


@pytest.fixture(scope="module")
def registry() -> pint.UnitRegistry:
    """Pint's own table of units."""
    return pint.UnitRegistry()


def pint_name(symbol: str) -> str:
    """What pint calls a unit of ours."""
    return PINT_NAMES.get(symbol) or symbol.replace("\N{OHM SIGN}", "ohm").replace("Ω", "ohm").replace("μ", "µ")


@pytest.mark.parametrize("symbol", sorted(UNITS))
@pytest.mark.parametrize("number", [1.0, -40.0, 98.6])
def test_unit_agrees_with_pint(registry, symbol, number):
    """Factor and offset of every entry are those of an independent table."""
    unit = UNITS[symbol]
    si = KINDS[unit.kind]

    expected = registry.Quantity(number, pint_name(symbol)).to(PINT_KINDS.get(si, si)).magnitude

    assert unit.to_si(number) == pytest.approx(expected, rel=1e-12, abs=1e-12)


@pytest.mark.parametrize("symbol", sorted(UNITS))
def test_unit_is_read_as_written(symbol):
    """A text with the unit gives what the table gives, with or without a space."""
    unit = UNITS[symbol]
    joined = [] if symbol[0].isdigit() else [f"2.5{symbol}"]  # 2.51/K is no 2.5 1/K
    for text in (f"2.5 {symbol}", f" +2.5  {symbol} ", *joined):
        assert parse_quantity(text, unit.kind) == pytest.approx(unit.to_si(2.5), rel=1e-15)


def test_units_of_one_symbol_agree_whatever_the_letter():
    """The three micro signs and the two ohm signs are the same unit."""
    for a, b in [("uV", "µV"), ("μV", "µV"), ("kΩ", "kohm"), ("k\N{OHM SIGN}", "kohm")]:
        assert (UNITS[a].kind, UNITS[a].factor) == (UNITS[b].kind, UNITS[b].factor)


def test_kinds_are_written_in_units_of_the_table():
    """Every kind has its SI symbol in the table, so that what is printed can be read again."""
    for kind, symbol in KINDS.items():
        if symbol:
            assert UNITS[symbol].kind == kind
            assert UNITS[symbol].factor == 1
            assert UNITS[symbol].offset == 0
    assert {unit.kind for unit in UNITS.values()} == set(KINDS)


@pytest.mark.parametrize(
    ("text", "kind", "value"),
    [
        ("24 V", "voltage", 24.0),
        ("24V", "voltage", 24.0),
        ("-6.144 V", "voltage", -6.144),
        ("\N{MINUS SIGN}6.144 V", "voltage", -6.144),
        (".5 V", "voltage", 0.5),
        ("5. V", "voltage", 5.0),
        ("1e3 mV", "voltage", 1.0),
        ("1E-3 V", "voltage", 0.001),
        ("57 %", "ratio", 0.57),
        ("0.5e2 %", "ratio", 0.5),
        ("105 %", "ratio", 1.05),
        ("50 ppm", "ratio", 5e-5),
        ("12 mohm", "resistance", 0.012),
        ("1 Mohm", "resistance", 1e6),
        ("30 min", "time", 1800.0),
        ("40 °C", "temperature", 40.0),
        ("104 °F", "temperature", 40.0),
        ("35 K", "temperature difference", 35.0),
        ("35 °C", "temperature difference", 35.0),
        ("9 °F", "temperature difference", 5.0),
        ("20 MHz", "frequency", 2e7),
        ("50 ppm/K", "temperature coefficient", 5e-5),
        ("-0 %", "ratio", 0.0),
    ],
)
def test_parse_quantity_value(text, kind, value):
    """Texts with their unit, as people write them."""
    assert parse_quantity(text, kind) == pytest.approx(value, rel=1e-15, abs=0)
    assert math.copysign(1, parse_quantity(text, kind)) == math.copysign(1, value)


@pytest.mark.parametrize(
    ("text", "kind", "words"),
    [
        ("", "voltage", "no number is given"),
        ("  ", "voltage", "no number is given"),
        ("V", "voltage", '"V" does not begin with a number'),
        ("24", "voltage", '"24" has no unit'),
        ("0.88", "ratio", '"0.88" has no unit'),
        ("24 A", "voltage", '"24 A" is a current, not a voltage'),
        ("88 V", "ratio", '"88 V" is a voltage, not a ratio'),
        ("300 K", "temperature", '"300 K" is a temperature difference, not a temperature'),
        ("24 volts", "voltage", '"volts" in "24 volts" is no known unit'),
        ("24 v", "voltage", '"v" in "24 v" is no known unit (units keep their case: V)'),
        ("3 MA", "current", '"MA" in "3 MA" is no known unit (units keep their case: mA)'),
        ("0,5 V", "voltage", '"0,5 V" has a decimal comma, and a limits file takes a decimal point'),
        ("1 000 V", "voltage", '"1 000 V" has a space inside its number'),
        ("1_000 V", "voltage", '"_000 V" in "1_000 V" is no known unit'),
        ("1e400 V", "voltage", '"1e400 V" is too large'),
        ("inf V", "voltage", '"inf V" does not begin with a number'),
        ("nan V", "voltage", '"nan V" does not begin with a number'),
        ("-300 °C", "temperature", '"-300 °C" lies below absolute zero'),
        ("٣ V", "voltage", '"٣ V" does not begin with a number'),
    ],
)
def test_parse_quantity_refuses(text, kind, words):
    """What is not a number with a unit of that kind is refused, in words."""
    with pytest.raises(MeasurementError, match=f"^{re.escape(words)}$"):
        parse_quantity(text, kind)


def test_parse_quantity_refuses_a_long_text_shortly():
    """A megabyte of digits gives a short message."""
    with pytest.raises(MeasurementError, match="too long") as caught:
        parse_quantity("9" * 1_000_000 + " V", "voltage")

    assert len(str(caught.value)) < 150


@given(
    number=st.decimals(min_value=-1000, max_value=1000, places=6),
    units=st.sampled_from([("V", "mV", 3), ("A", "uA", 6), ("ohm", "mohm", 3), ("%", "ppm", 4), ("W", "kW", -3)]),
)
def test_parse_quantity_is_the_same_in_any_unit(number, units):
    """To the last bit: a limit does not depend on the prefix it is written with."""
    large, small, places = units
    kind = UNITS[large].kind

    shifted = f"{number.scaleb(places):f} {small}"

    assert parse_quantity(f"{number:f} {large}", kind) == parse_quantity(shifted, kind)


@given(number=st.floats(min_value=1e-9, max_value=1e9))
def test_parse_quantity_loses_no_digit(number):
    """A number written in full comes back as the very same number."""
    assert parse_quantity(f"{number!r} V", "voltage") == number
    assert parse_quantity(f"{number!r} %", "ratio") == float(Decimal(repr(number)) / 100)


@given(text=st.text(max_size=40), kind=st.sampled_from(sorted(KINDS)))
def test_parse_quantity_gives_a_number_or_a_measurement_error(text, kind):
    """Nothing else leaves it, and every number is finite."""
    try:
        value = parse_quantity(text, kind)
    except MeasurementError:
        pass
    else:
        assert math.isfinite(value)


@pytest.mark.parametrize(
    ("text", "value", "bound"),
    [
        ("12 mohm", 0.012, None),
        ("12 mohm ± 2 mohm", 0.012, 0.002),
        ("12 mohm +/- 2 mohm", 0.012, 0.002),
        ("12mohm+-2mohm", 0.012, 0.002),
    ],
)
def test_parse_quantity_with_bound_value(text, value, bound):
    """A quantity, and the bound of its error where one is written."""
    assert parse_quantity_with_bound(text, "resistance") == (value, bound)


@pytest.mark.parametrize("text", ["12 mohm ± -2 mohm", "12 mohm ± 2", "12 mohm ±", "± 2 mohm", "12 mohm ± 2 V"])
def test_parse_quantity_with_bound_refuses(text):
    """Half of it is not enough."""
    with pytest.raises(MeasurementError):
        parse_quantity_with_bound(text, "resistance")


@pytest.mark.parametrize(
    ("text", "difference", "interval"),
    [("1 K/30 min", 1.0, 1800.0), ("2 K/h", 2.0, 3600.0), ("1 °C / 0.5 h", 1.0, 1800.0), ("1K/.5h", 1.0, 1800.0)],
)
def test_parse_rate_value(text, difference, interval):
    """A change of temperature within a time."""
    assert parse_rate(text) == Rate(difference, interval)


@pytest.mark.parametrize("text", ["1 K", "1 K/", "/30 min", "0 K/30 min", "1 K/0 min", "-1 K/h", "1 V/h", "1 K/30 V"])
def test_parse_rate_refuses(text):
    """Everything else, with its reason."""
    with pytest.raises(MeasurementError):
        parse_rate(text)


def test_find_unit_keeps_case_and_kind():
    """A unit is found by its own letters, and only where its kind is asked for."""
    assert find_unit("mA").factor == 1e-3
    assert find_unit("MA") is None
    assert find_unit("mA", "voltage") is None
    assert find_unit("°C", "temperature difference").offset == 0


def test_quoted_is_short_and_printable():
    """A message never carries a line break, an escape sequence or a page of text."""
    assert quoted("a\nb\x1b[31m") == '"a\\nb\\x1b[31m"'
    assert quoted("x" * 500) == '"' + "x" * 57 + '..."'
