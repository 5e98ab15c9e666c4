"""Ridge on all features at once, through the samples' kernel matrix."""

import numpy as np
from numpy.typing import NDArray

from panelkit.errors import FitError
from panelkit.records import MatrixSource

__all__ = ["kernel_matrix", "ridge_predictions"]

TILE = 2048
STEPS = 60
TOLERANCE = 1e-7


def kernel_matrix(
    source: MatrixSource,
    training: NDArray[np.int64],
    weights: NDArray[np.float64],
) -> NDArray[np.float64]:
    """Return the mean product of standardised features for every pair of samples.

    Parameters
    ----------
    source : MatrixSource
        The matrix; features that it leaves out do not count.
    training : ndarray of int64
        Rows that teach the means and deviations.
    weights : ndarray of shape (n_samples,)
        Observation weights.

    Returns
    -------
    ndarray of shape (n_samples, n_samples), float64
        Divided by the number of features.
    """
    n_features, n_samples = source.base.shape
    share = weights[training] / weights[training].sum()
    kernel = np.zeros((n_samples, n_samples))
    for start in range(0, n_features, TILE):
        here = slice(start, start + TILE)
        tile = source.base[here][source.included[here]].astype(np.float64)
        gap = np.isnan(tile)
        if gap.any():
            fill = source.fill[here][source.included[here]]
            np.copyto(tile, fill[:, None], where=gap)
        mean = (tile[:, training] * share).sum(axis=1)
        tile -= mean[:, None]
        variance = (tile[:, training] ** 2 * share).sum(axis=1)
        usable = variance > np.maximum(1e-24 * mean**2, 1e-290)
        tile = tile[usable] / np.sqrt(variance[usable])[:, None]
        kernel += tile.T @ tile
    return kernel / max(1, int(source.included.sum()))


def ridge_predictions(
    kernel: NDArray[np.float64],
    y: NDArray[np.float64],
    weights: NDArray[np.float64],
    training: NDArray[np.int64],
    test: NDArray[np.int64],
    penalties: NDArray[np.float64],
) -> NDArray[np.float64]:
    r"""Return log-odds of ridge-penalised logistic models on all features.

    With the kernel K on the training rows, minimises the weighted mean loss of
    :math:`f = b + K a` plus :math:`\lambda/2\, a^T K a`.

    Parameters
    ----------
    kernel : ndarray of shape (n_samples, n_samples)
        From `kernel_matrix`.
    y, weights : ndarray of shape (n_samples,)
        Outcome (0 and 1) and observation weights.
    training, test : ndarray of int64
        Rows that teach, rows that are predicted.
    penalties : ndarray of shape (n_penalties,)
        Largest first.

    Returns
    -------
    ndarray of shape (n_penalties, n_test)
        Log-odds.

    Raises
    ------
    FitError
        No convergence.

    References
    ----------
    Hoerl & Kennard 1970, Technometrics 12:55; Zhu & Hastie 2004, Biostatistics 5:427.
    """
    K = kernel[np.ix_(training, training)]
    outcome = y[training]
    share = weights[training] / weights[training].sum()
    mean = float((share * outcome).sum())
    intercept = np.log(mean / (1.0 - mean))
    dual = np.zeros(len(training))
    predictions = np.empty((len(penalties), len(test)))
    for k, penalty in enumerate(penalties):
        intercept, dual = _newton(K, outcome, share, float(penalty), intercept, dual)
        predictions[k] = intercept + kernel[np.ix_(test, training)] @ dual
    return predictions


def _newton(
    K: NDArray[np.float64],
    y: NDArray[np.float64],
    share: NDArray[np.float64],
    penalty: float,
    intercept: float,
    dual: NDArray[np.float64],
) -> tuple[float, NDArray[np.float64]]:
    """Return intercept and dual coefficients by Newton steps with halving."""
    n = len(y)
    best = np.inf
    before = (intercept, dual)
    for _step in range(STEPS):
        for _halving in range(30):
            eta = intercept + K @ dual
            value = float(
                (share * (np.logaddexp(0.0, eta) - y * eta)).sum()
                + 0.5 * penalty * dual @ (eta - intercept)
            )
            if value <= best + 1e-12 * abs(best):
                break
            intercept = before[0] + 0.5 * (intercept - before[0])
            dual = before[1] + 0.5 * (dual - before[1])
        best = value
        p = 1.0 / (1.0 + np.exp(-eta))
        r = share * (y - p)
        # at the solution penalty * dual equals the weighted residual
        if max(np.abs(r - penalty * dual).max() * n, abs(r.sum())) <= TOLERANCE:
            return intercept, dual
        h = share * np.maximum(p * (1.0 - p), 1e-10)
        before = (intercept, dual)
        # (K + penalty / h) a + b = eta + r / h,  sum(a) = 0
        A = K + np.diag(penalty / h)
        solved = np.linalg.solve(A, np.column_stack([eta + r / h, np.ones(n)]))
        intercept = float(solved[:, 0].sum() / solved[:, 1].sum())
        dual = solved[:, 0] - intercept * solved[:, 1]
    raise FitError(
        code="ridge-not-converged",
        where="ridge on all features",
        what=f"no convergence within {STEPS} Newton steps at penalty {penalty:g}",
        accepted="a penalty large enough for separable data",
        next_step="Raise the smallest ridge penalty",
    )
