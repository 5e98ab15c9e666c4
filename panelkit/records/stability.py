"""What stability selection found."""

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
    """

    threshold: float
    asked: int
    realised: float
    n_features: int
    worst_case: float

    def sentence(self) -> str:
        """Return what the bound says and does not say."""
        return (
            f"For independent people and random halves (ours are stratified), at most "
            f"about {self.worst_case:.3g} features on average reach a frequency of "
            f"{self.threshold:g} although their chance of being picked is below the "
            f"average of all {self.n_features:,} features ({self.realised:.3g} picked "
            "in a subsample). Features that are picked more often than the average, "
            "true or not, are not counted. This speaks of the shortlist, not of a "
            "panel."
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
    positive_share : ndarray of shape (n_features,)
        Share of the picks with a positive coefficient; NaN where never picked.
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
        Welch's t, for the univariate ranking.
    """

    frequency: NDArray[np.float64]
    low: NDArray[np.float64]
    high: NDArray[np.float64]
    positive_share: NDArray[np.float64]
    picks: tuple[NDArray[np.int64], ...]
    bound: ErrorBound
    shortlist: NDArray[np.int64]
    candidates: NDArray[np.int64]
    group: NDArray[np.int64]
    group_frequency: NDArray[np.float64]
    t: NDArray[np.float64]


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
        Mean over all analysed samples, on the prepared scale.
    difference, difference_low, difference_high : ndarray of float64
        Positive minus negative class, with its 95 % interval (Welch).
    single_marker_auc : ndarray of float64
        Apparent: on the samples that chose the marker.
    missing_share : ndarray of float64
        Share of analysed samples without a value.
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

    def to_frame(self) -> "pd.DataFrame":
        """Return one row a feature."""
        return frame({name: getattr(self, name) for name in self.__slots__})
