"""The table inside a file: its heading row, its unit row, its data rows, and the notes around it.

Both readers hand rows of cells here; after this a log is a `RawTable`, whatever file it came from.
"""

from __future__ import annotations

import re
from collections.abc import Iterable, Sequence
from dataclasses import dataclass, field, replace
from typing import TYPE_CHECKING, NoReturn

import numpy as np
from numpy.typing import NDArray

from acceptance.bench.headings import Heading, Vocabulary, resolve_unit, shown
from acceptance.bench.log import Ignored
from acceptance.bench.values import Place, is_reading, settle_decimal
from acceptance.errors import LogError

if TYPE_CHECKING:
    from acceptance.bench.values import Cells

__all__ = [
    "MAX_COLUMNS",
    "Layout",
    "RawColumn",
    "RawTable",
    "Row",
    "Source",
    "find_layout",
    "note_of",
    "refuse_headings",
    "refuse_width",
    "settle",
    "tables_of",
]

_SIDE_ROWS = 400  # notes beside a table stand beside its first rows
MAX_COLUMNS = 2000  # a bench log has tens; beyond this a file is something else
_DASHES = re.compile(r":?-{2,}:?")
_CLOCK_FORM = re.compile(r"[hmsydtf:./\- ]+", re.IGNORECASE)  # hh:mm:ss, dd.mm.yyyy
_KEY = re.compile(r"[^\W\d_][\w ./()-]{0,39}")

Row = tuple[int, Sequence[object]]  # line of the file from 1, cells


@dataclass(frozen=True, slots=True)
class RawColumn:
    """One understood column, its cells still as they stand in the file."""

    heading: Heading
    position: int  # from 1, in the file
    unit_below: str  # from the row under the heading, "" where there is none
    cells: Cells  # one a row


@dataclass(frozen=True, slots=True)
class RawTable:
    """The rows between one heading row and the next, or the end."""

    file: str
    sheet: str  # "" in delimited text
    name: str  # 'A-17.csv', 'A-17.xlsx, sheet "steady"'
    heading_line: int
    columns: tuple[RawColumn, ...]
    lines: NDArray[np.int64]  # of each row, from 1
    decimal: str = "."  # decimal mark of the numbers that stand as text
    thousands: bool = False  # whether the other mark groups their thousands

    def place(self, column: RawColumn) -> Place:
        """Where a column stands, for a fault's text."""
        return Place(self.file, column.heading.text, column.position, self.lines, self.sheet)


@dataclass(slots=True)
class Source:
    """What one file holds, before its numbers are read."""

    file: str
    dialect: str = ""
    tables: list[RawTable] = field(default_factory=list)
    notes: dict[str, str] = field(default_factory=dict)
    ignored: list[Ignored] = field(default_factory=list)

    def note(self, key: str, value: str) -> None:
        """Keep a note; of two with one key the first stays, the other is kept beside it."""
        if key in self.notes and self.notes[key] != value:
            value = f"{self.notes[key]}; {value}"
        self.notes[key] = value

    def ignore(self, what: str, reason: str, *, file: str = "") -> None:
        """Say that a part of the file was left out."""
        self.ignored.append(Ignored(file or self.file, what, reason))


@dataclass(frozen=True, slots=True)
class Layout:
    """Where the table stands among the rows given."""

    heading: int  # index of the heading row
    first: int  # index of the first row after headings and units
    columns: dict[int, Heading]  # cell index -> meaning, understood ones only
    unread: dict[int, Heading]  # cell index -> heading that was not understood
    units: dict[int, str]  # cell index -> unit from the row below
    width: int  # cells of the heading row up to its last heading
    cells: tuple[str, ...]  # the heading row as written
    numbers: tuple[int, ...]  # cell indices of the columns that hold readings or times


def is_blank(cell: object) -> bool:
    """Whether nothing stands in a cell."""
    return cell is None or (isinstance(cell, str) and not cell.strip())


def find_layout(rows: Sequence[Row], vocabulary: Vocabulary) -> Layout | None:
    """The row with most understood headings that has readings under it, or None.

    Of two alike the upper one is taken. A note such as "serial; A-17" is no heading row: no reading stands
    under a word that names a quantity.
    """
    best: Layout | None = None
    for index, (_, cells) in enumerate(rows):
        if len(cells) > MAX_COLUMNS:
            continue
        understood = _understood(cells, vocabulary)
        if len(understood) > (len(best.columns) if best else 0):
            layout = _layout_at(index, rows, understood, vocabulary)
            if layout is not None and len(layout.columns) > (len(best.columns) if best else 0):
                best = layout
    return best


def _understood(cells: Sequence[object], vocabulary: Vocabulary) -> dict[int, Heading]:
    found = {}
    for index, cell in enumerate(cells):
        # a number is no heading: the quick way past rows of data
        if isinstance(cell, str) and cell and not cell.lstrip()[:1].isdigit():
            heading = vocabulary.read(cell)
            if heading.quantity:
                found[index] = heading
    return found


def _layout_at(
    index: int, rows: Sequence[Row], understood: dict[int, Heading], vocabulary: Vocabulary
) -> Layout | None:
    numbers = [column for column, heading in understood.items() if heading.is_number]
    if not numbers:
        return None
    below = [i for i in range(index + 1, min(index + 12, len(rows))) if not _is_empty(rows[i][1], understood)]
    if not below:
        return None
    units = _unit_row(rows[below[0]][1], understood)
    first = below[0] + 1 if units else index + 1
    data = [i for i in below if i >= first]
    if not data or not any(_has_reading(rows[i][1], numbers) for i in data[:3]):
        return None
    cells = tuple("" if cell is None else str(cell) for cell in rows[index][1])
    kept = _blocks(cells, understood, rows[data[0]][1])
    columns = {i: heading for i, heading in understood.items() if i in kept}
    unread = {i: vocabulary.read(cells[i]) for i in sorted(kept) if i not in columns}
    width = max(kept) + 1
    units = {i: unit for i, unit in units.items() if i in kept}
    numbers = [i for i in columns if columns[i].is_number]
    return Layout(index, first, columns, unread, units, width, cells, tuple(numbers))


def _blocks(cells: Sequence[str], understood: dict[int, Heading], data: Sequence[object]) -> set[int]:
    """Cell indices of the table: of the runs of headings without a gap, those with a reading under them.

    What stands beside the table behind an empty column, such as "serial" with "A-17" at its right, is a note.
    """
    runs: list[list[int]] = []
    for index, cell in enumerate(cells):
        if cell.strip():
            if runs and runs[-1][-1] == index - 1:
                runs[-1].append(index)
            else:
                runs.append([index])
    kept = [
        run
        for run in runs
        if _has_reading(data, [i for i in run if i in understood and understood[i].is_number]) or len(runs) == 1
    ]
    if not kept:  # the first row has a gap in every run: keep what has a numeric heading
        kept = [run for run in runs if any(i in understood and understood[i].is_number for i in run)]
    return {index for run in kept for index in run}


def _is_empty(cells: Sequence[object], columns: Iterable[int]) -> bool:
    return all(index >= len(cells) or is_blank(cells[index]) or _is_rule(cells[index]) for index in columns)


def _is_rule(cell: object) -> bool:
    """A cell of the line that some tables draw under their headings."""
    return isinstance(cell, str) and _DASHES.fullmatch(cell.strip()) is not None and len(cell.strip()) > 2


def _has_reading(cells: Sequence[object], columns: Iterable[int]) -> bool:
    return any(index < len(cells) and is_reading(cells[index]) for index in columns)


def _unit_row(cells: Sequence[object], understood: dict[int, Heading]) -> dict[int, str]:
    """Units by cell index, where this row holds units and nothing else; else nothing."""
    units: dict[int, str] = {}
    for index, heading in understood.items():
        cell = cells[index] if index < len(cells) else None
        if is_blank(cell) or (isinstance(cell, str) and cell.strip() in ("-", "--")):
            continue
        if not isinstance(cell, str):
            return {}
        text = cell.strip().strip("()[]{}").strip()
        if heading.is_number and resolve_unit(text, heading.kind):
            units[index] = text
        elif heading.quantity != "time" or not _CLOCK_FORM.fullmatch(text):
            return {}
    return units


# --- rows -> tables -------------------------------------------------------------------------------------------------


def tables_of(
    rows: Sequence[Row], layout: Layout, source: Source, *, name: str, sheet: str = "", strict_width: bool = False
) -> list[RawTable]:
    """The tables under a heading row, a new one wherever the headings come again.

    Parameters
    ----------
    rows
        Those that `layout` was found in, and all that follow.
    strict_width
        Refuse a row with more cells than headings: in delimited text its cells have lost their columns.
    """
    found: list[RawTable] = []
    data: list[Row] = []
    heading_line = rows[layout.heading][0]
    repeated = tuple(cell.strip() for cell in layout.cells[: layout.width])
    after_heading = False
    has_gap = len(layout.columns) + len(layout.unread) < layout.width
    for number, row in enumerate(rows[layout.first :]):
        line, cells = row
        if _has_reading(cells, layout.numbers) and not _is_remark(cells, layout):
            if strict_width and len(cells) > layout.width:
                _refuse_long(row, layout, source)
            if number < _SIDE_ROWS and (has_gap or len(cells) > layout.width):
                _side_note(cells, layout, source)
            data.append(row)
            after_heading = False
        elif _is_empty(cells, layout.columns):
            _side_note(cells, layout, source)
        elif _is_repeated(cells, repeated):
            _close(found, data, layout, source, name=name, sheet=sheet, line=heading_line)
            data, heading_line, after_heading = [], line, True
            source.ignore(f"line {line}", "the headings come again here: a new table begins", file=name)
        elif not (after_heading and _unit_row(cells, layout.columns)):
            _leave_out(row, layout, source, name)
    _close(found, data, layout, source, name=name, sheet=sheet, line=heading_line)
    return found


def _is_repeated(cells: Sequence[object], repeated: tuple[str, ...]) -> bool:
    return len(cells) >= len(repeated) and all(
        ("" if cell is None else str(cell).strip()) == text for cell, text in zip(cells, repeated, strict=False)
    )


def _is_remark(cells: Sequence[object], layout: Layout) -> bool:
    """A short row that begins with a word: "count; 200" under thirteen headings."""
    filled = [cell for cell in cells if not is_blank(cell)]
    first = cells[layout.numbers[0]] if layout.numbers[0] < len(cells) else None
    if isinstance(first, str) and first.lstrip().startswith("#"):
        return True
    return len(filled) * 2 < len(layout.columns) and isinstance(first, str) and first != "" and not is_reading(first)


def _refuse_long(row: Row, layout: Layout, source: Source) -> None:
    line, cells = row
    if is_blank(cells[layout.width]):  # what stands behind an empty column is a note
        return
    found = f"this line has {len(cells)} cells and the headings are {layout.width}"
    expected = "write the log again with a separator that is not also the decimal mark"
    raise LogError(source.file, found, expected, line=line, column=layout.width + 1)


def _leave_out(row: Row, layout: Layout, source: Source, name: str) -> None:
    """A row of words among or below the data: a note, or a fault where it should have been data."""
    line, cells = row
    texts = [str(cell).strip() for cell in cells if not is_blank(cell)]
    under = [index for index in layout.numbers if index < len(cells) and not is_blank(cells[index])]
    is_comment = texts[0].startswith("#")
    numeric = under and str(cells[under[0]]).lstrip()[:1].isdigit()
    if not is_comment and (numeric or (len(texts) * 2 > len(layout.columns) and len(texts) > 2)):
        index = under[0] if under else layout.numbers[0]
        heading = layout.columns[index].text
        cell = cells[index] if index < len(cells) else ""  # a line may be shorter than the headings
        found = f'"{shown(cell, 30)}" under "{shown(heading)}" is not a number'
        raise LogError(source.file, found, "expected a reading, or an empty cell", line=line, column=index + 1)
    pair = note_of(texts)
    if pair:
        source.note(*pair)
    else:
        source.ignore(f"line {line}", f'text among the data: "{shown(" ".join(texts))}"', file=name)


def _side_note(cells: Sequence[object], layout: Layout, source: Source) -> None:
    table = layout.columns.keys() | layout.unread.keys()
    outside = [str(c).strip() for i, c in enumerate(cells) if i not in table and not is_blank(c)]
    pair = note_of(outside) if outside and not all(map(_is_rule, outside)) else None
    if pair:
        source.note(*pair)


def note_of(cells: Sequence[str]) -> tuple[str, str] | None:
    """A key in lower case and its value, from "key: value", "key = value" or the cells "key", "value"."""
    texts = [text for text in (cell.strip().lstrip("#").strip() for cell in cells) if text]
    if not texts:
        return None
    for mark in (":", "="):
        key, found, value = texts[0].partition(mark)
        if found and _KEY.fullmatch(key.strip()) and (value.strip() or len(texts) > 1):
            return key.strip().lower(), " ".join([value.strip(), *texts[1:]]).strip()
    if len(texts) > 1 and _KEY.fullmatch(texts[0]):
        return texts[0].lower(), " ".join(texts[1:])
    return None


def _close(
    found: list[RawTable], data: list[Row], layout: Layout, source: Source, *, name: str, sheet: str, line: int
) -> None:
    if not data:
        return
    columns = []
    for index, heading in layout.columns.items():
        cells = [row[index] if index < len(row) else None for _, row in data]
        columns.append(RawColumn(heading, index + 1, layout.units.get(index, ""), _compact(cells)))
    lines = np.fromiter((number for number, _ in data), np.int64, len(data))
    found.append(RawTable(source.file, sheet, name, line, tuple(columns), lines))


def _compact(cells: list[object]) -> Cells:
    """Plain numbers as an array, an empty cell NaN; anything else as it stands."""
    # a bool is no reading, and numpy would read a text "1_0" as ten: only these three types are safe
    if set(map(type, cells)) <= {int, float, type(None)}:
        try:
            return np.array(cells, dtype=np.float64)
        except OverflowError:
            return cells
    return cells


def settle(tables: Sequence[RawTable]) -> list[RawTable]:
    """The tables of one file, with the decimal mark that their numbers agree on."""
    numbers = [
        (table.place(column), column.cells)
        for table in tables
        for column in table.columns
        if column.heading.is_number and column.heading.quantity != "time"
    ]
    decimal, thousands = settle_decimal(numbers)
    return [replace(table, decimal=decimal, thousands=thousands) for table in tables]


# --- faults ---------------------------------------------------------------------------------------------------------


def refuse_width(file: str, width: int, *, line: int = 0) -> NoReturn:
    """Say that a table is too wide to be a log."""
    found = f"{width} columns stand here"
    raise LogError(file, found, f"expected a log of at most {MAX_COLUMNS} columns", line=line, column=1 if line else 0)


def refuse_headings(file: str, rows: Iterable[Row], vocabulary: Vocabulary) -> NoReturn:
    """Say why no table was found: nothing there, no readings under the headings, or headings not understood."""
    previous: list[str] = []
    for line, cells in rows:
        if any(vocabulary.read(c).is_number for c in cells if isinstance(c, str) and c and len(cells) < MAX_COLUMNS):
            found = "the headings have no readings under them"
            raise LogError(file, found, "expected one row of numbers for each sample", line=line, column=1)
        if len(previous) > 1 and sum(map(is_reading, cells)) > 1:
            listed = ", ".join(f'"{word}"' for word in previous[:8])
            found = f"none of the headings {listed} is understood"
            raise LogError(
                file, found, "name them under log: columns: in the limits or bench file", line=line - 1, column=1
            )
        words = [shown(c, 24) for c in cells[:40] if isinstance(c, str) and c.strip() and not is_reading(c)]
        previous = words or previous
    raise LogError(file, "no table of readings was found", "expected a row of headings with numbers under it")
