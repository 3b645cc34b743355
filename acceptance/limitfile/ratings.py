"""What limits and instruments must agree on with the ratings, so that no slip of the pen lets every unit pass.

A power of 210 MW where 210 mW was meant is a fault, however well it is written; so is a range that the rated voltage
overflows. The bounds lie where nothing that a product could be specified with reaches them.
"""

from __future__ import annotations

from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass, field

from acceptance.bench.log import channel_key
from acceptance.limitfile.faults import Source
from acceptance.limitfile.limits import Meter
from acceptance.limitfile.model import (
    InputRating,
    LineRegulation,
    LoadRegulation,
    NoLoadPower,
    Output,
    OutputVoltage,
    Requirement,
    Ripple,
    Tolerance,
)
from acceptance.limitfile.yamltree import Path

__all__ = ["Plate", "check_meters", "check_rated"]

INPUT_TOLERANCE = 0.01  # of the input voltage, where decision: gives none
LOAD_TOLERANCE = 0.02  # of rated current, where decision: gives none; half of it up to LIGHT_LOAD
LIGHT_LOAD = 0.1
NO_LOAD_TOLERANCE = 0.002  # of rated current

LARGEST_NO_LOAD = 0.2  # of the rated output power: a server's supply takes 3 %, one with a mains transformer 11 %
SMALL_NO_LOAD = 5.0  # W that a small mains transformer may take, up to all that it can give
LARGEST_RIPPLE = 0.2  # of the rated output voltage
SMALLEST_RANGE = 0.8  # of what is rated: a range that ends lower cannot have read it
SLACK = 1e-9  # of a comparison


@dataclass(frozen=True, slots=True)
class Plate:
    """What is known of the ratings, even where some of them are faulty."""

    outputs: tuple[str, ...] = ()  # empty where they cannot be told
    rated: Mapping[str, Output] = field(default_factory=dict)  # those of the outputs that are whole
    input: InputRating | None = None
    ambient_is_missing: bool = False
    tolerance: Tolerance | None = None  # None where it cannot be told


def check_rated(source: Source, path: Path, entry: Requirement, plate: Plate) -> None:
    """Note a limit or a span of one requirement that does not go with the ratings."""
    output = plate.rated.get(entry.output or next(iter(plate.outputs), ""))
    if isinstance(entry, NoLoadPower):
        _check_no_load(source, path, entry, plate)
    elif isinstance(entry, Ripple) and output is not None:
        _check_ripple(source, path, entry, rated=output.voltage)
    elif isinstance(entry, OutputVoltage) and output is not None:
        _check_band(source, path, entry, rated=output.voltage)
    elif isinstance(entry, LoadRegulation) and plate.tolerance is not None:
        _check_loads_apart(source, path, entry, plate.tolerance)
    elif isinstance(entry, LineRegulation) and plate.tolerance is not None:
        _check_inputs_apart(source, path, entry, plate.tolerance)


# --- limits ---------------------------------------------------------------------------------------------------------


def _check_no_load(source: Source, path: Path, entry: NoLoadPower, plate: Plate) -> None:
    if not plate.outputs or len(plate.rated) < len(plate.outputs):
        return
    rated = sum(output.voltage * output.current for output in plate.rated.values())
    bound = max(LARGEST_NO_LOAD * rated, min(SMALL_NO_LOAD, rated))
    if entry.max >= bound * (1 - SLACK):
        written = source.written((*path, "max"))
        found = f"a no-load power of {written} and a rated output power of {rated:.4g} W do not go together"
        share = f", {100 * bound / rated:.3g} % of it" if bound < rated else ""
        source.refuse((*path, "max"), found, f"expected below {bound:.4g} W{share}")


def _check_ripple(source: Source, path: Path, entry: Ripple, *, rated: float) -> None:
    bound = LARGEST_RIPPLE * rated
    if entry.max >= bound * (1 - SLACK):
        written = source.written((*path, "max"))
        found = f"a ripple of {written} and a rated output voltage of {rated:g} V do not go together"
        source.refuse((*path, "max"), found, f"expected below {bound:.4g} V, {100 * LARGEST_RIPPLE:g} % of it")


def _check_band(source: Source, path: Path, entry: OutputVoltage, *, rated: float) -> None:
    """The rated voltage must meet its own limits, and half or twice of it must not."""
    for key, limit, outside, far in (
        ("min", entry.min, f"above the rated {rated:g} V", f"above {rated / 2:g} V, half of it"),
        ("max", entry.max, f"below the rated {rated:g} V", f"below {2 * rated:g} V, twice it"),
    ):
        if limit is None:
            continue
        written = source.written((*path, key))
        at_least, ratio = ("most", limit / rated) if key == "min" else ("least", rated / limit)
        if ratio > 1 + SLACK:
            found = f"{key} {written} lies {outside}, which would fail"
            source.refuse((*path, key), found, f"expected at {at_least} {rated:g} V")
        elif ratio <= 0.5 + SLACK:
            found = f"{key} {written} and the rated {rated:g} V do not go together"
            source.refuse((*path, key), found, f"expected {far}, or no {key}")


def _check_loads_apart(source: Source, path: Path, entry: LoadRegulation, tolerance: Tolerance) -> None:
    needed = _load_tolerance(entry.from_, tolerance) + _load_tolerance(entry.to, tolerance)
    if entry.to - entry.from_ <= needed + SLACK:
        found = f"one dwell could serve as both ends, {100 * entry.from_:g} % and {100 * entry.to:g} %"
        expected = f"expected them more than {100 * needed:g} % apart, twice the tolerance of a load"
        source.refuse((*path, "to"), found, expected)


def _load_tolerance(load: float, tolerance: Tolerance) -> float:
    """How far a dwell may lie from a load and still meet it, as a fraction of rated current."""
    if load == 0:
        return NO_LOAD_TOLERANCE
    if tolerance.load is not None:
        return tolerance.load
    return LOAD_TOLERANCE if load > LIGHT_LOAD + SLACK else LOAD_TOLERANCE / 2


def _check_inputs_apart(source: Source, path: Path, entry: LineRegulation, tolerance: Tolerance) -> None:
    share = INPUT_TOLERANCE if tolerance.input is None else tolerance.input
    needed = share * (entry.from_ + entry.to)
    if entry.to - entry.from_ <= needed + SLACK:
        found = f"one dwell could serve as both ends, {entry.from_:g} V and {entry.to:g} V"
        expected = f"expected them more than {needed:.4g} V apart, twice the tolerance of an input voltage"
        source.refuse((*path, "to"), found, expected)


# --- instruments ----------------------------------------------------------------------------------------------------


def check_meters(source: Source, meters: Mapping[str, Meter], plate: Plate) -> None:
    """Note the instruments of one file that could not have read what is rated."""
    for key, meter in meters.items():
        name = _name_of(source, key)
        for whose, rated in _largest(key, meters, plate):
            _check_range(source, ("instruments", name, "meter_range"), meter, rated=rated, whose=whose)
            _check_shunt(source, ("instruments", name, "shunt"), meter, rated=rated, whose=whose)


def _name_of(source: Source, key: str) -> str:
    """The key under instruments: as the file writes it."""
    node = source.tree.node(("instruments",))
    written = node.value if node is not None and isinstance(node.value, dict) else {}
    return next((name for name in written if _plain_key(name) == key), key)


def _plain_key(name: str) -> str:
    quantity, _, qualifier = name.partition(" ")
    return channel_key(quantity, qualifier.strip())


def _largest(key: str, meters: Mapping[str, Meter], plate: Plate) -> Iterator[tuple[str, float]]:
    """The largest rating that an instrument must have read, and whose it is; nothing where none is rated."""
    quantity, _, output = key.partition(" ")
    if quantity == "input_voltage" and plate.input is not None:
        yield "the input", plate.input.voltage
    elif quantity in ("output_voltage", "output_current"):
        read: Sequence[str] = [output] if output else [o for o in plate.rated if channel_key(quantity, o) not in meters]
        what = quantity.removeprefix("output_")
        ratings = [(getattr(plate.rated[o], what), o) for o in read if o in plate.rated]
        yield from ((o, rated) for rated, o in [max(ratings, default=(0.0, ""))] if o)


def _check_range(source: Source, path: Path, meter: Meter, *, rated: float, whose: str) -> None:
    if isinstance(meter.meter_range, float) and meter.meter_range < SMALLEST_RANGE * rated * (1 - SLACK):
        unit = "A" if meter.kind == "current" else "V"
        found = f"the range of {source.written(path)} is too small for the rated {rated:g} {unit} of {whose}"
        source.refuse(path, found, f"expected a range above {rated:g} {unit}, or auto")


def _check_shunt(source: Source, path: Path, meter: Meter, *, rated: float, whose: str) -> None:
    if meter.shunt is None or meter.converter is None:
        return
    volts, converter = meter.shunt.resistance * rated, meter.converter
    # a shunt may be wired either way round
    if volts > max(abs(converter.low), abs(converter.high)) * (1 + SLACK):
        dropped = f"the rated {rated:g} A of {whose} drop {volts:g} V across {source.written((*path, 'resistance'))}"
        found = f"{dropped}, and the converter reads {converter.low:g} V to {converter.high:g} V"
        source.refuse((*path, "resistance"), found, "expected a smaller shunt, or the span that was used")
