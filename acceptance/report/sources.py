"""What the decision rests on: instruments, evidence with its hashes, doubts about the data, unprintable texts."""

from __future__ import annotations

import json
from collections.abc import Iterator
from dataclasses import fields, is_dataclass
from functools import lru_cache

from acceptance.printing import count
from acceptance.record import Health, Record
from acceptance.report.blocks import Block, Text, heading, subheading
from acceptance.report.fonts import REPLACEMENT, is_printable
from acceptance.report.style import AMBER, BODY, CELL, CELL_BOLD, CELL_MUTED, RED, SMALL, WIDTH, Type
from acceptance.report.table import Cell, Column, Row, Table
from acceptance.report.wrap import Run, fold
from acceptance.units import KINDS

__all__ = ["doubts", "evidence", "hash_in_fours", "instruments", "unprintable"]

_STATED_UNITS = {"voltage": KINDS["voltage"], "current": KINDS["current"], "power": KINDS["power"]}


def instruments(record: Record) -> list[Block]:
    """What measured each channel, and what was only stated."""
    if not record.instruments and not record.test.stated:
        return []
    blocks: list[Block] = [heading("Instruments")]
    if record.instruments:
        columns = [
            Column("Channel", 84),
            Column("Device", 84),
            Column("Accuracy", WIDTH - 374),
            Column("Range, resolution", 72),
            Column("Due", 54),
            Column("State", 80),
        ]
        rows = [
            Row(
                [
                    used.channel.replace("_", " "),
                    Cell(
                        [
                            Run(fold(used.device or "not stated"), CELL),
                            *([Run(f"serial {used.serial}", CELL_MUTED)] if used.serial else []),
                        ]
                    ),
                    fold(used.accuracy) or "not stated",
                    fold(", ".join(part for part in (used.meter_range, used.resolution) if part)) or "–",
                    used.due or "–",
                    Cell([Run(used.state, _state_type(used.state))]),
                ]
            )
            for used in record.instruments
        ]
        blocks.append(Table(columns, rows, above=2))
    if record.test.stated:
        texts = [f"{name.replace('_', ' ')} {value:.10g}{_unit_of(name)}" for name, value in record.test.stated.items()]
        lead = Run("Stated, not logged:  ", CELL_BOLD)
        blocks.append(Text([lead, Run("; ".join(texts), CELL)], BODY, above=5))
    return blocks


def _state_type(state: str) -> Type:
    if state == "in date":
        return CELL
    return Type(CELL.size, CELL.leading, "semibold", RED if state == "past due" else AMBER)


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
    rows = [
        _file(item.file, f"{count(item.bytes)} bytes, {count(item.rows)} rows", item.sha256) for item in record.evidence
    ]
    rows.append(_file(limits.file, "limits file", limits.sha256))
    rows.append(
        _file("Requirements", "as read from the limits file, without wording and layout", limits.requirements_sha256)
    )
    if limits.bench_file or limits.bench_sha256:
        rows.append(_file(limits.bench_file, "bench file", limits.bench_sha256))
    columns = [Column("File", 140), Column("SHA-256", WIDTH - 140)]
    made = ", ".join(f"{name} {version}" for name, version in record.made_by.items())
    blocks: list[Block] = [
        heading("Evidence"),
        Table(columns, rows, above=2),
        Text([Run("Made by  ", CELL_MUTED), Run(fold(made) or "not recorded", CELL)], BODY, above=5),
    ]
    if record.notes:
        notes = [Row([Cell([Run(fold(name), CELL_BOLD)]), fold(text)]) for name, text in record.notes.items()]
        blocks += [
            subheading("Notes from the log"),
            Table([Column("", 140), Column("", WIDTH - 140)], notes, head=False, above=1),
        ]
    return blocks


def _file(name: str, kind: str, digest: str) -> Row:
    shown = hash_in_fours(digest) or "none in the record"
    return Row([Cell([Run(name, CELL_BOLD), Run(kind, CELL_MUTED)]), Cell([Run(shown, CELL)])])


# -- doubts


def doubts(record: Record) -> list[Block]:
    """Deviations of the test, and doubts about the data with what to do about each."""
    deviations = [(finding.name, deviation.text) for finding in record.findings for deviation in finding.deviations]
    unseen = unprintable(record)
    blocks: list[Block] = [heading("Deviations and doubts about the data")]
    if not deviations and not record.health and not unseen:
        return [*blocks, Text("None are recorded.", BODY, above=2)]
    if record.health:
        columns = [Column("Doubt", WIDTH - 150 - 84), Column("What to do", 150), Column("Effect", 84)]
        blocks.append(Table(columns, [_doubt(doubt) for doubt in record.health], above=2))
    if deviations:
        rows = [Row([Cell([Run(name, CELL_BOLD)]), fold(text)]) for name, text in deviations]
        columns = [Column("Finding", 120), Column("How the test differed from what the requirement asks", WIDTH - 120)]
        blocks.append(Table(columns, rows, above=6))
    if unseen:
        blocks += _unseen(unseen)
    return blocks


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
    # the class's own fields: the instances met are all dataclasses
    return tuple(each.name for each in fields(kind))
