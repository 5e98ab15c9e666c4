"""Small refits of panels on training rows, and what they predict for test rows."""

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from panelkit.costing.data import ProcedureData, Split
from panelkit.fits import fit_panels, standardised
from panelkit.preparation import DesignView

__all__ = [
    "Columns",
    "TrainingObjective",
    "columns_of",
    "refit",
    "standardised_columns",
]

OBJECTIVE_PENALTY = 0.03
"""Ridge penalty by which makers compare panels: enough that separation is no merit."""


@dataclass(frozen=True, slots=True, eq=False)
class Columns:
    """Columns standardised on the training rows.

    Attributes
    ----------
    taught : ndarray of shape (n_columns, n_training)
        Of the training rows.
    tested : ndarray of shape (n_columns, n_test)
        Of the test rows, by the training rows' means and deviations.
    """

    taught: NDArray[np.float64]
    tested: NDArray[np.float64]


def standardised_columns(
    values: NDArray[np.float64], data: ProcedureData, split: Split
) -> Columns:
    """Return columns of the training, then test rows, standardised on the former."""
    n = len(split.training)
    Z, _mean, _deviation = standardised(
        values, np.arange(n), data.weights[split.training]
    )
    return Columns(Z[:, :n].copy(), Z[:, n:].copy())


def columns_of(
    view: DesignView,
    features: NDArray[np.int64],
    data: ProcedureData,
    split: Split,
) -> Columns:
    """Return prepared features standardised on the training rows.

    Parameters
    ----------
    view : DesignView
        Preparation learnt on the training rows.
    features : ndarray of int64
        Which features, one a column.
    data : ProcedureData
        Weights.
    split : Split
        Training and test rows.

    Returns
    -------
    Columns
        For `refit`.
    """
    rows = np.concatenate([split.training, split.test])
    return standardised_columns(view.columns(features, rows), data, split)


def refit(
    columns: Columns,
    panels: Sequence[NDArray[np.int64]],
    data: ProcedureData,
    split: Split,
    penalties: NDArray[np.float64],
) -> NDArray[np.float64]:
    """Refit each panel on the training rows; return predictions of the test rows.

    Parameters
    ----------
    columns : Columns
        Standardised columns.
    panels : sequence of ndarray of int64
        Positions among the columns.
    data : ProcedureData
        Outcome and weights.
    split : Split
        Training and test rows.
    penalties : ndarray of shape (n_panels, n_penalties)
        Ridge penalties of each panel, largest first.

    Returns
    -------
    ndarray of shape (n_panels, n_penalties[, n_classes], n_test)
        Linear predictors.

    Raises
    ------
    FitError
        One class only, no event, or no convergence.
    """
    task = data.task
    shape = (len(panels), penalties.shape[1], *task.predictors, len(split.test))
    predicted = np.empty(shape)
    grids, which = np.unique(penalties, axis=0, return_inverse=True)
    for k, grid in enumerate(grids):  # panels of the same penalties in one call
        alike = np.flatnonzero(which.ravel() == k).tolist()
        fits = fit_panels(
            columns.taught,
            [panels[p] for p in alike],
            task.outcome(split.training),
            data.weights[split.training],
            grid,
            family=task.family,
        )
        predicted[alike] = fits.linear_predictors(columns.tested)
    return predicted


class TrainingObjective:
    """Penalised training loss of panels: what makers compare them by.

    Parameters
    ----------
    view : DesignView
        Preparation learnt on the training rows.
    features : ndarray of int64
        The candidates, from which panels are formed.
    data : ProcedureData
        Outcome and weights.
    training : ndarray of int64
        Rows that teach.
    """

    def __init__(
        self,
        view: DesignView,
        features: NDArray[np.int64],
        data: ProcedureData,
        training: NDArray[np.int64],
    ) -> None:
        self._features = np.sort(features)
        self._data = data
        self._training = training
        split = Split(training, np.empty(0, np.int64))
        self._taught = columns_of(view, self._features, data, split).taught

    def __call__(self, panels: Sequence[NDArray[np.int64]]) -> NDArray[np.float64]:
        """Return the penalised loss of each panel of features."""
        task, training = self._data.task, self._training
        fits = fit_panels(
            self._taught,
            [np.searchsorted(self._features, panel) for panel in panels],
            task.outcome(training),
            self._data.weights[training],
            np.array([OBJECTIVE_PENALTY]),
            family=task.family,
        )
        predicted = fits.linear_predictors(self._taught)[:, 0]
        loss = task.losses(predicted, training, self._data.weights)
        slopes = fits.coefs[:, 0, ..., 1:].reshape(len(panels), -1)
        return np.asarray(loss + 0.5 * OBJECTIVE_PENALTY * (slopes**2).sum(axis=1))
