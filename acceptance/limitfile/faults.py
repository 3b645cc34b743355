"""Faults of one file: what the models objected to, in words and with line and column."""

from __future__ import annotations

import re
from collections.abc import Iterable, Mapping
from dataclasses import dataclass, field
from types import NoneType
from typing import Annotated, Any, Literal, get_args, get_origin

from pydantic import ValidationError, WithJsonSchema

from acceptance.errors import Fault
from acceptance.limitfile.fields import FAULT, Part
from acceptance.limitfile.yamltree import Path, Tree
from acceptance.units import quoted

__all__ = ["Source", "add_model_faults", "nearest", "on_one_line", "one_of", "unknown"]

_BRACKET = re.compile(r"[\[{]")


@dataclass(slots=True)
class Source:
    """One file while it is being checked."""

    file: str  # as faults name it
    tree: Tree
    faults: list[Fault] = field(default_factory=list)

    def refuse(self, path: Path, found: str, expected: str, *, key: bool = False) -> None:
        """Note a fault at the value of a path, or at its key."""
        self.add(self.tree.place(path, key=key), found, expected)

    def written(self, path: Path) -> str:
        """The text at a path as the file has it; "" where none is."""
        node = self.tree.node(path)
        return node.value if node is not None and isinstance(node.value, str) else ""

    def add(self, place: tuple[int, int], found: str, expected: str) -> None:
        """Note a fault at line and column; (0, 0) is the file as a whole."""
        self.faults.append(Fault(self.file, *place, on_one_line(found), on_one_line(expected)))


def on_one_line(text: str) -> str:
    """The text with everything that cannot be printed written as an escape."""
    return "".join(c if c.isprintable() else c.encode("unicode_escape").decode("ascii") for c in text)


def one_of(words: Iterable[str]) -> str:
    """The words as a choice: "a, b or c"."""
    *most, last = words
    return f"{', '.join(most)} or {last}" if most else last


def nearest(word: str, known: Iterable[str]) -> str:
    """The known word that is spelled most like another, or ""."""
    from difflib import get_close_matches  # only a faulty file needs it

    if len(word) < 3:
        return ""
    folded = {one.casefold(): one for one in known}
    return next((folded[one] for one in get_close_matches(word[:60].casefold(), folded, n=1, cutoff=0.6)), "")


def unknown(word: str, known: Iterable[str]) -> str:
    """What is expected instead of an unknown word."""
    known = list(known)
    close = nearest(word, known)
    choice = one_of(known) if known else "nothing"
    return f"expected {choice}; {close} is spelled alike" if close else f"expected {choice}"


def add_model_faults(
    source: Source, error: ValidationError, model: type[Part], *, elsewhere: Iterable[str] = ()
) -> None:
    """Note every fault that a model found.

    Parameters
    ----------
    source
        The file that was validated from its root.
    error
        What the model raised.
    model
        The model of the whole file.
    elsewhere
        Keys of the top level that belong into the limits file instead.
    """
    for found in error.errors(include_url=False, include_input=True):
        path: Path = tuple(found["loc"])
        if found["type"] == FAULT:
            for problem in found["ctx"]["problems"]:
                source.refuse(path + problem.at, problem.found, problem.expected)
        elif found["type"] == "extra_forbidden":
            _unknown_key(source, path, model, elsewhere=elsewhere)
        elif found["type"] == "missing":
            _missing_key(source, path, model)
        else:
            _unfit_value(source, path, model, value=found["input"])


def _unknown_key(source: Source, path: Path, model: type[Part], *, elsewhere: Iterable[str]) -> None:
    key = str(path[-1])
    if len(path) == 1 and key in set(elsewhere):
        source.refuse(path, f"the key {quoted(key)} stands in a bench file", "expected it in the limits file", key=True)
        return
    if bracket := _BRACKET.search(key):
        expected = f"expected a colon before the bracket: {key[: bracket.start()].strip()[:60]}: {bracket[0]}..."
        source.refuse(path, f"the key {quoted(key)} has a bracket", expected, key=True)
        return
    around = _annotation_at(model, path[:-1])
    expected = _home(model, key, path[:-1]) or unknown(key, _keys(around))
    source.refuse(path, f"the key {quoted(key)} is not known here", expected, key=True)


def _home(model: type[Part], key: str, around: Path) -> str:
    """Where a key belongs that has lost its indentation, or got one; "" where it belongs nowhere near."""
    if len(around) == 1 and key in _keys(model):
        return "expected it at the start of a line"
    sections = (name for name, inner in _fields(model).items() if _is_part(inner) and key in _keys(inner))
    section = next(sections, "") if not around else ""
    return f"expected it under {section}:, with spaces before it" if section else ""


def _missing_key(source: Source, path: Path, model: type[Part]) -> None:
    key = str(path[-1])
    around = _annotation_at(model, path[:-1])
    metadata: list[Any] = next((f.metadata for n, f in around.model_fields.items() if (f.alias or n) == key), [])
    schemas = [m.json_schema or {} for m in metadata if isinstance(m, WithJsonSchema)]
    examples = [example for schema in schemas for example in schema.get("examples", ())]
    example = examples[0] if examples else _example_of(_annotation_at(model, path))
    source.refuse(path[:-1], f"{key} is missing", f"expected {key}: {example}")


def _unfit_value(source: Source, path: Path, model: type[Part], *, value: object) -> None:
    annotation = _annotation_at(model, path)
    shown = quoted(value) if isinstance(value, str) else _kind_of(value)
    found = "no value is given" if value == "" else f"{shown} stands here"
    choices = get_args(annotation) if get_origin(annotation) is Literal else ()
    if choices and isinstance(value, str) and value:
        source.refuse(path, f"{shown} is not known here", unknown(value, choices))
    elif choices:
        source.refuse(path, found, f"expected {one_of(choices)}")
    elif get_origin(annotation) is tuple:
        source.refuse(path, found, "expected a list, each entry after a dash or within [ ]")
    elif get_origin(annotation) is dict or _is_part(annotation):
        source.refuse(path, found, f"expected a mapping, such as {_example_of(annotation)}")
    else:
        source.refuse(path, found, "expected a text")


def _kind_of(value: object) -> str:
    return "a mapping" if isinstance(value, Mapping) else "a list"


# --- from a path to what may stand there ----------------------------------------------------------------------------


def _is_part(annotation: Any) -> bool:
    return isinstance(annotation, type) and issubclass(annotation, Part)


def _annotation_at(model: type[Part], path: Path) -> Any:
    """The type that stands at a path of the file: a model, a tuple, a dict, a Literal or a plain type."""
    annotation: Any = model
    for step in path:
        if _is_part(annotation):
            annotation = _fields(annotation).get(str(step), NoneType)
        elif get_origin(annotation) in (dict, tuple):
            annotation = _bare(get_args(annotation)[1 if get_origin(annotation) is dict else 0])
        else:
            return NoneType
    return annotation


def _bare(annotation: Any) -> Any:
    """Without Annotated and without None."""
    while True:
        if get_origin(annotation) is Annotated:
            annotation = get_args(annotation)[0]
            continue
        inner = [arg for arg in get_args(annotation) if arg is not NoneType]
        if get_origin(annotation) in (dict, tuple, Literal) or len(inner) != 1:
            return annotation
        annotation = inner[0]


def _fields(model: type[Part]) -> dict[str, Any]:
    return {field.alias or name: _bare(field.annotation) for name, field in model.model_fields.items()}


def _keys(annotation: Any) -> list[str]:
    return list(_fields(annotation)) if _is_part(annotation) else []


# what to write where a key is missing or its value is of another shape
_EXAMPLES = {
    "Product": '{name: "Bench rail 24", revision: C}',
    "Ratings": "{input: {supply: ac, voltage: 230 V}, outputs: {main: {voltage: 24 V, current: 5 A}}}",
    "InputRating": "{supply: ac, voltage: 230 V}",
    "Output": "{voltage: 24 V, current: 5 A}",
    "Requirements": "{efficiency: [{at: {load: 50 %, input: 230 V}, min: 88 %}]}",
    "Conditions": "{load: 50 %, input: 230 V}",
    "Shunt": "{resistance: 1 ohm, tolerance: 0.1 %}",
    "Adc": "{bits: 16, span: [-6.144 V, 6.144 V]}",
    "Instrument": '{device: "DMM-7", accuracy: "0.05 % reading + 2 mV"}',
    "Decision": "{rule: guarded, confidence: 95 %}",
    "Tolerance": "{load: 2 %, input: 1 %}",
    "Recovery": "{within: 2 s, band: 1 %}",
    "ShortCircuit": "{max: 130 %}",
    "StoredCharge": "{capacitance: 100 uF, voltage: 400 V, bleeder: 1 Mohm}",
    "EveryUnit": "{}",
    "Attributes": "{aql: 1.0 %, level: II}",
    "Variables": "{aql: 1.0 %, level: II}",
    "ToleranceInterval": "{coverage: 99 %, confidence: 95 %}",
    "Lot": "{every_unit: {}}",
    "ColumnChoice": "{heading: ripple_mv, unit: mV}",
    "LogColumns": "{settle: 2 s}",
}


def _example_of(annotation: Any) -> str:
    """What could be written for a value of this type."""
    if _is_part(annotation):
        return _EXAMPLES.get(annotation.__name__) or f"{{{', '.join(_keys(annotation))}}}"
    if get_origin(annotation) is Literal:
        return one_of(get_args(annotation))
    if get_origin(annotation) is dict:
        inner = _example_of(_bare(get_args(annotation)[1]))
        return f"{{name: {inner}}}"
    return "a text"
