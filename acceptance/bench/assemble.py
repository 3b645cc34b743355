"""One raw table -> its samples in SI units, its channels, and what is doubtful about them."""

from __future__ import annotations

from collections.abc import Callable, Iterable, Sequence
from dataclasses import dataclass, field, replace
from datetime import date, datetime

import numpy as np
from numpy.typing import NDArray

from acceptance.bench.clocks import Times, read_dates, read_times
from acceptance.bench.digits import coarser_step, logged_step, written_decimals
from acceptance.bench.headings import Heading, plain, resolve_unit, shown
from acceptance.bench.log import Channel, Span, channel_key
from acceptance.bench.packed import Packed
from acceptance.bench.stamps import Stamps
from acceptance.bench.table import RawColumn, RawTable, Source
from acceptance.bench.values import Column, Readings, Worded, to_readings
from acceptance.bench.words import Words, each_word
from acceptance.errors import LogError
from acceptance.units import KINDS, UNITS, Unit

__all__ = ["Samples", "assemble", "spans_of"]

_SETTING_UNITS = {"CC": "A", "CR": "ohm", "CV": "V", "CP": "W"}
_MODES = {
    "cc": "CC", "cr": "CR", "cv": "CV", "cp": "CP", "cw": "CP", "constant current": "CC", "constant resistance": "CR",
    "constant voltage": "CV", "constant power": "CP",
}  # fmt: skip
_EPOCH_IN_MILLISECONDS = 1e11  # as seconds this is the year 5138


@dataclass(slots=True)
class Samples:
    """What one table gives to the log."""

    name: str
    file: str
    sheet: str
    lines: NDArray[np.int64] | Packed
    numbers: dict[str, Column] = field(default_factory=dict)  # channel key -> SI values
    texts: dict[str, Sequence[str]] = field(default_factory=dict)  # "stage", "serial", "load_mode ..."; "" where empty
    channels: list[Channel] = field(default_factory=list)
    missing: dict[str, tuple[NDArray[np.intp], str]] = field(default_factory=dict)  # key -> rows, first place
    over_range: dict[str, tuple[NDArray[np.intp], str]] = field(default_factory=dict)
    doubts: list[tuple[str, str]] = field(default_factory=list)  # kind and text
    chosen: set[str] = field(default_factory=set)  # channels whose heading the limits or bench file names
    day: date | None = None  # the latest that a sample lies in, where dates are written
    days_on: int = 0  # without a date, how many days the last sample lies after the first at the least
    started_at: datetime | None = None

    def __len__(self) -> int:
        return len(self.lines)


def assemble(table: RawTable, source: Source, *, load_mode: str | None = None) -> Samples:
    """The samples of a table.

    Parameters
    ----------
    load_mode
        Tells the unit of a load setting without one.

    Raises
    ------
    LogError
        Where two columns claim one channel, a unit is of the wrong kind, or a cell is no number.
    """
    samples = Samples(table.name, table.file, table.sheet, table.lines)
    columns = _claims(table, source)
    samples.chosen = {column.heading.key for column in columns if column.heading.is_chosen}
    _take_time(samples, table, [column for column in columns if column.heading.quantity == "time"])
    for column in columns:
        heading = column.heading
        if heading.quantity == "time":
            continue
        if heading.is_number:
            _take_numbers(samples, table, column, _mode(columns, load_mode))
        else:
            _take_texts(samples, table, column)
    _refuse_nothing(samples, table)
    return samples


def spans_of(rows: NDArray[np.intp], offset: int = 0) -> tuple[Span, ...]:
    """Row numbers in order as spans of neighbours."""
    if not rows.size:
        return ()
    cuts = np.flatnonzero(np.diff(rows) > 1)
    firsts = rows[np.concatenate(([0], cuts + 1))]
    lasts = rows[np.concatenate((cuts, [rows.size - 1]))]
    return tuple((int(a) + offset, int(b) + 1 + offset) for a, b in zip(firsts, lasts, strict=True))


# --- one column a channel -------------------------------------------------------------------------------------------


def _claims(table: RawTable, source: Source) -> list[RawColumn]:
    """The columns to read: one a channel, a date beside a clock excepted."""
    kept: dict[tuple[str, bool], RawColumn] = {}
    by_file = {column.heading.key for column in table.columns if column.heading.is_chosen}
    for column in table.columns:
        key = column.heading.key
        if key in by_file and not column.heading.is_chosen and not column.heading.is_date:
            reason = f"the limits or bench file names another column for {_words(key)}"
            source.ignore(f'column "{shown(column.heading.text)}"', reason, file=table.name)
            continue
        claim = (key, column.heading.is_date)
        if claim in kept:
            _refuse_two(table, kept[claim], column)
        kept[claim] = column
    return list(kept.values())


def _refuse_two(table: RawTable, first: RawColumn, second: RawColumn) -> None:
    key = first.heading.key
    found = f'"{shown(first.heading.text)}" and "{shown(second.heading.text)}" are both {_words(key)}'
    file = f'{table.file}, sheet "{shown(table.sheet)}"' if table.sheet else table.file
    expected = f'name one of them in the limits or bench file, under log: columns: {{{key}: "..."}}'
    if plain(first.heading.text) == plain(second.heading.text):
        expected = "rename one of them in the file"
    raise LogError(file, found, expected, line=table.heading_line, column=second.position)


def _words(key: str) -> str:
    return key.replace("_", " ")


def _mode(columns: Sequence[RawColumn], load_mode: str | None) -> str | None:
    for column in columns:
        if column.heading.quantity == "load_mode":
            cells = _texts_of(column)
            modes = {_mode_text(cell) for cell in (cells.words if isinstance(cells, Words) else cells)} - {""}
            return modes.pop() if len(modes) == 1 else load_mode
    return load_mode


def _texts_read(cells: Iterable[object], read: Callable[[object], str]) -> list[str]:
    known: dict[object, str] = {}
    texts = []
    for cell in cells:
        key = (type(cell), cell)
        if key not in known:
            known[key] = read(cell)
        texts.append(known[key])
    return texts


def _texts_of(column: RawColumn) -> Iterable[object]:
    assert isinstance(column.cells, (Sequence, np.ndarray))  # only readings are packed
    return column.cells


def _mode_text(cell: object) -> str:
    text = _text(cell)
    return _MODES.get(text.casefold(), text)


def _text(cell: object) -> str:
    """A text cell as written; a workbook's 7.0 is 7."""
    if cell is None or (isinstance(cell, float) and cell != cell):
        return ""
    if isinstance(cell, float) and cell.is_integer():
        return str(int(cell))
    return str(cell).strip()


def _take_texts(samples: Samples, table: RawTable, column: RawColumn) -> None:
    heading = column.heading
    read = _mode_text if heading.quantity == "load_mode" else _text
    cells = _texts_of(column)
    texts = each_word(cells, read) if isinstance(cells, Words) else _texts_read(cells, read)
    samples.texts[heading.key] = each_word(texts, str.lower) if heading.quantity == "stage" else texts
    samples.channels.append(_channel(table, heading, "", "not a number", None))


# --- numbers --------------------------------------------------------------------------------------------------------


def _take_numbers(samples: Samples, table: RawTable, column: RawColumn, mode: str | None) -> None:
    heading = column.heading
    unit, unit_from = _unit(table, column)
    place = table.place(column)
    readings = to_readings(
        column.cells, place, unit=unit, kind=heading.kind, decimal=table.decimal, thousands=table.thousands
    )
    samples.numbers[heading.key] = readings.values
    _note_gaps(samples, heading.key, readings, place.at)
    symbol, source = heading.unit or column.unit_below, unit_from
    if unit is None:
        symbol, source = (readings.cell_unit, "cells") if readings.cell_unit else (_assumed(heading, mode), "assumed")
    channel = _channel(table, heading, symbol, source, unit if source != "assumed" else UNITS.get(symbol))
    known = UNITS.get(symbol) or unit
    factor = abs(known.factor) if known is not None else 1.0
    samples.channels.append(replace(channel, step=_step(column, readings, factor)))


# what is measured, not set: a load may well read 2.000 A, a voltage that is always a whole tenth was rounded to it
_NEVER_ROUND = frozenset({"output_voltage", "input_power", "input_current", "ripple"})


def _step(column: RawColumn, readings: Readings, factor: float) -> float:
    """What one unit of the last digit written is. [SI]"""
    cells = column.cells
    decimals = column.decimals
    if decimals is None and isinstance(cells, Sequence):
        texts = [cell for cell in cells[:: max(1, len(cells) // 300)] if isinstance(cell, str)]
        decimals = written_decimals(texts)
    if decimals is None:
        return logged_step(readings.values, factor)
    written = factor * 10.0**-decimals
    if column.heading.quantity not in _NEVER_ROUND:
        return written
    return max(written, coarser_step(readings.values, factor, decimals))


def _note_gaps(samples: Samples, key: str, readings: Readings, at: object) -> None:
    for rows, kept in ((readings.missing, samples.missing), (readings.over_range, samples.over_range)):
        if rows.size:
            kept[key] = (rows, at(int(rows[0])) if callable(at) else "")


def _unit(table: RawTable, column: RawColumn) -> tuple[Unit | None, str]:
    """The unit that stands in limits file, heading or row below, and where; None where none of them tells."""
    heading = column.heading
    found: list[tuple[Unit, str]] = []
    for text, where in ((heading.unit, heading.unit_from), (column.unit_below, "row below")):
        if text:
            lower = heading.is_lower and where == "heading"
            found.append((_checked(table, column, text, resolve_unit(text, heading.kind, lower=lower)), where))
    if not found:
        return None, ""
    if len(found) == 2 and found[0][1] == "heading" and _si(found[0][0]) != _si(found[1][0]):
        text = f'"{shown(heading.text)}" has the unit {found[0][0].symbol}, and the row below it {found[1][0].symbol}'
        raise LogError(table.file, text, "expected one unit", line=table.heading_line, column=column.position)
    return found[0]


def _si(unit: Unit) -> tuple[str, float, float]:
    return unit.kind, unit.factor, unit.offset


def _checked(table: RawTable, column: RawColumn, text: str, unit: Unit | None) -> Unit:
    heading = column.heading
    kinds = ("current", "resistance", "voltage", "power") if heading.kind == "any" else (heading.kind,)
    if unit is not None and unit.kind in kinds:
        return unit
    what = f"the unit {shown(text)} is a {unit.kind}" if unit else f'"{shown(text)}" is no known unit'
    found = f'"{shown(heading.text)}" is {_words(heading.key)}, and {what}'
    wanted = " or ".join(f"a {kind}" for kind in kinds)
    expected = f"expected a unit of {wanted}, or name the column's meaning and unit under log: columns:"
    raise LogError(table.file, found, expected, line=table.heading_line, column=column.position)


def _assumed(heading: Heading, mode: str | None) -> str:
    if heading.kind == "ratio":
        return ""
    if heading.kind != "any":
        return KINDS[heading.kind]
    word = heading.text.strip().casefold()
    if word.startswith("i"):
        return "A"
    return "ohm" if word.startswith("r") else _SETTING_UNITS.get(mode or "", "")


def _channel(table: RawTable, heading: Heading, symbol: str, unit_from: str, unit: Unit | None) -> Channel:
    reason = heading.reason
    if unit_from == "row below":
        reason += f"; unit {shown(symbol)} in the row below"
    elif unit_from == "cells":
        reason += f"; unit {shown(symbol)} in the cells"
    elif unit_from == "limits file":
        reason += f"; unit {shown(symbol)} from there"
    elif unit_from == "assumed":
        reason += f"; no unit is written, {symbol} assumed" if symbol else "; no unit is written"
    factor, offset = (unit.factor, unit.offset) if unit is not None else (1.0, 0.0)
    return Channel(
        heading.key,
        heading.quantity,
        heading.qualifier,
        heading.text,
        symbol,
        unit_from,
        factor,
        offset,
        reason,
        table.name,
    )


def _refuse_nothing(samples: Samples, table: RawTable) -> None:
    measured = {key: values for key, values in samples.numbers.items() if key != "time"}
    file = f'{table.file}, sheet "{shown(table.sheet)}"' if table.sheet else table.file
    if not measured:
        found = "no measured quantity is among the headings"
        expected = "name the columns under log: columns: in the limits or bench file"
        raise LogError(file, found, expected, line=table.heading_line, column=1)
    if all(_is_empty(values) for values in measured.values()):
        raise LogError(file, "no reading stands under the headings", "expected one row of numbers for each sample")


def _is_empty(values: Column) -> bool:
    if isinstance(values, Packed):
        return all(np.isnan(part).all() for _, part in values.parts())
    return bool(np.isnan(values).all())


# --- time -----------------------------------------------------------------------------------------------------------


def _take_time(samples: Samples, table: RawTable, columns: Sequence[RawColumn]) -> None:
    """Time from its column; from a date and a clock beside each other; or only the day from a date alone."""
    if not columns:
        return
    dates = next((column for column in columns if column.heading.is_date), None)
    clock = next((column for column in columns if not column.heading.is_date), None)
    if clock is None:
        assert dates is not None
        times = _times(table, dates, None) if _has_clock(dates) else None
        if times is None:
            samples.day, doubts = read_dates(dates.cells, table.place(dates))
            samples.doubts += doubts
            samples.channels.append(_channel(table, dates.heading, "", "not a number", None))
            return
        clock = dates
    elif dates is not None and isinstance(clock.cells, Sequence):
        times = _times(table, clock, dates)
    else:
        times = _times(table, clock, None)
        if dates is not None:
            day, doubts = read_dates(dates.cells, table.place(dates))
            times = replace(times, day=day, doubts=(*times.doubts, *doubts))
    _keep_times(samples, table, clock, times)
    if dates is not None and dates is not clock:
        samples.channels.append(_channel(table, dates.heading, "", "not a number", None))


def _has_clock(column: RawColumn) -> bool:
    """Whether the cells of a column headed "date" carry a time of day."""
    if not isinstance(column.cells, Sequence):
        return True
    first = next((cell for cell in column.cells if cell not in (None, "")), None)
    if isinstance(first, datetime):
        return any(isinstance(c, datetime) and (c.hour or c.minute or c.second) for c in column.cells)
    return isinstance(first, str) and ":" in first


def _times(table: RawTable, column: RawColumn, dates: RawColumn | None) -> Times:
    place = table.place(column)
    if dates is not None:
        return read_times(column.cells, place, dates=(dates.cells, table.place(dates)))
    cells = column.cells
    unit, _ = _unit(table, column)
    if isinstance(cells, Sequence) and _is_numeric(cells):
        cells = to_readings(
            cells, place, unit=None, kind="time", decimal=table.decimal, thousands=table.thousands
        ).values
    if (
        unit is None
        and not isinstance(cells, (Sequence, Stamps, Worded))
        and (isinstance(cells, Packed) or cells.dtype.kind == "f")
        and _farthest(cells) > _EPOCH_IN_MILLISECONDS
    ):
        found = f'the numbers under "{shown(column.heading.text)}" are too large for seconds'
        place.refuse(0, found, "write the unit into the heading, such as (ms)")
    return read_times(cells, place, unit_factor=unit.factor if unit else 1.0)


def _farthest(times: Column) -> float:
    if isinstance(times, Packed):
        low, high = times.extent()
        return max(-low, high)
    return float(np.nanmax(np.abs(times), initial=0))


def _is_numeric(cells: Sequence[object]) -> bool:
    """Whether plain numbers stand in a column of times that also has empty or worded cells."""
    first = next((cell for cell in cells if cell not in (None, "")), None)
    if isinstance(first, str):
        text = first.strip()
        return ":" not in text and text.count("-") < 2 and text.count("/") < 2 and text.count(".") < 2
    return isinstance(first, (int, float)) and not isinstance(first, bool)


def _keep_times(samples: Samples, table: RawTable, column: RawColumn, times: Times) -> None:
    heading = column.heading
    key = channel_key("time")
    samples.numbers[key] = times.seconds
    samples.day, samples.days_on, samples.started_at = times.day, times.days_on, times.started_at
    samples.doubts += times.doubts
    rows = times.seconds.missing() if isinstance(times.seconds, Packed) else np.flatnonzero(np.isnan(times.seconds))
    if rows.size:
        samples.missing[key] = (rows, table.place(column).at(int(rows[0])))
    if times.kind != "seconds":
        samples.channels.append(_channel(table, heading, "", "not a number", None))
        return
    unit, unit_from = _unit(table, column)
    symbol = (heading.unit or column.unit_below) if unit else "s"
    samples.channels.append(_channel(table, heading, symbol, unit_from if unit else "assumed", unit or UNITS["s"]))
