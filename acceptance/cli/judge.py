"""`acceptance judge`: one unit."""

from __future__ import annotations

from datetime import UTC, datetime
from pathlib import Path
from typing import TYPE_CHECKING

import click

from acceptance.cli.shared import bench_option, existing, harmless, limits_option, logs_argument, verdict_words

if TYPE_CHECKING:
    from acceptance.record import Finding, Record

__all__ = ["judge"]

EXIT_BY_VERDICT = {"accepted": 0, "rejected": 1, "undecided": 3}

# an option more than the command's line shows: a letterhead of one's own, from the first report on
template_option = click.option(
    "--template", metavar="DIR", type=click.Path(path_type=Path),
    help="A template folder for the report: letterhead, sections, wording of the cautions.",
)  # fmt: skip


@click.command()
@logs_argument
@limits_option(required=True)
@bench_option
@click.option("--serial", metavar="S", help="The unit's serial, where the logs do not tell it.")
@click.option(
    "--out", metavar="DIR", type=click.Path(path_type=Path, file_okay=False), default=Path(),
    help="Where record and report go (default: here).",
)  # fmt: skip
@template_option
@click.option("--json", "as_json", is_flag=True, help="Print verdict and paths as JSON.")
def judge(
    logs: tuple[Path, ...],
    limits_path: Path,
    bench_path: Path | None,
    serial: str | None,
    out: Path,
    template: Path | None,
    as_json: bool,
) -> int:
    """Judge one unit by its logs: DIR/<serial>.record.json and DIR/<serial>.report.pdf."""
    existing([*logs, limits_path, *(path for path in (bench_path, template) if path)])
    if serial is not None and not serial.strip():
        msg = "--serial is empty"
        raise click.UsageError(msg)
    from acceptance.limitfile.load import load_limits

    limits = load_limits(limits_path, bench_path)  # before the heavy imports: a fault in it is told at once

    from acceptance.cli.progress import reading
    from acceptance.judge import judge_unit
    from acceptance.record import write_record
    from acceptance.report.build import write_report

    with reading(logs) as progress:
        record = judge_unit(logs, limits, serial=serial, judged_at=datetime.now(UTC), progress=progress)
    record_path = write_record(record, out)
    report_path = write_report(record, _beside(record_path), template=template)
    if as_json:
        _print_json(record, record_path, report_path)
    else:
        _print_words(record, record_path, report_path)
    return EXIT_BY_VERDICT[record.verdict]


def _beside(record_path: Path) -> Path:
    return record_path.with_name(record_path.name.removesuffix(".record.json") + ".report.pdf")


def _print_json(record: Record, record_path: Path, report_path: Path) -> None:
    import json

    told = {
        "serial": record.unit.serial,
        "verdict": record.verdict,
        "joint_conformity_probability": record.joint_conformity_probability,
        "findings": {finding.name: finding.verdict for finding in record.findings},
        "record": str(record_path),
        "report": str(report_path),
    }
    click.echo(json.dumps(told, ensure_ascii=False, indent=1))


def _print_words(record: Record, record_path: Path, report_path: Path) -> None:
    names = max((len(finding.name) for finding in record.findings), default=0)
    for finding in record.findings:
        click.echo(f"  {verdict_words(finding.verdict, 18)}  {_line(finding, names)}")
    for text in dict.fromkeys(doubt.text for doubt in record.health if doubt.bars):
        click.echo(harmless(f"  doubt: {text}"))
    others = list(dict.fromkeys(doubt.kind for doubt in record.health if not doubt.bars))
    if differed := sum(bool(finding.deviations) for finding in record.findings):
        others.append(f"how the test differed from what is asked, for {differed} finding{'s' if differed > 1 else ''}")
    if others:
        click.echo(harmless(f"  also told in the report: {', '.join(others)}"))
    unit = harmless(f"{record.unit.product}, serial {record.unit.serial}")
    click.echo(f"{unit}: {verdict_words(record.verdict)} (performance limits only; no safety approval)")
    click.echo(f"record  {record_path}")
    click.echo(f"report  {report_path}")


def _line(finding: Finding, names: int) -> str:
    from acceptance.printing import DASH, limit_range, printed_finding

    told = [harmless(finding.name).ljust(names), harmless(finding.condition)]
    if finding.value is not None:
        texts = printed_finding(finding)
        uncertainty = "" if texts.expanded == DASH else f" ± {texts.with_difference_unit(texts.expanded)}"
        limit = harmless(finding.asked) or limit_range(
            finding.min, finding.max, finding.unit, per_cent=finding.in_per_cent
        )
        told.append(f"{harmless(texts.with_unit(texts.value))}{uncertainty} (limit {limit})")
    if finding.reason:
        told.append(harmless(finding.reason))
    return "  ".join(part for part in told if part)
