"""Rows under a heading row -> raw tables: data, notes among them, headings that come again, a summary below."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from typing import TYPE_CHECKING, NoReturn

import numpy as np

from acceptance.bench.headings import shown
from acceptance.bench.table import (
    Layout,
    RawColumn,
    RawTable,
    Row,
    Source,
    cell_text,
    has_reading,
    is_blank,
    is_empty,
    is_rule,
    note_of,
    unit_row,
)
from acceptance.bench.values import is_reading
from acceptance.errors import LogError

if TYPE_CHECKING:
    from acceptance.bench.values import Cells

__all__ = ["Walk", "is_summary_word", "numbers_below", "tables_of"]

_SIDE_ROWS = 400  # notes beside a table stand beside its first rows
_SUMMARY_WORDS = frozenset((
    "average", "avg", "avg.", "mean", "median", "min", "min.", "minimum", "max", "max.", "maximum", "sum", "total",
    "std", "std dev", "std. dev.", "stdev", "stddev", "standard deviation", "mittelwert", "durchschnitt",
    "summe", "moyenne",
))  # fmt: skip


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

    def ended(data: list[Row], line: int) -> None:
        _close(found, data, layout, source, name=name, sheet=sheet, line=line)

    walk = Walk(rows, layout, source, ended, name=name, sheet=sheet)
    for number, row in enumerate(rows[layout.first :]):
        walk.go(number, row, strict_width=strict_width)
    walk.close()
    return found


def numbers_below(rows: Sequence[Row], layout: Layout) -> frozenset[int]:
    """Cell indices where numbers are expected: those of channels, and others whose first row holds one."""
    first = rows[layout.first][1] if layout.first < len(rows) else ()
    others = [i for i in layout.unread if i < len(first) and not is_blank(first[i]) and is_reading(first[i])]
    return frozenset((*layout.numbers, *others))


class Walk:
    """The way down the rows under a heading row, and what was met on it.

    `ended` is called with the rows of each table that ends, and the line of its headings.
    """

    def __init__(
        self,
        rows: Sequence[Row],
        layout: Layout,
        source: Source,
        ended: Callable[[list[Row], int], None],
        *,
        name: str,
        sheet: str = "",
    ) -> None:
        self.is_after_heading = False
        self.is_parted = False  # whether an empty row stands between here and the data
        self.has_gap = len(layout.columns) + len(layout.unread) < layout.width
        # headings such as "101" would pass for readings where they come again
        self.has_odd_headings = any(is_reading(heading.text) for heading in layout.columns.values())
        self._layout, self._source, self._name, self._sheet = layout, source, name, sheet
        self._ended = ended
        self._numbers = numbers_below(rows, layout)
        self._repeated = tuple(cell.strip() for cell in layout.cells[: layout.width])
        self._heading_line = self._line = rows[layout.heading][0]
        self._data: list[Row] = []
        self._has_data = False  # whether rows of this table were handed over before
        self._summary: list[Row] = []

    @property
    def bears_on_plain(self) -> bool:
        """Whether something met so far may make a fault, or no sample, of a row whose cells are all as expected."""
        return bool(self._summary) or (self.is_parted and self._numbers != frozenset(self._layout.numbers))

    def go(self, number: int, row: Row, *, strict_width: bool) -> None:
        """Take the next row for what it is; its number counts from 0 under the headings."""
        line, cells = row
        layout, source = self._layout, self._source
        self.meet(line)
        if number >= _SIDE_ROWS and self.is_plain(cells):
            self.take_plain(row)
        elif self.has_odd_headings and self.is_repeated(cells):
            self.begin_anew(line)
        elif has_reading(cells, layout.numbers) and not _is_remark(cells, layout):
            if strict_width and len(cells) > layout.width:
                _refuse_long(row, layout, source)
            if number < _SIDE_ROWS and (self.has_gap or len(cells) > layout.width):
                _side_note(cells, layout, source)
            self.take(row)
        elif is_empty(cells, layout.columns):
            _side_note(cells, layout, source)
            self.is_parted = self.is_parted or all(map(is_blank, cells))
        elif self.is_repeated(cells):
            self.begin_anew(line)
        elif not (self.is_after_heading and unit_row(cells, layout.columns)):
            self.leave_out(row)

    def hand_over(self) -> list[Row]:
        """The rows of this table since it began or they were last handed over."""
        rows, self._data = self._data, []
        self._has_data = self._has_data or bool(rows)
        return rows

    def pass_by(self) -> None:
        """Know that plain rows stand here, which somebody else has taken."""
        self._has_data = True
        self.is_after_heading = self.is_parted = False

    def meet(self, line: int) -> None:
        """Go on to a row; a workbook's empty rows are not among the rows."""
        if self._sheet and line > self._line + 1:
            self.is_parted = True
        self._line = line

    def is_plain(self, cells: Sequence[object]) -> bool:
        """Whether a row holds readings and no word at all, as nearly all of a workbook do: no closer look is needed."""
        return (
            not self._summary
            and len(cells) <= self._layout.width
            and str not in map(type, cells)
            and has_reading(cells, self._layout.numbers)
        )

    def take_plain(self, row: Row) -> None:
        """Take a row without words."""
        self._data.append(row)
        self.is_after_heading = self.is_parted = False

    def is_repeated(self, cells: Sequence[object]) -> bool:
        """Whether the headings come again."""
        return _is_repeated(cells, self._repeated)

    def begin_anew(self, line: int) -> None:
        """End the table; the next has its headings in this line."""
        self.close()
        self._heading_line, self.is_after_heading, self.is_parted = line, True, False
        self._source.ignore(f"line {line}", "the headings come again here: a new table begins", file=self._name)

    def take(self, row: Row) -> None:
        """Take a row with readings, unless a summary stands there."""
        if self._is_summary(row):
            self._summary.append(row)
            return
        if self._summary:
            self._refuse(self._summary[0], self._word_in(self._summary[0][1]))
        word = self._summary_word(row[1])
        if word is not None and word not in self._layout.columns:
            self._refuse(row, word)
        self._data.append(row)
        self.is_after_heading = self.is_parted = False

    def leave_out(self, row: Row) -> None:
        """Keep a row of words as a note, or say that it was left out; one that should be data is a fault."""
        wrong = _wrong_cell(row[1], self._layout)
        if wrong is None:
            _leave_out(row, self._source, self._name)
        elif self._is_summary(row):
            self._summary.append(row)
        else:
            self._refuse(row, wrong)

    def close(self) -> None:
        """End the table."""
        self._ended(self._data, self._heading_line)
        for line, cells in self._summary:
            text = shown(" ".join(str(cell).strip() for cell in cells if not is_blank(cell)))
            self._source.ignore(f"line {line}", f'a summary below the data: "{text}"', file=self._name)
        self._data, self._summary, self._has_data = [], [], False

    def _is_summary(self, row: Row) -> bool:
        """Words where numbers should be, few cells filled, and an empty row between them and the data."""
        if not self.is_parted or not (self._data or self._has_data):
            return False
        filled = sum(not is_blank(cell) for cell in row[1])
        headings = len(self._layout.columns) + len(self._layout.unread)
        return filled * 2 < headings and self._word_in(row[1]) is not None

    def _word_in(self, cells: Sequence[object]) -> int | None:
        """The first cell with a word where numbers are expected."""
        for index, cell in enumerate(cells):
            if index in self._numbers and not is_blank(cell) and not is_reading(cell):
                return index
        return None

    def _summary_word(self, cells: Sequence[object]) -> int | None:
        """The first filled cell, where "average" or its like stands there instead of a number."""
        for index, cell in enumerate(cells):
            if cell is not None and cell != "":
                is_word = isinstance(cell, str) and not cell[0].isdigit() and is_summary_word(cell)
                return index if is_word and index in self._numbers else None
        return None

    def _refuse(self, row: Row, index: int | None) -> NoReturn:
        line, cells = row
        at = self._layout.numbers[0] if index is None else index
        heading = self._layout.columns.get(at) or self._layout.unread[at]
        cell = cells[at] if at < len(cells) else ""  # a line may be shorter than the headings
        found = f'"{shown(cell, 30)}" under "{shown(heading.text)}" is not a number'
        if self._sheet:
            found = f'sheet "{shown(self._sheet)}": {found}'
        raise LogError(self._source.file, found, "expected a reading, or an empty cell", line=line, column=at + 1)


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
    expected = (
        "leave out the surplus cells or give them headings; or, where the separator is also the decimal mark, "
        "write the log again with another separator"
    )
    raise LogError(source.file, found, expected, line=line, column=layout.width + 1)


def is_summary_word(cell: str) -> bool:
    """Whether a cell heads a row of a summary: "Average", "Max:", "Std. dev."."""
    return cell.strip().rstrip(":").casefold() in _SUMMARY_WORDS


def _wrong_cell(cells: Sequence[object], layout: Layout) -> int | None:
    """Where a row of words should have been data; None where it is a note."""
    texts = [str(cell).strip() for cell in cells if not is_blank(cell)]
    under = [index for index in layout.numbers if index < len(cells) and not is_blank(cells[index])]
    if texts[0].startswith("#"):
        return None
    numeric = under and str(cells[under[0]]).lstrip()[:1].isdigit()
    if numeric or (len(texts) * 2 > len(layout.columns) and len(texts) > 2):
        return under[0] if under else layout.numbers[0]
    return None


def _leave_out(row: Row, source: Source, name: str) -> None:
    """A row of words among or below the data is a note, or said to be left out."""
    line, cells = row
    texts = [str(cell).strip() for cell in cells if not is_blank(cell)]
    pair = note_of(texts)
    if pair:
        source.note(*pair)
    else:
        source.ignore(f"line {line}", f'text among the data: "{shown(" ".join(texts))}"', file=name)


def _side_note(cells: Sequence[object], layout: Layout, source: Source) -> None:
    table = layout.columns.keys() | layout.unread.keys()
    outside = [cell_text(c) for i, c in enumerate(cells) if i not in table and not is_blank(c)]
    pair = note_of(outside) if outside and not all(map(is_rule, outside)) else None
    if pair:
        source.note(*pair)


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
