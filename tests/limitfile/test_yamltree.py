"""YAML to a tree with places: encodings, syntax, and files made to exhaust whoever reads them."""

from __future__ import annotations

import time

import pytest
import yaml

from acceptance.limitfile import yamltree
from acceptance.limitfile.yamltree import Flaw, decode, read_tree


def flaws(text: str | bytes) -> list[tuple[int, int, str]]:
    """What is wrong, with line and column."""
    tree = read_tree(text if isinstance(text, bytes) else text.encode())
    return [(flaw.line, flaw.column, flaw.found) for flaw in tree.flaws]


@pytest.fixture(params=["CSafeLoader", "SafeLoader"], autouse=True)
def loader(request, monkeypatch):
    """Every test with the fast parser and with the one in pure Python."""
    if not hasattr(yaml, request.param):
        pytest.skip("this PyYAML has no fast parser")
    monkeypatch.setattr(yamltree, "_LOADER", getattr(yaml, request.param))


def test_read_tree_keeps_texts():
    """Every scalar is what was written."""
    tree = read_tree(
        b"a: 1.10\nb: [007, no, 12:30, ~, 0x1F]\nc: {d: 'x', e: \"y\\u00e9\", f: }\ng: |\n  two\n  lines\n"
    )

    assert tree.flaws == []
    assert tree.plain() == {
        "a": "1.10",
        "b": ["007", "no", "12:30", "~", "0x1F"],
        "c": {"d": "x", "e": "yé", "f": ""},
        "g": "two\nlines\n",
    }


def test_place_is_that_of_value_and_key():
    """Lines and columns from 1, counted in characters."""
    tree = read_tree("é: {b: [x, {c: d}]}\n".encode())

    assert tree.place(("é", "b", 1, "c")) == (1, 16)
    assert tree.place(("é", "b", 1, "c"), key=True) == (1, 13)
    assert tree.place(("é", "b", 0)) == (1, 9)
    assert tree.place(("é", "none", "deeper")) == (1, 4)
    assert tree.place(()) == (1, 1)


def test_place_of_an_empty_value_is_its_key():
    """Where nothing is written there is nothing to point at."""
    assert read_tree(b"a:\n  b:\n\n\n").place(("a", "b")) == (2, 3)


def test_place_of_an_alias_is_where_the_value_is_written():
    """There it can be put right."""
    tree = read_tree(b"a: &x {b: 1}\nc: *x\n")

    assert tree.plain() == {"a": {"b": "1"}, "c": {"b": "1"}}
    assert tree.place(("c", "b")) == (1, 11)


@pytest.mark.parametrize(
    ("text", "expected"),
    [
        ("a: [1, 2", [(1, 4, "this list is not closed")]),
        ("a: {b: 1\nc: 2\n", [(1, 4, "this mapping is not closed")]),
        ("a: b: c", [(1, 5, "a colon stands where no key can be")]),
        ("a:\n\t- x", [(2, 1, "a tab stands here")]),
        ("a: 'x\n\n", [(1, 4, "a quotation mark is not closed")]),
        ("a:\n  b: 1\n c: 2", [(3, 2, "this does not line up with what is above")]),
        ("a: @x", [(1, 4, "a text cannot begin with this character")]),
        ("a: !x 1", [(1, 4, 'the tag "!x" stands here')]),
        ("a: !foo!bar 1", [(1, 4, "a tag stands here")]),
        ("!x {a: 1}", [(1, 1, 'the tag "!x" stands here')]),
        (
            "a: !!python/object/apply:os.system [id]",
            [(1, 4, 'the tag "tag:yaml.org,2002:python/object/apply:os.system" stands here')],
        ),
        ("a: 1\nb: 2\na: 3\na: 4\n", [(3, 1, 'the key "a" stands twice'), (4, 1, 'the key "a" stands twice')]),
        ('a: 1\n"a": 3\n', [(2, 1, 'the key "a" stands twice')]),
        ("x: &x {a: 1}\ny:\n  <<: *x\n", [(3, 3, 'the merge key "<<" stands here')]),
        ("? [a]\n: 1\n? {b: c}\n: 2\n", [(1, 3, "a list stands as a key"), (3, 3, "a mapping stands as a key")]),
        ("?\n: 1\n", [(1, 2, "a value stands here without a key")]),
        ("a: 1\n---\nb: 2\n", [(2, 1, "a second document begins here")]),
        ("a: *b", [(1, 4, "nothing is anchored as &b above")]),
        ("a: &a [*a]", [(1, 8, "*a stands inside what it refers to")]),
        ("a: &a {b: {c: *a}}", [(1, 15, "*a stands inside what it refers to")]),
        ("a: &x 1\nb: &x 2\nc: *x\n", []),
        ("---\na: 1\n...\n", []),
        ("%YAML 1.1\n---\na: 1\n", []),
        ("'<<': 1\n", []),
    ],
)
def test_read_tree_says_what_is_wrong(text, expected):
    """The same in both parsers."""
    assert flaws(text) == expected


def test_read_tree_has_words_for_everything():
    """What the table of words does not know is told as the parser says it, on one line."""
    for text in (
        "a: |x\n",
        "%FOO bar\n",
        "%YAML 3.0\n---\n",
        "&a &b c",
        "a: >0\n",
        "}",
        ",",
        "a: [,]",
        "?\n- ]",
        '"\\ud800"',
    ):
        for flaw in read_tree(text.encode()).flaws:
            assert flaw.found
            assert "\n" not in flaw.found + flaw.expected


@pytest.mark.parametrize(
    ("data", "flaw"),
    [
        ("a: 1".encode("utf-16"), Flaw(1, 1, "the file is UTF-16", "expected it saved as UTF-8")),
        (
            "a: 1".encode("utf-16-be"),
            Flaw(1, 1, "a NUL byte stands here: this is no text", "expected a text file in UTF-8"),
        ),
        ("a: 1".encode("utf-32"), Flaw(1, 1, "the file is UTF-32", "expected it saved as UTF-8")),
        (b"a: 1\nb: \x00", Flaw(2, 4, "a NUL byte stands here: this is no text", "expected a text file in UTF-8")),
        ("a: 1\nbé: ü\n".encode("latin-1"), Flaw(2, 2, "byte 0xe9 is not UTF-8", "expected the file saved as UTF-8")),
        (b"\xef\xbb\xbf\xe9", Flaw(1, 1, "byte 0xe9 is not UTF-8", "expected the file saved as UTF-8")),
        (b"\x89PNG\r\n\x1a\n", Flaw(1, 1, "byte 0x89 is not UTF-8", "expected the file saved as UTF-8")),
        (b"a: 1\n\x1b[31m", Flaw(2, 1, 'a control character stands here: "\\x1b"', "expected text")),
    ],
)
def test_decode_refuses_what_is_no_utf8_text(data, flaw):
    """In words that help: the encoding, the byte, its place."""
    assert decode(data) == flaw


def test_decode_takes_a_byte_order_mark():
    """It is no part of the first key, nor of its column."""
    tree = read_tree(b"\xef\xbb\xbfa: {b: c}\r\nd: e\r\n")

    assert tree.plain() == {"a": {"b": "c"}, "d": "e"}
    assert tree.place(("a", "b")) == (1, 8)


BOMBS = {
    "laughs": "a: &a [x,x,x,x,x,x,x,x,x]\n"
    + "".join(f"{c}: &{c} [{','.join([f'*{b}'] * 9)}]\n" for b, c in zip("abcdefghi", "bcdefghij", strict=True)),
    "quadratic": "a: &a [" + "x," * 2000 + "]\n" + "b: [" + "*a," * 2000 + "]\n",
    "lists": "[" * 400_000,
    "mappings": "{a: " * 200_000,
    "dashes": "- " * 400_000,
    "questions": "? " * 400_000,
    "anchors": "&a " * 300_000,
    "tags": "!a " * 300_000,
    "deep aliases": "a0: &a0 [x]\n" + "".join(f"a{i}: &a{i} [*a{i - 1}]\n" for i in range(1, 200)),
    "many keys": "".join(f"k{i}: v\n" for i in range(70_000)),
    "long text": "a: " + "x" * 900_000,
    "long key": "x" * 900_000 + ": a",
    "colons": ":" * 900_000,
    "quotes": "'" * 900_000,
    "comments": "#\n" * 450_000,
    "blanks": " \n" * 450_000 + "a: 1",
    "accuracy": "instruments: {ripple: {device: a, accuracy: '" + " " * 500_000 + "k'}}",
}


@pytest.mark.parametrize("name", BOMBS)
def test_load_limits_ends_soon_whatever_the_file(faults_of, name):
    """A megabyte made to be slow is refused within seconds, in few short lines."""
    if (
        name in ("comments", "blanks", "long text", "long key", "quotes", "accuracy")
        and yamltree._LOADER is yaml.SafeLoader
    ):
        pytest.skip("long, not nasty: the parser in pure Python takes its time")
    start = time.perf_counter()

    faults = faults_of(BOMBS[name])

    assert time.perf_counter() - start < 8
    assert faults
    assert all(len(str(fault)) < 1000 for fault in faults)


def test_read_tree_caps_expanded_values_and_depth():
    """Where it stops it says so, and gives no tree."""
    laughs, deep = read_tree(BOMBS["laughs"].encode()), read_tree(("[" * 50 + "]" * 50).encode())

    assert [flaw.found for flaw in laughs.flaws] == ["the file holds more than 20000 values by here"]
    assert [(flaw.column, flaw.found) for flaw in deep.flaws] == [(41, "more than 40 levels lie within each other")]
    assert laughs.root is None
    assert read_tree(("[" * 40 + "]" * 40).encode()).flaws == []
