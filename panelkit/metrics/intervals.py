"""Standard errors and intervals of cross-validated figures."""

from dataclasses import dataclass
from statistics import NormalDist

import numpy as np
from numpy.typing import NDArray

from panelkit.metrics.discrimination import auc_influence

__all__ = ["CrossValidated", "corrected_se", "cross_validated_auc", "naive_se"]


@dataclass(frozen=True, slots=True, eq=False)
class CrossValidated:
    """A cross-validated area under the ROC curve.

    Attributes
    ----------
    mean : float
        Mean over test folds, then over repeats.
    low, high : float
        Interval of `mean`; NaN where it cannot be estimated.
    per_fold : ndarray of shape (n_repeats, n_folds)
        Area within each test fold; NaN where a fold has one class only.
    """

    mean: float
    low: float
    high: float
    per_fold: NDArray[np.float64]


def cross_validated_auc(
    scores: NDArray[np.float64],
    outcome: NDArray[np.float64],
    fold: NDArray[np.int64],
    subjects: NDArray[np.int64],
    confidence: float,
) -> CrossValidated:
    """Return the AUC within test folds with an interval clustered by subject.

    Each sample's influence is averaged over the repeats, summed over the samples of
    a subject, and the subjects are the independent units; the interval is taken on
    the log-odds scale, so it stays inside 0 and 1. It describes the spread over
    people for models trained as these were, not over training sets.

    Parameters
    ----------
    scores : ndarray of shape (n_repeats, n_samples)
        Out-of-fold scores.
    outcome : ndarray of shape (n_samples,)
        0 and 1.
    fold : ndarray of shape (n_repeats, n_samples), int64
        Test fold of each sample.
    subjects : ndarray of shape (n_samples,), int64
        Subject of each sample.
    confidence : float
        For example 0.95.

    Returns
    -------
    CrossValidated
        Mean, interval, areas within folds.

    References
    ----------
    LeDell, Petersen & van der Laan 2015, Electron J Stat 9:1583.
    """
    n_repeats, n_samples = scores.shape
    per_fold = np.full((n_repeats, int(fold.max()) + 1), np.nan)
    influence = np.zeros(n_samples)
    n_valid = 0
    for repeat in range(n_repeats):
        own = np.zeros(n_samples)
        counted = 0
        for number in range(per_fold.shape[1]):
            test = np.flatnonzero(fold[repeat] == number)
            if len(test) and np.ptp(outcome[test]) > 0.0:
                area, of_samples = auc_influence(scores[repeat, test], outcome[test])
                per_fold[repeat, number] = area
                own[test] = of_samples / len(test)
                counted += 1
        if counted:
            influence += own / counted
            n_valid += 1
    means = [row[~np.isnan(row)].mean() for row in per_fold if not np.isnan(row).all()]
    if not means:
        return CrossValidated(np.nan, np.nan, np.nan, per_fold)
    mean = float(np.mean(means))
    clusters = np.bincount(subjects, weights=influence / n_valid)
    n_clusters = len(np.unique(subjects))
    se = float(np.sqrt((clusters**2).sum() * n_clusters / max(1, n_clusters - 1)))
    low, high = _log_odds_interval(mean, se, confidence)
    return CrossValidated(mean, low, high, per_fold)


def _log_odds_interval(
    mean: float, se: float, confidence: float
) -> tuple[float, float]:
    if not 0.0 < mean < 1.0 or se == 0.0:
        return float("nan"), float("nan")
    z = NormalDist().inv_cdf(0.5 + 0.5 * confidence)
    centre = np.log(mean / (1.0 - mean))
    half = z * se / (mean * (1.0 - mean))
    return (
        float(1.0 / (1.0 + np.exp(half - centre))),
        float(1.0 / (1.0 + np.exp(-half - centre))),
    )


def naive_se(per_fold: NDArray[np.float64]) -> float:
    """Return s / sqrt(J) of the fold values; NaN below two of them.

    Too small for repeated folds, whose training sets overlap: shown for comparison.

    References
    ----------
    Breiman, Friedman, Olshen & Stone 1984, section 3.4.3.
    """
    values = per_fold[~np.isnan(per_fold)]
    if len(values) < 2:
        return float("nan")
    return float(values.std(ddof=1) / np.sqrt(len(values)))


def corrected_se(per_fold: NDArray[np.float64], test_to_train: float) -> float:
    """Return sqrt(1/J + n_test/n_train) s of the fold values; NaN below two.

    Parameters
    ----------
    per_fold : ndarray
        One value a train/test split, NaN where undefined.
    test_to_train : float
        Ratio of test to training samples, 1 / (K - 1) for K folds.

    Returns
    -------
    float
        Standard error of their mean.

    References
    ----------
    Nadeau & Bengio 2003, Machine Learning 52:239; Bouckaert & Frank 2004.
    """
    values = per_fold[~np.isnan(per_fold)]
    if len(values) < 2:
        return float("nan")
    return float(values.std(ddof=1) * np.sqrt(1.0 / len(values) + test_to_train))
