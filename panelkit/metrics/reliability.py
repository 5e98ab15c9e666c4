"""How well repeated measurements of the same samples agree."""

from dataclasses import dataclass
from statistics import NormalDist

import numpy as np
from numpy.typing import NDArray

__all__ = [
    "LimitsOfAgreement",
    "Reliability",
    "coefficient_of_variation",
    "limits_of_agreement",
    "reliability",
]


@dataclass(frozen=True, slots=True, eq=False)
class Reliability:
    """One-way analysis of variance of repeated measurements, one row a feature.

    Attributes
    ----------
    n_sets : ndarray of shape (n_features,), int64
        Sets with at least one measurement.
    n_measurements : ndarray of shape (n_features,), int64
        Measurements, missing ones left out.
    mean : ndarray of shape (n_features,)
        Of all measurements.
    between, within : ndarray of shape (n_features,)
        Mean squares between and within sets; NaN without degrees of freedom.
    icc : ndarray of shape (n_features,)
        Intraclass correlation of a single measurement, one-way random effects; may
        be negative; NaN where it is not defined.
    """

    n_sets: NDArray[np.int64]
    n_measurements: NDArray[np.int64]
    mean: NDArray[np.float64]
    between: NDArray[np.float64]
    within: NDArray[np.float64]
    icc: NDArray[np.float64]

    @property
    def within_sd(self) -> NDArray[np.float64]:
        """Standard deviation within a set, of shape (n_features,)."""
        return np.sqrt(self.within)


def reliability(values: NDArray[np.floating], sets: NDArray[np.int64]) -> Reliability:
    """Return the intraclass correlation of every feature, with its mean squares.

    The one-way form, ICC(1,1), since technical replicates have no order that means
    anything. Sets of unequal size enter with their average size n0 = (N - sum n_i^2 /
    N) / (k - 1).

    Parameters
    ----------
    values : ndarray of shape (n_features, n_measurements)
        NaN where missing.
    sets : ndarray of shape (n_measurements,), int64
        Code of the sample that was measured, 0 to n_sets - 1.

    Returns
    -------
    Reliability
        One entry a feature.

    References
    ----------
    Shrout & Fleiss 1979, Psychological Bulletin 86:420, ICC(1,1); for unequal sets
    Donner 1986, International Statistical Review 54:67.
    """
    member = np.zeros((len(sets), int(sets.max()) + 1))
    member[np.arange(len(sets)), sets] = 1.0
    observed = np.isfinite(values)
    total = observed.sum(axis=1)
    filled = np.where(observed, values, 0.0).astype(np.float64)
    with np.errstate(invalid="ignore", divide="ignore"):
        mean = filled.sum(axis=1) / total
        # centred first: squares of large numbers would cancel
        centred = np.where(observed, filled - mean[:, None], 0.0)
        sizes = observed.astype(np.float64) @ member
        means = (centred @ member) / sizes
        set_sum = np.where(sizes > 0, sizes * means**2, 0.0).sum(axis=1)
        own_mean = np.where(sizes > 0, means, 0.0) @ member.T
        within_sum = (np.where(observed, centred - own_mean, 0.0) ** 2).sum(axis=1)
        n_sets = (sizes > 0).sum(axis=1)
        between_df, within_df = n_sets - 1, total - n_sets
        between = np.where(between_df > 0, set_sum / between_df, np.nan)
        within = np.where(within_df > 0, within_sum / within_df, np.nan)
        average = (total - (sizes**2).sum(axis=1) / total) / between_df
        icc = (between - within) / (between + (average - 1.0) * within)
    return Reliability(n_sets, total, mean, between, within, icc)


@dataclass(frozen=True, slots=True, eq=False)
class LimitsOfAgreement:
    """Differences of paired measurements, one row a feature.

    Attributes
    ----------
    n_pairs : ndarray of shape (n_features,), int64
        Pairs without a missing value.
    difference, sd : ndarray of shape (n_features,)
        Mean and standard deviation of the differences, first minus second.
    low, high : ndarray of shape (n_features,)
        Limits between which the stated share of differences is expected.
    """

    n_pairs: NDArray[np.int64]
    difference: NDArray[np.float64]
    sd: NDArray[np.float64]
    low: NDArray[np.float64]
    high: NDArray[np.float64]


def limits_of_agreement(
    first: NDArray[np.floating], second: NDArray[np.floating], share: float
) -> LimitsOfAgreement:
    """Return between which limits the differences of two measurements lie.

    Parameters
    ----------
    first, second : ndarray of shape (n_features, n_pairs)
        NaN where missing.
    share : float
        Share of differences between the limits, for example 0.95.

    Returns
    -------
    LimitsOfAgreement
        Mean difference plus and minus z standard deviations; NaN below two pairs.

    References
    ----------
    Bland & Altman 1986, Lancet 327:307; Bland & Altman 1999, Statistical Methods in
    Medical Research 8:135, section 2.
    """
    difference = np.asarray(first, np.float64) - second
    observed = np.isfinite(difference)
    pairs = observed.sum(axis=1)
    filled = np.where(observed, difference, 0.0)
    with np.errstate(invalid="ignore", divide="ignore"):
        mean = filled.sum(axis=1) / pairs
        squares = np.where(observed, (filled - mean[:, None]) ** 2, 0.0).sum(axis=1)
        sd = np.where(pairs > 1, np.sqrt(squares / (pairs - 1)), np.nan)
    half = NormalDist().inv_cdf(0.5 + 0.5 * share) * sd
    return LimitsOfAgreement(pairs, mean, sd, mean - half, mean + half)


def coefficient_of_variation(
    within_sd: NDArray[np.float64],
    mean: NDArray[np.float64],
    *,
    in_log2: bool,
) -> NDArray[np.float64]:
    """Return the coefficient of variation on the scale before any logarithm.

    Parameters
    ----------
    within_sd, mean : ndarray of shape (n_features,)
        Standard deviation within sets, and mean.
    in_log2 : bool
        Whether both are of log2 values: then it is sqrt(exp((sd ln 2)^2) - 1), that
        of a log-normal value, and does not need the mean.

    Returns
    -------
    ndarray of shape (n_features,)
        As a fraction (0.1 is 10 %); NaN for a mean that is not positive.

    References
    ----------
    Aitchison & Brown 1957, The Lognormal Distribution, section 2.3 (the log-normal
    form).
    """
    if in_log2:
        return np.asarray(np.sqrt(np.expm1((within_sd * np.log(2.0)) ** 2)))
    with np.errstate(invalid="ignore", divide="ignore"):
        return np.where(mean > 0, within_sd / mean, np.nan)
