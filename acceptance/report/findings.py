"""The findings: the table, and beneath it everything a verdict alone does not say."""

from __future__ import annotations

from acceptance.printing import DASH, printed, probability
from acceptance.record import Alternative, DecisionRule, Finding, Record
from acceptance.report.blocks import Block, Text, heading, subheading
from acceptance.report.front import verdict_mark
from acceptance.report.marks import FINDING_COLOURS
from acceptance.report.style import CELL, CELL_BOLD, CELL_MUTED, SMALL, WIDTH, Type
from acceptance.report.table import Cell, Column, Row, Table
from acceptance.report.wrap import Run, fold

__all__ = ["findings", "limit_text"]

_COLUMNS = (
    Column("Finding", 138),
    Column("Limit", 76),
    Column("Value", 58, "right"),
    Column("U", 50, "right"),
    Column("Margin", 50, "right"),
    Column("Conformity", 49, "right"),
    Column("Verdict", WIDTH - 421),
)


def findings(record: Record) -> list[Block]:
    """The table of findings, and the remarks to them."""
    if not record.findings:
        return [heading("Findings"), Text("The record holds no findings.", SMALL, above=3)]
    blocks: list[Block] = [
        heading("Findings"),
        Text(_key(record), SMALL, above=1, keep_next=True),
        Table(_COLUMNS, [_row(finding, record) for finding in record.findings], above=3),
    ]
    remarks = [
        Row([Cell([Run(finding.name, CELL_BOLD)]), Cell(lines)])
        for finding in record.findings
        if (lines := _remarks(finding, record.decision))
    ]
    if remarks:
        blocks.append(subheading("Remarks to the findings"))
        blocks.append(Table([Column("", 120), Column("", WIDTH - 120)], remarks, head=False, above=1))
    return blocks


def _row(finding: Finding, record: Record) -> Row:
    texts = printed(
        finding.value,
        finding.expanded_uncertainty,
        finding.unit,
        low=finding.min,
        high=finding.max,
        margin=finding.margin,
    )
    factor = f"k = {finding.coverage_factor:.2f}" if finding.coverage_factor is not None else ""
    kind = finding.characteristic.replace("_", " ")
    several = len(record.ratings.outputs) > 1 and finding.output not in finding.condition
    output = f"output {finding.output}" if several and finding.output else ""
    below = ": ".join(part for part in (kind, ", ".join(part for part in (finding.condition, output) if part)) if part)
    colour = FINDING_COLOURS[finding.verdict]
    return Row(
        [
            Cell([Run(finding.name, CELL_BOLD), Run(fold(below), CELL_MUTED)]),
            limit_text(finding),
            fold(texts.with_unit(texts.value)),
            Cell([Run(texts.with_unit(texts.expanded), CELL), *([Run(factor, CELL_MUTED)] if factor else [])]),
            texts.with_unit(texts.margin),
            probability(finding.conformity_probability, required=record.decision.required_probability),
            Cell([Run(finding.verdict, Type(CELL.size, CELL.leading, "semibold", colour))], verdict_mark(finding)),
        ],
        tinted=finding.verdict != "pass",
    )


def limit_text(finding: Finding) -> str:
    """What the finding had to meet, in the unit its value is printed in."""
    numbers = finding.value if isinstance(finding.value, (int, float)) else None
    texts = printed(numbers, finding.expanded_uncertainty, finding.unit, low=finding.min, high=finding.max)
    low, high = texts.with_unit(texts.low), texts.with_unit(texts.high)
    if texts.low != DASH and texts.high != DASH:
        return f"{low} to {high}"
    if texts.low != DASH:
        return f"≥ {low}"
    return f"≤ {high}" if texts.high != DASH else DASH


def _key(record: Record) -> str:
    """What the columns mean."""
    confidence = f"{record.decision.confidence * 100:.10g} %"
    text = (
        f"U: expanded uncertainty for {confidence} coverage, with its factor k. Margin: distance to the nearest limit, "
        "positive inside, before U. Conformity: probability that the true value meets the limit."
    )
    if any(not finding.unit for finding in record.findings):
        text += " U and margin of values in % are in percentage points."
    return text


def _remarks(finding: Finding, decision: DecisionRule) -> list[list[Run]]:
    """Everything about a finding beyond its row, one paragraph each."""
    found: list[list[Run]] = []

    def say(lead: str, text: str) -> None:
        found.append([Run(f"{lead}  ", CELL_MUTED), Run(fold(text), CELL)])

    if finding.verdict != "pass":
        say("Reason", finding.reason or "none is given in the record")
    numeric = isinstance(finding.value, (int, float))
    if numeric and finding.expanded_uncertainty is None:
        say("Uncertainty", "uncertainty not stated: an instrument that enters this value has no stated accuracy")
    if finding.others:
        said = "; ".join(_alternatives(finding, decision))
        say(
            "Other dwells that met the condition" if len(finding.others) > 1 else "Other dwell that met the condition",
            said,
        )
    for deviation in finding.deviations:
        say("Deviation", deviation.text)
    if finding.note.strip():
        say("Note of the limits file", finding.note)
    return found


def _alternatives(finding: Finding, decision: DecisionRule) -> list[str]:
    """What each other dwell gave; the file is named where it changes."""
    texts = []
    before = ""
    for other in finding.others:
        file, comma, place = other.where.partition(", ")
        text = _alternative(other, finding, decision)
        texts.append(text.removeprefix(f"{file}, ") if comma and file == before else text)
        before = file if comma and place else ""
    return texts


def _alternative(other: Alternative, finding: Finding, decision: DecisionRule) -> str:
    parts = [f"{other.where}:"] if other.where else []
    texts = printed(
        other.value, other.expanded_uncertainty, finding.unit, low=finding.min, high=finding.max, margin=other.margin
    )
    value = texts.with_unit(texts.value)
    parts.append(f"{value} ± {texts.with_unit(texts.expanded)}," if texts.expanded != DASH else f"{value},")
    if other.margin is not None:
        parts.append(f"margin {texts.with_unit(texts.margin)},")
    if other.conformity_probability is not None:
        parts.append(f"conformity {probability(other.conformity_probability, required=decision.required_probability)},")
    return " ".join([*parts, other.verdict])
