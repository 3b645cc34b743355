"""Numbers for people: quantities with their units and prefixes, uncertainties, limits, probabilities, durations.

Values come in as SI (ratios as fractions) and leave as text. Rounding follows the uncertainty: two significant digits
of U, and as many decimals of the value. A value never prints on another side of its limit than it lies on: where
rounding would do that, it gets more digits. Limits are printed as they were written, in the shortest form.

    with_uncertainty   "90.12 % ± 0.18 %"
    quantity           "12.3 mV"
    limit_range        "≥ 88 %", "23.52 V to 24.48 V"
    printed            value, U, limits and margin of one finding, in one unit, for the columns of a table
    printed_finding    the same of a finding of the record
    column             the numbers of one column of a table, on one scale, with decimals that stand below one another
    probability        "97.3 %", "> 99.9 %"
    duration           "1 h 5 min"
"""

from __future__ import annotations

import math
import re
from collections.abc import Iterable, Sequence
from dataclasses import dataclass
from decimal import Decimal, localcontext
from functools import lru_cache
from typing import TYPE_CHECKING

if TYPE_CHECKING:
    from acceptance.record import Alternative, Finding

__all__ = [
    "DASH",
    "MINUS",
    "Printed",
    "Scale",
    "column",
    "count",
    "difference_unit",
    "duration",
    "limit_range",
    "minus_signs",
    "printed",
    "printed_finding",
    "probability",
    "quantity",
    "scale_for",
    "time_scale",
    "with_uncertainty",
]

MINUS = "\N{MINUS SIGN}"
DASH = "\N{EN DASH}"  # stands where there is no value

_PREFIXES = {-12: "p", -9: "n", -6: "\N{MICRO SIGN}", -3: "m", 0: "", 3: "k", 6: "M"}

# unit -> lowest and highest power of ten a prefix may stand for; units that are not here take none
_SPAN = {"V": (-9, 3), "A": (-9, 3), "W": (-9, 6), "ohm": (-6, 6), "s": (-9, 0), "Hz": (0, 6), "F": (-12, 0)}
_SYMBOLS = {"ohm": "Ω"}

_MOST_DIGITS = 12  # significant; more than any reading has, and few enough that binary fractions do not show
_WRITTEN_DIGITS = 9  # a limit of more of them was worked out, not written
_FORMULA_DIGITS = 7
_SLACK = 1e-12  # a value this near to a limit is equal to it


@dataclass(frozen=True, slots=True)
class Scale:
    """One way to show SI values: number shown = value / (10^exponent x factor), followed by the symbol."""

    exponent: int
    symbol: str
    factor: float = 1.0  # other than 1 only for minutes and hours

    @property
    def size(self) -> float:
        """One of the unit shown, in SI."""
        return 10.0**self.exponent * self.factor

    def number(self, value: float) -> Decimal:
        """The exact decimal of a finite value on this scale, binary noise beyond 13 digits left out."""
        return Decimal(f"{value / self.factor:.13g}").scaleb(-self.exponent)

    def fixed(self, value: float, decimals: int) -> str:
        """A finite value with so many decimals, without its unit; negative decimals round to tens and more."""
        return _fixed(self.number(value), decimals)

    def rounded(self, value: float, digits: int) -> str:
        """A finite value rounded to so many significant digits, without its unit."""
        number = self.number(value)
        return _fixed(number, digits - 1 - int(f"{number:.{digits - 1}e}".partition("e")[2] if number else 0))

    def exact(self, value: float) -> str:
        """A finite value in its shortest exact form, without its unit."""
        return _shortest(self.number(value))

    def limit(self, value: float) -> str:
        """A limit: as it was written, or to seven digits where a formula gave it more than anyone writes."""
        text = self.exact(value)
        written = sum(c.isdigit() for c in text.strip(f"{MINUS}0.")) <= _WRITTEN_DIGITS
        return text if written else self.rounded(value, _FORMULA_DIGITS)

    def with_unit(self, number: str) -> str:
        """A number's text with the unit after it."""
        return f"{number} {self.symbol}" if self.symbol else number


@dataclass(frozen=True, slots=True)
class Printed:
    """The texts of one finding on one scale, without units; a dash where there is no number.

    U and margin are differences: of a temperature in °C they are in K.
    """

    unit: str
    value: str
    expanded: str
    low: str
    high: str
    margin: str

    def with_unit(self, number: str) -> str:
        """A value or a limit of this finding with its unit, a dash as it is."""
        return f"{number} {self.unit}" if self.unit and any(c.isdigit() for c in number) else number

    def with_difference_unit(self, number: str) -> str:
        """Its U or its margin with the unit of a difference, a dash as it is."""
        unit = difference_unit(self.unit)
        return f"{number} {unit}" if unit and any(c.isdigit() for c in number) else number


def difference_unit(unit: str) -> str:
    """The unit of a difference, and so of an uncertainty: K for a temperature in °C, else the unit itself."""
    return "K" if unit == "°C" else unit


def scale_for(unit: str, numbers: Iterable[float | None], *, per_cent: bool = True) -> Scale:
    """The scale that suits the largest of the numbers: 0.0123 V reads 12.3 mV, a ratio reads per cent.

    Parameters
    ----------
    unit
        SI unit as in the record; "" for a ratio.
    numbers
        Values that share the scale; missing and infinite ones do not count. [unit]
    per_cent
        Whether a ratio is shown in per cent.
    """
    if not unit:
        return Scale(-2, "%") if per_cent else Scale(0, "")
    if unit == "1/K":
        return Scale(-6, "ppm/K")
    symbol = _SYMBOLS.get(unit, unit)
    span = _SPAN.get(unit)
    largest = max((abs(n) for n in numbers if n is not None and math.isfinite(n)), default=0.0)
    if span is None or largest == 0:
        return Scale(0, symbol)
    # the small surplus keeps 0.9999 V from reading 1000 mV
    power = 3 * math.floor(math.log10(min(largest, 1e300) * 1.0005) / 3)
    power = min(max(power, span[0]), span[1])
    return Scale(power, _PREFIXES[power] + symbol)


_LONG, _LONGER = 240.0, 7260.0  # a stretch beyond these is shown in minutes, in hours [s]


def time_scale(numbers: Iterable[float]) -> Scale:
    """The scale of a time axis, from the stretch it shows: "ms" or "s" for short ones, "min" up to two hours, then "h".

    Parameters
    ----------
    numbers
        Finite. A stretch that begins late, seconds at the end of an hour, stays in seconds. [s]
    """
    listed = list(numbers)
    stretch = max(listed, default=0.0) - min(listed, default=0.0)
    if stretch <= _LONG:
        return scale_for("s", listed)
    return Scale(0, "min", 60.0) if stretch <= _LONGER else Scale(0, "h", 3600.0)


def quantity(value: float | None, unit: str, *, digits: int = 5, stripped: bool = True, per_cent: bool = True) -> str:
    """A value with its unit, rounded to so many significant digits; trailing zeros are left out where `stripped`."""
    odd = _odd(value)
    if odd is not None or value is None:
        return odd or DASH
    scale = scale_for(unit, [value], per_cent=per_cent)
    number = scale.number(value)
    decimals = digits - 1 - _order(number)
    text = _fixed(number, decimals)
    return scale.with_unit(_stripped(text) if stripped else text)


def with_uncertainty(value: float | None, expanded: float | None, unit: str, *, per_cent: bool = True) -> str:
    """A value and its expanded uncertainty, such as "90.12 % ± 0.18 %"; without one, the value alone.

    Parameters
    ----------
    value, expanded
        SI; ratios as fractions. None where not known. [unit]
    unit
        SI unit as in the record; "" for a ratio.
    per_cent
        Whether a ratio is shown in per cent.
    """
    texts = printed(value, expanded, unit, per_cent=per_cent)
    if _odd(value) is not None or texts.expanded == DASH:
        return texts.with_unit(texts.value)
    return f"{texts.with_unit(texts.value)} ± {texts.with_difference_unit(texts.expanded)}"


def printed(
    value: float | str | None,
    expanded: float | None,
    unit: str,
    *,
    low: float | None = None,
    high: float | None = None,
    margin: float | None = None,
    per_cent: bool = True,
) -> Printed:
    """The texts of one finding, all on one scale.

    The value has the decimals of U at two significant digits, and more where it would otherwise print on the limit,
    or beyond it, without being there. A text (a behaviour) is printed as it is.
    """
    number = value if isinstance(value, (int, float)) else None
    limits = [limit for limit in (low, high) if _is_number(limit)]
    scale = scale_for(unit, [number, expanded, *limits], per_cent=per_cent)
    if number is None or not math.isfinite(number):
        decimals = 0
        shown = value if isinstance(value, str) else _odd(number) or DASH
    else:
        decimals = _decimals_on_its_side(scale, number, _decimals(scale, number, expanded), limits)
        shown = scale.fixed(number, decimals)
        if not _is_number(expanded) or expanded == 0:  # nothing tells how many digits count
            shown = _stripped(shown)
    return Printed(
        unit=scale.symbol if value is None or not isinstance(value, str) else "",
        value=shown,
        expanded=_expanded_text(scale, number, expanded),
        low=scale.limit(low) if low is not None and _is_number(low) else DASH,
        high=scale.limit(high) if high is not None and _is_number(high) else DASH,
        margin=_margin_text(scale, margin, decimals, stripped=not _is_number(expanded) or expanded == 0),
    )


def printed_finding(finding: Finding, other: Alternative | None = None) -> Printed:
    """The texts of a finding, or of another dwell that met its condition, all on one scale."""
    shown = finding if other is None else other
    return printed(
        shown.value,
        shown.expanded_uncertainty,
        finding.unit,
        low=finding.min,
        high=finding.max,
        margin=shown.margin,
        per_cent=finding.in_per_cent,
    )


def limit_range(low: float | None, high: float | None, unit: str, *, per_cent: bool = True) -> str:
    """What must be met: "≥ 88 %", "≤ 120 mV", "23.52 V to 24.48 V", or a dash."""
    scale = scale_for(unit, [low, high], per_cent=per_cent)
    texts = [scale.with_unit(scale.limit(n)) if n is not None and _is_number(n) else "" for n in (low, high)]
    if all(texts):
        return f"{texts[0]} to {texts[1]}"
    if texts[0]:
        return f"≥ {texts[0]}"
    return f"≤ {texts[1]}" if texts[1] else DASH


def column(
    values: Sequence[float | None], scale: Scale, *, expanded: Sequence[float | None] = (), digits: int = 5
) -> list[str]:
    """The numbers of one column without their unit, "24.012 ± 0.011", their decimals alike as far as that is honest.

    With uncertainties a value has the decimals of its U at two significant digits, or one more where most rows of the
    column have that. Without any, the largest value has so many significant digits, and all share its decimals.

    Parameters
    ----------
    values
        SI; ratios as fractions. None where there is none: a dash. [the scale's unit]
    scale
        How they are shown.
    expanded
        Expanded uncertainty of each value, None where not known; empty where none is. [the scale's unit]
    digits
        Significant digits of the largest value, where it has no uncertainty.
    """
    bounds = list(expanded) or [None] * len(values)
    sure = [
        _decimals(scale, value, u)
        for value, u in zip(values, bounds, strict=True)
        if value is not None and math.isfinite(value) and u is not None and 0 < u < math.inf
    ]
    usual = max(sure, key=lambda decimals: (sure.count(decimals), decimals), default=0)
    plain = _plain_decimals(values, scale, digits)
    texts = []
    for value, u in zip(values, bounds, strict=True):
        odd = _odd(value)
        if odd is not None or value is None:
            texts.append(odd or DASH)
        elif u is None or not 0 < u < math.inf:
            zero = f" ± {_expanded_text(scale, value, u)}" if u else ""
            texts.append(scale.fixed(value, min(plain, usual) if sure else plain) + zero)
        else:
            own = _decimals(scale, value, u)
            shared = usual if usual - own == 1 else own
            texts.append(f"{scale.fixed(value, shared)} ± {_expanded_text(scale, value, u, shared)}")
    return texts


def _plain_decimals(values: Iterable[float | None], scale: Scale, digits: int) -> int:
    """Decimals that show the largest value with so many digits, without zeros that all of them would end in."""
    numbers = [scale.number(value) for value in values if value is not None and math.isfinite(value)]
    decimals = max(0, digits - 1 - max((_order(number) for number in numbers if number), default=0))
    needed = (-_exponent(_rounded(number, decimals).normalize()) for number in numbers)
    return min(decimals, max(0, *needed, 0))


def probability(share: float | None, *, required: float | None = None) -> str:
    """A probability in per cent: "97.3 %", "> 99.9 %", "< 0.1 %".

    With the one that is required, as many digits as it takes to show on which side of it this one lies.
    """
    if share is None or not math.isfinite(share):
        return DASH if share is None else "not a number"
    needed = None if required is None else Decimal(repr(required)) * 100
    if share > 0.999 and (needed is None or needed <= Decimal("99.9")):
        return "> 99.9 %"
    if share < 0.001 and (needed is None or needed >= Decimal("0.1")):
        return "< 0.1 %"
    exact = Decimal(repr(float(share))) * 100
    decimals = 1
    # 0 and 100 are certainties: nothing else prints as one
    sides = [Decimal(0), Decimal(100), *([] if needed is None else [needed])]
    while decimals < 12 and any(_side(_rounded(exact, decimals), side) != _side(exact, side) for side in sides):
        decimals += 1
    return f"{_fixed(exact, decimals)} %"


def duration(seconds: float | None) -> str:
    """A stretch of time: "2 h 5 min", "45 s", "12.3 ms"."""
    odd = _odd(seconds)
    if odd is not None or seconds is None:
        return odd or DASH
    if abs(seconds) < 59.95:
        return quantity(seconds, "s", digits=3)
    sign = MINUS if seconds < 0 else ""
    whole = round(abs(seconds))
    parts = [(whole // 3600, "h"), (whole % 3600 // 60, "min"), (whole % 60, "s")]
    return sign + " ".join(f"{n} {unit}" for n, unit in parts if n)


def count(number: int) -> str:
    """A whole number, its thousands apart: "12 345"."""
    return f"{number:,}".replace(",", " ").replace("-", MINUS)


_NO_SIGN = re.compile(r"(?<![\w.])-0(?=(?:\.0*)?(?![\d.]))")
_SIGN = re.compile(r"(?<![\w.])-(?=\d)")


def minus_signs(text: str) -> str:
    """Prose with the hyphens before its numbers as minus signs; zero has none."""
    return _SIGN.sub(MINUS, _NO_SIGN.sub("0", text))


def _is_number(value: float | None) -> bool:
    return value is not None and math.isfinite(value)


def _odd(value: float | None) -> str | None:
    """The word for what is no finite number, or None."""
    if value is None:
        return DASH
    if math.isnan(value):
        return "not a number"
    return None if math.isfinite(value) else f"{MINUS if value < 0 else ''}infinite"


@lru_cache(maxsize=4096)
def _fixed(number: Decimal, decimals: int) -> str:
    if number and not -15 < number.adjusted() < 15:
        # as a decimal: on another scale the smallest floats would come to nothing
        return f"{number.normalize():.6g}".replace("-", MINUS)
    text = f"{_rounded(number, decimals):f}"
    if text.startswith("-") and not text.strip("-0."):
        text = text[1:]
    return text.replace("-", MINUS)


def _rounded(number: Decimal, decimals: int) -> Decimal:
    with localcontext() as context:
        context.prec = 700  # any float fits
        return number.quantize(Decimal(1).scaleb(-decimals))


def _shortest(number: Decimal) -> str:
    return _fixed(number, max(0, -_exponent(number.normalize())))


def _stripped(text: str) -> str:
    return text.rstrip("0").rstrip(".") if "." in text else text


def _exponent(number: Decimal) -> int:
    exponent = number.as_tuple().exponent
    assert isinstance(exponent, int)  # only finite numbers come here
    return exponent


def _order(number: Decimal) -> int:
    """Power of ten of the first digit; 0 for zero."""
    return number.adjusted() if number else 0


def _side(number: Decimal, limit: Decimal) -> int:
    return (number > limit) - (number < limit)


def _decimals(scale: Scale, value: float, expanded: float | None) -> int:
    """Decimals of U at two significant digits; without U, what five significant digits of the value take."""
    number = scale.number(value)
    if expanded is None or not math.isfinite(expanded) or expanded <= 0:
        return max(0, 4 - _order(number))
    u = scale.number(expanded)
    order = int(f"{u:.1e}".partition("e")[2])  # after rounding: 0.0996 is 0.10
    return min(1 - order, max(0, _MOST_DIGITS - 1 - _order(max(abs(number), u))))


def _decimals_on_its_side(scale: Scale, value: float, decimals: int, limits: Iterable[float | None]) -> int:
    """As many decimals as keep the printed value on the side of each printed limit that it truly lies on."""
    number = scale.number(value)
    for limit in limits:
        if limit is None or abs(value - limit) <= _SLACK * abs(limit):
            continue
        exact = scale.number(limit)
        while decimals < 20 and _side(_rounded(number, decimals), exact) != _side(number, exact):
            decimals += 1
    return decimals


def _expanded_text(scale: Scale, value: float | None, expanded: float | None, decimals: int | None = None) -> str:
    if expanded is None or not math.isfinite(expanded):
        return DASH if expanded is None else "not a number"
    if expanded == 0:  # a bound, such as the end of a sampling interval
        return DASH
    if decimals is None:
        decimals = _decimals(scale, value if value is not None and math.isfinite(value) else expanded, expanded)
    text = scale.fixed(expanded, decimals)
    return text if text.strip("0.") else f"{scale.number(expanded):.1e}".replace("-", MINUS)


def _margin_text(scale: Scale, margin: float | None, decimals: int, *, stripped: bool) -> str:
    """With its sign; more digits where it would print as zero without being it."""
    if margin is None or not math.isfinite(margin):
        return DASH if margin is None else "not a number"
    while decimals < 20 and margin and not scale.fixed(margin, decimals).strip(f"{MINUS}0."):
        decimals += 1
    text = _stripped(scale.fixed(margin, decimals)) if stripped else scale.fixed(margin, decimals)
    return text if margin <= 0 or not text.strip("0.") else f"+{text}"
