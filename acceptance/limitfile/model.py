"""The shape of a limits file and of a bench file.

These models are the file: their fields are its keys. Values are SI numbers once loaded; ratios are fractions.
"""

# without postponed annotations: pydantic would evaluate each of them anew, which takes a third of the import
from collections.abc import Iterator
from typing import TYPE_CHECKING, Annotated, Any, Literal

from pydantic import BeforeValidator, Field

from acceptance.limitfile.fields import (
    Average,
    Capacitance,
    Current,
    Day,
    Degrees,
    Frequency,
    LeadResistance,
    Note,
    Part,
    Problem,
    Ratio,
    RatioFromZero,
    Resistance,
    TemperatureCoefficient,
    Text,
    ThermalResistance,
    Time,
    Voltage,
    VoltageFromZero,
    VoltageRange,
    Whole,
    Written,
)
from acceptance.limitfile.requirement import (
    Conditions,
    Efficiency,
    LineRegulation,
    LoadRegulation,
    NoLoadPower,
    OutputVoltage,
    Overcurrent,
    Published,
    Requirement,
    Requirements,
    Ripple,
    Temperature,
    TemperatureRise,
)

if TYPE_CHECKING:
    from pydantic import GetJsonSchemaHandler
    from pydantic_core import CoreSchema

__all__ = [
    "Adc",
    "Attributes",
    "Average",
    "BenchFile",
    "ColumnChoice",
    "Conditions",
    "Decision",
    "Efficiency",
    "EveryUnit",
    "InputRating",
    "Instrument",
    "LimitsFile",
    "LineRegulation",
    "LoadRegulation",
    "LogColumns",
    "Lot",
    "NoLoadPower",
    "Output",
    "OutputVoltage",
    "Overcurrent",
    "Product",
    "Published",
    "Ratings",
    "Requirement",
    "Requirements",
    "Ripple",
    "Shunt",
    "StoredCharge",
    "Temperature",
    "TemperatureRise",
    "Tolerance",
    "ToleranceInterval",
    "Variables",
]

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
    frequency: Frequency | None = Field(default=None, description="of an a.c. supply")

    def problems(self) -> Iterator[Problem]:
        """A frequency only for a.c., and the rated voltage within its range."""
        if self.supply == "dc" and self.frequency is not None:
            yield Problem("a d.c. supply has a frequency", "expected supply: ac, or no frequency", ("frequency",))
        if self.range is not None and not self.range[0] <= self.voltage <= self.range[1]:
            expected = f"expected {self.range[0]:g} V to {self.range[1]:g} V"
            yield Problem("the rated voltage lies outside its range", expected, ("voltage",))


class Output(Part):
    """One rated output."""

    voltage: Voltage
    current: Current


class StoredCharge(Part):
    """The largest capacitor that stays charged, and what discharges it."""

    capacitance: Capacitance
    voltage: Voltage
    bleeder: Resistance


class Ratings(Part):
    """The product's plate."""

    input: InputRating
    outputs: dict[str, Output] = Field(description="the rated outputs by name; the first one is the default")
    ambient: Degrees | None = Field(default=None, description="highest rated ambient temperature, such as 40 °C")
    # what the cautions need to know; unknown means that all are printed
    stored_charge: StoredCharge | None = None

    def problems(self) -> Iterator[Problem]:
        """At least one output."""
        if not self.outputs:
            expected = "expected at least one, such as main: {voltage: 24 V, current: 5 A}"
            yield Problem("outputs names none", expected, ("outputs",))


class Tolerance(Part):
    """How far a dwell may lie from a condition and still meet it."""

    load: Ratio | None = Field(default=None, description="of rated current; default 2 %, and 1 % at loads up to 10 %")
    input: Ratio | None = Field(default=None, description="of the input voltage; default 1 %")

    def problems(self) -> Iterator[Problem]:
        """A tolerance as large as the quantity itself would let every dwell meet every condition."""
        for key, share in (("load", self.load), ("input", self.input)):
            if share is not None and share >= 1:
                yield Problem(f"a tolerance of {100 * share:g} % is none", "expected one such as 2 %", (key,))


class Decision(Part):
    """How a value and its uncertainty become a verdict."""

    rule: Literal["simple", "guarded", "conditional"] = "guarded"
    confidence: Ratio = 0.95
    tolerance: Tolerance = Field(default_factory=Tolerance.model_construct)

    def problems(self) -> Iterator[Problem]:
        """A confidence that is one."""
        yield from _no_confidence(self.confidence)


def _no_confidence(confidence: float) -> Iterator[Problem]:
    if not 0.5 <= confidence < 1:
        found = f"{100 * confidence:g} % is no level of confidence"
        yield Problem(found, "expected 50 % up to below 100 %, such as 95 %", ("confidence",))


# --- the lot --------------------------------------------------------------------------------------------------------

Level = Annotated[
    Literal["I", "II", "III", "IV", "V", "S-1", "S-2", "S-3", "S-4"], Field(description="the inspection level")
]


class EveryUnit(Part):
    """Every unit of the lot is tested and must be accepted."""


class Attributes(Part):
    """A sample is counted: accepted units and others."""

    aql: Ratio = Field(description="acceptance quality limit, in per cent nonconforming")
    level: Level = "II"


class Variables(Part):
    """A sample is measured: its mean and spread decide."""

    aql: Ratio = Field(description="acceptance quality limit, in per cent nonconforming")
    level: Level = "II"


class ToleranceInterval(Part):
    """An interval that holds a share of the lot, at a confidence, must lie within the limits."""

    coverage: Ratio = Field(description="share of the lot")
    confidence: Ratio = 0.95

    def problems(self) -> Iterator[Problem]:
        """Shares below one."""
        yield from _no_confidence(self.confidence)
        if self.coverage >= 1:
            expected = "expected below 100 %, such as 99 %"
            yield Problem(f"a coverage of {100 * self.coverage:g} % cannot be shown", expected, ("coverage",))


class Lot(Part):
    """How a lot is decided; of several plans all must accept."""

    every_unit: EveryUnit | None = None
    attributes: Attributes | None = None
    variables: Variables | None = None
    tolerance: ToleranceInterval | None = None


# --- the bench ------------------------------------------------------------------------------------------------------


class ColumnChoice(Part):
    """Which heading holds a quantity, and in which unit where the heading does not say."""

    heading: Text
    unit: Text | None = None

    @classmethod
    def __get_pydantic_json_schema__(cls, schema: "CoreSchema", handler: "GetJsonSchemaHandler") -> dict[str, Any]:
        """Alone the heading, or a mapping with heading and unit."""
        heading = {"type": "string", "description": "the heading as it stands in the log"}
        mapping = handler.resolve_ref_schema(handler(schema))
        return {"anyOf": [heading, dict(mapping)]}


def _column(value: object) -> object:
    return {"heading": value} if isinstance(value, str) else value


Column = Annotated[ColumnChoice, BeforeValidator(_column)]


class LogColumns(Part):
    """How this bench's logs are headed, where a heading does not explain itself."""

    columns: dict[str, Column] = Field(default={}, description="quantity, and output or probe -> heading")
    stated: dict[str, Written] = Field(default={}, description="quantity -> value that was not logged, only stated")
    load_mode: Literal["CC", "CR", "CV", "CP"] | None = None
    settle: Time | None = Field(
        default=None, description="ignored at the start of every dwell; default: found from the data"
    )
    min_dwell: Time | None = Field(default=None, description="a shorter stretch is no dwell")


class Shunt(Part):
    """A resistor that a current was read across."""

    resistance: Resistance
    tolerance: RatioFromZero | None = None
    temperature_coefficient: TemperatureCoefficient | None = None
    heating: ThermalResistance | None = Field(default=None, description="how much it warms by the power it takes")


class Adc(Part):
    """The converter behind a reading; its volts are those at its input."""

    bits: Whole
    span: VoltageRange
    offset: VoltageFromZero | None = None

    def problems(self) -> Iterator[Problem]:
        """A resolution that exists."""
        if self.bits > 32:
            yield Problem(f"a converter of {self.bits} bits is not known", "expected at most 32", ("bits",))


class Instrument(Part):
    """What measured one quantity, and how well."""

    device: Text
    accuracy: Written | None = Field(
        default=None, description="a bound of error, such as 0.05 % reading + 0.02 % range + 3 digits, k = 2"
    )
    meter_range: Written | None = Field(default=None, description="the range it was set to, such as 60 V, or auto")
    resolution: Written | None = Field(default=None, description="the last digit's worth, such as 1 mV")
    shunt: Shunt | None = None
    adc: Adc | None = None
    due: Day | None = Field(default=None, description="when its calibration runs out")
    serial: Text | None = None
    note: Note | None = None


class BenchFile(Part):
    """What measured the unit: `--bench FILE`, or part of the limits file."""

    acceptance: Literal["1"] | None = Field(default=None, description="version of this format")
    log: LogColumns = Field(default_factory=LogColumns.model_construct)
    instruments: dict[str, Instrument] = Field(
        default={}, description="quantity, and output or probe -> what measured it"
    )
    lead_resistance: dict[str, LeadResistance] = Field(
        default={}, description="output, input or one output by name -> resistance of both leads together"
    )


class LimitsFile(BenchFile):
    """What the unit must meet."""

    acceptance: Literal["1"] = Field(description="version of this format")
    product: Product
    ratings: Ratings
    # a part that is left out is constructed, not validated: its validator would be built for that alone
    decision: Decision = Field(default_factory=Decision.model_construct)
    limits: Requirements
    lot: Lot | None = None
