"""Slips that are not YAML, or another YAML than was meant: told where the hand slipped."""

from __future__ import annotations

import re

import pytest
import yaml

from acceptance.limitfile import yamltree
from acceptance.limitfile.yamltree import read_tree


@pytest.fixture(params=["CSafeLoader", "SafeLoader"], autouse=True)
def loader(request, monkeypatch):
    """Every test with the fast parser and with the one in pure Python."""
    if not hasattr(yaml, request.param):
        pytest.skip("this PyYAML has no fast parser")
    monkeypatch.setattr(yamltree, "_LOADER", getattr(yaml, request.param))


NO_COLON = "this key has no colon"
COMMA = "has a decimal comma, and a limits file takes a decimal point"
ALIGN = "this does not line up with what is above"
CASES = {
    # a colon is missing: where it is missing, not where the parser stumbles
    "first line": ("acceptance 1\nproduct: {name: x}\n", 1, 1, NO_COLON, "expected key: value"),
    "above a comment": ("acceptance 1\n\n# note: it\nproduct: x\n", 1, 1, NO_COLON, "expected key: value"),
    "of a section": ("limits\n  efficiency:\n    - 1\n", 1, 1, NO_COLON, "expected key: value"),
    "above a list": ("limits:\n  efficiency\n    - {name: a, min: 1 %}\n", 2, 3, NO_COLON, "expected key: value"),
    "between keys": ("a: 1\nlimits\nb: 2\n", 2, 1, NO_COLON, "expected key: value"),
    "last line": ("a: 1\nlimits\n", 2, 1, NO_COLON, "expected key: value"),
    "before a bracket": ("a: 1\n  \nb {c: x, d: y}\n", 3, 1, NO_COLON, "expected a colon before the bracket"),
    "bracket within": ("a:\n  input {b: ac, c: 2}\n", 2, 3, NO_COLON, "expected a colon before the bracket"),
    "no space": ("a:1\nb: 2\n", 1, 1, "no space stands after this key's colon", "expected key: value"),
    "no space below": ("a: 0\nb:1\nc: 2\n", 2, 1, "no space stands after this key's colon", "expected key: value"),
    "bracket, then quotes": ('a: 1\nb {c: "x", d: 2}\n', 2, 1, NO_COLON, "expected a colon before the bracket"),
    # one colon too many, as before
    "two colons": ("a: b: c\n", 1, 5, "a colon stands where no key can be", "quotes round"),
    "text with a colon": ("note: see here: there\n", 1, 15, "a colon stands where no key can be", "quotes round"),
    # indentation: with the lines that it could line up with
    "deeper than a mapping": ("r:\n  i: {a: 1}\n   o: 2\n", 3, 4, ALIGN, "expected 2 spaces before it, as line 2 has"),
    "deeper than a text": ("r:\n  i: ac\n   o: 2\n", 3, 4, ALIGN, "expected 2 spaces before it, as line 2 has"),
    "deeper in a list": ("l:\n  - a: 1\n     b: 2\n", 3, 6, ALIGN, "expected 4 spaces before it, as line 2 has"),
    "deeper than a list": (
        "l:\n  e:\n    - {n: a}\n   f:\n    - {n: b}\n",
        4,
        4,
        ALIGN,
        "expected 2 spaces before it, as line 2 has",
    ),
    "between two": ("a:\n  b: 1\n c: 2\n", 3, 2, ALIGN, "expected 2 spaces before it, as line 2 has, or 0, as line 1"),
    "less than a dash": (
        "l:\n  e:\n    - {n: a}\n\n   - {n: b}\n",
        5,
        4,
        ALIGN,
        "expected 4 spaces before it, as line 3 has, or 2, as line 2 has",
    ),
    "more than a dash": (
        "l:\n  e:\n    - {n: a}\n     - {n: b}\n",
        4,
        6,
        ALIGN,
        "expected 4 spaces before it, as line 3",
    ),
    "key below a dash": ("l:\n  - a\n  b: 1\n", 3, 3, ALIGN, "expected a dash, as line 2 has, or another indentation"),
    "dash below a key": ("l:\n  a: 1\n  - b\n", 3, 3, ALIGN, "expected a key, as line 2 has, or another indentation"),
    "after a bracket": ("a: {b: 1} c\nd: 1\n", 1, 11, "a text stands after the end of the value", "nothing there"),
    "after a quote": ("a: 'x' y\nd: 1\n", 1, 8, "a text stands after the end of the value", "nothing there"),
    # a decimal comma: within brackets YAML takes it for the end of the value
    "comma": ("a: {max: 0,21 W, b: 2}\n", 1, 10, f'"0,21 W" {COMMA}', "expected 0.21 W"),
    "comma with a sign": ("a: {max: -3,5 V}\n", 1, 10, f'"-3,5 V" {COMMA}', "expected -3.5 V"),
    "comma at the end": ("a: {b: 2,\n  max: 0,5 %}\n", 2, 8, f'"0,5 %" {COMMA}', "expected 0.5 %"),
    "comma in a text": ("a: {revision: 2,1}\n", 1, 15, f'"2,1" {COMMA}', "expected 2.1, or quotes round a text"),
    "comma in a list": ("a: [207,5 V, 253 V]\n", 1, 5, f'"207,5 V" {COMMA}', "expected 207.5 V"),
    "thousands": ("a: {max: 1,000 W}\n", 1, 10, f'"1,000 W" {COMMA}', "expected 1.000 W or 1000 W"),
}


@pytest.mark.parametrize("case", CASES)
def test_slip_is_told_where_it_was_made(case):
    """One flaw, at its own line and column, by both parsers."""
    text, line, column, found, expected = CASES[case]

    (flaw,) = read_tree(text.encode()).flaws

    assert (flaw.line, flaw.column, flaw.found) == (line, column, found)
    assert expected in flaw.expected


def test_each_decimal_comma_is_told_once(faults_of, good_text):
    """Two of one mapping and one of a list; nothing about units or unknown keys beside them."""
    content = (
        good_text.replace("min: 4.9 V, max: 5.1 V", "min: 4,9 V, max: 5,1 V")
        .replace("[207 V, 253 V]", "[207,5 V, 253,5 V]")
        .replace("settled: 1 K/30 min", "settled: 1,5 K/30 min")
        .replace("load: {aux: 50 %}", "load: {aux: 50,5 %}")
        .replace("{main: 100 %, aux: any}", "{main: 99,5 %, aux: any}")
    )

    found = [fault.found.partition(" has ")[0] for fault in faults_of(content)]

    assert found == ['"207,5 V"', '"253,5 V"', '"99,5 %"', '"50,5 %"', '"4,9 V"', '"5,1 V"', '"1,5 K/30 min"']


@pytest.mark.parametrize(
    "text", ["a: [25, 50 %]", "a: {b: 5, 12V: 50 %}", "a: ['0',21]", "a: {b: '0',21: }", "a: [1.5,2 V]"]
)
def test_other_commas_are_no_decimal_commas(text):
    """A space after it, a value of its own, quotes, or a point already."""
    assert read_tree(text.encode()).flaws == []


def test_key_with_a_bracket_lacks_its_colon(faults_of, good_text):
    """`product {name: x}` is YAML with a strange key."""
    faults = faults_of(re.sub("product: {.*}", "product {name: x}", good_text))

    assert [(f.line, f.column, f.found, f.expected) for f in faults if f.line == 3] == [
        (3, 1, 'the key "product {name" has a bracket', "expected a colon before the bracket: product: {...")
    ]


@pytest.mark.parametrize(
    ("old", "new", "found", "expected"),
    [
        ("  ripple:\n", "ripple:\n", 'the key "ripple" is not known here', "expected it under limits:"),
        (
            "\nlot:\n  every",
            "\n  lot:\n    every",
            'the key "lot" is not known here',
            "expected it at the start of a line",
        ),
        ("  min_dwell:", "min_dwell:", 'the key "min_dwell" is not known here', "expected it under log:"),
    ],
)
def test_key_of_another_level_is_sent_there(faults_of, good_text, old, new, found, expected):
    """A key known one level up or down has lost its indentation, or got one."""
    assert good_text.count(old) == 1
    content = good_text.replace(old, new)
    if "lot" in new:
        content = content.replace("  attributes:", "    attributes:").replace(
            "  tolerance: {cov", "    tolerance: {cov"
        )

    assert [expected for fault in faults_of(content) if fault.found == found and expected in fault.expected] == [
        expected
    ]
