"""One hash for what is required, whatever way the file writes it."""

from __future__ import annotations

import hashlib
import json
from collections.abc import Sequence

from acceptance.limitfile.fields import Part
from acceptance.limitfile.model import Decision, Published, Ratings, Requirement
from acceptance.units import Rate

__all__ = ["requirements_sha256"]


def requirements_sha256(ratings: Ratings, decision: Decision, requirements: Sequence[Requirement]) -> str:
    """SHA-256 over ratings, decision and requirements as parsed.

    Neither notes nor the order of keys or requirements change it, nor the unit a value is written in. The
    order of the outputs matters only where a requirement names none and takes the first.
    """
    default = next(iter(ratings.outputs))
    content = {
        "acceptance": 1,
        "ratings": _dumped(ratings),
        "decision": _dumped(decision),
        "requirements": sorted((_line(entry, default) for entry in requirements), key=lambda line: str(line["name"])),
    }
    text = json.dumps(content, sort_keys=True, separators=(",", ":"), allow_nan=False)
    return hashlib.sha256(text.encode("ascii")).hexdigest()


def _line(entry: Requirement, default: str) -> dict[str, object]:
    line = {"output": default, **_dumped(entry)}
    line.pop("note", None)
    if isinstance(entry, Published):  # another version may know the set's numbers otherwise
        line["numbers"] = _numbers(entry.set_)
    return {"characteristic": entry.characteristic, **line}


def _numbers(name: str) -> str:
    from acceptance.limitfile.published import published_set  # the sets are read only where one is asked

    asked = published_set(name)
    return hashlib.sha256(repr((asked.test, asked.classes, asked.weights)).encode()).hexdigest()


def _dumped(part: Part) -> dict[str, object]:
    """A part's values by the file's keys, without what is not given.

    By hand, since a model builds its own serialiser, which takes as long as reading the file.
    """
    fields = ((field.alias or name, getattr(part, name)) for name, field in type(part).model_fields.items())
    return {key: _plain(value) for key, value in fields if value is not None}


def _plain(value: object) -> object:
    if isinstance(value, Part):
        return _dumped(value)
    if isinstance(value, Rate):
        return [value.difference, value.interval]
    if isinstance(value, dict):
        return {key: _plain(item) for key, item in value.items()}
    return value
