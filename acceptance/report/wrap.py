"""Lines from text: wrapping at spaces, and within words that are wider than the line. Nothing is cut off."""

from __future__ import annotations

import re
from collections.abc import Sequence
from dataclasses import dataclass

from acceptance.report.fonts import printable, string_width
from acceptance.report.style import Type

__all__ = ["Piece", "Run", "fit", "fold", "wrap", "wrap_runs"]


@dataclass(frozen=True, slots=True)
class Run:
    """Text of one look within a paragraph."""

    text: str
    style: Type


@dataclass(frozen=True, slots=True)
class Piece:
    """A string at its place in a line."""

    x: float
    text: str
    style: Type


_UNITS = r"(?:%|°C|ppm|[pnµmkM]?(?:V|VA|A|W|s|Hz|Ω|F|ohm)|K|min|h|bit)"
_APART = re.compile(rf"(?<=\d) (?={_UNITS}(?!\w))|(?<=[±≥≤<>]) (?=\d)")


def fold(text: str) -> str:
    """Prose on one line: line ends, tabs and repeated spaces become one space. Other controls stay, to be seen.

    A number and its unit stay together.
    """
    return _APART.sub("\N{NO-BREAK SPACE}", re.sub(r"[ \t\r\n]+", " ", text).strip(" "))


def wrap(text: str, style: Type, width: float) -> list[str]:
    """The lines of a text that is `width` wide; one empty line for an empty text."""
    text = printable(text)
    if string_width(text, style.size, style.weight) <= width:
        return [text]
    return ["".join(piece.text for piece in line).rstrip(" ") for line in wrap_runs([Run(text, style)], width)]


def wrap_runs(runs: Sequence[Run], width: float) -> list[list[Piece]]:
    """The lines of a paragraph of several looks."""
    lines: list[list[Piece]] = [[]]
    x = 0.0
    for run in runs:
        style = run.style
        for word in _words(printable(run.text)):
            wide = string_width(word, style.size, style.weight)
            # a space at the end of a line may hang over
            seen = string_width(word.rstrip(" "), style.size, style.weight) if word.endswith(" ") else wide
            if x and x + seen > width:
                lines.append([])
                x = 0.0
            if seen <= width:
                _put(lines[-1], Piece(x, word, style))
                x += wide
                continue
            chunks = _chunks(word, style, width)
            for chunk in chunks[:-1]:
                lines[-1].append(Piece(0.0, chunk, style))
                lines.append([])
            lines[-1].append(Piece(0.0, chunks[-1], style))
            x = string_width(chunks[-1], style.size, style.weight)
    return lines


def _words(text: str) -> list[str]:
    """The words of a text, each with the spaces after it; leading spaces stand alone."""
    return re.findall(r" *[^ ]+ *| +", text) if text.startswith(" ") else re.findall(r"[^ ]+ *", text)


def _put(line: list[Piece], piece: Piece) -> None:
    """Add a word to a line, joined to the piece before it when that looks the same."""
    if line and line[-1].style is piece.style:
        last = line[-1]
        line[-1] = Piece(last.x, last.text + piece.text, last.style)
    else:
        line.append(piece)


def _chunks(word: str, style: Type, width: float) -> list[str]:
    """A word in parts that fit; at least one character each."""
    chunks: list[str] = []
    start, used = 0, 0.0
    for place, character in enumerate(word):
        wide = string_width(character, style.size, style.weight)
        if place > start and used + wide > width:
            chunks.append(word[start:place])
            start, used = place, 0.0
        used += wide
    chunks.append(word[start:])
    return chunks


def fit(text: str, style: Type, width: float) -> str:
    """The text on one line, its middle left out with a visible mark where it is too wide; for headers only."""
    text = printable(text)
    if string_width(text, style.size, style.weight) <= width:
        return text
    room = width - string_width("…", style.size, style.weight)
    head = tail = 0
    used = 0.0
    while head + tail < len(text):
        character = text[head] if head <= tail else text[-1 - tail]
        used += string_width(character, style.size, style.weight)
        if used > room:
            break
        head, tail = (head + 1, tail) if head <= tail else (head, tail + 1)
    return f"{text[:head]}…{text[len(text) - tail :]}"
