"""One pass over the matrix that tells what all checks of values need."""

from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray

__all__ = ["SKETCH_FEATURES", "Survey", "evenly_spaced", "survey_values"]

_TILE = 2048
"""Features looked at together, so that no copy of the matrix is needed."""

SKETCH_FEATURES = 20_000
"""Samples are compared on at most so many features: more would change no finding."""


@dataclass(frozen=True, slots=True, eq=False)
class Survey:
    """What one pass over the matrix tells about each feature and sample.

    Attributes
    ----------
    missing_of_feature : ndarray of shape (n_features,), int64
        Missing cells.
    missing_of_sample : ndarray of shape (n_samples,), int64
        Missing cells.
    missing_of_group : ndarray of shape (n_features, n_groups), int64
        Missing cells of each feature among the samples of each group.
    lowest, highest : ndarray of shape (n_features,)
        Smallest and largest value, NaN where all are missing.
    at_lowest : ndarray of shape (n_features,), int64
        Cells that equal the feature's smallest value.
    copies : list of (int, int)
        Features with exactly the values of an earlier one: (earlier, later).
    """

    missing_of_feature: NDArray[np.int64]
    missing_of_sample: NDArray[np.int64]
    missing_of_group: NDArray[np.int64]
    lowest: NDArray[np.floating[Any]]
    highest: NDArray[np.floating[Any]]
    at_lowest: NDArray[np.int64]
    copies: list[tuple[int, int]]

    @property
    def constant(self) -> NDArray[np.bool_]:
        """Features with a single value wherever measured, of shape (n_features,)."""
        return np.asarray(self.lowest == self.highest)

    @property
    def n_missing(self) -> int:
        """Missing cells of the whole matrix."""
        return int(self.missing_of_feature.sum())


def survey_values(
    values: NDArray[np.floating[Any]], groups: NDArray[np.bool_]
) -> Survey:
    """Return what one pass over the matrix tells.

    Parameters
    ----------
    values : ndarray of shape (n_features, n_samples)
        The matrix, NaN where missing.
    groups : ndarray of shape (n_samples, n_groups), bool
        Samples whose missing cells are counted together.

    Returns
    -------
    Survey
        A few numbers for each feature and sample.
    """
    n_features, n_samples = values.shape
    missing_of_feature = np.zeros(n_features, dtype=np.int64)
    missing_of_sample = np.zeros(n_samples, dtype=np.int64)
    missing_of_group = np.zeros((n_features, groups.shape[1]), dtype=np.int64)
    lowest = np.empty(n_features, dtype=values.dtype)
    highest = np.empty(n_features, dtype=values.dtype)
    at_lowest = np.zeros(n_features, dtype=np.int64)
    # products of the mask count faster than sums of it; at most 2 ** 24 is exact
    member = np.column_stack([np.ones(n_samples), groups]).astype(np.float32)
    for start in range(0, n_features, _TILE):
        tile = values[start : start + _TILE]
        own = slice(start, start + len(tile))
        # a sum is NaN where any cell is: most tiles need no mask
        with np.errstate(over="ignore", invalid="ignore"):
            complete = not np.isnan(tile.sum(dtype=np.float64))
        if not complete:
            missing = np.isnan(tile).astype(np.float32)
            counts = missing @ member
            missing_of_feature[own] = counts[:, 0]
            missing_of_group[own] = counts[:, 1:]
            missing_of_sample += missing.sum(axis=0).astype(np.int64)
        # fmin and fmax pass over NaN; where all is missing NaN is not equal to NaN
        np.fmin.reduce(tile, axis=1, out=lowest[own])
        np.fmax.reduce(tile, axis=1, out=highest[own])
        at_lowest[own] = np.count_nonzero(tile == lowest[own][:, None], axis=1)
    copies = _copies(values, lowest, highest, at_lowest)
    return Survey(
        missing_of_feature,
        missing_of_sample,
        missing_of_group,
        lowest,
        highest,
        at_lowest,
        copies,
    )


def _copies(
    values: NDArray[np.floating[Any]],
    lowest: NDArray[np.floating[Any]],
    highest: NDArray[np.floating[Any]],
    at_lowest: NDArray[np.int64],
) -> list[tuple[int, int]]:
    """Return the features that repeat an earlier one, looking only at likely ones."""
    n_samples = values.shape[1]
    varied = np.flatnonzero(lowest < highest)
    shown = values[:, :: max(1, n_samples // 4)][varied]
    keys = np.column_stack(
        [shown, lowest[varied], highest[varied], at_lowest[varied]]
    ).astype(values.dtype, copy=False)
    keys = np.ascontiguousarray(keys + 0.0)  # -0.0 becomes 0.0
    bits = keys.view(np.uint32 if keys.itemsize == 4 else np.uint64).astype(np.uint64)
    mixed = np.zeros(len(keys), dtype=np.uint64)
    for column in range(bits.shape[1]):
        mixed = (mixed ^ bits[:, column]) * np.uint64(0x9E3779B97F4A7C15)
        mixed ^= mixed >> np.uint64(29)
    _, place, count = np.unique(mixed, return_inverse=True, return_counts=True)
    first: dict[bytes, int] = {}
    copies = []
    for feature in varied[count[place] > 1]:
        row = (values[feature] + 0.0).tobytes()
        earlier = first.setdefault(row, int(feature))
        if earlier != feature:
            copies.append((earlier, int(feature)))
    return copies


def evenly_spaced(n_features: int, at_most: int) -> slice:
    """Return the slice of at most so many features, evenly spaced.

    Parameters
    ----------
    n_features : int
        Features there are.
    at_most : int
        Features wanted.

    Returns
    -------
    slice
        All of them where there are no more.
    """
    return slice(None, None, max(1, -(-n_features // at_most)))
