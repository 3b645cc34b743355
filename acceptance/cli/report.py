"""`acceptance report`: a record, drawn again."""

from __future__ import annotations

from pathlib import Path

import click

from acceptance.cli.shared import existing

__all__ = ["report"]


@click.command()
@click.argument("record_path", metavar="RECORD", type=click.Path(path_type=Path))
@click.option(
    "--template", metavar="DIR", type=click.Path(path_type=Path),
    help="A template folder: letterhead, sections, wording of the cautions.",
)  # fmt: skip
@click.option("--out", metavar="FILE", type=click.Path(path_type=Path), help="The PDF (default: beside the record).")
@click.option("--json", "as_json", is_flag=True, help="Print the path as JSON.")
def report(record_path: Path, template: Path | None, out: Path | None, as_json: bool) -> int:
    """Draw the report of a record again, from the record alone."""
    existing([record_path, *([template] if template else [])])
    from acceptance.record import read_record
    from acceptance.report.build import write_report

    record = read_record(record_path)
    name = record_path.name.removesuffix(".json").removesuffix(".record") + ".report.pdf"
    path = write_report(record, out or record_path.with_name(name), template=template)
    if as_json:
        import json

        click.echo(json.dumps({"report": str(path)}))
    else:
        click.echo(f"report  {path}")
    return 0
