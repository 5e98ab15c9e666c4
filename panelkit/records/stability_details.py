"""What stands behind a shortlist: paths, convergence, companions, noise, agreement."""

import math
from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import NDArray

from panelkit.records.record import Record, frame
from panelkit.records.stability import ErrorBound

if TYPE_CHECKING:
    import pandas as pd

__all__ = [
    "Agreement",
    "Companions",
    "Convergence",
    "NullShortlist",
    "PathFrequencies",
    "SelectorResult",
]


@dataclass(frozen=True, slots=True, eq=False)
class Convergence(Record):
    """How frequencies settled as pairs of subsamples were added.

    Attributes
    ----------
    pairs : ndarray of shape (n_checkpoints,), int64
        Numbers of pairs.
    features : ndarray of shape (n_followed,), int64
        The most frequent features.
    frequency : ndarray of shape (n_checkpoints, n_followed)
        Their frequency over the first pairs.
    shortlist_size : ndarray of shape (n_checkpoints,), int64
        Features at or above the threshold over the first pairs.
    undecided : ndarray of int64
        Features whose interval holds the threshold: more subsamples of the same people
        could move them across it.
    threshold : float
        Selection frequency from which a feature is shortlisted.
    half_width : float
        Widest half interval among the undecided, else of the most frequent feature.
    precision : float
        Half width from which subsamples count as enough.
    pairs_needed : int
        Pairs that bring any frequency at the threshold to the precision.
    """

    pairs: NDArray[np.int64]
    features: NDArray[np.int64]
    frequency: NDArray[np.float64]
    shortlist_size: NDArray[np.int64]
    undecided: NDArray[np.int64]
    threshold: float
    half_width: float
    precision: float
    pairs_needed: int

    @property
    def enough(self) -> bool:
        """Whether no feature is undecided, or the precision is reached all the same."""
        return not len(self.undecided) or self.half_width <= self.precision

    def sentence(self) -> str:
        """Return whether there were enough subsamples, in words."""
        n_pairs = int(self.pairs[-1])
        if not len(self.undecided):
            return (
                f"{2 * n_pairs} subsamples are enough: no feature's interval holds the "
                f"threshold of {self.threshold:g}."
            )
        known = (
            "the asked precision or better"
            if self.enough
            else f"asked was {self.precision:g}, and "
            f"{2 * self.pairs_needed} subsamples reach it whatever the data"
        )
        return (
            f"For {len(self.undecided)} feature(s) {2 * n_pairs} subsamples leave open "
            f"on which side of {self.threshold:g} they belong (half interval up to "
            f"{self.half_width:.2g}: {known}). Set their number before the next run: "
            "adding subsamples until a shortlist pleases voids its bound."
        )

    def to_frame(self) -> "pd.DataFrame":
        """Return one row a checkpoint and feature."""
        n_checkpoints, n_followed = self.frequency.shape
        return frame(
            {
                "pairs": np.repeat(self.pairs, n_followed),
                "feature": np.tile(self.features, n_checkpoints),
                "frequency": self.frequency.ravel(),
                "shortlist_size": np.repeat(self.shortlist_size, n_followed),
            }
        )


@dataclass(frozen=True, slots=True, eq=False)
class PathFrequencies(Record):
    """Selection frequencies at equal relative penalty, without a stop.

    Attributes
    ----------
    relative_penalty : ndarray of shape (n_penalties,)
        Relative to each subsample's own largest.
    features : ndarray of shape (n_shown,), int64
        Features that are ever most frequent.
    frequency : ndarray of shape (n_penalties, n_shown)
        Share of subsamples with a coefficient other than 0 there.
    n_active : ndarray of shape (n_penalties,)
        Mean number of features with one.
    separated_share : ndarray of shape (n_penalties,)
        Share of subsamples whose own rows the model separates without an error; NaN
        for outcomes without two classes.
    """

    relative_penalty: NDArray[np.float64]
    features: NDArray[np.int64]
    frequency: NDArray[np.float64]
    n_active: NDArray[np.float64]
    separated_share: NDArray[np.float64]

    def to_frame(self) -> "pd.DataFrame":
        """Return one row a penalty and feature."""
        n_penalties, n_shown = self.frequency.shape
        return frame(
            {
                "relative_penalty": np.repeat(self.relative_penalty, n_shown),
                "feature": np.tile(self.features, n_penalties),
                "frequency": self.frequency.ravel(),
                "n_active": np.repeat(self.n_active, n_shown),
                "separated_share": np.repeat(self.separated_share, n_shown),
            }
        )


@dataclass(frozen=True, slots=True, eq=False)
class Companions(Record):
    """Pairs of features that travel together, or are picked for one another.

    Attributes
    ----------
    first, second : ndarray of shape (n_pairs,), int64
        Features.
    group : ndarray of shape (n_pairs,), int64
        Their companion group; -1 where they are in none together.
    pearson, spearman : ndarray of shape (n_pairs,)
        Correlation on the prepared matrix, and of its ranks.
    together : ndarray of shape (n_pairs,)
        Share of subsamples that picked both.
    expected : ndarray of shape (n_pairs,)
        Product of their frequencies: what chance alone would give.
    z : ndarray of shape (n_pairs,)
        (together - expected) over its deviation were picks independent; below 0 they
        exclude each other. Descriptive, since subsamples overlap.
    vote_split : ndarray of shape (n_pairs,), bool
        The group reaches the threshold and no member alone does.
    """

    first: NDArray[np.int64]
    second: NDArray[np.int64]
    group: NDArray[np.int64]
    pearson: NDArray[np.float64]
    spearman: NDArray[np.float64]
    together: NDArray[np.float64]
    expected: NDArray[np.float64]
    z: NDArray[np.float64]
    vote_split: NDArray[np.bool_]

    def to_frame(self) -> "pd.DataFrame":
        """Return one row a pair of features."""
        return frame({name: getattr(self, name) for name in self.__slots__})


@dataclass(frozen=True, slots=True, eq=False)
class NullShortlist(Record):
    """What the same selection shortlists when people are shuffled.

    Attributes
    ----------
    length : ndarray of shape (n_shuffles,), int64
        Features that reach the threshold in each shuffle.
    top_frequency : ndarray of shape (n_shuffles,)
        Largest frequency in each shuffle.
    top_group_frequency : ndarray of shape (n_shuffles,)
        Largest frequency of a companion group in each shuffle.
    observed_length : int
        Of the real outcome.
    observed_top, observed_top_group : float
        Of the real outcome.
    p_top, p_top_group, p_length : float
        (1 + shuffles at least as large) / (1 + shuffles): never 0.
    adjusted_p : ndarray of shape (n_features,)
        The same for each feature against the largest frequency of each shuffle: holds
        for all features at once.
    feature_p : ndarray of shape (n_features,)
        Each feature against its own frequencies; NaN below 1,000 shuffles.
    feature_q : ndarray of shape (n_features,)
        The same, adjusted for the share of false discoveries among all features that
        entered.
    """

    length: NDArray[np.int64]
    top_frequency: NDArray[np.float64]
    top_group_frequency: NDArray[np.float64]
    observed_length: int
    observed_top: float
    observed_top_group: float
    p_top: float
    p_top_group: float
    p_length: float
    adjusted_p: NDArray[np.float64]
    feature_p: NDArray[np.float64]
    feature_q: NDArray[np.float64]

    def limit(self, level: float) -> float:
        """Return the top frequency that noise exceeds in 1 - level of the shuffles."""
        rank = min(math.ceil(level * (self.n_shuffles + 1) - 1e-9), self.n_shuffles)
        return float(np.sort(self.top_frequency)[max(rank, 1) - 1])

    @property
    def n_shuffles(self) -> int:
        """Number of shuffles."""
        return len(self.length)

    def sentence(self) -> str:
        """Return what noise shortlists in this cohort, in words."""
        quiet = (
            "nothing"
            if not self.length.any()
            else f"{self.length.mean():.3g} feature(s) on average, up to "
            f"{self.length.max()}"
        )
        usual = self.limit(0.95)
        verdict = (
            "Noise does as well as this outcome: these data show no marker that is "
            "picked more often than by chance."
            if self.p_top > 0.05
            else "No shuffle, or almost none, does as well."
        )
        return (
            f"With people shuffled {self.n_shuffles:,} times the same selection "
            f"shortlists {quiet}; its most frequent feature reaches "
            f"{np.median(self.top_frequency):.3g} in the middle and {usual:.3g} in "
            f"one of twenty. Observed: {self.observed_top:.3g}, p = {self.p_top:.2g} "
            f"by the largest frequency (so many shuffles can give "
            f"{1.0 / (1.0 + self.n_shuffles):.2g} at least). {verdict}"
        )

    def to_frame(self) -> "pd.DataFrame":
        """Return one row a shuffle."""
        return frame(
            {
                "shuffle": np.arange(self.n_shuffles),
                "length": self.length,
                "top_frequency": self.top_frequency,
                "top_group_frequency": self.top_group_frequency,
            }
        )


@dataclass(frozen=True, slots=True, eq=False)
class Agreement(Record):
    """How much the sets of the subsamples agree; descriptive.

    Attributes
    ----------
    stability : float
        Nogueira et al. 2018; 1 for equal sets, 0 for chance; NaN where undefined.
    low, high : float
        Its interval, as if sets were independent; it is too narrow.
    kuncheva : float
        Mean over pairs of sets; NaN where sets differ in size.
    jaccard : float
        Mean over pairs of sets that are not both empty; not corrected for chance.
    n_sets : int
        Number of sets.
    """

    stability: float
    low: float
    high: float
    kuncheva: float
    jaccard: float
    n_sets: int

    def sentence(self) -> str:
        """Return the agreement in words."""
        if math.isnan(self.stability):
            return "No set agreement: every subsample picks nothing, or everything."
        words = (
            "poor"
            if self.stability < 0.4
            else "intermediate"
            if self.stability <= 0.75
            else "excellent"
        )
        return (
            f"The {self.n_sets} sets agree to {self.stability:.3g} on a scale where 1 "
            f"is equal and 0 is chance ({words}; interval {self.low:.3g} to "
            f"{self.high:.3g}, too narrow since subsamples share people). This "
            "describes the sets; it is no test."
        )


@dataclass(frozen=True, slots=True, eq=False)
class SelectorResult(Record):
    """One selector run through the same subsamples.

    Attributes
    ----------
    selector : str
        lasso, elastic-net or univariate.
    bound : ErrorBound
        Of its shortlist.
    shortlist : ndarray of int64
        What reaches the threshold.
    top_feature : int
        The most frequent.
    top_frequency : float
        Its frequency.
    agreement : Agreement
        Of its sets.
    """

    selector: str
    bound: ErrorBound
    shortlist: NDArray[np.int64]
    top_feature: int
    top_frequency: float
    agreement: Agreement
