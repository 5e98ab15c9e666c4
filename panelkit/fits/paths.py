"""`fit_paths`: hundreds of L1 penalty paths of one matrix."""

from collections.abc import Sequence
from typing import Any, Literal

import numpy as np
from numpy.typing import ArrayLike, NDArray

from panelkit.config import ENGINE
from panelkit.errors import FitError, UsageError, name_some
from panelkit.fits.engine import BlockSpecification, run_block
from panelkit.fits.kernel_cache import kernel_cache
from panelkit.fits.sources import ArraySource
from panelkit.records import MatrixSource, PathSet

with kernel_cache():
    from panelkit.fits import kernel_paths as kernels

__all__ = ["fit_paths"]

FAMILIES = {"binomial": kernels.BINOMIAL, "gaussian": kernels.GAUSSIAN}


def fit_paths(  # noqa: PLR0913 - the face of the engine: one argument a choice
    X: Any,
    outcome: ArrayLike,
    *,
    subsamples: Sequence[ArrayLike] | None = None,
    family: Literal["binomial", "gaussian"] = "binomial",
    penalties: ArrayLike | None = None,
    n_penalties: int = ENGINE.n_penalties,
    penalty_floor: float | None = None,
    max_markers: int | None = None,
    feature_weights: ArrayLike | None = None,
    weights: ArrayLike | None = None,
    mixing: float = 1.0,
    standardise: bool = True,
    tol: float = ENGINE.tol,
    threads: int = 1,
) -> PathSet:
    r"""Return L1 penalty paths of one matrix, one a subsample, solved in lockstep.

    Minimises, for each subsample and penalty :math:`\lambda`, the weighted mean loss
    plus :math:`\lambda \sum_j v_j (a|b_j| + (1-a) b_j^2 / 2)` with an unpenalised
    intercept, over columns that are centred and scaled (divisor n) on the
    subsample's own rows; a is `mixing`, v the `feature_weights`, never rescaled.

    Parameters
    ----------
    X : array_like of shape (n_samples, n_features), or MatrixSource
        The expression matrix, finite. float32 and float64 are not converted.
    outcome : array_like of shape (n_samples,)
        0 and 1 for ``binomial``, any finite number for ``gaussian``.
    subsamples : sequence of array_like of int, optional
        Row indices of each refit; None fits all rows once.
    family : {"binomial", "gaussian"}
        Loss: logistic, or half the squared error.
    penalties : array_like, optional
        Common descending penalties for every refit. When None, each refit has
        `n_penalties` of them, equally spaced in logarithm from its own largest to
        `penalty_floor` times that.
    n_penalties : int
        Number of relative penalties.
    penalty_floor : float, optional
        Last relative penalty; None means 0.01 with more features than rows, else
        0.0001.
    max_markers : int, optional
        A refit stops once this many distinct features have been picked.
    feature_weights : array_like of shape (n_features,), optional
        0 unpenalised, infinity excluded; None means one.
    weights : array_like of shape (n_samples,), optional
        Observation weights, positive; rescaled to sum to one in each refit.
    mixing : float
        Share of the L1 part, above 0 and at most 1 (the lasso).
    standardise : bool
        False leaves the columns on their own scale.
    tol : float
        Largest KKT violation relative to the penalty that counts as solved.
    threads : int
        Threads; no bit of the result depends on it.

    Returns
    -------
    PathSet
        Penalties, coefficients on the original scale, order of entry, certificate.

    Raises
    ------
    UsageError
        Arguments that do not fit together.
    FitError
        A subsample with one class only, or a refit that did not reach `tol`.

    References
    ----------
    Tibshirani 1996, JRSS-B 58:267; Friedman, Hastie & Tibshirani 2010, J Stat Softw
    33(1); Tibshirani et al. 2012, JRSS-B 74:245 (sequential strong rules).
    """
    source: MatrixSource = X if hasattr(X, "included") else ArraySource(X)
    n_features, n_samples = source.base.shape
    y = _vector(outcome, n_samples, "outcome")
    if family not in FAMILIES:
        raise UsageError(
            code="family-not-supported",
            where="family",
            what=f"unknown (got {family!r})",
            accepted=f"accepted are {name_some(FAMILIES)}",
            next_step="Choose one of them",
        )
    rows = _rows(subsamples, n_samples)
    _check_outcome(y, rows, family)
    block = BlockSpecification(
        family=FAMILIES[family],
        rows=rows,
        y=y,
        weights=_positive(weights, n_samples, "weights"),
        feature_weights=_feature_weights(feature_weights, n_features),
        penalties=_grid(penalties, n_penalties, penalty_floor, n_features, rows),
        relative=penalties is None,
        scaled=standardise,
        mixing=_share(mixing),
        max_markers=n_features if max_markers is None else max_markers,
        tol=tol,
        steps=ENGINE.max_steps,
    )
    return _path_set(run_block(source, block, threads), block, family, n_features)


def _vector(values: ArrayLike, length: int, where: str) -> NDArray[np.float64]:
    array = np.asarray(values, np.float64)
    if array.shape != (length,) or not np.isfinite(array).all():
        raise UsageError(
            code="vector-shape",
            where=where,
            what=f"an array of shape {array.shape} or with values that are not finite",
            accepted=f"{length} finite numbers, one a row of the matrix",
            next_step="Align it with the matrix",
        )
    return array


def _positive(values: ArrayLike | None, length: int, where: str) -> NDArray[np.float64]:
    if values is None:
        return np.ones(length)
    array = _vector(values, length, where)
    if not (array > 0).all():
        raise UsageError(
            code="weights-not-positive",
            where=where,
            what=f"a smallest value of {array.min():g}",
            accepted="positive numbers",
            next_step="Leave rows out by `subsamples` instead",
        )
    return array


def _feature_weights(values: ArrayLike | None, length: int) -> NDArray[np.float64]:
    if values is None:
        return np.ones(length)
    array = np.asarray(values, np.float64)
    if array.shape != (length,) or not (array >= 0).all():
        raise UsageError(
            code="feature-weights",
            where="feature_weights",
            what=f"an array of shape {array.shape} or with values below 0 or missing",
            accepted=f"{length} numbers, 0 (unpenalised) to infinity (excluded)",
            next_step="Give one weight a feature",
        )
    return array


def _share(mixing: float) -> float:
    if not 0.0 < mixing <= 1.0:
        raise UsageError(
            code="mixing-out-of-range",
            where="mixing",
            what=f"out of range (got {mixing!r})",
            accepted="above 0 and at most 1",
            next_step="Use 1 for the lasso; ridge alone picks no features",
        )
    return float(mixing)


def _rows(
    subsamples: Sequence[ArrayLike] | None, n_samples: int
) -> list[NDArray[np.int64]]:
    if subsamples is None:
        return [np.arange(n_samples)]
    rows = [np.asarray(chosen) for chosen in subsamples]
    for b, chosen in enumerate(rows):
        if (
            chosen.ndim != 1
            or chosen.dtype.kind not in "iu"
            or len(chosen) < 2
            or chosen.min() < 0
            or chosen.max() >= n_samples
            or len(np.unique(chosen)) < len(chosen)
        ):
            raise UsageError(
                code="subsample-rows",
                where=f"subsamples[{b}]",
                what="rows that are repeated, out of range or fewer than two",
                accepted=f"distinct integers from 0 to {n_samples - 1}",
                next_step="Use `weights` to count a row more than once",
            )
    if not rows:
        raise UsageError(
            code="no-subsamples",
            where="subsamples",
            what="an empty list",
            accepted="at least one array of row indices, or None for all rows",
            next_step="Leave it out to fit all rows once",
        )
    return [chosen.astype(np.int64) for chosen in rows]


def _check_outcome(
    y: NDArray[np.float64], rows: list[NDArray[np.int64]], family: str
) -> None:
    if family != "binomial":
        return
    if not np.isin(y, (0.0, 1.0)).all():
        raise UsageError(
            code="outcome-not-binary",
            where="outcome",
            what=f"values other than 0 and 1 (got {name_some(np.unique(y))})",
            accepted="0 and 1 for family 'binomial'",
            next_step="Code the positive class as 1",
        )
    single = [b for b, chosen in enumerate(rows) if np.ptp(y[chosen]) == 0.0]
    if single:
        raise FitError(
            code="one-class-subsample",
            where=f"subsamples {name_some(single)}",
            what="rows of one class only",
            accepted="both classes in every subsample",
            next_step="Stratify the subsamples by the outcome",
        )


def _grid(
    penalties: ArrayLike | None,
    n_penalties: int,
    floor: float | None,
    n_features: int,
    rows: list[NDArray[np.int64]],
) -> NDArray[np.float64]:
    if penalties is not None:
        grid = np.atleast_1d(np.asarray(penalties, np.float64))
        if not ((grid > 0).all() and (np.diff(grid) < 0).all() and len(grid)):
            raise UsageError(
                code="penalties-not-descending",
                where="penalties",
                what="values that are not positive and strictly descending",
                accepted="positive numbers, largest first",
                next_step="Sort them and drop repeated ones",
            )
        return grid
    if floor is None:
        wide = n_features > max(len(chosen) for chosen in rows)
        floor = ENGINE.penalty_floor_wide if wide else ENGINE.penalty_floor_tall
    if not 0.0 < floor < 1.0 or n_penalties < 2:
        raise UsageError(
            code="penalty-grid",
            where="n_penalties, penalty_floor",
            what=f"no path (got {n_penalties} penalties down to {floor!r})",
            accepted="at least 2 penalties and a floor between 0 and 1",
            next_step="Leave both out for the defaults",
        )
    return np.logspace(0.0, np.log10(floor), n_penalties)


def _path_set(
    refits: kernels.Refits,
    block: BlockSpecification,
    family: str,
    n_features: int,
) -> PathSet:
    failed = np.flatnonzero(refits.state[:, kernels.DONE] == 2)
    if len(failed):
        raise FitError(
            code="not-converged",
            where=f"subsamples {name_some(failed)}",
            what=f"the KKT violation stayed above {block.tol:g} of the penalty",
            accepted=f"convergence within {block.steps} Newton steps",
            next_step="Raise penalty_floor or tol, or check for separable data",
        )
    n_penalties = len(block.penalties)
    solved = np.arange(n_penalties) < refits.state[:, kernels.STEP][:, None]
    features, values, order, steps = [], [], [], []
    intercepts = np.where(solved, refits.intercept, np.nan)
    for b in range(len(block.rows)):
        stop = refits.stored_at[b, refits.state[b, kernels.STEP]]
        at = refits.stored_work[b, :stop]
        value = refits.stored_beta[b, :stop] / refits.deviation[b, at]
        shift = value * refits.mean[b, at]
        for k in np.flatnonzero(solved[b]):
            low, high = refits.stored_at[b, k : k + 2]
            intercepts[b, k] -= shift[low:high].sum()
        features.append(refits.work[b, at])
        values.append(value)
        n_picked = min(int(refits.state[b, kernels.ENTRIES]), block.max_markers)
        order.append(refits.work[b, refits.order[b, :n_picked]])
        steps.append(refits.order_step[b, :n_picked].copy())
    return PathSet(
        family=family,
        n_features=n_features,
        penalties=np.where(solved, refits.penalties, np.nan),
        largest_penalty=refits.value[:, kernels.LARGEST].copy(),
        certificate=np.where(solved, refits.certificate, np.nan),
        entry_order=tuple(order),
        entries=tuple(steps),
        intercepts=intercepts,
        coefficient_features=tuple(features),
        coefficient_values=tuple(values),
        coefficient_borders=refits.stored_at.copy(),
    )
