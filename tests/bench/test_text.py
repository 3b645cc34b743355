"""Delimited text: every dialect gives the same numbers, and a fault its place."""

from __future__ import annotations

from datetime import date

import numpy as np
import pytest
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st

from acceptance.bench.quick import _needs_precision
from acceptance.bench.read import read_logs
from acceptance.errors import LogError

PLAIN = "t,Vout (V),Iout (A)\n0,12.5,0.1\n1,12.25,1\n2,-3e-1,+2.5\n"
NUMBERS = {"time": [0.0, 1.0, 2.0], "output_voltage": [12.5, 12.25, -0.3], "output_current": [0.1, 1.0, 2.5]}


def numbers_of(log):
    return {key: log.samples[key].tolist() for key in NUMBERS}


@pytest.mark.parametrize("separator", [",", ";", "\t", "|"])
@pytest.mark.parametrize("decimal", [".", ","])
@pytest.mark.parametrize("ending", ["\n", "\r\n", "\r"])
def test_separators_and_decimal_marks(read_text_log, separator, decimal, ending):
    """Twenty-four dialects; a comma that is both is quoted."""
    rows = [line.split(",") for line in PLAIN.splitlines()]
    if decimal == ",":
        rows = [rows[0], *([cell.replace(".", ",") for cell in row] for row in rows[1:])]
        if separator == ",":
            rows = [rows[0], *([f'"{cell}"' for cell in row] for row in rows[1:])]
    text = ending.join(separator.join(row) for row in rows) + ending

    assert numbers_of(read_text_log(text)) == NUMBERS


@pytest.mark.parametrize(
    ("encoding", "named"),
    [
        ("utf-8", "UTF-8"),
        ("utf-8-sig", "UTF-8 with mark"),
        ("utf-16", "UTF-16 with mark"),
        ("utf-16-le", "UTF-16"),
        ("utf-16-be", "UTF-16"),
        ("latin-1", "Latin-1"),
        ("cp1252", "Latin-1"),
    ],
)
def test_encodings(read_text_log, encoding, named):
    """The degree sign survives, so the unit does."""
    log = read_text_log("t;Vout (V);T_amb (°C)\n" + "0;12,5;23,5\n" * 30, encoding=encoding)

    assert log.samples["ambient_temperature"].tolist() == [23.5] * 30
    assert next(c.unit for c in log.channels if c.key == "ambient_temperature") == "°C"
    assert log.evidence[0].dialect == f"semicolons, decimal comma, {named}"


def test_notes_above_and_below(read_text_log):
    """Keys in lower case, values as written."""
    log = read_text_log(
        '# serial: A-9\noperator; J. Q.\nBench = 3\n"Date: 2026-05-04"\n\njust words of no key here and there\n'
        "t;Vout;Iout\n0;1,5;2\n1;1,5;3\nremark; all fine\n"
    )

    assert log.notes == {
        "serial": "A-9", "operator": "J. Q.", "bench": "3", "date": "2026-05-04", "remark": "all fine",
    }  # fmt: skip
    assert (log.serial, log.serial_from, log.test_date) == ("A-9", "note", date(2026, 5, 4))
    assert any("just words" in item.what + item.reason for item in log.ignored)
    assert log.samples["line"].tolist() == [8, 9]


def test_notes_beside_the_table(read_text_log):
    """Behind an empty column, as a spreadsheet exports them."""
    log = read_text_log("t,Vout,,serial,B-5\n0,1.5,,operator,J. Q.\n1,1.6,,,\n")

    assert log.notes == {"serial": "B-5", "operator": "J. Q."}
    assert log.samples["output_voltage"].tolist() == [1.5, 1.6]


def test_headings_that_come_again_begin_a_new_table(read_text_log):
    """The logger was restarted: time begins anew, and no dwell may span it."""
    log = read_text_log("t,Vout\n5,1.5\n6,1.6\nt,Vout\n0,1.7\n\n1,1.8\n")

    assert log.samples["table"].tolist() == [0, 0, 1, 1]
    assert log.samples["time"].tolist() == [5, 6, 0, 1]
    assert log.samples["line"].tolist() == [2, 3, 5, 7]
    assert any(item.what == "line 4" for item in log.ignored)


def test_headings_that_come_again_otherwise_spaced(read_text_log):
    """The careful way, with comments and units among the rows."""
    log = read_text_log("t,Vout\ns,mV\n5,1500\n# paused\nt , Vout\ns,mV\n0,1700\n")

    assert log.samples["table"].tolist() == [0, 1]
    assert log.samples["output_voltage"].tolist() == [1.5, 1.7]
    assert any("paused" in item.reason for item in log.ignored)


def test_blank_lines_and_empty_rows_are_skipped(read_text_log):
    """Lines keep their numbers."""
    log = read_text_log("\nt;Vout;\n\n0;1,5;\n\n1;2,5;\n;;\n")

    assert log.samples["line"].tolist() == [4, 6]


def test_rule_under_the_headings_is_skipped(read_text_log):
    """A table drawn with bars."""
    log = read_text_log("| t | Vout |\n|---|---:|\n| 0 | 1.5 |\n| 1 | 2.5 |\n")

    assert log.samples["output_voltage"].tolist() == [1.5, 2.5]


@pytest.mark.parametrize(
    ("text", "unit_from"),
    [
        ("t,Vout (mV),Iout mA\n0,1500,2\n1,1500.5,3\n", "heading"),
        ("t,Vout,Iout\ns,mV,mA\n0,1500,2\n1,1500.5,3\n", "row below"),
        ("t,Vout,Iout\n,[mV],(mA)\n0,1500,2\n1,1500.5,3\n", "row below"),
        ("t,Vout,Iout\n0,1500 mV,2mA\n1,1.5005 V,0.003 A\n", "cells"),
    ],
)
def test_unit_in_heading_row_below_or_cell(read_text_log, text, unit_from):
    """Three places for a unit, one result."""
    log = read_text_log(text)

    assert log.samples["output_voltage"].tolist() == pytest.approx([1.5, 1.5005], rel=1e-12)
    assert log.samples["output_current"].tolist() == pytest.approx([0.002, 0.003], rel=1e-12)
    assert {c.unit_from for c in log.channels if c.key != "time"} == {unit_from}


def test_unit_not_written_is_assumed_and_said(read_text_log):
    """One doubt that names the channels, and bars nothing."""
    log = read_text_log("t,Vout,T_case,Rw,PF\n0,1,2,3,0.9\n")

    (doubt,) = [d for d in log.doubts if d.kind == "unit assumed"]
    assert set(doubt.channels) == {"time", "output_voltage", "temperature case", "winding_resistance"}
    assert not doubt.bars
    assert [c.unit for c in log.channels if c.unit_from == "assumed"] == ["s", "V", "°C", "ohm", ""]


@pytest.mark.parametrize(
    ("text", "place", "words"),
    [
        ("t,Vout (A),Iout\n0,1,2\n", "1:2", "the unit A is a current"),
        ("t,Vout,Iout\n0,1 A,2\n", "2:2", "is a current"),
        ("t,Vout (mV),Iout\n0,1 V,2\n", "2:2", "another unit"),
        ("t,Vout (V),Iout\ns,mV,A\n0,1,2\n", "1:2", "the row below"),
        ("t,Vout,Iout\n0,1 V,2\n1,2,2\n", "3:2", "no unit"),
        ("t,Vout,V_load\n0,1,2\n", "1:3", "both output voltage.*log: columns:"),
        ("t,Vout,Iout\n0,1.5,2\n1,abc,2\n", "3:2", '"abc" under "Vout" is not a number'),
        ("t,Vout,Iout\n0,1.5,2\n1,1 234,2\n", "3:2", "is not a number"),
        ("t,Vout,Iout\n0,1.5,2\n1,1.5.5,2\n", "3:2", "is not a number"),
        ("t;Vout;Iout\n0;1.5;1.5\n1;2.5;0,98\n", "3:3", '"0,98" under "Iout" is not a number; .* decimal point'),
        ("t;Vout;Iout\n0;1,5;1,5\n1;2,5;0.98\n", "3:3", '"0.98" under "Iout" is not a number; .* decimal comma'),
        ("t;Vout;Iout\n0;1,5;1,5\n1;2,5;1.234\n", "3:3", "decimal comma"),
        ("t;Vout\n0;1,234\n1;2,345\n", "2:2", "may be 1234 .* or 1.234 .*which is it"),
        ("t;Vout;Iout\n0;1,234;0.5\n", "2:2", "which is it"),
        ("t,Vout\n0,1,5\n1,1,6\n", "2:3", "3 cells and the headings are 2; leave out the surplus .*or.* separator"),
        ("t,Vout,Vout\n0,1,2\n", "1:3", "both output voltage; rename one of them in the file"),
        ("time,Vout\n12:00:00,1\nnoon,2\n", "3:1", "not a time"),
        ("time,Vout\n2026-05-04T12:00:00,1\n2026-05-04T12:00:01Z,2\n", "3:1|2:1", "another form"),
        ("time,Vout\n2026-02-30 12:00:00,1\n", "2:1", "not a time"),
        ("date,time,Vout\n04/05/2026,12:00:00,1\n05/05/2026,12:00:02,2\n", "2:1", "may be day/month or month/day"),
        ("time,Vout\n1767600000000,1\n", "2:1", "too large for seconds"),
        ("foo,bar\n1,2\n3,4\n", "1:1", 'none of the headings "foo", "bar" is understood'),
    ],
)  # fmt: skip
def test_fault_has_its_place(read_text_log, text, place, words):
    """File, line and column; what was found; what is expected; one line."""
    with pytest.raises(LogError, match=words) as caught:
        read_text_log(text)

    assert str(caught.value).startswith(tuple(f"A-17.csv:{p}: " for p in place.split("|")))
    assert "\n" not in str(caught.value)


@pytest.mark.parametrize(
    ("cells", "values"),
    [
        (["1,234", "0,345"], [1.234, 0.345]),
        (["1,234", "12,5"], [1.234, 12.5]),
        (["1.234,5", "2.345"], [1234.5, 2345.0]),
        (["1,234.5", "2,345"], [1234.5, 2345.0]),
        (["1,234,567", "1,234"], [1234567.0, 1234.0]),
        (["1.234", "2.345"], [1.234, 2.345]),
        (["1e3", "-1.5E-3"], [1000.0, -0.0015]),
        (["−2", "+3"], [-2.0, 3.0]),
    ],
)
def test_marks_that_other_numbers_settle(read_text_log, cells, values):
    """Thousands and decimals, where the file itself tells which."""
    log = read_text_log("t;Vout\n" + "".join(f"{row};{cell}\n" for row, cell in enumerate(cells)))

    assert log.samples["output_voltage"].tolist() == values


def test_missing_and_over_range_readings_are_no_numbers(read_text_log):
    """NaN and a doubt each; over range bars its samples."""
    log = read_text_log(
        "t,Vout,Iout\n0,1.5,\n1,--,2\n2,NaN,n/a\n3,OL,****\n4,overload,9.9e37\n5,-,inf\n6,1,OVLD\n7,2,3\n"
    )

    assert np.isnan(log.samples["output_voltage"]).tolist() == [False, *[True] * 5, False, False]
    doubts = {(d.kind, d.channels): d for d in log.doubts}
    assert doubts["missing", ("output_voltage",)].text.startswith("3 readings")
    assert "A-17.csv:3" in doubts["missing", ("output_voltage",)].text
    assert not doubts["missing", ("output_voltage",)].bars
    over = doubts["over range", ("output_voltage",)]
    assert (over.bars, over.spans) == (True, ((3, 5),))
    assert doubts["over range", ("output_current",)].spans == ((3, 7),)


@pytest.mark.parametrize("reading", ["9.9E37", "+9.90000000E+37", "-9.9E+37"])
@pytest.mark.parametrize("heading", ["Iout (A)", "Iout (mA)"])
def test_number_sent_for_over_range_bars_the_channel(read_text_log, reading, heading):
    """In a column of plain numbers, whatever its unit."""
    rows = "".join(f"{n},12.5,{reading if n in (3, 4) else 1.5}\n" for n in range(9))
    log = read_text_log(f"t,Vout (V),{heading}\n{rows}")

    (doubt,) = [d for d in log.doubts if d.kind == "over range"]
    assert (doubt.bars, doubt.channels, doubt.spans) == (True, ("output_current",), ((3, 5),))
    assert np.isnan(log.samples["output_current"]).tolist() == [n in (3, 4) for n in range(9)]


@pytest.mark.parametrize(
    ("heading", "other"), [("101 a", "102 a"), ("101 <VIN> (VAC)", "102 <IOUT> (ADC)"), ("101", "102"), ("1 A", "2 A")]
)
def test_chosen_heading_that_begins_with_a_digit(read_text_log, heading, other):
    """Under notes, and above data that look like it; and where it comes again."""
    columns = {"output_voltage": (heading, "V"), "output_current": (other, "A")}
    text = f"Scanner,Name,Time\n1,x,2\n\nScan,Time (s),{heading},{other}\n1,0,12,1\n2,1,101,102\n"
    log = read_text_log(text + f"Scan,Time (s),{heading},{other}\n1,0,13,1\n", columns=columns)

    assert log.samples["output_voltage"].tolist() == [12, 101, 13]
    assert log.samples["output_current"].tolist() == [1, 102, 1]
    assert log.samples["table"].tolist() == [0, 0, 1]


def test_row_with_chosen_headings_is_the_heading_row(read_text_log):
    """Though another row has more headings that are understood."""
    text = "t,Vout,Iout,Pin\n0,1,2,3\nA;B;C\nt;101 a;102 a\n0;12;1\n"
    columns = {"output_voltage": ("101 a", "V"), "output_current": ("102 a", "A")}

    assert read_text_log(text, columns=columns).samples["output_voltage"].tolist() == [12]


SUMMED = "load;Vin (V);Pin (W);Vout (V);Iout (A);ripple (mV)\n1;230;26;12;2;40\n2;230;26;12;2;41\n"


@pytest.mark.parametrize(
    "below", ["\n;;Average;0.9;;\n", "\n;;Average\n;;Efficiency;0.9\n", ";;;;;\n;;Average;0.9;;\n"]
)
def test_summary_below_the_data_is_left_out_and_said(read_text_log, below):
    """Words where numbers should be, fewer than half of the columns, and a blank line before."""
    log = read_text_log(SUMMED + below)

    assert log.samples["line"].tolist() == [2, 3]
    assert any("Average" in item.reason for item in log.ignored)
    assert any("a summary below the data" in item.reason and "0.9" in item.reason for item in log.ignored)


@pytest.mark.parametrize(
    "below",
    [
        ";;Average;0.9;;\n",
        "\n;;Average;0.9;12;\n",
        "\n;;Average;0.9;;\n3;230;26;12;2;40\n",
        "\nAverage;230;26;12;2;40\n",
        "Average;230;26;12;2;40\n",
    ],
)
def test_words_that_are_no_clear_summary_are_refused(read_text_log, below):
    """Without a blank line, filled half or more, or with data after it; also where the word stands in no channel."""
    with pytest.raises(LogError, match='"Average" under "(Pin .W.|load)"'):
        read_text_log(SUMMED + below)


def test_cut_last_line_is_left_out(read_text_log):
    """Its last number may be cut too."""
    log = read_text_log("t,Vout,Iout\n0,1.5,2\n1,1.5,2\n2,1.5")

    assert len(log.samples) == 2
    assert any(item.what == "line 4" for item in log.ignored)


def test_text_is_only_text(read_text_log):
    """Formulas, tags and paths in cells, headings and notes."""
    log = read_text_log(
        'note: =1+1\nremark: <img src="x">\n../../x;Vout;stage\n=1+1;2;../../x\n@x;3;<b>\n', name="=1+1.csv"
    )

    assert log.serial == "=1+1"
    assert log.notes["note"] == "=1+1"
    assert log.samples["stage"].tolist() == ["../../x", "<b>"]


@pytest.mark.parametrize(
    ("cells", "seconds", "day"),
    [
        (["0", "0.5"], [0, 0.5], None),
        (["10", ""], [10, np.nan], None),
        (["23:59:59.5", "00:00:00.5"], [0, 1], None),
        (["12:30", "12:31"], [0, 60], None),
        (["25:00:00", "25:00:10"], [0, 10], None),
        (["11:59:59 AM", "12:00:01 PM"], [0, 2], None),
        (["2026-05-04T12:00:00", "2026-05-04T12:00:00.25"], [0, 0.25], date(2026, 5, 4)),
        (["2026-05-04 23:59:59", "2026-05-05 00:00:01"], [0, 2], date(2026, 5, 5)),
        (["4.5.2026 23:59:59", "5.5.2026 00:00:01"], [0, 2], date(2026, 5, 5)),
        (["2026-05-05 00:00:01", "2026-05-04 23:59:59"], [0, -2], date(2026, 5, 5)),
        (["05/04/2026 09:00:00:000", "05/04/2026 09:00:00:250"], [0, 0.25], None),
        (["13/04/2026 09:00:00:000", "13/04/2026 09:00:01:005"], [0, 1.005], date(2026, 4, 13)),
        (["2026-05-04 09:00:00:000", "2026-05-04 09:00:00:500"], [0, 0.5], date(2026, 5, 4)),
        (["09:00:00:000", "09:00:00:125"], [0, 0.125], None),
        (["09:00:00", "09:00:00:125"], [0, 0.125], None),
        (["2026-05-04T23:30:00-05:00", "2026-05-04T23:30:01-05:00"], [0, 1], date(2026, 5, 4)),
        (["2026-05-04T12:00:00Z", "2026-05-04T12:00:02Z"], [0, 2], date(2026, 5, 4)),
        (["2026-10-25T02:59:59+02:00", "2026-10-25T02:00:00+01:00"], [0, 1], date(2026, 10, 25)),
        (["04.05.2026 12:00:00", "04.05.2026 12:00:01,5"], [0, 1.5], date(2026, 5, 4)),
        (["2026/05/04 12:00", "2026/05/04 12:01"], [0, 60], date(2026, 5, 4)),
        (["13/05/2026 12:00:00", "13/05/2026 12:00:09"], [0, 9], date(2026, 5, 13)),
        (["05/13/2026 12:00:00", "05/13/2026 12:00:09"], [0, 9], date(2026, 5, 13)),
        (["05/05/2026 12:00:00", "05/05/2026 12:00:09"], [0, 9], date(2026, 5, 5)),
        (["4-May-2026 12:00:00", "4-May-2026 12:00:09"], [0, 9], date(2026, 5, 4)),
        (["04/05/2026 12:00:00", "04/05/2026 12:00:09"], [0, 9], None),
    ],
)  # fmt: skip
def test_times(read_text_log, cells, seconds, day):
    """Seconds as logged, clocks from the first sample, and the day where it is certain."""
    log = read_text_log("time;Vout\n" + "".join(f"{cell};{row}\n" for row, cell in enumerate(cells)))

    np.testing.assert_allclose(log.samples["time"], seconds, atol=1e-6)
    assert log.test_date == day


@pytest.mark.parametrize(("unit", "factor"), [("ms", 1e-3), ("s", 1.0), ("min", 60.0), ("h", 3600.0)])
def test_time_in_any_unit(read_text_log, unit, factor):
    """A factor to seconds, and nothing taken off."""
    log = read_text_log(f"Time ({unit}),Vout\n10,1\n12,1\n")

    assert log.samples["time"].tolist() == pytest.approx([10 * factor, 12 * factor])


def test_date_and_clock_in_two_columns_are_joined(read_text_log):
    """And the start of the test is told."""
    log = read_text_log("Date;Time;Vout\n04.05.2026;23:59:59;1\n05.05.2026;00:00:02;2\n")

    assert log.samples["time"].tolist() == [0, 3]
    assert log.test_date == date(2026, 5, 5)
    started = log.evidence[0].started_at
    assert started is not None
    assert started.isoformat() == "2026-05-04T23:59:59"


def test_clock_past_midnight_and_ambiguous_date_are_doubts(read_text_log):
    """Both are said, neither bars."""
    midnight = read_text_log("time,Vout\n23:59:59,1\n00:00:01,2\n").doubts
    either = read_text_log("date,time,Vout\n04/05/2026,12:00:00,1\n04/05/2026,12:00:02,2\n").doubts

    assert [d.bars for d in midnight if d.kind == "midnight"] == [False]
    assert [d.bars for d in either if d.kind == "ambiguous date"] == [False]


@pytest.mark.parametrize(
    "data",
    [
        b"",
        b"\n \n",
        b"\xef\xbb\xbf",
        bytes(range(256)) * 30,
        b"\x00" * 1000,
        b"It was a dark night.\nTime, and time again, we met.\n" * 20,
        b"t,Vout\n",
        b"t,Vout",
        b"t,Vout\na,b\n",
        b"t,Vout\n0,\n1,\n",
        b"t\n1\n2\n",
        b"1,2\n3,4\n",
        b'"t,Vout\n0,1\n',
        "t,Vout\n0,1\n".encode("utf-16")[:-1],
        b"Vout\x00,t\n1,2\n",
        b"," * 5000 + b"\n" + b"," * 5000,
    ],
)
def test_junk_is_refused_in_one_line(read_text_log, data):
    """Empty, binary, prose, no numbers: one clear line."""
    with pytest.raises(LogError) as caught:
        read_text_log(data)

    assert str(caught.value).startswith("A-17.csv")
    assert "\n" not in str(caught.value)


def test_a_hundred_thousand_columns_are_refused(read_text_log):
    """At once, and with their number."""
    wide = ",".join(["Vout", *(f"x{n}" for n in range(100_000))]) + "\n" + ",".join(["1"] * 100_001) + "\n"

    with pytest.raises(LogError, match="100001 columns"):
        read_text_log(wide)


def test_folder_missing_file_and_pipe_are_refused(tmp_path):
    """What is no file, and what cannot be read."""
    import os

    os.mkfifo(tmp_path / "pipe.csv")
    for path, words in [(tmp_path, "folder"), (tmp_path / "x.csv", "no such file"), (tmp_path / "pipe.csv", "regular")]:
        with pytest.raises(LogError, match=words):
            read_logs([path])
    with pytest.raises(LogError):
        read_logs([tmp_path / "a\x00b"])


def test_only_an_old_pandas_is_asked_for_exact_numbers():
    """From 3.1 on they are exact unasked, and asking warns."""
    assert _needs_precision("2.2.3")
    assert _needs_precision("3.0.1")
    assert not _needs_precision("3.1.0")
    assert not _needs_precision("10.0.0rc1")


finite = st.floats(allow_nan=False, allow_infinity=False, width=64).filter(lambda x: abs(x) < 1e30)


@settings(max_examples=120, deadline=None, suppress_health_check=[HealthCheck.function_scoped_fixture])
@given(
    rows=st.lists(st.tuples(finite, finite), min_size=1, max_size=40),
    separator=st.sampled_from([",", ";", "\t", "|"]),
    decimal=st.sampled_from([".", ","]),
    encoding=st.sampled_from(["utf-8", "utf-8-sig", "utf-16", "latin-1"]),
    blank=st.booleans(),
    noted=st.booleans(),
    quoted=st.booleans(),
)
def test_any_dialect_reads_back_the_same_numbers(
    read_text_log, rows, separator, decimal, encoding, blank, noted, quoted
):
    """To the last bit; a number of three decimals is kept from being mistaken for thousands."""

    def cell(number):
        text = repr(number) if "e" in repr(number) or len(repr(number).partition(".")[2]) != 3 else f"{number!r}0"
        text = text.replace(".", decimal)
        return f'"{text}"' if quoted or decimal == separator else text

    lines = [separator.join(cell(number) for number in row) for row in rows]
    head = ["# operator: J. Q."] if noted else []
    text = "\n".join([*head, separator.join(["Vout (V)", "T_amb (°C)"]), *lines]) + "\n"
    if blank:
        text = text.replace("\n", "\n\n")

    log = read_text_log(text, encoding=encoding)

    assert log.samples[["output_voltage", "ambient_temperature"]].to_numpy().tolist() == [list(row) for row in rows]


def test_numbers_are_exact(read_text_log):
    """The quick way reads each number to the last bit, whatever its size."""
    generator = np.random.default_rng(7)
    numbers = generator.normal(size=3000) * 10.0 ** generator.integers(-20, 20, 3000)

    log = read_text_log("Vout (V)\n" + "\n".join(map(repr, numbers.tolist())) + "\n")

    assert np.array_equal(log.samples["output_voltage"], numbers)
