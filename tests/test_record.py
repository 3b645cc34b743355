"""The record: its JSON, its schema, its file, and file names for serials of any kind."""

from __future__ import annotations

import json
import re
import string
from dataclasses import asdict, fields, is_dataclass, replace
from pathlib import Path
from typing import Any

import jsonschema
import pytest
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st

import acceptance
from acceptance import record as module
from acceptance.errors import RecordError
from acceptance.record import (
    VERSION,
    Record,
    finite,
    read_record,
    record_schema,
    record_text,
    report_number,
    safe_stem,
    with_time,
    write_record,
)

SCHEMA = Path(acceptance.__file__).parent / "record.schema.json"
NO_LIMIT = settings(max_examples=60, deadline=None, suppress_health_check=[HealthCheck.function_scoped_fixture])


def full_record(serial: str = "A-17", *, product: str = "Quillfen A60-24") -> Record:
    """A record with something in every list, written down and not computed."""
    finding = module.Finding(
        name="eff-50",
        characteristic="efficiency",
        condition="load 50 %, input 230 V",
        value=0.9012,
        unit="",
        expanded_uncertainty=0.0018,
        coverage_factor=2.0,
        degrees_of_freedom=120.0,
        min=0.88,
        max=None,
        margin=0.0212,
        conformity_probability=1.0,
        verdict="pass",
        reason="",
        standard_uncertainty=0.0009,
        output="main",
        where="A-17.csv, lines 31 to 90",
        note="customer's specification, revision 2",
        formula="Σ V I / P",
        points=[module.AtDwell(0, "50 %")],
        others=[module.Alternative("A-17.csv, lines 1 to 9", 0.91, 0.002, 0.03, 1.0, "pass")],
        budget=[module.BudgetLine("input_power: gain", "B", 0.0008, 0.79, None)],
        deviations=[module.Deviation("the warm-up was not logged")],
    )
    words = replace(finding, name="ocp.behaviour", value="constant current", margin=None, conformity_probability=None)
    unknown = replace(finding, name="ripple", value=None, verdict="not judged", reason="no dwell at load 100 %")
    return Record(
        acceptance_record=1,
        report_number="0A1B-2C3D-4E5F",
        judged_at="2026-12-01T09:00:00Z",
        unit=module.Unit(product, "C", serial),
        verdict="undecided",
        joint_conformity_probability=None,
        findings=[finding, words, unknown],
        points=[
            module.Point(
                index=0,
                stage="steady",
                where="A-17.csv, lines 31 to 90",
                starts=12.5,
                duration=59.0,
                readings=60,
                settling=4,
                load_fractions={"main": 0.5003},
                channels={"output_voltage main": module.Reading(24.01, "V", 0.004, 0.0002, 0.004, 60, 41.5)},
                efficiency=0.9012,
                efficiency_expanded_uncertainty=0.0018,
                found_by="load setting",
            )
        ],
        figures=[
            module.Figure(
                name="efficiency",
                title="Efficiency over load",
                x=module.Axis("load", ""),
                y=module.Axis("efficiency", ""),
                series=[module.Series("230 V", [0.25, 0.5], [0.89, 0.9012], [None, 0.0018], "line")],
                limits=[module.LimitLine("eff-50", 0.88, "min", 0.48, 0.52)],
                caption="bars: expanded uncertainty",
            )
        ],
        instruments=[
            module.InstrumentUsed("input_power", "PM-1", "77", "0.1 % reading", "", "", "2027-03-01", "in date")
        ],
        health=[module.Health("gap", "3 s without a sample", False, ["time"], "A-17.csv, line 40", "log faster")],
        notes={"operator": 'Ω "µ" <b>'},
        evidence=[module.Evidence("A-17.csv", "ab" * 32, 1234, 60)],
        limits=module.LimitsUsed("adapter.yaml", "cd" * 32, "ef" * 32, "bench.yaml", "01" * 32),
        made_by={"acceptance": "0.1.0", "numpy": "2.0.0"},
        ratings=module.Ratings("ac", 230.0, [207.0, 253.0], 50.0, [module.Output("main", 24.0, 2.5)], 40.0, "II"),
        decision=module.DecisionRule("guarded", 0.95, 0.975, None, 0.02),
        test=module.TestFacts("2026-11-30", ["steady"], 60, "CC", None, 5.0, [22.9, 23.4], "note", {"frequency": 50.0}),
        hazards=[module.Hazard("stored charge", "68 µF charged to 375 V", 41.1)],
    )


def sized(value: object) -> int:
    """How many values of its own a record holds."""
    if is_dataclass(value) and not isinstance(value, type):
        return sum(sized(getattr(value, one.name)) for one in fields(value))
    if isinstance(value, dict):
        return sum(map(sized, value.values()))
    return sum(map(sized, value)) if isinstance(value, list) else 1


# --- JSON -----------------------------------------------------------------------------------------------------------


def test_record_round_trip(tmp_path):
    """What is written is read again, value for value."""
    record = full_record()

    path = write_record(record, tmp_path)

    assert path == tmp_path / "A-17.record.json"
    assert read_record(path) == record
    assert record_text(read_record(path)) == path.read_text(encoding="utf-8")
    assert sized(record) > 150  # nothing was left out of the record that is compared


texts = st.text(st.characters(exclude_categories=["Cs"]), max_size=20)
numbers = st.floats(allow_nan=False, allow_infinity=False)
maybe = st.one_of(st.none(), numbers)


@st.composite
def records(draw: st.DrawFn) -> Record:
    """Records with any texts and numbers where there are free ones."""
    record = full_record(draw(texts), product=draw(texts))
    finding = replace(
        record.findings[0],
        name=draw(texts),
        value=draw(st.one_of(numbers, st.none(), texts)),
        margin=draw(maybe),
        expanded_uncertainty=draw(maybe),
        min=draw(maybe),
        reason=draw(texts),
        verdict=draw(st.sampled_from(["pass", "conditional pass", "conditional fail", "fail", "not judged"])),
    )
    return replace(
        record,
        findings=[finding] * draw(st.integers(0, 3)),
        notes=draw(st.dictionaries(texts, texts, max_size=3)),
        joint_conformity_probability=draw(st.one_of(st.none(), st.floats(0, 1))),
    )


@NO_LIMIT
@given(records())
def test_record_round_trip_of_any_content(tmp_path, record):
    """Any text and number; the schema that is shipped takes it."""
    path = tmp_path / "any.json"
    path.write_bytes(record_text(record).encode())

    assert read_record(path) == record
    VALIDATOR.validate(json.loads(record_text(record)))


def test_record_text_is_the_designed_json():
    """Keys in the order of the format, non-ASCII as written, a line's end at its end, no infinity for an unknown."""
    text = record_text(full_record())
    data = json.loads(text)

    assert list(data)[:6] == [
        "acceptance_record",
        "report_number",
        "judged_at",
        "unit",
        "verdict",
        "joint_conformity_probability",
    ]
    assert data == asdict(full_record())
    assert data["acceptance_record"] == VERSION == 1
    assert data["findings"][2]["value"] is None
    assert data["findings"][0]["budget"][0]["degrees_of_freedom"] is None
    assert "Ω" in text
    assert text.endswith("}\n")
    assert not re.search(r"\b(NaN|Infinity)\b", text)


@pytest.mark.parametrize("number", [float("nan"), float("inf"), float("-inf")])
@pytest.mark.parametrize("name", ["value", "margin", "conformity_probability"])
def test_record_never_holds_what_is_no_number(tmp_path, number, name):
    """NaN and infinity are never written: nothing is, not even in part."""
    record = full_record()
    record = replace(record, findings=[replace(record.findings[0], **{name: number})])

    with pytest.raises((RecordError, ValueError)):
        write_record(record, tmp_path)

    assert list(tmp_path.iterdir()) == []


def test_record_text_names_the_trouble_with_nan():
    """Only errors of the package leave it."""
    with pytest.raises(RecordError):
        record_text(replace(full_record(), joint_conformity_probability=float("nan")))


@pytest.mark.parametrize(
    ("number", "kept"),
    [(1.5, 1.5), (0.0, 0.0), (None, None), (float("inf"), None), (float("-inf"), None), (float("nan"), None)],
)
def test_finite_turns_what_json_lacks_to_null(number, kept):
    """JSON has neither infinity nor NaN."""
    assert finite(number) == kept


def test_with_time_changes_the_time_alone():
    """The same record, judged at another moment."""
    record = full_record()

    later = with_time(record, "2031-01-01T00:00:00Z")

    assert later.judged_at == "2031-01-01T00:00:00Z"
    assert with_time(later, record.judged_at) == record


# --- the schema -----------------------------------------------------------------------------------------------------


VALIDATOR = jsonschema.Draft202012Validator(json.loads(SCHEMA.read_text(encoding="utf-8")))


def test_schema_shipped_is_that_of_the_record():
    """The file beside the package says what the code says; write it again when the record changes."""
    assert SCHEMA.read_text(encoding="utf-8") == json.dumps(record_schema(), indent=1, ensure_ascii=False) + "\n"


def test_schema_is_one_and_takes_a_record():
    """A schema of its own dialect, met by a full record."""
    jsonschema.Draft202012Validator.check_schema(record_schema())

    VALIDATOR.validate(json.loads(record_text(full_record())))


@pytest.mark.parametrize(
    ("path", "value"),
    [
        (("acceptance_record",), 2),
        (("verdict",), "fine"),
        (("findings", 0, "verdict"), "maybe"),
        (("findings", 0, "margin"), "wide"),
        (("unit", "serial"), 17),
        (("evidence", 0, "rows"), 1.5),
        (("hazards", 0, "hazard"), "bees"),
    ],
)
def test_schema_and_reader_refuse_alike(tmp_path, path, value):
    """What the schema refuses, the reader refuses, and names the place."""
    data: Any = json.loads(record_text(full_record()))
    inner = data
    for step in path[:-1]:
        inner = inner[step]
    inner[path[-1]] = value
    file = tmp_path / "x.record.json"
    file.write_text(json.dumps(data), encoding="utf-8")

    assert not VALIDATOR.is_valid(data)
    with pytest.raises(RecordError, match=re.escape(str(file))) as caught:
        read_record(file)
    assert "version" in str(caught.value) or ".".join(map(str, path)) in str(caught.value)
    assert "\n" not in str(caught.value)


@pytest.mark.parametrize("key", [one.name for one in fields(Record)])
def test_schema_and_reader_miss_every_key(tmp_path, key):
    """No part of a record may be lacking."""
    data = asdict(full_record())
    del data[key]
    file = tmp_path / "x.record.json"
    file.write_text(json.dumps(data), encoding="utf-8")

    assert not VALIDATOR.is_valid(data)
    with pytest.raises(RecordError):
        read_record(file)


# --- reading --------------------------------------------------------------------------------------------------------

JUNK = {
    "empty": b"",
    "prose": b"The unit passed, I am sure of it.",
    "binary": bytes(range(256)),
    "latin": '{"acceptance_record": 1, "unit": "Ü"}'.encode("latin-1"),
    "utf-16": '{"acceptance_record": 1}'.encode("utf-16"),
    "cut": record_text(full_record()).encode()[:700],
    "a list": b"[1, 2, 3]",
    "a number": b"1",
    "null": b"null",
    "another object": b'{"acceptance_lot_record": 1}',
    "nothing but a version": b'{"acceptance_record": 1}',
    "deep": b"[" * 100_000,
    "deep inside": b'{"acceptance_record": 1, "unit": ' + b'{"a":' * 50_000,
    "long number": b'{"acceptance_record": ' + b"9" * 10_000 + b"}",
    "NaN": record_text(full_record()).replace("0.9012", "NaN").encode(),
    "Infinity": record_text(full_record()).replace("0.9012", "-Infinity").encode(),
    "two records": (record_text(full_record()) * 2).encode(),
}


@pytest.mark.parametrize("content", JUNK.values(), ids=JUNK.keys())
def test_read_record_refuses_junk(tmp_path, content):
    """One clear line with the file's name, whatever is in it."""
    path = tmp_path / "junk.record.json"
    path.write_bytes(content)

    with pytest.raises(RecordError) as caught:
        read_record(path)
    assert str(caught.value).startswith(str(path))
    assert "\n" not in str(caught.value)
    assert len(str(caught.value)) < len(str(path)) + 200


@NO_LIMIT
@given(st.binary(max_size=200))
def test_read_record_takes_any_bytes(tmp_path, content):
    """Only errors of the package."""
    path = tmp_path / "junk.json"
    path.write_bytes(content)

    with pytest.raises(RecordError):
        read_record(path)


@NO_LIMIT
@given(
    st.recursive(st.one_of(st.none(), st.booleans(), numbers, st.text(max_size=5)), st.lists, max_leaves=4), st.data()
)
def test_read_record_takes_any_value_anywhere(tmp_path, value, data):
    """A record with any value in any one of its places is read, or refused with an error of the package."""
    content = asdict(full_record())
    key = data.draw(st.sampled_from([*content, *(f"findings.{name}" for name in content["findings"][0])]))
    outer, _, inner = key.partition(".")
    if inner:
        content["findings"][0][inner] = value
    else:
        content[outer] = value
    path = tmp_path / "odd.json"
    path.write_text(json.dumps(content), encoding="utf-8")

    try:
        record = read_record(path)
    except RecordError:
        return
    assert isinstance(record, Record)
    record_text(record)  # and can be written again


def test_read_record_of_what_is_no_file(tmp_path):
    """A missing file and a folder are named."""
    for path in (tmp_path / "missing.json", tmp_path):
        with pytest.raises(RecordError, match=re.escape(str(path))):
            read_record(path)


@pytest.mark.parametrize("version", [0, 2, 99, -1, 1.5, "1", None, [1], {"a": 1}])
def test_read_record_of_another_version(tmp_path, version):
    """Older, newer, or no version at all: refused, with the one that is expected."""
    path = tmp_path / "A-17.record.json"
    path.write_text(json.dumps({**asdict(full_record()), "acceptance_record": version}), encoding="utf-8")

    with pytest.raises(RecordError, match=f"version .*expected {VERSION}"):
        read_record(path)


def test_read_record_refuses_a_number_too_large(tmp_path):
    """1e999 is valid JSON, and infinity once read."""
    path = tmp_path / "A-17.record.json"
    path.write_text(record_text(full_record()).replace("0.9012", "1e999"), encoding="utf-8")

    with pytest.raises(RecordError):
        read_record(path)


@pytest.mark.parametrize(
    ("there", "instead"),
    [
        ('"expanded_uncertainty": 0.0018', '"expanded_uncertainty": "0.0018"'),
        ('"rows": 60', '"rows": "60"'),
        ('"rows": 60', '"rows": true'),
        ('"acceptance_record": 1,', '"acceptance_record": true,'),
    ],
)
def test_read_record_repairs_nothing(tmp_path, there, instead):
    """A text where a number belongs was not written by this package: the schema refuses it, and so must the reader."""
    text = record_text(full_record())
    assert there in text
    path = tmp_path / "A-17.record.json"
    path.write_text(text.replace(there, instead), encoding="utf-8")

    assert not VALIDATOR.is_valid(json.loads(path.read_text(encoding="utf-8")))
    with pytest.raises(RecordError):
        read_record(path)


# --- the report number ----------------------------------------------------------------------------------------------


def test_report_number_is_the_same_for_the_same_inputs():
    """Twelve hexadecimal digits in threes of four, from a hash: SHA-256 of "abc" begins BA7816BF 8F01."""
    assert report_number(["abc"]) == "BA78-16BF-8F01"  # FIPS 180-2, B.1
    assert report_number(["a", "b"]) == report_number(["a", "b"])
    assert re.fullmatch(r"([0-9A-F]{4}-){2}[0-9A-F]{4}", report_number([]))


@given(st.lists(texts, max_size=4), st.lists(texts, max_size=4))
def test_report_number_differs_with_any_part(mine, other):
    """Other inputs have another number (parts are hashes and serials, without line ends)."""
    mine, other = ([re.sub(r"\s", "", text) + "." for text in parts] for parts in (mine, other))

    assert (report_number(mine) == report_number(other)) == (mine == other)


# --- file names -----------------------------------------------------------------------------------------------------

# names that a file system keeps for itself, whatever follows their first dot
DEVICES = re.compile(r"(?i)(con|prn|aux|nul|com[0-9¹²³]|lpt[0-9¹²³])(\..*)?")
ODD = {
    "up": "../../x",
    "formula": "=1+1",
    "markup": '<img src="x">',
    "empty": "",
    "dot": ".",
    "dots": "..",
    "many dots": "......",
    "device": "CON",
    "device in small": "nul",
    "port": "COM1",
    "long": "x" * 300,
    "long escapes": "ü/" * 300,
    "NUL": "a\0b",
    "slash": "a/b",
    "root": "/etc/passwd",
    "backslash": "..\\..\\x",
    "colon": "C:",
    "stream": "a:b",
    "trailing dot": "A-17.",
    "trailing space": "A-17 ",
    "leading dot": ".A-17",
    "line end": "A\r\n17",
    "tab": "A\t17",
    "per cent": "100 %",
    "wildcard": "A*?",
    "quotes": "'\"`",
    "shell": "$(x);|&",
    "home": "~",
    "right to left": "A\u202e17",
    "joined": "e\u0301",
    "letters of other scripts": "Ω-序列-17",
}


def is_safe(name: str) -> bool:
    """Whether every file system takes a name for a plain file of the folder it is put into."""
    return (
        bool(name)
        and not name.startswith(".")
        and not name.endswith((".", " "))
        and not re.search(r'[\x00-\x1f\x7f/\\:*?"<>|]', name)
        and not DEVICES.fullmatch(name)
        and len(name.encode()) + len(".12345678.record.json") <= 255
    )


@pytest.mark.parametrize("serial", ODD.values(), ids=ODD.keys())
def test_safe_stem_of_an_odd_serial(serial):
    """Usable everywhere, and unlike that of any other."""
    stem = safe_stem(serial)

    assert is_safe(stem)
    assert all(safe_stem(other) != stem for other in ODD.values() if other != serial)


@pytest.mark.parametrize("serial", ["A-17", "B_203", "M.31", "0007", "1.10", "é12", "Ω-5", "10_000.b-c"])
def test_safe_stem_leaves_plain_serials_alone(serial):
    """Letters of any script, digits, dot, dash and underscore stay."""
    assert safe_stem(serial) == serial


@pytest.mark.parametrize(
    ("serial", "stem"),
    [("=1+1", "%3D1%2B1"), ("a b", "a%20b"), ("a/b", "a%2Fb"), ("50%", "50%25"), ("µ€", "µ%E2%82%AC")],
)
def test_safe_stem_escapes_by_the_bytes(serial, stem):
    """As in an address, so that a person can tell what stood there; the per cent sign itself is escaped too."""
    assert safe_stem(serial) == stem


plain = st.text(string.ascii_letters + string.digits + ".-_/\\ %:é", max_size=12)
any_text = st.one_of(plain, texts, st.text(st.characters(exclude_categories=["Cs"]), max_size=50))


@settings(max_examples=200, deadline=None)
@given(any_text)
def test_safe_stem_of_any_serial_is_safe(serial):
    """No text leaves the folder or is refused by a file system."""
    assert is_safe(safe_stem(serial))


@settings(max_examples=200, deadline=None)
@given(any_text, any_text)
def test_safe_stem_differs_between_serials(one, other):
    """Two serials never have one stem."""
    assert (safe_stem(one) == safe_stem(other)) == (one == other)


@pytest.mark.parametrize("serial", ["con.txt", "NUL.1", "COM¹"])
def test_safe_stem_of_a_device_with_something_behind_it(serial):
    """A device keeps its name with anything after a dot: con.txt-1a2b3c4d.record.json is the device still."""
    assert not DEVICES.fullmatch(f"{safe_stem(serial)}.record.json")


def test_safe_stem_is_short_enough_in_bytes():
    """Letters of four bytes: a file name has 255 bytes at most."""
    assert len(f"{safe_stem(chr(0x10400) * 100)}.record.json".encode()) <= 255


def test_safe_stem_of_bytes_that_are_no_text():
    """A --serial that is no UTF-8 comes from the command line with surrogates in it."""
    assert is_safe(safe_stem("A\udcff17"))


# --- writing --------------------------------------------------------------------------------------------------------


def names_in(folder: Path) -> list[str]:
    return sorted(path.name for path in folder.rglob("*"))


def test_write_record_keeps_one_that_differs(tmp_path):
    """What is there stays, and the new one is .2, .3 and so on."""
    versions = [replace(full_record(), report_number=f"{i}") for i in range(4)]

    paths = [write_record(version, tmp_path) for version in versions]

    assert [path.name for path in paths] == [
        "A-17.record.json",
        "A-17.2.record.json",
        "A-17.3.record.json",
        "A-17.4.record.json",
    ]
    assert [read_record(path) for path in paths] == versions
    assert [write_record(version, tmp_path) for version in versions] == paths
    assert len(names_in(tmp_path)) == 4


def test_write_record_does_not_write_the_same_again(tmp_path):
    """The same content but for the time of judging: the file stays as it was, to the byte."""
    path = write_record(full_record(), tmp_path)
    before, at = path.read_bytes(), path.stat().st_mtime_ns

    again = write_record(with_time(full_record(), "2031-01-01T00:00:00Z"), tmp_path)

    assert again == path
    assert path.read_bytes() == before
    assert path.stat().st_mtime_ns == at
    assert names_in(tmp_path) == ["A-17.record.json"]


@pytest.mark.parametrize("content", [b"", b"{", b"[]", b"\xff\xfe", b'{"unit": 5}'])
def test_write_record_keeps_what_is_no_record(tmp_path, content):
    """Somebody else's file of that name is not overwritten."""
    (tmp_path / "A-17.record.json").write_bytes(content)

    path = write_record(full_record(), tmp_path)

    assert path.name == "A-17.2.record.json"
    assert (tmp_path / "A-17.record.json").read_bytes() == content


def test_write_record_beside_a_folder_of_its_name(tmp_path):
    """A folder that has the name is passed by."""
    (tmp_path / "A-17.record.json").mkdir()

    assert write_record(full_record(), tmp_path).name == "A-17.2.record.json"


def test_write_record_makes_the_folder(tmp_path):
    """--out may name one that is not there yet; nothing else is left in it."""
    path = write_record(full_record(), tmp_path / "new" / "er")

    assert read_record(path) == full_record()
    assert names_in(tmp_path / "new") == ["A-17.record.json", "er"]


def test_write_record_of_serials_that_differ_by_case(tmp_path):
    """Files that some systems take for one: the second serial gets its hash, and each finds its own again."""
    serials = ["a-17", "A-17", "A-17/", "É1", "é1", "STRASSE", "strasse"]

    paths = {serial: write_record(full_record(serial), tmp_path) for serial in serials}

    assert len({path.name.lower() for path in paths.values()}) == len(serials)
    assert {serial: read_record(path).unit.serial for serial, path in paths.items()} == {s: s for s in serials}
    assert {serial: write_record(full_record(serial), tmp_path) for serial in serials} == paths


@settings(max_examples=25, deadline=None)
@given(
    st.lists(st.one_of(st.sampled_from(["a", "A", "a.2", "A.2", "..", ".", "a/2", "CON", "con"]), any_text), max_size=6)
)
def test_write_record_never_gives_two_serials_one_file(tmp_path_factory, serials):
    """Any serials in any order: each file is of one serial, told apart without case, and lies in the folder."""
    folder = tmp_path_factory.mktemp("out")
    inside = folder / "in"

    written = [(serial, write_record(full_record(serial), inside)) for serial in serials]

    owner: dict[str, str] = {}
    for serial, path in written:
        assert path.parent == inside
        assert path.resolve().parent == inside.resolve()
        assert owner.setdefault(path.name.lower(), serial) == serial
        assert read_record(path).unit.serial == serial
    assert [path.name for path in folder.iterdir()] in ([], ["in"])


def test_write_record_finds_its_own_beside_a_numbered_serial(tmp_path):
    """A-17, A-17.2, and A-17 again with the same content: the first file, and no third."""
    first = write_record(full_record("A-17"), tmp_path)
    write_record(full_record("A-17.2"), tmp_path)

    assert write_record(full_record("A-17"), tmp_path) == first


def test_write_record_whole_or_not_at_all(tmp_path, monkeypatch):
    """A disk that fills up leaves no half of a record, and no temporary file."""

    def full(_: int) -> None:
        raise OSError(28, "No space left on device")

    monkeypatch.setattr(module.os, "fsync", full)

    with pytest.raises(RecordError, match="No space left on device"):
        write_record(full_record(), tmp_path)
    assert names_in(tmp_path) == []


def test_write_record_into_what_is_no_folder(tmp_path):
    """A file where the folder should be: an error that names it, and an end."""
    (tmp_path / "out").write_text("here first")

    for folder in (tmp_path / "out", tmp_path / "out" / "deeper"):
        with pytest.raises(RecordError, match=re.escape(str(folder))):
            write_record(full_record(), folder)
    assert (tmp_path / "out").read_text() == "here first"


def test_write_record_into_a_folder_with_too_long_a_name(tmp_path):
    """A name that no file system takes: an error of the package."""
    with pytest.raises(RecordError):
        write_record(full_record(), tmp_path / ("x" * 300))
