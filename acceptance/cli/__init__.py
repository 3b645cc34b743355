"""The commands: parse, call, print, exit. No logic.

A command's module is imported when it is run; help for all of them needs none.
"""

from __future__ import annotations

import gc
import importlib
import sys
from typing import Any

import click

from acceptance import __version__
from acceptance.errors import AcceptanceError

__all__ = ["main"]

# command -> module and attribute, and the line that `acceptance --help` shows
COMMANDS: dict[str, tuple[str, str]] = {
    "judge": ("acceptance.cli.judge:judge", "Judge one unit: its logs against a limits file; record and report."),
    "inspect": ("acceptance.cli.inspect:inspect", "Show how a log is read: columns, units, stages, dwells, doubts."),
    "report": ("acceptance.cli.report:report", "Draw the report of a record again."),
    "limits": ("acceptance.cli.limits:limits", "Check a limits file, print its JSON Schema, or show published limits."),
}

UNFORESEEN = "something unforeseen went wrong"


class LazyGroup(click.Group):
    """A group whose commands are imported when they are asked for."""

    def list_commands(self, ctx: click.Context) -> list[str]:
        """Names of the commands, in the order of the job."""
        return list(COMMANDS)

    def get_command(self, ctx: click.Context, cmd_name: str) -> click.Command | None:
        """The command, imported."""
        if cmd_name not in COMMANDS:
            return None
        module, _, name = COMMANDS[cmd_name][0].partition(":")
        command: click.Command = getattr(importlib.import_module(module), name)
        return command

    def format_commands(self, ctx: click.Context, formatter: click.HelpFormatter) -> None:
        """The list of commands, without importing one."""
        with formatter.section("Commands"):
            formatter.write_dl([(name, words) for name, (_, words) in COMMANDS.items()])


@click.group(cls=LazyGroup, context_settings={"help_option_names": ["-h", "--help"], "max_content_width": 100})
@click.version_option(__version__, "--version", "-V", message="acceptance %(version)s")
def cli() -> None:
    """From logged bench data of a power source to a decision and a test report.

    \b
    Exit status: 0 all accepted, or done; 1 a unit rejected; 2 the command line or a limits or bench file is wrong;
    3 something undecided, unreadable, not judged, or not written.
    """


def main(arguments: list[str] | None = None) -> None:
    """Run the command line; every error is a line on standard error and an exit status, never a traceback."""
    sys.exit(run(arguments))


def run(arguments: list[str] | None = None) -> int:
    """The exit status of a command line."""
    # a short life full of imports makes hardly any garbage: looking for it less often saves a tenth of the start-up
    gc.set_threshold(50_000, 50, 50)
    try:
        result: Any = cli.main(arguments, prog_name="acceptance", standalone_mode=False)
        return result if isinstance(result, int) else 0
    except click.exceptions.Exit as stop:
        return stop.exit_code
    except click.UsageError as problem:
        _say(f"{problem.format_message()} (see {_help_of(problem)})")
        return 2
    except click.Abort:
        _say("stopped")
        return 130
    except click.ClickException as problem:
        _say(problem.format_message())
        return problem.exit_code
    except AcceptanceError as problem:
        return _refused(problem)
    except BrokenPipeError:
        # whoever read our output has gone; there is nobody to tell
        sys.stderr.close()
        return 3
    except KeyboardInterrupt:
        _say("stopped")
        return 130
    except OSError as problem:
        where = f"{problem.filename}: " if problem.filename else ""
        _say(f"{where}{problem.strerror or problem}")
        return 3
    except MemoryError:
        _say("there is not enough memory for this log; split it, or leave out columns that are not needed")
        return 3
    except Exception as problem:  # noqa: BLE001 - no traceback reaches a user
        _say(f"{UNFORESEEN} ({type(problem).__name__}: {_one_line(problem)}); nothing was judged")
        return 3


def _refused(problem: AcceptanceError) -> int:
    from acceptance.errors import LimitsError, SeveralSerialsError

    _say(str(problem))
    return 2 if isinstance(problem, LimitsError | SeveralSerialsError) else 3


def _help_of(problem: click.UsageError) -> str:
    path = problem.ctx.command_path if problem.ctx is not None else "acceptance"
    return f"{path} --help"


def _one_line(problem: Exception) -> str:
    return " ".join(str(problem).split())[:300]


def _say(text: str) -> None:
    """Text to standard error; whatever in it no terminal should obey is shown, not sent."""
    from acceptance.cli.shared import harmless

    click.echo(harmless(text), err=True)
