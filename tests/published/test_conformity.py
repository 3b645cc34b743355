"""Probability of conformity and its risks against JCGM 106:2012, ILAC-G8:09/2019 and printed tables of risk."""

from __future__ import annotations

import math

import numpy as np
import pytest
from scipy.integrate import quad
from scipy.special import ndtr, ndtri

from acceptance.decision import conformity_probability, margin, meets, required_probability, verdict_of
from acceptance.limitfile.model import Decision
from acceptance.points.propagation import coverage_factor
from tests.published.digits import printed


def decision(rule: str, confidence: str = "95 %") -> Decision:
    return Decision.model_validate({"rule": rule, "confidence": confidence})


# --- JCGM 106 -------------------------------------------------------------------------------------------------------


@pytest.mark.parametrize(
    ("value", "u", "low", "high", "p"),
    [
        # worked examples of 7.3 and 7.4, values from memory: breakdown of a diode [V], burst strength [kPa], viscosity
        pytest.param(-5.47, 0.05, None, -5.40, "0.92", id="upper limit"),
        pytest.param(509.7, 8.6, 490.0, None, "0.99", id="lower limit"),
        pytest.param(13.6, 1.8, 12.5, 16.3, "0.66", id="two-sided"),
    ],
)
def test_conformity_probability_reproduces_jcgm_106_7(value, u, low, high, p):
    """Measured value, u and limits give the probability printed."""
    assert conformity_probability(value, u, low=low, high=high) == printed(p)


@pytest.mark.parametrize(
    ("p", "z"), [("0.80", "0.84"), ("0.90", "1.28"), ("0.95", "1.64"), ("0.99", "2.33"), ("0.999", "3.09")]
)
def test_conformity_probability_reproduces_jcgm_106_table_1(p, z):
    """z standard uncertainties inside a single limit conform with p. Values from memory."""
    below, above = (float(z) + side * 0.005 for side in (-1, 1))  # z is rounded, and p is what it was formed from

    assert conformity_probability(-below, 1.0, low=None, high=0.0) < float(p) + 1e-3 * (1 - float(p))
    assert conformity_probability(-above, 1.0, low=None, high=0.0) > float(p)
    assert conformity_probability(above, 1.0, low=0.0, high=None) > float(p)


def risks(*, mean: float, sd: float, u: float, limits: tuple[float, float], accept: tuple[float, float]):
    """Share conforming, false accepts and false rejects of a process measured with u.

    By symmetry of the normal, a truth x reads inside the acceptance limits with the probability that a reading x
    speaks for a truth inside them.
    """

    def density(x: float) -> float:
        return math.exp(-0.5 * ((x - mean) / sd) ** 2) / (sd * math.sqrt(2 * math.pi))

    def accepted(x: float) -> float:
        return conformity_probability(x, u, low=accept[0], high=accept[1])

    def integral(function, low, high):
        return quad(function, low, high, epsabs=1e-13, epsrel=1e-12, limit=400)[0]

    far = 10 * sd
    outside = [(mean - far, limits[0]), (limits[1], mean + far)]
    conforming = integral(density, *limits)
    consumer = sum(integral(lambda x: density(x) * accepted(x), *span) for span in outside)
    producer = integral(lambda x: density(x) * (1 - accepted(x)), *limits)
    return conforming, consumer, producer


def test_conformity_probability_reproduces_jcgm_106_9_5():
    """1500 ohm resistors: 90 % conform, consumer's risk 1 %, producer's 7 %. Inputs read, results from memory."""
    conforming, consumer, producer = risks(
        mean=1500, sd=0.12, u=0.04, limits=(1499.8, 1500.2), accept=(1499.82, 1500.18)
    )

    assert conforming == printed("0.90")
    assert consumer == printed("0.01")
    assert producer == printed("0.07")


# Draft of RP-19 as quoted in github.com/sandialabs/suncal test/test_risk.py, test_risk_values: process N(0, s) with
# this share within +-1, measured with u = s/4; false accepts of all, and of those accepted, in per cent.
RP_19 = [
    ("0.60", "4.83860326", "8.26008199"),
    ("0.70", "3.92234109", "5.72322042"),
    ("0.80", "2.85583037", "3.63227145"),
    ("0.90", "1.59995312", "1.79880430"),
    ("0.95", "0.87100925", "0.92389664"),
    ("0.99", "0.19991684", "0.20243866"),
]


@pytest.mark.parametrize(("share", "of_all", "of_accepted"), RP_19)
def test_conformity_probability_reproduces_rp_19(share, of_all, of_accepted):
    """False accepts to the fifth digit after the point; the table's own integration is good to 2e-6."""
    sd = 1 / float(ndtri(0.5 + float(share) / 2))

    conforming, consumer, producer = risks(mean=0, sd=sd, u=sd / 4, limits=(-1, 1), accept=(-1, 1))
    accepted = conforming - producer + consumer

    assert conforming == pytest.approx(float(share), abs=1e-9)
    assert 100 * consumer == pytest.approx(float(of_all), rel=0, abs=2e-6)
    assert 100 * consumer / accepted == pytest.approx(float(of_accepted), rel=0, abs=2e-6)
    assert accepted == pytest.approx(
        conformity_probability(0, math.hypot(sd, sd / 4), low=-1, high=1),
        rel=1e-9,
    )


@pytest.mark.parametrize(
    ("u", "acceptance", "accepts", "rejects"),
    [
        # quoted from a published paper in github.com/sandialabs/suncal test/test_risk.py: process of sd 1, limits +-2
        pytest.param(0.25, 2.0, "0.008", "0.015", id="4 to 1"),
        pytest.param(0.5, 1.82, "0.008", "0.066", id="2 to 1, 0.91 of the tolerance"),
    ],
)
def test_conformity_probability_reproduces_false_accepts_and_rejects(u, acceptance, accepts, rejects):
    """Simple acceptance at 4 to 1, and a guard band at 2 to 1."""
    _, consumer, producer = risks(mean=0, sd=1, u=u, limits=(-2, 2), accept=(-acceptance, acceptance))

    assert consumer == printed(accepts)
    assert producer == printed(rejects)


@pytest.mark.parametrize(
    ("mean", "outside"),
    [(10.0, "0.01242"), (10.5, "0.10574"), (12.0, "0.99379")],  # suncal test/test_risk.py, test_cpk
)
def test_conformity_probability_reproduces_share_outside(mean, outside):
    """N(mean, 0.4) outside 9 to 11."""
    assert 1 - conformity_probability(mean, 0.4, low=9.0, high=11.0) == printed(outside)


# --- ILAC-G8:09/2019 ------------------------------------------------------------------------------------------------

# clauses 4.1 and 4.2 read at fliphtml5.com/szbrq/ktfm/ILAC_G8_09_2019_Quy_tac_ra_QD/8 to /10;
# figures of risk at thelab.asia/decision-rule. Guard band w = TL - AL.
UPPER = 10.0
U95 = 0.5


def specific_risk(value: float, u: float) -> float:
    return 1 - conformity_probability(value, u, low=None, high=UPPER)


def test_simple_reproduces_ilac_g8_4_2_1():
    """Binary without guard band: pass up to TL, with a risk of up to 50 % there."""
    u = U95 / coverage_factor(0.95, math.inf)

    assert specific_risk(UPPER, u) == pytest.approx(0.5)
    for value, verdict in ((UPPER - 1e-6, "pass"), (UPPER, "pass"), (UPPER + 1e-6, "fail")):
        p = conformity_probability(value, u, low=None, high=UPPER)
        assert verdict_of(p, meets(value, None, UPPER), decision("simple")) == verdict


@pytest.mark.parametrize("freedom", [math.inf, 60.0, 5.0, 1.5])
@pytest.mark.parametrize("side", ["upper", "lower"])
def test_guarded_reproduces_ilac_g8_4_2_2(freedom, side):
    """Binary with w = U: the acceptance limit is TL - U, and the specific risk there 2.5 %."""
    u = U95 / coverage_factor(0.95, freedom)
    sign = 1 if side == "upper" else -1
    low, high = (None, UPPER) if side == "upper" else (UPPER, None)

    def judged(value: float) -> tuple[str, float]:
        p = conformity_probability(value, u, low=low, high=high, degrees_of_freedom=freedom)
        return verdict_of(p, meets(value, low, high), decision("guarded")), 1 - p

    at = UPPER - sign * U95
    assert judged(at)[1] == pytest.approx(0.025, rel=1e-9)
    assert judged(at)[0] == "pass"
    assert judged(at - sign * 1e-6)[0] == "pass"
    assert judged(at + sign * 1e-6)[0] == "fail"
    assert margin(at, low, high) == pytest.approx(U95)


@pytest.mark.parametrize(("confidence", "risk"), [("90 %", 0.05), ("95 %", 0.025), ("99 %", 0.005)])
def test_required_probability_reproduces_ilac_g8_risk(confidence, risk):
    """Half of what the confidence leaves: 2.5 % at 95 %."""
    assert 1 - required_probability(decision("guarded", confidence)) == pytest.approx(risk)


@pytest.mark.parametrize(
    ("r", "bound"),
    # guard band w = r U with U = 2 u; read at findhealthclinics.com/NL/Nederwetten/355649698732075/HarperMetrology
    [(0.83, 0.05), (1.0, 0.025), (1.5, 0.0016), (3.0, 1e-6)],
)
def test_conformity_probability_reproduces_guard_bands_of_r_times_u(r, bound):
    """The specific risk at AL = TL - r U lies below what the table prints, and a quarter nearer it would not."""
    u = U95 / 2

    assert specific_risk(UPPER - r * U95, u) < bound
    assert specific_risk(UPPER - 0.75 * r * U95, u) > bound
    assert specific_risk(UPPER - r * U95, u) == pytest.approx(float(ndtr(-2 * r)), rel=1e-6, abs=1e-15)


@pytest.mark.parametrize(
    ("value", "verdict"),
    [
        (UPPER - U95 - 1e-6, "pass"),
        (UPPER - U95 + 1e-6, "conditional pass"),
        (UPPER - 1e-6, "conditional pass"),
        (UPPER + 1e-6, "conditional fail"),
        (UPPER + U95 - 1e-6, "conditional fail"),
        (UPPER + U95 + 1e-6, "fail"),
        # the clause leaves equality open; ours: what is shown at the probability asked for, and what meets the limit
        (UPPER - U95, "pass"),
        (UPPER, "conditional pass"),
        (UPPER + U95, "fail"),
    ],
)
@pytest.mark.parametrize("side", ["upper", "lower"])
def test_conditional_reproduces_ilac_g8_4_2_3(value, verdict, side):
    """Not binary, w = U: pass to TL - w, conditional pass to TL, conditional fail to TL + w, fail above."""
    u = U95 / coverage_factor(0.95, math.inf)
    low, high = (None, UPPER) if side == "upper" else (-UPPER, None)
    value = value if side == "upper" else -value

    p = conformity_probability(value, u, low=low, high=high)

    assert verdict_of(p, meets(value, low, high), decision("conditional")) == verdict


def test_guarded_keeps_the_risk_of_ilac_g8_4_2_2_in_draws():
    """Of 200 000 readings of a truth at the limit, 2.5 % are passed."""
    u, draws = 1.0, 200_000
    readings = UPPER + u * np.random.default_rng(20_270_101).standard_normal(draws)
    accept = UPPER - u * coverage_factor(0.95, math.inf)

    passed = sum(
        verdict_of(
            conformity_probability(value, u, low=None, high=UPPER), meets(value, None, UPPER), decision("guarded")
        )
        == "pass"
        for value in readings[readings < accept + 0.1]  # the others fail, which test above shows
    )

    assert passed / draws == pytest.approx(0.025, abs=4 * math.sqrt(0.025 * 0.975 / draws))
