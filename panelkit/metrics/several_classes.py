"""How well predicted chances tell three or more classes apart."""

from itertools import combinations

import numpy as np
from numpy.typing import NDArray

from panelkit.errors import FitError
from panelkit.metrics.discrimination import auc_placements

__all__ = ["class_areas", "hand_till", "log_loss_of_classes", "softmax"]


def softmax(predictors: NDArray[np.float64]) -> NDArray[np.float64]:
    """Return chances from linear predictors.

    Parameters
    ----------
    predictors : ndarray of shape (n_classes, n_samples)
        Log chances up to a constant a sample.

    Returns
    -------
    ndarray of shape (n_classes, n_samples)
        Sums to one over the classes.
    """
    raised = np.exp(predictors - predictors.max(axis=0))
    return np.asarray(raised / raised.sum(axis=0), np.float64)


def log_loss_of_classes(
    predictors: NDArray[np.float64],
    classes: NDArray[np.int64],
    weights: NDArray[np.float64] | None = None,
) -> float:
    """Return the mean negative log-likelihood of the observed classes.

    Parameters
    ----------
    predictors : ndarray of shape (n_classes, n_samples)
        Log chances up to a constant a sample.
    classes : ndarray of shape (n_samples,), int64
        Class numbers from 0.
    weights : ndarray of shape (n_samples,), optional
        Observation weights.

    Returns
    -------
    float
        In nats.
    """
    top = predictors.max(axis=0)
    total = top + np.log(np.exp(predictors - top).sum(axis=0))
    own = predictors[classes, np.arange(len(classes))]
    return float(np.average(total - own, weights=weights))


def hand_till(
    chances: NDArray[np.float64],
    classes: NDArray[np.int64],
    weights: NDArray[np.float64] | None = None,
) -> tuple[float, NDArray[np.float64]]:
    """Return the mean area over all pairs of classes, and each sample's influence.

    Parameters
    ----------
    chances : ndarray of shape (n_classes, n_samples)
        Predicted chance of each class.
    classes : ndarray of shape (n_samples,), int64
        Class numbers from 0; pairs without samples of both are left out.
    weights : ndarray of shape (n_samples,), optional
        Observation weights.

    Returns
    -------
    area : float
        Hand and Till's M, between 0 and 1.
    influence : ndarray of shape (n_samples,)
        First-order influence of each sample; sums to zero.

    Raises
    ------
    FitError
        One class only.

    References
    ----------
    Hand & Till 2001, Machine Learning 45:171.
    """
    share = np.ones(len(classes)) if weights is None else weights
    present = np.unique(classes)
    if len(present) < 2:
        raise FitError(
            code="auc-one-class",
            where="area under the ROC curve of several classes",
            what="samples of one class only",
            accepted="samples of at least two classes",
            next_step="Use folds stratified by the outcome",
        )
    areas = []
    influence = np.zeros(len(classes))
    for first, second in combinations(present, 2):
        rows = np.flatnonzero((classes == first) | (classes == second))
        for one, other in ((first, second), (second, first)):
            mine = (classes[rows] == one).astype(np.float64)
            area, placed = auc_placements(chances[one, rows], mine, share[rows])
            areas.append(area)
            for number in (one, other):
                own = rows[classes[rows] == number]
                placed_own = placed[classes[rows] == number]
                influence[own] += share[own] / share[own].sum() * (placed_own - area)
    return float(np.mean(areas)), influence / len(areas)


def class_areas(
    chances: NDArray[np.float64],
    classes: NDArray[np.int64],
    weights: NDArray[np.float64] | None = None,
) -> NDArray[np.float64]:
    """Return each class's area under the ROC curve against all others.

    Parameters
    ----------
    chances, classes, weights
        As for `hand_till`.

    Returns
    -------
    ndarray of shape (n_classes,)
        NaN for a class without samples.

    Raises
    ------
    FitError
        Never for two or more classes present.
    """
    areas = np.full(len(chances), np.nan)
    for number in np.unique(classes):
        mine = (classes == number).astype(np.float64)
        if 0.0 < mine.mean() < 1.0:
            areas[number] = auc_placements(chances[number], mine, weights)[0]
    return areas
