"""Which reader reads a file: by its content, or by the format that was named."""

from pathlib import Path
from typing import Any

from panelkit.errors import InputDataError, UsageError
from panelkit.ingest.columnar_reader import ArrowReader, ParquetReader
from panelkit.ingest.compression import COMPRESSED_SUFFIXES, is_compressed
from panelkit.ingest.excel_reader import ExcelReader
from panelkit.ingest.gct_reader import GctReader
from panelkit.ingest.h5ad_reader import H5adReader
from panelkit.ingest.matrix_market_reader import MatrixMarketReader
from panelkit.ingest.reader import OpenedMatrix, Reader, ReadOptions
from panelkit.ingest.source_file import file_start
from panelkit.ingest.text_reader import TextReader
from panelkit.ingest.wording import nearest_hint, quoted

__all__ = ["format_names", "open_matrix_file", "register_reader", "used_options"]

_TEXT: Reader = TextReader()
_READERS: list[Reader] = [
    ParquetReader(),
    ArrowReader(),
    H5adReader(),
    ExcelReader(),
    GctReader(),
    MatrixMarketReader(),
    _TEXT,
]


def format_names() -> tuple[str, ...]:
    """Return the names of all readers, in the order in which they are asked."""
    return tuple(reader.name for reader in _READERS)


def register_reader(reader: Reader) -> None:
    """Let a further format be read; it is asked before all others.

    Parameters
    ----------
    reader : Reader
        Its name must be new.

    Raises
    ------
    UsageError
        When there is a reader of that name.
    """
    if reader.name in format_names():
        raise UsageError(
            code="reader-twice",
            where="register_reader",
            what=f"there is a reader of that name (got {reader.name!r})",
            accepted="every reader has a name of its own",
            next_step="Give it another name",
        )
    _READERS.insert(0, reader)


def open_matrix_file(path: Path, options: ReadOptions) -> OpenedMatrix:
    """Return an expression file opened by the reader that fits.

    Parameters
    ----------
    path : Path
        The file.
    options : ReadOptions
        A format named there wins over what the content looks like.

    Returns
    -------
    OpenedMatrix
        Ready to be read.

    Raises
    ------
    UsageError
        When there is no format of that name, or options are named that mean nothing
        to it.
    InputDataError
        When the file is missing, empty, damaged, or not what its name or the named
        format says.
    """
    start = file_start(path)
    found = next((each for each in _READERS if each.matches(path, start)), _TEXT)
    reader = _promised(path, found) if options.format is None else _named(options)
    if options.format is not None and not reader.matches(path, start):
        raise InputDataError(
            code="format-contradicted",
            where=str(path),
            what=f"format says {reader.title} (got {options.format!r}), but the "
            f"content looks like {found.title}",
            accepted="the format and the content agree",
            next_step="Correct or leave out format, which is then found by content",
        )
    if not _TEXT.matches(path, start) and is_compressed(path):
        raise InputDataError(
            code="wrong-file-kind",
            where=str(path),
            what=f"the file is {reader.title} inside a compressed file",
            accepted="text may be compressed; binary formats are read as they are",
            next_step="Unpack the file first",
        )
    used_options(options, reader.takes | {"format"}, path.name, reader.title)
    return reader.read(path, options)


def _named(options: ReadOptions) -> Reader:
    for reader in _READERS:
        if reader.name == options.format:
            return reader
    known = format_names()
    raise UsageError(
        code="unknown-format",
        where="format",
        what=f"no file format is called {options.format!r}",
        accepted=f"{nearest_hint(str(options.format), known)}accepted are "
        f"{quoted(known, len(known))}",
        next_step="Use one of these words, or leave format out",
    )


def _promised(path: Path, found: Reader) -> Reader:
    """Refuse text in a file whose name promises something else."""
    plain = path.name.lower()
    for ending in COMPRESSED_SUFFIXES:
        plain = plain.removesuffix(ending)
    if found is _TEXT:
        for reader in _READERS:
            if reader is not _TEXT and plain.endswith(reader.suffixes):
                raise InputDataError(
                    code="wrong-file-kind",
                    where=str(path),
                    what=f"the name says {reader.title}, but the content is none",
                    accepted="name and content agree, or format names what it is",
                    next_step="Check how the file was written, or rename it",
                )
    return found


def used_options(
    options: ReadOptions, taken: frozenset[str] | set[str], where: str, title: str
) -> None:
    """Refuse options that the data cannot follow, since they would do nothing.

    Parameters
    ----------
    options : ReadOptions
        What the caller says.
    taken : set of str
        Options that mean something here.
    where, title : str
        The file or argument, and what it is called.

    Raises
    ------
    UsageError
        When another one is given.
    """
    given: dict[str, Any] = {
        name: getattr(options, name) for name in ReadOptions.__dataclass_fields__
    }
    idle = [name for name, value in given.items() if value and name not in taken]
    if idle:
        raise UsageError(
            code="option-without-use",
            where=f"{where}, {idle[0]}",
            what=f"{idle[0]} means nothing to {title} (got {str(given[idle[0]])!r})",
            accepted="layer belongs to AnnData, sheet to a workbook, row_names and "
            "column_names to a Matrix Market file, format to files",
            next_step=f"Leave out {idle[0]}",
        )
