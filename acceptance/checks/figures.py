"""Named series that show the characteristics of steady points; the report draws them as they are."""

from __future__ import annotations

from collections.abc import Callable, Mapping, Sequence
from functools import partial
from typing import Literal

from acceptance.bench.log import channel_key
from acceptance.errors import MeasurementError
from acceptance.limitfile.model import Efficiency
from acceptance.points.point import Estimate, Point, Points
from acceptance.points.propagation import expanded
from acceptance.record import Axis, Figure, LimitLine, Series

__all__ = ["efficiency_figure", "limit_line", "limit_lines", "merged", "voltage_figures"]

_HALF = 0.03  # half the width a limit at one load is drawn with, as a fraction of rated current


def efficiency_figure(lines: Sequence[LimitLine], points: Points) -> list[Figure]:
    """Efficiency over load with these limits, a series for each input voltage; none where no point has one."""
    limits = points.limits
    series = _series(points, lambda point: point.efficiency(limits.outputs), limits.outputs[0])
    if not series:
        return []
    axis = Axis(_load_label(points, limits.outputs[0]), "")
    return [Figure("efficiency", "Efficiency over load", axis, Axis("efficiency", ""), series, list(lines))]


def limit_lines(requirements: Sequence[Efficiency]) -> list[LimitLine]:
    """The limits of efficiency requirements, each over the loads that it is about."""
    lines: list[LimitLine] = []
    for requirement in requirements:
        load = requirement.at.load if requirement.at is not None else None
        loads = requirement.average or ((load,) if isinstance(load, float) else ())
        sides: tuple[tuple[Literal["min", "max"], float | None], ...] = (
            ("min", requirement.min),
            ("max", requirement.max),
        )
        for side, limit in sides:
            if limit is not None:
                lines.append(limit_line(requirement.name or "", limit, side, loads))
    return lines


def limit_line(name: str, limit: float, side: Literal["min", "max"], loads: Sequence[float]) -> LimitLine:
    """A limit over the loads that it is about, or over all where none is given."""
    ends = (min(loads) - _HALF, max(loads) + _HALF) if loads else ()
    return LimitLine(f"{name} {side}", limit, side, *ends)


def voltage_figures(
    outputs: Sequence[str], points: Points, *, bands: Mapping[str, Sequence[LimitLine]] | None = None
) -> list[Figure]:
    """The voltage of outputs over their load, a series for each input voltage."""
    figures = []
    for output in outputs:
        series = _series(points, partial(_voltage, output), output)
        if series:
            several = f" of {output}" if len(points.limits.outputs) > 1 else ""
            figures.append(
                Figure(
                    name=channel_key("output_voltage", output),
                    title=f"Output voltage{several} over load",
                    x=Axis(_load_label(points, output), ""),
                    y=Axis("output voltage", "V"),
                    series=series,
                    limits=list((bands or {}).get(output, ())),
                )
            )
    return figures


def _voltage(output: str, point: Point) -> Estimate:
    return point.voltage(output)


def merged(figures: Sequence[Figure]) -> list[Figure]:
    """The figures, those of one name as one with the limits, marks and regions of all."""
    found: dict[str, Figure] = {}
    for figure in figures:
        there = found.get(figure.name)
        if there is None:
            found[figure.name] = figure
        else:
            there.limits.extend(line for line in figure.limits if line not in there.limits)
            there.marks.extend(mark for mark in figure.marks if mark not in there.marks)
            there.regions.extend(region for region in figure.regions if region not in there.regions)
    return list(found.values())


def _load_label(points: Points, output: str) -> str:
    return f"load of {output}" if len(points.limits.outputs) > 1 else "load"


def _series(points: Points, value: Callable[[Point], Estimate], output: str) -> list[Series]:
    """A series for each input voltage, in the order of load; points that cannot be judged are not drawn."""
    groups: dict[str, list[tuple[float, float, float | None]]] = {}
    for point in points.steady:
        load = point.load_fraction(output)
        if load is None or load > 1.05:
            continue
        try:
            estimate = value(point)
        except MeasurementError:
            continue
        u = None if estimate.unstated else expanded(estimate.value, points.limits.decision.confidence).expanded
        groups.setdefault(_input_name(point, list(groups)), []).append((load, estimate.nominal, u))
    named = sorted(groups.items())
    return [_one_series(name, sorted(rows, key=lambda row: row[:2])) for name, rows in named]


def _one_series(name: str, rows: Sequence[tuple[float, float, float | None]]) -> Series:
    return Series(name, [r[0] for r in rows], [r[1] for r in rows], [r[2] for r in rows])


def _input_name(point: Point, names: Sequence[str]) -> str:
    """What a point's input is called: a name already there, where it lies within 1 % of it."""
    voltage = point.input_voltage()
    if voltage is None:
        return "input unknown"
    for name in names:
        there = name.removeprefix("input ").removesuffix(" V")
        if there != "unknown" and abs(float(there) - voltage) <= 0.01 * float(there):
            return name
    rated = point.limits.ratings.input.voltage
    return f"input {rated if abs(voltage - rated) <= 0.01 * rated else round(voltage, 1):g} V"
