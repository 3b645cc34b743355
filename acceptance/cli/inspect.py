"""`acceptance inspect`: how a log is read, before anything is judged by it."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import asdict
from pathlib import Path
from typing import TYPE_CHECKING, Any

import click

from acceptance.cli.shared import bench_option, existing, harmless, limits_option, logs_argument

if TYPE_CHECKING:
    from rich.console import Console

    from acceptance.bench.log import Evidence
    from acceptance.inspection import DwellShown, Inspection

__all__ = ["inspect"]

_ROWS = 200  # dwells shown before the table is cut; --json has them all


@click.command()
@logs_argument
@limits_option(required=False)
@bench_option
@click.option("--json", "as_json", is_flag=True, help="Print everything as JSON.")
def inspect(logs: tuple[Path, ...], limits_path: Path | None, bench_path: Path | None, as_json: bool) -> int:
    """Show how a log is read: columns, units, stages, dwells, doubts, and a log: block to paste."""
    existing([*logs, *([limits_path] if limits_path else []), *([bench_path] if bench_path else [])])
    limits, bench = None, None
    if limits_path is not None:
        from acceptance.limitfile.load import load_limits

        limits = load_limits(limits_path, bench_path)
    elif bench_path is not None:
        from acceptance.limitfile.load import load_bench

        bench = load_bench(bench_path)
    from acceptance.inspection import inspect_logs

    seen = inspect_logs(logs, limits, bench=bench)
    if as_json:
        _print_json(seen)
    else:
        _print_words(seen)
    return 0


def _print_json(seen: Inspection) -> None:
    import json

    log = seen.log
    told: dict[str, Any] = {
        "serial": log.serial,
        "serial_from": log.serial_from,
        "test_date": log.test_date.isoformat() if log.test_date else None,
        "stages": [str(stage) for stage in log.samples["stage"].unique()],
        "stages_from": log.stages_from,
        "samples": len(log.samples),
        "files": [_plain(one) for one in log.evidence],
        "columns": [asdict(channel) for channel in log.channels],
        "notes": log.notes,
        "stated": log.stated,
        "ignored": [asdict(one) for one in log.ignored],
        "dwells": [asdict(dwell) for dwell in seen.dwells],
        "doubts": [asdict(doubt) for doubt in seen.doubts],
        "log_block": seen.block,
    }
    click.echo(json.dumps(told, ensure_ascii=False, indent=1))


def _plain(one: Evidence) -> dict[str, Any]:
    return {**asdict(one), "started_at": one.started_at.isoformat() if one.started_at else None}


def _print_words(seen: Inspection) -> None:
    from rich.console import Console

    console = Console(highlight=False, markup=False, emoji=False)
    if not console.is_terminal:
        # a file or a pipe has no edge to wrap at
        console = Console(highlight=False, markup=False, emoji=False, width=200)
    log = seen.log
    for one in log.evidence:
        _say(console, f"{one.file}: {one.dialect}; {one.rows} samples, {one.bytes} bytes")
    _say(console, f"serial {log.serial} (from the {log.serial_from}), stages from: {log.stages_from}")
    _say(console, f"test date {log.test_date.isoformat() if log.test_date else 'not told by the log'}")
    for key, text in log.notes.items():
        _say(console, f"note    {key}: {text}")
    _columns(console, seen)
    _ignored(console, seen)
    _dwells(console, seen)
    _doubts(console, seen)
    if seen.block:
        _say(console, "\nTo paste into the limits or bench file, after a look at each line:\n")
        _say(console, seen.block)


def _columns(console: Console, seen: Inspection) -> None:
    files = len({channel.file for channel in seen.log.channels}) > 1
    rows = [
        [c.key, c.heading, f"{c.unit or '-'} ({c.unit_from})", c.reason, *([c.file] if files else [])]
        for c in seen.log.channels
    ]
    _table(console, "Columns", ["channel", "heading", "unit", "why", *(["file"] if files else [])], rows)


def _ignored(console: Console, seen: Inspection) -> None:
    if seen.log.ignored:
        rows = [[one.what, one.reason, one.file] for one in seen.log.ignored]
        _table(console, "Left out", ["what", "why", "file"], rows)


def _dwells(console: Console, seen: Inspection) -> None:
    if not seen.dwells:
        _say(console, "\nNo dwell was found.")
        return
    keys = list(dict.fromkeys(key for dwell in seen.dwells for key in dwell.means))
    shown = [key for key in keys if key.split(" ")[0] in _SHOWN]
    headings = [
        "#",
        "stage",
        "start",
        "lasts",
        "n",
        "settling",
        *(f"{k} [{_unit(k)}]" for k in shown),
        "where",
        "found by",
    ]
    rows = [_dwell_row(dwell, shown) for dwell in seen.dwells[:_ROWS]]
    _table(console, f"Dwells ({len(seen.dwells)})", headings, rows, right=range(2, 6 + len(shown)))
    if len(seen.dwells) > _ROWS:
        _say(console, f"... and {len(seen.dwells) - _ROWS} more; --json has them all")


_SHOWN = ("input_voltage", "input_power", "output_voltage", "output_current", "load_setting")


def _unit(key: str) -> str:
    from acceptance.bench.log import QUANTITIES
    from acceptance.units import KINDS

    return KINDS.get(QUANTITIES[key.split(" ")[0]], "SI")


def _dwell_row(dwell: DwellShown, keys: Sequence[str]) -> list[str]:
    start = "-" if dwell.starts is None else f"{dwell.starts:.6g} s"
    lasts = "-" if dwell.duration is None else f"{dwell.duration:.4g} s"
    means = [_mean(dwell.means.get(key), dwell.u.get(key)) for key in keys]
    left_out = str(dwell.settling)
    return [
        str(dwell.number),
        dwell.stage,
        start,
        lasts,
        str(dwell.readings),
        left_out,
        *means,
        dwell.where,
        dwell.found_by,
    ]


def _mean(mean: float | None, u: float | None) -> str:
    """A mean with digits that fit its spread."""
    if mean is None:
        return "-"
    if not u:
        return f"{mean:.6g}"
    from math import floor, log10

    return f"{mean:.{min(9, max(0, 1 - floor(log10(u))))}f}"


def _doubts(console: Console, seen: Inspection) -> None:
    if not seen.doubts:
        _say(console, "\nNo doubts about the data.")
        return
    rows = [
        [doubt.kind, "not judged" if doubt.bars else "told", doubt.text, doubt.remedy or "-"] for doubt in seen.doubts
    ]
    _table(console, f"Doubts ({len(rows)})", ["kind", "effect", "what", "remedy"], rows)


def _table(
    console: Console, title: str, headings: Sequence[str], rows: Sequence[Sequence[str]], *, right: Sequence[int] = ()
) -> None:
    from rich import box
    from rich.table import Table
    from rich.text import Text

    table = Table(title=title, title_justify="left", box=box.SIMPLE_HEAD, pad_edge=False, title_style="bold")
    for index, heading in enumerate(headings):
        table.add_column(Text(harmless(heading)), justify="right" if index in right else "left", overflow="fold")
    for row in rows:
        table.add_row(*(Text(harmless(cell)) for cell in row))
    console.print()
    console.print(table)


def _say(console: Console, text: str) -> None:
    from rich.text import Text

    console.print(Text(harmless(text)), soft_wrap=True)
