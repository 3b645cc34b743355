"""The foldback limiter of the textbook's pass regulator, in closed form.

Sense resistor R_s in the output, a divider that hands the fraction k of V + I R_s to the base of a transistor whose
emitter is at V, threshold V_BE: I_lim(V) = (V_BE + (1 - k) V)/(k R_s), so that I_sc = V_BE/(k R_s) and
I_k/I_sc = 1 + (1 - k) V_o/V_BE (common textbook circuit, from memory; the numbers below follow from these alone).
A textbook gives 2 to 3 for that ratio (from memory).
"""

from __future__ import annotations

import numpy as np
import pandas as pd
import pytest

from acceptance.checks.overcurrent import check_overcurrent
from acceptance.judge import find_points
from acceptance.points.propagation import expanded
from tests.checks.built import limits_from
from tests.overcurrent_logs import ACCURATE, log_of
from tests.published.digits import printed

OUTPUT, THRESHOLD, KNEE, SHORT = 12.0, 0.65, 3.0, 1.0  # V, V, A, A
K, SENSE = "0.891667", "0.728972"  # [1], [ohm]
SOURCE = 18.0  # V

RATED_2_8 = """
acceptance: 1
product: {name: "Pass rail 12", revision: A, protection_class: I}
ratings:
  input: {supply: dc, voltage: 18 V, range: [16 V, 20 V]}
  outputs:
    main: {voltage: 12 V, current: 2.8 A}
"""
ASKED = """
  overcurrent:
    - {name: ocp, at: {input: 18 V}, behaviour: foldback, onset: [100 %, 115 %], short_circuit: {max: 40 %}}
"""


def divider() -> tuple[float, float]:
    """k and R_s that give knee and short-circuit current."""
    k = 1 - (KNEE / SHORT - 1) * THRESHOLD / OUTPUT
    return k, THRESHOLD / (k * SHORT)


def limit(volts: float) -> float:
    """Current that the limiter lets through. [A]"""
    k, sense = divider()
    return (THRESHOLD + (1 - k) * volts) / (k * sense)


def swept() -> dict[str, list[float]]:
    """Resistors from light load into a short, each at the limiter's or the regulator's current."""
    found: dict[str, list[float]] = {"output_voltage main": [], "output_current main": [], "load_setting main": []}
    slope = (KNEE - SHORT) / OUTPUT
    for load in (24.0, 12.0, 6.0, 4.3, 4.1, 4.02, 3.98, 3.9, 3.8, 3.6, 3.3, 3.0, 2.5, 2.0, 1.5, 1.0, 0.6, 0.01):
        volts = OUTPUT if OUTPUT / load <= KNEE else load * SHORT / (1 - slope * load)
        found["output_voltage main"].append(volts)
        found["output_current main"].append(volts / load)
        found["load_setting main"].append(load)
    return found


def test_foldback_divider_reproduces_the_textbook_circuit():
    k, sense = divider()

    assert k == printed(K)
    assert sense == printed(SENSE)
    assert limit(OUTPUT) == pytest.approx(KNEE)
    assert limit(0.0) == pytest.approx(SHORT)


def test_foldback_sweep_reproduces_knee_and_short_of_the_textbook_circuit():
    """The check names the limiter, and finds what the formula says at the droop and into the short."""
    table = pd.DataFrame(swept())
    table["input_voltage"] = SOURCE
    table["load_mode main"] = pd.Categorical(["CR"] * len(table))
    limits = limits_from(ASKED, head=RATED_2_8, bench=ACCURATE)
    points = find_points(log_of(table), limits)

    outcomes = check_overcurrent(limits.requirements, points).outcomes
    behaviour, onset, short = (outcome.candidates[0] for outcome in outcomes)

    truth = limit(OUTPUT * 0.95)
    assert behaviour.text == "foldback"
    assert onset.estimate is not None
    assert abs(onset.estimate.nominal - truth) <= expanded(onset.estimate.value, 0.95).expanded < 0.15
    assert short.estimate is not None
    assert short.estimate.nominal == pytest.approx(SHORT, rel=2e-3)  # the last resistor is no perfect short


def test_foldback_dissipation_reproduces_the_textbook_circuit():
    """18 W into the short, where a constant current burns 54 W, and the most, 24 W, at 6 V and 2 A."""
    volts = np.linspace(0, OUTPUT, 1201)
    watts = (SOURCE - volts) * np.array([limit(v) for v in volts])

    assert watts[0] == printed("18")
    assert printed("54") == SOURCE * KNEE
    assert watts.max() == printed("24")
    assert volts[watts.argmax()] == pytest.approx(6.0)
    assert limit(6.0) == pytest.approx(2.0)
