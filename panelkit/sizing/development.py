"""People needed to develop a model of a few given parameters."""

import math
from dataclasses import dataclass

from panelkit.config import SIZING
from panelkit.errors import UsageError
from panelkit.sizing.demands import check_between, check_count, check_positive
from panelkit.sizing.precision import PRINTED_Z

__all__ = [
    "DevelopmentSize",
    "area_to_cox_snell",
    "develop_binary",
    "develop_survival",
    "largest_cox_snell",
    "people_for_shrinkage",
]


@dataclass(frozen=True, slots=True)
class DevelopmentSize:
    """Each criterion's number of people before rounding, and the largest.

    Attributes
    ----------
    overall_risk, prediction_error, shrinkage, optimism : float
        People by each criterion; NaN where it does not exist.
    people : int
        The largest, rounded up.
    people_three : int
        The same without the criterion of the prediction error.
    events : float
        Expected events among `people`.
    events_per_parameter : float
        Of `people`.
    """

    overall_risk: float
    prediction_error: float
    shrinkage: float
    optimism: float
    people: int
    people_three: int
    events: float
    events_per_parameter: float


def largest_cox_snell(prevalence: float) -> float:
    """Return the largest Cox-Snell R2 that a binary outcome allows.

    Parameters
    ----------
    prevalence : float
        Share with the outcome.

    Returns
    -------
    float
        1 - (f^f (1 - f)^(1 - f))^2.

    Raises
    ------
    UsageError
        Not a share.

    References
    ----------
    Riley et al. 2020, BMJ 368:m441, box 5 and table 1.
    """
    check_between("prevalence", prevalence, 0.0, 1.0)
    log_null = prevalence * math.log(prevalence)
    log_null += (1.0 - prevalence) * math.log1p(-prevalence)
    return -math.expm1(2.0 * log_null)


def people_for_shrinkage(
    parameters: int, cox_snell: float, shrinkage: float = SIZING.shrinkage
) -> float:
    """Return the people for an expected shrinkage, before rounding.

    Parameters
    ----------
    parameters : int
        Candidate parameters: everything that was ever looked at.
    cox_snell : float
        Expected Cox-Snell R2.
    shrinkage : float
        Least expected.

    Returns
    -------
    float
        P / ((S - 1) ln(1 - R2 / S)).

    Raises
    ------
    UsageError
        R2 is not below the shrinkage.

    References
    ----------
    Riley et al. 2019, Stat Med 38:1276, eq. 11; Riley et al. 2020, BMJ 368:m441.
    """
    check_count("number of candidate parameters", parameters)
    check_between("shrinkage", shrinkage, 0.0, 1.0)
    check_between("Cox-Snell R2", cox_snell, 0.0, shrinkage)
    return parameters / ((shrinkage - 1.0) * math.log1p(-cox_snell / shrinkage))


def _optimism(
    parameters: int, cox_snell: float, largest: float, optimism: float
) -> float:
    check_between("optimism of R2", optimism, 0.0, 1.0)
    return people_for_shrinkage(
        parameters, cox_snell, cox_snell / (cox_snell + optimism * largest)
    )


def develop_binary(
    prevalence: float,
    parameters: int,
    cox_snell: float,
    shrinkage: float = SIZING.shrinkage,
    optimism: float = SIZING.optimism,
    risk_margin: float = SIZING.risk_margin,
    prediction_error: float = SIZING.prediction_error,
) -> DevelopmentSize:
    """Return the people for developing a model of a binary outcome.

    Parameters
    ----------
    prevalence : float
        Share with the outcome.
    parameters : int
        Candidate parameters: everything that was ever looked at.
    cox_snell : float
        Expected Cox-Snell R2.
    shrinkage, optimism, risk_margin, prediction_error : float
        What each criterion asks for.

    Returns
    -------
    DevelopmentSize
        Four criteria; the largest decides.

    Raises
    ------
    UsageError
        Values that no study can have.

    References
    ----------
    Riley et al. 2020, BMJ 368:m441; criterion of the prediction error from van Smeden
    et al. 2019, Stat Methods Med Res 28:2455, whose simulations had up to 30
    parameters.
    """
    check_count("number of candidate parameters", parameters)
    largest = largest_cox_snell(prevalence)
    if not cox_snell < largest:
        raise UsageError(
            code="explained-too-much",
            where="Cox-Snell R2",
            what=f"this outcome cannot be explained so well (got {cox_snell:g})",
            accepted=f"a number below {largest:.3g}, the most that a prevalence of "
            f"{prevalence:g} allows",
            next_step="Expect less, or give the area under the ROC curve",
        )
    check_positive("margin of the overall risk", risk_margin)
    check_positive("prediction error", prediction_error)
    rare = min(prevalence, 1.0 - prevalence)
    risk = (PRINTED_Z / risk_margin) ** 2 * prevalence * (1.0 - prevalence)
    error = math.exp(
        (
            -0.508
            + 0.259 * math.log(rare)
            + 0.504 * math.log(parameters)
            - math.log(prediction_error)
        )
        / 0.544
    )
    shrunk = people_for_shrinkage(parameters, cox_snell, shrinkage)
    optimistic = _optimism(parameters, cox_snell, largest, optimism)
    people = _whole(max(risk, error, shrunk, optimistic))
    return DevelopmentSize(
        risk,
        error,
        shrunk,
        optimistic,
        people,
        _whole(max(risk, shrunk, optimistic)),
        people * prevalence,
        people * prevalence / parameters,
    )


def develop_survival(
    rate: float,
    follow_up: float,
    parameters: int,
    cox_snell: float,
    shrinkage: float = SIZING.shrinkage,
    optimism: float = SIZING.optimism,
) -> DevelopmentSize:
    """Return the people for developing a model of a time to an event.

    Parameters
    ----------
    rate : float
        Events per person and unit of time.
    follow_up : float
        Mean follow-up in that unit.
    parameters : int
        Candidate parameters.
    cox_snell : float
        Expected Cox-Snell R2.
    shrinkage, optimism : float
        What the criteria ask for.

    Returns
    -------
    DevelopmentSize
        Shrinkage and optimism; the null model is exponential.

    Raises
    ------
    UsageError
        Values that no study can have.

    References
    ----------
    Riley et al. 2019, Stat Med 38:1276.
    """
    check_positive("event rate", rate)
    check_positive("mean follow-up", follow_up)
    shrunk = people_for_shrinkage(parameters, cox_snell, shrinkage)
    events = rate * follow_up  # per person
    largest = -math.expm1(2.0 * (events * math.log(rate) - events))
    optimistic = _optimism(parameters, cox_snell, largest, optimism)
    people = _whole(max(shrunk, optimistic))
    return DevelopmentSize(
        math.nan,
        math.nan,
        shrunk,
        optimistic,
        people,
        people,
        people * events,
        people * events / parameters,
    )


def area_to_cox_snell(area: float, prevalence: float) -> float:
    """Return the Cox-Snell R2 that goes with an area when risks are well calibrated.

    Parameters
    ----------
    area : float
        Expected area under the ROC curve.
    prevalence : float
        Share with the outcome.

    Returns
    -------
    float
        One minus exp(2 (null - model) mean log-likelihood), the linear predictor being
        normal with one variance in both classes.

    Raises
    ------
    UsageError
        Values that no study can have.

    References
    ----------
    Riley et al. 2021, Stat Med 40:859: R2 from a C statistic through this same
    distribution, there by simulation, here by quadrature.
    """
    from panelkit.sizing.quadrature import expected_over_classes

    check_between("area under the ROC curve", area, 0.5, 1.0)
    check_between("prevalence", prevalence, 0.0, 1.0)

    def gain(predictor: float, is_case: bool) -> float:
        return -math.log1p(math.exp(-predictor if is_case else predictor))

    model = expected_over_classes(gain, area, prevalence)
    null = prevalence * math.log(prevalence)
    null += (1.0 - prevalence) * math.log1p(-prevalence)
    return -math.expm1(2.0 * (null - model))


def _whole(value: float) -> int:
    return math.ceil(value - 1e-9)
