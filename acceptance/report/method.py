"""How the decision was made: the rule and its risk in plain words, the formulas, the budgets."""

from __future__ import annotations

from acceptance.printing import MINUS, quantity, with_uncertainty
from acceptance.record import BudgetLine, DecisionRule, Finding, Record
from acceptance.report.blocks import Block, Text, heading, subheading
from acceptance.report.style import BODY, BODY_BOLD, CELL, CELL_BOLD, CELL_MUTED, SMALL, WIDTH, Type
from acceptance.report.table import Cell, Column, Row, Table
from acceptance.report.wrap import Run, fold

__all__ = ["budgets", "decision_text", "method"]


def method(record: Record) -> list[Block]:
    """Decision rule, conditions, uncertainty, and how each value was formed."""
    decision = record.decision
    paragraphs = [
        ("Decision rule", decision_text(decision)),
        ("Verdict on the unit", _UNIT),
        ("Conditions", _conditions(decision)),
        ("Dwells", _dwells(record)),
        ("Uncertainty", _uncertainty(decision)),
    ]
    texts = [Text([Run(f"{lead}:  ", BODY_BOLD), Run(fold(text), BODY)], above=5) for lead, text in paragraphs]
    texts[0].above = 2
    rows = [_formed(finding) for finding in record.findings]
    formed: list[Block] = []
    if rows:
        columns = [Column("Finding", 120), Column("How the value is formed, and from which dwells", WIDTH - 120)]
        formed = [subheading("How each value was formed"), Table(columns, rows, above=1)]
    return [heading("Method and decision rule"), *texts, *formed]


def _percent(share: float) -> str:
    return f"{share * 100:.10g} %"


def decision_text(decision: DecisionRule) -> str:
    """The decision rule and the risk it carries, in plain words."""
    confidence = _percent(decision.confidence)
    if decision.rule == "simple":
        return (
            "simple. A finding passes when its value meets the limit and fails when it does not; the uncertainty is "
            "printed but does not enter the decision. For a value right at its limit the risk of a wrong pass, and of "
            "a wrong fail, is up to 50 %; it shrinks as the margin grows beyond the uncertainty."
        )
    required = decision.required_probability
    if required is None:
        required = 1 - (1 - decision.confidence) / 2
    shown, risk = _percent(required), _percent(1 - required)
    if decision.rule == "guarded":
        return (
            f"guarded, at {confidence} confidence. A finding passes when the probability that the true value meets the "
            f"limit is at least {shown}. The risk that a unit outside a limit passes is thus at most {risk} for each "
            "finding. Everything else fails: a good unit whose margin is small against the uncertainty fails too, "
            f"with a risk of up to {shown} for a true value just inside the limit."
        )
    return (
        f"conditional, at {confidence} confidence. A finding passes, or fails, when that is shown with a probability "
        f"of at least {shown}; the risk of a wrong pass, or a wrong fail, is then at most {risk} for each finding. In "
        "between it is a conditional pass or a conditional fail by the side of the limit its value lies on; taken as a "
        "decision, that carries a risk of up to 50 %, and the unit stays undecided."
    )


_UNIT = (
    "rejected when a finding fails; undecided when none fails and one is conditional or not judged; accepted "
    "otherwise. A value equal to its limit meets it. The statement covers the findings listed here and nothing else."
)


def _conditions(decision: DecisionRule) -> str:
    load, volts = decision.load_tolerance, decision.input_tolerance
    by_load = "± 2 percentage points of rated current (± 1 at 10 % and below)"
    if load is not None:
        by_load = f"± {load * 100:.6g} percentage points of rated current"
    by_input = "± 1 %" if volts is None else f"± {_percent(volts)}"
    return (
        f"a dwell meets a load within {by_load} and an input voltage within {by_input}; no load means a current below "
        "its own uncertainty or 0.2 % of rated. Where several dwells meet a condition each is judged and the least "
        "favourable one is the finding. A condition without a dwell is not judged; nothing is interpolated."
    )


def _dwells(record: Record) -> str:
    test = record.test
    settle = "found from the data" if test.settle is None else quantity(test.settle, "s")
    least = "" if test.min_dwell is None else f"; the shortest dwell taken is {quantity(test.min_dwell, 's')}"
    return (
        f"stretches of samples at one steady condition, found in {test.samples} samples. Settling left out at the "
        f"start of each: {settle}{least}. A reading is the mean over its dwell."
    )


def _uncertainty(decision: DecisionRule) -> str:
    return (
        "each reading combines the scatter of its samples, which are taken as correlated, with the instrument's stated "
        "accuracy; a bound a counts as a/√3, a converter step q as q/√12. Between dwells of one channel the gain part "
        "is shared and cancels where values are compared; everything else is independent. Values are propagated to "
        "first order, degrees of freedom by Welch-Satterthwaite, and U = k·u with k from Student's t for "
        f"{_percent(decision.confidence)} coverage."
    )


def _formed(finding: Finding) -> Row:
    paragraphs: list[list[Run]] = []
    if finding.formula:
        paragraphs.append([Run(fold(finding.formula), CELL)])
    facts = []
    if finding.points:
        facts.append(
            ("dwell " if len(finding.points) == 1 else "dwells ")
            + ", ".join(f"{at.point + 1} ({at.role})" if at.role else str(at.point + 1) for at in finding.points)
        )
    if finding.where.strip():
        facts.append(fold(finding.where))
    if finding.standard_uncertainty is not None:
        facts.append(f"u = {quantity(finding.standard_uncertainty, finding.unit, digits=2, stripped=False)}")
    if finding.degrees_of_freedom is not None:
        shown = _freedom(finding.degrees_of_freedom)
        facts.append(f"ν {shown}" if shown.startswith(">") else f"ν = {shown}")
    if facts:
        paragraphs.append([Run("; ".join(facts), CELL_MUTED)])
    if finding.verdict == "pass" and finding.reason.strip():
        paragraphs.append([Run(fold(finding.reason), CELL_MUTED)])
    return Row([Cell([Run(finding.name, CELL_BOLD)]), Cell(paragraphs or [[Run("not formed", CELL_MUTED)]])])


# -- budgets


_COMPACT = Type(7.8, 9.4)
_SMALL_SHARE = 0.01  # of the variance; sources below it are counted, and kept in the record


def budgets(record: Record) -> list[Block]:
    """The uncertainty budget of each finding that has one."""
    with_budget = [finding for finding in record.findings if finding.budget]
    if not with_budget:
        return []
    columns = [
        Column("Source", WIDTH - 250),
        Column("Type", 40),
        Column("Contribution", 84, "right"),
        Column("Share of variance", 76, "right"),
        Column("ν", 50, "right"),
    ]
    rows = [row for finding in with_budget for row in (_group(finding), *_lines(finding))]
    note = (
        "Contribution: standard uncertainty it brings to the value. Type A: from the scatter of samples; B: from what "
        "is known of the instrument. ν: degrees of freedom, ∞ where none are given. A negative share is a correlation "
        "that takes uncertainty away. Sources of less than 1 % of the variance are counted; the record holds them."
    )
    return [
        heading("Uncertainty budgets"),
        Text(note, SMALL, above=1, keep_next=True),
        Table(columns, rows, above=3, style=_COMPACT),
    ]


def _group(finding: Finding) -> Row:
    value = finding.value if isinstance(finding.value, (int, float)) else None
    text = with_uncertainty(value, finding.expanded_uncertainty, finding.unit)
    return Row([Cell([[Run(f"{finding.name}   ", CELL_BOLD), Run(fold(text), CELL_MUTED)]])], span=True, tinted=True)


def _lines(finding: Finding) -> list[Row]:
    """The sources that count, the largest first, and how many do not."""
    ordered = sorted(finding.budget, key=lambda line: -abs(line.share))
    small = [line for line in ordered if abs(line.share) < _SMALL_SHARE]
    shown = ordered if len(small) < 2 else ordered[: len(ordered) - len(small)]
    rows = [_line(line, finding.unit) for line in shown]
    if len(shown) < len(ordered):
        most = max(small, key=lambda line: abs(line.contribution))
        texts = [f"{len(small)} further sources", "", f"≤ {_contribution(most, finding.unit)}", "< 1 % each", ""]
        rows.append(Row([Cell([Run(text, CELL_MUTED)]) for text in texts]))
    return rows


def _line(line: BudgetLine, unit: str) -> Row:
    share = f"{line.share * 100:.1f} %"
    share = share.removeprefix("-") if not share.strip("-0. %") else share.replace("-", MINUS)
    freedom = "∞" if line.degrees_of_freedom is None else _freedom(line.degrees_of_freedom)
    return Row([fold(line.source.replace("_", " ")), line.kind, _contribution(line, unit), share, freedom])


def _contribution(line: BudgetLine, unit: str) -> str:
    return quantity(line.contribution, unit, digits=2, stripped=False)


def _freedom(number: float) -> str:
    """Degrees of freedom; how many hardly matters beyond ten thousand."""
    return f"{number:.3g}" if number < 10_000 else "> 10 000"
