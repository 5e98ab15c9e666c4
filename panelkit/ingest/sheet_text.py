"""Rows of a sheet as text, from delimited text of any usual layout."""

import csv
from collections.abc import Iterator
from pathlib import Path

from panelkit.errors import InputDataError
from panelkit.ingest.cells import is_missing
from panelkit.ingest.decimal_mark import DecimalMark, with_point
from panelkit.ingest.text_layout import (
    Layout,
    SkippedLines,
    find_layout,
    is_comment,
    sample_of,
)
from panelkit.ingest.text_lines import Lines, read_lines
from panelkit.ingest.wording import quoted
from panelkit.records import Finding

__all__ = ["read_rows"]

Rows = list[list[str]]


def read_rows(
    path: Path, id_column: str
) -> tuple[list[str], Rows, tuple[Finding, ...]]:
    """Return header and rows of a sheet, and what was noticed about the file.

    Parameters
    ----------
    path : Path
        Plain or compressed text with a header line.
    id_column : str
        The usual name of the column with the ids; given to a column of row names
        that has no header of its own.

    Returns
    -------
    header : list of str
        Column names.
    rows : list of list of str
        Each as long as the header.
    findings : tuple of Finding
        Encoding, skipped lines, decimal commas.

    Raises
    ------
    InputDataError
        When there are no rows, lines differ in length or quotes are not closed.
    """
    return read_lines(path, lambda lines: _read(lines, id_column))


def _read(lines: Lines, id_column: str) -> tuple[list[str], Rows, tuple[Finding, ...]]:
    batches = iter(lines)
    sample = sample_of(batches)
    rest = [line for _, batch in batches for line in batch]
    layout = find_layout(sample, lines.where, id_column)
    skipped = SkippedLines(lines.where)
    for line in sample[: max(layout.header, 0)]:
        if line.strip(" \t,;"):
            skipped.line(line)
    header = [id_column, *layout.names] if layout.lacks_corner else layout.names
    below = layout.header + 1
    records = list(
        _records([*sample[below:], *rest], below + 1, layout.delimiter, lines.where)
    )
    rows = _equal_rows(records, layout, header, skipped)
    if not rows:
        found = "a header only" if header else "blank lines only"
        raise InputDataError(
            code="no-data-lines",
            where=lines.where,
            what=f"there are no data lines (got {found})",
            accepted="a header line and one line for each row are needed",
            next_step="Export the sheet again",
        )
    commas = [] if layout.delimiter == "," else _points(header, rows, lines.where)
    return header, rows, (*lines.findings(), *skipped.findings(), *commas)


def _records(
    lines: list[str], number: int, delimiter: str, where: str
) -> Iterator[tuple[int, list[str]]]:
    """Yield the line number and the fields of each row; quoted ones may go on."""
    reader = csv.reader(
        (line + "\n" for line in lines), delimiter=delimiter, strict=True
    )
    while True:
        begin = number + reader.line_num
        try:
            row = next(reader, None)
        except csv.Error as error:
            raise InputDataError(
                code="quotes-unbalanced",
                where=f"{where}, line {begin}",
                what=f"a quoted field does not end where it should ({error})",
                accepted="quotes are closed and doubled inside a field",
                next_step="Correct the quotes of this line",
            ) from error
        if row is None:
            return
        if any(field.strip() for field in row):
            yield begin, row


def _equal_rows(
    records: list[tuple[int, list[str]]],
    layout: Layout,
    header: list[str],
    skipped: SkippedLines,
) -> Rows:
    width = len(header)
    rows: Rows = []
    for number, row in records:
        if len(row) != width and is_comment(row[0]):
            skipped.line(layout.delimiter.join(row))
            continue
        if len(row) > width and not any(map(str.strip, row[width:])):
            del row[width:]
            skipped.padded(1)
        if len(row) != width:
            raise InputDataError(
                code="line-length-differs",
                where=f"{skipped.where}, line {number}, data row {len(rows) + 1}",
                what=f"the row has {len(row)} fields, the header {width}",
                accepted="every row has as many fields as the header",
                next_step="Look for a missing or additional delimiter, or put fields "
                "that contain one in quotes",
            )
        rows.append(row)
    return rows


def _points(header: list[str], rows: Rows, where: str) -> list[Finding]:
    """Write decimal points into columns that hold numbers with a decimal comma."""
    changed = []
    example = ""
    for place, name in enumerate(header):
        cells = [row[place] for row in rows]
        if not any("," in cell for cell in cells):
            continue
        mark = DecimalMark(where, True)
        mark.look(cells)
        points = [with_point(cell) for cell in cells]
        if not mark.proved or not all(map(_is_number, points)):
            continue
        changed.append(name)
        example = example or mark.proved
        for row, text in zip(rows, points, strict=True):
            row[place] = str(text)
    if not changed:
        return []
    return [
        Finding(
            code="decimal-comma-read",
            severity="info",
            where=where,
            message=f"numbers are written with a decimal comma in {quoted(changed)} "
            f"and were read so: {example!r} as {example.replace(',', '.')}",
            next_step="Check that commas are decimal marks there.",
        )
    ]


def _is_number(text: str | None) -> bool:
    if text is None:
        return False
    if is_missing(text):
        return True
    try:
        float(text)
    except ValueError:
        return False
    return True
