"""`judge` and `report`: what is written, what is said, and the exit status."""

from __future__ import annotations

import json
import os
import re
import zipfile
from pathlib import Path

import pytest

from tests.cli.run import ROOT, acceptance

LIMITS = """
acceptance: 1
product: {name: "Command rail 12", revision: A, protection_class: II}
ratings:
  input: {supply: ac, voltage: 230 V, range: [207 V, 253 V], frequency: 50 Hz}
  outputs:
    main: {voltage: 12 V, current: 2 A}
instruments:
  input_power: {device: P1, accuracy: "0.1 % reading + 0.02 W", due: 2027-01-01}
  output_voltage: {device: M1, accuracy: "0.02 % reading + 2 mV"}
  output_current: {device: L1, accuracy: "0.05 % reading + 1 mA"}
limits:
  efficiency:
    - {name: eff-100, at: {load: 100 %, input: 230 V}, min: MIN, note: "agreed with the customer"}
"""
LOG = """# serial: {serial}
# date: 2026-05-04
Vin (V),Pin (W),Vout (V),Iout (A)
230.0,{power},12.01,2.000
230.1,13.900,12.03,1.000
230.1,0.101,12.05,0.000
"""


@pytest.fixture
def bench(tmp_path):
    """A folder with a log and a limits file, and a function that judges in it."""

    def judge(*more, serial="K-1", power="27.000", minimum="80 %", log="K-1.csv"):
        (tmp_path / "limits.yaml").write_text(LIMITS.replace("MIN", minimum), encoding="utf-8")
        (tmp_path / log).write_text(LOG.format(serial=serial, power=power), encoding="utf-8")
        return acceptance("judge", log, "--limits", "limits.yaml", *more, cwd=tmp_path)

    return judge


@pytest.mark.parametrize(("minimum", "power", "verdict", "status"), [
    ("80 %", "27.000", "accepted", 0), ("95 %", "27.000", "rejected", 1), ("80 %", "", "undecided", 3),
])  # fmt: skip
def test_the_exit_status_is_the_verdict(bench, minimum, power, verdict, status):
    ran = bench(minimum=minimum, power=power)

    assert ran.status == status
    assert f"{verdict} (performance limits only; no safety approval)" in ran.out


def test_what_differed_from_what_is_asked_is_told_beside_the_verdict(bench, tmp_path):
    """One row a condition: single readings, said with the finding in the report."""
    ran = bench()

    record = json.loads((tmp_path / "K-1.record.json").read_text(encoding="utf-8"))
    assert record["findings"][0]["deviations"]
    assert "also told in the report: " in ran.out
    assert "how the test differed from what is asked, for 1 finding\n" in ran.out


def test_record_and_report_are_written_and_named(bench, tmp_path):
    ran = bench("--out", "done", "--json")

    told = json.loads(ran.out)
    record = json.loads((tmp_path / told["record"]).read_text(encoding="utf-8"))
    assert told["record"] == str(Path("done") / "K-1.record.json")
    assert (tmp_path / told["report"]).read_bytes().startswith(b"%PDF")
    assert record["verdict"] == "accepted"
    assert record["findings"][0]["value"] == pytest.approx(12.01 * 2 / 27, rel=1e-12)
    assert record["findings"][0]["note"] == "agreed with the customer"
    assert record["test"]["date"] == "2026-05-04"
    assert ran.err == ""


def test_the_same_evidence_gives_the_same_record_but_for_the_time(bench, tmp_path):
    bench("--out", "a")
    bench("--out", "b")

    a, b = (json.loads((tmp_path / name / "K-1.record.json").read_text(encoding="utf-8")) for name in "ab")
    assert {**a, "judged_at": ""} == {**b, "judged_at": ""}


def test_a_record_that_differs_is_kept(bench, tmp_path):
    bench()
    bench()
    bench(minimum="70 %")

    names = sorted(path.name for path in tmp_path.glob("*.json"))
    assert names == ["K-1.2.record.json", "K-1.record.json"]
    assert (tmp_path / "K-1.2.report.pdf").exists()


def test_a_comment_in_the_limits_file_changes_neither_requirements_nor_report_number(bench, tmp_path):
    bench("--out", "a")
    text = (tmp_path / "limits.yaml").read_text(encoding="utf-8")
    (tmp_path / "limits.yaml").write_text(f"# still the same\n{text}", encoding="utf-8")
    acceptance("judge", "K-1.csv", "--limits", "limits.yaml", "--out", "b", cwd=tmp_path)

    a, b = (json.loads((tmp_path / name / "K-1.record.json").read_text(encoding="utf-8")) for name in "ab")
    assert a["limits"]["requirements_sha256"] == b["limits"]["requirements_sha256"]
    assert a["report_number"] == b["report_number"]
    assert a["limits"]["sha256"] != b["limits"]["sha256"]


def test_a_report_drawn_again_is_the_same_to_the_byte(bench, tmp_path):
    bench()
    ran = acceptance("report", "K-1.record.json", "--out", "again.pdf", cwd=tmp_path)

    assert ran.status == 0
    assert (tmp_path / "again.pdf").read_bytes() == (tmp_path / "K-1.report.pdf").read_bytes()


def test_past_due_is_a_finding_and_leaves_the_unit_undecided(bench, tmp_path):
    ran = bench()
    text = (tmp_path / "limits.yaml").read_text(encoding="utf-8").replace("2027-01-01", "2026-05-03")
    (tmp_path / "limits.yaml").write_text(text, encoding="utf-8")
    late = acceptance("judge", "K-1.csv", "--limits", "limits.yaml", "--out", "late", cwd=tmp_path)

    assert ran.status == 0
    assert late.status == 3
    assert "calibration.P1" in late.out
    assert "due on 2026-05-03, the test was run on 2026-05-04" in late.out


@pytest.mark.parametrize("serial", ["../../x", "=1+1", '<img src="x">', "a/b", "CON", "x" * 300, "ü 7"])
def test_a_serial_is_text_and_never_leaves_the_folder(bench, tmp_path, serial):
    before = {path for path in tmp_path.parent.rglob("*") if tmp_path not in path.parents}
    ran = bench("--out", "out", serial=serial)

    assert ran.status == 0
    assert {path for path in tmp_path.parent.rglob("*") if tmp_path not in path.parents} == before
    (record,) = (tmp_path / "out").glob("*.record.json")
    assert json.loads(record.read_text(encoding="utf-8"))["unit"]["serial"] == serial


def test_logs_of_two_units_are_refused_with_status_2(bench, tmp_path):
    bench()
    (tmp_path / "K-2.csv").write_text(LOG.format(serial="K-2", power="27"), encoding="utf-8")
    ran = acceptance("judge", "K-1.csv", "K-2.csv", "--limits", "limits.yaml", "--out", "two", cwd=tmp_path)

    assert ran.status == 2
    assert "K-1" in ran.err
    assert "K-2" in ran.err
    assert not (tmp_path / "two").exists()


@pytest.mark.parametrize("arguments", [
    ["judge"], ["judge", "none.csv", "--limits", "none.yaml"], ["inspect", "none.csv"],
    ["report", "none.json"], ["limits", "check", "none.yaml"], ["frobnicate"], ["judge", "--frob"],
])  # fmt: skip
def test_a_wrong_command_line_or_path_is_status_2_in_one_line_a_fault(tmp_path, arguments):
    ran = acceptance(*arguments, cwd=tmp_path)

    assert ran.status == 2
    assert ran.out == ""
    assert all(line.strip() for line in ran.err.splitlines())
    assert len(ran.err.splitlines()) == max(1, sum(argument.startswith("none.") for argument in arguments))


def test_every_fault_of_a_limits_file_is_a_line_with_its_place(bench, tmp_path):
    bench()
    text = LIMITS.replace("MIN", "80").replace("revision: A", "revison: A").replace("voltage: 12 V", "voltage: 12 A")
    (tmp_path / "wrong.yaml").write_text(text, encoding="utf-8")
    ran = acceptance("judge", "K-1.csv", "--limits", "wrong.yaml", cwd=tmp_path)

    assert ran.status == 2
    lines = ran.err.splitlines()
    assert [re.match(r"wrong\.yaml:(\d+):\d+: .+; expected", line).group(1) for line in lines] == ["3", "7", "14"]


def junk(folder: Path) -> dict[str, Path]:
    """Files that no log can be read from."""
    made = {
        "empty.csv": b"",
        "binary.csv": bytes(range(256)) * 40,
        "prose.csv": b"Dear customer,\n\nwe have looked at your supply and found it in order.\n",
        "cut.xlsx": b"PK\x03\x04" + b"\x00" * 400,
        "heads.csv": b"Vin,Pin,Vout,Iout\n",
        "nan.csv": b"Vin,Pin,Vout,Iout\n" + b"NaN,NaN,NaN,NaN\n" * 20,
        "wide.csv": b",".join(b"c%d" % i for i in range(100_000)) + b"\n" + b",".join([b"1"] * 100_000) + b"\n",
    }
    paths = {}
    for name, content in made.items():
        paths[name] = folder / name
        paths[name].write_bytes(content)
    with zipfile.ZipFile(folder / "bomb.xlsx", "w", zipfile.ZIP_DEFLATED) as bomb:
        bomb.writestr("xl/worksheets/sheet1.xml", b"<" * 300_000_000)
    paths["bomb.xlsx"] = folder / "bomb.xlsx"
    return paths


def test_junk_ends_in_one_clear_line_and_status_3(bench, tmp_path):
    bench("--out", "kept")
    for name, path in junk(tmp_path).items():
        ran = acceptance("judge", path, "--limits", "limits.yaml", "--out", "out", cwd=tmp_path)

        assert ran.status == 3, name
        assert len(ran.err.splitlines()) == 1, (name, ran.err)
        assert name in ran.err
        assert ran.out == ""
        assert not (tmp_path / "out").exists()


@pytest.mark.skipif(os.name == "nt" or os.geteuid() == 0, reason="a folder that root could not write is hard to make")
def test_a_folder_that_cannot_be_written_is_status_3(bench, tmp_path):
    (tmp_path / "locked").mkdir(mode=0o500)
    ran = bench("--out", "locked/in")

    assert ran.status == 3
    assert "cannot be written" in ran.err


def test_an_out_below_a_file_is_status_3(bench, tmp_path):
    (tmp_path / "file").write_text("x", encoding="utf-8")
    ran = bench("--out", "file/in")

    assert ran.status == 3
    assert len(ran.err.splitlines()) == 1


@pytest.mark.parametrize(
    "content", [b"", b"{}", b"[1]", b'{"acceptance_record": 2}', b'{"acceptance_record": 1}', b"\xff\x00", b"NaN"]
)
def test_a_file_that_is_no_record_is_status_3(tmp_path, content):
    (tmp_path / "r.record.json").write_bytes(content)
    ran = acceptance("report", "r.record.json", cwd=tmp_path)

    assert ran.status == 3
    assert len(ran.err.splitlines()) == 1
    assert not list(tmp_path.glob("*.pdf"))


def test_a_control_sequence_in_a_log_does_not_reach_the_terminal(bench):
    ran = bench(serial="K\x1b[2J1")

    assert "\x1b" not in ran.out + ran.err


def test_help_names_every_command():
    ran = acceptance("--help")

    assert ran.status == 0
    assert all(command in ran.out for command in ("judge", "inspect", "report", "limits"))


def test_version():
    from acceptance import __version__

    assert acceptance("--version").out == f"acceptance {__version__}\n"


def test_help_and_limits_check_import_no_numbers_library(tmp_path):
    import subprocess
    import sys

    (tmp_path / "l.yaml").write_text(LIMITS.replace("MIN", "80 %"), encoding="utf-8")
    code = (
        "import sys; from acceptance.cli import run; "
        "status = run(['--help']) or run(['limits', 'check', 'l.yaml']); "
        "heavy = {'numpy', 'pandas', 'scipy', 'openpyxl', 'reportlab', 'rich'} & set(sys.modules); "
        "sys.exit(9 if heavy else status)"
    )
    done = subprocess.run([sys.executable, "-c", code], cwd=tmp_path, capture_output=True, check=False)
    assert done.returncode == 0


def test_the_demo_of_the_readme_is_accepted(tmp_path):
    ran = acceptance(
        "judge",
        ROOT / "sample_logs/A-17_steady.csv",
        "--limits",
        ROOT / "limits/quillfen-adapter.yaml",
        "--out",
        tmp_path,
    )

    assert ran.status == 0
