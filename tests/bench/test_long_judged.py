"""A unit judged by logs that were read in pieces and packed has the record that it has otherwise."""

from __future__ import annotations

import dataclasses
from datetime import UTC, datetime
from pathlib import Path

import numpy as np
import pandas as pd
import pytest

from acceptance.bench import long, read, threads
from acceptance.judge import judge_unit
from acceptance.limitfile.load import load_limits
from acceptance.record import Record

ROOT = Path(__file__).resolve().parents[2]
CASES = [
    ("quillfen-adapter.yaml", ["A-17_steady.csv"]),
    ("quillfen-adapter.yaml", [f"A-17_{s}.csv" for s in ("cold", "cooling", "overcurrent", "steady", "thermal")]),
    ("quillfen-adapter.yaml", ["A-18.csv"]),
]
JUDGED_AT = datetime(2026, 5, 4, tzinfo=UTC)


def judged(paths, limits) -> Record:
    return judge_unit(paths, limits, judged_at=JUDGED_AT)


def in_pieces(monkeypatch, paths, limits) -> tuple[Record, bool]:
    """The record, and whether any log could be read in pieces."""
    was_read = []

    def noted(*arguments, **options):
        found = long.read_long(*arguments, **{**options, "piece": 3000})
        was_read.append(found is not None)
        return found

    monkeypatch.setattr(read, "LONG", 0)
    monkeypatch.setattr(read, "read_long", noted)
    monkeypatch.setattr(threads, "MANY", 0)
    record = judged(paths, limits)
    monkeypatch.undo()
    return record, any(was_read)


@pytest.mark.parametrize(
    ("limits_name", "names"), CASES, ids=lambda value: value if isinstance(value, str) else value[0]
)
def test_a_sample_log_in_pieces_has_the_same_record(limits_name, names, monkeypatch):
    """To the last digit, and with every doubt."""
    limits = load_limits(ROOT / "limits" / limits_name, None)
    paths = [ROOT / "sample_logs" / name for name in names]

    record, was_read_so = in_pieces(monkeypatch, paths, limits)

    assert was_read_so
    assert dataclasses.asdict(record) == dataclasses.asdict(judged(paths, limits))


LIMITS = """
acceptance: 1
product: {name: "Bench rail 12", revision: A, protection_class: II}
ratings:
  input: {supply: ac, voltage: 230 V, range: [207 V, 253 V], frequency: 50 Hz}
  outputs: {main: {voltage: 12 V, current: 3 A}}
log: {columns: {load_setting: "i_set (A)"}}
instruments:
  input_power: {device: P1, accuracy: "0.1 % reading + 0.02 W"}
  output_voltage: {device: M1, accuracy: "0.02 % reading + 2 mV"}
  output_current: {device: L1, accuracy: "0.05 % reading + 1 mA"}
decision: {rule: guarded, confidence: 95 %}
limits:
  efficiency: [{name: eff, at: {load: any, input: any}, min: 80 %}]
  load_regulation: [{name: loadreg, from: 0 %, to: 100 %, at: {input: 230 V}, max: 2 %, relative_to: full load}]
"""


def faulty_log(rows: int, fault: str) -> pd.DataFrame:
    """Three loads in turn, three digits a reading, and one thing wrong."""
    rng = np.random.default_rng(3)
    setting = np.repeat(np.resize([0.0, 1.5, 3.0], 6), rows // 6)
    rows = setting.size
    current = setting + rng.normal(0, 2e-3, rows)
    voltage = 12.03 - 0.02 * current + rng.normal(0, 1.5e-3, rows)
    power = voltage * current + 0.15 + 0.6 * current + 0.15 * current**2 + rng.normal(0, 2e-3, rows)
    table = pd.DataFrame({
        "time (s)": (np.arange(rows) / 10).round(1), "i_set (A)": setting,
        "Vin (V)": (230 + rng.normal(0, 0.2, rows)).round(2), "Pin (W)": power.round(3),
        "Vout (V)": voltage.round(4), "Iout (A)": current.round(4),
    })  # fmt: skip
    middle = rows // 2
    if fault == "gap":
        table.loc[middle:, "time (s)"] = (table.loc[middle:, "time (s)"] + 300).round(1)
    elif fault == "back":
        table.loc[middle:, "time (s)"] = (table.loc[middle:, "time (s)"] - 300).round(1)
    elif fault == "repeated":
        table.loc[middle : middle + 2, "time (s)"] = table.loc[middle, "time (s)"]
    elif fault == "dropout":
        table.loc[middle + 40, "Vout (V)"] = 0.0
    elif fault == "frozen":
        table.loc[middle + 40 : middle + 400, "Pin (W)"] = table.loc[middle + 40, "Pin (W)"]
    elif fault == "clipped":
        table["Vout (V)"] = table["Vout (V)"].clip(upper=12.0295)
    elif fault == "missing":
        table.loc[middle + 40 : middle + 60, "Iout (A)"] = np.nan
    elif fault == "swapped":
        table = table.rename(columns={"Vout (V)": "Iout (A)", "Iout (A)": "Vout (V)"})
    elif fault == "gains":
        table["Pin (W)"] = (table["Pin (W)"] / 2).round(3)
    elif fault == "no setting":
        table["i_set (A)"] = 0.0
    return table


@pytest.mark.parametrize(
    "fault",
    ["none", "gap", "back", "repeated", "dropout", "frozen", "clipped", "missing", "swapped", "gains", "no setting"],
)
def test_a_faulty_log_in_pieces_has_the_same_record(fault, tmp_path, monkeypatch):
    """The health checks see in packed columns what they see in plain ones."""
    (tmp_path / "limits.yaml").write_text(LIMITS)
    path = tmp_path / "A-17.csv"
    faulty_log(6000, fault).to_csv(path, index=False)
    limits = load_limits(tmp_path / "limits.yaml", None)

    record, was_read_so = in_pieces(monkeypatch, [path], limits)
    plain = judged([path], limits)

    assert was_read_so
    assert dataclasses.asdict(record) == dataclasses.asdict(plain)
    told = {"gap": "gap", "back": "backward time", "repeated": "repeated time", "dropout": "unsteady"}
    told |= {"missing": "missing", "swapped": "swapped", "gains": "swapped"}
    if fault in told:
        assert told[fault] in {doubt.kind for doubt in plain.health}
