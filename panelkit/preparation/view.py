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
        After the per-sample steps; NaN where missing; shared by all folds.
    state : RecipeState
        Learnt from the fold's training rows.
    """

    base: NDArray[np.floating[Any]]
    state: RecipeState

    @property
    def fill(self) -> NDArray[np.float64]:
        """What stands for a missing cell of each feature."""
        return self.state.fill

    @property
    def included(self) -> NDArray[np.bool_]:
        """Whether each feature is in."""
        return self.state.included

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
        values = np.asarray(self.base[feature, rows], np.float64)
        return np.where(np.isnan(values), self.state.fill[feature], values)

    def columns(
        self, features: NDArray[np.int64], rows: NDArray[np.int64]
    ) -> NDArray[np.float64]:
        """Return several features, shape (n_chosen, n_rows)."""
        values = np.asarray(self.base[np.ix_(features, rows)], np.float64)
        fill = self.state.fill[features, None]
        return np.where(np.isnan(values), fill, values)
