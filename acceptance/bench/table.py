"""The table inside a file: its heading row, its unit row, its data rows, and the notes around it.

Both readers hand rows of cells here; after this a log is a `RawTable`, whatever file it came from.
"""

from __future__ import annotations

import re
from collections.abc import Iterable, Sequence
from dataclasses import dataclass, field, replace
from datetime import datetime, time
from typing import TYPE_CHECKING, NoReturn

import numpy as np
from numpy.typing import NDArray

from acceptance.bench.headings import Heading, Vocabulary, resolve_unit, shown
from acceptance.bench.log import Doubt, Ignored
from acceptance.bench.packed import Packed
from acceptance.bench.values import Place, is_reading, settle_decimal
from acceptance.errors import LogError

if TYPE_CHECKING:
    from acceptance.bench.values import Cells

__all__ = [
    "DATE_NOTES",
    "IDENTITY_NOTES",
    "MAX_COLUMNS",
    "Layout",
    "RawColumn",
    "RawTable",
    "Row",
    "SERIAL_NOTES",
    "Source",
    "cell_text",
    "find_layout",
    "has_reading",
    "is_blank",
    "is_empty",
    "is_rule",
    "note_of",
    "refuse_headings",
    "refuse_width",
    "settle",
    "unit_row",
]

MAX_COLUMNS = 2000  # a bench log has tens; beyond this a file is something else
_DASHES = re.compile(r":?-{2,}:?")
_CLOCK_FORM = re.compile(r"[hmsydtf:./\- ]+", re.IGNORECASE)  # hh:mm:ss, dd.mm.yyyy
_KEY = re.compile(r"[^\W\d_][\w ./()-]{0,39}")
SERIAL_NOTES = (
    "serial", "serial number", "serial no", "serial no.", "serialno", "serial nr", "sn", "s/n", "unit serial",
    "dut serial", "seriennummer", "numéro de série",
)  # fmt: skip
DATE_NOTES = ("date", "test date", "date of test", "tested", "tested on", "datum", "prüfdatum")
IDENTITY_NOTES = frozenset((*SERIAL_NOTES, *DATE_NOTES))

Row = tuple[int, Sequence[object]]  # line of the file from 1, cells


@dataclass(frozen=True, slots=True)
class RawColumn:
    """One understood column, its cells still as they stand in the file."""

    heading: Heading
    position: int  # from 1, in the file
    unit_below: str  # from the row under the heading, "" where there is none
    cells: Cells  # one a row
    decimals: int | None = None  # digits written behind the decimal mark, where the text was looked at


@dataclass(frozen=True, slots=True)
class RawTable:
    """The rows between one heading row and the next, or the end."""

    file: str
    sheet: str  # "" in delimited text
    name: str  # 'A-17.csv', 'A-17.xlsx, sheet "steady"'
    heading_line: int
    columns: tuple[RawColumn, ...]
    lines: NDArray[np.int64] | Packed  # of each row, from 1
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
    told: dict[str, list[str]] = field(default_factory=dict)  # every different value of a note, in order
    ignored: list[Ignored] = field(default_factory=list)
    doubts: list[Doubt] = field(default_factory=list)

    def note(self, key: str, value: str) -> None:
        """Keep a note; of two with one key the first stays, the other is kept beside it."""
        values = self.told.setdefault(key, [])
        if value in values:
            return
        values.append(value)
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

    @property
    def rank(self) -> tuple[int, int]:
        """What makes one row the heading row before another: chosen headings first, then understood ones."""
        return _rank(self.columns)


def is_blank(cell: object) -> bool:
    """Whether nothing stands in a cell."""
    return cell is None or (isinstance(cell, str) and not cell.strip())


def cell_text(cell: object) -> str:
    """A cell of a note as text: a day without its midnight."""
    if isinstance(cell, datetime) and cell.time() == time():
        return cell.date().isoformat()
    return str(cell).strip()


def find_layout(rows: Sequence[Row], vocabulary: Vocabulary) -> Layout | None:
    """The row with most chosen headings, then most understood ones, that has readings under it; or None.

    Of two alike the upper one is taken. A note such as "serial; A-17" is no heading row: no reading stands
    under a word that names a quantity.
    """
    best: Layout | None = None
    for index, (_, cells) in enumerate(rows):
        if len(cells) > MAX_COLUMNS:
            continue
        understood = _understood(cells, vocabulary)
        if understood and (best is None or _rank(understood) > best.rank):
            layout = _layout_at(index, rows, understood, vocabulary)
            if layout is not None and (best is None or layout.rank > best.rank):
                best = layout
    return best


def _rank(understood: dict[int, Heading]) -> tuple[int, int]:
    return sum(heading.is_chosen for heading in understood.values()), len(understood)


def _understood(cells: Sequence[object], vocabulary: Vocabulary) -> dict[int, Heading]:
    found = {}
    for index, cell in enumerate(cells):
        # a number is no heading, unless the bench file says so: the quick way past rows of data
        if isinstance(cell, str) and cell and not cell.lstrip()[:1].isdigit():
            heading = vocabulary.read(cell)
            if heading.quantity:
                found[index] = heading
        elif vocabulary.numeric and cell is not None and vocabulary.is_chosen(str(cell)):
            found[index] = vocabulary.read(str(cell))
    return found


def _layout_at(
    index: int, rows: Sequence[Row], understood: dict[int, Heading], vocabulary: Vocabulary
) -> Layout | None:
    numbers = [column for column, heading in understood.items() if heading.is_number]
    if not numbers:
        return None
    below = [i for i in range(index + 1, min(index + 12, len(rows))) if not is_empty(rows[i][1], understood)]
    if not below:
        return None
    units = unit_row(rows[below[0]][1], understood)
    first = below[0] + 1 if units else index + 1
    data = [i for i in below if i >= first]
    if not data or not any(has_reading(rows[i][1], numbers) for i in data[:3]):
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
        if has_reading(data, [i for i in run if i in understood and understood[i].is_number]) or len(runs) == 1
    ]
    if not kept:  # the first row has a gap in every run: keep what has a numeric heading
        kept = [run for run in runs if any(i in understood and understood[i].is_number for i in run)]
    return {index for run in kept for index in run}


def is_empty(cells: Sequence[object], columns: Iterable[int]) -> bool:
    return all(index >= len(cells) or is_blank(cells[index]) or is_rule(cells[index]) for index in columns)


def is_rule(cell: object) -> bool:
    """A cell of the line that some tables draw under their headings."""
    return isinstance(cell, str) and _DASHES.fullmatch(cell.strip()) is not None and len(cell.strip()) > 2


def has_reading(cells: Sequence[object], columns: Iterable[int]) -> bool:
    return any(index < len(cells) and is_reading(cells[index]) for index in columns)


def unit_row(cells: Sequence[object], understood: dict[int, Heading]) -> dict[int, str]:
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


# --- notes, decimal marks -------------------------------------------------------------------------------------------


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
