"""Log files -> `BenchLog`: the whole of reading, in order.

bytes ──text or workbook──> raw tables ──assemble──> samples in SI ──read_logs──> one log of one unit
"""

from __future__ import annotations

import hashlib
from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass
from pathlib import Path
from typing import TYPE_CHECKING, Any

import numpy as np
from numpy.typing import NDArray

from acceptance.bench.assemble import Samples, assemble, spans_of
from acceptance.bench.headings import Vocabulary, shown
from acceptance.bench.identity import Claim, day_of_test, serial_of
from acceptance.bench.log import BenchLog, Channel, Doubt, Evidence, Ignored, Span
from acceptance.bench.long import LONG, read_long
from acceptance.bench.packed import Packed
from acceptance.bench.stages import RowStages, doubts_of, split_name, stages_of
from acceptance.bench.table import Source
from acceptance.bench.text import read_text
from acceptance.bench.values import Column
from acceptance.bench.words import Words, distinct, each_word
from acceptance.bench.workbook import is_workbook, read_workbook
from acceptance.errors import LogError

if TYPE_CHECKING:
    import pandas as pd

__all__ = ["read_logs"]

MAX_TEXT_BYTES = 2 << 30
MAX_WORKBOOK_BYTES = 256 << 20


@dataclass(frozen=True, slots=True)
class _File:
    """One file, read."""

    source: Source
    samples: list[Samples]
    evidence: Evidence
    stem_serial: str
    stem_stage: str


def read_logs(
    paths: Sequence[Path],
    *,
    columns: Mapping[str, tuple[str, str | None]] | None = None,
    stated: Mapping[str, float] | None = None,
    load_mode: str | None = None,
    outputs: Sequence[str] = (),
    serial: str | None = None,
    progress: Callable[[int, int], None] | None = None,
) -> BenchLog:
    """The log of one unit, all its files together, in SI units.

    Parameters
    ----------
    paths
        Delimited text or workbooks, told apart by what is in them. Their order changes nothing: samples come in
        the order of the files' names.
    columns
        Channel key ("output_voltage", "temperature case") to its heading as in the file and its unit, or None.
    stated
        Channel key to a value that was not logged. [SI]
    load_mode
        CC, CR, CV or CP, for samples whose log does not tell.
    outputs
        The product's outputs; the first is meant where a heading names none. Without them such channels stay bare.
    serial
        The unit's; without it (None or empty) a serial column or note tells, else the file's name without its stage.
    progress
        Called with the bytes read so far and those of all files.

    Raises
    ------
    LogError
        If a file cannot be read, holds no table of readings, or a cell is not what its heading says.
    SeveralSerialsError
        If the files belong to several units.
    """
    if not paths:
        raise LogError(file="log", found="no log was given", expected="expected at least one file")
    vocabulary = Vocabulary(columns, outputs)
    files: list[_File] = []
    repeated: list[Ignored] = []
    ordered = sorted(map(Path, paths), key=lambda path: (path.name, str(path)))
    sizes = [path.stat().st_size if path.is_file() else 0 for path in ordered]
    for path, size, before in zip(ordered, sizes, np.cumsum([0, *sizes]).tolist(), strict=False):

        def told(done: int, before: int = before) -> None:
            if progress is not None:
                progress(before + done, sum(sizes))

        read = _read_file(path, vocabulary, told, known={file.evidence.sha256 for file in files})
        _take(read, path, files, repeated, load_mode)
        told(size)
    _refuse_unmet_columns(files, vocabulary)
    given = serial if serial is not None and serial.strip() else None
    identity = serial_of([_claim(file) for file in files], given)
    return _merge(files, vocabulary, dict(stated or {}), load_mode, identity, repeated)


# --- files ----------------------------------------------------------------------------------------------------------


def _read_file(
    path: Path, vocabulary: Vocabulary, told: Callable[[int], None], *, known: set[str]
) -> tuple[Source, str, int]:
    """What a file holds (nothing where its bytes are known already), the SHA-256 of its bytes, and their number."""
    name = _file_name(path) or str(path)
    try:
        _refuse_no_file(path, name)
        size = path.stat().st_size
        with path.open("rb") as stream:
            is_book = is_workbook(stream.read(8))
        in_pieces = None
        if size >= LONG and not is_book:
            in_pieces = read_long(path, name, vocabulary, progress=told)
        if in_pieces is not None:
            return in_pieces
        raw = _bytes(path, name, MAX_WORKBOOK_BYTES if is_book else MAX_TEXT_BYTES)
    except (OSError, ValueError) as problem:
        reason = getattr(problem, "strerror", None) or str(problem)
        raise LogError(name, f"the file cannot be read ({shown(reason)})") from None
    digest = hashlib.sha256(raw).hexdigest()
    if digest in known:
        return Source(name), digest, len(raw)
    read = read_workbook if is_workbook(raw) else read_text
    return read(raw, name, vocabulary), digest, len(raw)


def _take(
    read: tuple[Source, str, int], path: Path, files: list[_File], repeated: list[Ignored], load_mode: str | None
) -> None:
    source, digest, size = read
    name = source.file
    same = next((f.evidence.file for f in files if f.evidence.sha256 == digest), None)
    if same is not None:
        repeated.append(Ignored(name, "the whole file", f"its bytes are those of {same}: no sample counts twice"))
        return
    samples = [assemble(table, source, load_mode=load_mode) for table in source.tables]
    started = next((s.started_at for s in samples if s.started_at is not None), None)
    evidence = Evidence(name, digest, size, sum(map(len, samples)), source.dialect, started)
    stem, stage = split_name(_file_name(path.with_suffix("")) if path.suffix else name)
    files.append(_File(source, samples, evidence, stem, stage))


def _file_name(path: Path) -> str:
    """The file's name as text that can be printed anywhere."""
    return shown(path.name.encode("utf-8", "surrogateescape").decode("utf-8", "replace"), 200)


def _refuse_no_file(path: Path, name: str) -> None:
    if path.is_dir():
        raise LogError(name, "this is a folder", "expected a log file")
    if not path.exists():
        raise LogError(name, "there is no such file")
    if not path.is_file():
        raise LogError(name, "this is no regular file", "expected a log file")


def _bytes(path: Path, name: str, limit: int) -> bytes:
    """The whole file, which is not plain enough to be read in pieces, or not long."""
    size = path.stat().st_size
    if size > limit:
        expected = f"expected at most {limit}, or plain rows of numbers alone; split the log"
        raise LogError(name, f"the file is too large ({size} bytes)", expected)
    with path.open("rb") as stream:
        return stream.read(limit + 1)


def _refuse_unmet_columns(files: Sequence[_File], vocabulary: Vocabulary) -> None:
    met = {key for file in files for samples in file.samples for key in samples.chosen}
    for key, (heading, _) in vocabulary.columns.items():
        if key not in met:
            listed = ", ".join(file.evidence.file for file in files)
            found = f'no heading "{shown(heading)}" is there, which log: columns: gives for {key.replace("_", " ")}'
            raise LogError(listed, found, "write the heading as it stands in the file")


def _claim(file: _File) -> Claim:
    columns = [text for samples in file.samples for text in distinct(samples.texts.get("serial", ())) if text]
    return Claim(file.evidence.file, tuple(dict.fromkeys(columns)), file.source.told, file.stem_serial)


# --- all tables together --------------------------------------------------------------------------------------------


def _merge(
    files: Sequence[_File],
    vocabulary: Vocabulary,
    stated: dict[str, float],
    load_mode: str | None,
    identity: tuple[str, str, list[Doubt]],
    repeated: list[Ignored],
) -> BenchLog:
    unit, serial_from, doubts = identity
    tables = [(file, samples) for file in files for samples in file.samples]
    offsets = np.concatenate(([0], np.cumsum([len(samples) for _, samples in tables]))).tolist()
    stages, stages_from, stage_doubts = _stages(tables)
    frame = _frame(tables, stages, load_mode)
    day, day_doubts = day_of_test((samples, file.source.told) for file, samples in tables)
    qualified = {vocabulary.qualify(key): value for key, value in stated.items()}
    doubts = [
        *doubts,
        *day_doubts,
        *stage_doubts,
        *(doubt for file in files for doubt in file.source.doubts),
        *_reading_doubts(tables, offsets),
        *_unit_doubts(samples for _, samples in tables),
        *_stated_doubts(qualified, frame),
    ]
    return BenchLog(
        serial=unit,
        samples=frame,
        channels=_channels(tables),
        evidence=tuple(file.evidence for file in files),
        tables=tuple(samples.name for _, samples in tables),
        notes=_notes(files),
        stated=qualified,
        ignored=tuple(dict.fromkeys([item for file in files for item in file.source.ignored] + repeated)),
        doubts=tuple(doubts),
        test_date=day,
        serial_from=serial_from,
        stages_from=stages_from,
    )


def _channels(tables: Sequence[tuple[_File, Samples]]) -> tuple[Channel, ...]:
    return tuple(dict.fromkeys(channel for _, samples in tables for channel in samples.channels))


def _stages(tables: Sequence[tuple[_File, Samples]]) -> tuple[list[RowStages], str, list[Doubt]]:
    """Each table's stages, what told them, and what is doubtful about them."""
    found = [
        stages_of(samples, in_name=file.stem_stage, in_note="; ".join(_stage_notes(file))) for file, samples in tables
    ]
    told = {origin for _, origin, _ in found}
    order = ("stage column", "file name", "sheet name", "note", "none told")
    faults = list(dict.fromkeys(fault for _, _, fault in found if fault))
    stages = [stage for stage, _, _ in found]
    doubts = doubts_of([(samples, stage) for (_, samples), stage in zip(tables, stages, strict=True)], faults)
    return stages, next(name for name in order if name in told), doubts


def _stage_notes(file: _File) -> list[str]:
    return [text for key in ("stage", "test stage") for text in file.source.told.get(key, ())]


def _frame(tables: Sequence[tuple[_File, Samples]], stages: Sequence[RowStages], load_mode: str | None) -> pd.DataFrame:
    import pandas as pd

    sizes = [len(samples) for _, samples in tables]
    columns: dict[str, Any] = {}
    keys = dict.fromkeys(key for _, samples in tables for key in samples.numbers)
    for key in sorted(keys, key=lambda key: key != "time"):  # time first, the others as met
        columns[key] = _column([
            samples.numbers.get(key, np.broadcast_to(np.nan, size))
            for (_, samples), size in zip(tables, sizes, strict=True)
        ])  # fmt: skip
    columns["stage"] = _categorical(list(stages), sizes)
    for key, modes in _modes(tables, load_mode).items():
        columns[key] = _categorical(modes, sizes)
    columns["table"] = np.repeat(np.arange(len(sizes), dtype=np.int16 if len(sizes) < 1 << 15 else np.int64), sizes)
    columns["line"] = _column([samples.lines for _, samples in tables])
    return pd.DataFrame(columns, copy=False)


def _column(parts: Sequence[Column | NDArray[np.int64]]) -> Any:
    """One column of the samples, as a whole; packed where a table of it is."""
    if any(isinstance(part, Packed) for part in parts):
        from acceptance.bench.packed_frame import PackedArray

        return PackedArray(Packed.joined([Packed.of(part) for part in parts]))
    return parts[0] if len(parts) == 1 else np.concatenate(parts)


def _modes(tables: Sequence[tuple[_File, Samples]], load_mode: str | None) -> dict[str, list[RowStages]]:
    """Load modes by channel, each table's as one text or one a sample; the stated one where none is logged."""
    keys = dict.fromkeys(key for _, samples in tables for key in samples.texts if key.partition(" ")[0] == "load_mode")
    if not keys and load_mode is not None:
        return {"load_mode": [load_mode for _ in tables]}
    default = load_mode or ""
    return {
        key: [each_word(s.texts[key], lambda text: text or default) if key in s.texts else default for _, s in tables]
        for key in keys
    }


def _categorical(parts: Sequence[RowStages], sizes: Sequence[int]) -> Any:
    """Texts as categories in the order they are met; an empty text is no value."""
    import pandas as pd

    codes: dict[str, int] = {}
    arrays: list[NDArray[np.signedinteger]] = []
    for part, size in zip(parts, sizes, strict=True):
        told = [part] if isinstance(part, str) else distinct(part)
        numbers = {text: codes.setdefault(text, len(codes)) if text else -1 for text in told}
        kind = np.min_scalar_type(-max(1, len(codes)))
        if isinstance(part, str):
            arrays.append(np.full(size, numbers[part], dtype=kind))
        elif isinstance(part, Words):
            arrays.append(np.array([numbers[text] for text in part.words], dtype=kind)[part.codes])
        else:
            arrays.append(np.array([numbers[text] for text in part], dtype=kind))
    return pd.Categorical.from_codes(np.concatenate(arrays), categories=pd.Index(list(codes), dtype=object))


def _notes(files: Sequence[_File]) -> dict[str, str]:
    """All notes; where two files differ in one, the later stands under its file's name too."""
    notes: dict[str, str] = {}
    for file in files:
        for key, value in file.source.notes.items():
            if notes.setdefault(key, value) != value:
                notes[f"{key} ({file.evidence.file})"] = value
    return notes


# --- doubts ---------------------------------------------------------------------------------------------------------


def _reading_doubts(tables: Sequence[tuple[_File, Samples]], offsets: Sequence[int]) -> list[Doubt]:
    missing: dict[str, list[tuple[int, str, tuple[Span, ...]]]] = {}
    over: dict[str, list[tuple[int, str, tuple[Span, ...]]]] = {}
    for (_, samples), offset in zip(tables, offsets, strict=False):
        for kept, found in ((missing, samples.missing), (over, samples.over_range)):
            for key, (rows, place) in found.items():
                kept.setdefault(key, []).append((len(rows), place, spans_of(rows, offset)))
    doubts = []
    for key, parts in missing.items():
        text = f"{_count(parts)} of {key.replace('_', ' ')} missing, first at {parts[0][1]}"
        doubts.append(Doubt("missing", text, channels=(key,), spans=tuple(s for p in parts for s in p[2])))
    for key, parts in over.items():
        text = f"{_count(parts)} of {key.replace('_', ' ')} over range, first at {parts[0][1]}"
        spans = tuple(s for p in parts for s in p[2])
        remedy = "measure again in a higher range"
        doubts.append(Doubt("over range", text, bars=True, channels=(key,), spans=spans, remedy=remedy))
    return doubts


def _count(parts: Sequence[tuple[int, str, tuple[Span, ...]]]) -> str:
    number = sum(part[0] for part in parts)
    return "1 reading" if number == 1 else f"{number} readings"


def _unit_doubts(tables: Any) -> list[Doubt]:
    """One doubt for all the headings without a unit."""
    assumed: dict[str, Channel] = {}
    for samples in tables:
        for channel in samples.channels:
            if channel.unit_from == "assumed" and channel.quantity != "power_factor":
                assumed.setdefault(channel.key, channel)
    if not assumed:
        return []
    listed = ", ".join(f"{key.replace('_', ' ')} in {channel.unit or '?'}" for key, channel in assumed.items())
    text = f"no unit is written, and SI is assumed: {listed}"
    remedy = "write the units into the headings, or name them under log: columns:"
    return [Doubt("unit assumed", text, channels=tuple(assumed), remedy=remedy)]


def _stated_doubts(stated: Mapping[str, float], frame: pd.DataFrame) -> list[Doubt]:
    return [
        Doubt(
            "stated and logged", f"{key.replace('_', ' ')} is stated, and also logged: the log counts", channels=(key,)
        )
        for key in stated
        if key in frame.columns
    ]
