"""What acting on a score is worth at a threshold."""

import numpy as np
from numpy.typing import NDArray

from panelkit.errors import UsageError

__all__ = ["balanced_accuracy", "best_threshold", "net_benefit"]


def net_benefit(
    chances: NDArray[np.float64],
    outcome: NDArray[np.float64],
    threshold: float,
    weights: NDArray[np.float64] | None = None,
) -> float:
    """Return the net benefit of treating from a predicted chance on.

    Parameters
    ----------
    chances, outcome : ndarray of shape (n_samples,)
        Predicted chance of class 1; 0 and 1.
    threshold : float
        Treated from this chance on, above 0 and below 1.
    weights : ndarray of shape (n_samples,), optional
        Observation weights.

    Returns
    -------
    float
        In true positives a sample.

    Raises
    ------
    UsageError
        A threshold outside 0 to 1.

    References
    ----------
    Vickers & Elkin 2006, Med Decis Making 26:565.
    """
    if not 0.0 < threshold < 1.0:
        raise UsageError(
            code="threshold-outside",
            where="net benefit, threshold",
            what=f"no chance to act on (got {threshold:g})",
            accepted="a chance above 0 and below 1",
            next_step="Name the chance from which one would act",
        )
    share = np.ones(len(outcome)) if weights is None else weights
    share = share / share.sum()
    treated = chances >= threshold
    true = float((share * (treated & (outcome == 1.0))).sum())
    false = float((share * (treated & (outcome == 0.0))).sum())
    return true - false * threshold / (1.0 - threshold)


def balanced_accuracy(
    scores: NDArray[np.float64],
    outcome: NDArray[np.float64],
    threshold: float,
    weights: NDArray[np.float64] | None = None,
) -> float:
    """Return the mean of sensitivity and specificity at a threshold.

    Parameters
    ----------
    scores, outcome : ndarray of shape (n_samples,)
        Higher points to class 1; 0 and 1, both present.
    threshold : float
        Positive from this score on.
    weights : ndarray of shape (n_samples,), optional
        Observation weights.

    Returns
    -------
    float
        Between 0 and 1; 0.5 for calling everybody the same.
    """
    share = np.ones(len(outcome)) if weights is None else weights
    positive = scores >= threshold
    case = outcome == 1.0
    sensitivity = np.average(positive[case], weights=share[case])
    specificity = np.average(~positive[~case], weights=share[~case])
    return float(0.5 * (sensitivity + specificity))


def best_threshold(
    scores: NDArray[np.float64],
    outcome: NDArray[np.float64],
    weights: NDArray[np.float64] | None = None,
) -> float:
    """Return the score from which sensitivity plus specificity is largest.

    Parameters
    ----------
    scores, outcome, weights
        As for `balanced_accuracy`.

    Returns
    -------
    float
        Half-way between two neighbouring scores; of equals the lowest. Chosen on the
        same samples, so that what it reaches there is too good.

    References
    ----------
    Youden 1950, Cancer 3:32.
    """
    share = np.ones(len(outcome)) if weights is None else weights
    case = outcome == 1.0
    values = np.unique(scores)
    order = np.searchsorted(values, scores)
    gain = np.bincount(order[case], share[case], len(values)) / share[case].sum()
    lost = np.bincount(order[~case], share[~case], len(values)) / share[~case].sum()
    below = np.concatenate([[0.0], np.cumsum(lost - gain)[:-1]])
    best = int(below.round(12).argmax())
    if best == 0:
        return float(values[0])
    return float(0.5 * (values[best - 1] + values[best]))
