"""Small refits of panels on training rows, and what they predict for test rows."""

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Protocol

import numpy as np
from numpy.typing import NDArray

from panelkit.costing.data import ProcedureData, Split
from panelkit.fits import fit_panels, standardised
from panelkit.preparation import DesignView, Recipe

__all__ = [
    "Columns",
    "MarkerValues",
    "Prepared",
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


class Prepared(Protocol):
    """Anything that gives prepared features: a fold's view, or its assay part."""

    def columns(
        self, features: NDArray[np.int64], rows: NDArray[np.int64]
    ) -> NDArray[np.float64]:
        """Return several features, shape (n_chosen, n_rows)."""
        ...


@dataclass(frozen=True, slots=True, eq=False)
class MarkerValues:
    """Markers as their panel is fitted and scored with.

    By the assay part, from the markers and the references alone; without one as the
    view has them.

    Attributes
    ----------
    assay : Recipe or None
        The assay part.
    view : DesignView
        What selected the markers.
    data : ProcedureData
        Shared data.
    training : ndarray of int64
        Rows that teach the assay part.
    """

    assay: Recipe | None
    view: DesignView
    data: ProcedureData
    training: NDArray[np.int64]

    def columns(
        self, features: NDArray[np.int64], rows: NDArray[np.int64]
    ) -> NDArray[np.float64]:
        """Return several markers, ascending, shape (n_chosen, n_rows)."""
        values, context = self.data.values, self.data.context
        if self.assay is None or values is None:
            return self.view.columns(features, rows)
        references = self.assay.reference_candidates(context)
        measured = np.union1d(features, references)
        _state, alone = self.assay.prepare(
            self.assay.base(values[measured]),
            self.training,
            np.full(len(measured), "", object),
            context.among(measured),
        )
        return alone.columns(np.searchsorted(measured, features), rows)


def columns_of(
    prepared: Prepared,
    features: NDArray[np.int64],
    data: ProcedureData,
    split: Split,
) -> Columns:
    """Return prepared features standardised on the training rows.

    Parameters
    ----------
    prepared : Prepared
        A view, or markers by their assay part, learnt on the training rows.
    features : ndarray of int64
        Which features, ascending, one a column.
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
    return standardised_columns(prepared.columns(features, rows), data, split)


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
    prepared : Prepared
        A view, or markers by their assay part, learnt on the training rows.
    features : ndarray of int64
        The candidates, from which panels are formed.
    data : ProcedureData
        Outcome and weights.
    training : ndarray of int64
        Rows that teach.
    """

    def __init__(
        self,
        prepared: Prepared,
        features: NDArray[np.int64],
        data: ProcedureData,
        training: NDArray[np.int64],
    ) -> None:
        self._features = np.sort(features)
        self._data = data
        self._training = training
        split = Split(training, np.empty(0, np.int64))
        self._taught = columns_of(prepared, self._features, data, split).taught

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
