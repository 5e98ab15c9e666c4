"""What `read_cohort` is given as expression, samples and features, opened alike."""

import os
from dataclasses import dataclass
from pathlib import Path
from typing import Any

from panelkit.errors import UsageError
from panelkit.ingest.annotated import (
    annotated_matrix,
    annotated_sheet,
    is_anndata,
    read_annotated,
)
from panelkit.ingest.data_frames import frame_matrix, frame_sheet, is_data_frame
from panelkit.ingest.delimited import read_delimited_matrix
from panelkit.ingest.matrix_table import MatrixTable
from panelkit.ingest.sheet import Sheet, read_sheet
from panelkit.ingest.source_file import file_kind, sha256

__all__ = ["ExpressionSource", "open_expression", "open_sheet"]


@dataclass(frozen=True, slots=True, eq=False)
class ExpressionSource:
    """Expression data that can be read.

    Attributes
    ----------
    where : str
        The file or argument, for messages.
    path : Path or None
        Of the file, when it is one.
    annotated : AnnData or None
        Loaded, when the data are of that kind.
    frame : pandas.DataFrame or None
        When one was handed over.
    """

    where: str
    path: Path | None = None
    annotated: Any = None
    frame: Any = None

    def matrix(self, max_bad_cells: int) -> MatrixTable:
        """Return the matrix as it stands.

        Parameters
        ----------
        max_bad_cells : int
            Largest number of non-numeric cells that are read as missing.

        Returns
        -------
        MatrixTable
            Which way round it is, is not decided here.

        Raises
        ------
        InputDataError
            When the data cannot be read as a matrix.
        """
        if self.annotated is not None:
            return annotated_matrix(self.annotated, self.where, max_bad_cells)
        if self.frame is not None:
            return frame_matrix(self.frame, max_bad_cells)
        assert self.path is not None  # the third and last kind
        return read_delimited_matrix(self.path, max_bad_cells)

    def own_sheet(self, part: str) -> Sheet | None:
        """Return .obs or .var of annotated data, None for other kinds.

        Parameters
        ----------
        part : {"obs", "var"}
            Which one.

        Returns
        -------
        Sheet or None
            All as text.

        Raises
        ------
        InputDataError
            When its ids are blank or repeated.
        """
        if self.annotated is None:
            return None
        return annotated_sheet(self.annotated, self.where, part)


def open_expression(expression: object) -> ExpressionSource:
    """Return the expression data, with .h5ad files loaded and text files found.

    Parameters
    ----------
    expression : path, AnnData or pandas.DataFrame
        As handed to `read_cohort`.

    Returns
    -------
    ExpressionSource
        Ready to be read.

    Raises
    ------
    UsageError
        When it is something else.
    InputDataError
        When the file is missing, empty or of another kind.
    """
    if is_anndata(expression):
        return ExpressionSource("expression (AnnData)", annotated=expression)
    if is_data_frame(expression):
        return ExpressionSource("expression (data frame)", frame=expression)
    if not isinstance(expression, str | os.PathLike):
        raise UsageError(
            code="expression-not-understood",
            where="expression",
            what=f"this is a {type(expression).__name__}",
            accepted="a path, an AnnData object or a pandas data frame (samples by "
            "features, index of sample ids) is needed",
            next_step="Pass one of these",
        )
    path = Path(expression)
    if file_kind(path) == "hdf5":
        return ExpressionSource(path.name, path, annotated=read_annotated(path))
    return ExpressionSource(path.name, path)


def open_sheet(sheet: object, role: str, id_column: str) -> tuple[Sheet, str | None]:
    """Return a sample sheet or feature sheet, and the hash of its file.

    Parameters
    ----------
    sheet : path or pandas.DataFrame
        As handed to `read_cohort`.
    role : str
        The argument's name.
    id_column : str
        Name of the id column, if it is not the first one.

    Returns
    -------
    sheet : Sheet
        All as text.
    sha256 : str or None
        None for a data frame.

    Raises
    ------
    UsageError
        When it is something else.
    InputDataError
        When the sheet cannot be read.
    """
    if is_data_frame(sheet):
        return frame_sheet(sheet, f"{role} (data frame)", id_column), None
    if not isinstance(sheet, str | os.PathLike):
        raise UsageError(
            code="sheet-not-understood",
            where=role,
            what=f"this is a {type(sheet).__name__}",
            accepted="a path or a pandas data frame is needed",
            next_step="Pass one of these",
        )
    path = Path(sheet)
    return read_sheet(path, id_column), sha256(path)
