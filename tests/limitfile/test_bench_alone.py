"""The bench's part by itself, and what it may not say twice."""

from __future__ import annotations

import pytest

from acceptance.errors import LimitsError
from acceptance.limitfile.limits import Wiring
from acceptance.limitfile.load import BenchPart, load_bench, load_limits


def write(folder, text):
    """A bench file with this text."""
    path = folder / "bench.yaml"
    path.write_text(text, encoding="utf-8")
    return path


def test_load_bench_gives_what_the_limits_file_would(data, tmp_path, good_text):
    """With the outputs known, the same columns, values, meters and leads."""
    limits = load_limits(data / "good.yaml")
    mark, tail = good_text.partition("log:\n")[1:]

    part = load_bench(write(tmp_path, mark + tail), ("main", "aux"))

    assert isinstance(part, BenchPart)
    for field in ("columns", "stated", "load_mode", "settle", "min_dwell", "meters", "leads"):
        assert getattr(part, field) == getattr(limits, field), field


def test_load_bench_takes_any_output_where_none_is_known(tmp_path):
    """Names are taken as written; without a name nothing is put in."""
    text = (
        "log: {columns: {output_voltage: U2, ripple rail: Vpp}, stated: {output_current logic: 2 A}}\n"
        'instruments: {output_voltage rail: {device: D, accuracy: "1 mV"}}\n'
        "lead_resistance: {output rail: 12 mohm}\n"
    )

    part = load_bench(write(tmp_path, text))

    assert part.columns == {"output_voltage": ("U2", None), "ripple rail": ("Vpp", None)}
    assert part.stated == {"output_current logic": 2.0}
    assert part.meters["output_voltage rail"].device == "D"
    assert part.leads == {"output rail": Wiring(0.012, None)}


def test_load_bench_takes_a_file_that_is_shipped(data):
    """Those of the tests, and an empty section."""
    assert load_bench(data / "bench.yaml").load_mode == "CV"


@pytest.mark.parametrize(
    ("text", "found"),
    [
        ("log: {columns: {output_volts: U}}\nx: 1\n", ['"output_volts" is no quantity', 'the key "x" is not known']),
        ("limits: {}\n", ['the key "limits" stands in a bench file']),
        ("instruments: {input_power: {device: P, accuracy: 1 V}}", ['"1 V" is a voltage, not a power']),
        ("log: [a", ["this list is not closed"]),
        ("", ["the file is empty"]),
    ],
)  # fmt: skip
def test_load_bench_tells_every_fault(tmp_path, text, found):
    """As with a limits file."""
    with pytest.raises(LimitsError) as caught:
        load_bench(write(tmp_path, text))

    assert sorted(
        fault.found[: len(words)] for fault, words in zip(caught.value.faults, found, strict=False)
    ) == sorted(found)


def test_load_bench_names_a_file_that_is_not_there(tmp_path):
    """One line, no traceback."""
    with pytest.raises(LimitsError, match="cannot be read"):
        load_bench(tmp_path / "none.yaml")


@pytest.mark.parametrize(
    ("column", "stated", "key"),
    [
        ("input_voltage", "input_voltage", "input_voltage"),
        ("output_voltage", "output_voltage main", "output_voltage main"),
        ("output_voltage main", "output_voltage", "output_voltage"),
        ("temperature Case", "temperature case", "temperature case"),
    ],
)
def test_channel_in_a_column_and_stated_is_a_fault(tmp_path, column, stated, key):
    """It was logged, or it was not."""
    unit = "20 °C" if "temperature" in key else "5 V"
    path = write(tmp_path, f"log:\n  columns: {{{column}: X}}\n  stated: {{{stated}: {unit}}}\n")

    with pytest.raises(LimitsError) as caught:
        load_bench(path, ("main", "aux"))

    (fault,) = caught.value.faults
    assert (fault.line, fault.column) == (3, 12)
    assert fault.found == f'"{key}" is stated, and has a column too'
    assert fault.expected == "expected one of them; the column stands at line 2, column 13"


def test_column_and_stated_of_another_output_are_no_fault(tmp_path):
    """Each is a channel of its own."""
    path = write(tmp_path, "log: {columns: {output_voltage main: X}, stated: {output_voltage aux: 5 V}}\n")

    assert load_bench(path, ("main", "aux")).stated == {"output_voltage aux": 5.0}


def test_bench_file_states_what_the_limits_file_has_a_column_for(data, tmp_path):
    """What it says stands in place of what the limits file says: of a column and a stated value one remains."""
    states = write(tmp_path, "log: {stated: {input_power: 3 W}}\n")
    both = load_limits(data / "good.yaml", states)

    assert "input_power" not in both.columns
    assert both.stated["input_power"] == 3.0

    has_column = write(tmp_path, "log: {columns: {input_voltage: U1}}\n")
    both = load_limits(data / "good.yaml", has_column)

    assert both.columns["input_voltage"] == ("U1", None)
    assert "input_voltage" not in both.stated
