"""What the panel adds to covariates, and whether scores follow the handling."""

from collections.abc import Callable, Mapping

import numpy as np
from numpy.typing import NDArray
from scipy.stats import kruskal, spearmanr

from panelkit.costing.comparisons.plain_columns import COVARIATES, WITH_COVARIATES
from panelkit.costing.frontier import Judge, panel_name
from panelkit.costing.honest_accuracy import HonestAccuracy
from panelkit.costing.primary import Primary
from panelkit.costing.subgroups import bands
from panelkit.metrics import brier, net_benefit, paired_interval
from panelkit.records import AddedValue, Handling, OutOfFold

__all__ = ["THRESHOLDS", "added_value_of", "handling_of"]

THRESHOLDS = (0.1, 0.2, 0.3, 0.5)
"""Chances from which one would act, at which net benefit is shown."""
SMALLEST = 8

Measure = Callable[[NDArray[np.float64], NDArray[np.int64]], float]


def added_value_of(
    accuracy: HonestAccuracy, primary: Primary, judge: Judge
) -> tuple[AddedValue, ...]:
    """Return what the chosen maker and size adds to the covariates, on the same folds.

    Parameters
    ----------
    accuracy : HonestAccuracy
        Holds covariates alone and with each panel, or neither.
    primary : Primary
        Says which panel.
    judge : Judge
        Outcome, subjects, folds.

    Returns
    -------
    tuple of AddedValue
        Loss, Brier score and net benefit for two classes; loss for other outcomes; the
        metric last, since a difference of areas alone says little. Empty without
        covariates.
    """
    panel = accuracy.panels[primary.taken.row]
    name = WITH_COVARIATES + panel_name(panel.maker, panel.size)
    if COVARIATES not in accuracy.others or name not in accuracy.others:
        return ()
    without, together = accuracy.others[COVARIATES], accuracy.others[name]
    task, weights = judge.task, judge.weights
    rows: list[AddedValue] = []

    def add(measure: str, better: float, of: Measure) -> None:
        before, after = (_per_fold(each, judge, of) for each in (without, together))
        gain, low, high = paired_interval(
            better * (after - before), judge.test_to_train, judge.confidence
        )
        rows.append(
            AddedValue(
                measure,
                float(np.nanmean(before)),
                float(np.nanmean(after)),
                gain,
                low,
                high,
            )
        )

    add("loss", -1.0, lambda eta, test: task.loss(eta, test, weights))
    if task.family == "binomial":
        y = task.strata.astype(np.float64)
        add("brier", -1.0, lambda eta, test: brier(task.scores(eta), y[test]))
        for threshold in THRESHOLDS:
            add(
                f"net-benefit-at-{threshold:g}",
                1.0,
                lambda eta, test, c=threshold: net_benefit(  # type: ignore[misc]
                    task.scores(eta), y[test], c, weights[test]
                ),
            )
    before, after = judge.metric(without), judge.metric(together)
    gain, low, high = paired_interval(
        (after.per_fold - before.per_fold).ravel(),
        judge.test_to_train,
        judge.confidence,
    )
    rows.append(AddedValue(task.metric, before.mean, after.mean, gain, low, high))
    return tuple(rows)


def _per_fold(predictions: OutOfFold, judge: Judge, of: Measure) -> NDArray[np.float64]:
    found = []
    folds = judge.folds
    for repeat, fold in np.ndindex(folds.n_repeats, folds.n_folds):
        test = folds.split(repeat, fold)[1]
        found.append(of(predictions.predicted[repeat][..., test], test))
    return np.array(found)


def handling_of(
    predictions: OutOfFold, judge: Judge, columns: Mapping[str, NDArray[np.object_]]
) -> tuple[Handling, ...]:
    """Return how closely the out-of-fold score follows each nuisance column.

    Within a class the outcome plays no part: a score that still follows the batch or
    the run order has learnt the handling.

    Parameters
    ----------
    predictions : OutOfFold
        Of the primary rule.
    judge : Judge
        Outcome, subjects, folds.
    columns : mapping of str to ndarray of shape (n_samples,), object
        Nuisance columns as text.

    Returns
    -------
    tuple of Handling
        One a column and class; classes of fewer than eight samples are left out.

    References
    ----------
    Kruskal & Wallis 1952, J Am Stat Assoc 47:583; Spearman 1904.
    """
    if judge.task.predictors:
        return ()
    score = np.nanmean(predictions.predicted, axis=0)
    labels = judge.task.strata
    found = []
    for name, cells in columns.items():
        text = np.array([str(cell).strip() for cell in cells])
        for value in np.unique(labels):
            rows = np.flatnonzero((labels == value) & (text != ""))
            if len(rows) >= SMALLEST:
                found += _follows(name, str(value), rows, text, score)
    return tuple(found)


def _follows(
    name: str,
    group: str,
    rows: NDArray[np.int64],
    text: NDArray[np.str_],
    score: NDArray[np.float64],
) -> list[Handling]:
    own = text[rows]
    try:
        numbers = own.astype(float)
    except ValueError:
        numbers = None
    if numbers is not None and len(np.unique(numbers)) > 5:
        r, p = spearmanr(numbers, score[rows])
        return [Handling(name, group, len(rows), "spearman", float(r), float(p))]
    groups = bands(own.astype(object)) or {}
    members = [score[rows[place]] for place in groups.values() if len(place) > 1]
    if len(members) < 2:
        return []
    h, p = kruskal(*members)
    share = float(h) / (len(np.concatenate(members)) - 1)
    return [Handling(name, group, len(rows), "epsilon-squared", share, float(p))]
