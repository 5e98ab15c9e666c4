"""The headline's predictions within parts of the cohort."""

from collections.abc import Mapping

import numpy as np
from numpy.typing import NDArray

from panelkit.costing.frontier import Judge
from panelkit.metrics import CrossValidated
from panelkit.records import FoldPlan, OutOfFold, Subgroup

__all__ = ["bands", "subgroups_of"]

SMALLEST = 5
"""Samples of the smallest class below which no figure is given."""
N_BANDS = 3
MAX_GROUPS = 12


def bands(cells: NDArray[np.object_]) -> dict[str, NDArray[np.int64]] | None:
    """Return groups of a column: its values, or thirds of its numbers.

    Parameters
    ----------
    cells : ndarray of shape (n_samples,), object
        Text of the sample sheet.

    Returns
    -------
    dict of str to ndarray of int64, or None
        Rows of each group; blank cells form no group. None where the column has one
        value only, or more than twelve that are no numbers.
    """
    text = np.array([str(cell).strip() for cell in cells])
    filled = text != ""
    values = np.unique(text[filled])
    if len(values) < 2:
        return None
    numbers = _as_numbers(text)
    if numbers is not None and len(values) > N_BANDS + 2:
        edges = np.unique(np.quantile(numbers[filled], np.arange(1, N_BANDS) / N_BANDS))
        band = np.searchsorted(edges, numbers, "left")
        found = {}
        for k in range(len(edges) + 1):
            rows = np.flatnonzero(filled & (band == k))
            if len(rows):
                low, high = numbers[rows].min(), numbers[rows].max()
                found[f"{low:g} to {high:g}"] = rows
        return found
    if len(values) > MAX_GROUPS:
        return None
    return {str(value): np.flatnonzero(text == value) for value in values}


def _as_numbers(text: NDArray[np.str_]) -> NDArray[np.float64] | None:
    try:
        return np.array([float(cell) if cell else np.nan for cell in text])
    except ValueError:
        return None


def subgroups_of(
    predictions: OutOfFold, judge: Judge, columns: Mapping[str, NDArray[np.object_]]
) -> tuple[Subgroup, ...]:
    """Return accuracy within each group of each column, with counts.

    Parameters
    ----------
    predictions : OutOfFold
        Of the primary rule.
    judge : Judge
        Outcome, subjects, folds.
    columns : mapping of str to ndarray of shape (n_samples,), object
        Columns of the sample sheet.

    Returns
    -------
    tuple of Subgroup
        Groups too small for a figure are listed with their counts.
    """
    found = []
    for name, cells in columns.items():
        for group, rows in (bands(cells) or {}).items():
            found.append(_subgroup(name, group, rows, predictions, judge))
    return tuple(found)


def _subgroup(
    name: str,
    group: str,
    rows: NDArray[np.int64],
    predictions: OutOfFold,
    judge: Judge,
) -> Subgroup:
    labels = judge.task.strata
    counts = [int((labels[rows] == value).sum()) for value in np.unique(labels)]
    n_events = counts[-1] if judge.task.family == "cox" else min(counts)
    lead = f"{name} = {group}: {len(rows)} samples, "
    if min(counts) < SMALLEST:
        return Subgroup(
            name,
            group,
            len(rows),
            n_events,
            *(3 * (float("nan"),)),
            sentence=f"{lead}too few for a figure ({min(counts)} of the rarest kind).",
        )
    area = _within(rows, predictions, judge)
    if np.isnan(area.mean):
        words = "no test fold holds both kinds."
    elif np.isnan(area.low):
        words = f"{judge.task.metric_words} {area.mean:.3f}, no interval."
    else:
        words = (
            f"{judge.task.metric_words} {area.mean:.3f} ({area.low:.3f} to "
            f"{area.high:.3f})."
        )
    return Subgroup(
        name,
        group,
        len(rows),
        n_events,
        area.mean,
        area.low,
        area.high,
        sentence=lead + words,
    )


def _within(
    rows: NDArray[np.int64], predictions: OutOfFold, judge: Judge
) -> CrossValidated:
    """Return the metric where only these rows count in each test fold."""
    keep = np.zeros(len(judge.weights), np.bool_)
    keep[rows] = True
    plan = np.where(keep, judge.folds.test_fold, -1)
    return judge.task.cross_validated(
        predictions.predicted,
        FoldPlan(plan, judge.folds.n_folds),
        judge.subjects,
        judge.weights,
        judge.confidence,
    )
