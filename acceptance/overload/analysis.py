"""The overloads of one output that a log holds, ready to be looked at."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass, field
from typing import TypeVar

from acceptance.errors import MeasurementError
from acceptance.overload.behaviour import Behaviour, behaviour_of
from acceptance.overload.branch import branch_of
from acceptance.overload.doubts import see_to_the_meters
from acceptance.overload.episodes import Episode, episodes_of
from acceptance.overload.onset import Onset, onset_of
from acceptance.overload.recovery import Returned, returned_after
from acceptance.overload.short import Short, short_of
from acceptance.overload.steps import steps_of
from acceptance.overload.trace import Trace, trace_of
from acceptance.points.point import Point

__all__ = ["Overload", "overloads_in"]

T = TypeVar("T")


@dataclass(frozen=True, slots=True, eq=False)
class Overload:
    """One overload, or why there is none to look at; what is asked of it is kept."""

    part: Point
    trace: Trace | None = None
    episode: Episode | None = None
    fault: str = ""
    _kept: dict[str, object] = field(default_factory=dict)

    @property
    def where(self) -> str:
        """File and lines."""
        return self.episode.where if self.episode is not None else self.part.where

    def seen(self) -> Episode:
        """The episode.

        Raises
        ------
        MeasurementError
            If there is none.
        """
        if self.episode is None:
            raise MeasurementError(self.fault)
        return self.episode

    def onset(self) -> Onset:
        """Where it began (MeasurementError)."""
        return self._once("onset", lambda: onset_of(self.seen()))

    def behaviour(self) -> Behaviour:
        """What was seen (MeasurementError)."""
        return self._once("behaviour", lambda: behaviour_of(self.seen()))

    def short(self) -> Short:
        """What flowed into a short (MeasurementError)."""
        return self._once("short", lambda: short_of(self.seen()))

    def returned(self, *, band: float, within: float) -> Returned:
        """How it came back (MeasurementError)."""
        return self._once("returned", lambda: returned_after(self.seen(), band=band, within=within))

    def _once(self, name: str, form: Callable[[], T]) -> T:
        if name not in self._kept:
            try:
                self._kept[name] = form()
            except MeasurementError as problem:
                self._kept[name] = problem
        kept = self._kept[name]
        if isinstance(kept, MeasurementError):
            raise kept
        return kept  # type: ignore[return-value]


def overloads_in(part: Point, output: str, steady: Sequence[Point], *, droop: float) -> tuple[Overload, ...]:
    """The overloads of one stretch.

    Parameters
    ----------
    steady
        Points at the stretch's input voltage, for the regulated branch where the stretch does not show it.
    droop
        Fall below the branch that marks the onset, as a share of rated voltage.
    """
    try:
        trace = trace_of(part, output)
    except MeasurementError as problem:
        return (Overload(part, fault=str(problem)),)
    fall = droop * trace.rated_voltage
    try:
        steps = steps_of(trace)
        see_to_the_meters(trace, steps)
        branch = branch_of(trace, steps, steady, droop=fall)
    except MeasurementError as problem:
        return (Overload(part, trace, fault=str(problem)),)
    episodes = episodes_of(trace, steps, branch, droop=fall)
    if not episodes:
        most = 100 * float(trace.current.max()) / trace.rated_current
        fault = (
            f"no overload of {output} in {part.where}: at most {most:.1f} % of rated current was drawn; drive it "
            "further, until the output gives way"
        )
        return (Overload(part, trace, fault=fault),)
    return tuple(Overload(part, trace, episode) for episode in episodes)
