"""Charts: the record's figures as vectors. One block draws any of them without knowing what it shows.

Regions lie below the grid, limits below the data, error bars below their marks, labels on top. Series are told apart
by the form of their marks or by their dashes, not only by colour; measured traces are thin, and what was fitted to them
is thicker. Where everything but the labels comes to lie is known as soon as a chart is made, since a label that finds
no room takes a line beneath it.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import replace

from acceptance.printing import Scale, scale_for, time_scale
from acceptance.record import Axis, Figure, Series
from acceptance.report.annotations import (
    GROUND,
    Plot,
    crowd_of,
    draw_borders,
    draw_grounds,
    draw_limits,
    draw_marks,
    labels_of,
    ordinary,
)
from acceptance.report.axes import LinearAxis, axis_for, decimate, decimate_cloud, decimate_path
from acceptance.report.blocks import Block
from acceptance.report.curves import LINES, SPARSE, draw_sample, draw_series, led_through
from acceptance.report.fonts import printable, string_width
from acceptance.report.pen import Pen
from acceptance.report.placing import Box, Crowd, Label, apart, place_labels
from acceptance.report.style import FURNITURE, INK, MUTED, RULE, SUBHEADING, WHITE, Type
from acceptance.report.wrap import fit, fold, wrap

__all__ = ["Chart"]

_TICK = Type(7.0, 8.5, "regular", MUTED)
_LABEL = Type(7.2, 9.0, "regular", MUTED)
_MARK = 2.3  # half the width of a mark
_MOST = 1400  # points of a figure that are drawn
_FAR = 9.0  # a label farther from what it names is led to it [pt]


class Chart(Block):
    """A figure, so wide, with a plot so high."""

    def __init__(self, figure: Figure, width: float, plot_height: float = 128.0, *, above: float = 8.0) -> None:
        self._figure = figure
        finite = [_finite(series) for series in figure.series]
        self._lost = sum(len(series.x) for series in figure.series) - sum(len(series.x) for series in finite)
        self._series = _thinned(finite)
        self._xs, self._ys = self._numbers()
        self._width = width
        self._plot_height = plot_height
        self._title = wrap(fold(figure.title), SUBHEADING, width)
        self._legend = _legend(figure.series, width) if len(figure.series) > 1 else []
        self._labels = self._placed_labels()
        self._notes = [line for text in self._remarks() for line in wrap(text, FURNITURE, width)]
        self.above = above
        legend = len({row for row, _, _ in self._legend}) * 10.0
        self.head = len(self._title) * SUBHEADING.leading + legend + 13.0
        self._drop = 0.0
        self._measure()

    def _measure(self) -> None:
        self.height = self._drop + self.head + self._plot_height + 24.0 + len(self._notes) * FURNITURE.leading

    def align(self, head: float) -> None:
        """Lower the plot so far that it begins where that of a chart with such a head does. [pt]"""
        self._drop = max(0.0, head - self.head)
        self._measure()

    def _remarks(self) -> list[str]:
        texts = [fold(self._figure.caption)] if self._figure.caption.strip() else []
        if self._lost:
            texts.append(f"{self._lost} points of the record are no finite numbers and are not drawn.")
        if self._bars_are_hidden():
            texts.append("Error bars are smaller than the marks.")
        untold = list(dict.fromkeys(label.whole for label, box in self._labels if box is None or label.is_cut))
        if untold:
            texts.append(f"Not written into the plot, or not in full: {'; '.join(untold)}.")
        return texts

    def _numbers(self) -> tuple[list[float], list[float]]:
        """All the x and all the y that must be seen."""
        xs = [x for series in self._series for x in series.x]
        ys = [y for series in self._series for y in series.y]
        for series in self._series:
            bars = [(y, u) for y, u in zip(series.y, series.expanded_uncertainty, strict=True) if u is not None]
            ys += [y + u for y, u in bars] + [y - u for y, u in bars]
        more_xs: list[float | None] = [x for limit in self._figure.limits for x in (limit.x_from, limit.x_to)]
        more_ys: list[float | None] = [limit.y for limit in self._figure.limits]
        for mark in self._figure.marks:
            more_xs.append(mark.x)
            more_ys.append(mark.y)
        for region in self._figure.regions:
            more_xs += [region.x_from, region.x_to]
            more_ys += [region.y_from, region.y_to]
        xs += [x for x in more_xs if ordinary(x)]
        ys += [y for y in more_ys if ordinary(y)]
        if self._figure.x.unit == "A":
            xs.append(0.0)  # a curve over current begins at none
        return xs or [0.0], ys or [0.0]

    def _plot(self, x: float, low: float) -> Plot:
        """The axes of the plot whose chart begins at x and whose lower edge lies at `low`."""
        xs, ys, figure = self._xs, self._ys, self._figure
        # room for labels, on the side of a limit that is not allowed
        free = 0.13 if figure.limits or figure.marks or figure.regions else 0.07
        vertical = axis_for(ys, _scale(figure.y, ys), (low, low + self._plot_height), most=6, padding=free)
        room = max((string_width(label, _TICK.size) for label in vertical.labels), default=0.0) + 7
        most = max(2, int((self._width - room) / 34))
        horizontal = axis_for(
            xs, _scale(figure.x, xs), (x + room, x + self._width - 8), most=min(most, 8), from_zero=True
        )
        return Plot(horizontal, vertical)

    def _bars_are_hidden(self) -> bool:
        """Whether there are error bars, and none reaches beyond its mark."""
        bars = [
            u for s in self._series if s.kind == "points" for u in s.expanded_uncertainty if u is not None and u > 0
        ]
        if not bars:
            return False
        vertical = self._plot(0.0, 0.0).vertical
        return (vertical.place(max(bars)) - vertical.place(0.0)) < _MARK

    def _placed_labels(self) -> list[tuple[Label, Box | None]]:
        """Each label with its box, as seen from the chart's left and the plot's lower edge."""
        plot = self._plot(0.0, 0.0)
        labels = labels_of(self._figure, plot)
        if not labels:
            return []
        crowd = crowd_of(self._figure, plot)
        for series in self._series:
            _crowd_in(crowd, series, plot)
        left, low, right, high = plot.area
        return list(zip(labels, place_labels(labels, crowd, (left + 1, low + 1, right, high + 1)), strict=True))

    # -- drawing

    def draw(self, pen: Pen, x: float, y: float) -> None:
        y = self._draw_head(pen, x, y)
        low = y - self._plot_height
        plot = self._plot(x, low)
        draw_grounds(pen, self._figure, plot)
        _draw_grid(pen, plot.horizontal, plot.vertical)
        draw_borders(pen, self._figure, plot)
        draw_limits(pen, self._figure, plot)
        for place in self._order():
            draw_series(pen, self._series[place], place, plot)
        draw_marks(pen, self._figure, plot)
        self._draw_labels(pen, x, low)
        middle = (plot.horizontal.start + plot.horizontal.end) / 2
        if not any(series.x for series in self._series):
            pen.text(middle, low + 0.75 * self._plot_height, "no points to draw", _LABEL, align="centre")
        title = fit(_axis_title(self._figure.x, self._xs), _LABEL, plot.horizontal.end - plot.horizontal.start)
        pen.text(middle, low - 19, title, _LABEL, align="centre")
        for line in self._notes:
            low -= FURNITURE.leading
            pen.text(x, low - 21.5, line, FURNITURE)

    def _order(self) -> list[int]:
        """Places of the series from the lowest: many dots, measured traces, lines, few dots, marks."""

        def height(place: int) -> int:
            series = self._series[place]
            if series.kind in LINES:
                return 1 if series.kind == "trace" else 2
            return 4 if series.kind == "points" else 3 if len(series.x) <= SPARSE else 0

        return sorted(range(len(self._series)), key=height)

    def _draw_head(self, pen: Pen, x: float, y: float) -> float:
        for line in self._title:
            y -= SUBHEADING.leading
            pen.text(x, y + 3, line, SUBHEADING)
        rows = 0
        for row, offset, place in self._legend:
            series = self._figure.series[place]
            draw_sample(pen, series, place, (x + offset, y - row * 10.0 - 5.0))
            pen.text(x + offset + 18, y - row * 10.0 - 7.4, fit(fold(series.name), _LABEL, self._width - 18), _LABEL)
            rows = row + 1
        y -= rows * 10.0 + self._drop
        pen.text(x, y - 7.5, fit(_axis_title(self._figure.y, self._ys), _LABEL, self._width), _LABEL)
        return y - 13.0

    def _draw_labels(self, pen: Pen, x: float, y: float) -> None:
        """The labels, on a ground of their own, each led to what it names where it stands apart from it."""
        for label, box in self._labels:
            if box is None:
                continue
            left, low, right, high = box[0] + x, box[1] + y, box[2] + x, box[3] + y
            if apart(box, label.anchor) > _FAR:
                a, b, c, d = label.anchor
                middle = (left + right) / 2, (low + high) / 2
                end = min(max(middle[0], a + x), c + x), min(max(middle[1], b + y), d + y)
                pen.line([(min(max(end[0], left), right), min(max(end[1], low), high)), end], MUTED, 0.4)
            ground = GROUND if self._is_on_ground(box) else WHITE
            pen.rectangle((left, low, right - left, high - low), fill=ground)
            baseline = high - 5.8
            for line in label.lines:
                pen.text(left + 1.5, baseline, line, label.style)
                baseline -= label.style.leading

    def _is_on_ground(self, box: Box) -> bool:
        """Whether a label lies within a region."""
        regions = [label.anchor for label, _ in self._labels if label.is_region]
        return any(a <= box[0] and b <= box[1] and box[2] <= c and box[3] <= d for a, b, c, d in regions)


def _finite(series: Series) -> Series:
    """The series without points that are no finite numbers."""
    bars = [u if ordinary(u) else None for u in series.expanded_uncertainty]
    bars += [None] * (len(series.x) - len(bars))
    rows = [row for row in zip(series.x, series.y, bars, strict=False) if ordinary(row[0]) and ordinary(row[1])]
    xs, ys, us = ([row[0] for row in rows], [row[1] for row in rows], [row[2] for row in rows])
    return Series(series.name, xs, ys, us, series.kind)


def _thinned(listed: Sequence[Series]) -> list[Series]:
    """The series with as many points as can be told apart on paper, and as a figure may have together."""
    share = _MOST // max(1, sum(len(series.x) > 100 for series in listed))
    return [_picked(series, share) if len(series.x) > share else series for series in listed]


def _picked(series: Series, most: int) -> Series:
    kept = (
        decimate_cloud(series.x, series.y, most)
        if series.kind == "dots"
        else decimate_path(series.x, series.y, most // 2)
    )
    return replace(
        series,
        x=[series.x[place] for place in kept],
        y=[series.y[place] for place in kept],
        expanded_uncertainty=[series.expanded_uncertainty[place] for place in kept],
    )


def _scale(axis: Axis, numbers: Sequence[float]) -> Scale:
    return time_scale(numbers) if axis.unit == "s" else scale_for(axis.unit, numbers)


def _axis_title(axis: Axis, numbers: Sequence[float]) -> str:
    symbol = _scale(axis, numbers).symbol
    label = fold(axis.label)
    label = label[:1].upper() + label[1:]
    return f"{label} ({symbol})" if symbol else label


def _crowd_in(crowd: Crowd, series: Series, plot: Plot) -> None:
    """Where a series lies on the page: its points, its error bars, and the line through them."""
    points = [plot.place(x, y) for x, y in zip(series.x, series.y, strict=True)]
    if series.kind in LINES:
        crowd.add_path(points)
        return
    weight = 3.0 if series.kind == "points" else 1.0
    for x, y in points:
        crowd.add(x, y, weight)
    if series.kind == "dots":
        return
    crowd.add_path(led_through(points, plot))
    for n in decimate(series.y, 100):
        u, (x, _) = series.expanded_uncertainty[n], points[n]
        crowd.add(x - _MARK, points[n][1], 2.0)
        crowd.add(x + _MARK, points[n][1], 2.0)
        if u is not None:
            low, high = plot.vertical.place(series.y[n] - u), plot.vertical.place(series.y[n] + u)
            crowd.add_path([(x, low), (x, high)], 2.0)


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
