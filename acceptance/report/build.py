"""A record, drawn: the report as bytes, or as a file.

    report_pdf     record -> PDF                  the same bytes for the same record and template
    write_report   record -> file                 whole or not at all

Nothing that a verdict rests on is computed here. No string of the record is ever read as markup.
"""

from __future__ import annotations

import io
import os
from collections.abc import Callable, Iterator
from contextlib import contextmanager
from dataclasses import replace
from pathlib import Path
from typing import Any

from acceptance.errors import RecordError, ReportError
from acceptance.record import Record, write_whole
from acceptance.report.blocks import Block, Placed, paginate
from acceptance.report.findings import findings
from acceptance.report.fonts import NAMES, font, printable
from acceptance.report.front import NO_ISSUER, cautions, front
from acceptance.report.measured import figures, points
from acceptance.report.method import budgets, method
from acceptance.report.pen import Pen
from acceptance.report.signoff import NOT_SIGNED, sign_off
from acceptance.report.sources import doubts, evidence, instruments
from acceptance.report.style import BOTTOM, FURNITURE, LEFT, PAGE, ROOM, RULE, TOP, WIDTH, Type
from acceptance.report.template import Template, load_template
from acceptance.report.wrap import fit

__all__ = ["report_pdf", "write_report"]

_SECTIONS: dict[str, Callable[[Record], list[Block]]] = {
    "findings": findings,
    "figures": figures,
    "points": points,
    "method": method,
    "budgets": budgets,
    "instruments": instruments,
    "evidence": evidence,
    "doubts": doubts,
}


def report_pdf(record: Record, *, template: Path | None = None) -> bytes:
    """The report of a record, as the bytes of a PDF.

    Parameters
    ----------
    record
        What is drawn.
    template
        Folder of a template; the default one where none is given.

    Raises
    ------
    ReportError
        If the template is not what a template is, or the font is missing.
    """
    chosen = load_template(template)
    pages = paginate(_blocks(record, chosen), ROOM)
    return _draw(pages, record, chosen)


def write_report(record: Record, path: Path, *, template: Path | None = None) -> Path:
    """Path of the report of a record, as written; the file is there whole or not at all.

    Raises
    ------
    ReportError
        If it cannot be drawn, or not be written, or if something stands at the path that is no report.
    """
    _see_to_place(path)
    content = report_pdf(record, template=template)
    try:
        write_whole(path, content)
    except RecordError as problem:
        raise ReportError(str(problem)) from problem
    return path


def _see_to_place(path: Path) -> None:
    """See to it that nothing is lost: a report may take the place of a report, and of nothing else.

    Raises
    ------
    ReportError
        If a log, a record, a folder or a device stands there.
    """
    if not os.path.lexists(path):
        return
    if path.is_file() and not path.is_symlink():
        with path.open("rb") as file:
            if file.read(5) == b"%PDF-":
                return
    msg = f"{path}: something that is no PDF stands there, and is kept; choose another name with --out"
    raise ReportError(msg)


def _blocks(record: Record, template: Template) -> list[Block]:
    if "points" not in template.sections:
        record = replace(record, points=[])  # without a list of the dwells, their numbers say nothing
    blocks = front(record, template)
    for name in template.sections:
        if name == "cautions":
            blocks += cautions(record, template)
        elif name == "sign_off":
            blocks += sign_off(record.report_number)
        else:
            blocks += _SECTIONS[name](record)
    return blocks


def _draw(pages: list[list[Placed]], record: Record, template: Template) -> bytes:
    from reportlab.pdfgen.canvas import Canvas

    font("regular")  # registered before the canvas asks for it by name
    target = io.BytesIO()
    with _plain_streams():
        _draw_on(Canvas, target, pages, record, template)
    return target.getvalue()


@contextmanager
def _plain_streams() -> Iterator[None]:
    """Streams as bytes while a report is drawn: as ASCII they are a quarter longer and cost a fifth of the time."""
    from reportlab import rl_config

    before = rl_config.useA85
    rl_config.useA85 = 0
    try:
        yield
    finally:
        rl_config.useA85 = before


def _draw_on(
    canvas_type: Any, target: io.BytesIO, pages: list[list[Placed]], record: Record, template: Template
) -> None:
    canvas = canvas_type(
        target,
        pagesize=PAGE,
        pageCompression=1,
        invariant=1,
        pdfVersion=(1, 7),
        initialFontName=NAMES["regular"],
        lang="en-GB",
    )
    _describe(canvas, record, template)
    pen = Pen(canvas)
    for number, page in enumerate(pages, start=1):
        _furnish(pen, record, template, f"page {number} of {len(pages)}")
        for placed in page:
            placed.block.draw(pen, LEFT, TOP - placed.down)
        pen.end_page()
    canvas.save()


def _describe(canvas: Any, record: Record, template: Template) -> None:
    """The document's own title, author, subject and time; the time is that of the decision."""
    unit = record.unit
    canvas.setTitle(printable(f"{template.title} {record.report_number}: {unit.product}, serial {unit.serial}"))
    canvas.setAuthor(printable(template.issuer.name or NO_ISSUER))
    canvas.setSubject(printable(f"{unit.product}, serial {unit.serial}: {record.verdict}; performance limits only"))
    canvas.setCreator("acceptance")
    stamp = "".join(character for character in record.judged_at if character.isdigit())[:14]
    if len(stamp) == 14 and stamp.isascii():
        canvas.setDateFormatter(lambda *_: f"D:{stamp}Z")


def _furnish(pen: Pen, record: Record, template: Template, page: str) -> None:
    """Head and foot of a page."""
    unit = record.unit
    half = WIDTH / 2
    high, low = PAGE[1] - 40.0, BOTTOM - 22.0
    number = fit(f"Report {record.report_number}", FURNITURE, half - 20)
    heading = (template.issuer.name, unit.product, f"serial {unit.serial}")
    pen.text(
        LEFT,
        high,
        fit(" · ".join(part for part in heading if part), FURNITURE, half + 60),
        FURNITURE,
    )
    pen.text(LEFT + WIDTH, high, number, FURNITURE, align="right")
    pen.line([(LEFT, high - 6), (LEFT + WIDTH, high - 6)], RULE, 0.5)
    pen.line([(LEFT, low + 11), (LEFT + WIDTH, low + 11)], RULE, 0.5)
    pen.text(LEFT, low, number, FURNITURE)
    pen.text(LEFT + half, low, NOT_SIGNED, _STATE, align="centre")
    pen.text(LEFT + WIDTH, low, page, FURNITURE, align="right")


_STATE = Type(FURNITURE.size, FURNITURE.leading, "semibold", FURNITURE.colour)
