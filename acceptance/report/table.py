"""Tables: columns of wrapped cells, heads repeated on every page, rows that may break when they must."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass, replace
from typing import Literal

from acceptance.report.blocks import Block, Halves
from acceptance.report.fonts import printable, string_width
from acceptance.report.pen import Pen
from acceptance.report.style import ACCENT, CELL, COLUMN, DENSE, PALE, RULE, Type
from acceptance.report.wrap import Piece, Run, wrap, wrap_runs

__all__ = ["Cell", "Column", "Mark", "Row", "Table", "natural_width"]

PAD = 4.0  # between a column's edge and its text
_ROW_PAD = 2.4  # above and below a row's lines
_DENSE_PAD = 1.3
_BEGINNING = 46.0  # so much of a table's rows stands at a page's foot, or none
_SMALL = 110.0  # a table lower than this is not spread over two pages
_WHOLE = 220.0  # a row lower than this is never broken

Mark = Callable[[Pen, tuple[float, float]], None]


@dataclass(frozen=True, slots=True)
class Column:
    """One column: its title, its width, and on which side its cells stand."""

    title: str
    width: float
    align: Literal["left", "right"] = "left"


@dataclass(frozen=True, slots=True)
class Cell:
    """Paragraphs one below the other, each a run or runs; a mark may stand before the first line."""

    paragraphs: Sequence[Run | Sequence[Run]]
    mark: Mark | None = None


@dataclass(frozen=True, slots=True)
class Row:
    """Cells from left to right; `span`: one cell over the whole width. Plain text looks like the table's cells."""

    cells: Sequence[str | Cell]
    span: bool = False
    tinted: bool = False


@dataclass(frozen=True, slots=True)
class _Laid:
    """A row, wrapped: the lines of each cell, and their marks."""

    lines: tuple[list[list[Piece]], ...]
    marks: tuple[Mark | None, ...]
    span: bool
    tinted: bool
    ends: bool = True  # whether a rule stands below

    @property
    def deepest(self) -> int:
        return max((len(lines) for lines in self.lines), default=1)


_MARK_ROOM = 11.0


class Table(Block):
    """A table of the given columns."""

    def __init__(
        self, columns: Sequence[Column], rows: Sequence[Row], *, above: float = 5, style: Type = CELL, head: bool = True
    ) -> None:
        self._columns = columns
        self._pad = _DENSE_PAD if style is DENSE else _ROW_PAD
        self._style = style
        self._width = sum(column.width for column in columns)
        self._head = self._lay_head() if head else []
        self._set([self._lay(row) for row in rows])
        self.above = above

    def _set(self, rows: list[_Laid]) -> None:
        self._rows = rows
        self.height = self._head_height + sum(self._row_height(row) for row in rows)

    # -- measuring

    def _lay_head(self) -> list[list[str]]:
        return [
            [line for part in column.title.split("\n") for line in wrap(part, COLUMN, column.width - 2 * PAD)]
            for column in self._columns
        ]

    @property
    def _head_height(self) -> float:
        return max(map(len, self._head)) * COLUMN.leading + 2 * _ROW_PAD if self._head else 0.0

    def _row_height(self, row: _Laid) -> float:
        return row.deepest * self._style.leading + 2 * self._pad

    def _lay(self, row: Row) -> _Laid:
        widths = [self._width] if row.span else [column.width for column in self._columns]
        cells = list(row.cells)
        return _Laid(
            tuple(self._lay_cell(cell, width - 2 * PAD) for cell, width in zip(cells, widths, strict=True)),
            tuple(cell.mark if isinstance(cell, Cell) else None for cell in cells),
            row.span,
            row.tinted,
        )

    def _lay_cell(self, cell: str | Cell, width: float) -> list[list[Piece]]:
        if isinstance(cell, str):
            return [[Piece(0.0, line, self._style)] for line in wrap(cell, self._style, width)]
        width -= _MARK_ROOM if cell.mark else 0.0
        lines: list[list[Piece]] = []
        for paragraph in cell.paragraphs:
            if isinstance(paragraph, Run):
                lines += [[Piece(0.0, line, paragraph.style)] for line in wrap(paragraph.text, paragraph.style, width)]
            else:
                lines += wrap_runs(paragraph, width)
        return lines

    # -- flowing

    @property
    def least(self) -> float:
        if not self._rows:
            return self.height
        if self.height <= _SMALL:
            return self.height
        first = 0.0
        for row in self._rows:
            if first >= _BEGINNING:
                break
            first += self._row_height(row)
        return self._head_height + min(first, _WHOLE)

    def split(self, room: float) -> Halves:
        if self.height <= room:
            return self, None
        if self.height <= _SMALL:
            return None, self
        used = self._head_height
        place = 0
        while place < len(self._rows) and used + self._row_height(self._rows[place]) <= room:
            used += self._row_height(self._rows[place])
            place += 1
        if place == len(self._rows) - 1 and place > 2:
            place -= 1  # no last row alone on the next page
        head, tail = self._rows[:place], self._rows[place:]
        if tail and self._row_height(tail[0]) > _WHOLE:
            upper, lower = self._break(tail[0], room - used)
            head, tail = ([*head, upper], [lower, *tail[1:]]) if upper else (head, tail)
        while head and head[-1].span and head[-1].ends and len(head) > 1:
            tail.insert(0, head.pop())  # a group's title goes with its rows
        if not head or (len(head) == 1 and head[0].span and head[0].ends and tail):
            return None, self
        return self._part(head), self._part(tail)

    def _break(self, row: _Laid, room: float) -> tuple[_Laid | None, _Laid]:
        """A row too high to be moved whole, broken between two lines."""
        lines = int((room - 2 * self._pad) / self._style.leading)
        if lines < 3:
            return None, row
        upper = replace(row, lines=tuple(cell[:lines] for cell in row.lines), ends=False)
        lower = replace(row, lines=tuple(cell[lines:] for cell in row.lines), marks=tuple(None for _ in row.marks))
        return upper, lower

    def _part(self, rows: list[_Laid]) -> Table:
        part = Table.__new__(Table)
        part._columns, part._style, part._width, part._head = self._columns, self._style, self._width, self._head
        part._pad = self._pad
        part._set(rows)
        return part

    # -- drawing

    def draw(self, pen: Pen, x: float, y: float) -> None:
        low = self._draw_head(pen, x, y) if self._head else y
        below = low
        for row in self._rows:
            below = self._draw_row(pen, row, x, below)
        if self._head:  # after the rows, whose ground would cover half of it
            pen.line([(x, low), (x + self._width, low)], ACCENT, 0.9)

    def _draw_head(self, pen: Pen, x: float, y: float) -> float:
        low = y - self._head_height
        left = x
        for column, lines in zip(self._columns, self._head, strict=True):
            baseline = low + _ROW_PAD + 3.2 + (len(lines) - 1) * COLUMN.leading
            for line in lines:
                if column.align == "right":
                    pen.text(left + column.width - PAD, baseline, line, COLUMN, align="right")
                else:
                    pen.text(left + PAD, baseline, line, COLUMN)
                baseline -= COLUMN.leading
            left += column.width
        return low

    def _draw_row(self, pen: Pen, row: _Laid, x: float, y: float) -> float:
        low = y - self._row_height(row)
        if row.tinted:
            pen.rectangle((x, low, self._width, y - low), fill=PALE)
        left = x
        columns = [Column("", self._width)] if row.span else self._columns
        for column, lines, mark in zip(columns, row.lines, row.marks, strict=True):
            self._draw_cell(pen, column, lines, mark, left=left, top=y - self._pad)
            left += column.width
        if row.ends:
            pen.line([(x, low), (x + self._width, low)], RULE, 0.45)
        return low

    def _draw_cell(
        self, pen: Pen, column: Column, lines: list[list[Piece]], mark: Mark | None, *, left: float, top: float
    ) -> None:
        baseline = top - 0.5 * self._style.leading - 0.34 * self._style.size
        start = left + PAD
        if mark is not None:
            mark(pen, (start + 3.6, baseline + 0.34 * self._style.size))
            start += _MARK_ROOM
        for line in lines:
            if column.align == "right":
                _draw_right(pen, line, left + column.width - PAD, baseline)
            else:
                for piece in line:
                    pen.text(start + piece.x, baseline, piece.text, piece.style)
            baseline -= self._style.leading


def _draw_right(pen: Pen, line: list[Piece], right: float, baseline: float) -> None:
    """A line that ends at the right edge, whatever pieces it has."""
    if not line:
        return
    last = line[-1]
    end = last.x + string_width(last.text.rstrip(" "), last.style.size, last.style.weight)
    for piece in line:
        pen.text(right - end + piece.x, baseline, piece.text, piece.style)


def natural_width(texts: Sequence[str], style: Type = CELL) -> float:
    """Width of a column that none of the texts needs to wrap in."""
    return max((string_width(printable(text), style.size, style.weight) for text in texts), default=0.0) + 2 * PAD + 0.5
