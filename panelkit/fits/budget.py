"""The L1 budget: the lasso in its constraint form, for one path."""

from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import ArrayLike, NDArray

from panelkit.errors import FitError, UsageError
from panelkit.fits.families import Family
from panelkit.fits.paths import fit_paths
from panelkit.fits.sources import ArraySource
from panelkit.records import MatrixSource

__all__ = ["BudgetFit", "fit_budget"]

TOLERANCE = 1e-10  # KKT violation relative to the penalty: the norm follows it
REACH = 1e-9  # penalties below this share of the largest count as none
STEPS = 200


@dataclass(frozen=True, slots=True, eq=False)
class BudgetFit:
    """The best model whose coefficients keep an L1 budget.

    Attributes
    ----------
    budget : float
        Largest sum of absolute coefficients that was allowed.
    norm : float
        Sum that is used, on the scale of the budget.
    penalty : float
        The constraint's multiplier: the penalty whose solution this is; 0 where the
        budget does not bind.
    intercept : float or ndarray of shape (n_classes,)
        On the original scale.
    coefficients : ndarray of shape (n_features[, n_classes])
        On the original scale.
    """

    budget: float
    norm: float
    penalty: float
    intercept: float | NDArray[np.float64]
    coefficients: NDArray[np.float64]


class _Path:
    """Solutions of one matrix at single penalties, and their norms."""

    def __init__(
        self,
        source: MatrixSource,
        outcome: Any,
        standardise: bool,
        settings: dict[str, Any],
    ) -> None:
        self._source = source
        self._outcome = outcome
        self._standardise = standardise
        self._settings = settings
        first = self._fit(n_penalties=2, penalty_floor=0.999)
        self.largest = float(first.largest_penalty[0])

    def _fit(self, **penalties: Any) -> Any:
        return fit_paths(
            self._source,
            self._outcome,
            standardise=self._standardise,
            tol=TOLERANCE,
            **penalties,
            **self._settings,
        )

    def at(self, penalty: float) -> tuple[float, Any, NDArray[np.float64]]:
        """Return (norm, intercept, coefficients) at a penalty."""
        if penalty >= self.largest:
            fit = self._fit(penalties=[penalty])
        else:
            grid = np.geomspace(self.largest, penalty, 12)[1:]
            fit = self._fit(penalties=grid)
        return self._norm(*fit.coef(0, fit.penalties.shape[1] - 1))

    def unpenalised(self) -> tuple[float, Any, NDArray[np.float64]] | None:
        """Return the solution without a penalty, None where there is no single one."""
        n_features, n_samples = self._source.base.shape
        if n_features >= n_samples:
            return None
        try:
            free = np.zeros(n_features)
            fit = self._fit(penalties=[1.0], feature_weights=free)
        except FitError:  # separable data: the coefficients have no bound
            return None
        return self._norm(*fit.coef(0, 0))

    def _norm(
        self, intercept: Any, coefficients: NDArray[np.float64]
    ) -> tuple[float, Any, NDArray[np.float64]]:
        size = np.abs(coefficients)
        if coefficients.ndim == 2:
            size = np.sqrt((coefficients**2).sum(axis=1))
        used = np.flatnonzero(size)
        rows = np.arange(self._source.base.shape[1])
        if self._standardise:
            deviations = [self._source.column(int(j), rows).std() for j in used]
            return float((size[used] * deviations).sum()), intercept, coefficients
        return float(size.sum()), intercept, coefficients


def fit_budget(
    X: Any,
    outcome: Any,
    budget: float,
    *,
    family: Family = "binomial",
    standardise: bool = True,
    tol: float = 1e-9,
    strata: ArrayLike | None = None,
    ties: str = "efron",
) -> BudgetFit:
    r"""Return the best model under an L1 budget, all rows.

    Minimises the mean loss subject to :math:`\sum_j |b_j| \le t`. The solution is that
    of the penalty which is the constraint's multiplier; it is found by a bracketed root
    search on the norm, which no larger penalty can raise.

    Parameters
    ----------
    X : array_like of shape (n_samples, n_features), or MatrixSource
        The expression matrix.
    outcome : array_like of shape (n_samples,), or (time, event)
        As for `fit_paths`.
    budget : float
        The t above, 0 or larger. With `standardise` it holds for coefficients of
        columns scaled to deviation one (divisor n), else of the columns as they are.
        For several classes the norm of a feature is taken over the classes.
    family : {"gaussian", "binomial", "cox", "multinomial"}
        As for `fit_paths`.
    standardise : bool
        Scale on which the budget holds.
    tol : float
        How near the norm has to come to the budget, relative to it.
    strata, ties
        As for `fit_paths`.

    Returns
    -------
    BudgetFit
        Coefficients, and the penalty that they belong to.

    Raises
    ------
    UsageError
        A budget that is no number of at least 0.
    FitError
        As `fit_paths`, or no penalty meets the budget.

    References
    ----------
    Tibshirani 1996, JRSS-B 58:267 (the constraint form); Osborne, Presnell & Turlach
    2000, IMA J Numer Anal 20:389.
    """
    if not isinstance(budget, int | float | np.number) or not 0.0 <= budget < np.inf:
        raise UsageError(
            code="budget-out-of-range",
            where="budget",
            what=f"no budget (got {budget!r})",
            accepted="a number of at least 0",
            next_step="Name the largest sum of absolute coefficients",
        )
    source: MatrixSource = X if hasattr(X, "included") else ArraySource(X)
    settings = {"family": family, "strata": strata, "ties": ties}
    path = _Path(source, outcome, standardise, settings)
    if budget == 0.0 or path.largest == 0.0:
        norm, intercept, coefficients = path.at(max(path.largest, 1.0))
        return BudgetFit(float(budget), norm, path.largest, intercept, coefficients)
    free = path.unpenalised()
    if free is not None and free[0] <= budget:
        return BudgetFit(float(budget), free[0], 0.0, free[1], free[2])
    return _search(path, float(budget), tol)


def _search(path: _Path, budget: float, tol: float) -> BudgetFit:
    """Find the penalty by regula falsi (Illinois) between two that bracket it."""
    high, above = path.largest, -budget
    low = path.largest
    while True:
        low *= 0.1
        norm, intercept, coefficients = path.at(low)
        below = norm - budget
        if below >= 0.0:
            break
        if low < REACH * path.largest:  # every solution keeps the budget
            return BudgetFit(budget, norm, 0.0, intercept, coefficients)
        high, above = low, below
    side = 0
    penalty = low
    for _step in range(STEPS):
        if abs(below) <= tol * budget or abs(norm - budget) <= tol * budget:
            return BudgetFit(budget, norm, penalty, intercept, coefficients)
        penalty = (low * above - high * below) / (above - below)
        norm, intercept, coefficients = path.at(penalty)
        off = norm - budget
        if off > 0.0:
            low, below = penalty, off
            above = 0.5 * above if side == 1 else above
            side = 1
        else:
            high, above = penalty, off
            below = 0.5 * below if side == -1 else below
            side = -1
    raise FitError(
        code="budget-not-met",
        where="budget",
        what=f"the norm stayed at {norm:.6g}",
        accepted=f"a norm within {tol:g} of the budget {budget:g}",
        next_step="Raise tol",
    )
