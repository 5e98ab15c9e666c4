"""Standard errors and intervals of cross-validated figures."""

from dataclasses import dataclass
from statistics import NormalDist

import numpy as np
from numpy.typing import NDArray

from panelkit.metrics.discrimination import auc_placements

__all__ = [
    "CrossValidated",
    "corrected_se",
    "cross_validated_auc",
    "naive_se",
    "paired_interval",
]


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
    weights: NDArray[np.float64],
    confidence: float,
) -> CrossValidated:
    """Return the AUC within test folds with an interval clustered by subject.

    Placements are taken within a fold, never across folds. Each subject's placements,
    averaged over its samples and over the repeats, are centred on the overall mean;
    subjects are the independent units, in either class. The interval is taken on the
    log-odds scale, so it stays inside 0 and 1. It describes the spread over people for
    models trained as these were, not over training sets. With one fold and one sample a
    subject the variance is that of DeLong et al.

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
    weights : ndarray of shape (n_samples,)
        Observation weights; 1 / rows of the subject counts every subject once.
    confidence : float
        For example 0.95.

    Returns
    -------
    CrossValidated
        Mean, interval, areas within folds.

    References
    ----------
    LeDell, Petersen & van der Laan 2015, Electron J Stat 9:1583; DeLong, DeLong &
    Clarke-Pearson 1988, Biometrics 44:837.
    """
    n_repeats, n_samples = scores.shape
    per_fold = np.full((n_repeats, int(fold.max()) + 1), np.nan)
    placements = np.zeros((n_repeats, n_samples))
    share = np.zeros((n_repeats, n_samples))
    for repeat in range(n_repeats):
        for number in range(per_fold.shape[1]):
            test = np.flatnonzero(fold[repeat] == number)
            if not len(test) or np.ptp(outcome[test]) == 0.0:
                continue
            area, placed = auc_placements(
                scores[repeat, test], outcome[test], weights[test]
            )
            per_fold[repeat, number] = area
            placements[repeat, test] = placed
            for value in (0.0, 1.0):
                own = test[outcome[test] == value]
                share[repeat, own] = weights[own] / weights[own].sum()
    means = [row[~np.isnan(row)].mean() for row in per_fold if not np.isnan(row).all()]
    if not means:
        return CrossValidated(np.nan, np.nan, np.nan, per_fold)
    mean = float(np.mean(means))
    n_valid = (~np.isnan(per_fold)).sum(axis=1, keepdims=True)
    share /= np.maximum(n_valid, 1) * len(means)
    influence = (share * (placements - mean)).sum(axis=0)
    se = _clustered_se(influence, outcome, subjects)
    low, high = log_odds_interval(mean, se, confidence)
    return CrossValidated(mean, low, high, per_fold)


def _clustered_se(
    influence: NDArray[np.float64],
    outcome: NDArray[np.float64],
    subjects: NDArray[np.int64],
) -> float:
    """Return the standard error of a sum of influences, subjects independent."""
    variance = 0.0
    for value in (0.0, 1.0):
        own = outcome == value
        _, unit = np.unique(subjects[own], return_inverse=True)
        sums = np.bincount(unit, weights=influence[own])
        if len(sums) < 2:
            return float("nan")  # one subject has no spread
        variance += len(sums) / (len(sums) - 1) * ((sums - sums.mean()) ** 2).sum()
    return float(np.sqrt(variance))


def log_odds_interval(mean: float, se: float, confidence: float) -> tuple[float, float]:
    """Return an interval symmetric on the log-odds scale; NaN where undefined."""
    if not 0.0 < mean < 1.0 or not se > 0.0:
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


def paired_interval(
    differences: NDArray[np.float64], test_to_train: float, confidence: float
) -> tuple[float, float, float]:
    """Return the mean of paired differences over splits with its interval.

    Parameters
    ----------
    differences : ndarray
        One a train/test split, NaN where undefined.
    test_to_train : float
        Ratio of test to training samples.
    confidence : float
        For example 0.95.

    Returns
    -------
    mean, low, high : float
        Student's t with J - 1 degrees of freedom on the corrected standard error; the
        ends equal the mean where the differences do not vary, and are NaN below two.

    References
    ----------
    Nadeau & Bengio 2003, Machine Learning 52:239.
    """
    from scipy.stats import t as student  # slow to import

    values = differences[~np.isnan(differences)]
    if len(values) < 2:
        return float(np.mean(values)) if len(values) else np.nan, np.nan, np.nan
    mean = float(values.mean())
    quantile = float(student.ppf(0.5 + 0.5 * confidence, len(values) - 1))
    half = quantile * corrected_se(values, test_to_train)
    return mean, mean - half, mean + half
