"""Rules of choice: which maker and size is taken, and why."""

from collections.abc import Callable
from dataclasses import dataclass
from decimal import Decimal

import numpy as np
from numpy.typing import NDArray

from panelkit.metrics import corrected_se, paired_interval

__all__ = [
    "DECIMALS",
    "RULES",
    "Curve",
    "Pick",
    "Rule",
    "fold_means",
    "pick",
    "within_margin",
    "within_one_se",
]

DECIMALS = 4  # metrics are compared after rounding, so that machines agree
ONE_SIDED = 0.90  # a 90 % interval's lower end is the one-sided 95 % limit


@dataclass(frozen=True, slots=True)
class Rule:
    """A rule with its figures.

    Attributes
    ----------
    name : str
        One of `RULES`.
    margin : float
        Loss of the metric that counts as no loss; of the margin rules.
    budget : Decimal or None
        Largest programme cost; of ``best-under-budget``.
    required_accuracy : float or None
        Smallest metric; of ``cheapest-above-accuracy``.
    """

    name: str
    margin: float = 0.0
    budget: Decimal | None = None
    required_accuracy: float | None = None

    @property
    def needs_prices(self) -> bool:
        """Whether the rule weighs money."""
        return self.name.startswith(("cheapest", "best-under-budget"))


@dataclass(frozen=True, slots=True, eq=False)
class Curve:
    """Accuracy of procedures on the same splits, with size and cost.

    Attributes
    ----------
    metric : ndarray of shape (n_splits, n_rows)
        On each split, higher better; NaN where undefined.
    size : ndarray of shape (n_rows,)
        Markers.
    cost : ndarray of shape (n_rows,)
        Programme cost, NaN where it is unknown or nothing is priced.
    test_to_train : float
        Ratio of test to training samples.
    """

    metric: NDArray[np.float64]
    size: NDArray[np.float64]
    cost: NDArray[np.float64]
    test_to_train: float


@dataclass(frozen=True, slots=True)
class Pick:
    """What a rule takes.

    Attributes
    ----------
    row : int
        Position on the curve.
    met : bool
        False: no row meets the demand and this is the nearest miss.
    """

    row: int
    met: bool


def fold_means(metric: NDArray[np.float64]) -> NDArray[np.float64]:
    """Return rounded means over splits; minus infinity where no split counts."""
    counted = ~np.isnan(metric)
    total = np.where(counted, metric, 0.0).sum(axis=0)
    with np.errstate(invalid="ignore"):
        mean = total / counted.sum(axis=0)
    return np.where(counted.any(axis=0), mean, -np.inf).round(DECIMALS)


def within_one_se(
    metric: NDArray[np.float64], test_to_train: float
) -> NDArray[np.bool_]:
    """Return which procedures are within one standard error of the best one.

    The standard error is the corrected one of the paired difference to the best;
    where it is 0, or there is one split, only equals of the best are within.

    Parameters
    ----------
    metric : ndarray of shape (n_splits, n_procedures)
        Accuracy on each split; compared after rounding to four decimals.
    test_to_train : float
        Ratio of test to training samples.

    Returns
    -------
    ndarray of shape (n_procedures,), bool
        True for the best itself.

    References
    ----------
    Breiman, Friedman, Olshen & Stone 1984, section 3.4.3; Nadeau & Bengio 2003.
    """
    mean = fold_means(metric)
    best = int(mean.argmax())
    near = np.zeros(len(mean), np.bool_)
    for p in range(len(mean)):
        se = corrected_se(metric[:, best] - metric[:, p], test_to_train)
        allowed = 0.0 if np.isnan(se) else round(se, DECIMALS)
        near[p] = round(mean[best] - mean[p], DECIMALS) <= allowed
    return near


def within_margin(
    metric: NDArray[np.float64], test_to_train: float, margin: float
) -> NDArray[np.bool_]:
    """Return which procedures are shown to lose less than a margin to the best one.

    The lower one-sided 95 % limit of the paired difference has to lie above minus the
    margin; the best itself always qualifies.

    Parameters
    ----------
    metric : ndarray of shape (n_splits, n_procedures)
        Accuracy on each split.
    test_to_train : float
        Ratio of test to training samples.
    margin : float
        Fixed beforehand, never chosen from the data.

    Returns
    -------
    ndarray of shape (n_procedures,), bool
        True for the best itself.

    References
    ----------
    Nadeau & Bengio 2003, Machine Learning 52:239.
    """
    mean = fold_means(metric)
    best = int(mean.argmax())
    near = np.zeros(len(mean), np.bool_)
    for p in range(len(mean)):
        _, low, _ = paired_interval(
            metric[:, p] - metric[:, best], test_to_train, ONE_SIDED
        )
        near[p] = low > -margin
    near[best] = True
    return near


def _smallest(curve: Curve, mean: NDArray[np.float64]) -> NDArray[np.int64]:
    """Return rows by size, accuracy, cost, place."""
    cost = np.where(np.isnan(curve.cost), np.inf, curve.cost)
    return np.lexsort((np.arange(len(mean)), cost, -mean, curve.size))


def _cheapest(curve: Curve, mean: NDArray[np.float64]) -> NDArray[np.int64]:
    """Return rows by cost, size, accuracy, place; unpriced rows last."""
    cost = np.where(np.isnan(curve.cost), np.inf, curve.cost)
    return np.lexsort((np.arange(len(mean)), -mean, curve.size, cost))


def _best(curve: Curve, mean: NDArray[np.float64]) -> NDArray[np.int64]:
    """Return rows by accuracy, cost, size, place."""
    cost = np.where(np.isnan(curve.cost), np.inf, curve.cost)
    return np.lexsort((np.arange(len(mean)), curve.size, cost, -mean))


def _one_se(curve: Curve, rule: Rule) -> NDArray[np.bool_]:
    return within_one_se(curve.metric, curve.test_to_train)


def _margin(curve: Curve, rule: Rule) -> NDArray[np.bool_]:
    return within_margin(curve.metric, curve.test_to_train, rule.margin)


def _priced_one_se(curve: Curve, rule: Rule) -> NDArray[np.bool_]:
    return _one_se(curve, rule) & ~np.isnan(curve.cost)


def _priced_margin(curve: Curve, rule: Rule) -> NDArray[np.bool_]:
    return _margin(curve, rule) & ~np.isnan(curve.cost)


def _affordable(curve: Curve, rule: Rule) -> NDArray[np.bool_]:
    if rule.budget is None:
        return np.zeros(len(curve.size), np.bool_)
    return np.asarray(curve.cost <= float(rule.budget), np.bool_)


def _accurate(curve: Curve, rule: Rule) -> NDArray[np.bool_]:
    required = np.inf if rule.required_accuracy is None else rule.required_accuracy
    return np.asarray(fold_means(curve.metric) >= round(required, DECIMALS), np.bool_)


Ordering = Callable[[Curve, NDArray[np.float64]], NDArray[np.int64]]
Demand = Callable[[Curve, Rule], NDArray[np.bool_]]

RULES: dict[str, tuple[Demand, Ordering, Ordering]] = {
    # demand, order among those that meet it, order of near misses
    "smallest-within-one-se": (_one_se, _smallest, _best),
    "cheapest-within-one-se": (_priced_one_se, _cheapest, _best),
    "smallest-within-margin": (_margin, _smallest, _best),
    "cheapest-within-margin": (_priced_margin, _cheapest, _best),
    "best-under-budget": (_affordable, _best, _cheapest),
    "cheapest-above-accuracy": (_accurate, _cheapest, _best),
}
"""Rules by name; a study declares one of them as primary."""


def pick(rule: Rule, curve: Curve) -> Pick:
    """Return the row that a rule takes, or its nearest miss.

    Parameters
    ----------
    rule : Rule
        Name and figures.
    curve : Curve
        Procedures on the same splits.

    Returns
    -------
    Pick
        Of equals the first row.
    """
    demand, order, misses = RULES[rule.name]
    mean = fold_means(curve.metric)
    met = demand(curve, rule)
    if met.any():
        ranked = order(curve, mean)
        return Pick(int(ranked[met[ranked]][0]), met=True)
    return Pick(int(misses(curve, mean)[0]), met=False)
