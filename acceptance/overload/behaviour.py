"""The behaviour under overload: what is seen of it in time, and in its levels, put together."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

from acceptance.errors import MeasurementError
from acceptance.overload.bursts import Bursts, GivenUp, bursts_of, given_up
from acceptance.overload.episodes import Episode
from acceptance.overload.kinds import Kind, kind_of, levels_below
from acceptance.overload.steps import STEADY, Step
from acceptance.overload.way import into

__all__ = ["Behaviour", "behaviour_of"]

_A_PART = 3  # settled levels that make limiting a part of the behaviour, before bursts or giving up
_CEASED = 3.0  # periods without a burst


@dataclass(frozen=True, slots=True)
class Behaviour:
    """What an output does under overload."""

    name: str
    told: str  # period, duty, ratio: what was seen, in words


def behaviour_of(episode: Episode) -> Behaviour:
    """The behaviour of one episode.

    Raises
    ------
    MeasurementError
        If the samples do not show it; with what to record instead.
    """
    if not episode.left_branch:
        driven = max(step.current for step in into(episode) or episode.steps)
        msg = (
            f"never driven into limiting: {driven:.4g} A were drawn at most ({episode.where}); drive it further, until "
            "the output gives way"
        )
        raise MeasurementError(msg)
    bursts, gone = bursts_of(episode), given_up(episode)
    if bursts is not None:
        return _in_bursts(bursts, gone, episode)
    if gone is not None:
        return _given_up(gone, episode)
    kind = kind_of(episode)
    if kind.doubt:
        raise MeasurementError(f"{kind.doubt} ({episode.where})")  # noqa: EM102
    _see_to_what_gave_nothing(episode)
    return Behaviour(kind.name, kind.told)


def _see_to_what_gave_nothing(episode: Episode) -> None:
    """See to it that the output gave something at every setting: a limiter does.

    Raises
    ------
    MeasurementError
        If it did not at some; single readings, or few, catch bursts or miss them by chance.
    """
    over = [s for s in episode.steps if s.first >= episode.entered and s.stop <= episode.last_over + 1]
    gone = [step for step in over if step.kind != STEADY]
    if gone:
        msg = (
            f"the output gave nothing at {len(gone)} of {len(over)} settings of the overload "
            f"({episode.place(gone[0].first, gone[0].stop)}), which no limiter does: bursts, seen by too few readings, "
            "or a latch; log it ten times in a period of the bursts, and go on for 10 s after the overload is removed"
        )
        raise MeasurementError(msg)


def _in_bursts(bursts: Bursts, gone: GivenUp | None, episode: Episode) -> Behaviour:
    if not bursts.is_shown:
        msg = f"{bursts.doubt} ({episode.where})"
        raise MeasurementError(msg)
    told = _burst_words(bursts)
    if gone is not None and episode.end - gone.since > _CEASED * bursts.period_samples:
        if gone.latched:
            return Behaviour("mixed", f"hiccup ({told}), then latch off")
        msg = f"the bursts ceased before the overload was removed, and {gone.doubt or 'it is open what came then'}"
        raise MeasurementError(msg)
    # a burst may show a level or two of its own before the output first gives nothing
    before = [step for step in levels_below(episode) if step.samples > 2 * bursts.samples_on]
    if _is_a_part(before, episode):
        return Behaviour("mixed", f"{_limiting(episode)}, then hiccup ({told})")
    return Behaviour("hiccup", told)


def _burst_words(bursts: Bursts) -> str:
    period = f"every {bursts.period:.3g} s, " if bursts.period is not None else ""
    return f"{bursts.count} bursts, {period}on {100 * bursts.duty:.0f} % of the time, up to {bursts.current:.4g} A"


def _is_a_part(before: Sequence[Step], episode: Episode) -> bool:
    """Whether levels below the branch make limiting a part of what came later.

    Raises
    ------
    MeasurementError
        If there are some, but too few to tell.
    """
    if before and len(before) < _A_PART:
        msg = (
            f"the output was held below its branch at {len(before)} settings before it gave way, too few to tell "
            f"whether limiting is a part of its behaviour ({episode.where}); sweep in smaller steps about the onset"
        )
        raise MeasurementError(msg)
    return bool(before)


def _given_up(gone: GivenUp, episode: Episode) -> Behaviour:
    if not gone.latched:
        msg = f"{gone.doubt} ({episode.where})"
        raise MeasurementError(msg)
    until = "until the source was cycled" if episode.source_off is not None else "to the end of the log"
    if _is_a_part(levels_below(episode), episode):
        return Behaviour("mixed", f"{_limiting(episode)}, then latch off")
    return Behaviour("latch off", f"down after the overload {until}")


def _limiting(episode: Episode) -> str:
    """What the levels before a collapse show, in words; "limiting" where no kind is told."""
    kind: Kind = kind_of(episode)
    levels = levels_below(episode)
    share = 100 * min(step.voltage for step in levels) / episode.trace.rated_voltage
    return f"{kind.name or 'limiting'} down to {share:.0f} % of rated voltage"
