"""How one value of a limits file is read: text to SI number, with a fault in this project's words.

A fault carries what was found, what is expected, and where below the value's own place it lies; `faults`
adds file, line and column.
"""

from __future__ import annotations

import re
from collections.abc import Callable, Iterator
from datetime import date
from functools import partial
from typing import Annotated, Any, Literal, LiteralString, NamedTuple, NoReturn, Self, TypeVar

from pydantic import BaseModel, BeforeValidator, ConfigDict, WithJsonSchema, model_validator
from pydantic_core import PydanticCustomError

from acceptance.errors import MeasurementError
from acceptance.units import Rate, parse_quantity, parse_quantity_with_bound, parse_rate, quoted

__all__ = [
    "ANY",
    "EXAMPLES",
    "FAULT",
    "Average",
    "Capacitance",
    "Current",
    "Day",
    "Degrees",
    "Frequency",
    "InputOrAny",
    "Kelvin",
    "LeadResistance",
    "Loads",
    "Note",
    "Part",
    "Power",
    "Problem",
    "Ratio",
    "RatioFromZero",
    "RatioRange",
    "Resistance",
    "Settled",
    "TemperatureCoefficient",
    "Text",
    "ThermalResistance",
    "Time",
    "Voltage",
    "VoltageFromZero",
    "VoltageRange",
    "Whole",
    "Written",
    "refuse",
]

ANY = "any"
FAULT: LiteralString = "acceptance"  # the kind of every fault that this package words itself
T = TypeVar("T")

EXAMPLES = {
    "voltage": "24 V",
    "current": "5 A",
    "power": "0.21 W",
    "resistance": "12 mohm",
    "capacitance": "100 uF",
    "time": "2 s",
    "frequency": "50 Hz",
    "temperature": "40 °C",
    "temperature difference": "35 K",
    "ratio": "88 %",
    "thermal resistance": "5 K/W",
    "temperature coefficient": "50 ppm/K",
}
PAIRS = {"voltage": "[207 V, 253 V]", "ratio": "[105 %, 130 %]"}
# an editor reads a plain 1.10 or no as a number or a truth value; the loader keeps the text as written
SCALAR = ["string", "number", "boolean"]


class Problem(NamedTuple):
    """One thing wrong with a value."""

    found: str
    expected: str
    at: tuple[str | int, ...] = ()  # from the value that was checked to the part of it that is wrong


def refuse(found: str, expected: str, *, at: tuple[str | int, ...] = ()) -> NoReturn:
    """Raise one problem as a fault."""
    raise PydanticCustomError(FAULT, "refused", {"problems": (Problem(found, expected, at),)})


class Part(BaseModel):
    """A mapping of the file; an unknown key in it is a fault."""

    # only the two files' models are ever asked to validate, so that only their validators are built
    model_config = ConfigDict(extra="forbid", frozen=True, defer_build=True)

    def problems(self) -> Iterator[Problem]:
        """What is wrong between the values of this mapping, each of them being right by itself."""
        yield from ()

    @model_validator(mode="after")
    def _agrees_with_itself(self) -> Self:
        if problems := tuple(self.problems()):
            raise PydanticCustomError(FAULT, "refused", {"problems": problems})
        return self


def _read(value: object, reader: Callable[[str], T], expected: str, *, at: tuple[str | int, ...] = ()) -> T:
    if not isinstance(value, str):
        refuse(f"a {'list' if isinstance(value, list | tuple) else 'mapping'} stands here", expected, at=at)
    if not value:
        refuse("no value is given", expected, at=at)
    try:
        return reader(value)
    except MeasurementError as problem:
        refuse(str(problem), expected, at=at)


def _example(kind: str) -> str:
    return f"expected a {kind} with its unit, such as {EXAMPLES[kind]}"


def _schema(kind: str, **more: Any) -> WithJsonSchema:
    description = f"a {kind} with its unit, such as {EXAMPLES[kind]}"
    return WithJsonSchema({"type": "string", "description": description, "examples": [EXAMPLES[kind]], **more})


def _signed(kind: str, sign: str) -> Callable[[str], float]:
    """A reader of quantities that refuses those on the wrong side of zero."""

    def read(text: str) -> float:
        number = parse_quantity(text, kind)
        if (sign == "positive" and number <= 0) or (sign == "not negative" and number < 0):
            msg = f"{quoted(text)} is {'not above' if sign == 'positive' else 'below'} zero"
            raise MeasurementError(msg)
        return number

    return read


def _quantity(kind: str, *, sign: Literal["any", "positive", "not negative"] = "positive") -> BeforeValidator:
    return BeforeValidator(partial(_read, reader=_signed(kind, sign), expected=_example(kind)))


def _input_or_any(value: object) -> float | str:
    return ANY if value == ANY else _read(value, _signed("voltage", "positive"), f'{_example("voltage")}, or "any"')


def _pair(kind: str) -> BeforeValidator:
    expected = f"expected two of them, the smaller first, such as {PAIRS[kind]}"

    def read(value: object) -> tuple[float, float]:
        if not isinstance(value, list) or len(value) != 2:
            refuse("this is not a list of two", expected)
        reader = partial(parse_quantity, kind=kind)
        low, high = (_read(v, reader, _example(kind), at=(i,)) for i, v in enumerate(value))
        if low >= high:
            refuse(f"the range from {quoted(value[0])} to {quoted(value[1])} is reversed or empty", expected)
        return low, high

    return BeforeValidator(read)


def _pair_schema(kind: str) -> WithJsonSchema:
    items = {"type": "string", "examples": [EXAMPLES[kind]]}
    description = f"the smaller and the larger {kind}, such as {PAIRS[kind]}"
    return WithJsonSchema({"type": "array", "items": items, "minItems": 2, "maxItems": 2, "description": description})


def _lead_resistance(value: object) -> tuple[float, float | None]:
    def read(text: str) -> tuple[float, float | None]:
        resistance, bound = parse_quantity_with_bound(text, "resistance")
        if resistance < 0:
            msg = f"{quoted(text)} is below zero"
            raise MeasurementError(msg)
        return resistance, bound

    return _read(value, read, "expected a resistance, with its bound where known, such as 12 mohm ± 2 mohm")


def _whole(value: object) -> int:
    def read(text: str) -> int:
        if not re.fullmatch(r"[0-9]{1,6}", text) or int(text) < 1:
            msg = f"{quoted(text)} is no whole number above zero"
            raise MeasurementError(msg)
        return int(text)

    return _read(value, read, "expected one without a unit, such as 16")


def _day(value: object) -> date:
    def read(text: str) -> date:
        try:
            return date.fromisoformat(text if re.fullmatch(r"[0-9]{4}-[0-9]{2}-[0-9]{2}", text) else "")
        except ValueError:
            msg = f"{quoted(text)} is no date"
            raise MeasurementError(msg) from None

    return _read(value, read, "expected year, month and day, such as 2027-03-01")


def _line(text: str) -> str:
    if not text.strip() or "\n" in text:
        msg = "the text runs over several lines" if text.strip() else "an empty text stands here"
        raise MeasurementError(msg)
    return text


def _text(value: object) -> str:
    return _read(value, _line, "expected a text on one line")


def _note(value: object) -> str:
    return _read(value, str, "expected a text")


def _loads(value: object) -> Any:
    """One load for every output, or one for each that is named."""
    expected = 'expected a load with its unit, such as 50 %, "any", or one for each output, such as {main: 50 %}'
    one = _signed("ratio", "not negative")
    if value == ANY:
        return ANY
    if not isinstance(value, dict):
        return _read(value, one, expected)
    if not value:
        refuse("no load is given", expected)
    return {
        name: ANY if load == ANY else _read(load, one, 'expected a load such as 50 %, or "any"', at=(name,))
        for name, load in value.items()
    }


def _average(value: object) -> tuple[float, ...]:
    expected = "expected loads such as [25 %, 50 %, 75 %, 100 %]"
    if not isinstance(value, list) or len(value) < 2:
        refuse("this is not a list of two loads or more", expected)
    loads: list[float] = []
    for i, text in enumerate(value):
        load = _read(text, _signed("ratio", "positive"), "expected a load such as 25 %", at=(i,))
        if load > 1:
            refuse(f"load {100 * load:g} % is above rated current", "expected at most 100 %", at=(i,))
        if load in loads:
            refuse(f"load {100 * load:g} % stands twice in the average", "expected each load once", at=(i,))
        loads.append(load)
    return tuple(loads)


def _settled(value: object) -> Rate:
    return _read(value, parse_rate, "expected a change within a time, such as 1 K/30 min")


Voltage = Annotated[float, _quantity("voltage"), _schema("voltage")]
VoltageFromZero = Annotated[float, _quantity("voltage", sign="not negative"), _schema("voltage")]
Current = Annotated[float, _quantity("current"), _schema("current")]
Power = Annotated[float, _quantity("power"), _schema("power")]
Resistance = Annotated[float, _quantity("resistance"), _schema("resistance")]
Capacitance = Annotated[float, _quantity("capacitance"), _schema("capacitance")]
Time = Annotated[float, _quantity("time", sign="not negative"), _schema("time")]
Frequency = Annotated[float, _quantity("frequency"), _schema("frequency")]
Degrees = Annotated[float, _quantity("temperature", sign="any"), _schema("temperature")]
Kelvin = Annotated[float, _quantity("temperature difference"), _schema("temperature difference")]
Ratio = Annotated[float, _quantity("ratio"), _schema("ratio")]
RatioFromZero = Annotated[float, _quantity("ratio", sign="not negative"), _schema("ratio")]
ThermalResistance = Annotated[
    float, _quantity("thermal resistance", sign="not negative"), _schema("thermal resistance")
]
TemperatureCoefficient = Annotated[
    float, _quantity("temperature coefficient", sign="not negative"), _schema("temperature coefficient")
]
InputOrAny = Annotated[
    float | str,
    BeforeValidator(_input_or_any),
    WithJsonSchema({"type": "string", "description": "an input voltage, or any", "examples": ["230 V", "any"]}),
]
VoltageRange = Annotated[tuple[float, float], _pair("voltage"), _pair_schema("voltage")]
RatioRange = Annotated[tuple[float, float], _pair("ratio"), _pair_schema("ratio")]
Text = Annotated[str, BeforeValidator(_text), WithJsonSchema({"type": SCALAR})]
Note = Annotated[str, BeforeValidator(_note), WithJsonSchema({"type": SCALAR, "description": "printed, not judged"})]
Whole = Annotated[
    int, BeforeValidator(_whole), WithJsonSchema({"type": ["string", "integer"], "examples": ["16"], "minimum": 1})
]
Day = Annotated[
    date,
    BeforeValidator(_day),
    WithJsonSchema({"type": "string", "format": "date", "examples": ["2027-03-01"], "description": "year-month-day"}),
]
LeadResistance = Annotated[
    Any,  # resistance and bound, both in ohm; None where no bound is written
    BeforeValidator(_lead_resistance),
    WithJsonSchema({"type": "string", "examples": ["12 mohm", "12 mohm ± 2 mohm"]}),
]
Written = Annotated[str, BeforeValidator(_text), WithJsonSchema({"type": SCALAR})]  # read later, its kind being known
Settled = Annotated[
    Rate,
    BeforeValidator(_settled),
    WithJsonSchema({"type": "string", "examples": ["1 K/30 min"], "description": "a change within a time"}),
]
Average = Annotated[
    tuple[float, ...],
    BeforeValidator(_average),
    WithJsonSchema(
        {"type": "array", "items": {"type": "string"}, "minItems": 2, "examples": [["25 %", "50 %", "75 %", "100 %"]]}
    ),
]
Loads = Annotated[
    Any,  # a fraction of rated current, "any", or a mapping of outputs to these
    BeforeValidator(_loads),
    WithJsonSchema(
        {
            "anyOf": [
                {"type": "string", "examples": ["50 %", "any"]},
                {"type": "object", "additionalProperties": {"type": "string"}, "minProperties": 1},
            ],
            "description": "a load as a share of rated current, any, or one load for each output",
        }
    ),
]
