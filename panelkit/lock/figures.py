"""The figures of a validation: discrimination, calibration, cut-offs, subgroups."""

import math
from collections.abc import Callable, Mapping
from statistics import NormalDist
from typing import Final

import numpy as np
from numpy.typing import NDArray

from panelkit.config import LOCK
from panelkit.lock.scoring import GREY, Scores
from panelkit.metrics import (
    area_interval,
    brier,
    calibration_in_the_large,
    clopper_pearson,
    delong,
    likelihood_ratios,
    observed_over_expected,
    predictive_values,
    recalibration,
    scaled_brier,
    spiegelhalter_z,
    wilson,
)
from panelkit.records import PanelContent, ValidationFigure

__all__ = [
    "calibration_figures",
    "cutoff_figures",
    "discrimination_figure",
    "subgroup_figures",
]

NOTHING: Final = float("nan")
SMALL: Final = "too small"
Interval = Callable[[float, float, float], tuple[float, float]]


def _chances(log_odds: NDArray[np.float64]) -> NDArray[np.float64]:
    return np.asarray(1.0 / (1.0 + np.exp(-np.clip(log_odds, -700.0, 700.0))))


def discrimination_figure(
    log_odds: NDArray[np.float64],
    y: NDArray[np.float64],
    subjects: NDArray[np.int64],
    confidence: float,
    of: str = "all",
    note: str = "",
) -> ValidationFigure:
    """Return the area under the ROC curve, subjects independent.

    Parameters
    ----------
    log_odds, y, subjects : ndarray of shape (n_samples,)
        Scores; 0 and 1; subject codes.
    confidence : float
        Of the interval.
    of, note : str
        As in `ValidationFigure`.

    Returns
    -------
    ValidationFigure
        Without an interval where it is 0 or 1.

    Raises
    ------
    FitError
        One class only.
    """
    found = delong(log_odds[None, :], y, subjects)
    area = float(found.areas[0])
    low, high = area_interval(area, found.se(), confidence)
    method = "DeLong, clustered by subject, log-odds scale"
    return ValidationFigure(
        "auc", of, area, low, high, len(y), int(y.sum()), method, note
    )


def calibration_figures(
    log_odds: NDArray[np.float64], y: NDArray[np.float64], confidence: float
) -> list[ValidationFigure]:
    """Return how far predicted chances can be taken at their word.

    Parameters
    ----------
    log_odds, y : ndarray of shape (n_samples,)
        Predictions; 0 and 1.
    confidence : float
        Of the intervals.

    Returns
    -------
    list of ValidationFigure
        In the large, slope, O/E, Brier, Spiegelhalter, groups of equal size.
    """
    z = NormalDist().inv_cdf(0.5 + 0.5 * confidence)
    chances, n, cases = _chances(log_odds), len(y), int(y.sum())

    def figure(
        name: str, value: float, se: float = NOTHING, of: str = "all", how: str = ""
    ) -> ValidationFigure:
        ends = (value - z * se, value + z * se)
        return ValidationFigure(name, of, value, *ends, n, cases, how, "")

    large, large_se = calibration_in_the_large(log_odds, y)
    both = recalibration(log_odds, y)
    ratio = observed_over_expected(chances, y, confidence)
    deviate = spiegelhalter_z(chances, y)
    found = [
        figure("calibration-in-the-large", large, large_se, how="logistic, slope 1"),
        figure("calibration-slope", both.slope, both.slope_se, how="logistic"),
        figure("calibration-intercept", both.intercept, both.intercept_se,
               how="logistic, joint with the slope"),
        ValidationFigure("observed-over-expected", "all", *ratio, n, cases,
                         "logarithm of the ratio", ""),
        figure("brier", brier(chances, y)),
        figure("brier-scaled", scaled_brier(chances, y)),
        figure("spiegelhalter-z", deviate),
        figure("spiegelhalter-p", 2.0 * NormalDist().cdf(-abs(deviate))
               if not math.isnan(deviate) else NOTHING),
    ]  # fmt: skip
    order = np.argsort(chances, kind="stable")
    for k, group in enumerate(np.array_split(order, LOCK.calibration_groups)):
        if len(group):
            seen = float(y[group].sum())
            low, high = wilson(seen, len(group), confidence)
            found.append(
                ValidationFigure(
                    "observed-share",
                    f"chances about {chances[group].mean():.3f} (group {k + 1})",
                    seen / len(group), low, high, len(group), int(seen), "Wilson",
                    SMALL if len(group) < LOCK.small_group else "",
                )
            )  # fmt: skip
    return found


def cutoff_figures(
    panel: PanelContent,
    scores: Scores,
    scored: NDArray[np.bool_],
    y: NDArray[np.float64],
    prevalence: float,
    confidence: float,
) -> list[ValidationFigure]:
    """Return what each cut-off of a panel gives.

    Parameters
    ----------
    panel : PanelContent
        Its cut-offs.
    scores : Scores
        Of all samples.
    scored : ndarray of shape (n_samples,), bool
        Those with a score.
    y : ndarray of shape (n_scored,)
        0 and 1.
    prevalence : float
        Where predictive values are for; NaN for none.
    confidence : float
        Of the intervals.

    Returns
    -------
    list of ValidationFigure
        Grey results are called by the cut-off itself, and counted beside.
    """
    found: list[ValidationFigure] = []
    chances = scores.chances[scored]
    for k, cut in enumerate(panel.cutoffs):
        positive = chances >= cut.chance
        case = y == 1.0
        counts = [
            int(x.sum())
            for x in (positive & case, ~positive & case, ~positive & ~case,
                      positive & ~case)
        ]  # fmt: skip
        calls = np.array(scores.calls[k], object)[scored]
        found += _of_cutoff(cut.name, counts, prevalence, confidence)
        grey = int((calls == GREY).sum())
        found.append(_share("grey-share", cut.name, grey, len(y), int(y.sum()),
                            wilson, "Wilson", confidence))  # fmt: skip
        found += _benefit(cut.name, cut.chance, counts, prevalence)
    return found


def _share(
    name: str,
    of: str,
    hits: int,
    n: int,
    cases: int,
    interval: Interval,
    method: str,
    confidence: float,
) -> ValidationFigure:
    low, high = interval(hits, n, confidence)
    value = hits / n if n else NOTHING
    note = SMALL if n < LOCK.small_group else ""
    return ValidationFigure(name, of, value, low, high, n, cases, method, note)


def _of_cutoff(
    of: str, counts: list[int], prevalence: float, confidence: float
) -> list[ValidationFigure]:
    hits, misses, passes, alarms = counts
    cases, controls = hits + misses, passes + alarms
    found = []
    for name, right, n in (
        ("sensitivity", hits, cases),
        ("specificity", passes, controls),
    ):
        own = n if name == "sensitivity" else 0
        found += [
            _share(name, of, right, n, own, wilson, "Wilson", confidence),
            _share(f"{name}-exact", of, right, n, own, clopper_pearson,
                   "Clopper-Pearson", confidence),
        ]  # fmt: skip
    for name, ratio in zip(
        ("likelihood-ratio-positive", "likelihood-ratio-negative"),
        likelihood_ratios(hits, misses, passes, alarms, confidence),
        strict=True,
    ):
        value = NOTHING if math.isinf(ratio.value) else ratio.value
        note = "infinite: no false result" if math.isinf(ratio.value) else ""
        found.append(
            ValidationFigure(name, of, value, ratio.low, ratio.high,
                             cases + controls, cases, "logarithm", note)
        )  # fmt: skip
    if math.isnan(prevalence) or not cases or not controls:
        return found
    values = predictive_values(hits / cases, passes / controls, prevalence)
    for name, value in zip(
        ("positive-predictive-value", "negative-predictive-value"), values, strict=True
    ):
        found.append(
            ValidationFigure(name, of, value, NOTHING, NOTHING, cases + controls,
                             cases, "", f"at a prevalence of {prevalence:g}")
        )  # fmt: skip
    return found


def _benefit(
    of: str, chance: float, counts: list[int], prevalence: float
) -> list[ValidationFigure]:
    """Return net benefit of acting on the cut-off, and of acting on everybody.

    References
    ----------
    Vickers & Elkin 2006, Med Decis Making 26:565.
    """
    hits, misses, passes, alarms = counts
    cases, controls = hits + misses, passes + alarms
    if not cases or not controls:
        return []
    n = cases + controls
    share = cases / n if math.isnan(prevalence) else prevalence
    odds = chance / (1.0 - chance)
    acted = hits / cases * share - alarms / controls * (1.0 - share) * odds
    everybody = share - (1.0 - share) * odds
    note = f"acting from a chance of {chance:.3g} on, prevalence {share:.3g}"
    return [
        ValidationFigure(name, of, value, NOTHING, NOTHING, n, cases, "", note)
        for name, value in (
            ("net-benefit", acted),
            ("net-benefit-of-treating-all", everybody),
        )
    ]


def subgroup_figures(
    groups: Mapping[str, NDArray[np.object_]],
    log_odds: NDArray[np.float64],
    y: NDArray[np.float64],
    subjects: NDArray[np.int64],
    confidence: float,
) -> list[ValidationFigure]:
    """Return the area in each part of the people.

    Parameters
    ----------
    groups : mapping of str to ndarray of shape (n_samples,), object
        Columns.
    log_odds, y, subjects : ndarray of shape (n_samples,)
        Scores; 0 and 1; subject codes.
    confidence : float
        Of the intervals.

    Returns
    -------
    list of ValidationFigure
        One a value of a column; no value of the area where a class is not there.
    """
    found = []
    for name, column in groups.items():
        text = np.array([str(cell).strip() or "(blank)" for cell in column], object)
        for value in sorted(set(text)):
            own = text == value
            cases = int(y[own].sum())
            rest = int(own.sum()) - cases
            note = SMALL if min(cases, rest) < LOCK.small_group else ""
            of = f"{name}={value}"
            if not cases or not rest:
                found.append(
                    ValidationFigure("auc", of, NOTHING, NOTHING, NOTHING,
                                     cases + rest, cases, "", SMALL)
                )  # fmt: skip
                continue
            found.append(
                discrimination_figure(
                    log_odds[own], y[own], subjects[own], confidence, of, note
                )
            )
    return found
