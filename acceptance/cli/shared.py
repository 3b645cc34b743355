"""What several commands need: arguments, and how they speak."""

from __future__ import annotations

import re
import sys
from collections.abc import Callable, Sequence
from pathlib import Path
from typing import Any, TypeVar

import click

from acceptance.errors import Fault, LimitsError

__all__ = [
    "VERDICT_MARKS",
    "bench_option",
    "existing",
    "harmless",
    "is_terminal",
    "limits_option",
    "logs_argument",
    "verdict_words",
]

F = TypeVar("F", bound=Callable[..., Any])

# a word, a mark and a colour: never the colour alone
VERDICT_MARKS: dict[str, tuple[str, str]] = {
    "pass": ("+", "green"),
    "accepted": ("+", "green"),
    "conditional pass": ("?", "yellow"),
    "conditional fail": ("?", "yellow"),
    "not judged": ("?", "yellow"),
    "undecided": ("?", "yellow"),
    "fail": ("x", "red"),
    "rejected": ("x", "red"),
}

_CONTROL = re.compile(r"[\x00-\x08\x0b-\x1f\x7f-\x9f\u202a-\u202e\u2066-\u2069\ud800-\udfff]")


def harmless(text: str) -> str:
    """The text with control characters shown as their codes, so that a log's text cannot drive a terminal."""
    return _CONTROL.sub(lambda found: f"\\x{ord(found.group()):02x}", text)


def verdict_words(verdict: str, width: int = 0) -> str:
    """A verdict with its mark, coloured on a terminal."""
    mark, colour = VERDICT_MARKS[verdict]
    return click.style(f"{mark} {verdict}".ljust(width), fg=colour, bold=verdict in ("accepted", "rejected", "fail"))


def is_terminal() -> bool:
    """Whether a person is looking at standard error."""
    return sys.stderr.isatty()


def existing(paths: Sequence[Path]) -> None:
    """See to it that all paths exist.

    Raises
    ------
    LimitsError
        Naming each that does not, for exit status 2.
    """
    faults = [Fault(str(path), 0, 0, "there is no such file", "see the path") for path in paths if not path.exists()]
    if faults:
        raise LimitsError(faults)


def logs_argument(function: F) -> F:
    """LOG..."""
    return click.argument("logs", metavar="LOG...", nargs=-1, required=True, type=click.Path(path_type=Path))(function)


def limits_option(*, required: bool) -> Callable[[F], F]:
    """--limits FILE."""
    return click.option(
        "--limits", "limits_path", metavar="FILE", required=required, type=click.Path(path_type=Path),
        help="The limits file: what the unit must meet.",
    )  # fmt: skip


def bench_option(function: F) -> F:
    """--bench FILE."""
    return click.option(
        "--bench", "bench_path", metavar="FILE", type=click.Path(path_type=Path),
        help="The bench file: what measured it. Goes before the bench's part of the limits file.",
    )(function)  # fmt: skip
