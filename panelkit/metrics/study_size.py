"""How many people a verification takes: areas under curves, shares, spread."""

import math
from collections.abc import Callable

from scipy import stats

from panelkit.metrics.delong import hanley_mcneil_se

__all__ = [
    "auc_difference_se",
    "group_size_for_half_width",
    "group_size_not_worse",
    "positives_for_share",
    "sd_upper_factor",
    "size_without_failure",
]


def auc_difference_se(se_a: float, se_b: float, correlation: float) -> float:
    """Return the standard error of the difference of two areas on the same people.

    Parameters
    ----------
    se_a, se_b : float
        Of each area.
    correlation : float
        Of the two estimates.

    Returns
    -------
    float
        sqrt(a^2 + b^2 - 2 r a b).

    References
    ----------
    Hanley, J. A., McNeil, B. J. (1983). Radiology 148, 839-843.
    """
    return math.sqrt(se_a**2 + se_b**2 - 2 * correlation * se_a * se_b)


def group_size_for_half_width(
    area: float, half_width: float, confidence: float = 0.95
) -> int:
    """Return the people in each of two equal classes for an interval of an area.

    Parameters
    ----------
    area : float
        Expected.
    half_width : float
        Largest half-width of the interval.
    confidence : float
        Two-sided.

    Returns
    -------
    int
        The smallest number.
    """
    z = float(stats.norm.ppf(0.5 + confidence / 2))
    return _smallest(lambda n: z * hanley_mcneil_se(area, n, n) <= half_width)


def group_size_not_worse(
    area: float,
    reference_area: float,
    margin: float,
    correlation: float,
    power: float = 0.8,
) -> int:
    """Return the people in each class to show that an area is not worse by a margin.

    Parameters
    ----------
    area, reference_area : float
        True areas of the panel and of what it is compared with.
    margin : float
        Accepted loss.
    correlation : float
        Of the two estimates on the same people.
    power : float
        At 5 % one-sided.

    Returns
    -------
    int
        The smallest number.
    """
    z = float(stats.norm.ppf(0.95) + stats.norm.ppf(power))
    room = margin + area - reference_area

    def enough(n: int) -> bool:
        se = auc_difference_se(
            hanley_mcneil_se(area, n, n),
            hanley_mcneil_se(reference_area, n, n),
            correlation,
        )
        return z * se <= room

    return _smallest(enough)


def positives_for_share(
    share: float, half_width: float, confidence: float = 0.95
) -> int:
    """Return how many positives a sensitivity takes for a half-width (normal)."""
    z = float(stats.norm.ppf(0.5 + confidence / 2))
    return math.ceil(z**2 * share * (1 - share) / half_width**2)


def size_without_failure(share: float, confidence: float = 0.95) -> int:
    """Return how many successes in a row show a share with a confidence (exact)."""
    return math.ceil(math.log(1 - confidence) / math.log(share))


def sd_upper_factor(df: int, confidence: float = 0.95) -> float:
    """Return the factor of an SD that is its one-sided upper limit (chi-square)."""
    return math.sqrt(df / float(stats.chi2.ppf(1 - confidence, df)))


def _smallest(enough: Callable[[int], bool]) -> int:
    high = 2
    while not enough(high):
        high *= 2
    low = high // 2
    while high - low > 1:
        middle = (low + high) // 2
        low, high = (low, middle) if enough(middle) else (middle, high)
    return high
