"""Steps of a recipe.

A *per-sample* step uses nothing but the sample's own values, so it is applied once
and shared by all folds. A *learnt* step sees training rows only, through
`learn(values, rows)`; what it learnt is part of the `RecipeState`.
"""

from typing import Any, Protocol

import numpy as np
from numpy.typing import NDArray

from panelkit.errors import InputDataError

__all__ = ["PER_SAMPLE", "PerSampleStep", "fill_with_median", "filter_features"]

TILE = 4096


class PerSampleStep(Protocol):
    """Changes each sample by its own values alone, in place."""

    def __call__(self, values: NDArray[np.floating[Any]], offset: float) -> None:
        """Change the values, features by samples."""
        ...


def log2(values: NDArray[np.floating[Any]], offset: float) -> None:
    """Replace each value by log2(value + offset), in place.

    Raises
    ------
    InputDataError
        A value plus the offset is not positive.
    """
    measured = np.isfinite(values)
    smallest = float(np.min(values, where=measured, initial=np.inf))
    if smallest + offset <= 0.0:
        raise InputDataError(
            code="negative-before-log2",
            where="expression matrix",
            what=f"a value of {smallest:g} has no logarithm with offset {offset:g}",
            accepted="log2 takes values above minus the offset",
            next_step="Set [preparation] discovery without 'log2' if the values are "
            "logarithms already, or raise log2_offset",
        )
    for start in range(0, len(values), TILE):
        tile = values[start : start + TILE]
        np.add(tile, offset, out=tile)
        np.log2(tile, out=tile)


PER_SAMPLE: dict[str, PerSampleStep] = {"log2": log2}


def fill_with_median(
    values: NDArray[np.floating[Any]], rows: NDArray[np.int64]
) -> NDArray[np.float64]:
    """Return each feature's median over the rows where it was measured.

    Parameters
    ----------
    values : ndarray of shape (n_features, n_samples)
        NaN where missing.
    rows : ndarray of int64
        Training rows; no other value is read.

    Returns
    -------
    ndarray of shape (n_features,), float64
        NaN for a feature that no training row has.
    """
    medians = np.empty(len(values))
    for start in range(0, len(values), TILE):
        tile = values[start : start + TILE, rows].astype(np.float64)
        tile.sort(axis=1)  # NaN goes last
        measured = (~np.isnan(tile)).sum(axis=1)
        each = np.arange(len(tile))
        low = tile[each, np.maximum(measured - 1, 0) // 2]
        high = tile[each, np.minimum(measured // 2, tile.shape[1] - 1)]
        medians[start : start + TILE] = np.where(measured, 0.5 * (low + high), np.nan)
    return medians


def filter_features(
    values: NDArray[np.floating[Any]],
    rows: NDArray[np.int64],
    max_missing_share: float,
) -> NDArray[np.object_]:
    """Return why each feature is left out, ``""`` for features that stay.

    The filter does not look at the outcome, so the error bound holds for the
    features that pass it.

    Parameters
    ----------
    values : ndarray of shape (n_features, n_samples)
        NaN where missing.
    rows : ndarray of int64
        Training rows; no other value is read.
    max_missing_share : float
        A feature missing in a larger share of the rows is left out.

    Returns
    -------
    ndarray of shape (n_features,), object
        Reasons in words.
    """
    reasons = np.full(len(values), "", object)
    for start in range(0, len(values), TILE):
        tile = values[start : start + TILE, rows]
        gap = np.isnan(tile)
        missing = gap.mean(axis=1)
        low = np.where(gap, np.inf, tile).min(axis=1)
        high = np.where(gap, -np.inf, tile).max(axis=1)
        here = reasons[start : start + TILE]
        here[~(high > low)] = "constant on the training rows"
        here[missing > max_missing_share] = (
            f"missing in more than {max_missing_share:.0%} of the training rows"
        )
    return reasons
