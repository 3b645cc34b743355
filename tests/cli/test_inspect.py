"""`inspect` and `limits`: how a user learns to trust the reader."""

from __future__ import annotations

import json

import jsonschema
import pytest
import yaml

from tests.cli.run import acceptance

LOG = "\n".join(
    ["Uout;Iout;Leistung am Eingang X;t", *(f"12,{i % 3};{1 + (i // 20)},00{i % 2};28,5;{i}" for i in range(60))]
)


@pytest.fixture
def log(tmp_path):
    path = tmp_path / "R-5.csv"
    path.write_text(LOG, encoding="latin-1")
    return path


def test_inspect_shows_columns_dwells_and_what_was_left_out(log):
    ran = acceptance("inspect", log)

    assert ran.status == 0
    assert "output_voltage" in ran.out
    assert "Leistung am Eingang X" in ran.out
    assert "Dwells (3)" in ran.out
    assert "semicolon" in ran.out
    assert "\x1b[" not in ran.out


def test_inspect_json_has_the_same_for_machines(log):
    told = json.loads(acceptance("inspect", log, "--json").out)

    assert told["serial"] == "R-5"
    assert {column["key"] for column in told["columns"]} >= {"output_voltage", "output_current", "time"}
    assert [dwell["readings"] for dwell in told["dwells"]] == pytest.approx([20, 20, 20], abs=2)
    assert told["dwells"][1]["means"]["output_current"] == pytest.approx(2.0005, abs=1e-3)


def test_the_block_that_inspect_offers_is_yaml_that_a_bench_file_takes(log, tmp_path):
    block = json.loads(acceptance("inspect", log, "--json").out)["log_block"]

    columns = yaml.safe_load(block)["log"]["columns"]
    assert columns["output_voltage"] == {"heading": "Uout", "unit": "V"}
    assert "# input_power: not found" in block
    assert "Leistung am Eingang X" in block


def test_inspect_with_a_bench_file_alone_reads_as_it_says(log, tmp_path):
    """A heading that nobody could guess, told by the bench file."""
    (tmp_path / "bench.yaml").write_text(
        'acceptance: 1\nlog: {columns: {input_power: {heading: "Leistung am Eingang X", unit: W}}}\n', encoding="utf-8"
    )
    told = json.loads(acceptance("inspect", log, "--bench", tmp_path / "bench.yaml", "--json").out)

    (power,) = [column for column in told["columns"] if column["quantity"] == "input_power"]
    assert power["unit_from"] == "limits file"
    assert power["heading"] == "Leistung am Eingang X"


def test_limits_schema_accepts_what_limits_check_accepts(tmp_path):
    schema = json.loads(acceptance("limits", "schema").out)

    jsonschema.Draft202012Validator.check_schema(schema)


def test_limits_check_names_the_count(tmp_path):
    ran = acceptance("limits", "check", "limits/start-here.yaml", "--json")

    assert ran.status == 0
    assert json.loads(ran.out)["requirements"]


def test_limits_check_takes_a_bench_file_alone(tmp_path):
    assert acceptance("limits", "check", "--bench", "limits/bench-start-here.yaml").status == 0
    assert acceptance("limits", "check").status == 2
    (tmp_path / "b.yaml").write_text(
        "acceptance: 1\ninstruments: {output_voltage: {accuracy: 1 %}}\n", encoding="utf-8"
    )
    ran = acceptance("limits", "check", "--bench", tmp_path / "b.yaml")

    assert ran.status == 2
    assert "b.yaml:2:" in ran.err
