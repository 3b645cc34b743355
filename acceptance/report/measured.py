"""What was measured: the figures, and the readings of every dwell."""

from __future__ import annotations

import re
from collections.abc import Sequence
from dataclasses import replace
from itertools import groupby

from acceptance.printing import DASH, column, count, difference_unit, printed, scale_for
from acceptance.record import Figure, Output, Point, Reading, Record
from acceptance.report.blocks import Beside, Block, Halves, Text, heading
from acceptance.report.charts import Chart
from acceptance.report.style import COLUMN, DENSE, DENSE_BOLD, DENSE_MUTED, SMALL, WIDTH
from acceptance.report.table import Cell, Column, Row, Table, natural_width
from acceptance.report.wrap import Run, fold

__all__ = ["apart", "channel_name", "figures", "points"]

_GAP = 22.0
_HALF = (WIDTH - _GAP) / 2


def figures(record: Record) -> list[Block]:
    """The figures in the record's order, two side by side; of an odd number the fullest over the whole width."""
    listed = record.figures
    if not listed:
        return []
    blocks: list[Block] = [heading("Figures")]
    alone = _fullest(listed) if len(listed) % 2 else None
    place = 0
    while place < len(listed):
        if place == alone:
            blocks.append(Chart(listed[place], WIDTH, _WIDE, above=9))
            place += 1
            continue
        pair = listed[place : place + 2]
        blocks.append(_Pair(pair, _TALL if any(map(_is_annotated, pair)) else _MIDDLE))
        place += 2
    return [*blocks, Text(_signs(listed), SMALL, above=6)]


_LOW, _MIDDLE, _TALL, _WIDE = 108.0, 128.0, 150.0, 152.0  # heights of plots [pt]


class _Pair(Beside):
    """Two figures, their plots level with one another; lower where that saves half a page from staying empty."""

    def __init__(self, pair: Sequence[Figure], plot_height: float) -> None:
        self._pair = pair
        self._plot_height = plot_height
        charts = [Chart(figure, _HALF, plot_height) for figure in pair]
        for chart in charts:
            chart.align(max(each.head for each in charts))
        super().__init__([(0.0, charts[0]), (_HALF + _GAP, charts[1])], above=9)

    @property
    def least(self) -> float:
        return self.height - self._plot_height + _LOW

    def split(self, room: float) -> Halves:
        if self.height <= room:
            return self, None
        if self.least > room:
            return None, self
        lower = _Pair(self._pair, self._plot_height - (self.height - room))
        # a label that no longer finds room takes a line beneath the plot
        return (lower, None) if lower.height <= room + 1e-6 else (None, self)


def _is_annotated(figure: Figure) -> bool:
    return bool(figure.marks or figure.regions)


def _fullest(listed: Sequence[Figure]) -> int:
    """Place of the figure with the most to be told apart, the last of equals; pairs stay together before it."""
    fullness = [4 * len(f.marks) + 4 * len(f.regions) + len(f.series) for f in listed]
    return max(range(0, len(listed), 2), key=lambda place: (fullness[place], place))


def _signs(listed: Sequence[Figure]) -> str:
    """What the figures' signs mean, of those that are there."""
    texts = []
    if any(figure.limits for figure in listed):
        texts.append("Short strokes at a limit stand on the side that is not allowed.")
    bars = [u for f in listed for s in f.series if s.kind == "points" for u in s.expanded_uncertainty]
    marks = [mark for figure in listed for mark in figure.marks]
    if any(u is not None for u in [*bars, *(mark.expanded_uncertainty for mark in marks)]):
        texts.append("Bars: expanded uncertainty.")
    if marks:
        texts.append("Rings and dash-dotted lines: the places named beside them.")
    return " ".join(texts)


# -- points

Readings = tuple[str, list[str]]  # heading, and one text for each dwell

_PLACE = re.compile(r"(.*), lines? (\d.*)", re.DOTALL)
_NUMBER = Column("No.", 26, "right")
_ELECTRICAL = ("voltage", "current", "power", "power_factor")


def points(record: Record) -> list[Block]:
    """Dwells: where each lies, and the mean reading of each channel with twice its standard uncertainty.

    Those of the steady test, and whatever else a finding was formed from: a mean over bursts, or over a winding that
    cools, tells nothing.
    """
    used = {at.point for finding in record.findings for at in finding.points}
    listed = [point for point in record.points if point.stage == "steady" or point.index in used]
    if not listed:
        return []
    left_out = len(record.points) - len(listed)
    record = replace(record, points=listed)
    first, left = _places(record)
    note = (
        "n: samples in the dwell. Effective: as many independent samples as the output voltage's scatter is worth. "
        "Settling: samples left out before the dwell. Readings: mean ± expanded uncertainty, k = 2 (efficiency: as "
        "judged); without ± the instrument's accuracy is not stated."
    )
    if left_out:
        dwells = "1 dwell" if left_out == 1 else f"{left_out} dwells"
        note += f" Of other stages, in the record alone since no finding rests on a mean of them: {dwells}."
    return [
        heading("Dwells"),
        Text(note, SMALL, above=1, keep_next=True),
        first,
        *(
            table
            for group in _groups(record, left)
            for table in _reading_tables(group, [str(point.index + 1) for point in listed])
        ),
    ]


def _places(record: Record) -> tuple[Table, list[Readings]]:
    """The table of where each dwell lies and how it was loaded, and the columns that found no room in it."""
    listed = record.points
    seconds = scale_for("", [], per_cent=False)
    columns = [
        ("Begins\ns", column([point.starts for point in listed], seconds, digits=8)),
        ("Lasts\ns", column([point.duration for point in listed], seconds, digits=4)),
        ("n", [count(point.readings) for point in listed]),
        ("Effective", [_effective(point) for point in listed]),
        ("Settling", [count(point.settling) for point in listed]),
        *_loads(listed),
        *_efficiency(listed),
    ]
    lines = [fold(apart(point.where)[1]) for point in listed]
    room = max(62.0, min(150.0, natural_width(lines, DENSE)))
    widths = [_width(one, least=38.0) for one in columns]
    while len(columns) > 5 and _NUMBER.width + room + sum(widths) > WIDTH:
        widths.pop()
        columns.pop()
    left = [*_loads(listed), *_efficiency(listed)][len(columns) - 5 :]
    spare = (WIDTH - _NUMBER.width - room - sum(widths)) / (len(columns) + 1)
    heads = [
        _NUMBER,
        Column("Lines", room + spare),
        *(Column(one[0], width + spare, "right") for one, width in zip(columns, widths, strict=True)),
    ]
    sources = [_source(point, record.ratings.outputs) for point in listed]
    rows: list[Row] = []
    for source, group in groupby(range(len(listed)), key=sources.__getitem__):
        if any(source):
            texts = (Run(source[0], DENSE_BOLD), Run("   " if all(source) else "", DENSE), Run(source[1], DENSE_MUTED))
            rows.append(Row([Cell([[text for text in texts if text.text]])], span=True, tinted=True))
        rows += [Row([str(listed[n].index + 1), lines[n], *(one[1][n] for one in columns)]) for n in group]
    return Table(heads, rows, above=3, style=DENSE), left


def _source(point: Point, outputs: Sequence[Output]) -> tuple[str, str]:
    """The table that a dwell lies in, and its stage with what told it from its neighbours."""
    stage = f"stage {fold(point.stage)}" if point.stage.strip() else ""
    found_by = fold(point.found_by)
    lead, mark, channel = found_by.rpartition("found in ")
    if mark and not lead:
        found_by = "taken whole" if channel == "no channel" else mark + channel_name(channel, outputs)
    elif found_by:
        found_by = f"told apart by {found_by.replace('_', ' ')}"
    return fold(apart(point.where)[0]), ", ".join(part for part in (stage, found_by) if part)


def apart(where: str) -> tuple[str, str]:
    """A place in a log as its table and the lines of it: ("A-17.csv", "31 to 90"); no table where none is named."""
    found = _PLACE.fullmatch(where)
    return (found[1], found[2]) if found else ("", where)


def _effective(point: Point) -> str:
    """Of the output voltage; the least where there are several outputs."""
    known = [
        reading.effective_readings
        for name, reading in point.channels.items()
        if name.partition(" ")[0] == "output_voltage" and reading.effective_readings is not None
    ]
    return count(round(min(known))) if known and min(known) < 1e15 else DASH


def _loads(listed: Sequence[Point]) -> list[Readings]:
    names = dict.fromkeys(name for point in listed for name in point.load_fractions)
    scale = scale_for("", [])
    found = []
    for name in names:
        shares = [point.load_fractions.get(name) for point in listed]
        # a tenth of a per cent is enough to tell loads apart
        texts = [DASH if share is None else scale.fixed(share, 1) for share in shares]
        found.append((f"Load\n{name}\n%" if len(names) > 1 and name else "Load\n%", texts))
    return found


def _channels(record: Record) -> list[tuple[bool, Readings]]:
    """Each channel's column, and whether it is one of the electrical ones."""
    names = dict.fromkeys(name for point in record.points for name in point.channels)
    found = []
    for name in names:
        readings = [point.channels.get(name) for point in record.points]
        title = _title(name, record.ratings.outputs)
        # a channel has one unit; should a record hold several, each text carries its own
        units = {reading.unit for reading in readings if reading is not None}
        texts = _one_unit(title, readings, units.pop()) if len(units) == 1 else _own_units(title, readings)
        found.append((name.partition(" ")[0].endswith(_ELECTRICAL), texts))
    return found


def _groups(record: Record, left: list[Readings]) -> list[list[Readings]]:
    """The columns that go together: all of them where there is room, else the electrical ones apart from the others."""
    channels = _channels(record)
    together = [*left, *(readings for _, readings in channels)]
    if _NUMBER.width + sum(map(_width, together)) <= WIDTH:
        return [together] if together else []
    electrical = [*left, *(readings for is_electrical, readings in channels if is_electrical)]
    others = [readings for is_electrical, readings in channels if not is_electrical]
    return [group for group in (electrical, others) if group]


def channel_name(channel: str, outputs: Sequence[Output]) -> str:
    """A channel as it is spoken of; an output is named only where there are several."""
    quantity, _, of = channel.partition(" ")
    only = len(outputs) == 1 and of == outputs[0].name and not quantity.endswith("temperature")
    return quantity.replace("_", " ") if only or not of else f"{quantity.replace('_', ' ')} {of}"


def _title(channel: str, outputs: Sequence[Output]) -> str:
    """A channel's name over its column, the output or the probe on a line of its own."""
    quantity, _, of = channel.partition(" ")
    shown = channel_name(channel, outputs)
    title = shown.removesuffix(f" {of}") if of and shown.endswith(f" {of}") else shown
    title = title[:1].upper() + title[1:]
    return f"{title}\n{of}" if of and shown != quantity.replace("_", " ") else title


def _one_unit(title: str, readings: Sequence[Reading | None], unit: str) -> Readings:
    values = [None if reading is None else reading.value for reading in readings]
    scale = scale_for(unit, values, per_cent=False)
    texts = column(values, scale, expanded=[_twice(reading) for reading in readings])
    return f"{title}\n{scale.symbol}" if scale.symbol else title, texts


def _twice(reading: Reading | None) -> float | None:
    u = None if reading is None else reading.standard_uncertainty
    return None if u is None else 2 * u


def _own_units(title: str, readings: Sequence[Reading | None]) -> Readings:
    texts = []
    for reading in readings:
        if reading is None:
            texts.append(DASH)
            continue
        found = printed(reading.value, _twice(reading), reading.unit, per_cent=False)
        bare = found.expanded == DASH
        value = found.value if bare or difference_unit(found.unit) == found.unit else found.with_unit(found.value)
        texts.append(found.with_unit(value) if bare else f"{value} ± {found.with_difference_unit(found.expanded)}")
    return title, texts


def _efficiency(listed: Sequence[Point]) -> list[Readings]:
    if all(point.efficiency is None for point in listed):
        return []
    bounds = [point.efficiency_expanded_uncertainty for point in listed]
    texts = column([point.efficiency for point in listed], scale_for("", []), expanded=bounds)
    return [("Efficiency\n%", texts)]


def _width(readings: Readings, least: float = 44.0) -> float:
    """Width that none of the column's numbers, and as far as sensible no word of its title, needs to be broken in."""
    title, texts = readings
    word = min(natural_width(title.split(), COLUMN), 90.0)
    return min(max(natural_width(texts, DENSE), word, least), WIDTH - _NUMBER.width)


def _reading_tables(columns: Sequence[Readings], numbers: Sequence[str]) -> list[Table]:
    """The columns in as few tables as hold them, about as many in each, with the number of the dwell before them."""
    widths = [_width(one) for one in columns]
    room = WIDTH - _NUMBER.width
    tables = _filled(widths, room)
    fair = sum(widths) / len(tables) + max(widths) / 2
    if len(balanced := _filled(widths, min(fair, room))) == len(tables):
        tables = balanced
    return [_reading_table([columns[n] for n in chosen], [widths[n] for n in chosen], numbers) for chosen in tables]


def _filled(widths: Sequence[float], room: float) -> list[list[int]]:
    """Places of the columns, in order, in tables of so much room."""
    tables: list[list[int]] = [[]]
    used = 0.0
    for place, width in enumerate(widths):
        if tables[-1] and used + width > room:
            tables.append([])
            used = 0.0
        tables[-1].append(place)
        used += width
    return tables


def _reading_table(columns: Sequence[Readings], widths: Sequence[float], numbers: Sequence[str]) -> Table:
    stretch = (WIDTH - _NUMBER.width - sum(widths)) / len(columns)
    heads = [Column(one[0], width + stretch, "right") for one, width in zip(columns, widths, strict=True)]
    texts = zip(numbers, *(one[1] for one in columns), strict=True)
    rows = [Row(row) for row in texts if any(text != DASH for text in row[1:])]
    return Table([_NUMBER, *heads], rows, above=9, style=DENSE)
