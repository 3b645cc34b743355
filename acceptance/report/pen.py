"""The pen: the only place that writes on a page.

Everything is put down as text or as a path; no markup is ever read, so a string from a log cannot be anything but
text. Operators are collected and handed to the canvas once a page, which is several times quicker than its own calls.
The origin is the page's lower left corner; lengths in points.
"""

from __future__ import annotations

from collections.abc import Sequence
from typing import Any, Literal

from acceptance.report.fonts import font, printable, string_width
from acceptance.report.style import Colour, Type

__all__ = ["Pen"]

Align = Literal["left", "right", "centre"]

# within a PDF string: the delimiters, and every byte that is not plain ASCII in octal
_ESCAPE = {code: f"\\{code:03o}" for code in (*range(32), *range(127, 256))} | {
    ord(character): "\\" + character for character in "()\\"
}


class Pen:
    """Draws on a canvas, page after page."""

    def __init__(self, canvas: Any) -> None:
        self._canvas = canvas
        self._begun: set[str] = set()  # weights that the document knows
        self._strings: dict[tuple[str, str], list[tuple[str, str]]] = {}
        self._begin()

    def _begin(self) -> None:
        self._out: list[str] = []
        self._fill: Colour | None = None
        self._stroke: tuple[Colour, float, tuple[float, ...]] | None = None
        self._font: tuple[str, float] | None = None

    def end_page(self) -> None:
        """Hand the page to the canvas and begin the next."""
        self._canvas.addLiteral("\n".join(self._out))
        self._canvas.showPage()
        self._begin()

    # -- text

    def text(self, x: float, y: float, text: str, style: Type, *, align: Align = "left") -> None:
        """A string with its baseline at y; x is its left end, its right end, or its middle."""
        if not text:
            return
        text = printable(text)
        if align != "left":
            width = string_width(text, style.size, style.weight)
            x -= width if align == "right" else width / 2
        self._set_fill(style.colour)
        parts = self._encoded(text, style)
        self._out.append(f"BT 1 0 0 1 {x:.2f} {y:.2f} Tm")
        for name, encoded in parts:
            if self._font != (name, style.size):
                self._font = (name, style.size)
                self._out.append(f"{name} {style.size:g} Tf")
            self._out.append(f"({encoded}) Tj")
        self._out.append("ET")

    def _encoded(self, text: str, style: Type) -> list[tuple[str, str]]:
        """Font resource and escaped bytes of each part of a string; kept, since tables repeat themselves."""
        key = (text, style.weight)
        known = self._strings.get(key)
        if known is None:
            loaded = font(style.weight)
            document = self._canvas._doc  # a font's subsets belong to the document, and only this names it
            if text.isascii() and style.weight in self._begun:
                # the first subset holds ASCII at its own codes
                known = [(loaded.getSubsetInternalName(0, document), text.translate(_ESCAPE))]
                self._strings[key] = known
                return known
            self._begun.add(style.weight)
            known = [
                (loaded.getSubsetInternalName(subset, document), part.decode("latin-1").translate(_ESCAPE))
                for subset, part in loaded.splitString(text, document)
            ]
            self._strings[key] = known
        return known

    # -- paths

    def line(
        self, points: Sequence[tuple[float, float]], colour: Colour, width: float, *, dash: Sequence[float] = ()
    ) -> None:
        """A line through the points."""
        if len(points) < 2:
            return
        self._set_stroke(colour, width, tuple(dash))
        self._out.append(_path(points) + " S")

    def lines(self, segments: Sequence[tuple[float, float, float, float]], colour: Colour, width: float) -> None:
        """Separate straight strokes, each from (x, y) to (x, y)."""
        if not segments:
            return
        self._set_stroke(colour, width, ())
        strokes = [f"{a:.2f} {b:.2f} m {c:.2f} {d:.2f} l" for a, b, c, d in segments]
        self._out.append(" ".join(strokes) + " S")

    def rectangle(
        self,
        box: tuple[float, float, float, float],
        *,
        fill: Colour | None = None,
        stroke: Colour | None = None,
        width: float = 0.6,
    ) -> None:
        """A rectangle: x and y of its lower left corner, width and height."""
        self._paint("{:.2f} {:.2f} {:.2f} {:.2f} re".format(*box), fill, stroke, width)

    def polygon(
        self,
        points: Sequence[tuple[float, float]],
        *,
        fill: Colour | None = None,
        stroke: Colour | None = None,
        width: float = 0.6,
    ) -> None:
        """A closed polygon."""
        self._paint(_path(points) + " h", fill, stroke, width)

    def circle(
        self,
        centre: tuple[float, float],
        radius: float,
        *,
        fill: Colour | None = None,
        stroke: Colour | None = None,
        width: float = 0.6,
    ) -> None:
        """A circle, as four cubic arcs."""
        (x, y), r = centre, radius
        k = 0.5523 * r  # the arm of a cubic that follows a quarter of a circle
        path = (
            f"{x + r:.2f} {y:.2f} m "
            f"{x + r:.2f} {y + k:.2f} {x + k:.2f} {y + r:.2f} {x:.2f} {y + r:.2f} c "
            f"{x - k:.2f} {y + r:.2f} {x - r:.2f} {y + k:.2f} {x - r:.2f} {y:.2f} c "
            f"{x - r:.2f} {y - k:.2f} {x - k:.2f} {y - r:.2f} {x:.2f} {y - r:.2f} c "
            f"{x + k:.2f} {y - r:.2f} {x + r:.2f} {y - k:.2f} {x + r:.2f} {y:.2f} c h"
        )
        self._paint(path, fill, stroke, width)

    def clip(self, box: tuple[float, float, float, float]) -> None:
        """Keep what follows within a rectangle, until `unclip`."""
        self._out.append("q {:.2f} {:.2f} {:.2f} {:.2f} re W n".format(*box))

    def unclip(self) -> None:
        """End of `clip`."""
        self._out.append("Q")
        # the state that stood before `clip` is back, and is not known here
        self._fill = self._stroke = self._font = None

    def _paint(self, path: str, fill: Colour | None, stroke: Colour | None, width: float) -> None:
        if fill is not None:
            self._set_fill(fill)
        if stroke is not None:
            self._set_stroke(stroke, width, ())
        operator = {(True, True): "B", (True, False): "f", (False, True): "S", (False, False): "n"}
        self._out.append(f"{path} {operator[fill is not None, stroke is not None]}")

    def _set_fill(self, colour: Colour) -> None:
        if colour != self._fill:
            self._fill = colour
            self._out.append("{:.3g} {:.3g} {:.3g} rg".format(*colour))

    def _set_stroke(self, colour: Colour, width: float, dash: tuple[float, ...]) -> None:
        wanted = (colour, width, dash)
        if wanted != self._stroke:
            self._stroke = wanted
            pattern = " ".join(f"{length:g}" for length in dash)
            self._out.append("{:.3g} {:.3g} {:.3g} RG".format(*colour) + f" {width:g} w 1 j 1 J [{pattern}] 0 d")


def _path(points: Sequence[tuple[float, float]]) -> str:
    first, *rest = points
    return f"{first[0]:.2f} {first[1]:.2f} m " + " ".join([f"{x:.2f} {y:.2f} l" for x, y in rest])
