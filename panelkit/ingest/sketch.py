"""Samples compared on a bounded number of features, robustly standardised."""

from collections.abc import Iterator
from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray

from panelkit.config import PREPARATION
from panelkit.ingest.scale import ScaleGuess
from panelkit.ingest.survey import SKETCH_FEATURES, evenly_spaced

__all__ = ["Sketch", "in_logs", "sketch_samples"]

_TILE = 1024
_CUT = 6.0
"""Standardised values beyond are cut off: one absurd cell must not move a sample."""
_TO_SD = 1.4826
"""Median absolute deviation to standard deviation, for normal values."""


@dataclass(frozen=True, slots=True, eq=False)
class Sketch:
    """How far samples are from the middle of the cohort, and from one another.

    Attributes
    ----------
    n_features : int
        Features that were compared.
    distance : ndarray of shape (n_samples,)
        Root mean square of a sample's standardised values.
    correlation : ndarray of shape (n_samples, n_samples)
        Pearson correlation of the samples' standardised values, each sample's level
        (its median) taken off before.
    """

    n_features: int
    distance: NDArray[np.float64]
    correlation: NDArray[np.float64]


def in_logs(
    values: NDArray[np.floating[Any]],
    scale: ScaleGuess,
    depth: NDArray[np.float64] | None = None,
) -> NDArray[np.float64]:
    """Return values in log2 where they are counts or linear, otherwise as they are.

    Parameters
    ----------
    values : ndarray of shape (n_features, n_samples)
        Some features.
    scale : ScaleGuess
        Their scale.
    depth : ndarray of shape (n_samples,), optional
        What counts are divided by, in millions.

    Returns
    -------
    ndarray of shape (n_features, n_samples), float64
        A copy.
    """
    numbers = np.asarray(values, dtype=np.float64)
    if scale.kind not in ("counts", "linear"):
        return numbers.copy()
    if depth is not None:
        numbers = numbers / depth
    return np.asarray(np.log2(np.maximum(numbers, 0.0) + PREPARATION.log2_offset))


def sketch_samples(values: NDArray[np.floating[Any]], scale: ScaleGuess) -> Sketch:
    """Return how samples lie to one another.

    Each feature is centred at its median and divided by its median absolute
    deviation (times 1.4826); values beyond 6 are cut off, missing ones stand at the
    median. At most 20,000 features are used, evenly spaced, in tiles.

    Parameters
    ----------
    values : ndarray of shape (n_features, n_samples)
        The matrix, NaN where missing.
    scale : ScaleGuess
        Its scale; counts are divided by their depth, counts and linear values are
        taken in log2.

    Returns
    -------
    Sketch
        Distances are NaN for samples without values.
    """
    chosen = values[evenly_spaced(len(values), SKETCH_FEATURES)]
    n_samples = values.shape[1]
    gram = np.zeros((n_samples, n_samples))
    total = np.zeros(n_samples)
    observed = np.zeros(n_samples)
    n_features = 0
    squares = np.zeros(n_samples)
    for tile, squared, seen in _standardised(chosen, scale):
        gram += tile.T @ tile
        squares += squared
        total += tile.sum(axis=0, dtype=np.float64)
        observed += seen
        n_features += len(tile)
    with np.errstate(invalid="ignore", divide="ignore"):
        distance = np.sqrt(squares / observed)
        covariance = gram - np.outer(total, total) / max(1, n_features)
        spread = np.sqrt(np.diag(covariance))
        correlation = covariance / np.outer(spread, spread)
    return Sketch(n_features, distance, correlation)


def _standardised(
    chosen: NDArray[np.floating[Any]], scale: ScaleGuess
) -> Iterator[tuple[NDArray[np.float32], NDArray[np.float64], NDArray[np.int64]]]:
    """Yield tiles of standardised features without the samples' levels.

    With each tile come the samples' sums of squares with their levels, and how many
    cells of a sample are observed.
    """
    depth = _depth(chosen) if scale.kind == "counts" else None
    for start in range(0, len(chosen), _TILE):
        tile = in_logs(chosen[start : start + _TILE], scale, depth)
        missing = np.isnan(tile)
        tile = tile[~missing.all(axis=1)]
        if missing.any():
            missing = np.isnan(tile)
        centre = _medians(tile, gaps=bool(missing.any()))
        tile -= centre[:, None]
        spread = _TO_SD * _medians(np.abs(tile), gaps=bool(missing.any()))
        varied = spread > 0.0
        if not varied.any():
            continue
        tile, spread = tile[varied], spread[varied, None]
        absent = np.isnan(tile)
        tile[absent] = 0.0
        squares = (np.clip(tile / spread, -_CUT, _CUT) ** 2).sum(axis=0)
        # an amount of material is no likeness: copies may differ in it
        tile -= np.median(tile, axis=0)
        tile[absent] = 0.0
        standard = np.clip(tile / spread, -_CUT, _CUT).astype(np.float32)
        yield standard, squares, (~absent).sum(axis=0)


def _medians(tile: NDArray[np.float64], *, gaps: bool) -> NDArray[np.float64]:
    return np.asarray(np.nanmedian(tile, axis=1) if gaps else np.median(tile, axis=1))


def _depth(counts: NDArray[np.floating[Any]]) -> NDArray[np.float64]:
    total = np.zeros(counts.shape[1])
    for start in range(0, len(counts), _TILE):
        total += np.nansum(counts[start : start + _TILE], axis=0, dtype=np.float64)
    return np.where(total > 0, total, 1.0) / 1e6
