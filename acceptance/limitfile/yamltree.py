"""YAML text to a tree of plain text values that knows where each of them stands.

Built from the parser's events, without recursion, so that nothing a file holds can exhaust the stack or the
memory. Every scalar stays the text that was written: no numbers, no dates, no truth values.
"""

from __future__ import annotations

import re
from dataclasses import dataclass, field
from typing import Any

import yaml

from acceptance.units import quoted

__all__ = ["Entry", "Flaw", "Node", "Path", "Tree", "decode", "read_tree"]

MAX_BYTES = 1_000_000
MAX_NODES = 20_000  # after aliases have been written out
MAX_DEPTH = 40

Path = tuple[str | int, ...]
Plain = str | list[Any] | dict[str, Any]

_LOADER: Any = getattr(yaml, "CSafeLoader", yaml.SafeLoader)
# three sets, since one of both ends of the alphabet takes ten times as long to compile
_CONTROL = re.compile(r"[\x00-\x08\x0b\x0c\x0e-\x1f\x7f-\x84\x86-\x9f]|[\ud800-\udfff]|[\ufffe\uffff]")
# what YAML makes of 0,21 W within brackets: 0, and another value or a key without its own
_WHOLE = re.compile(r"[+\-−]?[0-9]{1,20}")
_REST = re.compile(r"[0-9].{0,60}", re.ASCII)
_THOUSANDS = re.compile(r"[0-9]{3}(?![0-9])")
_MARKS = (
    (b"\xff\xfe\x00\x00", "UTF-32"),
    (b"\x00\x00\xfe\xff", "UTF-32"),
    (b"\xff\xfe", "UTF-16"),
    (b"\xfe\xff", "UTF-16"),
)


@dataclass(frozen=True, slots=True)
class Flaw:
    """One thing wrong with the file as YAML."""

    line: int
    column: int
    found: str
    expected: str


@dataclass(slots=True)
class Node:
    """One value of the file: a text, a list or a mapping."""

    line: int  # from 1
    column: int  # from 1
    value: str | list[Node] | dict[str, Entry]
    empty: bool = False  # nothing is written there, as after "key:"
    plain: bool = False  # a text without quotation marks
    size: int = 1  # nodes in it, itself counted
    height: int = 1  # levels in it, its own counted


@dataclass(slots=True)
class Entry:
    """One key of a mapping, and its value."""

    line: int
    column: int
    node: Node


@dataclass(slots=True)
class Tree:
    """A file's content; `root` is None where it could not be read to its end."""

    root: Node | None
    flaws: list[Flaw] = field(default_factory=list)

    def plain(self) -> Plain:
        """The content as texts, lists and dictionaries."""
        return _plain(self.root) if self.root is not None else {}

    def node(self, path: Path) -> Node | None:
        """The value at a path, or None where the file has none."""
        node = self.root
        for step in path:
            node = _child(node, step)
        return node

    def place(self, path: Path, *, key: bool = False) -> tuple[int, int]:
        """Line and column of the value at a path, or of its key; of the nearest value around it where there is none."""
        node, place = self.root, (1, 1)
        if node is not None:
            place = (node.line, node.column)
        for i, step in enumerate(path):
            held = node.value if node is not None else ""
            node = _child(node, step)
            if node is None:
                break
            place = (node.line, node.column)
            if isinstance(held, dict) and isinstance(step, str) and (node.empty or (key and i == len(path) - 1)):
                place = (held[step].line, held[step].column)
        return place


def _child(node: Node | None, step: str | int) -> Node | None:
    held = node.value if node is not None else None
    if isinstance(held, dict) and isinstance(step, str) and step in held:
        return held[step].node
    if isinstance(held, list) and isinstance(step, int) and 0 <= step < len(held):
        return held[step]
    return None


def _plain(node: Node) -> Plain:
    if isinstance(node.value, dict):
        return {key: _plain(entry.node) for key, entry in node.value.items()}
    if isinstance(node.value, list):
        return [_plain(item) for item in node.value]
    return node.value


def decode(data: bytes) -> str | Flaw:
    """The file's text, without a byte-order mark; a flaw where it is not UTF-8 text."""
    for mark, name in _MARKS:
        if data.startswith(mark):
            return Flaw(1, 1, f"the file is {name}", "expected it saved as UTF-8")
    if (nul := data.find(b"\0")) >= 0:
        line, column = _place_of(data[:nul])
        return Flaw(line, column, "a NUL byte stands here: this is no text", "expected a text file in UTF-8")
    try:
        text = data.decode("utf-8-sig")
    except UnicodeDecodeError as error:
        start = error.start + (3 if data.startswith(b"\xef\xbb\xbf") and error.start < 3 else 0)
        line, column = _place_of(data[:start])
        return Flaw(line, column, f"byte 0x{data[start]:02x} is not UTF-8", "expected the file saved as UTF-8")
    if odd := _CONTROL.search(text):
        before = text[: odd.start()]
        line, column = before.count("\n") + 1, len(before) - (before.rfind("\n") + 1) + 1
        return Flaw(line, column, f"a control character stands here: {quoted(odd[0])}", "expected text")
    return text


def _place_of(before: bytes) -> tuple[int, int]:
    last = before[before.rfind(b"\n") + 1 :].decode("utf-8-sig", "replace")
    return before.count(b"\n") + 1, len(last) + 1


def read_tree(data: bytes) -> Tree:
    """The tree of one YAML document, with everything that is wrong with it as YAML."""
    text = decode(data)
    if isinstance(text, Flaw):
        return Tree(None, [text])
    builder = _Builder()
    try:
        for event in yaml.parse(text, Loader=_LOADER):
            builder.take(event)
    except _Stop:
        pass
    except yaml.YAMLError as error:
        from acceptance.limitfile.syntax import syntax_flaw  # only a faulty file needs it

        builder.fail(syntax_flaw(error, text))
    return builder.tree()


class _Stop(Exception):  # noqa: N818 - it ends the reading, and never leaves this module
    """Nothing after this place is read."""


@dataclass(slots=True)
class _Open:
    """A list or mapping whose end has not been read yet."""

    node: Node
    anchor: str | None
    key: Node | None = None  # the key that waits for its value
    merges: bool = False  # whether that key is a merge key
    last: str = ""  # the key before it


class _Builder:
    """Takes the parser's events, one after the other."""

    def __init__(self) -> None:
        self._root: Node | None = None
        self._open: list[_Open] = []
        self._anchors: dict[str, Node | None] = {}  # None: still open
        self._flaws: list[Flaw] = []
        self._count = 0
        self._documents = 0
        self._whole = True

    def tree(self) -> Tree:
        """What has been built."""
        if self._whole and self._root is None:
            self._flaws.append(Flaw(1, 1, "the file is empty", "expected acceptance: 1 and more"))
        return Tree(self._root if self._whole else None, self._flaws)

    def fail(self, flaw: Flaw) -> None:
        """Take a flaw after which nothing can be made of the file."""
        self._flaws.append(flaw)
        self._whole = False

    def take(self, event: Any) -> None:
        """Take the next event."""
        line, column = event.start_mark.line + 1, event.start_mark.column + 1
        if isinstance(event, yaml.ScalarEvent):
            self._tag(event, line, column)
            self._scalar(event, line, column)
        elif isinstance(event, yaml.CollectionStartEvent):
            self._tag(event, line, column)
            self._start(event, line, column)
        elif isinstance(event, yaml.CollectionEndEvent):
            done = self._open.pop()
            if done.anchor is not None:
                self._anchors[done.anchor] = done.node
            self._add(done.node, line=done.node.line, column=done.node.column)
        elif isinstance(event, yaml.AliasEvent):
            self._alias(str(event.anchor), line, column)
        elif isinstance(event, yaml.DocumentStartEvent):
            self._documents += 1
            if self._documents > 1:
                self._flaws.append(Flaw(line, column, "a second document begins here", "expected one in a file"))
                raise _Stop

    def _tag(self, event: Any, line: int, column: int) -> None:
        if event.tag is not None:
            found = f"the tag {quoted(str(event.tag))} stands here"
            self._flaws.append(Flaw(line, column, found, "expected the value without a tag"))

    def _scalar(self, event: Any, line: int, column: int) -> None:
        if odd := _CONTROL.search(event.value):
            found = f"the text holds the control character {quoted(odd[0])}"
            self._flaws.append(Flaw(line, column, found, "expected text that can be printed"))
        plain = event.style is None or event.style == ""
        node = Node(line, column, event.value, empty=plain and event.value == "", plain=plain)
        if event.anchor is not None:
            self._anchors[event.anchor] = node
        self._grow(1, line, column)
        merges = event.value == "<<" and plain
        self._add(node, line=line, column=column, merges=merges)

    def _start(self, event: Any, line: int, column: int) -> None:
        mapping = isinstance(event, yaml.MappingStartEvent)
        self._grow(1, line, column)
        self._open.append(_Open(Node(line, column, {} if mapping else []), event.anchor))
        self._too_deep(0, line, column)
        if event.anchor is not None:
            self._anchors[event.anchor] = None

    def _alias(self, name: str, line: int, column: int) -> None:
        if name not in self._anchors:
            self._flaws.append(Flaw(line, column, f"nothing is anchored as &{name} above", "expected an anchor first"))
            self._whole = False
            target: Node | None = Node(line, column, "")
        else:
            target = self._anchors[name]
        if target is None:
            self.fail(Flaw(line, column, f"*{name} stands inside what it refers to", "expected the value itself"))
            raise _Stop
        self._grow(target.size, line, column)
        self._too_deep(target.height, line, column)
        self._add(target, line=line, column=column)

    def _grow(self, size: int, line: int, column: int) -> None:
        self._count += size
        if self._count > MAX_NODES:
            found = f"the file holds more than {MAX_NODES} values by here"
            self.fail(Flaw(line, column, found, "expected fewer, aliases written out"))
            raise _Stop

    def _too_deep(self, height: int, line: int, column: int) -> None:
        if len(self._open) + height > MAX_DEPTH:
            self.fail(Flaw(line, column, f"more than {MAX_DEPTH} levels lie within each other", "expected fewer"))
            raise _Stop

    def _add(self, node: Node, *, line: int, column: int, merges: bool = False) -> None:
        """Put a finished value where it belongs: into the list or mapping that is open, as item, key or value."""
        if not self._open:
            self._root = node
            return
        parent = self._open[-1]
        held = parent.node.value
        if isinstance(held, list):
            if held and _touch(held[-1], node) and self._is_comma(held[-1], node):
                return
            held.append(node)
        elif isinstance(held, dict) and parent.key is None:
            # an alias as a key stands where it is written, not where it was anchored
            parent.key = Node(line, column, node.value, node.empty, plain=node.plain)
            parent.merges = merges
            return
        elif isinstance(held, dict) and parent.key is not None and not self._entry(parent, held, node):
            return
        parent.node.size += node.size
        parent.node.height = max(parent.node.height, node.height + 1)

    def _entry(self, parent: _Open, held: dict[str, Entry], node: Node) -> bool:
        """Put a value under the key that waits for it; whether it was kept."""
        key = parent.key
        parent.key = None
        if key is None or (node.empty and parent.last in held and self._is_comma(held[parent.last].node, key)):
            return False
        text = self._key(held, key, merges=parent.merges)
        parent.last = text or ""
        if text is not None:
            held[text] = Entry(key.line, key.column, node)
        return text is not None

    def _is_comma(self, before: Node, after: Node) -> bool:
        """Whether two texts are one number with a decimal comma; it is noted, and the first one takes its place."""
        whole, rest = before.value, after.value
        if not (before.plain and after.plain and isinstance(whole, str) and isinstance(rest, str)):
            return False
        if not (_WHOLE.fullmatch(whole) and _REST.fullmatch(rest)):
            return False
        found = f"{quoted(f'{whole},{rest}')} has a decimal comma, and a limits file takes a decimal point"
        expected = f"expected {whole}.{rest}" + (f" or {whole}{rest}" if _THOUSANDS.match(rest) else "")
        expected += "" if rest.strip("0123456789") else ", or quotes round a text"
        self._flaws.append(Flaw(before.line, before.column, found, expected))
        before.value = f"{whole}.{rest}"
        return True

    def _key(self, held: dict[str, Entry], key: Node, *, merges: bool) -> str | None:
        """The text of a key, or None where its entry is dropped because of a flaw."""
        place = (key.line, key.column)
        if not isinstance(key.value, str):
            kind = "mapping" if isinstance(key.value, dict) else "list"
            self._flaws.append(Flaw(*place, f"a {kind} stands as a key", "expected a text, quoted where it has braces"))
        elif merges:
            self._flaws.append(Flaw(*place, 'the merge key "<<" stands here', "expected the keys themselves"))
        elif key.value in held:
            first = held[key.value]
            found = f"the key {quoted(key.value)} stands twice"
            place_before = f"line {first.line}, column {first.column}"
            self._flaws.append(Flaw(*place, found, f"expected it once; it is there already at {place_before}"))
        elif key.empty:
            self._flaws.append(Flaw(*place, "a value stands here without a key", "expected a key before the colon"))
        else:
            return key.value
        return None


def _touch(before: Node, after: Node) -> bool:
    """Whether a plain text ends one character before another begins."""
    end = before.column + len(before.value)
    return before.plain and before.line == after.line and end + 1 == after.column
