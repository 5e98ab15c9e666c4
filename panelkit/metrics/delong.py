"""Areas under ROC curves of the same people, with their covariance."""

from dataclasses import dataclass
from math import sqrt
from statistics import NormalDist

import numpy as np
from numpy.typing import NDArray

from panelkit.errors import FitError
from panelkit.metrics.discrimination import auc_placements
from panelkit.metrics.intervals import log_odds_interval

__all__ = ["Areas", "area_interval", "delong", "hanley_mcneil_se"]


@dataclass(frozen=True, slots=True, eq=False)
class Areas:
    """Areas under the ROC curve of several scores of the same people.

    Attributes
    ----------
    areas : ndarray of shape (n_scores,)
        Ties counted one half.
    covariance : ndarray of shape (n_scores, n_scores)
        NaN where a class has fewer than two subjects.
    """

    areas: NDArray[np.float64]
    covariance: NDArray[np.float64]

    def se(self, score: int = 0) -> float:
        """Return the standard error of one area."""
        return float(np.sqrt(self.covariance[score, score]))

    def difference(self, confidence: float) -> tuple[float, float, float, float]:
        """Return the first area less the second.

        Parameters
        ----------
        confidence : float
            For example 0.95.

        Returns
        -------
        difference, low, high, p : float
            Normal interval and two-sided p-value; NaN where the two do not vary apart.
        """
        gap = float(self.areas[0] - self.areas[1])
        c = self.covariance
        variance = float(c[0, 0] + c[1, 1] - 2.0 * c[0, 1])
        if not variance > 1e-24:
            return gap, float("nan"), float("nan"), float("nan")
        se = sqrt(variance)
        half = NormalDist().inv_cdf(0.5 + 0.5 * confidence) * se
        p = 2.0 * NormalDist().cdf(-abs(gap) / se)
        return gap, gap - half, gap + half, p


def delong(
    scores: NDArray[np.float64],
    outcome: NDArray[np.float64],
    subjects: NDArray[np.int64] | None = None,
) -> Areas:
    """Return areas under the ROC curve with their covariance.

    Parameters
    ----------
    scores : ndarray of shape (n_scores, n_samples)
        Higher points to class 1.
    outcome : ndarray of shape (n_samples,)
        0 and 1.
    subjects : ndarray of shape (n_samples,), int64, optional
        Subject of each sample: what a subject's samples contribute is added up before
        its spread is taken. None takes every sample as a subject.

    Returns
    -------
    Areas
        One a score.

    Raises
    ------
    FitError
        One class only.

    References
    ----------
    DeLong, DeLong & Clarke-Pearson 1988, Biometrics 44:837; Obuchowski 1997,
    Biometrics 53:567 (clusters).
    """
    placed = [auc_placements(row, outcome) for row in scores]
    areas = np.array([area for area, _placements in placed])
    case = outcome == 1.0
    unit = np.arange(len(outcome)) if subjects is None else subjects
    people = np.unique(unit, return_inverse=True)[1]
    covariance = np.zeros((len(areas), len(areas)))
    sums, counts = [], []
    for own in (case, ~case):
        centred = np.array([p[own] for _area, p in placed]) - areas[:, None]
        total = np.array(
            [np.bincount(people[own], row, int(people.max()) + 1) for row in centred]
        )
        there = np.unique(people[own])
        sums.append(total / own.sum())
        counts.append(len(there))
        if len(there) < 2:
            return Areas(areas, np.full_like(covariance, np.nan))
        inside = total[:, there] / own.sum()
        covariance += len(there) / (len(there) - 1) * (inside @ inside.T)
    # subjects with samples in both classes tie the two parts together
    crossed = sums[0] @ sums[1].T
    return Areas(areas, covariance + crossed + crossed.T)


def area_interval(area: float, se: float, confidence: float) -> tuple[float, float]:
    """Return an interval of an area that stays inside 0 and 1.

    Parameters
    ----------
    area, se : float
        The area and its standard error.
    confidence : float
        For example 0.95.

    Returns
    -------
    low, high : float
        Symmetric on the log-odds; NaN for an area of 0 or 1, whose error is unknown.

    References
    ----------
    Pepe 2003, The Statistical Evaluation of Medical Tests, 5.2.5 (log-odds scale).
    """
    return log_odds_interval(area, se, confidence)


def hanley_mcneil_se(area: float, cases: float, controls: float) -> float:
    """Return the standard error of an area that is known by its value alone.

    Parameters
    ----------
    area : float
        Between 0 and 1.
    cases, controls : float
        Numbers of people.

    Returns
    -------
    float
        For scores near the exponential model.

    Raises
    ------
    FitError
        An area outside 0 to 1, or no case or control.

    References
    ----------
    Hanley & McNeil 1982, Radiology 143:29.
    """
    if not 0.0 <= area <= 1.0 or cases < 1 or controls < 1:
        raise FitError(
            code="area-without-error",
            where="standard error of an area",
            what=f"area {area:g} of {cases:g} cases and {controls:g} controls",
            accepted="an area from 0 to 1, at least one case and one control",
            next_step="Correct the figures",
        )
    q1 = area / (2.0 - area)
    q2 = 2.0 * area * area / (1.0 + area)
    variance = (
        area * (1.0 - area)
        + (cases - 1.0) * (q1 - area * area)
        + (controls - 1.0) * (q2 - area * area)
    ) / (cases * controls)
    return sqrt(max(variance, 0.0))
