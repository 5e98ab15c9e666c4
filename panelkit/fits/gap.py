"""The duality gap: how far a solution can be from the optimum, in units of the loss."""

from typing import Literal

import numpy as np
from numpy.typing import ArrayLike, NDArray

from panelkit.errors import UsageError

__all__ = ["duality_gap"]


def duality_gap(
    X: ArrayLike,
    outcome: ArrayLike,
    intercept: float,
    coefficients: ArrayLike,
    penalty: float,
    *,
    family: Literal["gaussian", "binomial"],
) -> float:
    r"""Return the duality gap of a lasso solution, an upper bound of its excess loss.

    The dual point is the residual, shrunk until no column exceeds the penalty. The gap
    is defined where the intercept is optimal (the residuals sum to 0); columns count as
    they are, so hand over standardised ones for a standardised fit.

    Parameters
    ----------
    X : array_like of shape (n_samples, n_features)
        The columns that the penalty applied to.
    outcome : array_like of shape (n_samples,)
        Values, or 0 and 1.
    intercept : float
        Optimal for the coefficients.
    coefficients : array_like of shape (n_features,)
        Any.
    penalty : float
        Positive.
    family : {"gaussian", "binomial"}
        Half the mean squared error, or the mean logistic loss.

    Returns
    -------
    float
        0 at the optimum, up to rounding.

    Raises
    ------
    UsageError
        A penalty that is not positive, or another family.

    References
    ----------
    Fercoq, Gramfort & Salmon 2015, ICML (gap safe rules); Kim et al. 2007, IEEE J Sel
    Top Signal Process 1:606.
    """
    if family not in ("gaussian", "binomial") or not penalty > 0.0:
        raise UsageError(
            code="gap-undefined",
            where="family, penalty",
            what=f"no gap is defined (got {family!r}, {penalty!r})",
            accepted="'gaussian' or 'binomial', and a positive penalty",
            next_step="Use the KKT certificate of the path",
        )
    matrix = np.asarray(X, np.float64)
    y = np.asarray(outcome, np.float64)
    beta = np.asarray(coefficients, np.float64)
    n = len(y)
    eta = intercept + matrix @ beta
    centred = matrix - matrix.mean(axis=0)
    l1 = penalty * float(np.abs(beta).sum())
    if family == "gaussian":
        residual = y - eta
        primal = float(residual @ residual) / (2 * n) + l1
        theta = _feasible(residual / n, centred, penalty)
        target = (y - y.mean()) / n
        off = theta - target
        dual = float(target @ target - off @ off) * n / 2
        return primal - dual
    chance = 1.0 / (1.0 + np.exp(-eta))
    primal = float((np.logaddexp(0.0, eta) - y * eta).mean()) + l1
    theta = _feasible((y - chance) / n, centred, penalty)
    u = np.clip(y - n * theta, 0.0, 1.0)
    entropy = -(_xlogx(u) + _xlogx(1.0 - u))
    return primal - float(entropy.mean())


def _feasible(
    theta: NDArray[np.float64],
    centred: NDArray[np.float64],
    penalty: float,
) -> NDArray[np.float64]:
    """Return the point shrunk until every column keeps the penalty."""
    largest = float(np.abs(centred.T @ theta).max(initial=0.0))
    return theta * min(1.0, penalty / largest) if largest > 0.0 else theta


def _xlogx(
    u: NDArray[np.float64],
) -> NDArray[np.float64]:
    return u * np.log(np.where(u > 0.0, u, 1.0))
