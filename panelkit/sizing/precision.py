"""People needed to measure a sensitivity, a specificity or an area to a given width."""

import math
from dataclasses import dataclass
from fractions import Fraction
from statistics import NormalDist

from panelkit.config import SIZING
from panelkit.metrics import (
    binormal_auc_variance,
    hanley_mcneil_se,
    normal_scores_auc_se,
)
from panelkit.sizing.demands import (
    check_area,
    check_between,
    check_positive,
    check_share,
    smallest,
)

__all__ = [
    "CohortSize",
    "area_size_binormal",
    "area_size_hanley_mcneil",
    "area_size_normal_scores",
    "area_width",
    "buderer_size",
    "normal_quantile",
    "wilson_size",
    "wilson_width",
]

PRINTED_Z = 1.96  # as the published size formulas print it


def normal_quantile(confidence: float) -> float:
    """Return the two-sided normal quantile of a confidence.

    Raises
    ------
    UsageError
        Not a share.
    """
    check_share("confidence", confidence)
    return NormalDist().inv_cdf(0.5 + 0.5 * confidence)


@dataclass(frozen=True, slots=True)
class CohortSize:
    """Cases and controls for a precision, and the cohort that brings them.

    Attributes
    ----------
    exact : float
        People of the class before any rounding.
    people : int
        People of the class, rounded up.
    cohort_late : int
        Cohort when only the end is rounded up.
    cohort_early : int
        Cohort when the class is rounded up first: surely enough on average.
    """

    exact: float
    people: int
    cohort_late: int
    cohort_early: int


def _ceiling(value: Fraction | float) -> int:
    """Return the next whole number; a float's rounding error adds no person."""
    return math.ceil(value - 1e-9) if isinstance(value, float) else math.ceil(value)


def _ratio(value: float) -> Fraction:
    return Fraction(str(value))  # 0.9 as it is written, not as binary holds it


def buderer_size(
    share: float, half_width: float, class_share: float, z: float = PRINTED_Z
) -> CohortSize:
    """Return the size for a sensitivity or specificity by the normal interval.

    Parameters
    ----------
    share : float
        Expected sensitivity or specificity.
    half_width : float
        Of the interval.
    class_share : float
        Share of the cohort in the class: prevalence, or 1 less prevalence.
    z : float
        Normal quantile; the publication prints 1.96.

    Returns
    -------
    CohortSize
        z^2 p (1 - p) / w^2, in exact arithmetic before rounding.

    Raises
    ------
    UsageError
        Values that no study can have.

    References
    ----------
    Buderer 1996, Acad Emerg Med 3:895.
    """
    check_share("expected share", share)
    check_share("share of the class", class_share)
    check_between("half-width", half_width, 0.0, 0.5)
    p, w, part = _ratio(share), _ratio(half_width), _ratio(class_share)
    exact = _ratio(z) ** 2 * p * (1 - p) / w**2
    people = _ceiling(exact)
    return CohortSize(
        float(exact), people, _ceiling(exact / part), _ceiling(Fraction(people) / part)
    )


def wilson_width(share: float, n: float, z: float) -> float:
    """Return the full width of the Wilson interval when the share is as expected.

    References
    ----------
    Wilson 1927, J Am Stat Assoc 22:209.
    """
    return 2.0 * z * math.sqrt(n * share * (1.0 - share) + z * z / 4.0) / (n + z * z)


def wilson_size(
    share: float,
    half_width: float,
    class_share: float,
    confidence: float = SIZING.confidence,
) -> CohortSize:
    """Return the size for a sensitivity or specificity by the Wilson interval.

    Parameters
    ----------
    share, half_width, class_share
        As for `buderer_size`; the interval's full width is twice `half_width`.
    confidence : float
        Two-sided.

    Returns
    -------
    CohortSize
        The smallest number whose interval is narrow enough when the share is as
        expected.

    Raises
    ------
    UsageError
        Values that no study can have.

    References
    ----------
    Wilson 1927, J Am Stat Assoc 22:209.
    """
    check_share("expected share", share)
    check_share("share of the class", class_share)
    check_between("half-width", half_width, 0.0, 0.5)
    z = normal_quantile(confidence)
    people = smallest(
        lambda n: wilson_width(share, n, z) <= 2.0 * half_width, "half-width", 1
    )
    cohort = _ceiling(Fraction(people) / _ratio(class_share))
    return CohortSize(float(people), people, cohort, cohort)


def area_width(
    area: float,
    n_cases: int,
    controls_per_case: float,
    z: float,
) -> tuple[float, float, float]:
    """Return the full width of an area's interval by three variance formulas.

    Parameters
    ----------
    area : float
        Expected.
    n_cases : int
        Cases.
    controls_per_case : float
        Ratio of the classes.
    z : float
        Normal quantile.

    Returns
    -------
    hanley_mcneil, binormal, normal_scores : float
        2 z SE.

    References
    ----------
    Hanley & McNeil 1982, Radiology 143:29; Obuchowski 1994, J Clin Epidemiol 47:549;
    Bamber 1975, J Math Psychol 12:387.
    """
    n_controls = _ceiling(controls_per_case * n_cases)
    theirs = hanley_mcneil_se(area, n_cases, n_controls)
    binormal = binormal_auc_variance(area, controls_per_case) / n_cases
    counted = normal_scores_auc_se(area, n_cases, n_controls)
    return 2.0 * z * theirs, 2.0 * z * math.sqrt(binormal), 2.0 * z * counted


def area_size_hanley_mcneil(
    area: float,
    width: float,
    controls_per_case: float = SIZING.controls_per_case,
    confidence: float = SIZING.confidence,
) -> tuple[int, int]:
    """Return the cases and controls for the width of an area's interval.

    Parameters
    ----------
    area : float
        Expected, above one half.
    width : float
        Full width of the interval.
    controls_per_case : float
        Ratio of the classes.
    confidence : float
        Two-sided.

    Returns
    -------
    n_cases, n_controls : int
        Smallest number of cases; controls rounded up.

    Raises
    ------
    UsageError
        Values that no study can have.

    References
    ----------
    Hanley & McNeil 1982, Radiology 143:29.
    """
    _check_area_demand(area, width, controls_per_case)
    z = normal_quantile(confidence)
    n = smallest(
        lambda n: area_width(area, n, controls_per_case, z)[0] <= width, "width", 1
    )
    return n, _ceiling(controls_per_case * n)


def area_size_normal_scores(
    area: float,
    width: float,
    controls_per_case: float = SIZING.controls_per_case,
    confidence: float = SIZING.confidence,
) -> tuple[int, int]:
    """Return the cases and controls for the width when normal scores are counted.

    Parameters
    ----------
    area, width, controls_per_case, confidence
        As for `area_size_hanley_mcneil`.

    Returns
    -------
    n_cases, n_controls : int
        Smallest number of cases; controls rounded up.

    Raises
    ------
    UsageError
        Values that no study can have.

    References
    ----------
    Bamber 1975, J Math Psychol 12:387; DeLong, DeLong & Clarke-Pearson 1988,
    Biometrics 44:837, whose estimate has this expectation.
    """
    _check_area_demand(area, width, controls_per_case)
    z = normal_quantile(confidence)
    n = smallest(
        lambda n: area_width(area, n, controls_per_case, z)[2] <= width, "width", 1
    )
    return n, _ceiling(controls_per_case * n)


def area_size_binormal(
    area: float,
    width: float,
    controls_per_case: float = SIZING.controls_per_case,
    confidence: float = SIZING.confidence,
) -> tuple[float, int, int]:
    """Return the size for the width of an area's interval, scores being normal.

    Parameters
    ----------
    area, width, controls_per_case, confidence
        As for `area_size_hanley_mcneil`.

    Returns
    -------
    exact : float
        Cases before rounding.
    n_cases, n_controls : int
        Rounded up.

    Raises
    ------
    UsageError
        Values that no study can have.

    References
    ----------
    Obuchowski 1994, J Clin Epidemiol 47:549.
    """
    _check_area_demand(area, width, controls_per_case)
    z = normal_quantile(confidence)
    exact = z**2 * binormal_auc_variance(area, controls_per_case) / (width / 2.0) ** 2
    n = max(1, _ceiling(exact))
    return exact, n, _ceiling(controls_per_case * n)


def _check_area_demand(area: float, width: float, ratio: float) -> None:
    check_area("area under the ROC curve", area)
    check_between("width", width, 0.0, 1.0)
    check_positive("number of controls per case", ratio)
