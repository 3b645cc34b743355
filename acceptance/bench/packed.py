"""Columns of very long logs, kept small and exact: decimal readings as the whole numbers that they were written as.

"12.034" is 12034 thousandths. A float64 is what 12034 / 1000 gives, to the last bit: both are rounded correctly
from the same decimal number. So a block of readings keeps its whole numbers in as few bytes as their range needs,
and gives the floats anew whenever somebody looks. What is no such decimal number stays a float64.
"""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import dataclass, replace
from itertools import pairwise
from typing import Any, overload

import numpy as np
from numpy.typing import NDArray

__all__ = ["Block", "Packed", "append", "extent_of", "pack", "pack_whole", "whole_run"]

Floats = NDArray[np.float64]

_MORE_DECIMALS = 2  # tried beyond those expected, before a block stays floats
_LARGEST = 2.0**53  # up to it a float64 holds every whole number
_TOGETHER = 12  # blocks that are merged into one
_CODES = ((np.uint8, 0xFF), (np.uint16, 0xFFFF), (np.uint32, 0xFFFF_FFFF))  # the largest code of each is a hole


@dataclass(frozen=True, slots=True)
class Block:
    """A stretch of one column: value = (base + code) / divisor * factor + offset."""

    size: int
    codes: NDArray[Any] | None  # whole numbers from 0; floats, which are the values before the factor; None: a run
    base: int = 0
    step: int = 0  # of a run: code i is i * step
    divisor: float = 1.0
    has_holes: bool = False  # whether the largest code (or NaN) stands for readings that are missing
    factor: float = 1.0
    offset: float = 0.0

    def into(self, out: Floats, first: int, stop: int) -> None:
        """Write the values of rows first to stop - 1."""
        if self.codes is None:
            np.divide(self.base + self.step * np.arange(first, stop), self.divisor, out=out)
        elif self.codes.dtype.kind == "f":
            out[:] = self.codes[first:stop]
        else:
            codes = self.codes[first:stop]
            np.add(codes, np.float64(self.base), out=out)
            if self.divisor != 1.0:
                np.divide(out, self.divisor, out=out)
            if self.has_holes:
                out[codes == np.iinfo(codes.dtype).max] = np.nan
        if self.factor != 1.0 or self.offset != 0.0:
            np.multiply(out, self.factor, out=out)
            np.add(out, self.offset, out=out)


class Packed:
    """A column of readings in blocks; wherever an array of float64 is wanted, it gives one."""

    __slots__ = ("_edges", "blocks", "is_whole")

    def __init__(self, blocks: Sequence[Block], *, is_whole: bool = False) -> None:
        self.blocks = tuple(blocks)
        self.is_whole = is_whole  # whether its values are whole numbers, such as lines
        self._edges = np.concatenate(([0], np.cumsum([block.size for block in self.blocks], dtype=np.int64)))

    @staticmethod
    def of(values: NDArray[Any] | Packed) -> Packed:
        """Plain floats, or whole numbers above zero, as they are, without a copy."""
        if isinstance(values, Packed):
            return values
        is_whole = values.dtype.kind != "f"
        return Packed([Block(values.size, values, has_holes=not is_whole)], is_whole=is_whole)

    @staticmethod
    def joined(parts: Sequence[Packed]) -> Packed:
        """Columns one below the other."""
        return Packed([block for part in parts for block in part.blocks], is_whole=all(p.is_whole for p in parts))

    def __len__(self) -> int:
        return int(self._edges[-1])

    @property
    def size(self) -> int:
        return len(self)

    @property
    def nbytes(self) -> int:
        return sum(0 if block.codes is None else block.codes.nbytes for block in self.blocks)

    def part(self, first: int, stop: int) -> Floats:
        """The values of rows first to stop - 1, in an array of their own."""
        out = np.empty(max(0, stop - first))
        at = int(np.searchsorted(self._edges, first, side="right")) - 1
        while first < stop:
            begin, end = int(self._edges[at]), min(stop, int(self._edges[at + 1]))
            self.blocks[at].into(out[out.size - (stop - first) : out.size - (stop - end)], first - begin, end - begin)
            first, at = end, at + 1
        return out

    def parts(self) -> Iterator[tuple[int, Floats]]:
        """Block by block: the row that it begins with, and its values."""
        for block, (first, stop) in zip(self.blocks, pairwise(self._edges.tolist()), strict=True):
            out = np.empty(stop - first)
            block.into(out, 0, stop - first)
            yield first, out

    def __array__(self, dtype: Any = None, copy: bool | None = None) -> NDArray[Any]:
        values = self.part(0, len(self))
        wanted = np.dtype(dtype) if dtype is not None else np.dtype(np.int64 if self.is_whole else np.float64)
        return values.astype(wanted, copy=False)

    @overload
    def __getitem__(self, at: int) -> float: ...
    @overload
    def __getitem__(self, at: slice) -> Floats: ...
    def __getitem__(self, at: int | slice) -> float | Floats:
        if isinstance(at, slice):
            first, stop, step = at.indices(len(self))
            return (
                self.part(first, stop)[::step] if step in (1, -1) or first >= stop else self._thinned(first, stop, step)
            )
        row = at + len(self) if at < 0 else at
        if not 0 <= row < len(self):
            raise IndexError(at)
        return float(self.part(row, row + 1)[0])

    def _thinned(self, first: int, stop: int, step: int) -> Floats:
        """Every so manieth row, with no more than one block in hand."""
        return np.concatenate([
            values[max(0, first - begin) + (-max(0, begin - first)) % step : stop - begin : step]
            for begin, values in self.parts()
            if begin < stop and begin + values.size > first
        ])  # fmt: skip

    def converted(self, factor: float, offset: float) -> Packed:
        """The column in another unit: value * factor + offset."""
        # a second conversion cannot be written into a block that has one
        assert all(block.factor == 1.0 and block.offset == 0.0 for block in self.blocks)
        return Packed([replace(block, factor=factor, offset=offset) for block in self.blocks])

    @property
    def has_holes(self) -> bool:
        """Whether any reading may be missing."""
        return any(block.has_holes for block in self.blocks)

    def missing(self) -> NDArray[np.intp]:
        """Rows without a reading."""
        found = [
            np.flatnonzero(np.isnan(self.part(int(first), int(stop)))) + first
            for block, (first, stop) in zip(self.blocks, pairwise(self._edges.tolist()), strict=True)
            if block.has_holes
        ]
        return np.concatenate(found) if found else np.zeros(0, np.intp)

    def is_rising_evenly(self, first: int, stop: int) -> bool:
        """Whether the rows first to stop - 1 rise by one and the same step, as the times of a logger do.

        Told only of what is kept as runs; False says nothing.
        """
        low = int(np.searchsorted(self._edges, first, side="right")) - 1
        high = int(np.searchsorted(self._edges, stop, side="left"))
        blocks = [block for block in self.blocks[low:high] if block.size]
        one = blocks[0] if blocks else None
        if one is None or one.codes is not None or one.step <= 0:
            return False
        form = (one.step, one.divisor, one.factor, one.offset)
        alike = all(b.codes is None and (b.step, b.divisor, b.factor, b.offset) == form for b in blocks)
        return alike and all(a.base + a.size * a.step == b.base for a, b in pairwise(blocks))

    def extent(self) -> tuple[float, float]:
        """The smallest and the largest value, infinite where there is none."""
        low, high = np.inf, -np.inf
        for _, values in self.parts():
            if not values.size:
                continue
            lowest, highest = _extent(values)
            low, high = np.fmin(low, lowest), np.fmax(high, highest)
        return float(low), float(high)


def pack(values: Floats, decimals: int, *, look_for_run: bool = False) -> Block:
    """A block of readings, in the fewest bytes that give every one of them back to the bit.

    Parameters
    ----------
    decimals
        Digits expected behind the decimal mark; a few more are tried.
    look_for_run
        Whether the values may well be evenly spaced, as times are.
    """
    for digits in range(max(0, decimals), max(0, decimals) + _MORE_DECIMALS + 1):
        divisor = 10.0**digits
        # rounded to whole numbers; what that loses shows when they are divided again
        with np.errstate(over="ignore", invalid="ignore"):
            whole = np.rint(values * divisor)
        low, high = _extent(whole)
        if not (-_LARGEST < low <= high < _LARGEST):
            break
        same = whole / divisor == values
        has_holes = not same.all()
        if has_holes and not np.isnan(values[~same]).all():
            continue
        if low <= 0 <= high and bool((np.signbit(values) & (values == 0)).any()):
            break  # a whole number has no -0
        return _coded(whole, (low, high), divisor, has_holes, look_for_run)
    return Block(values.size, values.copy(), has_holes=bool(np.isnan(values).any()))


def _extent(values: Floats) -> tuple[float, float]:
    low, high = float(values.min()), float(values.max())
    if low == low:  # the quick way has no NaN in it
        return low, high
    return float(np.fmin.reduce(values)), float(np.fmax.reduce(values))


def _coded(whole: Floats, extent: tuple[float, float], divisor: float, has_holes: bool, look_for_run: bool) -> Block:
    low, high = extent
    base, span = int(low), high - low
    if not has_holes and span == 0:
        return Block(whole.size, None, base, 0, divisor)
    if look_for_run and not has_holes and whole.size > 2:
        step = whole[1] - whole[0]
        if bool((np.diff(whole) == step).all()):
            return Block(whole.size, None, int(whole[0]), int(step), divisor)
    for kind, largest in _CODES:
        if span < largest:
            np.subtract(whole, low, out=whole)
            if has_holes:
                whole[np.isnan(whole)] = largest
            return Block(whole.size, whole.astype(kind), base, 0, divisor, has_holes)
    values = whole / divisor
    return Block(values.size, values, has_holes=has_holes)


def append(blocks: list[Block], block: Block) -> None:
    """Add a block to a column; of many small ones one is made now and then, which is quicker to look at."""
    blocks.append(block)
    last = blocks[-_TOGETHER:]
    if len(last) == _TOGETHER and all(one.size <= 2 * block.size for one in last):
        blocks[-_TOGETHER:] = _merged(last)


def _merged(blocks: Sequence[Block]) -> list[Block]:
    out: list[Block] = []
    group: list[Block] = []
    for block in blocks:
        if group and not _go_together(group[-1], block):
            out.append(_as_one(group))
            group = []
        group.append(block)
    return [*out, _as_one(group)] if group else out


def _go_together(one: Block, other: Block) -> bool:
    if one.divisor != other.divisor or one.has_holes or other.has_holes:
        return False
    if one.codes is None or other.codes is None:
        runs_on = one.step == other.step and one.base + one.size * one.step == other.base
        return one.codes is None and other.codes is None and runs_on
    return one.codes.dtype.kind == "u" and other.codes.dtype.kind == "u"


def _as_one(group: Sequence[Block]) -> Block:
    first = group[0]
    size = sum(block.size for block in group)
    if len(group) == 1 or first.codes is None:
        return replace(first, size=size)
    parts = [(block.base, block.codes) for block in group if block.codes is not None]
    low = min(base for base, _ in parts)
    high = max(base + int(codes.max()) for base, codes in parts)
    kind = next((kind for kind, largest in _CODES if high - low < largest), np.int64)
    codes = np.empty(size, kind)
    at = 0
    for base, part in parts:
        np.add(part, base - low, out=codes[at : at + part.size], dtype=np.int64, casting="unsafe")
        at += part.size
    return Block(size, codes, low, 0, first.divisor)


def pack_whole(numbers: NDArray[np.int64], divisor: int) -> Block:
    """A block of whole numbers that stand for number / divisor; none is missing."""
    step = int(numbers[1] - numbers[0]) if numbers.size > 1 else 0
    if bool((numbers[1:] - numbers[:-1] == step).all()):
        return Block(numbers.size, None, int(numbers[0]), step, float(divisor))
    while divisor > 1 and not (numbers % 10).any():
        numbers, divisor = numbers // 10, divisor // 10
    low = int(numbers.min())
    kind = next((kind for kind, largest in _CODES if int(numbers.max()) - low < largest), np.int64)
    return Block(numbers.size, (numbers - low).astype(kind), low, 0, float(divisor))


def whole_run(first: int, size: int) -> Packed:
    """The whole numbers from `first` on, such as the lines of a file."""
    return Packed([Block(size, None, first, 1)], is_whole=True)


def extent_of(column: Floats | Packed) -> tuple[float, float]:
    """The smallest and the largest reading of a column; the larger first where there is none."""
    if isinstance(column, Packed):
        return column.extent()
    known = column[~np.isnan(column)]
    return (float(known.min()), float(known.max())) if known.size else (np.inf, -np.inf)
