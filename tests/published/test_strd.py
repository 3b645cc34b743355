"""Mean, deviation and autocorrelation of samples against NIST's Statistical Reference Datasets."""

from __future__ import annotations

import math
from pathlib import Path
from typing import Any

import numpy as np
import pytest
import yaml

from acceptance.points.type_a import autocorrelation, type_a
from tests.published.digits import printed

SETS: dict[str, dict[str, Any]] = yaml.safe_load(
    (Path(__file__).parent / "strd_univariate.yaml").read_text(encoding="utf-8")
)


def pi_digits(count: int) -> list[int]:
    """The first digits of pi, 3 included, by Machin's formula in whole numbers."""
    unit = 10 ** (count + 10)

    def arctan_of_inverse(x: int) -> int:
        total = term = unit // x
        n, sign = 3, -1
        while term:
            term //= x * x
            total += sign * (term // n)
            n, sign = n + 2, -sign
        return total

    pi = 4 * (4 * arctan_of_inverse(5) - arctan_of_inverse(239))
    digits = []
    for _ in range(count):  # in pieces, since Python refuses to print a number of so many digits at once
        digit, rest = divmod(pi, unit)
        digits.append(int(digit))
        pi = 10 * rest
    return digits


def alternating(first: float, low: float, high: float) -> list[float]:
    """The sets NumAcc2 to NumAcc4: one reading, and 500 pairs about it."""
    return [first, *([low, high] * 500)]


def pi_digits_as_certified() -> list[int]:
    """The set PiDigits: the first 5000 digits of pi, but for the 957th, an 8 that the set has as a 3.

    The certified values are those of the set: its sum is 22674, that of the true digits 22679. Seen in a copy of the
    set among the tests of a public statistics library (nist_test.go).
    """
    digits = pi_digits(5000)
    assert digits[956] == 8
    digits[956] = 3
    return digits


BUILT = {
    "NumAcc2": alternating(1.2, 1.1, 1.3),
    "NumAcc3": alternating(1000000.2, 1000000.1, 1000000.3),
    "NumAcc4": alternating(10000000.2, 10000000.1, 10000000.3),
    "PiDigits": pi_digits_as_certified(),
}


def readings_of(name: str) -> np.ndarray:
    readings = np.array(SETS[name].get("readings") or BUILT[name], dtype=float)
    assert readings.size == SETS[name]["n"]
    return readings


def digits_agreeing(value: float, certified: str) -> float:
    """How many digits of a certified value are met, 15 at most."""
    truth = float(certified)
    error = abs(value - truth) / abs(truth)
    return 15.0 if error < 1e-15 else -math.log10(error)


@pytest.mark.parametrize("name", SETS)
def test_type_a_mean_reproduces_strd_univariate(name):
    """The mean to 14 digits, which is what the 15 digits certified allow."""
    assert digits_agreeing(type_a(readings_of(name)).mean, SETS[name]["mean"]) >= 14


@pytest.mark.parametrize("name", SETS)
def test_type_a_deviation_reproduces_strd_univariate(name):
    """The deviation to the digits that double precision can give; a one-pass formula has none of NumAcc4's."""
    assert digits_agreeing(type_a(readings_of(name)).deviation, SETS[name]["deviation"]) >= SETS[name]["digits"]


@pytest.mark.parametrize("name", SETS)
@pytest.mark.parametrize("lags", [1, 40, None], ids=["by itself", "of forty", "of all"])
def test_autocorrelation_reproduces_strd_univariate(name, lags):
    """The first coefficient, by the sum and by the transform alike."""
    r = autocorrelation(readings_of(name), lags)

    # the deviation's digits, and those that a small coefficient lacks against the one that it is a share of
    allowed = 10.0 ** -min(SETS[name]["digits"], 12)
    assert r[0] == pytest.approx(1.0, abs=1e-12)
    assert r[1] == pytest.approx(float(SETS[name]["lag1"]), rel=0, abs=allowed)


def test_autocorrelation_reproduces_e_handbook_1_4_2_6():
    """NIST/SEMATECH e-Handbook, filter transmittance: 0.9379892, far outside the band of 0.2771808 for white noise."""
    filter_data = readings_of("Mavro")  # the handbook's data are this set

    r = autocorrelation(filter_data, 1)[1]

    assert r == printed("0.9379892")
    # printed with the normal quantile 1.959964 over sqrt(n)
    assert 1.959964 / math.sqrt(filter_data.size) == printed("0.2771808", digits=1)


@pytest.mark.parametrize("name", ["Mavro", "Michelso"])
def test_type_a_does_not_take_strd_drift_for_independent_readings(name):
    """Sets that wander tell far less about their mean than s / sqrt(n) says."""
    told = type_a(readings_of(name))

    naive = told.deviation / math.sqrt(told.readings)
    assert told.standard_uncertainty > 1.5 * naive
    assert told.effective_readings < told.readings / 2
