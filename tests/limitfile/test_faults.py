"""Broken files: every kind of fault, with line, column, what was found and what is expected.

Each case takes the good file and puts something else in one place; the sign § marks where the fault must point.
"""

# ruff: noqa: E501 - the table of cases reads best with one case a line

from __future__ import annotations

from pathlib import Path

import pytest

GOOD = (Path(__file__).parent / "data" / "good.yaml").read_text(encoding="utf-8")


def broken(old: str, new: str) -> tuple[str, int, int]:
    """The good text with `old` (which must stand there once) replaced, and line and column of the sign §."""
    assert GOOD.count(old) == 1, old
    assert new.count("§") == 1, new
    marked = GOOD.replace(old, new)
    before = marked[: marked.index("§")]
    return marked.replace("§", ""), before.count("\n") + 1, len(before) - (before.rfind("\n") + 1) + 1


VOLTS = "expected a voltage with its unit, such as 24 V"
RATIO = "expected a ratio with its unit, such as 88 %"
LOAD = 'expected a load with its unit, such as 50 %, "any", or one for each output, such as {main: 50 %}'
EXTREME = 'expected a voltage with its unit, such as 24 V, or "any"'
TERMS = 'expected terms such as "0.05 % reading + 0.02 % range + 3 digits, k = 2"'
NAMES = "expected a letter or digit, then letters, digits, space and . + - _"
CASES = [
    # unknown keys: at the key
    ("min: 88 %", "§mim: 88 %", 'the key "mim" is not known here', "name, note, output, at, average, min or max; min is"),
    ("decision:", "§decisions:", 'the key "decisions" is not known here', "decision is spelled alike"),
    ("  ripple:\n    - {", "  §riple:\n    - {", 'the key "riple" is not known here', "ripple is spelled alike"),
    ("protection_class: I}", "§class: I}", 'the key "class" is not known', "expected name, revision or protection_class"),
    ("{load: 50 %, input: 230 V}, min", "{load: 50 %, input: 230 V, §temp: 1 K}, min", 'the key "temp"', "load or input"),
    ("load_mode: CR", "§mode: CR", 'the key "mode" is not known here', "columns, stated, load_mode, settle or min_dwell"),
    ("{heading: \"noise_mv\", unit: mV}", "{heading: x, §units: mV}", 'the key "units" is not known', "unit is spelled"),
    ("attributes:", "§atributes:", 'the key "atributes" is not known here', "attributes is spelled alike"),
    # units: at the value
    ("voltage: 24 V", "voltage: §24", '"24" has no unit', VOLTS),
    ("voltage: 24 V", "voltage: §24 A", '"24 A" is a current, not a voltage', VOLTS),
    ("voltage: 24 V", "voltage: §24 volt", '"volt" in "24 volt" is no known unit', VOLTS),
    ("voltage: 24 V", "voltage: §0 V", '"0 V" is not above zero', VOLTS),
    ("voltage: 24 V", 'voltage: §"0,5 V"', '"0,5 V" has a decimal comma, and a limits file takes a decimal point', VOLTS),
    ("voltage: 24 V", "voltage: §[24 V]", "a list stands here", VOLTS),
    ("voltage: 24 V", "voltage: §{is: 24 V}", "a mapping stands here", VOLTS),
    ("{voltage: 24 V, ", "{§voltage: , ", "no value is given", VOLTS),
    ("min: 88 %", "min: §88", '"88" has no unit', RATIO),
    ("min: 88 %", "min: §0.88", '"0.88" has no unit', RATIO),
    ("min: 88 %", "min: §880 %", "an efficiency of 880 % cannot be", "expected at most 100 %"),
    ("min: 88 %", "min: §-1 %", '"-1 %" is below zero', RATIO),
    ("load: 50 %, input: 230 V}, min", "load: §half, input: 230 V}, min", '"half" does not begin with a number', LOAD),
    ("load: 50 %, input: 230 V}, min", "load: §50, input: 230 V}, min", '"50" has no unit', LOAD),
    ("load: 50 %, input: 230 V}, min", "load: §{}, input: 230 V}, min", "no load is given", LOAD),
    ("{load: 50 %, input: 230 V}, min", "{load: 50 %, input: §mains}, min", '"mains" does not begin', EXTREME),
    ("aux: any}, input", "aux: §all}, input", '"all" does not begin with a number', "expected a load such as 50 %"),
    ("settled: 1 K/30 min", "settled: §1 K", '"1 K" is no change within a time', "such as 1 K/30 min"),
    ("ambient: 40 °C", "ambient: §40 K", '"40 K" is a temperature difference, not a temperature', "such as 40 °C"),
    ("due: 2027-03-01", "due: §01.03.2027", '"01.03.2027" is no date', "expected year, month and day"),
    ("due: 2027-03-01", "due: §2027-02-30", '"2027-02-30" is no date', "such as 2027-03-01"),
    ("bits: 16", "bits: §16.5", '"16.5" is no whole number above zero', "such as 16"),
    ("bits: 16", "bits: §64", "a converter of 64 bits is not known", "expected at most 32"),
    ("confidence: 95 %, tol", "confidence: §20 %, tol", "20 % is no level of confidence", "50 % up to below 100 %"),
    ("{load: 3 %, input: 1 %}", "{load: §100 %}", "a tolerance of 100 % is none", "such as 2 %"),
    # ranges
    ("[207 V, 253 V]", "§[253 V, 207 V]", 'the range from "253 V" to "207 V" is reversed or empty', "the smaller first"),
    ("[207 V, 253 V]", "§[230 V, 230 V]", 'the range from "230 V" to "230 V" is reversed or empty', "the smaller first"),
    ("[207 V, 253 V]", "§207 V to 253 V", "this is not a list of two", "such as [207 V, 253 V]"),
    ("[207 V, 253 V]", "[207 V, §253]", '"253" has no unit', VOLTS),
    ("[105 %, 130 %]", "§[130 %, 105 %]", 'the range from "130 %" to "105 %" is reversed', "such as [105 %, 130 %]"),
    ("min: 4.9 V, max: 5.1 V", "min: 5.1 V, max: §4.9 V", "min and max are reversed or equal", "min to be the smaller"),
    ("from: 0 %, to: 100 %", "from: 50 %, to: §50 %", "from and to are reversed or equal", "from to be the smaller one"),
    ("from: 207 V, to: 253 V", "from: 253 V, to: §207 V", "from and to are reversed", "from to be the smaller one"),
    ("voltage: 230 V, range", "voltage: §260 V, range", "the rated voltage lies outside its range", "207 V to 253 V"),
    # missing keys and conditions: at the mapping they are missing from
    ('{name: "Twin rail 24/5", ', "§{", "name is missing", "expected name: a text"),
    ("{voltage: 24 V, current: 5 A}", "§{voltage: 24 V}", "current is missing", "expected current: 5 A"),
    ("{supply: ac, ", "§{", "supply is missing", "expected supply: ac or dc"),
    ("acceptance: 1\n", "§", "acceptance is missing", "expected acceptance: 1"),
    (", max: 0.21 W}", "}", "max is missing", "expected max: 0.21 W"),
    ("{name: noise, at: {load: 100 %, input: 230 V}, max: 120 mV, ", "§{", "max is missing", "expected max: 24 V"),
    ("at: {load: 50 %, input: 230 V}, min", "at: §{load: 50 %}, min", "the input is not given", 'at: {input: 230 V}, or'),
    ("at: {load: 50 %, input: 230 V}, min", "at: §{input: 230 V}, min", "the load is not given", "at: {load: 50 %}"),
    ("{name: idle, at: {input: 230 V}, max", "§{name: idle, max", "the input is not given", "expected it under at:"),
    ("at: {load: 100 %}, max: 0.5 %", "at: §{}, max: 0.5 %", "the load is not given", "such as at: {load: 50 %}"),
    ("at: {load: any, input: any}, within", "at: §{input: any}, within", "the load is not given", 'or "any"'),
    ("{name: eff-half, at: {load: 50 %, input: 230 V}, min: 88 %}", "§{name: x, at: {load: 5 %, input: 230 V}}",
     "no limit is given", "expected min: or max:"),
    ("short_circuit: {max: 130 %}", "short_circuit: §{}", "no limit is given", "expected min: or max:"),
    ("method: resistance, material: copper, ", "method: resistance, ", "the winding's material is not given", "copper"),
    ("max: 35 K, settled", "max: 35 K, material: §copper, settled", "a material is given for a probe", "method: res"),
    ("max: 110 °C, ", "max: 110 °C, class: §F, ", "max and class are both given", "expected one of them"),
    ("  ambient: 40 °C\n", "", "no rated ambient is given to adjust to", "such as ambient: 40 °C"),
    # conditions that make no sense
    ("load: 50 %, input: 230 V}, min", "load: §110 %, input: 230 V}, min",
     "load 110 % under efficiency is above rated current", "at most 100 %; tests above it belong under overcurrent"),
    ("load: 50 %, input: 230 V}, min", "load: §0 %, input: 230 V}, min", "efficiency at no load is always zero", "0 %"),
    ("{main: 100 %, aux: any}", "{main: §101 %, aux: any}", "load 101 % under efficiency is above", "at most 100 %"),
    ("[25 %, 50 %, 75 %, 100 %]", "[25 %, 50 %, 75 %, §125 %]", "load 125 % is above rated current", "at most 100 %"),
    ("[25 %, 50 %, 75 %, 100 %]", "[25 %, 50 %, §50 %]", "load 50 % stands twice in the average", "each load once"),
    ("[25 %, 50 %, 75 %, 100 %]", "§50 %", "this is not a list of two loads or more", "[25 %, 50 %, 75 %, 100 %]"),
    ("at: {input: 230 V}, min: 87 %", "at: {load: §5 %, input: 230 V}, min: 87 %",
     "a load under at: and an average are both given", "expected one of them"),
    ("at: {input: 230 V}, max: 0.21 W", "at: {load: §0 %, input: 230 V}, max: 0.21 W", "no_load_power takes no load", "left"),
    ("to: 100 %, at", "to: §110 %, at", "load 110 % is above rated current", "expected at most 100 %"),
    ("load: {aux: 50 %}", "load: §50 %", "load_regulation sweeps the load itself", "only other outputs' loads"),
    ("load: {aux: 50 %}", "load: {§main: 50 %}", 'load_regulation sweeps "main" itself', "only the other outputs"),
    ("within: 2 %}", "within: §2 %, min: 23 V}", "within and min or max are both given", "expected one kind of limit"),
    ("supply: ac", "supply: dc", "a d.c. supply has a frequency", "expected supply: ac, or no frequency"),
    # the rated range of the input, 1 % beyond it still allowed
    ("{load: 50 %, input: 230 V}, min", "{load: 50 %, input: §300 V}, min", "input 300 V lies outside the rated range",
     "expected 207 V to 253 V"),
    ("from: 207 V, to: 253 V", "from: §200 V, to: 253 V", "input 200 V lies outside the rated range", "207 V to 253 V"),
    ("from: 207 V, to: 253 V", "from: 207 V, to: §256 V", "input 256 V lies outside the rated range", "207 V to 253 V"),
    # names
    ("name: idle", "name: §eff-half", 'the name "eff-half" is used twice', "line 19, column 14 has this one"),
    ("name: idle", "name: §efficiency-2", 'the name "efficiency-2" is used twice', "line 20, column 7 has this one"),
    ("name: idle", "name: §oc.onset", 'the name "oc.onset" begins with "oc."', 'findings of "oc" are called so'),
    ("name: idle", "name: §calibration.PM", 'the name "calibration.PM" begins with calibration.', "expected another"),
    ("name: idle", 'name: §"=1+1"', 'the name "=1+1" has characters that do not fit', NAMES),
    ("name: idle", "name: §../idle", 'the name "../idle" has characters that do not fit', NAMES),
    ("name: idle", 'name: §"a\\nb"', "the text runs over several lines", "expected a text on one line"),
    ("name: idle", 'name: §" "', "an empty text stands here", "expected a text on one line"),
    ("name: idle", 'name: §""', "no value is given", "expected a text on one line"),
    ("  outputs:\n    main:", '  outputs:\n    §"<b>":', 'the output is called "<b>"', "expected letters, digits"),
    # outputs
    ("output: aux, at", "output: §auxx, at", '"auxx" is no output', "expected main or aux; aux is spelled alike"),
    ("{main: 100 %, aux: any}", "{main: 100 %, aux: any, §third: any}", '"third" is no output', "expected main or aux"),
    ("{main: 100 %, aux: any}", "§{main: 100 %}", "no load is given for aux", 'such as aux: 50 %, or "any"'),
    ("{load: 100 %, input: 230 V}, max: 120", "{load: §{aux: 5 %}, input: 230 V}, max: 120", "no load is given for main", ""),
    # words of a closed list
    ("rule: guarded", "rule: §strict", '"strict" is not known here', "expected simple, guarded or conditional"),
    ("relative_to: no load", "relative_to: §noload", '"noload" is not known here', "no load is spelled alike"),
    ("behaviour: constant current", "behaviour: §latching", '"latching" is not known here', "expected constant current"),
    ("acceptance: 1\n", "acceptance: §2\n", '"2" is not known here', "expected 1"),
    ("load_mode: CR", "load_mode: §cr", '"cr" is not known here', "expected CC, CR, CV or CP"),
    ("supply: ac", "supply: §[ac]", "a list stands here", "expected ac or dc"),
    ("level: II", "level: §7", '"7" is not known here', "expected I, II, III"),
    # shapes
    ('{name: "Twin rail 24/5", revision: 1.10, protection_class: I}', "§[Twin]", "a list stands here", "such as {name:"),
    ("    - {name: set-a, set: us-eps-level-vi}", "    §name: x", "a mapping stands here", "expected a list"),
    ("    - {name: set-a, set: us-eps-level-vi}", "    - §us-eps", '"us-eps" stands here', "expected a mapping, such as"),
    ("at: {load: 50 %, input: 230 V}, min", "at: §50 %, min", '"50 %" stands here', "such as {load: 50 %, input: 230 V}"),
    # the bench
    ("input_power: {dev", "§input_pover: {dev", '"input_pover" is no quantity that can stand here', "input_power is spelled"),
    ("input_power: {dev", "§time: {dev", '"time" is no quantity that can stand here', "expected ambient_temperature"),
    ("input_power: {dev", "§load_setting: {dev", '"load_setting" is no quantity that can stand here', "expected"),
    ("input_power: {dev", "§input_power x: {dev", 'input_power has no "x"', "expected input_power alone"),
    ("output_voltage: {dev", "§output_voltage axu: {dev", '"axu" in "output_voltage axu" is no output', "main or aux"),
    ('"0.1 % reading + 0.05 W"', "§0.1 %", '"0.1 %" in "0.1 %" does not say of what', TERMS),
    ('"0.1 % reading + 0.05 W"', '§"0.1 % reading + 0.05 V"', '"0.05 V" is a voltage, not a power', TERMS),
    ('"0.1 % reading + 0.05 W"', '§"0.1 % rading"', '"rading" in "0.1 % rading" is neither reading, range nor digits', TERMS),
    ('"1.5 K"', '§"1.5 V"', '"1.5 V" is a voltage, not a temperature difference', TERMS),
    ("meter_range: 60 V, ", "meter_range: §auto, ", "the accuracy is of the range, and that is auto", "expected the range"),
    ("meter_range: 60 V, ", "", "the accuracy is of the range, and none is given", "expected meter_range: beside it"),
    (", resolution: 1 mV", "", "the accuracy has digits, and their worth is not given", "expected resolution: beside"),
    ("meter_range: 60 V", "meter_range: §60 A", '"60 A" is a current, not a voltage', "expected a voltage"),
    ("meter_range: 60 V", "meter_range: §-60 V", '"-60 V" is not above zero', "expected a voltage"),
    ("resolution: 1 mV", "resolution: §1 mA", '"1 mA" is a current, not a voltage', "expected a voltage with its unit"),
    ('ripple: {device: "S-1", ', 'ripple: {device: "S-1", §shunt: {resistance: 1 ohm}, ', "ripple is read across a shunt", ""),
    ('device: "PM-1", ', 'device: "PM-1", §adc: {bits: 12, span: [0 V, 5 V]}, ', "input_power is read by a converter", ""),
    ("heating: 5 K/W},\n                   adc: {bits: 16, span: [-6.144 V, 6.144 V], offset: 0.4 mV}}", "heating: 5 K/W}}",
     "nothing says what read the shunt's volts", "expected adc:, or the accuracy of the current"),
    ("output aux: 20 mohm ± 2 mohm", "§outlet: 20 mohm", '"outlet" has no leads', "expected output, input or output main"),
    ("output aux: 20 mohm ± 2 mohm", "§output x: 20 mohm", '"x" is no output', "expected main or aux"),
    ("20 mohm ± 2 mohm", "§20 mohm ± 2", '"2" has no unit', "such as 12 mohm ± 2 mohm"),
    ("20 mohm ± 2 mohm", "§-20 mohm", '"-20 mohm" is below zero', "such as 12 mohm ± 2 mohm"),
    ('output_voltage: "U2 [V]"', '§output_volts: "U2 [V]"', '"output_volts" is no quantity that', "output_voltage is spelled"),
    ('"noise_mv", unit: mV', '"noise_mv", unit: §mA', '"mA" is a unit of current', "expected a unit of voltage"),
    ('"noise_mv", unit: mV', '"noise_mv", unit: §MV', '"MV" is no known unit', "expected a unit of voltage"),
    ('output_voltage: "U2 [V]"', "stage: {heading: x, unit: §V}", "stage has a unit", "expected the heading alone"),
    ('"Wirkleistung"', '§"U2 [V]"', 'the heading "U2 [V]" stands for output_voltage already', "one quantity for each"),
    ("temperature shell: T1", "§temperature: T1", "temperature does not say of which probe", "such as temperature case"),
    ("temperature shell: T1", '§output_voltage main: "V"', '"output_voltage main" is named twice', "line 48, column 13"),
    ("{input_voltage: 230 V, ", "{input_voltage: §230 A, ", '"230 A" is a current, not a voltage', "expected a voltage"),
    ("{input_voltage: 230 V, ", "{input_voltage: §-230 V, ", '"-230 V" is below zero', "expected a voltage"),
    ("{input_voltage: 230 V, ", "{§stage: 230 V, ", '"stage" is no quantity that can stand here', "expected"),
    ("power_factor: 0.95", "power_factor: §9.5", '"9.5" is no power_factor', "expected above 0 and at most 1"),
    # YAML itself
    ("min: 88 %", "min: 88 %, §min: 89 %", 'the key "min" stands twice', "it is there already at line 19, column 56"),
    ("voltage: 24 V", "voltage: §!volt 24 V", 'the tag "!volt" stands here', "expected the value without a tag"),
    ("voltage: 24 V", "voltage: §!!str 24 V", 'the tag "tag:yaml.org,2002:str" stands here', "without a tag"),
    ("{voltage: 24 V", "{§<<: {voltage: 25 V}, voltage: 24 V", 'the merge key "<<" stands here', "the keys themselves"),
    ("{voltage: 24 V", "{§[a]: b, voltage: 24 V", "a list stands as a key", "expected a text"),
    ("\nlot:", "\n§---\nlot:", "a second document begins here", "expected one in a file"),
    ("voltage: 24 V", "voltage: §*volts", "nothing is anchored as &volts above", "expected an anchor first"),
    ("[207 V, 253 V]", "§[207 V, 253 V", "this list is not closed", "] at its end"),
    ('"3 % reading"', '§"3 % reading', "a quotation mark is not closed", "expected its second mark"),
    ("lot:\n  every", "lot:\n§\tevery", "a tab stands here", "expected spaces"),
    ("supply: ac", 'supply: §"a\\x07c"', "the text holds the control character", "expected text that can be printed"),
    ("# every characteristic", "# §\x07", 'a control character stands here: "\\x07"', "expected text"),
]  # fmt: skip
# cases whose mark would stand in a place that the replacement leaves out: where they point instead
PLACES = {
    ", max: 0.21 W}": "{name: idle",
    "method: resistance, material: copper, ": "{name: rise-coil",
    "  ambient: 40 °C\n": "rated ambient}",
    "meter_range: 60 V, ": '"0.05 % reading + 0.02 % range',
    ", resolution: 1 mV": '"0.05 % reading + 0.02 % range',
    "supply: ac": "50 Hz}",
}


@pytest.mark.parametrize(("old", "new", "found", "expected"), CASES, ids=[f"{c[1][:30]}" for c in CASES])
def test_fault_is_told_with_its_place(faults_of, old, new, found, expected):
    """One fault, where the mark stands, with what was found and what is expected."""
    if "§" not in new:
        new, place = new + "§", PLACES.get(old)
        content = GOOD.replace(old, new.replace("§", ""))
        if place is None:  # the shunt itself
            place = "shunt: {resistance"
        assert content.count(place) == 1
        before = content[: content.index(place)]
        line, column = before.count("\n") + 1, len(before) - (before.rfind("\n") + 1) + 1
    else:
        content, line, column = broken(old, new)

    faults = [f for f in faults_of(content) if found in f.found]

    assert [(f.line, f.column) for f in faults] == [(line, column)]
    assert expected in faults[0].expected
    assert str(faults[0]).endswith(f"limits.yaml:{line}:{column}: {faults[0].found}; {faults[0].expected}")


def test_good_file_is_what_the_cases_break(faults_of):
    """The file that the cases start from has no fault, so that each case's fault is its own."""
    assert faults_of(GOOD) == ()


def test_one_mistake_gives_one_fault(faults_of):
    """Most mistakes do not make others appear: of the cases only few give a second fault."""
    several = []
    for old, new, *_ in CASES:
        if "§" in new and len(faults_of(GOOD.replace(old, new.replace("§", "")))) > 1:
            several.append(new)

    assert len(several) < len(CASES) / 8, several


def test_every_fault_is_reported_at_once_and_in_order(faults_of):
    """Twelve mistakes, from the first line to the last: twelve lines, in the order of the file."""
    changes = [
        ("revision: 1.10", "revison: 1.10"),
        ("[207 V, 253 V]", "[253 V, 207 V]"),
        ("current: 5 A", "current: 5"),
        ("rule: guarded", "rule: careful"),
        ("name: eff-mixed", "name: eff-half"),
        ("max: 0.21 W", "max: 0.21 V"),
        ("{name: line, from", "{name: line, output: third, from"),
        ("at: {load: any, input: any}, within", "at: {load: any}, within"),
        ("level: II", "level: IX"),
        ('ripple: {heading: "noise_mv", unit: mV}', "noise: x"),
        ('"0.1 % reading + 0.05 W"', '"0.1 %"'),
        ("input: 5 mohm", "inlet: 5 mohm"),
    ]
    content = GOOD
    for old, new in changes:
        assert content.count(old) == 1, old
        content = content.replace(old, new)

    faults = faults_of(content)

    assert len(faults) == 12
    assert [(f.line, f.column) for f in faults] == sorted((f.line, f.column) for f in faults)
    assert [f.found.split(" is ")[0] for f in faults[:2]] == ['the key "revison"', 'the range from "253 V" to "207 V"']


def test_every_fault_of_one_entry_is_reported(faults_of):
    """Several things wrong between the values of one requirement."""
    content = GOOD.replace("{load: 50 %, input: 230 V}, min: 88 %", "{load: 120 %}, min: 120 %, max: 110 %")

    found = sorted(f.found for f in faults_of(content))

    assert found == [
        "an efficiency of 110 % cannot be",
        "an efficiency of 120 % cannot be",
        "load 120 % under efficiency is above rated current",
        "min and max are reversed or equal",
        "the input is not given",
    ]


def test_names_and_outputs_are_checked_where_ratings_are_faulty(faults_of):
    """A fault in the ratings does not hide those of the requirements."""
    content = GOOD.replace("voltage: 24 V", "voltage: 24").replace("output: aux, at", "output: axu, at")

    assert [f.found for f in faults_of(content)] == ['"24" has no unit', '"axu" is no output']


def test_input_within_the_slack_of_the_range_is_accepted(faults_of):
    """An input voltage is met within 1 %, so that 255 V is no fault for a range up to 253 V."""
    assert faults_of(GOOD.replace("from: 207 V, to: 253 V", "from: 205 V, to: 255 V")) == ()


def test_range_may_be_left_out(faults_of):
    """Without a range every input voltage is accepted."""
    assert (
        faults_of(GOOD.replace("range: [207 V, 253 V], ", "").replace("input: 230 V}, min", "input: 300 V}, min")) == ()
    )


def test_something_must_be_required(faults_of):
    """A file that asks for nothing would accept every unit."""
    head, tail = GOOD.partition("limits:\n")[0], "\nlot:" + GOOD.partition("\nlot:")[2]

    for limits, line in (("limits: {}\n", 15), ("limits:\n  efficiency: []\n", 16), ("limits:\n  efficiency:\n", 16)):
        (fault,) = faults_of(head + limits + tail)
        assert (fault.found, fault.line) == ("no requirement is given", line)


def test_keys_of_the_limits_file_are_refused_in_a_bench_file(faults_of):
    """With the file they belong into."""
    faults = faults_of(GOOD, bench="acceptance: 1\nproduct: {name: x}\nlimits: {}\nlogs: {}\n")

    assert [(f.line, f.column, f.found, f.expected) for f in faults] == [
        (2, 1, 'the key "product" stands in a bench file', "expected it in the limits file"),
        (3, 1, 'the key "limits" stands in a bench file', "expected it in the limits file"),
        (
            4,
            1,
            'the key "logs" is not known here',
            "expected acceptance, log, instruments or lead_resistance; log is spelled alike",
        ),
    ]


def test_bench_file_is_checked_against_the_outputs_of_the_limits_file(faults_of):
    """An output that the product does not have."""
    (fault,) = faults_of(GOOD, bench="lead_resistance: {output main: 1 ohm, output extra: 1 ohm}")

    assert (fault.line, fault.column, fault.found) == (1, 39, '"extra" is no output')


@pytest.mark.parametrize(
    ("content", "found"),
    [
        ("", "the file is empty"),
        ("# nothing\n", "the file is empty"),
        ("- 1\n", "the file is a list"),
        ("x", "the file is a single text"),
    ],
)
def test_file_without_a_mapping_is_refused(faults_of, content, found):
    """Nothing, a list, a word."""
    (fault,) = faults_of(content)

    assert (fault.found, fault.line) == (found, 1)
