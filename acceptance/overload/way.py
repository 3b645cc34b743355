"""The way into an overload: its steps up to the deepest one, and what each would have drawn on the branch."""

from __future__ import annotations

import math

import numpy as np

from acceptance.overload.episodes import Episode
from acceptance.overload.steps import HELD, STEADY, Step

__all__ = ["asked_at", "into"]


def into(episode: Episode) -> tuple[Step, ...]:
    """The steps of the way in, up to the deepest one: later ones are the way out, on which it may differ."""
    way = [step for step in episode.steps if step.first < episode.end]
    if not way:
        return ()
    asked = [asked_at(step, episode) for step in way]
    if all(math.isfinite(value) for value in asked):
        return tuple(way[: int(np.argmax(asked)) + 1])
    depth = np.array([step.voltage for step in way])
    return tuple(way[: int(np.argmax(depth <= depth.min() + 0.02 * episode.trace.rated_voltage)) + 1])


def asked_at(step: Step, episode: Episode) -> float:
    """The current that a step would have drawn on the branch; infinite or NaN where nothing tells it. [A]"""
    branch, lead = episode.branch, episode.trace.lead
    if step.mode == "CC":
        return step.setting
    if step.mode == "CR":
        resistance = step.setting + lead + branch.resistance
        return branch.voltage / resistance if resistance > 0 else math.nan
    if step.mode == "CV":
        fall = branch.voltage - step.setting
        return fall / branch.resistance if branch.resistance > 0 and fall < episode.droop else math.inf
    if step.mode == "CP":
        return step.setting / branch.voltage
    return _asked_by_bursts(step, episode)


def _asked_by_bursts(step: Step, episode: Episode) -> float:
    """What the resistance seen while the output gave something would have drawn. [A]"""
    trace, here = episode.trace, slice(step.first, step.stop)
    gives = trace.current[here] > 0.3 * trace.rated_current
    if step.kind == HELD or not gives.any():
        return math.nan
    seen = np.median(trace.voltage[here][gives] / trace.current[here][gives])
    resistance = float(seen) + episode.branch.resistance
    return episode.branch.voltage / resistance if resistance > 0 and step.kind != STEADY else math.nan
