"""Models that read every feature: what a small panel gives away."""

import numpy as np
from numpy.typing import NDArray

from panelkit.costing.comparisons.contract import FoldWork, LearntToo
from panelkit.costing.data import ProcedureData
from panelkit.fits import fit_paths
from panelkit.metrics import naive_se
from panelkit.preparation import DesignView
from panelkit.records import PathSet

__all__ = [
    "LASSO",
    "LASSO_ONE_SE",
    "LASSO_SIZES",
    "RIDGE",
    "lasso_on_all",
    "ridge_on_all",
]

RIDGE = "ridge-on-all"
LASSO = "lasso-on-all"
LASSO_ONE_SE = "lasso-on-all-one-se"
LASSO_SIZES = "lasso sizes"
N_PENALTIES = 60
FLOOR = 0.05


def ridge_on_all(work: FoldWork) -> LearntToo:
    """Return ridge on all features, tuned on complementary halves."""
    view = work.learnt.selected.view
    predicted = work.procedure.ridge_on_all(work.data, work.split, view)
    return LearntToo({RIDGE: predicted})


def lasso_on_all(work: FoldWork) -> LearntToo:
    """Return the lasso on all features at two penalties, and how many it reads.

    The inner folds judge the path: the penalty of the smallest loss, and the largest
    within one standard error of it (fold standard error over the root of the folds).

    References
    ----------
    Tibshirani 1996, JRSS-B 58:267; Breiman et al. 1984, section 3.4.3.
    """
    data, split = work.data, work.split
    view = work.learnt.selected.view
    training = [inner.training for inner in split.inner]
    inner = _paths(view, data, training)
    losses = []
    for s, fold in enumerate(split.inner):
        predicted = predictions(inner, s, view, data, fold.test)
        losses.append(data.task.losses(predicted, fold.test, data.weights))
    loss = np.array(losses)
    mean = loss.mean(axis=0)
    best = int(mean.argmin())
    allowed = mean[best] + naive_se(loss[:, best])
    simplest = int(np.flatnonzero(mean <= allowed)[0])
    whole = _paths(view, data, [split.training])
    tested = predictions(whole, 0, view, data, split.test)
    sizes = np.diff(whole.coefficient_borders[0])[[best, simplest]]
    return LearntToo(
        {LASSO: tested[best], LASSO_ONE_SE: tested[simplest]},
        {LASSO_SIZES: sizes.astype(np.float64)},
    )


def _paths(
    view: DesignView, data: ProcedureData, training: list[NDArray[np.int64]]
) -> PathSet:
    return fit_paths(
        view,
        data.task.outcome(),
        subsamples=training,
        family=data.task.family,
        n_penalties=N_PENALTIES,
        penalty_floor=FLOOR,
        weights=data.weights,
    )


def predictions(
    paths: PathSet,
    s: int,
    view: DesignView,
    data: ProcedureData,
    rows: NDArray[np.int64],
) -> NDArray[np.float64]:
    """Return linear predictors of rows at every penalty of a path.

    Parameters
    ----------
    paths : PathSet
        From `fit_paths`.
    s : int
        Which subsample's path.
    view : DesignView
        The matrix.
    data : ProcedureData
        For the shape of a prediction.
    rows : ndarray of int64
        Which samples.

    Returns
    -------
    ndarray of shape (n_penalties[, n_classes], n_rows)
        Linear predictors.
    """
    features, position = np.unique(paths.coefficient_features[s], return_inverse=True)
    values = view.columns(features, rows)
    borders = paths.coefficient_borders[s]
    out = np.empty((paths.penalties.shape[1], *data.task.predictors, len(rows)))
    for k in range(len(out)):
        here = slice(borders[k], borders[k + 1])
        own = paths.coefficient_values[s][here].T  # [n_classes, ]features
        intercept = np.asarray(paths.intercepts[s, k])
        out[k] = intercept[..., None] + own @ values[position[here]]
    return out
