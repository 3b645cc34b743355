"""Progress while a long log is read: for a person who waits, and for nobody else."""

from __future__ import annotations

import io

import pytest

from acceptance.cli import progress


@pytest.fixture
def log(tmp_path):
    path = tmp_path / "A-17.csv"
    path.write_bytes(b"x" * 1000)
    return path


def test_progress_is_told_on_a_terminal_alone(log, monkeypatch):
    monkeypatch.setattr(progress, "_LONG", 500)
    monkeypatch.setattr(progress, "is_terminal", lambda: False)

    with progress.reading([log]) as told:
        assert told is None


def test_progress_is_not_told_of_a_short_log(log, monkeypatch):
    monkeypatch.setattr(progress, "is_terminal", lambda: True)

    with progress.reading([log]) as told:
        assert told is None


def test_progress_tells_share_rate_and_time_left(log, monkeypatch):
    """And that the judging has begun, once all is read; nothing of it on the standard output."""
    import rich.console

    said = io.StringIO()
    console = rich.console.Console
    monkeypatch.setattr(progress, "_LONG", 500)
    monkeypatch.setattr(progress, "is_terminal", lambda: True)
    monkeypatch.setattr(rich.console, "Console", lambda **_: console(file=said, force_terminal=True, width=120))

    with progress.reading([log]) as told:
        told(400, 1000)
        told(600, 1000)
        told(1000, 1000)

    assert "reading" in said.getvalue() or "judging" in said.getvalue()
    assert "100 %" in said.getvalue()
    assert "left" in said.getvalue()
