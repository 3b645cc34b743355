"""The log that the ratios are measured on: six loads over and over, a row every 100 ms."""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pandas as pd


def write(path: Path, rows: int, seed: int = 1) -> None:
    """Write a log of so many rows."""
    rng = np.random.default_rng(seed)
    repeats = max(6, min(36, rows // 50))
    setting = np.repeat(np.resize([0.0, 0.3, 0.75, 1.5, 2.25, 3.0], repeats), int(np.ceil(rows / repeats)))[:rows]
    t = np.arange(rows)
    i = setting + rng.normal(0, 2e-3, rows)
    v = 12.03 - 0.02 * i + rng.normal(0, 1.5e-3, rows)
    p_in = v * i + 0.15 + 0.6 * i + 0.15 * i**2 + rng.normal(0, 2e-3, rows)
    v_in = 230 + rng.normal(0, 0.2, rows)
    ambient = 23 + 0.3 * np.sin(t / 5e4) + rng.normal(0, 0.02, rows)
    table = pd.DataFrame(
        {
            "timestamp": np.datetime64("2026-01-05T08:00:00.000", "ms") + t * np.timedelta64(100, "ms"),
            "i_set": setting,
            "v_set": 12.0,
            "v_in": v_in.round(2),
            "i_in": (p_in / v_in / 0.6).round(4),
            "p_in": p_in.round(3),
            "v_out": v.round(4),
            "i_out": i.round(4),
            "p_out": (v * i).round(3),
            "t_amb": ambient.round(2),
            "t_case": (ambient + 18 * (1 - np.exp(-t / (rows / 8))) + rng.normal(0, 0.03, rows)).round(2),
            "t_hot": (ambient + 31 * (1 - np.exp(-t / (rows / 9))) + rng.normal(0, 0.03, rows)).round(2),
            "ripple_mv": (22 + 4 * i + rng.normal(0, 0.5, rows)).round(2),
        }
    )
    table.to_csv(path, index=False, date_format="%Y-%m-%dT%H:%M:%S.%f")
