"""Delimited text as one of the file formats: what nothing else claims."""

from pathlib import Path

from panelkit.ingest.delimited import read_delimited_matrix
from panelkit.ingest.matrix_table import MatrixTable
from panelkit.ingest.reader import OpenedMatrix, ReadOptions
from panelkit.ingest.source_file import file_kind

__all__ = ["TextReader"]

_BINARY = (b"PAR1", b"ARROW1", b"\x89HDF", b"PK\x03\x04", b"\xff\xff\xff\xff")


class TextReader:
    """Reads CSV and TSV matrices; satisfies `Reader`."""

    name = "text"
    title = "delimited text"
    suffixes = (".csv", ".tsv", ".txt", ".tab")
    takes: frozenset[str] = frozenset()

    def matches(self, path: Path, start: bytes) -> bool:
        """Return whether no binary format begins like this."""
        return not start.startswith(_BINARY)

    def read(self, path: Path, options: ReadOptions) -> OpenedMatrix:
        """Return the file opened; it is read in one go when the numbers are asked for.

        Parameters
        ----------
        path : Path
            The file.
        options : ReadOptions
            None of them concerns text.

        Returns
        -------
        OpenedMatrix
            Ready to be read.

        Raises
        ------
        InputDataError
            When the file is of another kind.
        """
        file_kind(path)

        def table(max_bad_cells: int) -> MatrixTable:
            return read_delimited_matrix(path, max_bad_cells)

        return OpenedMatrix(path.name, table)
