"""Named sets of published limits: what each asks, and where every number of it stands.

The sets are data files beside this module. Their numbers are kept as printed; formulas are a ln P + b P + c of the
rated output power P, band by band.
"""

from __future__ import annotations

import math
from collections.abc import Mapping
from dataclasses import dataclass
from datetime import date
from functools import cache
from pathlib import Path
from typing import Any

from acceptance.limitfile.yamltree import read_tree

__all__ = [
    "EVIDENCE",
    "Band",
    "Formula",
    "Method",
    "PublishedSet",
    "Quantity",
    "SetConditions",
    "known_sets",
    "published_set",
]

FOLDER = Path(__file__).parent / "sets"

# how well a number is known -> in words
EVIDENCE: Mapping[str, str] = {
    "legal text": "read in the legal text",
    "secondary": "read in a secondary page that agrees with a legal text",
    "unconfirmed": "unconfirmed: from one weaker page or from memory, see the document before relying on it",
}


@dataclass(frozen=True, slots=True)
class Formula:
    """A limit as printed: a ln P + b P + c + d (N - 1), at most e. Texts, so that no printed digit is lost."""

    ln_p: str  # a; "" where the term is not there
    p: str  # b
    constant: str  # c
    per_further_port: str = ""  # d
    at_most: str = ""  # e

    def at(self, power: float, ports: int = 1) -> float:
        """The limit at a rated output power. [1 or W]

        Parameters
        ----------
        power
            Rated output power; above 0. [W]
        ports
            N, the number of adaptive ports and different fixed voltages; at least 1.
        """
        value = float(self.constant)
        value += float(self.ln_p) * math.log(power) if self.ln_p else 0.0
        value += float(self.p) * power if self.p else 0.0
        value += float(self.per_further_port) * (ports - 1) if self.per_further_port else 0.0
        return min(value, float(self.at_most)) if self.at_most else value

    def __str__(self) -> str:
        """As it is printed: "0.071 lnP − 0.0014 P + 0.67"."""
        terms = [(self.ln_p, " lnP"), (self.p, " P"), (self.constant, ""), (self.per_further_port, " (N − 1)")]
        kept = [(number, what) for number, what in terms if number and float(number)]
        text = "".join(f" {'−' if n.startswith('-') else '+'} {n.lstrip('-')}{what}" for n, what in kept)
        text = text.removeprefix(" + ") or self.constant
        return f"{text}, at most {self.at_most}" if self.at_most else text


@dataclass(frozen=True, slots=True)
class Band:
    """A formula and the rated output powers that it holds for."""

    bottom: float  # [W]
    holds_bottom: bool
    top: float  # [W]; infinite where it is open
    holds_top: bool
    formula: Formula
    evidence: str  # a key of EVIDENCE

    def holds(self, power: float) -> bool:
        """Whether a rated output power lies in it; an edge belongs to one band alone."""
        above = power > self.bottom or (self.holds_bottom and power == self.bottom)
        return above and (power < self.top or (self.holds_top and power == self.top))

    def __str__(self) -> str:
        """In words: "1 W < P ≤ 49 W"."""
        low = f"{self.bottom:g} W {'≤' if self.holds_bottom else '<'} " if self.bottom > 0 else ""
        high = f" {'≤' if self.holds_top else '<'} {self.top:g} W" if self.top < math.inf else ""
        if low and not high:
            return f"P {'≥' if self.holds_bottom else '>'} {self.bottom:g} W"
        return f"{low}P{high}" if low or high else "every P"


@dataclass(frozen=True, slots=True)
class Quantity:
    """One thing that a class asks, band by band."""

    key: str  # average_efficiency, no_load_power, efficiency_<load>, power_factor_<load>
    bands: tuple[Band, ...]

    @property
    def name(self) -> str:
        """How findings are called after it."""
        return self.characteristic if self.characteristic == "power_factor" else self.key

    @property
    def characteristic(self) -> str:
        """What is judged: efficiency, no_load_power or power_factor."""
        known = ("no_load_power", "power_factor")
        return next((name for name in known if self.key.startswith(name)), "efficiency")

    @property
    def load(self) -> float | None:
        """The one load that it is asked at, as a fraction; None for an average and for no load."""
        share = self.key.rpartition("_")[2]
        return int(share) / 100 if share.isdigit() else None

    @property
    def unit(self) -> str:
        """SI unit; "" for a ratio."""
        return "W" if self.characteristic == "no_load_power" else ""

    def limit(self, band: Band) -> str:
        """A band's limit in words: "≤ 0.100 W"."""
        sign, unit = ("≤", " W") if self.characteristic == "no_load_power" else ("≥", "")
        return f"{sign} {band.formula}{unit}"

    def band(self, power: float) -> Band | None:
        """The band that a rated output power lies in; None where nothing is asked there."""
        return next((band for band in self.bands if band.holds(power)), None)


@dataclass(frozen=True, slots=True)
class SetConditions:
    """Where a set is to be met."""

    clause: str
    input: float | None  # [V]; None where the limits file says it
    frequency: float | None  # [Hz]
    input_tolerance: float | None  # as a fraction of the input voltage
    loads: tuple[float, ...]  # whose efficiencies are averaged, in the order they are run
    load_tolerance: float  # of rated current, or power
    load_tolerance_several: float | None  # the same for several outputs, where it differs
    light_load_tolerance: float  # the same at loads up to 10 %
    minimum_current: str  # the clause that lets an output be run at its stated minimum; "" where none does

    def tolerance(self, load: float, *, several: bool) -> float:
        """How far a load may lie from the one asked for, as a fraction of what is rated."""
        if several and self.load_tolerance_several is not None:
            return self.load_tolerance_several
        return self.light_load_tolerance if load <= 0.1 + 1e-12 else self.load_tolerance


@dataclass(frozen=True, slots=True)
class Method:
    """What the method asks beside the conditions: held against the log, and told where it differs."""

    document: str
    unlogged: tuple[str, ...]  # what no log shows
    warm_up: float | None  # at full load before the first point [s]
    watch: float | None  # how long the input power is watched at every point [s]
    drift: float | None  # the largest one over that time, as a fraction of the largest input power
    drift_several: float | None  # the same for several outputs
    ambient: tuple[float, float] | None  # [°C]
    load_mode: str  # "" where none is asked


@dataclass(frozen=True, slots=True)
class PublishedSet:
    """One named set."""

    name: str
    title: str
    kind: str  # external supply, internal supply, weights
    document: str
    clause: str
    since: date | None  # from when it applies
    until: date | None  # the last day
    counts: str  # what the dates are compared with, in words
    early: str  # what is said about meeting it early
    read: date  # when the document was read
    supply: str  # ac, or "" where it does not matter
    largest_output_voltage: float  # [V]; infinite where none is said
    isolated_outputs_are_one: bool  # whether several outputs of one voltage count as a single voltage
    notes: tuple[str, ...]
    test: SetConditions
    method: Method | None
    classes: Mapping[str, tuple[Quantity, ...]]
    reported: tuple[float, ...]  # loads whose efficiency is reported without a limit
    reported_above: float  # rated output power from where on [W]
    weights: Mapping[float, float]  # load, of rated output power -> weight
    evidence: str  # of the weights

    def reports(self, power: float) -> tuple[float, ...]:
        """Loads whose efficiency is to be reported without a limit, at a rated output power."""
        return self.reported if power > self.reported_above else ()


def known_sets() -> tuple[str, ...]:
    """The names of all sets, in alphabetical order."""
    return tuple(sorted(path.stem for path in FOLDER.glob("*.yaml")))


@cache
def published_set(name: str) -> PublishedSet:
    """One set by its name.

    Raises
    ------
    KeyError
        If no set is called so.
    """
    if name not in known_sets():
        raise KeyError(name)
    content: Any = read_tree((FOLDER / f"{name}.yaml").read_bytes()).plain()
    return _set(name, content)


# --- from the data file ---------------------------------------------------------------------------------------------


def _set(name: str, raw: Mapping[str, Any]) -> PublishedSet:
    return PublishedSet(
        name=name,
        title=raw["title"],
        kind=raw["kind"],
        document=raw["document"],
        clause=raw["clause"],
        since=_day(raw.get("from")),
        until=_day(raw.get("until")),
        counts=raw.get("counts", ""),
        early=raw.get("early", ""),
        read=date.fromisoformat(raw["read"]),
        supply=raw.get("supply", ""),
        largest_output_voltage=float(raw.get("largest_output_voltage", "inf")),
        isolated_outputs_are_one=raw.get("isolated_outputs_are_one") == "true",
        notes=tuple(raw["notes"]),
        test=_test(raw["test"]),
        method=_method(raw["method"]) if "method" in raw else None,
        classes={name: _class(rows) for name, rows in raw.get("classes", {}).items()},
        reported=tuple(map(float, raw.get("reported", ()))),
        reported_above=float(raw.get("reported_above", "0")),
        weights={float(load): float(weight) for load, weight in raw.get("weights", {}).items()},
        evidence=raw.get("evidence", ""),
    )


def _test(raw: Mapping[str, Any]) -> SetConditions:
    return SetConditions(
        clause=raw["clause"],
        input=_number(raw.get("input")),
        frequency=_number(raw.get("frequency")),
        input_tolerance=_number(raw.get("input_tolerance")),
        loads=tuple(map(float, raw.get("loads", ()))),
        load_tolerance=float(raw["load_tolerance"]),
        load_tolerance_several=_number(raw.get("load_tolerance_several")),
        light_load_tolerance=float(raw.get("light_load_tolerance", raw["load_tolerance"])),
        minimum_current=raw.get("minimum_current", ""),
    )


def _method(raw: Mapping[str, Any]) -> Method:
    ambient = raw.get("ambient")
    return Method(
        document=raw["document"],
        unlogged=tuple(raw["unlogged"]),
        warm_up=_number(raw.get("warm_up")),
        watch=_number(raw.get("watch")),
        drift=_number(raw.get("drift")),
        drift_several=_number(raw.get("drift_several")),
        ambient=(float(ambient[0]), float(ambient[1])) if ambient is not None else None,
        load_mode=raw.get("load_mode", ""),
    )


def _class(rows: Mapping[str, list[dict[str, str]]]) -> tuple[Quantity, ...]:
    return tuple(Quantity(key, _bands(bands)) for key, bands in rows.items())


def _bands(raw: list[dict[str, str]]) -> tuple[Band, ...]:
    found: list[Band] = []
    for band in raw:
        bottom, holds_bottom = (found[-1].top, not found[-1].holds_top) if found else (0.0, False)
        if "above" in band or "from" in band:
            bottom, holds_bottom = float(band.get("above") or band["from"]), "from" in band
        top = float(band.get("up_to") or band.get("below") or "inf")
        formula = Formula(
            band.get("ln_p", ""),
            band.get("p", ""),
            band["constant"],
            band.get("per_further_port", ""),
            band.get("at_most", ""),
        )
        found.append(Band(bottom, holds_bottom, top, "up_to" in band, formula, band["evidence"]))
    return tuple(found)


def _number(text: str | None) -> float | None:
    return None if text is None else float(text)


def _day(text: str | None) -> date | None:
    return None if text is None else date.fromisoformat(text)
