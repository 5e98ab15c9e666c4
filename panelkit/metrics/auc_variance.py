"""Variance of an area under the ROC curve of normal scores, before any data."""

import math
from statistics import NormalDist

import numpy as np

__all__ = ["binormal_auc_variance", "normal_scores_auc_se"]

NODES, WEIGHTS = np.polynomial.hermite_e.hermegauss(80)
SHARES = WEIGHTS / WEIGHTS.sum()


def binormal_auc_variance(area: float, controls_per_case: float) -> float:
    """Return the variance of an area times the number of cases, scores being normal.

    Parameters
    ----------
    area : float
        Expected area.
    controls_per_case : float
        Ratio of the classes.

    Returns
    -------
    float
        V of the binormal model; the variance with n cases is V / n.

    References
    ----------
    Obuchowski 1994, J Clin Epidemiol 47:549; Obuchowski, Lieber & Wians 2004, Clin
    Chem 50:1118, eq. 4.
    """
    # an approximation from fitted curves; counting pairs varies a little less
    a = 1.414 * NormalDist().inv_cdf(area)
    shape = (5.0 * a**2 + 8.0) + (a**2 + 8.0) / controls_per_case
    return 0.0099 * math.exp(-0.5 * a**2) * shape


def normal_scores_auc_se(area: float, n_cases: float, n_controls: float) -> float:
    """Return the standard error of a counted area when scores are normal.

    Parameters
    ----------
    area : float
        True area, scores having one variance in both classes.
    n_cases, n_controls : float
        People in each class.

    Returns
    -------
    float
        Of the share of pairs in order; what DeLong's estimate is on average.

    References
    ----------
    Bamber 1975, J Math Psychol 12:387: the variance by the chance that two cases both
    exceed one control; DeLong, DeLong & Clarke-Pearson 1988, Biometrics 44:837.
    """
    normal = NormalDist()
    distance = math.sqrt(2.0) * normal.inv_cdf(area)
    both = math.fsum(
        share * normal.cdf(distance - node) ** 2
        for node, share in zip(NODES.tolist(), SHARES.tolist(), strict=True)
    )
    spread = area * (1.0 - area)
    spread += (n_cases + n_controls - 2.0) * (both - area**2)
    return math.sqrt(spread / (n_cases * n_controls))
