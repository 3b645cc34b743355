"""The report's front: what was tested, the verdict and what decided it, and the cautions."""

from __future__ import annotations

from collections import Counter
from collections.abc import Sequence

from acceptance.printing import DASH, printed_finding, probability, quantity
from acceptance.printing import duration as printed_duration
from acceptance.record import Finding, FindingVerdict, Hazard, Ratings, Record
from acceptance.report.blocks import Beside, Block, Panel, Rule, Stack, Text
from acceptance.report.fonts import string_width
from acceptance.report.marks import FINDING_COLOURS, UNIT_COLOURS, UNIT_WORDS, finding_mark, unit_mark, warning_triangle
from acceptance.report.pen import Pen
from acceptance.report.style import (
    ACCENT,
    BODY,
    BODY_BOLD,
    BODY_MUTED,
    CELL,
    CELL_BOLD,
    CELL_MUTED,
    INK,
    PALE,
    SMALL,
    SUBTITLE,
    TITLE,
    WHITE,
    WIDTH,
    Type,
)
from acceptance.report.table import Cell, Column, Mark, Row, Table
from acceptance.report.template import Cautions, Template
from acceptance.report.wrap import Run, fold

__all__ = ["SCOPE", "cautions", "front", "limit_text", "named", "verdict_mark"]

NO_ISSUER = "Issuer not named in the template"
SCOPE = "Performance limits only; no safety approval."
_ORDER: tuple[FindingVerdict, ...] = ("pass", "conditional pass", "conditional fail", "fail", "not judged")


def front(record: Record, template: Template) -> list[Block]:
    """Title, facts, verdict, and the findings that decided it."""
    unit = record.unit
    name = f"{unit.product}, revision {unit.revision}" if unit.revision else unit.product
    issuer = template.issuer
    sender = " · ".join(part for part in (*issuer.address, issuer.contact) if part)
    named = [Run(issuer.name, _ISSUER)] if issuer.name else [Run(NO_ISSUER, SMALL)]
    return [
        Text([*named, Run(f"   {sender}", SMALL)] if sender else named, _ISSUER),
        Text(template.title, TITLE, above=7),
        Text([Run(name, _NAME), Run("   serial ", _SERIAL_WORD), Run(unit.serial, _NAME)], SUBTITLE, above=1),
        Rule(colour=INK, thickness=1.1, above=8),
        _facts(record),
        _Verdict(record),
        *_deciding(record),
    ]


_ISSUER = Type(9.4, 12, "semibold", ACCENT)
_NAME = Type(11, 14.5, "semibold")
_SERIAL_WORD = Type(11, 14.5, "regular", BODY_MUTED.colour)


def _facts(record: Record) -> Table:
    """What was tested, when, against what, on which bench."""
    limits, test = record.limits, record.test
    named_there = "none; the instruments stand in the limits file" if record.instruments else "none"
    bench = f"{limits.bench_file}, SHA-256 {limits.bench_sha256[:12]}…" if limits.bench_file else named_there
    pairs = [
        ("Report number", record.report_number),
        ("Tested", test.date or "date not in the log"),
        ("Rated input", _input(record.ratings)),
        ("Judged", _moment(record.judged_at)),
        ("Rated output", _outputs(record.ratings)),
        ("Stages", ", ".join(test.stages) or "none named"),
        ("Limits file", f"{limits.file}, SHA-256 {limits.sha256[:12]}…"),
        ("Ambient", _ambient(record)),
        ("Bench file", bench),
        ("Load mode", test.load_mode or "not stated"),
    ]
    rows = [
        Row([cell for label, text in pairs[n : n + 2] for cell in (Cell([Run(label, CELL_MUTED)]), fold(text))])
        for n in range(0, len(pairs), 2)
    ]
    columns = [Column("", 66), Column("", 224), Column("", 58), Column("", WIDTH - 348)]
    return Table(columns, rows, head=False, above=5)


def _input(ratings: Ratings) -> str:
    text = f"{quantity(ratings.input_voltage, 'V')} {'a.c.' if ratings.supply == 'ac' else 'd.c.'}"
    if ratings.input_range:
        text += f" ({' to '.join(quantity(voltage, 'V') for voltage in ratings.input_range)})"
    if ratings.frequency is not None:
        text += f", {quantity(ratings.frequency, 'Hz')}"
    return f"{text}, class {ratings.protection_class}" if ratings.protection_class else text


def _outputs(ratings: Ratings) -> str:
    named = len(ratings.outputs) > 1
    texts = [
        f"{f'{output.name} ' if named else ''}{quantity(output.voltage, 'V')}, {quantity(output.current, 'A')}"
        for output in ratings.outputs
    ]
    return "; ".join(texts) or "none stated"


def _ambient(record: Record) -> str:
    ambient = record.test.ambient
    if not ambient:
        return "not logged"
    low, high = (quantity(temperature, "°C", digits=3) for temperature in (min(ambient), max(ambient)))
    return low if low == high else f"{low} to {high}"


def _moment(text: str) -> str:
    """A time as people read it; a text that is no such time stays as it is."""
    day, mark, rest = text.partition("T")
    return f"{day}, {rest[:5]} UTC" if mark and text.endswith("Z") and len(rest) >= 6 else text


# -- the verdict


class _Verdict(Block):
    """The unit's verdict: word, mark and colour, and what it does not say beside it."""

    above = 11.0
    _SIDE = 158.0

    def __init__(self, record: Record) -> None:
        self._verdict = record.verdict
        width = WIDTH - self._SIDE - 26
        words = [
            Text(SCOPE, _SCOPE, width=width),
            Text(_summary(record.findings), BODY, width=width, above=3),
            Text(_joint(record), BODY_MUTED, width=width, above=1),
        ]
        if differed := _differed(record.findings):
            words.append(Text(differed, BODY, width=width, above=1))
        self._words = Stack(words)
        self.height = max(64.0, self._words.height + 22)

    def draw(self, pen: Pen, x: float, y: float) -> None:
        low, middle = y - self.height, y - self.height / 2
        colour = UNIT_COLOURS[self._verdict]
        pen.rectangle((x, low, WIDTH, self.height), fill=WHITE, stroke=colour, width=1.0)
        pen.rectangle((x, low, self._SIDE, self.height), fill=colour)
        word = UNIT_WORDS[self._verdict]
        wide = 26 + 9 + string_width(word, _WORD.size, _WORD.weight)
        left = x + (self._SIDE - wide) / 2
        unit_mark(pen, self._verdict, (left + 13, middle), 13)
        pen.text(left + 35, middle - 6.2, word, _WORD)
        self._words.draw(pen, x + self._SIDE + 14, middle + self._words.height / 2)


_WORD = Type(18, 20, "semibold", WHITE)
_SCOPE = Type(10.4, 13.5, "semibold")


def _summary(findings: list[Finding]) -> str:
    """How many findings there are, and how many of each verdict."""
    if not findings:
        return "No findings: nothing was asked, or nothing could be judged."
    counted = Counter(finding.verdict for finding in findings)
    total = f"{len(findings)} finding{'s' if len(findings) != 1 else ''}"
    return f"{total}: {', '.join(f'{counted[verdict]} {verdict}' for verdict in _ORDER if counted[verdict])}."


def _differed(findings: list[Finding]) -> str:
    """Where to read how the test differed from what was asked: a verdict is not to be read without it."""
    count = sum(bool(finding.deviations) for finding in findings)
    if not count:
        return ""
    of = f"{count} of the findings" if count > 1 else "one finding"
    return f"For {of} the test differed, or may have, from what is asked: see Deviations and doubts about the data."


def _joint(record: Record) -> str:
    joint = record.joint_conformity_probability
    if joint is None:
        return "Probability that the unit meets all its limits together: not stated, since not every finding has one."
    return f"Probability that the unit meets all its limits together: {probability(joint)}."


_SEVERITY = ("fail", "not judged", "conditional fail", "conditional pass")
_MOST = 10  # rows of the summary; the findings' own part has them all
_LONGEST = 400  # characters of a reason in the summary


def _deciding(record: Record) -> list[Block]:
    """The findings that kept the unit from being accepted, each with its reason; those alike in one row."""
    deciding = [finding for finding in record.findings if finding.verdict != "pass"]
    if not deciding:
        return []
    deciding.sort(key=lambda finding: _SEVERITY.index(finding.verdict))
    grouped: dict[tuple[str, str], list[Finding]] = {}
    for finding in deciding:
        grouped.setdefault((finding.verdict, _reason(finding)), []).append(finding)
    rows = [
        Row([_names(alike, record), _word(alike[0]), _shortened(reason)])
        for (_, reason), alike in list(grouped.items())[:_MOST]
    ]
    title = {"accepted": "Not plainly passed", "rejected": "Why it was rejected", "undecided": "Why it is undecided"}
    blocks: list[Block] = [
        Text(title[record.verdict], BODY_BOLD, above=9, keep_next=True),
        Table([Column("", 170), Column("", 76), Column("", WIDTH - 246)], rows, head=False, above=2),
    ]
    left = sum(len(alike) for alike in list(grouped.values())[_MOST:])
    if left:
        text = (
            f"{left} more finding{'s' if left > 1 else ''}, with the reason{'s' if left > 1 else ''}, under Findings."
        )
        blocks.append(Text(text, SMALL, above=3))
    return blocks


def _names(alike: list[Finding], record: Record) -> Cell:
    names = [finding.name for finding in alike]
    if len(names) > _MOST and len(names) < len(record.findings):
        names = [*names[: _MOST - 2], f"and {len(names) - _MOST + 2} more"]
    cell = named(names, record)
    return Cell(cell.paragraphs, verdict_mark(alike[0]))


def named(names: Sequence[str], record: Record) -> Cell:
    """The names of findings, as a cell; all of several as such."""
    if len(names) == len(record.findings) > 2:
        return Cell([Run("all findings", CELL_BOLD)])
    return Cell([Run(", ".join(names), CELL_BOLD)])


def _word(finding: Finding) -> Cell:
    return Cell([Run(finding.verdict, Type(CELL.size, CELL.leading, "semibold", FINDING_COLOURS[finding.verdict]))])


def _reason(finding: Finding) -> str:
    """The reason, after the value and what it had to meet."""
    reason = fold(finding.reason) or "no reason is given in the record"
    if isinstance(finding.value, str):
        return fold(f"{finding.value}, limit {limit_text(finding)}: {reason}") if finding.asked else reason
    if finding.value is None:
        return reason
    texts = printed_finding(finding)
    value = texts.with_unit(texts.value)
    value += f" ± {texts.with_difference_unit(texts.expanded)}" if texts.expanded != DASH else ""
    return fold(f"{value}, limit {limit_text(finding)}: {reason}")


def _shortened(text: str) -> str:
    if len(text) <= _LONGEST:
        return text
    return f"{text[:_LONGEST].rpartition(' ')[0] or text[:_LONGEST]} … (the whole reason stands under Findings)"


def limit_text(finding: Finding) -> str:
    """What the finding had to meet, in the unit its value is printed in, or in words."""
    if finding.asked.strip():
        return fold(finding.asked)
    texts = printed_finding(finding)
    low, high = texts.with_unit(texts.low), texts.with_unit(texts.high)
    if texts.low != DASH and texts.high != DASH:
        return f"{low} to {high}"
    if texts.low != DASH:
        return f"≥ {low}"
    return f"≤ {high}" if texts.high != DASH else DASH


def verdict_mark(finding: Finding) -> Mark:
    """What draws the finding's mark at a place in a table."""

    def mark(pen: Pen, centre: tuple[float, float]) -> None:
        finding_mark(pen, finding.verdict, centre, 3.5)

    return mark


# -- cautions


class _Triangle(Block):
    """The warning triangle."""

    height = 22.0

    def draw(self, pen: Pen, x: float, y: float) -> None:
        warning_triangle(pen, (x + 12, y - 12), 24)


def cautions(record: Record, template: Template) -> list[Block]:
    """The cautions that the unit's hazards ask for, and the general ones."""
    words = template.cautions
    inner = Panel.INNER
    opening = Beside(
        [
            (0.0, _Triangle()),
            (
                36.0,
                Stack(
                    [
                        Text("Electrical safety", _CAUTION_TITLE),
                        Text(words.introduction, SMALL, width=inner - 36, above=1),
                    ]
                ),
            ),
        ]
    )
    specific = [_specific(hazard, words, inner) for hazard in record.hazards]
    general = [_caution(caution.title, caution.text, inner) for caution in words.general]
    basis = [_basis(record.hazards, inner)] if record.hazards else []
    inside = Stack([opening, *basis, *specific, *general])
    return [Panel(inside, fill=PALE, bar=_YELLOW, above=13)]


_CAUTION_TITLE = Type(11, 13.5, "semibold")
_YELLOW = (0.93, 0.68, 0.0)
_CAUTION = Type(8.0, 10.3)
_CAUTION_BOLD = Type(8.0, 10.3, "semibold")


def _specific(hazard: Hazard, words: Cautions, width: float) -> Block:
    caution = words.hazards[hazard.hazard]
    text = caution.text
    if hazard.wait is not None and caution.text_with_wait:
        text = caution.text_with_wait.replace("{wait}", printed_duration(hazard.wait))
    return _caution(caution.title, text, width)


def _caution(title: str, text: str, width: float) -> Text:
    runs = [Run(f"{fold(title).rstrip(chr(46))}.  ", _CAUTION_BOLD), Run(fold(text), _CAUTION)]
    return Text(runs, _CAUTION, width=width, above=3)


def _basis(hazards: list[Hazard], width: float) -> Text:
    """Why each hazard is taken to be there, in the words of the record."""
    texts = [f"{hazard.hazard} ({fold(hazard.basis)})" if hazard.basis.strip() else hazard.hazard for hazard in hazards]
    return Text(f"Hazards taken to be present: {'; '.join(texts)}.", SMALL, width=width, above=5)
