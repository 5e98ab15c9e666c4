"""What a reader of one file format owes: the plug point of ingest."""

import os
from collections.abc import Callable, Mapping
from dataclasses import dataclass, field
from pathlib import Path
from typing import Any, NoReturn, Protocol

import numpy as np

from panelkit.errors import InputDataError, RunFolderError
from panelkit.ingest.matrix_table import MatrixTable, Numbers, Side
from panelkit.ingest.sheet import Sheet

__all__ = [
    "OpenedMatrix",
    "ReadOptions",
    "Reader",
    "new_matrix",
    "refuse_oversized",
    "refuse_unreadable",
]

_BYTES_PER_ID = 100


@dataclass(frozen=True, slots=True)
class ReadOptions:
    """What a caller may say about a file beside its path.

    Attributes
    ----------
    format : str or None
        Name of the reader; None decides by content.
    layer : str or None
        Of AnnData: ``raw`` or the name of a layer; None is X.
    sheet : str or None
        Of a workbook: the sheet's name; None is the first.
    row_names, column_names : path or None
        Of a Matrix Market file: where its ids stand; None looks beside the file.
    """

    format: str | None = None
    layer: str | None = None
    sheet: str | None = None
    row_names: Path | None = None
    column_names: Path | None = None


def _no_sheet() -> Sheet | None:
    return None


@dataclass(frozen=True, slots=True, eq=False)
class OpenedMatrix:
    """Expression data that were recognised; the numbers are read when asked for.

    Attributes
    ----------
    where : str
        The file or argument, for messages.
    table : callable
        Largest number of bad cells to the `MatrixTable`.
    samples_on : {"rows", "columns"} or None
        Where the format itself puts the samples; used without a sample sheet.
    fixed : bool
        Whether the format leaves no doubt about that, as AnnData with its .obs.
    row_sheet, column_sheet : callable
        What the data say about their rows and columns, a `Sheet` or None.
    files : mapping of str to Path
        Further files that were read, by a word for their part.
    """

    where: str
    table: Callable[[int], MatrixTable]
    samples_on: Side | None = None
    row_sheet: Callable[[], Sheet | None] = _no_sheet
    column_sheet: Callable[[], Sheet | None] = _no_sheet
    files: Mapping[str, Path] = field(default_factory=dict)
    fixed: bool = False

    def sheet(self, side: Side) -> Sheet | None:
        """Return what the data say about one side.

        Parameters
        ----------
        side : {"rows", "columns"}
            Which one.

        Returns
        -------
        Sheet or None
            All as text.
        """
        return self.row_sheet() if side == "rows" else self.column_sheet()


class Reader(Protocol):
    """A reader of one file format.

    Attributes
    ----------
    name : str
        What `format` calls it.
    title : str
        What messages call such a file, with its article.
    suffixes : tuple of str
        File names that promise this format, in lower case.
    takes : frozenset of str
        Fields of `ReadOptions`, beside the format, that mean something to it.
    """

    @property
    def name(self) -> str:
        """What `format` calls it."""

    @property
    def title(self) -> str:
        """What messages call such a file, with its article."""

    @property
    def suffixes(self) -> tuple[str, ...]:
        """File names that promise this format, in lower case."""

    @property
    def takes(self) -> frozenset[str]:
        """Fields of `ReadOptions` that mean something to it."""

    def matches(self, path: Path, start: bytes) -> bool:
        """Return whether a file is of this format.

        Parameters
        ----------
        path : Path
            The file.
        start : bytes
            Its first bytes, after any compression.

        Returns
        -------
        bool
            By its content, whatever its name says.
        """

    def read(self, path: Path, options: ReadOptions) -> OpenedMatrix:
        """Return the file opened: ids and sheets checked as far as they are known.

        Parameters
        ----------
        path : Path
            A file that matches.
        options : ReadOptions
            What the caller says.

        Returns
        -------
        OpenedMatrix
            Ready to be read.

        Raises
        ------
        InputDataError
            When the file is damaged or holds no matrix.
        """


def refuse_unreadable(path: Path, title: str, reason: object) -> NoReturn:
    """Refuse a file that begins like its format and goes wrong later.

    Parameters
    ----------
    path : Path
        The file.
    title : str
        What such a file is called, with its article.
    reason : object
        An exception or text; its first line is shown.

    Raises
    ------
    InputDataError
        Always.
    """
    lines = str(reason).strip().splitlines() or [type(reason).__name__]
    raise InputDataError(
        code="wrong-file-kind",
        where=str(path),
        what=f"the file cannot be read as {title} ({lines[0].rstrip('.;:! ')[:160]})",
        accepted=f"a complete and undamaged file is needed ({title})",
        next_step="Copy or write the file again",
    ) from (reason if isinstance(reason, BaseException) else None)


def new_matrix(
    where: str, rows: int, columns: int, dtype: "np.dtype[np.floating[Any]]"
) -> Numbers:
    """Return a matrix of zeros, unless this machine cannot hold it.

    Parameters
    ----------
    where : str
        The file or argument, for messages.
    rows, columns : int
        Its size.
    dtype : dtype
        Its type.

    Returns
    -------
    ndarray of shape (rows, columns)
        C-contiguous.

    Raises
    ------
    RunFolderError
        When it would need more than the machine's memory.
    """
    refuse_oversized(where, rows, columns, dtype.itemsize)
    return np.zeros((rows, columns), dtype)


def refuse_oversized(where: str, rows: int, columns: int, itemsize: int = 0) -> None:
    """Refuse a matrix that this machine cannot hold, before any of it is read.

    Parameters
    ----------
    where : str
        The file or argument, for messages.
    rows, columns : int
        What the file says of itself.
    itemsize : int
        Bytes a number in memory; 0 while it is open how much will be read, so that
        only the ids count.

    Raises
    ------
    RunFolderError
        When the numbers and their ids need more than the machine's memory.
    """
    needed = rows * columns * itemsize + (rows + columns) * _BYTES_PER_ID
    memory = _memory_bytes()
    if memory is not None and needed > memory:
        raise RunFolderError(
            code="matrix-too-large",
            where=where,
            what=f"{rows:,} rows and {columns:,} columns would take "
            f"{needed / 2**30:,.1f} GiB of memory",
            accepted=f"this machine has {memory / 2**30:,.1f} GiB",
            next_step="Check the dimensions that the file states, or use a larger "
            "machine",
        )


def _memory_bytes() -> int | None:
    """Return the memory of the machine, None where the system does not say."""
    if not hasattr(os, "sysconf"):
        return None
    return os.sysconf("SC_PHYS_PAGES") * os.sysconf("SC_PAGE_SIZE")
