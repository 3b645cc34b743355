"""The report as a whole: what it says, where it says it, and that nothing a record holds can break it."""

from __future__ import annotations

import io
import re
from collections.abc import Iterator
from dataclasses import replace

import pytest
import report_records as records
from pypdf import PdfReader

from acceptance.errors import ReportError
from acceptance.record import BudgetLine, Deviation, Hazard, Mark, Output, Record
from acceptance.report.blocks import paginate
from acceptance.report.build import _blocks, report_pdf, write_report
from acceptance.report.fonts import string_width
from acceptance.report.measured import apart, channel_name, figures
from acceptance.report.method import decision_text
from acceptance.report.pen import Pen
from acceptance.report.sources import hash_in_fours, unprintable
from acceptance.report.style import LEFT, PAGE, ROOM, WIDTH, Type
from acceptance.report.template import SECTIONS, load_template

EVERY = [
    "typical",
    "every_verdict",
    "several_outputs",
    "characteristics",
    "nasty",
    "many_findings",
    "empty",
    "degenerate",
    "annotated",
]


def make(name: str) -> Record:
    made: Record = getattr(records, name)()
    return made


def reader(record: Record) -> PdfReader:
    return PdfReader(io.BytesIO(report_pdf(record)))


def text_of(record: Record) -> str:
    """The text of all pages, its spaces as one."""
    return " ".join(" ".join(page.extract_text() for page in reader(record).pages).split())


def bare(text: str) -> str:
    return re.sub(r"\s+", "", text)


@pytest.fixture
def drawn(monkeypatch: pytest.MonkeyPatch) -> list[list[tuple[float, float, float, str, Type]]]:
    """Every string as it is drawn, page by page: left, right, baseline, text, look."""
    pages: list[list[tuple[float, float, float, str, Type]]] = [[]]
    draw, end = Pen.text, Pen.end_page

    def text(self: Pen, x: float, y: float, text: str, style: Type, *, align: str = "left") -> None:
        wide = string_width(text, style.size, style.weight)
        left = x - {"left": 0.0, "right": wide, "centre": wide / 2}[align]
        seen = string_width(text.rstrip(" "), style.size, style.weight)
        pages[-1].append((left, left + seen, y, text, style))
        draw(self, x, y, text, style, align=align)  # type: ignore[arg-type]

    def end_page(self: Pen) -> None:
        pages.append([])
        end(self)

    monkeypatch.setattr(Pen, "text", text)
    monkeypatch.setattr(Pen, "end_page", end_page)
    return pages


# -- what it says


def test_report_states_who_what_when_and_against_what():
    """Issuer, product, revision, serial, dates, files, hashes, number."""
    record = make("typical")

    text = text_of(record)

    for part in (
        "Issuer not named in the template",
        "Acceptance test report",
        "Bench rail 24, revision C serial A-17",
        "2026-11-28",
        "2026-11-30, 14:05 UTC",
        "bench_rail_24.yaml",
        "bench_2.yaml",
        record.report_number,
        "ACCEPTED",
        "Performance limits only; no safety approval.",
        "5 findings: 5 pass.",
        "Probability that the unit meets all its limits together: 98.2 %.",
        "230 V a.c. (207 V to 253 V), 50 Hz, class I",
    ):
        assert part in text


def test_report_prints_values_limits_and_uncertainties():
    """The findings table carries the record's numbers."""
    text = text_of(make("typical"))

    assert "eff-50 efficiency: load 50 %, input 230 V" in text
    for part in ("≥ 88 %", "92.30 %", "0.36 %", "1.98", "+4.30 %", "> 99.9 %", "≤ 210 mW", "148 mW", "58 mW"):
        assert part in text
    assert "23.52 V to 24.48 V" in text
    assert "23.9376 V" in text


def test_report_gives_the_whole_hash_of_every_file():
    """SHA-256 in fours, none cut off."""
    record = make("typical")

    text = text_of(record)

    limits = record.limits
    for digest in (record.evidence[0].sha256, limits.sha256, limits.requirements_sha256, limits.bench_sha256):
        assert hash_in_fours(digest) in text


@pytest.mark.parametrize("name", ["typical", "every_verdict", "characteristics"])
def test_report_loses_no_text_of_the_record(name):
    """Every text the record holds stands in the report, whatever lines it was broken into.

    Places are given as table and lines; of a budget, the sources that make up nine tenths are there.
    """
    record = make(name)
    drawn_text = bare(text_of(record))

    wanted = [record.unit.serial, record.report_number, *record.notes.values(), *record.made_by.values()]
    for finding in record.findings:
        wanted += [finding.name, finding.condition, finding.reason, finding.note, finding.formula]
        wanted += [finding.characteristic.replace("_", " "), finding.verdict]
        wanted += [line.source.replace("_", " ") for line in finding.budget if line.share > 0.1]
        wanted += [other.where for other in finding.others]
        wanted += [other.at for other in finding.others] + [other.reason for other in finding.others]
        wanted += [deviation.text for deviation in finding.deviations]
    for used in record.instruments:
        wanted += [
            used.device or "",
            used.serial,
            used.accuracy,
            used.meter_range,
            used.resolution,
            used.due or "",
            used.state,
        ]
    for doubt in record.health:
        wanted += [doubt.kind, doubt.text, doubt.where, doubt.remedy]
    wanted += [part for point in record.points for part in apart(point.where)] + [
        hazard.basis for hazard in record.hazards
    ]
    wanted += [figure.title for figure in record.figures]
    wanted += [mark.label for figure in record.figures for mark in figure.marks]
    wanted += [region.label for figure in record.figures for region in figure.regions]
    for text in wanted:
        assert bare(text) in drawn_text


@pytest.mark.parametrize(
    ("verdict", "word"), [("accepted", "ACCEPTED"), ("rejected", "REJECTED"), ("undecided", "UNDECIDED")]
)
def test_report_prints_each_verdict_in_words(verdict, word):
    """The verdict's word stands on the first page, and no other one does."""
    first = reader(replace(make("typical"), verdict=verdict)).pages[0].extract_text()

    assert word in first
    assert len(set(re.findall("ACCEPTED|REJECTED|UNDECIDED", first))) == 1


def test_report_puts_the_deciding_reasons_on_the_first_page():
    """Whoever reads a rejection sees why before anything else."""
    record = make("every_verdict")

    first = bare(reader(record).pages[0].extract_text())

    for finding in record.findings:
        if finding.verdict in ("fail", "not judged"):
            assert bare(finding.name) in first
            assert bare(finding.reason) in first


def test_front_points_to_how_the_test_differed():
    """With the number of findings, and not where nothing differed."""
    record = make("typical")
    plain = replace(record, findings=[replace(finding, deviations=[]) for finding in record.findings])
    odd = replace(plain.findings[0], deviations=[Deviation("run in CR mode"), Deviation("no warm-up")])
    two = replace(plain, findings=[odd, replace(odd, name="other"), *plain.findings[1:]])

    firsts = [" ".join(reader(one).pages[0].extract_text().split()) for one in (plain, two)]

    assert "from what is asked" not in firsts[0]
    assert "For 2 of the findings the test differed, or may have, from what is asked: see Deviations" in firsts[1]


def test_report_shows_every_kind_of_finding():
    """Words for all five verdicts, a text as a value, and a value without uncertainty."""
    text = text_of(make("every_verdict"))

    for part in ("conditional pass", "conditional fail", "not judged", "constant current", "uncertainty not stated"):
        assert part in text
    assert "8 findings: 3 pass, 1 conditional pass, 1 conditional fail, 1 fail, 2 not judged." in text
    assert "not stated, since not every finding has one" in text


def test_report_names_cautions_of_the_hazards_only():
    """The cautions follow the record's hazards; the general ones always stand."""
    without = text_of(replace(make("typical"), hazards=[]))
    with_mains = text_of(replace(make("typical"), hazards=[Hazard("mains", "230 V a.c.")]))

    assert "Mains voltage." not in without
    assert "Mains voltage." in with_mains
    assert "Hot parts." not in with_mains
    for text in (without, with_mains):
        assert "Only qualified persons" in text
        assert "Local codes" in text


def test_report_gives_a_waiting_time_only_where_it_is_known():
    """Without capacitance and bleeder the unit counts as charged until measured."""
    unknown = text_of(replace(make("typical"), hazards=[Hazard("stored charge", "a.c. input")]))
    known = text_of(replace(make("typical"), hazards=[Hazard("stored charge", "470 µF, 150 kohm", 128.0)]))

    assert "Treat the unit as charged until it has been measured below 60 V" in unknown
    assert "after 2 min 8 s" in known


@pytest.mark.parametrize(
    ("rule", "confidence", "required", "parts"),
    [
        ("simple", 0.95, None, ["up to 50 %"]),
        ("guarded", 0.95, 0.975, ["at least 97.5 %", "at most 2.5 %"]),
        ("guarded", 0.99, 0.995, ["at least 99.5 %", "at most 0.5 %"]),
        ("conditional", 0.90, 0.95, ["at least 95 %", "at most 5 %", "undecided"]),
    ],
)
def test_decision_text_states_the_risk_of_the_rule(rule, confidence, required, parts):
    """The risk follows from the record's rule and confidence."""
    decision = replace(make("typical").decision, rule=rule, confidence=confidence, required_probability=required)

    for part in parts:
        assert part in decision_text(decision)


def test_budget_lists_what_makes_up_nine_tenths_of_the_variance():
    """Large ones first, each with its share; the others as a number, with the share they have together."""
    record = make("typical")
    lines = [
        BudgetLine("converter", "B", 2e-6, 0.001, None),
        BudgetLine("shunt", "B", 9e-5, 0.20, None),
        BudgetLine("meter", "B", 1.8e-4, 0.75, 2.5e6),
        BudgetLine("leads", "B", 4e-5, 0.049, None),
    ]

    text = text_of(replace(record, findings=[replace(record.findings[0], budget=lines)]))

    # in the text, a row's cells follow one another
    assert "meter shunt 2 more B B 0.018 % 0.0090 % 75.0 % 20.0 % 5.0 % > 1000 ∞" in text


def test_places_are_taken_apart():
    """Table and lines; a place of another form stays whole."""
    assert apart("A-17.csv, lines 31 to 90") == ("A-17.csv", "31 to 90")
    assert apart('B.xlsx, sheet "a, lines b", line 7') == ('B.xlsx, sheet "a, lines b"', "7")
    assert apart("by hand") == ("", "by hand")


@pytest.mark.parametrize(("has_output", "shown"), [(True, "60 41 15"), (False, "60 – 15")])
def test_effective_number_is_that_of_the_output_voltage(has_output, shown):
    """A slow temperature does not count; without an output voltage there is a dash."""
    record = make("typical")
    point = record.points[0]
    volts = replace(point.channels["output_voltage"], effective_readings=40.6)
    channels = {**point.channels, "output_voltage": volts, "temperature case": replace(volts, effective_readings=1.2)}
    if not has_output:
        del channels["output_voltage"]

    text = text_of(replace(record, points=[replace(point, channels=channels)]))

    assert shown in text


def test_findings_with_the_same_remark_share_it():
    """A text is printed once, with the names of all the findings it belongs to."""
    record = make("typical")
    findings = [replace(finding, note="data sheet") for finding in record.findings[:2]]

    text = text_of(replace(record, findings=[*findings, *record.findings[2:]]))

    assert text.count("data sheet") == 1
    assert "eff-50, eff-avg Note data sheet" in text


def test_front_says_value_and_limit_of_what_failed_and_groups_what_is_alike():
    """Several findings of one reason take one row; a failing value stands beside its limit."""
    record = make("typical")
    first, second, third, *_ = record.findings
    failed = replace(first, verdict="fail", reason="outside the limit")
    others = [replace(f, verdict="not judged", value=None, reason="no watts were logged") for f in (second, third)]

    made = reader(replace(record, verdict="rejected", findings=[failed, *others]))

    front = " ".join(made.pages[0].extract_text().split()).partition("Electrical safety")[0]
    assert "92.30 % ± 0.36 %, limit ≥ 88 %: outside the limit" in front
    assert front.count("no watts were logged") == 1
    assert "eff-avg, standby" in front


def test_front_stays_a_summary_of_many_findings():
    """Beyond ten rows it says how many are left, and where they stand."""
    record = make("typical")
    finding = replace(record.findings[0], verdict="fail")
    findings = [replace(finding, name=f"f{n}", reason=f"reason {n}") for n in range(25)]

    text = text_of(replace(record, verdict="rejected", findings=findings))

    assert "15 more findings, with the reasons, under Findings." in text
    assert text.count("reason 24") == 1


def test_what_was_run_stands_where_the_condition_left_it_open():
    """`any` names the least favourable dwell's condition in the table; a fixed one is told with the dwell."""
    record = make("typical")
    fixed, band = record.findings[0], record.findings[-1]
    findings = [replace(fixed, at="load -0.0 %, input 230.1 V"), replace(band, at="load 100.1 %, input 229.9 V")]

    text = text_of(replace(record, findings=findings))

    assert "load any, input any; least favourable at load 100.1 %, input 229.9 V" in text
    assert "4 (load 0.0 %, input 230.1 V)" in text
    assert "input 230 V; run at" not in text


def test_single_output_is_not_named():
    """The name says nothing where there is one output; with several each is named."""
    one, two = Output("main", 24.0, 5.0), Output("aux", 5.0, 1.0)

    assert channel_name("output_voltage main", [one]) == "output voltage"
    assert channel_name("output_voltage main", [one, two]) == "output voltage main"
    assert channel_name("temperature main", [one]) == "temperature main"
    assert channel_name("input_power", [one]) == "input power"


def test_places_stand_in_full_where_the_dwells_are_left_out(tmp_path):
    """Without the list of dwells their numbers would say nothing."""
    names = ", ".join(name for name in SECTIONS if name != "points")
    (tmp_path / "template.yaml").write_text(f"sections: [{names}]\n", encoding="utf-8")
    record = make("typical")

    pages = PdfReader(io.BytesIO(report_pdf(record, template=tmp_path))).pages

    text = bare(" ".join(page.extract_text() for page in pages))
    assert bare(record.findings[0].where) in text


def test_report_ends_with_sign_off_on_one_page():
    """Three roles, what the results relate to, and the end mark, together."""
    for name in ("typical", "every_verdict", "many_findings"):
        last = " ".join(reader(make(name)).pages[-1].extract_text().split())
        for part in ("Tested", "Reviewed", "Approved", "Signature", "Not signed off", "relate only to the unit tested"):
            assert part in last
        assert "End of report 7C1E-04B9-E2D5" in last


def test_report_of_several_outputs_prints_every_channel():
    """Wide tables are split; each channel's heading and last reading are there."""
    record = records.several_outputs(6)

    words = text_of(record)

    text = bare(words)
    for output in record.ratings.outputs:
        assert output.name in words
    assert words.count("Output voltage") >= 6
    for name, reading in record.points[-1].channels.items():
        if name.startswith("output_voltage"):
            assert f"{reading.value}".replace("-", "−")[:5] in text


def test_report_of_an_empty_record_says_so():
    """No findings, no points, no figures: still a whole report."""
    text = text_of(make("empty"))

    assert "The record holds no findings." in text
    assert "None are recorded." in text
    assert "UNDECIDED" in text
    assert "Figures" not in text


def test_value_in_words_stands_beside_the_limit_in_words():
    """Without U, margin and probability."""
    made = reader(make("characteristics"))
    text = " ".join(" ".join(page.extract_text() for page in made.pages).split())

    assert "hiccup hiccup – – – pass" in text
    front = " ".join(made.pages[0].extract_text().split()).partition("Electrical safety")[0]
    assert "then foldback, limit constant current: another behaviour than asked" in front


def test_uncertainty_and_margin_of_a_temperature_are_in_kelvin():
    """In the findings, in the budget, and where the value is formed; value and limit stay in degrees."""
    text = text_of(make("characteristics"))

    assert "≤ 110 °C 83.6 °C 1.8 K +26.4 K" in text
    assert "TC-4: accuracy B 0.87 K" in text
    assert "0.90 K" in text


def test_currents_and_times_are_in_their_units():
    """The onset in A between two limits, the recovery on the scale of its limit."""
    text = text_of(make("characteristics"))

    assert "5.25 A to 6.5 A 5.790 A 0.090 A +0.540 A" in text
    assert "≤ 2 s 0.2760 s 0.0020 s +1.7240 s" in text


def test_deviations_of_several_findings_are_printed_once():
    """With the names of all of them, each text on a line of its own."""
    record = make("characteristics")
    text = text_of(record)

    for deviation in record.findings[-1].deviations:
        assert text.count(deviation.text) == 1
    assert text.count("the frequency of the input was not logged") == 1
    names = bare("eps.average_efficiency, eps.efficiency-25, eps.efficiency-50, eps.efficiency-75, eps.efficiency-100")
    assert bare(f"• {record.findings[-1].deviations[0].text}") in bare(text)
    assert names in bare(text)


def test_a_finding_with_one_deviation_twice_is_named_once():
    """Two dwells that differed alike."""
    record = make("typical")
    odd = replace(record.findings[0], name="only-this", deviations=[Deviation("a cap was off")] * 2)

    text = text_of(replace(record, findings=[odd, *record.findings[1:]]))

    part = text.partition("How the test differed")[2]
    assert part.count("only-this") == part.count("a cap was off") == 1


def test_a_pair_of_figures_is_lowered_to_fit_and_never_higher_than_its_room():
    """A little room short: lower, and whole; much too short: on the next page; more notes than were reckoned: too."""
    base = replace(make("typical"), figures=[records.foldback(), records.hiccup()])
    pair = figures(base)[1]
    lowered = []
    for short in (0.0, 10.0, 25.0, 41.0, 43.0, 100.0):
        head, tail = pair.split(pair.height - short)
        assert (head is None) != (tail is None)
        lowered.append(head is not None)
        if head is not None:
            assert head.height <= pair.height - short + 1e-6
    assert lowered[:2] == [True, True]
    assert lowered[-2:] == [False, False]

    crowded = replace(records.foldback(), marks=[Mark(f"place {n} of many", n / 8, n / 3) for n in range(56)])
    full = figures(replace(base, figures=[crowded, crowded]))[1]
    for short in range(0, 43, 3):
        head, _ = full.split(full.height - short)
        assert head is None or head.height <= full.height - short + 1e-6


def test_pages_with_many_figures_are_well_filled():
    """Every page but the last is more than half full."""
    for record in (make("characteristics"), replace(make("characteristics"), figures=[records.soak(900)] * 9)):
        pages = paginate(_blocks(record, load_template(None)), ROOM)

        for page in pages[:-1]:
            assert page[-1].down + page[-1].block.height > ROOM / 2
        assert len(pages) <= 7


@pytest.mark.parametrize("count", [1, 2, 3, 8, 9])
def test_figures_keep_the_order_of_the_record(count):
    """Two beside one another; none is lost."""
    base = make("typical")
    listed = [replace(base.figures[0], title=f"figure-{n}") for n in range(count)]

    text = text_of(replace(base, figures=listed))

    assert re.findall(r"figure-\d", text) == [f"figure-{n}" for n in range(count)]


# -- how it is made


@pytest.mark.parametrize("name", EVERY)
def test_every_page_has_its_number_and_the_report_number(name):
    """Page x of y, report number, and the state of sign-off on each."""
    record = make(name)
    pages = reader(record).pages

    for number, page in enumerate(pages, start=1):
        text = " ".join(page.extract_text().split())
        assert f"page {number} of {len(pages)}" in text
        assert text.count(f"Report {record.report_number}") >= 2
        assert "Not signed off" in text


@pytest.mark.parametrize("name", EVERY)
def test_nothing_is_drawn_outside_the_text_area(name, drawn):
    """No string is clipped by an edge or runs out of its page."""
    report_pdf(make(name))

    for page in drawn:
        for left, right, baseline, text, _ in page:
            assert left >= LEFT - 0.5, text
            assert right <= LEFT + WIDTH + 0.5, text
            assert 30 <= baseline <= PAGE[1] - 36, text


@pytest.mark.parametrize("name", [name for name in EVERY if name != "degenerate"])
def test_no_two_strings_overlap(name, drawn):
    """Lines keep their distance, cells stay in their columns."""
    record = make(name)
    report_pdf(record)

    for page in drawn:
        for (left, right, low, text, style), (left2, right2, low2, text2, _) in _pairs(page):
            beside = right <= left2 + 0.3 or right2 <= left + 0.3
            apart = abs(low - low2) >= 0.7 * style.size
            assert beside or apart or not text.strip() or not text2.strip(), (text, text2)


def _pairs(page: list) -> Iterator[tuple[tuple, tuple]]:
    """Pairs of strings that are near enough in height to touch."""
    ordered = sorted(page, key=lambda item: item[2])
    for place, one in enumerate(ordered):
        for other in ordered[place + 1 :]:
            if other[2] - one[2] > 14:
                break
            yield one, other


@pytest.mark.parametrize("name", ["typical", "nasty", "empty"])
def test_all_fonts_are_embedded(name):
    """A reader's machine needs no font of ours, and none of its own is used."""
    found = set()
    for page in reader(make(name)).pages:
        for entry in page["/Resources"]["/Font"].values():
            font = entry.get_object()
            found.add(str(font["/BaseFont"]))
            assert "/FontFile2" in font["/FontDescriptor"].get_object()

    assert found
    assert all("SourceSansPro" in name for name in found)


def test_report_is_the_same_for_the_same_record():
    """Byte for byte; and another time of judging shows."""
    record = make("every_verdict")

    assert report_pdf(record) == report_pdf(make("every_verdict"))
    assert report_pdf(record) != report_pdf(replace(record, judged_at="2026-12-01T08:00:00Z"))


def test_report_describes_itself():
    """Title, author, subject, language and the time of the decision."""
    made = reader(make("typical"))
    info = made.metadata

    assert info is not None
    assert info.title == "Acceptance test report 7C1E-04B9-E2D5: Bench rail 24, serial A-17"
    assert info.author == "Issuer not named in the template"
    assert "accepted" in str(info.subject)
    assert info.get("/CreationDate") == "D:20261130140509Z"
    assert made.trailer["/Root"]["/Lang"] == "en-GB"


# -- what a record may hold


@pytest.mark.parametrize(
    "text", ['<img src="x">', "<para>", "&", "&amp;", "]]>", "=1+1", "(((", "\\", "a\\)b", "</b>", "%s {0}"]
)
def test_texts_are_drawn_as_they_are(text):
    """Markup of any kind is nothing but text, in the serial and everywhere else."""
    record = make("typical")
    hostile = replace(
        record,
        unit=replace(record.unit, serial=text),
        findings=[replace(record.findings[0], name=text, verdict="fail", reason=f"because {text}")],
        notes={"note": text},
    )

    drawn_text = text_of(hostile)

    assert f"serial {text}" in drawn_text
    assert f"because {text}" in drawn_text


@pytest.mark.parametrize(
    ("text", "shown"),
    [
        ("a\x00b", "a■b"),
        ("line\nbreak", "line■break"),
        ("\u202eABC", "■ABC"),
        ("電源-17", "■■-17"),
        ("\N{FIRE} 9", "■ 9"),
        ("zero\u200bwidth", "zero■width"),
        ("\ud800", "■"),
    ],
)
def test_what_cannot_be_printed_is_replaced_and_listed(text, shown):
    """A box for each such character, and the record's own notation near the end."""
    record = make("typical")
    odd = replace(record, unit=replace(record.unit, serial=text))

    drawn_text = text_of(odd)

    assert f"serial {shown}" in drawn_text
    assert "Some characters cannot be printed" in drawn_text
    assert unprintable(odd) == [text]
    escaped = text.encode("utf-16-be", "surrogatepass").hex()
    assert f"\\u{escaped[:4]}" in drawn_text or text[0].isascii()


def test_printable_letters_beyond_ascii_are_kept():
    """Accents, Greek, Cyrillic, signs; a decomposed accent is composed."""
    record = make("typical")
    named = replace(record, notes={"operator": "Žofia Ő. Δη → Яков ½ µΩ", "place": "Cafe\u0301"})

    text = text_of(named)

    assert "Žofia Ő. Δη → Яков ½ µΩ" in text
    assert "Café" in text
    assert "Some characters cannot be printed" not in text


def test_a_serial_without_spaces_is_wrapped_whole():
    """300 characters, each of them on the page."""
    serial = "".join(f"{n:03d}" for n in range(100))
    record = make("typical")

    first = reader(replace(record, unit=replace(record.unit, serial=serial))).pages[0].extract_text()

    assert serial in bare(first)


def test_a_reason_longer_than_a_page_goes_on():
    """Thousands of words: pages are added, none is lost, and the end mark still comes last."""
    words = " ".join(f"w{n:05d}" for n in range(4000))
    record = make("every_verdict")
    findings = [replace(record.findings[0], verdict="fail", reason=words)]

    text = text_of(replace(record, findings=findings))

    for n in range(0, 4000, 97):
        assert text.count(f"w{n:05d}") == 1 + (n < 40)  # all beneath the table, the beginning on the front too


def test_two_hundred_findings_are_all_there():
    """Each once in the table, with the head repeated on its pages."""
    record = make("many_findings")

    pages = [" ".join(page.extract_text().split()) for page in reader(record).pages]

    text = " ".join(pages)
    for finding in record.findings:
        assert finding.name in text
    assert sum("Finding Condition Limit Value U Margin Conformity Verdict" in page for page in pages) > 3


# -- as a file


def test_write_report_writes_the_whole_file(tmp_path):
    """The path comes back, folders are made, nothing else is left."""
    path = write_report(make("typical"), tmp_path / "out" / "A-17.report.pdf")

    assert path.read_bytes() == report_pdf(make("typical"))
    assert [each.name for each in path.parent.iterdir()] == ["A-17.report.pdf"]


def test_write_report_says_where_it_cannot_write(tmp_path):
    """A file where the folder should be."""
    (tmp_path / "out").write_text("in the way")

    with pytest.raises(ReportError, match="cannot be written"):
        write_report(make("typical"), tmp_path / "out" / "A-17.report.pdf")


def test_write_report_takes_the_place_of_a_report_only(tmp_path):
    """A log, a record, a folder or a link is kept; an older report is replaced."""
    record = make("typical")
    log, link = tmp_path / "A-17.csv", tmp_path / "link.pdf"
    log.write_text("Vin,Pin", encoding="utf-8")
    link.symlink_to(log)
    for place in (log, link, tmp_path):
        with pytest.raises(ReportError, match="no PDF stands there"):
            write_report(record, place)

    assert log.read_text(encoding="utf-8") == "Vin,Pin"
    assert (
        write_report(record, tmp_path / "r.pdf").read_bytes() == write_report(record, tmp_path / "r.pdf").read_bytes()
    )


def test_power_factor_is_printed_as_a_number_not_in_per_cent():
    """0.985 against 0.9, as the trade writes it."""
    of_power = replace(
        records.finding("eps.power_factor", 1.0, 0.9),
        characteristic="power_factor",
        value=0.985,
        expanded_uncertainty=0.0031,
    )

    text = text_of(replace(make("typical"), findings=[of_power]))

    assert "0.9850" in text
    assert "≥ 0.9 " in text
    assert "98.5" not in text


def test_value_without_uncertainty_of_its_own_is_printed_as_it_is():
    """The end of a sampling interval is a bound: no ± 0."""
    recovery = replace(
        records.finding("ocp.recovery", 1.0, 0.9), value=0.4, unit="s", min=None, max=3.0, expanded_uncertainty=0.0
    )

    text = text_of(replace(make("typical"), findings=[recovery]))

    assert "0.4 s" in text
    assert "0.40" not in text


def test_dwells_that_no_finding_rests_on_stand_in_the_record_alone():
    """A mean over bursts, or over a winding that cools, is no reading."""
    base = make("typical")
    bursts = replace(base.points[-1], index=len(base.points), stage="overcurrent", where="A-17_ocp.csv, lines 3 to 9")

    plain, with_bursts = text_of(base), text_of(replace(base, points=[*base.points, bursts]))

    assert "A-17_ocp.csv" not in with_bursts
    assert "no finding rests on a mean of them: 1 dwell." in with_bursts
    assert "Of other stages" not in plain
