"""The findings: the table, and beneath it everything a verdict alone does not say."""

from __future__ import annotations

import re
from collections.abc import Sequence
from typing import Literal

from acceptance.printing import DASH, minus_signs, printed_finding, probability
from acceptance.record import Alternative, Finding, Record
from acceptance.report.blocks import Block, Text, heading, subheading
from acceptance.report.front import limit_text, named, verdict_mark
from acceptance.report.marks import FINDING_COLOURS
from acceptance.report.style import (
    CELL,
    CELL_BOLD,
    CELL_MUTED,
    COLUMN,
    DENSE,
    DENSE_BOLD,
    DENSE_MUTED,
    SMALL,
    WIDTH,
    Type,
)
from acceptance.report.table import Cell, Column, Row, Table, natural_width
from acceptance.report.wrap import Run, fold

__all__ = ["findings"]

_TITLES = ("Finding", "Condition", "Limit", "Value", "U", "k", "Margin", "Conformity", "Verdict")
# least and most of each column's width, the condition's apart: it has what is left [pt]
_BOUNDS = ((44, 110), (0, 0), (46, 96), (36, 72), (32, 62), (0, 40), (38, 66), (48, 66), (44, 90))
_MARK = 11.0  # before a verdict


def findings(record: Record) -> list[Block]:
    """The table of findings, and the remarks to them."""
    if not record.findings:
        return [heading("Findings"), Text("The record holds no findings.", SMALL, above=3)]
    factors = {finding.coverage_factor for finding in record.findings if finding.coverage_factor is not None}
    shared = factors.pop() if len({f"{factor:.2f}" for factor in factors}) == 1 else None
    rows = [_row(finding, record) for finding in record.findings]
    kept = [place for place, title in enumerate(_TITLES) if title != "k" or shared is None]
    rows = [Row([row.cells[place] for place in kept], tinted=row.tinted) for row in rows]
    return [
        heading("Findings"),
        Text(_key(record, shared), SMALL, above=1, keep_next=True),
        Table(_columns(rows, kept), rows, above=3),
        *_remarks(record),
        *_others(record),
    ]


def _columns(rows: Sequence[Row], kept: Sequence[int]) -> list[Column]:
    """Each as wide as its cells need, within bounds; the conditions have what is left."""
    widths = []
    for nth, place in enumerate(kept):
        title, (least, most) = _TITLES[place], _BOUNDS[place]
        bold = CELL_BOLD if title in ("Finding", "Verdict") else CELL
        wide = max(natural_width([_widest(row.cells[nth]) for row in rows], bold), natural_width([title], COLUMN))
        widths.append(min(max(wide + (_MARK if title == "Verdict" else 0.0), least), most))
    widths[1] = WIDTH - sum(widths)
    return [
        Column(_TITLES[place], width, "left" if _TITLES[place] in ("Finding", "Condition", "Verdict") else "right")
        for place, width in zip(kept, widths, strict=True)
    ]


def _widest(cell: str | Cell) -> str:
    if isinstance(cell, str):
        return cell
    texts = [one.text for one in cell.paragraphs if isinstance(one, Run)]
    return max(texts, key=len, default="")


_OPEN = re.compile(r"\bany\b")  # a condition that leaves open what was run


def _row(finding: Finding, record: Record) -> Row:
    texts = printed_finding(finding)
    kind = finding.characteristic.replace("_", " ")
    several = len(record.ratings.outputs) > 1 and finding.output not in finding.condition
    output = f"output {finding.output}" if several and finding.output else ""
    below = ": ".join(part for part in (kind, ", ".join(part for part in (finding.condition, output) if part)) if part)
    if finding.at and _OPEN.search(finding.condition):
        below += f"; {'least favourable' if finding.others else 'run'} at {minus_signs(finding.at)}"
    colour = FINDING_COLOURS[finding.verdict]
    return Row(
        [
            Cell([Run(finding.name, CELL_BOLD)]),
            Cell([Run(fold(below), CELL_MUTED)]),
            limit_text(finding),
            fold(texts.with_unit(texts.value)),
            texts.with_difference_unit(texts.expanded),
            DASH if finding.coverage_factor is None else f"{finding.coverage_factor:.2f}",
            texts.with_difference_unit(texts.margin),
            probability(finding.conformity_probability, required=record.decision.required_probability),
            Cell([Run(finding.verdict, Type(CELL.size, CELL.leading, "semibold", colour))], verdict_mark(finding)),
        ],
        tinted=finding.verdict != "pass",
    )


def _key(record: Record, factor: float | None) -> str:
    """What the columns mean."""
    confidence = f"{record.decision.confidence * 100:.10g} %"
    k = "the factor k" if factor is None else f"k = {factor:.2f} throughout"
    text = (
        f"U: expanded uncertainty for {confidence} coverage, {'with ' if factor is None else ''}{k}. Margin: distance "
        "to the nearest limit, positive inside, before U. Conformity: probability that the true value meets the limit."
    )
    if any(not finding.unit for finding in record.findings):
        text += " U and margin of values in % are in percentage points."
    return fold(text)


# -- beneath the table


_UNSTATED = "uncertainty not stated: an instrument that enters this value has no stated accuracy"


def _remarks(record: Record) -> list[Block]:
    """What a row does not say, each text once with the findings it belongs to."""
    grouped: dict[tuple[str, str], list[str]] = {}
    for finding in record.findings:
        for remark in _remarks_to(finding):
            grouped.setdefault(remark, []).append(finding.name)
    if not grouped:
        return []
    rows = [
        Row([named(names, record), Cell([[Run(f"{lead}  ", CELL_MUTED), Run(text, CELL)]])])
        for (lead, text), names in sorted(grouped.items(), key=lambda item: _LEADS.index(item[0][0]))
    ]
    wide = (
        150.0 if max(map(len, grouped.values())) <= 12 or len(record.findings) in map(len, grouped.values()) else 300.0
    )
    columns = [Column("", wide), Column("", WIDTH - wide)]
    return [subheading("Remarks to the findings"), Table(columns, rows, head=False, above=1)]


_LEADS = ("Reason", "Uncertainty", "Note")


def _remarks_to(finding: Finding) -> list[tuple[str, str]]:
    found = []
    if finding.verdict != "pass":
        found.append((_LEADS[0], fold(finding.reason) or "none is given in the record"))
    if isinstance(finding.value, (int, float)) and finding.expanded_uncertainty is None:
        found.append((_LEADS[1], _UNSTATED))
    if finding.note.strip():
        found.append((_LEADS[2], fold(finding.note)))
    return found


def _others(record: Record) -> list[Block]:
    """The dwells that met a condition as well, and were more favourable."""
    numbers = {point.where: point.index + 1 for point in record.points if point.where}
    rows = []
    for finding in record.findings:
        for place, other in enumerate(finding.others):
            name = Cell([Run(finding.name, DENSE_MUTED if place else DENSE_BOLD)])
            rows.append(Row([name, *_alternative(other, finding, record, numbers.get(other.where))]))
    if not rows:
        return []
    note = "Each was judged; the least favourable one is the finding."
    return [
        subheading("Other dwells that met a condition"),
        Text(note, SMALL, keep_next=True),
        Table(_other_columns(rows), rows, above=1, style=DENSE),
    ]


def _other_columns(rows: Sequence[Row]) -> list[Column]:
    titles = ("Finding", "Dwell", "Value", "U", "Margin", "Conformity", "Verdict")
    bounds = ((44, 110), (40, 150), (48, 72), (44, 66), (48, 72), (50, 66), (50, 76))
    widths = [
        min(max(natural_width([_widest(row.cells[n]) for row in rows], DENSE), least), most)
        for n, (least, most) in enumerate(bounds)
    ]
    spare = (WIDTH - sum(widths)) / len(widths)
    sides: tuple[Literal["left", "right"], ...] = ("left", "left", "right", "right", "right", "right", "left")
    return [Column(title, width + spare, side) for title, width, side in zip(titles, widths, sides, strict=True)]


def _alternative(other: Alternative, finding: Finding, record: Record, number: int | None) -> list[str | Cell]:
    texts = printed_finding(finding, other)
    place = fold(other.where) if number is None else str(number)
    at = f":  {minus_signs(fold(other.at))}" if other.at and number is None else ""
    dwell = [Run(place + at, DENSE)]
    if other.reason.strip() and fold(other.reason) != fold(finding.reason):
        dwell.append(Run(fold(other.reason), DENSE_MUTED))
    return [
        Cell(dwell),
        fold(texts.with_unit(texts.value)),
        texts.with_difference_unit(texts.expanded),
        texts.with_difference_unit(texts.margin),
        probability(other.conformity_probability, required=record.decision.required_probability),
        other.verdict,
    ]
