"""Tuning: which ridge penalty, and which size, on rows outside the selection.

A refit tuned on the rows that chose its markers is badly over-confident. Inside the
training rows the whole selection is therefore repeated in inner folds, and penalties
and sizes are judged on the inner test rows only.
"""

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from panelkit.fits import ridge_predictions
from panelkit.metrics import auc, corrected_se, log_loss
from panelkit.records import SubsamplePlan

__all__ = ["Tuning", "choose_within_one_se", "judge", "tune_ridge", "within_one_se"]

DECIMALS = 4  # metrics are compared after rounding, so that machines agree


@dataclass(frozen=True, slots=True, eq=False)
class Tuning:
    """What the inner folds say about each maker, size and ridge penalty.

    Attributes
    ----------
    best : ndarray of shape (n_makers, n_sizes), int64
        Position of the penalty with the smallest mean log loss; of equals the first,
        that is the largest penalty.
    area : ndarray of shape (n_folds, n_makers, n_sizes)
        Area under the ROC curve on the inner test rows at that penalty.
    """

    best: NDArray[np.int64]
    area: NDArray[np.float64]


def judge(
    log_odds: Sequence[NDArray[np.float64]],
    outcomes: Sequence[NDArray[np.float64]],
    weights: Sequence[NDArray[np.float64]],
    shape: tuple[int, int],
) -> Tuning:
    """Return the best penalty and the accuracy of each maker and size.

    Parameters
    ----------
    log_odds : sequence of ndarray of shape (n_panels, n_penalties, n_test)
        Predictions of each inner fold; panels by maker, then size.
    outcomes, weights : sequence of ndarray of shape (n_test,)
        Of each inner fold's test rows.
    shape : tuple of int
        Number of makers and of sizes.

    Returns
    -------
    Tuning
        Best penalties, accuracy.

    Raises
    ------
    FitError
        An inner fold with one class only.
    """
    losses, areas = [], []
    for predicted, y, weight in zip(log_odds, outcomes, weights, strict=True):
        grid = [
            [(log_loss(e, y, weight), auc(e, y, weight)) for e in p] for p in predicted
        ]
        both = np.array(grid).reshape(*shape, -1, 2)
        losses.append(both[..., 0])
        areas.append(both[..., 1])
    best = np.mean(losses, axis=0).argmin(axis=2)
    chosen = np.take_along_axis(np.array(areas), best[None, ..., None], axis=3)
    return Tuning(best, chosen[..., 0])


def within_one_se(area: NDArray[np.float64], test_to_train: float) -> NDArray[np.bool_]:
    """Return which procedures are within one standard error of the best one.

    The standard error is the corrected one of the paired difference to the best;
    where it is 0, or there is one split, only equals of the best are within.

    Parameters
    ----------
    area : ndarray of shape (n_splits, n_procedures)
        Accuracy on each split; compared after rounding to four decimals.
    test_to_train : float
        Ratio of test to training samples.

    Returns
    -------
    ndarray of shape (n_procedures,), bool
        True for the best itself.

    References
    ----------
    Breiman, Friedman, Olshen & Stone 1984, section 3.4.3; Nadeau & Bengio 2003.
    """
    mean = _means(area)
    best = int(mean.argmax())
    near = np.zeros(len(mean), np.bool_)
    for p in range(len(mean)):
        se = corrected_se(area[:, best] - area[:, p], test_to_train)
        allowed = 0.0 if np.isnan(se) else round(se, DECIMALS)
        near[p] = round(mean[best] - mean[p], DECIMALS) <= allowed
    return near


def _means(area: NDArray[np.float64]) -> NDArray[np.float64]:
    """Return rounded means over splits; minus infinity where no split counts."""
    counted = ~np.isnan(area)
    total = np.where(counted, area, 0.0).sum(axis=0)
    with np.errstate(invalid="ignore"):
        mean = total / counted.sum(axis=0)
    return np.where(counted.any(axis=0), mean, -np.inf).round(DECIMALS)


def choose_within_one_se(
    area: NDArray[np.float64], test_to_train: float
) -> tuple[int, int]:
    """Return maker and size position of the smallest panel within one SE of the best.

    Among makers of that size the more accurate one is taken, then the first.

    Parameters
    ----------
    area : ndarray of shape (n_splits, n_makers, n_sizes)
        Accuracy on each split; sizes ascending.
    test_to_train : float
        Ratio of test to training samples.

    Returns
    -------
    maker, size : int
        Positions.
    """
    n_splits, n_makers, n_sizes = area.shape
    near = within_one_se(area.reshape(n_splits, -1), test_to_train)
    near = near.reshape(n_makers, n_sizes)
    mean = _means(area)
    size = int(near.any(axis=0).argmax())
    makers = np.flatnonzero(near[:, size])
    return int(makers[mean[makers, size].argmax()]), size


def tune_ridge(
    kernel: NDArray[np.float64],
    y: NDArray[np.float64],
    weights: NDArray[np.float64],
    plan: SubsamplePlan,
    n_pairs: int,
    penalties: NDArray[np.float64],
) -> int:
    """Return the position of the best penalty of ridge on all features.

    Nothing is selected, so the halves of complementary pairs can judge each other.

    Parameters
    ----------
    kernel : ndarray of shape (n_samples, n_samples)
        From `fits.kernel_matrix`.
    y, weights : ndarray of shape (n_samples,)
        Outcome and observation weights.
    plan : SubsamplePlan
        Halves to teach and to judge on.
    n_pairs : int
        Pairs used, the first ones.
    penalties : ndarray of shape (n_penalties,)
        Largest first.

    Returns
    -------
    int
        Smallest mean log loss; the larger penalty of equals.

    Raises
    ------
    FitError
        No convergence.
    """
    loss = np.zeros(len(penalties))
    for half in range(2 * min(n_pairs, plan.n_pairs)):
        teach, test = plan.rows[half], plan.rows[half ^ 1]
        predicted = ridge_predictions(kernel, y, weights, teach, test, penalties)
        loss += [log_loss(eta, y[test], weights[test]) for eta in predicted]
    return int(loss.argmin())
