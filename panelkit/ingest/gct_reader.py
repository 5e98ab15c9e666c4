"""GCT files, versions 1.2 and 1.3: a matrix with notes on its rows and columns.

The text format as published with GenePattern (version 1.2) and with the Connectivity
Map (version 1.3: metadata of rows in further columns, of columns in further rows).
"""

import codecs
from collections.abc import Iterator
from itertools import islice
from pathlib import Path
from typing import TypeAlias

import numpy as np
from numpy.typing import NDArray

from panelkit.errors import InputDataError
from panelkit.ingest.cells import BadCells
from panelkit.ingest.matrix_table import MatrixTable
from panelkit.ingest.number_rows import NumberRows
from panelkit.ingest.reader import OpenedMatrix, ReadOptions, refuse_oversized
from panelkit.ingest.sheet import Sheet, build_sheet
from panelkit.ingest.text_lines import Lines, read_lines

__all__ = ["GctReader"]

_TOGETHER = 100_000
"""Cells read at once, small enough to stay in the processor's cache."""
_FIRST_LINES = {"#1.2": 2, "#1.3": 4}
"""Version line to the number of dimensions that follow it."""


_RowTexts: TypeAlias = tuple[list[str], list[list[str]]]


class GctReader:
    """Reads GCT matrices; satisfies `Reader`."""

    name = "gct"
    title = "a GCT file"
    suffixes = (".gct",)
    takes: frozenset[str] = frozenset()

    def matches(self, path: Path, start: bytes) -> bool:
        """Return whether the first line is the version line of GCT."""
        wide = start.startswith((codecs.BOM_UTF16_LE, codecs.BOM_UTF16_BE))
        text = start[:40].decode("utf-16" if wide else "utf-8-sig", "replace")
        return text.partition("\n")[0].strip() in _FIRST_LINES

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
        head = read_lines(path, _Head)
        refuse_oversized(path.name, head.n_rows, head.n_columns, 8)

        noted: list[_RowTexts] = []  # so that one reading of the file is enough

        def table(max_bad_cells: int) -> MatrixTable:
            read, texts = read_lines(path, lambda lines: _table(lines, max_bad_cells))
            noted[:] = [texts]
            return read

        def row_sheet() -> Sheet | None:
            where = f"{path.name}, row metadata"
            ids, texts = noted[0] if noted else read_lines(path, _row_texts)
            return _sheet(where, head.row_names, ids, texts)

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
    lines : Lines
        Of the file; afterwards `lines` stands at the first line of the matrix.
    """

    def __init__(self, lines: Lines) -> None:
        self.where = lines.where
        self.lines = _Lines(lines)
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
        self.check_length(len(line))
        return line

    def check_length(self, n_fields: int) -> None:
        """Refuse a line of another length than line 2 says."""
        found = n_fields - self.before
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
    """Lines that are not blank, one by one, and the number of the last one."""

    def __init__(self, lines: Lines) -> None:
        self._each = (
            (number, line)
            for start, batch in lines
            for number, line in enumerate(batch, start)
            if line.strip()
        )
        self.number = 0

    def next(self) -> str | None:
        """Return the next line, None at the end."""
        self.number, line = next(self._each, (self.number, None))
        return line

    def fields(self) -> list[str] | None:
        """Return the fields of the next line, None at the end."""
        line = self.next()
        return None if line is None else _unquoted(line.split("\t"))


def _unquoted(fields: list[str]) -> list[str]:
    return [field.strip('"') for field in fields]


def _rows(head: _Head) -> Iterator[str]:
    """Yield each row's line, and hold their count against line 2."""
    found = 0
    while (line := head.lines.next()) is not None:
        found += 1
        if found <= head.n_rows:
            head.check_length(line.count("\t") + 1)
            yield line
    if found != head.n_rows:
        raise InputDataError(
            code="dimensions-differ",
            where=f"{head.where}, line 2",
            what=f"the line states {head.n_rows} rows, the file has {found}",
            accepted="the stated and the found number of rows are equal",
            next_step="Correct line 2, or copy or write the file again",
        )


def _row_texts(lines: Lines) -> _RowTexts:
    """Return row ids and row metadata, column by column."""
    head = _Head(lines)
    fields = [line.split("\t", head.before)[: head.before] for line in _rows(head)]
    ids, *texts = map(list, zip(*map(_unquoted, fields), strict=True))
    return ids, texts


def _table(lines: Lines, max_bad_cells: int) -> tuple[MatrixTable, _RowTexts]:
    head = _Head(lines)
    bad_cells = BadCells(lines.where, max_bad_cells)
    numbers = NumberRows("\t", head.column_ids, bad_cells)
    ids: list[str] = []
    texts: list[list[str]] = [[] for _ in head.row_names]
    values = np.empty((head.n_rows, head.n_columns))
    together = max(1, _TOGETHER // head.n_columns)
    rows = _rows(head)
    while batch := list(islice(rows, together)):
        parts = [line.split("\t", head.before) for line in batch]
        rests = [part.pop() for part in parts]
        names, *notes = map(list, zip(*map(_unquoted, parts), strict=True))
        if numbers.wants(rests):
            numbers.look(c.strip('"') for rest in rests for c in rest.split("\t"))
        values[len(ids) : len(ids) + len(names)] = _numbers(numbers, names, rests)
        ids += names
        for column, more in zip(texts, notes, strict=True):
            column += more
    findings = (*lines.findings(), *numbers.findings())
    table = MatrixTable(lines.where, ids, head.column_ids, values, bad_cells, findings)
    return table, (ids, texts)


def _numbers(
    numbers: NumberRows, names: list[str], rests: list[str]
) -> NDArray[np.float64]:
    plain = numbers.at_once(rests)
    if plain is not None:
        return plain
    return np.stack(
        [
            numbers.one(name, _unquoted(rest.split("\t")))
            for name, rest in zip(names, rests, strict=True)
        ]
    )
