"""Templates: who issues the report, which parts it has, and the words of its cautions.

A template is a folder with `template.yaml` and `cautions.yaml`. Whatever it lacks, a file or a key, is taken from the
default one, which comes with the package. Everything in it is text; aliases, tags and depth beyond what is needed are
refused, so that a template can neither run anything nor grow beyond its file.
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass
from functools import lru_cache
from pathlib import Path
from typing import Any

from acceptance.errors import Fault, ReportError

__all__ = ["HAZARDS", "OPTIONAL", "SECTIONS", "Caution", "Cautions", "Issuer", "Template", "load_template"]

SECTIONS = (
    "cautions",
    "findings",
    "figures",
    "points",
    "method",
    "budgets",
    "instruments",
    "evidence",
    "doubts",
    "sign_off",
)
OPTIONAL = frozenset({"figures", "points", "budgets", "instruments"})
HAZARDS = ("mains", "stored charge", "output above 60 V", "high power output", "hot parts")

_LARGEST = 256_000  # bytes; a template is a page or two
_DEEPEST = 8


@dataclass(frozen=True, slots=True)
class Issuer:
    """Who answers for the report."""

    name: str
    address: tuple[str, ...]
    contact: str


@dataclass(frozen=True, slots=True)
class Caution:
    """One caution; `text_with_wait` where a waiting time is known, with {wait} in its place."""

    title: str
    text: str
    text_with_wait: str = ""


@dataclass(frozen=True, slots=True)
class Cautions:
    """The words of the cautions."""

    introduction: str
    general: tuple[Caution, ...]
    hazards: dict[str, Caution]


@dataclass(frozen=True, slots=True)
class Template:
    """All that a template decides."""

    title: str
    issuer: Issuer
    sections: tuple[str, ...]
    cautions: Cautions


def load_template(folder: Path | None = None) -> Template:
    """The template in a folder, completed from the default one.

    Raises
    ------
    ReportError
        If the folder is not there, or a file in it is not what a template is; names file, line and column.
    """
    default = _read_folder(_default_folder())
    if folder is None:
        return default
    if not folder.is_dir():
        msg = f"{folder}: there is no such folder; a template is a folder with template.yaml and cautions.yaml"
        raise ReportError(msg)
    return _read_folder(folder, default)


def _default_folder() -> Path:
    """In the package where it was installed, else in the checkout it runs from."""
    package = Path(__file__).resolve().parents[1]
    for folder in (package / "_data" / "templates" / "default", package.parent / "templates" / "default"):
        if folder.is_dir():
            return folder
    msg = "the default report template is missing; install the package again"
    raise ReportError(msg)


def _read_folder(folder: Path, default: Template | None = None) -> Template:
    main = _read_file(folder / "template.yaml")
    words = _read_file(folder / "cautions.yaml")
    base = default or _EMPTY
    main.only("template", "language", "title", "issuer", "sections")
    _check_head(main)
    issuer = main.part("issuer")
    return Template(
        title=main.text("title", base.title),
        issuer=_issuer(issuer, base.issuer) if issuer else base.issuer,
        sections=_sections(main, base.sections),
        cautions=_cautions(words, base.cautions),
    )


def _check_head(main: _Mapping) -> None:
    if main.text("template", "1") != "1":
        main.refuse("template", f'version "{main.text("template", "")}" of a template', "expected 1")
    if main.text("language", "en") != "en":
        main.refuse("language", f'language "{main.text("language", "")}"', "expected en, the only one there is")


def _issuer(part: _Mapping, base: Issuer) -> Issuer:
    part.only("name", "address", "contact")
    address = part.texts("address")
    return Issuer(
        name=part.text("name", base.name),
        address=base.address if address is None else tuple(address),
        contact=part.text("contact", base.contact),
    )


def _sections(main: _Mapping, base: tuple[str, ...]) -> tuple[str, ...]:
    listed = main.texts("sections")
    if listed is None:
        return base
    for name in listed:
        if name not in SECTIONS:
            main.refuse("sections", f'"{name}" is no part of a report', f"expected some of {', '.join(SECTIONS)}")
        if listed.count(name) > 1:
            main.refuse("sections", f'"{name}" stands there twice', "expected each part once")
    missing = [name for name in SECTIONS if name not in listed and name not in OPTIONAL]
    if missing:
        free = ", ".join(name for name in SECTIONS if name in OPTIONAL)
        main.refuse("sections", f'"{missing[0]}" is left out', f"only these may be left out: {free}")
    return tuple(listed)


def _cautions(words: _Mapping, base: Cautions) -> Cautions:
    words.only("introduction", "general", "hazards")
    general = words.parts("general")
    hazards = words.part("hazards")
    merged = dict(base.hazards)
    if hazards:
        hazards.only(*HAZARDS)
        for name in hazards.keys():  # noqa: SIM118 - not a dict
            part = hazards.part(name)
            if part:
                merged[name] = _caution(part, base.hazards.get(name, Caution("", "")))
    return Cautions(
        introduction=words.text("introduction", base.introduction),
        general=base.general if general is None else tuple(_caution(part, Caution("", "")) for part in general),
        hazards=merged,
    )


def _caution(part: _Mapping, base: Caution) -> Caution:
    part.only("title", "text", "text_with_wait")
    with_wait = part.text("text_with_wait", base.text_with_wait)
    if "text_with_wait" in part.keys() and "{wait}" not in with_wait:  # noqa: SIM118 - not a dict
        part.refuse("text_with_wait", "there is no {wait} in it", "expected {wait} where the waiting time goes")
    return Caution(part.text("title", base.title), part.text("text", base.text), with_wait)


_EMPTY = Template("", Issuer("", (), ""), SECTIONS, Cautions("", (), {}))


# -- YAML, as text with places


@dataclass(frozen=True, slots=True)
class _Node:
    """A scalar's text, a list, or a mapping, with its place in the file."""

    content: str | list[_Node] | dict[str, _Node]
    line: int
    column: int


class _Mapping:
    """A mapping of a template's file, asked for what it should hold."""

    def __init__(self, path: Path, node: _Node) -> None:
        self._path = path
        self._node = node
        self._entries = node.content if isinstance(node.content, dict) else {}

    def refuse(self, key: str, found: str, expected: str) -> None:
        """Refuse the value of a key."""
        node = self._entries.get(key, self._node)
        raise _fault(self._path, node.line, node.column, found, expected)

    def keys(self) -> list[str]:
        """The keys there are."""
        return list(self._entries)

    def only(self, *names: str) -> None:
        """Refuse a key that is none of these."""
        for key in self._entries:
            if key not in names:
                self.refuse(key, f'unknown key "{key}"', f"expected one of {', '.join(names)}")

    def text(self, key: str, default: str) -> str:
        """The text of a key."""
        node = self._entries.get(key)
        if node is None:
            return default
        if not isinstance(node.content, str):
            self.refuse(key, f'"{key}" is no text', "expected text")
        return str(node.content)

    def texts(self, key: str) -> list[str] | None:
        """The list of texts of a key, None without the key."""
        if key not in self._entries:
            return None
        items = self._list(key)
        if any(not isinstance(item.content, str) for item in items):
            self.refuse(key, f'"{key}" holds something that is no text', "expected a list of texts")
        return [str(item.content) for item in items]

    def part(self, key: str) -> _Mapping | None:
        """The mapping of a key, None without the key."""
        node = self._entries.get(key)
        if node is None:
            return None
        if not isinstance(node.content, dict):
            self.refuse(key, f'"{key}" is no mapping', "expected keys with values")
        return _Mapping(self._path, node)

    def parts(self, key: str) -> list[_Mapping] | None:
        """The list of mappings of a key, None without the key."""
        if key not in self._entries:
            return None
        items = self._list(key)
        if any(not isinstance(item.content, dict) for item in items):
            self.refuse(key, f'"{key}" holds something that is no mapping', "expected a list of title and text")
        return [_Mapping(self._path, item) for item in items]

    def _list(self, key: str) -> list[_Node]:
        content = self._entries[key].content
        if not isinstance(content, list):
            self.refuse(key, f'"{key}" is no list', "expected a list")
        return content if isinstance(content, list) else []


def _fault(path: Path, line: int, column: int, found: str, expected: str) -> ReportError:
    return ReportError(str(Fault(str(path), line, column, found, expected)))


def _read_file(path: Path) -> _Mapping:
    """The mapping in a file; an empty one where there is no file."""
    try:
        content = path.read_bytes()
    except FileNotFoundError:
        return _Mapping(path, _Node({}, 0, 0))
    except OSError as problem:
        raise _fault(path, 0, 0, f"it cannot be read ({problem.strerror})", "expected a template's file") from problem
    if len(content) > _LARGEST:
        raise _fault(path, 0, 0, f"it has {len(content)} bytes", f"expected at most {_LARGEST}")
    try:
        node = _parse(path, content.decode("utf-8-sig"))
    except UnicodeDecodeError as problem:
        raise _fault(path, 0, 0, "it is not UTF-8", "save it as UTF-8") from problem
    if not isinstance(node.content, dict):
        raise _fault(path, node.line, node.column, "no keys stand at its top", "expected keys with values")
    return _Mapping(path, node)


@lru_cache(maxsize=16)
def _parse(path: Path, text: str) -> _Node:
    """The tree of a file, every scalar as it is written."""
    import yaml

    # without the C library the slower reader does the same
    loader = getattr(yaml, "CSafeLoader", yaml.SafeLoader)
    try:
        events = yaml.parse(text, Loader=loader)
        for event in events:
            if not isinstance(event, (yaml.StreamStartEvent, yaml.DocumentStartEvent)):
                break
        else:
            return _Node({}, 0, 0)
        if isinstance(event, yaml.StreamEndEvent):
            return _Node({}, 0, 0)
        return _tree(path, event, events, 0)
    except yaml.MarkedYAMLError as problem:
        mark = problem.problem_mark or problem.context_mark
        line, column = (mark.line + 1, mark.column + 1) if mark else (0, 0)
        raise _fault(path, line, column, f"this is not YAML: {problem.problem}", "") from problem
    except yaml.YAMLError as problem:
        raise _fault(path, 0, 0, "this is not YAML: a character that may not stand in it", "") from problem


def _tree(path: Path, event: Any, events: Iterator[Any], depth: int) -> _Node:
    import yaml

    line, column = event.start_mark.line + 1, event.start_mark.column + 1
    if depth > _DEEPEST:
        raise _fault(path, line, column, "this is nested too deeply", f"expected at most {_DEEPEST} levels")
    if isinstance(event, yaml.ScalarEvent):
        return _Node(event.value, line, column)
    if isinstance(event, yaml.SequenceStartEvent):
        items: list[_Node] = []
        while not isinstance(event := next(events), yaml.SequenceEndEvent):
            items.append(_tree(path, event, events, depth + 1))
        return _Node(items, line, column)
    if isinstance(event, yaml.MappingStartEvent):
        entries: dict[str, _Node] = {}
        while not isinstance(event := next(events), yaml.MappingEndEvent):
            key = _tree(path, event, events, depth + 1)
            if not isinstance(key.content, str):
                raise _fault(path, key.line, key.column, "a key is no text", "expected text")
            if key.content in entries:
                raise _fault(
                    path, key.line, key.column, f'the key "{key.content}" stands there twice', "expected it once"
                )
            entries[key.content] = _tree(path, next(events), events, depth + 1)
        return _Node(entries, line, column)
    raise _fault(path, line, column, "an alias (*name) is not taken here", "write the text out")
