"""Expression matrices from delimited text: fast where lines are clean, exact always."""

import math
from collections.abc import Iterator
from itertools import chain
from pathlib import Path

import numpy as np
from numpy.typing import NDArray

from panelkit.errors import InputDataError
from panelkit.ingest.cells import BadCells, cell_number
from panelkit.ingest.decimal_mark import DecimalMark, with_point
from panelkit.ingest.matrix_table import MatrixTable
from panelkit.ingest.number_lines import GrowingMatrix, PlainReader, unquoted
from panelkit.ingest.text_layout import (
    MOST_FIELDS,
    Layout,
    SkippedLines,
    find_layout,
    is_blank,
    is_comment,
    sample_of,
    split_quoted,
)
from panelkit.ingest.text_lines import Lines, read_lines

__all__ = ["read_delimited_matrix"]


def read_delimited_matrix(path: Path, max_bad_cells: int) -> MatrixTable:
    """Return the matrix of a CSV or TSV file: one header line, ids first in each line.

    Parameters
    ----------
    path : Path
        Plain or compressed text.
    max_bad_cells : int
        Largest number of non-numeric cells that are read as missing.

    Returns
    -------
    MatrixTable
        Values in float64, rows and columns as in the file; every one is what
        ``float()`` makes of its cell.

    Raises
    ------
    InputDataError
        When the file has no data, lines differ in length, a quoted field is not
        closed, or text stands in more than `max_bad_cells` cells.
    """
    return read_lines(path, lambda lines: _read(lines, max_bad_cells))


def _read(lines: Lines, max_bad_cells: int) -> MatrixTable:
    where = lines.where
    batches = iter(lines)
    sample = sample_of(batches)
    layout = find_layout(sample, where)
    skipped = SkippedLines(where)
    for line in sample[: max(layout.header, 0)]:
        if line.strip(" \t,;"):
            skipped.line(line)
    columns = _column_ids(layout, sample, where)
    first = layout.header + 1
    expected = _expected_rows(lines, sample[first:])
    body = _Body(layout, columns, BadCells(where, max_bad_cells), skipped, expected)
    for number, batch in chain([(first + 1, sample[first:])], batches):
        body.take(number, batch)
    return body.table(lines)


def _expected_rows(lines: Lines, sample: list[str]) -> int:
    """Return about how many rows a plain file has; 0 for a compressed one."""
    if lines.compressed:
        return 0
    characters = sum(map(len, sample)) + len(sample)
    return math.ceil(1.01 * lines.path.stat().st_size * len(sample) / characters)


def _column_ids(layout: Layout, sample: list[str], where: str) -> list[str]:
    """Return the header's ids; some programs leave out the field above the row ids."""
    if layout.header < 0:
        kind = "comment" if any(map(is_comment, sample)) else "blank"
        raise _no_data(where, f"{kind} lines only")
    if all(is_blank(line, layout.delimiter) for line in sample[layout.header + 1 :]):
        raise _no_data(where, "a header only")
    if '"' in sample[layout.header]:
        split_quoted(
            sample[layout.header],
            layout.delimiter,
            f"{where}, line {layout.header + 1}",
        )
    columns = layout.names if layout.lacks_corner else layout.names[1:]
    if not columns:
        raise InputDataError(
            code="one-column-only",
            where=where,
            what=f"only one column was found (header {layout.names[0][:40]!r})",
            accepted="an id column and columns of numbers, separated by comma, tab or "
            "semicolon, are needed",
            next_step="Export the matrix with one of these delimiters",
        )
    return columns


def _no_data(where: str, found: str) -> InputDataError:
    return InputDataError(
        code="no-data-lines",
        where=where,
        what=f"there are no data lines (got {found})",
        accepted="a header line and one line for each row are needed",
        next_step="Export the matrix again",
    )


class _Body:
    """The lines below the header, read batch by batch."""

    def __init__(
        self,
        layout: Layout,
        columns: list[str],
        bad_cells: BadCells,
        skipped: SkippedLines,
        expected: int,
    ) -> None:
        self._delimiter = layout.delimiter
        self._padding = layout.delimiter * layout.trailing
        self._columns = columns
        self._bad_cells = bad_cells
        self._skipped = skipped
        self._plain = PlainReader(layout.delimiter, len(columns))
        self._mark = DecimalMark(bad_cells.where, layout.delimiter != ",")
        self._names: list[str] = []
        self._matrix = GrowingMatrix(len(columns), expected)

    def take(self, number: int, lines: list[str]) -> None:
        """Read a batch of lines; `number` is that of its first."""
        delimiter = self._delimiter
        kept = [
            (place, line)
            for place, line in enumerate(lines, number)
            if not is_blank(line, delimiter)
        ]
        if not kept:
            return
        if self._mark.watching and any("," in line or "." in line for _, line in kept):
            self._mark.look(self._cells(kept))
        if not self._take_plain([line for _, line in kept]):
            for place, line in kept:
                self._take_line(place, line)

    def _cells(self, lines: list[tuple[int, str]]) -> Iterator[str]:
        for _, line in lines:
            _, _, rest = line.partition(self._delimiter)
            for cell in rest.split(self._delimiter):
                yield cell.strip('"')

    def _take_plain(self, lines: list[str]) -> bool:
        """Read lines at once if all of them are plain; otherwise take none."""
        delimiter, width, padding = self._delimiter, len(self._columns), self._padding
        names, rests = [], []
        for line in lines:
            if '"' in line and line[0] == '"':
                end = line.find('"' + delimiter, 1)
                if end < 0 or '"' in line[1:end]:
                    return False
                name, rest = line[1:end], line[end + 2 :]
            else:
                name, _, rest = line.partition(delimiter)
            if padding:
                if not rest.endswith(padding):
                    return False
                rest = rest[: -len(padding)]
            plain = unquoted(rest, delimiter, width) if '"' in rest else rest
            if plain is None or '"' in name:
                return False
            names.append(name)
            rests.append(plain)
        values = self._plain.numbers(rests, self._mark.comma)
        if values is None:
            return False
        self._names += names
        self._matrix.add(values)
        if padding:
            self._skipped.padded(len(names))
        return True

    def _take_line(self, number: int, line: str) -> None:
        where = f"{self._bad_cells.where}, line {number}"
        width = len(self._columns) + 1
        if '"' in line:
            fields = split_quoted(line, self._delimiter, where)
        else:
            found = line.count(self._delimiter) + 1
            if found > MOST_FIELDS:
                raise _ragged(where, found, width)
            fields = line.split(self._delimiter)
        if len(fields) != width and is_comment(line):
            self._skipped.line(line)
            return
        if len(fields) > width and not any(map(str.strip, fields[width:])):
            del fields[width:]
            self._skipped.padded(1)
        if len(fields) != width:
            raise _ragged(where, len(fields), width)
        self._names.append(fields[0])
        self._matrix.add(self._numbers(fields[0], fields[1:])[None, :])

    def _numbers(self, name: str, cells: list[str]) -> NDArray[np.float64]:
        """Return one line's numbers, cell by cell."""
        values = self._plain.numbers([self._delimiter.join(cells)], self._mark.comma)
        if values is not None:
            return values.reshape(-1)
        result = np.empty(len(cells))
        comma = self._mark.comma
        for position, cell in enumerate(cells):
            text = with_point(cell) if comma else cell
            value = None if text is None else cell_number(text)
            if value is None:
                self._bad_cells.add(name, self._columns[position], cell)
                value = math.nan
            result[position] = value
        return result

    def table(self, lines: Lines) -> MatrixTable:
        """Return the matrix and what was noticed, after the last batch."""
        if not self._names:
            raise _no_data(lines.where, "a header only")
        findings = (
            *lines.findings(),
            *self._skipped.findings(),
            *self._mark.findings(),
        )
        return MatrixTable(
            lines.where,
            self._names,
            self._columns,
            self._matrix.whole(),
            self._bad_cells,
            findings,
        )


def _ragged(where: str, found: int, wanted: int) -> InputDataError:
    return InputDataError(
        code="line-length-differs",
        where=where,
        what=f"the line has {found} fields, the lines before it {wanted}",
        accepted="every line has the same number of fields",
        next_step="Look for a missing or additional delimiter, or a file cut short",
    )
