"""Templates: what they may change, what they may lack, and how a bad one is refused."""

from __future__ import annotations

import contextlib
import io
from pathlib import Path

import pytest
import report_records as records
from hypothesis import given, settings
from hypothesis import strategies as st
from pypdf import PdfReader

from acceptance.errors import ReportError
from acceptance.report.build import report_pdf
from acceptance.report.template import HAZARDS, SECTIONS, load_template


def write(folder: Path, **files: str) -> Path:
    for name, text in files.items():
        (folder / f"{name}.yaml").write_text(text, encoding="utf-8")
    return folder


def pages(folder: Path) -> str:
    made = PdfReader(io.BytesIO(report_pdf(records.typical(), template=folder)))
    return " ".join(" ".join(page.extract_text() for page in made.pages).split())


def test_default_template_is_whole():
    """Every part, every hazard, words for each; a waiting time's place where one can be told."""
    template = load_template()

    assert template.sections == SECTIONS
    assert template.issuer.name == ""  # nobody's letterhead on anybody's report
    assert set(template.cautions.hazards) == set(HAZARDS)
    assert all(caution.title and caution.text for caution in template.cautions.hazards.values())
    assert "{wait}" in template.cautions.hazards["stored charge"].text_with_wait
    assert len(template.cautions.general) >= 4


def test_empty_folder_gives_the_default(tmp_path):
    """Nothing there, nothing changed."""
    assert load_template(tmp_path) == load_template()
    assert load_template(write(tmp_path, template="# only a remark\n")) == load_template()


def test_template_changes_what_it_names_only(tmp_path):
    """Issuer's name and one caution; the rest stays."""
    write(
        tmp_path,
        template='issuer: {name: "Lower Shop & Sons <1>"}\n',
        cautions="hazards: {mains: {text: Own words on mains.}}\n",
    )

    template = load_template(tmp_path)

    default = load_template()
    assert template.issuer.name == "Lower Shop & Sons <1>"
    assert template.issuer.address == default.issuer.address
    assert template.cautions.hazards["mains"].text == "Own words on mains."
    assert template.cautions.hazards["mains"].title == default.cautions.hazards["mains"].title
    assert template.cautions.general == default.cautions.general
    assert "Lower Shop & Sons <1>" in pages(tmp_path)
    assert "Own words on mains." in pages(tmp_path)


def test_template_orders_and_leaves_out_parts(tmp_path):
    """The list decides."""
    text = "sections: [findings, cautions, evidence, method, doubts, sign_off]\n"

    drawn = pages(write(tmp_path, template=text))

    assert "Uncertainty budgets" not in drawn
    assert "Figures" not in drawn
    order = [
        drawn.index(word) for word in ("Conformity Verdict", "Electrical safety", "Evidence", "Method and decision")
    ]
    assert order == sorted(order)


@pytest.mark.parametrize(
    ("name", "text", "match"),
    [
        ("template", "issuer: [a]\n", r'template\.yaml:1:9: "issuer" is no mapping'),
        ("template", "title: a\nisuer: {}\n", r'template\.yaml:2:8: unknown key "isuer"; expected one of'),
        ("template", "title: [a]\n", r'template\.yaml:1:8: "title" is no text'),
        ("template", "title: a\ntitle: b\n", r'template\.yaml:2:1: the key "title" stands there twice'),
        ("template", "template: 2\n", r'template\.yaml:1:11: version "2" of a template; expected 1'),
        ("template", "language: xx\n", r'template\.yaml:1:11: language "xx"'),
        (
            "template",
            "sections: [findings]\n",
            r'template\.yaml:1:11: "cautions" is left out; only these may be left out',
        ),
        ("template", "sections: [verdicts]\n", r'"verdicts" is no part of a report'),
        ("template", "sections: [figures, figures]\n", r'"figures" stands there twice'),
        ("template", "a: &x 1\nb: *x\n", r"template\.yaml:2:4: an alias"),
        ("template", "- a\n", r"template\.yaml:1:1: no keys stand at its top"),
        ("template", "title: 'open\n", r"template\.yaml:\d+:\d+: this is not YAML"),
        ("template", "title: a\x01\n", r"template\.yaml: this is not YAML"),
        ("template", "title: " + "[" * 30, r"nested too deeply"),
        ("template", "title: " + "[" * 5000, r"template\.yaml"),
        ("template", "x" * 300_000, r"300000 bytes; expected at most"),
        ("cautions", "hazards: {mains: text}\n", r'cautions\.yaml:1:18: "mains" is no mapping'),
        ("cautions", "hazards: {fire: {}}\n", r'cautions\.yaml:1:17: unknown key "fire"'),
        ("cautions", "general: [a]\n", r'cautions\.yaml:1:10: "general" holds something that is no mapping'),
        ("cautions", "hazards: {mains: {text_with_wait: soon}}\n", r"there is no {wait} in it"),
    ],
)
def test_bad_templates_are_refused_with_their_place(tmp_path, name, text, match):
    """File, line and column, what was found, what is expected."""
    with pytest.raises(ReportError, match=match):
        load_template(write(tmp_path, **{name: text}))


def test_missing_folder_and_wrong_encoding_are_refused(tmp_path):
    """A path that is not there; a file that is not UTF-8."""
    with pytest.raises(ReportError, match="there is no such folder"):
        load_template(tmp_path / "none")
    (tmp_path / "template.yaml").write_bytes(b"title: \xff\xfe\n")
    with pytest.raises(ReportError, match="it is not UTF-8"):
        load_template(tmp_path)


@settings(max_examples=150, deadline=None)
@given(text=st.text(max_size=200) | st.text(alphabet="abt{}[]:,-&*! \n'\"#|>", max_size=80))
def test_any_text_is_a_template_or_a_report_error(tmp_path_factory, text):
    """Nothing else ever comes out."""
    folder = write(tmp_path_factory.mktemp("template"), template="")
    (folder / "template.yaml").write_bytes(text.encode("utf-8", "surrogatepass"))

    with contextlib.suppress(ReportError):
        load_template(folder)


def test_example_template_names_its_workshop_on_every_page():
    """The letterhead that ships as an example, the rest from the default."""
    folder = Path(__file__).resolve().parents[2] / "templates" / "tarnbeck"

    assert load_template(folder).cautions == load_template().cautions
    assert pages(folder).count("Tarnbeck Bench Works") >= 3
