"""What the first lines of a very long log tell of all the others."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Any

from acceptance.bench.digits import sampled_cells, written_decimals
from acceptance.bench.headings import Vocabulary
from acceptance.bench.quick import head_decimal, line_start, reader_options
from acceptance.bench.rows import numbers_below
from acceptance.bench.stamps import Form, form_of
from acceptance.bench.table import Layout, Row, Source
from acceptance.bench.text import find_table, refuse_binary, take_notes
from acceptance.bench.values import MISSING

__all__ = ["MARK", "Outline", "Start", "outline_of"]

MARK = b"\xef\xbb\xbf"


@dataclass(frozen=True, slots=True)
class Outline:
    """How the rows of a log are to be taken apart."""

    separator: str
    decimal: str
    layout: Layout
    stamp: int | None  # cell index of the times that are no plain numbers
    day: int | None  # cell index of the dates beside clocks
    forms: dict[int, Form]  # how those times and dates are written
    heading: bytes  # the heading line
    encoding: str
    options: dict[str, Any]  # for pandas' C reader
    decimals: dict[int, int]  # cell index -> digits behind the mark in the first rows
    times: frozenset[int]  # cell indices of times in numbers
    has_gaps: bool  # whether readings are missing in the first rows already
    has_more_numbers: bool  # whether numbers are expected in columns that are not read
    is_for_plain: bool  # whether a single odd line leaves the log to the readers that take it whole


@dataclass(frozen=True, slots=True)
class Start:
    """What stands above the rows, and where they begin."""

    outline: Outline
    rows: list[Row]  # the first ones, headings and notes among them
    source: Source  # with its notes
    first: int  # bytes before the first row

    @property
    def line(self) -> int:
        """The line of the first row."""
        return self.rows[self.outline.layout.first][0]


def outline_of(lines: bytes, file: str, vocabulary: Vocabulary, *, encoding: str = "") -> Start | None:
    """The outline by a log's first lines, which are whole; None where the log must be read as a whole.

    Parameters
    ----------
    encoding
        What the lines were in before they became UTF-8; empty where they are as they stand in the file.

    Raises
    ------
    LogError
        If this is no text, or no table is found in it.
    """
    data, encoding = (lines, encoding) if encoding else _decoded(lines)
    refuse_binary(data, file)
    if b"\r" in data:
        data = data.replace(b"\r\n", b"\n")
    rows, separator, layout = find_table(data, file, vocabulary)
    source = Source(file)
    take_notes(source, rows, layout)
    decimal = head_decimal(rows, layout)
    whole = set(range(layout.width)) == layout.columns.keys() | layout.unread.keys()
    if decimal is None or not whole or layout.first >= len(rows) or b"\r" in data:
        return None
    times = _times(rows, layout)
    if times is None:
        return None
    stamp, day, forms = times
    line = rows[layout.heading][0], rows[layout.first][0]
    start = line_start(data, line[0])
    heading = data[start : data.find(b"\n", start) + 1]
    if b'"' in heading and heading.count(b'"') % 2 or line_start(data, line[1]) <= start:
        return None
    # a row is found by counting lines, which no encoding and no ending of lines changes
    mark = len(MARK) if lines.startswith(MARK) else 0
    first = mark + line_start(lines[mark:], line[1])
    numbers = frozenset(i for i, h in layout.columns.items() if h.quantity == "time" and i not in forms)
    outline = Outline(
        separator,
        decimal,
        layout,
        stamp,
        day,
        forms,
        heading.replace(b'"', b""),
        encoding,
        reader_options(separator, decimal, layout),
        _decimals(data[line_start(data, line[1]) :][:100_000], separator, layout.width),
        numbers,
        _has_gaps(rows, layout),
        numbers_below(rows, layout) != frozenset(layout.numbers),
        _is_for_plain(rows, layout, decimal, forms),
    )
    return Start(outline, rows, source, first)


def _times(rows: Sequence[Row], layout: Layout) -> tuple[int | None, int | None, dict[int, Form]] | None:
    """The column of times, that of dates beside it, and their forms, by the first row; None where others must tell."""
    _, cells = rows[layout.first]
    times = {i: heading for i, heading in layout.columns.items() if heading.quantity == "time"}
    found = {i: form_of(str(cells[i]).strip()) for i in times if i < len(cells)}
    forms = {i: form for i, form in found.items() if form is not None}
    kinds = {form.kind: i for i, form in forms.items()}
    if kinds.keys() == {"date", "clock"} and len(times) == 2:
        is_beside = times[kinds["date"]].is_date and not times[kinds["clock"]].is_date
        return (kinds["clock"], kinds["date"], forms) if is_beside else None
    if len(forms) > 1 or "date" in kinds:
        return None
    if "clock" in kinds and len(times) > 1:
        return None
    return next(iter(forms), None), None, forms


def _is_for_plain(rows: Sequence[Row], layout: Layout, decimal: str, forms: dict[int, Form]) -> bool:
    """Whether the careful way may see a plain log with an odd line in it otherwise.

    It tells the decimal mark without the times, and joins dates with whatever times stand beside them.
    """
    times = [i for i, heading in layout.columns.items() if heading.quantity == "time"]
    if len(times) > 1 and len(forms) != len(times):
        return True
    if decimal == ".":
        return False
    others = {i: heading for i, heading in layout.columns.items() if i not in times}
    without = Layout(
        layout.heading, layout.first, others, layout.unread, layout.units, layout.width, layout.cells, layout.numbers
    )
    cells = [(line, [cell for i, cell in enumerate(row) if i in others]) for line, row in rows[layout.first :]]
    has_comma = any("," in str(cell) for _, row in cells for cell in row)
    return not has_comma or head_decimal(rows, without) != decimal


def _has_gaps(rows: Sequence[Row], layout: Layout) -> bool:
    return any(
        str(cells[i]).strip() in MISSING for _, cells in rows[layout.first :] for i in layout.numbers if i < len(cells)
    )


def _decoded(lines: bytes) -> tuple[bytes, str]:
    """The first lines in UTF-8, and what they were in."""
    if lines.startswith(MARK):
        return lines[len(MARK) :].decode("utf-8", "replace").encode(), "UTF-8 with mark"
    if lines.isascii():
        return lines, "ASCII"
    try:
        lines.decode("utf-8")
    except UnicodeDecodeError:
        return lines.decode("cp1252", errors="replace").encode(), "Latin-1"
    return lines, "UTF-8"


def _decimals(body: bytes, separator: str, width: int) -> dict[int, int]:
    written = sampled_cells(body, separator, width)
    return {index: written_decimals(cells) or 0 for index, cells in enumerate(written)}
