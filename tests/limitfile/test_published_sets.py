"""The published sets as data, the class told from the ratings, and what a limits file may say of them."""

from __future__ import annotations

import math

import pytest
from hypothesis import given
from hypothesis import strategies as st

from acceptance.errors import MeasurementError
from acceptance.limitfile.load import limits_schema
from acceptance.limitfile.published import EVIDENCE, known_sets, published_set
from acceptance.limitfile.setclass import Unfit, asked_of, told_class

VI, EU = "us-eps-level-vi", "eu-eps-2019-1782"
NAMES = {
    "us-eps-level-vi", "us-eps-level-iv", "eu-eps-2019-1782", "eu-eps-2025-2052", "eu-computer-617-2013",
    "eu-server-2019-424-step-1", "eu-server-2019-424-step-2", "weight-european", "weight-california",
}  # fmt: skip
EPS = [name for name in sorted(NAMES) if "eps" in name]


def test_every_set_is_known():
    assert set(known_sets()) == NAMES


@pytest.mark.parametrize("name", sorted(NAMES))
def test_every_set_says_where_it_is_from(name):
    one = published_set(name)

    assert one.document
    assert one.clause
    assert one.test.clause
    assert one.read.isoformat() == "2026-12-01"
    assert one.notes
    assert one.weights or one.since is not None
    marks = [b.evidence for rows in one.classes.values() for q in rows for b in q.bands] or [one.evidence]
    assert set(marks) <= set(EVIDENCE)


@pytest.mark.parametrize("name", [name for name in sorted(NAMES) if not name.startswith("weight")])
def test_bands_neither_overlap_nor_leave_a_gap(name):
    """At every edge and on both sides of it exactly one band holds, from the first band's bottom on."""
    for rows in published_set(name).classes.values():
        for quantity in rows:
            edges = [edge for band in quantity.bands for edge in (band.bottom, band.top) if 0 < edge < math.inf]
            powers = [p for edge in edges for p in (math.nextafter(edge, 0), edge, math.nextafter(edge, math.inf))]
            for power in powers:
                holding = [band for band in quantity.bands if band.holds(power)]
                below, above = quantity.bands[0].bottom, quantity.bands[-1].top
                inside = below < power < above
                assert len(holding) == 1 if inside else len(holding) <= 1, (quantity.key, power)


@pytest.mark.parametrize("name", ["weight-european", "weight-california"])
def test_weights_add_up_to_one(name):
    assert math.fsum(published_set(name).weights.values()) == pytest.approx(1.0, abs=1e-15)


@pytest.mark.parametrize("name", EPS)
@given(data=st.data())
def test_a_formula_rises_with_the_power_within_its_band(name, data):
    """a ln P + b P + c grows while P is below -a/b; every band of every set ends before that."""
    one = published_set(name)
    rows = one.classes[data.draw(st.sampled_from(sorted(one.classes)))]
    band = data.draw(st.sampled_from([b for quantity in rows for b in quantity.bands]))
    top = min(band.top, 10_000.0)
    low, high = sorted(data.draw(st.tuples(*[st.floats(max(band.bottom, 1e-6), top)] * 2)))

    assert band.formula.at(low) <= band.formula.at(high) + 1e-15


@pytest.mark.parametrize("name", EPS)
@given(power=st.floats(1e-6, 250.0))
def test_limits_are_ratios_and_watts_that_can_be(name, power):
    """No efficiency of 1 or more, none of 0 or less, whatever the class."""
    one = published_set(name)
    for class_name, rows in one.classes.items():
        ports = 2 if any(b.formula.per_further_port for q in rows for b in q.bands) else None
        for limit in asked_of(one, (), power=power, class_name=class_name, ports=ports).limits:
            assert 0 < limit.value < 1


# --- class told from the ratings -------------------------------------------------------------------------------------


@pytest.mark.parametrize(("outputs", "class_name", "words"), [
    ([(5.0, 2.0)], "ac-dc low voltage", "5 V is below 6 V, and 2 A at least 0.55 A"),
    ([(5.99, 0.55)], "ac-dc low voltage", "5.99 V is below 6 V"),
    ([(6.0, 3.0)], "ac-dc basic voltage", "6 V is not below 6 V"),
    ([(5.0, 0.549)], "ac-dc basic voltage", "0.549 A is below 0.55 A"),
    ([(24.0, 5.0)], "ac-dc basic voltage", "24 V is not below 6 V"),
    ([(24.0, 5.0), (5.0, 2.0)], "multiple voltage", "outputs of 5 and 24 V"),
])  # fmt: skip
@pytest.mark.parametrize("name", [VI, EU, "eu-eps-2025-2052"])
def test_the_class_is_told_from_the_ratings(name, outputs, class_name, words):
    asked = asked_of(published_set(name), outputs)

    assert asked.class_name == class_name
    assert words in asked.reason


def test_several_outputs_of_one_voltage_go_by_the_set():
    """One voltage by the Commission's answer to (EU) 2019/1782; left open by the US text."""
    assert told_class(published_set(EU), [(5.0, 2.0), (5.0, 2.0)])[0] == "ac-dc low voltage"
    assert told_class(published_set(VI), [(5.0, 2.0), (5.0, 2.0)])[0] == ""
    assert told_class(published_set(EU), [(5.0, 0.3), (5.0, 0.3)])[0] == ""  # 0.3 A each, 0.6 A together
    assert told_class(published_set(EU), [(5.0, 0.2), (5.0, 0.2)])[0] == "ac-dc basic voltage"
    for given_class in ("multiple voltage", "ac-dc low voltage"):
        assert asked_of(published_set(VI), [(5.0, 2.0)] * 2, class_name=given_class).class_name == given_class


@pytest.mark.parametrize(("name", "outputs", "given_class"), [
    (VI, [(12.0, 2.0)], "ac-dc low voltage"),  # looser than its own
    (VI, [(5.0, 2.0)], "ac-dc basic voltage"),
    (VI, [(12.0, 2.0)], "multiple voltage"),
    (VI, [(12.0, 2.0)], "ac-ac low voltage"),
    (VI, [(12.0, 2.0), (5.0, 1.0)], "ac-dc basic voltage"),
    (VI, [(12.0, 2.0), (12.0, 1.0)], "ac-dc low voltage"),
    (EU, [(5.0, 0.3), (5.0, 0.3)], "multiple voltage"),
    ("eu-server-2019-424-step-2", [(12.0, 50.0)], "multi output"),
    ("eu-eps-2025-2052", [(12.0, 2.0)], "multiple voltage adaptive"),
    ("eu-eps-2025-2052", [(12.0, 2.0)], "ac-dc low voltage adaptive"),
])  # fmt: skip
def test_a_class_that_is_not_the_products_is_refused(name, outputs, given_class):
    ports = 1 if given_class == "multiple voltage adaptive" else None

    with pytest.raises(Unfit, match="does not go with the ratings"):
        asked_of(published_set(name), outputs, class_name=given_class, ports=ports)


def test_what_the_ratings_cannot_tell_is_taken_from_the_class():
    assert asked_of(published_set(VI), [(12.0, 2.0)], class_name="ac-ac basic voltage").limits[1].value == 0.21
    adaptive = asked_of(published_set("eu-eps-2025-2052"), [(12.0, 2.0)], class_name="ac-dc basic voltage adaptive")
    assert adaptive.limits[2].quantity.name == "efficiency_10"


def test_a_sum_of_products_stays_in_its_band():
    """0.56 V x 87.5 A and 87.5 V x 0.56 A are 49 W; as binary fractions they are a hair more."""
    assert 87.5 * 0.56 > 49.0
    for outputs in ([(87.5, 0.56)], [(0.56, 87.5)], [(175.0, 0.28)], [(4.9, 10.0)], [(12.0, 3.0), (13.0, 1.0)]):
        asked = asked_of(published_set(VI), outputs)
        assert asked.power == 49.0
        assert str(asked.limits[0].band) == "1 W < P ≤ 49 W"


@pytest.mark.parametrize(("power", "fits"), [(44.0, True), (43.8, True), (30.0, True), (28.8, True), (28.0, False),
                                             (46.0, False)])  # fmt: skip
def test_a_stated_power_goes_with_the_outputs(power, fits):
    """28.8 W is the larger output alone, 43.8 W both of them; a plate rounds by up to 2 %."""
    outputs = [(5.0, 3.0), (12.0, 2.4)]
    if fits:
        assert asked_of(published_set(VI), outputs, power=power).derating == min(1.0, power / 43.8)
    else:
        with pytest.raises(Unfit, match="does not go with the outputs"):
            asked_of(published_set(VI), outputs, power=power)


@pytest.mark.parametrize("power", [0.0, -1.0, math.inf, math.nan])
def test_a_power_that_is_none_is_refused(power):
    with pytest.raises(MeasurementError):
        asked_of(published_set(VI), (), power=power, class_name="multiple voltage")


def test_a_power_outside_every_band_is_refused():
    with pytest.raises(Unfit, match="250.1 W lies outside eu-eps-2019-1782; expected at most 250 W"):
        asked_of(published_set(EU), [(250.1, 1.0)])


# --- what a limits file may say --------------------------------------------------------------------------------------

HEAD = """acceptance: 1
product: {name: "Set rail"}
ratings:
  input: {supply: ac, voltage: 230 V, range: [100 V, 253 V]}
  outputs: OUTPUTS
limits:
  published:
    - {name: eps, ENTRY}
"""
ONE, TWO = (
    "{main: {voltage: 12 V, current: 2 A}}",
    "{main: {voltage: 12 V, current: 2 A}, aux: {voltage: 5 V, current: 1 A}}",
)


@pytest.fixture
def entry_faults(faults_of):
    """The faults of one entry."""

    def load(entry: str, outputs: str = ONE, supply: str = "ac"):
        text = HEAD.replace("ENTRY", entry).replace("OUTPUTS", outputs)
        return faults_of(text.replace("supply: ac", f"supply: {supply}"))

    return load


@pytest.mark.parametrize(("entry", "outputs"), [
    ("set: us-eps-level-vi", ONE),
    ("set: us-eps-level-vi", TWO),
    ("set: us-eps-level-vi, class: ac-ac basic voltage", ONE),
    ("set: us-eps-level-vi, power: 27 W, minimum_current: {aux: 0.3 A}", TWO),
    ("set: us-eps-level-iv", ONE),
    ("set: eu-eps-2025-2052, class: multiple voltage adaptive, ports: 2", TWO),
    ("set: eu-server-2019-424-step-1, class: multi output", TWO),
    ("set: weight-european, min: 90 %, at: {input: 200 V}", ONE),
])  # fmt: skip
def test_an_entry_that_is_whole_has_no_fault(entry_faults, entry, outputs):
    assert entry_faults(entry, outputs) == ()


@pytest.mark.parametrize(("entry", "outputs", "marked", "found", "expected"), [
    ("set: us-eps-level-5", ONE, "us-eps-level-5", "is no published set", "us-eps-level-vi"),
    ("set: us-eps-level-vj", ONE, "us-eps-level-vj", "is no published set", "us-eps-level-vi is spelled alike"),
    ("set: US-EPS-LEVEL-VI", ONE, "US-EPS", "is no published set", "us-eps-level-vi is spelled alike"),
    ("set: us-eps-level-vi, class: basic", ONE, "basic", "no class of us-eps-level-vi", "ac-dc basic voltage"),
    ("set: us-eps-level-vi, class: ac-dc low voltage", ONE, "ac-dc", "does not go with", "expected ac-dc basic"),
    ("set: eu-server-2019-424-step-2", TWO, "eu-server", "cannot be told", "expected class:"),
    ("set: eu-eps-2019-1782", "{main: {voltage: 60 V, current: 5 A}}", "eu-eps", "300 W lies outside", "at most 250 W"),
    ("set: eu-eps-2025-2052", "{main: {voltage: 61 V, current: 1 A}}", "eu-eps", "61 V lies outside", "at most 60 V"),
    ("set: us-eps-level-vi, power: 20 W", ONE, "20 W", "does not go with the outputs", "expected 24 W"),
    ("set: us-eps-level-vi, power: 60 W", ONE, "60 W", "does not go with the outputs", "expected 24 W"),
    ("set: us-eps-level-vi, power: 0 W", ONE, "0 W", "not above zero", "such as 0.21 W"),
    ("set: us-eps-level-vi, ports: 2", ONE, "2}", "counts no ports", "left out"),
    ("set: eu-eps-2025-2052, class: multiple voltage adaptive", TWO, "eu-eps", "ports is not given", "ports: 2"),
    ("set: eu-eps-2025-2052, class: multiple voltage adaptive, ports: 9", TWO, "9", "9 ports", "at most 2"),
    ("set: us-eps-level-vi, min: 80 %", ONE, "80 %", "brings its own", "expected no min:"),
    ("set: us-eps-level-vi, at: {input: 115 V}", ONE, "{input", "brings its own", "expected no at:"),
    ("set: us-eps-level-vi, output: main", TWO, "main", "all outputs together", "expected no output:"),
    ("set: us-eps-level-vi, minimum_current: {axu: 0.1 A}", TWO, "0.1 A", '"axu" is no output', "aux"),
    ("set: us-eps-level-vi, minimum_current: {aux: 0.5 A}", TWO, "0.5 A", "smallest current of 0.5 A", "below 0.5 A"),
    ("set: eu-eps-2019-1782, minimum_current: {aux: 0.1 A}", TWO, "{aux", "knows no smallest", "left out"),
    ("set: weight-european, at: {input: 200 V}", ONE, "weight", "no limit is published", "min: 96 %"),
    ("set: weight-european, min: 96 %", ONE, "weight", "input voltage is not given", "at: {input"),
    ("set: weight-european, min: 96 %, at: {input: any}", ONE, "{input", "input voltage is not given", "at: {input"),
    ("set: weight-european, min: 196 %, at: {input: 200 V}", ONE, "196 %", "cannot be", "at most 100 %"),
    ("set: weight-european, min: 0.96 %, at: {input: 200 V}", ONE, "0.96 %", "lets any pass", "88 %"),
    ("set: weight-european, min: 96 %, at: {input: 200 V}, power: 24 W", ONE, "24 W", "takes no power", "left out"),
])  # fmt: skip
def test_an_entry_that_cannot_be_asked_is_a_fault(entry_faults, entry, outputs, marked, found, expected):
    """At its place, with what is wrong and what is expected."""
    (fault,) = entry_faults(entry, outputs)

    line = HEAD.replace("ENTRY", entry).splitlines()[7]
    assert fault.line == 8
    assert line[fault.column - 1 :].startswith(marked) or marked in line[fault.column - 1 :].split(",")[0]
    assert found in fault.found
    assert expected in fault.expected


def test_a_dc_input_is_no_input_of_an_ac_set(entry_faults):
    (fault,) = entry_faults("set: us-eps-level-vi", supply="dc")

    assert "is for an a.c. input, and the ratings say supply: dc" in fault.found
    assert entry_faults("set: weight-european, min: 96 %, at: {input: 200 V}", supply="dc") == ()


def test_the_schema_lists_the_sets():
    assert set(limits_schema()["$defs"]["Published"]["properties"]["set"]["enum"]) == NAMES
