"""The state of a block of refits: the arrays that the engine's parts share."""

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray

__all__ = [
    "DONE", "ENTRIES", "FRESH", "PENDING", "STEP", "WORKING", "Refits", "new_refits",
]  # fmt: skip

FIRST_WORKING = 64  # working features for which space is made at first

# columns of Refits.state
STEP = 0  # -1 while the largest penalty is unknown
WORKING = 1
ENTRIES = 2
DONE = 3  # 1 finished, 2 tolerance not reached
PENDING = 4  # 1 while the current penalty waits to be solved
FRESH = 5  # 1 while the working set of the first penalty is not chosen yet


@dataclass(slots=True, eq=False)
class Refits:
    """The state of a block of B refits; first axis always the refit.

    Attributes
    ----------
    rows : ndarray of shape (B, n), int64
        Rows of the matrix.
    n_rows : ndarray of shape (B,), int64
        How many of them count.
    slots : ndarray of shape (B, n), int64
        Columns of `residuals`.
    weight : ndarray of shape (B, n)
        Observation weights, each refit's sum to one.
    eta, r : ndarray of shape (B, K, n)
        Linear predictors and weighted residuals.
    residuals : ndarray of shape (B, K, columns of the product), float32
        r, 0 elsewhere.
    Z : ndarray of shape (B, working, n)
        Standardised columns of the working set.
    work : ndarray of shape (B, working), int64
        Their features.
    pull, mean, deviation : ndarray of shape (B, working)
        Their feature weights and moments.
    beta : ndarray of shape (B, K, working)
        Coefficients of standardised columns.
    grad, grad_before : ndarray of shape (B, working)
        Size of the gradient at the last solution and at the previous penalty.
    entered : ndarray of shape (B, working), bool
        Whether the feature was non-zero before.
    order, order_step : ndarray of shape (B, working), int64
        Positions in `work` in order of entry, and the step of entry.
    penalties : ndarray of shape (B, penalties)
        Descending.
    now, largest : ndarray of shape (B,)
        The penalty to be solved, and the largest penalty.
    b0 : ndarray of shape (B, K)
        Intercepts for standardised columns.
    violation : ndarray of shape (B,)
        Of the last solve, over the working set.
    certificate : ndarray of shape (B, penalties)
        KKT violation over the penalty.
    intercept : ndarray of shape (B, penalties, K)
        Stored intercepts.
    stored_at : ndarray of shape (B, penalties + 1), int64
        Borders of the stored solutions.
    stored_work : ndarray of shape (B, stored), int64
        Positions in `work` of the stored coefficients.
    stored_beta : ndarray of shape (B, stored, K)
        The stored coefficients.
    state : ndarray of shape (B, 6), int64
        Columns STEP to FRESH of this file.
    """

    rows: NDArray[np.int64]
    n_rows: NDArray[np.int64]
    slots: NDArray[np.int64]
    weight: NDArray[np.float64]
    eta: NDArray[np.float64]
    r: NDArray[np.float64]
    residuals: NDArray[np.float32]
    Z: NDArray[np.float64]
    work: NDArray[np.int64]
    pull: NDArray[np.float64]
    mean: NDArray[np.float64]
    deviation: NDArray[np.float64]
    beta: NDArray[np.float64]
    grad: NDArray[np.float64]
    grad_before: NDArray[np.float64]
    entered: NDArray[np.bool_]
    order: NDArray[np.int64]
    order_step: NDArray[np.int64]
    penalties: NDArray[np.float64]
    now: NDArray[np.float64]
    largest: NDArray[np.float64]
    b0: NDArray[np.float64]
    violation: NDArray[np.float64]
    certificate: NDArray[np.float64]
    intercept: NDArray[np.float64]
    stored_at: NDArray[np.int64]
    stored_work: NDArray[np.int64]
    stored_beta: NDArray[np.float64]
    state: NDArray[np.int64]

    def make_room(self, working: int, stored: int) -> None:
        """Grow to so many working features and stored coefficients a refit."""
        if working > self.work.shape[1]:
            size = max(working, 2 * self.work.shape[1])
            for name in _WORKING_ARRAYS:
                setattr(self, name, _grown(getattr(self, name), size))
            self.beta = _grown(self.beta, size, axis=2)
        if stored > self.stored_work.shape[1]:
            size = max(stored, 2 * self.stored_work.shape[1])
            for name in ("stored_work", "stored_beta"):
                setattr(self, name, _grown(getattr(self, name), size))


_WORKING_ARRAYS = (
    "Z", "work", "pull", "mean", "deviation", "grad", "grad_before", "entered",
    "order", "order_step",
)  # fmt: skip


def _grown(array: NDArray[Any], size: int, axis: int = 1) -> NDArray[Any]:
    """Return the array with one axis grown by zeros."""
    shape = list(array.shape)
    shape[axis] = size
    grown = np.zeros(shape, array.dtype)  # pages that nobody writes cost no memory
    grown[tuple(slice(0, extent) for extent in array.shape)] = array
    return grown


def new_refits(
    rows_of: Sequence[NDArray[np.int64]],
    weights: NDArray[np.float64],
    penalties: NDArray[np.float64],
    n_predictors: int,
    used: NDArray[np.int64],
) -> Refits:
    """Return the refits' arrays before the null model is fitted.

    Parameters
    ----------
    rows_of : sequence of ndarray of int64
        Rows of each refit.
    weights : ndarray of shape (n_samples,)
        Observation weights.
    penalties : ndarray of shape (n_penalties,)
        Descending.
    n_predictors : int
        Linear predictors of a refit.
    used : ndarray of int64
        Samples that the product reads, ascending.

    Returns
    -------
    Refits
        With empty working sets.
    """
    n_refits = len(rows_of)
    n_rows = np.array([len(rows) for rows in rows_of], np.int64)
    shape = (n_refits, int(n_rows.max()))
    n_penalties = len(penalties)
    rows, slots = np.zeros(shape, np.int64), np.zeros(shape, np.int64)
    weight = np.zeros(shape)
    for b, chosen in enumerate(rows_of):
        n = len(chosen)
        rows[b, :n] = chosen
        slots[b, :n] = np.searchsorted(used, chosen)
        share = weights[chosen]
        weight[b, :n] = share / share.sum()
    state = np.zeros((n_refits, 6), np.int64)
    state[:, STEP] = -1
    working = (n_refits, FIRST_WORKING)
    return Refits(
        rows=rows,
        n_rows=n_rows,
        slots=slots,
        weight=weight,
        eta=np.zeros((n_refits, n_predictors, shape[1])),
        r=np.zeros((n_refits, n_predictors, shape[1])),
        residuals=np.zeros((n_refits, n_predictors, len(used)), np.float32),
        Z=np.zeros((n_refits, FIRST_WORKING, shape[1])),
        work=np.zeros(working, np.int64),
        pull=np.zeros(working),
        mean=np.zeros(working),
        deviation=np.ones(working),
        beta=np.zeros((n_refits, n_predictors, FIRST_WORKING)),
        grad=np.zeros(working),
        grad_before=np.zeros(working),
        entered=np.zeros(working, np.bool_),
        order=np.zeros(working, np.int64),
        order_step=np.zeros(working, np.int64),
        penalties=np.tile(penalties, (n_refits, 1)),
        now=np.zeros(n_refits),
        largest=np.zeros(n_refits),
        b0=np.zeros((n_refits, n_predictors)),
        violation=np.zeros(n_refits),
        certificate=np.full((n_refits, n_penalties), np.nan),
        intercept=np.full((n_refits, n_penalties, n_predictors), np.nan),
        stored_at=np.zeros((n_refits, n_penalties + 1), np.int64),
        stored_work=np.zeros((n_refits, 4 * FIRST_WORKING), np.int64),
        stored_beta=np.zeros((n_refits, 4 * FIRST_WORKING, n_predictors)),
        state=state,
    )
