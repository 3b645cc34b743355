"""The shape of a limits file and of a bench file.

These models are the file: their fields are its keys. Values are SI numbers once loaded; ratios are fractions.
A fault's text says what was found, then after "; " what is expected; `load` adds the place.
"""

from __future__ import annotations

import re
from collections.abc import Callable
from datetime import date
from functools import partial
from typing import Annotated, Any, ClassVar, Literal, LiteralString, NoReturn, Self, TypeVar

from pydantic import BaseModel, BeforeValidator, ConfigDict, Field, WithJsonSchema, model_validator
from pydantic_core import PydanticCustomError

from acceptance.errors import MeasurementError
from acceptance.units import Rate, parse_quantity, parse_quantity_with_bound, parse_rate

__all__ = [
    "Adc",
    "Average",
    "BenchFile",
    "Conditions",
    "Decision",
    "Efficiency",
    "Instrument",
    "LimitsFile",
    "LineRegulation",
    "LoadRegulation",
    "LogColumns",
    "NoLoadPower",
    "Output",
    "OutputVoltage",
    "Overcurrent",
    "Product",
    "Published",
    "Ratings",
    "Requirement",
    "Ripple",
    "Shunt",
    "Temperature",
    "TemperatureRise",
]

ANY = "any"
_FAULT: LiteralString = "acceptance"  # the kind of every fault that this module words itself
T = TypeVar("T")


def refuse(found: str, expected: str) -> NoReturn:
    """Raise a fault in the words of this project; braces are doubled since pydantic formats the text."""
    text = f"{found}; {expected}".replace("{", "{{").replace("}", "}}")
    raise PydanticCustomError(_FAULT, text)


_EXAMPLES = {
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


def _read(value: object, reader: Callable[[str], T], expected: str) -> T:
    if not isinstance(value, str):
        shown = "a list" if isinstance(value, list) else "a mapping" if isinstance(value, dict) else repr(value)
        refuse(f"{shown} stands here", f"expected {expected}")
    try:
        return reader(value)
    except MeasurementError as problem:
        refuse(str(problem), f"expected {expected}")


def _schema(kind: str, **more: Any) -> WithJsonSchema:
    example = _EXAMPLES[kind]
    return WithJsonSchema(
        {"type": "string", "description": f"a {kind}, such as {example}", "examples": [example], **more}
    )


def _quantity(kind: str, *, sign: Literal["any", "positive", "not negative"] = "positive") -> BeforeValidator:
    expected = f"a {kind} with its unit, such as {_EXAMPLES[kind]}"

    def read(value: object) -> float:
        number = _read(value, partial(parse_quantity, kind=kind), expected)
        if (sign == "positive" and number <= 0) or (sign == "not negative" and number < 0):
            refuse(f'"{value}" is {"not above" if sign == "positive" else "below"} zero', f"expected {expected}")
        return number

    return BeforeValidator(read)


def _or_any(kind: str) -> BeforeValidator:
    expected = f'a {kind} with its unit, such as {_EXAMPLES[kind]}, or "any"'

    def read(value: object) -> float | str:
        if value == ANY:
            return ANY
        number = _read(value, partial(parse_quantity, kind=kind), expected)
        if number < 0:
            refuse(f'"{value}" is below zero', f"expected {expected}")
        return number

    return BeforeValidator(read)


def _pair(kind: str) -> BeforeValidator:
    expected = f"two of them, the smaller first, such as [{_EXAMPLES[kind]}, ...]"

    def read(value: object) -> tuple[float, float]:
        if not isinstance(value, list) or len(value) != 2:
            refuse("this is not a list of two", f"expected {expected}")
        reader = partial(parse_quantity, kind=kind)
        low, high = (_read(v, reader, f"a {kind} with its unit, such as {_EXAMPLES[kind]}") for v in value)
        if low >= high:
            refuse(f"the range [{value[0]}, {value[1]}] is reversed or empty", "expected the smaller end first")
        return low, high

    return BeforeValidator(read)


PAIR = WithJsonSchema({"type": "array", "items": {"type": "string"}, "minItems": 2, "maxItems": 2})


def _bounded(value: object, kind: str) -> tuple[float, float | None]:
    expected = f"a {kind} with its unit, and ± its bound where known, such as {_EXAMPLES[kind]}"
    return _read(value, partial(parse_quantity_with_bound, kind=kind), expected)


def _number(value: object) -> float:
    def read(text: str) -> float:
        if not re.fullmatch(r"[+-]?(\d+\.?\d*|\.\d+)", text):
            msg = f'"{text}" is no plain number'
            raise MeasurementError(msg)
        return float(text)

    return _read(value, read, "a plain number without a unit")


def _whole(value: object) -> int:
    number = _number(value)
    if number != int(number) or number < 1:
        refuse(f'"{value}" is no whole number above zero', "expected one, such as 16")
    return int(number)


def _day(value: object) -> date:
    def read(text: str) -> date:
        try:
            return date.fromisoformat(text)
        except ValueError:
            msg = f'"{text}" is no date'
            raise MeasurementError(msg) from None

    return _read(value, read, "a date such as 2027-03-01")


def _text(value: object) -> str:
    return _read(value, _plain, "a text")


def _plain(text: str) -> str:
    if not text.strip():
        msg = "an empty text stands here"
        raise MeasurementError(msg)
    return text


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
    _or_any("voltage"),
    WithJsonSchema({"type": "string", "description": "a voltage, or any", "examples": ["230 V", "any"]}),
]
VoltageRange = Annotated[tuple[float, float], _pair("voltage"), PAIR]
RatioRange = Annotated[tuple[float, float], _pair("ratio"), PAIR]
Text = Annotated[str, BeforeValidator(_text)]
Day = Annotated[date, BeforeValidator(_day), WithJsonSchema({"type": "string", "format": "date"})]


class Part(BaseModel):
    """A mapping of the file; an unknown key in it is a fault."""

    model_config = ConfigDict(extra="forbid", frozen=True)


# --- the product ----------------------------------------------------------------------------------------------------


class Product(Part):
    """What is tested."""

    name: Text
    revision: Text | None = None
    protection_class: Literal["I", "II", "III"] | None = None


class InputRating(Part):
    """What the unit is fed with."""

    supply: Literal["ac", "dc"]
    voltage: Voltage
    range: VoltageRange | None = None
    frequency: Frequency | None = None


class Output(Part):
    """One rated output."""

    voltage: Voltage
    current: Current


class Ratings(Part):
    """The product's plate."""

    input: InputRating
    outputs: dict[str, Output]
    ambient: Degrees | None = None
    # what the cautions need to know; unknown means that all are printed
    stored_charge: StoredCharge | None = None

    @model_validator(mode="after")
    def _has_outputs(self) -> Self:
        if not self.outputs:
            refuse("outputs names none", "expected at least one, such as main: {voltage: 24 V, current: 5 A}")
        return self


class StoredCharge(Part):
    """The largest capacitor that stays charged, and what discharges it."""

    capacitance: Capacitance
    voltage: Voltage
    bleeder: Resistance


class Tolerance(Part):
    """How far a dwell may lie from a condition and still meet it."""

    load: Ratio | None = None  # of rated current; default 2 percentage points, 1 at 10 % and below
    input: Ratio | None = None  # of the input voltage; default 1 %


class Decision(Part):
    """How a value and its uncertainty become a verdict."""

    rule: Literal["simple", "guarded", "conditional"] = "guarded"
    confidence: Ratio = 0.95
    tolerance: Tolerance = Tolerance()

    @model_validator(mode="after")
    def _confidence_makes_sense(self) -> Self:
        if not 0.5 <= self.confidence < 1:
            refuse(
                f"confidence {self.confidence:.6g} is no level of confidence",
                "expected 50 % up to below 100 %, such as 95 %",
            )
        return self


# --- requirements ---------------------------------------------------------------------------------------------------


def _loads(value: object) -> Any:
    """One load for every output, or one for each that is named."""
    expected = 'a load with its unit, such as 50 %, "any", or one for each output, such as {main: 50 %}'
    one = partial(parse_quantity, kind="ratio")
    if isinstance(value, dict):
        return {name: (ANY if v == ANY else _read(v, one, "a load such as 50 %")) for name, v in value.items()}
    if value == ANY:
        return ANY
    load = _read(value, one, expected)
    if load < 0:
        refuse(f'"{value}" is below zero', f"expected {expected}")
    return load


Loads = Annotated[
    Any,
    BeforeValidator(_loads),
    WithJsonSchema(
        {
            "anyOf": [
                {"type": "string", "examples": ["50 %", "any"]},
                {"type": "object", "additionalProperties": {"type": "string"}},
            ],
            "description": "a load as a share of rated current, any, or one load for each output",
        }
    ),
]


class Conditions(Part):
    """Where a requirement is to be met; `any` is allowed, leaving out what matters is not."""

    load: Loads | None = None  # fraction of rated current, "any", or a mapping of outputs to them
    input: InputOrAny | None = None  # [V] or "any"


class Requirement(Part):
    """One line of the limits file."""

    characteristic: ClassVar[str]
    needs: ClassVar[tuple[str, ...]] = ()  # conditions that must be given
    takes: ClassVar[tuple[str, ...]] = ("load", "input")  # conditions that may be given

    name: Text | None = None
    note: Text | None = None
    output: Text | None = None

    @model_validator(mode="after")
    def _conditions_are_given(self) -> Self:
        at = getattr(self, "at", None)
        for key in self.needs:
            if at is None or getattr(at, key) is None:
                word = {"load": "load: 50 %", "input": "input: 230 V"}[key]
                refuse(f"the {key} is not given", f'expected it under at:, such as at: {{{word}}}, or "any"')
        for key in ("load", "input"):
            if at is not None and getattr(at, key) is not None and key not in self.takes:
                refuse(f"{self.characteristic} takes no {key} under at:", "expected it left out")
        return self


def _one_of(part: Requirement, *keys: str) -> None:
    if all(getattr(part, key) is None for key in keys):
        refuse("no limit is given", "expected " + " or ".join(keys))


def _in_order(low: float | None, high: float | None, names: str) -> None:
    if low is not None and high is not None and low >= high:
        refuse(f"{names} are reversed or equal", "expected the smaller one first")


def _not_above_rated(at: Conditions | None, characteristic: str) -> None:
    loads = at.load if at is not None else None
    values = list(loads.values()) if isinstance(loads, dict) else [loads]
    for load in values:
        if isinstance(load, float) and load > 1:
            refuse(
                f"load {100 * load:g} % under {characteristic} is above rated current",
                "expected at most 100 %; tests above it belong under overcurrent",
            )


def _average(value: object) -> tuple[float, ...]:
    if not isinstance(value, list) or len(value) < 2:
        refuse("this is not a list of two loads or more", "expected loads such as [25 %, 50 %, 75 %, 100 %]")
    loads = tuple(_read(v, partial(parse_quantity, kind="ratio"), "a load such as 25 %") for v in value)
    if any(not 0 < load <= 1 for load in loads) or len(set(loads)) != len(loads):
        refuse("the loads are not all different and between 0 and 100 %", "expected such as [25 %, 50 %, 75 %, 100 %]")
    return loads


Average = Annotated[
    tuple[float, ...],
    BeforeValidator(_average),
    WithJsonSchema(
        {"type": "array", "items": {"type": "string"}, "minItems": 2, "examples": [["25 %", "50 %", "75 %", "100 %"]]}
    ),
]


class Efficiency(Requirement):
    """Output power over input power, at one load or as the mean of several."""

    characteristic = "efficiency"
    needs = ("input",)
    at: Conditions | None = None
    average: Average | None = None
    min: RatioFromZero | None = None
    max: Ratio | None = None

    @model_validator(mode="after")
    def _is_complete(self) -> Self:
        _one_of(self, "min", "max")
        _in_order(self.min, self.max, "min and max")
        _not_above_rated(self.at, "efficiency")
        load = self.at.load if self.at else None
        if self.average is None and load is None:
            refuse("the load is not given", 'expected it under at:, such as at: {load: 50 %}, "any", or average: [...]')
        if self.average is not None and load is not None:
            refuse("a load under at: and an average are both given", "expected one of them")
        if load == 0:
            refuse("efficiency at no load is always zero", "expected a load above 0 %, or no_load_power")
        return self


class NoLoadPower(Requirement):
    """Mean power drawn with nothing connected to the outputs."""

    characteristic = "no_load_power"
    needs = ("input",)
    takes = ("input",)
    at: Conditions | None = None
    max: Power


class LoadRegulation(Requirement):
    """Spread of the output voltage over a span of load."""

    characteristic = "load_regulation"
    needs = ("input",)
    from_: RatioFromZero = Field(alias="from")
    to: Ratio
    at: Conditions | None = None  # a load given here is that of the other outputs
    max: Ratio
    relative_to: Literal["full load", "nominal", "no load", "half load"] = "full load"

    @model_validator(mode="after")
    def _spans_a_range(self) -> Self:
        _in_order(self.from_, self.to, "from and to")
        if self.to > 1:
            refuse(f"to {100 * self.to:g} % is above rated current", "expected at most 100 %")
        if self.at is not None and self.at.load is not None and not isinstance(self.at.load, dict):
            refuse(
                "load_regulation sweeps the load itself",
                "expected from: and to:, and under at: only other outputs' loads by name",
            )
        return self


class LineRegulation(Requirement):
    """Spread of the output voltage over a span of input voltage."""

    characteristic = "line_regulation"
    needs = ("load",)
    takes = ("load",)
    from_: Voltage = Field(alias="from")
    to: Voltage
    at: Conditions | None = None
    max: Ratio

    @model_validator(mode="after")
    def _spans_a_range(self) -> Self:
        _in_order(self.from_, self.to, "from and to")
        _not_above_rated(self.at, "line_regulation")
        return self


class OutputVoltage(Requirement):
    """A band that every steady output voltage lies in."""

    characteristic = "output_voltage"
    needs = ("load", "input")
    at: Conditions | None = None
    within: Ratio | None = None  # of the rated voltage, to either side
    min: VoltageFromZero | None = None
    max: Voltage | None = None

    @model_validator(mode="after")
    def _is_complete(self) -> Self:
        _one_of(self, "within", "min", "max")
        if self.within is not None and (self.min is not None or self.max is not None):
            refuse("within and min or max are both given", "expected one kind of limit")
        _in_order(self.min, self.max, "min and max")
        _not_above_rated(self.at, "output_voltage")
        return self


class ShortCircuit(Part):
    """Current into a short, as a share of rated current."""

    max: Ratio | None = None
    min: RatioFromZero | None = None


class Recovery(Part):
    """How soon the output is back once the overload is gone."""

    within: Time
    band: Ratio = 0.01


class Overcurrent(Requirement):
    """What the output does when more than its rated current is drawn."""

    characteristic = "overcurrent"
    needs = ("input",)
    takes = ("input",)
    at: Conditions | None = None
    behaviour: Literal["constant current", "constant power", "foldback", "hiccup", "latch off", "any"] | None = None
    onset: RatioRange | None = None
    droop: Ratio = 0.05
    short_circuit: ShortCircuit | None = None
    recovery: Recovery | None = None

    @model_validator(mode="after")
    def _asks_something(self) -> Self:
        _one_of(self, "behaviour", "onset", "short_circuit", "recovery")
        return self


def _settled(value: object) -> Rate:
    return _read(value, parse_rate, "a change within a time, such as 1 K/30 min")


Settled = Annotated[Rate, BeforeValidator(_settled), WithJsonSchema({"type": "string", "examples": ["1 K/30 min"]})]


class TemperatureRise(Requirement):
    """Rise of a probe or winding over the ambient at the same moment."""

    characteristic = "temperature_rise"
    needs = ("load", "input")
    probe: Text
    at: Conditions | None = None
    max: Kelvin
    settled: Settled = Rate(1.0, 1800.0)
    method: Literal["probe", "resistance"] = "probe"
    material: Literal["copper", "aluminium"] | None = None


class Temperature(Requirement):
    """Temperature of a probe, adjusted to the rated ambient where asked."""

    characteristic = "temperature"
    needs = ("load", "input")
    probe: Text
    at: Conditions | None = None
    max: Degrees | None = None
    class_: Annotated[Text | None, Field(alias="class")] = None
    settled: Settled = Rate(1.0, 1800.0)
    adjust: Literal["rated ambient", "none"] = "none"


class Ripple(Requirement):
    """Largest reading of the ripple on an output."""

    characteristic = "ripple"
    needs = ("load", "input")
    at: Conditions | None = None
    max: Voltage
    kind: Literal["p-p", "rms"] = "p-p"
    bandwidth: Frequency | None = None

    @model_validator(mode="after")
    def _is_complete(self) -> Self:
        _not_above_rated(self.at, "ripple")
        return self


class Published(Requirement):
    """A named set of published limits."""

    characteristic = "published"
    takes = ()
    set_: Text = Field(alias="set")
    class_: Annotated[Text | None, Field(alias="class")] = None


class Requirements(Part):
    """What must be met, by characteristic."""

    published: tuple[Published, ...] = ()
    efficiency: tuple[Efficiency, ...] = ()
    no_load_power: tuple[NoLoadPower, ...] = ()
    load_regulation: tuple[LoadRegulation, ...] = ()
    line_regulation: tuple[LineRegulation, ...] = ()
    output_voltage: tuple[OutputVoltage, ...] = ()
    overcurrent: tuple[Overcurrent, ...] = ()
    temperature_rise: tuple[TemperatureRise, ...] = ()
    temperature: tuple[Temperature, ...] = ()
    ripple: tuple[Ripple, ...] = ()

    def all(self) -> list[Requirement]:
        """Every requirement, in the order of the characteristics above."""
        return [entry for name in type(self).model_fields for entry in getattr(self, name)]


# --- the bench ------------------------------------------------------------------------------------------------------


class ColumnChoice(Part):
    """Which heading holds a quantity, and in which unit where the heading does not say."""

    heading: Text
    unit: Text | None = None


def _column(value: object) -> object:
    return {"heading": value} if isinstance(value, str) else value


class LogColumns(Part):
    """How this bench's logs are headed, where a heading does not explain itself."""

    columns: dict[str, Annotated[ColumnChoice, BeforeValidator(_column)]] = {}
    stated: dict[str, Annotated[Any, BeforeValidator(_text)]] = {}  # channel -> text; read by the loader
    load_mode: Literal["CC", "CR", "CV", "CP"] | None = None
    settle: Time | None = None
    min_dwell: Time | None = None


class Shunt(Part):
    """A resistor that a current was read across."""

    resistance: Resistance
    tolerance: RatioFromZero | None = None
    temperature_coefficient: TemperatureCoefficient | None = None
    heating: ThermalResistance | None = None


class Adc(Part):
    """The converter behind a reading; its volts are those at its input."""

    bits: Annotated[int, BeforeValidator(_whole)]
    span: VoltageRange
    offset: VoltageFromZero | None = None


class Instrument(Part):
    """What measured one quantity, and how well."""

    device: Text
    accuracy: Annotated[str, BeforeValidator(_text)] | None = None  # parsed by `accuracy_of`, which knows the quantity
    meter_range: Annotated[str, BeforeValidator(_text)] | None = None  # a quantity, or "auto"
    resolution: Annotated[str, BeforeValidator(_text)] | None = None
    shunt: Shunt | None = None
    adc: Adc | None = None
    due: Day | None = None
    serial: Text | None = None
    note: Text | None = None


class BenchFile(Part):
    """What measured the unit: `--bench FILE`, or part of the limits file."""

    acceptance: Literal["1"] | None = None
    log: LogColumns = LogColumns()
    instruments: dict[str, Instrument] = {}
    lead_resistance: dict[str, Annotated[Any, BeforeValidator(partial(_bounded, kind="resistance"))]] = {}


class LimitsFile(BenchFile):
    """What the unit must meet."""

    acceptance: Literal["1"]
    product: Product
    ratings: Ratings
    decision: Decision = Decision()
    limits: Requirements
    lot: dict[str, Any] | None = None


Ratings.model_rebuild()
