"""Cut-offs on out-of-fold chances: what was asked for, and what the counts support."""

import math
from dataclasses import dataclass
from typing import Final

import numpy as np
from numpy.typing import NDArray

from panelkit.config import LOCK
from panelkit.errors import UsageError
from panelkit.metrics import (
    lower_limit,
    needed_without_a_miss,
    predictive_values,
)
from panelkit.records import CutOff

__all__ = ["CutOffRule", "Judged", "choose_cutoff", "cutoff_rule"]

KINDS: Final = (
    "sensitivity",
    "sensitivity-lower-limit",
    "specificity",
    "specificity-lower-limit",
    "youden",
    "net-benefit",
)
EDGE: Final = 1e-9  # beyond the outermost scores


@dataclass(frozen=True, slots=True)
class CutOffRule:
    """What a cut-off is to reach.

    Attributes
    ----------
    kind : str
        One of `KINDS`.
    value : float
        The target, or the chance from which one would act; NaN for ``youden``.
    """

    kind: str
    value: float

    @property
    def name(self) -> str:
        """As it is written."""
        return self.kind if math.isnan(self.value) else f"{self.kind}={self.value:g}"


def cutoff_rule(text: str) -> CutOffRule:
    """Return the rule that a text asks for.

    Parameters
    ----------
    text : str
        ``youden``, or a kind with its value, for example ``sensitivity=0.9``.

    Returns
    -------
    CutOffRule
        The rule.

    Raises
    ------
    UsageError
        Another kind, or no chance behind it.
    """
    kind, _equals, value = text.partition("=")
    try:
        number = float("nan") if kind == "youden" and not value else float(value)
    except ValueError:
        number = -1.0
    fine = math.isnan(number) if kind == "youden" else 0.0 < number < 1.0
    if kind not in KINDS or not fine:
        raise UsageError(
            code="cutoff-unknown",
            where="cut-off",
            what=f"it cannot be meant (got {text!r})",
            accepted="youden, or sensitivity, sensitivity-lower-limit, specificity, "
            "specificity-lower-limit or net-benefit with =VALUE between 0 and 1",
            next_step="Write for example sensitivity=0.9",
        )
    return CutOffRule(kind, number)


@dataclass(frozen=True, slots=True, eq=False)
class Judged:
    """Out-of-fold chances and who they belong to.

    Attributes
    ----------
    log_odds : ndarray of shape (n_repeats, n_samples)
        Recalibrated.
    outcome : ndarray of shape (n_samples,)
        0 and 1.
    weights : ndarray of shape (n_samples,)
        1 / samples of the subject.
    subjects : ndarray of shape (n_samples,), int64
        Codes.
    prevalence : float
        Of the people that the test is meant for; NaN where it is not stated.
    assay_deviation : float
        Standard deviation of the log-odds from assay error; 0 where not stated.
    draws : numpy.random.Generator
        For the bootstrap.
    """

    log_odds: NDArray[np.float64]
    outcome: NDArray[np.float64]
    weights: NDArray[np.float64]
    subjects: NDArray[np.int64]
    prevalence: float
    assay_deviation: float
    draws: np.random.Generator

    def people(self, value: float) -> int:
        """Return the number of subjects of a class."""
        return len(np.unique(self.subjects[self.outcome == value]))


class _Curve:
    """Sensitivity and specificity at every possible cut-off, for any weights."""

    def __init__(self, judged: Judged) -> None:
        flat = judged.log_odds.ravel()
        self.values, place = np.unique(flat, return_inverse=True)
        self.place = place.ravel()
        self.case = np.tile(judged.outcome == 1.0, len(judged.log_odds))
        self.repeats = len(judged.log_odds)
        between = 0.5 * (self.values[1:] + self.values[:-1])
        ends = self.values[0] - EDGE, self.values[-1] + EDGE
        self.cuts = np.concatenate([[ends[0]], between, [ends[1]]])

    def rates(
        self, weights: NDArray[np.float64]
    ) -> tuple[NDArray[np.float64], NDArray[np.float64]]:
        """Return sensitivity and specificity from each cut-off on."""
        w = np.tile(weights, self.repeats)
        n = len(self.values)
        below = [
            np.concatenate([[0.0], np.cumsum(np.bincount(self.place[own], w[own], n))])
            / w[own].sum()
            for own in (self.case, ~self.case)
        ]
        return 1.0 - below[0], below[1]


def choose_cutoff(rule: CutOffRule, judged: Judged) -> CutOff:
    """Return the cut-off that a rule asks for.

    Parameters
    ----------
    rule : CutOffRule
        From `cutoff_rule`.
    judged : Judged
        Out-of-fold chances.

    Returns
    -------
    CutOff
        With bootstrap intervals over subjects, drawn within classes.

    Raises
    ------
    UsageError
        A target that the number of people cannot support.
    """
    _refuse_infeasible(rule, judged)
    curve = _Curve(judged)
    sensitivity, specificity = curve.rates(judged.weights)
    at = _place(rule, judged, curve, sensitivity, specificity)
    cut = _cut(rule, curve, at)
    again = [_again(rule, judged, curve, weights) for weights in _resamples(judged)]
    cuts, sens, spec = np.array(again).T
    alpha = 0.5 * (1.0 - LOCK.confidence)
    ends = (alpha, 1.0 - alpha)
    spread = float(np.hypot(cuts.std(ddof=1), judged.assay_deviation))
    half = LOCK.grey_deviations * spread
    values = (float("nan"), float("nan"))
    share = judged.prevalence
    if not math.isnan(share):
        values = predictive_values(sensitivity[at], specificity[at], share)
    else:
        share = float(np.average(judged.outcome, weights=judged.weights))
    chance = _chance(cut)
    odds = chance / (1.0 - chance)
    benefit = sensitivity[at] * share - (1.0 - specificity[at]) * (1.0 - share) * odds
    low, high = np.quantile(cuts, ends)
    return CutOff(
        name=rule.name,
        chance=chance,
        log_odds=cut,
        chance_low=_chance(float(low)),
        chance_high=_chance(float(high)),
        grey_low=_chance(cut - half),
        grey_high=_chance(cut + half),
        sensitivity=float(sensitivity[at]),
        sensitivity_low=float(np.quantile(sens, ends[0])),
        sensitivity_high=float(np.quantile(sens, ends[1])),
        specificity=float(specificity[at]),
        specificity_low=float(np.quantile(spec, ends[0])),
        specificity_high=float(np.quantile(spec, ends[1])),
        positive_value=float(values[0]),
        negative_value=float(values[1]),
        prevalence=judged.prevalence,
        net_benefit=float(benefit),
        sentence=f"Positive from a chance of {chance:.3g} on ({rule.name}): out of "
        f"fold sensitivity {sensitivity[at]:.3g}, specificity {specificity[at]:.3g}; "
        "it was chosen on these same predictions, so expect less of both together.",
    )


def _refuse_infeasible(rule: CutOffRule, judged: Judged) -> None:
    """Refuse a lower limit that not even a perfect result would reach."""
    if not rule.kind.endswith("-lower-limit"):
        return
    case = rule.kind.startswith("sensitivity")
    there = judged.people(1.0 if case else 0.0)
    needed = needed_without_a_miss(rule.value, LOCK.confidence)
    if there < needed:
        who = "cases" if case else "controls"
        raise UsageError(
            code="cutoff-infeasible",
            where=f"cut-off {rule.name}",
            what=f"{there} {who} cannot show it: even without a single miss "
            f"{needed} are needed for a {100 * LOCK.confidence:g} % lower limit of "
            f"{rule.value:g}",
            accepted=f"at least {needed} {who}, or a lower target",
            next_step="Ask for a point target such as "
            f"{rule.kind.removesuffix('-lower-limit')}={rule.value:g}, or recruit more",
        )


def _place(
    rule: CutOffRule,
    judged: Judged,
    curve: _Curve,
    sensitivity: NDArray[np.float64],
    specificity: NDArray[np.float64],
) -> int:
    """Return which cut-off the rule takes; cut-offs ascend."""
    if rule.kind == "youden":
        return int((sensitivity + specificity).round(12).argmax())
    if rule.kind == "net-benefit":
        aim = math.log(rule.value / (1.0 - rule.value))
        return int(np.searchsorted(curve.values, aim))
    of_cases = rule.kind.startswith("sensitivity")
    rate = sensitivity if of_cases else specificity
    if rule.kind.endswith("-lower-limit"):
        n = judged.people(1.0 if of_cases else 0.0)
        hits, which = np.unique(np.floor(rate * n + 1e-9), return_inverse=True)
        limits = [lower_limit(hit, n, LOCK.confidence) for hit in hits.tolist()]
        rate = np.array(limits)[which]
    # the outermost cut-offs call everybody the same: each target is reached by one
    good = np.flatnonzero(rate >= rule.value - 1e-12)
    return int(good[-1] if of_cases else good[0])


def _cut(rule: CutOffRule, curve: _Curve, at: int) -> float:
    if rule.kind == "net-benefit":  # the chance itself, not the next score
        return math.log(rule.value / (1.0 - rule.value))
    return float(curve.cuts[at])


def _again(
    rule: CutOffRule, judged: Judged, curve: _Curve, weights: NDArray[np.float64]
) -> tuple[float, float, float]:
    sensitivity, specificity = curve.rates(weights)
    at = _place(rule, judged, curve, sensitivity, specificity)
    return _cut(rule, curve, at), sensitivity[at], specificity[at]


def _resamples(judged: Judged) -> list[NDArray[np.float64]]:
    """Return weights of the samples when subjects are drawn again within classes."""
    found = []
    classes = [np.unique(judged.subjects[judged.outcome == v]) for v in (0.0, 1.0)]
    highest = int(judged.subjects.max()) + 1
    for _draw in range(LOCK.bootstrap):
        counts = np.zeros(highest)
        for people in classes:
            drawn = judged.draws.choice(people, len(people))
            counts += np.bincount(drawn, minlength=highest)
        found.append(judged.weights * counts[judged.subjects])
    return found


def _chance(log_odds: float) -> float:
    return float(1.0 / (1.0 + math.exp(-min(max(log_odds, -700.0), 700.0))))
