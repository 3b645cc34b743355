"""Cells -> SI numbers: decimal marks, units in cells, readings that are missing or over range."""

from __future__ import annotations

import math
import re
from collections.abc import Callable, Iterable, Sequence
from dataclasses import dataclass, replace
from datetime import date, datetime, time, timedelta
from typing import TYPE_CHECKING, Any, NoReturn, TypeAlias

import numpy as np
from numpy.typing import NDArray

from acceptance.bench.headings import resolve_unit, shown
from acceptance.bench.packed import Block, Packed
from acceptance.errors import LogError
from acceptance.units import Unit

if TYPE_CHECKING:
    from acceptance.bench.stamps import Stamps

__all__ = [
    "MISSING",
    "Cells",
    "Column",
    "Place",
    "Readings",
    "Worded",
    "is_reading",
    "plain_texts",
    "settle_decimal",
    "to_readings",
]

# numbers, stamps (datetime64), or cells as they stand; of a very long log packed
Cells: TypeAlias = "NDArray[Any] | Sequence[object] | Packed | Worded | Stamps"
Column = NDArray[np.float64] | Packed  # numbers, of a very long log packed

MISSING = ("", "-", "--", "NaN", "nan", "NAN", "n/a", "N/A", "na", "NA", "n.a.", "#N/A", "null", "NULL")
_MISSING = frozenset(word.casefold() for word in MISSING)
_OVER = re.compile(
    r"[+\-]?(?:o\.?l\.?|0\.l\.?|\.ol|ovld|ovl|over ?load|over[ \-]?range|over|\*{2,}|inf(?:inity)?)", re.IGNORECASE
)
# 9.9e37 is what instruments send for a reading over range, 9.91e37 for one that is none
_SENT_FOR_OVER = 9.895e37
_SENT_FOR_NONE = 9.905e37

_NUMBER = re.compile(
    r"(?P<sign>[+\-\u2212\u2013]?)(?P<digits>\d[\d.,]*|[.,]\d+)(?P<exponent>[eE][+\-\u2212]?\d{1,4})?"
    r"(?P<unit>\s*[^\d\s.,].*)?",
    re.ASCII,
)
_CLOCK_LIKE = re.compile(
    r"\d{1,4}:\d{2}|\d{1,4}[-/]\d{1,2}[-/]\d{1,4}|\d{1,2}\.\d{1,2}\.\d{2,4}|\d{1,2}[- ][A-Za-z]{3,9}[- ]\d{4}"
    r"|\d{8}T\d{4}",
    re.ASCII,
)


def is_reading(cell: object) -> bool:
    """Whether a cell is, or stands for, a reading or a time."""
    if isinstance(cell, str):
        text = cell.strip()
        if not text or len(text) > 60:
            return False
        match = _NUMBER.fullmatch(text)
        if match is not None:
            unit = (match["unit"] or "").strip()
            return not unit or resolve_unit(unit, "temperature") is not None or bool(_CLOCK_LIKE.match(text))
        return bool(_CLOCK_LIKE.match(text) or _OVER.fullmatch(text)) or text.casefold() in _MISSING
    return isinstance(cell, (int, float, datetime, date, time, timedelta)) and not isinstance(cell, bool)


@dataclass(frozen=True, slots=True)
class Place:
    """Where a column stands, for a fault's text."""

    file: str
    heading: str
    position: int  # column, from 1
    lines: NDArray[np.int64] | Packed  # of each row
    sheet: str = ""

    def refuse(self, row: int, found: str, expected: str) -> NoReturn:
        """Raise a fault at a row of this column; row -1 is the column as a whole."""
        line = int(self.lines[row]) if row >= 0 else 0
        file = f'{self.file}, sheet "{shown(self.sheet)}"' if self.sheet and not line else self.file
        if self.sheet and line:
            found = f'sheet "{shown(self.sheet)}": {found}'
        raise LogError(file, found, expected, line=line, column=self.position if line else 0)

    def at(self, row: int) -> str:
        """File and line of a row."""
        sheet = f', sheet "{shown(self.sheet)}"' if self.sheet else ""
        return f"{self.file}{sheet}:{int(self.lines[row])}"


@dataclass(frozen=True, slots=True)
class Readings:
    """One column in SI units."""

    values: Column
    missing: NDArray[np.intp]  # rows without a reading
    over_range: NDArray[np.intp]  # rows whose reading was over range
    cell_unit: str  # the unit written in the cells, "" where none is


@dataclass(frozen=True, slots=True)
class Worded:
    """A packed column in which words say that a reading was over range."""

    values: Packed  # NaN there
    over: NDArray[np.intp]  # rows

    def __len__(self) -> int:
        return len(self.values)


# --- which mark is decimal ------------------------------------------------------------------------------------------


@dataclass(slots=True)
class _Evidence:
    """How often numbers can be read with one decimal mark only, and where first."""

    count: int = 0
    first: tuple[Place, int, str] | None = None

    def add(self, place: Place, row: int, text: str, count: int) -> None:
        self.count += count
        if self.first is None or (place.lines[row], place.position) < (
            self.first[0].lines[self.first[1]],
            self.first[0].position,
        ):
            self.first = (place, row, text)


_SURE = {"point", "comma", "point thousands", "comma thousands"}


def _mark_of(digits: str) -> str:
    """What a number's marks say: "point" or "comma" (decimal, surely), "... thousands", "maybe ...", "" or "wrong"."""
    points, commas = digits.count("."), digits.count(",")
    if not points and not commas:
        return ""
    if points and commas:
        decimal, other = (".", ",") if digits.rfind(".") > digits.rfind(",") else (",", ".")
        grouped = re.fullmatch(rf"[1-9]\d{{0,2}}(?:\{other}\d{{3}})+\{decimal}\d*", digits)
        if not grouped:
            return "wrong"
        return "comma thousands" if decimal == "." else "point thousands"
    mark, name = (".", "point") if points else (",", "comma")
    if points + commas > 1:
        return f"{name} thousands" if re.fullmatch(rf"[1-9]\d{{0,2}}(?:\{mark}\d{{3}}){{2,}}", digits) else "wrong"
    return f"maybe {name}" if re.fullmatch(rf"[1-9]\d{{0,2}}\{mark}\d{{3}}", digits) else name


def settle_decimal(columns: Iterable[tuple[Place, Cells]]) -> tuple[str, bool]:
    """The decimal mark of a table's numbers, and whether the other mark groups thousands.

    "1.234" is a decimal point unless something says otherwise; "1,234" may be either and is never guessed.

    Raises
    ------
    LogError
        At the first number that deviates from the others' mark, or that only a question can settle.
    """
    seen: dict[str, _Evidence] = {}
    for place, cells in columns:
        if not isinstance(cells, Sequence):
            continue
        for text, (row, count) in _distinct(cells).items():
            match = _NUMBER.fullmatch(text)
            if match is not None and not _CLOCK_LIKE.match(text):
                seen.setdefault(_mark_of(match["digits"]), _Evidence()).add(place, row, text, count)
    return _decide(seen)


def _decide(seen: dict[str, _Evidence]) -> tuple[str, bool]:
    def count(*names: str) -> int:
        return sum(seen[name].count for name in names if name in seen)

    point, comma = count("point", "comma thousands"), count("comma", "point thousands")
    if point and comma:
        weak = "comma" if point >= comma else "point"
        _refuse_mixed(seen, weak)
    if comma:
        if count("maybe point") and not count("point thousands"):
            _refuse_mixed(seen, "maybe point")
        return ",", bool(count("point thousands"))
    if count("maybe comma") and not count("comma thousands"):
        place, row, text = seen["maybe comma"].first or _none()
        found = f'"{shown(text)}" under "{shown(place.heading)}" may be {_both(text)}'
        place.refuse(row, found, "which is it? write the log again with a decimal point, or without thousands marks")
    return ".", bool(count("comma thousands"))


def _both(text: str) -> str:
    return f"{text.replace(',', '')} with a thousands mark or {text.replace(',', '.')} with a decimal comma"


def _refuse_mixed(seen: dict[str, _Evidence], weak: str) -> NoReturn:
    other = "point thousands" if weak == "comma" else "comma thousands"
    names = [name for name in (weak, other) if name in seen and seen[name].first]
    place, row, text = min(
        (seen[name].first or _none() for name in names), key=lambda f: (f[0].lines[f[1]], f[0].position)
    )
    mark = "point" if weak == "comma" else "comma"
    others = f"the file's other numbers use a decimal {mark}"
    found = f'"{shown(text)}" under "{shown(place.heading)}" is not a number; {others}'
    place.refuse(row, found, "write the log again with one kind of decimal mark")


def _none() -> tuple[Place, int, str]:  # pragma: no cover - evidence that was counted has a place
    raise AssertionError


# --- cells -> numbers -----------------------------------------------------------------------------------------------


def _distinct(cells: Sequence[object]) -> dict[str, tuple[int, int]]:
    """Each text among the cells, with the first row that holds it and how many do."""
    found: dict[str, tuple[int, int]] = {}
    for row, cell in enumerate(cells):
        if isinstance(cell, str):
            text = cell.strip()
            first, count = found.get(text, (row, 0))
            found[text] = (first, count + 1)
    return found


def to_readings(
    cells: Cells, place: Place, *, unit: Unit | None, kind: str, decimal: str = ".", thousands: bool = False
) -> Readings:
    """The column in SI units: numbers times the unit's factor, or each with the unit in its cell.

    Parameters
    ----------
    unit
        From heading, row below or limits file; None where the cells may carry it, else SI is assumed.
    kind
        Of the unit: one of `acceptance.units.KINDS`, or "any".

    Raises
    ------
    LogError
        At the first cell that is no number, or whose unit is unknown, of another kind or another than the heading's.
    """
    if isinstance(cells, (Packed, Worded)):
        return _of_packed(cells, unit)
    if isinstance(cells, np.ndarray):
        values, over, cell_unit = cells, np.zeros(0, np.intp), ""
    else:
        assert isinstance(cells, Sequence)  # stamps stand under no other heading than the time's
        values, worded, cell_unit = _from_texts(cells, place, unit, kind, decimal, thousands)
        over = np.flatnonzero(worded)
    values, sent = _without_sent(values)
    over = np.union1d(over, sent)
    if unit is not None and (unit.factor != 1.0 or unit.offset != 0.0):
        values = values * unit.factor + unit.offset
    missing = np.flatnonzero(np.isnan(values))
    return Readings(values, np.setdiff1d(missing, over) if missing.size else missing, over, cell_unit)


def _of_packed(cells: Packed | Worded, unit: Unit | None) -> Readings:
    """The same for a packed column, whose cells carry no unit."""
    column, over = (cells.values, cells.over) if isinstance(cells, Worded) else (cells, np.zeros(0, np.intp))
    blocks: list[Block] = []
    for block, (first, values) in zip(column.blocks, column.parts(), strict=True):
        if block.codes is not None and block.codes.dtype.kind == "f":  # whole numbers are never so large
            values, sent = _without_sent(values)
            over = np.union1d(over, sent + first)
            block = replace(block, codes=values, has_holes=bool(np.isnan(values).any()))
        blocks.append(block)
    column = Packed(blocks)
    if unit is not None and (unit.factor != 1.0 or unit.offset != 0.0):
        column = column.converted(unit.factor, unit.offset)
    missing = column.missing()
    return Readings(column, np.setdiff1d(missing, over) if missing.size else missing, over, "")


def plain_texts(cells: Sequence[object], decimal: str) -> tuple[NDArray[np.float64], NDArray[np.intp]] | None:
    """Numbers without units, words for a missing reading, and words for one over range, whose rows come second.

    None where a cell is anything else.
    """
    known: dict[object, float] = {None: math.nan}
    worded: set[object] = set()
    for text in dict.fromkeys(cells):
        if not isinstance(text, str):
            if text is not None:
                return None
            continue
        stripped = text.strip()
        match = _NUMBER.fullmatch(stripped)
        if stripped.casefold() in _MISSING or _OVER.fullmatch(stripped):
            known[text] = math.nan
            if stripped.casefold() not in _MISSING:
                worded.add(text)
        elif match is None or (match["unit"] or "").strip() or _mark_of(match["digits"]) == "wrong":
            return None
        else:
            try:
                known[text] = float(stripped.replace(decimal, "."))
            except ValueError:  # a sign that only people know
                return None
    values = np.array([known[cell] for cell in cells])
    over = [row for row, cell in enumerate(cells) if cell in worded] if worded else []
    return values, np.array(over, dtype=np.intp)


def _without_sent(values: NDArray[np.float64]) -> tuple[NDArray[np.float64], NDArray[np.intp]]:
    """The values without the numbers that instruments send for no reading, and the rows of those for over range."""
    if not max(np.fmax.reduce(values, initial=0.0), -np.fmin.reduce(values, initial=0.0)) > _SENT_FOR_OVER:
        return values, np.zeros(0, np.intp)
    size = np.abs(values)
    big = size > _SENT_FOR_OVER
    sent = big & ((size < _SENT_FOR_NONE) | np.isinf(size))
    return np.where(big, np.nan, values), np.flatnonzero(sent)


def _from_texts(
    cells: Sequence[object], place: Place, unit: Unit | None, kind: str, decimal: str, thousands: bool
) -> tuple[NDArray[np.float64], NDArray[np.bool_], str]:
    read = _cell_reader(place, unit, kind, decimal, thousands)
    known: dict[object, tuple[float, bool, str]] = {}
    values, over = np.empty(len(cells)), np.zeros(len(cells), bool)
    first_unit, bare = "", -1
    for row, cell in enumerate(cells):
        key = (type(cell), cell)  # 1, 1.0 and True are one key without their types
        found = known.get(key)
        if found is None:
            found = known[key] = read(row, cell)
        values[row], over[row], cell_unit = found
        if cell_unit:
            first_unit = first_unit or cell_unit
        elif bare < 0 and not math.isnan(values[row]):
            bare = row
    if first_unit and bare >= 0 and unit is None:
        found_text = f'"{shown(cells[bare], 30)}" under "{shown(place.heading)}" has no unit, and other cells have one'
        place.refuse(bare, found_text, f"expected a unit, such as {first_unit}, in every cell or in the heading")
    return values, over, first_unit


def _cell_reader(
    place: Place, unit: Unit | None, kind: str, decimal: str, thousands: bool
) -> Callable[[int, object], tuple[float, bool, str]]:
    other = "," if decimal == "." else "."

    def read(row: int, cell: object) -> tuple[float, bool, str]:
        if cell is None:
            return math.nan, False, ""
        if isinstance(cell, (int, float)) and not isinstance(cell, bool):
            return _float(cell), False, ""
        text = str(cell).strip() if isinstance(cell, str) else ""
        if isinstance(cell, str) and text.casefold() in _MISSING:
            return math.nan, False, ""
        if text and _OVER.fullmatch(text):
            return math.nan, True, ""
        match = _NUMBER.fullmatch(text)
        if match is None or _mark_of(match["digits"]) == "wrong":
            found = f'"{shown(cell, 30)}" under "{shown(place.heading)}" is not a number'
            place.refuse(row, found, "expected a reading, or an empty cell")
        digits = match["digits"].replace(other, "") if thousands else match["digits"]
        if other in digits:
            found = f'"{shown(text, 30)}" under "{shown(place.heading)}" is not a number'
            place.refuse(row, found, f"expected a decimal {'point' if decimal == '.' else 'comma'} like the others'")
        sign = "-" if match["sign"] in ("-", "\u2212", "\u2013") else ""
        exponent = (match["exponent"] or "").replace("\u2212", "-")
        number = float(f"{sign}{digits.replace(decimal, '.')}{exponent}")
        symbol = (match["unit"] or "").strip()
        if not symbol:
            # beside cells with a unit of their own, a bare number is in the heading's unit
            return number, False, ""
        own = _own_unit(row, text, symbol, place, unit, kind)
        return (number if unit is not None else own.to_si(number)), False, symbol

    return read


def _float(number: float) -> float:
    try:
        return float(number)
    except OverflowError:
        return math.inf


def _own_unit(row: int, text: str, symbol: str, place: Place, unit: Unit | None, kind: str) -> Unit:
    """The unit written in a cell, which must be of the kind and, where a heading has one, the same."""
    own = resolve_unit(symbol, kind)
    under = f'"{shown(text, 30)}" under "{shown(place.heading)}"'
    if own is None:
        place.refuse(row, f"{under} is not a number with a known unit", "expected a reading, or an empty cell")
    if kind not in ("any", own.kind):
        place.refuse(row, f"{under} is a {own.kind}", f"expected a {kind}")
    if unit is not None and (own.kind, own.factor, own.offset) != (unit.kind, unit.factor, unit.offset):
        place.refuse(row, f"{under} has another unit than its heading, {unit.symbol}", "expected one unit")
    return own
