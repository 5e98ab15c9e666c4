"""Folds, out-of-fold predictions, and what each fold chose."""

import math
from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import NDArray

from panelkit.records.record import Record, frame

if TYPE_CHECKING:
    import pandas as pd

__all__ = ["Comparator", "FoldPanels", "FoldPlan", "OutOfFold", "TunedChoice"]


@dataclass(frozen=True, slots=True, eq=False)
class FoldPlan(Record):
    """Which sample is tested in which fold, drawn before the first fit.

    Attributes
    ----------
    test_fold : ndarray of shape (n_repeats, n_samples), int64
        Fold in which the sample is tested.
    n_folds : int
        Folds a repeat.
    """

    test_fold: NDArray[np.int64]
    n_folds: int

    @property
    def n_repeats(self) -> int:
        """Number of repeats."""
        return len(self.test_fold)

    def split(
        self, repeat: int, fold: int
    ) -> tuple[NDArray[np.int64], NDArray[np.int64]]:
        """Return training and test rows of one fold."""
        tested = self.test_fold[repeat] == fold
        return np.flatnonzero(~tested), np.flatnonzero(tested)


@dataclass(frozen=True, slots=True, eq=False)
class OutOfFold(Record):
    """Out-of-fold predictions of one procedure.

    Attributes
    ----------
    maker : str
        Maker, rule or comparator.
    size : int
        Panel size asked of the maker; 0 where the fold decides or size has no
        meaning.
    predicted : ndarray of shape (n_repeats[, n_classes], n_samples)
        Each sample's linear predictor (log-odds, log chances of each class, value, log
        hazard ratio) by the model that did not see its subject.
    """

    maker: str
    size: int
    predicted: NDArray[np.float64]


@dataclass(frozen=True, slots=True, eq=False)
class FoldPanels(Record):
    """Panels that one maker chose at one size, a row a fold.

    Attributes
    ----------
    maker : str
        Name of the maker.
    size : int
        Size asked for.
    members : ndarray of shape (n_repeats, n_folds, size), int64
        Features; -1 where the maker found fewer.
    penalty : ndarray of shape (n_repeats, n_folds)
        Ridge penalty that the fold's tuning chose.
    """

    maker: str
    size: int
    members: NDArray[np.int64]
    penalty: NDArray[np.float64]


@dataclass(frozen=True, slots=True, eq=False)
class TunedChoice(Record):
    """What the primary rule chose inside each fold's training rows.

    Attributes
    ----------
    maker : ndarray of shape (n_repeats, n_folds), int64
        Position of the maker.
    size : ndarray of shape (n_repeats, n_folds), int64
        Panel size.
    met : ndarray of shape (n_repeats, n_folds), bool
        False where no panel met the rule's demand and its nearest miss was taken.
    """

    maker: NDArray[np.int64]
    size: NDArray[np.int64]
    met: NDArray[np.bool_]


@dataclass(frozen=True, slots=True, eq=False)
class Comparator(Record):
    """One row of `comparators.csv`: what else could be done with the same data.

    Attributes
    ----------
    name : str
        What it is, in words.
    size : int
        Features that it reads; 0 where size has no meaning.
    metric, metric_low, metric_high : float
        Honest accuracy on the same folds, with its interval.
    sentence : str
        What the comparison says.
    kind : str
        ``ridge``, ``lasso``, ``lasso-one-se``, ``one-marker``, ``covariates``,
        ``covariates-with-panel``, ``nuisance``, ``controls``, ``random-all`` and
        ``random-candidates`` (against the chosen maker at that size),
        ``random-headline`` (against the headline) or ``no-feature``.
    difference, difference_low, difference_high : float
        Comparator minus primary rule, paired over folds, with its interval; NaN where
        none is given.
    p : float
        Of random panels; NaN for all others.
    """

    name: str
    size: int
    metric: float
    metric_low: float
    metric_high: float
    sentence: str
    kind: str = ""
    difference: float = math.nan
    difference_low: float = math.nan
    difference_high: float = math.nan
    p: float = math.nan

    def to_frame(self) -> "pd.DataFrame":
        """Return the row as a data frame."""
        return frame({name: [getattr(self, name)] for name in self.__slots__})
