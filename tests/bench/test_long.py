"""A log read in pieces is the log read as a whole, wherever a piece ends and whatever stands in it."""

from __future__ import annotations

from datetime import UTC, datetime, timedelta
from functools import partial

import numpy as np
import pytest
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st

from acceptance.bench import long, pieces, read
from acceptance.bench.headings import Vocabulary
from acceptance.bench.read import read_logs
from acceptance.errors import LogError

ODD_CELLS = [
    "", "NaN", "n/a", "OL", "-", "9.9E37", "9.91e37", "inf", "-0.000", "1e-3", "12 mV", "12 V", '"12.5"', "1,234", "x",
    "12.0000000000001", "123456789012345678901", " 12", "12 ", "+3", "1_0", "0x1f", "True", "\u221212", "1.2.3",
    "average", "1;2", "12,5", "\u00b5", "9" * 25, "1e999", "#", "\x00", "\t1",
]  # fmt: skip
ODD_LINES = [
    "", "   ", "# note: among the data", "# serial: B-9", "average,1,2,3", "headings", "\r", "1", "1,2,3,4,5,6,7,8",
    ",,,,,", "operator; N. N.", '"a', "end of run", ",", "-----", "#12,13,14", "# 12;13;14", "#", " # spaced", "1,,",
    '"a note, quoted"', '# "a", "b"', '"over', 'two lines"', "(s),(mV),(A)", ";;;", "average", "# 1.2345,1.2345,1.2345",
    "min,,,1", "\ttabbed", '""', "serial: A-17", "-,-,-", ",,,1", "# \u00b5",
]  # fmt: skip


def outcome(path):
    """What reading gives, in a form that can be compared; or the text of its refusal."""
    try:
        log = read_logs([path])
    except LogError as problem:
        return str(problem)
    columns = {}
    for key in log.samples.columns:
        column = log.samples[key]
        if column.dtype.kind in "fiu":
            values = np.asarray(column.to_numpy(np.float64))
            values = np.where(np.isnan(values), np.nan, values)
            columns[key] = values.view(np.uint64).tolist()
        else:
            columns[key] = column.tolist()
    dated = [one.started_at for one in log.evidence]
    told = (log.serial, log.serial_from, log.stages_from, log.notes, log.channels, log.evidence, log.tables)
    return columns, told, dated, log.ignored, log.doubts, log.test_date


@pytest.fixture
def in_pieces(monkeypatch):
    """Reads a log in pieces of so many bytes; tells whether it could be."""

    def outcome_of(path, piece, workers=2, small=64):
        was_read = []

        def noted(*arguments, **options):
            found = long.read_long(*arguments, **{**options, "piece": piece, "workers": workers})
            was_read.append(found is not None)
            return found

        monkeypatch.setattr(read, "LONG", 0)
        monkeypatch.setattr(read, "read_long", noted)
        monkeypatch.setattr(pieces, "_SMALL", small)
        found = outcome(path)
        monkeypatch.undo()
        return found, was_read == [True]

    return outcome_of


def stamp(row, form):
    moment = datetime(2026, 1, 5, 23, 59, 50, tzinfo=UTC).replace(tzinfo=None) + row * timedelta(milliseconds=500)
    return {
        "T": moment.isoformat(timespec="milliseconds"),
        "space": moment.isoformat(" ", timespec="seconds"),
        "short": moment.isoformat(),  # without a fraction where there is none
        "micro": moment.isoformat(timespec="microseconds"),
        "seconds": f"{row * 0.5:.1f}",
        "clock": moment.strftime("%H:%M:%S"),
        "german": moment.strftime("%d.%m.%Y %H:%M:%S"),
        "german short": f"{moment.day}.{moment.month}.{moment:%y %H:%M}",
        "german comma": f"{moment:%d.%m.%Y %H:%M:%S},{moment.microsecond // 100_000}",
        "year first": moment.strftime("%Y/%m/%d %H:%M:%S"),
        "elapsed": f"{9 + row // 2}:{row % 2 * 30:02}:00.{row % 7}",
        "clock short": f"{moment.hour % 12}:{moment:%M:%S}",
        "american": moment.strftime("%m/%d/%Y %H:%M:%S"),
        "split": f"{moment:%Y-%m-%d}|{moment:%H:%M:%S}.{moment.microsecond // 100_000}",
        "zoned": moment.isoformat(timespec="milliseconds") + "+01:00",
        "utc": moment.isoformat(" ") + "Z",
        "summer": moment.isoformat() + ("+01:00" if row < 12 else "+02:00"),
    }[form]


@st.composite
def logs(draw, odd=True):
    """A log, and the bytes of its pieces."""
    rows = draw(st.integers(1, 30))
    form = draw(
        st.sampled_from(
            ["T", "T", "space", "short", "micro", "seconds", "seconds", "zoned", "utc", "summer", "clock", "split"]
            + ["german", "german short", "german comma", "year first", "elapsed", "clock short", "american"]
        )
    )
    separator = draw(st.sampled_from([",", ";", "\t"]))
    comma = separator != "," and draw(st.booleans())
    has_time, has_stage, trailing = draw(st.booleans()), draw(st.booleans()), draw(st.booleans())
    time_at = draw(st.sampled_from([0, 0, 2]))
    quotes = draw(st.sampled_from(["", "", "", "first", "all"]))
    heading = ["Vout (mV)", "Iout [A]", "note"]
    lines = []
    for row in range(rows):
        volts = draw(st.integers(-20, 20000))
        cells = [f"{volts / 100:.2f}", f"{draw(st.integers(0, 3000)) / 1000:.3f}", draw(st.sampled_from(["1", "2.5"]))]
        if odd and draw(st.integers(0, 80)) == 0:
            cells[draw(st.integers(0, 2))] = draw(st.sampled_from(ODD_CELLS))
        if comma:
            cells = [cell.replace(".", ",") for cell in cells]
        if has_time:
            cells[time_at:time_at] = stamp(row, form).split("|")
        if has_stage:
            cells.append(draw(st.sampled_from(["steady", "steady", "overcurrent", ""])))
        if quotes == "all":
            cells = [f'"{cell}"' for cell in cells]
        elif quotes == "first":
            cells[0] = f'"{cells[0]}"'
        lines.append(separator.join(cells) + (separator if trailing else ""))
    if has_time:
        heading[time_at:time_at] = (
            ["date", "time"] if form == "split" else ["time" if form == "seconds" else "timestamp"]
        )
    if has_stage:
        heading.append("stage")
    first = separator.join(heading) + (separator if trailing else "")
    for _ in range(draw(st.sampled_from([0, 0, 1, 2, 5])) if odd else 0):
        line = draw(st.sampled_from(ODD_LINES))
        lines.insert(draw(st.integers(0, len(lines))), first if line == "headings" else line)
    notes = draw(st.sampled_from([[], ["# serial: A-17"], ["operator; N. N.", ""]]))
    end = draw(st.sampled_from(["\n", "\n", "\r\n"]))
    text = end.join([*notes, first, *lines]) + draw(st.sampled_from(["", end, end + end]))
    encoding = draw(
        st.sampled_from(["utf-8", "utf-8", "utf-8-sig", "utf-16", "utf-16-le", "latin-1"] if odd else ["utf-8"])
    )
    raw = text.encode(encoding, errors="replace")
    if odd and draw(st.integers(0, 20)) == 0:
        raw = raw[: draw(st.integers(0, len(raw)))]
    return raw


@settings(max_examples=400, deadline=None, suppress_health_check=[HealthCheck.function_scoped_fixture])
@given(raw=logs(), piece=st.integers(1, 400), small=st.sampled_from([1, 30, 100, 1000]))
def test_a_log_in_pieces_is_the_log_as_a_whole(raw, piece, small, tmp_path, in_pieces):
    """Whatever oddity stands wherever in it, and wherever the pieces end."""
    path = tmp_path / "A-17.csv"
    path.write_bytes(raw)

    found, _ = in_pieces(path, piece, small=small)

    assert found == outcome(path)


@settings(max_examples=100, deadline=None, suppress_health_check=[HealthCheck.function_scoped_fixture])
@given(
    rows=st.integers(2, 40),
    form=st.sampled_from(["T", "space", "short", "micro", "seconds", "zoned", "utc"]),
    piece=st.integers(1, 300),
)
def test_a_plain_log_can_be_read_in_pieces(rows, form, piece, tmp_path, in_pieces):
    """Or nothing would be gained."""
    lines = [
        f"{stamp(row, form)},{12 + row % 7 / 100:.2f},{row % 3 / 2:.3f},{'' if row % 5 else 40}" for row in range(rows)
    ]
    path = tmp_path / "A-17.csv"
    path.write_text("\n".join(["time,Vout,Iout,T_case (°C)", *lines]) + "\n", encoding="utf-8")

    found, was_read_so = in_pieces(path, piece)

    assert was_read_so
    assert found == outcome(path)


def test_every_border_of_pieces_gives_the_same_log(tmp_path, in_pieces):
    rows = [f"2026-01-05T08:00:{n:02}.000,{12 + n / 1000:.3f},{n % 4 / 2},steady" for n in range(20)]
    path = tmp_path / "A-17.csv"
    path.write_text("\n".join(["timestamp,Vout,Iout,stage", *rows, ""]))
    expected = outcome(path)

    for piece in range(1, path.stat().st_size + 2):
        assert in_pieces(path, piece) == (expected, True), piece


@pytest.mark.parametrize("workers", [1, 2, 5])
def test_any_number_of_threads_gives_the_same_log(workers, tmp_path, in_pieces):
    path = tmp_path / "A-17.csv"
    path.write_text("t,Vout,Iout\n" + "".join(f"{n},{12 + n % 9 / 100},{n % 5}\n" for n in range(3000)))

    assert in_pieces(path, 997, workers) == (outcome(path), True)


HEADINGS = "timestamp,Vout,Iout,stage"


def long_log(form="T", separator=",", comma=False):
    """Headings and 600 rows."""
    rows = []
    for n in range(600):
        cells = [f"{12 + n % 90 / 1000:.3f}", f"{n % 4 / 2:.1f}"]
        if comma:
            cells = [cell.replace(".", ",") for cell in cells]
        rows.append(separator.join([*stamp(n, form).split("|"), *cells, "steady"]))
    heading = HEADINGS.replace("timestamp", "date,time") if form == "split" else HEADINGS
    return [heading.replace(",", separator), *rows]


@pytest.mark.parametrize(
    ("at", "odd", "told"),
    [
        pytest.param(300, ["# fan: on"], ("note", "fan", "on"), id="note"),
        pytest.param(300, ["# the fan runs"], ("ignored", "line 301", "text among the data"), id="comment"),
        pytest.param(300, ["fan started"], ("ignored", "line 301", "text among the data"), id="remark"),
        pytest.param(300, ["operator,N. N."], ("note", "operator", "N. N."), id="note in cells"),
        pytest.param(300, ['"fan, left","on"'], ("ignored", "line 301", "fan, left on"), id="quoted remark"),
        pytest.param(300, ['"over', 'two lines"'], ("ignored", "line 301", "over"), id="quote over two lines"),
        pytest.param(300, ["", "   ", ""], (), id="blank lines"),
        pytest.param(300, [HEADINGS], ("ignored", "line 301", "the headings come again"), id="headings"),
        pytest.param(300, [HEADINGS, "(s),(V),(A),-"], ("ignored", "line 301", "again"), id="headings and units"),
        pytest.param(300, ["2026-01-06T00:02:19.500,12.0,1.0"], (), id="row without its last cell"),
        pytest.param(300, ['2026-01-06T00:02:19.500,"12.0",1.0,steady'], (), id="quoted cell"),
        pytest.param(300, ["n/a,12.0,1.0,steady"], (), id="no time"),
        pytest.param(300, ["2026-01-06T00:02:19.500,12.1234567,+1.0,steady"], (), id="more digits"),
        pytest.param(601, ["", "average"], ("ignored", "line 603", "text among the data"), id="summary"),
        pytest.param(601, ["2026-01-06T00:04:50.000,12.0"], ("ignored", "line 602", "ends within"), id="cut line"),
    ],
)
def test_an_odd_line_leaves_the_others_fast(at, odd, told, tmp_path, in_pieces):
    """It is told as it is in a short log, and the log is still read in pieces."""
    lines = long_log()
    lines[at:at] = odd
    path = tmp_path / "A-17.csv"
    path.write_text("\n".join(lines) + ("" if at > 600 else "\n"))

    found, was_read_so = in_pieces(path, 3000, small=500)

    assert was_read_so
    assert found == outcome(path)
    if told[:1] == ("note",):
        assert found[1][3][told[1]] == told[2]
    elif told:
        assert any(item.what == told[1] and told[2] in item.reason for item in found[3])


@pytest.mark.parametrize(
    "line",
    [
        "2026-01-06T00:02:19.500,12,1,steady,7,8",
        "word,word,word,word",
        "average,1,2,3",
        "2026-01-06T00:02:19.500,x,1,steady",
        '2026-01-06T00:02:19.500,"12,5",1,steady',
        "2026-01-06T00:02:19.500,12 A,1,steady",
        "2026-13-06T00:02:19.500,12,1,steady",
        "x,x,1,steady",
    ],
    ids=lambda line: line,
)
def test_a_line_that_does_not_fit_is_refused_without_reading_the_log_whole(line, tmp_path, monkeypatch):
    """In the same words, with its line."""
    lines = long_log()
    lines[300:300] = [line]
    path = tmp_path / "A-17.csv"
    path.write_text("\n".join([*lines, ""]))
    expected = outcome(path)

    with pytest.raises(LogError, match=r"A-17.csv:301") as refused:
        long.read_long(path, path.name, Vocabulary(None, ()), piece=3000)

    assert str(refused.value) == expected


DRESSES = {
    "semicolons and decimal commas": ("\n".join(long_log("T", ";", comma=True)), "utf-8"),
    "tabs": ("\n".join(long_log("T", "\t")), "utf-8"),
    "spreadsheet": ("\r\n".join(long_log("german comma", ";", comma=True)), "utf-8"),
    "carriage returns": ("\r\n".join(long_log()), "utf-8"),
    "two bytes": ("\n".join(long_log()), "utf-16"),
    "two bytes without a mark": ("\n".join(long_log()), "utf-16-le"),
    "quotes": ("\n".join('"' + line.replace(",", '","') + '"' for line in long_log()), "utf-8"),
}
FORMS = ["T", "space", "german", "german short", "year first", "clock", "clock short", "elapsed", "split", "zoned"]


@pytest.mark.parametrize(
    ("text", "encoding"),
    [pytest.param(*dress, id=name) for name, dress in DRESSES.items()]
    + [pytest.param("\n".join(long_log(form)), "utf-8", id=form) for form in FORMS],
)
def test_a_log_of_any_usual_dress_can_be_read_in_pieces(text, encoding, tmp_path, in_pieces):
    path = tmp_path / "A-17.csv"
    path.write_bytes(text.encode(encoding))

    found, was_read_so = in_pieces(path, 3000)

    assert was_read_so
    assert found == outcome(path)
    assert len(found[0]["time"]) == 600


def test_text_of_two_bytes_cut_within_a_character_is_refused_as_otherwise(tmp_path, in_pieces):
    path = tmp_path / "A-17.csv"
    path.write_bytes("\n".join(long_log()).encode("utf-16")[:-1])

    found, _ = in_pieces(path, 3000)

    assert found == outcome(path)
    assert "the file may be cut short" in found


@pytest.mark.parametrize("encodings", [["latin-1"], ["utf-8"], ["latin-1", "utf-8"], ["utf-8", "latin-1"]])
def test_a_letter_beyond_ascii_far_below_tells_the_encoding(encodings, tmp_path, in_pieces, monkeypatch):
    """Where two of them tell different ones, the log is read whole."""
    monkeypatch.setattr(long, "_HEAD", 2000)
    lines = [line.encode() for line in long_log()]
    for number, encoding in enumerate(encodings):
        lines[300 + 200 * number : 300 + 200 * number] = ["# pr\u00fcfer: M\u00fcller".encode(encoding)]
    path = tmp_path / "A-17.csv"
    path.write_bytes(b"\n".join([*lines, b""]))

    found, was_read_so = in_pieces(path, 3000)

    assert was_read_so == (len(encodings) == 1)
    assert found == outcome(path)


@pytest.mark.parametrize("word", ["OL", "OVLD", "***"])
def test_words_for_over_range_are_told_at_their_line(word, tmp_path, in_pieces):
    """A reading over range in one of many pieces."""
    rows = [f"{n},12.0{n % 9},1.0" for n in range(500)]
    rows[321] = f"321,{word},1.0"
    path = tmp_path / "A-17.csv"
    path.write_text("\n".join(["t,Vout,Iout", *rows, ""]))

    found, was_read_so = in_pieces(path, 500)

    assert was_read_so
    assert found == outcome(path)
    assert any("1 reading of output voltage over range, first at A-17.csv:323" in doubt.text for doubt in found[4])


def test_an_empty_row_ends_no_sample_in_either_way(tmp_path, in_pieces):
    """Its time is missing too: it is a line drawn under something, and no sample."""
    path = tmp_path / "A-17.csv"
    path.write_text("timestamp,Vout,Iout\n2026-01-05T23:59:50.000,,1.0\n,,\n2026-01-05T23:59:51.000,12,1.0\n")

    found, _ = in_pieces(path, 1)

    assert found == outcome(path)
    assert len(found[0]["time"]) == 2


# --- files that are no logs, or change ------------------------------------------------------------------------------


def test_a_file_that_grows_while_it_is_read_is_refused(tmp_path):
    path = tmp_path / "A-17.csv"
    path.write_text("t,Vout,Iout\n" + "".join(f"{n},12.0,{n % 5}\n" for n in range(3000)))

    def grow(done):
        with path.open("a") as stream:
            stream.write("3000,12.0,1\n")

    with pytest.raises(LogError, match="the file changed while it was read"):
        long.read_long(path, path.name, Vocabulary(None, ()), piece=5000, progress=grow)


def test_a_file_that_is_cut_while_it_is_read_is_refused(tmp_path, monkeypatch):
    path = tmp_path / "A-17.csv"
    path.write_text("t,Vout,Iout\n" + "".join(f"{n},12.0,{n % 5}\n" for n in range(3000)))
    monkeypatch.setattr(long, "_HEAD", 2000)

    def cut(done):
        with path.open("r+b") as stream:
            stream.truncate(30_000)

    with pytest.raises(LogError, match="the file changed while it was read"):
        long.read_long(path, path.name, Vocabulary(None, ()), piece=5000, progress=cut)


@pytest.mark.parametrize("before", [b"", b"t,Vout,Iout\n0,12,1\n1,12,1\n"])
def test_a_file_without_ends_of_lines_is_refused_before_it_is_read(before, tmp_path, monkeypatch):
    """A file of gigabytes with one endless line must not be taken into memory."""
    monkeypatch.setattr(long, "_HEAD", 1000)
    monkeypatch.setattr(long, "_LONGEST_LINE", 5000)
    path = tmp_path / "A-17.csv"
    path.write_bytes(before + b"1" * 200_000)
    read_so_far = []

    with pytest.raises(LogError, match="does not end within"):
        long.read_long(path, path.name, Vocabulary(None, ()), piece=1000, progress=read_so_far.append)

    assert max(read_so_far, default=0) < 20_000


def test_a_long_file_that_is_no_log_is_refused_like_a_short_one(tmp_path, in_pieces):
    for raw in (b"hello\nworld\n" * 50, b"\x00\x01\x02\n" * 100, b"a,b\n1,2\n" * 30, b"t,Vout\n", b""):
        path = tmp_path / "A-17.csv"
        path.write_bytes(raw)

        found, _ = in_pieces(path, 64)

        assert isinstance(found, str)
        assert found == outcome(path)


def test_progress_counts_the_bytes_of_all_files(tmp_path, monkeypatch):
    """Never backwards, and all of them at the end."""
    monkeypatch.setattr(read, "LONG", 0)
    monkeypatch.setattr(read, "read_long", partial(long.read_long, piece=500))
    monkeypatch.setattr(long, "_HEAD", 1000)
    paths = [tmp_path / name for name in ("A-17_steady.csv", "A-17_overcurrent.csv")]
    for path in paths:
        path.write_text("t,Vout,Iout\n" + "".join(f"{n},12.0,{n % 5}\n" for n in range(400)))
    seen = []

    read_logs(paths, serial="A-17", progress=lambda done, total: seen.append((done, total)))

    total = sum(path.stat().st_size for path in paths)
    assert [total_said for _, total_said in seen] == [total] * len(seen)
    done = [number for number, _ in seen]
    assert done == sorted(done)
    assert done[-1] == total
    assert len(done) > 8
