"""The requirements of a limits file: one class a characteristic, its fields being the file's keys."""

# without postponed annotations: pydantic would evaluate each of them anew, which takes a third of the import
from collections.abc import Iterator
from typing import Annotated, ClassVar, Literal

from pydantic import Field

from acceptance.limitfile.fields import (
    Average,
    Current,
    Degrees,
    Frequency,
    InputOrAny,
    Kelvin,
    Loads,
    Note,
    Part,
    Power,
    Problem,
    Ratio,
    RatioFromZero,
    RatioRange,
    Settled,
    Text,
    Time,
    Voltage,
    VoltageFromZero,
    Whole,
)
from acceptance.units import Rate

__all__ = [
    "Conditions",
    "Efficiency",
    "LineRegulation",
    "LoadRegulation",
    "NoLoadPower",
    "OutputVoltage",
    "Overcurrent",
    "Published",
    "Recovery",
    "Requirement",
    "Requirements",
    "Ripple",
    "ShortCircuit",
    "Temperature",
    "TemperatureRise",
]

# limits that no product needs, and that a slip of the pen makes: 0.88 % for 88 %, 100 % for 1 %
_LOWEST_EFFICIENCY = 0.01
_WIDEST = 0.5  # of the output voltage: its spread, or its band to either side


class Conditions(Part):
    """Where a requirement is to be met; `any` is allowed, leaving out what matters is not."""

    load: Loads | None = None  # fraction of rated current, "any", or a mapping of outputs to them
    input: InputOrAny | None = None  # [V] or "any"


At = Annotated[Conditions | None, Field(description="the conditions: load and input, where they matter")]


class Requirement(Part):
    """One line of the limits file."""

    characteristic: ClassVar[str]
    needs: ClassVar[tuple[str, ...]] = ()  # conditions that must be given
    takes: ClassVar[tuple[str, ...]] = ("load", "input")  # conditions that may be given
    overload: ClassVar[bool] = False  # whether a load above rated current makes sense

    name: Text | None = Field(default=None, description="how findings are called; default: characteristic and number")
    note: Note | None = None
    output: Text | None = Field(default=None, description="the output it is about; default: the first one")

    def problems(self) -> Iterator[Problem]:
        """Conditions that are missing, of no use, or above what the product is rated for."""
        at: Conditions | None = getattr(self, "at", None)
        for key in ("load", "input"):
            given = at is not None and getattr(at, key) is not None
            if key in self.needs and not given:
                word = {"load": "load: 50 %", "input": "input: 230 V"}[key]
                expected = f'expected it under at:, such as at: {{{word}}}, or "any"'
                yield Problem(f"the {key} is not given", expected, ("at",))
            if given and key not in self.takes:
                yield Problem(f"{self.characteristic} takes no {key} under at:", "expected it left out", ("at", key))
        if at is not None and "load" in self.takes and not self.overload:
            yield from _above_rated(at.load, self.characteristic)


def _above_rated(loads: object, characteristic: str) -> Iterator[Problem]:
    named = loads if isinstance(loads, dict) else {"": loads}
    for output, load in named.items():
        if isinstance(load, float) and load > 1:
            yield Problem(
                f"load {100 * load:g} % under {characteristic} is above rated current",
                "expected at most 100 %; tests above it belong under overcurrent",
                ("at", "load", output) if output else ("at", "load"),
            )


def _lacks(part: Part, *keys: str) -> Iterator[Problem]:
    if all(getattr(part, key) is None for key in keys):
        yield Problem("no limit is given", "expected " + " or ".join(f"{key.rstrip('_')}:" for key in keys))


def _reversed(low: float | None, high: float | None, names: tuple[str, str]) -> Iterator[Problem]:
    if low is not None and high is not None and low >= high:
        found = f"{names[0]} and {names[1]} are reversed or equal"
        yield Problem(found, f"expected {names[0]} to be the smaller one", (names[1],))


def _wide(spread: float, characteristic: str) -> Iterator[Problem]:
    if spread >= _WIDEST:
        found = f"a {characteristic} of {100 * spread:g} % as max lets any pass"
        yield Problem(found, f"expected below {100 * _WIDEST:g} %, such as 1 %", ("max",))


class Efficiency(Requirement):
    """Output power over input power, at one load or as the mean of several."""

    characteristic = "efficiency"
    needs = ("input",)
    at: At = None
    average: Average | None = Field(default=None, description="the loads whose efficiencies are averaged")
    min: RatioFromZero | None = None
    max: Ratio | None = None

    def problems(self) -> Iterator[Problem]:
        """One load or an average, and a limit that can be met."""
        yield from super().problems()
        yield from _lacks(self, "min", "max")
        yield from _reversed(self.min, self.max, ("min", "max"))
        if self.min is None and self.max is not None:
            yield Problem("an efficiency with a max and no min lets any low one pass", "expected min:", ("max",))
        if self.min is not None and self.min < _LOWEST_EFFICIENCY:
            found = f"an efficiency of {100 * self.min:g} % as min lets any pass"
            yield Problem(found, "expected one such as 88 %", ("min",))
        for key, limit in (("min", self.min), ("max", self.max)):
            if limit is not None and limit > 1:
                yield Problem(f"an efficiency of {100 * limit:g} % cannot be", "expected at most 100 %", (key,))
        load = self.at.load if self.at else None
        if self.average is None and load is None:
            expected = 'expected it under at:, such as at: {load: 50 %}, "any", or average: [25 %, 50 %]'
            yield Problem("the load is not given", expected, ("at",))
        if self.average is not None and load is not None:
            yield Problem("a load under at: and an average are both given", "expected one of them", ("at", "load"))
        if load is not None and all(one == 0 for one in (load.values() if isinstance(load, dict) else [load])):
            expected = "expected a load above 0 %, or no_load_power"
            yield Problem("efficiency at no load is always zero", expected, ("at", "load"))


class NoLoadPower(Requirement):
    """Mean power drawn with nothing connected to the outputs."""

    characteristic = "no_load_power"
    needs = ("input",)
    takes = ("input",)
    at: At = None
    max: Power


class LoadRegulation(Requirement):
    """Spread of the output voltage over a span of load."""

    characteristic = "load_regulation"
    needs = ("input",)
    from_: RatioFromZero = Field(alias="from", description="the smallest load of the span")
    to: RatioFromZero = Field(description="the largest load of the span")
    at: At = None  # a load given here is that of the other outputs
    max: Ratio
    relative_to: Literal["full load", "nominal", "no load", "half load"] = Field(
        default="full load", description="the output voltage that the spread is divided by"
    )

    def problems(self) -> Iterator[Problem]:
        """A span of load within the rating, a limit that not every spread meets; other outputs' loads alone."""
        yield from super().problems()
        yield from _reversed(self.from_, self.to, ("from", "to"))
        yield from _wide(self.max, self.characteristic)
        for key, load in (("from", self.from_), ("to", self.to)):
            if load > 1:
                yield Problem(f"load {100 * load:g} % is above rated current", "expected at most 100 %", (key,))
        if self.at is not None and self.at.load is not None and not isinstance(self.at.load, dict):
            yield Problem(
                "load_regulation sweeps the load itself",
                "expected from: and to:, and under at: only other outputs' loads by name",
                ("at", "load"),
            )


class LineRegulation(Requirement):
    """Spread of the output voltage over a span of input voltage."""

    characteristic = "line_regulation"
    needs = ("load",)
    takes = ("load",)
    # zero is told with what it is wrong with: reversed, or no input voltage
    from_: VoltageFromZero = Field(alias="from", description="the smallest input voltage of the span")
    to: VoltageFromZero = Field(description="the largest input voltage of the span")
    at: At = None
    max: Ratio

    def problems(self) -> Iterator[Problem]:
        """A span of input voltage, and a limit that not every spread meets."""
        yield from super().problems()
        yield from _reversed(self.from_, self.to, ("from", "to"))
        if self.from_ == 0:
            expected = "expected the smallest input voltage of the span, such as 207 V"
            yield Problem("an input voltage of 0 V is not above zero", expected, ("from",))
        yield from _wide(self.max, self.characteristic)


class OutputVoltage(Requirement):
    """A band that every steady output voltage lies in."""

    characteristic = "output_voltage"
    needs = ("load", "input")
    at: At = None
    within: Ratio | None = Field(default=None, description="share of the rated voltage, to either side")
    min: VoltageFromZero | None = None
    max: Voltage | None = None

    def problems(self) -> Iterator[Problem]:
        """One kind of limit."""
        yield from super().problems()
        yield from _lacks(self, "within", "min", "max")
        if self.within is not None and (self.min is not None or self.max is not None):
            yield Problem("within and min or max are both given", "expected one kind of limit", ("within",))
        if self.within is not None and self.within >= _WIDEST:
            found = f"a band of {100 * self.within:g} % to either side lets any pass"
            yield Problem(found, f"expected below {100 * _WIDEST:g} %, such as 2 %", ("within",))
        yield from _reversed(self.min, self.max, ("min", "max"))


class ShortCircuit(Part):
    """Current into a short, as a share of rated current."""

    max: Ratio | None = None
    min: RatioFromZero | None = None

    def problems(self) -> Iterator[Problem]:
        """A limit, and limits in order."""
        yield from _lacks(self, "min", "max")
        yield from _reversed(self.min, self.max, ("min", "max"))


class Recovery(Part):
    """How soon the output is back once the overload is gone."""

    within: Time
    band: Ratio = Field(default=0.01, description="share of the rated voltage, to either side")


class Overcurrent(Requirement):
    """What the output does when more than its rated current is drawn."""

    characteristic = "overcurrent"
    needs = ("input",)
    takes = ("input",)
    at: At = None
    behaviour: Literal["constant current", "constant power", "foldback", "hiccup", "latch off", "any"] | None = None
    onset: RatioRange | None = Field(default=None, description="where limiting begins, as shares of rated current")
    droop: Ratio = Field(
        default=0.05, description="fall of the output, as a share of rated voltage, that marks the onset"
    )
    short_circuit: ShortCircuit | None = None
    recovery: Recovery | None = None

    def problems(self) -> Iterator[Problem]:
        """Something is asked."""
        yield from super().problems()
        yield from _lacks(self, "behaviour", "onset", "short_circuit", "recovery")
        if self.droop >= 1:
            yield Problem(f"a droop of {100 * self.droop:g} % is no droop", "expected one such as 5 %", ("droop",))


def _winding(method: str, material: str | None) -> Iterator[Problem]:
    """A winding's material where its resistance tells the temperature, and only there."""
    if method == "resistance" and material is None:
        yield Problem("the winding's material is not given", "expected material: copper, or aluminium")
    if method == "probe" and material is not None:
        yield Problem("a material is given for a probe", "expected method: resistance beside it", ("material",))


Method = Annotated[
    Literal["probe", "resistance"],
    Field(description="resistance: the mean of a winding, by stages cold, thermal and cooling"),
]
Material = Annotated[Literal["copper", "aluminium"] | None, Field(description="of the winding; method: resistance")]


class TemperatureRise(Requirement):
    """Rise of a probe or winding over the ambient at the same moment."""

    characteristic = "temperature_rise"
    needs = ("load", "input")
    probe: Text = Field(description="the probe's name in the log: case for temperature case")
    at: At = None
    max: Kelvin
    settled: Settled = Rate(1.0, 1800.0)
    method: Method = "probe"
    material: Material = None

    def problems(self) -> Iterator[Problem]:
        """The winding's material where its resistance tells the temperature."""
        yield from super().problems()
        yield from _winding(self.method, self.material)


class Temperature(Requirement):
    """Temperature of a probe or winding, adjusted to the rated ambient where asked."""

    characteristic = "temperature"
    needs = ("load", "input")
    probe: Text = Field(description="the probe's name in the log: core for temperature core")
    at: At = None
    max: Degrees | None = None
    class_: Annotated[
        Text | None,
        Field(alias="class", description="insulation class of a winding, whose limit is taken: A, E, B, F, H"),
    ] = None
    settled: Settled = Rate(1.0, 1800.0)
    adjust: Literal["rated ambient", "none"] = Field(
        default="none", description="rated ambient: to what it would be at the highest rated ambient temperature"
    )
    method: Method = "probe"
    material: Material = None

    def problems(self) -> Iterator[Problem]:
        """One limit; the winding's material where its resistance tells the temperature."""
        yield from super().problems()
        yield from _lacks(self, "max", "class_")
        if self.max is not None and self.class_ is not None:
            yield Problem("max and class are both given", "expected one of them", ("class",))
        yield from _winding(self.method, self.material)


class Ripple(Requirement):
    """Largest reading of the ripple on an output."""

    characteristic = "ripple"
    needs = ("load", "input")
    at: At = None
    max: Voltage
    kind: Literal["p-p", "rms"] = "p-p"
    bandwidth: Frequency | None = Field(default=None, description="that the ripple is to be measured with")


class Published(Requirement):
    """A named set of published limits."""

    characteristic = "published"
    takes = ("input",)
    set_: Text = Field(alias="set", description="one of those that `acceptance limits published` lists")
    class_: Annotated[Text | None, Field(alias="class", description="default: told from the ratings")] = None
    power: Power | None = Field(
        default=None, description="rated output power; default: volts times amperes of all outputs together"
    )
    ports: Whole | None = Field(
        default=None, description="adaptive ports and different fixed voltages, where they count"
    )
    minimum_current: dict[str, Current] | None = Field(
        default=None, description="output -> the smallest current it can be run at, where the method knows one"
    )
    min: Ratio | None = Field(default=None, description="of a weighted efficiency, for which no limit is published")
    at: At = None  # of a weighted efficiency: the input voltage; every other set brings its own

    def problems(self) -> Iterator[Problem]:
        """An efficiency that can be met, and that not every unit meets."""
        yield from super().problems()
        if self.min is not None and self.min > 1:
            yield Problem(f"an efficiency of {100 * self.min:g} % cannot be", "expected at most 100 %", ("min",))
        if self.min is not None and self.min < _LOWEST_EFFICIENCY:
            found = f"an efficiency of {100 * self.min:g} % as min lets any pass"
            yield Problem(found, "expected one such as 88 %", ("min",))


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

    def problems(self) -> Iterator[Problem]:
        """Something is asked: a unit of which nothing is asked would be accepted."""
        if not self.all():
            yield Problem("no requirement is given", "expected one or more, such as efficiency: [...]")
