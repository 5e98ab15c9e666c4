"""A locked panel recalibrated on new people: a new panel that names its parent."""

import math
from dataclasses import replace
from typing import Literal

import numpy as np
from numpy.typing import NDArray

from panelkit.config import LOCK
from panelkit.errors import FitError
from panelkit.lock.panel_file import sealed
from panelkit.metrics import (
    calibration_in_the_large,
    log_loss,
    recalibration,
)
from panelkit.records import PanelContent, Parent

__all__ = ["Changed", "recalibrate_panel"]

Changed = Literal["intercept", "intercept and slope"]


def recalibrate_panel(
    panel: PanelContent,
    log_odds: NDArray[np.float64],
    outcome: NDArray[np.float64],
    subjects: NDArray[np.int64],
    changed: Changed,
    draws: np.random.Generator,
) -> PanelContent:
    """Return a panel whose chances fit new people; markers and order stay.

    Cut-offs stay at their chances. What the change is worth is judged in folds, on
    rows that did not fit it.

    Parameters
    ----------
    panel : PanelContent
        The parent.
    log_odds : ndarray of shape (n_samples,)
        The parent's, of the new people.
    outcome : ndarray of shape (n_samples,)
        0 and 1.
    subjects : ndarray of shape (n_samples,), int64
        Codes; a subject stays in one fold.
    changed : {"intercept", "intercept and slope"}
        What is fitted.
    draws : numpy.random.Generator
        For the folds.

    Returns
    -------
    PanelContent
        Sealed.

    Raises
    ------
    FitError
        One class only, or a slope that is not above 0.

    References
    ----------
    Steyerberg et al. 2004, Stat Med 23:2567 (updating by intercept, or by intercept
    and slope).
    """
    intercept, slope = _fitted(log_odds, outcome, changed)
    folds = _folds(outcome, subjects, draws)
    judged = np.full(len(outcome), np.nan)
    for fold in np.unique(folds):
        test = folds == fold
        if np.ptp(outcome[~test]) > 0.0:
            a, b = _fitted(log_odds[~test], outcome[~test], changed)
            judged[test] = a + b * log_odds[test]
    there = ~np.isnan(judged)
    before = log_loss(log_odds[there], outcome[there])
    after = log_loss(judged[there], outcome[there])
    large_before, _se = calibration_in_the_large(log_odds, outcome)
    large, _se = calibration_in_the_large(judged[there], outcome[there])
    better = "better" if after < before else "no better"
    return sealed(
        replace(
            panel,
            intercept=intercept + slope * panel.intercept,
            markers=tuple(
                replace(marker, coefficient=slope * marker.coefficient)
                for marker in panel.markers
            ),
            fallbacks=tuple(
                replace(
                    each,
                    intercept=intercept + slope * each.intercept,
                    coefficients={k: slope * v for k, v in each.coefficients.items()},
                )
                for each in panel.fallbacks
            ),
            prevalence=float("nan"),
            training=replace(
                panel.training,
                score_mean=intercept + slope * panel.training.score_mean,
                score_deviation=slope * panel.training.score_deviation,
            ),
            parent=Parent(
                sha256=panel.content_sha256,
                changed=changed,
                intercept=intercept,
                slope=slope,
                samples=len(outcome),
                cases=int(outcome.sum()),
                sentence=f"Recalibrated on {len(outcome)} samples ({changed}). On rows "
                f"that did not fit it the log loss is {after:.4g} against {before:.4g} "
                f"before, {better}; calibration in the large {large:+.3f} against "
                f"{large_before:+.3f}.",
            ),
            cautions=(
                *panel.cautions,
                "Recalibrated: the people who fitted it can no longer validate it.",
            ),
        )
    )


def _fitted(
    log_odds: NDArray[np.float64], outcome: NDArray[np.float64], changed: Changed
) -> tuple[float, float]:
    if changed == "intercept":
        intercept, slope = calibration_in_the_large(log_odds, outcome)[0], 1.0
    else:
        both = recalibration(log_odds, outcome)
        intercept, slope = both.intercept, both.slope
    if math.isnan(intercept) or not slope > 0.0:
        raise FitError(
            code="recalibration-impossible",
            where="recalibration",
            what=f"{int(outcome.sum())} cases among {len(outcome)} samples give "
            f"intercept {intercept:.3g} and slope {slope:.3g}",
            accepted="samples of both classes whose scores follow the outcome, and "
            "overlap",
            next_step="Recalibrate the intercept only, or gather more people",
        )
    return intercept, slope


def _folds(
    outcome: NDArray[np.float64],
    subjects: NDArray[np.int64],
    draws: np.random.Generator,
) -> NDArray[np.int64]:
    """Return a fold for each sample, subjects whole, classes in proportion."""
    people = np.unique(subjects)
    folds = np.empty(int(people.max()) + 1, np.int64)
    start = 0
    cases = {int(s) for s in subjects[outcome == 1.0]}
    for own in (
        [p for p in people.tolist() if p in cases],
        [p for p in people.tolist() if p not in cases],
    ):
        order = draws.permutation(np.array(own, np.int64))
        folds[order] = (start + np.arange(len(order))) % LOCK.recalibration_folds
        start += len(order)
    return folds[subjects]
