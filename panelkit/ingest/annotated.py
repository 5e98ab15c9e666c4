"""AnnData objects and .h5ad files: the matrix, and .obs and .var as sheets."""

import sys
import warnings
from pathlib import Path
from typing import Any

import numpy as np

from panelkit.errors import InputDataError
from panelkit.ingest.cells import BadCells
from panelkit.ingest.data_frames import index_sheet
from panelkit.ingest.matrix_table import MatrixTable, infinite_to_missing
from panelkit.ingest.sheet import Sheet

__all__ = ["annotated_matrix", "annotated_sheet", "is_anndata", "read_annotated"]


def is_anndata(value: object) -> bool:
    """Return whether a value is an AnnData object, without importing anndata.

    Parameters
    ----------
    value : object
        Anything.

    Returns
    -------
    bool
        False while anndata is not loaded: then nobody can hold such an object.
    """
    anndata = sys.modules.get("anndata")
    return anndata is not None and isinstance(value, anndata.AnnData)


def read_annotated(path: Path) -> Any:
    """Return the AnnData object of an .h5ad file.

    Parameters
    ----------
    path : Path
        An HDF5 file.

    Returns
    -------
    anndata.AnnData
        In memory.

    Raises
    ------
    InputDataError
        When the file is damaged or holds no AnnData.
    """
    import anndata

    try:
        with warnings.catch_warnings():
            # repeated ids are refused below with a sentence of our own
            warnings.filterwarnings("ignore", message=".* names are not unique")
            annotated = anndata.read_h5ad(path)
    except (OSError, KeyError, ValueError, TypeError, AttributeError) as error:
        reason = (str(error) or type(error).__name__).splitlines()[0]
        raise InputDataError(
            code="wrong-file-kind",
            where=str(path),
            what=f"the HDF5 file cannot be read as AnnData ({reason[:120]})",
            accepted="an .h5ad file with X, obs and var is needed",
            next_step="Write it again with AnnData's write_h5ad",
        ) from error
    return annotated


def annotated_matrix(annotated: Any, where: str, max_bad_cells: int) -> MatrixTable:
    """Return X with samples in rows; sparse matrices are filled up.

    Parameters
    ----------
    annotated : anndata.AnnData
        The object.
    where : str
        The file or argument, for messages.
    max_bad_cells : int
        Largest number of infinite cells that are read as missing.

    Returns
    -------
    MatrixTable
        Values in the stored precision (float32 or float64); whole numbers become
        float64.

    Raises
    ------
    InputDataError
        When there is no X, X is no numbers, or too many cells are infinite.
    """
    if annotated.isbacked:
        annotated = annotated.to_memory()
    values = annotated.X
    if hasattr(values, "toarray"):
        values = values.toarray()
    if values is None or values.size == 0 or values.dtype.kind not in "iufb":
        got = "no X" if values is None else f"shape {values.shape}, {values.dtype}"
        raise InputDataError(
            code="matrix-empty",
            where=where,
            what=f"X holds no numbers (got {got})",
            accepted="X is a matrix of numbers, samples by features",
            next_step="Put the expression values into X",
        )
    narrow = values.dtype.kind == "f" and values.dtype.itemsize <= 4
    values = np.asarray(values, dtype=np.float32 if narrow else np.float64)
    rows = [str(name) for name in annotated.obs_names]
    columns = [str(name) for name in annotated.var_names]
    bad_cells = BadCells(where, max_bad_cells)

    def note(row: int, column: int, text: str) -> None:
        bad_cells.add(rows[row], columns[column], text)

    values = infinite_to_missing(values, note)
    return MatrixTable(where, rows, columns, values, bad_cells)


def annotated_sheet(annotated: Any, where: str, part: str) -> Sheet:
    """Return .obs or .var as a sheet; its index holds the ids.

    Parameters
    ----------
    annotated : anndata.AnnData
        The object.
    where : str
        The file or argument, for messages.
    part : {"obs", "var"}
        Which one.

    Returns
    -------
    Sheet
        All as text.

    Raises
    ------
    InputDataError
        When ids are blank or repeated, or column names are repeated.
    """
    return index_sheet(getattr(annotated, part), f"{where}, .{part}")
