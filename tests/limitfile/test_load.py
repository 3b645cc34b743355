"""Whole files: what they say arrives as plain SI numbers, the bench file's word before the limits file's."""

from __future__ import annotations

import hashlib
import subprocess
import sys
from datetime import date
from pathlib import Path

import pytest

from acceptance.errors import LimitsError
from acceptance.limitfile import yamltree
from acceptance.limitfile.limits import Converter, ShuntResistor, Wiring
from acceptance.limitfile.load import load_limits
from acceptance.units import Rate


@pytest.fixture(scope="module")
def limits(data):
    """The good file, loaded."""
    return load_limits(data / "good.yaml")


def test_load_limits_accepts_the_quick_comparison(data):
    """A file without ratings beyond the needed, with its own headings."""
    limits = load_limits(data / "speed.yaml")

    assert [r.name for r in limits.requirements] == ["eff-10", "eff-100", "loadreg", "rise-case", "ripple"]
    assert limits.columns["temperature case"] == ("t_case", None)
    assert limits.columns["ripple main"] == ("ripple_mv", "mV")


def test_scalars_stay_as_written(limits):
    """1.10 is no number, 007 no seven."""
    assert limits.product.revision == "1.10"
    assert limits.meters["output_voltage"].serial == "007"


@pytest.mark.parametrize("text", ["no", "12:30", "0x1F", "1e3", "~", "null", "2027-03-01", "yes", "007"])
def test_scalars_stay_text_whatever_they_look_like(data, tmp_path, good_text, text):
    """No truth value, no time, no date."""
    path = tmp_path / "limits.yaml"
    path.write_text(good_text.replace("revision: 1.10", f"revision: {text}"), encoding="utf-8")

    assert load_limits(path).product.revision == text


def test_requirements_are_named_and_in_order(limits):
    """An entry without a name is called by its characteristic and its place in the list."""
    assert [r.name for r in limits.requirements] == [
        "set-a", "eff-half", "efficiency-2", "eff-mixed", "idle", "reg", "line", "band", "aux-band", "oc",
        "rise-shell", "rise-coil", "hot-core", "noise",
    ]  # fmt: skip
    assert [r.characteristic for r in limits.requirements[:5]] == ["published", *["efficiency"] * 3, "no_load_power"]


def test_requirements_keep_the_order_of_the_file(data, tmp_path, good_text):
    """Not that of the models."""
    path = tmp_path / "limits.yaml"
    head, _, tail = good_text.partition("  published:\n    - {name: set-a, set: us-eps-level-vi}\n")
    path.write_text(
        head + tail.replace("\nlot:", "  published: [{name: set-a, set: us-eps-level-vi}]\n\nlot:"), encoding="utf-8"
    )

    names = [r.name for r in load_limits(path).requirements]

    assert (names[0], names[-1]) == ("eff-half", "set-a")


def test_values_are_in_si(limits):
    """Fractions, volts, amperes, watts, seconds."""
    by_name = {r.name: r for r in limits.requirements}
    assert limits.ratings.outputs["main"].voltage == 24.0
    assert limits.ratings.input.range == (207.0, 253.0)
    assert limits.decision.confidence == 0.95
    assert limits.decision.tolerance.load == 0.03
    assert by_name["eff-half"].at.load == 0.5
    assert by_name["eff-mixed"].at.load == {"main": 1.0, "aux": "any"}
    assert by_name["efficiency-2"].average == (0.25, 0.5, 0.75, 1.0)
    assert by_name["idle"].max == 0.21
    assert (by_name["reg"].from_, by_name["reg"].to, by_name["reg"].relative_to) == (0.0, 1.0, "no load")
    assert by_name["oc"].onset == (1.05, 1.3)
    assert by_name["oc"].recovery.band == 0.01
    assert by_name["rise-shell"].settled == Rate(1.0, 1800.0)
    assert by_name["noise"].max == 0.12
    assert by_name["noise"].bandwidth == 2e7
    assert (limits.load_mode, limits.settle, limits.min_dwell) == ("CR", 2.0, 5.0)
    assert limits.stated == {"input_voltage": 230.0, "ambient_temperature": 23.0, "power_factor": 0.95}
    assert limits.lot == {
        "every_unit": {},
        "attributes": {"aql": 0.01, "level": "II"},
        "tolerance": {"coverage": 0.99, "confidence": 0.95},
    }


def test_instruments_are_read_in_the_kind_of_their_quantity(limits):
    """Ranges, resolutions, shunts and converters."""
    volts = limits.meters["output_voltage"]
    amperes = limits.meters["output_current"]
    assert volts.accuracy.gain == 0.0005
    assert (volts.accuracy.of_range, volts.accuracy.digits, volts.accuracy.coverage) == (0.0002, 3.0, 2.0)
    assert (volts.meter_range, volts.resolution) == (60.0, 0.001)
    assert amperes.shunt == ShuntResistor(1.0, 0.001, 5e-5, 5.0, stated=True)
    assert amperes.converter == Converter(16, -6.144, 6.144, 0.0004)
    assert amperes.text == (
        "shunt 1 ohm ± 0.1 %, 50 ppm/K, 5 K/W; converter 16 bits, -6.144 V to 6.144 V, offset 0.4 mV"
    )
    assert limits.meters["input_power"].due == date(2027, 3, 1)
    assert limits.meters["temperature"].accuracy.fixed == 1.5
    assert limits.meters["ripple"].meter_range == "auto"
    assert all(meter.is_stated for meter in limits.meters.values())
    assert limits.meter("temperature core").device == "TC-9"
    assert limits.meter("ambient_temperature").device == "TC-4"
    assert limits.leads == {
        "output": Wiring(0.012, None),
        "output aux": Wiring(0.02, 0.002),
        "input": Wiring(0.005, None),
    }


def test_bench_file_stands_before_the_limits_file(data, limits):
    """Entry by entry; what it does not mention stays."""
    both = load_limits(data / "good.yaml", data / "bench.yaml")

    assert both.meters["output_voltage"].device == "DMM-8"
    assert both.meters["output_voltage"].meter_range is None
    assert both.meters["input_power"] == limits.meters["input_power"]
    assert both.meters["winding_resistance"].device == "R-1"
    assert both.columns["ripple main"] == ("Vpp", None)
    assert both.columns["output_voltage main"] == ("U2 [V]", None)
    assert (both.load_mode, both.settle, both.min_dwell) == ("CV", 0.0, 5.0)
    assert both.leads["output aux"] == Wiring(0.008, None)
    assert both.leads["output"] == Wiring(0.012, None)
    assert both.requirements_sha256 == limits.requirements_sha256
    assert both.bench_file == "bench.yaml"
    assert both.bench_sha256 == hashlib.sha256((data / "bench.yaml").read_bytes()).hexdigest()


def test_bench_part_may_stand_in_the_bench_file_alone(data, tmp_path, good_text, limits):
    """Moving it there changes nothing of what is required."""
    head, mark, tail = good_text.partition("log:\n")
    only, bench = tmp_path / "only.yaml", tmp_path / "bench.yaml"
    only.write_text(head, encoding="utf-8")
    bench.write_text(mark + tail, encoding="utf-8")

    moved = load_limits(only, bench)

    assert moved.meters == limits.meters
    assert moved.columns == limits.columns
    assert moved.requirements == limits.requirements
    assert load_limits(only).meters == {}


def test_faults_of_both_files_are_reported_together(data, tmp_path, good_text):
    """A fault in each of them: two faults, each with its own file."""
    bad, bench = tmp_path / "l.yaml", tmp_path / "b.yaml"
    bad.write_text(good_text.replace("min: 88 %", "min: 88"), encoding="utf-8")
    bench.write_text(
        'instruments: {output_voltage main: {device: "D", accuracy: "1 A"}}\nlimits: {}\n', encoding="utf-8"
    )

    with pytest.raises(LimitsError) as caught:
        load_limits(bad, bench)

    assert [(Path(f.file).name, f.line) for f in caught.value.faults] == [("b.yaml", 1), ("b.yaml", 2), ("l.yaml", 19)]


def test_sha256_is_of_the_bytes(data, limits):
    """So that a file can be recognised."""
    assert limits.sha256 == hashlib.sha256((data / "good.yaml").read_bytes()).hexdigest()
    assert limits.file == "good.yaml"


def test_sections_may_stand_empty(faults_of, good_text):
    """As when every entry is commented out; an empty value is a fault all the same."""
    head = good_text.partition("lot:\n")[0].replace(
        "  published:\n    - {name: set-a", "  published:\n    # - {name: set-a"
    )
    empty = "lot:\n  every_unit:\nlog:\n  columns:\n  stated:\ninstruments:\nlead_resistance:\n"

    assert faults_of(head + empty) == ()
    assert faults_of(head + "lot:\n") == ()
    (fault,) = faults_of(head + "log:\n  settle:\n")
    assert fault.found == "no value is given"


def test_load_limits_without_the_fast_parser(data, monkeypatch, limits):
    """The parser in pure Python gives the same."""
    import yaml

    monkeypatch.setattr(yamltree, "_LOADER", yaml.SafeLoader)

    assert load_limits(data / "good.yaml") == limits


def test_load_limits_imports_no_numerical_library(data):
    """`limits check` must feel instant."""
    code = (
        "import sys; from pathlib import Path; from acceptance.limitfile.load import load_limits; "
        f"load_limits(Path({str(data / 'good.yaml')!r}), Path({str(data / 'bench.yaml')!r})); "
        "bad = {'numpy', 'pandas', 'scipy', 'openpyxl', 'reportlab', 'rich', 'click', 'difflib', "
        "'acceptance.limitfile.syntax'} & set(sys.modules); "
        "assert not bad, bad"
    )

    done = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=False)

    assert (done.returncode, done.stderr) == (0, "")


def test_load_limits_builds_one_validator_for_each_file(data):
    """That of the file, not others for the parts that it leaves out: each takes longer to build than to use."""
    code = (
        "from pathlib import Path; from acceptance.limitfile import model; "
        "from acceptance.limitfile.fields import Part; from acceptance.limitfile.load import load_limits; "
        f"load_limits(Path({str(data / 'speed.yaml')!r}).with_name('bare.yaml')); "
        "built = [c.__name__ for c in vars(model).values() if isinstance(c, type) and issubclass(c, Part) "
        "and c.__pydantic_complete__]; "
        "assert built == ['LimitsFile'], built"
    )

    done = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=False)

    assert (done.returncode, done.stderr) == (0, "")


def test_load_limits_names_a_file_that_cannot_be_read(tmp_path):
    """A folder, a missing file, a large one: one line each."""
    large = tmp_path / "large.yaml"
    large.write_bytes(b"# " + b"x" * 1_000_001)

    for path, words in [(tmp_path, "it is a folder"), (tmp_path / "none", "No such file"), (large, "larger than 1 MB")]:
        with pytest.raises(LimitsError, match=words) as caught:
            load_limits(path)
        assert str(caught.value).count("\n") == 0
