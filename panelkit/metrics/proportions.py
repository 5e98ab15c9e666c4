"""Proportions with their intervals, and what follows from sensitivity, specificity."""

from dataclasses import dataclass
from math import ceil, exp, log, sqrt
from statistics import NormalDist

from panelkit.errors import UsageError

__all__ = [
    "LikelihoodRatio",
    "clopper_pearson",
    "likelihood_ratios",
    "lower_limit",
    "mcnemar_exact",
    "needed_without_a_miss",
    "predictive_values",
    "wilson",
]


def wilson(count: float, n: float, confidence: float) -> tuple[float, float]:
    """Return Wilson's score interval of a proportion.

    Parameters
    ----------
    count, n : float
        Hits, and of how many.
    confidence : float
        For example 0.95.

    Returns
    -------
    low, high : float
        Between 0 and 1; NaN where n is 0.

    References
    ----------
    Wilson 1927, J Am Stat Assoc 22:209; Newcombe 1998, Stat Med 17:857 (method 3).
    """
    if not n > 0:
        return float("nan"), float("nan")
    z = NormalDist().inv_cdf(0.5 + 0.5 * confidence)
    share = count / n
    centre = share + z * z / (2 * n)
    half = z * sqrt(share * (1.0 - share) / n + z * z / (4 * n * n))
    scale = 1.0 + z * z / n
    low = 0.0 if count == 0 else (centre - half) / scale
    high = 1.0 if count == n else (centre + half) / scale
    return low, high


def clopper_pearson(count: float, n: float, confidence: float) -> tuple[float, float]:
    """Return the exact interval of a proportion.

    Parameters
    ----------
    count, n, confidence
        As for `wilson`.

    Returns
    -------
    low, high : float
        Between 0 and 1; NaN where n is 0.

    References
    ----------
    Clopper & Pearson 1934, Biometrika 26:404.
    """
    if not n > 0:
        return float("nan"), float("nan")
    one_side = 1.0 - 0.5 * (1.0 - confidence)
    return (
        lower_limit(count, n, one_side),
        1.0 - lower_limit(n - count, n, one_side),
    )


def lower_limit(count: float, n: float, confidence: float) -> float:
    """Return the exact one-sided lower limit of a proportion.

    Parameters
    ----------
    count, n : float
        Hits, and of how many.
    confidence : float
        Of the one side.

    Returns
    -------
    float
        0 without a hit.

    References
    ----------
    Clopper & Pearson 1934, Biometrika 26:404.
    """
    from scipy.stats import beta  # slow to import

    if not count > 0:
        return 0.0
    return float(beta.ppf(1.0 - confidence, count, n - count + 1.0))


def needed_without_a_miss(limit: float, confidence: float) -> int:
    """Return how many people without a single miss prove a proportion.

    Parameters
    ----------
    limit : float
        The exact one-sided lower limit that is to be reached, above 0 and below 1.
    confidence : float
        Of the one side.

    Returns
    -------
    int
        Smallest n with limit ** n at most 1 - confidence.

    References
    ----------
    Clopper & Pearson 1934, Biometrika 26:404, for n hits of n.
    """
    # a hair less, so that an exact power does not ask for one person more
    return ceil(log(1.0 - confidence) / log(limit) - 1e-9)


@dataclass(frozen=True, slots=True)
class LikelihoodRatio:
    """A likelihood ratio with its interval.

    Attributes
    ----------
    value : float
        Infinite where its divisor is 0; NaN for 0 / 0.
    low, high : float
        NaN where a cell is 0.
    """

    value: float
    low: float
    high: float


def likelihood_ratios(
    hits: float, misses: float, passes: float, alarms: float, confidence: float
) -> tuple[LikelihoodRatio, LikelihoodRatio]:
    """Return the likelihood ratios of a positive and of a negative result.

    Parameters
    ----------
    hits, misses : float
        Cases called positive and negative.
    passes, alarms : float
        Controls called negative and positive.
    confidence : float
        For example 0.95.

    Returns
    -------
    positive, negative : LikelihoodRatio
        Sensitivity / (1 - specificity), and (1 - sensitivity) / specificity.

    References
    ----------
    Simel, Samsa & Matchar 1991, J Clin Epidemiol 44:763 (intervals).
    """
    cases, controls = hits + misses, passes + alarms

    def ratio(of_cases: float, of_controls: float) -> LikelihoodRatio:
        nothing = float("nan")
        if not cases > 0 or not controls > 0 or (of_cases == 0 and of_controls == 0):
            return LikelihoodRatio(nothing, nothing, nothing)
        if of_controls == 0:
            return LikelihoodRatio(float("inf"), nothing, nothing)
        value = (of_cases / cases) / (of_controls / controls)
        if of_cases == 0:
            return LikelihoodRatio(value, nothing, nothing)
        z = NormalDist().inv_cdf(0.5 + 0.5 * confidence)
        spread = z * sqrt(
            1.0 / of_cases - 1.0 / cases + 1.0 / of_controls - 1.0 / controls
        )
        return LikelihoodRatio(value, value * exp(-spread), value * exp(spread))

    return ratio(hits, alarms), ratio(misses, passes)


def predictive_values(
    sensitivity: float, specificity: float, prevalence: float
) -> tuple[float, float]:
    """Return the predictive values of a positive and of a negative result.

    Parameters
    ----------
    sensitivity, specificity : float
        At a cut-off.
    prevalence : float
        Of the people that the test is meant for, above 0 and below 1; the share of
        cases in a study is another thing unless people came in as they come.

    Returns
    -------
    positive, negative : float
        NaN where nobody would be called so.

    Raises
    ------
    UsageError
        A prevalence outside 0 to 1.
    """
    if not 0.0 < prevalence < 1.0:
        raise UsageError(
            code="prevalence-outside",
            where="predictive values, prevalence",
            what=f"no share of people (got {prevalence:g})",
            accepted="a share above 0 and below 1",
            next_step="State the prevalence where the test is meant to be used",
        )
    found = sensitivity * prevalence
    alarmed = (1.0 - specificity) * (1.0 - prevalence)
    passed = specificity * (1.0 - prevalence)
    missed = (1.0 - sensitivity) * prevalence
    called, cleared = found + alarmed, passed + missed
    return (
        found / called if called > 0.0 else float("nan"),
        passed / cleared if cleared > 0.0 else float("nan"),
    )


def mcnemar_exact(only_first: int, only_second: int) -> float:
    """Return the exact two-sided p-value of a paired difference of proportions.

    Parameters
    ----------
    only_first, only_second : int
        People whom one of the two tests alone gets right.

    Returns
    -------
    float
        1 where the two never differ.

    References
    ----------
    McNemar 1947, Psychometrika 12:153, by the binomial distribution.
    """
    from scipy.stats import binomtest  # slow to import

    if only_first + only_second == 0:
        return 1.0
    return float(binomtest(only_first, only_first + only_second, 0.5).pvalue)
