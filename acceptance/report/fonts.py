"""The font family, loaded once: widths of strings, and what the font cannot show.

A character that the font lacks, or that has no shape of its own (a control character, a mark of direction), is drawn
as a filled box: visible, never dropped, never a crash. The report lists what stood there.
"""

from __future__ import annotations

import unicodedata
from functools import lru_cache
from importlib.util import find_spec
from pathlib import Path
from typing import Any

from acceptance.errors import ReportError
from acceptance.report.style import Weight

__all__ = ["NAMES", "REPLACEMENT", "font", "is_printable", "printable", "string_width"]

REPLACEMENT = "\N{BLACK SQUARE}"
NAMES: dict[Weight, str] = {"regular": "Report-Regular", "semibold": "Report-Semibold"}
_FILES: dict[Weight, str] = {"regular": "SourceSansPro-Regular.ttf", "semibold": "SourceSansPro-Semibold.ttf"}

# Unicode categories without a shape: controls, formatting marks, surrogates, private use, unassigned, separators
_SHAPELESS = frozenset({"Cc", "Cf", "Cs", "Co", "Cn", "Zl", "Zp"})


class _Widths(dict[str, float]):
    """Character -> its advance in thousandths of the size; filled as characters are met."""

    def __init__(self, face: Any) -> None:
        super().__init__()
        self._face = face

    def __missing__(self, character: str) -> float:
        code = 0x20 if character == "\N{NO-BREAK SPACE}" else ord(character)
        width = float(self._face.getCharWidth(code))
        self[character] = width
        return width


@lru_cache(maxsize=2)
def font(weight: Weight) -> Any:
    """The font of a weight, registered with the PDF library.

    Raises
    ------
    ReportError
        If its file is not there or is no font.
    """
    from reportlab.pdfbase import pdfmetrics
    from reportlab.pdfbase.ttfonts import TTFError, TTFont

    path = _folder() / _FILES[weight]
    try:
        loaded = TTFont(NAMES[weight], str(path), asciiReadable=1, shapable=False)
    except (OSError, TTFError) as problem:
        msg = f"{path}: this font cannot be read ({problem}); install the package font-source-sans-pro again"
        raise ReportError(msg) from problem
    pdfmetrics.registerFont(loaded)
    return loaded


def _folder() -> Path:
    # found without importing it: its import lists every file it has
    spec = find_spec("font_source_sans_pro")
    if spec is None or spec.origin is None:
        msg = "the report's font is not installed; install the package font-source-sans-pro"
        raise ReportError(msg)
    return Path(spec.origin).parent / "files"


@lru_cache(maxsize=2)
def _widths(weight: Weight) -> _Widths:
    return _Widths(font(weight).face)


def string_width(text: str, size: float, weight: Weight = "regular") -> float:
    """Width of a string. [pt]"""
    return sum(map(_widths(weight).__getitem__, text)) * size / 1000


def is_printable(text: str) -> bool:
    """Whether every character of the text can be shown."""
    if text.isascii():
        return text.isprintable()
    return all(map(_has_shape, unicodedata.normalize("NFC", text)))


@lru_cache(maxsize=4096)
def printable(text: str) -> str:
    """The text as it can be drawn: composed where it can be, a box for each character that has no shape."""
    if text.isascii() and text.isprintable():
        return text
    composed = unicodedata.normalize("NFC", text)
    return "".join(character if _has_shape(character) else REPLACEMENT for character in composed)


@lru_cache(maxsize=4096)
def _has_shape(character: str) -> bool:
    if unicodedata.category(character) in _SHAPELESS:
        return False
    return character == "\N{NO-BREAK SPACE}" or ord(character) in font("regular").face.charToGlyph
