"""The bench's part of a file: columns, instruments and wiring, checked against the quantities there are."""

from __future__ import annotations

import re
from collections.abc import Collection, Mapping, Sequence
from dataclasses import dataclass, field
from typing import Literal, TypeVar

from acceptance.bench.log import OUTPUT_QUANTITIES, QUANTITIES, channel_key
from acceptance.errors import MeasurementError
from acceptance.limitfile.accuracy import Accuracy, parse_accuracy
from acceptance.limitfile.faults import Source, unknown
from acceptance.limitfile.limits import Converter, Meter, ShuntResistor, Wiring
from acceptance.limitfile.model import Adc, BenchFile, ColumnChoice, Instrument, LogColumns, Shunt
from acceptance.limitfile.yamltree import Path
from acceptance.units import KINDS, UNITS, find_unit, parse_quantity, quoted

__all__ = ["BenchPart", "bench_part"]

V = TypeVar("V")

_NUMBERS = {name: kind for name, kind in QUANTITIES.items() if kind not in ("text", "any") and name != "time"}
_PROBED = frozenset({"temperature", "winding_resistance"})
_SETTINGS = ("current", "resistance", "voltage", "power")  # kinds that a load's setting may have
_PLAIN_NUMBER = re.compile(r"[0-9]{1,9}(\.[0-9]{0,30})?")
_EXAMPLES = {"voltage": "60 V", "current": "10 A", "power": "300 W", "resistance": "100 ohm", "ratio": "1"}


@dataclass(frozen=True, slots=True)
class BenchPart:
    """What one file says about the bench; empty or None where it says nothing."""

    columns: Mapping[str, tuple[str, str | None]] = field(default_factory=dict)
    stated: Mapping[str, float] = field(default_factory=dict)
    load_mode: str | None = None
    settle: float | None = None
    min_dwell: float | None = None
    meters: Mapping[str, Meter] = field(default_factory=dict)
    leads: Mapping[str, Wiring] = field(default_factory=dict)

    def overridden_by(self, other: BenchPart) -> BenchPart:
        """This part with what another file says instead, entry by entry: a column, or a value that was not logged."""
        return BenchPart(
            columns={**{k: v for k, v in self.columns.items() if k not in other.stated}, **other.columns},
            stated={**{k: v for k, v in self.stated.items() if k not in other.columns}, **other.stated},
            load_mode=self.load_mode if other.load_mode is None else other.load_mode,
            settle=self.settle if other.settle is None else other.settle,
            min_dwell=self.min_dwell if other.min_dwell is None else other.min_dwell,
            meters=_put_over(self.meters, other.meters),
            leads=_put_over(self.leads, other.leads),
        )


def _put_over(mine: Mapping[str, V], other: Mapping[str, V]) -> dict[str, V]:
    """Another file's entries over mine; one for a quantity as a whole also replaces mine for its outputs and probes."""
    kept = {name: entry for name, entry in mine.items() if name.partition(" ")[0] not in other}
    return {**kept, **other}


def bench_part(source: Source, model: BenchFile, outputs: Sequence[str]) -> BenchPart:
    """What a file says about the bench; everything wrong with it is noted in `source`."""
    _check_logged_or_stated(source, model.log, outputs)
    return BenchPart(
        columns=_columns(source, model.log.columns, outputs),
        stated=_stated(source, model.log.stated, outputs),
        load_mode=model.log.load_mode,
        settle=model.log.settle,
        min_dwell=model.log.min_dwell,
        meters=_meters(source, model.instruments, outputs),
        leads=_leads(source, model.lead_resistance, outputs),
    )


# --- channels -------------------------------------------------------------------------------------------------------


def _channel(
    source: Source, path: Path, *, quantities: Collection[str], outputs: Sequence[str], probe_needed: bool = False
) -> tuple[str, str] | None:
    """Quantity, and output or probe, of the key that a path ends with; None, and a fault noted, where it is neither."""
    key = str(path[-1])
    quantity, _, qualifier = key.partition(" ")
    qualifier = qualifier.strip()
    if quantity in _PROBED:
        qualifier = qualifier.lower()  # as the reader names probes
    if quantity not in quantities:
        found = f"{quoted(key)} is no quantity that can stand here"
        source.refuse(path, found, unknown(quantity, sorted(quantities)), key=True)
    elif quantity in OUTPUT_QUANTITIES:
        if not qualifier or not outputs or qualifier in outputs:
            return quantity, qualifier
        found = f"{quoted(qualifier)} in {quoted(key)} is no output"
        source.refuse(path, found, unknown(qualifier, outputs), key=True)
    elif qualifier and quantity not in _PROBED:
        source.refuse(path, f"{quantity} has no {quoted(qualifier)}", f"expected {quantity} alone", key=True)
    elif probe_needed and quantity == "temperature" and not qualifier:
        source.refuse(path, "temperature does not say of which probe", "expected such as temperature case", key=True)
    else:
        return quantity, qualifier
    return None


def _kept_once(source: Source, path: Path, *, key: str, seen: dict[str, Path]) -> bool:
    """Whether a channel is named for the first time; a fault is noted where it is not."""
    if key not in seen:
        seen[key] = path
        return True
    line, column = source.tree.place(seen[key], key=True)
    found = f"{quoted(str(path[-1]))} is named twice"
    source.refuse(path, found, f"expected it once; it is there already at line {line}, column {column}", key=True)
    return False


def _whole_key(channel: tuple[str, str], outputs: Sequence[str]) -> str:
    """The key of a channel of the log, an output's quantity without a name being the first output's."""
    quantity, qualifier = channel
    default = outputs[0] if outputs and quantity in OUTPUT_QUANTITIES else ""
    return channel_key(quantity, qualifier or default)


def _check_logged_or_stated(source: Source, log: LogColumns, outputs: Sequence[str]) -> None:
    """Note what is given a column and stated as well; what is wrong with either by itself has been noted."""
    columns = {_plain_key(name, outputs): name for name in log.columns}
    for name in log.stated:
        if column := columns.get(_plain_key(name, outputs)):
            line, at = source.tree.place(("log", "columns", column), key=True)
            expected = f"expected one of them; the column stands at line {line}, column {at}"
            found = f"{quoted(name)} is stated, and has a column too"
            source.refuse(("log", "stated", name), found, expected, key=True)


def _plain_key(name: str, outputs: Sequence[str]) -> str:
    quantity, _, qualifier = name.partition(" ")
    qualifier = qualifier.strip()
    return _whole_key((quantity, qualifier.lower() if quantity in _PROBED else qualifier), outputs)


def _columns(
    source: Source, columns: Mapping[str, ColumnChoice], outputs: Sequence[str]
) -> dict[str, tuple[str, str | None]]:
    made: dict[str, tuple[str, str | None]] = {}
    seen: dict[str, Path] = {}
    headings: dict[str, str] = {}
    for name, choice in columns.items():
        path: Path = ("log", "columns", name)
        channel = _channel(source, path, quantities=QUANTITIES, outputs=outputs, probe_needed=True)
        if channel is None:
            continue
        _check_column_unit(source, path, quantity=channel[0], unit=choice.unit)
        key = _whole_key(channel, outputs)
        if not _kept_once(source, path, key=key, seen=seen):
            continue
        if choice.heading in headings:
            found = f"the heading {quoted(choice.heading)} stands for {headings[choice.heading]} already"
            source.refuse((*path, "heading"), found, "expected one quantity for each heading")
        headings.setdefault(choice.heading, name)
        made[key] = (choice.heading, choice.unit)
    return made


def _check_column_unit(source: Source, path: Path, *, quantity: str, unit: str | None) -> None:
    if unit is None:
        return
    kind = QUANTITIES[quantity]
    kinds = _SETTINGS if kind == "any" else () if kind == "text" else (kind,)
    if any(find_unit(unit, one) for one in kinds):
        return
    known = UNITS.get(unit.strip())
    found = f"{quoted(unit)} is a unit of {known.kind}" if known else f"{quoted(unit)} is no known unit"
    if not kinds:
        found, expected = f"{quantity} has a unit", "expected the heading alone"
    else:
        expected = f"expected a unit of {' or '.join(kinds)}"
    source.refuse((*path, "unit"), found, expected)


def _stated(source: Source, stated: Mapping[str, str], outputs: Sequence[str]) -> dict[str, float]:
    made: dict[str, float] = {}
    seen: dict[str, Path] = {}
    for name, text in stated.items():
        path: Path = ("log", "stated", name)
        channel = _channel(source, path, quantities=_NUMBERS, outputs=outputs, probe_needed=True)
        key = _whole_key(channel, outputs) if channel is not None else ""
        if channel is None or not _kept_once(source, path, key=key, seen=seen):
            continue
        kind = _NUMBERS[channel[0]]
        value = _number(source, path, text, kind=kind)
        if value is None:
            continue
        if kind == "ratio" and not 0 < value <= 1:
            source.refuse(path, f"{quoted(text)} is no {channel[0]}", "expected above 0 and at most 1, or 100 %")
        elif kind != "temperature" and value < 0:
            source.refuse(path, f"{quoted(text)} is below zero", f"expected a {kind} such as 1 {_si(kind)}")
        made[key] = value
    return made


# --- instruments ----------------------------------------------------------------------------------------------------


def _meters(source: Source, instruments: Mapping[str, Instrument], outputs: Sequence[str]) -> dict[str, Meter]:
    made: dict[str, Meter] = {}
    seen: dict[str, Path] = {}
    for name, instrument in instruments.items():
        path: Path = ("instruments", name)
        channel = _channel(source, path, quantities=_NUMBERS, outputs=outputs)
        if channel is None or not _kept_once(source, path, key=channel_key(*channel), seen=seen):
            continue
        key = channel_key(*channel)
        made[key] = _meter(source, path, instrument, key=key, kind=_NUMBERS[channel[0]])
    return made


def _meter(source: Source, path: Path, instrument: Instrument, *, key: str, kind: str) -> Meter:
    """What measured the channel `key`, whose unit is of that kind."""
    difference = "temperature difference" if kind == "temperature" else kind
    meter = Meter(
        quantity=key,
        device=instrument.device,
        kind=kind,
        accuracy=_accuracy(source, (*path, "accuracy"), instrument.accuracy, kind=kind),
        meter_range=_meter_range(source, (*path, "meter_range"), instrument.meter_range, kind=kind),
        resolution=_positive(source, (*path, "resolution"), instrument.resolution, kind=difference),
        shunt=_shunt(instrument.shunt),
        converter=_converter(instrument.adc),
        due=instrument.due,
        serial=instrument.serial or "",
        note=instrument.note or "",
        text=_in_words(source, path, instrument),
    )
    _check_accuracy(source, path, instrument, accuracy=meter.accuracy)
    _check_chain(source, path, instrument, key=key, kind=kind)
    return meter


def _accuracy(source: Source, path: Path, text: str | None, *, kind: str) -> Accuracy | None:
    if text is None:
        return None
    try:
        return parse_accuracy(text, kind)
    except MeasurementError as problem:
        source.refuse(path, str(problem), 'expected terms such as "0.05 % reading + 0.02 % range + 3 digits, k = 2"')
        return None


def _meter_range(source: Source, path: Path, text: str | None, *, kind: str) -> float | Literal["auto"] | None:
    return "auto" if text == "auto" else _positive(source, path, text, kind=kind, other=", or auto")


def _positive(source: Source, path: Path, text: str | None, *, kind: str, other: str = "") -> float | None:
    if text is None:
        return None
    value = _number(source, path, text, kind=kind, other=other)
    if value is not None and value <= 0:
        source.refuse(path, f"{quoted(text)} is not above zero", f"expected a {kind}, such as 1 {_si(kind)}{other}")
    return value


def _number(source: Source, path: Path, text: str, *, kind: str, other: str = "") -> float | None:
    """The SI value of a text, a ratio also without a unit; None, and a fault noted, where it is none."""
    try:
        # a ratio of two quantities is as often a plain number: a power factor of 0.95
        return float(text) if kind == "ratio" and _PLAIN_NUMBER.fullmatch(text) else parse_quantity(text, kind)
    except MeasurementError as problem:
        example = _EXAMPLES.get(kind, f"1 {_si(kind)}")
        source.refuse(path, str(problem), f"expected a {kind} with its unit, such as {example}{other}")
        return None


def _si(kind: str) -> str:
    return KINDS[kind] or "%"


def _check_accuracy(source: Source, path: Path, instrument: Instrument, *, accuracy: Accuracy | None) -> None:
    """Note what an accuracy refers to and the entry does not give."""
    if accuracy is None:
        return
    if accuracy.of_range and instrument.meter_range == "auto":
        source.refuse((*path, "meter_range"), "the accuracy is of the range, and that is auto", "expected the range")
    elif accuracy.of_range and instrument.meter_range is None:
        found, expected = "the accuracy is of the range, and none is given", "expected meter_range: beside it"
        source.refuse((*path, "accuracy"), found, expected)
    if accuracy.digits and instrument.resolution is None:
        found, expected = "the accuracy has digits, and their worth is not given", "expected resolution: beside it"
        source.refuse((*path, "accuracy"), found, expected)


def _check_chain(source: Source, path: Path, instrument: Instrument, *, key: str, kind: str) -> None:
    """Note a shunt or a converter that cannot have measured this."""
    if instrument.shunt is not None and kind != "current":
        source.refuse(
            (*path, "shunt"), f"{key} is read across a shunt", "expected a shunt for a current alone", key=True
        )
    elif instrument.shunt is not None and instrument.adc is None and instrument.accuracy is None:
        found = "nothing says what read the shunt's volts"
        source.refuse((*path, "shunt"), found, "expected adc:, or the accuracy of the current", key=True)
    if instrument.adc is not None and instrument.shunt is None and kind != "voltage":
        expected = "expected a shunt beside it for a current, or accuracy: instead"
        source.refuse((*path, "adc"), f"{key} is read by a converter, which reads volts", expected, key=True)


def _shunt(shunt: Shunt | None) -> ShuntResistor | None:
    if shunt is None:
        return None
    return ShuntResistor(
        resistance=shunt.resistance,
        tolerance=shunt.tolerance or 0.0,
        temperature_coefficient=shunt.temperature_coefficient or 0.0,
        heating=shunt.heating or 0.0,
        stated=shunt.tolerance is not None,
    )


def _converter(adc: Adc | None) -> Converter | None:
    if adc is None:
        return None
    return Converter(bits=adc.bits, low=adc.span[0], high=adc.span[1], offset=adc.offset or 0.0)


def _in_words(source: Source, path: Path, instrument: Instrument) -> str:
    """The accuracy as the file writes it, shunt and converter included."""
    words = [instrument.accuracy] if instrument.accuracy is not None else []
    if instrument.shunt is not None:
        shunt = _written(source, (*path, "shunt"))
        parts = [f"shunt {shunt['resistance']}"]
        parts += [f"± {shunt['tolerance']}"] if "tolerance" in shunt else []
        parts += [shunt[key] for key in ("temperature_coefficient", "heating") if key in shunt]
        words.append(", ".join(parts).replace(", ±", " ±"))
    if instrument.adc is not None:
        adc = _written(source, (*path, "adc"))
        span = " to ".join(_texts(source, (*path, "adc", "span")))
        words.append(f"converter {adc['bits']} bits, {span}" + (f", offset {adc['offset']}" if "offset" in adc else ""))
    return "; ".join(words)


def _written(source: Source, path: Path) -> dict[str, str]:
    """The texts of a mapping of the file."""
    node = source.tree.node(path)
    held = node.value if node is not None and isinstance(node.value, dict) else {}
    return {key: entry.node.value for key, entry in held.items() if isinstance(entry.node.value, str)}


def _texts(source: Source, path: Path) -> list[str]:
    """The texts of a list of the file."""
    node = source.tree.node(path)
    held = node.value if node is not None and isinstance(node.value, list) else []
    return [item.value for item in held if isinstance(item.value, str)]


# --- wiring ---------------------------------------------------------------------------------------------------------


def _leads(
    source: Source, leads: Mapping[str, tuple[float, float | None]], outputs: Sequence[str]
) -> dict[str, Wiring]:
    made: dict[str, Wiring] = {}
    for name, (resistance, bound) in leads.items():
        side, _, output = name.partition(" ")
        path: Path = ("lead_resistance", name)
        if side not in ("output", "input") or (side == "input" and output):
            example = f"output {outputs[0]}" if outputs else "output and its name"
            source.refuse(path, f"{quoted(name)} has no leads", f"expected output, input or {example}", key=True)
        elif output and outputs and output not in outputs:
            source.refuse(path, f"{quoted(output)} is no output", unknown(output, outputs), key=True)
        else:
            made[name] = Wiring(resistance, bound)
    return made
