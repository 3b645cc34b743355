"""Numbers for people: rounding by the uncertainty, prefixes, limits, probabilities, durations."""

from __future__ import annotations

import math
from decimal import Decimal

import pytest
from hypothesis import example, given
from hypothesis import strategies as st

from acceptance.printing import (
    DASH,
    MINUS,
    column,
    count,
    duration,
    limit_range,
    minus_signs,
    printed,
    probability,
    quantity,
    scale_for,
    time_scale,
    with_uncertainty,
)

UNITS = ["V", "A", "W", "s", "K", "°C", "ohm", "Hz", "F", ""]
FINITE = st.floats(allow_nan=False, allow_infinity=False)
BENCH = st.floats(min_value=-1e4, max_value=1e4, allow_nan=False)


def number(text: str) -> Decimal:
    return Decimal(text.replace(MINUS, "-"))


@pytest.mark.parametrize(
    ("value", "expanded", "unit", "text"),
    [
        (0.9012, 0.0018, "", "90.12 % ± 0.18 %"),
        (0.0123, 0.00045, "V", "12.30 mV ± 0.45 mV"),
        (23.9376, 0.0096, "V", "23.9376 V ± 0.0096 V"),
        (0.148, 0.0581, "W", "148 mW ± 58 mW"),
        (4700.0, 23.0, "ohm", "4.700 kΩ ± 0.023 kΩ"),
        (41.26, 1.5, "°C", "41.3 °C ± 1.5 K"),  # an uncertainty is a difference
        (0.5, 0.0996, "K", "0.50 K ± 0.10 K"),  # U rounds up into another decade
        (3e-6, 2e-7, "A", "3.00 µA ± 0.20 µA"),
        (-12.034, 0.021, "V", "−12.034 V ± 0.021 V"),
        (24.0, 0.0, "V", "24 V"),
        (24.0, None, "V", "24 V"),
        (-1e-9, 0.01, "V", "0 mV ± 10 mV"),  # no negative zero
        (90.1, 1234.0, "V", "0.1 kV ± 1.2 kV"),
        (0.9, 1.234, "", "90 % ± 120 %"),
        (0.9999, 0.01, "V", "1.000 V ± 0.010 V"),  # not 1000 mV
        (None, 0.1, "V", DASH),
        (None, None, "", DASH),
        (math.nan, 0.1, "V", "not a number"),
        (math.inf, None, "V", "infinite"),
    ],
)
def test_with_uncertainty_rounds_to_two_digits_of_it(value, expanded, unit, text):
    """U has two significant digits, the value as many decimals, both one prefix."""
    assert with_uncertainty(value, expanded, unit) == text


def test_column_shares_decimals_as_far_as_is_honest():
    """The usual decimals; one digit more of U rather than a ragged row, never one less."""
    amperes = scale_for("A", [0.5])
    volts = scale_for("V", [230.0])

    shown = column([0.5053, 0.3997, 0.16068], amperes, expanded=[0.0018, 0.0015, 0.00096])
    wider = column([230.12, 230.1, 229.0], volts, expanded=[0.28, 0.27, 1.1])

    assert shown == ["505.3 ± 1.8", "399.7 ± 1.5", "160.68 ± 0.96"]
    assert wider == ["230.12 ± 0.28", "230.10 ± 0.27", "229.00 ± 1.10"]


def test_column_without_uncertainties_has_equal_decimals():
    """As many as the largest value needs, zeros that all would end in left out; odd values as words."""
    seconds = scale_for("", [], per_cent=False)

    assert column([3.75, 302.5, 540.0, None], seconds, digits=8) == ["3.75", "302.50", "540.00", DASH]
    assert column([56.0, 117.0], seconds) == ["56", "117"]
    assert column([0.0, math.nan, -math.inf], seconds) == ["0", "not a number", f"{MINUS}infinite"]
    assert column([], seconds) == []


@pytest.mark.parametrize(
    ("text", "shown"),
    [
        ("load -0.0 %", "load 0.0 %"),
        ("load -0.1 %, input -5 V", "load −0.1 %, input −5 V"),
        ("load -0.05 %", "load −0.05 %"),
        ("2026-05-04, A-17.csv, 5-10", "2026-05-04, A-17.csv, 5-10"),
        ("-0", "0"),
    ],
)
def test_minus_signs_stand_before_numbers_only(text, shown):
    """Dates, names and ranges keep their hyphens; zero has no sign."""
    assert minus_signs(text) == shown


@given(values=st.lists(BENCH, min_size=1, max_size=8), u=st.floats(1e-6, 10.0))
def test_column_rounds_to_within_half_a_digit_of_u(values, u):
    """What is printed lies within half of the last digit of U from the value, whatever the column."""
    for value, text in zip(values, column(values, scale_for("V", [1.0]), expanded=[u] * len(values)), strict=True):
        shown, _, bound = text.partition(" ± ")
        last = Decimal(1).scaleb(number(bound).as_tuple().exponent)
        noise = abs(Decimal(value)) * Decimal("1e-12")  # binary noise beyond 13 digits is rounded away first
        assert abs(number(shown) - Decimal(value)) <= last * Decimal("0.500001") + noise


@pytest.mark.parametrize(
    ("first", "last", "symbol", "number"),
    [
        (0.0, 0.25, "ms", "250"),
        (0.0, 3.0, "s", "3"),
        (7000.0, 7100.0, "s", "7100"),  # a short stretch late in a log
        (0.0, 240.0, "s", "240"),
        (0.0, 300.0, "min", "5"),
        (0.0, 7200.0, "min", "120"),
        (0.0, 10_800.0, "h", "3"),
        (-1800.0, 14_400.0, "h", "4"),
    ],
)
def test_time_scale_suits_the_stretch(first, last, symbol, number):
    """Milliseconds to hours; 60 and 3600 are exact."""
    scale = time_scale([first, last])

    assert scale.symbol == symbol
    assert scale.exact(last) == number
    assert scale.size == pytest.approx(last / float(number))


def test_printed_gives_uncertainty_and_margin_of_a_temperature_in_kelvin():
    """83.6 °C, at most 110 °C: 26.4 K are left."""
    texts = printed(83.6, 1.8, "°C", high=110.0, margin=26.4)

    assert texts.with_unit(texts.value) == "83.6 °C"
    assert texts.with_unit(texts.high) == "110 °C"
    assert texts.with_difference_unit(texts.expanded) == "1.8 K"
    assert texts.with_difference_unit(texts.margin) == "+26.4 K"
    assert texts.with_difference_unit(DASH) == DASH
    assert printed(5.0, 0.1, "V").with_difference_unit("0.1") == "0.1 V"


def test_with_uncertainty_shows_a_plain_ratio_when_told():
    """A power factor is no percentage."""
    assert with_uncertainty(0.953, 0.004, "", per_cent=False) == "0.9530 ± 0.0040"


def test_with_uncertainty_far_below_the_value_is_still_shown():
    """A U that no digit of the value reaches is not printed as zero."""
    text = with_uncertainty(12.0, 1e-15, "V")

    assert text.endswith("± 1e−15 V")


@pytest.mark.parametrize(
    ("value", "unit", "text"),
    [
        (0.0123, "V", "12.3 mV"),
        (230.0, "V", "230 V"),
        (0.0, "V", "0 V"),
        (47e3, "ohm", "47 kΩ"),
        (1e-4, "1/K", "100 ppm/K"),
        (5e-5, "s", "50 µs"),
        (123_456.0, "W", "123.46 kW"),
        (-0.5, "V", "−500 mV"),
        (0.05, "", "5 %"),
        (12.5, "K/W", "12.5 K/W"),
    ],
)
def test_quantity_takes_a_sensible_prefix(value, unit, text):
    """Numbers between 1 and 1000 where the unit allows it."""
    assert quantity(value, unit) == text


@pytest.mark.parametrize(
    ("low", "high", "unit", "text"),
    [
        (0.88, None, "", "≥ 88 %"),
        (0.8825, None, "", "≥ 88.25 %"),
        (None, 0.12, "V", "≤ 120 mV"),
        (23.52, 24 * 1.02, "V", "23.52 V to 24.48 V"),
        (None, 12 * 1.1, "A", "≤ 13.2 A"),  # 13.200000000000001 in binary
        (None, 1 / 3, "V", "≤ 333.3333 mV"),
        (None, None, "V", DASH),
        (None, 0.0, "V", "≤ 0 V"),
        (-12.24, None, "V", "≥ −12.24 V"),
    ],
)
def test_limit_range_is_as_written(low, high, unit, text):
    """A limit is printed as it is, not rounded to anything."""
    assert limit_range(low, high, unit) == text


@pytest.mark.parametrize(
    ("value", "expanded", "low", "high", "shown"),
    [
        (0.88497, 0.02, 0.885, None, "88.497"),  # 88.5 would look as if it met 88.5
        (0.8849, 0.02, 0.885, None, "88.49"),
        (0.876, 0.25, 0.879, None, "87.6"),  # 88 would lie beyond 87.9
        (0.885, 0.02, 0.885, None, "88.5"),  # equal: nothing to tell apart
        (0.8851, 0.02, 0.885, None, "88.51"),
        (0.9004, 0.02, None, 0.90, "90.04"),
    ],
)
def test_printed_value_stays_on_its_side_of_the_limit(value, expanded, low, high, shown):
    """More digits where rounding would move a value onto its limit or beyond it."""
    assert printed(value, expanded, "", low=low, high=high).value == shown


@given(value=BENCH, expanded=st.floats(1e-6, 1e3), limit=BENCH, unit=st.sampled_from(UNITS))
def test_printed_value_compares_with_its_limit_as_the_number_does(value, expanded, limit, unit):
    """What a reader sees agrees with what is true, wherever both differ by more than a float can tell."""
    texts = printed(value, expanded, unit, low=limit)

    if abs(value - limit) > 1e-9 * max(abs(limit), abs(value)) + 1e-9:
        assert (number(texts.value) > number(texts.low)) == (value > limit)
        assert number(texts.value) != number(texts.low)


@given(value=BENCH, expanded=st.floats(1e-6, 1e3), unit=st.sampled_from(UNITS))
def test_printed_rounds_to_the_nearest_of_its_last_digit(value, expanded, unit):
    """Value and U lie within half a unit of their last digit of what they stand for."""
    texts = printed(value, expanded, unit)
    scale = scale_for(unit, [value, expanded])

    for text, true in ((texts.value, value), (texts.expanded, expanded)):
        last = Decimal(1).scaleb(scale.number(expanded).adjusted() - 1)  # the second digit of U
        assert abs(number(text) - scale.number(true)) <= last * Decimal("0.5000001") * (
            10 if first_two(expanded) > 9.94 else 1
        )


def first_two(value: float) -> float:
    """A number between 1 and 10 with the digits of the value; from 9.95 on, rounding reaches the next decade."""
    return value / 10.0 ** math.floor(math.log10(value))


@example(value=1000.0, expanded=5e-324, low=None, margin=-5e-324)
@given(value=FINITE | st.none() | st.just(math.nan), expanded=FINITE | st.none(), low=FINITE | st.none(), margin=FINITE)
def test_printed_takes_any_number(value, expanded, low, margin):
    """Nothing a file could hold makes it fail, and no negative zero comes out."""
    texts = printed(value, expanded, "V", low=low, margin=margin)

    for text in (texts.value, texts.expanded, texts.low, texts.margin):
        assert text
        assert not text.startswith(MINUS) or text.strip(f"{MINUS}0.")


def test_printed_shows_a_margin_that_would_round_to_zero():
    """A margin of almost nothing is still seen, with its sign."""
    assert printed(0.90004, 0.02, "", low=0.9, margin=0.00004).margin == "+0.004"
    assert printed(0.89996, 0.02, "", low=0.9, margin=-0.00004).margin == "−0.004"


def test_printed_leaves_a_text_as_it_is():
    """A behaviour has no unit and no digits."""
    texts = printed("constant current", None, "")

    assert texts.with_unit(texts.value) == "constant current"
    assert texts.expanded == DASH


@pytest.mark.parametrize(
    ("share", "required", "text"),
    [
        (0.973, None, "97.3 %"),
        (1.0, None, "> 99.9 %"),
        (0.9991, None, "> 99.9 %"),
        (0.0, None, "< 0.1 %"),
        (0.0004, None, "< 0.1 %"),
        (0.5, None, "50.0 %"),
        (0.97496, 0.975, "97.496 %"),  # 97.5 % would look shown
        (0.97504, 0.975, "97.504 %"),
        (0.975, 0.975, "97.5 %"),
        (0.9993, 0.9995, "99.9 %"),
        (0.99951, 0.9995, "99.951 %"),
        (None, None, DASH),
    ],
)
def test_probability_tells_the_side_of_what_is_required(share, required, text):
    """In per cent, and never rounded across the probability that is needed."""
    assert probability(share, required=required) == text


@pytest.mark.parametrize(
    ("seconds", "text"),
    [
        (0.0123, "12.3 ms"),
        (45.2, "45.2 s"),
        (59.99, "1 min"),
        (90.0, "1 min 30 s"),
        (7200.0, "2 h"),
        (3725.0, "1 h 2 min 5 s"),
        (0.0, "0 s"),
        (-90.0, "−1 min 30 s"),
        (None, DASH),
    ],
)
def test_duration_in_hours_minutes_and_seconds(seconds, text):
    """Short ones with a prefix, long ones in parts."""
    assert duration(seconds) == text


def test_count_keeps_thousands_apart():
    """A space between thousands."""
    assert count(1_234_567) == "1 234 567"


def test_limit_of_a_formula_is_printed_to_seven_digits():
    assert limit_range(0.071 * math.log(24) - 0.0014 * 24 + 0.67, None, "") == "≥ 86.20418 %"
    assert limit_range(0.12345678, None, "V") == "≥ 123.45678 mV"  # as it was written
    assert printed(0.9, 0.01, "", low=1 / 3).low == "33.33333"
