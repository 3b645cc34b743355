"""One log of one unit: serials, stages, notes, evidence, and several files together."""

from __future__ import annotations

import hashlib
from datetime import date

import numpy as np
import pytest

from acceptance.bench.read import read_logs
from acceptance.bench.stages import split_name
from acceptance.errors import LogError, SeveralSerialsError

BASELINE = """timestamp,i_set,v_set,v_in,i_in,p_in,v_out,i_out,p_out,t_amb,t_case,t_hot,ripple_mv
2026-01-05T08:00:00.000000,0.0,12.0,230.12,0.0011,0.15,12.03,0.0002,0.002,23.01,23.02,23.01,22.1
2026-01-05T08:00:00.100000,0.0,12.0,229.88,0.0012,0.151,12.029,-0.0001,-0.001,23.0,23.1,23.2,21.9
"""


def put(folder, files):
    paths = []
    for name, text in files.items():
        paths.append(folder / name)
        paths[-1].write_text(text)
    return paths


def test_realistic_log_is_understood_unaided(read_text_log):
    """All columns but the supply's own setting."""
    log = read_text_log(BASELINE, outputs=("main",))

    assert set(log.samples.columns) == {
        "time", "load_setting main", "input_voltage", "input_current", "input_power", "output_voltage main",
        "output_current main", "output_power main", "ambient_temperature", "temperature case", "temperature hot",
        "ripple main", "stage", "table", "line",
    }  # fmt: skip
    assert [item.what for item in log.ignored] == ['column "v_set"']
    assert log.samples["ripple main"].tolist() == pytest.approx([0.0221, 0.0219])
    assert log.samples["time"].tolist() == [0, 0.1]
    assert log.test_date == date(2026, 1, 5)
    assert all(log.samples[key].dtype == np.float64 for key in log.samples if key not in ("stage", "table", "line"))


def test_evidence_is_over_the_bytes_of_the_file(read_text_log):
    """Hash, size and rows."""
    (evidence,) = read_text_log(BASELINE.replace("\n", "\r\n")).evidence

    data = BASELINE.replace("\n", "\r\n").encode()
    assert (evidence.sha256, evidence.bytes, evidence.rows) == (hashlib.sha256(data).hexdigest(), len(data), 2)
    assert evidence.file == "A-17.csv"


@pytest.mark.parametrize(
    ("stem", "serial", "stage"),
    [
        ("A-17_overcurrent", "A-17", "overcurrent"),
        ("A-17", "A-17", ""),
        ("A-17-Thermal", "A-17", "thermal"),
        ("A-17.cold", "A-17", "cold"),
        ("A-17_cooling_2", "A-17", "cooling"),
        ("steady", "", "steady"),
        ("unsteady", "unsteady", ""),
        ("A-17_overcurrents", "A-17_overcurrents", ""),
    ],
)
def test_names_tell_serial_and_stage(stem, serial, stage):
    """The stage is the last word of a name."""
    assert split_name(stem) == (serial, stage)


def test_files_of_one_unit_become_one_log(tmp_path):
    """In the order of their names; what one lacks is empty, and no doubt."""
    paths = put(
        tmp_path,
        {
            "A-17.csv": "t,Vout (V),Iout (A)\n0,12,1\n1,12,2\n",
            "A-17_overcurrent.csv": "t,Vout (mV)\n5,11000\n6,10000\n",
        },
    )
    seen = []

    log = read_logs(paths, progress=lambda done, total: seen.append((done, total)))

    assert log.samples["output_voltage"].tolist() == [12, 12, 11, 10]
    np.testing.assert_array_equal(log.samples["output_current"], [1, 2, np.nan, np.nan])
    assert log.samples["time"].tolist() == [0, 1, 5, 6]  # seconds stay as they were logged
    assert log.samples["stage"].tolist() == ["steady"] * 2 + ["overcurrent"] * 2
    assert log.samples["table"].tolist() == [0, 0, 1, 1]
    assert (log.serial, log.serial_from, log.stages_from) == ("A-17", "file name", "file name")
    assert not [d for d in log.doubts if d.kind == "missing"]
    sizes = [path.stat().st_size for path in sorted(paths)]
    assert seen == [(sizes[0], sum(sizes)), (sum(sizes), sum(sizes))]


def test_spans_of_doubts_count_through_all_files(tmp_path):
    """A reading over range in the second file."""
    paths = put(tmp_path, {"A.csv": "t,Vout\n0,1\n1,1\n", "A_thermal.csv": "t,Vout\n0,1\n1,OL\n"})

    (doubt,) = [d for d in read_logs(paths).doubts if d.kind == "over range"]

    assert doubt.spans == ((3, 4),)


def test_same_file_twice_counts_once(tmp_path):
    """No sample counts twice."""
    paths = put(tmp_path, {"A.csv": "t,Vout\n0,1\n1,2\n", "A_2.csv": "t,Vout\n0,1\n1,2\n"})

    log = read_logs(paths)

    assert len(log.samples) == 2
    assert any(item.file == "A_2.csv" for item in log.ignored)


def test_serial_is_text_as_written(read_text_log):
    """A column, a note, the name; each leading zero kept."""
    assert read_text_log("SN,Vout\n007,1\n007,2\n").serial == "007"
    assert read_text_log("SN,Vout\n007,1\n,2\n").serial_from == "column"
    assert read_text_log("serial number: 0042\nVout\n1\n").serial == "0042"
    assert read_text_log("Vout\n1\n", name="0017_cold.csv").serial == "0017"
    assert read_text_log("Vout\n1\n", name="steady.csv", serial="9").serial_from == "--serial"
    with pytest.raises(LogError, match="--serial"):
        read_text_log("Vout\n1\n", name="steady.csv")


def test_serial_given_that_the_log_contradicts_is_a_doubt(read_text_log):
    """The argument stays."""
    log = read_text_log("serial: B-2\nVout\n1\n", serial="B-1")

    assert log.serial == "B-1"
    (doubt,) = [d for d in log.doubts if d.kind == "serial differs"]
    assert not doubt.bars
    assert "B-2" in doubt.text


def test_several_serials_are_refused(tmp_path, read_text_log):
    """In a column, in notes even against an argument, in names without one."""
    with pytest.raises(SeveralSerialsError, match="A-1, A-2") as caught:
        read_text_log("SN,Vout\nA-1,1\nA-2,2\n")
    assert caught.value.serials == ("A-1", "A-2")
    noted = put(tmp_path, {"a.csv": "SN: A-1\nVout\n1\n", "b.csv": "SN: A-2\nVout\n1\n"})
    with pytest.raises(SeveralSerialsError):
        read_logs(noted, serial="A-1")
    named = put(tmp_path, {"C-1.csv": "Vout\n1\n", "C-2.csv": "Vout\n2\n"})
    with pytest.raises(SeveralSerialsError, match="--serial"):
        read_logs(named)
    assert read_logs(named, serial="C-1").serial == "C-1"


def test_serial_of_a_note_against_a_column_is_refused(read_text_log):
    """Or told from --serial, where that is one of them."""
    text = "# serial: X9\nSN,Vout\nX1,1\nX1,2\n"
    with pytest.raises(SeveralSerialsError, match="X1, X9.*--serial") as caught:
        read_text_log(text)
    assert caught.value.serials == ("X1", "X9")
    with pytest.raises(SeveralSerialsError):
        read_text_log(text, serial="X5")
    for given, other in (("X1", "X9"), ("X9", "X1")):
        log = read_text_log(text, serial=given)
        assert log.serial == given
        (doubt,) = [d for d in log.doubts if d.kind == "serial differs"]
        assert other in doubt.text


def test_two_serials_in_notes_are_refused(read_text_log):
    """Under one key nobody can tell which rows are whose; under two, --serial can."""
    with pytest.raises(SeveralSerialsError, match="X1, X9"):
        read_text_log("# serial: X1\n# serial: X9\nVout\n1\n", serial="X1")
    text = "# serial: X1\n# S/N: X9\nVout\n1\n"
    with pytest.raises(SeveralSerialsError, match="X1, X9"):
        read_text_log(text)
    assert read_text_log(text, serial="X9").serial == "X9"
    assert read_text_log("# serial: X1\n# SN: X1\nSN,Vout\nX1,1\n").serial_from == "column"


def test_empty_serial_is_none_given(read_text_log):
    """As if the argument were left out."""
    for given in ("", "  "):
        log = read_text_log("serial: B-2\nVout\n1\n", serial=given)
        assert (log.serial, log.serial_from) == ("B-2", "note")


def test_order_of_the_files_changes_nothing(tmp_path):
    """Samples, evidence, tables, notes and doubts."""
    paths = put(
        tmp_path,
        {
            "A-17_thermal.csv": "# operator: J. Q.\ntime (s),T_case (°C)\n0,25\n1,26\n",
            "A-17_cold.csv": "# operator: M. F.\ntime,Rw (ohm)\n0,1\n1,OL\n",
            "A-17_steady.csv": "time,Vout\n0,12\n1,12.5\n",
        },
    )

    first, *others = (read_logs(order) for order in (paths, paths[::-1], [paths[1], paths[0], paths[2]]))

    assert first.tables == ("A-17_cold.csv", "A-17_steady.csv", "A-17_thermal.csv")
    assert first.samples["table"].tolist() == [0, 0, 1, 1, 2, 2]
    for log in others:
        assert log.samples.equals(first.samples)
        assert list(log.samples.columns) == list(first.samples.columns)
        for part in ("serial", "channels", "evidence", "tables", "notes", "ignored", "doubts", "stages_from"):
            assert getattr(log, part) == getattr(first, part), part


def test_stage_column_comes_first(read_text_log):
    """Before the file's name; an empty cell falls back to it."""
    log = read_text_log("stage,Vout\nSteady,1\n,2\ncooling,3\n", name="A_thermal.csv")

    assert log.samples["stage"].tolist() == ["steady", "thermal", "cooling"]
    assert log.samples["stage"].dtype == "category"
    assert log.stages_from == "stage column"


def test_load_mode_logged_or_stated(read_text_log):
    """The logged one counts."""
    assert read_text_log("Vout\n1\n", load_mode="CR").samples["load_mode"].tolist() == ["CR"]
    logged = read_text_log("Vout,mode\n1,cc\n2,constant resistance\n", load_mode="CV", outputs=("main",))
    assert logged.samples["load_mode main"].tolist() == ["CC", "CR"]


@pytest.mark.parametrize(
    ("heading", "mode", "unit"),
    [("i_set", None, "A"), ("load setting", "CR", "ohm"), ("load_setting", "CV", "V"), ("load_setting", None, "")],
)
def test_load_setting_without_a_unit(read_text_log, heading, mode, unit):
    """By its letter or the load's mode."""
    log = read_text_log(f"Vout,{heading}\n1,2\n", load_mode=mode)

    assert next(c.unit for c in log.channels if c.quantity == "load_setting") == unit


def test_stated_values_are_kept_apart(read_text_log):
    """Under the first output's name; one that is logged too is a doubt."""
    log = read_text_log("Vout\n1\n", stated={"input_voltage": 230.0, "output_voltage": 1.0}, outputs=("main",))

    assert log.stated == {"input_voltage": 230.0, "output_voltage main": 1.0}
    assert [d.channels for d in log.doubts if d.kind == "stated and logged"] == [("output_voltage main",)]


def test_columns_of_the_bench_file(read_text_log):
    """A heading of any kind, its unit, and the column that would have been taken without it."""
    columns = {"output_voltage": ("U2", "mV"), "input_power": ("Wirkleistung [W]", None), "time": ("ts", None)}
    log = read_text_log("ts,U2,Vout,Wirkleistung [W]\n0,1500,7,3\n1,1600,7,3\n", columns=columns, outputs=("main",))

    assert log.samples["output_voltage main"].tolist() == [1.5, 1.6]
    assert log.samples["input_power"].tolist() == [3, 3]
    assert 'column "Vout"' in {item.what for item in log.ignored}
    assert {c.key: c.unit_from for c in log.channels}["output_voltage main"] == "limits file"
    with pytest.raises(LogError, match='"Nowhere"'):
        read_text_log("t,Vout\n0,1\n", columns={"input_power": ("Nowhere", None)})


def test_test_date_from_a_note(read_text_log):
    """Certain, or a doubt."""
    assert read_text_log("Test date: 4.5.2026\nVout\n1\n").test_date == date(2026, 5, 4)
    either = read_text_log("date: 04/05/2026\nVout\n1\n")
    assert either.test_date is None
    assert [d.kind for d in either.doubts if d.kind == "ambiguous date"] == ["ambiguous date"]


def test_test_date_is_the_latest_day(tmp_path, read_text_log):
    """Past midnight a clock is in the next day; of several files the latest counts."""
    noted = "date: 4.5.2026\ntime,Vout\n"
    assert read_text_log(noted + "23:59:00,1\n23:59:30,1\n").test_date == date(2026, 5, 4)
    assert read_text_log(noted + "23:59:00,1\n00:00:30,1\n").test_date == date(2026, 5, 5)
    assert read_text_log(noted + "23:59:00,1\n00:00:30,1\n23:00:00,1\n01:00:00,1\n").test_date == date(2026, 5, 6)
    assert read_text_log(noted + "0,1\n180000,1\n").test_date == date(2026, 5, 6)
    assert read_text_log("date: 4.5.2026\ndate: 7.5.2026\nVout\n1\n").test_date == date(2026, 5, 7)
    assert read_text_log("date,t,Vout\n4.5.2026,0,1\n5.5.2026,1,2\n").test_date == date(2026, 5, 5)
    paths = put(
        tmp_path,
        {
            "B_cold.csv": "date: 4.5.2026\nVout\n1\n",
            "B_cooling.csv": "date: 8.5.2026\nVout\n2\n",
            "B_steady.csv": "time,Vout\n2026-05-06 12:00:00,1\n2026-05-06 12:00:01,2\n",
        },
    )
    assert read_logs(paths).test_date == date(2026, 5, 8)
    assert read_logs(paths[::2]).test_date == date(2026, 5, 6)


def test_no_log_is_refused():
    """An empty list of files."""
    with pytest.raises(LogError, match="no log"):
        read_logs([])
