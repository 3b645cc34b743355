"""How long the commands take, as ratios against a floor in the same run.

    python tests/benchmarks/ratios.py [--runs 9] [--only judge,help,check,workbook]

Each pair of processes runs in turn, whole and cold; the figure is the median of the ratios. Absolute times drift
with the machine and are printed only to show what was compared.
"""

from __future__ import annotations

import argparse
import os
import statistics
import subprocess
import sys
import tempfile
import time
from collections.abc import Sequence
from dataclasses import dataclass
from pathlib import Path

import make_log

HERE = Path(__file__).resolve().parent
PYTHON = sys.executable
ACCEPTANCE = [PYTHON, "-m", "acceptance"]
BARE_WORKBOOK = (
    "import sys, openpyxl\n"
    "book = openpyxl.load_workbook(sys.argv[1], read_only=True, data_only=True)\n"
    "for sheet in book.worksheets:\n"
    "    for row in sheet.iter_rows(values_only=True):\n"
    "        pass\n"
)
READ_WORKBOOK = (
    "import sys, pathlib\n"
    "from acceptance.bench.read import read_logs\n"
    "read_logs([pathlib.Path(sys.argv[1])], outputs=['main'])\n"
)


@dataclass(frozen=True)
class Race:
    """One command against its floor."""

    name: str
    ours: Sequence[str]
    floor: Sequence[str]
    at_most: float


def races(folder: Path, only: set[str]) -> list[Race]:
    log, book = folder / "B.csv", folder / "W.xlsx"
    make_log.write(log, 2000)
    limits = str(HERE / "limits.yaml")
    click = [PYTHON, "-c", "import click"]
    judge = [*ACCEPTANCE, "judge", str(log), "--limits", limits, "--out", str(folder)]
    found = {
        "judge": Race(
            "judge, 2 000 rows, against by_hand.py",
            judge,
            [PYTHON, str(HERE / "by_hand.py"), str(log), str(folder / "t.pdf")],
            2.5,
        ),
        "help": Race("--help, against import click", [*ACCEPTANCE, "--help"], click, 3.0),
        "check": Race("limits check, against import click", [*ACCEPTANCE, "limits", "check", limits], click, 8.0),
    }
    if "workbook" in only:
        write_book(book, 100_000)
        ours, floor = [PYTHON, "-c", READ_WORKBOOK, str(book)], [PYTHON, "-c", BARE_WORKBOOK, str(book)]
        found["workbook"] = Race("workbook, 100 000 rows, against bare openpyxl", ours, floor, 1.3)
    return [race for name, race in found.items() if name in only]


def write_book(path: Path, rows: int) -> None:
    """A workbook of so many rows, as a logger's export would be."""
    import openpyxl
    import pandas as pd

    text = path.with_suffix(".csv")
    make_log.write(text, rows)
    table = pd.read_csv(text, parse_dates=["timestamp"])
    book = openpyxl.Workbook(write_only=True)
    sheet = book.create_sheet("steady")
    sheet.append(list(table.columns))
    for row in table.itertuples(index=False):
        sheet.append([row[0].to_pydatetime(), *row[1:]])
    book.save(path)


def seconds(command: Sequence[str], folder: Path) -> float:
    # compiled modules are kept, as in any installed package, but not beside the sources
    environment = {key: value for key, value in os.environ.items() if key != "PYTHONDONTWRITEBYTECODE"}
    environment["PYTHONPYCACHEPREFIX"] = str(folder / "compiled")
    start = time.perf_counter()
    done = subprocess.run(command, capture_output=True, check=False, env=environment)
    spent = time.perf_counter() - start
    if done.returncode not in (0, 1, 3) or b"Error" in done.stderr:
        sys.exit(done.stderr.decode())
    return spent


def main() -> int:
    parser = argparse.ArgumentParser(description=__doc__, formatter_class=argparse.RawDescriptionHelpFormatter)
    parser.add_argument("--runs", type=int, default=9)
    parser.add_argument("--only", default="judge,help,check,workbook")
    asked = parser.parse_args()
    worst = 0
    with tempfile.TemporaryDirectory() as name:
        for race in races(Path(name), set(asked.only.split(","))):
            runs = min(asked.runs, 3) if "workbook" in race.name else asked.runs
            folder = Path(name)
            seconds(race.floor, folder), seconds(race.ours, folder)  # caches warm
            pairs = [(seconds(race.floor, folder), seconds(race.ours, folder)) for _ in range(runs)]
            ratio = statistics.median(ours / floor for floor, ours in pairs)
            floor, ours = (statistics.median(side) for side in zip(*pairs, strict=True))
            said = "holds" if ratio <= race.at_most else "DOES NOT HOLD"
            print(f"{race.name}: {ratio:.2f} (at most {race.at_most}; {said}; {ours:.3f} s against {floor:.3f} s)")
            worst |= ratio > race.at_most
    return worst


if __name__ == "__main__":
    sys.exit(main())
