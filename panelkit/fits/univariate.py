"""One feature at a time: Welch's t for every feature."""

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from panelkit.errors import FitError
from panelkit.fits.kernel_cache import kernel_cache
from panelkit.records import MatrixSource

with kernel_cache():
    from panelkit.fits import kernel_univariate as kernels

__all__ = ["Univariate", "rank_univariate"]


@dataclass(frozen=True, slots=True, eq=False)
class Univariate:
    """Class means and Welch's t of every feature.

    Attributes
    ----------
    means, variances : ndarray of shape (n_features, 2)
        Of class 0 and class 1, over subjects; 0 where the feature is left out.
    t : ndarray of shape (n_features,)
        Positive where class 1 is higher; 0 where undefined or left out.
    order : ndarray of shape (n_features,), int64
        Features by |t|, largest first, then by column.
    """

    means: NDArray[np.float64]
    variances: NDArray[np.float64]
    t: NDArray[np.float64]
    order: NDArray[np.int64]


def rank_univariate(
    source: MatrixSource,
    y: NDArray[np.float64],
    rows: NDArray[np.int64],
    subjects: NDArray[np.int64],
    weights: NDArray[np.float64],
) -> Univariate:
    """Rank every feature by the size of Welch's t between the two classes.

    Subjects are the independent units: their (weighted) means are compared.

    Parameters
    ----------
    source : MatrixSource
        The matrix.
    y : ndarray of shape (n_samples,)
        0 and 1.
    rows : ndarray of int64
        Rows that teach.
    subjects : ndarray of shape (n_samples,), int64
        Subject of each sample.
    weights : ndarray of shape (n_samples,)
        Observation weights.

    Returns
    -------
    Univariate
        Means, variances, t, order.

    Raises
    ------
    FitError
        Fewer than two subjects in a class.

    References
    ----------
    Welch 1947, Biometrika 34:28.
    """
    n_features = source.base.shape[0]
    units = np.array(
        [len(np.unique(subjects[rows][y[rows] == value])) for value in (0.0, 1.0)],
        np.float64,
    )
    if units.min() < 2:
        raise FitError(
            code="too-few-for-ranking",
            where="univariate ranking",
            what=f"{int(units.min())} subjects in a class",
            accepted="at least 2 subjects of each class",
            next_step="Use fewer folds, or more samples of the smaller class",
        )
    means, variances = np.zeros((n_features, 2)), np.zeros((n_features, 2))
    t = np.zeros(n_features)
    _, unit = np.unique(
        np.stack([subjects[rows], y[rows].astype(np.int64)]),
        axis=1,
        return_inverse=True,
    )
    unit = unit.ravel()
    classes = np.where(y[rows] > 0.5, 1, 0)
    in_class = np.bincount(classes, weights=weights[rows])[classes]
    unit_weight = np.bincount(unit, weights=weights[rows] / in_class)
    kernels.welch(
        source.base,
        source.fill,
        *source.shift,
        source.included,
        rows,
        y[rows],
        weights[rows],
        unit,
        unit_weight,
        units,
        means,
        variances,
        t,
    )
    return Univariate(means, variances, t, np.argsort(-np.abs(t), kind="stable"))
