"""What else could be done with the same data, on the same folds."""

import numpy as np
from numpy.typing import NDArray

from panelkit.costing.frontier import Judge
from panelkit.costing.honest_accuracy import HonestAccuracy
from panelkit.metrics import CrossValidated, corrected_se
from panelkit.records import Comparator, OutOfFold

__all__ = ["compare"]


def compare(
    accuracy: HonestAccuracy, judge: Judge, n_features: int
) -> tuple[Comparator, ...]:
    """Return the comparators, each with a sentence against the primary rule.

    Parameters
    ----------
    accuracy : HonestAccuracy
        Out-of-fold predictions.
    judge : Judge
        Outcome, subjects, folds.
    n_features : int
        Features that ridge reads.

    Returns
    -------
    tuple of Comparator
        Ridge on all features, the best single marker, the majority class.
    """
    primary = judge.area(accuracy.primary)
    single = _best_single(accuracy)
    found = [
        ("ridge on all features", n_features, judge.area(accuracy.ridge)),
    ]
    if single is not None:
        found.append(("best single marker", 1, judge.area(single)))
    rows = [
        Comparator(
            name,
            size,
            area.mean,
            area.low,
            area.high,
            _sentence(name, area, primary, judge.test_to_train),
        )
        for name, size, area in found
    ]
    share = max(float(judge.y.mean()), 1.0 - float(judge.y.mean()))
    rows.append(
        Comparator(
            "majority class",
            0,
            0.5,
            float("nan"),
            float("nan"),
            "Calling everybody the commoner class separates nobody (area 0.5), though "
            f"it is right for {share:.0%} of the samples.",
        )
    )
    return tuple(rows)


def _best_single(accuracy: HonestAccuracy) -> OutOfFold | None:
    """Return the univariate maker at size one: chosen anew in every fold."""
    for predictions in accuracy.panels:
        if (predictions.maker, predictions.size) == ("univariate", 1):
            return predictions
    return None


def _sentence(
    name: str, area: CrossValidated, primary: CrossValidated, test_to_train: float
) -> str:
    difference: NDArray[np.float64] = (primary.per_fold - area.per_fold).ravel()
    gap = float(np.nanmean(difference))
    se = corrected_se(difference, test_to_train)
    figures = f"{area.mean:.3f} against {primary.mean:.3f}"
    if np.isnan(se) or abs(gap) <= se:
        verdict = (
            f"is not told apart from the primary rule by these data ({figures}, "
            "difference within one standard error)"
        )
    elif gap > 0:
        verdict = f"is less accurate than the primary rule ({figures})"
    else:
        verdict = (
            f"is more accurate than the primary rule ({figures}): the small panel "
            "gives something away"
        )
    return f"{name[0].upper()}{name[1:]} {verdict}."
