"""Variance of an area under the ROC curve before any data: what theory expects."""

import math
from statistics import NormalDist

__all__ = ["binormal_auc_variance", "hanley_mcneil_variance"]


def hanley_mcneil_variance(area: float, n_cases: float, n_controls: float) -> float:
    """Return the variance of an area by the negative-exponential approximation.

    Parameters
    ----------
    area : float
        Expected area.
    n_cases, n_controls : float
        People in each class.

    Returns
    -------
    float
        Of the estimated area.

    References
    ----------
    Hanley & McNeil 1982, Radiology 143:29, eq. 1 and 2.
    """
    q1, q2 = area / (2.0 - area), 2.0 * area**2 / (1.0 + area)
    spread = area * (1.0 - area)
    spread += (n_cases - 1.0) * (q1 - area**2)
    spread += (n_controls - 1.0) * (q2 - area**2)
    return spread / (n_cases * n_controls)


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
    a = 1.414 * NormalDist().inv_cdf(area)
    shape = (5.0 * a**2 + 8.0) + (a**2 + 8.0) / controls_per_case
    return 0.0099 * math.exp(-0.5 * a**2) * shape
