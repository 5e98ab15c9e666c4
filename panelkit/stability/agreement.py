"""How much the sets picked by the subsamples agree; descriptive."""

import math
from typing import Final

import numpy as np
from numpy.typing import NDArray

from panelkit.errors import UsageError
from panelkit.records import Agreement

__all__ = [
    "jaccard_agreement",
    "kuncheva_agreement",
    "nogueira_stability",
    "set_agreement",
]

Z_95: Final = 1.959963984540054


def _checked(sets: NDArray[np.bool_]) -> NDArray[np.float64]:
    if sets.ndim != 2 or len(sets) < 2 or sets.shape[1] < 1:
        raise UsageError(
            code="too-few-sets",
            where="sets",
            what=f"an array of shape {sets.shape}",
            accepted="two axes, sets by features, with at least 2 sets",
            next_step="Give the picks of at least 2 subsamples",
        )
    return np.asarray(sets, np.float64)


def nogueira_stability(
    sets: NDArray[np.bool_],
) -> tuple[float, float]:
    """Return the stability of sets of any size, corrected for chance, and its variance.

    Parameters
    ----------
    sets : ndarray of shape (n_sets, n_features), bool
        Which features each set holds.

    Returns
    -------
    stability : float
        1 - (mean variance of the features' picks) / (k/p (1 - k/p)), k the mean size
        and variances with divisor n_sets - 1; NaN where every set is empty or full.
    variance : float
        Of the estimate, as if sets were independent.

    Raises
    ------
    UsageError
        Fewer than two sets.

    References
    ----------
    Nogueira, Sechidis & Brown 2018, JMLR 18(174):1.
    """
    z = _checked(sets)
    n_sets, n_features = z.shape
    share = z.mean(axis=0)
    size = z.sum(axis=1) / n_features
    mean_size = float(size.mean())
    chance = mean_size * (1.0 - mean_size)
    if chance <= 0.0:
        return math.nan, math.nan
    spread = (n_sets / (n_sets - 1.0)) * (share * (1.0 - share)).mean()
    stability = float(1.0 - spread / chance)
    influence = (
        (z * share).mean(axis=1)
        - size * mean_size
        + 0.5 * stability * (2.0 * mean_size * size - size - mean_size + 1.0)
    ) / chance
    variance = 4.0 / n_sets**2 * float(((influence - influence.mean()) ** 2).sum())
    return stability, variance


def kuncheva_agreement(sets: NDArray[np.bool_]) -> float:
    """Return the mean consistency index over pairs of sets of one size.

    Parameters
    ----------
    sets : ndarray of shape (n_sets, n_features), bool
        Which features each set holds.

    Returns
    -------
    float
        Mean of (r p - k^2) / (k (p - k)), r the features in common; NaN where sizes
        differ, or are 0 or p.

    Raises
    ------
    UsageError
        Fewer than two sets.

    References
    ----------
    Kuncheva 2007, IASTED Artificial Intelligence and Applications, 390-395.
    """
    z = _checked(sets)
    n_sets, n_features = z.shape
    sizes = z.sum(axis=1)
    k = float(sizes[0])
    if (sizes != k).any() or not 0.0 < k < n_features:
        return math.nan
    counts = z.sum(axis=0)
    common = float((counts * (counts - 1.0)).sum()) / (n_sets * (n_sets - 1.0))
    return float((common * n_features - k**2) / (k * (n_features - k)))


def jaccard_agreement(sets: NDArray[np.bool_]) -> float:
    """Return the mean share in common over pairs of sets, not corrected for chance.

    Parameters
    ----------
    sets : ndarray of shape (n_sets, n_features), bool
        Which features each set holds.

    Returns
    -------
    float
        Mean of the common over the joint features; pairs of two empty sets are left
        out, NaN where there are no others.

    Raises
    ------
    UsageError
        Fewer than two sets.

    References
    ----------
    Jaccard 1912, New Phytologist 11:37.
    """
    z = _checked(sets)
    used = z[:, z.any(axis=0)]
    common = np.einsum("if,jf->ij", used, used)
    sizes = used.sum(axis=1)
    joint = sizes[:, None] + sizes[None, :] - common
    upper = np.triu_indices(len(z), 1)
    known = joint[upper] > 0.0
    if not known.any():
        return math.nan
    return float((common[upper][known] / joint[upper][known]).mean())


def set_agreement(sets: NDArray[np.bool_]) -> Agreement:
    """Return all three measures of agreement.

    Parameters
    ----------
    sets : ndarray of shape (n_sets, n_features), bool
        Which features each subsample picked, among those that entered.

    Returns
    -------
    Agreement
        Descriptive: subsamples share people, so the interval is too narrow.

    Raises
    ------
    UsageError
        Fewer than two sets.

    References
    ----------
    Nogueira et al. 2018, JMLR 18(174):1; Kuncheva 2007, IASTED AIA 390-395.
    """
    stability, variance = nogueira_stability(sets)
    half = Z_95 * math.sqrt(variance) if not math.isnan(variance) else math.nan
    return Agreement(
        stability=stability,
        low=stability - half,
        high=stability + half,
        kuncheva=kuncheva_agreement(sets),
        jaccard=jaccard_agreement(sets),
        n_sets=len(sets),
    )
