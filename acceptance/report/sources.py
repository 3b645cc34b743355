"""What the decision rests on: instruments, evidence with its hashes, doubts about the data, unprintable texts."""

from __future__ import annotations

import json
from collections.abc import Iterator
from dataclasses import fields, is_dataclass, replace
from functools import lru_cache

from acceptance.printing import DASH, count
from acceptance.record import Health, InstrumentUsed, Record
from acceptance.report.blocks import Block, Text, heading, subheading
from acceptance.report.fonts import REPLACEMENT, is_printable
from acceptance.report.front import named
from acceptance.report.measured import channel_name
from acceptance.report.style import (
    AMBER,
    BODY,
    CELL,
    CELL_BOLD,
    CELL_MUTED,
    DENSE,
    DENSE_BOLD,
    DENSE_MUTED,
    RED,
    SMALL,
    WIDTH,
    Type,
)
from acceptance.report.table import Cell, Column, Row, Table, natural_width
from acceptance.report.wrap import Run, fold
from acceptance.units import KINDS

__all__ = ["doubts", "evidence", "hash_in_fours", "instruments", "unprintable"]

_STATED_UNITS = {"voltage": KINDS["voltage"], "current": KINDS["current"], "power": KINDS["power"]}


_HASH = 300.0  # room for a hash on one line [pt]


def instruments(record: Record) -> list[Block]:
    """What measured each channel, and what was only stated."""
    if not record.instruments and not record.test.stated:
        return []
    blocks: list[Block] = [heading("Instruments")]
    if record.instruments:
        columns = [
            Column("Device", 66),
            Column("Channels", 112),
            Column("Accuracy", WIDTH - 372),
            Column("Range, resolution", 74),
            Column("Due", 54),
            Column("State", 66),
        ]
        alike: dict[InstrumentUsed, list[str]] = {}
        for used in record.instruments:
            name = channel_name(used.channel, record.ratings.outputs)
            alike.setdefault(replace(used, channel=""), []).append(name)
        rows = [_instrument(used, names) for used, names in alike.items()]
        blocks.append(Table(columns, rows, above=2, style=DENSE))
    if record.test.stated:
        texts = [f"{name.replace('_', ' ')} {value:.10g}{_unit_of(name)}" for name, value in record.test.stated.items()]
        lead = Run("Stated, not logged:  ", CELL_BOLD)
        blocks.append(Text([lead, Run("; ".join(texts), CELL)], BODY, above=5))
    return blocks


def _instrument(used: InstrumentUsed, channels: list[str]) -> Row:
    device = [Run(fold(used.device or DASH), DENSE_BOLD)]
    if used.serial:
        device.append(Run(f"serial {used.serial}", DENSE_MUTED))
    return Row(
        [
            Cell(device),
            ", ".join(dict.fromkeys(channels)),
            fold(used.accuracy) or DASH,
            fold(", ".join(part for part in (used.meter_range, used.resolution) if part)) or DASH,
            used.due or DASH,
            Cell([Run(used.state, _state_type(used.state))]),
        ]
    )


def _state_type(state: str) -> Type:
    if state == "in date":
        return DENSE
    return Type(DENSE.size, DENSE.leading, "semibold", RED if state == "past due" else AMBER)


def _unit_of(channel: str) -> str:
    """The SI unit of a channel by its name; nothing where the name does not tell."""
    for word, unit in _STATED_UNITS.items():
        if channel.partition(" ")[0].endswith(word):
            return f" {unit}"
    return " °C" if "temperature" in channel else ""


def hash_in_fours(digest: str) -> str:
    """A hash in groups of four, so that it can be compared by eye."""
    return " ".join(digest[n : n + 4] for n in range(0, len(digest), 4))


def evidence(record: Record) -> list[Block]:
    """Every file that the decision rests on, with its whole SHA-256; programs; notes from the log."""
    limits = record.limits
    files = [
        (item.file, f"{count(item.rows)} rows, {count(item.bytes)} bytes", item.sha256) for item in record.evidence
    ]
    files.append((limits.file, "limits file", limits.sha256))
    if limits.bench_file or limits.bench_sha256:
        files.append((limits.bench_file, "bench file", limits.bench_sha256))
    files.append(("requirements", "as read from the limits file", limits.requirements_sha256))
    rows = [_file(*file) for file in files]
    name = min(max(natural_width([file for file, _, _ in files], DENSE_BOLD), 90.0), WIDTH - _HASH - 62)
    columns = [Column("File", name), Column("", WIDTH - name - _HASH), Column("SHA-256", _HASH)]
    made = ", ".join(f"{name} {version}" for name, version in record.made_by.items())
    blocks: list[Block] = [
        heading("Evidence"),
        Table(columns, rows, above=2, style=DENSE),
        Text([Run("Serial taken from  ", CELL_MUTED), Run(_serial_from(record.test.serial_from), CELL)], BODY, above=5),
        Text([Run("Made by  ", CELL_MUTED), Run(fold(made) or "not recorded", CELL)], BODY),
    ]
    if record.notes:
        notes = [Row([Cell([Run(fold(name), DENSE_BOLD)]), fold(text)]) for name, text in record.notes.items()]
        blocks += [
            subheading("Notes from the log"),
            Table([Column("", 140), Column("", WIDTH - 140)], notes, head=False, above=1, style=DENSE),
        ]
    return blocks


def _serial_from(source: str) -> str:
    words = {"note": "a note in the log", "column": "a column of the log", "file name": "the file's name"}
    return words.get(source) or fold(source.replace("--serial", "the command line (--serial)")) or "not recorded"


def _file(name: str, kind: str, digest: str) -> Row:
    shown = hash_in_fours(digest) or "none in the record"
    return Row([Cell([Run(name, DENSE_BOLD)]), Cell([Run(kind, DENSE_MUTED)]), shown])


# -- doubts


def doubts(record: Record) -> list[Block]:
    """Deviations of the test, and doubts about the data with what to do about each."""
    deviations = _deviations(record)
    unseen = unprintable(record)
    blocks: list[Block] = [heading("Deviations and doubts about the data")]
    if not deviations and not record.health and not unseen:
        return [*blocks, Text("None are recorded.", BODY, above=2)]
    if record.health:
        columns = [Column("Doubt", WIDTH - 150 - 84), Column("What to do", 150), Column("Effect", 84)]
        blocks.append(Table(columns, [_doubt(doubt) for doubt in record.health], above=2))
    if deviations:
        rows = [Row([named(names, record), _listed(texts)]) for names, texts in deviations.items()]
        columns = [Column("Finding", 150), Column("How the test differed from what the requirement asks", WIDTH - 150)]
        blocks.append(Table(columns, rows, above=6))
    if unseen:
        blocks += _unseen(unseen)
    return blocks


def _deviations(record: Record) -> dict[tuple[str, ...], list[str]]:
    """Each text once: by the findings that share it, the texts they share."""
    findings: dict[str, list[str]] = {}
    for finding in record.findings:
        for deviation in finding.deviations:
            names = findings.setdefault(fold(deviation.text), [])
            if finding.name not in names:
                names.append(finding.name)
    texts: dict[tuple[str, ...], list[str]] = {}
    for text, names in findings.items():
        texts.setdefault(tuple(names), []).append(text)
    return texts


def _listed(texts: list[str]) -> Cell:
    """One text as it is, several each on a line of its own."""
    return Cell([Run(f"•  {text}" if len(texts) > 1 else text, DENSE if len(texts) > 1 else CELL) for text in texts])


def _doubt(doubt: Health) -> Row:
    place = "; ".join(part for part in (fold(doubt.where), ", ".join(doubt.channels).replace("_", " ")) if part)
    lines = [[Run(f"{doubt.kind}  ", CELL_BOLD), Run(fold(doubt.text), CELL)]]
    if place:
        lines.append([Run(place, CELL_MUTED)])
    effect = Run("keeps findings from being judged", Type(CELL.size, CELL.leading, "semibold", RED))
    return Row(
        [Cell(lines), fold(doubt.remedy) or "–", Cell([effect if doubt.bars else Run("none on the verdicts", CELL)])]
    )


def _unseen(texts: list[str]) -> list[Block]:
    note = (
        f"Some characters cannot be printed; a box ({REPLACEMENT}) stands in the place of each. The record holds them; "
        "these are the texts they stand in, as the record's notation writes them."
    )
    rows = [Row([text, json.dumps(text, ensure_ascii=True)]) for text in texts]
    columns = [Column("As printed", 170), Column("In the record", WIDTH - 170)]
    return [Text(note, SMALL, above=8, keep_next=True), Table(columns, rows, above=1)]


def unprintable(record: Record) -> list[str]:
    """The texts of the record that hold a character the report cannot show, each once, in order."""
    # names are drawn as they are, so that two of them never look alike; prose is folded to one line first
    names = {
        record.unit.product,
        record.unit.revision,
        record.unit.serial,
        record.limits.file,
        record.limits.bench_file,
    }
    names |= {finding.name for finding in record.findings} | {item.file for item in record.evidence}
    shown = ((text, text if text in names else fold(text)) for text in _texts(record))
    return list(dict.fromkeys(text for text, drawn in shown if not is_printable(drawn)))


def _texts(thing: object) -> Iterator[str]:
    """Every text within a record; rows of numbers are passed over."""
    if isinstance(thing, str):
        yield thing
    elif is_dataclass(thing) and not isinstance(thing, type):
        for name in _field_names(type(thing)):
            yield from _texts(getattr(thing, name))
    elif isinstance(thing, dict):
        for key, value in thing.items():
            yield from _texts(key)
            yield from _texts(value)
    elif isinstance(thing, list) and thing and not (thing[0] is None or isinstance(thing[0], (int, float))):
        for item in thing:
            yield from _texts(item)


@lru_cache(maxsize=64)
def _field_names(kind: type) -> tuple[str, ...]:
    # the class's own fields, those of plain numbers left out: there is no text in them
    return tuple(each.name for each in fields(kind) if not _NUMBERS.issuperset(str(each.type).split(" | ")))


_NUMBERS = frozenset({"float", "int", "bool", "None", "list[float]"})
