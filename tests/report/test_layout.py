"""Wrapping, tables and pages: nothing is lost, nothing is too wide."""

from __future__ import annotations

import pytest
from hypothesis import given
from hypothesis import strategies as st

from acceptance.report.blocks import Stack, Text, heading, paginate
from acceptance.report.fonts import printable, string_width
from acceptance.report.style import BODY, BODY_BOLD, ROOM
from acceptance.report.table import Cell, Column, Row, Table
from acceptance.report.wrap import Run, fit, fold, wrap, wrap_runs

WORDS = st.text(alphabet=st.sampled_from("abcxyzWM.-_ Ωµ電\x07"), max_size=300)


@given(text=WORDS, width=st.floats(12.0, 400.0))
def test_wrap_loses_nothing_and_fits(text, width):
    """All characters but spaces at line ends, in lines no wider than they may be."""
    lines = wrap(text, BODY, width)

    assert "".join(lines).replace(" ", "") == printable(text).replace(" ", "")
    for line in lines:
        assert string_width(line, BODY.size) <= width + 1e-9 or len(line) == 1


@given(first=WORDS, second=WORDS, width=st.floats(20.0, 300.0))
def test_wrap_runs_keeps_pieces_apart(first, second, width):
    """Pieces of different looks stand beside one another, never on one another."""
    lines = wrap_runs([Run(first, BODY), Run(second, BODY_BOLD)], width)

    for line in lines:
        for one, other in zip(line, line[1:], strict=False):
            assert one.x + string_width(one.text, one.style.size, one.style.weight) <= other.x + 1e-6
        for piece in line:
            seen = piece.text.rstrip(" ")
            end = piece.x + string_width(seen, piece.style.size, piece.style.weight)
            assert end <= width + 1e-6 or len(seen) <= 1
    text = "".join(piece.text for line in lines for piece in line)
    assert text.replace(" ", "") == (printable(first) + printable(second)).replace(" ", "")


def test_fold_keeps_a_number_with_its_unit():
    """Line ends become spaces; 5 V does not break; controls stay to be seen."""
    assert fold(" a\n b\tc ") == "a b c"
    assert fold("at 5 V and 10 %") == "at 5\N{NO-BREAK SPACE}V and 10\N{NO-BREAK SPACE}%"
    assert fold("5 Volts, 3 samples") == "5 Volts, 3 samples"
    assert fold("a\x07b") == "a\x07b"


@given(text=st.text(max_size=120), width=st.floats(20.0, 200.0))
def test_fit_marks_what_it_leaves_out(text, width):
    """Never wider than it may be; cut only with a visible mark."""
    shown = fit(text, BODY, width)

    assert string_width(shown, BODY.size) <= width + 1e-9
    assert shown == printable(text) or "…" in shown


@given(heights=st.lists(st.integers(1, 60), min_size=1, max_size=40))
def test_pages_hold_all_lines_in_order(heights):
    """Paragraphs of any length, over as many pages as it takes, none beyond its page."""
    count = 0
    blocks = []
    for height in heights:
        words = " ".join(f"w{n:04d}" for n in range(count, count + height * 12))
        count += height * 12
        blocks.append(Text(words, BODY, width=400.0, above=5))

    pages = paginate(blocks, ROOM)

    drawn: list[str] = []
    for page in pages:
        assert page
        for placed in page:
            assert placed.down + placed.block.height <= ROOM + 1e-6
            assert isinstance(placed.block, Text)
            drawn += [word for line in placed.block._lines for piece in line for word in piece.text.split()]
    assert drawn == [f"w{n:04d}" for n in range(count)]


@given(lengths=st.lists(st.integers(0, 1200), min_size=1, max_size=60))
def test_tables_hold_all_rows_over_pages(lengths):
    """Rows of any height: broken where they must be, no line lost, the head on every part."""
    rows = [Row([f"r{n}", Cell([Run(" ".join([f"c{n}"] * length), BODY)])]) for n, length in enumerate(lengths)]
    table = Table([Column("Name", 60), Column("Text", 200)], rows)

    pages = paginate([table], ROOM)

    counted = dict.fromkeys(range(len(lengths)), 0)
    for page in pages:
        for placed in page:
            assert placed.down + placed.block.height <= ROOM + 1e-6
            assert isinstance(placed.block, Table)
            for row in placed.block._rows:
                for line in row.lines[1]:
                    for word in "".join(piece.text for piece in line).split():
                        counted[int(word[1:])] += 1
    assert counted == dict(enumerate(lengths))


def test_heading_is_not_left_alone_at_the_foot():
    """A heading goes to the next page with what it heads."""
    filler = Text(" ".join(["word"] * 100), BODY, width=100.0)
    lines = int(ROOM / BODY.leading) - 2
    first = Stack([Text("line", BODY) for _ in range(lines)])

    pages = paginate([first, heading("Next"), filler], ROOM)

    assert len(pages[0]) == 1
    assert len(pages[1]) == 2


@pytest.mark.parametrize("free", range(1, 8))
@pytest.mark.parametrize("count", range(1, 7))
def test_heading_never_ends_a_page_however_long_what_it_heads(count, free):
    """A paragraph of three lines cannot be split, and takes its heading with it."""
    filler = Stack([Text("line", BODY) for _ in range(int(ROOM / BODY.leading) - free)])
    headed = Text(" ".join(["word"] * count), BODY, width=20.0)

    pages = paginate([filler, heading("Next"), headed], ROOM)

    assert headed.height == count * BODY.leading
    assert not any(page[-1].block.keep_next for page in pages)


def test_stack_kept_together_moves_whole():
    """It is not split while it fits on a page, and is when it cannot."""
    filler = Stack([Text("line", BODY) for _ in range(40)])
    block = Stack([Text("line", BODY) for _ in range(30)], together=True)
    large = Stack([Text("line", BODY) for _ in range(100)], together=True)

    assert [len(page) for page in paginate([filler, block], ROOM)] == [1, 1]
    assert len(paginate([large], ROOM)) == 2


@pytest.mark.parametrize("count", [0, 1, 2, 3])
def test_small_tables_are_drawn_whole(count):
    """A few rows need no second page."""
    table = Table([Column("A", 100)], [Row(["x"])] * count)

    assert len(paginate([table], ROOM)) == 1
