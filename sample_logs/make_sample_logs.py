"""Make the logs of this folder again, the same to the byte.

    python sample_logs/make_sample_logs.py [--out DIR]

`CASES` says what each log is there to show and what the tool is to find in it.
"""

from __future__ import annotations

import argparse
from collections.abc import Sequence
from dataclasses import dataclass
from pathlib import Path

from workshop.runs import FILES, LogFile

__all__ = ["CASES", "FILES", "Case", "LogFile", "make", "readme"]

HERE = Path(__file__).resolve().parent


@dataclass(frozen=True, slots=True)
class Case:
    """One unit given to `acceptance judge`, and what is to come of it."""

    files: tuple[str, ...]
    limits: str  # under limits/
    verdict: str
    shows: str
    bench: str = ""  # under limits/; "": the limits file names the instruments itself
    fails: tuple[str, ...] = ()  # every finding that is to fail
    not_judged: tuple[str, ...] = ()  # every finding that is not to be judged
    open: tuple[str, ...] = ()  # every finding that is to pass or fail on condition
    because: tuple[tuple[str, str], ...] = ()  # finding, and words that its reason must hold

    @property
    def unit(self) -> str:
        """The serial, as the files' names tell it."""
        return Path(self.files[0]).stem.partition("_")[0]


ADAPTER, SUPPLY = "quillfen-adapter.yaml", "wrenlow-bench-supply.yaml"
CONVERTER, TWO_OUTPUT = "pellmarsh-converter.yaml", "skerrow-two-output.yaml"
BENCH_2, BENCH_3 = "tarnbeck-bench-2.yaml", "tarnbeck-bench-3.yaml"
ADAPTER_FULL, SUPPLY_FULL = "quillfen-adapter-full.yaml", "wrenlow-bench-supply-full.yaml"
CONVERTER_FULL = "pellmarsh-converter-full.yaml"
STAGES = ("cold", "cooling", "overcurrent", "steady", "thermal")  # as a shell sorts the files
ALL_STAGES = tuple(f"A-17_{stage}.csv" for stage in STAGES)

CASES = (
    Case(("A-17_steady.csv",), ADAPTER, "accepted", "the main demo: comma, decimal point, UTF-8, date-times with zone"),
    Case(
        ALL_STAGES,
        ADAPTER_FULL,
        "accepted",
        "every kind of requirement, five files as stages: a published set, hiccup seen in a CR sweep, a settled soak "
        "of 4 h in a room that warms by 1 K, the winding by its resistance",
    ),
    Case(ALL_STAGES, ADAPTER, "accepted", "the same five files where only the steady stage is asked for"),
    Case(
        ("A-17_steady.csv",),
        "start-here.yaml",
        "accepted",
        "the first limits and bench file of a newcomer",
        bench="bench-start-here.yaml",
    ),
    Case(
        ("A-18.csv",),
        ADAPTER,
        "rejected",
        "lossy at half load; semicolons, decimal comma, UTF-8 with mark, notes above, mA, no load setting",
        fails=("eff-50",),
    ),
    Case(
        ("A-19.csv",),
        ADAPTER,
        "rejected",
        "30 mohm too much at the output; semicolons, decimal comma, Latin-1, day and clock in two columns",
        fails=("loadreg",),
    ),
    Case(
        ("A-20_steady.csv",),
        ADAPTER,
        "undecided",
        "75 % load was not run; clock times, units in the cells",
        not_judged=("eff-75", "eff-avg"),
    ),
    Case(
        ("A-21.csv",),
        ADAPTER,
        "undecided",
        "a.c. volts and amperes without watts; lower-case headings, notes below",
        not_judged=("eff-10", "eff-25", "eff-50", "eff-75", "eff-100", "eff-avg", "standby"),
    ),
    Case(
        ("A-22.csv",),
        "quillfen-adapter-conditional.yaml",
        "undecided",
        "average efficiency too near its limit to be shown; headings explained by the bench file",
        bench="tarnbeck-bench-4.yaml",
        open=("eff-avg",),
    ),
    Case(
        ("B-203.xlsx",),
        SUPPLY,
        "accepted",
        "workbook: table off the corner, notes beside it, sheets as stages",
        bench=BENCH_2,
    ),
    Case(
        ("B-203.xlsx", "B-203_thermal.txt"),
        SUPPLY_FULL,
        "accepted",
        "constant current seen in a CR sweep on a sheet of its own; the soak in a file beside the workbook",
        bench=BENCH_2,
    ),
    Case(
        ("B-204.tsv",),
        SUPPLY,
        "rejected",
        "a dried-out capacitor; tabs, UTF-16",
        bench=BENCH_2,
        fails=("ripple",),
    ),
    Case(
        ("B-205.txt",),
        SUPPLY,
        "undecided",
        "the voltmeter hung from full load on; bars",
        bench=BENCH_2,
        not_judged=("band", "eff-100", "linereg", "loadreg"),
    ),
    Case(
        ("B-206_overcurrent.tsv", "B-206_steady.tsv", "B-206_thermal.tsv"),
        SUPPLY_FULL,
        "undecided",
        "slots full of dust: its soak, stopped after 50 min, has not settled; in the end it would go beyond the limit",
        bench=BENCH_2,
        not_judged=("rise-case",),
        because=(("rise-case", "not settled"),),
    ),
    Case(
        ("D-0412.csv",),
        CONVERTER,
        "accepted",
        "d.c. in, power from volts and amperes, shunts; units in a row under the headings",
        bench=BENCH_3,
    ),
    Case(
        ("D-0413.csv",),
        CONVERTER,
        "accepted",
        "one row a condition, read and written down; units in the cells",
        bench=BENCH_3,
    ),
    Case(
        ("D-0414.csv",),
        CONVERTER,
        "rejected",
        "a bad switch, lossy at full load; clock times over midnight, Latin-1",
        bench=BENCH_3,
        fails=("eff-100",),
    ),
    Case(
        ("D-0415.tsv",),
        CONVERTER,
        "undecided",
        "a good unit, but a shunt past its due date; tabs, units in a row",
        bench=BENCH_3,
        not_judged=("calibration.SH-10",),
    ),
    Case(
        tuple(f"D-0416_{stage}.csv" for stage in STAGES),
        CONVERTER_FULL,
        "accepted",
        "foldback seen in a CR sweep, a settled soak of 2.5 h, class B, the winding by its resistance",
        bench=BENCH_3,
    ),
    Case(
        ("D-0417_overcurrent.csv", "D-0417_steady.csv"),
        CONVERTER_FULL,
        "rejected",
        "swept in CV mode: it holds its current into the short, where it was to fold back; not gone on to the soak",
        bench=BENCH_3,
        fails=("ocp.behaviour", "ocp.short_circuit"),
        not_judged=("hot-core", "rise-case", "rise-winding"),
        because=(("ocp.behaviour", "not foldback"), ("rise-case", "no thermal stage")),
    ),
    Case(
        ("M-31.txt",),
        TWO_OUTPUT,
        "accepted",
        "two outputs, each also alone against the other; bars",
        bench=BENCH_2,
    ),
    Case(
        ("M-32.csv",),
        TWO_OUTPUT,
        "rejected",
        "the drive output moves with the logic output's load",
        bench=BENCH_2,
        fails=("drive-band",),
    ),
)


def readme() -> str:
    """The text of this folder's README.md."""
    rows = [
        f"| {' '.join(f'`{file}`' for file in case.files)} | {case.shows} | `{case.limits}` "
        f"| {f'`{case.bench}`' if case.bench else ''} | {case.verdict} |"
        for case in CASES
    ]
    return "\n".join(
        [
            "# Logs of the Tarnbeck Bench Works",
            "",
            "An invented workshop, invented products, invented units. `make_sample_logs.py` makes every file again,",
            "the same to the byte: from closed forms of loss, droop and heat, and from instruments with errors within",
            "their stated accuracy (`workshop/`). The limits and bench files named here stand in `limits/`.",
            "",
            "    acceptance judge sample_logs/A-17_steady.csv --limits limits/quillfen-adapter.yaml --out out",
            "    acceptance judge sample_logs/A-17_*.csv --limits limits/quillfen-adapter-full.yaml --out out",
            "",
            "| log | what it shows | limits | bench | verdict |",
            "|---|---|---|---|---|",
            *rows,
            "",
            "Products: A, a 24 V 2.5 A mains adapter that protects itself by hiccup; B, a 30 V 3 A bench supply with",
            "constant current limit; D, a 48 V to 12 V 8 A converter with foldback; M, a supply with two outputs,",
            "5 V 4 A and 12 V 1.5 A.",
            "",
        ]
    )


def make(folder: Path) -> list[Path]:
    """The files written into `folder`: every log, and the README.md."""
    folder.mkdir(parents=True, exist_ok=True)
    written = []
    for name, build in FILES.items():
        path = folder / name
        path.write_bytes(build().data)
        written.append(path)
    path = folder / "README.md"
    path.write_bytes(readme().encode())
    return [*written, path]


def main(arguments: Sequence[str] | None = None) -> None:
    """Write every file, into this folder or another."""
    parser = argparse.ArgumentParser(description="Make the sample logs again, the same to the byte.")
    parser.add_argument("--out", type=Path, default=HERE, help="folder to write into (default: this one)")
    for path in make(parser.parse_args(arguments).out):
        print(path)


if __name__ == "__main__":
    main()
