"""What betrays an ambient that is none: one that the unit itself warms, or one in another unit of temperature."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from acceptance.errors import MeasurementError
from acceptance.thermal.soak import Soak
from acceptance.thermal.warming import Warming

__all__ = ["ambient_doubt", "see_to_room_level"]

Floats = NDArray[np.float64]

_LEAST_WARMED = 2.0  # that the ambient rose with the unit [K]
_SHARE_WARMED = 0.06  # of what the probe rose
_LIKENESS = 0.9  # of the ambient's variance that the probe's course explains
_BETTER = 0.5  # times what a room that drifts by itself leaves unexplained
_SOON = (0.01, 0.02, 0.04, 0.08)  # time constants of the air about the unit, as shares of the soak
_BELOW = 3.0  # that a unit may begin below its room [K]
_FEWEST = 8  # readings
_USUAL = 40.0  # highest ambient, where none is rated (common practice, no source) [°C]
_ABOVE_RATED = 20.0  # an ambient so far above it is none [K]
_AT_START = 1.5  # how well a cold probe that reads in °F agrees with its room [K]
_MOVED = 10.0  # that it rose [K]


def ambient_doubt(warming: Warming) -> str:
    """Why the rise is only known at the least, as the ambient seems to read too high; "" where it does not."""
    return _above_a_cold_unit(warming) or _warmed_by_the_unit(warming)


def _above_a_cold_unit(warming: Warming) -> str:
    """A unit that was left off has its room's temperature when the soak begins."""
    below = -float(warming.rise[0])
    if below < _BELOW:
        return ""
    return (
        f"the probe begins about {below:.1f} K below the ambient: its sensor reads too high or stands too warm, or "
        "the unit came in cold; see which, let the unit take the temperature of the room, and record the soak again"
    )


def _warmed_by_the_unit(warming: Warming) -> str:
    """Why the ambient is none: its sensor feels the unit's heat; "" where it does not.

    A room drifts by itself, along a line or a bow; a sensor beside the unit follows the unit's own curve. The rise
    over such a reading is too small.
    """
    time, probe, room = warming.time, warming.probe, warming.ambient
    if time.size < _FEWEST or not np.ptp(probe) > 0:
        return ""
    place = (time - time[0]) / (time[-1] - time[0])
    # the unit's own curve, or that of a part of it that is warm sooner
    courses = [(probe - probe[0]) / np.ptp(probe), *(-np.expm1(-place / share) for share in _SOON)]
    left = [_left(np.column_stack([np.ones(time.size), course]), room) for course in courses]
    followed, found = min(left, key=lambda one: one[0])
    warmed = float(found[1])
    if warmed < max(_LEAST_WARMED, _SHARE_WARMED * float(np.ptp(probe))):
        return ""
    drifted, _ = _left(np.column_stack([np.ones(time.size), place, place**2]), room)
    total = float(np.square(room - room.mean()).sum())
    if followed > (1 - _LIKENESS) * total or followed > _BETTER * drifted:
        return ""
    return (
        f"the ambient rises by {warmed:.2g} K along with the unit, so that its sensor feels the unit's heat and the "
        "rise over it is too small; move the sensor away from the unit and out of its warm air, 1 m or more, and "
        "record the soak again"
    )


def _left(basis: Floats, values: Floats) -> tuple[float, Floats]:
    """Sum of squares that a linear model leaves, and its parameters."""
    found: Floats = np.linalg.lstsq(basis, values, rcond=None)[0].astype(np.float64, copy=False)
    return float(np.square(values - basis @ found).sum()), found


def see_to_room_level(
    soak: Soak, key: str, values: Floats, *, ambient: Floats | float | None, rated: float | None
) -> None:
    """See to it that the ambient is one of a room, and that the probe reads in its unit of temperature.

    Raises
    ------
    MeasurementError
        If the ambient lies far above the highest rated one, or the cold probe reads what the room is in °F.
    """
    if ambient is None:
        return
    room = float(np.nanmedian(ambient))
    highest = _USUAL if rated is None else max(rated, _USUAL)
    if room > highest + _ABOVE_RATED:
        msg = (
            f"the ambient reads {room:.1f} °C ({soak.where}), {room - highest:.0f} K above {highest:g} °C: see whether "
            "it was logged in °F (write the unit into its heading), or whether its column is that of a probe"
        )
        raise MeasurementError(msg)
    known = np.flatnonzero(np.isfinite(values))
    first = float(values[known[0]])
    cold = float(ambient[known[0]]) if isinstance(ambient, np.ndarray) else ambient
    rose = float(np.nanmax(values)) - first
    if np.isfinite(cold) and abs(first - (1.8 * cold + 32)) <= _AT_START and rose > _MOVED:
        msg = (
            f"{key} begins at {first:.1f} °C in a room of {cold:.1f} °C ({soak.where}), which is the room in °F: write "
            "the unit into its heading, or let the unit cool down before the soak if it was truly so warm"
        )
        raise MeasurementError(msg)
