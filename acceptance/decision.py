"""The only place where a number becomes a verdict.

A value meets its limits with a probability, by Student's t or the normal, from its standard uncertainty; the rule says
what probability is asked for.

    simple        pass when the value meets the limit
    guarded       pass when p >= 1 - (1 - confidence) / 2, so that at 95 % a false accept stays below 2.5 %; else fail
    conditional   pass and fail when shown at that p; else conditional pass or fail by the side of the limit
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray
from scipy.special import ndtr, ndtri, stdtr

from acceptance.checks.outcome import Candidate, Outcome
from acceptance.limitfile.model import Decision
from acceptance.points.point import Estimate
from acceptance.points.propagation import Expanded, covariance, expanded, nominal
from acceptance.record import FindingVerdict, UnitVerdict

__all__ = [
    "Decided",
    "conformity_probability",
    "decide",
    "joint_probability",
    "margin",
    "meets",
    "required_probability",
    "unit_verdict",
    "verdict_of",
]

_SLACK = 1e-12  # relative: equality meets a limit
_CERTAIN = 1e-9  # a finding that conforms as surely as this adds nothing to the joint probability
_DRAWS = 200_000
_SEED = 20_260_501

# from the least favourable; a value that cannot be judged hides behind a failure, never behind a pass
_ORDER: tuple[FindingVerdict, ...] = ("fail", "not judged", "conditional fail", "conditional pass", "pass")


@dataclass(frozen=True, slots=True)
class Verdict:
    """One candidate, decided."""

    candidate: Candidate
    verdict: FindingVerdict
    reason: str = ""
    expanded: Expanded | None = None
    probability: float | None = None
    margin: float | None = None


@dataclass(frozen=True, slots=True)
class Decided:
    """One outcome, decided: the least favourable candidate, and the others."""

    outcome: Outcome
    verdict: FindingVerdict
    reason: str
    by: Verdict | None = None  # None where there was nothing to judge
    others: tuple[Verdict, ...] = ()


def meets(value: float, low: float | None, high: float | None) -> bool:
    """Whether a value lies within its limits; equality does, with a relative slack of 1e-12."""
    above = low is None or value >= low - _SLACK * abs(low)
    below = high is None or value <= high + _SLACK * abs(high)
    return above and below


def margin(value: float, low: float | None, high: float | None) -> float | None:
    """Distance to the nearest limit, positive inside."""
    distances = [*([] if low is None else [value - low]), *([] if high is None else [high - value])]
    return min(distances) if distances else None


def conformity_probability(
    value: float, u: float, *, low: float | None, high: float | None, degrees_of_freedom: float = math.inf
) -> float:
    """Probability that the true value meets the limits, given what was measured.

    References
    ----------
    JCGM 106:2012, 7.2 to 7.4: the distribution of the measurand about the measured value, integrated over the
    tolerance interval.
    """
    if u <= 0:
        return 1.0 if meets(value, low, high) else 0.0
    below = 1.0 if high is None else _below((high - value) / u, degrees_of_freedom)
    if low is None:
        return below
    above = _below((value - low) / u, degrees_of_freedom)
    return above if high is None else max(0.0, below + above - 1.0)


def _below(x: float, degrees_of_freedom: float) -> float:
    """Probability that Student's t, or the normal, lies below x."""
    return float(stdtr(degrees_of_freedom, x) if math.isfinite(degrees_of_freedom) else ndtr(x))


def required_probability(decision: Decision) -> float:
    """Probability of conformity that a pass must show under the guarded and conditional rules."""
    return 1 - (1 - decision.confidence) / 2


def verdict_of(probability: float, is_inside: bool, decision: Decision) -> FindingVerdict:
    """The verdict for a value with a probability of conformity."""
    needed = required_probability(decision) - _SLACK
    if decision.rule == "simple":
        return "pass" if is_inside else "fail"
    if probability >= needed and is_inside:
        return "pass"
    if decision.rule == "guarded" or (1 - probability >= needed and not is_inside):
        return "fail"
    return "conditional pass" if is_inside else "conditional fail"


def decide(outcome: Outcome, decision: Decision) -> Decided:
    """The outcome's verdict: that of its least favourable candidate."""
    if not outcome.candidates:
        return Decided(outcome, "not judged", outcome.reason or "nothing in the log to judge it by")
    verdicts = [_judge(candidate, outcome, decision) for candidate in outcome.candidates]
    worst = min(verdicts, key=_favour)
    others = tuple(verdict for verdict in verdicts if verdict is not worst)
    return Decided(outcome, worst.verdict, worst.reason, worst, others)


def _favour(verdict: Verdict) -> tuple[int, float, float]:
    probability = 1.0 if verdict.probability is None else verdict.probability
    distance = math.inf if verdict.margin is None else verdict.margin
    return _ORDER.index(verdict.verdict), probability, distance


def _judge(candidate: Candidate, outcome: Outcome, decision: Decision) -> Verdict:
    if candidate.reason:
        return Verdict(candidate, "not judged", candidate.reason)
    if candidate.text is not None:
        return Verdict(
            candidate, "pass" if candidate.text_meets else "fail", "" if candidate.text_meets else _unlike(outcome)
        )
    if candidate.estimate is None:
        return Verdict(candidate, "not judged", "there is no value")
    if not math.isfinite(candidate.estimate.nominal):
        return Verdict(candidate, "not judged", "the value is not a finite number")
    if not _tells(candidate, candidate.estimate.nominal, outcome):
        return Verdict(candidate, "not judged", candidate.bound_reason)
    if candidate.estimate.unstated:
        return _judge_unstated(candidate, candidate.estimate, outcome, decision)
    return _judge_estimate(candidate, candidate.estimate, outcome, decision)


def _unlike(outcome: Outcome) -> str:
    return f"not {outcome.asked}" if outcome.asked else "not as required"


def _tells(candidate: Candidate, value: float, outcome: Outcome) -> bool:
    """Whether what is known of a value can decide: of a bound only what it already rules out."""
    if candidate.known == "at least":
        return not meets(value, None, outcome.high)
    if candidate.known == "at most":
        return not meets(value, outcome.low, None)
    return True


def _judge_unstated(candidate: Candidate, estimate: Estimate, outcome: Outcome, decision: Decision) -> Verdict:
    """A value without a known uncertainty: only the simple rule can judge it, and the finding says so."""
    missing = "uncertainty not stated: no accuracy is given for " + ", ".join(sorted(estimate.unstated))
    if decision.rule != "simple":
        return Verdict(candidate, "not judged", f"{missing}; give it under instruments:, or ± beside a lead resistance")
    inside = meets(estimate.nominal, outcome.low, outcome.high)
    distance = margin(estimate.nominal, outcome.low, outcome.high)
    return Verdict(candidate, "pass" if inside else "fail", missing, margin=distance)


def _judge_estimate(candidate: Candidate, estimate: Estimate, outcome: Outcome, decision: Decision) -> Verdict:
    value, low, high = estimate.nominal, outcome.low, outcome.high
    u = expanded(estimate.value, decision.confidence)
    impossible = _impossible(value, u, outcome)
    if impossible:
        return Verdict(candidate, "not judged", impossible)
    least, most = outcome.bounds
    freedom = u.degrees_of_freedom
    probability = conformity_probability(value, u.standard, low=least, high=most, degrees_of_freedom=freedom)
    inside = meets(value, low, high)
    verdict = verdict_of(probability, inside, decision)
    reason = _why(verdict, inside, probability, decision)
    if candidate.known != "value":
        reason = f"{reason}: the true value is {candidate.known} this ({candidate.bound_reason})"
    return Verdict(candidate, verdict, reason, u, probability, margin(value, low, high))


def _impossible(value: float, u: Expanded, outcome: Outcome) -> str:
    if outcome.characteristic == "efficiency" and value > 1 + u.expanded:
        return (
            f"an efficiency of {100 * value:.4g} % cannot be: more than 100 % by more than its uncertainty; "
            "see which column holds which quantity, in which unit, and how the meters are wired"
        )
    return ""


def _why(verdict: FindingVerdict, inside: bool, probability: float, decision: Decision) -> str:
    if verdict == "fail" and not inside:
        return "outside the limit"
    if verdict == "fail":
        return f"inside the limit, but not shown to conform (conformity {_percent(probability)})"
    if verdict == "conditional pass":
        return f"inside the limit, but by less than its uncertainty (conformity {_percent(probability)})"
    if verdict == "conditional fail":
        return f"outside the limit, but by less than its uncertainty (conformity {_percent(probability)})"
    return ""


def _percent(probability: float) -> str:
    return f"{100 * probability:.1f} %"


def unit_verdict(verdicts: Sequence[FindingVerdict]) -> UnitVerdict:
    """The unit's verdict: rejected when a finding fails, undecided when one is conditional or not judged.

    Without any finding nothing was shown, so the unit is undecided.
    """
    if "fail" in verdicts:
        return "rejected"
    return "accepted" if verdicts and all(verdict == "pass" for verdict in verdicts) else "undecided"


def joint_probability(decided: Sequence[Decided]) -> float | None:
    """Probability that all findings conform at once, from their probabilities and their covariance.

    A Gaussian copula: each finding's interval of conformity is carried to the normal, and those are drawn together
    with the correlation that the findings' shared errors give them. Findings that share nothing multiply.
    None when one is not judged or has no probability; findings in words count as certain when they pass.
    """
    bounds: list[tuple[float, float]] = []
    values: list[Any] = []
    for one in decided:
        if one.by is None or one.verdict == "not judged":
            return None
        if one.by.candidate.text is not None:
            if one.verdict == "fail":
                return 0.0
            continue
        if one.by.probability is None or one.by.expanded is None or one.by.candidate.estimate is None:
            return None
        if one.by.probability >= 1 - _CERTAIN:
            continue
        bounds.append(_normal_bounds(one))
        values.append(one.by.candidate.estimate.value)
    return _probability_within(bounds, values)


def _normal_bounds(one: Decided) -> tuple[float, float]:
    """Where a standard normal must lie for the finding to conform."""
    assert one.by is not None
    assert one.by.expanded is not None
    assert one.by.candidate.estimate is not None
    u, value = one.by.expanded, nominal(one.by.candidate.estimate.value)
    if u.standard <= 0:
        return (-math.inf, math.inf) if one.by.probability else (math.inf, math.inf)
    low, high = one.outcome.bounds
    return (
        -math.inf if low is None else float(ndtri(_below((low - value) / u.standard, u.degrees_of_freedom))),
        math.inf if high is None else float(ndtri(_below((high - value) / u.standard, u.degrees_of_freedom))),
    )


def _probability_within(bounds: Sequence[tuple[float, float]], values: Sequence[Any]) -> float:
    """Probability that correlated standard normals lie within their bounds."""
    if not bounds:
        return 1.0
    low, high = np.array(bounds).T
    alone = _normal(high) - _normal(low)
    matrix = covariance(values)
    deviation = np.sqrt(np.diag(matrix))
    scale = np.where(deviation > 0, deviation, 1.0)
    correlation = matrix / np.outer(scale, scale)
    np.fill_diagonal(correlation, 1.0)
    if np.abs(correlation - np.eye(len(bounds))).max() < 1e-6:
        return float(np.prod(alone))
    drawn = np.random.default_rng(_SEED).standard_normal((_DRAWS, len(bounds))) @ _root(correlation).T
    inside = np.all((drawn >= low) & (drawn <= high), axis=1)
    # never above the least of them, nor below what they leave of one another
    return float(np.clip(inside.mean(), max(0.0, 1 - (1 - alone).sum()), alone.min()))


def _normal(x: NDArray[np.float64]) -> NDArray[np.float64]:
    probabilities: NDArray[np.float64] = ndtr(x)
    return probabilities


def _root(correlation: NDArray[np.float64]) -> NDArray[np.float64]:
    """A matrix whose square is the correlation, also where findings are one and the same value."""
    eigenvalues, vectors = np.linalg.eigh(correlation)
    # below zero only by rounding: a correlation matrix has none
    root: NDArray[np.float64] = vectors * np.sqrt(np.clip(eigenvalues, 0.0, None))
    return root
