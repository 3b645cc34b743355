"""How long the commands take, as ratios against a floor in the same run.

    python tests/benchmarks/ratios.py [--runs 9] [--only judge,help,check,workbook]
    python tests/benchmarks/ratios.py --only long [--rows 10000000] [--log FILE]

Each pair of processes runs in turn, whole and cold; the figure is the median of the ratios. Absolute times drift
with the machine and are printed only to show what was compared. `long` compares the largest memory as well, on a log
of ten million rows (1 GB) that it writes first, or on the one given, which must be one of make_log.py.
"""

from __future__ import annotations

import argparse
import math
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
    memory_at_most: float = math.inf  # the same of the largest memory


@dataclass(frozen=True)
class Spent:
    """What one process took."""

    seconds: float
    megabytes: float  # the most it had at a time


def long_race(folder: Path, rows: int, given: Path | None) -> Race:
    """A log that does not fit where the others do."""
    log = given or folder / "L.csv"
    if given is None:
        make_log.write(log, rows)
    return Race(
        f"judge, {log.stat().st_size / 1e6:.0f} MB, against by_hand.py",
        [*ACCEPTANCE, "judge", str(log), "--limits", str(HERE / "limits.yaml"), "--out", str(folder)],
        [PYTHON, str(HERE / "by_hand.py"), str(log), str(folder / "t.pdf")],
        1.2,
        0.6,
    )


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


def spent(command: Sequence[str], folder: Path) -> Spent:
    """Run a command, and tell what it took."""
    # compiled modules are kept, as in any installed package, but not beside the sources
    environment = {key: value for key, value in os.environ.items() if key != "PYTHONDONTWRITEBYTECODE"}
    environment["PYTHONPYCACHEPREFIX"] = str(folder / "compiled")
    with (folder / "said").open("w+b") as said:
        start = time.perf_counter()
        process = subprocess.Popen(command, stdout=subprocess.DEVNULL, stderr=said, env=environment)
        _, status, used = os.wait4(process.pid, 0)
        seconds = time.perf_counter() - start
        process.returncode = os.waitstatus_to_exitcode(status)
        said.seek(0)
        error = said.read()
    if process.returncode not in (0, 1, 3) or b"Error" in error:
        sys.exit(error.decode())
    return Spent(seconds, used.ru_maxrss / 1024)


def judged(race: Race, runs: int, folder: Path) -> bool:
    """Run a race, print it, and tell whether it holds."""
    spent(race.floor, folder), spent(race.ours, folder)  # caches warm
    pairs = [(spent(race.floor, folder), spent(race.ours, folder)) for _ in range(runs)]
    ratio = statistics.median(ours.seconds / floor.seconds for floor, ours in pairs)
    floor, ours = (statistics.median(one.seconds for one in side) for side in zip(*pairs, strict=True))
    holds = ratio <= race.at_most
    said = "holds" if holds else "DOES NOT HOLD"
    print(f"{race.name}: {ratio:.2f} (at most {race.at_most}; {said}; {ours:.3f} s against {floor:.3f} s)")
    if race.memory_at_most < math.inf:
        floor, ours = (max(one.megabytes for one in side) for side in zip(*pairs, strict=True))
        holds = holds and ours / floor <= race.memory_at_most
        said = "holds" if ours / floor <= race.memory_at_most else "DOES NOT HOLD"
        limit = f"at most {race.memory_at_most}; {said}"
        print(f"  largest memory: {ours / floor:.2f} ({limit}; {ours:.0f} MB against {floor:.0f} MB)")
    return holds


def main() -> int:
    parser = argparse.ArgumentParser(description=__doc__, formatter_class=argparse.RawDescriptionHelpFormatter)
    parser.add_argument("--runs", type=int, default=9)
    parser.add_argument("--only", default="judge,help,check,workbook")
    parser.add_argument("--rows", type=int, default=10_000_000)
    parser.add_argument("--log", type=Path)
    asked = parser.parse_args()
    only = set(asked.only.split(","))
    worst = 0
    with tempfile.TemporaryDirectory() as name:
        folder = Path(name)
        found = races(folder, only)
        if "long" in only:
            found.append(long_race(folder, asked.rows, asked.log))
        for race in found:
            is_slow = "workbook" in race.name or race.memory_at_most < math.inf
            worst |= not judged(race, min(asked.runs, 3) if is_slow else asked.runs, folder)
    return worst


if __name__ == "__main__":
    sys.exit(main())
