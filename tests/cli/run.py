"""The command as a user runs it: a process with its output, its errors and its exit status."""

from __future__ import annotations

import subprocess
import sys
from dataclasses import dataclass
from pathlib import Path

ROOT = Path(__file__).resolve().parents[2]


@dataclass(frozen=True)
class Ran:
    status: int
    out: str
    err: str


def acceptance(*arguments: str | Path, cwd: Path | None = None) -> Ran:
    """What one command line gave; warnings are errors there too."""
    command = [sys.executable, "-W", "error", "-m", "acceptance", *map(str, arguments)]
    done = subprocess.run(command, cwd=cwd or ROOT, capture_output=True, encoding="utf-8", timeout=120, check=False)
    assert "Traceback" not in done.stderr
    return Ran(done.returncode, done.stdout, done.stderr)
