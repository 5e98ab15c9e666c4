"""What else could be done with the same data, on the same folds."""

import numpy as np
from numpy.typing import NDArray

from panelkit.costing.frontier import Judge
from panelkit.costing.honest_accuracy import HonestAccuracy
from panelkit.metrics import CrossValidated, paired_interval
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
        Ridge on all features, one marker, the majority class.
    """
    primary = judge.area(accuracy.primary)
    single = _best_single(accuracy)
    found = [
        ("ridge on all features", n_features, judge.area(accuracy.ridge)),
    ]
    if single is not None:
        found.append(
            ("single marker chosen by |t| in each fold", 1, judge.area(single))
        )
    rows = [
        Comparator(
            name,
            size,
            area.mean,
            area.low,
            area.high,
            _sentence(name, area, primary, judge),
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
    name: str,
    area: CrossValidated,
    primary: CrossValidated,
    judge: Judge,
) -> str:
    difference: NDArray[np.float64] = (area.per_fold - primary.per_fold).ravel()
    gap, low, high = paired_interval(difference, judge.test_to_train, judge.confidence)
    name = f"{name[0].upper()}{name[1:]}"
    figures = f"{area.mean:.3f} against {primary.mean:.3f}"
    if np.isnan(low):
        return f"{name}: {figures}; too few folds for an interval of the difference."
    spread = (
        f"difference {gap:+.3f}, {100 * judge.confidence:g} % interval {low:+.3f} to "
        f"{high:+.3f}"
    )
    if low <= 0.0 <= high:
        return (
            f"{name} is not told apart from the primary rule by these data ({figures}; "
            f"{spread})."
        )
    if gap < 0.0:
        return f"{name} is less accurate than the primary rule ({figures}; {spread})."
    return (
        f"{name} is more accurate than the primary rule ({figures}; {spread}): the "
        "small panel gives something away."
    )
