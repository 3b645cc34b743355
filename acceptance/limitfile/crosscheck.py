"""What the requirements of a limits file must agree on with the ratings and with each other."""

from __future__ import annotations

import re
from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass
from typing import Any

from acceptance.limitfile.faults import Source, unknown
from acceptance.limitfile.insulation import CLASSES, insulation_class
from acceptance.limitfile.model import (
    Efficiency,
    InputRating,
    LineRegulation,
    LoadRegulation,
    Overcurrent,
    Published,
    Requirement,
    Temperature,
)
from acceptance.limitfile.ratings import Plate, check_rated
from acceptance.limitfile.yamltree import Path
from acceptance.units import quoted

__all__ = ["Placed", "check_outputs", "check_requirements", "named"]

NAME = re.compile(r"[^\W_](?:[\w .+-]*[\w.+-])?")
OUTPUT_NAME = re.compile(r"[\w+-](?:[\w .+-]*[\w.+-])?")
RESERVED = "calibration."  # findings about instruments past their date are called so
_SEVERAL = frozenset({Overcurrent.characteristic, Published.characteristic})  # these give several findings each
RANGE_SLACK = 0.01  # an input voltage is met within 1 %, so it may lie that far outside


@dataclass(frozen=True, slots=True)
class Placed:
    """One entry under limits:, and where it stands in the file."""

    path: Path  # ("limits", characteristic, index)
    written_name: str | None
    entry: Requirement | None  # None where it has faults of its own

    @property
    def name(self) -> str:
        """Its own name, or <characteristic>-<n>."""
        return self.written_name or f"{self.path[1]}-{int(self.path[2]) + 1}"

    @property
    def name_path(self) -> Path:
        """Where the name stands; the whole entry where it has none."""
        return (*self.path, "name") if self.written_name is not None else self.path


def named(requirements: Sequence[Placed]) -> list[Requirement]:
    """The requirements, each with a name of its own."""
    return [placed.entry.model_copy(update={"name": placed.name}) for placed in requirements if placed.entry]


def check_outputs(source: Source, outputs: Sequence[str]) -> None:
    """Note outputs whose names could not stand in a heading."""
    for name in outputs:
        if not OUTPUT_NAME.fullmatch(name):
            expected = "expected letters, digits, space and . + - _, such as main"
            source.refuse(("ratings", "outputs", name), f"the output is called {quoted(name)}", expected, key=True)


def check_requirements(source: Source, requirements: Sequence[Placed], plate: Plate) -> None:
    """Note every name, output, load, input voltage and limit that does not fit."""
    _check_names(source, requirements)
    for placed in requirements:
        path, entry = placed.path, placed.entry
        if entry is None:
            continue
        if plate.outputs:
            _check_output(source, path, entry, outputs=plate.outputs)
        _check_inputs(source, path, entry, rating=plate.input)
        check_rated(source, path, entry, plate)
        if isinstance(entry, Published):
            _check_published(source, path, entry, plate)
        _check_class(source, path, entry)
        if plate.ambient_is_missing and isinstance(entry, Temperature) and entry.adjust == "rated ambient":
            expected = "expected ambient: under ratings:, such as ambient: 40 °C"
            source.refuse((*path, "adjust"), "no rated ambient is given to adjust to", expected)


def _check_class(source: Source, path: Path, entry: Requirement) -> None:
    """Note an insulation class that no table knows."""
    if isinstance(entry, Temperature) and entry.class_ is not None and insulation_class(entry.class_) is None:
        known = ", ".join(
            f"{one.name} ({one.temperature:g} °C)" if one.name.isalpha() else one.name for one in CLASSES.values()
        )
        expected = f"expected one of {known}, or max:"
        source.refuse((*path, "class"), f"{quoted(entry.class_)} is no insulation class", expected)


def _check_names(source: Source, requirements: Sequence[Placed]) -> None:
    first: dict[str, Placed] = {}
    for placed in sorted(requirements, key=lambda placed: source.tree.place(placed.name_path)):
        name = placed.name
        if not NAME.fullmatch(name):
            expected = "expected a letter or digit, then letters, digits, space and . + - _"
            source.refuse(placed.name_path, f"the name {quoted(name)} has characters that do not fit", expected)
        elif name.startswith(RESERVED):
            expected = "expected another; findings about calibration are called so"
            source.refuse(placed.name_path, f"the name {quoted(name)} begins with {RESERVED}", expected)
        if name in first:
            line, column = source.tree.place(first[name].name_path)
            expected = f"expected a name of its own; line {line}, column {column} has this one"
            source.refuse(placed.name_path, f"the name {quoted(name)} is used twice", expected)
        first.setdefault(name, placed)
    # one requirement with several findings calls them <name>.<what>
    several = {p.name for p in requirements if p.path[1] in _SEVERAL}
    for name, placed in first.items():
        heads = (name[: dot.start()] for dot in re.finditer(r"\.", name))
        if owner := next((head for head in heads if head in several), None):
            expected = f"expected another name; findings of {quoted(owner)} are called so"
            source.refuse(placed.name_path, f"the name {quoted(name)} begins with {quoted(owner + '.')}", expected)


def _check_output(source: Source, path: Path, entry: Requirement, *, outputs: Sequence[str]) -> None:
    if entry.output is not None and entry.output not in outputs:
        source.refuse((*path, "output"), f"{quoted(entry.output)} is no output", unknown(entry.output, outputs))
    loads = _loads(entry)
    for name in loads:
        if name not in outputs:
            source.refuse((*path, "at", "load", name), f"{quoted(name)} is no output", unknown(name, outputs), key=True)
    own = entry.output or outputs[0]
    if isinstance(entry, LoadRegulation):
        _check_other_loads(source, path, loads, own=own, outputs=outputs)
        return
    needed = outputs if isinstance(entry, Efficiency) else [own]
    if loads and (missing := [name for name in needed if name not in loads]):
        found = f"no load is given for {' and '.join(missing)}"
        source.refuse((*path, "at", "load"), found, f'expected one, such as {missing[0]}: 50 %, or "any"')


def _check_other_loads(
    source: Source, path: Path, loads: Mapping[str, Any], *, own: str, outputs: Sequence[str]
) -> None:
    """A sweep of one output says what the others carry meanwhile: it matters to the output that is swept."""
    if own in loads:
        expected = "expected from: and to: for it, and under at: only the other outputs"
        source.refuse((*path, "at", "load", own), f"load_regulation sweeps {quoted(own)} itself", expected, key=True)
    if own in outputs and (missing := [name for name in outputs if name != own and name not in loads]):
        example = ", ".join(f"{name}: 50 %" for name in missing)
        found = f"no load is given for {' and '.join(missing)}"
        source.refuse((*path, "at", "load"), found, f'expected it under at:, such as load: {{{example}}}, or "any"')


def _check_published(source: Source, path: Path, entry: Published, plate: Plate) -> None:
    from acceptance.limitfile.setcheck import check_set  # the sets are read only where one is asked

    check_set(source, path, entry, plate)


def _loads(entry: Requirement) -> Mapping[str, Any]:
    """The loads by output, where they are given so."""
    at = getattr(entry, "at", None)
    loads = at.load if at is not None else None
    return loads if isinstance(loads, dict) else {}


def _check_inputs(source: Source, path: Path, entry: Requirement, *, rating: InputRating | None) -> None:
    if rating is None or rating.range is None:
        return
    low, high = rating.range
    for below, volts in _inputs(entry):
        if not low * (1 - RANGE_SLACK) <= volts <= high * (1 + RANGE_SLACK):
            expected = f"expected {low:g} V to {high:g} V"
            source.refuse((*path, *below), f"input {volts:g} V lies outside the rated range", expected)


def _inputs(entry: Requirement) -> Iterator[tuple[Path, float]]:
    """Every input voltage that a requirement asks for, and where it says so."""
    at = getattr(entry, "at", None)
    if at is not None and isinstance(at.input, float):
        yield ("at", "input"), at.input
    if isinstance(entry, LineRegulation):
        yield ("from",), entry.from_
        yield ("to",), entry.to
