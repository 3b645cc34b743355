"""`acceptance limits`: what a limits file may say, and whether one does."""

from __future__ import annotations

from pathlib import Path

import click

from acceptance.cli.shared import existing

__all__ = ["limits"]


@click.group()
def limits() -> None:
    """Check a limits file, print its JSON Schema, or show the published sets of limits."""


@limits.command()
@click.argument("path", metavar="FILE", required=False, type=click.Path(path_type=Path))
@click.option("--bench", "bench_path", metavar="FILE", type=click.Path(path_type=Path), help="The bench file with it.")
@click.option("--json", "as_json", is_flag=True, help="Print what was found as JSON.")
def check(path: Path | None, bench_path: Path | None, as_json: bool) -> int:
    """Check a limits file, or a bench file alone: every fault with file, line and column, all at once."""
    existing([one for one in (path, bench_path) if one is not None])
    if path is None:
        return _check_bench(bench_path)
    from acceptance.limitfile.load import load_limits

    found = load_limits(path, bench_path)
    if as_json:
        import json

        names = [requirement.name for requirement in found.requirements]
        told = {"file": str(path), "requirements_sha256": found.requirements_sha256, "requirements": names}
        click.echo(json.dumps(told, ensure_ascii=False, indent=1))
    else:
        count = len(found.requirements)
        click.echo(f"{path}: no fault; {count} {'requirement' if count == 1 else 'requirements'}")
    return 0


def _check_bench(path: Path | None) -> int:
    if path is None:
        msg = "give a limits file, or --bench FILE"
        raise click.UsageError(msg)
    from acceptance.limitfile.load import load_bench

    load_bench(path)
    click.echo(f"{path}: no fault")
    return 0


@limits.command()
@click.option("--bench", "of_bench", is_flag=True, help="That of a bench file instead.")
def schema(of_bench: bool) -> int:
    """Print the JSON Schema of a limits file, for an editor that completes and checks while you type."""
    import json

    from acceptance.limitfile.load import bench_schema, limits_schema

    click.echo(json.dumps(bench_schema() if of_bench else limits_schema(), ensure_ascii=False, indent=2))
    return 0


@limits.command()
@click.argument("name", required=False)
@click.option("--voltage", "voltages", metavar="VOLTAGE", multiple=True, help="Rated output voltage, such as 12V.")
@click.option("--current", "currents", metavar="CURRENT", multiple=True, help="Rated output current, such as 2A.")
@click.option("--power", metavar="POWER", help="Rated output power; default: volts times amperes of all outputs.")
@click.option("--class", "class_name", metavar="CLASS", help="Default: told from the ratings.")
@click.option("--ports", metavar="N", type=click.IntRange(1), help="Adaptive ports and different fixed voltages.")
@click.option("--json", "as_json", is_flag=True, help="Print it as JSON.")
def published(
    name: str | None,
    voltages: tuple[str, ...],
    currents: tuple[str, ...],
    power: str | None,
    class_name: str | None,
    ports: int | None,
    as_json: bool,
) -> int:
    """List the published sets of limits, or show the set NAME and what it asks of a product.

    \b
    acceptance limits published                                                every set
    acceptance limits published us-eps-level-vi                                one set, all of its classes
    acceptance limits published us-eps-level-vi --voltage 12V --current 2A     its limits for a product
    Several outputs: --voltage and --current again for each.
    """
    from acceptance.cli import published as show  # the sets and their words are read only here

    rated = show.Plate(voltages, currents, power, class_name, ports)
    if name is None:
        if rated.is_given:
            msg = "give the NAME of a set, such as us-eps-level-vi, beside the ratings"
            raise click.UsageError(msg)
        return show.every_set(as_json=as_json)
    return show.limits_for(name, rated, as_json=as_json) if rated.is_given else show.one_set(name, as_json=as_json)
