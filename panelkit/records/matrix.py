"""Where a fit's numbers come from."""

from typing import Any, Protocol

import numpy as np
from numpy.typing import NDArray

__all__ = ["MatrixSource"]


class MatrixSource(Protocol):
    """An expression matrix as the fits read it.

    Attributes
    ----------
    base : ndarray of shape (n_features, n_samples), float32 or float64
        Feature-major and C-contiguous; NaN where missing. Shared, never written.
    fill : ndarray of shape (n_features,), float64
        What stands for a missing cell of each feature.
    included : ndarray of shape (n_features,), bool
        False for features that this view leaves out.
    shift : tuple of ndarray of shapes (n_features, rank) and (rank, n_samples)
        What is added to the measured values, as a product: batch means, size factors,
        references. Filled cells are not shifted.
    """

    @property
    def base(self) -> NDArray[np.floating[Any]]: ...  # noqa: D102 - see Attributes
    @property
    def fill(self) -> NDArray[np.float64]: ...  # noqa: D102
    @property
    def included(self) -> NDArray[np.bool_]: ...  # noqa: D102
    @property
    def shift(  # noqa: D102
        self,
    ) -> tuple[NDArray[np.float64], NDArray[np.float64]]: ...

    def column(self, feature: int, rows: NDArray[np.int64]) -> NDArray[np.float64]:
        """Return one feature on the given rows, float64: the source of all numbers."""
        ...
