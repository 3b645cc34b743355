"""`Packed` as a column of a pandas table."""

from __future__ import annotations

import builtins
from collections.abc import Sequence
from typing import Any, ClassVar, Literal

import numpy as np
from pandas.api.extensions import ExtensionArray, ExtensionDtype

from acceptance.bench.packed import Packed

__all__ = ["PackedArray"]


class _PackedType(ExtensionDtype):
    """Readings that are packed."""

    name = "packed readings"
    type: ClassVar[builtins.type[float]] = float
    kind: Literal["f", "i"] = "f"
    na_value = np.nan

    @property
    def _is_numeric(self) -> bool:
        return True

    @classmethod
    def construct_array_type(cls) -> builtins.type[PackedArray]:
        return PackedArray


class _PackedWhole(_PackedType):
    """Whole numbers that are packed, such as lines."""

    name = "packed whole numbers"
    type = int
    kind = "i"


class PackedArray(ExtensionArray):
    """A column that gives float64 (or int64) wherever it is looked at; it is never written to."""

    def __init__(self, column: Packed) -> None:
        self._column = column

    @property
    def packed(self) -> Packed:
        return self._column

    @property
    def dtype(self) -> Any:
        return _PackedWhole() if self._column.is_whole else _PackedType()

    @property
    def nbytes(self) -> int:
        return self._column.nbytes

    def __len__(self) -> int:
        return len(self._column)

    def __array__(self, dtype: Any = None, copy: bool | None = None) -> Any:
        return self._column.__array__(dtype, copy)

    def __getitem__(self, item: Any) -> Any:
        if isinstance(item, (int, np.integer)):
            value = self._column[int(item)]
            return int(value) if self._column.is_whole else value
        if isinstance(item, slice) and item == slice(None):
            return self
        if isinstance(item, slice) and item.step in (None, 1):
            return self._of(self._column[item])
        return self._of(np.asarray(self._column, dtype=np.float64)[item])

    def _of(self, values: Any) -> PackedArray:
        column = Packed.of(np.asarray(values, dtype=np.float64))
        return PackedArray(Packed(column.blocks, is_whole=self._column.is_whole))

    def isna(self) -> Any:
        out = np.zeros(len(self), dtype=bool)
        out[self._column.missing()] = True
        return out

    def copy(self) -> PackedArray:
        return PackedArray(self._column)

    def take(self, indices: Any, *, allow_fill: bool = False, fill_value: Any = None) -> PackedArray:
        from pandas.api.extensions import take

        fill = np.nan if fill_value is None else fill_value
        values = np.asarray(self._column, dtype=np.float64)
        return self._of(take(values, np.asarray(indices), allow_fill=allow_fill, fill_value=fill))

    @classmethod
    def _from_sequence(cls, scalars: Any, *, dtype: Any = None, copy: bool = False) -> PackedArray:
        column = Packed.of(np.asarray(scalars, dtype=np.float64))
        return cls(Packed(column.blocks, is_whole=getattr(dtype, "kind", "f") == "i"))

    @classmethod
    def _concat_same_type(cls, to_concat: Sequence[Any]) -> PackedArray:
        return cls(Packed.joined([array.packed for array in to_concat]))
