"""The step that a channel was logged in, told from its digits.

A converter's own step may be larger, and is for the bench file to state.
"""

from __future__ import annotations

import csv
import re
from collections.abc import Iterable, Sequence

import numpy as np
from numpy.typing import NDArray

from acceptance.bench.packed import Packed

__all__ = ["coarser_step", "logged_step", "sampled_cells", "spots", "written_decimals"]

_NUMBER = re.compile(r"\s*\"?\s*[-+\u2212]?\d*(?:[.,](?P<fraction>\d*))?(?:[eE](?P<exponent>[-+]?\d{1,3}))?")
_DECIMALS = range(-3, 9)  # thousands to a hundred-millionth of the unit that was logged
_LOOKED_AT = 20_000  # values; the digits of a logger do not change on the way
_LINES = 300  # lines looked at in delimited text
_FARTHEST = 15  # digits to either side of the point that a reading may have
_FEWEST = 20  # different values, below which a workbook tells nothing: 12 V may be 12.000 V there


def written_decimals(cells: Iterable[str]) -> int | None:
    """Digits behind the decimal mark, the most of all cells; below 0 for whole tens. None without a number.

    "12.050" has three: what stands there was written to a thousandth, whatever the last digit is.
    """
    most: int | None = None
    for cell in cells:
        match = _NUMBER.match(cell)
        if match is None or not any(c.isdigit() for c in match.group()):
            continue
        decimals = len(match["fraction"] or "") - int(match["exponent"] or 0)
        if not -_FARTHEST <= decimals <= _FARTHEST:
            continue  # an overflow mark such as 9.9E37, or worse, has no digits to speak of
        most = decimals if most is None else max(most, decimals)
    return most


def spots(size: int) -> list[int]:
    """Bytes spread over a table of so many, in whose lines the digits are looked at."""
    return sorted({size * i // _LINES for i in range(_LINES)})


def sampled_cells(body: bytes, separator: str, width: int, at: Sequence[int] | None = None) -> list[list[str]]:
    """Cells of some lines spread over a table, column by column.

    Comments, and lines with a quote that is left open, are passed over. `at` tells bytes in those lines; without it
    they are spread evenly.
    """
    size = len(body)
    mark = separator.encode()
    columns: list[list[str]] = [[] for _ in range(width)]
    for start in spots(size) if at is None else at:
        begin = body.rfind(b"\n", 0, start) + 1
        end = body.find(b"\n", begin)
        line = body[begin : end if end >= 0 else size]
        if line.startswith(b"#") or line.count(b'"') % 2:
            continue
        cells = _unquoted(line, separator) if b'"' in line else line.split(mark)
        if len(cells) < width:
            continue
        for column, cell in zip(columns, cells, strict=False):
            column.append(cell.decode("ascii", errors="replace"))
    return columns


def _unquoted(line: bytes, separator: str) -> list[bytes]:
    text = line.decode("latin-1").rstrip("\r")
    try:
        cells = next(csv.reader([text], delimiter=separator, skipinitialspace=True), [])
    except csv.Error:
        return []
    return [cell.encode("latin-1") for cell in cells]


def logged_step(values: Sequence[float] | NDArray[np.float64] | Packed, factor: float) -> float:
    """The decimal step that all values are whole multiples of; 0 where there is none, or too few values to tell.

    For workbooks, where a number has lost the zeros at its end.

    Parameters
    ----------
    values : shape (n,)
        A channel as read, NaN where it was not. [SI]
    factor
        What one unit of the file is in SI.

    Returns
    -------
    float
        The step in SI.
    """
    logged = _different(values, factor)
    return _lattice(logged, factor) if logged.size >= _FEWEST else 0.0


def coarser_step(values: Sequence[float] | NDArray[np.float64] | Packed, factor: float, decimals: int) -> float:
    """A step coarser than the digits that were written, where all values lie on it and chance would not do that.

    12.1000, 12.0000: three digits that say nothing, in two values. Of that many digits one in a thousand logs has
    three zeros by chance.
    """
    logged = _different(values, factor)
    step = _lattice(logged, factor)
    if step <= 0:
        return 0.0
    zeros = round(np.log10(step / factor)) + decimals
    return step if zeros * logged.size >= 4 and zeros >= 1 else 0.0


def _different(values: Sequence[float] | NDArray[np.float64] | Packed, factor: float) -> NDArray[np.float64]:
    """The different values, in the unit of the file, zeros left out: they lie on every step."""
    samples = values if isinstance(values, Packed) and not values.missing().size else np.asarray(values, np.float64)
    if isinstance(samples, np.ndarray):
        samples = samples[np.isfinite(samples)]
    seen = samples[:: max(1, samples.size // _LOOKED_AT)]
    logged = np.unique(seen[np.isfinite(seen)] / factor)
    return np.asarray(logged[logged != 0], dtype=np.float64)


def _lattice(logged: NDArray[np.float64], factor: float) -> float:
    """The largest decimal step that all values are whole multiples of. [SI]"""
    if not logged.size:
        return 0.0
    largest = float(np.abs(logged).max())
    for decimals in _DECIMALS:
        step = 10.0**-decimals
        if step > largest:
            continue
        off = np.abs(logged / step - np.rint(logged / step))
        # beside large readings a float has fewer digits below the point
        if float(off.max()) <= 1e-6 + 4e-16 * largest / step:
            return step * abs(factor)
    return 0.0
