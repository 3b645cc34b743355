"""What a limits file must say for a published set to be asked: known names, ratings that it fits, what it lacks."""

from __future__ import annotations

from collections.abc import Iterator

from acceptance.limitfile.faults import Source, unknown
from acceptance.limitfile.fields import Problem
from acceptance.limitfile.model import Published
from acceptance.limitfile.published import PublishedSet, known_sets, published_set
from acceptance.limitfile.ratings import Plate
from acceptance.limitfile.setclass import Unfit, asked_of
from acceptance.limitfile.yamltree import Path
from acceptance.units import quoted

__all__ = ["check_set"]


def check_set(source: Source, path: Path, entry: Published, plate: Plate) -> None:
    """Note whatever keeps a published set from being asked."""
    if entry.set_ not in known_sets():
        found = f"{quoted(entry.set_)} is no published set"
        source.refuse((*path, "set"), found, unknown(entry.set_, known_sets()))
        return
    published = published_set(entry.set_)
    for problem in _problems(published, entry, plate):
        source.refuse((*path, *problem.at), problem.found, problem.expected)


def _problems(published: PublishedSet, entry: Published, plate: Plate) -> Iterator[Problem]:
    if entry.output is not None and len(plate.outputs) > 1:
        yield Problem("a published set is about all outputs together", "expected no output:", ("output",))
    if published.kind == "weights":
        yield from _weights(published, entry)
        return
    for key in ("min", "at"):
        if getattr(entry, key) is not None:
            yield Problem(f"{published.name} brings its own limits and conditions", f"expected no {key}:", (key,))
    yield from _minimum_current(published, entry, plate)
    if plate.input is not None and published.supply and plate.input.supply != published.supply:
        found = f"{published.name} is for an a.c. input, and the ratings say supply: {plate.input.supply}"
        yield Problem(found, "expected a set for it, or limits of its own", ("set",))
    if plate.outputs and len(plate.rated) == len(plate.outputs):
        yield from _unfit(published, entry, plate)


def _unfit(published: PublishedSet, entry: Published, plate: Plate) -> Iterator[Problem]:
    outputs = [(output.voltage, output.current) for output in plate.rated.values()]
    try:
        asked_of(published, outputs, power=entry.power, class_name=entry.class_, ports=entry.ports)
    except Unfit as unfit:
        key = unfit.key if getattr(entry, "class_" if unfit.key == "class" else unfit.key, True) is not None else "set"
        yield Problem(unfit.found, unfit.expected, (key,))


def _weights(published: PublishedSet, entry: Published) -> Iterator[Problem]:
    if entry.min is None:
        found = f"no limit is published for {published.name}, and none is given"
        yield Problem(found, "expected min:, such as min: 96 %", ("set",))
    if entry.at is None or not isinstance(entry.at.input, float):
        found = "the input voltage is not given"
        yield Problem(
            found, "expected one under at:, such as at: {input: 350 V}", ("set",) if entry.at is None else ("at",)
        )
    for key, value in (
        ("class", entry.class_),
        ("power", entry.power),
        ("ports", entry.ports),
        ("minimum_current", entry.minimum_current),
    ):
        if value is not None:
            yield Problem(f"{published.name} takes no {key}", "expected it left out", (key,))


def _minimum_current(published: PublishedSet, entry: Published, plate: Plate) -> Iterator[Problem]:
    """An output that cannot go as low as 25 %: known to one method, and below what the next load asks."""
    for output, current in (entry.minimum_current or {}).items():
        at = ("minimum_current", output)
        if not published.test.minimum_current:
            yield Problem(f"{published.name} knows no smallest current", "expected it left out", ("minimum_current",))
            return
        if plate.outputs and output not in plate.outputs:
            yield Problem(f"{quoted(output)} is no output", unknown(output, plate.outputs), at)
        elif output in plate.rated and current >= 0.5 * plate.rated[output].current:
            half = 0.5 * plate.rated[output].current
            yield Problem(
                f"a smallest current of {current:g} A", f"expected below {half:g} A, half of the rated one", at
            )
