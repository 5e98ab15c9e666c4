"""Small refits: ridge-penalised models of the panels themselves, all four families."""

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import ArrayLike, NDArray

from panelkit.errors import FitError
from panelkit.fits.arguments import problem_of
from panelkit.fits.families import Family, Problem
from panelkit.fits.kernel_cache import kernel_cache

with kernel_cache():
    from panelkit.fits import kernel_grouped, kernel_scalar

__all__ = ["PanelFits", "fit_panels", "standardised"]

TOLERANCE = 1e-9
STEPS = 200


@dataclass(frozen=True, slots=True, eq=False)
class PanelFits:
    """Ridge-penalised fits of several panels at several penalties.

    Attributes
    ----------
    members : ndarray of shape (n_panels, largest size), int64
        Columns of each panel; only the first `sizes` count.
    sizes : ndarray of shape (n_panels,), int64
        Number of columns of each panel.
    coefs : ndarray of shape (n_panels, n_penalties[, n_classes], 1 + largest size)
        Intercept first (0 for Cox); for standardised columns.
    classes : tuple
        Class labels of a multinomial outcome.
    """

    members: NDArray[np.int64]
    sizes: NDArray[np.int64]
    coefs: NDArray[np.float64]
    classes: tuple[object, ...] = ()

    def linear_predictors(self, Z: NDArray[np.float64]) -> NDArray[np.float64]:
        """Return linear predictors, (n_panels, n_penalties[, n_classes], n_rows).

        Parameters
        ----------
        Z : ndarray of shape (n_columns, n_rows)
            Columns standardised as for the fit.

        Returns
        -------
        ndarray
            Value, log-odds, log hazard ratio, or log chances up to a constant; summed
            in the order of the markers, so that a row's bits depend on no other row.
        """
        eta = np.empty((*self.coefs.shape[:-1], Z.shape[1]))
        kernel = kernel_grouped if self.coefs.ndim == 4 else kernel_scalar
        kernel.predict_panels(
            np.ascontiguousarray(Z), self.members, self.sizes, self.coefs, eta
        )
        return eta


def fit_panels(
    Z: NDArray[np.float64],
    panels: Sequence[NDArray[np.int64]],
    outcome: Any,
    weights: NDArray[np.float64],
    penalties: NDArray[np.float64],
    *,
    family: Family = "binomial",
    strata: ArrayLike | None = None,
    ties: str = "efron",
) -> PanelFits:
    r"""Fit ridge-penalised models of several panels, each at several penalties.

    Minimises the weighted mean loss plus :math:`\lambda/2 \sum_j b_j^2`, intercept
    free.

    Parameters
    ----------
    Z : ndarray of shape (n_columns, n_rows)
        Standardised columns (`standardised`).
    panels : sequence of ndarray of int64
        Columns of each panel; may be empty (intercept only).
    outcome : array_like of shape (n_rows,), or (time, event)
        As for `fit_paths`.
    weights : ndarray of shape (n_rows,)
        Positive; rescaled to sum to one.
    penalties : ndarray of shape (n_penalties,)
        Positive, largest first.
    family : {"gaussian", "binomial", "cox", "multinomial"}
        As for `fit_paths`.
    strata, ties
        As for `fit_paths`.

    Returns
    -------
    PanelFits
        Coefficients for standardised columns.

    Raises
    ------
    UsageError
        An outcome that does not suit the family.
    FitError
        One class only, no event, or no convergence.

    References
    ----------
    Hoerl & Kennard 1970, Technometrics 12:55; le Cessie & van Houwelingen 1992,
    Appl Stat 41:191; Verweij & van Houwelingen 1994, Stat Med 13:2427 (Cox).
    """
    n = Z.shape[1]
    problem, classes = problem_of(
        outcome,
        family,
        [np.arange(n)],
        n,
        weights=weights,
        strata=strata,
        ties=ties,
    )
    sizes = np.array([len(panel) for panel in panels], np.int64)
    members = np.zeros((len(panels), max(1, int(sizes.max(initial=0)))), np.int64)
    for s, panel in enumerate(panels):
        members[s, : len(panel)] = panel
    grid = np.ascontiguousarray(penalties, np.float64)
    fit = _grouped_fits if family == "multinomial" else _scalar_fits
    coefs, worst = fit(problem, np.ascontiguousarray(Z), members, sizes, grid)
    if not worst <= 100 * TOLERANCE:
        raise FitError(
            code="refit-not-converged",
            where="refit of a panel",
            what=f"the gradient stayed at {worst:.2g}",
            accepted=f"at most {100 * TOLERANCE:g}",
            next_step="Raise the smallest ridge penalty",
        )
    return PanelFits(members, sizes, coefs, classes)


def _scalar_fits(
    problem: Problem,
    Z: NDArray[np.float64],
    members: NDArray[np.int64],
    sizes: NDArray[np.int64],
    penalties: NDArray[np.float64],
) -> tuple[NDArray[np.float64], float]:
    share = problem.weights / problem.weights.sum()
    coefs = np.zeros((len(sizes), len(penalties), 1 + members.shape[1]))
    worst = kernel_scalar.ridge_panels(
        problem.code,
        problem.survival(),
        Z,
        members,
        sizes,
        problem.y,
        share,
        penalties,
        problem.start(share),
        STEPS,
        TOLERANCE,
        coefs,
    )
    return coefs, float(worst)


def _grouped_fits(
    problem: Problem,
    Z: NDArray[np.float64],
    members: NDArray[np.int64],
    sizes: NDArray[np.int64],
    penalties: NDArray[np.float64],
) -> tuple[NDArray[np.float64], float]:
    share = problem.weights / problem.weights.sum()
    shape = (len(sizes), len(penalties), problem.n_classes, 1 + members.shape[1])
    coefs = np.zeros(shape)
    worst = kernel_grouped.ridge_panels(
        Z,
        members,
        sizes,
        problem.y,
        share,
        penalties,
        STEPS,
        TOLERANCE,
        coefs,
    )
    return coefs, float(worst)


def standardised(
    columns: NDArray[np.float64],
    training: NDArray[np.int64],
    weights: NDArray[np.float64],
) -> tuple[NDArray[np.float64], NDArray[np.float64], NDArray[np.float64]]:
    """Return columns centred and scaled by their training rows, mean and deviation.

    Parameters
    ----------
    columns : ndarray of shape (n_columns, n_rows)
        Prepared values, all rows.
    training : ndarray of int64
        Which of them teach.
    weights : ndarray of shape (n_training,)
        Observation weights of the training rows.

    Returns
    -------
    Z : ndarray of shape (n_columns, n_rows)
        0 throughout for a column that is constant on the training rows.
    mean, deviation : ndarray of shape (n_columns,)
        Learnt on the training rows; deviation 1 for a constant column.
    """
    share = weights / weights.sum()
    taught = columns[:, training]
    mean = (taught * share).sum(axis=1)
    variance = ((taught - mean[:, None]) ** 2 * share).sum(axis=1)
    constant = ~(variance > np.maximum(1e-24 * mean**2, 1e-290))
    deviation = np.sqrt(np.where(constant, 1.0, variance))
    Z = (columns - mean[:, None]) / deviation[:, None]
    Z[constant] = 0.0
    return Z, mean, deviation
