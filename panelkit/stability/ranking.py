"""One feature at a time, for every family: Welch's t, Cox score, F, correlation."""

from collections.abc import Iterator
from typing import Any

import numpy as np
from numpy.typing import NDArray

from panelkit.errors import FitError
from panelkit.fits import rank_univariate
from panelkit.records import MatrixSource

__all__ = ["cox_score_statistics", "f_statistics", "feature_statistics", "unit_means"]

TILE = 2048


def feature_statistics(
    source: MatrixSource,
    outcome: Any,
    family: str,
    rows: NDArray[np.int64],
    subjects: NDArray[np.int64],
    weights: NDArray[np.float64],
) -> NDArray[np.float64]:
    """Return how strongly each feature alone goes with the outcome.

    Subjects are the independent units: their weighted means are compared, a subject
    counting with the outcome of its first row.

    Parameters
    ----------
    source : MatrixSource
        The matrix.
    outcome : ndarray of shape (n_samples,), or (time, event)
        As `fit_paths` takes it.
    family : {"gaussian", "binomial", "cox", "multinomial"}
        Welch's t for two classes, the signed root of the score test for survival, F
        for several classes, the correlation's t for a number.
    rows : ndarray of int64
        Rows that teach.
    subjects : ndarray of shape (n_samples,), int64
        Subject of each sample.
    weights : ndarray of shape (n_samples,)
        Observation weights.

    Returns
    -------
    ndarray of shape (n_features,)
        0 where undefined or left out. For survival positive where higher values go
        with earlier events.

    Raises
    ------
    FitError
        Too few subjects, classes or events.

    References
    ----------
    Welch 1947, Biometrika 34:28; Cox 1972, JRSS-B 34:187 (score test); Fisher 1925,
    Statistical Methods for Research Workers (F).
    """
    if family == "binomial":
        return rank_univariate(source, outcome, rows, subjects, weights).t
    unit, first = _units(rows, subjects)
    if len(first) < 3:
        raise FitError(
            code="too-few-for-ranking",
            where="univariate ranking",
            what=f"{len(first)} subjects",
            accepted="at least 3 subjects",
            next_step="Use fewer folds, or more people",
        )
    found = np.zeros(source.base.shape[0])
    for here, values in _unit_tiles(source, rows, unit, weights[rows]):
        if family == "cox":
            time, event = (
                np.asarray(part, np.float64)[rows][first] for part in outcome
            )
            found[here] = cox_score_statistics(values, time, event)
        elif family == "multinomial":
            found[here] = f_statistics(values, np.asarray(outcome)[rows][first])
        else:
            found[here] = _correlation_t(values, np.asarray(outcome)[rows][first])
    found[~source.included] = 0.0
    return found


def _units(
    rows: NDArray[np.int64], subjects: NDArray[np.int64]
) -> tuple[NDArray[np.int64], NDArray[np.int64]]:
    """Return each row's unit, and the first row of each unit."""
    _, first, unit = np.unique(subjects[rows], return_index=True, return_inverse=True)
    return unit.ravel(), first


def unit_means(
    values: NDArray[np.float64], unit: NDArray[np.int64], weights: NDArray[np.float64]
) -> NDArray[np.float64]:
    """Return weighted means over the columns of each unit.

    Parameters
    ----------
    values : ndarray of shape (n_features, n_rows)
        Prepared values.
    unit : ndarray of shape (n_rows,), int64
        0 to n_units - 1.
    weights : ndarray of shape (n_rows,)
        Observation weights.

    Returns
    -------
    ndarray of shape (n_features, n_units)
        The values themselves, in the units' order, where each has one column.
    """
    n_units = int(unit.max()) + 1
    if n_units == len(unit):
        return values[:, np.argsort(unit)]
    total = np.bincount(unit, weights)
    means = np.zeros((len(values), n_units))
    for column, (k, weight) in enumerate(zip(unit, weights, strict=True)):
        means[:, k] += values[:, column] * (weight / total[k])
    return means


def _unit_tiles(
    source: MatrixSource,
    rows: NDArray[np.int64],
    unit: NDArray[np.int64],
    weights: NDArray[np.float64],
) -> Iterator[tuple[slice, NDArray[np.float64]]]:
    """Yield tiles of prepared values, one column a unit."""
    left, right = source.shift
    for start in range(0, source.base.shape[0], TILE):
        here = slice(start, min(start + TILE, source.base.shape[0]))
        values = np.array(source.base[here][:, rows], np.float64)
        for q in range(left.shape[1]):
            values += left[here, q][:, None] * right[q, rows]
        gaps = np.isnan(values)
        values = np.where(gaps, source.fill[here][:, None], values)
        yield here, unit_means(values, unit, weights)


def f_statistics(
    values: NDArray[np.float64], classes: NDArray[Any]
) -> NDArray[np.float64]:
    """Return the F of a one-way analysis of variance of each row.

    Parameters
    ----------
    values : ndarray of shape (n_features, n_units)
        Values.
    classes : ndarray of shape (n_units,)
        Class labels.

    Returns
    -------
    ndarray of shape (n_features,)
        0 where a feature does not vary within classes.

    Raises
    ------
    FitError
        One class, or as many classes as units.

    References
    ----------
    Fisher 1925, Statistical Methods for Research Workers.
    """
    labels, code = np.unique(classes, return_inverse=True)
    n_units, n_classes = len(code), len(labels)
    if not 1 < n_classes < n_units:
        raise FitError(
            code="too-few-for-ranking",
            where="univariate ranking",
            what=f"{n_classes} classes of {n_units} subjects",
            accepted="at least two classes, one of them with two subjects",
            next_step="Use fewer folds, or more people",
        )
    member = (code[:, None] == np.arange(n_classes)).astype(np.float64)
    counts = member.sum(axis=0)
    centred = values - values.mean(axis=1, keepdims=True)
    means = np.einsum("ji,ik->jk", centred, member) / counts
    between = (counts * means**2).sum(axis=1) / (n_classes - 1)
    within = ((centred - means[:, code]) ** 2).sum(axis=1) / (n_units - n_classes)
    floor = 1e-24 * (values**2).mean(axis=1)
    return np.where(
        within > floor, between / np.where(within > floor, within, 1.0), 0.0
    )


def _correlation_t(
    values: NDArray[np.float64], outcome: NDArray[Any]
) -> NDArray[np.float64]:
    """Return the t of each row's correlation with a number."""
    number = np.asarray(outcome, np.float64)
    y = number - number.mean()
    centred = values - values.mean(axis=1, keepdims=True)
    size = np.sqrt((centred**2).sum(axis=1) * (y**2).sum())
    floor = 1e-12 * np.sqrt((values**2).sum(axis=1) * (number**2).sum())
    with np.errstate(invalid="ignore", divide="ignore"):
        r = np.where(size > floor, np.einsum("ji,i->j", centred, y) / size, 0.0)
        r = np.clip(r, -1.0 + 1e-15, 1.0 - 1e-15)
        return np.asarray(r * np.sqrt((len(y) - 2) / (1.0 - r**2)), np.float64)


def cox_score_statistics(
    values: NDArray[np.float64],
    time: NDArray[np.float64],
    event: NDArray[np.float64],
) -> NDArray[np.float64]:
    """Return the signed root of the score test of each row in a Cox model alone.

    Parameters
    ----------
    values : ndarray of shape (n_features, n_units)
        Values.
    time : ndarray of shape (n_units,)
        Times.
    event : ndarray of shape (n_units,)
        1 event, 0 censored.

    Returns
    -------
    ndarray of shape (n_features,)
        Score at coefficient 0 over the root of its information there, tied events by
        Efron's approximation; positive where higher values go with earlier events, 0
        where the information is 0.

    Raises
    ------
    FitError
        No event.

    References
    ----------
    Cox 1972, JRSS-B 34:187; Efron 1977, JASA 72:557.
    """
    if not (event > 0.0).any():
        raise FitError(
            code="no-event",
            where="univariate ranking",
            what="no event among the rows that teach",
            accepted="at least one event",
            next_step="Use fewer folds, or more people",
        )
    order = np.argsort(-time, kind="stable")
    ordered_time, ordered_event = time[order], event[order] > 0.0
    x = values - values.mean(axis=1, keepdims=True)  # the score does not see a shift
    x = x[:, order]
    at_risk = np.cumsum(x, axis=1)
    squares = np.cumsum(x**2, axis=1)
    score, information = np.zeros(len(values)), np.zeros(len(values))
    for moment in np.unique(ordered_time[ordered_event]):
        last = int(np.flatnonzero(ordered_time >= moment)[-1])
        dying = np.flatnonzero((ordered_time == moment) & ordered_event)
        d = len(dying)
        own, own_squares = x[:, dying].sum(axis=1), (x[:, dying] ** 2).sum(axis=1)
        score += own
        for k in range(d):
            share = k / d
            n = last + 1.0 - share * d
            mean = (at_risk[:, last] - share * own) / n
            score -= mean
            information += (squares[:, last] - share * own_squares) / n - mean**2
    floor = 1e-20 * (values**2).mean(axis=1)
    known = information > floor
    return np.where(known, score / np.sqrt(np.where(known, information, 1.0)), 0.0)
