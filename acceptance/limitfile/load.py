"""A limits file, and the bench file beside it, to `Limits`: all of their faults at once, or none."""

from __future__ import annotations

import hashlib
from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass
from pathlib import Path as FilePath
from typing import Any, TypeVar

from pydantic import ValidationError

from acceptance.errors import Fault, LimitsError
from acceptance.limitfile.benchpart import BenchPart, bench_part
from acceptance.limitfile.crosscheck import Placed, check_outputs, check_requirements, named
from acceptance.limitfile.faults import Source, add_model_faults, on_one_line
from acceptance.limitfile.fields import Part
from acceptance.limitfile.fingerprint import requirements_sha256
from acceptance.limitfile.limits import Limits
from acceptance.limitfile.model import BenchFile, Decision, InputRating, LimitsFile, Output, Requirements
from acceptance.limitfile.ratings import Plate, check_meters
from acceptance.limitfile.yamltree import MAX_BYTES, Path, Tree, read_tree

__all__ = ["BenchPart", "bench_schema", "limits_schema", "load_bench", "load_limits"]

P = TypeVar("P", bound=Part)

# keys that a bench file cannot have
_OWN_KEYS = frozenset(LimitsFile.model_fields) - frozenset(BenchFile.model_fields)
# sections that may stand empty, as when all their entries are commented out
_SECTIONS = frozenset({"log", "instruments", "lead_resistance", "lot", "decision"})


@dataclass(frozen=True, slots=True)
class _File:
    """One file: its content, and what is wrong with it so far."""

    name: str  # without its folder
    source: Source
    sha256: str
    raw: dict[str, Any]  # texts, lists and dictionaries, as written
    broken: bool  # nothing can be made of it


def load_limits(path: FilePath, bench: FilePath | None = None) -> Limits:
    """What a limits file, and a bench file, say.

    Parameters
    ----------
    path
        The limits file.
    bench
        A file with the bench's own part; what it says stands in place of what the limits file says.

    Raises
    ------
    LimitsError
        With every fault of both files: unreadable, not YAML, unknown keys, values that do not fit, names
        used twice, conditions that are missing or outside the ratings.
    """
    limits_file = _read(path)
    bench_file = _read(bench) if bench is not None else None
    model = _validated(limits_file, LimitsFile)
    bench_model = _validated(bench_file, BenchFile, elsewhere=_OWN_KEYS) if bench_file is not None else None

    plate = _plate(limits_file.raw, model)
    check_outputs(limits_file.source, plate.outputs)
    requirements = list(_requirements(limits_file.raw, model))
    check_requirements(limits_file.source, requirements, plate)
    part = _bench_part(limits_file, model, plate)
    if bench_file is not None:
        part = part.overridden_by(_bench_part(bench_file, bench_model, plate))

    faults = _faults(limits_file, bench_file)
    if faults or model is None:
        raise LimitsError(faults)
    return Limits(
        file=limits_file.name,
        sha256=limits_file.sha256,
        requirements_sha256=requirements_sha256(model.ratings, model.decision, named(requirements)),
        product=model.product,
        ratings=model.ratings,
        decision=model.decision,
        requirements=tuple(named(requirements)),
        columns=part.columns,
        stated=part.stated,
        load_mode=part.load_mode,
        settle=part.settle,
        min_dwell=part.min_dwell,
        meters=part.meters,
        leads=part.leads,
        bench_file=bench_file.name if bench_file is not None else "",
        bench_sha256=bench_file.sha256 if bench_file is not None else "",
        lot=model.lot.model_dump(exclude_none=True) if model.lot is not None else None,
    )


def load_bench(path: FilePath, outputs: Sequence[str] = ()) -> BenchPart:
    """What a bench file says by itself, without a limits file.

    Parameters
    ----------
    path
        The bench file.
    outputs
        Names of the product's outputs, the default first. Where none are known, every name of an output is taken
        as it is written, and a quantity without one stays without.

    Raises
    ------
    LimitsError
        With every fault of the file.
    """
    file = _read(path)
    part = _bench_part(file, _validated(file, BenchFile, elsewhere=_OWN_KEYS), Plate(tuple(outputs)))
    if faults := _faults(file):
        raise LimitsError(faults)
    return part


def limits_schema() -> dict[str, Any]:
    """JSON Schema (draft 2020-12) of a limits file, made from the models that `load_limits` checks by."""
    from acceptance.limitfile import schema  # only this needs pydantic's schema writer

    return schema.limits_schema()


def bench_schema() -> dict[str, Any]:
    """JSON Schema (draft 2020-12) of a bench file."""
    from acceptance.limitfile import schema

    return schema.bench_schema()


# --- reading --------------------------------------------------------------------------------------------------------


def _read(path: FilePath) -> _File:
    """A file's content, its own faults as YAML noted."""
    source = Source(on_one_line(str(path)), Tree(None))
    try:
        with path.open("rb") as stream:
            data = stream.read(MAX_BYTES + 1)
    except OSError as problem:
        reason = "it is a folder" if isinstance(problem, IsADirectoryError) else problem.strerror or "it is not there"
        source.add((0, 0), f"the file cannot be read: {reason}", "expected a readable file")
        return _File(path.name, source, "", {}, broken=True)
    if len(data) > MAX_BYTES:
        source.add((0, 0), "the file is larger than 1 MB", "expected a limits or bench file")
        return _File(path.name, source, "", {}, broken=True)
    source.tree = read_tree(data)
    for flaw in source.tree.flaws:
        source.add((flaw.line, flaw.column), flaw.found, flaw.expected)
    return _with_content(path.name, source, hashlib.sha256(data).hexdigest())


def _with_content(name: str, source: Source, sha256: str) -> _File:
    content = source.tree.plain()
    if source.tree.root is not None and not isinstance(content, dict):
        found = f"the file is a {'list' if isinstance(content, list) else 'single text'}"
        source.refuse((), found, "expected a mapping, such as acceptance: 1 and more")
        return _File(name, source, sha256, {}, broken=True)
    raw = content if isinstance(content, dict) else {}
    _drop_empty_sections(source.tree, raw)
    return _File(name, source, sha256, raw, broken=source.tree.root is None)


def _drop_empty_sections(tree: Tree, raw: dict[str, Any]) -> None:
    """Leave out what stands empty where a section may: a value that is empty remains, and is a fault."""
    paths: list[Path] = [(key,) for key in raw if key in _SECTIONS]
    paths += [("log", "columns"), ("log", "stated"), ("decision", "tolerance")]
    if isinstance(raw.get("limits"), dict):
        paths += [("limits", key) for key in raw["limits"] if key in Requirements.model_fields]
    for path in paths:
        node = tree.node(path)
        if node is not None and node.empty:
            holder = raw if len(path) == 1 else raw[str(path[0])]
            del holder[str(path[-1])]
    if isinstance(lot := raw.get("lot"), dict) and lot.get("every_unit") == "":
        lot["every_unit"] = {}


# --- validating -----------------------------------------------------------------------------------------------------


def _validated(file: _File, model: type[P], *, elsewhere: frozenset[str] = frozenset()) -> P | None:
    """The file by its model, or None with its faults noted."""
    if file.broken:
        return None
    try:
        return model.model_validate(file.raw)
    except ValidationError as error:
        add_model_faults(file.source, error, model, elsewhere=elsewhere)
        return None


def _attempt(model: type[P], raw: object) -> P | None:
    """A part of a faulty file, so far as it is whole; its faults have been noted already."""
    try:
        return model.model_validate(raw)
    except ValidationError:
        return None


def _plate(raw: Mapping[str, Any], model: LimitsFile | None) -> Plate:
    """What the ratings say; of a faulty file each of them by itself."""
    if model is not None:
        plate = model.ratings
        names, tolerance = tuple(plate.outputs), model.decision.tolerance
        return Plate(names, plate.outputs, plate.input, plate.ambient is None, tolerance)
    decision = _attempt(Decision, raw.get("decision", {}))
    tolerance_told = decision.tolerance if decision is not None else None
    ratings = raw.get("ratings")
    if not isinstance(ratings, dict):
        return Plate(tolerance=tolerance_told)
    outputs = ratings.get("outputs")
    outputs = outputs if isinstance(outputs, dict) else {}
    tried = {name: _attempt(Output, output) for name, output in outputs.items()}
    return Plate(
        outputs=tuple(outputs),
        rated={name: output for name, output in tried.items() if output is not None},
        input=_attempt(InputRating, ratings.get("input")),
        ambient_is_missing="ambient" not in ratings,
        tolerance=tolerance_told,
    )


def _requirements(raw: Mapping[str, Any], model: LimitsFile | None) -> Iterator[Placed]:
    """Every entry under limits:, in the order of the file."""
    limits = raw.get("limits")
    for characteristic, entries in limits.items() if isinstance(limits, dict) else ():
        field = Requirements.model_fields.get(characteristic)
        if field is None or not isinstance(entries, list):
            continue
        kind = field.annotation.__args__[0]  # type: ignore[union-attr]  # tuple[kind, ...]
        for i, entry in enumerate(entries):
            made = getattr(model.limits, characteristic)[i] if model is not None else _attempt(kind, entry)
            name = entry.get("name") if isinstance(entry, dict) else None
            yield Placed(("limits", characteristic, i), name if isinstance(name, str) and name else None, made)


def _bench_part(file: _File, model: BenchFile | None, plate: Plate) -> BenchPart:
    part = bench_part(file.source, model if model is not None else _salvaged(file.raw), plate.outputs)
    check_meters(file.source, part.meters, plate)
    return part


def _faults(*files: _File | None) -> list[Fault]:
    """Every fault of the files, each once."""
    return list({fault: None for file in files if file is not None for fault in file.source.faults})


def _salvaged(raw: Mapping[str, Any]) -> BenchFile:
    """The bench's part of a faulty file, without the entries that are faulty."""
    kept: dict[str, Any] = {"log": {}}
    log = raw.get("log")
    sections = [((), "instruments"), ((), "lead_resistance"), (("log",), "columns"), (("log",), "stated")]
    for around, section in sections:
        holder = log if around else raw
        entries = holder.get(section) if isinstance(holder, dict) else None
        for key, value in entries.items() if isinstance(entries, dict) else ():
            one = {section: {key: value}}
            if _attempt(BenchFile, {"log": one} if around else one) is not None:
                target = kept["log"] if around else kept
                target.setdefault(section, {})[key] = value
    return BenchFile.model_validate(kept)
