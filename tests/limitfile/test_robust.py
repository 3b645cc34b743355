"""Whatever a file holds: it loads, or every fault of it is told in this project's words."""

from __future__ import annotations

import copy
import re
from pathlib import Path

import pytest
import yaml
from hypothesis import given, settings
from hypothesis import strategies as st

from acceptance.errors import LimitsError
from acceptance.limitfile.limits import Limits
from acceptance.limitfile.load import load_limits
from acceptance.limitfile.yamltree import read_tree

DATA = Path(__file__).parent / "data"
TREE = read_tree((DATA / "good.yaml").read_bytes()).plain()
DUMPER = getattr(yaml, "CSafeDumper", yaml.SafeDumper)
# words of the libraries behind, and of Python
FOREIGN = re.compile(
    r"Input should|pydantic|type=|field required|validation error|Extra inputs|\bNone\b|object at 0x|<class|"
    r"Traceback|dict\b|\bstr\b|\bfloat\b|\bint\b|tuple|NoneType|\bloc\b|ctx|custom error"
)


@pytest.fixture(scope="module")
def outcome(tmp_path_factory):
    """A function: content -> what was loaded, or the faults; each fault being one line with a place in the file."""
    path = tmp_path_factory.mktemp("robust") / "limits.yaml"
    bench = path.with_name("bench.yaml")
    bench.write_bytes((DATA / "bench.yaml").read_bytes())

    def load(content: bytes, *, with_bench: bool = False) -> Limits | tuple:
        path.write_bytes(content)
        try:
            return load_limits(path, bench if with_bench else None)
        except LimitsError as error:
            faults = error.faults
        text = content.decode("utf-8", "replace")
        lines = 2 + sum(text.count(mark) for mark in "\n\r\x85\u2028\u2029")
        assert len(faults) == len(set(faults)) > 0
        for fault in faults:
            assert str(fault).isprintable()
            assert fault.found
            assert fault.expected
            assert 1 <= fault.line <= lines
            assert fault.column >= 1
        return faults

    return load


def paths(content, path=()):
    """Every path of a tree."""
    yield path
    children = content.items() if isinstance(content, dict) else enumerate(content) if isinstance(content, list) else ()
    for step, value in children:
        yield from paths(value, (*path, step))


PATHS = [path for path in paths(TREE) if path]
KEYS = sorted({str(step) for path in PATHS for step in path})
SCALARS = sorted({
    "", " ", "any", "5", "-1", "0", "1", "24 V", "5 A", "50 %", "110 %", "-3 %", "1e999 V", "1e-999 V", "nan", "inf %",
    "0,5 V", "x" * 300, "{braces}", "{0} {} %s", "a\nb", "é ü °C", "=1+1", "../../x", "<img src=x>", "\u2028", "\u202e",
    "1 K/30 min", "2027-03-01", "9" * 5000, "16", "99999999", "auto", "main", "aux", "0.1 % reading", "2 digits",
    "12 ohm ± 1 ohm", "± V", "true", "null", "~", "!!str", "&a", "*a", "<<", "100 K", "-300 °C", "dc", "I",
})  # fmt: skip
VALUES = st.recursive(
    st.sampled_from(SCALARS) | st.text(max_size=12),
    lambda inner: (
        st.lists(inner, max_size=3) | st.dictionaries(st.sampled_from(KEYS) | st.text(max_size=6), inner, max_size=3)
    ),
    max_leaves=6,
)


@st.composite
def mutations(draw):
    """The good tree with one to five places replaced, removed, renamed or added."""
    tree = copy.deepcopy(TREE)
    for _ in range(draw(st.integers(1, 5))):
        path = draw(st.sampled_from(PATHS))
        holder = tree
        try:
            for step in path[:-1]:
                holder = holder[step]
            holder[path[-1]]
        except (KeyError, IndexError, TypeError):
            continue
        if not isinstance(holder, dict | list):
            continue
        act = draw(st.sampled_from(["replace", "remove", "rename", "add"]))
        if act == "replace":
            holder[path[-1]] = draw(VALUES)
        elif act == "remove":
            del holder[path[-1]]
        elif isinstance(holder, list):
            holder.append(draw(VALUES))
        elif act == "rename":
            holder[draw(st.sampled_from(KEYS))] = holder.pop(path[-1])
        else:
            holder[draw(st.sampled_from(KEYS) | st.text(max_size=6))] = draw(VALUES)
    return tree


def printed(tree) -> bytes:
    """A tree as YAML text; characters that YAML writes as escapes included."""
    return yaml.dump(tree, Dumper=DUMPER, allow_unicode=True, sort_keys=False).encode()


@settings(max_examples=250, deadline=None)
@given(tree=mutations(), with_bench=st.booleans())
def test_load_limits_gives_limits_or_faults_of_any_mutation(outcome, tree, with_bench):
    """Never another error, never a library's words, and every fault has its place."""
    found = outcome(printed(tree), with_bench=with_bench)

    if isinstance(found, Limits):
        assert found.requirements
        assert len({r.name for r in found.requirements}) == len(found.requirements)
    else:
        words = " ".join(re.sub(r'"[^"]*"', "", f.found + f.expected) for f in found)
        assert not FOREIGN.search(words), words


@settings(max_examples=250, deadline=None)
@given(text=st.text(alphabet="ab1:-[]{}#&*!|>'\"%@`\n\t ,?~<=0.\\\r\u2028é", max_size=60))
def test_load_limits_gives_faults_of_any_text_like_yaml(outcome, text):
    """The marks of the format in any order."""
    assert outcome(text.encode())


@settings(max_examples=200, deadline=None)
@given(data=st.binary(max_size=60) | st.text(max_size=60).map(str.encode))
def test_load_limits_gives_faults_of_any_bytes(outcome, data):
    """No text at all."""
    assert outcome(data)


@settings(max_examples=150, deadline=None)
@given(
    place=st.integers(0, 3500),
    junk=st.text(alphabet="ab1:-[]{}#&*!|>'\"%@\n\t ,?", min_size=1, max_size=4),
    cut=st.booleans(),
)
def test_load_limits_survives_a_slip_of_the_hand(outcome, place, junk, cut):
    """Some characters too many anywhere in a good file, or the file cut there."""
    text = (DATA / "good.yaml").read_text(encoding="utf-8")

    outcome((text[:place] + junk + ("" if cut else text[place:])).encode())


@pytest.mark.parametrize("path", PATHS, ids=[".".join(map(str, path)) for path in PATHS])
def test_every_value_replaced_by_another_shape_is_a_fault_at_its_place(outcome, path):
    """A list of lists in place of each value in turn: a fault, and one of them points at it or into it."""
    tree = copy.deepcopy(TREE)
    holder = tree
    for step in path[:-1]:
        holder = holder[step]
    holder[path[-1]] = [["odd"]]
    content = printed(tree)

    found = outcome(content)

    assert isinstance(found, tuple)
    lines = content.decode().split("\n")
    start, _ = read_tree(content).place(path)
    assert any(start <= fault.line <= start + 2 for fault in found), (found, lines[start - 1])
    assert not FOREIGN.search(" ".join(f.found + f.expected for f in found))
