"""What is drawn into a plot beside its data: limits, marks and regions, and the labels they ask for.

A limit is a dashed line whose short strokes point to the side that is not allowed; a mark is a ring, or a dash-dotted
line over the whole height; a region is a light ground between thin lines. All of it survives black-and-white print.
"""

from __future__ import annotations

import math
from dataclasses import dataclass, replace
from typing import TypeGuard

from acceptance.printing import duration, limit_range, quantity
from acceptance.record import Axis, Figure, LimitLine, Mark, Region
from acceptance.report.axes import LinearAxis
from acceptance.report.fonts import printable, string_width
from acceptance.report.pen import Pen
from acceptance.report.placing import Box, Crowd, Label
from acceptance.report.style import INK, MUTED, RED, Colour, Type
from acceptance.report.wrap import fit, fold, wrap

__all__ = [
    "GROUND",
    "Plot",
    "crowd_of",
    "draw_borders",
    "draw_grounds",
    "draw_limits",
    "draw_marks",
    "labels_of",
    "ordinary",
]

GROUND: Colour = (0.925, 0.94, 0.955)
_LIMIT = Type(7.0, 8.5, "semibold", RED)
_MARK = Type(7.0, 8.5, "regular", INK)
_REGION = Type(7.0, 8.5, "regular", MUTED)
_RING = 3.6  # radius
_CAP = 1.9  # half the width of an error bar's end
_WIDEST = 112.0  # a label of a mark or a region is broken into lines so wide
_MOST_LINES = 3


@dataclass(frozen=True, slots=True)
class Plot:
    """A figure's two axes."""

    horizontal: LinearAxis
    vertical: LinearAxis

    @property
    def area(self) -> Box:
        """What lies between the axes' ends."""
        return self.horizontal.start, self.vertical.start, self.horizontal.end, self.vertical.end

    def place(self, x: float, y: float) -> tuple[float, float]:
        """Where a point of the plot lies on the page."""
        return self.horizontal.place(x), self.vertical.place(y)


def ordinary(number: float | None) -> TypeGuard[float]:
    """Finite, and not so large that a range of such numbers could overflow."""
    return number is not None and math.isfinite(number) and abs(number) < 1e150


# -- regions


def _box(region: Region, plot: Plot) -> Box:
    """A region's place; an edge that is not given, or is no number, is that of the plot."""
    left, low, right, high = plot.area
    x_from = plot.horizontal.place(region.x_from) if ordinary(region.x_from) else left
    x_to = plot.horizontal.place(region.x_to) if ordinary(region.x_to) else right
    y_from = plot.vertical.place(region.y_from) if ordinary(region.y_from) else low
    y_to = plot.vertical.place(region.y_to) if ordinary(region.y_to) else high
    (x_from, x_to), (y_from, y_to) = sorted((x_from, x_to)), sorted((y_from, y_to))
    return max(x_from, left), max(y_from, low), min(x_to, right), min(y_to, high)


def draw_grounds(pen: Pen, figure: Figure, plot: Plot) -> None:
    """The grounds of the regions, to lie below everything."""
    for region in figure.regions:
        left, low, right, high = _box(region, plot)
        pen.rectangle((left, low, right - left, high - low), fill=GROUND)


def draw_borders(pen: Pen, figure: Figure, plot: Plot) -> None:
    """The regions' edges where they are not the plot's own."""
    area = plot.area
    strokes = []
    for region in figure.regions:
        left, low, right, high = _box(region, plot)
        strokes += [(x, low, x, high) for x in (left, right) if area[0] + 0.5 < x < area[2] - 0.5]
        strokes += [(left, y, right, y) for y in (low, high) if area[1] + 0.5 < y < area[3] - 0.5]
    pen.lines(strokes, MUTED, 0.5)


def _region_label(region: Region, plot: Plot) -> Label:
    box = _box(region, plot)
    text = fold(region.label)
    word = max(
        string_width(printable(part), _REGION.size, _REGION.weight) for part in text.split() or [""]
    )  # a name is not broken for a narrow region; it stands beside it
    lines, is_cut = _broken(text, _REGION, min(_WIDEST, max(46.0, word, box[2] - box[0] - 4)))
    label = Label(lines, _REGION, box, (), f"region “{text}”", is_cut, is_region=True)
    wide, high = label.size
    lefts = (box[0] + 2, box[2] - wide - 2, (box[0] + box[2] - wide) / 2)
    lows = (box[3] - high - 1, box[1] + 2)
    places = []
    if box[2] - box[0] >= wide and box[3] - box[1] >= high:
        places += [(left, low) for low in lows for left in lefts]
    if box[2] - box[0] < 2 * wide:  # beside a narrow one
        steps = [box[3] - high - 1 - n * max(0.0, box[3] - box[1] - high - 2) / 5 for n in range(6)]
        places += [(left, low) for low in steps for left in (box[0] - wide - 2, box[2] + 2)]
    if box[3] - box[1] < 2 * high:  # above or below a flat one
        places += [(left, low) for low in (box[3] + 1.5, box[1] - high - 1.5) for left in lefts]
    return _with_places(label, places)


# -- limits


def _span(limit: LimitLine, horizontal: LinearAxis) -> tuple[float, float]:
    """From where to where a limit is drawn; one that holds at a single place is given some width. [pt]"""
    begin = horizontal.place(limit.x_from) if ordinary(limit.x_from) else horizontal.start
    end = horizontal.place(limit.x_to) if ordinary(limit.x_to) else horizontal.end
    begin, end = min(begin, end), max(begin, end)
    short = max(0.0, 20.0 - (end - begin)) / 2
    return max(horizontal.start, begin - short), min(horizontal.end, end + short)


def draw_limits(pen: Pen, figure: Figure, plot: Plot) -> None:
    """The limits' lines."""
    for limit in figure.limits:
        if not ordinary(limit.y):
            continue
        begin, end = _span(limit, plot.horizontal)
        height = plot.vertical.place(limit.y)
        away = -4.0 if limit.side == "min" else 4.0
        count = int((end - begin) / 5)
        pen.lines([(begin + 5 * n + 3, height, begin + 5 * n, height + away) for n in range(count)], RED, 0.45)
        pen.line([(begin, height), (end, height)], RED, 1.0, dash=(4, 2))


def _limit_text(limit: LimitLine, axis: Axis) -> str:
    """The label and the limit; one of many digits was worked out for the figure, and is told by five of them."""
    five = float(f"{limit.y:.5g}")
    at = limit.y if float(f"{limit.y:.7g}") == limit.y else five
    low, high = (at, None) if limit.side == "min" else (None, at)
    amount = limit_range(low, high, axis.unit)
    label = fold(limit.label.removesuffix(" min").removesuffix(" max"))  # the sign says it
    return label if amount in label else f"{label} {amount}".strip()


def _limit_label(limit: LimitLine, axis: Axis, plot: Plot) -> Label:
    """Above or below its line, at its ends or its middle; beside a short one; a line of text farther away."""
    begin, end = _span(limit, plot.horizontal)
    height = plot.vertical.place(limit.y)
    whole = _limit_text(limit, axis)
    text = fit(whole, _LIMIT, plot.horizontal.end - plot.horizontal.start - 6)
    label = Label((text,), _LIMIT, (begin, height, end, height), (), f"limit “{whole}”", "…" in text)
    wide, _ = label.size
    above, below = (height + 2.5, height - 13.5) if limit.side == "min" else (height + 5.5, height - 9.5)
    rows = (below, above) if limit.side == "min" else (above, below)
    lefts = (end - wide, begin, (begin + end - wide) / 2)
    places = [(left, low) for low in rows for left in lefts]
    places += [(end + 4, height - 4), (begin - wide - 4, height - 4)]
    places += [(left, below - 9) for left in lefts] + [(left, above + 9) for left in lefts]
    return _with_places(label, places)


# -- marks


def draw_marks(pen: Pen, figure: Figure, plot: Plot) -> None:
    """Rings, and lines over the whole height, with the uncertainty of where they stand."""
    _, low, _, high = plot.area
    for mark in figure.marks:
        if not _is_drawn(mark):
            continue
        x = plot.horizontal.place(mark.x)
        if mark.y is None:
            pen.line([(x, low), (x, high)], INK, 0.7, dash=(6, 2, 1.2, 2))
        else:
            pen.circle((x, plot.vertical.place(mark.y)), _RING, stroke=INK, width=0.9)
        pen.lines(_bar(mark, plot), INK, 0.8)


def _is_drawn(mark: Mark) -> bool:
    return ordinary(mark.x) and (mark.y is None or ordinary(mark.y))


def _bar(mark: Mark, plot: Plot) -> list[tuple[float, float, float, float]]:
    """The strokes of the error bar; none where it would not be seen, no end where it leaves the plot."""
    u = mark.expanded_uncertainty
    if u is None or not ordinary(u) or u <= 0:
        return []
    left, right = plot.horizontal.place(mark.x - u), plot.horizontal.place(mark.x + u)
    height = plot.vertical.end - 5.0 if mark.y is None else plot.vertical.place(mark.y)
    if right - left < 2.0:
        return []
    begin, end = max(left, plot.horizontal.start), min(right, plot.horizontal.end)
    ends = [(x, height - _CAP, x, height + _CAP) for x in (left, right) if begin <= x <= end]
    return [(begin, height, end, height), *ends]


def _mark_label(mark: Mark, figure: Figure, plot: Plot) -> Label:
    """Around a ring; at either side of a line, best at its upper end."""
    _, low, _, high = plot.area
    x = plot.horizontal.place(mark.x)
    lines, is_cut = _broken(fold(mark.label), _MARK, _WIDEST)
    at = duration(mark.x) if figure.x.unit == "s" else quantity(mark.x, figure.x.unit)
    whole = f"“{fold(mark.label)}” at {at}"
    if mark.y is None:
        label = Label(lines, _MARK, (x, low, x, high), (), whole, is_cut)
        wide, tall = label.size
        steps = [high - tall - 9 - n * (high - low - tall - 11) / 6 for n in range(7)]
        return _with_places(label, [(left, step) for step in steps for left in (x + 2, x - wide - 2)])
    y = plot.vertical.place(mark.y)
    whole += f", {quantity(mark.y, figure.y.unit)}"
    label = Label(lines, _MARK, (x - _RING, y - _RING, x + _RING, y + _RING), (), whole, is_cut)
    wide, tall = label.size
    beside, off = y - tall / 2, _RING + 2
    right, left, middle = x + off, x - off - wide, x - wide / 2
    above, under = y + off, y - off - tall
    places = [(right, above), (left, above), (right, beside), (left, beside), (right, under), (left, under)]
    return _with_places(label, [*places, (middle, above + 2), (middle, under - 2)])


# -- labels


def labels_of(figure: Figure, plot: Plot) -> list[Label]:
    """A label for whatever is drawn and has a text; those that can stand in fewest places first."""
    marks = [mark for mark in figure.marks if _is_drawn(mark) and mark.label.strip()]
    points = [_mark_label(mark, figure, plot) for mark in marks if mark.y is not None]
    limits = [_limit_label(limit, figure.y, plot) for limit in figure.limits if ordinary(limit.y)]
    lines = [_mark_label(mark, figure, plot) for mark in marks if mark.y is None]
    regions = [_region_label(region, plot) for region in figure.regions if region.label.strip()]
    return [*points, *limits, *lines, *regions]


def _broken(text: str, style: Type, width: float) -> tuple[tuple[str, ...], bool]:
    """A label's lines, and whether something of it was left out."""
    lines = wrap(text, style, width)
    if len(lines) > _MOST_LINES:
        return (fit(text, style, width),), True
    narrower = width - 6.0
    # lines about as long as one another, no word broken for it
    while len(lines) > 1 and narrower > 30.0:
        closer = wrap(text, style, narrower)
        if len(closer) > len(lines) or " ".join(closer) != " ".join(lines):
            break
        lines, narrower = closer, narrower - 6.0
    return tuple(lines), False


def _with_places(label: Label, places: list[tuple[float, float]]) -> Label:
    return replace(label, places=tuple(places))


def crowd_of(figure: Figure, plot: Plot) -> Crowd:
    """The paper that limits, marks and edges of regions take, for labels to keep clear of."""
    crowd = Crowd(plot.area)
    _, low, _, high = plot.area
    for limit in figure.limits:
        if ordinary(limit.y):
            begin, end = _span(limit, plot.horizontal)
            height = plot.vertical.place(limit.y)
            crowd.add_path([(begin, height), (end, height)])
            away = -3.0 if limit.side == "min" else 3.0
            crowd.add_path([(begin, height + away), (end, height + away)], 0.5)
    for mark in figure.marks:
        if not _is_drawn(mark):
            continue
        x = plot.horizontal.place(mark.x)
        if mark.y is None:
            crowd.add_path([(x, low), (x, high)], 1.5)
        else:
            y = plot.vertical.place(mark.y)
            for across in (-_RING, 0.0, _RING):
                crowd.add_path([(x + across, y - _RING), (x + across, y + _RING)], 3.0)
        for a, b, c, d in _bar(mark, plot):
            crowd.add_path([(a, b), (c, d)], 2.0)
    for region in figure.regions:
        left, bottom, right, top = _box(region, plot)
        crowd.add_path([(left, bottom), (left, top), (right, top), (right, bottom), (left, bottom)], 0.2)
    return crowd
