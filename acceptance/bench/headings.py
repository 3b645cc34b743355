"""A heading as written -> the channel it names, its unit, and the reason in words.

Nothing is guessed: a heading is taken for a channel only where its words mean that channel and no other.
Words may be joined by a space, "_", "." or "-", in any case. A unit stands in brackets, after "/", or as the
last word; its case counts, except that an all-lower-case heading can only mean milli by "m".
"""

from __future__ import annotations

import re
from collections.abc import Mapping, Sequence
from dataclasses import dataclass, replace

from acceptance.bench.log import OUTPUT_QUANTITIES, QUANTITIES, channel_key
from acceptance.units import UNITS, Unit

__all__ = ["Heading", "Vocabulary", "plain", "resolve_unit", "shown"]

# Names and the trade's abbreviations, joints left out. Every word here has one meaning on a bench.
_NAMES: dict[str, str] = {
    "time": "time t timestamp datetime clock elapsed elapsedtime timeelapsed testtime relativetime seconds zeit "
    "zeitstempel uhrzeit date datum heure timeutc dateandtime datetimeutc date/time date&time dateheure datumuhrzeit "
    "datumundzeit",
    "input_voltage": "inputvoltage voltagein voltageinput vinput uinput vin uin vi mainsvoltage "
    "eingangsspannung uein tensionentree tensiondentree tensiond'entrée tensiondentrée tensionentrée",
    "input_current": "inputcurrent currentin currentinput iinput iin eingangsstrom iein courantentree courantdentree "
    "courantd'entrée courantentrée",
    "input_power": "inputpower powerin powerinput pinput pin eingangsleistung pein puissanceentree "
    "puissanced'entrée puissanceentrée",
    "power_factor": "powerfactor pf cosphi cosφ cosϕ leistungsfaktor facteurdepuissance",
    "output_voltage": "outputvoltage voltageout voltageoutput voutput uoutput vout uout vo uo vload uload loadvoltage "
    "ausgangsspannung uaus tensionsortie tensiondesortie",
    "output_current": "outputcurrent currentout currentoutput ioutput iout io iload loadcurrent ausgangsstrom iaus "
    "laststrom courantsortie courantdesortie",
    "output_power": "outputpower powerout poweroutput poutput pout po pload loadpower ausgangsleistung paus "
    "puissancesortie puissancedesortie",
    "load_setting": "loadsetting loadset iset currentset setcurrent currentsetting rset",
    "load_mode": "loadmode mode",
    "ambient_temperature": "ambienttemperature ambienttemp ambient temperatureambient tempambient tempamb tamb "
    "tambient ambtemp ta roomtemperature troom umgebungstemperatur tumg temperatureambiante",
    "ripple": "ripple vripple uripple rippleptp ripplepp ripplepktopk ripplepkpk rippleptop ripplevoltage "
    "outputripple rippleandnoise ripplenoise ripple+noise ripple&noise vrip restwelligkeit",
    "winding_resistance": "windingresistance resistancewinding rw rwdg rwind rwinding wicklungswiderstand",
    "stage": "stage teststage",
    "serial": "serial sn s/n serialnumber serialno serialnr serialnum unitserial dutserial seriennummer numérodesérie",
}
_ALIASES = {word: quantity for quantity, words in _NAMES.items() for word in words.split()}
_DATE_WORDS = frozenset({"date", "datum"})
_TEMPERATURE_WORDS = frozenset({"t", "temp", "temperature", "temperatur"})
_GLUED_PROBES = {"tcase": "case", "tcore": "core", "twinding": "winding", "twdg": "winding", "theatsink": "heatsink"}
# "t_on" and their like are times; "T_set", "T_rise" and their like are no readings of a probe
_NO_PROBE_WORDS = (
    "on off start stop end rise fall rec recovery delay hold step set setpoint sample samples stamp dwell min max "
    "avg mean std delta diff limit rate abs rel total elapsed meas zero"
)
_NO_PROBE = frozenset(_NO_PROBE_WORDS.split())
_NO_QUALIFIER_WORDS = (
    "rms pp p pk peak ac dc range error err status sense target nominal nom rated corr corrected raw ref cal average "
    "sd ripple noise u unc uncertainty and in out l n"
)
_NO_QUALIFIER = _NO_PROBE | frozenset(_NO_QUALIFIER_WORDS.split())

# a unit in the wrong case, or one not known here, is no output's name
_UNITLIKE = re.compile(r"[munk\u00b5\u03bc]?(?:v|a|w|va|var|wh|ah|ohm|hz|s|db)(?:pp|rms|dc|ac)?", re.IGNORECASE)

_UNIT_WORDS = {
    "volt": "V", "volts": "V", "millivolt": "mV", "millivolts": "mV", "amp": "A", "amps": "A", "ampere": "A",
    "amperes": "A", "milliamp": "mA", "milliamps": "mA", "watt": "W", "watts": "W", "milliwatt": "mW",
    "milliwatts": "mW", "ohms": "ohm", "ohm": "ohm", "sec": "s", "second": "s", "seconds": "s", "sek": "s",
    "minutes": "min", "minute": "min", "hours": "h", "hour": "h", "celsius": "°C", "degc": "°C", "deg.c": "°C",
    "deg c": "°C", "° c": "°C", "fahrenheit": "°F", "degf": "°F", "deg f": "°F", "percent": "%", "msec": "ms",
}  # fmt: skip
_LOWER_UNITS = {symbol.lower(): symbol for symbol in ("V", "mV", "uV", "kV", "A", "mA", "uA", "W", "mW", "uW", "kW")}
_LOWER_UNITS |= {"°c": "°C", "°f": "°F", "µv": "µV", "µa": "µA", "µw": "µW"}
_ELECTRICAL = re.compile(r"([munkM\u00b5\u03bc]?[VA])[ _]?(dc|DC|ac|AC|rms|RMS|eff)$")
_PEAK_TO_PEAK = re.compile(r"([mun\u00b5\u03bc]?V|mv|v|uv)[ _]?(pp|PP|p-p|pk-pk|p_p|ptp)$")
_BRACKETS = re.compile(r"[(\[{]([^()\[\]{}]*)[)\]}]")
_JOINT = re.compile(r"[\s_.\-]+")
_FORMAT = re.compile(r"(?=.*[:\-/.])[hHmMsSyYdDTfF:./\-\s0]+|HH?MM?SS?|hms|local|utc|UTC", re.ASCII)
_SINGLE_IN = re.compile(r"[A-Za-z]\s+in\s+[^\s(\[{/]\S*", re.ASCII)
_CONTROL = re.compile(r"[\x00-\x1f\x7f-\x9f\u2028\u2029\ud800-\udfff]+")


def shown(text: object, length: int = 60) -> str:
    """The text on one line, cut to `length`: what a file holds is only text, but a message is one line."""
    line = _CONTROL.sub(" ", str(text)).strip()
    return line if len(line) <= length else line[: length - 1] + "…"


def resolve_unit(text: str, kind: str, *, lower: bool = False) -> Unit | None:
    """The unit that `text` stands for in a column of this kind, or None where it is no known unit.

    Its kind may differ from the one asked for; the caller says so. `lower`: the heading has no capital, so
    that "mv" can only be mV. C and F mean degrees in a column of temperatures and nowhere else.
    """
    text = text.strip()
    if kind == "temperature" and text in ("C", "F", "c", "f"):
        return UNITS["°" + text.upper()] if text.isupper() or lower else None
    unit = UNITS.get(text)
    if unit is not None:
        return unit
    symbol = _UNIT_WORDS.get(text.casefold()) or (_LOWER_UNITS.get(text) if lower else None)
    if symbol is not None:
        return UNITS[symbol]
    match = _ELECTRICAL.match(text) or _PEAK_TO_PEAK.match(text)
    if match is None or (match.re is _PEAK_TO_PEAK and not lower and match[1].islower()):
        return None
    found = UNITS.get(match[1]) or UNITS.get(_LOWER_UNITS.get(match[1], ""))
    return replace(found, symbol=text) if found is not None else None


@dataclass(frozen=True, slots=True)
class Heading:
    """What a heading was taken for; `quantity` is empty where it was not understood."""

    text: str  # as written
    quantity: str
    qualifier: str
    unit: str  # as written in the heading or the limits file, "" where none is
    unit_from: str  # "heading", "limits file", or "" where none is told yet
    reason: str
    is_date: bool = False  # a column of dates, whose times stand in another
    is_lower: bool = False  # no capital in it
    is_chosen: bool = False  # named by the limits or bench file

    @property
    def key(self) -> str:
        """The channel's key."""
        return channel_key(self.quantity, self.qualifier)

    @property
    def kind(self) -> str:
        """The kind of its unit, "any" or "text"; "" where the heading was not understood."""
        return QUANTITIES.get(self.quantity, "")

    @property
    def is_number(self) -> bool:
        """Whether its cells are readings (or times)."""
        return self.kind not in ("", "text")


class Vocabulary:
    """What headings mean for one product: the trade's words, the outputs' names, and the bench file's columns."""

    def __init__(
        self, columns: Mapping[str, tuple[str, str | None]] | None = None, outputs: Sequence[str] = ()
    ) -> None:
        self.outputs = tuple(outputs)
        self.columns = {self._own_key(key): value for key, value in (columns or {}).items()}
        self._by_output = self._output_words()
        self._known: dict[str, Heading] = {}
        self._chosen = {plain(heading): key for key, (heading, _) in self.columns.items()}
        self.numeric = any(heading[:1].isdigit() or heading[:1] in "+-." for heading in self._chosen)

    def read(self, text: str) -> Heading:
        """What this heading means; `numeric` tells that one of the chosen headings begins like a number."""
        known = self._known.get(text)
        if known is None:
            known = self._known[text] = self._read(text)
        return known

    def is_chosen(self, text: str) -> bool:
        """Whether the limits or bench file names this heading."""
        return plain(shown(text, 200)) in self._chosen

    def qualify(self, key: str) -> str:
        """The channel key, an unqualified output quantity given the first output's name."""
        return self._own_key(key)

    def _own_key(self, key: str) -> str:
        quantity, _, qualifier = key.partition(" ")
        return channel_key(quantity, self._default(quantity, qualifier))

    def _default(self, quantity: str, qualifier: str) -> str:
        return self.outputs[0] if not qualifier and self.outputs and quantity in OUTPUT_QUANTITIES else qualifier

    def _output_words(self) -> dict[str, tuple[str, str]]:
        words: dict[str, tuple[str, str]] = {}
        for output in reversed(self.outputs):
            name = _joined(output)
            for alias, quantity in _ALIASES.items():
                if quantity in OUTPUT_QUANTITIES and alias not in ("io", "vo", "uo", "po"):
                    words[alias + name] = words[name + alias] = (quantity, output)
        return words

    def _read(self, text: str) -> Heading:
        stripped = shown(text, 200)
        if not stripped:
            return _unread(text, "it is empty")
        chosen = self._chosen.get(plain(stripped))
        if chosen is not None:
            return self._from_limits_file(text, chosen)
        if len(stripped) > 80:
            return _unread(text, "it is too long for a heading")
        if _SINGLE_IN.fullmatch(stripped):
            return _unread(text, f'"{stripped}" may name an input or a unit')
        return self._from_words(text, stripped)

    def _from_limits_file(self, text: str, key: str) -> Heading:
        quantity, _, qualifier = key.partition(" ")
        unit = self.columns[key][1]
        lower = text == text.lower()
        reason = f'heading "{shown(text)}" is {_words(key)}, as the limits or bench file says'
        if unit is not None:
            return Heading(text, quantity, qualifier, unit, "limits file", reason, is_lower=lower, is_chosen=True)
        found, _ = _bracketed(shown(text, 200), QUANTITIES.get(quantity, ""), lower=lower)
        if not found:
            last = _JOINT.split(text.strip())[-1]
            if last != text.strip() and resolve_unit(last, QUANTITIES.get(quantity, ""), lower=lower):
                found = last
        origin = "heading" if found else ""
        return Heading(text, quantity, qualifier, found, origin, reason, is_lower=lower, is_chosen=True)

    def _from_words(self, text: str, stripped: str) -> Heading:
        lower = stripped == stripped.lower()
        unit, rest = _bracketed(stripped, "temperature", lower=lower)
        where = "in brackets or after a stroke"
        tokens = [token for token in _JOINT.split(rest) if token]
        meaning = self._meaning(tokens, unit, lower=lower)
        if meaning is None and not unit:
            unit, tokens = _last_word_unit(tokens, lower=lower)
            where = "as the last word"
            meaning = self._meaning(tokens, unit, lower=lower) if unit else self._loose(tokens, "", lower=lower)
        if meaning is None and unit:
            meaning = self._loose(tokens, unit, lower=lower)
        if meaning is None:
            return _unread(text, self._why_not(tokens))
        quantity, qualifier, is_date = meaning
        if quantity != "ripple" and _PEAK_TO_PEAK.match(unit):
            return _unread(text, f'"{unit}" is a peak-to-peak unit, and only a ripple has one')
        qualifier = self._default(quantity, qualifier)
        reason = f'heading "{shown(text)}" is {_words(channel_key(quantity, qualifier))}'
        if unit:
            reason += f"; unit {unit} {where}"
        origin = "heading" if unit else ""
        return Heading(text, quantity, qualifier, unit, origin, reason, is_date=is_date, is_lower=lower)

    def _meaning(self, tokens: list[str], unit: str, *, lower: bool) -> tuple[str, str, bool] | None:
        """Words that mean one channel by themselves, output names included."""
        joined = "".join(tokens).casefold()
        if joined in self._by_output:
            return (*self._by_output[joined], False)
        if tokens == ["T"] or (joined == "t" and unit):
            return _single_t(unit, lower=lower)
        quantity = _ALIASES.get(joined)
        if quantity is not None:
            return quantity, "", joined in _DATE_WORDS
        if joined in ("input", "output") and unit:
            found = resolve_unit(unit, "", lower=lower)
            by_kind = f"{joined}_{found.kind}" if found else ""
            return (by_kind, "", False) if by_kind in QUANTITIES else None
        return None

    def _loose(self, tokens: list[str], unit: str, *, lower: bool) -> tuple[str, str, bool] | None:
        """A quantity with a probe, or with an output's name where the outputs are not told."""
        if tokens and tokens[-1] == "in" and unit:
            found = self._meaning(tokens[:-1], unit, lower=lower)
            if found is not None:
                return found
        probe = _probe(tokens, unit, lower=lower)
        if probe is not None:
            return "temperature", probe, False
        if self.outputs or len(tokens) < 2 or tokens[-1].casefold() in _NO_QUALIFIER or _UNITLIKE.fullmatch(tokens[-1]):
            return None
        quantity = _ALIASES.get("".join(tokens[:-1]).casefold())
        return (quantity, tokens[-1], False) if quantity in OUTPUT_QUANTITIES else None

    def _why_not(self, tokens: list[str]) -> str:
        for end in range(len(tokens) - 1, 0, -1):
            quantity = _ALIASES.get("".join(tokens[:end]).casefold())
            if quantity is not None and len("".join(tokens[:end])) > 1:
                rest = shown(" ".join(tokens[end:]), 40)
                outputs = f" and no output's name ({', '.join(map(shown, self.outputs))})" if self.outputs else ""
                return f'it begins like {_words(quantity)}, but "{rest}" is no known unit{outputs}'
        return "it names no quantity known here"


def _words(key: str) -> str:
    return key.replace("_", " ")


def plain(heading: str) -> str:
    """A heading as it is compared: in any case, with single spaces."""
    return " ".join(heading.split()).casefold()


def _joined(text: str) -> str:
    return "".join(_JOINT.split(text)).casefold()


def _unread(text: str, reason: str) -> Heading:
    return Heading(text, "", "", "", "", reason)


def _bracketed(text: str, kind: str, *, lower: bool) -> tuple[str, str]:
    """The unit in brackets or after a stroke, and the heading without it; other brackets' words stay words."""
    unit = ""

    def keep(match: re.Match[str]) -> str:
        nonlocal unit
        content = match[1].strip()
        if not unit and content and resolve_unit(content, kind, lower=lower):
            unit = content
            return " "
        return " " if _FORMAT.fullmatch(content) else f" {content} "

    rest = _BRACKETS.sub(keep, text)
    if not unit and "/" in rest:
        head, _, tail = rest.rpartition("/")
        if head.strip() and resolve_unit(tail, kind, lower=lower):
            return tail.strip(), head
        if rest.strip().casefold() in ("date/time", "date / time"):
            rest = "datetime"
    return unit, rest


def _last_word_unit(tokens: list[str], *, lower: bool) -> tuple[str, list[str]]:
    if len(tokens) > 2 and tokens[-2].casefold() in ("deg", "°") and tokens[-1].casefold() in ("c", "f"):
        return f"°{tokens[-1].upper()}", tokens[:-2]
    if len(tokens) > 1 and tokens[-1] != "min" and resolve_unit(tokens[-1], "temperature", lower=lower):
        head = tokens[0].casefold()
        # C and F are degrees only under a temperature
        if tokens[-1].upper() not in ("C", "F") or head in _TEMPERATURE_WORDS or "temp" in "".join(tokens).casefold():
            return tokens[-1], tokens[:-1]
    return "", tokens


def _single_t(unit: str, *, lower: bool) -> tuple[str, str, bool] | None:
    """A lone T is a temperature or a time; only its unit tells."""
    found = resolve_unit(unit, "temperature", lower=lower) if unit else None
    if found is None:
        return None
    return ("time", "", False) if found.kind == "time" else ("temperature", "", False)


def _probe(tokens: list[str], unit: str, *, lower: bool) -> str | None:
    """The probe of a temperature, in lower case; None where these words are no temperature."""
    words = [token.casefold() for token in tokens]
    if not words:
        return None
    glued = _GLUED_PROBES.get("".join(words))
    if glued:
        return glued
    found = resolve_unit(unit, "temperature", lower=lower) if unit else None
    in_degrees = found is not None and found.kind == "temperature"
    if words[0] in _TEMPERATURE_WORDS:
        probe = words[1:]
    elif words[-1] in ("temp", "temperature"):
        probe = words[:-1]
    elif in_degrees and len(words) == 1 and re.fullmatch(r"t\d{1,3}", words[0]):
        probe = [words[0][1:]]
    else:
        return None
    if not probe and words[0] == "t":
        return None
    if _NO_PROBE.intersection(probe) or (words[0] == "t" and probe[0].isdigit() and not in_degrees):
        return None
    return " ".join(probe)
