"""The series of a chart: lines, dots, and marks with their error bars.

Each is told by its place among the series, and by its form as well as by its colour.
"""

from __future__ import annotations

from collections.abc import Sequence

from acceptance.record import Series
from acceptance.report.annotations import Plot
from acceptance.report.axes import LinearAxis
from acceptance.report.pen import Pen
from acceptance.report.style import ACCENT, WHITE, Colour

__all__ = ["LINES", "SPARSE", "draw_sample", "draw_series", "led_through"]

_COLOURS: tuple[Colour, ...] = (ACCENT, (0.72, 0.40, 0.05), (0.10, 0.45, 0.35), (0.42, 0.22, 0.50), (0.35, 0.38, 0.42))
_DASHES: tuple[tuple[float, ...], ...] = ((), (5, 2), (1.5, 1.8), (7, 2, 1.5, 2))
_MARK = 2.3  # half the width of a mark
_CAP = 1.9  # half the width of an error bar's end
LINES = ("trace", "line")  # kinds of series that are drawn without marks
_WIDTHS = {"points": 0.7, "trace": 0.6, "line": 1.2}
SPARSE = 100  # so few dots are larger, and lie above the lines


def draw_series(pen: Pen, series: Series, place: int, plot: Plot) -> None:
    """A series in the form that its kind and its place among the series ask for."""
    points = [plot.place(x, y) for x, y in zip(series.x, series.y, strict=True)]
    colour = _COLOURS[place % len(_COLOURS)]
    dash = _DASHES[place % len(_DASHES)]
    if series.kind == "dots":
        _draw_dots(pen, points, place, are_few=len(points) <= SPARSE)
        return
    if series.kind in LINES:
        pen.line(points, _stroke(series, colour), _WIDTHS[series.kind], dash=dash)
        if len(points) == 1:
            _draw_mark(pen, place, points[0])
        return
    pen.line(led_through(points, plot), colour, _WIDTHS[series.kind], dash=dash)
    _draw_bars(pen, series, points, plot.vertical, colour)
    for point in points:
        _draw_mark(pen, place, point)


def _stroke(series: Series, colour: Colour) -> Colour:
    """A measured trace is lighter, so that the curve fitted to it shows."""
    return _light(colour) if series.kind == "trace" else colour


def _light(colour: Colour) -> Colour:
    red, green, blue = (1 - 0.75 * (1 - part) for part in colour)
    return red, green, blue


def _draw_dots(pen: Pen, points: Sequence[tuple[float, float]], place: int, *, are_few: bool) -> None:
    """Round ones, upright crosses, slanting crosses."""
    colour, r = _light(_COLOURS[place % len(_COLOURS)]), 1.0
    match place % 3:
        case 0:
            # a stroke of no length has round ends, and nothing between them
            pen.lines([(x, y, x, y) for x, y in points], colour, 3.0 if are_few else 1.7)
        case 1:
            pen.lines([s for x, y in points for s in ((x - r, y, x + r, y), (x, y - r, x, y + r))], colour, 0.5)
        case _:
            pen.lines(
                [s for x, y in points for s in ((x - r, y - r, x + r, y + r), (x - r, y + r, x + r, y - r))],
                colour,
                0.5,
            )


def led_through(points: Sequence[tuple[float, float]], plot: Plot) -> list[tuple[float, float]]:
    """The line that leads the eye from mark to mark; none where marks at one place lie far apart.

    Repeated readings at one place are led through in their middle; marks that differ there belong to different
    conditions, which a line must not join.
    """
    left, low, right, high = plot.area
    near, alike = 0.012 * abs(right - left), 0.08 * abs(high - low)
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


def draw_sample(pen: Pen, series: Series, place: int, left: tuple[float, float]) -> None:
    """A series' sign in the legend."""
    x, y = left
    if series.kind == "dots":
        _draw_dots(pen, [(x + 2, y), (x + 7, y), (x + 12, y)], place, are_few=len(series.x) <= SPARSE)
        return
    colour = _COLOURS[place % len(_COLOURS)]
    dash = _DASHES[place % len(_DASHES)]
    pen.line([(x, y), (x + 14, y)], _stroke(series, colour), _WIDTHS[series.kind], dash=dash)
    if series.kind == "points":
        _draw_mark(pen, place, (x + 7, y))
