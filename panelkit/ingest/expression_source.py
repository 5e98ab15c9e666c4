"""What `read_cohort` is given as expression, samples and features, opened alike."""

import os
from collections.abc import Mapping, Sequence, Set
from dataclasses import dataclass, field
from pathlib import Path
from typing import Protocol

from panelkit.errors import UsageError
from panelkit.ingest.alignment import FeatureMajor, orient, refuse_strangers
from panelkit.ingest.annotated import is_anndata, open_object
from panelkit.ingest.cells import BadCells
from panelkit.ingest.data_frames import frame_matrix, frame_sheet, is_data_frame
from panelkit.ingest.matrix_table import Side
from panelkit.ingest.reader import OpenedMatrix, ReadOptions
from panelkit.ingest.readers import open_matrix_file, used_options
from panelkit.ingest.sheet import Sheet
from panelkit.ingest.sheet_files import read_sheet_file
from panelkit.ingest.source_file import sha256
from panelkit.records import Finding

__all__ = [
    "ExpressionSource",
    "Expressions",
    "TurnedMatrix",
    "open_expression",
    "open_sheet",
]


@dataclass(frozen=True, slots=True, eq=False)
class TurnedMatrix:
    """A matrix with features first, and what came with it.

    Attributes
    ----------
    matrix : FeatureMajor
        Its values may still be deferred.
    feature_sheet : Sheet or None
        What the data themselves say about their features.
    noted : list of Finding
        From opening and turning.
    bad_cells : tuple of BadCells
        Complete once the values were taken.
    """

    matrix: FeatureMajor
    feature_sheet: Sheet | None
    noted: list[Finding]
    bad_cells: tuple[BadCells, ...]

    def findings(self, hidden: Set[str] = frozenset()) -> list[Finding]:
        """Return all findings; to be asked for after the values were taken.

        Parameters
        ----------
        hidden : set of str
            Samples that may not be read, whose cells are not spoken of.

        Returns
        -------
        list of Finding
            Of cells, then of the rest.
        """
        cells = [
            each for bad in self.bad_cells for each in bad.without(hidden).findings()
        ]
        return [*cells, *self.noted]


class Expressions(Protocol):
    """Expression data of one source or of several."""

    @property
    def where(self) -> str:
        """The file or argument, for messages."""

    def sample_sheet(self, orientation: str) -> Sheet | None:
        """Return what the data themselves say about their samples."""

    def with_origin(
        self, sheet: Sheet | None, orientation: str, max_bad_cells: int
    ) -> Sheet | None:
        """Return the sample sheet with what the data add to it."""

    def turned(
        self, sheet: Sheet | None, own: bool, orientation: str, max_bad_cells: int
    ) -> TurnedMatrix:
        """Return the matrix with features first."""

    def refuse_strangers(
        self, sheet: Sheet, missing: Sequence[str], max_bad_cells: int
    ) -> None:
        """Refuse a sample sheet that has no id in common with the data."""

    def hashes(self) -> dict[str, str]:
        """Return the SHA-256 of each file, by its role."""


@dataclass(frozen=True, slots=True, eq=False)
class ExpressionSource:
    """Expression data of one source; satisfies `Expressions`.

    Attributes
    ----------
    where : str
        The file or argument, for messages.
    opened : OpenedMatrix
        By the reader of its format.
    files : mapping of str to Path
        Role to file; empty for objects in memory.
    """

    where: str
    opened: OpenedMatrix
    files: Mapping[str, Path] = field(default_factory=dict)

    def sample_sheet(self, orientation: str) -> Sheet | None:
        """Return what the data themselves say about their samples.

        Parameters
        ----------
        orientation : {"auto", "samples-in-rows", "features-in-rows"}
            Which way round the matrix is.

        Returns
        -------
        Sheet or None
            All as text.

        Raises
        ------
        UsageError
            When AnnData are to be turned against their own .obs.
        InputDataError
            When its ids are blank or repeated.
        """
        if self.opened.fixed and orientation == "features-in-rows":
            raise UsageError(
                code="orientation-fixed",
                where="orientation",
                what="AnnData has samples in rows (got 'features-in-rows')",
                accepted="'auto' and 'samples-in-rows' are accepted for AnnData "
                "without a sample sheet of its own",
                next_step="Transpose the object first if its .obs describes features",
            )
        side = self._side(orientation)
        return None if side is None else self.opened.sheet(side)

    def _side(self, orientation: str) -> Side | None:
        """Return where the samples are when no sheet tells."""
        if orientation == "auto":
            return self.opened.samples_on
        return "rows" if orientation == "samples-in-rows" else "columns"

    def with_origin(
        self, sheet: Sheet | None, orientation: str, max_bad_cells: int
    ) -> Sheet | None:
        """Return the sample sheet as it is: one source adds nothing.

        Parameters
        ----------
        sheet : Sheet or None
            As given, or as the data brought it.
        orientation : str
            Not needed here.
        max_bad_cells : int
            Not needed here.

        Returns
        -------
        Sheet or None
            The same.
        """
        return sheet

    def turned(
        self, sheet: Sheet | None, own: bool, orientation: str, max_bad_cells: int
    ) -> TurnedMatrix:
        """Return the matrix with features first.

        Parameters
        ----------
        sheet : Sheet or None
            The sample sheet.
        own : bool
            Whether it came with the data, or there is none.
        orientation : {"auto", "samples-in-rows", "features-in-rows"}
            "auto" goes by a sheet of its own, else by the format.
        max_bad_cells : int
            Largest number of non-numeric cells that are read as missing.

        Returns
        -------
        TurnedMatrix
            Ids checked.

        Raises
        ------
        InputDataError
            When the data cannot be read as a matrix, or no id or ids on both sides
            are known to the sheet.
        """
        table = self.opened.table(max_bad_cells)
        if own and orientation == "auto" and self.opened.samples_on is not None:
            orientation = f"{_INSIDE[self.opened.samples_on]}-in-rows"
        matrix, findings = orient(table, sheet, orientation)
        in_rows = matrix.features is table.column_ids
        return TurnedMatrix(
            matrix,
            self.opened.sheet("columns" if in_rows else "rows"),
            [*table.findings, *findings],
            (table.bad_cells,),
        )

    def refuse_strangers(
        self, sheet: Sheet, missing: Sequence[str], max_bad_cells: int
    ) -> None:
        """Refuse a sample sheet that has no id in common with the data.

        Parameters
        ----------
        sheet : Sheet
            The sample sheet.
        missing : sequence of str
            Columns that it does not have either.
        max_bad_cells : int
            Largest number of non-numeric cells that are read as missing.

        Raises
        ------
        InputDataError
            When it seems to belong to another study.
        """
        refuse_strangers(self.opened.table(max_bad_cells), sheet, missing)

    def hashes(self) -> dict[str, str]:
        """Return the SHA-256 of each file, by its role."""
        return {role: sha256(path) for role, path in self.files.items()}


_INSIDE: Mapping[Side, str] = {"rows": "samples", "columns": "features"}


def open_expression(expression: object, options: ReadOptions) -> ExpressionSource:
    """Return the expression data opened by the reader of their format.

    Parameters
    ----------
    expression : path, AnnData or pandas.DataFrame
        As handed to `read_cohort`.
    options : ReadOptions
        What the caller says beside it.

    Returns
    -------
    ExpressionSource
        Ready to be read.

    Raises
    ------
    UsageError
        When it is something else, or options mean nothing to it.
    InputDataError
        When the file is missing, empty or cannot be read.
    """
    if is_anndata(expression):
        used_options(options, {"layer"}, "expression", "an AnnData object")
        opened = open_object(expression, options.layer)
        return ExpressionSource(opened.where, opened)
    if is_data_frame(expression):
        used_options(options, set(), "expression", "a data frame")
        where, frame = "expression (data frame)", expression
        opened = OpenedMatrix(where, lambda limit: frame_matrix(frame, limit))
        return ExpressionSource(where, opened)
    if not isinstance(expression, str | os.PathLike):
        raise UsageError(
            code="expression-not-understood",
            where="expression",
            what=f"this is a {type(expression).__name__}",
            accepted="a path, an AnnData object or a pandas data frame (samples by "
            "features, index of sample ids) is needed, or a list of them",
            next_step="Pass one of these",
        )
    path = Path(expression)
    opened = open_matrix_file(path, options)
    files = {"expression": path}
    for part, beside in opened.files.items():
        files[f"expression-{part}"] = beside
    return ExpressionSource(path.name, opened, files)


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
    return read_sheet_file(path, id_column), sha256(path)
