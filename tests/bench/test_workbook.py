"""Workbooks: the table anywhere, notes beside it, sheets as stages; and what is no log."""

from __future__ import annotations

import io
import subprocess
import sys
import zipfile
from datetime import date, datetime, time, timedelta

import numpy as np
import openpyxl
import pytest
from openpyxl.chart import LineChart, Reference

from acceptance.bench import workbook
from acceptance.bench.read import read_logs
from acceptance.errors import LogError, SeveralSerialsError


def put(sheet, rows, at=(1, 1)):
    for i, row in enumerate(rows):
        for j, value in enumerate(row):
            if value is not None:
                sheet.cell(at[0] + i, at[1] + j, value)


TABLE = [["Vout", "Iout", "T_case"], ["V", "mA", "°C"], [12.5, 100, 25], [12.25, 200, None], [12, 300, "26.5"]]


@pytest.mark.parametrize("at", [(1, 1), (7, 4), (30, 20)])
def test_table_anywhere_with_notes_above_and_beside(read_book, at):
    """Its rows keep their numbers."""

    def fill(book):
        put(book.active, TABLE, at)
        if at[0] > 3:
            put(book.active, [["serial", 7], ["operator: J. Q."]], (1, 2))
        put(book.active, [["bench", "three"], [], ["date", date(2026, 5, 4)]], (at[0], at[1] + 4))

    log = read_book(fill)

    assert log.samples["output_current"].tolist() == [0.1, 0.2, 0.3]
    np.testing.assert_array_equal(log.samples["temperature case"], [25, np.nan, 26.5])
    assert log.samples["line"].tolist() == [at[0] + 2, at[0] + 3, at[0] + 4]
    assert log.notes["bench"] == "three"
    assert log.serial == ("7" if at[0] > 3 else "A-17")
    assert [d.channels for d in log.doubts if d.kind == "missing"] == [("temperature case",)]


def test_sheets_are_stages_and_others_are_left_out(read_book):
    """Sheets of charts and sheets of words are tolerated and said."""

    def fill(book):
        book.active.title = "Steady"
        put(book.active, TABLE)
        put(book.create_sheet("overcurrent"), [["time", "Vout (V)"], [0, 12], [1, 11.5]])
        put(book.create_sheet("Notes"), [["the unit hummed"]])
        put(book.create_sheet("thermal 2"), [["T_case (°C)"], [40]])
        chart = LineChart()
        chart.add_data(Reference(book.active, min_col=1, min_row=3, max_row=5))
        book.create_chartsheet("curve").add_chart(chart)

    log = read_book(fill)

    assert log.samples["stage"].tolist() == ["steady"] * 3 + ["overcurrent"] * 2 + ["thermal"]
    assert log.stages_from == "sheet name"
    assert log.tables == tuple(f'A-17.xlsx, sheet "{n}"' for n in ("Steady", "overcurrent", "thermal 2"))
    assert {item.what for item in log.ignored} == {'sheet "Notes"', 'sheet "curve"'}


@pytest.mark.parametrize("state", ["hidden", "veryHidden"])
def test_hidden_sheet_is_not_read(read_book, state):
    """Nobody who looks at the workbook sees it: neither its samples nor its notes."""

    def fill(book):
        put(book.active, TABLE)
        put(book.create_sheet("old"), [["serial", "X-1"], [], ["Vout (V)"], [40]])
        book["old"].sheet_state = state

    log = read_book(fill)

    assert log.samples["output_voltage"].tolist() == [12.5, 12.25, 12]
    assert (log.serial, log.notes) == ("A-17", {})
    (item,) = log.ignored
    assert item.what == 'sheet "old"'
    assert item.reason == "it is hidden; make it visible if it belongs to the test"


def test_table_on_a_hidden_sheet_alone_is_refused(read_book):
    """With the way out."""

    def fill(book):
        put(book.active, [["Serial", "X-1"]])
        put(book.create_sheet("data"), TABLE)
        book["data"].sheet_state = "hidden"

    with pytest.raises(LogError, match='hidden.*"data".*visible'):
        read_book(fill)


def test_notes_of_a_sheet_without_a_table(read_book):
    """A cover sheet tells serial, operator and date."""

    def fill(book):
        book.active.title = "Cover"
        put(book.active, [
            ["Test report of a supply"],
            ["Serial", "X-0071"],
            [None, "Operator", None, "J. Q."],
            ["Date", date(2026, 5, 4)],
            ["bench: 3", None, "room:", "north"],
            ["Step", "Load", "Limit"],
            ["one", "50 %", "88 %"],
            ["Product:", "adapter", "Revision:", "C"],
        ])  # fmt: skip
        put(book.create_sheet("data"), TABLE)

    log = read_book(fill)

    assert (log.serial, log.serial_from, log.test_date) == ("X-0071", "note", date(2026, 5, 4))
    assert log.notes == {
        "serial": "X-0071", "operator": "J. Q.", "date": "2026-05-04", "bench": "3", "room": "north",
        "product": "adapter", "revision": "C",
    }  # fmt: skip
    (item,) = log.ignored
    assert item.what == 'sheet "Cover"'
    assert "no table of readings" in item.reason
    assert "notes" in item.reason


def test_cover_sheet_of_another_unit_is_refused(read_book):
    """Its serial counts as a note."""

    def fill(book):
        put(book.active, [["Serial", "X-0071"]])
        put(book.create_sheet("data"), [["serial", "Vout (V)"], ["X-0072", 12]])

    with pytest.raises(SeveralSerialsError):
        read_book(fill)


def test_formula_without_a_value_in_a_column_that_nothing_needs(read_book):
    """Left out and said; the workbook is read."""
    rows = [["Vin (V)", "Vout (V)", "Iout (A)", "Pout (W)", "margin"]]
    rows += [[230, 12.5, n, f"=B{n + 1}*C{n + 1}", f"=D{n + 1}/60"] for n in (1, 2, 3)]
    log = read_book(lambda book: put(book.active, rows))

    assert "output_power" not in log.samples
    assert "output_power" not in {channel.key for channel in log.channels}
    assert {item.what for item in log.ignored} == {'column "Pout (W)"', 'column "margin"'}
    (doubt,) = [d for d in log.doubts if d.kind == "formula"]
    assert not doubt.bars
    assert "Pout (W)" in doubt.text
    assert "save it" in doubt.remedy


def test_formula_without_a_value_in_a_needed_column_is_refused(read_book):
    """Also beside one that nothing needs."""
    rows = [["Vout (V)", "Iout (A)", "Pout (W)", "Pin (W)"]]
    rows += [[12.5, n, f"=A{n + 1}*B{n + 1}", f"=C{n + 1}*1.1"] for n in (1, 2, 3)]

    with pytest.raises(LogError, match='"Pin .W.".*formula without a stored value'):
        read_book(lambda book: put(book.active, rows))


def test_readings_over_range_in_a_workbook(read_book):
    """The number that instruments send, whatever the column's unit."""
    rows = [["Vout (mV)", "Iout (A)"], [12000, 1], [9.9e37, 1], [-9.9e37, "9.90000000E+37"], [12000, 1]]
    log = read_book(lambda book: put(book.active, rows))

    doubts = {d.channels: d for d in log.doubts if d.kind == "over range"}
    assert doubts[("output_voltage",)].spans == ((1, 3),)
    assert doubts[("output_current",)].spans == ((2, 3),)
    assert all(d.bars for d in doubts.values())


def test_heading_that_is_a_number(read_book):
    """A scanner's channel number, as a number in its cell."""
    columns = {"output_voltage": ("101", "V"), "output_current": ("102", "A")}
    log = read_book(lambda b: put(b.active, [["t", 101, 102], [0, 12, 1], [1, 101, 102]]), columns=columns)

    assert log.samples["output_voltage"].tolist() == [12, 101]
    assert log.samples["output_current"].tolist() == [1, 102]


def test_summary_below_the_data_of_a_sheet(read_book):
    """Left out and said, where a blank row parts it from the data."""
    head = ["load", "Vin (V)", "Pin (W)", "Vout (V)", "Iout (A)", "ripple (mV)"]
    rows = [[n, 230, 26, 12, 2, 40] for n in (1, 2, 3)]
    below = [[None, None, "Average", 0.9], [None, None, "Ripple", 40]]
    log = read_book(lambda b: put(b.active, [head, *rows, [], *below]))

    assert log.samples["line"].tolist() == [2, 3, 4]
    told = {item.what: item.reason for item in log.ignored if item.what.startswith("line")}
    assert set(told) == {"line 6", "line 7"}
    assert "summary" in told["line 6"]
    assert "Average 0.9" in told["line 6"]


def test_dates_clocks_and_texts_in_cells(read_book):
    """A workbook's own kinds of time, and numbers that are text."""
    noon = datetime(2026, 5, 4, 12)  # noqa: DTZ001 - a workbook knows no zones
    stamps = [noon, noon + timedelta(seconds=1.5)]
    days = [date(2026, 5, 4), date(2026, 5, 5)]
    dated = read_book(lambda b: put(b.active, [["timestamp", "Vout"], [stamps[0], "11,5"], [stamps[1], 3]]))
    clock = read_book(lambda b: put(b.active, [["time", "Vout"], [time(23, 59, 59), 1], [time(0, 0, 1), 2]]))
    two = read_book(lambda b: put(b.active, [["date", "time", "Vout"], [days[0], time(12), 1], [days[1], time(1), 2]]))

    assert (dated.samples["time"].tolist(), dated.test_date) == ([0, 1.5], date(2026, 5, 4))
    assert dated.samples["output_voltage"].tolist() == [11.5, 3]
    assert clock.samples["time"].tolist() == [0, 2]
    assert (two.samples["time"].tolist(), two.test_date) == ([0, 13 * 3600], date(2026, 5, 5))


def test_headings_that_come_again_and_blank_rows(read_book):
    """As in text."""
    log = read_book(
        lambda b: put(b.active, [["t", "Vout"], [0, 1], [], [1, 2], ["t", "Vout"], [0, 3], ["remark", "ok"]])
    )

    assert log.samples["table"].tolist() == [0, 0, 1]
    assert log.samples["line"].tolist() == [2, 4, 6]
    assert log.notes["remark"] == "ok"


@pytest.mark.parametrize(
    ("rows", "words"),
    [
        ([["t", "Vout"], [0, 1], [1, "#DIV/0!"]], r':3:2: .*"#DIV/0!" under "Vout" is not a number'),
        ([["t", "Vout"], [0, 1], [1, True]], r':3:2: .*"True" under "Vout" is not a number'),
        ([["Iout", "Vout"], [1, "=A2*2"], [2, "=A3*2"]], "formula without a stored value"),
        ([["Vout"], ["=1+1"]], "formula without a stored value"),
        ([["t", "Vout", "Uout"], [0, 1, 2]], ":1:3: .*both output voltage.*log: columns:"),
        ([["t", "Vout", "vout "], [0, 1, 2]], ":1:3: .*both output voltage; rename one of them in the file"),
        ([["foo", "bar"], [0, 1]], "none of the headings"),
        ([["t", "Vout"]], "no readings"),
        ([["Vout", *["x"] * 3000], [1] * 3001], "3001 columns"),
        ([], "empty"),
    ],
)
def test_fault_in_a_workbook_has_its_place(read_book, rows, words):
    """Row and column of the sheet, one line."""
    with pytest.raises(LogError, match=words) as caught:
        read_book(lambda book: put(book.active, rows))

    assert "\n" not in str(caught.value)


def saved(rows=TABLE):
    book = openpyxl.Workbook()
    put(book.active, rows)
    stream = io.BytesIO()
    book.save(stream)
    return stream.getvalue()


def refused(tmp_path, data, name="A-17.xlsx"):
    (tmp_path / name).write_bytes(data)
    with pytest.raises(LogError) as caught:
        read_logs([tmp_path / name])
    assert "\n" not in str(caught.value)
    return str(caught.value)


def test_cut_workbook_is_refused(tmp_path):
    """At any length."""
    whole = saved()
    for length in (4, 30, len(whole) // 2, len(whole) - 10):
        assert "damaged" in refused(tmp_path, whole[:length])


def test_what_is_no_workbook_is_refused(tmp_path):
    """Another archive; the older kind; a document type."""
    stream = io.BytesIO()
    with zipfile.ZipFile(stream, "w") as archive:
        archive.writestr("content.xml", "<x/>")
    assert "no .xlsx workbook" in refused(tmp_path, stream.getvalue())
    assert ".xls" in refused(tmp_path, b"\xd0\xcf\x11\xe0\xa1\xb1\x1a\xe1" + bytes(600))
    laughs = '<?xml version="1.0"?><!DOCTYPE x [<!ENTITY a "aaaa">]><x>&a;</x>'
    assert "document type" in refused(tmp_path, replaced(saved(), "xl/worksheets/sheet1.xml", laughs))


def replaced(data, part, text):
    stream = io.BytesIO()
    with zipfile.ZipFile(io.BytesIO(data)) as old, zipfile.ZipFile(stream, "w", zipfile.ZIP_DEFLATED) as new:
        for entry in old.infolist():
            new.writestr(entry.filename, text if entry.filename == part else old.read(entry.filename))
    return stream.getvalue()


def test_damaged_parts_are_refused(tmp_path):
    """Whatever the readers underneath make of them."""
    for part in ("xl/workbook.xml", "xl/worksheets/sheet1.xml", "[Content_Types].xml", "xl/styles.xml"):
        for text in (
            "",
            "<x/>",
            "no xml",
            "<worksheet><sheetData><row r='x'><c r='??'/></row></sheetData></worksheet>",
        ):
            data = replaced(saved(), part, text)
            (tmp_path / "A-17.xlsx").write_bytes(data)
            try:
                found = read_logs([tmp_path / "A-17.xlsx"]).samples["output_current"].tolist()
            except LogError as problem:
                found = str(problem)
            # a part that the numbers do not need may be anything
            assert found == [0.1, 0.2, 0.3] or "\n" not in found


def test_bomb_is_refused_unopened(tmp_path, monkeypatch):
    """More than 200-fold and 100 MiB."""
    monkeypatch.setattr(workbook, "MAX_UNPACKED", 200 << 20)
    stream = io.BytesIO()
    archive = zipfile.ZipFile(stream, "w", zipfile.ZIP_DEFLATED, compresslevel=1)
    with archive, archive.open("xl/worksheets/sheet1.xml", "w") as part:
        for _ in range(101):
            part.write(b" " * (1 << 20))
    assert "unpacks to 101 MiB" in refused(tmp_path, stream.getvalue())


_MEASURE = """
import resource, sys
from pathlib import Path
import openpyxl, pandas
from acceptance.bench.read import read_logs
from acceptance.errors import LogError, SeveralSerialsError
resource.setrlimit(resource.RLIMIT_AS, (2500 << 20, 2500 << 20))
before = resource.getrusage(resource.RUSAGE_SELF).ru_maxrss
try:
    print(len(read_logs([Path(sys.argv[1])]).samples))
except LogError as problem:
    print(problem)
print((resource.getrusage(resource.RUSAGE_SELF).ru_maxrss - before) // 1024)
"""


@pytest.mark.parametrize("kind", ["empty rows", "far cell", "claimed size"])
def test_smaller_bomb_ends_in_bounded_memory(tmp_path, kind):
    """A hundredfold of nothing, or a size that is only claimed, takes little memory."""
    sheet = {
        "empty rows": "<row/>" * 1_500_000,
        "far cell": '<row r="1048576"><c r="XFD1048576"><v>1</v></c></row>',
        "claimed size": "",
    }[kind]
    head = '<worksheet xmlns="http://schemas.openxmlformats.org/spreadsheetml/2006/main">'
    text = f'{head}<dimension ref="A1:XFD1048576"/><sheetData>{_cells()}{sheet}</sheetData></worksheet>'
    (tmp_path / "A-17.xlsx").write_bytes(replaced(saved(), "xl/worksheets/sheet1.xml", text))

    done = subprocess.run(
        [sys.executable, "-c", _MEASURE, tmp_path / "A-17.xlsx"], capture_output=True, text=True, check=True, timeout=60
    )

    outcome, grown = done.stdout.splitlines()
    assert outcome == "2" or "columns" in outcome
    assert int(grown) < 300  # MiB


def _cells():
    cells = '<row r="1"><c r="A1" t="str"><v>Vout</v></c></row>'
    return cells + "".join(f'<row r="{n}"><c r="A{n}"><v>{n}</v></c></row>' for n in (2, 3))


def test_text_named_like_a_workbook_is_read_as_text(tmp_path):
    """What is in the file counts, not its name."""
    (tmp_path / "A-17.xlsx").write_text("t,Vout\n0,1\n")
    (tmp_path / "A-18.csv").write_bytes(saved())

    assert read_logs([tmp_path / "A-17.xlsx"]).evidence[0].dialect.startswith("commas")
    assert read_logs([tmp_path / "A-18.csv"]).evidence[0].dialect.startswith("workbook")
