"""How well scores separate two classes."""

import numpy as np
from numpy.typing import NDArray

from panelkit.errors import FitError

__all__ = ["auc", "auc_influence"]


def _placements(
    scores: NDArray[np.float64], outcome: NDArray[np.float64]
) -> tuple[NDArray[np.float64], NDArray[np.float64]]:
    """Return, for cases, the share of controls below; for controls, of cases above.

    Ties count one half.
    """
    if np.isnan(scores).any():  # a missing score has no rank
        nothing = np.full(1, np.nan)
        return nothing, nothing
    cases = scores[outcome == 1.0]
    controls = scores[outcome == 0.0]
    if not len(cases) or not len(controls):
        raise FitError(
            code="auc-one-class",
            where="area under the ROC curve",
            what=f"{len(cases)} cases and {len(controls)} controls",
            accepted="at least one of each",
            next_step="Use folds stratified by the outcome",
        )
    low = np.sort(controls)
    below = np.searchsorted(low, cases, "left") + np.searchsorted(low, cases, "right")
    high = np.sort(cases)
    above = (
        2 * len(high)
        - np.searchsorted(high, controls, "left")
        - np.searchsorted(high, controls, "right")
    )
    return below / (2.0 * len(low)), above / (2.0 * len(high))


def auc(scores: NDArray[np.float64], outcome: NDArray[np.float64]) -> float:
    """Return the area under the ROC curve, ties counted one half.

    Parameters
    ----------
    scores : ndarray of shape (n_samples,)
        Higher points to class 1.
    outcome : ndarray of shape (n_samples,)
        0 and 1.

    Returns
    -------
    float
        Between 0 and 1.

    Raises
    ------
    FitError
        One class only.

    References
    ----------
    Hanley & McNeil 1982, Radiology 143:29.
    """
    return float(_placements(scores, outcome)[0].mean())


def auc_influence(
    scores: NDArray[np.float64], outcome: NDArray[np.float64]
) -> tuple[float, NDArray[np.float64]]:
    """Return the area under the ROC curve and each sample's influence on it.

    Parameters
    ----------
    scores, outcome : ndarray of shape (n_samples,)
        As for `auc`.

    Returns
    -------
    area : float
        As `auc` gives.
    influence : ndarray of shape (n_samples,)
        Sums to 0; the variance of the area is about mean(influence^2) / n_samples
        for independent samples.

    Raises
    ------
    FitError
        One class only.

    References
    ----------
    LeDell, Petersen & van der Laan 2015, Electron J Stat 9:1583.
    """
    of_cases, of_controls = _placements(scores, outcome)
    area = float(of_cases.mean())
    n = len(scores)
    influence = np.empty(n)
    influence[outcome == 1.0] = (of_cases - area) * n / len(of_cases)
    influence[outcome == 0.0] = (of_controls - area) * n / len(of_controls)
    return area, influence
