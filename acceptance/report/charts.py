"""Charts: the record's figures as vectors. One block draws any of them without knowing what it shows.

Grid and limits lie below the data, error bars below their marks, labels on top. Series are told apart by the form of
their marks or by their dashes, not only by colour. A limit is a dashed line whose short strokes point to the side that
is not allowed.
"""

from __future__ import annotations

import math
from collections.abc import Iterator, Sequence
from dataclasses import replace

from acceptance.printing import limit_range, scale_for
from acceptance.record import Axis, Figure, LimitLine, Series
from acceptance.report.axes import LinearAxis, axis_for, decimate
from acceptance.report.blocks import Block
from acceptance.report.fonts import printable, string_width
from acceptance.report.pen import Pen
from acceptance.report.style import ACCENT, FURNITURE, INK, MUTED, RED, RULE, SUBHEADING, WHITE, Colour, Type
from acceptance.report.wrap import fit, fold, wrap

__all__ = ["Chart"]

_TICK = Type(7.0, 8.5, "regular", MUTED)
_LABEL = Type(7.2, 9.0, "regular", MUTED)
_LIMIT = Type(7.0, 8.5, "semibold", RED)
_COLOURS: tuple[Colour, ...] = (ACCENT, (0.72, 0.40, 0.05), (0.10, 0.45, 0.35), (0.42, 0.22, 0.50), (0.35, 0.38, 0.42))
_DASHES: tuple[tuple[float, ...], ...] = ((), (5, 2), (1.5, 1.8), (7, 2, 1.5, 2))
_MARK = 2.3  # half the width of a mark
_CAP = 1.9  # half the width of an error bar's end

Box = tuple[float, float, float, float]  # left, low, right, high


class Chart(Block):
    """A figure, so wide, with a plot so high."""

    def __init__(self, figure: Figure, width: float, plot_height: float = 128.0, *, above: float = 8.0) -> None:
        self._figure = figure
        finite = [_finite(series) for series in figure.series]
        self._lost = sum(len(series.x) for series in figure.series) - sum(len(series.x) for series in finite)
        self._series = [_thinned(series) for series in finite]
        self._xs, self._ys = self._numbers()
        self._width = width
        self._plot_height = plot_height
        self._title = wrap(fold(figure.title), SUBHEADING, width)
        self._notes = [line for text in self._remarks() for line in wrap(text, FURNITURE, width)]
        self._legend = _legend(figure.series, width) if len(figure.series) > 1 else []
        self.above = above
        legend = len({row for row, _, _ in self._legend}) * 10.0
        self._upper = len(self._title) * SUBHEADING.leading + legend + 13.0
        self.height = self._upper + plot_height + 24.0 + len(self._notes) * FURNITURE.leading

    def _remarks(self) -> list[str]:
        texts = [fold(self._figure.caption)] if self._figure.caption.strip() else []
        if self._lost:
            texts.append(f"{self._lost} points of the record are no finite numbers and are not drawn.")
        if self._bars_are_hidden():
            texts.append("Error bars are smaller than the marks.")
        return texts

    def _numbers(self) -> tuple[list[float], list[float]]:
        """All the x and all the y that must be seen."""
        xs = [x for series in self._series for x in series.x]
        ys = [y for series in self._series for y in series.y]
        for series in self._series:
            bars = [(y, u) for y, u in zip(series.y, series.expanded_uncertainty, strict=True) if u is not None]
            ys += [y + u for y, u in bars] + [y - u for y, u in bars]
        ys += [limit.y for limit in self._figure.limits if _ordinary(limit.y)]
        xs += [x for limit in self._figure.limits for x in (limit.x_from, limit.x_to) if x is not None and _ordinary(x)]
        return xs or [0.0], ys or [0.0]

    def _axes(self, x: float, low: float) -> tuple[LinearAxis, LinearAxis]:
        """The two axes of the plot whose chart begins at x and whose lower edge lies at `low`."""
        xs, ys = self._xs, self._ys
        figure = self._figure
        free = 0.13 if figure.limits else 0.07  # room for the limits' labels on the side that is not allowed
        vertical = axis_for(ys, scale_for(figure.y.unit, ys), (low, low + self._plot_height), most=6, padding=free)
        room = max((string_width(label, _TICK.size) for label in vertical.labels), default=0.0) + 7
        most = max(2, int((self._width - room) / 34))
        horizontal = axis_for(
            xs, scale_for(figure.x.unit, xs), (x + room, x + self._width - 8), most=min(most, 8), from_zero=True
        )
        return horizontal, vertical

    def _bars_are_hidden(self) -> bool:
        """Whether there are error bars, and none reaches beyond its mark."""
        bars = [
            u for s in self._series if s.kind == "points" for u in s.expanded_uncertainty if u is not None and u > 0
        ]
        if not bars:
            return False
        _, vertical = self._axes(0.0, 0.0)
        return (vertical.place(max(bars)) - vertical.place(0.0)) < _MARK

    # -- drawing

    def draw(self, pen: Pen, x: float, y: float) -> None:
        y = self._draw_head(pen, x, y)
        low = y - self._plot_height
        horizontal, vertical = self._axes(x, low)
        _draw_grid(pen, horizontal, vertical)
        for limit in self._figure.limits:
            _draw_limit(pen, limit, horizontal, vertical)
        for place, series in enumerate(self._series):
            _draw_series(pen, series, place, (horizontal, vertical))
        self._label_limits(pen, horizontal, vertical)
        middle = (horizontal.start + horizontal.end) / 2
        if not any(series.x for series in self._series):
            pen.text(middle, low + 0.75 * self._plot_height, "no points to draw", _LABEL, align="centre")
        title = fit(_axis_title(self._figure.x, self._xs), _LABEL, horizontal.end - horizontal.start)
        pen.text(middle, low - 19, title, _LABEL, align="centre")
        for line in self._notes:
            low -= FURNITURE.leading
            pen.text(x, low - 21.5, line, FURNITURE)

    def _draw_head(self, pen: Pen, x: float, y: float) -> float:
        for line in self._title:
            y -= SUBHEADING.leading
            pen.text(x, y + 3, line, SUBHEADING)
        rows = 0
        for row, offset, place in self._legend:
            series = self._figure.series[place]
            _draw_sample(pen, series, place, (x + offset, y - row * 10.0 - 5.0))
            pen.text(x + offset + 18, y - row * 10.0 - 7.4, fit(fold(series.name), _LABEL, self._width - 18), _LABEL)
            rows = row + 1
        y -= rows * 10.0
        pen.text(x, y - 7.5, fit(_axis_title(self._figure.y, self._ys), _LABEL, self._width), _LABEL)
        return y - 13.0

    def _label_limits(self, pen: Pen, horizontal: LinearAxis, vertical: LinearAxis) -> None:
        taken: list[Box] = []
        points = _crowd(self._series, horizontal, vertical)
        points += [place for limit in self._figure.limits for place in _strokes(limit, horizontal, vertical)]
        for limit in self._figure.limits:
            if not _ordinary(limit.y):
                continue
            text = fit(_limit_text(limit, self._figure.y), _LIMIT, horizontal.end - horizontal.start - 4)
            box = _quietest(_label_boxes(limit, text, horizontal, vertical), taken, points)
            taken.append(box)
            pen.rectangle((box[0], box[1], box[2] - box[0], box[3] - box[1]), fill=WHITE)
            pen.text(box[0] + 1.5, box[1] + 2.2, text, _LIMIT)


def _finite(series: Series) -> Series:
    """The series without points that are no finite numbers."""
    bars = [u if u is not None and _ordinary(u) else None for u in series.expanded_uncertainty]
    bars += [None] * (len(series.x) - len(bars))
    rows = [row for row in zip(series.x, series.y, bars, strict=False) if _ordinary(row[0]) and _ordinary(row[1])]
    xs, ys, us = ([row[0] for row in rows], [row[1] for row in rows], [row[2] for row in rows])
    return Series(series.name, xs, ys, us, series.kind)


def _thinned(series: Series) -> Series:
    """The series with as many points as can be told apart on paper."""
    kept = decimate(series.y)
    if len(kept) == len(series.y):
        return series
    return replace(
        series,
        x=[series.x[place] for place in kept],
        y=[series.y[place] for place in kept],
        expanded_uncertainty=[series.expanded_uncertainty[place] for place in kept],
    )


def _ordinary(number: float) -> bool:
    """Finite, and not so large that a range of such numbers could overflow."""
    return math.isfinite(number) and abs(number) < 1e150


def _axis_title(axis: Axis, numbers: Sequence[float]) -> str:
    symbol = scale_for(axis.unit, numbers).symbol
    label = fold(axis.label)
    label = label[:1].upper() + label[1:]
    return f"{label} ({symbol})" if symbol else label


def _legend(series: Sequence[Series], width: float) -> list[tuple[int, float, int]]:
    """Row, distance from the left, and index of each entry of the legend."""
    entries: list[tuple[int, float, int]] = []
    row, used = 0, 0.0
    for place, one in enumerate(series):
        wide = 18 + string_width(printable(fold(one.name)), _LABEL.size) + 12
        if used and used + wide > width:
            row, used = row + 1, 0.0
        entries.append((row, used, place))
        used += wide
    return entries


def _draw_grid(pen: Pen, horizontal: LinearAxis, vertical: LinearAxis) -> None:
    left, right, low = horizontal.start, horizontal.end, vertical.start
    pen.lines([(left, vertical.place(tick), right, vertical.place(tick)) for tick in vertical.ticks], RULE, 0.4)
    for tick, label in zip(vertical.ticks, vertical.labels, strict=True):
        pen.text(left - 4, vertical.place(tick) - 2.4, label, _TICK, align="right")
    pen.line([(left, low), (right, low)], INK, 0.7)
    pen.lines([(horizontal.place(tick), low, horizontal.place(tick), low - 2.5) for tick in horizontal.ticks], INK, 0.6)
    for tick, label in zip(horizontal.ticks, horizontal.labels, strict=True):
        pen.text(horizontal.place(tick), low - 10, label, _TICK, align="centre")


# -- limits


def _span(limit: LimitLine, horizontal: LinearAxis) -> tuple[float, float]:
    """From where to where a limit is drawn; one that holds at a single place is given some width. [pt]"""
    begin = horizontal.start if limit.x_from is None else horizontal.place(limit.x_from)
    end = horizontal.end if limit.x_to is None else horizontal.place(limit.x_to)
    begin, end = min(begin, end), max(begin, end)
    short = max(0.0, 20.0 - (end - begin)) / 2
    return max(horizontal.start, begin - short), min(horizontal.end, end + short)


def _draw_limit(pen: Pen, limit: LimitLine, horizontal: LinearAxis, vertical: LinearAxis) -> None:
    if not _ordinary(limit.y):
        return
    begin, end = _span(limit, horizontal)
    height = vertical.place(limit.y)
    away = -4.0 if limit.side == "min" else 4.0
    count = int((end - begin) / 5)
    pen.lines([(begin + 5 * n + 3, height, begin + 5 * n, height + away) for n in range(count)], RED, 0.45)
    pen.line([(begin, height), (end, height)], RED, 1.0, dash=(4, 2))


def _limit_text(limit: LimitLine, axis: Axis) -> str:
    low, high = (limit.y, None) if limit.side == "min" else (None, limit.y)
    amount = limit_range(low, high, axis.unit)
    label = fold(limit.label.removesuffix(" min").removesuffix(" max"))  # the sign says it
    return label if amount in label else f"{label} {amount}".strip()


def _label_boxes(limit: LimitLine, text: str, horizontal: LinearAxis, vertical: LinearAxis) -> list[Box]:
    """Places where a limit's label may stand: above or below its line, at its ends or its middle, best first."""
    wide = min(string_width(text, _LIMIT.size, _LIMIT.weight) + 3, horizontal.end - horizontal.start)
    begin, end = _span(limit, horizontal)
    height = vertical.place(limit.y)
    above, below = (height + 1.5, height - 13.5) if limit.side == "min" else (height + 5.5, height - 9.5)
    tops = (below, above) if limit.side == "min" else (above, below)
    lefts = (end - wide, begin, (begin + end - wide) / 2)
    places = [(left, low) for low in tops for left in lefts]
    # beside a short line, and a line of text farther away
    places += [(end + 4, height - 4), (begin - wide - 4, height - 4)]
    places += [(left, below - 9) for left in lefts] + [(left, above + 9) for left in lefts]
    boxes = []
    for left, low in places:
        inside = min(max(left, horizontal.start + 1), horizontal.end - wide)
        if vertical.start + 1 <= low and low + 8 <= vertical.end + 1:
            boxes.append((inside, low, inside + wide, low + 8.0))
    return boxes or [(horizontal.end - wide, height + 1.5, horizontal.end, height + 9.5)]


def _strokes(limit: LimitLine, horizontal: LinearAxis, vertical: LinearAxis) -> list[tuple[float, float]]:
    """Places along a limit's line, for labels to keep clear of."""
    if not _ordinary(limit.y):
        return []
    begin, end = _span(limit, horizontal)
    steps = max(1, int((end - begin) / 6))
    height = vertical.place(limit.y) + (-2.0 if limit.side == "min" else 2.0)
    return [(begin + (end - begin) * n / steps, height) for n in range(steps + 1)]


def _every(series: Series, buckets: int) -> list[tuple[float, float]]:
    return [(series.x[place], series.y[place]) for place in decimate(series.y, buckets)]


def _bars(series: Series, horizontal: LinearAxis, vertical: LinearAxis) -> Iterator[list[tuple[float, float]]]:
    """Places along each error bar, half of it below its mark and half above."""
    for place in decimate(series.y, 100):
        u = series.expanded_uncertainty[place]
        if u is None:
            continue
        x, y = horizontal.place(series.x[place]), series.y[place]
        yield [(x, vertical.place(y + share * u)) for share in (-1.0, -0.5, 0.5, 1.0)]


def _crowd(series: Sequence[Series], horizontal: LinearAxis, vertical: LinearAxis) -> list[tuple[float, float]]:
    """Where the data lie on the page: points, error bars, and places along the lines between points."""
    crowd: list[tuple[float, float]] = []
    for one in series:
        points = [(horizontal.place(x), vertical.place(y)) for x, y in _every(one, 100)]
        crowd += points
        crowd += [place for bar in _bars(one, horizontal, vertical) for place in bar]
        for (a, b), (c, d) in zip(points, points[1:], strict=False):
            steps = min(30, int(math.hypot(c - a, d - b) / 6))
            crowd += [(a + (c - a) * n / (steps + 1), b + (d - b) * n / (steps + 1)) for n in range(1, steps + 1)]
    return crowd


def _quietest(boxes: Sequence[Box], taken: Sequence[Box], points: Sequence[tuple[float, float]]) -> Box:
    """The box that covers the least; the first of equals."""

    left, low = min(box[0] for box in boxes) - 3, min(box[1] for box in boxes) - 3
    right, high = max(box[2] for box in boxes) + 3, max(box[3] for box in boxes) + 3
    near = [(x, y) for x, y in points if left < x < right and low < y < high]

    def covered(box: Box) -> int:
        left, low, right, high = box
        labels = sum(left < b[2] and right > b[0] and low < b[3] and high > b[1] for b in taken)
        return 1000 * labels + len([1 for x, y in near if left - 3 < x < right + 3 and low - 3 < y < high + 3])

    return min(boxes, key=covered)


# -- series


def _draw_series(pen: Pen, series: Series, place: int, axes: tuple[LinearAxis, LinearAxis]) -> None:
    horizontal, vertical = axes
    colour = _COLOURS[place % len(_COLOURS)]
    if series.kind == "line":
        points = [(horizontal.place(x), vertical.place(y)) for x, y in zip(series.x, series.y, strict=True)]
        pen.line(points, colour, 1.2, dash=_DASHES[place % len(_DASHES)])
        if len(points) == 1:
            _draw_mark(pen, place, points[0])
        return
    points = [(horizontal.place(x), vertical.place(y)) for x, y in zip(series.x, series.y, strict=True)]
    pen.line(_curve(points, axes), colour, 0.7, dash=_DASHES[place % len(_DASHES)])
    _draw_bars(pen, series, points, vertical, colour)
    for point in points:
        _draw_mark(pen, place, point)


def _curve(points: Sequence[tuple[float, float]], axes: tuple[LinearAxis, LinearAxis]) -> list[tuple[float, float]]:
    """The line that leads the eye from mark to mark; none where marks at one place lie far apart.

    Repeated readings at one place are led through in their middle; marks that differ there belong to different
    conditions, which a line must not join.
    """
    near, alike = 0.012 * abs(axes[0].end - axes[0].start), 0.08 * abs(axes[1].end - axes[1].start)
    groups: list[list[tuple[float, float]]] = []
    for point in sorted(points):
        if groups and point[0] - groups[-1][0][0] <= near:
            groups[-1].append(point)
        else:
            groups.append([point])
    if any(max(y for _, y in group) - min(y for _, y in group) > alike for group in groups):
        return []
    return [(sum(x for x, _ in group) / len(group), sum(y for _, y in group) / len(group)) for group in groups]


def _draw_bars(
    pen: Pen, series: Series, points: Sequence[tuple[float, float]], vertical: LinearAxis, colour: Colour
) -> None:
    strokes = []
    for (x, _), y, u in zip(points, series.y, series.expanded_uncertainty, strict=True):
        if u is None:
            continue
        low, high = vertical.place(y - u), vertical.place(y + u)
        strokes += [(x, low, x, high), (x - _CAP, low, x + _CAP, low), (x - _CAP, high, x + _CAP, high)]
    pen.lines(strokes, colour, 0.8)


def _draw_mark(pen: Pen, place: int, centre: tuple[float, float]) -> None:
    """One of eight forms: disc, square, triangle and diamond, full and hollow."""
    colour = _COLOURS[place % len(_COLOURS)]
    fill = colour if place % 2 == 0 else WHITE
    x, y = centre
    r = _MARK
    match (place // 2 + place) % 4:
        case 0:
            pen.circle(centre, r, fill=fill, stroke=colour, width=0.9)
        case 1:
            pen.rectangle((x - r * 0.9, y - r * 0.9, r * 1.8, r * 1.8), fill=fill, stroke=colour, width=0.9)
        case 2:
            pen.polygon(
                [(x - 1.15 * r, y - r), (x + 1.15 * r, y - r), (x, y + 1.2 * r)], fill=fill, stroke=colour, width=0.9
            )
        case _:
            pen.polygon(
                [(x, y + 1.3 * r), (x + 1.3 * r, y), (x, y - 1.3 * r), (x - 1.3 * r, y)],
                fill=fill,
                stroke=colour,
                width=0.9,
            )


def _draw_sample(pen: Pen, series: Series, place: int, left: tuple[float, float]) -> None:
    """A series' sign in the legend."""
    x, y = left
    colour = _COLOURS[place % len(_COLOURS)]
    width = 1.2 if series.kind == "line" else 0.7
    pen.line([(x, y), (x + 14, y)], colour, width, dash=_DASHES[place % len(_DASHES)])
    if series.kind == "points":
        _draw_mark(pen, place, (x + 7, y))
