"""Predicted chances against what happened: intercept, slope, ratios, one test."""

from dataclasses import dataclass
from math import exp, sqrt
from statistics import NormalDist

import numpy as np
from numpy.typing import NDArray

from panelkit.metrics.calibration import calibration_slope

__all__ = [
    "Recalibration",
    "calibration_in_the_large",
    "observed_over_expected",
    "recalibration",
    "scaled_brier",
    "spiegelhalter_z",
]

STEPS = 200


def _chances(log_odds: NDArray[np.float64]) -> NDArray[np.float64]:
    return np.asarray(1.0 / (1.0 + np.exp(-np.clip(log_odds, -500.0, 500.0))))


@dataclass(frozen=True, slots=True)
class Recalibration:
    """Logistic regression of the outcome on predicted log-odds.

    Attributes
    ----------
    intercept, slope : float
        Fitted together; NaN where undefined. The intercept is not
        calibration-in-the-large, which holds the slope at 1.
    intercept_se, slope_se : float
        Standard errors, samples independent.
    """

    intercept: float
    slope: float
    intercept_se: float
    slope_se: float


def calibration_in_the_large(
    log_odds: NDArray[np.float64],
    outcome: NDArray[np.float64],
    weights: NDArray[np.float64] | None = None,
) -> tuple[float, float]:
    """Return the intercept that makes predictions right on average, slope held at 1.

    Parameters
    ----------
    log_odds, outcome : ndarray of shape (n_samples,)
        Predictions; 0 and 1.
    weights : ndarray of shape (n_samples,), optional
        Observation weights; the standard error takes their mean as 1.

    Returns
    -------
    intercept, se : float
        0 for predictions that are right on average, above 0 for too low ones; NaN for
        one class.

    References
    ----------
    Cox 1958, Biometrika 45:562; Steyerberg 2019, Clinical Prediction Models, 15.
    """
    if np.ptp(outcome) == 0.0:
        return float("nan"), float("nan")
    w = np.ones(len(outcome)) if weights is None else weights / weights.mean()
    # between these ends the mean prediction passes the share of cases
    low = -float(np.abs(log_odds).max()) - 50.0
    high = -low
    for _step in range(STEPS):
        middle = 0.5 * (low + high)
        excess = float((w * (outcome - _chances(log_odds + middle))).sum())
        low, high = (middle, high) if excess > 0.0 else (low, middle)
    intercept = 0.5 * (low + high)
    p = _chances(log_odds + intercept)
    return intercept, 1.0 / sqrt(float((w * p * (1.0 - p)).sum()))


def recalibration(
    log_odds: NDArray[np.float64],
    outcome: NDArray[np.float64],
    weights: NDArray[np.float64] | None = None,
) -> Recalibration:
    """Return intercept and slope of the outcome on predicted log-odds.

    Parameters
    ----------
    log_odds, outcome, weights
        As for `calibration_in_the_large`.

    Returns
    -------
    Recalibration
        Slope 1 and intercept 0 for chances that can be taken at their word.

    References
    ----------
    Cox 1958, Biometrika 45:562.
    """
    slope = calibration_slope(log_odds, outcome, weights)
    if not np.isfinite(slope):
        nothing = float("nan")
        return Recalibration(nothing, nothing, nothing, nothing)
    intercept, _se = calibration_in_the_large(slope * log_odds, outcome, weights)
    p = _chances(intercept + slope * log_odds)
    w = np.ones(len(outcome)) if weights is None else weights / weights.mean()
    h = w * p * (1.0 - p)
    a, b, c = h.sum(), (h * log_odds).sum(), (h * log_odds**2).sum()
    determinant = float(a * c - b * b)
    return Recalibration(
        intercept, slope, sqrt(float(c) / determinant), sqrt(float(a) / determinant)
    )


def observed_over_expected(
    chances: NDArray[np.float64], outcome: NDArray[np.float64], confidence: float
) -> tuple[float, float, float]:
    """Return observed over expected cases.

    Parameters
    ----------
    chances, outcome : ndarray of shape (n_samples,)
        Predictions; 0 and 1.
    confidence : float
        For example 0.95.

    Returns
    -------
    ratio, low, high : float
        Interval on the logarithm, of the observed share alone; NaN without a case.

    References
    ----------
    Debray et al. 2017, BMJ 356:i6460 (ln O:E and its standard error).
    """
    share, n = float(outcome.mean()), len(outcome)
    if share == 0.0:
        return 0.0, float("nan"), float("nan")
    ratio = share / float(chances.mean())
    z = NormalDist().inv_cdf(0.5 + 0.5 * confidence)
    half = z * sqrt((1.0 - share) / (n * share))
    return ratio, ratio * exp(-half), ratio * exp(half)


def spiegelhalter_z(
    chances: NDArray[np.float64], outcome: NDArray[np.float64]
) -> float:
    """Return the normal deviate of the Brier score from what it ought to be.

    Parameters
    ----------
    chances, outcome : ndarray of shape (n_samples,)
        Predictions; 0 and 1.

    Returns
    -------
    float
        About standard normal for calibrated chances; NaN where all are 0, 0.5 or 1.

    References
    ----------
    Spiegelhalter 1986, Stat Med 5:421.
    """
    lean = 1.0 - 2.0 * chances
    variance = float((lean**2 * chances * (1.0 - chances)).sum())
    if not variance > 0.0:
        return float("nan")
    return float(((outcome - chances) * lean).sum() / sqrt(variance))


def scaled_brier(chances: NDArray[np.float64], outcome: NDArray[np.float64]) -> float:
    """Return the share of the Brier score that is removed, against the mean alone.

    Parameters
    ----------
    chances, outcome : ndarray of shape (n_samples,)
        Predictions; 0 and 1.

    Returns
    -------
    float
        At most 1; NaN for one class.

    References
    ----------
    Steyerberg et al. 2010, Epidemiology 21:128.
    """
    share = float(outcome.mean())
    if share in (0.0, 1.0):
        return float("nan")
    miss = float(((chances - outcome) ** 2).mean())
    return 1.0 - miss / (share * (1.0 - share))
