"""How close predicted numbers come to measured ones."""

import numpy as np
from numpy.typing import NDArray

__all__ = ["linear_slope", "r_squared", "root_mean_square"]


def r_squared(
    predicted: NDArray[np.float64],
    outcome: NDArray[np.float64],
    centre: float,
    weights: NDArray[np.float64] | None = None,
) -> tuple[float, NDArray[np.float64]]:
    """Return the share of squared error that predictions remove, and influences.

    Parameters
    ----------
    predicted, outcome : ndarray of shape (n_samples,)
        Predictions for samples that taught nothing, and what was measured.
    centre : float
        What would be predicted without any feature: the training samples' mean.
    weights : ndarray of shape (n_samples,), optional
        Observation weights.

    Returns
    -------
    share : float
        At most 1; below 0 where predicting `centre` is better; NaN where no outcome
        differs from `centre`.
    influence : ndarray of shape (n_samples,)
        First-order influence of each sample; sums to zero.
    """
    share = np.ones(len(outcome)) if weights is None else weights
    residual = share * (outcome - predicted) ** 2
    spread = share * (outcome - centre) ** 2
    total = spread.sum()
    if not total > 0.0:
        return float("nan"), np.zeros(len(outcome))
    left = residual.sum() / total
    return float(1.0 - left), (left * spread - residual) / total


def root_mean_square(
    predicted: NDArray[np.float64],
    outcome: NDArray[np.float64],
    weights: NDArray[np.float64] | None = None,
) -> float:
    """Return the root of the mean squared error, in units of the outcome.

    Parameters
    ----------
    predicted, outcome : ndarray of shape (n_samples,)
        Predictions and measured values.
    weights : ndarray of shape (n_samples,), optional
        Observation weights.

    Returns
    -------
    float
        Not negative.
    """
    return float(np.sqrt(np.average((predicted - outcome) ** 2, weights=weights)))


def linear_slope(
    predicted: NDArray[np.float64],
    outcome: NDArray[np.float64],
    weights: NDArray[np.float64] | None = None,
) -> float:
    """Return the slope of a straight line of measured on predicted values.

    Parameters
    ----------
    predicted, outcome : ndarray of shape (n_samples,)
        Out-of-fold predictions and measured values.
    weights : ndarray of shape (n_samples,), optional
        Observation weights.

    Returns
    -------
    float
        1 for well calibrated, below 1 for too extreme predictions; NaN where all
        predictions are equal.
    """
    share = np.ones(len(outcome)) if weights is None else weights
    centred = predicted - np.average(predicted, weights=share)
    spread = float((share * centred**2).sum())
    if not spread > 1e-16 * max(1.0, float(np.abs(predicted).max()) ** 2):
        return float("nan")
    centred_outcome = outcome - np.average(outcome, weights=share)
    return float((share * centred * centred_outcome).sum() / spread)
