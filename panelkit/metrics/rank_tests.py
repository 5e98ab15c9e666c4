"""Tests of many things at once: rank sums, two-by-two tables, their multiplicity."""

from statistics import NormalDist

import numpy as np
from numpy.typing import NDArray

__all__ = [
    "auc_score_interval",
    "false_discovery_adjusted",
    "fisher_exact_many",
    "holm_adjusted",
    "rank_sum_p",
]


def rank_sum_p(scores: NDArray[np.float64], outcome: NDArray[np.float64]) -> float:
    """Return the two-sided p-value of the rank-sum test.

    Parameters
    ----------
    scores : ndarray of shape (n_samples,)
        No missing values.
    outcome : ndarray of shape (n_samples,)
        0 and 1, both present.

    Returns
    -------
    float
        Exact for small samples without ties, otherwise the normal approximation with
        the correction for ties; 1 where all scores are equal.

    References
    ----------
    Mann & Whitney 1947, Annals of Mathematical Statistics 18:50.
    """
    from scipy.stats import mannwhitneyu  # slow to import; start-up must stay light

    if scores.min() == scores.max():
        return 1.0
    return float(mannwhitneyu(scores[outcome == 1.0], scores[outcome == 0.0]).pvalue)


def fisher_exact_many(
    hits: NDArray[np.int64], totals: NDArray[np.int64], n_first: int, n_second: int
) -> NDArray[np.float64]:
    """Return Fisher's exact two-sided p-value of many two-by-two tables at once.

    All tables share their class sizes; tables with the same counts are solved once.

    Parameters
    ----------
    hits : ndarray of shape (n_tables,), int64
        Hits in the first class.
    totals : ndarray of shape (n_tables,), int64
        Hits in both classes.
    n_first, n_second : int
        Sizes of the classes.

    Returns
    -------
    ndarray of shape (n_tables,)
        Sum of the probabilities of all tables that are no likelier than the observed
        one.

    References
    ----------
    Fisher 1935, Journal of the Royal Statistical Society 98:39.
    """
    from scipy.stats import hypergeom

    p_values = np.ones(len(hits))
    for total in np.unique(totals):
        low, high = max(0, int(total) - n_second), min(n_first, int(total))
        if low == high:
            continue
        chances = hypergeom.pmf(
            np.arange(low, high + 1), n_first + n_second, n_first, total
        )
        order = np.sort(chances)
        below = np.cumsum(order)
        # equal probabilities differ by rounding: compare with a small margin
        place = np.searchsorted(order, chances * (1.0 + 1e-7), side="right") - 1
        own = totals == total
        p_values[own] = np.minimum(1.0, below[place][hits[own] - low])
    return p_values


def false_discovery_adjusted(p_values: NDArray[np.float64]) -> NDArray[np.float64]:
    """Return p-values adjusted for the false discovery rate.

    Parameters
    ----------
    p_values : ndarray of shape (n_tests,)
        Between 0 and 1.

    Returns
    -------
    ndarray of shape (n_tests,)
        Values at most q: among them a share of at most q is expected to be false.

    References
    ----------
    Benjamini & Hochberg 1995, Journal of the Royal Statistical Society B 57:289.
    """
    from scipy.stats import false_discovery_control

    return np.asarray(false_discovery_control(p_values))


def holm_adjusted(p_values: NDArray[np.float64]) -> NDArray[np.float64]:
    """Return p-values adjusted so that any false one is unlikely.

    Parameters
    ----------
    p_values : ndarray of shape (n_tests,)
        Between 0 and 1.

    Returns
    -------
    ndarray of shape (n_tests,)
        In the order given; at most 1.

    References
    ----------
    Holm 1979, Scandinavian Journal of Statistics 6:65.
    """
    order = np.argsort(p_values, kind="stable")
    factors = np.arange(len(p_values), 0, -1)
    stepped = np.maximum.accumulate(p_values[order] * factors)
    adjusted = np.empty(len(p_values))
    adjusted[order] = np.minimum(1.0, stepped)
    return adjusted


def auc_score_interval(
    area: float, n_cases: int, n_controls: int, confidence: float
) -> tuple[float, float]:
    """Return the interval of an area under the ROC curve that also holds at 0 and 1.

    All areas whose own standard error, at that area, reaches the observed one:
    |area - A| <= z SE(A), with the variance of Hanley & McNeil in which both class
    sizes are replaced by their mean.

    Parameters
    ----------
    area : float
        Observed area.
    n_cases, n_controls : int
        Independent units of each class.
    confidence : float
        For example 0.95.

    Returns
    -------
    low, high : float
        Between 0 and 1.

    References
    ----------
    Newcombe 2006, Statistics in Medicine 25:559, method 5; Hanley & McNeil 1982,
    Radiology 143:29 (the variance).
    """
    z = NormalDist().inv_cdf(0.5 + 0.5 * confidence)

    def reached(other: float) -> bool:
        half = 0.5 * (n_cases + n_controls) - 1.0
        spread = 1.0 + half * ((1.0 - other) / (2.0 - other) + other / (1.0 + other))
        variance = other * (1.0 - other) * spread / (n_cases * n_controls)
        return abs(area - other) <= z * float(np.sqrt(variance))

    def end(outside: float) -> float:
        inside = area
        for _ in range(60):  # halving: exact to the last bit of a double
            middle = 0.5 * (inside + outside)
            inside, outside = (middle, outside) if reached(middle) else (inside, middle)
        return inside

    return end(0.0), end(1.0)
