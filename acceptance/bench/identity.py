"""Whose log it is, and of which day: what columns, notes and names claim, and what happens where they differ."""

from __future__ import annotations

from collections.abc import Iterable, Mapping, Sequence
from contextlib import suppress
from dataclasses import dataclass
from datetime import date, timedelta

from acceptance.bench.assemble import Samples
from acceptance.bench.clocks import parse_day
from acceptance.bench.headings import shown
from acceptance.bench.log import Doubt
from acceptance.bench.table import DATE_NOTES, SERIAL_NOTES
from acceptance.errors import LogError, SeveralSerialsError

__all__ = ["Claim", "day_of_test", "serial_of"]

Notes = Mapping[str, Sequence[str]]  # every different value of a note


@dataclass(frozen=True, slots=True)
class Claim:
    """What one file says about whose log it is."""

    file: str
    columns: tuple[str, ...]  # serials in its columns
    notes: Notes
    stem: str  # the file's name without its stage

    def told(self) -> dict[str, str]:
        """Serials in columns and notes, each with the word for where it stands."""
        noted = [text for key in SERIAL_NOTES for text in self.notes.get(key, ()) if text]
        return dict.fromkeys(noted, "note") | dict.fromkeys(self.columns, "column")

    def is_open(self) -> bool:
        """Whether --serial can say which is right: no column and no note has two serials by itself."""
        return len(self.columns) < 2 and all(len(self.notes.get(key, ())) < 2 for key in SERIAL_NOTES)


def serial_of(claims: Sequence[Claim], given: str | None) -> tuple[str, str, list[Doubt]]:
    """The unit's serial, what told it, and a doubt where another is told that was not believed.

    Raises
    ------
    SeveralSerialsError
        If columns, notes or names tell several, and `given` does not settle it.
    LogError
        If nothing tells a serial.
    """
    told: dict[str, str] = {}
    named: dict[str, str] = {}
    doubts: list[Doubt] = []
    for claim in claims:
        own = claim.told()
        if given in own and len(own) > 1 and claim.is_open():
            doubts += _differing(given, own)
            own = {given: own[given]}
        told |= {text: origin for text, origin in own.items() if text not in told}
        if not own and claim.stem:
            named.setdefault(claim.stem, "file name")
    listed = ", ".join(claim.file for claim in claims)
    if len(told) > 1:
        raise _several(listed, _by_columns_first(told), "the logs belong to", _way_out(claims))
    if given is not None:
        return given, "--serial", doubts or _differing(given, told)
    both = {**told, **named}
    if len(both) > 1:
        raise _several(listed, list(both), "the names of the logs tell", " or say which unit it is with --serial")
    if not both:
        raise LogError(listed, "no serial is told by the log or its name", "give it with --serial")
    unit, origin = next(iter(both.items()))
    return unit, origin, []


def _by_columns_first(told: Mapping[str, str]) -> list[str]:
    return sorted(told, key=lambda text: told[text] != "column")


def _way_out(claims: Sequence[Claim]) -> str:
    """What --serial can do where one file contradicts itself."""
    sets = [(set(claim.told()), claim.is_open()) for claim in claims if claim.told()]
    shared = set.intersection(*(texts for texts, _ in sets))
    if shared and all(is_open or len(texts) == 1 for texts, is_open in sets):
        return " or say which unit it is with --serial"
    return ""


def _several(listed: str, serials: Sequence[str], tell: str, way_out: str) -> SeveralSerialsError:
    units = ", ".join(shown(text, 30) for text in serials[:6])
    what = "units" if tell.endswith("to") else "serials"
    found = f"{tell} {len(serials)} {what}: {units}"
    expected = f"give the logs of one unit{',' if way_out else ''}{way_out}"
    return SeveralSerialsError(listed, found, expected, serials=tuple(serials))


def _differing(given: str, told: Mapping[str, str]) -> list[Doubt]:
    return [
        Doubt(
            "serial differs",
            f'--serial says "{shown(given)}", and the log\'s serial {origin} says "{shown(text)}"',
            remedy="make sure that these are the logs of this unit",
        )
        for text, origin in told.items()
        if text != given
    ]


def day_of_test(tables: Iterable[tuple[Samples, Notes]]) -> tuple[date | None, list[Doubt]]:
    """The day of the test: the latest that any sample lies in, which no calibration may be past; None where not told.

    A table without dates has its file's note, and a day more for each midnight that its clock passes.
    """
    days: list[date] = []
    doubts: list[Doubt] = []
    for samples, notes in tables:
        doubts += [Doubt(kind, f"{samples.name}: {text}", channels=("time",)) for kind, text in samples.doubts]
        if samples.day is not None:
            days.append(samples.day)
            continue
        noted, unclear = _noted_day(notes)
        if noted is not None:
            with suppress(OverflowError):  # a day beyond the year 9999
                noted += timedelta(days=samples.days_on)
            days.append(noted)
        elif unclear is not None and unclear not in doubts:
            doubts.append(unclear)
    return max(days, default=None), doubts


def _noted_day(notes: Notes) -> tuple[date | None, Doubt | None]:
    """The latest day of the first note that tells one, else a doubt about one that may be read in two ways."""
    unclear = None
    for key in DATE_NOTES:
        read = [(text, *parse_day(text)) for text in notes.get(key, ())]
        days = [day for _, day, _ in read if day is not None]
        if days:
            return max(days), None
        either = next((text for text, _, is_either in read if is_either), None)
        if either is not None and unclear is None:
            found = f'the note "{key}: {shown(either)}" may be day/month or month/day: no test date is taken from it'
            unclear = Doubt("ambiguous date", found, remedy="write dates as 2026-05-04")
    return None, unclear
