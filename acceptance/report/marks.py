"""Marks drawn as vectors: verdicts that do not need colour to be told apart, and the warning triangle."""

from __future__ import annotations

from acceptance.record import FindingVerdict, UnitVerdict
from acceptance.report.pen import Pen
from acceptance.report.style import AMBER, GREEN, INK, RED, SLATE, WHITE, Colour

__all__ = ["FINDING_COLOURS", "UNIT_COLOURS", "UNIT_WORDS", "finding_mark", "unit_mark", "warning_triangle"]

FINDING_COLOURS: dict[FindingVerdict, Colour] = {
    "pass": GREEN,
    "conditional pass": AMBER,
    "conditional fail": AMBER,
    "fail": RED,
    "not judged": SLATE,
}
UNIT_COLOURS: dict[UnitVerdict, Colour] = {"accepted": GREEN, "rejected": RED, "undecided": AMBER}
UNIT_WORDS: dict[UnitVerdict, str] = {"accepted": "ACCEPTED", "rejected": "REJECTED", "undecided": "UNDECIDED"}

Place = tuple[float, float]


def finding_mark(pen: Pen, verdict: FindingVerdict, centre: Place, radius: float) -> None:
    """The mark of a finding: a full disc when shown, a ring when conditional, a diamond when not judged."""
    colour = FINDING_COLOURS[verdict]
    if verdict == "not judged":
        x, y = centre
        r = radius * 1.15
        pen.polygon([(x, y + r), (x + r, y), (x, y - r), (x - r, y)], fill=WHITE, stroke=colour, width=radius * 0.24)
        _question(pen, centre, radius * 0.62, colour)
        return
    full = verdict in ("pass", "fail")
    pen.circle(centre, radius, fill=colour if full else WHITE, stroke=colour, width=radius * 0.24)
    stroke = _tick if verdict in ("pass", "conditional pass") else _cross
    stroke(pen, centre, radius * 0.62, WHITE if full else colour)


def unit_mark(pen: Pen, verdict: UnitVerdict, centre: Place, radius: float) -> None:
    """The mark of the unit's verdict, white, for a coloured ground."""
    pen.circle(centre, radius, stroke=WHITE, width=radius * 0.13)
    drawn = {"accepted": _tick, "rejected": _cross, "undecided": _question}[verdict]
    drawn(pen, centre, radius * 0.60, WHITE)


def _tick(pen: Pen, centre: Place, size: float, colour: Colour) -> None:
    x, y = centre
    points = [
        (x - 0.80 * size, y - 0.05 * size),
        (x - 0.20 * size, y - 0.65 * size),
        (x + 0.85 * size, y + 0.65 * size),
    ]
    pen.line(points, colour, size * 0.38)


def _cross(pen: Pen, centre: Place, size: float, colour: Colour) -> None:
    x, y = centre
    d = 0.62 * size
    pen.lines([(x - d, y - d, x + d, y + d), (x - d, y + d, x + d, y - d)], colour, size * 0.38)


def _question(pen: Pen, centre: Place, size: float, colour: Colour) -> None:
    x, y = centre
    hook = [
        (-0.42, 0.45),
        (-0.30, 0.78),
        (0.0, 0.92),
        (0.30, 0.78),
        (0.42, 0.48),
        (0.30, 0.20),
        (0.0, 0.0),
        (0.0, -0.28),
    ]
    pen.line([(x + a * size, y + b * size) for a, b in hook], colour, size * 0.34)
    pen.circle((x, y - 0.80 * size), size * 0.21, fill=colour)


def warning_triangle(pen: Pen, centre: Place, size: float) -> None:
    """The general warning: a triangle with an exclamation mark, its base `size` wide."""
    x, y = centre
    half, height = size / 2, size * 0.88
    low = y - height / 2
    pen.polygon(
        [(x - half, low), (x + half, low), (x, low + height)], fill=(1.0, 0.80, 0.10), stroke=INK, width=size * 0.075
    )
    pen.polygon(
        [
            (x - 0.055 * size, low + 0.62 * height),
            (x + 0.055 * size, low + 0.62 * height),
            (x + 0.03 * size, low + 0.27 * height),
            (x - 0.03 * size, low + 0.27 * height),
        ],
        fill=INK,
        stroke=INK,
        width=size * 0.02,
    )
    pen.circle((x, low + 0.15 * height), size * 0.05, fill=INK)
