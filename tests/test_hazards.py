"""Which hazards a unit is taken to have."""

from __future__ import annotations

import math

import pytest
from hypothesis import given
from hypothesis import strategies as st

from acceptance.hazards import hazards_of, waiting_time
from acceptance.limitfile.model import Ratings

AC = {"supply": "ac", "voltage": "230 V", "range": ["207 V", "253 V"], "frequency": "50 Hz"}


def ratings(*, supply=None, outputs=None, **more) -> Ratings:
    """A 48 V d.c. converter to 12 V, 8 A, but for what is given."""
    return Ratings.model_validate(
        {
            "input": supply or {"supply": "dc", "voltage": "48 V", "range": ["36 V", "60 V"]},
            "outputs": outputs or {"main": {"voltage": "12 V", "current": "8 A"}},
            **more,
        }
    )


def names(plate: Ratings) -> set[str]:
    return {hazard.hazard for hazard in hazards_of(plate)}


# --- the waiting time -----------------------------------------------------------------------------------------------


def test_waiting_time_of_a_bulk_capacitor():
    """100 uF at 400 V through 100 kohm: 60 V after 19 s. Calculated."""
    assert waiting_time(100e-6, 400.0, 100e3) == pytest.approx(19.0, abs=0.05)


def test_waiting_time_of_the_plug():
    """230 V, 325 V at the peak, is down to 60 V after 1 s with a time constant of 0.592 s; 0.547 s at 264 V."""
    assert waiting_time(1e-6, 325.0, 0.592e6) == pytest.approx(1.0, abs=1e-3)
    assert waiting_time(1e-6, 264.0 * math.sqrt(2), 0.547e6) == pytest.approx(1.0, abs=1e-3)


@given(st.floats(1e-9, 1e-2), st.floats(60.001, 1e4), st.floats(1.0, 1e7))
def test_waiting_time_leaves_sixty_volts(capacitance, voltage, bleeder):
    """After it the exponential stands at 60 V: neither above nor for nothing."""
    wait = waiting_time(capacitance, voltage, bleeder)

    assert wait > 0
    assert voltage * math.exp(-wait / (bleeder * capacitance)) == pytest.approx(60.0, rel=1e-9)


@pytest.mark.parametrize("voltage", [0.0, 5.0, 59.9, 60.0])
def test_waiting_time_up_to_sixty_volts_is_none(voltage):
    """Nothing to wait for, and no negative time."""
    assert waiting_time(1e-3, voltage, 1e5) == 0.0


# --- the hazards ----------------------------------------------------------------------------------------------------


def test_hazards_of_a_low_voltage_converter():
    """48 V in, 12 V and 96 W out: what the ratings do not tell is taken to be there."""
    assert names(ratings()) == {"stored charge", "hot parts"}
    assert all(hazard.basis for hazard in hazards_of(ratings()))


def test_hazards_of_a_mains_unit():
    """Mains, with its voltage as the basis."""
    found = {hazard.hazard: hazard for hazard in hazards_of(ratings(supply=AC))}

    assert set(found) == {"mains", "stored charge", "hot parts"}
    assert "230 V" in found["mains"].basis


@pytest.mark.parametrize(
    ("supply", "is_mains"),
    [
        ({"supply": "dc", "voltage": "60 V"}, False),
        ({"supply": "dc", "voltage": "60.1 V"}, True),
        ({"supply": "dc", "voltage": "48 V", "range": ["36 V", "75 V"]}, True),  # the range counts, not the rating
        ({"supply": "dc", "voltage": "380 V"}, True),
        ({"supply": "ac", "voltage": "115 V"}, True),
    ],
)
def test_hazards_of_the_input(supply, is_mains):
    """An a.c. input, or d.c. that may exceed 60 V."""
    assert ("mains" in names(ratings(supply=supply))) is is_mains


@pytest.mark.parametrize(("voltage", "is_high"), [("60 V", False), ("60.5 V", True), ("400 V", True)])
@pytest.mark.parametrize("place", [0, 1])
def test_hazards_of_the_output_voltage(voltage, is_high, place):
    """Any output above 60 V, the first or the last."""
    outputs = [{"voltage": "5 V", "current": "1 A"}, {"voltage": "12 V", "current": "1 A"}]
    outputs[place] = {"voltage": voltage, "current": "0.1 A"}

    plate = ratings(outputs={"a": outputs[0], "b": outputs[1]})

    assert ("output above 60 V" in names(plate)) is is_high


@pytest.mark.parametrize(
    ("outputs", "is_high"),
    [
        ({"main": {"voltage": "24 V", "current": "10 A"}}, True),  # 240 VA exactly
        ({"main": {"voltage": "24 V", "current": "9.99 A"}}, False),
        ({"a": {"voltage": "12 V", "current": "15 A"}, "b": {"voltage": "5 V", "current": "12 A"}}, True),  # 240 in all
        ({"a": {"voltage": "12 V", "current": "15 A"}, "b": {"voltage": "5 V", "current": "11 A"}}, False),
    ],
)
def test_hazards_of_the_output_power(outputs, is_high):
    """240 VA and more, all outputs together."""
    assert ("high power output" in names(ratings(outputs=outputs))) is is_high


def test_hazards_of_a_known_capacitor_give_a_waiting_time():
    """Only where capacitance and bleeder are stated is there a time; else none, never zero."""
    charge = {"capacitance": "100 uF", "voltage": "400 V", "bleeder": "100 kohm"}

    known = next(h for h in hazards_of(ratings(supply=AC, stored_charge=charge)) if h.hazard == "stored charge")
    unknown = next(h for h in hazards_of(ratings(supply=AC)) if h.hazard == "stored charge")

    assert known.wait == pytest.approx(19.0, abs=0.05)
    assert all(part in known.basis for part in ("100 µF", "400 V", "100 kΩ"))
    assert unknown.wait is None


@given(st.floats(1, 1000), st.floats(0.1, 100), st.floats(1, 500), st.booleans())
def test_hazards_are_each_named_once(voltage, current, source, ac):
    """Whatever the ratings, stored charge and hot parts are among them, and none stands twice."""
    supply = {"supply": "ac" if ac else "dc", "voltage": f"{source:.3f} V"}
    outputs = {"main": {"voltage": f"{voltage:.3f} V", "current": f"{current:.3f} A"}}

    found = [hazard.hazard for hazard in hazards_of(ratings(supply=supply, outputs=outputs))]

    assert len(found) == len(set(found))
    assert {"stored charge", "hot parts"} <= set(found)
    assert ("mains" in found) == (ac or float(f"{source:.3f}") > 60)
