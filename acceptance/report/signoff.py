"""The end of the report: who tested, reviewed and approved, and what the report may be used for."""

from __future__ import annotations

from acceptance.report.blocks import Block, Stack, Text, heading
from acceptance.report.pen import Pen
from acceptance.report.style import ACCENT, BODY, CELL_MUTED, INK, MUTED, RULE, SMALL, SUBHEADING, WIDTH, Type
from acceptance.report.wrap import fit

__all__ = ["NOT_SIGNED", "sign_off"]

NOT_SIGNED = "Not signed off"

_ROLES = (
    ("Tested", "tested the unit"),
    ("Reviewed", "checked data and decision"),
    ("Approved", "releases this report"),
)
_GAP = 14.0
_BOX = (WIDTH - 2 * _GAP) / 3


def sign_off(report_number: str) -> list[Block]:
    """Three boxes and the closing words, together on one page."""
    return [
        Stack(
            [
                heading("Sign-off"),
                Text(_STATE, BODY, above=1),
                _Boxes(),
                Text(_USE, SMALL, above=9),
                _End(report_number),
            ],
            above=17,
            together=True,
        )
    ]


_STATE = f"{NOT_SIGNED}. A report without all three signatures is a draft, whatever its verdict."
_USE = (
    "The results relate only to the unit tested, in the state it was in and under the conditions given. The report may "
    "be passed on whole; parts of it only with the issuer's written consent. It says whether performance limits are "
    "met; it is no statement on electrical safety, and no approval to put the unit into use."
)


class _Boxes(Block):
    """One box for each role, with lines for name, date and signature."""

    height = 92.0
    above = 7.0

    def draw(self, pen: Pen, x: float, y: float) -> None:
        for place, (role, meaning) in enumerate(_ROLES):
            left = x + place * (_BOX + _GAP)
            pen.rectangle((left, y - self.height, _BOX, self.height), stroke=MUTED, width=0.7)
            pen.rectangle((left, y - 20, _BOX, 20), fill=ACCENT)
            pen.text(left + 8, y - 13.4, role, _ROLE)
            pen.text(left + _BOX - 8, y - 13.2, meaning, _MEANING, align="right")
            for line, word in enumerate(("Name", "Date", "Signature")):
                base = y - 35 - line * 18 - (13 if word == "Signature" else 0)
                pen.text(left + 8, base, word, CELL_MUTED)
                pen.line([(left + 46, base - 2), (left + _BOX - 8, base - 2)], RULE, 0.7)


_ROLE = Type(SUBHEADING.size, 12, "semibold", (1.0, 1.0, 1.0))
_MEANING = Type(7.4, 9, "regular", (0.88, 0.92, 0.96))


class _End(Block):
    """The mark that nothing follows."""

    height = 12.0
    above = 10.0

    def __init__(self, report_number: str) -> None:
        self._text = fit(f"End of report {report_number}", CELL_MUTED, WIDTH - 120)

    def draw(self, pen: Pen, x: float, y: float) -> None:
        from acceptance.report.fonts import string_width

        middle, half = x + WIDTH / 2, string_width(self._text, CELL_MUTED.size) / 2 + 10
        pen.lines([(x, y - 6, middle - half, y - 6), (middle + half, y - 6, x + WIDTH, y - 6)], INK, 0.7)
        pen.text(middle, y - 8.6, self._text, CELL_MUTED, align="centre")
