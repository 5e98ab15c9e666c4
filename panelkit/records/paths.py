"""Penalty paths of many refits."""

from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import NDArray

from panelkit.records.record import Record, frame

if TYPE_CHECKING:
    import pandas as pd

__all__ = ["PathSet"]


@dataclass(frozen=True, slots=True, eq=False)
class PathSet(Record):
    """L1 penalty paths of one matrix, one a subsample.

    Axis order is always (subsamples, penalties, features). Coefficients are on the
    original scale of the matrix.

    Attributes
    ----------
    family : str
        Family of the outcome.
    n_features : int
        Number of features of the matrix.
    penalties : ndarray of shape (n_subsamples, n_penalties), float64
        NaN behind the last penalty that was solved (`max_markers` reached).
    largest_penalty : ndarray of shape (n_subsamples,), float64
        The smallest penalty at which nothing is picked.
    certificate : ndarray of shape (n_subsamples, n_penalties), float64
        Largest KKT violation relative to the penalty over all features; NaN where
        not solved.
    entry_order : tuple of ndarray, int64
        For each subsample its features in order of entry, at most `max_markers`.
    entries : tuple of ndarray, int64
        Step of the path at which each of them entered.
    intercepts : ndarray of shape (n_subsamples, n_penalties[, n_classes]), float64
        On the original scale; 0 for Cox. With several classes they sum to 0, and a
        class that a subsample does not have gets minus infinity.
    coefficient_features, coefficient_values : tuple of ndarray
        The non-zero coefficients of each subsample, penalty after penalty; values have
        a second axis where there are several classes.
    coefficient_borders : ndarray of shape (n_subsamples, n_penalties + 1), int64
        Where each penalty's coefficients begin and end.
    covariate_coefficients : ndarray of float64
        Of the unpenalised covariates, original scale; shape (n_subsamples,
        n_penalties, n_covariates[, n_classes]).
    classes : tuple
        Class labels of a multinomial outcome, in the order of the last axis.
    """

    family: str
    n_features: int
    penalties: NDArray[np.float64]
    largest_penalty: NDArray[np.float64]
    certificate: NDArray[np.float64]
    entry_order: tuple[NDArray[np.int64], ...]
    entries: tuple[NDArray[np.int64], ...]
    intercepts: NDArray[np.float64]
    coefficient_features: tuple[NDArray[np.int64], ...]
    coefficient_values: tuple[NDArray[np.float64], ...]
    coefficient_borders: NDArray[np.int64]
    covariate_coefficients: NDArray[np.float64]
    classes: tuple[object, ...] = ()

    @property
    def n_subsamples(self) -> int:
        """Number of refits."""
        return len(self.entry_order)

    @property
    def ever_selected(self) -> NDArray[np.bool_]:
        """Whether each feature was picked, shape (n_subsamples, n_features)."""
        picked = np.zeros((self.n_subsamples, self.n_features), np.bool_)
        for row, features in zip(picked, self.entry_order, strict=True):
            row[features] = True
        return picked

    def coef(
        self, subsample: int, penalty: int
    ) -> tuple[float | NDArray[np.float64], NDArray[np.float64]]:
        """Return intercept and coefficients of one solution, original scale.

        Parameters
        ----------
        subsample, penalty : int
            Positions on the first two axes.

        Returns
        -------
        intercept : float, or ndarray of shape (n_classes,)
            NaN where the path had stopped before.
        coefficients : ndarray of shape (n_features[, n_classes])
            All NaN where the path had stopped before.

        Raises
        ------
        IndexError
            Position outside the path.
        """
        values = self.coefficient_values[subsample]
        coefficients = np.zeros((self.n_features, *values.shape[1:]))
        if np.isnan(self.penalties[subsample, penalty]):
            coefficients[:] = np.nan
        else:
            low, high = self.coefficient_borders[subsample, penalty : penalty + 2]
            features = self.coefficient_features[subsample][low:high]
            coefficients[features] = values[low:high]
        intercept = self.intercepts[subsample, penalty]
        return (intercept if self.classes else float(intercept)), coefficients

    def to_frame(self) -> "pd.DataFrame":
        """Return one row a pick: subsample, feature, step, penalty, position."""
        subsample = np.repeat(
            np.arange(self.n_subsamples), [len(order) for order in self.entry_order]
        )
        step = np.concatenate([*self.entries, np.empty(0, np.int64)])
        return frame(
            {
                "subsample": subsample,
                "feature": np.concatenate([*self.entry_order, np.empty(0, np.int64)]),
                "step": step,
                "penalty": self.penalties[subsample, step],
                "position": np.concatenate(
                    [np.arange(len(order)) for order in self.entry_order]
                    + [np.empty(0, np.int64)]
                ),
            }
        )
