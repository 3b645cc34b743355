"""The decision: verdicts by rule, the least favourable of several, and the joint probability."""

from __future__ import annotations

import itertools
import math
from dataclasses import replace
from typing import get_args

import numpy as np
import pytest
from hypothesis import assume, given
from hypothesis import strategies as st
from scipy.special import bdtr, ndtr, ndtri

from acceptance.checks.outcome import Candidate, Outcome
from acceptance.decision import (
    Decided,
    conformity_probability,
    decide,
    joint_probability,
    margin,
    meets,
    required_probability,
    unit_verdict,
    verdict_of,
)
from acceptance.limitfile.model import Decision
from acceptance.points.point import Estimate
from acceptance.points.propagation import Source, coverage_factor, of_source
from acceptance.record import FindingVerdict

RULES = ("simple", "guarded", "conditional")
ORDER = ("fail", "conditional fail", "conditional pass", "pass")  # worst first, of what can be judged

values = st.floats(-1e3, 1e3, allow_nan=False)
uncertainties = st.floats(1e-6, 1e3)
freedoms = st.one_of(st.just(math.inf), st.floats(1, 200))
limits_pairs = st.tuples(st.floats(-100, 100), st.floats(-100, 100)).filter(lambda pair: pair[0] < pair[1])
bounds = st.one_of(limits_pairs, st.tuples(st.none(), st.floats(-100, 100)), st.tuples(st.floats(-100, 100), st.none()))
rules = st.sampled_from(RULES)


def rule_of(rule: str, confidence: str = "95 %") -> Decision:
    return Decision.model_validate({"rule": rule, "confidence": confidence})


GUARDED, SIMPLE, CONDITIONAL = (rule_of(rule) for rule in ("guarded", "simple", "conditional"))


def judged(value, u, low, high, *, decision=GUARDED, freedom=math.inf) -> FindingVerdict:
    p = conformity_probability(value, u, low=low, high=high, degrees_of_freedom=freedom)
    return verdict_of(p, meets(value, low, high), decision)


def estimate(value: float, u: float, freedom: float = math.inf, *, name: str = "meter", unstated=()) -> Estimate:
    return Estimate(of_source(u, Source(name, "B", freedom), value), frozenset(unstated))


def outcome_of(*candidates: Candidate, low=None, high=None, characteristic="output_voltage", reason="") -> Outcome:
    return Outcome("x", characteristic, "load 50 %", "V", low, high, tuple(candidates), reason)


def candidate(value: float, u: float = 0.0, **more) -> Candidate:
    return Candidate((), estimate(value, u, **more))


def decided(value, *, low=None, high=None, decision=GUARDED) -> Decided:
    return decide(outcome_of(Candidate((), Estimate(value)), low=low, high=high), decision)


# --- meeting a limit ------------------------------------------------------------------------------------------------


@pytest.mark.parametrize(
    ("value", "low", "high", "inside"),
    [
        (1.0, 1.0, None, True),
        (1.0, None, 1.0, True),
        (0.1 + 0.2, None, 0.3, True),  # equal but for rounding
        (1 - 9e-13, 1.0, None, True),
        (1 - 2e-12, 1.0, None, False),
        (1 + 2e-12, None, 1.0, False),
        (-1 - 9e-13, -1.0, None, True),
        (-1 - 2e-12, -1.0, None, False),
        (0.0, 0.0, 0.0, True),
        (1e-300, None, 0.0, False),  # the slack is relative: none at zero
        (5.0, None, None, True),
        (2.0, 1.0, 3.0, True),
        (0.5, 1.0, 3.0, False),
        (3.5, 1.0, 3.0, False),
    ],
)
def test_meets_at_and_about_the_limit(value, low, high, inside):
    """Equality meets, with a slack of 1e-12 of the limit and no more."""
    assert meets(value, low, high) is inside


@pytest.mark.parametrize("limit", [0.21, 24.48, 1e-6, 3.7e5])
def test_meets_slack_is_relative(limit):
    """The same share of any limit, large or small."""
    assert meets(limit * (1 + 0.9e-12), None, limit)
    assert not meets(limit * (1 + 1.2e-12), None, limit)


@given(values, bounds)
def test_margin_is_positive_inside_alone(value, pair):
    """The distance to the nearest limit, negative outside."""
    low, high = pair
    distance = margin(value, low, high)

    assert distance == min([value - low] if low is not None else [], default=math.inf) or distance == high - value
    assert (distance >= 0) == ((low is None or value >= low) and (high is None or value <= high))


def test_margin_without_limits_is_none():
    """Nothing to be distant from."""
    assert margin(1.0, None, None) is None


# --- the probability ------------------------------------------------------------------------------------------------


@given(values, uncertainties, limits_pairs, freedoms)
def test_two_sided_probability_leaves_the_sum_of_the_tails(value, u, pair, freedom):
    """What does not conform lies below the one limit or above the other."""
    low, high = pair

    p = conformity_probability(value, u, low=low, high=high, degrees_of_freedom=freedom)
    below = 1 - conformity_probability(value, u, low=low, high=None, degrees_of_freedom=freedom)
    above = 1 - conformity_probability(value, u, low=None, high=high, degrees_of_freedom=freedom)

    assert 0 <= p <= 1
    assert p == pytest.approx(1 - below - above, abs=1e-12)


@given(values, uncertainties, bounds, freedoms)
def test_probability_is_that_of_the_mirror_image(value, u, pair, freedom):
    """Value and limits with their signs turned conform as surely."""
    low, high = pair
    mirrored = (None if high is None else -high, None if low is None else -low)

    p = conformity_probability(value, u, low=low, high=high, degrees_of_freedom=freedom)
    turned = conformity_probability(-value, u, low=mirrored[0], high=mirrored[1], degrees_of_freedom=freedom)

    assert turned == pytest.approx(p, abs=1e-12)


@given(st.floats(-100, 100), st.floats(0, 10), st.floats(0.01, 10), freedoms)
def test_probability_falls_towards_the_limit(limit, step, u, freedom):
    """Nearer the limit, or beyond it, a value conforms less surely."""
    inner = conformity_probability(limit - 2 * step, u, low=None, high=limit, degrees_of_freedom=freedom)
    outer = conformity_probability(limit - step, u, low=None, high=limit, degrees_of_freedom=freedom)

    assert inner >= outer >= 0.5
    assert 1 - outer == pytest.approx(
        conformity_probability(limit + step, u, low=None, high=limit, degrees_of_freedom=freedom), abs=1e-12
    )


@pytest.mark.parametrize("value", [-1.5, -0.3, 0.0, 0.7, 2.0])
def test_probability_in_closed_form(value):
    """Cauchy's for one degree of freedom, that of (1 + x / sqrt(2 + x2)) / 2 for two, the normal's without end."""
    p = [conformity_probability(0.0, 1.0, low=None, high=value, degrees_of_freedom=nu) for nu in (1.0, 2.0, math.inf)]

    assert p[0] == pytest.approx(0.5 + math.atan(value) / math.pi, abs=1e-12)
    assert p[1] == pytest.approx(0.5 + value / (2 * math.sqrt(2 + value**2)), abs=1e-12)
    assert p[2] == pytest.approx(0.5 * math.erfc(-value / math.sqrt(2)), abs=1e-12)


@given(values, bounds)
def test_probability_without_uncertainty_is_certain(value, pair):
    """An exact value conforms or does not."""
    assert conformity_probability(value, 0.0, low=pair[0], high=pair[1]) == float(meets(value, *pair))


# --- one verdict ----------------------------------------------------------------------------------------------------


@given(values, uncertainties, bounds, rules, freedoms)
def test_verdict_is_that_of_the_mirror_image(value, u, pair, rule, freedom):
    """A maximum is judged as a minimum is."""
    low, high = pair
    mirrored = (None if high is None else -high, None if low is None else -low)
    p = conformity_probability(value, u, low=low, high=high, degrees_of_freedom=freedom)
    assume(abs(p - 0.975) > 1e-9)
    assume(abs(p - 0.025) > 1e-9)

    turned = judged(-value, u, *mirrored, decision=rule_of(rule), freedom=freedom)

    assert judged(value, u, low, high, decision=rule_of(rule), freedom=freedom) == turned


@given(st.lists(values, min_size=2, max_size=6), uncertainties, rules, freedoms)
def test_verdict_never_improves_towards_a_limit(readings, u, rule, freedom):
    """With a maximum, a larger value has no better verdict."""
    verdicts = [judged(v, u, None, 10.0, decision=rule_of(rule), freedom=freedom) for v in sorted(readings)]

    ranks = [ORDER.index(verdict) for verdict in verdicts]
    assert ranks == sorted(ranks, reverse=True)


@given(values, st.lists(uncertainties, min_size=2, max_size=6), bounds, freedoms)
def test_pass_is_never_gained_by_a_larger_uncertainty(value, us, pair, freedom):
    """Measuring worse never turns into a pass what measuring better does not show."""
    passes = [judged(value, u, *pair, freedom=freedom) == "pass" for u in sorted(us)]

    assert passes == sorted(passes, reverse=True)


@given(values, st.lists(uncertainties, min_size=2, max_size=6), st.floats(-100, 100), freedoms)
def test_fail_of_the_conditional_rule_is_never_gained_by_a_larger_uncertainty(value, us, high, freedom):
    """Nor into a failure that is shown."""
    fails = [judged(value, u, None, high, decision=CONDITIONAL, freedom=freedom) == "fail" for u in sorted(us)]

    assert fails == sorted(fails, reverse=True)


@given(values, st.one_of(st.just(0.0), uncertainties), bounds)
def test_simple_ignores_the_uncertainty(value, u, pair):
    """Inside is a pass, outside a failure, whatever u."""
    assert judged(value, u, *pair, decision=SIMPLE) == ("pass" if meets(value, *pair) else "fail")


@given(values, uncertainties, bounds, freedoms, st.sampled_from(["90 %", "95 %", "99 %"]))
def test_guarded_passes_where_conformity_is_shown_and_nowhere_else(value, u, pair, freedom, confidence):
    """Binary, at p >= 0.975 for 95 %."""
    decision = rule_of("guarded", confidence)
    needed = 0.5 + float(confidence.removesuffix(" %")) / 200
    p = conformity_probability(value, u, low=pair[0], high=pair[1], degrees_of_freedom=freedom)
    assume(abs(p - needed) > 1e-9)

    assert required_probability(decision) == pytest.approx(needed)
    assert judged(value, u, *pair, decision=decision, freedom=freedom) == ("pass" if p > needed else "fail")


@given(values, uncertainties, bounds, freedoms)
def test_conditional_refines_guarded_and_simple(value, u, pair, freedom):
    """Pass is guarded's pass; the side of the limit is simple's."""
    verdict = judged(value, u, *pair, decision=CONDITIONAL, freedom=freedom)

    assert (verdict == "pass") == (judged(value, u, *pair, freedom=freedom) == "pass")
    assert (verdict in ("pass", "conditional pass")) == (judged(value, u, *pair, decision=SIMPLE) == "pass")


@pytest.mark.parametrize(
    ("low", "high", "inwards", "freedom"),
    [
        *((None, 0.0, -1, freedom) for freedom in (math.inf, 50.0, 4.0, 1.3)),
        *((0.0, None, 1, freedom) for freedom in (math.inf, 50.0, 4.0, 1.3)),
        (-14.0, 0.0, -1, math.inf),  # the other limit 1400 u away
    ],
)
def test_conditional_has_four_bands_about_the_limit(low, high, inwards, freedom):
    """ILAC-G8:09/2019, 4.2.3: the bands end at limit - U, the limit, and limit + U."""
    u = 0.01  # the limit is 0, so that limit +- U is exact
    expanded = u * coverage_factor(0.95, freedom)
    hair = 1e-7

    def at(distance: float) -> FindingVerdict:
        return judged(-inwards * distance, u, low, high, decision=CONDITIONAL, freedom=freedom)

    assert at(-expanded - hair) == "pass"
    assert at(-expanded) == "pass"
    assert at(-expanded + hair) == "conditional pass"
    assert at(0.0) == "conditional pass"
    assert at(hair) == "conditional fail"
    assert at(expanded - hair) == "conditional fail"
    assert at(expanded) == "fail"
    assert at(expanded + hair) == "fail"


def test_no_value_passes_between_limits_nearer_than_the_uncertainty():
    """Limits 1 U apart: nothing can be shown to conform, and guarded fails all."""
    middle = [judged(0.0, 1.0, -1.0, 1.0, decision=rule) for rule in (GUARDED, CONDITIONAL, SIMPLE)]

    assert middle == ["fail", "conditional pass", "pass"]


# --- several dwells -------------------------------------------------------------------------------------------------


def test_decide_takes_the_least_favourable_candidate():
    """The nearest to the limit decides, and the others are kept."""
    dwells = [candidate(23.0, 0.1), candidate(23.9, 0.1), candidate(22.0, 0.1)]

    told = decide(outcome_of(*dwells, high=24.0), SIMPLE)

    assert told.by is not None
    assert told.by.candidate is dwells[1]
    assert {id(other.candidate) for other in told.others} == {id(dwells[0]), id(dwells[2])}


@given(st.lists(st.tuples(st.floats(20, 26), st.floats(0.01, 1)), min_size=1, max_size=5), rules, st.randoms())
def test_decide_does_not_depend_on_the_order(pairs, rule, random):
    """The finding is the worst of the candidates' own verdicts, whichever comes first."""
    decision = rule_of(rule)
    alone = [decide(outcome_of(candidate(v, u), low=21.0, high=25.0), decision).verdict for v, u in pairs]
    shuffled = random.sample(pairs, len(pairs))

    told = decide(outcome_of(*(candidate(v, u) for v, u in pairs), low=21.0, high=25.0), decision)
    turned = decide(outcome_of(*(candidate(v, u) for v, u in shuffled), low=21.0, high=25.0), decision)

    assert told.verdict == min(alone, key=ORDER.index)
    assert turned.verdict == told.verdict
    assert turned.by.probability == told.by.probability
    assert turned.by.margin == told.by.margin
    assert len(told.others) == len(pairs) - 1


def test_decide_takes_the_least_probable_not_the_nearest():
    """Of two passes, the one that conforms less surely, although its value lies further inside."""
    near, vague = candidate(23.9, 0.001), candidate(23.5, 0.2)

    told = decide(outcome_of(near, vague, high=24.0), GUARDED)

    assert told.verdict == "pass"
    assert told.by.candidate is vague


def test_decide_prefers_not_judged_to_all_but_failure():
    """What cannot be judged hides behind a failure, never behind a pass or a condition."""
    unknown = Candidate((), reason="the converter was clipped")
    good, near, over, bad = (candidate(value, 0.1) for value in (20.0, 23.95, 24.05, 30.0))

    for others in ([good], [good, near], [over, near]):
        told = decide(outcome_of(*others, unknown, high=24.0), CONDITIONAL)
        assert (told.verdict, told.reason) == ("not judged", "the converter was clipped")
    assert decide(outcome_of(unknown, bad, good, high=24.0), CONDITIONAL).verdict == "fail"


def test_decide_without_a_candidate_says_why():
    """No dwell: not judged, with the check's reason, or one of its own."""
    told = decide(outcome_of(reason="no dwell at load 50 %", high=1.0), SIMPLE)
    bare = decide(outcome_of(high=1.0), SIMPLE)

    assert (told.verdict, told.reason, told.by) == ("not judged", "no dwell at load 50 %", None)
    assert bare.verdict == "not judged"
    assert bare.reason


@pytest.mark.parametrize(
    ("value", "rule", "verdict"),
    [
        (23.0, "simple", "pass"),
        (25.0, "simple", "fail"),
        (24.0, "simple", "pass"),
        (23.0, "guarded", "not judged"),
        (25.0, "guarded", "not judged"),
        (23.0, "conditional", "not judged"),
        (25.0, "conditional", "not judged"),
    ],
)
def test_decide_unstated_uncertainty_only_under_the_simple_rule(value, rule, verdict):
    """Without an accuracy only the simple rule judges, and the finding says so and of which channel."""
    told = decide(outcome_of(candidate(value, 0.01, unstated=["output_voltage"]), high=24.0), rule_of(rule))

    assert told.verdict == verdict
    assert "uncertainty not stated" in told.reason
    assert "output_voltage" in told.reason
    assert told.by.probability is None
    assert told.by.expanded is None


@pytest.mark.parametrize("value", [math.nan, math.inf, -math.inf])
@pytest.mark.parametrize("rule", RULES)
@pytest.mark.parametrize("unstated", [(), ("output_voltage",)])
def test_decide_never_judges_what_is_no_number(value, rule, unstated):
    """NaN and infinity are not judged under any rule, with a reason."""
    one = Candidate((), Estimate(value, frozenset(unstated)))

    told = decide(outcome_of(one, high=24.0, low=-24.0), rule_of(rule))

    assert told.verdict == "not judged"
    assert told.reason


@pytest.mark.parametrize("rule", RULES)
def test_decide_words_are_met_or_not(rule):
    """A value in words has a verdict, and no probability."""
    right = Candidate((), text="constant current", text_meets=True)
    wrong = Candidate((), text="foldback", text_meets=False)

    assert decide(outcome_of(right), rule_of(rule)).verdict == "pass"
    told = decide(outcome_of(right, wrong), rule_of(rule))
    assert (told.verdict, told.by.candidate.text, told.by.probability) == ("fail", "foldback", None)


@pytest.mark.parametrize(
    ("value", "u", "verdict"),
    [(1.001, 0.002, "pass"), (1.02, 0.002, "not judged"), (0.9, 0.002, "pass")],
)
def test_decide_efficiency_above_one_is_not_judged(value, u, verdict):
    """More than 1 by more than its U cannot be, and is never a pass."""
    told = decide(outcome_of(candidate(value, u), low=0.85, characteristic="efficiency"), GUARDED)

    assert told.verdict == verdict
    assert decide(outcome_of(candidate(value, u), low=0.85), GUARDED).verdict == "pass"  # a voltage may


def test_decide_says_how_far_conformity_is_shown():
    """Inside the limit but not shown: the reason carries p, and the parts are there to be printed."""
    told = decide(outcome_of(candidate(23.95, 0.05), high=24.0), GUARDED)

    assert told.verdict == "fail"
    assert told.reason == "inside the limit, but not shown to conform (conformity 84.1 %)"
    assert told.by.probability == pytest.approx(float(ndtr(1.0)))
    assert told.by.margin == pytest.approx(0.05)
    assert told.by.expanded.expanded == pytest.approx(0.05 * float(ndtri(0.975)))
    assert decide(outcome_of(candidate(24.5, 0.05), high=24.0), GUARDED).reason == "outside the limit"


def test_decide_uses_the_degrees_of_freedom_of_the_value():
    """2.1 u inside passes with many readings behind u, and does not with four."""
    many, few = (outcome_of(candidate(24.0 - 2.1 * 0.1, 0.1, freedom=nu), high=24.0) for nu in (math.inf, 3.0))

    assert decide(many, GUARDED).verdict == "pass"
    assert decide(few, GUARDED).verdict == "fail"


# --- the unit -------------------------------------------------------------------------------------------------------


@pytest.mark.parametrize("count", [1, 2, 3])
def test_unit_verdict_by_all_combinations(count):
    """Rejected when one fails; undecided when none fails and one is conditional or not judged; else accepted."""
    for verdicts in itertools.product(get_args(FindingVerdict), repeat=count):
        if "fail" in verdicts:
            expected = "rejected"
        elif set(verdicts) == {"pass"}:
            expected = "accepted"
        else:
            expected = "undecided"
        assert unit_verdict(verdicts) == expected


def test_unit_verdict_without_findings_is_undecided():
    """Nothing was shown."""
    assert unit_verdict([]) == "undecided"


# --- joint probability ----------------------------------------------------------------------------------------------

DRAWS = 200_000


def monte_carlo(p: float) -> float:
    """Four standard deviations of a share of the draws."""
    return 4 * math.sqrt(max(p * (1 - p), 1e-9) / DRAWS)


def correlated(rho: float) -> tuple:
    """Two values of u = 1 and the correlation asked for."""
    a, b = (of_source(1.0, Source(name, "B")) for name in "ab")
    return a, rho * a + math.sqrt(1 - rho * rho) * b


def alone(one: Decided) -> float:
    assert one.by is not None
    assert one.by.probability is not None
    return one.by.probability


@given(st.lists(st.tuples(st.floats(-3, 3), st.floats(-2, 0), st.floats(0.1, 2)), min_size=1, max_size=6))
def test_joint_probability_of_independent_findings_is_their_product(parts):
    """Nothing shared: exactly the product."""
    findings = [
        decided(of_source(1.0, Source(f"{i}", "B"), value), low=low, high=high)
        for i, (value, low, high) in enumerate(parts)
    ]

    assert joint_probability(findings) == pytest.approx(math.prod(alone(one) for one in findings), rel=1e-9, abs=1e-15)


@pytest.mark.parametrize("rho", [-0.95, -0.5, 0.2, 0.7, 0.99])
def test_joint_probability_of_two_at_their_limits(rho):
    """The orthant: 1/4 + asin(rho) / (2 pi)."""
    findings = [decided(value, low=0.0) for value in correlated(rho)]

    expected = 0.25 + math.asin(rho) / (2 * math.pi)
    assert joint_probability(findings) == pytest.approx(expected, abs=monte_carlo(expected))


@pytest.mark.parametrize("signs", [(1, 1, 1), (1, -1, 1)])
def test_joint_probability_of_three_at_their_limits(signs):
    """The orthant in three: 1/8 + (asin r12 + asin r13 + asin r23) / (4 pi)."""
    shared = of_source(1.0, Source("shared", "B"))
    values_ = [sign * shared + of_source(1.0, Source(f"{i}", "B")) for i, sign in enumerate(signs)]
    pairs = [signs[0] * signs[1], signs[0] * signs[2], signs[1] * signs[2]]

    joint = joint_probability([decided(value, low=0.0) for value in values_])

    expected = 0.125 + sum(math.asin(0.5 * sign) for sign in pairs) / (4 * math.pi)
    assert joint == pytest.approx(expected, abs=monte_carlo(expected))


@pytest.mark.parametrize("highs", [(0.5, 0.5), (0.2, 1.3, 2.0)])
def test_joint_probability_of_one_value_twice_is_the_least(highs):
    """Findings on one and the same value: the strictest limit alone."""
    value = of_source(1.0, Source("shared", "B"))
    findings = [decided(value, high=high) for high in highs]

    expected = min(alone(one) for one in findings)
    assert joint_probability(findings) == pytest.approx(expected, abs=monte_carlo(expected))


@pytest.mark.parametrize(("low", "high"), [(-1.0, 0.5), (-0.2, 2.0), (0.3, 1.0)])
def test_joint_probability_of_opposites(low, high):
    """X below one limit and -X below another: P(low < X < high), in closed form."""
    value = of_source(1.0, Source("shared", "B"))
    findings = [decided(value, high=high), decided(-value, high=-low)]

    expected = float(ndtr(high) - ndtr(low))
    assert joint_probability(findings) == pytest.approx(expected, abs=monte_carlo(expected))


@pytest.mark.parametrize(("low", "high"), [(-1.0, 0.5), (-0.2, 2.0)])
def test_joint_probability_of_both_limits_in_two_findings_is_that_of_one(low, high):
    """A minimum and a maximum written as two requirements of one value."""
    value = of_source(1.0, Source("shared", "B"))
    together = alone(decided(value, low=low, high=high))

    joint = joint_probability([decided(value, low=low), decided(value, high=high)])

    assert joint == pytest.approx(together, abs=monte_carlo(together))


@pytest.mark.parametrize("freedom", [2.0, 10.0])
def test_joint_probability_keeps_each_findings_own_probability(freedom):
    """Student's t through the copula: alone, and twice the same, the finding's own p remains."""
    value = of_source(1.0, Source("shared", "A", freedom))
    one = decided(value, low=-1.0, high=1.5)

    assert joint_probability([one]) == pytest.approx(alone(one), rel=1e-12)
    assert joint_probability([one, one]) == pytest.approx(alone(one), abs=monte_carlo(alone(one)))


@pytest.mark.parametrize("seed", range(3))
def test_joint_probability_does_not_depend_on_the_order(seed):
    """Findings in any order, but for the noise of the draws; and the same order always gives the same."""
    rng = np.random.default_rng(seed)
    errors = [of_source(1.0, Source(f"{i}", "B")) for i in range(3)]
    mixed = [sum(float(w) * e for w, e in zip(rng.normal(size=3), errors, strict=True)) for _ in range(4)]
    findings = [decided(value, low=float(-rng.uniform(0.5, 3))) for value in mixed]

    joints = [joint_probability([findings[i] for i in order]) for order in ((0, 1, 2, 3), (3, 2, 1, 0), (1, 3, 0, 2))]

    # each is within four of its own deviations of the truth, so two are within sqrt(2) of that
    assert max(joints) - min(joints) < 2 * math.sqrt(2) * monte_carlo(joints[0])
    assert joint_probability(findings) == joint_probability(findings)


@pytest.mark.parametrize("rho", [-1.0, -0.6, 0.0, 0.6, 1.0])
@pytest.mark.parametrize(("high_a", "high_b"), [(0.1, 0.2), (1.0, 3.0), (-2.0, 2.0)])
def test_joint_probability_stays_within_its_bounds(rho, high_a, high_b):
    """Never above the least of the findings' own, nor below what they leave of one another."""
    a, b = correlated(rho)
    findings = [decided(a, high=high_a), decided(b, high=high_b)]
    own = [alone(one) for one in findings]

    joint = joint_probability(findings)

    assert max(0.0, sum(own) - 1) - 1e-12 <= joint <= min(own) + 1e-12


def test_joint_probability_with_exact_values():
    """An exact value conforms for sure or not at all, and is not drawn."""
    vague = decided(of_source(1.0, Source("meter", "B"), 0.0), high=1.0)
    inside, outside = decided(0.5, high=1.0), decided(1.5, high=1.0)

    assert joint_probability([vague, inside]) == pytest.approx(alone(vague))
    assert joint_probability([vague, outside]) == 0.0
    assert joint_probability([inside]) == 1.0
    assert joint_probability([]) == 1.0


def test_joint_probability_is_none_when_one_is_not_judged():
    """No number where a finding has none."""
    good = decided(of_source(1.0, Source("meter", "B"), 0.0), high=5.0)
    unknown = decide(outcome_of(Candidate((), reason="clipped"), high=5.0), GUARDED)
    empty = decide(outcome_of(high=5.0), GUARDED)
    unstated = decide(outcome_of(candidate(0.0, unstated=["output_voltage"]), high=5.0), SIMPLE)

    assert unstated.verdict == "pass"
    for one in (unknown, empty, unstated):
        assert joint_probability([good, one]) is None


def test_joint_probability_of_words():
    """Words as required are certain; a word that is not makes it zero."""
    good = decided(of_source(1.0, Source("meter", "B"), 0.0), high=1.0)
    right = decide(outcome_of(Candidate((), text="hiccup", text_meets=True)), GUARDED)
    wrong = decide(outcome_of(Candidate((), text="latch off", text_meets=False)), GUARDED)

    assert joint_probability([good, right]) == pytest.approx(alone(good))
    assert joint_probability([good, wrong]) == 0.0


# --- false accepts --------------------------------------------------------------------------------------------------


@pytest.mark.parametrize("freedom", [math.inf, 20, 4, 2])
@pytest.mark.parametrize("excess", [1e-9, 0.5])
def test_guarded_false_accepts_stay_below_the_risk(freedom, excess):
    """A truth just outside its limit: of 20 000 readings fewer than 2.5 % pass, also with few readings behind u."""
    draws, u, high = 20_000, 0.3, 24.0
    rng = np.random.default_rng(20_260_714)
    truth = high + excess * u
    readings = truth + u * rng.standard_normal(draws)
    # what the bench would say of u: from a chi-square of that many degrees of freedom
    told = np.full(draws, u) if math.isinf(freedom) else u * np.sqrt(rng.chisquare(freedom, draws) / freedom)

    accepts = sum(
        judged(value, s, None, high, freedom=freedom) == "pass"
        for value, s in zip(readings[readings < high], told[readings < high], strict=True)
    )

    # binomial: the count that a risk of 2.5 % exceeds once in 10 000 times
    allowed = next(n for n in range(draws) if bdtr(n, draws, 0.025) > 1 - 1e-4)
    assert accepts <= allowed
    if excess < 0.1:  # and the test can fail: the risk is used up at the limit
        assert accepts > draws * 0.025 - (allowed - draws * 0.025)
    else:
        assert accepts < 0.025 * draws


def test_guarded_false_accepts_between_two_limits():
    """Two-sided: a truth just above the upper limit, the lower one 5 u away."""
    draws, u, low, high = 20_000, 1.0, -5.0, 0.0
    readings = u * np.random.default_rng(7).standard_normal(draws)

    accepts = sum(judged(value, u, low, high) == "pass" for value in readings)

    assert 0 < accepts < 0.025 * draws


def test_decided_by_replaced_limit_changes_nothing_but_the_verdict():
    """The same candidate against another limit: value and U stay, margin and p follow."""
    one = outcome_of(candidate(23.5, 0.1), high=24.0)

    strict, loose = decide(replace(one, high=23.6), GUARDED), decide(one, GUARDED)

    assert (strict.verdict, loose.verdict) == ("fail", "pass")
    assert strict.by.expanded == loose.by.expanded
    assert strict.by.margin == pytest.approx(loose.by.margin - 0.4)


# --- values of which only a bound is known --------------------------------------------------------------------------


@pytest.mark.parametrize("decision", [GUARDED, SIMPLE, CONDITIONAL])
@pytest.mark.parametrize(
    ("known", "value", "verdict"),
    [
        ("at least", 9.0, "not judged"),  # it may lie above the limit
        ("at least", 12.0, "fail"),
        ("at least", 1.0, "not judged"),  # below the lower limit so far, and it may still reach it
        ("at most", 9.0, "not judged"),
        ("at most", 1.0, "fail"),
        ("at most", 12.0, "not judged"),
    ],
)
def test_a_bound_fails_what_it_rules_out_and_passes_nothing(decision, known, value, verdict):
    outcome = outcome_of(replace(candidate(value, 0.01), known=known, bound_reason="still rising"), low=2.0, high=10.0)

    found = decide(outcome, decision)

    assert found.verdict == verdict
    assert "still rising" in found.reason


@given(st.sampled_from(["at least", "at most"]), st.floats(-1e3, 1e3), uncertainties, bounds, rules)
def test_a_bound_never_passes(known, value, u, limits, rule):
    outcome = outcome_of(replace(candidate(value, u), known=known, bound_reason="?"), low=limits[0], high=limits[1])

    assert "pass" not in decide(outcome, rule_of(rule)).verdict
