"""The hash over what is required: the same however it is written, another as soon as it differs."""

from __future__ import annotations

import random
import re
from dataclasses import replace
from pathlib import Path

import pytest
import yaml
from hypothesis import given
from hypothesis import strategies as st

from acceptance.limitfile.load import load_limits
from acceptance.limitfile.published import published_set
from acceptance.limitfile.yamltree import read_tree

GOOD = (Path(__file__).parent / "data" / "good.yaml").read_text(encoding="utf-8")


@pytest.fixture(scope="module")
def fingerprint(tmp_path_factory):
    """A function: content -> hash of its requirements."""
    path = tmp_path_factory.mktemp("hash") / "limits.yaml"

    def of(content: str) -> str:
        path.write_text(content, encoding="utf-8")
        return load_limits(path).requirements_sha256

    return of


def shuffled(content, chance):
    """The same tree with the keys of every mapping in another order."""
    if isinstance(content, dict):
        keys = list(content)
        chance.shuffle(keys)
        return {key: shuffled(content[key], chance) for key in keys}
    return [shuffled(item, chance) for item in content] if isinstance(content, list) else content


@given(seed=st.integers(0, 10_000), style=st.sampled_from([None, "'", '"']), flow=st.sampled_from([True, False, None]))
def test_requirements_sha256_does_not_depend_on_how_it_is_written(fingerprint, seed, style, flow):
    """Order of keys, quotation marks, lines or braces; outputs excepted, since the first one is the default."""
    content = read_tree(GOOD.encode()).plain()
    mixed = shuffled(content, random.Random(seed))
    mixed["ratings"]["outputs"] = content["ratings"]["outputs"]

    text = yaml.safe_dump(mixed, sort_keys=False, default_style=style, default_flow_style=flow, allow_unicode=True)

    assert fingerprint(text) == fingerprint(GOOD)


@pytest.mark.parametrize(
    ("old", "new"),
    [
        ("min: 88 %", "min: 0.88e2 %"),
        ("min: 88 %", "min: 880000 ppm"),
        ("min: 88 %", "min: 88.000 %   # as ever"),
        ("max: 120 mV", "max: 0.12 V"),
        ("max: 0.21 W", "max: 210 mW"),
        ("settled: 1 K/30 min", "settled: 1 K/1800 s"),
        (", settled: 1 K/30 min", ""),
        ("kind: p-p, ", ""),
        ("rule: guarded, ", ""),
        ("from: 0 %", "from: -0 %"),
        ('note: "of four"', "note: of all"),
        ("revision: 1.10", "revision: 2"),
        ("Twin rail 24/5", "Twin rail"),
        ("{aql: 1.0 %, level: II}", "{aql: 4.0 %, level: I}"),
        ("settle: 2 s", "settle: 9 s"),
        ('device: "PM-1"', 'device: "PM-2"'),
        ("name: band, at", "name: band, output: main, at"),
        ("{average: [25", "{name: efficiency-2, average: [25"),
    ],
)
def test_requirements_sha256_stays(fingerprint, old, new):
    """Another way to write a limit, a note, the product's name, the lot, the bench, a default spelled out."""
    assert GOOD.count(old) == 1

    changed = GOOD.replace("# as ever", "").replace(old, new if "#" not in new else new.partition(" #")[0])

    assert fingerprint(changed) == fingerprint(GOOD)


@pytest.mark.parametrize(
    ("old", "new"),
    [
        ("min: 88 %", "min: 88.00001 %"),
        ("min: 80 %, max: 99 %", "min: 80 %"),
        ("name: eff-half", "name: eff-50"),
        ("load: 50 %, input: 230 V}, min", "load: 51 %, input: 230 V}, min"),
        ("load: 50 %, input: 230 V}, min", "load: any, input: 230 V}, min"),
        ("{load: 50 %, input: 230 V}, min", "{load: 50 %, input: any}, min"),
        ("{main: 100 %, aux: any}", "{main: 100 %, aux: 0 %}"),
        ("[25 %, 50 %, 75 %, 100 %]", "[25 %, 50 %, 100 %]"),
        ("max: 0.21 W", "max: 0.22 W"),
        ("from: 0 %", "from: 1 %"),
        ("relative_to: no load", "relative_to: nominal"),
        ("max: 0.5 %", "max: 0.4 %"),
        ("within: 2 %", "within: 3 %"),
        ("kind: p-p", "output: aux, kind: p-p"),
        ("constant current", "foldback"),
        ("[105 %, 130 %]", "[105 %, 131 %]"),
        ("droop: 5 %", "droop: 4 %"),
        ("short_circuit: {max: 130 %}", "short_circuit: {max: 140 %}"),
        ("within: 2 s", "within: 3 s"),
        ("band: 1 %", "band: 2 %"),
        ("probe: shell", "probe: lid"),
        ("settled: 1 K/30 min", "settled: 2 K/30 min"),
        ("settled: 1 K/30 min", "settled: 1 K/20 min"),
        ("material: copper", "material: aluminium"),
        ("adjust: rated ambient", "adjust: none"),
        ("kind: p-p", "kind: rms"),
        ("bandwidth: 20 MHz", "bandwidth: 100 MHz"),
        ("set: us-eps-level-vi", "set: eu-eps-2019-1782"),
        ("set: us-eps-level-vi", "set: us-eps-level-vi, class: multiple voltage"),
        ("ambient: 40 °C\n", "ambient: 45 °C\n"),
        ("current: 5 A", "current: 5.1 A"),
        ("voltage: 230 V, range", "voltage: 231 V, range"),
        ("rule: guarded", "rule: conditional"),
        ("confidence: 95 %, tol", "confidence: 99 %, tol"),
        ("{load: 3 %, input: 1 %}", "{load: 3 %, input: 2 %}"),
        ("    main: {voltage: 24 V, current: 5 A}\n    aux: {voltage: 5 V, current: 2 A}\n",
         "    aux: {voltage: 5 V, current: 2 A}\n    main: {voltage: 24 V, current: 5 A}\n"),
    ],
)  # fmt: skip
def test_requirements_sha256_changes(fingerprint, old, new):
    """With every limit, condition, rating and rule; with the output that requirements are about."""
    assert GOOD.count(old) == 1
    text = GOOD.replace(old, new)
    if old.startswith("    main:"):  # aux, now the first one, is what load_regulation sweeps
        text = text.replace("load: {aux: 50 %}}", "load: {main: 50 %}}")

    assert fingerprint(text) != fingerprint(GOOD)


def test_requirements_sha256_of_every_limit_differs(fingerprint):
    """One hash a changed number: every number under limits: is part of it."""
    start, end = GOOD.index("\nlimits:"), GOOD.index("\nlot:")
    hashes = [fingerprint(GOOD)]
    for number in re.finditer(r"(?<![\w-])\d+(\.\d+)?(?= ?(%|V|W|K|s|mV|MHz|°C|A|min)\b| %)", GOOD[start:end]):
        value = float(number[0])
        changed = f"{value * 1.0001 + 0.0001 if value < 99 else value * 0.9999:.6f}"
        text = GOOD[: start + number.start()] + changed + GOOD[start + number.end() :]
        hashes.append(fingerprint(text))

    assert len(hashes) > 40
    assert len(set(hashes)) == len(hashes)


def test_requirements_sha256_holds_the_numbers_of_a_published_set(fingerprint, monkeypatch):
    """Records of two versions that know a set otherwise are not records of one set of requirements."""
    before = fingerprint(GOOD)

    def other(name):
        return replace(published_set(name), classes={})

    monkeypatch.setattr("acceptance.limitfile.published.published_set", other)

    assert "us-eps" in GOOD
    assert fingerprint(GOOD) != before
