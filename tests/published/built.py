"""Limits, logs and points built by hand, for tests that know the truth."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from pathlib import Path

import numpy as np
import pandas as pd

from acceptance.bench.log import BenchLog
from acceptance.limitfile.limits import Limits
from acceptance.limitfile.load import load_limits
from acceptance.points.dwells import Dwell
from acceptance.points.point import Points, measure_points

BAND = "output_voltage: [{name: band, at: {load: any, input: any}, within: 10 %}]"


def limits_of(
    folder: Path,
    *,
    instruments: str = "{}",
    leads: str = "{}",
    requirements: str = BAND,
    outputs: str = "{main: {voltage: 12 V, current: 10 A}}",
    rule: str = "guarded",
) -> Limits:
    """A limits file of a 48 V d.c. converter, written and loaded; the parts are YAML."""
    path = folder / "built.yaml"
    path.write_text(
        f"""acceptance: 1
product: {{name: "Built to be tested"}}
ratings:
  input: {{supply: dc, voltage: 48 V, range: [36 V, 60 V]}}
  outputs: {outputs}
decision: {{rule: {rule}, confidence: 95 %}}
limits:
  {requirements}
instruments: {instruments}
lead_resistance: {leads}
""",
        encoding="utf-8",
    )
    return load_limits(path)


def points_of(limits: Limits, dwells: Sequence[Mapping[str, Sequence[float]]]) -> Points:
    """Steady points of a log made of these dwells, each a mapping of channel to its samples."""
    lengths = [len(next(iter(dwell.values()))) for dwell in dwells]
    edges = np.concatenate([[0], np.cumsum(lengths)])
    n = int(edges[-1])
    columns = {key: np.concatenate([np.asarray(dwell[key], dtype=float) for dwell in dwells]) for key in dwells[0]}
    samples = pd.DataFrame(columns)
    samples["stage"] = pd.Categorical(["steady"] * n)
    samples["table"] = 0
    samples["line"] = np.arange(n) + 2
    log = BenchLog(serial="B-1", samples=samples, channels=(), evidence=(), tables=("B-1.csv",))
    spans = zip(edges[:-1].tolist(), edges[1:].tolist(), strict=True)
    made = [Dwell(a, b, a, "steady", 0, "load setting", None) for a, b in spans]
    return measure_points(log, made, limits)
