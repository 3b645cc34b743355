"""A workbook, written part by part, so that it is the same to the byte on every machine.

A general library stamps the time of writing and its own version into a workbook, and the size of packed parts
depends on the packer: here times are fixed and parts are stored unpacked.
"""

from __future__ import annotations

import io
import zipfile
from collections.abc import Mapping, Sequence
from datetime import datetime
from xml.sax.saxutils import escape

__all__ = ["Cell", "workbook"]

Cell = str | float | datetime | None
DAY_ZERO = datetime(1899, 12, 30)  # noqa: DTZ001 - a sheet's dates have no zone
STAMP = (2026, 1, 1, 0, 0, 0)
HEAD = '<?xml version="1.0" encoding="UTF-8" standalone="yes"?>\n'
MAIN = "http://schemas.openxmlformats.org/spreadsheetml/2006/main"
OFFICE = "http://schemas.openxmlformats.org/officeDocument/2006/relationships"
PACKAGE = "http://schemas.openxmlformats.org/package/2006"
TYPE = "application/vnd.openxmlformats-officedocument.spreadsheetml"
STYLES = (
    f'<styleSheet xmlns="{MAIN}"><numFmts count="1"><numFmt numFmtId="164" formatCode="yyyy\\-mm\\-dd\\ hh:mm:ss.0"/>'
    '</numFmts><fonts count="1"><font><sz val="11"/><name val="Calibri"/></font></fonts>'
    '<fills count="2"><fill><patternFill patternType="none"/></fill><fill><patternFill patternType="gray125"/></fill>'
    '</fills><borders count="1"><border><left/><right/><top/><bottom/><diagonal/></border></borders>'
    '<cellStyleXfs count="1"><xf numFmtId="0" fontId="0" fillId="0" borderId="0"/></cellStyleXfs>'
    '<cellXfs count="2"><xf numFmtId="0" fontId="0" fillId="0" borderId="0" xfId="0"/>'
    '<xf numFmtId="164" fontId="0" fillId="0" borderId="0" xfId="0" applyNumberFormat="1"/></cellXfs>'
    '<cellStyles count="1"><cellStyle name="Normal" xfId="0" builtinId="0"/></cellStyles></styleSheet>'
)


def workbook(sheets: Mapping[str, Sequence[Sequence[Cell]]], *, author: str, created: datetime) -> bytes:
    """The bytes of an .xlsx of these sheets, each a list of rows of cells from A1 on; None is an empty cell."""
    parts = {
        "[Content_Types].xml": _content_types(len(sheets)),
        "_rels/.rels": _relations({"rId1": ("officeDocument", "xl/workbook.xml")}, core="docProps/core.xml"),
        "docProps/core.xml": _core(author, created),
        "xl/workbook.xml": _book(list(sheets)),
        "xl/_rels/workbook.xml.rels": _relations(
            {f"rId{n}": ("worksheet", f"worksheets/sheet{n}.xml") for n in range(1, len(sheets) + 1)}
            | {f"rId{len(sheets) + 1}": ("styles", "styles.xml")}
        ),
        "xl/styles.xml": STYLES,
    }
    for number, rows in enumerate(sheets.values(), start=1):
        parts[f"xl/worksheets/sheet{number}.xml"] = _sheet(rows)
    return _stored(parts)


def _stored(parts: Mapping[str, str]) -> bytes:
    whole = io.BytesIO()
    with zipfile.ZipFile(whole, "w", zipfile.ZIP_STORED) as archive:
        for name, body in parts.items():
            entry = zipfile.ZipInfo(name, STAMP)
            entry.create_system = 0  # the same wherever it is made
            archive.writestr(entry, (HEAD + body).encode())
    return whole.getvalue()


def _content_types(sheets: int) -> str:
    overrides = {"/xl/workbook.xml": f"{TYPE}.sheet.main+xml", "/xl/styles.xml": f"{TYPE}.styles+xml"}
    overrides |= {f"/xl/worksheets/sheet{n}.xml": f"{TYPE}.worksheet+xml" for n in range(1, sheets + 1)}
    overrides["/docProps/core.xml"] = "application/vnd.openxmlformats-package.core-properties+xml"
    listed = "".join(f'<Override PartName="{name}" ContentType="{kind}"/>' for name, kind in overrides.items())
    return (
        f'<Types xmlns="{PACKAGE}/content-types">'
        '<Default Extension="rels" ContentType="application/vnd.openxmlformats-package.relationships+xml"/>'
        f'<Default Extension="xml" ContentType="application/xml"/>{listed}</Types>'
    )


def _relations(targets: Mapping[str, tuple[str, str]], *, core: str = "") -> str:
    listed = "".join(
        f'<Relationship Id="{key}" Type="{OFFICE}/{kind}" Target="{target}"/>'
        for key, (kind, target) in targets.items()
    )
    if core:
        kind = f"{PACKAGE}/relationships/metadata/core-properties"
        listed += f'<Relationship Id="rIdCore" Type="{kind}" Target="{core}"/>'
    return f'<Relationships xmlns="{PACKAGE}/relationships">{listed}</Relationships>'


def _core(author: str, created: datetime) -> str:
    stamp = created.strftime("%Y-%m-%dT%H:%M:%SZ")
    return (
        f'<cp:coreProperties xmlns:cp="{PACKAGE}/metadata/core-properties" '
        'xmlns:dc="http://purl.org/dc/elements/1.1/" xmlns:dcterms="http://purl.org/dc/terms/" '
        f'xmlns:xsi="http://www.w3.org/2001/XMLSchema-instance"><dc:creator>{escape(author)}</dc:creator>'
        f'<dcterms:created xsi:type="dcterms:W3CDTF">{stamp}</dcterms:created>'
        f'<dcterms:modified xsi:type="dcterms:W3CDTF">{stamp}</dcterms:modified></cp:coreProperties>'
    )


def _book(names: Sequence[str]) -> str:
    listed = "".join(
        f'<sheet name="{escape(name)}" sheetId="{n}" r:id="rId{n}"/>' for n, name in enumerate(names, start=1)
    )
    return f'<workbook xmlns="{MAIN}" xmlns:r="{OFFICE}"><sheets>{listed}</sheets></workbook>'


def _sheet(rows: Sequence[Sequence[Cell]]) -> str:
    width = max((len(row) for row in rows), default=1)
    body = "".join(_row(number, row) for number, row in enumerate(rows, start=1))
    span = f'<dimension ref="A1:{_letters(width - 1)}{max(len(rows), 1)}"/>'
    return f'<worksheet xmlns="{MAIN}">{span}<sheetData>{body}</sheetData></worksheet>'


def _row(number: int, row: Sequence[Cell]) -> str:
    body = "".join(_cell(f"{_letters(n)}{number}", cell) for n, cell in enumerate(row) if cell is not None)
    return f'<row r="{number}">{body}</row>' if body else ""


def _cell(place: str, cell: str | float | datetime | None) -> str:
    if isinstance(cell, str):
        return f'<c r="{place}" t="inlineStr"><is><t xml:space="preserve">{escape(cell)}</t></is></c>'
    if isinstance(cell, datetime):
        days = (cell.replace(tzinfo=None) - DAY_ZERO).total_seconds() / 86400
        return f'<c r="{place}" s="1"><v>{days:.9f}</v></c>'
    return f'<c r="{place}"><v>{cell!r}</v></c>'


def _letters(column: int) -> str:
    name = ""
    while column >= 0:
        name, column = chr(ord("A") + column % 26) + name, column // 26 - 1
    return name
