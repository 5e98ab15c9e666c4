"""What stability selection found."""

import math
from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import NDArray

from panelkit.records.record import Record, frame

if TYPE_CHECKING:
    import pandas as pd

__all__ = ["ErrorBound", "ShortlistTable", "Stability", "SubsamplePlan"]


@dataclass(frozen=True, slots=True, eq=False)
class SubsamplePlan(Record):
    """Complementary pairs of subsamples, drawn before the first fit.

    Attributes
    ----------
    rows : tuple of ndarray of int64
        Rows of subsample 0, 1, ...; 2b and 2b + 1 are a pair without a subject in
        common.
    """

    rows: tuple[NDArray[np.int64], ...]

    @property
    def n_pairs(self) -> int:
        """Number of pairs."""
        return len(self.rows) // 2


@dataclass(frozen=True, slots=True, eq=False)
class ErrorBound(Record):
    """What is known about false markers in the shortlist.

    Attributes
    ----------
    threshold : float
        Selection frequency from which a feature is shortlisted.
    asked : int
        Markers asked for in each subsample.
    realised : float
        Mean number of features actually picked in a subsample.
    n_features : int
        Features that entered every subsample.
    worst_case : float
        Largest expected number of shortlisted features whose selection chance is
        below average, whatever is picked (Shah & Samworth 2013, theorem 1); with the
        realised number of picks it is an estimate.
    unimodal : float
        The same for picks whose distribution over pairs has one mode (theorem 2); NaN
        where it is not defined.
    r_concave : float
        The same for r-concave picks (equation 8); NaN unless asked for.
    decides : str
        The bound that had to be kept: worst-case, unimodal or r-concave.
    n_pairs : int
        Complementary pairs, fixed before the first fit.
    full_share : float
        Share of subsamples that reached the number asked for.
    """

    threshold: float
    asked: int
    realised: float
    n_features: int
    worst_case: float
    unimodal: float
    r_concave: float
    decides: str
    n_pairs: int
    full_share: float

    def sentence(self) -> str:
        """Return what the bound says and does not say."""
        shaped = ""
        if not math.isnan(self.unimodal):
            shaped = (
                f" (at most about {self.unimodal:.3g} if the picks of pairs have a "
                "distribution with one mode"
            )
        if shaped and not math.isnan(self.r_concave):
            shaped += (
                f", {self.r_concave:.3g} if it is r-concave, the strongest assumption"
            )
        shaped += ")" if shaped else ""
        return (
            "For independent people and random halves (ours are stratified), at most "
            f"about {self.worst_case:.3g} features on average in the worst case{shaped}"
            f" reach a frequency of {self.threshold:g} although their chance of being "
            f"picked is below the average of all {self.n_features:,} features "
            f"({self.realised:.3g} picked in a subsample, {self.asked} asked for). "
            "Features that are picked more often than the average, true or not, are "
            "not counted: a companion of a true marker is no error of this kind. This "
            "speaks of the shortlist, not of a panel and not of other people. The "
            f"number of subsamples ({2 * self.n_pairs}) was fixed before the first fit."
        )

    def saturation(self) -> str:
        """Return what to know where subsamples did not give what was asked; or ""."""
        if self.full_share >= 1.0:
            return ""
        return (
            f"Asked for {self.asked} markers, subsamples stopped near "
            f"{self.realised:.3g} ({1.0 - self.full_share:.0%} of them short): with so "
            "few people the outcome is explained before, so the last picks follow the "
            "order of the path rather than strength."
        )


@dataclass(frozen=True, slots=True, eq=False)
class Stability(Record):
    """How often each feature is picked, over all subsamples.

    Attributes
    ----------
    frequency : ndarray of shape (n_features,)
        Share of subsamples among whose first picks the feature is.
    low, high : ndarray of shape (n_features,)
        Interval of the frequency from pair averages.
    simultaneous : ndarray of shape (n_features,)
        Share of pairs whose halves both picked the feature.
    positive_share : ndarray of shape (n_features,)
        Share of the picks with a positive coefficient; NaN where never picked or where
        a feature has a coefficient for every class.
    picks : tuple of ndarray of int64
        Features of each subsample in order of entry.
    bound : ErrorBound
        Of the shortlist.
    shortlist : ndarray of int64
        Features that reach the threshold, most frequent first.
    candidates : ndarray of int64
        What panels are built from, first choice first.
    group : ndarray of shape (n_features,), int64
        Companion group, -1 for features that were not grouped.
    group_frequency : ndarray of shape (n_features,)
        Share of subsamples in which a member of the feature's group was picked.
    t : ndarray of shape (n_features,)
        The univariate ranking's statistic: Welch's t, the Cox score, F, or the
        correlation's t.
    """

    frequency: NDArray[np.float64]
    low: NDArray[np.float64]
    high: NDArray[np.float64]
    simultaneous: NDArray[np.float64]
    positive_share: NDArray[np.float64]
    picks: tuple[NDArray[np.int64], ...]
    bound: ErrorBound
    shortlist: NDArray[np.int64]
    candidates: NDArray[np.int64]
    group: NDArray[np.int64]
    group_frequency: NDArray[np.float64]
    t: NDArray[np.float64]

    @property
    def picked(self) -> NDArray[np.bool_]:
        """Whether each subsample picked each feature, (n_subsamples, n_features)."""
        picked = np.zeros((len(self.picks), len(self.frequency)), np.bool_)
        for row, features in zip(picked, self.picks, strict=True):
            row[features] = True
        return picked

    def to_frame(self) -> "pd.DataFrame":
        """Return one row a feature, in column order."""
        shortlist, candidate = (np.zeros(len(self.frequency), np.bool_) for _ in "ab")
        shortlist[self.shortlist] = True
        candidate[self.candidates] = True
        return frame(
            {
                "frequency": self.frequency,
                "frequency_low": self.low,
                "frequency_high": self.high,
                "simultaneous": self.simultaneous,
                "positive_share": self.positive_share,
                "group": self.group,
                "group_frequency": self.group_frequency,
                "statistic": self.t,
                "shortlist": shortlist,
                "candidate": candidate,
            }
        )


@dataclass(frozen=True, slots=True, eq=False)
class ShortlistTable(Record):
    """Rows of `shortlist.csv`: every feature that was ever picked or is a candidate.

    Attributes
    ----------
    feature : ndarray of object
        Feature ids, most frequent first.
    frequency, frequency_low, frequency_high : ndarray of float64
        Selection frequency with its interval.
    sign : ndarray of object
        ``"+"`` where a higher value points to the positive class, else ``"-"``.
    sign_share : ndarray of float64
        Share of picks that agree with `sign`.
    group : ndarray of int64
        Companion group.
    group_frequency : ndarray of float64
        Frequency of the group.
    picked, candidate : ndarray of bool
        In the shortlist; among the candidates.
    mean_level : ndarray of float64
        Plain mean over all analysed samples, on the prepared scale: every sample
        counts once, also where a subject has several.
    difference, difference_low, difference_high : ndarray of float64
        Positive minus negative class, with its 95 % interval (Welch).
    single_marker_auc : ndarray of float64
        Apparent: on the samples that chose the marker.
    missing_share : ndarray of float64
        Share of analysed samples without a value.
    below_limit_share : ndarray of float64
        Share of measured values below the feature's limit of detection; NaN where the
        feature sheet gives none.
    replicate_icc : ndarray of float64
        Intraclass correlation of repeated measurements; NaN where there are none.
    symbol : ndarray of object
        As the feature sheet writes it, or ``""``.
    assayable : ndarray of object
        Platforms that have an assay, joined by ``;``; ``""`` where nothing is known.
    """

    feature: NDArray[np.object_]
    frequency: NDArray[np.float64]
    frequency_low: NDArray[np.float64]
    frequency_high: NDArray[np.float64]
    sign: NDArray[np.object_]
    sign_share: NDArray[np.float64]
    group: NDArray[np.int64]
    group_frequency: NDArray[np.float64]
    picked: NDArray[np.bool_]
    candidate: NDArray[np.bool_]
    mean_level: NDArray[np.float64]
    difference: NDArray[np.float64]
    difference_low: NDArray[np.float64]
    difference_high: NDArray[np.float64]
    single_marker_auc: NDArray[np.float64]
    missing_share: NDArray[np.float64]
    below_limit_share: NDArray[np.float64]
    replicate_icc: NDArray[np.float64]
    symbol: NDArray[np.object_]
    assayable: NDArray[np.object_]

    def to_frame(self) -> "pd.DataFrame":
        """Return one row a feature."""
        return frame({name: getattr(self, name) for name in self.__slots__})
