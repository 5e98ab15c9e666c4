"""A fold's view of the shared matrix."""

from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray

from panelkit.records import RecipeState

__all__ = ["DesignView"]


@dataclass(frozen=True, slots=True, eq=False)
class DesignView:
    """The prepared matrix of one fold: the shared base and what the fold learnt.

    Attributes
    ----------
    base : ndarray of shape (n_features, n_samples), float32 or float64
        NaN where missing; shared by all folds, or the fold's own where a step asks for
        it.
    state : RecipeState
        Learnt from the fold's training rows.
    corrections : tuple of ndarray of shapes (n_features, rank) and (rank, n_samples)
        Row and column shifts as a low-rank product, added to measured values; None for
        no shift.
    """

    base: NDArray[np.floating[Any]]
    state: RecipeState
    corrections: tuple[NDArray[np.float64], NDArray[np.float64]] | None = None

    @property
    def fill(self) -> NDArray[np.float64]:
        """What stands for a missing cell of each feature."""
        return self.state.fill

    @property
    def included(self) -> NDArray[np.bool_]:
        """Whether each feature is in."""
        return self.state.included

    @property
    def shift(self) -> tuple[NDArray[np.float64], NDArray[np.float64]]:
        """What is added to measured values, as a product."""
        if self.corrections is not None:
            return self.corrections
        n_features, n_samples = self.base.shape
        return np.empty((n_features, 0)), np.empty((0, n_samples))

    def column(self, feature: int, rows: NDArray[np.int64]) -> NDArray[np.float64]:
        """Return one prepared feature on the given rows, float64.

        Parameters
        ----------
        feature : int
            Position in the cohort.
        rows : ndarray of int64
            Samples.

        Returns
        -------
        ndarray of shape (n_rows,), float64
            The same bits as `Recipe.apply` gives.
        """
        values: NDArray[np.float64] = self.columns(np.array([feature]), rows)[0]
        return values

    def columns(
        self, features: NDArray[np.int64], rows: NDArray[np.int64]
    ) -> NDArray[np.float64]:
        """Return several features, shape (n_chosen, n_rows)."""
        values = np.array(self.base[np.ix_(features, rows)], np.float64)
        left, right = self.shift
        for q in range(left.shape[1]):  # term by term, as the kernels add them
            values += left[features, q][:, None] * right[q, rows]
        fill = self.state.fill[features, None]
        return np.where(np.isnan(values), fill, values)
