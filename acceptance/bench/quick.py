"""The quick way down a log's rows: pandas' C reader, for what can be taken whole.

It gives the same numbers as the careful way, and None wherever anything wants a closer look.
"""

from __future__ import annotations

import io
import re
import warnings
from collections.abc import Sequence
from typing import TYPE_CHECKING, Any

import numpy as np
from numpy.typing import NDArray

from acceptance.bench.digits import sampled_cells, written_decimals
from acceptance.bench.rows import is_summary_word
from acceptance.bench.table import Layout, RawColumn, RawTable, Row, Source
from acceptance.bench.values import MISSING, Place, is_reading, settle_decimal
from acceptance.errors import LogError

if TYPE_CHECKING:
    import pandas as pd

__all__ = [
    "clean_texts",
    "cut_tail",
    "has_summary",
    "head_decimal",
    "line_start",
    "quick_tables",
    "reader_options",
]

_TAIL_LINES = 40
_ISO = re.compile(r"\d{4}-\d{2}-\d{2}[T ]\d{2}:\d{2}(:\d{2}(\.\d{1,6})?)?")


def quick_tables(
    data: bytes, head: Sequence[Row], separator: str, layout: Layout, source: Source
) -> list[RawTable] | None:
    """The tables by pandas' C reader; None where anything in them wants a closer look."""
    if b"\n#" in data or set(range(layout.width)) != layout.columns.keys() | layout.unread.keys():
        return None  # comments among the data, or notes beside it
    line = head[layout.heading][0]
    start = line_start(data, line)
    heading = data[start : data.find(b"\n", start) + 1 or len(data)]
    first = line_start(data, head[layout.first][0]) if layout.first < len(head) else len(data)
    decimal = head_decimal(head, layout)
    if decimal is None or first <= start or b'"' in heading and heading.count(b'"') % 2:
        return None
    tables: list[RawTable] = []
    stamps = _stamp_columns(head, layout)
    while True:
        again = data.find(b"\n" + heading, first - 1) + 1 if heading.endswith(b"\n") else 0
        last = again or len(data)
        body_line = line + data.count(b"\n", start, first)
        cut = cut_tail(data, first, last, separator, layout, source if not again else None)
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


def line_start(data: bytes, line: int) -> int:
    """Where a line begins, counted from 1."""
    position = 0
    for _ in range(line - 1):
        position = data.find(b"\n", position) + 1
    return position


def head_decimal(head: Sequence[Row], layout: Layout) -> str | None:
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


def cut_tail(data: bytes, first: int, last: int, separator: str, layout: Layout, source: Source | None) -> int | None:
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
    if any(has_summary(frame[index]) for index in layout.unread):
        return None
    columns = []
    written = sampled_cells(body, separator, layout.width)
    for index, heading in layout.columns.items():
        cells: Any = frame[index]
        if cells.dtype.kind in "fi":
            cells = cells.to_numpy(np.float64)
        elif cells.dtype.kind == "M":
            cells = cells.to_numpy("datetime64[us]")
        elif cells.dtype.kind in "bu":
            return None
        elif heading.is_number and heading.quantity != "time":
            cells = clean_texts(cells, decimal)
            if cells is None:
                return None
        else:
            cells = cells.tolist()
        columns.append(
            RawColumn(heading, index + 1, layout.units.get(index, ""), cells, written_decimals(written[index]))
        )
    if not _all_rows_read(columns):
        return None
    return RawTable(source.file, "", source.file, at[0], tuple(columns), lines, decimal)


def _frame(body: bytes, separator: str, decimal: str, layout: Layout, stamps: list[int]) -> pd.DataFrame | None:
    """The rows as pandas reads them, ISO stamps without a zone as dates; None where a row does not fit."""
    import pandas as pd

    # one column more than there are headings: what stands in it has lost its heading
    extra = layout.width
    texts = {index: str for index, heading in layout.columns.items() if not heading.is_number}
    options = {**reader_options(separator, decimal, layout), "names": list(range(extra + 1)), "dtype": texts or None}
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


def reader_options(separator: str, decimal: str, layout: Layout) -> dict[str, Any]:
    """How pandas' C reader is to take rows without headings apart."""
    import pandas as pd

    options: dict[str, Any] = {
        "sep": separator,
        "header": None,
        "index_col": False,
        "decimal": decimal,
        "engine": "c",
        "keep_default_na": False,
        "na_values": {index: list(MISSING) for index in [*layout.numbers, layout.width]},
        "skipinitialspace": True,
    }
    if _needs_precision(pd.__version__):
        options["float_precision"] = "round_trip"
    return options


def has_summary(cells: pd.Series[Any]) -> bool:
    """Whether "average" or its like stands in a column that is not read: its row may be no sample."""
    if cells.dtype.kind in "fiubM":
        return False
    return any(isinstance(cell, str) and is_summary_word(cell) for cell in cells.unique())


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


def clean_texts(cells: pd.Series[Any], decimal: str) -> list[object] | None:
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
    texts = [column.cells for column in numbers if isinstance(column.cells, Sequence)]
    return all(is_reading(cells[row]) or cells[row] is None for cells in texts for row in suspects.tolist())
