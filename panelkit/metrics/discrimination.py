"""How well scores separate two classes."""

import numpy as np
from numpy.typing import NDArray

from panelkit.errors import FitError

__all__ = ["areas", "auc", "auc_placements"]

PAIRS_AT_ONCE = 1 << 20


def _share_below(
    points: NDArray[np.float64],
    others: NDArray[np.float64],
    weights: NDArray[np.float64],
) -> NDArray[np.float64]:
    """Return the weighted share of `others` below each point, ties counted one half."""
    order = np.argsort(others, kind="stable")
    total = np.concatenate([[0.0], np.cumsum(weights[order])])
    ranked = others[order]
    below = total[np.searchsorted(ranked, points, "left")]
    up_to = total[np.searchsorted(ranked, points, "right")]
    return np.asarray(0.5 * (below + up_to) / total[-1], np.float64)


def auc_placements(
    scores: NDArray[np.float64],
    outcome: NDArray[np.float64],
    weights: NDArray[np.float64] | None = None,
) -> tuple[float, NDArray[np.float64]]:
    """Return the area under the ROC curve and each sample's placement.

    Parameters
    ----------
    scores : ndarray of shape (n_samples,)
        Higher points to class 1.
    outcome : ndarray of shape (n_samples,)
        0 and 1.
    weights : ndarray of shape (n_samples,), optional
        Positive observation weights; None counts every sample once.

    Returns
    -------
    area : float
        Between 0 and 1; NaN where a score is missing.
    placements : ndarray of shape (n_samples,)
        For a case the share of controls below it, for a control the share of cases
        above it, ties counted one half; their weighted mean in a class is the area.

    Raises
    ------
    FitError
        One class only.

    References
    ----------
    Hanley & McNeil 1982, Radiology 143:29; DeLong, DeLong & Clarke-Pearson 1988,
    Biometrics 44:837 (placements).
    """
    case = outcome == 1.0
    if case.all() or not case.any():
        raise _one_class(case)
    if np.isnan(scores).any():  # a missing score has no rank
        return float("nan"), np.full(len(scores), np.nan)
    share = np.ones(len(scores)) if weights is None else weights
    placements = np.empty(len(scores))
    placements[case] = _share_below(scores[case], scores[~case], share[~case])
    placements[~case] = 1.0 - _share_below(scores[~case], scores[case], share[case])
    return float(np.average(placements[case], weights=share[case])), placements


def auc(
    scores: NDArray[np.float64],
    outcome: NDArray[np.float64],
    weights: NDArray[np.float64] | None = None,
) -> float:
    """Return the area under the ROC curve, ties counted one half.

    Parameters
    ----------
    scores, outcome, weights
        As for `auc_placements`.

    Returns
    -------
    float
        Between 0 and 1; NaN where a score is missing.

    Raises
    ------
    FitError
        One class only.

    References
    ----------
    Hanley & McNeil 1982, Radiology 143:29.
    """
    return auc_placements(scores, outcome, weights)[0]


def areas(
    scores: NDArray[np.float64],
    outcome: NDArray[np.float64],
    weights: NDArray[np.float64],
) -> NDArray[np.float64]:
    """Return the areas under the ROC curve of many scores of the same samples.

    Parameters
    ----------
    scores : ndarray of shape (n_scores, n_samples)
        Higher points to class 1.
    outcome, weights
        As for `auc`.

    Returns
    -------
    ndarray of shape (n_scores,)
        NaN where a score is missing.

    Raises
    ------
    FitError
        One class only.
    """
    case = outcome == 1.0
    if case.all() or not case.any():
        raise _one_class(case)
    share = weights[case][:, None] * weights[~case]
    share = share / share.sum()
    found = np.empty(len(scores))
    step = max(1, PAIRS_AT_ONCE // share.size)
    for start in range(0, len(scores), step):
        some = scores[start : start + step]
        high, low = some[:, case, None], some[:, None, ~case]
        wins = (high > low) + 0.5 * (high == low)
        found[start : start + step] = np.einsum("pij,ij->p", wins, share)
    found[np.isnan(scores).any(axis=1)] = np.nan
    return found


def _one_class(case: NDArray[np.bool_]) -> FitError:
    return FitError(
        code="auc-one-class",
        where="area under the ROC curve",
        what=f"{int(case.sum())} cases and {int((~case).sum())} controls",
        accepted="at least one of each",
        next_step="Use folds stratified by the outcome",
    )
