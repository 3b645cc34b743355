"""Fixtures: a log written with known contents, and read back."""

from __future__ import annotations

import io
from collections.abc import Callable
from pathlib import Path
from typing import Any

import openpyxl
import pytest

from acceptance.bench.log import BenchLog
from acceptance.bench.read import read_logs

Reader = Callable[..., BenchLog]


@pytest.fixture
def read_text_log(tmp_path: Path) -> Reader:
    """Writes a text (or bytes) under a name, and reads it."""

    def read(text: str | bytes, name: str = "A-17.csv", encoding: str = "utf-8", **options: Any) -> BenchLog:
        path = tmp_path / name
        path.write_bytes(text if isinstance(text, bytes) else text.encode(encoding))
        return read_logs([path], **options)

    return read


@pytest.fixture
def read_book(tmp_path: Path) -> Reader:
    """Lets a function fill a new workbook, and reads it."""

    def read(fill: Callable[[openpyxl.Workbook], None], name: str = "A-17.xlsx", **options: Any) -> BenchLog:
        book = openpyxl.Workbook()
        fill(book)
        stream = io.BytesIO()
        book.save(stream)
        path = tmp_path / name
        path.write_bytes(stream.getvalue())
        return read_logs([path], **options)

    return read
