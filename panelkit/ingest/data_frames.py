"""Matrices and sheets from pandas data frames."""

import sys
from typing import TYPE_CHECKING, Any, TypeGuard

import numpy as np
from numpy.typing import NDArray

from panelkit.ingest.cells import BadCells, cell_number
from panelkit.ingest.matrix_table import MatrixTable, infinite_to_missing
from panelkit.ingest.sheet import Sheet, build_sheet
from panelkit.ingest.wording import as_text

if TYPE_CHECKING:
    import pandas as pd

__all__ = [
    "frame_matrix",
    "frame_sheet",
    "index_sheet",
    "is_data_frame",
    "series_text",
]


def is_data_frame(value: object) -> "TypeGuard[pd.DataFrame]":
    """Return whether a value is a pandas data frame, without importing pandas.

    Parameters
    ----------
    value : object
        Anything.

    Returns
    -------
    bool
        False while pandas is not loaded: then nobody can hold a data frame.
    """
    pandas = sys.modules.get("pandas")
    return pandas is not None and isinstance(value, pandas.DataFrame)


def frame_matrix(frame: "pd.DataFrame", max_bad_cells: int) -> MatrixTable:
    """Return the matrix of a data frame: index and columns are the ids.

    Parameters
    ----------
    frame : pandas.DataFrame
        Numbers; columns of another kind are read cell by cell.
    max_bad_cells : int
        Largest number of non-numeric cells that are read as missing.

    Returns
    -------
    MatrixTable
        Values in float32 when every column is float32, otherwise in float64.

    Raises
    ------
    InputDataError
        When text stands in more than `max_bad_cells` cells.
    """
    where = "expression (data frame)"
    bad_cells = BadCells(where, max_bad_cells)
    rows = [as_text(name) for name in frame.index]
    columns = [as_text(name) for name in frame.columns]
    narrow = len(columns) > 0 and all(kind == np.float32 for kind in frame.dtypes)

    def note(row: int, column: int, text: str) -> None:
        bad_cells.add(rows[row], columns[column], text)

    if all(isinstance(kind, np.dtype) and kind.kind in "iuf" for kind in frame.dtypes):
        values: NDArray[Any] = frame.to_numpy(
            dtype=np.float32 if narrow else np.float64
        )
    else:
        values = np.empty(frame.shape)
        for position in range(len(columns)):
            values[:, position] = _column_numbers(
                frame.iloc[:, position], note, position
            )
    return MatrixTable(
        where, rows, columns, infinite_to_missing(values, note), bad_cells
    )


def _column_numbers(series: Any, note: Any, position: int) -> NDArray[np.float64]:
    import pandas as pd

    if pd.api.types.is_numeric_dtype(series) and not pd.api.types.is_bool_dtype(series):
        return np.asarray(series.to_numpy(dtype=np.float64, na_value=np.nan))
    values = np.empty(len(series))
    for row, cell in enumerate(series_text(series)):
        number = cell_number(cell)
        if number is None:
            note(row, position, cell)
            number = np.nan
        values[row] = number
    return values


def series_text(series: Any) -> NDArray[np.object_]:
    """Return a column of a data frame as text, missing entries as ``""``.

    Parameters
    ----------
    series : pandas.Series
        Of any kind.

    Returns
    -------
    ndarray of shape (n_rows,), object
        Whole floats are written without ``.0`` when the entire column is whole.
    """
    absent = series.isna().to_numpy()
    plain = series.astype(object).to_numpy()
    present = plain[~absent]
    # a column of floats such as 1.0 and 2.5 keeps its points
    whole = all(isinstance(v, float) and v.is_integer() for v in present)
    write = as_text if whole else str
    result = np.empty(len(plain), dtype=object)
    result[:] = ""
    result[~absent] = [write(value) for value in present]
    return result


def frame_sheet(frame: "pd.DataFrame", where: str, id_column: str) -> Sheet:
    """Return the sheet of a data frame, all as text.

    Parameters
    ----------
    frame : pandas.DataFrame
        One row for each sample or feature.
    where : str
        The argument, for messages.
    id_column : str
        The column with the ids; without it the index, or for a plain numbered
        index the first column, holds them.

    Returns
    -------
    Sheet
        Ids and columns.

    Raises
    ------
    InputDataError
        When ids are blank or repeated, or column names are repeated.
    """
    import pandas as pd

    names = [str(name) for name in frame.columns]
    numbered = isinstance(frame.index, pd.RangeIndex)
    if id_column not in names and not (numbered and names):
        return index_sheet(frame, where, id_column)
    return build_sheet(where, names, _texts(frame), id_column)


def index_sheet(frame: "pd.DataFrame", where: str, id_column: str = "(index)") -> Sheet:
    """Return the sheet of a data frame whose index holds the ids.

    Parameters
    ----------
    frame : pandas.DataFrame
        One row for each sample or feature.
    where : str
        The argument, for messages.
    id_column : str
        What to call the index in messages.

    Returns
    -------
    Sheet
        Ids and columns.

    Raises
    ------
    InputDataError
        When ids are blank or repeated, or column names are repeated.
    """
    names = [id_column, *map(str, frame.columns)]
    ids = np.array([as_text(name) for name in frame.index], dtype=object)
    return build_sheet(where, names, [ids, *_texts(frame)], id_column)


def _texts(frame: "pd.DataFrame") -> list[NDArray[np.object_]]:
    return [series_text(frame.iloc[:, place]) for place in range(frame.shape[1])]
