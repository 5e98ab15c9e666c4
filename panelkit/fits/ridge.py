"""Ridge on all features at once, through the samples' kernel matrix."""

from typing import Any

import numpy as np
from numpy.typing import ArrayLike, NDArray
from scipy.linalg import lu_factor, lu_solve

from panelkit.errors import FitError
from panelkit.fits.arguments import problem_of
from panelkit.fits.families import Family, Problem
from panelkit.fits.kernel_cache import kernel_cache
from panelkit.records import MatrixSource

with kernel_cache():
    from panelkit.fits import kernel_grouped, kernel_scalar

__all__ = ["kernel_matrix", "ridge_predictions"]

TILE = 2048
STEPS = 60
TOLERANCE = 1e-7
BOUND_STEPS = 20_000
BOUND_TOLERANCE = 1e-6


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
        left, right = source.shift
        tile += left[here][source.included[here]] @ right
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


def ridge_predictions(  # noqa: PLR0913 - data, rows, family: each is one thing
    kernel: NDArray[np.float64],
    outcome: Any,
    weights: NDArray[np.float64],
    training: NDArray[np.int64],
    test: NDArray[np.int64],
    penalties: NDArray[np.float64],
    *,
    family: Family = "binomial",
    strata: ArrayLike | None = None,
    ties: str = "efron",
) -> NDArray[np.float64]:
    r"""Return linear predictors of ridge-penalised models on all features.

    With the kernel K on the training rows, minimises the weighted mean loss of
    :math:`f = b + K a` plus :math:`\lambda/2\, a^T K a`; for several classes one a
    and b each, for Cox without b.

    Parameters
    ----------
    kernel : ndarray of shape (n_samples, n_samples)
        From `kernel_matrix`.
    outcome : array_like of shape (n_samples,), or (time, event)
        As for `fit_paths`.
    weights : ndarray of shape (n_samples,)
        Observation weights.
    training, test : ndarray of int64
        Rows that teach, rows that are predicted.
    penalties : ndarray of shape (n_penalties,)
        Largest first.
    family : {"gaussian", "binomial", "cox", "multinomial"}
        As for `fit_paths`.
    strata, ties
        As for `fit_paths`.

    Returns
    -------
    ndarray of shape (n_penalties[, n_classes], n_test)
        Values, log-odds, log hazard ratios, or log chances up to a constant.

    Raises
    ------
    UsageError
        An outcome that does not suit the family.
    FitError
        One class only, no event, or no convergence.

    References
    ----------
    Hoerl & Kennard 1970, Technometrics 12:55; Zhu & Hastie 2004, Biostatistics 5:427;
    Boehning 1992, Ann Inst Stat Math 44:197 (bound for several classes).
    """
    problem, _classes = problem_of(
        outcome,
        family,
        [training],
        len(kernel),
        weights=weights,
        strata=strata,
        ties=ties,
    )
    K = kernel[np.ix_(training, training)]
    share = weights[training] / weights[training].sum()
    cross = kernel[np.ix_(test, training)]
    kind = _Several if family == "multinomial" else _One
    fit: _One | _Several = kind(problem, K, share, training)
    predicted = [fit.solve(float(penalty), cross) for penalty in penalties]
    return np.array(predicted)


class _One:
    """Warm-started Newton steps for one linear predictor."""

    def __init__(
        self,
        problem: Problem,
        K: NDArray[np.float64],
        share: NDArray[np.float64],
        training: NDArray[np.int64],
    ) -> None:
        self._family = problem.code
        self._K = K
        self._survival = problem.survival(training)
        self._y = np.ascontiguousarray(problem.y[training])
        self._share = share
        self._intercept = problem.start(share, training)
        self._free = problem.family != "cox"
        self._dual = np.zeros(len(training))

    def _curvature(self, h: NDArray[np.float64]) -> NDArray[np.float64]:
        """Return the curvature of the loss by the linear predictors."""
        n = len(h)
        if self._free:
            return h[:, None]  # diagonal: one column stands for it
        HZ, diagonal, active = np.empty((n, n)), np.empty(n), np.arange(n)
        kernel_scalar.curves(
            self._family,
            self._survival,
            self._share,
            h,
            n,
            np.eye(n),
            active,
            n,
            HZ,
            diagonal,
        )
        return HZ

    def solve(self, penalty: float, cross: NDArray[np.float64]) -> NDArray[np.float64]:
        """Return linear predictors of the test rows at a penalty."""
        K, n = self._K, len(self._K)
        r, h = np.empty(n), np.empty(n)
        intercept, dual = self._intercept, self._dual
        before = (intercept, dual)
        best = np.inf
        for _step in range(STEPS):
            for _halving in range(30):
                eta = intercept + K @ dual
                value = kernel_scalar.loss_terms(
                    self._family,
                    self._survival,
                    self._y,
                    self._share,
                    eta,
                    n,
                    r,
                    h,
                )
                value += 0.5 * penalty * float(dual @ (eta - intercept))
                if value <= best + 1e-12 * abs(best):
                    break
                intercept = before[0] + 0.5 * (intercept - before[0])
                dual = before[1] + 0.5 * (dual - before[1])
            best = value
            # at the solution penalty * dual equals the weighted residual
            off = float(np.abs(r - penalty * dual).max()) * n
            if max(off, abs(float(r.sum())) if self._free else 0.0) <= TOLERANCE:
                self._intercept, self._dual = intercept, dual
                return np.asarray(intercept + cross @ dual)
            before = (intercept, dual)
            H = self._curvature(h)
            # penalty * a = r - H (K a + b - eta), and the a sum to 0 where b is free
            times = np.multiply if self._free else np.matmul
            A = times(H, K) + penalty * np.eye(n)
            curved = times(H, np.column_stack([eta, np.ones(n)]))
            right = np.column_stack([curved[:, 0] + r, curved[:, 1]])
            solved = np.linalg.solve(A, right)
            intercept = 0.0
            if self._free:
                intercept = float(solved[:, 0].sum() / solved[:, 1].sum())
            dual = solved[:, 0] - intercept * solved[:, 1]
        raise _not_converged(penalty)


class _Several:
    """Steps on a fixed bound of the curvature, for several classes."""

    def __init__(
        self,
        problem: Problem,
        K: NDArray[np.float64],
        share: NDArray[np.float64],
        training: NDArray[np.int64],
    ) -> None:
        self._K = K
        self._y = np.ascontiguousarray(problem.y[training])
        self._share = share
        shape = (problem.n_classes, len(training))
        self._dual = np.zeros(shape)
        self._intercept = np.zeros(problem.n_classes)

    def solve(self, penalty: float, cross: NDArray[np.float64]) -> NDArray[np.float64]:
        """Return linear predictors (n_classes, n_test) at a penalty."""
        K, n = self._K, len(self._K)
        # the curvature is at most one half of the weights, whatever the chances
        half = 0.5 * self._share
        factor = lu_factor(half[:, None] * K + penalty * np.eye(n))
        ones = lu_solve(factor, half)
        r, p = np.empty_like(self._dual), np.empty_like(self._dual)
        for _step in range(BOUND_STEPS):
            eta = self._intercept[:, None] + self._dual @ K
            kernel_grouped.multinomial_terms(self._y, self._share, eta, n, r, p)
            off = float(np.abs(r - penalty * self._dual).max()) * n
            if max(off, float(np.abs(r.sum(axis=1)).max())) <= BOUND_TOLERANCE:
                return np.asarray(self._intercept[:, None] + self._dual @ cross.T)
            solved = lu_solve(factor, (half * eta + r).T).T
            self._intercept = solved.sum(axis=1) / ones.sum()
            self._dual = solved - self._intercept[:, None] * ones
        raise _not_converged(penalty)


def _not_converged(penalty: float) -> FitError:
    return FitError(
        code="ridge-not-converged",
        where="ridge on all features",
        what=f"no convergence at penalty {penalty:g}",
        accepted="a penalty large enough for separable data",
        next_step="Raise the smallest ridge penalty",
    )
