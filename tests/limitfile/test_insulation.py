"""An insulation class that nobody knows is a fault of the limits file, with its place."""

from __future__ import annotations

from pathlib import Path

import pytest

from acceptance.errors import LimitsError
from acceptance.limitfile.insulation import CLASSES, insulation_class
from acceptance.limitfile.load import load_limits

TEXT = """acceptance: 1
product: {name: "Check rail 12"}
ratings:
  input: {supply: dc, voltage: 48 V}
  outputs:
    main: {voltage: 12 V, current: 4 A}
limits:
  temperature:
    - {name: hot, probe: winding, at: {load: 100 %, input: 48 V}, class: CLASS}
"""


def loaded(folder: Path, written: str, more: str = "") -> None:
    path = folder / "limits.yaml"
    path.write_text(TEXT.replace("CLASS", written + more), encoding="utf-8")
    load_limits(path)


@pytest.mark.parametrize("written", ["B", "b", "130", "class F", "200"])
def test_known_class_is_taken(tmp_path: Path, written: str) -> None:
    loaded(tmp_path, written)


@pytest.mark.parametrize("written", ["C", "140", "B2", "thermal"])
def test_unknown_class_is_a_fault_with_its_place(tmp_path: Path, written: str) -> None:
    with pytest.raises(LimitsError) as caught:
        loaded(tmp_path, written)

    (fault,) = caught.value.faults
    assert (fault.line, fault.column) == (9, TEXT.splitlines()[8].index("CLASS") + 1)
    assert f'"{written}" is no insulation class' in str(caught.value)
    assert "A (105 °C), E (120 °C), B (130 °C), F (155 °C), H (180 °C), 200" in str(caught.value)


def test_winding_of_a_temperature_needs_its_material(tmp_path: Path) -> None:
    with pytest.raises(LimitsError, match="the winding's material is not given"):
        loaded(tmp_path, "B", ", method: resistance")

    loaded(tmp_path, "B", ", method: resistance, material: copper")


def test_every_class_is_known_by_letter_and_temperature() -> None:
    for name, one in CLASSES.items():
        assert insulation_class(name) is insulation_class(f"{one.temperature:g}") is one
        assert one.winding < one.temperature
