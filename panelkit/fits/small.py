"""Small refits: ridge-penalised logistic models of the panels themselves."""

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from panelkit.errors import FitError
from panelkit.fits.kernel_cache import kernel_cache

with kernel_cache():
    from panelkit.fits import kernel_small as kernels

__all__ = ["PanelFits", "fit_panels", "standardised"]

TOLERANCE = 1e-9
STEPS = 100


@dataclass(frozen=True, slots=True, eq=False)
class PanelFits:
    """Ridge-penalised fits of several panels at several penalties.

    Attributes
    ----------
    members : ndarray of shape (n_panels, largest size), int64
        Columns of each panel; only the first `sizes` count.
    sizes : ndarray of shape (n_panels,), int64
        Number of columns of each panel.
    coefs : ndarray of shape (n_panels, n_penalties, 1 + largest size)
        Intercept first; for standardised columns.
    """

    members: NDArray[np.int64]
    sizes: NDArray[np.int64]
    coefs: NDArray[np.float64]

    def linear_predictors(self, Z: NDArray[np.float64]) -> NDArray[np.float64]:
        """Return log-odds of shape (n_panels, n_penalties, n_rows).

        Parameters
        ----------
        Z : ndarray of shape (n_columns, n_rows)
            Columns standardised as for the fit.
        """
        eta = np.empty((*self.coefs.shape[:2], Z.shape[1]))
        kernels.predict_panels(
            np.ascontiguousarray(Z), self.members, self.sizes, self.coefs, eta
        )
        return eta


def fit_panels(
    Z: NDArray[np.float64],
    panels: Sequence[NDArray[np.int64]],
    y: NDArray[np.float64],
    weights: NDArray[np.float64],
    penalties: NDArray[np.float64],
) -> PanelFits:
    r"""Fit logistic models of several panels, each at several ridge penalties.

    Minimises the weighted mean loss plus :math:`\lambda/2 \sum_j b_j^2`, intercept
    free.

    Parameters
    ----------
    Z : ndarray of shape (n_columns, n_rows)
        Standardised columns (`standardised`).
    panels : sequence of ndarray of int64
        Columns of each panel; may be empty (intercept only).
    y : ndarray of shape (n_rows,)
        0 and 1, both present.
    weights : ndarray of shape (n_rows,)
        Positive; rescaled to sum to one.
    penalties : ndarray of shape (n_penalties,)
        Positive, largest first.

    Returns
    -------
    PanelFits
        Coefficients for standardised columns.

    Raises
    ------
    FitError
        One class only, or no convergence.

    References
    ----------
    Hoerl & Kennard 1970, Technometrics 12:55; le Cessie & van Houwelingen 1992,
    Appl Stat 41:191.
    """
    if np.ptp(y) == 0.0:
        raise FitError(
            code="one-class-refit",
            where="refit of a panel",
            what="rows of one class only",
            accepted="both classes among the training rows",
            next_step="Use fewer folds or more samples",
        )
    sizes = np.array([len(panel) for panel in panels], np.int64)
    members = np.zeros((len(panels), max(1, int(sizes.max(initial=0)))), np.int64)
    for s, panel in enumerate(panels):
        members[s, : len(panel)] = panel
    coefs = np.zeros((len(panels), len(penalties), 1 + members.shape[1]))
    worst = kernels.ridge_panels(
        np.ascontiguousarray(Z),
        members,
        sizes,
        y,
        weights / weights.sum(),
        penalties,
        STEPS,
        TOLERANCE,
        coefs,
    )
    if not worst <= 100 * TOLERANCE:
        raise FitError(
            code="refit-not-converged",
            where="refit of a panel",
            what=f"the gradient stayed at {worst:.2g}",
            accepted=f"at most {100 * TOLERANCE:g}",
            next_step="Raise the smallest ridge penalty",
        )
    return PanelFits(members, sizes, coefs)


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
