"""The values of a cohort at one point of a recipe, read in tiles."""

from collections.abc import Iterator
from dataclasses import dataclass, replace
from typing import Any

import numpy as np
from numpy.typing import NDArray

__all__ = ["Values", "middle", "starting_values"]

TILE = 512  # features a tile: its float64 copy stays in a core's cache
BLOCK = 16  # samples at a time, for steps that need the whole of a sample


@dataclass(frozen=True, slots=True, eq=False)
class Values:
    """What a step reads and gives: a matrix, shifts, fills, and who is left out.

    Attributes
    ----------
    matrix : ndarray of shape (n_features, n_samples), float32 or float64
        The cohort's shared base, or the fold's own matrix; NaN where missing.
    left, right : ndarray of shapes (n_features, rank) and (rank, n_samples)
        Added to measured values, term by term.
    fill : ndarray of shape (n_features,), float64
        What stands for a missing value; NaN as long as it stays missing.
    reasons : ndarray of shape (n_features,), object
        Why a feature is left out, or ``""``.
    """

    matrix: NDArray[np.floating[Any]]
    left: NDArray[np.float64]
    right: NDArray[np.float64]
    fill: NDArray[np.float64]
    reasons: NDArray[np.object_]

    @property
    def n_features(self) -> int:
        """Number of features, those left out included."""
        return len(self.matrix)

    @property
    def n_samples(self) -> int:
        """Number of samples."""
        return int(self.matrix.shape[1])

    @property
    def included(self) -> NDArray[np.bool_]:
        """Whether each feature is in."""
        return np.asarray(self.reasons == "", np.bool_)

    def part(
        self,
        here: slice | NDArray[np.int64],
        rows: slice | NDArray[np.int64] | None = None,
    ) -> NDArray[np.floating[Any]]:
        """Return some features on some samples, missing cells left missing.

        Parameters
        ----------
        here : slice or ndarray of int64
            Features.
        rows : slice or ndarray of int64, optional
            Samples; None for all.

        Returns
        -------
        ndarray
            Of the matrix's type without shifts, else float64; always a copy.
        """
        values = self.matrix[here]
        # `take` keeps rows of features together, which `values[:, rows]` does not
        if rows is None or isinstance(rows, slice):
            values = values[:, slice(None) if rows is None else rows].copy()
        else:
            values = np.take(values, rows, axis=1)
        if self.left.shape[1]:
            values = values.astype(np.float64)
            right = self.right if rows is None else self.right[:, rows]
            for q in range(len(right)):  # term by term, as the kernels add them
                values += self.left[here, q][:, None] * right[q]
        return values

    def tiles(
        self, rows: slice | NDArray[np.int64] | None = None
    ) -> Iterator[tuple[slice, NDArray[np.floating[Any]]]]:
        """Yield all features, tile by tile.

        Parameters
        ----------
        rows : slice or ndarray of int64, optional
            Samples; None for all.

        Yields
        ------
        here : slice
            Features.
        tile : ndarray
            As `part` gives it.
        """
        for start in range(0, self.n_features, TILE):
            here = slice(start, start + TILE)
            yield here, self.part(here, rows)

    def samples(
        self, rows: NDArray[np.int64]
    ) -> Iterator[tuple[NDArray[np.int64], NDArray[np.floating[Any]]]]:
        """Yield whole samples, a few at a time.

        Parameters
        ----------
        rows : ndarray of int64
            Samples.

        Yields
        ------
        at : ndarray of int64
            Their positions in `rows`.
        block : ndarray of shape (n_chosen, n_features)
            C-contiguous, so that a sum over features has one order; of the type that
            `part` gives.
        """
        kind = np.float64 if self.left.shape[1] else self.matrix.dtype
        for start in range(0, len(rows), BLOCK):
            chosen = rows[start : start + BLOCK]
            first, last = int(chosen.min()), int(chosen.max()) + 1
            near = last - first <= 2 * len(chosen)  # cheaper to read than to pick out
            read = slice(first, last) if near else chosen
            count = last - first if near else len(chosen)
            block = np.empty((count, self.n_features), kind)
            for here, tile in self.tiles(read):
                block[:, here] = tile.T  # tile by tile: both sides stay in cache
            at = np.arange(start, start + len(chosen))
            yield at, block[chosen - first] if near else block

    def own(self, matrix: NDArray[np.float32]) -> "Values":
        """Return the values with a matrix of the fold's own, shifts taken up in it."""
        return replace(
            self,
            matrix=matrix,
            left=np.empty((self.n_features, 0)),
            right=np.empty((0, self.n_samples)),
        )

    def shifted(
        self, left: NDArray[np.float64], right: NDArray[np.float64]
    ) -> "Values":
        """Return the values with more row and column shifts."""
        return replace(
            self,
            left=np.concatenate([self.left, left], axis=1),
            right=np.concatenate([self.right, right], axis=0),
        )

    def filled(self, fill: NDArray[np.float64]) -> "Values":
        """Return the values with missing cells filled, feature by feature."""
        return replace(self, fill=fill)

    def without(self, reasons: NDArray[np.object_]) -> "Values":
        """Return the values with more features left out; the first reason stays."""
        return replace(self, reasons=np.where(self.included, reasons, self.reasons))


def starting_values(
    base: NDArray[np.floating[Any]], barred: NDArray[np.object_] | None = None
) -> Values:
    """Return the values before the first step that is learnt.

    Parameters
    ----------
    base : ndarray of shape (n_features, n_samples)
        The matrix that all folds share.
    barred : ndarray of shape (n_features,), object, optional
        Reasons for which features are left out already.

    Returns
    -------
    Values
        Without shift and fill.
    """
    n_features, n_samples = base.shape
    reasons = np.full(n_features, "", object) if barred is None else barred
    return Values(
        matrix=base,
        left=np.empty((n_features, 0)),
        right=np.empty((0, n_samples)),
        fill=np.full(n_features, np.nan),
        reasons=np.array(reasons, object),
    )


def middle(values: NDArray[np.floating[Any]]) -> float:
    """Return the median of what is not NaN; NaN without anything.

    Sorted whole: on current processors that is faster than selecting.
    """
    ascending = np.sort(values)
    count = int((~np.isnan(ascending)).sum())
    if not count:
        return float("nan")
    low, high = ascending[(count - 1) // 2], ascending[count // 2]
    return 0.5 * (float(low) + float(high))
