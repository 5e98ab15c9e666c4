"""Net benefit, thresholds, and figures of predicted numbers."""

import numpy as np
import pytest
from sklearn.metrics import balanced_accuracy_score, r2_score

from panelkit.errors import UsageError
from panelkit.metrics import (
    balanced_accuracy,
    best_threshold,
    linear_slope,
    net_benefit,
    r_squared,
    root_mean_square,
)

# fmt: off
CHANCES = np.array([
    0.05, 0.10, 0.10, 0.15, 0.20, 0.20, 0.25, 0.30, 0.35, 0.40,
    0.45, 0.50, 0.55, 0.60, 0.65, 0.70, 0.75, 0.80, 0.90, 0.95,
])
OUTCOME = np.array(
    [0, 0, 0, 0, 1, 0, 0, 0, 1, 0, 1, 0, 1, 1, 0, 1, 1, 1, 1, 1], float
)
# fmt: on


@pytest.mark.parametrize(
    ("threshold", "expected"),
    [(0.1, 0.45), (0.2, 0.425), (0.3, 0.3642857143), (0.5, 0.25), (0.7, 0.25)],
)
def test_net_benefit_by_hand(threshold, expected):
    # counts of true and false positives by hand; Vickers & Elkin 2006
    assert net_benefit(CHANCES, OUTCOME, threshold) == pytest.approx(
        expected, abs=1e-10
    )


def test_treating_everybody():
    everybody = np.ones(20)
    assert net_benefit(everybody, OUTCOME, 0.7) == pytest.approx(-2 / 3)
    with pytest.raises(UsageError, match="above 0 and below 1"):
        net_benefit(CHANCES, OUTCOME, 1.0)


def test_balanced_accuracy_against_scikit_learn():
    found = balanced_accuracy(CHANCES, OUTCOME, 0.4)
    assert found == pytest.approx(balanced_accuracy_score(OUTCOME, CHANCES >= 0.4))


def test_best_threshold_beats_every_other():
    best = best_threshold(CHANCES, OUTCOME)
    reached = balanced_accuracy(CHANCES, OUTCOME, best)
    tried = np.linspace(0.0, 1.0, 201)
    assert reached == max(balanced_accuracy(CHANCES, OUTCOME, c) for c in tried)


def test_r_squared_against_scikit_learn():
    draws = np.random.default_rng(0)
    outcome = draws.normal(size=30)
    predicted = outcome + draws.normal(size=30)
    value, influence = r_squared(predicted, outcome, float(outcome.mean()))
    assert value == pytest.approx(r2_score(outcome, predicted))
    assert influence.sum() == pytest.approx(0.0, abs=1e-14)
    share = np.ones(30)
    for i in (0, 7, 29):
        more = share.copy()
        more[i] += 1e-6
        change = r_squared(predicted, outcome, float(outcome.mean()), more)[0] - value
        assert influence[i] == pytest.approx(change / 1e-6, abs=1e-5)
    assert root_mean_square(predicted, outcome) == pytest.approx(
        np.sqrt(((predicted - outcome) ** 2).mean())
    )


def test_slope_is_that_of_least_squares():
    draws = np.random.default_rng(1)
    predicted = draws.normal(size=25)
    outcome = 0.5 * predicted + draws.normal(size=25)
    assert linear_slope(predicted, outcome) == pytest.approx(
        np.polyfit(predicted, outcome, 1)[0]
    )
    assert np.isnan(linear_slope(np.ones(25), outcome))
