"""Cut-offs: what was asked for is reached, and what cannot be is refused."""

import math

import numpy as np
import pytest
from sklearn.metrics import roc_curve

from panelkit.errors import UsageError
from panelkit.lock.cutoffs import Judged, choose_cutoff, cutoff_rule
from panelkit.metrics import lower_limit, net_benefit, predictive_values


def judged(n=200, repeats=2, seed=0, prevalence=float("nan"), assay=0.0):
    draws = np.random.default_rng(seed)
    y = (np.arange(n) % 2).astype(float)
    scores = 1.5 * y - 0.75 + draws.normal(size=(repeats, n))
    return Judged(
        scores, y, np.full(n, 1 / n), np.arange(n), prevalence, assay,
        np.random.default_rng(1),
    )  # fmt: skip


def rates(seen, cut):
    positive = seen.log_odds >= cut
    case = seen.outcome == 1.0
    return positive[:, case].mean(), (~positive[:, ~case]).mean()


@pytest.mark.parametrize("target", [0.5, 0.8, 0.9, 0.95])
@pytest.mark.parametrize("kind", ["sensitivity", "specificity"])
def test_targets_are_reached_and_no_more_is_given_away(kind, target):
    seen = judged()
    cut = choose_cutoff(cutoff_rule(f"{kind}={target}"), seen)
    sensitivity, specificity = rates(seen, cut.log_odds)
    assert (cut.sensitivity, cut.specificity) == pytest.approx(
        (sensitivity, specificity)
    )
    own = {"sensitivity": sensitivity, "specificity": specificity}[kind]
    assert target - 1e-12 <= own < target + 0.011  # 200 cases: steps of 0.005
    assert cut.chance_low <= cut.chance <= cut.chance_high
    assert cut.grey_low < cut.chance < cut.grey_high


def test_youden_is_that_of_scikit_learn():
    seen = judged(repeats=1)
    cut = choose_cutoff(cutoff_rule("youden"), seen)
    alarms, hits, _cuts = roc_curve(seen.outcome, seen.log_odds[0])
    best = (hits - alarms).max()
    assert cut.sensitivity + cut.specificity - 1.0 == pytest.approx(best)


def test_lower_limits_hold_by_the_exact_interval():
    seen = judged(repeats=1)
    cut = choose_cutoff(cutoff_rule("sensitivity-lower-limit=0.9"), seen)
    hits = round(cut.sensitivity * 100)
    assert lower_limit(hits, 100, 0.95) >= 0.9
    assert lower_limit(hits - 1, 100, 0.95) < 0.9


def test_what_counts_cannot_support_is_refused_with_the_number_needed():
    """0.95 ** 59 < 0.05: 59 people without a miss, arithmetic."""
    rule = cutoff_rule("sensitivity-lower-limit=0.95")
    with pytest.raises(UsageError, match=r"58 cases .* 59 are needed"):
        choose_cutoff(rule, judged(n=116))
    assert choose_cutoff(rule, judged(n=118)).sensitivity == 1.0
    with pytest.raises(UsageError, match="controls"):
        choose_cutoff(cutoff_rule("specificity-lower-limit=0.99"), judged())


def test_net_benefit_acts_on_the_chance_itself():
    seen = judged(repeats=1)
    cut = choose_cutoff(cutoff_rule("net-benefit=0.2"), seen)
    assert cut.chance == pytest.approx(0.2)
    chances = 1 / (1 + np.exp(-seen.log_odds[0]))
    assert cut.net_benefit == pytest.approx(net_benefit(chances, seen.outcome, 0.2))


def test_predictive_values_need_a_prevalence():
    assert math.isnan(choose_cutoff(cutoff_rule("youden"), judged()).positive_value)
    cut = choose_cutoff(cutoff_rule("youden"), judged(prevalence=0.05))
    assert (cut.positive_value, cut.negative_value) == pytest.approx(
        predictive_values(cut.sensitivity, cut.specificity, 0.05)
    )
    assert cut.prevalence == 0.05


def test_assay_error_widens_the_grey_zone():
    plain = choose_cutoff(cutoff_rule("youden"), judged())
    wide = choose_cutoff(cutoff_rule("youden"), judged(assay=2.0))
    assert wide.chance == plain.chance
    assert wide.grey_low < plain.grey_low
    assert wide.grey_high > plain.grey_high


def test_subjects_are_drawn_whole():
    """A copy of every sample under the same subject changes no interval much."""
    one = judged(repeats=1)
    twice = Judged(
        np.tile(one.log_odds, 2), np.tile(one.outcome, 2), np.tile(one.weights, 2) / 2,
        np.tile(one.subjects, 2), one.prevalence, 0.0, np.random.default_rng(1),
    )  # fmt: skip
    rule = cutoff_rule("sensitivity=0.9")
    assert choose_cutoff(rule, twice).chance_low == pytest.approx(
        choose_cutoff(rule, one).chance_low
    )


@pytest.mark.parametrize(
    "text", ["", "best", "sensitivity", "sensitivity=1", "sensitivity=x", "youden=0.5"]
)
def test_other_words_are_refused(text):
    with pytest.raises(UsageError, match="cannot be meant"):
        cutoff_rule(text)
