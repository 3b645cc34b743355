"""What the report's tests share."""

from __future__ import annotations

import importlib.util
import sys
from pathlib import Path
from types import ModuleType

# records.py stands beside the tests and belongs to no package
_PATH = Path(__file__).with_name("records.py")


def _load() -> ModuleType:
    spec = importlib.util.spec_from_file_location("report_records", _PATH)
    assert spec is not None
    assert spec.loader is not None
    module = importlib.util.module_from_spec(spec)
    sys.modules["report_records"] = module
    spec.loader.exec_module(module)
    return module


_load()
