"""Matrix Market files with the files of their row and column ids.

Boisvert, Pozo & Remington 1996, The Matrix Market Exchange Formats (NISTIR 5935).
The format has no ids; that they stand beside it, line by line, is common practice.
"""

from collections.abc import Iterator, Sequence
from contextlib import contextmanager
from dataclasses import dataclass
from pathlib import Path
from typing import Any

import numpy as np

from panelkit.errors import InputDataError
from panelkit.ingest.cells import LARGEST, BadCells
from panelkit.ingest.compression import COMPRESSED_SUFFIXES, is_compressed
from panelkit.ingest.matrix_table import (
    DeferredValues,
    MatrixTable,
    Numbers,
    Positions,
    Side,
    cell_notes,
    infinite_to_missing,
)
from panelkit.ingest.reader import (
    OpenedMatrix,
    ReadOptions,
    new_matrix,
    refuse_oversized,
    refuse_unreadable,
)
from panelkit.ingest.sheet import Sheet, build_sheet
from panelkit.ingest.source_file import file_kind, open_binary, open_text
from panelkit.ingest.wording import quoted

__all__ = ["MatrixMarketReader"]

_FEATURES = ("features", "genes", "feature_names", "gene_names")
_SAMPLES = ("samples", "barcodes", "cells", "sample_names")
_SUFFIXES = ("", ".tsv", ".txt")  # samples.csv is a usual name of sample sheets
_PACKED = ("", *COMPRESSED_SUFFIXES)


@dataclass(frozen=True, slots=True, eq=False)
class _Names:
    """Ids of one side, one a line, with further fields if there are any."""

    path: Path
    header: list[str] | None
    lines: list[list[str]]

    def of_length(self, count: int) -> "_Names | None":
        """Return the names without a header line when there are `count`, else None."""
        if len(self.lines) == count:
            return self
        if len(self.lines) == count + 1:
            return _Names(self.path, self.lines[0], self.lines[1:])
        return None

    def ids(self) -> list[str]:
        return [line[0] for line in self.lines]

    def sheet(self) -> Sheet | None:
        """Return the further fields; without a header the second one is the symbol."""
        width = min(map(len, self.lines))
        if width < 2:
            return None
        head = self.header or ["id", "symbol", *(f"column_{n}" for n in range(3, 99))]
        columns = [
            np.array([line[place] for line in self.lines], dtype=object)
            for place in range(width)
        ]
        names = [*head, *(f"column_{n + 1}" for n in range(len(head), width))][:width]
        return build_sheet(self.path.name, names, columns, names[0])


class MatrixMarketReader:
    """Reads Matrix Market coordinate and array files; satisfies `Reader`."""

    name = "matrix-market"
    title = "a Matrix Market file"
    suffixes = (".mtx",)
    takes = frozenset({"row_names", "column_names"})

    def matches(self, path: Path, start: bytes) -> bool:
        """Return whether the file has the banner of Matrix Market."""
        return start[:14].lower() == b"%%matrixmarket"

    def read(self, path: Path, options: ReadOptions) -> OpenedMatrix:
        """Return the file opened: its head and its ids, no numbers yet.

        Parameters
        ----------
        path : Path
            Plain or compressed.
        options : ReadOptions
            May name the files of the ids.

        Returns
        -------
        OpenedMatrix
            Ready to be read.

        Raises
        ------
        InputDataError
            When the head is wrong, the files of the ids are missing, several, or of
            another length, or the numbers are complex.
        """
        shape = _shape(path)
        rows, columns, samples_on = _sides(path, options, shape)
        refuse_oversized(path.name, *shape)
        row_ids, column_ids = rows.ids(), columns.ids()

        def table(max_bad_cells: int) -> MatrixTable:
            bad_cells = BadCells(path.name, max_bad_cells)
            note = cell_notes(bad_cells, row_ids, column_ids)
            values = _values(path, shape, note)
            return MatrixTable(path.name, row_ids, column_ids, values, bad_cells)

        files = {"row-names": rows.path, "column-names": columns.path}
        return OpenedMatrix(
            path.name, table, samples_on, rows.sheet, columns.sheet, files
        )


@contextmanager
def _source(path: Path) -> Iterator[Any]:
    """Yield what scipy reads: the path, or a stream where the file is compressed."""
    if not is_compressed(path):
        yield str(path)
        return
    with open_binary(path) as stream:
        yield stream


def _shape(path: Path) -> tuple[int, int]:
    from scipy.io import mminfo

    try:
        with _source(path) as source:
            rows, columns, entries, layout, field, symmetry = mminfo(source)
    except (ValueError, OSError, OverflowError, EOFError) as error:
        refuse_unreadable(path, MatrixMarketReader.title, error)
    if field not in ("real", "integer", "unsigned-integer") or symmetry != "general":
        raise InputDataError(
            code="matrix-kind-refused",
            where=f"{path.name}, line 1",
            what=f"the entries are {field} and {symmetry}",
            accepted="an expression matrix has real or integer entries and is general",
            next_step="Write the values themselves as a general matrix",
        )
    if not rows or not columns:
        raise InputDataError(
            code="matrix-empty",
            where=path.name,
            what=f"there are no numbers (got {rows} rows and {columns} columns)",
            accepted="at least one row and one column are needed",
            next_step="Write the file again",
        )
    high, wide = (rows, columns) if layout == "array" else (entries, 2)
    refuse_oversized(path.name, int(high), int(wide), 8)
    return int(rows), int(columns)


def _sides(
    path: Path, options: ReadOptions, shape: tuple[int, int]
) -> tuple[_Names, _Names, Side | None]:
    """Return the ids of rows and columns, and where the samples are if that is said."""
    if options.row_names is not None and options.column_names is not None:
        rows = _fitting(options.row_names, shape[0], "rows", path)
        columns = _fitting(options.column_names, shape[1], "columns", path)
        return rows, columns, None
    if options.row_names is not None or options.column_names is not None:
        raise InputDataError(
            code="names-file-missing",
            where=path.name,
            what="only one of row_names and column_names is given",
            accepted="both files are named, or both are found beside the matrix",
            next_step="Name the other one too",
        )
    features = _read_names(_beside(path, _FEATURES, "features"))
    samples = _read_names(_beside(path, _SAMPLES, "samples"))
    # features in rows is the usual way, so a square matrix is read like that
    usual = features.of_length(shape[0]), samples.of_length(shape[1])
    turned = samples.of_length(shape[0]), features.of_length(shape[1])
    for (rows_of, columns_of), side in ((usual, "columns"), (turned, "rows")):
        if rows_of is not None and columns_of is not None:
            return rows_of, columns_of, "columns" if side == "columns" else "rows"
    raise InputDataError(
        code="dimensions-differ",
        where=path.name,
        what=f"the matrix has {shape[0]} rows and {shape[1]} columns, but "
        f"{features.path.name} has {len(features.lines)} lines and "
        f"{samples.path.name} {len(samples.lines)}",
        accepted="one line for each row and each column (and perhaps a header line)",
        next_step="Put the files that belong together into one folder, or name them as "
        "row_names and column_names",
    )


def _beside(path: Path, words: Sequence[str], what: str) -> Path:
    """Return the one file beside the matrix that holds such names."""
    prefix = path.name.lower()
    for ending in COMPRESSED_SUFFIXES:
        prefix = prefix.removesuffix(ending)
    prefix = prefix.removesuffix(".mtx").removesuffix("matrix").removesuffix("counts")
    stems = {prefix, f"{prefix}_", f"{prefix}."} if prefix else {""}
    wanted = {
        f"{stem}{word}{suffix}{packed}"
        for word in words
        for suffix in _SUFFIXES
        for packed in _PACKED
        for stem in stems
    }
    found = sorted(
        each for each in path.parent.iterdir() if each.name.lower() in wanted
    )
    if not found and prefix:
        plain = {f"{w}{s}{p}" for w in words for s in _SUFFIXES for p in _PACKED}
        found = sorted(e for e in path.parent.iterdir() if e.name.lower() in plain)
    accepted = f"one file called {words[0]}.tsv or {words[1]}.tsv (plain or .gz)"
    if not found:
        raise InputDataError(
            code="names-file-missing",
            where=path.name,
            what=f"no file beside it holds the ids of its {what}",
            accepted=accepted,
            next_step="Put it there, or name both files as row_names and column_names",
        )
    if len(found) > 1:
        raise InputDataError(
            code="names-file-unclear",
            where=path.name,
            what=f"several files beside it may hold the ids of its {what}: "
            f"{quoted(each.name for each in found)}",
            accepted=accepted,
            next_step="Name the right ones as row_names and column_names",
        )
    return found[0]


def _fitting(path: Path, count: int, side: str, matrix: Path) -> _Names:
    names = _read_names(path)
    fitting = names.of_length(count)
    if fitting is None:
        raise InputDataError(
            code="dimensions-differ",
            where=path.name,
            what=f"the file has {len(names.lines)} lines, {matrix.name} has {count} "
            f"{side}",
            accepted=f"one line for each of the {side} (and perhaps a header line)",
            next_step="Name the file that belongs to the matrix",
        )
    return fitting


def _read_names(path: Path) -> _Names:
    file_kind(path)
    delimiter = "," if ".csv" in path.name.lower() else "\t"
    with open_text(path) as text:
        lines = [
            [field.strip('"') for field in line.rstrip("\r\n").split(delimiter)]
            for line in text
            if line.strip()
        ]
    return _Names(path, None, lines)


def _values(path: Path, shape: tuple[int, int], note: Any) -> Any:
    """Return the numbers: whole from an array file, deferred from a coordinate file."""
    from scipy.io import mmread

    try:
        with _source(path) as source:
            read: Any = mmread(source, spmatrix=False)
    except (ValueError, OSError, OverflowError, EOFError) as error:
        refuse_unreadable(path, MatrixMarketReader.title, error)
    if isinstance(read, np.ndarray):
        return infinite_to_missing(np.asarray(read, dtype=np.float64), note)
    rows, columns = read.coords
    data = np.asarray(read.data, dtype=np.float64)
    _refuse_repeated(path, rows, columns, shape)
    for entry in np.flatnonzero(np.abs(data) > LARGEST):
        note(int(rows[entry]), int(columns[entry]), str(data[entry]))
        data[entry] = np.nan

    def scattered(
        keep: Any, taken: Any, count: int, size: int, chosen: Positions
    ) -> Any:
        place = np.full(count, -1)
        place[chosen] = np.arange(len(chosen))
        result = new_matrix(path.name, size, len(chosen), np.dtype(np.float64))
        wanted = place[taken] >= 0
        result[keep[wanted], place[taken[wanted]]] = data[wanted]
        return result

    def take_rows(positions: Positions) -> Numbers:
        return np.asarray(scattered(columns, rows, *shape, positions))

    def take_columns(positions: Positions) -> Numbers:
        return np.asarray(scattered(rows, columns, *shape[::-1], positions))

    return DeferredValues(shape, take_rows, take_columns)


def _refuse_repeated(
    path: Path, rows: Any, columns: Any, shape: tuple[int, int]
) -> None:
    """Refuse entries that stand twice: adding them up may be meant, or a mistake."""
    keys = rows.astype(np.int64) * shape[1] + columns
    keys.sort()
    twice = keys[1:][keys[1:] == keys[:-1]]
    if len(twice):
        row, column = divmod(int(twice[0]), shape[1])
        raise InputDataError(
            code="repeated-entries",
            where=path.name,
            what=f"{len(twice)} entries stand more than once (the first is row "
            f"{row + 1}, column {column + 1})",
            accepted="every row and column pair has one entry",
            next_step="Write the matrix again with each entry once",
        )
