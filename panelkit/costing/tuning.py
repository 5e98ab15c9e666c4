"""Tuning: which ridge penalty, on rows outside the selection.

A refit tuned on the rows that chose its markers is badly over-confident. Inside the
training rows the whole selection is therefore repeated in inner folds, and penalties
and sizes are judged on the inner test rows only.
"""

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from panelkit.costing.data import ProcedureData, Split
from panelkit.costing.tasks import Task
from panelkit.fits import ridge_predictions
from panelkit.records import SubsamplePlan

__all__ = ["Tuning", "judge", "tune_ridge"]


@dataclass(frozen=True, slots=True, eq=False)
class Tuning:
    """What the inner folds say about each maker, size and ridge penalty.

    Attributes
    ----------
    best : ndarray of shape (n_makers, n_sizes), int64
        Position of the penalty with the smallest mean loss; of equals the first,
        that is the largest penalty.
    metric : ndarray of shape (n_folds, n_makers, n_sizes)
        The task's metric on the inner test rows at that penalty.
    """

    best: NDArray[np.int64]
    metric: NDArray[np.float64]


def judge(
    predicted: Sequence[NDArray[np.float64]],
    data: ProcedureData,
    splits: Sequence[Split],
    shape: tuple[int, int],
) -> Tuning:
    """Return the best penalty and the accuracy of each maker and size.

    Parameters
    ----------
    predicted : sequence of ndarray of shape (n_panels, n_penalties[, K], n_test)
        Predictions of each inner fold; panels by maker, then size.
    data : ProcedureData
        Task and weights.
    splits : sequence of Split
        The inner folds.
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
    task, weights = data.task, data.weights
    losses = [
        [task.losses(panel, split.test, weights) for panel in one]
        for one, split in zip(predicted, splits, strict=True)
    ]
    best = np.mean(losses, axis=0).argmin(axis=1)
    each = np.arange(len(best))
    metric = [
        task.all_scores(one[each, best], split.training, split.test, weights)
        for one, split in zip(predicted, splits, strict=True)
    ]
    return Tuning(best.reshape(shape), np.array(metric).reshape(-1, *shape))


def tune_ridge(
    kernel: NDArray[np.float64],
    task: Task,
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
    task : Task
        Outcome and loss.
    weights : ndarray of shape (n_samples,)
        Observation weights.
    plan : SubsamplePlan
        Halves to teach and to judge on.
    n_pairs : int
        Pairs used, the first ones.
    penalties : ndarray of shape (n_penalties,)
        Largest first.

    Returns
    -------
    int
        Smallest mean loss; the larger penalty of equals.

    Raises
    ------
    FitError
        No convergence.
    """
    loss = np.zeros(len(penalties))
    for half in range(2 * min(n_pairs, plan.n_pairs)):
        teach, test = plan.rows[half], plan.rows[half ^ 1]
        predicted = ridge_predictions(
            kernel,
            task.outcome(),
            weights,
            teach,
            test,
            penalties,
            family=task.family,
        )
        loss += task.losses(predicted, test, weights)
    return int(loss.argmin())
