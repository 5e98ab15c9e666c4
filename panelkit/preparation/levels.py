"""Steps that bring the whole of a sample to a frozen level."""

from dataclasses import dataclass
from typing import Any, ClassVar

import numpy as np
from numpy.typing import NDArray

from panelkit.errors import InputDataError
from panelkit.preparation.step import WHOLE, Learnt
from panelkit.preparation.values import TILE, Values, middle
from panelkit.records import RecipeContext

__all__ = ["MedianDifference", "Quantile", "normalised_to"]


def _positions(count: int) -> NDArray[np.float64]:
    """Return the quantiles that order statistics stand for."""
    return (np.arange(count) + 0.5) / count


def _order(sample: NDArray[np.floating[Any]]) -> NDArray[np.int64]:
    """Return the places of a sample's values, ascending; missing ones come last.

    Numbers of 32 bits are sorted together with their place, as one whole number, which
    is several times as fast as sorting places.
    """
    if sample.dtype != np.float32:
        return np.argsort(sample)
    bits = np.where(np.isnan(sample), np.float32(np.inf), sample).view(np.int32)
    rising = np.where(bits < 0, bits ^ np.int32(0x7FFFFFFF), bits).astype(np.int64)
    key = (rising << 32) | np.arange(len(sample))
    key.sort()
    return key & 0xFFFFFFFF


def normalised_to(
    target: NDArray[np.float64], sample: NDArray[np.floating[Any]]
) -> NDArray[np.float64]:
    """Return a sample with its values replaced by those of a target of equal rank.

    Parameters
    ----------
    target : ndarray of shape (n_features,)
        Ascending.
    sample : ndarray of shape (n_features,)
        NaN where missing; the target is then read at the measured values' quantiles,
        linear between its order statistics.

    Returns
    -------
    ndarray of shape (n_features,), float64
        Equal values become the mean of the target at their ranks.

    References
    ----------
    Bolstad et al. 2003, Bioinformatics 19:185.
    """
    count = int(np.isfinite(sample).sum())
    order = _order(sample)[:count]  # missing values come last
    if count < len(target):
        target = np.interp(_positions(count), _positions(len(target)), target)
    ascending = sample[order]
    starts = np.flatnonzero(np.r_[True, ascending[1:] > ascending[:-1]][:count])
    result = np.full(len(sample), np.nan)
    if len(starts) < count:
        size = np.diff(np.r_[starts, count])
        means = np.add.reduceat(target, starts) / size
        result[order] = np.repeat(means, size)
    else:
        result[order] = target
    return result


@dataclass(frozen=True, slots=True)
class Quantile:
    """Quantile normalisation to the training rows' mean sorted sample.

    References
    ----------
    Bolstad et al. 2003, Bioinformatics 19:185.
    """

    name: ClassVar[str] = "quantile"
    place: ClassVar[str] = WHOLE
    assay: ClassVar[bool] = False

    def words(self) -> str:
        """Return what the step does."""
        return "quantile normalisation to the training rows' mean sorted sample"

    def learn(
        self, values: Values, rows: NDArray[np.int64], context: RecipeContext
    ) -> Learnt:
        """Return the target: the mean of the sorted training samples.

        Raises
        ------
        InputDataError
            No training sample has a value.
        """
        del context
        target = np.zeros(values.n_features)
        counted = 0
        for _at, block in values.samples(rows):
            for ascending in np.sort(block, axis=1):
                count = int(np.isfinite(ascending).sum())
                if count == len(target):
                    target += ascending
                elif count:
                    at, known = _positions(len(target)), _positions(count)
                    target += np.interp(at, known, ascending[:count])
                counted += count > 0
        if not counted:
            raise InputDataError(
                code="nothing-measured",
                where="expression matrix",
                what="no training sample has a value",
                accepted="measured values",
                next_step="Look at the findings of `panelkit check`",
            )
        return {"target": target / counted}

    def apply(self, values: Values, learnt: Learnt, context: RecipeContext) -> Values:
        """Return normalised samples, a matrix of the fold's own."""
        del context
        matrix = np.empty((values.n_features, values.n_samples), np.float32)
        for at, block in values.samples(np.arange(values.n_samples)):
            for i in range(len(block)):
                block[i] = normalised_to(learnt["target"], block[i])
            for start in range(0, values.n_features, TILE):
                here = slice(start, start + TILE)
                matrix[here, at[0] : at[-1] + 1] = block[:, here].T
        return values.own(matrix)

    def needs(self, learnt: Learnt, markers: NDArray[np.int64]) -> NDArray[np.int64]:
        """Return every feature: ranks are those among all of them."""
        del markers
        return np.arange(len(learnt["target"]))


@dataclass(frozen=True, slots=True)
class MedianDifference:
    """Takes each sample's median difference to the training means out of logarithms.

    On logarithms of counts the median difference is a log size factor. It is a shift of
    the whole sample, so folds go on sharing one matrix.

    References
    ----------
    Anders & Huber 2010, Genome Biology 11:R106 (median of ratios), here of logarithms
    with their offset.
    """

    name: ClassVar[str] = "median-difference"
    place: ClassVar[str] = WHOLE
    assay: ClassVar[bool] = False

    def words(self) -> str:
        """Return what the step does."""
        return "each sample's median difference to the training rows' means subtracted"

    def learn(
        self, values: Values, rows: NDArray[np.int64], context: RecipeContext
    ) -> Learnt:
        """Return the training mean of the features measured on every training row."""
        del context
        reference = np.empty(values.n_features)
        for here, tile in values.tiles(rows):
            reference[here] = tile.astype(np.float64).mean(axis=1)
        return {"reference": reference}

    def apply(self, values: Values, learnt: Learnt, context: RecipeContext) -> Values:
        """Return the values with a shift for each sample."""
        del context
        used = np.flatnonzero(np.isfinite(learnt["reference"]))
        reference = learnt["reference"][used]
        shift = np.zeros((1, values.n_samples))
        for at, block in values.samples(np.arange(values.n_samples)):
            for i, sample in zip(at, block, strict=True):
                median = middle(sample[used] - reference)
                shift[0, i] = 0.0 if np.isnan(median) else -median
        return values.shifted(np.ones((values.n_features, 1)), shift)

    def needs(self, learnt: Learnt, markers: NDArray[np.int64]) -> NDArray[np.int64]:
        """Return the features that the median is taken of."""
        del markers
        return np.flatnonzero(np.isfinite(learnt["reference"]))
