"""Delimited text -> `Source`: encoding, separator, decimal mark, notes, repeated headings, blank lines.

The quick way gives the lines between two heading rows to pandas' C reader, once the separator and the decimal
mark are told from the first lines. Whatever that cannot take whole goes the careful way, cell by cell, which
knows the place of every fault. Both give the same numbers.
"""

from __future__ import annotations

import csv
import io
import re
import warnings
from collections.abc import Sequence
from dataclasses import dataclass, replace
from typing import TYPE_CHECKING, Any

import numpy as np
from numpy.typing import NDArray

from acceptance.bench.headings import Vocabulary, shown
from acceptance.bench.table import (
    MAX_COLUMNS,
    Layout,
    RawColumn,
    RawTable,
    Row,
    Source,
    find_layout,
    note_of,
    refuse_headings,
    refuse_width,
    settle,
    tables_of,
)
from acceptance.bench.values import MISSING, Place, is_reading, settle_decimal
from acceptance.errors import LogError

if TYPE_CHECKING:
    import pandas as pd

__all__ = ["read_text"]

_SEPARATORS = {";": "semicolons", "\t": "tabs", "|": "bars", ",": "commas"}
_HEAD_LINES = (32, 600)  # notes longer than this are prose
_HEAD_BYTES = 1 << 20
_TAIL_LINES = 40
_ISO = re.compile(r"\d{4}-\d{2}-\d{2}[T ]\d{2}:\d{2}(:\d{2}(\.\d{1,6})?)?")


@dataclass(frozen=True, slots=True)
class _Text:
    """A file's text in one encoding, its lines ended by "\\n" alone."""

    data: bytes  # UTF-8
    encoding: str


def read_text(raw: bytes, file: str, vocabulary: Vocabulary) -> Source:
    """The tables and notes of a file of delimited text.

    Raises
    ------
    LogError
        If it is empty, no text, or holds no table of readings; or at the first line that does not fit its headings.
    """
    text = _decode(raw, file)
    head, separator, layout = _find_table(text.data, file, vocabulary)
    source = Source(file)
    _take_notes(source, head, layout)
    tables = _quick_tables(text.data, head, separator, layout, source)
    if tables is None:
        # the careful way meets the notes below the table anew
        source = Source(file)
        _take_notes(source, head, layout)
        rows = _split(text.data.decode(), separator, file)
        tables = tables_of(rows, layout, source, name=file, strict_width=True)
        _drop_cut_line(tables, text.data, rows, layout, source)
        tables = settle(tables)
    source.tables = [table for table in tables if len(table.lines)]
    if not source.tables:
        raise LogError(file, "the headings have no readings under them", "expected one row of numbers for each sample")
    for heading in layout.unread.values():
        if heading.text.strip():
            source.ignore(f'column "{shown(heading.text)}"', heading.reason)
    mark = "decimal comma" if source.tables[0].decimal == "," else "decimal point"
    source.dialect = f"{_SEPARATORS[separator]}, {mark}, {text.encoding}"
    return source


# --- bytes -> text --------------------------------------------------------------------------------------------------


def _decode(raw: bytes, file: str) -> _Text:
    if not raw.strip(b"\x00 \t\r\n\xef\xbb\xbf\xff\xfe"):
        raise LogError(file, "the file is empty", "expected a log with headings and readings")
    text, encoding = _by_mark(raw, file)
    if text is None:
        try:
            if not raw.isascii():
                raw.decode("utf-8")
            data, encoding = raw, "ASCII" if raw.isascii() else "UTF-8"
        except UnicodeDecodeError:
            data, encoding = raw.decode("cp1252", errors="replace").encode(), "Latin-1"
    else:
        data = text.encode("utf-8", errors="replace")
    _refuse_binary(data, file)
    if b"\r" in data:
        data = data.replace(b"\r\n", b"\n").replace(b"\r", b"\n")
    return _Text(data, encoding)


def _by_mark(raw: bytes, file: str) -> tuple[str | None, str]:
    """Text whose byte-order mark, or whose every second byte, tells the encoding."""
    try:
        if raw.startswith(b"\xef\xbb\xbf"):
            return raw[3:].decode("utf-8"), "UTF-8 with mark"
        if raw.startswith((b"\xff\xfe", b"\xfe\xff")):
            return raw.decode("utf-16"), "UTF-16 with mark"
        sample = raw[:4000]
        if len(sample) > 3 and sample.count(0) > len(sample) // 3:
            low, high = sample[1::2].count(0), sample[::2].count(0)
            if low > 0.9 * (len(sample) // 2) and not high:
                return raw.decode("utf-16-le"), "UTF-16"
            if high > 0.9 * (len(sample) // 2) and not low:
                return raw.decode("utf-16-be"), "UTF-16"
    except UnicodeDecodeError as problem:
        found = f"the text is not the {problem.encoding.upper()} that its first bytes say (byte {problem.start})"
        raise LogError(file, found, "the file may be cut short; copy it again") from None
    return None, ""


def _refuse_binary(data: bytes, file: str) -> None:
    sample = data[: 1 << 16]
    controls = sum(sample.count(code) for code in (*range(1, 9), 11, *range(14, 32), 127))
    if b"\x00" in data or controls * 50 > len(sample):
        raise LogError(file, "this is no text and no workbook", "expected delimited text or an .xlsx workbook")


# --- where the table is ---------------------------------------------------------------------------------------------


def _find_table(data: bytes, file: str, vocabulary: Vocabulary) -> tuple[list[Row], str, Layout]:
    """The first rows, the separator that shows most headings in them, and where the table stands."""
    for count in _HEAD_LINES:
        lines = _first_lines(data, count)
        best: tuple[list[Row], str, Layout] | None = None
        split: dict[str, list[Row]] = {}
        for separator in _SEPARATORS:
            if separator != "," and not any(separator in line for line in lines):
                continue
            rows = split[separator] = _split("\n".join(lines), separator, file)
            layout = find_layout(rows, vocabulary)
            if layout is not None and (best is None or len(layout.columns) > len(best[2].columns)):
                best = rows, separator, layout
        if best is not None:
            return best
        widest = max(split.values(), key=lambda rows: max((len(cells) for _, cells in rows), default=0))
        line, width = max(((line, len(cells)) for line, cells in widest), key=lambda w: w[1], default=(0, 0))
        if width > MAX_COLUMNS:
            refuse_width(file, width, line=line)
    return refuse_headings(file, widest, vocabulary)


def _first_lines(data: bytes, count: int) -> list[str]:
    end = 0
    for _ in range(count):
        end = data.find(b"\n", end) + 1
        if end == 0:
            end = len(data)
            break
        if end > _HEAD_BYTES:
            break
    # a file of one endless line is cut: it is refused all the same
    return data[: min(end, 8 * _HEAD_BYTES)].decode("utf-8", errors="replace").split("\n")


def _split(text: str, separator: str, file: str) -> list[Row]:
    reader = csv.reader(io.StringIO(text, newline="\n"), delimiter=separator, skipinitialspace=True)
    rows: list[Row] = []
    before = 0
    try:
        for cells in reader:
            rows.append((before + 1, cells))
            before = reader.line_num
    except csv.Error as problem:
        found = f"this line cannot be taken apart ({shown(problem)})"
        raise LogError(file, found, "expected delimited text", line=before + 1, column=1) from None
    return rows


def _take_notes(source: Source, head: Sequence[Row], layout: Layout) -> None:
    """Keep what stands above the table, and beside its headings."""
    for line, cells in head[: layout.heading]:
        texts = [str(cell) for cell in cells]
        if not any(text.strip(" #\t") for text in texts):
            continue
        pair = note_of(texts)
        if pair:
            source.note(*pair)
        else:
            source.ignore(f"line {line}", f'text above the table: "{shown(" ".join(texts))}"')
    table = layout.columns.keys() | layout.unread.keys()
    for _, cells in head[layout.heading : layout.heading + 1]:
        pair = note_of([str(cell) for index, cell in enumerate(cells) if index not in table])
        if pair:
            source.note(*pair)


# --- the quick way --------------------------------------------------------------------------------------------------


def _quick_tables(
    data: bytes, head: Sequence[Row], separator: str, layout: Layout, source: Source
) -> list[RawTable] | None:
    """The tables by pandas' C reader; None where anything in them wants a closer look."""
    if b"\n#" in data or set(range(layout.width)) != layout.columns.keys() | layout.unread.keys():
        return None  # comments among the data, or notes beside it
    line = head[layout.heading][0]
    start = _offset(data, line)
    heading = data[start : data.find(b"\n", start) + 1 or len(data)]
    first = _offset(data, head[layout.first][0]) if layout.first < len(head) else len(data)
    decimal = _head_decimal(head, layout)
    if decimal is None or first <= start or b'"' in heading and heading.count(b'"') % 2:
        return None
    tables: list[RawTable] = []
    stamps = _stamp_columns(head, layout)
    while True:
        again = data.find(b"\n" + heading, first - 1) + 1 if heading.endswith(b"\n") else 0
        last = again or len(data)
        body_line = line + data.count(b"\n", start, first)
        cut = _cut_tail(data, first, last, separator, layout, source if not again else None)
        if cut is None:
            return None
        table = _quick_table(data[first:cut], separator, decimal, layout, source, stamps=stamps, at=(line, body_line))
        if table is None:
            return None
        tables.append(table)
        if not again:
            return tables
        line = body_line + data.count(b"\n", first, again)
        source.ignore(f"line {line}", "the headings come again here: a new table begins")
        start, first = again, again + len(heading)


def _offset(data: bytes, line: int) -> int:
    """Where a line begins, counted from 1."""
    position = 0
    for _ in range(line - 1):
        position = data.find(b"\n", position) + 1
    return position


def _head_decimal(head: Sequence[Row], layout: Layout) -> str | None:
    """The decimal mark of the first rows; None where they do not settle it alone."""
    rows = head[layout.first :]
    if not any("," in cell for _, cells in rows for cell in cells if isinstance(cell, str)):
        return "."  # what is no number with a point goes the careful way
    lines = np.fromiter((line for line, _ in rows), np.int64, len(rows))
    columns = [
        (Place("", "", index + 1, lines), [cells[index] if index < len(cells) else "" for _, cells in rows])
        for index, heading in layout.columns.items()
        if heading.is_number
    ]
    try:
        decimal, thousands = settle_decimal(columns)
    except LogError:
        return None
    return None if thousands else decimal


def _stamp_columns(head: Sequence[Row], layout: Layout) -> list[int]:
    """Cell indices of times that are ISO stamps without a zone, by the first row."""
    _, cells = head[layout.first]
    times = [index for index, heading in layout.columns.items() if heading.quantity == "time" and index < len(cells)]
    return [index for index in times if _ISO.fullmatch(str(cells[index]).strip())]


def _cut_tail(data: bytes, first: int, last: int, separator: str, layout: Layout, source: Source | None) -> int | None:
    """Where the data end and notes below them begin; None where the end wants a closer look."""
    tail_start = max(first, data.rfind(b"\n", first, max(first, last - 4096)) + 1)
    lines = data[tail_start:last].split(b"\n")[-_TAIL_LINES:]
    mark = separator.encode()
    whole = True
    for line in reversed(lines):
        if not line.strip():
            continue
        cells = line.count(mark) + 1
        if cells >= layout.width and (whole or b'"' not in line):
            first_cell = line.split(mark)[layout.numbers[0]].decode("utf-8", errors="replace").strip().strip('"')
            return last if is_reading(first_cell) and whole else None
        whole = False
    return None if source is None or not whole else last


def _quick_table(
    body: bytes, separator: str, decimal: str, layout: Layout, source: Source, *, stamps: list[int], at: tuple[int, int]
) -> RawTable | None:
    """One table; `at` tells the lines of its headings and of its first row."""
    frame = _frame(body, separator, decimal, layout, stamps)
    if frame is None or not len(frame):
        return None
    lines = _line_numbers(body, len(frame), at[1])
    if lines is None:
        return None
    columns = []
    for index, heading in layout.columns.items():
        cells: Any = frame[index]
        if cells.dtype.kind in "fi":
            cells = cells.to_numpy(np.float64)
        elif cells.dtype.kind == "M":
            cells = cells.to_numpy("datetime64[us]")
        elif cells.dtype.kind in "bu":
            return None
        elif heading.is_number and heading.quantity != "time":
            cells = _clean_texts(cells, decimal)
            if cells is None:
                return None
        else:
            cells = cells.tolist()
        columns.append(RawColumn(heading, index + 1, layout.units.get(index, ""), cells))
    if not _all_rows_read(columns):
        return None
    return RawTable(source.file, "", source.file, at[0], tuple(columns), lines, decimal)


def _frame(body: bytes, separator: str, decimal: str, layout: Layout, stamps: list[int]) -> pd.DataFrame | None:
    """The rows as pandas reads them, ISO stamps without a zone as dates; None where a row does not fit."""
    import pandas as pd

    texts = {index: str for index, heading in layout.columns.items() if not heading.is_number}
    # one column more than there are headings: what stands in it has lost its heading
    extra = layout.width
    options: dict[str, Any] = {
        "sep": separator,
        "header": None,
        "names": list(range(extra + 1)),
        "index_col": False,
        "dtype": texts or None,
        "decimal": decimal,
        "engine": "c",
        "keep_default_na": False,
        "na_values": {index: list(MISSING) for index in [*layout.numbers, extra]},
        "skipinitialspace": True,
    }
    if _needs_precision(pd.__version__):
        options["float_precision"] = "round_trip"
    # each next one is slower and takes more: pieces may differ in kind, and stamps may be no stamps
    for more in ({"parse_dates": stamps, "date_format": "ISO8601"}, {}, {"low_memory": False}):
        if not stamps and "parse_dates" in more:
            continue
        try:
            frame: pd.DataFrame = _strictly(pd.read_csv, io.BytesIO(body), **options, **more)
        except (Warning, TypeError):
            continue
        except (ValueError, OverflowError, pd.errors.ParserError):
            return None
        if frame[extra].notna().any():
            return None
        if "low_memory" in more or _is_settled(frame, layout, more):
            return frame
    return None


def _is_settled(frame: pd.DataFrame, layout: Layout, options: dict[str, Any]) -> bool:
    """Whether every column is of one kind, and stamps became dates without a zone."""
    stamps = options.get("parse_dates", ())
    if any(frame[index].dtype.kind != "M" or getattr(frame[index].dtype, "tz", None) for index in stamps):
        return False
    return all(frame[index].dtype != object for index in layout.columns)


def _strictly(read: Any, *arguments: Any, **options: Any) -> Any:
    """Call the reader; that it leaves cells out, of which it only warns, is an error."""
    with warnings.catch_warnings():
        warnings.simplefilter("error")
        return read(*arguments, **options)


def _needs_precision(version: str) -> bool:
    """From pandas 3.1 on the default is exact, and asking for it warns."""
    return tuple(int(part) for part in version.split(".")[:2]) < (3, 1)


def _line_numbers(body: bytes, rows: int, first: int) -> NDArray[np.int64] | None:
    """The file's line of every row; None where rows and lines cannot be matched."""
    ends = body.count(b"\n") + (not body.endswith(b"\n"))
    if ends == rows:
        return np.arange(first, first + rows, dtype=np.int64)
    filled = np.array([bool(line.strip()) for line in body.split(b"\n")])
    numbers = np.flatnonzero(filled) + first
    return numbers.astype(np.int64) if len(numbers) == rows else None


def _clean_texts(cells: pd.Series[Any], decimal: str) -> list[object] | None:
    """Texts under a numeric heading, where each can only be read in one way; else None."""
    other = "," if decimal == "." else "."
    for text in cells.unique():
        if isinstance(text, str) and (not is_reading(text) or other in text or text.count(decimal) > 1):
            return None
        if not isinstance(text, (str, float)):
            return None
    return [text if isinstance(text, str) else None for text in cells.tolist()]


def _all_rows_read(columns: Sequence[RawColumn]) -> bool:
    """Whether every row has a reading; else a note may stand among the rows."""
    numbers = [column for column in columns if column.heading.is_number]
    arrays = [column.cells for column in numbers if isinstance(column.cells, np.ndarray)]
    if not arrays:
        return False
    empty = np.isnan(arrays[0])
    if not empty.any():
        return True
    for cells in arrays[1:]:
        empty = empty & np.isnan(cells)
    suspects = np.flatnonzero(np.isnan(arrays[0]))
    if empty.any():
        return False
    # a remark such as "count; 200" has a number in it: its first cell is a word
    texts = [column.cells for column in numbers if not isinstance(column.cells, np.ndarray)]
    return all(is_reading(cells[row]) or cells[row] is None for cells in texts for row in suspects.tolist())


# --- the careful way ------------------------------------------------------------------------------------------------


def _drop_cut_line(tables: list[RawTable], data: bytes, rows: Sequence[Row], layout: Layout, source: Source) -> None:
    """Leave out a last line that ends before its last cell: its last number may be cut too."""
    if data.endswith(b"\n") or not tables or not rows:
        return
    line, cells = rows[-1]
    table = tables[-1]
    if len(cells) >= layout.width or line != table.lines[-1] or len(table.lines) < 2:
        return
    columns = [RawColumn(c.heading, c.position, c.unit_below, c.cells[:-1]) for c in table.columns]
    tables[-1] = replace(table, columns=tuple(columns), lines=table.lines[:-1])
    source.ignore(f"line {line}", "the file ends within this line: it was left out")
