"""How the decision was made: the rule and its risk in plain words, the formulas, the budgets."""

from __future__ import annotations

from collections.abc import Sequence

from acceptance.printing import DASH, MINUS, Scale, count, difference_unit, minus_signs, quantity, scale_for
from acceptance.record import BudgetLine, DecisionRule, Finding, Record
from acceptance.report.blocks import Block, Text, heading, subheading
from acceptance.report.measured import channel_name
from acceptance.report.style import BODY, BODY_BOLD, DENSE, DENSE_BOLD, DENSE_MUTED, SMALL, WIDTH
from acceptance.report.table import PAD, Cell, Column, Row, Table, natural_width
from acceptance.report.wrap import Run, fold, wrap

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
    texts = [
        Text([Run(f"{lead}.  ", BODY_BOLD), Run(fold(text[:1].upper() + text[1:]), BODY)], above=4)
        for lead, text in paragraphs
    ]
    texts[0].above = 2
    return [heading("Method and decision rule"), *texts, *_formed(record)]


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
        f"stretches of samples at one steady condition, found in {count(test.samples)} samples. Settling left out "
        f"at the start of each: {settle}{least}. A reading is the mean over its dwell."
    )


def _uncertainty(decision: DecisionRule) -> str:
    return (
        "each reading combines the scatter of its samples, which are taken as correlated, with the instrument's stated "
        "accuracy; a bound a counts as a/√3, a converter step q as q/√12. Between dwells of one channel the gain part "
        "is shared and cancels where values are compared; everything else is independent. Values are propagated to "
        "first order, degrees of freedom by Welch-Satterthwaite, and U = k·u with k from Student's t for "
        f"{_percent(decision.confidence)} coverage."
    )


def _formed(record: Record) -> list[Block]:
    """How each value was formed, and from which dwells."""
    findings = [finding for finding in record.findings if finding.formula or finding.points or finding.where.strip()]
    if not findings:
        return []
    name = _names(findings)
    columns = [
        Column("Finding", name),
        Column("How it is formed", 0.47 * (WIDTH - name - 88)),
        Column("From dwell", 0.53 * (WIDTH - name - 88)),
        Column("u", 48, "right"),
        Column("ν", 40, "right"),
    ]
    rows = [_row(finding, record) for finding in findings]
    return [subheading("How each value was formed"), Table(columns, rows, above=1, style=DENSE)]


def _names(findings: Sequence[Finding]) -> float:
    """Width of a column of their names. [pt]"""
    return min(max(natural_width([finding.name for finding in findings], DENSE_BOLD), 44.0), 110.0)


def _row(finding: Finding, record: Record) -> Row:
    value = [Run(fold(finding.formula), DENSE)] if finding.formula else []
    if finding.verdict == "pass" and finding.reason.strip():
        value.append(Run(fold(finding.reason), DENSE_MUTED))
    u, freedom = finding.standard_uncertainty, finding.degrees_of_freedom
    return Row(
        [
            Cell([Run(finding.name, DENSE_BOLD)]),
            Cell(value),
            _from(finding, record),
            DASH if u is None else quantity(u, difference_unit(finding.unit), digits=2, stripped=False),
            DASH if u is None else _freedom(freedom),
        ]
    )


def _from(finding: Finding, record: Record) -> Cell:
    """The numbers of the dwells, with what each was for; their places in the log where the dwells are not listed."""
    if not record.points or not finding.points:
        return Cell([Run(fold(finding.where) or DASH, DENSE)])
    alone = len(finding.points) == 1
    texts = [_dwell(at.point + 1, finding.at if alone and finding.at else at.role) for at in finding.points]
    return Cell([Run(fold(", ".join(texts)), DENSE)])


def _dwell(number: int, what: str) -> str:
    return f"{number} ({minus_signs(what)})" if what else str(number)


# -- budgets


_ENOUGH = 0.9  # of the variance: the sources that make it up are listed, the others counted; the record holds all


def budgets(record: Record) -> list[Block]:
    """The uncertainty budget of each finding that has one."""
    with_budget = [finding for finding in record.findings if finding.budget]
    if not with_budget:
        return []
    name = _names(with_budget)
    columns = [
        Column("Finding", name),
        Column("Source", WIDTH - name - 36 - 76 - 62 - 48),
        Column("Type", 36),
        Column("Contribution", 76, "right"),
        Column("Share", 62, "right"),
        Column("ν", 48, "right"),
    ]
    wide = columns[1].width - 2 * PAD
    note = (
        "Contribution: standard uncertainty that a source brings to the value. Share: of the variance; a negative one "
        "is a correlation that takes uncertainty away. Type A: from the scatter of samples; B: from what is known of "
        "the instrument. ν: degrees of freedom, ∞ where none are given. The sources that make up 90 % are listed; the "
        "record holds all."
    )
    return [
        heading("Uncertainty budgets"),
        Text(note, SMALL, above=1, keep_next=True),
        Table(columns, [_budget(finding, record, wide) for finding in with_budget], above=3, style=DENSE),
    ]


def _budget(finding: Finding, record: Record, wide: float) -> Row:
    """A finding's sources, the largest first, in one row; the cells' lines stand level with one another."""
    ordered = sorted(finding.budget, key=lambda line: -abs(line.share))
    shown = _telling(ordered)
    unit = difference_unit(finding.unit)
    scale = scale_for(unit, [finding.standard_uncertainty, *(line.contribution for line in shown)])
    cells: tuple[list[Run], ...] = ([], [], [], [], [])
    for line in shown:
        source = wrap(_source(line, record), DENSE, wide)
        texts = [line.kind, _contribution(line, scale), _share(line.share), _freedom(line.degrees_of_freedom)]
        cells[0].extend(Run(text, DENSE) for text in source)
        for cell, text in zip(cells[1:], texts, strict=True):
            cell += [Run(text, DENSE), *[Run("", DENSE)] * (len(source) - 1)]
    left = ordered[len(shown) :]
    if left:
        texts = [f"{len(left)} more", "", "", _share(sum(line.share for line in left)), ""]
        for cell, text in zip(cells, texts, strict=True):
            cell.append(Run(text, DENSE_MUTED))
    return Row([Cell([Run(finding.name, DENSE_BOLD)]), *(Cell(cell) for cell in cells)])


def _telling(ordered: Sequence[BudgetLine]) -> list[BudgetLine]:
    """The sources that make up nearly all of the variance."""
    shown: list[BudgetLine] = []
    for line in ordered:
        if sum(one.share for one in shown) >= _ENOUGH:
            break
        shown.append(line)
    return shown


def _source(line: BudgetLine, record: Record) -> str:
    """What the source is; an output is named only where there are several."""
    text = fold(line.source.replace("_", " "))
    for used in record.instruments:
        long, short = used.channel.replace("_", " "), channel_name(used.channel, record.ratings.outputs)
        if text == long or text.startswith((f"{long},", f"{long}:")):
            return short + text[len(long) :]
    return text


def _share(share: float) -> str:
    text = f"{share * 100:.1f} %"
    return text.removeprefix("-") if not text.strip("-0. %") else text.replace("-", MINUS)


def _contribution(line: BudgetLine, scale: Scale) -> str:
    return scale.with_unit(scale.rounded(line.contribution, 2))


def _freedom(number: float | None) -> str:
    """Degrees of freedom; how many hardly matters beyond a thousand."""
    if number is None or number > 1e15:
        return "∞"
    return f"{number:.3g}" if number < 999.5 else "> 1000"
