"""Texts that come again and again in a column of a very long log: each kept once, and a number a row."""

from __future__ import annotations

from collections.abc import Callable, Iterator, Sequence
from typing import Any, overload

import numpy as np
from numpy.typing import NDArray

__all__ = ["Words", "distinct", "each_word"]

Codes = NDArray[np.signedinteger[Any]] | NDArray[np.integer[Any]]


class Words(Sequence[str]):
    """A column of texts; `words` in the order that they were met in, `codes` which of them stands in each row."""

    __slots__ = ("codes", "words")

    def __init__(self, words: Sequence[str], codes: Codes) -> None:
        self.words = tuple(words)
        self.codes = codes

    @staticmethod
    def joined(parts: Sequence[Words]) -> Words:
        """Columns one below the other."""
        numbers: dict[str, int] = {}
        codes = []
        for part in parts:
            own = np.array([numbers.setdefault(word, len(numbers)) for word in part.words], dtype=np.int64)
            codes.append(own.astype(np.min_scalar_type(-max(1, len(numbers))))[part.codes])
        return Words(list(numbers), np.concatenate(codes) if codes else np.zeros(0, np.int8))

    def __len__(self) -> int:
        return int(self.codes.size)

    def __iter__(self) -> Iterator[str]:
        return (self.words[code] for code in self.codes.tolist())

    @overload
    def __getitem__(self, at: int) -> str: ...
    @overload
    def __getitem__(self, at: slice) -> Words: ...
    def __getitem__(self, at: int | slice) -> str | Words:
        if isinstance(at, slice):
            return Words(self.words, self.codes[at])
        return self.words[int(self.codes[at])]


def distinct(column: Sequence[str]) -> list[str]:
    """The different texts of a column, in the order that they were met in."""
    return list(column.words) if isinstance(column, Words) else list(dict.fromkeys(column))


def each_word(column: Sequence[str], function: Callable[[str], str]) -> Sequence[str]:
    """The column with a function of every text."""
    changed = {word: function(word) for word in distinct(column)}
    if not isinstance(column, Words):
        return [changed[word] for word in column]
    known = {word: number for number, word in enumerate(dict.fromkeys(changed.values()))}
    codes = np.array([known[changed[word]] for word in column.words], dtype=column.codes.dtype)
    return Words(list(known), codes[column.codes])
