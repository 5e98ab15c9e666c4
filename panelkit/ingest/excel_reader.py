"""Excel workbooks (.xlsx): one sheet as a matrix or as text, read row by row."""

import datetime
import re
import warnings
import zipfile
from collections.abc import Iterator
from contextlib import contextmanager
from pathlib import Path
from typing import Any

import numpy as np
from numpy.typing import NDArray

from panelkit.errors import InputDataError, UsageError, name_some
from panelkit.ingest.cells import LARGEST, BadCells, cell_number
from panelkit.ingest.matrix_table import MatrixTable
from panelkit.ingest.reader import OpenedMatrix, ReadOptions, refuse_unreadable
from panelkit.ingest.wording import as_text, counted, nearest_hint, quoted
from panelkit.records import Finding

__all__ = ["ExcelReader", "read_texts"]

_MOST_BYTES = 2 * 2**30
"""Of all members of a workbook together, unpacked."""
_MOST_ROWS = 2**20
"""Of a worksheet, by the format; a damaged file may name a row beyond counting."""
_BLANK = (None, "")
_DATES = (datetime.datetime, datetime.date, datetime.time, datetime.timedelta)
_FORMULA = re.compile(rb"<f[ >/]")


class ExcelReader:
    """Reads Excel workbooks through openpyxl; satisfies `Reader`."""

    name = "excel"
    title = "an Excel workbook (.xlsx)"
    suffixes = (".xlsx", ".xlsm")
    takes = frozenset({"sheet"})

    def matches(self, path: Path, start: bytes) -> bool:
        """Return whether the file is a zip archive, as workbooks are."""
        return start.startswith(b"PK\x03\x04")

    def read(self, path: Path, options: ReadOptions) -> OpenedMatrix:
        """Return the workbook opened: checked for what it would unpack to.

        Parameters
        ----------
        path : Path
            The file.
        options : ReadOptions
            May name the sheet.

        Returns
        -------
        OpenedMatrix
            Ready to be read.

        Raises
        ------
        UsageError
            When openpyxl is not installed.
        InputDataError
            When the archive is no workbook or would fill the memory.
        """
        _refuse_missing_package()
        _check_archive(path)

        def table(max_bad_cells: int) -> MatrixTable:
            return _table(path, options.sheet, max_bad_cells)

        return OpenedMatrix(path.name, table)


def read_texts(
    path: Path, id_column: str
) -> tuple[list[str], list[NDArray[np.object_]], tuple[Finding, ...]]:
    """Return the columns of a workbook's first sheet as text.

    Parameters
    ----------
    path : Path
        The workbook.
    id_column : str
        Name of a first column that has none.

    Returns
    -------
    names : list of str
        Column names.
    texts : list of ndarray of shape (n_rows,), object
        Their content; dates as in ISO 8601.
    findings : tuple of Finding
        Which sheet was read when there are several, and ids stored as dates.

    Raises
    ------
    UsageError
        When openpyxl is not installed.
    InputDataError
        When it is no workbook, or its first sheet holds no table.
    """
    _refuse_missing_package()
    _check_archive(path)
    with _worksheet(path, None, formulas=False) as sheet:
        where = f"{path.name}, sheet {sheet.title!r}"
        others = [each.title for each in sheet.parent.worksheets[1:]]
        each_row = _rows(path, sheet)
        _, header = next(each_row, (0, []))
        rows = []
        dates = []
        for number, cells in each_row:
            if len(cells) > len(header):
                raise _too_long(f"{where}, row {number}", len(cells), len(header))
            rows.append([*cells, *[None] * (len(header) - len(cells))])
            dates += [_id_text(cells[0])] if isinstance(cells[0], _DATES) else []
    if not rows:
        raise InputDataError(
            code="no-data-lines",
            where=where,
            what=f"there are no data rows (got {len(header)} cells in the header)",
            accepted="a header row and one row for each sample or feature are needed",
            next_step="Fill the sheet, or put it first in the workbook",
        )
    _refuse_formulas(path, None, where)
    names = [_id_text(cell) for cell in header]
    names[0] = names[0] or id_column
    texts = [
        np.array([_id_text(cell) for cell in column], dtype=object)
        for column in zip(*rows, strict=True)
    ]
    return names, texts, (*_first_of(where, others), *_dated(where, dates))


def _first_of(where: str, others: list[str]) -> Iterator[Finding]:
    if others:
        yield Finding(
            code="first-worksheet-read",
            severity="info",
            where=where,
            message=f"the workbook's first sheet was read; left out: {quoted(others)}",
            next_step="Check that the first sheet is the one that is meant.",
        )


def _refuse_missing_package() -> None:
    try:
        import openpyxl  # noqa: F401 - whether it is there is the question
    except ImportError as error:
        raise UsageError(
            code="extra-missing",
            where="format 'excel'",
            what="Excel workbooks are read by openpyxl, which is not installed",
            accepted="the extra 'excel' brings it",
            next_step="Run pip install 'panelkit[excel]', or save the sheet as CSV",
        ) from error


@contextmanager
def _damage(path: Path) -> Iterator[None]:
    """Turn what openpyxl and zipfile say about damaged files into one sentence."""
    try:
        yield
    except (
        zipfile.BadZipFile,
        KeyError,
        ValueError,
        TypeError,
        AttributeError,
        IndexError,
        EOFError,
        OSError,
        SyntaxError,  # of XML: ElementTree's ParseError is one
        NotImplementedError,  # an unknown compression
        RuntimeError,  # an encrypted member
    ) as error:
        refuse_unreadable(path, ExcelReader.title, error)


def _check_archive(path: Path) -> None:
    with _damage(path), zipfile.ZipFile(path) as archive:
        members = archive.infolist()
        total = sum(member.file_size for member in members)
        workbook = any(member.filename == "xl/workbook.xml" for member in members)
        # entities of a document type are how small XML grows large
        typed = total <= _MOST_BYTES and any(
            b"<!DOCTYPE" in archive.open(member).read(2048)
            for member in members
            if member.filename.endswith((".xml", ".rels"))
        )
    if not workbook:
        raise InputDataError(
            code="wrong-file-kind",
            where=str(path),
            what="the file is a zip archive, but no Excel workbook",
            accepted="an .xlsx workbook, or the unpacked file",
            next_step="Unpack the archive and name the file inside it",
        )
    if total > _MOST_BYTES or typed:
        raise InputDataError(
            code="archive-expands",
            where=str(path),
            what="the workbook declares XML entities"
            if typed
            else f"the workbook would unpack to {total / 2**30:.1f} GiB",
            accepted=f"workbooks of plain XML up to {_MOST_BYTES / 2**30:.0f} GiB",
            next_step="Save the matrix as CSV, Parquet or .h5ad",
        )


@contextmanager
def _worksheet(path: Path, name: str | None, *, formulas: bool) -> Iterator[Any]:
    """Open the named or the first sheet; with `formulas`, cells show those."""
    import openpyxl

    # a stream, since openpyxl goes by the names of files
    with path.open("rb") as stream:
        with _damage(path), warnings.catch_warnings():
            # openpyxl warns of parts that it leaves alone, such as styles
            warnings.simplefilter("ignore")
            book = openpyxl.load_workbook(
                stream, read_only=True, data_only=not formulas, keep_links=False
            )
            sheets = {sheet.title: sheet for sheet in book.worksheets}
        if not sheets or (name is not None and name not in sheets):
            raise _sheet_missing(path, name, list(sheets))
        sheet = sheets[name] if name is not None else next(iter(sheets.values()))
        sheet.reset_dimensions()  # what a file says of its size may be wrong
        yield sheet


def _sheet_missing(path: Path, name: str | None, names: list[str]) -> InputDataError:
    known = f"{nearest_hint(name or '', names)}its sheets are {quoted(names)}"
    return InputDataError(
        code="sheet-missing",
        where=str(path),
        what=f"the workbook has no sheet {name!r}"
        if names
        else "the workbook has no sheet of cells",
        accepted=known if names else "a sheet of cells is needed",
        next_step="Name one of its sheets" if names else "Save the matrix as CSV",
    )


def _rows(path: Path, sheet: Any) -> Iterator[tuple[int, list[Any]]]:
    """Yield number and cells of each row that is not blank, blank ends cut off."""
    with _damage(path):
        for number, cells in enumerate(sheet.iter_rows(values_only=True), 1):
            if number > _MOST_ROWS:
                refuse_unreadable(
                    path, ExcelReader.title, f"more than {_MOST_ROWS:,} rows"
                )
            last = len(cells)
            while last and cells[last - 1] in _BLANK:
                last -= 1
            if last:
                yield number, list(cells[:last])


def _table(path: Path, name: str | None, max_bad_cells: int) -> MatrixTable:
    with _worksheet(path, name, formulas=False) as sheet:
        where = f"{path.name}, sheet {sheet.title!r}"
        bad_cells = BadCells(where, max_bad_cells)
        rows = _rows(path, sheet)
        _, header = next(rows, (0, []))
        columns = [_id_text(cell) for cell in header[1:]]
        dates = [_id_text(cell) for cell in header if isinstance(cell, _DATES)]
        names: list[str] = []
        values: list[NDArray[np.float64]] = []
        for number, cells in rows:
            if len(cells) > len(header):
                raise _too_long(f"{where}, row {number}", len(cells), len(header))
            names.append(_id_text(cells[0]))
            dates += [names[-1]] if isinstance(cells[0], _DATES) else []
            values.append(_row_numbers(names[-1], cells[1:], columns, bad_cells))
    if not columns or not names:
        raise InputDataError(
            code="sheet-empty",
            where=where,
            what="the sheet holds no matrix (got "
            f"{len(header)} cells in the header and {len(names)} rows below it)",
            accepted="a header row, a first column of ids and numbers are needed",
            next_step="Fill the sheet, or name the right one with sheet",
        )
    _refuse_formulas(path, name, where)
    findings = tuple(_dated(where, dates))
    return MatrixTable(where, names, columns, np.stack(values), bad_cells, findings)


def _too_long(where: str, found: int, wanted: int) -> InputDataError:
    return InputDataError(
        code="line-length-differs",
        where=where,
        what=f"the row has {found} cells, the header {wanted}",
        accepted="every column has a name in the header row",
        next_step="Name the columns, or clear the cells beside the table",
    )


def _id_text(cell: object) -> str:
    if isinstance(cell, datetime.datetime) and cell.time() == datetime.time():
        return cell.date().isoformat()
    return as_text(cell)


def _row_numbers(
    name: str, cells: list[Any], columns: list[str], bad_cells: BadCells
) -> NDArray[np.float64]:
    values = np.full(len(columns), np.nan)
    for position, cell in enumerate(cells):
        if type(cell) is float or type(cell) is int:
            number = float(cell) if abs(cell) <= LARGEST else None
        else:
            number = cell_number("" if cell is None else str(cell))
        if number is None:
            bad_cells.add(name, columns[position], str(cell))
        else:
            values[position] = number
    return values


def _refuse_formulas(path: Path, name: str | None, where: str) -> None:
    """Refuse formulas whose result was never stored: they would read as blank."""
    with _damage(path), zipfile.ZipFile(path) as archive:
        sheets = [
            each for each in archive.namelist() if each.startswith("xl/worksheets/")
        ]
        if not any(_holds_formula(archive, each) for each in sheets):
            return
    places = []
    with (
        _worksheet(path, name, formulas=False) as results,
        _worksheet(path, name, formulas=True) as formulas,
        _damage(path),
    ):
        for found, written in zip(
            results.iter_rows(), formulas.iter_rows(), strict=True
        ):
            places += [
                cell.coordinate
                for result, cell in zip(found, written, strict=True)
                if result.value is None and cell.data_type == "f"
            ]
    if places:
        raise InputDataError(
            code="formulas-without-results",
            where=where,
            what=f"{len(places)} cells hold formulas whose results are not stored "
            f"(cells {name_some(places)})",
            accepted="cells hold numbers or formulas that were calculated",
            next_step="Open the workbook in a spreadsheet program and save it, or "
            "paste the values in place of the formulas",
        )


def _holds_formula(archive: zipfile.ZipFile, member: str) -> bool:
    tail = b""
    with archive.open(member) as stream:
        while chunk := stream.read(2**20):
            if _FORMULA.search(tail + chunk):
                return True
            tail = chunk[-2:]
    return False


def _dated(where: str, dates: list[str]) -> Iterator[Finding]:
    if dates:
        yield Finding(
            code="ids-are-dates",
            severity="warning",
            where=where,
            message=f"{counted(len(dates), 'id is', 'ids are')} stored as a date: "
            f"{quoted(dates)}; spreadsheets turn gene names such as MARCH1 or SEPT2 "
            "into dates",
            next_step="Restore the names from the file that the workbook was made of.",
        )
