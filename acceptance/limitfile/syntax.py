"""What is wrong with a file as YAML, in words, and where the hand slipped rather than where the parser stumbled."""

from __future__ import annotations

import re
from collections.abc import Iterator

import yaml

from acceptance.limitfile.yamltree import Flaw

__all__ = ["syntax_flaw"]


# what the parser says -> what is found, what is expected; the first that fits
_FROM_ITS_START = (
    ("expected ',' or ']'", "this list is not closed", "expected commas between its values and ] at its end"),
    ("expected ',' or '}'", "this mapping is not closed", "expected commas between its entries and } at its end"),
    ("stream while scanning a quoted scalar", "a quotation mark is not closed", "expected its second mark"),
)
_NO_COLON = ("this key has no colon", "expected key: value")
_NO_SPACE = ("no space stands after this key's colon", "expected key: value")
_STRAY_COLON = "mapping values are not allowed"
_MISALIGNED = ("expected <block end>", "did not find expected key", "did not find expected '-'")
_OTHERS = (
    ("a tab character", "a tab stands here", "expected spaces"),
    ("sequence entries are not allowed", "a dash stands where no list can begin", "expected it on its own line"),
    ("undefined tag handle", "a tag stands here", "expected the value without a tag"),
    ("unknown escape character", "a backslash means nothing here", "expected single quotes round such a text"),
    ("that cannot start any token", "a text cannot begin with this character", "expected quotes round the text"),
    ("expected node content", "the file ends, or a bracket closes, before a value", "expected the value"),
    ("expected the node content", "the file ends, or a bracket closes, before a value", "expected the value"),
)
_BREAK = re.compile("\r\n|[\n\r\x85\u2028\u2029]")  # where the parser begins a new line
_COLON = re.compile(r":(?:\s|$)")
_TIGHT_COLON = re.compile(r"[^\s:#'\"\[{][^:]*:\S")
_BRACKET_WITHOUT_COLON = re.compile(r"[^\s:#'\"\[{][^:#'\"\[{]*[\[{]")
_DASH = re.compile(r"-(?:\s+|$)")
_FAR = 1_000_000  # columns: beyond every indentation of a file that is read


def syntax_flaw(error: yaml.YAMLError, text: str) -> Flaw:
    """A flaw in our words for what the parser objected to in the file's text."""
    mark, start = getattr(error, "problem_mark", None), getattr(error, "context_mark", None)
    said = f"{getattr(error, 'problem', None) or ''} {getattr(error, 'context', None) or ''}".strip()
    lines = _BREAK.split(text)
    if start is not None:
        for part, found, expected in _FROM_ITS_START:
            if part in said:
                return Flaw(start.line + 1, start.column + 1, found, expected)
        if "expected ':'" in said:
            return _lacks_colon(lines, start.line + 1)
    line, column = (mark.line + 1, mark.column + 1) if mark is not None else (1, 1)
    if _line(lines, line)[column - 1 : column] == "\t":
        said = "a tab character"
    elif _STRAY_COLON in said:
        return _stray_colon(lines, line, column)
    elif any(part in said for part in _MISALIGNED):
        return _misaligned(lines, line, column)
    elif "<document start>" in said:
        return _after_the_end(lines, line, column)
    for part, found, expected in _OTHERS:
        if part in said:
            return Flaw(line, column, found, expected)
    return Flaw(line, column, f"this is not YAML ({said or 'it cannot be read'})", "expected lines of key: value")


def _line(lines: list[str], number: int) -> str:
    """A line by its number from 1; empty beyond the end."""
    return lines[number - 1] if 1 <= number <= len(lines) else ""


def _indent(text: str) -> int:
    return len(text) - len(text.lstrip(" "))


def _above(lines: list[str], line: int) -> int:
    """The number of the next line above that is neither blank nor a comment; 0 where there is none."""
    written = (n for n in range(line - 1, 0, -1) if lines[n - 1].strip() and lines[n - 1].lstrip()[0] != "#")
    return next(written, 0)


def _lacks_colon(lines: list[str], line: int) -> Flaw:
    """A key that a line begins with, and that ends without a colon."""
    text = _line(lines, line)
    column = _key_column(text)
    return Flaw(line, column, *(_NO_SPACE if _TIGHT_COLON.match(text, column - 1) else _NO_COLON))


def _bare_bracket(before: str, line: int) -> Flaw | None:
    """A key of that line that a bracket follows without a colon between them; None where there is none."""
    column = _key_column(before)
    if not _BRACKET_WITHOUT_COLON.match(before, column - 1):
        return None
    return Flaw(line, column, _NO_COLON[0], "expected a colon before the bracket, and a space after it")


def _key_column(text: str) -> int:
    """The column, from 1, where the key of a line begins: after its dashes."""
    column = _indent(text)
    while dash := _DASH.match(text, column):
        column = dash.end()
    return column + 1


def _stray_colon(lines: list[str], line: int, column: int) -> Flaw:
    """A colon inside what has been read as a text: the text began where a colon is missing, or where indentation is."""
    before, above = _line(lines, line)[: column - 1], _above(lines, line)
    follows_a_key = above == 0 or _COLON.search(lines[above - 1]) is not None
    is_dash = _DASH.match(before, _indent(before)) is not None
    if (follows_a_key or not is_dash) and (flaw := _bare_bracket(before, line)):
        return flaw
    if above and not _COLON.search(before):
        if not follows_a_key:
            return _lacks_colon(lines, above)
        if _indent(before) > _key_column(lines[above - 1]) - 1:
            return _misaligned(lines, line, _indent(before) + 1)
    return Flaw(line, column, "a colon stands where no key can be", "expected quotes round a text with ': '")


def _after_the_end(lines: list[str], line: int, column: int) -> Flaw:
    """More content below a text or a bracket that has been read as the whole of the file."""
    above = _above(lines, line)
    if above and not _COLON.search(lines[above - 1]):
        return _lacks_colon(lines, above)
    return Flaw(line, column, "the content has ended above this line", "expected key: value from the first line on")


def _misaligned(lines: list[str], line: int, column: int) -> Flaw:
    """A line that begins at none of the columns that it could, or a text where a value has ended already."""
    here = _line(lines, line)
    if here[: column - 1].strip(" -"):
        expected = "expected nothing there, or quotes round the whole text"
        return _bare_bracket(here[: column - 1], line) or Flaw(
            line, column, "a text stands after the end of the value", expected
        )
    found, indent = "this does not line up with what is above", column - 1
    blocks = list(_blocks(lines, line))
    if same := next((n for n in blocks if _indent(lines[n - 1]) == indent), 0):
        kind = "a dash" if _DASH.match(lines[same - 1], indent) else "a key"
        return Flaw(line, column, found, f"expected {kind}, as line {same} has, or another indentation")
    is_dash = _DASH.match(here, indent) is not None
    ways = [(_indent(lines[n - 1]) if is_dash else _key_column(lines[n - 1]) - 1, n) for n in blocks]
    # no key can line up with a bracket
    ways = [(at, n) for at, n in ways if lines[n - 1][at : at + 1] not in ("{", "[")]
    deeper = min((way for way in ways if way[0] > indent), default=None)
    less = max((way for way in ways if way[0] < indent), default=None)
    words = [(f"{way[0]}", f"as line {way[1]} has") for way in (deeper, less) if way is not None]
    if not words:
        return Flaw(line, column, found, "expected the same indentation")
    told = [f"{words[0][0]} spaces before it, {words[0][1]}", *(", ".join(more) for more in words[1:])]
    return Flaw(line, column, found, f"expected {', or '.join(told)}")


def _blocks(lines: list[str], line: int) -> Iterator[int]:
    """Numbers of the lines above that open the blocks around a line, the innermost first."""
    limit = _FAR
    while limit > 0 and (line := _above(lines, line)):
        if _indent(lines[line - 1]) < limit:
            limit = _indent(lines[line - 1])
            yield line
