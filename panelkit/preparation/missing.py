"""Steps that give missing values a value, learnt on the training rows."""

from dataclasses import dataclass
from typing import Any, ClassVar

import numpy as np
from numpy.typing import NDArray
from scipy.special import log_ndtr

from panelkit.config import STEPS
from panelkit.preparation.step import (
    FILL,
    Learnt,
    choice,
    nothing,
    number,
    whole,
)
from panelkit.preparation.values import Values
from panelkit.records import RecipeContext

__all__ = [
    "BelowLimit",
    "HalfMinimum",
    "MedianFill",
    "Neighbours",
    "below_limit_means",
    "censored_normal",
    "medians",
]

SCALES = ("log2", "linear")
FARTHEST = 30.0  # standard deviations between mean and limit
BISECTIONS = 64


class _FrozenFill:
    """A step whose missing values become one frozen value a feature."""

    place: ClassVar[str] = FILL
    assay: ClassVar[bool] = True

    def apply(self, values: Values, learnt: Learnt, context: RecipeContext) -> Values:
        """Return the values with missing cells filled."""
        del context
        return values.filled(learnt["fill"])

    def needs(self, learnt: Learnt, markers: NDArray[np.int64]) -> NDArray[np.int64]:
        """Return no feature: each marker has its own frozen value."""
        del learnt, markers
        return nothing()


def medians(values: Values, rows: NDArray[np.int64]) -> NDArray[np.float64]:
    """Return each feature's median over the rows where it was measured.

    Parameters
    ----------
    values : Values
        At some point of a recipe.
    rows : ndarray of int64
        Training rows; no other value is read.

    Returns
    -------
    ndarray of shape (n_features,), float64
        NaN for a feature that no training row has.
    """
    found = np.empty(values.n_features)
    for here, tile in values.tiles(rows):
        tile.sort(axis=1)  # NaN goes last
        measured = (~np.isnan(tile)).sum(axis=1)
        each = np.arange(len(tile))
        low = tile[each, np.maximum(measured - 1, 0) // 2].astype(np.float64)
        high = tile[each, np.minimum(measured // 2, tile.shape[1] - 1)]
        middle = 0.5 * (low + high.astype(np.float64))
        found[here] = np.where(measured, middle, np.nan)
    return found


def minima(values: Values, rows: NDArray[np.int64]) -> NDArray[np.float64]:
    """Return each feature's smallest measured value; NaN without one."""
    found = np.empty(values.n_features)
    for here, tile in values.tiles(rows):
        found[here] = np.where(np.isnan(tile), np.inf, tile).min(axis=1)
    return np.where(np.isfinite(found), found, np.nan)


@dataclass(frozen=True, slots=True)
class MedianFill(_FrozenFill):
    """A missing value becomes the feature's median on the training rows."""

    name: ClassVar[str] = "median-fill"

    def words(self) -> str:
        """Return what the step does."""
        return "missing values become the feature's median on the training rows"

    def learn(
        self, values: Values, rows: NDArray[np.int64], context: RecipeContext
    ) -> Learnt:
        """Return the medians."""
        del context
        return {"fill": medians(values, rows)}


@dataclass(frozen=True, slots=True)
class HalfMinimum(_FrozenFill):
    """A missing value becomes half of the feature's smallest training value.

    Common practice where values are missing because they are low.

    Attributes
    ----------
    scale : str
        Of the values: on ``log2``, half is one less.
    """

    name: ClassVar[str] = "half-minimum"

    scale: str = choice(STEPS.value_scale, SCALES)

    def words(self) -> str:
        """Return what the step does."""
        return (
            "missing values become half of the feature's smallest training value "
            f"({self.scale} scale)"
        )

    def learn(
        self, values: Values, rows: NDArray[np.int64], context: RecipeContext
    ) -> Learnt:
        """Return half of each smallest value."""
        del context
        least = minima(values, rows)
        return {"fill": least - 1.0 if self.scale == "log2" else 0.5 * least}


def _hazard(xi: NDArray[np.float64]) -> NDArray[np.float64]:
    """Return the normal density over the chance of lying below."""
    density = -0.5 * xi**2 - 0.5 * np.log(2.0 * np.pi)
    return np.asarray(np.exp(density - log_ndtr(xi)), np.float64)


def censored_normal(
    mean: NDArray[np.float64],
    variance: NDArray[np.float64],
    measured: NDArray[Any],
    censored: NDArray[Any],
    limit: NDArray[np.float64],
) -> tuple[NDArray[np.float64], NDArray[np.float64]]:
    r"""Return the normal distributions most likely to give values cut off below.

    With :math:`\xi = (L - \mu) / \sigma`, :math:`\Omega = (c / m) \phi(\xi) /
    \Phi(\xi)`, the likelihood equations leave one unknown:
    :math:`s^2 / (\bar x - L)^2 = (1 + \xi\Omega - \Omega^2) / (\Omega - \xi)^2`,
    whose right side grows with :math:`\xi`; it is solved by halving.

    Parameters
    ----------
    mean, variance : ndarray of shape (n_features,)
        Of the measured values; variance with divisor m.
    measured, censored : ndarray of shape (n_features,), int
        Numbers m and c of values above and below the limit.
    limit : ndarray of shape (n_features,)
        The limit L.

    Returns
    -------
    mu, sigma : ndarray of shape (n_features,), float64
        NaN where there is no spread above the limit to learn from.

    References
    ----------
    Cohen 1959, Technometrics 1:217 (singly censored samples).
    """
    above = mean - limit
    usable = (measured > 1) & (variance > 0.0) & (above > 0.0)
    share = np.where(usable, censored / np.maximum(measured, 1), 0.0)
    aim = np.where(usable, variance / np.where(usable, above, 1.0) ** 2, 1.0)
    low, high = np.full((2, len(mean)), [[-FARTHEST], [FARTHEST]])
    for _ in range(BISECTIONS):
        xi = 0.5 * (low + high)
        omega = share * _hazard(xi)
        # beyond the pole, where omega = xi, there is no solution: as if too large
        value = np.where(
            omega > xi, 1.0 + xi * omega - omega**2 - aim * (omega - xi) ** 2, np.inf
        )
        low, high = np.where(value < 0.0, xi, low), np.where(value < 0.0, high, xi)
    xi = 0.5 * (low + high)
    omega = share * _hazard(xi)
    sigma = np.where(usable, above / np.where(usable, omega - xi, 1.0), np.nan)
    return mean - sigma * omega, sigma


def below_limit_means(
    mu: NDArray[np.float64], sigma: NDArray[np.float64], limit: NDArray[np.float64]
) -> NDArray[np.float64]:
    """Return the mean of a normal distribution below a limit.

    Parameters
    ----------
    mu, sigma, limit : ndarray of shape (n_features,)
        The distribution and the limit.

    Returns
    -------
    ndarray of shape (n_features,), float64
        Below the limit.

    References
    ----------
    Johnson, Kotz & Balakrishnan 1994, Continuous Univariate Distributions 1, 13.10.
    """
    return np.asarray(mu - sigma * _hazard((limit - mu) / sigma), np.float64)


@dataclass(frozen=True, slots=True)
class BelowLimit(_FrozenFill):
    """A missing value becomes what is expected below the limit of detection.

    A normal distribution of the logarithms, cut off at the limit, is fitted to each
    feature's training rows. Where it cannot be estimated, half of the smallest value
    is taken.

    Attributes
    ----------
    limit : float or None
        The limit on the scale of the values at this point; None takes each feature's
        smallest training value. Values below the limit are left as they are.
    scale : str
        Of the values.

    References
    ----------
    Cohen 1959, Technometrics 1:217.
    """

    name: ClassVar[str] = "below-limit"

    limit: float | None = number(None, -np.inf)
    scale: str = choice(STEPS.value_scale, SCALES)

    def words(self) -> str:
        """Return what the step does."""
        limit = "its smallest training value" if self.limit is None else self.limit
        return (
            "missing values become the mean below the limit of detection of a normal "
            f"distribution fitted to the logarithms (limit: {limit}; {self.scale} "
            "scale)"
        )

    def learn(
        self, values: Values, rows: NDArray[np.int64], context: RecipeContext
    ) -> Learnt:
        """Return each feature's mean below its limit, with the distribution."""
        del context
        shape = values.n_features
        mean, variance, limit = np.empty((3, shape))
        measured, censored = np.empty((2, shape), np.int64)
        least = minima(values, rows)
        for here, tile in values.tiles(rows):
            each = self._logs(tile.astype(np.float64))
            known = self._logs(least[here])
            if self.limit is not None:
                known = np.full(len(each), self._logs(np.array(self.limit)))
            limit[here] = known
            there = each >= known[:, None]
            measured[here] = there.sum(axis=1)
            censored[here] = each.shape[1] - measured[here]
            count = np.maximum(measured[here], 1)
            mean[here] = np.where(there, each, 0.0).sum(axis=1) / count
            squares = np.where(there, (each - mean[here][:, None]) ** 2, 0.0)
            variance[here] = squares.sum(axis=1) / count
        mu, sigma = censored_normal(mean, variance, measured, censored, limit)
        expected = below_limit_means(mu, sigma, limit)
        half = self._logs(least) - 1.0
        fill = np.where(np.isfinite(expected), expected, half)
        if self.scale == "linear":
            fill = np.exp2(fill)
        return {"fill": np.where(np.isnan(least), np.nan, fill)}

    def _logs(self, values: NDArray[np.float64]) -> NDArray[np.float64]:
        if self.scale == "log2":
            return values
        with np.errstate(divide="ignore", invalid="ignore"):  # 0: minus infinity
            return np.asarray(np.log2(values), np.float64)


@dataclass(frozen=True, slots=True)
class Neighbours:
    """A missing value becomes the mean of the nearest training rows that have it.

    Distances are Euclidean over the features measured in both rows. It suits values
    that are missing at random; what is missing because it is low it moves up.

    Attributes
    ----------
    k : int
        How many training rows.

    References
    ----------
    Troyanskaya et al. 2001, Bioinformatics 17:520; done by scikit-learn's
    ``KNNImputer``.
    """

    name: ClassVar[str] = "neighbours"
    place: ClassVar[str] = FILL
    assay: ClassVar[bool] = False

    k: int = whole(STEPS.neighbours, 1)

    def words(self) -> str:
        """Return what the step does."""
        return (
            f"missing values become the mean of the {self.k} nearest training rows "
            "that have them"
        )

    def learn(
        self, values: Values, rows: NDArray[np.int64], context: RecipeContext
    ) -> Learnt:
        """Return the training rows, of the features that are in."""
        del context
        centre = medians(values, rows)
        used = np.flatnonzero(values.included & np.isfinite(centre))
        taught = values.part(used, rows).astype(np.float64).T
        return {
            "features": used,
            "taught": np.ascontiguousarray(taught),
            "fill": centre,
        }

    def apply(self, values: Values, learnt: Learnt, context: RecipeContext) -> Values:
        """Return the values with missing cells filled, a matrix of the fold's own."""
        from sklearn.impute import KNNImputer  # slow to import

        del context
        used, taught = learnt["features"], learnt["taught"]
        matrix = np.empty((values.n_features, values.n_samples), np.float32)
        for here, tile in values.tiles():
            matrix[here] = tile
        done = values.own(matrix).filled(learnt["fill"])
        if not len(used):
            return done
        imputer = KNNImputer(n_neighbors=self.k, keep_empty_features=True).fit(taught)
        for at, block in values.samples(np.arange(values.n_samples)):
            for i, sample in zip(at, block[:, used], strict=True):
                if np.isnan(sample).any():
                    # alone, so that no bit depends on which other rows are filled
                    matrix[used, i] = imputer.transform(sample[None, :])[0]
        return done

    def needs(self, learnt: Learnt, markers: NDArray[np.int64]) -> NDArray[np.int64]:
        """Return the features that distances are taken over."""
        del markers
        return np.asarray(learnt["features"], np.int64)
