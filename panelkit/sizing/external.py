"""People needed to validate a locked model on a new cohort."""

import math
from dataclasses import dataclass
from statistics import NormalDist

from panelkit.config import SIZING
from panelkit.sizing.demands import (
    check_area,
    check_between,
    check_positive,
    check_share,
    smallest,
)
from panelkit.sizing.precision import PRINTED_Z
from panelkit.sizing.quadrature import (
    class_predictors,
    expected_over_classes,
    expected_over_normal,
)

__all__ = [
    "ContinuousValidation",
    "SlopeInformation",
    "area_se_newcombe",
    "people_for_area",
    "people_for_benefit",
    "people_for_ratio",
    "people_for_slope",
    "sensitivity_at",
    "slope_information",
    "slope_information_of_area",
    "validate_continuous",
]


def people_for_ratio(prevalence: float, width: float = SIZING.ratio_width) -> float:
    """Return the people for the interval of observed over expected events around 1.

    Parameters
    ----------
    prevalence : float
        Share with the outcome.
    width : float
        Full width; the interval is symmetric on the logarithmic scale.

    Returns
    -------
    float
        (1 - f) / (f se^2), se = arsinh(width / 2) / 1.96.

    Raises
    ------
    UsageError
        Values that no study can have.

    References
    ----------
    Riley et al. 2021, Stat Med 40:4230.
    """
    check_share("prevalence", prevalence)
    check_positive("width of observed over expected", width)
    se = math.asinh(width / 2.0) / PRINTED_Z
    return (1.0 - prevalence) / (prevalence * se**2)


def area_se_newcombe(area: float, n: float, prevalence: float) -> float:
    """Return the standard error of an area in a cohort of n people.

    References
    ----------
    Newcombe 2006, Stat Med 25:559; Riley et al. 2021, Stat Med 40:4230.
    """
    half = n / 2.0 - 1.0
    spread = 1.0 + half * (1.0 - area) / (2.0 - area) + half * area / (1.0 + area)
    spread *= area * (1.0 - area)
    return math.sqrt(spread / (n * n * prevalence * (1.0 - prevalence)))


def people_for_area(
    area: float, prevalence: float, width: float = SIZING.area_width
) -> int:
    """Return the people for the width of the interval of the area.

    Parameters
    ----------
    area : float
        Expected area under the ROC curve.
    prevalence : float
        Share with the outcome.
    width : float
        Full width.

    Returns
    -------
    int
        The smallest number.

    Raises
    ------
    UsageError
        Values that no study can have.

    References
    ----------
    Newcombe 2006, Stat Med 25:559; Riley et al. 2021, Stat Med 40:4230.
    """
    check_area("area under the ROC curve", area)
    check_share("prevalence", prevalence)
    check_between("width of the area", width, 0.0, 1.0)
    return smallest(
        lambda n: 2.0 * PRINTED_Z * area_se_newcombe(area, n, prevalence) <= width,
        "width of the area",
    )


@dataclass(frozen=True, slots=True)
class SlopeInformation:
    """What one person says about the calibration line.

    Attributes
    ----------
    intercept, cross, slope : float
        Elements of the information matrix.
    prevalence : float
        That the predictor implies.
    """

    intercept: float
    cross: float
    slope: float
    prevalence: float


def _weight(predictor: float) -> float:
    return 0.25 / math.cosh(predictor / 2.0) ** 2


def slope_information(mean: float, sd: float) -> SlopeInformation:
    """Return the information of a well calibrated normal linear predictor.

    Parameters
    ----------
    mean, sd : float
        Of the linear predictor in the new cohort.

    Returns
    -------
    SlopeInformation
        By quadrature.

    Raises
    ------
    UsageError
        No spread.

    References
    ----------
    Riley et al. 2021, Stat Med 40:4230.
    """
    check_positive("SD of the linear predictor", sd)
    return SlopeInformation(
        expected_over_normal(_weight, mean, sd),
        expected_over_normal(lambda x: x * _weight(x), mean, sd),
        expected_over_normal(lambda x: x * x * _weight(x), mean, sd),
        expected_over_normal(lambda x: 0.5 + 0.5 * math.tanh(x / 2.0), mean, sd),
    )


def slope_information_of_area(area: float, prevalence: float) -> SlopeInformation:
    """Return the information when the predictor is normal in each class.

    Parameters
    ----------
    area, prevalence : float
        Expected in the new cohort.

    Returns
    -------
    SlopeInformation
        By quadrature, the predictor being calibrated.

    Raises
    ------
    UsageError
        Values that no study can have.

    References
    ----------
    Riley et al. 2021, Stat Med 40:4230, for the information.
    """
    check_area("area under the ROC curve", area)
    check_share("prevalence", prevalence)
    return SlopeInformation(
        expected_over_classes(lambda x, _: _weight(x), area, prevalence),
        expected_over_classes(lambda x, _: x * _weight(x), area, prevalence),
        expected_over_classes(lambda x, _: x * x * _weight(x), area, prevalence),
        prevalence,
    )


def people_for_slope(
    information: SlopeInformation, width: float = SIZING.slope_width
) -> float:
    """Return the people for the width of the interval of the calibration slope.

    Parameters
    ----------
    information : SlopeInformation
        Of one person.
    width : float
        Full width.

    Returns
    -------
    float
        I_a / (se^2 (I_a I_b - I_ab^2)), se = width / 3.92.

    Raises
    ------
    UsageError
        No width.

    References
    ----------
    Riley et al. 2021, Stat Med 40:4230.
    """
    check_positive("width of the calibration slope", width)
    se = width / (2.0 * PRINTED_Z)
    part = information.intercept * information.slope - information.cross**2
    return information.intercept / (se**2 * part)


def sensitivity_at(
    area: float, prevalence: float, threshold: float
) -> tuple[float, float]:
    """Return sensitivity and specificity of a calibrated predictor at a threshold.

    Parameters
    ----------
    area, prevalence : float
        Expected in the new cohort.
    threshold : float
        Probability from which someone counts as positive.

    Returns
    -------
    sensitivity, specificity : float
        The predictor being normal in each class.
    """
    controls, cases, sd = class_predictors(area, prevalence)
    cut = math.log(threshold / (1.0 - threshold))
    return (
        1.0 - NormalDist(cases, sd).cdf(cut),
        NormalDist(controls, sd).cdf(cut),
    )


def people_for_benefit(
    sensitivity: float,
    specificity: float,
    prevalence: float,
    threshold: float,
    width: float = SIZING.benefit_width,
) -> float:
    """Return the people for the interval of the standardised net benefit.

    Parameters
    ----------
    sensitivity, specificity : float
        At the threshold.
    prevalence : float
        Share with the outcome.
    threshold : float
        Probability from which someone counts as positive.
    width : float
        Full width.

    Returns
    -------
    float
        Before rounding.

    Raises
    ------
    UsageError
        Values that no study can have.

    References
    ----------
    Riley et al. 2021, Stat Med 40:4230; Marsh, Janes & Pepe 2020, Stat Med 39:2980.
    """
    for name, value in (
        ("sensitivity", sensitivity),
        ("specificity", specificity),
        ("prevalence", prevalence),
        ("threshold probability", threshold),
    ):
        check_share(name, value)
    check_positive("width of the net benefit", width)
    se = width / (2.0 * PRINTED_Z)
    weight = (1.0 - prevalence) / prevalence * threshold / (1.0 - threshold)
    spread = sensitivity * (1.0 - sensitivity) / prevalence
    spread += weight**2 * specificity * (1.0 - specificity) / (1.0 - prevalence)
    spread += weight**2 * (1.0 - specificity) ** 2 / (prevalence * (1.0 - prevalence))
    return spread / se**2


@dataclass(frozen=True, slots=True)
class ContinuousValidation:
    """People by each criterion before rounding, and the largest.

    Attributes
    ----------
    r_squared, slope : float
        People for the interval of each.
    people : int
        The larger, rounded up.
    """

    r_squared: float
    slope: float
    people: int


def validate_continuous(
    r_squared: float,
    r_squared_width: float = SIZING.r_squared_width,
    slope_width: float = SIZING.slope_width,
) -> ContinuousValidation:
    """Return the people for validating a model of a number.

    Parameters
    ----------
    r_squared : float
        Expected share of variance that is explained.
    r_squared_width, slope_width : float
        Full widths of the intervals.

    Returns
    -------
    ContinuousValidation
        4 R2 (1 - R2)^2 / se^2 and (1 - R2) / (se^2 R2) + 1.

    Raises
    ------
    UsageError
        Values that no study can have.

    References
    ----------
    Archer et al. 2021, Stat Med 40:133.
    """
    check_share("R2", r_squared)
    check_positive("width of R2", r_squared_width)
    check_positive("width of the calibration slope", slope_width)
    se = r_squared_width / (2.0 * PRINTED_Z)
    explained = 4.0 * r_squared * (1.0 - r_squared) ** 2 / se**2
    se = slope_width / (2.0 * PRINTED_Z)
    slope = (1.0 - r_squared) / (se**2 * r_squared) + 1.0
    return ContinuousValidation(
        explained, slope, math.ceil(max(explained, slope) - 1e-9)
    )
