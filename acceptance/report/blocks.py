"""Blocks: what a page is made of, and how they flow from page to page.

A block knows its height as soon as it is made, can be split where that makes sense, and is drawn at a place. Nothing
overlaps, since each is given the room it asks for; nothing is lost, since what does not fit goes on to the next page.
"""

from __future__ import annotations

from collections import deque
from collections.abc import Iterable, Sequence
from dataclasses import dataclass

from acceptance.report.pen import Pen
from acceptance.report.style import BODY, HEADING, ROOM, RULE, SUBHEADING, WIDTH, Colour, Type
from acceptance.report.wrap import Piece, Run, wrap_runs

__all__ = ["Beside", "Block", "Panel", "Placed", "Rule", "Stack", "Text", "heading", "paginate", "subheading"]

Halves = tuple["Block | None", "Block | None"]


class Block:
    """Something with a height, drawn from its upper left corner."""

    height: float = 0.0  # [pt]
    above: float = 0.0  # room left above it, unless it is the first on the page [pt]
    keep_next: bool = False  # whether it must not stand alone at a page's foot

    @property
    def least(self) -> float:
        """Height of the smallest part that may stand alone at a page's foot. [pt]"""
        return self.height

    def split(self, room: float) -> Halves:
        """What fits into the room, and the rest; None for a half that is empty."""
        return (self, None) if self.height <= room else (None, self)

    def draw(self, pen: Pen, x: float, y: float) -> None:
        """Draw it with its upper left corner at (x, y)."""
        raise NotImplementedError


class Text(Block):
    """A paragraph, of one look or of several."""

    def __init__(
        self,
        runs: str | Sequence[Run],
        style: Type = BODY,
        *,
        width: float = WIDTH,
        above: float = 0.0,
        keep_next: bool = False,
    ) -> None:
        self._style = style
        self._set(wrap_runs([Run(runs, style)] if isinstance(runs, str) else runs, width))
        self.above = above
        self.keep_next = keep_next

    def _set(self, lines: list[list[Piece]]) -> None:
        self._lines = lines
        self.height = len(lines) * self._style.leading

    @property
    def least(self) -> float:
        lines = len(self._lines)
        return (lines if lines <= 3 else 2) * self._style.leading  # three are not split: one would be left alone

    def split(self, room: float) -> Halves:
        fitting = int(room / self._style.leading + 1e-6)
        if fitting >= len(self._lines):
            return self, None
        if len(self._lines) - fitting == 1:
            fitting -= 1  # no last line alone on the next page
        if fitting < 2:
            return None, self
        return self._part(self._lines[:fitting]), self._part(self._lines[fitting:])

    def _part(self, lines: list[list[Piece]]) -> Text:
        part = Text.__new__(Text)
        part._style = self._style
        part._set(lines)
        return part

    def draw(self, pen: Pen, x: float, y: float) -> None:
        baseline = y - 0.5 * self._style.leading - 0.34 * self._style.size
        for line in self._lines:
            for piece in line:
                pen.text(x + piece.x, baseline, piece.text, piece.style)
            baseline -= self._style.leading


def heading(text: str, *, width: float = WIDTH) -> Text:
    """A section's heading; stays with what follows."""
    return Text(text, HEADING, width=width, above=17, keep_next=True)


def subheading(text: str, *, width: float = WIDTH, above: float = 9) -> Text:
    """A heading within a section; stays with what follows."""
    return Text(text, SUBHEADING, width=width, above=above, keep_next=True)


class Rule(Block):
    """A thin line across."""

    def __init__(
        self, *, colour: Colour = RULE, thickness: float = 0.6, above: float = 6, width: float = WIDTH
    ) -> None:
        self.height = thickness
        self.above = above
        self._colour = colour
        self._width = width

    def draw(self, pen: Pen, x: float, y: float) -> None:
        pen.line([(x, y), (x + self._width, y)], self._colour, self.height)


class Stack(Block):
    """Blocks one below the other; together on a page when `together`."""

    def __init__(self, blocks: Iterable[Block], *, above: float = 0.0, together: bool = False) -> None:
        self._blocks = list(blocks)
        self.above = above
        self._together = together
        gaps = sum(block.above for block in self._blocks[1:])
        self.height = gaps + sum(block.height for block in self._blocks)

    @property
    def least(self) -> float:
        return self.height if self._together or not self._blocks else self._blocks[0].least

    def split(self, room: float) -> Halves:
        if self.height <= room:
            return self, None
        if self._together and self.height <= ROOM:
            return None, self
        used = 0.0
        for place, block in enumerate(self._blocks):
            gap = block.above if place else 0.0
            if used + gap + block.height <= room:
                used += gap + block.height
                continue
            head, tail = block.split(room - used - gap)
            first = [*self._blocks[:place], *([head] if head else [])]
            rest = [*([tail] if tail else []), *self._blocks[place + 1 :]]
            if not first:
                return None, self
            return Stack(first), Stack(rest)
        return self, None

    def draw(self, pen: Pen, x: float, y: float) -> None:
        for place, block in enumerate(self._blocks):
            y -= block.above if place else 0.0
            block.draw(pen, x, y)
            y -= block.height


class Beside(Block):
    """Blocks side by side, each at its own distance from the left; never split."""

    def __init__(self, blocks: Sequence[tuple[float, Block]], *, above: float = 0.0) -> None:
        self._blocks = blocks
        self.above = above
        self.height = max(block.height for _, block in blocks)

    def draw(self, pen: Pen, x: float, y: float) -> None:
        for offset, block in self._blocks:
            block.draw(pen, x + offset, y)


class Panel(Block):
    """Blocks on a ground of their own, with a bar at the left."""

    def __init__(
        self, inside: Block, *, fill: Colour | None, bar: Colour, stroke: Colour | None = None, above: float = 0.0
    ) -> None:
        self._inside = inside
        self._fill, self._bar, self._stroke = fill, bar, stroke
        self.above = above
        self.height = inside.height + 2 * self.PADDING

    PADDING = 9.0
    INSET = 14.0  # from the panel's left edge to what stands in it
    INNER = WIDTH - INSET - 12.0  # width of what stands in it

    @property
    def least(self) -> float:
        return self._inside.least + 2 * self.PADDING

    def split(self, room: float) -> Halves:
        if self.height <= room:
            return self, None
        head, tail = self._inside.split(room - 2 * self.PADDING)
        return self._part(head), self._part(tail)

    def _part(self, inside: Block | None) -> Panel | None:
        return Panel(inside, fill=self._fill, bar=self._bar, stroke=self._stroke) if inside else None

    def draw(self, pen: Pen, x: float, y: float) -> None:
        low = y - self.height
        pen.rectangle((x, low, WIDTH, self.height), fill=self._fill, stroke=self._stroke)
        pen.rectangle((x, low, 3.2, self.height), fill=self._bar)
        self._inside.draw(pen, x + self.INSET, y - self.PADDING)


@dataclass(frozen=True, slots=True)
class Placed:
    """A block, and how far below the text's upper edge it begins."""

    block: Block
    down: float


def paginate(blocks: Iterable[Block], room: float) -> list[list[Placed]]:
    """The blocks on pages of so much room each, in order."""
    pages: list[list[Placed]] = [[]]
    used = 0.0
    queue = deque(blocks)
    while queue:
        block = queue.popleft()
        gap = block.above if pages[-1] else 0.0
        free = room - used - gap
        if block.height + _kept(block, queue) <= free:
            head, tail = block, None
        elif block.keep_next and pages[-1]:
            head, tail = None, block
        else:
            head, tail = block.split(free)
        if head is None and tail is not None and not pages[-1]:
            head, tail = tail, None  # higher than a page and not to be split: drawn whole rather than lost
        if head is not None:
            pages[-1].append(Placed(head, used + gap))
            used += gap + head.height
        if tail is not None:
            queue.appendleft(tail)
            pages.append([])
            used = 0.0
    return pages


def _kept(block: Block, following: deque[Block]) -> float:
    """Room that must be left below a heading for what it heads."""
    kept = 0.0
    for after in following:
        if not block.keep_next:
            break
        kept += after.above + (after.height if after.keep_next else after.least)
        block = after
    return kept
