"""The sample logs: made again to the byte, physically sound, and judged as their README says.

The stages beside the steady one have their physics tested in test_sample_logs_stages.py.
"""

from __future__ import annotations

import io
import json
import re
import shlex
import subprocess
import sys
import zipfile
from collections.abc import Sequence
from datetime import UTC, datetime
from pathlib import Path

import numpy as np
import openpyxl
import pytest
import yaml

from acceptance.limitfile.accuracy import Accuracy, parse_accuracy
from acceptance.units import find_unit, parse_quantity
from tests.sample_truth import (
    LIMITS,
    ROOT,
    SAMPLES,
    STEADY,
    made,
    recovery_bracket,
    shown_warmth,
    true_value,
    true_words,
)

# isort: split
from make_sample_logs import CASES, FILES, Case
from workshop.products import Network, Product
from workshop.runs import LogFile
from workshop.sequence import SETTLING, Bench, DwellTruth, Run
from workshop.units import BENCH_1, BENCH_2, BENCH_3, BENCH_4
from workshop.workbook import workbook

EXIT = {"accepted": 0, "rejected": 1, "undecided": 3}


def run_of(name: str) -> Run:
    """The steady run behind a log."""
    run = made(name).run
    assert run is not None
    return run


def dwell_rows(run: Run, dwell: DwellTruth) -> np.ndarray:
    """The samples of one dwell after settling, found by the steps' own order and not by the readings."""
    times = run.samples["time"].to_numpy()
    return (times >= dwell.begins + SETTLING) & (times < dwell.ends)


# --- the files --------------------------------------------------------------------------------------------------------


def test_script_makes_every_shipped_file_again_to_the_byte(tmp_path: Path) -> None:
    done = subprocess.run(
        [sys.executable, str(SAMPLES / "make_sample_logs.py"), "--out", str(tmp_path)], capture_output=True, text=True
    )

    assert done.returncode == 0, done.stderr
    shipped = {
        path.name for path in SAMPLES.iterdir() if path.is_file() and path.suffix and path.suffix not in (".py", ".png")
    }
    assert {path.name for path in tmp_path.iterdir()} == shipped
    for name in sorted(shipped):
        assert (tmp_path / name).read_bytes() == (SAMPLES / name).read_bytes(), name


def test_files_are_of_modest_size() -> None:
    sizes = [(SAMPLES / name).stat().st_size for name in FILES]

    assert max(sizes) < 300_000
    assert sum(sizes) < 2_000_000


def test_every_log_is_in_a_case_and_every_case_names_what_is_there() -> None:
    assert {name for case in CASES for name in case.files} == set(FILES)
    for case in CASES:
        assert (LIMITS / case.limits).is_file()
        assert not case.bench or (LIMITS / case.bench).is_file()
    assert {case.verdict for case in CASES} == set(EXIT)
    assert {name.partition("_")[2].partition(".")[0] for name in FILES} >= {"overcurrent", "thermal", "cold", "cooling"}


def test_logs_speak_many_dialects() -> None:
    heads = {name: made(name).data[:2] for name in FILES}
    table = {name: made(name).data for name in FILES}

    assert heads["A-18.csv"] == b"\xef\xbb"
    assert heads["B-204.tsv"] == b"\xff\xfe"
    assert heads["B-203.xlsx"] == b"PK"
    assert b"\xb0C" in table["A-19.csv"]  # Latin-1
    assert b"\xc2\xb0C" in table["A-17_steady.csv"]  # UTF-8
    assert b"|" in table["M-31.txt"]


def test_workbook_carries_no_time_of_making_and_opens() -> None:
    data = made("B-203.xlsx").data
    with zipfile.ZipFile(io.BytesIO(data)) as archive:
        assert {entry.date_time for entry in archive.infolist()} == {(2026, 1, 1, 0, 0, 0)}
    book = openpyxl.load_workbook(io.BytesIO(data))

    assert book.sheetnames == ["about", "steady", "overcurrent"]
    assert book["steady"]["C5"].value == "Timestamp"
    assert str(book["steady"]["C6"].value).startswith("2026-06-02 10:05:00")
    assert book["steady"]["L5"].value == "B-203"


def test_workbook_keeps_text_as_text() -> None:
    data = workbook({"a&b": [["=1+1", None, "<x>&", 1.5, 0.1]]}, author="x<y", created=datetime(2026, 6, 2, tzinfo=UTC))

    row = next(openpyxl.load_workbook(io.BytesIO(data), data_only=True)["a&b"].iter_rows(values_only=True))

    assert row == ("=1+1", None, "<x>&", 1.5, 0.1)


# --- the physics ------------------------------------------------------------------------------------------------------


@pytest.mark.parametrize("name", STEADY)
def test_truth_of_every_dwell_follows_from_the_closed_forms(name: str) -> None:
    product = made(name).product
    hottest = float(product.heat.settled(largest_loss(product))[0])
    for dwell in run_of(name).truth:
        point = dwell.point
        v = point.input_voltage / product.rated_input - 1
        fixed = product.fixed_loss
        if product.standby is not None and not any(point.output_current.values()):
            fixed = product.standby
        a = sum(port.linear_loss * point.output_current[n] for n, port in product.outputs.items())
        b = sum(port.square_loss * point.output_current[n] ** 2 for n, port in product.outputs.items())
        loss = (fixed + a) * (1 + product.core_line * v) + b * (1 - product.copper_line * v)

        assert point.input_power - point.output_power == pytest.approx(loss, rel=1e-9)
        assert point.input_power > point.output_power
        for output, port in product.outputs.items():
            others = sum(i for n, i in point.output_current.items() if n != output)
            cold = port.no_load_voltage * (1 + port.line * v)
            cold -= port.resistance * point.output_current[output] + port.cross * others
            warmed = (point.output_voltage[output] - cold) / (port.no_load_voltage * port.drift)
            assert 0 <= warmed <= 1.05 * hottest  # the rise of the core that the drift tells of
            assert point.output_current[output] == dwell.loads[output] * port.rated_current


def largest_loss(product: Product) -> float:
    """Loss at full load over the inputs that the sequences use."""
    full = {name: port.rated_current for name, port in product.outputs.items()}
    return max(product.loss(full, share * product.rated_input) for share in (0.75, 0.9, 1.0, 1.1, 1.25))


@pytest.mark.parametrize("name", [name for name in STEADY if name not in {"B-205.txt", "D-0413.csv"}])
def test_readings_lie_within_the_instruments_accuracy_of_the_truth(name: str) -> None:
    log, run = made(name), run_of(name)
    for dwell in run.truth:
        rows = dwell_rows(run, dwell)
        truths = {"input_power": dwell.point.input_power, "input_voltage": dwell.point.input_voltage}
        for output, current in dwell.point.output_current.items():
            truths[f"output_current {output}"] = current
            truths[f"output_voltage {output}"] = dwell.point.output_voltage[output] - log.bench.leads * current
        for key, truth in truths.items():
            meter = log.bench.meter(key)
            if meter is None:
                continue
            bound = meter.gain * abs(truth) + meter.offset
            noise = np.hypot(meter.noise, meter.relative_noise * truth) + meter.step
            bursts = log.product.burst if key == "input_power" and not any(dwell.loads.values()) else 0.0
            slack = 6 * noise * 2 / np.sqrt(rows.sum()) + bursts / rows.sum() + 2e-5 * abs(truth)
            assert abs(run.samples.loc[rows, key].mean() - truth) <= bound + slack, (dwell.step, key)


def test_no_load_power_comes_in_bursts_of_the_stated_mean() -> None:
    run = run_of("A-17_steady.csv")
    dwell = next(dwell for dwell in run.truth if not any(dwell.loads.values()))
    power = run.samples.loc[dwell_rows(run, dwell), "input_power"]

    assert dwell.point.input_power == pytest.approx(0.062)
    assert power.max() > 10 * power.median()
    assert power.mean() == pytest.approx(0.062, abs=0.010 + 0.004)


def test_load_steps_overshoot_and_sag() -> None:
    samples = run_of("A-17_steady.csv").samples
    first = samples.iloc[0]

    assert first["output_current main"] > 1.02 * 2.5
    assert first["output_voltage main"] < samples["output_voltage main"].iloc[40] - 0.2


def test_poor_joint_takes_its_power_from_the_output_and_not_from_the_input() -> None:
    poor = made("A-19.csv").product
    cured = poor.outputs["main"].resistance - 0.030
    point = poor.point({"main": 2.5}, 230.0)
    without = poor.outputs["main"].no_load_voltage - cured * 2.5

    assert without - point.output_voltage["main"] == pytest.approx(0.075)
    assert point.input_power == pytest.approx(
        without * 2.5 + poor.loss({"main": 2.5}, 230.0) - 0.030 * 2.5**2, rel=1e-9
    )


@pytest.mark.parametrize("drift", [0.0, 2e-4, -0.01])
def test_network_solves_its_equations(drift: float) -> None:
    heat, power = Network(3.5, 4.4, 95.0, 380.0), 7.2
    seconds = np.linspace(0, 9000, 4001)
    core, case = heat.rise(power, seconds, np.array([5.0, 12.0]), drift=drift).T
    step = seconds[1] - seconds[0]

    # the bodies themselves change as their rises and the ambient do
    d_core = np.gradient(core, step, edge_order=2) + drift
    d_case = np.gradient(case, step, edge_order=2) + drift
    inner = slice(2, -2)
    assert 95.0 * d_core[inner] == pytest.approx((power - (core - case) / 3.5)[inner], abs=2e-3 * power)
    assert 380.0 * d_case[inner] == pytest.approx(((core - case) / 3.5 - case / 4.4)[inner], abs=2e-3 * power)
    assert (core[0], case[0]) == pytest.approx((5.0, 12.0))


def test_network_settles_where_its_resistances_say() -> None:
    heat = Network(3.5, 4.4, 95.0, 380.0)

    after_long = heat.rise(7.2, np.array([1e6]), np.zeros(2))[0]

    assert after_long == pytest.approx([7.2 * 7.9, 7.2 * 4.4])
    slow, fast = heat.rates()
    assert 0 < slow < fast
    assert slow * fast == pytest.approx(1 / (3.5 * 4.4 * 95.0 * 380.0))  # determinant of the system


# --- the benches agree with the files that state their accuracy -------------------------------------------------------


@pytest.mark.parametrize(
    ("file", "bench"),
    [
        ("quillfen-adapter.yaml", BENCH_1),
        ("quillfen-adapter-full.yaml", BENCH_1),
        ("bench-start-here.yaml", BENCH_1),
        ("tarnbeck-bench-4.yaml", BENCH_4),
        ("tarnbeck-bench-2.yaml", BENCH_2),
        ("tarnbeck-bench-3.yaml", BENCH_3),
    ],
)
def test_meters_err_as_much_as_their_file_states(file: str, bench: Bench) -> None:
    stated = yaml.load((LIMITS / file).read_text(encoding="utf-8"), yaml.BaseLoader)["instruments"]
    kinds = {"input_power": "power", "temperature": "temperature", "winding_resistance": "resistance"}
    for quantity, entry in stated.items():
        kind = kinds.get(quantity, "current" if quantity.endswith("current") else "voltage")
        meter = bench.meters[quantity]
        if "shunt" in entry:
            resistance = parse_quantity(entry["shunt"]["resistance"], "resistance")
            assert meter.gain == pytest.approx(parse_quantity(entry["shunt"]["tolerance"], "ratio"))
            assert meter.offset == pytest.approx(parse_quantity(entry["adc"]["offset"], "voltage") / resistance)
            low, high = (parse_quantity(end, "voltage") for end in entry["adc"]["span"])
            assert meter.step == pytest.approx((high - low) / 2 ** int(entry["adc"]["bits"]) / resistance)
            continue
        accuracy = parse_accuracy(entry["accuracy"], kind)
        of_range = parse_quantity(entry["meter_range"], kind) if "meter_range" in entry else 0.0
        assert meter.gain == pytest.approx(accuracy.gain), quantity
        assert meter.offset == pytest.approx(fixed_part(accuracy, of_range)), quantity


def fixed_part(accuracy: Accuracy, of_range: float) -> float:
    """What of an accuracy does not depend on the reading."""
    return accuracy.fixed + accuracy.of_range * of_range


def test_true_leads_lie_within_what_the_limits_files_state() -> None:
    for file in ("quillfen-adapter.yaml", "tarnbeck-bench-4.yaml", "bench-start-here.yaml"):
        stated = yaml.load((LIMITS / file).read_text(encoding="utf-8"), yaml.BaseLoader)["lead_resistance"]["output"]
        value, bound = (parse_quantity(part, "resistance") for part in stated.split("±"))

        assert abs(BENCH_1.leads - value) <= bound
    assert find_unit("mohm", "resistance") is not None


# --- the tool's verdicts ----------------------------------------------------------------------------------------------


@pytest.mark.parametrize("file", sorted(path.name for path in LIMITS.glob("*.yaml")))
def test_limits_and_bench_files_load_without_fault(file: str) -> None:
    from acceptance.limitfile.load import load_limits

    if "bench-" not in file or file.startswith("wrenlow"):
        assert load_limits(LIMITS / file).requirements
    else:
        limits = load_limits(LIMITS / "start-here.yaml", LIMITS / file)
        assert limits.bench_file == file
        assert limits.meters


def test_start_here_loads_with_every_example_taken_in(tmp_path: Path) -> None:
    from acceptance.limitfile.load import load_limits

    text = (LIMITS / "start-here.yaml").read_text(encoding="utf-8")
    taken_in = re.sub(r"(?m)^  # (\w+:|  - \{.*\})$", r"  \1", text)
    path = tmp_path / "mine.yaml"
    path.write_text(taken_in, encoding="utf-8")

    asked = {
        requirement.characteristic for requirement in load_limits(path, LIMITS / "bench-start-here.yaml").requirements
    }
    assert asked >= {"published", "overcurrent", "temperature_rise", "temperature", "efficiency", "ripple"}


def commands_of(file: Path) -> list[list[str]]:
    """The judge commands that a limits file's comments tell, as words."""
    lines = re.findall(r"(?m)^#\s+(acceptance judge .*)$", file.read_text(encoding="utf-8"))
    return [shlex.split(line) for line in lines]


@pytest.mark.parametrize("file", sorted({case.limits for case in CASES}))
def test_commands_in_a_limits_file_are_those_of_its_cases(file: str) -> None:
    told = set()
    for words in commands_of(LIMITS / file):
        options = dict(zip(words[words.index("--limits") :: 2], words[words.index("--limits") + 1 :: 2], strict=True))
        logs = [name for pattern in words[2 : words.index("--limits")] for name in sorted(ROOT.glob(pattern))]
        told.add((tuple(path.name for path in logs), options["--limits"], options.get("--bench", "")))

    mine = {(case.files, f"limits/{case.limits}", f"limits/{case.bench}" if case.bench else "") for case in CASES}
    assert told
    assert told <= mine


def command_line(case: Case, out: Path) -> list[str]:
    """The arguments that the README tells a user to give."""
    arguments = ["judge", *(str(SAMPLES / name) for name in case.files)]
    arguments += ["--limits", str(LIMITS / case.limits), "--out", str(out)]
    return [*arguments, "--bench", str(LIMITS / case.bench)] if case.bench else arguments


FIRST_OF_EACH = [next(case for case in CASES if case.verdict == verdict) for verdict in EXIT]


@pytest.mark.parametrize("case", FIRST_OF_EACH, ids=list(EXIT))
def test_judge_exits_by_the_verdict_as_a_process(case: Case, tmp_path: Path) -> None:
    command = [sys.executable, "-m", "acceptance", *command_line(case, tmp_path)]

    done = subprocess.run(command, capture_output=True, text=True, encoding="utf-8", cwd=ROOT, check=False)

    assert done.returncode == EXIT[case.verdict], done.stderr + done.stdout
    assert "Traceback" not in done.stderr
    assert {path.name for path in tmp_path.iterdir()} == {f"{case.unit}.record.json", f"{case.unit}.report.pdf"}


@pytest.mark.parametrize("case", CASES, ids=[f"{case.unit} {case.limits} {len(case.files)}" for case in CASES])
def test_judge_decides_as_the_readme_says(case: Case, tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    from acceptance.cli import run

    code = run(command_line(case, tmp_path))

    assert code == EXIT[case.verdict], capsys.readouterr()
    record = json.loads((tmp_path / f"{case.unit}.record.json").read_text(encoding="utf-8"))
    by_verdict: dict[str, set[str]] = {}
    for finding in record["findings"]:
        by_verdict.setdefault(finding["verdict"].partition(" ")[0], set()).add(finding["name"])
    assert record["verdict"] == case.verdict
    assert record["unit"]["serial"] == case.unit
    assert by_verdict.get("fail", set()) == set(case.fails)
    assert by_verdict.get("not", set()) == set(case.not_judged)
    assert by_verdict.get("conditional", set()) == set(case.open)
    assert (tmp_path / f"{case.unit}.report.pdf").read_bytes().startswith(b"%PDF")
    reasons = {finding["name"]: finding["reason"] for finding in record["findings"]}
    for name, words in case.because:
        assert words in reasons[name]
    logs = [made(name) for name in case.files]
    for finding in record["findings"]:
        compare_with_truth(finding, logs)


# an uncertainty below this one means something
LARGEST_U = {
    "efficiency": 0.01,
    "no_load_power": 0.05,
    "load_regulation": 0.002,
    "line_regulation": 0.002,
    "published": 0.05,
    "overcurrent": 0.4,
    "temperature_rise": 3.5,
    "temperature": 2.5,
}


def compare_with_truth(finding: dict, logs: Sequence[LogFile]) -> None:
    """A value agrees with the physics behind the log, within a little more than its uncertainty.

    The instruments err within bounds, so that the coverage is better than the 95 % of U: 1.25 U is never left.
    """
    if finding["value"] is None:
        return
    if isinstance(finding["value"], str):
        assert finding["value"] == true_words(finding["name"], logs)
        return
    if (bracket := recovery_bracket(finding["name"], logs)) is not None:
        assert bracket[0] <= finding["value"] <= bracket[1] + 1e-6
    truth = true_value(finding["name"], logs)
    if truth is None:
        return
    assert finding["value"] == pytest.approx(truth, abs=1.25 * finding["expanded_uncertainty"]), finding["name"]
    assert finding["expanded_uncertainty"] < LARGEST_U[finding["characteristic"]]
    shown = shown_warmth(finding["name"], logs)
    if shown is not None:  # what is left of a settled soak: noise, and the way still to go
        assert finding["value"] == pytest.approx(shown, abs=0.5)
