"""Progress on a terminal while a long log is read."""

from __future__ import annotations

from collections.abc import Callable, Iterator, Sequence
from contextlib import contextmanager
from pathlib import Path

from acceptance.cli.shared import is_terminal

__all__ = ["reading"]

_LONG = 20_000_000  # bytes from which on a person would wonder [B]


@contextmanager
def reading(logs: Sequence[Path]) -> Iterator[Callable[[int, int], None] | None]:
    """A function that takes bytes done and in all, where a person waits for a long log; None otherwise."""
    size = sum(path.stat().st_size for path in logs if path.is_file())
    # a workbook takes a hundred times as long as the same table in text
    heavy = any(path.suffix.lower() in (".xlsx", ".xlsm") and path.stat().st_size > _LONG / 20 for path in logs)
    if not is_terminal() or (size < _LONG and not heavy):
        yield None
        return
    from rich.console import Console
    from rich.progress import BarColumn, Progress, TextColumn, TimeRemainingColumn, TransferSpeedColumn

    columns = (
        TextColumn("{task.description}"),
        BarColumn(),
        TextColumn("{task.percentage:.0f} %"),
        TransferSpeedColumn(),
        TimeRemainingColumn(),
        TextColumn("left"),
    )
    with Progress(*columns, console=Console(stderr=True), transient=True) as bar:
        task = bar.add_task("reading", total=size)

        def told(done: int, total: int) -> None:
            # what comes after the last byte is judging, and has no end that could be told
            bar.update(task, completed=done, total=total, description="reading" if done < total else "judging")

        yield told
