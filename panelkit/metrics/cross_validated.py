"""Any metric within test folds, with an interval clustered by subject."""

from collections.abc import Callable
from statistics import NormalDist
from typing import Literal

import numpy as np
from numpy.typing import NDArray

from panelkit.metrics.intervals import CrossValidated, log_odds_interval

__all__ = ["Measure", "cross_validate"]

Measure = Callable[[int, NDArray[np.int64]], tuple[float, NDArray[np.float64]] | None]
"""Repeat and test rows to (value, influence of each row); None where undefined."""


def cross_validate(
    measure: Measure,
    fold: NDArray[np.int64],
    subjects: NDArray[np.int64],
    confidence: float,
    scale: Literal["log-odds", "plain"],
) -> CrossValidated:
    """Return a metric within test folds, averaged, with its interval.

    Each subject's influences are added over its samples, the folds and the repeats;
    subjects are the independent units. The interval describes the spread over people
    for models trained as these were, not over training sets.

    Parameters
    ----------
    measure : callable
        Of a repeat and its test rows.
    fold : ndarray of shape (n_repeats, n_samples), int64
        Test fold of each sample; -1 where it is never tested.
    subjects : ndarray of shape (n_samples,), int64
        Subject of each sample.
    confidence : float
        For example 0.95.
    scale : {"log-odds", "plain"}
        Where the interval is symmetric; log-odds stay inside 0 and 1.

    Returns
    -------
    CrossValidated
        Mean, interval, values within folds.

    References
    ----------
    LeDell, Petersen & van der Laan 2015, Electron J Stat 9:1583 (for the area under
    the ROC curve; the same first-order argument holds for every smooth metric).
    """
    n_repeats, n_samples = fold.shape
    per_fold = np.full((n_repeats, int(fold.max()) + 1), np.nan)
    influence = np.zeros((n_repeats, n_samples))
    for repeat, number in np.ndindex(*per_fold.shape):
        test = np.flatnonzero(fold[repeat] == number)
        found = measure(repeat, test) if len(test) else None
        if found is not None:
            per_fold[repeat, number], influence[repeat, test] = found
    counted = (~np.isnan(per_fold)).sum(axis=1)
    used = np.flatnonzero(counted)
    if not len(used):
        return CrossValidated(np.nan, np.nan, np.nan, per_fold)
    mean = float(np.mean([np.nanmean(per_fold[repeat]) for repeat in used]))
    total = (influence[used] / counted[used, None]).sum(axis=0) / len(used)
    _, unit = np.unique(subjects[(fold >= 0).any(axis=0)], return_inverse=True)
    sums = np.bincount(unit, weights=total[(fold >= 0).any(axis=0)])
    if len(sums) < 2:
        return CrossValidated(mean, np.nan, np.nan, per_fold)
    spread = ((sums - sums.mean()) ** 2).sum() * len(sums) / (len(sums) - 1)
    low, high = _interval(mean, float(np.sqrt(spread)), confidence, scale)
    return CrossValidated(mean, low, high, per_fold)


def _interval(
    mean: float, se: float, confidence: float, scale: str
) -> tuple[float, float]:
    if not se > 0.0:
        return float("nan"), float("nan")
    if scale == "plain":
        z = NormalDist().inv_cdf(0.5 + 0.5 * confidence)
        return mean - z * se, mean + z * se
    return log_odds_interval(mean, se, confidence)
