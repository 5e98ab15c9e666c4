"""Sheets in files of any format that holds a table: text, Parquet, Arrow, Excel."""

from dataclasses import replace
from pathlib import Path
from typing import Any

from panelkit.errors import InputDataError
from panelkit.ingest.columnar_reader import ArrowReader, ParquetReader
from panelkit.ingest.compression import is_compressed
from panelkit.ingest.data_frames import frame_columns
from panelkit.ingest.excel_reader import ExcelReader, read_texts
from panelkit.ingest.reader import refuse_oversized, refuse_unreadable
from panelkit.ingest.sheet import Sheet, Text, build_sheet, read_columns
from panelkit.ingest.source_file import file_start
from panelkit.ingest.wording import quoted
from panelkit.records import Finding

__all__ = ["read_sheet_file", "sheet_columns"]

_BYTES_PER_CELL = 64


def read_sheet_file(path: Path, id_column: str) -> Sheet:
    """Return the sheet of a file, all as text.

    Parameters
    ----------
    path : Path
        Plain or compressed text, Parquet, Arrow, or a workbook (its first sheet).
    id_column : str
        The column with the ids; the first column when there is none of that name.

    Returns
    -------
    Sheet
        Ids and columns.

    Raises
    ------
    UsageError
        When it is a workbook and openpyxl is not installed.
    InputDataError
        When the file holds no table, ids are blank or repeated, or column names are
        repeated.
    """
    names, texts, findings = sheet_columns(path, id_column)
    return replace(build_sheet(path.name, names, texts, id_column), findings=findings)


def sheet_columns(
    path: Path, id_column: str
) -> tuple[list[str], list[Text], tuple[Finding, ...]]:
    """Return the columns of a file, all as text, no id looked at.

    Parameters
    ----------
    path : Path
        As for `read_sheet_file`.
    id_column : str
        Name of a first column that has none.

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
    UsageError
        When it is a workbook and openpyxl is not installed.
    InputDataError
        When the file holds no table.
    """
    start = file_start(path)
    if not is_compressed(path):
        if ExcelReader().matches(path, start):
            return read_texts(path, id_column)
        for reader in (ParquetReader(), ArrowReader()):
            if reader.matches(path, start):
                names, texts = frame_columns(_frame(path, reader.title), id_column)
                return names, texts, ()
    return read_columns(path, id_column)


def _frame(path: Path, title: str) -> Any:
    """Return a columnar file as a data frame; whole numbers stay whole."""
    import pyarrow as pa
    from pyarrow import parquet

    try:
        if title == ParquetReader.title:
            stored = parquet.ParquetFile(path)
            n_rows, schema = stored.metadata.num_rows, stored.schema_arrow
            refuse_oversized(path.name, n_rows, len(schema), _BYTES_PER_CELL)
            table = stored.read()
        else:
            with pa.memory_map(str(path)) as source:
                is_file = source.read(6) == b"ARROW1"
                source.seek(0)
                opening = pa.ipc.open_file if is_file else pa.ipc.open_stream
                table = opening(source).read_all()
    except (pa.ArrowException, OSError, ValueError) as error:
        refuse_unreadable(path, title, error)
    nested = [field.name for field in table.schema if pa.types.is_nested(field.type)]
    if nested:
        raise InputDataError(
            code="columns-not-flat",
            where=path.name,
            what=f"{len(nested)} columns hold lists or records: {quoted(nested)}",
            accepted="every column of a sheet holds one entry a row",
            next_step="Take these columns out, or write their entries one a column",
        )
    if not table.num_rows or not table.num_columns:
        raise InputDataError(
            code="no-data-lines",
            where=path.name,
            what=f"there is no table (got {table.num_rows} rows and "
            f"{table.num_columns} columns)",
            accepted="at least one row and one column are needed",
            next_step="Export the sheet again",
        )
    return table.to_pandas(integer_object_nulls=True)
