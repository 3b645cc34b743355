"""Pieces of a very long log -> readings packed, texts numbered, times in microseconds; odd lines are put aside.

Plain are lines with the same cells as the headings, numbers that pandas' C reader takes, and times of one form.
"""

from __future__ import annotations

import csv
from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field
from typing import TYPE_CHECKING, Any

import numpy as np
from numpy.typing import NDArray

from acceptance.bench.digits import sampled_cells
from acceptance.bench.outline import Outline
from acceptance.bench.packed import Block, pack
from acceptance.bench.quick import clean_texts, cut_tail, has_summary
from acceptance.bench.stamps import DAY, NO_STAMP, read_stamps
from acceptance.bench.values import plain_texts
from acceptance.bench.words import Words

if TYPE_CHECKING:
    import pandas as pd

__all__ = ["Odd", "Piece", "moments", "take_apart", "utf8"]

_SMALL = 1 << 13  # bytes of odd lines and their neighbours that are no more cut
_MOST_CUTS = 128  # around odd lines of one piece
_PARTS = 8  # that a piece with something odd in it is cut into


@dataclass(slots=True)
class Piece:
    """What some lines of the log hold."""

    rows: int
    blocks: dict[int, Block]  # cell index -> readings
    words: dict[int, Words]  # cell index -> texts
    stamps: NDArray[np.int64] | None  # microseconds since 1970, or of clocks since midnight
    over: dict[int, NDArray[np.intp]]  # cell index -> rows over range
    cells: list[list[str]]  # of some lines, column by column, as written
    body: bytes
    is_last: bool = False
    asides: list[tuple[int, bytes]] = field(default_factory=list)  # comments and blank lines: rows before, text


@dataclass(frozen=True, slots=True)
class Odd:
    """Lines of the log among which something odd stands."""

    body: bytes
    is_last: bool = False


def take_apart(
    body: bytes, plan: Outline, looked_at: Sequence[int] = (), *, is_last: bool = False
) -> list[Piece | Odd]:
    """What some whole lines hold, in their order.

    Parameters
    ----------
    looked_at
        Bytes in the lines whose cells are kept as they are written.
    is_last
        Whether the log ends with them.
    """
    piece = _plain(body, plan, looked_at, is_last=is_last)
    if piece is not None:
        return [piece]
    if len(body) <= _SMALL:
        return [Odd(body, is_last)]
    cuts = _around_odd(body, plan) or _evenly(body)
    if len(cuts) < 2:
        return [Odd(body, is_last)]
    parts: list[Piece | Odd] = []
    for begin, end, is_odd in cuts:
        at = [0, *(spot - begin for spot in looked_at if begin < spot < end)]
        ends_log = is_last and end == len(body)
        part = body[begin:end]
        parts += [Odd(part, ends_log)] if is_odd else take_apart(part, plan, at, is_last=ends_log)
    return parts


def _evenly(body: bytes) -> list[tuple[int, int, bool]]:
    """Lines cut into several parts: begin, end, and that nothing is known of them."""
    cuts = []
    begin = 0
    while begin < len(body):
        end = body.find(b"\n", begin + max(_SMALL, len(body) // _PARTS) - 1) + 1 or len(body)
        cuts.append((begin, end, False))
        begin = end
    return cuts


def _around_odd(body: bytes, plan: Outline) -> list[tuple[int, int, bool]]:
    """The same, cut before and behind lines with too many or too few cells; nothing where there are none, or many."""
    each = np.frombuffer(body, np.uint8)
    ends = np.flatnonzero(each == ord("\n")) + 1
    if not body.endswith(b"\n"):
        ends = np.append(ends, each.size)
    marks = np.diff(np.searchsorted(np.flatnonzero(each == ord(plan.separator)), ends), prepend=0)
    quotes = np.diff(np.searchsorted(np.flatnonzero(each == ord('"')), ends), prepend=0)
    usual = int(np.median(marks))
    is_odd = marks != usual
    starts = np.concatenate(([0], ends[:-1]))
    at = body.find(plan.heading) if plan.heading else -1
    while at >= 0:
        is_odd |= starts == at
        at = body.find(plan.heading, at + 1)
    borders = np.flatnonzero(np.diff(is_odd, prepend=False, append=False))
    if not borders.size or borders.size > _MOST_CUTS or (quotes % 2).any():
        return []
    at_bytes = np.append(starts, each.size)[borders].tolist()
    odd = list(zip(at_bytes[::2], at_bytes[1::2], strict=True))
    plain = zip([0, *at_bytes[1::2]], [*at_bytes[::2], each.size], strict=True)
    cuts = [(*cut, True) for cut in odd] + [(*cut, False) for cut in plain if cut[0] < cut[1]]
    return sorted(cuts)


def _plain(body: bytes, plan: Outline, looked_at: Sequence[int], *, is_last: bool) -> Piece | None:
    """What the lines hold; None where anything in them is not plain."""
    text = _plain_text(body, plan)
    if text is None or (is_last and not _ends_plainly(text, plan)):
        return None
    if is_last and not (text := text.rstrip(b"\n") + b"\n").strip():
        return None
    text, asides = _without_asides(text, plan)
    lines = _lines_of(text, plan)
    if lines is None or _has_odd_line(lines, plan):
        return None
    read = _cells(lines, plan)
    if read is None:
        return None
    cells = sampled_cells(body, plan.separator, plan.layout.width, looked_at)
    piece = Piece(lines.count, {}, {}, None, {}, cells, body, is_last, asides)
    if plan.stamp is not None:
        piece.stamps = _times(lines, plan, plan.stamp)
        if piece.stamps is None:
            return None
    return piece if _take_columns(piece, read, plan) else None


def _without_asides(text: bytes, plan: Outline) -> tuple[bytes, list[tuple[int, bytes]]]:
    """The lines without those that are no rows in any case, and these, each with the number of rows before it."""
    each = np.frombuffer(text, np.uint8)
    ends = np.flatnonzero(each == ord("\n")) + 1
    if not ends.size:
        return text, []
    starts = np.concatenate(([0], ends[:-1]))
    first = each[starts]
    if not ((first == ord("#")) | (first == ord("\n"))).any():  # faster than to look for both in the text
        return text, []
    is_aside = (first == ord("\n")) & (not plan.has_more_numbers)
    if plan.layout.numbers[0] == 0 and not plan.heading.startswith(b"#"):
        is_aside |= first == ord("#")
    rows = np.cumsum(~is_aside)
    asides = [(int(rows[at]), text[starts[at] : ends[at]]) for at in np.flatnonzero(is_aside).tolist()]
    return each[np.repeat(~is_aside, ends - starts)].tobytes() if asides else text, asides


def _times(lines: _Lines, plan: Outline, index: int) -> NDArray[np.int64] | None:
    clocks = read_stamps(lines.text, *_cell_ends(lines, plan, index), plan.forms[index])
    if clocks is None or plan.day is None:
        return clocks
    dates = read_stamps(lines.text, *_cell_ends(lines, plan, plan.day), plan.forms[plan.day])
    return moments(dates, clocks) if dates is not None else None


def moments(dates: NDArray[np.int64], clocks: NDArray[np.int64]) -> NDArray[np.int64] | None:
    """Dates and the clocks beside them; None where one is missing, or a clock goes beyond its day."""
    if (dates == NO_STAMP).any() or (clocks == NO_STAMP).any() or (clocks >= DAY).any():
        return None
    return dates + clocks


def utf8(body: bytes, plan: Outline) -> bytes | None:
    """Lines in UTF-8, ended by "\n" alone; None where they are no text.

    Where the first lines are ASCII, the first other character tells what the log is in.
    """
    text = body
    if not body.isascii():
        if plan.encoding == "Latin-1":
            text = body.decode("cp1252", errors="replace").encode()
        else:
            try:
                body.decode("utf-8")
            except UnicodeDecodeError:
                if plan.encoding != "ASCII":
                    return None
                text = body.decode("cp1252", errors="replace").encode()
    if b"\r" in text:
        text = text.replace(b"\r\n", b"\n").replace(b"\r", b"\n")
    return None if b"\x00" in text else text


def _plain_text(body: bytes, plan: Outline) -> bytes | None:
    """The same without the quotes around cells; None where a quote or the end of a line is odd."""
    text = utf8(body, plan)
    if text is None or (b"\r" in body and body.count(b"\r") != body.count(b"\r\n")):
        return None
    return unquoted(text, plan.separator) if b'"' in text else text


def unquoted(text: bytes, separator: str) -> bytes | None:
    """Lines without the quotes around their cells; None where one stands elsewhere or holds more than one cell."""
    each = np.frombuffer(text, np.uint8)
    quotes = np.flatnonzero(each == ord('"'))
    if quotes.size % 2:
        return None
    is_mark = (each == ord(separator)) | (each == ord("\n"))
    opening, closing = quotes[::2], quotes[1::2]
    before, after = opening[opening > 0] - 1, closing[closing < each.size - 1] + 1
    if not (is_mark[before].all() and is_mark[after].all()):
        return None
    marks = np.flatnonzero(is_mark)
    if (np.searchsorted(marks, opening) != np.searchsorted(marks, closing)).any():
        return None
    return text.replace(b'"', b"")


def _ends_plainly(text: bytes, plan: Outline) -> bool:
    return cut_tail(text, 0, len(text), plan.separator, plan.layout, None) is not None


@dataclass(frozen=True, slots=True)
class _Lines:
    """Some lines of a log, byte by byte."""

    text: bytes
    each: NDArray[np.uint8]
    starts: NDArray[np.intp]
    ends: NDArray[np.intp]
    cells: int  # in every line, on the mean

    @property
    def count(self) -> int:
        return int(self.ends.size)


def _lines_of(text: bytes, plan: Outline) -> _Lines | None:
    """The lines; None where their cells are too many or too few, taken together."""
    each = np.frombuffer(text, np.uint8)
    ends = np.flatnonzero(each == 10)
    marks = np.count_nonzero(each == ord(plan.separator))
    # one separator more than there are cells may end every line
    for cells in (plan.layout.width, plan.layout.width + 1):
        if ends.size and marks == (cells - 1) * ends.size:
            return _Lines(text, each, np.concatenate(([0], ends[:-1] + 1)), ends, cells)
    return None


def _has_odd_line(lines: _Lines, plan: Outline) -> bool:
    """Whether a comment, or the headings once more, stand among the lines."""
    first = lines.each[lines.starts]
    if (first == ord("#")).any():
        return True
    alike = lines.starts[first == plan.heading[0]].tolist()
    return any(lines.text.startswith(plan.heading, start) for start in alike)


def _are_uneven(lines: _Lines, plan: Outline) -> bool:
    """Whether one line has more cells than another."""
    marks = np.flatnonzero(lines.each == ord(plan.separator)).reshape(lines.count, lines.cells - 1)
    return bool((marks[:, 0] < lines.starts).any() or (marks[:, -1] > lines.ends).any())


def _cell_ends(lines: _Lines, plan: Outline, index: int) -> tuple[NDArray[np.intp], NDArray[np.intp]]:
    """Where a cell of every line begins and ends; the lines are known to be even."""
    if index == 0:
        ends = lines.starts + max(0, lines.text.find(plan.separator.encode()))
        if lines.cells > 1 and ends[-1] < len(lines.text) and (lines.each[ends] == ord(plan.separator)).all():
            return lines.starts, ends  # all of one width, if they are stamps
    marks = np.flatnonzero(lines.each == ord(plan.separator)).reshape(lines.count, lines.cells - 1)
    starts = marks[:, index - 1] + 1 if index else lines.starts
    return starts, marks[:, index] if index < lines.cells - 1 else lines.ends


def _cells(lines: _Lines, plan: Outline) -> dict[Any, pd.Series[Any]] | None:
    """The columns as pandas reads them, stamps left out; None where they are not one kind a column."""
    layout = plan.layout
    names = [index for index in range(lines.cells) if index not in plan.forms]
    if not names:
        return None
    cells = None if plan.has_gaps else _read(lines, plan, names, quick=True)
    if cells is None or any(cells[index].dtype.kind not in "fi" for index in layout.numbers if index in cells):
        cells = _read(lines, plan, names, quick=False)
    if cells is None or (lines.cells > layout.width and cells[layout.width].notna().any()):
        return None
    # the reader fills a line that is too short, and that is how one too long beside it shows
    if lines.cells > 1 and _is_empty_anywhere(cells[names[-1]]) and _are_uneven(lines, plan):
        return None
    return None if any(has_summary(cells[index]) for index in layout.unread) else cells


def _read(lines: _Lines, plan: Outline, names: list[int], *, quick: bool) -> dict[Any, pd.Series[Any]] | None:
    """One call of the C reader; the quick one knows no missing reading, and takes its column for text."""
    import io

    import pandas as pd

    words: dict[int, Any] = {i: "category" for i, heading in plan.layout.columns.items() if not heading.is_number}
    options = {**plan.options, "names": list(range(lines.cells)), "usecols": names, "dtype": words or None}
    if quick:
        options |= {"na_filter": False, "na_values": None}
    else:
        options["na_values"] = {index: words for index, words in options["na_values"].items() if index in names}
    options["skipinitialspace"] = b" " in lines.text or b"\t" in lines.text
    try:
        frame: pd.DataFrame = pd.read_csv(io.BytesIO(lines.text), **options, low_memory=False, quoting=csv.QUOTE_NONE)
    except (Warning, TypeError, ValueError, OverflowError, pd.errors.ParserError):
        return None
    return dict(frame.items()) if len(frame) == lines.count else None


def _is_empty_anywhere(cells: pd.Series[Any]) -> bool:
    if cells.dtype.kind in "fi":
        return bool(np.isnan(cells.to_numpy()).any())
    return bool(cells.isna().any()) or "" in cells.unique()


def _take_columns(piece: Piece, read: Mapping[Any, pd.Series[Any]], plan: Outline) -> bool:
    """Pack the columns; False where a cell wants a closer look."""
    empty = np.ones(piece.rows, bool) if piece.stamps is None else piece.stamps == NO_STAMP
    for index, heading in plan.layout.columns.items():
        if index in plan.forms:
            continue
        cells = read[index]
        if not heading.is_number:
            words = _words(cells)
            if words is None:
                return False
            piece.words[index] = words
            continue
        values = _readings(piece, index, cells, plan, is_time=heading.quantity == "time")
        if values is None:
            return False
        piece.blocks[index] = pack(values, plan.decimals[index], look_for_run=index in plan.times)
        if empty.any():
            empty &= np.isnan(values)
    return not empty.any()  # a row without a reading may be a note


def _words(cells: pd.Series[Any]) -> Words | None:
    """Texts in the order that they were met in; None where one is missing."""
    codes = cells.cat.codes.to_numpy()
    met, first = np.unique(codes, return_index=True)
    if met[0] < 0:
        return None
    order = np.argsort(first)
    place = np.empty(int(met[-1]) + 1, codes.dtype)
    place[met[order]] = np.arange(met.size, dtype=codes.dtype)
    return Words([str(cells.cat.categories[code]) for code in met[order].tolist()], place[codes])


def _readings(
    piece: Piece, index: int, cells: pd.Series[Any], plan: Outline, *, is_time: bool
) -> NDArray[np.float64] | None:
    if cells.dtype.kind in "fi":
        return cells.to_numpy(np.float64)
    if is_time or cells.dtype.kind in "bu":
        return None
    texts = clean_texts(cells, plan.decimal)
    found = plain_texts(texts, plan.decimal) if texts is not None else None
    if found is None:
        return None
    values, over = found
    if over.size:
        piece.over[index] = over
    return values
