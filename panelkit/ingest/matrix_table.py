"""A matrix as it was read, before anyone knows which way round it is."""

from collections.abc import Callable
from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray

from panelkit.ingest.cells import LARGEST, BadCells
from panelkit.records import Finding

__all__ = ["MatrixTable", "infinite_to_missing"]


@dataclass(frozen=True, slots=True, eq=False)
class MatrixTable:
    """Numbers with the ids of their rows and columns.

    Attributes
    ----------
    where : str
        The file or argument, for messages.
    row_ids, column_ids : list of str
        As written.
    values : ndarray of shape (n_rows, n_columns), float32 or float64
        NaN where missing.
    bad_cells : BadCells
        Cells that were read as missing though they hold something.
    findings : tuple of Finding
        What was noticed about the file itself.
    """

    where: str
    row_ids: list[str]
    column_ids: list[str]
    values: NDArray[np.floating[Any]]
    bad_cells: BadCells
    findings: tuple[Finding, ...] = ()


def infinite_to_missing(
    values: NDArray[np.floating[Any]], note: Callable[[int, int, str], None]
) -> NDArray[np.floating[Any]]:
    """Return the values with those beyond single precision noted and set to NaN.

    Parameters
    ----------
    values : ndarray
        Two-dimensional; copied only when something is beyond it.
    note : callable
        Called with row position, column position and the number as text.

    Returns
    -------
    ndarray
        Same shape and dtype.
    """
    infinite = (values > LARGEST) | (values < -LARGEST)
    if not infinite.any():
        return values
    values = values.copy()
    for row, column in np.argwhere(infinite):
        note(int(row), int(column), str(values[row, column]))
    values[infinite] = np.nan
    return values
