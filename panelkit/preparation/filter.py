"""Steps that leave features out. None looks at an outcome.

The error bound holds for the features that pass such a filter.
"""

from dataclasses import dataclass
from typing import ClassVar

import numpy as np
from numpy.typing import NDArray

from panelkit.config import PREPARATION, STEPS
from panelkit.errors import InputDataError
from panelkit.preparation.counts import library_sizes
from panelkit.preparation.step import FILTER, Learnt, choice, nothing, number, whole
from panelkit.preparation.values import Values
from panelkit.records import RecipeContext

__all__ = [
    "Detection",
    "MeasuredAndVarying",
    "Prevalence",
    "ReplicateReliability",
    "Variance",
    "intraclass_correlations",
    "training_moments",
]


class _Mask:
    """A step that leaves features out and changes no value."""

    place: ClassVar[str] = FILTER
    assay: ClassVar[bool] = True

    def apply(self, values: Values, learnt: Learnt, context: RecipeContext) -> Values:
        """Return the values with more features left out."""
        del context
        return values.without(learnt["reasons"])

    def needs(self, learnt: Learnt, markers: NDArray[np.int64]) -> NDArray[np.int64]:
        """Return no feature: what is left out was decided on the training rows."""
        del learnt, markers
        return nothing()


def training_moments(
    values: Values, rows: NDArray[np.int64]
) -> tuple[NDArray[np.float64], NDArray[np.float64]]:
    """Return mean and variance of each feature's measured values.

    Parameters
    ----------
    values : Values
        At some point of a recipe.
    rows : ndarray of int64
        Training rows.

    Returns
    -------
    mean, variance : ndarray of shape (n_features,), float64
        Variance with divisor n - 1, 0 for a single value; NaN without a value.
    """
    mean, variance = np.empty((2, values.n_features))
    for here, tile in values.tiles(rows):
        each = tile.astype(np.float64)
        gap = np.isnan(each)
        count = each.shape[1] - gap.sum(axis=1)
        with np.errstate(invalid="ignore"):
            mean[here] = np.where(gap, 0.0, each).sum(axis=1) / count
        each -= mean[here][:, None]
        each **= 2
        spread = np.where(gap, 0.0, each).sum(axis=1) / np.maximum(count - 1, 1)
        variance[here] = np.where(count > 0, spread, np.nan)
    return mean, variance


@dataclass(frozen=True, slots=True)
class MeasuredAndVarying(_Mask):
    """Leaves out features that are mostly missing or constant on the training rows.

    Attributes
    ----------
    max_missing_share : float
        A feature missing in a larger share of the training rows is left out.
    """

    name: ClassVar[str] = "filter"

    max_missing_share: float = number(PREPARATION.max_missing_share, 0.0, 1.0)

    def words(self) -> str:
        """Return what the step does."""
        return (
            "features constant on the training rows, or missing in more than "
            f"{self.max_missing_share:.0%} of them, left out"
        )

    def learn(
        self, values: Values, rows: NDArray[np.int64], context: RecipeContext
    ) -> Learnt:
        """Return why each feature is left out."""
        del context
        reasons = np.full(values.n_features, "", object)
        for here, tile in values.tiles(rows):
            gap = np.isnan(tile)
            missing = gap.mean(axis=1)
            low = np.where(gap, np.inf, tile).min(axis=1)
            high = np.where(gap, -np.inf, tile).max(axis=1)
            found = reasons[here]
            found[~(high > low)] = "constant on the training rows"
            found[missing > self.max_missing_share] = (
                f"missing in more than {self.max_missing_share:.0%} of the training "
                "rows"
            )
        return {"reasons": reasons}


@dataclass(frozen=True, slots=True)
class Variance(_Mask):
    """Keeps the features that vary most on the training rows.

    Attributes
    ----------
    number : int
        How many are kept, of those that are still in; of equals the first.
    """

    name: ClassVar[str] = "variance"

    number: int = whole(STEPS.variance_number, 1)

    def words(self) -> str:
        """Return what the step does."""
        return f"the {self.number} features with the largest variance kept"

    def learn(
        self, values: Values, rows: NDArray[np.int64], context: RecipeContext
    ) -> Learnt:
        """Return why each feature is left out."""
        del context
        variance = training_moments(values, rows)[1]
        rank = np.where(values.included & np.isfinite(variance), -variance, np.inf)
        kept = np.argsort(rank, kind="stable")[: self.number]
        reasons = np.full(
            values.n_features, f"not among the {self.number} that vary most", object
        )
        reasons[kept] = ""
        return {"reasons": reasons}


@dataclass(frozen=True, slots=True)
class Prevalence(_Mask):
    """Keeps features that are present in a share of the training rows.

    Attributes
    ----------
    share : float
        Smallest share of training rows; a missing value is not present.
    above : float
        A value above it is present.
    """

    name: ClassVar[str] = "prevalence"

    share: float = number(STEPS.prevalence_share, 0.0, 1.0)
    above: float = number(STEPS.prevalence_above, -np.inf)

    def words(self) -> str:
        """Return what the step does."""
        return (
            f"features above {self.above:g} in fewer than {self.share:.0%} of the "
            "training rows left out"
        )

    def learn(
        self, values: Values, rows: NDArray[np.int64], context: RecipeContext
    ) -> Learnt:
        """Return why each feature is left out."""
        del context
        reasons = np.full(values.n_features, "", object)
        for here, tile in values.tiles(rows):
            present = (tile > self.above).mean(axis=1)
            reasons[here][present < self.share] = (
                f"above {self.above:g} in fewer than {self.share:.0%} of the training "
                "rows"
            )
        return {"reasons": reasons}


@dataclass(frozen=True, slots=True)
class Detection(_Mask):
    """Keeps features that reach a level in a number of training rows.

    The number is stated, never taken from the outcome's classes: that would look at
    the outcome.

    Attributes
    ----------
    level : float
        A value of at least this counts as detected.
    samples : int
        Training rows in which a feature has to be detected.
    unit : str
        ``value``, or ``per-million`` for counts per million of the sample's counts.
    """

    name: ClassVar[str] = "detection"

    level: float = number(STEPS.detection_level, -np.inf)
    samples: int = whole(STEPS.detection_samples, 1)
    unit: str = choice(STEPS.detection_unit, ("value", "per-million"))

    def words(self) -> str:
        """Return what the step does."""
        unit = " counts per million" if self.unit == "per-million" else ""
        return (
            f"features of at least {self.level:g}{unit} in fewer than {self.samples} "
            "training rows left out"
        )

    def learn(
        self, values: Values, rows: NDArray[np.int64], context: RecipeContext
    ) -> Learnt:
        """Return why each feature is left out.

        Raises
        ------
        InputDataError
            Counts per million of negative values.
        """
        del context
        scale = np.ones(len(rows))
        if self.unit == "per-million":
            with np.errstate(divide="ignore"):
                scale = 1e6 / library_sizes(values, rows)
        reasons = np.full(values.n_features, "", object)
        for here, tile in values.tiles(rows):
            with np.errstate(invalid="ignore"):  # no counts at all: 0 times infinity
                detected = (tile * scale >= self.level).sum(axis=1)
            reasons[here][detected < self.samples] = (
                f"detected in fewer than {self.samples} training rows"
            )
        return {"reasons": reasons}


def intraclass_correlations(
    values: Values, groups: list[NDArray[np.int64]]
) -> NDArray[np.float64]:
    """Return each feature's one-way intraclass correlation of single measurements.

    Parameters
    ----------
    values : Values
        At some point of a recipe.
    groups : list of ndarray of int64
        Rows that measure one specimen; of a specimen's rows those with a value count,
        and specimens with fewer than two such rows do not.

    Returns
    -------
    ndarray of shape (n_features,), float64
        NaN where fewer than two specimens count or nothing varies.

    References
    ----------
    Shrout & Fleiss 1979, Psychological Bulletin 86:420, ICC(1,1); unequal numbers of
    replicates as in Searle, Casella & McCulloch 1992, Variance Components, chapter 3.
    """
    rows = np.concatenate(groups)
    of = np.repeat(np.arange(len(groups)), [len(group) for group in groups])
    member = (of[:, None] == np.arange(len(groups))).astype(np.float64)
    found = np.empty(values.n_features)
    for here, tile in values.tiles(rows):
        each = tile.astype(np.float64)
        there = ~np.isnan(each)
        size = _sums(there.astype(np.float64), member)
        there &= (size >= 2.0)[:, of]
        size = np.where(size >= 2.0, size, 0.0)
        value = np.where(there, each, 0.0)
        n, k = size.sum(axis=1), (size > 0.0).sum(axis=1)
        with np.errstate(invalid="ignore", divide="ignore"):
            means = np.where(size > 0.0, _sums(value, member) / size, 0.0)
            grand = value.sum(axis=1) / n
            inside = np.where(there, (value - means[:, of]) ** 2, 0.0).sum(axis=1)
            between = (size * (means - grand[:, None]) ** 2).sum(axis=1)
            within = inside / (n - k)
            typical = (n - (size**2).sum(axis=1) / n) / (k - 1)
            component = (between / (k - 1) - within) / typical
            found[here] = np.where(k >= 2, component / (component + within), np.nan)
    return found


def _sums(
    values: NDArray[np.float64], member: NDArray[np.float64]
) -> NDArray[np.float64]:
    """Return sums over each group's columns, without a matrix product."""
    return np.stack([(values * column).sum(axis=1) for column in member.T], axis=1)


@dataclass(frozen=True, slots=True)
class ReplicateReliability(_Mask):
    """Leaves out features whose technical replicates disagree.

    Attributes
    ----------
    least : float
        Smallest intraclass correlation over the training rows that have replicates.

    References
    ----------
    Shrout & Fleiss 1979, Psychological Bulletin 86:420.
    """

    name: ClassVar[str] = "replicate-reliability"

    least: float = number(STEPS.least_reliability, 0.0, 1.0)

    def words(self) -> str:
        """Return what the step does."""
        return (
            "features with an intraclass correlation of replicates below "
            f"{self.least:g} left out"
        )

    def check(self, context: RecipeContext) -> None:
        """Refuse a cohort without replicates.

        Raises
        ------
        InputDataError
            Fewer than two specimens have replicates.
        """
        if context.replicate is None:
            _replicated(context, np.empty(0, np.int64))
        else:
            _replicated(context, np.arange(len(context.replicate)))

    def learn(
        self, values: Values, rows: NDArray[np.int64], context: RecipeContext
    ) -> Learnt:
        """Return why each feature is left out.

        Raises
        ------
        InputDataError
            Fewer than two specimens of the training rows have replicates.
        """
        groups = _replicated(context, rows)
        found = intraclass_correlations(values, groups)
        reasons = np.full(values.n_features, "", object)
        reasons[~(found >= self.least)] = f"replicates agree less than {self.least:g}"
        return {"reasons": reasons}


def _replicated(
    context: RecipeContext, rows: NDArray[np.int64]
) -> list[NDArray[np.int64]]:
    """Return the rows of each specimen that was measured more than once."""
    groups = []
    if context.replicate is not None:
        code = context.replicate[rows]
        groups = [rows[code == each] for each in np.unique(code[code >= 0])]
        groups = [group for group in groups if len(group) >= 2]
    if len(groups) < 2:
        raise InputDataError(
            code="no-replicates",
            where="[preparation] discovery, step 'replicate-reliability'",
            what=f"{len(groups)} specimens of the training rows have replicates",
            accepted="at least 2 specimens with 2 measurements each among the analysed "
            "samples",
            next_step="Take the step out of the recipe",
        )
    return groups
