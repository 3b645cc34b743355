"""Workbooks -> `Source`: the table anywhere on any sheet, notes beside or above it, several sheets as stages."""

from __future__ import annotations

import gc
import io
import warnings
import zipfile
from collections.abc import Iterator, Sequence
from contextlib import contextmanager
from dataclasses import replace
from itertools import groupby
from typing import Any

from acceptance.bench.headings import Vocabulary, shown
from acceptance.bench.log import Doubt
from acceptance.bench.packed import Packed
from acceptance.bench.rows import tables_of
from acceptance.bench.stamps import Stamps
from acceptance.bench.table import (
    IDENTITY_NOTES,
    MAX_COLUMNS,
    Layout,
    RawColumn,
    RawTable,
    Row,
    Source,
    cell_text,
    find_layout,
    is_blank,
    note_of,
    refuse_headings,
    refuse_width,
    settle,
)
from acceptance.bench.values import Worded
from acceptance.errors import LogError

__all__ = ["is_workbook", "read_workbook"]

_MIB = 1 << 20
MAX_UNPACKED = 1024 * _MIB
MAX_RATIO = 200  # of a file that unpacks to more than 100 MiB; real logs shrink five- to fifteenfold
MAX_TEXTS = 256 * _MIB  # shared texts and styles are held in memory whole
MAX_CELLS = 50_000_000
MAX_EMPTY_ROWS = 100_000  # in a row, below or above a table
_HEAD_ROWS = 400
_COVER_ROWS = 60  # what is longer is a list, and no cover
_UNUSED = ("output_power",)  # a check forms it from volts and amperes
_FORMULA = "formula without a stored value: open the workbook in a spreadsheet program, save it, try again"


def is_workbook(raw: bytes) -> bool:
    """Whether these bytes are a workbook's (or claim to be): a zip, or the older kind."""
    return raw.startswith((b"PK\x03\x04", b"PK\x05\x06", b"\xd0\xcf\x11\xe0\xa1\xb1\x1a\xe1"))


def read_workbook(raw: bytes, file: str, vocabulary: Vocabulary) -> Source:
    """The tables and notes of every visible sheet of a workbook; what is left out is said.

    A sheet without a table gives its notes alone; a hidden one gives nothing.

    Raises
    ------
    LogError
        If it cannot be opened, unpacks to far more than a log, or no sheet holds a table of readings.
    """
    _refuse_container(raw, file)
    source = Source(file)
    tried: list[tuple[str, list[Row]]] = []
    hidden: list[str] = []
    with _opened(raw, file) as (book, charts):
        for sheet in book.worksheets:
            if getattr(sheet, "sheet_state", "visible") != "visible":
                hidden.append(sheet.title)
                reason = "it is hidden; make it visible if it belongs to the test"
                source.ignore(f'sheet "{shown(sheet.title)}"', reason)
                continue
            with _rarely_collected():
                rows, layout = _read_sheet(sheet, file, vocabulary)
            if layout is None:
                tried.append((sheet.title, rows[:_HEAD_ROWS]))
                noted = _take_cover(source, rows[:_COVER_ROWS])
                reason = "no table of readings on it" + ("; its notes are kept" if noted else "")
                source.ignore(f'sheet "{shown(sheet.title)}"', reason)
                continue
            _take_sheet(source, sheet, rows, layout)
        for title in charts:
            source.ignore(f'sheet "{shown(title)}"', "a sheet of charts only")
    if not source.tables:
        _refuse_sheets(raw, file, tried, hidden, vocabulary)
    _settle_formulas(raw, source)
    source.tables = settle(source.tables)
    listed = ", ".join(f'"{shown(name, 31)}"' for name in dict.fromkeys(table.sheet for table in source.tables))
    source.dialect = f"workbook, {'sheets' if ',' in listed else 'sheet'} {listed}"
    return source


# --- opening --------------------------------------------------------------------------------------------------------


def _refuse_container(raw: bytes, file: str) -> None:
    if raw.startswith(b"\xd0\xcf\x11\xe0"):
        found = "this is an old workbook (.xls) or one with a password"
        raise LogError(file, found, "save it as .xlsx without a password")
    try:
        with zipfile.ZipFile(io.BytesIO(raw)) as archive:
            entries = archive.infolist()
            _refuse_bomb(entries, len(raw), file)
            if not any(entry.filename.startswith("xl/") for entry in entries):
                raise LogError(file, "this archive is no .xlsx workbook", "save the log as .xlsx or as delimited text")
            _refuse_doctypes(archive, entries, file)
    except LogError:
        raise
    except Exception:  # a damaged archive ends in zlib's, struct's or zipfile's own errors
        found = "the workbook is cut short or damaged"
        raise LogError(file, found, "copy it again, or save it anew in a spreadsheet program") from None


def _refuse_bomb(entries: Sequence[zipfile.ZipInfo], packed: int, file: str) -> None:
    total = sum(entry.file_size for entry in entries)
    texts = sum(entry.file_size for entry in entries if not entry.filename.startswith("xl/worksheets/"))
    if total > MAX_UNPACKED or (total > 100 * _MIB and total > MAX_RATIO * packed) or texts > MAX_TEXTS:
        found = f"the workbook unpacks to {total / _MIB:.0f} MiB from {max(packed, 1) / _MIB:.2g} MiB"
        raise LogError(file, found, "expected a log; export it as delimited text")


def _refuse_doctypes(archive: zipfile.ZipFile, entries: Sequence[zipfile.ZipInfo], file: str) -> None:
    """No part of a workbook declares a document type; one that does is out to expand entities."""
    for entry in entries:
        if entry.filename.endswith((".xml", ".rels")):
            with archive.open(entry) as part:
                start = part.read(2048).replace(b"\x00", b"")
            if b"<!DOCTYPE" in start or b"<!ENTITY" in start:
                raise LogError(file, "the workbook declares a document type", "save it anew in a spreadsheet program")


@contextmanager
def _opened(raw: bytes, file: str, *, values: bool = True) -> Iterator[Any]:
    """The workbook in read-only mode; anything that goes wrong inside it is a LogError."""
    from openpyxl.reader.excel import ExcelReader

    with warnings.catch_warnings():
        warnings.simplefilter("ignore")  # styles and validations that are not read here
        try:
            reader: Any = ExcelReader(io.BytesIO(raw), read_only=True, data_only=values, keep_links=False)
            charts: list[str] = []
            # a sheet of charts is not opened: an odd chart must not lose the log beside it
            reader.read_chartsheet = lambda sheet, _: charts.append(sheet.name)
            reader.read()
            try:
                yield reader.wb, charts
            finally:
                reader.wb.close()
        except (LogError, KeyboardInterrupt, MemoryError):
            raise
        except Exception as problem:
            # a damaged part may end in any exception of the readers underneath
            found = f"the workbook cannot be read ({type(problem).__name__}: {shown(problem, 80)})"
            raise LogError(file, found, "save it anew in a spreadsheet program") from None


# --- sheets ---------------------------------------------------------------------------------------------------------


@contextmanager
def _rarely_collected() -> Iterator[None]:
    """Look for garbage rarely: a million cells are kept on purpose, and to look through them costs a tenth."""
    kept = gc.get_threshold()
    gc.set_threshold(1_000_000, 50, 1000)
    try:
        yield
    finally:
        gc.set_threshold(*kept)


def _read_sheet(sheet: Any, file: str, vocabulary: Vocabulary) -> tuple[list[Row], Layout | None]:
    """All rows of a sheet that has a table within its first rows; else the first rows, and None."""
    if not hasattr(sheet, "reset_dimensions"):
        return [], None
    sheet.reset_dimensions()  # the size that a sheet claims may be anything
    rows: list[Row] = []
    append = rows.append
    layout: Layout | None = None
    empty, cells_read = 0, 0
    for number, cells in enumerate(sheet.iter_rows(values_only=True), start=1):
        if not cells or (cells[0] is None and not any(cell is not None for cell in cells)):
            empty += 1
            if empty > MAX_EMPTY_ROWS:
                break
            continue
        empty = 0
        width = len(cells)
        if width > MAX_COLUMNS:
            refuse_width(f'{file}, sheet "{shown(sheet.title)}"', width, line=0)
        cells_read += width
        if cells_read > MAX_CELLS:
            raise LogError(file, f"more than {MAX_CELLS} cells stand in the workbook", "export it as delimited text")
        append((number, cells))
        if len(rows) == _HEAD_ROWS:
            layout = find_layout(rows, vocabulary)
            if layout is None:
                return rows, None
    if layout is None:
        layout = find_layout(rows[:_HEAD_ROWS], vocabulary)
    return rows, layout


def _take_sheet(source: Source, sheet: Any, rows: list[Row], layout: Layout) -> None:
    name = f'{source.file}, sheet "{shown(sheet.title)}"'
    for _, cells in rows[: layout.heading]:
        _side_pairs(source, cells, frozenset())
    _side_pairs(source, rows[layout.heading][1], frozenset(layout.columns) | frozenset(layout.unread))
    source.tables += tables_of(rows, layout, source, name=name, sheet=sheet.title)
    for heading in layout.unread.values():
        if heading.text.strip():
            source.ignore(f'column "{shown(heading.text)}"', heading.reason, file=name)


def _side_pairs(source: Source, cells: Sequence[object], table: frozenset[int]) -> None:
    """Notes in a row, outside the table's columns: a key with its value at its right, or both in one cell."""
    texts = [cell_text(cell) for i, cell in enumerate(cells) if i not in table and cell is not None]
    pair = note_of(texts) if texts else None
    if pair:
        source.note(*pair)


def _take_cover(source: Source, rows: Sequence[Row]) -> bool:
    """Keep the notes of a sheet without a table, such as a cover; whether there is one."""
    noted = False
    for _, cells in rows:
        for pair in _pairs(["" if is_blank(cell) else cell_text(cell) for cell in cells]):
            source.note(*pair)
            noted = True
    return noted


def _pairs(texts: Sequence[str]) -> Iterator[tuple[str, str]]:
    """Keys and values in a row: two cells, or runs of neighbours of which each is one note, or "key:", value, ...

    A row of three words or more is a row of some other table, unless it tells the serial or the date.
    """
    runs = [list(run) for is_filled, run in groupby(texts, key=bool) if is_filled]
    if len(runs) == 2 and all(len(run) == 1 and not note_of(run) for run in runs):
        runs = [runs[0] + runs[1]]  # the value stands behind an empty or merged cell
    for run in runs:
        if len(run) > 2 and len(run) % 2 == 0 and all(key.endswith((":", "=")) for key in run[::2]):
            yield from filter(None, map(note_of, zip(run[::2], run[1::2], strict=True)))
            continue
        pair = note_of(run)
        if pair and (len(run) < 3 or pair[0] in IDENTITY_NOTES):
            yield pair


def _refuse_sheets(
    raw: bytes, file: str, tried: Sequence[tuple[str, list[Row]]], hidden: Sequence[str], vocabulary: Vocabulary
) -> None:
    filled = [(title, rows) for title, rows in tried if rows]
    if not filled and not hidden:
        raise LogError(file, "the workbook is empty", "expected a sheet with headings and readings")
    with _opened(raw, file, values=False) as (book, _):
        for name, kept in filled:
            cells = book[name].iter_rows(min_row=kept[0][0], max_row=kept[-1][0] + 50, max_col=40, values_only=True)
            if any(isinstance(cell, str) and cell.startswith("=") for row in cells for cell in row):
                raise LogError(file, f'sheet "{shown(name)}" holds a {_FORMULA}')
    if hidden:
        listed = ", ".join(f'"{shown(name, 31)}"' for name in hidden[:6])
        found = f"no sheet that can be seen holds a table of readings; hidden: {listed}"
        raise LogError(file, found, "make the sheet visible if it belongs to the test")
    title, rows = filled[0]
    refuse_headings(f'{file}, sheet "{shown(title)}"' if len(filled) > 1 else file, rows, vocabulary)


# --- formulas -------------------------------------------------------------------------------------------------------


def _settle_formulas(raw: bytes, source: Source) -> None:
    """A column without one value may hold formulas that no program has worked out yet.

    One that is needed is refused; one that nothing uses is left out, and said.
    """
    empty = [
        (number, column)
        for number, table in enumerate(source.tables)
        for column in table.columns
        if not isinstance(column.cells, (Packed, Worded, Stamps))
        and all(cell is None or cell != cell for cell in column.cells)
    ]
    if not empty:
        return
    with _opened(raw, source.file, values=False) as (book, _):
        for number, column in empty:
            table = source.tables[number]
            if not _is_formula(book[table.sheet], table, column.position):
                continue
            if column.heading.quantity not in _UNUSED or column.heading.is_chosen:
                found = f'sheet "{shown(table.sheet)}": the column "{shown(column.heading.text)}" holds a {_FORMULA}'
                raise LogError(source.file, found, line=int(table.lines[0]), column=column.position)
            source.tables[number] = replace(table, columns=tuple(c for c in table.columns if c is not column))
            _say_formula(source, table, column)


def _say_formula(source: Source, table: RawTable, column: RawColumn) -> None:
    heading = shown(column.heading.text)
    source.ignore(f'column "{heading}"', f"it holds a {_FORMULA}", file=table.name)
    text = f'{table.name}: the column "{heading}" holds formulas without stored values, and is left out'
    doubt = Doubt("formula", text, remedy="open the workbook in a spreadsheet program, and save it")
    if doubt not in source.doubts:
        source.doubts.append(doubt)


def _is_formula(sheet: Any, table: RawTable, position: int) -> bool:
    row = int(table.lines[0])
    cells = sheet.iter_rows(min_row=row, max_row=row, min_col=position, max_col=position, values_only=True)
    return any(isinstance(cell, str) and cell.startswith("=") for found in cells for cell in found)
