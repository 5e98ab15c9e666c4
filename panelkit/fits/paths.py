"""`fit_paths`: hundreds of L1 penalty paths of one matrix."""

from collections.abc import Sequence
from typing import Any

import numpy as np
from numpy.typing import ArrayLike, NDArray

from panelkit.config import ENGINE
from panelkit.errors import FitError, UsageError, name_some
from panelkit.fits.arguments import (
    check_share,
    check_tolerance,
    covariate_rows,
    feature_weight_vector,
    largest_count,
    penalty_grid,
    problem_of,
    row_lists,
)
from panelkit.fits.engine import BlockSpecification, run_block
from panelkit.fits.families import ABSENT, Family
from panelkit.fits.refits import DONE, ENTRIES, STEP, Refits
from panelkit.fits.sources import ArraySource
from panelkit.records import MatrixSource, PathSet

__all__ = ["fit_paths"]


def fit_paths(  # noqa: PLR0913 - the face of the engine: one argument a choice
    X: Any,
    outcome: Any,
    *,
    subsamples: Sequence[ArrayLike] | None = None,
    family: Family = "binomial",
    penalties: ArrayLike | None = None,
    n_penalties: int = ENGINE.n_penalties,
    penalty_floor: float | None = None,
    max_markers: int | None = None,
    feature_weights: ArrayLike | None = None,
    unpenalised: ArrayLike | None = None,
    weights: ArrayLike | None = None,
    mixing: float = 1.0,
    strata: ArrayLike | None = None,
    ties: str = "efron",
    standardise: bool = True,
    tol: float = ENGINE.tol,
    threads: int = 1,
) -> PathSet:
    r"""Return L1 penalty paths of one matrix, one a subsample, solved in lockstep.

    Minimises, for each subsample and penalty :math:`\lambda`, the weighted mean loss
    plus :math:`\lambda \sum_j v_j (a|b_j| + (1-a) b_j^2 / 2)` with an unpenalised
    intercept, over columns that are centred and scaled (divisor n) on the
    subsample's own rows; a is `mixing`, v the `feature_weights`, never rescaled. For
    several classes :math:`|b_j|` is the Euclidean norm over the classes: a feature
    enters for all of them together.

    Parameters
    ----------
    X : array_like of shape (n_samples, n_features), or MatrixSource
        The expression matrix, finite. float32 and float64 are not converted.
    outcome : array_like of shape (n_samples,), or (time, event)
        0 and 1 for ``binomial``, any finite number for ``gaussian``, class labels for
        ``multinomial``; for ``cox`` a pair of times and events (1 event, 0 censored).
    subsamples : sequence of array_like of int, optional
        Row indices of each refit; None fits all rows once.
    family : {"gaussian", "binomial", "cox", "multinomial"}
        Loss: half the squared error, logistic, partial likelihood, multinomial
        logistic.
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
    unpenalised : array_like of shape (n_samples, n_covariates), optional
        Covariates beside the matrix that are in every model.
    weights : array_like of shape (n_samples,), optional
        Observation weights, positive; rescaled to sum to one in each refit.
    mixing : float
        Share of the L1 part, above 0 and at most 1 (the lasso).
    strata : array_like of shape (n_samples,), optional
        Cox: rows are compared within a stratum only. Strata of matched sets, with
        equal times and events for the cases, give conditional logistic regression.
    ties : {"efron", "breslow"}
        Cox: how tied events are treated.
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
        A subsample with one class only or without an event, or a refit that did not
        reach `tol`.

    References
    ----------
    Tibshirani 1996, JRSS-B 58:267; Friedman, Hastie & Tibshirani 2010, J Stat Softw
    33(1); Simon et al. 2011, J Stat Softw 39(5); Yuan & Lin 2006, JRSS-B 68:49;
    Tibshirani et al. 2012, JRSS-B 74:245 (sequential strong rules); Efron 1977, JASA
    72:557; Breslow 1974, Biometrics 30:89.
    """
    source: MatrixSource = X if hasattr(X, "included") else ArraySource(X)
    n_features, n_samples = source.base.shape
    rows = row_lists(subsamples, n_samples)
    problem, classes = problem_of(
        outcome, family, rows, n_samples, weights=weights, strata=strata, ties=ties
    )
    wide = n_features > max(len(chosen) for chosen in rows)
    block = BlockSpecification(
        problem=problem,
        rows=rows,
        feature_weights=feature_weight_vector(feature_weights, n_features),
        covariates=covariate_rows(unpenalised, n_samples),
        penalties=penalty_grid(penalties, n_penalties, penalty_floor, wide),
        relative=penalties is None,
        scaled=standardise,
        mixing=check_share(mixing),
        max_markers=largest_count(max_markers, n_features),
        tol=check_tolerance(tol),
        steps=ENGINE.max_steps,
    )
    if isinstance(threads, bool) or not isinstance(threads, int) or threads < 1:
        raise UsageError(
            code="threads-out-of-range",
            where="threads",
            what=f"no number of threads (got {threads!r})",
            accepted="a whole number of at least 1",
            next_step="Leave it out for one thread",
        )
    return _path_set(run_block(source, block, threads), block, classes, n_features)


def _path_set(
    refits: Refits,
    block: BlockSpecification,
    classes: tuple[object, ...],
    n_features: int,
) -> PathSet:
    failed = np.flatnonzero(refits.state[:, DONE] == 2)
    if len(failed):
        raise FitError(
            code="not-converged",
            where=f"subsamples {name_some(failed)}",
            what=f"the KKT violation stayed above {block.tol:g} of the penalty",
            accepted=f"convergence within {block.steps} Newton steps",
            next_step="Raise penalty_floor or tol, or check for separable data",
        )
    reached = refits.state[:, STEP][:, None]
    solved = np.arange(len(block.penalties)) < reached
    paths = [_one_path(refits, block, b, n_features) for b in range(len(block.rows))]
    several = block.problem.family == "multinomial"
    intercepts = np.array([path[0] for path in paths])
    covariates = np.array([path[4] for path in paths])
    if not several:
        intercepts, covariates = intercepts[..., 0], covariates[..., 0]
    values = tuple(path[2] if several else path[2][:, 0] for path in paths)
    order, entries = [], []
    for b in range(len(block.rows)):
        n_picked = min(int(refits.state[b, ENTRIES]), block.max_markers)
        order.append(refits.work[b, refits.order[b, :n_picked]])
        entries.append(refits.order_step[b, :n_picked].copy())
    return PathSet(
        family=block.problem.family,
        n_features=n_features,
        penalties=np.where(solved, refits.penalties, np.nan),
        largest_penalty=refits.largest.copy(),
        certificate=np.where(solved, refits.certificate, np.nan),
        entry_order=tuple(order),
        entries=tuple(entries),
        intercepts=intercepts,
        coefficient_features=tuple(path[1] for path in paths),
        coefficient_values=values,
        coefficient_borders=np.array([path[3] for path in paths]),
        covariate_coefficients=covariates,
        classes=classes,
    )


def _one_path(
    refits: Refits, block: BlockSpecification, b: int, n_features: int
) -> tuple[
    NDArray[np.float64],
    NDArray[np.int64],
    NDArray[np.float64],
    NDArray[np.int64],
    NDArray[np.float64],
]:
    """Return one refit's path on the original scale.

    Intercepts (penalties, K), features and values (stored, K) with their borders, and
    the covariates' coefficients (penalties, covariates, K).
    """
    reached = int(refits.state[b, STEP])
    borders = refits.stored_at[b].copy()
    borders[reached + 1 :] = borders[reached]
    stop = borders[reached]
    at = refits.stored_work[b, :stop]
    value = refits.stored_beta[b, :stop] / refits.deviation[b, at][:, None]
    shift = value * refits.mean[b, at][:, None]
    feature = refits.work[b, at]
    n_classes = value.shape[1]
    intercept = np.full((len(block.penalties), n_classes), np.nan)
    covariates = np.full(
        (len(block.penalties), len(block.covariates), n_classes), np.nan
    )
    intercept[:reached] = refits.intercept[b, :reached]
    for k in range(reached):
        here = slice(borders[k], borders[k + 1])
        intercept[k] -= shift[here].sum(axis=0)
        covariates[k] = 0.0
        extra = feature[here] >= n_features
        covariates[k][feature[here][extra] - n_features] = value[here][extra]
    if block.problem.family == "cox":
        intercept[:reached] = 0.0  # the baseline hazard stands in its place
    elif block.problem.family == "multinomial":
        _centre(intercept[:reached])
    inside = feature < n_features
    kept = np.concatenate([[0], np.cumsum(inside)])[borders]
    return intercept, feature[inside], value[inside], kept.astype(np.int64), covariates


def _centre(intercept: NDArray[np.float64]) -> None:
    """Centre intercepts over the classes that there are; absent ones get -inf."""
    absent = intercept < 0.5 * ABSENT
    intercept[absent] = np.nan
    intercept -= np.nanmean(intercept, axis=1, keepdims=True)
    intercept[absent] = -np.inf
