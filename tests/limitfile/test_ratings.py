"""Limits and instruments that do not go with the ratings: slips of the pen that would let any unit pass.

Each case puts something else in one place of the good file; the sign § marks where the fault must point.
"""

# ruff: noqa: E501 - the table of cases reads best with one case a line

from __future__ import annotations

from pathlib import Path

import pytest

from acceptance.limitfile.load import load_limits

GOOD = (Path(__file__).parent / "data" / "good.yaml").read_text(encoding="utf-8")
ROOT = Path(__file__).parents[2]

# the good file's product: input 230 V a.c., main 24 V 5 A, aux 5 V 2 A: 130 W together
REFUSED = [
    # efficiency
    ("min: 88 %}", "max: §88 %}", "an efficiency with a max and no min lets any low one pass", "expected min:"),
    ("min: 88 %}", "min: §0.88 %}", "an efficiency of 0.88 % as min lets any pass", "expected one such as 88 %"),
    ("min: 88 %}", "min: §0 %}", "an efficiency of 0 % as min lets any pass", "expected one such as 88 %"),
    # no-load power: 20 % of 130 W are 26 W
    ("max: 0.21 W}", "max: §210 MW}", "a no-load power of 210 MW and a rated output power of 130 W do not go together", "below 26 W, 20 % of it"),
    ("max: 0.21 W}", "max: §210 W}", "a no-load power of 210 W and a rated output power of 130 W", "below 26 W, 20 % of it"),
    ("max: 0.21 W}", "max: §26 W}", "a no-load power of 26 W and a rated output power of 130 W", "below 26 W"),
    # ripple: 20 % of 24 V are 4.8 V
    ("max: 120 mV", "max: §4.8 V", "a ripple of 4.8 V and a rated output voltage of 24 V do not go together", "below 4.8 V, 20 % of it"),
    ("{name: noise, at", "{name: noise, output: aux, at", "", ""),
    ("{name: noise, at: {load: 100 %, input: 230 V}, max: 120 mV", "{name: noise, output: aux, at: {load: 100 %, input: 230 V}, max: §1.2 V", "a ripple of 1.2 V and a rated output voltage of 5 V", "below 1 V"),
    # regulation
    ("}}, max: 1 %", "}}, max: §100 %", "a load_regulation of 100 % as max lets any pass", "expected below 50 %"),
    ("}}, max: 1 %", "}}, max: §50 %", "a load_regulation of 50 % as max lets any pass", "expected below 50 %"),
    ("}}, max: 1 %", "}}, max: 49 %", "", ""),
    ("100 %}, max: 0.5 %", "100 %}, max: §50 %", "a line_regulation of 50 % as max lets any pass", "expected below 50 %"),
    # output voltage
    ("within: 2 %}", "within: §50 %}", "a band of 50 % to either side lets any pass", "expected below 50 %"),
    ("within: 2 %}", "within: 49 %}", "", ""),
    ("min: 4.9 V, max: 5.1 V", "min: §5.01 V, max: 5.1 V", "min 5.01 V lies above the rated 5 V, which would fail", "expected at most 5 V"),
    ("min: 4.9 V, max: 5.1 V", "min: 4.9 V, max: §4.99 V", "max 4.99 V lies below the rated 5 V, which would fail", "expected at least 5 V"),
    ("min: 4.9 V, max: 5.1 V", "min: 5 V, max: 5.1 V", "", ""),
    ("min: 4.9 V, max: 5.1 V", "max: 5.1 V", "", ""),
    ("min: 4.9 V, max: 5.1 V", "min: §49 mV, max: 5.1 V", "min 49 mV and the rated 5 V do not go together", "expected above 2.5 V, half of it, or no min"),
    ("min: 4.9 V, max: 5.1 V", "min: §0 V, max: 5.1 V", "min 0 V and the rated 5 V do not go together", "or no min"),
    ("min: 4.9 V, max: 5.1 V", "min: 4.9 V, max: §51 V", "max 51 V and the rated 5 V do not go together", "expected below 10 V, twice it, or no max"),
    ("output: aux, at: {load: any, input: any}, min: 4.9 V, max: 5.1 V", "at: {load: any, input: any}, min: §4.9 V, max: 24.5 V", "min 4.9 V and the rated 24 V", "above 12 V"),
    # one dwell at both ends; loads are met within 3 % here, inputs within 1 %
    ("from: 0 %, to: 100 %", "from: 94 %, to: §100 %", "one dwell could serve as both ends, 94 % and 100 %", "expected them more than 6 % apart, twice the tolerance of a load"),
    ("from: 0 %, to: 100 %", "from: 93.9 %, to: 100 %", "", ""),
    ("from: 207 V, to: 253 V", "from: 229 V, to: §233 V", "one dwell could serve as both ends, 229 V and 233 V", "expected them more than 4.62 V apart, twice the tolerance of an input voltage"),
    ("from: 207 V, to: 253 V", "from: 228 V, to: 233 V", "", ""),
    # reversed, zero being on the wrong side
    ("from: 0 %, to: 100 %", "from: 100 %, to: §0 %", "from and to are reversed or equal", "expected from to be the smaller one"),
    ("from: 207 V, to: 253 V", "from: 253 V, to: §0 V", "from and to are reversed or equal", "expected from to be the smaller one"),
    ("from: 207 V, to: 253 V", "from: §0 V, to: 253 V", "an input voltage of 0 V is not above zero", "such as 207 V"),
    ("from: 207 V, to: 253 V", "from: §0 %, to: 253 V", '"0 %" is a ratio, not a voltage', "expected a voltage"),
    # several outputs: the others' loads matter to a sweep of one
    ("at: {input: 230 V, load: {aux: 50 %}}", "at: §{input: 230 V}", "no load is given for aux", 'such as load: {aux: 50 %}, or "any"'),
    ("at: {input: 230 V, load: {aux: 50 %}}", "at: {input: 230 V, load: {aux: any}}", "", ""),
    # instruments
    ("meter_range: 60 V", "meter_range: §6 V", "the range of 6 V is too small for the rated 24 V of main", "expected a range above 24 V, or auto"),
    ("meter_range: 60 V", "meter_range: §19.1 V", "the range of 19.1 V is too small for the rated 24 V", "above 24 V"),
    ("meter_range: 60 V", "meter_range: 19.2 V", "", ""),
    ('{device: "PM-1", accuracy', '{device: "PM-1", meter_range: 1 W, accuracy', "", ""),
    ('  ripple: {device: "S-1"', '  input_voltage: {device: "V-1", meter_range: §100 V, accuracy: "1 V"}\n  ripple: {device: "S-1"', "the range of 100 V is too small for the rated 230 V of the input", "above 230 V"),
    ('  ripple: {device: "S-1"', '  output_current aux: {device: "A-1", meter_range: §200 mA, accuracy: "1 mA"}\n  ripple: {device: "S-1"', "the range of 200 mA is too small for the rated 2 A of aux", "above 2 A"),
    ('  ripple: {device: "S-1"', '  output_voltage main: {device: "V-1", accuracy: "1 mV"}\n  ripple: {device: "S-1"', "", ""),
    ("resistance: 1 ohm, tol", "resistance: §2 ohm, tol", "the rated 5 A of main drop 10 V across 2 ohm, and the converter reads -6.144 V to 6.144 V", "expected a smaller shunt, or the span that was used"),
    ("span: [-6.144 V, 6.144 V]", "span: [-4.096 V, 4.096 V]", "the rated 5 A of main drop 5 V across 1 ohm", "expected a smaller shunt"),
]  # fmt: skip


@pytest.mark.parametrize(("old", "new", "found", "expected"), REFUSED, ids=[case[1][-40:] for case in REFUSED])
def test_what_does_not_go_with_the_ratings_is_refused(faults_of, old, new, found, expected):
    """One fault, where the mark stands, with both figures; none where nothing is to be found."""
    assert GOOD.count(old) == 1, old
    marked = GOOD.replace(old, new)

    faults = faults_of(marked.replace("§", ""))

    assert [fault.found.startswith(found) for fault in faults] == ([True] if found else []), faults
    if "§" in marked:
        before = marked[: marked.index("§")]
        place = (before.count("\n") + 1, len(before) - (before.rfind("\n") + 1) + 1)
        assert (faults[0].line, faults[0].column) == place
    assert all(expected in fault.expected for fault in faults)


def supply(voltage: str, current: str, limits: str) -> str:
    """A limits file of one output with these limits."""
    return (
        "acceptance: 1\nproduct: {name: p}\n"
        "ratings: {input: {supply: ac, voltage: 230 V}, "
        f"outputs: {{main: {{voltage: {voltage}, current: {current}}}}}}}\n"
        f"limits: {{{limits}}}\n"
    )


@pytest.mark.parametrize(
    ("voltage", "current", "power", "passes"),
    [
        ("12 V", "5 A", "21 W", False),  # 60 W: 0.21 W or 210 mW were meant
        ("12 V", "5 A", "0.21 W", True),
        ("48 V", "21 A", "30 W", True),  # a server's supply, 3 % of what it is rated for
        ("30 V", "3 A", "10 W", True),  # a bench supply with a mains transformer, 11 %
        ("5 V", "1 A", "2.5 W", True),  # a small mains transformer takes half of what it can give
        ("5 V", "1 A", "5 W", False),  # not as much as it can give
        ("5 V", "1 A", "210 W", False),
    ],
)
def test_no_load_power_is_compared_with_the_rated_power(faults_of, voltage, current, power, passes):
    """Refused from 20 % of the rated output power on; of small units only what exceeds 5 W or all they can give."""
    content = supply(voltage, current, f"no_load_power: [{{at: {{input: 230 V}}, max: {power}}}]")

    assert [fault.column > 0 for fault in faults_of(content)] == ([] if passes else [True])


@pytest.mark.parametrize(
    ("span", "passes"),
    [
        ("from: 0 %, to: 1 %", False),  # 1 % is met from 0 on
        ("from: 0 %, to: 1.5 %", True),
        ("from: 8 %, to: 10 %", False),  # within 1 point each at 10 % and below
        ("from: 7 %, to: 10 %", True),
        ("from: 48 %, to: 52 %", False),  # 50 % meets both
        ("from: 48 %, to: 52.1 %", True),
        ("from: 9 %, to: 12 %", False),  # one point and two
        ("from: 9 %, to: 12.1 %", True),
    ],
)
def test_ends_of_a_span_are_told_apart_by_their_tolerances(faults_of, span, passes):
    """The default tolerances: 2 points of load, 1 at 10 % and below, at no load only what is no load."""
    content = supply("12 V", "5 A", f"load_regulation: [{{{span}, at: {{input: 230 V}}, max: 1 %}}]")

    assert [fault.found[:9] for fault in faults_of(content)] == ([] if passes else ["one dwell"])


def test_ranges_of_a_bench_file_are_told_in_the_bench_file(faults_of):
    """They meet the ratings there; what it replaces in the limits file is not asked again."""
    bench = 'instruments:\n  output_voltage: {device: "D", accuracy: "1 mV", meter_range: 10 V}\n'

    (fault,) = faults_of(GOOD, bench=bench)

    assert (Path(fault.file).name, fault.line, fault.column) == ("bench.yaml", 2, 64)
    assert fault.found == "the range of 10 V is too small for the rated 24 V of main"


def test_limits_are_compared_with_what_is_whole_of_faulty_ratings(faults_of):
    """A fault of one output does not hide that of a limit of another."""
    content = GOOD.replace("current: 5 A}", "current: 5}").replace("max: 5.1 V", "max: 51 V")

    assert [fault.found for fault in faults_of(content)] == [
        '"5" has no unit',
        "max 51 V and the rated 5 V do not go together",
    ]


def test_requirements_alike_but_for_their_names_are_no_fault(faults_of):
    """Two names for one thing, as when two customers ask for it."""
    line = "    - {name: idle, at: {input: 230 V}, max: 0.21 W}\n"

    assert faults_of(GOOD.replace(line, line + line.replace("idle", "idle-too"))) == ()


@pytest.mark.parametrize("path", sorted((ROOT / "limits").glob("*.yaml")), ids=lambda path: path.name)
def test_limits_files_that_are_shipped_have_no_fault(path):
    """Those to start from, and the demo's with their benches."""
    if "bench" in path.stem.split("-")[:2] and "supply" not in path.stem:
        assert load_limits(ROOT / "limits" / "start-here.yaml", path).bench_file == path.name
    else:
        assert load_limits(path).requirements
