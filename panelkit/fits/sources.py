"""Plain arrays as a source of numbers for the fits."""

from typing import Any

import numpy as np
from numpy.typing import NDArray

from panelkit.errors import UsageError

__all__ = ["ArraySource", "feature_major"]


def feature_major(matrix: Any, where: str = "X") -> NDArray[np.floating[Any]]:
    """Return the matrix as a feature-major float array, copied only where needed.

    Parameters
    ----------
    matrix : array_like of shape (n_samples, n_features)
        float32 and float64 are kept as they are, anything else becomes float64.
    where : str
        What to call the matrix in an error.

    Returns
    -------
    ndarray of shape (n_features, n_samples)
        C-contiguous; shares memory with `matrix` where its layout allows.

    Raises
    ------
    UsageError
        Not a matrix of numbers.
    """
    try:
        array = np.asarray(matrix)
        if array.dtype not in (np.float32, np.float64):
            array = array.astype(np.float64)
    except (TypeError, ValueError):
        raise UsageError(
            code="matrix-not-numeric",
            where=where,
            what="values that are not numbers",
            accepted="a matrix of numbers, samples in rows",
            next_step="Convert text to numbers or NaN first",
        ) from None
    if array.ndim != 2 or 0 in array.shape:
        raise UsageError(
            code="matrix-shape",
            where=where,
            what=f"an array of shape {array.shape}",
            accepted="two axes, samples by features, neither empty",
            next_step="Reshape it",
        )
    return np.ascontiguousarray(array.T)


class ArraySource:
    """A matrix without missing values, all features included.

    Parameters
    ----------
    matrix : array_like of shape (n_samples, n_features)
        The expression matrix.

    Raises
    ------
    UsageError
        Not a matrix of finite numbers.
    """

    __slots__ = ("base", "fill", "included", "shift")

    def __init__(self, matrix: Any) -> None:
        self.base = feature_major(matrix)
        n_features = self.base.shape[0]
        self.fill: NDArray[np.float64] = np.zeros(n_features)
        self.included: NDArray[np.bool_] = np.ones(n_features, np.bool_)
        self.shift = (np.empty((n_features, 0)), np.empty((0, self.base.shape[1])))
        for start in range(0, n_features, 4096):
            bad = ~np.isfinite(self.base[start : start + 4096])
            if bad.any():
                feature, sample = (int(k) for k in np.argwhere(bad)[0])
                raise UsageError(
                    code="matrix-not-finite",
                    where=f"X, row {sample}, column {start + feature}",
                    what="a value that is missing or infinite",
                    accepted="finite numbers",
                    next_step="Fill missing values, or use a cohort and its recipe",
                )

    def column(self, feature: int, rows: NDArray[np.int64]) -> NDArray[np.float64]:
        """Return one feature on the given rows, float64."""
        return np.asarray(self.base[feature, rows], np.float64)
