"""What callers hand to `fit_paths`, checked and brought into one form."""

from collections.abc import Sequence
from typing import Any

import numpy as np
from numpy.typing import ArrayLike, NDArray

from panelkit.config import ENGINE
from panelkit.errors import FitError, UsageError, name_some
from panelkit.fits.families import FAMILIES, Problem

__all__ = [
    "check_share",
    "check_tolerance",
    "covariate_rows",
    "feature_weight_vector",
    "largest_count",
    "penalty_grid",
    "problem_of",
    "row_lists",
    "vector",
]


def _numbers(values: Any, where: str) -> NDArray[np.float64]:
    """Return an array of numbers.

    Raises
    ------
    UsageError
        Something in it is no number.
    """
    try:
        return np.asarray(values, np.float64)
    except (TypeError, ValueError):
        raise UsageError(
            code="not-numeric",
            where=where,
            what=f"not all numbers (got {type(values).__name__})",
            accepted="numbers",
            next_step="Convert text and missing values first",
        ) from None


def vector(values: Any, length: int, where: str) -> NDArray[np.float64]:
    """Return one finite number a row of the matrix.

    Raises
    ------
    UsageError
        Another shape, or values that are not finite.
    """
    array = _numbers(values, where)
    if array.shape != (length,) or not np.isfinite(array).all():
        raise UsageError(
            code="vector-shape",
            where=where,
            what=f"an array of shape {array.shape} or with values that are not finite",
            accepted=f"{length} finite numbers, one a row of the matrix",
            next_step="Align it with the matrix",
        )
    return array


def _positive(values: Any, length: int, where: str) -> NDArray[np.float64]:
    if values is None:
        return np.ones(length)
    array = vector(values, length, where)
    if not (array > 0).all():
        raise UsageError(
            code="weights-not-positive",
            where=where,
            what=f"a smallest value of {array.min():g}",
            accepted="positive numbers",
            next_step="Leave rows out by `subsamples` instead",
        )
    return array


def feature_weight_vector(values: Any, length: int) -> NDArray[np.float64]:
    """Return one feature weight a column.

    Raises
    ------
    UsageError
        Another shape, or values below 0 or missing.
    """
    if values is None:
        return np.ones(length)
    array = _numbers(values, "feature_weights")
    if array.shape != (length,) or not (array >= 0).all():
        raise UsageError(
            code="feature-weights",
            where="feature_weights",
            what=f"an array of shape {array.shape} or with values below 0 or missing",
            accepted=f"{length} numbers, 0 (unpenalised) to infinity (excluded)",
            next_step="Give one weight a feature",
        )
    return array


def covariate_rows(values: Any, length: int) -> NDArray[np.float64]:
    """Return unpenalised covariates, one a row.

    Raises
    ------
    UsageError
        Another shape, or values that are not finite.
    """
    if values is None:
        return np.empty((0, length))
    array = _numbers(values, "unpenalised")
    if array.ndim == 1:
        array = array[:, None]
    if array.ndim != 2 or len(array) != length or not np.isfinite(array).all():
        raise UsageError(
            code="covariate-shape",
            where="unpenalised",
            what=f"an array of shape {array.shape} or with values that are not finite",
            accepted=f"{length} rows of finite numbers, a column a covariate",
            next_step="Align it with the matrix",
        )
    return np.ascontiguousarray(array.T)


def check_share(mixing: Any) -> float:
    """Return the share of the L1 part.

    Raises
    ------
    UsageError
        Not above 0 and at most 1.
    """
    if not _is_number(mixing) or not 0.0 < mixing <= 1.0:
        raise UsageError(
            code="mixing-out-of-range",
            where="mixing",
            what=f"out of range (got {mixing!r})",
            accepted="above 0 and at most 1",
            next_step="Use 1 for the lasso; ridge alone picks no features",
        )
    return float(mixing)


def check_tolerance(tol: Any) -> float:
    """Return the tolerance.

    Raises
    ------
    UsageError
        Not above 0 and below 1.
    """
    if not _is_number(tol) or not 0.0 < tol < 1.0:
        raise UsageError(
            code="tolerance-out-of-range",
            where="tol",
            what=f"out of range (got {tol!r})",
            accepted="above 0 and below 1, for example 1e-6",
            next_step="Leave it out for the default",
        )
    return float(tol)


def _is_number(value: Any) -> bool:
    return isinstance(value, int | float | np.number) and not isinstance(value, bool)


def largest_count(max_markers: Any, n_features: int) -> int:
    """Return after how many markers a refit stops; None means never.

    Raises
    ------
    UsageError
        Not a whole number of at least 1.
    """
    if max_markers is None:
        return n_features + 1
    if isinstance(max_markers, bool) or not isinstance(max_markers, int | np.integer):
        max_markers = f"{max_markers!r}"
    elif max_markers >= 1:
        return int(max_markers)
    raise UsageError(
        code="max-markers-out-of-range",
        where="max_markers",
        what=f"no number of markers (got {max_markers})",
        accepted="a whole number of at least 1, or None for no limit",
        next_step="Leave it out to walk the whole path",
    )


def row_lists(
    subsamples: Sequence[ArrayLike] | None, n_samples: int
) -> list[NDArray[np.int64]]:
    """Return the rows of each refit.

    Raises
    ------
    UsageError
        Rows that are repeated, out of range or fewer than two, or no list.
    """
    if subsamples is None:
        return [np.arange(n_samples)]
    try:
        rows = [np.asarray(chosen) for chosen in subsamples]
    except (TypeError, ValueError):
        rows = []
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
            what="no list of row indices",
            accepted="at least one array of row indices, or None for all rows",
            next_step="Leave it out to fit all rows once",
        )
    return [chosen.astype(np.int64) for chosen in rows]


def penalty_grid(
    penalties: Any,
    n_penalties: Any,
    floor: Any,
    wide: bool,
) -> NDArray[np.float64]:
    """Return penalties, or relative ones where none are given.

    Raises
    ------
    UsageError
        Not positive, finite and descending, or no path.
    """
    if penalties is not None:
        grid = np.atleast_1d(_numbers(penalties, "penalties"))
        descending = grid.ndim == 1 and len(grid) and np.isfinite(grid).all()
        if not descending or not (grid > 0).all() or not (np.diff(grid) < 0).all():
            raise UsageError(
                code="penalties-not-descending",
                where="penalties",
                what="values that are not positive, finite and strictly descending",
                accepted="positive numbers, largest first",
                next_step="Sort them and drop repeated ones",
            )
        return grid
    if floor is None:
        floor = ENGINE.penalty_floor_wide if wide else ENGINE.penalty_floor_tall
    whole = isinstance(n_penalties, int | np.integer)
    if not (_is_number(floor) and 0.0 < floor < 1.0 and whole and n_penalties >= 2):
        raise UsageError(
            code="penalty-grid",
            where="n_penalties, penalty_floor",
            what=f"no path (got {n_penalties!r} penalties down to {floor!r})",
            accepted="at least 2 penalties and a floor between 0 and 1",
            next_step="Leave both out for the defaults",
        )
    return np.logspace(0.0, np.log10(floor), int(n_penalties))


def problem_of(
    outcome: Any,
    family: Any,
    rows: list[NDArray[np.int64]],
    n_samples: int,
    *,
    weights: Any,
    strata: Any,
    ties: Any,
) -> tuple[Problem, tuple[object, ...]]:
    """Return the problem, and the classes of a multinomial one.

    Raises
    ------
    UsageError
        An unknown family, or an outcome that does not suit it.
    FitError
        A subsample with one class only, or without an event.
    """
    if not isinstance(family, str) or family not in FAMILIES:
        raise UsageError(
            code="family-not-supported",
            where="family",
            what=f"unknown (got {family!r})",
            accepted=f"accepted are {name_some(FAMILIES)}",
            next_step="Choose one of them",
        )
    if ties not in ("efron", "breslow"):
        raise UsageError(
            code="ties-unknown",
            where="ties",
            what=f"unknown (got {ties!r})",
            accepted="'efron' or 'breslow'",
            next_step="Choose one of them",
        )
    share = _positive(weights, n_samples, "weights")
    groups = _codes(strata, n_samples)
    nothing = np.zeros(n_samples)
    if family == "cox":
        time, event = _survival(outcome, n_samples)
        _refuse_no_event(event, rows)
        return Problem("cox", time, event, groups, share, 1, ties == "efron"), ()
    if family == "multinomial":
        classes, code = _classes(outcome, n_samples)
        _refuse_one_class(code, rows)
        problem = Problem("multinomial", code, nothing, groups, share, len(classes))
        return problem, classes
    y = vector(outcome, n_samples, "outcome")
    if family == "gaussian":
        return Problem("gaussian", y, nothing, groups, share), ()
    if not np.isin(y, (0.0, 1.0)).all():
        raise UsageError(
            code="outcome-not-binary",
            where="outcome",
            what=f"values other than 0 and 1 (got {name_some(np.unique(y))})",
            accepted="0 and 1 for family 'binomial'",
            next_step="Code the positive class as 1",
        )
    _refuse_one_class(y, rows)
    return Problem("binomial", y, nothing, groups, share), ()


def _codes(strata: Any, n_samples: int) -> NDArray[np.int64]:
    if strata is None:
        return np.zeros(n_samples, np.int64)
    labels = np.asarray(strata)
    if labels.shape != (n_samples,):
        raise UsageError(
            code="strata-shape",
            where="strata",
            what=f"an array of shape {labels.shape}",
            accepted=f"{n_samples} labels, one a row of the matrix",
            next_step="Align it with the matrix",
        )
    return np.unique(labels, return_inverse=True)[1].astype(np.int64)


def _survival(
    outcome: Any, n_samples: int
) -> tuple[NDArray[np.float64], NDArray[np.float64]]:
    """Return times and events."""
    try:
        time, event = outcome
    except (TypeError, ValueError):
        raise UsageError(
            code="outcome-not-survival",
            where="outcome",
            what="not a pair of times and events",
            accepted="(time, event) for family 'cox'",
            next_step="Hand over both arrays as a pair",
        ) from None
    times = vector(time, n_samples, "outcome, time")
    events = vector(event, n_samples, "outcome, event")
    if not (np.isin(events, (0.0, 1.0)).all() and (times >= 0).all()):
        raise UsageError(
            code="outcome-not-survival",
            where="outcome",
            what="times below 0, or events other than 0 and 1",
            accepted="times from 0, and 1 for an event, 0 for censored",
            next_step="Code other kinds of event as censored, or leave them out",
        )
    return times, events


def _classes(
    outcome: Any, n_samples: int
) -> tuple[tuple[object, ...], NDArray[np.float64]]:
    labels = np.asarray(outcome)
    missing = labels.dtype.kind == "f" and not np.isfinite(labels).all()
    if labels.shape != (n_samples,) or missing:
        raise UsageError(
            code="vector-shape",
            where="outcome",
            what=f"an array of shape {labels.shape} or with missing values",
            accepted=f"{n_samples} class labels, one a row of the matrix",
            next_step="Align it with the matrix",
        )
    classes, code = np.unique(labels, return_inverse=True)
    return tuple(classes.tolist()), code.astype(np.float64)


def _refuse_one_class(
    values: NDArray[np.float64], rows: list[NDArray[np.int64]]
) -> None:
    bad = [b for b, chosen in enumerate(rows) if np.ptp(values[chosen]) == 0.0]
    if bad:
        raise FitError(
            code="one-class-subsample",
            where=f"subsamples {name_some(bad)}",
            what="rows of one class only",
            accepted="two classes in every subsample",
            next_step="Stratify the subsamples by the outcome",
        )


def _refuse_no_event(event: NDArray[np.float64], rows: list[NDArray[np.int64]]) -> None:
    bad = [b for b, chosen in enumerate(rows) if not event[chosen].any()]
    if bad:
        raise FitError(
            code="no-event-subsample",
            where=f"subsamples {name_some(bad)}",
            what="no event",
            accepted="an event in every subsample",
            next_step="Stratify the subsamples by the events",
        )
