"""`acceptance limits published`: what is printed, as JSON too, and the exit status."""

from __future__ import annotations

import json
import subprocess
import sys

import pytest

from acceptance.limitfile.published import known_sets
from tests.cli.run import ROOT, acceptance


def test_every_set_is_listed_with_what_it_asks():
    ran = acceptance("limits", "published")

    assert (ran.status, ran.err) == (0, "")
    for name in known_sets():
        assert f"{name}   " in ran.out
    assert "10 CFR 430.32(w)(1)(ii), 79 FR 7845 (10 Feb 2014)" in ran.out
    assert "for what is made on or after 2016-02-10; as read on 2026-12-01" in ran.out
    assert "asks average_efficiency, no_load_power; at 115 V, 60 Hz" in ran.out
    assert "classes: ac-dc basic voltage, ac-dc low voltage" in ran.out
    assert "evidence: secondary, unconfirmed" in ran.out
    assert "0.48 at 50 %" in ran.out


def test_the_list_as_json_holds_every_set():
    told = json.loads(acceptance("limits", "published", "--json").out)

    assert [one["set"] for one in told] == list(known_sets())
    by_name = {one["set"]: one for one in told}
    assert by_name["eu-eps-2019-1782"]["until"] == "2028-12-13"
    assert by_name["us-eps-level-iv"]["classes"]["every supply"]["average_efficiency"][0] == {
        "band": "P < 1 W", "formula": "0.5 P", "evidence": "legal text",
    }  # fmt: skip


def test_one_set_is_shown_whole():
    ran = acceptance("limits", "published", "eu-eps-2025-2052")

    assert ran.status == 0
    assert "≥ 0.0582 lnP − 0.00104 P + 0.727" in ran.out
    assert "≤ 0.075 + 0.025 (N − 1), at most 0.300 W" in ran.out
    assert "10 W < P ≤ 49 W" in ran.out
    assert "Annex V are for authorities alone" in ran.out


def test_the_limits_of_a_product_are_printed():
    """24 W, basic voltage, 10 CFR 430.32(w)(1)(ii): 0.86204 and 0.100 W."""
    ran = acceptance("limits", "published", "us-eps-level-vi", "--power", "24W", "--voltage", "12V", "--current", "2A")

    assert (ran.status, ran.err) == (0, "")
    assert "class ac-dc basic voltage (a.c. to d.c., basic voltage: 12 V is not below 6 V); P = 24 W" in ran.out
    assert "86.204 %   average_efficiency   1 W < P ≤ 49 W   ≥ 0.071 lnP − 0.0014 P + 0.67   secondary" in ran.out
    assert "0.1 W   no_load_power        P ≤ 49 W         ≤ 0.100 W" in ran.out


def test_the_limits_of_a_product_as_json():
    """Unrounded; several outputs, rated together for less than their sum."""
    ran = acceptance(
        "limits", "published", "us-eps-level-vi", "--json", "--power", "30W",
        "--voltage", "5V", "--current", "3A", "--voltage", "12V", "--current", "2.4A",
    )  # fmt: skip

    told = json.loads(ran.out)
    assert told["class"] == "multiple voltage"
    assert told["derating"] == pytest.approx(30 / 43.8, rel=1e-12)
    assert [(one["finding"], one["min"], one["max"]) for one in told["limits"]] == [
        ("average_efficiency", pytest.approx(0.8160898, abs=5e-8), None), ("no_load_power", None, 0.3),
    ]  # fmt: skip


@pytest.mark.parametrize(("arguments", "words"), [
    (["us-eps-level-v1"], "us-eps-level-vi is spelled alike"),
    (["--power", "24W"], "give the NAME of a set"),
    (["us-eps-level-vi", "--power", "24W"], "the class of us-eps-level-vi cannot be told"),
    (["us-eps-level-vi", "--voltage", "12V"], "1 of --voltage and 0 of --current"),
    (["us-eps-level-vi", "--class", "multiple voltage"], "no power is given"),
    (["us-eps-level-vi", "--voltage", "12", "--current", "2A"], '--voltage: "12" has no unit'),
    (["us-eps-level-vi", "--voltage", "0V", "--current", "2A"], "is not above zero"),
    (["us-eps-level-vi", "--power", "0W"], "is not above zero"),
    (["us-eps-level-vi", "--voltage", "12V", "--current", "2A", "--class", "low"], "is no class of us-eps-level-vi"),
    (["us-eps-level-vi", "--voltage", "12V", "--current", "2A", "--power", "90W"], "does not go with the outputs"),
    (["eu-eps-2019-1782", "--voltage", "60V", "--current", "5A"], "300 W lies outside eu-eps-2019-1782"),
    (["eu-eps-2025-2052", "--power", "50W", "--class", "multiple voltage adaptive"], "ports is not given"),
    (["weight-european", "--power", "50W"], "has weights and no limits"),
    (["us-eps-level-vi", "--ports", "0"], "--ports"),
])  # fmt: skip
def test_what_cannot_be_shown_is_a_line_and_status_2(arguments, words):
    ran = acceptance("limits", "published", *arguments)

    assert (ran.status, ran.out) == (2, "")
    assert words in ran.err
    assert ran.err.count("\n") == 1


def test_no_numbers_library_is_imported():
    code = (
        "import sys; from acceptance.cli import run;"
        "run(['limits', 'published', 'us-eps-level-vi', '--voltage', '12V', '--current', '2A']);"
        "print(sorted({'numpy', 'pandas', 'scipy'} & set(sys.modules)))"
    )
    done = subprocess.run([sys.executable, "-c", code], cwd=ROOT, capture_output=True, encoding="utf-8", check=True)

    assert done.stdout.endswith("[]\n")
