"""What `acceptance limits published` shows: the sets, one set, or its limits for a product."""

from __future__ import annotations

import json
from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass
from typing import Any, NoReturn

import click

from acceptance.cli.shared import harmless
from acceptance.errors import MeasurementError
from acceptance.limitfile.faults import unknown
from acceptance.limitfile.published import EVIDENCE, Band, PublishedSet, Quantity, known_sets, published_set
from acceptance.limitfile.setclass import Asked, AskedLimit, Unfit, asked_of
from acceptance.units import parse_quantity, quoted

__all__ = ["Plate", "every_set", "limits_for", "one_set"]


@dataclass(frozen=True, slots=True)
class Plate:
    """Ratings as written on the command line."""

    voltages: Sequence[str]
    currents: Sequence[str]
    power: str | None
    class_name: str | None
    ports: int | None

    @property
    def is_given(self) -> bool:
        """Whether anything is rated at all."""
        rest = (self.power, self.class_name, self.ports)
        return bool(self.voltages or self.currents) or any(one is not None for one in rest)

    def outputs(self) -> list[tuple[float, float]]:
        """Volts and amperes of each output."""
        if len(self.voltages) != len(self.currents):
            found = f"{len(self.voltages)} of --voltage and {len(self.currents)} of --current are given"
            _refuse(f"{found}; expected both for each output")
        return [
            (_positive(volts, "voltage", "--voltage"), _positive(amperes, "current", "--current"))
            for volts, amperes in zip(self.voltages, self.currents, strict=True)
        ]


def _positive(text: str, kind: str, option: str) -> float:
    try:
        value = parse_quantity(text, kind)
    except MeasurementError as problem:
        _refuse(f"{option}: {problem}")
    if not value > 0:
        _refuse(f"{option}: {quoted(text)} is not above zero")
    return value


def _refuse(message: str) -> NoReturn:
    raise click.UsageError(message)


def _known(name: str) -> PublishedSet:
    if name not in known_sets():
        _refuse(f"{quoted(name)} is no published set; {unknown(name, known_sets())}")
    return published_set(name)


# --- every set ------------------------------------------------------------------------------------------------------


def every_set(*, as_json: bool) -> int:
    """Every set with what it asks, in a few lines each."""
    found = [published_set(name) for name in known_sets()]
    if as_json:
        _print_json([_plain_set(one) for one in found])
        return 0
    for one in found:
        click.echo(f"{one.name}   {one.title}")
        for line in _about(one):
            click.echo(f"    {line}")
        click.echo()
    click.echo(
        "One of them whole: acceptance limits published NAME; for a product: --voltage 12V --current 2A beside it."
    )
    return 0


def _about(one: PublishedSet) -> Iterator[str]:
    yield one.document
    yield "; ".join([*_dates(one), f"as read on {one.read}"])
    yield f"asks {', '.join(_asks(one))}; {_conditions(one)}"
    if len(one.classes) > 1:
        yield f"classes: {', '.join(one.classes)}"
    yield f"evidence: {', '.join(_evidence(one))}"


def _dates(one: PublishedSet) -> Iterator[str]:
    if one.since is not None:
        yield f"for what is {one.counts} {one.since}"
    if one.until is not None:
        yield f"until {one.until}"


def _asks(one: PublishedSet) -> list[str]:
    if one.weights:
        return ["weighted_efficiency"]
    return list(dict.fromkeys(quantity.name for rows in one.classes.values() for quantity in rows))


def _conditions(one: PublishedSet) -> str:
    if one.weights:
        return ", ".join(f"{weight:g} at {100 * load:g} %" for load, weight in one.weights.items())
    loads = f", mean over load {', '.join(f'{100 * load:g} %' for load in one.test.loads)}" if one.test.loads else ""
    return f"at {one.test.input:g} V, {one.test.frequency:g} Hz{loads}"


def _evidence(one: PublishedSet) -> list[str]:
    if one.weights:
        return [one.evidence]
    marks = {band.evidence for rows in one.classes.values() for quantity in rows for band in quantity.bands}
    return [mark for mark in EVIDENCE if mark in marks]


# --- one set --------------------------------------------------------------------------------------------------------


def one_set(name: str, *, as_json: bool) -> int:
    """One set whole: every class, band and formula, and what is to be known about it."""
    one = _known(name)
    if as_json:
        _print_json(_plain_set(one))
        return 0
    click.echo(f"{one.name}   {one.title}")
    for line in _about(one):
        click.echo(f"    {line}")
    for class_name, rows in one.classes.items():
        click.echo(f"\n{class_name}")
        _table([_cells(quantity, band) for quantity in rows for band in quantity.bands])
    click.echo()
    for note in (*one.notes, f"conditions: {one.test.clause}", *(_method(one))):
        click.echo(f"  - {note}")
    return 0


def _cells(quantity: Quantity, band: Band) -> list[str]:
    return [quantity.key, str(band), quantity.limit(band), band.evidence]


def _method(one: PublishedSet) -> Iterator[str]:
    if one.method is not None:
        yield f"method: {one.method.document}"


# --- for a product --------------------------------------------------------------------------------------------------


def limits_for(name: str, plate: Plate, *, as_json: bool) -> int:
    """What a set asks of a product with these ratings."""
    one = _known(name)
    if one.weights:
        _refuse(f"{name} has weights and no limits that go by ratings; expected no ratings")
    outputs = plate.outputs()
    power = _positive(plate.power, "power", "--power") if plate.power is not None else None
    if not outputs and power is None:
        _refuse("no power is given; expected --voltage and --current of each output, or --power")
    try:
        asked = asked_of(one, outputs, power=power, class_name=plate.class_name, ports=plate.ports)
    except Unfit as unfit:
        _refuse(str(unfit))
    if as_json:
        _print_json(_plain_asked(one, asked))
        return 0
    click.echo(f"{one.name}: {one.title}")
    click.echo(f"class {asked.class_name} ({asked.reason}); P = {asked.power:g} W; {_conditions(one)}")
    _table([[_value(limit), *_cells(limit.quantity, limit.band)] for limit in asked.limits], right=(0,))
    for line in [one.document, *_dates(one), f"as read on {one.read}", *_derated(asked)]:
        click.echo(f"  {line}")
    for mark in dict.fromkeys(limit.band.evidence for limit in asked.limits):
        click.echo(f"  {mark}: {EVIDENCE[mark]}" if mark != "unconfirmed" else f"  {EVIDENCE[mark]}")
    return 0


def _value(limit: AskedLimit) -> str:
    """Rounded for reading; what is judged is not rounded, and --json has it."""
    return f"{limit.value:.4g} W" if limit.quantity.unit else f"{100 * limit.value:.3f} %"


def _derated(asked: Asked) -> list[str]:
    return [f"every current is scaled by {asked.derating:.6f}"] if asked.derating < 1 else []


def _table(rows: Sequence[Sequence[str]], *, right: Sequence[int] = ()) -> None:
    widths = [max(map(len, column)) for column in zip(*rows, strict=True)]
    for row in rows:
        cells = [c.rjust(w) if at in right else c.ljust(w) for at, (c, w) in enumerate(zip(row, widths, strict=True))]
        click.echo(harmless(f"  {'   '.join(cells)}".rstrip()))


# --- JSON -----------------------------------------------------------------------------------------------------------


def _print_json(told: object) -> None:
    click.echo(json.dumps(told, ensure_ascii=False, indent=1))


def _plain_set(one: PublishedSet) -> dict[str, Any]:
    return {
        **_head(one),
        "classes": {
            name: {quantity.key: [_plain_band(band) for band in quantity.bands] for quantity in rows}
            for name, rows in one.classes.items()
        },
        "weights": [{"load": load, "weight": weight} for load, weight in one.weights.items()],
        "evidence": _evidence(one),
        "notes": list(one.notes),
    }


def _head(one: PublishedSet) -> dict[str, Any]:
    return {
        "set": one.name,
        "title": one.title,
        "document": one.document,
        "clause": one.clause,
        "from": one.since.isoformat() if one.since is not None else None,
        "until": one.until.isoformat() if one.until is not None else None,
        "read": one.read.isoformat(),
        "conditions": {
            "clause": one.test.clause,
            "supply": one.supply or None,
            "input_voltage": one.test.input,
            "frequency": one.test.frequency,
            "loads": list(one.test.loads),
            "method": one.method.document if one.method is not None else None,
        },
    }


def _plain_band(band: Band) -> Mapping[str, str]:
    return {"band": str(band), "formula": str(band.formula), "evidence": band.evidence}


def _plain_asked(one: PublishedSet, asked: Asked) -> dict[str, Any]:
    return {
        **_head(one),
        "class": asked.class_name,
        "reason": asked.reason,
        "power": asked.power,
        "derating": asked.derating,
        "limits": [_plain_limit(limit) for limit in asked.limits],
    }


def _plain_limit(limit: AskedLimit) -> dict[str, Any]:
    quantity = limit.quantity
    return {
        "finding": quantity.name,
        "characteristic": quantity.characteristic,
        "unit": quantity.unit,
        "load": quantity.load,
        "min": limit.low,
        "max": limit.high,
        **_plain_band(limit.band),
    }
