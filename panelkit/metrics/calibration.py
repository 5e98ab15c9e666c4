"""Whether predicted chances can be taken at their word."""

import numpy as np
from numpy.typing import NDArray

__all__ = ["brier", "calibration_slope", "log_loss"]


def log_loss(
    log_odds: NDArray[np.float64],
    outcome: NDArray[np.float64],
    weights: NDArray[np.float64] | None = None,
) -> float:
    """Return the mean negative log-likelihood of predicted log-odds.

    Parameters
    ----------
    log_odds, outcome : ndarray of shape (n_samples,)
        Predictions; 0 and 1.
    weights : ndarray of shape (n_samples,), optional
        Observation weights.

    Returns
    -------
    float
        In nats.
    """
    loss = np.logaddexp(0.0, log_odds) - outcome * log_odds
    return float(np.average(loss, weights=weights))


def brier(chances: NDArray[np.float64], outcome: NDArray[np.float64]) -> float:
    """Return the mean squared difference of predicted chance and outcome.

    References
    ----------
    Brier 1950, Monthly Weather Review 78:1.
    """
    return float(((chances - outcome) ** 2).mean())


def calibration_slope(
    log_odds: NDArray[np.float64],
    outcome: NDArray[np.float64],
    weights: NDArray[np.float64] | None = None,
) -> float:
    """Return the slope of a logistic regression of the outcome on the log-odds.

    Parameters
    ----------
    log_odds, outcome : ndarray of shape (n_samples,)
        Out-of-fold predictions; 0 and 1.
    weights : ndarray of shape (n_samples,), optional
        Observation weights.

    Returns
    -------
    float
        1 for well calibrated, below 1 for over-confident predictions; NaN where it
        is undefined (one class, constant or separating predictions).

    References
    ----------
    Cox 1958, Biometrika 45:562.
    """
    flat = np.ptp(log_odds) < 1e-8 * max(1.0, float(np.abs(log_odds).max()))
    if np.ptp(outcome) == 0.0 or flat:
        return float("nan")
    if _separates(log_odds, outcome):
        return float("nan")
    centre = log_odds.mean()
    x = log_odds - centre
    w = np.ones(len(outcome)) if weights is None else weights * len(weights)
    w = w / w.mean()
    share = float(np.average(outcome, weights=w))
    intercept, slope = float(np.log(share / (1.0 - share))), 0.0
    for _step in range(100):
        p = 1.0 / (1.0 + np.exp(-np.clip(intercept + slope * x, -500.0, 500.0)))
        h = w * np.maximum(p * (1.0 - p), 1e-12)
        r = w * (outcome - p)
        a, b, c = h.sum(), (h * x).sum(), (h * x * x).sum()
        g0, g1 = r.sum(), (r * x).sum()
        determinant = a * c - b * b
        if not determinant > 0.0:
            return float("nan")
        step0 = (c * g0 - b * g1) / determinant
        step1 = (a * g1 - b * g0) / determinant
        longest = max(abs(step0), abs(step1) * float(np.abs(x).max()))
        damped = min(1.0, 5.0 / longest) if longest > 0.0 else 1.0
        intercept += damped * step0
        slope += damped * step1
        if longest < 1e-11:
            return float(slope)
    return float("nan")


def _separates(log_odds: NDArray[np.float64], outcome: NDArray[np.float64]) -> bool:
    cases, controls = log_odds[outcome == 1.0], log_odds[outcome == 0.0]
    return bool(cases.min() > controls.max() or cases.max() < controls.min())
