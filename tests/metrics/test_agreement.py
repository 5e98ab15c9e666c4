"""Calibration of twenty people; by R (glm, rms), scikit-learn and by hand."""

import numpy as np
import pytest
from sklearn.linear_model import LogisticRegression

from panelkit.metrics import (
    brier,
    calibration_in_the_large,
    observed_over_expected,
    recalibration,
    scaled_brier,
    spiegelhalter_z,
)

TEXT = "5 10 10 15 20 20 25 30 35 40 45 50 55 60 65 70 75 80 90 95"
P = np.array(TEXT.split(), float) / 100
Y = np.array([0, 0, 0, 0, 1, 0, 0, 0, 1, 0, 1, 0, 1, 1, 0, 1, 1, 1, 1, 1], float)
LOG_ODDS = np.log(P / (1 - P))


def test_in_the_large_holds_the_slope_at_one():
    """R: glm(y ~ offset(qlogis(p)), binomial); statsmodels 0.15.0 agrees."""
    assert calibration_in_the_large(LOG_ODDS, Y) == pytest.approx(
        (0.3020518955, 0.5349267756), abs=5e-11
    )


def test_slope_and_joint_intercept():
    """R: rms::val.prob prints these two; the intercept is the joint one."""
    found = recalibration(LOG_ODDS, Y)
    assert found.slope == pytest.approx(1.4524281866, abs=5e-11)
    assert found.intercept == pytest.approx(0.4546004777, abs=5e-11)
    assert found.slope_se == pytest.approx(0.6399759444, abs=5e-10)
    peer = LogisticRegression(C=np.inf, tol=1e-12, max_iter=1000)
    peer.fit(LOG_ODDS[:, None], Y)
    assert found.slope == pytest.approx(peer.coef_[0, 0], abs=1e-6)
    assert found.intercept == pytest.approx(peer.intercept_[0], abs=1e-6)


def test_brier_ratio_and_deviate():
    """By hand; Spiegelhalter's z is that of rms::val.prob."""
    assert brier(P, Y) == pytest.approx(0.150125)
    assert scaled_brier(P, Y) == pytest.approx(0.3995)
    ratio = observed_over_expected(P, Y, 0.95)
    assert ratio == pytest.approx((1.1173184358, 0.7208460340, 1.7318545542), abs=5e-11)
    assert spiegelhalter_z(P, Y) == pytest.approx(-0.5277184838, abs=5e-11)


def test_weights_are_repeated_rows():
    repeats = np.array([1, 2] * 10)
    weighted = calibration_in_the_large(LOG_ODDS, Y, repeats.astype(float))[0]
    rows = np.repeat(np.arange(20), repeats)
    assert weighted == pytest.approx(
        calibration_in_the_large(LOG_ODDS[rows], Y[rows])[0]
    )


def test_what_is_not_defined():
    ones = np.ones(20)
    assert np.isnan(calibration_in_the_large(LOG_ODDS, ones)).all()
    assert np.isnan(recalibration(np.zeros(20), Y).slope)
    assert np.isnan(scaled_brier(P, ones))
    assert np.isnan(spiegelhalter_z(np.full(20, 0.5), Y))
    assert observed_over_expected(P, np.zeros(20), 0.95)[0] == 0.0
