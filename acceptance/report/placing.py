"""Where the labels of a plot stand: never on one another, on as little of the data as possible, near what they name.

Plain geometry in points, with no page in it.
"""

from __future__ import annotations

import math
from collections.abc import Iterable, Iterator, Sequence
from dataclasses import dataclass
from itertools import accumulate

from acceptance.report.fonts import string_width
from acceptance.report.style import Type

__all__ = ["Box", "Crowd", "Label", "apart", "place_labels"]

Box = tuple[float, float, float, float]  # left, low, right, high
Place = tuple[float, float]

_CELL = 2.5  # edge of the cells in which covered paper is counted
_GAP = 1.0  # between two labels
_MARGIN = 1.2  # around the text within its box
_COVERED = 3.0  # cost of a cell of data hidden
_PER_POINT = 0.2  # cost of a point of distance from what a label names
_QUIET = 4.0  # a place that costs less is taken without looking farther


@dataclass(frozen=True, slots=True)
class Label:
    """Lines of text, the box of what they name, and the places they would best stand at: lower left corners."""

    lines: tuple[str, ...]
    style: Type
    anchor: Box
    places: tuple[Place, ...]
    whole: str  # what is said beneath the plot where there is no room in it, or where the lines are cut
    is_cut: bool = False
    is_region: bool = False

    @property
    def size(self) -> tuple[float, float]:
        """Width and height with a margin."""
        wide = max(string_width(line, self.style.size, self.style.weight) for line in self.lines)
        return wide + 3.0, (len(self.lines) - 1) * self.style.leading + 8.0


class Crowd:
    """How much of a plot's paper is covered, by cells."""

    def __init__(self, area: Box) -> None:
        self._left, self._low = area[0], area[1]
        self._columns = max(1, math.ceil((area[2] - area[0]) / _CELL))
        self._rows = max(1, math.ceil((area[3] - area[1]) / _CELL))
        self._cells = [[0.0] * self._columns for _ in range(self._rows)]
        self._sums: list[list[float]] = []

    def add(self, x: float, y: float, weight: float = 1.0) -> None:
        """Something at a place; more of it at the same place counts once."""
        column, row = int((x - self._left) / _CELL), int((y - self._low) / _CELL)
        if 0 <= column < self._columns and 0 <= row < self._rows:
            self._cells[row][column] = max(self._cells[row][column], weight)
            self._sums = []

    def add_path(self, points: Sequence[Place], weight: float = 1.0) -> None:
        """A line through places."""
        for x, y in points[:1]:
            self.add(x, y, weight)
        for (a, b), (c, d) in zip(points, points[1:], strict=False):
            steps = min(int(max(abs(c - a), abs(d - b)) / _CELL) + 1, self._columns + self._rows)
            for n in range(1, steps + 1):
                self.add(a + (c - a) * n / steps, b + (d - b) * n / steps, weight)

    def covered(self, box: Box) -> float:
        """Weight of the covered cells that what stands in a box touches; its margin may."""
        if not self._sums:
            self._sums = self._summed()
        left = min(max(int((box[0] + _MARGIN - self._left) / _CELL), 0), self._columns)
        low = min(max(int((box[1] + _MARGIN - self._low) / _CELL), 0), self._rows)
        right = min(max(int((box[2] - _MARGIN - self._left) / _CELL) + 1, left), self._columns)
        high = min(max(int((box[3] - _MARGIN - self._low) / _CELL) + 1, low), self._rows)
        sums = self._sums
        return sums[high][right] - sums[low][right] - sums[high][left] + sums[low][left]

    def _summed(self) -> list[list[float]]:
        """Sums over all cells below and to the left."""
        sums = [[0.0] * (self._columns + 1)]
        for row in self._cells:
            across = accumulate(row, initial=0.0)
            sums.append([below + so_far for below, so_far in zip(sums[-1], across, strict=True)])
        return sums


def place_labels(labels: Sequence[Label], crowd: Crowd, area: Box) -> list[Box | None]:
    """The box of each label within the area, in order; None for one that finds no room beside the others."""
    taken: list[Box] = []
    found: list[Box | None] = []
    for label in labels:
        box = _best(label, crowd, area, taken)
        found.append(box)
        if box is not None:
            taken.append(box)
    return found


def _best(label: Label, crowd: Crowd, area: Box, taken: Sequence[Box]) -> Box | None:
    """The cheapest of the wanted places; anywhere in the area where each of those is bad."""
    best, least = None, math.inf
    for rank, box in enumerate(_boxes(label.places, label, area)):
        cost = 0.3 * rank + _cost(box, label, crowd, taken)
        if cost < least:
            best, least = box, cost
    if least <= _QUIET:
        return best
    for box in _boxes(_anywhere(label, area), label, area):
        cost = 3.0 + _cost(box, label, crowd, taken)
        if cost < least:
            best, least = box, cost
    return best


def _cost(box: Box, label: Label, crowd: Crowd, taken: Sequence[Box]) -> float:
    if any(_overlap(box, other) for other in taken):
        return math.inf
    return _COVERED * crowd.covered(box) + _PER_POINT * max(0.0, apart(box, label.anchor) - 4.0)


def _boxes(places: Iterable[Place], label: Label, area: Box) -> Iterator[Box]:
    """The boxes at places, moved sideways into the area where need be; none that stands out of it above or below."""
    wide, high = label.size
    if wide > area[2] - area[0]:
        return
    for left, low in places:
        inside = min(max(left, area[0]), area[2] - wide)
        if area[1] <= low and low + high <= area[3]:
            yield inside, low, inside + wide, low + high


def _anywhere(label: Label, area: Box) -> Iterator[Place]:
    wide, high = label.size
    columns = int(max(0.0, area[2] - area[0] - wide) / 8.0) + 1
    rows = int(max(0.0, area[3] - area[1] - high) / 5.0) + 1
    for row in range(rows):
        for column in range(columns):
            yield area[0] + 8.0 * column, area[1] + 5.0 * row


def _overlap(one: Box, other: Box) -> bool:
    return (
        one[0] < other[2] + _GAP and other[0] < one[2] + _GAP and one[1] < other[3] + _GAP and other[1] < one[3] + _GAP
    )


def apart(one: Box, other: Box) -> float:
    """Distance of two boxes; 0 where they touch."""
    aside = max(one[0] - other[2], other[0] - one[2], 0.0)
    upright = max(one[1] - other[3], other[1] - one[3], 0.0)
    return math.hypot(aside, upright)
