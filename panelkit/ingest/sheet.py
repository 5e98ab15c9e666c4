"""Sheets: one row for each sample or feature, every column as text."""

import csv
from collections import Counter
from collections.abc import Mapping
from dataclasses import dataclass
from pathlib import Path

import numpy as np
from numpy.typing import NDArray

from panelkit.errors import InputDataError
from panelkit.ingest.source_file import file_kind, open_text, sniff_delimiter
from panelkit.ingest.wording import nearest_hint, quoted

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
    """

    where: str
    ids: Text
    columns: Mapping[str, Text]

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
    header, texts = read_columns(path, id_column)
    return build_sheet(path.name, header, texts, id_column)


def read_columns(path: Path, id_column: str) -> tuple[list[str], list[Text]]:
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
            accepted="sheets are CSV or TSV in UTF-8 (plain or .gz)",
            next_step="Save the sheet in one of these formats",
        )
    header, rows = _read_rows(path)
    if len(rows[0]) == len(header) + 1 and id_column not in header:
        header = [id_column, *header]  # row names without a header of their own
    for number, row in enumerate(rows, 1):
        if len(row) != len(header):
            raise InputDataError(
                code="line-length-differs",
                where=f"{path.name}, data row {number}",
                what=f"the row has {len(row)} fields, the header {len(header)}",
                accepted="every row has as many fields as the header",
                next_step="Look for a missing or additional delimiter, or put fields "
                "that contain one in quotes",
            )
    texts = list(np.array(rows, dtype=object).reshape(len(rows), len(header)).T)
    return header, texts


def _read_rows(path: Path) -> tuple[list[str], list[list[str]]]:
    delimiter = sniff_delimiter(path)
    with open_text(path, newline="") as text:
        reader = csv.reader(text, delimiter=delimiter, strict=True)
        try:
            lines = [row for row in reader if any(field.strip() for field in row)]
        except csv.Error as error:
            raise InputDataError(
                code="quotes-unbalanced",
                where=f"{path.name}, line {reader.line_num}",
                what=f"a quoted field does not end where it should ({error})",
                accepted="quotes are closed and doubled inside a field",
                next_step="Correct the quotes of this line",
            ) from error
    if len(lines) < 2:
        raise InputDataError(
            code="no-data-lines",
            where=str(path),
            what=f"there are no data lines (got {len(lines)} lines in all)",
            accepted="a header line and one line for each row are needed",
            next_step="Export the sheet again",
        )
    return lines[0], lines[1:]


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
