"""Lines of a small CSV file that people write by hand: prices, conflicts."""

import csv
import io
from collections.abc import Iterator, Sequence
from pathlib import Path

from panelkit.errors import InputDataError, name_some

__all__ = ["read_header", "read_lines", "take_cells"]


def read_lines(path: str | Path) -> Iterator[tuple[int, list[str]]]:
    """Return the lines that hold anything: number and stripped cells.

    Raises
    ------
    InputDataError
        The file cannot be read, or a line is no CSV.
    """
    try:
        text = Path(path).read_text(encoding="utf-8-sig")
    except (OSError, UnicodeDecodeError) as error:
        raise InputDataError(
            code="file-unreadable",
            where=str(path),
            what=f"the file cannot be read (got {error})",
            accepted="a readable CSV file in UTF-8",
            next_step="Check the path and the file",
        ) from None
    return _split_lines(text, str(path))


def _split_lines(text: str, name: str) -> Iterator[tuple[int, list[str]]]:
    reader = csv.reader(io.StringIO(text, newline=""), strict=True)
    try:
        for cells in reader:
            stripped = [cell.strip() for cell in cells]
            if any(stripped):
                yield reader.line_num, stripped
    except csv.Error as error:
        raise InputDataError(
            code="csv-unreadable",
            where=f"{name}, line {reader.line_num}",
            what=f"the line is not valid CSV (got {error})",
            accepted='cells between commas, quoted with " where they hold one',
            next_step="Correct the quotes of this line",
        ) from None


def read_header(
    lines: Iterator[tuple[int, list[str]]],
    name: str,
    needed: Sequence[str],
    known: Sequence[str],
) -> tuple[list[str], str]:
    """Return the names of the columns, and how errors name their line.

    Raises
    ------
    InputDataError
        A column is named twice or a needed one is missing.
    """
    number, header = next(lines, (1, []))
    where = f"{name}, line {number}"
    repeated = sorted({column for column in header if header.count(column) > 1})
    if repeated:
        raise InputDataError(
            code="column-repeated",
            where=where,
            what=f"a column is named twice (got {name_some(map(repr, repeated))})",
            accepted="each column once",
            next_step="Remove or rename one of them",
        )
    missing = [column for column in needed if column not in header]
    if missing:
        raise InputDataError(
            code="column-missing",
            where=where,
            what=f"column {missing[0]} is missing (got {name_some(header) or 'none'})",
            accepted=f"a comma-separated header with {' and '.join(needed)}; "
            f"known are {', '.join(known)}",
            next_step="Add the column, or separate the columns by commas",
        )
    return header, where


def take_cells(
    cells: list[str], header: Sequence[str], name: str, number: int
) -> dict[str, str]:
    """Return the cells of one line by column.

    Raises
    ------
    InputDataError
        Their number is not that of the columns.
    """
    if len(cells) != len(header):
        raise InputDataError(
            code="cells-miscounted",
            where=f"{name}, line {number}",
            what=f"the line has another number of cells than the header "
            f"(got {len(cells)})",
            accepted=f"{len(header)} cells, with a decimal point in numbers",
            next_step="Add or remove commas; quote cells that hold one",
        )
    return dict(zip(header, cells, strict=True))
