"""Sheets: one row for each sample or feature, every column as text."""

from collections import Counter
from collections.abc import Mapping
from dataclasses import dataclass, replace
from pathlib import Path

import numpy as np
from numpy.typing import NDArray

from panelkit.errors import InputDataError
from panelkit.ingest.sheet_text import read_rows
from panelkit.ingest.source_file import file_kind
from panelkit.ingest.wording import nearest_hint, quoted
from panelkit.records import Finding

__all__ = ["Sheet", "Text", "build_sheet", "read_columns", "read_sheet"]

Text = NDArray[np.object_]


@dataclass(frozen=True, slots=True, eq=False)
class Sheet:
    """Ids and columns of a sample sheet or a feature sheet.

    Attributes
    ----------
    where : str
        The file or argument, for messages.
    ids : ndarray of shape (n_rows,), object
        As written, unique.
    columns : mapping of str to ndarray of shape (n_rows,), object
        The other columns, as text.
    findings : tuple of Finding
        What was noticed about the file itself.
    """

    where: str
    ids: Text
    columns: Mapping[str, Text]
    findings: tuple[Finding, ...] = ()

    def column(self, name: str, role: str) -> Text:
        """Return one column.

        Parameters
        ----------
        name : str
            Its name.
        role : str
            What it was asked for, for the message.

        Returns
        -------
        ndarray of shape (n_rows,), object
            As written.

        Raises
        ------
        InputDataError
            When there is no such column.
        """
        if name not in self.columns:
            known = list(self.columns)
            raise InputDataError(
                code="unknown-column",
                where=f"{self.where}, {role}",
                what=f"there is no column {name!r}",
                accepted=f"{nearest_hint(name, known)}the columns are "
                f"{quoted(known, 20) if known else 'none beside the ids'}",
                next_step="Name one of these columns",
            )
        return self.columns[name]


def read_sheet(path: Path, id_column: str) -> Sheet:
    """Return the sheet of a CSV or TSV file, all as text.

    Parameters
    ----------
    path : Path
        Plain or compressed text with a header line.
    id_column : str
        The column with the ids; the first column when there is none of that name.

    Returns
    -------
    Sheet
        Ids and columns.

    Raises
    ------
    InputDataError
        When the file is no text, has no rows, lines differ in length, ids are blank
        or repeated, or column names are repeated.
    """
    header, texts, findings = read_columns(path, id_column)
    return replace(build_sheet(path.name, header, texts, id_column), findings=findings)


def read_columns(
    path: Path, id_column: str
) -> tuple[list[str], list[Text], tuple[Finding, ...]]:
    """Return the columns of a CSV or TSV file, all as text, no id looked at.

    Parameters
    ----------
    path : Path
        Plain or compressed text with a header line.
    id_column : str
        Name of a first column that the header leaves out.

    Returns
    -------
    names : list of str
        Column names.
    texts : list of ndarray of shape (n_rows,), object
        Their content.
    findings : tuple of Finding
        What was noticed about the file itself.

    Raises
    ------
    InputDataError
        When the file is no text, has no rows, or lines differ in length.
    """
    if file_kind(path) != "delimited":
        raise InputDataError(
            code="wrong-file-kind",
            where=str(path),
            what="the file is an HDF5 file",
            accepted="sheets are CSV or TSV (plain, .gz, .bz2, .xz or .zst)",
            next_step="Save the sheet in one of these formats",
        )
    header, rows, findings = read_rows(path, id_column)
    texts = list(np.array(rows, dtype=object).reshape(len(rows), len(header)).T)
    return header, texts, findings


def build_sheet(
    where: str, names: list[str], texts: list[Text], id_column: str
) -> Sheet:
    """Return a sheet after its ids and column names have been checked.

    Parameters
    ----------
    where : str
        The file or argument, for messages.
    names : list of str
        Column names.
    texts : list of ndarray of shape (n_rows,), object
        Their content as text.
    id_column : str
        The column with the ids; the first column when there is none of that name.

    Returns
    -------
    Sheet
        Ids and the other columns.

    Raises
    ------
    InputDataError
        When ids are blank or repeated, or column names are repeated.
    """
    repeated = [name for name, count in Counter(names).items() if count > 1]
    if repeated:
        raise InputDataError(
            code="repeated-columns",
            where=where,
            what=f"column names occur more than once: {quoted(repeated)}",
            accepted="every column has a name of its own",
            next_step="Rename or remove the repeated columns",
        )
    position = names.index(id_column) if id_column in names else 0
    ids = texts[position]
    _check_ids(ids, where, names[position])
    columns = {
        name: text
        for number, (name, text) in enumerate(zip(names, texts, strict=True))
        if number != position
    }
    return Sheet(where, ids, columns)


def _check_ids(ids: Text, where: str, column: str) -> None:
    blank = [number + 1 for number, name in enumerate(ids) if not name.strip()]
    if blank:
        raise InputDataError(
            code="blank-id",
            where=f"{where}, column {column!r}",
            what=f"{len(blank)} ids are blank (data rows {quoted(blank)})",
            accepted="every row has an id",
            next_step="Fill in the ids or remove these rows",
        )
    repeated = [name for name, count in Counter(ids).items() if count > 1]
    if repeated:
        raise InputDataError(
            code="repeated-ids",
            where=f"{where}, column {column!r}",
            what=f"{len(repeated)} ids occur more than once: {quoted(repeated)}",
            accepted="every row has an id of its own",
            next_step="Remove the repeated rows, or give repeated measurements ids of "
            "their own and name the person in a subject column",
        )
