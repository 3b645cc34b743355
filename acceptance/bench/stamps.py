"""Dates with times, and clocks, in very long logs: a whole column of them at once, byte by byte."""

from __future__ import annotations

import re
from collections.abc import Sequence
from dataclasses import dataclass, field
from datetime import date, datetime, tzinfo

import numpy as np
from numpy.typing import NDArray

from acceptance.bench.packed import Block, Packed, append, pack_whole
from acceptance.bench.values import MISSING

__all__ = ["DAY", "NO_STAMP", "Form", "Stamps", "form_of", "read_cells", "read_stamps"]

Whole = NDArray[np.int64]

# year first, or day first with points; dates with slashes that begin with the day or the month are for others to settle
_DATE = (
    r"(?P<date>(?P<y>\d{4})(?P<s>[-/.])(?P<m>\d{1,2})(?P=s)(?P<d>\d{1,2})"
    r"|(?P<d2>\d{1,2})\.(?P<m2>\d{1,2})\.(?P<y2>\d{4}|\d{2}))"
)
_CLOCK = r"(?P<H>\d{1,4}):(?P<M>\d{2})(?::(?P<S>\d{2})(?:[.,](?P<f>\d{1,6}))?)?"
_FORMS = {
    kind: re.compile(rf" *{form} *".encode())
    for kind, form in (("dated", f"{_DATE}[T ]{_CLOCK}"), ("date", _DATE), ("clock", _CLOCK))
}
_DATE_FORM = re.compile(_DATE.encode())
_ZONED = re.compile(r"\d{4}-\d{2}-\d{2}[T ]\d{2}:\d{2}(?::\d{2}(?:\.\d{1,6})?)?(?P<zone>Z|[+-]\d{2}:?\d{2})")
_MISSING = frozenset(word.casefold() for word in MISSING)
_WIDTHS = 64  # different ones in one piece; a column with more of them is no column of times
_ZERO = ord("0")
_SECOND = 1_000_000  # microseconds
DAY = 86_400 * _SECOND
NO_STAMP = np.iinfo(np.int64).min  # no stamp, as numpy has it


@dataclass(frozen=True, slots=True)
class Form:
    """How the times of a column are written."""

    kind: str  # "dated", "date" or "clock"
    zone: str = ""  # that each of them ends with

    @property
    def is_clock(self) -> bool:
        return self.kind == "clock"


@dataclass(slots=True)
class Stamps:
    """A column of dates with times, all in one zone or none, or of clocks: seconds from the first of them.

    A clock that goes back by more than half a day has passed midnight, unless it counts beyond 24 h: then it counts
    from the start of something.
    """

    form: Form = field(default_factory=lambda: Form("dated"))
    first: datetime | None = None  # with dates
    latest: date | None = None  # with dates
    midnights: int = 0  # that a clock has passed
    _start: int | None = None
    _before: int = 0  # the last one known, as written
    _end: int = 0
    _is_beyond: bool = False  # whether a clock has counted 24 h
    _blocks: list[Block] = field(default_factory=list)

    @property
    def is_known(self) -> bool:
        """Whether there is any stamp."""
        return self._start is not None

    @property
    def seconds(self) -> Packed:
        """[s]"""
        return Packed(self._blocks)

    @property
    def days_on(self) -> int:
        """Days of 24 h that a clock has run through at the least."""
        since = 0 if self.midnights else self._start or 0
        return (self._end - since) // DAY

    def __len__(self) -> int:
        return sum(block.size for block in self._blocks)

    def add(self, stamps: Whole) -> bool:
        """The next rows, in microseconds since 1970 or midnight, the smallest number where there is no stamp.

        False where a clock passes midnight and also counts beyond 24 h, so that it cannot be carried on.
        """
        is_missing = stamps == NO_STAMP
        known = stamps[~is_missing] if is_missing.any() else stamps
        if known.size and self._start is None:
            self._start = self._before = self._end = int(known[0])
            if not self.form.is_clock:
                self.first = _moment(self._start).replace(tzinfo=_zone(self.form.zone))
        if known.size and self.form.is_clock:
            carried = self._carried_on(known)
            if carried is None:
                return False
            if carried is not known:
                stamps = stamps.copy()
                stamps[~is_missing] = known = carried
        if known.size:
            self._end = max(self._end, int(known.max()))
            if not self.form.is_clock:
                self.latest = _moment(self._end).date()
        start = self._start or 0
        if known.size == stamps.size and stamps.size:
            append(self._blocks, pack_whole(stamps - start, _SECOND))
        elif stamps.size:
            seconds = (stamps - start) / 1e6
            seconds[is_missing] = np.nan
            self._blocks.append(Block(stamps.size, seconds, has_holes=True))
        return True

    def _carried_on(self, known: Whole) -> Whole | None:
        """Clocks with a day added for each midnight passed so far."""
        back = np.diff(known, prepend=self._before) < -DAY // 2
        self._before = int(known[-1])
        self._is_beyond = self._is_beyond or int(known.max()) >= DAY
        passed = int(np.count_nonzero(back))
        if self._is_beyond:
            return None if self.midnights else known
        if not (passed or self.midnights):
            return known
        carried: Whole = known + DAY * (self.midnights + np.cumsum(back))
        self.midnights += passed
        return carried


def _moment(microseconds: int) -> datetime:
    found = np.datetime64(microseconds, "us").astype(datetime)
    assert isinstance(found, datetime)
    return found


def form_of(cell: str) -> Form | None:
    """How a time is written; None where it is no such time."""
    match = _ZONED.fullmatch(cell)
    if match is not None:
        return Form("dated", match["zone"])
    text = cell.encode()
    return next((Form(kind) for kind, form in _FORMS.items() if form.fullmatch(text)), None)


def _zone(zone: str) -> tzinfo | None:
    """The zone of the stamps that end so."""
    import pandas as pd

    if not zone:
        return None
    found: tzinfo | None = pd.to_datetime(pd.Series([f"2026-01-01T00:00:00{zone}"]), format="ISO8601").dt.tz
    return found


def read_stamps(text: bytes, starts: NDArray[np.intp], ends: NDArray[np.intp], form: Form) -> Whole | None:
    """The times between the bytes `starts` and `ends` of a text; None where one of them is none.

    Returns
    -------
    shape (n,)
        Microseconds since 1970, of a clock since midnight; `NO_STAMP` where one is missing.
    """
    if form.zone:
        shorn = _without_zone(text, starts, ends, form.zone.encode())
        if shorn is None:
            return None
        ends = shorn
    widths = ends - starts
    if bool((widths == widths[0]).all()):
        return _of_one_width(text, starts, int(widths[0]), form)
    out = np.full(starts.size, NO_STAMP)
    different = np.unique(widths).tolist()
    if len(different) > _WIDTHS:
        return None
    for width in different:
        rows = np.flatnonzero(widths == width)
        found = _of_one_width(text, starts[rows], width, form)
        if found is None:
            return None
        out[rows] = found
    return out


def read_cells(cells: Sequence[str], form: Form) -> Whole | None:
    """The same of cells by themselves."""
    encoded = [cell.strip().encode() for cell in cells]
    is_there = np.array([cell.decode().casefold() not in _MISSING for cell in encoded], dtype=bool)
    out = np.full(len(cells), NO_STAMP)
    texts = [cell for cell, there in zip(encoded, is_there.tolist(), strict=True) if there]
    if not texts:
        return out
    ends = np.cumsum([len(text) for text in texts])
    found = read_stamps(b"".join(texts), np.concatenate(([0], ends[:-1])), ends, form)
    if found is None:
        return None
    out[is_there] = found
    return out


def _without_zone(
    text: bytes, starts: NDArray[np.intp], ends: NDArray[np.intp], zone: bytes
) -> NDArray[np.intp] | None:
    """Where the stamps end that are followed by the zone; None where one is not."""
    if ((ends - starts) <= len(zone)).any():
        return None
    ends = ends - len(zone)
    each = np.frombuffer(text, np.uint8)
    return None if any((each[ends + at] != code).any() for at, code in enumerate(zone)) else ends


def _of_one_width(text: bytes, starts: NDArray[np.intp], width: int, form: Form) -> Whole | None:
    """Times of one width, all of one form, or all missing."""
    if width == 0:
        return np.full(starts.size, NO_STAMP)
    first = text[starts[0] : starts[0] + width]
    match = _FORMS[form.kind].fullmatch(first)
    if match is None:
        different = {text[start : start + width] for start in starts.tolist()}
        are_missing = all(cell.decode("utf-8", "replace").strip().casefold() in _MISSING for cell in different)
        return np.full(starts.size, NO_STAMP) if are_missing else None
    # rows of one width are one table of bytes
    whole = np.ndarray((len(text) - width + 1,), f"V{width}", text, strides=(1,))
    return _of_one_form(whole[starts].view(np.uint8).reshape(-1, width), first, match)


def _of_one_form(each: NDArray[np.uint8], form: bytes, match: re.Match[bytes]) -> Whole | None:
    """Times all written like the first; None where one is not, or is no moment."""
    columns = np.ascontiguousarray(each.T)
    is_digit = np.array([chr(code).isdigit() for code in form])
    for column, digit, code in zip(columns, is_digit.tolist(), form, strict=True):
        if not digit and not (column == code).all():
            return None
    digits = columns - np.uint8(_ZERO)  # what is below wraps to large numbers
    if (digits[is_digit] > 9).any():
        return None
    parts = match.re.groupindex
    has_date = "date" in parts
    clock = _clock(digits, match, has_date=has_date) if "H" in parts else 0
    if clock is None or not has_date:
        return clock if isinstance(clock, np.ndarray) else None
    begin, end = match.span("date")
    dates = columns[begin:end]
    is_one_day = bool((dates == dates[:, :1]).all())
    day = _days(each[:1, begin:end] if is_one_day else each[:, begin:end])
    if day is None:
        return None
    moments: Whole = np.broadcast_to(day + clock, (each.shape[0],)).copy()
    return moments


def _clock(digits: NDArray[np.uint8], match: re.Match[bytes], *, has_date: bool) -> Whole | None:
    """Microseconds since midnight; None where one is no clock."""

    def number(part: str) -> Whole:
        begin, end = match.span(part)
        return _number(digits[max(0, begin) : max(0, end)])

    hours, minutes, seconds = number("H"), number("M"), number("S")
    if (has_date and (hours > 23).any()) or (minutes > 59).any() or (seconds > 59).any():
        return None
    fraction: Whole = number("f") * 10 ** (6 - len(match["f"] or b""))
    since_midnight: Whole = ((hours * 60 + minutes) * 60 + seconds) * _SECOND + fraction
    return since_midnight


def _number(digits: NDArray[np.uint8]) -> Whole:
    """Rows of digits as numbers; none is 0."""
    total = np.zeros(digits.shape[1], np.int64)
    for row in digits:
        total *= 10
        total += row
    return total


def _days(each: NDArray[np.uint8]) -> Whole | None:
    """Midnight of every date, in microseconds; a log has few of them."""
    dates = np.ascontiguousarray(each).view(f"S{each.shape[1]}").ravel()
    changes = np.concatenate(([0], np.flatnonzero(dates[1:] != dates[:-1]) + 1))
    midnights = np.empty(changes.size, np.int64)
    known: dict[bytes, int] = {}
    for at, row in enumerate(changes.tolist()):
        text = bytes(dates[row])
        if text not in known:
            day = _date(text)
            if day is None:
                return None
            known[text] = int(np.datetime64(day, "us").astype(np.int64))
        midnights[at] = known[text]
    return np.repeat(midnights, np.diff(np.append(changes, dates.size)))


def _date(text: bytes) -> date | None:
    match = _DATE_FORM.fullmatch(text)
    if match is None:
        return None
    year, month, day = (int(match[part] or match[f"{part}2"]) for part in "ymd")
    try:
        return date(year + 2000 if match["y2"] and len(match["y2"]) == 2 else year, month, day)
    except ValueError:
        return None
