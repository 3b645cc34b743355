"""Whatever stands in a file: a log, or one clear line."""

from __future__ import annotations

import io
from datetime import date, datetime, time, timedelta

import openpyxl
import pytest
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st

from acceptance.bench.health import check_health
from acceptance.bench.log import BenchLog
from acceptance.bench.read import read_logs
from acceptance.errors import LogError

quick = settings(max_examples=150, deadline=None, suppress_health_check=list(HealthCheck))

HEADINGS = ["t", "time", "date", "Vout", "Vout (mV)", "Iout A", "stage", "SN", "T_case", "mode", "Pin", "junk", ""]
CELLS = [
    *["0", "1.5", "1,5", "1,234", "1.234,5", "-", "OL", "NaN", "abc", "12:00:00", "2026-05-04 12:00", "04/05/2026"],
    *["V", "1 V", "=1+1", "9.9e37", "1e400", "", " ", '"', "#", "# a", "steady", "007", "\u22122", "1_0", "²", "٣"],
    *["𝟙", "0x1", "inf"],
]


def outcome(path):
    fault = ""
    try:
        log = read_logs([path], outputs=("main",))
    except LogError as problem:
        fault = str(problem)
    if fault:
        assert "\n" not in fault
        return None
    assert isinstance(log, BenchLog)
    assert len(log.samples) > 0
    check_health(log, supply="ac", rated_input_voltage=230.0, rated={"main": (12.0, 3.0)})
    return log


@quick
@given(st.binary(max_size=600))
def test_any_bytes(tmp_path, data):
    """Junk."""
    path = tmp_path / "A.csv"
    path.write_bytes(data)
    outcome(path)


@quick
@given(st.binary(max_size=60), st.integers(0, 200), st.sampled_from(["utf-8", "utf-16", "latin-1"]))
def test_junk_within_a_log(tmp_path, junk, at, encoding):
    """A good log with junk put into it."""
    good = ("t;Vout (V);T_amb (°C)\n" + "".join(f"{n};12,{n};23,5\n" for n in range(12))).encode(encoding)
    path = tmp_path / "A.csv"
    path.write_bytes(good[:at] + junk + good[at:])
    outcome(path)


@quick
@given(
    st.lists(st.sampled_from(HEADINGS), min_size=1, max_size=5),
    st.lists(st.lists(st.sampled_from(CELLS), max_size=6), max_size=8),
    st.sampled_from([",", ";", "\t", "|"]),
)
def test_tables_of_odd_cells(tmp_path, headings, rows, separator):
    """Headings that are known over cells that are odd."""
    path = tmp_path / "A.csv"
    path.write_text("\n".join(separator.join(row) for row in [headings, *rows]), encoding="utf-8")
    outcome(path)


cell = st.one_of(
    st.none(), st.booleans(), st.integers(-(10**20), 10**20), st.floats(allow_nan=False, allow_infinity=False),
    st.sampled_from(CELLS), st.datetimes(datetime(1950, 1, 1), datetime(2090, 1, 1)), st.times(),  # noqa: DTZ001
    st.dates(date(1950, 1, 1), date(2090, 1, 1)), st.timedeltas(timedelta(0), timedelta(days=3)),
)  # fmt: skip


@settings(quick, max_examples=80)
@given(
    st.lists(st.sampled_from(HEADINGS), min_size=1, max_size=5),
    st.lists(st.lists(cell, max_size=6), max_size=8),
    st.integers(1, 4),
)
def test_workbooks_of_odd_cells(tmp_path, headings, rows, top):
    """Every kind of cell that a workbook has."""
    book = openpyxl.Workbook()
    sheet = book.active
    for i, row in enumerate([headings, *rows]):
        for j, value in enumerate(row):
            if value is not None:
                sheet.cell(top + i, j + 1, value.replace(tzinfo=None) if isinstance(value, time) else value)
    stream = io.BytesIO()
    book.save(stream)
    path = tmp_path / "A.xlsx"
    path.write_bytes(stream.getvalue())
    outcome(path)


@settings(quick, max_examples=60)
@given(st.binary(max_size=12), st.floats(0, 1))
def test_damaged_workbooks(tmp_path, junk, at):
    """Bytes overwritten anywhere."""
    book = openpyxl.Workbook()
    for row in (["t", "Vout"], [0, 1.5], [1, 2.5]):
        book.active.append(row)
    stream = io.BytesIO()
    book.save(stream)
    data = bytearray(stream.getvalue())
    place = int(at * (len(data) - len(junk)))
    data[place : place + len(junk)] = junk
    path = tmp_path / "A.xlsx"
    path.write_bytes(data)
    outcome(path)


@quick
@given(st.lists(st.floats(-1e6, 1e6, allow_nan=False), min_size=1, max_size=30), st.sampled_from([".", ","]))
def test_quick_and_careful_ways_agree(tmp_path, numbers, decimal):
    """A comment among the rows sends a log the careful way; its numbers stay the same."""
    lines = [f"{n};{format(x, '.9e').replace('.', decimal)}" for n, x in enumerate(numbers)]
    quick_path, careful_path = tmp_path / "A.csv", tmp_path / "B.csv"
    quick_path.write_text("\n".join(["t;Vout (V)", *lines]) + "\n")
    careful_path.write_text("\n".join(["t;Vout (V)", lines[0], "# a comment", *lines[1:]]) + "\n")

    one, two = outcome(quick_path), outcome(careful_path)

    assert one is not None
    assert two is not None
    assert one.samples["output_voltage main"].tolist() == two.samples["output_voltage main"].tolist()
    assert one.samples["output_voltage main"].tolist() == [float(format(x, ".9e")) for x in numbers]


def test_a_log_of_a_reader_that_fails_is_seen(tmp_path):
    """The check above is no empty one: a fault in a reading is an error, not a log."""
    path = tmp_path / "A.csv"
    path.write_text("t,Vout\n0,1\n1,x\n")
    assert outcome(path) is None
    with pytest.raises(LogError):
        read_logs([path])
