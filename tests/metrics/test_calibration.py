"""Brier score, log loss and calibration slope."""

import numpy as np
import pytest
from sklearn.linear_model import LogisticRegression
from sklearn.metrics import log_loss as sklearn_log_loss

from panelkit.metrics import auc, brier, calibration_slope, log_loss

# twenty predictions: Brier exact; log loss scikit-learn 1.9.1; slope of Cox 1958,
# Biometrika 45:562, computed with statsmodels 0.15.0 and R 4.2.2 glm
CHANCES = np.array(
    [5, 10, 10, 15, 20, 20, 25, 30, 35, 40, 45, 50, 55, 60, 65, 70, 75, 80, 90, 95]
) / 100.0  # fmt: skip
OUTCOME = np.array([0, 0, 0, 0, 1, 0, 0, 0, 1, 0, 1, 0, 1, 1, 0, 1, 1, 1, 1, 1], float)
LOG_ODDS = np.log(CHANCES / (1.0 - CHANCES))


def test_figures_of_twenty_predictions():
    assert brier(CHANCES, OUTCOME) == pytest.approx(0.150125, abs=1e-15)
    assert log_loss(LOG_ODDS, OUTCOME) == pytest.approx(0.4568206744, abs=1e-10)
    assert calibration_slope(LOG_ODDS, OUTCOME) == pytest.approx(1.4524281866, abs=1e-9)
    assert auc(LOG_ODDS, OUTCOME) == 0.875


def test_log_loss_with_weights_equals_scikit_learn():
    weights = np.random.default_rng(0).uniform(0.5, 2.0, 20)
    expected = sklearn_log_loss(OUTCOME, CHANCES, sample_weight=weights)
    assert log_loss(LOG_ODDS, OUTCOME, weights) == pytest.approx(expected)


def test_log_loss_of_certain_predictions_is_finite_where_they_are_right():
    sure = np.array([800.0, -800.0])
    assert log_loss(sure, np.array([1.0, 0.0])) == 0.0
    assert log_loss(sure, np.array([0.0, 1.0])) == 800.0


def test_weights_stand_for_repeated_predictions():
    times = np.random.default_rng(1).integers(1, 5, 20)
    assert log_loss(LOG_ODDS, OUTCOME, times) == pytest.approx(
        log_loss(np.repeat(LOG_ODDS, times), np.repeat(OUTCOME, times))
    )


@pytest.mark.parametrize("seed", range(4))
def test_slope_equals_unpenalised_regression(seed):
    draws = np.random.default_rng(seed)
    log_odds = draws.normal(0.5, 2.0, 120)
    outcome = (draws.random(120) < 1 / (1 + np.exp(-0.4 * log_odds))).astype(float)
    model = LogisticRegression(C=np.inf, tol=1e-12, max_iter=1000)
    expected = model.fit(log_odds[:, None], outcome).coef_[0, 0]
    assert calibration_slope(log_odds, outcome) == pytest.approx(expected, rel=1e-5)


def test_slope_shrinks_as_predictions_are_stretched():
    # exact: y on c x has 1 / c times the slope of y on x
    slope = calibration_slope(LOG_ODDS, OUTCOME)
    for factor in (0.01, 3.0, 1e4):
        assert calibration_slope(factor * LOG_ODDS, OUTCOME) == pytest.approx(
            slope / factor, rel=1e-8
        )
    assert calibration_slope(LOG_ODDS + 100.0, OUTCOME) == pytest.approx(slope)
    assert calibration_slope(-LOG_ODDS, OUTCOME) == pytest.approx(-slope)


@pytest.mark.parametrize(
    ("log_odds", "outcome"),
    [
        ([1.0, 2.0, 3.0], [1.0, 1.0, 1.0]),
        ([1.0, 1.0, 1.0], [1.0, 0.0, 1.0]),
        ([1.0, 2.0, 3.0, 4.0], [0.0, 0.0, 1.0, 1.0]),
        ([1.0, 2.0, 3.0, 4.0], [1.0, 1.0, 0.0, 0.0]),
        ([1.0, 2.0, 2.0, 3.0], [0.0, 0.0, 1.0, 1.0]),  # separated but for a tie
        ([0.0, 0.0, 1.0], [0.0, 1.0, 1.0]),
        ([-1e6, 0.0, 0.0, 1e6], [0.0, 0.0, 1.0, 1.0]),
    ],
    ids=["one class", "constant", "apart", "reversed", "tie", "half tie", "far"],
)
def test_slope_is_nan_where_it_is_undefined(log_odds, outcome):
    assert np.isnan(calibration_slope(np.array(log_odds), np.array(outcome)))
