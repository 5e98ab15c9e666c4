"""GCT files, versions 1.2 and 1.3: a matrix with notes on its rows and columns.

The text format as published with GenePattern (version 1.2) and with the Connectivity
Map (version 1.3: metadata of rows in further columns, of columns in further rows).
"""

from collections.abc import Iterator
from pathlib import Path
from typing import TextIO

import numpy as np
from numpy.typing import NDArray

from panelkit.errors import InputDataError
from panelkit.ingest.cells import BadCells, cell_number
from panelkit.ingest.matrix_table import MatrixTable, Note, cell_notes
from panelkit.ingest.reader import OpenedMatrix, ReadOptions, refuse_oversized
from panelkit.ingest.sheet import Sheet, build_sheet
from panelkit.ingest.source_file import open_text

__all__ = ["GctReader"]

_FIRST_LINES = {"#1.2": 2, "#1.3": 4}
"""Version line to the number of dimensions that follow it."""


class GctReader:
    """Reads GCT matrices; satisfies `Reader`."""

    name = "gct"
    title = "a GCT file"
    suffixes = (".gct",)
    takes: frozenset[str] = frozenset()

    def matches(self, path: Path, start: bytes) -> bool:
        """Return whether the first line is the version line of GCT."""
        first = start.removeprefix(b"\xef\xbb\xbf").split(b"\n", 1)[0]
        return first.strip().decode("latin-1") in _FIRST_LINES

    def read(self, path: Path, options: ReadOptions) -> OpenedMatrix:
        """Return the file opened: its head and its row metadata.

        Parameters
        ----------
        path : Path
            Plain or compressed text.
        options : ReadOptions
            None of them concerns GCT.

        Returns
        -------
        OpenedMatrix
            Samples on columns, as the format has them.

        Raises
        ------
        InputDataError
            When dimensions and content differ, or lines differ in length.
        """
        with open_text(path) as text:
            head = _Head(path.name, text)
        refuse_oversized(path.name, head.n_rows, head.n_columns, 8)

        def table(max_bad_cells: int) -> MatrixTable:
            return _table(path, max_bad_cells)

        def row_sheet() -> Sheet | None:
            where = f"{path.name}, row metadata"
            return _sheet(where, head.row_names, *_row_texts(path))

        def column_sheet() -> Sheet | None:
            where = f"{path.name}, column metadata"
            return _sheet(where, head.column_names, head.column_ids, head.column_texts)

        return OpenedMatrix(path.name, table, "columns", row_sheet, column_sheet)


def _sheet(
    where: str, names: list[str], ids: list[str], texts: list[list[str]]
) -> Sheet | None:
    if not names:
        return None
    columns = [np.array(column, dtype=object) for column in (ids, *texts)]
    return build_sheet(where, ["id", *names], columns, "id")


class _Head:
    """The lines above the matrix.

    Parameters
    ----------
    where : str
        The file, for messages.
    text : TextIO
        At its first line; afterwards at the first line of the matrix.
    """

    def __init__(self, where: str, text: TextIO) -> None:
        self.where = where
        self.lines = _Lines(text)
        self.version = (self.lines.fields() or [""])[0].strip()
        sizes = self._sizes(_FIRST_LINES[self.version])
        self.n_rows, self.n_columns = sizes[:2]
        if self.version == "#1.2":
            # the second column is a description by definition
            n_row_names, n_column_names = 1, 0
        else:
            n_row_names, n_column_names = sizes[2:]
        self.before = 1 + n_row_names
        header = self._line("a header line")
        self.row_names = header[1 : self.before]
        self.column_ids = header[self.before :]
        self.column_names: list[str] = []
        self.column_texts: list[list[str]] = []
        for _ in range(n_column_names):
            line = self._line(f"{n_column_names} lines of column metadata")
            self.column_names.append(line[0])
            self.column_texts.append(line[self.before :])

    def _sizes(self, count: int) -> list[int]:
        fields = [field for field in self.lines.fields() or () if field.strip()]
        if len(fields) < count or not all(
            f.strip().isdecimal() for f in fields[:count]
        ):
            raise InputDataError(
                code="dimensions-unreadable",
                where=f"{self.where}, line 2",
                what=f"the line does not state the dimensions (got "
                f"{' '.join(fields)[:60]!r})",
                accepted=f"{count} whole numbers, separated by tabs, are needed "
                f"({'rows and columns' if count == 2 else _SIZES_13})",
                next_step="Write the file again",
            )
        sizes = [int(field) for field in fields[:count]]
        if not sizes[0] or not sizes[1]:
            raise InputDataError(
                code="matrix-empty",
                where=f"{self.where}, line 2",
                what=f"there are no numbers (got {sizes[0]} rows and {sizes[1]} "
                "columns)",
                accepted="at least one row and one column are needed",
                next_step="Write the file again",
            )
        return sizes

    def _line(self, wanted: str) -> list[str]:
        """Return the next line; it must be as long as line 2 says."""
        line = self.lines.fields()
        if line is None:
            raise InputDataError(
                code="dimensions-differ",
                where=self.where,
                what=f"the file ends after line {self.lines.number}",
                accepted=f"{wanted} and {self.n_rows} rows should follow, as line 2 "
                "says",
                next_step="Copy or write the file again",
            )
        self.check_length(line)
        return line

    def check_length(self, line: list[str]) -> None:
        """Refuse a line of another length than line 2 says."""
        found = len(line) - self.before
        if found != self.n_columns:
            raise InputDataError(
                code="dimensions-differ",
                where=f"{self.where}, line {self.lines.number}",
                what=f"line 2 states {self.n_columns} columns, this line has {found} "
                f"after its {self.before} first fields",
                accepted="the stated and the found number of columns are equal",
                next_step="Correct line 2, or write the file again",
            )


_SIZES_13 = "rows, columns, row metadata, column metadata"


class _Lines:
    """Fields of the lines that are not blank, and the number of the last one."""

    def __init__(self, text: TextIO) -> None:
        self.text = text
        self.number = 0

    def fields(self) -> list[str] | None:
        """Return the fields of the next line, None at the end."""
        for raw in self.text:
            self.number += 1
            line = raw.rstrip("\r\n")
            if line.strip():
                return [field.strip('"') for field in line.split("\t")]
        return None


def _rows(head: _Head) -> Iterator[tuple[int, list[str]]]:
    """Yield each row's number and fields, and hold their count against line 2."""
    found = 0
    while (line := head.lines.fields()) is not None:
        found += 1
        if found <= head.n_rows:
            head.check_length(line)
            yield found - 1, line
    if found != head.n_rows:
        raise InputDataError(
            code="dimensions-differ",
            where=f"{head.where}, line 2",
            what=f"the line states {head.n_rows} rows, the file has {found}",
            accepted="the stated and the found number of rows are equal",
            next_step="Correct line 2, or copy or write the file again",
        )


def _row_texts(path: Path) -> tuple[list[str], list[list[str]]]:
    """Return row ids and row metadata, column by column."""
    with open_text(path) as text:
        head = _Head(path.name, text)
        ids: list[str] = []
        texts: list[list[str]] = [[] for _ in head.row_names]
        for _, line in _rows(head):
            ids.append(line[0])
            for column, field in zip(texts, line[1 : head.before], strict=True):
                column.append(field)
    return ids, texts


def _table(path: Path, max_bad_cells: int) -> MatrixTable:
    bad_cells = BadCells(path.name, max_bad_cells)
    with open_text(path) as text:
        head = _Head(path.name, text)
        ids: list[str] = []
        note = cell_notes(bad_cells, ids, head.column_ids)
        values = np.empty((head.n_rows, head.n_columns))
        for row, line in _rows(head):
            ids.append(line[0])
            cells = line[head.before :]
            quick = _all_numbers(cells)
            values[row] = _each_number(cells, row, note) if quick is None else quick
    return MatrixTable(path.name, ids, head.column_ids, values, bad_cells)


def _all_numbers(cells: list[str]) -> NDArray[np.float64] | None:
    """Return the numbers of clean cells, None where a cell needs a closer look."""
    try:
        values = np.fromiter(map(float, cells), np.float64, len(cells))
    except ValueError:
        return None
    text = "".join(cells)
    # float() would take 1_000 and digits of other scripts
    clean = "_" not in text and text.isascii() and not np.isinf(values).any()
    return values if clean else None


def _each_number(cells: list[str], row: int, note: Note) -> NDArray[np.float64]:
    values = np.empty(len(cells))
    for column, cell in enumerate(cells):
        number = cell_number(cell)
        if number is None:
            note(row, column, cell)
            number = np.nan
        values[column] = number
    return values
