"""Which differences a shortlist can find with so many people: simulation."""

import math
from collections.abc import Callable, Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from panelkit.config import SIZING
from panelkit.errors import UsageError
from panelkit.sizing.demands import check_count, check_positive, check_share

__all__ = ["Detection", "Selector", "marker_power", "simulate_detection"]

Selector = Callable[[NDArray[np.float32], NDArray[np.float64], int], NDArray[np.bool_]]
"""Values (samples, features), outcome, number of the draw -> which are picked."""

LEAST_PER_CLASS = 8


@dataclass(frozen=True, slots=True)
class Detection:
    """What the shortlist found with a number of people.

    Attributes
    ----------
    n_people : int
        Both classes together.
    difference : float
        Of a true marker, in within-class SD.
    found : float
        Share of true markers that were picked, over all invented cohorts.
    found_se : float
        Its standard error over cohorts.
    false_markers : float
        Picked features without a difference, mean over cohorts.
    all_found : float
        Share of cohorts in which every true marker was picked.
    single_test : float
        Power of Student's t test of one marker at the level that tolerates as many
        false markers, for comparison.
    """

    n_people: int
    difference: float
    found: float
    found_se: float
    false_markers: float
    all_found: float
    single_test: float


def marker_power(
    n_cases: int, n_controls: int, difference: float, level: float
) -> float:
    """Return the power of the two-sided t test of one marker.

    Parameters
    ----------
    n_cases, n_controls : int
        People in each class.
    difference : float
        Of the means, in within-class SD.
    level : float
        Significance level.

    Returns
    -------
    float
        By the noncentral t distribution.

    References
    ----------
    Cohen 1988, Statistical Power Analysis for the Behavioral Sciences, chapter 2.
    """
    from scipy import stats

    df = n_cases + n_controls - 2
    shift = difference / math.sqrt(1.0 / n_cases + 1.0 / n_controls)
    cut = float(stats.t.isf(level / 2.0, df))
    upper = float(stats.nct.sf(cut, df, shift))
    lower = float(stats.nct.cdf(-cut, df, shift))
    return upper + (lower if math.isfinite(lower) else 0.0)


def simulate_detection(
    n_people: int,
    difference: float,
    select: Selector,
    draws: Sequence[np.random.Generator],
    prevalence: float,
    n_features: int = SIZING.features,
    n_true: int = SIZING.true_markers,
    false_markers: float = 1.0,
) -> Detection:
    """Return what a selector finds in invented cohorts with true markers.

    Parameters
    ----------
    n_people : int
        Both classes together.
    difference : float
        Of each true marker, in within-class SD.
    select : callable
        The selector: values, outcome, number of the draw -> picked features.
    draws : sequence of numpy.random.Generator
        One an invented cohort.
    prevalence : float
        Share of cases.
    n_features, n_true : int
        Features; those with a difference. All are independent and normal.
    false_markers : float
        Tolerated, for the level of the single test.

    Returns
    -------
    Detection
        Shares over cohorts.

    Raises
    ------
    UsageError
        Values that no study can have, or too few people in a class to halve.
    """
    check_count("number of people", n_people)
    check_count("number of features", n_features, 2)
    check_count("number of true markers", n_true)
    check_share("prevalence", prevalence)
    check_positive("difference", difference)
    n_cases = round(prevalence * n_people)
    if min(n_cases, n_people - n_cases) < LEAST_PER_CLASS or n_true >= n_features:
        raise UsageError(
            code="cohort-too-small-to-halve",
            where="number of people",
            what=f"{n_people} people are {n_cases} cases and {n_people - n_cases} "
            f"controls; {n_true} of {n_features} features are markers",
            accepted=f"at least {LEAST_PER_CLASS} of each class and more features than "
            "markers",
            next_step="Simulate more people",
        )
    outcome = (np.arange(n_people) < n_cases).astype(np.float64)
    share, wrong = [], []
    for number, draw in enumerate(draws):
        values = draw.standard_normal((n_people, n_features), np.float32)
        values[:n_cases, :n_true] += np.float32(difference)
        picked = select(values, outcome, number)
        share.append(float(picked[:n_true].mean()))
        wrong.append(int(picked[n_true:].sum()))
    found = np.array(share)
    return Detection(
        n_people,
        difference,
        float(found.mean()),
        float(found.std(ddof=1) / math.sqrt(len(found)))
        if len(found) > 1
        else math.nan,
        float(np.mean(wrong)),
        float((found == 1.0).mean()),
        marker_power(
            n_cases,
            n_people - n_cases,
            difference,
            min(0.5, false_markers / n_features),
        ),
    )
