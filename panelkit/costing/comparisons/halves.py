"""Tuning on complementary halves, for what was not selected."""

from collections.abc import Callable, Sequence

import numpy as np
from numpy.typing import NDArray

from panelkit.costing.data import ProcedureData, Split
from panelkit.costing.refits import Columns, refit

__all__ = ["tuned_on_halves"]


def tuned_on_halves(
    columns: Callable[[Split], Columns],
    panels: Sequence[NDArray[np.int64]],
    data: ProcedureData,
    split: Split,
    penalties: Sequence[float],
    n_pairs: int,
) -> float:
    """Return the ridge penalty by which panels lose least on the other half.

    Parameters
    ----------
    columns : callable
        A split to its standardised columns.
    panels : sequence of ndarray of int64
        Positions among the columns; one penalty for all of them.
    data : ProcedureData
        Shared data.
    split : Split
        Its training rows and their complementary pairs.
    penalties : sequence of float
        Largest first.
    n_pairs : int
        Pairs used, the first ones.

    Returns
    -------
    float
        Scaled to the training rows, which are more than a half; the larger of equals.

    Raises
    ------
    FitError
        A fit that is not possible or did not converge.
    """
    grid = np.tile(np.array(penalties), (len(panels), 1))
    loss = np.zeros(grid.shape[1])
    halves = split.pairs.rows[: 2 * n_pairs]
    for half, teach in enumerate(halves):
        own = Split(teach, halves[half ^ 1])
        for predicted in refit(columns(own), panels, data, own, grid):
            loss += data.task.losses(predicted, own.test, data.weights)
    best = float(penalties[int(loss.argmin())])
    return best * len(halves[0]) / len(split.training)
