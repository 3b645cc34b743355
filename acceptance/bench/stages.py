"""Stage and serial from the names of files and sheets."""

from __future__ import annotations

import re

__all__ = ["STAGES", "split_name", "stage_of_sheet"]

STAGES = ("steady", "overcurrent", "thermal", "cold", "cooling")

_STAGED = re.compile(
    rf"(?P<serial>.*?)(?:^|[_\-. ]+)(?P<stage>{'|'.join(STAGES)})(?:[_\-. ]+\d{{1,3}})?", re.IGNORECASE
)


def split_name(stem: str) -> tuple[str, str]:
    """Serial and stage of a file's stem, the stage "" where the name tells none.

    "A-17_overcurrent" is unit A-17, overcurrent, and so is "A-17_overcurrent_2", its second run.
    """
    match = _STAGED.fullmatch(stem.strip())
    if match is None:
        return stem.strip(), ""
    return match["serial"].strip(), match["stage"].lower()


def stage_of_sheet(title: str) -> str:
    """The stage a sheet's name tells, "" for none: "overcurrent", "Thermal 2", "A-17 cold"."""
    return split_name(title)[1]
