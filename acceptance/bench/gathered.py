"""The tables of a very long log, put together piece by piece; where a piece is odd, its lines are walked one by one."""

from __future__ import annotations

import csv
import io
from collections.abc import Callable, Sequence
from dataclasses import dataclass, field
from typing import Any

import numpy as np
from numpy.typing import NDArray

from acceptance.bench.assemble import assemble
from acceptance.bench.digits import written_decimals
from acceptance.bench.outline import Outline, Start
from acceptance.bench.packed import Block, Packed, append, pack, pack_whole
from acceptance.bench.pieces import Odd, Piece, moments, take_apart, utf8
from acceptance.bench.rows import Walk
from acceptance.bench.stamps import Form, Stamps, read_cells
from acceptance.bench.table import RawColumn, RawTable, Row, Source, settle
from acceptance.bench.values import Worded, is_reading, plain_texts
from acceptance.bench.words import Words

__all__ = ["Gathered"]

_CELLS = 2000  # of a column, looked at as they are written
_UNCLEAR = 1000  # rows with a cell that is no plain reading, beyond which the log is of another kind
_LARGEST = 1e37  # of a time; what instruments send for no reading lies beyond
_END = "\x1f"  # a line by itself that no log has


@dataclass(slots=True)
class _Table:
    """The rows met so far under one row of headings."""

    stamps: Stamps
    rows: int = 0
    blocks: dict[int, list[Block]] = field(default_factory=dict)
    words: dict[int, list[Words]] = field(default_factory=dict)
    over: dict[int, list[NDArray[np.intp]]] = field(default_factory=dict)
    cells: list[list[str]] = field(default_factory=list)
    lines: list[Block] = field(default_factory=list)

    def add(self, piece: Piece, lines: Sequence[Block]) -> bool:
        """Take the rows of a piece; False where their times cannot follow those before."""
        for index, block in piece.blocks.items():
            append(self.blocks.setdefault(index, []), block)
        for index, words in piece.words.items():
            self.words.setdefault(index, []).append(words)
        for index, rows in piece.over.items():
            self.over.setdefault(index, []).append(rows + self.rows)
        for run in lines:
            append(self.lines, run)
        self.cells = self.cells or [[] for _ in piece.cells]
        for kept, cells in zip(self.cells, piece.cells, strict=True):
            kept += cells[: max(0, _CELLS - len(kept))]
        self.rows += piece.rows
        return piece.stamps is None or self.stamps.add(piece.stamps)


class Gathered:
    """What the pieces of a log hold together.

    Every odd line ends as it does where the log is read as a whole: a note, a new table, a fault. What would need
    all rows to be told in the same way makes `is_plain` False: then the log must be read as a whole.
    """

    def __init__(self, start: Start, file: str) -> None:
        self.is_plain = True
        self._encodings = {start.outline.encoding}
        self.source = Source(file, notes=start.source.notes, told=start.source.told, ignored=start.source.ignored)
        self.tables: list[RawTable] = []
        self._plan, self._file = start.outline, file
        self._heading_line = start.rows[start.outline.layout.heading][0]
        self._has_odd = False
        self._first_rows = _readings(start.rows, self._plan)
        self._unclear: list[Row] = []  # with a cell that is no plain reading
        self._tables_met = 0
        self._line, self._number = start.line, 0  # of the next row
        self._table = self._new_table()
        self._walk = Walk(start.rows, self._plan.layout, self.source, self._end_table, name=file)

    def take(self, parts: Sequence[Piece | Odd]) -> bool:
        """The next lines; False as soon as the log must be read as a whole."""
        for part in parts:
            self._see_encoding(part.body)
            if isinstance(part, Odd):
                self._take_odd(part)
            elif self._walk.bears_on_plain:
                self._take_warily(part)
            else:
                self._take_plain(part)
            if not self.is_plain:
                return False
        return self.is_plain

    def end(self) -> bool:
        """End the last table; False where the log must be read as a whole.

        Raises
        ------
        LogError
            At a cell that is none of what its heading says.
        """
        self._walk.close()
        if self._unclear and self.is_plain:
            self._refuse_unclear()
            self.is_plain = False
        return self.is_plain

    def _refuse_unclear(self) -> None:
        """Look at the unclear rows below some plain ones: a fault among them is that of the whole log."""
        if self._tables_met > 1 or len(self._unclear) >= len(self._first_rows):
            return
        layout = self._plan.layout
        data = [*self._first_rows, *self._unclear]
        columns = tuple(
            RawColumn(heading, i + 1, layout.units.get(i, ""), [row[i] if i < len(row) else None for _, row in data])
            for i, heading in layout.columns.items()
        )
        lines = np.fromiter((line for line, _ in data), np.int64, len(data))
        table = RawTable(self._file, "", self._file, self._heading_line, columns, lines)
        assemble(settle([table])[0], Source(self._file))

    def look_over(self, parts: Sequence[Piece | Odd]) -> bool:
        """Look below a fault for what makes the whole log no text, or text in another encoding; False if it does."""
        for part in parts:
            self._see_encoding(part.body)
            self.is_plain = self.is_plain and utf8(part.body, self._plan) is not None
        return self.is_plain

    @property
    def encoding(self) -> str:
        """What the log is written in."""
        return next((one for one in self._encodings if one != "ASCII"), "ASCII")

    def _see_encoding(self, body: bytes) -> None:
        if self._plan.encoding != "ASCII" or body.isascii():
            return
        try:
            body.decode("utf-8")
            self._encodings.add("UTF-8")
        except UnicodeDecodeError:
            self._encodings.add("Latin-1")
        self.is_plain = self.is_plain and len(self._encodings) < 3  # else it is one of them, and was taken for both

    def _take_plain(self, piece: Piece) -> None:
        if piece.asides and self._plan.is_for_plain:
            self.is_plain = False
            return
        taken, lines = 0, []
        for row, text in [*piece.asides, (piece.rows, b"")]:
            if row > taken:
                lines.append(Block(row - taken, None, self._line, 1))
                self._walk.pass_by()
            self._line += row - taken
            self._number += row - taken
            taken = row
            if text:
                self._meet_aside(text)
        self._has_odd = self._has_odd or bool(piece.asides)
        self.is_plain = self.is_plain and self._table.add(piece, lines)

    def _meet_aside(self, text: bytes) -> None:
        rows = _rows(text.decode(), self._plan.separator, self._line)
        if rows is None:
            self.is_plain = False
            return
        self._walk.go(self._number, rows[0], strict_width=True)
        self._line += 1
        self._number += 1

    def _take_warily(self, piece: Piece) -> None:
        """Plain rows below a line that bears on them: they are walked until it does no more."""
        end = piece.body.find(b"\n") + 1 or len(piece.body)
        self._take_odd(Odd(piece.body[:end], piece.is_last and end == len(piece.body)))
        rest = piece.body[end:]
        if self.is_plain and rest.strip():
            self.take(take_apart(rest, self._plan, [0], is_last=piece.is_last))

    def _take_odd(self, odd: Odd) -> None:
        text = None if self._plan.is_for_plain else utf8(odd.body, self._plan)
        rows = _rows(text.decode(), self._plan.separator, self._line) if text is not None else None
        if text is None or rows is None:
            self.is_plain = False
            return
        self._has_odd = True
        for row in rows:
            self._walk.go(self._number, row, strict_width=True)
            self._number += 1
        self._line += text.count(b"\n")
        data = self._walk.hand_over()
        if odd.is_last and not text.endswith(b"\n"):
            self._drop_cut_line(data, rows)
        self._take_rows(data)

    def _drop_cut_line(self, data: list[Row], rows: Sequence[Row]) -> None:
        """Leave out a last line that ends before its last cell: its last number may be cut too."""
        line, cells = rows[-1]
        is_data = bool(data) and data[-1][0] == line and self._table.rows + len(data) > 1
        if is_data and len(cells) < self._plan.layout.width:
            data.pop()
            self.source.ignore(f"line {line}", "the file ends within this line: it was left out")

    def _take_rows(self, data: Sequence[Row]) -> None:
        """Rows of readings that stood among odd lines."""
        if not data or not self.is_plain:
            return
        piece = _piece_of(data, self._plan)
        if piece is None:
            self._unclear += [row for row in data if _piece_of([row], self._plan) is None] or data
            self.is_plain = len(self._unclear) <= _UNCLEAR
            return
        lines = np.fromiter((line for line, _ in data), np.int64, len(data))
        is_run = int(lines[-1] - lines[0]) == lines.size - 1
        block = Block(lines.size, None, int(lines[0]), 1) if is_run else pack_whole(lines, 1)
        self.is_plain = self._table.add(piece, [block])

    # --- tables

    def _new_table(self) -> _Table:
        plan = self._plan
        form = plan.forms.get(plan.stamp) if plan.stamp is not None and plan.day is None else None
        return _Table(Stamps(form or Form("dated")))

    def _end_table(self, data: list[Row], line: int) -> None:
        self._take_rows(data)
        self._tables_met += bool(self._table.rows or self._unclear)
        if self._table.rows and self.is_plain and not self._unclear:
            table = self._raw_table(self._table, line)
            if table is None:
                self.is_plain = False
            else:
                self.tables.append(table)
        self._table = self._new_table()

    def _raw_table(self, table: _Table, line: int) -> RawTable | None:
        """The table as the other readers give it."""
        plan, columns = self._plan, []
        for index, heading in plan.layout.columns.items():
            cells: Any
            if index in plan.forms:
                cells = table.stamps
                if not cells.is_known:
                    return None
            elif index in table.words:
                cells = Words.joined(table.words[index])
            elif index in table.over:
                cells = Worded(Packed(table.blocks[index]), np.concatenate(table.over[index]))
            else:
                cells = Packed(table.blocks[index])
                if self._has_odd and index in plan.times and max(map(abs, _known(cells.extent()))) > _LARGEST:
                    return None
            decimals = written_decimals(table.cells[index])
            columns.append(RawColumn(heading, index + 1, plan.layout.units.get(index, ""), cells, decimals))
        lines = Packed(table.lines, is_whole=True)
        return RawTable(self._file, "", self._file, line, tuple(columns), lines, plan.decimal)


def _readings(rows: Sequence[Row], plan: Outline) -> list[Row]:
    """Those of the first rows in which all is plain."""
    below = [row for row in rows[plan.layout.first :] if len(row[1]) >= plan.layout.width]
    return [row for row in below if _piece_of([row], plan) is not None]


def _known(extent: tuple[float, float]) -> tuple[float, float]:
    return extent if extent[0] <= extent[1] else (0.0, 0.0)


def _rows(text: str, separator: str, first: int) -> list[Row] | None:
    """Lines taken apart, with their numbers; None where a quote is open at their end."""
    ended = text if text.endswith("\n") else text + "\n"
    reader = csv.reader(io.StringIO(ended + _END, newline="\n"), delimiter=separator, skipinitialspace=True)
    rows: list[Row] = []
    before = 0
    try:
        for cells in reader:
            rows.append((first + before, cells))
            before = reader.line_num
    except csv.Error:
        return None
    return rows if rows and rows.pop()[1] == [_END] else None


# --- rows -> columns ------------------------------------------------------------------------------------------------


def _piece_of(data: Sequence[Row], plan: Outline) -> Piece | None:
    """The readings of some rows; None where a cell can only be told beside all the others."""
    columns = [[cells[i] if i < len(cells) else "" for _, cells in data] for i in range(plan.layout.width)]
    texts = [[str(cell) for cell in column] for column in columns]
    piece = Piece(len(data), {}, {}, None, {}, texts, b"")
    if plan.stamp is not None:
        piece.stamps = read_cells(texts[plan.stamp], plan.forms[plan.stamp])
        if plan.day is not None and piece.stamps is not None:
            dates = read_cells(texts[plan.day], plan.forms[plan.day])
            piece.stamps = moments(dates, piece.stamps) if dates is not None else None
        if piece.stamps is None:
            return None
    read: Callable[[Piece, int, list[str], Outline], bool]
    for index, heading in plan.layout.columns.items():
        if index in plan.forms:
            continue
        read = _take_numbers if heading.is_number else _take_words
        if not read(piece, index, texts[index], plan):
            return None
    return piece


def _take_words(piece: Piece, index: int, cells: list[str], plan: Outline) -> bool:
    words = {word: number for number, word in enumerate(dict.fromkeys(cells))}
    codes = np.array([words[cell] for cell in cells], np.min_scalar_type(-len(words)))
    piece.words[index] = Words(list(words), codes)
    return True


def _take_numbers(piece: Piece, index: int, cells: list[str], plan: Outline) -> bool:
    """Readings without a unit, with the decimal mark of the others or none."""
    other = "," if plan.decimal == "." else "."
    for cell in set(cells):
        if cell.strip() and (not is_reading(cell) or other in cell or cell.count(plan.decimal) > 1):
            return False
    found = plain_texts(cells, plan.decimal)
    if found is None:
        return False
    values, over = found
    if index in plan.times and (over.size or any("--" in cell for cell in cells)):
        return False
    if over.size:
        piece.over[index] = over
    piece.blocks[index] = pack(values, plan.decimals[index], look_for_run=index in plan.times)
    return True
