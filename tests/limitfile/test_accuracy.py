"""Accuracy texts of instruments."""

from __future__ import annotations

import math
import re

import pytest
from hypothesis import given
from hypothesis import strategies as st

from acceptance.errors import MeasurementError
from acceptance.limitfile.accuracy import Accuracy, parse_accuracy


@pytest.mark.parametrize(
    ("text", "kind", "parts"),
    [
        ("0.1 % reading + 0.05 W", "power", {"gain": 0.001, "fixed": 0.05}),
        ("0.05 % reading + 0.02 % range", "voltage", {"gain": 0.0005, "of_range": 0.0002}),
        ("0.05 % of reading + 0.02 % of range + 3 digits", "voltage", {"gain": 5e-4, "of_range": 2e-4, "digits": 3}),
        ("±(0.1%rdg + 2 dgt)", "voltage", {"gain": 0.001, "digits": 2}),
        ("+/- 0.5 % rdg. + 5 counts", "current", {"gain": 0.005, "digits": 5}),
        ("0.1 % of full scale", "power", {"of_range": 0.001}),
        ("0.1 % fs+1 digit", "power", {"of_range": 0.001, "digits": 1}),
        ("0.02 % range+2 mV", "voltage", {"of_range": 0.0002, "fixed": 0.002}),
        ("100 ppm reading + 50 ppm range", "voltage", {"gain": 1e-4, "of_range": 5e-5}),
        ("1.5 K", "temperature", {"fixed": 1.5}),
        ("1.5 °C", "temperature", {"fixed": 1.5}),
        ("0.5 % reading + 1 K", "temperature", {"gain": 0.005, "fixed": 1.0}),
        ("2e+1 mV + 1E-3 V", "voltage", {"fixed": 0.021}),
        ("0.002", "ratio", {"fixed": 0.002}),
        ("1 mV + 2 mV", "voltage", {"fixed": 0.003}),
        ("0.1 % reading, k = 2", "voltage", {"gain": 0.001, "coverage": 2.0}),
        ("0.1 % reading (k=2)", "voltage", {"gain": 0.001, "coverage": 2.0}),
        ("0.1 % reading; K = 1.96", "voltage", {"gain": 0.001, "coverage": 1.96}),
        ("2 mV k=3", "voltage", {"fixed": 0.002, "coverage": 3.0}),
    ],
)
def test_parse_accuracy_value(text, kind, parts):
    """As data sheets write them."""
    found = parse_accuracy(text, kind)

    expected = Accuracy(text=text, **parts)
    for name in ("gain", "of_range", "fixed", "digits"):
        assert getattr(found, name) == pytest.approx(getattr(expected, name), rel=1e-12, abs=0)
    assert found.coverage == expected.coverage
    assert found.text == text


@pytest.mark.parametrize(
    ("text", "kind", "words"),
    [
        ("", "voltage", "no accuracy is given"),
        ("0.1 %", "voltage", '"0.1 %" in "0.1 %" does not say of what'),
        ("0.1 % + 2 digits", "voltage", '"0.1 %" in "0.1 % + 2 digits" does not say of what'),
        ("50 ppm", "voltage", "does not say of what"),
        ("0.1 % rading", "voltage", '"rading" in "0.1 % rading" is neither reading, range nor digits'),
        ("5 mV reading", "voltage", '"5 mV reading" in "5 mV reading" needs % or ppm before "reading"'),
        ("0.1 reading", "voltage", 'needs % or ppm before "reading"'),
        ("0.1 % reading - 2 mV", "voltage", "is no accuracy term"),
        ("-0.1 % reading", "voltage", '"-0.1 % reading" in "-0.1 % reading" is negative'),
        ("0.1 % reading + -2 mV", "voltage", "is negative"),
        ("0.1 % reading +", "voltage", "lacks a term"),
        ("5 mA", "voltage", '"5 mA" is a current, not a voltage'),
        ("5", "voltage", '"5" has no unit'),
        ("0,1 % reading", "voltage", "is no accuracy term"),
        ("good", "voltage", '"good" in "good" is no accuracy term'),
        ("0 % reading", "voltage", '"0 % reading" states no error at all'),
        ("0 V", "voltage", "states no error at all"),
        ("1e999 % reading", "voltage", '"1e999" in "1e999 % reading" is no number'),
        ("1e999 digits", "voltage", "is no number"),
        ("1 mV, k = 0", "voltage", "does not lie between 1 and 10"),
        ("1 mV, k = 0.5", "voltage", "does not lie between 1 and 10"),
        ("1 mV, k = 1000", "voltage", "does not lie between 1 and 10"),
        ("1 mV, k = 1.2.3", "voltage", '"1.2.3" in "1 mV, k = 1.2.3" is no number'),
        ("1 mV" * 100, "voltage", "too long"),
    ],
)
def test_parse_accuracy_refuses(text, kind, words):
    """What is not understood is refused, with the term named."""
    with pytest.raises(MeasurementError, match=re.escape(words)):
        parse_accuracy(text, kind)


@given(
    gain=st.integers(1, 10_000),
    of_range=st.integers(0, 10_000),
    digits=st.integers(0, 100),
    joint=st.sampled_from(["+", " + ", "+ "]),
)
def test_parse_accuracy_is_the_sum_of_its_terms(gain, of_range, digits, joint):
    """In any order and spacing."""
    terms = [f"{gain} ppm reading", f"{of_range} ppm range", f"{digits} digits"]

    forward, backward = (parse_accuracy(joint.join(order), "voltage") for order in (terms, terms[::-1]))

    assert (forward.gain, forward.of_range, forward.digits) == (gain / 1e6, of_range / 1e6, digits)
    assert (backward.gain, backward.of_range, backward.digits) == (forward.gain, forward.of_range, forward.digits)


@given(text=st.text(alphabet="0123456789.eE+-±%()kK=,; readingofsclmVAWpt/", max_size=40))
def test_parse_accuracy_gives_an_accuracy_or_a_measurement_error(text):
    """Nothing else leaves it; every bound is finite, none negative, not all zero."""
    try:
        found = parse_accuracy(text, "voltage")
    except MeasurementError:
        return
    parts = (found.gain, found.of_range, found.fixed, found.digits)
    assert all(math.isfinite(part) and part >= 0 for part in parts)
    assert any(parts)
