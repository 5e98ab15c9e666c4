"""People needed to compare two panels on the same people."""

import math
from statistics import NormalDist

from panelkit.config import SIZING
from panelkit.errors import UsageError
from panelkit.metrics import binormal_auc_variance
from panelkit.sizing.demands import (
    check_area,
    check_between,
    check_positive,
    check_share,
)

__all__ = [
    "cases_for_areas",
    "exact_mcnemar_power",
    "mcnemar_power",
    "pairs_for_mcnemar",
]


def _quantiles(significance: float, power: float) -> tuple[float, float]:
    check_share("significance level", significance)
    check_between("power", power, significance / 2.0, 1.0)
    normal = NormalDist()
    return normal.inv_cdf(1.0 - significance / 2.0), normal.inv_cdf(power)


def pairs_for_mcnemar(
    discordant: float,
    difference: float,
    power: float = SIZING.power,
    significance: float = SIZING.significance,
) -> float:
    """Return the people for McNemar's test of two paired shares.

    Parameters
    ----------
    discordant : float
        Share of people on whom the panels disagree.
    difference : float
        Of the two shares, positive or negative.
    power, significance : float
        Power at the two-sided significance level.

    Returns
    -------
    float
        Before rounding, for the asymptotic test.

    Raises
    ------
    UsageError
        Values that no two panels can have.

    References
    ----------
    Connor 1987, Biometrics 43:207.
    """
    _check_discordance(discordant, difference)
    upper, beta = _quantiles(significance, power)
    spread = beta * math.sqrt(discordant - difference**2)
    return (upper * math.sqrt(discordant) + spread) ** 2 / difference**2


def _check_discordance(discordant: float, difference: float) -> None:
    check_share("share of discordant people", discordant)
    check_between("difference", difference, -1.0, 1.0)
    if difference == 0.0 or abs(difference) > discordant:
        raise UsageError(
            code="difference-impossible",
            where="difference",
            what=f"panels that disagree on a share of {discordant:g} cannot differ by "
            f"{difference:g}",
            accepted="a difference other than 0 and at most the discordant share",
            next_step="Correct one of the two",
        )


def mcnemar_power(
    n: int,
    discordant: float,
    difference: float,
    significance: float = SIZING.significance,
) -> float:
    """Return the power of the asymptotic test: `pairs_for_mcnemar` turned round.

    References
    ----------
    Connor 1987, Biometrics 43:207.
    """
    _check_discordance(discordant, difference)
    upper = NormalDist().inv_cdf(1.0 - significance / 2.0)
    reach = math.sqrt(n) * abs(difference) - upper * math.sqrt(discordant)
    return NormalDist().cdf(reach / math.sqrt(discordant - difference**2))


def exact_mcnemar_power(
    n: int,
    discordant: float,
    difference: float,
    significance: float = SIZING.significance,
) -> float:
    """Return the power of the exact test with n people.

    Parameters
    ----------
    n : int
        People.
    discordant, difference : float
        As for `pairs_for_mcnemar`.
    significance : float
        Two-sided.

    Returns
    -------
    float
        Summed over the number of discordant people and their split.

    Raises
    ------
    UsageError
        Values that no two panels can have.

    References
    ----------
    McNemar 1947, Psychometrika 12:153, in its exact binomial form.
    """
    import numpy as np
    from scipy import stats

    _check_discordance(discordant, difference)
    first = (discordant + difference) / 2.0 / discordant
    power = 0.0
    for number in range(n + 1):
        chance = float(stats.binom.pmf(number, n, discordant))
        if chance < 1e-15 or number == 0:
            continue
        counts = np.arange(number + 1)
        tail = stats.binom.cdf(np.minimum(counts, number - counts), number, 0.5)
        rejected = np.minimum(1.0, 2.0 * tail) <= significance
        power += chance * float(stats.binom.pmf(counts, number, first)[rejected].sum())
    return power


def cases_for_areas(
    area: float,
    other_area: float,
    correlation: float,
    controls_per_case: float = SIZING.controls_per_case,
    power: float = SIZING.power,
    significance: float = SIZING.significance,
) -> float:
    """Return the cases for telling two areas apart on the same people.

    Parameters
    ----------
    area, other_area : float
        Expected.
    correlation : float
        Of the two estimated areas.
    controls_per_case : float
        Ratio of the classes.
    power, significance : float
        Power at the two-sided significance level.

    Returns
    -------
    float
        Cases before rounding; the first area is that under the null hypothesis.

    Raises
    ------
    UsageError
        Equal areas, or values that no study can have.

    References
    ----------
    Obuchowski & McClish 1997, Stat Med 16:1529.
    """
    check_area("area of the first panel", area)
    check_area("area of the second panel", other_area)
    check_between("correlation of the areas", correlation, -1.0, 1.0)
    check_positive("number of controls per case", controls_per_case)
    if area == other_area:
        raise UsageError(
            code="areas-equal",
            where="areas of the two panels",
            what=f"no study tells equal areas apart (got {area:g} twice)",
            accepted="two different areas",
            next_step="State the difference that matters",
        )
    upper, beta = _quantiles(significance, power)
    one = binormal_auc_variance(area, controls_per_case)
    two = binormal_auc_variance(other_area, controls_per_case)
    null = 2.0 * one * (1.0 - correlation)
    alternative = one + two - 2.0 * correlation * math.sqrt(one * two)
    needed = upper * math.sqrt(null) + beta * math.sqrt(alternative)
    return (needed / (area - other_area)) ** 2
