"""The record: everything one decision rests on, as plain values, and its JSON.

The record is the only bridge to the report. Field names here are the keys of the file. Values are SI; ratios are
fractions; temperatures in °C, differences in K. A value that is not known is null, never zero.

    build it        decision and points -> Record          (acceptance.judge)
    write_record    Record -> <serial>.record.json         one that is there and differs is kept
    read_record     file -> Record                         refused with a clear word where it is none
    record_schema   the JSON Schema that ships with the package
"""

from __future__ import annotations

import hashlib
import json
import math
import os
import re
import tempfile
from collections.abc import Mapping, Sequence
from dataclasses import asdict, dataclass, field, replace
from functools import cache
from pathlib import Path
from typing import TYPE_CHECKING, Any, Literal

from acceptance.errors import RecordError

if TYPE_CHECKING:
    from pydantic import TypeAdapter

__all__ = [
    "VERSION",
    "Alternative",
    "AtDwell",
    "Axis",
    "BudgetLine",
    "DecisionRule",
    "Deviation",
    "Evidence",
    "Figure",
    "Finding",
    "FindingVerdict",
    "Hazard",
    "Health",
    "InstrumentUsed",
    "LimitLine",
    "LimitsUsed",
    "Mark",
    "Output",
    "Point",
    "Ratings",
    "Reading",
    "Record",
    "Region",
    "Series",
    "TestFacts",
    "Unit",
    "UnitVerdict",
    "read_record",
    "record_schema",
    "record_text",
    "safe_stem",
    "write_record",
]

VERSION: Literal[1] = 1

FindingVerdict = Literal["pass", "conditional pass", "conditional fail", "fail", "not judged"]
UnitVerdict = Literal["accepted", "rejected", "undecided"]


@dataclass(frozen=True, slots=True)
class Unit:
    """The power source under test."""

    product: str
    revision: str | None
    serial: str


@dataclass(frozen=True, slots=True)
class Output:
    """One rated output."""

    name: str
    voltage: float  # [V]
    current: float  # [A]


@dataclass(frozen=True, slots=True)
class Ratings:
    """The product's plate."""

    supply: Literal["ac", "dc"]
    input_voltage: float  # [V]
    input_range: list[float] | None  # [V], two
    frequency: float | None  # [Hz]
    outputs: list[Output]
    ambient: float | None  # [°C]
    protection_class: str | None


@dataclass(frozen=True, slots=True)
class TestFacts:
    """When and how the test was run, as far as the log and the limits file tell."""

    __test__ = False  # no test of pytest's

    date: str | None  # ISO 8601 day
    stages: list[str]
    samples: int
    load_mode: str | None
    settle: float | None  # [s]; null: found from the data
    min_dwell: float | None  # [s]
    ambient: list[float] | None  # lowest and highest [°C]
    serial_from: str
    stated: dict[str, float]  # channel -> value not logged, only stated


@dataclass(frozen=True, slots=True)
class DecisionRule:
    """How a value and its uncertainty become a verdict."""

    rule: Literal["simple", "guarded", "conditional"]
    confidence: float
    required_probability: float | None  # of conformity, for a pass; null under the simple rule
    load_tolerance: float | None  # of rated current; null: the default
    input_tolerance: float | None  # of the input voltage; null: the default


@dataclass(frozen=True, slots=True)
class BudgetLine:
    """One source of uncertainty of a finding."""

    source: str
    kind: Literal["A", "B"]
    contribution: float  # standard uncertainty it brings to the value, in the value's unit
    share: float  # of the variance; negative where a correlation takes away
    degrees_of_freedom: float | None  # null: infinite


@dataclass(frozen=True, slots=True)
class AtDwell:
    """One of the points a value was formed from."""

    point: int  # index into Record.points
    role: str  # "no load", "full load", "25 %", ...


@dataclass(frozen=True, slots=True)
class Alternative:
    """What another dwell that meets the same condition gave; the least favourable one is the finding."""

    where: str
    value: float | None
    expanded_uncertainty: float | None
    margin: float | None
    conformity_probability: float | None
    verdict: FindingVerdict
    reason: str = ""
    at: str = ""  # the operating condition that was run


@dataclass(frozen=True, slots=True)
class Deviation:
    """How the test differed from what the requirement asks of the method."""

    text: str


@dataclass(frozen=True, slots=True)
class Finding:
    """One requirement's outcome."""

    name: str
    characteristic: str
    condition: str
    value: float | str | None
    unit: str
    expanded_uncertainty: float | None
    coverage_factor: float | None
    degrees_of_freedom: float | None  # null: infinite, or not known
    min: float | None
    max: float | None
    margin: float | None
    conformity_probability: float | None
    verdict: FindingVerdict
    reason: str
    standard_uncertainty: float | None = None
    output: str = ""
    where: str = ""  # file and lines of the dwell, or dwells
    at: str = ""  # the operating condition that was run, where the condition leaves it open
    note: str = ""  # of the limits file: where the limit was taken from
    formula: str = ""  # how the value is formed, in one line
    points: list[AtDwell] = field(default_factory=list)
    others: list[Alternative] = field(default_factory=list)
    budget: list[BudgetLine] = field(default_factory=list)
    deviations: list[Deviation] = field(default_factory=list)
    asked: str = ""  # the limit, where it is one in words: "hiccup"

    @property
    def in_per_cent(self) -> bool:
        """Whether a ratio is spoken of in per cent; a power factor is not."""
        return self.characteristic != "power_factor"


@dataclass(frozen=True, slots=True)
class Reading:
    """The mean of one channel over one dwell."""

    value: float
    unit: str
    standard_uncertainty: float | None  # all of it; null where the instrument's accuracy is not stated
    type_a: float | None  # of the mean; null for a single reading
    type_b: float | None  # of the instrument; null where it is not stated
    readings: int
    effective_readings: float | None  # as many independent readings as those tell


@dataclass(frozen=True, slots=True)
class Point:
    """One dwell's mean readings."""

    index: int
    stage: str
    where: str  # "A-17.csv, lines 31 to 90"
    starts: float | None  # time of its first sample within its table [s]
    duration: float | None  # [s]
    readings: int
    settling: int  # samples left out before it
    load_fractions: dict[str, float]  # output -> measured current over rated current
    channels: dict[str, Reading]
    efficiency: float | None = None
    efficiency_expanded_uncertainty: float | None = None
    found_by: str = ""


@dataclass(frozen=True, slots=True)
class Axis:
    """What an axis of a figure shows."""

    label: str
    unit: str  # SI; "" for a ratio, shown in per cent


@dataclass(frozen=True, slots=True)
class Series:
    """One row of values of a figure; all lists have one length."""

    name: str
    x: list[float]
    y: list[float]
    expanded_uncertainty: list[float | None]  # of y
    # points: marks with error bars, led through; trace: a measured line; line: one that was worked out, such as a fit;
    # dots: samples that nothing joins
    kind: Literal["points", "trace", "line", "dots"] = "points"


@dataclass(frozen=True, slots=True)
class LimitLine:
    """A limit drawn into a figure, between two places of its x axis."""

    label: str
    y: float
    side: Literal["min", "max"]
    x_from: float | None = None  # null: the whole width
    x_to: float | None = None


@dataclass(frozen=True, slots=True)
class Mark:
    """A place that a reader must find: a point of the plot, or (without y) a moment or a current."""

    label: str
    x: float
    y: float | None = None  # null: a line over the whole height
    expanded_uncertainty: float | None = None  # of x


@dataclass(frozen=True, slots=True)
class Region:
    """A part of the plot with a meaning, such as the window that an onset must lie in."""

    label: str
    x_from: float | None = None  # null: to the edge of the plot
    x_to: float | None = None
    y_from: float | None = None
    y_to: float | None = None


@dataclass(frozen=True, slots=True)
class Figure:
    """Named series that show a characteristic; the report draws them without knowing what they are."""

    name: str
    title: str
    x: Axis
    y: Axis
    series: list[Series]
    limits: list[LimitLine] = field(default_factory=list)
    caption: str = ""
    marks: list[Mark] = field(default_factory=list)
    regions: list[Region] = field(default_factory=list)


@dataclass(frozen=True, slots=True)
class InstrumentUsed:
    """What measured a channel."""

    channel: str
    device: str | None  # null: not stated
    serial: str
    accuracy: str  # as written; "" where it is not stated
    meter_range: str
    resolution: str
    due: str | None
    state: str  # "in date", "past due", "no due date stated", "test date unknown", "uncertainty not stated"


@dataclass(frozen=True, slots=True)
class Health:
    """A doubt about the data."""

    kind: str
    text: str
    bars: bool  # whether it keeps findings from being judged
    channels: list[str]
    where: str
    remedy: str


@dataclass(frozen=True, slots=True)
class Hazard:
    """A hazard of the unit under test, and why it is taken to be there."""

    hazard: Literal["mains", "stored charge", "output above 60 V", "high power output", "hot parts"]
    basis: str
    wait: float | None = None  # until a stored charge is below 60 V, where that can be told [s]


@dataclass(frozen=True, slots=True)
class Evidence:
    """One file that the decision rests on."""

    file: str
    sha256: str
    bytes: int
    rows: int


@dataclass(frozen=True, slots=True)
class LimitsUsed:
    """Which requirements, and which bench."""

    file: str
    sha256: str
    requirements_sha256: str
    bench_file: str = ""
    bench_sha256: str = ""


@dataclass(frozen=True, slots=True)
class Record:
    """Everything that the decision on one unit rests on."""

    acceptance_record: Literal[1]
    report_number: str
    judged_at: str  # ISO 8601, UTC
    unit: Unit
    verdict: UnitVerdict
    joint_conformity_probability: float | None
    findings: list[Finding]
    points: list[Point]
    figures: list[Figure]
    instruments: list[InstrumentUsed]
    health: list[Health]
    notes: dict[str, str]
    evidence: list[Evidence]
    limits: LimitsUsed
    made_by: dict[str, str]
    ratings: Ratings
    decision: DecisionRule
    test: TestFacts
    hazards: list[Hazard]


def record_text(record: Record) -> str:
    """The record as JSON, the same for the same record.

    Raises
    ------
    RecordError
        If a number in it is not finite: JSON has no such numbers, and a decision never rests on one.
    """
    try:
        return "{\n" + ",\n".join(_entry(name, value) for name, value in asdict(record).items()) + "\n}\n"
    except ValueError:
        msg = f"a number in the record of {record.unit.serial} is not finite; nothing was written"
        raise RecordError(msg) from None


def _entry(name: str, value: Any) -> str:
    """One key of the record: on a line of its own, and so is each entry of a list, for whoever compares two files.

    The library's own indenting would be ten times slower.
    """
    if isinstance(value, list) and value:
        return f'"{name}": [\n ' + ",\n ".join(map(_json, value)) + "\n]"
    return f'"{name}": {_json(value)}'


def _json(value: Any) -> str:
    return json.dumps(value, ensure_ascii=False, allow_nan=False)


_DEVICE = re.compile(r"(?i)(con|prn|aux|nul|com[\d\u00b9\u00b2\u00b3]|lpt[\d\u00b9\u00b2\u00b3])(\..*)?")


def safe_stem(serial: str) -> str:
    """A file name's stem for a serial: unsafe characters escaped, so that no serial leaves the folder.

    Letters, digits, dot, dash and underscore stay; everything else becomes %XX, byte by byte. Names that mean
    something to a file system, and very long ones, get the first digits of their hash.
    """
    stem = re.sub(r"[^\w.\-]", lambda found: _escaped(found.group()), serial)
    odd = _DEVICE.fullmatch(stem) is not None or stem.startswith(".") or stem.endswith(".") or not stem
    if odd or len(stem.encode()) > 120:
        kept = stem.strip(".").replace(".", "%2E").encode()[:60].decode(errors="ignore")
        stem = f"{kept or 'unit'}-{_short_hash(serial)}"
    return stem


def _escaped(text: str) -> str:
    return "".join(f"%{byte:02X}" for byte in text.encode(errors="surrogatepass"))


def _short_hash(serial: str) -> str:
    return hashlib.sha256(serial.encode(errors="surrogatepass")).hexdigest()[:8]


def write_record(record: Record, folder: Path) -> Path:
    """Path of the record as written; a record already there is kept, and one of the same content is not written again.

    Two serials that a file system would take for one (case) get the hash of the serial.

    Raises
    ------
    RecordError
        If the folder cannot be written.
    """
    text = record_text(record)
    stem = _free_stem(record.unit.serial, folder)
    number = 1
    while True:
        path = folder / (f"{stem}.record.json" if number == 1 else f"{stem}.{number}.record.json")
        kept = _same_content(path, text)
        if kept is True:
            return path
        if kept is None:
            break
        number += 1
    # a character that is none (from a name in another encoding) stands as its JSON escape
    write_whole(path, text.encode(errors="backslashreplace"))
    return path


def _free_stem(serial: str, folder: Path) -> str:
    """The stem for a serial, with its hash where another serial's record would take the same name."""
    stem = safe_stem(serial)
    if not os.path.isdir(folder):  # noqa: PTH112 - a name too long is no folder, and no error either
        return stem
    for path in folder.glob("*.record.json"):
        if path.name.removesuffix(".record.json").lower() == stem.lower() and _serial_in(path) not in (None, serial):
            return f"{stem}-{_short_hash(serial)}"
    return stem


def _serial_in(path: Path) -> str | None:
    try:
        unit = json.loads(path.read_text(encoding="utf-8"))["unit"]
        return str(unit["serial"])
    except (OSError, ValueError, KeyError, TypeError):
        return None


def _same_content(path: Path, text: str) -> bool | None:
    """Whether the file holds this record but for the time of judging; None where there is no file."""
    try:
        there = path.read_text(encoding="utf-8")
        if _timeless(there) == _timeless(text):
            return True
        kept, mine = json.loads(there), json.loads(text)
        return isinstance(kept, dict) and {**kept, "judged_at": ""} == {**mine, "judged_at": ""}
    except (OSError, ValueError, RecursionError):
        # something unreadable that stands there is kept too; where nothing stands, or nothing can, the place is free
        return False if os.path.lexists(path) else None


def _timeless(text: str) -> list[str]:
    return [line for line in text.splitlines() if not line.startswith('"judged_at": ')]


def write_whole(path: Path, content: bytes) -> None:
    """Write a file so that it is there whole or not at all.

    Raises
    ------
    RecordError
        If it cannot be written.
    """
    try:
        path.parent.mkdir(parents=True, exist_ok=True)
        handle, temporary = tempfile.mkstemp(dir=path.parent, prefix=".acceptance-")
        try:
            with os.fdopen(handle, "wb") as file:
                file.write(content)
                file.flush()
                os.fsync(file.fileno())
            Path(temporary).chmod(0o666 & ~_umask())
            Path(temporary).replace(path)
        except BaseException:
            Path(temporary).unlink(missing_ok=True)
            raise
    except OSError as problem:
        msg = f"{path} cannot be written ({problem.strerror or problem}); choose another folder with --out"
        raise RecordError(msg) from problem


def _umask() -> int:
    mask = os.umask(0)
    os.umask(mask)
    return mask


def read_record(path: Path) -> Record:
    """The record in a file.

    Raises
    ------
    RecordError
        If the file cannot be read, is no record, or is one of another version.
    """
    from pydantic import ValidationError

    try:
        text = path.read_text(encoding="utf-8")
        data: Any = json.loads(text, parse_constant=_no_constant, parse_float=_finite_float)
    except (OSError, ValueError, RecursionError) as problem:
        reason = problem.strerror if isinstance(problem, OSError) else "it is not JSON with finite numbers"
        msg = f"{path}: no record can be read from it: {reason}; expected a file written by judge"
        raise RecordError(msg) from None
    if not isinstance(data, Mapping) or "acceptance_record" not in data:
        msg = f"{path}: this is no record of a unit; expected a file written by judge"
        raise RecordError(msg)
    version = data["acceptance_record"]
    if version is True or version != VERSION:
        msg = f"{path}: version {version!r} of the record; expected {VERSION}"
        raise RecordError(msg)
    try:
        # strictly: "0.9" is no number, and true is none either
        return _adapter().validate_json(json.dumps(data), strict=True)
    except ValidationError as problem:
        first = problem.errors(include_url=False)[0]
        place = ".".join(str(part) for part in first["loc"])
        msg = f'{path}: "{place}" of the record is not what it should be; expected a file as written by judge'
        raise RecordError(msg) from None


@cache
def _adapter() -> TypeAdapter[Record]:
    from pydantic import TypeAdapter

    return TypeAdapter(Record)


def _no_constant(text: str) -> float:
    msg = f"{text} stands in the record"
    raise ValueError(msg)


def _finite_float(text: str) -> float:
    number = float(text)
    return number if math.isfinite(number) else _no_constant(text)


def record_schema() -> dict[str, Any]:
    """The JSON Schema of the record."""
    schema = _adapter().json_schema()
    return {"$schema": "https://json-schema.org/draft/2020-12/schema", **schema}


def report_number(parts: Sequence[str]) -> str:
    """A number that follows from the hashes of evidence, requirements and bench: the same inputs, the same number."""
    digest = hashlib.sha256("\n".join(parts).encode()).hexdigest().upper()
    return f"{digest[:4]}-{digest[4:8]}-{digest[8:12]}"


def with_time(record: Record, judged_at: str) -> Record:
    """The record, judged at another time."""
    return replace(record, judged_at=judged_at)


def finite(number: float | None) -> float | None:
    """The number, or None where it is infinite or not a number, since JSON has neither."""
    return number if number is not None and math.isfinite(number) else None
