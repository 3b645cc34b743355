"""The look of the page: its measures, its colours, its type scale. Lengths in points, colours in RGB from 0 to 1."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Literal

Colour = tuple[float, float, float]
Weight = Literal["regular", "semibold"]

PAGE = (595.28, 841.89)  # A4, upright
LEFT = 48.0
WIDTH = PAGE[0] - 2 * LEFT
TOP = PAGE[1] - 62.0  # upper edge of the text
BOTTOM = 56.0
ROOM = TOP - BOTTOM

INK: Colour = (0.10, 0.12, 0.15)
MUTED: Colour = (0.36, 0.40, 0.45)
RULE: Colour = (0.82, 0.84, 0.87)
PALE: Colour = (0.955, 0.963, 0.972)
WHITE: Colour = (1.0, 1.0, 1.0)
ACCENT: Colour = (0.08, 0.29, 0.44)
GREEN: Colour = (0.07, 0.43, 0.24)
RED: Colour = (0.68, 0.12, 0.12)
AMBER: Colour = (0.58, 0.37, 0.0)
SLATE: Colour = (0.30, 0.33, 0.42)


@dataclass(frozen=True, slots=True)
class Type:
    """How a piece of text looks."""

    size: float
    leading: float
    weight: Weight = "regular"
    colour: Colour = INK


TITLE = Type(22, 26, "semibold")
SUBTITLE = Type(11, 14.5)
HEADING = Type(12.5, 16, "semibold", ACCENT)
SUBHEADING = Type(9.2, 12, "semibold")
BODY = Type(8.8, 12)
BODY_BOLD = Type(8.8, 12, "semibold")
BODY_MUTED = Type(8.8, 12, "regular", MUTED)
CELL = Type(8.2, 10.6)
CELL_BOLD = Type(8.2, 10.6, "semibold")
CELL_MUTED = Type(7.6, 10.6, "regular", MUTED)
DENSE = Type(7.8, 10.0)  # tables of numbers
DENSE_BOLD = Type(7.8, 10.0, "semibold")
DENSE_MUTED = Type(7.8, 10.0, "regular", MUTED)
COLUMN = Type(7.6, 10.6, "semibold", MUTED)
SMALL = Type(7.4, 9.8, "regular", MUTED)
SMALL_BOLD = Type(7.4, 9.8, "semibold", MUTED)
FURNITURE = Type(7.2, 9, "regular", MUTED)
