"""Steps that take the size of the library out of counts, with a frozen reference.

All give logarithms: log2 of counts that are divided by a size. What the size is
relative to is learnt on training rows; a new sample is then sized by itself.
"""

from abc import ABC, abstractmethod
from dataclasses import dataclass
from typing import ClassVar

import numpy as np
from numpy.typing import NDArray

from panelkit.config import STEPS
from panelkit.errors import InputDataError, name_some
from panelkit.preparation.step import SCALE, Learnt, number
from panelkit.preparation.values import Values, middle
from panelkit.records import RecipeContext

__all__ = [
    "LogCpm",
    "MedianOfRatios",
    "TrimmedMean",
    "UpperQuartile",
    "library_sizes",
    "ratio_medians",
    "trimmed_mean_factor",
    "upper_quantiles",
]


def library_sizes(values: Values, rows: NDArray[np.int64]) -> NDArray[np.float64]:
    """Return the sum of all measured counts of each sample.

    Every feature of the matrix counts, those left out of panels included.

    Parameters
    ----------
    values : Values
        Counts.
    rows : ndarray of int64
        Samples.

    Returns
    -------
    ndarray of shape (n_rows,), float64
        Summed in one order whatever the number of samples.

    Raises
    ------
    InputDataError
        A negative count.
    """
    total = np.zeros(len(rows))
    for _here, tile in values.tiles(rows):
        counts = np.ascontiguousarray(tile.T, np.float64)
        np.copyto(counts, 0.0, where=np.isnan(counts))
        if (counts < 0.0).any():
            raise InputDataError(
                code="negative-count",
                where="expression matrix",
                what=f"a count of {counts.min():g}",
                accepted="counts of at least 0",
                next_step="Take the step that normalises counts out of [preparation] "
                "discovery if the values are no counts",
            )
        total += counts.sum(axis=1)
    return total


def _refuse_empty(
    size: NDArray[np.float64], rows: NDArray[np.int64], context: RecipeContext
) -> None:
    """Refuse samples that have no size."""
    empty = rows[~(np.isfinite(size) & (size > 0.0))]
    if len(empty):
        ids = context.samples
        listed = [f"row {i}" if ids is None else ids[i] for i in empty]
        raise InputDataError(
            code="sample-without-counts",
            where="expression matrix",
            what=f"no size can be given to {name_some(listed)}: too few counts above 0",
            accepted="samples with counts",
            next_step="Leave them out with [cohort] keep, or take another step for "
            "counts",
        )


class _Sized(ABC):
    """A step that divides each sample by a size: log2(count / size + offset)."""

    place: ClassVar[str] = SCALE
    assay: ClassVar[bool] = False
    offset: float

    @abstractmethod
    def sizes(
        self, values: Values, rows: NDArray[np.int64], learnt: Learnt
    ) -> NDArray[np.float64]:
        """Return the size of each sample, about 1 on the training rows."""

    def apply(self, values: Values, learnt: Learnt, context: RecipeContext) -> Values:
        """Return log2(count / size + offset), a matrix of the fold's own.

        A count of 0 becomes the same value in every sample: with an offset before the
        division it would tell the size of the library.

        Raises
        ------
        InputDataError
            A sample without size, or a negative count.
        """
        everyone = np.arange(values.n_samples)
        size = self.sizes(values, everyone, learnt)
        _refuse_empty(size, everyone, context)
        matrix = np.empty((values.n_features, values.n_samples), np.float32)
        for here, tile in values.tiles():
            counts = tile.astype(np.float64)
            counts /= size
            counts += self.offset
            matrix[here] = np.log2(counts, out=counts)
        return values.own(matrix)

    def needs(self, learnt: Learnt, markers: NDArray[np.int64]) -> NDArray[np.int64]:
        """Return the features that the size is computed from."""
        del markers
        return np.flatnonzero(learnt["used"])


@dataclass(frozen=True, slots=True)
class LogCpm:
    r"""Log2 counts per million with a prior in proportion to the library.

    With library sizes :math:`N_j`, their mean :math:`L` over the training rows and the
    prior :math:`c_j = c N_j / L`: :math:`\log_2 10^6 (x + c_j) / (N_j + 2 c_j)`. A
    count of 0 becomes the same value in every sample.

    Attributes
    ----------
    prior : float
        Counts added in a library of average size.

    References
    ----------
    Law et al. 2014, Genome Biology 15:R29 (log counts per million; the prior in
    proportion to the library is common practice).
    """

    name: ClassVar[str] = "log-cpm"
    place: ClassVar[str] = SCALE
    assay: ClassVar[bool] = False

    prior: float = number(STEPS.cpm_prior, 0.0, above=True)

    def words(self) -> str:
        """Return what the step does."""
        return (
            "log2 counts per million, prior of "
            f"{self.prior:g} counts in a library of the training rows' mean size"
        )

    def learn(
        self, values: Values, rows: NDArray[np.int64], context: RecipeContext
    ) -> Learnt:
        """Return the mean library size of the training rows.

        Raises
        ------
        InputDataError
            A training sample without counts, or a negative count.
        """
        size = library_sizes(values, rows)
        _refuse_empty(size, rows, context)
        used = np.ones(values.n_features, np.bool_)
        return {"library": np.array([size.mean()]), "used": used}

    def apply(self, values: Values, learnt: Learnt, context: RecipeContext) -> Values:
        """Return log counts per million, a matrix of the fold's own.

        Raises
        ------
        InputDataError
            A sample without counts, or a negative count.
        """
        everyone = np.arange(values.n_samples)
        size = library_sizes(values, everyone)
        _refuse_empty(size, everyone, context)
        prior = self.prior * size / learnt["library"][0]
        scale = 1e6 / (size + 2.0 * prior)
        matrix = np.empty((values.n_features, values.n_samples), np.float32)
        for here, tile in values.tiles():
            counts = tile.astype(np.float64)
            counts += prior
            counts *= scale
            matrix[here] = np.log2(counts, out=counts)
        return values.own(matrix)

    def needs(self, learnt: Learnt, markers: NDArray[np.int64]) -> NDArray[np.int64]:
        """Return every feature: the size of the library."""
        del markers
        return np.flatnonzero(learnt["used"])


def ratio_medians(
    values: Values,
    rows: NDArray[np.int64],
    reference: NDArray[np.float64],
) -> NDArray[np.float64]:
    """Return each sample's median ratio to a reference.

    Parameters
    ----------
    values : Values
        Counts.
    rows : ndarray of int64
        Samples.
    reference : ndarray of shape (n_features,)
        Geometric means; NaN for features that do not count.

    Returns
    -------
    ndarray of shape (n_rows,), float64
        NaN without a measured feature.
    """
    used = np.flatnonzero(np.isfinite(reference))
    found = np.full(len(rows), np.nan)
    if not len(used):
        return found
    known = reference[used]
    for at, block in values.samples(rows):
        for i, counts in zip(at, block, strict=True):
            found[i] = middle(counts[used] / known)
    return found


@dataclass(frozen=True, slots=True)
class MedianOfRatios(_Sized):
    """Size factors as medians of ratios to frozen geometric means.

    Attributes
    ----------
    offset : float
        Added to counts that are divided by their size factor.

    References
    ----------
    Anders & Huber 2010, Genome Biology 11:R106, equation 5.
    """

    name: ClassVar[str] = "median-of-ratios"

    offset: float = number(STEPS.count_offset, 0.0, above=True)

    def words(self) -> str:
        """Return what the step does."""
        return (
            f"log2 of counts over size factor plus {self.offset:g}; size factors are "
            "medians of ratios to the training rows' geometric means"
        )

    def learn(
        self, values: Values, rows: NDArray[np.int64], context: RecipeContext
    ) -> Learnt:
        """Return geometric means of the features without a zero on training rows.

        Raises
        ------
        InputDataError
            Every feature has a zero or a missing count on some training row.
        """
        del context
        reference = np.full(values.n_features, np.nan)
        for here, tile in values.tiles(rows):
            counts = tile.astype(np.float64)
            positive: NDArray[np.bool_] = np.asarray((counts > 0.0).all(axis=1))
            logs = np.log(counts, where=positive[:, None], out=np.zeros_like(counts))
            reference[here] = np.where(positive, np.exp(logs.mean(axis=1)), np.nan)
        used = np.isfinite(reference)
        if not used.any():
            raise InputDataError(
                code="no-feature-without-zero",
                where="expression matrix",
                what="every feature has a count of 0 on some training row, so there "
                "is no reference for medians of ratios",
                accepted="at least one feature with counts above 0 in every training "
                "sample",
                next_step="Take 'log-cpm' or 'upper-quartile' in [preparation] "
                "discovery",
            )
        return {"reference": reference, "used": used}

    def sizes(
        self, values: Values, rows: NDArray[np.int64], learnt: Learnt
    ) -> NDArray[np.float64]:
        """Return medians of ratios."""
        return ratio_medians(values, rows, learnt["reference"])


def upper_quantiles(
    values: Values,
    rows: NDArray[np.int64],
    used: NDArray[np.bool_],
    quantile: float,
) -> NDArray[np.float64]:
    """Return a quantile of each sample's counts, linear between order statistics.

    Parameters
    ----------
    values : Values
        Counts.
    rows : ndarray of int64
        Samples.
    used : ndarray of shape (n_features,), bool
        Features that count.
    quantile : float
        Which one.

    Returns
    -------
    ndarray of shape (n_rows,), float64
        NaN without a measured feature.
    """
    found = np.full(len(rows), np.nan)
    chosen = np.flatnonzero(used)
    for at, block in values.samples(rows):
        for i, counts in zip(at, block, strict=True):
            ascending = np.sort(counts[chosen]).astype(np.float64)
            measured = int(np.isfinite(ascending).sum())
            if measured:
                place = quantile * (measured - 1)
                low = int(place)
                high = min(low + 1, measured - 1)
                step = ascending[high] - ascending[low]
                found[i] = ascending[low] + (place - low) * step
    return found


@dataclass(frozen=True, slots=True)
class UpperQuartile(_Sized):
    """Size factors in proportion to a high quantile of the sample.

    Features that are above 0 on some training row count.

    Attributes
    ----------
    offset : float
        Added to counts that are divided by their size factor.
    quantile : float
        Which quantile.

    References
    ----------
    Bullard et al. 2010, BMC Bioinformatics 11:94.
    """

    name: ClassVar[str] = "upper-quartile"

    offset: float = number(STEPS.count_offset, 0.0, above=True)
    quantile: float = number(STEPS.upper_quantile, 0.0, 1.0, above=True)

    def words(self) -> str:
        """Return what the step does."""
        return (
            f"log2 of counts over size factor plus {self.offset:g}; size factors are "
            f"the {self.quantile:g} quantile over its mean on the training rows"
        )

    def learn(
        self, values: Values, rows: NDArray[np.int64], context: RecipeContext
    ) -> Learnt:
        """Return the features that count, and the mean quantile.

        Raises
        ------
        InputDataError
            A training sample whose quantile is 0.
        """
        used = np.zeros(values.n_features, np.bool_)
        for here, tile in values.tiles(rows):
            used[here] = (tile > 0.0).any(axis=1)
        found = upper_quantiles(values, rows, used, self.quantile)
        _refuse_empty(found, rows, context)
        return {"used": used, "mean": np.array([found.mean()])}

    def sizes(
        self, values: Values, rows: NDArray[np.int64], learnt: Learnt
    ) -> NDArray[np.float64]:
        """Return quantiles over their training mean."""
        found = upper_quantiles(values, rows, learnt["used"], self.quantile)
        return np.asarray(found / learnt["mean"][0])


def _trimmed(values: NDArray[np.float64], share: float) -> NDArray[np.bool_]:
    """Return which values stay when a share is cut off at both ends, by mean rank.

    Only values equal to those at the two cuts need their mean rank.
    """
    count = len(values)
    cut = int(np.floor(share * count))
    ascending = np.sort(values)
    low, high = ascending[cut], ascending[count - cut - 1]
    stay = (values > low) & (values < high)
    for border in {float(low), float(high)}:
        first = int(np.searchsorted(ascending, border, "left"))
        last = int(np.searchsorted(ascending, border, "right"))
        rank = 0.5 * (first + 1 + last)
        if cut + 1 <= rank <= count - cut:
            stay |= values == border
    return np.asarray(stay, np.bool_)


def trimmed_mean_factor(
    counts: NDArray[np.float64],
    reference: NDArray[np.float64],
    libraries: tuple[float, float],
    ratio_trim: float,
    level_trim: float,
) -> float:
    """Return the factor of a sample against a reference sample.

    Parameters
    ----------
    counts, reference : ndarray of shape (n_features,)
        Counts of the sample and of the reference.
    libraries : tuple of float
        Their library sizes.
    ratio_trim, level_trim : float
        Shares cut off at both ends of log ratios and of mean log levels.

    Returns
    -------
    float
        1 where no feature is left, as for the reference itself.

    References
    ----------
    Robinson & Oshlack 2010, Genome Biology 11:R25 (weights are inverse variances).
    """
    library, library_r = libraries
    both = (counts > 0.0) & (reference > 0.0)
    x, r = counts[both], reference[both]
    ratio = np.log2((x / library) / (r / library_r))
    level = 0.5 * np.log2((x / library) * (r / library_r))
    variance = (library - x) / (library * x) + (library_r - r) / (library_r * r)
    usable = np.flatnonzero(variance > 0.0)
    ratio, level, variance = (each[usable] for each in (ratio, level, variance))
    if not len(ratio) or np.abs(ratio).max() < 1e-6:
        return 1.0
    stay = np.flatnonzero(_trimmed(ratio, ratio_trim) & _trimmed(level, level_trim))
    if not len(stay):
        return 1.0
    weight = 1.0 / variance[stay]
    return float(2.0 ** ((ratio[stay] * weight).sum() / weight.sum()))


@dataclass(frozen=True, slots=True)
class TrimmedMean(_Sized):
    """Effective library sizes by trimmed means of M-values.

    The reference sample is the training row whose 75 % quantile per count of the
    library is nearest the training rows' mean; it is frozen, as is the constant that
    makes the training rows' factors multiply to 1.

    Attributes
    ----------
    offset : float
        Added to counts that are divided by their size factor.
    ratio_trim, level_trim : float
        Shares cut off at both ends of log ratios and of mean log levels.

    References
    ----------
    Robinson & Oshlack 2010, Genome Biology 11:R25.
    """

    name: ClassVar[str] = "trimmed-mean"

    offset: float = number(STEPS.count_offset, 0.0, above=True)
    ratio_trim: float = number(STEPS.ratio_trim, 0.0, 0.49)
    level_trim: float = number(STEPS.level_trim, 0.0, 0.49)

    def words(self) -> str:
        """Return what the step does."""
        return (
            f"log2 of counts over size factor plus {self.offset:g}; size factors are "
            "effective libraries by trimmed means of M-values (trim "
            f"{self.ratio_trim:g} of ratios, {self.level_trim:g} of levels) against "
            "one training sample, over their training mean"
        )

    def learn(
        self, values: Values, rows: NDArray[np.int64], context: RecipeContext
    ) -> Learnt:
        """Return the reference sample, its library, and the constants.

        Raises
        ------
        InputDataError
            A training sample without counts.
        """
        library = library_sizes(values, rows)
        _refuse_empty(library, rows, context)
        used = np.zeros(values.n_features, np.bool_)
        for here, tile in values.tiles(rows):
            used[here] = (tile > 0.0).any(axis=1)
        height = upper_quantiles(values, rows, used, STEPS.upper_quantile) / library
        chosen = int(np.abs(height - height.mean()).argmin())
        reference = values.part(slice(None), rows[chosen : chosen + 1])[:, 0]
        found: dict[str, NDArray[np.generic]] = {
            "reference": reference.astype(np.float64),
            "library": library[chosen : chosen + 1],
            "constant": np.ones(1),
            "mean": np.ones(1),
            "used": np.ones(values.n_features, np.bool_),
        }
        factor = self.factors(values, rows, found)
        constant = np.exp(np.log(factor).mean())
        found["constant"] = np.array([constant])
        found["mean"] = np.array([(library * factor / constant).mean()])
        return found

    def factors(
        self, values: Values, rows: NDArray[np.int64], learnt: Learnt
    ) -> NDArray[np.float64]:
        """Return the factors of samples; on training rows they multiply to 1."""
        reference, library_r = learnt["reference"], float(learnt["library"][0])
        size = library_sizes(values, rows)
        found = np.empty(len(rows))
        for at, block in values.samples(rows):
            for i, counts in zip(at, block, strict=True):
                found[i] = trimmed_mean_factor(
                    counts.astype(np.float64),
                    reference,
                    (size[i], library_r),
                    self.ratio_trim,
                    self.level_trim,
                )
        return np.asarray(found / learnt["constant"][0])

    def sizes(
        self, values: Values, rows: NDArray[np.int64], learnt: Learnt
    ) -> NDArray[np.float64]:
        """Return effective library sizes over their training mean."""
        effective = library_sizes(values, rows) * self.factors(values, rows, learnt)
        return np.asarray(effective / learnt["mean"][0])
