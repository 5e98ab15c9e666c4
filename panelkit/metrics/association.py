"""Association of two nominal columns: Cramer's V and its bias-corrected form."""

from collections.abc import Sequence

import numpy as np
from numpy.typing import ArrayLike, NDArray

from panelkit.errors import InputDataError

__all__ = ["contingency_table", "cramers_v", "cramers_v_corrected"]


def contingency_table(
    rows: Sequence[str] | NDArray[np.object_],
    columns: Sequence[str] | NDArray[np.object_],
) -> tuple[NDArray[np.int64], list[str], list[str]]:
    """Return how often each pair of entries occurs together.

    Parameters
    ----------
    rows, columns : sequence of str of length n
        Two columns of the same rows.

    Returns
    -------
    table : ndarray of shape (n_row_levels, n_column_levels), int64
        Counts.
    row_levels, column_levels : list of str
        Sorted levels of the two columns.

    Raises
    ------
    InputDataError
        When the columns differ in length.
    """
    if len(rows) != len(columns):
        raise InputDataError(
            code="lengths-differ",
            where="contingency table",
            what=f"the columns have {len(rows)} and {len(columns)} entries",
            accepted="both columns have one entry for each row",
            next_step="Pass two columns of the same table",
        )
    row_levels = sorted(set(rows))
    column_levels = sorted(set(columns))
    row_place = {level: place for place, level in enumerate(row_levels)}
    column_place = {level: place for place, level in enumerate(column_levels)}
    table = np.zeros((len(row_levels), len(column_levels)), dtype=np.int64)
    for row, column in zip(rows, columns, strict=True):
        table[row_place[row], column_place[column]] += 1
    return table, row_levels, column_levels


def cramers_v(table: ArrayLike) -> float:
    """Return Cramer's V of a contingency table.

    Parameters
    ----------
    table : array_like of shape (n_row_levels, n_column_levels)
        Counts; rows and columns without any are left out.

    Returns
    -------
    float
        Between 0 and 1; NaN when one of the columns has a single level.

    Raises
    ------
    InputDataError
        When the table is not two-dimensional or holds anything but counts.

    References
    ----------
    Cramer H (1946). Mathematical Methods of Statistics, chapter 21. Princeton.
    """
    counts = _counts(table)
    n_rows, n_columns = counts.shape
    if min(n_rows, n_columns) < 2:
        return float("nan")
    phi_squared = _chi_square(counts) / counts.sum()
    return float(np.sqrt(phi_squared / min(n_rows - 1, n_columns - 1)))


def cramers_v_corrected(table: ArrayLike) -> float:
    """Return Cramer's V corrected for its upward bias in small tables.

    Parameters
    ----------
    table : array_like of shape (n_row_levels, n_column_levels)
        Counts; rows and columns without any are left out.

    Returns
    -------
    float
        Between 0 and 1; NaN when one of the columns has a single level; 0 when every
        row has a level of its own, where nothing can be told.

    Raises
    ------
    InputDataError
        When the table is not two-dimensional or holds anything but counts.

    References
    ----------
    Bergsma W (2013). A bias-correction for Cramer's V and Tschuprow's T. Journal of
    the Korean Statistical Society 42:323-328.
    """
    counts = _counts(table)
    n_rows, n_columns = counts.shape
    if min(n_rows, n_columns) < 2:
        return float("nan")
    n = counts.sum()
    phi_squared = _chi_square(counts) / n - (n_rows - 1) * (n_columns - 1) / (n - 1)
    rows_corrected = n_rows - (n_rows - 1) ** 2 / (n - 1)
    columns_corrected = n_columns - (n_columns - 1) ** 2 / (n - 1)
    scale = min(rows_corrected, columns_corrected) - 1
    if phi_squared <= 0 or scale <= 0:
        return 0.0
    return float(min(1.0, np.sqrt(phi_squared / scale)))


def _counts(table: ArrayLike) -> NDArray[np.float64]:
    counts = np.asarray(table, dtype=np.float64)
    if counts.ndim != 2 or not np.all(counts >= 0) or not np.isfinite(counts).all():
        raise InputDataError(
            code="no-contingency-table",
            where="contingency table",
            what=f"this is no table of counts (got shape {counts.shape})",
            accepted="two dimensions of finite, non-negative counts are needed",
            next_step="Pass the counts of each pair of levels",
        )
    rows, columns = counts.sum(axis=1) > 0, counts.sum(axis=0) > 0
    return np.asarray(counts[rows][:, columns])


def _chi_square(counts: NDArray[np.float64]) -> float:
    from scipy.stats import chi2_contingency  # slow to import; start-up must stay light

    return float(chi2_contingency(counts, correction=False).statistic)
