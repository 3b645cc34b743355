"""Cells -> seconds: plain seconds, clocks, dates with a time, and dates beside clocks.

Times within a log are differences. A zone that stays the same is left out of them; the date is the one written.
"""

from __future__ import annotations

import re
from collections.abc import Iterable, Sequence
from contextlib import suppress
from dataclasses import dataclass, field
from datetime import UTC, date, datetime, time, timedelta, timezone
from typing import Any

import numpy as np
from numpy.typing import NDArray

from acceptance.bench.headings import shown
from acceptance.bench.packed import Packed
from acceptance.bench.stamps import Stamps
from acceptance.bench.values import MISSING, Cells, Column, Place, Worded

__all__ = ["Times", "parse_day", "read_dates", "read_times"]

_DAY = 86400.0
_MONTH_NAMES = ("jan", "feb", "mar", "apr", "may", "jun", "jul", "aug", "sep", "oct", "nov", "dec")
_MONTHS = {m: i + 1 for i, m in enumerate(_MONTH_NAMES)}
_MONTHS |= {"mai": 5, "okt": 10, "dez": 12, "mär": 3}
_MISSING = frozenset(word.casefold() for word in MISSING)

_STAMP = re.compile(
    r"""(?:
        (?P<y>\d{4})(?P<ys>[-/.])(?P<m>\d{1,2})(?P=ys)(?P<d>\d{1,2})
      | (?P<cy>\d{4})(?P<cm>\d{2})(?P<cd>\d{2})(?=T)
      | (?P<a>\d{1,2})(?P<s>[./-])(?P<b>\d{1,2})(?P=s)(?P<ay>\d{4}|\d{2})
      | (?P<nd>\d{1,2})[-\ ](?P<nm>[A-Za-zä]{3})[a-z]*[-\ ,]+(?P<ny>\d{4})
    )?
    (?:(?:^|T|[\s,;]+)(?:
        (?P<H>\d{1,4}):(?P<M>[0-5]\d)(?::(?P<S>[0-5]\d|60)(?:[.,](?P<f>\d{1,12})|:(?P<ms>\d{3}))?)?(?:\s*(?P<ap>[AaPp])\.?[Mm]\.?)?
      | (?P<cH>\d{2})(?P<cM>[0-5]\d)(?P<cS>[0-5]\d)?(?:[.,](?P<cf>\d{1,12}))?
    ))?
    (?:\s*(?P<z>Z|UTC|GMT|[+\-\u2212]\d{2}(?::?\d{2})?))?""",
    re.VERBOSE,
)


@dataclass(frozen=True, slots=True)
class Times:
    """When each row was taken."""

    seconds: Column  # as logged, or from the first row that has a clock; NaN where a cell is empty
    day: date | None = None  # the latest that a row lies in, where dates are written
    days_on: int = 0  # days, without a date: how many the last row lies after the first at the least
    started_at: datetime | None = None
    kind: str = "seconds"  # "seconds", "clock", "date and time"
    unit: str = "s"
    doubts: tuple[tuple[str, str], ...] = ()  # kind and text


@dataclass(frozen=True, slots=True)
class _Stamp:
    """One cell's parts."""

    day: int | None  # proleptic ordinal
    seconds: float | None  # since midnight
    zone: int | None  # s east of Greenwich
    either: tuple[int, int, int] | None = None  # a, b, year where day and month may be changed over


@dataclass(slots=True)
class _Order:
    """Which of two numbers in a date is the day, as far as the dates seen so far tell."""

    day_first: bool = False
    month_first: bool = False
    open: set[tuple[int, int, int]] = field(default_factory=set)

    def see(self, a: int, b: int, year: int) -> None:
        if a > 12 >= b:
            self.day_first = True
        elif b > 12 >= a:
            self.month_first = True
        elif a != b:
            self.open.add((a, b, year))


def read_times(
    cells: Cells, place: Place, *, unit_factor: float = 1.0, dates: tuple[Cells, Place] | None = None
) -> Times:
    """The times of a column, or of a column of clocks beside one of dates.

    Raises
    ------
    LogError
        At the first cell that is no time, or where dates that differ may be read in two ways.
    """
    if isinstance(cells, Stamps):
        if cells.form.is_clock:
            return Times(cells.seconds, kind="clock", days_on=cells.days_on, doubts=_midnights(cells.midnights))
        return Times(cells.seconds, cells.latest, started_at=cells.first, kind="date and time")
    if isinstance(cells, Packed):
        return _from_packed(cells, unit_factor)
    assert not isinstance(cells, Worded)  # a word is no time: such a log is read whole
    if isinstance(cells, np.ndarray):
        times = _from_datetimes(cells) if cells.dtype.kind == "M" else None
        return times or _from_seconds(cells * unit_factor)
    if dates is None:
        quick = _quick(cells)
        if quick is not None:
            return quick
        stamps, order = _stamps(cells, place)
    else:
        joined, order = _stamps(*dates)
        clocks, _ = _stamps(cells, place)
        stamps = [
            clock if clock is None or day is None or clock.day is not None
            else _Stamp(day.day, clock.seconds, clock.zone, day.either)
            for day, clock in zip(joined, clocks, strict=True)
        ]  # fmt: skip
    return _from_stamps(stamps, order, place if dates is None else dates[1])


def read_dates(cells: Cells, place: Place) -> tuple[date | None, tuple[tuple[str, str], ...]]:
    """The latest date of a column of dates, None where it may be read in two ways, and what is doubtful about it."""
    if isinstance(cells, Stamps):
        return cells.latest, ()
    if isinstance(cells, (Packed, Worded)):
        return None, ()
    if isinstance(cells, np.ndarray):
        times = _from_datetimes(cells) if cells.dtype.kind == "M" else None
        return (times.day if times else None), ()
    stamps, order = _stamps(cells, place)
    days, doubts = _days(stamps, order, place)
    known = [day for day in days if day is not None]
    return _latest(known), doubts


def _latest(days: Iterable[int | None]) -> date | None:
    """The latest of the days that are known, None where there is none."""
    number = max((day for day in days if day is not None), default=0)
    return date.fromordinal(number) if number > 0 else None


def parse_day(text: str) -> tuple[date | None, bool]:
    """The date a note tells, and whether the text is a date that may be read in two ways."""
    match = _STAMP.fullmatch(text.strip())
    if match is None:
        return None, False
    order = _Order()
    try:
        stamp = _stamp_of(match, order)
    except ValueError:
        return None, False
    if stamp.either is not None:
        day = _resolve(stamp.either, order)
        return (date.fromordinal(day) if day is not None else None), day is None
    return (date.fromordinal(stamp.day) if stamp.day is not None else None), False


# --- the quick way: a whole column in one form ----------------------------------------------------------------------


def _quick(cells: Sequence[object]) -> Times | None:
    """ISO dates with times, plain clocks, and a workbook's dates; None where a cell is anything else."""
    kinds = set(map(type, cells))
    if kinds <= {datetime, type(None)} and datetime in kinds:
        return _from_datetimes(np.array(cells, dtype="datetime64[us]"))
    first = next((cell for cell in cells if isinstance(cell, str) and cell), None)
    if first is None or kinds - {str, float, type(None)}:
        return None
    match = _STAMP.fullmatch(first.strip())
    if match is None:
        return None
    if match["y"] and match["ys"] == "-" and (match["H"] or match["cH"]):
        return _quick_iso(cells)
    if match["H"] and not match["ap"] and match["S"] and match.start("H") == 0 and not match["z"]:
        return _quick_clock(cells)
    return None


def _quick_iso(cells: Sequence[object]) -> Times | None:
    import pandas as pd

    if any(len(cell) < 15 for cell in cells[:: max(1, len(cells) // 64)] if isinstance(cell, str)):
        return None
    try:
        index: Any = pd.to_datetime(pd.Series(list[Any](cells), dtype=object), format="ISO8601")
        if index.dtype == object:  # several zones
            return None
        zone = index.dt.tz
        local = index.dt.tz_localize(None) if zone is not None else index
        stamps = local.to_numpy().astype("datetime64[us]")
    except (ValueError, TypeError, OverflowError):
        return None
    return _from_datetimes(stamps, zone)


def _quick_clock(cells: Sequence[object]) -> Times | None:
    import pandas as pd

    try:
        spans = pd.to_timedelta(pd.Series(list[Any](cells), dtype=object)).to_numpy().astype("timedelta64[us]")
    except (ValueError, TypeError, OverflowError):
        return None
    seconds = spans.astype(np.int64) / 1e6
    seconds[np.isnat(spans)] = np.nan
    return _from_clocks(seconds)


def _from_datetimes(stamps: NDArray[Any], zone: Any = None) -> Times | None:
    known = np.flatnonzero(~np.isnat(stamps))
    if not known.size:
        return None
    first = stamps[known[0]]
    seconds = (stamps - first).astype(np.int64) / 1e6
    seconds[np.isnat(stamps)] = np.nan
    started, latest = first.astype(datetime), stamps[known].max().astype(datetime)
    if not (isinstance(started, datetime) and isinstance(latest, datetime)):
        return None
    return Times(seconds, latest.date(), started_at=started.replace(tzinfo=zone), kind="date and time")


# --- the careful way: cell by cell ----------------------------------------------------------------------------------


def _stamps(cells: Cells, place: Place) -> tuple[list[_Stamp | None], _Order]:
    assert not isinstance(cells, (Packed, Worded, Stamps))
    order = _Order()
    known: dict[object, _Stamp | None] = {}
    stamps: list[_Stamp | None] = []
    for row, cell in enumerate(cells):
        key = (type(cell), cell)
        if key not in known:
            known[key] = _read_cell(row, cell, place, order)
        stamps.append(known[key])
    return stamps, order


def _read_cell(row: int, cell: object, place: Place, order: _Order) -> _Stamp | None:
    if cell is None or (isinstance(cell, float) and np.isnan(cell)):
        return None
    if isinstance(cell, datetime):
        return _Stamp(cell.toordinal(), _since_midnight(cell.time()), None)
    if isinstance(cell, date):
        return _Stamp(cell.toordinal(), None, None)
    if isinstance(cell, time):
        return _Stamp(None, _since_midnight(cell), None)
    if isinstance(cell, timedelta):
        return _Stamp(None, cell.total_seconds(), None)
    text = cell.strip() if isinstance(cell, str) else ""
    if isinstance(cell, str) and text.casefold() in _MISSING:
        return None
    match = _STAMP.fullmatch(text) if text else None
    stamp = None
    with suppress(ValueError):
        stamp = _stamp_of(match, order) if match is not None else None
    if stamp is not None:
        return stamp
    found = f'"{shown(cell, 30)}" under "{shown(place.heading)}" is not a time like the others'
    return place.refuse(row, found, "expected seconds, hh:mm:ss, or a date and time")


def _since_midnight(clock: time) -> float:
    return clock.hour * 3600 + clock.minute * 60 + clock.second + clock.microsecond / 1e6


def _stamp_of(match: re.Match[str], order: _Order) -> _Stamp:
    """The parts of a stamp; a ValueError where its numbers are no date or clock."""
    part = match.groupdict()
    day, either = None, None
    if part["y"] or part["cy"]:
        year, month, number = (part["y"], part["m"], part["d"]) if part["y"] else (part["cy"], part["cm"], part["cd"])
        day = date(int(year), int(month), int(number)).toordinal()
    elif part["ny"]:
        day = date(int(part["ny"]), _MONTHS.get(part["nm"].casefold(), 0), int(part["nd"])).toordinal()
    elif part["ay"]:
        a, b, year = int(part["a"]), int(part["b"]), int(part["ay"])
        if part["s"] == ".":
            day = date(year + 2000 if year < 100 else year, b, a).toordinal()
        elif year < 100:
            raise ValueError
        else:
            either = (a, b, year)
            order.see(a, b, year)
    seconds = _clock_of(part, has_day=day is not None or either is not None)
    if day is None and either is None and seconds is None:
        raise ValueError
    return _Stamp(day, seconds, _zone_of(part["z"]), either)


def _clock_of(part: dict[str, str | None], *, has_day: bool) -> float | None:
    if part["cH"] and not has_day:
        raise ValueError
    hours, minutes = part["H"] or part["cH"], part["M"] or part["cM"]
    if hours is None or minutes is None:
        return None
    fraction = part["f"] or part["ms"] or part["cf"]
    hour = int(hours)
    if part["ap"]:
        if not 1 <= hour <= 12:
            raise ValueError
        hour = hour % 12 + (12 if part["ap"].lower() == "p" else 0)
    if has_day and hour > 24:
        raise ValueError
    second = int(part["S"] or part["cS"] or 0) + (float(f"0.{fraction}") if fraction else 0.0)
    return hour * 3600 + int(minutes) * 60 + second


def _zone_of(text: str | None) -> int | None:
    if text is None:
        return None
    if text[0] in "ZUG":
        return 0
    digits = text[1:].replace(":", "")
    return (1 if text[0] == "+" else -1) * (int(digits[:2]) * 3600 + int(digits[2:] or 0) * 60)


def _resolve(either: tuple[int, int, int], order: _Order) -> int | None:
    """The day of a date whose numbers may be changed over, None where nothing tells their order."""
    a, b, year = either
    if a == b or (order.day_first != order.month_first):
        day, month = (b, a) if order.month_first and a != b else (a, b)
        return date(year, month, day).toordinal()
    return None


def _days(
    stamps: Iterable[_Stamp | None], order: _Order, place: Place
) -> tuple[list[int | None], tuple[tuple[str, str], ...]]:
    """Each row's day; days from 0 where all dates are one that may be read in two ways."""
    whole = list(stamps)
    if order.day_first and order.month_first:
        place.refuse(
            -1, f'the dates under "{shown(place.heading)}" put the day now first, now second', "expected one form"
        )
    unknown = order.open and not (order.day_first or order.month_first)
    written = {stamp.either for stamp in whole if stamp is not None and stamp.either is not None}
    if unknown and len(written) > 1:
        a, b, year = min(order.open)
        found = f'the dates under "{shown(place.heading)}", such as {a:02}/{b:02}/{year}, may be day/month or month/day'
        place.refuse(0, found, "write dates as 2026-05-04")
    try:
        days = [_day_of(stamp, order, unknown=bool(unknown)) for stamp in whole]
    except ValueError:
        place.refuse(-1, f'a date under "{shown(place.heading)}" does not exist', "expected dates as 2026-05-04")
    if not unknown:
        return days, ()
    a, b, year = next(iter(written))
    which = f'the date {a:02}/{b:02}/{year} under "{shown(place.heading)}"'
    text = f"{which} may be day/month or month/day: no test date is taken"
    return days, (("ambiguous date", text),)


def _day_of(stamp: _Stamp | None, order: _Order, *, unknown: bool) -> int | None:
    if stamp is None or stamp.either is None:
        return stamp.day if stamp is not None else None
    return 0 if unknown else _resolve(stamp.either, order)


def _from_stamps(stamps: Sequence[_Stamp | None], order: _Order, place: Place) -> Times:
    days, doubts = _days(stamps, order, place)
    known = [row for row, stamp in enumerate(stamps) if stamp is not None]
    if not known:
        return Times(np.full(len(stamps), np.nan))
    has_day = days[known[0]] is not None
    zones = {stamp.zone for stamp in stamps if stamp is not None}
    seconds = np.full(len(stamps), np.nan)
    for row in known:
        stamp, day = stamps[row], days[row]
        assert stamp is not None
        if (day is not None) != has_day or stamp.seconds is None or ((stamp.zone is None) != (None in zones)):
            found = f'a time under "{shown(place.heading)}" has another form than the first'
            place.refuse(row, found, "expected one form of times in a column")
        shift = (stamp.zone or 0) if len(zones) > 1 else 0
        seconds[row] = ((day - (days[known[0]] or 0)) * _DAY if day is not None else 0.0) + stamp.seconds - shift
    if not has_day:
        return _from_clocks(seconds, doubts=doubts)
    first = stamps[known[0]]
    assert first is not None
    number = days[known[0]] or 0
    begun = date.fromordinal(number) if number > 0 else None
    started = _started(begun, first)
    return Times(
        _whole(seconds - seconds[known[0]]), _latest(days), started_at=started, kind="date and time", doubts=doubts
    )


def _started(day: date | None, stamp: _Stamp) -> datetime | None:
    if day is None or stamp.seconds is None or stamp.seconds >= _DAY:
        return None
    zone = None if stamp.zone is None else (UTC if stamp.zone == 0 else timezone(timedelta(seconds=stamp.zone)))
    midnight = datetime(day.year, day.month, day.day, tzinfo=zone)
    return midnight + timedelta(seconds=round(stamp.seconds, 6))


def _past_midnight(seconds: NDArray[np.float64]) -> tuple[NDArray[np.float64], tuple[tuple[str, str], ...]]:
    """Clock times carried on past midnight: a step back by more than half a day is a new day."""
    known = np.flatnonzero(~np.isnan(seconds))
    if known.size < 2 or np.nanmax(seconds) >= _DAY:
        return seconds, ()
    crossed = np.diff(seconds[known]) < -_DAY / 2
    count = int(crossed.sum())
    if not count:
        return seconds, ()
    carried = seconds.copy()
    carried[known[1:]] += _DAY * np.cumsum(crossed)
    return carried, _midnights(count)


def _midnights(count: int) -> tuple[tuple[str, str], ...]:
    if not count:
        return ()
    times = "once" if count == 1 else f"{count} times"
    return (("midnight", f"the clock passes midnight {times}; a day was added each time"),)


def _whole(seconds: NDArray[np.float64]) -> NDArray[np.float64]:
    """Differences of times as they were written: to a microsecond, without what a float loses of the hour."""
    rounded: NDArray[np.float64] = np.rint(seconds * 1e6) / 1e6
    return rounded


def _from_clocks(seconds: NDArray[np.float64], *, doubts: tuple[tuple[str, str], ...] = ()) -> Times:
    """Clocks from the first row, carried on past midnight."""
    carried, past = _past_midnight(seconds)
    known = carried[np.isfinite(carried)]
    start = float(known[0]) if known.size else 0.0
    # a clock beyond 24 h counts from the start of something: only what it ran through is known
    since = 0.0 if past else start
    days = int((known.max() - since) // _DAY) if known.size else 0
    return Times(_whole(carried - start), kind="clock", days_on=days, doubts=doubts + past)


def _from_seconds(seconds: NDArray[np.float64]) -> Times:
    """Plain seconds as they were logged, since they count from something that matters."""
    known = seconds[np.isfinite(seconds)]
    return Times(seconds, days_on=int((known.max() - known.min()) // _DAY) if known.size else 0)


def _from_packed(cells: Packed, unit_factor: float) -> Times:
    """The same for a packed column."""
    seconds = cells.converted(unit_factor, 0.0) if unit_factor != 1.0 else cells
    low, high = seconds.extent()
    return Times(seconds, days_on=int((high - low) // _DAY) if np.isfinite(low) and np.isfinite(high) else 0)
