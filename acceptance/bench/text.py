"""Delimited text -> `Source`: encoding, separator, decimal mark, notes, repeated headings, blank lines.

The quick way gives the lines between two heading rows to pandas' C reader, once the separator and the decimal
mark are told from the first lines. Whatever that cannot take whole goes the careful way, cell by cell, which
knows the place of every fault. Both give the same numbers.
"""

from __future__ import annotations

import csv
import io
from collections.abc import Sequence
from dataclasses import dataclass, replace
from typing import TYPE_CHECKING

import numpy as np

from acceptance.bench.headings import Vocabulary, shown
from acceptance.bench.quick import quick_tables
from acceptance.bench.rows import tables_of
from acceptance.bench.table import (
    MAX_COLUMNS,
    Layout,
    RawTable,
    Row,
    Source,
    find_layout,
    note_of,
    refuse_headings,
    refuse_width,
    settle,
)
from acceptance.errors import LogError

if TYPE_CHECKING:
    pass

__all__ = ["SEPARATORS", "describe_source", "find_table", "read_text", "refuse_binary", "take_notes", "wide_encoding"]

SEPARATORS = {";": "semicolons", "\t": "tabs", "|": "bars", ",": "commas"}
_HEAD_LINES = (32, 600)  # notes longer than this are prose
_HEAD_BYTES = 1 << 20


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
    head, separator, layout = find_table(text.data, file, vocabulary)
    source = Source(file)
    take_notes(source, head, layout)
    tables = quick_tables(text.data, head, separator, layout, source)
    if tables is None:
        # the careful way meets the notes below the table anew
        source = Source(file)
        take_notes(source, head, layout)
        rows = _split(text.data.decode(), separator, file)
        tables = tables_of(rows, layout, source, name=file, strict_width=True)
        _drop_cut_line(tables, text.data, rows, layout, source)
        tables = settle(tables)
    return describe_source(source, tables, layout, f"{SEPARATORS[separator]}, {{}}, {text.encoding}")


def describe_source(source: Source, tables: Sequence[RawTable], layout: Layout, dialect: str) -> Source:
    """The source with its tables, the columns that were not read, and its dialect, `{}` being the decimal mark."""
    source.tables = [table for table in tables if len(table.lines)]
    if not source.tables:
        found = "the headings have no readings under them"
        raise LogError(source.file, found, "expected one row of numbers for each sample")
    for heading in layout.unread.values():
        if heading.text.strip():
            source.ignore(f'column "{shown(heading.text)}"', heading.reason)
    source.dialect = dialect.format("decimal comma" if source.tables[0].decimal == "," else "decimal point")
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
    refuse_binary(data, file)
    if b"\r" in data:
        data = data.replace(b"\r\n", b"\n").replace(b"\r", b"\n")
    return _Text(data, encoding)


def _by_mark(raw: bytes, file: str) -> tuple[str | None, str]:
    """Text whose byte-order mark, or whose every second byte, tells the encoding."""
    try:
        if raw.startswith(b"\xef\xbb\xbf"):
            return raw[3:].decode("utf-8"), "UTF-8 with mark"
        codec, encoding = wide_encoding(raw)
        if codec:
            return raw.decode(codec), encoding
    except UnicodeDecodeError as problem:
        found = f"the text is not the {problem.encoding.upper()} that its first bytes say (byte {problem.start})"
        raise LogError(file, found, "the file may be cut short; copy it again") from None
    return None, ""


def wide_encoding(raw: bytes) -> tuple[str, str]:
    """The codec of text with two bytes a character, and its name in the record; empty where it is another."""
    if raw.startswith((b"\xff\xfe", b"\xfe\xff")):
        return "utf-16", "UTF-16 with mark"
    sample = raw[:4000]
    if len(sample) > 3 and sample.count(0) > len(sample) // 3:
        low, high = sample[1::2].count(0), sample[::2].count(0)
        if low > 0.9 * (len(sample) // 2) and not high:
            return "utf-16-le", "UTF-16"
        if high > 0.9 * (len(sample) // 2) and not low:
            return "utf-16-be", "UTF-16"
    return "", ""


def refuse_binary(data: bytes, file: str) -> None:
    sample = data[: 1 << 16]
    controls = sum(sample.count(code) for code in (*range(1, 9), 11, *range(14, 32), 127))
    if b"\x00" in data or controls * 50 > len(sample):
        raise LogError(file, "this is no text and no workbook", "expected delimited text or an .xlsx workbook")


# --- where the table is ---------------------------------------------------------------------------------------------


def find_table(data: bytes, file: str, vocabulary: Vocabulary) -> tuple[list[Row], str, Layout]:
    """The first rows, the separator that shows most headings in them, and where the table stands."""
    for count in _HEAD_LINES:
        lines = _first_lines(data, count)
        best: tuple[list[Row], str, Layout] | None = None
        split: dict[str, list[Row]] = {}
        for separator in SEPARATORS:
            if separator != "," and not any(separator in line for line in lines):
                continue
            rows = split[separator] = _split("\n".join(lines), separator, file)
            layout = find_layout(rows, vocabulary)
            if layout is not None and (best is None or layout.rank > best[2].rank):
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


def take_notes(source: Source, head: Sequence[Row], layout: Layout) -> None:
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


# --- the careful way ------------------------------------------------------------------------------------------------


def _drop_cut_line(tables: list[RawTable], data: bytes, rows: Sequence[Row], layout: Layout, source: Source) -> None:
    """Leave out a last line that ends before its last cell: its last number may be cut too."""
    if data.endswith(b"\n") or not tables or not rows:
        return
    line, cells = rows[-1]
    table = tables[-1]
    if len(cells) >= layout.width or line != table.lines[-1] or len(table.lines) < 2:
        return
    columns = [replace(c, cells=c.cells[:-1]) for c in table.columns if isinstance(c.cells, (Sequence, np.ndarray))]
    lines = np.asarray(table.lines, dtype=np.int64)[:-1]
    tables[-1] = replace(table, columns=tuple(columns), lines=lines)
    source.ignore(f"line {line}", "the file ends within this line: it was left out")
