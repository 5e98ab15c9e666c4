"""A matrix as it was read, before anyone knows which way round it is."""

from collections.abc import Callable
from dataclasses import dataclass
from typing import Any, Literal

import numpy as np
from numpy.typing import NDArray

from panelkit.ingest.cells import LARGEST, BadCells
from panelkit.ingest.wording import counted, quoted
from panelkit.records import Finding

__all__ = [
    "BLOCK_BYTES",
    "DeferredValues",
    "MatrixTable",
    "Note",
    "Numbers",
    "Positions",
    "Side",
    "cell_notes",
    "infinite_to_missing",
    "truth_findings",
    "values_of_samples",
]

BLOCK_BYTES = 16 * 2**20
"""Numbers held beside the matrix while it is read from a file in blocks."""

_TILE = 4096
"""Features copied together when the matrix is brought into its final order."""

Numbers = NDArray[np.floating[Any]]
Positions = NDArray[np.int64]
Side = Literal["rows", "columns"]
Note = Callable[[int, int, str], None]


@dataclass(frozen=True, slots=True, eq=False)
class DeferredValues:
    """Values that stay where they are until it is known which samples are wanted.

    Attributes
    ----------
    shape : tuple of int
        Rows and columns.
    take_rows : callable
        Row positions to their values, ndarray of shape (n_columns, n_taken).
    take_columns : callable
        Column positions to their values, ndarray of shape (n_rows, n_taken).
    """

    shape: tuple[int, int]
    take_rows: Callable[[Positions], Numbers]
    take_columns: Callable[[Positions], Numbers]

    @property
    def T(self) -> "DeferredValues":
        """The same values the other way round."""
        return DeferredValues(self.shape[::-1], self.take_columns, self.take_rows)


@dataclass(frozen=True, slots=True, eq=False)
class MatrixTable:
    """Numbers with the ids of their rows and columns.

    Attributes
    ----------
    where : str
        The file or argument, for messages.
    row_ids, column_ids : list of str
        As written.
    values : ndarray or DeferredValues of shape (n_rows, n_columns)
        float32 or float64, NaN where missing.
    bad_cells : BadCells
        Cells that were read as missing though they hold something; for deferred
        values it is filled when they are taken.
    findings : tuple of Finding
        What was noticed about the file itself.
    """

    where: str
    row_ids: list[str]
    column_ids: list[str]
    values: Any
    bad_cells: BadCells
    findings: tuple[Finding, ...] = ()


def values_of_samples(values: Any, positions: Positions) -> Numbers:
    """Return the wanted samples of a matrix with features in rows, in their order.

    Parameters
    ----------
    values : ndarray or DeferredValues of shape (n_features, n_in_file)
        The matrix.
    positions : ndarray of shape (n_samples,), int64
        Wanted columns, each once.

    Returns
    -------
    ndarray of shape (n_features, n_samples)
        C-contiguous, a copy.
    """
    if isinstance(values, DeferredValues):
        return values.take_columns(positions)
    result = np.empty((len(values), len(positions)), dtype=values.dtype)
    for start in range(0, len(values), _TILE):
        result[start : start + _TILE] = values[start : start + _TILE][:, positions]
    return result


def cell_notes(
    bad_cells: BadCells, row_ids: list[str], column_ids: list[str]
) -> Callable[[int, int, str], None]:
    """Return a function that notes a bad cell by its row and column positions.

    Parameters
    ----------
    bad_cells : BadCells
        Where they are collected.
    row_ids, column_ids : list of str
        Ids to name them by.

    Returns
    -------
    callable
        Of row position, column position and text.
    """

    def note(row: int, column: int, text: str) -> None:
        bad_cells.add(row_ids[row], column_ids[column], text)

    return note


def truth_findings(where: str, names: list[str]) -> list[Finding]:
    """Return the finding that names columns of truth values, if there are any.

    Parameters
    ----------
    where : str
        The file or argument.
    names : list of str
        The columns.

    Returns
    -------
    list of Finding
        One or none.
    """
    if not names:
        return []
    return [
        Finding(
            code="truth-values-as-numbers",
            severity="info",
            where=where,
            message=f"{counted(len(names), 'column holds', 'columns hold')} truth "
            f"values, read as 0 and 1: {quoted(names)}",
            next_step="Check that they belong into the matrix.",
        )
    ]


def infinite_to_missing(values: Numbers, note: Note) -> Numbers:
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
