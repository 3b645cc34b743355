"""What was measured: the figures, and the readings of every dwell."""

from __future__ import annotations

from collections.abc import Sequence
from itertools import groupby

from acceptance.printing import DASH, count, duration, printed, quantity, scale_for
from acceptance.record import Point, Reading, Record
from acceptance.report.blocks import Beside, Block, Text, heading
from acceptance.report.charts import Chart
from acceptance.report.style import CELL, CELL_MUTED, COLUMN, SMALL, WIDTH
from acceptance.report.table import Cell, Column, Row, Table, natural_width
from acceptance.report.wrap import Run, fold

__all__ = ["figures", "points"]

_GAP = 22.0
_HALF = (WIDTH - _GAP) / 2


def figures(record: Record) -> list[Block]:
    """The figures, two side by side; a single one, or the last of an odd number, over the whole width."""
    if not record.figures:
        return []
    blocks: list[Block] = [heading("Figures")]
    listed = record.figures
    for n in range(0, len(listed) - 1, 2):
        pair = [Chart(figure, _HALF) for figure in listed[n : n + 2]]
        blocks.append(Beside([(0.0, pair[0]), (_HALF + _GAP, pair[1])], above=9))
    if len(listed) % 2:
        blocks.append(Chart(listed[-1], WIDTH, 142.0, above=9))
    marks = "Short strokes at a limit stand on the side that is not allowed. Bars: expanded uncertainty."
    return [*blocks, Text(marks, SMALL, above=6)]


# -- points


def points(record: Record) -> list[Block]:
    """Every dwell: where it lies, and the mean reading of each channel with twice its standard uncertainty."""
    if not record.points:
        return []
    columns = [*_loads(record.points), *_channels(record.points), *_efficiency(record.points)]
    note = (
        "n: samples in the dwell; effective: as many independent samples as its least telling channel has; settling: "
        "samples left out before it. Readings: mean ± expanded uncertainty, k = 2 (efficiency: as judged); "
        "without ± the instrument's accuracy is not stated."
    )
    found_by = list(dict.fromkeys(fold(point.found_by.replace("_", " ")) for point in record.points))
    if len(found_by) == 1 and found_by[0]:
        note += f" Dwells found by: {found_by[0]}."
    return [
        heading("Dwells"),
        Text(note, SMALL, above=1, keep_next=True),
        _places(record.points, told=len(found_by) > 1),
        *_reading_tables(record.points, columns),
    ]


def _places(listed: Sequence[Point], *, told: bool) -> Table:
    columns = [
        Column("No.", 28, "right"),
        Column("Where in the log", WIDTH - 28 - 66 - 60 - 60 - 44 - 50 - 46),
        Column("Stage", 66),
        Column("Begins", 60, "right"),
        Column("Lasts", 60, "right"),
        Column("n", 44, "right"),
        Column("Effective", 50, "right"),
        Column("Settling", 46, "right"),
    ]
    rows = [
        Row(
            [
                str(point.index + 1),
                _place(point, told=told),
                fold(point.stage),
                quantity(point.starts, "s", digits=6),
                duration(point.duration),
                count(point.readings),
                _effective(point),
                count(point.settling),
            ]
        )
        for point in listed
    ]
    return Table(columns, rows, above=3)


def _place(point: Point, *, told: bool) -> Cell:
    found_by = fold(point.found_by.replace("_", " "))
    return Cell([Run(fold(point.where), CELL), *([Run(found_by, CELL_MUTED)] if told and found_by else [])])


def _effective(point: Point) -> str:
    known = [
        reading.effective_readings for reading in point.channels.values() if reading.effective_readings is not None
    ]
    return f"{min(known):.3g}" if known else DASH


Readings = tuple[str, list[str]]  # heading, and one text for each dwell


def _loads(listed: Sequence[Point]) -> list[Readings]:
    names = dict.fromkeys(name for point in listed for name in point.load_fractions)
    single = len(names) == 1
    found = []
    for name in names:
        fractions = [point.load_fractions.get(name) for point in listed]
        texts = [
            DASH if share is None else f"{share * 100:.1f}".replace("-0.0", "0.0").replace("-", "−")
            for share in fractions
        ]
        found.append(("load\n%" if single or not name else f"load {name}\n%", texts))
    return found


def _channels(listed: Sequence[Point]) -> list[Readings]:
    names = dict.fromkeys(name for point in listed for name in point.channels)
    found = []
    for name in names:
        readings = [point.channels.get(name) for point in listed]
        # a channel has one unit; should a record hold several, each text carries its own
        units = {reading.unit for reading in readings if reading is not None}
        found.append(_one_unit(name, readings, units.pop()) if len(units) == 1 else _own_units(name, readings))
    return found


def _title(channel: str) -> str:
    """A channel's name over its column, the output or the probe on a line of its own."""
    quantity_name, _, of = channel.partition(" ")
    return f"{quantity_name.replace('_', ' ')}\n{of}" if of else quantity_name.replace("_", " ")


def _one_unit(name: str, readings: Sequence[Reading | None], unit: str) -> Readings:
    values = [reading.value for reading in readings if reading is not None]
    scale = scale_for(unit, values, per_cent=False)
    texts = []
    for reading in readings:
        if reading is None:
            texts.append(DASH)
            continue
        u = reading.standard_uncertainty
        texts.append(scale.pair(reading.value, None if u is None else 2 * u))
    return f"{_title(name)}\n{scale.symbol}" if scale.symbol else _title(name), texts


def _own_units(name: str, readings: Sequence[Reading | None]) -> Readings:
    texts = []
    for reading in readings:
        if reading is None:
            texts.append(DASH)
            continue
        u = reading.standard_uncertainty
        found = printed(reading.value, None if u is None else 2 * u, reading.unit, per_cent=False)
        texts.append(found.with_unit(found.value if u is None else f"{found.value} ± {found.expanded}"))
    return _title(name), texts


def _efficiency(listed: Sequence[Point]) -> list[Readings]:
    if all(point.efficiency is None for point in listed):
        return []
    scale = scale_for("", [])
    texts = [
        DASH if point.efficiency is None else scale.pair(point.efficiency, point.efficiency_expanded_uncertainty)
        for point in listed
    ]
    return [("efficiency\n%", texts)]


def _word_width(title: str) -> float:
    """Width that no word of a column's title needs to be broken in, as far as that is sensible."""
    return min(natural_width(title.split(), COLUMN), 90.0)


def _reading_tables(listed: Sequence[Point], columns: Sequence[Readings]) -> list[Table]:
    """The columns in as many tables as they need, each with the number of the dwell before it."""
    first = 28.0
    widths = [min(max(natural_width(texts), _word_width(title), 46.0), WIDTH - first) for title, texts in columns]
    places: list[int] = []
    used, table = first, 0
    for width in widths:
        if used + width > WIDTH and used > first:
            used, table = first, table + 1
        used += width
        places.append(table)
    tables = []
    for _, group in groupby(range(len(columns)), key=lambda n: places[n]):
        chosen = list(group)
        spare = (WIDTH - first - sum(widths[n] for n in chosen)) / len(chosen)
        stretch = max(0.0, min(spare, 24.0))
        heads = [Column("No.", first, "right"), *(Column(columns[n][0], widths[n] + stretch, "right") for n in chosen)]
        rows = [Row([str(p.index + 1), *(columns[n][1][row] for n in chosen)]) for row, p in enumerate(listed)]
        tables.append(Table(heads, rows, above=9))
    return tables
