"""Stages: spellings that mean one stage, rows that are no part of the test, and words that nobody knows."""

from __future__ import annotations

from pathlib import Path

import pytest

from acceptance.bench.read import read_logs
from acceptance.bench.stages import split_name, stage_named

SAMPLES = Path(__file__).resolve().parents[2] / "sample_logs"


def log_with(stages, head=""):
    return head + "stage,Vout (V),Iout (A)\n" + "".join(f"{stage},12.{n},1\n" for n, stage in enumerate(stages))


def doubts_of(log, kind):
    return [doubt for doubt in log.doubts if doubt.kind == kind]


@pytest.mark.parametrize(
    ("written", "stage"),
    [
        *((word, "steady") for word in ("steady", "STEADY", "Steady State", "steady-state", "steady_2", " steady ")),
        *((word, "overcurrent") for word in ("over current", "Over-Current", "overload", "OCP", "overcurrent 3")),
        *((word, "thermal") for word in ("Thermal", "thermal soak", "temperature rise", "Thermal_Soak")),
        *((word, "cold") for word in ("cold", "COLD")),
        *((word, "cooling") for word in ("cooling", "Cool down", "cooldown", "cooling-down")),
        *((word, "warm-up") for word in ("warm-up", "warmup", "Warm up", "WARMING UP", "preheat", "pre-heat")),
        *((word, word.lower()) for word in ("idle", "Pause", "off", "setup")),
    ],
)
def test_spellings_of_a_stage(read_text_log, written, stage):
    """Case, joints and a run's number are no part of a stage."""
    assert stage_named(written) == stage
    assert read_text_log(log_with([written, written])).samples["stage"].tolist() == [stage, stage]


@pytest.mark.parametrize("written", ["unsteady", "steadyish", "warm run", "burn-in", "stage 1", "2", "hot", "colder"])
def test_unknown_stage_is_kept_and_bars_everything(read_text_log, written):
    """A unit must not be accepted while rows of an unknown stage were never judged."""
    assert stage_named(written) is None
    log = read_text_log(log_with(["steady", written, written, "steady"]))

    assert log.samples["stage"].tolist() == ["steady", written, written, "steady"]
    (doubt,) = doubts_of(log, "stage unknown")
    assert (doubt.bars, doubt.channels, doubt.spans) == (True, (), ())
    assert f'"{written}"' in doubt.text
    assert "2 rows" in doubt.text
    assert "A-17.csv:3" in doubt.text
    assert "steady, overcurrent, thermal, cold or cooling" in doubt.remedy


def test_unknown_stages_are_one_doubt(read_text_log):
    """With every value, the rows of all, and the first place."""
    (doubt,) = doubts_of(read_text_log(log_with(["steady", "burn", "steady", "soak?"])), "stage unknown")

    assert '"burn", "soak?"' in doubt.text
    assert "2 rows" in doubt.text
    assert "A-17.csv:3" in doubt.text


def test_stages_that_are_not_judged_are_said(read_text_log):
    """Warm-up, pauses and their like: their own stages, no bar."""
    log = read_text_log(log_with(["warmup", "preheat", "steady", "pause", "steady"]))

    assert log.samples["stage"].tolist() == ["warm-up", "warm-up", "steady", "pause", "steady"]
    assert not doubts_of(log, "stage unknown")
    (doubt,) = doubts_of(log, "stage not judged")
    assert not doubt.bars
    assert "warm-up (2 rows)" in doubt.text
    assert "pause (1 row)" in doubt.text
    assert doubt.spans == ((0, 2), (3, 4))


def test_empty_stage_cells_between_equal_stages_take_that_stage(read_text_log):
    """And no doubt is left."""
    log = read_text_log(log_with(["steady", "", "-", "Steady State", "thermal", "", "thermal"]))

    assert log.samples["stage"].tolist() == ["steady"] * 4 + ["thermal"] * 3
    assert not doubts_of(log, "stage unknown")


@pytest.mark.parametrize(
    ("stages", "rows"),
    [(["", "steady", "steady"], [0]), (["steady", "steady", ""], [2]), (["steady", "", "", "thermal"], [1, 2])],
)
def test_empty_stage_cells_elsewhere_bar_everything(read_text_log, stages, rows):
    """Which stage they belong to nobody can tell."""
    log = read_text_log(log_with(stages))

    told = log.samples["stage"].tolist()
    assert [row for row, stage in enumerate(told) if stage == "not told"] == rows
    (doubt,) = doubts_of(log, "stage unknown")
    assert doubt.bars
    assert "empty" in doubt.text
    assert f"A-17.csv:{rows[0] + 2}" in doubt.text


def test_empty_stage_cells_take_the_stage_that_the_name_tells(read_text_log):
    """A file called thermal."""
    log = read_text_log(log_with(["", "cooling"]), name="A-17_thermal.csv")

    assert log.samples["stage"].tolist() == ["thermal", "cooling"]
    assert not doubts_of(log, "stage unknown")


def test_empty_stage_cells_are_not_filled_across_tables(read_text_log):
    """The logger was started anew in between."""
    log = read_text_log(log_with(["steady", ""]) + log_with(["", "steady"]))

    assert log.samples["stage"].tolist() == ["steady", "not told", "not told", "steady"]
    assert "2 rows" in doubts_of(log, "stage unknown")[0].text


def test_stage_from_a_note(read_text_log):
    """Of a file without a stage column, whose name tells none."""
    text = "# stage: Over Current\nVout (V),Iout (A)\n12,1\n"
    log = read_text_log(text)

    assert log.samples["stage"].tolist() == ["overcurrent"]
    assert log.stages_from == "note"
    assert not doubts_of(log, "stage unknown")
    assert doubts_of(read_text_log(text.replace("Over Current", "burn-in")), "stage unknown")[0].bars


def test_stage_note_against_the_name_bars_everything(read_text_log):
    """One of the two is wrong."""
    text = "# stage: overcurrent\nVout (V),Iout (A)\n12,1\n"

    (doubt,) = doubts_of(read_text_log(text, name="A-17_steady.csv"), "stage unknown")
    assert doubt.bars
    assert "steady" in doubt.text
    assert "overcurrent" in doubt.text
    assert not doubts_of(read_text_log(text, name="A-17_overload.csv"), "stage unknown")


@pytest.mark.parametrize(
    ("stem", "serial", "stage"),
    [
        ("A-17_overload", "A-17", "overcurrent"),
        ("A-17_steady-state", "A-17", "steady"),
        ("A-17 thermal soak 2", "A-17", "thermal"),
        ("A-17_warm-up", "A-17", "warm-up"),
        ("A-17_off", "A-17_off", ""),
        ("A-17-setup", "A-17-setup", ""),
    ],
)
def test_names_tell_spellings_too(stem, serial, stage):
    """But for words that may well end a serial."""
    assert split_name(stem) == (serial, stage)


def test_sheet_of_a_stage_that_is_not_judged(read_book):
    """Its rows are not taken for steady ones."""

    def fill(book):
        book.active.title = "Steady state"
        book.active.append(["Vout (V)"])
        book.active.append([12])
        sheet = book.create_sheet("warm-up")
        sheet.append(["Vout (V)"])
        sheet.append([11])

    log = read_book(fill)

    assert log.samples["stage"].tolist() == ["steady", "warm-up"]
    assert doubts_of(log, "stage not judged")


@pytest.mark.parametrize("path", sorted(p for p in SAMPLES.iterdir() if p.suffix in (".csv", ".tsv", ".txt", ".xlsx")))
def test_sample_logs_have_known_stages(path):
    """None is barred."""
    columns = {"A-22": {"output_voltage": ("U2 [V]", None)}}.get(path.stem)
    log = read_logs([path], columns=columns)

    assert not [d for d in log.doubts if d.kind.startswith("stage")]


@pytest.mark.parametrize("name", ["A-17_overlaod.csv", "A-17_stready.csv", "A-17-termal-2.csv", "colling.csv"])
def test_slip_of_the_pen_in_a_file_name_bars_everything(tmp_path, name):
    path = tmp_path / name
    path.write_text("# serial: A-17\nVout (V),Iout (A)\n24.0,1.0\n23.9,2.0\n", encoding="utf-8")

    log = read_logs([path])

    doubt = next(doubt for doubt in log.doubts if doubt.kind == "stage unknown")
    assert doubt.bars
    assert "is nearly" in doubt.text


@pytest.mark.parametrize("name", ["A-17.csv", "A-17_ready.csv", "A-17_old.csv", "A-17_warm.csv", "studio.csv"])
def test_words_of_their_own_in_a_file_name_are_no_slip(tmp_path, name):
    path = tmp_path / name
    path.write_text("# serial: A-17\nVout (V),Iout (A)\n24.0,1.0\n23.9,2.0\n", encoding="utf-8")

    assert not [doubt for doubt in read_logs([path]).doubts if doubt.kind == "stage unknown"]
