"""Stages: the spellings that mean one, what names of files and sheets tell, and rows whose stage nobody knows."""

from __future__ import annotations

import re
from collections.abc import Sequence
from difflib import get_close_matches

import numpy as np
from numpy.typing import NDArray

from acceptance.bench.assemble import Samples, spans_of
from acceptance.bench.headings import shown
from acceptance.bench.log import Doubt
from acceptance.bench.values import MISSING
from acceptance.bench.words import Words, distinct, each_word

__all__ = ["NOT_JUDGED", "NOT_TOLD", "STAGES", "RowStages", "doubts_of", "split_name", "stage_named", "stages_of"]

STAGES = ("steady", "overcurrent", "thermal", "cold", "cooling")
NOT_JUDGED = ("warm-up", "idle", "pause", "off", "setup")  # certainly no part of the test
NOT_TOLD = "not told"  # an empty cell that nothing settles

RowStages = Sequence[str]  # one a row; or a text, which is for all rows of a table

# only what has one meaning: "warm run" may be the soak or the warming up before it
_SPELLINGS = {
    "steady": ("steady", "steady state"),
    "overcurrent": ("overcurrent", "over current", "overload", "ocp"),
    "thermal": ("thermal", "thermal soak", "temperature rise"),
    "cold": ("cold",),
    "cooling": ("cooling", "cooling down", "cool down"),
    "warm-up": ("warm up", "warming up", "preheat", "pre heat", "preheating"),
    "idle": ("idle",),
    "pause": ("pause", "paused"),
    "off": ("off", "switched off"),
    "setup": ("setup", "set up"),
}
_JOINTS = re.compile(r"[\s_.\-]+")
_BY_WORD = {phrase.replace(" ", ""): stage for stage, phrases in _SPELLINGS.items() for phrase in phrases}
_MISSING = frozenset(word.casefold() for word in MISSING)
# a serial may well end in "off"
_IN_NAMES = [p for stage, phrases in _SPELLINGS.items() if stage not in ("off", "setup") for p in phrases]
_STAGED = re.compile(
    rf"(?P<serial>.*?)(?:^|[_\-. ]+)(?P<stage>{'|'.join(p.replace(' ', '[_. -]*') for p in _IN_NAMES)})"
    r"(?:[_\-. ]+\d{1,3})?",
    re.IGNORECASE,
)
_NEAR = 0.8  # likeness of two words, as difflib counts it: two letters of nine that changed places
_SLIPPABLE = 5  # letters; "old" and "warm" are words of their own
_LISTED = 8  # values named in a doubt
_SPANS = 200  # spans kept of a doubt without a bar


def stage_named(text: str) -> str | None:
    """The stage that a word means, in any case and spelling, a run's number left off; None where it is not known."""
    return _BY_WORD.get(_JOINTS.sub("", text.casefold()).rstrip("0123456789"))


def split_name(stem: str) -> tuple[str, str]:
    """Serial and stage of a file's stem, the stage "" where the name tells none.

    "A-17_overcurrent" is unit A-17, overcurrent, and so is "A-17_overcurrent_2", its second run.
    """
    match = _STAGED.fullmatch(stem.strip())
    if match is None:
        return stem.strip(), ""
    return match["serial"].strip(), stage_named(match["stage"]) or ""


def _of_sheet(title: str) -> str:
    """The stage a sheet's name tells, "" for none: "overcurrent", "Thermal 2", "A-17 cold"."""
    return stage_named(title) or split_name(title)[1]


def stages_of(samples: Samples, *, in_name: str, in_note: str) -> tuple[RowStages, str, str]:
    """A table's stages, what told them, and what contradicts itself ("" where nothing does).

    A stage column comes first, then the sheet's name, the file's, a note. An empty cell of the column has the stage
    of the rows around it where these agree, else that of the name; without one its stage is `NOT_TOLD`.

    Parameters
    ----------
    in_name, in_note
        The stage that the file's name tells, and the text of its note; "" where there is none.
    """
    of_sheet = _of_sheet(samples.sheet) if samples.sheet else ""
    noted = stage_named(in_note) or in_note.strip().lower()
    default, origin = next(
        (pair for pair in ((of_sheet, "sheet name"), (in_name, "file name"), (noted, "note")) if pair[0]),
        ("", "none told"),
    )
    written = samples.texts.get("stage", [])
    column = each_word(written, _of_cell)
    if any(distinct(column)):
        filled = column if "" not in distinct(column) else _filled(column)
        return each_word(filled, lambda text: text or default or NOT_TOLD), "stage column", ""
    fault = ""
    if noted and in_name and not of_sheet and noted != in_name:
        fault = f'{samples.file}: its name says the stage {in_name}, and its note says "{shown(in_note, 30)}"'
    if origin == "none told" and (slip := _slip(samples.file)):
        fault = f'{samples.file}: "{shown(slip[0], 30)}" in its name is nearly "{slip[1]}", and no stage'
    return default or "steady", origin, fault


def _slip(name: str) -> tuple[str, str] | None:
    """The word at the end of a file's name that misses a stage by a slip of the pen, and that stage's word."""
    words = [word for word in re.split(r"[_\-. ]+", name.rpartition(".")[0].casefold()) if not word.isdigit()]
    if not words or not words[-1].isalpha() or len(words[-1]) < _SLIPPABLE:
        return None
    alike = [word for word in _BY_WORD if word[0] == words[-1][0]]  # "ready" is no slip of "steady"
    close = get_close_matches(words[-1], alike, n=1, cutoff=_NEAR)
    return (words[-1], close[0]) if close else None


def _of_cell(text: str) -> str:
    return "" if text.strip().casefold() in _MISSING else stage_named(text) or text


def _filled(column: Sequence[str]) -> list[str]:
    """The column, empty cells between two of one stage given that stage."""
    filled = list(column)
    before = -1  # the last row with a stage
    for row, text in enumerate(column):
        if not text:
            continue
        if before >= 0 and row - before > 1 and column[before] == text:
            filled[before + 1 : row] = [text] * (row - before - 1)
        before = row
    return filled


# --- doubts ---------------------------------------------------------------------------------------------------------


def doubts_of(tables: Sequence[tuple[Samples, RowStages]], contradictions: Sequence[str]) -> list[Doubt]:
    """What a reader of the report must know about the stages; an unknown one bars everything.

    A unit must not be accepted while rows that may belong to its test were never looked at.
    """
    rows: dict[str, list[NDArray[np.intp]]] = {}
    offset = 0
    for samples, stages in tables:
        for stage, found in _odd_rows(stages, len(samples)).items():
            rows.setdefault(stage, []).append(found + offset)
        offset += len(samples)
    odd = {stage: np.concatenate(parts) for stage, parts in rows.items()}
    unknown = {stage: found for stage, found in odd.items() if stage not in NOT_JUDGED}
    remedy = "call the stages steady, overcurrent, thermal, cold or cooling, or leave those rows out"
    doubts = [Doubt("stage unknown", text, bars=True, remedy="make them agree") for text in contradictions]
    if unknown:
        doubts.append(Doubt("stage unknown", _unknown_text(tables, unknown), bars=True, remedy=remedy))
    left = {stage: found for stage, found in odd.items() if stage in NOT_JUDGED}
    if left:
        doubts.append(_not_judged(left))
    return doubts


def _odd_rows(stages: RowStages, size: int) -> dict[str, NDArray[np.intp]]:
    """Rows by stage, of those stages that are not judged."""
    if isinstance(stages, str):
        return {} if stages in STAGES else {stages: np.arange(size)}
    if isinstance(stages, Words):
        own = {stage: number for number, stage in enumerate(stages.words) if stage not in STAGES}
        return {stage: np.flatnonzero(stages.codes == number) for stage, number in own.items()}
    odd: dict[str, list[int]] = {}
    for row, stage in enumerate(stages):
        if stage not in STAGES:
            odd.setdefault(stage, []).append(row)
    return {stage: np.array(found, np.intp) for stage, found in odd.items()}


def _unknown_text(tables: Sequence[tuple[Samples, RowStages]], unknown: dict[str, NDArray[np.intp]]) -> str:
    listed = ["an empty cell" if stage == NOT_TOLD else f'"{shown(stage, 30)}"' for stage in unknown]
    more = f" and {len(listed) - _LISTED} more" if len(listed) > _LISTED else ""
    first = min(int(found[0]) for found in unknown.values())
    count = _count(sum(found.size for found in unknown.values()))
    where = _place(tables, first)
    return f"{count} of a stage that is not known ({', '.join(listed[:_LISTED])}{more}), first at {where}"


def _place(tables: Sequence[tuple[Samples, RowStages]], row: int) -> str:
    for samples, _ in tables:
        if row < len(samples):
            return f"{samples.name}:{int(samples.lines[row])}"
        row -= len(samples)
    raise AssertionError  # pragma: no cover - the row is one of the tables'


def _not_judged(left: dict[str, NDArray[np.intp]]) -> Doubt:
    listed = ", ".join(f"{stage} ({_count(found.size)})" for stage, found in left.items())
    rows = np.sort(np.concatenate(list(left.values())))
    text = f"stages that are no part of the judged test are left out: {listed}"
    return Doubt("stage not judged", text, spans=spans_of(rows)[:_SPANS])


def _count(rows: int) -> str:
    return "1 row" if rows == 1 else f"{rows} rows"
