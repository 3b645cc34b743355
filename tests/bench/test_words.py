"""Texts kept once are the texts of every row."""

from __future__ import annotations

import numpy as np
from hypothesis import given
from hypothesis import strategies as st

from acceptance.bench.words import Words, distinct, each_word

COLUMNS = st.lists(st.sampled_from(["steady", "Steady", "", "cold", "thermal"]), max_size=30)


def words_of(column):
    words = list(dict.fromkeys(column))
    return Words(words, np.array([words.index(text) for text in column], dtype=np.int8))


@given(COLUMNS, st.integers(0, 30), st.integers(0, 30))
def test_words_are_like_the_list_of_texts(column, first, stop):
    words = words_of(column)

    assert list(words) == column
    assert len(words) == len(column)
    assert [words[row] for row in range(len(column))] == column
    assert list(words[first:stop]) == column[first:stop]
    assert distinct(words) == distinct(column)


@given(st.lists(COLUMNS, max_size=4))
def test_words_joined_are_one_below_the_other(columns):
    whole = [text for column in columns for text in column]

    joined = Words.joined([words_of(column) for column in columns])

    assert list(joined) == whole
    assert distinct(joined) == distinct(whole)


@given(COLUMNS)
def test_each_word_gives_what_the_function_gives_in_every_row(column):
    """Two texts that become one are one."""
    changed = each_word(words_of(column), str.lower)

    assert list(changed) == each_word(column, str.lower) == [text.lower() for text in column]
    assert distinct(changed) == distinct([text.lower() for text in column])


def test_words_of_many_texts_keep_them_apart():
    """More than fit into one byte."""
    parts = [[f"word {number}" for number in range(first, first + 100)] for first in range(0, 400, 100)]

    assert list(Words.joined([words_of(part) for part in parts])) == [text for part in parts for text in part]
