"""Files to load, and a helper that writes and loads one."""

from __future__ import annotations

from collections.abc import Callable
from pathlib import Path

import pytest

from acceptance.errors import Fault, LimitsError
from acceptance.limitfile.load import load_limits

DATA = Path(__file__).parent / "data"


@pytest.fixture(scope="session")
def data() -> Path:
    """The folder of the files that are right."""
    return DATA


@pytest.fixture(scope="session")
def good_text() -> str:
    """A limits file with every characteristic, its bench's part included."""
    return (DATA / "good.yaml").read_text(encoding="utf-8")


@pytest.fixture
def faults_of(tmp_path: Path) -> Callable[..., tuple[Fault, ...]]:
    """A function: content of a limits file (and of a bench file) -> its faults, none where it loads."""

    def load(content: str | bytes, bench: str | None = None) -> tuple[Fault, ...]:
        path = tmp_path / "limits.yaml"
        path.write_bytes(content if isinstance(content, bytes) else content.encode())
        bench_path = None
        if bench is not None:
            bench_path = tmp_path / "bench.yaml"
            bench_path.write_text(bench, encoding="utf-8")
        try:
            load_limits(path, bench_path)
        except LimitsError as error:
            return error.faults
        return ()

    return load
